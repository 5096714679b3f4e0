//! Exact answers: a full class, a long line, and the law of the time.
//!
//! Run with `cargo bench --bench elimination`. Compare ratios of one run; machines differ.

use std::hint::black_box;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use tallystone::exact::{Exact, Request};
use tallystone::model::{Draft, Model, Silent};

/// A class in which every state leads to every other, left with probability 1e-3.
fn full(states: usize) -> Model {
    let mut draft = Draft::new("full");
    let whole = 1000 * states * states;
    for i in 0..states {
        draft.moves(&format!("s{i}"), "end", "1/1000");
        for j in (0..states).filter(|j| *j != i) {
            let weight = 1 + (i * 7 + j * 13) % states;
            draft.moves(&format!("s{i}"), &format!("s{j}"), &format!("{weight}/{whole}"));
        }
        draft.moves(&format!("s{i}"), &format!("s{i}"), "rest");
    }
    draft.absorbing("end");
    draft.start("s0");
    draft.check().expect("a checked chain")
}

/// A walk on a line, which is one class with three moves a state at most.
fn line(states: usize) -> Model {
    let mut draft = Draft::new("line");
    for i in 0..states {
        let down = if i == 0 { "low".to_owned() } else { format!("s{}", i - 1) };
        let up = if i + 1 == states { "high".to_owned() } else { format!("s{}", i + 1) };
        draft.moves(&format!("s{i}"), &up, "0.5");
        draft.moves(&format!("s{i}"), &down, "0.5");
    }
    draft.absorbing("low");
    draft.absorbing("high");
    draft.start(&format!("s{}", states / 2));
    draft.check().expect("a checked chain")
}

fn elimination(c: &mut Criterion) {
    let mut group = c.benchmark_group("elimination");
    group.sample_size(10);
    for states in [100, 300, 1000] {
        let model = full(states);
        group.bench_with_input(BenchmarkId::new("full class", states), &model, |b, model| {
            b.iter(|| black_box(Exact::solve(model, &Request::default(), &Silent).expect("answers").mean_time()));
        });
    }
    for states in [1000, 100_000] {
        let model = line(states);
        group.bench_with_input(BenchmarkId::new("line", states), &model, |b, model| {
            b.iter(|| black_box(Exact::solve(model, &Request::default(), &Silent).expect("answers").mean_time()));
        });
    }
    group.finish();
}

fn law(c: &mut Criterion) {
    let mut group = c.benchmark_group("law");
    group.sample_size(10);
    // 62 steps to absorption in the mean for 16 states, 1,002 for 64: multiply-adds are moves times some 20 means.
    for states in [15, 63, 255] {
        let model = line(states);
        let request = Request { law: true, ..Request::default() };
        group.bench_with_input(BenchmarkId::new("line", states), &model, |b, model| {
            b.iter(|| black_box(Exact::solve(model, &request, &Silent).expect("answers").mean_time()));
        });
    }
    group.finish();
}

criterion_group!(benches, elimination, law);
criterion_main!(benches);
