//! The kinds of model file, and how they are told apart.

use std::ffi::OsStr;
use std::path::Path;

use super::{matrix_market, npy};

/// What a model is written as.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    /// A model file.
    Toml,
    /// A list of moves or a square table (CSV).
    Table,
    /// A sparse matrix.
    MatrixMarket,
    /// A dense array.
    Npy,
}

impl Kind {
    /// Of a file: a matrix by its beginning or its name, a model file by its name, and a table otherwise.
    pub(super) fn of_file(path: &Path, head: &[u8]) -> Self {
        let is = |end: &str| path.extension().and_then(OsStr::to_str).is_some_and(|own| own.eq_ignore_ascii_case(end));
        match matrix(head) {
            Some(kind) => kind,
            None if is("toml") => Self::Toml,
            None if is("mtx") => Self::MatrixMarket,
            None if is("npy") => Self::Npy,
            None => Self::Table,
        }
    }

    /// Of a stream without a name. Its first line that is neither blank nor a comment decides: `[` at its beginning, or an
    /// `=` before any comma and semicolon, makes a model file.
    pub(super) fn of_stream(head: &[u8]) -> Self {
        if let Some(kind) = matrix(head) {
            return kind;
        }
        let says_something = |line: &&[u8]| line.first().is_some_and(|first| *first != b'#');
        let first = without_mark(head).split(|byte| *byte == b'\n').map(<[u8]>::trim_ascii).find(says_something);
        let first = first.unwrap_or_default();
        let sign = first.iter().find(|byte| b"=,;".contains(byte));
        if first.starts_with(b"[") || sign == Some(&b'=') { Self::Toml } else { Self::Table }
    }
}

fn matrix(head: &[u8]) -> Option<Kind> {
    if head.starts_with(npy::MAGIC) {
        Some(Kind::Npy)
    } else if without_mark(head).starts_with(matrix_market::BANNER.as_bytes()) {
        Some(Kind::MatrixMarket)
    } else {
        None
    }
}

/// A text without the byte-order mark that some programs put before it.
pub(super) fn without_mark(text: &[u8]) -> &[u8] {
    text.strip_prefix(b"\xef\xbb\xbf").unwrap_or(text)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_stream_is_known_by_its_beginning() {
        for (head, kind) in [
            ("", Kind::Table),
            ("from,to,probability\n", Kind::Table),
            ("# a = b\n\n;S=0;S=1\n", Kind::Table),
            ("\u{feff}# note\r\n start = { a = 0.5, b = \"rest\" }\r\n", Kind::Toml),
            ("[moves]\na = { b = 1 }\n", Kind::Toml),
            ("title\t= \"one, two\"\n", Kind::Toml),
            ("%%MatrixMarket matrix coordinate real general\n", Kind::MatrixMarket),
        ] {
            assert_eq!(Kind::of_stream(head.as_bytes()), kind, "{head}");
        }
        assert_eq!(Kind::of_stream(b"\x93NUMPY\x01\x00"), Kind::Npy);
    }

    #[test]
    fn a_file_is_known_by_its_name_unless_it_begins_as_a_matrix() {
        for (name, head, kind) in [
            ("a.toml", "a,b", Kind::Toml),
            ("a.TOML", "", Kind::Toml),
            ("a.csv", "start = 1", Kind::Table),
            ("a", "start = 1", Kind::Table),
            ("a.mtx", "", Kind::MatrixMarket),
            ("a.Npy", "", Kind::Npy),
            ("a.txt", "%%MatrixMarket", Kind::MatrixMarket),
        ] {
            assert_eq!(Kind::of_file(Path::new(name), head.as_bytes()), kind, "{name}");
        }
    }
}
