//! The tables `[hits.NAME]` and `[costs.NAME]` of a model file.

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::draft::{DraftCost, NamedList};
use super::fault::{Fault, FaultKind, did_you_mean};
use super::number::Number;
use super::toml_file::{Reader, is_empty_list};

type Value<'a> = Spanned<DeValue<'a>>;

impl Reader<'_> {
    pub(super) fn hits(&mut self, hits: &Value<'_>) {
        let remedy = "write [hits.NAME] with states = [\"STATE\", …]";
        let Some(table) = self.table(hits, "hits", remedy) else { return };
        for (name, hit) in table {
            let line = self.line(&name.span());
            let name = name.get_ref().as_ref();
            let Some(hit) = self.table(hit, name, remedy) else { continue };
            self.known_keys(hit, &["states"], name);
            let states = hit.iter().find(|(key, _)| key.get_ref() == "states").map(|(_, states)| states);
            let Some(states) = states.filter(|states| !is_empty_list(states)) else {
                let said = format!("the hit `{name}` lists no states");
                self.draft.fault(Fault::new(FaultKind::Shape, self.draft.place(0, line), said, remedy).about(name));
                continue;
            };
            let members = self.names(states, "states").into_iter().map(|(member, _)| member).collect();
            self.draft.hits.push(NamedList { name: name.to_owned(), members, line });
        }
    }

    pub(super) fn costs(&mut self, costs: &Value<'_>) {
        let remedy = "write [costs.NAME] with visit = { STATE = amount } or move = [{ from = …, to = …, cost = … }]";
        let Some(table) = self.table(costs, "costs", remedy) else { return };
        for (name, body) in table {
            let line = self.line(&name.span());
            let name = name.get_ref().as_ref();
            let Some(body) = self.table(body, name, remedy) else { continue };
            self.known_keys(body, &["unit", "visit", "move"], name);
            let mut cost = DraftCost { name: name.to_owned(), unit: None, visit: Vec::new(), moves: Vec::new(), line };
            for (key, value) in body {
                match key.get_ref().as_ref() {
                    "unit" => cost.unit = self.text(value, "unit"),
                    "visit" => self.visit_amounts(value, &mut cost),
                    "move" => self.move_amounts(value, &mut cost),
                    _ => {}
                }
            }
            self.draft.costs.push(cost);
        }
    }

    fn visit_amounts(&mut self, value: &Value<'_>, cost: &mut DraftCost) {
        let Some(amounts) = self.table(value, "visit", "write visit = { STATE = amount }") else { return };
        for (state, amount) in amounts {
            let line = self.line(&state.span());
            if let Some(amount) = self.amount_of(amount, &cost.name, line) {
                cost.visit.push((state.get_ref().to_string(), amount, line));
            }
        }
    }

    fn move_amounts(&mut self, value: &Value<'_>, cost: &mut DraftCost) {
        let remedy = "write move = [{ from = \"STATE\", to = \"STATE\", cost = amount }]";
        let Some(items) = value.get_ref().as_array() else {
            return self.wrong_type("move", value.get_ref(), &value.span(), remedy);
        };
        for item in items {
            let line = self.line(&item.span());
            let Some(item) = self.table(item, "move", remedy) else { continue };
            self.known_keys(item, &["from", "to", "cost"], "move");
            let mut found = ["from", "to", "cost"].map(|wanted| {
                let field = item.iter().find(|(key, _)| key.get_ref() == wanted);
                if field.is_none() {
                    let said = format!("a move of the cost `{}` has no `{wanted}`", cost.name);
                    self.draft.fault(Fault::new(FaultKind::Shape, self.draft.place(0, line), said, remedy));
                }
                field.map(|(_, value)| value)
            });
            let [Some(from), Some(to), Some(amount)] = std::mem::take(&mut found) else { continue };
            let states = (self.text(from, "from"), self.text(to, "to"));
            let amount = self.amount_of(amount, &cost.name, line);
            if let ((Some(from), Some(to)), Some(amount)) = (states, amount) {
                cost.moves.push((from, to, amount, line));
            }
        }
    }

    fn amount_of(&mut self, amount: &Value<'_>, cost: &str, line: u64) -> Option<Number> {
        let text = self.as_written(amount);
        self.draft.amount(&text, cost, self.draft.place(0, line))
    }

    /// Tells off keys that mean nothing in a table.
    fn known_keys(&mut self, table: &DeTable<'_>, known: &[&str], of: &str) {
        for (key, _) in table {
            let name = key.get_ref().as_ref();
            if !known.contains(&name) {
                let remedy = did_you_mean(name, known.iter().copied(), &format!("the keys are {}", known.join(", ")));
                let said = format!("the key `{name}` means nothing in `{of}`");
                let place = self.place(&key.span());
                self.draft.fault(Fault::new(FaultKind::UnknownKey, place, said, remedy).valued(name));
            }
        }
    }
}
