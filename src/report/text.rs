//! The report for people, in plain text.

use std::io::{self, Write};

use crate::compare::{Comparison, Row, Verdict};
use crate::exact::Bounded;
use crate::model::Quantity;
use crate::sampling::Estimate;

use super::document::{Answer, Body, Document, SeedSource};
use super::number::{proven, proven_within, rounded, thousands};
use super::table::{Column, KEPT, Table, table};
use super::words::{shown, wrapped};

/// Rows that the text shows; files hold all.
const MOST_ROWS: usize = 20;

/// What the page allows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Layout {
    /// Columns of the page; the text keeps within them as far as names allow.
    pub width: usize,
    /// Whether verdicts may be coloured by terminal codes.
    pub color: bool,
}

impl Default for Layout {
    fn default() -> Self {
        Self { width: 80, color: false }
    }
}

/// Writes a document for people.
///
/// # Errors
/// Those of the sink.
pub fn write_text(document: &Document, layout: Layout, out: &mut impl Write) -> io::Result<()> {
    let paragraph = |text: &str| wrapped(text, layout.width, 0);
    writeln!(out, "{}", paragraph(&heading(document)))?;
    for line in particulars(document) {
        writeln!(out, "{}", paragraph(&line))?;
    }
    writeln!(out)?;
    match &document.body {
        Body::Check(comparison) | Body::Audit(comparison) => write_comparison(document, comparison, layout, out)?,
        Body::Exact(answers) => write_answers(answers, layout, out)?,
        Body::Sample(estimates) => write_estimates(estimates, layout, out)?,
    }
    writeln!(out)?;
    writeln!(out, "{}", paragraph(&document.cautions().join(" ")))
}

fn heading(document: &Document) -> String {
    let model = &document.model;
    let title = if model.title.is_empty() { "Untitled model".to_owned() } else { shown(&model.title) };
    let ends = model.ends.len();
    let count = |n: usize, word: &str| format!("{} {word}{}", thousands(n as u64), if n == 1 { "" } else { "s" });
    format!("{title}: {}, {}, {}", count(model.states, "state"), count(model.moves, "move"), count(ends, "end"))
}

/// What was run, in a few lines.
fn particulars(document: &Document) -> Vec<String> {
    let mut lines = Vec::new();
    let unit = &document.model.clock_unit;
    if document.model.clock == "rates" {
        lines.push(format!("Continuous time, in clock units of one {}.", shown(unit)));
    } else if unit != "step" {
        lines.push(format!("One step of the clock is one {}.", shown(unit)));
    }
    for input in document.inputs.iter().filter(|input| input.rows.is_some()) {
        let rows = thousands(input.rows.unwrap_or_default());
        let ignored: Vec<String> = input.ignored_columns.iter().map(|name| shown(name)).collect();
        let ignored =
            if ignored.is_empty() { String::new() } else { format!("; columns not read: {}", ignored.join(", ")) };
        let s = if input.rows == Some(1) { "" } else { "s" };
        lines.push(format!("{rows} outcome{s} from {}{ignored}", shown(&input.file)));
    }
    let run = document.run.as_ref();
    let times = run.and_then(|run| run.times).filter(|_| matches!(document.body, Body::Sample(_)));
    let Some(plan) = &document.plan else { return lines };
    if let (Some((seed, source)), Some(replications)) = (plan.seed, run.and_then(|run| run.replications)) {
        let source = match source {
            SeedSource::Default => " (default)",
            SeedSource::Random => " (random)",
            SeedSource::Given => "",
        };
        let steps =
            run.and_then(|run| run.steps).map_or(String::new(), |steps| format!(", {} steps", thousands(steps)));
        lines.push(format!("{} replications, seed {seed}{source}{steps}", thousands(replications)));
    }
    if let Some((shortest, longest)) = times {
        lines.push(format!("Shortest time {}, longest {}", thousands(shortest), thousands(longest)));
    }
    if let Some(rate) = plan.error_rate {
        let sized = match (plan.replications, &plan.demanding) {
            (Some(replications), Some(quantity)) => format!(
                "; to decide every row takes {} replications, most of all for {}",
                thousands(replications),
                shown(&quantity.to_string())
            ),
            _ => String::new(),
        };
        let look = plan.look.map_or(String::new(), |look| format!(" (look {look} of a series)"));
        lines.push(format!("Error rate of the whole table: {}{look}{sized}", rounded(rate, 3)));
    }
    lines
}

