//! `loopwright completions SHELL`: completion script on standard output.

use clap::CommandFactory;
use clap_complete::{Shell, generate};

use super::{CliError, Line};

/// Print a completion script for a shell.
#[derive(Debug, clap::Args)]
#[command(
    after_help = "Example:\n  loopwright completions bash > ~/.local/share/bash-completion/completions/loopwright"
)]
pub struct Options {
    shell: Shell,
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let mut script = Vec::new();
    generate(
        options.shell,
        &mut Line::command(),
        "loopwright",
        &mut script,
    );
    use std::io::Write;
    std::io::stdout().lock().write_all(&script)?;
    Ok(())
}
