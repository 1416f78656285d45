//! `loopwright seasons`: the seasons of a planet compared, from one or several places.

use std::io::{BufWriter, stdout};
use std::path::PathBuf;
use std::str::FromStr;

use crate::scenario::{Scenario, usual_site};
use crate::season::compare::{
    Measures, Ranked, Viewpoint, Want, inner_seasons, outer_seasons, rank,
};
use crate::season::nights::LocalClock;
use crate::season::{Conditions, Span, synodic_days};
use crate::sheet::season_tables::{
    INNER_SEASON_COLUMNS, OUTER_SEASON_COLUMNS, inner_season_row, outer_season_row,
};
use crate::sheet::table::{Cell, TableWriter};
use crate::sky::place::Sky;
use crate::sky::{Body, Site, Skyline};

use super::progress::Progress;
use super::words::{InstantWord, SiteWord, site_clock};
use super::{CliError, Format};

/// Compare the seasons of a planet as seen from here: one row an apparition and place.
#[derive(Debug, clap::Args)]
#[command(after_help = "Examples:
  loopwright seasons --subject mars --from 2026 --to 2061 --site 50.6,10.3,486
  loopwright seasons my-season.ron --from 2026 --to 2041 --want disc:2,high,soon
  loopwright seasons --subject mercury --from 2027 --to 2029 --site home=50.6,10.3,486 --site abroad=-24.6,-70.4,2600

Outer planets: a row for each opposition; times in view are those of the nights within 120 days of it, by the scenario's
altitude, skyline and darkness (10 degrees, level, Sun at -6 for --site); its hours say what an evening is (18:00 to 23:00
without). Inner planets: a row for each evening or morning apparition; first and last sighting with the bare eye in
clear, usual and hazy air. --want ranks by disc, high, evening, loop, soon, each with a weight if you like.")]
pub struct Options {
    /// A scenario file, for its place, skyline, conditions and subject.
    scenario: Option<PathBuf>,
    /// The planet; the scenario's subject without it.
    #[arg(long, value_name = "PLANET")]
    subject: Option<Body>,
    /// Begin of the span: 2026, 2026-11 or 2026-11-01.
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    from: InstantWord,
    /// End of the span, which does not belong to it.
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    to: InstantWord,
    /// A place to compare from, may be repeated: latitude, longitude (east positive) in degrees, metres; a name before it if
    /// you like.
    #[arg(long, value_name = "[NAME=]LAT,LON,ELEV_M", allow_hyphen_values = true)]
    site: Vec<NamedSite>,
    /// What is wanted, with weights: disc,high,evening,loop,soon or disc:2,high. The rows then come best first.
    #[arg(long, value_name = "LIST")]
    want: Option<String>,
    #[arg(long, value_enum, default_value_t)]
    format: Format,
}

/// A site with its name, or with its coordinates for a name.
#[derive(Clone, Debug)]
struct NamedSite(Site);

impl FromStr for NamedSite {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let (name, place) = match text.split_once('=') {
            Some((name, place)) if !name.trim().is_empty() => (name.trim(), place),
            Some((_, place)) => (place, place),
            None => (text, text),
        };
        let SiteWord(site) = place.parse()?;
        Ok(NamedSite(usual_site(
            name.to_owned(),
            site.latitude,
            site.longitude,
            site.elevation_m,
        )))
    }
}

/// Everything a viewpoint borrows.
struct Stand {
    site: Site,
    skyline: Skyline,
    conditions: Conditions,
    clock: LocalClock,
}

