//! The finished comparison: plain data, from which reports are written.

use crate::exact::Bounded;
use crate::model::{Quantity, Tolerance};
use crate::statistics::Interval;

use super::Verdict;

/// Where a tolerance comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ToleranceSource {
    /// The default of its quantity.
    Default,
    /// A default that was widened from this value until its row needed no more than 500,000 replications.
    Widened {
        /// The default before, in the unit of the quantity.
        from: f64,
    },
    /// The user's, which is never touched.
    Given,
}

/// A tolerance in use.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AppliedTolerance {
    /// As written, absolute or relative.
    pub tolerance: Tolerance,
    /// In the unit of the quantity.
    pub value: f64,
    /// Where it comes from.
    pub source: ToleranceSource,
}

/// What stands behind the interval of a row.
#[derive(Debug, Clone, Copy, PartialEq, Eq, serde::Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Guarantee {
    /// The interval covers at its level for every sample size.
    Exact,
    /// It does so in the limit of many replications.
    Approximate,
    /// The row spends no level: nothing is random, or it is decided by the same event as another row.
    Certain,
}

/// One compared quantity.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// What is compared.
    pub quantity: Quantity,
    /// The exact answer; `None` for the law, which is no single number (its estimate is the distance D from the exact law).
    pub exact: Option<Bounded>,
    /// The estimate; `None` when the sample has none.
    pub estimate: Option<f64>,
    /// Its standard error, where it has one.
    pub standard_error: Option<f64>,
    /// The confidence interval.
    pub interval: Option<Interval>,
    /// Its confidence level, 1 − α.
    pub level: f64,
    /// The difference that does not matter.
    pub tolerance: AppliedTolerance,
    /// The method's usual name.
    pub method: &'static str,
    /// What stands behind the interval.
    pub guarantee: Guarantee,
    /// The smallest level at which the row would disagree.
    pub p_value: Option<f64>,
    /// That, for the whole table.
    pub p_adjusted: Option<f64>,
    /// What the row says.
    pub verdict: Verdict,
    /// Replications after which it would be decided with the plan's power if there is no difference; only for rows that are
    /// inconclusive.
    pub replications_needed: Option<u64>,
    /// What else a reader must know.
    pub note: Option<String>,
}

/// Something that cannot happen under the model, and did.
#[derive(Debug, Clone, PartialEq, serde::Serialize)]
pub struct Finding {
    /// The end's name.
    pub end: String,
    /// The time of the first such outcome, in steps; `None` in continuous time.
    pub time: Option<u64>,
    /// Line of the first in its file, if it has one.
    pub line: Option<u64>,
    /// How many such outcomes there were.
    pub count: u64,
    /// What was seen and why it cannot be.
    pub text: String,
}

/// A quantity that was left out.
#[derive(Debug, Clone, PartialEq)]
pub struct NotCompared {
    /// What was left out.
    pub quantity: Quantity,
    /// Its exact answer, if it is a number and known.
    pub exact: Option<Bounded>,
    /// Why.
    pub text: String,
}

/// A table of rows with its verdict.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    /// The rows, in the order of the plan.
    pub rows: Vec<Row>,
    /// Impossible outcomes.
    pub findings: Vec<Finding>,
    /// Quantities that were left out.
    pub not_compared: Vec<NotCompared>,
    /// What the table says.
    pub verdict: Verdict,
    /// Replications compared.
    pub replications: u64,
    /// The error rate of the whole table.
    pub error_rate: f64,
}
