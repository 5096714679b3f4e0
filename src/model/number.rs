//! Numbers exactly as somebody wrote them.
//!
//! A model is the rational chain of its decimals and fractions, not of the doubles nearest to them: a stay written
//! `0.999999999999999999` is one in a double, and the state would never be left.

use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

/// Largest power of ten that a decimal may carry in either direction; beyond it a double is zero or infinite anyway.
const LARGEST_EXPONENT: i64 = 400;
/// Longest number that is read, in characters; a longer one is a mistake or an attack.
const LONGEST: usize = 1000;
/// Powers of ten that fit into 64 bits.
const NARROW_DIGITS: u8 = 19;

/// A number as written: a short decimal, or any rational.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Number {
    /// `mantissa / 10^scale`, with `scale` at most 19 and no trailing zero beyond need.
    Decimal {
        /// All digits.
        mantissa: u64,
        /// Digits behind the point.
        scale: u8,
    },
    /// Everything else: fractions, negative numbers, long decimals.
    Ratio(Box<RBig>),
}

/// Why a text is not a number that a model can hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum NumberFault {
    /// Not a decimal and not a fraction.
    #[error("is not a number")]
    NotANumber,
    /// `inf` or `nan`.
    #[error("is not finite")]
    NotFinite,
    /// A fraction over zero.
    #[error("divides by zero")]
    ZeroDenominator,
    /// More than 1000 characters, or an exponent beyond ±400.
    #[error("is longer or more extreme than a model can hold (exponents within ±400)")]
    TooExtreme,
}

impl Number {
    /// Reads `0.25`, `1e-18`, `+3`, `5/12` or `1_000`; blanks around it and around the bar do not matter.
    ///
    /// # Errors
    /// A [`NumberFault`] says what is wrong; the caller adds the place.
    ///
    /// ```
    /// use tallystone::model::Number;
    /// assert_eq!(Number::parse("5/12")?.to_f64(), 5.0 / 12.0);
    /// assert_eq!(Number::parse("0.250")?, Number::Decimal { mantissa: 25, scale: 2 });
    /// assert!(Number::parse("5/0").is_err());
    /// # Ok::<(), tallystone::model::NumberFault>(())
    /// ```
    pub fn parse(text: &str) -> Result<Self, NumberFault> {
        if let Some(number) = Self::plain(text.as_bytes()) {
            return Ok(number);
        }
        let text = text.trim();
        if text.len() > LONGEST {
            return Err(NumberFault::TooExtreme);
        }
        match text.split_once('/') {
            None => decimal(text),
            Some((over, under)) => {
                let (over, under) = (decimal(over.trim())?.to_ratio(), decimal(under.trim())?.to_ratio());
                if under == RBig::ZERO {
                    return Err(NumberFault::ZeroDenominator);
                }
                Ok(Self::Ratio(Box::new(over / under)))
            }
        }
    }

    /// A short decimal of digits and a point alone: nearly every number of a large model.
    pub(super) fn plain(text: &[u8]) -> Option<Self> {
        let (mut mantissa, mut behind_point, mut digits) = (0u64, None, 0);
        for byte in text {
            match byte {
                b'0'..=b'9' => {
                    mantissa = mantissa.checked_mul(10)?.checked_add(u64::from(byte - b'0'))?;
                    digits += 1;
                    behind_point = behind_point.map(|count: u8| count + 1);
                }
                b'.' if behind_point.is_none() => behind_point = Some(0),
                _ => return None,
            }
            if digits > NARROW_DIGITS {
                return None;
            }
        }
        let mut scale = behind_point.unwrap_or(0);
        while scale > 0 && mantissa % 10 == 0 {
            (mantissa, scale) = (mantissa / 10, scale - 1);
        }
        (digits > 0).then_some(Self::Decimal { mantissa, scale })
    }

