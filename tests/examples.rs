//! The programs in examples/ run and say what they should.

use std::path::Path;
use std::process::Command;

/// The output of an example, which `cargo test` has built beside the program.
fn output(name: &str) -> String {
    let directory = Path::new(env!("CARGO_BIN_EXE_tallystone")).with_file_name("examples");
    let program = directory.join(name).with_extension(std::env::consts::EXE_EXTENSION);
    assert!(program.exists(), "{} is missing; run `cargo build --examples` first", program.display());
    let run = Command::new(program).output().unwrap();
    assert!(run.status.success(), "{}", String::from_utf8_lossy(&run.stderr));
    String::from_utf8(run.stdout).unwrap()
}

#[test]
fn chain_in_code_agrees() {
    let text = output("chain_in_code");
    // (3/8)³ = 27/512.
    assert!(text.starts_with("given up with probability 0.052734375 "), "{text}");
    assert!(text.trim_end().ends_with("replications: Agree"), "{text}");
}

#[test]
fn audit_in_memory_finds_the_forgotten_stay() {
    let text = output("audit_in_memory");
    assert!(text.contains("mean_time: Disagree"), "{text}");
    assert!(text.contains("absorption_probability:accepted: Agree"), "{text}");
    assert!(text.trim_end().ends_with("the audit says: Disagree"), "{text}");
}
