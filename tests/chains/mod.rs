//! The published chains that several tests use, each built from the rule in its source.

#![allow(dead_code)]

use std::cmp::Ordering;
use std::collections::BTreeMap;

use tallystone::model::{Draft, Model};

/// The walk on `0..=top` that goes up with probability `up` and otherwise down, ends absorbing.
pub(crate) fn walk(up: &str, start: usize, top: usize) -> Model {
    let mut draft = Draft::new("walk");
    let name = |position: usize| position.to_string();
    draft.absorbing(&name(0));
    for position in 1..top {
        draft.moves(&name(position), &name(position + 1), up);
        draft.moves(&name(position), &name(position - 1), "rest");
    }
    draft.absorbing(&name(top));
    draft.start(&name(start));
    draft.check().unwrap()
}

/// Grinstead & Snell 11.2: jump to a uniformly chosen larger integer of 1..=top, from `start`.
pub(crate) fn jump_up(top: usize, start: usize) -> Model {
    let mut draft = Draft::new("jump up");
    for at in 1..top {
        (at + 1..=top).for_each(|to| draft.moves(&at.to_string(), &to.to_string(), &format!("1/{}", top - at)));
    }
    draft.absorbing(&top.to_string());
    draft.start(&start.to_string());
    draft.check().unwrap()
}

/// Althoen, King & Schilling, Math. Gazette 77 (1993) 71–76: the race of 100 squares with a die; a throw beyond the last
/// square is not moved.
pub(crate) fn race_board() -> Model {
    let jumps: BTreeMap<usize, usize> = [
        (1, 38),
        (4, 14),
        (9, 31),
        (21, 42),
        (28, 84),
        (36, 44),
        (51, 67),
        (71, 91),
        (80, 100),
        (16, 6),
        (47, 26),
        (49, 11),
        (56, 53),
        (62, 19),
        (64, 60),
        (87, 24),
        (93, 73),
        (95, 75),
        (98, 78),
    ]
    .into();
    let mut draft = Draft::new("race board");
    for at in (0..100).filter(|at| !jumps.contains_key(at)) {
        let mut sixths: BTreeMap<usize, u32> = BTreeMap::new();
        for die in 1..=6 {
            let to = if at + die > 100 { at } else { at + die };
            *sixths.entry(*jumps.get(&to).unwrap_or(&to)).or_default() += 1;
        }
        sixths.iter().for_each(|(to, sixth)| draft.moves(&at.to_string(), &to.to_string(), &format!("{sixth}/6")));
    }
    draft.absorbing("100");
    draft.start("0");
    draft.check().unwrap()
}

/// Feller I, XIII.7: trials until `length` successes in a row, the success having probability `p`.
pub(crate) fn success_run(p: &str, length: usize) -> Model {
    let mut draft = Draft::new("success run");
    for run in 0..length {
        draft.moves(&run.to_string(), &(run + 1).to_string(), p);
        draft.moves(&run.to_string(), "0", "rest");
    }
    draft.absorbing(&length.to_string());
    draft.start("0");
    draft.check().unwrap()
}

/// Penney, J. Recreational Math. 2 (1969) 241: which of two patterns of three tosses of a fair coin comes first.
pub(crate) fn pattern_race(first: &str, second: &str) -> Model {
    let mut draft = Draft::new("pattern race");
    let mut open = vec![String::from("start")];
    let mut known = open.clone();
    while let Some(state) = open.pop() {
        let tossed = if state == "start" { "" } else { state.as_str() };
        for coin in ["H", "T"] {
            let all = format!("{tossed}{coin}");
            let next = if all.len() > 3 { all[1..].to_owned() } else { all };
            draft.moves(&state, &next, "1/2");
            if next != first && next != second && !known.contains(&next) {
                known.push(next.clone());
                open.push(next);
            }
        }
    }
    draft.absorbing(first);
    draft.absorbing(second);
    draft.start("start");
    draft.check().unwrap()
}

/// Feller I, IX.3: draws until each of `kinds` equally likely kinds has come.
pub(crate) fn collector(kinds: usize) -> Model {
    let mut draft = Draft::new("collector");
    for have in 0..kinds {
        draft.moves(&have.to_string(), &(have + 1).to_string(), &format!("{}/{kinds}", kinds - have));
        if have > 0 {
            draft.moves(&have.to_string(), &have.to_string(), "rest");
        }
    }
    draft.absorbing(&kinds.to_string());
    draft.start("0");
    draft.check().unwrap()
}

/// Ethier, The Doctrine of Chances (Springer 2010) 15: the pass-line bet with two dice.
pub(crate) fn dice_game() -> Model {
    let mut draft = Draft::new("dice game");
    draft.moves("come-out", "win", "8/36");
    draft.moves("come-out", "lose", "4/36");
    for (point, ways) in [(4, 3), (5, 4), (6, 5), (8, 5), (9, 4), (10, 3)] {
        let name = format!("point-{point}");
        draft.moves("come-out", &name, &format!("{ways}/36"));
        draft.moves(&name, "win", &format!("{ways}/36"));
        draft.moves(&name, "lose", "6/36");
        draft.moves(&name, &name, "rest");
    }
    draft.absorbing("win");
    draft.absorbing("lose");
    draft.start("come-out");
    draft.check().unwrap()
}

/// The accounts-receivable chain of management-science textbooks, from one of its two ages.
pub(crate) fn accounts(start: &str) -> Model {
    Model::from_toml(&format!(
        "start = \"{start}\"\nabsorbing = [\"paid\", \"bad\"]\n[moves]\n\
         young = {{ young = 0.3, old = 0.3, paid = 0.4 }}\nold = {{ young = 0.3, old = 0.1, paid = 0.4, bad = 0.2 }}\n"
    ))
    .unwrap()
}

/// The Moran process with relative fitness 1.1: `i` of `n` individuals are mutants, starting with one.
pub(crate) fn moran(n: u32) -> Model {
    let mut draft = Draft::new("fixation");
    draft.absorbing("0");
    for i in 1..n {
        // Up r i (n − i), down i (n − i), over (r i + n − i) n; r = 11/10.
        let (weight, whole) = (i * (n - i), (11 * i + 10 * (n - i)) * n);
        draft.moves(&i.to_string(), &(i + 1).to_string(), &format!("{}/{whole}", 11 * weight));
        draft.moves(&i.to_string(), &(i - 1).to_string(), &format!("{}/{whole}", 10 * weight));
        draft.moves(&i.to_string(), &i.to_string(), "rest");
    }
    draft.absorbing(&n.to_string());
    draft.start("1");
    draft.check().unwrap()
}

/// Haddad & Monmege, RP 2014: `0..=2n`, where stopping at a small change returns 0 for a probability of one half.
pub(crate) fn slow_to_converge(n: usize) -> Model {
    let mut draft = Draft::new("slow to converge");
    draft.absorbing("0");
    for state in 1..2 * n {
        let onwards = match state.cmp(&n) {
            Ordering::Less => [state - 1, n],
            Ordering::Equal => [n - 1, n + 1],
            Ordering::Greater => [state + 1, n],
        };
        onwards.iter().for_each(|to| draft.moves(&state.to_string(), &to.to_string(), "1/2"));
    }
    draft.absorbing(&(2 * n).to_string());
    draft.start(&n.to_string());
    draft.check().unwrap()
}
