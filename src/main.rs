//! Starts the command line.

use std::process::ExitCode;

fn main() -> ExitCode {
    loopwright::cli::run(std::env::args_os())
}
