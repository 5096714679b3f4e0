//! The whole chain by classes: each is factored once and serves every right-hand side.

use crate::model::{Chain, Progress, Row, Weights};

use super::ExactError;
use super::dd::{Dd, INPUT, U2, power_of_two};
use super::envelope::{Class, Cost, ENTRIES_LIMIT, Factor, Refusal, WORK_LIMIT, product};
use super::kernel::Kernel;
use super::stopped::Stopped;

/// Bytes of a double-double.
const BYTES: u64 = 16;

/// One move in double-double.
#[derive(Debug, Clone, Copy)]
pub(super) struct Move {
    pub(super) to: u32,
    pub(super) probability: Dd,
}

/// The exact probabilities of a row in double-double, each within [`INPUT`] units.
pub(super) fn probabilities(row: Row<'_>) -> impl Iterator<Item = Move> + '_ {
    let at = move |i: usize| match row.weights {
        Weights::Narrow { numerators, denominator } => Dd::of_u64(numerators[i]).over(Dd::of_u64(denominator)),
        Weights::Wide { numerators, denominator } => {
            let ((over, up), (under, down)) = (Dd::of_big(&numerators[i]), Dd::of_big(denominator));
            let ratio = over.over(under);
            let scale = power_of_two(up - down);
            Dd { hi: ratio.hi * scale, lo: ratio.lo * scale }
        }
    };
    row.targets.iter().enumerate().map(move |(i, to)| Move { to: *to, probability: at(i) })
}

/// Those of a state, or of the start, held to the range of the arithmetic.
///
/// # Errors
/// [`ExactError::OutOfRange`].
pub(super) fn usable_probabilities(chain: &Chain, from: Option<usize>) -> Result<Vec<Move>, ExactError> {
    let row = from.map_or(chain.start(), |state| chain.row(state));
    let usable = |one: Move| {
        let is_usable = one.probability.is_in_range() && !one.probability.is_zero();
        is_usable
            .then_some(one)
            .ok_or_else(|| ExactError::OutOfRange { example: chain.name(from.unwrap_or(one.to as usize)).to_owned() })
    };
    probabilities(row).map(usable).collect()
}

/// The factored chain: every reachable state where paths go on.
pub(super) struct Elimination<'a> {
    stopped: &'a Stopped<'a>,
    progress: &'a dyn Progress,
    factors: Vec<Factor>,
    /// Class and place in it of each state; `u32::MAX` where paths stop and for unreachable states.
    class_of: Vec<u32>,
    place_of: Vec<u32>,
    /// Moves of each state, stays left out.
    moves: Vec<Vec<Move>>,
    widest: usize,
}

/// A number for every state, each within `error` relatively.
#[derive(Debug, Clone)]
pub(super) struct Solution {
    pub(super) of: Vec<Dd>,
    pub(super) error: f64,
}

impl<'a> Elimination<'a> {
    /// Factors every class.
    ///
    /// # Errors
    /// A class that would cost too much is refused before its work; numbers too small for the arithmetic are refused, and
    /// so is all when the user asks to stop.
    pub(super) fn of(stopped: &'a Stopped<'a>, progress: &'a dyn Progress) -> Result<Self, ExactError> {
        let chain = stopped.chain();
        let n = chain.states();
        let mut class_of = vec![u32::MAX; n];
        let mut place_of = vec![u32::MAX; n];
        for (class, states) in stopped.classes().iter().enumerate() {
            for (place, state) in states.iter().enumerate() {
                class_of[*state as usize] = class as u32;
                place_of[*state as usize] = place as u32;
            }
        }
        let mut moves: Vec<Vec<Move>> = vec![Vec::new(); n];
        for state in stopped.classes().iter().flatten().map(|state| *state as usize) {
            moves[state] = usable_probabilities(chain, Some(state))?;
            moves[state].retain(|one| one.to as usize != state);
        }
        let widest = moves.iter().map(Vec::len).max().unwrap_or(0) + 1;
        let mut all = Self { stopped, progress, factors: Vec::new(), class_of, place_of, moves, widest };
        all.are_small_together()?;
        progress.begin("elimination", "states", Some(stopped.classes().iter().map(|class| class.len() as u64).sum()));
        let kernel = Kernel::new();
        for (number, states) in stopped.classes().iter().enumerate() {
            let factor = all.class(number, states).factor(kernel, progress).map_err(|why| all.refused(why, states))?;
            all.factors.push(factor);
            progress.advance(states.len() as u64);
        }
        progress.end();
        Ok(all)
    }

