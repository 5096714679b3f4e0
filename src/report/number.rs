//! Numbers as people read them.

use crate::exact::Bounded;

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

/// An exact answer to the digits that its bounds prove, at most `digits`.
///
/// ```
/// use tallystone::exact::Bounded;
/// use tallystone::report::proven;
/// assert_eq!(proven(Bounded { value: 0.123_456, low: 0.123_452, high: 0.123_461 }, 10), "0.1235");
/// assert_eq!(proven(Bounded { value: 0.2, low: 0.199_999_999_999_999_98, high: 0.2 }, 17), "0.2");
/// ```
pub fn proven(answer: Bounded, digits: usize) -> String {
    let agreed = (2..=digits).rev().find(|digits| rounded(answer.low, *digits) == rounded(answer.high, *digits));
    match agreed {
        Some(digits) => rounded(answer.value, digits),
        None => format!("{} to {}", rounded(answer.low, 2), rounded(answer.high, 2)),
    }
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
    }
}
