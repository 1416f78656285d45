//! What happens to a planet: conjunctions, stations, greatest elongations and the like.
//!
//! Geocentric; longitudes apparent, of the true ecliptic and equinox of date. Instants are TT.
//!
//! # How nothing is missed or invented
//! Each quantity is sampled on a grid of its own body whose nodes lie at whole multiples of the step since J2000,
//! never at the ends of the span, and past both ends; a bracket is then narrowed to a tenth of a second. The same
//! event therefore comes out to the last bit from every span that holds it. The step is a fraction of the shortest
//! time between two events of one kind: Mercury is retrograde for at least 19.5 days (1900-2100) and sampled every 4,
//! Venus for 40 and the outer planets for 60 and more and sampled every 8. Stations are roots of the rate of the
//! apparent longitude, nutation included, computed analytically, in which the bending of light behind the Sun has no
//! part: that bending made false stations of Neptune in 2003 in a search that differenced longitudes.
//!
//! The search walks through the span once and hands each event on in order of time; its memory does not grow.

use std::ops::ControlFlow;

use super::search::{minimum, root};
use super::types::{Event, EventKind, EventValue, Span};
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::place::{Place, Side, Sky, SkyError, Vantage};
use crate::sky::{Angle, Body, Cautions, Tt};

/// Length of one stride of the search, days; every body's step divides it.
const STRIDE_DAYS: f64 = 8.0;
/// To what the instant of a root is narrowed: 0.05 s.
const ROOT_TOLERANCE_DAYS: f64 = 5e-7;
/// To what the instant of a least magnitude is narrowed; magnitudes are too flat there for less.
const MINIMUM_TOLERANCE_DAYS: f64 = 2e-4;

/// Kinds of events to look for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Kinds(u32);

impl Kinds {
    pub const NONE: Kinds = Kinds(0);
    /// Configurations with the Sun, stations, greatest elongations, closest approaches.
    pub const CONFIGURATIONS: Kinds = Kinds::of(&[
        EventKind::Conjunction,
        EventKind::InferiorConjunction,
        EventKind::SuperiorConjunction,
        EventKind::Opposition,
        EventKind::QuadratureEast,
        EventKind::QuadratureWest,
        EventKind::StationRetrograde,
        EventKind::StationDirect,
        EventKind::RaStationRetrograde,
        EventKind::RaStationDirect,
        EventKind::GreatestElongationEast,
        EventKind::GreatestElongationWest,
        EventKind::ClosestApproach,
        EventKind::ClosestApproachLightTime,
    ]);
    /// All that concerns one planet and the Sun.
    pub const ALL: Kinds = Kinds(
        Kinds::CONFIGURATIONS.0
            | Kinds::of(&[
                EventKind::GreatestBrightness,
                EventKind::Perihelion,
                EventKind::ConstellationEntry,
            ])
            .0,
    );

    #[must_use]
    pub const fn of(kinds: &[EventKind]) -> Self {
        let mut bits = 0;
        let mut i = 0;
        while i < kinds.len() {
            bits |= 1 << kinds[i] as u32;
            i += 1;
        }
        Kinds(bits)
    }

    #[must_use]
    pub const fn contains(self, kind: EventKind) -> bool {
        self.0 & (1 << kind as u32) != 0
    }

    const fn any(self, kinds: &[EventKind]) -> bool {
        self.0 & Kinds::of(kinds).0 != 0
    }

    /// These kinds and those.
    #[must_use]
    pub const fn and(self, other: Kinds) -> Self {
        Kinds(self.0 | other.0)
    }
}

/// Sampling step of a planet, days: it divides [`STRIDE_DAYS`].
const fn step_days(body: Body) -> f64 {
    match body {
        Body::Mercury => 4.0,
        _ => STRIDE_DAYS,
    }
}

/// How far on either side a magnitude must be the least to count as greatest brightness, days. Venus is at its
/// brightest 36 days either side of inferior conjunction, Mercury once in 116 days, outer planets once a year or more.
const fn brightest_within_days(body: Body) -> f64 {
    match body {
        Body::Mercury | Body::Venus => 32.0,
        _ => 96.0,
    }
}

/// The quantities whose signs are followed, at one instant.
#[derive(Clone, Copy)]
struct Sample {
    days: f64,
    /// Apparent longitude minus the Sun's, -180 to 180 degrees, in radians.
    from_sun: f64,
    longitude_rate: f64,
    ra_rate: f64,
    elongation_rate: f64,
    distance_rate: f64,
    light_distance_rate: f64,
    sun_distance_rate: f64,
    magnitude: f64,
}

/// A planet and the Sun seen from the Earth's centre.
struct Look {
    planet: Place,
    sun: Place,
}

