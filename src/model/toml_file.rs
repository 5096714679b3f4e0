//! The reader of model files in TOML: our own schema, every key known, every fault with its line.

use std::collections::HashMap;
use std::ops::Range;
use std::path::Path;
use std::sync::Arc;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::Clock;
use super::draft::{Draft, DraftMove, NamedList, Written};
use super::fault::{Fault, FaultKind, ModelError, Place, did_you_mean, shortened};
use super::input::Input;
use super::kind::Kind;
use super::number::Number;
use super::quantity::Quantity;
use super::tolerance::{Tolerance, ToleranceKey};
use super::{InputFile, ReadOptions};

const KEYS: [&str; 13] = [
    "title",
    "clock",
    "clock_unit",
    "start",
    "absorbing",
    "compare",
    "moves",
    "moves_file",
    "classes",
    "groups",
    "costs",
    "hits",
    "tolerance",
];
/// Reads the text of a model file. `directory` is where a `moves_file` is looked for.
pub(super) fn read(
    text: &str,
    file: Option<&str>,
    directory: &Path,
    options: &ReadOptions,
) -> Result<(Draft, Vec<InputFile>), ModelError> {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut reader = Reader { draft: Draft::default(), text, lines: Lines::of(text), inputs: Vec::new() };
    reader.draft.files.extend(file.map(Arc::from));
    let (document, errors) = DeTable::parse_recoverable(text);
    for error in errors {
        reader.not_toml(error.message().trim(), &error.span().unwrap_or(0..0));
    }
    if !reader.draft.faults.is_empty() {
        return Err(ModelError::Faulty(reader.draft.faults));
    }
    reader.model(document.get_ref(), directory, options)?;
    Ok((reader.draft, reader.inputs))
}

pub(super) struct Reader<'t> {
    pub(super) draft: Draft,
    text: &'t str,
    lines: Lines,
    inputs: Vec<InputFile>,
}

