//! What a run keeps of its replications.

use std::sync::Arc;

use sha2::{Digest, Sha256};
use thiserror::Error;

use super::column::Column;
use super::grid::Grid;
use super::observed::Observable;
use crate::model::{Ticks, hexadecimal};
use crate::statistics::{PowerSums, PowerSumsBlock};

/// Why two tallies cannot be merged.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Error)]
#[non_exhaustive]
pub enum TallyMismatch {
    /// They count time in different units.
    #[error("the tallies count time in different units; sample both with the same one")]
    Ticks,
    /// They record different things besides end and time.
    #[error("the tallies record different quantities; sample both with the same ones")]
    Observed,
    /// They are over different numbers of ends.
    #[error("one tally has {left} ends and the other {right}; merge tallies of one model only")]
    Ends {
        /// Of the tally that was merged into.
        left: usize,
        /// Of the other.
        right: usize,
    },
    /// Their times are cut at different edges.
    #[error("the tallies cut times at different edges; sample both with the same edges")]
    Edges,
}

/// The outcomes at one end.
#[derive(Debug, Clone, Default)]
struct EndTally {
    count: u64,
    /// Smallest and largest time.
    range: Option<(u64, u64)>,
    /// Not yet in `settled`.
    recent: PowerSumsBlock,
    settled: PowerSums,
}

impl EndTally {
    fn counted(&mut self, count: u64, smallest: u64, largest: u64) {
        self.count += count;
        let range = self.range.get_or_insert((smallest, largest));
        *range = (range.0.min(smallest), range.1.max(largest));
    }

    fn power_sums(&self) -> PowerSums {
        let mut sums = self.recent.clone().finish();
        sums.merge(&self.settled);
        sums
    }
}

/// The mergeable sums over replications: per end, how many there were, the exact power sums of their times, and counts
/// over the cells of a [`Grid`].
///
/// Everything is a whole number, so tallies merge to the same result in any order and grouping. Times are in steps, or in
/// [`Ticks`].
///
/// # Complexity
/// O(1) to add an outcome whose time the grid looks up; memory 8 bytes × ends × cells.
///
/// ```
/// use std::sync::Arc;
/// use tallystone::sampling::{Grid, Tally};
/// let mut tally = Tally::new(2, Arc::new(Grid::new(vec![3])));
/// tally.add(0, 2);
/// tally.add_many(1, 5, 3);
/// assert_eq!(tally.count(1), 3);
/// assert_eq!(tally.all().mean(), Some(4.25));
/// assert_eq!(tally.at_or_below(3), Some(1));
/// assert_eq!(tally.at_or_below(4), None);
/// ```
#[derive(Debug, Clone)]
pub struct Tally {
    grid: Arc<Grid>,
    replications: u64,
    ends: Vec<EndTally>,
    /// The cells of end 0, of end 1, and so on.
    cells: Vec<u64>,
    observed: Arc<[Observable]>,
    /// One an observable.
    columns: Vec<Column>,
    ticks: Ticks,
}

impl Tally {
    /// The empty tally.
    pub fn new(ends: usize, grid: Arc<Grid>) -> Self {
        Self::observing(ends, grid, Arc::from([]))
    }

    /// The empty tally with columns for what is recorded besides end and time.
    pub fn observing(ends: usize, grid: Arc<Grid>, observed: Arc<[Observable]>) -> Self {
        let cells = vec![0; ends * grid.cells()];
        let columns = vec![Column::default(); observed.len()];
        Self {
            grid,
            replications: 0,
            ends: vec![EndTally::default(); ends],
            cells,
            observed,
            columns,
            ticks: Ticks::STEPS,
        }
    }

    /// The same with times counted in another unit.
    #[must_use]
    pub fn in_ticks(self, ticks: Ticks) -> Self {
        Self { ticks, ..self }
    }

    /// The unit in which times are counted, those of the grid too.
    pub fn ticks(&self) -> Ticks {
        self.ticks
    }

    /// Adds one outcome with what was recorded of it, one cell an observable; a cell without a value counts nothing.
    ///
    /// # Panics
    /// When there is no such end, or as many cells as observables.
    pub fn add_observed(&mut self, end: usize, time: u64, values: &[Option<i128>]) {
        assert_eq!(values.len(), self.columns.len(), "one cell an observable");
        self.add(end, time);
        for (column, value) in self.columns.iter_mut().zip(values) {
            if let Some(value) = value {
                column.add(*value, time);
            }
        }
    }

    /// What is recorded besides end and time.
    pub fn observed(&self) -> &[Observable] {
        &self.observed
    }

    /// What was recorded of an observable; `None` if nothing was.
    pub fn column(&self, observable: Observable) -> Option<&Column> {
        let at = self.observed.iter().position(|known| *known == observable)?;
        Some(&self.columns[at])
    }

    /// Adds one outcome.
    ///
    /// # Panics
    /// When there is no such end.
    #[inline]
    pub fn add(&mut self, end: usize, time: u64) {
        self.counted(end, time, 1);
        self.ends[end].recent.add(time);
    }

