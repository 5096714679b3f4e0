//! Elimination without subtraction inside one communicating class.
//!
//! The diagonal of `I − Q` is never formed: a pivot is the sum of what leaves the state, so nothing cancels and every
//! answer keeps its relative accuracy however rarely the class is left.
//!
//! # Formula
//! With moves `q_ij` (`i ≠ j`) inside the class and exits `r_i` out of it, state `k` is censored by
//! `s_k = r_k + Σ_{j>k} q_kj`, `f_ik = q_ik / s_k`, `q_ij += f_ik q_kj`, `r_i += f_ik r_k`. Rows are finished one after
//! another and kept only between their first and last entry, so a band costs what a band must.
//!
//! # Accuracy
//! The bound is derived in the documentation of [`crate::exact`].
//!
//! # Reference
//! Grassmann, Taksar & Heyman, Oper. Res. 33 (1985) 1107, doi:10.1287/opre.33.5.1107.

use crate::model::Progress;

use super::dd::{Dd, INPUT, SMALLEST, U2};
use super::kernel::{Kernel, Stretch};

/// Multiply-adds that one class may cost: 2,000 states when every row is full.
pub(super) const WORK_LIMIT: u64 = 2_700_000_000;
/// Numbers of the factor that one class may keep: 1 GB.
pub(super) const ENTRIES_LIMIT: u64 = 1 << 26;

/// The moves of one class in local numbers: for each state the moves inside the class and the sum of those out of it.
#[derive(Debug)]
pub(super) struct Class {
    pub(super) inside: Vec<Vec<(u32, Dd)>>,
    pub(super) exit: Vec<Dd>,
    /// Most moves of one state, for the bound of the exit sums.
    pub(super) widest: usize,
}

/// The factor of one class.
#[derive(Debug)]
pub(super) struct Factor {
    rows: Vec<FactorRow>,
    /// Local position of each elimination step.
    order: Vec<u32>,
    /// Relative error bound of a solution with exact right-hand side.
    pub(super) error: f64,
    /// Longest row, for the bounds of the solves.
    widest: usize,
}

#[derive(Debug)]
struct FactorRow {
    /// Column of the first entry.
    first: usize,
    /// `f` below the diagonal, an unused cell on it, `u` above.
    entries: Stretch,
    /// The pivot.
    leave: Dd,
}

impl FactorRow {
    /// `f` left of the diagonal in row `i`, with its columns.
    fn below(&self, i: usize) -> impl Iterator<Item = (usize, Dd)> + '_ {
        (self.first..i).map(|k| (k, self.entries.get(k - self.first)))
    }

    /// `u` right of it.
    fn above(&self, i: usize) -> impl Iterator<Item = (usize, Dd)> + '_ {
        (i + 1..self.first + self.entries.hi.len()).map(|j| (j, self.entries.get(j - self.first)))
    }
}

/// Why a class could not be eliminated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Refusal {
    /// The predicted cost passes a limit.
    TooLarge(Cost),
    /// Numbers became too small or too large for double-double arithmetic.
    OutOfRange,
    /// The user asked to stop.
    Interrupted,
}

/// What an elimination takes.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub(super) struct Cost {
    /// Multiply-adds.
    pub(super) work: u64,
    /// Numbers kept.
    pub(super) entries: u64,
}

impl Cost {
    pub(super) fn is_too_large(self) -> bool {
        self.work > WORK_LIMIT || self.entries > ENTRIES_LIMIT
    }

    /// That of both together.
    pub(super) fn plus(self, other: Self) -> Self {
        Self { work: self.work.saturating_add(other.work), entries: self.entries.saturating_add(other.entries) }
    }
}

impl Class {
    /// The order as given, its reverse, and both from the outside in, with their predicted costs, the best first.
    fn orders(&self) -> Vec<(Vec<u32>, Cost)> {
        let n = self.inside.len() as u32;
        let inwards = (0..n).map(|i| if i % 2 == 0 { i / 2 } else { n - 1 - i / 2 });
        let mut orders: Vec<(Vec<u32>, Cost)> = [(0..n).collect(), (0..n).rev().collect(), inwards.collect()]
            .into_iter()
            .map(|order: Vec<u32>| {
                let cost = self.cost(&order);
                (order, cost)
            })
            .collect();
        // A stable sort: of equals the order as given comes first.
        orders.sort_by_key(|(_, cost)| (cost.is_too_large(), cost.work));
        orders
    }

    /// What the best order will take.
    pub(super) fn best_cost(&self) -> Cost {
        self.orders()[0].1
    }

