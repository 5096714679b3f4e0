//! Answers with their proven bounds.

use super::dd::Dd;

/// An answer and an interval that certainly holds the truth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bounded {
    /// The answer, rounded to a double.
    pub value: f64,
    /// Not above the truth.
    pub low: f64,
    /// Not below the truth.
    pub high: f64,
}

impl Bounded {
    /// A number that is known exactly.
    pub fn exactly(value: f64) -> Self {
        Self { value, low: value, high: value }
    }

    /// A double-double within `error` of a truth that is not negative; `None` when either is no finite number, which is
    /// all that an overflow leaves.
    pub(super) fn within(value: Dd, error: f64) -> Option<Self> {
        let Self { value, low, high } = Self::signed(value, error)?;
        Some(Self { value: value.max(0.0), low: low.max(0.0), high: high.max(0.0) })
    }

    /// The same for a truth of any sign.
    pub(super) fn signed(value: Dd, error: f64) -> Option<Self> {
        if !(value.hi.is_finite() && value.lo.is_finite() && error.is_finite()) {
            return None;
        }
        if value.lo == 0.0 && error == 0.0 {
            return Some(Self::exactly(value.hi));
        }
        // The comparisons hold a unit of slack, since the error itself is a rounded number.
        let slack = error * (1.0 + 1e-10) + f64::MIN_POSITIVE;
        let low = if value.lo >= slack { value.hi } else { outwards(value.hi, value.lo - slack) };
        let high = if value.lo <= -slack { value.hi } else { outwards(value.hi, value.lo + slack) };
        Some(Self { value: value.hi, low, high })
    }

    /// A truth that is not negative, within the share `relative` of it.
    pub(super) fn relative(value: Dd, relative: f64) -> Option<Self> {
        Self::within(value, value.hi * relative * (1.0 + 1e-10))
    }

    /// The same for a truth that is a probability, of which at least that is known.
    pub(super) fn probability(found: Option<Self>) -> Self {
        let Self { value, low, high } = found.unwrap_or(Self { value: 0.5, low: 0.0, high: 1.0 });
        Self { value: value.min(1.0), low: low.min(1.0), high: high.min(1.0) }
    }

    /// The same with more room on either side.
    #[must_use]
    pub fn widened(self, by: f64) -> Self {
        if by == 0.0 {
            self
        } else {
            Self { value: self.value, low: (self.low - by).next_down(), high: (self.high + by).next_up() }
        }
    }

    /// The square root, for an answer that is not negative.
    #[must_use]
    pub fn sqrt(self) -> Self {
        if self.high == 0.0 {
            return Self::exactly(0.0);
        }
        let value = self.value.sqrt();
        Self { value, low: self.low.sqrt().next_down().max(0.0), high: self.high.sqrt().next_up() }
    }

    /// Largest distance between the answer and the truth.
    pub fn error(&self) -> f64 {
        (self.high - self.value).max(self.value - self.low)
    }

    /// Whether a number may be the truth.
    pub fn contains(&self, value: f64) -> bool {
        (self.low..=self.high).contains(&value)
    }
}

/// `base + step`, rounded away from `base` by one double more than needed.
fn outwards(base: f64, step: f64) -> f64 {
    let sum = base + step;
    if step < 0.0 { sum.min(base).next_down() } else { sum.max(base).next_up() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_face_outwards_and_exact_numbers_have_none() {
        assert_eq!(Bounded::within(Dd::of(21.0), 0.0), Some(Bounded::exactly(21.0)));
        let tight = Bounded::within(Dd { hi: 21.0, lo: 1e-17 }, 1e-25).unwrap();
        assert_eq!(tight.low, 21.0);
        assert!(tight.high > 21.0 && tight.high <= 21.0f64.next_up().next_up());
        let wide = Bounded::within(Dd::of(1e-3), 1e-2).unwrap();
        assert_eq!(wide.low, 0.0);
        assert!(wide.high > 1.1e-2);
        let root = Bounded::exactly(2.0).sqrt();
        assert!(root.low < root.value && root.value < root.high);
        assert_eq!(Bounded::exactly(0.0).sqrt(), Bounded::exactly(0.0));
    }

    #[test]
    fn an_overflow_is_never_an_answer() {
        let overflown = Dd::of(1e300).times(Dd::of(1e300));
        for (value, error) in
            [(overflown, 0.0), (Dd::of(f64::INFINITY), 0.0), (Dd::ONE, f64::NAN), (Dd::ONE, f64::INFINITY)]
        {
            assert_eq!(Bounded::within(value, error), None);
        }
        assert_eq!(Bounded::probability(None), Bounded { value: 0.5, low: 0.0, high: 1.0 });
    }
}
