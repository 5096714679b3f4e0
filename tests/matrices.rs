//! Models as matrices: whatever the form, the same chain as the model file.
//!
//! Sources of the formats: Boisvert, Pozo & Remington, The Matrix Market Exchange Formats, NISTIR 5935 (1996); NumPy
//! Enhancement Proposal 1, A Simple File Format for NumPy Arrays. Files that other programs wrote say so.

mod arrays;

use std::fs;
use std::path::PathBuf;

use arrays::{CELLS, MATRIX_MARKET, bench, npy, square};
use tallystone::model::{Model, Number, ReadOptions, WarningKind};
use tempfile::TempDir;

const TOML: &str = r#"
start = "intake"
absorbing = ["shipped", "scrapped"]
[moves]
intake = { test = 0.92, scrapped = "rest" }
test = { repair = 0.4, burn-in = 0.35, shipped = 0.25 }
repair = { test = 0.7, repair = 0.2, scrapped = 0.1 }
burn-in = { shipped = 1 }
"#;

const NAMES: [&str; 6] = ["intake", "test", "repair", "burn-in", "shipped", "scrapped"];

const LIST: &str = "from,to,probability\nintake,test,0.92\nintake,scrapped,0.08\ntest,repair,0.4\ntest,burn-in,0.35\n\
test,shipped,0.25\nrepair,test,0.7\nrepair,repair,0.2\nrepair,scrapped,0.1\nburn-in,shipped,1\n";

/// The fingerprint of the bench with these names for its states.
fn fingerprint(names: [&str; 6]) -> String {
    let renamed = NAMES.iter().zip(names).fold(TOML.to_owned(), |text, (old, new)| text.replace(old, new));
    Model::from_toml(&renamed).unwrap().fingerprint().to_owned()
}

fn start(state: &str) -> ReadOptions {
    ReadOptions { start: Some(state.to_owned()), ..ReadOptions::default() }
}

/// Files in a directory of their own.
struct Files(TempDir);

impl Files {
    fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    fn write(&self, name: &str, bytes: impl AsRef<[u8]>) -> PathBuf {
        let path = self.0.path().join(name);
        fs::write(&path, bytes).unwrap();
        path
    }

    /// Options that name the states of the bench.
    fn named(&self) -> ReadOptions {
        let names = self.write("names.txt", format!("\u{feff}{}\r\n", NAMES.join("\r\n")));
        ReadOptions { state_names: Some(names), ..start("intake") }
    }
}

#[track_caller]
fn hold(bytes: impl AsRef<[u8]>, options: &ReadOptions, expected: &str) -> Model {
    let read = Model::read_from(bytes.as_ref(), "matrix", options).unwrap_or_else(|error| panic!("{error}"));
    assert_eq!(read.fingerprint(), expected, "{}", String::from_utf8_lossy(bytes.as_ref()));
    read
}

#[test]
fn a_sparse_matrix_is_the_same_chain_in_any_dress() {
    let files = Files::new();
    let (numbered, named) = (fingerprint(["1", "2", "3", "4", "5", "6"]), fingerprint(NAMES));
    let sorted = {
        let (head, entries) = MATRIX_MARKET.split_once("\n\n").unwrap();
        let mut entries: Vec<&str> = entries.lines().collect();
        entries.sort_unstable();
        format!("{head}\n{}\n", entries.join("\n"))
    };
    for text in [
        MATRIX_MARKET.to_owned(),
        sorted,
        MATRIX_MARKET.trim_end().to_owned(),
        MATRIX_MARKET.replace('\n', "\r\n"),
        format!("\u{feff}{MATRIX_MARKET}"),
        MATRIX_MARKET.replace("matrix coordinate real", "MATRIX  Coordinate\tReal"),
        MATRIX_MARKET.replace("1 2 0.92", "  1\t2   +.92  \n\n"),
        // A zero that is written is no move.
        MATRIX_MARKET.replace("6 6 11", "6 6 13").replace("4 5 1", "4 5 1\n4 1 0\n5 1 0.0"),
    ] {
        hold(&text, &start("1"), &numbered);
        let model = hold(&text, &files.named(), &named);
        assert!(model.warnings().is_empty());
    }
    let path = files.write("bench.MTX", MATRIX_MARKET);
    let model = Model::read(&path, &files.named()).unwrap();
    assert_eq!((model.title(), model.fingerprint()), ("bench", &*named));
    assert_eq!(model.inputs().len(), 2);
    assert!(model.inputs()[1].file.ends_with("names.txt"));
}

