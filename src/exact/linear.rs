//! The answers that come from the factored chain: sums over ends, the mean, the variance.

use crate::model::{Chain, Progress};

use super::bounded::Bounded;
use super::dd::{Dd, INPUT, SMALLEST, U2};
use super::elimination::{Elimination, Solution, usable_probabilities};
use super::reference;
use super::shape::ORDERS;
use super::{ExactError, envelope};

/// `E[C(T + j − 1, j); end]` for one end, `j` from 0: the probability of the end, the mean of the time there, and so on.
#[derive(Debug, Clone, Default)]
pub(super) struct RisingSums {
    /// As far as they could be computed; at least two.
    pub(super) of: Vec<Dd>,
}

/// Everything linear.
#[derive(Debug)]
pub(super) struct Linear {
    pub(super) ends: Vec<RisingSums>,
    /// Relative error of the sums of each order.
    pub(super) errors: Vec<f64>,
    pub(super) mean: Bounded,
    pub(super) variance: Bounded,
}

/// The start, over states.
fn start(chain: &Chain) -> Result<Solution, ExactError> {
    let mut of = vec![Dd::ZERO; chain.states()];
    usable_probabilities(chain, None)?.iter().for_each(|one| of[one.to as usize] = one.probability);
    Ok(Solution { of, error: U2 * INPUT })
}

/// The sum of products over `terms` of two numbers that are not negative, with the error that the summation adds.
fn sum_of_products(terms: impl Iterator<Item = (Dd, Dd)>) -> (Dd, f64) {
    let mut count = 0u32;
    let sum = terms.fold(Dd::ZERO, |sum, (a, b)| {
        count += 1;
        sum.plus(a.times(b))
    });
    (sum, U2 * (3.0 * f64::from(count) + 5.0))
}

impl Linear {
    pub(super) fn solve(chain: &Chain, progress: &dyn Progress) -> Result<Self, ExactError> {
        let start = start(chain)?;
        let elimination = Elimination::of(chain, progress)?;
        let transient: Vec<usize> = chain.components().iter().flatten().map(|state| *state as usize).collect();
        let ones = Solution { of: vec![Dd::ONE; chain.states()], error: 0.0 };
        let times = elimination.column(&ones)?;
        let begins: Vec<usize> = chain.start().targets.iter().map(|state| *state as usize).collect();
        let (mean, adding) = sum_of_products(begins.iter().map(|state| (start.of[*state], times.of[*state])));
        let mean_error = start.error + times.error + adding;

        let mut visits = elimination.row(&start)?;
        let around_start = || ExactError::OutOfRange { example: chain.name(begins[0]).to_owned() };
        let mean_bound = Bounded::relative(mean, mean_error).ok_or_else(around_start)?;
        let squares = squares(&elimination, &transient, &start, &times, &visits, (mean, mean_error))?;
        let mut ends = vec![RisingSums::default(); chain.ends().len()];
        let mut errors = Vec::new();
        for order in 0..ORDERS {
            errors.push(rising_sums(&elimination, &transient, &visits, &mut ends)?);
            if order == 0 {
                for state in begins.iter().filter(|state| chain.end_of(**state).is_some()) {
                    let sum = &mut ends[chain.end_of(*state).unwrap_or_default()].of[0];
                    *sum = sum.plus(start.of[*state]);
                    errors[0] += U2 * 3.0;
                }
            }
            match elimination.row(&visits) {
                Ok(next) => visits = next,
                // Means are answers; higher orders only guide the plan.
                Err(_) if order > 0 => break,
                Err(refused) => return Err(refused),
            }
        }
        for (end, sums) in chain.ends().iter().zip(&ends).filter(|(_, sums)| !sums.of[0].is_zero()) {
            if !sums.of[1].over(sums.of[0]).is_in_range() {
                return Err(ExactError::OutOfRange { example: end.name.clone() });
            }
        }
        let variance = squares.narrower(second_moment(&ends, &errors, (mean, mean_error)));
        let variance = variance.ok_or_else(around_start)?;
        reference::confirm(chain, &transient, mean_bound)?;
        Ok(Self { ends, errors, mean: mean_bound, variance })
    }
}

/// Adds the next order to the sums of every end; returns their relative error.
fn rising_sums(
    elimination: &Elimination<'_>,
    transient: &[usize],
    visits: &Solution,
    ends: &mut [RisingSums],
) -> Result<f64, ExactError> {
    let chain = elimination.chain();
    let mut sums = vec![Dd::ZERO; ends.len()];
    let mut terms = vec![0u32; ends.len()];
    for state in transient {
        for one in elimination.moves(*state) {
            let Some(end) = chain.end_of(one.to as usize) else { continue };
            let term = envelope::product(one.probability, visits.of[*state])
                .map_err(|_| ExactError::OutOfRange { example: chain.name(*state).to_owned() })?;
            sums[end] = sums[end].plus(term);
            terms[end] += 1;
        }
    }
    for (end, sum) in ends.iter_mut().zip(sums) {
        end.of.push(sum);
    }
    let most = terms.into_iter().max().unwrap_or(0);
    Ok(visits.error + U2 * (3.0 * f64::from(most) + INPUT + 5.0))
}

