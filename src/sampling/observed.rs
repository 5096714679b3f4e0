//! What a replication leaves besides its end and time, and the walk that records it.

use std::sync::Arc;

use rand_pcg::Lcg128CmDxsm64;

use super::run::{Interrupted, OutcomeSource};
use super::sampler::{Arrival, Outcome, Sampler};
use super::streams::Streams;
use super::tally::Tally;
use crate::model::{Model, Progress, Ticks};

/// Something that is recorded of every replication, as a whole number.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Observable {
    /// Steps spent in a state, by its number in the chain.
    Visits(usize),
    /// A cost, by its number in [`Model::costs`], in parts: see [`Observable::unit`].
    Cost(usize),
    /// The time of the first passage to a set, by its number in [`Model::hits`]; nothing when there was none.
    Hit(usize),
}

/// Which columns a move adds to, and how much.
type Amounts = Vec<(u32, i64)>;

/// What a visit of a place adds to a column.
#[derive(Debug, Clone, Copy)]
struct Visit {
    column: u32,
    /// A step, or a tick.
    each: i64,
    /// The visit itself, however long.
    once: i64,
}

/// A sampler that records observables too. Its outcomes are those of the [`Sampler`], draw for draw.
///
/// # Complexity
/// A step costs one addition for each observable that its states belong to.
#[derive(Debug, Clone)]
pub struct ObservedSampler<'a> {
    sampler: &'a Sampler,
    observed: Arc<[Observable]>,
    /// For each place: what a visit adds to which columns.
    visits: Vec<Vec<Visit>>,
    /// For each place: targets whose moves add something, with what they add.
    moves: Vec<Vec<(u32, Amounts)>>,
    /// For each place, and for each end after them: columns whose set it belongs to.
    hits: Vec<Vec<u32>>,
    /// Columns that are sums; the others have no value until their set is met.
    is_sum: Vec<bool>,
    /// What amounts a tick, and amounts a move, are multiplied by, so that both are whole.
    factors: (i128, i128),
}

impl<'a> ObservedSampler<'a> {
    /// Adds observables of the model that the sampler was built from.
    ///
    /// # Panics
    /// When the model lacks one of them, or is not that of the sampler.
    pub fn new(sampler: &'a Sampler, model: &Model, observed: Arc<[Observable]>) -> Self {
        let chain = model.chain();
        let states = Sampler::states_of_places(chain);
        let mut visits: Vec<Vec<Visit>> = vec![Vec::new(); states.len()];
        let mut moves: Vec<Vec<(u32, Amounts)>> = vec![Vec::new(); states.len()];
        let mut hits = vec![Vec::new(); states.len() + chain.ends().len()];
        for (column, observable) in observed.iter().enumerate() {
            let column = column as u32;
            for (place, state) in states.iter().enumerate() {
                match observable {
                    Observable::Visits(of) if of == state => visits[place].push(Visit { column, each: 0, once: 1 }),
                    Observable::Cost(number) => {
                        let cost = &model.costs()[*number];
                        let each = cost.of_visit(*state);
                        visits[place].extend((each != 0).then_some(Visit { column, each, once: 0 }));
                        for to in chain.row(*state).targets {
                            let amount = cost.of_move(*state, *to as usize);
                            if amount != 0 {
                                add(
                                    &mut moves[place],
                                    sampler.place_of(chain, *to as usize, &states),
                                    (column, amount),
                                );
                            }
                        }
                    }
                    Observable::Hit(number) if model.hits()[*number].contains(*state) => hits[place].push(column),
                    _ => {}
                }
            }
            if let Observable::Hit(number) = observable {
                let is_met = |end: &usize| model.hits()[*number].contains(chain.ends()[*end].states[0]);
                (0..chain.ends().len()).filter(is_met).for_each(|end| hits[states.len() + end].push(column));
            }
        }
        let is_sum = observed.iter().map(|one| !matches!(one, Observable::Hit(_))).collect();
        let factors = factors(sampler.ticks());
        Self { sampler, observed, visits, moves, hits, is_sum, factors }
    }

