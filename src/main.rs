//! The `underwind` program.

use std::process::ExitCode;

fn main() -> ExitCode {
    underwind::cli::main()
}
