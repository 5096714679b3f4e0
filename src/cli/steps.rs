//! The steps that commands share.

use std::io;
use std::path::Path;
use std::time::{Instant, SystemTime, UNIX_EPOCH};

use rand::TryRng;
use rand::rngs::SysRng;

use super::arguments::{Comparing, DEFAULT_SEED, Reading, Sampling, Seed, Warnings};
use super::failure::{Failure, refused};
use super::{Session, output};
use crate::compare::{Settings, Study};
use crate::exact::{Exact, ExactError, Request};
use crate::model::{Clock, Model, Progress, ReadOptions, Silent, Ticks, Tolerance, ToleranceKey, Tolerances, Warning};
use crate::report::{Body, Document, Input, ModelSummary, PlanSummary, RunSummary, SeedSource};
use crate::sampling::{OutcomeSource, Plan, Sampler, Tally, sample_with};

/// Whether a path stands for standard input.
pub(super) fn is_standard_input(path: &Path) -> bool {
    path.as_os_str() == "-"
}

/// Reads a model and says what deserves a look.
pub(super) fn read(path: &Path, reading: &Reading, session: &Session) -> Result<Model, Failure> {
    let options = ReadOptions {
        start: reading.start.clone(),
        absorbing: reading.absorbing.clone(),
        state_names: reading.state_names.clone(),
        transpose: reading.transpose,
        rescale_rows: reading.rescale_rows.clone(),
    };
    let model = if is_standard_input(path) {
        Model::read_from(io::stdin().lock(), "standard input", &options)
    } else {
        Model::read(path, &options)
    };
    // The program at the other end of a pipe stops by the same signal, and what it wrote until then is no whole model.
    if session.watch.interrupted() {
        return Err(Failure::Interrupted("interrupted while reading the model; no result was written".to_owned()));
    }
    let model = model?;
    look_at(model.warnings(), reading)?;
    Ok(model)
}

/// The files that a model was read from.
pub(super) fn files_of(model: &Model) -> Vec<&Path> {
    model.inputs().iter().map(|input| Path::new(&input.file)).collect()
}

/// Prints warnings, and stops if the user refuses them.
pub(super) fn look_at(warnings: &[Warning], reading: &Reading) -> Result<(), Failure> {
    output::warn(warnings);
    if reading.warnings == Warnings::Refuse && !warnings.is_empty() {
        let text = format!("{} warnings, which --warnings refuse does not let pass", warnings.len());
        return Err(Failure::Data(refused("warnings", text, "see to them, or allow them")));
    }
    Ok(())
}

/// The wishes for a comparison.
pub(super) fn settings(comparing: &Comparing) -> Settings {
    let collected = |given: &[(ToleranceKey, Tolerance)]| {
        let mut all = Tolerances::default();
        given.iter().for_each(|(key, value)| all.set(key.clone(), *value));
        all
    };
    Settings {
        error_rate: comparing.error_rate,
        power: comparing.power,
        quantities: (!comparing.quantities.is_empty()).then(|| comparing.quantities.clone()),
        tolerances: collected(&comparing.tolerances),
        detectable: collected(&comparing.detectable),
        look: comparing.look,
        outcomes_only: false,
    }
}

/// The seed and where it comes from.
pub(super) fn seed(sampling: &Sampling) -> Result<(u64, SeedSource), Failure> {
    match sampling.seed {
        None => Ok((DEFAULT_SEED, SeedSource::Default)),
        Some(Seed::Fixed(seed)) => Ok((seed, SeedSource::Given)),
        Some(Seed::Random) => {
            let seed = SysRng.try_next_u64().map_err(|error| {
                Failure::Io(refused("io", format!("the system gives no random number: {error}"), "give a seed"))
            })?;
            Ok((seed, SeedSource::Random))
        }
    }
}

