//! Holds the faults of broken models to what they should be.

use tallystone::model::{FaultKind, Model, ModelError, ReadOptions};

/// Parts of remedies that several faults share.
pub(crate) const IN_RANGE: &str = "probabilities lie between 0 and 1";
pub(crate) const AS_NUMBER: &str = "write a decimal such as 0.25";
pub(crate) const GIVE_MOVES: &str = "give it moves, or declare it absorbing";

/// A fault as it should be: kind, line (0 for none), state and value (empty for none), part of the text, part of the
/// remedy.
pub(crate) type Expected<'a> = (FaultKind, u64, &'a str, &'a str, &'a str, &'a str);

/// Holds the faults of a model to the expected ones, all of them and no others.
#[track_caller]
pub(crate) fn hold(read: Result<Model, ModelError>, input: &str, expected: &[Expected<'_>]) {
    let error = read.expect_err(input);
    let faults = error.faults();
    let shown = error.to_string();
    assert_eq!(faults.len(), expected.len(), "{input}\n{shown}");
    for (fault, (kind, line, state, value, text, remedy)) in faults.iter().zip(expected) {
        let seen = (
            fault.kind,
            fault.place.line.unwrap_or(0),
            fault.state.as_deref().unwrap_or(""),
            fault.value.as_deref().unwrap_or(""),
        );
        assert_eq!(seen, (*kind, *line, *state, *value), "{input}\n{shown}");
        assert!(fault.text.contains(text), "{input}\n{fault}");
        assert!(fault.remedy.contains(remedy), "{input}\n{fault}");
        assert!(!fault.remedy.is_empty() && shown.contains(&fault.text), "{input}\n{shown}");
    }
}

/// Start and declared absorbing states of a table; no start if its name is empty.
pub(crate) fn options(start: &str, absorbing: &[&str]) -> ReadOptions {
    ReadOptions {
        start: (!start.is_empty()).then(|| start.to_owned()),
        absorbing: absorbing.iter().map(|name| (*name).to_owned()).collect(),
        ..ReadOptions::default()
    }
}
