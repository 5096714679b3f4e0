//! The third part of the check: costs and hits.

use std::collections::{BTreeMap, HashSet};

use dashu_int::ops::{Gcd, UnsignedAbs};
use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

use super::chain::{End, NO_END};
use super::draft::{Draft, DraftCost, NamedList};
use super::fault::{Fault, FaultKind, Place, did_you_mean};
use super::number::Number;
use super::observed::{Cost, Hit};
use super::row::Rows;

/// Amounts, over their denominator, stay below this, so that two of them can be added and a path of 2⁶⁴ steps summed.
const LARGEST: u64 = 1 << 62;

/// What an amount is given for: a step in a state, or a move.
type Amounts<Key> = BTreeMap<Key, Number>;

impl Draft {
    /// The costs, with amounts over a common denominator.
    pub(super) fn check_costs(&mut self, rows: &Rows, end_of: &[u32]) -> Vec<Cost> {
        let drafts = std::mem::take(&mut self.costs);
        self.check_repeated(drafts.iter().map(|cost| (cost.name.as_str(), cost.line)), "cost");
        drafts.into_iter().filter_map(|cost| self.check_cost(cost, rows, end_of)).collect()
    }

    fn check_cost(&mut self, cost: DraftCost, rows: &Rows, end_of: &[u32]) -> Option<Cost> {
        let mut visits: Amounts<u32> = BTreeMap::new();
        let mut moves: Amounts<(u32, u32)> = BTreeMap::new();
        let name = &cost.name;
        for (state, amount, line) in cost.visit {
            let place = self.place(0, line);
            let Some(at) = self.listed_state(&state, &place, &format!("the cost `{name}`")) else { continue };
            if end_of[at as usize] != NO_END {
                let text = format!("the cost `{name}` is given for a step in `{state}`, but replications finish there");
                let remedy = "give it to the move that leads there";
                self.fault(Fault::new(FaultKind::UnknownState, place, text, remedy).about(state));
            } else if visits.insert(at, amount).is_some() {
                let text = format!("the cost `{name}` of `{state}` is given twice");
                self.fault(Fault::new(FaultKind::DuplicateName, place, text, "keep one").about(state));
            }
        }
        for (from, to, amount, line) in cost.moves {
            let place = self.place(0, line);
            let owner = format!("the cost `{name}`");
            let ends = [&from, &to].map(|state| self.listed_state(state, &place, &owner));
            let [Some(from_state), Some(to_state)] = ends else { continue };
            if !rows.targets(from_state as usize).contains(&to_state) {
                let text =
                    format!("the cost `{name}` is given for a move from `{from}` to `{to}`, which the model lacks");
                let others = rows.targets(from_state as usize).iter().map(|to| &*self.states[*to as usize].name);
                let remedy = did_you_mean(&to, others, "name a move of the model");
                self.fault(Fault::new(FaultKind::UnknownState, place, text, remedy).about(from).valued(to));
            } else if moves.insert((from_state, to_state), amount).is_some() {
                let text = format!("the cost `{name}` of the move from `{from}` to `{to}` is given twice");
                self.fault(Fault::new(FaultKind::DuplicateMove, place, text, "keep one").about(from).valued(to));
            }
        }
        let amounts: Vec<RBig> = visits.values().chain(moves.values()).map(Number::to_ratio).collect();
        let Some((denominator, scaled)) = over_one_denominator(&amounts) else {
            let text = format!("the amounts of the cost `{name}` have no common denominator and sizes below 2^62");
            let remedy = "round them to fewer digits, or choose a larger unit";
            let place = self.place(0, cost.line);
            self.fault(Fault::new(FaultKind::OutOfRange, place, text, remedy).about(cost.name));
            return None;
        };
        let (of_visits, of_moves) = scaled.split_at(visits.len());
        Some(Cost {
            name: cost.name,
            unit: cost.unit,
            denominator,
            visits: visits.into_keys().zip(of_visits.iter().copied()).collect(),
            moves: moves.into_keys().zip(of_moves.iter().copied()).collect(),
        })
    }

