//! Bands for distribution functions, by the inequality of Dvoretzky, Kiefer and Wolfowitz.
//!
//! For n observations of any law, discrete ones included, P(sup |F̂ − F| > d) ≤ 2 exp(−2 n d²). Several functions at
//! once, such as the parts of one law by end, share the level in equal parts.
//!
//! Reference: P. Massart, Ann. Probab. 18 (1990) 1269–1283, doi:10.1214/aop/1176990746.

/// The half width d of `bands` simultaneous bands from `n` observations: √(ln(2 bands/alpha)/(2 n)).
///
/// All of them hold together with probability at least `1 − alpha`. A distance of distribution functions is at most 1;
/// the value is not capped there, so that it scales as 1/√n.
///
/// ```
/// use tallystone::statistics::dkw_half_width;
/// assert!((dkw_half_width(100, 1, 0.05) - 0.135_810_151_57).abs() < 1e-11);
/// ```
#[must_use]
pub fn dkw_half_width(n: u64, bands: u64, alpha: f64) -> f64 {
    ((2.0 * bands as f64 / alpha).ln() / (2.0 * n as f64)).sqrt()
}

/// The level at which `bands` bands just reach the distance `distance`: min(1, 2 bands exp(−2 n distance²)).
///
/// The inverse of [`dkw_half_width`] wherever the level is below 1.
///
/// ```
/// use tallystone::statistics::{dkw_half_width, dkw_level};
/// let distance = dkw_half_width(1_000, 3, 0.01);
/// assert!((dkw_level(distance, 1_000, 3) - 0.01).abs() < 1e-15);
/// ```
#[must_use]
pub fn dkw_level(distance: f64, n: u64, bands: u64) -> f64 {
    if distance <= 0.0 {
        return 1.0;
    }
    (2.0 * bands as f64 * (-2.0 * n as f64 * distance * distance).exp()).min(1.0)
}
