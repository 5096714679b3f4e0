//! The binomial law: exact tails, the intervals for a proportion, and the p-value that matches them.

use super::incomplete_beta::{Split, inverse_beta, regularised_beta};
use super::interval::{Interval, is_level};
use super::normal::normal_upper_quantile;

/// P(X ≥ k) for X ~ Bin(n, p).
///
/// `p` is clamped to the unit interval; NaN gives NaN.
///
/// # Accuracy
/// Relative 1e-12 down to 1e-300 for n up to 1e12.
///
/// # Complexity
/// A microsecond or two, whatever n.
///
/// # Formula
/// I_p(k, n − k + 1), the regularised incomplete beta function.
///
/// ```
/// use tallystone::statistics::upper_tail;
/// assert!((upper_tail(3, 0.5, 2) - 0.5).abs() < 1e-15);
/// assert!((upper_tail(1_000, 0.5, 1_000) * 2_f64.powi(1_000) - 1.0).abs() < 1e-12);
/// ```
#[must_use]
pub fn upper_tail(n: u64, p: f64, k: u64) -> f64 {
    if p.is_nan() {
        return f64::NAN;
    }
    if k == 0 {
        return 1.0;
    }
    if k > n || p <= 0.0 {
        return 0.0;
    }
    if p >= 1.0 {
        return 1.0;
    }
    regularised_beta(k as f64, (n - k) as f64 + 1.0, Split::at(p)).value
}

/// P(X ≤ k) for X ~ Bin(n, p).
///
/// `p` is clamped to the unit interval; NaN gives NaN. Accuracy and cost are those of [`upper_tail`].
///
/// ```
/// use tallystone::statistics::lower_tail;
/// assert!((lower_tail(3, 0.5, 1) - 0.5).abs() < 1e-15);
/// ```
#[must_use]
pub fn lower_tail(n: u64, p: f64, k: u64) -> f64 {
    if p.is_nan() {
        return f64::NAN;
    }
    if k >= n || p <= 0.0 {
        return 1.0;
    }
    if p >= 1.0 {
        return 0.0;
    }
    regularised_beta((n - k) as f64, k as f64 + 1.0, Split::at(p).swapped()).value
}

