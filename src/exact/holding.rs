//! How long a state is held each time it is visited.

use dashu_int::ops::UnsignedAbs;

use crate::model::{Chain, Clock};

use super::ExactError;
use super::dd::{Dd, INPUT, U2, power_of_two};
use super::elimination::Solution;
use super::envelope::product;

/// Mean holding times: one step, or the reciprocal of the rate out of a state.
#[derive(Debug)]
pub(super) struct Holding {
    /// `None` when the clock counts steps.
    means: Option<Vec<Dd>>,
}

impl Holding {
    /// # Errors
    /// [`ExactError::OutOfRange`] where a rate is too small or too large for the arithmetic.
    pub(super) fn of_chain(chain: &Chain) -> Result<Self, ExactError> {
        if chain.clock() == Clock::Steps {
            return Ok(Self { means: None });
        }
        let mean = |state: usize| {
            let Some(rate) = chain.rate(state).filter(|rate| !rate.is_zero()) else { return Ok(Dd::ZERO) };
            let ((over, up), (under, down)) =
                (Dd::of_big(rate.denominator()), Dd::of_big(&rate.numerator().unsigned_abs()));
            let ratio = over.over(under);
            let shift = up - down;
            let scale = power_of_two(shift);
            let mean = Dd { hi: ratio.hi * scale, lo: ratio.lo * scale };
            // Beyond these shifts the power of two is not exact, and nothing near them is of use.
            let is_usable = shift.abs() < 900 && mean.is_in_range();
            is_usable.then_some(mean).ok_or_else(|| ExactError::OutOfRange { example: chain.name(state).to_owned() })
        };
        Ok(Self { means: Some((0..chain.states()).map(mean).collect::<Result<_, _>>()?) })
    }

    /// The mean holding time of a state in clock units, within [`INPUT`] units of u²; `None` when it is one step.
    pub(super) fn of(&self, state: usize) -> Option<Dd> {
        self.means.as_ref().map(|means| means[state])
    }

    /// Whether the clock counts steps.
    pub(super) fn is_one_step(&self) -> bool {
        self.means.is_none()
    }

    /// The mean time of one visit of each state.
    pub(super) fn once(&self, states: usize) -> Solution {
        match &self.means {
            None => Solution { of: vec![Dd::ONE; states], error: 0.0 },
            Some(means) => Solution { of: means.clone(), error: U2 * INPUT },
        }
    }

    /// Numbers of visits as times spent.
    ///
    /// # Errors
    /// [`ExactError::OutOfRange`].
    pub(super) fn spent(&self, chain: &Chain, visits: Solution) -> Result<Solution, ExactError> {
        let Some(means) = &self.means else { return Ok(visits) };
        let spent = |(state, (visits, mean)): (usize, (&Dd, &Dd))| {
            product(*visits, *mean).map_err(|_| ExactError::OutOfRange { example: chain.name(state).to_owned() })
        };
        let of = visits.of.iter().zip(means).enumerate().map(spent).collect::<Result<_, _>>()?;
        Ok(Solution { of, error: visits.error + U2 * (INPUT + 5.0) })
    }
}
