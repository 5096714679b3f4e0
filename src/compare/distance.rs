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

#[cfg(test)]
mod tests {
    use rand_pcg::Lcg128CmDxsm64;
    use rand_pcg::rand_core::Rng;

    use super::*;

    /// A distribution function on 0..len with many flat stretches, not reaching 1: some mass lies beyond.
    fn function(draw: &mut impl FnMut(u64) -> u64, len: usize) -> Vec<f64> {
        let steps: Vec<u64> = (0..len).map(|_| if draw(3) == 0 { draw(100) } else { 0 }).collect();
        let total = steps.iter().sum::<u64>() + 1 + draw(20);
        let mut sum = 0;
        steps
            .iter()
            .map(|step| {
                sum += step;
                sum as f64 / total as f64
            })
            .collect()
    }

    // 2,000 pairs of functions with random cuts and bounds, against the maximum over all times.
    #[test]
    fn the_bounds_hold_the_largest_distance() {
        let mut rng = Lcg128CmDxsm64::new(11, 5);
        let mut draw = |below: u64| rng.next_u64() % below;
        let mut exact_ones = 0;
        for case in 0..2000 {
            let len = 1 + draw(60) as usize;
            let (law, sample) = (function(&mut draw, len), function(&mut draw, len));
            let error = [0.0, 0.01][case % 2];
            let beyond = (law[len - 1] - sample[len - 1]).abs();
            let truth = law.iter().zip(&sample).map(|(f, g)| (f - g).abs()).fold(beyond, f64::max);
            let every = draw(4) == 0;
            // The last time is always cut, and nothing happens between it and the end of all times here.
            let cuts: Vec<usize> = (0..len).filter(|time| every || *time == len - 1 || draw(3) == 0).collect();
            let bounded = |value: f64| Bounded { value, low: value - error, high: value + 0.5 * error };
            let inner =
                cuts.iter().map(|t| Point { time: Some(*t as u64), exact: bounded(law[*t]), share: sample[*t] });
            let last = Point { time: None, exact: bounded(law[len - 1]), share: sample[len - 1] };
            let points: Vec<Point> = inner.chain([last]).collect();
            let distance = Distance::of(points.iter().copied());
            assert!(distance.at_least <= truth + 1e-15 && truth <= distance.at_most + 1e-15, "case {case}");
            assert!(distance.at_least <= distance.seen && distance.seen <= distance.at_most);
            // What the cells hide is bounded by what the law gains in the widest.
            let at_points = points.iter().map(|p| (p.share - p.exact.value).abs()).fold(0.0, f64::max);
            assert!(distance.at_most <= at_points + widest_gap(points) + 2.0 * error + 1e-15, "case {case}");
            if every && error == 0.0 {
                exact_ones += 1;
                assert!((distance.at_least - truth).abs() < 1e-15);
                assert!((distance.seen - truth).abs() < 1e-15);
            }
        }
        assert!(exact_ones > 100);
    }

    #[test]
    fn neighbouring_times_hide_nothing_and_others_do() {
        let point = |time, value, share| Point { time, exact: Bounded::exactly(value), share };
        let close = [point(Some(0), 0.0, 0.0), point(Some(1), 0.5, 0.5), point(None, 0.5, 0.5)];
        assert_eq!(Distance::of(close), Distance::default());
        assert_eq!(widest_gap(close), 0.0);
        // Time 0 is not cut here: all of the half may come at 0 in one and at 1 in the other.
        let apart = [point(Some(1), 0.5, 0.5), point(None, 0.5, 0.5)];
        assert_eq!(Distance::of(apart), Distance { at_least: 0.0, seen: 0.0, at_most: 0.5 });
        assert_eq!(widest_gap(apart), 0.5);
    }
}
