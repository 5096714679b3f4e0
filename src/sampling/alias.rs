//! Alias tables in whole numbers.

use std::hint::select_unpredictable;

use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;

use super::quantise::DRAWS;

/// One column of a table: draws of the column below `threshold` lead to `own`, the others to `alias`.
///
/// The threshold is a draw itself, not a fraction of the column, so that it is compared without masking.
#[derive(Debug, Clone, Copy)]
struct Column {
    threshold: u64,
    own: u32,
    alias: u32,
}

/// Many alias tables, stored one after another.
///
/// # Method
/// A table over m ≥ 2 targets has 2ᵏ ≥ m columns, each the 2⁶⁴⁻ᵏ draws that share their top k bits. Target j is given
/// exactly the draws it asks for: columns short of draws are filled up by columns with too many, last in first out,
/// all in integers, so nothing is left to round. A draw costs one 64-bit number, one column, one comparison. A table over
/// one target takes no draw at all. The order of filling is part of the stream version.
///
/// # Complexity
/// O(m) time and at most 32 m bytes to build a table; O(1) to draw.
///
/// # References
/// A. J. Walker, An efficient method for generating discrete random variables with general distributions, ACM TOMS 3,
/// 1977, doi:10.1145/355744.355749. M. D. Vose, A linear algorithm for generating random numbers with a given
/// distribution, IEEE TSE 17, 1991, doi:10.1109/32.92917.
#[derive(Debug, Clone, Default)]
pub(super) struct AliasTables {
    columns: Vec<Column>,
    /// First column · 256 + the shift that brings a draw down to its column; `NO_DRAW` for a lone target.
    tables: Vec<u64>,
}

const NO_DRAW: u32 = 64;

impl AliasTables {
    /// Number of tables.
    #[cfg(test)]
    pub(super) fn len(&self) -> usize {
        self.tables.len()
    }

    /// Appends the table in which `draws[i]` of the 2⁶⁴ draws lead to `targets[i]`; they sum to 2⁶⁴.
    pub(super) fn push(&mut self, targets: &[u32], draws: &[u128]) {
        debug_assert_eq!(draws.iter().sum::<u128>(), DRAWS);
        let bits = targets.len().next_power_of_two().trailing_zeros();
        self.tables.push(((self.columns.len() as u64) << 8) | u64::from(NO_DRAW - bits));

        let capacity = DRAWS >> bits;
        let mut unplaced = draws.to_vec();
        unplaced.resize(1 << bits, 0);
        // Padding owns no draw; whichever target stands there is never taken.
        let target = |column: usize| targets.get(column).copied().unwrap_or(targets[0]);
        let first = self.columns.len();
        self.columns.extend((0..1 << bits).map(|column| Column {
            // A full column leads to its own target on both sides of any threshold.
            threshold: (column as u128 * capacity) as u64,
            own: target(column),
            alias: target(column),
        }));
        let (mut short, mut ample): (Vec<usize>, Vec<usize>) =
            (0..1 << bits).partition(|column| unplaced[*column] < capacity);
        while let (Some(to), Some(&from)) = (short.pop(), ample.last()) {
            let column = &mut self.columns[first + to];
            column.threshold += unplaced[to] as u64;
            column.alias = target(from);
            unplaced[from] -= capacity - unplaced[to];
            if unplaced[from] < capacity {
                ample.pop();
                short.push(from);
            }
        }
    }

    /// Draws a target of a table.
    #[inline]
    pub(super) fn draw(&self, table: u32, rng: &mut Lcg128CmDxsm64) -> u32 {
        let packed = self.tables[table as usize];
        let (first, shift) = ((packed >> 8) as usize, packed as u32 & 0xff);
        if shift == NO_DRAW {
            return self.columns[first].own;
        }
        let draw = rng.next_u64();
        let column = self.columns[first + (draw >> shift) as usize];
        select_unpredictable(draw < column.threshold, column.own, column.alias)
    }
}

#[cfg(test)]
mod tests {
    use super::super::quantise::quantise;
    use super::super::quantise::tests::assorted_rows;
    use super::*;

    impl AliasTables {
        /// How many of the 2⁶⁴ draws lead to each of the targets below `targets`, read off the table.
        pub(in super::super) fn counted(&self, table: usize, targets: usize) -> Vec<u128> {
            let end = self.tables.get(table + 1).map_or(self.columns.len(), |packed| (packed >> 8) as usize);
            let columns = &self.columns[(self.tables[table] >> 8) as usize..end];
            let capacity = DRAWS / columns.len() as u128;
            let mut counts = vec![0; targets];
            for (number, column) in columns.iter().enumerate() {
                let own = u128::from(column.threshold) - number as u128 * capacity;
                assert!(own <= capacity);
                counts[column.own as usize] += own;
                counts[column.alias as usize] += capacity - own;
            }
            counts
        }
    }

    #[test]
    fn exactly_the_quantised_number_of_draws_leads_to_each_target() {
        let mut tables = AliasTables::default();
        let mut expected: Vec<Vec<u128>> = Vec::new();
        for owned in assorted_rows() {
            for level in quantise(owned.row()) {
                let draws: Vec<u128> =
                    level.draws.iter().copied().chain(Some(level.escape).filter(|e| *e > 0)).collect();
                let targets: Vec<u32> = (0..draws.len() as u32).collect();
                tables.push(&targets, &draws);
                expected.push(draws);
            }
        }
        assert_eq!(tables.len(), expected.len());
        for (table, draws) in expected.iter().enumerate() {
            assert_eq!(tables.counted(table, draws.len()), *draws);
        }
    }

    // Both ends of the range of draws and both sides of every threshold lead where the count above says.
    #[test]
    fn draws_agree_with_the_count() {
        let mut tables = AliasTables::default();
        tables.push(&[0, 1, 2], &[1 << 62, 1 << 61, DRAWS - (1 << 62) - (1 << 61)]);
        let mut rng = Lcg128CmDxsm64::new(5, 5);
        let mut counts = [0_u32; 3];
        (0..80_000).for_each(|_| counts[tables.draw(0, &mut rng) as usize] += 1);
        // 20,000, 10,000 and 50,000 expected, standard deviations below 142: 6 of them, false alarm below 1e-8.
        for (count, mean) in counts.iter().zip([20_000_u32, 10_000, 50_000]) {
            assert!(count.abs_diff(mean) < 6 * 142);
        }
    }

    #[test]
    fn a_lone_target_takes_no_draw() {
        let mut tables = AliasTables::default();
        tables.push(&[9], &[DRAWS]);
        let (mut rng, untouched) = (Lcg128CmDxsm64::new(1, 1), Lcg128CmDxsm64::new(1, 1));
        assert_eq!(tables.draw(0, &mut rng), 9);
        assert_eq!(rng, untouched);
    }
}
