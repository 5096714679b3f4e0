//! The program as people and build servers meet it: statuses, help, text, JSON.
//!
//! Golden output stands in tests/snapshots; `TALLYSTONE_REWRITE_SNAPSHOTS=1 cargo test --test cli` writes it anew, to be
//! read before it is committed.

mod golden;

use std::fs;
use std::io::{Read, Write};
use std::path::Path;
use std::process::{Child, Command, Output, Stdio};

use golden::golden;
use serde_json::Value;
use tempfile::TempDir;

const MODEL: &str = include_str!("../src/cli/demo/bench.toml");

fn program() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_tallystone"));
    command.env_remove("COLUMNS").env_remove("NO_COLOR");
    command
}

fn run(arguments: &[&str]) -> Output {
    program().args(arguments).output().unwrap()
}

fn status(output: &Output) -> i32 {
    output.status.code().expect("no signal")
}

fn out(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

fn err(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

/// A directory with the bench and some files beside it.
fn directory(files: &[(&str, &str)]) -> TempDir {
    let directory = tempfile::tempdir().unwrap();
    fs::write(directory.path().join("bench.toml"), MODEL).unwrap();
    for (name, text) in files {
        fs::write(directory.path().join(name), text).unwrap();
    }
    directory
}

fn within(directory: &TempDir, arguments: &[&str]) -> Output {
    program().current_dir(directory).args(arguments).output().unwrap()
}

#[test]
fn the_demo_agrees_and_looks_as_it_should() {
    let demo = run(&["check", "--demo"]);
    assert_eq!(status(&demo), 0, "{}", err(&demo));
    golden("check-demo.txt", &out(&demo));
    let text = out(&demo);
    assert!(text.contains("No other program was\ntested; use `audit`."), "{text}");
    assert!(text.contains("safety, medical or financial"), "{text}");
    let narrow = program().env("COLUMNS", "60").args(["check", "--demo"]).output().unwrap();
    golden("check-demo-60-columns.txt", &out(&narrow));
    for (width, text) in [(80, text), (60, out(&narrow))] {
        assert!(text.lines().all(|line| line.chars().count() <= width), "{text}");
    }
}

#[test]
fn exact_and_sample_print_their_tables() {
    let place = directory(&[]);
    let exact = within(&place, &["exact", "bench.toml"]);
    assert_eq!(status(&exact), 0);
    golden("exact.txt", &out(&exact));
    let asked = within(&place, &["exact", "bench.toml", "--quantity", "survival_probability:10"]);
    assert!(out(&asked).contains("survival_probability:10"), "{}", out(&asked));
    let sample = within(&place, &["sample", "bench.toml", "--replications", "20_000", "--write-tally", "tally.txt"]);
    golden("sample.txt", &out(&sample));
    assert!(fs::read_to_string(place.path().join("tally.txt")).unwrap().starts_with("tallystone tally 1\n"));
}

/// The document without what the clock says.
fn timeless(json: &str) -> Value {
    let mut document: Value = serde_json::from_str(json).unwrap();
    document["when"] = Value::Null;
    document["run"]["seconds"] = Value::Null;
    document["tool"]["version"] = Value::Null;
    document
}

/// Numbers to ten digits: the last ones of an interval depend on the mathematical library of the system.
fn to_ten_digits(value: &mut Value) {
    match value {
        Value::Array(values) => values.iter_mut().for_each(to_ten_digits),
        Value::Object(fields) => fields.values_mut().for_each(to_ten_digits),
        Value::Number(number) if number.is_f64() => {
            *value = format!("{:.9e}", number.as_f64().unwrap()).parse::<f64>().unwrap().into();
        }
        _ => {}
    }
}

#[test]
fn json_has_the_documented_fields_in_their_order() {
    let place = directory(&[]);
    let check = within(&place, &["check", "bench.toml", "--json", "-"]);
    assert_eq!(status(&check), 0);
    let text = out(&check);
    let document: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(document["schema"], "tallystone.check/1");
    assert!(document["run"]["seconds"].is_number() && document["when"].is_number());
    assert_eq!(document["run"]["replications"], document["plan"]["replications"]);
    assert!(document["plan"]["seed"].is_string());
    for row in document["rows"].as_array().unwrap() {
        let number = |field: &str| row[field].as_f64();
        if let (Some(exact), Some(low), Some(high)) = (number("exact"), number("exact_low"), number("exact_high")) {
            assert!(low <= exact && exact <= high, "{row}");
        }
        assert_eq!(row["verdict"], "agree", "{row}");
    }
    let mut steady = timeless(&text);
    to_ten_digits(&mut steady);
    let golden_text = serde_json::to_string_pretty(&steady).unwrap();
    golden("check.json", &(golden_text + "\n"));
    // serde_json sorts the keys of a value; the order of the text itself is looked at here.
    let keys = [
        "schema",
        "tool",
        "command",
        "inputs",
        "model",
        "plan",
        "run",
        "rows",
        "findings",
        "not_compared",
        "verdict",
        "warnings",
        "cautions",
        "when",
    ];
    let mut places: Vec<usize> = keys.iter().map(|key| text.find(&format!("\n  \"{key}\":")).expect(key)).collect();
    let found = places.clone();
    places.sort_unstable();
    assert_eq!(found, places);
}

#[test]
fn a_result_repeats_but_for_the_clock_on_any_number_of_threads() {
    let place = directory(&[]);
    let documents: Vec<Value> = ["1", "2", "16"]
        .map(|threads| {
            let arguments = ["check", "bench.toml", "--seed", "77", "--threads", threads, "--json", "-"];
            let mut document = timeless(&out(&within(&place, &arguments)));
            document["command"] = Value::Null;
            document
        })
        .into();
    assert_eq!(documents[0], documents[1]);
    assert_eq!(documents[0], documents[2]);
    let tallies: Vec<String> = ["1", "2", "16"]
        .map(|threads| {
            let arguments = ["sample", "bench.toml", "--threads", threads, "--write-tally", "t.txt", "--quiet"];
            assert_eq!(status(&within(&place, &arguments)), 0);
            fs::read_to_string(place.path().join("t.txt")).unwrap()
        })
        .into();
    assert!(tallies[0] == tallies[1] && tallies[0] == tallies[2]);
}

#[test]
fn an_audit_finds_the_planted_mistake_and_not_the_right_simulator() {
    let place = tempfile::tempdir().unwrap();
    let demo = within(&place, &["demo", "files"]);
    assert_eq!(status(&demo), 0, "{}", err(&demo));
    golden("demo.txt", &out(&demo));
    let right = within(&place, &["audit", "files/bench.toml", "--outcomes", "files/outcomes-right.csv"]);
    assert_eq!(status(&right), 0, "{}", out(&right));
    let wrong = within(&place, &["audit", "files/bench.toml", "--outcomes", "files/outcomes-wrong.csv"]);
    assert_eq!(status(&wrong), 1, "{}", out(&wrong));
    golden("audit-wrong.txt", &out(&wrong));
    // Files are never overwritten.
    let again = within(&place, &["demo", "files"]);
    assert_eq!(status(&again), 2);
    assert!(err(&again).contains("bench.toml") && err(&again).contains("exists already"), "{}", err(&again));
}

#[test]
fn impossible_outcomes_are_findings_and_bad_rows_bad_data() {
    let place = directory(&[
        ("impossible.csv", "end,time\nshipped,1\nshipped,5\n"),
        ("bad.csv", "end,time\nshiped,4\nparts,2.5\nparts,-1\n"),
        ("empty.csv", ""),
    ]);
    let impossible = within(&place, &["audit", "bench.toml", "--outcomes", "impossible.csv", "--json", "-"]);
    assert_eq!(status(&impossible), 1);
    let document: Value = serde_json::from_str(&out(&impossible)).unwrap();
    assert_eq!(document["findings"][0]["end"], "shipped");
    assert_eq!(document["findings"][0]["line"], 2);
    let bad = within(&place, &["audit", "bench.toml", "--outcomes", "bad.csv", "--json", "-"]);
    assert_eq!(status(&bad), 65);
    for part in ["bad.csv:2", "`shipped`", "bad.csv:3", "`2.5`", "bad.csv:4", "`-1`"] {
        assert!(err(&bad).contains(part), "{part}: {}", err(&bad));
    }
    let refusal: Value = serde_json::from_str(&out(&bad)).unwrap();
    assert_eq!(refusal["schema"], "tallystone.error/1");
    assert_eq!(refusal["errors"].as_array().unwrap().len(), 3);
    assert_eq!(status(&within(&place, &["audit", "bench.toml", "--outcomes", "empty.csv"])), 65);
}

#[test]
fn every_kind_of_end_has_its_status() {
    let place = directory(&[("broken.toml", "start = \"a\"\n[moves]\na = { b = 0.5 }\n")]);
    for (arguments, expected, says) in [
        (&["check", "nothing.toml"][..], 74, "nothing.toml"),
        (&["check", "broken.toml"], 65, "broken.toml:3"),
        (&["check"], 2, "--demo"),
        (&["check", "--demo", "--tolerence", "mean_time=1"], 2, "--tolerance"),
        (&["chekc", "--demo"], 2, "check"),
        (&["check", "--demo", "--tolerance", "mean_tim=1"], 2, "mean_time"),
        (&["check", "--demo", "--tolerance", "absorption_probability:shiped=0.1"], 2, "`shipped`"),
        (&["check", "--demo", "--quantity", "mean_time_given:scraped"], 2, "`scrapped`"),
        (&["check", "--demo", "--error-rate", "2"], 2, "between 0 and 1"),
        (&["check", "--demo", "--replications", "many"], 2, "whole number"),
        (&["check", "--demo", "--replications", "4096"], 3, ""),
        (&["check", "--demo", "--tolerance", "mean_time=0", "--quantity", "mean_time"], 0, ""),
        (&["check", "--demo", "--tolerance", "mean_time=1e-6"], 3, "not started"),
        (&["check", "bench.toml", "--json", "bench.toml"], 2, "overwritten"),
        (&["check", "bench.toml", "--json", "no/such/place.json"], 74, "no/such/place.json"),
        (&["check", "bench.toml", "--start", "intke"], 65, "intke"),
        (&["audit", "bench.toml"], 2, "--outcomes"),
        (&["audit", "bench.toml", "--outcomes", "nothing.csv"], 74, "nothing.csv"),
        (&["exact", "bench.toml", "--quantity", "law"], 2, "no single number"),
        (&["check", "--demo", "--start", "board"], 2, "--start"),
        (&["check", "--demo", "--absorbing", "board"], 2, "--absorbing"),
        (&["sample", "bench.toml", "--write-tally", "both.txt", "--json", "./both.txt"], 2, "two results"),
        (&["sample", "bench.toml", "--write-tally", "."], 74, "directory"),
        (&["sample", "bench.toml", "--threads", "5000"], 2, "1024"),
        (&["audit", "bench.toml", "--outcomes", "broken.toml", "--json", "broken.toml"], 2, "overwritten"),
        (&["--help"], 0, ""),
        (&["--version"], 0, ""),
    ] {
        let output = within(&place, arguments);
        assert_eq!(status(&output), expected, "{arguments:?}: {}{}", out(&output), err(&output));
        assert!(err(&output).contains(says), "{arguments:?}: {}", err(&output));
    }
    // A result that could not be written leaves no half file behind.
    let names: Vec<_> = fs::read_dir(&place).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert_eq!(names.len(), 2, "{names:?}");
}

// The run would take ages: the place of its result is looked at before.
#[test]
fn a_result_without_a_place_is_refused_before_the_work() {
    let place = directory(&[]);
    endless(place.path());
    let refused = within(&place, &["sample", "endless.toml", "--json", "no/such/place.json"]);
    assert_eq!(status(&refused), 74);
    assert!(err(&refused).starts_with("error: no/such/place.json: ") && !err(&refused).contains(".tallystone-"));
}

// A device takes the file in place, so only its writing fails.
#[cfg(target_os = "linux")]
#[test]
fn a_result_that_cannot_be_written_is_still_printed() {
    let place = directory(&[]);
    let full = within(&place, &["check", "bench.toml", "--json", "/dev/full"]);
    assert_eq!(status(&full), 74, "{}", err(&full));
    assert!(out(&full).contains("Verdict:") && err(&full).contains("/dev/full"), "{}", err(&full));
}

#[test]
fn several_models_count_by_the_worst() {
    let place = directory(&[("coin.toml", "start = \"t\"\nabsorbing = [\"h\"]\n[moves]\nt = { t = 0.5, h = 0.5 }\n")]);
    let both = within(&place, &["check", "bench.toml", "coin.toml"]);
    assert_eq!(status(&both), 0, "{}", err(&both));
    assert_eq!(out(&both).matches("Verdict:").count(), 2);
    let one_undecided = within(&place, &["check", "coin.toml", "bench.toml", "--replications", "4096"]);
    assert_eq!(status(&one_undecided), 3);
}

#[test]
fn a_faulty_model_among_several_leaves_the_others_their_turn() {
    let place = directory(&[("coin.toml", "start = \"t\"\nabsorbing = [\"h\"]\n[moves]\nt = { t = 0.5, h = 0.5 }\n")]);
    let both = within(&place, &["check", "nothing.toml", "coin.toml"]);
    assert_eq!(status(&both), 74);
    assert!(err(&both).contains("nothing.toml") && out(&both).contains("Verdict: ● agree"), "{}", err(&both));
}

#[test]
fn wrong_arguments_are_an_object_too_where_json_is_asked_for() {
    for arguments in
        [["check", "--demo", "--json", "-", "--replication", "5"], ["exact", "--json=-", "a", "b", "c", "d"]]
    {
        let wrong = run(&arguments);
        assert_eq!(status(&wrong), 2);
        let document: Value = serde_json::from_str(&out(&wrong)).unwrap();
        assert_eq!(document["schema"], "tallystone.error/1");
        assert_eq!(document["errors"][0]["kind"], "usage");
    }
    assert!(out(&run(&["check", "--demo", "--json", "x", "--replication", "5"])).is_empty());
}

// What one command writes another reads, without a file between them.
#[test]
fn a_dash_is_standard_output_and_input() {
    let place = directory(&[]);
    let arguments = ["sample", "bench.toml", "--replications", "5000", "--seed", "2", "--write-outcomes"];
    let written = within(&place, &[&arguments[..], &["outcomes.csv"]].concat());
    assert!(out(&written).contains("standard error"));
    let printed = within(&place, &[&arguments[..], &["-"]].concat());
    assert_eq!(out(&printed), fs::read_to_string(place.path().join("outcomes.csv")).unwrap());
    let twice = within(&place, &[&arguments[..], &["-", "--json", "-"]].concat());
    assert_eq!(status(&twice), 2, "{}", err(&twice));

    let audit = |name: &str| {
        let outcomes = fs::File::open(place.path().join("outcomes.csv")).unwrap();
        let arguments = ["audit", "bench.toml", "--outcomes", name, "--json", "-"];
        let done = program().current_dir(&place).args(arguments).stdin(outcomes).output().unwrap();
        serde_json::from_str::<Value>(&out(&done)).unwrap()
    };
    let (from_file, from_pipe) = (audit("outcomes.csv"), audit("-"));
    assert_eq!(from_file["rows"], from_pipe["rows"]);
    assert_eq!(from_pipe["inputs"][1]["file"], "standard input");
    assert_eq!(from_file["inputs"][1]["sha256"], from_pipe["inputs"][1]["sha256"]);
}

#[cfg(unix)]
#[test]
fn a_link_stays_a_link() {
    let place = directory(&[("old.json", "old")]);
    std::os::unix::fs::symlink("old.json", place.path().join("link.json")).unwrap();
    assert_eq!(status(&within(&place, &["check", "bench.toml", "--json", "link.json"])), 0);
    assert!(fs::symlink_metadata(place.path().join("link.json")).unwrap().is_symlink());
    assert!(fs::read_to_string(place.path().join("old.json")).unwrap().contains("tallystone.check/1"));
}

// More rows than are shown: those about all replications are among them.
#[test]
fn of_many_rows_alike_the_common_ones_are_shown() {
    let ends: Vec<String> = (0..30).map(|i| format!("e{i} = \"1/60\"")).collect();
    let names: Vec<String> = (0..30).map(|i| format!("\"e{i}\"")).collect();
    let model =
        format!("start = \"a\"\nabsorbing = [{}]\n[moves]\na = {{ a = 0.5, {} }}\n", names.join(","), ends.join(","));
    let place = directory(&[("many.toml", &model)]);
    let check = within(&place, &["check", "many.toml"]);
    let text = out(&check);
    for name in ["mean_time ", "variance_time", "time_quantile:0.9 ", "law ", "more rows, none worse"] {
        assert!(text.contains(name), "{name}: {text}");
    }
}

#[test]
fn warnings_are_printed_and_can_be_refused() {
    let place = directory(&[(
        "lone.toml",
        "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = 0.5, a = 0.5 }\nlost = { x = 1 }\n",
    )]);
    let allowed = within(&place, &["exact", "lone.toml"]);
    assert_eq!(status(&allowed), 0);
    assert!(err(&allowed).contains("`lost`"), "{}", err(&allowed));
    assert_eq!(status(&within(&place, &["exact", "lone.toml", "--warnings", "refuse"])), 65);
}

#[test]
fn colour_only_where_it_is_wanted() {
    let place = directory(&[]);
    let colored = within(&place, &["check", "bench.toml", "--color", "always"]);
    assert!(out(&colored).contains("\u{1b}[32m"));
    let plain = within(&place, &["check", "bench.toml"]);
    assert!(!out(&plain).contains('\u{1b}'));
}

#[test]
fn written_outcomes_are_those_of_the_tally() {
    let place = directory(&[]);
    let written = within(
        &place,
        &["sample", "bench.toml", "--replications", "5000", "--write-outcomes", "o.csv", "--write-tally", "a.txt"],
    );
    assert_eq!(status(&written), 0);
    within(&place, &["sample", "bench.toml", "--replications", "5000", "--write-tally", "b.txt", "--quiet"]);
    let read = |name: &str| fs::read_to_string(place.path().join(name)).unwrap();
    assert_eq!(read("a.txt"), read("b.txt"));
    assert_eq!(read("o.csv").lines().count(), 5001);
    assert!(read("o.csv").starts_with("replication,end,time\n0,"));
}

#[test]
fn a_reader_that_goes_away_is_no_panic() {
    let place = directory(&[]);
    let mut child = program()
        .current_dir(&place)
        .args(["check", "bench.toml", "--json", "-"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let mut said = String::new();
    child.stderr.take().unwrap().read_to_string(&mut said).unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(74));
    assert!(!said.contains("panic"), "{said}");
}

/// A model of which a single path takes ages.
fn endless(place: &Path) {
    let text = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { x = \"1/1000000000000000\", a = \"rest\" }\n";
    fs::write(place.join("endless.toml"), text).unwrap();
}

/// Sends a signal to a program that has started.
#[cfg(unix)]
fn send(signal: &str, child: &Child) {
    // The handler stands within milliseconds; a signal before it would end the program with the same status.
    std::thread::sleep(std::time::Duration::from_millis(500));
    let sent = Command::new("kill").args([&format!("-{signal}"), &child.id().to_string()]).status().unwrap();
    assert!(sent.success());
}

// Ctrl-C reaches both ends of a pipe: the simulator stops, and what it wrote until then is no whole file.
#[cfg(unix)]
#[test]
fn an_audit_of_an_interrupted_simulator_gives_no_verdict() {
    let place = directory(&[]);
    let mut child = program()
        .current_dir(&place)
        .args(["audit", "bench.toml", "--outcomes", "-"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut pipe = child.stdin.take().unwrap();
    pipe.write_all(b"end,time\nshipped,5\n").unwrap();
    send("INT", &child);
    drop(pipe);
    let done = child.wait_with_output().unwrap();
    assert_eq!(status(&done), 130, "{}", err(&done));
    assert!(out(&done).is_empty() && err(&done).contains("interrupted"), "{}", out(&done));
}

#[cfg(unix)]
#[test]
fn an_interrupted_run_ends_cleanly() {
    let place = directory(&[]);
    endless(place.path());
    for (signal, expected) in [("INT", 130), ("TERM", 143)] {
        let mut child = program()
            .current_dir(&place)
            .args(["sample", "endless.toml", "--replications", "1000000"])
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        send(signal, &child);
        let mut said = String::new();
        child.stderr.take().unwrap().read_to_string(&mut said).unwrap();
        assert_eq!(child.wait().unwrap().code(), Some(expected), "{said}");
        assert!(said.contains("interrupted"), "{said}");
    }
    let started = within(&place, &["check", "endless.toml"]);
    assert_eq!(status(&started), 3, "{}", err(&started));
}

#[test]
fn help_names_every_command() {
    let help = run(&["--help"]);
    golden("help.txt", &out(&help));
    for command in ["check", "exact", "sample", "audit", "demo"] {
        assert!(out(&help).contains(command));
        let own = run(&[command, "--help"]);
        assert_eq!(status(&own), 0);
        assert!(out(&own).contains("Exit status"));
    }
}

#[test]
fn the_readme_shows_what_the_program_prints() {
    let readme = include_str!("../README.md").replace("\r\n", "\n");
    assert!(readme.contains(MODEL.trim_end()), "the model of the README is not that of the demo");
    for (name, text) in [
        ("exact.txt", include_str!("snapshots/exact.txt")),
        ("check-demo.txt", include_str!("snapshots/check-demo.txt")),
        ("audit-wrong.txt", include_str!("snapshots/audit-wrong.txt")),
    ] {
        assert!(readme.contains(text.trim_end()), "the README does not show {name}");
    }
}
