//! What a row must know of its statistical method.

use std::fmt::Debug;

use crate::sampling::{Observable, Tally};
use crate::statistics::Interval;

use super::Guarantee;
use super::words::counted;

/// How the estimate of a quantity is formed, enclosed, tested and planned.
pub(super) trait Method: Debug {
    /// Its usual name.
    fn name(&self) -> &'static str;

    /// What stands behind its interval.
    fn guarantee(&self) -> Guarantee;

    /// What the tally must record besides end and time.
    fn observes(&self) -> Option<Observable> {
        None
    }

    /// Times at which the tally must cut so that the verdict, the ends of the interval and the estimate can be told.
    fn cuts(&self, tolerance: f64) -> Vec<u64> {
        let _ = tolerance;
        Vec::new()
    }

    /// The chance that `n` replications of a right simulator do not agree within `tolerance`, which is not 0, at level
    /// `alpha`. 1 below the size from which the interval holds.
    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64;

    /// Why no number of replications ever agrees, if that is so.
    fn never_agrees(&self, tolerance: f64) -> Option<String> {
        let _ = tolerance;
        None
    }

    /// What a tally says. `tolerance` matters to the p-value alone.
    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence;
}

/// What a tally says of one quantity.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Evidence {
    /// The estimate, if there is one.
    pub(super) estimate: Option<f64>,
    /// Its standard error, if it has one.
    pub(super) standard_error: Option<f64>,
    /// The confidence interval, if there is one.
    pub(super) interval: Option<Interval>,
    /// The smallest level at which the quantity would be beyond the tolerance.
    pub(super) p_value: Option<f64>,
    /// Why nothing may be decided yet, although there is an interval.
    pub(super) premature: Option<String>,
    /// What else a reader must know.
    pub(super) note: Option<String>,
}

/// Why `n` observations are too few for an interval that holds from `least` on, if they are.
pub(super) fn premature(n: u64, least: u64, which: &str) -> Option<String> {
    let (have, needed) = (counted(n), counted(least));
    (n < least).then(|| format!("the interval holds from {needed} replications{which} on; there are {have}"))
}
