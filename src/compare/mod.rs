//! The comparison of a tally with the exact answers: one table, one error rate, a verdict for every row.
//!
//! **Purpose.** Chooses the rows and their tolerances, says before the run how many replications the table needs, and
//! afterwards, for each quantity, *agree*, *disagree*, *inconclusive* or, where nothing is tolerated, *consistent*.
//!
//! **Limits.** Replications are taken to be independent, and their number to be fixed in advance: a larger rerun after an
//! inconclusive table is another test. Intervals for means and variances are asymptotic; below the size from which they
//! hold their level within a tenth, their rows are inconclusive. What the tally does not hold, such as the path of a
//! replication, is not compared.
//!
//! ```
//! use tallystone::compare::{Settings, Study, Verdict};
//! use tallystone::exact::{Exact, Request};
//! use tallystone::model::{Model, Silent};
//! use tallystone::sampling::{Plan, Sampler, sample};
//! let model = Model::from_toml(r#"
//!     start = "bench"
//!     absorbing = ["shipped", "scrapped"]
//!     [moves]
//!     bench = { shipped = "5/6", bench = 0.1, scrapped = "rest" }
//! "#)?;
//! let settings = Settings::default();
//! let exact = Exact::solve(&model, &Request::of(&model, &Study::quantities(&model, &settings)), &Silent)?;
//! let study = Study::new(&exact, &settings)?;
//! let replications = study.plan().replications.expect("every default row can be decided");
//! let tally = sample(&Sampler::new(model.chain()), &Plan { replications, seed: 1, grid: study.grid() }, &Silent)?;
//! assert_eq!(study.compare(&tally, Vec::new()).verdict, Verdict::Agree);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```
//!
//! # Why no verdict is wrong, but with the probability stated
//! Of each row let θ be the model's answer, known to lie in [l, h]; θ* what the program's outcomes have in its place; τ the
//! tolerance, and [L, U] an interval that holds θ* with probability 1 − α at least. The row
//!
//! - *disagrees* if [L, U] misses [l − τ, h + τ];
//! - *agrees* if [L, U] lies inside [h − τ, l + τ]: the guard band faces inwards;
//! - else is *inconclusive*.
//!
//! Suppose that [L, U] holds θ*. If |θ* − θ| ≤ τ, then θ* lies in [θ − τ, θ + τ], a part of [l − τ, h + τ], so [L, U] does
//! not miss that: the row does not disagree. If θ* > θ + τ, then U ≥ θ* > θ + τ ≥ l + τ, so [L, U] is not inside: the row
//! does not agree; likewise below. So a wrong verdict of either kind takes an interval that misses.
//!
//! Of k rows with α = δ/k each, some interval misses with probability δ at most, however the rows depend on one another
//! (Bonferroni). Rows, tolerances and k come from the model and the settings alone, never from the outcomes. On the other
//! event, of probability 1 − δ at least, **no row of the table is wrong, in either direction**.
//!
//! This holds at every size for rows marked [`Guarantee::Exact`]: probabilities, by the interval of Clopper and Pearson;
//! quantiles, by order statistics, for any law and with ties; the law of end and time. For the last, θ* = D is the largest
//! |F*(e, t) − F(e, t)| over ends, over all of them together, and over times; by Dvoretzky, Kiefer, Wolfowitz and Massart
//! each empirical function is within d of its own, all K + 1 at once with probability 1 − α, and then the empirical distance
//! is within d of D. What it may be between the times at which the law is kept widens the interval. Rows marked
//! [`Guarantee::Approximate`] have it in the limit.
//!
//! Two kinds of row take no part of δ. The probability of all ends but some is decided by the same event as theirs: its
//! interval is the mirror image, and both hold or miss together. And where the model leaves one possibility only, one
//! occurrence of anything else disagrees; that none occurred is no proof that none can, and such a row agrees in that sense
//! alone.
//!
//! The p-value of a row is the smallest level at which it would disagree. It tests |θ* − θ| ≤ τ, not θ* = θ; a row disagrees
//! exactly if k times its p-value is at most δ.
//!
//! # References
//! C. J. Clopper & E. S. Pearson, Biometrika 26 (1934) 404, doi:10.1093/biomet/26.4.404. P. Massart, Ann. Probab. 18 (1990)
//! 1269, doi:10.1214/aop/1176990746. P. Hall, The Bootstrap and Edgeworth Expansion, Springer 1992, for least sizes. D. J.
//! Schuirmann, J. Pharmacokinet. Biopharm. 15 (1987) 657, doi:10.1007/BF01068419 (from memory), for intervals inside a
//! tolerance.

mod certain;
mod comparison;
mod covariance;
mod curves;
mod distance;
mod draft;
mod evaluate;
mod impossible;
mod law;
mod mean;
mod method;
mod planned;
mod quantile;
mod quantities;
mod sample;
mod settings;
mod settle;
mod share;
mod size;
mod study;
mod tolerance;
mod variance;
mod verdict;
mod warnings;
mod words;

pub use comparison::{AppliedTolerance, Comparison, Finding, Guarantee, NotCompared, Row, ToleranceSource};
pub use settings::{MOST_LOOKS, Settings, StudyFault};
pub use size::SizePlan;
pub use study::Study;
pub use verdict::Verdict;
