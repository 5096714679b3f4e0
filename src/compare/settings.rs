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
    /// Differences that a row without tolerance must be able to see before it is consistent; the default tolerances where
    /// none is given.
    pub detectable: Tolerances,
    /// The number, from 1, of this look at a series of ever larger runs; look j spends 1/2^j of the error rate, so that all
    /// looks together spend it once. `None` for a run that stands alone.
    pub look: Option<u32>,
    /// Whether only end and time are known of each replication, as from a file of outcomes: rows about visits, costs and
    /// hits are left out then.
    pub outcomes_only: bool,
}

/// More looks than this leave next to nothing to spend.
pub const MOST_LOOKS: u32 = 20;

impl Default for Settings {
    fn default() -> Self {
        Self {
            error_rate: 0.01,
            power: 0.95,
            quantities: None,
            tolerances: Tolerances::default(),
            detectable: Tolerances::default(),
            look: None,
            outcomes_only: false,
        }
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

    /// The error rate that this table spends.
    pub fn spent(&self) -> f64 {
        self.error_rate / self.look.map_or(1.0, |look| 2f64.powi(look.min(MOST_LOOKS) as i32))
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
        if self.look.is_some_and(|look| !(1..=MOST_LOOKS).contains(&look)) {
            let text = format!("look {} is not between 1 and {MOST_LOOKS}", self.look.unwrap_or_default());
            return Err(StudyFault { text, remedy: "number the looks of a series from 1".to_owned() });
        }
        let given = || self.tolerances.keys().chain(self.detectable.keys());
        let named = given().filter_map(|key| match key {
            ToleranceKey::One(quantity) => Some(quantity),
            ToleranceKey::All(_) => None,
        });
        for quantity in self.quantities.iter().flatten().chain(named) {
            model.resolve(quantity).map_err(|fault| StudyFault { text: fault.text, remedy: fault.remedy })?;
        }
        for key in given() {
            check_name(key)?;
        }
        // Those of the model are looked at here too: what a tolerance may be is no matter of reading.
        let asked = self.quantities.iter().flatten().chain(model.compare().into_iter().flatten());
        let keys = given().chain(model.tolerances().keys());
        let keyed = keys.map(|key| match key {
            ToleranceKey::One(quantity) => quantity.clone(),
            ToleranceKey::All(name) => stand_in(name),
        });
        for quantity in asked.cloned().chain(keyed) {
            if let Some(tolerance) = self.tolerance(model, &quantity) {
                check_tolerance(&quantity, tolerance)?;
            }
            if let Some(difference) = self.detectable.of(&quantity) {
                check_tolerance(&quantity, difference)?;
                if matches!(difference, Tolerance::Absolute(0.0) | Tolerance::Relative(0.0)) {
                    let text = format!("no number of replications can see a difference of 0 in `{}`", quantity.name());
                    return Err(StudyFault { text, remedy: "give a difference above 0, such as 1 %".to_owned() });
                }
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
        "survival_probability" => Quantity::SurvivalProbability(0.0),
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

#[cfg(test)]
mod tests {
    use super::*;

    fn model() -> Model {
        let text = "start = \"a\"\nabsorbing = [\"shipped\", \"parts\"]\n[moves]\na = { shipped = 0.5, parts = 0.5 }\n\
                    [tolerance]\nmean_time = \"2 %\"\n";
        Model::from_toml(text).unwrap()
    }

    fn with(key: &str, tolerance: Tolerance) -> Settings {
        let mut settings = Settings::default();
        let key = match Quantity::parse(key) {
            Ok(quantity) => ToleranceKey::One(quantity),
            Err(_) => ToleranceKey::All(key.to_owned()),
        };
        settings.tolerances.set(key, tolerance);
        settings
    }

    #[test]
    fn what_does_not_fit_names_the_value_and_the_remedy() {
        use Tolerance::{Absolute, Relative};
        let model = model();
        let unknown = vec![Quantity::MeanTimeGiven("partz".to_owned())];
        for (settings, wrong, remedy) in [
            (Settings { error_rate: 0.0, ..Settings::default() }, "error rate 0", "0.01"),
            (Settings { error_rate: f64::NAN, ..Settings::default() }, "error rate NaN", "0.01"),
            (Settings { power: 1.0, ..Settings::default() }, "power 1", "0.95"),
            (Settings { quantities: Some(unknown), ..Settings::default() }, "`partz`", "`parts`"),
            (with("absorption_probability:shiped", Absolute(0.1)), "`shiped`", "`shipped`"),
            (with("mean_tme", Absolute(0.1)), "`mean_tme`", "`mean_time`"),
            (with("zzz", Absolute(0.1)), "`zzz`", "use one of"),
            (with("mean_time", Absolute(-1.0)), "-1", "from 0 up"),
            (with("mean_time", Absolute(f64::NAN)), "NaN", "from 0 up"),
            (with("law", Relative(0.01)), "1 %", "0.01"),
            (with("law", Absolute(1.0)), "1 of `law`", "below 1"),
            (with("absorption_probability", Absolute(2.0)), "2 of `absorption_probability`", "below 1"),
        ] {
            let fault = settings.check(&model).unwrap_err();
            assert!(fault.text.contains(wrong), "{fault}");
            assert!(fault.remedy.contains(remedy), "{fault}");
        }
    }

    #[test]
    fn the_user_comes_before_the_model() {
        let model = model();
        let own = with("mean_time", Tolerance::Absolute(0.5));
        assert_eq!(own.check(&model), Ok(()));
        assert_eq!(own.tolerance(&model, &Quantity::MeanTime), Some(Tolerance::Absolute(0.5)));
        assert_eq!(Settings::default().tolerance(&model, &Quantity::MeanTime), Some(Tolerance::Relative(0.02)));
        assert_eq!(own.tolerance(&model, &Quantity::Law), None);
        assert_eq!(own.asked(&model), None);
    }
}
