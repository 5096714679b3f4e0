//! Models as tables: lists of moves (`from,to,probability`) and square tables with names, as spreadsheets save them.

use std::collections::HashMap;

use csv::StringRecord;

use super::Clock;
use super::draft::{Draft, DraftMove};
use super::fault::{Fault, FaultKind, did_you_mean, nearest, shortened};
use super::input::Input;
use super::number::Number;
use super::records::{self, Records, decimal_point};

/// Column names of a list of moves.
const COLUMNS: [&str; 3] = ["from", "to", "probability"];
/// In place of the last one, in continuous time.
const RATE: &str = "rate";

/// Lines that begin with it are comments.
const COMMENT: Option<u8> = Some(b'#');

/// The rows of a table as text, one at a time.
struct Table<'i, 's> {
    records: Records<&'i mut Input<'s>>,
    delimiter: u8,
    row: StringRecord,
}

impl<'i, 's> Table<'i, 's> {
    fn of(input: &'i mut Input<'s>) -> Self {
        let delimiter = records::delimiter(input.head(), COMMENT);
        Self { records: Records::new(input, delimiter, COMMENT), delimiter, row: StringRecord::new() }
    }

    /// Reads the next row that is not blank; gives its line. Rows that are not text become faults.
    fn next(&mut self, draft: &mut Draft) -> Option<u64> {
        loop {
            let mut row = std::mem::take(&mut self.row).into_byte_record();
            // An input always reads; see there.
            if !self.records.read(&mut row).unwrap_or(false) {
                return None;
            }
            let line = self.records.line(&row);
            if let Ok(row) = StringRecord::from_byte_record(row) {
                self.row = row;
                if !self.cells().all(str::is_empty) {
                    return Some(line);
                }
            } else {
                let place = draft.place(draft.moves_file, line);
                let said = "the line is not UTF-8 text";
                draft.fault(Fault::new(FaultKind::Syntax, place, said, "save the file as UTF-8"));
            }
        }
    }

    /// A cell of the row that was read last, without the blanks around it.
    fn cell(&self, column: usize) -> Option<&str> {
        self.row.get(column).map(str::trim)
    }

    fn cells(&self) -> impl Iterator<Item = &str> {
        self.row.iter().map(str::trim)
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
        let line = header.filter(|_| !draft.moves_unread)?;
        Some((self.cells().map(str::to_owned).collect(), line))
    }
}

/// Reads a table into the draft: a list of moves if its header says so, a square table otherwise.
pub(super) fn read(input: &mut Input<'_>, transpose: bool, draft: &mut Draft) {
    let mut table = Table::of(input);
    let Some((header, line)) = table.header(draft) else { return };
    // A table that is a model by itself has no other way to say it.
    if draft.moves_file == 0 && header.iter().any(|name| name.eq_ignore_ascii_case(RATE)) {
        draft.clock = Clock::Rates;
    }
    // Two of the three names show what is meant, so that a misspelt third is told.
    if COLUMNS.iter().filter(|name| header.iter().any(|known| known.eq_ignore_ascii_case(name))).count() >= 2 {
        list_of_moves(table, &header, line, transpose, draft);
    } else {
        square(table, &header, line, transpose, draft);
    }
}

