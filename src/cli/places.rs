//! `loopwright places`: where bodies stand at given instants.

use std::io::{BufWriter, Read, stdout};
use std::path::PathBuf;

use crate::scenario::DEFAULT_SUN_DISTANCE;
use crate::sheet::table::TableWriter;
use crate::sheet::tables::{PLACE_COLUMNS, place_row};
use crate::sky::Tt;
use crate::sky::place::{Sky, SkyError};

use super::progress::Progress;
use super::words::{self, InstantWord, SiteWord, StepWord};
use super::{CliError, Format};

/// Print places of bodies: coordinates, distances, elongation, phase, magnitude.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright places --bodies mars --from 2026-11-01 --to 2027-06-01 --step 1d
  loopwright places --bodies venus,moon --from 2026-12-24T16:00:00Z --to 2026-12-24T18:00:00Z --step 10min --site -35.1,138.6,50
  loopwright places --bodies all --instants instants.txt --format json

Right ascension, declination, longitude and latitude are apparent, of the true equator, equinox and ecliptic of date;
geocentric without --site, topocentric with it. distance_au is the light-time distance. altitude_deg is unrefracted.")]
pub struct Options {
    /// Bodies, separated by commas; \"planets\" and \"all\" are understood.
    #[arg(long, value_name = "LIST")]
    bodies: String,
    /// First instant: 2026-11-01, 2026-11, 2026-11-01T18:30:00Z or "JD 2461000.5 TT".
    #[arg(
        long,
        value_name = "T",
        requires = "to",
        required_unless_present = "instants",
        allow_hyphen_values = true
    )]
    from: Option<InstantWord>,
    /// End of the span, which does not belong to it.
    #[arg(long, value_name = "T", requires = "from", allow_hyphen_values = true)]
    to: Option<InstantWord>,
    /// Step: 1d, 6h, 10min, 30s.
    #[arg(
        long,
        value_name = "STEP",
        default_value = "1d",
        allow_hyphen_values = true
    )]
    step: StepWord,
    /// A file with one instant a line, or - for standard input; rows come out in its order.
    #[arg(long, value_name = "FILE", conflicts_with_all = ["from", "to", "step"])]
    instants: Option<PathBuf>,
    /// The observer's place: latitude, longitude (east positive) in degrees, metres above the ellipsoid.
    #[arg(long, value_name = "LAT,LON,ELEV_M", allow_hyphen_values = true)]
    site: Option<SiteWord>,
    #[arg(long, value_enum, default_value_t)]
    format: Format,
}

/// Largest file of instants that is read: two million of them.
const LARGEST_FILE: u64 = 64 << 20;

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let bodies = words::bodies(&options.bodies).map_err(CliError::Words)?;
    let site = options.site.as_ref().map(|word| &word.0);
    let mut skies = Skies::default();
    let sink = BufWriter::new(stdout().lock());
    // The header waits for the first row, so that wrong words leave standard output empty.
    let mut table: Option<TableWriter<_>> = None;
    let mut sink = Some(sink);
    let mut rows_at = |instant: Tt| -> Result<(), CliError> {
        let sky = skies.at(instant)?;
        let vantage = match site {
            Some(site) => sky.observer(site, instant)?,
            None => sky.geocentre(instant)?,
        };
        for &body in &bodies {
            let cells = place_row(sky, &vantage, site, body, DEFAULT_SUN_DISTANCE)?;
            if let Some(sink) = sink.take() {
                table = Some(TableWriter::new(
                    sink,
                    PLACE_COLUMNS,
                    options.format.into(),
                )?);
            }
            if let Some(table) = &mut table {
                table.row(&cells)?;
            }
        }
        Ok(())
    };
    let mut progress = Progress::new("places");
    match (&options.instants, options.from, options.to) {
        (Some(file), _, _) => {
            let instants = read_instants(file)?;
            for (index, &instant) in instants.iter().enumerate() {
                rows_at(instant)?;
                progress.at(index as f64 / instants.len() as f64);
            }
        }
        (None, Some(InstantWord(from)), Some(InstantWord(to))) => {
            if from >= to {
                return Err(CliError::Words(String::from(
                    "--to must be later than --from",
                )));
            }
            let mut k = 0.0_f64;
            loop {
                let instant = from.plus_days(k * options.step.days);
                if instant >= to {
                    break;
                }
                rows_at(instant)?;
                k += 1.0;
                progress.at((instant.days() - from.days()) / (to.days() - from.days()));
            }
        }
        // clap sees to it that one of the two is given.
        _ => {
            return Err(CliError::Words(String::from(
                "give --from and --to, or --instants",
            )));
        }
    }
    match table {
        Some(table) => table.finish().map(drop)?,
        None => {
            if let Some(sink) = sink {
                TableWriter::new(sink, PLACE_COLUMNS, options.format.into())?.finish()?;
            }
        }
    }
    Ok(())
}

fn read_instants(file: &std::path::Path) -> Result<Vec<Tt>, CliError> {
    let name = if file.as_os_str() == "-" {
        String::from("standard input")
    } else {
        file.display().to_string()
    };
    let cannot = |source| CliError::File {
        what: format!("{name} cannot be read"),
        source,
    };
    let mut bytes = Vec::new();
    if file.as_os_str() == "-" {
        std::io::stdin()
            .lock()
            .take(LARGEST_FILE + 1)
            .read_to_end(&mut bytes)
            .map_err(cannot)?;
    } else {
        let opened = std::fs::File::open(file).map_err(cannot)?;
        opened
            .take(LARGEST_FILE + 1)
            .read_to_end(&mut bytes)
            .map_err(cannot)?;
    }
    if bytes.len() as u64 > LARGEST_FILE {
        return Err(CliError::Failed(format!(
            "{name} is larger than 64 MB; split it"
        )));
    }
    let text = String::from_utf8(bytes).map_err(|_| {
        CliError::Failed(format!(
            "{name} is not UTF-8 text; it holds one instant a line"
        ))
    })?;
    let lines = text
        .lines()
        .enumerate()
        .map(|(index, line)| (index + 1, line.trim()));
    lines
        .filter(|(_, line)| !line.is_empty() && !line.starts_with('#'))
        .map(|(number, line)| {
            line.parse::<InstantWord>()
                .map(|word| word.0)
                .map_err(|error| CliError::Failed(format!("{name}, line {number}: {error}")))
        })
        .collect()
}

/// The two sources of places, each made when first needed: an instant has no season that a seam could fall into.
#[derive(Default)]
struct Skies {
    de440: Option<Sky>,
    series: Option<Sky>,
}

impl Skies {
    fn at(&mut self, instant: Tt) -> Result<&Sky, SkyError> {
        if self.de440.is_none() {
            self.de440 = Some(Sky::de440()?);
        }
        if let Some(sky) = &self.de440
            && sky.covers(instant)
        {
            return Ok(sky);
        }
        if self.series.as_ref().is_none_or(|sky| !sky.covers(instant)) {
            self.series = Some(Sky::for_span(instant, instant)?);
        }
        self.series.as_ref().ok_or(SkyError::OutsideAllSpans {
            jd: instant.julian_date(),
        })
    }
}
