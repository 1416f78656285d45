//! The tables from which a programme is made: the evenings of a year, and seasons compared.

use super::table::{Cell, fixed};
use super::words::utc_minute;
use crate::season::compare::{
    InnerHere, InnerSeason, MoonThen, OuterHere, OuterSeason, Ranked, Viewpoint,
};
use crate::season::nights::LocalClock;
use crate::season::year::{Evening, InView, Meeting, Showing};
use crate::season::{Loop, Other};
use crate::sky::calendar::Precision;
use crate::sky::place::{Sky, Spherical};
use crate::sky::{Angle, Body, Tt};

/// The bodies of a year's table, in the order of their columns.
pub const YEAR_BODIES: [Body; 8] = [
    Body::Moon,
    Body::Mercury,
    Body::Venus,
    Body::Mars,
    Body::Jupiter,
    Body::Saturn,
    Body::Uranus,
    Body::Neptune,
];

/// Columns of the evenings of a year: for each of [`YEAR_BODIES`] its longest stretch in view, its greatest apparent altitude
/// and its magnitude then, or one word why it is not in view.
pub const YEAR_COLUMNS: &[&str] = &[
    "night",
    "weekday",
    "sun_set_local",
    "civil_dusk_local",
    "moon_lit_fraction",
    "moon_from_local",
    "moon_to_local",
    "moon_altitude_deg",
    "moon_magnitude",
    "moon_why_not",
    "mercury_from_local",
    "mercury_to_local",
    "mercury_altitude_deg",
    "mercury_magnitude",
    "mercury_why_not",
    "venus_from_local",
    "venus_to_local",
    "venus_altitude_deg",
    "venus_magnitude",
    "venus_why_not",
    "mars_from_local",
    "mars_to_local",
    "mars_altitude_deg",
    "mars_magnitude",
    "mars_why_not",
    "jupiter_from_local",
    "jupiter_to_local",
    "jupiter_altitude_deg",
    "jupiter_magnitude",
    "jupiter_why_not",
    "saturn_from_local",
    "saturn_to_local",
    "saturn_altitude_deg",
    "saturn_magnitude",
    "saturn_why_not",
    "uranus_from_local",
    "uranus_to_local",
    "uranus_altitude_deg",
    "uranus_magnitude",
    "uranus_why_not",
    "neptune_from_local",
    "neptune_to_local",
    "neptune_altitude_deg",
    "neptune_magnitude",
    "neptune_why_not",
    "margin",
    "caution",
];

/// Columns of an outer planet's seasons, a row for each opposition and place.
pub const OUTER_SEASON_COLUMNS: &[&str] = &[
    "subject",
    "site",
    "rank",
    "score",
    "part_disc",
    "part_high",
    "part_evening",
    "part_loop",
    "part_soon",
    "opposition_utc",
    "constellation",
    "distance_au",
    "diameter_arcsec",
    "magnitude",
    "culmination_deg",
    "in_view_at_opposition_h",
    "in_view_h",
    "evening_h",
    "stretch_from",
    "stretch_to",
    "stretch_nights",
    "stretch_h",
    "station_retrograde_utc",
    "station_direct_utc",
    "arc_deg",
    "duration_d",
    "shape",
    "crossing_first_utc",
    "crossing_second_utc",
    "crossing_ra_deg",
    "crossing_dec_deg",
    "moon_lit_opposition",
    "moon_distance_opposition_deg",
    "moon_lit_station_retrograde",
    "moon_distance_station_retrograde_deg",
    "moon_lit_station_direct",
    "moon_distance_station_direct_deg",
    "ring_tilt_deg",
    "mars_ls_deg",
    "sub_earth_latitude_deg",
    "caution",
];

/// Columns of an inner planet's apparitions, a row for each and place.
pub const INNER_SEASON_COLUMNS: &[&str] = &[
    "subject",
    "site",
    "rank",
    "score",
    "part_disc",
    "part_high",
    "part_evening",
    "part_loop",
    "part_soon",
    "sky",
    "greatest_elongation_utc",
    "elongation_deg",
    "constellation",
    "magnitude",
    "lit_fraction",
    "diameter_arcsec",
    "arc_deg",
    "from_utc",
    "to_utc",
    "highest_date",
    "highest_utc",
    "highest_deg",
    "after_sunset_min",
    "before_sunrise_min",
    "first_seen_clear_utc",
    "first_seen_usual_utc",
    "first_seen_hazy_utc",
    "last_seen_clear_utc",
    "last_seen_usual_utc",
    "last_seen_hazy_utc",
    "caution",
];

/// A local clock reading to the minute with its offset: `2026-11-06T18:40+01:00`.
#[must_use]
pub fn local_minute(sky: &Sky, clock: &LocalClock, instant: Tt) -> String {
    let utc = sky.tables().utc_from_tt(instant);
    let offset = clock.offset_seconds(utc);
    let (sign, seconds) = (if offset < 0 { '-' } else { '+' }, offset.unsigned_abs());
    match clock
        .reading(utc)
        .and_then(|reading| reading.text(Precision::Minute))
    {
        Ok(text) => format!("{text}{sign}{:02}:{:02}", seconds / 3600, seconds / 60 % 60),
        Err(error) => error.to_string(),
    }
}

