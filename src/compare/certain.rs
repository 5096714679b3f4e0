//! Rows about which nothing is random: probabilities of 0 and 1, times that the moves fix.

use crate::model::Quantity;
use crate::sampling::{Observable, Tally};

use super::sample::recorded;
use super::share::Event;

/// The only thing that the model allows.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Certain {
    /// An event happens to every replication, or to none.
    Event {
        /// The event.
        event: Event,
        /// Whether it always happens.
        always: bool,
    },
    /// Every replication that finishes in one of these ends does so at one time.
    Time {
        /// The ends.
        ends: Vec<usize>,
        /// The time.
        time: u64,
    },
    /// What is recorded of every replication that has a value is one number, over a denominator.
    Amount {
        /// What is recorded.
        observable: Observable,
        /// The number.
        amount: i128,
        /// In how many parts of its unit it is counted, and of a clock unit.
        units: (f64, f64),
    },
    /// Every replication finishes in one end at one time.
    Outcome {
        /// The end.
        end: usize,
        /// The time.
        time: u64,
    },
}

/// What a tally says of it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Seen {
    /// Replications that speak of it.
    pub(super) replications: u64,
    /// Whether any of them shows something else.
    pub(super) otherwise: bool,
    /// The estimate, if there is one.
    pub(super) estimate: Option<f64>,
}

impl Certain {
    /// Where the tally must cut.
    pub(super) fn cuts(&self) -> Vec<u64> {
        match self {
            Self::Event { event, .. } => event.cuts(),
            Self::Time { .. } | Self::Amount { .. } | Self::Outcome { .. } => Vec::new(),
        }
    }

    /// What the tally must record.
    pub(super) fn observes(&self) -> Option<Observable> {
        match self {
            Self::Event { event, .. } => event.observes(),
            Self::Amount { observable, .. } => Some(*observable),
            Self::Time { .. } | Self::Outcome { .. } => None,
        }
    }

    /// Reads a tally; the quantity says which estimate is meant.
    pub(super) fn seen(&self, quantity: &Quantity, tally: &Tally) -> Seen {
        let n = tally.replications();
        match self {
            Self::Event { event, always } => {
                let count = event.count(tally);
                let otherwise = count != if *always { n } else { 0 };
                Seen { replications: n, otherwise, estimate: (n > 0).then(|| count as f64 / n as f64) }
            }
            Self::Time { ends, time } => {
                let sums = tally.power_sums_of(ends);
                let otherwise = ends.iter().any(|end| !is_only(tally, *end, *time));
                let estimate = match quantity {
                    Quantity::VarianceTime => sums.variance(),
                    Quantity::SdTime => sums.variance().map(f64::sqrt),
                    Quantity::CovarianceTimeCost(_) => (!otherwise).then_some(0.0),
                    // A quantile of several times would need all of them.
                    Quantity::TimeQuantile(_) if otherwise => None,
                    _ => sums.mean(),
                };
                Seen { replications: sums.count(), otherwise, estimate }
            }
            Self::Amount { observable, amount, units } => {
                let column = recorded(tally, *observable);
                let (sums, unit) = (column.sums(), units.0);
                let otherwise = column.range().is_some_and(|range| range != (*amount, *amount));
                let estimate = match quantity {
                    Quantity::VarianceCost(_) | Quantity::VarianceVisits(_) => {
                        sums.values().variance().map(|variance| variance / unit / unit)
                    }
                    Quantity::CovarianceTimeCost(_) => sums.covariance().map(|covariance| covariance / unit / units.1),
                    _ => sums.values().mean().map(|mean| mean / unit),
                };
                Seen { replications: sums.count(), otherwise, estimate }
            }
            Self::Outcome { end, time } => {
                let otherwise = tally.count(*end) < n || !is_only(tally, *end, *time);
                Seen { replications: n, otherwise, estimate: (n > 0 && !otherwise).then_some(0.0) }
            }
        }
    }
}

/// Whether all outcomes at an end have one time.
fn is_only(tally: &Tally, end: usize, time: u64) -> bool {
    [tally.smallest(end), tally.largest(end)].iter().flatten().all(|seen| *seen == time)
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::sampling::Grid;

    fn tally(outcomes: &[(usize, u64, u64)]) -> Tally {
        let mut tally = Tally::new(2, Arc::new(Grid::new(vec![4])));
        outcomes.iter().for_each(|(end, time, copies)| tally.add_many(*end, *time, *copies));
        tally
    }

    #[test]
    fn one_occurrence_of_the_impossible_is_seen() {
        let never = Certain::Event { event: Event::Ends(vec![1]), always: false };
        let always = Certain::Event { event: Event::LongerThan(4), always: true };
        let quantity = Quantity::Law;
        for (outcomes, seen_never, seen_always) in [
            (&[][..], (0, false, None), (0, false, None)),
            (&[(0, 5, 1000)], (1000, false, Some(0.0)), (1000, false, Some(1.0))),
            (&[(0, 5, 999), (1, 4, 1)], (1000, true, Some(1e-3)), (1000, true, Some(0.999))),
        ] {
            let tally = tally(outcomes);
            for (certain, (replications, otherwise, estimate)) in [(&never, seen_never), (&always, seen_always)] {
                assert_eq!(certain.seen(&quantity, &tally), Seen { replications, otherwise, estimate });
            }
        }
    }

    #[test]
    fn a_fixed_time_has_its_own_estimates() {
        let fixed = Certain::Time { ends: vec![0], time: 7 };
        let right = tally(&[(0, 7, 10), (1, 3, 5)]);
        let wrong = tally(&[(0, 7, 1), (0, 9, 1)]);
        for (quantity, of_right, of_wrong) in [
            (Quantity::MeanTime, Some(7.0), Some(8.0)),
            (Quantity::VarianceTime, Some(0.0), Some(2.0)),
            (Quantity::SdTime, Some(0.0), Some(2.0_f64.sqrt())),
            (Quantity::TimeQuantile(0.5), Some(7.0), None),
        ] {
            let expected = Seen { replications: 10, otherwise: false, estimate: of_right };
            assert_eq!(fixed.seen(&quantity, &right), expected, "{quantity}");
            let expected = Seen { replications: 2, otherwise: true, estimate: of_wrong };
            assert_eq!(fixed.seen(&quantity, &wrong), expected, "{quantity}");
        }
        let law = Certain::Outcome { end: 0, time: 7 };
        assert_eq!(law.seen(&Quantity::Law, &tally(&[(0, 7, 10)])).estimate, Some(0.0));
        assert!(law.seen(&Quantity::Law, &right).otherwise);
        assert!(law.seen(&Quantity::Law, &wrong).otherwise);
    }
}
