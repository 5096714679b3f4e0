//! `demo`: the example model, and outcome files of a right and a wrong simulator.

use std::fs;
use std::path::Path;
use std::sync::Arc;

use super::arguments::Demo;
use super::failure::{Failure, status};
use super::sample::write_outcomes;
use super::{Session, output};
use crate::model::Model;
use crate::sampling::{Grid, ObservedSampler, Plan, Sampler};

/// The field-radio refurbishing bench.
const MODEL: &str = include_str!("demo/bench.toml");
const COOLING: &str = include_str!("demo/cooling.toml");
/// The line that the wrong simulator gets wrong, and what it makes of it: too few radios fail their test.
const RIGHT: &str = "test     = { shipped = 0.7, rework = 0.25, scrapped = \"rest\" }";
const WRONG: &str = "test     = { shipped = 0.75, rework = 0.2, scrapped = \"rest\" }";
const REPLICATIONS: u64 = 100_000;
/// Not the default seed of `check`, so that the files are no copy of its run.
const SEED: u64 = 2_026;

/// The example model.
pub(super) fn model() -> Result<Model, Failure> {
    Ok(Model::from_toml(MODEL)?)
}

/// Writes the files.
pub(super) fn run(arguments: &Demo, session: &Session) -> Result<u8, Failure> {
    let directory = &arguments.directory;
    fs::create_dir_all(directory).map_err(|error| Failure::io(directory, &error))?;
    let bench = output::new_file(directory, "bench.toml")?;
    let cooling = output::new_file(directory, "cooling.toml")?;
    let right = output::new_file(directory, "outcomes-right.csv")?;
    let wrong = output::new_file(directory, "outcomes-wrong.csv")?;
    output::write(&bench, |out| out.write_all(MODEL.as_bytes()))?;
    output::write(&cooling, |out| out.write_all(COOLING.as_bytes()))?;
    outcomes(MODEL, &right, session)?;
    outcomes(&MODEL.replace(RIGHT, WRONG), &wrong, session)?;
    let shown = |path: &Path| path.display().to_string();
    output::print(|out| {
        writeln!(out, "{}  the model", shown(&bench))?;
        writeln!(out, "{}  outcomes of a simulator that follows it", shown(&right))?;
        writeln!(out, "{}  outcomes of one that lets too many radios pass their test", shown(&wrong))?;
        writeln!(out, "{}  another model, in continuous time, with a cost", shown(&cooling))?;
        writeln!(out, "\nTry: tallystone audit {} --outcomes {}", shown(&bench), shown(&wrong))
    })?;
    Ok(status::WORKED)
}

fn outcomes(text: &str, path: &Path, session: &Session) -> Result<(), Failure> {
    let model = Model::from_toml(text)?;
    let plan = Plan { replications: REPLICATIONS, seed: SEED, grid: Arc::new(Grid::new(Vec::new())) };
    let sampler = Sampler::new(model.chain());
    let watching = ObservedSampler::new(&sampler, &model, [].into());
    write_outcomes(path, &watching, &plan, model.chain(), &session.watch).map(drop)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_mistake_is_planted_in_a_line_of_the_model() {
        assert_eq!(MODEL.matches(RIGHT).count(), 1);
        let (right, wrong) =
            (Model::from_toml(MODEL).unwrap(), Model::from_toml(&MODEL.replace(RIGHT, WRONG)).unwrap());
        assert_ne!(right.fingerprint(), wrong.fingerprint());
        assert!(right.warnings().is_empty());
        assert!(Model::from_toml(COOLING).unwrap().warnings().is_empty());
    }
}
