//! Quantiles of the time, by order statistics.

use crate::exact::{Bounded, Law};
use crate::sampling::Tally;
use crate::statistics::{Interval, lower_tail, quantile_p_value, quantile_ranks, upper_tail};

use super::Guarantee;
use super::method::{Evidence, Method};
use super::words::{counted, rounded};

/// Single times that the tally keeps apart on either side of a quantile, so that interval and estimate can be told.
const KEPT_APART: u64 = 512;

/// The smallest t with P(time ≤ t) ≥ p.
#[derive(Debug)]
pub(super) struct Quantile<'a> {
    pub(super) p: f64,
    /// One whole number, or two neighbours that the bounds of the law leave, in steps or ticks.
    pub(super) exact: Bounded,
    pub(super) law: &'a Law,
    /// Steps, or ticks, in the unit of the clock.
    pub(super) unit: f64,
}

/// The whole times at which a verdict turns.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Turns {
    /// Lower and upper end of the times that are within the tolerance of every candidate.
    within_all: (u64, u64),
    /// Lower and upper end of the times that are within the tolerance of any candidate.
    within_any: (u64, u64),
}

impl Turns {
    fn of(exact: Bounded, tolerance: f64) -> Self {
        // Casting saturates: no time is below 0.
        let up = |time: f64| time.ceil() as u64;
        let down = |time: f64| time.floor() as u64;
        Self {
            within_all: (up(exact.high - tolerance), down(exact.low + tolerance)),
            within_any: (up(exact.low - tolerance), down(exact.high + tolerance)),
        }
    }
}

impl Quantile<'_> {
    fn turns(&self, tolerance: f64) -> Turns {
        Turns::of(self.exact, tolerance * self.unit)
    }

    /// P(time ≤ t) from below and from above; nothing is below time 0.
    fn at_most(&self, time: Option<u64>) -> Bounded {
        time.map_or(Bounded::exactly(0.0), |time| self.law.at_or_below(time))
    }

    /// By how much more than p, and by how much less, the law passes both ends of what agrees.
    pub(super) fn margins(&self, tolerance: f64) -> (f64, f64) {
        let (low, high) = self.turns(tolerance).within_all;
        let above = self.at_most(Some(high)).low - self.p;
        let below = self.p - self.at_most(low.checked_sub(1)).high;
        (above, below)
    }
}

