//! What time means to a model.

/// The clock of a model.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub enum Clock {
    /// Discrete time: moves have probabilities, and each takes one step.
    #[default]
    Steps,
    /// Continuous time: moves have rates, and a state is held for an exponential time.
    Rates,
}

impl Clock {
    /// The word of the model file.
    pub fn name(self) -> &'static str {
        match self {
            Self::Steps => "steps",
            Self::Rates => "rates",
        }
    }

    /// The unit of time where none is given.
    pub(super) fn default_unit(self) -> &'static str {
        match self {
            Self::Steps => "step",
            Self::Rates => "unit",
        }
    }
}
