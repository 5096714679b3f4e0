//! Result files of every kind, good and bad.

use std::io::Write;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};

use rand_pcg::Lcg128CmDxsm64;
use rand_pcg::rand_core::Rng;
use tempfile::NamedTempFile;

use super::outcome_file::read;
use super::{Collector, OutcomeError, OutcomeFile};
use crate::exact::{Exact, Request};
use crate::model::{FaultKind, Model, Progress, Silent, Ticks};
use crate::sampling::Grid;

fn file(bytes: &[u8]) -> NamedTempFile {
    let mut file = NamedTempFile::new().unwrap();
    file.write_all(bytes).unwrap();
    file
}

fn read_with(path: &Path, progress: &dyn Progress) -> Result<OutcomeFile, OutcomeError> {
    let model = Model::from_toml(
        r#"
        start = "bench"
        absorbing = ["shipped", "scrapped"]
        [moves]
        bench = { test = 1 }
        test = { shipped = "5/6", test = 0.1, scrapped = "rest" }
        [groups]
        out = ["shipped", "scrapped"]
        "#,
    );
    let model = model.unwrap();
    let exact = Exact::solve(&model, &Request::default(), &Silent).unwrap();
    read(path, Collector::over(&exact, Arc::new(Grid::new(vec![2, 5])), Ticks::STEPS), progress)
}

fn outcomes(bytes: &[u8]) -> Result<OutcomeFile, OutcomeError> {
    read_with(file(bytes).path(), &Silent)
}

/// Rows, bad rows, and the faults without the name of the file.
fn refusal(bytes: &[u8]) -> (u64, u64, Vec<String>) {
    let error = outcomes(bytes).unwrap_err();
    let shown = error.to_string();
    let OutcomeError::Bad { file, rows, bad, faults } = error else { panic!("{error:?}") };
    assert!(shown.contains(&file), "{shown}");
    (rows, bad, faults.iter().map(|fault| fault.to_string().replace(&file, "F")).collect())
}

// Two, three and twelve steps, all possible.
#[test]
fn the_same_outcomes_in_any_dress_give_the_same_tally() {
    let plain = outcomes(b"end,time\nshipped,2\nscrapped,3\nshipped,12\n").unwrap();
    assert_eq!((plain.rows, plain.ignored_columns.len(), plain.audited.findings.len()), (3, 0, 0));
    assert_eq!(plain.audited.tally.at_or_below(2), Some(1));
    for dressed in [
        "end,time\r\nshipped,2\r\nscrapped,3\r\nshipped,12\r\n",
        "\u{feff}end,time\nshipped,2\nscrapped,3\nshipped,12",
        "Time, END\n12.0, shipped\n\n2,shipped\n \n3.,scrapped",
        "\"end\",\"time\"\r\n\"shipped\",\"2\"\r\n\"scrapped\",\"3\"\r\n\"shipped\",\"1.2e1\"\r\n",
        "end;time\nshipped;2,0\nscrapped;3\nshipped;12\n",
        "time\tend\n2\tshipped\n3\tscrapped\n12\tshipped\n",
        "replication,end,time\n7,shipped,2\n0.0,scrapped,3\n18446744073709551615,shipped,12\n",
        "end,time\nshipped,+2,\nscrapped,003\nshipped,12,,\n",
        "end,note,time\nshipped,\"a \"\"b\"\"\",2\nscrapped,,3\nshipped,\"x,y\",12\n",
    ] {
        let read = outcomes(dressed.as_bytes()).unwrap();
        assert_eq!(read.audited.tally, plain.audited.tally, "{dressed}");
        assert_eq!(read.rows, 3);
    }
}

#[test]
fn other_columns_are_passed_over_and_listed_even_if_they_are_no_text() {
    let read = outcomes(b"seed,end,,time,worker\n\xff,shipped,x,2,\xfe\n").unwrap();
    assert_eq!(read.ignored_columns, ["seed", "worker"]);
    assert_eq!(read.audited.tally.replications(), 1);
}

#[test]
fn columns_that_would_change_what_a_row_says_are_refused() {
    for name in ["count", "Weight", "censored", "start"] {
        let (rows, _, faults) = refusal(format!("end,time,{name}\nshipped,2,1\n").as_bytes());
        assert_eq!((rows, faults.len()), (0, 1));
        assert!(faults[0].starts_with(&format!("F:1: the column `{name}` changes what a row says")), "{}", faults[0]);
    }
}

#[test]
fn a_quotation_mark_cannot_swallow_rows() {
    // A later quotation mark closes the cell: without a look at the line breaks the second row would vanish unseen.
    let (rows, bad, faults) = refusal(b"end,time,note\nshipped,2,\"a\nshipped,3,b\nshipped,2,c\"\nshipped,2,d\n");
    assert_eq!((rows, bad), (2, 1));
    assert!(faults[0].starts_with("F:2: a quoted cell runs over several lines"), "{}", faults[0]);
}

