//! The law of end and time in continuous time, at any tick.
//!
//! # Formula
//! With the largest rate Λ, `exp(Q t) = Σ_k e^{−Λt} (Λt)^k/k! U^k`, where `U = I + Q/Λ` is a matrix of moves (uniformization;
//! Jensen 1953). For `Λτ ≤ ½` some forty terms leave less than 1e-60. The matrices `exp(Q 2^k τ)` follow by squaring, and a
//! time is the sum of those of its binary digits and of a remainder below τ. Ends are absorbing states of the same matrices.
//!
//! # Accuracy
//! Nothing is subtracted and all numbers are positive, in double-double arithmetic: a squaring doubles the relative error of
//! the entries and adds that of a sum of `n` products, `(3 n + 8) u²`. What the series leave out counts absolutely.
//!
//! # Complexity
//! `n² (n + ends)` multiply-adds a squaring, one for each doubling of the time from `1/(2 Λ)` to the horizon; `n (n + ends)` a
//! binary digit of a time that is asked for.
//!
//! # References
//! - A. Jensen, Skand. Aktuarietidskr. 36 (1953) 87.
//! - J. Xue & Q. Ye, Math. Comp. 82 (2013) 1577, doi:10.1090/S0025-5718-2013-02674-1 (entrywise accuracy of the exponential).

use std::collections::HashMap;
use std::sync::{Arc, Mutex, PoisonError};

use dashu_int::ops::UnsignedAbs;
use dashu_ratio::RBig;

use crate::model::{Chain, Progress, Ticks};

use super::bounded::Bounded;
use super::dd::{Dd, INPUT, U2, power_of_two};
use super::elimination::probabilities;
use super::kernel::{Kernel, Stretch};
use super::{ExactError, LawRefusal, Request};

/// Terms of the series. With Λτ ≤ ½ the next is ½^41/41! < 2e-62.
const TERMS: usize = 40;
/// What all series together leave out, at most 2⁶³ times 2e-62, and what underflow costs.
const LEFT_OUT: f64 = 1e-40;
/// What may be left at the horizon.
const TAIL: f64 = 1e-9;
/// Most mass between two edges, unless so many ends are kept or so many states that it must be more.
const CELL: f64 = 1.0 / 2048.0;
const MOST_KEPT: f64 = (1 << 22) as f64;
/// Multiply-adds in double-double for the squarings, and for the edges.
const BUDGET: f64 = 7e8;

/// The law, evaluated where it is asked for.
#[derive(Debug)]
pub(super) struct ContinuousLaw {
    uniform: Uniform,
    start: Vec<Dd>,
    /// `exp(Q 2^k τ)`, with ends as further columns.
    powers: Vec<Vec<Stretch>>,
    /// τ is 2 to this power, in ticks.
    base: u32,
    relative: f64,
    horizon: u64,
    edges: Vec<u64>,
    kernel: Kernel,
    /// What is left, and what has entered each end, at the times asked for before.
    known: Mutex<HashMap<u64, Arc<[Dd]>>>,
}

/// The uniformized chain.
#[derive(Debug)]
struct Uniform {
    states: usize,
    ends: usize,
    /// Moves of each state, its own share first; ends follow the states in the numbering.
    moves: Vec<Vec<(u32, Dd)>>,
    /// Λ in moves a tick.
    rate: Dd,
    /// Relative error of one step.
    step_error: f64,
}

impl Uniform {
    fn of(chain: &Chain, ticks: Ticks) -> (Self, Vec<Dd>) {
        let order: Vec<u32> = chain.components().iter().flatten().copied().collect();
        let mut place = vec![u32::MAX; chain.states()];
        order.iter().enumerate().for_each(|(at, state)| place[*state as usize] = at as u32);
        let target = |state: u32| match chain.end_of(state as usize) {
            Some(end) => (order.len() + end) as u32,
            None => place[state as usize],
        };
        let rates: Vec<&RBig> = order.iter().filter_map(|state| chain.rate(*state as usize)).collect();
        let largest = rates.iter().copied().max().cloned().unwrap_or(RBig::ONE);
        let mut into = vec![1u32; order.len() + chain.ends().len()];
        let moves = order.iter().zip(&rates).enumerate().map(|(at, (state, rate))| {
            let share = to_dd(&(*rate / &largest));
            let mut moves = vec![(at as u32, to_dd(&((&largest - *rate) / &largest)))];
            for one in probabilities(chain.row(*state as usize)) {
                moves.push((target(one.to), share.times(one.probability)));
                into[target(one.to) as usize] += 1;
            }
            moves
        });
        let moves: Vec<_> = moves.collect();
        let most = f64::from(into.into_iter().max().unwrap_or(1));
        let step_error = U2 * (3.0 * most + 2.0 * INPUT + 12.0);
        let rate = to_dd(&largest).times(Dd::of(ticks.length()));
        let mut start = vec![Dd::ZERO; order.len() + chain.ends().len()];
        for one in probabilities(chain.start()) {
            let at = target(one.to) as usize;
            start[at] = start[at].plus(one.probability);
        }
        (Self { states: order.len(), ends: chain.ends().len(), moves, rate, step_error }, start)
    }

