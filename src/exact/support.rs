//! Which outcomes can happen at all: facts about the moves alone, without any rounding.

use crate::model::{Chain, Clock};

/// Work, in moves, after which the search for the cycle of reachable sets ends.
const WORK_LIMIT: u64 = 100_000_000;
/// Words kept, at most: 64 ends and times each.
const WORDS_LIMIT: usize = 1 << 22;

/// The ends that can be entered at each time. The set of states that can be occupied after `t` steps is a function of the
/// set after `t − 1`, so from some time on the sets repeat in a cycle (of length one when nothing is periodic).
#[derive(Debug, Clone)]
pub(super) struct Support {
    words: usize,
    /// One bit an end, `words` words a time.
    entered: Vec<u64>,
    /// The times before the cycle and its length; `None` when it was not found within the limits.
    cycle: Option<(u64, u64)>,
}

impl Support {
    pub(super) fn of(chain: &Chain) -> Self {
        let words = chain.ends().len().div_ceil(64);
        let mut support = Self { words, entered: Vec::new(), cycle: None };
        let mut occupied: Vec<u32> = Vec::new();
        let mut first = vec![0u64; words];
        for state in chain.start().targets {
            match chain.end_of(*state as usize) {
                Some(end) => first[end / 64] |= 1 << (end % 64),
                None => occupied.push(*state),
            }
        }
        occupied.sort_unstable();
        support.entered.extend(first);
        // Brent's way to find a cycle: keep one earlier set, and replace it at every power of two.
        let (mut kept, mut kept_at) = (occupied.clone(), 0u64);
        let mut seen = vec![u64::MAX; chain.states()];
        let mut work = 0u64;
        let mut time = 0u64;
        while work < WORK_LIMIT && support.entered.len() < WORDS_LIMIT {
            let mut entered = vec![0u64; words];
            let mut next = Vec::new();
            for state in &occupied {
                let row = chain.row(*state as usize);
                work += row.targets.len() as u64 + 1;
                for to in row.targets {
                    match chain.end_of(*to as usize) {
                        Some(end) => entered[end / 64] |= 1 << (end % 64),
                        None if seen[*to as usize] != time => {
                            seen[*to as usize] = time;
                            next.push(*to);
                        }
                        None => {}
                    }
                }
            }
            next.sort_unstable();
            occupied = next;
            time += 1;
            support.entered.extend(entered);
            if occupied == kept {
                // What is entered at time t + 1 follows from the set after t steps.
                support.cycle = Some((kept_at + 1, time - kept_at));
                break;
            }
            if time.is_power_of_two() {
                (kept, kept_at) = (occupied.clone(), time);
            }
            work += occupied.len() as u64;
        }
        support
    }

    /// Whether an end can be entered at a time; `true` when that is not known.
    pub(super) fn is_possible(&self, end: usize, time: u64) -> bool {
        let known = (self.entered.len() / self.words) as u64;
        let time = match self.cycle {
            Some((before, length)) if time >= before + length => before + (time - before) % length,
            _ => time,
        };
        time >= known || self.entered[time as usize * self.words + end / 64] >> (end % 64) & 1 == 1
    }
}

/// The first time at which each end can be entered; `None` for one that the start cannot reach.
///
/// # Complexity
/// Linear in states and moves.
pub(super) fn first_times(chain: &Chain) -> Vec<Option<u64>> {
    let mut firsts = vec![None; chain.ends().len()];
    let mut seen = vec![false; chain.states()];
    let mut now = chain.start().targets.to_vec();
    for time in 0.. {
        let mut next = Vec::new();
        for state in now {
            if let Some(end) = chain.end_of(state as usize) {
                firsts[end].get_or_insert(time);
            } else if !std::mem::replace(&mut seen[state as usize], true) {
                next.extend_from_slice(chain.row(state as usize).targets);
            }
        }
        if next.is_empty() {
            break;
        }
        now = next;
    }
    firsts
}

/// The time by which every replication has finished; `None` when some cycle or stay leaves none.
///
/// # Complexity
/// Linear in states and moves.
pub(super) fn last_time(chain: &Chain) -> Option<u64> {
    // Steps that may follow, over classes from last to first.
    let mut follow = vec![0u64; chain.states()];
    for class in chain.components().iter().rev() {
        let [state] = class[..] else { return None };
        let targets = chain.row(state as usize).targets;
        if targets.contains(&state) {
            return None;
        }
        follow[state as usize] = 1 + targets.iter().map(|to| follow[*to as usize]).max().unwrap_or(0);
    }
    chain.start().targets.iter().map(|state| follow[*state as usize]).max()
}

