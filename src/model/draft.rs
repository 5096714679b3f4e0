//! A model as somebody wrote it, before anything is checked. Every reader fills one; [`Draft::check`] is the only way
//! from here to a [`Model`](super::Model).

use std::collections::HashMap;
use std::sync::Arc;

use super::Clock;
use super::fault::{Fault, FaultKind, Place, shortened};
use super::number::{Number, NumberFault};
use super::quantity::Quantity;
use super::tolerance::{Tolerance, ToleranceKey};

const IN_RANGE: &str = "probabilities lie between 0 and 1; correct it";
const RATE_IN_RANGE: &str = "rates are finite and not negative; correct it";
const HOW_TO_WRITE_A_RATE: &str = "write a decimal such as 0.25, or a fraction such as \"5/12\"";
const HOW_TO_WRITE: &str = "write a decimal such as 0.25, a fraction such as \"5/12\", or \"rest\"";

/// A probability or a rate as written.
#[derive(Debug, Clone, PartialEq)]
pub enum Written {
    /// A number.
    Number(Number),
    /// What is left to one.
    Rest,
}

/// One move as written; states by their number in the draft.
#[derive(Debug, Clone)]
pub(super) struct DraftMove {
    pub(super) from: u32,
    pub(super) to: u32,
    /// `None` when it could not be read; the move then still tells where the state leads.
    pub(super) value: Option<Written>,
    pub(super) line: u64,
}

impl DraftMove {
    /// Whether its probability is one.
    pub(super) fn is_certain(&self) -> bool {
        matches!(&self.value, Some(Written::Number(number)) if number.is_one())
    }
}

/// What is known of a state before the check.
#[derive(Debug, Clone)]
pub(super) struct DraftState {
    pub(super) name: Arc<str>,
    /// Line of the first mention; 0 when made in code.
    pub(super) line: u64,
    /// The file of the first mention, as an index into the draft's files.
    pub(super) file: usize,
    /// Line of its row of moves, if it has one.
    pub(super) row: Option<u64>,
    /// Line of its declaration as absorbing, if it has one.
    pub(super) absorbing: Option<u64>,
    /// Something is wrong with its moves already, so nothing is said of their sum.
    pub(super) faulty: bool,
}

/// A named list of states or ends: a class or a group.
#[derive(Debug, Clone)]
pub(super) struct NamedList {
    pub(super) name: String,
    pub(super) members: Vec<String>,
    pub(super) line: u64,
}

/// A cost as written: amounts a step in a state, and a move.
#[derive(Debug, Clone)]
pub(super) struct DraftCost {
    pub(super) name: String,
    pub(super) unit: Option<String>,
    pub(super) visit: Vec<(String, Number, u64)>,
    pub(super) moves: Vec<(String, String, Number, u64)>,
    pub(super) line: u64,
}

/// A model as written, built by a reader or in code.
///
/// ```
/// use tallystone::model::Draft;
/// let mut draft = Draft::new("coin until heads");
/// draft.start("tossing");
/// draft.absorbing("heads");
/// draft.moves("tossing", "heads", "1/2");
/// draft.moves("tossing", "tossing", "rest");
/// let model = draft.check()?;
/// assert_eq!(model.chain().states(), 2);
/// # Ok::<(), tallystone::model::ModelError>(())
/// ```
#[derive(Debug, Clone, Default)]
pub struct Draft {
    pub(super) title: String,
    pub(super) clock: Clock,
    pub(super) clock_unit: Option<String>,
    pub(super) files: Vec<Arc<str>>,
    pub(super) states: Vec<DraftState>,
    index: HashMap<Arc<str>, u32>,
    pub(super) starts: Vec<(u32, Written, u64)>,
    /// Something is wrong with the start already, so nothing is said of its sum.
    pub(super) start_faulty: bool,
    /// Absorbing states that a file or an option declares, with their lines, until [`Draft::declare`] numbers them.
    pub(super) declared: Vec<(String, u64)>,
    pub(super) moves: Vec<DraftMove>,
    /// The file that the moves stand in.
    pub(super) moves_file: usize,
    /// The moves could not be read, so nothing is known of states that seem to lack them.
    pub(super) moves_unread: bool,
    /// What to do when every column of the table sums to one and not every row; `None` for what is no matrix.
    pub(super) turn_hint: Option<&'static str>,
    /// Rows whose sum is off by no more than this are divided by it, as an option allows.
    pub(super) rescale_rows: Option<Number>,
    /// A row with only a stay of one is an end without a word, as tables have no other way to say it.
    pub(super) lone_stay_is_absorbing: bool,
    pub(super) classes: Vec<NamedList>,
    pub(super) groups: Vec<NamedList>,
    pub(super) costs: Vec<DraftCost>,
    pub(super) hits: Vec<NamedList>,
    pub(super) compare: Option<Vec<(Quantity, u64)>>,
    pub(super) tolerances: Vec<(ToleranceKey, Tolerance, u64)>,
    pub(super) faults: Vec<Fault>,
}

