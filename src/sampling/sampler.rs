//! Walks paths of a chain.

use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;

use super::alias::AliasTables;
use super::quantise::{Level, quantise};
use super::run::{Interrupted, OutcomeSource};
use super::streams::Streams;
use super::tally::Tally;
use crate::model::{Chain, Clock, Progress, Row, Ticks};

/// Steps of one path between two looks at whether the user asked to stop.
const STEPS_BETWEEN_CHECKS: u64 = 1 << 16;

/// A place that a path comes to.
#[derive(Debug, Clone, Copy)]
pub(super) struct Arrival {
    /// The place before; `None` at the start.
    pub(super) from: Option<u32>,
    /// How long that was held: one step, or ticks.
    pub(super) held: u64,
    pub(super) to: u32,
    /// The time of the arrival.
    pub(super) time: u64,
}

/// What one replication left.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Outcome {
    /// Where it finished, as a number into [`Chain::ends`].
    pub end: u32,
    /// The steps, or ticks, until the end was entered; 0 for a start in an end.
    pub time: u64,
}

/// The path walker of a chain: alias tables of the start and of every reachable transient state.
///
/// # Method
/// One path at a time. The start takes a draw if it has several states; a step takes one draw, a step out of a state with
/// a single move takes none, and moves with a probability below 2⁻⁴⁰ share one escape that is resolved by a further draw.
/// All of this is part of the [stream version](super::STREAM_VERSION).
///
/// # Accuracy
/// A path of S steps over rows of at most d moves differs from the model by less than (d + 1) S 2⁻⁶⁵ in total variation,
/// and every move keeps its probability within a relative 2⁻²⁴, however rare it is. Times are exact up to 2⁶⁴ − 1 steps,
/// centuries of walking.
///
/// # Complexity
/// O(1) a step. At most 32 bytes a move and 8 a state to keep; O(d log d) to build a row of d moves.
#[derive(Debug, Clone)]
pub struct Sampler {
    /// Tables of the places below `places`, of the start, and of the escapes, in this order.
    tables: AliasTables,
    /// Transient states. They are numbered first, then come the ends, then the escapes, so that one comparison tells
    /// that a step led somewhere special.
    places: u32,
    ends: u32,
    /// Mean holding time of each place in ticks; `None` when a step is a step.
    holding: Option<Vec<f64>>,
    ticks: Ticks,
}

impl Sampler {
    /// Builds the tables of a chain whose clock counts steps.
    ///
    /// # Panics
    /// When the transient states, ends and escapes of the chain number 2³² or more together, or its clock runs in rates.
    pub fn new(chain: &Chain) -> Self {
        assert!(chain.clock() == Clock::Steps, "continuous time is sampled in ticks");
        Self::in_ticks(chain, Ticks::STEPS)
    }

    /// Builds the tables of a chain, whose times are counted in ticks if its clock runs in rates.
    ///
    /// # Method
    /// In continuous time the moves are those of the embedded chain; before each move one more draw gives the time that the
    /// state is held, −θ ln u by inversion with u from the top 53 bits of the draw, rounded to a tick. The logarithm is one
    /// of pure Rust, the same on every machine.
    ///
    /// # Panics
    /// When the transient states, ends and escapes of the chain number 2³² or more together.
    pub fn in_ticks(chain: &Chain, ticks: Ticks) -> Self {
        let is_place = |state: usize| is_place(chain, state);
        let places = (0..chain.states()).filter(|state| is_place(*state)).count() as u32;
        let ends = chain.ends().len() as u32;
        let mut next_place = 0;
        let numbers: Vec<u32> = (0..chain.states())
            .map(|state| match chain.end_of(state) {
                Some(end) => places + end as u32,
                None if is_place(state) => {
                    next_place += 1;
                    next_place - 1
                }
                // No row that is kept leads here.
                None => u32::MAX,
            })
            .collect();

        let mut build = Build { numbers, tables: AliasTables::default(), escapes: Vec::new(), first: places + ends };
        (0..chain.states()).filter(|state| is_place(*state)).for_each(|state| build.push(chain.row(state)));
        build.push(chain.start());
        let of_place = |state: usize| {
            let rate = chain.rate(state)?;
            // Two roundings of a factor that stands before a random number.
            Some(ticks.per_unit() / rate.to_f64().value())
        };
        let holding = (0..chain.states()).filter(|state| is_place(*state)).map(of_place).collect();
        let (holding, ticks) = match chain.clock() {
            Clock::Steps => (None, Ticks::STEPS),
            Clock::Rates => (holding, ticks),
        };
        Self { tables: build.finish(), places, ends, holding, ticks }
    }