#[test]
fn the_hash_is_over_all_bytes() {
    // Source: `printf 'end,time\nshipped,2\n' | sha256sum`.
    let read = outcomes(b"end,time\nshipped,2\n").unwrap();
    assert_eq!(read.sha256, "1207688f3f3f0adc16a6b0a9346a2e758e74f0034678f3bf914043a5cac4fa38");
}

#[test]
fn every_kind_of_bad_row_is_named_with_line_value_and_remedy() {
    let steps = "write the number of steps to the end, a whole number such as 12 or 12.0";
    let numbers = "number the replications with whole numbers, or leave the column out";
    let many = "9".repeat(80);
    let expected = [
        ("shipped,,1", "the time is empty", steps),
        ("shipped,abc,1", "the time `abc` is not a number", steps),
        ("shipped,NaN,1", "the time `NaN` is not finite", steps),
        ("shipped,inf,1", "the time `inf` is not finite", steps),
        ("shipped,-1,1", "the time `-1` is negative", steps),
        ("shipped,2.5,1", "the time `2.5` is not a whole number", steps),
        ("shipped,18446744073709551616,1", "the time `18446744073709551616` is out of range", steps),
        ("shipped,1e999,1", "the time `1e999` is out of range", steps),
        (&format!("shipped,{many},1"), &format!("the time `{}…` is out of range", &many[..60]), steps),
        ("shipped,\u{fffd},1", "the time `\u{fffd}` is not UTF-8 text", steps),
        ("\u{fffd},2,1", "the end `\u{fffd}` is not UTF-8 text", "save the file as UTF-8"),
        (",2,1", "the outcome names no end", "name the end in which the replication finished"),
        ("shiped,2,1", "`shiped` is no end of the model", "did you mean `shipped`?"),
        ("out,2,1", "`out` is a group of ends, not an end", "name the end itself"),
        (
            "bench,2,1",
            "`bench` is a transient state, where no replication finishes",
            "the ends are `shipped`, `scrapped`",
        ),
        ("shipped,2,", "the replication is empty", numbers),
        ("shipped,2,a", "the replication `a` is not a number", numbers),
        ("shipped,2,-1", "the replication `-1` is negative", numbers),
        ("shipped,2,0.5", "the replication `0.5` is not a whole number", numbers),
        ("shipped,2", "the line has 2 cells, the header 3", "complete it"),
        ("shipped,2,1,0", "the line has 4 cells, the header 3", "give every line the cells"),
        ("shi", "the line has 1 cell, the header 3", "complete it"),
    ];
    for (row, text, remedy) in expected {
        let content = format!("end,time,replication\n\nshipped,2,5\n{row}\n");
        // A lone continuation byte is no text; the replacement character stands for it above.
        let bytes: Vec<u8> =
            content.replace('\u{fffd}', "\u{1}").bytes().map(|b| if b == 1 { 0x80 } else { b }).collect();
        let (rows, bad, faults) = refusal(&bytes);
        assert_eq!((rows, bad, faults.len()), (2, 1, 1), "{row}");
        assert!(faults[0].starts_with(&format!("F:4: {text}")), "{row}: {}", faults[0]);
        assert!(faults[0].contains(&format!("; {remedy}")), "{row}: {}", faults[0]);
    }
}

#[test]
fn the_first_ten_bad_rows_are_shown_and_all_are_counted() {
    let mut text = "end,time\r\n".to_owned();
    (0..30).for_each(|row| text.push_str(if row % 2 == 0 { "shipped,2\r\n" } else { "lost,2\r\n" }));
    let (rows, bad, faults) = refusal(text.as_bytes());
    assert_eq!((rows, bad, faults.len()), (30, 15, 10));
    assert!(faults[0].starts_with("F:3: ") && faults[9].starts_with("F:21: "), "{faults:?}");
    let error = outcomes(text.as_bytes()).unwrap_err();
    assert!(error.to_string().starts_with("15 of 30 rows of "), "{error}");
    assert_eq!(error.faults()[0].kind, FaultKind::UnknownName);
    assert_eq!(error.faults()[0].value.as_deref(), Some("lost"));
}

#[test]
fn a_repeated_replication_names_both_lines() {
    let (rows, bad, faults) = refusal(
        b"end,time,replication\nshipped,2,7\n\nshipped,3,900\nshipped,4,7\nshipped,5,900.0\nshipped,5,8\nshipped,6,7\n",
    );
    assert_eq!((rows, bad), (6, 3));
    let texts = [
        "F:5: replication 7 is listed twice (first on line 2)",
        "F:6: replication 900 is listed twice (first on line 4)",
    ];
    assert!(faults[0].starts_with(texts[0]) && faults[1].starts_with(texts[1]), "{faults:?}");
    assert!(faults[2].starts_with("F:8: replication 7 is listed twice (first on line 2)"), "{faults:?}");
}

