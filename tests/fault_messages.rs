//! Every kind of fault of a model, as a user reads it; the golden file is meant to be read aloud.

mod golden;

use std::collections::BTreeSet;
use std::fmt::Write;

use golden::golden;
use tallystone::model::{Model, ReadOptions};

/// A right model with something wrong put in.
const RIGHT: &str = "start = \"intake\"\nabsorbing = [\"shipped\", \"scrapped\"]\n[moves]\n\
                     intake = { board = 0.9, scrapped = 0.1 }\nboard = { shipped = 0.8, intake = \"rest\" }\n";

/// What is replaced by what.
const WRONG: &[(&str, &str)] = &[
    ("board = 0.9", "board = 0,9"),
    ("start =", "strat = 1\nstart ="),
    ("board = 0.9", "board = \"often\""),
    ("board = 0.9", "board = nan"),
    ("board = 0.9", "board = -0.9"),
    ("board = 0.9", "board = 1.9"),
    ("board = 0.9", "board = 0.8"),
    ("shipped = 0.8", "shipped = \"rest\""),
    ("shipped = 0.8", "shipped = 0.8, scrapped = 0.3"),
    ("shipped = 0.8", "shiped = 0.8"),
    ("start = \"intake\"", "start = { intake = 0.5, board = 0.4 }"),
    ("start = \"intake\"\n", ""),
    ("start = \"intake\"", "start = \"shipped\""),
    ("start = \"intake\"", "start = 5"),
    ("board = { shipped", "shipped = { board = 1 }\nboard = { shipped"),
    ("intake = { board = 0.9, scrapped = 0.1 }", "\"\" = { board = 1 }\nintake = { board = 0.9, scrapped = 0.1 }"),
    ("[moves]", "[groups]\nlost = [\"scraped\"]\n[moves]"),
    ("[moves]", "[groups]\nintake = [\"scrapped\"]\n[moves]"),
    ("[moves]", "[classes]\nidle = [\"board\"]\n[moves]"),
    ("[moves]", "compare = [\"mean_tme\"]\n[moves]"),
    ("[moves]", "compare = [\"mean_cost:labour\"]\n[moves]"),
    ("[moves]", "compare = [\"survival_probability:2.5\"]\n[moves]"),
    ("[moves]", "[tolerance]\nmean_time = \"much\"\n[moves]"),
    ("[moves]", "[costs.labour]\nvisit = { shipped = 1 }\n[moves]"),
    ("[moves]", "[costs.labour]\nmove = [{ from = \"board\", to = \"scrapped\", cost = 1 }]\n[moves]"),
    ("[moves]", "[costs.labour]\nvisit = { board = 1e30 }\n[moves]"),
    ("[moves]", "[hits.seen]\nstates = [\"bord\"]\n[moves]"),
    ("start =", "clock = \"hours\"\nstart ="),
    ("start =", "clock = \"rates\"\nstart ="),
];

/// Tables with something wrong.
const TABLES: &[&str] = &[
    "",
    "from,to,prob\na,shipped,1\n",
    "a,shipped,1\n",
    "from,to,probability\na,shipped,0.5\na,shipped,0.5\n",
    "from,to,probability\na,shipped\n",
    "from,to,rate\na,a,2\na,shipped,1\n",
    ",a,shipped\na,0.5\nshipped,0,1\n",
    ",a,b,shipped\na,0.5,0.2,0\nb,0.5,0,0\nshipped,0,0.8,1\n",
];

#[test]
fn every_fault_is_told_with_its_place_and_its_remedy() {
    let mut text = String::new();
    let mut kinds = BTreeSet::new();
    let mut tell = |input: &str, read: Result<Model, tallystone::model::ModelError>| {
        let Err(error) = read else { return writeln!(text, "{input}\n").unwrap() };
        writeln!(text, "{}", input.trim_end()).unwrap();
        for fault in error.faults() {
            kinds.insert(format!("{:?}", fault.kind));
            writeln!(text, "    → {fault}").unwrap();
        }
        writeln!(text).unwrap();
    };
    for (right, wrong) in WRONG {
        let model = RIGHT.replacen(right, wrong, 1);
        assert_ne!(model, RIGHT);
        tell(wrong, Model::from_toml(&model));
    }
    let place = tempfile::tempdir().unwrap();
    let path = place.path().join("moves.csv");
    for table in TABLES {
        std::fs::write(&path, table).unwrap();
        let options =
            ReadOptions { start: Some("a".into()), absorbing: vec!["shipped".into()], ..ReadOptions::default() };
        tell(table, Model::read(&path, &options));
    }
    let text = text.replace(&path.display().to_string(), "moves.csv");
    golden("faults.txt", &text);
    assert!(kinds.len() >= 20, "{kinds:?}");
}
