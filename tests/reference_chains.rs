//! The exact answers against published chains. Values marked "from memory" were recalled from the source named; those
//! marked "own" were computed for this project with exact fractions and are no published numbers.

mod chains;
mod naive;

use dashu_ratio::RBig;
use tallystone::exact::{Bounded, Exact, Request};
use tallystone::model::{Model, Silent};

fn solve(model: &Model) -> Exact<'_> {
    let request = Request { law: true, levels: vec![0.25, 0.5, 0.75, 0.9, 0.95, 0.99], ..Request::default() };
    Exact::solve(model, &request, &Silent).unwrap()
}

/// Without the law, which would be too long.
fn solve_linear(model: &Model) -> Exact<'_> {
    Exact::solve(model, &Request::default(), &Silent).unwrap()
}

fn end(model: &Model, name: &str) -> Vec<usize> {
    model.ends_named(name).unwrap()
}

/// A fraction lies within bounds that are at most 1e-12 of it wide.
#[track_caller]
fn is(answer: Bounded, fraction: &str) {
    let truth: RBig = fraction.parse().unwrap();
    let exactly = |value: f64| RBig::try_from(value).unwrap();
    assert!(exactly(answer.low) <= truth && truth <= exactly(answer.high), "{answer:?} is not {fraction}");
    assert!(answer.high - answer.low <= 1e-12 * answer.value.abs(), "{answer:?}");
}

/// A decimal within 1e-12 relatively.
#[track_caller]
fn near(answer: Bounded, decimal: f64) {
    assert!((answer.value - decimal).abs() <= 1e-12 * decimal.abs(), "{answer:?} is not {decimal}");
    assert!(answer.error() <= 1e-12 * answer.value.abs());
}

/// A number that was published with some decimals.
#[track_caller]
fn printed(answer: Bounded, decimal: f64, unit: f64) {
    assert!((answer.value - decimal).abs() <= 0.5 * unit * (1.0 + 1e-9), "{answer:?} is not {decimal}");
}

#[test]
fn a01_fair_walk_on_a_line() {
    // Grinstead & Snell, Introduction to Probability (AMS 1997), 11.2, examples 11.13 to 11.15; the variances Kemeny &
    // Snell, Finite Markov Chains (1960), III, from memory.
    for (start, time, low) in [(1, "3", "3/4"), (2, "4", "1/2"), (3, "3", "1/4")] {
        let model = chains::walk("1/2", start, 4);
        let exact = solve(&model);
        is(exact.mean_time(), time);
        is(exact.variance_time(), "8");
        is(exact.absorption(&end(&model, "0")), low);
    }
}

#[test]
fn a02_walk_with_drift() {
    // Grinstead & Snell 11.2, exercise; variances own.
    for (start, time, variance, low) in
        [(1, "17/5", "168/25", "7/15"), (2, "18/5", "144/25", "1/5"), (3, "11/5", "24/5", "1/15")]
    {
        let model = chains::walk("2/3", start, 4);
        let exact = solve(&model);
        is(exact.mean_time(), time);
        is(exact.variance_time(), variance);
        is(exact.absorption(&end(&model, "0")), low);
    }
}

#[test]
fn a03_jumps_to_a_larger_integer() {
    // Grinstead & Snell 11.2, exercise; variances own.
    for (start, time, variance) in [(1, "25/12", "95/144"), (2, "11/6", "17/36"), (3, "3/2", "1/4"), (4, "1", "0")] {
        let model = chains::jump_up(5, start);
        let exact = solve(&model);
        is(exact.mean_time(), time);
        is(exact.variance_time(), variance);
    }
}