impl Draft {
    /// An empty draft.
    pub fn new(title: impl Into<String>) -> Self {
        Self { title: title.into(), ..Self::default() }
    }

    /// An empty draft in continuous time: the numbers of its moves are rates.
    pub fn in_rates(title: impl Into<String>) -> Self {
        Self { title: title.into(), clock: Clock::Rates, ..Self::default() }
    }

    /// The unit printed beside every time; `step`, or `unit` in continuous time, where none is given.
    pub fn clock_unit(&mut self, unit: impl Into<String>) {
        self.clock_unit = Some(unit.into());
    }

    /// Starts every replication in one state.
    pub fn start(&mut self, state: &str) {
        self.start_with(state, "1");
    }

    /// Starts a share of the replications in a state; shares are numbers as in a model file, or `rest`.
    pub fn start_with(&mut self, state: &str, share: &str) {
        let number = self.state(state, 0, 0);
        if let Some(share) = self.written(share, None, 0, 0) {
            self.starts.push((number, share, 0));
        }
    }

    /// Declares a state absorbing.
    pub fn absorbing(&mut self, state: &str) {
        let number = self.state(state, 0, 0);
        self.states[number as usize].absorbing = Some(0);
    }

    /// Adds a move; its probability is a number as in a model file, or `rest`, and its rate a number.
    pub fn moves(&mut self, from: &str, to: &str, probability: &str) {
        let (from_number, to_number) = (self.state(from, 0, 0), self.state(to, 0, 0));
        self.states[from_number as usize].row = Some(0);
        let value = self.written(probability, Some(from_number), 0, 0);
        self.moves.push(DraftMove { from: from_number, to: to_number, value, line: 0 });
    }

    /// Reports several ends together under a name.
    pub fn group(&mut self, name: &str, ends: &[&str]) {
        let members = ends.iter().map(|end| (*end).to_owned()).collect();
        self.groups.push(NamedList { name: name.to_owned(), members, line: 0 });
    }

    /// Names a closed class of several states.
    pub fn class(&mut self, name: &str, states: &[&str]) {
        let members = states.iter().map(|state| (*state).to_owned()).collect();
        self.classes.push(NamedList { name: name.to_owned(), members, line: 0 });
    }

    /// Lets a cost accumulate by an amount for every step spent in a state; amounts are numbers as in a model file, and may
    /// be negative.
    pub fn visit_cost(&mut self, cost: &str, state: &str, amount: &str) {
        if let Some(amount) = self.amount(amount, cost, Place::default()) {
            self.cost(cost, 0).visit.push((state.to_owned(), amount, 0));
        }
    }

    /// The same for every move from one state to another.
    pub fn move_cost(&mut self, cost: &str, from: &str, to: &str, amount: &str) {
        if let Some(amount) = self.amount(amount, cost, Place::default()) {
            self.cost(cost, 0).moves.push((from.to_owned(), to.to_owned(), amount, 0));
        }
    }

    /// Asks for the first passage to a set of states.
    pub fn hit(&mut self, name: &str, states: &[&str]) {
        let members = states.iter().map(|state| (*state).to_owned()).collect();
        self.hits.push(NamedList { name: name.to_owned(), members, line: 0 });
    }

