//! The rooms: each knows only those below it. Read off the text of the sources, so that nothing can be hidden behind a
//! feature or a test.

use std::fs;
use std::path::{Path, PathBuf};

/// The rooms that each room may name, besides itself.
const MAY_NAME: [(&str, &[&str]); 8] = [
    ("statistics", &[]),
    ("model", &[]),
    ("exact", &["model", "statistics"]),
    ("sampling", &["model", "statistics"]),
    ("compare", &["exact", "sampling", "model", "statistics"]),
    ("audit", &["compare", "exact", "sampling", "model", "statistics"]),
    // It writes what was computed, and so needs no statistics.
    ("report", &["audit", "compare", "exact", "sampling", "model"]),
    ("cli", &["report", "audit", "compare", "exact", "sampling", "model", "statistics"]),
];

/// What only `cli` and `main` may see: arguments, environment, terminal, signals, exit statuses.
const OUTSIDE: [&[&str]; 8] = [
    &["clap"],
    &["indicatif"],
    &["terminal_size"],
    &["ctrlc"],
    &["std", "env"],
    &["std", "process"],
    &["std", "io", "IsTerminal"],
    &["std", "io", "stdin"],
];

/// Keywords that a path can follow.
const KEYWORDS: [&str; 11] = ["use", "as", "dyn", "impl", "for", "in", "mut", "return", "ref", "move", "where"];

/// Source text without comments, strings and characters.
fn code(text: &str) -> String {
    let bytes = text.as_bytes();
    let mut kept = Vec::with_capacity(bytes.len());
    let mut at = 0;
    while at < bytes.len() {
        let rest = &bytes[at..];
        let is_word = |b: u8| b.is_ascii_alphanumeric() || b == b'_';
        let after_word = at > 0 && is_word(bytes[at - 1]);
        let length = if rest.starts_with(b"//") {
            rest.iter().position(|b| *b == b'\n').unwrap_or(rest.len())
        } else if rest.starts_with(b"/*") {
            block_comment(rest)
        } else if rest[0] == b'"' {
            1 + string(&rest[1..])
        } else if !after_word && (rest.starts_with(b"r\"") || rest.starts_with(b"r#\"") || rest.starts_with(b"r##\"")) {
            let hashes = rest[1..].iter().take_while(|b| **b == b'#').count();
            let close = [b"\"".as_slice(), &rest[1..=hashes]].concat();
            let body = &rest[hashes + 2..];
            hashes + 2 + close.len() + body.windows(close.len()).position(|w| w == close).unwrap_or(body.len())
        } else if rest[0] == b'\'' && (rest.get(1) == Some(&b'\\') || text[at + 1..].chars().nth(1) == Some('\'')) {
            // A character; a lifetime has no quote behind it.
            let skip = if rest[1] == b'\\' { 3 } else { 2 };
            skip + rest[skip..].iter().position(|b| *b == b'\'').unwrap_or(0) + 1
        } else {
            kept.push(rest[0]);
            at += 1;
            continue;
        };
        kept.extend(rest[..length.min(rest.len())].iter().filter(|b| **b == b'\n'));
        kept.push(b' ');
        at += length;
    }
    String::from_utf8_lossy(&kept).into_owned()
}

fn block_comment(rest: &[u8]) -> usize {
    let (mut depth, mut at) = (0, 0);
    while at < rest.len() {
        if rest[at..].starts_with(b"/*") {
            (depth, at) = (depth + 1, at + 2);
        } else if rest[at..].starts_with(b"*/") {
            (depth, at) = (depth - 1, at + 2);
            if depth == 0 {
                break;
            }
        } else {
            at += 1;
        }
    }
    at
}

/// Length of a string from behind its opening quote, the closing one included.
fn string(rest: &[u8]) -> usize {
    let mut at = 0;
    while at < rest.len() && rest[at] != b'"' {
        at += if rest[at] == b'\\' { 2 } else { 1 };
    }
    at + 1
}

/// Words, `::`, and single signs, each with the depth of modules that it stands in.
fn tokens(code: &str) -> Vec<(String, usize)> {
    let mut tokens: Vec<(String, usize)> = Vec::new();
    // For every open brace, whether it opened a module.
    let mut open: Vec<bool> = Vec::new();
    let mut rest = code;
    while let Some(first) = rest.chars().next() {
        let length = if first.is_alphanumeric() || first == '_' {
            rest.find(|c: char| !c.is_alphanumeric() && c != '_').unwrap_or(rest.len())
        } else if rest.starts_with("::") {
            2
        } else {
            first.len_utf8()
        };
        let (token, after) = rest.split_at(length);
        rest = after;
        if token.trim().is_empty() {
            continue;
        }
        if token == "{" {
            open.push(tokens.len() > 1 && tokens[tokens.len() - 2].0 == "mod");
        } else if token == "}" {
            open.pop();
        }
        tokens.push((token.to_owned(), open.iter().filter(|module| **module).count()));
    }
    tokens
}

