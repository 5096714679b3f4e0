//! From a quantity to a row: its exact answer, and the method that fits it.

use crate::exact::{Bounded, Exact, Shape};
use crate::model::{Quantity, Ticks, Tolerance};
use crate::sampling::Observable;

use super::certain::Certain;
use super::covariance::Covariance;
use super::curves::Curves;
use super::law::{Band, ChiSquare};
use super::mean::{Mean, Spread};
use super::method::Method;
use super::planned::{Basis, Outcomes, Planned, Tested};
use super::quantile::Quantile;
use super::sample::{Sample, Values};
use super::share::{Event, Share};
use super::variance::{Squares, Variance};
use super::{NotCompared, tolerance};

/// Makes a row of a quantity, with the tolerance and the detectable difference that the user gave, if any; a default
/// tolerance is not settled yet.
///
/// # Errors
/// Why there is no such row.
pub(super) fn draft<'a>(
    exact: &'a Exact<'a>,
    quantity: Quantity,
    given: Option<Tolerance>,
    detectable: Option<Tolerance>,
    ticks: Ticks,
) -> Result<Planned<'a>, NotCompared> {
    if let Some((answer, certain)) = certainty(exact, &quantity, ticks) {
        return Ok(Planned { quantity, exact: answer, basis: Basis::Certain(certain) });
    }
    let answer = match exact.answer(&quantity) {
        Ok(answer) => answer,
        Err(refusal) => return Err(NotCompared { quantity, exact: None, text: refusal.to_string() }),
    };
    match method(exact, &quantity, answer, given, ticks) {
        Ok(chosen) => {
            let bounds = answer.unwrap_or(Bounded::exactly(0.0)).widened(rounding(exact, &quantity, ticks));
            let default = chosen.default.unwrap_or_else(|| tolerance::default_of(&quantity, bounds));
            let tested = Tested {
                method: chosen.method,
                bounds,
                default,
                detectable: detectable.unwrap_or(default),
                tolerance: tolerance::given(given.unwrap_or(default), bounds),
                is_given: given.is_some(),
                outcomes: outcomes(exact, &quantity),
                shares: None,
            };
            Ok(Planned { quantity, exact: answer, basis: Basis::Tested(tested) })
        }
        Err(text) => Err(NotCompared { quantity, exact: answer, text }),
    }
}

/// All ends of the model.
fn all_ends(exact: &Exact<'_>) -> Vec<usize> {
    (0..exact.model().chain().ends().len()).collect()
}

fn named(exact: &Exact<'_>, name: &str) -> Vec<usize> {
    exact.model().ends_named(name).unwrap_or_default()
}

/// What must be recorded for a quantity about visits, costs or hits, and its denominator.
fn observable(exact: &Exact<'_>, quantity: &Quantity) -> Option<(Observable, u64)> {
    let model = exact.model();
    match quantity {
        Quantity::MeanVisits(of) | Quantity::VarianceVisits(of) | Quantity::VisitProbability(of) => {
            Some((Observable::Visits(model.transient_named(of)?), 1))
        }
        Quantity::HitProbability(of) | Quantity::MeanTimeGivenHit(of) => {
            Some((Observable::Hit(model.hit_named(of)?), 1))
        }
        Quantity::MeanCost(of) | Quantity::VarianceCost(of) | Quantity::CovarianceTimeCost(of) => {
            let number = model.cost_named(of)?;
            Some((Observable::Cost(number), model.costs()[number].denominator))
        }
        _ => None,
    }
}

/// The ends that can be reached, of those whose probability a quantity is.
fn outcomes(exact: &Exact<'_>, quantity: &Quantity) -> Option<Outcomes> {
    let Quantity::AbsorptionProbability(name) = quantity else { return None };
    let is_reachable = |end: &usize| exact.absorption(&[*end]).high > 0.0;
    let reachable = all_ends(exact).into_iter().filter(is_reachable).count();
    Some(Outcomes { ends: named(exact, name).into_iter().filter(is_reachable).collect(), reachable })
}

