//! The law of end and time, step by step.
//!
//! The distribution over transient states is multiplied by the matrix of moves once a step. All terms are positive, so
//! after `t` steps every entry is right within `t` times the relative error of one step. Double-double numbers are used
//! while they are cheap, doubles beyond.
//!
//! # Accuracy
//! With at most `d` moves into a state and unit `u` (2⁻⁵³ for doubles), a step costs a product, the conversion of the
//! probability and `d` additions: `(d + 2) u` in doubles, `(3d + 23) u²` in double-double. Sums over `n` states add `n u` or
//! `3n u²`. Entries that underflow lose less than 2⁻¹⁰⁰⁰ a term; the bounds carry that too.
//!
//! # Complexity
//! One multiply-add a move and step; memory for one number a step up to the horizon.

use crate::model::{Chain, Progress};

use super::bounded::Bounded;
use super::dd::{Dd, INPUT, U2};
use super::elimination::probabilities;
use super::{ExactError, LawRefusal, Request};

/// What may be left at the horizon.
const TAIL: f64 = 1e-9;
/// Most mass between two edges, save in a single step.
const CELL: f64 = 1.0 / 4096.0;
/// Multiply-adds in doubles that a law may cost; one in double-double counts as six.
const BUDGET: f64 = 4e9;
const DOUBLE_DOUBLE_COST: f64 = 6.0;
/// Laws that are expected to cost less than this are computed in double-double.
const DOUBLE_DOUBLE_BUDGET: f64 = 1e9;
/// Steps that are kept at most: 64 MB.
const LONGEST: u64 = 1 << 23;
/// What underflow can cost an absolute value.
const UNDERFLOW: f64 = 1e-290;

/// The joint law of end and time, step by step from the start to a horizon beyond which less than 1e-9 is left, and
/// beyond every time and quantile that was asked for, as far as the budget of work reaches.
#[derive(Debug, Clone)]
pub struct Law {
    /// P(time > t) for every t up to the horizon.
    survival: Vec<f64>,
    /// Relative error of `survival[t]`: `errors.0 + t · errors.1`.
    errors: (f64, f64),
    edges: Vec<u64>,
    /// P(end = e, time ≤ edge), ends within edges.
    at_edges: Vec<Bounded>,
    ends: usize,
}

/// The arithmetic of the iteration.
trait Real: Copy + Send {
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
    const COST: f64 = DOUBLE_DOUBLE_COST;
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
struct Steps<T> {
    offsets: Vec<usize>,
    /// Transient states by their place; ends after them.
    moves: Vec<(u32, T)>,
    states: usize,
    ends: usize,
    /// Most moves into one state.
    most: f64,
}

impl<T: Real> Steps<T> {
    fn of(chain: &Chain) -> (Self, Vec<T>) {
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
        let mut start = vec![T::ZERO; order.len() + steps.ends];
        for one in probabilities(chain.start()) {
            let at = target(one.to) as usize;
            start[at] = start[at].plus(T::of(one.probability));
        }
        (steps, start)
    }

    /// One step: `after` becomes the distribution over states and what has newly entered each end.
    fn take(&self, before: &[T], after: &mut [T]) {
        after.fill(T::ZERO);
        for (state, mass) in before[..self.states].iter().enumerate() {
            for (to, probability) in &self.moves[self.offsets[state]..self.offsets[state + 1]] {
                let cell = &mut after[*to as usize];
                *cell = cell.plus(mass.times(*probability));
            }
        }
    }
}

impl Law {
    /// Computes the law; `mean` predicts how long it is.
    ///
    /// # Errors
    /// The outer error when the user asked to stop, the inner one when it would take too long.
    pub(super) fn of(
        chain: &Chain,
        mean: f64,
        request: &Request,
        progress: &dyn Progress,
    ) -> Result<Result<Self, LawRefusal>, ExactError> {
        if !request.law {
            return Ok(Err(LawRefusal::NotRequested));
        }
        let moves: usize =
            chain.components().iter().flatten().map(|state| chain.row(*state as usize).targets.len()).sum();
        // An exponential tail falls below the limit after some twenty means.
        let expected = moves as f64 * mean * 21.0;
        if moves as f64 * mean > BUDGET || mean > LONGEST as f64 {
            return Ok(Err(refusal(moves, mean)));
        }
        if expected * DOUBLE_DOUBLE_COST < DOUBLE_DOUBLE_BUDGET {
            Self::iterate::<Dd>(chain, moves, mean, request, progress)
        } else {
            Self::iterate::<f64>(chain, moves, mean, request, progress)
        }
    }

