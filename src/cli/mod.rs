//! The command line: one file a command, the same functions as everything else.
//!
//! Exit status: 0 done, 1 could not do it, 2 wrong words. Standard output is data only; progress, cautions and errors go to
//! standard error.

mod advise;
mod completions;
mod events;
mod frame;
mod ground;
mod log;
mod new;
mod nights;
mod outings;
mod picks;
mod places;
mod progress;
mod seasons;
mod sheet;
mod window;
pub mod words;
mod year;

use std::ffi::OsString;
use std::io;
use std::path::PathBuf;
use std::process::ExitCode;

use clap::{CommandFactory, FromArgMatches, Parser, Subcommand, ValueEnum};

use crate::scenario::files::FileError;
use crate::scenario::programme::ProgrammeError;
use crate::scenario::{PlanError, ScenarioError};
use crate::sheet::SheetError;
use crate::sheet::table::TableFormat;
use crate::sky::delta_t::TimeTables;
use crate::sky::place::SkyError;
use crate::sky::{Tt, Utc};

/// Plans a planet's season from one place: the loop among the stars, the events, the sheets to hand out.
#[derive(Debug, Parser)]
#[command(name = "loopwright", version, args_conflicts_with_subcommands = true)]
#[command(after_help = "Examples:
  loopwright                                   opens the window; without a display writes the season sheet instead
  loopwright sheet my-season.ron --out print   the sheet of a scenario of yours, in print/
  loopwright new --subject venus --site -35.1,138.6,50 --zone Australia/Adelaide --out venus.ron
  loopwright places --bodies mars --from 2026-11 --to 2027-06 --step 1d
  loopwright events --bodies mars,jupiter --from 2026-11 --to 2027-06
  loopwright year my-season.ron --from 2026-09-01 --format page
  loopwright seasons my-season.ron --from 2026 --to 2061 --want disc,high
  loopwright nights my-season.ron              when the planet is in view, night by night
  loopwright picks my-season.ron --count 6     dates to announce, with reserves and their chances

Never point optics or eyes near the Sun. For work at night follow local rules, and ask qualified people about
lasers, roofs and access to the site.")]
struct Line {
    /// A scenario file; without one the built-in Mars loop of 2026-27.
    scenario: Option<PathBuf>,
    #[command(subcommand)]
    command: Option<Command>,
}

#[derive(Debug, Subcommand)]
enum Command {
    Sheet(sheet::Options),
    New(new::Options),
    Places(places::Options),
    Events(events::Options),
    Year(year::Options),
    Seasons(seasons::Options),
    Nights(nights::Options),
    Picks(picks::Options),
    Advise(advise::Options),
    Frame(frame::Options),
    Log(log::Options),
    Completions(completions::Options),
}

/// How a table is written.
#[derive(Clone, Copy, Debug, Default, ValueEnum)]
enum Format {
    /// Comma-separated values with a header row.
    #[default]
    Csv,
    /// An array of objects, one a row.
    Json,
}

impl From<Format> for TableFormat {
    fn from(format: Format) -> Self {
        match format {
            Format::Csv => TableFormat::Csv,
            Format::Json => TableFormat::Json,
        }
    }
}

/// Why a command could not do its work.
#[derive(Debug, thiserror::Error)]
pub enum CliError {
    /// The words are well formed but ask for something that cannot be.
    #[error("{0}")]
    Words(String),
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error(transparent)]
    Scenario(#[from] ScenarioError),
    #[error(transparent)]
    Plan(#[from] PlanError),
    #[error(transparent)]
    Year(#[from] crate::season::year::YearError),
    #[error(transparent)]
    Programme(#[from] ProgrammeError),
    #[error(transparent)]
    Sheet(#[from] SheetError),
    #[error(transparent)]
    Files(#[from] FileError),
    #[error("{what}: {source}")]
    File { what: String, source: io::Error },
    /// The reader of our output has gone away, as `head` does: not an error to speak of.
    #[error("standard output was closed")]
    ClosedPipe,
    #[error("standard output cannot be written: {0}; redirect it to a file on a disk with room")]
    Output(io::Error),
    #[error("{0}")]
    Failed(String),
}

impl From<io::Error> for CliError {
    /// For errors of standard output; files say which one they mean.
    fn from(error: io::Error) -> Self {
        match error.kind() {
            io::ErrorKind::BrokenPipe => CliError::ClosedPipe,
            _ => CliError::Output(error),
        }
    }
}

/// Runs the program with these words (the first is its own name).
#[must_use]
pub fn run(words: impl IntoIterator<Item = OsString>) -> ExitCode {
    let command = Line::command().long_version(long_version());
    let line = match command
        .try_get_matches_from(words)
        .and_then(|matches| Line::from_arg_matches(&matches))
    {
        Ok(line) => line,
        Err(error) => {
            // Help and version are data; a closed pipe under them is nobody's fault.
            let _ = error.print();
            return ExitCode::from(if error.use_stderr() { 2 } else { 0 });
        }
    };
    let result = match &line.command {
        None => window::run(line.scenario.as_deref()),
        Some(Command::Sheet(options)) => sheet::run(options),
        Some(Command::New(options)) => new::run(options),
        Some(Command::Places(options)) => places::run(options),
        Some(Command::Events(options)) => events::run(options),
        Some(Command::Year(options)) => year::run(options),
        Some(Command::Seasons(options)) => seasons::run(options),
        Some(Command::Nights(options)) => nights::run(options),
        Some(Command::Picks(options)) => picks::run(options),
        Some(Command::Advise(options)) => advise::run(options),
        Some(Command::Frame(options)) => frame::run(options),
        Some(Command::Log(options)) => log::run(options),
        Some(Command::Completions(options)) => completions::run(options),
    };
    match result {
        Ok(()) | Err(CliError::ClosedPipe) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("loopwright: {error}");
            ExitCode::from(if matches!(error, CliError::Words(_)) {
                2
            } else {
                1
            })
        }
    }
}

/// The instant of this computer's clock.
fn now() -> Tt {
    // Seconds between 1970-01-01 0h and 2000-01-01 12h.
    const J2000_UNIX: f64 = 946_728_000.0;
    let since = std::time::SystemTime::now().duration_since(std::time::UNIX_EPOCH);
    // A clock before 1970 is a clock that is not set: the season it leads to is as good as any.
    let seconds = since.map_or(0.0, |since| since.as_secs_f64());
    TimeTables::embedded().tt_from_utc(Utc::from_days((seconds - J2000_UNIX) / 86_400.0))
}

/// The versions of the program and of its data.
fn long_version() -> String {
    let tables = TimeTables::embedded();
    let ephemeris = match crate::sky::ephemeris::Ephemeris::embedded() {
        Ok(ephemeris) => format!(
            "{} (format {}, checksum {:08x})",
            ephemeris.source(),
            ephemeris.version(),
            ephemeris.checksum()
        ),
        Err(error) => error.to_string(),
    };
    format!(
        "{}\nplaces: {ephemeris}\nrotation: {}\nstars: {}\nboundaries: {}",
        env!("CARGO_PKG_VERSION"),
        tables.reach_text(),
        crate::sky::stars::SOURCE,
        crate::sky::constellations::SOURCE,
    )
}
