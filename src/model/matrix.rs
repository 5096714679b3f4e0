//! Square matrices of probabilities, as their readers fill them: entries by number first, the states and their names when
//! it is known how many there are.

use std::collections::HashMap;
use std::path::Path;
use std::sync::Arc;

use super::InputFile;
use super::draft::{BadValue, Draft, DraftMove, Written};
use super::fault::{Fault, FaultKind, ModelError};
use super::input::{Input, as_text};
use super::kind::without_mark;
use super::number::Number;

/// States that are made, and told one by one if they lack moves, however few entries there are. A file of a few bytes
/// must not claim the memory of the billions of states that it announces.
const STATES_UNSEEN: u64 = 1000;

/// The names of states, one a line.
pub(super) struct Names {
    file: Arc<str>,
    names: Vec<String>,
}

impl Names {
    /// Reads the file of names.
    pub(super) fn read(path: &Path) -> Result<(Self, InputFile), ModelError> {
        let mut input = Input::open(path)?;
        let (bytes, file) = (input.whole(), Arc::from(input.name()));
        let input = input.finish()?;
        let text = as_text(without_mark(&bytes), &file)?;
        Ok((Self { file, names: text.lines().map(|line| line.trim().to_owned()).collect() }, input))
    }
}

/// How a matrix is to be read.
pub(super) struct Reading {
    /// Names of the states; the numbers of the file otherwise.
    pub(super) names: Option<Names>,
    /// Whether it lists moves from column to row.
    pub(super) transpose: bool,
}

/// The entries of a matrix.
#[derive(Default)]
pub(super) struct Matrix {
    moves: Vec<DraftMove>,
    /// Values that are no probabilities; told when the states have names.
    bad: Vec<(usize, BadEntry)>,
}

struct BadEntry {
    text: String,
    value: BadValue,
    line: u64,
}

impl Matrix {
    /// Adds the entry in a row and a column, both from 0. `text` is what stands there.
    pub(super) fn push(
        &mut self,
        [from, to]: [u32; 2],
        value: Result<Number, BadValue>,
        text: impl FnOnce() -> String,
        line: u64,
    ) {
        let value = match value {
            Ok(number) => Some(Written::Number(number)),
            Err(value) => {
                self.bad.push((self.moves.len(), BadEntry { text: text(), value, line }));
                None
            }
        };
        self.moves.push(DraftMove { from, to, value, line });
    }

    /// Makes a matrix of so many states, numbered from `first`, the moves of a draft.
    pub(super) fn fill(mut self, states: u32, first: u32, reading: Reading, draft: &mut Draft) {
        if reading.transpose {
            self.moves.iter_mut().for_each(|one| (one.from, one.to) = (one.to, one.from));
        }
        draft.turn_hint = Some(super::table::turn_hint(reading.transpose));
        if !self.name_states(states, first, reading.names, draft) {
            draft.moves_unread = true;
            return;
        }
        for (at, bad) in self.bad {
            let from = self.moves[at].from;
            draft.refuse_value(&bad.text, bad.value, Some(from), draft.moves_file, bad.line);
        }
        draft.moves = in_order(self.moves);
        draft.declare();
    }

    fn name_states(&self, states: u32, first: u32, names: Option<Names>, draft: &mut Draft) -> bool {
        let shape = |draft: &mut Draft, said: String, remedy: &str| {
            let fault = Fault::new(FaultKind::Shape, draft.place(draft.moves_file, 0), said, remedy);
            draft.fault(fault.valued(states.to_string()));
            false
        };
        if states == 0 {
            return shape(draft, "the matrix has no rows".to_owned(), "give it a row for every state");
        }
        let Some(Names { file, names }) = names else {
            let entries = self.moves.len() as u64;
            let states = u64::from(states);
            let seen = entries + draft.declared.len() as u64;
            if states > seen.max(STATES_UNSEEN) {
                let said = format!("the matrix has {states} rows, but only {entries} entries: most rows hold no moves");
                return shape(draft, said, "give every state moves; if it is absorbing, a stay of 1");
            }
            draft.expect(states as usize);
            for number in 0..states {
                let state = draft.state(&(number + u64::from(first)).to_string(), draft.moves_file, 0);
                draft.states[state as usize].row = Some(0);
            }
            return true;
        };
        draft.files.push(file);
        let file = draft.files.len() - 1;
        if names.len() as u64 != u64::from(states) {
            let said = format!("the file names {} states, and the matrix has {states} rows", names.len());
            let remedy = "give it one name a line, a line for every row";
            let fault = Fault::new(FaultKind::Shape, draft.place(file, 0), said, remedy);
            draft.fault(fault.valued(names.len().to_string()));
            return false;
        }
        let mut lines: HashMap<&str, u64> = HashMap::with_capacity(names.len());
        let faults = draft.faults.len();
        for (line, name) in (1..).zip(&names) {
            if let Some(before) = lines.insert(name, line) {
                let said = format!("the name `{name}` is there twice (first on line {before})");
                let fault =
                    Fault::new(FaultKind::DuplicateName, draft.place(file, line), said, "give every state its own");
                draft.fault(fault.about(name.as_str()));
            }
            let state = draft.state(name, file, line);
            draft.states[state as usize].row = Some(0);
        }
        draft.faults.len() == faults
    }
}

/// Moves by row and column, so that a matrix is the same chain whatever the order of its entries. A zero is no move, unless
/// it stands where another entry does.
fn in_order(mut moves: Vec<DraftMove>) -> Vec<DraftMove> {
    let cell = |one: &DraftMove| (one.from, one.to);
    moves.sort_by_key(cell);
    let is_zero = |one: &DraftMove| matches!(&one.value, Some(Written::Number(number)) if number.is_zero());
    if moves.iter().any(is_zero) {
        let is_twin = |at: usize, other: Option<usize>| {
            other.and_then(|at| moves.get(at)).is_some_and(|other| cell(other) == cell(&moves[at]))
        };
        let kept: Vec<bool> = (0..moves.len())
            .map(|at| !is_zero(&moves[at]) || is_twin(at, at.checked_sub(1)) || is_twin(at, Some(at + 1)))
            .collect();
        let mut kept = kept.into_iter();
        moves.retain(|_| kept.next() == Some(true));
    }
    moves
}
