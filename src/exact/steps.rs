//! One step of the law: the moves as a matrix in either arithmetic.

use crate::model::Chain;

use super::dd::{Dd, INPUT, U2};
use super::elimination::probabilities;

/// The arithmetic of the iteration.
pub(super) trait Real: Copy + Send {
    const ZERO: Self;
    /// Cost of a multiply-add, in multiply-adds of doubles.
    const COST: f64;
    fn of(value: Dd) -> Self;
    fn dd(self) -> Dd;
    fn plus(self, other: Self) -> Self;
    fn times(self, other: Self) -> Self;
    /// Relative error of one step when at most `d` moves lead into a state.
    fn step_error(d: f64) -> f64;
    /// Relative error of adding `n` numbers.
    fn sum_error(n: f64) -> f64;
}

impl Real for f64 {
    const ZERO: Self = 0.0;
    const COST: f64 = 1.0;
    fn of(value: Dd) -> Self {
        value.to_f64()
    }
    fn dd(self) -> Dd {
        Dd::of(self)
    }
    fn plus(self, other: Self) -> Self {
        self + other
    }
    fn times(self, other: Self) -> Self {
        self * other
    }
    fn step_error(d: f64) -> f64 {
        (d + 2.5) * f64::EPSILON / 2.0
    }
    fn sum_error(n: f64) -> f64 {
        (n + 1.0) * f64::EPSILON / 2.0
    }
}

impl Real for Dd {
    const ZERO: Self = Dd::ZERO;
    const COST: f64 = 6.0;
    fn of(value: Dd) -> Self {
        value
    }
    fn dd(self) -> Dd {
        self
    }
    fn plus(self, other: Self) -> Self {
        Dd::plus(self, other)
    }
    fn times(self, other: Self) -> Self {
        Dd::times(self, other)
    }
    fn step_error(d: f64) -> f64 {
        (3.0 * d + INPUT + 6.0) * U2
    }
    fn sum_error(n: f64) -> f64 {
        3.0 * (n + 1.0) * U2
    }
}

/// Moves between reachable transient states, and into ends, in one numbering.
pub(super) struct Steps<T> {
    offsets: Vec<usize>,
    /// Transient states by their place; ends after them.
    moves: Vec<(u32, T)>,
    pub(super) states: usize,
    pub(super) ends: usize,
    /// Most moves into one state.
    pub(super) most: f64,
}

impl<T: Real> Steps<T> {
    /// The moves, and the distribution at the start.
    pub(super) fn of(chain: &Chain) -> (Self, Vec<T>) {
        let order: Vec<u32> = chain.components().iter().flatten().copied().collect();
        let mut place = vec![u32::MAX; chain.states()];
        order.iter().enumerate().for_each(|(at, state)| place[*state as usize] = at as u32);
        let target = |state: u32| match chain.end_of(state as usize) {
            Some(end) => (order.len() + end) as u32,
            None => place[state as usize],
        };
        let mut steps =
            Self { offsets: vec![0], moves: Vec::new(), states: order.len(), ends: chain.ends().len(), most: 0.0 };
        let mut into = vec![0u32; order.len() + steps.ends];
        for state in &order {
            for one in probabilities(chain.row(*state as usize)) {
                steps.moves.push((target(one.to), T::of(one.probability)));
                into[target(one.to) as usize] += 1;
            }
            steps.offsets.push(steps.moves.len());
        }
        steps.most = f64::from(into.into_iter().max().unwrap_or(0));
        // Many states of one end may share the start: their shares are joined before they are rounded.
        let mut start = vec![Dd::ZERO; order.len() + steps.ends];
        for one in probabilities(chain.start()) {
            let at = target(one.to) as usize;
            start[at] = start[at].plus(one.probability);
        }
        (steps, start.into_iter().map(T::of).collect())
    }

    /// One step: `after` becomes the distribution over states and what has newly entered each end.
    pub(super) fn take(&self, before: &[T], after: &mut [T]) {
        after.fill(T::ZERO);
        for (state, mass) in before[..self.states].iter().enumerate() {
            for (to, probability) in &self.moves[self.offsets[state]..self.offsets[state + 1]] {
                let cell = &mut after[*to as usize];
                *cell = cell.plus(mass.times(*probability));
            }
        }
    }
}
