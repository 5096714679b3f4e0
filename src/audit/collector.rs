//! Collects outcomes one by one, in whatever order they come.

use crate::compare::{Finding, Study};
use crate::sampling::Tally;

/// Why one outcome cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{text}; {remedy}")]
pub struct OutcomeFault {
    /// What is wrong, with the value.
    pub text: String,
    /// What to do about it.
    pub remedy: String,
}

/// Outcomes on the way into a tally.
#[derive(Debug)]
pub struct Collector<'a> {
    study: &'a Study<'a>,
}

/// What the outcomes came to.
#[derive(Debug)]
pub struct Audited {
    /// Their tally, over the study's grid.
    pub tally: Tally,
    /// Outcomes that the model makes impossible.
    pub findings: Vec<Finding>,
}

impl<'a> Collector<'a> {
    /// Collects for a study.
    pub fn new(study: &'a Study<'a>) -> Self {
        Self { study }
    }

    /// Adds an outcome by the name of its end; `line` is its place in a file, if it comes from one.
    ///
    /// # Errors
    /// An end that the model does not have, with the nearest known name.
    pub fn add(&mut self, end: &str, time: u64, line: Option<u64>) -> Result<(), OutcomeFault> {
        let _ = (end, time, line, &self.study);
        todo!()
    }

    /// The tally and the findings.
    pub fn finish(self) -> Audited {
        todo!()
    }
}
