//! Finished documents and their writers.
//!
//! **Purpose.** A [`Document`] holds everything that a command found, as plain data. [`write_text`] sets it for people;
//! [`write_json`] writes it for programs.
//!
//! **Limits.** This room formats and computes no statistic. It writes to any sink and knows no terminal.
//!
//! # The JSON document
//! One object. Fields come in this order and are always there; what does not apply is `null` or empty. Counts that can pass
//! 2⁵³ and seeds are decimal strings; an infinite number is the string `"infinity"`. Clock times stand under `when` and
//! `run.seconds` only, all else repeats byte for byte.
//!
//! | field | holds |
//! | --- | --- |
//! | `schema` | `tallystone.check/1`, `tallystone.exact/1`, `tallystone.sample/1`, `tallystone.audit/1` |
//! | `tool` | `name`, `version`, `stream_version` |
//! | `command` | the arguments |
//! | `inputs` | files read: `file`, `sha256`, `rows` and `bad_rows` of outcomes, `ignored_columns` |
//! | `model` | `title`, `sha256` of the chain's meaning, `clock`, `clock_unit`, `states`, `moves`, `ends`, `largest_correction` |
//! | `plan` | `error_rate` spent, `look` in a series of runs, number of `rows`, `power`, `replications` planned, `demanding` row, `seed`, `seed_source` (`default`, `given`, `random`) |
//! | `run` | `replications`, their `steps` together, `shortest` and `longest` of their times, `seconds`, `solver` |
//! | `rows` | see below |
//! | `findings` | impossible outcomes: `end`, `time`, `line` of the first, `count`, `text` |
//! | `not_compared` | `quantity`, `of`, `exact`, `text` |
//! | `verdict` | `agree`, `consistent`, `inconclusive`, `disagree` |
//! | `warnings` | `kind`, `text` |
//! | `cautions` | texts |
//! | `when` | the end of the run, seconds since 1970-01-01 UTC |
//!
//! A row of a check or audit has `quantity`, `of`, `exact`, `exact_low`, `exact_high` (bounds that hold the truth, rounded
//! outwards), `exact_fraction` (not computed by this version), `estimate`, `standard_error`, `low`, `high` and `level` of the
//! confidence interval, `tolerance` (`value`, `kind`, `source`), `method`, `guarantee` (`exact`, `approximate`, `certain`),
//! `p_value`, `p_adjusted`, `verdict`, `replications_needed`, `note`. A row of exact answers ends after `exact_fraction`
//! with a `note`; a row of estimates has `quantity`, `of`, `estimate`, `standard_error`.
//!
//! A refusal is an object with `schema` `tallystone.error/1` and `errors`: `kind`, `file`, `line`, `state`, `value`, `text`,
//! `remedy`.
//!
//! # Example
//! ```
//! use tallystone::report::{Body, Document, Layout, ModelSummary, write_text};
//! use tallystone::sampling::Estimate;
//! use tallystone::model::{Model, Quantity};
//! let model = Model::from_toml(r#"
//!     title = "coin until heads"
//!     start = "tossing"
//!     absorbing = ["heads"]
//!     [moves]
//!     tossing = { heads = 0.5, tossing = 0.5 }
//! "#)?;
//! let estimate = Estimate { quantity: Quantity::MeanTime, estimate: Some(2.01), standard_error: Some(0.02) };
//! let document = Document::new(ModelSummary::of(&model), Body::Sample(vec![estimate]));
//! let mut text = Vec::new();
//! write_text(&document, Layout::default(), &mut text)?;
//! assert!(String::from_utf8(text)?.contains("mean_time"));
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```

mod document;
mod json;
mod number;
mod table;
mod text;
mod words;

pub use document::{Answer, Body, Document, Input, ModelSummary, PlanSummary, Refused, RunSummary, SeedSource};
pub use json::{write_json, write_refusal};
pub use number::{duration, proven, proven_within, rounded, thousands};
pub use text::{Layout, write_text};
pub use words::{shown, wrapped};
