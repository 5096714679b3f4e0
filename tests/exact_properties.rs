//! Properties of the exact answers over thousands of random chains: the truth, from fractions, lies inside every bound;
//! and the laws that any answer must obey. Chains are made from fixed seeds, so a pass or a failure repeats.

mod naive;

use dashu_ratio::RBig;
use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;
use tallystone::exact::{Bounded, Exact, ExactError, Request};
use tallystone::model::{Draft, Model, Silent};

/// A random chain as weights: `rows[i][j]` leads from state i to state j, the last `ends` columns being ends; the start
/// likewise.
#[derive(Clone)]
struct Weights {
    rows: Vec<Vec<u128>>,
    ends: usize,
    start: Vec<u128>,
}

fn below(rng: &mut Lcg128CmDxsm64, n: u64) -> u64 {
    rng.next_u64() % n
}

/// Up to seven states, sparse, with weights from 1 to 1e18, so that some states are left with a probability of 1e-18.
fn random(rng: &mut Lcg128CmDxsm64) -> Weights {
    let (states, ends) = (1 + below(rng, 7) as usize, 1 + below(rng, 3) as usize);
    let largest_power = [0, 3, 9, 18][below(rng, 4) as usize];
    let weight =
        |rng: &mut Lcg128CmDxsm64| u128::from(1 + below(rng, 9)) * 10u128.pow(below(rng, largest_power + 1) as u32);
    let mut rows = vec![vec![0; states + ends]; states];
    for (i, row) in rows.iter_mut().enumerate() {
        for cell in row.iter_mut() {
            if below(rng, 3) == 0 {
                *cell = weight(rng);
            }
        }
        // A way onwards, so that every state reaches an end.
        let onwards = if below(rng, 2) == 0 { states + below(rng, ends as u64) as usize } else { i + 1 };
        row[onwards] = row[onwards].max(1);
    }
    let mut start = vec![0; states + ends];
    start[below(rng, states as u64) as usize] = 1;
    if below(rng, 3) == 0 {
        // Several starts, ends that exist among them.
        let exists = |at: usize| at < states || rows.iter().any(|row| row[at] > 0);
        (0..states + ends).filter(|at| exists(*at)).for_each(|at| start[at] += u128::from(below(rng, 3)));
    }
    Weights { rows, ends, start }
}

impl Weights {
    /// The model, its states mentioned in the given order.
    fn model(&self, order: &[usize]) -> Model {
        let states = self.rows.len();
        let name = |state: usize| if state < states { format!("s{state}") } else { format!("end{}", state - states) };
        let mut draft = Draft::new("random");
        for from in order {
            let row = &self.rows[*from];
            let sum: u128 = row.iter().sum();
            for (to, weight) in row.iter().enumerate().filter(|(_, weight)| **weight > 0) {
                draft.moves(&name(*from), &name(to), &format!("{weight}/{sum}"));
            }
        }
        for end in 0..self.ends {
            if self.rows.iter().any(|row| row[states + end] > 0) {
                draft.absorbing(&name(states + end));
            }
        }
        let sum: u128 = self.start.iter().sum();
        for (state, share) in self.start.iter().enumerate().filter(|(_, share)| **share > 0) {
            draft.start_with(&name(state), &format!("{share}/{sum}"));
        }
        draft.check().unwrap_or_else(|error| panic!("{error}\n{:?}", self.rows))
    }

    fn in_order(&self) -> Model {
        self.model(&(0..self.rows.len()).collect::<Vec<_>>())
    }
}

fn solve(model: &Model) -> Exact<'_> {
    Exact::solve(model, &Request::default(), &Silent).unwrap()
}

/// Whether a fraction lies within bounds, compared exactly.
#[track_caller]
fn holds(bounded: Bounded, truth: &RBig, what: &str) {
    let exactly = |value: f64| RBig::try_from(value).unwrap();
    assert!(
        exactly(bounded.low) <= *truth && *truth <= exactly(bounded.high),
        "{what}: {bounded:?} does not hold {}",
        truth.to_f64().value()
    );
    assert!(bounded.low <= bounded.value && bounded.value <= bounded.high, "{what}: {bounded:?}");
}

