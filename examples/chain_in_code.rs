//! A chain written in code, solved, sampled and compared.
//!
//! `cargo run --release --example chain_in_code`

use tallystone::compare::{Settings, Study};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Draft, Silent};
use tallystone::sampling::{Plan, Sampler, sample};

fn main() -> Result<(), Box<dyn std::error::Error>> {
    // A relay that is retried up to twice before it is given up.
    let mut draft = Draft::new("relay with two retries");
    draft.clock_unit("attempt");
    draft.start("first");
    for (attempt, next) in [("first", "second"), ("second", "third"), ("third", "given-up")] {
        draft.moves(attempt, "linked", "5/8");
        draft.moves(attempt, next, "rest");
    }
    draft.absorbing("linked");
    draft.absorbing("given-up");
    let model = draft.check()?;

    let settings = Settings::default();
    let quantities = Study::quantities(&model, &settings);
    let exact = Exact::solve(&model, &Request::of(&model, &quantities), &Silent)?;
    let given_up = exact.absorption(&model.ends_named("given-up").ok_or("no such end")?);
    println!("given up with probability {} (proven: {} to {})", given_up.value, given_up.low, given_up.high);

    let study = Study::new(&exact, &settings)?;
    let replications = study.plan().replications.ok_or("some row can never be decided")?;
    let plan = Plan { replications, seed: 7, grid: study.grid() };
    let tally = sample(&Sampler::new(model.chain()), &plan, &Silent)?;
    let comparison = study.compare(&tally, Vec::new());
    for row in &comparison.rows {
        println!("{}: {:?}", row.quantity, row.verdict);
    }
    println!("{replications} replications: {:?}", comparison.verdict);
    Ok(())
}
