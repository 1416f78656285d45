//! Seasons of a planet compared: one after another, as seen from one or several places.
//!
//! What does not depend on the place (events, loop, disc, Moon) is geocentric, as in [`super::events`] and
//! [`super::loops`]. What does is taken from the geocentric apparent direction, followed by a cubic through one place a
//! day, and the sidereal time: altitudes are good to 0.01 degrees (a planet's parallax is left out), times in view to a
//! minute. Times in view are sampled every ten minutes, so that an opening shorter than that may be missed; the exact
//! spells of a season once chosen come from [`super::spells`]. Altitudes of the subject are apparent; instants TT.
//!
//! # Closed loop, open S, open Z
//! A loop is closed where its track meets itself ([`Loop::crossing`]). Where it never does, the planet passes through the
//! ecliptic while it turns and the three strands (in, back, out) lie one above the other, so that the ecliptic latitude
//! from station to station decides: falling, the path is drawn like an S; rising, like a Z. Latitudes are astrometric, on
//! the mean ecliptic of the loop's middle. Turning the chart upside down, as southern observers do, changes neither letter.

use super::events::{Kinds, events};
use super::loops::{loops, synodic_days};
use super::nights::LocalClock;
use super::search::root;
use super::site_tracks::{LocalSky, NightSpan, Standing};
use super::types::{Event, EventKind, EventValue, Loop, Span};
use super::visibility::{Aid, Haze, Viewer};
use super::year::open_hours;
use super::{ClockTime, Conditions, Hours};
use crate::sky::calendar::CivilDate;
use crate::sky::constellations::Constellation;
use crate::sky::frames::{ReferenceFrame, apparent_sidereal_time};
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::physical::{
    equatorial_diameter, mars_season, planetographic_latitudes, saturn_rings,
};
use crate::sky::place::{Place, Sky, SkyError};
use crate::sky::refraction::{apparent_from_true, true_from_apparent};
use crate::sky::time::J2000_JD;
use crate::sky::{Angle, Body, Site, Skyline, Tt, Vec3};

/// The nights of an outer planet that are looked at lie within so many days of opposition.
pub const REACH_DAYS: f64 = 120.0;
/// Days between questions to the ephemeris.
const NODE_STEP: f64 = 1.0;
/// Between samples of a night: ten minutes.
const STEPS_A_NIGHT: usize = 144;
/// Turning rate of the Earth, radians a day (IERS Conventions 2010, table 1.2).
const SPIN: f64 = std::f64::consts::TAU * 1.002_737_811_911_354_6;
/// True altitude of the Sun's centre when almanacs have it rise and set.
const SUN_RISE_SET: Angle = Angle::from_degrees(-50.0 / 60.0);
/// True altitude of a planet when almanacs have it rise and set.
const PLANET_RISE_SET: Angle = Angle::from_degrees(-34.0 / 60.0);
const CIVIL: Angle = Angle::from_degrees(-6.0);
/// An evening counts in a stretch of evenings from so many hours in view on (common practice, no source).
const LEAST_EVENING_HOURS: f64 = 0.5;

/// One place from which seasons are compared.
#[derive(Clone, Copy, Debug)]
pub struct Viewpoint<'a> {
    pub site: &'a Site,
    pub skyline: &'a Skyline,
    /// Least altitude, clearance and darkness; the hours are those of an evening (18:00 to 23:00 where there are none).
    /// Weekdays and Moon do not count.
    pub conditions: &'a Conditions,
    pub clock: &'a LocalClock,
}

impl Viewpoint<'_> {
    fn evening_hours(&self) -> Option<Hours> {
        self.conditions.hours.or_else(|| {
            Some(Hours {
                from: ClockTime::new(18, 0)?,
                to: ClockTime::new(23, 0)?,
            })
        })
    }
}

/// How a loop lies among the stars.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum LoopShape {
    /// The track meets itself.
    Closed,
    /// It does not, and the latitude falls.
    OpenS,
    /// It does not, and the latitude rises.
    OpenZ,
}

impl LoopShape {
    /// The word used in tables.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            LoopShape::Closed => "closed_loop",
            LoopShape::OpenS => "open_s",
            LoopShape::OpenZ => "open_z",
        }
    }
}

/// The shape of a loop, by the rule in the head of this module.
///
/// # Errors
/// A loop that the sky does not cover.
pub fn loop_shape(sky: &Sky, path: &Loop) -> Result<LoopShape, SkyError> {
    if path.crossing.is_some() {
        return Ok(LoopShape::Closed);
    }
    let (from, to) = (path.station_retrograde.instant, path.station_direct.instant);
    let middle = Span { from, to }.middle();
    let frame = ReferenceFrame::mean_of_date(middle, sky.precession());
    let latitude = |instant: Tt| -> Result<Angle, SkyError> {
        let place = sky.geocentre(instant)?.place(path.body)?;
        Ok((frame.ecliptic_from_icrs * place.direction).latitude())
    };
    Ok(if latitude(to)? < latitude(from)? {
        LoopShape::OpenS
    } else {
        LoopShape::OpenZ
    })
}

