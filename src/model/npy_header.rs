//! The header of an array file: its version, and what its numbers are, as a literal dictionary of Python.

use std::fmt::Write;
use std::io::Read;

use super::fault::FaultKind;
use super::npy::{MAGIC, Problem};

/// A longer header describes no square array of numbers.
const LONGEST: usize = 1 << 16;

/// What the header says.
#[derive(Debug, Clone, Copy)]
pub(super) struct Header {
    /// Rows, and columns.
    pub(super) states: u32,
    /// Whether cells stand column by column (Fortran order).
    pub(super) is_by_column: bool,
    pub(super) scalar: Scalar,
}

/// The form of a number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Scalar {
    form: Form,
    size: usize,
    is_big_endian: bool,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Form {
    Float,
    Signed,
    Unsigned,
}

impl Scalar {
    /// Reads a type such as `<f8`.
    fn parse(text: &str) -> Option<Self> {
        let mut signs = text.chars();
        let order = signs.next()?;
        let form = match signs.next()? {
            'f' => Form::Float,
            'i' => Form::Signed,
            'u' => Form::Unsigned,
            _ => return None,
        };
        let size = match (signs.as_str(), form) {
            ("1", Form::Signed | Form::Unsigned) => 1,
            ("2", Form::Signed | Form::Unsigned) => 2,
            ("4", _) => 4,
            ("8", _) => 8,
            _ => return None,
        };
        // A single byte has no order.
        (matches!(order, '<' | '>') || order == '|' && size == 1).then_some(Self {
            form,
            size,
            is_big_endian: order == '>',
        })
    }

    /// Bytes of a number.
    pub(super) fn size(self) -> usize {
        self.size
    }

    /// Whether it is zero, either one.
    pub(super) fn is_zero(self, bytes: &[u8]) -> bool {
        let bits = self.bits(bytes);
        bits == 0 || self.form == Form::Float && bits == 1 << (8 * self.size - 1)
    }

    /// Writes the number as text: the shortest decimal that reads back as it.
    pub(super) fn write(self, bytes: &[u8], out: &mut String) {
        let bits = self.bits(bytes);
        // Writing to a text cannot fail.
        let _written = match (self.form, self.size) {
            (Form::Float, 4) => write!(out, "{:?}", f32::from_bits(bits as u32)),
            (Form::Float, _) => write!(out, "{:?}", f64::from_bits(bits)),
            (Form::Unsigned, _) => write!(out, "{bits}"),
            // Shifted up and down again, the sign fills the upper bits.
            (Form::Signed, size) => write!(out, "{}", ((bits << (64 - 8 * size)) as i64) >> (64 - 8 * size)),
        };
    }

    fn bits(self, bytes: &[u8]) -> u64 {
        let join = |bits, byte: &u8| bits << 8 | u64::from(*byte);
        if self.is_big_endian { bytes.iter().fold(0, join) } else { bytes.iter().rev().fold(0, join) }
    }
}

