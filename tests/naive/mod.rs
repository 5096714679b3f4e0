//! The truth, the slow way: exact fractions and textbook Gaussian elimination. It shares no code with the library beyond the
//! accessors of the model.

#![allow(dead_code)]

use dashu_ratio::RBig;
use tallystone::model::Chain;

/// Exact answers as fractions.
pub(crate) struct Truth {
    pub(crate) mean: RBig,
    pub(crate) variance: RBig,
    /// Of each end: its probability and the mean of the time there, `E[T; end]`.
    pub(crate) ends: Vec<(RBig, RBig)>,
}

/// Solves a chain.
pub(crate) fn solve(chain: &Chain) -> Truth {
    let transient: Vec<usize> = chain.components().iter().flatten().map(|state| *state as usize).collect();
    let n = transient.len();
    let ends = chain.ends().len();
    let mut place = vec![None; chain.states()];
    transient.iter().enumerate().for_each(|(at, state)| place[*state] = Some(at));
    // I − Q, and beside it R.
    let mut matrix = vec![vec![RBig::ZERO; n]; n];
    let mut exits = vec![vec![RBig::ZERO; ends]; n];
    for (at, state) in transient.iter().enumerate() {
        matrix[at][at] = RBig::ONE;
        let row = chain.row(*state);
        for (i, to) in row.targets.iter().enumerate() {
            match place[*to as usize] {
                Some(column) => matrix[at][column] -= row.probability(i),
                None => exits[at][chain.end_of(*to as usize).unwrap()] += row.probability(i),
            }
        }
    }
    let ones = vec![RBig::ONE; n];
    let times = gauss(&matrix, &ones);
    // E[T²] = N (2 h − 1) for each start.
    let squares: Vec<RBig> = times.iter().map(|h| h.clone() * RBig::from(2) - RBig::ONE).collect();
    let squares = gauss(&matrix, &squares);
    let start = chain.start();
    let mut shares = vec![RBig::ZERO; n];
    let mut at_once = vec![RBig::ZERO; ends];
    for (i, state) in start.targets.iter().enumerate() {
        match place[*state as usize] {
            Some(at) => shares[at] += start.probability(i),
            None => at_once[chain.end_of(*state as usize).unwrap()] += start.probability(i),
        }
    }
    let average = |values: &[RBig]| total(shares.iter().zip(values).map(|(share, value)| share * value));
    let mean = average(&times);
    let variance = average(&squares) - &mean * &mean;
    let ends = (0..ends)
        .map(|end| {
            let column: Vec<RBig> = exits.iter().map(|row| row[end].clone()).collect();
            let reach = gauss(&matrix, &column);
            let times = gauss(&matrix, &reach);
            (average(&reach) + &at_once[end], average(&times))
        })
        .collect();
    Truth { mean, variance, ends }
}

/// The sum of fractions.
pub(crate) fn total(terms: impl Iterator<Item = RBig>) -> RBig {
    terms.fold(RBig::ZERO, |sum, term| sum + term)
}

/// Gaussian elimination.
fn gauss(matrix: &[Vec<RBig>], right: &[RBig]) -> Vec<RBig> {
    let n = right.len();
    let mut a = matrix.to_vec();
    let mut x = right.to_vec();
    for k in 0..n {
        let pivot = (k..n).find(|row| !a[*row][k].is_zero()).expect("I − Q of a checked chain is regular");
        a.swap(k, pivot);
        x.swap(k, pivot);
        let (above, below) = a.split_at_mut(k + 1);
        let pivots = &above[k];
        for (offset, row) in below.iter_mut().enumerate() {
            if row[k].is_zero() {
                continue;
            }
            let factor = &row[k] / &pivots[k];
            for column in k..n {
                let step = &factor * &pivots[column];
                row[column] -= step;
            }
            let step = &factor * &x[k];
            x[k + 1 + offset] -= step;
        }
    }
    for k in (0..n).rev() {
        let known = total((k + 1..n).map(|column| &a[k][column] * &x[column]));
        x[k] = (&x[k] - known) / &a[k][k];
    }
    x
}

/// A chain that also stops at some states, as equations over the states where it goes on.
pub(crate) struct System<'c> {
    chain: &'c Chain,
    states: Vec<usize>,
    place: Vec<Option<usize>>,
    matrix: Vec<Vec<RBig>>,
}

impl<'c> System<'c> {
    pub(crate) fn new(chain: &'c Chain, stops: impl Fn(usize) -> bool) -> Self {
        let reachable = chain.components().iter().flatten().map(|state| *state as usize);
        let states: Vec<usize> = reachable.filter(|state| !stops(*state)).collect();
        let mut place = vec![None; chain.states()];
        states.iter().enumerate().for_each(|(at, state)| place[*state] = Some(at));
        let mut matrix = vec![vec![RBig::ZERO; states.len()]; states.len()];
        for (at, state) in states.iter().enumerate() {
            matrix[at][at] = RBig::ONE;
            let row = chain.row(*state);
            for (i, to) in row.targets.iter().enumerate() {
                if let Some(column) = place[*to as usize] {
                    matrix[at][column] -= row.probability(i);
                }
            }
        }
        Self { chain, states, place, matrix }
    }

    /// Solves `x_i = Σ_j p_ij (a(i, j) + x_j)`, `x` being `stopped(j)` where the chain stops; for every state of the chain.
    pub(crate) fn solve(&self, a: impl Fn(usize, usize) -> RBig, stopped: impl Fn(usize) -> RBig) -> Vec<RBig> {
        let right = |state: &usize| {
            let row = self.chain.row(*state);
            total(row.targets.iter().enumerate().map(|(i, to)| {
                let to = *to as usize;
                let after = if self.place[to].is_none() { stopped(to) } else { RBig::ZERO };
                row.probability(i) * (a(*state, to) + after)
            }))
        };
        let right: Vec<RBig> = self.states.iter().map(right).collect();
        let solved = gauss(&self.matrix, &right);
        (0..self.chain.states())
            .map(|state| self.place[state].map_or_else(|| stopped(state), |at| solved[at].clone()))
            .collect()
    }

    /// The mean over the start of values of the states.
    pub(crate) fn over_start(&self, values: &[RBig]) -> RBig {
        let start = self.chain.start();
        total(start.targets.iter().enumerate().map(|(i, state)| start.probability(i) * &values[*state as usize]))
    }
}