impl Method for Quantile<'_> {
    fn name(&self) -> &'static str {
        "order statistics"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Exact
    }

    fn cuts(&self, tolerance: f64) -> Vec<u64> {
        let Turns { within_all: all, within_any: any } = self.turns(tolerance);
        let mut cuts: Vec<u64> = [all.0, any.0].iter().filter_map(|low| low.checked_sub(1)).collect();
        cuts.extend([all.1, any.1]);
        let (low, high) = (self.exact.low as u64, self.exact.high as u64);
        // Single steps, but no single ticks: nothing depends on one of them.
        let apart = if self.unit == 1.0 { KEPT_APART } else { 0 };
        let near = low.saturating_sub(apart)..=high.saturating_add(apart);
        let apart_at_most = (high - low) / (2 * KEPT_APART) + 1;
        cuts.extend(near.step_by(apart_at_most as usize));
        // Beyond them, steps that are small against the tolerance.
        let step = ((any.1 - any.0) / KEPT_APART).max(1) as usize;
        cuts.extend((any.0..=any.1).step_by(step));
        cuts
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let Some(ranks) = quantile_ranks(n, self.p, alpha) else { return 1.0 };
        let (low, high) = self.turns(tolerance).within_all;
        if low > high {
            return 1.0;
        }
        // The upper end passes if fewer observations than its rank are at or below `high`, the lower end if as many as
        // its rank are below `low`.
        let above = lower_tail(n, self.at_most(Some(high)).low, ranks.upper - 1);
        let below = upper_tail(n, self.at_most(low.checked_sub(1)).high, ranks.lower);
        (above + below).min(1.0)
    }

    fn never_agrees(&self, tolerance: f64) -> Option<String> {
        let Turns { within_all: (low, high), .. } = self.turns(tolerance);
        if low > high {
            let [low, high] = [self.exact.low, self.exact.high].map(|time| time / self.unit);
            return Some(format!(
                "the law leaves {low} and {high} as the exact answer, which the tolerance tells apart"
            ));
        }
        let (above, below) = self.margins(tolerance);
        (above <= 0.0 || below <= 0.0).then(|| {
            let end = if above <= 0.0 { high } else { low.saturating_sub(1) } as f64 / self.unit;
            format!(
                "P(time ≤ {end}) is {} itself, so the interval reaches beyond it however many replications there are",
                self.p
            )
        })
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let n = tally.replications();
        let located = Located::new(tally);
        let estimate = located.first(|count| count as f64 / n as f64 >= self.p);
        let Some(ranks) = quantile_ranks(n, self.p, alpha) else {
            let few = format!("{} replications are too few to enclose this quantile", counted(n));
            return Evidence {
                estimate: estimate.map(|cell| cell.1 as f64 / self.unit),
                premature: Some(few),
                ..Evidence::default()
            };
        };
        // Whoever lies in a cell of several times is taken at its outer end.
        let lower = located.first(|count| count >= ranks.lower).map(|cell| cell.0);
        let upper = located.first(|count| count >= ranks.upper).map(|cell| cell.1);
        let (low, high) = self.turns(tolerance).within_any;
        let below = low.checked_sub(1).map_or(0, |time| at_or_below(tally, time));
        Evidence {
            estimate: estimate.map(|cell| cell.1 as f64 / self.unit),
            standard_error: None,
            interval: lower
                .zip(upper)
                .map(|(low, high)| Interval { low: low as f64 / self.unit, high: high as f64 / self.unit }),
            p_value: Some(quantile_p_value(n, self.p, at_or_below(tally, high), below)),
            premature: None,
            note: estimate
                // Ticks are many: what matters is how far apart they are against the tolerance.
                .filter(|(from, to)| {
                    from < to && (self.unit == 1.0 || (to - from) as f64 > 0.01 * tolerance * self.unit)
                })
                .map(|(from, to)| {
                    let [from, to] = [from, to].map(|time| rounded(time as f64 / self.unit));
                    format!("the estimate is located between {from} and {to} only")
                }),
        }
    }
}

fn at_or_below(tally: &Tally, time: u64) -> u64 {
    match tally.at_or_below(time) {
        Some(count) => count,
        None => panic!("the tally does not cut at time {time}"),
    }
}

/// The order statistics of a tally, as far as its cells tell them.
struct Located<'t> {
    tally: &'t Tally,
    /// How many outcomes there are up to the end of each cell.
    counts: Vec<u64>,
    smallest: u64,
    largest: u64,
}

impl<'t> Located<'t> {
    fn new(tally: &'t Tally) -> Self {
        let mut counts = vec![0; tally.grid().cells()];
        for end in 0..tally.ends() {
            counts.iter_mut().zip(tally.cells(end)).for_each(|(sum, count)| *sum += count);
        }
        let mut sum = 0;
        for count in &mut counts {
            sum += *count;
            *count = sum;
        }
        let ends = || 0..tally.ends();
        let smallest = ends().filter_map(|end| tally.smallest(end)).min().unwrap_or(0);
        let largest = ends().filter_map(|end| tally.largest(end)).max().unwrap_or(0);
        Self { tally, counts, smallest, largest }
    }

