//! Good models: every form of one model is the same chain, and its numbers are those that were written.

mod models;

use std::fmt::Write;
use std::fs;

use tallystone::model::{Draft, Model, ReadOptions, WarningKind};

fn options(start: &str, absorbing: &[&str]) -> ReadOptions {
    let absorbing = absorbing.iter().map(|name| (*name).to_owned()).collect();
    ReadOptions { start: Some(start.to_owned()), absorbing, ..ReadOptions::default() }
}

fn windows(text: &str) -> String {
    format!("\u{feff}{}", text.replace('\n', "\r\n"))
}

/// As a spreadsheet writes where the comma is the decimal sign.
fn continental(text: &str) -> String {
    text.replace(',', ";").replace('.', ",")
}

fn fingerprint() -> String {
    Model::from_toml(models::TOML).unwrap().fingerprint().to_owned()
}

#[test]
fn a_model_file_says_what_it_says() {
    let bench = Model::from_toml(models::TOML).unwrap();
    assert_eq!((bench.title(), bench.clock_unit()), ("Field-radio refurbishing bench", "shift"));
    let chain = bench.chain();
    assert_eq!((chain.states(), chain.moves()), (6, 9));
    assert_eq!(chain.ends().iter().map(|end| end.name.as_str()).collect::<Vec<_>>(), ["shipped", "scrapped"]);
    assert!(bench.warnings().is_empty() && bench.largest_correction() == 0.0);
    assert_eq!(bench.groups()[0].ends, [0, 1]);
    assert_eq!(bench.compare().unwrap().len(), 3);
    assert_eq!(bench.tolerances().keys().count(), 3);
}

#[test]
fn a_model_file_may_write_the_same_chain_in_many_ways() {
    for (from, to) in [
        ("0.92, scrapped = \"rest\"", "\"23/25\", scrapped = 0.08"),
        ("0.92, scrapped = \"rest\"", "9.2e-1, scrapped = \"rest\""),
        ("{ shipped = 1 }", "{ shipped = \"rest\", test = 0 }"),
        ("Field-radio", "Airband"),
        ("start = \"intake\"", "start = { intake = 1.0, shipped = 0 }"),
        ("burn-in = { shipped = 1 }", "burn-in.shipped = 1"),
        ("burn-in = { shipped = 1 }", "burn-in = { shipped = 1 }\nshipped = { shipped = 1 }"),
    ] {
        let text = models::TOML.replace(from, to);
        assert_ne!(text, models::TOML);
        let same = Model::from_toml(&text).unwrap_or_else(|error| panic!("{text}\n{error}"));
        assert_eq!(same.fingerprint(), fingerprint(), "{text}");
    }
    assert_eq!(Model::from_toml(&windows(models::TOML)).unwrap().fingerprint(), fingerprint());
    for other in [models::TOML.replace("0.92", "0.920000000000000001"), models::TOML.replace("burn-in", "burn_in")] {
        assert_ne!(Model::from_toml(&other).unwrap().fingerprint(), fingerprint());
    }
}

#[test]
fn a_list_of_moves_is_the_same_chain_in_any_dress() {
    let columns_turned = models::MOVES.lines().fold(String::new(), |mut text, line| {
        let cells: Vec<&str> = line.split(',').collect();
        writeln!(text, "{},note,{},{}", cells[2], cells[0], cells[1]).unwrap();
        text
    });
    for table in [
        models::MOVES.to_owned(),
        models::MOVES.trim_end().to_owned(),
        windows(models::MOVES),
        windows(&continental(models::MOVES)),
        models::MOVES.replace(',', "\t"),
        models::MOVES.replace("from,to,probability", "# moves; one a line; as planned\nFrom, TO,Probability,"),
        models::MOVES.replace("test,repair", "# a note\n\n , ,\n test , repair "),
        columns_turned,
    ] {
        let read = Model::from_table(&table, &options("intake", &["shipped", "scrapped"]));
        let read = read.unwrap_or_else(|error| panic!("{table}\n{error}"));
        assert_eq!(read.fingerprint(), fingerprint(), "{table}");
    }
    // A stay of 1 declares an end, as a table has no other way to; its states are numbered as the rows stand.
    let table = format!("{}shipped,shipped,1\nscrapped,scrapped,1.0\n", models::MOVES);
    let read = Model::from_table(&table, &options("intake", &[])).unwrap();
    assert_eq!(read.fingerprint(), fingerprint());
    assert!(read.warnings().is_empty());
}

