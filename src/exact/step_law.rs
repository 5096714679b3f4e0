//! The law of end and time with a clock in steps, step by step.
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
use super::steps::{Real, Steps};
use super::support::{first_times, last_time};
use super::{ExactError, LawRefusal, Request};

/// What may be left at the horizon.
const TAIL: f64 = 1e-9;
/// Most mass between two edges, save in a single step, unless so many ends are kept that it must be more.
const CELL: f64 = 1.0 / 4096.0;
/// Probabilities that are kept at most, ends times edges: 100 MB.
const MOST_KEPT: f64 = (1 << 22) as f64;
/// Multiply-adds in doubles that a law may cost.
const BUDGET: f64 = 4e9;
/// Laws that are expected to cost less than this are computed in double-double.
const DOUBLE_DOUBLE_BUDGET: f64 = 1e9;
/// Multiply-adds that are tried where the mean says that it would take too long, since something rare may make the mean.
const TRIED: f64 = 1e7;
/// Steps that are kept at most: 64 MB.
const LONGEST: u64 = 1 << 23;
/// What underflow can cost an absolute value.
const UNDERFLOW: f64 = 1e-290;

/// The joint law of end and time, step by step.
#[derive(Debug, Clone)]
pub(super) struct StepLaw {
    /// P(time > t) for every t up to the horizon.
    survival: Vec<f64>,
    /// Relative error of `survival[t]`: `errors.0 + t · errors.1`.
    errors: (f64, f64),
    /// From this time on nothing is left, by the moves alone.
    last: Option<u64>,
    edges: Vec<u64>,
    /// P(end = e, time ≤ edge), ends within edges.
    at_edges: Vec<Bounded>,
    ends: usize,
}