/// The answer to a quantity about which nothing is random, with what the model allows.
fn certainty(exact: &Exact<'_>, quantity: &Quantity, ticks: Ticks) -> Option<(Option<Bounded>, Certain)> {
    let all = all_ends(exact);
    let fixed = |time: f64| {
        let time_of_all = exact.only_time(&all)?;
        Some((Some(Bounded::exactly(time)), Certain::Time { ends: all.clone(), time: time_of_all }))
    };
    match quantity {
        Quantity::AbsorptionProbability(name) => {
            let ends = named(exact, name);
            let probability = exact.absorption(&ends);
            let always = probability == Bounded::exactly(1.0);
            let never = probability == Bounded::exactly(0.0);
            (always || never).then_some((Some(probability), Certain::Event { event: Event::Ends(ends), always }))
        }
        Quantity::MeanTime | Quantity::TimeQuantile(_) => fixed(exact.only_time(&all)? as f64),
        Quantity::VarianceTime | Quantity::SdTime => fixed(0.0),
        Quantity::SurvivalProbability(time) => {
            let always = exact.only_time(&all)? as f64 > *time;
            let probability = Bounded::exactly(f64::from(u8::from(always)));
            Some((Some(probability), Certain::Event { event: Event::LongerThan(*time as u64), always }))
        }
        Quantity::MeanTimeGiven(name) => {
            let ends = named(exact, name);
            let time = exact.only_time(&ends)?;
            Some((Some(Bounded::exactly(time as f64)), Certain::Time { ends, time }))
        }
        Quantity::VisitProbability(_) | Quantity::HitProbability(_) => {
            let probability = exact.answer(quantity).ok().flatten()?;
            let always = probability == Bounded::exactly(1.0);
            let never = probability == Bounded::exactly(0.0);
            let event = Event::Met(observable(exact, quantity)?.0);
            (always || never).then_some((Some(probability), Certain::Event { event, always }))
        }
        Quantity::CovarianceTimeCost(_) if exact.only_time(&all).is_some() => fixed(0.0),
        Quantity::MeanVisits(_)
        | Quantity::VarianceVisits(_)
        | Quantity::MeanCost(_)
        | Quantity::VarianceCost(_)
        | Quantity::CovarianceTimeCost(_)
        | Quantity::MeanTimeGivenHit(_) => {
            let amount = exact.only_amount(quantity)?;
            let (observable, denominator) = observable(exact, quantity)?;
            let units = (observable.unit(denominator, ticks), ticks.per_unit());
            // Amounts a move are recorded in parts of a clock unit too.
            let parts = observable.unit(denominator, ticks) / denominator as f64;
            let amount = if matches!(observable, Observable::Cost(_)) { amount * parts as i128 } else { amount };
            let answer = exact.answer(quantity).ok().flatten();
            Some((answer, Certain::Amount { observable, amount, units }))
        }
        Quantity::Law => {
            let time = exact.only_time(&all)?;
            let mut possible = all.into_iter().filter(|end| exact.absorption(&[*end]).high > 0.0);
            let end = possible.next()?;
            possible.next().is_none().then_some((None, Certain::Outcome { end, time }))
        }
    }
}

/// A method, with the default tolerance if that follows from it.
struct Chosen<'a> {
    method: Box<dyn Method + 'a>,
    default: Option<Tolerance>,
}

impl<'a> Chosen<'a> {
    fn of(method: impl Method + 'a) -> Self {
        Self { method: Box::new(method), default: None }
    }

    /// The same with a default tolerance.
    fn with(method: impl Method + 'a, default: Tolerance) -> Self {
        Self { method: Box::new(method), default: Some(default) }
    }
}

const UNKNOWN_SHAPE: &str =
    "its higher moments are not known well enough to say from how many replications an interval holds";

const ONE_DEVIATION: &str = "it has two values equally far from its mean, so that the estimate of its variance hardly \
                             varies and has no interval; the mean and the law hold all there is";

