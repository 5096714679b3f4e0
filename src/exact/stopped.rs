//! A chain whose paths are followed until they finish, or only until they meet a set of states.

use std::borrow::Cow;

use crate::model::Chain;

const GOES_ON: u32 = u32::MAX;

/// A chain with the places where its paths stop: slots, which are the ends, and beyond them the set that is waited for.
#[derive(Debug)]
pub(super) struct Stopped<'a> {
    chain: &'a Chain,
    slot_of: Vec<u32>,
    slots: usize,
    /// Classes without the states at which paths stop, in topological order.
    classes: Cow<'a, [Vec<u32>]>,
}

impl<'a> Stopped<'a> {
    /// Paths stop in ends alone.
    pub(super) fn in_ends(chain: &'a Chain) -> Self {
        let slot = |state| chain.end_of(state).map_or(GOES_ON, |end| end as u32);
        let slot_of = (0..chain.states()).map(slot).collect();
        Self { chain, slot_of, slots: chain.ends().len(), classes: Cow::Borrowed(chain.components()) }
    }

    /// Paths stop also at the states of a set, ends among them or not: the slot of the set is the last.
    pub(super) fn also_at(chain: &'a Chain, is_awaited: impl Fn(usize) -> bool) -> Self {
        let mut stopped = Self::in_ends(chain);
        for state in (0..chain.states()).filter(|state| is_awaited(*state)) {
            stopped.slot_of[state] = stopped.slots as u32;
        }
        stopped.slots += 1;
        let goes_on = |state: &&u32| stopped.slot_of[**state as usize] == GOES_ON;
        let classes = chain.components().iter().map(|class| class.iter().filter(goes_on).copied().collect());
        stopped.classes = classes.filter(|class: &Vec<u32>| !class.is_empty()).collect();
        stopped
    }

    pub(super) fn chain(&self) -> &'a Chain {
        self.chain
    }

    pub(super) fn classes(&self) -> &[Vec<u32>] {
        &self.classes
    }

    pub(super) fn slots(&self) -> usize {
        self.slots
    }

    /// The slot at which a path stops in a state; `None` where it goes on.
    pub(super) fn slot(&self, state: usize) -> Option<usize> {
        let slot = self.slot_of[state];
        (slot != GOES_ON).then_some(slot as usize)
    }

    /// The slots that paths from some states can stop in, by the moves alone.
    ///
    /// # Complexity
    /// Linear in states and moves.
    pub(super) fn reached(&self, from: &[u32]) -> Vec<bool> {
        let mut reached = vec![false; self.slots];
        let mut seen = vec![false; self.slot_of.len()];
        let mut open = from.to_vec();
        while let Some(state) = open.pop() {
            match self.slot(state as usize) {
                Some(slot) => reached[slot] = true,
                None if !std::mem::replace(&mut seen[state as usize], true) => {
                    open.extend_from_slice(self.chain.row(state as usize).targets);
                }
                None => {}
            }
        }
        reached
    }

    /// What paths from the start gather until they stop in wanted slots, if the moves leave just one amount; `step` is what
    /// a step from one state to another adds.
    ///
    /// # Complexity
    /// Linear in states and moves.
    pub(super) fn only_amount(
        &self,
        is_wanted: impl Fn(usize) -> bool,
        step: impl Fn(usize, usize) -> i64,
    ) -> Option<i128> {
        let leads = self.leads(&is_wanted);
        let mut only: Option<i128> = None;
        let mut gathered: Vec<Option<i128>> = vec![None; self.slot_of.len()];
        let mut open: Vec<(u32, i128)> = self.chain.start().targets.iter().map(|state| (*state, 0)).collect();
        while let Some((state, amount)) = open.pop() {
            let state = state as usize;
            match self.slot(state) {
                Some(slot) if is_wanted(slot) && *only.get_or_insert(amount) != amount => return None,
                None if leads[state] => match gathered[state] {
                    Some(known) if known == amount => {}
                    Some(_) => return None,
                    None => {
                        gathered[state] = Some(amount);
                        let targets = self.chain.row(state).targets.iter();
                        open.extend(targets.map(|to| (*to, amount + i128::from(step(state, *to as usize)))));
                    }
                },
                _ => {}
            }
        }
        only
    }

    /// States from which a path can stop in a wanted slot.
    fn leads(&self, is_wanted: &impl Fn(usize) -> bool) -> Vec<bool> {
        let going_on = || self.classes.iter().flatten().map(|state| *state as usize);
        let mut before: Vec<Vec<u32>> = vec![Vec::new(); self.slot_of.len()];
        for state in going_on() {
            self.chain.row(state).targets.iter().for_each(|to| before[*to as usize].push(state as u32));
        }
        let mut leads = vec![false; self.slot_of.len()];
        let wanted = (0..self.slot_of.len()).filter(|state| self.slot(*state).is_some_and(is_wanted));
        let mut open: Vec<usize> = wanted.collect();
        while let Some(state) = open.pop() {
            for earlier in &before[state] {
                if !std::mem::replace(&mut leads[*earlier as usize], true) {
                    open.push(*earlier as usize);
                }
            }
        }
        leads
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::Model;

    #[test]
    fn the_moves_alone_tell_what_can_be_met_and_what_is_always_gathered() {
        let model = Model::from_toml(
            "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { b = 0.5, c = 0.5 }\nb = { d = 1 }\nc = { d = 1 }\n\
             d = { a = 0.5, x = \"rest\" }\n",
        )
        .unwrap();
        let chain = model.chain();
        let number = |name: &str| chain.state(name).unwrap();
        let at_d = Stopped::also_at(chain, |state| state == number("d"));
        assert_eq!(at_d.slots(), 3);
        assert_eq!(at_d.reached(chain.start().targets), [false, false, true]);
        assert_eq!(at_d.classes().iter().map(Vec::len).sum::<usize>(), 3);
        // d is met after two steps; x after 2, 4, … of them, though always at a time that the cost takes back.
        assert_eq!(at_d.only_amount(|slot| slot == 2, |_, _| 1), Some(2));
        let to_the_end = Stopped::in_ends(chain);
        assert_eq!(to_the_end.reached(chain.start().targets), [true, false]);
        assert_eq!(to_the_end.only_amount(|_| true, |_, _| 1), None);
        let back = |from: usize, to: usize| if (from, to) == (number("d"), number("a")) { -2 } else { 1 };
        assert_eq!(to_the_end.only_amount(|_| true, back), Some(3));
        assert_eq!(to_the_end.only_amount(|slot| slot == 1, back), None);
    }
}
