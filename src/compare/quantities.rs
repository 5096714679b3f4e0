//! Which quantities are compared when nobody chooses.

use std::collections::HashMap;

use crate::exact::Exact;
use crate::model::{Model, Quantity};

use super::{NotCompared, Settings};

/// Ends that get a row of their own by default, at most.
const MOST_ENDS: usize = 20;
/// An end whose mean time is compared by default has at least this probability.
const LEAST_SHARE: f64 = 0.02;
const LEVELS: [f64; 3] = [0.5, 0.9, 0.99];

/// The quantities to choose rows from, before the exact answers are known.
pub(super) fn candidates(model: &Model, settings: &Settings) -> Vec<Quantity> {
    if let Some(asked) = settings.asked(model) {
        return without_repeats(asked);
    }
    let ends = || model.chain().ends().iter().map(|end| end.name.clone());
    let groups = model.groups().iter().map(|group| group.name.clone());
    let mut quantities: Vec<Quantity> = ends().chain(groups).map(Quantity::AbsorptionProbability).collect();
    quantities.extend([Quantity::MeanTime, Quantity::VarianceTime]);
    quantities.extend(LEVELS.map(Quantity::TimeQuantile));
    quantities.extend(ends().map(Quantity::MeanTimeGiven));
    quantities.extend(model.costs().iter().map(|cost| Quantity::MeanCost(cost.name.clone())));
    quantities.extend(model.hits().iter().map(|hit| Quantity::HitProbability(hit.name.clone())));
    quantities.push(Quantity::Law);
    quantities
}

fn without_repeats(asked: &[Quantity]) -> Vec<Quantity> {
    let mut once: Vec<Quantity> = Vec::with_capacity(asked.len());
    for quantity in asked {
        if !once.contains(quantity) {
            once.push(quantity.clone());
        }
    }
    once
}

/// The rows of a comparison and what is left out of it.
#[derive(Debug, Default)]
pub(super) struct Selection {
    pub(super) rows: Vec<Quantity>,
    /// Ends without a row of their own.
    pub(super) left_out: Vec<NotCompared>,
}

/// Chooses among the candidates by the exact answers.
pub(super) fn select(exact: &Exact<'_>, settings: &Settings) -> Selection {
    let model = exact.model();
    let candidates = candidates(model, settings);
    if settings.asked(model).is_some() {
        return Selection { rows: candidates, left_out: Vec::new() };
    }
    let ends = model.chain().ends();
    let probabilities: Vec<f64> = (0..ends.len()).map(|end| exact.absorption(&[end]).value).collect();
    let possible = |end: &usize| probabilities[*end] > 0.0;
    let mut likeliest: Vec<usize> = (0..ends.len()).filter(possible).collect();
    let lone = likeliest.len() == 1;
    // A stable sort: the earlier of two equally likely ends goes first.
    likeliest.sort_by(|a, b| probabilities[*b].total_cmp(&probabilities[*a]));
    likeliest.truncate(MOST_ENDS);

    let numbers: HashMap<&str, usize> = ends.iter().enumerate().map(|(at, end)| (end.name.as_str(), at)).collect();
    let mut selection = Selection::default();
    for quantity in candidates {
        let end = match &quantity {
            Quantity::AbsorptionProbability(of) | Quantity::MeanTimeGiven(of) => numbers.get(of.as_str()).copied(),
            _ => None,
        };
        let Some(end) = end else {
            selection.rows.push(quantity);
            continue;
        };
        if matches!(quantity, Quantity::MeanTimeGiven(_)) {
            if !lone && probabilities[end] >= LEAST_SHARE && likeliest.contains(&end) {
                selection.rows.push(quantity);
            }
        } else if likeliest.contains(&end) {
            selection.rows.push(quantity);
        } else {
            let text = if possible(&end) {
                format!("only the {MOST_ENDS} likeliest ends have a row of their own; ask for this one to compare it")
            } else {
                "the start cannot reach this end; an outcome there is a finding".to_owned()
            };
            selection.left_out.push(NotCompared { quantity, exact: Some(exact.absorption(&[end])), text });
        }
    }
    selection
}
