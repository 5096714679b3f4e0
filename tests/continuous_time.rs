//! Chains in continuous time: sampled against exact answers, and the sampler by itself.

mod studies;

use std::sync::Arc;

use studies::{asking, quantity, row, with_study};
use tallystone::compare::{Comparison, Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, ReadOptions, Silent, Ticks, Tolerance, ToleranceKey};
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

/// What is left and what has entered each end at a time, by the textbook series with hundreds of terms in doubles.
fn by_series(model: &Model, time: f64) -> (f64, Vec<f64>) {
    let chain = model.chain();
    let rate = |state: usize| chain.rate(state).map_or(0.0, |rate| rate.to_f64().value());
    let largest = (0..chain.states()).map(rate).fold(0.0, f64::max);
    let mut power = vec![0.0; chain.states()];
    let start = chain.start();
    start.targets.iter().enumerate().for_each(|(i, to)| power[*to as usize] += start.probability(i).to_f64().value());
    let mut weight = (-largest * time).exp();
    let mut mass = vec![0.0; chain.states()];
    for k in 1..2000 {
        mass.iter_mut().zip(&power).for_each(|(sum, mass)| *sum += weight * mass);
        weight *= largest * time / f64::from(k);
        let mut next = vec![0.0; chain.states()];
        for state in 0..chain.states() {
            let leaves = rate(state) / largest;
            next[state] += power[state] * (1.0 - leaves);
            let row = chain.row(state);
            for (i, to) in row.targets.iter().enumerate() {
                next[*to as usize] += power[state] * leaves * row.probability(i).to_f64().value();
            }
        }
        power = next;
    }
    let of_ends = chain.ends().iter().map(|end| end.states.iter().map(|state| mass[*state]).sum());
    let left = (0..chain.states()).filter(|state| chain.end_of(*state).is_none()).map(|state| mass[state]).sum();
    (left, of_ends.collect())
}

#[test]
fn the_law_agrees_with_the_textbook_series() {
    let model = Model::from_toml(LOOP).unwrap();
    let request = Request { law: true, levels: vec![0.01, 0.2, 0.9], times: vec![0.5], ..Request::default() };
    let exact = Exact::solve(&model, &request, &Silent).unwrap();
    let (law, ticks) = (exact.law().unwrap(), exact.ticks());
    let edges = law.edges();
    let mut looked = 0;
    for (edge, count) in edges.iter().enumerate().step_by(edges.len() / 40) {
        let time = ticks.time(*count);
        // Beyond some hundreds of expected terms the weight of the first would vanish.
        if time * 3.8 > 600.0 {
            break;
        }
        looked += 1;
        let (left, ends) = by_series(&model, time);
        assert!((law.survival(*count).value - left).abs() < 1e-12, "{time}");
        for (end, entered) in ends.iter().enumerate() {
            assert!((law.at_edge(end, edge).value - entered).abs() < 1e-12, "{time} {end}");
        }
    }
    assert!(looked > 5, "{looked} of {}", edges.len());
    for p in [0.01, 0.2] {
        let quantile = exact.answer(&quantity(&format!("time_quantile:{p}"))).unwrap().unwrap();
        assert!(quantile.high - quantile.low < 1e-9 * quantile.value, "{quantile:?}");
        let (before, after) = (by_series(&model, quantile.low).0, by_series(&model, quantile.high).0);
        assert!(1.0 - before <= p + 1e-12 && 1.0 - after >= p - 1e-12, "{p}: {quantile:?}");
    }
    let survival = exact.answer(&quantity("survival_probability:0.5")).unwrap().unwrap();
    assert!((survival.value - by_series(&model, 0.5).0).abs() < 1e-12);
}

#[test]
fn one_chain_in_every_form_has_one_fingerprint() {
    let toml = "clock = \"rates\"\nstart = \"1\"\nabsorbing = [\"3\"]\n[moves]\n1 = { 2 = 2.5, 3 = 0.125 }\n2 = { 1 = \"12\" }\n";
    let wanted = Model::from_toml(toml).unwrap();
    let place = tempfile::tempdir().unwrap();
    let write = |name: &str, text: &str| std::fs::write(place.path().join(name), text).unwrap();
    write("moves.csv", "from,to,rate\n1,2,2.50\n1,3,0.125\n2,1,12\n");
    write("moves.mtx", "%%MatrixMarket matrix coordinate real general\n3 3 4\n1 2 2.5\n1 3 0.125\n2 1 1.2e1\n3 3 1\n");
    let keys = "clock = \"rates\"\nstart = \"1\"\nabsorbing = [\"3\"]\n";
    write("csv.toml", &format!("{keys}moves_file = \"moves.csv\"\n"));
    write("mtx.toml", &format!("{keys}moves_file = \"moves.mtx\"\n"));
    let options = ReadOptions { start: Some("1".into()), absorbing: vec!["3".into()], ..ReadOptions::default() };
    for (name, options) in
        [("moves.csv", &options), ("csv.toml", &ReadOptions::default()), ("mtx.toml", &ReadOptions::default())]
    {
        let model = Model::read(&place.path().join(name), options).unwrap_or_else(|error| panic!("{name}: {error}"));
        assert_eq!(model.fingerprint(), wanted.fingerprint(), "{name}");
        assert_eq!(model.chain().rate(0).unwrap().to_string(), "21/8");
    }
    // A list of rates beside a clock in steps is no list of probabilities.
    write("steps.toml", "start = \"1\"\nabsorbing = [\"3\"]\nmoves_file = \"moves.csv\"\n");
    let refused = Model::read(&place.path().join("steps.toml"), &ReadOptions::default()).unwrap_err().to_string();
    assert!(refused.contains("set clock = \"rates\""), "{refused}");
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