    fn iterate<T: Real>(
        chain: &Chain,
        moves: usize,
        mean: f64,
        request: &Request,
        progress: &dyn Progress,
    ) -> Result<Result<Self, LawRefusal>, ExactError> {
        let (steps, mut mass) = Steps::<T>::of(chain);
        let (states, ends) = (steps.states, steps.ends);
        let step_error = T::step_error(steps.most) * (1.0 + 1e-6);
        let sum_error = (T::sum_error(states as f64) + INPUT * U2 + f64::EPSILON) * (1.0 + 1e-6);
        let longest = LONGEST.min((BUDGET / T::COST / (moves as f64 + states as f64)) as u64);
        let least_level = request.levels.iter().fold(1.0f64, |least, level| least.min((1.0 - level) * 0.5));
        let last_time = request.times.iter().copied().max().unwrap_or(0);
        let mut law = Self {
            survival: Vec::new(),
            errors: (sum_error, step_error),
            edges: Vec::new(),
            at_edges: Vec::new(),
            ends,
        };
        let mut entered: Vec<T> = mass[states..].to_vec();
        let mut next = mass.clone();
        // What entered since the last edge.
        let mut gathered = mass[states..].iter().map(|x| x.dd().hi).sum::<f64>();
        progress.begin("law of the time", "steps", Some((21.0 * mean) as u64));
        let mut time = 0u64;
        loop {
            let survival = mass[..states].iter().fold(T::ZERO, |sum, x| sum.plus(*x)).dd().hi;
            law.survival.push(survival);
            if gathered > CELL {
                law.edge(time, &entered, step_error, sum_error);
                gathered = 0.0;
            }
            let enough = survival < TAIL && survival < least_level && time >= last_time;
            if enough || survival == 0.0 || (time >= longest && survival < TAIL) {
                break;
            }
            if time >= longest {
                progress.end();
                return Ok(Err(refusal(moves, longest as f64)));
            }
            if time % 1024 == 1023 {
                progress.advance(1024);
                if progress.interrupted() {
                    return Err(ExactError::Interrupted);
                }
            }
            steps.take(&mass, &mut next);
            std::mem::swap(&mut mass, &mut next);
            let fresh = mass[states..].iter().map(|x| x.dd().hi).sum::<f64>();
            // Also before a jump out of nothing, so that its cell holds a single time.
            if gathered + fresh > CELL && law.edges.last() != Some(&time) {
                law.edge(time, &entered, step_error, sum_error);
                gathered = 0.0;
            }
            gathered += fresh;
            entered.iter_mut().zip(&mass[states..]).for_each(|(sum, x)| *sum = sum.plus(*x));
            time += 1;
        }
        if law.edges.last() != Some(&time) {
            law.edge(time, &entered, step_error, sum_error);
        }
        progress.end();
        Ok(Ok(law))
    }

    fn edge<T: Real>(&mut self, time: u64, entered: &[T], step_error: f64, sum_error: f64) {
        let relative = (time as f64 + 1.0) * (step_error + T::sum_error(1.0)) + sum_error;
        self.edges.push(time);
        self.at_edges.extend(entered.iter().map(|sum| {
            let sum = sum.dd();
            let error = if sum.is_zero() { 0.0 } else { sum.hi * relative + UNDERFLOW };
            let bounded = Bounded::within(sum, error, 0.0);
            Bounded { value: bounded.value.min(1.0), low: bounded.low.min(1.0), high: bounded.high.min(1.0) }
        }));
    }

    /// The last time that was computed.
    pub fn horizon(&self) -> u64 {
        self.survival.len() as u64 - 1
    }

    /// P(time > t). Beyond the horizon the bounds are 0 and what was left there.
    pub fn survival(&self, time: u64) -> Bounded {
        let at = time.min(self.horizon());
        let value = self.survival[at as usize];
        if value == 0.0 {
            // Nothing was left, unless it vanished in underflow.
            let high = if at == 0 || self.errors.1 == 0.0 { 0.0 } else { UNDERFLOW };
            return Bounded { value: 0.0, low: 0.0, high };
        }
        let error = value * (self.errors.0 + at as f64 * self.errors.1) + UNDERFLOW;
        let bounded = Bounded::within(Dd::of(value), error, 0.0);
        let bounded = Bounded { value: bounded.value.min(1.0), low: bounded.low.min(1.0), high: bounded.high.min(1.0) };
        if time > at { Bounded { value: 0.5 * bounded.high, low: 0.0, ..bounded } } else { bounded }
    }

