//! Default tolerances, and how a default is widened where it asks for too much.

use crate::exact::Bounded;
use crate::model::{Quantity, Tolerance};

use super::quantile::Quantile;
use super::{AppliedTolerance, ToleranceSource};

/// A default is widened until its row needs no more replications than this.
pub(super) const WIDENED_ABOVE: u64 = 500_000;

/// By this factor at most.
pub(super) const WIDEST: f64 = 4.0;

const MEAN: f64 = 0.01;
const MEAN_GIVEN: f64 = 0.05;
const VARIANCE: f64 = 0.05;
/// Half that of the variance, since d(σ²)/σ² = 2 dσ/σ.
const STANDARD_DEVIATION: f64 = 0.025;
const LAW: f64 = 0.01;
/// No default for a probability is below this.
const LEAST_PROBABILITY: f64 = 2.5e-4;
/// No default for a quantile is below this share of it.
const QUANTILE: f64 = 0.01;

/// A difference of probabilities around `p` that nobody calls small or large: min(0.005, p/4, (1 − p)/4).
fn small_for(p: f64) -> f64 {
    0.005_f64.min(0.25 * p).min(0.25 * (1.0 - p))
}

/// The default tolerance of a quantity with a known answer; that of a quantile comes from [`of_quantile`].
pub(super) fn default_of(quantity: &Quantity, exact: Bounded) -> Tolerance {
    match quantity {
        Quantity::MeanTime => Tolerance::Relative(MEAN),
        Quantity::MeanTimeGiven(_) => Tolerance::Relative(MEAN_GIVEN),
        Quantity::VarianceTime => Tolerance::Relative(VARIANCE),
        Quantity::SdTime => Tolerance::Relative(STANDARD_DEVIATION),
        Quantity::Law => Tolerance::Absolute(LAW),
        Quantity::AbsorptionProbability(_) | Quantity::SurvivalProbability(_) => {
            Tolerance::Absolute(small_for(exact.value).max(LEAST_PROBABILITY))
        }
        Quantity::TimeQuantile(_) => Tolerance::Relative(QUANTILE),
    }
}

/// The default tolerance of a quantile: the smallest whole number of steps, at least one and at least a hundredth of the
/// quantile, with which the law passes p by a probability that matters on both sides.
pub(super) fn of_quantile(quantile: &Quantile<'_>) -> Tolerance {
    let margin = small_for(quantile.p);
    let enough = |steps: u64| {
        let (above, below) = quantile.margins(steps as f64);
        above >= margin && below >= margin
    };
    let mut high = (QUANTILE * quantile.exact.high).ceil().max(1.0) as u64;
    let mut low = high;
    // Far enough up everything is passed: F reaches 1, and nothing is below time 0. The cap is for laws that end sooner.
    while !enough(high) && high < 1 << 60 {
        low = high + 1;
        high *= 2;
    }
    while low < high {
        let middle = low + (high - low) / 2;
        if enough(middle) {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    Tolerance::Absolute(high as f64)
}

/// A tolerance in the unit of its quantity. A share is one of the smallest answer that the bounds leave, so that no
/// difference beyond that share passes.
pub(super) fn value_of(tolerance: Tolerance, exact: Bounded) -> f64 {
    match tolerance {
        Tolerance::Absolute(value) => value,
        Tolerance::Relative(share) => share * exact.low.max(0.0),
    }
}

/// The user's tolerance, which is never touched.
pub(super) fn given(tolerance: Tolerance, exact: Bounded) -> AppliedTolerance {
    AppliedTolerance { tolerance, value: value_of(tolerance, exact), source: ToleranceSource::Given }
}

/// A default tolerance, widened along 1, 2, 5, 10, … until `affordable`, to four times itself at most; `None` if that is
/// not enough.
pub(super) fn widened(
    default: Tolerance,
    exact: Bounded,
    affordable: impl Fn(f64) -> bool,
) -> Option<AppliedTolerance> {
    let from = value_of(default, exact);
    let mut tolerance = default;
    loop {
        let value = value_of(tolerance, exact);
        if affordable(value) {
            let source =
                if tolerance == default { ToleranceSource::Default } else { ToleranceSource::Widened { from } };
            return Some(AppliedTolerance { tolerance, value, source });
        }
        tolerance = match tolerance {
            Tolerance::Absolute(value) => Tolerance::Absolute(next_step(value)),
            Tolerance::Relative(share) => Tolerance::Relative(next_step(share)),
        };
        // A hair of slack: 4 × 0.05 and the step 0.2 are the same number.
        if number(tolerance) > WIDEST * number(default) * (1.0 + 1e-9) {
            return None;
        }
    }
}

fn number(tolerance: Tolerance) -> f64 {
    match tolerance {
        Tolerance::Absolute(value) | Tolerance::Relative(value) => value,
    }
}

/// The next larger number among 1, 2 and 5 times the powers of ten.
fn next_step(value: f64) -> f64 {
    let power = value.log10().floor() as i32;
    let steps = [power, power + 1].into_iter().flat_map(|power| [1, 2, 5].map(|digit| format!("{digit}e{power}")));
    // Read as decimals, so that 0.05 is the double that everybody writes.
    let mut steps = steps.filter_map(|text| text.parse().ok());
    steps.find(|step| *step > value * (1.0 + 1e-9)).unwrap_or(10.0 * value)
}