    /// What the elimination will take in a given order; counting ends far above the limits.
    fn cost(&self, order: &[u32]) -> Cost {
        let position = inverse(order);
        // Last columns of finished rows that no later row exceeds: the widest row above a column is found by bisection.
        let mut tops: Vec<(usize, usize)> = Vec::new();
        let mut widths: Vec<u64> = vec![0];
        let mut cost = Cost::default();
        for (i, state) in order.iter().enumerate() {
            let columns = self.inside[*state as usize].iter().map(|(to, _)| position[*to as usize] as usize);
            let (first, mut last) = columns.fold((i, i), |(low, high), column| (low.min(column), high.max(column)));
            if first < i {
                let at = tops.partition_point(|(row, _)| *row < first);
                last = last.max(tops.get(at).map_or(i, |(_, last)| *last));
            }
            cost.work += widths[i] - widths[first];
            cost.entries += (last - first) as u64 + 1;
            if cost.work > 64 * WORK_LIMIT {
                return cost;
            }
            widths.push(widths[i] + (last - i) as u64 + 1);
            while tops.last().is_some_and(|(_, earlier)| *earlier <= last) {
                tops.pop();
            }
            tops.push((i, last));
        }
        cost
    }

    /// Eliminates the class.
    ///
    /// # Errors
    /// [`Refusal`] before any work when it would cost too much, when numbers become too small or too large, or when the
    /// user asks to stop.
    ///
    /// # Complexity
    /// At most n³/3 multiply-adds for n states; n·b² for a band of width b.
    pub(super) fn factor(&self, kernel: Kernel, progress: &dyn Progress) -> Result<Factor, Refusal> {
        let mut refused = Refusal::OutOfRange;
        for (at, (order, cost)) in self.orders().into_iter().enumerate() {
            if cost.is_too_large() {
                return Err(if at == 0 { Refusal::TooLarge(cost) } else { refused });
            }
            // Where a line drifts one way, the way out at its start vanishes from the other end but not from this one; where
            // it drifts apart, neither end sees the other, and the middle sees both.
            match self.factor_in(order, kernel, progress) {
                Err(Refusal::OutOfRange) => refused = Refusal::OutOfRange,
                factored => return factored,
            }
        }
        Err(refused)
    }

    fn factor_in(&self, order: Vec<u32>, kernel: Kernel, progress: &dyn Progress) -> Result<Factor, Refusal> {
        let n = self.inside.len();
        let position = inverse(&order);
        let mut done = Finished::default();
        let mut widest = self.widest;
        for start in (0..n).step_by(ROWS_AT_ONCE) {
            if progress.interrupted() {
                return Err(Refusal::Interrupted);
            }
            let batch = start..n.min(start + ROWS_AT_ONCE);
            let mut open: Vec<OpenRow> = batch.map(|i| self.open(order[i], &position)).collect();
            // A finished row is fetched once for the whole batch; each open row still meets them in ascending order.
            let first = open.iter().map(|row| row.first).min().unwrap_or(start);
            for k in first..start {
                open.iter_mut().try_for_each(|row| row.eliminate(k, &done, kernel))?;
            }
            for (i, mut row) in (start..).zip(open) {
                (start..i).try_for_each(|k| row.eliminate(k, &done, kernel))?;
                widest = widest.max(row.entries.hi.len());
                done.finish(i, row)?;
            }
        }
        Ok(Factor { rows: done.rows, order, error: elimination_error(n, widest), widest })
    }

    /// The row of a state before anything is eliminated from it.
    fn open(&self, state: u32, position: &[u32]) -> OpenRow {
        let i = position[state as usize] as usize;
        let moves = &self.inside[state as usize];
        let columns = moves.iter().map(|(to, _)| position[*to as usize] as usize);
        let (first, last) = columns.fold((i, i), |(low, high), column| (low.min(column), high.max(column)));
        let mut entries = Stretch::zeros(last - first + 1);
        for (to, q) in moves {
            entries.set(position[*to as usize] as usize - first, *q);
        }
        OpenRow { first, entries, exit: self.exit[state as usize] }
    }
}

/// Rows that are eliminated at once, so that memory is read once for all of them.
const ROWS_AT_ONCE: usize = 8;

/// A row on its way.
struct OpenRow {
    first: usize,
    entries: Stretch,
    exit: Dd,
}

/// The rows that are finished.
#[derive(Default)]
struct Finished {
    rows: Vec<FactorRow>,
    exits: Vec<Dd>,
    /// The smallest non-zero entry right of the diagonal, so that a vanishing product is seen before it is formed.
    smallest: Vec<f64>,
}

impl OpenRow {
    /// Removes state `k`: what leads there leads on as the finished row says.
    fn eliminate(&mut self, k: usize, done: &Finished, kernel: Kernel) -> Result<(), Refusal> {
        let Some(at) = k.checked_sub(self.first) else { return Ok(()) };
        let q = self.entries.get(at);
        if q.is_zero() {
            return Ok(());
        }
        let above = &done.rows[k];
        let f = q.over(above.leave);
        if f.hi < SMALLEST || f.hi * done.smallest[k] < SMALLEST {
            return Err(Refusal::OutOfRange);
        }
        self.entries.set(at, f);
        self.exit = self.exit.plus(f.times(done.exits[k]));
        let from = k + 1 - above.first;
        let end = above.first + above.entries.hi.len();
        let length = self.entries.hi.len().max(end - self.first);
        self.entries.hi.resize(length, 0.0);
        self.entries.lo.resize(length, 0.0);
        let range = at + 1..end - self.first;
        kernel.add_multiple(
            f,
            (&above.entries.hi[from..], &above.entries.lo[from..]),
            (&mut self.entries.hi[range.clone()], &mut self.entries.lo[range]),
        );
        Ok(())
    }
}

