//! What a command found, as plain data.

use serde::Serialize;

use crate::compare::Comparison;
use crate::exact::Bounded;
use crate::model::{InputFile, Model, Quantity, Warning};
use crate::sampling::Estimate;

/// Everything that a command found.
#[derive(Debug, Clone)]
pub struct Document {
    /// The arguments of the program.
    pub command: Vec<String>,
    /// Files read.
    pub inputs: Vec<Input>,
    /// The model.
    pub model: ModelSummary,
    /// What was planned; `None` where nothing is compared or sampled.
    pub plan: Option<PlanSummary>,
    /// What was run.
    pub run: Option<RunSummary>,
    /// What was found.
    pub body: Body,
    /// What deserves a look.
    pub warnings: Vec<Warning>,
    /// Seconds since 1970-01-01 UTC; `None` where it must not show.
    pub when: Option<u64>,
}

/// What was found, by command.
#[derive(Debug, Clone)]
pub enum Body {
    /// The program's own sampler against the exact answers.
    Check(Comparison),
    /// Somebody else's outcomes against the exact answers.
    Audit(Comparison),
    /// Exact answers alone.
    Exact(Vec<Answer>),
    /// Estimates alone.
    Sample(Vec<Estimate>),
}

/// An exact answer.
#[derive(Debug, Clone, PartialEq)]
pub struct Answer {
    /// To what.
    pub quantity: Quantity,
    /// The answer with its bounds; `None` where it is undefined or was refused.
    pub exact: Option<Bounded>,
    /// Why there is none.
    pub note: Option<String>,
}

/// A file read.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Input {
    /// The path as given.
    pub file: String,
    /// SHA-256 of its bytes, in hexadecimal.
    pub sha256: String,
    /// Outcomes in it; `None` for a model.
    pub rows: Option<u64>,
    /// Outcomes that could not be used; `None` for a model.
    pub bad_rows: Option<u64>,
    /// Columns that mean nothing here.
    pub ignored_columns: Vec<String>,
}

impl From<&InputFile> for Input {
    fn from(input: &InputFile) -> Self {
        let InputFile { file, sha256 } = input.clone();
        Self { file, sha256, rows: None, bad_rows: None, ignored_columns: Vec::new() }
    }
}

/// The model in a few numbers.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ModelSummary {
    /// Its title, which may be empty.
    pub title: String,
    /// Fingerprint of its meaning.
    pub sha256: String,
    /// `steps` or `rates`.
    pub clock: &'static str,
    /// The unit of time.
    pub clock_unit: String,
    /// Number of states.
    pub states: usize,
    /// Number of moves.
    pub moves: usize,
    /// Names of the ends.
    pub ends: Vec<String>,
    /// Largest difference from one among the row sums that were corrected.
    pub largest_correction: f64,
}

impl ModelSummary {
    /// Sums up a model.
    pub fn of(model: &Model) -> Self {
        let chain = model.chain();
        Self {
            title: model.title().to_owned(),
            sha256: model.fingerprint().to_owned(),
            clock: model.clock().name(),
            clock_unit: model.clock_unit().to_owned(),
            states: chain.states(),
            moves: chain.moves(),
            ends: chain.ends().iter().map(|end| end.name.clone()).collect(),
            largest_correction: model.largest_correction(),
        }
    }
}

/// Where a seed comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum SeedSource {
    /// The fixed default.
    Default,
    /// The user.
    Given,
    /// The system, as the user asked.
    Random,
}

/// What was planned.
#[derive(Debug, Clone, PartialEq)]
pub struct PlanSummary {
    /// The error rate that the whole table spends; `None` where nothing is compared.
    pub error_rate: Option<f64>,
    /// The number of this look at a series of runs; `None` for a run that stands alone.
    pub look: Option<u32>,
    /// Number of rows.
    pub rows: usize,
    /// Probability of a conclusive table, if there is no difference, to which the plan is sized.
    pub power: Option<f64>,
    /// Replications that the plan asks for; `None` when no number decides any row.
    pub replications: Option<u64>,
    /// The row that needs most.
    pub demanding: Option<Quantity>,
    /// The seed; `None` for an audit.
    pub seed: Option<(u64, SeedSource)>,
}

/// What was run.
#[derive(Debug, Clone, PartialEq)]
pub struct RunSummary {
    /// Replications; `None` where none were.
    pub replications: Option<u64>,
    /// Their steps together; `None` in continuous time.
    pub steps: Option<u128>,
    /// The shortest and the longest of their times, in steps; `None` in continuous time.
    pub times: Option<(u64, u64)>,
    /// How long it took.
    pub seconds: f64,
    /// How the exact answers were found.
    pub solver: Option<&'static str>,
}

/// One reason for a refusal.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Refused {
    /// Its kind, for programs.
    pub kind: String,
    /// The file concerned.
    pub file: Option<String>,
    /// The line in it.
    pub line: Option<u64>,
    /// The state or name concerned.
    pub state: Option<String>,
    /// The offending value.
    pub value: Option<String>,
    /// What is wrong.
    pub text: String,
    /// What to do about it.
    pub remedy: String,
}

impl Document {
    /// A document of a model and what was found; the rest is filled in as it becomes known.
    pub fn new(model: ModelSummary, body: Body) -> Self {
        Self {
            command: Vec::new(),
            inputs: Vec::new(),
            model,
            plan: None,
            run: None,
            body,
            warnings: Vec::new(),
            when: None,
        }
    }

    /// The comparison, if the document holds one.
    pub fn comparison(&self) -> Option<&Comparison> {
        match &self.body {
            Body::Check(comparison) | Body::Audit(comparison) => Some(comparison),
            Body::Exact(_) | Body::Sample(_) => None,
        }
    }

    /// What every reader must be told.
    pub fn cautions(&self) -> Vec<&'static str> {
        let use_of_it =
            "Use in safety, medical or financial decisions needs qualified review under the rules that apply there.";
        match self.body {
            Body::Check(_) | Body::Audit(_) => vec![
                "This compares a program with its model. It does not say that the model describes the world.",
                use_of_it,
            ],
            Body::Exact(_) => {
                vec![
                    "The answers are exact for the model as written. They do not say that the model describes the world.",
                    use_of_it,
                ]
            }
            Body::Sample(_) => {
                vec![
                    "The estimates are of the model as written. They do not say that the model describes the world.",
                    use_of_it,
                ]
            }
        }
    }
}
