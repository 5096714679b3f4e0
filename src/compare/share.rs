//! The share of replications to which something happens: an end, a group, a time that is passed, a state or set that is
//! met.

use crate::exact::Bounded;
use crate::sampling::{Observable, Tally};
use crate::statistics::{agree_miss_probability, binomial_agree_miss_probability, binomial_p_value, clopper_pearson};

use super::Guarantee;
use super::method::{Evidence, Method};
use super::sample::recorded;

/// From this variance of the count on, the normal approximation serves for sizes.
const NORMAL_FROM: f64 = 5000.0;

/// Something that happens to a replication or does not.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Event {
    /// It finishes in one of these ends.
    Ends(Vec<usize>),
    /// It takes longer than this.
    LongerThan(u64),
    /// It meets the state or the set of an observable.
    Met(Observable),
}

impl Event {
    /// How often it happened.
    ///
    /// # Panics
    /// When the tally has no such end, does not cut at the time, or does not record the observable.
    pub(super) fn count(&self, tally: &Tally) -> u64 {
        match self {
            Self::Ends(ends) => tally.count_of(ends),
            Self::LongerThan(time) => {
                let Some(within) = tally.at_or_below(*time) else { panic!("the tally does not cut at time {time}") };
                tally.replications() - within
            }
            Self::Met(observable @ Observable::Hit(_)) => recorded(tally, *observable).sums().count(),
            Self::Met(observable) => recorded(tally, *observable).above_zero(),
        }
    }

    /// What must be recorded to count it.
    pub(super) fn observes(&self) -> Option<Observable> {
        match self {
            Self::Met(observable) => Some(*observable),
            _ => None,
        }
    }

    /// Where the tally must cut to count it.
    pub(super) fn cuts(&self) -> Vec<u64> {
        match self {
            Self::Ends(_) | Self::Met(_) => Vec::new(),
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

    fn observes(&self) -> Option<Observable> {
        self.event.observes()
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

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::verdict::{Verdict, of_interval};
    use super::*;
    use crate::sampling::Grid;

    const ALPHA: f64 = 0.01 / 14.0;

    fn share(p: f64) -> Share {
        Share { event: Event::Ends(vec![0]), exact: Bounded { value: p, low: p - 1e-7, high: p + 1e-7 } }
    }

    fn tally(count: u64, n: u64) -> Tally {
        let mut tally = Tally::new(2, Arc::new(Grid::new(vec![])));
        tally.add_many(0, 1, count);
        tally.add_many(1, 1, n - count);
        tally
    }

    fn verdict(share: &Share, tolerance: f64, count: u64, n: u64) -> Verdict {
        let evidence = share.evaluate(&tally(count, n), tolerance, ALPHA);
        of_interval(evidence.interval.unwrap(), share.exact, tolerance, false)
    }

    /// P(X = k) for k = 0..=n, by the ratio of neighbours from the mode outwards.
    fn masses(n: u64, p: f64) -> Vec<f64> {
        let mode = (n as f64 * p) as usize;
        let mut mass = vec![0.0; n as usize + 1];
        mass[mode] = 1.0;
        let up = |k: usize| (n as f64 - k as f64) / (k as f64 + 1.0) * p / (1.0 - p);
        (mode..n as usize).for_each(|k| mass[k + 1] = mass[k] * up(k));
        (0..mode).rev().for_each(|k| mass[k] = mass[k + 1] / up(k));
        let total: f64 = mass.iter().sum();
        mass.iter().map(|x| x / total).collect()
    }

    /// The chance of a verdict when the program's probability is `truth`.
    fn chance(share: &Share, tolerance: f64, truth: f64, n: u64, of: impl Fn(Verdict) -> bool) -> f64 {
        let masses = masses(n, truth);
        let counts = (0..=n).filter(|k| masses[*k as usize] > 1e-18);
        counts.filter(|k| of(verdict(share, tolerance, *k, n))).map(|k| masses[k as usize]).sum()
    }

    // Every count of 3 sizes, 4 probabilities, 3 tolerances: 48,000 tallies. The interval is found by solving for its ends
    // and the p-value by a tail, so this compares two computations.
    #[test]
    fn the_p_value_is_below_the_level_exactly_when_the_interval_disagrees() {
        let mut decided = [0; 2];
        for n in [50, 777, 3000] {
            for p in [0.5, 0.03, 0.001, 0.98] {
                let share = share(p);
                for tolerance in [0.0, 0.004, 0.03] {
                    for count in 0..=n {
                        let evidence = share.evaluate(&tally(count, n), tolerance, ALPHA);
                        let disagrees = verdict(&share, tolerance, count, n) == Verdict::Disagree;
                        assert_eq!(evidence.p_value.unwrap() <= ALPHA, disagrees, "{count} of {n}, {p} ± {tolerance}");
                        decided[usize::from(disagrees)] += 1;
                    }
                }
            }
        }
        assert!(decided.iter().all(|count| *count > 1000));
    }

    // Exact sums over all counts, no sampling.
    #[test]
    fn wrong_verdicts_are_as_rare_as_promised_at_the_edges_of_the_tolerance() {
        for (p, tolerance, n) in [(0.5, 0.02, 6000), (0.1, 0.01, 6000), (0.01, 0.004, 5000), (0.97, 0.01, 3000)] {
            let share = share(p);
            for sign in [-1.0, 1.0] {
                let false_alarm =
                    chance(&share, tolerance, p + sign * tolerance, n, |verdict| verdict == Verdict::Disagree);
                assert!(false_alarm <= 0.5 * ALPHA, "{p} {tolerance} {n}: {false_alarm}");
                let passed =
                    chance(&share, tolerance, p + sign * 1.01 * tolerance, n, |verdict| verdict == Verdict::Agree);
                assert!(passed <= 0.5 * ALPHA, "{p} {tolerance} {n}: {passed}");
            }
        }
    }

    #[test]
    fn the_chance_to_miss_is_that_of_all_counts_that_do_not_agree() {
        for (p, tolerance, n) in [(0.5, 0.05, 9000), (0.02, 0.005, 9000), (0.001, 0.0015, 20_000), (0.999, 0.002, 9000)]
        {
            let share = share(p);
            assert!(p * (1.0 - p) * (n as f64) < NORMAL_FROM);
            let missed = chance(&share, tolerance, p, n, |verdict| verdict != Verdict::Agree);
            let planned = share.miss_probability(tolerance, n, ALPHA);
            assert!((planned / missed - 1.0).abs() < 1e-6, "{p}: {planned} against {missed}");
        }
    }

    // From there on by the normal approximation, which is a guide: a few per cent of a miss of 5 %.
    #[test]
    fn the_normal_chance_to_miss_is_close_where_it_is_used() {
        let share = share(0.5);
        for tolerance in [0.017, 0.019, 0.021] {
            let n = 20_001;
            let missed = chance(&share, tolerance, 0.5, n, |verdict| verdict != Verdict::Agree);
            let planned = share.miss_probability(tolerance, n, ALPHA);
            assert!((0.85..1.15).contains(&(planned / missed)), "{planned} against {missed}");
        }
    }

    #[test]
    fn survival_counts_what_is_left_after_a_cut() {
        let event = Event::LongerThan(5);
        let mut tally = Tally::new(1, Arc::new(Grid::new(event.cuts())));
        [1, 5, 6, 900].iter().for_each(|time| tally.add(0, *time));
        assert_eq!(event.count(&tally), 2);
    }

    #[test]
    fn no_replications_are_no_evidence() {
        assert_eq!(share(0.5).evaluate(&tally(0, 0), 0.1, ALPHA), Evidence::default());
    }
}
