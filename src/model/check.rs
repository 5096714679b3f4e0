//! The check that turns a draft into a model: every fault at once, each with its place.

use std::collections::{HashMap, HashSet};

use super::chain::{Chain, End, NO_END, Structure};
use super::draft::{Draft, DraftMove, NamedList, Written};
use super::fault::{Fault, FaultKind, ModelError, Place, Warning, WarningKind, did_you_mean};
use super::number::Number;
use super::quantity::Quantity;
use super::row::{ExactRow, RowOutcome, Rows};
use super::tolerance::{ToleranceKey, Tolerances};
use super::{Group, Model};

/// Names listed in one warning before the rest is counted.
const LISTED: usize = 8;

impl Draft {
    /// Proves the model well formed.
    ///
    /// # Errors
    /// [`ModelError::Faulty`] with every fault found, not the first alone.
    ///
    /// # Complexity
    /// Linear in states and moves, but for the exact arithmetic of long decimals.
    pub fn check(mut self) -> Result<Model, ModelError> {
        self.check_names();
        let moves = self.moves_by_state();
        let mut checked = Checked::default();
        let (rows, targets) = self.check_rows(&moves, &mut checked);
        self.check_states_are_known();
        let start = self.check_start(&mut checked);
        // The structure needs only targets, so names are checked against the ends even when numbers are faulty.
        let structure = Structure::of(&targets, start.targets(0));
        let ends = self.check_ends(&structure, &mut checked);
        let groups = self.check_groups(&ends);
        self.check_quantities(&ends, &groups);
        self.check_something_happens(&structure, &ends, start.targets(0), &mut checked);
        if !self.faults.is_empty() {
            self.faults.sort_by_key(|fault| (fault.place.file.clone(), fault.place.line));
            return Err(ModelError::Faulty(self.faults));
        }
        let mut end_of = vec![NO_END; self.states.len()];
        for (number, end) in ends.iter().enumerate() {
            end.states.iter().for_each(|state| end_of[*state] = number as u32);
        }
        let mut tolerances = Tolerances::default();
        for (key, value, _) in self.tolerances {
            tolerances.set(key, value);
        }
        let chain = Chain {
            names: self.states.into_iter().map(|state| state.name).collect(),
            rows: without_ends(&rows, &end_of),
            start,
            ends,
            end_of,
            components: structure.transient_components(),
            reachable: structure.reachable,
        };
        Ok(Model {
            title: self.title,
            clock_unit: self.clock_unit.unwrap_or_else(|| "step".to_owned()),
            fingerprint: chain.fingerprint(),
            chain,
            groups,
            compare: self.compare.map(|rows| rows.into_iter().map(|(quantity, _)| quantity).collect()),
            tolerances,
            warnings: checked.warnings,
            largest_correction: checked.largest_correction,
            inputs: Vec::new(),
        })
    }

    fn check_names(&mut self) {
        let mut faults = Vec::new();
        for state in &self.states {
            if let Some(text) = bad_name(&state.name) {
                let place = self.place(state.file, state.line);
                let fault = Fault::new(FaultKind::BadName, place, text, "rename it");
                faults.push(fault.about(state.name.clone()));
            }
        }
        let mut taken: HashSet<&str> = self.states.iter().map(|state| state.name.as_str()).collect();
        for list in self.classes.iter().chain(&self.groups) {
            if let Some(text) = bad_name(&list.name) {
                faults.push(Fault::new(FaultKind::BadName, self.place(0, list.line), text, "rename it"));
            }
            if !taken.insert(&list.name) {
                let text = format!("the name `{}` is used twice", list.name);
                let remedy = "states, classes and groups need names of their own; rename one";
                let fault = Fault::new(FaultKind::DuplicateName, self.place(0, list.line), text, remedy);
                faults.push(fault.about(list.name.clone()));
            }
        }
        self.faults.extend(faults);
    }

    /// The moves of each state, in the order in which they are written.
    fn moves_by_state(&mut self) -> Vec<Vec<DraftMove>> {
        let mut by_state: Vec<Vec<DraftMove>> = vec![Vec::new(); self.states.len()];
        for one in std::mem::take(&mut self.moves) {
            by_state[one.from as usize].push(one);
        }
        by_state
    }

