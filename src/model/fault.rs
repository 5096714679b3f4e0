//! What can be wrong with a model or with outcomes, each fault with its place, its value and the remedy.

use std::fmt;
use std::io;
use std::path::PathBuf;
use std::sync::Arc;

use serde::Serialize;

/// Where in the input something stands.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize)]
pub struct Place {
    /// The file; `None` for a model made in code.
    pub file: Option<Arc<str>>,
    /// Line, from 1; `None` where the file as a whole is meant.
    pub line: Option<u64>,
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match (&self.file, self.line) {
            (Some(file), Some(line)) => write!(f, "{file}:{line}: "),
            (Some(file), None) => write!(f, "{file}: "),
            (None, Some(line)) => write!(f, "line {line}: "),
            (None, None) => Ok(()),
        }
    }
}

/// The kinds of fault, for programs that read them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
#[non_exhaustive]
pub enum FaultKind {
    /// The file does not follow its format.
    Syntax,
    /// A key that means nothing.
    UnknownKey,
    /// A key that a later version will read.
    Unsupported,
    /// A value of the wrong type or form.
    WrongType,
    /// A text that should be a number.
    NotANumber,
    /// Infinite or not a number.
    NonFinite,
    /// A probability below zero.
    Negative,
    /// A probability above one.
    AboveOne,
    /// Probabilities that do not sum to one.
    RowSum,
    /// More than one "rest" in a row, or nothing left for it.
    Rest,
    /// A state that is neither given moves nor declared absorbing.
    UnknownState,
    /// A name that is no end, group or quantity.
    UnknownName,
    /// A move listed twice.
    DuplicateMove,
    /// A state, class or group name used twice.
    DuplicateName,
    /// A name that is empty or holds control characters.
    BadName,
    /// A declared absorbing state that has moves.
    AbsorbingWithMoves,
    /// No start is given.
    MissingStart,
    /// The model has no moves.
    NoMoves,
    /// The start lies in a closed class, so nothing happens.
    NoEndReachable,
    /// A declared class that is not a closed class of the chain.
    NotAClosedClass,
    /// A table that is not square, or lacks a column or a cell.
    Shape,
    /// A number that should be whole.
    NotWhole,
    /// A number that is too large or written too long, or that lies outside its range.
    OutOfRange,
    /// A replication listed twice.
    DuplicateReplication,
}

/// One thing that is wrong with a model, or with a row of outcomes.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Fault {
    /// Its kind.
    pub kind: FaultKind,
    /// Where it stands.
    #[serde(flatten)]
    pub place: Place,
    /// The state or name concerned.
    pub state: Option<String>,
    /// The offending value as written.
    pub value: Option<String>,
    /// What is wrong, naming state and value.
    pub text: String,
    /// What to do about it.
    pub remedy: String,
}

impl Fault {
    /// A fault of a kind at a place; add the state and the value with [`Fault::about`] and [`Fault::valued`].
    pub fn new(kind: FaultKind, place: Place, text: impl Into<String>, remedy: impl Into<String>) -> Self {
        Self { kind, place, state: None, value: None, text: text.into(), remedy: remedy.into() }
    }

    /// Names the state concerned.
    #[must_use]
    pub fn about(mut self, state: impl Into<String>) -> Self {
        self.state = Some(state.into());
        self
    }

    /// Keeps the offending value.
    #[must_use]
    pub fn valued(mut self, value: impl Into<String>) -> Self {
        self.value = Some(value.into());
        self
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}{}; {}", self.place, self.text, self.remedy)
    }
}

/// Why there is no model.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum ModelError {
    /// A file could not be read.
    #[error("{}: {source}; check the path and the permissions", path.display())]
    Read {
        /// The file.
        path: PathBuf,
        /// The system's reason.
        source: io::Error,
    },
    /// An option that does not fit what is read.
    #[error("{said}; {remedy}")]
    Option {
        /// What is wrong, naming the option.
        said: String,
        /// What to do about it.
        remedy: String,
    },
    /// The model is faulty; every fault is listed.
    #[error("{}", shown(.0))]
    Faulty(Vec<Fault>),
}

fn shown(faults: &[Fault]) -> String {
    faults.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n")
}

impl ModelError {
    /// The faults found; empty when a file could not be read at all, or an option does not fit.
    pub fn faults(&self) -> &[Fault] {
        match self {
            Self::Faulty(faults) => faults,
            Self::Read { .. } | Self::Option { .. } => &[],
        }
    }
}

/// Something that deserves a look but does not stop the work.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Warning {
    /// Its kind.
    pub kind: WarningKind,
    /// What was seen, naming state and value, and what was done about it.
    pub text: String,
}

/// The kinds of warning, for programs that read them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
#[non_exhaustive]
pub enum WarningKind {
    /// States that the start cannot reach.
    UnreachableStates,
    /// Ends that the start cannot reach.
    UnreachableEnds,
    /// Part of the start lies in an end: those replications take no time.
    AbsorbingStart,
    /// A closed class that the model does not declare; it becomes an end.
    UndeclaredClosedClass,
    /// A row that did not sum to one exactly and was corrected.
    CorrectedRow,
    /// A row of the comparison that was left out.
    NotCompared,
    /// A tolerance as wide as the answer itself, or wider than the usual one.
    WideTolerance,
    /// A row of the comparison that no number of replications decides.
    NeverDecided,
    /// Something about the data that was audited.
    Data,
}

/// The nearest known name to a misspelt one, if any is near enough to be meant.
pub fn nearest<'a>(name: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let lower = name.to_lowercase();
    known
        .into_iter()
        .map(|candidate| (strsim::jaro_winkler(&lower, &candidate.to_lowercase()), candidate))
        .filter(|(score, _)| *score > 0.75)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, candidate)| candidate)
}

/// A remedy that suggests the nearest known name, or falls back to general advice.
pub(crate) fn did_you_mean<'a>(name: &str, known: impl IntoIterator<Item = &'a str>, otherwise: &str) -> String {
    match nearest(name, known) {
        Some(near) => format!("did you mean `{near}`?"),
        None => otherwise.to_owned(),
    }
}

/// Names listed in one message before the rest is counted.
pub(crate) const LISTED: usize = 8;
/// Characters of a value that a message shows.
const SHOWN: usize = 60;

/// The first few of several names, separated by commas, and how many more there are.
pub(crate) fn listed(names: impl ExactSizeIterator<Item = String>) -> String {
    let more = names.len().saturating_sub(LISTED);
    let shown = names.take(LISTED).collect::<Vec<_>>().join(", ");
    if more > 0 { format!("{shown} and {more} more") } else { shown }
}

/// A value as a message shows it: not longer than a line, and without line ends.
pub(crate) fn shortened(value: &str) -> String {
    let mut shown: String = value.chars().take(SHOWN).map(|c| if c.is_control() { ' ' } else { c }).collect();
    if value.chars().nth(SHOWN).is_some() {
        shown.push('…');
    }
    shown
}
