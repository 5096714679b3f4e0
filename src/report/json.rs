//! The report for programs. The fields are documented in [`crate::report`].

use std::io::{self, Write};

use serde::{Serialize, Serializer};

use crate::compare::{Comparison, Finding, Guarantee, NotCompared, Row, ToleranceSource, Verdict};
use crate::exact::Bounded;
use crate::model::{Quantity, Tolerance, Warning};
use crate::sampling::{Estimate, STREAM_VERSION};

use super::document::{Answer, Body, Document, Input, ModelSummary, PlanSummary, Refused, RunSummary, SeedSource};

/// Writes a document as one JSON object and a line feed.
///
/// # Errors
/// Those of the sink.
pub fn write_json(document: &Document, out: &mut impl Write) -> io::Result<()> {
    write(&Whole::of(document), out)
}

/// Writes a refusal as one JSON object and a line feed.
///
/// # Errors
/// Those of the sink.
pub fn write_refusal(errors: &[Refused], out: &mut impl Write) -> io::Result<()> {
    write(&Refusal { schema: "tallystone.error/1", errors }, out)
}

fn write(value: &impl Serialize, out: &mut impl Write) -> io::Result<()> {
    serde_json::to_writer_pretty(&mut *out, value)?;
    writeln!(out)
}

#[derive(Serialize)]
struct Refusal<'a> {
    schema: &'static str,
    errors: &'a [Refused],
}

#[derive(Serialize)]
struct Whole<'a> {
    schema: &'static str,
    tool: Tool,
    command: &'a [String],
    inputs: &'a [Input],
    model: &'a ModelSummary,
    plan: Option<Plan>,
    run: Option<Run>,
    rows: Vec<AnyRow<'a>>,
    findings: &'a [Finding],
    not_compared: Vec<LeftOut<'a>>,
    verdict: Option<Verdict>,
    warnings: &'a [Warning],
    cautions: Vec<&'static str>,
    when: Option<u64>,
}

#[derive(Serialize)]
struct Tool {
    name: &'static str,
    version: &'static str,
    stream_version: u32,
}

/// A double that JSON may not be able to hold.
struct Number(f64);

impl Serialize for Number {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        if self.0.is_finite() {
            serializer.serialize_f64(self.0)
        } else if self.0.is_nan() {
            serializer.serialize_none()
        } else {
            serializer.serialize_str(if self.0 > 0.0 { "infinity" } else { "-infinity" })
        }
    }
}

fn number(value: Option<f64>) -> Option<Number> {
    value.map(Number)
}

#[derive(Serialize)]
struct Plan {
    error_rate: Option<f64>,
    look: Option<u32>,
    rows: usize,
    power: Option<f64>,
    replications: Option<String>,
    demanding: Option<String>,
    seed: Option<String>,
    seed_source: Option<SeedSource>,
}

impl Plan {
    fn of(plan: &PlanSummary) -> Self {
        Self {
            error_rate: plan.error_rate,
            look: plan.look,
            rows: plan.rows,
            power: plan.power,
            replications: plan.replications.map(|n| n.to_string()),
            demanding: plan.demanding.as_ref().map(ToString::to_string),
            seed: plan.seed.map(|(seed, _)| seed.to_string()),
            seed_source: plan.seed.map(|(_, source)| source),
        }
    }
}

#[derive(Serialize)]
struct Run {
    replications: Option<String>,
    steps: Option<String>,
    shortest: Option<String>,
    longest: Option<String>,
    seconds: Option<f64>,
    solver: Option<&'static str>,
}

impl Run {
    /// `timed` says whether clock times may show.
    fn of(run: &RunSummary, timed: bool) -> Self {
        Self {
            replications: run.replications.map(|n| n.to_string()),
            steps: run.steps.map(|n| n.to_string()),
            shortest: run.times.map(|(shortest, _)| shortest.to_string()),
            longest: run.times.map(|(_, longest)| longest.to_string()),
            seconds: timed.then_some(run.seconds),
            solver: run.solver,
        }
    }
}

/// The exact part of a row.
#[derive(Serialize)]
struct ExactPart {
    quantity: &'static str,
    of: Option<String>,
    exact: Option<Number>,
    exact_low: Option<Number>,
    exact_high: Option<Number>,
    exact_fraction: Option<String>,
}

impl ExactPart {
    fn of(quantity: &Quantity, exact: Option<Bounded>) -> Self {
        Self {
            quantity: quantity.name(),
            of: quantity.of(),
            exact: number(exact.map(|exact| exact.value)),
            exact_low: number(exact.map(|exact| exact.low)),
            exact_high: number(exact.map(|exact| exact.high)),
            exact_fraction: None,
        }
    }
}

