//! Settles tolerances and levels of all rows together: each depends on how many rows there are.

use super::planned::{Basis, Outcomes, Planned, Shared, Tested};
use super::size::{level, smallest};
use super::tolerance::{WIDENED_ABOVE, WIDEST, value_of, widened};
use super::words::counted;
use super::{AppliedTolerance, NotCompared};

/// Settles the rows; what asks for too much even with a widened tolerance is left out.
///
/// Leaving rows out raises the level of the others, which then need less: the rows that stay are settled again, and none
/// of them falls out by that.
pub(super) fn settle(mut rows: Vec<Planned<'_>>, error_rate: f64, power: f64) -> (Vec<Planned<'_>>, Vec<NotCompared>) {
    share_levels(&mut rows);
    let alpha = level(&rows, error_rate);
    let mut kept = Vec::with_capacity(rows.len());
    let mut left_out = Vec::new();
    for row in rows {
        match row.tested().filter(|tested| applied(tested, alpha, power).is_none()) {
            None => kept.push(row),
            Some(tested) => {
                let text = too_much(tested, alpha, power);
                left_out.push(NotCompared { quantity: row.quantity, exact: row.exact, text });
            }
        }
    }
    share_levels(&mut kept);
    let alpha = level(&kept, error_rate);
    for row in &mut kept {
        if let Basis::Tested(tested) = &mut row.basis
            && let Some(tolerance) = applied(tested, alpha, power)
        {
            tested.tolerance = tolerance;
        }
    }
    (kept, left_out)
}

/// The tolerance to use: the user's, or the default, widened as far as it needs; `None` if that is not far enough.
fn applied(tested: &Tested<'_>, alpha: f64, power: f64) -> Option<AppliedTolerance> {
    if tested.is_given {
        return Some(tested.tolerance);
    }
    widened(tested.default, tested.bounds, |tolerance| {
        tested.never(tolerance).is_none()
            && tested.method.miss_probability(tolerance, WIDENED_ABOVE, alpha) <= 1.0 - power
    })
}

fn too_much(tested: &Tested<'_>, alpha: f64, power: f64) -> String {
    let widest = WIDEST * value_of(tested.default, tested.bounds);
    let default = tested.default;
    if let Some(reason) = tested.never(widest) {
        return reason;
    }
    let needed = smallest(1, |n| tested.method.miss_probability(widest, n, alpha) <= 1.0 - power);
    let needs = needed
        .map_or_else(|| "more replications than can be run".to_owned(), |n| format!("{} replications", counted(n)));
    format!(
        "even {WIDEST} times its default tolerance of {default} would take {needs}, more than {}; give a tolerance of your \
         own to compare it",
        counted(WIDENED_ABOVE)
    )
}

/// Finds the rows whose outcomes are those of an earlier one, or all others: one event decides both, so that the later
/// row spends no level.
fn share_levels(rows: &mut [Planned<'_>]) {
    for later in 0..rows.len() {
        let (before, after) = rows.split_at_mut(later);
        let Basis::Tested(tested) = &mut after[0].basis else { continue };
        tested.shares = tested.outcomes.as_ref().and_then(|outcomes| {
            let mut spends = before.iter().enumerate().filter(|(_, row)| row.spends());
            spends.find_map(|(with, row)| outcomes.shared_with(row.tested()?.outcomes.as_ref()?, with))
        });
    }
}

impl Outcomes {
    /// How these follow from those of row number `with`, if they do.
    fn shared_with(&self, other: &Self, with: usize) -> Option<Shared> {
        let disjoint = || !self.ends.iter().any(|end| other.ends.contains(end));
        if self.ends == other.ends {
            Some(Shared { with, complement: false })
        } else {
            let all = self.ends.len() + other.ends.len() == self.reachable && disjoint();
            all.then_some(Shared { with, complement: true })
        }
    }
}
