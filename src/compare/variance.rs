//! The variance of the time and its square root, on the logarithmic scale.

use crate::exact::{Bounded, Shape};
use crate::sampling::Tally;
use crate::statistics::{Interval, mean_least_size, normal_survival, normal_upper_quantile, variance_interval};

use super::Guarantee;
use super::mean::FEWEST;
use super::method::{Evidence, Method, premature};

/// The variance of the time, or its square root.
#[derive(Debug)]
pub(super) struct Variance {
    /// Whether the standard deviation is meant.
    pub(super) root: bool,
    /// Bounds of what is meant.
    pub(super) exact: Bounded,
    pub(super) squares: Squares,
}

/// The shape of the law of a squared deviation Y = (T − μ)².
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Squares {
    /// The variance of Y over its squared mean, m₄/σ⁴ − 1.
    pub(super) excess: f64,
    pub(super) skewness: f64,
    pub(super) excess_kurtosis: f64,
}

impl Squares {
    /// `None` when its moments are not known well, or Y does not vary.
    pub(super) fn of(shape: &Shape) -> Option<Self> {
        let excess = shape.excess_kurtosis()? + 2.0;
        let (skewness, excess_kurtosis) = shape.of_squared_deviation()?;
        (excess > 0.0).then_some(Self { excess, skewness, excess_kurtosis })
    }

    /// The least number of observations from which the interval holds its level.
    ///
    /// s² is the mean of Y less (x̄ − μ)², which adds 2/n to `excess`: the tail beyond z grows by about z²/(n · excess),
    /// of which a tenth is allowed.
    pub(super) fn least_size(&self, alpha: f64) -> u64 {
        let z = normal_upper_quantile(0.5 * alpha);
        let from_mean = (10.0 * z * z / self.excess).ceil() as u64;
        mean_least_size(self.skewness, self.excess_kurtosis, alpha).max(from_mean).max(FEWEST)
    }
}

impl Variance {
    /// The power of the variance that is meant, a factor on the logarithmic scale.
    fn power(&self) -> f64 {
        if self.root { 0.5 } else { 1.0 }
    }

    /// What is meant, of a variance.
    fn of(&self, variance: f64) -> f64 {
        if self.root { variance.sqrt() } else { variance }
    }
}

impl Method for Variance {
    fn name(&self) -> &'static str {
        "normal limit of the log variance"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Approximate
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let Bounded { value, low, high } = self.exact;
        let lowest = high - tolerance;
        let highest = low + tolerance;
        if n < self.squares.least_size(alpha) || highest <= value || value <= lowest {
            return 1.0;
        }
        let standard_error = self.power() * (self.squares.excess / n as f64).sqrt();
        let z = normal_upper_quantile(0.5 * alpha);
        let above = normal_survival((highest / value).ln() / standard_error - z);
        // Nothing is below a bound of 0.
        let below = if lowest <= 0.0 { 0.0 } else { normal_survival((value / lowest).ln() / standard_error - z) };
        (above + below).min(1.0)
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let sums = tally.all();
        let n = sums.count();
        let premature = premature(n, self.squares.least_size(alpha), "");
        let moments = sums.variance().zip(sums.central_moment(2)).zip(sums.central_moment(4));
        let Some(((variance, second), fourth)) = moments else {
            return Evidence { premature, ..Evidence::default() };
        };
        // Where nothing varies the limit is a point. From the least size on that does not happen to a law that varies.
        let of_variance = variance_interval(variance, fourth, n, alpha)
            .or_else(|| (variance == 0.0).then_some(Interval { low: 0.0, high: 0.0 }));
        let estimate = self.of(variance);
        let spread = if second > 0.0 { ((fourth / second / second - 1.0).max(0.0) / n as f64).sqrt() } else { 0.0 };
        let interval = of_variance.map(|Interval { low, high }| Interval { low: self.of(low), high: self.of(high) });
        Evidence {
            estimate: Some(estimate),
            standard_error: Some(estimate * self.power() * spread),
            interval,
            p_value: interval.map(|interval| self.p_value(estimate, interval, tolerance, alpha)),
            premature,
            note: None,
        }
    }
}

impl Variance {
    /// The smallest level at which the interval misses all that is within the tolerance: on the logarithmic scale its
    /// half width is proportional to the normal quantile of its level.
    fn p_value(&self, estimate: f64, interval: Interval, tolerance: f64, alpha: f64) -> f64 {
        let (lowest, highest) = (self.exact.low - tolerance, self.exact.high + tolerance);
        if (lowest..=highest).contains(&estimate) {
            return 1.0;
        }
        if estimate == 0.0 {
            return 0.0;
        }
        let bound = if estimate > highest { highest } else { lowest };
        let half_width = 0.5 * (interval.high / interval.low).ln();
        let reach = (estimate / bound).ln().abs() / half_width;
        2.0 * normal_survival(normal_upper_quantile(0.5 * alpha) * reach)
    }
}
