//! Tolerances and sizes of the comparison as its users see them.

mod studies;

use studies::{COIN, asking, made, quantity, row, run, tolerating, with_study};
use tallystone::compare::{Settings, Study, ToleranceSource, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Silent, Tolerance, ToleranceKey, WarningKind};
use tallystone::sampling::BLOCK;
use tallystone::statistics::{agree_miss_probability, proportion_size};

// The table of one probability: ⌈(z_{α/2} + z_{β/2})² p (1 − p)/τ²⌉, then up to a block. For several rows, the sum of their
// chances to miss, by hand from the formula of each, is within 1 − power at the plan and beyond it one block earlier.
#[test]
fn the_plan_is_minimal() {
    with_study(COIN, &asking(&["absorption_probability:heads"]), |_, study| {
        let by_hand = proportion_size(0.5, 0.005, 0.01, 0.05).unwrap();
        let plan = study.plan();
        assert_eq!(plan.replications, Some(by_hand.div_ceil(BLOCK) * BLOCK));
        assert_eq!(plan.demanding, Some(quantity("absorption_probability:heads")));
        assert_eq!((plan.without, plan.never.len()), (None, 0));
    });
    let rows = ["absorption_probability:heads", "mean_time", "time_quantile:0.5"];
    // The complement of the first spends nothing and asks for nothing.
    with_study(COIN, &asking(&[rows[0], "absorption_probability:tails", rows[1]]), |_, study| {
        // Geometric with 0.8: mean 1.25, variance 0.2/0.64 = 0.3125.
        let missed = |n: u64, alpha: f64| {
            agree_miss_probability(0.005, 0.5, n, alpha) + agree_miss_probability(0.0125, 0.3125_f64.sqrt(), n, alpha)
        };
        let n = study.plan().replications.unwrap();
        assert!(missed(n, 0.005) <= 0.05 && missed(n - BLOCK, 0.005) > 0.05);
    });
    with_study(COIN, &asking(&rows), |_, study| {
        let plan = study.plan();
        let without = with_study(COIN, &asking(&rows[1..]), |_, study| study.plan().replications);
        assert_eq!(plan.demanding, Some(quantity(rows[0])));
        assert_eq!(plan.without, without);
    });
}

// A rare detour of a million steps: the mean needs (5 σ/(1 % μ))² replications, far beyond 500,000 even at four times the
// tolerance; σ² is about 1e-4 · 1e12 and μ about 100.
#[test]
fn a_default_is_widened_or_left_out_and_a_given_one_is_kept() {
    let rare = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = 0.9999, far = \"rest\" }\n\
                far = { x = 0.000001, far = \"rest\" }\n";
    with_study(rare, &asking(&["mean_time"]), |_, study| {
        assert_eq!(study.rows(), 0);
        let text = &made(study, &[]).not_compared[0].text;
        assert!(text.contains("even 4 times its default tolerance of 1 %") && text.contains("500,000"), "{text}");
    });
    let given = tolerating(asking(&["mean_time"]), "mean_time", Tolerance::Relative(0.03));
    with_study(rare, &given, |_, study| {
        let comparison = made(study, &[(0, 1, 1000)]);
        let row = row(&comparison, "mean_time");
        assert_eq!(row.tolerance.source, ToleranceSource::Given);
        assert!((row.tolerance.value / row.exact.unwrap().value - 0.03).abs() < 1e-12);
        assert_eq!((row.verdict, row.p_value), (Verdict::Inconclusive, None));
        assert!(row.replications_needed.unwrap() > 500_000);
        assert!(row.note.as_ref().unwrap().contains("replications on; there are 1,000"));
    });
    // A geometric time has σ = μ √q, so 1 % needs (z_{α/2} + z_{β/2})² q/1e-4 = 205,000 (α = 0.01, β = 0.05), and a mixture
    // with twice the spread four times that: it is widened to 2 %.
    let spread = "start = { a = 0.9, b = 0.1 }\nabsorbing = [\"x\"]\n[moves]\na = { x = 0.1, a = \"rest\" }\n\
                  b = { x = 0.01, b = \"rest\" }\n";
    with_study(spread, &asking(&["mean_time"]), |_, study| {
        let comparison = made(study, &[]);
        let row = row(&comparison, "mean_time");
        assert_eq!(row.tolerance.tolerance, Tolerance::Relative(0.02));
        // μ = 0.9 · 10 + 0.1 · 100 = 19.
        let ToleranceSource::Widened { from } = row.tolerance.source else { panic!("{:?}", row.tolerance) };
        assert!((from - 0.19).abs() < 1e-12 && (row.tolerance.value - 0.38).abs() < 1e-12);
        assert!(study.plan().replications.unwrap() <= 500_000 + BLOCK);
        let [warning] = &study.warnings()[..] else { panic!("{:?}", study.warnings()) };
        assert_eq!(warning.kind, WarningKind::WideTolerance);
        assert!(warning.text.contains("from 1 % to 2 %"));
    });
}

