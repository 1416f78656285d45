//! How dark every night of a season is, and when the subject stands in the open: what a picture of the season needs.
//!
//! The ephemeris is asked every six hours; a polynomial of the fourth degree through the five answers of a night and the
//! sidereal time give altitudes anywhere between, with the parallax of the site put in. Against the full chain of
//! [`Sky::observer`] they differ by less than 2" for Sun and planets and 5" for the Moon. Times are TT, found to 3 s;
//! altitudes of the Sun true, of its centre.
//!
//! "In view" is a plain test of altitude, skyline and the Sun's depth by [`Conditions`]; hours, weekdays and Moon do not
//! enter, and an opening shorter than ten minutes may be missed. Stretches from an exact search can take its place
//! ([`Darkness::set_in_view`]).

use super::conditions::Conditions;
use super::moment::night_at;
use super::types::Span;
use crate::sky::frames::apparent_sidereal_time;
use crate::sky::place::{AU_KM, Sky, SkyError};
use crate::sky::refraction::apparent_from_true;
use crate::sky::skyline::Cursor;
use crate::sky::{Angle, Body, Site, Skyline, Tt, Vec3};

/// Samples of a night, one every ten minutes, both ends included.
const SAMPLES: usize = 145;
/// Questions to the ephemeris in a night, both ends included.
const NODES: usize = 5;
/// Where a stretch begins and ends is found to this, days.
const TOLERANCE_DAYS: f64 = 3.0 / 86_400.0;

/// The nights of a season.
#[derive(Clone, Debug, PartialEq)]
pub struct Darkness {
    pub subject: Body,
    /// One after the other, without gaps.
    pub nights: Vec<NightLight>,
}

/// The light of one night.
#[derive(Clone, Debug, PartialEq)]
pub struct NightLight {
    /// From local mean noon to the next.
    pub span: Span,
    /// True altitude of the Sun's centre at even instants, both ends of the span included.
    pub sun_altitudes: Vec<Angle>,
    /// When the Moon is up: upper limb, level horizon, standard refraction.
    pub moon_up: Vec<Span>,
    /// Of the Moon at the middle of the night, 0 to 1.
    pub moon_lit: f64,
    /// When the subject stands above the least altitude and the skyline while the Sun is low enough.
    pub in_view: Vec<Span>,
}

impl NightLight {
    /// The stretch around midnight in which the Sun's centre is below a true altitude; `None` where it never is. The ends
    /// are good to 20 s where the Sun does not merely graze the altitude.
    #[must_use]
    pub fn sun_below(&self, limit: Angle) -> Option<Span> {
        let samples = &self.sun_altitudes;
        let step = self.span.days() / samples.len().saturating_sub(1).max(1) as f64;
        let is_below = |index: usize| samples.get(index).is_some_and(|&altitude| altitude < limit);
        // The lowest is surely within, if any is.
        let lowest = (0..samples.len()).min_by(|&a, &b| {
            let altitude = |index: usize| samples.get(index).map_or(0.0, |angle| angle.radians());
            altitude(a).total_cmp(&altitude(b))
        })?;
        if !is_below(lowest) {
            return None;
        }
        let first = (0..lowest)
            .rev()
            .take_while(|&at| is_below(at))
            .last()
            .unwrap_or(lowest);
        let last = (lowest..samples.len())
            .take_while(|&at| is_below(at))
            .last()
            .unwrap_or(lowest);
        // Straight between the last sample on one side and the first on the other.
        let instant = |inside: usize, outside: Option<usize>| {
            let here = inside as f64;
            let beyond = outside.and_then(|outside| {
                let (a, b) = (
                    samples.get(inside)?.radians(),
                    samples.get(outside)?.radians(),
                );
                let share = (limit.radians() - a) / (b - a);
                Some(here + (outside as f64 - here) * share)
            });
            self.span.from.plus_days(beyond.unwrap_or(here) * step)
        };
        Some(Span {
            from: instant(first, first.checked_sub(1)),
            to: instant(last, Some(last + 1)),
        })
    }

    /// Days in which the subject is in view.
    #[must_use]
    pub fn days_in_view(&self) -> f64 {
        self.in_view.iter().map(|stretch| stretch.days()).sum()
    }
}

impl Darkness {
    /// The number of the night that holds an instant.
    #[must_use]
    pub fn night_of(&self, instant: Tt) -> Option<usize> {
        let after = self
            .nights
            .partition_point(|night| night.span.from <= instant);
        let index = after.checked_sub(1)?;
        self.nights
            .get(index)
            .filter(|night| night.span.contains(instant))
            .map(|_| index)
    }

    /// Puts stretches found elsewhere in the place of the plain ones. Each belongs to the night in which it begins;
    /// those that begin outside the season are left out.
    pub fn set_in_view(&mut self, stretches: impl IntoIterator<Item = Span>) {
        for night in &mut self.nights {
            night.in_view.clear();
        }
        for stretch in stretches {
            let night = self.night_of(stretch.from);
            if let Some(night) = night.and_then(|index| self.nights.get_mut(index)) {
                night.in_view.push(stretch);
            }
        }
    }
}