/// Relative width, in units in the last place of a double.
fn units(bounded: Bounded) -> f64 {
    if bounded.value == 0.0 { 0.0 } else { (bounded.high - bounded.low) / (bounded.value.abs() * f64::EPSILON) }
}

#[test]
fn the_truth_lies_inside_every_bound_and_the_bounds_are_tight() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 1);
    let (mut slowest, mut widest) = (0.0f64, 0.0f64);
    for _ in 0..3000 {
        let model = random(&mut rng).in_order();
        let exact = solve(&model);
        let truth = naive::solve(model.chain());
        slowest = slowest.max(exact.mean_time().value);
        holds(exact.mean_time(), &truth.mean, "mean");
        assert!(units(exact.mean_time()) <= 3.0);
        holds(exact.variance_time(), &truth.variance, "variance");
        widest = widest.max(units(exact.variance_time()));
        for (end, (probability, time)) in truth.ends.iter().enumerate() {
            let answer = exact.absorption(&[end]);
            holds(answer, probability, "probability");
            assert!(units(answer) <= 3.0);
            match exact.mean_time_given(&[end]) {
                Some(given) => holds(given, &(time / probability), "mean given"),
                None => assert!(probability.is_zero()),
            }
        }
    }
    // The draws reach the hard cases.
    assert!(slowest > 1e17, "{slowest}");
    assert!(widest <= 4.0, "{widest}");
}

/// Up to four states in a ring of rare moves down to 1e-300, and starts as rare: at the edge of the arithmetic and beyond.
fn extreme(rng: &mut Lcg128CmDxsm64) -> Model {
    let rare = |rng: &mut Lcg128CmDxsm64| {
        let most = [12, 100, 300][below(rng, 3) as usize];
        let power = below(rng, most);
        format!("{}e-{}", 1 + below(rng, 9), power + 2)
    };
    let states = 2 + below(rng, 3) as usize;
    let mut draft = Draft::new("extreme");
    draft.absorbing("x");
    draft.absorbing("y");
    for state in 0..states {
        let from = format!("s{state}");
        draft.moves(&from, &format!("s{}", (state + 1) % states), "rest");
        for to in ["x", "y", &from] {
            // Every way into both ends exists at least once.
            if (state == 0 && to != from) || below(rng, 3) == 0 {
                draft.moves(&from, to, &rare(rng));
            }
        }
    }
    draft.start_with(&format!("s{}", below(rng, states as u64)), "rest");
    if below(rng, 3) == 0 {
        draft.start_with("x", &rare(rng));
    }
    draft.check().unwrap()
}

#[test]
fn at_the_edge_of_the_arithmetic_a_number_is_right_or_refused() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 6);
    let (mut refused, mut largest) = (0, 0.0f64);
    for _ in 0..2000 {
        let model = extreme(&mut rng);
        let exact = match Exact::solve(&model, &Request::default(), &Silent) {
            Ok(exact) => exact,
            Err(ExactError::OutOfRange { .. }) => {
                refused += 1;
                continue;
            }
            Err(error) => panic!("{error}"),
        };
        let truth = naive::solve(model.chain());
        largest = largest.max(exact.mean_time().value);
        holds(exact.mean_time(), &truth.mean, "mean");
        holds(exact.variance_time(), &truth.variance, "variance");
        assert!(units(exact.mean_time()) <= 3.0);
        for (end, (probability, time)) in truth.ends.iter().enumerate() {
            let answer = exact.absorption(&[end]);
            holds(answer, probability, "probability");
            assert!(units(answer) <= 3.0);
            holds(exact.mean_time_given(&[end]).unwrap(), &(time / probability), "mean given");
        }
    }
    // Both sides of the edge are reached.
    assert!((200..1800).contains(&refused) && largest > 1e90, "{refused} {largest:e}");
}

