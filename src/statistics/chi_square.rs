//! The chi-square law and the pooled test of goodness of fit.

use super::incomplete_gamma::{GammaTail, lower_gamma, upper_gamma};
use super::normal::normal_upper_quantile;

/// The survival function P(X > x) of the chi-square law.
///
/// `degrees_of_freedom` is positive and need not be whole; NaN otherwise.
///
/// # Accuracy
/// Relative 1e-12 down to 1e-300.
///
/// # Complexity
/// O(√(degrees of freedom)) next to the mean, less elsewhere.
///
/// ```
/// use tallystone::statistics::chi_square_survival;
/// // Two degrees of freedom are an exponential law of mean 2.
/// assert!((chi_square_survival(600.0, 2.0) / (-300.0_f64).exp() - 1.0).abs() < 1e-12);
/// ```
#[must_use]
pub fn chi_square_survival(x: f64, degrees_of_freedom: f64) -> f64 {
    if x.is_nan() || degrees_of_freedom.is_nan() || degrees_of_freedom <= 0.0 {
        return f64::NAN;
    }
    if x <= 0.0 {
        return 1.0;
    }
    if x == f64::INFINITY {
        return 0.0;
    }
    upper_gamma(0.5 * degrees_of_freedom, 0.5 * x).value
}

/// The upper quantile: the x with P(X > x) = `q` under the chi-square law.
///
/// `+∞` at 0, 0 at 1; NaN for q outside [0, 1] and for degrees of freedom that are not positive.
///
/// # Accuracy
/// Relative 1e-13 for q from 1e-300 up to the nearest double below 1.
///
/// # Formula
/// The start of Wilson and Hilferty (1931), then Newton's method on the logarithm of the smaller tail against ln x,
/// where both are concave.
///
/// ```
/// use tallystone::statistics::chi_square_upper_quantile;
/// assert!((chi_square_upper_quantile(0.05, 8.0) - 15.507).abs() < 5e-4);
/// ```
#[must_use]
pub fn chi_square_upper_quantile(q: f64, degrees_of_freedom: f64) -> f64 {
    if !(0.0..=1.0).contains(&q) || degrees_of_freedom.is_nan() || degrees_of_freedom <= 0.0 {
        return f64::NAN;
    }
    if q == 0.0 {
        return f64::INFINITY;
    }
    if q == 1.0 {
        return 0.0;
    }
    let a = 0.5 * degrees_of_freedom;
    let spread = 2.0 / (9.0 * degrees_of_freedom);
    let root = 1.0 - spread + normal_upper_quantile(q) * spread.sqrt();
    // Near 0 the cube turns negative; there P(a, x) is close to x^a/Γ(a + 1), and any small start will do.
    let start = a * root.powi(3).max(1e-3);
    if q > 0.5 {
        2.0 * newton(start, 1.0 - q, |x| lower_gamma(a, x), 1.0)
    } else {
        2.0 * newton(start, q, |x| upper_gamma(a, x), -1.0)
    }
}

/// Newton's method on the logarithm of `tail` against ln x; `direction` is the sign of its slope.
fn newton(start: f64, target: f64, tail: impl Fn(f64) -> GammaTail, direction: f64) -> f64 {
    let mut x = start;
    for _ in 0..200 {
        let at = tail(x);
        let mut step = direction * (target.ln() - at.ln_value) * at.ratio;
        // Where the tail is nearly all of the law its logarithm is flat and the tangent points too far.
        if at.value > 0.6 {
            step = step.clamp(-1.0, 1.0);
        }
        x *= step.exp();
        if step.abs() <= f64::EPSILON {
            break;
        }
    }
    x
}

/// The outcome of a chi-square test of goodness of fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GoodnessOfFit {
    /// Σ (observed − expected)²/expected over the pooled cells.
    pub statistic: f64,
    /// The number of pooled cells less one.
    pub degrees_of_freedom: u64,
    /// The chance of a statistic at least as large under the law, by the chi-square approximation.
    pub p_value: f64,
}

/// Pearson's test of counts against a fully known law, with thin cells pooled.
///
/// `observed` holds the counts, `expected_probability` the probability of each cell; the probabilities sum to 1. Adjacent
/// cells are joined in order until the expected count reaches `minimum_expected` (5 is usual); what is left at the end
/// joins the last pool. `None` with fewer than two pooled cells, without observations, and when the lengths differ.
///
/// # Reference
/// K. Pearson, Philos. Mag. 50 (1900) 157–175, doi:10.1080/14786440009463897.
///
/// ```
/// use tallystone::statistics::pooled_chi_square;
/// let fit = pooled_chi_square(&[40, 60], &[0.5, 0.5], 5.0).unwrap();
/// assert_eq!((fit.statistic, fit.degrees_of_freedom), (4.0, 1));
/// ```
#[must_use]
pub fn pooled_chi_square(
    observed: &[u64],
    expected_probability: &[f64],
    minimum_expected: f64,
) -> Option<GoodnessOfFit> {
    let total = observed.iter().sum::<u64>() as f64;
    if observed.len() != expected_probability.len() || total == 0.0 {
        return None;
    }
    let mut pools: Vec<Pool> = Vec::new();
    let mut open = Pool::default();
    for (&count, &probability) in observed.iter().zip(expected_probability) {
        open.observed += count;
        open.expected += total * probability;
        // An empty expectation is never a pool of its own, even for a minimum of zero.
        if open.expected >= minimum_expected && open.expected > 0.0 {
            pools.push(std::mem::take(&mut open));
        }
    }
    let last = pools.last_mut()?;
    last.observed += open.observed;
    last.expected += open.expected;
    if pools.len() < 2 {
        return None;
    }
    let statistic = pools.iter().map(|pool| (pool.observed as f64 - pool.expected).powi(2) / pool.expected).sum();
    let degrees_of_freedom = pools.len() as u64 - 1;
    let p_value = chi_square_survival(statistic, degrees_of_freedom as f64);
    Some(GoodnessOfFit { statistic, degrees_of_freedom, p_value })
}

#[derive(Default)]
struct Pool {
    observed: u64,
    expected: f64,
}
