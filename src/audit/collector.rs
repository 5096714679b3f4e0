//! Collects outcomes one by one, in whatever order they come.

use std::collections::HashMap;
use std::sync::Arc;

use crate::compare::{Finding, Study};
use crate::exact::Exact;
use crate::model::{Ticks, did_you_mean, listed, shortened};
use crate::sampling::{Grid, Tally};

/// Steps to either side in which the nearest possible time is looked for.
const NEIGHBOURHOOD: u64 = 10_000;

/// Why one outcome cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{text}; {remedy}")]
pub struct OutcomeFault {
    /// What is wrong, with the value.
    pub text: String,
    /// What to do about it.
    pub remedy: String,
}

/// Outcomes on the way into a tally.
#[derive(Debug)]
pub struct Collector<'a> {
    exact: &'a Exact<'a>,
    tally: Tally,
    ends: HashMap<&'a [u8], usize>,
    /// For each end, its impossible outcomes.
    impossible: Vec<Option<Impossible>>,
}

/// Impossible outcomes of one end: how many, and the first of them.
#[derive(Debug, Clone)]
struct Impossible {
    count: u64,
    time: u64,
    line: Option<u64>,
}

/// What the outcomes came to.
#[derive(Debug)]
pub struct Audited {
    /// Their tally, over the study's grid; impossible outcomes are in it too.
    pub tally: Tally,
    /// Outcomes that the model makes impossible: an entry for each end that has some, in the order of the ends.
    pub findings: Vec<Finding>,
}

impl<'a> Collector<'a> {
    /// Collects for a study.
    pub fn new(study: &'a Study<'a>) -> Self {
        Self::over(study.exact(), study.grid(), study.ticks())
    }

    pub(super) fn over(exact: &'a Exact<'a>, grid: Arc<Grid>, ticks: Ticks) -> Self {
        let ends = exact.model().chain().ends();
        Self {
            exact,
            tally: Tally::new(ends.len(), grid).in_ticks(ticks),
            ends: ends.iter().enumerate().map(|(number, end)| (end.name.as_bytes(), number)).collect(),
            impossible: vec![None; ends.len()],
        }
    }

    /// Adds an outcome by the name of its end and its time in steps, or in the ticks of the study in continuous time; `line`
    /// is its place in a file, if it comes from one.
    ///
    /// # Errors
    /// An end that the model does not have, with the nearest known name; nothing is added then.
    ///
    /// # Complexity
    /// O(1), besides what the tally needs to find the cell of the time.
    pub fn add(&mut self, end: &str, time: u64, line: Option<u64>) -> Result<(), OutcomeFault> {
        let number = self.end(end.as_bytes()).ok_or_else(|| self.unknown_end(end))?;
        self.count(number, time, line);
        Ok(())
    }

    /// The unit in which times are counted.
    pub(super) fn ticks(&self) -> Ticks {
        self.tally.ticks()
    }

    /// The number of the end of that name.
    pub(super) fn end(&self, name: &[u8]) -> Option<usize> {
        self.ends.get(name).copied()
    }

    /// Adds an outcome by the number of its end.
    pub(super) fn count(&mut self, end: usize, time: u64, line: Option<u64>) {
        self.tally.add(end, time);
        if !self.exact.is_possible(end, time) {
            self.impossible[end].get_or_insert(Impossible { count: 0, time, line }).count += 1;
        }
    }

