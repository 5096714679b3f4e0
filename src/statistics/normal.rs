//! The standard normal law.

use std::f64::consts::{PI, SQRT_2};

use statrs::function::erf::erfc_inv;

use super::incomplete_gamma::upper_gamma;

/// From here on the continued fraction needs few terms and beats the incomplete gamma function, whose argument, rounded
/// once, costs z² units in the last place.
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
/// # Formula
/// ½ Q(½, z²/2), the regularised incomplete gamma function; far out, the continued fraction of Laplace (NIST Digital
/// Library of Mathematical Functions, 7.11 and 7.9). The complementary error function of `statrs` is only good to 1e-11.
///
/// ```
/// use tallystone::statistics::normal_survival;
/// assert_eq!(normal_survival(0.0), 0.5);
/// assert!((normal_survival(10.0) / 7.619_853_024_160_527e-24 - 1.0).abs() < 1e-14);
/// ```
#[must_use]
pub fn normal_survival(z: f64) -> f64 {
    if z < 0.0 {
        return 1.0 - normal_survival(-z);
    }
    if z == 0.0 {
        return 0.5;
    }
    if z < FAR {
        return 0.5 * upper_gamma(0.5, 0.5 * z * z).value;
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
/// The inverse complementary error function of `statrs` for a start, then Newton's method on ln P(Z > z), which is concave,
/// so that the steps cannot run away.
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
    let mut z = SQRT_2 * erfc_inv(2.0 * q);
    // Each step squares the error of the start: one suffices, the second is for the last place.
    for _ in 0..2 {
        let survival = normal_survival(z);
        z += (survival / q).ln() * survival / normal_density(z);
    }
    z
}
