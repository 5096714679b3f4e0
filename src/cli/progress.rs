//! Progress on standard error, with rate and time left.

use std::fmt;
use std::sync::{Mutex, PoisonError};
use std::time::Duration;

use indicatif::{HumanCount, ProgressBar, ProgressDrawTarget, ProgressState, ProgressStyle};

use super::output::width;
use super::signals::Stop;
use crate::model::Progress;

/// Columns that a bar with all its words takes; the outlook is dropped on narrower terminals.
const ROOMY: usize = 100;

/// Shows progress bars, if they are wanted, and passes on the wish to stop.
#[derive(Debug)]
pub(super) struct Watch {
    bar: Mutex<Option<ProgressBar>>,
    /// What is known of the next phase before it begins.
    outlook: Mutex<String>,
    is_shown: bool,
    stop: Stop,
}

impl Watch {
    pub(super) fn new(is_shown: bool, stop: Stop) -> Self {
        Self { bar: Mutex::new(None), outlook: Mutex::default(), is_shown, stop }
    }

    /// Says beside the next phase what is to be expected of it.
    pub(super) fn expect(&self, outlook: String) {
        *self.outlook.lock().unwrap_or_else(PoisonError::into_inner) = outlook;
    }

    fn with_bar(&self, act: impl FnOnce(&mut Option<ProgressBar>)) {
        act(&mut self.bar.lock().unwrap_or_else(PoisonError::into_inner));
    }
}

/// Whole units a second.
fn rate(state: &ProgressState, out: &mut dyn fmt::Write) {
    // A terminal that cannot be written to is no matter.
    let _written = write!(out, "{}/s", HumanCount(state.per_sec() as u64));
}

impl Progress for Watch {
    fn begin(&self, phase: &str, unit: &str, total: Option<u64>) {
        if !self.is_shown {
            return;
        }
        let template = match total {
            Some(_) => "{msg} {wide_bar} {percent}% of {human_len} {prefix} ({rate}, {eta} left)",
            None => "{msg} {spinner} {human_pos} {prefix} ({rate})",
        };
        let mut outlook = std::mem::take(&mut *self.outlook.lock().unwrap_or_else(PoisonError::into_inner));
        if width() < ROOMY {
            outlook.clear();
        }
        let bar = ProgressBar::with_draw_target(total, ProgressDrawTarget::stderr_with_hz(8))
            .with_message(format!("{phase}{outlook}"))
            .with_prefix(unit.to_owned());
        if let Ok(style) = ProgressStyle::with_template(template) {
            bar.set_style(style.with_key("rate", rate));
        }
        bar.enable_steady_tick(Duration::from_millis(250));
        self.with_bar(|current| *current = Some(bar));
    }

    fn advance(&self, done: u64) {
        self.with_bar(|current| {
            if let Some(bar) = current {
                bar.inc(done);
            }
        });
    }

    fn end(&self) {
        self.with_bar(|current| {
            if let Some(bar) = current.take() {
                bar.finish_and_clear();
            }
        });
    }

    fn interrupted(&self) -> bool {
        self.stop.is_asked()
    }
}