    /// P(time ≤ t), as survival is.
    pub fn at_or_below(&self, time: u64) -> Bounded {
        let survival = self.survival(time);
        let value = 1.0 - survival.value;
        let low = (1.0 - survival.high).next_down().max(0.0);
        let high = (1.0 - survival.low).next_up().min(1.0);
        Bounded { value, low: low.min(value), high: high.max(value) }
    }

    /// The smallest t with P(time ≤ t) ≥ p: `low = high = value` unless the proven error leaves several candidates; then
    /// they lie from `low` to `high`, and `value` is the first. `None` when the horizon does not decide it.
    pub fn quantile(&self, p: f64) -> Option<Bounded> {
        // The level as written may be a decimal that its double misses by half a unit.
        let (below, above) = (p * (1.0 - f64::EPSILON), p * (1.0 + f64::EPSILON));
        let horizon = self.horizon() + 1;
        let first = partition(horizon, |time| self.at_or_below(time).high < below);
        let certain = partition(horizon, |time| self.at_or_below(time).low < above);
        (certain < horizon).then_some(Bounded { value: first as f64, low: first as f64, high: certain as f64 })
    }

    /// Ascending times, the last of them the horizon, at which P(end = e, time ≤ t) was kept: so close that no more than
    /// 1/4096 of all outcomes lies between two of them, unless they are neighbouring times.
    pub fn edges(&self) -> &[u64] {
        &self.edges
    }

    /// P(end = e, time ≤ `edges()[edge]`).
    ///
    /// # Panics
    /// When there is no such end or edge.
    pub fn at_edge(&self, end: usize, edge: usize) -> Bounded {
        assert!(end < self.ends, "the law is over {} ends", self.ends);
        self.at_edges[edge * self.ends + end]
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

fn refusal(moves: usize, steps: f64) -> LawRefusal {
    LawRefusal::TooLong { moves: moves as u64, steps: steps as u64, budget: BUDGET, longest: LONGEST }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::{Model, Silent};

    fn law<T: Real>(text: &str, request: &Request) -> Law {
        let model = Model::from_toml(text).unwrap();
        Law::iterate::<T>(model.chain(), 10, 10.0, request, &Silent).unwrap().unwrap()
    }

    const COIN: &str = "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { a = 0.5, x = 0.25, y = 0.25 }\n";

    #[test]
    fn a_geometric_law_in_both_arithmetics() {
        for law in [law::<Dd>(COIN, &Request::default()), law::<f64>(COIN, &Request::default())] {
            for time in 0..30u64 {
                assert_eq!(law.survival(time).value, 0.5f64.powi(time as i32));
                assert!(law.survival(time).contains(0.5f64.powi(time as i32)));
            }
            assert_eq!(law.horizon(), 30);
            assert_eq!(law.survival(1000).low, 0.0);
            assert!(law.survival(1000).high < 1e-9);
            for (edge, time) in law.edges().iter().enumerate() {
                assert!(law.at_edge(1, edge).contains(0.5 * (1.0 - 0.5f64.powi(*time as i32))));
            }
        }
    }

    #[test]
    fn a_quantile_on_a_jump_has_two_candidates_and_others_one() {
        let law = law::<Dd>(COIN, &Request { levels: vec![0.999_999_999_999], ..Request::default() });
        let half = law.quantile(0.5).unwrap();
        assert_eq!((half.low, half.high), (1.0, 2.0));
        assert_eq!(law.quantile(0.9).unwrap(), Bounded::exactly(4.0));
        assert_eq!(law.quantile(0.999_999_999_999).unwrap(), Bounded::exactly(40.0));
        assert_eq!(law.quantile(1.0), None);
    }

    #[test]
    fn times_asked_for_are_reached() {
        let law = law::<f64>(COIN, &Request { times: vec![500], ..Request::default() });
        assert!((law.survival(500).value / 0.5f64.powi(500) - 1.0).abs() < 1e-12);
    }
}
