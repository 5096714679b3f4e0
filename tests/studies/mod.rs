//! Small models and the steps that the tests of the comparison share.

#![allow(dead_code)]

use tallystone::compare::{Comparison, Row, Settings, Study};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Quantity, Silent, Tolerance, ToleranceKey};
use tallystone::sampling::{ObservedSampler, Plan, Sampler, Tally, sample_with};

/// Three ends, one of them rare, and a loop.
pub(crate) const BENCH: &str = r#"
    start = "intake"
    absorbing = ["shipped", "parts", "scrapped"]
    [moves]
    intake = { diagnose = 0.92, scrapped = "rest" }
    diagnose = { board = "5/12", case = 0.25, diagnose = "rest" }
    board = { test = 0.9, parts = "rest" }
    case = { test = 1 }
    test = { shipped = 0.8, diagnose = "rest" }
    [groups]
    lost = ["parts", "scrapped"]
    any = ["parts", "scrapped", "shipped"]
    sold = ["shipped"]
"#;

/// Two ends, half of the time each.
pub(crate) const COIN: &str =
    "start = \"toss\"\nabsorbing = [\"heads\", \"tails\"]\n[moves]\ntoss = { heads = 0.4, tails = 0.4, toss = 0.2 }\n";

pub(crate) fn quantity(text: &str) -> Quantity {
    Quantity::parse(text).unwrap()
}

pub(crate) fn asking(quantities: &[&str]) -> Settings {
    Settings { quantities: Some(quantities.iter().map(|text| quantity(text)).collect()), ..Settings::default() }
}

pub(crate) fn tolerating(mut settings: Settings, key: &str, tolerance: Tolerance) -> Settings {
    settings.tolerances.set(ToleranceKey::One(quantity(key)), tolerance);
    settings
}

pub(crate) fn with_study<T>(text: &str, settings: &Settings, test: impl FnOnce(&Model, &Study<'_>) -> T) -> T {
    let model = Model::from_toml(text).unwrap();
    let exact = Exact::solve(&model, &Request::of(&model, &Study::quantities(&model, settings)), &Silent).unwrap();
    test(&model, &Study::new(&exact, settings).unwrap())
}

pub(crate) fn run(model: &Model, study: &Study<'_>, replications: u64, seed: u64) -> Comparison {
    let plan = Plan { replications, seed, grid: study.grid() };
    let sampler = Sampler::new(model.chain());
    let watching = ObservedSampler::new(&sampler, model, study.observed());
    study.compare(&sample_with(&watching, &plan, &Silent).unwrap(), Vec::new())
}

pub(crate) fn made(study: &Study<'_>, outcomes: &[(usize, u64, u64)]) -> Comparison {
    let mut tally = Tally::new(study.exact().model().chain().ends().len(), study.grid());
    outcomes.iter().for_each(|(end, time, copies)| tally.add_many(*end, *time, *copies));
    study.compare(&tally, Vec::new())
}

#[track_caller]
pub(crate) fn row<'c>(comparison: &'c Comparison, name: &str) -> &'c Row {
    let wanted = quantity(name);
    comparison.rows.iter().find(|row| row.quantity == wanted).unwrap_or_else(|| panic!("no row {name}"))
}

pub(crate) fn names(comparison: &Comparison) -> Vec<String> {
    comparison.rows.iter().map(|row| row.quantity.to_string()).collect()
}

pub(crate) fn names_of(comparison: &Comparison, name: &str) -> Vec<String> {
    comparison.rows.iter().filter(|row| row.quantity.name() == name).map(|row| row.quantity.to_string()).collect()
}
