//! Where subject, Moon and Sun stand in the sky of a site, at any instant of a span, for a fraction of the cost of a place.
//!
//! The ephemeris is asked every six hours for apparent geocentric positions (au, axes of date) and their rates; a cubic
//! through two of these and the sidereal time give altitude and azimuth anywhere between, with the parallax of the site
//! and the diurnal aberration put in exactly. Differences from the full chain of [`Sky::observer`]: 0.05" for planets
//! and Sun, 0.6" for the Moon (the annual aberration of its parallax, and the cubic), which is 0.04 s of an ordinary
//! rising. Times are TT; altitudes unrefracted, of centres.

use super::types::Span;
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::physical::semidiameter;
use crate::sky::place::{AU_KM, LIGHT_AU_PER_DAY, Place, Sky, SkyError};
use crate::sky::time::J2000_JD;
use crate::sky::{Angle, Body, Cautions, Site, Tt, Utc, Vec3, frames};

/// Days between questions to the ephemeris.
const NODE_STEP: f64 = 0.25;
/// Samples kept between two nodes: 20 minutes.
const SAMPLES_PER_NODE: usize = 18;
pub(super) const SAMPLE_STEP: f64 = NODE_STEP / SAMPLES_PER_NODE as f64;
/// What is known before the first night and after the last, days: more than the Sun-is-down rule looks back.
pub(super) const MARGIN_DAYS: f64 = 0.25;
/// Turning rate of the Earth, radians a day (IERS Conventions 2010, table 1.2).
const SPIN: f64 = std::f64::consts::TAU * 1.002_737_811_911_354_6;

/// Position and rate per node step, au on the true equator and equinox of date.
#[derive(Clone, Copy, Debug, Default)]
struct Motion {
    at: Vec3,
    rate: Vec3,
}

impl Motion {
    fn apparent(place: &Place) -> Motion {
        let vector = place.apparent * place.distance_au;
        let rate =
            place.apparent_rate() * place.distance_au + place.apparent * place.distance_rate();
        Motion::of(place, vector, rate)
    }

    fn astrometric(place: &Place) -> Motion {
        Motion::of(place, place.astrometric, place.astrometric_rate)
    }

    fn of(place: &Place, vector: Vec3, rate: Vec3) -> Motion {
        Motion {
            at: place.frame.equatorial_from_icrs * vector,
            rate: place.frame.equatorial_rate(vector, rate) * NODE_STEP,
        }
    }
}

/// What the ephemeris says at one instant.
#[derive(Clone, Copy, Debug)]
struct Node {
    /// Local apparent sidereal time, radians, growing without wrapping.
    sidereal: f64,
    subject: Motion,
    moon: Motion,
    sun: Motion,
    moon_astrometric: Motion,
    sun_astrometric: Motion,
    /// Of the subject, geocentric.
    magnitude: f64,
}

/// Which of the three.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Which {
    Subject,
    Moon,
    Sun,
}

/// An instant between two nodes, ready to be used for several bodies.
pub(super) struct Between<'a> {
    tracks: &'a SiteTracks,
    before: &'a Node,
    after: &'a Node,
    /// Weights of the two positions and the two rates.
    weights: [f64; 4],
    /// 0 to 1 between the nodes.
    share: f64,
    sin: f64,
    cos: f64,
}

/// Where a body stands, seen from the site.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Standing {
    /// East, north, up: unit vector.
    pub direction: Vec3,
    pub distance_au: f64,
}

impl Standing {
    /// Of the centre, unrefracted.
    #[must_use]
    pub fn altitude(&self) -> Angle {
        Angle::from_radians(libm::asin(self.direction.z.clamp(-1.0, 1.0)))
    }

    /// From north through east, 0 to 360 degrees.
    #[must_use]
    pub fn azimuth(&self) -> Angle {
        Angle::from_radians(libm::atan2(self.direction.x, self.direction.y)).wrapped()
    }

    /// Angle to another body seen from the same site.
    #[must_use]
    pub fn separation(&self, other: &Standing) -> Angle {
        self.direction.separation(other.direction)
    }
}

