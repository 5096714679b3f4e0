//! A closed interval of the real line.

/// A closed interval `[low, high]`, in the units of the quantity it covers.
///
/// A confidence interval never says at which level it holds; the function that made it does.
///
/// ```
/// use tallystone::statistics::Interval;
/// let interval = Interval { low: 1.0, high: 4.0 };
/// assert!(interval.contains(4.0));
/// assert_eq!(interval.half_width(), 1.5);
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interval {
    /// The lower end, itself inside.
    pub low: f64,
    /// The upper end, itself inside.
    pub high: f64,
}

impl Interval {
    /// Whether `x` lies inside, ends included; NaN lies nowhere.
    #[must_use]
    pub fn contains(&self, x: f64) -> bool {
        self.low <= x && x <= self.high
    }

    /// Half the distance between the ends.
    #[must_use]
    pub fn half_width(&self) -> f64 {
        // Halved first, so that the widest finite interval does not overflow.
        0.5 * self.high - 0.5 * self.low
    }
}

/// Whether `alpha` can be the level of an interval: strictly between 0 and 1.
pub(super) fn is_level(alpha: f64) -> bool {
    alpha > 0.0 && alpha < 1.0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ends_are_inside_and_nan_is_not() {
        let interval = Interval { low: -1.0, high: 2.0 };
        assert!(interval.contains(-1.0) && interval.contains(2.0));
        assert!(!interval.contains(2.0_f64.next_up()) && !interval.contains((-1.0_f64).next_down()));
        assert!(!interval.contains(f64::NAN));
    }

    #[test]
    fn half_width_does_not_overflow() {
        let interval = Interval { low: -f64::MAX, high: f64::MAX };
        assert_eq!(interval.half_width(), f64::MAX);
    }
}
