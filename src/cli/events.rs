//! `loopwright events`: what happens to bodies within a span.

use std::io::{BufWriter, stdout};

use crate::season::close::{Limits, close_approaches};
use crate::season::events::{Kinds, events};
use crate::season::horizon::{HorizonKind, horizon_events};
use crate::season::{EventKind, Span};
use crate::sheet::table::{Cell, TableWriter};
use crate::sheet::tables::{EVENT_COLUMNS, event_row, horizon_row};
use crate::sky::place::Sky;
use crate::sky::{Body, Tt};

use super::progress::Progress;
use super::words::{self, InstantWord, SiteWord};
use super::{CliError, Format};

/// Print events: oppositions, conjunctions, stations, elongations, nearest and brightest, rise and set.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright events --bodies mars,jupiter --from 2026-11 --to 2027-06
  loopwright events --bodies venus --from 2020 --to 2030 --kinds greatest_elongation_east,greatest_brightness
  loopwright events --bodies sun --from 2026-12-01 --to 2026-12-08 --site 47.5,8.3,450 --kinds set,civil_dusk

Kinds: conjunction, inferior_conjunction, superior_conjunction, opposition, quadrature_east, quadrature_west,
station_retrograde, station_direct (in ecliptic longitude), ra_station_retrograde, ra_station_direct (in right
ascension), greatest_elongation_east, greatest_elongation_west, closest_approach, closest_approach_lighttime,
greatest_brightness, perihelion, constellation_entry (all these without --kinds), close_approach (to planets, the Moon,
bright stars); with --site rise, upper_transit, set, and for the sun civil_dusk, nautical_dusk, astronomical_dusk,
astronomical_dawn, nautical_dawn, civil_dawn. All but the last group are geocentric.")]
pub struct Options {
    /// Bodies, separated by commas; \"planets\" and \"all\" are understood.
    #[arg(long, value_name = "LIST")]
    bodies: String,
    /// Begin of the span: 2026-11-01, 2026-11, 2026-11-01T18:30:00Z or "JD 2461000.5 TT".
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    from: InstantWord,
    /// End of the span, which does not belong to it.
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    to: InstantWord,
    /// Kinds of events, separated by commas.
    #[arg(long, value_name = "LIST")]
    kinds: Option<String>,
    /// The observer's place: latitude, longitude (east positive) in degrees, metres above the ellipsoid.
    #[arg(long, value_name = "LAT,LON,ELEV_M", allow_hyphen_values = true)]
    site: Option<SiteWord>,
    #[arg(long, value_enum, default_value_t)]
    format: Format,
}

/// The span is worked through in pieces of so many days, so that memory stays flat.
const PIECE_DAYS: f64 = 400.0;

/// The kinds asked for, sorted by the search that finds them.
struct Wanted {
    planetary: Kinds,
    close: bool,
    horizon: Vec<HorizonKind>,
}

impl Wanted {
    fn read(options: &Options) -> Result<Self, String> {
        let Some(list) = &options.kinds else {
            return Ok(Wanted {
                planetary: Kinds::ALL,
                close: false,
                horizon: Vec::new(),
            });
        };
        let mut wanted = Wanted {
            planetary: Kinds::NONE,
            close: false,
            horizon: Vec::new(),
        };
        for word in list
            .split(',')
            .map(str::trim)
            .filter(|word| !word.is_empty())
        {
            if let Some(kind) = EventKind::ALL.into_iter().find(|kind| kind.word() == word) {
                if kind == EventKind::CloseApproach {
                    wanted.close = true;
                } else {
                    wanted.planetary = wanted.planetary.and(Kinds::of(&[kind]));
                }
            } else if let Some(kind) = HorizonKind::ALL
                .into_iter()
                .find(|kind| kind.word() == word)
            {
                if options.site.is_none() {
                    return Err(format!(
                        "\"{word}\" happens at a place; add --site LAT,LON,ELEV_M"
                    ));
                }
                if !wanted.horizon.contains(&kind) {
                    wanted.horizon.push(kind);
                }
            } else {
                return Err(format!(
                    "no kind of event is called \"{word}\"; \"loopwright events --help\" lists them"
                ));
            }
        }
        if wanted.planetary == Kinds::NONE && !wanted.close && wanted.horizon.is_empty() {
            return Err(String::from("--kinds names no kind of event"));
        }
        Ok(wanted)
    }
}

/// A row before it is written.
struct Row {
    instant: Tt,
    cells: Vec<Cell>,
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let bodies = words::bodies(&options.bodies).map_err(CliError::Words)?;
    let wanted = Wanted::read(options).map_err(CliError::Words)?;
    let span = Span {
        from: options.from.0,
        to: options.to.0,
    };
    if span.from >= span.to {
        return Err(CliError::Words(String::from(
            "--to must be later than --from",
        )));
    }
    if wanted.horizon.iter().any(|kind| kind.is_twilight()) && !bodies.contains(&Body::Sun) {
        return Err(CliError::Words(String::from(
            "dusks and dawns are the Sun's; add sun to --bodies",
        )));
    }
    let sky = Sky::for_span(span.from, span.to)?;
    let stars = if wanted.close {
        words::bright_zodiac_stars(span.middle())?
    } else {
        Vec::new()
    };
    let mut table = TableWriter::new(
        BufWriter::new(stdout().lock()),
        EVENT_COLUMNS,
        options.format.into(),
    )?;
    let mut progress = Progress::new("events");
    let mut seen = vec![false; bodies.len()];
    let pieces = (span.days() / PIECE_DAYS).ceil().max(1.0) as u64;
    for piece in 0..pieces {
        let from = span.from.plus_days(piece as f64 * PIECE_DAYS);
        let to = if piece + 1 == pieces {
            span.to
        } else {
            span.from.plus_days((piece + 1) as f64 * PIECE_DAYS)
        };
        let part = Span { from, to };
        let mut rows: Vec<Row> = Vec::new();
        for event in events(&sky, &bodies, wanted.planetary, part)? {
            rows.push(Row {
                instant: event.instant,
                cells: event_row(&sky, &event),
            });
        }
        for (index, &body) in bodies.iter().enumerate() {
            if wanted.close && body != Body::Sun {
                let others: Vec<Body> = Body::PLANETS
                    .into_iter()
                    .chain([Body::Moon])
                    .filter(|&other| body != other)
                    .collect();
                for event in close_approaches(&sky, body, &others, &stars, Limits::default(), part)?
                {
                    rows.push(Row {
                        instant: event.instant,
                        cells: event_row(&sky, &event),
                    });
                }
            }
            if let Some(SiteWord(site)) = &options.site
                && !wanted.horizon.is_empty()
            {
                let found = horizon_events(&sky, site, body, &wanted.horizon, part)?;
                seen[index] |= !found.is_empty();
                rows.extend(found.iter().map(|event| Row {
                    instant: event.instant,
                    cells: horizon_row(&sky, event),
                }));
            }
        }
        rows.sort_by(|a, b| a.instant.days().total_cmp(&b.instant.days()));
        for row in rows {
            table.row(&row.cells)?;
        }
        progress.at((piece + 1) as f64 / pieces as f64);
    }
    table.finish()?;
    drop(progress);
    if !wanted.horizon.is_empty() {
        for (body, _) in bodies.iter().zip(seen).filter(|(_, seen)| !seen) {
            let kinds: Vec<&str> = wanted.horizon.iter().map(|kind| kind.word()).collect();
            eprintln!(
                "{body}: no {} at this site within the span",
                kinds.join(", ")
            );
        }
    }
    Ok(())
}
