//! Rows of CSV text, as spreadsheets and programs save them, each with the line that it stands on.

use std::borrow::Cow;
use std::io::{self, Chain, Read};

use csv::{ByteRecord, Position, ReaderBuilder, Terminator};

/// The rows of a CSV text; the first one is the header.
#[derive(Debug)]
pub(crate) struct Records<R> {
    reader: csv::Reader<Chain<R, &'static [u8]>>,
}

impl<R: Read> Records<R> {
    /// Reads the rows of `source`. Lines that begin with `comment` are passed over.
    pub(crate) fn new(source: R, delimiter: u8, comment: Option<u8>) -> Self {
        // A line ends at its line feed alone, which one more at the end of the text makes true of the last line too; a
        // carriage return before it is a blank at the end of the last cell. `line` rests on this.
        let reader = ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .delimiter(delimiter)
            .comment(comment)
            .terminator(Terminator::Any(b'\n'))
            .buffer_capacity(1 << 16)
            .from_reader(source.chain(b"\n".as_slice()));
        Self { reader }
    }

    /// Reads the next row that is not blank; `false` when there is none. Cells are as written: [`cell`] takes the blanks
    /// around them away.
    ///
    /// # Errors
    /// The system's reason why the source could not be read.
    pub(crate) fn read(&mut self, row: &mut ByteRecord) -> io::Result<bool> {
        while self.reader.read_byte_record(row).map_err(io::Error::from)? {
            if row.len() > 1 || !row[0].trim_ascii().is_empty() {
                return Ok(true);
            }
        }
        Ok(false)
    }

    /// The line, from 1, on which the row that was read last begins.
    pub(crate) fn line(&self, row: &ByteRecord) -> u64 {
        // The position of the row is where the one before ended, so it lies before any blank lines and comments between
        // the two; count back from its end instead. Only a quote that is never closed lacks the line feed at the end.
        let inside = row.as_slice().iter().filter(|byte| **byte == b'\n').count() as u64;
        let earliest = row.position().map_or(1, Position::line);
        self.reader.position().line().saturating_sub(1 + inside).max(earliest)
    }

    /// The source, read as far as the rows were.
    pub(crate) fn into_inner(self) -> R {
        self.reader.into_inner().into_inner().0
    }
}

/// A cell without the blanks around it; empty when the row is shorter.
pub(crate) fn cell(row: &ByteRecord, column: usize) -> &[u8] {
    row.get(column).unwrap_or_default().trim_ascii()
}

/// Comma, semicolon or tab: whichever the first line has most of that is neither blank nor a comment.
pub(crate) fn delimiter(text: &[u8], comment: Option<u8>) -> u8 {
    let says_nothing =
        |line: &&[u8]| line.trim_ascii().is_empty() || comment.is_some() && line.first() == comment.as_ref();
    let header = text.split(|byte| *byte == b'\n').find(|line| !says_nothing(line)).unwrap_or_default();
    let count = |delimiter: u8| header.iter().filter(|byte| **byte == delimiter).count();
    // The last of equal counts wins, so a file of one column counts as separated by commas.
    [b'\t', b';', b','].into_iter().max_by_key(|delimiter| count(*delimiter)).unwrap_or(b',')
}

/// A number with a decimal point: spreadsheets that separate by semicolon or tab often write a decimal comma.
pub(crate) fn decimal_point(cell: &str, delimiter: u8) -> Cow<'_, str> {
    if delimiter != b',' && cell.matches(',').count() == 1 && !cell.contains('.') {
        cell.replace(',', ".").into()
    } else {
        cell.into()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The rows of a text with their lines, cells joined by a bar.
    fn rows(text: &str, comment: Option<u8>) -> Vec<(u64, String)> {
        let mut records = Records::new(text.as_bytes(), b',', comment);
        let mut row = ByteRecord::new();
        let mut found = Vec::new();
        while records.read(&mut row).unwrap() {
            let cells = (0..row.len()).map(|column| String::from_utf8_lossy(cell(&row, column)).into_owned());
            found.push((records.line(&row), cells.collect::<Vec<_>>().join("|")));
        }
        found
    }

    #[test]
    fn rows_know_their_lines_whatever_stands_between_them() {
        let text = "\u{feff}a,b\n\n \n# no row, \"\nc , d\n\"e\nf\",\"g\"\n,\nh,i";
        let expected = [(1, "a|b"), (5, "c|d"), (6, "e\nf|g"), (8, "|"), (9, "h|i")];
        let expected: Vec<(u64, String)> = expected.map(|(line, cells)| (line, cells.to_owned())).into();
        assert_eq!(rows(text, Some(b'#')), expected);
        assert_eq!(rows(&format!("{text}\n"), Some(b'#')), expected);
        let windows: Vec<(u64, String)> = rows(&text.replace('\n', "\r\n"), Some(b'#'));
        assert_eq!(windows.iter().map(|row| row.0).collect::<Vec<_>>(), [1, 5, 6, 8, 9]);
        assert_eq!(windows[2].1, "e\r\nf|g");
        assert_eq!(windows[4].1, "h|i");
    }

    #[test]
    fn without_a_comment_sign_nothing_is_passed_over() {
        assert_eq!(rows("a,b\n#c,d\n", None)[1], (2, "#c|d".to_owned()));
    }

    #[test]
    fn a_quote_that_is_never_closed_is_one_row_on_its_first_line() {
        let found = rows("a,b\n\"c,d\ne,f\n", None);
        assert_eq!(found.len(), 2);
        assert_eq!(found[1].0, 2);
    }

    #[test]
    fn the_first_line_that_says_something_chooses_the_delimiter() {
        for (text, comment, expected) in [
            ("a,b;c,d", None, b','),
            ("a;b\n1,5;2\n", None, b';'),
            ("a\tb\n", None, b'\t'),
            ("a\n", None, b','),
            ("", None, b','),
            ("\n# x; y; z\na,b\n", Some(b'#'), b','),
            ("# x; y; z\na,b\n", None, b';'),
        ] {
            assert_eq!(delimiter(text.as_bytes(), comment), expected, "{text:?}");
        }
    }

    #[test]
    fn a_decimal_comma_is_one_only_where_commas_do_not_separate() {
        assert_eq!(decimal_point("1,5", b';'), "1.5");
        assert_eq!(decimal_point("1,5", b','), "1,5");
        assert_eq!(decimal_point("1,234,5", b';'), "1,234,5");
        assert_eq!(decimal_point("1,234.5", b';'), "1,234.5");
    }
}