    /// The exact value.
    pub fn to_ratio(&self) -> RBig {
        match self {
            Self::Decimal { mantissa, scale } => {
                RBig::from_parts(IBig::from(*mantissa), UBig::from(10u64.pow(u32::from(*scale))))
            }
            Self::Ratio(value) => (**value).clone(),
        }
    }

    /// The nearest double, for messages.
    pub fn to_f64(&self) -> f64 {
        match self {
            // Both are doubles exactly, so their quotient is rounded once.
            Self::Decimal { mantissa, scale } if *mantissa <= 1 << f64::MANTISSA_DIGITS => {
                *mantissa as f64 / 10u64.pow(u32::from(*scale)) as f64
            }
            _ => self.to_ratio().to_f64().value(),
        }
    }

    /// Whether the number is exactly zero.
    pub fn is_zero(&self) -> bool {
        match self {
            Self::Decimal { mantissa, .. } => *mantissa == 0,
            Self::Ratio(value) => **value == RBig::ZERO,
        }
    }

    /// Whether the number is exactly one.
    pub fn is_one(&self) -> bool {
        match self {
            Self::Decimal { mantissa, scale } => *mantissa == 10u64.pow(u32::from(*scale)),
            Self::Ratio(value) => **value == RBig::ONE,
        }
    }

    /// Whether the number is whole.
    pub fn is_whole(&self) -> bool {
        match self {
            // Decimals carry no zeros at their end.
            Self::Decimal { scale, .. } => *scale == 0,
            Self::Ratio(value) => value.is_int(),
        }
    }

    /// Whether the number is below zero.
    pub fn is_negative(&self) -> bool {
        matches!(self, Self::Ratio(value) if **value < RBig::ZERO)
    }

    /// Whether the number is above one.
    pub fn exceeds_one(&self) -> bool {
        match self {
            Self::Decimal { mantissa, scale } => *mantissa > 10u64.pow(u32::from(*scale)),
            Self::Ratio(value) => **value > RBig::ONE,
        }
    }
}

fn decimal(text: &str) -> Result<Number, NumberFault> {
    let (negative, body) = match text.as_bytes().first() {
        Some(b'-') => (true, &text[1..]),
        Some(b'+') => (false, &text[1..]),
        _ => (false, text),
    };
    if ["inf", "infinity", "nan"].iter().any(|word| body.eq_ignore_ascii_case(word)) {
        return Err(NumberFault::NotFinite);
    }
    let (body, exponent) = match body.find(['e', 'E']) {
        None => (body, 0),
        Some(at) => {
            let exponent = &body[at + 1..];
            let digits = exponent.strip_prefix(['+', '-']).unwrap_or(exponent);
            if digits.is_empty() || !digits.bytes().all(|b| b.is_ascii_digit()) {
                return Err(NumberFault::NotANumber);
            }
            let exponent: i64 = exponent.parse().map_err(|_| NumberFault::TooExtreme)?;
            if !(-LARGEST_EXPONENT..=LARGEST_EXPONENT).contains(&exponent) {
                return Err(NumberFault::TooExtreme);
            }
            (&body[..at], exponent)
        }
    };
    let (whole, part) = body.split_once('.').unwrap_or((body, ""));
    let digits: String = whole.chars().chain(part.chars()).filter(|c| *c != '_').collect();
    if digits.is_empty() || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return Err(NumberFault::NotANumber);
    }
    let behind_point = part.bytes().filter(u8::is_ascii_digit).count() as i64;
    // The value is `digits · 10^power`, with trailing zeros moved into the power.
    let significant = digits.trim_start_matches('0');
    let trimmed = significant.trim_end_matches('0');
    if trimmed.is_empty() {
        return Ok(Number::Decimal { mantissa: 0, scale: 0 });
    }
    let power = exponent - behind_point + (significant.len() - trimmed.len()) as i64;
    if !negative && let Some(narrow) = narrow(trimmed, power) {
        return Ok(narrow);
    }
    let mantissa = IBig::from_str_radix(trimmed, 10).map_err(|_| NumberFault::NotANumber)?;
    let mantissa = if negative { -mantissa } else { mantissa };
    let ten = UBig::from(10u8).pow(power.unsigned_abs() as usize);
    let value = if power < 0 { RBig::from_parts(mantissa, ten) } else { RBig::from(mantissa * IBig::from(ten)) };
    Ok(Number::Ratio(Box::new(value)))
}