// Decimals stay as they are written, those too that no double can hold.
#[test]
fn the_numbers_of_a_sparse_matrix_are_those_that_were_written() {
    let text = "%%MatrixMarket matrix coordinate real general\n2 2 3\n1 1 0.999999999999999999\n1 2 1e-18\n2 2 1\n";
    let model = Model::read_from(text.as_bytes(), "matrix", &start("1")).unwrap();
    assert_eq!(model.chain().row(0).probability(1).to_string(), "1/1000000000000000000");
    assert!(model.warnings().is_empty());
}

// Written by SciPy 1.17.1: scipy.io.mmwrite of coo_matrix([[0.9, 0.1], [0, 1]]) and of [[0, 1], [0, 1]] in integers.
#[test]
fn sparse_matrices_of_another_program_are_read() {
    let real = "%%MatrixMarket matrix coordinate real general\n%\n2 2 3\n1 1 9E-1\n1 2 1E-1\n2 2 1\n";
    let integer = "%%MatrixMarket matrix coordinate integer general\n%\n2 2 2\n1 2 1\n2 2 1\n";
    for (text, moves) in [(real, "1 = { 1 = 0.9, 2 = 0.1 }"), (integer, "1 = { 2 = 1 }")] {
        let same = Model::from_toml(&format!("start = \"1\"\nabsorbing = [\"2\"]\n[moves]\n{moves}\n")).unwrap();
        hold(text, &start("1"), same.fingerprint());
    }
}

/// How a number is stored.
type Form = fn(f64) -> Vec<u8>;

#[test]
fn an_array_is_the_same_chain_in_any_dress() {
    let files = Files::new();
    let (numbered, named) = (fingerprint(["0", "1", "2", "3", "4", "5"]), fingerprint(NAMES));
    let cells = CELLS.as_flattened();
    let by_column: Vec<f64> = (0..36).map(|at| CELLS[at % 6][at / 6]).collect();
    let bytes = |cells: &[f64], form: Form| cells.iter().flat_map(|cell| form(*cell)).collect::<Vec<u8>>();
    let forms: [(&str, Form); 4] = [
        ("<f8", |cell| cell.to_le_bytes().into()),
        (">f8", |cell| cell.to_be_bytes().into()),
        ("<f4", |cell| (cell as f32).to_le_bytes().into()),
        (">f4", |cell| (cell as f32).to_be_bytes().into()),
    ];
    for (descr, form) in forms {
        for version in 1..=3 {
            for (order, cells) in [("False", cells), ("True", &by_column)] {
                let file = npy(version, &square(descr, order, 6), &bytes(cells, form));
                let model = hold(&file, &start("0"), &numbered);
                assert!(model.warnings().is_empty());
                hold(&file, &files.named(), &named);
            }
        }
    }
    // Any order of the keys, either quote, no comma at the end; a zero below zero.
    let other = "{\"shape\":(6,6),\"fortran_order\":False,\"descr\":\"<f8\"}";
    let below: Vec<f64> = cells.iter().map(|cell| if *cell == 0.0 { -0.0 } else { *cell }).collect();
    hold(npy(1, other, &bytes(&below, forms[0].1)), &start("0"), &numbered);
    let path = files.write("bench.npy", bench());
    assert_eq!(Model::read(&path, &files.named()).unwrap().fingerprint(), named);
}

#[test]
fn arrays_of_integers_are_read() {
    let same = Model::from_toml("start = \"0\"\nabsorbing = [\"1\"]\n[moves]\n0 = { 1 = 1 }\n").unwrap();
    for (descr, zero, one) in [
        ("|i1", &[0][..], &[1][..]),
        ("|u1", &[0], &[1]),
        ("<u1", &[0], &[1]),
        ("<i2", &[0; 2], &[1, 0]),
        (">u4", &[0; 4], &[0, 0, 0, 1]),
        ("<i8", &[0; 8], &[1, 0, 0, 0, 0, 0, 0, 0]),
        (">i8", &[0; 8], &[0, 0, 0, 0, 0, 0, 0, 1]),
    ] {
        hold(npy(1, &square(descr, "False", 2), &[zero, one, zero, one].concat()), &start("0"), same.fingerprint());
    }
}