// Mean 14 and variance 470, so 1 % needs (z_{α/2} + 1.960)² · 2.40e4 replications: 493,000 at α = 0.01, more than 500,000 at
// a third of that.
#[test]
fn rows_that_are_left_out_give_their_level_to_the_others() {
    let text = "start = { a = 0.9, b = 0.1 }\nabsorbing = [\"x\", \"rare\", \"scarce\"]\n[moves]\n\
                a = { x = 0.1, rare = 1e-7, scarce = 1e-7, a = \"rest\" }\nb = { x = 0.02, b = \"rest\" }\n";
    let source_of_mean = |rows: &[&str]| {
        with_study(text, &asking(rows), |_, study| {
            let comparison = made(study, &[]);
            (comparison.rows.len(), row(&comparison, "mean_time").tolerance.source)
        })
    };
    let (rows, source) = source_of_mean(&["mean_time", "mean_time_given:rare", "mean_time_given:scarce"]);
    assert_eq!((rows, source), (1, ToleranceSource::Default));
    let (rows, source) = source_of_mean(&["mean_time", "survival_probability:5", "survival_probability:9"]);
    assert!(rows == 3 && matches!(source, ToleranceSource::Widened { .. }), "{rows} {source:?}");
}

#[test]
fn tolerances_that_are_wide_useless_or_hopeless_are_said_before_the_run() {
    let rare = "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { x = 0.0001, y = \"rest\" }\n";
    with_study(rare, &asking(&["absorption_probability:x"]), |_, study| {
        let [warning] = &study.warnings()[..] else { panic!("{:?}", study.warnings()) };
        // (1 − 1e-4)^n ≤ 0.05 from n = ln 0.05/ln(1 − 1e-4) = 29,956 on.
        assert!(warning.text.contains("29,956 replications"), "{}", warning.text);
        assert!(warning.text.contains("0.00025") && warning.text.contains("0.0001"));
    });
    let unused = tolerating(asking(&["mean_time"]), "law", Tolerance::Absolute(0.02));
    with_study(COIN, &unused, |_, study| {
        let [warning] = &study.warnings()[..] else { panic!("{:?}", study.warnings()) };
        assert_eq!(warning.kind, WarningKind::NotCompared);
        assert!(warning.text.contains("`law`, which is not compared"));
    });
    let whole = tolerating(asking(&["mean_time"]), "mean_time", Tolerance::Relative(2.0));
    with_study(COIN, &whole, |_, study| {
        let [warning] = &study.warnings()[..] else { panic!("{:?}", study.warnings()) };
        assert_eq!(warning.kind, WarningKind::WideTolerance);
        assert!(warning.text.contains("as wide as the answer"), "{}", warning.text);
    });
    // One or two steps, equally likely: (T − 1.5)² is always 1/4, and its estimate differs from that by O(1/n) only.
    let even = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { b = 0.5, x = 0.5 }\nb = { x = 1 }\n";
    with_study(even, &asking(&["variance_time"]), |_, study| {
        assert!(study.warnings()[0].text.contains("two values equally far from its mean"));
    });
    // The median of the coin is 1 with P(time ≤ 1) = 0.8: no tolerance is too small for it, but 1e-13 of a mean needs more
    // than 2^53 replications.
    let hopeless = tolerating(asking(&["mean_time"]), "mean_time", Tolerance::Absolute(1e-13));
    with_study(COIN, &hopeless, |model, study| {
        let plan = study.plan();
        assert_eq!((plan.replications, plan.demanding), (None, None));
        assert!(plan.never[0].1.contains("more than"));
        assert_eq!(study.warnings()[0].kind, WarningKind::NeverDecided);
        let comparison = run(model, study, 10 * BLOCK, 1);
        let row = row(&comparison, "mean_time");
        assert_eq!((row.verdict, row.replications_needed), (Verdict::Inconclusive, None));
        assert!(row.note.as_ref().unwrap().starts_with("never decided"));
    });
}

