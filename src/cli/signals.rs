//! Ctrl-C and termination: the first signal asks to stop, a second one, of either kind, stops at once.

use std::io;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};

use signal_hook::consts::{SIGINT, SIGTERM};
use signal_hook::flag;

use super::failure::status;

/// Which signal came first, if any did.
#[derive(Debug, Clone, Default)]
pub(super) struct Stop(Arc<AtomicUsize>);

impl Stop {
    /// Listens from now on.
    ///
    /// # Errors
    /// When the system refuses a handler.
    pub(super) fn listen() -> io::Result<Self> {
        let stop = Self::default();
        let armed = Arc::new(AtomicBool::new(false));
        for (signal, exit) in [(SIGINT, status::INTERRUPTED), (SIGTERM, status::TERMINATED)] {
            // In this order: only the second signal finds the flag set.
            flag::register_conditional_shutdown(signal, i32::from(exit), Arc::clone(&armed))?;
            flag::register(signal, Arc::clone(&armed))?;
            flag::register_usize(signal, Arc::clone(&stop.0), signal.unsigned_abs() as usize)?;
        }
        Ok(stop)
    }

    /// Whether a stop was asked for.
    pub(super) fn is_asked(&self) -> bool {
        self.0.load(Ordering::Relaxed) != 0
    }

    /// Whether the system asked, not the keyboard.
    pub(super) fn is_termination(&self) -> bool {
        self.0.load(Ordering::Relaxed) == SIGTERM.unsigned_abs() as usize
    }
}
