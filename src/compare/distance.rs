//! The largest distance between a law and a sample, from values at single times.

use crate::exact::Bounded;

/// A law and a sample, up to one time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Point {
    /// The time; `None` for the end of all times.
    pub(super) time: Option<u64>,
    /// The probability up to it.
    pub(super) exact: Bounded,
    /// The share of replications up to it.
    pub(super) share: f64,
}

/// What is known of the supremum over all times of |share − probability|.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(super) struct Distance {
    /// It is not smaller than this.
    pub(super) at_least: f64,
    /// It is this at the points, for the rounded probabilities.
    pub(super) seen: f64,
    /// It is not larger than this.
    pub(super) at_most: f64,
}

impl Distance {
    /// The larger of both, part by part.
    pub(super) fn max(self, other: Self) -> Self {
        Self {
            at_least: self.at_least.max(other.at_least),
            seen: self.seen.max(other.seen),
            at_most: self.at_most.max(other.at_most),
        }
    }

    /// That of a curve given at ascending times, the last of them the end of all times.
    ///
    /// Between two points both functions lie between their values there, so the distance is at most that of one function
    /// at the right and the other at the left. Neighbouring whole times have nothing between them.
    pub(super) fn of(points: impl IntoIterator<Item = Point>) -> Self {
        let mut distance = Self::default();
        walk(points, |left, right, gap| {
            let (share, Bounded { value, low, high }) = (right.share, right.exact);
            let mut at_most = (high - share).max(share - low);
            if gap {
                at_most = at_most.max(share - left.exact.low).max(high - left.share);
            }
            let at_least = (low - share).max(share - high).max(0.0);
            distance = distance.max(Self { at_least, seen: (share - value).abs(), at_most });
        });
        distance
    }
}

/// The most that the law gains between two neighbouring points with times between them: what [`Distance::of`] may add to
/// the distance at the points.
pub(super) fn widest_gap(points: impl IntoIterator<Item = Point>) -> f64 {
    let mut widest = 0.0_f64;
    walk(points, |left, right, gap| {
        if gap {
            widest = widest.max(right.exact.high - left.exact.low);
        }
    });
    widest
}

/// Shows each point with the one before it and whether there are times between them.
fn walk(points: impl IntoIterator<Item = Point>, mut visit: impl FnMut(Point, Point, bool)) {
    let mut left = Point { time: None, exact: Bounded::exactly(0.0), share: 0.0 };
    let mut next_time = Some(0);
    for right in points {
        let gap = match (next_time, right.time) {
            (Some(next), Some(time)) => next < time,
            (_, None) => true,
            (None, Some(_)) => false,
        };
        visit(left, right, gap);
        next_time = right.time.and_then(|time| time.checked_add(1));
        left = right;
    }
}
