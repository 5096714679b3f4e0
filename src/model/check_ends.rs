//! The second half of the check: ends, and everything that speaks of them.

use std::collections::HashSet;

use super::chain::{End, NO_END, Structure};
use super::check::Checked;
use super::draft::{Draft, NamedList};
use super::fault::{Fault, FaultKind, WarningKind, did_you_mean, listed};
use super::observed::{Cost, Hit};
use super::quantity::Quantity;
use super::tolerance::ToleranceKey;
use super::{Clock, Group};

impl Draft {
    /// The ends: absorbing states as declared, then closed classes in the order of their first state.
    pub(super) fn check_ends(&mut self, structure: &Structure, checked: &mut Checked) -> Vec<End> {
        let mut ends = Vec::new();
        let mut undeclared = Vec::new();
        let mut claimed: HashSet<usize> = HashSet::new();
        let mut classes: Vec<Vec<usize>> = structure.closed_classes();
        let declared = std::mem::take(&mut self.classes);
        for list in &declared {
            if let Some(at) = self.find_class(list, &classes) {
                claimed.insert(at);
                ends.push((classes[at][0], End { name: list.name.clone(), states: classes[at].clone() }));
            }
        }
        for (at, states) in classes.drain(..).enumerate() {
            if claimed.contains(&at) {
                continue;
            }
            let first = states[0];
            let name = self.states[first].name.to_string();
            if self.states[first].absorbing.is_none() && self.states[first].row.is_some() {
                undeclared.push((name.clone(), states.len()));
            }
            ends.push((first, End { name, states }));
        }
        if !undeclared.is_empty() {
            let listed =
                listed(undeclared.iter().map(|(name, size)| format!("`{name}` ({size} state{})", plural(*size))));
            checked.warn(
                WarningKind::UndeclaredClosedClass,
                format!("closed classes that the model does not declare are ends too, named after their first state: {listed}"),
            );
        }
        ends.sort_by_key(|(first, _)| *first);
        ends.into_iter().map(|(_, end)| end).collect()
    }

    fn find_class(&mut self, declared: &NamedList, classes: &[Vec<usize>]) -> Option<usize> {
        let place = self.place(0, declared.line);
        let mut members = Vec::new();
        let mut clean = true;
        for member in &declared.members {
            if let Some(state) = self.known_state(member) {
                members.push(state as usize);
            } else {
                let names: Vec<&str> = self.states.iter().map(|state| &*state.name).collect();
                let remedy = did_you_mean(member, names, "name a state of the model");
                let text = format!("the class `{}` lists `{member}`, which is no state", declared.name);
                let fault = Fault::new(FaultKind::UnknownState, place.clone(), text, remedy);
                self.fault(fault.about(member.clone()));
                clean = false;
            }
        }
        if !clean {
            return None;
        }
        members.sort_unstable();
        members.dedup();
        let found = classes.iter().position(|class| *class == members);
        if found.is_none() {
            let text = format!("the states of `{}` are not a closed class of the chain", declared.name);
            let remedy = "list exactly the states that reach one another and are never left together";
            self.fault(Fault::new(FaultKind::NotAClosedClass, place, text, remedy).about(declared.name.clone()));
        }
        found
    }

    pub(super) fn check_groups(&mut self, ends: &[End]) -> Vec<Group> {
        let mut groups = Vec::new();
        for list in std::mem::take(&mut self.groups) {
            let place = self.place(0, list.line);
            let mut members = Vec::new();
            for member in &list.members {
                if let Some(end) = ends.iter().position(|end| end.name == *member) {
                    members.push(end);
                    continue;
                }
                let names = ends.iter().map(|end| end.name.as_str());
                let remedy = did_you_mean(member, names, "a group lists ends: absorbing states or closed classes");
                let text = format!("the group `{}` lists `{member}`, which is no end", list.name);
                let fault = Fault::new(FaultKind::UnknownName, place.clone(), text, remedy);
                self.fault(fault.about(member.clone()));
            }
            members.sort_unstable();
            members.dedup();
            groups.push(Group { name: list.name, ends: members });
        }
        groups
    }

    /// The rows to compare and the tolerances must speak of what exists.
    pub(super) fn check_quantities(
        &mut self,
        ends: &[End],
        groups: &[Group],
        costs: &[Cost],
        hits: &[Hit],
        end_of: &[u32],
    ) {
        let mut asked: Vec<(Quantity, u64)> = self.compare.clone().unwrap_or_default();
        for (key, _, line) in &self.tolerances {
            if let ToleranceKey::One(quantity) = key {
                asked.push((quantity.clone(), *line));
            }
        }
        for (quantity, line) in asked {
            let place = self.place(0, line);
            let states = States {
                number: &|name| self.known_state(name).map(|state| state as usize),
                names: &|| self.states.iter().map(|state| &*state.name).collect(),
                end_of,
                clock: self.clock,
            };
            if let Some((text, remedy)) = unknown_name(&quantity, ends, groups, costs, hits, &states) {
                self.fault(Fault::new(FaultKind::UnknownName, place, text, remedy).valued(quantity.to_string()));
            }
        }
    }