    /// The exact rows, and the rows of targets alone, which exist for faulty rows too.
    fn check_rows(&mut self, moves: &[Vec<DraftMove>], checked: &mut Checked) -> (Rows, Rows) {
        let total = moves.iter().map(Vec::len).sum();
        let (mut rows, mut targets) =
            (Rows::with_capacity(moves.len(), total), Rows::with_capacity(moves.len(), total));
        // A state that already has a faulty number is not told off for its sum as well.
        let faulty: HashSet<String> = self.faults.iter().filter_map(|fault| fault.state.clone()).collect();
        for (state, moves) in moves.iter().enumerate() {
            let lone_stay = matches!(moves.as_slice(), [one] if one.to as usize == state && is_one(&one.value));
            if lone_stay && (self.lone_stay_is_absorbing || self.states[state].absorbing.is_some()) {
                self.states[state].absorbing = Some(moves[0].line);
                rows.push(ExactRow::none());
                targets.push(ExactRow::none());
                continue;
            }
            let row = self.check_row(state, moves, faulty.contains(&self.states[state].name), checked);
            match row {
                Some(row) => {
                    targets.push(row.clone());
                    rows.push(row);
                }
                None => {
                    rows.push(ExactRow::none());
                    targets.push(ExactRow::targets_only(moves.iter().map(|one| one.to)));
                }
            }
        }
        (rows, targets)
    }

    fn check_row(
        &mut self,
        state: usize,
        moves: &[DraftMove],
        faulty: bool,
        checked: &mut Checked,
    ) -> Option<ExactRow> {
        let name = self.states[state].name.clone();
        let row_line = self.states[state].row;
        if let Some(line) = self.states[state].absorbing {
            if row_line.is_some() {
                let place = self.place(self.moves_file, row_line.unwrap_or(line));
                let text = format!("`{name}` is declared absorbing but has moves");
                let remedy = "take it from the absorbing states, or take its moves away";
                self.fault(Fault::new(FaultKind::AbsorbingWithMoves, place, text, remedy).about(name));
                return None;
            }
            return Some(ExactRow::none());
        }
        let line = row_line?;
        let place = self.place(self.moves_file, moves.first().map_or(line, |one| one.line));
        let mut clean = self.check_duplicates(&name, moves);
        let rests: Vec<&DraftMove> = moves.iter().filter(|one| one.value == Written::Rest).collect();
        if rests.len() > 1 {
            let text = format!("{} moves of `{name}` are \"rest\"", rests.len());
            let fault =
                Fault::new(FaultKind::Rest, place.clone(), text, "only one move of a state can be what is left");
            self.fault(fault.about(name.clone()).valued("rest"));
            clean = false;
        }
        if faulty || !clean {
            return None;
        }
        let numbers: Vec<(u32, Number)> = moves
            .iter()
            .filter_map(|one| match &one.value {
                Written::Number(number) => Some((one.to, number.clone())),
                Written::Rest => None,
            })
            .collect();
        match ExactRow::normalise(&numbers, Some(state as u32), rests.first().map(|one| one.to)) {
            RowOutcome::Exact(row) => Some(row),
            RowOutcome::Corrected { row, sum } => {
                let sum = sum.to_f64().value();
                checked.correct(&place, &name, sum);
                Some(row)
            }
            RowOutcome::WrongSum { sum } => {
                let sum = sum.to_f64().value();
                let text = format!("the moves of `{name}` sum to {sum}, not 1");
                let remedy = "correct one, or give one of them as \"rest\"";
                let fault = Fault::new(FaultKind::RowSum, place, text, remedy);
                self.fault(fault.about(name).valued(sum.to_string()));
                None
            }
            RowOutcome::NothingLeft { sum } => {
                let sum = sum.to_f64().value();
                let text = format!("the moves of `{name}` already sum to {sum}, so nothing is left for \"rest\"");
                let fault = Fault::new(FaultKind::Rest, place, text, "make the others smaller");
                self.fault(fault.about(name).valued(sum.to_string()));
                None
            }
        }
    }

    fn check_duplicates(&mut self, name: &str, moves: &[DraftMove]) -> bool {
        let mut seen: HashMap<u32, u64> = HashMap::with_capacity(moves.len());
        let mut clean = true;
        for one in moves {
            if let Some(first) = seen.insert(one.to, one.line) {
                let to = self.states[one.to as usize].name.clone();
                let before = if first > 0 { format!(" (first on line {first})") } else { String::new() };
                let text = format!("the move from `{name}` to `{to}` is listed twice{before}");
                let place = self.place(self.moves_file, one.line);
                let remedy = "join the two into one";
                self.fault(Fault::new(FaultKind::DuplicateMove, place, text, remedy).about(name).valued(to));
                clean = false;
            }
        }
        clean
    }