    /// Every class is held to the limits alone as it is factored; all of them are kept, and so are held together too.
    fn are_small_together(&self) -> Result<(), ExactError> {
        let mut total = Cost::default();
        let mut largest: Option<(&[u32], u64)> = None;
        for (number, states) in self.stopped.classes().iter().enumerate() {
            // A state by itself costs next to nothing.
            let cost =
                if states.len() == 1 { Cost { work: 0, entries: 1 } } else { self.class(number, states).best_cost() };
            if cost.is_too_large() {
                return Err(self.refused(Refusal::TooLarge(cost), states));
            }
            total = total.plus(cost);
            if largest.is_none_or(|(_, work)| cost.work > work) {
                largest = Some((states, cost.work));
            }
        }
        let Some((states, _)) = largest.filter(|_| total.entries > ENTRIES_LIMIT || total.work > 4 * WORK_LIMIT) else {
            return Ok(());
        };
        Err(ExactError::TooLarge {
            classes: self.stopped.classes().len(),
            states: self.stopped.classes().iter().map(Vec::len).sum(),
            example: self.stopped.chain().name(states[0] as usize).to_owned(),
            work: (total.work, 4 * WORK_LIMIT),
            bytes: (total.entries * BYTES, ENTRIES_LIMIT * BYTES),
        })
    }

    fn class(&self, number: usize, states: &[u32]) -> Class {
        let mut inside = Vec::with_capacity(states.len());
        let mut exit = Vec::with_capacity(states.len());
        for state in states {
            let (within, out): (Vec<&Move>, Vec<&Move>) =
                self.moves[*state as usize].iter().partition(|one| self.class_of[one.to as usize] as usize == number);
            inside.push(within.iter().map(|one| (self.place_of[one.to as usize], one.probability)).collect());
            exit.push(out.iter().fold(Dd::ZERO, |sum, one| sum.plus(one.probability)));
        }
        Class { inside, exit, widest: self.widest }
    }

    fn refused(&self, why: Refusal, states: &[u32]) -> ExactError {
        let example = self.stopped.chain().name(states[0] as usize).to_owned();
        match why {
            Refusal::TooLarge(cost) => ExactError::TooLarge {
                classes: 1,
                states: states.len(),
                example,
                work: (cost.work, WORK_LIMIT),
                bytes: (cost.entries * BYTES, ENTRIES_LIMIT * BYTES),
            },
            Refusal::OutOfRange => ExactError::OutOfRange { example },
            Refusal::Interrupted => ExactError::Interrupted,
        }
    }

    /// Asked once a class, the longest unit of work in a solve.
    fn go_on(&self) -> Result<(), ExactError> {
        if self.progress.interrupted() { Err(ExactError::Interrupted) } else { Ok(()) }
    }

    pub(super) fn stopped(&self) -> &'a Stopped<'a> {
        self.stopped
    }

    /// Moves of a state, stays left out; empty where paths stop and for unreachable states.
    pub(super) fn moves(&self, state: usize) -> &[Move] {
        &self.moves[state]
    }

