//! The quantities of a model, by the names they have everywhere.

use std::fmt;

use super::fault::nearest;

/// Something that a simulation estimates and that the model answers exactly.
///
/// Written `name` or `name:argument`, split at the first colon, in options, files and reports alike.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum Quantity {
    /// Probability of finishing in an end, or in any end of a group.
    AbsorptionProbability(String),
    /// Mean number of clock units until the end is entered.
    MeanTime,
    /// Standard deviation of that time.
    SdTime,
    /// Variance of that time.
    VarianceTime,
    /// Smallest `t` with P(time ≤ t) ≥ the given probability.
    TimeQuantile(f64),
    /// P(time > t), t in clock units.
    SurvivalProbability(f64),
    /// Mean time of the replications that finish in an end or group.
    MeanTimeGiven(String),
    /// End and time jointly: P(end = e, time ≤ t) for every end and time.
    Law,
    /// Mean number of steps spent in a state, a start there included.
    MeanVisits(String),
    /// Variance of that number.
    VarianceVisits(String),
    /// Probability of ever being in a state.
    VisitProbability(String),
    /// Mean of a cost over a replication.
    MeanCost(String),
    /// Variance of a cost.
    VarianceCost(String),
    /// Covariance of a cost with the time.
    CovarianceTimeCost(String),
    /// Probability of ever being in the set of a hit.
    HitProbability(String),
    /// Mean time of the first passage to that set, of the replications that pass there.
    MeanTimeGivenHit(String),
}

/// Names that take no argument, and names that need one.
const PLAIN: [&str; 4] = ["mean_time", "sd_time", "variance_time", "law"];
const WITH_ARGUMENT: [&str; 12] = [
    "absorption_probability",
    "mean_time_given",
    "time_quantile",
    "survival_probability",
    "mean_visits",
    "variance_visits",
    "visit_probability",
    "mean_cost",
    "variance_cost",
    "covariance_time_cost",
    "hit_probability",
    "mean_time_given_hit",
];
/// Names that the format reserves; this version does not compute them yet.
const RESERVED: [&str; 2] = ["skewness_time", "kurtosis_time"];

/// Why a text names no quantity, and what to write instead.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{text}; {remedy}")]
pub struct QuantityFault {
    /// What is wrong, with the value.
    pub text: String,
    /// What to write instead.
    pub remedy: String,
}

impl Quantity {
    /// Reads a quantity as written.
    ///
    /// # Errors
    /// An unknown name (with the nearest known one), a missing or superfluous argument, or one out of range.
    ///
    /// ```
    /// use tallystone::model::Quantity;
    /// assert_eq!(Quantity::parse("time_quantile:0.9")?, Quantity::TimeQuantile(0.9));
    /// assert!(Quantity::parse("mean_tim").unwrap_err().remedy.contains("mean_time"));
    /// # Ok::<(), tallystone::model::QuantityFault>(())
    /// ```
    pub fn parse(text: &str) -> Result<Self, QuantityFault> {
        let (name, argument) = match text.split_once(':') {
            Some((name, argument)) => (name.trim(), Some(argument.trim())),
            None => (text.trim(), None),
        };
        let fault = |text: String, remedy: String| Err(QuantityFault { text, remedy });
        if RESERVED.contains(&name) {
            return fault(
                format!("`{name}` is not computed by this version"),
                format!("use one of {}", Self::names().join(", ")),
            );
        }
        match argument {
            None if WITH_ARGUMENT.contains(&name) => {
                return fault(format!("`{name}` lacks its argument"), format!("write {}", Self::form(name)));
            }
            Some(argument) if PLAIN.contains(&name) => {
                return fault(
                    format!("`{name}` takes no argument, but `{argument}` is given"),
                    format!("write `{name}`"),
                );
            }
            _ => {}
        }
        let argument = argument.unwrap_or_default();
        match name {
            "mean_time" => Ok(Self::MeanTime),
            "sd_time" => Ok(Self::SdTime),
            "variance_time" => Ok(Self::VarianceTime),
            "law" => Ok(Self::Law),
            "absorption_probability" => Ok(Self::AbsorptionProbability(argument.to_owned())),
            "mean_time_given" => Ok(Self::MeanTimeGiven(argument.to_owned())),
            "mean_visits" => Ok(Self::MeanVisits(argument.to_owned())),
            "variance_visits" => Ok(Self::VarianceVisits(argument.to_owned())),
            "visit_probability" => Ok(Self::VisitProbability(argument.to_owned())),
            "mean_cost" => Ok(Self::MeanCost(argument.to_owned())),
            "variance_cost" => Ok(Self::VarianceCost(argument.to_owned())),
            "covariance_time_cost" => Ok(Self::CovarianceTimeCost(argument.to_owned())),
            "hit_probability" => Ok(Self::HitProbability(argument.to_owned())),
            "mean_time_given_hit" => Ok(Self::MeanTimeGivenHit(argument.to_owned())),
            "time_quantile" => match argument.parse::<f64>() {
                Ok(p) if p > 0.0 && p < 1.0 => Ok(Self::TimeQuantile(p)),
                _ => fault(
                    format!("`{argument}` is not a probability between 0 and 1"),
                    "write for example `time_quantile:0.9`".to_owned(),
                ),
            },
            "survival_probability" => match argument.parse::<f64>() {
                Ok(t) if t >= 0.0 && t.is_finite() => Ok(Self::SurvivalProbability(t)),
                _ => fault(
                    format!("`{argument}` is not a time from 0 up"),
                    "write for example `survival_probability:100`".to_owned(),
                ),
            },
            _ => {
                let names = PLAIN.iter().chain(&WITH_ARGUMENT).copied();
                let remedy = match nearest(name, names) {
                    Some(near) => format!("did you mean {}?", Self::form(near)),
                    None => format!("use one of {}", Self::names().join(", ")),
                };
                fault(format!("`{name}` is no quantity"), remedy)
            }
        }
    }

