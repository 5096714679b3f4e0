//! The checked chain: states, exact moves, ends, and the order in which classes are left.

use std::collections::HashMap;
use std::sync::Arc;

use dashu_ratio::RBig;
use sha2::{Digest, Sha256};

use super::Clock;
use super::classes::{Components, Graph, strongly_connected};
use super::row::{Row, Rows, Weights};
use super::source::hexadecimal;

/// Where a replication finishes: an absorbing state, or a closed class of several states.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct End {
    /// The absorbing state's name, the declared name of the class, or the name of its first state.
    pub name: String,
    /// Its states, in the order of the model.
    pub states: Vec<usize>,
}

/// A finite Markov chain, proven well formed: every row sums to one exactly and every state reaches an end. In continuous time
/// rows are those of the embedded chain, and states have rates besides.
///
/// States are numbered in the order of the model. Rows hold the exact rational probabilities; the states of ends have
/// none, since what happens inside an end is no part of a replication.
#[derive(Debug, Clone)]
pub struct Chain {
    pub(super) names: Vec<Arc<str>>,
    pub(super) rows: Rows,
    pub(super) start: Rows,
    pub(super) ends: Vec<End>,
    /// The end each state belongs to, `NO_END` for transient states.
    pub(super) end_of: Vec<u32>,
    pub(super) components: Vec<Vec<u32>>,
    pub(super) reachable: Vec<bool>,
    pub(super) clock: Clock,
    /// Total rate out of each state, zero for the states of ends; empty when the clock counts steps.
    pub(super) rates: Vec<RBig>,
}

pub(super) const NO_END: u32 = u32::MAX;

impl Chain {
    /// Number of states.
    pub fn states(&self) -> usize {
        self.names.len()
    }

    /// Number of moves with a probability above zero, stays included, out of transient states.
    pub fn moves(&self) -> usize {
        self.rows.moves()
    }

    /// The name of a state.
    ///
    /// # Panics
    /// When there is no such state.
    pub fn name(&self, state: usize) -> &str {
        &self.names[state]
    }

    /// The number of a named state, by a linear search.
    pub fn state(&self, name: &str) -> Option<usize> {
        self.names.iter().position(|known| **known == *name)
    }

    /// What time means.
    pub fn clock(&self) -> Clock {
        self.clock
    }

    /// The exact total rate out of a transient state, per clock unit; `None` when the clock counts steps, and for the states
    /// of ends.
    ///
    /// # Panics
    /// When there is no such state.
    pub fn rate(&self, state: usize) -> Option<&RBig> {
        let rate = || &self.rates[state];
        (self.clock == Clock::Rates && self.end_of(state).is_none()).then(rate)
    }

    /// The moves out of a state with their probabilities, which with a clock in rates are those of where the state is left
    /// for; empty for the states of ends.
    ///
    /// # Panics
    /// When there is no such state.
    pub fn row(&self, state: usize) -> Row<'_> {
        self.rows.row(state)
    }

    /// The start as a row: where replications begin and with which exact probability.
    pub fn start(&self) -> Row<'_> {
        self.start.row(0)
    }

    /// Where replications can finish.
    pub fn ends(&self) -> &[End] {
        &self.ends
    }

    /// The end that a state belongs to; `None` for a transient state.
    ///
    /// # Panics
    /// When there is no such state.
    pub fn end_of(&self, state: usize) -> Option<usize> {
        let end = self.end_of[state];
        (end != NO_END).then_some(end as usize)
    }

    /// The classes of transient states that the start can reach, in topological order: every move between two classes
    /// leads from an earlier to a later one.
    pub fn components(&self) -> &[Vec<u32>] {
        &self.components
    }

    /// Whether the start can reach a state.
    ///
    /// # Panics
    /// When there is no such state.
    pub fn is_reachable(&self, state: usize) -> bool {
        self.reachable[state]
    }

    /// SHA-256 over the chain's meaning: names, exact probabilities in lowest terms, start and ends, in a fixed form.
    /// Two files that say the same chain in the same order have the same fingerprint, however they write it.
    pub fn fingerprint(&self) -> String {
        let mut parts = Parts::default();
        parts.text(&format!("tallystone chain 1, {}", self.clock.name()));
        for name in &self.names {
            parts.text(name);
        }
        let rows = std::iter::once(self.start()).chain((0..self.states()).map(|state| self.row(state)));
        for row in rows {
            parts.text("row");
            match row.weights {
                Weights::Narrow { numerators, denominator } => {
                    parts.written(&[denominator]);
                    row.targets
                        .iter()
                        .zip(numerators)
                        .for_each(|(to, weight)| parts.written(&[u64::from(*to), *weight]));
                }
                Weights::Wide { numerators, denominator } => {
                    parts.text(&denominator.to_string());
                    row.targets.iter().zip(numerators).for_each(|(to, weight)| parts.text(&format!("{to} {weight}")));
                }
            }
        }
        for rate in &self.rates {
            parts.text(&format!("rate {rate}"));
        }
        for end in &self.ends {
            parts.text("end");
            parts.text(&end.name);
            end.states.iter().for_each(|state| parts.written(&[*state as u64]));
        }
        parts.hash()
    }
}

