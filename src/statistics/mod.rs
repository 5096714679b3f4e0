//! Intervals, tests and exact moments: what turns tallies into statements with a stated error rate.
//!
//! **Purpose.** Everything a comparison needs from mathematical statistics, and nothing else: confidence intervals for
//! proportions, means, quantiles, variances and distribution functions; the p-values that match them; the sample sizes
//! at which they decide; and the exact integer power sums that the tallies keep.
//!
//! **Limits.** This room knows nothing of chains, models or files. It takes numbers and returns numbers, keeps no
//! state and draws nothing at random. Intervals for means and variances are asymptotic; those for proportions,
//! quantiles and distribution functions hold at every sample size.
//!
//! **Accuracy.** Tails come from survival functions and never from a complement that cancels, so a p-value of 1e-200
//! is as good, relatively, as one of 0.01. Undefined is `None`, never zero and never NaN.
//!
//! # Example
//! ```
//! use tallystone::statistics::{binomial_p_value, clopper_pearson, PowerSums};
//!
//! // 4 of 20 runs ended in failure: where may the true proportion lie, with 90 % confidence?
//! let interval = clopper_pearson(4, 20, 0.10).unwrap();
//! assert!(interval.contains(0.1) && !interval.contains(0.5));
//! assert!(binomial_p_value(4, 20, 0.5, 0.5) < 0.10);
//!
//! // Moments come from exact integers and are rounded once.
//! let mut steps = PowerSums::default();
//! for value in [2, 4, 4, 4, 5, 5, 7, 9] {
//!     steps.add(value);
//! }
//! assert_eq!(steps.mean(), Some(5.0));
//! assert_eq!(steps.central_moment(2), Some(4.0));
//! ```

mod band;
mod binomial;
mod chi_square;
mod continued;
mod incomplete_beta;
mod incomplete_gamma;
mod interval;
mod joint;
mod moments;
mod normal;
mod order;
mod rounding;
mod saddle;
mod sizing;
mod student;
mod variance;

pub use band::{dkw_half_width, dkw_level};
pub use binomial::{
    binomial_p_value, clopper_pearson, largest_with_lower_tail_at_most, lower_tail, smallest_with_upper_tail_at_most,
    upper_tail, wilson,
};
pub use chi_square::{GoodnessOfFit, chi_square_survival, chi_square_upper_quantile, pooled_chi_square};
pub use interval::Interval;
pub use joint::JointSums;
pub use moments::{PowerSums, PowerSumsBlock};
pub use normal::{normal_density, normal_survival, normal_upper_quantile};
pub use order::{Ranks, quantile_p_value, quantile_ranks};
pub use rounding::ratio_to_f64;
pub use sizing::{
    agree_miss_probability, binomial_agree_miss_probability, law_size, mean_least_size, proportion_size,
    size_for_margin,
};
pub use student::{mean_interval, student_survival, student_upper_quantile};
pub use variance::variance_interval;
