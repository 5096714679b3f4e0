//! The bench for refurbishing field radios as matrices: its states are intake, test, repair, burn-in, shipped, scrapped.

/// As a sparse matrix; entries in no order.
pub(crate) const MATRIX_MARKET: &str = "\
%%MatrixMarket matrix coordinate real general
% The bench, shift by shift.
%
6 6 11

2 3 0.4
1 2 0.92
1 6 8e-2
2 5 0.25
2 4 0.35
3 2 0.7
3 3 0.20
3 6 1.0E-1
4 5 1
5 5 1.0
6 6 1
";

/// As a dense table.
pub(crate) const CELLS: [[f64; 6]; 6] = [
    [0.0, 0.92, 0.0, 0.0, 0.0, 0.08],
    [0.0, 0.0, 0.4, 0.35, 0.25, 0.0],
    [0.0, 0.7, 0.2, 0.0, 0.0, 0.1],
    [0.0, 0.0, 0.0, 0.0, 1.0, 0.0],
    [0.0, 0.0, 0.0, 0.0, 1.0, 0.0],
    [0.0, 0.0, 0.0, 0.0, 0.0, 1.0],
];

/// An array file: version 1, 2 or 3, the text of its header, and the bytes of its cells. Headers are filled with blanks so
/// that cells begin at a multiple of 64 bytes (NumPy Enhancement Proposal 1).
pub(crate) fn npy(version: u8, header: &str, cells: &[u8]) -> Vec<u8> {
    let before = if version == 1 { 10 } else { 12 };
    let length = (before + header.len() + 1).next_multiple_of(64) - before;
    let mut bytes = [b"\x93NUMPY".as_slice(), &[version, 0]].concat();
    if version == 1 {
        bytes.extend((length as u16).to_le_bytes());
    } else {
        bytes.extend((length as u32).to_le_bytes());
    }
    bytes.extend(format!("{header:<width$}\n", width = length - 1).as_bytes());
    bytes.extend(cells);
    bytes
}

/// The header of a square array.
pub(crate) fn square(descr: &str, order: &str, states: usize) -> String {
    format!("{{'descr': '{descr}', 'fortran_order': {order}, 'shape': ({states}, {states}), }}")
}

/// The bench as an array of doubles.
pub(crate) fn bench() -> Vec<u8> {
    let cells: Vec<u8> = CELLS.as_flattened().iter().flat_map(|cell| cell.to_le_bytes()).collect();
    npy(1, &square("<f8", "False", 6), &cells)
}