/// The Moon on a critical night.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MoonThen {
    /// 0 to 1.
    pub lit_fraction: f64,
    /// From the subject, geocentric.
    pub separation: Angle,
}

/// A season of an outer planet.
#[derive(Clone, Debug, PartialEq)]
pub struct OuterSeason {
    pub opposition: Event,
    /// Around the opposition.
    pub path: Option<Loop>,
    pub shape: Option<LoopShape>,
    /// The astrometric place lies in it at opposition.
    pub constellation: Constellation,
    /// Apparent declination of date at opposition.
    pub declination: Angle,
    /// Light-time distance at opposition.
    pub distance_au: f64,
    /// Equatorial, the greatest of the season.
    pub diameter: Angle,
    /// V at its brightest between the stations, without the rotation and season terms of Mars.
    pub magnitude: f64,
    pub moon_at_opposition: MoonThen,
    pub moon_at_station_retrograde: Option<MoonThen>,
    pub moon_at_station_direct: Option<MoonThen>,
    /// Of Saturn: height of the Earth over the plane of the rings at opposition, north positive.
    pub ring_tilt: Option<Angle>,
    /// Of Mars: Ls at opposition.
    pub mars_season: Option<Angle>,
    /// Of Mars: planetographic latitude under the Earth at opposition.
    pub sub_earth_latitude: Option<Angle>,
    /// From each viewpoint, in their order.
    pub here: Vec<OuterHere>,
}

/// A season of an outer planet from one place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OuterHere {
    /// Apparent altitude in upper culmination at opposition; negative where it never rises.
    pub culmination: Angle,
    /// In view in the dark in the night of the opposition, any hour.
    pub hours_at_opposition: f64,
    /// In view in the dark in all nights within [`REACH_DAYS`] of opposition.
    pub hours: f64,
    /// The part of them that lies in the evening.
    pub evening_hours: f64,
    /// The longest run of evenings of at least half an hour.
    pub stretch: Option<Stretch>,
}

/// Evenings one after the other.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stretch {
    /// Civil date of the first evening.
    pub from: CivilDate,
    /// Civil date of the last evening.
    pub to: CivilDate,
    pub nights: u32,
    /// In view in all these evenings.
    pub hours: f64,
}

/// An apparition of an inner planet: from one conjunction with the Sun to the next.
#[derive(Clone, Debug, PartialEq)]
pub struct InnerSeason {
    /// In the evening sky, else in the morning sky.
    pub evening: bool,
    /// From conjunction to conjunction.
    pub span: Span,
    /// Greatest elongation.
    pub greatest: Event,
    pub elongation: Angle,
    /// At greatest elongation.
    pub constellation: Constellation,
    /// At greatest elongation, V.
    pub magnitude: f64,
    /// At greatest elongation.
    pub lit_fraction: f64,
    /// Equatorial, at greatest elongation.
    pub diameter: Angle,
    /// Retrograde arc of the loop at the inferior conjunction that ends or begins the apparition.
    pub arc: Option<Angle>,
    /// From each viewpoint, in their order.
    pub here: Vec<InnerHere>,
}

/// An apparition of an inner planet from one place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct InnerHere {
    /// Where the planet stands highest at the end of civil twilight (evening) or its beginning (morning); `None` where it is
    /// never above the horizon then, or the Sun never passes -6 degrees.
    pub highest: Option<TwilightBest>,
    /// First date on which it shows to the bare eye in clear, usual and hazy air; `None` where it never does.
    pub first_seen: [Option<Tt>; 3],
    /// Last date, likewise.
    pub last_seen: [Option<Tt>; 3],
}

/// The evening (or morning) on which an inner planet stands highest at the end (beginning) of civil twilight.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TwilightBest {
    pub date: CivilDate,
    /// End or beginning of civil twilight.
    pub instant: Tt,
    /// Apparent.
    pub altitude: Angle,
    /// From sunset to the setting of the planet, or from its rising to sunrise, on a level horizon; `None` where one of them
    /// does not happen that night.
    pub minutes_from_sun: Option<f64>,
}