    fn check_states_are_known(&mut self) {
        let known = |state: &super::draft::DraftState| state.row.is_some() || state.absorbing.is_some();
        let names: Vec<&str> =
            self.states.iter().filter(|state| known(state)).map(|state| state.name.as_str()).collect();
        let faults: Vec<Fault> = self
            .states
            .iter()
            .filter(|state| !known(state))
            .map(|state| {
                let otherwise = "give it moves, or declare it absorbing";
                let remedy = did_you_mean(&state.name, names.iter().copied(), otherwise);
                let text = format!("the state `{}` has no moves and is not declared absorbing", state.name);
                let place = self.place(state.file, state.line);
                Fault::new(FaultKind::UnknownState, place, text, remedy).about(state.name.clone())
            })
            .collect();
        if self.moves_are_missing() {
            let place = self.place(0, 0);
            let remedy = "add a [moves] table, or name a file with moves_file";
            self.fault(Fault::new(FaultKind::NoMoves, place, "the model has no moves", remedy));
        }
        self.faults.extend(faults);
    }

    fn moves_are_missing(&self) -> bool {
        self.faults.is_empty() && self.states.iter().all(|state| state.row.is_none())
    }

    fn check_start(&mut self, checked: &mut Checked) -> Rows {
        let mut start = Rows::with_capacity(1, self.starts.len());
        let place = self.place(0, self.starts.first().map_or(0, |(_, _, line)| *line));
        if self.starts.is_empty() {
            if !self.faults.iter().any(|fault| fault.state.as_deref() == Some("start")) {
                let remedy = "say where replications begin: start = \"STATE\" in the model, or --start STATE";
                let place = self.place(0, 0);
                self.fault(Fault::new(FaultKind::MissingStart, place, "the model has no start", remedy));
            }
            start.push(ExactRow::none());
            return start;
        }
        let mut seen = HashSet::new();
        for (state, _, line) in self.starts.clone() {
            if !seen.insert(state) {
                let name = self.states[state as usize].name.clone();
                let text = format!("`{name}` is listed twice in the start");
                let place = self.place(0, line);
                let fault = Fault::new(FaultKind::DuplicateMove, place, text, "join the two into one");
                self.fault(fault.about(name));
            }
        }
        let numbers: Vec<(u32, Number)> = self
            .starts
            .iter()
            .filter_map(|(state, value, _)| match value {
                Written::Number(number) => Some((*state, number.clone())),
                Written::Rest => None,
            })
            .collect();
        let rests: Vec<u32> =
            self.starts.iter().filter(|(_, value, _)| *value == Written::Rest).map(|(state, ..)| *state).collect();
        let wrong = |kind, text: String, remedy: &str| Fault::new(kind, place.clone(), text, remedy).about("start");
        if rests.len() > 1 {
            self.fault(wrong(FaultKind::Rest, format!("{} shares of the start are \"rest\"", rests.len()), "keep one"));
        }
        let row = match ExactRow::normalise(&numbers, None, rests.first().copied()) {
            RowOutcome::Exact(row) => row,
            RowOutcome::Corrected { row, sum } => {
                checked.correct(&place, "start", sum.to_f64().value());
                row
            }
            RowOutcome::WrongSum { sum } | RowOutcome::NothingLeft { sum } => {
                let sum = sum.to_f64().value();
                let text = format!("the shares of the start sum to {sum}, not 1");
                let fault = wrong(FaultKind::RowSum, text, "correct one, or give one of them as \"rest\"");
                self.fault(fault.valued(sum.to_string()));
                ExactRow::targets_only(self.starts.iter().map(|(state, ..)| *state))
            }
        };
        start.push(row);
        start
    }