    fn width(&self) -> usize {
        self.states + self.ends
    }

    /// A distribution after `Λt = x ≤ ½`.
    fn advance(&self, mass: &[Dd], x: Dd) -> Vec<Dd> {
        if x.is_zero() {
            return mass.to_vec();
        }
        // e^{−x} = 1/e^x, all terms being positive.
        let mut term = Dd::ONE;
        let mut exponential = Dd::ONE;
        for k in 1..=TERMS {
            term = term.times(x).over(Dd::of(k as f64));
            exponential = exponential.plus(term);
        }
        let mut weight = Dd::ONE.over(exponential);
        let mut power = mass.to_vec();
        let mut next = vec![Dd::ZERO; self.width()];
        let mut sum: Vec<Dd> = mass.iter().map(|mass| mass.times(weight)).collect();
        for k in 1..=TERMS {
            weight = weight.times(x).over(Dd::of(k as f64));
            next.fill(Dd::ZERO);
            next[self.states..].copy_from_slice(&power[self.states..]);
            for (state, mass) in power[..self.states].iter().enumerate().filter(|(_, mass)| !mass.is_zero()) {
                for (to, probability) in &self.moves[state] {
                    next[*to as usize] = next[*to as usize].plus(mass.times(*probability));
                }
            }
            std::mem::swap(&mut power, &mut next);
            sum.iter_mut().zip(&power).for_each(|(sum, mass)| *sum = sum.plus(mass.times(weight)));
        }
        sum
    }

    /// Relative error of [`Uniform::advance`].
    fn advance_error(&self) -> f64 {
        let terms = TERMS as f64;
        // A weight has k factors Λt/k, each with the error of Λt too; so have the terms of the exponential.
        terms * self.step_error + U2 * (2.0 * terms * (20.0 + INPUT + 10.0) + 3.0 * terms + 30.0 + INPUT)
    }
}

/// A fraction that is not negative, within [`INPUT`] units.
fn to_dd(value: &RBig) -> Dd {
    if value.is_zero() {
        return Dd::ZERO;
    }
    let ((over, up), (under, down)) = (Dd::of_big(&value.numerator().unsigned_abs()), Dd::of_big(value.denominator()));
    let (ratio, scale) = (over.over(under), power_of_two(up - down));
    Dd { hi: ratio.hi * scale, lo: ratio.lo * scale }
}

