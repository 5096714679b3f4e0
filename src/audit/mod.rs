//! Outcomes that another simulator left. (Docs to come.)

mod collector;
mod outcome_file;

pub use collector::{Audited, Collector, OutcomeFault};
pub use outcome_file::{OutcomeError, OutcomeFile, read_outcomes};