#[test]
fn an_overflow_or_an_underflow_is_refused_and_never_reads_zero() {
    let ring = |rare: &str| {
        let mut draft = Draft::new("ring");
        draft.moves("a", "b", rare);
        draft.moves("a", "x", "rest");
        draft.moves("b", "x", rare);
        draft.moves("b", "b", "rest");
        draft.absorbing("x");
        draft.start("a");
        draft.check().unwrap()
    };
    // b lives 1e160 steps and is seen once in 1e160 times: a variance of 2e160, although a square on the way overflows.
    for rare in ["1e-60", "1e-160", "1e-250"] {
        let model = ring(rare);
        let variance = solve(&model).variance_time();
        holds(variance, &naive::solve(model.chain()).variance, "variance");
        assert!(variance.value > 1e60 && units(variance) <= 10.0, "{variance:?}");
    }
    let refused =
        |model: &Model| matches!(Exact::solve(model, &Request::default(), &Silent), Err(ExactError::OutOfRange { .. }));
    assert!(refused(&ring("1e-272")));
    // A start that underflows.
    let mut draft = Draft::new("start");
    draft.moves("a", "x", "1");
    draft.moves("b", "y", "1");
    draft.absorbing("x");
    draft.absorbing("y");
    draft.start_with("b", "1e-350");
    draft.start_with("a", "rest");
    assert!(refused(&draft.check().unwrap()));
}

#[test]
fn a_variance_beyond_all_usual_sizes_is_held_relatively() {
    // Two states that pass one another to and fro, each left with 1e-120 a step: T is geometric but for its first step.
    let text = "start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { b = 0.5, c = 0.5 }\nb = { x = 1e-120, c = \"rest\" }\n\
                c = { x = 1e-120, b = \"rest\" }\n";
    let model = Model::from_toml(text).unwrap();
    let exact = solve(&model);
    holds(exact.variance_time(), &naive::solve(model.chain()).variance, "variance");
    assert!(units(exact.variance_time()) <= 4.0, "{:?}", exact.variance_time());
}

#[test]
fn a_line_that_drifts_apart_is_solved_from_the_middle() {
    let n = 200;
    let mut draft = Draft::new("apart");
    for i in 0..n {
        let left = if i == 0 { "low".to_owned() } else { format!("s{}", i - 1) };
        let right = if i == n - 1 { "high".to_owned() } else { format!("s{}", i + 1) };
        draft.moves(&format!("s{i}"), if i < n / 2 { &left } else { &right }, "0.999");
        draft.moves(&format!("s{i}"), if i < n / 2 { &right } else { &left }, "rest");
    }
    draft.absorbing("low");
    draft.absorbing("high");
    draft.start("s100");
    let model = draft.check().unwrap();
    let exact = solve(&model);
    let truth = naive::solve(model.chain());
    holds(exact.mean_time(), &truth.mean, "mean");
    holds(exact.variance_time(), &truth.variance, "variance");
    for (end, (probability, _)) in truth.ends.iter().enumerate() {
        holds(exact.absorption(&[end]), probability, "probability");
    }
}

#[test]
fn probabilities_sum_to_one_and_groups_add_up() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 2);
    for _ in 0..2000 {
        let model = random(&mut rng).in_order();
        let exact = solve(&model);
        let all: Vec<usize> = (0..model.chain().ends().len()).collect();
        assert_eq!(exact.absorption(&all), Bounded::exactly(1.0));
        let parts: Vec<Bounded> = all.iter().map(|end| exact.absorption(&[*end])).collect();
        let slack = 4.0 * f64::EPSILON;
        assert!(parts.iter().map(|part| part.low).sum::<f64>() <= 1.0 + slack);
        assert!(parts.iter().map(|part| part.high).sum::<f64>() >= 1.0 - slack);
        if all.len() > 1 {
            let pair = exact.absorption(&all[..2]);
            assert!((pair.value - parts[0].value - parts[1].value).abs() <= 4.0 * f64::EPSILON * pair.value);
        }
    }
}

