//! Which replications were seen.

use std::collections::HashMap;

/// A set of replication numbers, 64 to an entry: numbers that lie close together take less than a byte each, in whatever
/// order they come.
#[derive(Debug, Default)]
pub(super) struct Replications(HashMap<u64, u64>);

impl Replications {
    /// Adds a number; `false` if it was there already.
    pub(super) fn insert(&mut self, number: u64) -> bool {
        let seen = self.0.entry(number / 64).or_default();
        let bit = 1 << (number % 64);
        let fresh = *seen & bit == 0;
        *seen |= bit;
        fresh
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_number_is_new_once() {
        let mut seen = Replications::default();
        let numbers = || (0..200).chain([1 << 40, u64::MAX - 1, u64::MAX]);
        assert!(numbers().all(|number| seen.insert(number)));
        assert!(numbers().all(|number| !seen.insert(number)));
        assert!(seen.insert(200) && seen.insert((1 << 40) + 64));
    }
}