impl StepLaw {
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
        let moves: usize =
            chain.components().iter().flatten().map(|state| chain.row(*state as usize).targets.len()).sum();
        // Every step also looks at every end.
        let moves = moves + chain.ends().len();
        // An exponential tail falls below the limit after some twenty means.
        let expected = moves as f64 * mean * 21.0;
        if moves as f64 * mean > BUDGET || mean > LONGEST as f64 {
            let tried = Self::iterate::<Dd>(chain, moves, mean, TRIED, request, progress)?;
            return Ok(tried.map_err(|_| refusal(moves, mean)));
        }
        if expected * Dd::COST < DOUBLE_DOUBLE_BUDGET {
            Self::iterate::<Dd>(chain, moves, mean, BUDGET, request, progress)
        } else {
            Self::iterate::<f64>(chain, moves, mean, BUDGET, request, progress)
        }
    }

    fn iterate<T: Real>(
        chain: &Chain,
        moves: usize,
        mean: f64,
        budget: f64,
        request: &Request,
        progress: &dyn Progress,
    ) -> Result<Result<Self, LawRefusal>, ExactError> {
        let (steps, mut mass) = Steps::<T>::of(chain);
        let (states, ends) = (steps.states, steps.ends);
        let step_error = T::step_error(steps.most) * (1.0 + 1e-6);
        let sum_error = (T::sum_error(states as f64) + INPUT * U2 + f64::EPSILON) * (1.0 + 1e-6);
        let longest = LONGEST.min((budget / T::COST / (moves as f64 + states as f64)) as u64);
        let least_level = request.levels.iter().fold(1.0f64, |least, level| least.min((1.0 - level) * 0.5));
        let latest = request.times.iter().copied().fold(0.0, f64::max) as u64;
        // Asked often enough to answer at once, rarely enough to cost nothing.
        let between_questions = ((1 << 16) / (moves as u64 + 1)).clamp(1, 1024);
        let mut law = Self {
            survival: Vec::new(),
            errors: (sum_error, step_error),
            last: last_time(chain),
            edges: Vec::new(),
            at_edges: Vec::new(),
            ends,
        };
        let firsts = if request.law { first_times(chain) } else { Vec::new() };
        // Two edges a cell at most: one at its end, and one before a jump.
        let cell = CELL.max(2.0 * ends as f64 / MOST_KEPT);
        let mut entered: Vec<T> = mass[states..].to_vec();
        let mut next = mass.clone();
        // What entered since the last edge.
        let mut gathered = mass[states..].iter().map(|x| x.dd().hi).sum::<f64>();
        progress.begin("law of the time", "steps", Some((21.0 * mean) as u64));
        let mut time = 0u64;
        loop {
            let survival = mass[..states].iter().fold(T::ZERO, |sum, x| sum.plus(*x)).dd().hi;
            law.survival.push(survival);
            if request.law && gathered > cell {
                law.edge(time, &entered, &firsts);
                gathered = 0.0;
            }
            let enough = survival < TAIL && survival < least_level && time >= latest;
            // What is left below the bound on underflow tells no more.
            if enough || survival < UNDERFLOW || (time >= longest && survival < TAIL) {
                break;
            }
            if time >= longest {
                progress.end();
                return Ok(Err(refusal(moves, longest as f64)));
            }
            if time.is_multiple_of(between_questions) {
                progress.advance(between_questions);
                if progress.interrupted() {
                    return Err(ExactError::Interrupted);
                }
            }
            steps.take(&mass, &mut next);
            std::mem::swap(&mut mass, &mut next);
            let fresh = mass[states..].iter().map(|x| x.dd().hi).sum::<f64>();
            // Also before a jump out of nothing, so that its cell holds a single time.
            if request.law && gathered + fresh > cell && law.edges.last() != Some(&time) {
                law.edge(time, &entered, &firsts);
                gathered = 0.0;
            }
            gathered += fresh;
            entered.iter_mut().zip(&mass[states..]).for_each(|(sum, x)| *sum = sum.plus(*x));
            time += 1;
        }
        if request.law && law.edges.last() != Some(&time) {
            law.edge(time, &entered, &firsts);
        }
        progress.end();
        Ok(Ok(law))
    }

    /// Keeps what has entered each end up to a time; `firsts` are the times from which that is possible at all.
    fn edge<T: Real>(&mut self, time: u64, entered: &[T], firsts: &[Option<u64>]) {
        let (sum_error, step_error) = self.errors;
        let relative = (time as f64 + 1.0) * (step_error + T::sum_error(1.0)) + sum_error;
        self.edges.push(time);
        self.at_edges.extend(entered.iter().zip(firsts).map(|(sum, first)| {
            if first.is_none_or(|first| time < first) {
                return Bounded::exactly(0.0);
            }
            let sum = sum.dd();
            Bounded::probability(Bounded::within(sum, sum.hi * relative + UNDERFLOW))
        }));
    }

    /// The last time that was computed.
    pub(super) fn horizon(&self) -> u64 {
        self.survival.len() as u64 - 1
    }

    /// P(time > t). Beyond the horizon the bounds are 0 and what was left there.
    pub(super) fn survival(&self, time: u64) -> Bounded {
        if self.last.is_some_and(|last| last <= time) {
            return Bounded::exactly(0.0);
        }
        let at = time.min(self.horizon());
        let value = self.survival[at as usize];
        let error = value * (self.errors.0 + at as f64 * self.errors.1) + UNDERFLOW;
        let bounded = Bounded::probability(Bounded::within(Dd::of(value), error));
        if time > at { Bounded { value: 0.5 * bounded.high, low: 0.0, ..bounded } } else { bounded }
    }

    /// Ascending times, the last of them the horizon, at which P(end = e, time ≤ t) was kept: so close that no more than
    /// 1/4096 of all outcomes lies between two of them, unless they are neighbouring times; beyond 500 ends the cells grow
    /// with their number. None when the joint law was not asked for.
    pub(super) fn edges(&self) -> &[u64] {
        &self.edges
    }

    /// P(end = e, time ≤ `edges()[edge]`).
    ///
    /// # Panics
    /// When there is no such end or edge.
    pub(super) fn at_edge(&self, end: usize, edge: usize) -> Bounded {
        assert!(end < self.ends, "the law is over {} ends", self.ends);
        self.at_edges[edge * self.ends + end]
    }
}

fn refusal(moves: usize, steps: f64) -> LawRefusal {
    LawRefusal::TooLong { moves: moves as u64, steps: steps as u64, budget: BUDGET, longest: LONGEST }
}

#[cfg(test)]
mod tests {
    use dashu_ratio::RBig;