    /// Why a name is no end, and what to write instead.
    pub(super) fn unknown_end(&self, name: &str) -> OutcomeFault {
        let fault = |text: String, remedy: String| OutcomeFault { text, remedy };
        if name.is_empty() {
            let remedy =
                "name the end in which the replication finished; this version reads finished replications only";
            return fault("the outcome names no end".to_owned(), remedy.to_owned());
        }
        let model = self.exact.model();
        let ends = model.chain().ends();
        let quoted = |numbers: &[usize]| listed(numbers.iter().map(|end| format!("`{}`", ends[*end].name)));
        if let Some(group) = model.groups().iter().find(|group| group.name == name) {
            let text = format!("`{name}` is a group of ends, not an end");
            return fault(text, format!("name the end itself, one of {}", quoted(&group.ends)));
        }
        let all = quoted(&(0..ends.len()).collect::<Vec<_>>());
        if let Some(state) = model.chain().state(name) {
            let Some(end) = model.chain().end_of(state) else {
                let text = format!("`{name}` is a transient state, where no replication finishes");
                return fault(text, format!("the ends are {all}"));
            };
            let text = format!("`{name}` is no end by itself, but a state of the end `{}`", ends[end].name);
            return fault(text, format!("write `{}`", ends[end].name));
        }
        let remedy = did_you_mean(name, ends.iter().map(|end| end.name.as_str()), &format!("the ends are {all}"));
        fault(format!("`{}` is no end of the model", shortened(name)), remedy)
    }

    /// The tally and the findings.
    pub fn finish(self) -> Audited {
        let ends = self.exact.model().chain().ends();
        let found = self.impossible.iter().enumerate().filter_map(|(end, seen)| seen.as_ref().map(|seen| (end, seen)));
        let findings = found.map(|(end, seen)| {
            let Impossible { count, time, line } = *seen;
            let name = &ends[end].name;
            let why = self.why_impossible(end, time);
            let which = match (count, line) {
                (1, None) => String::new(),
                (1, Some(line)) => format!(" (line {line})"),
                (_, None) => format!(" (the first of {count} impossible outcomes)"),
                (_, Some(line)) => format!(" (line {line}, the first of {count} impossible outcomes)"),
            };
            let ticks = self.tally.ticks();
            let at = if ticks.is_steps() { time.to_string() } else { ticks.time(time).to_string() };
            let text = format!("`{name}` at time {at}{which} cannot happen: {why}");
            let time = ticks.is_steps().then_some(time);
            Finding { end: name.clone(), time, line, count, text }
        });
        let findings = findings.collect();
        Audited { tally: self.tally, findings }
    }

    fn why_impossible(&self, end: usize, time: u64) -> String {
        if self.exact.absorption(&[end]).high == 0.0 {
            return "the start cannot reach it".to_owned();
        }
        if let Some(only) = self.exact.only_time(&[end]) {
            return format!("every path to it takes exactly {}", steps(only));
        }
        let possible = |time: &u64| self.exact.is_possible(end, *time);
        let earliest = time.saturating_sub(NEIGHBOURHOOD);
        let before = (earliest..time).rev().find(possible);
        let after = (time.saturating_add(1)..=time.saturating_add(NEIGHBOURHOOD)).find(possible);
        match (before, after) {
            (None, Some(after)) if earliest == 0 => format!("the shortest path to it takes {}", steps(after)),
            (Some(before), Some(after)) => {
                format!("no path to it takes {}; the nearest take {before} and {after}", steps(time))
            }
            (Some(near), None) | (None, Some(near)) => {
                format!("no path to it takes {}; the nearest takes {near}", steps(time))
            }
            (None, None) => format!("no path to it takes {}", steps(time)),
        }
    }
}