    /// The sets of states whose first passage matters.
    pub(super) fn check_hits(&mut self, ends: &[End]) -> Vec<Hit> {
        let drafts = std::mem::take(&mut self.hits);
        self.check_repeated(drafts.iter().map(|hit| (hit.name.as_str(), hit.line)), "hit");
        drafts.into_iter().map(|hit| self.check_hit(hit, ends)).collect()
    }

    fn check_hit(&mut self, hit: NamedList, ends: &[End]) -> Hit {
        let place = self.place(0, hit.line);
        let owner = format!("the hit `{}`", hit.name);
        let listed = hit.members.iter().filter_map(|member| self.listed_state(member, &place, &owner));
        let mut states: Vec<usize> = listed.map(|state| state as usize).collect();
        states.sort_unstable();
        states.dedup();
        let hit = Hit { name: hit.name, states };
        for end in ends {
            let inside = end.states.iter().filter(|state| hit.contains(**state)).count();
            if (1..end.states.len()).contains(&inside) {
                let text =
                    format!("{owner} lists {inside} of the {} states of the end `{}`", end.states.len(), end.name);
                let remedy = "a replication is over when it enters the class; list all of its states or none";
                self.fault(Fault::new(FaultKind::NotAClosedClass, place.clone(), text, remedy).about(hit.name.clone()));
            }
        }
        hit
    }

    fn check_repeated<'a>(&mut self, names: impl Iterator<Item = (&'a str, u64)>, what: &str) {
        let mut seen = HashSet::new();
        for (name, line) in names {
            if !seen.insert(name) {
                let text = format!("the {what} `{name}` is there twice");
                let place = self.place(0, line);
                self.fault(Fault::new(FaultKind::DuplicateName, place, text, "rename one").about(name));
            }
        }
    }

    /// The number of a state that something lists.
    fn listed_state(&mut self, state: &str, place: &Place, owner: &str) -> Option<u32> {
        let known = self.known_state(state);
        if known.is_none() {
            let names: Vec<&str> = self.states.iter().map(|state| &*state.name).collect();
            let remedy = did_you_mean(state, names, "name a state of the model");
            let text = format!("{owner} lists `{state}`, which is no state");
            self.fault(Fault::new(FaultKind::UnknownState, place.clone(), text, remedy).about(state));
        }
        known
    }
}

/// Fractions as whole numbers over their least common denominator; `None` when one of them is too large.
fn over_one_denominator(amounts: &[RBig]) -> Option<(u64, Vec<i64>)> {
    let is_small = |number: &UBig| *number < UBig::from(LARGEST);
    let mut common = UBig::ONE;
    for amount in amounts {
        let denominator = amount.denominator();
        common = &common * (denominator / (&common).gcd(denominator));
        if !is_small(&common) {
            return None;
        }
    }
    let scaled = |amount: &RBig| {
        let number = amount.numerator() * IBig::from(&common / amount.denominator());
        is_small(&(&number).unsigned_abs()).then(|| i64::try_from(number).ok()).flatten()
    };
    let numbers = amounts.iter().map(scaled).collect::<Option<Vec<i64>>>()?;
    Some((u64::try_from(common).ok()?, numbers))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn amounts_meet_over_their_least_common_denominator() {
        let amounts = ["0.25", "-1/6", "3"].map(|text| Number::parse(text).unwrap().to_ratio());
        assert_eq!(over_one_denominator(&amounts), Some((12, vec![3, -2, 36])));
        assert_eq!(over_one_denominator(&[]), Some((1, vec![])));
        for text in ["1e19", "-1e19", "1e-19", "1/9223372036854775783"] {
            assert_eq!(over_one_denominator(&[Number::parse(text).unwrap().to_ratio()]), None, "{text}");
        }
    }
}