/// Reads `disc:2,high`.
fn wishes(text: &str) -> Result<Vec<(Want, f64)>, String> {
    let mut wanted: Vec<(Want, f64)> = Vec::new();
    for word in text
        .split(',')
        .map(str::trim)
        .filter(|word| !word.is_empty())
    {
        let (name, weight) = word.split_once(':').unwrap_or((word, "1"));
        let want = Want::ALL
            .into_iter()
            .find(|want| want.word() == name.trim())
            .ok_or_else(|| {
                format!("\"{name}\" cannot be wanted; use disc, high, evening, loop or soon")
            })?;
        let weight: f64 = weight
            .trim()
            .parse()
            .ok()
            .filter(|weight: &f64| weight.is_finite() && *weight > 0.0)
            .ok_or_else(|| {
                format!("the weight of \"{word}\" is no number above 0; write for example disc:2")
            })?;
        if wanted.iter().any(|(other, _)| *other == want) {
            return Err(format!("\"{name}\" is wanted twice; give it one weight"));
        }
        wanted.push((want, weight));
    }
    if wanted.is_empty() {
        return Err(String::from(
            "--want names nothing; write for example --want disc,high",
        ));
    }
    Ok(wanted)
}

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let wanted = options
        .want
        .as_deref()
        .map(wishes)
        .transpose()
        .map_err(CliError::Words)?;
    let span = Span {
        from: options.from.0,
        to: options.to.0,
    };
    if span.from >= span.to {
        return Err(CliError::Words(String::from(
            "--to must be later than --from",
        )));
    }
    let scenario = match &options.scenario {
        Some(path) => Some(Scenario::load(path)?),
        None if options.site.is_empty() => Some(Scenario::embedded()?),
        None => None,
    };
    let subject = options
        .subject
        .or(scenario.as_ref().map(|scenario| scenario.subject))
        .ok_or_else(|| CliError::Words(String::from("name a planet: --subject mars")))?;
    if !subject.is_inner_planet() && !subject.is_outer_planet() {
        return Err(CliError::Words(format!(
            "{subject} has no seasons; name a planet, Mercury to Neptune"
        )));
    }
    // The conjunctions and stations around the first and last season.
    let (first, last) = (span.from.plus_days(-800.0), span.to.plus_days(800.0));
    let sky = Sky::for_span(first, last)?;
    let mut stands = Vec::new();
    if let Some(scenario) = &scenario {
        stands.push(Stand {
            site: scenario.site.clone(),
            skyline: scenario.skyline.polygon().clone(),
            conditions: scenario.conditions.clone(),
            clock: site_clock(scenario, &sky, first, last)?,
        });
    }
    for NamedSite(site) in &options.site {
        // Local mean time: a place without a scenario has no zone.
        let seconds = (site.longitude.signed().degrees() * 240.0).round() as i32;
        stands.push(Stand {
            site: site.clone(),
            skyline: Skyline::default(),
            conditions: Conditions::default(),
            clock: LocalClock::fixed(seconds),
        });
    }
    let viewpoints: Vec<Viewpoint<'_>> = stands
        .iter()
        .map(|stand| Viewpoint {
            site: &stand.site,
            skyline: &stand.skyline,
            conditions: &stand.conditions,
            clock: &stand.clock,
        })
        .collect();
    let mut measures: Vec<Measures> = Vec::new();
    // A row waits for its rank.
    type Row<'a> = Box<dyn Fn(Option<&Ranked>) -> Vec<Cell> + 'a>;
    let (mut outer, mut inner) = (Vec::new(), Vec::new());
    let mut rows: Vec<Row<'_>> = Vec::new();
    let mut progress = Progress::new("seasons");
    for piece in pieces(span) {
        outer.extend(outer_seasons(&sky, subject, piece, &viewpoints)?);
        inner.extend(inner_seasons(&sky, subject, piece, &viewpoints)?);
        progress.at((piece.to.days() - span.from.days()) / span.days());
    }
    drop(progress);
    let columns = if subject.is_outer_planet() {
        for season in &outer {
            for (view, here) in viewpoints.iter().zip(&season.here) {
                measures.push(Measures::from((season, here, span.from)));
                let sky = &sky;
                rows.push(Box::new(move |ranked| {
                    outer_season_row(sky, season, view, here, ranked)
                }));
            }
        }
        OUTER_SEASON_COLUMNS
    } else {
        for season in &inner {
            for (view, here) in viewpoints.iter().zip(&season.here) {
                measures.push(Measures::from((season, here, span.from)));
                let sky = &sky;
                rows.push(Box::new(move |ranked| {
                    inner_season_row(sky, season, view, here, ranked)
                }));
            }
        }
        INNER_SEASON_COLUMNS
    };
    if rows.is_empty() {
        return Err(CliError::Failed(format!(
            "no season of {subject} lies in this span; one follows the other after about {:.0} days, so make it longer",
            synodic_days(subject)
        )));
    }
    let ranked = wanted.map(|wanted| rank(&measures, &wanted));
    let mut order: Vec<usize> = (0..rows.len()).collect();
    if let Some(ranked) = &ranked {
        order.sort_by_key(|&k| ranked.get(k).map_or(usize::MAX, |season| season.rank));
    }
    let mut table = TableWriter::new(
        BufWriter::new(stdout().lock()),
        columns,
        options.format.into(),
    )?;
    for k in order {
        let season = ranked.as_ref().and_then(|ranked| ranked.get(k));
        if let Some(row) = rows.get(k) {
            table.row(&row(season))?;
        }
    }
    table.finish()?;
    Ok(())
}

/// Pieces of at most twenty years that follow each other without a gap, so that long spans can show how far they are.
fn pieces(span: Span) -> Vec<Span> {
    const PIECE_DAYS: f64 = 7_305.0;
    let count = (span.days() / PIECE_DAYS).ceil().max(1.0) as u32;
    let bound = |k: u32| {
        if k == count {
            span.to
        } else {
            span.from.plus_days(f64::from(k) * PIECE_DAYS)
        }
    };
    (0..count)
        .map(|k| Span {
            from: bound(k),
            to: bound(k + 1),
        })
        .collect()
}
