//! The law of end and time, by the distance of distribution functions and by chi-square.

use crate::exact::{Bounded, Exact, Law};
use crate::sampling::Tally;
use crate::statistics::{GoodnessOfFit, Interval, dkw_half_width, dkw_level, law_size, pooled_chi_square};

use super::Guarantee;
use super::distance::{Distance, Point, widest_gap};
use super::method::{Evidence, Method};
use super::words::rounded;

/// The level of the note that the law differs detectably. It is the note's own: no verdict rests on it.
const NOTE_LEVEL: f64 = 1e-3;

/// A cell of the chi-square test expects at least this many outcomes, and at least this share of all, so that the limit
/// holds far out in the tail.
const FEWEST_EXPECTED: f64 = 25.0;
const SMALLEST_SHARE: f64 = 1.0 / 256.0;

/// F(e, t) = P(end = e, time ≤ t) for every end that can be reached, and P(time ≤ t).
#[derive(Debug)]
pub(super) struct Curves<'a> {
    law: &'a Law,
    /// The ends that can be reached, with their probabilities.
    ends: Vec<(usize, Bounded)>,
    /// What an unknown course between the edges may add to a distance.
    widest_gap: f64,
}

impl<'a> Curves<'a> {
    pub(super) fn new(exact: &Exact<'_>, law: &'a Law) -> Self {
        let ends = (0..exact.model().chain().ends().len())
            .map(|end| (end, exact.absorption(&[end])))
            .filter(|(_, probability)| probability.high > 0.0)
            .collect();
        let mut curves = Self { law, ends, widest_gap: 0.0 };
        let gaps = curves.all(|_, _| 0.0).map(widest_gap);
        curves.widest_gap = gaps.fold(0.0, f64::max);
        curves
    }

    /// Functions that are compared at once.
    fn bands(&self) -> u64 {
        self.ends.len() as u64 + 1
    }

    /// Each function as points; `share` gives the sample's share up to a time, or in all, of an end or of all.
    ///
    /// Before each edge stands the time one step earlier. What of an end lies between the edges before and that time is no
    /// more than what of all ends does, which the law knows at every step; so a step of any size ends a cell alone.
    fn all<'c>(
        &'c self,
        share: impl Fn(Option<usize>, Option<u64>) -> f64 + Copy + 'c,
    ) -> impl Iterator<Item = impl Iterator<Item = Point> + 'c> + 'c {
        let curves = self.ends.iter().map(|(end, all)| (Some(*end), *all)).chain([(None, Bounded::exactly(1.0))]);
        curves.map(move |(end, all)| {
            let times = steps(self.law.edges()).map(Some).chain([None]);
            let mut edge = 0;
            times.map(move |time| {
                let share = share(end, time);
                let Some(at) = time else { return Point { time, exact: all, share } };
                let exact = match end {
                    None => self.law.at_or_below(at),
                    Some(end) if self.law.edges()[edge] == at => self.law.at_edge(end, edge),
                    Some(end) => self.before_edge(end, edge, share),
                };
                edge += usize::from(self.law.edges()[edge] == at);
                Point { time, exact, share }
            })
        })
    }

    /// P(end = e, time < edge), where only that of all ends is known. The value is the one nearest to the sample.
    fn before_edge(&self, end: usize, edge: usize, share: f64) -> Bounded {
        let nothing = Bounded::exactly(0.0);
        let (left, all_left) = match edge.checked_sub(1) {
            Some(before) => (self.law.at_edge(end, before), self.law.at_or_below(self.law.edges()[before])),
            None => (nothing, nothing),
        };
        let between = self.law.at_or_below(self.law.edges()[edge] - 1).high - all_left.low;
        let low = left.low;
        let high = (left.high + between).min(self.law.at_edge(end, edge).high).max(low);
        Bounded { value: share.clamp(low, high), low, high }
    }

    /// How far a tally is from the law.
    fn distance(&self, tally: &Tally) -> Distance {
        let n = tally.replications() as f64;
        let counts = Counts::new(tally);
        let share = |end: Option<usize>, time: Option<u64>| counts.of(end, time) as f64 / n;
        self.all(&share).map(Distance::of).fold(Distance::default(), Distance::max)
    }

    /// The test of equal laws; `None` when too little is expected for two cells.
    fn chi_square(&self, tally: &Tally) -> Option<GoodnessOfFit> {
        let counts = Counts::new(tally);
        let mut observed = Vec::new();
        let mut expected = Vec::new();
        for (end, all) in &self.ends {
            let edges =
                self.law.edges().iter().enumerate().map(|(edge, time)| (self.law.at_edge(*end, edge), Some(*time)));
            let (mut count_before, mut probability_before) = (0, 0.0);
            for (probability, time) in edges.chain([(*all, None)]) {
                let count = counts.of(Some(*end), time);
                observed.push(count - count_before);
                expected.push((probability.value - probability_before).max(0.0));
                (count_before, probability_before) = (count, probability.value);
            }
        }
        let fewest = FEWEST_EXPECTED.max(SMALLEST_SHARE * tally.replications() as f64);
        pooled_chi_square(&observed, &expected, fewest)
    }
}

