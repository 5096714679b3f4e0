//! The covariance of a cost with the time, by the normal limit of the mean product of deviations.

use crate::exact::Bounded;
use crate::sampling::{Observable, Tally};
use crate::statistics::{Interval, agree_miss_probability, normal_survival, normal_upper_quantile};

use super::Guarantee;
use super::mean::Spread;
use super::method::{Evidence, Method, premature};
use super::sample::recorded;

/// The covariance of a cost with the time.
#[derive(Debug)]
pub(super) struct Covariance {
    /// The cost, and in how many parts of its unit, and of a clock unit, it is counted.
    pub(super) cost: Observable,
    pub(super) units: (f64, f64),
    pub(super) exact: Bounded,
    /// Of the product of the two deviations. The estimate is its mean but for the means that are estimated too, which
    /// changes it by terms of order 1/n.
    pub(super) spread: Spread,
}

impl Method for Covariance {
    fn name(&self) -> &'static str {
        "normal limit of the covariance"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Approximate
    }

    fn observes(&self) -> Option<Observable> {
        Some(self.cost)
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let margin = tolerance - 0.5 * (self.exact.high - self.exact.low);
        let too_few = f64::from(u8::from(n < self.spread.least_size(alpha)));
        (too_few + agree_miss_probability(margin, self.spread.standard_deviation, n, alpha)).min(1.0)
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let sums = recorded(tally, self.cost).sums();
        let n = sums.count();
        let premature = premature(n, self.spread.least_size(alpha), "");
        let unit = self.units.0 * self.units.1;
        let moments = sums.covariance().zip(sums.squared_product_moment());
        let Some((covariance, square)) = moments.map(|(c, square)| (c / unit, square / unit / unit)) else {
            return Evidence { premature, ..Evidence::default() };
        };
        let standard_error = ((square - covariance * covariance).max(0.0) / n as f64).sqrt();
        let half_width = normal_upper_quantile(0.5 * alpha) * standard_error;
        let beyond = (covariance - (self.exact.high + tolerance)).max(self.exact.low - tolerance - covariance);
        let p_value = if beyond <= 0.0 { 1.0 } else { 2.0 * normal_survival(beyond / standard_error) };
        Evidence {
            estimate: Some(covariance),
            standard_error: Some(standard_error),
            interval: Some(Interval { low: covariance - half_width, high: covariance + half_width }),
            p_value: Some(p_value),
            premature,
            note: None,
        }
    }
}
