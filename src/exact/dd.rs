//! Double-double arithmetic: an unevaluated sum `hi + lo` of two doubles, about 106 bits.
//!
//! With `u = 2⁻⁵³` and no underflow, the relative errors are at most 3 u² for sums of equal sign and for [`Dd::sum`] of any
//! signs, 5 u² for products and 15 u² for quotients (Joldes, Muller & Popescu, ACM Trans. Math. Softw.
//! 44 (2017) 15, doi:10.1145/3121432, algorithms 5, 6, 10 and 17). Low-order terms use plain multiplications and
//! additions, so machines with and without a fused multiply-add give the same bits.

use dashu_int::UBig;
use dashu_int::ops::BitTest;

/// `u²`: the unit of every error bound here.
pub(super) const U2: f64 = 1.0 / (1u128 << 106) as f64;
/// Units of `u²` that a probability loses when its exact weights become a [`Dd`]: two conversions and a quotient.
pub(super) const INPUT: f64 = 18.0;

/// Numbers below this could lose their low-order part to underflow.
pub(super) const SMALLEST: f64 = 1.183_129_797_395_182_6e-271; // 2^-900
/// Numbers above this could overflow within a product, where their halves are split.
pub(super) const LARGEST: f64 = 6.696_928_794_914_171e299; // 2^996

/// A number of about 106 bits.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(super) struct Dd {
    pub(super) hi: f64,
    pub(super) lo: f64,
}

/// `a + b` and its rounding error, exactly.
#[inline(always)]
pub(super) fn two_sum(a: f64, b: f64) -> (f64, f64) {
    let s = a + b;
    let t = s - a;
    (s, (a - (s - t)) + (b - t))
}

/// The same for `|a| ≥ |b|`.
#[inline(always)]
pub(super) fn fast_two_sum(a: f64, b: f64) -> (f64, f64) {
    let s = a + b;
    (s, b - (s - a))
}

/// `a · b` and its rounding error, exactly; by Dekker's splitting, without a fused multiply-add.
#[inline(always)]
pub(super) fn two_product(a: f64, b: f64) -> (f64, f64) {
    let p = a * b;
    let (ah, al) = split(a);
    let (bh, bl) = split(b);
    (p, ((ah * bh - p) + ah * bl + al * bh) + al * bl)
}

#[inline(always)]
fn split(a: f64) -> (f64, f64) {
    let c = 134_217_729.0 * a;
    let high = c - (c - a);
    (high, a - high)
}

impl Dd {
    pub(super) const ZERO: Self = Self { hi: 0.0, lo: 0.0 };
    pub(super) const ONE: Self = Self { hi: 1.0, lo: 0.0 };

    pub(super) fn of(value: f64) -> Self {
        Self { hi: value, lo: 0.0 }
    }

    /// Exact.
    pub(super) fn of_u64(value: u64) -> Self {
        // Both halves fit into 53 bits, and so does their exact sum into two doubles.
        let (hi, lo) = two_sum((value >> 32) as f64 * 4_294_967_296.0, (value & 0xffff_ffff) as f64);
        Self { hi, lo }
    }

    /// Exact.
    pub(super) fn of_i64(value: i64) -> Self {
        let size = Self::of_u64(value.unsigned_abs());
        if value < 0 { Self::ZERO.minus(size) } else { size }
    }

    /// The top 106 bits or so of a large integer, scaled by a power of two that is returned: `value ≈ result · 2^shift`,
    /// within u² relatively.
    pub(super) fn of_big(value: &UBig) -> (Self, i64) {
        let shift = value.bit_len().saturating_sub(120);
        let top = u128::try_from(value >> shift).unwrap_or(u128::MAX);
        let high = Self::of_u64((top >> 64) as u64);
        let low = Self::of_u64(top as u64);
        let scale = 18_446_744_073_709_551_616.0;
        (Self { hi: high.hi * scale, lo: high.lo * scale }.sum(low), shift as i64)
    }

    /// The sum, for any signs (algorithm 6).
    pub(super) fn sum(self, other: Self) -> Self {
        let (s, e) = two_sum(self.hi, other.hi);
        let (t, f) = two_sum(self.lo, other.lo);
        let (s, e) = fast_two_sum(s, e + t);
        let (hi, lo) = fast_two_sum(s, e + f);
        Self { hi, lo }
    }

