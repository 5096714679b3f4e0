//! Broken matrices and array files: every fault named and nothing else said.
//!
//! Sources of the formats: Boisvert, Pozo & Remington, The Matrix Market Exchange Formats, NISTIR 5935 (1996); NumPy
//! Enhancement Proposal 1, A Simple File Format for NumPy Arrays.

mod faults;

use std::fs;

use faults::{AS_NUMBER, Expected, GIVE_MOVES, IN_RANGE, hold, options};
use tallystone::model::FaultKind::{
    AboveOne, BadName, DuplicateMove, DuplicateName, MissingStart, Negative, NonFinite, NotANumber, NotWhole,
    OutOfRange, RowSum, Shape, Syntax, UnknownState, Unsupported,
};
use tallystone::model::{Model, ModelError, ReadOptions};

const BANNER: &str = "%%MatrixMarket matrix coordinate real general";
const BEGIN: &str = "begin with %%MatrixMarket matrix coordinate real general";

fn read(bytes: &[u8]) -> Result<Model, ModelError> {
    Model::read_from(bytes, "matrix", &options("1", &[]))
}

#[test]
fn first_lines_that_promise_something_else() {
    let cases: &[(&str, &[Expected<'_>])] = &[
        ("%%MatrixMarket", &[(Syntax, 1, "", "%%MatrixMarket", "has 0 words behind %%MatrixMarket, not four", BEGIN)]),
        (
            "%%MatrixMarket matrix array real general",
            &[(Unsupported, 1, "", "array", "a matrix that is `array` is not read", "in coordinate form")],
        ),
        (
            "%%MatrixMarket matrix coordinate complex general",
            &[(Unsupported, 1, "", "complex", "`complex` is not read", "probabilities are real")],
        ),
        (
            "%%MatrixMarket matrix coordinate pattern Symmetric",
            &[
                (Unsupported, 1, "", "pattern", "`pattern` is not read", "a pattern has no probabilities"),
                (Unsupported, 1, "", "symmetric", "`symmetric` is not read", "every entry of both triangles"),
            ],
        ),
        (
            "%%MatrixMarket matrix coordinate real skew-symmetric",
            &[(Unsupported, 1, "", "skew-symmetric", "`skew-symmetric` is not read", "write general")],
        ),
        (
            "%%MatrixMarket matrix coordinate real hermitian",
            &[(Unsupported, 1, "", "hermitian", "`hermitian` is not read", "write general")],
        ),
        (
            "%%MatrixMarket matrix coordinate rael general",
            &[(Syntax, 1, "", "rael", "`rael` in the first line", BEGIN)],
        ),
        ("%%MatrixMarket vector coordinate real general", &[(Unsupported, 1, "", "vector", "`vector` is not", BEGIN)]),
    ];
    for (banner, expected) in cases {
        let text = format!("{banner}\n2 2 2\n1 2 1\n2 2 1\n");
        hold(read(text.as_bytes()), &text, expected);
    }
    // A file whose name alone says what it should be.
    let directory = tempfile::tempdir().unwrap();
    let path = directory.path().join("bench.mtx");
    for (text, shown) in [("", ""), ("%MatrixMarket matrix\n1 1 1\n", "%MatrixMarket matrix")] {
        fs::write(&path, text).unwrap();
        let expected = [(Syntax, 1, "", shown, "the file does not begin as a Matrix Market file does", BEGIN)];
        hold(Model::read(&path, &options("1", &[])), text, &expected);
    }
}

#[test]
fn sizes_and_entries_that_do_not_fit() {
    let three = "write row, column and value";
    let cases: &[(&str, &[Expected<'_>])] = &[
        ("", &[(Shape, 0, "", "", "the file has no size line", "below the comments")]),
        ("% note\n\n", &[(Shape, 0, "", "", "the file has no size line", "below the comments")]),
        ("2 2\n1 2 1\n", &[(Shape, 2, "", "2 2", "the size line is not three whole numbers", "write rows, columns")]),
        ("2 2 x\n", &[(Shape, 2, "", "2 2 x", "the size line is not three whole numbers", "number of entries")]),
        ("2 2 -1\n", &[(Shape, 2, "", "2 2 -1", "not three whole numbers", "number of entries")]),
        ("% a\n2 3 1\n", &[(Shape, 3, "", "2 3 1", "the matrix has 2 rows and 3 columns", "a row and a column")]),
        ("0 0 0\n", &[(Shape, 0, "", "0", "the matrix has no rows", "give it a row for every state")]),
        (
            "4294967295 4294967295 1\n",
            &[(OutOfRange, 2, "", "4294967295 4294967295 1", "more than 4294967294", "cannot be reached")],
        ),
        ("2 2 3\n1 2 1\n2 2 1\n", &[(Shape, 0, "", "2", "announces 3 entries and has 2", "written to its end")]),
        ("2 2 1\n1 2 1\n2 2 1\n", &[(Shape, 0, "", "2", "announces 1 entries and has 2", "correct the count")]),
        ("2 2 2\n1 2\n2 2 1\n", &[(Shape, 3, "", "1 2", "the entry has 2 words, not three", three)]),
        ("2 2 2\n1 2 1 0\n2 2 1\n", &[(Shape, 3, "", "1 2 1 0", "the entry has 4 words, not three", three)]),
        ("2 2 2\n1 3 1\n2 2 1\n", &[(OutOfRange, 3, "", "3", "the column 3 is not among 1 to 2", "from 1")]),
        (
            "2 2 2\n0 1 1\n2 2 1\n",
            &[(OutOfRange, 3, "", "0", "the row 0 is not among 1 to 2", "correct the size line")],
        ),
        ("2 2 2\n1 -2 1\n2 2 1\n", &[(NotWhole, 3, "", "-2", "the column `-2` is no whole number", three)]),
        ("2 2 2\n1.0 2 1\n2 2 1\n", &[(NotWhole, 3, "", "1.0", "the row `1.0` is no whole number", three)]),
        (
            "2 2 2\n99999999999999999999 2 1\n2 2 1\n",
            &[(NotWhole, 3, "", "99999999999999999999", "is no whole number", three)],
        ),
        // Everything at once.
        (
            "2 2 9\n1 2\n% note\n3 1 1\n1 2 -0.5\n",
            &[
                (Shape, 0, "", "3", "announces 9 entries and has 3", "written to its end"),
                (Shape, 3, "", "1 2", "the entry has 2 words", three),
                (OutOfRange, 5, "", "3", "the row 3 is not among 1 to 2", "from 1"),
                (Negative, 6, "1", "-0.5", "`-0.5` among the moves of `1` is negative", IN_RANGE),
            ],
        ),
    ];
    for (text, expected) in cases {
        let text = format!("{BANNER}\n{text}");
        hold(read(text.as_bytes()), &text, expected);
    }
}

#[test]
fn entries_that_make_no_chain() {
    let cases: &[(&str, &[Expected<'_>])] = &[
        (
            "2 2 3\n1 2 0.5\n1 2 0.5\n2 2 1\n",
            &[(DuplicateMove, 4, "1", "2", "from `1` to `2` is listed twice (first on line 3)", "join the two")],
        ),
        // A zero may not hide that a cell is there twice.
        (
            "2 2 4\n1 2 0\n1 2 1\n1 1 0\n2 2 1\n",
            &[(DuplicateMove, 4, "1", "2", "from `1` to `2` is listed twice (first on line 3)", "join the two")],
        ),
        (
            "2 2 2\n1 2 nan\n2 2 1\n",
            &[(NonFinite, 3, "1", "nan", "`nan` among the moves of `1` is not finite", IN_RANGE)],
        ),
        ("2 2 2\n1 2 -Inf\n2 2 1\n", &[(NonFinite, 3, "1", "-Inf", "is not finite", IN_RANGE)]),
        ("2 2 2\n1 2 -1e-3\n2 2 1\n", &[(Negative, 3, "1", "-1e-3", "is negative", IN_RANGE)]),
        ("2 2 2\n1 2 1.5\n2 2 1\n", &[(AboveOne, 3, "1", "1.5", "is above 1", IN_RANGE)]),
        ("2 2 2\n1 2 one\n2 2 1\n", &[(NotANumber, 3, "1", "one", "`one` among the moves of `1`", AS_NUMBER)]),
        // What other tables may hold, the format does not know.
        ("2 2 2\n1 2 rest\n2 2 1\n", &[(NotANumber, 3, "1", "rest", "is not a number", AS_NUMBER)]),
        ("2 2 2\n1 2 1/1\n2 2 1\n", &[(NotANumber, 3, "1", "1/1", "is not a number", AS_NUMBER)]),
        ("2 2 2\n1 2 1_0e-1\n2 2 1\n", &[(NotANumber, 3, "1", "1_0e-1", "is not a number", AS_NUMBER)]),
        ("2 2 2\n1 2 1D0\n2 2 1\n", &[(NotANumber, 3, "1", "1D0", "is not a number", AS_NUMBER)]),
        (
            "3 3 3\n1 2 0.5\n1 3 0.4\n3 3 1\n",
            &[
                (RowSum, 0, "2", "", "the row of `2` holds no moves", "declare it so or give it a stay of 1"),
                (RowSum, 3, "1", "0.9", "the moves of `1` sum to 0.9, not 1", "correct one"),
            ],
        ),
        (
            "2 2 3\n1 1 0.333\n1 2 0.666\n2 2 1\n",
            &[(RowSum, 3, "1", "0.999", "sum to 0.999", "--rescale-rows LIMIT divides rows by their sum")],
        ),
        (
            "2 2 4\n1 1 0.3\n2 1 0.7\n1 2 0.4\n2 2 0.6\n",
            &[
                (RowSum, 0, "", "", "every column sums to 1, but not every row", "read it with --transpose"),
                (RowSum, 3, "1", "0.7", "sum to 0.7", "correct one"),
                (RowSum, 4, "2", "1.3", "sum to 1.3", "correct one"),
            ],
        ),
    ];
    for (text, expected) in cases {
        let text = format!("{BANNER}\n{text}");
        hold(read(text.as_bytes()), &text, expected);
    }
    let text = format!("{}\n2 2 3\n1 1 0.5\n1 2 5e-1\n2 2 1\n", BANNER.replace("real", "integer"));
    let whole = "write real in the first line";
    let expected = [
        (NotWhole, 3, "1", "0.5", "`0.5` among the moves of `1` is not whole, as the first line says", whole),
        (NotWhole, 4, "1", "5e-1", "`5e-1` among the moves of `1` is not whole", whole),
    ];
    hold(read(text.as_bytes()), &text, &expected);
    // Bytes that are no text.
    let bytes = [BANNER.as_bytes(), b"\n%\xe9\n2 2 2\n1 2 \xff\n2 2 1\n"].concat();
    hold(read(&bytes), "no text", &[(NotANumber, 4, "1", "\u{fffd}", "is not a number", AS_NUMBER)]);
    let text = format!("{BANNER}\n2 2 2\n1 2 1\n2 2 1\n");
    let no_start = Model::read_from(text.as_bytes(), "matrix", &ReadOptions::default());
    hold(no_start, &text, &[(MissingStart, 0, "start", "", "the model has no start", "--start STATE")]);
    let unknown = Model::read_from(text.as_bytes(), "matrix", &options("3", &[]));
    hold(unknown, &text, &[(UnknownState, 0, "3", "", "the state `3` has no moves", GIVE_MOVES)]);
}

// A file of a few bytes must not take the memory of what it announces.
#[test]
fn matrices_that_announce_more_than_they_hold() {
    let text = format!("{BANNER}\n4000000000 4000000000 1\n1 4000000000 1\n");
    let said = "the matrix has 4000000000 rows, but only 1 entries: most rows hold no moves";
    hold(read(text.as_bytes()), &text, &[(Shape, 0, "", "4000000000", said, "a stay of 1")]);
    let text = format!("{BANNER}\n2 2 18446744073709551615\n1 2 1\n2 2 1\n");
    let said = "the file announces 18446744073709551615 entries and has 2";
    hold(read(text.as_bytes()), &text, &[(Shape, 0, "", "2", said, "written to its end")]);
}

/// An array file of version 1.0 with this header.
fn npy(header: &str, cells: &[u8]) -> Vec<u8> {
    let length = u16::try_from(header.len()).unwrap().to_le_bytes();
    [b"\x93NUMPY\x01\x00".as_slice(), &length, header.as_bytes(), cells].concat()
}

fn doubles(cells: [f64; 4]) -> Vec<u8> {
    let header = "{'descr': '<f8', 'fortran_order': False, 'shape': (2, 2), }\n";
    npy(header, cells.map(f64::to_le_bytes).as_flattened())
}

#[test]
fn array_files_that_are_cut_or_something_else() {
    let good = doubles([0.5, 0.5, 0.0, 1.0]);
    let cells = good.len() - 32;
    let cut = "check that it was written to its end";
    for length in 8..good.len() {
        let done = length.saturating_sub(cells) / 8;
        let value = if length < cells { String::new() } else { done.to_string() };
        let said = if length < cells { "within its header".to_owned() } else { format!("after {done} cells of 4") };
        hold(read(&good[..length]), &format!("{length} bytes"), &[(Shape, 0, "", &value, &said, cut)]);
    }
    let save = "store one array with numpy.save";
    let by_itself = "store one array in the file, by itself";
    let version = [b"\x93NUMPY\x04\x01".as_slice(), &good[8..]].concat();
    let long = [b"\x93NUMPY\x02\x00".as_slice(), &u32::MAX.to_le_bytes(), &good[10..]].concat();
    let unsupported = "version 4.1 of the format is not read";
    let cases: &[(Vec<u8>, Expected<'_>)] = &[
        ([good.as_slice(), b"\n"].concat(), (Shape, 0, "", "", "goes on behind the 2 rows of its array", by_itself)),
        (version, (Unsupported, 0, "", "4.1", unsupported, "store it in version 1.0 to 3.0")),
        (long, (OutOfRange, 0, "", "4294967295", "the header has 4294967295 bytes, more than 65536", "plain array")),
        (npy("hello", &[]), (Syntax, 0, "", "hello", "the header is no dictionary of descr", save)),
        (npy("{'descr': '<f8'", &[]), (Syntax, 0, "", "{'descr': '<f8'", "the header is no dictionary", save)),
    ];
    for (bytes, expected) in cases {
        hold(read(bytes), &String::from_utf8_lossy(bytes), &[*expected]);
    }
    let directory = tempfile::tempdir().unwrap();
    let path = directory.path().join("bench.npy");
    let said = "the file does not begin as an array file of NumPy does";
    for (bytes, value, said, remedy) in [
        (&b"0.5,0.5\n"[..], "0.5,0.", said, save),
        (b"", "", said, save),
        (b"\x1f\x8b\x08\x00", "", "the file is compressed", "unpack it first"),
        (b"PK\x03\x04", "", "the file is compressed", "unpack it first"),
    ] {
        fs::write(&path, bytes).unwrap();
        let read = Model::read(&path, &options("0", &[]));
        hold(read, "no array", &[(Syntax, 0, "", value, said, remedy)]);
    }
}

#[test]
fn headers_of_arrays_that_are_no_square_tables_of_numbers() {
    let header = |descr: &str, order: &str, shape: &str| {
        format!("{{'descr': {descr}, 'fortran_order': {order}, 'shape': {shape}, }}\n")
    };
    let number = "store the array as float64";
    for descr in
        ["'|O'", "'<c16'", "'|b1'", "'<f2'", "'<f16'", "'<U8'", "'|f8'", "'<i3'", "[('a', '<f8'), ('b', '<i4')]", "f8"]
    {
        let said = format!("cells of the type {descr} are not read");
        let bytes = npy(&header(descr, "False", "(2, 2)"), &[0; 64]);
        hold(read(&bytes), descr, &[(Unsupported, 0, "", descr, &said, number)]);
    }
    for shape in ["(2, 3)", "(4,)", "()", "(2, 2, 2)", "(-2, -2)", "(4294967295, 4294967295)", "2", "(2, two)"] {
        let said = format!("an array of the shape {shape} is no square table");
        let bytes = npy(&header("'<f8'", "False", shape), &[0; 64]);
        hold(read(&bytes), shape, &[(Shape, 0, "", shape, &said, "one row and one column a state")]);
    }
    for text in [
        header("'<f8'", "Maybe", "(2, 2)"),
        header("'<f8'", "False", "(2, 2), 'shape': (2, 2)"),
        header("'<f8'", "False", "(2, 2), 'extra': 1"),
        "{'descr': '<f8', 'shape': (2, 2)}".to_owned(),
        "{descr: '<f8', 'fortran_order': False, 'shape': (2, 2)}".to_owned(),
    ] {
        let error = read(&npy(&text, &[0; 32])).unwrap_err();
        assert_eq!((error.faults().len(), error.faults()[0].kind), (1, Syntax), "{text}: {error}");
    }
    let empty = npy(&header("'<f8'", "False", "(0, 0)"), &[]);
    hold(read(&empty), "empty", &[(Shape, 0, "", "0", "the matrix has no rows", "give it a row for every state")]);
    let huge = npy(&header("'<f8'", "False", "(4000000000, 4000000000)"), &[0; 32]);
    let said = "the file ends after 4 cells of 16000000000000000000";
    hold(read(&huge), "huge", &[(Shape, 0, "", "4", said, "written to its end")]);
}

#[test]
fn arrays_that_make_no_chain() {
    let cases: &[([f64; 4], &[Expected<'_>])] = &[
        ([f64::NAN, 1.0, 0.0, 1.0], &[(NonFinite, 0, "0", "NaN", "`NaN` among the moves of `0`", IN_RANGE)]),
        ([f64::NEG_INFINITY, 1.0, 0.0, 1.0], &[(NonFinite, 0, "0", "-inf", "is not finite", IN_RANGE)]),
        (
            [-0.25, 1.0, 0.0, 1.0],
            &[(Negative, 0, "0", "-0.25", "`-0.25` among the moves of `0` is negative", IN_RANGE)],
        ),
        ([0.5, 0.5, 0.0, 1.5], &[(AboveOne, 0, "1", "1.5", "`1.5` among the moves of `1` is above 1", IN_RANGE)]),
        ([0.5, 0.25, 0.0, 1.0], &[(RowSum, 0, "0", "0.75", "the moves of `0` sum to 0.75", "correct one")]),
        (
            [0.75, 0.5, 0.25, 0.5],
            &[
                (RowSum, 0, "", "", "every column sums to 1, but not every row", "read it with --transpose"),
                (RowSum, 0, "0", "1.25", "sum to 1.25", "correct one"),
                (RowSum, 0, "1", "0.75", "sum to 0.75", "correct one"),
            ],
        ),
    ];
    for (cells, expected) in cases {
        let read = Model::read_from(doubles(*cells).as_slice(), "array", &options("0", &[]));
        hold(read, &format!("{cells:?}"), expected);
    }
    let turned = ReadOptions { transpose: true, ..options("0", &[]) };
    let read = Model::read_from(doubles([0.75, 0.25, 0.5, 0.5]).as_slice(), "array", &turned);
    assert!(read.unwrap_err().faults().iter().any(|fault| fault.remedy == "read it without --transpose"));
}

#[test]
fn names_that_do_not_fit_the_matrix() {
    let directory = tempfile::tempdir().unwrap();
    let path = directory.path().join("names.txt");
    let matrix = format!("{BANNER}\n2 2 2\n1 2 1\n2 2 1\n");
    let a_line = "give it one name a line, a line for every row";
    let cases: &[(&[u8], &[Expected<'_>])] = &[
        (b"a\n", &[(Shape, 0, "", "1", "the file names 1 states, and the matrix has 2 rows", a_line)]),
        (b"a\nb\nc\n", &[(Shape, 0, "", "3", "the file names 3 states, and the matrix has 2 rows", a_line)]),
        (b"a\n\n", &[(BadName, 2, "", "", "a name is empty", "rename it")]),
        (b"a\na\n", &[(DuplicateName, 2, "a", "", "`a` is there twice (first on line 1)", "give every state its own")]),
        (b"a\n\xe9\n", &[(Syntax, 2, "", "", "the file is not UTF-8 text", "save the file as UTF-8")]),
    ];
    for (names, expected) in cases {
        fs::write(&path, names).unwrap();
        let named = ReadOptions { state_names: Some(path.clone()), ..options("a", &[]) };
        let read = Model::read_from(matrix.as_bytes(), "matrix", &named);
        assert!(read.as_ref().unwrap_err().to_string().contains("names.txt"));
        hold(read, &String::from_utf8_lossy(names), expected);
    }
}
