//! From a path or a text to a checked model.

use std::ffi::OsStr;
use std::path::Path;
use std::sync::Arc;

use sha2::{Digest, Sha256};

use super::draft::Draft;
use super::fault::{Fault, FaultKind, ModelError, Place};
use super::input::Input;
use super::{Model, table, toml_file};

/// What a table cannot say of itself.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct ReadOptions {
    /// The state in which every replication starts; it replaces the start of a model file.
    pub start: Option<String>,
    /// States that are absorbing although they have no row.
    pub absorbing: Vec<String>,
}

impl Model {
    /// Reads a model: TOML if the name ends in `.toml`, a table (CSV) otherwise.
    ///
    /// # Errors
    /// [`ModelError::Read`] when a file cannot be read, [`ModelError::Faulty`] with every fault otherwise.
    pub fn read(path: &Path, options: &ReadOptions) -> Result<Self, ModelError> {
        let mut input = Input::open(path)?;
        let is_toml = path.extension().and_then(OsStr::to_str).is_some_and(|end| end.eq_ignore_ascii_case("toml"));
        let (mut draft, more) = if is_toml {
            let bytes = input.whole();
            let text = std::str::from_utf8(&bytes).map_err(|error| not_text(input.name(), &bytes, error.valid_up_to()));
            toml_file::read(text?, Some(input.name()), path.parent().unwrap_or(Path::new("")))?
        } else {
            let mut draft = Draft::new(path.file_stem().and_then(OsStr::to_str).unwrap_or_default());
            draft.files.push(Arc::from(input.name()));
            draft.declare_all(options);
            table::read(&mut input, &mut draft);
            (draft, Vec::new())
        };
        let mut inputs = vec![input.finish()?];
        inputs.extend(more);
        draft.apply(options);
        let mut model = draft.check()?;
        model.inputs = inputs;
        Ok(model)
    }

    /// Reads a model from the text of a TOML file; a `moves_file` is looked for in the working directory.
    ///
    /// # Errors
    /// [`ModelError::Faulty`] with every fault.
    pub fn from_toml(text: &str) -> Result<Self, ModelError> {
        toml_file::read(text, None, Path::new(""))?.0.check()
    }

    /// Reads a model from the text of a table: moves (`from,to,probability`) or a square table with names.
    ///
    /// # Errors
    /// [`ModelError::Faulty`] with every fault.
    pub fn from_table(text: &str, options: &ReadOptions) -> Result<Self, ModelError> {
        let mut draft = Draft::default();
        draft.declare_all(options);
        table::read(&mut Input::new(text.as_bytes(), String::new()), &mut draft);
        draft.apply(options);
        draft.check()
    }
}

impl Draft {
    fn declare_all(&mut self, options: &ReadOptions) {
        self.declared.extend(options.absorbing.iter().map(|name| (name.clone(), 0)));
    }

    fn apply(&mut self, options: &ReadOptions) {
        self.declare_all(options);
        self.declare();
        if let Some(start) = &options.start {
            self.starts.clear();
            self.start(start);
        }
    }
}

/// A hash as it is shown.
pub(crate) fn hexadecimal(hash: Sha256) -> String {
    hash.finalize().iter().fold(String::with_capacity(64), |hex, byte| hex + &format!("{byte:02x}"))
}

fn not_text(file: &str, bytes: &[u8], valid: usize) -> ModelError {
    let line = bytes[..valid].iter().filter(|b| **b == b'\n').count() as u64 + 1;
    let place = Place { file: Some(Arc::from(file)), line: Some(line) };
    let remedy = "save the file as UTF-8";
    ModelError::Faulty(vec![Fault::new(FaultKind::Syntax, place, "the file is not UTF-8 text", remedy)])
}
