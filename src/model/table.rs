//! Models as tables: lists of moves (`from,to,probability`) and square tables with names, as spreadsheets save them.

use std::collections::HashMap;

use csv::{ByteRecord, StringRecord};

use super::Clock;
use super::draft::{Draft, DraftMove, Written};
use super::fault::{Fault, FaultKind, did_you_mean, nearest, shortened};
use super::number::Number;
use super::records::{self, Records, decimal_point};

/// Column names of a list of moves.
const COLUMNS: [&str; 3] = ["from", "to", "probability"];
/// In place of the last one, in continuous time.
const RATE: &str = "rate";

/// Lines that begin with it are comments.
const COMMENT: Option<u8> = Some(b'#');

/// The rows of a table as text.
struct Table<'a> {
    records: Records<&'a [u8]>,
    delimiter: u8,
    row: ByteRecord,
}

impl<'a> Table<'a> {
    fn of(bytes: &'a [u8]) -> Self {
        let delimiter = records::delimiter(bytes, COMMENT);
        Self { records: Records::new(bytes, delimiter, COMMENT), delimiter, row: ByteRecord::new() }
    }

    /// The next row that is not blank, and its line. Rows that are not text become faults.
    fn next(&mut self, draft: &mut Draft) -> Option<(StringRecord, u64)> {
        // Memory can always be read.
        while self.records.read(&mut self.row).unwrap_or(false) {
            let line = self.records.line(&self.row);
            match StringRecord::from_byte_record(self.row.clone()) {
                Ok(mut row) => {
                    row.trim();
                    if !row.iter().all(str::is_empty) {
                        return Some((row, line));
                    }
                }
                Err(_) => {
                    let place = draft.place(draft.moves_file, line);
                    let said = "the line is not UTF-8 text";
                    draft.fault(Fault::new(FaultKind::Syntax, place, said, "save the file as UTF-8"));
                }
            }
        }
        None
    }

    /// The first row, the line that the table is known by.
    fn header(&mut self, draft: &mut Draft) -> Option<(Vec<String>, u64)> {
        let faults = draft.faults.len();
        let header = self.next(draft);
        if header.is_none() && draft.faults.len() == faults {
            let place = draft.place(draft.moves_file, 0);
            draft.fault(Fault::new(FaultKind::Shape, place, "the table is empty", "give it a header and a row a move"));
        }
        draft.moves_unread = draft.faults.len() > faults;
        let (row, line) = header.filter(|_| !draft.moves_unread)?;
        Some((row.iter().map(str::to_owned).collect(), line))
    }
}

/// Reads a table that is a model by itself: a list of moves if its header says so, a square table otherwise.
pub(super) fn read(bytes: &[u8], draft: &mut Draft) {
    draft.lone_stay_is_absorbing = true;
    let mut table = Table::of(bytes);
    let Some((header, line)) = table.header(draft) else { return };
    if header.iter().any(|name| name.eq_ignore_ascii_case(RATE)) {
        draft.clock = Clock::Rates;
    }
    // Two of the three names show what is meant, so that a misspelt third is told.
    if COLUMNS.iter().filter(|name| header.iter().any(|known| known.eq_ignore_ascii_case(name))).count() >= 2 {
        list_of_moves(table, &header, line, draft);
    } else {
        square(table, &header, line, draft);
    }
}

/// Reads a list of moves into the draft.
pub(super) fn read_moves(bytes: &[u8], draft: &mut Draft) {
    let mut table = Table::of(bytes);
    let Some((header, line)) = table.header(draft) else { return };
    list_of_moves(table, &header, line, draft);
}

fn list_of_moves(mut table: Table<'_>, header: &[String], header_line: u64, draft: &mut Draft) {
    let file = draft.moves_file;
    let [first, second, last] = COLUMNS;
    let names = [first, second, if draft.clock == Clock::Rates { RATE } else { last }];
    let is_column = |known: &str| names.iter().any(|name| name.eq_ignore_ascii_case(known));
    let mut columns = [None; 3];
    for (column, name) in columns.iter_mut().zip(names) {
        *column = header.iter().position(|known| known.eq_ignore_ascii_case(name));
        if column.is_none() {
            let others = header.iter().map(String::as_str).filter(|known| !is_column(known));
            let near = nearest(name, others).map(|near| format!("rename `{near}` to `{name}`"));
            let is_rate =
                column.is_none() && name == last && header.iter().any(|known| known.eq_ignore_ascii_case(RATE));
            let remedy = match near {
                _ if is_rate => "set clock = \"rates\" in the model, or give probabilities".to_owned(),
                Some(near) => near,
                None => format!("the header is {}", names.join(",")),
            };
            let said = format!("the header has no column `{name}`");
            let fault = Fault::new(FaultKind::Shape, draft.place(file, header_line), said, remedy);
            draft.fault(fault.valued(header.join(",")));
        }
    }
    let [Some(from), Some(to), Some(probability)] = columns else {
        draft.moves_unread = true;
        return;
    };
    let mut pending: Vec<(u32, String, String, u64)> = Vec::new();
    while let Some((row, line)) = table.next(draft) {
        let from_state = row.get(from).map(|name| draft.state(name, file, line));
        if let Some(state) = from_state {
            draft.states[state as usize].row.get_or_insert(line);
        }
        let too_long = row.iter().skip(header.len()).any(|cell| !cell.is_empty());
        match (from_state, row.get(to), row.get(probability)) {
            (Some(from), Some(to), Some(value)) if !too_long => {
                pending.push((from, to.to_owned(), decimal_point(value, table.delimiter), line));
            }
            _ => {
                let said = format!("the line has {} cells, the header {}", row.len(), header.len());
                let remedy = "give every line the cells of the header; put quotes around a cell with a comma in it";
                let mut fault = Fault::new(FaultKind::Shape, draft.place(file, line), said, remedy);
                fault.state = row.get(from).map(str::to_owned);
                if let Some(state) = from_state {
                    draft.states[state as usize].faulty = true;
                }
                draft.fault(fault.valued(shortened(&row.iter().collect::<Vec<_>>().join(","))));
            }
        }
    }
    draft.declare();
    for (from, to, value, line) in pending {
        let to = draft.state(&to, file, line);
        add_move(draft, from, to, &value, line);
    }
}

