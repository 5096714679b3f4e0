//! `exact`: the answers alone.

use std::time::Instant;

use super::arguments::Exact as Arguments;
use super::failure::{Failure, refused, status};
use super::{Session, output, steps};
use crate::compare::{Settings, Study};
use crate::exact::{Exact, Request};
use crate::model::{Model, Quantity};
use crate::report::{Answer, Body, Document, ModelSummary, RunSummary};

/// Reads, solves, writes.
pub(super) fn run(arguments: &Arguments, session: &Session) -> Result<u8, Failure> {
    let model = steps::read(&arguments.model, &arguments.reading, session)?;
    let quantities = quantities(arguments, &model)?;
    output::look_at_destinations(&[arguments.output.json.as_deref()], &steps::files_of(&model))?;
    let started = Instant::now();
    let exact = Exact::solve(&model, &Request::of(&model, &quantities), &session.watch)?;
    let answers = quantities.into_iter().map(|quantity| answer(&exact, quantity)).collect();
    let mut document = Document::new(ModelSummary::of(&model), Body::Exact(answers));
    let seconds = started.elapsed().as_secs_f64();
    document.run =
        Some(RunSummary { replications: None, steps: None, times: None, seconds, solver: Some(exact.solver()) });
    document.warnings = model.warnings().to_vec();
    output::deliver(&steps::complete(document, &model, session), &arguments.output)?;
    Ok(status::WORKED)
}

/// Those asked for, or all that a check may compare and the standard deviation.
fn quantities(arguments: &Arguments, model: &Model) -> Result<Vec<Quantity>, Failure> {
    if arguments.quantities.is_empty() {
        let mut all = Study::quantities(model, &Settings::default());
        all.retain(|quantity| *quantity != Quantity::Law);
        if let Some(at) = all.iter().position(|quantity| *quantity == Quantity::VarianceTime) {
            all.insert(at + 1, Quantity::SdTime);
        }
        return Ok(all);
    }
    for quantity in &arguments.quantities {
        model.resolve(quantity).map_err(|fault| Failure::Usage(refused("usage", fault.text, fault.remedy)))?;
        if *quantity == Quantity::Law {
            let text = "`law` is compared, but it is no single number that could be printed";
            let remedy = "ask for survival_probability:T or time_quantile:P";
            return Err(Failure::Usage(refused("usage", text, remedy)));
        }
    }
    Ok(arguments.quantities.clone())
}

fn answer(exact: &Exact<'_>, quantity: Quantity) -> Answer {
    let (answer, note) = match exact.answer(&quantity) {
        Ok(Some(answer)) => (Some(answer), None),
        Ok(None) => (None, Some("undefined, since no replication comes there".to_owned())),
        Err(refusal) => (None, Some(refusal.to_string())),
    };
    Answer { quantity, exact: answer, note }
}
