//! Everything at the time cursor, as finished values: what [`moment`] says of one instant, and what [`tonight`] says of
//! the night around it.
//!
//! Places are apparent, of the true equator and equinox of date, seen from the site; motions are seen from the Earth's
//! centre, as the stations of a season are (the turning Earth alone moves Mars by up to 80" a day from a site). Altitudes
//! are of the centre, angles in [`Angle`], distances au, instants TT. Accuracy is that of [`crate::sky::place`]; rise,
//! set and twilight are almanac ones (see [`super::horizon`]), good to about a minute in ordinary air.

use super::horizon::{HorizonEvent, HorizonKind, Threshold, Transit, horizon_events, transits};
use super::search::root;
use super::types::Span;
use crate::sky::constellations::Constellation;
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::physical::equatorial_diameter;
use crate::sky::place::{Horizontal, Place, Side, Sky, SkyError, Spherical, Vantage};
use crate::sky::refraction::apparent_from_true;
use crate::sky::{Angle, Body, Caution, Cautions, Flagged, Mat3, Site, Skyline, Tt, Utc, Vec3};

/// Who looks from where at what.
#[derive(Clone, Copy)]
pub struct Watch<'a> {
    pub sky: &'a Sky,
    pub site: &'a Site,
    pub skyline: &'a Skyline,
    pub subject: Body,
    /// Further bodies, in the order wanted.
    pub companions: &'a [Body],
    /// Within this angle of a Sun that is up, a body carries [`Caution::SunNear`].
    pub sun_distance: Angle,
}

impl Watch<'_> {
    /// Subject, companions, Moon and Sun; none twice.
    #[must_use]
    pub fn bodies(&self) -> Vec<Body> {
        let mut bodies = vec![self.subject];
        for &body in self.companions.iter().chain(&[Body::Moon, Body::Sun]) {
            if !bodies.contains(&body) {
                bodies.push(body);
            }
        }
        bodies
    }

    fn against_skyline(&self, seen: Horizontal) -> OverSkyline<'_> {
        let apparent = apparent_from_true(seen.altitude, &self.site.air);
        let altitude = self.skyline.altitude_at(seen.azimuth);
        OverSkyline {
            apparent,
            skyline: altitude,
            part: self.skyline.part_at(seen.azimuth),
        }
    }
}

struct OverSkyline<'a> {
    apparent: Angle,
    skyline: Angle,
    part: Option<&'a str>,
}

/// The horizon's axes at an instant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LocalAxes {
    /// Rows east, north, up: turns apparent directions on ICRS axes into local ones, altitudes unrefracted.
    pub local_from_icrs: Mat3,
}

impl LocalAxes {
    /// The axes of a vantage; `None` at the geocentre.
    #[must_use]
    pub fn of(vantage: &Vantage<'_>) -> Option<Self> {
        let axis = |azimuth, altitude| vantage.direction_at(Horizontal { azimuth, altitude });
        Some(LocalAxes {
            local_from_icrs: Mat3 {
                rows: [
                    axis(Angle::QUARTER_TURN, Angle::ZERO)?,
                    axis(Angle::ZERO, Angle::ZERO)?,
                    axis(Angle::ZERO, Angle::QUARTER_TURN)?,
                ],
            },
        })
    }

    /// Azimuth and unrefracted altitude of an apparent direction on ICRS axes.
    #[must_use]
    pub fn horizontal(&self, apparent: Vec3) -> Horizontal {
        let local = self.local_from_icrs * apparent;
        Horizontal {
            azimuth: Angle::from_radians(libm::atan2(local.x, local.y)).wrapped(),
            altitude: local.latitude(),
        }
    }
}

/// Which way a body moves along the ecliptic.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sense {
    /// Forward.
    Eastward,
    /// Back: retrograde.
    Westward,
}

impl Sense {
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Sense::Eastward => "eastward",
            Sense::Westward => "westward",
        }
    }
}

/// The angle from the Sun; the Sun itself has none.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Elongation {
    /// 0 to 180 degrees, between apparent directions.
    pub angle: Angle,
    /// East: evening sky.
    pub side: Side,
}

