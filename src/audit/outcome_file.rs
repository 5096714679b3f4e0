//! Reads result files.

use std::collections::HashMap;
use std::fs::{self, File, Metadata};
use std::io::{self, Read};
use std::path::{Path, PathBuf};
use std::sync::Arc;

use csv::ByteRecord;
use sha2::{Digest, Sha256};

use crate::compare::Study;
use crate::model::{Fault, FaultKind, Place, Progress, hexadecimal};

use super::outcome_row::BadRow;
use super::outcome_table::{NoTable, Table};
use super::replications::Replications;
use super::{Audited, Collector};

/// Bad rows that are shown; the others are counted.
const SHOWN: usize = 10;
/// Rows between two looks at whether the user wants to stop.
const ROWS_A_LOOK: u64 = 4096;

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
        source: io::Error,
    },
    /// Rows that cannot be used, or no rows at all.
    #[error("{}", summary(file, *rows, *bad))]
    Bad {
        /// The file.
        file: String,
        /// Rows read; 0 when the fault lies in the header or in the file as a whole.
        rows: u64,
        /// Rows that cannot be used.
        bad: u64,
        /// The first few faults, each with line, value and remedy.
        faults: Vec<Fault>,
    },
    /// The user asked to stop.
    #[error("interrupted while reading")]
    Interrupted,
}

fn summary(file: &str, rows: u64, bad: u64) -> String {
    if rows == 0 {
        return format!("{file} gives no outcomes");
    }
    format!("{bad} of {rows} row{} of {file} cannot be used", if rows == 1 { "" } else { "s" })
}

impl OutcomeError {
    /// The faults found; empty when the file could not be read or the user asked to stop.
    pub fn faults(&self) -> &[Fault] {
        match self {
            Self::Bad { faults, .. } => faults,
            Self::Read { .. } | Self::Interrupted => &[],
        }
    }
}

/// Reads outcomes from a CSV file with the columns `end` and `time`, in any order, optionally `replication`. The path `-`
/// is standard input.
///
/// Comma, semicolon or tab separates; the first line is the header. A time is a whole number of steps (`12`, `12.0`);
/// replications, where they are given, are whole numbers, each there once, in any order. Other columns are passed over.
///
/// # Errors
/// [`OutcomeError`]. One row that cannot be used is enough: what it would have said is unknown.
///
/// # Complexity
/// Linear in the bytes of the file. Memory does not grow with it, but for one bit a replication if these are numbered
/// densely (16 bytes each if they are far apart).
pub fn read_outcomes(path: &Path, study: &Study<'_>, progress: &dyn Progress) -> Result<OutcomeFile, OutcomeError> {
    read(path, Collector::new(study), progress)
}

pub(super) fn read(
    path: &Path,
    collector: Collector<'_>,
    progress: &dyn Progress,
) -> Result<OutcomeFile, OutcomeError> {
    let named = Some(path).filter(|path| path.as_os_str() != "-");
    let size = named.and_then(|path| fs::metadata(path).ok()).filter(Metadata::is_file).map(|file| file.len());
    progress.begin("reading outcomes", "bytes", size);
    let name = named.map_or("standard input".into(), |path| path.display().to_string().into());
    let source = Source { path: named, name, is_file: size.is_some() };
    let outcomes = source.outcomes(collector, progress);
    progress.end();
    outcomes
}

/// A result file by its name.
struct Source<'a> {
    /// `None` for standard input.
    path: Option<&'a Path>,
    name: Arc<str>,
    /// Whether it can be read again, as a pipe cannot.
    is_file: bool,
}