/// The times at which a tally must cut for a law that is kept at these edges: each with the step before it.
fn steps(edges: &[u64]) -> impl Iterator<Item = u64> {
    edges.iter().enumerate().flat_map(|(at, edge)| {
        let after = at.checked_sub(1).map_or(0, |before| edges[before] + 1);
        let before = edge.checked_sub(1).filter(|before| *before >= after);
        before.into_iter().chain([*edge])
    })
}

/// Counts of a tally up to its cuts.
struct Counts<'t> {
    tally: &'t Tally,
    /// Up to each cut and in all: for every end, and for all together at the end.
    up_to: Vec<Vec<u64>>,
}

impl<'t> Counts<'t> {
    fn new(tally: &'t Tally) -> Self {
        let mut total = vec![0; tally.grid().cells()];
        let mut up_to: Vec<Vec<u64>> = Vec::with_capacity(tally.ends() + 1);
        for end in 0..tally.ends() {
            let mut sum = 0;
            let running = tally.cells(end).iter().map(|count| {
                sum += count;
                sum
            });
            let counts: Vec<u64> = running.collect();
            total.iter_mut().zip(&counts).for_each(|(sum, count)| *sum += count);
            up_to.push(counts);
        }
        up_to.push(total);
        Self { tally, up_to }
    }

    /// Up to a cut, or in all; of an end, or of all.
    ///
    /// # Panics
    /// When the tally does not cut there.
    fn of(&self, end: Option<usize>, time: Option<u64>) -> u64 {
        let counts = &self.up_to[end.unwrap_or(self.tally.ends())];
        let Some(time) = time else { return counts[counts.len() - 1] };
        match self.tally.grid().cell_ending_at(time) {
            Some(cell) => counts[cell],
            None => panic!("the tally does not cut at time {time}"),
        }
    }
}

/// The distance D with the band of Dvoretzky, Kiefer, Wolfowitz and Massart.
#[derive(Debug)]
pub(super) struct Band<'a>(pub(super) Curves<'a>);

impl Method for Band<'_> {
    fn name(&self) -> &'static str {
        "Dvoretzky–Kiefer–Wolfowitz–Massart band"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Exact
    }

    fn cuts(&self, _tolerance: f64) -> Vec<u64> {
        steps(self.0.law.edges()).collect()
    }

    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let bands = self.0.bands();
        dkw_level(tolerance - self.0.widest_gap - dkw_half_width(n, bands, alpha), n, bands)
    }

    fn never_agrees(&self, tolerance: f64) -> Option<String> {
        let gap = self.0.widest_gap;
        (gap >= tolerance).then(|| format!("the exact law is kept in cells of up to {} only", rounded(gap)))
    }

    fn evaluate(&self, tally: &Tally, tolerance: f64, alpha: f64) -> Evidence {
        let n = tally.replications();
        if n == 0 {
            return Evidence::default();
        }
        let (distance, bands) = (self.0.distance(tally), self.0.bands());
        let half_width = dkw_half_width(n, bands, alpha);
        let interval =
            Interval { low: (distance.at_least - half_width).max(0.0), high: (distance.at_most + half_width).min(1.0) };
        let detectable = self.0.chi_square(tally).filter(|fit| fit.p_value <= NOTE_LEVEL);
        Evidence {
            estimate: Some(distance.seen),
            standard_error: None,
            interval: Some(interval),
            p_value: Some(dkw_level(distance.at_least - tolerance, n, bands)),
            premature: None,
            note: detectable
                .map(|fit| format!("the law differs detectably (pooled chi-square, p = {})", rounded(fit.p_value))),
        }
    }
}

/// The pooled chi-square test, where no difference at all is tolerated.
#[derive(Debug)]
pub(super) struct ChiSquare<'a>(pub(super) Curves<'a>);

impl Method for ChiSquare<'_> {
    fn name(&self) -> &'static str {
        "pooled chi-square"
    }

    fn guarantee(&self) -> Guarantee {
        Guarantee::Approximate
    }

    fn cuts(&self, _tolerance: f64) -> Vec<u64> {
        steps(self.0.law.edges()).collect()
    }

    /// The size from which the band of D would see the tolerance: chi-square has no size for a distance.
    fn miss_probability(&self, tolerance: f64, n: u64, alpha: f64) -> f64 {
        let size = law_size(self.0.bands(), alpha, 0.1, tolerance - self.0.widest_gap);
        f64::from(u8::from(size.is_none_or(|size| n < size)))
    }

    fn evaluate(&self, tally: &Tally, _tolerance: f64, _alpha: f64) -> Evidence {
        if tally.replications() == 0 {
            return Evidence::default();
        }
        Evidence {
            estimate: Some(self.0.distance(tally).seen),
            p_value: self.0.chi_square(tally).map(|fit| fit.p_value),
            ..Evidence::default()
        }
    }
}
