//! The law of end and time.

use super::Bounded;

/// The joint law of end and time, step by step from the start to a horizon beyond which less than 1e-9 is left, and
/// beyond every time and quantile that was asked for.
#[derive(Debug, Clone)]
pub struct Law {}

impl Law {
    /// The last time that was computed.
    pub fn horizon(&self) -> u64 {
        todo!()
    }

    /// P(time > t). Beyond the horizon the bounds are 0 and what was left there.
    pub fn survival(&self, time: u64) -> Bounded {
        let _ = time;
        todo!()
    }

    /// P(time ≤ t), as survival is.
    pub fn at_or_below(&self, time: u64) -> Bounded {
        let _ = time;
        todo!()
    }

    /// The smallest t with P(time ≤ t) ≥ p: `low = high = value` unless the proven error leaves two candidates, which
    /// are then `low` and `high = low + 1`. `None` when it lies beyond the horizon.
    pub fn quantile(&self, p: f64) -> Option<Bounded> {
        let _ = p;
        todo!()
    }

    /// Ascending times, the last of them the horizon, at which P(end = e, time ≤ t) was kept: so close that no end
    /// gathers more than 1/4096 between two of them, save in a single step.
    pub fn edges(&self) -> &[u64] {
        todo!()
    }

    /// P(end = e, time ≤ `edges()[edge]`).
    ///
    /// # Panics
    /// When there is no such end or edge.
    pub fn at_edge(&self, end: usize, edge: usize) -> Bounded {
        let _ = (end, edge);
        todo!()
    }

    /// Whether a replication can finish in that end at that time at all. Beyond the horizon the answer is `true`.
    ///
    /// # Panics
    /// When there is no such end.
    pub fn is_possible(&self, end: usize, time: u64) -> bool {
        let _ = (end, time);
        todo!()
    }
}
