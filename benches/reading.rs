//! Seconds, speed and peak memory of reading large models, each in a process of its own.
//!
//! `cargo bench --bench reading`, or `cargo bench --bench reading -- MOVES` for another size than ten million moves. The
//! files are written to a temporary directory first. Peak memory is `VmHWM` of `/proc/self/status`, where there is one.
#![allow(missing_docs)]

use std::fs::{self, File};
use std::io::{self, BufWriter, Write};
use std::path::Path;
use std::process::Command;
use std::time::Instant;

use tallystone::model::{Model, ReadOptions};

/// Moves out of each state: how far they lead, and their probabilities.
const MOVES: [(u64, &str); 10] = [
    (1, "0.05"),
    (2, "0.125"),
    (3, "0.1"),
    (10, "0.1"),
    (31, "0.075"),
    (100, "0.1"),
    (317, "0.15"),
    (1000, "0.1"),
    (3170, "0.15"),
    (99_991, "0.05"),
];

/// Marks the process that reads.
const READ: &str = "read";

fn main() -> io::Result<()> {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|argument| argument != "--bench").collect();
    if let [mode, file] = arguments.as_slice()
        && mode == READ
    {
        return read(Path::new(file));
    }
    let moves = arguments.first().and_then(|text| text.parse().ok()).unwrap_or(10_000_000);
    let directory = tempfile::tempdir()?;
    for (name, write) in FORMS {
        let path = directory.path().join(name);
        let mut out = BufWriter::new(File::create(&path)?);
        write(&mut out, moves / MOVES.len() as u64 + 1)?;
        out.into_inner()?.sync_all()?;
        Command::new(std::env::current_exe()?).arg(READ).arg(&path).status()?;
        fs::remove_file(&path)?;
    }
    Ok(())
}

/// Writes a model of so many states, the last of them absorbing.
type Writer = fn(&mut BufWriter<File>, u64) -> io::Result<()>;

const FORMS: [(&str, Writer); 2] = [("moves.csv", write_csv), ("moves.mtx", write_matrix_market)];

/// Every move of the model: from, to (from 1), probability.
fn moves(states: u64) -> impl Iterator<Item = (u64, u64, &'static str)> {
    let leaving = (1..states).flat_map(move |from| {
        MOVES.into_iter().map(move |(far, probability)| (from, (from + far - 1) % states + 1, probability))
    });
    leaving.chain([(states, states, "1")])
}

fn write_csv(out: &mut BufWriter<File>, states: u64) -> io::Result<()> {
    writeln!(out, "from,to,probability")?;
    moves(states).try_for_each(|(from, to, probability)| writeln!(out, "{from},{to},{probability}"))
}

fn write_matrix_market(out: &mut BufWriter<File>, states: u64) -> io::Result<()> {
    writeln!(out, "%%MatrixMarket matrix coordinate real general")?;
    writeln!(out, "{states} {states} {}", moves(states).count())?;
    moves(states).try_for_each(|(from, to, probability)| writeln!(out, "{from} {to} {probability}"))
}

fn read(path: &Path) -> io::Result<()> {
    let megabytes = fs::metadata(path)?.len() as f64 / 1e6;
    let options = ReadOptions { start: Some("1".to_owned()), ..ReadOptions::default() };
    let started = Instant::now();
    let model = Model::read(path, &options).map_err(io::Error::other)?;
    let seconds = started.elapsed().as_secs_f64();
    println!(
        "{:10} {} states, {} moves, {megabytes:.0} MB: {seconds:.2} s, {:.0} MB/s, peak memory {}",
        path.file_name().unwrap_or_default().display(),
        model.chain().states(),
        model.chain().moves(),
        megabytes / seconds,
        peak_memory().unwrap_or_else(|| "unknown".to_owned()),
    );
    Ok(())
}

/// The most memory that this process ever had resident.
fn peak_memory() -> Option<String> {
    let status = fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"))?;
    let kilobytes: f64 = line.trim().trim_end_matches("kB").trim().parse().ok()?;
    Some(format!("{:.0} MB", kilobytes * 1024.0 / 1e6))
}
