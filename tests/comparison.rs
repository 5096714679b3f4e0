//! The comparison as its users see it: rows, levels, verdicts.

mod studies;

use std::sync::Arc;

use studies::{BENCH, COIN, asking, made, names, names_of, quantity, row, run, tolerating, with_study};
use tallystone::compare::{Guarantee, Settings, Study, Verdict};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Silent, Tolerance, ToleranceKey, WarningKind};
use tallystone::sampling::{BLOCK, Tally};
use tallystone::statistics::clopper_pearson;

#[test]
fn default_rows_levels_and_shared_levels() {
    with_study(BENCH, &Settings::default(), |model, study| {
        let comparison = run(model, study, 20 * BLOCK, 1);
        let expected = [
            "absorption_probability:shipped",
            "absorption_probability:parts",
            "absorption_probability:scrapped",
            "absorption_probability:lost",
            "absorption_probability:any",
            "absorption_probability:sold",
            "mean_time",
            "variance_time",
            "time_quantile:0.5",
            "time_quantile:0.9",
            "time_quantile:0.99",
            "mean_time_given:shipped",
            "mean_time_given:parts",
            "mean_time_given:scrapped",
            "law",
        ];
        assert_eq!(names(&comparison), expected);
        assert_eq!(comparison.not_compared, []);
        // `lost` is all but `shipped`, `sold` is `shipped`, `any` is certain, and so is the time given `scrapped`: at step 1.
        let free: Vec<&str> =
            expected.into_iter().filter(|name| row(&comparison, name).guarantee == Guarantee::Certain).collect();
        assert_eq!(
            free,
            [
                "absorption_probability:lost",
                "absorption_probability:any",
                "absorption_probability:sold",
                "mean_time_given:scrapped"
            ]
        );
        for row in &comparison.rows {
            let certain = row.method == "occurrence of the impossible";
            let level = if certain { 1.0 } else { 1.0 - 0.01 / 11.0 };
            assert!((row.level - level).abs() < 1e-15, "{}", row.quantity);
            assert_eq!(row.interval.is_some(), !certain);
            if let (Some(p), Some(adjusted), false) = (row.p_value, row.p_adjusted, certain) {
                assert!((adjusted - (11.0 * p).min(1.0)).abs() < 1e-15);
            }
        }
    });
}

#[test]
fn a_complement_and_a_namesake_say_what_their_leader_says() {
    with_study(BENCH, &Settings::default(), |_, study| {
        for shipped in [7600, 7700, 7900, 8000, 8050, 8200, 9000] {
            let comparison = made(study, &[(0, 9, shipped * 5), (1, 6, 1000 * 5), (2, 1, (9000 - shipped) * 5)]);
            let [first, lost, sold] =
                ["shipped", "lost", "sold"].map(|end| row(&comparison, &format!("absorption_probability:{end}")));
            assert_eq!((lost.verdict, sold.verdict), (first.verdict, first.verdict));
            assert_eq!(sold.interval, first.interval);
            let (a, b) = (first.interval.unwrap(), lost.interval.unwrap());
            assert!((a.low + b.high - 1.0).abs() < 1e-15 && (a.high + b.low - 1.0).abs() < 1e-15);
            assert!((first.p_value.unwrap() - lost.p_value.unwrap()).abs() <= 1e-9 * first.p_value.unwrap());
            assert!(lost.note.as_ref().unwrap().contains("complement of `absorption_probability:shipped`"));
            assert!(sold.note.as_ref().unwrap().contains("same outcomes as `absorption_probability:shipped`"));
        }
    });
}

