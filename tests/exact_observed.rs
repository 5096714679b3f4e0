//! Visits, costs and first passages: the truth, in fractions, inside every bound over random chains; and published chains.

mod naive;

use std::collections::BTreeMap;

use dashu_ratio::RBig;
use naive::System;
use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;
use tallystone::exact::{Bounded, Exact, Request};
use tallystone::model::{Draft, Model, Quantity, Silent};

fn below(rng: &mut Lcg128CmDxsm64, n: u64) -> u64 {
    rng.next_u64() % n
}

fn quantity(text: &str) -> Quantity {
    Quantity::parse(text).unwrap()
}

/// The answers to some quantities, by their names.
fn answers(model: &Model, names: &[String]) -> BTreeMap<String, Option<Bounded>> {
    let quantities: Vec<Quantity> = names.iter().map(|name| quantity(name)).collect();
    quantities.iter().for_each(|one| model.resolve(one).unwrap());
    let exact = Exact::solve(model, &Request::of(model, &quantities), &Silent).unwrap();
    names.iter().zip(&quantities).map(|(name, one)| (name.clone(), exact.answer(one).unwrap())).collect()
}

#[track_caller]
fn holds(found: Bounded, truth: &RBig, what: &str) {
    let exactly = |value: f64| RBig::try_from(value).unwrap();
    assert!(
        exactly(found.low) <= *truth && *truth <= exactly(found.high),
        "{what}: {found:?} does not hold {}",
        truth.to_f64().value()
    );
    assert!(found.low <= found.value && found.value <= found.high, "{what}: {found:?}");
}

/// Two to six states with weights from 1 to 1e12, a cost of both signs, and a set of states that may hold ends.
fn random(rng: &mut Lcg128CmDxsm64) -> Model {
    let states = 2 + below(rng, 5) as usize;
    let power = [0, 3, 12][below(rng, 3) as usize];
    let mut draft = Draft::new("random");
    draft.absorbing("x");
    draft.absorbing("y");
    let mut amounts = Vec::new();
    for state in 0..states {
        let mut row = BTreeMap::new();
        for to in 0..states + 2 {
            if below(rng, 3) == 0 || to == state + 1 || (state == 0 && to >= states) {
                row.insert(to, u128::from(1 + below(rng, 9)) * 10u128.pow(below(rng, power + 1) as u32));
            }
        }
        let sum: u128 = row.values().sum();
        let name = |to: usize| if to < states { format!("s{to}") } else { ["x", "y"][to - states].to_owned() };
        for (to, weight) in row {
            draft.moves(&name(state), &name(to), &format!("{weight}/{sum}"));
            if below(rng, 3) == 0 {
                amounts.push((name(state), Some(name(to)), below(rng, 200)));
            }
        }
        if below(rng, 2) == 0 {
            amounts.push((name(state), None, below(rng, 200)));
        }
    }
    draft.visit_cost("labour", "s0", "1/3");
    for (from, to, amount) in amounts {
        let amount = format!("{}", (amount as f64 - 100.0) / 8.0);
        match to {
            Some(to) => draft.move_cost("labour", &from, &to, &amount),
            None if from != "s0" => draft.visit_cost("labour", &from, &amount),
            None => {}
        }
    }
    let members = ["s1", "x"];
    draft.hit("met", &members[..=below(rng, 2) as usize]);
    let first = format!("s{}", below(rng, states as u64));
    let second = ["s0", "x"][below(rng, 2) as usize];
    if first == second {
        draft.start(&first);
    } else {
        draft.start_with(&first, "2/3");
        draft.start_with(second, "rest");
    }
    draft.check().unwrap()
}

