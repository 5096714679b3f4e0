//! The answers of a model.

use std::sync::OnceLock;

use crate::model::{Clock, Model, Progress, Quantity, Ticks};

use super::costs::CostAnswer;
use super::dd::{Dd, U2};
use super::linear::Linear;
use super::passages::{self, HitAnswer, VisitAnswer};
use super::support::{Support, only_time};
use super::{Bounded, ExactError, Law, LawRefusal, Shape};

/// What is asked beyond probabilities, means and variances.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Request {
    /// Whether the joint law of end and time is wanted.
    pub law: bool,
    /// Probabilities whose quantiles are wanted, which rest on the law of the time.
    pub levels: Vec<f64>,
    /// Times in clock units whose survival probabilities are wanted, likewise.
    pub times: Vec<f64>,
    /// Costs whose answers are wanted, as numbers into [`Model::costs`].
    pub costs: Vec<usize>,
    /// Hits, as numbers into [`Model::hits`].
    pub hits: Vec<usize>,
    /// States whose visits are wanted, as numbers in the chain.
    pub visits: Vec<usize>,
}

impl Request {
    /// What a list of quantities of a model needs.
    pub fn of<'a>(model: &Model, quantities: impl IntoIterator<Item = &'a Quantity>) -> Self {
        fn once(list: &mut Vec<usize>, number: Option<usize>) {
            list.extend(number.filter(|number| !list.contains(number)));
        }
        let mut request = Self::default();
        for quantity in quantities {
            match quantity {
                Quantity::TimeQuantile(p) => request.levels.push(*p),
                Quantity::SurvivalProbability(time) => request.times.push(*time),
                Quantity::Law => request.law = true,
                Quantity::MeanCost(name) | Quantity::VarianceCost(name) | Quantity::CovarianceTimeCost(name) => {
                    once(&mut request.costs, model.cost_named(name));
                }
                Quantity::HitProbability(name) | Quantity::MeanTimeGivenHit(name) => {
                    once(&mut request.hits, model.hit_named(name));
                }
                Quantity::MeanVisits(name) | Quantity::VarianceVisits(name) | Quantity::VisitProbability(name) => {
                    once(&mut request.visits, model.transient_named(name));
                }
                Quantity::AbsorptionProbability(_)
                | Quantity::MeanTime
                | Quantity::SdTime
                | Quantity::VarianceTime
                | Quantity::MeanTimeGiven(_) => {}
            }
        }
        request
    }
}

/// The exact answers of a model.
#[derive(Debug)]
pub struct Exact<'a> {
    model: &'a Model,
    linear: Linear,
    /// Ends that the start can reach.
    reachable: Vec<bool>,
    /// The only time of all, if the moves leave just one.
    only: Option<u64>,
    /// Only audits ask for it.
    support: OnceLock<Support>,
    law: Result<Law, LawRefusal>,
    /// The law of the time as it is counted in ticks.
    counted: Option<Law>,
    ticks: Ticks,
    /// Why a quantile is not there, once one was asked for in vain.
    undecided: OnceLock<LawRefusal>,
    shape: Shape,
    hits: Vec<(usize, HitAnswer)>,
    visits: Vec<(usize, VisitAnswer)>,
}

