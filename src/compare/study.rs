//! A comparison from its rows to its verdict.

use std::sync::Arc;

use crate::exact::Exact;
use crate::model::{Model, Quantity, Ticks, Warning};
use crate::sampling::{Grid, Observable, Tally};

use super::draft::draft;
use super::evaluate::{Terms, evaluate};
use super::planned::Planned;
use super::quantities::{candidates, select};
use super::settle::settle;
use super::size::{self, SizePlan, level};
use super::{Comparison, Finding, NotCompared, Settings, StudyFault, impossible, verdict, warnings};

/// A comparison before it is run.
#[derive(Debug)]
pub struct Study<'a> {
    exact: &'a Exact<'a>,
    rows: Vec<Planned<'a>>,
    not_compared: Vec<NotCompared>,
    warnings: Vec<Warning>,
    grid: Arc<Grid>,
    observed: Arc<[Observable]>,
    ticks: Ticks,
    terms: Terms,
}

impl<'a> Study<'a> {
    /// Lists the quantities that a check of this model compares by default or by the wish of its `compare`; the request of
    /// the exact solver follows from them. [`Study::new`] chooses among them by the exact answers.
    pub fn quantities(model: &Model, settings: &Settings) -> Vec<Quantity> {
        candidates(model, settings)
    }

    /// Sets up a comparison.
    ///
    /// # Errors
    /// Settings that do not fit the model.
    ///
    /// # Complexity
    /// A few milliseconds besides what the law costs: some fifty looks at each row for its tolerance.
    pub fn new(exact: &'a Exact<'a>, settings: &Settings) -> Result<Self, StudyFault> {
        let model = exact.model();
        settings.check(model)?;
        let selection = select(exact, settings);
        let ticks = exact.ticks();
        let mut drafted = Vec::new();
        let mut refused = Vec::new();
        for quantity in selection.rows {
            let given = settings.tolerance(model, &quantity);
            let detectable = settings.detectable.of(&quantity);
            let drafted_row = match draft(exact, quantity, given, detectable, ticks) {
                // What a file of outcomes does not say cannot be compared.
                Ok(row) if settings.outcomes_only && row.observes().is_some() => {
                    let text = "the outcomes hold end and time alone".to_owned();
                    Err(NotCompared { quantity: row.quantity, exact: row.exact, text })
                }
                result => result,
            };
            match drafted_row {
                Ok(row) => drafted.push(row),
                Err(not_compared) => refused.push(not_compared),
            }
        }
        let (rows, too_much) = settle(drafted, settings.spent(), settings.power);
        refused.extend(too_much);
        let mut warnings = warnings::left_out(&refused);
        warnings.extend(warnings::unlisted(&selection.left_out));
        refused.extend(selection.left_out);
        warnings.extend(warnings::wide(&rows, settings.power));
        warnings.extend(warnings::unused(model, settings, &rows, &refused));
        let grid = Arc::new(Grid::new(rows.iter().flat_map(Planned::cuts).collect()));
        let mut observed: Vec<Observable> = rows.iter().filter_map(Planned::observes).collect();
        observed.sort_unstable();
        observed.dedup();
        let alpha = level(&rows, settings.spent());
        warnings.extend(warnings::never(&rows, alpha, settings.power));
        let terms = Terms { error_rate: settings.spent(), power: settings.power, alpha };
        Ok(Self { exact, rows, not_compared: refused, warnings, grid, observed: observed.into(), ticks, terms })
    }

    /// The exact answers that the study compares with.
    pub fn exact(&self) -> &'a Exact<'a> {
        self.exact
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.rows.len()
    }

    /// Where the tally must cut times.
    pub fn grid(&self) -> Arc<Grid> {
        Arc::clone(&self.grid)
    }

    /// What the tally must record besides end and time.
    pub fn observed(&self) -> Arc<[Observable]> {
        Arc::clone(&self.observed)
    }

    /// The unit in which the tally must count times.
    pub fn ticks(&self) -> Ticks {
        self.ticks
    }

    /// How many replications the table needs.
    pub fn plan(&self) -> SizePlan {
        size::plan(&self.rows, self.terms.error_rate, self.terms.power)
    }

    /// What deserves a look before the run: wide tolerances, widened ones, rows left out, rows that are never decided.
    pub fn warnings(&self) -> Vec<Warning> {
        self.warnings.clone()
    }

    /// Compares a tally, whose grid must be [`Study::grid`]; `findings` are impossible outcomes that an audit saw.
    /// Impossible outcomes that the tally shows by itself join them.
    ///
    /// # Panics
    /// When the tally is over another grid or other ends, counts time in other ticks, or lacks what [`Study::observed`] asks for.
    pub fn compare(&self, tally: &Tally, mut findings: Vec<Finding>) -> Comparison {
        assert_eq!(
            tally.ends(),
            self.exact.model().chain().ends().len(),
            "the tally is over other ends than the model"
        );
        assert!(tally.grid() == &*self.grid, "the tally cuts times elsewhere than the study asks for");
        assert!(tally.ticks() == self.ticks, "the tally counts time in another unit than the study asks for");
        findings.extend(impossible::findings(self.exact, tally, &findings));
        let rows: Vec<_> = (0..self.rows.len()).map(|at| evaluate(&self.rows, at, tally, self.terms)).collect();
        let verdict = verdict::of_table(&rows, &findings);
        Comparison {
            rows,
            findings,
            not_compared: self.not_compared.clone(),
            verdict,
            replications: tally.replications(),
            error_rate: self.terms.error_rate,
        }
    }
}
