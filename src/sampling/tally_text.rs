//! The canonical text of a tally.

use std::fmt;

use super::observed::Observable;
use super::tally::Tally;

/// The canonical text: the same for equal tallies, and for no others.
///
/// One line with the edges, after one with `ticks` k where a tick is 2⁻ᵏ clock units and not a step; then, for each end, one with count, smallest and largest time (`-` for none) and the sums of
/// the powers 1 to 4, and one with the cells that are not empty as `cell:count`; then one for each observable, with its
/// number in the model, count, values above zero, smallest and largest value, and the sums of [`JointSums::sums`](crate::statistics::JointSums::sums). Lines end
/// with a line feed.
impl fmt::Display for Tally {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(f, "tallystone tally 1")?;
        if !self.ticks().is_steps() {
            writeln!(f, "ticks {}", self.ticks().exponent())?;
        }
        write!(f, "edges")?;
        self.grid().edges().iter().try_for_each(|edge| write!(f, " {edge}"))?;
        for number in 0..self.ends() {
            write!(f, "\nend {number} count {} times ", self.count(number))?;
            match self.smallest(number).zip(self.largest(number)) {
                Some((smallest, largest)) => write!(f, "{smallest} {largest}")?,
                None => f.write_str("- -")?,
            }
            f.write_str(" sums")?;
            self.power_sums(number).sums().iter().try_for_each(|sum| write!(f, " {sum}"))?;
            f.write_str("\ncells")?;
            let mut cells = self.cells(number).iter().enumerate().filter(|(_, count)| **count > 0);
            cells.try_for_each(|(cell, count)| write!(f, " {cell}:{count}"))?;
        }
        for observable in self.observed() {
            let Some(column) = self.column(*observable) else { continue };
            let (kind, number) = match observable {
                Observable::Visits(state) => ("visits", state),
                Observable::Cost(cost) => ("cost", cost),
                Observable::Hit(hit) => ("hit", hit),
            };
            write!(f, "\n{kind} {number} {column}")?;
        }
        f.write_str("\n")
    }
}