    /// The first and the last time between which the outcome lies that makes the count of all up to it fulfil `enough`;
    /// `None` if not even all outcomes do.
    fn first(&self, enough: impl Fn(u64) -> bool) -> Option<(u64, u64)> {
        let cell = self.counts.partition_point(|count| !enough(*count));
        if cell == self.counts.len() {
            return None;
        }
        let edges = self.tally.grid().edges();
        let from = cell.checked_sub(1).map_or(0, |before| edges[before] + 1);
        let to = edges.get(cell).copied().unwrap_or(u64::MAX);
        Some((from.max(self.smallest), to.min(self.largest)))
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::super::verdict::{Verdict, of_interval};
    use super::*;
    use crate::exact::{Exact, Request};
    use crate::model::{Model, Quantity, Silent};
    use crate::sampling::Grid;

    const ALPHA: f64 = 0.01 / 14.0;

    /// A geometric time that ends with probability 0.03 a step.
    fn geometric() -> Model {
        let text = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = 0.03, a = \"rest\" }\n";
        Model::from_toml(text).unwrap()
    }

    fn with_law(test: impl FnOnce(&Law)) {
        let model = geometric();
        let exact = Exact::solve(&model, &Request::of(&model, &[Quantity::Law]), &Silent).unwrap();
        test(exact.law().unwrap());
    }

    fn tally(times: &[u64], cuts: Vec<u64>) -> Tally {
        let mut tally = Tally::new(2, Arc::new(Grid::new(cuts)));
        times.iter().enumerate().for_each(|(i, time)| tally.add(i % 2, *time));
        tally
    }

    /// Many ties: times of a few sizes around a place.
    fn tied_times(draw: &mut impl FnMut(u64) -> u64) -> Vec<u64> {
        let (n, width, place) = (300 + draw(400), 1 + draw(30), draw(60));
        (0..n).map(|_| place + draw(width).min(draw(width))).collect()
    }

    // 3,000 samples with ties, against sorted lists: every time is cut here.
    #[test]
    fn interval_and_estimate_are_those_of_the_sorted_sample() {
        let mut rng = Lcg128CmDxsm64::new(21, 5);
        let mut draw = |below: u64| rng.next_u64() % below;
        with_law(|law| {
            for case in 0..3000 {
                let p = [0.5, 0.9, 0.05][case % 3];
                let mut times = tied_times(&mut draw);
                let tally = tally(&times, (0..120).collect());
                times.sort_unstable();
                let n = times.len() as u64;
                let quantile = Quantile { p, exact: law.quantile(p).unwrap(), law, unit: 1.0 };
                let evidence = quantile.evaluate(&tally, 1.0, ALPHA);
                let ranks = quantile_ranks(n, p, ALPHA).unwrap();
                let of_rank = |rank: u64| times[rank as usize - 1] as f64;
                let interval = Interval { low: of_rank(ranks.lower), high: of_rank(ranks.upper) };
                assert_eq!(evidence.interval, Some(interval), "case {case}");
                // min{t : F̂(t) ≥ p} is the observation of rank ⌈np⌉; 300 to 700 times these p never round across.
                assert_eq!(evidence.estimate, Some(of_rank((n as f64 * p - 1e-9).ceil() as u64)));
                assert_eq!(evidence.note, None);
            }
        });
    }

    // The same samples over the few cuts that a verdict needs: the ends move outwards, within their cells, and neither the
    // verdict nor the p-value changes. It agrees with the level throughout.
    #[test]
    fn few_cuts_give_the_same_verdict() {
        let mut rng = Lcg128CmDxsm64::new(22, 5);
        let mut draw = |below: u64| rng.next_u64() % below;
        let mut decided = [0; 4];
        with_law(|law| {
            for case in 0..6000 {
                let p = [0.5, 0.9, 0.05][case % 3];
                let single = law.quantile(p).unwrap();
                // Now and then the law leaves two candidates.
                let exact = if case % 5 == 0 { Bounded { high: single.high + 1.0, ..single } } else { single };
                let quantile = Quantile { p, exact, law, unit: 1.0 };
                let tolerance = [1.0, 2.5, 7.0, 200.0][case / 3 % 4];
                let turns = Turns::of(exact, tolerance);
                let needed = [turns.within_all.0, turns.within_any.0].map(|low| low.wrapping_sub(1));
                let needed = needed.into_iter().chain([turns.within_all.1, turns.within_any.1]).collect();
                let times = tied_times(&mut draw);
                let fine = quantile.evaluate(&tally(&times, (0..400).collect()), tolerance, ALPHA);
                let coarse = quantile.evaluate(&tally(&times, needed), tolerance, ALPHA);
                let verdict = |evidence: &Evidence| of_interval(evidence.interval.unwrap(), exact, tolerance, false);
                assert_eq!(verdict(&fine), verdict(&coarse), "case {case}");
                assert_eq!(fine.p_value, coarse.p_value);
                assert_eq!(fine.p_value.unwrap() <= ALPHA, verdict(&fine) == Verdict::Disagree);
                let (inner, outer) = (fine.interval.unwrap(), coarse.interval.unwrap());
                assert!(outer.low <= inner.low && inner.high <= outer.high);
                decided[verdict(&fine) as usize] += 1;
            }
        });
        assert!([0, 2, 3].iter().all(|verdict| decided[*verdict] > 100), "{decided:?}");
    }

    // P(X ≤ k) and P(X ≥ k) of the two counts that decide, against all pairs of counts: at most their sum, and within one
    // part in a thousand of it, since both at once are next to impossible.
    #[test]
    fn the_chance_to_miss_is_that_of_either_count() {
        with_law(|law| {
            let quantile = Quantile { p: 0.9, exact: law.quantile(0.9).unwrap(), law, unit: 1.0 };
            // q = ⌈ln 0.1/ln 0.97⌉ = 76.
            assert_eq!(quantile.exact, Bounded::exactly(76.0));
            let (n, tolerance) = (5000, 8.0);
            let ranks = quantile_ranks(n, 0.9, ALPHA).unwrap();
            let at_most = |time: i32| 1.0 - 0.97_f64.powi(time);
            let above = lower_tail(n, at_most(84), ranks.upper - 1);
            let below = upper_tail(n, at_most(67), ranks.lower);
            let miss = quantile.miss_probability(tolerance, n, ALPHA);
            assert!((miss / (above + below) - 1.0).abs() < 1e-9);
            assert!((0.01..0.3).contains(&miss), "{miss}");
            assert_eq!(quantile.miss_probability(tolerance, 3, ALPHA), 1.0);
        });
    }

    #[test]
    fn what_no_size_decides_is_said() {
        with_law(|law| {
            let two = Bounded { value: 23.0, low: 23.0, high: 24.0 };
            let quantile = Quantile { p: 0.5, exact: two, law, unit: 1.0 };
            assert!(quantile.never_agrees(0.5).unwrap().contains("23 and 24"));
            assert!(quantile.never_agrees(0.75).unwrap().contains("tells apart"));
            assert_eq!(quantile.miss_probability(0.75, 1 << 40, ALPHA), 1.0);
            assert_eq!(quantile.never_agrees(1.0), None);
            // A level that the law takes: F(23) itself.
            let p = law.at_or_below(23).value;
            let on_jump = Quantile { p, exact: Bounded::exactly(23.0), law, unit: 1.0 };
            assert!(on_jump.never_agrees(0.0).unwrap().contains("however many replications"));
        });
    }

    #[test]
    fn too_few_replications_enclose_nothing() {
        with_law(|law| {
            let quantile = Quantile { p: 0.9, exact: law.quantile(0.9).unwrap(), law, unit: 1.0 };
            for times in [&[][..], &[40], &[80; 50]] {
                let evidence = quantile.evaluate(&tally(times, quantile.cuts(1.0)), 1.0, ALPHA);
                assert_eq!((evidence.interval, evidence.p_value), (None, None));
                assert_eq!(evidence.estimate, times.first().map(|time| *time as f64));
                assert!(evidence.premature.unwrap().contains("too few to enclose"));
            }
        });
    }

    #[test]
    fn an_estimate_in_a_wide_cell_says_so() {
        with_law(|law| {
            let quantile = Quantile { p: 0.5, exact: law.quantile(0.5).unwrap(), law, unit: 1.0 };
            let times: Vec<u64> = (0..2000).map(|i| 5000 + i % 100).collect();
            let evidence = quantile.evaluate(&tally(&times, quantile.cuts(1.0)), 1.0, ALPHA);
            assert_eq!(evidence.interval, Some(Interval { low: 5000.0, high: 5099.0 }));
            assert_eq!(evidence.note.unwrap(), "the estimate is located between 5000 and 5099 only");
        });
    }
}
