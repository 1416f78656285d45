//! `loopwright new`: a scenario to start from.

use std::io::{Write, stdout};
use std::path::PathBuf;

use crate::scenario::files::{FileError, write_whole};
use crate::scenario::{Scenario, SeasonDates, Zone, usual_site};
use crate::season::next_season;
use crate::sky::calendar::CivilDate;
use crate::sky::place::Sky;
use crate::sky::{Body, Tt};

use super::CliError;
use super::words::SiteWord;

/// Write a scenario to start from.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright new --subject mars --from 2026-11 --to 2027-06 --site 50.6,10.3,486 --zone Europe/Berlin --out mars.ron
  loopwright new --subject venus --site -35.1,138.6,50 --zone Australia/Adelaide

Without dates the next season of the subject is taken; without --zone the zone of this computer; without --out the text
goes to standard output.")]
pub struct Options {
    /// The planet the season is about.
    #[arg(long, value_name = "BODY")]
    subject: Body,
    /// First day: 2026-11-01, or 2026-11 for the first of the month.
    #[arg(long, value_name = "DATE", requires = "to", allow_hyphen_values = true, value_parser = CivilDate::parse_start)]
    from: Option<CivilDate>,
    /// The day after the last.
    #[arg(long, value_name = "DATE", requires = "from", allow_hyphen_values = true, value_parser = CivilDate::parse_start)]
    to: Option<CivilDate>,
    /// The place: latitude, longitude (east positive) in degrees, metres above the ellipsoid.
    #[arg(long, value_name = "LAT,LON,ELEV_M", allow_hyphen_values = true)]
    site: SiteWord,
    /// The name of the place.
    #[arg(long, value_name = "TEXT", default_value = "Our place")]
    name: String,
    /// Time zone, as in Europe/Berlin, or \"local mean time\".
    #[arg(long, value_name = "ZONE")]
    zone: Option<Zone>,
    /// The file to write; one that is already there is left alone, without --replace.
    #[arg(long, value_name = "FILE")]
    out: Option<PathBuf>,
    /// Replace a file that is already there.
    #[arg(long)]
    replace: bool,
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    if !options.subject.is_inner_planet() && !options.subject.is_outer_planet() {
        return Err(CliError::Words(format!(
            "{} has no season of its own; --subject is a planet, mercury to neptune",
            options.subject
        )));
    }
    let zone = match options.zone {
        Some(zone) => zone,
        None => system_zone()?,
    };
    let asked = &options.site.0;
    let site = usual_site(
        options.name.clone(),
        asked.latitude,
        asked.longitude,
        asked.elevation_m,
    );
    let dates = match (options.from, options.to) {
        (Some(from), Some(to)) if from < to => SeasonDates { from, to },
        (Some(_), Some(_)) => {
            return Err(CliError::Words(String::from(
                "--to must be later than --from",
            )));
        }
        _ => next_dates(options.subject, super::now(), zone, &site)?,
    };
    let scenario = Scenario::new_for(options.subject, dates, site, zone);
    let text = scenario.to_ron()?;
    // What is written here must open again: a season too long or too far away shows now, not later.
    Scenario::from_ron(&text, std::path::Path::new("the new scenario"))?;
    match &options.out {
        None => stdout().lock().write_all(text.as_bytes())?,
        Some(path) => {
            if path.symlink_metadata().is_ok() && !options.replace {
                return Err(CliError::Failed(format!(
                    "{} is already there; choose another name or add --replace",
                    path.display()
                )));
            }
            write_whole(path, text.as_bytes())
                .map_err(|error: FileError| CliError::Failed(error.to_string()))?;
            eprintln!("Scenario written to {}", path.display());
        }
    }
    Ok(())
}

/// The next season of a subject in civil dates, both ends taken to whole days.
fn next_dates(
    subject: Body,
    now: Tt,
    zone: Zone,
    site: &crate::sky::Site,
) -> Result<SeasonDates, CliError> {
    let sky = Sky::for_span(now.plus_days(-500.0), now.plus_days(3_000.0))?;
    let span = next_season(&sky, subject, now)?.ok_or_else(|| {
        CliError::Failed(format!(
            "no season of {subject} is near; give --from and --to"
        ))
    })?;
    let date = |instant: Tt| {
        let utc = sky.tables().utc_from_tt(instant);
        zone.local_from_utc(site.longitude, utc)
            .map(|local| local.date_time.date())
            .map_err(|error| CliError::Failed(error.to_string()))
    };
    let end = date(span.to)?
        .plus_days(1)
        .map_err(|error| CliError::Failed(error.to_string()))?;
    Ok(SeasonDates {
        from: date(span.from)?,
        to: end,
    })
}

/// The zone that this computer is set to: the variable TZ, or where /etc/localtime points.
fn system_zone() -> Result<Zone, CliError> {
    let from_variable = std::env::var("TZ")
        .ok()
        .map(|name| name.trim_start_matches(':').to_owned());
    let from_link = || {
        let target = std::fs::read_link("/etc/localtime").ok()?;
        let text = target.to_str()?.to_owned();
        text.split_once("zoneinfo/")
            .map(|(_, name)| name.to_owned())
    };
    let from_file = || {
        std::fs::read_to_string("/etc/timezone")
            .ok()
            .map(|name| name.trim().to_owned())
    };
    [from_variable, from_link(), from_file()]
        .into_iter()
        .flatten()
        .find_map(|name| name.parse::<Zone>().ok())
        .ok_or_else(|| {
            CliError::Failed(String::from(
                "the time zone of this computer cannot be told; give one with --zone, for example --zone Europe/Berlin",
            ))
        })
}
