//! The mean of a time, a cost or a number of visits, of all replications or of those that have one, by Student's t.

use crate::exact::{Bounded, Shape};
use crate::sampling::{Observable, Tally};
use crate::statistics::{agree_miss_probability, lower_tail, mean_interval, mean_least_size, student_survival};

use super::Guarantee;
use super::method::{Evidence, Method, premature};
use super::sample::Sample;

/// No normal limit is trusted with fewer observations. Its expansion in the moments does not see that times are whole:
/// where they take two values equally often, the steps between the means that can occur shift the level by a tenth at
/// this size, and by all of it at a few observations, which are often all equal.
pub(super) const FEWEST: u64 = 1000;

/// The mean of a value.
#[derive(Debug)]
pub(super) struct Mean {
    pub(super) of: Sample,
    /// The probability that a replication has a value.
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
    /// That of a value; `None` when its moments are not known well.
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

    fn observes(&self) -> Option<Observable> {
        self.of.observes()
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let margin = tolerance - 0.5 * (self.exact.high - self.exact.low);
        let least = self.spread.least_size(alpha);
        let expected = (n as f64 * self.share) as u64;
        let too_few = if self.of.which().is_none() {
            f64::from(u8::from(n < least))
        } else {
            // How many have a value is random too.
            lower_tail(n, self.share, least - 1)
        };
        (too_few + agree_miss_probability(margin, self.spread.standard_deviation, expected, alpha)).min(1.0)
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let sums = self.of.sums(tally);
        let (n, unit) = (sums.count(), self.of.unit);
        let estimate = sums.mean().map(|mean| mean / unit);
        let (Some(mean), Some(variance)) = (estimate, sums.variance().map(|variance| variance / unit / unit)) else {
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
        premature(n, self.spread.least_size(alpha), self.of.which().unwrap_or_default())
    }
}

#[cfg(test)]
pub(super) mod tests {
    use std::sync::Arc;

    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::super::sample::Values;
    use super::super::verdict::{Verdict, of_interval};
    use super::*;
    use crate::sampling::Grid;

    const ALPHA: f64 = 0.1 / 14.0;

    pub(in super::super) fn tally(outcomes: &[(usize, u64, u64)]) -> Tally {
        let mut tally = Tally::new(2, Arc::new(Grid::new(vec![])));
        outcomes.iter().for_each(|(end, time, copies)| tally.add_many(*end, *time, *copies));
        tally
    }

    /// P(X = k) for X ~ Bin(n, p) wherever it matters, by the ratio of neighbours from the mode outwards.
    pub(in super::super) fn masses(n: u64, p: f64) -> Vec<(u64, f64)> {
        let mut mass = vec![0.0; n as usize + 1];
        let mode = (n as f64 * p) as usize;
        mass[mode] = 1.0;
        let up = |k: usize| (n as f64 - k as f64) / (k as f64 + 1.0) * p / (1.0 - p);
        (mode..n as usize).for_each(|k| mass[k + 1] = mass[k] * up(k));
        (0..mode).rev().for_each(|k| mass[k] = mass[k + 1] / up(k));
        let total: f64 = mass.iter().sum();
        (0..).zip(mass.iter().map(|x| x / total)).filter(|(_, x)| *x > 1e-16).collect()
    }

    /// Tallies of `n` times, 1 or 2 at random in all proportions and now and then another.
    pub(in super::super) fn odd_tallies(seed: u128) -> impl Iterator<Item = Tally> {
        let mut rng = Lcg128CmDxsm64::new(seed, 3);
        (0..5000).map(move |_| {
            let mut draw = |below: u64| rng.next_u64() % below;
            let (ones, twos) = (1 + draw(2000), 1 + draw(2000));
            let others = if draw(2) == 0 { draw(20) } else { 0 };
            tally(&[(0, 1, ones), (0, 2, twos), (0, 3 + draw(10), others)])
        })
    }

