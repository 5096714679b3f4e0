//! Nanoseconds a step of the path walker, beside one bare draw of its generator in the same run.
//!
//! `cargo bench --bench path_kernel`; the throughput is in steps (draws for the bare generator) a second.
#![allow(missing_docs)]

use std::hint::black_box;
use std::sync::Arc;

use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;
use tallystone::model::{Draft, Model, Silent};
use tallystone::sampling::{Grid, OutcomeSource, Sampler, Streams, Tally};

const DRAWS: u64 = 1 << 16;

fn bare_draw(c: &mut Criterion) {
    let mut group = c.benchmark_group("generator");
    group.throughput(Throughput::Elements(DRAWS));
    let mut rng = Lcg128CmDxsm64::new(1, 1);
    group.bench_function("bare draw", |b| b.iter(|| (0..DRAWS).fold(0, |all, _| all ^ black_box(rng.next_u64()))));
    group.finish();
}

/// A refurbishing bench of nine states, three of them ends; paths of about a dozen steps.
fn nine_states() -> Model {
    Model::from_toml(
        r#"
        start = "intake"
        absorbing = ["shipped", "parts", "scrapped"]
        [moves]
        intake   = { diagnose = 0.92, scrapped = "rest" }
        diagnose = { board = "5/12", case = 0.25, burn-in = "rest" }
        board    = { test = 0.7, diagnose = 0.2, parts = "rest" }
        case     = { test = 0.8, board = "rest" }
        burn-in  = { burn-in = 0.6, test = 0.3, board = "rest" }
        test     = { shipped = 0.2, diagnose = 0.5, burn-in = 0.25, scrapped = "rest" }
        "#,
    )
    .expect("well formed")
}

/// States with eight distinct random targets each; every hundredth has the end among them.
fn random_targets(states: u64) -> Model {
    let mut rng = Lcg128CmDxsm64::new(2, 2);
    let mut draft = Draft::new("random targets");
    draft.start("0");
    draft.absorbing("end");
    for state in 0..states {
        let mut targets: Vec<u64> = Vec::with_capacity(8);
        while targets.len() < 8 {
            let target = rng.next_u64() % states;
            if !targets.contains(&target) {
                targets.push(target);
            }
        }
        for (i, target) in targets.iter().enumerate() {
            let to = if i == 0 && state % 100 == 0 { "end".to_owned() } else { target.to_string() };
            draft.moves(&state.to_string(), &to, &format!("{}/72", 2 * i + 2));
        }
    }
    draft.check().expect("well formed")
}

fn walks(c: &mut Criterion) {
    let mut group = c.benchmark_group("path walker");
    for (name, model, replications) in
        [("9 states", nine_states(), 4096), ("100,000 states, 8 random targets each", random_targets(100_000), 200)]
    {
        let sampler = Sampler::new(model.chain());
        let grid = Arc::new(Grid::logarithmic());
        let walk = || {
            let mut tally = Tally::new(sampler.ends(), Arc::clone(&grid));
            sampler.block(Streams::new(1), 0, replications, &mut tally, &Silent).expect("nobody interrupts");
            tally
        };
        let steps = u64::try_from(walk().steps()).expect("few steps");
        group.throughput(Throughput::Elements(steps));
        group.bench_function(name, |b| b.iter(|| black_box(walk()).replications()));
    }
    group.finish();
}

criterion_group!(benches, bare_draw, walks);
criterion_main!(benches);
