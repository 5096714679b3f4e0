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
        Quantity::MeanTime | Quantity::MeanVisits(_) | Quantity::MeanCost(_) => Tolerance::Relative(MEAN),
        Quantity::MeanTimeGiven(_) | Quantity::MeanTimeGivenHit(_) => Tolerance::Relative(MEAN_GIVEN),
        Quantity::VarianceTime
        | Quantity::VarianceVisits(_)
        | Quantity::VarianceCost(_)
        | Quantity::CovarianceTimeCost(_) => Tolerance::Relative(VARIANCE),
        Quantity::SdTime => Tolerance::Relative(STANDARD_DEVIATION),
        Quantity::Law => Tolerance::Absolute(LAW),
        Quantity::AbsorptionProbability(_)
        | Quantity::SurvivalProbability(_)
        | Quantity::VisitProbability(_)
        | Quantity::HitProbability(_) => Tolerance::Absolute(small_for(exact.value).max(LEAST_PROBABILITY)),
        Quantity::TimeQuantile(_) => Tolerance::Relative(QUANTILE),
    }
}

/// The default tolerance of the mean of a value of any sign: a hundredth of it, or a fiftieth of its standard deviation
/// where that is the larger by far, as it is where the mean is zero.
pub(super) fn of_signed_mean(exact: Bounded, standard_deviation: f64) -> Tolerance {
    let share = value_of(Tolerance::Relative(MEAN), exact);
    if share >= 0.002 * standard_deviation {
        return Tolerance::Relative(MEAN);
    }
    Tolerance::Absolute(one_digit(0.02 * standard_deviation))
}

/// The default tolerance of a covariance: a twentieth of the product of the two standard deviations, its largest value.
pub(super) fn of_covariance(product: f64) -> Tolerance {
    Tolerance::Absolute(one_digit(VARIANCE * product))
}

/// A number as people write one that need not be exact.
fn one_digit(value: f64) -> f64 {
    format!("{value:.0e}").parse().unwrap_or(value)
}