/// The time of day of [`local_minute`] alone: `18:40`.
fn local_time(sky: &Sky, clock: &LocalClock, instant: Tt) -> String {
    local_minute(sky, clock, instant)
        .get(11..16)
        .unwrap_or_default()
        .to_owned()
}

/// A close approach in words: `Moon 2.1 deg from Jupiter 20:15`.
#[must_use]
pub fn meeting_words(sky: &Sky, clock: &LocalClock, meeting: &Meeting) -> String {
    let with = match &meeting.with {
        Other::Body(body) => body.name(),
        Other::Star(name) => name,
    };
    format!(
        "{} {} deg from {with} {}",
        meeting.body.name(),
        fixed(meeting.separation.degrees(), 1),
        local_time(sky, clock, meeting.instant)
    )
}

fn margin(sky: &Sky, clock: &LocalClock, evening: &Evening) -> String {
    let words: Vec<String> = evening
        .meetings
        .iter()
        .map(|meeting| meeting_words(sky, clock, meeting))
        .collect();
    words.join("; ")
}

/// A row of [`YEAR_COLUMNS`]; the evening's showings are those of [`YEAR_BODIES`].
#[must_use]
pub fn year_row(sky: &Sky, clock: &LocalClock, evening: &Evening) -> Vec<Cell> {
    let local = |instant: Option<Tt>| {
        instant.map_or(Cell::Empty, |at| Cell::text(local_minute(sky, clock, at)))
    };
    let mut cells = vec![
        Cell::text(evening.date.to_string()),
        Cell::text(evening.date.weekday().name()),
        local(evening.sun.set),
        local(evening.sun.civil_dusk),
        Cell::Number(evening.moon_lit_fraction, 2),
    ];
    for showing in &evening.showings {
        match showing {
            Showing::InView(view) => {
                let longest = view.longest();
                cells.extend([
                    local(longest.map(|span| span.from)),
                    local(longest.map(|span| span.to)),
                    Cell::Number(view.altitude.degrees(), 1),
                    Cell::Number(view.magnitude, 1),
                    Cell::Empty,
                ]);
            }
            Showing::Absent(absence) => cells.extend([
                Cell::Empty,
                Cell::Empty,
                Cell::Empty,
                Cell::Empty,
                Cell::text(absence.word()),
            ]),
        }
    }
    let cautions = sky
        .cautions()
        .and(sky.tables().delta_t(evening.span.from).cautions());
    cells.push(Cell::text(margin(sky, clock, evening)));
    cells.push(Cell::text(cautions.to_string()));
    cells
}

/// The evenings as a page to read: a line each, a column a body with its times, altitude and magnitude.
#[must_use]
pub fn year_page_line(sky: &Sky, clock: &LocalClock, evening: &Evening) -> String {
    let weekday = evening.date.weekday().name();
    let mut line = format!("{} {}", weekday.get(..3).unwrap_or(weekday), evening.date);
    for showing in &evening.showings {
        let cell = match showing {
            Showing::InView(view) => in_view_words(sky, clock, view),
            Showing::Absent(absence) => format!("({})", absence.word()),
        };
        line.push_str(&format!("  {cell:<20}"));
    }
    let margin = margin(sky, clock, evening);
    format!("{line}  {margin}").trim_end().to_owned()
}

/// The heading of [`year_page_line`].
#[must_use]
pub fn year_page_heading() -> String {
    let mut line = format!("{:<14}", "Evening");
    for body in YEAR_BODIES {
        line.push_str(&format!("  {:<20}", body.name()));
    }
    format!("{line}  Close together")
}

fn in_view_words(sky: &Sky, clock: &LocalClock, view: &InView) -> String {
    let times = view.longest().map_or_else(String::new, |span| {
        format!(
            "{}-{}",
            local_time(sky, clock, span.from),
            local_time(sky, clock, span.to)
        )
    });
    format!(
        "{times} {:>2} {:>5}",
        fixed(view.altitude.degrees(), 0),
        fixed(view.magnitude, 1)
    )
}

fn utc_cell(sky: &Sky, instant: Option<Tt>) -> Cell {
    instant.map_or(Cell::Empty, |at| Cell::text(utc_minute(sky, at)))
}

fn degrees(angle: Option<Angle>, decimals: usize) -> Cell {
    Cell::number(angle.map(Angle::degrees), decimals)
}