#[test]
fn a04_race_board() {
    // Althoen, King & Schilling, Math. Gazette 77 (1993) 71–76: the mean as a fraction of 60 digits; the rest own.
    let model = chains::race_board();
    let exact = solve(&model);
    is(
        exact.mean_time(),
        "225837582538403273407117496273279920181931269186581786048583/\
         5757472998140039232950575874628786131130999406013041613400",
    );
    near(exact.variance_time(), 636.298_461_344_877_5);
    near(exact.variance_time().sqrt(), 25.224_957_112_845_157);
    let law = exact.law().unwrap();
    for (level, time) in [(0.25, 22.0), (0.5, 32.0), (0.75, 50.0), (0.9, 72.0), (0.95, 89.0), (0.99, 128.0)] {
        assert_eq!(law.quantile(level).unwrap(), Bounded::exactly(time), "{level}");
    }
    assert_eq!(law.survival(6).value, 1.0);
    let first = law.survival(6).value - law.survival(7).value;
    assert!((first / 0.001_511_059_670_781_892_6 - 1.0).abs() < 1e-12);
    assert!(!exact.is_possible(0, 6) && exact.is_possible(0, 7));
}

#[test]
fn a08_ruin() {
    // Feller, An Introduction to Probability Theory and Its Applications I (3rd ed. 1968), XIV.2 and 3, table 1, from memory.
    // Printed digits; the fair rows are whole: 1 − z/a and z (a − z).
    for (up, start, top, ruin, time, ruin_unit, time_unit) in [
        ("0.45", 9, 10, 0.21, 11.0, 1e-3, 0.1),
        ("0.45", 90, 100, 0.866, 765.6, 1e-3, 0.1),
        ("0.45", 99, 100, 0.182, 171.8, 1e-3, 0.1),
        ("0.4", 90, 100, 0.983, 441.3, 1e-3, 0.1),
        ("0.4", 99, 100, 0.333, 161.7, 1e-3, 0.1),
    ] {
        let model = chains::walk(up, start, top);
        let exact = solve_linear(&model);
        printed(exact.absorption(&end(&model, "0")), ruin, ruin_unit);
        printed(exact.mean_time(), time, time_unit);
    }
    for (start, top, ruin, time) in [
        (9, 10, "1/10", "9"),
        (90, 100, "1/10", "900"),
        (950, 1000, "1/20", "47500"),
        (8000, 10_000, "1/5", "16000000"),
    ] {
        let model = chains::walk("0.5", start, top);
        let exact = solve_linear(&model);
        is(exact.absorption(&end(&model, "0")), ruin);
        is(exact.mean_time(), time);
    }
}

#[test]
fn a09_law_of_the_duration() {
    // Feller I, XIV.5, eq. 5.7 (from memory): the probability of ruin at step n,
    // 2^n p^((n−z)/2) q^((n+z)/2) / a · Σ_{0<v<a} cos^(n−1)(πv/a) sin(πv/a) sin(πzv/a).
    let (p, a, z) = (0.45f64, 10u32, 3u32);
    let formula = |n: u32| {
        let terms = (1..a).map(|v| {
            let angle = std::f64::consts::PI * f64::from(v) / f64::from(a);
            angle.cos().powi(n as i32 - 1) * angle.sin() * (f64::from(z) * angle).sin()
        });
        let (n, z) = (n as i32, z as i32);
        let scale = 2f64.powi(n) * p.powi((n - z) / 2) * (1.0 - p).powi(i32::midpoint(n, z));
        scale / f64::from(a) * terms.sum::<f64>()
    };
    let model = chains::walk("0.45", 3, 10);
    let exact = solve(&model);
    let law = exact.law().unwrap();
    let ruin = end(&model, "0")[0];
    // The law is kept at edges; between two neighbouring times it is the probability of the later one.
    let mut seen = 0;
    for (edge, pair) in law.edges().windows(2).enumerate().filter(|(_, pair)| pair[1] == pair[0] + 1) {
        let here = law.at_edge(ruin, edge + 1).value - law.at_edge(ruin, edge).value;
        if pair[1] % 2 == 1 {
            assert!((here - formula(pair[1] as u32)).abs() < 1e-14, "{}", pair[1]);
            seen += 1;
        } else {
            assert_eq!(here, 0.0);
        }
    }
    assert!(seen >= 10, "{seen}");
    // Own numbers.
    assert!((formula(3) - 0.166_375).abs() < 1e-14);
    assert!((formula(25) - 0.018_692_014_147_6).abs() < 1e-12);
}

