//! The joint law of end and time, whatever the clock.

use std::sync::Arc;

use crate::model::{Chain, Clock, Progress, Ticks};

use super::bounded::Bounded;
use super::continuous::ContinuousLaw;
use super::step_law::StepLaw;
use super::{ExactError, LawRefusal, Request};

/// The joint law of end and time, from the start to a horizon beyond which less than 1e-9 is left, and beyond every time
/// and quantile that was asked for, as far as the budget of work reaches. Times are in steps, or in continuous time in
/// [`Ticks`].
#[derive(Debug, Clone)]
pub struct Law {
    kind: Kind,
    /// What rounding to ticks adds to the error of every probability.
    blur: f64,
}

#[derive(Debug, Clone)]
enum Kind {
    Steps(Arc<StepLaw>),
    Continuous(Arc<ContinuousLaw>),
}

impl Law {
    /// Computes the law; `mean` predicts how long it is.
    ///
    /// # Errors
    /// The outer error when the user asked to stop, the inner one when it would take too long.
    pub(super) fn of(
        chain: &Chain,
        mean: f64,
        ticks: Ticks,
        request: &Request,
        progress: &dyn Progress,
    ) -> Result<Result<Self, LawRefusal>, ExactError> {
        if !request.law && request.levels.is_empty() && request.times.is_empty() {
            return Ok(Err(LawRefusal::NotRequested));
        }
        let kind = match chain.clock() {
            Clock::Steps => StepLaw::of(chain, mean, request, progress)?.map(|law| Kind::Steps(Arc::new(law))),
            Clock::Rates => {
                ContinuousLaw::of(chain, ticks, request, progress)?.map(|law| Kind::Continuous(Arc::new(law)))
            }
        };
        Ok(kind.map(|kind| Self { kind, blur: 0.0 }))
    }

    #[cfg(test)]
    pub(super) fn in_steps(law: StepLaw) -> Self {
        Self { kind: Kind::Steps(Arc::new(law)), blur: 0.0 }
    }

    /// The law of a time that is rounded to ticks, which moves every probability by no more than `by`.
    pub(super) fn blurred(&self, by: f64) -> Self {
        Self { kind: self.kind.clone(), blur: by }
    }

    fn wide(&self, found: Bounded) -> Bounded {
        if self.blur == 0.0 { found } else { Bounded::probability(Some(found.widened(self.blur))) }
    }

    /// The last time that was computed.
    pub fn horizon(&self) -> u64 {
        match &self.kind {
            Kind::Steps(law) => law.horizon(),
            Kind::Continuous(law) => law.horizon(),
        }
    }

    /// P(time > t). Beyond the horizon the bounds are 0 and what was left there.
    pub fn survival(&self, time: u64) -> Bounded {
        self.wide(match &self.kind {
            Kind::Steps(law) => law.survival(time),
            Kind::Continuous(law) => law.survival(time),
        })
    }

    /// P(time ≤ t), as survival is.
    pub fn at_or_below(&self, time: u64) -> Bounded {
        let survival = self.survival(time);
        if survival.high == 0.0 {
            return Bounded::exactly(1.0);
        }
        let value = 1.0 - survival.value;
        let low = (1.0 - survival.high).next_down().max(0.0);
        let high = (1.0 - survival.low).next_up().min(1.0);
        Bounded { value, low: low.min(value), high: high.max(value) }
    }

    /// The smallest t with P(time ≤ t) ≥ p, for p between 0 and 1: `low = high = value` unless the proven error leaves
    /// several candidates; then they lie from `low` to `high`, and `value` is the first. `None` when the horizon does not
    /// decide it.
    pub fn quantile(&self, p: f64) -> Option<Bounded> {
        if !(p > 0.0 && p < 1.0) {
            return None;
        }
        // The level as written may be a decimal that its double misses by half a unit.
        let (below, above) = (p * (1.0 - f64::EPSILON), p * (1.0 + f64::EPSILON));
        let horizon = self.horizon() + 1;
        let first = partition(horizon, |time| self.at_or_below(time).high < below);
        let certain = partition(horizon, |time| self.at_or_below(time).low < above);
        (certain < horizon).then_some(Bounded { value: first as f64, low: first as f64, high: certain as f64 })
    }

    /// Ascending times, the last of them the horizon, at which P(end = e, time ≤ t) is known: so close that no more than
    /// 1/4096 of all outcomes (1/2048 in continuous time) lies between two of them, unless they are neighbouring times;
    /// beyond 500 ends, or some hundred states in continuous time, the cells grow. None when the joint law was not asked
    /// for.
    pub fn edges(&self) -> &[u64] {
        match &self.kind {
            Kind::Steps(law) => law.edges(),
            Kind::Continuous(law) => law.edges(),
        }
    }

    /// P(end = e, time ≤ `edges()[edge]`).
    ///
    /// # Panics
    /// When there is no such end or edge.
    pub fn at_edge(&self, end: usize, edge: usize) -> Bounded {
        self.wide(match &self.kind {
            Kind::Steps(law) => law.at_edge(end, edge),
            Kind::Continuous(law) => {
                assert!(end < law.ends(), "the law is over {} ends", law.ends());
                law.at_edge(end, edge)
            }
        })
    }
}

/// The first number below `count` for which a monotone condition fails; `count` when it never does.
fn partition(count: u64, holds: impl Fn(u64) -> bool) -> u64 {
    let (mut low, mut high) = (0, count);
    while low < high {
        let middle = low + (high - low) / 2;
        if holds(middle) { low = middle + 1 } else { high = middle }
    }
    low
}
