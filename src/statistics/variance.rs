//! The interval for a variance, on the logarithmic scale.

use super::interval::{Interval, is_level};
use super::normal::normal_upper_quantile;

/// The interval `s² exp(± z √((m₄/s⁴ − 1)/n))` for a variance, level about `1 − alpha`.
///
/// `variance` is s² with divisor n − 1, `fourth_central_moment` is m₄ with divisor n. `None` below two observations,
/// for a variance that is not positive, for moments that are not finite, and for `alpha` outside (0, 1).
///
/// # Formula
/// The delta method on ln s², whose variance is close to `(m₄/s⁴ − 1)/n`; the linear scale errs about three times as
/// often, because s² is skewed to the right. Where the data take two values equally often m₄/s⁴ − 1 vanishes or falls
/// below zero; `2/(n − 1)`, the next term of the exact variance of s², then stands in for it.
///
/// # Accuracy
/// The level is asymptotic. It settles where the t interval of Y = (T − μ)² does.
///
/// ```
/// use tallystone::statistics::variance_interval;
/// // A normal law has m₄ = 3 s⁴.
/// let interval = variance_interval(2.0, 12.0, 20_000, 0.05).unwrap();
/// assert!((interval.high / 2.0 - (1.959_964 * 0.01_f64).exp()).abs() < 1e-6);
/// assert!((interval.low * interval.high - 4.0).abs() < 1e-12);
/// ```
#[must_use]
pub fn variance_interval(variance: f64, fourth_central_moment: f64, n: u64, alpha: f64) -> Option<Interval> {
    let in_range = variance > 0.0 && variance.is_finite() && fourth_central_moment.is_finite();
    if n < 2 || !in_range || !is_level(alpha) {
        return None;
    }
    // Two quotients, since the square of the variance can overflow or vanish.
    let excess = (fourth_central_moment / variance / variance - 1.0).max(2.0 / (n - 1) as f64);
    let spread = normal_upper_quantile(0.5 * alpha) * (excess / n as f64).sqrt();
    Some(Interval { low: variance * (-spread).exp(), high: variance * spread.exp() })
}
