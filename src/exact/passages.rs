//! Answers about single states and sets of states: first passages, and how often a state is visited.
//!
//! # Formula
//! Let the chain stop at state `j` too. From the start it stops there with probability `f`; from a step out of `j` it comes
//! back with probability `1 − e`, and stops in an end before that with probability `e`. Both and their complements are
//! absorption probabilities, so nothing is subtracted: the visits have mean `f/e` and variance `(f/e²)[(1 − e) + (1 − f)]`.

use crate::model::{Chain, Hit, Progress};

use super::bounded::Bounded;
use super::dd::{Dd, U2};
use super::elimination::{Elimination, Solution};
use super::holding::Holding;
use super::linear::{Rising, RisingSums, distribution, rising};
use super::shape::ORDERS;
use super::stopped::Stopped;
use super::{ExactError, Shape};

/// The answers about the visits of a state.
#[derive(Debug, Clone)]
pub(super) struct VisitAnswer {
    pub(super) probability: Bounded,
    pub(super) mean: Bounded,
    pub(super) variance: Bounded,
    pub(super) shape: Shape,
    /// The only number of visits, if the moves leave just one.
    pub(super) only: Option<u64>,
}

/// The answers about a first passage.
#[derive(Debug, Clone)]
pub(super) struct HitAnswer {
    pub(super) probability: Bounded,
    /// Mean time of the passage and its shape; `None` when there is none.
    pub(super) given: Option<(Bounded, Shape)>,
    /// The only time of the passage, if the moves leave just one.
    pub(super) only: Option<u64>,
}

/// Where paths from a distribution stop: at the awaited states, or before in an end.
struct Split {
    there: RisingSums,
    /// Probability of stopping elsewhere.
    elsewhere: Dd,
    errors: Vec<f64>,
}

fn split(
    elimination: &Elimination<'_>,
    holding: &Holding,
    start: &Solution,
    orders: usize,
) -> Result<Split, ExactError> {
    let visits = elimination.row(start)?;
    let Rising { mut slots, errors } = rising(elimination, holding, start, visits, orders)?;
    let there = slots.pop().unwrap_or_default();
    let elsewhere = slots.iter().fold(Dd::ZERO, |sum, slot| sum.plus(slot.of[0]));
    let adding = 3.0 * U2 * slots.len() as f64;
    Ok(Split { there, elsewhere, errors: errors.into_iter().map(|error| error + adding).collect() })
}

/// The probability of stopping at the awaited states; exactly 0 or 1 if the moves alone decide it.
fn probability(stopped: &Stopped<'_>, from: &[u32], split: &Split) -> Bounded {
    let reached = stopped.reached(from);
    match reached.split_last() {
        Some((false, _)) | None => Bounded::exactly(0.0),
        Some((true, others)) if !others.contains(&true) => Bounded::exactly(1.0),
        Some(_) => Bounded::probability(Bounded::relative(split.there.of[0], split.errors[0])),
    }
}

/// Solves the first passage to a set.
pub(super) fn hit(chain: &Chain, hit: &Hit, progress: &dyn Progress) -> Result<HitAnswer, ExactError> {
    let stopped = Stopped::also_at(chain, |state| hit.contains(state));
    let elimination = Elimination::of(&stopped, progress)?;
    let holding = Holding::of_chain(chain)?;
    let split = split(&elimination, &holding, &distribution(&stopped, None)?, ORDERS)?;
    let probability = probability(&stopped, chain.start().targets, &split);
    let there = stopped.slots() - 1;
    let only = stopped.only_amount(|slot| slot == there, |_, _| 1).and_then(|time| u64::try_from(time).ok());
    // In continuous time only a start in the set is met at one time.
    let only = only.filter(|time| holding.is_one_step() || *time == 0);
    let given = match only {
        _ if probability.high == 0.0 => None,
        Some(time) => Some((Bounded::exactly(time as f64), Shape::constant(time as f64))),
        None => {
            let ratio = split.there.of[1].over(split.there.of[0]);
            let bounded = Bounded::relative(ratio, split.errors[0] + split.errors[1] + 15.0 * U2);
            let out_of_range = || ExactError::OutOfRange { example: chain.name(hit.states[0]).to_owned() };
            Some((
                bounded.ok_or_else(out_of_range)?,
                Shape::of_sums(&split.there.of, &split.errors, holding.is_one_step()),
            ))
        }
    };
    Ok(HitAnswer { probability, given, only })
}

/// Solves the visits of a transient state.
pub(super) fn visits(chain: &Chain, state: usize, progress: &dyn Progress) -> Result<VisitAnswer, ExactError> {
    let stopped = Stopped::also_at(chain, |at| at == state);
    let elimination = Elimination::of(&stopped, progress)?;
    let holding = Holding::of_chain(chain)?;
    let first = split(&elimination, &holding, &distribution(&stopped, None)?, 1)?;
    let probability = probability(&stopped, chain.start().targets, &first);
    if probability.high == 0.0 {
        let zero = Bounded::exactly(0.0);
        return Ok(VisitAnswer { probability, mean: zero, variance: zero, shape: Shape::constant(0.0), only: Some(0) });
    }
    let again = split(&elimination, &holding, &distribution(&stopped, Some(state))?, 1)?;
    let is_once = |from: usize, _: usize| i64::from(from == state);
    let only = Stopped::in_ends(chain).only_amount(|_| true, is_once).and_then(|visits| u64::try_from(visits).ok());
    if let Some(visits) = only {
        let (mean, shape) = (Bounded::exactly(visits as f64), Shape::constant(visits as f64));
        return Ok(VisitAnswer { probability, mean, variance: Bounded::exactly(0.0), shape, only });
    }
    let (f, not_f) = (first.there.of[0], first.elsewhere);
    let (back, e) = (again.there.of[0], again.elsewhere);
    let (f_error, e_error) = (first.errors[0], again.errors[0]);
    let out_of_range = || ExactError::OutOfRange { example: chain.name(state).to_owned() };
    let mean = f.over(e);
    let variance = mean.over(e).times(back.plus(not_f));
    // Powers f E[…] of a geometric number: E[C(V + j − 1, j)] = f e^{−j}, and 1 for j = 0.
    let mut sums = vec![Dd::ONE, mean];
    while sums.len() < ORDERS {
        let next = sums[sums.len() - 1].over(e);
        if !next.is_in_range() {
            break;
        }
        sums.push(next);
    }
    let errors: Vec<f64> = (0..sums.len()).map(|j| f_error + j as f64 * (e_error + 15.0 * U2)).collect();
    Ok(VisitAnswer {
        probability,
        mean: Bounded::relative(mean, f_error + e_error + 15.0 * U2).ok_or_else(out_of_range)?,
        variance: Bounded::relative(variance, 2.0 * f_error + 3.0 * e_error + 40.0 * U2).ok_or_else(out_of_range)?,
        shape: Shape::of_sums(&sums, &errors, true),
        only,
    })
}
