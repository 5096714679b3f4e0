//! The whole check — exact, sampled, compared — on published chains, at a fixed seed.
//!
//! Each test is one table at an error rate of 0.01 and tolerances above zero: a false "disagree" has odds far below 1e-6,
//! and the plan sizes each table so that it agrees in 9,999 of 10,000 seeds. The seed is fixed, so a pass repeats.

mod chains;

use tallystone::compare::{Comparison, Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Quantity, Silent};
use tallystone::sampling::{Plan, Sampler, sample};

fn check(model: &Model) -> Comparison {
    let settings = Settings { power: 0.9999, ..Settings::default() };
    let exact = Exact::solve(model, &Request::of(model, &Study::quantities(model, &settings)), &Silent).unwrap();
    let study = Study::new(&exact, &settings).unwrap();
    let replications = study.plan().replications.expect("default rows can all be decided");
    let plan = Plan { replications, seed: 20_261_201, grid: study.grid() };
    let tally = sample(&Sampler::new(model.chain()), &plan, &Silent).unwrap();
    study.compare(&tally, Vec::new())
}

#[track_caller]
fn agrees(comparison: &Comparison) {
    let off: Vec<_> = comparison.rows.iter().filter(|row| row.verdict != Verdict::Agree).collect();
    assert_eq!(comparison.verdict, Verdict::Agree, "{off:#?}");
}

/// The sampled value of a row lies within its tolerance of the published one.
#[track_caller]
fn sampled(comparison: &Comparison, quantity: &str, published: f64) {
    let quantity = Quantity::parse(quantity).unwrap();
    let row = comparison.rows.iter().find(|row| row.quantity == quantity).expect("a default row");
    let off = (row.estimate.unwrap() - published).abs();
    assert!(off <= row.tolerance.value, "{quantity}: {:?} against {published}", row.estimate);
}

#[test]
fn a01_fair_walk() {
    // Grinstead & Snell, Introduction to Probability (AMS 1997), 11.2.
    let comparison = check(&chains::walk("1/2", 1, 4));
    agrees(&comparison);
    sampled(&comparison, "mean_time", 3.0);
    sampled(&comparison, "absorption_probability:0", 0.75);
}

#[test]
fn a02_walk_with_drift() {
    // Grinstead & Snell 11.2, exercise.
    let comparison = check(&chains::walk("2/3", 2, 4));
    agrees(&comparison);
    sampled(&comparison, "mean_time", 3.6);
}

#[test]
fn a03_jumps_to_a_larger_integer() {
    // Grinstead & Snell 11.2, exercise: one end, and a law of four atoms.
    let comparison = check(&chains::jump_up(5, 1));
    agrees(&comparison);
    sampled(&comparison, "mean_time", 25.0 / 12.0);
}

#[test]
fn a04_race_board() {
    // Althoen, King & Schilling, Math. Gazette 77 (1993) 71–76.
    let comparison = check(&chains::race_board());
    agrees(&comparison);
    sampled(&comparison, "mean_time", 39.225_122_308_234_96);
}

#[test]
fn a08_ruin() {
    // Feller I (1968), XIV.2 and 3, table 1, from memory.
    let comparison = check(&chains::walk("0.45", 9, 10));
    agrees(&comparison);
    sampled(&comparison, "absorption_probability:0", 0.21);
    sampled(&comparison, "mean_time", 11.0);
}

#[test]
fn a11_success_runs() {
    // Feller I, XIII.7, from memory.
    let comparison = check(&chains::success_run("1/2", 5));
    agrees(&comparison);
    sampled(&comparison, "mean_time", 62.0);
}

#[test]
fn a12_pattern_race() {
    // Penney, J. Recreational Math. 2 (1969) 241, from memory.
    let comparison = check(&chains::pattern_race("HHH", "THH"));
    agrees(&comparison);
    sampled(&comparison, "absorption_probability:THH", 0.875);
}

#[test]
fn a14_dice_game() {
    // Ethier, The Doctrine of Chances (Springer 2010), 15, from memory.
    let comparison = check(&chains::dice_game());
    agrees(&comparison);
    sampled(&comparison, "absorption_probability:win", 244.0 / 495.0);
}

#[test]
fn a17_fixation() {
    // Lieberman, Hauert & Nowak, Nature 433 (2005) 312, from memory.
    let comparison = check(&chains::moran(10));
    agrees(&comparison);
    sampled(&comparison, "absorption_probability:10", 0.147_950_358_984_101_44);
}

#[test]
fn i01_slow_to_converge() {
    // Haddad & Monmege, RP 2014: 0 and 2n are equally likely.
    let comparison = check(&chains::slow_to_converge(6));
    agrees(&comparison);
    sampled(&comparison, "absorption_probability:0", 0.5);
}
