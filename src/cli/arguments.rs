//! The arguments as typed.

use std::path::PathBuf;

use clap::{ArgGroup, Args, Parser, Subcommand, ValueEnum};

use crate::compare::MOST_LOOKS;
use crate::model::{Number, Quantity, Tolerance, ToleranceKey};

/// More threads than any machine has cores only stand in each other's way.
const MOST_THREADS: i64 = 1024;

/// Seeds are fixed unless the user says otherwise, so that a build gate does not flap.
pub(super) const DEFAULT_SEED: u64 = 1;

#[derive(Debug, Parser)]
#[command(
    name = "tallystone",
    version,
    about = "Checks that a stochastic simulation computes what its model says",
    long_about = "Checks that a stochastic simulation computes what its model says: exact answers of a Markov chain with proven \
                  bounds, a sampled run of the same chain, and a comparison at one stated error rate; for this program's own \
                  sampler (check) and for outcomes of yours (audit).",
    after_help = EXIT_STATUSES,
    arg_required_else_help = true,
    subcommand_required = true,
    max_term_width = 100
)]
pub(super) struct Arguments {
    #[command(subcommand)]
    pub(super) command: Command,
}

pub(super) const EXIT_STATUSES: &str = "\
Exit status: 0 agree or consistent, or the command simply worked; 1 disagree; 2 usage; 3 not decided; \
65 bad input data; 70 internal error; 74 input/output failure; 130 interrupted; 143 terminated.";

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Compare exact answers with a sampled run of the same model
    #[command(after_help = EXIT_STATUSES)]
    Check(Check),
    /// Print the exact answers with their proven bounds
    #[command(after_help = EXIT_STATUSES)]
    Exact(Exact),
    /// Run the sampler alone, and keep its outcomes if asked
    #[command(after_help = EXIT_STATUSES)]
    Sample(Sample),
    /// Compare the outcomes of your own simulator with the exact answers
    #[command(after_help = EXIT_STATUSES)]
    Audit(Audit),
    /// Write an example model and outcome files of a right and a wrong simulator
    #[command(after_help = EXIT_STATUSES)]
    Demo(Demo),
}

#[derive(Debug, Args)]
#[command(group(ArgGroup::new("what").required(true).args(["models", "demo"])))]
pub(super) struct Check {
    /// Model files: TOML, a table of moves (CSV) or a matrix (.mtx, .npy); "-" is standard input. One is checked after the
    /// other, and the worst verdict counts
    #[arg(value_name = "MODEL")]
    pub(super) models: Vec<PathBuf>,
    /// Check the built-in example model, a field-radio refurbishing bench
    // The example has its own start and ends; what would be ignored is refused.
    #[arg(long, conflicts_with_all = ["start", "absorbing", "state_names", "transpose", "rescale_rows"])]
    pub(super) demo: bool,
    #[command(flatten)]
    pub(super) reading: Reading,
    #[command(flatten)]
    pub(super) comparing: Comparing,
    #[command(flatten)]
    pub(super) sampling: Sampling,
    /// Longest predicted run that is started, such as 90s, 15m or 2h [default: 10m for runs that size themselves]
    #[arg(long, value_name = "TIME", value_parser = seconds)]
    pub(super) time_limit: Option<f64>,
    #[command(flatten)]
    pub(super) output: Output,
}

#[derive(Debug, Args)]
pub(super) struct Exact {
    /// The model file: TOML, a table of moves (CSV) or a matrix (.mtx, .npy); "-" is standard input
    #[arg(value_name = "MODEL")]
    pub(super) model: PathBuf,
    #[command(flatten)]
    pub(super) reading: Reading,
    /// Answer this instead of the default list, such as mean_time or survival_probability:20; repeatable
    #[arg(long = "quantity", value_name = "NAME[:ARG]", value_parser = quantity)]
    pub(super) quantities: Vec<Quantity>,
    #[command(flatten)]
    pub(super) output: Output,
}

#[derive(Debug, Args)]
pub(super) struct Sample {
    /// The model file: TOML, a table of moves (CSV) or a matrix (.mtx, .npy); "-" is standard input
    #[arg(value_name = "MODEL")]
    pub(super) model: PathBuf,
    #[command(flatten)]
    pub(super) reading: Reading,
    #[command(flatten)]
    pub(super) sampling: Sampling,
    /// Write the tally, exact sums over all replications, as text; "-" writes it to standard output in place of the table
    #[arg(long, value_name = "FILE")]
    pub(super) write_tally: Option<PathBuf>,
    /// Write every outcome as CSV with the columns replication, end, time; one thread does that
    #[arg(long, value_name = "FILE")]
    pub(super) write_outcomes: Option<PathBuf>,
    #[command(flatten)]
    pub(super) output: Output,
}

