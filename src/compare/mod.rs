//! Comparing a tally with the exact answers. (Docs to come.)

mod certain;
mod comparison;
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
pub use settings::{Settings, StudyFault};
pub use size::SizePlan;
pub use study::Study;
pub use verdict::Verdict;