/// Every path in a source with the depth of modules that it stands in; the branches of a `use` one by one.
fn paths(tokens: &[(String, usize)]) -> Vec<(Vec<String>, usize)> {
    let mut found = Vec::new();
    // Prefixes of the braces that are open, and the path that is being read.
    let mut prefixes: Vec<Vec<String>> = Vec::new();
    let mut path: Vec<String> = Vec::new();
    let mut before = "";
    for (at, (token, depth)) in tokens.iter().enumerate() {
        let goes_on = tokens.get(at + 1).is_some_and(|(next, _)| next == "::");
        let is_word = token.starts_with(|c: char| c.is_alphanumeric() || c == '_') || (token == "*" && before == "::");
        match token.as_str() {
            "::" => {}
            // Only a path that ends in `::` goes on inside the braces.
            "{" => prefixes.push(if before == "::" { path.clone() } else { Vec::new() }),
            "}" => drop(prefixes.pop()),
            // A path that begins with `::` does not go on from the keyword before it.
            _ if is_word && !KEYWORDS.contains(&token.as_str()) => {
                path.push(token.clone());
                if !goes_on {
                    found.push((path.clone(), *depth));
                }
            }
            _ => {}
        }
        if token != "::" && !goes_on {
            path = prefixes.last().cloned().unwrap_or_default();
        }
        before = token;
    }
    found
}

/// What is wrong with a source. `file` is its path below `src`.
fn violations(file: &Path, text: &str) -> Vec<String> {
    let parts: Vec<&str> = file.iter().filter_map(|part| part.to_str()).collect();
    let (room, is_main) = (if parts.len() > 1 { parts[0] } else { "" }, parts == ["main.rs"]);
    let rooms = || MAY_NAME.iter().map(|(name, _)| *name);
    let may_name = MAY_NAME.iter().find(|(name, _)| *name == room).map_or(&[] as &[&str], |(_, below)| below);
    // `super` may be said once for every module between the file and its room.
    let inside = parts.len().saturating_sub(2) + usize::from(parts.last() != Some(&"mod.rs"));
    let depth_of_file = if room.is_empty() { 0 } else { inside };
    let tokens = tokens(&code(text));
    let mut wrong = Vec::new();
    for (path, depth) in paths(&tokens) {
        let shown = path.join("::");
        let named = path.get(1).map_or("", String::as_str);
        match path[0].as_str() {
            "crate" if path.len() > 1 && named != room && !may_name.contains(&named) => {
                wrong.push(format!("{}: `{shown}` is not below `{room}`", file.display()));
            }
            "tallystone" if !(is_main && named == "cli") => {
                wrong.push(format!("{}: `{shown}` goes around the rooms", file.display()));
            }
            "self" | "super" => {
                let ups = path.iter().filter(|part| *part == "super").count();
                if ups > depth_of_file + depth {
                    wrong.push(format!("{}: `{shown}` leaves the room", file.display()));
                }
            }
            _ => {}
        }
        let outside = OUTSIDE
            .iter()
            .any(|forbidden| path.iter().zip(*forbidden).filter(|(a, b)| a == b).count() == forbidden.len());
        if outside && room != "cli" && !is_main {
            wrong.push(format!("{}: `{shown}` is for `cli` alone", file.display()));
        }
    }
    for three in tokens.windows(3) {
        let three = [&three[0].0, &three[1].0, &three[2].0].map(String::as_str);
        if matches!(three, ["crate", "as", _] | ["extern", "crate", _] | ["[", "path", "="] | ["include", "!", _]) {
            wrong.push(format!("{}: `{}` hides what is named", file.display(), three.join(" ")));
        }
    }
    if !room.is_empty() && !rooms().any(|known| known == room) {
        wrong.push(format!("{}: the room `{room}` has no place among the layers", file.display()));
    }
    wrong
}

fn sources(directory: &Path, found: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(directory).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            sources(&path, found);
        } else if path.extension().is_some_and(|end| end == "rs") {
            found.push(path);
        }
    }
}

#[test]
fn every_room_names_only_those_below_it() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Vec::new();
    sources(&root, &mut files);
    for (room, _) in MAY_NAME {
        assert!(files.contains(&root.join(room).join("mod.rs")), "there is no room `{room}`");
    }
    let wrong: Vec<String> = files
        .iter()
        .flat_map(|path| violations(path.strip_prefix(&root).unwrap(), &fs::read_to_string(path).unwrap()))
        .collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn the_layers_are_those_of_the_plan() {
    let below = |room: &str| MAY_NAME.iter().find(|(name, _)| *name == room).unwrap().1;
    for (number, (room, names)) in MAY_NAME.iter().enumerate() {
        for name in *names {
            let lower = MAY_NAME.iter().position(|(known, _)| known == name).unwrap();
            assert!(lower < number, "`{room}` names `{name}`, which is no lower");
        }
    }
    assert!(!below("exact").contains(&"sampling") && !below("sampling").contains(&"exact"));
    assert!(!below("report").contains(&"statistics") && !below("model").contains(&"statistics"));
}

