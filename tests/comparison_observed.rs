//! Visits, costs and first passages, sampled against exact answers.

mod studies;

use std::sync::Arc;

use studies::{asking, names, names_of, quantity, row, run, with_study};
use tallystone::compare::{Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Silent, Tolerance, ToleranceKey};
use tallystone::sampling::{BLOCK, ObservedSampler, Plan, Sampler, sample_with};

/// A shop with a cost of both signs, one of mean zero, one that the moves fix, and a set that is met or not.
const SHOP: &str = r#"
    start = { intake = 0.7, board = "rest" }
    absorbing = ["good", "bad"]
    [moves]
    intake = { board = 0.5, case = 0.25, intake = 0.25 }
    board = { case = 0.5, good = 0.4, bad = 0.1 }
    case = { board = 0.25, bad = 0.75 }
    [costs.labour]
    visit = { board = 1.5, case = -0.25 }
    move = [{ from = "board", to = "bad", cost = 3 }, { from = "intake", to = "intake", cost = "1/3" }]
    [costs.balance]
    move = [{ from = "board", to = "good", cost = 0.9 }, { from = "board", to = "case", cost = -0.72 }]
    [costs.fee]
    move = [
        { from = "board", to = "good", cost = 2 }, { from = "board", to = "bad", cost = 2 },
        { from = "case", to = "bad", cost = 2 },
    ]
    [hits.repair]
    states = ["case", "good"]
"#;

const ALL: [&str; 9] = [
    "mean_visits:board",
    "variance_visits:board",
    "visit_probability:board",
    "mean_cost:labour",
    "mean_cost:balance",
    "variance_cost:labour",
    "covariance_time_cost:labour",
    "hit_probability:repair",
    "mean_time_given_hit:repair",
];

#[test]
fn costs_and_hits_have_default_rows_and_agree() {
    with_study(SHOP, &Settings::default(), |model, study| {
        let comparison = run(model, study, study.plan().replications.unwrap(), 1);
        assert_eq!(comparison.verdict, Verdict::Agree, "{:?}", names(&comparison));
        assert_eq!(names_of(&comparison, "mean_cost"), ["mean_cost:labour", "mean_cost:balance", "mean_cost:fee"]);
        assert_eq!(names_of(&comparison, "hit_probability"), ["hit_probability:repair"]);
        // A mean of zero has an absolute tolerance of its own, a fiftieth of the standard deviation.
        let balance = row(&comparison, "mean_cost:balance");
        assert!((0.005..0.05).contains(&balance.tolerance.value) && balance.exact.unwrap().contains(0.0));
        // Every replication ends with one payment.
        let fee = row(&comparison, "mean_cost:fee");
        assert_eq!((fee.estimate, fee.verdict, fee.p_value), (Some(2.0), Verdict::Agree, Some(1.0)));
    });
}

#[test]
fn every_row_agrees_at_the_size_that_it_plans() {
    with_study(SHOP, &asking(&ALL), |model, study| {
        let comparison = run(model, study, study.plan().replications.unwrap(), 2);
        let open: Vec<_> = comparison.rows.iter().filter(|row| row.verdict != Verdict::Agree).collect();
        assert!(open.is_empty(), "{open:?}");
        assert_eq!(comparison.rows.len(), ALL.len());
    });
}

// A program that charges 1.6 for a step at the board instead of 1.5, and one that forgets a member of the set.
#[test]
fn a_wrong_amount_and_a_forgotten_state_are_found_in_their_rows_alone() {
    let right = Model::from_toml(SHOP).unwrap();
    let settings = asking(&ALL);
    let exact = Exact::solve(&right, &Request::of(&right, &Study::quantities(&right, &settings)), &Silent).unwrap();
    let study = Study::new(&exact, &settings).unwrap();
    let disagreeing = |wrong: &str| {
        let wrong = Model::from_toml(wrong).unwrap();
        let sampler = Sampler::new(wrong.chain());
        let watching = ObservedSampler::new(&sampler, &wrong, study.observed());
        let plan = Plan { replications: study.plan().replications.unwrap(), seed: 3, grid: study.grid() };
        let comparison = study.compare(&sample_with(&watching, &plan, &Silent).unwrap(), Vec::new());
        let found = comparison.rows.iter().filter(|row| row.verdict == Verdict::Disagree);
        found.map(|row| row.quantity.to_string()).collect::<Vec<_>>()
    };
    let dear = disagreeing(&SHOP.replace("board = 1.5, case", "board = \"50/31\", case"));
    assert!(dear.contains(&"mean_cost:labour".to_owned()), "{dear:?}");
    assert!(dear.iter().all(|name| name.ends_with("labour")), "{dear:?}");
    let forgetful = disagreeing(&SHOP.replace("[\"case\", \"good\"]", "[\"case\"]"));
    assert_eq!(forgetful[0], "hit_probability:repair");
    assert!(forgetful.iter().all(|name| name.ends_with("repair")), "{forgetful:?}");
}