impl Finished {
    /// Takes row `i` once all states before it are eliminated from it.
    fn finish(&mut self, i: usize, row: OpenRow) -> Result<(), Refusal> {
        let OpenRow { first, entries, exit } = row;
        // The cell on the diagonal, which leads back to the state itself, has no part in what leaves.
        let beyond = i - first + 1..entries.hi.len();
        let leave = beyond.clone().fold(exit, |sum, at| sum.plus(entries.get(at)));
        let least = beyond.map(|at| entries.hi[at]).filter(|x| *x > 0.0).fold(f64::INFINITY, f64::min);
        let least = if exit.hi > 0.0 { least.min(exit.hi) } else { least };
        if least < SMALLEST || leave.hi < SMALLEST {
            return Err(Refusal::OutOfRange);
        }
        self.smallest.push(least);
        self.exits.push(exit);
        self.rows.push(FactorRow { first, entries, leave });
        Ok(())
    }
}

/// Relative error of `N`, `B` and `h` after eliminating `n` states whose rows have at most `width` entries.
fn elimination_error(n: usize, width: usize) -> f64 {
    let step = 3.0 * width as f64 + 25.0;
    // Step m leaves m states, and moves every answer by at most 2 m times its own error; the given moves count once more.
    let n = n as f64;
    U2 * (n * (n + 1.0) * step + 2.0 * n * (INPUT + 3.0 * width as f64))
}

impl Factor {
    /// Relative error that a solve adds to those of the factor and of its right-hand side.
    pub(super) fn solve_error(&self) -> f64 {
        U2 * self.rows.len() as f64 * 2.0 * (6.0 * self.widest as f64 + 20.0)
    }

    /// Solves `x = b + Q x` for a right-hand side that is not negative, in place, in local numbers.
    ///
    /// # Errors
    /// [`Refusal::OutOfRange`].
    ///
    /// # Complexity
    /// Two operations an entry of the factor.
    pub(super) fn solve_column(&self, b: &mut [Dd]) -> Result<(), Refusal> {
        let mut x: Vec<Dd> = self.order.iter().map(|state| b[*state as usize]).collect();
        for (i, row) in self.rows.iter().enumerate() {
            for (k, f) in row.below(i) {
                x[i] = x[i].plus(product(f, x[k])?);
            }
        }
        for (i, row) in self.rows.iter().enumerate().rev() {
            for (j, u) in row.above(i) {
                x[i] = x[i].plus(product(u, x[j])?);
            }
            x[i] = x[i].over(row.leave);
        }
        self.give_back(&x, b)
    }

    /// Solves `y = a + y Q` likewise.
    ///
    /// # Errors
    /// [`Refusal::OutOfRange`].
    ///
    /// # Complexity
    /// Two operations an entry of the factor.
    pub(super) fn solve_row(&self, a: &mut [Dd]) -> Result<(), Refusal> {
        let mut y: Vec<Dd> = self.order.iter().map(|state| a[*state as usize]).collect();
        for (i, row) in self.rows.iter().enumerate() {
            y[i] = y[i].over(row.leave);
            for (j, u) in row.above(i) {
                y[j] = y[j].plus(product(u, y[i])?);
            }
        }
        for (i, row) in self.rows.iter().enumerate().rev() {
            for (k, f) in row.below(i) {
                y[k] = y[k].plus(product(f, y[i])?);
            }
        }
        self.give_back(&y, a)
    }

    fn give_back(&self, solution: &[Dd], into: &mut [Dd]) -> Result<(), Refusal> {
        for (state, value) in self.order.iter().zip(solution) {
            if !value.is_in_range() {
                return Err(Refusal::OutOfRange);
            }
            into[*state as usize] = *value;
        }
        Ok(())
    }
}

/// A product of numbers that are not negative, refused when it could lose its low-order part, or is too large.
pub(super) fn product(a: Dd, b: Dd) -> Result<Dd, Refusal> {
    let p = a.times(b);
    let vanishes = p.is_zero() && !a.is_zero() && !b.is_zero();
    if vanishes || !p.is_in_range() { Err(Refusal::OutOfRange) } else { Ok(p) }
}

fn inverse(order: &[u32]) -> Vec<u32> {
    let mut position = vec![0; order.len()];
    order.iter().enumerate().for_each(|(at, state)| position[*state as usize] = at as u32);
    position
}