#[test]
fn a_square_table_is_the_same_chain_in_any_dress() {
    let declared = options("intake", &["shipped", "scrapped"]);
    let plain = options("intake", &[]);
    for (table, options) in [
        (models::SQUARE.to_owned(), &plain),
        (models::SQUARE.trim_end().to_owned(), &plain),
        (windows(models::SQUARE), &plain),
        (windows(&continental(models::SQUARE)), &plain),
        (models::SQUARE.replace(',', "\t").replace("0.", "."), &plain),
        (models::SQUARE.replace(",,", ",0,").replace(",,", ",0.0,"), &plain),
        (models::SQUARE.replace(",intake,", "state, intake ,"), &plain),
        // Ends may have a row of zeros, or no row, if they are declared.
        (models::SQUARE.replace("shipped,,,,,1,", "shipped,0,,,,,"), &declared),
        (models::SQUARE.replace("shipped,,,,,1,\nscrapped,,,,,,1\n", ""), &declared),
    ] {
        let read = Model::from_table(&table, options).unwrap_or_else(|error| panic!("{table}\n{error}"));
        assert_eq!(read.fingerprint(), fingerprint(), "{table}");
    }
}

#[test]
fn a_model_in_code_and_models_in_files_are_the_same_chain() {
    let mut draft = Draft::new("bench");
    draft.start("intake");
    // States are numbered at their first mention.
    for (from, to, probability) in [
        ("intake", "test", "0.92"),
        ("test", "repair", "5/12"),
        ("burn-in", "shipped", "1"),
        ("intake", "scrapped", "rest"),
        ("test", "burn-in", "rest"),
        ("test", "shipped", "0.25"),
        ("repair", "test", "0.7"),
        ("repair", "repair", "0.2"),
        ("repair", "scrapped", "1/10"),
    ] {
        draft.moves(from, to, probability);
    }
    draft.absorbing("shipped");
    draft.absorbing("scrapped");
    assert_eq!(draft.check().unwrap().fingerprint(), fingerprint());

    let directory = tempfile::tempdir().unwrap();
    let write = |name: &str, text: &str| {
        let path = directory.path().join(name);
        fs::write(&path, text).unwrap();
        path
    };
    let (head, rest) = models::TOML.split_once("[moves]").unwrap();
    let (_, tail) = rest.split_once("[groups]").unwrap();
    write("moves.csv", models::MOVES);
    let table = options("intake", &["shipped", "scrapped"]);
    for (path, options) in [
        (write("whole.toml", models::TOML), &ReadOptions::default()),
        (write("split.TOML", &format!("moves_file = \"moves.csv\"\n{head}[groups]{tail}")), &ReadOptions::default()),
        (write("list.csv", models::MOVES), &table),
        (write("square.txt", models::SQUARE), &table),
    ] {
        let read = Model::read(&path, options).unwrap_or_else(|error| panic!("{error}"));
        assert_eq!(read.fingerprint(), fingerprint(), "{}", path.display());
        assert_eq!(read.inputs()[0].file, path.display().to_string());
        assert_eq!(read.inputs().len(), if path.ends_with("split.TOML") { 2 } else { 1 });
    }
}

/// The exact probabilities of the row of `a`, by the names of its targets, and the kinds of warnings.
fn row(moves: &str) -> (Vec<(String, String)>, Vec<WarningKind>) {
    let text = format!("start = \"a\"\nabsorbing = [\"x\", \"y\", \"z\"]\n[moves]\na = {{ {moves} }}\n");
    let model = Model::from_toml(&text).unwrap_or_else(|error| panic!("{moves}\n{error}"));
    let row = model.chain().row(0);
    let name = |i: usize| model.chain().name(row.targets[i] as usize).to_owned();
    let probabilities = (0..row.targets.len()).map(|i| (name(i), row.probability(i).to_string())).collect();
    let kinds = model.warnings().iter().map(|warning| warning.kind);
    (probabilities, kinds.filter(|kind| *kind != WarningKind::UnreachableEnds).collect())
}

/// The moves of `a` as written, its exact row, and the warnings.
type Case<'a> = (&'a str, &'a [(&'a str, &'a str)], &'a [WarningKind]);

