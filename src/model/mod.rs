//! The model: a finite Markov chain with a start, read from a file or made in code, and proven well formed.
//!
//! Files are our own TOML, CSV tables, Matrix Market matrices and NumPy arrays; see [`Model::read`] and [`ReadOptions`].
//!
//! Limits of this version: the clock counts steps (discrete time); costs and hits are not read yet. States number up to
//! 2³² − 1. Probabilities are kept exactly as written, as rationals; see [`Row`].
//!
//! ```
//! use tallystone::model::Model;
//! let model = Model::from_toml(r#"
//!     start = "bench"
//!     absorbing = ["shipped", "scrapped"]
//!     [moves]
//!     bench = { shipped = "5/6", bench = 0.1, scrapped = "rest" }
//! "#)?;
//! assert_eq!(model.chain().ends().len(), 2);
//! # Ok::<(), tallystone::model::ModelError>(())
//! ```

mod chain;
mod check;
mod check_ends;
mod classes;
mod draft;
mod fault;
mod input;
mod kind;
mod matrix;
mod matrix_market;
mod npy;
mod npy_header;
mod number;
mod progress;
mod quantity;
mod records;
mod row;
mod source;
mod table;
mod tolerance;
mod toml_file;

use serde::Serialize;

pub use chain::{Chain, End};
pub use draft::{Draft, Written};
pub use fault::{Fault, FaultKind, ModelError, Place, Warning, WarningKind, nearest};
pub(crate) use fault::{did_you_mean, listed, shortened};
pub use number::{Number, NumberFault};
pub use progress::{Progress, Silent};
pub use quantity::{Quantity, QuantityFault};
pub(crate) use records::{Records, cell, decimal_point, delimiter};
pub use row::{LARGEST_CORRECTION, Row, Weights};
pub use source::ReadOptions;
pub(crate) use source::hexadecimal;
pub use tolerance::{Tolerance, ToleranceKey, Tolerances};

/// Ends that are also reported together.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Group {
    /// Its name.
    pub name: String,
    /// Its ends, ascending, as numbers into [`Chain::ends`].
    pub ends: Vec<usize>,
}

/// A file that was read.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct InputFile {
    /// The path as given.
    pub file: String,
    /// SHA-256 of its bytes, in hexadecimal.
    pub sha256: String,
}

/// A checked model.
#[derive(Debug, Clone)]
pub struct Model {
    title: String,
    clock_unit: String,
    chain: Chain,
    fingerprint: String,
    groups: Vec<Group>,
    compare: Option<Vec<Quantity>>,
    tolerances: Tolerances,
    warnings: Vec<Warning>,
    largest_correction: f64,
    inputs: Vec<InputFile>,
}

impl Model {
    /// The title, empty if none was given.
    pub fn title(&self) -> &str {
        &self.title
    }

    /// The unit of time.
    pub fn clock_unit(&self) -> &str {
        &self.clock_unit
    }

    /// The chain.
    pub fn chain(&self) -> &Chain {
        &self.chain
    }

    /// [`Chain::fingerprint`], computed once.
    pub fn fingerprint(&self) -> &str {
        &self.fingerprint
    }

    /// Groups of ends.
    pub fn groups(&self) -> &[Group] {
        &self.groups
    }

    /// The rows that the model asks to compare; `None` means the default ones.
    pub fn compare(&self) -> Option<&[Quantity]> {
        self.compare.as_deref()
    }

    /// The tolerances that the model gives.
    pub fn tolerances(&self) -> &Tolerances {
        &self.tolerances
    }

    /// What deserves a look.
    pub fn warnings(&self) -> &[Warning] {
        &self.warnings
    }

    /// The largest difference from one among the row sums that were corrected; 0 when none was.
    pub fn largest_correction(&self) -> f64 {
        self.largest_correction
    }

    /// The files that the model was read from.
    pub fn inputs(&self) -> &[InputFile] {
        &self.inputs
    }

    /// The ends that a name stands for: one end, or those of a group.
    pub fn ends_named(&self, name: &str) -> Option<Vec<usize>> {
        let end = self.chain.ends().iter().position(|end| end.name == name);
        let group = || self.groups.iter().find(|group| group.name == name).map(|group| group.ends.clone());
        end.map(|end| vec![end]).or_else(group)
    }

    /// Checks that a quantity speaks of ends and groups of this model.
    ///
    /// # Errors
    /// The unknown name, with the nearest known one.
    pub fn resolve(&self, quantity: &Quantity) -> Result<(), QuantityFault> {
        match check_ends::unknown_end(quantity, self.chain.ends(), &self.groups) {
            Some((text, remedy)) => Err(QuantityFault { text, remedy }),
            None => Ok(()),
        }
    }
}
