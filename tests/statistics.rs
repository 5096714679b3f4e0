//! Intervals, tests and moments against handbooks, certified data and high-precision arithmetic.

use statrs::distribution::{Beta, ChiSquared, ContinuousCDF, Normal, StudentsT};
use tallystone::statistics::{
    PowerSums, agree_miss_probability, binomial_agree_miss_probability, binomial_p_value, chi_square_survival,
    chi_square_upper_quantile, clopper_pearson, dkw_half_width, dkw_level, law_size, lower_tail, mean_interval,
    mean_least_size, normal_density, normal_survival, normal_upper_quantile, quantile_p_value, quantile_ranks,
    size_for_margin, student_survival, student_upper_quantile, upper_tail, variance_interval, wilson,
};

#[track_caller]
fn relative(found: f64, truth: f64, within: f64, what: &str) {
    assert!((found - truth).abs() <= within * truth.abs(), "{what}: {found:e} is not {truth:e}");
}

/// Half a unit of the last printed digit.
#[track_caller]
fn printed(found: f64, published: f64, unit: f64) {
    assert!((found - published).abs() <= 0.5 * unit * (1.0 + 1e-9), "{found} is not {published}");
}

#[test]
fn far_tails_agree_with_high_precision_arithmetic() {
    // tests/references/statistics.py, by mpmath; its header says how.
    let table = include_str!("references/statistics.csv");
    let mut seen = 0;
    for line in table.lines().skip(1) {
        let cells: Vec<&str> = line.split(',').collect();
        let number = |at: usize| cells[at].parse::<f64>().unwrap_or(f64::NAN);
        let count = |at: usize| cells[at].parse::<u64>().unwrap();
        let (a, b, c, truth) = (number(1), number(2), number(3), number(4));
        let (found, within) = match cells[0] {
            "normal_survival" => (normal_survival(a), 1e-13),
            "normal_upper_quantile" => (normal_upper_quantile(a), 1e-13),
            "student_survival" => (student_survival(a, b), 1e-12),
            "student_upper_quantile" => (student_upper_quantile(a, b), 1e-12),
            "chi_square_survival" => (chi_square_survival(a, b), 1e-12),
            "chi_square_upper_quantile" => (chi_square_upper_quantile(a, b), 1e-12),
            "upper_tail" => (upper_tail(count(1), b, count(3)), 1e-12),
            "lower_tail" => (lower_tail(count(1), b, count(3)), 1e-12),
            "clopper_pearson_low" => (clopper_pearson(count(1), count(2), c).unwrap().low, 1e-11),
            "clopper_pearson_high" => (clopper_pearson(count(1), count(2), c).unwrap().high, 1e-11),
            other => panic!("{other}"),
        };
        relative(found, truth, within, line);
        seen += 1;
    }
    assert_eq!(seen, 160);
}

#[test]
fn the_middle_of_each_law_agrees_with_a_general_library() {
    // statrs 0.19, whose quantiles are good to some 1e-9 there.
    for q in [0.4, 0.2, 0.05, 0.01] {
        let of = |found: f64, truth: f64, what: &str| relative(found, truth, 1e-7, what);
        of(normal_upper_quantile(q), Normal::standard().inverse_cdf(1.0 - q), "normal");
        for df in [3.0, 12.0, 200.0] {
            of(student_upper_quantile(q, df), StudentsT::new(0.0, 1.0, df).unwrap().inverse_cdf(1.0 - q), "t");
            of(chi_square_upper_quantile(q, df), ChiSquared::new(df).unwrap().inverse_cdf(1.0 - q), "chi-square");
        }
        // The limits of Clopper and Pearson are quantiles of beta laws.
        let limits = clopper_pearson(7, 40, 2.0 * q).unwrap();
        of(limits.low, Beta::new(7.0, 34.0).unwrap().inverse_cdf(q), "beta, low");
        of(limits.high, Beta::new(8.0, 33.0).unwrap().inverse_cdf(1.0 - q), "beta, high");
    }
}

#[test]
fn c01_handbook_proportions() {
    // NIST/SEMATECH e-Handbook of Statistical Methods 7.2.4.1: one-sided Wilson bound for 26 of 200, z = 1.645; exact limits
    // for 4 of 20 at 90 %. (The page prints the upper limit as 0.400 once; its own formula gives 0.401029.)
    let z = 1.645;
    let alpha = 2.0 * normal_survival(z);
    printed(wilson(26, 200, alpha).unwrap().low, 0.09577, 1e-5);
    let exact = clopper_pearson(4, 20, 0.10).unwrap();
    printed(exact.low, 0.071_354, 1e-6);
    assert!((exact.high - 0.401_029).abs() < 1.5e-6);
}

