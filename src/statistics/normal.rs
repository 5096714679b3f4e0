//! The standard normal law.

use statrs::function::erf::erfc;
use std::f64::consts::{FRAC_1_SQRT_2, PI};

/// From here on the continued fraction needs fewer than fifty terms and beats the complementary error function, whose
/// argument, rounded once, costs z² units in the last place.
const FAR: f64 = 5.0;

/// The density `exp(−z²/2)/√(2π)`.
///
/// # Accuracy
/// Relative 1e-15 down to the smallest normal number: z is split, so that its square is not rounded before the
/// exponential.
///
/// ```
/// use tallystone::statistics::normal_density;
/// assert!((normal_density(0.0) - 0.398_942_280_401_432_7).abs() < 1e-16);
/// ```
#[must_use]
pub fn normal_density(z: f64) -> f64 {
    // Below the smallest number; and the parts of z² would overflow against one another further out.
    if z.abs() > 39.0 {
        return 0.0;
    }
    // The square of a multiple of 1/16 below 40 is exact.
    let head = (z * 16.0).round() / 16.0;
    let tail = (z - head) * (z + head);
    (-0.5 * head * head).exp() * (-0.5 * tail).exp() / (2.0 * PI).sqrt()
}

/// The survival function P(Z > z).
///
/// # Accuracy
/// Relative 1e-14 for z up to 37.5, where the value is 1e-307; beyond 38.6 it underflows to 0.
///
/// # Reference
/// Far out, the continued fraction of Laplace: NIST Digital Library of Mathematical Functions, 7.9.
///
/// ```
/// use tallystone::statistics::normal_survival;
/// assert_eq!(normal_survival(0.0), 0.5);
/// assert!((normal_survival(10.0) / 7.619_853_024_160_527e-24 - 1.0).abs() < 1e-14);
/// ```
#[must_use]
pub fn normal_survival(z: f64) -> f64 {
    if z < FAR {
        return 0.5 * erfc(z * FRAC_1_SQRT_2);
    }
    normal_density(z) * mills_ratio(z)
}

/// P(Z > z)/φ(z) for `z >= FAR`, by 1/(z + 1/(z + 2/(z + 3/(z + …)))).
fn mills_ratio(z: f64) -> f64 {
    let terms = if z < 8.0 { 60 } else { 30 };
    let mut below = z;
    for k in (1..=terms).rev() {
        below = z + f64::from(k) / below;
    }
    1.0 / below
}

/// The upper quantile: the z with P(Z > z) = `q`.
///
/// Not finite outside (0, 1): `+∞` at 0, `−∞` at 1, NaN beyond.
///
/// # Accuracy
/// Relative 1e-14 for q from 1e-300 to 0.4; near the median, absolute 1e-15.
///
/// # Formula
/// The rational start of Hastings (Abramowitz & Stegun 26.2.23, absolute error 4.5e-4), then Newton's method on
/// ln P(Z > z), which is concave, so that the steps cannot run away.
///
/// ```
/// use tallystone::statistics::normal_upper_quantile;
/// assert!((normal_upper_quantile(0.025) - 1.959_963_984_540_054).abs() < 1e-14);
/// ```
#[must_use]
pub fn normal_upper_quantile(q: f64) -> f64 {
    if !(0.0..=1.0).contains(&q) {
        return f64::NAN;
    }
    if q > 0.5 {
        // Exact: the complement of a double in [½, 1] is a double.
        return -normal_upper_quantile(1.0 - q);
    }
    if q == 0.0 {
        return f64::INFINITY;
    }
    if q == 0.5 {
        return 0.0;
    }
    let t = (-2.0 * q.ln()).sqrt();
    let mut z =
        t - (2.515_517 + t * (0.802_853 + t * 0.010_328)) / (1.0 + t * (1.432_788 + t * (0.189_269 + t * 0.001_308)));
    // The start is good to 4.5e-4 and each step squares the error: two suffice, the third is for the last place.
    for _ in 0..3 {
        let survival = normal_survival(z);
        z += (survival / q).ln() * survival / normal_density(z);
    }
    z
}