fn steps(count: u64) -> String {
    if count == 1 { "1 step".to_owned() } else { format!("{count} steps") }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::exact::Request;
    use crate::model::{Model, Silent};

    /// Ends that take exactly 2, an even number of at least 4, or any number of at least 3 steps, and one that is never
    /// reached.
    const BENCH: &str = r#"
        start = "intake"
        absorbing = ["scrapped", "shipped", "parts", "stolen"]
        [moves]
        intake = { sort = 0.2, test = "rest" }
        sort   = { scrapped = 0.5, stock = 0.5 }
        stock  = { parts = 0.5, stock = 0.5 }
        test   = { box = 1 }
        box    = { label = 1 }
        label  = { shipped = 0.5, box-again = 0.5 }
        box-again = { label = 1 }
        shelf  = { stolen = 1 }
        wait-a = { wait-b = 1 }
        wait-b = { wait-a = 1 }
        [classes]
        waiting = ["wait-a", "wait-b"]
        [groups]
        lost = ["scrapped", "stolen"]
    "#;

    fn audited(outcomes: &[(&str, u64, Option<u64>)]) -> (Audited, Vec<OutcomeFault>) {
        let model = Model::from_toml(BENCH).unwrap();
        let exact = Exact::solve(&model, &Request::default(), &Silent).unwrap();
        let mut collector = Collector::over(&exact, Arc::new(Grid::new(vec![3])), Ticks::STEPS);
        let faults = outcomes.iter().filter_map(|(end, time, line)| collector.add(end, *time, *line).err()).collect();
        (collector.finish(), faults)
    }

    #[test]
    fn possible_outcomes_are_counted_and_nothing_is_found() {
        let (audited, faults) = audited(&[("shipped", 4, None), ("parts", 3, None), ("parts", 1 << 60, Some(9))]);
        assert!(faults.is_empty() && audited.findings.is_empty());
        assert_eq!(audited.tally.replications(), 3);
        assert_eq!((audited.tally.count(2), audited.tally.count(3)), (1, 2));
        assert_eq!(audited.tally.at_or_below(3), Some(1));
    }

    #[test]
    fn impossible_outcomes_are_found_by_end_and_counted_all_the_same() {
        let outcomes = [
            ("shipped", 7, Some(3)),
            ("scrapped", 3, None),
            ("stolen", 2, Some(4)),
            ("shipped", 0, Some(2)),
            ("parts", 0, None),
        ];
        let (audited, faults) = audited(&outcomes);
        assert!(faults.is_empty());
        assert_eq!(audited.tally.replications(), 5);
        let texts: Vec<&str> = audited.findings.iter().map(|finding| finding.text.as_str()).collect();
        assert_eq!(
            texts,
            [
                "`scrapped` at time 3 cannot happen: every path to it takes exactly 2 steps",
                "`shipped` at time 7 (line 3, the first of 2 impossible outcomes) cannot happen: no path to it takes 7 steps; \
                 the nearest take 6 and 8",
                "`parts` at time 0 cannot happen: the shortest path to it takes 3 steps",
                "`stolen` at time 2 (line 4) cannot happen: the start cannot reach it",
            ]
        );
        let shipped = &audited.findings[1];
        assert_eq!((shipped.end.as_str(), shipped.time, shipped.line, shipped.count), ("shipped", Some(7), Some(3), 2));
    }

    #[test]
    fn no_end_is_far_from_the_largest_time() {
        let (audited, _) = audited(&[("shipped", u64::MAX, None)]);
        assert_eq!(audited.findings.len(), 1);
        assert!(audited.findings[0].text.ends_with("the nearest takes 18446744073709551614"), "{:?}", audited.findings);
    }

    #[test]
    fn unknown_ends_are_refused_with_what_to_write_instead() {
        let (audited, faults) = audited(&[
            ("shiped", 4, None),
            ("lost", 2, None),
            ("wait-b", 2, None),
            ("", 2, None),
            ("zzz", 2, None),
            ("intake", 0, None),
        ]);
        assert_eq!(audited.tally.replications(), 0);
        let shown: Vec<String> = faults.iter().map(ToString::to_string).collect();
        assert_eq!(shown[0], "`shiped` is no end of the model; did you mean `shipped`?");
        assert_eq!(shown[1], "`lost` is a group of ends, not an end; name the end itself, one of `scrapped`, `stolen`");
        assert_eq!(shown[2], "`wait-b` is no end by itself, but a state of the end `waiting`; write `waiting`");
        assert!(shown[3].starts_with("the outcome names no end; name the end"), "{}", shown[3]);
        let all = "the ends are `waiting`, `scrapped`, `shipped`, `parts`, `stolen`";
        assert_eq!(shown[4], format!("`zzz` is no end of the model; {all}"));
        assert_eq!(shown[5], format!("`intake` is a transient state, where no replication finishes; {all}"));
    }
}
