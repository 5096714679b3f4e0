//! Why an exact answer is refused.

/// Why there are no exact answers.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ExactError {
    /// A communicating class that would take too long to eliminate.
    #[error(
        "the communicating class of `{example}` has {states} states, which would take about {work:.1e} multiply-adds to \
         eliminate; this version stops at {limit:.1e} (about 2,000 states that all lead to one another): list the states in an order in which \
         moves lead to near ones, split the model, or wait for the sparse solver",
        limit = *limit as f64, work = *work as f64
    )]
    TooLarge {
        /// States of the class.
        states: usize,
        /// One of them.
        example: String,
        /// Multiply-adds that it would take.
        work: u64,
        /// Multiply-adds that are allowed.
        limit: u64,
    },
    /// Numbers below 2⁻⁹⁰⁰ occurred, where double-double arithmetic loses its bounds.
    #[error(
        "numbers below 1e-271 or above 1e308 occur around state `{example}`, where this version cannot keep its error bounds; \
         check the smallest probabilities there, or leave out what cannot happen in practice"
    )]
    OutOfRange {
        /// A state of the class where they occurred.
        example: String,
    },
    /// The independent reference solver contradicts the elimination: an internal error.
    #[error(
        "internal error: elimination gives a mean time of {elimination:e} and the dense reference solver {reference:e}, \
         which its conditioning does not explain; please report this model"
    )]
    Contradiction {
        /// Mean time by elimination.
        elimination: f64,
        /// Mean time by the reference solver.
        reference: f64,
    },
    /// The user asked to stop.
    #[error("interrupted while solving")]
    Interrupted,
}

/// Why the law of the time is not there, while the other answers are.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum LawRefusal {
    /// It would take too long.
    #[error(
        "the law of the time would take more than {steps} steps over {moves} moves, beyond the budget of {budget:.0e} \
         multiply-adds or of {longest} steps"
    )]
    TooLong {
        /// Moves among reachable transient states.
        moves: u64,
        /// Steps that it would take at least.
        steps: u64,
        /// Multiply-adds that are allowed.
        budget: f64,
        /// Steps that are allowed.
        longest: u64,
    },
    /// The request did not ask for it.
    #[error("the law of the time was not asked for")]
    NotRequested,
}
