//! Why the program stops early, and the exit status that says so.

use std::io;
use std::path::Path;

use crate::audit::OutcomeError;
use crate::compare::{StudyFault, Verdict};
use crate::exact::ExactError;
use crate::model::{Fault, ModelError};
use crate::report::{Refused, shown};
use crate::sampling::Interrupted;

/// Exit statuses.
pub(super) mod status {
    pub(crate) const WORKED: u8 = 0;
    pub(crate) const DISAGREE: u8 = 1;
    pub(crate) const USAGE: u8 = 2;
    pub(crate) const UNDECIDED: u8 = 3;
    pub(crate) const BAD_DATA: u8 = 65;
    pub(crate) const INTERNAL: u8 = 70;
    pub(crate) const IO: u8 = 74;
    pub(crate) const INTERRUPTED: u8 = 130;
    pub(crate) const TERMINATED: u8 = 143;
}

/// The exit status of a verdict.
pub(super) fn of_verdict(verdict: Verdict) -> u8 {
    match verdict {
        // Consistent is the best that a row without tolerance can be, and it has the power to see what matters.
        Verdict::Agree | Verdict::Consistent => status::WORKED,
        Verdict::Disagree => status::DISAGREE,
        Verdict::Inconclusive => status::UNDECIDED,
    }
}

/// An early end.
#[derive(Debug)]
pub(super) enum Failure {
    /// The arguments do not fit the model or one another.
    Usage(Vec<Refused>),
    /// A run that is not started, or that decides nothing.
    Undecided(Vec<Refused>),
    /// Faulty input.
    Data(Vec<Refused>),
    /// A fault of this program.
    Internal(Vec<Refused>),
    /// A file that cannot be read or written.
    Io(Vec<Refused>),
    /// The reader of standard output went away: not worth a word.
    ReaderGone,
    /// The user asked to stop.
    Interrupted(String),
}

/// One reason, without a place.
pub(super) fn refused(kind: &str, text: impl Into<String>, remedy: impl Into<String>) -> Vec<Refused> {
    let (text, remedy) = (text.into(), remedy.into());
    vec![Refused { kind: kind.to_owned(), file: None, line: None, state: None, value: None, text, remedy }]
}

impl Failure {
    /// A failure to read or write a path.
    pub(super) fn io(path: &Path, error: &io::Error) -> Self {
        let mut reasons = refused("io", format!("{error}"), "check the path and the permissions");
        reasons[0].file = Some(path.display().to_string());
        Self::Io(reasons)
    }

    /// The reasons, as far as there are any.
    pub(super) fn reasons(&self) -> &[Refused] {
        match self {
            Self::Usage(reasons)
            | Self::Undecided(reasons)
            | Self::Data(reasons)
            | Self::Internal(reasons)
            | Self::Io(reasons) => reasons,
            Self::ReaderGone | Self::Interrupted(_) => &[],
        }
    }

    /// The exit status; `terminated` says that the stop was not asked for at the keyboard.
    pub(super) fn status(&self, terminated: bool) -> u8 {
        match self {
            Self::Usage(_) => status::USAGE,
            Self::Undecided(_) => status::UNDECIDED,
            Self::Data(_) => status::BAD_DATA,
            Self::Internal(_) => status::INTERNAL,
            Self::Io(_) | Self::ReaderGone => status::IO,
            Self::Interrupted(_) if terminated => status::TERMINATED,
            Self::Interrupted(_) => status::INTERRUPTED,
        }
    }
}

/// A reason as people read it.
pub(super) fn line(reason: &Refused) -> String {
    let place = match (&reason.file, reason.line) {
        (Some(file), Some(line)) => format!("{file}:{line}: "),
        (Some(file), None) => format!("{file}: "),
        (None, Some(line)) => format!("line {line}: "),
        (None, None) => String::new(),
    };
    shown(&format!("{place}{}; {}", reason.text, reason.remedy))
}

fn of_fault(fault: &Fault) -> Refused {
    let kind = serde_json::to_value(fault.kind).ok().and_then(|kind| kind.as_str().map(str::to_owned));
    Refused {
        kind: kind.unwrap_or_default(),
        file: fault.place.file.as_deref().map(str::to_owned),
        line: fault.place.line,
        state: fault.state.clone(),
        value: fault.value.clone(),
        text: fault.text.clone(),
        remedy: fault.remedy.clone(),
    }
}

impl From<ModelError> for Failure {
    fn from(error: ModelError) -> Self {
        match &error {
            ModelError::Read { path, source } => Self::io(path, source),
            ModelError::Option { said, remedy } => Self::Usage(refused("usage", said, remedy)),
            _ => Self::Data(error.faults().iter().map(of_fault).collect()),
        }
    }
}

impl From<ExactError> for Failure {
    fn from(error: ExactError) -> Self {
        let reasons = |kind| refused(kind, error.text(), error.remedy());
        match &error {
            ExactError::Interrupted => Self::Interrupted(format!("{}; no result was written", error.text())),
            ExactError::Contradiction { .. } => Self::Internal(reasons("internal")),
            _ => Self::Data(reasons("unsolvable")),
        }
    }
}

impl From<StudyFault> for Failure {
    fn from(fault: StudyFault) -> Self {
        Self::Usage(refused("usage", fault.text, fault.remedy))
    }
}

impl From<Interrupted> for Failure {
    fn from(interrupted: Interrupted) -> Self {
        Self::Interrupted(format!("{interrupted}; no result was written"))
    }
}

impl From<OutcomeError> for Failure {
    fn from(error: OutcomeError) -> Self {
        match &error {
            OutcomeError::Read { path, source } => Self::io(path, source),
            OutcomeError::Bad { file, faults, bad, .. } => {
                let mut reasons: Vec<Refused> = faults.iter().map(of_fault).collect();
                if *bad > faults.len() as u64 {
                    let text = format!("{} more rows cannot be used", bad - faults.len() as u64);
                    let mut more =
                        refused("more", text, "correct the rows named first; the others may share their cause");
                    more[0].file = Some(file.clone());
                    reasons.append(&mut more);
                }
                Self::Data(reasons)
            }
            OutcomeError::Interrupted => Self::Interrupted(error.to_string()),
        }
    }
}