    /// The name before the colon.
    pub fn name(&self) -> &'static str {
        match self {
            Self::AbsorptionProbability(_) => "absorption_probability",
            Self::MeanTime => "mean_time",
            Self::SdTime => "sd_time",
            Self::VarianceTime => "variance_time",
            Self::TimeQuantile(_) => "time_quantile",
            Self::SurvivalProbability(_) => "survival_probability",
            Self::MeanTimeGiven(_) => "mean_time_given",
            Self::Law => "law",
            Self::MeanVisits(_) => "mean_visits",
            Self::VarianceVisits(_) => "variance_visits",
            Self::VisitProbability(_) => "visit_probability",
            Self::MeanCost(_) => "mean_cost",
            Self::VarianceCost(_) => "variance_cost",
            Self::CovarianceTimeCost(_) => "covariance_time_cost",
            Self::HitProbability(_) => "hit_probability",
            Self::MeanTimeGivenHit(_) => "mean_time_given_hit",
        }
    }

    /// What stands behind the colon, if anything.
    pub fn of(&self) -> Option<String> {
        match self {
            Self::AbsorptionProbability(name)
            | Self::MeanTimeGiven(name)
            | Self::MeanVisits(name)
            | Self::VarianceVisits(name)
            | Self::VisitProbability(name)
            | Self::MeanCost(name)
            | Self::VarianceCost(name)
            | Self::CovarianceTimeCost(name)
            | Self::HitProbability(name)
            | Self::MeanTimeGivenHit(name) => Some(name.clone()),
            Self::TimeQuantile(p) => Some(p.to_string()),
            Self::SurvivalProbability(t) => Some(t.to_string()),
            Self::MeanTime | Self::SdTime | Self::VarianceTime | Self::Law => None,
        }
    }

    /// Whether the answer is a probability, so that a tolerance beyond one makes no sense.
    pub fn is_probability(&self) -> bool {
        matches!(
            self,
            Self::AbsorptionProbability(_)
                | Self::SurvivalProbability(_)
                | Self::Law
                | Self::VisitProbability(_)
                | Self::HitProbability(_)
        )
    }

    /// Whether a name is that of a quantity.
    pub fn is_name(name: &str) -> bool {
        PLAIN.contains(&name) || WITH_ARGUMENT.contains(&name)
    }

    /// All quantities, in the form in which they are written.
    pub fn names() -> Vec<String> {
        PLAIN.iter().chain(&WITH_ARGUMENT).map(|name| Self::form(name)).collect()
    }

    fn form(name: &str) -> String {
        match name {
            "absorption_probability" | "mean_time_given" => format!("`{name}:END`"),
            "time_quantile" => format!("`{name}:P`"),
            "survival_probability" => format!("`{name}:T`"),
            "mean_visits" | "variance_visits" | "visit_probability" => format!("`{name}:STATE`"),
            "mean_cost" | "variance_cost" | "covariance_time_cost" => format!("`{name}:COST`"),
            "hit_probability" | "mean_time_given_hit" => format!("`{name}:HIT`"),
            _ => format!("`{name}`"),
        }
    }
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.of() {
            Some(of) => write!(f, "{}:{of}", self.name()),
            None => f.write_str(self.name()),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_quantity_reads_back_what_it_shows() {
        for text in [
            "absorption_probability:a:b",
            "mean_time",
            "sd_time",
            "variance_time",
            "time_quantile:0.999",
            "survival_probability:100",
            "survival_probability:0.25",
            "mean_time_given:shipped",
            "law",
            "mean_visits:board",
            "variance_visits:board",
            "visit_probability:board",
            "mean_cost:labour",
            "variance_cost:labour",
            "covariance_time_cost:labour",
            "hit_probability:any-repair",
            "mean_time_given_hit:any-repair",
        ] {
            assert_eq!(Quantity::parse(text).unwrap().to_string(), text);
        }
    }

    #[test]
    fn mistakes_name_the_value_and_the_remedy() {
        for (text, wrong, remedy) in [
            ("absorbtion_probability:x", "`absorbtion_probability`", "absorption_probability:END"),
            ("mean_time_given", "lacks its argument", "mean_time_given:END"),
            ("mean_time:3", "takes no argument", "`mean_time`"),
            ("time_quantile:1.5", "`1.5`", "time_quantile:0.9"),
            ("survival_probability:-1", "`-1`", "survival_probability:100"),
            ("skewness_time", "not computed by this version", "mean_time"),
            ("mean_cost", "lacks its argument", "mean_cost:COST"),
            ("zzz", "`zzz`", "use one of"),
        ] {
            let fault = Quantity::parse(text).unwrap_err();
            assert!(fault.text.contains(wrong), "{fault}");
            assert!(fault.remedy.contains(remedy), "{fault}");
        }
    }
}
