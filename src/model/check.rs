//! The check that turns a draft into a model: every fault at once, each with its place.

use std::collections::{HashMap, HashSet};

use dashu_ratio::RBig;

use super::chain::{Chain, NO_END, Structure};
use super::draft::{Draft, DraftMove, DraftState, Written};
use super::fault::{Fault, FaultKind, LISTED, ModelError, Place, Warning, WarningKind, did_you_mean};
use super::number::Number;
use super::row::{ExactRow, LARGEST_CORRECTION, Rest, RowOutcome, Rows};
use super::tolerance::Tolerances;
use super::{Clock, Model};

/// Names that are compared, at most, in search of those that were meant.
const SUGGESTION_WORK: usize = 1_000_000;
/// What a matrix can do about a wrong sum.
const CORRECT: &str = "correct one";
/// A row sum that is off by no more than this may come from rounding.
const ROUNDED: f64 = 0.01;
const CORRECT_ONE: &str = "correct one, or give one of them as \"rest\"";

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
        // Rows that were not read whole would be told for what is missing.
        let rows = if self.moves_unread { Rows::default() } else { self.check_rows(&moves, &mut checked) };
        drop(moves);
        let start = self.check_start(&mut checked);
        if !self.moves_are_there() {
            return Err(self.refused());
        }
        self.check_states_are_known();
        // The structure needs only targets, so names are checked against the ends even when numbers are faulty.
        let structure = Structure::of(&rows, start.targets(0));
        let ends = self.check_ends(&structure, &mut checked);
        let groups = self.check_groups(&ends);
        let mut end_of = vec![NO_END; self.states.len()];
        for (number, end) in ends.iter().enumerate() {
            end.states.iter().for_each(|state| end_of[*state] = number as u32);
        }
        let costs = self.check_costs(&rows, &end_of);
        let hits = self.check_hits(&ends);
        self.check_quantities(&ends, &groups, &costs, &hits, &end_of);
        if self.faults.is_empty() {
            self.check_something_happens(&structure, &ends, &end_of, start.targets(0), &mut checked);
        }
        if !self.faults.is_empty() {
            return Err(self.refused());
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
            clock: self.clock,
            rates: checked.rates,
        };
        let of_groups = groups.iter().map(|group| (group.name.clone(), group.ends.clone()));
        let of_ends = chain.ends.iter().enumerate().map(|(number, end)| (end.name.clone(), vec![number]));
        Ok(Model {
            ends_by_name: of_groups.chain(of_ends).collect(),
            title: self.title,
            clock_unit: self.clock_unit.unwrap_or_else(|| self.clock.default_unit().to_owned()),
            fingerprint: chain.fingerprint(),
            chain,
            groups,
            costs,
            hits,
            compare: self.compare.map(|rows| rows.into_iter().map(|(quantity, _)| quantity).collect()),
            tolerances,
            warnings: checked.warnings,
            largest_correction: checked.largest_correction,
            inputs: Vec::new(),
        })
    }

    fn refused(mut self) -> ModelError {
        self.faults.sort_by_key(|fault| (fault.place.file.clone(), fault.place.line));
        ModelError::Faulty(self.faults)
    }

    fn check_names(&mut self) {
        let mut faults = Vec::new();
        for state in &self.states {
            if let Some(text) = bad_name(&state.name) {
                let place = self.place(state.file, state.line);
                let fault = Fault::new(FaultKind::BadName, place, text, "rename it");
                faults.push(fault.about(&*state.name));
            }
        }
        let mut taken: HashSet<&str> = HashSet::new();
        let others = self.hits.iter().map(|hit| (&hit.name, hit.line));
        let others = others.chain(self.costs.iter().map(|cost| (&cost.name, cost.line)));
        for (name, line) in others {
            if let Some(text) = bad_name(name) {
                faults.push(Fault::new(FaultKind::BadName, self.place(0, line), text, "rename it"));
            }
        }
        for list in self.classes.iter().chain(&self.groups) {
            if let Some(text) = bad_name(&list.name) {
                faults.push(Fault::new(FaultKind::BadName, self.place(0, list.line), text, "rename it"));
            }
            if !taken.insert(&list.name) || self.known_state(&list.name).is_some() {
                let text = format!("the name `{}` is used twice", list.name);
                let remedy = "states, classes and groups need names of their own; rename one";
                let fault = Fault::new(FaultKind::DuplicateName, self.place(0, list.line), text, remedy);
                faults.push(fault.about(list.name.clone()));
            }
        }
        self.faults.extend(faults);
    }

    /// The moves, sorted by the state that they leave; those of one state stay in the order in which they are written.
    fn moves_by_state(&mut self) -> Vec<DraftMove> {
        let mut moves = std::mem::take(&mut self.moves);
        moves.sort_by_key(|one| one.from);
        moves
    }

    /// The exact rows; faulty ones hold at least their targets.
    fn check_rows(&mut self, moves: &[DraftMove], checked: &mut Checked) -> Rows {
        let mut rows = Rows::with_capacity(self.states.len(), moves.len());
        let mut left = moves;
        for state in 0..self.states.len() {
            let (moves, others) = left.split_at(left.iter().take_while(|one| one.from as usize == state).count());
            left = others;
            let lone_stay = matches!(moves, [one] if one.to as usize == state && one.is_certain());
            if lone_stay && (self.lone_stay_is_absorbing || self.states[state].absorbing.is_some()) {
                self.states[state].absorbing = Some(moves[0].line);
                rows.push(ExactRow::none());
                checked.no_rate(self.clock);
                continue;
            }
            let known = checked.rates.len();
            let row = self.check_row(state, moves, checked);
            rows.push(row.unwrap_or_else(|| ExactRow::targets_only(moves.iter().map(|one| one.to))));
            if checked.rates.len() == known {
                checked.no_rate(self.clock);
            }
        }
        self.hint_at_transposition(moves);
        rows
    }

    /// When every column of a matrix sums to one and some row does not, it is most likely written the other way round.
    fn hint_at_transposition(&mut self, moves: &[DraftMove]) {
        let Some(remedy) = self.turn_hint else { return };
        if !self.faults.iter().any(|fault| fault.kind == FaultKind::RowSum) {
            return;
        }
        let mut column_sums = vec![0.0; self.states.len()];
        for one in moves {
            if let Some(Written::Number(number)) = &one.value {
                column_sums[one.to as usize] += number.to_f64();
            }
        }
        if column_sums.iter().all(|sum| (sum - 1.0).abs() <= LARGEST_CORRECTION) {
            let said = "every column sums to 1, but not every row: the table seems to be meant the other way round";
            let place = self.place(self.moves_file, 0);
            // First, since it explains the others.
            self.faults.insert(0, Fault::new(FaultKind::RowSum, place, said, remedy));
        }
    }

    fn check_row(&mut self, state: usize, moves: &[DraftMove], checked: &mut Checked) -> Option<ExactRow> {
        let DraftState { name, row, absorbing, faulty, .. } = self.states[state].clone();
        let place = self.place(self.moves_file, moves.first().map_or(row.unwrap_or(0), |one| one.line));
        let fault = |kind, text: String, remedy: &str| Fault::new(kind, place.clone(), text, remedy).about(&*name);
        if absorbing.is_some() {
            if !moves.is_empty() {
                let text = format!("`{name}` is declared absorbing but has moves");
                let remedy = "take it from the absorbing states, or take its moves away";
                self.fault(fault(FaultKind::AbsorbingWithMoves, text, remedy));
                return None;
            }
            return Some(ExactRow::none());
        }
        row?;
        let unique = self.check_duplicates(&name, moves);
        let (numbers, rests) = split(moves.iter().map(|one| (one.to, one.value.as_ref())));
        if rests.len() > 1 {
            let text = format!("{} moves of `{name}` are \"rest\"", rests.len());
            let remedy = "only one move of a state can be what is left";
            self.fault(fault(FaultKind::Rest, text, remedy).valued("rest"));
        }
        if faulty || !unique || rests.len() > 1 {
            return None;
        }
        if moves.is_empty() {
            let remedy = if self.lone_stay_is_absorbing {
                "give it moves; if it is absorbing, declare it so or give it a stay of 1"
            } else {
                "give it moves, or declare it absorbing"
            };
            self.fault(fault(FaultKind::RowSum, format!("the row of `{name}` holds no moves"), remedy));
            return None;
        }
        if self.clock == Clock::Rates {
            return self.check_rates(state, &numbers, &rests, &place, checked);
        }
        let rescale = self.rescale_rows.as_ref();
        match ExactRow::normalise(&numbers, Some(state as u32), rests.first().copied(), rescale) {
            RowOutcome::Exact(row) => Some(row),
            RowOutcome::Corrected { row, sum } => {
                checked.correct(&place, &format!("moves of `{name}`"), sum.to_f64().value());
                Some(row)
            }
            RowOutcome::WrongSum { sum } => {
                let sum = sum.to_f64().value();
                let text = format!("the moves of `{name}` sum to {sum}, not 1");
                let mut remedy = if self.turn_hint.is_some() { CORRECT.to_owned() } else { CORRECT_ONE.to_owned() };
                if (sum - 1.0).abs() <= ROUNDED {
                    remedy.push_str("; if the numbers were rounded, --rescale-rows LIMIT divides rows by their sum");
                }
                self.fault(fault(FaultKind::RowSum, text, &remedy).valued(sum.to_string()));
                None
            }
            RowOutcome::NothingLeft { sum } => {
                let sum = sum.to_f64().value();
                let text = format!("the moves of `{name}` already sum to {sum}, so nothing is left for \"rest\"");
                self.fault(fault(FaultKind::Rest, text, "make the others smaller").valued(sum.to_string()));
                None
            }
        }
    }

    fn check_rates(
        &mut self,
        state: usize,
        numbers: &[(u32, Number)],
        rests: &[Rest],
        place: &Place,
        checked: &mut Checked,
    ) -> Option<ExactRow> {
        let name = self.states[state].name.clone();
        let is_stay = |(to, number): &(u32, Number)| *to as usize == state && !number.is_zero();
        let fault = if !rests.is_empty() {
            let text = format!("a rate among the moves of `{name}` is \"rest\"");
            let remedy = "rates need not sum to anything; give the rate itself";
            Fault::new(FaultKind::Rest, place.clone(), text, remedy).valued("rest")
        } else if numbers.iter().any(is_stay) {
            let text = format!("`{name}` has a rate to itself, which means nothing in continuous time");
            Fault::new(FaultKind::Unsupported, place.clone(), text, "take it out")
        } else {
            match ExactRow::of_rates(numbers) {
                Some((row, rate)) => {
                    checked.rates.push(rate);
                    return Some(row);
                }
                None => {
                    let text = format!("every rate out of `{name}` is zero");
                    Fault::new(FaultKind::RowSum, place.clone(), text, "give it rates, or declare it absorbing")
                }
            }
        };
        self.fault(fault.about(&*name));
        None
    }

    fn check_duplicates(&mut self, name: &str, moves: &[DraftMove]) -> bool {
        let mut targets: Vec<u32> = moves.iter().map(|one| one.to).collect();
        targets.sort_unstable();
        if targets.windows(2).all(|pair| pair[0] != pair[1]) {
            return true;
        }
        let mut seen: HashMap<u32, u64> = HashMap::with_capacity(moves.len());
        for one in moves {
            if let Some(first) = seen.insert(one.to, one.line) {
                let to = self.states[one.to as usize].name.clone();
                let before = if first > 0 { format!(" (first on line {first})") } else { String::new() };
                let text = format!("the move from `{name}` to `{to}` is listed twice{before}");
                let place = self.place(self.moves_file, one.line);
                let remedy = "join the two into one";
                self.fault(Fault::new(FaultKind::DuplicateMove, place, text, remedy).about(name).valued(&*to));
            }
        }
        false
    }

    /// Whether there are moves to speak of. Without them every other fault would follow from that one.
    fn moves_are_there(&mut self) -> bool {
        if self.moves_unread || self.states.iter().any(|state| state.row.is_some()) {
            return !self.moves_unread;
        }
        // A misspelt key explains it already.
        if !self.faults.iter().any(|fault| fault.kind == FaultKind::UnknownKey) {
            let remedy = "list them below [moves], or in a table below its header";
            let fault = Fault::new(FaultKind::NoMoves, self.place(0, 0), "the model has no moves", remedy);
            self.fault(fault);
        }
        false
    }

    fn check_states_are_known(&mut self) {
        let known = |state: &DraftState| state.row.is_some() || state.absorbing.is_some();
        let unknown = |state: &&DraftState| !known(state) && bad_name(&state.name).is_none();
        let names: Vec<&str> = self.states.iter().filter(|state| known(state)).map(|state| &*state.name).collect();
        let suggested = SUGGESTION_WORK / names.len().max(1);
        let faults: Vec<Fault> = self
            .states
            .iter()
            .filter(unknown)
            .enumerate()
            .map(|(number, state)| {
                let otherwise = "give it moves, or declare it absorbing";
                let names = if number < suggested { names.as_slice() } else { &[] };
                let remedy = did_you_mean(&state.name, names.iter().copied(), otherwise);
                let text = format!("the state `{}` has no moves and is not declared absorbing", state.name);
                let place = self.place(state.file, state.line);
                Fault::new(FaultKind::UnknownState, place, text, remedy).about(&*state.name)
            })
            .collect();
        self.faults.extend(faults);
    }

    fn check_start(&mut self, checked: &mut Checked) -> Rows {
        let starts = std::mem::take(&mut self.starts);
        let place = self.place(0, starts.first().map_or(0, |(_, _, line)| *line));
        let fault = |kind, text: String, remedy: &str| Fault::new(kind, place.clone(), text, remedy).about("start");
        if starts.is_empty() && !self.start_faulty {
            let remedy = "say where replications begin: start = \"STATE\" in the model, or --start STATE";
            self.fault(fault(FaultKind::MissingStart, "the model has no start".to_owned(), remedy));
            self.start_faulty = true;
        }
        let mut seen = HashSet::new();
        for (state, _, line) in &starts {
            if !seen.insert(*state) {
                let name = self.states[*state as usize].name.clone();
                let text = format!("`{name}` is listed twice in the start");
                let place = self.place(0, *line);
                self.fault(Fault::new(FaultKind::DuplicateMove, place, text, "join the two into one").about(&*name));
                self.start_faulty = true;
            }
        }
        let (numbers, rests) = split(starts.iter().map(|(state, value, _)| (*state, Some(value))));
        if rests.len() > 1 {
            let text = format!("{} shares of the start are \"rest\"", rests.len());
            self.fault(fault(FaultKind::Rest, text, "only one can be what is left").valued("rest"));
            self.start_faulty = true;
        }
        let mut row = ExactRow::targets_only(starts.iter().map(|(state, ..)| *state));
        if !self.start_faulty {
            match ExactRow::normalise(&numbers, None, rests.first().copied(), None) {
                RowOutcome::Exact(exact) => row = exact,
                RowOutcome::Corrected { row: exact, sum } => {
                    checked.correct(&place, "shares of the start", sum.to_f64().value());
                    row = exact;
                }
                RowOutcome::WrongSum { sum } | RowOutcome::NothingLeft { sum } => {
                    let sum = sum.to_f64().value();
                    let text = format!("the shares of the start sum to {sum}, not 1");
                    self.fault(fault(FaultKind::RowSum, text, CORRECT_ONE).valued(sum.to_string()));
                }
            }
        }
        self.starts = starts;
        let mut rows = Rows::with_capacity(1, seen.len());
        rows.push(row);
        rows
    }
}

