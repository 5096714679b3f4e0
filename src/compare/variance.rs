//! The variance of a time, a cost or a number of visits, and its square root, on the logarithmic scale.

use crate::exact::{Bounded, Shape};
use crate::sampling::{Observable, Tally};
use crate::statistics::{Interval, mean_least_size, normal_survival, normal_upper_quantile, variance_interval};

use super::Guarantee;
use super::mean::FEWEST;
use super::method::{Evidence, Method, premature};
use super::sample::Sample;

/// The variance of a value, or its square root.
#[derive(Debug)]
pub(super) struct Variance {
    pub(super) sample: Sample,
    /// Whether the standard deviation is meant.
    pub(super) root: bool,
    /// Bounds of what is meant.
    pub(super) exact: Bounded,
    pub(super) squares: Squares,
}

/// The shape of the law of a time T and of its squared deviation Y = (T − μ)², as far as sizes depend on it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Squares {
    /// The variance of Y over its squared mean, m₄/σ⁴ − 1.
    pub(super) excess: f64,
    /// The skewness of T.
    pub(super) skewness: f64,
    /// The skewness of Y.
    pub(super) skewness_of_square: f64,
}

impl Squares {
    /// `None` when its moments are not known well, or Y does not vary.
    pub(super) fn of(shape: &Shape) -> Option<Self> {
        let excess = shape.excess_kurtosis()? + 2.0;
        let (skewness_of_square, _) = shape.of_squared_deviation()?;
        (excess > 0.0).then_some(Self { excess, skewness: shape.skewness()?, skewness_of_square })
    }

