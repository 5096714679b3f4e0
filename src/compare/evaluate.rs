//! From a planned row and a tally to a finished row.

use crate::exact::Bounded;
use crate::model::Tolerance;
use crate::sampling::Tally;
use crate::statistics::normal_upper_quantile;

use super::certain::Certain;
use super::method::Evidence;
use super::planned::{Basis, Planned, Shared, Tested};
use super::words::counted;
use super::{AppliedTolerance, Guarantee, Row, ToleranceSource, Verdict, verdict};

/// What all rows of a table have in common.
#[derive(Debug, Clone, Copy)]
pub(super) struct Terms {
    pub(super) error_rate: f64,
    pub(super) power: f64,
    /// The level of one row.
    pub(super) alpha: f64,
}

/// Nothing beyond what the model allows is tolerated where only one thing is possible.
const NOTHING: AppliedTolerance =
    AppliedTolerance { tolerance: Tolerance::Absolute(0.0), value: 0.0, source: ToleranceSource::Default };

/// Evaluates row number `at`.
pub(super) fn evaluate(rows: &[Planned<'_>], at: usize, tally: &Tally, terms: Terms) -> Row {
    let row = &rows[at];
    match &row.basis {
        Basis::Certain(certain) => certainty(row, certain, tally),
        Basis::Tested(tested) => {
            let shares = tested.shares.map(|Shared { with, complement }| {
                let relation = if complement { "the complement of" } else { "the same outcomes as" };
                format!("{relation} `{}`, whose level it shares", rows[with].quantity)
            });
            test(row, tested, shares, tally, terms)
        }
    }
}

fn certainty(row: &Planned<'_>, certain: &Certain, tally: &Tally) -> Row {
    let seen = certain.seen(&row.quantity, tally);
    let verdict = verdict::of_certainty(seen.replications, seen.otherwise);
    let p_value = match verdict {
        Verdict::Disagree => Some(0.0),
        Verdict::Inconclusive => None,
        _ => Some(1.0),
    };
    let note = match verdict {
        Verdict::Disagree => "the model allows nothing else, and something else occurred",
        Verdict::Inconclusive => "the model allows nothing else, and no replication speaks of it",
        _ => "certain: the model allows nothing else",
    };
    Row {
        quantity: row.quantity.clone(),
        exact: row.exact,
        estimate: seen.estimate,
        standard_error: None,
        interval: None,
        level: 1.0,
        tolerance: NOTHING,
        method: "occurrence of the impossible",
        guarantee: Guarantee::Certain,
        p_value,
        p_adjusted: p_value,
        verdict,
        replications_needed: None,
        note: Some(note.to_owned()),
    }
}

fn test(row: &Planned<'_>, tested: &Tested<'_>, shares: Option<String>, tally: &Tally, terms: Terms) -> Row {
    let (n, alpha, tolerance) = (tally.replications(), terms.alpha, tested.tolerance.value);
    let evidence = tested.method.evaluate(tally, tolerance, alpha);
    let decides = evidence.premature.is_none();
    let p_value = evidence.p_value.filter(|_| decides);
    let p_adjusted = p_value.map(|p| (p * terms.error_rate / alpha).min(1.0));
    let sensitive = tolerance == 0.0 && tested.is_sensitive(n, alpha);
    let verdict = match (evidence.interval, p_adjusted) {
        _ if !decides => Verdict::Inconclusive,
        (Some(interval), _) => verdict::of_interval(interval, tested.bounds, tolerance, sensitive),
        (None, Some(p_adjusted)) => verdict::of_test(p_adjusted, terms.error_rate, sensitive),
        (None, None) => Verdict::Inconclusive,
    };
    let open = verdict == Verdict::Inconclusive;
    let needed = open.then(|| tested.needed(alpha, terms.power));
    let never = needed.as_ref().and_then(|needed| needed.as_ref().err().cloned());
    let needed = needed.and_then(Result::ok);
    let guarantee = if shares.is_some() { Guarantee::Certain } else { tested.method.guarantee() };
    let notes = [
        shares,
        evidence.premature.clone(),
        never.as_ref().map(|reason| format!("never decided: {reason}")),
        if open && decides && never.is_none() { outlook(tested, &evidence, n, needed, terms) } else { None },
        evidence.note,
    ];
    let notes: Vec<String> = notes.into_iter().flatten().collect();
    Row {
        quantity: row.quantity.clone(),
        exact: row.exact,
        estimate: evidence.estimate,
        standard_error: evidence.standard_error,
        interval: evidence.interval,
        level: 1.0 - alpha,
        tolerance: tested.tolerance,
        method: tested.method.name(),
        guarantee,
        p_value,
        p_adjusted,
        verdict,
        replications_needed: needed,
        note: (!notes.is_empty()).then(|| notes.join("; ")),
    }
}

/// How an undecided row would go on if the difference seen were the true one; `needed` replications decide it if there is
/// none at all.
fn outlook(tested: &Tested<'_>, evidence: &Evidence, n: u64, needed: Option<u64>, terms: Terms) -> Option<String> {
    let tolerance = tested.tolerance.value;
    let (interval, estimate) = evidence.interval.zip(evidence.estimate)?;
    let enough = needed.is_some_and(|needed| n >= needed);
    let none_seen = interval.low <= tested.bounds.high && tested.bounds.low <= interval.high;
    // With fewer replications than needed the difference seen is chance, or seems near the tolerance by chance.
    if tolerance == 0.0 || (none_seen && !enough) {
        return None;
    }
    let half_width = (interval.high - estimate).max(estimate - interval.low);
    match replications_for(half_width, gap(estimate, tested.bounds, tolerance), n, terms) {
        Some(about) => Some(format!("at the difference seen, about {} replications would decide it", counted(about))),
        None => enough.then(|| "near the tolerance: it may never resolve".to_owned()),
    }
}

/// How far the difference seen is from the tolerance.
fn gap(estimate: f64, exact: Bounded, tolerance: f64) -> f64 {
    let difference = (estimate - exact.value).abs();
    (difference - tolerance).abs() - 0.5 * (exact.high - exact.low)
}

/// Replications after which an interval that narrows as 1/√n stays on its side of the tolerance with the power asked, to
/// two digits; `None` when the gap is so small that its very sign is in doubt.
fn replications_for(half_width: f64, gap: f64, n: u64, terms: Terms) -> Option<u64> {
    if gap <= 0.25 * half_width {
        return None;
    }
    let z = normal_upper_quantile(0.5 * terms.alpha);
    let reach = (z + normal_upper_quantile(1.0 - terms.power)) / z;
    let replications = n as f64 * (half_width * reach / gap).powi(2);
    let digits = 10_f64.powf(replications.log10().floor() - 1.0).max(1.0);
    // Casting saturates.
    Some(((replications / digits).ceil() * digits) as u64)
}