impl Look {
    fn at(sky: &Sky, body: Body, days: f64) -> Result<Self, SkyError> {
        Self::from(&sky.geocentre(Tt::from_days(days))?, body)
    }

    fn from(vantage: &Vantage<'_>, body: Body) -> Result<Self, SkyError> {
        Ok(Look {
            planet: vantage.place(body)?,
            sun: vantage.place(Body::Sun)?,
        })
    }

    fn longitude_off_sun(&self) -> f64 {
        (self.planet.ecliptic_of_date().longitude - self.sun.ecliptic_of_date().longitude)
            .signed()
            .radians()
    }

    fn elongation_rate(&self) -> f64 {
        self.planet.separation_rate(&self.sun).radians()
    }

    fn sun_distance_rate(&self) -> f64 {
        self.planet
            .heliocentric_now
            .dot(self.planet.heliocentric_velocity_now)
    }

    fn magnitude(&self) -> f64 {
        magnitude(&self.planet.geometry(), MarsTerms::Omit).value
    }

    /// Only what `kinds` need is computed; the rest stays 0 and is not looked at.
    fn sample(&self, days: f64, kinds: Kinds) -> Sample {
        use EventKind as K;
        let when = |wanted: &[EventKind], value: &dyn Fn() -> f64| {
            if kinds.any(wanted) { value() } else { 0.0 }
        };
        Sample {
            days,
            from_sun: when(
                &[
                    K::Conjunction,
                    K::InferiorConjunction,
                    K::SuperiorConjunction,
                    K::Opposition,
                    K::QuadratureEast,
                    K::QuadratureWest,
                ],
                &|| self.longitude_off_sun(),
            ),
            longitude_rate: when(&[K::StationRetrograde, K::StationDirect], &|| {
                self.planet.ecliptic_rate().longitude.radians()
            }),
            ra_rate: when(&[K::RaStationRetrograde, K::RaStationDirect], &|| {
                self.planet.equatorial_rate().longitude.radians()
            }),
            elongation_rate: when(
                &[K::GreatestElongationEast, K::GreatestElongationWest],
                &|| self.elongation_rate(),
            ),
            distance_rate: when(&[K::ClosestApproach], &|| {
                self.planet.geometric_distance_rate()
            }),
            light_distance_rate: when(&[K::ClosestApproachLightTime], &|| {
                self.planet.distance_rate()
            }),
            sun_distance_rate: when(&[K::Perihelion], &|| self.sun_distance_rate()),
            magnitude: when(&[K::GreatestBrightness], &|| self.magnitude()),
        }
    }
}

/// The search for one body, between nodes of its grid.
struct Follower<'s> {
    sky: &'s Sky,
    body: Body,
    kinds: Kinds,
    /// The sample before the last; only magnitudes need it.
    older: Option<Sample>,
    last: Option<Sample>,
    walker: Option<super::constellation_walk::Walk>,
}