    /// Moves of a state with its stay.
    pub(super) fn steps(&self, state: usize) -> impl Iterator<Item = Move> + '_ {
        probabilities(self.stopped.chain().row(state))
    }

    /// Relative error of a sum over the moves of one state.
    pub(super) fn row_sum_error(&self) -> f64 {
        U2 * (3.0 * self.widest as f64 + INPUT + 10.0)
    }

    /// Solves `x = b + P x` over states where paths go on, `x = 0` elsewhere, for `b` that is not negative: `x = N b`.
    pub(super) fn column(&self, b: &Solution) -> Result<Solution, ExactError> {
        let mut x = vec![Dd::ZERO; b.of.len()];
        let mut errors = vec![0.0f64; self.factors.len()];
        let mut worst = b.error;
        for (number, states) in self.stopped.classes().iter().enumerate().rev() {
            self.go_on()?;
            let factor = &self.factors[number];
            let mut error = b.error;
            let mut right: Vec<Dd> = Vec::with_capacity(states.len());
            for state in states {
                let mut sum = b.of[*state as usize];
                for one in &self.moves[*state as usize] {
                    let class = self.class_of[one.to as usize];
                    if class != u32::MAX && class as usize != number {
                        let term = product(one.probability, x[one.to as usize]);
                        sum = sum.plus(term.map_err(|why| self.refused(why, states))?);
                        error = error.max(errors[class as usize]);
                    }
                }
                right.push(sum);
            }
            factor.solve_column(&mut right).map_err(|why| self.refused(why, states))?;
            states.iter().zip(right).for_each(|(state, value)| x[*state as usize] = value);
            errors[number] = error + self.row_sum_error() + factor.error + factor.solve_error();
            worst = worst.max(errors[number]);
        }
        Ok(Solution { of: x, error: worst })
    }

    /// Solves `y = a + y P` over states where paths go on, for `a` that is not negative: `y = a N`.
    pub(super) fn row(&self, a: &Solution) -> Result<Solution, ExactError> {
        let mut y = a.of.clone();
        // What arrives at a state from earlier classes: how many terms, and the worst of their errors by class.
        let mut arrivals = vec![0u32; y.len()];
        let mut arrived = vec![a.error; self.factors.len()];
        let mut worst = a.error;
        for (number, states) in self.stopped.classes().iter().enumerate() {
            self.go_on()?;
            let factor = &self.factors[number];
            let mut right: Vec<Dd> = states.iter().map(|state| y[*state as usize]).collect();
            factor.solve_row(&mut right).map_err(|why| self.refused(why, states))?;
            let most = states.iter().map(|state| arrivals[*state as usize]).max().unwrap_or(0);
            let adding = U2 * (3.0 * f64::from(most) + INPUT + 5.0);
            let error = arrived[number] + adding + factor.error + factor.solve_error();
            worst = worst.max(error);
            for (state, value) in states.iter().zip(right) {
                y[*state as usize] = value;
                for one in &self.moves[*state as usize] {
                    let class = self.class_of[one.to as usize] as usize;
                    if class != number && class < self.factors.len() {
                        let term = product(one.probability, value).map_err(|why| self.refused(why, states))?;
                        y[one.to as usize] = y[one.to as usize].plus(term);
                        arrivals[one.to as usize] += 1;
                        arrived[class] = arrived[class].max(error);
                    }
                }
            }
        }
        Ok(Solution { of: y, error: worst })
    }
}

#[cfg(test)]
mod tests {
    use dashu_ratio::RBig;

    use std::sync::atomic::Ordering::SeqCst;

    use super::*;
    use crate::model::{Draft, Model, Silent};

    /// The walk on `0..=top` that goes up with probability 9/10, state `i` at number `i − 1`.
    fn walk(top: usize) -> crate::model::Model {
        let mut draft = Draft::new("walk");
        for i in 1..top {
            draft.moves(&i.to_string(), &(i + 1).to_string(), "0.9");
            draft.moves(&i.to_string(), &(i - 1).to_string(), "rest");
        }
        draft.absorbing("0");
        draft.absorbing(&top.to_string());
        draft.start("1");
        draft.check().unwrap()
    }

    fn exactly(x: Dd) -> RBig {
        RBig::try_from(x.hi).unwrap() + RBig::try_from(x.lo).unwrap()
    }

    #[test]
    fn double_double_solutions_stay_within_their_relative_bounds() {
        // Ruin from i: (ρ^i − ρ^a)/(1 − ρ^a) with ρ = 1/9; mean duration i/(q − p) − a/(q − p) (1 − ρ^i)/(1 − ρ^a) with
        // q − p = −4/5: Feller I (1968), XIV.2 and 3, from memory.
        for top in [2, 5, 40, 200] {
            let model = walk(top);
            let chain = model.chain();
            let stopped = Stopped::in_ends(chain);
            let elimination = Elimination::of(&stopped, &Silent).unwrap();
            let mut down = vec![Dd::ZERO; chain.states()];
            let mut ones = down.clone();
            for state in stopped.classes().iter().flatten().map(|state| *state as usize) {
                ones[state] = Dd::ONE;
                let low = chain.state("0").unwrap();
                for one in elimination.moves(state).iter().filter(|one| one.to as usize == low) {
                    down[state] = one.probability;
                }
            }
            let ruin = elimination.column(&Solution { of: down, error: INPUT * U2 }).unwrap();
            let times = elimination.column(&Solution { of: ones, error: 0.0 }).unwrap();
            let rho = |power: usize| RBig::from(9).pow(-(power as isize));
            let mut worst = 0.0f64;
            for i in 1..top {
                let state = chain.state(&i.to_string()).unwrap();
                let chance = (rho(i) - rho(top)) / (RBig::ONE - rho(top));
                let share = (RBig::ONE - rho(i)) / (RBig::ONE - rho(top));
                let duration =
                    (RBig::from(top as u64) * share - RBig::from(i as u64)) / (RBig::from(4) / RBig::from(5));
                for (found, truth) in [(&ruin, chance), (&times, duration)] {
                    let off = ((exactly(found.of[state]) - &truth) / truth).to_f64().value().abs();
                    assert!(off <= found.error, "{top} {i}: {off:e} beyond {:e}", found.error);
                    worst = worst.max(off / U2);
                }
            }
            assert!(top == 2 || worst > 0.5, "the last digits are not those of double-double numbers: {worst}");
        }
    }

