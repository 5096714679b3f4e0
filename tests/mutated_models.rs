//! Models cut short and mutated at random: whatever the bytes, an answer or faults with remedies, and never a panic.

mod arrays;
mod models;

use std::fs;
use std::path::Path;

use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;
use tallystone::model::{Model, ModelError, ReadOptions};

/// Reads bytes as every kind of model; a panic fails the test, an answer of either kind is fine.
fn read_all(bytes: &[u8], directory: &Path) {
    let options = ReadOptions {
        start: Some("intake".to_owned()),
        absorbing: vec!["shipped".to_owned()],
        ..ReadOptions::default()
    };
    let turned = ReadOptions { transpose: true, ..options.clone() };
    let mut answers: Vec<_> = [&options, &turned].map(|options| Model::read_from(bytes, "model", options)).into();
    match std::str::from_utf8(bytes) {
        Ok(text) => answers.extend([Model::from_toml(text), Model::from_table(text, &options)]),
        Err(_) if bytes.starts_with(b"\x93NUMPY") => {}
        // Only a file can hold what is no text.
        Err(_) => answers.extend(["model.toml", "model.csv"].map(|name| {
            let path = directory.join(name);
            fs::write(&path, bytes).unwrap();
            let answer = Model::read(&path, &options);
            fs::remove_file(&path).unwrap();
            answer
        })),
    }
    for error in answers.into_iter().filter_map(Result::err) {
        let is_whole = matches!(error, ModelError::Read { .. } | ModelError::Option { .. });
        assert!(!error.faults().is_empty() || is_whole);
        assert!(error.faults().iter().all(|fault| !fault.remedy.is_empty() && !fault.text.is_empty()), "{error}");
    }
}

#[test]
fn mutated_models_never_panic() {
    let directory = tempfile::tempdir().unwrap();
    // What breaks numbers, quotes, tables and lines.
    let pieces: [&[u8]; 16] = [
        b"\"",
        b"'",
        b",",
        b";",
        b"\t",
        b"\n",
        b"\r",
        b"#",
        b"[",
        b"{",
        b"e-999",
        b"9e9999999999999999999",
        b"/0",
        b"\0",
        b"\xff",
        b"\xef\xbb\xbf",
    ];
    let array = arrays::bench();
    let goods = [models::TOML, models::MOVES, models::SQUARE, arrays::MATRIX_MARKET].map(str::as_bytes);
    for (seed, good) in goods.into_iter().chain([array.as_slice()]).enumerate() {
        for end in 0..=good.len() {
            read_all(&good[..end], directory.path());
        }
        let mut rng = Lcg128CmDxsm64::new(seed as u128, 7);
        let mut below = |n: usize| (rng.next_u64() % n as u64) as usize;
        for _ in 0..4000 {
            let mut bytes = good.to_vec();
            for _ in 0..=below(3) {
                let at = below(bytes.len());
                match below(4) {
                    0 => bytes[at] ^= 1 << below(8),
                    1 => drop(bytes.splice(at..at, pieces[below(pieces.len())].iter().copied())),
                    2 => drop(bytes.drain(at..(at + below(12)).min(bytes.len()))),
                    _ => {
                        let piece = bytes[at..(at + below(40)).min(bytes.len())].to_vec();
                        let to = below(bytes.len());
                        drop(bytes.splice(to..to, piece));
                    }
                }
                bytes.push(b'\n');
            }
            read_all(&bytes, directory.path());
        }
    }
}

#[test]
fn deep_nesting_and_long_lines_never_panic() {
    let directory = tempfile::tempdir().unwrap();
    for piece in ["[", "{a=", "a.", "[[", "\"", ",", "a={b=[", "1_", "e", "-"] {
        let deep = piece.repeat(100_000);
        read_all(deep.as_bytes(), directory.path());
        read_all(format!("start = {deep}").as_bytes(), directory.path());
        read_all(format!("from,to,probability\na,b,{deep}\n").as_bytes(), directory.path());
    }
}
