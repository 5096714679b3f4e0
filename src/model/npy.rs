//! The reader of dense arrays in the binary form of NumPy (`.npy`, versions 1.0 to 3.0): square arrays of floating-point
//! numbers or integers.
//!
//! A floating-point number stands for the shortest decimal that reads back as it, which is what printing it shows: a cell
//! that was 0.1 is one tenth, not the double nearest to it. Rows of such decimals rarely sum to one exactly, and fall under
//! the rule for sums near one.
//!
//! # Reference
//! NumPy Enhancement Proposal 1, *A Simple File Format for NumPy Arrays*; version 3.0 (a header in UTF-8) in the
//! documentation of `numpy.lib.format`.

use std::io::{BufReader, Read};

use super::Clock;
use super::draft::{Draft, probability_or_rate};
use super::fault::{Fault, FaultKind, shortened};
use super::input::Input;
use super::matrix::{Matrix, Reading};
use super::npy_header::{Header, header};

/// How every file begins.
pub(super) const MAGIC: &[u8] = b"\x93NUMPY";

/// Reads an array into the draft.
pub(super) fn read(input: &mut Input<'_>, reading: Reading, draft: &mut Draft) {
    let mut source = BufReader::with_capacity(1 << 16, input);
    let read = header(&mut source).and_then(|header| Ok((entries(&mut source, &header, draft.clock)?, header)));
    match read {
        Ok((matrix, header)) => matrix.fill(header.states, 0, reading, draft),
        Err(problem) => {
            let Problem { kind, said, value, remedy } = problem;
            let fault = Fault::new(kind, draft.place(draft.moves_file, 0), said, remedy);
            draft.fault(Fault { value: value.map(|value| shortened(&value)), ..fault });
            draft.moves_unread = true;
        }
    }
}

/// What is wrong with a file as a whole.
#[derive(Debug)]
pub(super) struct Problem {
    pub(super) kind: FaultKind,
    pub(super) said: String,
    pub(super) value: Option<String>,
    pub(super) remedy: &'static str,
}

fn entries(source: &mut impl Read, header: &Header, clock: Clock) -> Result<Matrix, Problem> {
    let Header { states, is_by_column, scalar } = *header;
    let mut matrix = Matrix::default();
    let mut text = String::new();
    for outer in 0..states {
        for inner in 0..states {
            let mut bytes = [0; 8];
            let bytes = &mut bytes[..scalar.size()];
            if source.read_exact(bytes).is_err() {
                let cells = u64::from(outer) * u64::from(states) + u64::from(inner);
                let said = format!("the file ends after {cells} cells of {}", u64::from(states).pow(2));
                let remedy = "check that it was written to its end";
                return Err(Problem { kind: FaultKind::Shape, said, value: Some(cells.to_string()), remedy });
            }
            if scalar.is_zero(bytes) {
                continue;
            }
            text.clear();
            scalar.write(bytes, &mut text);
            let cell = if is_by_column { [inner, outer] } else { [outer, inner] };
            matrix.push(cell, probability_or_rate(&text, clock, "store numbers"), || text.clone(), 0);
        }
    }
    if source.read(&mut [0]).is_ok_and(|more| more > 0) {
        let said = format!("the file goes on behind the {states} rows of its array");
        let remedy = "store one array in the file, by itself";
        return Err(Problem { kind: FaultKind::Shape, said, value: None, remedy });
    }
    Ok(matrix)
}
