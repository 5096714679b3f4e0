//! A model as somebody wrote it, before anything is checked. Every reader fills one; [`Draft::check`] is the only way
//! from here to a [`Model`](super::Model).

use std::collections::HashMap;
use std::sync::Arc;

use super::fault::{Fault, FaultKind, Place};
use super::number::{Number, NumberFault};
use super::quantity::Quantity;
use super::tolerance::{Tolerance, ToleranceKey};

/// A probability as written.
#[derive(Debug, Clone, PartialEq)]
pub enum Written {
    /// A number.
    Number(Number),
    /// What is left to one.
    Rest,
}

/// One move as written; states by their number in the draft.
#[derive(Debug, Clone)]
pub(super) struct DraftMove {
    pub(super) from: u32,
    pub(super) to: u32,
    pub(super) value: Written,
    pub(super) line: u64,
}

/// What is known of a state before the check.
#[derive(Debug, Clone)]
pub(super) struct DraftState {
    pub(super) name: String,
    /// Line of the first mention; 0 when made in code.
    pub(super) line: u64,
    /// The file of the first mention, as an index into the draft's files.
    pub(super) file: usize,
    /// Line of its row of moves, if it has one.
    pub(super) row: Option<u64>,
    /// Line of its declaration as absorbing, if it has one.
    pub(super) absorbing: Option<u64>,
}

/// A named list of states or ends: a class or a group.
#[derive(Debug, Clone)]
pub(super) struct NamedList {
    pub(super) name: String,
    pub(super) members: Vec<String>,
    pub(super) line: u64,
}

/// A model as written, built by a reader or in code.
///
/// ```
/// use tallystone::model::Draft;
/// let mut draft = Draft::new("coin until heads");
/// draft.start("tossing");
/// draft.absorbing("heads");
/// draft.moves("tossing", "heads", "1/2");
/// draft.moves("tossing", "tossing", "rest");
/// let model = draft.check()?;
/// assert_eq!(model.chain().states(), 2);
/// # Ok::<(), tallystone::model::ModelError>(())
/// ```
#[derive(Debug, Clone, Default)]
pub struct Draft {
    pub(super) title: String,
    pub(super) clock_unit: Option<String>,
    pub(super) files: Vec<Arc<str>>,
    pub(super) states: Vec<DraftState>,
    index: HashMap<String, u32>,
    pub(super) starts: Vec<(u32, Written, u64)>,
    pub(super) moves: Vec<DraftMove>,
    /// The file that the moves stand in.
    pub(super) moves_file: usize,
    /// A row with only a stay of one is an end without a word, as tables have no other way to say it.
    pub(super) lone_stay_is_absorbing: bool,
    pub(super) classes: Vec<NamedList>,
    pub(super) groups: Vec<NamedList>,
    pub(super) compare: Option<Vec<(Quantity, u64)>>,
    pub(super) tolerances: Vec<(ToleranceKey, Tolerance, u64)>,
    pub(super) faults: Vec<Fault>,
}

impl Draft {
    /// An empty draft.
    pub fn new(title: impl Into<String>) -> Self {
        Self { title: title.into(), ..Self::default() }
    }

    /// The unit printed beside every time; `step` where none is given.
    pub fn clock_unit(&mut self, unit: impl Into<String>) {
        self.clock_unit = Some(unit.into());
    }

    /// Starts every replication in one state.
    pub fn start(&mut self, state: &str) {
        self.start_with(state, "1");
    }

    /// Starts a share of the replications in a state; shares are numbers as in a model file, or `rest`.
    pub fn start_with(&mut self, state: &str, share: &str) {
        let number = self.state(state, 0, 0);
        if let Some(share) = self.written(share, state, Place::default()) {
            self.starts.push((number, share, 0));
        }
    }

    /// Declares a state absorbing.
    pub fn absorbing(&mut self, state: &str) {
        let number = self.state(state, 0, 0);
        self.states[number as usize].absorbing = Some(0);
    }

    /// Adds a move; its probability is a number as in a model file, or `rest`.
    pub fn moves(&mut self, from: &str, to: &str, probability: &str) {
        let (from_number, to_number) = (self.state(from, 0, 0), self.state(to, 0, 0));
        self.states[from_number as usize].row = Some(0);
        if let Some(value) = self.written(probability, from, Place::default()) {
            self.moves.push(DraftMove { from: from_number, to: to_number, value, line: 0 });
        }
    }

    /// Reports several ends together under a name.
    pub fn group(&mut self, name: &str, ends: &[&str]) {
        let members = ends.iter().map(|end| (*end).to_owned()).collect();
        self.groups.push(NamedList { name: name.to_owned(), members, line: 0 });
    }

    /// Names a closed class of several states.
    pub fn class(&mut self, name: &str, states: &[&str]) {
        let members = states.iter().map(|state| (*state).to_owned()).collect();
        self.classes.push(NamedList { name: name.to_owned(), members, line: 0 });
    }

    /// Sets a tolerance.
    pub fn tolerance(&mut self, key: ToleranceKey, value: Tolerance) {
        self.tolerances.push((key, value, 0));
    }

    /// Chooses the rows of the comparison instead of the default ones.
    pub fn compare(&mut self, quantities: impl IntoIterator<Item = Quantity>) {
        self.compare = Some(quantities.into_iter().map(|quantity| (quantity, 0)).collect());
    }

    /// The number of a state, given at its first mention.
    pub(super) fn state(&mut self, name: &str, file: usize, line: u64) -> u32 {
        if let Some(number) = self.index.get(name) {
            return *number;
        }
        let number = self.states.len() as u32;
        self.index.insert(name.to_owned(), number);
        self.states.push(DraftState { name: name.to_owned(), line, file, row: None, absorbing: None });
        number
    }

    pub(super) fn known_state(&self, name: &str) -> Option<u32> {
        self.index.get(name).copied()
    }

    pub(super) fn place(&self, file: usize, line: u64) -> Place {
        Place { file: self.files.get(file).cloned(), line: (line > 0).then_some(line) }
    }

    pub(super) fn fault(&mut self, fault: Fault) {
        self.faults.push(fault);
    }

    /// Reads a probability; what is wrong with it becomes a fault.
    pub(super) fn written(&mut self, text: &str, state: &str, place: Place) -> Option<Written> {
        if text.trim() == "rest" {
            return Some(Written::Rest);
        }
        match Number::parse(text) {
            Ok(number) => self.in_range(number, text, state, place).map(Written::Number),
            Err(reason) => {
                let (kind, remedy) = match reason {
                    NumberFault::NotFinite => (FaultKind::NonFinite, "give a probability between 0 and 1"),
                    _ => (
                        FaultKind::NotANumber,
                        "write a decimal such as 0.25, a fraction such as \"5/12\", or \"rest\"",
                    ),
                };
                let text = text.trim();
                let fault = Fault::new(kind, place, format!("`{text}` among the moves of `{state}` {reason}"), remedy);
                self.fault(fault.about(state).valued(text));
                None
            }
        }
    }

    fn in_range(&mut self, number: Number, text: &str, state: &str, place: Place) -> Option<Number> {
        let (kind, word) = if number.is_negative() {
            (FaultKind::Negative, "negative")
        } else if number.exceeds_one() {
            (FaultKind::AboveOne, "above 1")
        } else {
            return Some(number);
        };
        let text = text.trim();
        let said = format!("the probability {text} among the moves of `{state}` is {word}");
        let remedy = "probabilities lie between 0 and 1; correct it";
        self.fault(Fault::new(kind, place, said, remedy).about(state).valued(text));
        None
    }
}
