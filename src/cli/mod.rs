//! The command line: arguments as typed, settings as checked, one file a command, exit statuses.
//!
//! **Purpose.** Only this room knows the arguments, the environment, the terminal and the exit statuses. Each command reads
//! like a table of contents: read, solve, sample, compare, write.
//!
//! **Limits.** It computes nothing. Results go to standard output or to files that appear whole or not at all; warnings,
//! progress and errors go to standard error.
//!
//! ```no_run
//! // The whole program.
//! let status: std::process::ExitCode = tallystone::cli::main();
//! ```

mod arguments;
mod audit;
mod check;
mod demo;
mod exact;
mod failure;
mod output;
mod progress;
mod sample;
mod signals;
mod steps;

use std::io::{self, IsTerminal};
use std::panic::{self, AssertUnwindSafe};
use std::process::ExitCode;

use clap::Parser;

use arguments::{Arguments, Command, Output, Shown};
use failure::{Failure, status};
use progress::Watch;
use signals::Stop;

use crate::model::Progress;

/// What every command has at hand.
struct Session {
    watch: Watch,
    /// The arguments, for the record.
    command: Vec<String>,
}

/// Runs the program on the arguments of the process.
pub fn main() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            // Help and version are no errors; a terminal that is gone is no matter.
            let _printed = error.print();
            if !error.use_stderr() {
                return ExitCode::from(status::WORKED);
            }
            output::deliver_usage_error(&error.to_string());
            return ExitCode::from(status::USAGE);
        }
    };
    ExitCode::from(run(&arguments.command))
}

fn run(command: &Command) -> u8 {
    let output = output_of(command);
    let is_shown = io::stderr().is_terminal() && output.is_some_and(|output| output.progress == Shown::Auto);
    let stop = match Stop::listen() {
        Ok(stop) => stop,
        Err(error) => {
            output::complain("error", &format!("signals cannot be handled: {error}; run it again"));
            return status::INTERNAL;
        }
    };
    let session = Session {
        watch: Watch::new(is_shown, stop.clone()),
        command: std::env::args_os().skip(1).map(|argument| argument.to_string_lossy().into_owned()).collect(),
    };
    let done = panic::catch_unwind(AssertUnwindSafe(|| match command {
        Command::Check(arguments) => check::run(arguments, &session),
        Command::Exact(arguments) => exact::run(arguments, &session),
        Command::Sample(arguments) => sample::run(arguments, &session),
        Command::Audit(arguments) => audit::run(arguments, &session),
        Command::Demo(arguments) => demo::run(arguments, &session),
    }));
    let failure = match done {
        Ok(Ok(status)) => return status,
        Ok(Err(failure)) => failure,
        Err(_) => Failure::Internal(failure::refused(
            "internal",
            "this program has failed, as the message above says",
            "please report it with the model and the arguments",
        )),
    };
    tell(&failure, &session, output);
    failure.status(stop.is_termination())
}

/// Says why, on standard error and, if JSON was asked for there, on standard output.
fn tell(failure: &Failure, session: &Session, output: Option<&Output>) {
    // A phase that failed has left its bar on the screen.
    session.watch.end();
    failure.reasons().iter().for_each(|reason| output::complain("error", &failure::line(reason)));
    if let Failure::Interrupted(text) = failure {
        output::complain("stopped", text);
    }
    // A second failure while telling of the first has nobody to tell.
    let _delivered = output::deliver_refusal(failure.reasons(), output);
}

fn output_of(command: &Command) -> Option<&Output> {
    match command {
        Command::Check(arguments) => Some(&arguments.output),
        Command::Exact(arguments) => Some(&arguments.output),
        Command::Sample(arguments) => Some(&arguments.output),
        Command::Audit(arguments) => Some(&arguments.output),
        Command::Demo(_) => None,
    }
}