impl Reader<'_> {
    fn not_toml(&mut self, reason: &str, span: &Range<usize>) {
        let place = self.place(span);
        // What follows on the same line follows from the first mistake there.
        if self.draft.faults.last().is_some_and(|last| last.place == place) {
            return;
        }
        let written = shortened(self.text.get(span.clone()).unwrap_or_default());
        let value = Some(written).filter(|written| !written.trim().is_empty());
        let at = value.as_ref().map(|written| format!(" at `{written}`")).unwrap_or_default();
        let remedy = if reason.contains("duplicate") {
            "write every name once"
        } else {
            "correct the line; names with blanks or dots need quotes"
        };
        let said = format!("this is not valid TOML{at}: {reason}");
        self.draft.fault(Fault { value, ..Fault::new(FaultKind::Syntax, place, said, remedy) });
    }

    pub(super) fn line(&self, span: &Range<usize>) -> u64 {
        self.lines.of_byte(span.start)
    }

    pub(super) fn place(&self, span: &Range<usize>) -> Place {
        self.draft.place(0, self.line(span))
    }

    fn model(&mut self, document: &DeTable<'_>, directory: &Path, options: &ReadOptions) -> Result<(), ModelError> {
        let entries: HashMap<&str, &Spanned<DeValue<'_>>> =
            document.iter().map(|(key, value)| (key.get_ref().as_ref(), value)).collect();
        self.check_keys(document);
        self.plain_texts(&entries);
        if let Some(absorbing) = entries.get("absorbing") {
            self.draft.declared = self.names(absorbing, "absorbing");
        }
        match (entries.get("moves"), entries.get("moves_file")) {
            (None, Some(file)) => self.moves_file(file, directory, options)?,
            (moves, file) => {
                options.look_without_table()?;
                if let (Some(_), Some(file)) = (moves, file) {
                    let said = "the model has both [moves] and moves_file";
                    let fault = Fault::new(FaultKind::Shape, self.place(&file.span()), said, "keep one of the two");
                    self.draft.fault(fault);
                }
                if let Some(moves) = moves {
                    self.moves(moves);
                }
            }
        }
        self.draft.declare();
        if let Some(start) = entries.get("start") {
            self.start(start);
        }
        if let Some(classes) = entries.get("classes") {
            self.draft.classes = self.named_lists(classes, "classes");
        }
        if let Some(groups) = entries.get("groups") {
            self.draft.groups = self.named_lists(groups, "groups");
        }
        if let Some(hits) = entries.get("hits") {
            self.hits(hits);
        }
        if let Some(costs) = entries.get("costs") {
            self.costs(costs);
        }
        if let Some(compare) = entries.get("compare") {
            self.compare(compare);
        }
        if let Some(tolerance) = entries.get("tolerance") {
            self.tolerances(tolerance);
        }
        Ok(())
    }

    fn check_keys(&mut self, document: &DeTable<'_>) {
        for (key, _) in document {
            let name = key.get_ref().as_ref();
            let place = self.place(&key.span());
            if !KEYS.contains(&name) {
                let known = KEYS.iter().copied();
                let remedy = did_you_mean(name, known, &format!("the keys are {}", KEYS.join(", ")));
                let said = format!("the key `{name}` means nothing here");
                self.draft.fault(Fault::new(FaultKind::UnknownKey, place, said, remedy).valued(name));
            }
        }
    }

    fn plain_texts(&mut self, entries: &HashMap<&str, &Spanned<DeValue<'_>>>) {
        if let Some(title) = entries.get("title") {
            self.draft.title = self.text(title, "title").unwrap_or_default();
        }
        if let Some(unit) = entries.get("clock_unit") {
            self.draft.clock_unit = self.text(unit, "clock_unit");
        }
        let Some(clock) = entries.get("clock") else { return };
        match self.text(clock, "clock").as_deref() {
            None | Some("steps") => {}
            Some("rates") => self.draft.clock = Clock::Rates,
            Some(other) => {
                let said = format!("`{other}` is no clock");
                let fault = Fault::new(
                    FaultKind::WrongType,
                    self.place(&clock.span()),
                    said,
                    "write clock = \"steps\" or \"rates\"",
                );
                self.draft.fault(fault.valued(other));
            }
        }
    }

    fn moves(&mut self, moves: &Spanned<DeValue<'_>>) {
        let Some(table) = self.table(moves, "moves", "[moves] holds one table a state") else {
            self.draft.moves_unread = true;
            return;
        };
        for (from, _) in table {
            let line = self.line(&from.span());
            let state = self.draft.state(from.get_ref(), 0, line);
            self.draft.states[state as usize].row = Some(line);
        }
        self.draft.declare();
        for (from, row) in table {
            let name = from.get_ref().as_ref();
            let from = self.draft.state(name, 0, self.line(&from.span()));
            let Some(row) = self.table(row, name, "write the moves of a state as { target = probability }") else {
                self.draft.states[from as usize].faulty = true;
                continue;
            };
            for (to, value) in row {
                let line = self.line(&to.span());
                let to = self.draft.state(to.get_ref(), 0, line);
                let value = self.draft.written(&self.as_written(value), Some(from), 0, line);
                self.draft.moves.push(DraftMove { from, to, value, line });
            }
        }
    }

    fn moves_file(
        &mut self,
        value: &Spanned<DeValue<'_>>,
        directory: &Path,
        options: &ReadOptions,
    ) -> Result<(), ModelError> {
        let Some(name) = self.text(value, "moves_file") else {
            self.draft.moves_unread = true;
            return Ok(());
        };
        let path = directory.join(&name);
        let input = Input::open(&path)?;
        self.draft.files.push(input.name().into());
        self.draft.moves_file = self.draft.files.len() - 1;
        let kind = Kind::of_file(&path, input.head());
        self.inputs.extend(self.draft.read_moves(kind, input, options)?);
        Ok(())
    }

    fn start(&mut self, start: &Spanned<DeValue<'_>>) {
        let line = self.line(&start.span());
        match start.get_ref() {
            DeValue::String(name) => {
                let state = self.draft.state(name, 0, line);
                let all = Written::Number(Number::Decimal { mantissa: 1, scale: 0 });
                self.draft.starts.push((state, all, line));
            }
            DeValue::Table(shares) => {
                for (name, share) in shares {
                    let line = self.line(&name.span());
                    let state = self.draft.state(name.get_ref(), 0, line);
                    if let Some(share) = self.draft.written(&self.as_written(share), None, 0, line) {
                        self.draft.starts.push((state, share, line));
                    }
                }
            }
            other => {
                let remedy = "write start = \"STATE\", or start = { STATE = share, … }";
                self.wrong_type("start", other, &start.span(), remedy);
                self.draft.start_faulty = true;
            }
        }
    }

    fn named_lists(&mut self, lists: &Spanned<DeValue<'_>>, key: &str) -> Vec<NamedList> {
        let mut found = Vec::new();
        let Some(table) = self.table(lists, key, "write NAME = [\"STATE\", …] below it") else { return found };
        for (name, members) in table {
            let line = self.line(&name.span());
            if is_empty_list(members) {
                let said = format!("`{}` under [{key}] lists nothing", name.get_ref());
                let fault = Fault::new(FaultKind::Shape, self.draft.place(0, line), said, "list at least one name");
                self.draft.fault(fault.about(name.get_ref().as_ref()));
                continue;
            }
            let members = self.names(members, name.get_ref()).into_iter().map(|(member, _)| member).collect();
            found.push(NamedList { name: name.get_ref().to_string(), members, line });
        }
        found
    }

    fn compare(&mut self, compare: &Spanned<DeValue<'_>>) {
        let mut rows = Vec::new();
        for (name, line) in self.names(compare, "compare") {
            match Quantity::parse(&name) {
                Ok(quantity) => rows.push((quantity, line)),
                Err(reason) => self.unknown_quantity(&name, line, reason.text, reason.remedy),
            }
        }
        if is_empty_list(compare) {
            let said = "compare lists nothing";
            let remedy = "name quantities, or take the key out for the default rows";
            let fault = Fault::new(FaultKind::Shape, self.place(&compare.span()), said, remedy);
            self.draft.fault(fault);
        }
        self.draft.compare = Some(rows);
    }

    fn unknown_quantity(&mut self, name: &str, line: u64, text: String, remedy: String) {
        let fault = Fault::new(FaultKind::UnknownName, self.draft.place(0, line), text, remedy);
        self.draft.fault(fault.valued(name));
    }

    fn tolerances(&mut self, tolerance: &Spanned<DeValue<'_>>) {
        let Some(table) = self.table(tolerance, "tolerance", "write NAME = VALUE below [tolerance]") else { return };
        for (name, value) in table {
            let line = self.line(&name.span());
            let name = name.get_ref().as_ref();
            if let DeValue::Table(by_argument) = value.get_ref() {
                for (argument, value) in by_argument {
                    let line = self.line(&argument.span());
                    if argument.get_ref() == "default" {
                        self.tolerance(name, value, line);
                    } else {
                        self.tolerance(&format!("{name}:{}", argument.get_ref()), value, line);
                    }
                }
            } else {
                self.tolerance(name, value, line);
            }
        }
    }

    fn tolerance(&mut self, name: &str, value: &Spanned<DeValue<'_>>, line: u64) {
        let key = match ToleranceKey::parse(name) {
            Ok(key) => key,
            Err(reason) => return self.unknown_quantity(name, line, reason.text, reason.remedy),
        };
        let text = self.as_written(value);
        match Tolerance::parse(&text) {
            Ok(value) => self.draft.tolerances.push((key, value, line)),
            Err(reason) => {
                let remedy = "write an absolute one such as 0.005, or a relative one such as \"1 %\"";
                let fault = Fault::new(FaultKind::WrongType, self.draft.place(0, line), reason, remedy);
                self.draft.fault(fault.about(name).valued(shortened(&text)));
            }
        }
    }

    /// A number or text as written, so that its exact value is not lost in a double; anything else as the file has it, for
    /// the message that it is no number.
    pub(super) fn as_written(&self, value: &Spanned<DeValue<'_>>) -> String {
        match value.get_ref() {
            DeValue::String(text) => text.to_string(),
            DeValue::Float(number) => number.as_str().to_owned(),
            DeValue::Integer(number) if number.radix() == 10 => number.as_str().to_owned(),
            _ => self.text.get(value.span()).unwrap_or_default().to_owned(),
        }
    }

    pub(super) fn text(&mut self, value: &Spanned<DeValue<'_>>, key: &str) -> Option<String> {
        match value.get_ref() {
            DeValue::String(text) => Some(text.to_string()),
            other => {
                self.wrong_type(key, other, &value.span(), "put the text in quotes");
                None
            }
        }
    }

    pub(super) fn table<'a, 'b>(
        &mut self,
        value: &'a Spanned<DeValue<'b>>,
        key: &str,
        remedy: &str,
    ) -> Option<&'a DeTable<'b>> {
        let table = value.get_ref().as_table();
        if table.is_none() {
            self.wrong_type(key, value.get_ref(), &value.span(), remedy);
        }
        table
    }

    pub(super) fn names(&mut self, value: &Spanned<DeValue<'_>>, key: &str) -> Vec<(String, u64)> {
        // A lone name is told off, and then taken for the list that was meant.
        let items = value.get_ref().as_array().map_or(std::slice::from_ref(value), |items| items);
        if value.get_ref().as_array().is_none() {
            self.wrong_type(key, value.get_ref(), &value.span(), "write a list of names in quotes: [\"a\", \"b\"]");
        }
        items.iter().filter_map(|item| self.text(item, key).map(|name| (name, self.line(&item.span())))).collect()
    }

    pub(super) fn wrong_type(&mut self, key: &str, value: &DeValue<'_>, span: &Range<usize>, remedy: &str) {
        let said = format!("`{key}` holds a value of type {}, which does not belong there", value.type_str());
        let fault = Fault::new(FaultKind::WrongType, self.place(span), said, remedy);
        let written = self.text.get(span.clone()).unwrap_or_default();
        self.draft.fault(fault.about(key).valued(shortened(written)));
    }
}

pub(super) fn is_empty_list(value: &Spanned<DeValue<'_>>) -> bool {
    value.get_ref().as_array().is_some_and(|items| items.is_empty())
}

/// Where each line of a text begins.
struct Lines(Vec<usize>);

impl Lines {
    fn of(text: &str) -> Self {
        Self(
            std::iter::once(0)
                .chain(text.bytes().enumerate().filter(|(_, b)| *b == b'\n').map(|(at, _)| at + 1))
                .collect(),
        )
    }

    fn of_byte(&self, at: usize) -> u64 {
        self.0.partition_point(|start| *start <= at) as u64
    }
}