    use super::super::Law;
    use super::*;
    use crate::model::{Draft, Model, Silent};

    fn law<T: Real>(text: &str, request: &Request) -> Law {
        let model = Model::from_toml(text).unwrap();
        let request = Request { law: true, ..request.clone() };
        Law::in_steps(StepLaw::iterate::<T>(model.chain(), 10, 10.0, BUDGET, &request, &Silent).unwrap().unwrap())
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

    /// The law of a chain in fractions, step by step: the mass of each state, ends keeping what enters them.
    fn in_fractions(chain: &Chain, steps: usize) -> Vec<Vec<RBig>> {
        let mut mass = vec![RBig::ZERO; chain.states()];
        let start = chain.start();
        start.targets.iter().enumerate().for_each(|(i, to)| mass[*to as usize] += start.probability(i));
        let mut all = vec![mass];
        for _ in 0..steps {
            let before = &all[all.len() - 1];
            let mut after = vec![RBig::ZERO; chain.states()];
            for (state, here) in before.iter().enumerate() {
                let row = chain.row(state);
                if chain.end_of(state).is_some() {
                    after[state] += here;
                }
                row.targets.iter().enumerate().for_each(|(i, to)| after[*to as usize] += row.probability(i) * here);
            }
            all.push(after);
        }
        all
    }

    // Weights that no double holds, so that every step rounds in both arithmetics.
    #[test]
    fn both_arithmetics_hold_the_law_in_fractions() {
        let text = "start = { a = \"1/3\", b = \"2/7\", c = \"rest\" }\nabsorbing = [\"x\", \"y\"]\n[moves]\n\
            a = { a = \"2/3\", b = \"1/7\", x = \"1/97\", c = \"rest\" }\nb = { c = \"5/11\", a = \"3/13\", y = \"rest\" }\n\
            c = { c = \"9/10\", a = \"1/19\", x = \"rest\" }\n";
        let model = Model::from_toml(text).unwrap();
        let chain = model.chain();
        let truth = in_fractions(chain, 120);
        let holds = |found: Bounded, truth: &RBig| {
            let exactly = |value: f64| RBig::try_from(value).unwrap();
            assert!(
                exactly(found.low) <= *truth && *truth <= exactly(found.high),
                "{found:?} {}",
                truth.to_f64().value()
            );
            (found.high - found.low) / found.value
        };
        let mut widths = Vec::new();
        for law in [law::<Dd>(text, &Request::default()), law::<f64>(text, &Request::default())] {
            let mut widest = 0.0f64;
            for (time, mass) in truth.iter().enumerate() {
                let left = (0..chain.states()).filter(|state| chain.end_of(*state).is_none());
                let survival = left.fold(RBig::ZERO, |sum, state| sum + &mass[state]);
                widest = widest.max(holds(law.survival(time as u64), &survival));
                if let Ok(edge) = law.edges().binary_search(&(time as u64)) {
                    for (end, found) in chain.ends().iter().enumerate() {
                        widest = widest.max(holds(law.at_edge(end, edge), &mass[found.states[0]]));
                    }
                }
            }
            widths.push(widest);
        }
        assert!(widths[0] < 2e-15 && widths[1] < 1e-12 && widths[1] > 2.0 * widths[0], "{widths:?}");
    }

    // 120 steps of a thousandth within 150: about 1e-330, which no double holds and which is not zero.
    #[test]
    fn what_underflows_is_not_impossible() {
        let mut draft = Draft::new("line");
        for i in 0..120 {
            draft.moves(&format!("l{i}"), &if i < 119 { format!("l{}", i + 1) } else { "y".to_owned() }, "0.001");
            draft.moves(&format!("l{i}"), &format!("l{i}"), "rest");
        }
        for i in 0..150 {
            draft.moves(&format!("d{i}"), &if i < 149 { format!("d{}", i + 1) } else { "x".to_owned() }, "1");
        }
        draft.absorbing("x");
        draft.absorbing("y");
        draft.start_with("l0", "0.5");
        draft.start_with("d0", "0.5");
        let model = draft.check().unwrap();
        let request = Request { law: true, ..Request::default() };
        let law = StepLaw::iterate::<f64>(model.chain(), 1, 1e5, BUDGET, &request, &Silent).unwrap().unwrap();
        let at = |time| law.edges().binary_search(&time).unwrap();
        let [x, y] = ["x", "y"].map(|name| model.ends_named(name).unwrap()[0]);
        assert_eq!(law.at_edge(y, at(149)).low, 0.0);
        assert!(law.at_edge(y, at(149)).high > 0.0);
        assert_eq!(law.at_edge(x, at(149)), Bounded::exactly(0.0));
        assert!(law.at_edge(x, at(150)).contains(0.5));
    }

    #[test]
    fn a_time_that_is_over_by_the_moves_is_over_exactly() {
        let text = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { b = \"1/3\", x = \"rest\" }\nb = { x = 1 }\n";
        let law = law::<f64>(text, &Request::default());
        assert_eq!(law.survival(2), Bounded::exactly(0.0));
        assert_eq!(law.at_or_below(7), Bounded::exactly(1.0));
        assert!(law.survival(1).low > 0.333);
    }

    // What made a mean of 1e10 is below the tail after one step.
    #[test]
    fn a_long_mean_out_of_something_rare_does_not_hide_a_short_law() {
        let text = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { b = \"1e-40\", x = \"rest\" }\n\
                    b = { x = \"1e-50\", b = \"rest\" }\n";
        let model = Model::from_toml(text).unwrap();
        let request = Request { levels: vec![0.5, 0.99], ..Request::default() };
        let law = Law::in_steps(StepLaw::of(model.chain(), 1e10, &request, &Silent).unwrap().unwrap());
        assert_eq!(law.quantile(0.99), Some(Bounded::exactly(1.0)));
        let forever =
            Model::from_toml("start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = 1e-10, a = \"rest\" }\n");
        assert!(StepLaw::of(forever.unwrap().chain(), 1e10, &request, &Silent).unwrap().is_err());
    }

    // A start in 20,000 states of one closed class: their shares must not be rounded one by one.
    #[test]
    fn a_start_in_a_large_class_is_one_share() {
        let n = 20_000;
        let mut draft = Draft::new("ring");
        for i in 0..n {
            draft.moves(&format!("c{i}"), &format!("c{}", (i + 1) % n), "1");
            draft.start_with(&format!("c{i}"), "1/25000");
        }
        draft.start_with("a", "rest");
        draft.moves("a", "x", "0.5");
        draft.moves("a", "a", "rest");
        draft.absorbing("x");
        let model = draft.check().unwrap();
        let request = Request { law: true, ..Request::default() };
        let law = StepLaw::iterate::<f64>(model.chain(), 2, 2.0, BUDGET, &request, &Silent).unwrap().unwrap();
        let class = model.ends_named("c0").unwrap()[0];
        let truth = RBig::from(4) / RBig::from(5);
        let found = law.at_edge(class, 0);
        assert!(
            RBig::try_from(found.low).unwrap() <= truth && truth <= RBig::try_from(found.high).unwrap(),
            "{found:?}"
        );
    }

    #[test]
    fn many_ends_widen_the_cells_and_without_the_joint_law_there_are_none() {
        let mut draft = Draft::new("wide");
        let ends = 30_000;
        for i in 0..ends {
            draft.moves("a", &format!("e{i}"), "1/60000");
            draft.absorbing(&format!("e{i}"));
        }
        draft.moves("a", "a", "rest");
        draft.start("a");
        let model = draft.check().unwrap();
        let law = |law| {
            let request = Request { law, levels: vec![0.5], ..Request::default() };
            StepLaw::of(model.chain(), 2.0, &request, &Silent).unwrap().unwrap()
        };
        let kept = law(true).at_edges.len();
        assert!(kept as f64 <= MOST_KEPT && kept >= 2 * ends, "{kept}");
        assert!(law(false).edges().is_empty() && Law::in_steps(law(false)).quantile(0.5).is_some());
    }

    #[test]
    fn times_asked_for_are_reached() {
        let law = law::<f64>(COIN, &Request { times: vec![500.0], ..Request::default() });
        assert!((law.survival(500).value / 0.5f64.powi(500) - 1.0).abs() < 1e-12);
    }
}
