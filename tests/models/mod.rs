//! One bench for refurbishing field radios, written in every form that a model can have.

/// As a model file.
pub(crate) const TOML: &str = r#"title = "Field-radio refurbishing bench"
clock_unit = "shift"
start = "intake"
absorbing = ["shipped", "scrapped"]
compare = ["absorption_probability:shipped", "mean_time", "law"]

[moves]
intake = { test = 0.92, scrapped = "rest" }
test = { repair = "5/12", burn-in = "rest", shipped = 0.25 }
repair = { test = 0.7, repair = 0.2, scrapped = "1/10" }
burn-in = { shipped = 1 }

[groups]
over = ["shipped", "scrapped"]

[tolerance]
mean_time = "1 %"

[tolerance.absorption_probability]
default = 0.005
shipped = 0.001
"#;

/// As a list of moves.
pub(crate) const MOVES: &str = "\
from,to,probability
intake,test,0.92
intake,scrapped,rest
test,repair,5/12
test,burn-in,rest
test,shipped,0.25
repair,test,0.7
repair,repair,0.2
repair,scrapped,1/10
burn-in,shipped,1
";

/// As a square table, with the states in the order of [`TOML`].
pub(crate) const SQUARE: &str = "\
,intake,test,repair,burn-in,shipped,scrapped
intake,,0.92,,,,0.08
test,,,5/12,1/3,0.25,
repair,,0.7,0.2,,,0.1
burn-in,,,,,1,
shipped,,,,,1,
scrapped,,,,,,1
";
