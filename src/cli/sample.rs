//! `sample`: the sampler alone.

use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::Instant;

use super::arguments::{Output, Sample};
use super::failure::{Failure, status};
use super::{Session, output, steps};
use crate::model::{Chain, Model, Progress, Ticks};
use crate::report::{Body, Document, ModelSummary, PlanSummary, RunSummary};
use crate::sampling::{Grid, Observable, ObservedSampler, OutcomeSource, Plan, Streams, Tally, estimates, sample_with};

/// Replications where none are asked for.
const REPLICATIONS: u64 = 100_000;

/// Reads, samples, writes.
pub(super) fn run(arguments: &Sample, session: &Session) -> Result<u8, Failure> {
    let model = steps::read(&arguments.model, &arguments.reading, session)?;
    let (seed, seed_source) = steps::seed(&arguments.sampling)?;
    let replications = arguments.sampling.replications.unwrap_or(REPLICATIONS);
    let plan = Plan { replications, seed, grid: Arc::new(Grid::logarithmic()) };
    let sampler = steps::sampler(&model, session)?;
    let costs = (0..model.costs().len()).map(Observable::Cost);
    let observed = costs.chain((0..model.hits().len()).map(Observable::Hit)).collect();
    let watching = ObservedSampler::new(&sampler, &model, observed);
    let files = [&arguments.write_outcomes, &arguments.write_tally, &arguments.output.json];
    output::look_at_destinations(&files.map(Option::as_deref), &steps::files_of(&model))?;
    let started = Instant::now();
    // A result on standard output stands there alone.
    let is_taken = |path: &Option<PathBuf>| path.as_deref().is_some_and(output::is_standard_output);
    let quiet = arguments.output.quiet || is_taken(&arguments.write_outcomes) || is_taken(&arguments.write_tally);
    let destination = Output { quiet, ..arguments.output.clone() };
    let tally = match &arguments.write_outcomes {
        Some(path) => write_outcomes(path, &watching, &plan, model.chain(), &session.watch)?,
        None => steps::on_threads(&arguments.sampling, || Ok(sample_with(&watching, &plan, &session.watch)?))?,
    };
    let seconds = started.elapsed().as_secs_f64();
    if let Some(path) = &arguments.write_tally {
        output::write(path, |out| write!(out, "{tally}"))?;
    }
    let document = document(&model, &tally, &plan, seed_source, seconds);
    output::deliver(&steps::complete(document, &model, session), &destination)?;
    Ok(status::WORKED)
}

fn document(
    model: &Model,
    tally: &Tally,
    plan: &Plan,
    seed_source: crate::report::SeedSource,
    seconds: f64,
) -> Document {
    let mut document = Document::new(ModelSummary::of(model), Body::Sample(estimates(model, tally)));
    document.plan = Some(PlanSummary {
        error_rate: None,
        look: None,
        rows: 0,
        power: None,
        replications: Some(plan.replications),
        demanding: None,
        seed: Some((plan.seed, seed_source)),
    });
    let replications = Some(tally.replications());
    let is_in_steps = tally.ticks().is_steps();
    let steps = is_in_steps.then(|| tally.steps());
    let times = tally.range().filter(|_| is_in_steps);
    document.run = Some(RunSummary { replications, steps, times, seconds, solver: None });
    document.warnings = model.warnings().to_vec();
    document
}

/// Samples one replication after another, which are the same as those of any number of threads, and writes each.
pub(super) fn write_outcomes(
    path: &Path,
    sampler: &ObservedSampler<'_>,
    plan: &Plan,
    chain: &Chain,
    progress: &dyn Progress,
) -> Result<Tally, Failure> {
    let mut tally =
        Tally::observing(sampler.ends(), Arc::clone(&plan.grid), sampler.observed()).in_ticks(sampler.ticks());
    let mut interrupted = None;
    let walked = output::write(path, |out| {
        progress.begin("sampling", "replications", Some(plan.replications));
        walk(out, sampler, plan, chain, &mut tally, progress).inspect_err(|_| interrupted = Some(tally.replications()))
    });
    progress.end();
    match interrupted {
        Some(done) if progress.interrupted() => {
            Err(Failure::Interrupted(format!("interrupted after {done} replications; no whole result was written")))
        }
        _ => walked.map(|()| tally),
    }
}

fn walk(
    out: &mut dyn Write,
    sampler: &ObservedSampler<'_>,
    plan: &Plan,
    chain: &Chain,
    tally: &mut Tally,
    progress: &dyn Progress,
) -> io::Result<()> {
    let names: Vec<String> = chain.ends().iter().map(|end| quoted(&end.name)).collect();
    writeln!(out, "replication,end,time")?;
    let streams = Streams::new(plan.seed);
    let mut values = vec![None; sampler.observed().len()];
    for block in 0..plan.blocks() {
        let mut rng = streams.block(block);
        for _ in 0..plan.replications_in(block) {
            let walked = sampler.walk(&mut rng, &mut values, progress);
            let outcome = walked.map_err(|stopped| io::Error::other(stopped.to_string()))?;
            let (number, end) = (tally.replications(), &names[outcome.end as usize]);
            match sampler.ticks() {
                Ticks::STEPS => writeln!(out, "{number},{end},{}", outcome.time)?,
                ticks => writeln!(out, "{number},{end},{}", ticks.time(outcome.time))?,
            }
            tally.add_observed(outcome.end as usize, outcome.time, &values);
        }
        progress.advance(plan.replications_in(block));
        if progress.interrupted() {
            return Err(io::Error::other("interrupted"));
        }
    }
    Ok(())
}

/// A field of a CSV file, quoted where it must be.
fn quoted(name: &str) -> String {
    if name.contains([',', '"', '\n', '\r']) { format!("\"{}\"", name.replace('"', "\"\"")) } else { name.to_owned() }
}
