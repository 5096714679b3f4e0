//! The whole numbers in which times are counted.

use dashu_int::UBig;
use dashu_ratio::RBig;

/// The unit in which a tally counts time: 2⁻ᵏ clock units. Steps are counted one by one, k = 0.
///
/// Continuous time is rounded to ticks, state by state, so that its sums are whole numbers too: exact, and the same in any
/// order. The unit is chosen so fine that rounding does not matter, and so coarse that no time is too large.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Ticks {
    exponent: i32,
}

/// The longest mean time from any state on is about two to this many ticks: a time of 128 such means, which no state passes
/// with a probability above 2⁻⁶⁴, fits into 63 bits.
const LONGEST: i32 = 56;
/// Exponents are kept to sizes that doubles hold.
const LARGEST: i32 = 900;

impl Ticks {
    /// The unit for steps.
    pub const STEPS: Self = Self { exponent: 0 };

    /// The unit for continuous time, given the longest mean time, over the states, from one to the end. A guess serves: it
    /// decides the rounding, not the law of what is sampled.
    ///
    /// # Panics
    /// When it is not above zero and finite.
    pub fn for_longest(mean: f64) -> Self {
        assert!(mean > 0.0 && mean.is_finite(), "a mean time is positive and finite");
        Self { exponent: (LONGEST - mean.log2().ceil() as i32).clamp(-LARGEST, LARGEST) }
    }

    /// Ticks in a clock unit, a power of two.
    pub fn per_unit(self) -> f64 {
        2f64.powi(self.exponent)
    }

    /// The length of a tick in clock units.
    pub fn length(self) -> f64 {
        2f64.powi(-self.exponent)
    }

    /// Whether time is counted in steps.
    pub fn is_steps(self) -> bool {
        self == Self::STEPS
    }

    /// k, where a tick is 2⁻ᵏ clock units.
    pub fn exponent(self) -> i32 {
        self.exponent
    }

    /// A time in clock units as the nearest number of ticks; `None` when it is negative or beyond 64 bits.
    pub fn count(self, time: &RBig) -> Option<u64> {
        let power = RBig::from(UBig::ONE << self.exponent.unsigned_abs() as usize);
        let ticks = if self.exponent < 0 { time / power } else { time * power };
        u64::try_from(ticks.round()).ok()
    }

    /// A number of ticks in clock units, rounded to a double.
    pub fn time(self, ticks: u64) -> f64 {
        ticks as f64 * self.length()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_longest_mean_has_room_above_and_below() {
        for mean in [1e-9, 0.7, 1.0, 3.0, 875.0, 1e12, 1e30] {
            let ticks = Ticks::for_longest(mean);
            let of_mean = mean * ticks.per_unit();
            assert!((2f64.powi(55)..=2f64.powi(56)).contains(&of_mean), "{mean}: {of_mean:e}");
            assert_eq!(ticks.length() * ticks.per_unit(), 1.0);
        }
    }

    #[test]
    fn times_are_counted_to_the_nearest_tick() {
        let count = |ticks: Ticks, text: &str| ticks.count(&text.parse::<RBig>().unwrap());
        assert_eq!(count(Ticks::STEPS, "12"), Some(12));
        let ticks = Ticks { exponent: 3 };
        assert_eq!(["5/2", "1/24", "1/3", "-1"].map(|text| count(ticks, text)), [Some(20), Some(0), Some(3), None]);
        assert_eq!(count(Ticks { exponent: -2 }, "7"), Some(2));
        assert_eq!(count(ticks, "9223372036854775807"), None);
        assert_eq!(ticks.time(20), 2.5);
    }
}