    /// Adds the same outcome `copies` times.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn add_many(&mut self, end: usize, time: u64, copies: u64) {
        if copies > 0 {
            self.counted(end, time, copies);
            self.ends[end].settled.add_many(time, copies);
        }
    }

    #[inline]
    fn counted(&mut self, end: usize, time: u64, copies: u64) {
        self.replications += copies;
        self.ends[end].counted(copies, time, time);
        self.cells[end * self.grid.cells() + self.grid.cell(time)] += copies;
    }

    /// Adds all outcomes of another tally.
    ///
    /// # Errors
    /// When the other is over other ends or another grid; nothing is added then.
    pub fn merge(&mut self, other: &Self) -> Result<(), TallyMismatch> {
        if self.ends.len() != other.ends.len() {
            return Err(TallyMismatch::Ends { left: self.ends.len(), right: other.ends.len() });
        }
        if !Arc::ptr_eq(&self.grid, &other.grid) && self.grid.edges() != other.grid.edges() {
            return Err(TallyMismatch::Edges);
        }
        if self.observed != other.observed {
            return Err(TallyMismatch::Observed);
        }
        if self.ticks != other.ticks {
            return Err(TallyMismatch::Ticks);
        }
        self.replications += other.replications;
        for (end, more) in self.ends.iter_mut().zip(&other.ends) {
            if let Some((smallest, largest)) = more.range {
                end.counted(more.count, smallest, largest);
                end.settled.merge(&more.power_sums());
            }
        }
        for (cell, more) in self.cells.iter_mut().zip(&other.cells) {
            *cell += more;
        }
        self.columns.iter_mut().zip(&other.columns).for_each(|(column, more)| column.merge(more));
        Ok(())
    }

    /// Where times are cut.
    pub fn grid(&self) -> &Grid {
        &self.grid
    }

    /// Number of ends, reached or not.
    pub fn ends(&self) -> usize {
        self.ends.len()
    }

    /// Number of outcomes.
    pub fn replications(&self) -> u64 {
        self.replications
    }

    /// Steps of all replications together: the sum of the times, in ticks where these are counted.
    pub fn steps(&self) -> u128 {
        // Fewer than 2⁶⁴ times below 2⁶⁴ each.
        u128::try_from(&self.all().sums()[0]).unwrap_or(u128::MAX)
    }

    /// Number of outcomes at an end.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn count(&self, end: usize) -> u64 {
        self.ends[end].count
    }

    /// Number of outcomes at any of several distinct ends.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn count_of(&self, ends: &[usize]) -> u64 {
        ends.iter().map(|end| self.count(*end)).sum()
    }

    /// The power sums of the times at an end.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn power_sums(&self, end: usize) -> PowerSums {
        self.ends[end].power_sums()
    }

    /// The power sums of the times at any of several distinct ends.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn power_sums_of(&self, ends: &[usize]) -> PowerSums {
        let mut sums = PowerSums::default();
        for end in ends {
            sums.merge(&self.power_sums(*end));
        }
        sums
    }

    /// The power sums of all times.
    pub fn all(&self) -> PowerSums {
        let mut sums = PowerSums::default();
        for end in &self.ends {
            sums.merge(&end.power_sums());
        }
        sums
    }

    /// The smallest time at an end; `None` when no replication finished there.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn smallest(&self, end: usize) -> Option<u64> {
        self.ends[end].range.map(|(smallest, _)| smallest)
    }

    /// The largest time at an end; `None` when no replication finished there.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn largest(&self, end: usize) -> Option<u64> {
        self.ends[end].range.map(|(_, largest)| largest)
    }

    /// The smallest and the largest of all times; `None` when there is no outcome.
    pub fn range(&self) -> Option<(u64, u64)> {
        let ranges = self.ends.iter().filter_map(|end| end.range);
        ranges.reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)))
    }

    /// The counts over the cells of the grid, at an end.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn cells(&self, end: usize) -> &[u64] {
        let width = self.grid.cells();
        &self.cells[end * width..(end + 1) * width]
    }

    /// Number of outcomes with a time of at most `time`; `None` unless `time` is an edge of the grid.
    pub fn at_or_below(&self, time: u64) -> Option<u64> {
        let last = self.grid.cell_ending_at(time)?;
        Some((0..self.ends.len()).flat_map(|end| &self.cells(end)[..=last]).sum())
    }

    /// Number of outcomes at an end with a time of at most `time`; `None` unless `time` is an edge of the grid.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn at_or_below_for(&self, end: usize, time: u64) -> Option<u64> {
        let last = self.grid.cell_ending_at(time)?;
        Some(self.cells(end)[..=last].iter().sum())
    }

    /// SHA-256 of the canonical text, in hexadecimal.
    pub fn digest(&self) -> String {
        hexadecimal(Sha256::new_with_prefix(self.to_string()))
    }
}