impl<'a> Exact<'a> {
    /// Solves a model.
    ///
    /// # Errors
    /// [`ExactError`]. A law that would take too long is no error: see [`Exact::law`].
    ///
    /// # Complexity
    /// At most n³/3 multiply-adds in double-double for a communicating class of n states, n b² for a band of width b; the
    /// law besides costs one multiply-add a move and step.
    ///
    /// # Accuracy
    /// Each answer lies within its bounds; see [`crate::exact`].
    pub fn solve(model: &'a Model, request: &Request, progress: &dyn Progress) -> Result<Self, ExactError> {
        let chain = model.chain();
        let mut linear = Linear::solve(model, request, progress)?;
        let ticks = match model.clock() {
            Clock::Steps => Ticks::STEPS,
            Clock::Rates => Ticks::for_longest(linear.longest),
        };
        let law = Law::of(chain, linear.mean.value, ticks, request, progress)?;
        // A rounded time is off by less than half a tick a visit, and a time enters an end at most at the largest rate.
        let largest = (0..chain.states()).filter_map(|state| chain.rate(state)).map(|rate| rate.to_f64().value());
        let blur = largest.fold(0.0, f64::max) * linear.moves * ticks.length();
        let counted = law.as_ref().ok().map(|law| law.blurred(blur));
        let reachable =
            chain.ends().iter().map(|end| end.states.iter().any(|state| chain.is_reachable(*state))).collect();
        let all: Vec<usize> = (0..chain.ends().len()).collect();
        let only = only_time(chain, &all);
        if let Some(time) = only {
            linear.mean = Bounded::exactly(time as f64);
            linear.variance = Bounded::exactly(0.0);
        }
        let shape = Shape::constant(0.0);
        let hits = request.hits.iter().map(|number| {
            let answer = passages::hit(chain, &model.hits()[*number], progress)?;
            Ok((*number, answer))
        });
        let hits = hits.collect::<Result<_, ExactError>>()?;
        let visits = request.visits.iter().map(|state| Ok((*state, passages::visits(chain, *state, progress)?)));
        let visits = visits.collect::<Result<_, ExactError>>()?;
        let (support, undecided) = (OnceLock::new(), OnceLock::new());
        let mut exact =
            Self { model, linear, reachable, only, support, law, counted, ticks, undecided, shape, hits, visits };
        if let Some(shape) = exact.shape_given(&all) {
            exact.shape = shape;
        }
        Ok(exact)
    }

