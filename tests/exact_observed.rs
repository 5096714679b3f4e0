//! Visits, costs and first passages: the truth, in fractions, inside every bound over random chains; and published chains.

mod naive;

use std::collections::BTreeMap;

use dashu_ratio::RBig;
use naive::System;
use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;
use tallystone::exact::{Bounded, Exact, Request};
use tallystone::model::{Clock, Draft, Model, Quantity, Silent};

fn below(rng: &mut Lcg128CmDxsm64, n: u64) -> u64 {
    rng.next_u64() % n
}

fn quantity(text: &str) -> Quantity {
    Quantity::parse(text).unwrap()
}

/// What a path gathers: an amount a clock unit in a state, and an amount a move.
struct Rule<'r> {
    pace: &'r dyn Fn(usize) -> RBig,
    jump: &'r dyn Fn(usize, usize) -> RBig,
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

/// Two to six states with weights from 1 to 1e12, a cost of both signs, and a set of states that may hold ends. In
/// continuous time the weights are rates, a seventh each.
fn random(rng: &mut Lcg128CmDxsm64, clock: Clock) -> Model {
    let states = 2 + below(rng, 5) as usize;
    let power = [0, 3, 12][below(rng, 3) as usize];
    let is_in_steps = clock == Clock::Steps;
    let mut draft = if is_in_steps { Draft::new("random") } else { Draft::in_rates("random") };
    draft.absorbing("x");
    draft.absorbing("y");
    let mut amounts = Vec::new();
    for state in 0..states {
        let mut row = BTreeMap::new();
        for to in 0..states + 2 {
            let is_wanted = (is_in_steps || to != state) && below(rng, 3) == 0;
            if is_wanted || to == state + 1 || (state == 0 && to >= states) {
                row.insert(to, u128::from(1 + below(rng, 9)) * 10u128.pow(below(rng, power + 1) as u32));
            }
        }
        let sum: u128 = if is_in_steps { row.values().sum() } else { 7 };
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
fn the_truth_lies_inside_every_bound_in_steps() {
    hold_all(Clock::Steps, Lcg128CmDxsm64::new(20_261_201, 7));
}

#[test]
fn the_truth_lies_inside_every_bound_in_rates() {
    hold_all(Clock::Rates, Lcg128CmDxsm64::new(20_261_201, 8));
}

fn hold_all(clock: Clock, mut rng: Lcg128CmDxsm64) {
    let (mut negative, mut impossible, mut widest) = (0, 0, 0.0f64);
    for _ in 0..1500 {
        let model = random(&mut rng, clock);
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
            "mean_time",
            "variance_time",
        ];
        let found = answers(&model, &names.map(str::to_owned));
        let zero = |_: usize| RBig::ZERO;
        let (s1, cost, hit) = (chain.state("s1").unwrap(), &model.costs()[0], &model.hits()[0]);

        // Moments of what is gathered, by conditioning on the first step: while a state is held, for θ in the mean, X grows
        // by v a clock unit, and with the move by c. A step is held for exactly one unit, a state in continuous time for an
        // exponential time, of which E[H²] = 2 θ².
        let system = System::new(chain, |_| false);
        let theta = |state: usize| chain.rate(state).map_or(RBig::ONE, |rate| RBig::ONE / rate);
        let square = |state: usize| theta(state).sqr() * RBig::from(if clock == Clock::Steps { 1 } else { 2 });
        let per = |amount: i64| RBig::from(amount) / RBig::from(cost.denominator);
        let labour = Rule { pace: &|i| per(cost.of_visit(i)), jump: &|i, j| per(cost.of_move(i, j)) };
        let time = Rule { pace: &|_| RBig::ONE, jump: &|_, _| RBig::ZERO };
        // Visits are entries: they grow with the move out of the state, however long it was held.
        let spent = Rule { pace: &|_| RBig::ZERO, jump: &|i, _| RBig::from(u8::from(i == s1)) };
        let means = |rule: &Rule<'_>| system.solve(|i, j| (rule.pace)(i) * theta(i) + (rule.jump)(i, j), zero);
        let together = |one: &Rule<'_>, other: &Rule<'_>| {
            let (x, y) = (means(one), means(other));
            let product = system.solve(
                |i, j| {
                    let (v, w) = ((one.pace)(i), (other.pace)(i));
                    let (c, d) = ((one.jump)(i, j) + &x[j], (other.jump)(i, j) + &y[j]);
                    let held = &v * &w * square(i) + theta(i) * (v * &d + w * &c);
                    held + c * d - &x[j] * &y[j]
                },
                zero,
            );
            system.over_start(&product) - system.over_start(&x) * system.over_start(&y)
        };
        let mean = |rule: &Rule<'_>| system.over_start(&means(rule));
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
        check("mean_cost:labour", mean(&labour));
        check("variance_cost:labour", together(&labour, &labour));
        check("covariance_time_cost:labour", together(&labour, &time));
        check("mean_time", mean(&time));
        check("variance_time", together(&time, &time));

        let met = |wanted: &dyn Fn(usize) -> bool| {
            let system = System::new(chain, wanted);
            let indicator = |state: usize| if wanted(state) { RBig::ONE } else { RBig::ZERO };
            let reach = system.solve(|_, _| RBig::ZERO, indicator);
            // E[T; met] by the first step: its own time counts where the set is met later.
            let time = system.solve(|from, to| theta(from) * &reach[to], zero);
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

// Standby (2λ + μ)/λ² and two of three with repair (5λ + μ)/(6λ²), λ = 1/150, μ = 1/5 an hour: standard reliability
// formulas (common practice), 4800 and 875 hours, from memory.
#[test]
fn b02_redundant_systems_with_repair() {
    let standby = "start = \"both\"\nclock = \"rates\"\nclock_unit = \"h\"\nabsorbing = [\"down\"]\n[moves]\n\
                   both = { one = \"1/150\" }\none = { both = 0.2, down = \"1/150\" }\n";
    let two_of_three = "start = \"three\"\nclock = \"rates\"\nabsorbing = [\"down\"]\n[moves]\n\
                        three = { two = \"3/150\" }\ntwo = { three = 0.2, down = \"2/150\" }\n";
    for (text, hours) in [(standby, 4800.0), (two_of_three, 875.0)] {
        let model = Model::from_toml(text).unwrap();
        let mean = answers(&model, &["mean_time".to_owned()])["mean_time"].unwrap();
        assert!(mean.contains(hours) && (mean.value - hours).abs() < 1e-12, "{mean:?}");
    }
}

// The sum of exponential times with rates 1, 2, 3 has the law of the largest of three with rate 1 (Rényi): mean 11/6,
// variance 49/36, from memory.
#[test]
fn b03_a_hypoexponential_time() {
    let text =
        "start = \"a\"\nclock = \"rates\"\nabsorbing = [\"x\"]\n[moves]\na = { b = 1 }\nb = { c = 2 }\nc = { x = 3 }\n";
    let found = answers(&Model::from_toml(text).unwrap(), &["mean_time", "variance_time"].map(str::to_owned));
    holds(found["mean_time"].unwrap(), &"11/6".parse().unwrap(), "mean");
    holds(found["variance_time"].unwrap(), &"49/36".parse().unwrap(), "variance");
}