    /// The cost of a name, new if there is none.
    fn cost(&mut self, name: &str, line: u64) -> &mut DraftCost {
        let at = self.costs.iter().position(|cost| cost.name == name).unwrap_or_else(|| {
            self.costs.push(DraftCost {
                name: name.to_owned(),
                unit: None,
                visit: Vec::new(),
                moves: Vec::new(),
                line,
            });
            self.costs.len() - 1
        });
        &mut self.costs[at]
    }

    /// Sets a tolerance.
    pub fn tolerance(&mut self, key: ToleranceKey, value: Tolerance) {
        self.tolerances.push((key, value, 0));
    }

    /// Chooses the rows of the comparison instead of the default ones.
    pub fn compare(&mut self, quantities: impl IntoIterator<Item = Quantity>) {
        self.compare = Some(quantities.into_iter().map(|quantity| (quantity, 0)).collect());
    }

    /// Numbers the declared absorbing states. Readers call it between the states that have moves and all other targets, so
    /// that every form of a model numbers its states alike.
    pub(super) fn declare(&mut self) {
        for (name, line) in std::mem::take(&mut self.declared) {
            let state = self.state(&name, 0, line);
            self.states[state as usize].absorbing = Some(line);
        }
    }

    /// Makes room for so many states.
    pub(super) fn expect(&mut self, states: usize) {
        self.states.reserve(states);
        self.index.reserve(states);
    }

    /// The number of a state, given at its first mention.
    pub(super) fn state(&mut self, name: &str, file: usize, line: u64) -> u32 {
        if let Some(number) = self.index.get(name) {
            return *number;
        }
        let number = self.states.len() as u32;
        let name: Arc<str> = Arc::from(name);
        self.index.insert(Arc::clone(&name), number);
        self.states.push(DraftState { name, line, file, row: None, absorbing: None, faulty: false });
        number
    }

    /// Numbers the states anew: first those that have moves, in the given order, then the declared absorbing ones, then all
    /// other targets, as a reader does that knows the states with moves before it looks at targets.
    pub(super) fn renumber(&mut self, leaving: &[u32]) {
        let declared: Vec<String> = self.declared.iter().map(|(name, _)| name.clone()).collect();
        self.declare();
        let declared = declared.iter().filter_map(|name| self.known_state(name));
        let mut number_of = vec![u32::MAX; self.states.len()];
        let mut next = 0;
        for state in leaving.iter().copied().chain(declared).chain(0..self.states.len() as u32) {
            let number = &mut number_of[state as usize];
            if *number == u32::MAX {
                *number = next;
                next += 1;
            }
        }
        if number_of.is_sorted() {
            return;
        }
        let mut states: Vec<(u32, DraftState)> =
            number_of.iter().copied().zip(std::mem::take(&mut self.states)).collect();
        states.sort_unstable_by_key(|(number, _)| *number);
        self.states = states.into_iter().map(|(_, state)| state).collect();
        self.index.values_mut().for_each(|state| *state = number_of[*state as usize]);
        for one in &mut self.moves {
            (one.from, one.to) = (number_of[one.from as usize], number_of[one.to as usize]);
        }
    }

    pub(super) fn known_state(&self, name: &str) -> Option<u32> {
        self.index.get(name).copied()
    }

    pub(super) fn place(&self, file: usize, line: u64) -> Place {
        Place { file: self.files.get(file).cloned(), line: (line > 0).then_some(line) }
    }

    pub(super) fn fault(&mut self, fault: Fault) {
        self.faults.push(fault);
    }

    /// Reads an amount of a cost; what is wrong with it becomes a fault.
    pub(super) fn amount(&mut self, text: &str, cost: &str, place: Place) -> Option<Number> {
        let reason = match Number::parse(text) {
            Ok(number) => return Some(number),
            Err(reason) => reason,
        };
        let kind = if reason == NumberFault::NotFinite { FaultKind::NonFinite } else { FaultKind::NotANumber };
        let said = format!("`{}` among the amounts of the cost `{cost}` {reason}", shortened(text));
        let remedy = "write a decimal such as -0.25, or a fraction such as \"5/12\"";
        self.fault(Fault::new(kind, place, said, remedy).about(cost).valued(shortened(text)));
        None
    }