#[test]
fn a10_variance_of_the_duration() {
    // z (a − z) (z² + (a − z)² − 2)/3: Bach, Statist. Probab. Lett. 36 (1997) 1–7, from memory.
    let model = chains::walk("0.5", 3, 10);
    is(solve(&model).variance_time(), "392");
}

#[test]
fn a11_success_runs() {
    // Feller I, XIII.7, from memory: mean (1 − p^r)/(q p^r), variance 1/(q p^r)² − (2r + 1)/(q p^r) − p/q².
    for (p, length, mean) in [
        ("1/2", 2, "6"),
        ("1/2", 3, "14"),
        ("1/2", 5, "62"),
        ("1/2", 10, "2046"),
        ("1/2", 20, "2097150"),
        ("1/6", 5, "9330"),
    ] {
        is(solve_linear(&chains::success_run(p, length)).mean_time(), mean);
    }
    is(solve_linear(&chains::success_run("1/2", 2)).variance_time(), "22");
    is(solve_linear(&chains::success_run("1/2", 3)).variance_time(), "142");
    printed(solve_linear(&chains::success_run("0.6", 10)).mean_time(), 410.954_292_198, 1e-9);
}

#[test]
fn a12_pattern_races() {
    // Penney, J. Recreational Math. 2 (1969) 241; Gardner, Sci. Amer. (Oct. 1974), from memory: the best answer to a pattern
    // and its chance.
    for (pattern, answer, chance) in
        [("HHH", "THH", "7/8"), ("HHT", "THH", "3/4"), ("HTH", "HHT", "2/3"), ("HTT", "HHT", "2/3")]
    {
        let model = chains::pattern_race(pattern, answer);
        is(solve(&model).absorption(&end(&model, answer)), chance);
    }
}

#[test]
fn a13_collector() {
    // Feller I, IX.3, from memory: n (1 + 1/2 + … + 1/n).
    near(solve(&chains::collector(6)).mean_time(), 14.7);
    near(solve(&chains::collector(6)).variance_time(), 38.99);
    near(solve(&chains::collector(52)).mean_time(), 235.978_285_436_267_36);
    near(solve(&chains::collector(365)).mean_time(), 2_364.646_023_436_338);
}

#[test]
fn a14_dice_game() {
    // Ethier, The Doctrine of Chances (Springer 2010), 15, from memory; the variance own.
    let model = chains::dice_game();
    let exact = solve(&model);
    is(exact.absorption(&end(&model, "win")), "244/495");
    is(exact.mean_time(), "557/165");
    is(exact.variance_time(), "245672/27225");
}

#[test]
fn a16_accounts_receivable() {
    // Anderson, Sweeney & Williams, An Introduction to Management Science, Markov chapter, from memory. The published
    // split of 1,000 and 2,000, 2,370 to 630, rests on rounded probabilities; the exact one is 2,370.37.
    let (young, old) = (chains::accounts("young"), chains::accounts("old"));
    let (from_young, from_old) = (solve(&young), solve(&old));
    is(from_young.absorption(&end(&young, "paid")), "8/9");
    is(from_old.absorption(&end(&old, "bad")), "7/27");
    let paid = 1000.0 * from_young.absorption(&end(&young, "paid")).value
        + 2000.0 * from_old.absorption(&end(&old, "paid")).value;
    assert!((paid - 2370.37).abs() < 0.005);
    // Row sums of N = [[1.67, 0.56], [0.56, 1.30]], two published digits each.
    printed(from_young.mean_time(), 1.67 + 0.56, 0.02);
    printed(from_old.mean_time(), 0.56 + 1.30, 0.02);
}

#[test]
fn a17_fixation() {
    // (1 − 1/r)/(1 − r^(−N)) with r = 1.1: Moran; Lieberman, Hauert & Nowak, Nature 433 (2005) 312, from memory. Time own.
    let model = chains::moran(10);
    let exact = solve(&model);
    near(exact.absorption(&end(&model, "10")), 0.147_950_358_984_101_44);
    near(exact.mean_time(), 30.582_530_884_423_29);
    let model = chains::moran(100);
    near(solve(&model).absorption(&end(&model, "100")), 0.090_915_688_271_097_01);
}