/// Seasons of an outer planet whose oppositions lie in the span.
///
/// # Errors
/// A span that the sky, with 400 days on either side, does not cover.
pub fn outer_seasons(
    sky: &Sky,
    subject: Body,
    span: Span,
    viewpoints: &[Viewpoint<'_>],
) -> Result<Vec<OuterSeason>, SkyError> {
    if !subject.is_outer_planet() {
        return Ok(Vec::new());
    }
    let oppositions = events(sky, &[subject], Kinds::of(&[EventKind::Opposition]), span)?;
    let paths = loops(sky, subject, widened(span, 100.0))?;
    let mut seasons = Vec::with_capacity(oppositions.len());
    for opposition in oppositions {
        let path = paths
            .iter()
            .find(|path| {
                path.station_retrograde.instant < opposition.instant
                    && opposition.instant < path.station_direct.instant
            })
            .cloned();
        let vantage = sky.geocentre(opposition.instant)?;
        let place = vantage.place(subject)?;
        let geometry = place.geometry();
        let declination = place.equatorial_of_date().latitude;
        let course = Course::new(
            sky,
            subject,
            widened(
                Span {
                    from: opposition.instant,
                    to: opposition.instant,
                },
                REACH_DAYS,
            ),
        )?;
        let moon_at = |event: Option<&Event>| {
            event
                .map(|event| moon_then(sky, subject, event.instant))
                .transpose()
        };
        let is_mars = subject == Body::Mars;
        seasons.push(OuterSeason {
            shape: path
                .as_ref()
                .map(|path| loop_shape(sky, path))
                .transpose()?,
            constellation: Constellation::at_icrs(place.direction),
            declination,
            distance_au: place.distance_au,
            diameter: path
                .as_ref()
                .and_then(|path| path.largest_diameter)
                .unwrap_or_else(|| equatorial_diameter(&geometry)),
            magnitude: match path.as_ref().and_then(|path| path.brightest.as_ref()) {
                Some(Event {
                    value: EventValue::Magnitude(value),
                    ..
                }) => *value,
                _ => magnitude(&geometry, MarsTerms::Omit).value,
            },
            moon_at_opposition: moon_then(sky, subject, opposition.instant)?,
            moon_at_station_retrograde: moon_at(
                path.as_ref().map(|path| &path.station_retrograde),
            )?,
            moon_at_station_direct: moon_at(path.as_ref().map(|path| &path.station_direct))?,
            ring_tilt: saturn_rings(&geometry, &place.frame.equatorial_from_icrs)
                .map(|rings| rings.observer),
            mars_season: mars_season(&geometry),
            sub_earth_latitude: is_mars.then(|| planetographic_latitudes(&geometry).observer),
            here: viewpoints
                .iter()
                .map(|view| outer_here(sky, &course, view, opposition.instant, declination))
                .collect(),
            opposition,
            path,
        });
    }
    Ok(seasons)
}

fn widened(span: Span, days: f64) -> Span {
    Span {
        from: span.from.plus_days(-days),
        to: span.to.plus_days(days),
    }
}

fn moon_then(sky: &Sky, subject: Body, instant: Tt) -> Result<MoonThen, SkyError> {
    let vantage = sky.geocentre(instant)?;
    let moon = vantage.place(Body::Moon)?;
    Ok(MoonThen {
        lit_fraction: moon.geometry().lit_fraction(),
        separation: moon.separation(&vantage.place(subject)?),
    })
}

/// True altitude in upper culmination.
fn culmination(latitude: Angle, declination: Angle) -> Angle {
    let sine = (latitude - declination).cos();
    Angle::from_radians(libm::asin(sine.clamp(-1.0, 1.0)))
}

fn outer_here(
    sky: &Sky,
    course: &Course,
    view: &Viewpoint<'_>,
    opposition: Tt,
    declination: Angle,
) -> OuterHere {
    let eye = Eye::new(course, view);
    let hours = view.evening_hours();
    let mut here = OuterHere {
        culmination: apparent_from_true(
            culmination(view.site.latitude, declination),
            &view.site.air,
        ),
        hours_at_opposition: 0.0,
        hours: 0.0,
        evening_hours: 0.0,
        stretch: None,
    };
    let mut run: Option<Stretch> = None;
    for night in nights_within(sky, view.site, course.span()) {
        let spans = eye.in_view(night.span);
        let in_view: f64 = spans.iter().map(|span| 24.0 * span.days()).sum();
        here.hours += in_view;
        if night.span.contains(opposition) {
            here.hours_at_opposition = in_view;
        }
        let evening = hours
            .and_then(|hours| open_hours(view.clock, hours, night))
            .map_or(0.0, |open| {
                let overlap = |span: &Span| {
                    let from = span.from.days().max(open.from.days());
                    let to = span.to.days().min(open.to.days());
                    24.0 * (to - from).max(0.0)
                };
                spans.iter().map(overlap).sum()
            });
        here.evening_hours += evening;
        let date = view
            .clock
            .reading(night.evening)
            .ok()
            .map(|reading| reading.date());
        run = match (run, date) {
            (Some(mut run), Some(date)) if evening >= LEAST_EVENING_HOURS => {
                run.to = date;
                run.nights += 1;
                run.hours += evening;
                Some(run)
            }
            (None, Some(date)) if evening >= LEAST_EVENING_HOURS => Some(Stretch {
                from: date,
                to: date,
                nights: 1,
                hours: evening,
            }),
            _ => None,
        };
        if let Some(run) = run
            && here.stretch.is_none_or(|best| run.nights > best.nights)
        {
            here.stretch = Some(run);
        }
    }
    here
}

/// Apparitions of an inner planet whose greatest elongations lie in the span, evenings and mornings.
///
/// # Errors
/// A span that the sky, with 700 days on either side, does not cover.
pub fn inner_seasons(
    sky: &Sky,
    subject: Body,
    span: Span,
    viewpoints: &[Viewpoint<'_>],
) -> Result<Vec<InnerSeason>, SkyError> {
    if !subject.is_inner_planet() {
        return Ok(Vec::new());
    }
    let wide = widened(span, synodic_days(subject));
    let kinds = Kinds::of(&[
        EventKind::InferiorConjunction,
        EventKind::SuperiorConjunction,
        EventKind::GreatestElongationEast,
        EventKind::GreatestElongationWest,
        EventKind::StationRetrograde,
        EventKind::StationDirect,
    ]);
    let found = events(sky, &[subject], kinds, wide)?;
    let viewers: Vec<[[Viewer; 3]; 12]> = viewpoints
        .iter()
        .map(|view| airs_by_month(view.site))
        .collect();
    let mut seasons = Vec::new();
    for (index, greatest) in found.iter().enumerate() {
        let evening = match greatest.kind {
            EventKind::GreatestElongationEast => true,
            EventKind::GreatestElongationWest => false,
            _ => continue,
        };
        if !span.contains(greatest.instant) {
            continue;
        }
        let is_conjunction = |event: &&Event| {
            matches!(
                event.kind,
                EventKind::InferiorConjunction | EventKind::SuperiorConjunction
            )
        };
        let (earlier, later) = found.split_at(index);
        let (Some(before), Some(after)) = (
            earlier.iter().rev().find(is_conjunction),
            later.iter().find(is_conjunction),
        ) else {
            continue;
        };
        let inferior = if evening { after } else { before };
        let apparition = Span {
            from: before.instant,
            to: after.instant,
        };
        let course = Course::new(sky, subject, apparition)?;
        let place = sky.geocentre(greatest.instant)?.place(subject)?;
        let geometry = place.geometry();
        seasons.push(InnerSeason {
            evening,
            span: apparition,
            greatest: greatest.clone(),
            elongation: match greatest.value {
                EventValue::Elongation(angle) => angle,
                _ => Angle::ZERO,
            },
            constellation: Constellation::at_icrs(place.direction),
            magnitude: magnitude(&geometry, MarsTerms::Omit).value,
            lit_fraction: geometry.lit_fraction(),
            diameter: equatorial_diameter(&geometry),
            arc: arc_around(&found, inferior.instant),
            here: viewpoints
                .iter()
                .zip(&viewers)
                .map(|(view, airs)| inner_here(sky, &course, view, airs, evening))
                .collect(),
        });
    }
    Ok(seasons)
}

/// From station to station around an instant.
fn arc_around(found: &[Event], instant: Tt) -> Option<Angle> {
    let start = found
        .iter()
        .rev()
        .find(|event| event.kind == EventKind::StationRetrograde && event.instant < instant)?;
    let end = found
        .iter()
        .find(|event| event.kind == EventKind::StationDirect && event.instant > instant)?;
    match (start.value, end.value) {
        (EventValue::Longitude(first), EventValue::Longitude(second)) => {
            Some((first - second).signed())
        }
        _ => None,
    }
}

/// The bare eye in clear, usual and hazy air of each month; moonlight is left out, as it is in sightings.
fn airs_by_month(site: &Site) -> [[Viewer; 3]; 12] {
    let mut month = 0;
    [(); 12].map(|()| {
        month += 1;
        let viewer = Viewer {
            with_moon: false,
            ..Viewer::at(site, month)
        };
        Haze::ALL.map(|haze| viewer.through(haze))
    })
}

fn inner_here(
    sky: &Sky,
    course: &Course,
    view: &Viewpoint<'_>,
    airs: &[[Viewer; 3]; 12],
    evening: bool,
) -> InnerHere {
    let eye = Eye::new(course, view);
    let nights: Vec<NightSpan> = nights_within(sky, view.site, course.span()).collect();
    let halves: Vec<Half> = nights
        .iter()
        .map(|&night| eye.half(night, evening))
        .collect();
    let mut highest: Option<TwilightBest> = None;
    for half in &halves {
        let Some((instant, altitude)) = half.civil else {
            continue;
        };
        if altitude <= Angle::ZERO || highest.is_some_and(|best| altitude <= best.altitude) {
            continue;
        }
        // The civil date of the moment itself: a morning's is the day after its night's.
        let utc = sky.tables().utc_from_tt(instant);
        let Ok(reading) = view.clock.reading(utc) else {
            continue;
        };
        highest = Some(TwilightBest {
            date: reading.date(),
            instant,
            altitude,
            minutes_from_sun: half.minutes_from_sun,
        });
    }
    let mut seen: Vec<Option<[Option<Tt>; 3]>> = vec![None; halves.len()];
    let mut shows = |k: usize| -> [Option<Tt>; 3] {
        let Some(half) = halves.get(k) else {
            return [None; 3];
        };
        let fresh = || {
            let month = nights
                .get(k)
                .and_then(|night| view.clock.reading(night.evening).ok())
                .map_or(1, |reading| reading.date().month());
            airs.get(usize::from(month.saturating_sub(1)))
                .map_or([None; 3], |airs| eye.shows(half, airs))
        };
        match seen.get_mut(k) {
            Some(slot) => *slot.get_or_insert_with(fresh),
            None => [None; 3],
        }
    };
    let mut found = |order: &mut dyn Iterator<Item = usize>| -> [Option<Tt>; 3] {
        let mut first = [None; 3];
        for k in order {
            for (slot, at) in first.iter_mut().zip(shows(k)) {
                *slot = slot.or(at);
            }
            if first.iter().all(Option::is_some) {
                break;
            }
        }
        first
    };
    InnerHere {
        highest,
        first_seen: found(&mut (0..halves.len())),
        last_seen: found(&mut (0..halves.len()).rev()),
    }
}

/// The nights that lie wholly within a span, in order.
fn nights_within(sky: &Sky, site: &Site, span: Span) -> impl Iterator<Item = NightSpan> {
    let tables = sky.tables();
    let shift = site.longitude.signed().degrees() / 360.0;
    // A Julian day begins at noon of its date.
    let first = (tables.utc_from_tt(span.from).days() + J2000_JD + shift).ceil();
    let count = (span.days().max(0.0)) as u32 + 1;
    (0..count)
        .map(move |k| {
            let noon = crate::sky::Utc::from_days(first + f64::from(k) - J2000_JD - shift);
            NightSpan {
                span: Span {
                    from: tables.tt_from_utc(noon),
                    to: tables.tt_from_utc(noon.plus_days(1.0)),
                },
                evening: noon.plus_days(0.25),
                noon,
            }
        })
        .take_while(move |night| night.span.to <= span.to)
}

/// What the ephemeris says on one day: apparent directions on the true equator and equinox of date, rates a node step.
#[derive(Clone, Copy, Debug)]
struct Node {
    /// Of Greenwich, radians, growing without wrapping.
    sidereal: f64,
    subject: (Vec3, Vec3),
    sun: (Vec3, Vec3),
    magnitude: f64,
}

/// Subject and Sun through an apparition, for every place on Earth.
struct Course {
    from: f64,
    nodes: Vec<Node>,
}

impl Course {
    /// Covers the span.
    fn new(sky: &Sky, subject: Body, span: Span) -> Result<Self, SkyError> {
        let pieces = (span.days() / NODE_STEP).ceil().max(1.0) as usize;
        let from = span.from.days();
        let mut nodes: Vec<Node> = Vec::with_capacity(pieces + 1);
        for k in 0..=pieces {
            let instant = Tt::from_days(from + k as f64 * NODE_STEP);
            let vantage = sky.geocentre(instant)?;
            let ut1 = sky.tables().ut1_from_tt(instant);
            let wrapped = apparent_sidereal_time(ut1, instant, vantage.frame());
            let sidereal = match nodes.last() {
                None => wrapped.wrapped().radians(),
                Some(last) => {
                    let expected = last.sidereal + SPIN * NODE_STEP;
                    expected + (wrapped - Angle::from_radians(expected)).signed().radians()
                }
            };
            let motion = |place: &Place| {
                let rate = place
                    .frame
                    .equatorial_rate(place.apparent, place.apparent_rate());
                (
                    place.frame.equatorial_from_icrs * place.apparent,
                    rate * NODE_STEP,
                )
            };
            let place = vantage.place(subject)?;
            nodes.push(Node {
                sidereal,
                subject: motion(&place),
                sun: motion(&vantage.place(Body::Sun)?),
                magnitude: magnitude(&place.geometry(), MarsTerms::Omit).value,
            });
        }
        Ok(Course { from, nodes })
    }

    fn span(&self) -> Span {
        let steps = self.nodes.len().saturating_sub(1) as f64;
        Span {
            from: Tt::from_days(self.from),
            to: Tt::from_days(self.from + steps * NODE_STEP),
        }
    }

    /// The nodes around an instant and the share of the way between them; the nearest piece outside the span.
    fn piece(&self, days: f64) -> Option<(&Node, &Node, f64)> {
        let since = (days - self.from) / NODE_STEP;
        let index = (since.max(0.0) as usize).min(self.nodes.len().saturating_sub(2));
        let (before, after) = (self.nodes.get(index)?, self.nodes.get(index + 1)?);
        Some((before, after, since - index as f64))
    }
}

/// The cubic through two places with their rates.
fn cubic(before: (Vec3, Vec3), after: (Vec3, Vec3), s: f64) -> Vec3 {
    let rest = 1.0 - s;
    before.0 * (rest * rest * (1.0 + 2.0 * s))
        + before.1 * (s * rest * rest)
        + after.0 * (s * s * (3.0 - 2.0 * s))
        - after.1 * (s * s * rest)
}

/// Subject and Sun at one instant: east, north, up.
#[derive(Clone, Copy, Debug)]
struct Sample {
    days: f64,
    subject: Vec3,
    sun: Vec3,
}

/// The evening or morning half of a night.
#[derive(Debug, Default)]
struct Half {
    /// When the Sun's centre passes -6 degrees, and the apparent altitude of the planet then.
    civil: Option<(Tt, Angle)>,
    minutes_from_sun: Option<f64>,
    /// From sunset (or to sunrise) on the side of the night, days; `None` without a sunset.
    sun_at: Option<f64>,
    evening: bool,
}

/// An eye at a viewpoint.
struct Eye<'a> {
    course: &'a Course,
    view: &'a Viewpoint<'a>,
    sin_latitude: f64,
    cos_latitude: f64,
    /// Sine of the true altitude below which the subject is not in view whatever the skyline.
    floor: f64,
    /// Sine of the Sun's greatest altitude.
    dark: f64,
    /// The skyline may stand higher than the least altitude.
    skyline_matters: bool,
}

impl<'a> Eye<'a> {
    fn new(course: &'a Course, view: &'a Viewpoint<'a>) -> Self {
        let (sin_latitude, cos_latitude) = view.site.latitude.sin_cos();
        let conditions = view.conditions;
        let dark = if conditions.sun_below < SUN_RISE_SET {
            conditions.sun_below
        } else {
            SUN_RISE_SET
        };
        Eye {
            course,
            view,
            sin_latitude,
            cos_latitude,
            floor: true_from_apparent(conditions.least_altitude, &view.site.air).sin(),
            dark: dark.sin(),
            skyline_matters: view.skyline.max_altitude() + conditions.clearance
                > conditions.least_altitude,
        }
    }

    fn at(&self, days: f64) -> Option<Sample> {
        let (before, after, s) = self.course.piece(days)?;
        let sidereal = before.sidereal + s * (after.sidereal - before.sidereal);
        let (sin, cos) = libm::sincos(sidereal + self.view.site.longitude.radians());
        let local = |v: Vec3| {
            let meridian = cos * v.x + sin * v.y;
            Vec3::new(
                cos * v.y - sin * v.x,
                self.cos_latitude * v.z - self.sin_latitude * meridian,
                self.cos_latitude * meridian + self.sin_latitude * v.z,
            )
        };
        Some(Sample {
            days,
            subject: local(cubic(before.subject, after.subject, s)),
            sun: local(cubic(before.sun, after.sun, s)),
        })
    }

    /// Positive while the subject is in view; zero at the edges.
    fn openness(&self, sample: &Sample) -> f64 {
        let plain = (self.dark - sample.sun.z).min(sample.subject.z - self.floor);
        if plain <= 0.0 || !self.skyline_matters {
            return plain;
        }
        let standing = standing(sample.subject);
        let above = apparent_from_true(standing.altitude(), &self.view.site.air)
            - self.view.skyline.altitude_at(standing.azimuth())
            - self.view.conditions.clearance;
        plain.min(above.radians())
    }

    /// The stretches of a night in which the subject is in view.
    fn in_view(&self, night: Span) -> Vec<Span> {
        let mut spans = Vec::new();
        let mut open: Option<f64> = None;
        let mut before: Option<(f64, f64)> = None;
        for k in 0..=STEPS_A_NIGHT {
            let days = night.from.days() + night.days() * k as f64 / STEPS_A_NIGHT as f64;
            let Some(sample) = self.at(days) else {
                continue;
            };
            let value = self.openness(&sample);
            let edge = before.map_or(days, |(then, old)| {
                if old == value {
                    days
                } else {
                    then + (days - then) * (old / (old - value)).clamp(0.0, 1.0)
                }
            });
            match open {
                None if value > 0.0 => open = Some(edge),
                Some(from) if value <= 0.0 => {
                    spans.push(span_of(from, edge));
                    open = None;
                }
                _ => {}
            }
            before = Some((days, value));
        }
        if let Some(from) = open {
            spans.push(span_of(from, night.to.days()));
        }
        spans
    }

    /// When a sine of altitude passes a value in the direction asked for within a half night.
    fn passage(
        &self,
        samples: &[Sample],
        altitude: Angle,
        downward: bool,
        sine: impl Fn(&Sample) -> f64,
    ) -> Option<f64> {
        let level = altitude.sin();
        let pair = samples.windows(2).find_map(|pair| match pair {
            [a, b] => {
                let (fa, fb) = (sine(a) - level, sine(b) - level);
                let passes = if downward {
                    fa >= 0.0 && fb < 0.0
                } else {
                    fa < 0.0 && fb >= 0.0
                };
                passes.then_some(((a.days, fa), (b.days, fb)))
            }
            _ => None,
        })?;
        let value = |days: f64| {
            Ok::<_, std::convert::Infallible>(
                self.at(days).map_or(0.0, |sample| sine(&sample) - level),
            )
        };
        // A second.
        let Ok(days) = root(pair.0, pair.1, 1e-5, value);
        Some(days)
    }

    fn half(&self, night: NightSpan, evening: bool) -> Half {
        let start = night.span.from.days() + if evening { 0.0 } else { 0.5 };
        let samples: Vec<Sample> = (0..=STEPS_A_NIGHT / 2)
            .filter_map(|k| self.at(start + k as f64 / STEPS_A_NIGHT as f64))
            .collect();
        let sun = |sample: &Sample| sample.sun.z;
        let subject = |sample: &Sample| sample.subject.z;
        let sun_at = self.passage(&samples, SUN_RISE_SET, evening, sun);
        let planet_at = self.passage(&samples, PLANET_RISE_SET, evening, subject);
        let civil = self
            .passage(&samples, CIVIL, evening, sun)
            .and_then(|days| self.at(days))
            .map(|sample| {
                let altitude = standing(sample.subject).altitude();
                (
                    Tt::from_days(sample.days),
                    apparent_from_true(altitude, &self.view.site.air),
                )
            });
        Half {
            civil,
            minutes_from_sun: match (sun_at, planet_at) {
                (Some(sun), Some(planet)) => {
                    Some((if evening { planet - sun } else { sun - planet }) * 1_440.0)
                }
                _ => None,
            },
            sun_at,
            evening,
        }
    }

    /// The moment of a half night at which the planet first shows to the bare eye in each air, of samples every 4 minutes
    /// away from the Sun's passage of the horizon.
    fn shows(&self, half: &Half, airs: &[Viewer; 3]) -> [Option<Tt>; 3] {
        /// Deeper in the night it is no sighting near the Sun.
        const DARK: Angle = Angle::from_degrees(-20.0);
        const STEP_DAYS: f64 = 4.0 / 1_440.0;
        let mut seen = [None; 3];
        let Some(sun_at) = half.sun_at else {
            return seen;
        };
        let direction = if half.evening { 1.0 } else { -1.0 };
        // Twilight at high latitudes lasts for hours; midnight ends it.
        for k in 1..180 {
            let days = sun_at + direction * f64::from(k) * STEP_DAYS;
            let Some(sample) = self.at(days) else {
                break;
            };
            if sample.subject.z <= PLANET_RISE_SET.sin() || sample.sun.z < DARK.sin() {
                break;
            }
            let subject = standing(sample.subject);
            let altitude = apparent_from_true(subject.altitude(), &self.view.site.air);
            if altitude < self.view.skyline.altitude_at(subject.azimuth()) {
                continue;
            }
            let local = LocalSky {
                instant: Tt::from_days(days),
                subject,
                // The viewers leave moonlight out.
                moon: standing(Vec3::new(0.0, 0.0, -1.0)),
                sun: standing(sample.sun),
                moon_lit_fraction: 0.0,
                magnitude: self.magnitude(days),
                diameter: Angle::ZERO,
            };
            for (slot, air) in seen.iter_mut().zip(airs) {
                if slot.is_some() {
                    continue;
                }
                match air.margin(self.view.site, &local, Aid::NakedEye) {
                    Some(margin) if margin >= 0.0 => *slot = Some(local.instant),
                    // Hazier air shows no more.
                    _ => break,
                }
            }
            if seen.iter().all(Option::is_some) {
                break;
            }
        }
        seen
    }

    fn magnitude(&self, days: f64) -> f64 {
        self.course.piece(days).map_or(99.0, |(before, after, s)| {
            before.magnitude + s * (after.magnitude - before.magnitude)
        })
    }
}

fn span_of(from: f64, to: f64) -> Span {
    Span {
        from: Tt::from_days(from),
        to: Tt::from_days(to),
    }
}

fn standing(direction: Vec3) -> Standing {
    Standing {
        direction: direction.unit(),
        distance_au: 1.0,
    }
}

/// What a user may want of a season.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Want {
    /// A large disc.
    Disc,
    /// High in the sky: at culmination, or at the end of civil twilight for an inner planet.
    High,
    /// Hours in the evening.
    Evening,
    /// A long loop.
    Loop,
    /// A short wait.
    Soon,
}