#[test]
fn every_way_around_the_layers_is_seen() {
    for (file, text) in [
        ("exact/law.rs", "use crate::sampling::Tally;"),
        ("sampling/run.rs", "use crate::{model::Chain, exact::Exact};"),
        (
            "sampling/run.rs",
            "use crate::model::{self, Chain};\nuse crate::{\n    model::Row,\n    exact::{Bounded, Exact},\n};",
        ),
        ("statistics/normal.rs", "use crate::model::Number;"),
        ("model/chain.rs", "use crate::statistics::Interval;"),
        ("compare/study.rs", "use crate::audit::Collector;"),
        ("audit/mod.rs", "use crate::report::Document;"),
        ("report/text.rs", "use crate::statistics::normal_survival;"),
        ("report/text.rs", "fn f() -> f64 { crate::statistics::normal_survival(1.0) }"),
        ("report/text.rs", "pub use crate::cli;"),
        ("exact/law.rs", "fn f(tally: &crate /* a */ :: sampling::Tally) {}"),
        ("exact/law.rs", "use super::super::sampling::Tally;"),
        ("exact/mod.rs", "use super::sampling::Tally;"),
        ("exact/law.rs", "use super::{super::sampling::Tally, Bounded};"),
        ("exact/law.rs", "#[cfg(test)]\nmod tests {\n    use super::super::super::sampling::Tally;\n}"),
        ("exact/law.rs", "mod tests { fn f() { { } } }\nuse super::super::sampling::Tally;"),
        ("exact/law.rs", "use self::super::super::sampling::Tally;"),
        ("exact/law.rs", "use crate as all;"),
        ("exact/law.rs", "use crate::{self as all};"),
        ("exact/law.rs", "use crate::*;"),
        ("exact/law.rs", "use tallystone::sampling::Tally;"),
        ("exact/law.rs", "use ::tallystone::sampling::Tally;"),
        ("exact/law.rs", "extern crate tallystone as all;"),
        ("exact/law.rs", "#[path = \"../sampling/tally.rs\"]\nmod tally;"),
        ("exact/law.rs", "include!(\"../sampling/tally.rs\");"),
        ("main.rs", "fn main() { tallystone::report::write(); }"),
        ("report/text.rs", "use clap::Parser;"),
        ("report/text.rs", "#[derive(clap::Parser)] struct A;"),
        ("compare/study.rs", "use indicatif::ProgressBar;"),
        ("report/text.rs", "fn f() { terminal_size::terminal_size(); }"),
        ("sampling/run.rs", "fn f() { std::env::var(\"A\"); }"),
        ("sampling/run.rs", "use std::{collections::HashMap, env};"),
        ("model/source.rs", "use std::process::{self, ExitCode};"),
        ("report/text.rs", "use std::io::{self, IsTerminal, Write};"),
        ("oracle/mod.rs", "fn f() {}"),
    ] {
        assert!(!violations(Path::new(file), text).is_empty(), "{file}: {text}");
    }
}

#[test]
fn what_is_allowed_or_only_talked_of_is_not_accused() {
    for (file, text) in [
        ("compare/study.rs", "use crate::exact::{Bounded, Exact};\nuse crate::{sampling::Tally, model::Model};"),
        ("exact/law.rs", "use super::{Bounded, kernel::Kernel};\nuse crate::exact::Shape;"),
        ("exact/law.rs", "#[cfg(test)]\nmod tests {\n    use super::super::Bounded;\n    use super::*;\n}"),
        ("cli/demo/mod.rs", "use super::Session;"),
        ("cli/demo/files.rs", "use super::super::Session;\nuse clap::Parser;\nuse std::env;"),
        (
            "exact/law.rs",
            "//! use crate::sampling::Tally;\n/// [`tallystone::sampling`]\n/* use clap::Parser; /* nested */ */ fn f() {}",
        ),
        (
            "exact/law.rs",
            "const A: &str = \"crate::sampling\"; const B: &str = r#\"use clap::\"#; const C: char = '\"';",
        ),
        ("exact/law.rs", "fn f<'a>(a: &'a str) -> char { '\\'' } pub(crate) fn g() {} pub(in crate::exact) fn h() {}"),
        ("report/json.rs", "const V: &str = env!(\"CARGO_PKG_VERSION\");\nuse std::io::{self, Write};"),
        ("main.rs", "fn main() -> std::process::ExitCode { tallystone::cli::main() }"),
        ("lib.rs", "pub mod exact;"),
    ] {
        assert_eq!(violations(Path::new(file), text), Vec::<String>::new(), "{file}: {text}");
    }
}
