//! Numbers as people read them.

use dashu_ratio::RBig;

use crate::exact::Bounded;
use crate::model::Number;

/// A number to some significant digits, without trailing zeros; plain decimals for usual sizes, an exponent beyond.
///
/// ```
/// use tallystone::report::rounded;
/// assert_eq!(rounded(0.123456, 3), "0.123");
/// assert_eq!(rounded(1234567.0, 3), "1230000");
/// assert_eq!(rounded(5.4123e-38, 3), "5.41e-38");
/// ```
pub fn rounded(value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".to_owned();
    }
    if value.is_nan() {
        return "undefined".to_owned();
    }
    if value.is_infinite() {
        return if value > 0.0 { "infinity" } else { "-infinity" }.to_owned();
    }
    let scientific = format!("{value:.*e}", digits.saturating_sub(1));
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
    let power: i32 = exponent.parse().unwrap_or(0);
    if !(-5..10.max(digits as i32)).contains(&power) {
        return format!("{}e{power}", trimmed(mantissa));
    }
    // The digits are those of the correctly rounded mantissa; only the point moves.
    let sign = if value < 0.0 { "-" } else { "" };
    let all: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let plain = if power < 0 {
        format!("0.{}{all}", "0".repeat((-power - 1) as usize))
    } else if power as usize >= all.len() - 1 {
        format!("{all}{}", "0".repeat(power as usize + 1 - all.len()))
    } else {
        format!("{}.{}", &all[..=power as usize], &all[power as usize + 1..])
    };
    format!("{sign}{}", trimmed(&plain))
}

fn trimmed(digits: &str) -> &str {
    if digits.contains('.') { digits.trim_end_matches('0').trim_end_matches('.') } else { digits }
}

/// A range around zero that is narrower shows as zero.
const NEGLIGIBLE: f64 = 1e-12;

/// An exact answer to the digits that its bounds prove, at most `digits`.
///
/// ```
/// use tallystone::exact::Bounded;
/// use tallystone::report::proven;
/// assert_eq!(proven(Bounded { value: 0.123_456, low: 0.123_452, high: 0.123_461 }, 10), "0.1235");
/// assert_eq!(proven(Bounded { value: 0.2, low: 0.199_999_999_999_999_98, high: 0.2 }, 17), "0.2");
/// assert_eq!(proven(Bounded { value: 0.5, low: 0.014_9, high: 1.0 }, 10), "0.014 to 1");
/// ```
pub fn proven(answer: Bounded, digits: usize) -> String {
    if answer.low < 0.0 && answer.high > 0.0 && answer.high - answer.low < NEGLIGIBLE {
        return "0".to_owned();
    }
    let agreed = (2..=digits).rev().find(|digits| rounded(answer.low, *digits) == rounded(answer.high, *digits));
    match agreed {
        Some(digits) => rounded(answer.value, digits),
        None => format!("{} to {}", outwards(answer.low, false), outwards(answer.high, true)),
    }
}

/// A number to two digits that lies not above it, or not below it.
fn outwards(value: f64, up: bool) -> String {
    let text = rounded(value, 2);
    let shown: f64 = text.parse().unwrap_or(value);
    if if up { shown >= value } else { shown <= value } {
        return text;
    }
    // Half a unit of the second digit further, the nearest such number lies on the right side.
    let half = 0.5 * 10f64.powf(value.abs().log10().floor() - 1.0);
    rounded(if up { value + half } else { value - half }, 2)
}

/// How far the truth can be from the number that [`proven`] shows, rounded up: ahead of it comes what the shown digits
/// leave out.
///
/// ```
/// use tallystone::exact::Bounded;
/// use tallystone::report::proven_within;
/// assert_eq!(proven_within(Bounded::exactly(42.0), 17), "exactly");
/// assert_eq!(proven_within(Bounded { value: 0.2, low: 0.199_999_999_999_999_98, high: 0.2 }, 17), "± 1.7e-17");
/// assert_eq!(proven_within(Bounded { value: 1.0, low: 1.0, high: 2.0 }, 17), "between these");
/// ```
pub fn proven_within(answer: Bounded, digits: usize) -> String {
    let ratio = |value: f64| RBig::try_from(value).ok();
    let shown = Number::parse(&proven(answer, digits)).ok().map(|number| number.to_ratio());
    let (Some(shown), Some(low), Some(high)) = (shown, ratio(answer.low), ratio(answer.high)) else {
        return "between these".to_owned();
    };
    let farthest = (high - &shown).max(shown - low);
    if farthest <= RBig::ZERO {
        "exactly".to_owned()
    } else {
        format!("± {}", outwards(farthest.to_f64().value().next_up(), true))
    }
}

