//! `audit`: somebody else's outcomes.

use std::time::Instant;

use super::arguments::Audit;
use super::failure::{Failure, of_verdict, refused};
use super::{Session, output, steps};
use crate::audit::read_outcomes;
use crate::compare::{Settings, Study};
use crate::exact::{Exact, Request};
use crate::report::{Body, Input};

/// Reads the model, solves, reads the outcomes, compares, writes.
pub(super) fn run(arguments: &Audit, session: &Session) -> Result<u8, Failure> {
    if steps::is_standard_input(&arguments.model) && steps::is_standard_input(&arguments.outcomes) {
        let text = "standard input, `-`, is named for the model and for the outcomes";
        return Err(Failure::Usage(refused("usage", text, "give one of them as a file")));
    }
    let model = steps::read(&arguments.model, &arguments.reading, session)?;
    let mut inputs = steps::files_of(&model);
    inputs.push(&arguments.outcomes);
    output::look_at_destinations(&[arguments.output.json.as_deref()], &inputs)?;
    let settings = Settings { outcomes_only: true, ..steps::settings(&arguments.comparing) };
    let started = Instant::now();
    let exact = Exact::solve(&model, &Request::of(&model, &Study::quantities(&model, &settings)), &session.watch)?;
    let study = Study::new(&exact, &settings)?;
    steps::look_at(&study.warnings(), &arguments.reading)?;
    let outcomes = read_outcomes(&arguments.outcomes, &study, &session.watch)?;
    let audited = outcomes.audited;
    let comparison = study.compare(&audited.tally, audited.findings);
    let verdict = comparison.verdict;

    let body = Body::Audit(comparison);
    let mut document = steps::compared(&study, &settings, body, &audited.tally, None, started);
    document.inputs.push(Input {
        file: outcomes.file,
        sha256: outcomes.sha256,
        rows: Some(outcomes.rows),
        bad_rows: Some(0),
        ignored_columns: outcomes.ignored_columns,
    });
    output::deliver(&steps::complete(document, &model, session), &arguments.output)?;
    Ok(of_verdict(verdict))
}
