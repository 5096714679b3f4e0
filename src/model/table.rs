//! Models as tables: lists of moves (`from,to,probability`) and square tables with names, as spreadsheets save them.

use std::collections::HashMap;

use csv::{ByteRecord, ReaderBuilder, Trim};

use super::draft::{Draft, DraftMove};
use super::fault::{Fault, FaultKind, Place, did_you_mean};
use super::number::Number;

/// Column names of a list of moves.
const COLUMNS: [&str; 3] = ["from", "to", "probability"];

/// Reads a table that is a model by itself: a list of moves if its header says so, a square table otherwise.
pub(super) fn read(bytes: &[u8], draft: &mut Draft) {
    draft.lone_stay_is_absorbing = true;
    let header = records(bytes, delimiter(bytes)).next();
    let is_list = header.and_then(Result::ok).is_some_and(|header| {
        let names: Vec<String> = header.iter().map(|cell| text(cell).to_lowercase()).collect();
        names.iter().any(|name| name == "from") && names.iter().any(|name| name == "to")
    });
    if is_list {
        read_moves(bytes, draft);
    } else {
        read_square(bytes, draft);
    }
}

/// Reads a list of moves into the draft.
pub(super) fn read_moves(bytes: &[u8], draft: &mut Draft) {
    let delimiter = delimiter(bytes);
    let mut rows = records(bytes, delimiter);
    let Some(Ok(header)) = rows.next() else { return empty(draft) };
    let names: Vec<String> = header.iter().map(|cell| text(cell).to_lowercase()).collect();
    let mut columns = [0; 3];
    for (column, name) in columns.iter_mut().zip(COLUMNS) {
        match names.iter().position(|known| known == name) {
            Some(at) => *column = at,
            None => {
                let remedy = did_you_mean(name, names.iter().map(String::as_str), "the header is from,to,probability");
                let said = format!("the header has no column `{name}`");
                let place = draft.place(draft.moves_file, 1);
                draft.fault(Fault::new(FaultKind::Shape, place, said, remedy).valued(names.join(",")));
            }
        }
    }
    if !draft.faults.is_empty() {
        return;
    }
    let file = draft.moves_file;
    let mut pending: Vec<(u32, String, String, u64)> = Vec::new();
    for row in rows {
        let Some((row, line)) = line_of(row, draft) else { continue };
        let cells = columns.map(|column| row.get(column).map(text));
        let [Some(from), Some(to), Some(value)] = cells else {
            let said = format!("the line has {} columns, the header {}", row.len(), names.len());
            let fault = Fault::new(FaultKind::Shape, draft.place(file, line), said, "complete the line");
            draft.fault(fault);
            continue;
        };
        let from_state = draft.state(&from, file, line);
        draft.states[from_state as usize].row.get_or_insert(line);
        pending.push((from_state, to, value, line));
    }
    // Targets are numbered after all states that have moves, as in a model file.
    for (from, to, value, line) in pending {
        let to = draft.state(&to, file, line);
        add_move(draft, from, to, &decimal_point(value, delimiter), line);
    }
}

fn read_square(bytes: &[u8], draft: &mut Draft) {
    let delimiter = delimiter(bytes);
    let mut rows = records(bytes, delimiter);
    let Some(Ok(header)) = rows.next() else { return empty(draft) };
    let file = draft.moves_file;
    let names: Vec<String> = header.iter().skip(1).map(text).collect();
    let mut column_of: HashMap<&str, usize> = HashMap::new();
    for (column, name) in names.iter().enumerate() {
        if column_of.insert(name, column).is_some() {
            let said = format!("the header names `{name}` twice");
            let fault = Fault::new(FaultKind::DuplicateName, draft.place(file, 1), said, "give every state one column");
            draft.fault(fault.about(name.clone()));
        }
        draft.state(name, file, 1);
    }
    let mut seen: HashMap<String, u64> = HashMap::new();
    let mut column_sums = vec![0.0; names.len()];
    for row in rows {
        let Some((row, line)) = line_of(row, draft) else { continue };
        let name = row.get(0).map(text).unwrap_or_default();
        let place = draft.place(file, line);
        if row.len() != names.len() + 1 {
            let said = format!("the row of `{name}` has {} cells, the header {}", row.len(), names.len() + 1);
            draft.fault(Fault::new(FaultKind::Shape, place, said, "the table must be square").about(name));
            continue;
        }
        if !column_of.contains_key(name.as_str()) {
            let remedy = did_you_mean(&name, names.iter().map(String::as_str), "every row needs a column of its name");
            let said = format!("the row `{name}` has no column");
            draft.fault(Fault::new(FaultKind::UnknownState, place, said, remedy).about(name));
            continue;
        }
        if let Some(first) = seen.insert(name.clone(), line) {
            let said = format!("the row of `{name}` is there twice (first on line {first})");
            draft.fault(Fault::new(FaultKind::DuplicateName, place, said, "keep one").about(name));
            continue;
        }
        let from = draft.state(&name, file, line);
        draft.states[from as usize].row = Some(line);
        for (column, cell) in row.iter().skip(1).enumerate() {
            let cell = decimal_point(text(cell), delimiter);
            if cell.is_empty() {
                continue;
            }
            if let Ok(number) = Number::parse(&cell) {
                if number.is_zero() {
                    continue;
                }
                column_sums[column] += number.to_f64();
            }
            let to = draft.state(&names[column], file, 1);
            add_move(draft, from, to, &cell, line);
        }
    }
    for name in names.iter().filter(|name| !seen.contains_key(*name)) {
        let said = format!("the column `{name}` has no row");
        let fault = Fault::new(FaultKind::Shape, draft.place(file, 1), said, "the table must be square; add its row");
        draft.fault(fault.about(name.clone()));
    }
    hint_at_transposition(draft, &column_sums);
}

