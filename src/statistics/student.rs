//! Student's t law and the interval for a mean that rests on it.

use super::incomplete_beta::{Split, inverse_beta, regularised_beta};
use super::interval::{Interval, is_level};
use super::normal::normal_upper_quantile;
use std::f64::consts::PI;

/// The survival function P(T > t) of Student's law.
///
/// `degrees_of_freedom` is at least 1 and need not be whole; NaN below.
///
/// # Formula
/// ½ I_x(ν/2, ½) at x = ν/(ν + t²) for t > 0.
///
/// # Accuracy
/// Relative 1e-12 down to 1e-300, for 1 and for at least 2 degrees of freedom; in between, down to 1e-150.
///
/// ```
/// use tallystone::statistics::student_survival;
/// // One degree of freedom is the Cauchy law: a quarter lies beyond 1.
/// assert!((student_survival(1.0, 1.0) - 0.25).abs() < 1e-15);
/// ```
#[must_use]
pub fn student_survival(t: f64, degrees_of_freedom: f64) -> f64 {
    if t.is_nan() || degrees_of_freedom.is_nan() || degrees_of_freedom < 1.0 {
        return f64::NAN;
    }
    if t == 0.0 {
        return 0.5;
    }
    if t < 0.0 {
        return 1.0 - student_survival(-t, degrees_of_freedom);
    }
    if degrees_of_freedom == 1.0 {
        return (1.0 / t).atan() / PI;
    }
    // A quotient before the product: t² alone overflows first.
    let odds = degrees_of_freedom / t / t;
    if odds == 0.0 {
        return 0.0;
    }
    0.5 * regularised_beta(0.5 * degrees_of_freedom, 0.5, Split::from_odds(odds)).value
}

/// The upper quantile: the t with P(T > t) = `q` under Student's law.
///
/// Not finite outside (0, 1): `+∞` at 0, `−∞` at 1, NaN beyond, and NaN below 1 degree of freedom.
///
/// # Accuracy
/// Relative 1e-13 wherever [`student_survival`] is accurate, the median's neighbourhood included.
///
/// ```
/// use tallystone::statistics::student_upper_quantile;
/// assert!((student_upper_quantile(0.025, 10.0) - 2.228).abs() < 5e-4);
/// ```
#[must_use]
pub fn student_upper_quantile(q: f64, degrees_of_freedom: f64) -> f64 {
    if !(0.0..=1.0).contains(&q) || degrees_of_freedom.is_nan() || degrees_of_freedom < 1.0 {
        return f64::NAN;
    }
    if q > 0.5 {
        return -student_upper_quantile(1.0 - q, degrees_of_freedom);
    }
    if q == 0.0 {
        return f64::INFINITY;
    }
    if q == 0.5 {
        return 0.0;
    }
    if degrees_of_freedom == 1.0 {
        return 1.0 / (PI * q).tan();
    }
    let z = normal_upper_quantile(q);
    let start = Split::from_odds(degrees_of_freedom / (z * z));
    let at = inverse_beta(0.5 * degrees_of_freedom, 0.5, 2.0 * q, start);
    (degrees_of_freedom * at.y / at.x).sqrt()
}

/// The t interval for a mean: `mean ± t √(variance/n)` with n − 1 degrees of freedom.
///
/// `variance` has divisor n − 1; `alpha` is the chance of missing, half on each side. `None` below two observations,
/// for a variance that is negative or not finite, and for `alpha` outside (0, 1).
///
/// # Accuracy
/// The level is asymptotic unless the observations are normal: see [`mean_least_size`](super::mean_least_size). A
/// variance of 0 gives an interval of no width, which covers only if the law itself has none.
///
/// # Reference
/// Student, The Probable Error of a Mean, Biometrika 6 (1908) 1–25, doi:10.1093/biomet/6.1.1.
///
/// ```
/// use tallystone::statistics::mean_interval;
/// let interval = mean_interval(10.0, 4.0, 9, 0.05).unwrap();
/// // Upper 2.5 % point at 8 degrees of freedom: 2.306.
/// assert!((interval.half_width() - 2.306 * 2.0 / 3.0).abs() < 1e-3);
/// assert!(mean_interval(10.0, 4.0, 1, 0.05).is_none());
/// ```
#[must_use]
pub fn mean_interval(mean: f64, variance: f64, n: u64, alpha: f64) -> Option<Interval> {
    if n < 2 || !mean.is_finite() || !(0.0..f64::INFINITY).contains(&variance) || !is_level(alpha) {
        return None;
    }
    let half_width = student_upper_quantile(0.5 * alpha, (n - 1) as f64) * (variance / n as f64).sqrt();
    Some(Interval { low: mean - half_width, high: mean + half_width })
}