/// The smallest k with P(X ≥ k) ≤ `level` for X ~ Bin(n, p); `n + 1`, whose tail is empty, when no smaller one serves.
///
/// # Complexity
/// O(log n) tails.
#[must_use]
pub fn smallest_with_upper_tail_at_most(n: u64, p: f64, level: f64) -> u64 {
    // Invariant: the answer lies in low..=high; the tail falls as k grows.
    let (mut low, mut high) = (0, n + 1);
    while low < high {
        let middle = low + (high - low) / 2;
        if upper_tail(n, p, middle) <= level {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    low
}

/// The largest k with P(X ≤ k) ≤ `level` for X ~ Bin(n, p); `None` when P(X = 0) is already above.
///
/// # Complexity
/// O(log n) tails.
#[must_use]
pub fn largest_with_lower_tail_at_most(n: u64, p: f64, level: f64) -> Option<u64> {
    // Invariant: every k below `low` serves, no k from `high` on does.
    let (mut low, mut high) = (0, n + 1);
    while low < high {
        let middle = low + (high - low) / 2;
        if lower_tail(n, p, middle) <= level {
            low = middle + 1;
        } else {
            high = middle;
        }
    }
    low.checked_sub(1)
}

/// The Clopper–Pearson interval for a proportion, level `1 − alpha`, half of `alpha` on each side.
///
/// The lower end solves P(X ≥ successes; p) = alpha/2, the upper end P(X ≤ successes; p) = alpha/2; with no success
/// the lower end is 0, with no failure the upper end is 1. It covers with probability at least `1 − alpha` for every n
/// and every proportion. `None` for n = 0, `successes > n` and `alpha` outside (0, 1).
///
/// # Accuracy
/// Each defining tail equals alpha/2 to about 1e-12, or to what the spacing of doubles allows: at n = 1e12 one unit in
/// the last place of p moves the tail by 1e-10.
///
/// # Complexity
/// About ten tails, whatever n: some ten microseconds.
///
/// # Reference
/// C. J. Clopper and E. S. Pearson, Biometrika 26 (1934) 404–413, doi:10.1093/biomet/26.4.404.
///
/// ```
/// use tallystone::statistics::clopper_pearson;
/// let interval = clopper_pearson(0, 20, 0.10).unwrap();
/// assert_eq!(interval.low, 0.0);
/// assert!((interval.high - (1.0 - 0.05_f64.powf(1.0 / 20.0))).abs() < 1e-15);
/// ```
#[must_use]
pub fn clopper_pearson(successes: u64, n: u64, alpha: f64) -> Option<Interval> {
    if n == 0 || successes > n || !is_level(alpha) {
        return None;
    }
    let low = proportion_with_upper_tail(successes, n, 0.5 * alpha).x;
    // Failures are successes of the complement, and their lower end is the upper end seen from the other side.
    let high = proportion_with_upper_tail(n - successes, n, 0.5 * alpha).y;
    Some(Interval { low, high })
}

/// The p with P(X ≥ k) = `level` for X ~ Bin(n, p), and its complement.
fn proportion_with_upper_tail(k: u64, n: u64, level: f64) -> Split {
    if k == 0 {
        return Split { x: 0.0, y: 1.0 };
    }
    let (count, size) = (k as f64, n as f64);
    if k == n {
        let ln_x = level.ln() / size;
        return Split { x: ln_x.exp(), y: -ln_x.exp_m1() };
    }
    if k == 1 {
        let ln_y = (-level).ln_1p() / size;
        return Split { x: -ln_y.exp_m1(), y: ln_y.exp() };
    }
    // Wilson's lower end with the continuity correction folded into the count: a few per cent of a width off.
    let start = wilson_low(count - 0.5, size, normal_upper_quantile(level));
    inverse_beta(count, size - count + 1.0, level, start)
}

/// Wilson's lower end for the real count `k` out of `n`, with its complement.
fn wilson_low(k: f64, n: f64, z: f64) -> Split {
    let square = z * z;
    let failures = n - k;
    let root = z * (k / n * failures + 0.25 * square).sqrt();
    // k²/n over a sum of positive parts: the textbook form cancels for small counts.
    let x = k * (k / n) / (k + 0.5 * square + root);
    Split { x, y: (failures + 0.5 * square + root) / (n + square) }
}

/// Wilson's score interval for a proportion, level about `1 − alpha`.
///
/// Shorter than [`clopper_pearson`], and its coverage is right on average only. `None` for n = 0, `successes > n` and
/// `alpha` outside (0, 1).
///
/// # Reference
/// E. B. Wilson, J. Am. Stat. Assoc. 22 (1927) 209–212, doi:10.1080/01621459.1927.10502953.
///
/// ```
/// use tallystone::statistics::wilson;
/// let interval = wilson(81, 263, 0.05).unwrap();
/// assert!((interval.low - 0.2553).abs() < 5e-5 && (interval.high - 0.3662).abs() < 5e-5);
/// ```
#[must_use]
pub fn wilson(successes: u64, n: u64, alpha: f64) -> Option<Interval> {
    if n == 0 || successes > n || !is_level(alpha) {
        return None;
    }
    let z = normal_upper_quantile(0.5 * alpha);
    let low = wilson_low(successes as f64, n as f64, z).x;
    let high = wilson_low((n - successes) as f64, n as f64, z).y;
    Some(Interval { low, high })
}

/// The p-value of "the proportion lies in `[p_low, p_high]`": twice the smaller tail, at most 1.
///
/// It is the smallest level at which [`clopper_pearson`] misses `[p_low, p_high]`: the interval of level `1 − alpha`
/// does so exactly if the value is below `alpha`. A count inside `[n p_low, n p_high]` gives 1.
///
/// # Accuracy
/// Relative 1e-12 down to 1e-300.
///
/// ```
/// use tallystone::statistics::binomial_p_value;
/// assert_eq!(binomial_p_value(50, 100, 0.5, 0.5), 1.0);
/// // No head in ten throws: 2/1024.
/// assert!((binomial_p_value(0, 10, 0.5, 0.5) - 2.0 / 1024.0).abs() < 1e-17);
/// ```
#[must_use]
pub fn binomial_p_value(successes: u64, n: u64, p_low: f64, p_high: f64) -> f64 {
    // The median of Bin(n, p) is ⌊np⌋ or ⌈np⌉, so the tail that points away from the set is at least a half: no case
    // for "above", "below" and "inside" is needed.
    let above = upper_tail(n, p_high, successes);
    let below = lower_tail(n, p_low, successes);
    (2.0 * above.min(below)).min(1.0)
}