impl ContinuousLaw {
    /// Computes the matrices up to the horizon, and the edges if the joint law is asked for.
    ///
    /// # Errors
    /// The outer error when the user asked to stop, the inner one when it would take too long.
    pub(super) fn of(
        chain: &Chain,
        ticks: Ticks,
        request: &Request,
        progress: &dyn Progress,
    ) -> Result<Result<Self, LawRefusal>, ExactError> {
        let (uniform, start) = Uniform::of(chain, ticks);
        let (n, width) = (uniform.states, uniform.width());
        // 2^base Λ ≤ ½ in ticks.
        let base = (0.5 / uniform.rate.hi).log2().floor();
        let squarings = f64::from(u64::BITS) - base;
        if base < 0.0 || squarings * (n * n) as f64 * width as f64 > BUDGET {
            return Ok(Err(LawRefusal::TooManyStates { states: n }));
        }
        let base = base as u32;
        let unit = |state: usize| {
            let mut mass = vec![Dd::ZERO; width];
            mass[state] = Dd::ONE;
            mass
        };
        let x = uniform.rate.times(Dd::of(power_of_two(i64::from(base))));
        let first: Vec<Stretch> = (0..n).map(|state| stretch(&uniform.advance(&unit(state), x))).collect();
        let advance_error = uniform.advance_error();
        let mut law = Self {
            uniform,
            start,
            powers: vec![first],
            base,
            relative: 0.0,
            horizon: 0,
            edges: Vec::new(),
            kernel: Kernel::new(),
            known: Mutex::new(HashMap::new()),
        };
        let least_level = request.levels.iter().fold(TAIL, |least, level| least.min((1.0 - level) * 0.5));
        let per_unit = ticks.per_unit();
        let latest = request.times.iter().map(|time| *time * per_unit).fold(0.0, f64::max);
        progress.begin("law of the time", "doublings", None);
        let mut error = advance_error;
        loop {
            let last = law.powers.len() as u32 - 1 + law.base;
            let time = 1u64 << last;
            if progress.interrupted() {
                return Err(ExactError::Interrupted);
            }
            progress.advance(1);
            let left = law.at(time)[0].hi;
            if (left < least_level && time as f64 >= latest) || last >= 62 {
                law.horizon = time;
                break;
            }
            let squared = law.squared();
            law.powers.push(squared);
            error = 2.0 * error + U2 * (3.0 * n as f64 + 8.0);
        }
        progress.end();
        let digits = U2 * f64::from(u64::BITS) * (3.0 * n as f64 + 8.0);
        law.relative = (2.0 * error + digits + 2.0 * advance_error + U2 * 3.0 * width as f64) * (1.0 + 1e-6);
        if request.law {
            let moves: usize = law.uniform.moves.iter().map(Vec::len).sum();
            let of_one = (n * width) as f64 * 0.5 * squarings + (TERMS * (moves + width)) as f64;
            // Each cell takes two times at its end and one or two on the way.
            let affordable = BUDGET / of_one / 4.0;
            let cell = CELL.max(2.0 * law.uniform.ends as f64 / MOST_KEPT).max(1.0 / affordable);
            law.edges = law.cut(cell, progress)?;
        }
        Ok(Ok(law))
    }

    /// The square of the last power.
    fn squared(&self) -> Vec<Stretch> {
        let (n, width) = (self.uniform.states, self.uniform.width());
        let last = &self.powers[self.powers.len() - 1];
        let square = |row: &Stretch| {
            let mut sum = Stretch::zeros(width);
            for end in n..width {
                sum.set(end, row.get(end));
            }
            for (state, of_state) in last.iter().enumerate() {
                self.add(row.get(state), of_state, &mut sum);
            }
            sum
        };
        last.iter().map(square).collect()
    }

    fn add(&self, mass: Dd, row: &Stretch, sum: &mut Stretch) {
        if !mass.is_zero() {
            self.kernel.add_multiple(mass, (&row.hi, &row.lo), (&mut sum.hi, &mut sum.lo));
        }
    }

    /// What is left at a time, and what has entered each end by then.
    fn at(&self, time: u64) -> Arc<[Dd]> {
        let mut known = self.known.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(found) = known.get(&time) {
            return Arc::clone(found);
        }
        let n = self.uniform.states;
        let mut mass = stretch(&self.start);
        for (digit, power) in self.powers.iter().enumerate().filter(|(digit, _)| time >> self.base >> digit & 1 == 1) {
            debug_assert!(digit < self.powers.len(), "no time beyond the horizon is asked for");
            let mut next = Stretch::zeros(self.uniform.width());
            for end in n..self.uniform.width() {
                next.set(end, mass.get(end));
            }
            for (state, row) in power.iter().enumerate() {
                self.add(mass.get(state), row, &mut next);
            }
            mass = next;
        }
        let rest = time & ((1 << self.base) - 1);
        let mass: Vec<Dd> = (0..self.uniform.width()).map(|at| mass.get(at)).collect();
        let mass = self.uniform.advance(&mass, self.uniform.rate.times(Dd::of_u64(rest)));
        let left = mass[..n].iter().fold(Dd::ZERO, |sum, mass| sum.plus(*mass));
        let found: Arc<[Dd]> = std::iter::once(left).chain(mass[n..].iter().copied()).collect();
        known.insert(time, Arc::clone(&found));
        found
    }

    /// Times from 0 to the horizon between which no more than `cell` of all outcomes lies.
    fn cut(&self, cell: f64, progress: &dyn Progress) -> Result<Vec<u64>, ExactError> {
        let mut edges = vec![0];
        let mut open = vec![self.horizon];
        while let Some(&to) = open.last() {
            if progress.interrupted() {
                return Err(ExactError::Interrupted);
            }
            let from = edges[edges.len() - 1];
            if to - from <= 1 || self.at(from)[0].hi - self.at(to)[0].hi <= cell {
                edges.push(to);
                open.pop();
            } else {
                // Where times differ by orders of magnitude, halve their logarithms.
                let middle = if from > 0 && to / from > 4 {
                    ((from as f64) * (to as f64)).sqrt() as u64
                } else {
                    from + (to - from) / 2
                };
                let middle = if from == 0 && to > 1 << 8 { to >> 4 } else { middle };
                open.push(middle.clamp(from + 1, to - 1));
            }
        }
        Ok(edges)
    }

