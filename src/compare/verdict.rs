//! Verdicts: of a row and of the table. They are decided here and nowhere else.

use serde::Serialize;

use crate::exact::Bounded;
use crate::statistics::Interval;

use super::{Finding, Row};

/// What a row, or a whole table, says.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Verdict {
    /// Within the tolerance.
    Agree,
    /// No difference seen, and one that matters would have been (only where the tolerance is 0).
    Consistent,
    /// Not decided by these replications.
    Inconclusive,
    /// Beyond the tolerance.
    Disagree,
}

/// What a confidence interval says of an exact answer.
///
/// It disagrees if it misses the answer and all that is within the tolerance of it, wherever in its bounds the answer
/// lies. It agrees only if all of it is within the tolerance of the answer, again wherever that lies: the guard band
/// faces inwards. A tolerance of 0 never agrees; there `sensitive` says whether a difference that matters would have
/// been seen.
pub(super) fn of_interval(interval: Interval, exact: Bounded, tolerance: f64, sensitive: bool) -> Verdict {
    if interval.high < exact.low - tolerance || exact.high + tolerance < interval.low {
        return Verdict::Disagree;
    }
    if tolerance == 0.0 {
        return if sensitive { Verdict::Consistent } else { Verdict::Inconclusive };
    }
    let inside = exact.high - tolerance <= interval.low && interval.high <= exact.low + tolerance;
    if inside && resolves(exact, tolerance) { Verdict::Agree } else { Verdict::Inconclusive }
}

/// Whether an answer is known better than to the tolerance; nothing can agree otherwise.
pub(super) fn resolves(exact: Bounded, tolerance: f64) -> bool {
    exact.high - exact.low < 2.0 * tolerance
}

/// What a test of no difference at all says, by its p-value for the whole table.
pub(super) fn of_test(p_adjusted: f64, error_rate: f64, sensitive: bool) -> Verdict {
    match (p_adjusted <= error_rate, sensitive) {
        (true, _) => Verdict::Disagree,
        (false, true) => Verdict::Consistent,
        (false, false) => Verdict::Inconclusive,
    }
}

/// What outcomes say where only one thing is possible: `seen` of them speak of it, `otherwise` says whether any of them
/// is impossible.
pub(super) fn of_certainty(seen: u64, otherwise: bool) -> Verdict {
    match (otherwise, seen) {
        (true, _) => Verdict::Disagree,
        (false, 0) => Verdict::Inconclusive,
        (false, _) => Verdict::Agree,
    }
}

/// What the whole table says: the worst of its rows. An impossible outcome disagrees, and an empty table decides nothing.
pub(super) fn of_table(rows: &[Row], findings: &[Finding]) -> Verdict {
    if !findings.is_empty() {
        return Verdict::Disagree;
    }
    rows.iter().map(|row| row.verdict).max().unwrap_or(Verdict::Inconclusive)
}

#[cfg(test)]
mod tests {
    use super::super::{AppliedTolerance, Guarantee, ToleranceSource};
    use super::*;
    use crate::model::{Quantity, Tolerance};

    const EXACT: Bounded = Bounded { value: 10.0, low: 9.75, high: 10.25 };

    fn around(centre: f64, half_width: f64) -> Interval {
        Interval { low: centre - half_width, high: centre + half_width }
    }

    #[test]
    fn the_guard_band_faces_inwards() {
        let say = |centre, half_width| of_interval(around(centre, half_width), EXACT, 1.0, false);
        assert_eq!(say(10.0, 0.75), Verdict::Agree);
        assert_eq!(say(10.75, 0.0), Verdict::Agree);
        // τ + ε: the answer may lie at the other end of its bounds, τ + 2ε away.
        assert_eq!(say(11.0, 0.0), Verdict::Inconclusive);
        assert_eq!(say(11.25, 0.0), Verdict::Inconclusive);
        assert_eq!(say(8.75, 0.0), Verdict::Inconclusive);
        assert_eq!(say(11.3, 0.0), Verdict::Disagree);
        assert_eq!(say(8.7, 0.0), Verdict::Disagree);
        assert_eq!(say(10.0, 5.0), Verdict::Inconclusive);
    }