#[test]
fn two_ends_share_one_level() {
    with_study(COIN, &Settings::default(), |model, study| {
        let comparison = run(model, study, BLOCK, 1);
        assert_eq!(row(&comparison, "absorption_probability:heads").guarantee, Guarantee::Exact);
        assert_eq!(row(&comparison, "absorption_probability:tails").guarantee, Guarantee::Certain);
        let spending = comparison.rows.iter().filter(|row| row.guarantee != Guarantee::Certain).count() as f64;
        assert!(comparison.rows.iter().all(|row| (row.level - (1.0 - 0.01 / spending)).abs() < 1e-15));
    });
    // A tighter tolerance of the complement counts, at the same level, and the plan follows it.
    let ends = ["absorption_probability:heads", "absorption_probability:tails"];
    let plain = with_study(COIN, &asking(&ends), |_, study| study.plan());
    let tight = tolerating(asking(&ends), ends[1], Tolerance::Absolute(0.0025));
    with_study(COIN, &tight, |_, study| {
        let plan = study.plan();
        assert_eq!(plan.demanding, Some(quantity(ends[1])));
        assert!(plan.replications.unwrap() > 3 * plain.replications.unwrap());
        let comparison = made(study, &[(0, 1, 50_300 * 8), (1, 1, 49_700 * 8)]);
        assert_eq!(row(&comparison, ends[0]).verdict, Verdict::Agree);
        assert_eq!(row(&comparison, ends[1]).verdict, Verdict::Inconclusive);
    });
}

#[test]
fn twenty_ends_have_rows_and_the_rest_is_said() {
    let names: Vec<String> = (0..30).map(|i| format!("e{i}")).collect();
    // e1 to e29 with 0.01 to 0.0129 and e0 with what is left; e30 is out of reach.
    let moves: Vec<String> = (1..30).map(|i| format!("e{i} = 0.0{}", 100 + i)).collect();
    let text = format!(
        "start = \"a\"\nabsorbing = [\"e30\", {}]\n[moves]\na = {{ {}, e0 = 0.05, a = \"rest\" }}\nb = {{ e30 = 1 }}\n",
        names.iter().map(|name| format!("\"{name}\"")).collect::<Vec<_>>().join(", "),
        moves.join(", ")
    );
    with_study(&text, &Settings::default(), |_, study| {
        let comparison = made(study, &[(1, 1, 10)]);
        let rows = names_of(&comparison, "absorption_probability");
        let expected: Vec<String> =
            std::iter::once(0).chain(11..30).map(|i| format!("absorption_probability:e{i}")).collect();
        assert_eq!(rows, expected);
        let out = &comparison.not_compared;
        assert_eq!(out.len(), 11, "{out:?}");
        assert!(out[0].quantity == quantity("absorption_probability:e30") && out[0].text.contains("cannot reach"));
        assert!(out[1..].iter().all(|row| row.text.contains("20 likeliest") && row.exact.is_some()));
        let warned: Vec<_> =
            study.warnings().into_iter().filter(|warning| warning.kind == WarningKind::NotCompared).collect();
        assert_eq!(warned.len(), 1, "{warned:?}");
        assert!(warned[0].text.contains("10 less likely ends"));
        // Mean times only where the share is 0.02 or more, which all the twenty have.
        assert_eq!(names_of(&comparison, "mean_time_given").len(), 20);
    });
}

