//! Where times are cut into cells.

/// Ascending cut times. Cell i counts the times in (edge i − 1, edge i]; the last cell counts everything above the last
/// edge. The number of times at or below an edge is therefore known exactly, at no other time.
///
/// ```
/// use tallystone::sampling::Grid;
/// let grid = Grid::new(vec![10, 5]);
/// assert_eq!([0, 5, 6, 10, 11].map(|time| grid.cell(time)), [0, 0, 1, 1, 2]);
/// ```
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Grid {
    edges: Vec<u64>,
    /// The cells of times 0, 1, 2, …, for as long as that is cheaper than a search.
    direct: Vec<u32>,
}

/// Times that are looked up rather than searched: 16 kB, half of a usual first-level cache.
const LARGEST_DIRECT: u64 = 4095;

impl Grid {
    /// The grid with these edges, in any order, repeated or not; without any, there is one cell for all times.
    pub fn new(mut edges: Vec<u64>) -> Self {
        edges.sort_unstable();
        edges.dedup();
        let last = edges.last().map_or(0, |edge| LARGEST_DIRECT.min(*edge));
        let direct = (0..=last).map(|time| search(&edges, time) as u32).collect();
        Self { edges, direct }
    }

    /// Every time to 64, then 32 cells a doubling, up to 2⁶³: cells of at most 1/32 of their times, for when nobody names
    /// any.
    pub fn logarithmic() -> Self {
        let doublings =
            (6..63).flat_map(|power: u32| (1..=32).map(move |part| (1_u64 << power) + (part << (power - 5))));
        Self::new((0..=64).chain(doublings).collect())
    }

    /// The edges, ascending.
    pub fn edges(&self) -> &[u64] {
        &self.edges
    }

    /// The number of cells: one more than there are edges.
    pub fn cells(&self) -> usize {
        self.edges.len() + 1
    }

    /// The cell that counts a time: O(1) for small times, O(log edges) for others.
    #[inline]
    pub fn cell(&self, time: u64) -> usize {
        match usize::try_from(time).ok().and_then(|time| self.direct.get(time)) {
            Some(cell) => *cell as usize,
            None => search(&self.edges, time),
        }
    }

    /// The cell that ends with a time; `None` if the time is no edge.
    pub fn cell_ending_at(&self, time: u64) -> Option<usize> {
        self.edges.binary_search(&time).ok()
    }
}

fn search(edges: &[u64], time: u64) -> usize {
    edges.partition_point(|edge| *edge < time)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cells_are_open_below_and_closed_above() {
        let grids = [
            vec![],
            vec![0],
            vec![3],
            vec![u64::MAX],
            vec![0, 1, 2],
            vec![7, 4095, 4096, 5000, 1 << 40],
            vec![1 << 50, u64::MAX - 1],
        ];
        let times = (0..6000).chain([1 << 40, (1 << 40) + 1, 1 << 50, u64::MAX - 1, u64::MAX]);
        for grid in grids.map(Grid::new).into_iter().chain([Grid::logarithmic()]) {
            for time in times.clone() {
                let cell = grid.cell(time);
                assert!(cell < grid.cells());
                assert!(cell == 0 || grid.edges()[cell - 1] < time);
                assert!(cell == grid.edges().len() || time <= grid.edges()[cell]);
            }
        }
    }

    #[test]
    fn edges_are_sorted_once_each_and_the_logarithmic_ones_are_as_said() {
        assert_eq!(Grid::new(vec![4, 2, 4, 9]).edges(), [2, 4, 9]);
        let grid = Grid::logarithmic();
        assert_eq!(grid.edges()[..68], (0..=64).chain([66, 68, 70]).collect::<Vec<_>>());
        assert_eq!(grid.edges().last(), Some(&(1 << 63)));
        assert_eq!(grid.cells(), 65 + 57 * 32 + 1);
        assert_eq!(grid.cell_ending_at(66), Some(65));
        assert_eq!(grid.cell_ending_at(67), None);
    }
}
