//! Reads result files.

use std::path::{Path, PathBuf};

use crate::compare::Study;
use crate::model::{Fault, Progress};

use super::Audited;

/// A result file that was read.
#[derive(Debug)]
pub struct OutcomeFile {
    /// The path as given.
    pub file: String,
    /// SHA-256 of its bytes, in hexadecimal.
    pub sha256: String,
    /// Outcomes read.
    pub rows: u64,
    /// Columns that mean nothing here.
    pub ignored_columns: Vec<String>,
    /// What they came to.
    pub audited: Audited,
}

/// Why a result file gives no outcomes.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum OutcomeError {
    /// The file could not be read.
    #[error("{}: {source}; check the path and the permissions", path.display())]
    Read {
        /// The file.
        path: PathBuf,
        /// The system's reason.
        source: std::io::Error,
    },
    /// Rows that cannot be used.
    #[error("{bad} of {rows} rows of {file} cannot be used")]
    Bad {
        /// The file.
        file: String,
        /// Rows read.
        rows: u64,
        /// Rows that cannot be used.
        bad: u64,
        /// The first few, each with line, value and remedy.
        faults: Vec<Fault>,
    },
    /// The user asked to stop.
    #[error("interrupted while reading")]
    Interrupted,
}

/// Reads outcomes from a CSV file with the columns `end` and `time`, in any order, optionally `replication`.
///
/// # Errors
/// [`OutcomeError`].
pub fn read_outcomes(path: &Path, study: &Study<'_>, progress: &dyn Progress) -> Result<OutcomeFile, OutcomeError> {
    let _ = (path, study, progress);
    todo!()
}