#[test]
fn names_and_order_do_not_matter() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 3);
    for _ in 0..2000 {
        let weights = random(&mut rng);
        let mut order: Vec<usize> = (0..weights.rows.len()).collect();
        for i in (1..order.len()).rev() {
            order.swap(i, below(&mut rng, i as u64 + 1) as usize);
        }
        let (one, other) = (weights.in_order(), weights.model(&order));
        let (first, second) = (solve(&one), solve(&other));
        let meet = |a: Bounded, b: Bounded| assert!(a.low <= b.high && b.low <= a.high, "{a:?} {b:?}");
        meet(first.mean_time(), second.mean_time());
        meet(first.variance_time(), second.variance_time());
        for (end, found) in one.chain().ends().iter().enumerate() {
            let same = other.ends_named(&found.name).unwrap();
            meet(first.absorption(&[end]), second.absorption(&same));
        }
    }
}

#[test]
fn a_stay_added_to_every_state_scales_the_time_and_keeps_the_ends() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 4);
    for _ in 0..2000 {
        let weights = random(&mut rng);
        let mut slower = weights.clone();
        // Every move has a quarter of its probability left; so the time is four times as long in the mean.
        for (state, row) in slower.rows.iter_mut().enumerate() {
            row[state] += 3 * row.iter().sum::<u128>();
        }
        let (one, other) = (weights.in_order(), slower.in_order());
        let (fast, slow) = (solve(&one), solve(&other));
        let near = |a: f64, b: f64| assert!((a - b).abs() <= 4.0 * f64::EPSILON * b.abs(), "{a} {b}");
        near(slow.mean_time().value, 4.0 * fast.mean_time().value);
        for end in 0..one.chain().ends().len() {
            near(slow.absorption(&[end]).value, fast.absorption(&[end]).value);
        }
        // Given M moves the time is M plus negative-binomial stays: Var T = 16 Var M + 12 E M. A start in an end has M = 0.
        let expected = 16.0 * fast.variance_time().value + 12.0 * fast.mean_time().value;
        assert!((slow.variance_time().value / expected - 1.0).abs() < 1e-14);
    }
}

#[test]
fn the_law_agrees_with_fractions_step_by_step() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 5);
    for _ in 0..300 {
        let model = random(&mut rng).in_order();
        // Long lives only cost time here.
        if solve(&model).mean_time().value > 1e3 {
            continue;
        }
        let exact = Exact::solve(
            &model,
            &Request { law: true, levels: vec![0.5, 0.9], times: vec![12.0], ..Request::default() },
            &Silent,
        )
        .unwrap();
        let Ok(law) = exact.law() else { continue };
        let chain = model.chain();
        let mut mass = vec![RBig::ZERO; chain.states()];
        let start = chain.start();
        start.targets.iter().enumerate().for_each(|(i, state)| mass[*state as usize] += start.probability(i));
        for time in 0..=12u64.min(law.horizon()) {
            let transient = (0..chain.states()).filter(|state| chain.end_of(*state).is_none());
            let survival = naive::total(transient.map(|state| mass[state].clone()));
            holds(law.survival(time), &survival, "survival");
            if let Ok(edge) = law.edges().binary_search(&time) {
                for (end, found) in chain.ends().iter().enumerate() {
                    let entered = naive::total(found.states.iter().map(|state| mass[*state].clone()));
                    holds(law.at_edge(end, edge), &entered, "law");
                }
            }
            for level in ["1/2", "9/10"] {
                let p = level.parse::<RBig>().unwrap();
                let quantile = law.quantile(p.to_f64().value());
                let reached = RBig::ONE - &survival >= p;
                if let Some(quantile) = quantile {
                    assert!(if reached { quantile.low <= time as f64 } else { quantile.high > time as f64 });
                }
            }
            let mut next = vec![RBig::ZERO; chain.states()];
            for (state, here) in mass.iter().enumerate().filter(|(_, here)| !here.is_zero()) {
                if chain.end_of(state).is_some() {
                    next[state] += here;
                }
                let row = chain.row(state);
                row.targets.iter().enumerate().for_each(|(i, to)| next[*to as usize] += row.probability(i) * here);
            }
            mass = next;
        }
    }
}
