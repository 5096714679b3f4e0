//! Central moments without cancellation: how much each step changes what is expected.
//!
//! # Formula
//! Let `X` gather an amount `s_ij` with each step from `i` to `j`, and `x_i` be its mean from `i` on. The deviation of a step
//! is `d_ij = s_ij + x_j − x_i`, with `x` zero where paths stop, and `E[X − x_i]` is a sum of deviations of mean zero. So
//! `Cov(X, Y) = Σ_i y_i Σ_j p_ij d_ij e_ij + Σ_i α_i (x_i − E X)(y_i − E Y)`, and with `Y = X` a variance is a sum of squares.
//! In continuous time a state is held for an exponential time of mean `θ_i` and adds `v_i` a clock unit, so that `s_ij` is
//! `v_i θ_i + c_ij` in the mean, and `Σ_i y_i v_i w_i θ_i²` comes from the holding times themselves.

use crate::model::Chain;

use super::ExactError;
use super::dd::{Dd, INPUT, SMALLEST, U2};
use super::elimination::{Solution, usable_probabilities};
use super::holding::Holding;
use super::stopped::Stopped;

/// What a path gathers until it stops, by its mean from each state on. Amounts may be negative; then the mean is the
/// difference of two solutions that are not.
pub(super) struct Gathered<'s> {
    /// What a clock unit spent in a state adds.
    pub(super) pace: &'s dyn Fn(usize) -> i64,
    /// What a move from one state to another adds.
    pub(super) jump: &'s dyn Fn(usize, usize) -> i64,
    pub(super) gains: &'s Solution,
    /// `None` when nothing is negative.
    pub(super) losses: Option<&'s Solution>,
    /// From the start, with its absolute error.
    pub(super) mean: (Dd, f64),
}

impl Gathered<'_> {
    /// The mean from a state on, and the size that its relative error refers to.
    fn from(&self, state: usize) -> (Dd, f64) {
        let gain = self.gains.of[state];
        match self.losses {
            None => (gain, gain.hi),
            Some(losses) => (gain.minus(losses.of[state]), gain.hi + losses.of[state].hi),
        }
    }

    fn error(&self) -> f64 {
        self.losses.map_or(0.0, |losses| losses.error + 3.0 * U2) + self.gains.error
    }

    /// What a visit of a state adds while it lasts, in the mean, with its absolute error.
    pub(super) fn held(&self, holding: &Holding, state: usize) -> (Dd, f64) {
        let pace = Dd::of_i64((self.pace)(state));
        match holding.of(state) {
            None => (pace, 0.0),
            Some(mean) => {
                let held = pace.times(mean);
                (held, held.hi.abs() * U2 * (INPUT + 6.0))
            }
        }
    }

    /// The deviation of a step, with its absolute error.
    pub(super) fn deviation(&self, stopped: &Stopped<'_>, holding: &Holding, from: usize, to: usize) -> (Dd, f64) {
        let (held, held_off) = self.held(holding, from);
        let jump = Dd::of_i64((self.jump)(from, to));
        let step = held.sum(jump);
        let step_off = held_off + 3.0 * U2 * step.hi.abs();
        // A stay changes nothing that is expected.
        if from == to {
            return (step, if held_off == 0.0 { 0.0 } else { step_off });
        }
        let (own, own_size) = self.from(from);
        let (after, after_size) = if stopped.slot(to).is_some() { (Dd::ZERO, 0.0) } else { self.from(to) };
        let sizes = own_size + after_size;
        let off = self.error() * sizes + step_off;
        // And so does a move between states of equal mean.
        if after == own { (step, off) } else { (after.minus(own).sum(step), off + 8.0 * U2 * (step.hi.abs() + sizes)) }
    }

    /// How far the mean from a starting state is off the mean from the start, with its absolute error.
    pub(super) fn deviation_of_start(&self, stopped: &Stopped<'_>, state: usize) -> (Dd, f64) {
        let (own, size) = if stopped.slot(state).is_some() { (Dd::ZERO, 0.0) } else { self.from(state) };
        let (mean, mean_error) = self.mean;
        let off = self.error() * size + mean_error;
        if own == mean { (Dd::ZERO, off) } else { (own.minus(mean), off + 8.0 * U2 * (size + mean.hi.abs())) }
    }
}

/// A covariance, or a variance where both are the same, with its absolute error, before it is an answer.
#[derive(Debug, Clone, Copy)]
pub(super) struct Covariance {
    pub(super) value: Dd,
    pub(super) error: f64,
}

/// The covariance of two gathered amounts; `visits` are the mean numbers of steps in each state, stays included.
pub(super) fn covariance(
    stopped: &Stopped<'_>,
    holding: &Holding,
    start: &Solution,
    visits: &Solution,
    one: &Gathered<'_>,
    other: &Gathered<'_>,
) -> Result<Covariance, ExactError> {
    let chain: &Chain = stopped.chain();
    let mut total = Products::default();
    for state in stopped.classes().iter().flatten().map(|state| *state as usize) {
        for step in usable_probabilities(chain, Some(state))? {
            let weight = step.probability.times(visits.of[state]);
            let to = step.to as usize;
            total.add(weight, one.deviation(stopped, holding, state, to), other.deviation(stopped, holding, state, to));
        }
        if holding.of(state).is_some() {
            total.add(visits.of[state], one.held(holding, state), other.held(holding, state));
        }
    }
    let begins = chain.start().targets;
    for state in begins.iter().map(|state| *state as usize).filter(|_| begins.len() > 1) {
        let deviations = (one.deviation_of_start(stopped, state), other.deviation_of_start(stopped, state));
        total.add(start.of[state], deviations.0, deviations.1);
    }
    let relative = visits.error + U2 * (INPUT + 20.0 + 3.0 * total.terms);
    Ok(Covariance { value: total.sum, error: total.absolute + total.size * relative * (1.0 + 1e-10) })
}

/// A weighted sum of products of numbers that are known within absolute errors.
#[derive(Default)]
struct Products {
    sum: Dd,
    /// Sum of the absolute values.
    size: f64,
    absolute: f64,
    terms: f64,
}

impl Products {
    fn add(&mut self, weight: Dd, (d, d_off): (Dd, f64), (e, e_off): (Dd, f64)) {
        // (d ± d_off)(e ± e_off) is within |d| e_off + |e| d_off + d_off e_off of d e; the factor covers the rounding of
        // these few operations.
        let slack = (d.hi.abs() * e_off + e.hi.abs() * d_off + d_off * e_off) * (1.0 + 1e-10);
        let size = (d.hi * e.hi).abs();
        if weight.hi < SMALLEST {
            // Such a weight has no relative bound: all that its term can be is counted as error.
            self.absolute += SMALLEST * (size + slack) * (1.0 + 1e-9);
        } else {
            self.sum = self.sum.sum(weight.times(d.times(e)));
            self.size += weight.hi * size * (1.0 + 1e-10);
            // Deviations may be so small that their product underflows.
            self.absolute += weight.hi * (slack + f64::MIN_POSITIVE);
        }
        self.terms += 1.0;
    }
}