/// Texts to be hashed, each behind its length. They are collected first, since there are tens of millions of short ones.
#[derive(Default)]
struct Parts {
    hash: Sha256,
    open: Vec<u8>,
}

impl Parts {
    /// Bytes that are worth hashing at once.
    const ENOUGH: usize = 1 << 14;

    fn text(&mut self, part: &str) {
        self.open.extend((part.len() as u64).to_le_bytes());
        self.open.extend(part.as_bytes());
        if self.open.len() > Self::ENOUGH {
            self.hash.update(&self.open);
            self.open.clear();
        }
    }

    /// Numbers in decimal digits, with a blank between them.
    fn written(&mut self, numbers: &[u64]) {
        // Digits from the last one on; two numbers of 64 bits have 40 at most.
        let (mut digits, mut at) = ([b' '; 64], 64);
        for number in numbers.iter().rev() {
            at -= usize::from(at < 64);
            let mut left = *number;
            loop {
                at -= 1;
                digits[at] = b'0' + (left % 10) as u8;
                left /= 10;
                if left == 0 {
                    break;
                }
            }
        }
        self.text(std::str::from_utf8(&digits[at..]).unwrap_or_default());
    }

    fn hash(mut self) -> String {
        self.hash.update(&self.open);
        hexadecimal(self.hash)
    }
}

impl Graph for Rows {
    fn nodes(&self) -> usize {
        self.len()
    }
    fn targets(&self, node: usize) -> &[u32] {
        Rows::targets(self, node)
    }
}

/// What the moves alone say of the states.
#[derive(Debug)]
pub(super) struct Structure {
    pub(super) components: Components,
    /// Whether the component has no move to another one.
    pub(super) closed: Vec<bool>,
    pub(super) reachable: Vec<bool>,
}

impl Structure {
    pub(super) fn of(rows: &Rows, start: &[u32]) -> Self {
        let components = strongly_connected(rows);
        let mut closed = vec![true; components.count];
        for state in 0..rows.len() {
            let own = components.of[state];
            if rows.targets(state).iter().any(|to| components.of[*to as usize] != own) {
                closed[own as usize] = false;
            }
        }
        let mut reachable = vec![false; rows.len()];
        let mut open: Vec<u32> = start.to_vec();
        while let Some(state) = open.pop() {
            if !std::mem::replace(&mut reachable[state as usize], true) {
                open.extend(rows.targets(state as usize).iter().filter(|to| !reachable[**to as usize]));
            }
        }
        Self { components, closed, reachable }
    }

    /// States of each closed class, classes in the order of their first state.
    pub(super) fn closed_classes(&self) -> Vec<Vec<usize>> {
        let mut place: HashMap<u32, usize> = HashMap::new();
        let mut classes: Vec<Vec<usize>> = Vec::new();
        for (state, component) in self.components.of.iter().enumerate() {
            if self.closed[*component as usize] {
                let at = *place.entry(*component).or_insert_with(|| {
                    classes.push(Vec::new());
                    classes.len() - 1
                });
                classes[at].push(state);
            }
        }
        classes
    }

    /// Reachable transient classes in topological order.
    pub(super) fn transient_components(&self) -> Vec<Vec<u32>> {
        // Components are numbered against the direction of moves, so descending numbers are a topological order.
        let mut classes: Vec<Vec<u32>> = vec![Vec::new(); self.components.count];
        for (state, component) in self.components.of.iter().enumerate() {
            if self.reachable[state] && !self.closed[*component as usize] {
                classes[*component as usize].push(state as u32);
            }
        }
        classes.into_iter().rev().filter(|class| !class.is_empty()).collect()
    }
}