/// The only time at which the given ends can be entered, if the moves leave just one.
///
/// # Complexity
/// Linear in states and moves.
pub(super) fn only_time(chain: &Chain, ends: &[usize]) -> Option<u64> {
    let mut wanted_ends = vec![false; chain.ends().len()];
    ends.iter().for_each(|end| wanted_ends[*end] = true);
    let wanted = |state: usize| chain.end_of(state).is_some_and(|end| wanted_ends[end]);
    // States that can still reach the ends, classes from last to first; inside a class all or none can.
    let mut leads = vec![false; chain.states()];
    for class in chain.components().iter().rev() {
        let reaches = class.iter().any(|state| {
            chain.row(*state as usize).targets.iter().any(|to| wanted(*to as usize) || leads[*to as usize])
        });
        class.iter().for_each(|state| leads[*state as usize] = reaches);
    }
    let mut only: Option<u64> = None;
    let mut after: Vec<Option<u64>> = vec![None; chain.states()];
    let agrees = |known: &mut Option<u64>, time: u64| *known.get_or_insert(time) == time;
    for state in chain.start().targets {
        let fits = match (wanted(*state as usize), leads[*state as usize]) {
            (true, _) => agrees(&mut only, 0),
            (_, true) => agrees(&mut after[*state as usize], 0),
            _ => true,
        };
        if !fits {
            return None;
        }
    }
    for class in chain.components() {
        for state in class.iter().filter(|state| leads[**state as usize]) {
            let Some(time) = after[*state as usize] else { continue };
            // A cycle gives some state two times, and so does a stay.
            if class.len() > 1 {
                return None;
            }
            for to in chain.row(*state as usize).targets {
                let fits = match (wanted(*to as usize), leads[*to as usize]) {
                    (true, _) => agrees(&mut only, time + 1),
                    (_, true) => agrees(&mut after[*to as usize], time + 1),
                    _ => true,
                };
                if !fits {
                    return None;
                }
            }
        }
    }
    // In continuous time only a start in the ends takes one time.
    only.filter(|time| chain.clock() == Clock::Steps || *time == 0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::Model;

    fn model(text: &str) -> Model {
        Model::from_toml(text).unwrap()
    }

    #[test]
    fn a_walk_on_a_line_enters_each_end_at_times_of_one_parity() {
        // From 2 on 0..5: the lower end at even times from 2 on, the upper one at odd times from 3 on.
        let walk = model(
            "start = \"b\"\nabsorbing = [\"low\", \"high\"]\n[moves]\na = { low = 0.5, b = 0.5 }\nb = { a = 0.5, c = 0.5 }\n\
             c = { b = 0.5, d = 0.5 }\nd = { c = 0.5, high = 0.5 }\n",
        );
        let support = Support::of(walk.chain());
        for time in 0..200 {
            assert_eq!(support.is_possible(0, time), time >= 2 && time % 2 == 0, "low {time}");
            assert_eq!(support.is_possible(1, time), time >= 3 && time % 2 == 1, "high {time}");
        }
        assert!(support.is_possible(0, 1 << 60) && !support.is_possible(0, (1 << 60) + 1));
        assert_eq!(only_time(walk.chain(), &[0]), None);
        assert_eq!((first_times(walk.chain()), last_time(walk.chain())), (vec![Some(2), Some(3)], None));
    }

    #[test]
    fn chains_without_a_choice_of_length_have_one_time() {
        let fixed = model(
            "start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\na = { b = 0.5, c = 0.5 }\nb = { x = 1 }\nc = { x = 0.5, d = 0.5 }\n\
             d = { y = 1 }\n",
        );
        assert_eq!(only_time(fixed.chain(), &[0]), Some(2));
        assert_eq!(only_time(fixed.chain(), &[1]), Some(3));
        assert_eq!(only_time(fixed.chain(), &[0, 1]), None);
        assert_eq!((first_times(fixed.chain()), last_time(fixed.chain())), (vec![Some(2), Some(3)], Some(3)));
        let support = Support::of(fixed.chain());
        assert!(support.is_possible(0, 2) && !support.is_possible(0, 3) && !support.is_possible(1, 1000));
        let stay = model("start = \"a\"\nabsorbing = [\"x\"]\n[moves]\na = { a = 0.5, x = 0.5 }\n");
        assert_eq!(only_time(stay.chain(), &[0]), None);
        assert_eq!((first_times(stay.chain()), last_time(stay.chain())), (vec![Some(1)], None));
    }
}