#[derive(Serialize)]
#[serde(untagged)]
enum AnyRow<'a> {
    Compared(Box<Compared<'a>>),
    Answered(Answered<'a>),
    Estimated(Estimated),
}

#[derive(Serialize)]
struct Compared<'a> {
    #[serde(flatten)]
    exact: ExactPart,
    estimate: Option<Number>,
    standard_error: Option<Number>,
    low: Option<Number>,
    high: Option<Number>,
    level: f64,
    tolerance: JsonTolerance,
    method: &'static str,
    guarantee: Guarantee,
    p_value: Option<Number>,
    p_adjusted: Option<Number>,
    verdict: Verdict,
    replications_needed: Option<String>,
    note: Option<&'a str>,
}

#[derive(Serialize)]
struct JsonTolerance {
    value: Number,
    kind: &'static str,
    source: &'static str,
}

impl<'a> Compared<'a> {
    fn of(row: &'a Row) -> Self {
        let (value, kind) = match row.tolerance.tolerance {
            Tolerance::Absolute(value) => (value, "absolute"),
            Tolerance::Relative(share) => (share, "relative"),
        };
        let source = match row.tolerance.source {
            ToleranceSource::Default => "default",
            ToleranceSource::Widened { .. } => "widened",
            ToleranceSource::Given => "given",
        };
        Self {
            exact: ExactPart::of(&row.quantity, row.exact),
            estimate: number(row.estimate),
            standard_error: number(row.standard_error),
            low: number(row.interval.map(|interval| interval.low)),
            high: number(row.interval.map(|interval| interval.high)),
            level: row.level,
            tolerance: JsonTolerance { value: Number(value), kind, source },
            method: row.method,
            guarantee: row.guarantee,
            p_value: number(row.p_value),
            p_adjusted: number(row.p_adjusted),
            verdict: row.verdict,
            replications_needed: row.replications_needed.map(|n| n.to_string()),
            note: row.note.as_deref(),
        }
    }
}

#[derive(Serialize)]
struct Answered<'a> {
    #[serde(flatten)]
    exact: ExactPart,
    note: Option<&'a str>,
}

impl<'a> Answered<'a> {
    fn of(answer: &'a Answer) -> Self {
        Self { exact: ExactPart::of(&answer.quantity, answer.exact), note: answer.note.as_deref() }
    }
}

#[derive(Serialize)]
struct Estimated {
    quantity: &'static str,
    of: Option<String>,
    estimate: Option<Number>,
    standard_error: Option<Number>,
}

impl Estimated {
    fn of(one: &Estimate) -> Self {
        Self {
            quantity: one.quantity.name(),
            of: one.quantity.of(),
            estimate: number(one.estimate),
            standard_error: number(one.standard_error),
        }
    }
}

#[derive(Serialize)]
struct LeftOut<'a> {
    quantity: &'static str,
    of: Option<String>,
    exact: Option<Number>,
    text: &'a str,
}

impl<'a> LeftOut<'a> {
    fn of(one: &'a NotCompared) -> Self {
        Self {
            quantity: one.quantity.name(),
            of: one.quantity.of(),
            exact: number(one.exact.map(|exact| exact.value)),
            text: &one.text,
        }
    }
}

impl<'a> Whole<'a> {
    fn of(document: &'a Document) -> Self {
        let (schema, rows): (_, Vec<AnyRow<'a>>) = match &document.body {
            Body::Check(comparison) => ("tallystone.check/1", compared(comparison)),
            Body::Audit(comparison) => ("tallystone.audit/1", compared(comparison)),
            Body::Exact(answers) => {
                ("tallystone.exact/1", answers.iter().map(|one| AnyRow::Answered(Answered::of(one))).collect())
            }
            Body::Sample(estimates) => {
                ("tallystone.sample/1", estimates.iter().map(|one| AnyRow::Estimated(Estimated::of(one))).collect())
            }
        };
        let comparison = document.comparison();
        Self {
            schema,
            tool: Tool { name: "tallystone", version: env!("CARGO_PKG_VERSION"), stream_version: STREAM_VERSION },
            command: &document.command,
            inputs: &document.inputs,
            model: &document.model,
            plan: document.plan.as_ref().map(Plan::of),
            run: document.run.as_ref().map(|run| Run::of(run, document.when.is_some())),
            rows,
            findings: comparison.map_or(&[], |comparison| &comparison.findings),
            not_compared: comparison
                .map_or(Vec::new(), |comparison| comparison.not_compared.iter().map(LeftOut::of).collect()),
            verdict: comparison.map(|comparison| comparison.verdict),
            warnings: &document.warnings,
            cautions: document.cautions(),
            when: document.when,
        }
    }
}

fn compared(comparison: &Comparison) -> Vec<AnyRow<'_>> {
    comparison.rows.iter().map(|row| AnyRow::Compared(Box::new(Compared::of(row)))).collect()
}