#[test]
fn c02_published_intervals_for_proportions() {
    // Newcombe, Statist. Med. 17 (1998) 857–872, table I; the Wilson column seen, the exact one from memory.
    for (x, n, score, exact) in [
        (81, 263, [0.2553, 0.3662], [0.2527, 0.3676]),
        (15, 148, [0.0624, 0.1605], [0.0578, 0.1617]),
        (0, 20, [0.0, 0.1611], [0.0, 0.1684]),
        (1, 29, [0.0061, 0.1718], [0.0009, 0.1776]),
    ] {
        let (found, found_exact) = (wilson(x, n, 0.05).unwrap(), clopper_pearson(x, n, 0.05).unwrap());
        printed(found.low, score[0], 1e-4);
        printed(found.high, score[1], 1e-4);
        printed(found_exact.low, exact[0], 1e-4);
        printed(found_exact.high, exact[1], 1e-4);
    }
}

#[test]
fn c06_handbook_tables() {
    // NIST/SEMATECH e-Handbook 1.3.6.7.2 and 1.3.6.7.4. Its columns for 0.001 are known to be rounded wrongly and left out.
    for (df, q, value) in [
        (8.0, 0.05, 1.860),
        (8.0, 0.10, 1.397),
        (10.0, 0.05, 1.812),
        (10.0, 0.025, 2.228),
        (10.0, 0.005, 3.169),
        (30.0, 0.025, 2.042),
    ] {
        printed(student_upper_quantile(q, df), value, 1e-3);
    }
    for (df, q, value) in
        [(8.0, 0.10, 13.362), (8.0, 0.05, 15.507), (8.0, 0.025, 17.535), (8.0, 0.01, 20.090), (100.0, 0.01, 135.807)]
    {
        printed(chi_square_upper_quantile(q, df), value, 1e-3);
    }
}

/// Power sums of decimals with one digit, as tenths.
fn tenths(values: impl IntoIterator<Item = u64>) -> PowerSums {
    let mut sums = PowerSums::default();
    values.into_iter().for_each(|value| sums.add(value));
    sums
}

#[test]
fn nist_certified_moments() {
    // NIST Statistical Reference Datasets, univariate: NumAcc1 to NumAcc4. Certified mean and standard deviation; the data
    // are decimals with one digit, so they are exact in tenths.
    let three = tenths([10_000_001, 10_000_003, 10_000_002]);
    assert_eq!((three.mean(), three.variance()), (Some(10_000_002.0), Some(1.0)));
    for (base, mean) in [(10, 12.0), (10_000_000, 10_000_002.0), (100_000_000, 100_000_002.0)] {
        let alternating = (0..1000).map(|i| base + if i % 2 == 0 { 1 } else { 3 });
        let sums = tenths(std::iter::once(base + 2).chain(alternating));
        assert_eq!(sums.count(), 1001);
        assert_eq!(sums.mean(), Some(mean));
        // 0.1² in units of a tenth squared: exactly 1.
        assert_eq!(sums.variance(), Some(1.0));
    }
}

#[test]
fn numacc_through_the_tally() {
    // The same sets as times of replications, and as a cost that is negative throughout: the sums are exact, so the
    // standard deviation is 0.1, that is 1 in tenths, wherever the numbers lie.
    use std::sync::Arc;
    use tallystone::sampling::{Grid, Observable, Tally};
    for (base, mean) in [(10_000_000_u64, 10_000_002.0), (100_000_000, 100_000_002.0)] {
        let observed: Arc<[Observable]> = [Observable::Cost(0)].into();
        let mut tally = Tally::observing(1, Arc::new(Grid::logarithmic()), observed);
        let mut second = tally.clone();
        for i in 0..1001_u64 {
            let value = if i == 0 { base + 2 } else { base + 1 + 2 * (i % 2) };
            let half = if i % 3 == 0 { &mut tally } else { &mut second };
            half.add_observed(0, value, &[Some(-i128::from(value))]);
        }
        tally.merge(&second).unwrap();
        assert_eq!((tally.all().mean(), tally.all().variance()), (Some(mean), Some(1.0)));
        let cost = tally.column(Observable::Cost(0)).unwrap().sums();
        assert_eq!((cost.values().mean(), cost.values().variance()), (Some(-mean), Some(1.0)));
        assert_eq!(cost.covariance(), Some(-1.0));
    }
}