#[test]
fn a_file_without_outcomes_says_why() {
    for (bytes, expected) in [
        (b"".as_slice(), "F: the file is empty; check that the program finished"),
        (b"\xef\xbb\xbf\n \n", "F: the file is empty; check that the program finished"),
        (b"end,time\n\n", "F: the file has a header, but no outcomes; check that"),
        (b"end,steps\nshipped,2\n", "F:1: the header `end,steps` has no column `time`; name the columns"),
        (b"\nshipped,2\n", "F:2: the first line `shipped,2` is a row, not the header; name the columns"),
        (b"end,time,End\n", "F:1: the header names `end` twice; keep one"),
        (b"end,time,replication,replication\n", "F:1: the header names `replication` twice; keep one"),
        (b"end,time\xff\n", "F:1: the header is not UTF-8 text; save the file as UTF-8"),
        (b"\xff\xfee\0n\0d\0", "F:1: the header is not UTF-8 text; save the file as UTF-8"),
        (b"\x1f\x8b\x08\0\0", "F: the file is compressed; unpack it first"),
    ] {
        let (rows, bad, faults) = refusal(bytes);
        assert_eq!((rows, bad, faults.len()), (0, 0, 1));
        assert!(faults[0].starts_with(expected), "{}", faults[0]);
    }
    assert!(outcomes(b"").unwrap_err().to_string().ends_with(" gives no outcomes"));
}

#[test]
fn a_file_that_is_not_there_or_is_a_directory_is_a_matter_of_reading() {
    for path in ["/no/such/file.csv", "/"] {
        let error = read_with(Path::new(path), &Silent).unwrap_err();
        assert!(matches!(error, OutcomeError::Read { .. }), "{error:?}");
        assert!(error.to_string().starts_with(path) && error.faults().is_empty(), "{error}");
    }
}

#[test]
fn impossible_outcomes_are_found_with_their_line_and_no_bad_rows() {
    let read = outcomes(b"end,time\r\nshipped,2\r\nshipped,1\r\nshipped,0\r\n").unwrap();
    assert_eq!(read.audited.tally.replications(), 3);
    let [finding] = read.audited.findings.as_slice() else { panic!("{:?}", read.audited.findings) };
    assert_eq!((finding.end.as_str(), finding.time, finding.line, finding.count), ("shipped", Some(1), Some(3), 2));
}

#[derive(Default)]
struct Watch {
    bytes: AtomicU64,
    ended: AtomicBool,
    stop: bool,
}

impl Progress for Watch {
    fn begin(&self, phase: &str, unit: &str, total: Option<u64>) {
        assert_eq!((phase, unit, total), ("reading outcomes", "bytes", Some(9 + 10 * 20_000)));
    }
    fn advance(&self, done: u64) {
        self.bytes.fetch_add(done, Ordering::Relaxed);
    }
    fn end(&self) {
        self.ended.store(true, Ordering::Relaxed);
    }
    fn interrupted(&self) -> bool {
        self.stop && self.bytes.load(Ordering::Relaxed) > 0
    }
}

#[test]
fn progress_counts_bytes_and_an_interruption_ends_the_reading() {
    let file = file(format!("end,time\n{}", "shipped,2\n".repeat(20_000)).as_bytes());
    let watch = Watch::default();
    assert_eq!(read_with(file.path(), &watch).unwrap().rows, 20_000);
    assert_eq!(watch.bytes.into_inner(), 9 + 10 * 20_000);
    assert!(watch.ended.into_inner());
    let watch = Watch { stop: true, ..Watch::default() };
    assert!(matches!(read_with(file.path(), &watch), Err(OutcomeError::Interrupted)));
    assert!(watch.ended.into_inner());
}

#[test]
fn mutated_files_give_an_answer_or_faults_and_never_a_panic() {
    let good = b"replication,end,time\r\n1,shipped,2\r\n2,\"scrapped\",3.0\r\n\r\n3,shipped,12\r\n".as_slice();
    let pieces: [&[u8]; 9] = [b"\"", b",", b"\n", b"\0", b"\xff", b"e99", b"-", b"18446744073709551615", b"\t"];
    let mut rng = Lcg128CmDxsm64::new(5, 6);
    let mut below = |n: usize| (rng.next_u64() % n as u64) as usize;
    let mutated = (0..1000).map(|_| {
        let mut bytes = good.to_vec();
        for _ in 0..=below(2) {
            let at = below(bytes.len());
            match below(3) {
                0 => bytes[at] ^= 1 << below(8),
                1 => drop(bytes.splice(at..at, pieces[below(pieces.len())].iter().copied())),
                _ => drop(bytes.drain(at..(at + 1 + below(6)).min(bytes.len()))),
            }
            bytes.push(b'\n');
        }
        bytes
    });
    let (mut used, mut refused) = (0, 0);
    for bytes in (0..good.len()).map(|end| good[..end].to_vec()).chain(mutated) {
        match outcomes(&bytes) {
            Ok(read) => {
                assert_eq!(read.rows, read.audited.tally.replications());
                used += 1;
            }
            Err(error) => {
                let OutcomeError::Bad { rows, bad, faults, .. } = error else { panic!("{error:?}") };
                assert!(bad <= rows && faults.len() as u64 == bad.max(1), "{bytes:?}");
                assert!(faults.iter().all(|fault| !fault.text.is_empty() && !fault.remedy.is_empty()));
                refused += 1;
            }
        }
    }
    assert!(used > 100 && refused > 100, "{used} used, {refused} refused");
}
