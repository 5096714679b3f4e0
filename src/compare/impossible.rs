//! Outcomes of a tally that the model makes impossible.

use crate::exact::Exact;
use crate::sampling::Tally;

use super::Finding;
use super::words::counted;

/// Impossible outcomes that a tally shows by itself: ends that the start cannot reach, and extreme times that no path has.
/// `known` ends have findings already.
pub(super) fn findings(exact: &Exact<'_>, tally: &Tally, known: &[Finding]) -> Vec<Finding> {
    let mut found = Vec::new();
    for (number, end) in exact.model().chain().ends().iter().enumerate() {
        let (Some(smallest), Some(largest)) = (tally.smallest(number), tally.largest(number)) else { continue };
        if known.iter().any(|finding| finding.end == end.name) {
            continue;
        }
        let name = &end.name;
        if exact.absorption(&[number]).high == 0.0 {
            let count = tally.count(number);
            let text = format!("`{name}` occurred {} times, but the start cannot reach it", counted(count));
            let time = tally.ticks().is_steps().then_some(smallest);
            found.push(Finding { end: name.clone(), time, line: None, count, text });
            continue;
        }
        let impossible = [smallest, largest].into_iter().find(|time| !exact.is_possible(number, *time));
        if let Some(time) = impossible {
            let text = format!("`{name}` was entered at time {time}, when no path of the model does so");
            found.push(Finding { end: name.clone(), time: Some(time), line: None, count: 1, text });
        }
    }
    found
}
