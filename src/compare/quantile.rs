//! Quantiles of the time, by order statistics.

use crate::exact::{Bounded, Law};
use crate::sampling::Tally;
use crate::statistics::{Interval, lower_tail, quantile_p_value, quantile_ranks, upper_tail};

use super::Guarantee;
use super::method::{Evidence, Method};
use super::words::counted;

/// Single times that the tally keeps apart on either side of a quantile, so that interval and estimate can be told.
const KEPT_APART: u64 = 512;

/// The smallest t with P(time ≤ t) ≥ p.
#[derive(Debug)]
pub(super) struct Quantile<'a> {
    pub(super) p: f64,
    /// One whole number, or two neighbours that the bounds of the law leave.
    pub(super) exact: Bounded,
    pub(super) law: &'a Law,
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
    /// P(time ≤ t) from below and from above; nothing is below time 0.
    fn at_most(&self, time: Option<u64>) -> Bounded {
        time.map_or(Bounded::exactly(0.0), |time| self.law.at_or_below(time))
    }

    /// By how much more than p, and by how much less, the law passes both ends of what agrees.
    pub(super) fn margins(&self, tolerance: f64) -> (f64, f64) {
        let (low, high) = Turns::of(self.exact, tolerance).within_all;
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
        let Turns { within_all: all, within_any: any } = Turns::of(self.exact, tolerance);
        let mut cuts: Vec<u64> = [all.0, any.0].iter().filter_map(|low| low.checked_sub(1)).collect();
        cuts.extend([all.1, any.1]);
        let (low, high) = (self.exact.low as u64, self.exact.high as u64);
        cuts.extend(low.saturating_sub(KEPT_APART)..=high.saturating_add(KEPT_APART));
        // Beyond them, steps that are small against the tolerance.
        let step = ((any.1 - any.0) / KEPT_APART).max(1) as usize;
        cuts.extend((any.0..=any.1).step_by(step));
        cuts
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let Some(ranks) = quantile_ranks(n, self.p, alpha) else { return 1.0 };
        let (low, high) = Turns::of(self.exact, tolerance).within_all;
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
        let Turns { within_all: (low, high), .. } = Turns::of(self.exact, tolerance);
        if low > high {
            let Bounded { low, high, .. } = self.exact;
            return Some(format!(
                "the law leaves {low} and {high} as the exact answer, which the tolerance tells apart"
            ));
        }
        let (above, below) = self.margins(tolerance);
        (above <= 0.0 || below <= 0.0).then(|| {
            let end = if above <= 0.0 { high } else { low.saturating_sub(1) };
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
                estimate: estimate.map(|cell| cell.1 as f64),
                premature: Some(few),
                ..Evidence::default()
            };
        };
        // Whoever lies in a cell of several times is taken at its outer end.
        let lower = located.first(|count| count >= ranks.lower).map(|cell| cell.0);
        let upper = located.first(|count| count >= ranks.upper).map(|cell| cell.1);
        let (low, high) = Turns::of(self.exact, tolerance).within_any;
        let below = low.checked_sub(1).map_or(0, |time| at_or_below(tally, time));
        Evidence {
            estimate: estimate.map(|cell| cell.1 as f64),
            standard_error: None,
            interval: lower.zip(upper).map(|(low, high)| Interval { low: low as f64, high: high as f64 }),
            p_value: Some(quantile_p_value(n, self.p, at_or_below(tally, high), below)),
            premature: None,
            note: estimate
                .filter(|(from, to)| from < to)
                .map(|(from, to)| format!("the estimate is located between {from} and {to} only")),
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
