//! A row before the run.

use crate::exact::Bounded;
use crate::model::{Quantity, Tolerance};
use crate::sampling::Observable;

use super::certain::Certain;
use super::method::Method;
use super::size::{MOST, smallest};
use super::tolerance::value_of;
use super::words::rounded;
use super::{AppliedTolerance, verdict};

/// Without tolerance a row is consistent once it would see the detectable difference with probability 0.9. The interval misses
/// the answer on one side then, while a miss is counted on both.
const UNSEEN: f64 = 0.2;

/// A row before the run.
#[derive(Debug)]
pub(super) struct Planned<'a> {
    pub(super) quantity: Quantity,
    /// The exact answer; `None` for the law.
    pub(super) exact: Option<Bounded>,
    pub(super) basis: Basis<'a>,
}

/// What decides the row.
#[derive(Debug)]
pub(super) enum Basis<'a> {
    /// Nothing is random.
    Certain(Certain),
    /// A statistical method.
    Tested(Tested<'a>),
}

/// A row that a statistical method decides.
#[derive(Debug)]
pub(super) struct Tested<'a> {
    pub(super) method: Box<dyn Method + 'a>,
    /// Bounds of the exact answer; for the law, those of the distance 0.
    pub(super) bounds: Bounded,
    pub(super) default: Tolerance,
    /// What the row must be able to see if nothing is tolerated.
    pub(super) detectable: Tolerance,
    /// The tolerance in use.
    pub(super) tolerance: AppliedTolerance,
    /// Whether that is the user's.
    pub(super) is_given: bool,
    /// What a probability of finishing somewhere is about.
    pub(super) outcomes: Option<Outcomes>,
    /// The earlier row with the same outcomes, or all others, whose level this row shares.
    pub(super) shares: Option<Shared>,
}

/// The ends, among those that can be reached, that a row is about.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Outcomes {
    pub(super) ends: Vec<usize>,
    /// How many ends can be reached.
    pub(super) reachable: usize,
}

/// Why a row spends no level of its own.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Shared {
    /// The number of the row that spends it.
    pub(super) with: usize,
    /// Whether the outcomes are all others, not the same.
    pub(super) complement: bool,
}

impl<'a> Planned<'a> {
    /// The row's method, unless nothing is random.
    pub(super) fn tested(&self) -> Option<&Tested<'a>> {
        match &self.basis {
            Basis::Tested(tested) => Some(tested),
            Basis::Certain(_) => None,
        }
    }

    /// Whether the row takes a part of the error rate.
    pub(super) fn spends(&self) -> bool {
        self.tested().is_some_and(|tested| tested.shares.is_none())
    }

    /// What the tally must record.
    pub(super) fn observes(&self) -> Option<Observable> {
        match &self.basis {
            Basis::Certain(certain) => certain.observes(),
            Basis::Tested(tested) => tested.method.observes(),
        }
    }

    /// Where the tally must cut.
    pub(super) fn cuts(&self) -> Vec<u64> {
        match &self.basis {
            Basis::Certain(certain) => certain.cuts(),
            Basis::Tested(tested) => tested.method.cuts(tested.tolerance.value),
        }
    }
}

impl Tested<'_> {
    /// The chance that `n` replications of a right simulator leave the row undecided. Without tolerance that is no matter
    /// of chance: the size decides.
    pub(super) fn undecided(&self, n: u64, alpha: f64) -> f64 {
        if self.tolerance.value == 0.0 {
            return f64::from(u8::from(!self.is_sensitive(n, alpha)));
        }
        self.method.miss_probability(self.tolerance.value, n, alpha)
    }

    /// Whether `n` replications would show the difference that must be seen.
    pub(super) fn is_sensitive(&self, n: u64, alpha: f64) -> bool {
        self.method.miss_probability(value_of(self.detectable, self.bounds), n, alpha) <= UNSEEN
    }

    /// Why no number of replications decides the row with a tolerance, if that is so.
    pub(super) fn never(&self, tolerance: f64) -> Option<String> {
        let tolerance = if tolerance == 0.0 { value_of(self.detectable, self.bounds) } else { tolerance };
        if let Some(reason) = self.method.never_agrees(tolerance) {
            return Some(reason);
        }
        (!verdict::resolves(self.bounds, tolerance))
            .then(|| "the bounds of the exact answer are wider than the tolerance".to_owned())
    }

    /// Replications after which the row by itself is decided with a probability of `power`, at the level `alpha`.
    ///
    /// # Errors
    /// Why there is no such number.
    pub(super) fn needed(&self, alpha: f64, power: f64) -> Result<u64, String> {
        if let Some(reason) = self.never(self.tolerance.value) {
            return Err(reason);
        }
        let decides = |n| self.undecided(n, alpha) <= 1.0 - power;
        smallest(1, decides).ok_or_else(|| format!("it would need more than {} replications", rounded(MOST as f64)))
    }
}
