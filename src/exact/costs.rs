//! The answers of a cost: mean, variance, covariance with the time, and moments for planning.
//!
//! Gains and losses are solved apart, so that nothing cancels within a solution; the mean is their difference, within the
//! error of both together, which is what its bound states. A cost that the moves alone fix is exact.

use std::collections::HashMap;

use crate::model::Cost;

use super::bounded::Bounded;
use super::dd::{Dd, INPUT, U2};
use super::deviations::{Covariance, Gathered, covariance};
use super::elimination::{Elimination, Solution};
use super::holding::Holding;
use super::linear::start_sum;
use super::stopped::Stopped;
use super::{ExactError, Shape};

/// The answers of one cost, in its unit.
#[derive(Debug, Clone)]
pub(super) struct CostAnswer {
    pub(super) mean: Bounded,
    pub(super) variance: Bounded,
    pub(super) covariance: Bounded,
    pub(super) shape: Shape,
    /// The only amount, as the moves fix it, times the denominator.
    pub(super) only: Option<i128>,
    /// Moments of the product of the deviations of cost and time.
    pub(super) product: Option<Shape>,
}

/// Solves a cost.
///
/// # Complexity
/// Two solves of the factored chain for the answers; some fifty for the moments.
pub(super) fn answer(
    cost: &Cost,
    elimination: &Elimination<'_>,
    holding: &Holding,
    start: &Solution,
    visits: &Solution,
    time: &Gathered<'_>,
) -> Result<CostAnswer, ExactError> {
    let stopped = elimination.stopped();
    let begins = stopped.chain().start().targets;
    let around_start = || ExactError::OutOfRange { example: stopped.chain().name(begins[0] as usize).to_owned() };
    let (pace, jump) = (|state: usize| cost.of_visit(state), |from: usize, to: usize| cost.of_move(from, to));
    let side = |sign: i64| {
        let part = move |amount: i64| (amount * sign).max(0).unsigned_abs();
        amounts(elimination, holding, |state| part(pace(state)), |from, to| part(jump(from, to)))
    };
    let (gains, losses) = (elimination.column(&side(1))?, elimination.column(&side(-1))?);
    let ((gained, adding), (lost, _)) = (start_sum(start, &gains, begins), start_sum(start, &losses, begins));
    let mean = gained.minus(lost);
    let relative = start.error + gains.error + losses.error + adding + 6.0 * U2;
    let mean_error = (gained.hi + lost.hi) * relative * (1.0 + 1e-10);
    let gathered =
        Gathered { pace: &pace, jump: &jump, gains: &gains, losses: Some(&losses), mean: (mean, mean_error) };

    let unit = Dd::of_u64(cost.denominator);
    let square = unit.times(unit);
    let scaled = |value: Dd, error: f64, by: Dd| {
        let quotient = value.over(by);
        (quotient, error / by.hi * (1.0 + 1e-10) + quotient.hi.abs() * 25.0 * U2)
    };
    let variance = covariance(stopped, holding, start, visits, &gathered, &gathered)?;
    let together = covariance(stopped, holding, start, visits, &gathered, time)?;
    let bounded = |Covariance { value, error }: Covariance, by: Dd| scaled(value, error, by);
    let (mean_value, mean_off) = scaled(mean, mean_error, unit);
    let (variance_value, variance_off) = bounded(variance, square);
    let (covariance_value, covariance_off) = bounded(together, unit);
    let moments = Moments { elimination, holding, start, gathered: &gathered, time };
    // In continuous time what a state adds while it is held is never fixed.
    let is_fixed_by_moves = holding.is_one_step() || cost.is_of_moves_alone();
    let step = |from: usize, to: usize| cost.of_step(from, to);
    let scale = 1.0 / cost.denominator as f64;
    let mut answer = CostAnswer {
        mean: Bounded::signed(mean_value, mean_off).ok_or_else(around_start)?,
        variance: Bounded::within(variance_value, variance_off).ok_or_else(around_start)?,
        covariance: Bounded::signed(covariance_value, covariance_off).ok_or_else(around_start)?,
        shape: moments.of_cost(mean_value.hi, scale)?,
        only: is_fixed_by_moves.then(|| stopped.only_amount(|_| true, step)).flatten(),
        product: moments.of_product(scale)?,
    };
    if let Some(only) = answer.only {
        answer.fix(only, cost.denominator);
    }
    Ok(answer)
}

impl CostAnswer {
    /// The answers of a cost that does not vary.
    fn fix(&mut self, only: i128, denominator: u64) {
        let value = only as f64 / denominator as f64;
        let is_whole = only.unsigned_abs() < 1 << 53 && only % i128::from(denominator) == 0;
        self.mean = if is_whole {
            Bounded::exactly(value)
        } else {
            // The rounding of the two conversions and the quotient.
            Bounded { value, low: value.next_down().next_down(), high: value.next_up().next_up() }
        };
        self.variance = Bounded::exactly(0.0);
        self.covariance = Bounded::exactly(0.0);
        self.shape = Shape::constant(value);
        self.product = None;
    }
}