impl Follower<'_> {
    /// Takes the sample at the next node and gives the events of the interval that ends there (greatest brightness:
    /// of the one before).
    fn step(&mut self, sample: Sample, found: &mut Vec<Event>) -> Result<(), SkyError> {
        if let Some(before) = self.last {
            self.between(before, sample, found)?;
            if let Some(older) = self.older {
                self.brightest(older, before, sample, found)?;
            }
        }
        self.older = self.last;
        self.last = Some(sample);
        Ok(())
    }

    fn between(&mut self, a: Sample, b: Sample, found: &mut Vec<Event>) -> Result<(), SkyError> {
        use EventKind as K;
        self.configurations(a, b, found)?;
        self.rate_root(
            a,
            b,
            |s| s.longitude_rate,
            |look| look.planet.ecliptic_rate().longitude.radians(),
            |falling, look| {
                let kind = if falling {
                    K::StationRetrograde
                } else {
                    K::StationDirect
                };
                Some((
                    kind,
                    EventValue::Longitude(look.planet.ecliptic_of_date().longitude),
                ))
            },
            found,
        )?;
        self.rate_root(
            a,
            b,
            |s| s.ra_rate,
            |look| look.planet.equatorial_rate().longitude.radians(),
            |falling, look| {
                let kind = if falling {
                    K::RaStationRetrograde
                } else {
                    K::RaStationDirect
                };
                Some((
                    kind,
                    EventValue::RightAscension(look.planet.equatorial_of_date().longitude),
                ))
            },
            found,
        )?;
        if self.body.is_inner_planet() {
            self.rate_root(
                a,
                b,
                |s| s.elongation_rate,
                Look::elongation_rate,
                |falling, look| {
                    let kind = match look.planet.side_of(&look.sun) {
                        Side::East => K::GreatestElongationEast,
                        Side::West => K::GreatestElongationWest,
                    };
                    falling.then(|| {
                        (
                            kind,
                            EventValue::Elongation(look.planet.separation(&look.sun)),
                        )
                    })
                },
                found,
            )?;
        }
        self.rate_root(
            a,
            b,
            |s| s.distance_rate,
            |look| look.planet.geometric_distance_rate(),
            |falling, look| {
                let value = EventValue::DistanceAu(look.planet.geometric_distance_au());
                (!falling).then_some((K::ClosestApproach, value))
            },
            found,
        )?;
        self.rate_root(
            a,
            b,
            |s| s.light_distance_rate,
            |look| look.planet.distance_rate(),
            |falling, look| {
                let value = EventValue::DistanceAu(look.planet.distance_au);
                (!falling).then_some((K::ClosestApproachLightTime, value))
            },
            found,
        )?;
        self.rate_root(
            a,
            b,
            |s| s.sun_distance_rate,
            Look::sun_distance_rate,
            |falling, look| {
                let value = EventValue::DistanceAu(look.planet.heliocentric_now.norm());
                (!falling).then_some((K::Perihelion, value))
            },
            found,
        )?;
        if let Some(walk) = &mut self.walker {
            walk.advance(self.sky, self.body, a.days, b.days, found)?;
        }
        Ok(())
    }

    fn event(&self, kind: EventKind, days: f64, value: EventValue, cautions: Cautions) -> Event {
        Event {
            body: self.body,
            kind,
            instant: Tt::from_days(days),
            value,
            with: None,
            cautions: cautions.and(self.sky.cautions()),
        }
    }

    /// Where a rate changes sign; `name` says which event that is (given whether the rate falls), if any.
    fn rate_root(
        &self,
        a: Sample,
        b: Sample,
        of_sample: impl Fn(&Sample) -> f64,
        of_look: impl Fn(&Look) -> f64,
        name: impl Fn(bool, &Look) -> Option<(EventKind, EventValue)>,
        found: &mut Vec<Event>,
    ) -> Result<(), SkyError> {
        let (fa, fb) = (of_sample(&a), of_sample(&b));
        if (fa < 0.0) == (fb < 0.0) {
            return Ok(());
        }
        let days = root((a.days, fa), (b.days, fb), ROOT_TOLERANCE_DAYS, |days| {
            Ok::<_, SkyError>(of_look(&Look::at(self.sky, self.body, days)?))
        })?;
        let look = Look::at(self.sky, self.body, days)?;
        if let Some((kind, value)) = name(fb < 0.0, &look)
            && self.kinds.contains(kind)
        {
            found.push(self.event(kind, days, value, Cautions::NONE));
        }
        Ok(())
    }

    /// Longitudes 0, 90, 180, -90 degrees from the Sun's.
    fn configurations(&self, a: Sample, b: Sample, found: &mut Vec<Event>) -> Result<(), SkyError> {
        use EventKind as K;
        if !self.kinds.any(&[
            K::Conjunction,
            K::InferiorConjunction,
            K::SuperiorConjunction,
            K::Opposition,
            K::QuadratureEast,
            K::QuadratureWest,
        ]) {
            return Ok(());
        }
        let targets: &[(f64, EventKind)] = if self.body.is_inner_planet() {
            &[(0.0, K::InferiorConjunction)]
        } else {
            &[
                (0.0, K::Conjunction),
                (180.0, K::Opposition),
                (90.0, K::QuadratureEast),
                (-90.0, K::QuadratureWest),
            ]
        };
        for &(target, kind) in targets {
            let target = Angle::from_degrees(target);
            let off = |from_sun: f64| (Angle::from_radians(from_sun) - target).signed().radians();
            let (fa, fb) = (off(a.from_sun), off(b.from_sun));
            // A jump from 180 to -180 is the far side, not a root.
            if (fa < 0.0) == (fb < 0.0) || (fa - fb).abs() > std::f64::consts::PI {
                continue;
            }
            let days = root((a.days, fa), (b.days, fb), ROOT_TOLERANCE_DAYS, |days| {
                Ok::<_, SkyError>(off(Look::at(self.sky, self.body, days)?.longitude_off_sun()))
            })?;
            let look = Look::at(self.sky, self.body, days)?;
            let kind = match kind {
                K::InferiorConjunction if look.planet.distance_au > look.sun.distance_au => {
                    K::SuperiorConjunction
                }
                kind => kind,
            };
            if self.kinds.contains(kind) {
                let value = EventValue::Longitude(look.planet.ecliptic_of_date().longitude);
                found.push(self.event(kind, days, value, Cautions::NONE));
            }
        }
        Ok(())
    }

    fn brightest(
        &self,
        a: Sample,
        b: Sample,
        c: Sample,
        found: &mut Vec<Event>,
    ) -> Result<(), SkyError> {
        let least = b.magnitude < a.magnitude && b.magnitude <= c.magnitude;
        if !(least && self.kinds.contains(EventKind::GreatestBrightness)) {
            return Ok(());
        }
        let at = |days: f64| Ok::<_, SkyError>(Look::at(self.sky, self.body, days)?.magnitude());
        let (days, least) = minimum(
            a.days,
            (b.days, b.magnitude),
            c.days,
            MINIMUM_TOLERANCE_DAYS,
            at,
        )?;
        let step = step_days(self.body);
        let count = (brightest_within_days(self.body) / step) as i32;
        for k in 1..=count {
            for days in [b.days - f64::from(k) * step, b.days + f64::from(k) * step] {
                match at(days) {
                    Ok(other) if other < least => return Ok(()),
                    // Past the end of the ephemeris nothing contradicts the candidate.
                    Ok(_) | Err(SkyError::OutsideSource { .. }) => {}
                    Err(error) => return Err(error),
                }
            }
        }
        let look = Look::at(self.sky, self.body, days)?;
        let flagged = magnitude(&look.planet.geometry(), MarsTerms::Omit);
        let value = EventValue::Magnitude(flagged.value);
        found.push(self.event(EventKind::GreatestBrightness, days, value, flagged.cautions));
        Ok(())
    }
}

