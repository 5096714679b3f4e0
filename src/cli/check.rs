//! `check`: the main job.

use std::time::Instant;

use super::arguments::Check;
use super::failure::{Failure, of_verdict, refused};
use super::{Session, demo, output, steps, tell};
use crate::compare::{SizePlan, Study, Verdict};
use crate::exact::{Exact, Request};
use crate::model::Model;
use crate::report::{Body, duration, rounded, thousands};
use crate::sampling::{BLOCK, ObservedSampler, OutcomeSource, Plan, Sampler, sample_with};

/// Longest run that is started unasked.
const UNASKED_SECONDS: f64 = 600.0;

/// Checks every model; the worst verdict counts.
pub(super) fn run(arguments: &Check, session: &Session) -> Result<u8, Failure> {
    if arguments.models.len() > 1 && arguments.output.json.is_some() {
        let text = format!("--json holds one result, and {} models are given", arguments.models.len());
        return Err(Failure::Usage(refused("usage", text, "run one model at a time")));
    }
    if arguments.models.iter().filter(|path| steps::is_standard_input(path)).count() > 1 {
        let text = "standard input, `-`, is named for two models";
        return Err(Failure::Usage(refused("usage", text, "give one of them as a file")));
    }
    if arguments.demo {
        let model = demo::model()?;
        steps::look_at(model.warnings(), &arguments.reading)?;
        return Ok(of_verdict(one(&model, arguments, session)?));
    }
    let mut worst = Verdict::Agree;
    // A model that cannot be checked leaves the others their turn; the first such gives the status.
    let mut failed = None;
    for (number, path) in arguments.models.iter().enumerate() {
        if number > 0 && !arguments.output.quiet {
            output::print(|out| out.write_all(b"\n"))?;
        }
        match steps::read(path, &arguments.reading, session).and_then(|model| one(&model, arguments, session)) {
            Ok(verdict) => worst = worst.max(verdict),
            Err(failure @ (Failure::Data(_) | Failure::Io(_) | Failure::Undecided(_)))
                if arguments.models.len() > 1 =>
            {
                tell(&failure, session, None);
                failed = failed.or(Some(failure.status(false)));
            }
            Err(failure) => return Err(failure),
        }
    }
    Ok(failed.unwrap_or_else(|| of_verdict(worst)))
}

/// Reads, solves, samples, compares, writes.
fn one(model: &Model, arguments: &Check, session: &Session) -> Result<Verdict, Failure> {
    output::look_at_destinations(&[arguments.output.json.as_deref()], &steps::files_of(model))?;
    let settings = steps::settings(&arguments.comparing);
    let (seed, seed_source) = steps::seed(&arguments.sampling)?;
    let started = Instant::now();
    let exact = Exact::solve(model, &Request::of(model, &Study::quantities(model, &settings)), &session.watch)?;
    let study = Study::new(&exact, &settings)?;
    steps::look_at(&study.warnings(), &arguments.reading)?;

    let size = study.plan();
    let sampler = Sampler::in_ticks(model.chain(), study.ticks());
    let watching = ObservedSampler::new(&sampler, model, study.observed());
    let replications = arguments.sampling.replications.or(size.replications).unwrap_or(BLOCK);
    let plan = Plan { replications, seed, grid: study.grid() };
    let tally = steps::on_threads(&arguments.sampling, || {
        allow(&watching, &plan, &exact, &size, arguments)?;
        let steps = exact.mean_moves() * replications as f64;
        session.watch.expect(format!(", some {} steps", thousands(steps as u64)));
        Ok(sample_with(&watching, &plan, &session.watch)?)
    })?;
    let comparison = study.compare(&tally, Vec::new());
    let verdict = comparison.verdict;

    let document =
        steps::compared(&study, &settings, Body::Check(comparison), &tally, Some((seed, seed_source)), started);
    output::deliver(&steps::complete(document, model, session), &arguments.output)?;
    Ok(verdict)
}

/// Refuses a run that is predicted to take longer than allowed.
fn allow(
    sampler: &dyn OutcomeSource,
    plan: &Plan,
    exact: &Exact<'_>,
    size: &SizePlan,
    arguments: &Check,
) -> Result<(), Failure> {
    let unasked = arguments.sampling.replications.is_none().then_some(UNASKED_SECONDS);
    let Some(limit) = arguments.time_limit.or(unasked) else { return Ok(()) };
    let seconds = steps::predicted_seconds(sampler, plan, exact.mean_moves());
    if seconds <= limit {
        return Ok(());
    }
    let demanding = match (&size.demanding, size.without) {
        (Some(quantity), Some(without)) if arguments.sampling.replications.is_none() => format!(
            "; `{quantity}` needs most, and without it {} replications would do, about {}",
            thousands(without),
            duration(seconds * without as f64 / plan.replications as f64)
        ),
        (Some(quantity), _) if arguments.sampling.replications.is_none() => format!("; `{quantity}` needs most"),
        _ => String::new(),
    };
    let text = format!(
        "the run is not started: {} replications of {} steps in the mean would take about {}, more than the limit of {}{demanding}",
        thousands(plan.replications),
        rounded(exact.mean_moves(), 3),
        duration(seconds),
        duration(limit)
    );
    let remedy = "allow more with --time-limit, widen a tolerance, or choose rows with --quantity";
    Err(Failure::Undecided(refused("not_started", text, remedy)))
}
