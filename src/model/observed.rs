//! What a replication leaves besides its end and time: costs, and first passages to sets of states.

/// A cost: an amount for every step (in continuous time, every clock unit) spent in a state, and for every move, negative ones included. Nothing accumulates in an
/// end.
///
/// Amounts are kept exactly, as whole numbers over one denominator, so that sums over paths are exact too.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Cost {
    /// Its name.
    pub name: String,
    /// Its unit, if one is given.
    pub unit: Option<String>,
    /// What the amounts are divided by.
    pub denominator: u64,
    /// Amount a step or clock unit of each state that has one, ascending by state.
    pub(super) visits: Vec<(u32, i64)>,
    /// Amount of each move that has one, ascending by its two states.
    pub(super) moves: Vec<((u32, u32), i64)>,
}

impl Cost {
    /// Amount of a step, or of a clock unit in continuous time, spent in a state, times the denominator.
    pub fn of_visit(&self, state: usize) -> i64 {
        let found = self.visits.binary_search_by_key(&state, |(at, _)| *at as usize);
        found.map_or(0, |at| self.visits[at].1)
    }

    /// Amount of a move, times the denominator.
    pub fn of_move(&self, from: usize, to: usize) -> i64 {
        let found = self.moves.binary_search_by_key(&(from, to), |((from, to), _)| (*from as usize, *to as usize));
        found.map_or(0, |at| self.moves[at].1)
    }

    /// The largest amount, in size, of a step or clock unit spent in a state, in the cost's unit.
    pub fn steepest(&self) -> f64 {
        let largest = self.visits.iter().map(|(_, amount)| amount.unsigned_abs()).max().unwrap_or(0);
        largest as f64 / self.denominator as f64
    }

    /// Whether nothing accumulates while a state is held.
    pub fn is_of_moves_alone(&self) -> bool {
        self.visits.iter().all(|(_, amount)| *amount == 0)
    }

    /// Amount of a step that leads from a state to another, the stay included, times the denominator.
    pub fn of_step(&self, from: usize, to: usize) -> i64 {
        // Both are below 2⁶² in size.
        self.of_visit(from) + self.of_move(from, to)
    }
}

/// A set of states of which the first passage matters. A start in the set counts, at time 0.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Hit {
    /// Its name.
    pub name: String,
    /// Its states, ascending. Of a closed class of several states it holds all or none.
    pub states: Vec<usize>,
}

impl Hit {
    /// Whether a state belongs to the set.
    pub fn contains(&self, state: usize) -> bool {
        self.states.binary_search(&state).is_ok()
    }
}
