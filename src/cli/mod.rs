//! The command line: one file a command, the same functions as everything else.

use std::ffi::OsString;
use std::process::ExitCode;

/// Runs the program with these words (the first is its own name).
#[must_use]
pub fn run(_words: impl IntoIterator<Item = OsString>) -> ExitCode {
    ExitCode::SUCCESS
}