impl Between<'_> {
    fn cubic(&self, motion: impl Fn(&Node) -> Motion) -> Vec3 {
        let [at_before, rate_before, at_after, rate_after] = self.weights;
        let (before, after) = (motion(self.before), motion(self.after));
        before.at * at_before
            + before.rate * rate_before
            + after.at * at_after
            + after.rate * rate_after
    }

    /// From the axes of date at the Earth's centre to local ones (east, north, up) at the site, au.
    fn topocentric(&self, v: Vec3) -> Vec3 {
        let tracks = self.tracks;
        let meridian = self.cos * v.x + self.sin * v.y;
        let east = self.cos * v.y - self.sin * v.x;
        Vec3::new(
            east,
            tracks.cos_latitude * v.z - tracks.sin_latitude * meridian - tracks.site_north_au,
            tracks.cos_latitude * meridian + tracks.sin_latitude * v.z - tracks.site_up_au,
        )
    }

    pub(super) fn standing(&self, which: Which) -> Standing {
        let geocentric = self.cubic(|node| match which {
            Which::Subject => node.subject,
            Which::Moon => node.moon,
            Which::Sun => node.sun,
        });
        let local = self.topocentric(geocentric);
        let distance_au = local.norm();
        let mut direction = local * (1.0 / distance_au);
        // The site moves due east; what is along the line of sight changes nothing at this size.
        let push = self.tracks.diurnal_aberration;
        let along = push * direction.x;
        direction = Vec3::new(
            direction.x + push - along * direction.x,
            direction.y - along * direction.y,
            direction.z - along * direction.z,
        );
        Standing {
            direction,
            distance_au,
        }
    }

    /// Lit fraction of the Moon's disc as seen from the site, 0 to 1.
    pub(super) fn moon_lit_fraction(&self) -> f64 {
        let moon = self.cubic(|node| node.moon_astrometric);
        let from_sun = moon - self.cubic(|node| node.sun_astrometric);
        let tracks = self.tracks;
        // The Sun's direction on local axes, without the shift of the site.
        let site = Vec3::new(0.0, tracks.site_north_au, tracks.site_up_au);
        let seen = self.topocentric(moon).unit();
        let lit_from = (self.topocentric(from_sun) + site).unit();
        (0.5 * (1.0 + seen.dot(lit_from))).clamp(0.0, 1.0)
    }

    pub(super) fn magnitude(&self) -> f64 {
        self.before.magnitude + self.share * (self.after.magnitude - self.before.magnitude)
    }
}

/// Values at the even samples, kept for searches.
#[derive(Clone, Debug, Default)]
pub(super) struct Sampled {
    /// Sine of the altitude of each body.
    pub subject: Vec<f64>,
    pub moon: Vec<f64>,
    pub sun: Vec<f64>,
    /// Component of the subject's direction towards the east.
    pub subject_east: Vec<f64>,
    /// Cosine of the angle between Moon and subject.
    pub moon_cosine: Vec<f64>,
    pub moon_distance_au: Vec<f64>,
    pub sun_distance_au: Vec<f64>,
}

/// The three bodies over a span of nights at a site.
#[derive(Clone, Debug)]
pub struct SiteTracks {
    site: Site,
    subject: Body,
    sin_latitude: f64,
    cos_latitude: f64,
    /// The site seen from the Earth's centre on its own axes.
    site_north_au: f64,
    site_up_au: f64,
    /// Speed of the site over that of light.
    diurnal_aberration: f64,
    from: f64,
    nodes: Vec<Node>,
    pub(super) sampled: Sampled,
    nights: Vec<NightSpan>,
    cautions: Cautions,
}

/// The 24 hours from one local mean noon to the next.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NightSpan {
    pub span: Span,
    /// 18h local mean time, which names the night.
    pub evening: Utc,
    /// Its first noon.
    pub noon: Utc,
}

