//! What deserves a look before the run.

use crate::model::{Model, Quantity, ToleranceKey, Warning, WarningKind};

use super::planned::{Planned, Tested};
use super::words::{counted, rounded};
use super::{NotCompared, Settings, ToleranceSource};

fn warning(kind: WarningKind, text: String) -> Warning {
    Warning { kind, text }
}

/// Rows that were asked for, or are there by default, and cannot be: one warning a reason.
pub(super) fn left_out(rows: &[NotCompared]) -> Vec<Warning> {
    let mut reasons: Vec<(&str, Vec<String>)> = Vec::new();
    for row in rows {
        let name = format!("`{}`", row.quantity);
        match reasons.iter_mut().find(|(text, _)| *text == row.text) {
            Some((_, names)) => names.push(name),
            None => reasons.push((&row.text, vec![name])),
        }
    }
    let text = |(reason, names): (&str, Vec<String>)| format!("not compared: {}: {reason}", names.join(", "));
    reasons.into_iter().map(|reason| warning(WarningKind::NotCompared, text(reason))).collect()
}

/// Ends that are too many to have rows of their own. Those that cannot be reached are a matter of the model's warnings.
pub(super) fn unlisted(rows: &[NotCompared]) -> Option<Warning> {
    let possible = rows.iter().filter(|row| row.exact.is_some_and(|exact| exact.high > 0.0)).count();
    let text =
        || format!("{} less likely ends have no row of their own; ask for those that matter", counted(possible as u64));
    (possible > 0).then(|| warning(WarningKind::NotCompared, text()))
}

/// Tolerances that let much pass: widened ones, and those as wide as a probability.
pub(super) fn wide(rows: &[Planned<'_>], power: f64) -> Vec<Warning> {
    let tested = rows.iter().filter_map(|row| Some((row, row.tested()?)));
    let texts = tested.flat_map(|(row, tested)| [widened(row, tested), blind(row, tested, power), whole(row, tested)]);
    texts.flatten().map(|text| warning(WarningKind::WideTolerance, text)).collect()
}

fn widened(row: &Planned<'_>, tested: &Tested<'_>) -> Option<String> {
    let ToleranceSource::Widened { .. } = tested.tolerance.source else { return None };
    Some(format!(
        "the default tolerance of `{}` was widened from {} to {}, so that 500,000 replications decide it; give a tolerance \
         of your own if that is too much",
        row.quantity, tested.default, tested.tolerance.tolerance
    ))
}

/// Rows that stay undecided whatever is run; defaults never do.
pub(super) fn never(rows: &[Planned<'_>], alpha: f64, power: f64) -> Vec<Warning> {
    let reasons = rows.iter().filter_map(|row| {
        let tested = row.tested().filter(|tested| tested.is_given)?;
        Some((&row.quantity, tested.needed(alpha, power).err()?))
    });
    let text = |(quantity, reason): (&Quantity, String)| {
        format!("`{quantity}` will not be decided by any number of replications: {reason}; give it a wider tolerance")
    };
    reasons.map(|row| warning(WarningKind::NeverDecided, text(row))).collect()
}

/// A tolerance that lets an end pass that never occurs.
fn blind(row: &Planned<'_>, tested: &Tested<'_>, power: f64) -> Option<String> {
    if !row.quantity.is_probability() {
        return None;
    }
    let p = row.exact?.value;
    if p <= 0.0 || tested.tolerance.value < p {
        return None;
    }
    // Not once in n replications: (1 − p)^n.
    let n = ((1.0 - power).ln() / (-p).ln_1p()).ceil();
    let once = if n < 1e18 { counted(n as u64) } else { rounded(n) };
    Some(format!(
        "the tolerance {} of `{}` is as wide as the probability {} itself: it agrees even if nothing of the kind occurs; to \
         see one with probability {power} takes {once} replications",
        rounded(tested.tolerance.value),
        row.quantity,
        rounded(p)
    ))
}

/// A tolerance as wide as the answer itself.
fn whole(row: &Planned<'_>, tested: &Tested<'_>) -> Option<String> {
    if row.quantity.is_probability() {
        return None;
    }
    let (value, tolerance) = (row.exact?.value.abs(), tested.tolerance.value);
    (tested.is_given && value > 0.0 && tolerance >= value).then(|| {
        format!(
            "the tolerance {} of `{}` is as wide as the answer {} itself",
            rounded(tolerance),
            row.quantity,
            rounded(value)
        )
    })
}

/// Tolerances that were given for what is not compared.
pub(super) fn unused(
    model: &Model,
    settings: &Settings,
    rows: &[Planned<'_>],
    left_out: &[NotCompared],
) -> Vec<Warning> {
    // A user who names the rows knows that the model's tolerances for others rest.
    let of_model = model.tolerances().keys().filter(|_| settings.quantities.is_none());
    let is_named = |key: &ToleranceKey, quantity: &Quantity| match key {
        ToleranceKey::One(one) => one == quantity,
        ToleranceKey::All(name) => name == quantity.name(),
    };
    let mut texts: Vec<String> = Vec::new();
    for key in settings.tolerances.keys().chain(of_model) {
        let used = rows.iter().any(|row| is_named(key, &row.quantity));
        // What was left out has a warning of its own.
        if used || left_out.iter().any(|row| is_named(key, &row.quantity)) {
            continue;
        }
        let name = match key {
            ToleranceKey::One(quantity) => quantity.to_string(),
            ToleranceKey::All(name) => name.clone(),
        };
        let text =
            format!("a tolerance is given for `{name}`, which is not compared; ask for the quantity, or drop it");
        if !texts.contains(&text) {
            texts.push(text);
        }
    }
    texts.into_iter().map(|text| warning(WarningKind::NotCompared, text)).collect()
}