/// The numbers of a row, and where its "rest" goes: all of them, though only one may be there.
fn split<'a>(row: impl Iterator<Item = (u32, Option<&'a Written>)>) -> (Vec<(u32, Number)>, Vec<Rest>) {
    let (mut numbers, mut rests) = (Vec::new(), Vec::new());
    for (place, (to, value)) in row.enumerate() {
        match value {
            Some(Written::Number(number)) => numbers.push((to, number.clone())),
            Some(Written::Rest) => rests.push(Rest { place, to }),
            None => {}
        }
    }
    (numbers, rests)
}

/// What the check learns besides faults.
#[derive(Debug, Default)]
pub(super) struct Checked {
    warnings: Vec<Warning>,
    largest_correction: f64,
    corrected: usize,
    /// One a state when the clock runs in rates.
    rates: Vec<RBig>,
}

impl Checked {
    pub(super) fn warn(&mut self, kind: WarningKind, text: String) {
        self.warnings.push(Warning { kind, text });
    }

    /// A state without moves, or with faulty ones, has no rate.
    fn no_rate(&mut self, clock: Clock) {
        if clock == Clock::Rates {
            self.rates.push(RBig::ZERO);
        }
    }

    fn correct(&mut self, place: &Place, what: &str, sum: f64) {
        let off = (sum - 1.0).abs();
        self.largest_correction = self.largest_correction.max(off);
        self.corrected += 1;
        if self.corrected <= LISTED {
            let text = format!("{place}the {what} sum to {sum}; they were corrected so that they sum to 1 exactly");
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

fn bad_name(name: &str) -> Option<String> {
    if name.trim().is_empty() {
        return Some("a name is empty".to_owned());
    }
    name.chars().any(char::is_control).then(|| format!("the name `{}` holds control characters", name.escape_debug()))
}