    /// The model.
    pub fn model(&self) -> &'a Model {
        self.model
    }

    /// The usual name of the way in which the answers were found.
    pub fn solver(&self) -> &'static str {
        "elimination without subtraction, by classes, in double-double arithmetic"
    }

    /// Sums of an order over several ends.
    fn summed(&self, ends: &[usize], order: usize) -> Dd {
        ends.iter().fold(Dd::ZERO, |sum, end| sum.plus(self.linear.ends[*end].of[order]))
    }

    fn sum_error(&self, ends: &[usize], order: usize) -> f64 {
        self.linear.errors[order] + U2 * 3.0 * ends.len() as f64
    }

    /// The probability of finishing in any of several distinct ends. Exactly 0 or 1 (`low == high`) if the moves alone
    /// decide it.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn absorption(&self, ends: &[usize]) -> Bounded {
        if !ends.iter().any(|end| self.reachable[*end]) {
            return Bounded::exactly(0.0);
        }
        let mut others = self.reachable.clone();
        ends.iter().for_each(|end| others[*end] = false);
        if !others.contains(&true) {
            return Bounded::exactly(1.0);
        }
        Bounded::probability(Bounded::relative(self.summed(ends, 0), self.sum_error(ends, 0)))
    }

    /// Mean time to the end, in clock units.
    pub fn mean_time(&self) -> Bounded {
        self.linear.mean
    }

    /// The longest mean time from any reachable state to the end, rounded: a guide.
    pub fn longest_mean_time(&self) -> f64 {
        self.linear.longest
    }

    /// Mean number of moves until the end, stays included, rounded: a guide. With a clock in steps it is the mean time.
    pub fn mean_moves(&self) -> f64 {
        self.linear.moves
    }

    /// Variance of the time.
    pub fn variance_time(&self) -> Bounded {
        self.linear.variance
    }

    /// Mean time of the replications that finish in any of these ends; `None` when none can.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn mean_time_given(&self, ends: &[usize]) -> Option<Bounded> {
        if !ends.iter().any(|end| self.reachable[*end]) {
            return None;
        }
        if let Some(time) = self.only_time(ends) {
            return Some(Bounded::exactly(time as f64));
        }
        let ratio = self.summed(ends, 1).over(self.summed(ends, 0));
        Bounded::relative(ratio, self.sum_error(ends, 0) + self.sum_error(ends, 1) + 15.0 * U2)
    }

    /// The only time at which replications that finish in any of these ends can do so, if the moves leave just one; `None`
    /// when there are several, and when none can finish there.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn only_time(&self, ends: &[usize]) -> Option<u64> {
        only_time(self.model.chain(), ends)
    }

    /// A quantile that is a number of ticks, in clock units: the truth lies after the tick before it.
    fn in_units(&self, ticks: Bounded) -> Bounded {
        if self.is_in_steps() {
            return ticks;
        }
        let length = self.ticks.length();
        let scaled =
            Bounded { value: ticks.value * length, low: (ticks.low - 1.0) * length, high: ticks.high * length };
        Bounded { low: scaled.low.next_down().max(0.0), high: scaled.high.next_up(), ..scaled }
    }

    fn is_in_steps(&self) -> bool {
        self.model.clock() == Clock::Steps
    }

    /// Whether a replication can finish in an end at a time at all, by the moves alone. `true` when that would take too
    /// long to find out.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn is_possible(&self, end: usize, time: u64) -> bool {
        // In continuous time every time is possible where the end is.
        self.reachable[end]
            && (!self.is_in_steps()
                || self.support.get_or_init(|| Support::of(self.model.chain())).is_possible(end, time))
    }

    /// Moments of the time, for planning.
    pub fn shape(&self) -> &Shape {
        &self.shape
    }

    /// Moments of the time of replications that finish in any of these ends, for planning; `None` when none can.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn shape_given(&self, ends: &[usize]) -> Option<Shape> {
        if !ends.iter().any(|end| self.reachable[*end]) {
            return None;
        }
        if let Some(time) = self.only_time(ends) {
            return Some(Shape::constant(time as f64));
        }
        let sums: Vec<Dd> = (0..self.linear.errors.len()).map(|order| self.summed(ends, order)).collect();
        Some(Shape::of_sums(&sums, &self.linear.errors, self.is_in_steps()))
    }

    fn visits_of(&self, state: &str) -> Option<&VisitAnswer> {
        found(&self.visits, self.model.transient_named(state)?)
    }

    fn hit_of(&self, hit: &str) -> Option<&HitAnswer> {
        found(&self.hits, self.model.hit_named(hit)?)
    }

    fn cost_of(&self, cost: &str) -> Option<&CostAnswer> {
        found(&self.linear.costs, self.model.cost_named(cost)?)
    }

    /// Moments, for planning, of what a quantity about visits, costs or a first passage averages: the visits, the cost, the
    /// time of the passage, or for a covariance the product of the two deviations. `None` for other quantities, for those
    /// that were not asked for, and where the moments are not known well.
    pub fn shape_of(&self, quantity: &Quantity) -> Option<Shape> {
        match quantity {
            Quantity::MeanVisits(of) | Quantity::VarianceVisits(of) => Some(self.visits_of(of)?.shape.clone()),
            Quantity::MeanTimeGivenHit(of) => Some(self.hit_of(of)?.given.as_ref()?.1.clone()),
            Quantity::MeanCost(of) | Quantity::VarianceCost(of) => Some(self.cost_of(of)?.shape.clone()),
            Quantity::CovarianceTimeCost(of) => self.cost_of(of)?.product.clone(),
            _ => None,
        }
    }

    /// The only value that the moves leave to what such a quantity averages: visits, steps to the passage, or the cost
    /// times its denominator. `None` when there are several.
    pub fn only_amount(&self, quantity: &Quantity) -> Option<i128> {
        match quantity {
            Quantity::MeanVisits(of) | Quantity::VarianceVisits(of) => self.visits_of(of)?.only.map(i128::from),
            Quantity::MeanTimeGivenHit(of) => self.hit_of(of)?.only.map(i128::from),
            Quantity::MeanCost(of) | Quantity::VarianceCost(of) | Quantity::CovarianceTimeCost(of) => {
                self.cost_of(of)?.only
            }
            _ => None,
        }
    }

    /// The law of end and time.
    ///
    /// # Errors
    /// Why it was not computed.
    pub fn law(&self) -> Result<&Law, &LawRefusal> {
        self.law.as_ref()
    }

    /// The law of end and time as a sampler counts them: with a clock in steps the law itself, in continuous time that of
    /// times rounded to [`Exact::ticks`].
    ///
    /// # Errors
    /// Why it was not computed.
    pub fn law_in_ticks(&self) -> Result<&Law, &LawRefusal> {
        let law = self.law.as_ref()?;
        Ok(self.counted.as_ref().unwrap_or(law))
    }

    /// The unit in which times are counted: steps, or in continuous time ticks that suit the longest mean time.
    pub fn ticks(&self) -> Ticks {
        self.ticks
    }

    /// The answer to a quantity of this model: `Ok(None)` where it is undefined (a mean given what is impossible, an unknown
    /// name), no single number (the law), or was not asked for (visits, costs and hits).
    ///
    /// # Errors
    /// Why the law, on which it rests, was not computed.
    pub fn answer(&self, quantity: &Quantity) -> Result<Option<Bounded>, &LawRefusal> {
        let named = |name: &str| self.model.ends_named(name);
        Ok(match quantity {
            Quantity::AbsorptionProbability(name) => named(name).map(|ends| self.absorption(&ends)),
            Quantity::MeanTime => Some(self.mean_time()),
            Quantity::VarianceTime => Some(self.variance_time()),
            Quantity::SdTime => Some(self.variance_time().sqrt()),
            Quantity::MeanTimeGiven(name) => named(name).and_then(|ends| self.mean_time_given(&ends)),
            Quantity::TimeQuantile(p) => match self.only {
                Some(time) => Some(Bounded::exactly(time as f64)),
                None => {
                    let law = self.law()?;
                    let undecided = || self.undecided.get_or_init(|| LawRefusal::Undecided { horizon: law.horizon() });
                    Some(self.in_units(law.quantile(*p).ok_or_else(undecided)?))
                }
            },
            Quantity::SurvivalProbability(time) => Some(match self.only {
                Some(only) => Bounded::exactly(if *time < only as f64 { 1.0 } else { 0.0 }),
                // From the last tick before the time to the first after it.
                None if !self.is_in_steps() => {
                    let (law, at) = (self.law()?, *time * self.ticks.per_unit());
                    let (early, late) = (law.survival(at.floor() as u64), law.survival(at.ceil() as u64));
                    Bounded { value: early.value, low: late.low, high: early.high }
                }
                None => self.law()?.survival(*time as u64),
            }),
            Quantity::Law => None,
            Quantity::MeanVisits(of) => self.visits_of(of).map(|answer| answer.mean),
            Quantity::VarianceVisits(of) => self.visits_of(of).map(|answer| answer.variance),
            Quantity::VisitProbability(of) => self.visits_of(of).map(|answer| answer.probability),
            Quantity::MeanCost(of) => self.cost_of(of).map(|answer| answer.mean),
            Quantity::VarianceCost(of) => self.cost_of(of).map(|answer| answer.variance),
            Quantity::CovarianceTimeCost(of) => self.cost_of(of).map(|answer| match self.only {
                Some(_) => Bounded::exactly(0.0),
                None => answer.covariance,
            }),
            Quantity::HitProbability(of) => self.hit_of(of).map(|answer| answer.probability),
            Quantity::MeanTimeGivenHit(of) => self.hit_of(of).and_then(|answer| Some(answer.given.as_ref()?.0)),
        })
    }
}

/// The answer of a number.
fn found<T>(answers: &[(usize, T)], number: usize) -> Option<&T> {
    answers.iter().find(|(known, _)| *known == number).map(|(_, answer)| answer)
}
