//! How many replications the table needs.

use crate::model::Quantity;
use crate::sampling::BLOCK;

use super::planned::{Planned, Tested};

/// How many replications the table needs.
#[derive(Debug, Clone, PartialEq)]
pub struct SizePlan {
    /// The smallest multiple of a block at which all rows that can be decided are, with the power asked. `None` if there
    /// is none, or no row.
    pub replications: Option<u64>,
    /// The row that needs most by itself.
    pub demanding: Option<Quantity>,
    /// What the table would need without that row; `None` also if no other is left.
    pub without: Option<u64>,
    /// Rows that no number of replications decides, each with the reason. They are left out of the numbers above.
    pub never: Vec<(Quantity, String)>,
}

/// No plan goes beyond this: every number up to it is a double, and no run is that long.
pub(super) const MOST: u64 = 1 << 53;

/// The smallest positive multiple of `step` that fits, if what fits goes on fitting; otherwise one that fits while the
/// multiple before it does not.
pub(super) fn smallest(step: u64, fits: impl Fn(u64) -> bool) -> Option<u64> {
    // Invariant: `high` steps fit, `low` do not, or are none at all.
    let (mut low, mut high) = (0, 1);
    while !fits(high * step) {
        low = high;
        high *= 2;
        if high * step > MOST {
            return None;
        }
    }
    while high - low > 1 {
        let middle = low + (high - low) / 2;
        if fits(middle * step) {
            high = middle;
        } else {
            low = middle;
        }
    }
    Some(high * step)
}

/// The level of one row when `rows` of them share the error rate equally.
pub(super) fn level(rows: &[Planned<'_>], error_rate: f64) -> f64 {
    error_rate / rows.iter().filter(|row| row.spends()).count().max(1) as f64
}

/// Plans a table. The chances that its rows stay undecided add up to 1 − `power` at most.
pub(super) fn plan(rows: &[Planned<'_>], error_rate: f64, power: f64) -> SizePlan {
    let alpha = level(rows, error_rate);
    let mut never = Vec::new();
    let mut needed = vec![None; rows.len()];
    for (at, row) in rows.iter().enumerate() {
        match row.tested().map(|tested| tested.needed(alpha, power)) {
            Some(Ok(n)) => needed[at] = Some(n),
            Some(Err(reason)) => never.push((row.quantity.clone(), reason)),
            None => {}
        }
    }
    // A row that shares its level is decided by the same event as the other, unless its tolerance is tighter.
    let counts = |tested: &Tested<'_>| {
        let decided = tested.shares.filter(|shared| needed[shared.with].is_some());
        let other = decided.and_then(|shared| rows[shared.with].tested());
        other.is_none_or(|other| tested.tolerance.value < other.tolerance.value)
    };
    let planned: Vec<usize> =
        (0..rows.len()).filter(|at| needed[*at].is_some() && rows[*at].tested().is_some_and(counts)).collect();
    // The first of equals.
    let demanding = planned.iter().rev().copied().max_by_key(|at| needed[*at]);
    let size_without = |left_out: Option<usize>| {
        let is_in = |at: &usize| Some(*at) != left_out;
        let spenders = (0..rows.len()).filter(is_in).filter(|at| rows[*at].spends()).count();
        let alpha = error_rate / spenders.max(1) as f64;
        let tested: Vec<&Tested<'_>> =
            planned.iter().copied().filter(is_in).filter_map(|at| rows[at].tested()).collect();
        smallest(BLOCK, |n| tested.iter().map(|row| row.undecided(n, alpha)).sum::<f64>() <= 1.0 - power)
    };
    let decides = !planned.is_empty() || (never.is_empty() && !rows.is_empty());
    SizePlan {
        replications: if decides { size_without(None) } else { None },
        demanding: demanding.map(|at| rows[at].quantity.clone()),
        without: if planned.len() > 1 { size_without(demanding) } else { None },
        never,
    }
}