    /// The start must not lie in ends altogether; what the start cannot reach deserves a warning.
    pub(super) fn check_something_happens(
        &mut self,
        structure: &Structure,
        ends: &[End],
        end_of: &[u32],
        start: &[u32],
        checked: &mut Checked,
    ) {
        let inside: Vec<u32> = start.iter().copied().filter(|state| end_of[*state as usize] != NO_END).collect();
        if inside.len() == start.len() {
            let first = inside[0] as usize;
            let name = self.states[first].name.clone();
            let size = ends[end_of[first] as usize].states.len();
            let text = format!(
                "the start `{name}` already lies in an end of {size} state{}, so nothing happens",
                plural(size)
            );
            let remedy = "start in a transient state, or declare absorbing states that the start can reach";
            let place = self.place(0, self.starts.first().map_or(0, |(_, _, line)| *line));
            self.fault(Fault::new(FaultKind::NoEndReachable, place, text, remedy).about(&*name));
            return;
        }
        if !inside.is_empty() {
            let names = listed(inside.iter().map(|state| format!("`{}`", self.states[*state as usize].name)));
            checked.warn(WarningKind::AbsorbingStart, format!("replications that start in {names} are over at time 0"));
        }
        let lost = |end: &End| !end.states.iter().any(|state| structure.reachable[*state]);
        let lost_ends: Vec<&End> = ends.iter().filter(|end| lost(end)).collect();
        if !lost_ends.is_empty() {
            let names = listed(lost_ends.iter().map(|end| format!("`{}`", end.name)));
            checked.warn(WarningKind::UnreachableEnds, format!("the start cannot reach these ends: {names}"));
        }
        let ends_of_lost: HashSet<usize> = lost_ends.iter().flat_map(|end| end.states.iter().copied()).collect();
        let unreached: Vec<String> = (0..self.states.len())
            .filter(|state| !structure.reachable[*state] && !ends_of_lost.contains(state))
            .map(|state| format!("`{}`", self.states[state].name))
            .collect();
        if !unreached.is_empty() {
            let names = listed(unreached.into_iter());
            checked.warn(WarningKind::UnreachableStates, format!("the start cannot reach these states: {names}"));
        }
    }
}

/// The states of a model, checked or not yet.
pub(super) struct States<'a> {
    pub(super) number: &'a dyn Fn(&str) -> Option<usize>,
    pub(super) names: &'a dyn Fn() -> Vec<&'a str>,
    pub(super) end_of: &'a [u32],
    pub(super) clock: Clock,
}

/// Why a quantity means nothing for this model, and what to write instead.
pub(super) fn unknown_name(
    quantity: &Quantity,
    ends: &[End],
    groups: &[Group],
    costs: &[Cost],
    hits: &[Hit],
    states: &States<'_>,
) -> Option<(String, String)> {
    let (of, known, what, remedy): (_, Vec<&str>, _, _) = match quantity {
        Quantity::AbsorptionProbability(of) | Quantity::MeanTimeGiven(of) => {
            let names = ends.iter().map(|end| &*end.name).chain(groups.iter().map(|group| &*group.name));
            (of, names.collect(), "no end and no group", "name an end or a group of the model")
        }
        Quantity::MeanCost(of) | Quantity::VarianceCost(of) | Quantity::CovarianceTimeCost(of) => {
            (of, costs.iter().map(|cost| &*cost.name).collect(), "no cost", "name a cost below [costs] in the model")
        }
        Quantity::HitProbability(of) | Quantity::MeanTimeGivenHit(of) => {
            (of, hits.iter().map(|hit| &*hit.name).collect(), "no hit", "name a hit below [hits] in the model")
        }
        Quantity::MeanVisits(of) | Quantity::VarianceVisits(of) | Quantity::VisitProbability(of) => {
            match (states.number)(of) {
                Some(state) if states.end_of[state] == NO_END => return None,
                Some(_) => {
                    let text = format!("`{quantity}` speaks of `{of}`, where replications finish");
                    return Some((text, "ask for the absorption_probability of the end".to_owned()));
                }
                None => (of, (states.names)(), "no state", "name a state of the model"),
            }
        }
        Quantity::SurvivalProbability(time) if states.clock == Clock::Steps && !is_a_count(*time) => {
            let text = format!("`{quantity}` speaks of a time of {time}, but the clock counts steps");
            return Some((text, "give a whole number of steps".to_owned()));
        }
        _ => return None,
    };
    if known.contains(&of.as_str()) {
        return None;
    }
    Some((format!("`{quantity}` speaks of `{of}`, which is {what}"), did_you_mean(of, known, remedy)))
}

/// Whether a number is whole and small enough for a double to tell it from its neighbours.
fn is_a_count(time: f64) -> bool {
    time.fract() == 0.0 && time < 2f64.powi(53)
}

fn plural(count: usize) -> &'static str {
    if count == 1 { "" } else { "s" }
}