/// When every column sums to one and some row does not, the table is most likely written the other way round.
fn hint_at_transposition(draft: &mut Draft, column_sums: &[f64]) {
    let is_one = |sum: &f64| (sum - 1.0).abs() <= 1e-9;
    if column_sums.is_empty() || !column_sums.iter().all(is_one) {
        return;
    }
    let mut row_sums = vec![0.0; draft.states.len()];
    for one in &draft.moves {
        if let super::draft::Written::Number(number) = &one.value {
            row_sums[one.from as usize] += number.to_f64();
        }
    }
    if !row_sums.iter().all(is_one) {
        let said = "every column sums to 1, but not every row: the table seems to list moves from column to row";
        let place = draft.place(draft.moves_file, 0);
        draft.fault(Fault::new(FaultKind::RowSum, place, said, "transpose the table: one row for each state left"));
    }
}

fn add_move(draft: &mut Draft, from: u32, to: u32, value: &str, line: u64) {
    let name = draft.states[from as usize].name.clone();
    let place = draft.place(draft.moves_file, line);
    if let Some(value) = draft.written(value, &name, place) {
        draft.moves.push(DraftMove { from, to, value, line });
    }
}

fn empty(draft: &mut Draft) {
    let place = draft.place(draft.moves_file, 0);
    draft.fault(Fault::new(FaultKind::Shape, place, "the table is empty", "give it a header and a row a move"));
}

fn line_of(row: Result<ByteRecord, csv::Error>, draft: &mut Draft) -> Option<(ByteRecord, u64)> {
    match row {
        Ok(row) => {
            let line = row.position().map_or(0, csv::Position::line);
            (!row.iter().all(<[u8]>::is_empty)).then_some((row, line))
        }
        Err(error) => {
            let place: Place = draft.place(draft.moves_file, error.position().map_or(0, csv::Position::line));
            draft.fault(Fault::new(
                FaultKind::Syntax,
                place,
                format!("not readable as CSV: {error}"),
                "correct the line",
            ));
            None
        }
    }
}

fn records(bytes: &[u8], delimiter: u8) -> impl Iterator<Item = Result<ByteRecord, csv::Error>> {
    let bytes = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
    ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .trim(Trim::All)
        .comment(Some(b'#'))
        .delimiter(delimiter)
        .from_reader(bytes)
        .into_byte_records()
}

/// Comma, semicolon or tab: whichever the first line has most of.
fn delimiter(bytes: &[u8]) -> u8 {
    let first = bytes.split(|b| *b == b'\n').next().unwrap_or_default();
    let count = |delimiter: u8| first.iter().filter(|b| **b == delimiter).count();
    // The last of equal counts wins, so a file of one column counts as separated by commas.
    [b'\t', b';', b','].into_iter().max_by_key(|delimiter| count(*delimiter)).unwrap_or(b',')
}

/// Spreadsheets that separate by semicolon or tab often write a decimal comma.
fn decimal_point(cell: String, delimiter: u8) -> String {
    if delimiter != b',' && cell.matches(',').count() == 1 && !cell.contains('.') {
        cell.replace(',', ".")
    } else {
        cell
    }
}

fn text(cell: &[u8]) -> String {
    String::from_utf8_lossy(cell).into_owned()
}