#[derive(Debug, Args)]
pub(super) struct Audit {
    /// The model file: TOML, a table of moves (CSV) or a matrix (.mtx, .npy); "-" is standard input
    #[arg(value_name = "MODEL")]
    pub(super) model: PathBuf,
    /// Outcomes of your simulator: CSV with the columns end and time, optionally replication; "-" is standard input
    #[arg(long, value_name = "FILE", required = true)]
    pub(super) outcomes: PathBuf,
    #[command(flatten)]
    pub(super) reading: Reading,
    #[command(flatten)]
    pub(super) comparing: Comparing,
    #[command(flatten)]
    pub(super) output: Output,
}

#[derive(Debug, Args)]
pub(super) struct Demo {
    /// Directory to write to; it is made if it does not exist, and files in it are never overwritten
    #[arg(value_name = "DIR")]
    pub(super) directory: PathBuf,
}

/// How the model is read.
#[derive(Debug, Args)]
#[command(next_help_heading = "Model")]
pub(super) struct Reading {
    /// Start every replication in this state, instead of the start that the file gives
    #[arg(long, value_name = "STATE")]
    pub(super) start: Option<String>,
    /// A state that is absorbing although the table has no row for it; repeatable
    #[arg(long, value_name = "STATE")]
    pub(super) absorbing: Vec<String>,
    /// File with the names of the states of a matrix, one a line [default: the numbers of its rows]
    #[arg(long, value_name = "FILE")]
    pub(super) state_names: Option<PathBuf>,
    /// The table lists moves from column to row; in a list of moves, from and to change places
    #[arg(long)]
    pub(super) transpose: bool,
    /// Divide rows by their sum, with a warning, where it differs from 1 by no more than this, such as 1e-6; rows that differ
    /// by no more than 1e-9 are corrected without it
    #[arg(long, value_name = "LIMIT", value_parser = number)]
    pub(super) rescale_rows: Option<Number>,
    /// Whether warnings about the model let the work go on
    #[arg(long, value_name = "WHAT", default_value = "allow")]
    pub(super) warnings: Warnings,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Warnings {
    /// Print them and go on
    Allow,
    /// Stop with status 65
    Refuse,
}

/// What is compared, and how strictly.
#[derive(Debug, Args)]
#[command(next_help_heading = "Comparison")]
pub(super) struct Comparing {
    /// Probability, at most, that any row of the table is wrongly judged
    #[arg(long, value_name = "RATE", default_value_t = 0.01, value_parser = probability)]
    pub(super) error_rate: f64,
    /// Probability of deciding every row, if there is no difference, for which a run sizes itself
    #[arg(long, value_name = "POWER", default_value_t = 0.95, value_parser = probability)]
    pub(super) power: f64,
    /// Compare this instead of the default rows, such as mean_time or time_quantile:0.9; repeatable
    #[arg(long = "quantity", value_name = "NAME[:ARG]", value_parser = quantity)]
    pub(super) quantities: Vec<Quantity>,
    /// Difference that a row with a tolerance of 0 must be able to see [default: the default tolerance]; repeatable
    #[arg(long = "detectable", value_name = "NAME[:ARG]=VALUE", value_parser = tolerance)]
    pub(super) detectable: Vec<(ToleranceKey, Tolerance)>,
    /// Number of this look at a planned series of ever larger runs; look J spends the error rate over 2^J
    #[arg(long, value_name = "J", value_parser = clap::value_parser!(u32).range(1..=i64::from(MOST_LOOKS)))]
    pub(super) look: Option<u32>,
    /// A difference that does not matter: 0.005 is absolute, "1 %" relative; repeatable
    #[arg(long = "tolerance", value_name = "NAME[:ARG]=VALUE", value_parser = tolerance)]
    pub(super) tolerances: Vec<(ToleranceKey, Tolerance)>,
}

/// How much is sampled, and from which seed.
#[derive(Debug, Args)]
#[command(next_help_heading = "Sampling")]
pub(super) struct Sampling {
    /// Number of replications [default: as many as decide every row; 100,000 for sample]
    #[arg(long, value_name = "N", value_parser = count)]
    pub(super) replications: Option<u64>,
    /// Seed of the random streams, or "random"; one seed repeats one draw of luck, so vary it before drawing conclusions
    /// from many runs [default: 1]
    #[arg(long, value_name = "N|random", value_parser = seed)]
    pub(super) seed: Option<Seed>,
    /// Number of threads; the outcomes are the same for any [default: one a core]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=MOST_THREADS))]
    pub(super) threads: Option<u16>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Seed {
    Fixed(u64),
    Random,
}

/// Where results go.
#[derive(Debug, Clone, Args)]
#[command(next_help_heading = "Output")]
pub(super) struct Output {
    /// Write the whole result as JSON; "-" writes it to standard output in place of the table
    #[arg(long, value_name = "FILE")]
    pub(super) json: Option<PathBuf>,
    /// Print no table
    #[arg(long)]
    pub(super) quiet: bool,
    /// When to colour verdicts; NO_COLOR in the environment is honoured
    #[arg(long, value_name = "WHEN", default_value = "auto")]
    pub(super) color: When,
    /// When to show progress on standard error
    #[arg(long, value_name = "WHEN", default_value = "auto")]
    pub(super) progress: Shown,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum When {
    /// On a terminal
    Auto,
    /// Everywhere
    Always,
    /// Nowhere
    Never,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Shown {
    /// On a terminal
    Auto,
    /// Nowhere
    Never,
}

fn quantity(text: &str) -> Result<Quantity, String> {
    Quantity::parse(text).map_err(|fault| fault.to_string())
}

fn tolerance(text: &str) -> Result<(ToleranceKey, Tolerance), String> {
    let (name, value) = text
        .rsplit_once('=')
        .ok_or("there is no `=`; write NAME=VALUE or NAME:ARG=VALUE, such as mean_time=\"1 %\"")?;
    let key = ToleranceKey::parse(name).map_err(|fault| fault.to_string())?;
    let value = Tolerance::parse(value).map_err(|text| format!("{text}; write 0.005 or \"1 %\""))?;
    Ok((key, value))
}

fn number(text: &str) -> Result<Number, String> {
    Number::parse(text).map_err(|fault| format!("it {fault}; give a number such as 1e-6"))
}

fn probability(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(p) if p > 0.0 && p < 1.0 => Ok(p),
        _ => Err("give a number between 0 and 1, such as 0.01".to_owned()),
    }
}

fn count(text: &str) -> Result<u64, String> {
    let digits: String = text.chars().filter(|c| !matches!(c, '_' | ',')).collect();
    match digits.parse::<u64>() {
        Ok(n) if (1..=1 << 53).contains(&n) => Ok(n),
        _ => Err("give a whole number from 1 to 9007199254740992".to_owned()),
    }
}

fn seed(text: &str) -> Result<Seed, String> {
    match text {
        "random" => Ok(Seed::Random),
        _ => text
            .parse()
            .map(Seed::Fixed)
            .map_err(|_| "give a whole number from 0 to 18446744073709551615, or the word random".to_owned()),
    }
}

fn seconds(text: &str) -> Result<f64, String> {
    let (digits, unit) = match text.char_indices().last() {
        Some((at, 's')) => (&text[..at], 1.0),
        Some((at, 'm')) => (&text[..at], 60.0),
        Some((at, 'h')) => (&text[..at], 3600.0),
        _ => (text, 1.0),
    };
    match digits.parse::<f64>() {
        Ok(value) if value > 0.0 && value.is_finite() => Ok(value * unit),
        _ => Err("give a time above zero in seconds, or with a unit: 90s, 15m, 2h".to_owned()),
    }
}

#[cfg(test)]
mod tests {
    use clap::CommandFactory;

    use super::*;

    #[test]
    fn the_arguments_are_consistent() {
        Arguments::command().debug_assert();
    }

    #[test]
    fn values_are_read_or_refused_with_a_remedy() {
        assert_eq!(seconds("90s"), Ok(90.0));
        assert_eq!(seconds("1.5m"), Ok(90.0));
        assert_eq!(seconds("2h"), Ok(7200.0));
        assert!(seconds("-1").is_err() && seconds("").is_err() && seconds("infm").is_err() && seconds("5é").is_err());
        assert_eq!(count("1_000,000"), Ok(1_000_000));
        assert!(count("0").is_err() && count("1e6").is_err());
        assert_eq!(seed("random"), Ok(Seed::Random));
        assert!(seed("-1").is_err());
        assert!(probability("1").is_err() && probability("nan").is_err());
        assert!(tolerance("mean_time").unwrap_err().contains('='));
        assert!(tolerance("mean_tim=1").unwrap_err().contains("mean_time"));
        let (key, value) = tolerance("absorption_probability=0.01").unwrap();
        assert_eq!((key, value), (ToleranceKey::All("absorption_probability".into()), Tolerance::Absolute(0.01)));
    }
}