fn write_comparison(
    document: &Document,
    comparison: &Comparison,
    layout: Layout,
    out: &mut impl Write,
) -> io::Result<()> {
    const COLUMNS: [Column; 6] = [
        Column { title: "quantity", right: false, worth: KEPT },
        Column { title: "exact", right: true, worth: 4 },
        Column { title: "observed", right: true, worth: 3 },
        Column { title: "interval", right: false, worth: 1 },
        Column { title: "tolerance", right: true, worth: 2 },
        Column { title: "verdict", right: false, worth: KEPT },
    ];
    let worst_first = worst_first(comparison);
    let rows: Vec<Vec<String>> = worst_first.iter().map(|row| cells(row)).collect();
    let Table { lines, dropped } = table(&COLUMNS, &rows, layout.width);
    for (number, mut line) in lines.into_iter().enumerate() {
        if let (Some(at), Some(verdict)) = (number.checked_sub(1), line.last_mut()) {
            *verdict = colored(verdict.trim_end(), worst_first[at].verdict, layout);
        }
        writeln!(out, "{}", line.join("  ").trim_end())?;
    }
    let hidden = comparison.rows.len() - worst_first.len();
    if hidden > 0 {
        let s = if hidden == 1 { "" } else { "s" };
        let text = format!("and {hidden} more row{s}, none worse than these; --json holds all");
        writeln!(out, "{}", wrapped(&text, layout.width, 2))?;
    }
    write_dropped(&dropped, layout, out)?;
    let item = |text: &str| wrapped(&format!("- {text}"), layout.width, 2);
    let notes = worst_first.iter().filter_map(|row| Some((row, note(row, comparison.replications)?)));
    let notes = grouped(notes.map(|(row, text)| (row.quantity.to_string(), text)));
    let left_out = grouped(comparison.not_compared.iter().map(|one| (one.quantity.to_string(), one.text.clone())));
    for (title, texts) in [
        ("Findings, impossible under the model:", comparison.findings.iter().map(|one| shown(&one.text)).collect()),
        ("Notes:", notes),
        ("Not compared:", left_out),
    ] {
        if !texts.is_empty() {
            writeln!(out, "\n{title}")?;
            texts.iter().take(MOST_ROWS).try_for_each(|text| writeln!(out, "{}", item(text)))?;
            if texts.len() > MOST_ROWS {
                writeln!(out, "  and {} more; --json holds all", texts.len() - MOST_ROWS)?;
            }
        }
    }
    let verdict = colored(&marked(comparison.verdict), comparison.verdict, layout);
    writeln!(out, "\nVerdict: {verdict}")?;
    writeln!(out, "{}", wrapped(closing(document, comparison), layout.width, 0))
}

/// Says which columns a narrow page leaves out.
fn write_dropped(dropped: &[&str], layout: Layout, out: &mut impl Write) -> io::Result<()> {
    if dropped.is_empty() {
        return Ok(());
    }
    let text = format!("(a wider terminal also shows: {})", dropped.join(", "));
    writeln!(out, "{}", wrapped(&text, layout.width, 2))
}

/// The rows that are shown: disagreeing ones first, then the undecided, each in the order of the plan; of many rows alike,
/// those that are about all replications before those of single ends.
fn worst_first(comparison: &Comparison) -> Vec<&Row> {
    let mut rows: Vec<&Row> = comparison.rows.iter().collect();
    if rows.len() > MOST_ROWS {
        let is_of_end =
            |row: &Row| matches!(row.quantity, Quantity::AbsorptionProbability(_) | Quantity::MeanTimeGiven(_));
        rows.sort_by_key(|row| (std::cmp::Reverse(row.verdict), is_of_end(row)));
        rows.truncate(MOST_ROWS);
    }
    rows
}

fn cells(row: &Row) -> Vec<String> {
    let number = |value: Option<f64>| value.map_or("-".to_owned(), |value| rounded(value, 5));
    let interval = match row.interval {
        // Short enough to tell, with the digits that its width leaves meaningful.
        Some(interval) => format!("{} to {}", rounded(interval.low, 5), rounded(interval.high, 5)),
        None => "-".to_owned(),
    };
    vec![
        shown(&row.quantity.to_string()),
        row.exact.map_or("-".to_owned(), |exact| proven(exact, 6)),
        number(row.estimate),
        interval,
        rounded(row.tolerance.value, 2),
        marked(row.verdict),
    ]
}

/// What a reader must know of a row; `replications` were compared.
fn note(row: &Row, replications: u64) -> Option<String> {
    let needed = row.replications_needed.filter(|n| *n > replications);
    let needed = needed.map(|n| format!("needs {} replications", thousands(n)));
    let parts: Vec<String> = needed.into_iter().chain(row.note.clone()).collect();
    (!parts.is_empty()).then(|| parts.join("; "))
}

/// Names that stand before a text that they share; the others are counted.
const MOST_NAMES: usize = 8;