// Every tolerance 0, so that "disagree" means that some interval misses the truth: at most one table in ten. At a rate of
// 0.1, 300 tables disagree more than 52 times with odds below 1e-4 (binomial, exact sum).
#[test]
fn without_tolerance_the_error_rate_is_kept() {
    let mut settings = Settings { error_rate: 0.1, ..asking(&ALL) };
    for name in ALL {
        settings.tolerances.set(ToleranceKey::One(quantity(name)), Tolerance::Absolute(0.0));
    }
    with_study(SHOP, &settings, |model, study| {
        let seeds = 5000..5300;
        let disagrees = |seed: &u64| run(model, study, 4 * BLOCK, *seed).verdict == Verdict::Disagree;
        let alarms = seeds.filter(disagrees).count();
        assert!((3..=52).contains(&alarms), "{alarms}");
    });
}

#[test]
fn outcomes_alone_leave_them_out_and_say_so() {
    let settings = Settings { outcomes_only: true, ..Settings::default() };
    with_study(SHOP, &settings, |model, study| {
        assert!(study.observed().is_empty());
        let plan = Plan { replications: BLOCK, seed: 1, grid: Arc::clone(&study.grid()) };
        let tally = tallystone::sampling::sample(&Sampler::new(model.chain()), &plan, &Silent).unwrap();
        let comparison = study.compare(&tally, Vec::new());
        let left_out: Vec<String> = comparison.not_compared.iter().map(|one| one.quantity.to_string()).collect();
        assert_eq!(left_out, ["mean_cost:labour", "mean_cost:balance", "mean_cost:fee", "hit_probability:repair"]);
    });
}

// A cost of one a step is the time, and one a step in a state its visits: what guides the plan must be the same.
#[test]
fn moments_for_planning_agree_between_their_ways() {
    let text = SHOP.replace(
        "[hits.repair]",
        "[costs.clock]\nvisit = { intake = 1, board = 1, case = 1 }\n[costs.seen]\nvisit = { board = 1 }\n[hits.repair]",
    );
    let asked = ["mean_cost:clock", "mean_cost:seen", "mean_visits:board", "covariance_time_cost:clock"];
    with_study(&text, &asking(&asked), |_, study| {
        let exact = study.exact();
        let shape = |name: &str| exact.shape_of(&quantity(name)).unwrap();
        let time = exact.shape();
        for order in 2..=8 {
            let near = |a: f64, b: f64| assert!((a / b - 1.0).abs() < 1e-9, "{order}: {a} {b}");
            near(shape("mean_cost:clock").central(order).unwrap(), time.central(order).unwrap());
            near(shape("mean_cost:seen").central(order).unwrap(), shape("mean_visits:board").central(order).unwrap());
        }
        // The product of the deviations is then the square of one: mean m₂, variance m₄ − m₂².
        let product = shape("covariance_time_cost:clock");
        let (m2, m4) = (time.central(2).unwrap(), time.central(4).unwrap());
        assert!((product.mean() / m2 - 1.0).abs() < 1e-12);
        assert!((product.variance().unwrap() / (m4 - m2 * m2) - 1.0).abs() < 1e-9);
        let (skewness, _) = time.of_squared_deviation().unwrap();
        assert!((product.skewness().unwrap() / skewness - 1.0).abs() < 1e-8);
        let truth = exact.answer(&quantity("covariance_time_cost:clock")).unwrap().unwrap();
        assert!(truth.contains(exact.variance_time().value) || (truth.value / m2 - 1.0).abs() < 1e-15);
    });
}
