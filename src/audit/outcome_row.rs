//! One row of a result file: its cells, what they mean, and what can be wrong with them.

use csv::ByteRecord;

use crate::model::{Fault, FaultKind, Number, NumberFault, Place, Ticks, cell, decimal_point, shortened};

use super::Collector;

/// Where the columns stand.
#[derive(Debug, Clone, Copy)]
pub(super) struct Columns {
    pub(super) end: usize,
    pub(super) time: usize,
    pub(super) replication: Option<usize>,
    /// How many there are, the ignored ones too.
    pub(super) count: usize,
    pub(super) delimiter: u8,
}

/// What a row says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Outcome {
    pub(super) end: usize,
    pub(super) time: u64,
    pub(super) replication: Option<u64>,
}

/// Why a row cannot be used. Made into words only for the few that are shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum BadRow {
    /// Not as many cells as the header has.
    Cells,
    /// A quotation mark that is closed lines later, if at all.
    LineBreak,
    /// An end that the model does not have.
    End,
    /// A time that is no number of steps.
    Time(NotWhole),
    /// A replication that is no number.
    Replication(NotWhole),
    /// A replication that was there before.
    Repeated(u64),
}

/// Why a cell is no whole number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum NotWhole {
    Empty,
    NotText,
    NotANumber,
    NotFinite,
    Negative,
    Fraction,
    OutOfRange,
}

impl Columns {
    /// Reads a row.
    pub(super) fn outcome(&self, row: &ByteRecord, collector: &Collector<'_>) -> Result<Outcome, BadRow> {
        let is_blank = |column: usize| cell(row, column).is_empty();
        // A comma more at the end of a line says nothing.
        if row.len() < self.count || !(self.count..row.len()).all(is_blank) {
            return Err(BadRow::Cells);
        }
        if row.as_slice().contains(&b'\n') {
            return Err(BadRow::LineBreak);
        }
        let end = collector.end(cell(row, self.end)).ok_or(BadRow::End)?;
        let time = match collector.ticks() {
            Ticks::STEPS => self.whole(row, self.time),
            ticks => self.in_ticks(row, self.time, ticks),
        };
        let time = time.map_err(BadRow::Time)?;
        let replication = self.replication.map(|column| self.whole(row, column).map_err(BadRow::Replication));
        Ok(Outcome { end, time, replication: replication.transpose()? })
    }

    /// The replication of a row, if it has one that can be read.
    pub(super) fn replication(&self, row: &ByteRecord) -> Option<u64> {
        self.whole(row, self.replication?).ok()
    }

    /// A time in clock units, as the nearest number of ticks.
    fn in_ticks(&self, row: &ByteRecord, column: usize, ticks: Ticks) -> Result<u64, NotWhole> {
        let number = self.number(row, column)?;
        if number.is_negative() {
            return Err(NotWhole::Negative);
        }
        ticks.count(&number.to_ratio()).ok_or(NotWhole::OutOfRange)
    }

    /// A cell that holds a number.
    fn number(&self, row: &ByteRecord, column: usize) -> Result<Number, NotWhole> {
        let cell = cell(row, column);
        if cell.is_empty() {
            return Err(NotWhole::Empty);
        }
        let text = std::str::from_utf8(cell).map_err(|_| NotWhole::NotText)?;
        Number::parse(&decimal_point(text, self.delimiter)).map_err(|reason| match reason {
            NumberFault::NotFinite => NotWhole::NotFinite,
            NumberFault::TooExtreme => NotWhole::OutOfRange,
            _ => NotWhole::NotANumber,
        })
    }

    /// A whole number, as programs write it: `12`, `12.0`, `1.2e1`.
    fn whole(&self, row: &ByteRecord, column: usize) -> Result<u64, NotWhole> {
        let cell = cell(row, column);
        // Nearly every cell.
        if cell.first().is_some_and(u8::is_ascii_digit)
            && let Some(number) = std::str::from_utf8(cell).ok().and_then(|text| text.parse().ok())
        {
            return Ok(number);
        }
        let number = self.number(row, column)?;
        match number {
            Number::Decimal { mantissa, scale: 0 } => Ok(mantissa),
            _ if number.is_negative() => Err(NotWhole::Negative),
            _ if number.is_whole() => Err(NotWhole::OutOfRange),
            _ => Err(NotWhole::Fraction),
        }
    }

