//! What a tally estimates by itself, without exact answers beside it.

use crate::model::{Model, Quantity};
use crate::statistics::PowerSums;

use super::Tally;

/// An estimate with its standard error.
#[derive(Debug, Clone, PartialEq)]
pub struct Estimate {
    /// Of what.
    pub quantity: Quantity,
    /// The estimate; `None` when the sample has none.
    pub estimate: Option<f64>,
    /// Its standard error, where it has one.
    pub standard_error: Option<f64>,
}

/// The shares of ends and groups, mean and standard deviation of the time, and the mean time given each end.
///
/// # Panics
/// When the tally is over other ends than the model.
pub fn estimates(model: &Model, tally: &Tally) -> Vec<Estimate> {
    let n = tally.replications() as f64;
    let share = |name: &str, ends: &[usize]| {
        let p = (n > 0.0).then(|| tally.count_of(ends) as f64 / n);
        Estimate {
            quantity: Quantity::AbsorptionProbability(name.to_owned()),
            estimate: p,
            standard_error: p.map(|p| (p * (1.0 - p) / n).sqrt()),
        }
    };
    let ends = model.chain().ends();
    let mut all: Vec<Estimate> = ends.iter().enumerate().map(|(end, one)| share(&one.name, &[end])).collect();
    all.extend(model.groups().iter().map(|group| share(&group.name, &group.ends)));
    let times = tally.all();
    all.push(mean(Quantity::MeanTime, &times));
    let sd = times.variance().map(f64::sqrt);
    // The delta method: sd(s) ≈ √((m₄ − s⁴)/n)/(2 s).
    let sd_error = sd
        .filter(|sd| *sd > 0.0)
        .zip(times.central_moment(4))
        .map(|(sd, fourth)| ((fourth - sd.powi(4)).max(0.0) / n).sqrt() / (2.0 * sd));
    all.push(Estimate { quantity: Quantity::SdTime, estimate: sd, standard_error: sd_error });
    let given = ends.iter().enumerate();
    all.extend(given.map(|(end, one)| mean(Quantity::MeanTimeGiven(one.name.clone()), &tally.power_sums(end))));
    all
}

fn mean(quantity: Quantity, times: &PowerSums) -> Estimate {
    let standard_error = times.variance().map(|variance| (variance / times.count() as f64).sqrt());
    Estimate { quantity, estimate: times.mean(), standard_error }
}