/// The method for a quantity with its answer; the text says why there is none.
fn method<'a>(
    exact: &'a Exact<'a>,
    quantity: &Quantity,
    answer: Option<Bounded>,
    given: Option<Tolerance>,
    ticks: Ticks,
) -> Result<Chosen<'a>, String> {
    let undefined = || "it is undefined under the model".to_owned();
    let bounds = match quantity {
        // The distance from the exact law, which is 0.
        Quantity::Law => Bounded::exactly(0.0),
        _ => answer.ok_or_else(undefined)?,
    };
    let clock = ticks.per_unit();
    is_fine_enough(exact, quantity, bounds, ticks)?;
    match quantity {
        Quantity::AbsorptionProbability(name) => {
            Ok(Chosen::of(Share { event: Event::Ends(named(exact, name)), exact: bounds }))
        }
        Quantity::SurvivalProbability(time) => {
            Ok(Chosen::of(Share { event: Event::LongerThan((*time * clock).round() as u64), exact: bounds }))
        }
        Quantity::MeanTime => {
            let spread = Spread::of(exact.shape()).ok_or(UNKNOWN_SHAPE)?;
            Ok(Chosen::of(Mean { of: Sample { of: Values::Times, unit: clock }, share: 1.0, exact: bounds, spread }))
        }
        Quantity::MeanTimeGiven(name) => {
            let ends = named(exact, name);
            let shape = exact.shape_given(&ends).ok_or_else(undefined)?;
            let spread = Spread::of(&shape).ok_or(UNKNOWN_SHAPE)?;
            let share = exact.absorption(&ends).value;
            Ok(Chosen::of(Mean { of: Sample { of: Values::TimesIn(ends), unit: clock }, share, exact: bounds, spread }))
        }
        Quantity::VarianceTime | Quantity::SdTime => {
            let squares = squares(exact.shape())?;
            let root = *quantity == Quantity::SdTime;
            Ok(Chosen::of(Variance { sample: Sample { of: Values::Times, unit: clock }, root, exact: bounds, squares }))
        }
        Quantity::VisitProbability(_) | Quantity::HitProbability(_) => {
            let (observable, _) = observable(exact, quantity).ok_or_else(undefined)?;
            Ok(Chosen::of(Share { event: Event::Met(observable), exact: bounds }))
        }
        Quantity::MeanVisits(_)
        | Quantity::VarianceVisits(_)
        | Quantity::MeanCost(_)
        | Quantity::VarianceCost(_)
        | Quantity::CovarianceTimeCost(_)
        | Quantity::MeanTimeGivenHit(_) => of_observable(exact, quantity, bounds, ticks),
        Quantity::TimeQuantile(p) => {
            let law = exact.law_in_ticks().map_err(ToString::to_string)?;
            let counted =
                law.quantile(*p).ok_or("the law of the time, as it is counted, does not decide this quantile")?;
            let quantile = Quantile { p: *p, exact: counted, law, unit: clock };
            let default = tolerance::of_quantile(&quantile);
            Ok(Chosen::with(quantile, default))
        }
        Quantity::Law => {
            let law = exact.law_in_ticks().map_err(ToString::to_string)?;
            let curves = Curves::new(exact, law);
            let no_tolerance = matches!(given, Some(Tolerance::Absolute(value)) if value == 0.0);
            Ok(if no_tolerance { Chosen::of(ChiSquare(curves)) } else { Chosen::of(Band(curves)) })
        }
    }
}

/// What rounding to ticks can shift a mean by: half a tick each time that a state is held, of those that are counted.
fn rounding(exact: &Exact<'_>, quantity: &Quantity, ticks: Ticks) -> f64 {
    let share = match quantity {
        _ if ticks.is_steps() => return 0.0,
        Quantity::MeanTime => 1.0,
        Quantity::MeanTimeGiven(name) => exact.absorption(&named(exact, name)).low,
        Quantity::MeanTimeGivenHit(name) => {
            let hit = exact.answer(&Quantity::HitProbability(name.clone())).ok().flatten();
            hit.map_or(0.0, |hit| hit.low)
        }
        Quantity::MeanCost(name) => return steepness(exact, name) * exact.mean_moves() * ticks.length(),
        _ => return 0.0,
    };
    exact.mean_moves() * ticks.length() / share
}