/// A length of time in the unit that suits it.
///
/// ```
/// use tallystone::report::duration;
/// assert_eq!(duration(57.0), "57 s");
/// assert_eq!(duration(5_700.0), "95 min");
/// assert_eq!(duration(5.7e7), "660 days");
/// assert_eq!(duration(3.2e10), "1000 years");
/// ```
pub fn duration(seconds: f64) -> String {
    const UNITS: [(f64, &str); 4] = [(31_557_600.0, "years"), (86_400.0, "days"), (3_600.0, "h"), (60.0, "min")];
    let (length, unit) = UNITS.into_iter().find(|(length, _)| seconds >= 2.0 * length).unwrap_or((1.0, "s"));
    format!("{} {unit}", rounded(seconds / length, 2))
}

/// A count with its thousands parted.
///
/// ```
/// assert_eq!(tallystone::report::thousands(1_234_567_u64), "1,234,567");
/// ```
pub fn thousands(count: impl Into<u128>) -> String {
    let digits = count.into().to_string();
    let mut parted = String::with_capacity(digits.len() + digits.len() / 3);
    for (at, digit) in digits.chars().enumerate() {
        if at > 0 && (digits.len() - at) % 3 == 0 {
            parted.push(',');
        }
        parted.push(digit);
    }
    parted
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sizes_from_tiny_to_huge() {
        for (value, digits, text) in [
            (0.0, 3, "0"),
            (-0.001_25, 2, "-0.0013"),
            (0.000_012_3, 2, "0.000012"),
            (0.000_001_23, 2, "1.2e-6"),
            (999.96, 4, "1000"),
            (12.5, 6, "12.5"),
            (100.0, 6, "100"),
            (2_097_150.0, 7, "2097150"),
            (2e17, 6, "2e17"),
            (1e300, 3, "1e300"),
            (f64::INFINITY, 3, "infinity"),
            (f64::NAN, 3, "undefined"),
        ] {
            assert_eq!(rounded(value, digits), text, "{value}");
        }
        assert_eq!(thousands(999u64), "999");
        assert_eq!(thousands(0u64), "0");
    }

    #[test]
    fn an_answer_that_proves_no_digit_shows_its_range() {
        assert_eq!(proven(Bounded { value: 1.0, low: 0.0, high: 2.0 }, 10), "0 to 2");
        assert_eq!(proven(Bounded::exactly(42.0), 10), "42");
        let nothing = Bounded { value: 1e-31, low: -1e-29, high: 2e-29 };
        assert_eq!((proven(nothing, 6), proven_within(nothing, 6)), ("0".to_owned(), "± 2.1e-29".to_owned()));
    }

    #[test]
    fn a_range_is_rounded_away_from_its_middle() {
        for exponent in -300..300 {
            let value = 1.2345 * 10f64.powi(exponent);
            for value in [value, 1.0449 * value, 10f64.powi(exponent), 9.99 * value] {
                assert!(outwards(value, false).parse::<f64>().unwrap() <= value, "{value}");
                assert!(outwards(value, true).parse::<f64>().unwrap() >= value, "{value}");
            }
        }
    }

    // The lower bound is 1.5e-16 below two thirds, and the fifteen digits are a third of 1e-15 above them.
    #[test]
    fn what_the_shown_digits_leave_out_counts() {
        let value = 2.0 / 3.0;
        let answer = Bounded { value, low: value.next_down(), high: value.next_up() };
        assert_eq!(proven(answer, 17), "0.666666666666667");
        assert_eq!(proven_within(answer, 17), "± 4.9e-16");
    }
}