fn list_of_moves(mut table: Table<'_, '_>, header: &[String], header_line: u64, transpose: bool, draft: &mut Draft) {
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
    let (from, to) = if transpose { (to, from) } else { (from, to) };
    // States are numbered as they are met, and anew when it is known which of them have moves.
    let mut leaving: Vec<u32> = Vec::new();
    while let Some(line) = table.next(draft) {
        let from_state = table.cell(from).map(|name| match leaving.last() {
            // Lists are mostly sorted by the state that is left.
            Some(last) if *draft.states[*last as usize].name == *name => *last,
            _ => draft.state(name, file, line),
        });
        if let Some(state) = from_state
            && draft.states[state as usize].row.is_none()
        {
            draft.states[state as usize].row = Some(line);
            leaving.push(state);
        }
        let too_long = (header.len()..table.row.len()).any(|column| table.cell(column) != Some(""));
        match (from_state, table.cell(to), table.cell(probability)) {
            (Some(from), Some(to), Some(value)) if !too_long => {
                let to = draft.state(to, file, line);
                add_move(draft, from, to, &decimal_point(value, table.delimiter), line);
            }
            _ => {
                let said = format!("the line has {} cells, the header {}", table.row.len(), header.len());
                let remedy = "give every line the cells of the header; put quotes around a cell with a comma in it";
                let mut fault = Fault::new(FaultKind::Shape, draft.place(file, line), said, remedy);
                fault.state = table.cell(from).map(str::to_owned);
                if let Some(state) = from_state {
                    draft.states[state as usize].faulty = true;
                }
                draft.fault(fault.valued(shortened(&table.cells().collect::<Vec<_>>().join(","))));
            }
        }
    }
    draft.renumber(&leaving);
}

fn square(mut table: Table<'_, '_>, header: &[String], header_line: u64, transpose: bool, draft: &mut Draft) {
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
    let states: Vec<u32> = names.iter().map(|name| draft.state(name, file, header_line)).collect();
    draft.turn_hint = Some(turn_hint(transpose));
    if transpose {
        draft.states.iter_mut().for_each(|state| state.row = Some(header_line));
    }
    let mut seen: HashMap<String, u64> = HashMap::new();
    while let Some(line) = table.next(draft) {
        let name = table.cell(0).unwrap_or_default();
        let place = draft.place(file, line);
        let Some(own) = column_of.get(name).map(|column| states[*column]) else {
            let remedy = did_you_mean(name, names.iter().map(String::as_str), "every row needs a column of its name");
            let said = format!("the row `{name}` has no column");
            draft.fault(Fault::new(FaultKind::UnknownState, place, said, remedy).about(name));
            continue;
        };
        if let Some(first) = seen.insert(name.to_owned(), line) {
            let said = format!("the row of `{name}` is there twice (first on line {first})");
            draft.fault(Fault::new(FaultKind::DuplicateName, place, said, "keep one").about(name));
            continue;
        }
        if !transpose {
            draft.states[own as usize].row = Some(line);
        }
        if table.row.len() != header.len() {
            let said = format!("the row of `{name}` has {} cells, the header {}", table.row.len(), header.len());
            let remedy = "give every row the cells of the header";
            draft.fault(Fault::new(FaultKind::Shape, place, said, remedy).about(name));
            // The states that lack a move then.
            let lacking = if transpose { states.as_slice() } else { &[own] };
            lacking.iter().for_each(|state| draft.states[*state as usize].faulty = true);
            continue;
        }
        for (written, other) in table.cells().skip(1).zip(&states).filter(|(written, _)| !written.is_empty()) {
            let written = decimal_point(written, table.delimiter);
            if Number::parse(&written).is_ok_and(|number| number.is_zero()) {
                continue;
            }
            let (from, to) = if transpose { (*other, own) } else { (own, *other) };
            add_move(draft, from, to, &written, line);
        }
    }
}

/// Whether a line is one of a list of moves, such as `a,b,0.5`, which a header never is.
fn is_a_move(line: &[String]) -> bool {
    let [from, to, probability] = line else { return false };
    let is_number = |text: &str| Number::parse(text).is_ok();
    !from.is_empty() && !is_number(from) && !is_number(to) && is_number(probability)
}

/// What to do about a table of which every column sums to one and not every row.
pub(super) fn turn_hint(is_turned: bool) -> &'static str {
    if is_turned {
        "read it without --transpose"
    } else {
        "transpose the table, or read it with --transpose: one row for each state left"
    }
}

fn add_move(draft: &mut Draft, from: u32, to: u32, value: &str, line: u64) {
    let value = draft.written(value, Some(from), draft.moves_file, line);
    draft.moves.push(DraftMove { from, to, value, line });
}
