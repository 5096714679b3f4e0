//! Order statistics: the interval for a quantile that holds for every law, discrete ones included.
//!
//! For a law F and q = min{t : F(t) ≥ p}, let X_(1) ≤ … ≤ X_(n) be the sorted observations.
//!
//! - X_(r) > q exactly if fewer than r observations are ≤ q. Each is with probability F(q) ≥ p, so the chance is at
//!   most P(Bin(n, p) ≤ r − 1).
//! - X_(s) < q exactly if at least s observations are < q. Each is with probability P(T < q) < p, so the chance is at
//!   most P(Bin(n, p) ≥ s).
//!
//! Bounding each by alpha/2 gives the ranks. Ties only make the interval more cautious.

use super::binomial::{largest_with_lower_tail_at_most, lower_tail, smallest_with_upper_tail_at_most, upper_tail};
use super::interval::is_level;

/// The ranks of the two order statistics that enclose a quantile, counted from 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Ranks {
    /// Rank of the observation that is the lower end.
    pub lower: u64,
    /// Rank of the observation that is the upper end.
    pub upper: u64,
}

/// The tightest ranks r ≤ s with P(X_(r) ≤ q_p) ≥ 1 − alpha/2 and P(X_(s) ≥ q_p) ≥ 1 − alpha/2 for every law.
///
/// `n` is the number of observations and `p`, strictly between 0 and 1, says which quantile. `None` if a rank would fall
/// outside 1..=n (too few observations for that quantile and level), and for `p` or `alpha` outside (0, 1).
///
/// # Complexity
/// O(log n) binomial tails.
///
/// # Reference
/// W. R. Thompson, Ann. Math. Stat. 7 (1936) 122–128, doi:10.1214/aoms/1177732502 (from memory).
///
/// ```
/// use tallystone::statistics::{Ranks, quantile_ranks};
/// assert_eq!(quantile_ranks(20, 0.5, 0.05), Some(Ranks { lower: 6, upper: 15 }));
/// // Five observations never enclose the median with 95 %: 2 · 2⁻⁵ = 0.0625.
/// assert_eq!(quantile_ranks(5, 0.5, 0.05), None);
/// ```
#[must_use]
pub fn quantile_ranks(n: u64, p: f64, alpha: f64) -> Option<Ranks> {
    if !is_level(p) || !is_level(alpha) {
        return None;
    }
    let lower = largest_with_lower_tail_at_most(n, p, 0.5 * alpha)? + 1;
    let upper = smallest_with_upper_tail_at_most(n, p, 0.5 * alpha);
    (lower <= n && upper <= n).then_some(Ranks { lower, upper })
}

/// The p-value of "the quantile lies in [a, b]": the smallest level at which the interval of [`quantile_ranks`] misses.
///
/// `at_or_below_high` is the number of observations ≤ b, `below_low` the number of observations < a. The interval lies
/// above b exactly if `at_or_below_high < r`, that is P(Bin(n, p) ≤ `at_or_below_high`) ≤ alpha/2, and below a exactly
/// if `below_low ≥ s`, that is P(Bin(n, p) ≥ `below_low`) ≤ alpha/2: twice the smaller of the two, at most 1.
///
/// ```
/// use tallystone::statistics::quantile_p_value;
/// // "The median is at most b", and none of ten observations is: 2 · 2⁻¹⁰.
/// assert!((quantile_p_value(10, 0.5, 0, 0) - 2.0 / 1024.0).abs() < 1e-17);
/// // Half at or below b, less than half below a: no evidence at all.
/// assert_eq!(quantile_p_value(10, 0.5, 6, 3), 1.0);
/// ```
#[must_use]
pub fn quantile_p_value(n: u64, p: f64, at_or_below_high: u64, below_low: u64) -> f64 {
    let quantile_above = lower_tail(n, p, at_or_below_high);
    let quantile_below = upper_tail(n, p, below_low);
    (2.0 * quantile_above.min(quantile_below)).min(1.0)
}