fn square(mut table: Table<'_>, header: &[String], header_line: u64, draft: &mut Draft) {
    let file = draft.moves_file;
    let names = &header[1..];
    let mut refused = |kind, said: String, remedy: &str| {
        let fault = Fault::new(kind, draft.place(file, header_line), said, remedy);
        draft.fault(fault.valued(shortened(&header.join(","))));
        draft.moves_unread = true;
    };
    // A number among the names is a table or a list of moves without its header.
    if names.is_empty() || header.iter().all(|name| Number::parse(name).is_ok()) || is_a_move(header) {
        let said = "the first line does not name the states";
        let remedy = "begin with from,to,probability for a list of moves, or with a blank cell and the names of all states \
                      for a square table";
        return refused(FaultKind::Shape, said.to_owned(), remedy);
    }
    let mut column_of: HashMap<&str, usize> = HashMap::new();
    for (column, name) in names.iter().enumerate() {
        if column_of.insert(name, column).is_some() {
            let said = format!("the header names `{name}` twice");
            return refused(FaultKind::DuplicateName, said, "give every state one column");
        }
    }
    for name in names {
        draft.state(name, file, header_line);
    }
    let mut seen: HashMap<String, u64> = HashMap::new();
    let mut column_sums = vec![0.0; names.len()];
    while let Some((row, line)) = table.next(draft) {
        let name = &row[0];
        let place = draft.place(file, line);
        if !column_of.contains_key(name) {
            let remedy = did_you_mean(name, names.iter().map(String::as_str), "every row needs a column of its name");
            let said = format!("the row `{name}` has no column");
            draft.fault(Fault::new(FaultKind::UnknownState, place, said, remedy).about(name));
            continue;
        }
        if let Some(first) = seen.insert(name.to_owned(), line) {
            let said = format!("the row of `{name}` is there twice (first on line {first})");
            draft.fault(Fault::new(FaultKind::DuplicateName, place, said, "keep one").about(name));
            continue;
        }
        let from = draft.state(name, file, line);
        draft.states[from as usize].row = Some(line);
        if row.len() != header.len() {
            let said = format!("the row of `{name}` has {} cells, the header {}", row.len(), header.len());
            draft
                .fault(Fault::new(FaultKind::Shape, place, said, "give every row the cells of the header").about(name));
            draft.states[from as usize].faulty = true;
            continue;
        }
        for (column, written) in row.iter().skip(1).enumerate().filter(|(_, written)| !written.is_empty()) {
            let written = decimal_point(written, table.delimiter);
            if let Ok(number) = Number::parse(&written) {
                if number.is_zero() {
                    continue;
                }
                column_sums[column] += number.to_f64();
            }
            let to = draft.state(&names[column], file, header_line);
            add_move(draft, from, to, &written, line);
        }
    }
    hint_at_transposition(draft, &column_sums);
}

/// Whether a line is one of a list of moves, such as `a,b,0.5`, which a header never is.
fn is_a_move(line: &[String]) -> bool {
    let [from, to, probability] = line else { return false };
    let is_number = |text: &str| Number::parse(text).is_ok();
    !from.is_empty() && !is_number(from) && !is_number(to) && is_number(probability)
}

/// When every column sums to one and some row does not, the table is most likely written the other way round.
fn hint_at_transposition(draft: &mut Draft, column_sums: &[f64]) {
    let is_one = |sum: &f64| (sum - 1.0).abs() <= 1e-9;
    if column_sums.is_empty() || !column_sums.iter().all(is_one) {
        return;
    }
    let mut row_sums = vec![0.0; draft.states.len()];
    for one in &draft.moves {
        if let Some(Written::Number(number)) = &one.value {
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
    let place = draft.place(draft.moves_file, line);
    let value = draft.written(value, Some(from), place);
    draft.moves.push(DraftMove { from, to, value, line });
}