// Written by NumPy 2.4.6: format.write_array of [[0.9, 0.1], [0, 1]] in versions 1.0, 2.0 and 3.0, and numpy.save of the same
// in Fortran order as '>f4'.
#[test]
fn arrays_of_another_program_are_read() {
    let blanks = " ".repeat(58);
    let dictionary = "{'descr': '<f8', 'fortran_order': False, 'shape': (2, 2), }";
    let cells = b"\xcd\xcc\xcc\xcc\xcc\xcc\xec?\x9a\x99\x99\x99\x99\x99\xb9?\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\x00\xf0?";
    let first = [b"\x93NUMPY\x01\x00v\x00", dictionary.as_bytes(), blanks.as_bytes(), b"\n", cells].concat();
    let later = |version: u8| {
        let begin = [b"\x93NUMPY".as_slice(), &[version], b"\x00t\x00\x00\x00"].concat();
        [&begin, dictionary.as_bytes(), &blanks.as_bytes()[2..], b"\n", cells].concat()
    };
    let fortran = b"\x93NUMPY\x01\x00v\x00{'descr': '>f4', 'fortran_order': True, 'shape': (2, 2), }                                                           \n?fff\x00\x00\x00\x00=\xcc\xcc\xcd?\x80\x00\x00";
    let same = Model::from_toml("start = \"0\"\nabsorbing = [\"1\"]\n[moves]\n0 = { 0 = 0.9, 1 = 0.1 }\n").unwrap();
    for file in [first, later(2), later(3), fortran.to_vec()] {
        hold(file, &start("0"), same.fingerprint());
    }
}

// Thirds as doubles are decimals of sixteen digits, so the row misses one and is corrected with a warning.
#[test]
fn a_double_is_its_shortest_decimal() {
    let third: f64 = 1.0 / 3.0;
    let cells = [third, third, third, 0.0, 1.0, 0.0, 0.0, 0.0, 1.0].map(f64::to_le_bytes);
    let file = npy(1, &square("<f8", "False", 3), cells.as_flattened());
    let model = Model::read_from(file.as_slice(), "thirds", &start("0")).unwrap();
    let row = model.chain().row(0);
    // The stay takes the difference: 1 − 2 · 0.3333333333333333.
    assert_eq!(row.probability(0).to_string(), "1666666666666667/5000000000000000");
    assert_eq!(row.probability(1).to_string(), "3333333333333333/10000000000000000");
    assert_eq!(model.warnings().iter().map(|one| one.kind).collect::<Vec<_>>(), [WarningKind::CorrectedRow]);
}

#[test]
fn a_table_that_lists_moves_from_column_to_row_is_turned() {
    let files = Files::new();
    let options = ReadOptions { transpose: true, ..files.named() };
    let (head, entries) = MATRIX_MARKET.split_once("\n\n").unwrap();
    let turned = entries.lines().fold(format!("{head}\n"), |text, line| {
        let words: Vec<&str> = line.split(' ').collect();
        text + &format!("{} {} {}\n", words[1], words[0], words[2])
    });
    hold(turned, &options, &fingerprint(NAMES));
    let cells: Vec<u8> = CELLS.as_flattened().iter().flat_map(|cell| cell.to_le_bytes()).collect();
    hold(npy(1, &square("<f8", "True", 6), &cells), &options, &fingerprint(NAMES));

    let options = ReadOptions {
        absorbing: vec!["shipped".to_owned(), "scrapped".to_owned()],
        transpose: true,
        ..start("intake")
    };
    hold(LIST.replace("from,to", "to,from"), &options, &fingerprint(NAMES));
    let mut table = format!(",{}\n", NAMES.join(","));
    for (to, name) in NAMES.iter().enumerate() {
        let row: Vec<String> = CELLS.iter().map(|row| row[to].to_string()).collect();
        table += &[*name, ",", &row.join(","), "\n"].concat();
    }
    hold(table, &ReadOptions { absorbing: Vec::new(), ..options }, &fingerprint(NAMES));
}

