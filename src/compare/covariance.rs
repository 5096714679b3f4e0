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

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::*;
    use crate::sampling::Grid;

    /// A time of 1 to 4, equally likely, at a cost of its square less 3: covariance E[T³] − E[T] E[T²] = 25 − 2.5 · 7.5.
    fn tally(n: u64, stream: u128) -> Tally {
        let mut rng = Lcg128CmDxsm64::new(4, stream);
        let mut tally = Tally::observing(1, Arc::new(Grid::new(vec![])), [Observable::Cost(0)].into());
        for _ in 0..n {
            let time = 1 + (rng.next_u64() >> 62);
            tally.add_observed(0, time, &[Some(i128::from(time * time) - 3)]);
        }
        tally
    }

    fn covariance() -> Covariance {
        let spread = Spread { standard_deviation: 7.0, skewness: 0.5, excess_kurtosis: 0.0 };
        Covariance { cost: Observable::Cost(0), units: (1.0, 1.0), exact: Bounded::exactly(6.25), spread }
    }

    // 2,000 right tables at a level of 0.05: misses between 58 and 148 with probability above 1 − 1e-5 (Bin(2000, 0.05)).
    #[test]
    fn the_interval_keeps_its_level_and_the_p_value_says_the_same() {
        let mut misses = 0;
        for stream in 0..2000 {
            let evidence = covariance().evaluate(&tally(1500, stream), 0.0, 0.05);
            let is_missed = !evidence.interval.unwrap().contains(6.25);
            assert_eq!(is_missed, evidence.p_value.unwrap() <= 0.05);
            misses += u32::from(is_missed);
        }
        assert!((58..=148).contains(&misses), "{misses}");
    }

    #[test]
    fn what_is_within_the_tolerance_is_no_difference_and_few_are_premature() {
        let evidence = covariance().evaluate(&tally(1500, 1), 5.0, 0.05);
        assert_eq!((evidence.p_value, evidence.premature), (Some(1.0), None));
        assert!(covariance().evaluate(&tally(900, 1), 5.0, 0.05).premature.is_some());
        assert_eq!(covariance().evaluate(&tally(1, 1), 5.0, 0.05).estimate, None);
    }
}
