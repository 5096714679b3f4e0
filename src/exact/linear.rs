//! The answers that come from the factored chain: sums over ends, the mean, the variance.

use crate::model::{Model, Progress};

use super::bounded::Bounded;
use super::costs::{self, CostAnswer};
use super::dd::{Dd, INPUT, U2};
use super::deviations::{Covariance, Gathered, covariance};
use super::elimination::{Elimination, Solution, usable_probabilities};
use super::holding::Holding;
use super::shape::ORDERS;
use super::stopped::Stopped;
use super::{ExactError, Request, envelope, reference};

/// `E[C(T + j − 1, j); slot]` for one slot, or in continuous time `E[T^j; slot]/j!`, `j` from 0: the probability of stopping
/// there, the mean of the time, and so on.
#[derive(Debug, Clone, Default)]
pub(super) struct RisingSums {
    /// As far as they could be computed.
    pub(super) of: Vec<Dd>,
}

/// The sums of every slot, with the relative error of each order.
#[derive(Debug)]
pub(super) struct Rising {
    pub(super) slots: Vec<RisingSums>,
    pub(super) errors: Vec<f64>,
}

/// Everything linear.
#[derive(Debug)]
pub(super) struct Linear {
    pub(super) ends: Vec<RisingSums>,
    /// Relative error of the sums of each order.
    pub(super) errors: Vec<f64>,
    pub(super) mean: Bounded,
    pub(super) variance: Bounded,
    /// The longest mean time from a state on, and the mean number of moves from the start; rounded.
    pub(super) longest: f64,
    pub(super) moves: f64,
    /// Answers of the costs that were asked for, by their numbers in the model.
    pub(super) costs: Vec<(usize, CostAnswer)>,
}

/// The distribution over states that a state's moves lead to, or that of the start.
pub(super) fn distribution(stopped: &Stopped<'_>, from: Option<usize>) -> Result<Solution, ExactError> {
    let chain = stopped.chain();
    let mut of = vec![Dd::ZERO; chain.states()];
    usable_probabilities(chain, from)?.iter().for_each(|one| of[one.to as usize] = one.probability);
    Ok(Solution { of, error: U2 * INPUT })
}

/// The sum of products over `terms` of two numbers that are not negative, with the error that the summation adds.
pub(super) fn sum_of_products(terms: impl Iterator<Item = (Dd, Dd)>) -> (Dd, f64) {
    let mut count = 0u32;
    let sum = terms.fold(Dd::ZERO, |sum, (a, b)| {
        count += 1;
        sum.plus(a.times(b))
    });
    (sum, U2 * (3.0 * f64::from(count) + 5.0))
}

impl Linear {
    pub(super) fn solve(model: &Model, request: &Request, progress: &dyn Progress) -> Result<Self, ExactError> {
        let chain = model.chain();
        let stopped = Stopped::in_ends(chain);
        let start = distribution(&stopped, None)?;
        let holding = Holding::of_chain(chain)?;
        let elimination = Elimination::of(&stopped, progress)?;
        let times = elimination.column(&holding.once(chain.states()))?;
        let begins = chain.start().targets;
        let (mean, adding) = start_sum(&start, &times, begins);
        let mean_error = start.error + times.error + adding;
        let around_start = || ExactError::OutOfRange { example: chain.name(begins[0] as usize).to_owned() };
        let mean_bound = Bounded::relative(mean, mean_error).ok_or_else(around_start)?;

        let visits = elimination.row(&start)?;
        let mean_off = mean_error * mean.hi;
        let time = Gathered { pace: &|_| 1, jump: &|_, _| 0, gains: &times, losses: None, mean: (mean, mean_off) };
        let squares = covariance(&stopped, &holding, &start, &visits, &time, &time)?;
        let going_on = || stopped.classes().iter().flatten().map(|state| *state as usize);
        let longest = going_on().map(|state| times.of[state].hi).fold(0.0, f64::max);
        let moves = going_on().map(|state| visits.of[state].hi).sum();
        let spent = holding.spent(chain, visits.clone())?;
        let steps = if holding.is_one_step() { mean } else { Dd::ZERO };
        let second_moment = second_moment(&stopped, &spent, &times, steps, (mean, mean_error));
        let wanted = request.costs.iter().map(|number| (*number, &model.costs()[*number]));
        let costs = wanted
            .map(|(number, cost)| Ok((number, costs::answer(cost, &elimination, &holding, &start, &visits, &time)?)))
            .collect::<Result<_, ExactError>>()?;
        let Rising { slots: ends, errors } = rising(&elimination, &holding, &start, visits, ORDERS)?;
        for (end, sums) in chain.ends().iter().zip(&ends).filter(|(_, sums)| !sums.of[0].is_zero()) {
            if !sums.of[1].over(sums.of[0]).is_in_range() {
                return Err(ExactError::OutOfRange { example: end.name.clone() });
            }
        }
        let variance = narrower(squares, second_moment);
        let variance = variance.ok_or_else(around_start)?;
        reference::confirm(chain, &going_on().collect::<Vec<_>>(), &holding, mean_bound)?;
        Ok(Self { ends, errors, mean: mean_bound, variance, longest, moves, costs })
    }
}