    /// Number of ends of the chain.
    pub fn ends(&self) -> usize {
        self.ends as usize
    }

    /// Walks one path from the start to an end.
    ///
    /// # Errors
    /// [`Interrupted`] if the user asked to stop within a path of many steps.
    #[inline]
    pub fn walk(&self, rng: &mut Lcg128CmDxsm64, progress: &dyn Progress) -> Result<Outcome, Interrupted> {
        if self.holding.is_some() {
            return self.walk_in_ticks(rng, progress);
        }
        let mut place = self.resolve(self.tables.draw(self.places, rng), rng);
        if place >= self.places {
            return Ok(Outcome { end: place - self.places, time: 0 });
        }
        let mut time = 0_u64;
        loop {
            for step in 1..=STEPS_BETWEEN_CHECKS {
                place = self.tables.draw(place, rng);
                if place >= self.places {
                    place = self.resolve(place, rng);
                    if place >= self.places {
                        return Ok(Outcome { end: place - self.places, time: time.saturating_add(step) });
                    }
                }
            }
            time = time.saturating_add(STEPS_BETWEEN_CHECKS);
            if progress.interrupted() {
                return Err(Interrupted { done: 0 });
            }
        }
    }

    /// Apart from the walk in steps, whose loop is worth its registers.
    #[inline(never)]
    fn walk_in_ticks(&self, rng: &mut Lcg128CmDxsm64, progress: &dyn Progress) -> Result<Outcome, Interrupted> {
        self.follow(rng, progress, |_| {})
    }

    /// Walks one path and shows every place that it comes to. Places number the reachable transient states, ends come after
    /// them. The outcome and the draws are those of [`Sampler::walk`].
    ///
    /// # Errors
    /// [`Interrupted`] if the user asked to stop within a path of many steps.
    pub(super) fn follow(
        &self,
        rng: &mut Lcg128CmDxsm64,
        progress: &dyn Progress,
        mut visit: impl FnMut(Arrival),
    ) -> Result<Outcome, Interrupted> {
        let mut place = self.resolve(self.tables.draw(self.places, rng), rng);
        let (mut time, mut steps) = (0_u64, 0_u64);
        visit(Arrival { from: None, held: 0, to: place, time });
        while place < self.places {
            let held = self.held(place, rng);
            let next = self.resolve(self.tables.draw(place, rng), rng);
            time = time.saturating_add(held);
            steps = steps.wrapping_add(1);
            visit(Arrival { from: Some(place), held, to: next, time });
            place = next;
            if steps.is_multiple_of(STEPS_BETWEEN_CHECKS) && progress.interrupted() {
                return Err(Interrupted { done: 0 });
            }
        }
        Ok(Outcome { end: place - self.places, time })
    }

    /// How long a place is held.
    #[inline]
    fn held(&self, place: u32, rng: &mut Lcg128CmDxsm64) -> u64 {
        let Some(holding) = &self.holding else { return 1 };
        // Between 0 and 1, and neither of them.
        let u = ((rng.next_u64() >> 11) as f64 + 0.5) * 2f64.powi(-53);
        (-libm::log(u) * holding[place as usize]).round() as u64
    }

    /// The unit in which times are counted.
    pub fn ticks(&self) -> Ticks {
        self.ticks
    }

    /// The states of the places, by their numbers in the chain that the sampler was built from.
    pub(super) fn states_of_places(chain: &Chain) -> Vec<usize> {
        (0..chain.states()).filter(|state| is_place(chain, *state)).collect()
    }

    /// The place of a state, or that of its end; `states` are those of the places.
    pub(super) fn place_of(&self, chain: &Chain, state: usize, states: &[usize]) -> u32 {
        match chain.end_of(state) {
            Some(end) => self.places + end as u32,
            None => states.partition_point(|known| *known < state) as u32,
        }
    }

    /// Draws on while a draw escaped.
    #[inline]
    fn resolve(&self, mut place: u32, rng: &mut Lcg128CmDxsm64) -> u32 {
        while let Some(escape) = place.checked_sub(self.places + self.ends) {
            place = self.tables.draw(self.places + 1 + escape, rng);
        }
        place
    }
}

/// Whether a sampler keeps moves of a state.
fn is_place(chain: &Chain, state: usize) -> bool {
    chain.is_reachable(state) && chain.end_of(state).is_none()
}

impl OutcomeSource for Sampler {
    fn ends(&self) -> usize {
        Sampler::ends(self)
    }

    fn ticks(&self) -> Ticks {
        Sampler::ticks(self)
    }

