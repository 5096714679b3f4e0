//! The regularised incomplete gamma functions, the tails of the chi-square law.
//!
//! The factor `x^a e^−x / Γ(a)` comes from the saddle-point density, the rest from Legendre's continued fraction above
//! a + 1 and from the power series below (NIST Digital Library of Mathematical Functions, 8.9 and 8.7).
//!
//! Accuracy: relative 1e-13 in the middle, growing as 4e-16 times the logarithm of the value far out. Both need about
//! √a terms next to the mean.

use super::continued::continued_fraction;
use super::saddle::ln_poisson_density;

/// One tail in the forms that the callers need.
#[derive(Clone, Copy, Debug)]
pub(super) struct GammaTail {
    pub(super) value: f64,
    /// Finite even where the value underflows.
    pub(super) ln_value: f64,
    /// The value over `x^a e^−x / Γ(a)`, the size of its derivative with respect to ln x.
    pub(super) ratio: f64,
}

/// `Q(a, x) = Γ(a, x)/Γ(a)` for `a, x > 0`.
pub(super) fn upper_gamma(a: f64, x: f64) -> GammaTail {
    let ln_scale = ln_poisson_density(a, x) + a.ln();
    if x > a + 1.0 { small(ln_scale, fraction(a, x)) } else { complement(ln_scale, series(a, x)) }
}

/// `P(a, x) = γ(a, x)/Γ(a)` for `a, x > 0`.
pub(super) fn lower_gamma(a: f64, x: f64) -> GammaTail {
    let ln_scale = ln_poisson_density(a, x) + a.ln();
    if x > a + 1.0 { complement(ln_scale, fraction(a, x)) } else { small(ln_scale, series(a, x)) }
}

fn small(ln_scale: f64, ratio: f64) -> GammaTail {
    GammaTail { value: ln_scale.exp() * ratio, ln_value: ln_scale + ratio.ln(), ratio }
}

/// The other tail of one that is itself not near 1.
fn complement(ln_scale: f64, other_ratio: f64) -> GammaTail {
    let other = ln_scale.exp() * other_ratio;
    GammaTail { value: 1.0 - other, ln_value: (-other).ln_1p(), ratio: (1.0 - other) / ln_scale.exp() }
}

/// Legendre's fraction for the upper tail.
fn fraction(a: f64, x: f64) -> f64 {
    // For whole a the fraction ends.
    continued_fraction(x + 1.0 - a, |k| (k * (a - k), x + 1.0 - a + 2.0 * k))
}

/// The power series for the lower tail: 1/a (1 + x/(a+1) + x²/((a+1)(a+2)) + …).
fn series(a: f64, x: f64) -> f64 {
    let mut term = 1.0 / a;
    let mut sum = term;
    let mut at = a;
    while term > sum * 0.25 * f64::EPSILON {
        at += 1.0;
        term *= x / at;
        sum += term;
    }
    sum
}