/// A variance with an absolute error, before it is an answer.
#[derive(Debug, Clone, Copy)]
struct Variance {
    value: Dd,
    error: f64,
}

impl Variance {
    /// The answer of the smaller error; `None` when neither is a finite number.
    fn narrower(self, other: Option<Self>) -> Option<Bounded> {
        let better =
            other.filter(|other| other.value.hi.is_finite() && (!self.error.is_finite() || other.error < self.error));
        let Self { value, error } = better.unwrap_or(self);
        Bounded::within(value, error)
    }
}

/// `Var T = 2 E[C(T + 1, 2)] − m − m²`: it cancels where the time hardly varies, but its error does not grow with the mean.
fn second_moment(ends: &[RisingSums], errors: &[f64], (mean, mean_error): (Dd, f64)) -> Option<Variance> {
    let sum = ends.iter().try_fold(Dd::ZERO, |sum, end| Some(sum.plus(*end.of.get(2)?)))?;
    let (twice, square) = (sum.times(Dd::of(2.0)), mean.times(mean));
    let value = twice.minus(mean).minus(square);
    let sum_error = errors.get(2)? + U2 * 3.0 * ends.len() as f64;
    let sizes = twice.hi + mean.hi + square.hi;
    let error = twice.hi * sum_error + (mean.hi + 2.0 * square.hi) * mean_error + 16.0 * U2 * sizes;
    Some(Variance { value, error: error * (1.0 + 1e-10) })
}

/// `Var T = y·g + Σ α_i (h_i − m)²`, where `g_i = Σ_j p_ij (1 + h_j − h_i)²`: a sum of squares, so that only the deviations
/// cancel, and each of those is held to its absolute error.
fn squares(
    elimination: &Elimination<'_>,
    transient: &[usize],
    start: &Solution,
    times: &Solution,
    visits: &Solution,
    (mean, mean_error): (Dd, f64),
) -> Result<Variance, ExactError> {
    let chain = elimination.chain();
    let mut total = Squares::default();
    for state in transient {
        let own = times.of[*state];
        for one in usable_probabilities(chain, Some(*state))? {
            let after = if chain.end_of(one.to as usize).is_some() { Dd::ZERO } else { times.of[one.to as usize] };
            // A stay, and any move between states of equal mean, deviates by exactly one step.
            let (deviation, off) = if after == own {
                (Dd::ONE, if one.to as usize == *state { 0.0 } else { times.error * (own.hi + after.hi) })
            } else {
                let scale = 1.0 + own.hi + after.hi;
                (after.minus(own).sum(Dd::ONE), times.error * (own.hi + after.hi) + 8.0 * U2 * scale)
            };
            total.add(one.probability.times(visits.of[*state]), deviation, off);
        }
    }
    for one in usable_probabilities(chain, None)? {
        let own = if chain.end_of(one.to as usize).is_some() { Dd::ZERO } else { times.of[one.to as usize] };
        if own != mean {
            let off = times.error * own.hi + mean_error * mean.hi + 8.0 * U2 * (own.hi + mean.hi);
            total.add(start.of[one.to as usize], own.minus(mean), off);
        } else if chain.start().targets.len() > 1 {
            total.add(start.of[one.to as usize], Dd::ZERO, times.error * own.hi + mean_error * mean.hi);
        }
    }
    let relative = visits.error + U2 * (INPUT + 20.0 + 3.0 * total.terms);
    Ok(Variance { value: total.sum, error: total.absolute + total.sum.hi * relative * (1.0 + 1e-10) })
}

/// A weighted sum of squares of numbers that are known within absolute errors.
#[derive(Default)]
struct Squares {
    sum: Dd,
    absolute: f64,
    terms: f64,
}

impl Squares {
    fn add(&mut self, weight: Dd, deviation: Dd, off: f64) {
        // (d ± off)² is within 2 |d| off + off² of d²; the factor covers the rounding of these few operations.
        let slack = off * (2.0 * deviation.hi.abs() + off) * (1.0 + 1e-10);
        if weight.hi < SMALLEST {
            // Such a weight has no relative bound: all that its term can be is counted as error.
            self.absolute += SMALLEST * (deviation.hi * deviation.hi + slack) * (1.0 + 1e-9);
        } else {
            self.sum = self.sum.plus(weight.times(deviation.times(deviation)));
            self.absolute += weight.hi * slack;
        }
        self.terms += 1.0;
    }
}