/// Hands on every event of the kinds asked for within the span, in order of time.
///
/// `on_event` may stop the search. Bodies without such events (the Sun, the Moon) are passed over.
///
/// # Errors
/// A span that the sky does not cover.
pub fn for_each_event(
    sky: &Sky,
    bodies: &[Body],
    kinds: Kinds,
    span: Span,
    mut on_event: impl FnMut(Event) -> ControlFlow<()>,
) -> Result<(), SkyError> {
    let mut followers: Vec<Follower<'_>> = bodies
        .iter()
        .filter(|body| body.is_inner_planet() || body.is_outer_planet())
        .map(|&body| Follower {
            sky,
            body,
            kinds,
            older: None,
            last: None,
            walker: kinds
                .contains(EventKind::ConstellationEntry)
                .then(super::constellation_walk::Walk::default),
        })
        .collect();
    if followers.is_empty() || kinds == Kinds::NONE {
        return Ok(());
    }
    // One stride more on either side: a root may be refined across the edge, and greatest brightness is known only
    // one node late.
    let first = (span.from.days() / STRIDE_DAYS).floor() as i64 - 1;
    let last = (span.to.days() / STRIDE_DAYS).ceil() as i64 + 1;
    let fine = (STRIDE_DAYS / 4.0) as i64;
    let mut waiting: Vec<Event> = Vec::new();
    for stride in first..=last {
        for part in 0..fine {
            let days = stride as f64 * STRIDE_DAYS + part as f64 * 4.0;
            if !followers.iter().any(|f| on_grid(f.body, part)) {
                continue;
            }
            let vantage = sky.geocentre(Tt::from_days(days))?;
            let sun = vantage.place(Body::Sun)?;
            for follower in followers.iter_mut().filter(|f| on_grid(f.body, part)) {
                let look = Look {
                    planet: vantage.place(follower.body)?,
                    sun,
                };
                follower.step(look.sample(days, kinds), &mut waiting)?;
            }
        }
        // Every body's events before two strides ago are known by now.
        let settled = Tt::from_days((stride as f64 - 2.0) * STRIDE_DAYS);
        if hand_on(&mut waiting, settled, span, &mut on_event).is_break() {
            return Ok(());
        }
    }
    let _ = hand_on(&mut waiting, Tt::from_days(f64::MAX), span, &mut on_event);
    Ok(())
}

/// Whether a body's grid has a node at this quarter of a stride.
fn on_grid(body: Body, part: i64) -> bool {
    part == 0 || step_days(body) < STRIDE_DAYS
}

fn hand_on(
    waiting: &mut Vec<Event>,
    settled: Tt,
    span: Span,
    on_event: &mut impl FnMut(Event) -> ControlFlow<()>,
) -> ControlFlow<()> {
    waiting.sort_by(|a, b| {
        a.instant
            .days()
            .total_cmp(&b.instant.days())
            .then(a.body.cmp(&b.body))
    });
    let count = waiting.partition_point(|event| event.instant < settled);
    for event in waiting.drain(..count) {
        if span.contains(event.instant) {
            on_event(event)?;
        }
    }
    ControlFlow::Continue(())
}

/// All events of the kinds asked for within the span, in order of time.
///
/// # Errors
/// A span that the sky does not cover.
pub fn events(
    sky: &Sky,
    bodies: &[Body],
    kinds: Kinds,
    span: Span,
) -> Result<Vec<Event>, SkyError> {
    let mut all = Vec::new();
    for_each_event(sky, bodies, kinds, span, |event| {
        all.push(event);
        ControlFlow::Continue(())
    })?;
    Ok(all)
}