#[test]
fn poisson_truncation_points() {
    // Fox & Glynn, Comm. ACM 31 (1988) 440 (method); points for 5e-11 in each tail, own, by mpmath. P(N ≤ n) for a Poisson
    // number of mean λ is the chi-square survival of 2λ with 2(n + 1) degrees of freedom.
    let at_most = |n: i64, mean: f64| if n < 0 { 0.0 } else { chi_square_survival(2.0 * mean, 2.0 * (n + 1) as f64) };
    let beyond = |n: i64, mean: f64| 1.0 - at_most(n, mean);
    for (mean, left, right) in [(10.0, 0, 36), (100.0, 43, 171), (1000.0, 802, 1211)] {
        assert!(at_most(left - 1, mean) <= 5e-11 && (left == 0 || at_most(left, mean) > 5e-11), "{mean} {left}");
        assert!(beyond(right, mean) <= 5e-11 * (1.0 + 1e-3) && beyond(right - 1, mean) > 5e-11, "{mean} {right}");
    }
}

#[test]
fn levels_and_intervals_say_the_same() {
    // An interval at alpha misses exactly when the p-value is at most alpha.
    for n in [1u64, 7, 60, 1000] {
        for x in (0..=n).step_by(1 + n as usize / 17) {
            for alpha in [0.2, 0.05, 1e-3, 1e-8] {
                let interval = clopper_pearson(x, n, alpha).unwrap();
                for p in [1e-6, 0.03, 0.2, 0.5, 0.77, 0.999] {
                    let level = binomial_p_value(x, n, p, p);
                    if (level / alpha - 1.0).abs() > 1e-9 {
                        assert_eq!(level <= alpha, p < interval.low || interval.high < p, "{x}/{n} {alpha} {p}");
                    }
                }
            }
        }
    }
    for n in [5u64, 40, 500] {
        for p in [0.1, 0.5, 0.9] {
            for alpha in [0.2, 0.01] {
                let ranks = quantile_ranks(n, p, alpha);
                for at_or_below in 0..=n {
                    // The quantile is a single value v that no observation equals: as many below as at or below.
                    let level = quantile_p_value(n, p, at_or_below, at_or_below);
                    match ranks {
                        Some(ranks) => {
                            // X_(r) > v exactly if fewer than r are at or below; X_(s) < v if at least s are below.
                            let misses = at_or_below < ranks.lower || at_or_below >= ranks.upper;
                            assert_eq!(level <= alpha, misses, "{n} {p} {alpha} {at_or_below}");
                        }
                        // Too few observations to enclose the quantile on both sides.
                        None => assert!(n < 100, "{n} {p} {alpha}"),
                    }
                }
            }
        }
    }
    for n in [10, 100_000] {
        for alpha in [0.3, 0.01, 1e-6] {
            relative(dkw_level(dkw_half_width(n, 4, alpha), n, 4), alpha, 1e-12, "dkw");
        }
    }
}

/// P(X = k).
fn binomial(n: u64, p: f64, k: u64) -> f64 {
    let mut value = 1.0;
    for i in 0..k {
        value *= (n - i) as f64 / (i + 1) as f64 * p / (1.0 - p);
    }
    value * (1.0 - p).powi(n as i32)
}

#[test]
fn exact_intervals_cover_on_each_side() {
    // Every sample enumerated: each side misses with probability alpha/2 at most, and not much less at its best.
    for (n, alpha) in [(10, 0.1), (37, 0.05), (60, 0.2)] {
        let mut largest = 0.0f64;
        for step in 1..200 {
            let p = f64::from(step) / 200.0;
            let (mut above, mut below) = (0.0, 0.0);
            for x in 0..=n {
                let interval = clopper_pearson(x, n, alpha).unwrap();
                let weight = binomial(n, p, x);
                above += if interval.low > p { weight } else { 0.0 };
                below += if interval.high < p { weight } else { 0.0 };
            }
            assert!(above <= 0.5 * alpha * (1.0 + 1e-9) && below <= 0.5 * alpha * (1.0 + 1e-9), "{n} {p}");
            largest = largest.max(above).max(below);
        }
        assert!(largest > 0.4 * alpha, "{largest} for {alpha}");
    }
    // Ranks, for a continuous law: the number below the quantile is binomial. One rank further in would not do.
    for (n, p, alpha) in [(20, 0.5, 0.05), (100, 0.9, 0.02), (300, 0.01, 0.2)] {
        let ranks = quantile_ranks(n, p, alpha).unwrap();
        let at_most = |k: u64| (0..=k).map(|x| binomial(n, p, x)).sum::<f64>();
        assert!(at_most(ranks.lower - 1) <= 0.5 * alpha && at_most(ranks.lower) > 0.5 * alpha);
        assert!(1.0 - at_most(ranks.upper - 1) <= 0.5 * alpha && 1.0 - at_most(ranks.upper - 2) > 0.5 * alpha);
    }
}

