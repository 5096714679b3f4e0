//! The sampler: seeded random streams, alias tables, the path walker, tallies.
//!
//! **Purpose.** Walks replications of a chain from the start to an end, on all threads, and keeps what a comparison needs
//! of them. The tally depends on the chain, the seed, the number of replications and [`STREAM_VERSION`] alone: the same
//! bits on any machine and any number of threads.
//!
//! **Limits.** A path may take up to 2⁶⁴ − 1 steps, or [`Ticks`](crate::model::Ticks) of continuous time. This room knows nothing of
//! the exact answers and takes from the model only its exact rows, so that a comparison does not test code against itself.
//!
//! ```
//! use std::sync::Arc;
//! use tallystone::model::{Model, Silent};
//! use tallystone::sampling::{Grid, Plan, Sampler, sample};
//! let model = Model::from_toml(r#"
//!     start = "bench"
//!     absorbing = ["shipped", "scrapped"]
//!     [moves]
//!     bench = { shipped = "5/6", bench = 0.1, scrapped = "rest" }
//! "#)?;
//! let plan = Plan { replications: 10_000, seed: 1, grid: Arc::new(Grid::logarithmic()) };
//! let tally = sample(&Sampler::new(model.chain()), &plan, &Silent)?;
//! // A path takes more than one step with probability 0.1, and 1/0.9 steps on average.
//! assert!((tally.all().mean().unwrap() - 1.0 / 0.9).abs() < 0.02);
//! assert!(tally.at_or_below(1).unwrap().abs_diff(9_000) < 200);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```

mod alias;
mod column;
mod estimate;
mod grid;
mod observed;
mod quantise;
mod run;
mod sampler;
mod streams;
mod tally;
mod tally_text;

pub use column::Column;
pub use estimate::{Estimate, estimates};
pub use grid::Grid;
pub use observed::{Observable, ObservedSampler};
pub use run::{Interrupted, OutcomeSource, Plan, sample, sample_with};
pub use sampler::{Outcome, Sampler};
pub use streams::{BLOCK, STREAM_VERSION, Streams};
pub use tally::{Tally, TallyMismatch};