    #[test]
    fn the_p_value_is_below_the_level_exactly_when_the_interval_disagrees() {
        let spread = Spread { standard_deviation: 0.5, skewness: 0.0, excess_kurtosis: -2.0 };
        let exact = Bounded { value: 1.5, low: 1.499, high: 1.502 };
        let mean = Mean { of: Sample { of: Values::Times, unit: 1.0 }, share: 1.0, exact, spread };
        let mut decided = [0; 2];
        for (i, tally) in odd_tallies(1).enumerate() {
            let tolerance = [0.0, 0.01, 0.1, 0.3][i % 4];
            let evidence = mean.evaluate(&tally, tolerance, ALPHA);
            let verdict = of_interval(evidence.interval.unwrap(), exact, tolerance, false);
            assert_eq!(evidence.p_value.unwrap() <= ALPHA, verdict == Verdict::Disagree, "{evidence:?}");
            decided[usize::from(verdict == Verdict::Disagree)] += 1;
        }
        assert!(decided.iter().all(|count| *count > 500), "{decided:?}");
    }

    // A time of 1 or 2 steps: the mean is a binomial count, so the true level is an exact sum. A tenth of excess is allowed
    // by the expansion, and as much again for what it leaves out; without the least size the excess is far above that.
    #[test]
    fn the_interval_holds_its_level_from_the_least_size_on() {
        let level = |p: f64, n: u64| -> f64 {
            let missed = masses(n, p).into_iter().filter(|(twos, _)| {
                let tally = tally(&[(0, 1, n - twos), (0, 2, *twos)]);
                let sums = tally.all();
                let interval = mean_interval(sums.mean().unwrap(), sums.variance().unwrap(), n, ALPHA).unwrap();
                !interval.contains(1.0 + p)
            });
            missed.map(|(_, mass)| mass).sum()
        };
        for p in [0.5, 0.47, 0.4, 0.3, 0.2, 0.1, 0.05] {
            let variance: f64 = p * (1.0 - p);
            let skewness = (1.0 - 2.0 * p) / variance.sqrt();
            let excess_kurtosis = (1.0 - 6.0 * variance) / variance;
            let spread = Spread { standard_deviation: variance.sqrt(), skewness, excess_kurtosis };
            let least = spread.least_size(ALPHA);
            let ratio = level(p, least) / ALPHA;
            assert!(ratio < 1.2, "{p}: {ratio} at {least}");
        }
        assert!(level(0.05, 500) > 1.5 * ALPHA);
        assert!(level(0.5, 8) > 1.0 * ALPHA);
    }

    #[test]
    fn few_replications_are_premature_and_the_size_there_is_random() {
        let spread = Spread { standard_deviation: 1.0, skewness: 2.0, excess_kurtosis: 6.0 };
        let least = spread.least_size(ALPHA);
        let mean = Mean {
            of: Sample { of: Values::TimesIn(vec![1]), unit: 1.0 },
            share: 0.1,
            exact: Bounded::exactly(1.5),
            spread,
        };
        let evidence =
            |there: u64| mean.evaluate(&tally(&[(0, 1, 10 * there), (1, 1, there - 1), (1, 2, 1)]), 0.1, ALPHA);
        assert_eq!(evidence(least).premature, None);
        let text = evidence(least - 1).premature.unwrap();
        assert!(text.contains("that finish there"), "{text}");
        // At ten times the least size about half of all runs have too few there.
        let miss = |n: u64| mean.miss_probability(10.0, n, ALPHA);
        assert!((0.45..0.55).contains(&miss(10 * least)));
        assert!(miss(12 * least) < 1e-3);
    }

    #[test]
    fn nothing_and_one_observation_have_no_interval() {
        let spread = Spread { standard_deviation: 0.5, skewness: 0.0, excess_kurtosis: -2.0 };
        let mean =
            Mean { of: Sample { of: Values::Times, unit: 1.0 }, share: 1.0, exact: Bounded::exactly(1.5), spread };
        for (tally, estimate) in [(tally(&[]), None), (tally(&[(0, 4, 1)]), Some(4.0))] {
            let evidence = mean.evaluate(&tally, 0.1, ALPHA);
            assert_eq!((evidence.estimate, evidence.interval, evidence.p_value), (estimate, None, None));
            assert!(evidence.premature.is_some());
        }
        // Equal observations: a point, far from the answer at any level.
        let evidence = mean.evaluate(&tally(&[(0, 1, 2000)]), 0.1, ALPHA);
        assert_eq!(evidence.p_value, Some(0.0));
    }
}