    // The proof of the room's documentation, tried on a lattice of truths, answers, intervals and tolerances: an interval
    // that holds the truth never disagrees with a difference within the tolerance and never agrees with one beyond it.
    #[test]
    fn an_interval_that_covers_gives_no_wrong_verdict() {
        let eighths = |range: std::ops::RangeInclusive<i32>| range.map(|i| f64::from(i) / 8.0);
        let mut decided = [0_u32; 2];
        for truth in eighths(-12..=12) {
            for (low, high) in eighths(-12..=0).flat_map(|low| eighths(0..=12).map(move |high| (low, high))) {
                for tolerance in eighths(1..=8) {
                    for (down, up) in eighths(0..=3).flat_map(|down| eighths(0..=3).map(move |up| (down, up))) {
                        // The exact answer is 0 and known to lie in [−down, up].
                        let exact = Bounded { value: 0.0, low: -down, high: up };
                        let interval = Interval { low: truth + low, high: truth + high };
                        match of_interval(interval, exact, tolerance, true) {
                            Verdict::Agree => {
                                decided[0] += 1;
                                assert!(truth.abs() <= tolerance);
                            }
                            Verdict::Disagree => {
                                decided[1] += 1;
                                assert!(truth.abs() > tolerance);
                            }
                            Verdict::Inconclusive => {}
                            Verdict::Consistent => unreachable!("the tolerance is not 0"),
                        }
                    }
                }
            }
        }
        assert!(decided.iter().all(|count| *count > 1000));
    }

    #[test]
    fn bounds_wider_than_the_tolerance_never_agree() {
        assert!(!resolves(EXACT, 0.25));
        assert!(resolves(EXACT, 0.26));
        assert_eq!(of_interval(around(10.0, 0.0), EXACT, 0.25, true), Verdict::Inconclusive);
        assert_eq!(of_interval(around(10.0, 0.0), EXACT, 0.1, true), Verdict::Inconclusive);
    }

    #[test]
    fn no_tolerance_is_consistent_at_best() {
        let exact = Bounded::exactly(1.0);
        let say = |centre, sensitive| of_interval(around(centre, 0.5), exact, 0.0, sensitive);
        assert_eq!(say(1.0, true), Verdict::Consistent);
        assert_eq!(say(1.0, false), Verdict::Inconclusive);
        assert_eq!(say(1.6, true), Verdict::Disagree);
        assert_eq!(of_interval(around(1.0, 0.0), exact, 0.0, true), Verdict::Consistent);
        assert_eq!(of_test(0.01, 0.01, true), Verdict::Disagree);
        assert_eq!(of_test(0.02, 0.01, true), Verdict::Consistent);
        assert_eq!(of_test(0.02, 0.01, false), Verdict::Inconclusive);
    }

    #[test]
    fn what_cannot_be_otherwise_disagrees_only_by_an_occurrence() {
        assert_eq!(of_certainty(100, false), Verdict::Agree);
        assert_eq!(of_certainty(0, false), Verdict::Inconclusive);
        assert_eq!(of_certainty(100, true), Verdict::Disagree);
    }

    fn row(verdict: Verdict) -> Row {
        let tolerance = Tolerance::Absolute(0.0);
        Row {
            quantity: Quantity::MeanTime,
            exact: None,
            estimate: None,
            standard_error: None,
            interval: None,
            level: 1.0,
            tolerance: AppliedTolerance { tolerance, value: 0.0, source: ToleranceSource::Default },
            method: "",
            guarantee: Guarantee::Exact,
            p_value: None,
            p_adjusted: None,
            verdict,
            replications_needed: None,
            note: None,
        }
    }

    #[test]
    fn the_table_says_the_worst_and_a_finding_disagrees() {
        use Verdict::{Agree, Consistent, Disagree, Inconclusive};
        let rows = |verdicts: &[Verdict]| verdicts.iter().map(|verdict| row(*verdict)).collect::<Vec<_>>();
        for (verdicts, table) in [
            (&[Agree, Agree][..], Agree),
            (&[Agree, Consistent], Consistent),
            (&[Consistent, Inconclusive, Agree], Inconclusive),
            (&[Disagree, Inconclusive, Agree], Disagree),
            (&[], Inconclusive),
        ] {
            assert_eq!(of_table(&rows(verdicts), &[]), table);
            let finding = Finding { end: "shipped".into(), time: Some(1), line: None, count: 1, text: String::new() };
            assert_eq!(of_table(&rows(verdicts), &[finding]), Disagree);
        }
    }
}