/// Texts with the names that they are about; a text that several share stands once.
fn grouped(texts: impl Iterator<Item = (String, String)>) -> Vec<String> {
    let mut groups: Vec<(Vec<String>, String)> = Vec::new();
    for (name, text) in texts {
        match groups.iter_mut().find(|(_, known)| *known == text) {
            Some((names, _)) => names.push(name),
            None => groups.push((vec![name], text)),
        }
    }
    let line = |(names, text): (Vec<String>, String)| {
        let listed = names[..names.len().min(MOST_NAMES)].join(", ");
        let more = names.len().saturating_sub(MOST_NAMES);
        let more = if more > 0 { format!(" and {more} more") } else { String::new() };
        shown(&format!("{listed}{more}: {text}"))
    };
    groups.into_iter().map(line).collect()
}

fn marked(verdict: Verdict) -> String {
    match verdict {
        Verdict::Agree => "● agree",
        Verdict::Disagree => "⊠ disagree",
        Verdict::Inconclusive => "○ inconclusive",
        Verdict::Consistent => "◐ consistent",
    }
    .to_owned()
}

fn colored(text: &str, verdict: Verdict, layout: Layout) -> String {
    let code = match verdict {
        Verdict::Agree => "32",
        Verdict::Disagree => "1;31",
        Verdict::Inconclusive => "33",
        Verdict::Consistent => "36",
    };
    if layout.color { format!("\u{1b}[{code}m{text}\u{1b}[0m") } else { text.to_owned() }
}

fn closing(document: &Document, comparison: &Comparison) -> &'static str {
    let has_row = comparison.rows.iter().any(|row| row.verdict == Verdict::Disagree);
    match (&document.body, comparison.verdict) {
        (Body::Check(_), Verdict::Agree) => {
            "This program's own solver and sampler agree on this model. No other program was tested; use `audit`."
        }
        (Body::Check(_), Verdict::Disagree) => {
            "This program's own solver and sampler disagree on this model, which is a fault of this program unless a tolerance \
             is too tight; please report it. No other program was tested."
        }
        (Body::Check(_), _) => "These replications do not decide every row. No other program was tested; use `audit`.",
        (_, Verdict::Agree) => "The outcomes agree with the model, each row within its tolerance.",
        (_, Verdict::Disagree) if has_row => {
            "The outcomes are not those of the model: the rows marked disagree are beyond their tolerances."
        }
        (_, Verdict::Disagree) => {
            "The outcomes are not those of the model, which makes those listed as findings impossible."
        }
        (_, Verdict::Consistent) => "No difference was seen, and one that matters would have been.",
        (_, Verdict::Inconclusive) => "These outcomes do not decide every row; the notes say how many would.",
    }
}

fn write_table(columns: &[Column], rows: &[Vec<String>], layout: Layout, out: &mut impl Write) -> io::Result<()> {
    let Table { lines, dropped } = table(columns, rows, layout.width);
    lines.iter().try_for_each(|line| writeln!(out, "{}", line.join("  ").trim_end()))?;
    write_dropped(&dropped, layout, out)
}

fn write_answers(answers: &[Answer], layout: Layout, out: &mut impl Write) -> io::Result<()> {
    const COLUMNS: [Column; 3] = [
        Column { title: "quantity", right: false, worth: KEPT },
        Column { title: "exact", right: false, worth: KEPT },
        Column { title: "proven within", right: false, worth: 1 },
    ];
    let rows: Vec<Vec<String>> = answers.iter().map(answer_cells).collect();
    write_table(&COLUMNS, &rows, layout, out)?;
    for note in answers.iter().filter_map(|answer| Some(format!("- {}: {}", answer.quantity, answer.note.as_ref()?))) {
        writeln!(out, "{}", wrapped(&shown(&note), layout.width, 2))?;
    }
    Ok(())
}

fn answer_cells(answer: &Answer) -> Vec<String> {
    let cell = |write: fn(Bounded, usize) -> String| answer.exact.map_or("-".to_owned(), |exact| write(exact, 17));
    vec![shown(&answer.quantity.to_string()), cell(proven), cell(proven_within)]
}

fn write_estimates(estimates: &[Estimate], layout: Layout, out: &mut impl Write) -> io::Result<()> {
    const COLUMNS: [Column; 3] = [
        Column { title: "quantity", right: false, worth: KEPT },
        Column { title: "estimate", right: true, worth: KEPT },
        Column { title: "standard error", right: true, worth: 1 },
    ];
    let number = |value: Option<f64>, digits| value.map_or("-".to_owned(), |value| rounded(value, digits));
    let row =
        |one: &Estimate| vec![shown(&one.quantity.to_string()), number(one.estimate, 6), number(one.standard_error, 2)];
    let rows: Vec<Vec<String>> = estimates.iter().map(row).collect();
    write_table(&COLUMNS, &rows, layout, out)
}