#[test]
fn a_model_without_chance_has_only_certain_rows() {
    let line = "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { b = 1 }\nb = { x = 1 }\nc = { y = 1 }\n";
    let settings = asking(&[
        "absorption_probability:x",
        "absorption_probability:y",
        "mean_time",
        "variance_time",
        "sd_time",
        "time_quantile:0.5",
        "survival_probability:1",
        "survival_probability:2",
        "mean_time_given:x",
        "law",
    ]);
    with_study(line, &settings, |model, study| {
        let plan = study.plan();
        assert_eq!((plan.replications, plan.demanding, plan.without), (Some(BLOCK), None, None));
        let right = run(model, study, BLOCK, 1);
        assert_eq!((right.rows.len(), right.verdict), (10, Verdict::Agree));
        for row in &right.rows {
            assert_eq!(row.guarantee, Guarantee::Certain);
            assert_eq!(row.estimate, row.exact.map_or(Some(0.0), |exact| Some(exact.value)), "{}", row.quantity);
            assert_eq!((row.p_value, row.level, row.tolerance.value), (Some(1.0), 1.0, 0.0));
        }
        // One late outcome among a million is impossible, and one at the other end.
        let late = made(study, &[(0, 2, 999_999), (0, 3, 1)]);
        let disagreeing = late.rows.iter().filter(|row| row.verdict == Verdict::Disagree).count();
        assert_eq!((late.verdict, disagreeing), (Verdict::Disagree, 7), "all but both ends and survival at 1");
        assert_eq!((late.findings.len(), late.findings[0].time), (1, Some(3)));
        let elsewhere = made(study, &[(0, 2, 999_999), (1, 2, 1)]);
        assert_eq!(row(&elsewhere, "absorption_probability:y").verdict, Verdict::Disagree);
        assert_eq!(elsewhere.findings[0].end, "y");
        let none = made(study, &[]);
        assert_eq!(none.verdict, Verdict::Inconclusive);
        assert!(none.rows.iter().all(|row| row.verdict == Verdict::Inconclusive && row.p_value.is_none()));
    });
}

#[test]
fn impossible_outcomes_are_found_whatever_the_rows_say() {
    let walk = "start = \"b\"\nabsorbing = [\"low\", \"high\", \"never\"]\n[moves]\na = { low = 0.5, b = 0.5 }\n\
                b = { a = 0.5, high = 0.5 }\nz = { never = 1 }\n";
    with_study(walk, &asking(&["absorption_probability:low"]), |model, study| {
        // From b: high at odd times, low at even ones from 2 on. P(low) = 1/3.
        let right = run(model, study, 100 * BLOCK, 1);
        assert_eq!((right.verdict, right.findings.len()), (Verdict::Agree, 0));
        for (outcomes, end, time, count) in [
            ([(0, 2, 100), (1, 1, 200), (2, 5, 7)], "never", 5, 7),
            ([(0, 3, 1), (0, 2, 99), (1, 1, 200)], "low", 3, 1),
            ([(0, 2, 100), (1, 0, 1), (1, 1, 199)], "high", 0, 1),
        ] {
            let comparison = made(study, &outcomes);
            assert_eq!(comparison.verdict, Verdict::Disagree);
            let [finding] = &comparison.findings[..] else { panic!("{:?}", comparison.findings) };
            assert_eq!((finding.end.as_str(), finding.time, finding.count), (end, Some(time), count));
            // What an audit saw of that end is not said twice.
            let mut tally = Tally::new(3, study.grid());
            outcomes.iter().for_each(|(end, time, copies)| tally.add_many(*end, *time, *copies));
            assert_eq!(study.compare(&tally, comparison.findings.clone()).findings, comparison.findings);
        }
    });
}

#[test]
fn what_cannot_be_compared_is_left_out_with_its_reason() {
    // The law was not asked for: quantiles, survival and the law rest on it.
    let model = Model::from_toml(COIN).unwrap();
    let exact = Exact::solve(&model, &Request::default(), &Silent).unwrap();
    let settings = asking(&["law", "time_quantile:0.5", "survival_probability:2", "mean_time"]);
    let study = Study::new(&exact, &settings).unwrap();
    assert_eq!(study.rows(), 1);
    let comparison = made(&study, &[]);
    let out: Vec<String> = comparison.not_compared.iter().map(|row| row.quantity.to_string()).collect();
    assert_eq!(out, ["law", "time_quantile:0.5", "survival_probability:2"]);
    let warnings = study.warnings();
    assert_eq!(warnings.len(), 1, "{warnings:?}");
    assert!(warnings[0].text.contains("`law`, `time_quantile:0.5`, `survival_probability:2`: the law"));
    // Nothing left: nothing is decided.
    let study = Study::new(&exact, &asking(&["law"])).unwrap();
    assert_eq!((study.rows(), study.plan().replications), (0, None));
    assert_eq!(made(&study, &[(0, 1, 100)]).verdict, Verdict::Inconclusive);
    // A mean given an end out of reach is undefined.
    let line = "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { a = 0.5, x = 0.5 }\nc = { y = 1 }\n";
    with_study(line, &asking(&["mean_time_given:y"]), |_, study| {
        assert!(made(study, &[]).not_compared[0].text.contains("undefined"));
    });
}