#[test]
fn intervals_for_means_and_variances_follow_their_formulas() {
    // Nine observations, mean 10, variance 4: 10 ± 2.306 · 2/3 (t table, e-Handbook 1.3.6.7.2, 8 degrees of freedom).
    let interval = mean_interval(10.0, 4.0, 9, 0.05).unwrap();
    printed(interval.high, 10.0 + 2.306 * 2.0 / 3.0, 1e-3);
    // s² exp(±z √((m₄/s⁴ − 1)/n)) with s² = 4, m₄ = 48 (normal kurtosis), n = 200: z √(2/200) on the logarithm.
    let interval = variance_interval(4.0, 48.0, 200, 0.05).unwrap();
    printed((interval.high / 4.0).ln(), 1.960 * 0.1, 2e-4);
    relative(interval.low * interval.high, 16.0, 1e-2, "symmetric on the logarithm, up to the divisor");
}

#[test]
fn sizes_are_the_smallest_that_do() {
    let n = law_size(4, 0.001, 0.05, 0.01).unwrap();
    let needs = |n: u64| dkw_half_width(n, 4, 0.001) + dkw_half_width(n, 4, 0.05);
    assert!(needs(n) <= 0.01 && needs(n - 1) > 0.01);
    let n = size_for_margin(0.01, 0.5, 0.001, 0.05).unwrap();
    assert!(agree_miss_probability(0.01, 0.5, n, 0.001) <= 0.05 + 1e-12);
    assert!(agree_miss_probability(0.01, 0.5, n - 1, 0.001) > 0.05 - 1e-5);
    // The binomial one by full enumeration.
    let (p, low, high, n, alpha) = (0.07, 0.03, 0.12, 400, 0.02);
    let miss: f64 = (0..=n)
        .filter(|x| {
            let interval = clopper_pearson(*x, n, alpha).unwrap();
            interval.low < low || interval.high > high
        })
        .map(|x| binomial(n, p, x))
        .sum();
    relative(binomial_agree_miss_probability(p, low, high, n, alpha), miss, 1e-9, "binomial miss");
    // By hand: skewness 2, excess kurtosis 6, alpha 0.05, z = 1.959964: z φ(z) = 0.114546; z⁴ + 2z² − 3 = 19.4399;
    // [4 · 19.4399/18 − 6 · 0.841459/12] = 3.89925; 2 · 0.114546 · 3.89925/0.005 = 178.66.
    assert_eq!(mean_least_size(2.0, 6.0, 0.05), 179);
}

#[test]
fn edges_are_defined_or_refused() {
    assert_eq!(clopper_pearson(0, 0, 0.05), None);
    assert_eq!(clopper_pearson(3, 2, 0.05), None);
    assert_eq!(clopper_pearson(1, 2, 0.0), None);
    assert_eq!(clopper_pearson(1, 2, f64::NAN), None);
    assert_eq!(clopper_pearson(0, 5, 0.05).unwrap().low, 0.0);
    assert_eq!(clopper_pearson(5, 5, 0.05).unwrap().high, 1.0);
    assert_eq!(mean_interval(1.0, 1.0, 1, 0.05), None);
    assert_eq!(variance_interval(1.0, 3.0, 1, 0.05), None);
    assert_eq!(PowerSums::default().mean(), None);
    assert_eq!(tenths([5]).variance(), None);
    assert_eq!((upper_tail(5, 0.0, 1), upper_tail(5, 1.0, 5), lower_tail(5, 0.3, 5)), (0.0, 1.0, 1.0));
    assert_eq!((normal_density(1e6), normal_survival(1e300), normal_survival(-1e300)), (0.0, 0.0, 1.0));
    assert!(upper_tail(5, f64::NAN, 1).is_nan());
}
