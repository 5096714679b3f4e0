//! Binomial and Poisson densities by their saddle point: relatively right for counts up to 1e12 and beyond.
//!
//! A density formed from differences of `ln Γ` loses as many digits as `ln Γ` is large: at n = 1e9 the error is 1e-6.
//! The saddle-point form has no such differences. With the *deviance* `x ln(x/m) + m − x` of an observed x from its
//! mean m, and the *Stirling error* `ln x! − [x ln x − x + ½ ln(2πx)]`, every term is of the size of the logarithm of
//! the result.
//!
//! Reference: C. Loader, Fast and Accurate Computation of Binomial Probabilities (2000). Here the difference between
//! observed and mean is passed in, formed with one rounding by the caller, which removes the last dependence on n.

use std::f64::consts::PI;

/// `ln(1 + d) − d` for `d > −1`, without the cancellation near 0.
///
/// With r = d/(2 + d), `ln(1 + d) = 2 atanh r` and `d = 2r/(1 − r)`, so the difference is
/// `−r d + 2 (r³/3 + r⁵/5 + …)`; both parts are small of second order or higher.
pub(super) fn ln_1p_minus(d: f64) -> f64 {
    if d.abs() > 0.4 {
        return d.ln_1p() - d;
    }
    let r = d / (2.0 + d);
    let square = r * r;
    // |r| <= 1/4: the first term left out is below 16^-12 / 27 of the leading one.
    let mut series = 0.0;
    for k in (0..12).rev() {
        series = series * square + 1.0 / f64::from(2 * k + 3);
    }
    2.0 * r * square * series - r * d
}

/// The Stirling error `ln Γ(x + 1) − [x ln x − x + ½ ln(2πx)]` for `x > 0`; absolute error below 1e-15.
pub(super) fn stirling_error(x: f64) -> f64 {
    let mut shift = 0.0;
    let mut at = x;
    // One step up the recurrence of Γ: δ(x) = δ(x + 1) + (x + ½) ln(1 + 1/x) − 1.
    while at < 16.0 {
        shift += (at + 0.5) * (1.0 / at).ln_1p() - 1.0;
        at += 1.0;
    }
    let t = 1.0 / (at * at);
    let series = 1.0 / 12.0
        - t * (1.0 / 360.0 - t * (1.0 / 1260.0 - t * (1.0 / 1680.0 - t * (1.0 / 1188.0 - t * (691.0 / 360_360.0)))));
    shift + series / at
}

/// The deviance `observed ln(observed/expected) − difference`, where `difference = observed − expected`.
pub(super) fn deviance(observed: f64, expected: f64, difference: f64) -> f64 {
    let d = difference / expected;
    if d.abs() <= 0.4 {
        expected * ((1.0 + d) * ln_1p_minus(d) + d * d)
    } else {
        observed * (observed / expected).ln() - difference
    }
}

/// `ln [Γ(a+b+1) / (Γ(a+1) Γ(b+1)) x^a y^b]` for `a, b > 0` and `x + y = 1`.
///
/// `excess` is `a − (a + b) x`, which the caller can form more exactly than this function could.
pub(super) fn ln_binomial_density(a: f64, b: f64, x: f64, y: f64, excess: f64) -> f64 {
    let n = a + b;
    let stirling = stirling_error(n) - stirling_error(a) - stirling_error(b);
    let distance = deviance(a, n * x, excess) + deviance(b, n * y, -excess);
    0.5 * (n / (2.0 * PI * a * b)).ln() + stirling - distance
}

/// `ln [x^a e^−x / Γ(a + 1)]` for `a, x > 0`.
pub(super) fn ln_poisson_density(a: f64, x: f64) -> f64 {
    -0.5 * (2.0 * PI * a).ln() - stirling_error(a) - deviance(a, x, a - x)
}
