//! From an exact fraction to the nearest double, with one rounding.

use dashu_int::ops::{BitTest, UnsignedAbs};
use dashu_int::{IBig, Sign, UBig};

/// Bits kept of the quotient: at least 53 for the double, one to round and one to spare.
const KEPT_BITS: i64 = 64;

/// The double nearest to `numerator / denominator`, ties to even; `None` for a denominator of 0.
///
/// # Accuracy
/// Correctly rounded wherever the quotient is a normal number. Below 2.2e-308 a second rounding can add one unit in the
/// last place; above the largest double the result is infinite.
///
/// # Complexity
/// One long division.
///
/// ```
/// use dashu_int::{IBig, UBig};
/// use tallystone::statistics::ratio_to_f64;
/// assert_eq!(ratio_to_f64(&IBig::from(-1), &UBig::from(3_u8)), Some(-1.0 / 3.0));
/// ```
#[must_use]
pub fn ratio_to_f64(numerator: &IBig, denominator: &UBig) -> Option<f64> {
    if denominator.is_zero() {
        return None;
    }
    let magnitude = numerator.unsigned_abs();
    if magnitude.is_zero() {
        return Some(0.0);
    }
    // Scale so that the whole quotient has 65 or 66 bits, then remember in its last bit whether anything is left.
    let shift = KEPT_BITS + 1 - (magnitude.bit_len() as i64 - denominator.bit_len() as i64);
    let (scaled, divisor) = if shift >= 0 {
        (magnitude << shift.unsigned_abs() as usize, denominator.clone())
    } else {
        (magnitude, denominator.clone() << shift.unsigned_abs() as usize)
    };
    let quotient = &scaled / &divisor;
    let left_over = scaled != &quotient * &divisor;
    let Ok(bits) = u128::try_from(quotient) else {
        unreachable!("a quotient of numbers scaled to 65 bits more has at most 66")
    };
    // The conversion rounds to nearest, ties to even; the sticky bit breaks ties that are none.
    let rounded = (bits | u128::from(left_over)) as f64;
    let value = scale_by_power_of_two(rounded, -shift);
    Some(if numerator.sign() == Sign::Negative { -value } else { value })
}

/// `value · 2^exponent`, in steps that stay inside the range of a double.
fn scale_by_power_of_two(value: f64, exponent: i64) -> f64 {
    let mut value = value;
    let mut left = exponent;
    while left != 0 && value != 0.0 && value.is_finite() {
        let step = left.clamp(-1000, 1000);
        value *= 2.0_f64.powi(step as i32);
        left -= step;
    }
    value
}
