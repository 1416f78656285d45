//! The season sheet: strip as SVG and PNG, events and daily places as CSV, and the brief.

use super::brief::brief;
use super::png::{PngError, png};
use super::strip_words::{printed_view, strip_text};
use super::svg::svg;
use super::table::{TableFormat, TableWriter};
use super::tables::{EVENT_COLUMNS, PLACE_COLUMNS, event_row, place_row};
use crate::chart::{Palette, Scene, strip};
use crate::scenario::Plan;
use crate::sky::place::SkyError;
use crate::sky::stars::{StarCatalogue, StarTableError};
use crate::sky::time::J2000_JD;
use crate::sky::{Body, Tt, Utc};

/// Pixels to a point in the PNG: 200 dots an inch on the A4 sheet.
const PNG_SCALE: f64 = 200.0 / 72.0;

/// Why a sheet could not be made.
#[derive(Debug, thiserror::Error)]
pub enum SheetError {
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error(transparent)]
    Stars(#[from] StarTableError),
    #[error(transparent)]
    Png(#[from] PngError),
    #[error("a table cannot be written: {0}")]
    Table(#[from] std::io::Error),
}

/// The files of a season sheet and the page to read aloud.
pub struct SeasonSheet {
    /// Name and contents.
    pub files: Vec<(&'static str, Vec<u8>)>,
    pub brief: String,
}

/// The strip of a plan as it is printed.
///
/// # Errors
/// A damaged table of stars.
pub fn printed_strip(plan: &Plan) -> Result<Scene, StarTableError> {
    let stars = StarCatalogue::embedded()?.stars();
    Ok(strip(
        &plan.season,
        stars,
        &strip_text(plan),
        &printed_view(plan),
    ))
}

/// Makes the season sheet in memory.
///
/// # Errors
/// A span the sky does not cover; a damaged table of stars.
pub fn season_sheet(plan: &Plan) -> Result<SeasonSheet, SheetError> {
    let scene = printed_strip(plan)?;
    Ok(SeasonSheet {
        files: vec![
            ("strip.svg", svg(&scene, &Palette::LIGHT).into_bytes()),
            ("strip.png", png(&scene, &Palette::LIGHT, PNG_SCALE)?),
            ("events.csv", events_csv(plan)?),
            ("places.csv", places_csv(plan)?),
        ],
        brief: brief(plan)?,
    })
}

fn events_csv(plan: &Plan) -> Result<Vec<u8>, SheetError> {
    let mut table = TableWriter::new(Vec::new(), EVENT_COLUMNS, TableFormat::Csv)?;
    for event in &plan.season.events {
        table.row(&event_row(&plan.sky, event))?;
    }
    Ok(table.finish()?)
}

/// The subject, the companions and the Sun from the site on every night of the season, at the site's local mean midnight
/// (24h - longitude/15 UTC).
fn places_csv(plan: &Plan) -> Result<Vec<u8>, SheetError> {
    let site = &plan.scenario.site;
    let season = &plan.season;
    let mut bodies = vec![season.subject];
    bodies.extend(season.companions.iter().map(|track| track.body));
    bodies.push(Body::Sun);
    let mut table = TableWriter::new(Vec::new(), PLACE_COLUMNS, TableFormat::Csv)?;
    let tables = plan.sky.tables();
    let first = tables.utc_from_tt(season.span.from).days();
    // Local mean midnight of the Julian day that began at noon before.
    let mut day = (first + J2000_JD).floor();
    loop {
        let midnight = day - J2000_JD + 0.5 - site.longitude.signed().degrees() / 360.0;
        // Whole seconds read better and are far finer than a daily table needs.
        let seconds = (midnight * 86_400.0).round();
        let instant: Tt = tables.tt_from_utc(Utc::from_days(seconds / 86_400.0));
        if instant >= season.span.to {
            break;
        }
        if instant >= season.span.from {
            let vantage = plan.sky.observer(site, instant)?;
            for &body in &bodies {
                let near_sun = plan.scenario.sun_distance;
                table.row(&place_row(&plan.sky, &vantage, Some(site), body, near_sun)?)?;
            }
        }
        day += 1.0;
    }
    Ok(table.finish()?)
}
