//! What a tally estimates by itself, without exact answers beside it.

use crate::model::{Model, Quantity};
use crate::statistics::PowerSums;

use super::{Observable, Tally};

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

/// Levels of the quantiles that are estimated.
const LEVELS: [f64; 3] = [0.5, 0.9, 0.99];

/// The shares of ends and groups, mean and standard deviation of the time, its quantiles at 0.5, 0.9 and 0.99 where a cell
/// of the grid holds one time alone, the mean time given each end, and what the tally records of costs and hits.
///
/// # Panics
/// When the tally is over other ends than the model.
pub fn estimates(model: &Model, tally: &Tally) -> Vec<Estimate> {
    let n = tally.replications() as f64;
    let share = |quantity: Quantity, count: u64| {
        let p = (n > 0.0).then(|| count as f64 / n);
        Estimate { quantity, estimate: p, standard_error: p.map(|p| (p * (1.0 - p) / n).sqrt()) }
    };
    let finishing =
        |name: &str, ends: &[usize]| share(Quantity::AbsorptionProbability(name.to_owned()), tally.count_of(ends));
    let ends = model.chain().ends();
    let mut all: Vec<Estimate> = ends.iter().enumerate().map(|(end, one)| finishing(&one.name, &[end])).collect();
    all.extend(model.groups().iter().map(|group| finishing(&group.name, &group.ends)));
    let times = tally.all();
    let clock = tally.ticks().per_unit();
    all.push(mean(Quantity::MeanTime, &times, clock));
    let sd = times.variance().map(f64::sqrt);
    // The delta method: sd(s) ≈ √((m₄ − s⁴)/n)/(2 s).
    let sd_error = sd
        .filter(|sd| *sd > 0.0)
        .zip(times.central_moment(4))
        .map(|(sd, fourth)| ((fourth - sd.powi(4)).max(0.0) / n).sqrt() / (2.0 * sd));
    let in_units = |value: Option<f64>| value.map(|value| value / clock);
    all.push(Estimate { quantity: Quantity::SdTime, estimate: in_units(sd), standard_error: in_units(sd_error) });
    all.extend(LEVELS.into_iter().filter_map(|p| quantile(p, tally)));
    let given = ends.iter().enumerate();
    all.extend(given.map(|(end, one)| mean(Quantity::MeanTimeGiven(one.name.clone()), &tally.power_sums(end), clock)));
    for (number, cost) in model.costs().iter().enumerate() {
        let Some(column) = tally.column(Observable::Cost(number)) else { continue };
        let unit = Observable::Cost(number).unit(cost.denominator, tally.ticks());
        all.push(mean(Quantity::MeanCost(cost.name.clone()), &column.sums().values(), unit));
    }
    for (number, hit) in model.hits().iter().enumerate() {
        let Some(column) = tally.column(Observable::Hit(number)) else { continue };
        let times = column.sums().values();
        all.push(share(Quantity::HitProbability(hit.name.clone()), times.count()));
        all.push(mean(Quantity::MeanTimeGivenHit(hit.name.clone()), &times, clock));
    }
    all
}

/// The smallest time at or below which the share `p` of the outcomes lies, if the grid cuts right before and after it.
fn quantile(p: f64, tally: &Tally) -> Option<Estimate> {
    let share = |time: u64| Some(tally.at_or_below(time)? as f64 / tally.replications() as f64);
    let edges = tally.grid().edges();
    // The share never falls from one edge to the next.
    let time = *edges.get(edges.partition_point(|edge| share(*edge).is_some_and(|share| share < p)))?;
    let is_alone = time == 0 || share(time - 1).is_some_and(|share| share < p);
    let quantity = Quantity::TimeQuantile(p);
    (is_alone && tally.replications() > 0 && tally.ticks().is_steps()).then_some(Estimate {
        quantity,
        estimate: Some(time as f64),
        standard_error: None,
    })
}

/// The mean of values that are counted in parts of a unit.
fn mean(quantity: Quantity, values: &PowerSums, unit: f64) -> Estimate {
    let standard_error = values.variance().map(|variance| (variance / values.count() as f64).sqrt() / unit);
    Estimate { quantity, estimate: values.mean().map(|mean| mean / unit), standard_error }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::Grid;
    use super::*;

    // 100 times, one each from 1 to 100: by counting, the quantiles at 0.5, 0.9, 0.99 are 50, 90 and 99.
    #[test]
    fn quantiles_are_told_where_the_grid_knows_them() {
        let quantiles = |edges: Vec<u64>| {
            let mut tally = Tally::new(1, Arc::new(Grid::new(edges)));
            (1..=100).for_each(|time| tally.add(0, time));
            LEVELS.map(|p| quantile(p, &tally).and_then(|one| one.estimate))
        };
        assert_eq!(quantiles((0..=100).collect()), [Some(50.0), Some(90.0), Some(99.0)]);
        assert_eq!(quantiles((49..=90).collect()), [Some(50.0), Some(90.0), None]);
        // From 50 alone it cannot be told that fewer than half lie at or below 49.
        assert_eq!(quantiles(vec![50, 89, 90]), [None, Some(90.0), None]);
        assert_eq!(quantiles(vec![]), [None; 3]);
        assert_eq!(quantile(0.5, &Tally::new(1, Arc::new(Grid::logarithmic()))), None);
    }
}