    /// Reads the probability of a move of a state, or a share of the start; what is wrong with it becomes a fault.
    pub(super) fn written(&mut self, text: &str, state: Option<u32>, file: usize, line: u64) -> Option<Written> {
        let text = text.trim();
        if text == "rest" {
            return Some(Written::Rest);
        }
        // Shares of the start are probabilities whatever the clock.
        let clock = if state.is_some() { self.clock } else { Clock::Steps };
        match probability_or_rate(text, clock, HOW_TO_WRITE) {
            Ok(number) => Some(Written::Number(number)),
            Err(bad) => {
                self.refuse_value(text, bad, state, file, line);
                None
            }
        }
    }

    /// Tells of a value among the moves of a state, or among the shares of the start, that is no probability.
    pub(super) fn refuse_value(&mut self, text: &str, bad: BadValue, state: Option<u32>, file: usize, line: u64) {
        let BadValue { kind, reason, remedy } = bad;
        let place = self.place(file, line);
        let shown = shortened(text);
        let what = if text.is_empty() { "a value".to_owned() } else { format!("`{shown}`") };
        let fault = match state {
            Some(state) => {
                let state = &mut self.states[state as usize];
                state.faulty = true;
                let said = format!("{what} among the moves of `{}` {reason}", state.name);
                Fault::new(kind, place, said, remedy).about(&*state.name)
            }
            None => {
                self.start_faulty = true;
                Fault::new(kind, place, format!("{what} among the shares of the start {reason}"), remedy).about("start")
            }
        };
        self.fault(fault.valued(shown));
    }
}

/// Why a text is no probability.
#[derive(Debug)]
pub(super) struct BadValue {
    pub(super) kind: FaultKind,
    pub(super) reason: String,
    pub(super) remedy: &'static str,
}

/// Reads the probability or the rate of a move; `how_to_write` is the remedy if a probability is no number at all.
pub(super) fn probability_or_rate(text: &str, clock: Clock, how_to_write: &'static str) -> Result<Number, BadValue> {
    match clock {
        Clock::Steps => probability(text, how_to_write),
        Clock::Rates => rate(text),
    }
}

fn probability(text: &str, how_to_write: &'static str) -> Result<Number, BadValue> {
    let (kind, reason, remedy) = match Number::parse(text) {
        _ if text.is_empty() => (FaultKind::NotANumber, "is empty".to_owned(), how_to_write),
        Ok(number) if number.is_negative() => (FaultKind::Negative, "is negative".to_owned(), IN_RANGE),
        Ok(number) if number.exceeds_one() => (FaultKind::AboveOne, "is above 1".to_owned(), IN_RANGE),
        Ok(number) => return Ok(number),
        Err(reason @ NumberFault::NotFinite) => (FaultKind::NonFinite, reason.to_string(), IN_RANGE),
        Err(reason) => (FaultKind::NotANumber, reason.to_string(), how_to_write),
    };
    Err(BadValue { kind, reason, remedy })
}

fn rate(text: &str) -> Result<Number, BadValue> {
    let (kind, reason, remedy) = match Number::parse(text) {
        _ if text.is_empty() => (FaultKind::NotANumber, "is empty".to_owned(), HOW_TO_WRITE_A_RATE),
        Ok(number) if number.is_negative() => (FaultKind::Negative, "is negative".to_owned(), RATE_IN_RANGE),
        Ok(number) => return Ok(number),
        Err(reason @ NumberFault::NotFinite) => (FaultKind::NonFinite, reason.to_string(), RATE_IN_RANGE),
        Err(reason) => (FaultKind::NotANumber, reason.to_string(), HOW_TO_WRITE_A_RATE),
    };
    Err(BadValue { kind, reason, remedy })
}
