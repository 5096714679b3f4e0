//! Exact power sums of whole numbers, and the moments that they give.
//!
//! A tally of step counts, or of costs over their denominator, is a set of whole numbers, so its power sums are whole numbers too and can be kept without any
//! rounding. They merge by addition, in any order, to the same result; and the moments are formed from them exactly and
//! rounded once. A running sum of squares in doubles would lose the variance altogether when the mean is large.

use super::rounding::ratio_to_f64;
use dashu_int::{IBig, UBig};

/// The number of values with the sums of their first four powers, exact.
///
/// The moments below treat the values as observations of one law. Each is `None` where it is undefined.
///
/// ```
/// use tallystone::statistics::PowerSums;
/// let mut sums = PowerSums::default();
/// sums.add(10_000_001);
/// sums.add_many(10_000_002, 2);
/// sums.add(10_000_003);
/// assert_eq!(sums.mean(), Some(10_000_002.0));
/// assert_eq!(sums.variance(), Some(2.0 / 3.0));
/// assert_eq!(sums.skewness(), Some(0.0));
/// ```
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct PowerSums {
    count: u64,
    sums: [IBig; 4],
}

impl PowerSums {
    /// The tally whose parts were kept elsewhere: the number of values and the sums of their powers 1 to 4.
    #[must_use]
    pub fn from_parts(count: u64, sums: [IBig; 4]) -> Self {
        Self { count, sums }
    }

    /// Adds one value. Many values in a row go through [`PowerSumsBlock`] much faster.
    pub fn add(&mut self, value: u64) {
        self.add_many(value, 1);
    }

    /// Adds the same value `copies` times.
    pub fn add_many(&mut self, value: u64, copies: u64) {
        self.count += copies;
        let mut term = IBig::from(copies);
        for sum in &mut self.sums {
            term *= value;
            *sum += &term;
        }
    }

    /// Adds all values of another tally; the order of merges never matters.
    pub fn merge(&mut self, other: &Self) {
        self.count += other.count;
        for (sum, more) in self.sums.iter_mut().zip(&other.sums) {
            *sum += more;
        }
    }

    /// The number of values.
    #[must_use]
    pub fn count(&self) -> u64 {
        self.count
    }

    /// The sums of the powers 1 to 4.
    #[must_use]
    pub fn sums(&self) -> &[IBig; 4] {
        &self.sums
    }

    /// The mean, correctly rounded; `None` without values.
    #[must_use]
    pub fn mean(&self) -> Option<f64> {
        ratio_to_f64(&self.sums[0], &UBig::from(self.count))
    }

    /// The sample variance, divisor n − 1, correctly rounded; `None` below two values.
    #[must_use]
    pub fn variance(&self) -> Option<f64> {
        let fewer = self.count.checked_sub(1)?;
        ratio_to_f64(&self.scaled_second(), &(UBig::from(self.count) * fewer))
    }

    /// The central moment of order 2, 3 or 4, divisor n, correctly rounded.
    ///
    /// `None` without values, and for any other order.
    #[must_use]
    pub fn central_moment(&self, order: u32) -> Option<f64> {
        let scaled = match order {
            2 => self.scaled_second(),
            3 => self.scaled_third(),
            4 => self.scaled_fourth(),
            _ => return None,
        };
        ratio_to_f64(&scaled, &UBig::from(self.count).pow(order as usize))
    }

    /// The skewness m₃/m₂^{3/2} of the values themselves (divisor n); `None` if they are all equal.
    ///
    /// Within a few units in the last place: both moments are correctly rounded.
    #[must_use]
    pub fn skewness(&self) -> Option<f64> {
        let second = self.central_moment(2)?;
        let third = self.central_moment(3)?;
        (second > 0.0).then(|| third / second / second.sqrt())
    }

    /// The excess kurtosis m₄/m₂² − 3 of the values themselves (divisor n), correctly rounded; `None` if they are all
    /// equal.
    #[must_use]
    pub fn excess_kurtosis(&self) -> Option<f64> {
        // Both moments carry the same power of n, which drops out.
        let square = self.scaled_second().pow(2);
        let excess = self.scaled_fourth() - IBig::from(3) * &square;
        ratio_to_f64(&excess, &UBig::try_from(square).ok()?)
    }

    /// n² m₂ = n S₂ − S₁².
    fn scaled_second(&self) -> IBig {
        let [n, s1, s2, _, _] = self.signed();
        n * s2 - s1.pow(2)
    }

    /// n³ m₃ = n² S₃ − 3 n S₁ S₂ + 2 S₁³.
    fn scaled_third(&self) -> IBig {
        let [n, s1, s2, s3, _] = self.signed();
        n.pow(2) * s3 - IBig::from(3) * n * &s1 * s2 + IBig::from(2) * s1.pow(3)
    }

    /// n⁴ m₄ = n³ S₄ − 4 n² S₁ S₃ + 6 n S₁² S₂ − 3 S₁⁴.
    fn scaled_fourth(&self) -> IBig {
        let [n, s1, s2, s3, s4] = self.signed();
        n.pow(3) * s4 - IBig::from(4) * n.pow(2) * &s1 * s3 + IBig::from(6) * n * s1.pow(2) * s2
            - IBig::from(3) * s1.pow(4)
    }

    fn signed(&self) -> [IBig; 5] {
        let [s1, s2, s3, s4] = &self.sums;
        [IBig::from(self.count), s1.clone(), s2.clone(), s3.clone(), s4.clone()]
    }
}

/// The fast way into [`PowerSums`]: plain 128-bit sums, settled into exact ones before they can overflow.
///
/// At most [`CAPACITY`](Self::CAPACITY) values below 2²⁹ are held back at a time. A fourth power is then below 2¹¹⁶, and
/// the sum of 2¹² of them below 2¹²⁸; lower powers are smaller still. Larger values bypass the block.
///
/// ```
/// use tallystone::statistics::PowerSumsBlock;
/// let mut block = PowerSumsBlock::default();
/// for steps in 1..=10_000 {
///     block.add(steps);
/// }
/// assert_eq!(block.finish().mean(), Some(5_000.5));
/// ```
#[derive(Clone, Debug, Default)]
pub struct PowerSumsBlock {
    held: u64,
    sums: [u128; 4],
    settled: PowerSums,
}

impl PowerSumsBlock {
    /// The number of values held back before they are settled.
    pub const CAPACITY: u64 = 4096;

    /// Values from here on are added exactly, one by one.
    const LARGE: u64 = 1 << 29;

    /// Adds one value: a few nanoseconds below 2²⁹.
    #[inline]
    pub fn add(&mut self, value: u64) {
        if value >= Self::LARGE {
            self.settled.add(value);
            return;
        }
        if self.held == Self::CAPACITY {
            self.settle();
        }
        self.held += 1;
        // The square of 29 bits fits 64.
        let square = value * value;
        let wide = u128::from(square);
        self.sums[0] += u128::from(value);
        self.sums[1] += wide;
        self.sums[2] += wide * u128::from(value);
        self.sums[3] += wide * wide;
    }

    /// All values added so far, as exact sums.
    #[must_use]
    pub fn finish(mut self) -> PowerSums {
        self.settle();
        self.settled
    }

    #[cold]
    fn settle(&mut self) {
        let held = std::mem::take(&mut self.held);
        let sums = std::mem::take(&mut self.sums).map(IBig::from);
        self.settled.merge(&PowerSums::from_parts(held, sums));
    }
}
