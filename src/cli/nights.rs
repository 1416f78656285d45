//! `loopwright nights`: every night of a season with the spells in which the subject can be had.

use std::io::{BufWriter, stdout};
use std::path::PathBuf;

use crate::scenario::programme::Programme;
use crate::season::planner::{JudgedSpell, SeasonNight};
use crate::sheet::table::{Cell, TableWriter};
use crate::sky::place::Sky;

use super::outings::{plan, print_cautions, print_spell_cautions, utc_second};
use super::{CliError, Format};

/// Print every night of a season: when the subject meets every condition, how good that is, what ends it.
#[derive(Debug, clap::Args)]
#[command(after_help = "Example:
  loopwright nights scenarios/mars-loop-2026.ron > nights.csv

One row a spell, and one row with empty times for a night without one; ends_because then says which condition is missed, by
how much and for how long. Values are those of the best moment; the altitude is refracted, Sun and Moon are not. night is
the civil date of the evening; margin_mag is by how many magnitudes the subject exceeds the faintest thing that shows to
the bare eye there (Uranus and Neptune: to binoculars). score, 0 to 1, is for the scenario's purpose.")]
pub struct Options {
    /// A scenario file.
    scenario: PathBuf,
    #[arg(long, value_enum, default_value_t)]
    format: Format,
}

const COLUMNS: &[&str] = &[
    "night",
    "from_utc",
    "to_utc",
    "best_utc",
    "altitude_deg",
    "azimuth_deg",
    "skyline_deg",
    "sun_altitude_deg",
    "moon_altitude_deg",
    "moon_separation_deg",
    "moon_lit_fraction",
    "magnitude",
    "diameter_arcsec",
    "margin_mag",
    "score",
    "ends_because",
];

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let plan = plan(&options.scenario)?;
    let programme = Programme::new(&plan)?;
    let sink = BufWriter::new(stdout().lock());
    let mut table = TableWriter::new(sink, COLUMNS, options.format.into())?;
    let nights = &programme.season.nights;
    for night in nights {
        let spells = night.offer.spells();
        for judged in spells {
            table.row(&spell_row(&plan.sky, night, judged))?;
        }
        if spells.is_empty() {
            table.row(&closed_row(night))?;
        }
    }
    table.finish()?;
    let with = nights
        .iter()
        .filter(|night| !night.offer.spells().is_empty())
        .count();
    eprintln!("{with} of {} nights have a spell", nights.len());
    print_cautions(&plan);
    let spells = nights.iter().flat_map(|night| night.offer.spells());
    print_spell_cautions(&plan, spells);
    Ok(())
}

fn spell_row(sky: &Sky, night: &SeasonNight, judged: &JudgedSpell) -> Vec<Cell> {
    let spell = &judged.spell;
    let best = &spell.best;
    vec![
        Cell::text(night.date().to_string()),
        Cell::text(utc_second(sky, spell.start.instant)),
        Cell::text(utc_second(sky, spell.finish.instant)),
        Cell::text(utc_second(sky, best.instant)),
        Cell::Number(best.altitude.degrees(), 2),
        Cell::Number(best.azimuth.degrees(), 2),
        Cell::Number(best.skyline.degrees(), 2),
        Cell::Number(best.sun_altitude.degrees(), 2),
        Cell::Number(best.moon_altitude.degrees(), 2),
        Cell::Number(best.moon_separation.degrees(), 2),
        Cell::Number(best.moon_lit_fraction, 3),
        Cell::Number(best.magnitude, 2),
        Cell::Number(best.diameter.arcsec(), 2),
        Cell::number(judged.margin_mag, 2),
        Cell::Number(judged.score.value, 3),
        Cell::text(judged.ends_because()),
    ]
}

fn closed_row(night: &SeasonNight) -> Vec<Cell> {
    let mut cells = vec![Cell::Empty; COLUMNS.len()];
    if let Some(first) = cells.first_mut() {
        *first = Cell::text(night.date().to_string());
    }
    if let Some(last) = cells.last_mut() {
        *last = Cell::text(night.offer.closed_words().unwrap_or_default());
    }
    cells
}