    /// The least number of observations from which the interval holds its level.
    ///
    /// # Formula
    /// To order 1/√n the studentised ln s² is U + [(√e − γ_Y) U²/2 + (2γ/e) U V − V²/√e]/√n, with U and V the standardised
    /// means of Y and T, whose correlation is γ/√e; e the excess, γ the skewness of T, γ_Y that of Y. U²/2 comes from the
    /// logarithm and the spread of Y, V² from the mean that s² subtracts, U V from that mean within m₄. Its third cumulant
    /// is λ/√n, λ = 3√e − 2γ_Y + 6γ²/e^{3/2}. That of a t statistic is −2γ/√n, so λ/2 stands for the skewness in the least
    /// size of a t interval. The excess kurtosis, which would lower the size, is taken as 0.
    ///
    /// A law of nearly two values, equally likely, has a Y that hardly varies. There the last term is large.
    pub(super) fn least_size(&self, alpha: f64) -> u64 {
        let root = self.excess.sqrt();
        let from_mean = 6.0 * self.skewness * self.skewness / (self.excess * root);
        let cumulant = 3.0 * root - 2.0 * self.skewness_of_square + from_mean;
        mean_least_size(0.5 * cumulant, 0.0, alpha).max(FEWEST)
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

    fn observes(&self) -> Option<Observable> {
        self.sample.observes()
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
        let sums = self.sample.sums(tally);
        let n = sums.count();
        let premature = premature(n, self.squares.least_size(alpha), "");
        let moments = sums.variance().zip(sums.central_moment(2)).zip(sums.central_moment(4));
        let Some(((variance, second), fourth)) = moments else {
            return Evidence { premature, ..Evidence::default() };
        };
        let unit = self.sample.unit.powi(2);
        let (variance, second, fourth) = (variance / unit, second / unit, fourth / unit / unit);
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

#[cfg(test)]
mod tests {
    use super::super::mean::tests::{masses, odd_tallies, tally};
    use super::super::sample::Values;
    use super::super::verdict::{Verdict, of_interval};
    use super::*;

    const ALPHA: f64 = 0.1 / 14.0;

    /// The shape of a time that is 2 with probability p, else 1. Any handbook: skewness (1 − 2p)/σ, excess kurtosis
    /// (1 − 6σ²)/σ²; Y has two values too, (1 − p)² with probability p.
    fn two_valued(p: f64) -> (f64, Squares) {
        let variance = p * (1.0 - p);
        let skewness = (1.0 - 2.0 * p) / variance.sqrt();
        let excess = (1.0 - 6.0 * variance) / variance + 2.0;
        (variance, Squares { excess, skewness, skewness_of_square: skewness.abs() })
    }

    #[test]
    fn the_p_value_is_below_the_level_exactly_when_the_interval_disagrees() {
        let (variance, squares) = two_valued(0.25);
        for root in [false, true] {
            let value = if root { variance.sqrt() } else { variance };
            let exact = Bounded { value, low: value - 1e-3, high: value + 2e-3 };
            let method = Variance { sample: Sample { of: Values::Times, unit: 1.0 }, root, exact, squares };
            let mut decided = [0; 2];
            for (i, tally) in odd_tallies(2).enumerate() {
                let tolerance = [0.0, 0.01, 0.05, 0.3][i % 4];
                let evidence = method.evaluate(&tally, tolerance, ALPHA);
                let verdict = of_interval(evidence.interval.unwrap(), exact, tolerance, false);
                assert_eq!(evidence.p_value.unwrap() <= ALPHA, verdict == Verdict::Disagree, "{evidence:?}");
                decided[usize::from(verdict == Verdict::Disagree)] += 1;
            }
            assert!(decided.iter().all(|count| *count > 300), "{decided:?}");
        }
    }

    // As for the mean, the true level is an exact sum over binomial counts. At p = 0.45 a least size that looks at Y alone,
    // 212 at this level, misses by a factor of five.
    #[test]
    fn the_interval_holds_its_level_from_the_least_size_on() {
        let level = |p: f64, n: u64| -> f64 {
            let missed = masses(n, p).into_iter().filter(|(twos, _)| {
                let sums = tally(&[(0, 1, n - twos), (0, 2, *twos)]).all();
                let fourth = sums.central_moment(4).unwrap();
                let interval = variance_interval(sums.variance().unwrap(), fourth, n, ALPHA);
                interval.is_none_or(|interval| !interval.contains(p * (1.0 - p)))
            });
            missed.map(|(_, mass)| mass).sum()
        };
        for p in [0.45, 0.4, 0.3, 0.2, 0.1, 0.05] {
            let least = two_valued(p).1.least_size(ALPHA);
            let ratio = level(p, least) / ALPHA;
            assert!(ratio < 1.2, "{p}: {ratio} at {least}");
        }
        assert!(level(0.45, 1792) > 4.0 * ALPHA);
    }

    #[test]
    fn the_standard_deviation_is_the_square_root_of_all() {
        let (variance, squares) = two_valued(0.25);
        let of_variance = Variance {
            sample: Sample { of: Values::Times, unit: 1.0 },
            root: false,
            exact: Bounded::exactly(variance),
            squares,
        };
        let of_root = Variance {
            sample: Sample { of: Values::Times, unit: 1.0 },
            root: true,
            exact: Bounded::exactly(variance.sqrt()),
            squares,
        };
        let tally = tally(&[(0, 1, 40_000), (0, 2, 14_000)]);
        let (square, root) = (of_variance.evaluate(&tally, 0.0, ALPHA), of_root.evaluate(&tally, 0.0, ALPHA));
        assert!((root.estimate.unwrap().powi(2) - square.estimate.unwrap()).abs() < 1e-15);
        assert!((root.interval.unwrap().low.powi(2) - square.interval.unwrap().low).abs() < 1e-15);
        assert!((root.p_value.unwrap() / square.p_value.unwrap() - 1.0).abs() < 1e-9);
        // dσ/σ = dσ²/(2σ²), to first order.
        let relative = |evidence: &Evidence| evidence.standard_error.unwrap() / evidence.estimate.unwrap();
        assert!((2.0 * relative(&root) / relative(&square) - 1.0).abs() < 1e-12);
        // Twice the tolerance for the square, to first order.
        let miss = of_variance.miss_probability(0.025 * variance, 30_000, ALPHA);
        let miss_of_root = of_root.miss_probability(0.0125 * variance.sqrt(), 30_000, ALPHA);
        assert!((0.2..0.4).contains(&miss) && (miss / miss_of_root - 1.0).abs() < 0.02, "{miss} {miss_of_root}");
    }

    #[test]
    fn a_sample_that_does_not_vary_is_far_from_any_variance() {
        let (variance, squares) = two_valued(0.25);
        let method = Variance {
            sample: Sample { of: Values::Times, unit: 1.0 },
            root: false,
            exact: Bounded::exactly(variance),
            squares,
        };
        let evidence = method.evaluate(&tally(&[(0, 1, 100_000)]), 0.01, ALPHA);
        assert_eq!((evidence.estimate, evidence.p_value), (Some(0.0), Some(0.0)));
        assert_eq!(evidence.interval, Some(Interval { low: 0.0, high: 0.0 }));
        assert_eq!(method.evaluate(&tally(&[]), 0.01, ALPHA).interval, None);
    }
}