    #[test]
    fn a_class_too_large_is_refused_before_any_work() {
        let mut draft = Draft::new("full");
        for i in 0..6000usize {
            // Far moves both ways make the envelope full.
            draft.moves(&format!("s{i}"), &format!("s{}", (i * 977 + 7) % 6000), "0.5");
            draft.moves(&format!("s{i}"), &format!("s{}", (i + 1) % 6000), "0.25");
            draft.moves(&format!("s{i}"), "end", "rest");
        }
        draft.absorbing("end");
        draft.start("s0");
        let model = draft.check().unwrap();
        match Elimination::of(&Stopped::in_ends(model.chain()), &Silent) {
            Err(ExactError::TooLarge { states, work, .. }) => assert!(states == 6000 && work.0 > work.1),
            other => panic!("{:?}", other.err()),
        }
    }

    // Few operations, but half of all pairs of states would be kept.
    #[test]
    fn a_class_that_needs_too_much_memory_is_refused_before_any_work() {
        let n = 20_000;
        let mut draft = Draft::new("onwards or back to the start");
        for i in 0..n {
            let next = if i + 1 < n { format!("s{}", i + 1) } else { "end".to_owned() };
            draft.moves(&format!("s{i}"), &next, "0.9999");
            draft.moves(&format!("s{i}"), "s0", "rest");
        }
        draft.absorbing("end");
        draft.start("s0");
        let model = draft.check().unwrap();
        match Elimination::of(&Stopped::in_ends(model.chain()), &Silent) {
            Err(ExactError::TooLarge { work, bytes, .. }) => assert!(work.0 < work.1 && bytes.0 > bytes.1),
            other => panic!("{:?}", other.err()),
        }
    }

    #[test]
    fn classes_that_need_too_much_memory_together_are_refused_before_any_work() {
        let (classes, n) = (4, 6_000);
        let mut draft = Draft::new("onwards or back to the start of the class");
        for i in 0..classes * n {
            draft.moves(&format!("s{i}"), &format!("s{}", i + 1), "0.9999");
            draft.moves(&format!("s{i}"), &format!("s{}", i / n * n), "rest");
        }
        draft.absorbing(&format!("s{}", classes * n));
        draft.start("s0");
        let model = draft.check().unwrap();
        match Elimination::of(&Stopped::in_ends(model.chain()), &Silent) {
            Err(ExactError::TooLarge { classes: 4, bytes, .. }) => assert!(bytes.0 > bytes.1),
            other => panic!("{:?}", other.err()),
        }
    }

    #[test]
    fn probabilities_below_the_range_of_the_arithmetic_are_refused() {
        for text in [
            "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { x = \"1e-350\", y = \"rest\" }\n",
            "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { x = \"1e-272\", y = \"rest\" }\n",
            "start = \"a\"\nabsorbing = [\"y\"]\n[moves]\na = { a = \"1e-350\", y = \"rest\" }\n",
        ] {
            let model = Model::from_toml(text).unwrap();
            let stopped = Stopped::in_ends(model.chain());
            let refused = Elimination::of(&stopped, &Silent);
            assert!(matches!(refused.err(), Some(ExactError::OutOfRange { .. })), "{text}");
        }
    }

    #[test]
    fn a_wish_to_stop_is_heard_inside_a_class_and_between_solves() {
        struct Impatient(std::sync::atomic::AtomicU32);
        impl Progress for Impatient {
            fn begin(&self, _: &str, _: &str, _: Option<u64>) {}
            fn advance(&self, _: u64) {}
            fn end(&self) {}
            fn interrupted(&self) -> bool {
                self.0.fetch_update(SeqCst, SeqCst, |left| Some(left.saturating_sub(1))).unwrap_or_default() == 0
            }
        }
        let model = walk(200);
        let asked = |questions: u32| Impatient(questions.into());
        let ones = Solution { of: vec![Dd::ONE; model.chain().states()], error: 0.0 };
        // One question for each eight of the 199 states, then one for the solve.
        let stopped = Stopped::in_ends(model.chain());
        for questions in [0, 24] {
            assert_eq!(Elimination::of(&stopped, &asked(questions)).err(), Some(ExactError::Interrupted));
        }
        let patient = asked(25);
        let elimination = Elimination::of(&stopped, &patient).unwrap();
        assert_eq!(elimination.column(&ones).err(), Some(ExactError::Interrupted));
        assert_eq!(elimination.row(&ones).err(), Some(ExactError::Interrupted));
    }
}
