//! What a run keeps of one observable.

use std::fmt;

use crate::statistics::JointSums;

/// What was recorded of one observable.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Column {
    sums: JointSums,
    above_zero: u64,
    range: Option<(i128, i128)>,
}

impl Column {
    pub(super) fn add(&mut self, value: i128, time: u64) {
        self.sums.add(value, time);
        self.above_zero += u64::from(value > 0);
        self.cover((value, value));
    }

    fn cover(&mut self, (smallest, largest): (i128, i128)) {
        let range = self.range.get_or_insert((smallest, largest));
        *range = (range.0.min(smallest), range.1.max(largest));
    }

    pub(super) fn merge(&mut self, other: &Self) {
        self.sums.merge(&other.sums);
        self.above_zero += other.above_zero;
        other.range.into_iter().for_each(|range| self.cover(range));
    }

    /// Sums over the replications that have a value, with their times.
    pub fn sums(&self) -> &JointSums {
        &self.sums
    }

    /// Number of values above zero.
    pub fn above_zero(&self) -> u64 {
        self.above_zero
    }

    /// The smallest and the largest value; `None` when there is none.
    pub fn range(&self) -> Option<(i128, i128)> {
        self.range
    }
}

/// Count, values above zero, smallest and largest value, and the sums.
impl fmt::Display for Column {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "count {} above {} values ", self.sums.count(), self.above_zero)?;
        match self.range {
            Some((smallest, largest)) => write!(f, "{smallest} {largest}")?,
            None => f.write_str("- -")?,
        }
        f.write_str(" sums")?;
        self.sums.sums().iter().try_for_each(|sum| write!(f, " {sum}"))
    }
}
