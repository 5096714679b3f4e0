//! (to come)

/// Runs the program.
pub fn main() -> std::process::ExitCode {
    todo!()
}
