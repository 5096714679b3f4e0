//! Comparing a tally with the exact answers. (Docs to come.)

mod comparison;
mod study;
mod verdict;

pub use comparison::{AppliedTolerance, Comparison, Finding, Guarantee, NotCompared, Row, ToleranceSource};
pub use study::{Settings, SizePlan, Study, StudyFault};
pub use verdict::Verdict;