#[test]
fn rows_are_rescaled_only_as_far_as_is_allowed() {
    let toml = "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { a = 0.1, x = 0.3, y = 0.599 }\n";
    let files = Files::new();
    let path = files.write("rounded.toml", toml);
    let read = |limit: &str| {
        let rescale_rows = Some(Number::parse(limit).unwrap());
        Model::read(&path, &ReadOptions { rescale_rows, ..ReadOptions::default() })
    };
    for limit in ["0.001", "1/1000", "0.5"] {
        let model = read(limit).unwrap_or_else(|error| panic!("{error}"));
        // Every entry is divided by the sum, 0.999; the stay as well.
        let row = model.chain().row(0);
        let row: Vec<String> = (0..3).map(|i| row.probability(i).to_string()).collect();
        assert_eq!(row, ["100/999", "100/333", "599/999"]);
        assert!(model.warnings()[0].text.contains("the moves of `a` sum to 0.999; they were corrected"));
        assert!((model.largest_correction() - 0.001).abs() < 1e-12);
    }
    let error = read("0.000999").unwrap_err();
    assert!(error.faults()[0].remedy.contains("--rescale-rows LIMIT"), "{error}");
    for limit in ["1e-9", "0", "1", "-0.5", "2"] {
        let error = read(limit).unwrap_err().to_string();
        assert!(error.contains("is not between 0.000000001 and 1; give a number such as 1e-6"), "{error}");
    }
    // What the built-in rule corrects, it corrects as ever: the stay takes the difference.
    files.write("rounded.toml", toml.replace("0.599", "0.5999999999"));
    let model = read("0.001").unwrap();
    assert_eq!(model.chain().row(0).probability(1).to_string(), "3/10");
}

#[test]
fn a_model_file_takes_its_moves_from_any_table() {
    let files = Files::new();
    let head = "start = \"intake\"\nabsorbing = [\"shipped\", \"scrapped\"]\nmoves_file = ";
    files.write("list.csv", LIST);
    files.write("bench.mtx", MATRIX_MARKET);
    files.write("bench.npy", bench());
    let named = ReadOptions { start: None, ..files.named() };
    for (name, options, inputs) in
        [("list.csv", &ReadOptions::default(), 2), ("bench.mtx", &named, 3), ("bench.npy", &named, 3)]
    {
        let path = files.write("model.toml", format!("{head}\"{name}\"\n"));
        let model = Model::read(&path, options).unwrap_or_else(|error| panic!("{error}"));
        assert_eq!((model.fingerprint(), model.inputs().len()), (&*fingerprint(NAMES), inputs), "{name}");
    }
    // Numbers are names like any others.
    let numbered = "start = \"1\"\nabsorbing = [\"5\", \"6\"]\nmoves_file = \"bench.mtx\"\n";
    let model = Model::read(&files.write("model.toml", numbered), &ReadOptions::default()).unwrap();
    assert_eq!(model.fingerprint(), fingerprint(["1", "2", "3", "4", "5", "6"]));
}

#[test]
fn options_that_do_not_fit_are_refused() {
    let files = Files::new();
    let (toml, list) = (files.write("model.toml", TOML), files.write("list.csv", LIST));
    let with_file = files.write("split.toml", "start = \"intake\"\nmoves_file = \"list.csv\"\n");
    let transpose = ReadOptions { transpose: true, ..ReadOptions::default() };
    for (path, options, said) in [
        (&toml, &files.named(), "--state-names is for tables, and the moves of this model stand under [moves]; leave"),
        (&toml, &transpose, "--transpose is for tables, and the moves of this model stand under [moves]; leave"),
        (&list, &files.named(), "names its states itself; leave it out, or rename the states in the file"),
        (&with_file, &files.named(), "names its states itself; leave it out"),
    ] {
        let error = Model::read(path, options).unwrap_err();
        assert!(error.to_string().contains(said) && error.faults().is_empty(), "{error}");
    }
    let missing = ReadOptions { state_names: Some(files.0.path().join("none.txt")), ..start("1") };
    let error = Model::read(&files.write("bench.mtx", MATRIX_MARKET), &missing).unwrap_err();
    assert!(error.to_string().contains("none.txt"), "{error}");
}
