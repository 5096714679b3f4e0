//! Whose values a mean or a variance is taken of.

use crate::sampling::{Column, Observable, Tally};
use crate::statistics::PowerSums;

/// Values of replications, as whole numbers in parts of a unit.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Sample {
    pub(super) of: Values,
    /// How many parts the unit has.
    pub(super) unit: f64,
}

/// Which values.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Values {
    /// The times of all.
    Times,
    /// The times of those that finish in certain ends.
    TimesIn(Vec<usize>),
    /// What is recorded of an observable.
    Recorded(Observable),
}

impl Sample {
    /// # Panics
    /// When the tally has no such end, or does not record the observable.
    pub(super) fn sums(&self, tally: &Tally) -> PowerSums {
        match &self.of {
            Values::Times => tally.all(),
            Values::TimesIn(ends) => tally.power_sums_of(ends),
            Values::Recorded(observable) => recorded(tally, *observable).sums().values(),
        }
    }

    /// Which replications have a value, where not all do.
    pub(super) fn which(&self) -> Option<&'static str> {
        match &self.of {
            Values::Times | Values::Recorded(Observable::Visits(_) | Observable::Cost(_)) => None,
            Values::TimesIn(_) => Some(" that finish there"),
            Values::Recorded(Observable::Hit(_)) => Some(" that pass there"),
        }
    }

    /// What must be recorded for it.
    pub(super) fn observes(&self) -> Option<Observable> {
        match &self.of {
            Values::Recorded(observable) => Some(*observable),
            _ => None,
        }
    }
}

/// What a tally records of an observable.
///
/// # Panics
/// When that is nothing.
pub(super) fn recorded(tally: &Tally, observable: Observable) -> &Column {
    let Some(column) = tally.column(observable) else { panic!("the tally does not record {observable:?}") };
    column
}
