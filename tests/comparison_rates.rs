//! How often the comparison is right: correct programs at the size that it chooses, and programs whose difference lies at the
//! edge of the tolerance. Seeds are fixed, so a pass repeats; the odds are those of a fresh draw.

mod chains;

use tallystone::compare::{Comparison, Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Quantity, Silent, Tolerance, ToleranceKey};
use tallystone::sampling::{Plan, Sampler, sample};

/// Compares a program with a model, once for each seed; the size is the plan's unless given.
fn tables(
    model: &Model,
    program: &Model,
    settings: &Settings,
    replications: Option<u64>,
    seeds: std::ops::Range<u64>,
) -> Vec<Comparison> {
    let exact = Exact::solve(model, &Request::of(model, &Study::quantities(model, settings)), &Silent).unwrap();
    let study = Study::new(&exact, settings).unwrap();
    let replications = replications.unwrap_or_else(|| study.plan().replications.unwrap());
    let sampler = Sampler::new(program.chain());
    let table = |seed| {
        let plan = Plan { replications, seed, grid: study.grid() };
        study.compare(&sample(&sampler, &plan, &Silent).unwrap(), Vec::new())
    };
    seeds.map(table).collect()
}

fn count(tables: &[Comparison], verdict: Verdict) -> usize {
    tables.iter().filter(|table| table.verdict == verdict).count()
}

// 8 chains of very different shapes, 20 tables each. The plan promises that 95 % agree, chain by chain: fewer than 138 of
// 160 have odds below 1e-4 (binomial, exact sum). A false "disagree" with a tolerance at the planned size has odds below
// 1e-12 a table.
#[test]
fn correct_programs_agree_at_the_size_that_is_planned() {
    let models = [
        chains::walk("1/2", 1, 4),
        chains::walk("2/3", 2, 4),
        chains::walk("0.45", 9, 10),
        chains::jump_up(5, 1),
        chains::success_run("1/2", 3),
        chains::pattern_race("HHH", "THH"),
        chains::dice_game(),
        chains::moran(5),
    ];
    let mut agreed = 0;
    for model in &models {
        let tables = tables(model, model, &Settings::default(), None, 0..20);
        assert_eq!(count(&tables, Verdict::Disagree), 0, "{}", model.title());
        agreed += count(&tables, Verdict::Agree);
    }
    assert!(agreed >= 138, "{agreed} of 160");
}

/// A coin that is tossed again with probability `again`, else shows heads with probability `heads` in all.
fn coin(heads: &str, again: &str) -> Model {
    let text = format!(
        "start = \"toss\"\nabsorbing = [\"heads\", \"tails\"]\n[moves]\n\
         toss = {{ heads = \"{heads}\", toss = {again}, tails = \"rest\" }}\n"
    );
    Model::from_toml(&text).unwrap()
}

/// The rows of which one differs by a given difference, and the tolerances.
fn at_the_edge(row: &str, tolerance: f64) -> Settings {
    let quantity = Quantity::parse(row).unwrap();
    let mut settings = Settings { error_rate: 0.1, quantities: Some(vec![quantity.clone()]), ..Settings::default() };
    settings.tolerances.set(ToleranceKey::One(quantity), Tolerance::Absolute(tolerance));
    settings
}

// A program whose difference is the tolerance itself: "disagree" at most at the error rate of 0.1. More than 22 of 100 have
// odds of 1.2e-4 (binomial, exact sum). With 1.01 times the tolerance, "agree" is as rare.
#[test]
fn at_the_edge_of_the_tolerance_wrong_verdicts_are_as_rare_as_stated() {
    let model = coin("0.4", "0.2");
    // Heads 0.404/0.8 = 0.505; the law of heads is off by as much at the end. Mean 1/0.79 against 1/0.8.
    let (heads, slow) = (coin("0.404", "0.2"), coin("0.395", "0.21"));
    let mean = 1.0 / 0.79 - 1.25;
    for (row, program, difference) in [
        ("absorption_probability:heads", &heads, 0.005),
        ("absorption_probability:tails", &heads, 0.005),
        ("law", &heads, 0.005),
        ("mean_time", &slow, mean),
        ("survival_probability:1", &slow, 0.01),
    ] {
        // An interval much narrower than the tolerance, so that "agree" is within reach.
        let just_within = tables(&model, program, &at_the_edge(row, difference), Some(200_000), 0..100);
        assert!(count(&just_within, Verdict::Disagree) <= 22, "{row}");
        let just_beyond = tables(&model, program, &at_the_edge(row, difference / 1.01), Some(200_000), 100..200);
        assert!(count(&just_beyond, Verdict::Agree) <= 22, "{row}");
        // Far enough beyond it is found: half the tolerance, and every one of 3 tables.
        let beyond = tables(&model, program, &at_the_edge(row, 0.5 * difference), Some(2_000_000), 200..203);
        assert_eq!(count(&beyond, Verdict::Disagree), 3, "{row}");
    }
}