/// The most that a tick can add to a cost, in its unit a clock unit.
fn steepness(exact: &Exact<'_>, cost: &str) -> f64 {
    let model = exact.model();
    model.cost_named(cost).map_or(0.0, |number| model.costs()[number].steepest())
}

/// Rates so unlike one another that the ticks, which the slowest states choose, are too coarse for what is compared.
fn is_fine_enough(exact: &Exact<'_>, quantity: &Quantity, bounds: Bounded, ticks: Ticks) -> Result<(), String> {
    let off_time = exact.mean_moves() * ticks.length();
    let deviation = |variance: Quantity| root_of(exact, &variance);
    let is_fine = |off: f64, size: f64| off <= 1e-3 * size;
    let cost_is_fine =
        |name: &String| is_fine(steepness(exact, name) * off_time, deviation(Quantity::VarianceCost(name.clone())));
    let is_fine_enough = match quantity {
        _ if ticks.is_steps() => true,
        Quantity::MeanTime | Quantity::MeanTimeGiven(_) | Quantity::MeanTimeGivenHit(_) => {
            is_fine(rounding(exact, quantity, ticks), bounds.value)
        }
        Quantity::SdTime | Quantity::VarianceTime => is_fine(off_time, deviation(Quantity::VarianceTime)),
        Quantity::MeanCost(name) | Quantity::VarianceCost(name) => cost_is_fine(name),
        Quantity::CovarianceTimeCost(name) => {
            cost_is_fine(name) && is_fine(off_time, deviation(Quantity::VarianceTime))
        }
        _ => true,
    };
    let text = "the rates of the model differ by so much that this version cannot sample it finely enough";
    if is_fine_enough { Ok(()) } else { Err(text.to_owned()) }
}

/// The standard deviation that belongs to a variance.
fn root_of(exact: &Exact<'_>, variance: &Quantity) -> f64 {
    exact.answer(variance).ok().flatten().map_or(0.0, |variance| variance.value.sqrt())
}

fn squares(shape: &Shape) -> Result<Squares, &'static str> {
    let reason = if shape.has_one_deviation() { ONE_DEVIATION } else { UNKNOWN_SHAPE };
    Squares::of(shape).ok_or(reason)
}

/// The method for what is recorded besides end and time.
fn of_observable<'a>(
    exact: &'a Exact<'a>,
    quantity: &Quantity,
    bounds: Bounded,
    ticks: Ticks,
) -> Result<Chosen<'a>, String> {
    let shape = exact.shape_of(quantity).ok_or(UNKNOWN_SHAPE)?;
    let (observable, denominator) = observable(exact, quantity).ok_or(UNKNOWN_SHAPE)?;
    let unit = observable.unit(denominator, ticks);
    let sample = Sample { of: Values::Recorded(observable), unit };
    match quantity {
        Quantity::VarianceVisits(_) | Quantity::VarianceCost(_) => {
            Ok(Chosen::of(Variance { sample, root: false, exact: bounds, squares: squares(&shape)? }))
        }
        Quantity::CovarianceTimeCost(of) => {
            let spread = Spread::of(&shape).ok_or(UNKNOWN_SHAPE)?;
            let product = root_of(exact, &Quantity::VarianceCost(of.clone())) * root_of(exact, &Quantity::VarianceTime);
            let units = (unit, ticks.per_unit());
            let covariance = Covariance { cost: observable, units, exact: bounds, spread };
            Ok(Chosen::with(covariance, tolerance::of_covariance(product)))
        }
        _ => {
            let spread = Spread::of(&shape).ok_or(UNKNOWN_SHAPE)?;
            let hit = match quantity {
                Quantity::MeanTimeGivenHit(of) => exact.answer(&Quantity::HitProbability(of.clone())).ok().flatten(),
                _ => None,
            };
            let share = hit.map_or(1.0, |hit| hit.value);
            let default = match quantity {
                Quantity::MeanCost(_) => Some(tolerance::of_signed_mean(bounds, spread.standard_deviation)),
                _ => None,
            };
            Ok(Chosen { method: Box::new(Mean { of: sample, share, exact: bounds, spread }), default })
        }
    }
}
