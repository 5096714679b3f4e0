//! From a path, a stream or a text to a checked model.

use std::ffi::OsStr;
use std::io::Read;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use sha2::{Digest, Sha256};

use super::draft::Draft;
use super::fault::{Fault, FaultKind, ModelError};
use super::input::{Input, as_text};
use super::kind::Kind;
use super::matrix::{Names, Reading};
use super::number::Number;
use super::{InputFile, LARGEST_CORRECTION, Model, matrix_market, npy, table, toml_file};

/// How files that gzip and zip have packed begin.
const PACKED: [&[u8]; 2] = [b"\x1f\x8b", b"PK\x03\x04"];

/// What a file cannot say of itself, and how it is to be taken.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct ReadOptions {
    /// The state in which every replication starts; it replaces the start of a model file.
    pub start: Option<String>,
    /// States that are absorbing although they have no row.
    pub absorbing: Vec<String>,
    /// A file that names the states of a matrix (`.mtx`, `.npy`), one a line; they keep the numbers of the matrix otherwise.
    pub state_names: Option<PathBuf>,
    /// The table lists moves from column to row; in a list of moves, `from` and `to` change places.
    pub transpose: bool,
    /// Rows whose sum differs from 1 by more than [`LARGEST_CORRECTION`], but by no more than this, are divided by their
    /// sum, with a warning.
    pub rescale_rows: Option<Number>,
}

impl Model {
    /// Reads a model. A file that begins as one is a matrix (Matrix Market, or a NumPy array); otherwise the end of its name
    /// says what it is: `.toml` a model file, `.mtx` and `.npy` a matrix, anything else a table (CSV).
    ///
    /// # Errors
    /// [`ModelError::Read`] when a file cannot be read, [`ModelError::Option`] when an option does not fit what is read,
    /// [`ModelError::Faulty`] with every fault otherwise.
    pub fn read(path: &Path, options: &ReadOptions) -> Result<Self, ModelError> {
        let input = Input::open(path)?;
        let title = path.file_stem().and_then(OsStr::to_str).unwrap_or_default();
        let kind = Kind::of_file(path, input.head());
        Source { input, kind, title, directory: path.parent().unwrap_or(Path::new("")) }.model(options)
    }

    /// Reads a model from a stream, such as standard input, by a name for messages. Its beginning says what it is: a matrix
    /// begins as one; `[` at the beginning of the first line that is neither blank nor a comment, or an `=` in it before any
    /// comma and semicolon, makes a model file; anything else is a table. A `moves_file` is looked for in the working
    /// directory.
    ///
    /// # Errors
    /// As [`Model::read`].
    ///
    /// ```
    /// use tallystone::model::{Model, ReadOptions};
    /// let matrix = "%%MatrixMarket matrix coordinate real general\n2 2 3\n1 1 0.75\n1 2 0.25\n2 2 1\n";
    /// let options = ReadOptions { start: Some("1".to_owned()), ..ReadOptions::default() };
    /// let model = Model::read_from(matrix.as_bytes(), "matrix", &options)?;
    /// assert_eq!(model.chain().ends()[0].name, "2");
    /// # Ok::<(), tallystone::model::ModelError>(())
    /// ```
    pub fn read_from(source: impl Read, name: &str, options: &ReadOptions) -> Result<Self, ModelError> {
        let input = Input::new(source, name.to_owned());
        let kind = Kind::of_stream(input.head());
        Source { input, kind, title: "", directory: Path::new("") }.model(options)
    }

    /// Reads a model from the text of a TOML file; a `moves_file` is looked for in the working directory.
    ///
    /// # Errors
    /// [`ModelError::Faulty`] with every fault.
    pub fn from_toml(text: &str) -> Result<Self, ModelError> {
        toml_file::read(text, None, Path::new(""), &ReadOptions::default())?.0.check()
    }

    /// Reads a model from the text of a table: moves (`from,to,probability`) or a square table with names.
    ///
    /// # Errors
    /// As [`Model::read`].
    pub fn from_table(text: &str, options: &ReadOptions) -> Result<Self, ModelError> {
        let input = Input::new(text.as_bytes(), String::new());
        let mut draft = Draft::default();
        options.look()?;
        draft.read_whole(Kind::Table, input, options)?;
        draft.check()
    }
}

/// What a model is read from.
struct Source<'a> {
    input: Input<'a>,
    kind: Kind,
    title: &'a str,
    /// Where a `moves_file` is looked for.
    directory: &'a Path,
}

