//! A law and a tally as distribution functions, end by end.

use crate::exact::{Bounded, Exact, Law};
use crate::sampling::Tally;
use crate::statistics::{GoodnessOfFit, pooled_chi_square};

use super::distance::{Distance, Point, widest_gap};

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

    /// The times at which the law is kept end by end.
    pub(super) fn edges(&self) -> &[u64] {
        self.law.edges()
    }

    /// What an unknown course between the edges may add to a distance.
    pub(super) fn widest_gap(&self) -> f64 {
        self.widest_gap
    }

    /// Functions that are compared at once.
    pub(super) fn bands(&self) -> u64 {
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
    pub(super) fn distance(&self, tally: &Tally) -> Distance {
        let n = tally.replications() as f64;
        let counts = Counts::new(tally);
        let share = |end: Option<usize>, time: Option<u64>| counts.of(end, time) as f64 / n;
        self.all(&share).map(Distance::of).fold(Distance::default(), Distance::max)
    }

    /// The test of equal laws; `None` when too little is expected for two cells.
    pub(super) fn chi_square(&self, tally: &Tally) -> Option<GoodnessOfFit> {
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
pub(super) fn steps(edges: &[u64]) -> impl Iterator<Item = u64> {
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

#[cfg(test)]
pub(super) mod tests {
    use std::sync::Arc;

    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::*;
    use crate::exact::Request;
    use crate::model::{Model, Quantity, Silent};
    use crate::sampling::Grid;

    /// Two ends, one at odd times only; a third that cannot be reached. Long enough for cells of several steps.
    const WALK: &str = r#"
        start = "a"
        absorbing = ["x", "y", "z"]
        [moves]
        a = { b = 0.99, x = "rest" }
        b = { a = 0.97, c = 0.02, y = "rest" }
        c = { c = 0.995, y = "rest" }
        d = { z = 1 }
    "#;

    /// P(end = e, time ≤ t) for ends x and y, t = 0, 1, …, by the moves above, one step at a time.
    fn by_hand(steps: usize) -> Vec<[f64; 2]> {
        let (mut at, mut entered) = ([1.0, 0.0, 0.0], [0.0, 0.0]);
        let mut all = Vec::with_capacity(steps);
        for _ in 0..steps {
            all.push(entered);
            let [a, b, c] = at;
            entered = [entered[0] + 0.01 * a, entered[1] + 0.01 * b + 0.005 * c];
            at = [0.97 * b, 0.99 * a, 0.02 * b + 0.995 * c];
        }
        all
    }

    pub(in super::super) fn with_curves(test: impl FnOnce(Curves<'_>)) {
        let model = Model::from_toml(WALK).unwrap();
        let exact = Exact::solve(&model, &Request::of(&model, &[Quantity::Law]), &Silent).unwrap();
        test(Curves::new(&exact, exact.law().unwrap()));
    }

    pub(in super::super) fn grid(curves: &Curves<'_>) -> Arc<Grid> {
        Arc::new(Grid::new(steps(curves.law.edges()).collect()))
    }

    /// Outcomes of a program whose times are `late` steps late in one case of four, and whose ends may be swapped.
    pub(in super::super) fn outcomes(n: u64, late: u64, swapped: u64, seed: u128) -> Vec<(usize, u64)> {
        let mut rng = Lcg128CmDxsm64::new(seed, 7);
        let mut draw = move || (rng.next_u64() >> 11) as f64 / (1_u64 << 53) as f64;
        let walk = |draw: &mut dyn FnMut() -> f64| {
            let (mut state, mut time) = (0, 0);
            loop {
                time += 1;
                let u = draw();
                state = match state {
                    0 if u < 0.99 => 1,
                    0 => return (0, time),
                    1 if u < 0.97 => 0,
                    1 if u < 0.99 => 2,
                    2 if u < 0.995 => 2,
                    _ => return (1, time),
                };
            }
        };
        (0..n)
            .map(|i| {
                let (end, time) = walk(&mut draw);
                let end = if swapped > 0 && i % swapped == 0 { 1 - end } else { end };
                (end, if i % 4 == 0 { time + late } else { time })
            })
            .collect()
    }

    pub(in super::super) fn tally(outcomes: &[(usize, u64)], grid: Arc<Grid>) -> Tally {
        let mut tally = Tally::new(3, grid);
        outcomes.iter().for_each(|(end, time)| tally.add(*end, *time));
        tally
    }

    // The distance over every single time and end, with the law by hand, lies within the bounds from the cells.
    #[test]
    fn the_bounds_hold_the_distance_over_all_times() {
        with_curves(|curves| {
            assert_eq!(curves.bands(), 3);
            assert!(curves.law.edges().windows(2).any(|pair| pair[1] - pair[0] > 1), "cells of several steps");
            assert!(curves.widest_gap <= 1.0 / 4096.0 + 1e-12);
            let law = by_hand(20_000);
            for (seed, late, swapped) in [(1, 0, 0), (2, 40, 0), (3, 0, 6), (4, 1, 0), (5, 300, 3)] {
                let outcomes = outcomes(3000, late, swapped, seed);
                let distance = curves.distance(&tally(&outcomes, grid(&curves)));
                let mut counts = [0.0, 0.0];
                let mut sorted = outcomes.clone();
                sorted.sort_by_key(|(_, time)| *time);
                let mut rest = sorted.into_iter().peekable();
                let mut truth = 0.0_f64;
                for (time, exact) in law.iter().enumerate() {
                    while let Some((end, _)) = rest.next_if(|(_, at)| *at == time as u64) {
                        counts[end] += 1.0 / 3000.0;
                    }
                    let apart = [counts[0] - exact[0], counts[1] - exact[1]];
                    truth = truth.max(apart[0].abs()).max(apart[1].abs()).max((apart[0] + apart[1]).abs());
                }
                assert!(rest.peek().is_none());
                assert!(
                    distance.at_least <= truth + 1e-12 && truth <= distance.at_most + 1e-12,
                    "{distance:?} {truth}"
                );
                assert!(distance.at_most - distance.at_least <= 2.0 / 4096.0 + 0.002, "{distance:?}");
            }
        });
    }

    // One step before an edge the law of an end is not kept: its bounds hold the law by hand.
    #[test]
    fn the_law_before_an_edge_lies_within_its_bounds() {
        with_curves(|curves| {
            let law = by_hand(20_000);
            let mut inner = 0;
            for (edge, time) in curves.edges().iter().enumerate().filter(|(_, time)| (1..20_000).contains(*time)) {
                for (end, probability) in law[*time as usize - 1].iter().enumerate() {
                    let bounds = curves.before_edge(end, edge, 0.0);
                    assert!(bounds.low - 1e-12 <= *probability && *probability <= bounds.high + 1e-12);
                    inner += usize::from(*probability > bounds.low + 1e-9);
                }
            }
            assert!(inner > 100, "the upper bounds matter");
        });
    }
}
