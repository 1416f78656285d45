//! `loopwright sheet`: the season sheet of a scenario, into a folder.

use std::io::{Write, stdout};
use std::path::{Path, PathBuf};

use crate::scenario::files::{Output, Replace, write_outputs};
use crate::scenario::{Plan, Scenario};
use crate::sheet::season_sheet;

use super::CliError;
use super::progress::Progress;

/// Write the season sheet: strip chart as SVG and PNG, events and daily places as CSV; the brief goes to standard output.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright sheet
  loopwright sheet my-season.ron --out print

Files that this program wrote and nobody changed since are replaced; others are not, without --replace.")]
pub struct Options {
    /// A scenario file; without one the built-in Mars loop of 2026-27.
    scenario: Option<PathBuf>,
    /// The folder to write into; it is made if it is missing.
    #[arg(long, value_name = "DIR", default_value = DEFAULT_FOLDER)]
    out: PathBuf,
    /// Replace files of yours, too.
    #[arg(long)]
    replace: bool,
}

const DEFAULT_FOLDER: &str = "season-sheet";

/// What the program does when no command is named.
pub(super) fn run_default(scenario: Option<&Path>) -> Result<(), CliError> {
    write(scenario, Path::new(DEFAULT_FOLDER), Replace::OnlyOurs)
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let replace = if options.replace {
        Replace::Everything
    } else {
        Replace::OnlyOurs
    };
    write(options.scenario.as_deref(), &options.out, replace)
}

fn write(scenario: Option<&Path>, folder: &Path, replace: Replace) -> Result<(), CliError> {
    let mut progress = Progress::new("season sheet");
    let scenario = match scenario {
        Some(path) => Scenario::load(path)?,
        None => Scenario::embedded()?,
    };
    let plan = Plan::new(scenario, super::now())?;
    progress.at(0.5);
    let sheet = season_sheet(&plan)?;
    let outputs: Vec<Output<'_>> = sheet
        .files
        .iter()
        .map(|(name, bytes)| Output { name, bytes })
        .collect();
    write_outputs(folder, &outputs, replace)?;
    drop(progress);
    let mut out = stdout().lock();
    out.write_all(sheet.brief.as_bytes())?;
    out.flush()?;
    let names: Vec<&str> = sheet.files.iter().map(|(name, _)| *name).collect();
    eprintln!(
        "Season sheet written to {}: {}",
        folder.display(),
        names.join(", ")
    );
    Ok(())
}
