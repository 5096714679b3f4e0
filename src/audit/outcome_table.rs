//! A result file behind its header.

use std::io::{self, BufRead, BufReader, Read};

use csv::{ByteRecord, StringRecord};

use crate::model::{Fault, FaultKind, Number, Place, Records, delimiter, shortened};

use super::outcome_row::Columns;

/// Columns that later versions read: counts of equal rows, weights, runs cut short, several starts. To pass over them would
/// compare something else than the file says.
const WEIGHTY: [&str; 4] = ["count", "weight", "censored", "start"];

/// The rows below the header, and what the header says of them.
pub(super) struct Table<R> {
    pub(super) records: Records<BufReader<R>>,
    pub(super) columns: Columns,
    /// Columns that mean nothing here.
    pub(super) ignored: Vec<String>,
}

/// Why there is no table.
pub(super) enum NoTable {
    /// The system's reason.
    Unreadable(io::Error),
    /// What is wrong with the header, or with the file as a whole.
    Faulty(Box<Fault>),
}

impl From<Fault> for NoTable {
    fn from(fault: Fault) -> Self {
        Self::Faulty(Box::new(fault))
    }
}

impl<R: Read> Table<R> {
    /// Reads the header; `place` is that of the file.
    pub(super) fn open(source: R, place: &Place) -> Result<Self, NoTable> {
        let fault = |kind, text: &str, remedy: &str| NoTable::from(Fault::new(kind, place.clone(), text, remedy));
        let mut source = BufReader::with_capacity(1 << 16, source);
        let beginning = source.fill_buf().map_err(NoTable::Unreadable)?;
        if beginning.starts_with(b"\x1f\x8b") {
            return Err(fault(FaultKind::Syntax, "the file is compressed", "unpack it first"));
        }
        let delimiter = delimiter(beginning, None);
        let mut records = Records::new(source, delimiter, None);
        let mut header = ByteRecord::new();
        if !records.read(&mut header).map_err(NoTable::Unreadable)? {
            let remedy = "check that the program finished and wrote its outcomes";
            return Err(fault(FaultKind::Shape, "the file is empty", remedy));
        }
        let place = Place { line: Some(records.line(&header)), ..place.clone() };
        let (columns, ignored) = columns(header, delimiter, place)?;
        Ok(Self { records, columns, ignored })
    }
}

/// Where the columns of the header stand, and the names of those that mean nothing here.
fn columns(header: ByteRecord, delimiter: u8, place: Place) -> Result<(Columns, Vec<String>), NoTable> {
    let Ok(header) = StringRecord::from_byte_record(header) else {
        return Err(
            Fault::new(FaultKind::Syntax, place, "the header is not UTF-8 text", "save the file as UTF-8").into()
        );
    };
    let names: Vec<&str> = header.iter().map(str::trim).collect();
    let at = ["end", "time", "replication"].map(|wanted| {
        let mut found = (0..names.len()).filter(|column| names[*column].eq_ignore_ascii_case(wanted));
        (wanted, found.next(), found.next())
    });
    if let Some((twice, ..)) = at.iter().find(|(.., second)| second.is_some()) {
        let text = format!("the header names `{twice}` twice");
        return Err(Fault::new(FaultKind::DuplicateName, place, text, "keep one").about(*twice).into());
    }
    if let Some(name) = names.iter().find(|name| WEIGHTY.iter().any(|known| name.eq_ignore_ascii_case(known))) {
        let text = format!("the column `{name}` changes what a row says, and this version does not read it");
        let remedy = "write one row a replication that ran to its end; rename the column if it means something else";
        return Err(Fault::new(FaultKind::Unsupported, place, text, remedy).about(*name).into());
    }
    let [(_, Some(end), _), (_, Some(time), _), (_, replication, _)] = at else {
        let missing = at[..2].iter().filter(|(_, column, _)| column.is_none());
        let missing: Vec<String> = missing.map(|(name, ..)| format!("no column `{name}`")).collect();
        let shown = shortened(&names.join(","));
        let is_row = names.iter().any(|name| Number::parse(name).is_ok());
        let text = if is_row && missing.len() == 2 {
            format!("the first line `{shown}` is a row, not the header")
        } else {
            format!("the header `{shown}` has {}", missing.join(" and "))
        };
        let remedy =
            "name the columns in the first line: `end` is where a replication finished, `time` is its number of steps";
        return Err(Fault::new(FaultKind::Shape, place, text, remedy).valued(shown).into());
    };
    let used = [Some(end), Some(time), replication];
    let ignored = (0..names.len()).filter(|column| !used.contains(&Some(*column)) && !names[*column].is_empty());
    let ignored = ignored.map(|column| names[column].to_owned()).collect();
    Ok((Columns { end, time, replication, count: names.len(), delimiter }, ignored))
}