/// The mean over the start of a solution, with the relative error that the sum adds.
pub(super) fn start_sum(start: &Solution, of: &Solution, begins: &[u32]) -> (Dd, f64) {
    sum_of_products(begins.iter().map(|state| (start.of[*state as usize], of.of[*state as usize])))
}

/// The sums of every slot from a starting distribution on; `visits` is its row solution.
///
/// # Errors
/// When the first two orders are out of range: higher ones only guide the plan, and end the list.
pub(super) fn rising(
    elimination: &Elimination<'_>,
    holding: &Holding,
    start: &Solution,
    mut visits: Solution,
    orders: usize,
) -> Result<Rising, ExactError> {
    let stopped = elimination.stopped();
    let mut all = Rising { slots: vec![RisingSums::default(); stopped.slots()], errors: Vec::new() };
    for order in 0..orders {
        let error = rising_sums(elimination, &visits, &mut all.slots)?;
        all.errors.push(error);
        if order == 0 {
            for state in (0..start.of.len()).filter(|state| !start.of[*state].is_zero()) {
                if let Some(slot) = stopped.slot(state) {
                    let sum = &mut all.slots[slot].of[0];
                    *sum = sum.plus(start.of[state]);
                    all.errors[0] += U2 * 3.0;
                }
            }
        }
        if order + 1 < orders {
            let next = holding.spent(stopped.chain(), visits).and_then(|spent| elimination.row(&spent));
            match next {
                Ok(next) => visits = next,
                Err(ExactError::OutOfRange { .. }) if order > 0 => break,
                Err(refused) => return Err(refused),
            }
        }
    }
    Ok(all)
}

/// Adds the next order to the sums of every slot; returns their relative error.
fn rising_sums(elimination: &Elimination<'_>, visits: &Solution, slots: &mut [RisingSums]) -> Result<f64, ExactError> {
    let stopped = elimination.stopped();
    let mut sums = vec![Dd::ZERO; slots.len()];
    let mut terms = vec![0u32; slots.len()];
    for state in stopped.classes().iter().flatten().map(|state| *state as usize) {
        for one in elimination.moves(state) {
            let Some(slot) = stopped.slot(one.to as usize) else { continue };
            let term = envelope::product(one.probability, visits.of[state])
                .map_err(|_| ExactError::OutOfRange { example: stopped.chain().name(state).to_owned() })?;
            sums[slot] = sums[slot].plus(term);
            terms[slot] += 1;
        }
    }
    for (slot, sum) in slots.iter_mut().zip(sums) {
        slot.of.push(sum);
    }
    let most = terms.into_iter().max().unwrap_or(0);
    Ok(visits.error + U2 * (3.0 * f64::from(most) + INPUT + 5.0))
}

/// The answer of the smaller error; `None` when neither is a finite number.
fn narrower(one: Covariance, other: Covariance) -> Option<Bounded> {
    let is_better = other.value.hi.is_finite() && (one.error.is_nan() || other.error < one.error);
    let Covariance { value, error } = if is_better { other } else { one };
    Bounded::within(value, error)
}

/// `Var T = 2 E[C(T + 1, 2)] − m − m²`, where `E[C(T + 1, 2)] = α N² 1 = Σ_i y_i h_i`; in continuous time
/// `Var T = 2 Σ_i y_i θ_i h_i − m²`. It cancels where the time hardly varies, but its error does not grow with the mean.
/// `spent` are the mean times spent in each state, and `steps` is what is taken off besides m².
fn second_moment(
    stopped: &Stopped<'_>,
    spent: &Solution,
    times: &Solution,
    steps: Dd,
    (mean, mean_error): (Dd, f64),
) -> Covariance {
    let states = stopped.classes().iter().flatten().map(|state| *state as usize);
    let (sum, adding) = sum_of_products(states.map(|state| (spent.of[state], times.of[state])));
    let (twice, square) = (sum.times(Dd::of(2.0)), mean.times(mean));
    let value = twice.minus(steps).minus(square);
    let sum_error = spent.error + times.error + adding;
    let sizes = twice.hi + mean.hi + square.hi;
    let error = twice.hi * sum_error + (mean.hi + 2.0 * square.hi) * mean_error + 16.0 * U2 * sizes;
    Covariance { value, error: error * (1.0 + 1e-10) }
}