/// What stands in the way and what is asked for.
#[derive(Clone, Copy)]
pub struct Place<'a> {
    pub site: &'a Site,
    pub skyline: &'a Skyline,
    pub conditions: &'a Conditions,
}

/// The nights whose evenings lie in a span.
///
/// # Errors
/// A span that the sky does not cover.
pub fn darkness(
    sky: &Sky,
    place: Place<'_>,
    subject: Body,
    span: Span,
) -> Result<Darkness, SkyError> {
    let mut nights = Vec::new();
    // 18h of the first civil day, whatever the zone, lies in the night that its evening begins.
    let mut night = night_at(sky, place.site, span.from.plus_days(0.75));
    let mut cursor = place.skyline.cursor();
    let mut opening = None;
    while night.from < span.to {
        let track = NightTrack::new(sky, place.site, subject, night, opening)?;
        nights.push(track.light(place, &mut cursor));
        opening = track.nodes.last().copied();
        // The end of one night is the beginning of the next, to the bit.
        night = Span {
            from: night.to,
            to: night_at(sky, place.site, night.to.plus_days(0.5)).to,
        };
    }
    Ok(Darkness { subject, nights })
}

/// What the ephemeris says at one instant: au on the true equator and equinox of date, from the Earth's centre.
#[derive(Clone, Copy)]
struct Node {
    sun: Vec3,
    moon: Vec3,
    subject: Vec3,
    /// Local apparent sidereal time, 0 to a turn.
    sidereal: f64,
    moon_lit: f64,
}

impl Node {
    fn new(sky: &Sky, site: &Site, subject: Body, instant: Tt) -> Result<Self, SkyError> {
        let vantage = sky.geocentre(instant)?;
        let of_date = vantage.frame().equatorial_from_icrs;
        let at = |body: Body| -> Result<Vec3, SkyError> {
            let place = vantage.place(body)?;
            Ok(of_date * (place.apparent * place.distance_au))
        };
        let ut1 = sky.tables().ut1_from_tt(instant);
        let sidereal = apparent_sidereal_time(ut1, instant, vantage.frame()) + site.longitude;
        Ok(Node {
            sun: at(Body::Sun)?,
            moon: at(Body::Moon)?,
            subject: at(subject)?,
            sidereal: sidereal.wrapped().radians(),
            moon_lit: vantage.place(Body::Moon)?.geometry().lit_fraction(),
        })
    }
}

/// A night in which altitudes cost little.
struct NightTrack {
    span: Span,
    nodes: [Node; NODES],
    /// Sidereal time gained over the night, radians.
    turn: f64,
    sin_latitude: f64,
    cos_latitude: f64,
    axial_au: f64,
    polar_au: f64,
}

/// An instant of a night.
struct Instant<'a> {
    track: &'a NightTrack,
    weights: [f64; NODES],
    sin: f64,
    cos: f64,
}

impl NightTrack {
    fn new(
        sky: &Sky,
        site: &Site,
        subject: Body,
        span: Span,
        opening: Option<Node>,
    ) -> Result<Self, SkyError> {
        let node = |index: usize| {
            let days = span.days() * index as f64 / (NODES - 1) as f64;
            Node::new(sky, site, subject, span.from.plus_days(days))
        };
        let first = match opening {
            Some(node) => node,
            None => node(0)?,
        };
        let nodes = [first, node(1)?, node(2)?, node(3)?, node(4)?];
        let [.., last] = nodes;
        // A day of the Sun is a turn and a little more among the stars.
        let gained = last.sidereal - first.sidereal;
        let turn = std::f64::consts::TAU + Angle::from_radians(gained).signed().radians();
        let (sin_latitude, cos_latitude) = site.latitude.sin_cos();
        let (axial_au, polar_au) = site.geocentric_au();
        Ok(NightTrack {
            span,
            nodes,
            turn,
            sin_latitude,
            cos_latitude,
            axial_au,
            polar_au,
        })
    }