/// The mean amount of one visit of each state and the move after it, stays included.
fn amounts(
    elimination: &Elimination<'_>,
    holding: &Holding,
    pace: impl Fn(usize) -> u64,
    jump: impl Fn(usize, usize) -> u64,
) -> Solution {
    let stopped = elimination.stopped();
    let mut of = vec![Dd::ZERO; stopped.chain().states()];
    for state in stopped.classes().iter().flatten().map(|state| *state as usize) {
        let held = Dd::of_u64(pace(state));
        let held = holding.of(state).map_or(held, |mean| held.times(mean));
        of[state] = elimination
            .steps(state)
            .fold(held, |sum, one| sum.plus(one.probability.times(Dd::of_u64(jump(state, one.to as usize)))));
    }
    Solution { of, error: elimination.row_sum_error() + U2 * (INPUT + 8.0) }
}

/// Orders of the moments of a cost, and of the product of its deviation with that of the time.
const ORDERS: usize = 8;
const PRODUCT_ORDERS: usize = 4;

/// Joint central moments of cost and time, for planning: guides without bounds.
///
/// `c⁽ᵖ'ᵠ⁾_i = E_i[(C − x_i)ᵖ (T − h_i)ᵠ]` solves `(I − Q) c = g` with
/// `g_i = Σ_j p_ij Σ_{(l,m) < (p,q)} C(p,l) C(q,m) E[d_ij^{p−l} e_ij^{q−m}] c⁽ˡ'ᵐ⁾_j`; gains and losses of `g` are solved apart.
/// In continuous time the deviations d and e vary with the holding time.
struct Moments<'m, 's> {
    elimination: &'m Elimination<'m>,
    holding: &'m Holding,
    start: &'m Solution,
    gathered: &'m Gathered<'s>,
    time: &'m Gathered<'s>,
}

/// The moments from each state on, by their two orders, with the sizes that cancelled.
type Known = HashMap<(usize, usize), Vec<(f64, f64)>>;

/// A moment may be off by this share of itself, or of the matching power of the spread.
const LARGEST_ERROR: f64 = 0.01;
/// What a unit of cancelled size costs, generously: these moments are formed in doubles.
const LOSS: f64 = 1e-13;

impl Moments<'_, '_> {
    fn of_cost(&self, mean: f64, scale: f64) -> Result<Shape, ExactError> {
        let mut known = Known::new();
        let mut central = Vec::new();
        for order in 2..=ORDERS {
            let Some((value, size)) = self.moment(order, 0, &mut known)? else { break };
            let spread = central.first().copied().flatten().unwrap_or(0.0_f64).powf(order as f64 / 2.0);
            let scaled = value * scale.powi(order as i32);
            let good = size * scale.powi(order as i32) * LOSS <= LARGEST_ERROR * scaled.abs().max(spread);
            central.push(good.then_some(scaled));
        }
        Ok(Shape::of_central(mean, &central))
    }

    fn of_product(&self, scale: f64) -> Result<Option<Shape>, ExactError> {
        let mut known = Known::new();
        let mut raw = [0.0; PRODUCT_ORDERS + 1];
        for (order, slot) in raw.iter_mut().enumerate().skip(1) {
            let Some((value, size)) = self.moment(order, order, &mut known)? else { return Ok(None) };
            // Even orders are sizes themselves; odd ones only shift the skewness.
            if order % 2 == 0 && size * LOSS > LARGEST_ERROR * value.abs() {
                return Ok(None);
            }
            *slot = value * scale.powi(order as i32);
        }
        let [_, m1, m2, m3, m4] = raw;
        let second = m2 - m1 * m1;
        let third = m3 - 3.0 * m1 * m2 + 2.0 * m1.powi(3);
        let fourth = m4 - 4.0 * m1 * m3 + 6.0 * m1 * m1 * m2 - 3.0 * m1.powi(4);
        let is_known = second > LARGEST_ERROR * LARGEST_ERROR * m2;
        Ok(is_known.then(|| Shape::of_central(m1, &[Some(second), Some(third), Some(fourth)])))
    }

    /// `E[(C − E C)ᵖ (T − E T)ᵠ]` in the unit of the scaled cost, and the size that cancelled; `None` when out of range.
    fn moment(&self, p: usize, q: usize, known: &mut Known) -> Result<Option<(f64, f64)>, ExactError> {
        let stopped = self.elimination.stopped();
        for (a, b) in orders_up_to(p, q) {
            if !known.contains_key(&(a, b)) {
                let Some(solved) = self.solve(a, b, known)? else { return Ok(None) };
                known.insert((a, b), solved);
            }
        }
        let mut total = (0.0, 0.0);
        for state in stopped.chain().start().targets.iter().map(|state| *state as usize) {
            let step = Step {
                d: self.gathered.deviation_of_start(stopped, state).0.hi,
                e: self.time.deviation_of_start(stopped, state).0.hi,
                held: None,
            };
            let (value, size) = expanded(stopped, (p, q), &step, state, known, true);
            let share = self.start.of[state].hi;
            total = (total.0 + share * value, total.1 + share * size);
        }
        Ok((total.0.is_finite() && total.1.is_finite()).then_some(total))
    }