fn first_cells(subject: Body, view: &Viewpoint<'_>, ranked: Option<&Ranked>) -> Vec<Cell> {
    let mut cells = vec![
        Cell::text(subject.word()),
        Cell::text(&view.site.name),
        ranked.map_or(Cell::Empty, |ranked| Cell::Digits(ranked.rank.to_string())),
        Cell::number(ranked.map(|ranked| ranked.score), 4),
    ];
    for index in 0..5 {
        let part = ranked.and_then(|ranked| ranked.parts.get(index).copied());
        cells.push(Cell::number(part, 3));
    }
    cells
}

fn caution_cell(sky: &Sky, instant: Tt) -> Cell {
    let cautions = sky.cautions().and(sky.tables().delta_t(instant).cautions());
    Cell::text(cautions.to_string())
}

/// A row of [`OUTER_SEASON_COLUMNS`].
#[must_use]
pub fn outer_season_row(
    sky: &Sky,
    season: &OuterSeason,
    view: &Viewpoint<'_>,
    here: &OuterHere,
    ranked: Option<&Ranked>,
) -> Vec<Cell> {
    let path = season.path.as_ref();
    let crossing = path.and_then(|path| path.crossing);
    let crossing_place = crossing.map(|crossing| Spherical::of(crossing.direction));
    let stretch = here.stretch;
    let lit = |moon: Option<MoonThen>| Cell::number(moon.map(|moon| moon.lit_fraction), 2);
    let distance = |moon: Option<MoonThen>| degrees(moon.map(|moon| moon.separation), 1);
    let at_opposition = Some(season.moon_at_opposition);
    let mut cells = first_cells(season.opposition.body, view, ranked);
    cells.extend([
        utc_cell(sky, Some(season.opposition.instant)),
        Cell::text(season.constellation.abbreviation()),
        Cell::Number(season.distance_au, 5),
        Cell::Number(season.diameter.arcsec(), 2),
        Cell::Number(season.magnitude, 2),
        degrees(Some(here.culmination), 2),
        Cell::Number(here.hours_at_opposition, 2),
        Cell::Number(here.hours, 1),
        Cell::Number(here.evening_hours, 1),
        stretch.map_or(Cell::Empty, |run| Cell::text(run.from.to_string())),
        stretch.map_or(Cell::Empty, |run| Cell::text(run.to.to_string())),
        stretch.map_or(Cell::Empty, |run| Cell::Digits(run.nights.to_string())),
        Cell::number(stretch.map(|run| run.hours), 1),
        utc_cell(sky, path.map(|path| path.station_retrograde.instant)),
        utc_cell(sky, path.map(|path| path.station_direct.instant)),
        degrees(path.map(Loop::arc), 3),
        Cell::number(path.map(Loop::duration_days), 1),
        season
            .shape
            .map_or(Cell::Empty, |shape| Cell::text(shape.word())),
        utc_cell(sky, crossing.map(|crossing| crossing.first)),
        utc_cell(sky, crossing.map(|crossing| crossing.second)),
        degrees(crossing_place.map(|place| place.longitude.wrapped()), 4),
        degrees(crossing_place.map(|place| place.latitude), 4),
        lit(at_opposition),
        distance(at_opposition),
        lit(season.moon_at_station_retrograde),
        distance(season.moon_at_station_retrograde),
        lit(season.moon_at_station_direct),
        distance(season.moon_at_station_direct),
        degrees(season.ring_tilt, 2),
        degrees(season.mars_season, 1),
        degrees(season.sub_earth_latitude, 1),
        caution_cell(sky, season.opposition.instant),
    ]);
    cells
}

/// A row of [`INNER_SEASON_COLUMNS`].
#[must_use]
pub fn inner_season_row(
    sky: &Sky,
    season: &InnerSeason,
    view: &Viewpoint<'_>,
    here: &InnerHere,
    ranked: Option<&Ranked>,
) -> Vec<Cell> {
    let minutes = here.highest.and_then(|best| best.minutes_from_sun);
    let mut cells = first_cells(season.greatest.body, view, ranked);
    cells.extend([
        Cell::text(if season.evening { "evening" } else { "morning" }),
        utc_cell(sky, Some(season.greatest.instant)),
        degrees(Some(season.elongation), 3),
        Cell::text(season.constellation.abbreviation()),
        Cell::Number(season.magnitude, 2),
        Cell::Number(season.lit_fraction, 3),
        Cell::Number(season.diameter.arcsec(), 2),
        degrees(season.arc, 3),
        utc_cell(sky, Some(season.span.from)),
        utc_cell(sky, Some(season.span.to)),
        here.highest
            .map_or(Cell::Empty, |best| Cell::text(best.date.to_string())),
        utc_cell(sky, here.highest.map(|best| best.instant)),
        degrees(here.highest.map(|best| best.altitude), 2),
        Cell::number(minutes.filter(|_| season.evening), 0),
        Cell::number(minutes.filter(|_| !season.evening), 0),
    ]);
    cells.extend(
        here.first_seen
            .iter()
            .chain(&here.last_seen)
            .map(|&at| utc_cell(sky, at)),
    );
    cells.push(caution_cell(sky, season.greatest.instant));
    cells
}
