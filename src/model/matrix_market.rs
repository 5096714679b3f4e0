//! The reader of sparse matrices in the Matrix Market exchange format: a first line that says what follows, comments, the
//! size, and one entry a line.
//!
//! # Reference
//! Boisvert, Pozo & Remington, *The Matrix Market Exchange Formats: Initial Design*, NISTIR 5935 (1996),
//! doi:10.6028/NIST.IR.5935.

use std::io::{BufRead, BufReader};

use super::Clock;
use super::draft::{BadValue, Draft, probability_or_rate};
use super::fault::{Fault, FaultKind, shortened};
use super::input::Input;
use super::kind::without_mark;
use super::matrix::{Matrix, Reading};
use super::number::{Number, NumberFault};

/// How the first line begins.
pub(super) const BANNER: &str = "%%MatrixMarket";
const BEGIN_WITH: &str = "begin with %%MatrixMarket matrix coordinate real general";
const HOW_TO_WRITE: &str = "write a decimal such as 0.25";
const ENTRY: &str = "write row, column and value";

/// Reads a matrix into the draft.
pub(super) fn read(input: &mut Input<'_>, reading: Reading, draft: &mut Draft) {
    let faults = draft.faults.len();
    let mut lines = Lines { source: BufReader::with_capacity(1 << 16, input), line: Vec::new(), number: 0 };
    let matrix = entries(&mut lines, draft);
    // What is known of the entries is told too, but nothing of the rows that they make.
    draft.moves_unread = draft.faults.len() > faults;
    let Some((matrix, size)) = matrix else { return };
    matrix.fill(size.states, 1, reading, draft);
}

/// Lines as bytes, since comments may be written in any code.
struct Lines<R> {
    source: R,
    line: Vec<u8>,
    number: u64,
}

impl<R: BufRead> Lines<R> {
    /// Reads the next line; `false` at the end.
    fn next(&mut self) -> bool {
        self.line.clear();
        self.number += 1;
        // An input always reads; see there.
        self.source.read_until(b'\n', &mut self.line).is_ok_and(|length| length > 0)
    }

    /// Reads the next line that is neither blank nor a comment.
    fn next_that_says_something(&mut self) -> bool {
        while self.next() {
            if self.line.trim_ascii().first().is_some_and(|first| *first != b'%') {
                return true;
            }
        }
        false
    }

    fn words(&self) -> impl Iterator<Item = &[u8]> {
        self.line.split(u8::is_ascii_whitespace).filter(|word| !word.is_empty())
    }

    /// A fault of the line that was read last.
    fn fault(&self, draft: &Draft, kind: FaultKind, said: impl Into<String>, remedy: &str) -> Fault {
        let place = draft.place(draft.moves_file, self.number);
        Fault::new(kind, place, said, remedy).valued(shown(self.line.trim_ascii()))
    }
}

fn shown(bytes: &[u8]) -> String {
    shortened(&String::from_utf8_lossy(bytes))
}

struct Size {
    states: u32,
    entries: u64,
}

fn entries<R: BufRead>(lines: &mut Lines<R>, draft: &mut Draft) -> Option<(Matrix, Size)> {
    let is_integer = banner(lines, draft)?;
    let size = size(lines, draft)?;
    let mut matrix = Matrix::default();
    let mut count = 0;
    while lines.next_that_says_something() {
        count += 1;
        match entry(lines, size.states, draft) {
            Ok((cell, text)) => matrix.push(cell, value(text, is_integer, draft.clock), || shown(text), lines.number),
            Err(fault) => draft.fault(*fault),
        }
    }
    if count != size.entries {
        let said = format!("the file announces {} entries and has {count}", size.entries);
        let remedy = "check that it was written to its end, or correct the count in the size line";
        let fault = Fault::new(FaultKind::Shape, draft.place(draft.moves_file, 0), said, remedy);
        draft.fault(fault.valued(count.to_string()));
    }
    Some((matrix, size))
}

/// Reads the first line: whether numbers are integers.
fn banner<R: BufRead>(lines: &mut Lines<R>, draft: &mut Draft) -> Option<bool> {
    let faults = draft.faults.len();
    if !lines.next() || !without_mark(&lines.line).starts_with(BANNER.as_bytes()) {
        let said = "the file does not begin as a Matrix Market file does";
        draft.fault(lines.fault(draft, FaultKind::Syntax, said, BEGIN_WITH));
        return None;
    }
    let words: Vec<String> = lines.words().skip(1).map(|word| String::from_utf8_lossy(word).to_lowercase()).collect();
    let [object, form, field, symmetry] = words.as_slice() else {
        let said = format!("the first line has {} words behind {BANNER}, not four", words.len());
        draft.fault(lines.fault(draft, FaultKind::Syntax, said, BEGIN_WITH));
        return None;
    };
    for (word, known, others) in [
        (object, &["matrix"][..], &[("vector", BEGIN_WITH)][..]),
        (form, &["coordinate"], &[("array", "write it in coordinate form, a line for each entry that is not zero")]),
        (
            field,
            &["real", "integer"],
            &[
                ("double", "write real, which means the same"),
                ("complex", "probabilities are real: write real, and one value an entry"),
                ("pattern", "a pattern has no probabilities: write real, and a value for every entry"),
            ],
        ),
        (
            symmetry,
            &["general"],
            &[
                ("symmetric", "write general, and every entry of both triangles"),
                ("skew-symmetric", "probabilities are not negative: write general, and every entry"),
                ("hermitian", "write general, and every entry of both triangles"),
            ],
        ),
    ] {
        if known.contains(&word.as_str()) {
            continue;
        }
        let fault = match others.iter().find(|(other, _)| other == word) {
            Some((_, remedy)) => {
                lines.fault(draft, FaultKind::Unsupported, format!("a matrix that is `{word}` is not read"), remedy)
            }
            None => {
                let said = format!("`{}` in the first line means nothing", shortened(word));
                lines.fault(draft, FaultKind::Syntax, said, BEGIN_WITH)
            }
        };
        draft.fault(fault.valued(shortened(word)));
    }
    (draft.faults.len() == faults).then(|| field == "integer")
}

