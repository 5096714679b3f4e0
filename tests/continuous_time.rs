//! Chains in continuous time: sampled against exact answers, and the sampler by itself.

mod studies;

use std::sync::Arc;

use studies::{asking, quantity, row, with_study};
use tallystone::compare::{Comparison, Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Silent, Ticks, Tolerance, ToleranceKey};
use tallystone::sampling::{BLOCK, Grid, ObservedSampler, Plan, Sampler, Tally, sample, sample_with};
use tallystone::statistics::pooled_chi_square;

/// Two pumps that fail and are repaired, a fan that takes over, and what it costs.
const LOOP: &str = r#"
    clock = "rates"
    start = { both = 0.9, one = "rest" }
    absorbing = ["overheated", "retired"]
    [moves]
    both = { one = "2/90", fan = 0.01, retired = 0.002 }
    one = { both = 0.5, none = "1/60" }
    none = { one = 0.8, overheated = 3 }
    fan = { both = 0.25, overheated = 0.01 }
    [costs.repair]
    visit = { one = 40, none = 120.5, fan = -15 }
    move = [{ from = "none", to = "one", cost = 200 }]
    [hits.blind]
    states = ["none", "fan"]
"#;

const ALL: [&str; 16] = [
    "absorption_probability:overheated",
    "mean_time",
    "sd_time",
    "mean_time_given:retired",
    "mean_visits:one",
    "variance_visits:one",
    "visit_probability:none",
    "mean_cost:repair",
    "variance_cost:repair",
    "covariance_time_cost:repair",
    "hit_probability:blind",
    "mean_time_given_hit:blind",
    "time_quantile:0.5",
    "time_quantile:0.99",
    "survival_probability:123.25",
    "law",
];

fn run(model: &Model, study: &Study<'_>, replications: u64, seed: u64) -> Comparison {
    let sampler = Sampler::in_ticks(model.chain(), study.ticks());
    let watching = ObservedSampler::new(&sampler, model, study.observed());
    let plan = Plan { replications, seed, grid: study.grid() };
    study.compare(&sample_with(&watching, &plan, &Silent).unwrap(), Vec::new())
}

fn verdicts(comparison: &Comparison) -> Vec<(String, Verdict)> {
    comparison.rows.iter().map(|row| (row.quantity.to_string(), row.verdict)).collect()
}

#[test]
fn every_row_agrees_at_the_size_that_it_plans() {
    with_study(LOOP, &asking(&ALL), |model, study| {
        let comparison = run(model, study, study.plan().replications.unwrap(), 1);
        assert_eq!(comparison.rows.len(), ALL.len(), "{:?}", comparison.not_compared);
        assert_eq!(comparison.verdict, Verdict::Agree, "{:?}", verdicts(&comparison));
    });
}

// Every tolerance 0, so that "disagree" means that some interval misses the truth: at most one table in ten. At a rate of
// 0.1, 200 tables disagree more than 38 times with odds below 1e-4 (binomial, exact sum).
#[test]
fn without_tolerance_the_error_rate_is_kept() {
    let mut settings = Settings { error_rate: 0.1, ..asking(&ALL) };
    for name in ALL.into_iter().filter(|name| *name != "law") {
        settings.tolerances.set(ToleranceKey::One(quantity(name)), Tolerance::Absolute(0.0));
    }
    with_study(LOOP, &settings, |model, study| {
        let disagrees = |seed: &u64| run(model, study, 4 * BLOCK, *seed).verdict == Verdict::Disagree;
        let alarms = (7000..7200).filter(disagrees).count();
        assert!((1..=38).contains(&alarms), "{alarms}");
    });
}

#[test]
fn a_rate_that_is_a_tenth_too_high_is_found() {
    let right = Model::from_toml(LOOP).unwrap();
    let settings = asking(&ALL);
    let exact = Exact::solve(&right, &Request::of(&right, &Study::quantities(&right, &settings)), &Silent).unwrap();
    let study = Study::new(&exact, &settings).unwrap();
    let wrong = Model::from_toml(&LOOP.replace("retired = 0.002", "retired = 0.0022")).unwrap();
    let comparison = run(&wrong, &study, study.plan().replications.unwrap(), 2);
    assert_eq!(row(&comparison, "mean_time").verdict, Verdict::Disagree);
}

// Slow states of 11 days beside fast ones of a microsecond, and an end that is mostly met at once.
#[test]
fn stiff_rates_are_sampled_as_they_are_solved() {
    let stiff = "clock = \"rates\"\nstart = \"fast\"\nabsorbing = [\"x\", \"y\"]\n[moves]\nfast = { other = 1e6, slow = 2e5, x = 1e5 }\n\
                 other = { fast = 2e6 }\nslow = { fast = 1e-6, y = 2e-6 }\n";
    let asked = [
        "absorption_probability:x",
        "mean_time",
        "sd_time",
        "mean_time_given:x",
        "mean_time_given:y",
        "mean_visits:other",
    ];
    with_study(stiff, &asking(&asked), |model, study| {
        let comparison = run(model, study, study.plan().replications.unwrap(), 1);
        assert_eq!(comparison.verdict, Verdict::Agree, "{:?} {:?}", verdicts(&comparison), comparison.not_compared);
    });
}

// An exponential time with rate 3 in forty equally likely cells: chi-square, alarm odds 1e-6.
#[test]
fn holding_times_are_exponential() {
    let model =
        Model::from_toml("clock = \"rates\"\nstart = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = 3 }\n").unwrap();
    let ticks = Ticks::for_longest(1.0 / 3.0);
    let cell = |i: u32| (-(1.0 - f64::from(i) / 40.0).ln() / 3.0 * ticks.per_unit()) as u64;
    let grid = Arc::new(Grid::new((1..40).map(cell).collect()));
    let plan = Plan { replications: 400_000, seed: 9, grid };
    let tally = sample(&Sampler::in_ticks(model.chain(), ticks), &plan, &Silent).unwrap();
    let fit = pooled_chi_square(tally.cells(0), &[1.0 / 40.0; 40], 5.0).unwrap();
    assert!(fit.p_value > 1e-6, "{fit:?}");
}

fn on_threads(threads: usize) -> Tally {
    let model = Model::from_toml(LOOP).unwrap();
    let sampler = Sampler::in_ticks(model.chain(), Ticks::for_longest(2000.0));
    let plan = Plan { replications: 20_000, seed: 1, grid: Arc::new(Grid::new(vec![1 << 50, 1 << 54])) };
    let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
    pool.install(|| sample(&sampler, &plan, &Silent).unwrap())
}

// Any change here is a new stream version.
#[test]
fn the_tally_of_stream_version_1_on_any_number_of_threads() {
    let alone = on_threads(1);
    assert_eq!(alone.to_string(), on_threads(2).to_string());
    assert_eq!(alone.to_string(), on_threads(16).to_string());
    assert_eq!(alone.digest(), "325c00670831aa7536ec5a5c4f54d90549a78986f52474c98032045ac9dfe0ec");
}
