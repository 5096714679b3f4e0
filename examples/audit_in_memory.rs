//! A simulator of one's own, audited without a file: its outcomes go straight into the comparison.
//!
//! `cargo run --release --example audit_in_memory`

use rand_pcg::Pcg64Mcg;
use rand_pcg::rand_core::Rng;
use tallystone::audit::Collector;
use tallystone::compare::{Settings, Study};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Model, Silent};

const MODEL: &str = r#"
    title = "battery pack at the acceptance desk"
    clock_unit = "cycle"
    start = "charging"
    absorbing = ["accepted", "returned"]
    [moves]
    charging = { charging = 0.2, testing = 0.8 }
    testing  = { accepted = 0.7, charging = 0.25, returned = "rest" }
"#;

/// The simulator under audit. Its author forgot that a pack can stay on the charger for another cycle.
fn simulate(rng: &mut impl Rng) -> (&'static str, u64) {
    let mut uniform = || (rng.next_u64() >> 11) as f64 / (1u64 << 53) as f64;
    let mut cycles = 0;
    loop {
        cycles += 2;
        match uniform() {
            u if u < 0.7 => return ("accepted", cycles),
            u if u < 0.95 => {}
            _ => return ("returned", cycles),
        }
    }
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let model = Model::from_toml(MODEL)?;
    let settings = Settings::default();
    let exact = Exact::solve(&model, &Request::of(&model, &Study::quantities(&model, &settings)), &Silent)?;
    let study = Study::new(&exact, &settings)?;

    let mut collector = Collector::new(&study);
    let mut rng = Pcg64Mcg::new(42);
    for _ in 0..100_000 {
        let (end, cycles) = simulate(&mut rng);
        collector.add(end, cycles, None)?;
    }
    let audited = collector.finish();
    let comparison = study.compare(&audited.tally, audited.findings);
    for row in &comparison.rows {
        println!("{}: {:?}", row.quantity, row.verdict);
    }
    println!("the audit says: {:?}", comparison.verdict);
    Ok(())
}
