//! Outcomes that another simulator left. (Docs to come.)

mod collector;
mod outcome_file;
mod outcome_row;
mod outcome_table;
mod replications;
#[cfg(test)]
mod tests;

pub use collector::{Audited, Collector, OutcomeFault};
pub use outcome_file::{OutcomeError, OutcomeFile, read_outcomes};
