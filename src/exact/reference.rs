//! An independent solution of small chains by dense LU, to catch a mistake in the elimination itself.

use nalgebra::{DMatrix, DVector};

use crate::model::{Chain, Weights};

use super::dd::Dd;
use super::holding::Holding;
use super::{Bounded, ExactError};

/// Chains of up to this many transient states are solved twice: at that size the second solution takes a millisecond.
const LARGEST: usize = 150;

/// Compares the mean time with that of LU with partial pivoting in doubles, as far as the conditioning lets it speak.
///
/// # Errors
/// [`ExactError::Contradiction`].
pub(super) fn confirm(chain: &Chain, transient: &[usize], holding: &Holding, mean: Bounded) -> Result<(), ExactError> {
    let n = transient.len();
    if n == 0 || n > LARGEST {
        return Ok(());
    }
    let mut place = vec![usize::MAX; chain.states()];
    transient.iter().enumerate().for_each(|(at, state)| place[*state] = at);
    let mut matrix = DMatrix::<f64>::identity(n, n);
    for (at, state) in transient.iter().enumerate() {
        let row = chain.row(*state);
        for (i, to) in row.targets.iter().enumerate().filter(|(_, to)| place[**to as usize] != usize::MAX) {
            matrix[(at, place[*to as usize])] -= probability(row.weights, i);
        }
    }
    let once = |at: usize, _: usize| holding.of(transient[at]).map_or(1.0, Dd::to_f64);
    let lu = matrix.lu();
    let Some(times) = lu.solve(&DVector::from_fn(n, once)) else { return Ok(()) };
    let Some(visits) = lu.solve(&DVector::from_element(n, 1.0)) else { return Ok(()) };
    let start = chain.start();
    let reference: f64 = (start.targets.iter().enumerate())
        .filter(|(_, state)| place[**state as usize] != usize::MAX)
        .map(|(i, state)| probability(start.weights, i) * times[place[*state as usize]])
        .sum();
    // ‖I − Q‖ ≤ 2 and ‖N‖ is the largest mean number of visits; backward errors of LU beyond n² units are not met in practice.
    let longest = times.iter().fold(0.0f64, |most, time| most.max(time.abs()));
    let most = visits.iter().fold(0.0f64, |most, visits| most.max(visits.abs()));
    let relative = 8.0 * (n * n) as f64 * f64::EPSILON * (2.0 * most);
    let trusted = relative < 0.5 && reference.is_finite();
    if trusted && (reference - mean.value).abs() > relative * longest.max(mean.value) {
        return Err(ExactError::Contradiction { elimination: mean.value, reference });
    }
    Ok(())
}

fn probability(weights: Weights<'_>, i: usize) -> f64 {
    match weights {
        Weights::Narrow { numerators, denominator } => numerators[i] as f64 / denominator as f64,
        Weights::Wide { numerators, denominator } => {
            dashu_ratio::RBig::from_parts(numerators[i].clone().into(), denominator.clone()).to_f64().value()
        }
    }
}
