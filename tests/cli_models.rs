//! How the program reads models: options, matrices, standard input.

use std::fs::{self, File};
use std::io::Write;
use std::process::{Command, Output, Stdio};

use serde_json::Value;
use tempfile::TempDir;

const TOML: &str = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { a = 0.75, x = 0.25 }\n";
const LIST: &str = "from,to,probability\na,a,0.75\na,x,0.25\nx,x,1\n";
const MATRIX: &str = "%%MatrixMarket matrix coordinate real general\n2 2 3\n1 1 0.75\n1 2 0.25\n2 2 1\n";

fn program() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_tallystone"));
    command.env_remove("COLUMNS").env_remove("NO_COLOR");
    command
}

fn directory() -> TempDir {
    let directory = tempfile::tempdir().unwrap();
    for (name, text) in [
        ("model.toml", TOML),
        ("list.csv", LIST),
        ("model.mtx", MATRIX),
        ("turned.mtx", &MATRIX.replace("1 2 0.25", "2 1 0.25")),
        ("rounded.mtx", &MATRIX.replace("0.25", "0.2499")),
        ("names.txt", "a\nx\n"),
        ("split.toml", "start = \"1\"\nabsorbing = [\"2\"]\nmoves_file = \"model.mtx\"\n"),
        ("outcomes.csv", "end,time\nx,1\nx,2\n"),
    ] {
        fs::write(directory.path().join(name), text).unwrap();
    }
    directory
}

fn run(directory: &TempDir, arguments: &[&str], input: Option<&str>) -> Output {
    let input = input.map_or(Stdio::null(), |name| File::open(directory.path().join(name)).unwrap().into());
    program().current_dir(directory).args(arguments).stdin(input).output().unwrap()
}

#[track_caller]
fn hold(output: &Output, status: i32, said: &str) {
    // Lines are as wide as the terminal.
    let shown = String::from_utf8_lossy(&output.stderr).split_whitespace().collect::<Vec<_>>().join(" ");
    assert_eq!(output.status.code(), Some(status), "{shown}");
    assert!(shown.contains(said), "{shown}");
}

#[test]
fn every_command_reads_matrices_and_takes_the_options() {
    let place = directory();
    let named = ["--start", "a", "--state-names", "names.txt"];
    for command in [
        &["exact"][..],
        &["check", "--quantity", "mean_time", "--quiet"],
        &["sample", "--replications", "100"],
        &["audit", "--outcomes", "outcomes.csv", "--quiet", "--quantity", "mean_time"],
    ] {
        let status = if command[0] == "audit" { 3 } else { 0 };
        for (model, options) in
            [("model.mtx", &[][..]), ("turned.mtx", &["--transpose"]), ("rounded.mtx", &["--rescale-rows", "0.001"])]
        {
            let arguments = [command, &[model], &named, options].concat();
            let done = run(&place, &arguments, None);
            hold(&done, status, if model == "rounded.mtx" { "the moves of `a` sum to 0.9999" } else { "" });
        }
        hold(&run(&place, &[command, &["-"], &named].concat(), Some("model.mtx")), status, "");
    }
    let refused = run(&place, &["exact", "rounded.mtx", "--start", "1"], None);
    hold(&refused, 65, "--rescale-rows LIMIT divides rows by their sum");
    hold(&run(&place, &["exact", "turned.mtx", "--start", "1"], None), 65, "read it with --transpose");
}

#[test]
fn a_model_from_standard_input_is_the_model_of_the_file() {
    let place = directory();
    let read = |arguments: &[&str], input: Option<&str>| -> Value {
        let done = run(&place, &[&["exact", "--json", "-"], arguments].concat(), input);
        hold(&done, 0, "");
        serde_json::from_slice(&done.stdout).unwrap()
    };
    for (name, options) in [
        ("model.toml", &[][..]),
        ("list.csv", &["--start", "a"]),
        ("model.mtx", &["--start", "1"]),
        // Its file of moves is looked for in the working directory.
        ("split.toml", &[]),
    ] {
        let file = read(&[&[name], options].concat(), None);
        let stream = read(&[&["-"], options].concat(), Some(name));
        assert_eq!(file["model"]["sha256"], stream["model"]["sha256"], "{name}");
        assert_eq!(file["rows"], stream["rows"], "{name}");
        assert_eq!(stream["inputs"][0]["file"], "standard input");
        assert_eq!(file["inputs"][0]["sha256"], stream["inputs"][0]["sha256"], "{name}");
    }
    fs::write(place.path().join("empty"), "").unwrap();
    hold(&run(&place, &["exact", "-"], Some("empty")), 65, "standard input: the table is empty");
    fs::write(place.path().join("broken.toml"), TOML.replace("0.25", "0.2")).unwrap();
    hold(&run(&place, &["exact", "-"], Some("broken.toml")), 65, "standard input:4: the moves of `a` sum to 0.95");
}

#[test]
fn options_that_do_not_fit_are_usage_errors() {
    let place = directory();
    for (arguments, said) in [
        (&["exact", "model.toml", "--state-names", "names.txt"][..], "--state-names is for tables"),
        (&["exact", "model.toml", "--transpose"], "--transpose is for tables"),
        (&["exact", "list.csv", "--state-names", "names.txt"], "list.csv names its states itself"),
        (&["exact", "model.toml", "--rescale-rows", "1e-12"], "--rescale-rows 0.000000000001 is not between"),
        (&["exact", "model.toml", "--rescale-rows", "much"], "give a number such as 1e-6"),
        (&["check", "--demo", "--transpose"], "--transpose"),
        (&["check", "--demo", "--state-names", "names.txt"], "--state-names"),
        (&["check", "--demo", "--rescale-rows", "0.1"], "--rescale-rows"),
        (&["audit", "-", "--outcomes", "-"], "is named for the model and for the outcomes; give one of them as a file"),
        (&["check", "-", "model.toml", "-"], "is named for two models; give one of them as a file"),
    ] {
        hold(&run(&place, arguments, Some("model.toml")), 2, said);
    }
    let missing = run(&place, &["exact", "model.mtx", "--start", "a", "--state-names", "none.txt"], None);
    hold(&missing, 74, "none.txt");
}

// Ctrl-C reaches both ends of a pipe: what was written until then is no whole model.
#[cfg(unix)]
#[test]
fn an_interrupted_model_is_no_model() {
    let place = directory();
    let mut command = program();
    command.current_dir(&place).args(["exact", "-"]);
    let mut child = command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    let mut pipe = child.stdin.take().unwrap();
    pipe.write_all(TOML.as_bytes()).unwrap();
    // The handler stands within milliseconds; a signal before it would end the program without a word.
    std::thread::sleep(std::time::Duration::from_millis(500));
    assert!(Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap().success());
    drop(pipe);
    let done = child.wait_with_output().unwrap();
    hold(&done, 130, "interrupted while reading the model");
    assert!(done.stdout.is_empty());
}