    /// Walks one path and records it; `values` has one cell an observable.
    ///
    /// # Errors
    /// [`Interrupted`] if the user asked to stop within a path of many steps.
    pub fn walk(
        &self,
        rng: &mut Lcg128CmDxsm64,
        values: &mut [Option<i128>],
        progress: &dyn Progress,
    ) -> Result<Outcome, Interrupted> {
        if self.observed.is_empty() {
            return self.sampler.walk(rng, progress);
        }
        values.iter_mut().zip(&self.is_sum).for_each(|(value, is_sum)| *value = is_sum.then_some(0));
        let (each_tick, each_move) = self.factors;
        self.sampler.follow(rng, progress, |Arrival { from, held, to, time }| {
            if let Some(from) = from {
                for visit in &self.visits[from as usize] {
                    let while_held = i128::from(visit.each).saturating_mul(i128::from(held)).saturating_mul(each_tick);
                    grow(&mut values[visit.column as usize], while_held.saturating_add(i128::from(visit.once)));
                }
                let taken = self.moves[from as usize].iter().find(|(target, _)| *target == to);
                for (column, amount) in taken.map_or(&[][..], |(_, amounts)| amounts) {
                    grow(&mut values[*column as usize], i128::from(*amount).saturating_mul(each_move));
                }
            }
            for column in &self.hits[to as usize] {
                values[*column as usize].get_or_insert(i128::from(time));
            }
        })
    }
}

/// Costs are counted in parts of their denominator and of a clock unit: an amount a clock unit is one a tick there, and an
/// amount a move is as many as there are ticks in a unit. Where a tick is longer than a unit it is the other way round.
fn factors(ticks: Ticks) -> (i128, i128) {
    let power = 1_i128.checked_shl(ticks.exponent().unsigned_abs()).filter(|power| *power > 0).unwrap_or(i128::MAX);
    if ticks.exponent() < 0 { (power, 1) } else { (1, power) }
}

impl Observable {
    /// What the values of a column are divided by to be in the unit of the observable: visits, the cost's unit given its
    /// denominator, clock units.
    pub fn unit(self, denominator: u64, ticks: Ticks) -> f64 {
        match self {
            Self::Visits(_) => 1.0,
            Self::Cost(_) => denominator as f64 * ticks.per_unit().max(1.0),
            Self::Hit(_) => ticks.per_unit(),
        }
    }
}

/// Adds an amount to a sum.
fn grow(value: &mut Option<i128>, amount: i128) {
    *value = value.map(|value| value.saturating_add(amount));
}

/// Adds an amount to the moves to a target.
fn add(moves: &mut Vec<(u32, Amounts)>, target: u32, amount: (u32, i64)) {
    match moves.iter_mut().find(|(known, _)| *known == target) {
        Some((_, amounts)) => amounts.push(amount),
        None => moves.push((target, vec![amount])),
    }
}