    /// A bad row in words.
    pub(super) fn fault(&self, bad: BadRow, row: &ByteRecord, collector: &Collector<'_>, place: Place) -> Fault {
        let value = |column: usize| String::from_utf8_lossy(cell(row, column)).into_owned();
        let (kind, value, text, remedy) = match bad {
            BadRow::Cells => {
                let written: Vec<_> = row.iter().map(String::from_utf8_lossy).collect();
                let text = format!("the line has {}, the header {}", cells(row.len()), cells(self.count));
                let remedy = if row.len() > self.count {
                    "give every line the cells of the header; put quotes around a cell with a comma in it"
                } else {
                    "complete it; a last line that is cut short means that the program was stopped as it wrote"
                };
                (FaultKind::Shape, written.join(","), text, remedy.to_owned())
            }
            BadRow::LineBreak => {
                let written: Vec<_> = row.iter().map(String::from_utf8_lossy).collect();
                let remedy = "close the quotation mark on its line; the lines up to the closing one are not read";
                let text = "a quoted cell runs over several lines".to_owned();
                (FaultKind::Syntax, written.join(","), text, remedy.to_owned())
            }
            BadRow::End if std::str::from_utf8(cell(row, self.end)).is_err() => {
                let value = value(self.end);
                let text = format!("the end `{}` is not UTF-8 text", shortened(&value));
                (FaultKind::Syntax, value, text, "save the file as UTF-8".to_owned())
            }
            BadRow::End => {
                let reason = collector.unknown_end(&value(self.end));
                (FaultKind::UnknownName, value(self.end), reason.text, reason.remedy)
            }
            BadRow::Time(reason) => {
                let remedy = match collector.ticks() {
                    Ticks::STEPS => "write the number of steps to the end, a whole number such as 12 or 12.0",
                    _ => "write the time to the end in clock units, a number such as 12.5",
                };
                let (kind, text) = reason.words("time", &value(self.time));
                (kind, value(self.time), text, remedy.to_owned())
            }
            BadRow::Replication(reason) => {
                let written = self.replication.map(value).unwrap_or_default();
                let remedy = "number the replications with whole numbers, or leave the column out";
                let (kind, text) = reason.words("replication", &written);
                (kind, written, text, remedy.to_owned())
            }
            BadRow::Repeated(number) => {
                let remedy = "keep one of them, or number the replications of several runs on from one another";
                let text = format!("replication {number} is listed twice");
                (FaultKind::DuplicateReplication, number.to_string(), text, remedy.to_owned())
            }
        };
        Fault::new(kind, place, text, remedy).valued(shortened(&value))
    }
}

impl NotWhole {
    fn words(self, what: &str, written: &str) -> (FaultKind, String) {
        let (kind, reason) = match self {
            Self::Empty => return (FaultKind::Shape, format!("the {what} is empty")),
            Self::NotText => (FaultKind::Syntax, "is not UTF-8 text"),
            Self::NotANumber => (FaultKind::NotANumber, "is not a number"),
            Self::NotFinite => (FaultKind::NonFinite, "is not finite"),
            Self::Negative => (FaultKind::Negative, "is negative"),
            Self::Fraction => (FaultKind::NotWhole, "is not a whole number"),
            Self::OutOfRange => {
                (FaultKind::OutOfRange, "is out of range: 18446744073709551615 is the largest that is counted")
            }
        };
        (kind, format!("the {what} `{}` {reason}", shortened(written)))
    }
}

fn cells(count: usize) -> String {
    if count == 1 { "1 cell".to_owned() } else { format!("{count} cells") }
}
