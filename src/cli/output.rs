//! Where results go: standard output, and files that appear whole or not at all.

use std::fs::{self, File};
use std::io::{self, BufWriter, IsTerminal, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

use super::arguments::{Output, When};
use super::failure::{Failure, refused};
use crate::model::Warning;
use crate::report::{Document, Layout, Refused, shown, wrapped, write_json, write_refusal, write_text};

/// A narrower page helps nobody.
const NARROWEST: usize = 40;
/// A wider one is hard to read.
const WIDEST: usize = 120;

/// Standard output as a destination.
const STANDARD_OUTPUT: &str = "-";

pub(super) fn is_standard_output(path: &Path) -> bool {
    path.as_os_str() == STANDARD_OUTPUT
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

/// Delivers a finished document. A file that cannot be written does not cost the table as well.
pub(super) fn deliver(document: &Document, output: &Output) -> Result<(), Failure> {
    let filed = match &output.json {
        Some(path) => write(path, |mut out| write_json(document, &mut out)),
        None => Ok(()),
    };
    if output.quiet || output.json.as_deref().is_some_and(is_standard_output) {
        return filed;
    }
    let printed = print(|mut out| write_text(document, layout(output), &mut out));
    filed.and(printed)
}

/// Looks before the work at where its results will go, so that none is done in vain.
///
/// # Errors
/// A file that is one of the inputs, that is named twice, or that cannot be made.
pub(super) fn look_at_destinations(files: &[Option<&Path>], inputs: &[&Path]) -> Result<(), Failure> {
    let usage = |text: String| Failure::Usage(refused("usage", text, "give another name for the result"));
    let (printed, files): (Vec<&Path>, Vec<&Path>) =
        files.iter().flatten().copied().partition(|path| is_standard_output(path));
    if printed.len() > 1 {
        return Err(usage("standard output, `-`, is named for two results".to_owned()));
    }
    for (number, path) in files.iter().enumerate() {
        if inputs.iter().any(|input| is_same(path, input)) {
            return Err(usage(format!("`{}` is an input of this run and would be overwritten", path.display())));
        }
        if !is_special(path) && files[..number].iter().any(|earlier| is_same(path, earlier)) {
            return Err(usage(format!("`{}` is named for two results, of which one would be lost", path.display())));
        }
        if path.is_dir() {
            return Err(Failure::io(path, &io::ErrorKind::IsADirectory.into()));
        }
        if !is_special(path) {
            temporary(path).map_err(|error| Failure::io(path, &error))?;
        }
    }
    Ok(())
}

/// Whether two paths are one file, there already or not.
fn is_same(a: &Path, b: &Path) -> bool {
    let place = |path: &Path| {
        let made = || Some(fs::canonicalize(directory(path)).ok()?.join(path.file_name()?));
        fs::canonicalize(path).ok().or_else(made)
    };
    a == b || place(a).is_some_and(|place_of_a| place(b) == Some(place_of_a))
}

/// Delivers a refusal as JSON, where JSON was asked for on standard output.
pub(super) fn deliver_refusal(reasons: &[Refused], output: Option<&Output>) -> Result<(), Failure> {
    match output.and_then(|output| output.json.as_deref()) {
        Some(path) if is_standard_output(path) && !reasons.is_empty() => {
            print(|mut out| write_refusal(reasons, &mut out))
        }
        _ => Ok(()),
    }
}

/// Delivers wrong arguments as JSON, where the arguments as they stand ask for it on standard output.
pub(super) fn deliver_usage_error(text: &str) {
    let arguments: Vec<_> = std::env::args_os().collect();
    let is_asked = arguments.windows(2).any(|pair| pair[0] == "--json" && pair[1] == STANDARD_OUTPUT)
        || arguments.iter().any(|argument| argument == "--json=-");
    if is_asked {
        let text = text.lines().next().unwrap_or_default().trim_start_matches("error: ");
        let reasons = refused("usage", text, "see --help");
        // A second failure while telling of the first has nobody to tell.
        let _delivered = print(|mut out| write_refusal(&reasons, &mut out));
    }
}

/// Writes a file that appears whole or not at all; devices and pipes, standard output as `-` among them, are written in
/// place.
///
/// # Errors
/// A path that cannot be written.
pub(super) fn write(path: &Path, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), Failure> {
    if is_standard_output(path) {
        print(write)
    } else {
        written(path, write).map_err(|error| Failure::io(path, &error))
    }
}

/// Writes to standard output; a reader that went away is told apart from a real failure.
pub(super) fn print(write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), Failure> {
    buffered(io::stdout().lock(), write).map_err(|error| match error.kind() {
        io::ErrorKind::BrokenPipe => Failure::ReaderGone,
        _ => Failure::io(Path::new("standard output"), &error),
    })
}

fn written(path: &Path, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
    if is_special(path) {
        return buffered(File::options().write(true).open(path)?, write);
    }
    // A link stays, and what it leads to is replaced.
    let path = &fs::canonicalize(path).unwrap_or_else(|_| path.to_owned());
    let mut file = temporary(path)?;
    buffered(file.as_file_mut(), write)?;
    file.persist(path).map(drop).map_err(|error| error.error)
}

fn buffered(sink: impl Write, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
    let mut out = BufWriter::with_capacity(1 << 16, sink);
    let written = write(&mut out).and_then(|()| out.flush());
    // What is left in the buffer after a failure cannot be written either.
    let _unwritten = out.into_parts();
    written
}

/// A device, a pipe or a directory: nothing that a new file could replace.
fn is_special(path: &Path) -> bool {
    fs::metadata(path).is_ok_and(|found| !found.is_file())
}

/// The directory of a path.
fn directory(path: &Path) -> &Path {
    path.parent().filter(|directory| !directory.as_os_str().is_empty()).unwrap_or(Path::new("."))
}

/// A file beside a path, which it may replace; it is gone when it is dropped.
fn temporary(path: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    // As any other new file, not private as temporary files are.
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    fs::metadata(directory(path))?;
    // The name of the temporary file, which the error holds, would tell nobody anything: the kind is enough.
    builder.prefix(".tallystone-").tempfile_in(directory(path)).map_err(|error| error.kind().into())
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