    fn block(
        &self,
        streams: Streams,
        block: u64,
        replications: u64,
        tally: &mut Tally,
        progress: &dyn Progress,
    ) -> Result<(), Interrupted> {
        let mut rng = streams.block(block);
        for done in 0..replications {
            let outcome = self.walk(&mut rng, progress).map_err(|_| Interrupted { done })?;
            tally.add(outcome.end as usize, outcome.time);
        }
        Ok(())
    }
}

/// Tables in the making.
struct Build {
    /// The number of each state, by its number in the chain.
    numbers: Vec<u32>,
    tables: AliasTables,
    /// Levels that resolve escapes, their targets numbered; their tables come last.
    escapes: Vec<Level>,
    /// The number of the first escape.
    first: u32,
}

impl Build {
    fn push(&mut self, row: Row<'_>) {
        for (depth, mut level) in quantise(row).into_iter().enumerate() {
            level.targets.iter_mut().for_each(|target| *target = self.numbers[*target as usize]);
            if level.escape > 0 {
                // The level that resolves it is the next of this row, hence the next escape to be numbered, after this
                // level itself if that is one.
                let number = self.escapes.len() + usize::from(depth > 0);
                let number = u32::try_from(number).ok().and_then(|number| self.first.checked_add(number));
                level.targets.push(number.expect("fewer than 2³² states, ends and escapes"));
                level.draws.push(level.escape);
            }
            if depth == 0 {
                self.tables.push(&level.targets, &level.draws);
            } else {
                self.escapes.push(level);
            }
        }
    }