/// Runs work on the number of threads asked for.
pub(super) fn on_threads<T: Send>(
    sampling: &Sampling,
    work: impl FnOnce() -> Result<T, Failure> + Send,
) -> Result<T, Failure> {
    let threads = sampling.threads.map_or(0, usize::from);
    let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().map_err(|error| {
        Failure::Io(refused("io", format!("the system gives no threads: {error}"), "ask for fewer with --threads"))
    })?;
    pool.install(work)
}

/// Steps that a pilot should take: some milliseconds.
const PILOT_STEPS: f64 = 1e6;
/// A step is faster than this on no machine.
const FASTEST_STEP_SECONDS: f64 = 5e-10;

/// The sampler of a model. In continuous time the exact solver chooses the ticks, or where it refuses the model a guess by
/// the mean holding times does.
pub(super) fn sampler(model: &Model, session: &Session) -> Result<Sampler, Failure> {
    let chain = model.chain();
    if model.clock() == Clock::Steps {
        return Ok(Sampler::new(chain));
    }
    let longest = match Exact::solve(model, &Request::default(), &session.watch) {
        Ok(exact) => exact.longest_mean_time(),
        Err(ExactError::Interrupted) => return Err(ExactError::Interrupted.into()),
        Err(_) => {
            let held =
                (0..chain.states()).filter_map(|state| chain.rate(state)).map(|rate| 1.0 / rate.to_f64().value());
            1024.0 * held.sum::<f64>()
        }
    };
    Ok(Sampler::in_ticks(chain, Ticks::for_longest(longest)))
}

/// Seconds that sampling will take, by a short pilot on one thread; from the number of steps alone where even the pilot
/// would be long.
pub(super) fn predicted_seconds(sampler: &dyn OutcomeSource, plan: &Plan, mean_steps: f64) -> f64 {
    let threads = rayon::current_num_threads() as f64;
    let steps = mean_steps * plan.replications as f64;
    let replications = (PILOT_STEPS / mean_steps.max(1.0)).clamp(1.0, 4096.0) as u64;
    if mean_steps * replications as f64 > 100.0 * PILOT_STEPS {
        return steps * FASTEST_STEP_SECONDS / threads;
    }
    let pilot = Plan { replications: replications.min(plan.replications), ..plan.clone() };
    let started = Instant::now();
    let piloted = sample_with(sampler, &pilot, &Silent);
    debug_assert!(piloted.is_ok(), "nobody interrupts a silent run");
    started.elapsed().as_secs_f64() / pilot.replications as f64 * plan.replications as f64 / threads
}

/// The document of a comparison.
pub(super) fn compared(
    study: &Study<'_>,
    settings: &Settings,
    body: Body,
    tally: &Tally,
    seed: Option<(u64, SeedSource)>,
    started: Instant,
) -> Document {
    let (exact, size) = (study.exact(), study.plan());
    let model = exact.model();
    let mut document = Document::new(ModelSummary::of(model), body);
    document.plan = Some(PlanSummary {
        error_rate: Some(settings.spent()),
        look: settings.look,
        rows: study.rows(),
        power: Some(settings.power),
        replications: size.replications,
        demanding: size.demanding,
        seed,
    });
    document.run = Some(RunSummary {
        replications: Some(tally.replications()),
        steps: tally.ticks().is_steps().then(|| tally.steps()),
        times: tally.range().filter(|_| tally.ticks().is_steps()),
        seconds: started.elapsed().as_secs_f64(),
        solver: Some(exact.solver()),
    });
    document.warnings = model.warnings().iter().cloned().chain(study.warnings()).collect();
    document
}

/// Fills in what is known of every run.
pub(super) fn complete(mut document: Document, model: &Model, session: &Session) -> Document {
    document.command.clone_from(&session.command);
    document.inputs.splice(0..0, model.inputs().iter().map(Input::from));
    let now = SystemTime::now().duration_since(UNIX_EPOCH);
    document.when = now.ok().map(|since| since.as_secs());
    document
}