/// Reads the header.
pub(super) fn header(source: &mut impl Read) -> Result<Header, Problem> {
    let problem = |kind, said: &str, value: &str, remedy| Problem {
        kind,
        said: said.to_owned(),
        value: (!value.is_empty()).then(|| value.to_owned()),
        remedy,
    };
    let cut =
        |_| problem(FaultKind::Shape, "the file ends within its header", "", "check that it was written to its end");
    let mut magic = Vec::new();
    // An input always reads; see there.
    let _length = source.by_ref().take(MAGIC.len() as u64).read_to_end(&mut magic);
    if magic != MAGIC {
        let said = "the file does not begin as an array file of NumPy does";
        return Err(problem(
            FaultKind::Syntax,
            said,
            &String::from_utf8_lossy(&magic),
            "store one array with numpy.save",
        ));
    }
    let mut version = [0; 2];
    source.read_exact(&mut version).map_err(cut)?;
    let mut length = [0; 4];
    match version {
        [1, 0] => source.read_exact(&mut length[..2]),
        [2 | 3, 0] => source.read_exact(&mut length),
        [major, minor] => {
            let said = format!("version {major}.{minor} of the format is not read");
            return Err(problem(
                FaultKind::Unsupported,
                &said,
                &format!("{major}.{minor}"),
                "store it in version 1.0 to 3.0",
            ));
        }
    }
    .map_err(cut)?;
    let length = u32::from_le_bytes(length) as usize;
    if length > LONGEST {
        let said = format!("the header has {length} bytes, more than {LONGEST}");
        return Err(problem(FaultKind::OutOfRange, &said, &length.to_string(), "store a plain array of numbers"));
    }
    let mut text = vec![0; length];
    source.read_exact(&mut text).map_err(cut)?;
    let text = String::from_utf8_lossy(&text);
    let unreadable = || {
        let said = "the header is no dictionary of descr, fortran_order and shape";
        problem(FaultKind::Syntax, said, text.trim(), "store one array with numpy.save")
    };
    let fields = dictionary(&text).ok_or_else(unreadable)?;
    let field = |name: &str| {
        let mut values = fields.iter().filter(|(key, _)| *key == name).map(|(_, value)| *value);
        values.next().filter(|_| values.next().is_none()).ok_or_else(unreadable)
    };
    let (descr, order, shape) = (field("descr")?, field("fortran_order")?, field("shape")?);
    if fields.len() != 3 {
        return Err(unreadable());
    }
    let Some(scalar) = quoted(descr).and_then(Scalar::parse) else {
        let said = format!("cells of the type {descr} are not read");
        return Err(problem(FaultKind::Unsupported, &said, descr, "store the array as float64"));
    };
    let is_by_column = match order {
        "True" => true,
        "False" => false,
        _ => return Err(unreadable()),
    };
    let sides: Option<Vec<u64>> = shape
        .strip_prefix('(')
        .and_then(|shape| shape.strip_suffix(')'))
        .map(|sides| sides.trim().trim_end_matches(','))
        .and_then(|sides| sides.split(',').map(|side| side.trim().parse().ok()).collect());
    match sides.as_deref() {
        Some([rows, columns]) if rows == columns && *rows < u64::from(u32::MAX) => {
            Ok(Header { states: *rows as u32, is_by_column, scalar })
        }
        _ => {
            let said = format!("an array of the shape {shape} is no square table");
            Err(problem(FaultKind::Shape, &said, shape, "store an array with one row and one column a state"))
        }
    }
}

/// The entries of a dictionary as written. Values are texts, words, or anything between brackets.
fn dictionary(text: &str) -> Option<Vec<(&str, &str)>> {
    let mut left = text.trim().strip_prefix('{')?.strip_suffix('}')?.trim();
    let mut entries = Vec::new();
    while !left.is_empty() {
        let (key, after) = left.split_once(':')?;
        let after = after.trim_start();
        let (value, after) = after.split_at(value_length(after));
        entries.push((quoted(key.trim())?, value.trim()));
        left = match after.strip_prefix(',') {
            Some(after) => after.trim_start(),
            None if after.is_empty() => after,
            None => return None,
        };
    }
    Some(entries)
}

/// Bytes up to the comma that ends a value.
fn value_length(text: &str) -> usize {
    let (mut depth, mut quote) = (0u32, None);
    for (at, sign) in text.char_indices() {
        match sign {
            _ if quote == Some(sign) => quote = None,
            _ if quote.is_some() => {}
            '\'' | '"' => quote = Some(sign),
            '(' | '[' | '{' => depth += 1,
            ')' | ']' | '}' => depth = depth.saturating_sub(1),
            ',' if depth == 0 => return at,
            _ => {}
        }
    }
    text.len()
}

fn quoted(text: &str) -> Option<&str> {
    ['\'', '"'].iter().find_map(|quote| text.strip_prefix(*quote)?.strip_suffix(*quote))
}