    /// The sum of two numbers of equal sign (algorithm 5): faster, and as accurate.
    pub(super) fn plus(self, other: Self) -> Self {
        let (s, e) = two_sum(self.hi, other.hi);
        let (hi, lo) = fast_two_sum(s, e + (self.lo + other.lo));
        Self { hi, lo }
    }

    pub(super) fn minus(self, other: Self) -> Self {
        self.sum(Self { hi: -other.hi, lo: -other.lo })
    }

    pub(super) fn times(self, other: Self) -> Self {
        let (p, e) = two_product(self.hi, other.hi);
        let (hi, lo) = fast_two_sum(p, e + (self.hi * other.lo + self.lo * other.hi));
        Self { hi, lo }
    }

    /// The quotient; `other` must not be zero.
    pub(super) fn over(self, other: Self) -> Self {
        let q = self.hi / other.hi;
        let (p, e) = two_product(q, other.hi);
        let rest = ((self.hi - p) - e + self.lo) - q * other.lo;
        let (hi, lo) = fast_two_sum(q, rest / other.hi);
        Self { hi, lo }
    }

    pub(super) fn is_zero(self) -> bool {
        self.hi == 0.0
    }

    /// Whether a number that is not negative is zero or so far from underflow and overflow that the bounds hold.
    pub(super) fn is_in_range(self) -> bool {
        self.is_zero() || (SMALLEST..=LARGEST).contains(&self.hi)
    }

    pub(super) fn to_f64(self) -> f64 {
        self.hi
    }
}

/// `2^exponent` as a double, in the range where it is exact.
pub(super) fn power_of_two(exponent: i64) -> f64 {
    2f64.powi(exponent.clamp(-1074, 1023) as i32)
}

#[cfg(test)]
mod tests {
    use dashu_int::IBig;
    use dashu_ratio::RBig;

    use super::*;

    fn exact(x: Dd) -> RBig {
        RBig::try_from(x.hi).unwrap() + RBig::try_from(x.lo).unwrap()
    }

    fn relative_units(got: Dd, truth: &RBig) -> f64 {
        let off = (exact(got) - truth.clone()) / truth.clone();
        off.to_f64().value().abs() / U2
    }

    /// Numbers of 106 random bits with exponents from -30 to 30, by a fixed multiplicative generator.
    fn numbers(count: usize) -> Vec<Dd> {
        let mut state = 0x9e37_79b9_7f4a_7c15_u64;
        let mut next = move || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            state ^ (state >> 29)
        };
        (0..count)
            .map(|_| {
                let hi = (next() >> 11) as f64 * power_of_two((next() % 60) as i64 - 83);
                let (hi, lo) = fast_two_sum(hi, hi * (next() as f64 / 2f64.powi(64) - 0.5) * 2f64.powi(-52));
                Dd { hi, lo }
            })
            .collect()
    }

    #[test]
    fn sums_products_and_quotients_stay_within_their_bounds() {
        let numbers = numbers(4000);
        for pair in numbers.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            assert!(relative_units(a.plus(b), &(exact(a) + exact(b))) <= 3.01);
            assert!(relative_units(a.sum(b), &(exact(a) + exact(b))) <= 3.01);
            assert!(relative_units(a.times(b), &(exact(a) * exact(b))) <= 5.01);
            assert!(relative_units(a.over(b), &(exact(a) / exact(b))) <= 15.01);
        }
    }

    #[test]
    fn integers_convert_exactly_or_within_a_unit() {
        for value in [0, 1, u64::MAX, 1 << 53, (1 << 53) + 1, 9_999_999_999_999_999_999] {
            assert_eq!(exact(Dd::of_u64(value)), RBig::from(IBig::from(value)));
        }
        let big = UBig::from(7u8).pow(300);
        let (top, shift) = Dd::of_big(&big);
        let truth = RBig::from(IBig::from(big)) / RBig::from(IBig::from(UBig::ONE << shift as usize));
        assert!(relative_units(top, &truth) <= 1.01);
    }
}
