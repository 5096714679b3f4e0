//! Exact answers, each with a proven bound.
//!
//! **Purpose.** From a checked chain: the probability of each end and group, mean and variance of the time, the mean time
//! given an end, the joint law of end and time with its quantiles and survival probabilities; and on request the visits of
//! a state, costs that accumulate on the way, and first passages to sets of states.
//!
//! **Limits.** A communicating class of transient states may be as large as 2,000 states that all
//! lead to one another, or much larger when moves lead only to states near in the order of the model; larger ones are
//! refused before any work, by time or by memory (1 GB). The law is refused when it would take more than some seconds, and in
//! continuous time beyond some 150 states. This room knows nothing of the
//! sampler, so that a comparison does not test code against itself.
//!
//! ```
//! use tallystone::exact::{Exact, Request};
//! use tallystone::model::{Model, Silent};
//! let model = Model::from_toml(r#"
//!     start = "bench"
//!     absorbing = ["shipped", "scrapped"]
//!     [moves]
//!     bench = { shipped = "5/6", bench = 0.1, scrapped = "rest" }
//! "#)?;
//! let exact = Exact::solve(&model, &Request::default(), &Silent)?;
//! assert!(exact.mean_time().contains(1.0 / 0.9));
//! let shipped = model.ends_named("shipped").unwrap();
//! assert!((exact.absorption(&shipped).value - 25.0 / 27.0).abs() < 1e-15);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```
//!
//! # How the answers are found
//! States are taken class by class. Inside a class, elimination without subtraction (Grassmann, Taksar & Heyman 1985) in
//! double-double arithmetic gives one factor; between classes, sums of products do. With N = (I − Q)⁻¹, α the start and R
//! the moves into ends, a column solve gives the mean times h = N 1, and row solves give y = α N, α N², …; then
//!
//! - P(end e) = α_e + Σ_i y_i R_ie and E\[T; e\] = Σ_i (α N²)_i R_ie;
//! - Var T = Σ_i y_i Σ_j p_ij (1 + h_j − h_i)² + Σ_i α_i (h_i − E T)², a sum of squares; and Var T = 2 E\[C(T + 1, 2)\] −
//!   E T − (E T)² with E\[C(T + 1, 2)\] = Σ_i y_i h_i, which is better where the mean is beyond 1e30. The one of the smaller proven error is the answer.
//!
//! - Visits and first passages are absorption probabilities and times of the chain that also stops at the state or set
//!   (`passages.rs`); a cost is `x⁺ − x⁻`, each from a column solve, and its variance and covariance with the time are sums
//!   over steps of products of deviations like those above (`costs.rs`, `deviations.rs`).
//!
//! - In continuous time N is that of the embedded chain, h = N θ with the mean holding times θ, E\[T^j; e\]/j! takes the place
//!   of binomial moments, and Σ_i y_i θ_i² joins the variance; the law is in `continuous.rs`.
//!
//! # Why the bounds hold
//! Let u = 2⁻⁵³. Sums, products and quotients of double-doubles that are not negative lose at most 3 u², 5 u² and 15 u²
//! relatively (Joldes, Muller & Popescu 2017). A given probability, two conversions and a quotient, is within 18 u².
//!
//! *A perturbed chain has near answers.* Write I − Q through its off-diagonal moves q_ij and exits r_i alone, the diagonal
//! being what leaves. By the matrix-tree theorem det(I − Q) is the sum over the spanning forests rooted at exits of the
//! products of their weights, and each cofactor is such a sum too. These are polynomials of degree at most m for m states,
//! without a negative coefficient. If every weight changes by a factor within 1 ± η, numerator and denominator of N_ij
//! change by factors within (1 ± η)^m, so N, and with it B = N R and h = N 1, moves relatively by no more than 2 m η to
//! first order (O'Cinneide 1993; Alfa, Xue & Ye 2002).
//!
//! *Elimination perturbs a little at each step.* Removing a state from m leaves the chain censored to the others. Its
//! computed weights are those of the exact censored chain, each within η_m: the pivot is a sum of at most w numbers (3 w u²),
//! then come a quotient (15 u²), a product (5 u²) and a sum (3 u²), at most (3 w + 25) u². Summed over the steps:
//! Σ_m 2 m (3 w + 25) u² = n (n + 1)(3 w + 25) u², where w is the longest row, fill included. The given weights count once
//! more, exits being sums themselves: 2 n (18 + 3 w) u². For 2,000 states and full rows this is 3e-22.
//!
//! *Solves add what they round*: each unknown is a sum of at most w products with factors that carry 3 w + 15 themselves, one
//! quotient and what its predecessors carry, through two sweeps of n unknowns: 2 n (6 w + 20) u². Between classes another sum of products is added; errors of classes
//! that follow one another add up.
//!
//! *Deviations in the variance cancel*, so each d = 1 + h_j − h_i carries the absolute error ε (h_i + h_j) plus rounding, and
//! the sum of squares the error Σ y_i p_ij (2 |d| δ + δ²) besides the relative one of its weights. For a cost of both signs ε
//! refers to x⁺ + x⁻, and a product of two deviations has the error |d| δ' + |d'| δ + δ δ'.
//!
//! All this is first order in quantities below 1e-12; a factor 1 + 1e-10 and outward rounding to doubles cover the rest.
//! Numbers below 2⁻⁹⁰⁰ or above 2⁹⁹⁶ are refused where they occur, given probabilities included, since underflow and overflow
//! would void the relative bounds. In the sum of squares, weights below that count as error instead.
//! `tests/exact_properties.rs` holds all of it against fractions, leave probabilities of 1e-18 included.
//!
//! A second solution of small chains by dense LU, in doubles, stands beside the elimination: a contradiction that the
//! conditioning does not explain is an internal error, not an answer.
//!
//! # References
//! - W. Grassmann, M. Taksar & D. Heyman, Oper. Res. 33 (1985) 1107, doi:10.1287/opre.33.5.1107.
//! - C. O'Cinneide, Numer. Math. 65 (1993) 109, doi:10.1007/BF01385743.
//! - A. S. Alfa, J. Xue & Q. Ye, Math. Comp. 71 (2002) 217, doi:10.1090/S0025-5718-01-01325-4.
//! - M. Joldes, J.-M. Muller & V. Popescu, ACM Trans. Math. Softw. 44 (2017) 15, doi:10.1145/3121432.

mod answers;
mod bounded;
mod continuous;
mod costs;
mod dd;
mod deviations;
mod elimination;
mod envelope;
mod error;
mod holding;
mod kernel;
mod law;
mod linear;
mod passages;
mod reference;
mod shape;
mod step_law;
mod steps;
mod stopped;
mod support;

pub use answers::{Exact, Request};
pub use bounded::Bounded;
pub use error::{ExactError, LawRefusal};
pub use law::Law;
pub use shape::Shape;
