//! The tables of places and events: columns and rows, for the command line and for the season sheet alike.

use super::table::Cell;
use super::words::{julian_date_text, utc_shortest, utc_tenths};
use crate::season::horizon::{HorizonEvent, HorizonKind, Threshold};
use crate::season::{Event, EventValue, Other};
use crate::sky::constellations::Constellation;
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::physical::equatorial_diameter;
use crate::sky::place::{Place, Sky, SkyError, Vantage};
use crate::sky::refraction::apparent_from_true;
use crate::sky::{Angle, Body, Caution, Cautions, Site, Tt};

/// Columns of a table of places.
pub const PLACE_COLUMNS: &[&str] = &[
    "body",
    "utc",
    "jd_tt",
    "ra_deg",
    "dec_deg",
    "lon_deg",
    "lat_deg",
    "distance_au",
    "sun_distance_au",
    "elongation_deg",
    "phase_angle_deg",
    "lit_fraction",
    "diameter_arcsec",
    "magnitude",
    "constellation",
    "altitude_deg",
    "apparent_altitude_deg",
    "azimuth_deg",
    "caution",
];

/// Columns of a table of events.
pub const EVENT_COLUMNS: &[&str] = &[
    "body", "kind", "jd_tt", "utc", "value", "value_is", "caution",
];

/// A row of [`PLACE_COLUMNS`]. `near_sun` is how near to a Sun that is up, or that may be up where no site is given, a body
/// carries the Sun caution.
///
/// # Errors
/// An instant that the sky does not cover.
pub fn place_row(
    sky: &Sky,
    vantage: &Vantage<'_>,
    site: Option<&Site>,
    body: Body,
    near_sun: Angle,
) -> Result<Vec<Cell>, SkyError> {
    let place = vantage.place(body)?;
    let sun = vantage.place(Body::Sun)?;
    let geometry = place.geometry();
    let light = magnitude(&geometry, MarsTerms::Include);
    let equatorial = place.equatorial_of_date();
    let ecliptic = place.ecliptic_of_date();
    let elongation = place.separation(&sun);
    let seen = vantage.horizontal(place.apparent);
    let instant = vantage.instant();
    let cautions = place
        .cautions
        .and(light.cautions)
        .and(sky.tables().delta_t(instant).cautions())
        .with_if(
            elongation < near_sun && sun_may_be_up(vantage, &sun),
            Caution::SunNear,
        );
    let unless_sun = |value: f64| if body == Body::Sun { None } else { Some(value) };
    Ok(vec![
        Cell::text(body.word()),
        Cell::text(utc_shortest(sky, instant)),
        Cell::Digits(julian_date_text(instant, 9)),
        Cell::Number(equatorial.longitude.degrees(), 8),
        Cell::Number(equatorial.latitude.degrees(), 8),
        Cell::Number(ecliptic.longitude.degrees(), 8),
        Cell::Number(ecliptic.latitude.degrees(), 8),
        Cell::Number(place.distance_au, 10),
        Cell::number(unless_sun(geometry.sun_distance_au()), 10),
        Cell::Number(elongation.degrees(), 7),
        Cell::number(unless_sun(geometry.phase_angle().degrees()), 7),
        Cell::number(unless_sun(geometry.lit_fraction()), 7),
        Cell::Number(equatorial_diameter(&geometry).arcsec(), 5),
        Cell::Number(light.value, 3),
        Cell::text(Constellation::at_icrs(place.direction).abbreviation()),
        Cell::number(seen.map(|seen| seen.altitude.degrees()), 7),
        Cell::number(
            seen.zip(site)
                .map(|(seen, site)| apparent_from_true(seen.altitude, &site.air).degrees()),
            7,
        ),
        Cell::number(seen.map(|seen| seen.azimuth.degrees()), 7),
        Cell::text(cautions.to_string()),
    ])
}

fn sun_may_be_up(vantage: &Vantage<'_>, sun: &Place) -> bool {
    match vantage.horizontal(sun.apparent) {
        Some(seen) => seen.altitude > Threshold::RiseSet.altitude_of(sun),
        None => true,
    }
}

fn event_cells(
    sky: &Sky,
    words: [&str; 2],
    instant: Tt,
    (value, value_is): (Cell, String),
    cautions: Cautions,
) -> Vec<Cell> {
    let [body, kind] = words;
    vec![
        Cell::text(body),
        Cell::text(kind),
        Cell::Digits(julian_date_text(instant, 8)),
        Cell::text(utc_tenths(sky, instant)),
        value,
        Cell::text(value_is),
        Cell::text(
            cautions
                .and(sky.tables().delta_t(instant).cautions())
                .to_string(),
        ),
    ]
}

/// A row of [`EVENT_COLUMNS`].
#[must_use]
pub fn event_row(sky: &Sky, event: &Event) -> Vec<Cell> {
    let (value, value_is) = match event.value {
        EventValue::Longitude(angle) => (Cell::Number(angle.degrees(), 6), String::from("lon_deg")),
        EventValue::RightAscension(angle) => {
            (Cell::Number(angle.degrees(), 6), String::from("ra_deg"))
        }
        EventValue::Elongation(angle) => {
            (Cell::Number(angle.degrees(), 6), String::from("elong_deg"))
        }
        EventValue::DistanceAu(distance) => (Cell::Number(distance, 9), String::from("dist_au")),
        EventValue::Magnitude(magnitude) => (Cell::Number(magnitude, 3), String::from("magnitude")),
        EventValue::Separation(angle) => {
            let partner = match &event.with {
                Some(Other::Body(body)) => body.word().to_owned(),
                Some(Other::Star(name)) => name.to_lowercase().replace(' ', "_"),
                None => String::from("nothing"),
            };
            (
                Cell::Number(angle.degrees(), 6),
                format!("separation_deg_from_{partner}"),
            )
        }
        EventValue::Constellation(name) => (Cell::text(name), String::from("constellation")),
    };
    event_cells(
        sky,
        [event.body.word(), event.kind.word()],
        event.instant,
        (value, value_is),
        event.cautions,
    )
}

/// A row of [`EVENT_COLUMNS`] for a rising, transit, setting, dusk or dawn.
#[must_use]
pub fn horizon_row(sky: &Sky, event: &HorizonEvent) -> Vec<Cell> {
    let value_is = if event.kind == HorizonKind::UpperTransit {
        "altitude_deg"
    } else {
        "azimuth_deg"
    };
    let value = (
        Cell::Number(event.value.degrees(), 6),
        String::from(value_is),
    );
    event_cells(
        sky,
        [event.body.word(), event.kind.word()],
        event.instant,
        value,
        sky.cautions(),
    )
}
