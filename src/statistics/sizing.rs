//! Sample sizes: how many observations a verdict needs, and how often it would be missed.
//!
//! An interval decides "agree" when it lies inside the tolerance. `margin` is the tolerance less the proven error of the
//! exact answer, `alpha` the level of the interval and `beta` the chance of not agreeing when there is no difference.

use super::binomial::{largest_with_lower_tail_at_most, lower_tail, smallest_with_upper_tail_at_most, upper_tail};
use super::interval::is_level;
use super::normal::{normal_density, normal_survival, normal_upper_quantile};

/// The part of `alpha` by which the true level of a t interval may exceed it at the least size.
const TOLERATED_EXCESS: f64 = 0.1;

/// The smallest n at which a t interval of level `1 − alpha` misses at most a tenth of `alpha` too often; at least 2.
///
/// `skewness` and `excess_kurtosis` are those of the law of one observation. `u64::MAX` if they are not finite.
///
/// # Formula
/// The two-sided level of the t interval is `alpha + (2 z φ(z)/n) [γ² (z⁴ + 2z² − 3)/18 − κ (z² − 3)/12] + O(n⁻²)`,
/// z the upper alpha/2 quantile. A negative excess means that the interval misses less often than it may, which no
/// verdict suffers from; so the excess is taken with its sign, and then 2 is enough.
///
/// # Accuracy
/// The next order is left out: for very skewed laws the size is a guide, not a bound.
///
/// # Reference
/// P. Hall, The Bootstrap and Edgeworth Expansion (Springer 1992), 2.6, the second-order term of the studentised mean.
///
/// ```
/// use tallystone::statistics::mean_least_size;
/// // The normal law needs no more than a variance; the exponential law has skewness 2 and excess kurtosis 6.
/// assert_eq!(mean_least_size(0.0, 0.0, 0.05), 2);
/// assert!(mean_least_size(2.0, 6.0, 0.05) > 50);
/// ```
#[must_use]
pub fn mean_least_size(skewness: f64, excess_kurtosis: f64, alpha: f64) -> u64 {
    let z = normal_upper_quantile(0.5 * alpha);
    let square = z * z;
    let from_skewness = skewness * skewness * (square * square + 2.0 * square - 3.0) / 18.0;
    let from_kurtosis = excess_kurtosis * (square - 3.0) / 12.0;
    let excess_times_n = 2.0 * z * normal_density(z) * (from_skewness - from_kurtosis);
    if !excess_times_n.is_finite() {
        return u64::MAX;
    }
    // Casting saturates, and takes what is negative to zero.
    ((excess_times_n / (TOLERATED_EXCESS * alpha)).ceil() as u64).max(2)
}

/// The chance that an interval of level `1 − alpha` around a normal estimate without bias is not inside ± `margin`.
///
/// 2 P(Z > margin √n/σ − z), z the upper alpha/2 quantile, at most 1; 0 without spread, 1 without margin.
///
/// ```
/// use tallystone::statistics::agree_miss_probability;
/// assert!(agree_miss_probability(0.01, 0.5, 10_000, 0.01) > 0.5);
/// assert!(agree_miss_probability(0.01, 0.5, 100_000, 0.01) < 1e-3);
/// ```
#[must_use]
pub fn agree_miss_probability(margin: f64, standard_deviation: f64, n: u64, alpha: f64) -> f64 {
    if margin.is_nan() || margin <= 0.0 {
        return 1.0;
    }
    if standard_deviation == 0.0 {
        return 0.0;
    }
    let reach = margin * (n as f64).sqrt() / standard_deviation;
    (2.0 * normal_survival(reach - normal_upper_quantile(0.5 * alpha))).min(1.0)
}

