//! `loopwright year`: what a house can show on each evening it is open.

use std::io::{BufWriter, Write, stdout};
use std::path::PathBuf;

use clap::ValueEnum;

use crate::scenario::{Scenario, ScenarioError};
use crate::season::NightRules;
use crate::season::year::{House, Watch, Year, year};
use crate::sheet::season_tables::{
    YEAR_BODIES, YEAR_COLUMNS, year_page_heading, year_page_line, year_row,
};
use crate::sheet::table::{TableFormat, TableWriter};
use crate::sky::Angle;
use crate::sky::calendar::CivilDate;
use crate::sky::delta_t::TimeTables;
use crate::sky::place::Sky;

use super::CliError;
use super::words::{bright_zodiac_stars, site_clock};

/// Print every open evening of a year: when each planet and the Moon are in view, how high and how bright, or why not.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright year my-season.ron --from 2026-09-01
  loopwright year --from 2026-09-01 --days 120 --format page

A row for each night that the scenario's weekdays allow, within its hours; its least altitude, skyline, darkness and Moon
rule hold for every body (the Moon is exempt from the Moon rule). Times are of the site's clock; the longest stretch of the
evening is given, and the greatest altitude. Words for what is not in view: daylight, sun (too low, within 15 degrees of
the Sun), low, early and late (in view before or after the hours), skyline, moon (too near it), occulted. The margin names
two planets within 3 degrees, the Moon within 5 of a planet, a bright star within 2, on the open evening that has them
closest.")]
pub struct Options {
    /// A scenario file; without one the built-in Mars loop of 2026-27.
    scenario: Option<PathBuf>,
    /// The first evening, a civil date of the site: 2026-09-01, 2026-09 or 2026.
    #[arg(long, value_name = "DATE", allow_hyphen_values = true)]
    from: String,
    /// How many days from there.
    #[arg(long, value_name = "N", default_value_t = 365, value_parser = clap::value_parser!(u32).range(1..=3_660))]
    days: u32,
    /// Another least altitude than the scenario's, degrees.
    #[arg(long, value_name = "DEG")]
    least_altitude: Option<f64>,
    #[arg(long, value_enum, default_value_t)]
    format: YearFormat,
}

/// How the evenings are written.
#[derive(Clone, Copy, Debug, Default, ValueEnum)]
enum YearFormat {
    /// Comma-separated values with a header row.
    #[default]
    Csv,
    /// An array of objects, one a row.
    Json,
    /// A page to read.
    Page,
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let from = CivilDate::parse_start(&options.from).map_err(|error| {
        CliError::Words(format!("--from: {error}; write for example 2026-09-01"))
    })?;
    let scenario = match &options.scenario {
        Some(path) => Scenario::load(path)?,
        None => Scenario::embedded()?,
    };
    let mut rules = NightRules::from(scenario.conditions.clone());
    rules.sun_distance = scenario.sun_distance;
    if let Some(least) = options.least_altitude {
        if !(0.0..=90.0).contains(&least) {
            return Err(CliError::Words(format!(
                "--least-altitude {least} is outside 0 to 90 degrees"
            )));
        }
        rules.conditions.least_altitude = Angle::from_degrees(least);
    }
    let house = House::on(rules.conditions.weekdays);
    let tables = TimeTables::embedded();
    let utc = scenario
        .zone
        .start_of_day(scenario.site.longitude, from)
        .map_err(ScenarioError::from)?;
    let first = tables.tt_from_utc(utc).plus_days(-3.0);
    let last = first.plus_days(f64::from(options.days) + 6.0);
    let sky = Sky::for_span(first, last)?;
    let clock = site_clock(&scenario, &sky, first, last)?;
    let stars = bright_zodiac_stars(first)?;
    let watch = Watch {
        site: &scenario.site,
        skyline: scenario.skyline.polygon(),
        clock: &clock,
        rules: &rules,
        house: &house,
    };
    let Year { evenings, .. } = year(&sky, watch, &YEAR_BODIES, &stars, from, options.days)?;
    let mut sink = BufWriter::new(stdout().lock());
    let format = match options.format {
        YearFormat::Csv => TableFormat::Csv,
        YearFormat::Json => TableFormat::Json,
        YearFormat::Page => {
            writeln!(sink, "{}", year_page_heading())?;
            for evening in &evenings {
                writeln!(sink, "{}", year_page_line(&sky, &clock, evening))?;
            }
            return Ok(sink.flush()?);
        }
    };
    let mut table = TableWriter::new(sink, YEAR_COLUMNS, format)?;
    for evening in &evenings {
        table.row(&year_row(&sky, &clock, evening))?;
    }
    table.finish()?;
    Ok(())
}