impl Source<'_> {
    fn model(mut self, options: &ReadOptions) -> Result<Model, ModelError> {
        options.look()?;
        let (draft, inputs) = if self.kind == Kind::Toml {
            let (bytes, file) = (self.input.whole(), self.input.name().to_owned());
            let mut inputs = vec![self.input.finish()?];
            let (mut draft, more) = toml_file::read(as_text(&bytes, &file)?, Some(&file), self.directory, options)?;
            draft.apply(options);
            inputs.extend(more);
            (draft, inputs)
        } else {
            let mut draft = Draft::new(self.title);
            draft.files.push(Arc::from(self.input.name()));
            let inputs = draft.read_whole(self.kind, self.input, options)?;
            (draft, inputs)
        };
        let mut model = draft.check()?;
        model.inputs = inputs;
        Ok(model)
    }
}

impl ReadOptions {
    /// Whether the options make sense by themselves.
    fn look(&self) -> Result<(), ModelError> {
        let Some(limit) = &self.rescale_rows else { return Ok(()) };
        if limit.to_f64() > LARGEST_CORRECTION && !limit.exceeds_one() && !limit.is_one() {
            return Ok(());
        }
        let said = format!("--rescale-rows {} is not between {LARGEST_CORRECTION} and 1", limit.to_f64());
        let remedy = "give a number such as 1e-6; smaller differences are corrected without it";
        Err(ModelError::Option { said, remedy: remedy.to_owned() })
    }

    /// Refuses the options of tables where there is none.
    pub(super) fn look_without_table(&self) -> Result<(), ModelError> {
        let given = [("--transpose", self.transpose), ("--state-names", self.state_names.is_some())];
        let Some((option, _)) = given.iter().find(|(_, is_given)| *is_given) else { return Ok(()) };
        let said = format!("{option} is for tables, and the moves of this model stand under [moves]");
        Err(ModelError::Option { said, remedy: format!("leave {option} out") })
    }
}

impl Draft {
    /// Reads a table or matrix that is a model by itself.
    fn read_whole(
        &mut self,
        kind: Kind,
        input: Input<'_>,
        options: &ReadOptions,
    ) -> Result<Vec<InputFile>, ModelError> {
        self.lone_stay_is_absorbing = true;
        self.declared.extend(options.absorbing.iter().map(|name| (name.clone(), 0)));
        let inputs = self.read_moves(kind, input, options)?;
        self.apply(options);
        Ok(inputs)
    }

    /// Reads a table or matrix of moves; gives the files that it was read from.
    pub(super) fn read_moves(
        &mut self,
        kind: Kind,
        mut input: Input<'_>,
        options: &ReadOptions,
    ) -> Result<Vec<InputFile>, ModelError> {
        let is_matrix = matches!(kind, Kind::MatrixMarket | Kind::Npy);
        let (names, more) = match &options.state_names {
            Some(_) if !is_matrix => {
                let said =
                    format!("--state-names is for matrices, and {} names its states itself", shown(input.name()));
                let remedy = "leave it out, or rename the states in the file";
                return Err(ModelError::Option { said, remedy: remedy.to_owned() });
            }
            Some(path) => Names::read(path).map(|(names, file)| (Some(names), Some(file)))?,
            None => (None, None),
        };
        let reading = Reading { names, transpose: options.transpose };
        match kind {
            _ if PACKED.iter().any(|magic| input.head().starts_with(magic)) => {
                let place = self.place(self.moves_file, 0);
                self.fault(Fault::new(FaultKind::Syntax, place, "the file is compressed", "unpack it first"));
                self.moves_unread = true;
            }
            Kind::MatrixMarket => matrix_market::read(&mut input, reading, self),
            Kind::Npy => npy::read(&mut input, reading, self),
            Kind::Toml | Kind::Table => table::read(&mut input, options.transpose, self),
        }
        Ok(std::iter::once(input.finish()?).chain(more).collect())
    }

    /// What the options say beside the file.
    fn apply(&mut self, options: &ReadOptions) {
        self.rescale_rows.clone_from(&options.rescale_rows);
        self.declared.extend(options.absorbing.iter().map(|name| (name.clone(), 0)));
        self.declare();
        if let Some(start) = &options.start {
            self.starts.clear();
            self.start(start);
        }
    }
}

/// The name of an input in a sentence.
fn shown(name: &str) -> &str {
    if name.is_empty() { "the table" } else { name }
}

/// A hash as it is shown.
pub(crate) fn hexadecimal(hash: Sha256) -> String {
    hash.finalize().iter().fold(String::with_capacity(64), |hex, byte| hex + &format!("{byte:02x}"))
}