    fn bounded(&self, value: Dd) -> Bounded {
        Bounded::probability(Bounded::within(value, value.hi * self.relative + LEFT_OUT))
    }

    pub(super) fn horizon(&self) -> u64 {
        self.horizon
    }

    pub(super) fn survival(&self, time: u64) -> Bounded {
        let Bounded { value, low, high } = self.bounded(self.at(time.min(self.horizon))[0]);
        if time > self.horizon { Bounded { value: 0.5 * high, low: 0.0, high } } else { Bounded { value, low, high } }
    }

    pub(super) fn edges(&self) -> &[u64] {
        &self.edges
    }

    pub(super) fn ends(&self) -> usize {
        self.uniform.ends
    }

    pub(super) fn at_edge(&self, end: usize, edge: usize) -> Bounded {
        self.bounded(self.at(self.edges[edge])[1 + end])
    }
}

fn stretch(values: &[Dd]) -> Stretch {
    let mut stretch = Stretch::zeros(values.len());
    values.iter().enumerate().for_each(|(at, value)| stretch.set(at, *value));
    stretch
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::{Model, Silent};

    fn law(text: &str, longest: f64) -> (ContinuousLaw, Ticks) {
        let model = Model::from_toml(text).unwrap();
        let ticks = Ticks::for_longest(longest);
        let request = Request { law: true, ..Request::default() };
        (ContinuousLaw::of(model.chain(), ticks, &request, &Silent).unwrap().unwrap(), ticks)
    }

    // S(t) = 3e^{−t} − 3e^{−2t} + e^{−3t}, that of the largest of three exponential times (Rényi, from memory); in doubles,
    // which are good to a few units where nothing cancels.
    #[test]
    fn a_hypoexponential_law_is_that_of_the_formula() {
        let (law, ticks) = law(
            "clock = \"rates\"\nstart = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { b = 1 }\nb = { c = 2 }\nc = { x = 3 }\n",
            11.0 / 6.0,
        );
        for time in [0.01, 0.5, 1.0, 3.0, 10.0, 20.0] {
            let count = (time * ticks.per_unit()) as u64;
            let t = ticks.time(count);
            let truth = 3.0 * (-t).exp() - 3.0 * (-2.0 * t).exp() + (-3.0 * t).exp();
            let found = law.survival(count);
            assert!((found.value / truth - 1.0).abs() < 1e-14, "{t}: {found:?} {truth}");
            assert!((found.high - found.low) / found.value < 1e-15, "{found:?}");
        }
        let one = law.survival(ticks.per_unit() as u64);
        assert!((one.value - 0.747_419_542_172_352_8).abs() < 2e-16, "{one:?}");
        assert!(law.survival(law.horizon()).high < 1e-9 && law.survival(u64::MAX).low == 0.0);
        let gaps = law.edges().windows(2).map(|pair| law.survival(pair[0]).value - law.survival(pair[1]).value);
        assert!(gaps.fold(0.0, f64::max) <= CELL && law.edges().len() < 6000, "{}", law.edges().len());
    }

    // Two competing ends from one state: P(x, T ≤ t) = (a/(a + b)) (1 − e^{−(a + b) t}); and rates 1e12 apart: the slow state
    // decays as e^{−st} with s the product of its small rates, to first order in 1e-12.
    #[test]
    fn ends_compete_and_stiff_rates_are_held() {
        let (law, ticks) =
            law("clock = \"rates\"\nstart = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { x = 2, y = 6 }\n", 0.125);
        for edge in [1, law.edges().len() / 2, law.edges().len() - 1] {
            let truth = 0.25 * -(-8.0 * ticks.time(law.edges()[edge])).exp_m1();
            assert!((law.at_edge(0, edge).value - truth).abs() <= 1e-15, "{edge}");
        }
        let (law, ticks) = self::law(
            "clock = \"rates\"\nstart = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { b = 1e-6 }\nb = { a = 1e6, x = 1e6 }\n",
            2e6,
        );
        for days in [1e3, 1e6, 1e7] {
            let found = law.survival((days * ticks.per_unit()) as u64);
            let truth = (-0.5e-6 * days).exp();
            assert!((found.value / truth - 1.0).abs() < 1e-11, "{days}: {found:?} {truth}");
            assert!((found.high - found.low) / found.value < 1e-11, "{found:?}");
        }
    }
}
