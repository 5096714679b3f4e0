//! The share of replications to which something happens: an end, a group, a time that is passed.

use crate::exact::Bounded;
use crate::sampling::Tally;
use crate::statistics::{agree_miss_probability, binomial_agree_miss_probability, binomial_p_value, clopper_pearson};

use super::Guarantee;
use super::method::{Evidence, Method};

/// From this variance of the count on, the normal approximation serves for sizes.
const NORMAL_FROM: f64 = 5000.0;

/// Something that happens to a replication or does not.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Event {
    /// It finishes in one of these ends.
    Ends(Vec<usize>),
    /// It takes longer than this.
    LongerThan(u64),
}

impl Event {
    /// How often it happened.
    ///
    /// # Panics
    /// When the tally has no such end or does not cut at the time.
    pub(super) fn count(&self, tally: &Tally) -> u64 {
        match self {
            Self::Ends(ends) => tally.count_of(ends),
            Self::LongerThan(time) => {
                let Some(within) = tally.at_or_below(*time) else { panic!("the tally does not cut at time {time}") };
                tally.replications() - within
            }
        }
    }

    /// Where the tally must cut to count it.
    pub(super) fn cuts(&self) -> Vec<u64> {
        match self {
            Self::Ends(_) => Vec::new(),
            Self::LongerThan(time) => vec![*time],
        }
    }
}

/// The probability of an event, by the interval of Clopper and Pearson.
#[derive(Debug)]
pub(super) struct Share {
    pub(super) event: Event,
    pub(super) exact: Bounded,
}

impl Method for Share {
    fn name(&self) -> &'static str {
        "Clopper–Pearson"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Exact
    }

    fn cuts(&self, _tolerance: f64) -> Vec<u64> {
        self.event.cuts()
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let Bounded { value: p, low, high } = self.exact;
        let variance = p * (1.0 - p);
        if n as f64 * variance < NORMAL_FROM {
            return binomial_agree_miss_probability(p, high - tolerance, low + tolerance, n, alpha);
        }
        agree_miss_probability(tolerance - 0.5 * (high - low), variance.sqrt(), n, alpha)
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let (n, count) = (tally.replications(), self.event.count(tally));
        let Some(interval) = clopper_pearson(count, n, alpha) else { return Evidence::default() };
        let share = count as f64 / n as f64;
        let p_value = binomial_p_value(count, n, self.exact.low - tolerance, self.exact.high + tolerance);
        Evidence {
            estimate: Some(share),
            standard_error: Some((share * (1.0 - share) / n as f64).sqrt()),
            interval: Some(interval),
            p_value: Some(p_value),
            ..Evidence::default()
        }
    }
}
