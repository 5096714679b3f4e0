//! Whose values a mean or a variance is taken of.

use crate::sampling::{Column, Observable, Tally};
use crate::statistics::PowerSums;

/// Values of replications, as whole numbers over a denominator.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Sample {
    /// The times of all.
    Times,
    /// The times of those that finish in certain ends.
    TimesIn(Vec<usize>),
    /// What is recorded of an observable, over this denominator.
    Recorded(Observable, u64),
}

impl Sample {
    /// # Panics
    /// When the tally has no such end, or does not record the observable.
    pub(super) fn sums(&self, tally: &Tally) -> PowerSums {
        match self {
            Self::Times => tally.all(),
            Self::TimesIn(ends) => tally.power_sums_of(ends),
            Self::Recorded(observable, _) => recorded(tally, *observable).sums().values(),
        }
    }

    /// What the values are divided by.
    pub(super) fn denominator(&self) -> f64 {
        match self {
            Self::Recorded(_, denominator) => *denominator as f64,
            _ => 1.0,
        }
    }

    /// Which replications have a value, where not all do.
    pub(super) fn which(&self) -> Option<&'static str> {
        match self {
            Self::Times | Self::Recorded(Observable::Visits(_) | Observable::Cost(_), _) => None,
            Self::TimesIn(_) => Some(" that finish there"),
            Self::Recorded(Observable::Hit(_), _) => Some(" that pass there"),
        }
    }

    /// What must be recorded for it.
    pub(super) fn observes(&self) -> Option<Observable> {
        match self {
            Self::Recorded(observable, _) => Some(*observable),
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