impl SiteTracks {
    /// Follows the three bodies through every night that shares an instant with the span.
    ///
    /// # Errors
    /// A span that the sky, with half a day more on either side, does not cover.
    pub fn new(sky: &Sky, site: &Site, subject: Body, span: Span) -> Result<Self, SkyError> {
        let nights = night_spans(sky, site, span);
        let bounds = match (nights.first(), nights.last()) {
            (Some(first), Some(last)) => Span {
                from: first.span.from,
                to: last.span.to,
            },
            _ => Span {
                from: span.from,
                to: span.from,
            },
        };
        let from = bounds.from.days() - MARGIN_DAYS;
        let pieces = ((bounds.days() + 2.0 * MARGIN_DAYS) / NODE_STEP)
            .ceil()
            .max(1.0) as usize;
        let (sin_latitude, cos_latitude) = site.latitude.sin_cos();
        let (axial_au, polar_au) = site.geocentric_au();
        let mut tracks = SiteTracks {
            site: site.clone(),
            subject,
            sin_latitude,
            cos_latitude,
            site_north_au: cos_latitude * polar_au - sin_latitude * axial_au,
            site_up_au: cos_latitude * axial_au + sin_latitude * polar_au,
            diurnal_aberration: SPIN * axial_au / LIGHT_AU_PER_DAY,
            from,
            nodes: Vec::with_capacity(pieces + 1),
            sampled: Sampled::default(),
            nights,
            cautions: sky.cautions(),
        };
        for k in 0..=pieces {
            let node = tracks.node(sky, Tt::from_days(from + k as f64 * NODE_STEP))?;
            tracks.nodes.push(node);
        }
        tracks.sample();
        Ok(tracks)
    }

    fn node(&self, sky: &Sky, instant: Tt) -> Result<Node, SkyError> {
        let vantage = sky.geocentre(instant)?;
        let ut1 = sky.tables().ut1_from_tt(instant);
        let wrapped =
            frames::apparent_sidereal_time(ut1, instant, vantage.frame()) + self.site.longitude;
        let sidereal = match self.nodes.last() {
            None => wrapped.wrapped().radians(),
            Some(last) => {
                let expected = last.sidereal + SPIN * NODE_STEP;
                expected + (wrapped - Angle::from_radians(expected)).signed().radians()
            }
        };
        let (moon, sun) = (vantage.place(Body::Moon)?, vantage.place(Body::Sun)?);
        let subject = match self.subject {
            Body::Moon => moon,
            Body::Sun => sun,
            planet => vantage.place(planet)?,
        };
        Ok(Node {
            sidereal,
            subject: Motion::apparent(&subject),
            moon: Motion::apparent(&moon),
            sun: Motion::apparent(&sun),
            moon_astrometric: Motion::astrometric(&moon),
            sun_astrometric: Motion::astrometric(&sun),
            magnitude: magnitude(&subject.geometry(), MarsTerms::Omit).value,
        })
    }

    fn sample(&mut self) {
        let count = (self.nodes.len().saturating_sub(1)) * SAMPLES_PER_NODE + 1;
        let mut sampled = Sampled::default();
        for k in 0..count {
            let Some(between) = self.between(self.from + k as f64 * SAMPLE_STEP) else {
                continue;
            };
            let [subject, moon, sun] =
                [Which::Subject, Which::Moon, Which::Sun].map(|which| between.standing(which));
            sampled.subject.push(subject.direction.z);
            sampled.moon.push(moon.direction.z);
            sampled.sun.push(sun.direction.z);
            sampled.subject_east.push(subject.direction.x);
            sampled
                .moon_cosine
                .push(subject.direction.dot(moon.direction));
            sampled.moon_distance_au.push(moon.distance_au);
            sampled.sun_distance_au.push(sun.distance_au);
        }
        self.sampled = sampled;
    }

