//! Where results go: standard output, and files that appear whole or not at all.

use std::fs::{self, File};
use std::io::{self, BufWriter, IsTerminal, Write};
use std::path::{Path, PathBuf};

use super::arguments::{Output, When};
use super::failure::{Failure, refused};
use crate::model::Warning;
use crate::report::{Document, Layout, Refused, shown, wrapped, write_json, write_refusal, write_text};

/// A narrower page helps nobody.
const NARROWEST: usize = 40;
/// A wider one is hard to read.
const WIDEST: usize = 120;

/// Standard output as a destination of JSON.
fn is_standard_output(path: &Path) -> bool {
    path.as_os_str() == "-"
}

/// The layout of a page on standard output.
pub(super) fn layout(output: &Output) -> Layout {
    let terminal = io::stdout().is_terminal();
    let color = match output.color {
        When::Always => true,
        When::Never => false,
        When::Auto => terminal && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty()),
    };
    Layout { width: width(), color }
}

/// Columns of the terminal, 80 where there is none or COLUMNS does not say.
pub(super) fn width() -> usize {
    let said = std::env::var("COLUMNS").ok().and_then(|columns| columns.parse().ok());
    let seen = || terminal_size::terminal_size().map(|(width, _)| usize::from(width.0));
    said.or_else(seen).unwrap_or(80).clamp(NARROWEST, WIDEST)
}

/// Delivers a finished document.
pub(super) fn deliver(document: &Document, output: &Output) -> Result<(), Failure> {
    match &output.json {
        Some(path) if is_standard_output(path) => return to_standard_output(|out| write_json(document, out)),
        Some(path) => {
            let inputs: Vec<&Path> = document.inputs.iter().map(|input| Path::new(&input.file)).collect();
            write_file(path, &inputs, |out| write_json(document, out))?;
        }
        None => {}
    }
    if output.quiet {
        return Ok(());
    }
    to_standard_output(|out| write_text(document, layout(output), out))
}

/// Delivers a refusal as JSON, where JSON was asked for on standard output.
pub(super) fn deliver_refusal(reasons: &[Refused], output: Option<&Output>) -> Result<(), Failure> {
    match output.and_then(|output| output.json.as_deref()) {
        Some(path) if is_standard_output(path) && !reasons.is_empty() => {
            to_standard_output(|out| write_refusal(reasons, out))
        }
        _ => Ok(()),
    }
}

/// Writes to standard output; a reader that went away is told apart from a real failure.
pub(super) fn to_standard_output(
    write: impl FnOnce(&mut BufWriter<io::StdoutLock<'_>>) -> io::Result<()>,
) -> Result<(), Failure> {
    let mut out = BufWriter::new(io::stdout().lock());
    let written = write(&mut out).and_then(|()| out.flush());
    // What is left in the buffer cannot be written either.
    let _unwritten = out.into_parts();
    written.map_err(|error| match error.kind() {
        io::ErrorKind::BrokenPipe => Failure::ReaderGone,
        _ => Failure::io(Path::new("standard output"), &error),
    })
}

/// Writes a file that appears whole or not at all; devices and pipes are written in place.
///
/// # Errors
/// A path that is one of the inputs, or one that cannot be written.
pub(super) fn write_file(
    path: &Path,
    inputs: &[&Path],
    write: impl FnOnce(&mut BufWriter<&mut File>) -> io::Result<()>,
) -> Result<(), Failure> {
    let same = |input: &&Path| matches!((fs::canonicalize(path), fs::canonicalize(input)), (Ok(a), Ok(b)) if a == b);
    if inputs.iter().any(same) {
        let text = format!("`{}` is an input of this run and would be overwritten", path.display());
        return Err(Failure::Usage(refused("usage", text, "give another name for the result")));
    }
    written(path, write).map_err(|error| Failure::io(path, &error))
}

fn written(path: &Path, write: impl FnOnce(&mut BufWriter<&mut File>) -> io::Result<()>) -> io::Result<()> {
    if fs::metadata(path).is_ok_and(|found| !found.is_file()) {
        let mut file = File::options().write(true).open(path)?;
        let mut out = BufWriter::new(&mut file);
        return write(&mut out).and_then(|()| out.flush());
    }
    let directory = match path.parent() {
        Some(directory) if !directory.as_os_str().is_empty() => directory,
        _ => Path::new("."),
    };
    let mut builder = tempfile::Builder::new();
    // As any other new file, not private as temporary files are.
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    let mut file = builder.prefix(".tallystone-").tempfile_in(directory)?;
    let mut out = BufWriter::new(file.as_file_mut());
    write(&mut out).and_then(|()| out.flush())?;
    drop(out);
    file.persist(path).map(drop).map_err(|error| error.error)
}

/// Prints warnings on standard error.
pub(super) fn warn(warnings: &[Warning]) {
    warnings.iter().for_each(|warning| complain("warning", &shown(&warning.text)));
}

/// Prints one thing that is wrong on standard error.
pub(super) fn complain(what: &str, text: &str) {
    // Nothing can be done about a standard error that is gone.
    let _written = writeln!(io::stderr().lock(), "{}", wrapped(&format!("{what}: {text}"), width(), 2));
}

/// The path of a file that must not exist yet.
pub(super) fn new_file(directory: &Path, name: &str) -> Result<PathBuf, Failure> {
    let path = directory.join(name);
    if path.exists() {
        let text = format!("`{}` exists already", path.display());
        return Err(Failure::Usage(refused("usage", text, "name another directory, or remove the file")));
    }
    Ok(path)
}