#[test]
fn without_tolerance_a_row_is_consistent_once_it_would_have_seen_the_default() {
    let settings = ["absorption_probability:heads", "mean_time", "time_quantile:0.9", "law"]
        .into_iter()
        .fold(asking(&["absorption_probability:heads", "mean_time", "time_quantile:0.9", "law"]), |settings, name| {
            tolerating(settings, name, Tolerance::Absolute(0.0))
        });
    with_study(COIN, &settings, |model, study| {
        let n = study.plan().replications.unwrap();
        // (z_{α/2} + 1.2816)² p (1 − p)/0.005² with α = 0.01/4, z_{α/2} = 3.0233: 185,318; the law: ((√(ln(6/α)/2) +
        // √(ln(6/0.1)/2))/0.01)² = 114,000.
        assert_eq!(n, 185_318_u64.div_ceil(BLOCK) * BLOCK);
        // Alarms have odds of 0.01 a table; the seeds are fixed, and none of these three alarms.
        for seed in 1..4 {
            let comparison = run(model, study, n, seed);
            assert!(comparison.rows.iter().all(|row| row.verdict == Verdict::Consistent), "{comparison:#?}");
            assert_eq!(comparison.verdict, Verdict::Consistent);
            assert_eq!(row(&comparison, "law").method, "pooled chi-square");
        }
        let early = run(model, study, n - BLOCK, 1);
        assert_eq!(row(&early, "absorption_probability:heads").verdict, Verdict::Inconclusive);
        assert_eq!(
            row(&early, "absorption_probability:heads").replications_needed.map(|n| n.div_ceil(1000)),
            Some(186)
        );
    });
}

#[test]
fn looks_of_a_series_spend_the_error_rate_once() {
    let rates: Vec<f64> = (1..=20)
        .map(|look| {
            let settings = Settings { look: Some(look), ..asking(&["mean_time"]) };
            with_study(COIN, &settings, |_, study| {
                let comparison = made(study, &[(0, 1, 5000), (1, 2, 1000)]);
                // One row: its level is that of the table.
                assert!((comparison.rows[0].level - (1.0 - comparison.error_rate)).abs() < 1e-12);
                comparison.error_rate
            })
        })
        .collect();
    assert_eq!(rates[..2], [0.005, 0.0025]);
    assert!(rates.iter().sum::<f64>() < 0.01);
    let model = Model::from_toml(COIN).unwrap();
    let exact = Exact::solve(&model, &Request::default(), &Silent).unwrap();
    for look in [0, 21] {
        let refused = Study::new(&exact, &Settings { look: Some(look), ..asking(&["mean_time"]) }).unwrap_err();
        assert!(refused.text.contains(&format!("look {look}")), "{refused}");
    }
}

#[test]
fn without_tolerance_the_detectable_difference_decides_what_is_consistent() {
    // ((z_{α/2} + 1.282) σ/d)² with α = 0.01, σ² = 0.3125 and d = 1.25 %, half of it, or twice: z = 2.576.
    let none = tolerating(asking(&["mean_time"]), "mean_time", Tolerance::Absolute(0.0));
    for share in [0.01, 0.005, 0.02] {
        let mut settings = none.clone();
        settings.detectable.set(ToleranceKey::One(quantity("mean_time")), Tolerance::Relative(share));
        with_study(COIN, &settings, |_, study| {
            let by_hand = (2.575_829 + 1.281_552_f64).powi(2) * 0.3125 / (share * 1.25).powi(2);
            let plan = study.plan().replications.unwrap();
            assert_eq!(plan, (by_hand as u64).div_ceil(BLOCK) * BLOCK, "{share}");
        });
    }
    let mut nothing = none;
    nothing.detectable.set(ToleranceKey::All("mean_time".into()), Tolerance::Absolute(0.0));
    let model = Model::from_toml(COIN).unwrap();
    let exact = Exact::solve(&model, &Request::default(), &Silent).unwrap();
    assert!(Study::new(&exact, &nothing).unwrap_err().text.contains("difference of 0"));
}
