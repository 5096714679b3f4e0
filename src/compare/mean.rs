//! The mean time, of all replications or of those that finish in certain ends, by Student's t.

use crate::exact::{Bounded, Shape};
use crate::sampling::Tally;
use crate::statistics::{agree_miss_probability, lower_tail, mean_interval, mean_least_size, student_survival};

use super::Guarantee;
use super::method::{Evidence, Method, premature};

/// No normal limit is trusted with fewer observations. Its expansion in the moments does not see that times are whole:
/// where they take two values equally often, the steps between the means that can occur shift the level by a tenth at
/// this size, and by all of it at a few observations, which are often all equal.
pub(super) const FEWEST: u64 = 1000;

/// The mean time of replications that finish in certain ends.
#[derive(Debug)]
pub(super) struct Mean {
    /// Their ends; `None` for all.
    pub(super) ends: Option<Vec<usize>>,
    /// The probability of finishing there.
    pub(super) share: f64,
    pub(super) exact: Bounded,
    pub(super) spread: Spread,
}

/// The shape of the law of one observation, as far as sizes depend on it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Spread {
    pub(super) standard_deviation: f64,
    pub(super) skewness: f64,
    pub(super) excess_kurtosis: f64,
}

impl Spread {
    /// That of a time; `None` when its moments are not known well.
    pub(super) fn of(shape: &Shape) -> Option<Self> {
        Some(Self {
            standard_deviation: shape.variance()?.sqrt(),
            skewness: shape.skewness()?,
            excess_kurtosis: shape.excess_kurtosis()?,
        })
    }

    /// The least number of observations from which a t interval holds its level.
    pub(super) fn least_size(&self, alpha: f64) -> u64 {
        mean_least_size(self.skewness, self.excess_kurtosis, alpha).max(FEWEST)
    }
}

impl Method for Mean {
    fn name(&self) -> &'static str {
        "Student t"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Approximate
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let margin = tolerance - 0.5 * (self.exact.high - self.exact.low);
        let least = self.spread.least_size(alpha);
        let expected = (n as f64 * self.share) as u64;
        let too_few = if self.ends.is_none() {
            f64::from(u8::from(n < least))
        } else {
            // How many finish there is random too.
            lower_tail(n, self.share, least - 1)
        };
        (too_few + agree_miss_probability(margin, self.spread.standard_deviation, expected, alpha)).min(1.0)
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let sums = self.ends.as_ref().map_or_else(|| tally.all(), |ends| tally.power_sums_of(ends));
        let n = sums.count();
        let estimate = sums.mean();
        let (Some(mean), Some(variance)) = (estimate, sums.variance()) else {
            return Evidence { estimate, premature: self.premature(n, alpha), ..Evidence::default() };
        };
        let standard_error = (variance / n as f64).sqrt();
        let beyond = (mean - (self.exact.high + tolerance)).max(self.exact.low - tolerance - mean);
        let p_value = if beyond <= 0.0 { 1.0 } else { 2.0 * student_survival(beyond / standard_error, (n - 1) as f64) };
        Evidence {
            estimate,
            standard_error: Some(standard_error),
            interval: mean_interval(mean, variance, n, alpha),
            p_value: Some(p_value),
            premature: self.premature(n, alpha),
            note: None,
        }
    }
}

impl Mean {
    fn premature(&self, n: u64, alpha: f64) -> Option<String> {
        let there = if self.ends.is_some() { " that finish there" } else { "" };
        premature(n, self.spread.least_size(alpha), there)
    }
}
