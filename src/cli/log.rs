//! `loopwright log`: what became of a night, into the scenario.

use std::path::PathBuf;

use crate::scenario::{Plan, Scenario};
use crate::season::log::{LogEntry, Outcome};
use crate::sky::Utc;
use crate::sky::calendar::{CivilDate, parse_utc};

use super::CliError;
use super::outings::short_day;

/// Write down what became of a night; the entry goes into the scenario.
#[derive(Debug, clap::Args)]
#[command(after_help = "Example:
  loopwright log my-season.ron --night 2027-02-11 --as shot --at 2027-02-11T21:40:00Z --exposure 8 --file mars-0211.tif

Words: planned, reserve, shot, partly_shot, held (an evening that took place), clouded, skipped. A night is named by the civil
date of its evening. An entry that only planned the night is replaced; any other only with --replace. A scenario written by
hand is kept beside it as .bak; comments in it are lost, remarks stay.")]
pub struct Options {
    /// A scenario file; it is written anew.
    scenario: PathBuf,
    /// The night, by the date of its evening: 2027-02-11.
    #[arg(long, value_name = "DATE", allow_hyphen_values = true)]
    night: CivilDate,
    /// What became of it.
    #[arg(long = "as", value_name = "WORD", value_parser = outcome)]
    outcome: Outcome,
    /// Middle of the exposure or start of the evening: 2027-02-11T21:40:00Z.
    #[arg(long, value_name = "UTC", allow_hyphen_values = true, value_parser = parse_utc)]
    at: Option<Utc>,
    /// Exposure in seconds.
    #[arg(long, value_name = "S", allow_hyphen_values = true)]
    exposure: Option<f64>,
    /// Name of the picture's file.
    #[arg(long, value_name = "NAME")]
    file: Option<String>,
    /// A note.
    #[arg(long, value_name = "TEXT")]
    remark: Option<String>,
    /// Replace what is already logged for that night.
    #[arg(long)]
    replace: bool,
}

fn outcome(text: &str) -> Result<Outcome, String> {
    Outcome::from_word(text).map_err(|error| error.to_string())
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let mut scenario = Scenario::load(&options.scenario)?;
    if scenario.season.is_none() {
        // The next season depends on the clock; an entry belongs to the one meant now.
        check_next_season(&scenario, options.night)?;
    }
    let entry = LogEntry {
        at: options.at,
        exposure_s: options.exposure,
        file: options.file.clone(),
        remark: options.remark.clone(),
        ..LogEntry::new(options.night, options.outcome)
    };
    let failed = |error: crate::season::log::LogError| CliError::Failed(error.to_string());
    scenario
        .log
        .record(entry, options.replace)
        .map_err(failed)?;
    if let Some(season) = scenario.season {
        let last = season
            .to
            .plus_days(-1)
            .map_err(|error| CliError::Failed(error.to_string()))?;
        scenario
            .log
            .check_season(season.from, last)
            .map_err(failed)?;
    }
    scenario
        .log
        .check_times(scenario.site.longitude)
        .map_err(failed)?;
    let backup = scenario.save(&options.scenario)?;
    eprintln!(
        "{} is logged as {} in {}",
        short_day(options.night),
        options.outcome.word(),
        options.scenario.display()
    );
    if let Some(backup) = backup {
        eprintln!("The file as it was is kept as {}", backup.display());
    }
    Ok(())
}

fn check_next_season(scenario: &Scenario, night: CivilDate) -> Result<(), CliError> {
    let plan = Plan::new(scenario.clone(), super::now())?;
    let programme = crate::scenario::programme::Programme::new(&plan)?;
    if programme.season.night(night).is_some() {
        return Ok(());
    }
    Err(CliError::Failed(format!(
        "the log has {night}, which is outside the next season; give the scenario a season with from and to"
    )))
}