/// Reads the size line.
fn size<R: BufRead>(lines: &mut Lines<R>, draft: &mut Draft) -> Option<Size> {
    if !lines.next_that_says_something() {
        let place = draft.place(draft.moves_file, 0);
        let remedy = "write rows, columns and the number of entries below the comments";
        draft.fault(Fault::new(FaultKind::Shape, place, "the file has no size line", remedy));
        return None;
    }
    let numbers: Vec<Option<u64>> = lines.words().map(whole).collect();
    let fault = match numbers.as_slice() {
        [Some(rows), Some(columns), Some(entries)] => {
            if rows != columns {
                let said = format!("the matrix has {rows} rows and {columns} columns");
                lines.fault(draft, FaultKind::Shape, said, "give every state a row and a column")
            } else if let Some(states) = u32::try_from(*rows).ok().filter(|states| *states < u32::MAX) {
                return Some(Size { states, entries: *entries });
            } else {
                let said = format!("the matrix has {rows} rows, more than {}", u32::MAX - 1);
                lines.fault(draft, FaultKind::OutOfRange, said, "leave out states that cannot be reached")
            }
        }
        _ => {
            let said = "the size line is not three whole numbers";
            lines.fault(draft, FaultKind::Shape, said, "write rows, columns and the number of entries")
        }
    };
    draft.fault(fault);
    None
}

/// Reads an entry: row and column from 0, and the text of its value.
fn entry<'l, R: BufRead>(lines: &'l Lines<R>, states: u32, draft: &Draft) -> Result<([u32; 2], &'l [u8]), Box<Fault>> {
    let mut words = lines.words();
    let (Some(row), Some(column), Some(value), None) = (words.next(), words.next(), words.next(), words.next()) else {
        let said = format!("the entry has {} words, not three", lines.words().count());
        return Err(Box::new(lines.fault(draft, FaultKind::Shape, said, ENTRY)));
    };
    let place = |word: &[u8], what: &str| match whole(word) {
        Some(number) if (1..=u64::from(states)).contains(&number) => Ok(number as u32 - 1),
        Some(number) => {
            let said = format!("the {what} {number} is not among 1 to {states}");
            let remedy = "number rows and columns from 1, or correct the size line";
            Err(Box::new(lines.fault(draft, FaultKind::OutOfRange, said, remedy).valued(number.to_string())))
        }
        None => {
            let said = format!("the {what} `{}` is no whole number", shown(word));
            Err(Box::new(lines.fault(draft, FaultKind::NotWhole, said, ENTRY).valued(shown(word))))
        }
    };
    Ok(([place(row, "row")?, place(column, "column")?], value))
}

/// A whole number of digits alone.
fn whole(word: &[u8]) -> Option<u64> {
    word.iter().try_fold(0u64, |number, byte| {
        let digit = byte.is_ascii_digit().then(|| u64::from(byte - b'0'))?;
        number.checked_mul(10)?.checked_add(digit)
    })
}

/// The value of an entry. The format knows neither fractions nor blanks within a number.
fn value(text: &[u8], is_integer: bool, clock: Clock) -> Result<Number, BadValue> {
    // Nearly every value; what is left is looked at more closely.
    if !is_integer && let Some(number) = Number::plain(text).filter(|number| !number.exceeds_one()) {
        return Ok(number);
    }
    let bad = |kind, reason: &str, remedy| Err(BadValue { kind, reason: reason.to_owned(), remedy });
    let Some(text) = std::str::from_utf8(text).ok().filter(|text| !text.contains(['/', '_'])) else {
        return bad(FaultKind::NotANumber, &NumberFault::NotANumber.to_string(), HOW_TO_WRITE);
    };
    match probability_or_rate(text, clock, HOW_TO_WRITE) {
        Ok(_) if is_integer && !text.trim_start_matches('+').bytes().all(|byte| byte.is_ascii_digit()) => {
            bad(FaultKind::NotWhole, "is not whole, as the first line says", "write real in the first line")
        }
        read => read,
    }
}