    /// `None` outside the span (with its margin).
    pub(super) fn between(&self, days: f64) -> Option<Between<'_>> {
        let since = (days - self.from) / NODE_STEP;
        // A rounding error beyond the ends does no harm to a cubic.
        if !(-1e-6..=self.nodes.len() as f64).contains(&since) {
            return None;
        }
        let index = (since as usize).min(self.nodes.len().saturating_sub(2));
        let (before, after) = (self.nodes.get(index)?, self.nodes.get(index + 1)?);
        let s = since - index as f64;
        if s > 1.0 + 1e-6 {
            return None;
        }
        let rest = 1.0 - s;
        let (sin, cos) = libm::sincos(before.sidereal + s * (after.sidereal - before.sidereal));
        Some(Between {
            tracks: self,
            before,
            after,
            weights: [
                rest * rest * (1.0 + 2.0 * s),
                s * rest * rest,
                s * s * (3.0 - 2.0 * s),
                -s * s * rest,
            ],
            share: s,
            sin,
            cos,
        })
    }

    /// Where a body stands at an instant; straight down outside the span, where nothing is asked.
    pub(super) fn standing(&self, which: Which, days: f64) -> Standing {
        self.between(days).map_or(
            Standing {
                direction: Vec3::new(0.0, 0.0, -1.0),
                distance_au: 1.0,
            },
            |between| between.standing(which),
        )
    }

    /// Instant of the first sample.
    pub(super) fn start_days(&self) -> f64 {
        self.from
    }

    /// Upper bound of the subject's speed on the local sky, radians a day.
    pub(super) fn subject_speed(&self) -> f64 {
        // The Moon gains by its own motion (15 degrees a day at most) and by its parallax (a 55th of the turning rate).
        if self.subject == Body::Moon {
            6.75
        } else {
            6.4
        }
    }

    #[must_use]
    pub fn site(&self) -> &Site {
        &self.site
    }

    #[must_use]
    pub fn subject(&self) -> Body {
        self.subject
    }

    /// The nights in order.
    #[must_use]
    pub fn night_spans(&self) -> &[NightSpan] {
        &self.nights
    }

    #[must_use]
    pub fn cautions(&self) -> Cautions {
        self.cautions
    }

    /// The sky of the site at an instant; `None` outside the nights.
    #[must_use]
    pub fn at(&self, instant: Tt) -> Option<LocalSky> {
        let between = self.between(instant.days())?;
        let [subject, moon, sun] =
            [Which::Subject, Which::Moon, Which::Sun].map(|which| between.standing(which));
        Some(LocalSky {
            instant,
            subject,
            moon,
            sun,
            moon_lit_fraction: between.moon_lit_fraction(),
            magnitude: between.magnitude(),
            diameter: semidiameter(self.subject, subject.distance_au) * 2.0,
        })
    }
}

/// A round body touching a horizon with its upper limb, or another body with any.
#[derive(Clone, Copy, Debug)]
pub(super) struct Limb {
    sin_horizon: f64,
    cos_horizon: f64,
    radius_au: f64,
}

impl Limb {
    /// `horizon`: true altitude at which a point stands on the horizon.
    pub(super) fn new(body: Body, horizon: Angle) -> Self {
        let (sin_horizon, cos_horizon) = horizon.sin_cos();
        Limb {
            sin_horizon,
            cos_horizon,
            radius_au: body.radius_km() / AU_KM,
        }
    }

    /// Sine and cosine of the semidiameter.
    fn semidiameter(self, distance_au: f64) -> (f64, f64) {
        let sin = (self.radius_au / distance_au).min(1.0);
        (sin, (1.0 - sin * sin).sqrt())
    }

    /// Sine of the altitude of the centre when the upper limb is on the horizon.
    pub(super) fn sine(self, distance_au: f64) -> f64 {
        let (sin, cos) = self.semidiameter(distance_au);
        self.sin_horizon * cos - self.cos_horizon * sin
    }

    /// Cosine of the semidiameter.
    pub(super) fn cosine(self, distance_au: f64) -> f64 {
        self.semidiameter(distance_au).1
    }
}

/// Subject, Moon and Sun over a site at one instant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LocalSky {
    pub instant: Tt,
    pub subject: Standing,
    pub moon: Standing,
    pub sun: Standing,
    /// 0 to 1.
    pub moon_lit_fraction: f64,
    /// Of the subject, V, outside the air, without the rotation and season terms of Mars.
    pub magnitude: f64,
    /// Equatorial, of the subject.
    pub diameter: Angle,
}

/// The nights, from local mean noon (12h - longitude/15 UTC) on, that share an instant with the span.
fn night_spans(sky: &Sky, site: &Site, span: Span) -> Vec<NightSpan> {
    let tables = sky.tables();
    let shift = site.longitude.signed().degrees() / 360.0;
    // A Julian day begins at noon of its date.
    let number = |tt: Tt| (tables.utc_from_tt(tt).days() + J2000_JD + shift).floor();
    let (first, last) = (number(span.from), number(span.to));
    let mut nights = Vec::new();
    let mut day = first;
    while day <= last {
        let noon = Utc::from_days(day - J2000_JD - shift);
        let night = Span {
            from: tables.tt_from_utc(noon),
            to: tables.tt_from_utc(noon.plus_days(1.0)),
        };
        if night.from < span.to && span.from < night.to {
            nights.push(NightSpan {
                span: night,
                evening: noon.plus_days(0.25),
                noon,
            });
        }
        day += 1.0;
    }
    nights
}