/// What is read of one body at one instant.
#[derive(Clone, Debug, PartialEq)]
pub struct Readings {
    pub body: Body,
    /// `None` for the Sun.
    pub elongation: Option<Elongation>,
    /// Light-time distance from the site.
    pub distance_au: f64,
    /// V, outside the atmosphere.
    pub magnitude: Flagged<f64>,
    /// Equatorial.
    pub diameter: Angle,
    /// 0 to 1; `None` for the Sun.
    pub lit_fraction: Option<f64>,
    pub constellation: Constellation,
    /// Apparent right ascension and declination of date.
    pub equatorial: Spherical,
    /// Apparent ecliptic longitude and latitude of date.
    pub ecliptic: Spherical,
    /// Astrometric direction on ICRS axes: where it stands among the stars of the strip.
    pub direction: Vec3,
    pub azimuth: Angle,
    /// Unrefracted.
    pub altitude: Angle,
    /// Refracted.
    pub apparent_altitude: Angle,
    /// Apparent altitude of the skyline at the azimuth.
    pub skyline_altitude: Angle,
    /// Name of what stands there, as the skyline has it.
    pub skyline_part: Option<String>,
    /// Rate of the geocentric apparent longitude of date per day, eastward positive.
    pub longitude_per_day: Angle,
    pub cautions: Cautions,
}

impl Readings {
    /// Apparent altitude above the skyline; negative behind it.
    #[must_use]
    pub fn height_over_skyline(&self) -> Angle {
        self.apparent_altitude - self.skyline_altitude
    }

    #[must_use]
    pub fn sense(&self) -> Sense {
        if self.longitude_per_day < Angle::ZERO {
            Sense::Westward
        } else {
            Sense::Eastward
        }
    }
}

/// How dark it is, by the true altitude of the Sun's centre: the almanac's steps.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Twilight {
    /// Sun up: upper limb above a level horizon in standard refraction, -50'.
    Day,
    /// Down to -6 degrees.
    Civil,
    /// Down to -12 degrees.
    Nautical,
    /// Down to -18 degrees.
    Astronomical,
    Night,
}

impl Twilight {
    /// From the true altitude of the Sun's centre.
    #[must_use]
    pub fn of(sun_altitude: Angle) -> Self {
        match sun_altitude.degrees() {
            altitude if altitude > -50.0 / 60.0 => Twilight::Day,
            altitude if altitude > -6.0 => Twilight::Civil,
            altitude if altitude > -12.0 => Twilight::Nautical,
            altitude if altitude > -18.0 => Twilight::Astronomical,
            _ => Twilight::Night,
        }
    }

    #[must_use]
    pub const fn phrase(self) -> &'static str {
        match self {
            Twilight::Day => "day",
            Twilight::Civil => "civil twilight",
            Twilight::Nautical => "nautical twilight",
            Twilight::Astronomical => "astronomical twilight",
            Twilight::Night => "night",
        }
    }
}

/// Sun and Moon as the sky's light.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SkyState {
    /// True altitude of the Sun's centre.
    pub sun_altitude: Angle,
    /// Between lower and upper transit: towards noon.
    pub sun_is_rising: bool,
    pub twilight: Twilight,
    /// Upper limb above a level horizon in standard refraction.
    pub moon_is_up: bool,
    /// 0 to 1.
    pub moon_lit: f64,
    /// Moon's longitude minus the Sun's, 0 to 360 degrees: 0 new, 90 first quarter, 180 full.
    pub moon_age: Angle,
}

impl SkyState {
    /// The Moon's phase in words. A principal phase has the name for half a day's motion on either side.
    #[must_use]
    pub fn moon_phase(&self) -> &'static str {
        const NEAR_DEGREES: f64 = 6.1;
        let age = self.moon_age.wrapped().degrees();
        let near = |phase: f64| (age - phase).abs() < NEAR_DEGREES;
        if near(0.0) || near(360.0) {
            "new Moon"
        } else if near(90.0) {
            "first quarter"
        } else if near(180.0) {
            "full Moon"
        } else if near(270.0) {
            "last quarter"
        } else if age < 90.0 {
            "waxing crescent"
        } else if age < 180.0 {
            "waxing gibbous"
        } else if age < 270.0 {
            "waning gibbous"
        } else {
            "waning crescent"
        }
    }
}

/// Everything at one instant.
#[derive(Clone, Debug, PartialEq)]
pub struct Moment {
    pub instant: Tt,
    pub axes: LocalAxes,
    pub sky: SkyState,
    /// Subject first, companions in their order, then Moon and Sun.
    pub readings: Vec<Readings>,
    /// What holds for every reading here, delta-T's among them.
    pub cautions: Cautions,
}

impl Moment {
    /// The readings of a body, if it is among them.
    #[must_use]
    pub fn of(&self, body: Body) -> Option<&Readings> {
        self.readings.iter().find(|readings| readings.body == body)
    }
}