#[test]
fn the_truth_lies_inside_every_bound() {
    let mut rng = Lcg128CmDxsm64::new(20_261_201, 7);
    let (mut negative, mut impossible, mut widest) = (0, 0, 0.0f64);
    for _ in 0..1500 {
        let model = random(&mut rng);
        let chain = model.chain();
        let names = [
            "mean_visits:s1",
            "variance_visits:s1",
            "visit_probability:s1",
            "mean_cost:labour",
            "variance_cost:labour",
            "covariance_time_cost:labour",
            "hit_probability:met",
            "mean_time_given_hit:met",
        ];
        let found = answers(&model, &names.map(str::to_owned));
        let zero = |_: usize| RBig::ZERO;
        let one = |_: usize, _: usize| RBig::ONE;
        let (s1, cost, hit) = (chain.state("s1").unwrap(), &model.costs()[0], &model.hits()[0]);

        // Moments of what is gathered: E[X], E[X²] and E[X Y] by conditioning on the first step.
        let system = System::new(chain, |_| false);
        let step = |from: usize, to: usize| RBig::from(cost.of_step(from, to)) / RBig::from(cost.denominator);
        let spent = |from: usize, _: usize| if from == s1 { RBig::ONE } else { RBig::ZERO };
        let together = |a: &dyn Fn(usize, usize) -> RBig, b: &dyn Fn(usize, usize) -> RBig| {
            let (x, y) = (system.solve(a, zero), system.solve(b, zero));
            let product = system.solve(|i, j| a(i, j) * b(i, j) + a(i, j) * &y[j] + b(i, j) * &x[j], zero);
            system.over_start(&product) - system.over_start(&x) * system.over_start(&y)
        };
        let mean = |a: &dyn Fn(usize, usize) -> RBig| system.over_start(&system.solve(a, zero));
        let mut check = |name: &str, truth: RBig| {
            let bounded = found[name].unwrap();
            holds(bounded, &truth, name);
            negative += usize::from(bounded.high < 0.0);
            if bounded.low > 0.0 && !name.contains("cost") {
                widest = widest.max((bounded.high - bounded.low) / bounded.value / f64::EPSILON);
            }
        };
        check("mean_visits:s1", mean(&spent));
        check("variance_visits:s1", together(&spent, &spent));
        check("mean_cost:labour", mean(&step));
        check("variance_cost:labour", together(&step, &step));
        check("covariance_time_cost:labour", together(&step, &one));

        let met = |wanted: &dyn Fn(usize) -> bool| {
            let system = System::new(chain, wanted);
            let indicator = |state: usize| if wanted(state) { RBig::ONE } else { RBig::ZERO };
            let reach = system.solve(|_, _| RBig::ZERO, indicator);
            // E[T; met] by the first step: its own time counts where the set is met later.
            let time = system.solve(|_, to| reach[to].clone(), zero);
            (system.over_start(&reach), system.over_start(&time))
        };
        check("visit_probability:s1", met(&|state| state == s1).0);
        let (probability, time) = met(&|state| hit.contains(state));
        if probability.is_zero() {
            impossible += 1;
            assert_eq!(found["mean_time_given_hit:met"], None);
        } else {
            check("mean_time_given_hit:met", time / &probability);
        }
        check("hit_probability:met", probability);
    }
    assert!(negative > 300 && impossible < 1500, "{negative} {impossible}");
    assert!(widest <= 4.0, "{widest}");
}

// Grinstead & Snell, Introduction to Probability (AMS 1997), example 11.13 (from memory): the walk on 0..4 with absorbing
// ends has N = [[3/2, 1, 1/2], [1, 2, 1], [1/2, 1, 3/2]]; variances of visits 2N_ij N_jj − N_ij − N_ij² by Kemeny & Snell,
// Finite Markov Chains (1960), theorem 3.3.6 (from memory).
#[test]
fn visits_of_the_walk_are_those_of_the_fundamental_matrix() {
    let n = [[1.5, 1.0, 0.5], [1.0, 2.0, 1.0], [0.5, 1.0, 1.5]];
    for (i, row) in n.iter().enumerate() {
        let mut draft = Draft::new("walk");
        for at in 1..4 {
            draft.moves(&at.to_string(), &(at + 1).to_string(), "1/2");
            draft.moves(&at.to_string(), &(at - 1).to_string(), "rest");
        }
        draft.absorbing("0");
        draft.absorbing("4");
        draft.start(&(i + 1).to_string());
        let model = draft.check().unwrap();
        for (j, mean) in row.iter().enumerate() {
            let state = j + 1;
            let names = ["mean_visits", "variance_visits", "visit_probability"].map(|name| format!("{name}:{state}"));
            let found = answers(&model, &names);
            let is = |name: &String, truth: f64| {
                let answer = found[name].unwrap();
                assert!((answer.value - truth).abs() <= 4e-16 && answer.contains(truth), "{i} {j} {name}: {answer:?}");
            };
            is(&names[0], *mean);
            is(&names[1], 2.0 * mean * n[j][j] - mean - mean * mean);
            // F = (N − I) divided by the diagonal, and 1 for the start itself.
            is(&names[2], mean / n[j][j]);
        }
    }
}

#[test]
fn a_cost_that_the_moves_fix_is_exact_and_one_of_mean_zero_is_held_absolutely() {
    let text = "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { b = 0.5, c = 0.5 }\nb = { x = 1 }\nc = { a = 0.5, y = 0.5 }\n\
                [costs.fixed]\nvisit = { a = 2, b = 1, c = -2 }\nmove = [{ from = \"c\", to = \"y\", cost = 3 }]\n\
                [costs.fair]\nmove = [{ from = \"a\", to = \"b\", cost = 0.1 }, { from = \"a\", to = \"c\", cost = -0.1 }]\n";
    let model = Model::from_toml(text).unwrap();
    let names = ["mean_cost:fixed", "variance_cost:fixed", "covariance_time_cost:fixed", "mean_cost:fair"];
    let found = answers(&model, &names.map(str::to_owned));
    assert_eq!(found["mean_cost:fixed"], Some(Bounded::exactly(3.0)));
    assert_eq!(found["variance_cost:fixed"], Some(Bounded::exactly(0.0)));
    assert_eq!(found["covariance_time_cost:fixed"], Some(Bounded::exactly(0.0)));
    // Each way out of a has the same chance, so the mean is nothing but rounding.
    let fair = found["mean_cost:fair"].unwrap();
    assert!(fair.contains(0.0) && fair.high - fair.low < 1e-25, "{fair:?}");
}