impl Want {
    pub const ALL: [Want; 5] = [
        Want::Disc,
        Want::High,
        Want::Evening,
        Want::Loop,
        Want::Soon,
    ];

    /// The word used on the command line.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Want::Disc => "disc",
            Want::High => "high",
            Want::Evening => "evening",
            Want::Loop => "loop",
            Want::Soon => "soon",
        }
    }
}

/// What a season has of each thing wanted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Measures {
    pub disc: Angle,
    /// Apparent altitude.
    pub height: Angle,
    /// Hours in the evenings of the season, or minutes after sunset on the best evening: the unit cancels.
    pub evening: f64,
    pub arc: Angle,
    pub wait_days: f64,
}

/// Days of waiting that halve the part for a short wait: ten years. Our choice.
const WAIT_HALVES_DAYS: f64 = 3_652.5;

/// A season's standing among those compared.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ranked {
    /// 1 is best; equal scores share a rank.
    pub rank: usize,
    /// 0 to 1: the product of the wanted parts, each raised to its share of the weights.
    pub score: f64,
    /// In the order of [`Want::ALL`], 0 to 1: the disc, the sine of the height, the evening and the arc over the greatest of
    /// all seasons compared; for the wait, a half for every ten years.
    pub parts: [f64; 5],
}

impl From<(&OuterSeason, &OuterHere, Tt)> for Measures {
    /// Of a season, from one place, at an instant from which the wait counts.
    fn from((season, here, now): (&OuterSeason, &OuterHere, Tt)) -> Self {
        Measures {
            disc: season.diameter,
            height: here.culmination,
            evening: here.evening_hours,
            arc: season.path.as_ref().map_or(Angle::ZERO, Loop::arc),
            wait_days: season.opposition.instant.days() - now.days(),
        }
    }
}