/// What stands where at an instant: quick enough for every frame of a scrub.
///
/// # Errors
/// An instant that the sky does not cover.
pub fn moment(watch: &Watch<'_>, instant: Tt) -> Result<Moment, SkyError> {
    let vantage = watch.sky.observer(watch.site, instant)?;
    let geocentre = watch.sky.geocentre(instant)?;
    let sun = vantage.place(Body::Sun)?;
    let sun_seen = seen_from_site(&vantage, &sun);
    let sun_may_be_up = sun_seen.altitude > Threshold::RiseSet.altitude_of(&sun);
    let cautions = watch
        .sky
        .cautions()
        .and(watch.sky.tables().delta_t(instant).cautions());
    let read = |body: Body| -> Result<Readings, SkyError> {
        let place = if body == Body::Sun {
            sun
        } else {
            vantage.place(body)?
        };
        let seen = seen_from_site(&vantage, &place);
        let over = watch.against_skyline(seen);
        let geometry = place.geometry();
        let light = magnitude(&geometry, MarsTerms::Include);
        let is_sun = body == Body::Sun;
        let angle = place.separation(&sun);
        Ok(Readings {
            body,
            elongation: (!is_sun).then(|| Elongation {
                angle,
                side: place.side_of(&sun),
            }),
            distance_au: place.distance_au,
            magnitude: light,
            diameter: equatorial_diameter(&geometry),
            lit_fraction: (!is_sun).then(|| geometry.lit_fraction()),
            constellation: Constellation::at_icrs(place.direction),
            equatorial: place.equatorial_of_date(),
            ecliptic: place.ecliptic_of_date(),
            direction: place.direction,
            azimuth: seen.azimuth,
            altitude: seen.altitude,
            apparent_altitude: over.apparent,
            skyline_altitude: over.skyline,
            skyline_part: over.part.map(str::to_owned),
            longitude_per_day: geocentre.place(body)?.ecliptic_rate().longitude,
            cautions: cautions.and(light.cautions).with_if(
                sun_may_be_up && angle < watch.sun_distance,
                Caution::SunNear,
            ),
        })
    };
    let moon = vantage.place(Body::Moon)?;
    let moon_age = moon.ecliptic_of_date().longitude - sun.ecliptic_of_date().longitude;
    let sky = SkyState {
        sun_altitude: sun_seen.altitude,
        sun_is_rising: vantage
            .hour_angle(&sun)
            .is_some_and(|angle| angle < Angle::ZERO),
        twilight: Twilight::of(sun_seen.altitude),
        moon_is_up: seen_from_site(&vantage, &moon).altitude
            > Threshold::RiseSet.altitude_of(&moon),
        moon_lit: moon.geometry().lit_fraction(),
        moon_age: moon_age.wrapped(),
    };
    Ok(Moment {
        instant,
        axes: LocalAxes::of(&vantage).unwrap_or(LocalAxes {
            local_from_icrs: Mat3::IDENTITY,
        }),
        sky,
        readings: watch
            .bodies()
            .into_iter()
            .map(read)
            .collect::<Result<_, _>>()?,
        cautions,
    })
}

/// A vantage from a site always has a horizon.
fn seen_from_site(vantage: &Vantage<'_>, place: &Place) -> Horizontal {
    vantage.horizontal(place.apparent).unwrap_or(Horizontal {
        azimuth: Angle::ZERO,
        altitude: Angle::ZERO,
    })
}

/// How a body goes through a night: an absent rising is told apart from a body that is never up.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Course {
    RisesOrSets,
    StaysUp,
    StaysDown,
}

/// A body's rising, culmination and setting within a night.
#[derive(Clone, Debug, PartialEq)]
pub struct Passages {
    pub body: Body,
    pub course: Course,
    /// The first of the night, where there is one: the Moon may rise on the day before and on the day after.
    pub rise: Option<HorizonEvent>,
    pub culmination: Option<Transit>,
    pub set: Option<HorizonEvent>,
}

/// The subject passing the skyline.
#[derive(Clone, Debug, PartialEq)]
pub struct SkylinePassage {
    pub instant: Tt,
    /// Comes out above it.
    pub clears: bool,
    pub azimuth: Angle,
    /// Name of what it passes.
    pub part: Option<String>,
}

/// What happens within a night, the same for every instant of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Tonight {
    /// From local mean noon to the next.
    pub span: Span,
    /// Sunset, dusks, dawns, sunrise, in order of time.
    pub sun: Vec<HorizonEvent>,
    /// Of the bodies of [`Watch::bodies`].
    pub passages: Vec<Passages>,
    /// Of the subject, in order of time.
    pub skyline: Vec<SkylinePassage>,
}

impl Tonight {
    /// A body's passages, if it is among them.
    #[must_use]
    pub fn of(&self, body: Body) -> Option<&Passages> {
        self.passages.iter().find(|passages| passages.body == body)
    }

