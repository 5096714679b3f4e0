//! The model: a finite Markov chain with a start, read from a file or made in code, and proven well formed.
//!
//! Files are our own TOML, CSV tables, Matrix Market matrices and NumPy arrays; see [`Model::read`] and [`ReadOptions`].
//! The clock counts steps (discrete time, moves have probabilities) or runs in rates (continuous time). States number up to
//! 2³² − 1. Probabilities and rates are kept exactly as written, as rationals; see [`Row`].
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
mod check_observed;
mod classes;
mod clock;
mod draft;
mod fault;
mod input;
mod kind;
mod matrix;
mod matrix_market;
mod npy;
mod npy_header;
mod number;
mod observed;
mod progress;
mod quantity;
mod records;
mod row;
mod source;
mod table;
mod ticks;
mod tolerance;
mod toml_file;
mod toml_observed;

use std::collections::HashMap;

use serde::Serialize;

pub use chain::{Chain, End};
pub use clock::Clock;
pub use draft::{Draft, Written};
pub use fault::{Fault, FaultKind, ModelError, Place, Warning, WarningKind, nearest};
pub(crate) use fault::{did_you_mean, listed, shortened};
pub use number::{Number, NumberFault};
pub use observed::{Cost, Hit};
pub use progress::{Progress, Silent};
pub use quantity::{Quantity, QuantityFault};
pub(crate) use records::{Records, cell, decimal_point, delimiter};
pub use row::{LARGEST_CORRECTION, Row, Weights};
pub use source::ReadOptions;
pub(crate) use source::hexadecimal;
pub use ticks::Ticks;
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
    /// Ends by the names of ends and groups.
    ends_by_name: HashMap<String, Vec<usize>>,
    costs: Vec<Cost>,
    hits: Vec<Hit>,
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

    /// What time means.
    pub fn clock(&self) -> Clock {
        self.chain.clock
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

    /// Costs that accumulate on the way.
    pub fn costs(&self) -> &[Cost] {
        &self.costs
    }

    /// Sets of states whose first passage matters.
    pub fn hits(&self) -> &[Hit] {
        &self.hits
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

    /// The number of a named cost in [`Model::costs`].
    pub fn cost_named(&self, name: &str) -> Option<usize> {
        self.costs.iter().position(|cost| cost.name == name)
    }

    /// The number of a named hit in [`Model::hits`].
    pub fn hit_named(&self, name: &str) -> Option<usize> {
        self.hits.iter().position(|hit| hit.name == name)
    }

    /// The number of a named transient state in the chain.
    pub fn transient_named(&self, name: &str) -> Option<usize> {
        self.chain.state(name).filter(|state| self.chain.end_of(*state).is_none())
    }

    /// The ends that a name stands for: one end, or those of a group.
    pub fn ends_named(&self, name: &str) -> Option<Vec<usize>> {
        self.ends_by_name.get(name).cloned()
    }

    /// Checks that a quantity speaks of ends, groups, states, costs and hits of this model.
    ///
    /// # Errors
    /// The unknown name, with the nearest known one.
    pub fn resolve(&self, quantity: &Quantity) -> Result<(), QuantityFault> {
        let states = check_ends::States {
            number: &|name| self.chain.state(name),
            names: &|| (0..self.chain.states()).map(|state| self.chain.name(state)).collect(),
            end_of: &self.chain.end_of,
            clock: self.clock(),
        };
        let unknown =
            check_ends::unknown_name(quantity, self.chain.ends(), &self.groups, &self.costs, &self.hits, &states);
        match unknown {
            Some((text, remedy)) => Err(QuantityFault { text, remedy }),
            None => Ok(()),
        }
    }
}
