//! Outcomes that another simulator left, made ready for the comparison.
//!
//! **Purpose.** Takes outcomes, from a result file or from memory, checks each, and puts them into the tally that a
//! [`Study`](crate::compare::Study) compares with the exact answers. Three things are kept apart:
//!
//! - an outcome that says nothing certain (an unknown end, a time that is no whole number) is *refused*, with the place, the
//!   value and a remedy;
//! - an outcome that the model makes impossible is a *finding*: one is enough for the verdict "disagree". It is counted all
//!   the same;
//! - everything else is counted, and the statistics decide.
//!
//! **Limits.** Result files are CSV with a header and the columns `end` and `time`, one finished replication a row; see
//! [`read_outcomes`]. Only what is recorded can be audited: a program that goes wrong ways and arrives at the right ends
//! at the right times passes. Outcomes are taken as independent; whether the streams behind them are is not tested.
//!
//! # Example
//! A program under audit, in memory: it counts the start as a step.
//! ```
//! use tallystone::audit::Collector;
//! use tallystone::compare::{Settings, Study, Verdict};
//! use tallystone::exact::{Exact, Request};
//! use tallystone::model::{Model, Silent};
//! let model = Model::from_toml(r#"
//!     start = "intake"
//!     absorbing = ["shipped", "scrapped"]
//!     [moves]
//!     intake = { repair = 1 }
//!     repair = { shipped = 0.75, scrapped = "rest" }
//! "#)?;
//! let settings = Settings::default();
//! let exact = Exact::solve(&model, &Request::of(&model, &Study::quantities(&model, &settings)), &Silent)?;
//! let study = Study::new(&exact, &settings)?;
//!
//! let mut collector = Collector::new(&study);
//! for replication in 0..1000 {
//!     collector.add(if replication % 4 == 0 { "scrapped" } else { "shipped" }, 3, None)?;
//! }
//! assert!(collector.add("shiped", 2, None).unwrap_err().remedy.contains("shipped"));
//!
//! let audited = collector.finish();
//! assert_eq!(audited.findings.len(), 2);
//! assert!(audited.findings[0].text.contains("every path to it takes exactly 2 steps"));
//! let comparison = study.compare(&audited.tally, audited.findings);
//! assert_eq!(comparison.verdict, Verdict::Disagree);
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```

mod collector;
mod outcome_file;
mod outcome_row;
mod outcome_table;
mod replications;
#[cfg(test)]
mod tests;

pub use collector::{Audited, Collector, OutcomeFault};
pub use outcome_file::{OutcomeError, OutcomeFile, read_outcomes};