// The rule: what is written is meant, in fractions; "rest" is exact; a sum within 1e-9 of 1 is corrected, a written stay
// taking the difference and otherwise every entry its share, and never is a stay or a move created.
#[test]
fn the_numbers_of_a_chain_are_those_that_were_written() {
    use WarningKind::CorrectedRow;
    let third = ("x", "1/3");
    let cases: &[Case<'_>] = &[
        ("x = 0.1, y = 0.2, z = 0.7", &[("x", "1/10"), ("y", "1/5"), ("z", "7/10")], &[]),
        ("x = \"1/3\", y = \"2/3\"", &[third, ("y", "2/3")], &[]),
        ("x = \"1/3\", y = \"rest\"", &[third, ("y", "2/3")], &[]),
        (
            "a = \"rest\", x = 1e-18",
            &[("a", "999999999999999999/1000000000000000000"), ("x", "1/1000000000000000000")],
            &[],
        ),
        (
            "a = 0.999999999999999999, x = \"rest\"",
            &[("a", "999999999999999999/1000000000000000000"), ("x", "1/1000000000000000000")],
            &[],
        ),
        // A rest of nothing is no move, nor is a written zero.
        ("x = 0.5, y = 0.5, z = \"rest\"", &[("x", "1/2"), ("y", "1/2")], &[]),
        ("x = 1, y = 0, z = 0.0", &[("x", "1")], &[]),
        // The stay is replaced, the leaves are untouched.
        (
            "a = 0.5, x = 0.4999999999",
            &[("a", "5000000001/10000000000"), ("x", "4999999999/10000000000")],
            &[CorrectedRow],
        ),
        ("a = 0.5000000001, x = 0.5", &[("a", "1/2"), ("x", "1/2")], &[CorrectedRow]),
        // The leaves alone are above 1, so every entry is divided by the sum: 1.0000000001 and a stay of 2e-10.
        (
            "a = 2e-10, x = 1.0000000000, y = 1e-10",
            &[("a", "2/10000000003"), ("x", "10000000000/10000000003"), ("y", "1/10000000003")],
            &[CorrectedRow],
        ),
        // No stay is created where none, or one of zero, is written.
        ("x = 0.3333333333, y = 0.3333333333, z = 0.3333333333", &[third, ("y", "1/3"), ("z", "1/3")], &[CorrectedRow]),
        ("a = 0, x = 0.9999999999", &[("x", "1")], &[CorrectedRow]),
        // The largest correction is 1e-9, on either side.
        ("x = 0.999999999", &[("x", "1")], &[CorrectedRow]),
        ("x = 1, y = 1e-9", &[("x", "1000000000/1000000001"), ("y", "1/1000000001")], &[CorrectedRow]),
    ];
    for (moves, expected, warnings) in cases {
        let expected: Vec<(String, String)> =
            expected.iter().map(|(to, value)| ((*to).to_owned(), (*value).to_owned())).collect();
        assert_eq!(row(moves), (expected, warnings.to_vec()), "{moves}");
    }
}

#[test]
fn a_corrected_row_is_told_with_its_place_and_its_sum() {
    let model = Model::from_toml(
        "start = { a = 0.5, b = 0.5000000001 }\nabsorbing = [\"x\"]\n[moves]\na = { x = 1 }\nb = { a = 0.5, x = 0.4999999998 }\n",
    );
    let model = model.unwrap();
    let texts: Vec<&str> = model.warnings().iter().map(|warning| warning.text.as_str()).collect();
    assert_eq!(
        texts,
        [
            "line 5: the moves of `b` sum to 0.9999999998; they were corrected so that they sum to 1 exactly",
            "line 1: the shares of the start sum to 1.0000000001; they were corrected so that they sum to 1 exactly",
        ]
    );
    assert!((model.largest_correction() / 2e-10 - 1.0).abs() < 1e-6);
}

#[test]
fn what_a_chain_leaves_open_is_told() {
    let model = Model::from_toml(
        r#"
        start = { a = 0.5, x = "rest" }
        absorbing = ["x", "y"]
        [moves]
        a = { x = 0.5, b = "rest" }
        b = { c = 1 }
        c = { b = 1 }
        d = { a = 1 }
        e = { f = 1 }
        f = { e = 1 }
        [classes]
        idle = ["f", "e"]
        "#,
    );
    let model = model.unwrap();
    let found: Vec<(WarningKind, &str)> = model.warnings().iter().map(|one| (one.kind, one.text.as_str())).collect();
    assert_eq!(
        found,
        [
            (
                WarningKind::UndeclaredClosedClass,
                "closed classes that the model does not declare are ends too, named after their first state: `b` (2 states)"
            ),
            (WarningKind::AbsorbingStart, "replications that start in `x` are over at time 0"),
            (WarningKind::UnreachableEnds, "the start cannot reach these ends: `idle`, `y`"),
            (WarningKind::UnreachableStates, "the start cannot reach these states: `d`"),
        ]
    );
    let ends: Vec<(&str, usize)> =
        model.chain().ends().iter().map(|end| (end.name.as_str(), end.states.len())).collect();
    assert_eq!(ends, [("b", 2), ("idle", 2), ("x", 1), ("y", 1)]);
}

#[test]
fn a_million_states_in_a_line_need_no_deep_stack() {
    const STATES: usize = 1_000_000;
    let mut table = String::with_capacity(STATES * 24);
    table.push_str("from,to,probability\n");
    for state in 0..STATES {
        writeln!(table, "{state},{},1", state + 1).unwrap();
    }
    let model = Model::from_table(&table, &options("0", &[&STATES.to_string()])).unwrap();
    assert_eq!((model.chain().states(), model.chain().components().len()), (STATES + 1, STATES));
    assert_eq!(model.chain().components()[0], [0]);
}

#[test]
fn many_unknown_states_are_told_without_comparing_each_with_every_name() {
    const STATES: usize = 50_000;
    let mut table = "from,to,probability\n".to_owned();
    for state in 0..STATES {
        writeln!(table, "from-{state},to-{state},1").unwrap();
    }
    let error = Model::from_table(&table, &options("from-0", &[])).unwrap_err();
    assert_eq!(error.faults().len(), STATES);
}