    /// When the subject next comes out from behind the skyline or goes behind it within the night.
    #[must_use]
    pub fn next_skyline_passage(&self, after: Tt) -> Option<&SkylinePassage> {
        self.skyline.iter().find(|passage| passage.instant > after)
    }
}

/// The night that holds an instant: the 24 hours from local mean noon (12h - longitude/15 UTC) to the next.
#[must_use]
pub fn night_at(sky: &Sky, site: &Site, instant: Tt) -> Span {
    let tables = sky.tables();
    let east = site.longitude.signed().degrees() / 360.0;
    // Counted from the mean noon of 2000 January 1.
    let local = (tables.utc_from_tt(instant).days() + east).floor();
    let noon = |day: f64| tables.tt_from_utc(Utc::from_days(day - east));
    Span {
        from: noon(local),
        to: noon(local + 1.0),
    }
}

/// Noon stands among the Sun's passages.
const SUN_KINDS: [HorizonKind; 8] = [
    HorizonKind::Rise,
    HorizonKind::Set,
    HorizonKind::CivilDusk,
    HorizonKind::NauticalDusk,
    HorizonKind::AstronomicalDusk,
    HorizonKind::AstronomicalDawn,
    HorizonKind::NauticalDawn,
    HorizonKind::CivilDawn,
];

/// Rise, culmination, set, twilight and passages of the skyline in the night that holds an instant.
///
/// # Errors
/// An instant that the sky does not cover.
pub fn tonight(watch: &Watch<'_>, instant: Tt) -> Result<Tonight, SkyError> {
    let span = night_at(watch.sky, watch.site, instant);
    let passages = watch
        .bodies()
        .into_iter()
        .map(|body| passages(watch, body, span))
        .collect::<Result<_, _>>()?;
    Ok(Tonight {
        span,
        sun: horizon_events(watch.sky, watch.site, Body::Sun, &SUN_KINDS, span)?,
        passages,
        skyline: skyline_passages(watch, span)?,
    })
}

fn passages(watch: &Watch<'_>, body: Body, span: Span) -> Result<Passages, SkyError> {
    let (sky, site) = (watch.sky, watch.site);
    let kinds = [HorizonKind::Rise, HorizonKind::Set];
    let found = horizon_events(sky, site, body, &kinds, span)?;
    let first = |kind| found.iter().copied().find(|event| event.kind == kind);
    let course = if found.is_empty() {
        let vantage = sky.observer(site, span.middle())?;
        let place = vantage.place(body)?;
        if seen_from_site(&vantage, &place).altitude > Threshold::RiseSet.altitude_of(&place) {
            Course::StaysUp
        } else {
            Course::StaysDown
        }
    } else {
        Course::RisesOrSets
    };
    Ok(Passages {
        body,
        course,
        rise: first(HorizonKind::Rise),
        culmination: transits(sky, site, body, span)?.first().copied(),
        set: first(HorizonKind::Set),
    })
}

/// Between samples of the height over the skyline, days: 5 minutes, in which the sky turns by 1.25 degrees. A gap between
/// two chimneys narrower than that may go unnoticed here; the search for spells does not rest on this.
const SKYLINE_STEP_DAYS: f64 = 1.0 / 288.0;

fn skyline_passages(watch: &Watch<'_>, span: Span) -> Result<Vec<SkylinePassage>, SkyError> {
    let seen = |days: f64| -> Result<Horizontal, SkyError> {
        let vantage = watch.sky.observer(watch.site, Tt::from_days(days))?;
        Ok(seen_from_site(&vantage, &vantage.place(watch.subject)?))
    };
    let over = |seen: Horizontal| {
        let over = watch.against_skyline(seen);
        (over.apparent - over.skyline).radians()
    };
    let mut found = Vec::new();
    let count = (span.days() / SKYLINE_STEP_DAYS).round().max(1.0) as usize;
    let step = span.days() / count as f64;
    let mut before = (span.from.days(), over(seen(span.from.days())?));
    for sample in 1..=count {
        let days = span.from.days() + sample as f64 * step;
        let here = (days, over(seen(days)?));
        if (before.1 < 0.0) != (here.1 < 0.0) {
            // To a second.
            let days = root(before, here, 1e-5, |days| {
                Ok::<_, SkyError>(over(seen(days)?))
            })?;
            let azimuth = seen(days)?.azimuth;
            found.push(SkylinePassage {
                instant: Tt::from_days(days),
                clears: before.1 < 0.0,
                azimuth,
                part: watch.skyline.part_at(azimuth).map(str::to_owned),
            });
        }
        before = here;
    }
    Ok(found)
}