    /// Solves for the moments of two orders from each state on, all lower ones being known.
    fn solve(&self, p: usize, q: usize, known: &Known) -> Result<Option<Vec<(f64, f64)>>, ExactError> {
        let stopped = self.elimination.stopped();
        let states = stopped.chain().states();
        let mut signed = [vec![Dd::ZERO; states], vec![Dd::ZERO; states]];
        for state in stopped.classes().iter().flatten().map(|state| *state as usize) {
            for one in self.elimination.steps(state) {
                let to = one.to as usize;
                let held = |of: &Gathered<'_>| of.held(self.holding, state).0.hi;
                let step = Step {
                    d: self.gathered.deviation(stopped, self.holding, state, to).0.hi,
                    e: self.time.deviation(stopped, self.holding, state, to).0.hi,
                    held: self.holding.of(state).map(|_| (held(self.gathered), held(self.time))),
                };
                let (value, _) = expanded(stopped, (p, q), &step, to, known, false);
                let term = one.probability.hi * value;
                if !term.is_finite() {
                    return Ok(None);
                }
                let side = &mut signed[usize::from(term < 0.0)][state];
                *side = side.plus(Dd::of(term.abs()));
            }
        }
        let mut sides = Vec::new();
        for of in signed {
            match self.elimination.column(&Solution { of: flushed(of), error: 0.0 }) {
                Ok(solution) => sides.push(solution.of),
                Err(ExactError::OutOfRange { .. }) => return Ok(None),
                Err(error) => return Err(error),
            }
        }
        let join = |state: usize| (sides[0][state].hi - sides[1][state].hi, sides[0][state].hi + sides[1][state].hi);
        Ok(Some((0..states).map(join).collect()))
    }
}

/// What would be refused as too small for the arithmetic, and matters to no plan.
fn flushed(mut of: Vec<Dd>) -> Vec<Dd> {
    of.iter_mut().filter(|x| x.hi < 1e-150).for_each(|x| *x = Dd::ZERO);
    of
}

/// Pairs of orders up to a pair, in an order in which each comes after all that it rests on; the trivial ones left out.
fn orders_up_to(p: usize, q: usize) -> impl Iterator<Item = (usize, usize)> {
    (2..=p + q).flat_map(move |sum| (0..=sum).map(move |a| (a, sum - a)).filter(move |(a, b)| *a <= p && *b <= q))
}

fn binomial(n: usize, k: usize) -> f64 {
    (0..k).fold(1.0, |c, i| c * (n - i) as f64 / (i + 1) as f64)
}

/// The deviations of a step: those of its mean, and in continuous time how much each varies with the holding time, by its
/// means.
struct Step {
    d: f64,
    e: f64,
    held: Option<(f64, f64)>,
}

/// The moments of an exponential time of mean 1 less 1.
const SUBFACTORIALS: [f64; 9] = [1.0, 0.0, 1.0, 2.0, 9.0, 44.0, 265.0, 1854.0, 14833.0];

impl Step {
    /// `E[d^a e^b]`.
    fn power(&self, a: usize, b: usize) -> f64 {
        let Some((v, w)) = self.held else { return self.d.powi(a as i32) * self.e.powi(b as i32) };
        // Both deviate by a multiple of the same exponential time of mean 1, less 1.
        let mut sum = 0.0;
        for i in 0..=a {
            for j in 0..=b {
                let mean_part = self.d.powi((a - i) as i32) * self.e.powi((b - j) as i32);
                sum += binomial(a, i)
                    * binomial(b, j)
                    * mean_part
                    * v.powi(i as i32)
                    * w.powi(j as i32)
                    * SUBFACTORIALS[i + j];
            }
        }
        sum
    }
}

/// `Σ C(p,l) C(q,m) E[d^{p−l} e^{q−m}] c⁽ˡ'ᵐ⁾` over lower orders, or over all of them, with the sum of absolute values.
fn expanded(
    stopped: &Stopped<'_>,
    (p, q): (usize, usize),
    step: &Step,
    state: usize,
    known: &Known,
    all: bool,
) -> (f64, f64) {
    let (mut value, mut size) = (0.0, 0.0);
    for l in 0..=p {
        for m in 0..=q {
            let moment = match (l, m) {
                (0, 0) => (1.0, 1.0),
                (1, 0) | (0, 1) => (0.0, 0.0),
                _ if (l, m) == (p, q) && !all => (0.0, 0.0),
                _ if stopped.slot(state).is_some() => (0.0, 0.0),
                _ => known.get(&(l, m)).map_or((0.0, 0.0), |of| of[state]),
            };
            let factor = binomial(p, l) * binomial(q, m) * step.power(p - l, q - m);
            value += factor * moment.0;
            size += factor.abs() * moment.1;
        }
    }
    (value, size)
}
