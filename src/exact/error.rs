//! Why an exact answer is refused.

use std::fmt;

/// Why there are no exact answers.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum ExactError {
    /// A communicating class that would take too long, or too much memory, to eliminate.
    TooLarge {
        /// Classes that are too large together: one, if it is too large alone.
        classes: usize,
        /// Their states.
        states: usize,
        /// One of them.
        example: String,
        /// Multiply-adds that it would take at least, and those that are allowed.
        work: (u64, u64),
        /// Bytes that it would take at least, and those that are allowed.
        bytes: (u64, u64),
    },
    /// Numbers below 2⁻⁹⁰⁰ or above 2⁹⁹⁶ occurred, where double-double arithmetic loses its bounds.
    OutOfRange {
        /// A state of the class where they occurred.
        example: String,
    },
    /// The independent reference solver contradicts the elimination: an internal error.
    Contradiction {
        /// Mean time by elimination.
        elimination: f64,
        /// Mean time by the reference solver.
        reference: f64,
    },
    /// The user asked to stop.
    Interrupted,
}

impl ExactError {
    /// What is wrong, and where.
    pub fn text(&self) -> String {
        match self {
            Self::TooLarge { classes, states, example, work, bytes } => format!(
                "the {} `{example}` with {states} states would take {:.1e} multiply-adds and {:.1e} bytes to eliminate, \
                 beyond the {:.1e} and {:.1e} of this version (about 2,000 states that all lead to one \
                 another)",
                if *classes == 1 {
                    "communicating class of".to_owned()
                } else {
                    format!("{classes} communicating classes around")
                },
                work.0 as f64,
                bytes.0 as f64,
                work.1 as f64,
                bytes.1 as f64
            ),
            Self::OutOfRange { example } => format!(
                "numbers below 1e-271 or above 1e299 occur around state `{example}`, where this version cannot keep its error \
                 bounds"
            ),
            Self::Contradiction { elimination, reference } => format!(
                "internal error: elimination gives a mean time of {elimination:e} and the dense reference solver \
                 {reference:e}, which its conditioning does not explain"
            ),
            Self::Interrupted => "interrupted while solving".to_owned(),
        }
    }

    /// What can be done about it.
    pub fn remedy(&self) -> &'static str {
        match self {
            Self::TooLarge { .. } => {
                "list the states in an order in which moves lead to near ones, split the model, or wait for the sparse solver"
            }
            Self::OutOfRange { .. } => {
                "check the smallest probabilities there, or leave out what cannot happen in practice"
            }
            Self::Contradiction { .. } => "please report this model",
            Self::Interrupted => "start it again",
        }
    }
}

impl fmt::Display for ExactError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}; {}", self.text(), self.remedy())
    }
}

impl std::error::Error for ExactError {}

/// Why the law of the time is not there, while the other answers are.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LawRefusal {
    /// It would take too long.
    #[error(
        "the law of the time is expected to take more than {steps} steps over {moves} moves, beyond the budget of {budget:.0e} \
         multiply-adds or of {longest} steps"
    )]
    TooLong {
        /// Moves among reachable transient states.
        moves: u64,
        /// Steps that it is expected to take at least.
        steps: u64,
        /// Multiply-adds that are allowed.
        budget: f64,
        /// Steps that are allowed.
        longest: u64,
    },
    /// It was computed to a time up to which it does not decide a quantile.
    #[error("the law of the time is known up to {horizon} steps, and does not decide this quantile")]
    Undecided {
        /// The last time that was computed.
        horizon: u64,
    },
    /// Too many states in continuous time, or rates that differ by too much.
    #[error(
        "in continuous time this version computes the law of the time for up to some 150 states, and rates that differ by less \
         than 1e15; there are {states} states"
    )]
    TooManyStates {
        /// Reachable transient states.
        states: usize,
    },
    /// The request did not ask for it.
    #[error("the law of the time was not asked for")]
    NotRequested,
}