/// Equal tallies have equal counts, sums and cells, whatever way they came about.
impl PartialEq for Tally {
    fn eq(&self, other: &Self) -> bool {
        self.grid.edges() == other.grid.edges()
            && self.cells == other.cells
            && self.observed == other.observed
            && self.ticks == other.ticks
            && self.columns == other.columns
            && self.ends.len() == other.ends.len()
            && self.ends.iter().zip(&other.ends).all(|(a, b)| a.range == b.range && a.power_sums() == b.power_sums())
    }
}

impl Eq for Tally {}

#[cfg(test)]
mod tests {
    use dashu_int::IBig;
    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::*;

    fn empty() -> Tally {
        Tally::new(3, Arc::new(Grid::new(vec![0, 10, 1000, 1 << 40])))
    }

    /// Times from 0 to beyond 2⁶³; end 2 stays empty.
    fn outcomes(n: usize) -> Vec<(usize, u64)> {
        let mut rng = Lcg128CmDxsm64::new(3, 4);
        (0..n).map(|_| ((rng.next_u64() % 2) as usize, rng.next_u64() >> (rng.next_u64() % 64))).collect()
    }

    fn tally_of(outcomes: &[(usize, u64)]) -> Tally {
        let mut tally = empty();
        for (end, time) in outcomes {
            tally.add(*end, *time);
        }
        tally
    }

    #[test]
    fn every_split_merges_to_the_same_bytes_both_ways_round() {
        let outcomes = outcomes(40);
        let whole = tally_of(&outcomes);
        for at in 0..=outcomes.len() {
            let (left, right) = (tally_of(&outcomes[..at]), tally_of(&outcomes[at..]));
            for (mut into, other) in [(left.clone(), &right), (right.clone(), &left)] {
                into.merge(other).unwrap();
                assert_eq!(into, whole);
                assert_eq!(into.to_string(), whole.to_string());
                assert_eq!(into.digest(), whole.digest());
            }
        }
    }

    #[test]
    fn counts_agree_with_a_plain_recount() {
        let outcomes = outcomes(10_000);
        let tally = tally_of(&outcomes);
        let times = |end: usize| outcomes.iter().filter(move |outcome| outcome.0 == end).map(|outcome| outcome.1);
        for end in 0..3 {
            assert_eq!(tally.count(end), times(end).count() as u64);
            assert_eq!(tally.smallest(end), times(end).min());
            assert_eq!(tally.largest(end), times(end).max());
            assert_eq!(tally.cells(end).iter().sum::<u64>(), tally.count(end));
            let fourth = times(end).map(|time| IBig::from(time).pow(4)).sum::<IBig>();
            assert_eq!(tally.power_sums(end).sums()[3], fourth);
            assert_eq!(tally.at_or_below_for(end, 1000), Some(times(end).filter(|time| *time <= 1000).count() as u64));
        }
        let all = || outcomes.iter().map(|outcome| outcome.1);
        assert_eq!(tally.range(), all().min().zip(all().max()));
        assert_eq!(empty().range(), None);
        assert_eq!(tally.replications(), 10_000);
        assert_eq!(tally.count_of(&[0, 1]), 10_000);
        assert_eq!(tally.power_sums_of(&[0, 1]), tally.all());
        assert_eq!(tally.steps(), outcomes.iter().map(|outcome| u128::from(outcome.1)).sum());
        assert_eq!(tally.at_or_below(10), Some(outcomes.iter().filter(|outcome| outcome.1 <= 10).count() as u64));
        assert_eq!(tally.at_or_below(11), None);
    }

    #[test]
    fn copies_are_the_same_as_repeated_outcomes() {
        let mut copies = empty();
        copies.add_many(1, 7, 3);
        copies.add_many(0, u64::MAX, 2);
        copies.add_many(2, 5, 0);
        assert_eq!(copies, tally_of(&[(1, 7), (0, u64::MAX), (1, 7), (0, u64::MAX), (1, 7)]));
        assert_eq!(copies.smallest(2), None);
    }

    #[test]
    fn tallies_of_other_ends_or_edges_are_refused_untouched() {
        let mut tally = tally_of(&[(0, 1)]);
        let ends = Tally::new(2, Arc::new(empty().grid().clone()));
        assert_eq!(tally.merge(&ends), Err(TallyMismatch::Ends { left: 3, right: 2 }));
        let edges = Tally::new(3, Arc::new(Grid::new(vec![1])));
        assert_eq!(tally.merge(&edges), Err(TallyMismatch::Edges));
        assert_eq!(tally, tally_of(&[(0, 1)]));
    }

    #[test]
    fn the_canonical_text_is_as_documented() {
        let text = "tallystone tally 1\nedges 0 10 1000 1099511627776\nend 0 count 2 times 2 3 sums 5 13 35 97\n\
                    cells 1:2\nend 1 count 0 times - - sums 0 0 0 0\ncells\nend 2 count 1 times 0 0 sums 0 0 0 0\n\
                    cells 0:1\n";
        assert_eq!(tally_of(&[(0, 2), (2, 0), (0, 3)]).to_string(), text);
    }
}