/// The default tolerance of a quantile: the smallest whole number of steps, at least one and at least a hundredth of the
/// quantile, with which the law passes p by a probability that matters on both sides.
pub(super) fn of_quantile(quantile: &Quantile<'_>) -> Tolerance {
    let margin = small_for(quantile.p);
    let enough = |steps: u64| {
        let (above, below) = quantile.margins(steps as f64 / quantile.unit);
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
    if quantile.unit == 1.0 {
        return Tolerance::Absolute(high as f64);
    }
    // In continuous time a round number above it.
    Tolerance::Absolute(next_step(high as f64 / quantile.unit))
}

/// A tolerance in the unit of its quantity. A share is one of the smallest answer that the bounds leave, so that no
/// difference beyond that share passes.
pub(super) fn value_of(tolerance: Tolerance, exact: Bounded) -> f64 {
    match tolerance {
        Tolerance::Absolute(value) => value,
        Tolerance::Relative(share) => share * exact.low.max(-exact.high).max(0.0),
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::exact::{Exact, Request};
    use crate::model::{Model, Silent};

    #[test]
    fn defaults_by_hand() {
        let probability = Quantity::AbsorptionProbability("x".to_owned());
        // min(0.005, p/4, (1 − p)/4), but at least 0.00025.
        for (p, tolerance) in [
            (0.5, 0.005),
            (0.02, 0.005),
            (0.01, 0.0025),
            (0.001, 0.000_25),
            (1e-6, 0.000_25),
            (0.99, 0.0025),
            (0.9999, 0.000_25),
        ] {
            let Tolerance::Absolute(found) = default_of(&probability, Bounded::exactly(p)) else { panic!("absolute") };
            assert!((found - tolerance).abs() < 1e-15, "{p}: {found}");
        }
        let exact = Bounded { value: 200.0, low: 199.0, high: 201.0 };
        assert_eq!(value_of(default_of(&Quantity::MeanTime, exact), exact), 1.99);
        let given = Quantity::MeanTimeGiven("x".to_owned());
        assert_eq!(value_of(default_of(&given, exact), exact), 0.05 * 199.0);
        assert_eq!(default_of(&Quantity::VarianceTime, exact), Tolerance::Relative(0.05));
        assert_eq!(default_of(&Quantity::Law, Bounded::exactly(0.0)), Tolerance::Absolute(0.01));
    }

    #[test]
    fn steps_are_one_two_five() {
        let mut value = 0.000_25;
        let mut steps = Vec::new();
        for _ in 0..8 {
            value = next_step(value);
            steps.push(value);
        }
        assert_eq!(steps, [0.0005, 0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1]);
        assert_eq!([1.0, 7.0, 10.0, 49.0, 99.0].map(next_step), [2.0, 10.0, 20.0, 50.0, 100.0]);
    }

    #[test]
    fn a_default_is_widened_until_it_is_affordable_and_to_four_times_at_most() {
        let exact = Bounded::exactly(50.0);
        let widen = |default, least: f64| widened(default, exact, |value| value >= least);
        let one = Tolerance::Relative(0.01);
        let as_it_is = widen(one, 0.5).unwrap();
        assert_eq!((as_it_is.value, as_it_is.source), (0.5, ToleranceSource::Default));
        let twice = widen(one, 0.6).unwrap();
        assert_eq!(twice.tolerance, Tolerance::Relative(0.02));
        assert_eq!((twice.value, twice.source), (1.0, ToleranceSource::Widened { from: 0.5 }));
        // From 1 % the next step after 2 % is 5 %, five times the default.
        assert_eq!(widen(one, 1.1), None);
        assert_eq!(widen(Tolerance::Relative(0.05), 10.0).unwrap().tolerance, Tolerance::Relative(0.2));
        assert_eq!(widen(Tolerance::Relative(0.05), 10.1), None);
        assert_eq!(widen(Tolerance::Absolute(7.0), 15.0).unwrap().tolerance, Tolerance::Absolute(20.0));
        assert_eq!(widen(Tolerance::Absolute(7.0), 21.0), None);
    }

    // A geometric time with P(time > t) = 0.99^t. The median is ⌈ln 0.5/ln 0.99⌉ = 69, with P(time ≤ 69) = 0.50016. The
    // margin is 0.005: F(70) − 0.5 = 0.00516 suffices above with one step, and 0.5 − F(67) = 0.00999 below. The quantile
    // 0.99 is 459; a hundredth of it is 5 steps, with which F(464) − 0.99 = 0.00057 and 0.99 − F(453) = 0.00053 fall short
    // of (1 − p)/4 = 0.0025. Above, 0.99^t ≤ 0.0075 from t = 487 on; below, 0.99^t ≥ 0.0125 up to t = 436.
    #[test]
    fn the_default_of_a_quantile_leaves_margins_on_both_sides() {
        let text = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = 0.01, a = \"rest\" }\n";
        let model = Model::from_toml(text).unwrap();
        let levels = [0.5, 0.99];
        let exact = Exact::solve(&model, &Request::of(&model, &levels.map(Quantity::TimeQuantile)), &Silent).unwrap();
        let law = exact.law().unwrap();
        let quantile = |p| Quantile { p, exact: law.quantile(p).unwrap(), law, unit: 1.0 };
        assert_eq!(quantile(0.5).exact, Bounded::exactly(69.0));
        assert_eq!(of_quantile(&quantile(0.5)), Tolerance::Absolute(1.0));
        assert_eq!(quantile(0.99).exact, Bounded::exactly(459.0));
        assert_eq!(of_quantile(&quantile(0.99)), Tolerance::Absolute(28.0));
        let (above, below) = quantile(0.99).margins(27.0);
        assert!(above.min(below) < 0.0025);
    }
}
