//! The command-line program: parse, run, exit.

fn main() -> std::process::ExitCode {
    tallystone::cli::main()
}