    /// At `share` (0 to 1) of the night.
    fn at(&self, share: f64) -> Instant<'_> {
        let [first, ..] = self.nodes;
        let (sin, cos) = libm::sincos(first.sidereal + self.turn * share);
        // Lagrange's weights for nodes at 0 to 4.
        let x = share * (NODES - 1) as f64;
        let (a, b, c, d, e) = (x, x - 1.0, x - 2.0, x - 3.0, x - 4.0);
        Instant {
            track: self,
            weights: [
                b * c * d * e / 24.0,
                a * c * d * e / -6.0,
                a * b * d * e / 4.0,
                a * b * c * e / -6.0,
                a * b * c * d / 24.0,
            ],
            sin,
            cos,
        }
    }

    fn light(&self, place: Place<'_>, cursor: &mut Cursor<'_>) -> NightLight {
        let days = |share: f64| self.span.from.plus_days(share * self.span.days());
        let mut sun_altitudes = Vec::with_capacity(SAMPLES);
        let mut moon = Stretches::default();
        let mut view = Stretches::default();
        for sample in 0..SAMPLES {
            let share = sample as f64 / (SAMPLES - 1) as f64;
            let instant = self.at(share);
            sun_altitudes.push(Angle::from_radians(instant.sun_altitude()));
            moon.sample(share, instant.moon_over(), |share| {
                self.at(share).moon_over()
            });
            let over = instant.in_view_by(place, cursor);
            view.sample(share, over, |share| {
                self.at(share).in_view_by(place, cursor)
            });
        }
        let [_, _, middle, ..] = self.nodes;
        let spans = |stretches: Stretches| {
            stretches
                .closed()
                .into_iter()
                .map(|(from, to)| Span {
                    from: days(from),
                    to: if to >= 1.0 { self.span.to } else { days(to) },
                })
                .collect()
        };
        NightLight {
            span: self.span,
            sun_altitudes,
            moon_up: spans(moon),
            moon_lit: middle.moon_lit,
            in_view: spans(view),
        }
    }
}

impl Instant<'_> {
    /// On local axes (east, north, up), au from the site.
    fn local(&self, of: impl Fn(&Node) -> Vec3) -> Vec3 {
        let track = self.track;
        let v = track
            .nodes
            .iter()
            .zip(self.weights)
            .fold(Vec3::ZERO, |sum, (node, weight)| sum + of(node) * weight);
        let meridian = self.cos * v.x + self.sin * v.y - track.axial_au;
        let east = self.cos * v.y - self.sin * v.x;
        let polar = v.z - track.polar_au;
        Vec3::new(
            east,
            track.cos_latitude * polar - track.sin_latitude * meridian,
            track.cos_latitude * meridian + track.sin_latitude * polar,
        )
    }

    /// Radians.
    fn sun_altitude(&self) -> f64 {
        altitude(self.local(|node| node.sun))
    }

    /// The Moon's altitude above that at which it rises and sets, radians.
    fn moon_over(&self) -> f64 {
        let local = self.local(|node| node.moon);
        let semidiameter = Body::Moon.radius_km() / AU_KM / local.norm();
        altitude(local) + semidiameter - MOON_LIMB.radians()
    }

    /// Least margin of the conditions, radians; not negative when the subject is in view.
    fn in_view_by(&self, place: Place<'_>, cursor: &mut Cursor<'_>) -> f64 {
        let conditions = place.conditions;
        let dark = conditions.sun_below.radians() - self.sun_altitude();
        let local = self.local(|node| node.subject);
        let true_altitude = altitude(local);
        // Far below, or in daylight, the rest need not be known.
        if true_altitude < -0.2 || dark < -0.2 {
            return dark.min(true_altitude);
        }
        let apparent = apparent_from_true(Angle::from_radians(true_altitude), &place.site.air);
        let azimuth = Angle::from_radians(libm::atan2(local.x, local.y));
        let skyline = cursor.altitude_at(azimuth) + conditions.clearance;
        let least = skyline.radians().max(conditions.least_altitude.radians());
        dark.min(apparent.radians() - least)
    }
}

/// Of the Moon's upper limb when it rises or sets, as in [`super::horizon::Threshold::RiseSet`].
const MOON_LIMB: Angle = Angle::from_degrees(-34.0 / 60.0);

fn altitude(local: Vec3) -> f64 {
    libm::asin((local.z / local.norm()).clamp(-1.0, 1.0))
}

/// Collects the stretches in which a sampled value is not negative.
#[derive(Default)]
struct Stretches {
    found: Vec<(f64, f64)>,
    open: Option<f64>,
    last: Option<(f64, bool)>,
}

impl Stretches {
    fn sample(&mut self, share: f64, value: f64, mut f: impl FnMut(f64) -> f64) {
        let holds = value >= 0.0;
        match self.last {
            None if holds => self.open = Some(share),
            Some((before, held)) if held != holds => {
                // By halves: a wall in the skyline makes the value jump.
                let (mut from, mut to) = (before, share);
                while to - from > TOLERANCE_DAYS {
                    let middle = 0.5 * (from + to);
                    if (f(middle) >= 0.0) == held {
                        from = middle;
                    } else {
                        to = middle;
                    }
                }
                let change = 0.5 * (from + to);
                match self.open.take() {
                    Some(open) => self.found.push((open, change)),
                    None => self.open = Some(change),
                }
            }
            _ => {}
        }
        self.last = Some((share, holds));
    }

    fn closed(mut self) -> Vec<(f64, f64)> {
        if let (Some(open), Some((last, _))) = (self.open, self.last) {
            self.found.push((open, last));
        }
        self.found
    }
}