/// The chance, exact, that the Clopper–Pearson interval is not inside `[tolerance_low, tolerance_high]` when n
/// observations succeed with probability `p`.
///
/// `tolerance_low ≤ 0` puts no demand on the lower end, `tolerance_high ≥ 1` none on the upper.
///
/// # Formula
/// The lower end reaches `tolerance_low` exactly from the smallest x with P(X ≥ x; `tolerance_low`) ≤ alpha/2 on, the
/// upper end stays within up to the largest x with P(X ≤ x; `tolerance_high`) ≤ alpha/2: no interval is solved for.
///
/// # Complexity
/// O(log n) binomial tails.
///
/// ```
/// use tallystone::statistics::binomial_agree_miss_probability;
/// assert_eq!(binomial_agree_miss_probability(0.5, 0.49, 0.51, 100, 0.05), 1.0);
/// assert!(binomial_agree_miss_probability(0.5, 0.49, 0.51, 100_000, 0.05) < 1e-4);
/// ```
#[must_use]
pub fn binomial_agree_miss_probability(p: f64, tolerance_low: f64, tolerance_high: f64, n: u64, alpha: f64) -> f64 {
    let level = 0.5 * alpha;
    let least = if tolerance_low <= 0.0 { 0 } else { smallest_with_upper_tail_at_most(n, tolerance_low, level) };
    let most = if tolerance_high >= 1.0 { Some(n) } else { largest_with_lower_tail_at_most(n, tolerance_high, level) };
    let Some(most) = most.filter(|&most| least <= most) else { return 1.0 };
    let too_few = if least == 0 { 0.0 } else { lower_tail(n, p, least - 1) };
    let too_many = upper_tail(n, p, most + 1);
    (too_few + too_many).min(1.0)
}

/// The least n at which an interval of level `1 − alpha` is inside ± `margin` with probability `1 − beta`:
/// ⌈(z_{alpha/2} + z_{beta/2})² σ²/margin²⌉, at least 1.
///
/// `None` without a margin, for levels outside (0, 1), and when the size does not fit 64 bits.
///
/// ```
/// use tallystone::statistics::size_for_margin;
/// assert_eq!(size_for_margin(0.0, 1.0, 0.05, 0.05), None);
/// // (1.960 + 1.960)² · 4 = 61.46
/// assert_eq!(size_for_margin(0.5, 1.0, 0.05, 0.05), Some(62));
/// ```
#[must_use]
pub fn size_for_margin(margin: f64, standard_deviation: f64, alpha: f64, beta: f64) -> Option<u64> {
    if margin.is_nan() || margin <= 0.0 || !is_level(alpha) || !is_level(beta) {
        return None;
    }
    let reach = normal_upper_quantile(0.5 * alpha) + normal_upper_quantile(0.5 * beta);
    whole_size((reach * standard_deviation / margin).powi(2))
}

/// The least n at which `bands` simultaneous bands of level `1 − alpha` show a distance within `margin` with probability
/// `1 − beta`: ((√(ln(2 bands/alpha)/2) + √(ln(2 bands/beta)/2))/margin)², rounded up.
///
/// `None` without a margin, for levels outside (0, 1), without bands, and when the size does not fit 64 bits.
///
/// ```
/// use tallystone::statistics::{dkw_half_width, law_size};
/// let n = law_size(3, 0.01, 0.05, 0.01).unwrap();
/// assert!(dkw_half_width(n, 3, 0.01) + dkw_half_width(n, 3, 0.05) <= 0.01);
/// ```
#[must_use]
pub fn law_size(bands: u64, alpha: f64, beta: f64, margin: f64) -> Option<u64> {
    if margin.is_nan() || margin <= 0.0 || bands == 0 || !is_level(alpha) || !is_level(beta) {
        return None;
    }
    let reach = |level: f64| (0.5 * (2.0 * bands as f64 / level).ln()).sqrt();
    whole_size(((reach(alpha) + reach(beta)) / margin).powi(2))
}

/// [`size_for_margin`] for a proportion, whose standard deviation is √(p (1 − p)).
///
/// `None` also for `p` outside [0, 1]. It is the normal approximation: for few expected successes or failures use
/// [`binomial_agree_miss_probability`].
///
/// ```
/// use tallystone::statistics::proportion_size;
/// assert_eq!(proportion_size(0.5, 0.01, 0.05, 0.05), Some(38_415));
/// ```
#[must_use]
pub fn proportion_size(p: f64, margin: f64, alpha: f64, beta: f64) -> Option<u64> {
    if !(0.0..=1.0).contains(&p) {
        return None;
    }
    size_for_margin(margin, (p * (1.0 - p)).sqrt(), alpha, beta)
}

/// The next whole size, at least 1; `None` if it does not fit.
fn whole_size(size: f64) -> Option<u64> {
    // 2⁶³: any larger real would saturate the cast, and no run is that long.
    (size < 9.2e18).then(|| (size.ceil() as u64).max(1))
}