// Every row and field over tallies of all sizes, odd ones too: finite or absent, verdicts in line with p-values.
#[test]
fn nothing_undefined_leaks_and_verdicts_follow_p_values() {
    let mut all: Vec<String> = ["sd_time", "survival_probability:3", "survival_probability:0", "mean_time_given:any"]
        .map(str::to_owned)
        .into();
    let model = Model::from_toml(BENCH).unwrap();
    all.extend(Study::quantities(&model, &Settings::default()).iter().map(ToString::to_string));
    let names: Vec<&str> = all.iter().map(String::as_str).collect();
    let mut zero = asking(&names);
    for name in ["absorption_probability", "mean_time", "variance_time", "law", "time_quantile"] {
        zero.tolerances.set(ToleranceKey::All(name.to_owned()), Tolerance::Absolute(0.0));
    }
    for settings in [asking(&names), zero] {
        with_study(BENCH, &settings, |model, study| {
            let sampled = [1, 2, 3, 10, 100, 1000, BLOCK, 50 * BLOCK].map(|n| run(model, study, n, n));
            let odd = [
                made(study, &[]),
                made(study, &[(0, 4, 1)]),
                made(study, &[(0, 4, 1_000_000)]),
                made(study, &[(2, 1, 1 << 40)]),
                made(study, &[(0, 4, 1 << 30), (0, u64::MAX, 1)]),
                made(study, &[(0, 5, 30_000), (1, 3, 1), (2, 1, 1)]),
            ];
            for row in sampled.iter().chain(&odd).flat_map(|comparison| &comparison.rows) {
                let interval = row.interval.map(|interval| [interval.low, interval.high]);
                let numbers = [row.estimate, row.standard_error, row.p_value, row.p_adjusted];
                let all = numbers.into_iter().flatten().chain(interval.into_iter().flatten());
                assert!(all.chain([row.level, row.tolerance.value]).all(f64::is_finite), "{row:?}");
                assert_eq!(row.p_adjusted.is_some_and(|p| p <= 0.01), row.verdict == Verdict::Disagree, "{row:?}");
                let adjusted = row.p_value.map(|p| (p * 0.01 / (1.0 - row.level)).min(1.0));
                let near = |(a, b): (f64, f64)| (a - b).abs() <= 1e-9 * b;
                assert!(row.level == 1.0 || adjusted.zip(row.p_adjusted).is_none_or(near), "{row:?}");
                assert!(row.verdict == Verdict::Inconclusive || row.replications_needed.is_none());
                if let (Some([low, high]), Some(estimate)) = (interval, row.estimate) {
                    assert!(low <= high && low <= estimate && estimate <= high, "{row:?}");
                }
            }
        });
    }
}

#[test]
fn intervals_are_those_of_the_methods_named() {
    with_study(COIN, &asking(&["absorption_probability:heads", "survival_probability:1"]), |_, study| {
        let comparison = made(study, &[(0, 1, 4000), (1, 1, 4100), (0, 2, 900), (1, 3, 1000)]);
        for (name, count) in [("absorption_probability:heads", 4900), ("survival_probability:1", 1900)] {
            let row = row(&comparison, name);
            assert_eq!(row.interval, clopper_pearson(count, 10_000, 0.005));
            assert_eq!(row.estimate, Some(count as f64 / 10_000.0));
        }
    });
}

#[test]
#[should_panic(expected = "cuts times elsewhere")]
fn a_tally_over_another_grid_is_refused() {
    with_study(COIN, &Settings::default(), |_, study| {
        let tally = Tally::new(2, Arc::new(tallystone::sampling::Grid::new(vec![77])));
        study.compare(&tally, Vec::new())
    });
}
