//! What the user asks of a comparison.

use crate::model::{Model, Quantity, Tolerance, ToleranceKey, Tolerances, nearest};

/// What the user asks of a comparison.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Probability, at most, that any row of the table gives a wrong verdict; between 0 and 1 exclusively.
    pub error_rate: f64,
    /// Probability that every row agrees when there is no difference, to which the plan sizes itself; between 0 and 1
    /// exclusively.
    pub power: f64,
    /// Rows instead of those of the model or the default ones.
    pub quantities: Option<Vec<Quantity>>,
    /// Tolerances that take precedence over those of the model.
    pub tolerances: Tolerances,
}

impl Default for Settings {
    fn default() -> Self {
        Self { error_rate: 0.01, power: 0.95, quantities: None, tolerances: Tolerances::default() }
    }
}

/// Why a comparison cannot be set up: the user's settings do not fit the model.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{text}; {remedy}")]
pub struct StudyFault {
    /// What is wrong, with the value.
    pub text: String,
    /// What to do about it.
    pub remedy: String,
}

impl Settings {
    /// The rows asked for, by the user before the model; `None` for the default ones.
    pub(super) fn asked<'s>(&'s self, model: &'s Model) -> Option<&'s [Quantity]> {
        self.quantities.as_deref().or_else(|| model.compare())
    }

    /// The tolerance given for a quantity, by the user before the model.
    pub(super) fn tolerance(&self, model: &Model, quantity: &Quantity) -> Option<Tolerance> {
        self.tolerances.of(quantity).or_else(|| model.tolerances().of(quantity))
    }

    /// Checks that the settings make sense and speak of the model.
    pub(super) fn check(&self, model: &Model) -> Result<(), StudyFault> {
        for (name, value) in [("error rate", self.error_rate), ("power", self.power)] {
            if !(value > 0.0 && value < 1.0) {
                let text = format!("the {name} {value} is not between 0 and 1");
                return Err(StudyFault { text, remedy: "give a probability such as 0.01 or 0.95".to_owned() });
            }
        }
        let named = self.tolerances.keys().filter_map(|key| match key {
            ToleranceKey::One(quantity) => Some(quantity),
            ToleranceKey::All(_) => None,
        });
        for quantity in self.quantities.iter().flatten().chain(named) {
            model.resolve(quantity).map_err(|fault| StudyFault { text: fault.text, remedy: fault.remedy })?;
        }
        for key in self.tolerances.keys() {
            check_name(key)?;
        }
        // Those of the model are looked at here too: what a tolerance may be is no matter of reading.
        let asked = self.quantities.iter().flatten().chain(model.compare().into_iter().flatten());
        let keys = self.tolerances.keys().chain(model.tolerances().keys());
        let keyed = keys.map(|key| match key {
            ToleranceKey::One(quantity) => quantity.clone(),
            ToleranceKey::All(name) => stand_in(name),
        });
        for quantity in asked.cloned().chain(keyed) {
            if let Some(tolerance) = self.tolerance(model, &quantity) {
                check_tolerance(&quantity, tolerance)?;
            }
        }
        Ok(())
    }
}

/// Some quantity of a name that is known.
fn stand_in(name: &str) -> Quantity {
    match name {
        "law" => Quantity::Law,
        "absorption_probability" => Quantity::AbsorptionProbability(String::new()),
        "survival_probability" => Quantity::SurvivalProbability(0),
        _ => Quantity::MeanTime,
    }
}

fn check_name(key: &ToleranceKey) -> Result<(), StudyFault> {
    let ToleranceKey::All(name) = key else { return Ok(()) };
    if Quantity::is_name(name) {
        return Ok(());
    }
    let names = Quantity::names();
    // As they are written without quotes and argument.
    let plain = names.iter().map(|form| form.trim_matches('`').split(':').next().unwrap_or_default());
    let remedy = match nearest(name, plain) {
        Some(near) => format!("did you mean `{near}`?"),
        None => format!("use one of {}", names.join(", ")),
    };
    Err(StudyFault { text: format!("a tolerance is given for `{name}`, which is no quantity"), remedy })
}

fn check_tolerance(quantity: &Quantity, tolerance: Tolerance) -> Result<(), StudyFault> {
    let (Tolerance::Absolute(value) | Tolerance::Relative(value)) = tolerance;
    let name = quantity.name();
    let fault = |text: String, remedy: &str| Err(StudyFault { text, remedy: remedy.to_owned() });
    if !(value >= 0.0 && value.is_finite()) {
        return fault(
            format!("the tolerance {tolerance} of `{name}` is negative or not finite"),
            "give a number from 0 up, or a share such as 1 %",
        );
    }
    match (quantity, tolerance) {
        (Quantity::Law, Tolerance::Relative(_)) => fault(
            format!("the tolerance {tolerance} of `law` is a share, but the law is no number to take a share of"),
            "give the largest difference of probabilities that does not matter, such as 0.01",
        ),
        (_, Tolerance::Absolute(value)) if quantity.is_probability() && value >= 1.0 => fault(
            format!("the tolerance {value} of `{name}` is 1 or more, so that any probability would do"),
            "give a difference of probabilities below 1, such as 0.005",
        ),
        _ => Ok(()),
    }
}
