//! Tolerances as written: the differences that do not matter to the user.

use std::fmt;

use super::quantity::{Quantity, QuantityFault};

/// A difference that does not matter.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Tolerance {
    /// In the unit of the quantity.
    Absolute(f64),
    /// As a share of the exact answer.
    Relative(f64),
}

impl Tolerance {
    /// Reads `0.005` (absolute) or `1 %` (relative).
    ///
    /// # Errors
    /// The reason, with the value, when it is neither, negative or not finite.
    pub fn parse(text: &str) -> Result<Self, String> {
        let trimmed = text.trim();
        let (digits, relative) = match trimmed.strip_suffix('%') {
            Some(digits) => (digits.trim_end(), true),
            None => (trimmed, false),
        };
        match digits.parse::<f64>() {
            Ok(value) if value >= 0.0 && value.is_finite() => {
                Ok(if relative { Self::Relative(value / 100.0) } else { Self::Absolute(value) })
            }
            Ok(_) => Err(format!("the tolerance `{trimmed}` is negative or not finite")),
            Err(_) => Err(format!("`{trimmed}` is no tolerance")),
        }
    }
}

impl fmt::Display for Tolerance {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Absolute(value) => write!(f, "{value}"),
            // Percent as people write them: the rounding hides that 0.07 · 100 is not 7 in a double.
            Self::Relative(share) => write!(f, "{} %", (share * 1e14).round() / 1e12),
        }
    }
}

/// What a tolerance is given for.
#[derive(Debug, Clone, PartialEq)]
pub enum ToleranceKey {
    /// One quantity.
    One(Quantity),
    /// Every quantity of that name, where none is given for it alone.
    All(String),
}

impl ToleranceKey {
    /// Reads `NAME` or `NAME:ARGUMENT`.
    ///
    /// # Errors
    /// As [`Quantity::parse`].
    pub fn parse(text: &str) -> Result<Self, QuantityFault> {
        let name = text.trim();
        if Quantity::is_name(name) { Ok(Self::All(name.to_owned())) } else { Quantity::parse(name).map(Self::One) }
    }
}

/// The tolerances that a user gave; later entries win.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Tolerances {
    entries: Vec<(ToleranceKey, Tolerance)>,
}

impl Tolerances {
    /// Adds one; it replaces an earlier one for the same key.
    pub fn set(&mut self, key: ToleranceKey, value: Tolerance) {
        self.entries.push((key, value));
    }

    /// The tolerance that the user gave for a quantity, if any: its own before that of its name.
    pub fn of(&self, quantity: &Quantity) -> Option<Tolerance> {
        let own = |key: &ToleranceKey| matches!(key, ToleranceKey::One(one) if one == quantity);
        let name = |key: &ToleranceKey| matches!(key, ToleranceKey::All(name) if name == quantity.name());
        let last = |fits: &dyn Fn(&ToleranceKey) -> bool| {
            self.entries.iter().rev().find(|(key, _)| fits(key)).map(|(_, value)| *value)
        };
        last(&own).or_else(|| last(&name))
    }

    /// The keys given, to check that each means something.
    pub fn keys(&self) -> impl Iterator<Item = &ToleranceKey> {
        self.entries.iter().map(|(key, _)| key)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percent_is_relative_and_a_plain_number_absolute() {
        assert_eq!(Tolerance::parse("1 %"), Ok(Tolerance::Relative(0.01)));
        assert_eq!(Tolerance::parse(" 0.005 "), Ok(Tolerance::Absolute(0.005)));
        assert_eq!(Tolerance::parse("7%").unwrap().to_string(), "7 %");
        for wrong in ["", "%", "-1", "nan", "inf", "one"] {
            assert!(Tolerance::parse(wrong).is_err(), "{wrong}");
        }
    }

    #[test]
    fn a_quantity_of_its_own_wins_over_its_name_and_later_over_earlier() {
        let shipped = Quantity::AbsorptionProbability("shipped".into());
        let lost = Quantity::AbsorptionProbability("lost".into());
        let mut given = Tolerances::default();
        given.set(ToleranceKey::One(shipped.clone()), Tolerance::Absolute(0.001));
        given.set(ToleranceKey::All("absorption_probability".into()), Tolerance::Absolute(0.01));
        given.set(ToleranceKey::One(shipped.clone()), Tolerance::Absolute(0.002));
        assert_eq!(given.of(&shipped), Some(Tolerance::Absolute(0.002)));
        assert_eq!(given.of(&lost), Some(Tolerance::Absolute(0.01)));
        assert_eq!(given.of(&Quantity::MeanTime), None);
    }
}