    fn finish(mut self) -> AliasTables {
        for level in &self.escapes {
            self.tables.push(&level.targets, &level.draws);
        }
        self.tables
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::grid::Grid;
    use super::*;
    use crate::model::{Draft, Model, Silent};
    use crate::statistics::pooled_chi_square;

    fn model(text: &str) -> Model {
        Model::from_toml(text).unwrap()
    }

    fn block(model: &Model, replications: u64, edges: Vec<u64>) -> Tally {
        let sampler = Sampler::new(model.chain());
        let mut tally = Tally::new(sampler.ends(), Arc::new(Grid::new(edges)));
        sampler.block(Streams::new(11), 0, replications, &mut tally, &Silent).unwrap();
        tally
    }

    /// One step from `s` to end i with a probability of `weights[i]` over their sum.
    fn one_step(weights: &[u64]) -> Model {
        let sum: u64 = weights.iter().sum();
        let mut draft = Draft::new("");
        draft.start("s");
        for (end, weight) in weights.iter().enumerate() {
            draft.absorbing(&format!("e{end}"));
            draft.moves("s", &format!("e{end}"), &format!("{weight}/{sum}"));
        }
        draft.check().unwrap()
    }

    // Seven chi-square tests at 1e-6 each: false alarm below 1e-5 over all seeds.
    #[test]
    fn one_step_goes_where_the_row_says() {
        let rows = [
            vec![1, 1],
            vec![1, 999],
            vec![1, 2, 3],
            vec![5; 8],
            (1..=9).collect(),
            (1..=100).collect(),
            vec![3; 1000],
        ];
        for weights in rows {
            let model = one_step(&weights);
            let tally = block(&model, 200_000, vec![0, 1]);
            let sum: u64 = weights.iter().sum();
            let expected: Vec<f64> = weights.iter().map(|weight| *weight as f64 / sum as f64).collect();
            let observed: Vec<u64> = (0..model.chain().ends().len())
                .map(|at| {
                    let name = format!("e{at}");
                    tally.count(model.chain().ends().iter().position(|end| end.name == name).unwrap())
                })
                .collect();
            assert!(pooled_chi_square(&observed, &expected, 5.0).unwrap().p_value > 1e-6, "{weights:?}");
            assert_eq!((tally.at_or_below(0), tally.at_or_below(1)), (Some(0), Some(200_000)));
        }
    }

    // Geometric on 1, 2, … with p = 1/50: mean 50, variance 2450. With 200,000 paths the standard error of the mean is
    // 0.111 and that of the variance 2450 √(8/200000) ≈ 15.5; 6 of each: false alarm below 1e-8.
    #[test]
    fn a_stay_is_geometric() {
        let model = model("start = 's'\nabsorbing = ['e']\n[moves]\ns = { e = 0.02, s = 'rest' }");
        let all = block(&model, 200_000, vec![]).all();
        assert!((all.mean().unwrap() - 50.0).abs() < 6.0 * 0.111);
        assert!((all.variance().unwrap() - 2450.0).abs() < 6.0 * 15.5);
    }

    // 50,000 of 200,000 start in the end, standard deviation 194, and 6 of them: false alarm below 1e-8.
    #[test]
    fn replications_start_as_the_start_says_and_an_end_takes_no_time() {
        let model = model("start = { s = 0.75, e = 0.25 }\nabsorbing = ['e']\n[moves]\ns = { t = 1 }\nt = { e = 1 }");
        let tally = block(&model, 200_000, vec![0, 1, 2]);
        assert!(tally.at_or_below(0).unwrap().abs_diff(50_000) < 6 * 194);
        assert_eq!(tally.at_or_below(1), tally.at_or_below(0));
        assert_eq!(tally.at_or_below(2), Some(200_000));
    }

    #[test]
    fn rows_of_one_move_take_no_draw() {
        let model = model("start = 's'\nabsorbing = ['e']\n[moves]\ns = { t = 1 }\nt = { e = 1 }");
        let mut rng = Lcg128CmDxsm64::new(0, 0);
        let outcome = Sampler::new(model.chain()).walk(&mut rng, &Silent).unwrap();
        assert_eq!(outcome, Outcome { end: 0, time: 2 });
        assert_eq!(rng, Lcg128CmDxsm64::new(0, 0));
    }

    // The escape of a row cannot be met by chance in a test; its table can be asked directly. Two rare moves share it, 3
    // to 1 between them, with 2²¹ draws, and the usual move has 2²⁴ of padding: 8/9, 3/36 and 1/36. Alarm odds 1e-6.
    #[test]
    fn escapes_lead_to_the_rare_moves_in_their_proportion() {
        let model = one_step(&[(1 << 45) - 4, 3, 1]);
        let sampler = Sampler::new(model.chain());
        assert_eq!(sampler.tables.len(), 3);
        let mut rng = Lcg128CmDxsm64::new(1, 2);
        let mut counts = [0; 3];
        for _ in 0..200_000 {
            let end = sampler.resolve(sampler.places + sampler.ends, &mut rng) - sampler.places;
            counts[end as usize] += 1;
        }
        let fit = pooled_chi_square(&counts, &[8.0 / 9.0, 3.0 / 36.0, 1.0 / 36.0], 5.0).unwrap();
        assert!(fit.p_value > 1e-6, "{counts:?}");
    }

    // Both rows take three levels: two escapes of about 2⁻⁴⁰ and a last draw. Too rare to be met, so the draws that lead
    // there are counted in the tables.
    #[test]
    fn escapes_of_escapes_are_linked_row_by_row() {
        let model = model(
            "start = 's'\nabsorbing = ['rare', 'usual']\n[moves]\ns = { rare = 1e-30, t = 'rest' }\n\
             t = { rare = 1e-25, usual = 'rest' }",
        );
        let sampler = Sampler::new(model.chain());
        let rare = model.chain().ends().iter().position(|end| end.name == "rare").unwrap() as u32 + sampler.places;
        assert_eq!((sampler.places, sampler.ends, sampler.tables.len()), (2, 2, 7));
        let share =
            |table: u32, to: u32| sampler.tables.counted(table as usize, 8)[to as usize] as f64 / 2_f64.powi(64);
        for (row, escapes, probability) in [(0, [4, 5], 1e-30), (1, [6, 7], 1e-25)] {
            let [first, second] = escapes.map(|escape| escape - sampler.ends + 1);
            let realised = share(row, escapes[0]) * share(first, escapes[1]) * share(second, rare);
            assert!((realised / probability - 1.0).abs() < 2_f64.powi(-24), "{realised:e}");
        }
        let mut rng = Lcg128CmDxsm64::new(1, 2);
        for escape in 4..8 {
            assert!(sampler.resolve(escape, &mut rng) < 4);
        }
    }

    #[test]
    fn a_closed_class_is_one_end_and_unreachable_states_have_no_table() {
        let model = model(
            "start = 's'\n[moves]\ns = { a = 0.5, b = 0.25, s = 'rest' }\na = { b = 1 }\nb = { a = 1 }\nlost = { a = 1 }",
        );
        let sampler = Sampler::new(model.chain());
        assert_eq!((sampler.ends(), sampler.tables.len()), (1, 2));
        assert_eq!(block(&model, 1000, vec![]).count(0), 1000);
    }

    #[test]
    fn a_long_path_can_be_interrupted() {
        struct Impatient;
        impl Progress for Impatient {
            fn begin(&self, _: &str, _: &str, _: Option<u64>) {}
            fn advance(&self, _: u64) {}
            fn end(&self) {}
            fn interrupted(&self) -> bool {
                true
            }
        }
        let model = model("start = 's'\nabsorbing = ['e']\n[moves]\ns = { e = 1e-18, s = 'rest' }");
        let walked = Sampler::new(model.chain()).walk(&mut Lcg128CmDxsm64::new(1, 2), &Impatient);
        assert_eq!(walked, Err(Interrupted { done: 0 }));
    }
}