impl OutcomeSource for ObservedSampler<'_> {
    fn ends(&self) -> usize {
        self.sampler.ends()
    }

    fn observed(&self) -> Arc<[Observable]> {
        Arc::clone(&self.observed)
    }

    fn ticks(&self) -> Ticks {
        self.sampler.ticks()
    }

    fn block(
        &self,
        streams: Streams,
        block: u64,
        replications: u64,
        tally: &mut Tally,
        progress: &dyn Progress,
    ) -> Result<(), Interrupted> {
        if self.observed.is_empty() {
            return self.sampler.block(streams, block, replications, tally, progress);
        }
        let mut rng = streams.block(block);
        let mut values = vec![None; self.observed.len()];
        for done in 0..replications {
            let outcome = self.walk(&mut rng, &mut values, progress).map_err(|_| Interrupted { done })?;
            tally.add_observed(outcome.end as usize, outcome.time, &values);
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::super::grid::Grid;
    use super::super::run::{Plan, sample, sample_with};
    use super::*;
    use crate::model::Silent;

    const SHOP: &str = "start = { intake = 0.7, board = \"rest\" }\nabsorbing = [\"good\", \"bad\"]\n[moves]\n\
        intake = { board = 0.5, case = 0.25, intake = 0.25 }\nboard = { case = 0.5, good = 0.4, bad = 0.1 }\n\
        case = { board = 0.25, bad = 0.75 }\n[costs.labour]\nvisit = { board = 1.5, case = -0.25 }\n\
        move = [{ from = \"board\", to = \"bad\", cost = 3 }, { from = \"intake\", to = \"intake\", cost = \"1/3\" }]\n\
        [hits.repair]\nstates = [\"case\", \"good\"]\n";

    /// Observes by the names of the states that a path of the sampler goes through.
    #[test]
    fn what_is_recorded_is_what_the_path_says() {
        let model = Model::from_toml(SHOP).unwrap();
        let chain = model.chain();
        let sampler = Sampler::new(chain);
        let board = chain.state("board").unwrap();
        let observed: Arc<[Observable]> = [Observable::Visits(board), Observable::Cost(0), Observable::Hit(0)].into();
        let watching = ObservedSampler::new(&sampler, &model, observed);
        let states = Sampler::states_of_places(chain);
        let name = |place: u32| match states.get(place as usize) {
            Some(state) => chain.name(*state).to_owned(),
            None => chain.ends()[place as usize - states.len()].name.clone(),
        };
        let (mut one, mut two) = (Streams::new(5).block(0), Streams::new(5).block(0));
        let mut values = [None; 3];
        let mut hits = 0;
        for _ in 0..3000 {
            let mut path = Vec::new();
            let followed = sampler.follow(&mut one, &Silent, |arrival| path.push(name(arrival.to))).unwrap();
            let outcome = watching.walk(&mut two, &mut values, &Silent).unwrap();
            assert_eq!(outcome, followed);
            assert_eq!(path.len() as u64, outcome.time + 1);
            let visits = path.iter().filter(|name| *name == "board").count() as i128;
            let of_step = |pair: &[String]| {
                let visit = match pair[0].as_str() {
                    "board" => 18,
                    "case" => -3,
                    _ => 0,
                };
                let of_move = match (pair[0].as_str(), pair[1].as_str()) {
                    ("board", "bad") => 36,
                    ("intake", "intake") => 4,
                    _ => 0,
                };
                visit + of_move
            };
            let cost: i128 = path.windows(2).map(of_step).sum();
            let hit = path.iter().position(|name| name == "case" || name == "good").map(|at| at as i128);
            assert_eq!(values, [Some(visits), Some(cost), hit]);
            hits += usize::from(hit.is_some());
        }
        assert!((1..3000).contains(&hits));
    }

    #[test]
    fn watching_changes_no_outcome_on_any_number_of_threads() {
        let model = Model::from_toml(SHOP).unwrap();
        let sampler = Sampler::new(model.chain());
        let plan = Plan { replications: 20_000, seed: 3, grid: Arc::new(Grid::new((0..20).collect())) };
        let plain = sample(&sampler, &plan, &Silent).unwrap();
        let watching = ObservedSampler::new(&sampler, &model, [Observable::Cost(0), Observable::Hit(0)].into());
        let on = |threads| {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
            pool.install(|| sample_with(&watching, &plan, &Silent).unwrap())
        };
        let alone = on(1);
        assert_eq!(alone, on(3));
        assert_eq!(alone.to_string(), on(16).to_string());
        assert_eq!(alone.all(), plain.all());
        assert_eq!(alone.cells(0), plain.cells(0));
        let cost = alone.column(Observable::Cost(0)).unwrap();
        assert_eq!(cost.sums().count(), 20_000);
        assert!(alone.column(Observable::Hit(0)).unwrap().sums().count() < 20_000);
        assert!(alone.column(Observable::Visits(0)).is_none());
    }
}
