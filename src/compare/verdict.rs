//! Verdicts: of a row and of the table.

use serde::Serialize;

/// What a row, or a whole table, says.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Verdict {
    /// Within the tolerance.
    Agree,
    /// No difference seen, and one that matters would have been (only where the tolerance is 0).
    Consistent,
    /// Not decided by these replications.
    Inconclusive,
    /// Beyond the tolerance.
    Disagree,
}