fn narrow(digits: &str, power: i64) -> Option<Number> {
    let mantissa: u64 = digits.parse().ok()?;
    if power > 0 {
        let mantissa = mantissa.checked_mul(10u64.checked_pow(u32::try_from(power).ok()?)?)?;
        return Some(Number::Decimal { mantissa, scale: 0 });
    }
    let scale = u8::try_from(-power).ok().filter(|scale| *scale <= NARROW_DIGITS)?;
    Some(Number::Decimal { mantissa, scale })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ratio(over: i64, under: u64) -> RBig {
        RBig::from_parts(IBig::from(over), UBig::from(under))
    }

    #[test]
    fn every_form_of_a_number_keeps_its_exact_value() {
        let cases = [
            ("0.25", ratio(1, 4)),
            ("2.5e-1", ratio(1, 4)),
            ("25E-2", ratio(1, 4)),
            ("+1_000.5", ratio(2001, 2)),
            (" 5 / 12 ", ratio(5, 12)),
            ("0.5/1.5", ratio(1, 3)),
            ("-0.5", ratio(-1, 2)),
            ("1e3", ratio(1000, 1)),
            (".5", ratio(1, 2)),
            ("5.", ratio(5, 1)),
            ("0.000", ratio(0, 1)),
            ("0.999999999999999999", RBig::ONE - ratio(1, 1_000_000_000_000_000_000)),
        ];
        for (text, value) in cases {
            assert_eq!(Number::parse(text).unwrap().to_ratio(), value, "{text}");
        }
    }

    #[test]
    fn what_is_no_number_is_refused_by_kind() {
        let cases = [
            ("", NumberFault::NotANumber),
            ("abc", NumberFault::NotANumber),
            ("0,5", NumberFault::NotANumber),
            ("1e", NumberFault::NotANumber),
            ("1e1.5", NumberFault::NotANumber),
            ("1e+-5", NumberFault::NotANumber),
            ("--1", NumberFault::NotANumber),
            ("nan", NumberFault::NotFinite),
            ("-INF", NumberFault::NotFinite),
            ("1/0", NumberFault::ZeroDenominator),
            ("1e999999999999999999999", NumberFault::TooExtreme),
            ("1e-401", NumberFault::TooExtreme),
            ("1.5e-9223372036854775808", NumberFault::TooExtreme),
        ];
        for (text, fault) in cases {
            assert_eq!(Number::parse(text), Err(fault), "{text}");
        }
        assert_eq!(Number::parse(&"1".repeat(1001)), Err(NumberFault::TooExtreme));
    }

    // The standard library rounds a decimal to the nearest double.
    #[test]
    fn the_nearest_double_is_the_one_that_the_text_reads_as() {
        for text in [
            "0.1",
            "0.92",
            "0.3333333333333333",
            "1e-19",
            "0.0000000000000000001",
            "9007199254740993",
            "0.9007199254740993",
            "1.7976931348623157",
            "0.000",
            "1e-300",
        ] {
            assert_eq!(Number::parse(text).unwrap().to_f64(), text.parse::<f64>().unwrap(), "{text}");
        }
    }

    #[test]
    fn comparisons_are_exact_beside_one() {
        assert!(!Number::parse("1").unwrap().exceeds_one());
        assert!(["1.0", "12/12"].iter().all(|text| Number::parse(text).unwrap().is_one()));
        assert!(!Number::parse("1.000000000000000000000001").unwrap().is_one());
        assert!(Number::parse("1.000000000000000000000001").unwrap().exceeds_one());
        assert!(Number::parse("-1e-30").unwrap().is_negative());
        assert!(Number::parse("0/5").unwrap().is_zero());
    }
}