    /// The ends: absorbing states as declared, then closed classes in the order of their first state.
    fn check_ends(&mut self, structure: &Structure, checked: &mut Checked) -> Vec<End> {
        let mut ends = Vec::new();
        let mut undeclared = Vec::new();
        let mut claimed: HashSet<usize> = HashSet::new();
        let mut classes: Vec<Vec<usize>> = structure.closed_classes();
        let declared = std::mem::take(&mut self.classes);
        for list in &declared {
            if let Some(at) = self.find_class(list, &classes) {
                claimed.insert(at);
                ends.push((classes[at][0], End { name: list.name.clone(), states: classes[at].clone() }));
            }
        }
        for (at, states) in classes.drain(..).enumerate() {
            if claimed.contains(&at) {
                continue;
            }
            let first = states[0];
            let name = self.states[first].name.clone();
            if self.states[first].absorbing.is_none() && self.states[first].row.is_some() {
                undeclared.push((name.clone(), states.len()));
            }
            ends.push((first, End { name, states }));
        }
        if !undeclared.is_empty() {
            let listed =
                list(undeclared.iter().map(|(name, size)| format!("`{name}` ({size} state{})", plural(*size))));
            checked.warn(
                WarningKind::UndeclaredClosedClass,
                format!("closed classes that the model does not declare are ends too, named after their first state: {listed}"),
            );
        }
        ends.sort_by_key(|(first, _)| *first);
        ends.into_iter().map(|(_, end)| end).collect()
    }

    fn find_class(&mut self, declared: &NamedList, classes: &[Vec<usize>]) -> Option<usize> {
        let place = self.place(0, declared.line);
        let mut members = Vec::new();
        let mut clean = true;
        for member in &declared.members {
            if let Some(state) = self.known_state(member) {
                members.push(state as usize);
            } else {
                let names: Vec<&str> = self.states.iter().map(|state| state.name.as_str()).collect();
                let remedy = did_you_mean(member, names, "name a state of the model");
                let text = format!("the class `{}` lists `{member}`, which is no state", declared.name);
                let fault = Fault::new(FaultKind::UnknownState, place.clone(), text, remedy);
                self.fault(fault.about(member.clone()));
                clean = false;
            }
        }
        if !clean {
            return None;
        }
        members.sort_unstable();
        members.dedup();
        let found = classes.iter().position(|class| *class == members);
        if found.is_none() {
            let text = format!("the states of `{}` are not a closed class of the chain", declared.name);
            let remedy = "list exactly the states that reach one another and are never left together";
            self.fault(Fault::new(FaultKind::NotAClosedClass, place, text, remedy).about(declared.name.clone()));
        }
        found
    }

    fn check_groups(&mut self, ends: &[End]) -> Vec<Group> {
        let mut groups = Vec::new();
        for list in std::mem::take(&mut self.groups) {
            let place = self.place(0, list.line);
            let mut members = Vec::new();
            for member in &list.members {
                if let Some(end) = ends.iter().position(|end| end.name == *member) {
                    members.push(end);
                    continue;
                }
                let names = ends.iter().map(|end| end.name.as_str());
                let remedy = did_you_mean(member, names, "a group lists ends: absorbing states or closed classes");
                let text = format!("the group `{}` lists `{member}`, which is no end", list.name);
                let fault = Fault::new(FaultKind::UnknownName, place.clone(), text, remedy);
                self.fault(fault.about(member.clone()));
            }
            members.sort_unstable();
            members.dedup();
            groups.push(Group { name: list.name, ends: members });
        }
        groups
    }

    /// The rows to compare and the tolerances must speak of ends and groups that exist.
    fn check_quantities(&mut self, ends: &[End], groups: &[Group]) {
        let mut asked: Vec<(Quantity, u64)> = self.compare.clone().unwrap_or_default();
        for (key, _, line) in &self.tolerances {
            if let ToleranceKey::One(quantity) = key {
                asked.push((quantity.clone(), *line));
            }
        }
        for (quantity, line) in asked {
            let place = self.place(0, line);
            if let Some((text, remedy)) = unknown_end(&quantity, ends, groups) {
                self.fault(Fault::new(FaultKind::UnknownName, place, text, remedy).valued(quantity.to_string()));
            }
        }
    }