#[test]
fn a18_hitting() {
    // Norris, Markov Chains (CUP 1997), example 1.3.1, from memory: from 2 on 1..4, the walk reaches 4 with probability 1/3
    // and ends after 2 steps. Our line starts at 0, so all numbers are one lower.
    let model = chains::walk("1/2", 1, 3);
    let exact = solve(&model);
    is(exact.absorption(&end(&model, "3")), "1/3");
    is(exact.mean_time(), "2");
}

#[test]
fn h03_hard_for_plain_solvers() {
    // Own, elementary. In doubles 1 − 1e-17 is 1, and a plain I − Q is singular.
    let pair = Model::from_toml(
        "start = \"a\"\nabsorbing = [\"exit\"]\n[moves]\na = { b = \"rest\", exit = \"1/100000000000000000\" }\nb = { a = 1 }\n",
    )
    .unwrap();
    // The mean number of visits to a is 1e17, and each but the last is followed by two steps.
    is(solve_linear(&pair).mean_time(), "199999999999999999");
    let model = chains::walk("0.9", 39, 40);
    let exact = solve(&model);
    near(exact.absorption(&end(&model, "0")), 5.412_396_560_948_301e-38);
    // (ρ^39 − ρ^40)/(1 − ρ^40) with ρ = 1/9.
    let truth = RBig::from(8) / (RBig::from(9).pow(40) - RBig::ONE);
    is(exact.absorption(&end(&model, "0")), &truth.to_string());
}

#[test]
fn long_lines_with_drift_either_way() {
    // Feller I, XIV.2 and 3, from memory: ruin from z is (ρ^z − ρ^a)/(1 − ρ^a) with ρ = q/p, and the mean duration
    // z/(q − p) − a/(q − p) (1 − ρ^z)/(1 − ρ^a). On a line of 2,000 the far end is 1e-1908 away.
    for (up, start) in [("0.9", 20), ("0.1", 1980)] {
        let model = chains::walk(up, start, 2000);
        let exact = solve_linear(&model);
        let (near_end, distance) = if up == "0.9" { ("0", 20) } else { ("2000", 20) };
        let rho = |power: isize| RBig::from(9).pow(-power);
        let chance = (rho(distance) - rho(2000)) / (RBig::ONE - rho(2000));
        is(exact.absorption(&end(&model, near_end)), &chance.to_string());
        let share = (RBig::ONE - rho(distance)) / (RBig::ONE - rho(2000));
        let time = (RBig::from(2000) * share - RBig::from(distance)) * RBig::from(5) / RBig::from(4);
        is(exact.mean_time(), &time.to_string());
    }
}

#[test]
fn what_no_double_holds_is_refused() {
    // A mean of 1e149 is answered; its variance at 1e160 is not, and a probability of 1e-300 neither.
    for (leave, answers) in [(149, true), (160, false), (300, false)] {
        let text = format!(
            "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = {{ a = \"rest\", x = \"1/1{}\" }}\n",
            "0".repeat(leave)
        );
        let model = Model::from_toml(&text).unwrap();
        match Exact::solve(&model, &Request::default(), &Silent) {
            Ok(exact) => {
                assert!(answers);
                near(exact.mean_time(), 1e149);
                near(exact.variance_time(), 1e298);
            }
            Err(refused) => assert!(!answers && refused.to_string().contains("`a`"), "{refused}"),
        }
    }
}

#[test]
fn i01_small_changes_prove_nothing() {
    // Haddad & Monmege, RP 2014; Theor. Comput. Sci. 735 (2018) 111–131.
    for n in [10, 20, 30, 200] {
        let model = chains::slow_to_converge(n);
        is(solve_linear(&model).absorption(&end(&model, "0")), "1/2");
    }
}

#[test]
fn fractions_agree_on_the_race_board() {
    // Own: textbook elimination in fractions.
    let model = chains::race_board();
    let truth = naive::solve(model.chain());
    is(solve(&model).variance_time(), &truth.variance.to_string());
}
