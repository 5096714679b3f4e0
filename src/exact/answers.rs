//! The answers of a model.

use crate::model::{Model, Progress, Quantity};

use super::{Bounded, ExactError, Law, LawRefusal, Shape};

/// What the law must reach.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Request {
    /// Probabilities whose quantiles are wanted.
    pub levels: Vec<f64>,
    /// Times whose survival probabilities are wanted.
    pub times: Vec<u64>,
}

impl Request {
    /// What a list of quantities needs.
    pub fn of<'a>(quantities: impl IntoIterator<Item = &'a Quantity>) -> Self {
        let mut request = Self::default();
        for quantity in quantities {
            match quantity {
                Quantity::TimeQuantile(p) => request.levels.push(*p),
                Quantity::SurvivalProbability(time) => request.times.push(*time),
                _ => {}
            }
        }
        request
    }
}

/// The exact answers of a model.
#[derive(Debug)]
pub struct Exact<'a> {
    model: &'a Model,
}

impl<'a> Exact<'a> {
    /// Solves a model.
    ///
    /// # Errors
    /// [`ExactError`]. A law that would take too long is no error: see [`Exact::law`].
    pub fn solve(model: &'a Model, request: &Request, progress: &dyn Progress) -> Result<Self, ExactError> {
        let _ = (request, progress);
        Ok(Self { model })
    }

    /// The model.
    pub fn model(&self) -> &'a Model {
        self.model
    }

    /// The probability of finishing in any of several distinct ends. Exactly 0 or 1 (`low == high`) if the moves alone
    /// decide it.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn absorption(&self, ends: &[usize]) -> Bounded {
        let _ = ends;
        todo!()
    }

    /// Mean time to the end, in clock units.
    pub fn mean_time(&self) -> Bounded {
        todo!()
    }

    /// Variance of the time.
    pub fn variance_time(&self) -> Bounded {
        todo!()
    }

    /// Mean time of the replications that finish in any of these ends; `None` when none can.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn mean_time_given(&self, ends: &[usize]) -> Option<Bounded> {
        let _ = ends;
        todo!()
    }

    /// The only time at which replications that finish in any of these ends can do so, if the moves leave just one; `None`
    /// when there are several, and when none can finish there.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn only_time(&self, ends: &[usize]) -> Option<u64> {
        let _ = ends;
        todo!()
    }

    /// Moments of the time, for planning.
    pub fn shape(&self) -> &Shape {
        todo!()
    }

    /// Moments of the time of replications that finish in any of these ends, for planning; `None` when none can.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn shape_given(&self, ends: &[usize]) -> Option<Shape> {
        let _ = ends;
        todo!()
    }

    /// The law of end and time.
    ///
    /// # Errors
    /// Why it was not computed.
    pub fn law(&self) -> Result<&Law, &LawRefusal> {
        todo!()
    }

    /// The answer to a quantity that names ends of this model: `Ok(None)` where it is undefined (a mean given an
    /// impossible end) or no single number (the law).
    ///
    /// # Errors
    /// Why the law, on which it rests, was not computed.
    pub fn answer(&self, quantity: &Quantity) -> Result<Option<Bounded>, &LawRefusal> {
        let _ = quantity;
        todo!()
    }
}