    fn check_something_happens(&mut self, structure: &Structure, ends: &[End], start: &[u32], checked: &mut Checked) {
        if !self.faults.is_empty() {
            return;
        }
        let in_end = |state: u32| ends.iter().find(|end| end.states.contains(&(state as usize)));
        let (inside, outside): (Vec<u32>, Vec<u32>) = start.iter().partition(|state| in_end(**state).is_some());
        if outside.is_empty() && !inside.is_empty() {
            let name = self.states[inside[0] as usize].name.clone();
            let end = in_end(inside[0]).map_or(1, |end| end.states.len());
            let text = format!(
                "the start `{name}` already lies in an end of {end} state{}, so no end is reached",
                plural(end)
            );
            let remedy = "start in a transient state, or declare absorbing states that the start can reach";
            let place = self.place(0, self.starts.first().map_or(0, |(_, _, line)| *line));
            self.fault(Fault::new(FaultKind::NoEndReachable, place, text, remedy).about(name));
            return;
        }
        if !inside.is_empty() {
            let names = list(inside.iter().map(|state| format!("`{}`", self.states[*state as usize].name)));
            checked.warn(WarningKind::AbsorbingStart, format!("replications that start in {names} are over at time 0"));
        }
        let lost = |end: &End| !end.states.iter().any(|state| structure.reachable[*state]);
        let lost_ends: Vec<&End> = ends.iter().filter(|end| lost(end)).collect();
        if !lost_ends.is_empty() {
            let names = list(lost_ends.iter().map(|end| format!("`{}`", end.name)));
            checked.warn(WarningKind::UnreachableEnds, format!("the start cannot reach these ends: {names}"));
        }
        let ends_of_lost: HashSet<usize> = lost_ends.iter().flat_map(|end| end.states.iter().copied()).collect();
        let unreached: Vec<String> = (0..self.states.len())
            .filter(|state| !structure.reachable[*state] && !ends_of_lost.contains(state))
            .map(|state| format!("`{}`", self.states[state].name))
            .collect();
        if !unreached.is_empty() {
            let names = list(unreached.into_iter());
            checked.warn(WarningKind::UnreachableStates, format!("the start cannot reach these states: {names}"));
        }
    }
}

/// Why a quantity means nothing for these ends, and what to write instead.
pub(super) fn unknown_end(quantity: &Quantity, ends: &[End], groups: &[Group]) -> Option<(String, String)> {
    let (Quantity::AbsorptionProbability(of) | Quantity::MeanTimeGiven(of)) = quantity else { return None };
    let names = || ends.iter().map(|end| end.name.as_str()).chain(groups.iter().map(|group| group.name.as_str()));
    if names().any(|name| name == of) {
        return None;
    }
    let remedy = did_you_mean(of, names(), "name an end or a group of the model");
    Some((format!("`{quantity}` speaks of `{of}`, which is no end and no group"), remedy))
}

/// What the check learns besides faults.
#[derive(Debug, Default)]
struct Checked {
    warnings: Vec<Warning>,
    largest_correction: f64,
    corrected: usize,
}

impl Checked {
    fn warn(&mut self, kind: WarningKind, text: String) {
        self.warnings.push(Warning { kind, text });
    }

    fn correct(&mut self, place: &Place, name: &str, sum: f64) {
        let off = (sum - 1.0).abs();
        self.largest_correction = self.largest_correction.max(off);
        self.corrected += 1;
        if self.corrected <= LISTED {
            let text = format!("{place}the moves of `{name}` sum to {sum}; the row was corrected exactly");
            self.warn(WarningKind::CorrectedRow, text);
        } else if let Some(last) = self.warnings.iter_mut().rfind(|warning| warning.kind == WarningKind::CorrectedRow) {
            last.text = format!("{} rows in all did not sum to one exactly and were corrected", self.corrected);
        }
    }
}

fn without_ends(rows: &Rows, end_of: &[u32]) -> Rows {
    let mut kept = Rows::with_capacity(rows.len(), rows.moves());
    for (state, end) in end_of.iter().enumerate() {
        if *end == NO_END { kept.copy_from(rows, state) } else { kept.push(ExactRow::none()) }
    }
    kept
}

fn is_one(value: &Written) -> bool {
    matches!(value, Written::Number(Number::Decimal { mantissa: 1, scale: 0 }))
        || matches!(value, Written::Number(number) if number.to_ratio() == dashu_ratio::RBig::ONE)
}

fn bad_name(name: &str) -> Option<String> {
    if name.trim().is_empty() {
        return Some("a name is empty".to_owned());
    }
    name.chars().any(char::is_control).then(|| format!("the name `{}` holds control characters", name.escape_debug()))
}

fn plural(count: usize) -> &'static str {
    if count == 1 { "" } else { "s" }
}

fn list(names: impl ExactSizeIterator<Item = String>) -> String {
    let total = names.len();
    let shown: Vec<String> = names.take(LISTED).collect();
    let more = if total > LISTED { format!(" and {} more", total - LISTED) } else { String::new() };
    shown.join(", ") + &more
}