impl From<(&InnerSeason, &InnerHere, Tt)> for Measures {
    /// Of an apparition, from one place, at an instant from which the wait counts; mornings have no evening.
    fn from((season, here, now): (&InnerSeason, &InnerHere, Tt)) -> Self {
        Measures {
            disc: season.diameter,
            height: here.highest.map_or(Angle::ZERO, |best| best.altitude),
            evening: here
                .highest
                .and_then(|best| best.minutes_from_sun)
                .filter(|_| season.evening)
                .unwrap_or(0.0),
            arc: season.arc.unwrap_or(Angle::ZERO),
            wait_days: season.greatest.instant.days() - now.days(),
        }
    }
}

/// Ranks seasons by what is wanted, with positive weights; a want that is not named does not count. The parts stand beside
/// the score whether wanted or not. A part at zero puts a season last.
#[must_use]
pub fn rank(seasons: &[Measures], wanted: &[(Want, f64)]) -> Vec<Ranked> {
    let greatest = |f: fn(&Measures) -> f64| seasons.iter().map(f).fold(0.0, f64::max);
    let part = |value: f64, greatest: f64| {
        if greatest > 0.0 {
            (value / greatest).clamp(0.0, 1.0)
        } else {
            0.0
        }
    };
    let disc: fn(&Measures) -> f64 = |season| season.disc.radians();
    let height: fn(&Measures) -> f64 = |season| season.height.sin();
    let evening: fn(&Measures) -> f64 = |season| season.evening;
    let arc: fn(&Measures) -> f64 = |season| season.arc.radians();
    let most = [disc, height, evening, arc].map(greatest);
    let total: f64 = wanted.iter().map(|(_, weight)| weight.max(0.0)).sum();
    let mut ranked: Vec<Ranked> = seasons
        .iter()
        .map(|season| {
            let [d, h, e, a] = most;
            let parts = [
                part(disc(season), d),
                part(height(season), h),
                part(evening(season), e),
                part(arc(season), a),
                libm::exp2(-season.wait_days.max(0.0) / WAIT_HALVES_DAYS),
            ];
            let mut score = if total > 0.0 { 1.0 } else { 0.0 };
            for (want, value) in Want::ALL.into_iter().zip(parts) {
                let weight: f64 = wanted
                    .iter()
                    .filter(|(other, _)| *other == want)
                    .map(|(_, weight)| weight.max(0.0))
                    .sum();
                if weight > 0.0 {
                    score *= libm::pow(value, weight / total);
                }
            }
            Ranked {
                rank: 0,
                score,
                parts,
            }
        })
        .collect();
    let scores: Vec<f64> = ranked.iter().map(|season| season.score).collect();
    for season in &mut ranked {
        season.rank = 1 + scores.iter().filter(|&&score| score > season.score).count();
    }
    ranked
}