impl Source<'_> {
    fn place(&self, line: Option<u64>) -> Place {
        Place { file: Some(Arc::clone(&self.name)), line }
    }

    fn open(&self) -> io::Result<Box<dyn Read>> {
        match self.path {
            Some(path) => Ok(Box::new(File::open(path)?)),
            None => Ok(Box::new(io::stdin())),
        }
    }

    fn unreadable(&self, source: io::Error) -> OutcomeError {
        OutcomeError::Read { path: Path::new(&*self.name).to_owned(), source }
    }

    fn bad(&self, rows: u64, bad: u64, faults: Vec<Fault>) -> OutcomeError {
        OutcomeError::Bad { file: self.name.to_string(), rows, bad, faults }
    }

    fn outcomes(&self, mut collector: Collector<'_>, progress: &dyn Progress) -> Result<OutcomeFile, OutcomeError> {
        let source = self.open().map_err(|error| self.unreadable(error))?;
        let watched = Watched { source, hash: Sha256::new(), progress };
        let Table { mut records, columns, ignored } =
            Table::open(watched, &self.place(None)).map_err(|reason| match reason {
                NoTable::Unreadable(error) => self.unreadable(error),
                NoTable::Faulty(fault) => self.bad(0, 0, vec![*fault]),
            })?;
        let (mut rows, mut bad, mut faults) = (0, 0, Vec::new());
        let mut seen = Replications::default();
        let mut row = ByteRecord::new();
        while records.read(&mut row).map_err(|error| self.unreadable(error))? {
            if rows % ROWS_A_LOOK == 0 && progress.interrupted() {
                return Err(OutcomeError::Interrupted);
            }
            rows += 1;
            let line = Some(records.line(&row));
            let usable = columns.outcome(&row, &collector).and_then(|outcome| match outcome.replication {
                Some(number) if !seen.insert(number) => Err(BadRow::Repeated(number)),
                _ => Ok(outcome),
            });
            match usable {
                Ok(outcome) => collector.count(outcome.end, outcome.time, line),
                Err(reason) => {
                    bad += 1;
                    if faults.len() < SHOWN {
                        faults.push(columns.fault(reason, &row, &collector, self.place(line)));
                    }
                }
            }
        }
        // The program at the other end of a pipe stops by the same signal, and what it wrote until then is no whole file.
        if progress.interrupted() {
            return Err(OutcomeError::Interrupted);
        }
        if rows == 0 {
            let remedy = "check that the program finished and wrote its outcomes";
            let text = "the file has a header, but no outcomes";
            return Err(self.bad(0, 0, vec![Fault::new(FaultKind::Shape, self.place(None), text, remedy)]));
        }
        if bad > 0 {
            self.name_first_lines(&mut faults);
            return Err(self.bad(rows, bad, faults));
        }
        let sha256 = hexadecimal(records.into_inner().into_inner().hash);
        let audited = collector.finish();
        Ok(OutcomeFile { file: self.name.to_string(), sha256, rows, ignored_columns: ignored, audited })
    }

    /// Names the line on which a repeated replication was there first. Lines are not kept, since few are ever asked for,
    /// so the file is read again; a pipe cannot be, and its faults stay as they are.
    fn name_first_lines(&self, faults: &mut [Fault]) {
        let repeated = |fault: &Fault| match (fault.kind, &fault.value) {
            (FaultKind::DuplicateReplication, Some(number)) => number.parse::<u64>().ok(),
            _ => None,
        };
        let mut first: HashMap<u64, Option<u64>> = faults.iter().filter_map(repeated).map(|n| (n, None)).collect();
        if first.is_empty() || !self.is_file {
            return;
        }
        let Ok(file) = self.open() else { return };
        let Ok(Table { mut records, columns, .. }) = Table::open(file, &self.place(None)) else { return };
        let mut row = ByteRecord::new();
        while first.values().any(Option::is_none) && records.read(&mut row).unwrap_or(false) {
            if let Some(line) = columns.replication(&row).and_then(|number| first.get_mut(&number)) {
                line.get_or_insert(records.line(&row));
            }
        }
        for fault in faults {
            if let Some(Some(line)) = repeated(fault).and_then(|number| first.get(&number)) {
                fault.text = format!("{} (first on line {line})", fault.text);
            }
        }
    }
}

/// Hashes what is read through it, and says how far it is.
struct Watched<'p, R> {
    source: R,
    hash: Sha256,
    progress: &'p dyn Progress,
}

impl<R: Read> Read for Watched<'_, R> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let read = self.source.read(buffer)?;
        self.hash.update(&buffer[..read]);
        self.progress.advance(read as u64);
        Ok(read)
    }
}
