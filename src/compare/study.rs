//! A comparison before it is run: rows, tolerances, sizes.

use std::sync::Arc;

use crate::exact::Exact;
use crate::model::{Quantity, Tolerances, Warning};
use crate::sampling::{Grid, Tally};

use super::{Comparison, Finding};

/// What the user asks of a comparison.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Probability, at most, that any row of the table gives a wrong verdict; between 0 and 1 exclusively.
    pub error_rate: f64,
    /// Probability that every row agrees when there is no difference, to which the plan sizes itself.
    pub power: f64,
    /// Rows instead of those of the model or the default ones.
    pub quantities: Option<Vec<Quantity>>,
    /// Tolerances that take precedence over those of the model.
    pub tolerances: Tolerances,
}

impl Default for Settings {
    fn default() -> Self {
        Self { error_rate: 0.01, power: 0.95, quantities: None, tolerances: Tolerances::default() }
    }
}

/// Why a comparison cannot be set up: the user's settings do not fit the model.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{text}; {remedy}")]
pub struct StudyFault {
    /// What is wrong, with the value.
    pub text: String,
    /// What to do about it.
    pub remedy: String,
}

/// How many replications the table needs.
#[derive(Debug, Clone, PartialEq)]
pub struct SizePlan {
    /// The smallest multiple of a block at which every row is conclusive with the power asked, if there is one.
    pub replications: Option<u64>,
    /// The row that needs most by itself.
    pub demanding: Option<Quantity>,
    /// What the table would need without that row.
    pub without: Option<u64>,
    /// Rows that no number of replications decides, each with the reason.
    pub never: Vec<(Quantity, String)>,
}

/// A comparison before it is run.
#[derive(Debug)]
pub struct Study<'a> {
    exact: &'a Exact<'a>,
}

impl<'a> Study<'a> {
    /// Lists the quantities that a check of this model compares by default or by the wish of its `compare`; the request of
    /// the exact solver follows from them.
    pub fn quantities(model: &crate::model::Model, settings: &Settings) -> Vec<Quantity> {
        let _ = (model, settings);
        todo!()
    }

    /// Sets up a comparison.
    ///
    /// # Errors
    /// Settings that do not fit the model.
    pub fn new(exact: &'a Exact<'a>, settings: &Settings) -> Result<Self, StudyFault> {
        let _ = settings;
        Ok(Self { exact })
    }

    /// The exact answers that the study compares with.
    pub fn exact(&self) -> &'a Exact<'a> {
        self.exact
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        todo!()
    }

    /// Where the tally must cut times.
    pub fn grid(&self) -> Arc<Grid> {
        todo!()
    }

    /// How many replications the table needs.
    pub fn plan(&self) -> SizePlan {
        todo!()
    }

    /// What deserves a look before the run: wide tolerances, widened ones, rows left out.
    pub fn warnings(&self) -> Vec<Warning> {
        todo!()
    }

    /// Compares a tally, whose grid must be [`Study::grid`]; `findings` are impossible outcomes that an audit saw.
    ///
    /// # Panics
    /// When the tally is over another grid or other ends.
    pub fn compare(&self, tally: &Tally, findings: Vec<Finding>) -> Comparison {
        let _ = (tally, findings);
        todo!()
    }
}
