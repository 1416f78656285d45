//! Rising, setting, twilight and transit at a site.
//!
//! Altitudes are topocentric, of the body's centre, unrefracted, without dip: the almanac definition, in which the
//! usual 34' of refraction stand in the threshold. What hides behind roofs is the business of skylines, not of this.

use super::search::{minimum, root};
use super::types::Span;
use crate::sky::place::{AU_KM, Place, Sky, SkyError};
use crate::sky::{Angle, Body, Site, Tt};

/// Between samples of an altitude: 20 minutes.
const STEP_DAYS: f64 = 1.0 / 72.0;
/// To what a crossing is narrowed: 0.02 s.
const TOLERANCE_DAYS: f64 = 2e-7;

/// The altitude at which something counts as happening.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Threshold {
    /// Rise and set as almanacs print them: the Sun's and Moon's upper limb and a planet's centre in a standard
    /// refraction of 34': Sun -50', planets -34', Moon -(34' + semidiameter) by its distance.
    RiseSet,
    /// A fixed unrefracted altitude of the centre, as for twilight: -6, -12, -18 degrees.
    Altitude(Angle),
}

impl Threshold {
    /// The unrefracted altitude of the centre at which the body stands on the threshold.
    #[must_use]
    pub fn altitude_of(self, place: &Place) -> Angle {
        match (self, place.body) {
            (Threshold::Altitude(altitude), _) => altitude,
            (Threshold::RiseSet, Body::Sun) => Angle::from_degrees(-50.0 / 60.0),
            (Threshold::RiseSet, Body::Moon) => {
                let radius_au = Body::Moon.radius_km() / AU_KM;
                let semidiameter =
                    Angle::from_radians(libm::asin((radius_au / place.distance_au).min(1.0)));
                Angle::from_degrees(-34.0 / 60.0) - semidiameter
            }
            (Threshold::RiseSet, _) => Angle::from_degrees(-34.0 / 60.0),
        }
    }
}

/// A body passing a threshold.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AltitudeCrossing {
    pub instant: Tt,
    /// Upward: rising, or the end of twilight seen from below.
    pub upward: bool,
    pub azimuth: Angle,
}

/// A body on the upper meridian: apparent topocentric hour angle zero.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transit {
    pub instant: Tt,
    /// Unrefracted.
    pub altitude: Angle,
}

/// Every passage of a body through a threshold within the span, in order of time.
///
/// Passages are found however short the body stays beyond the threshold: between samples the altitude is followed to
/// its turning points.
///
/// # Errors
/// A span that the sky does not cover.
pub fn altitude_crossings(
    sky: &Sky,
    site: &Site,
    body: Body,
    threshold: Threshold,
    span: Span,
) -> Result<Vec<AltitudeCrossing>, SkyError> {
    let above = |days: f64| -> Result<f64, SkyError> {
        let vantage = sky.observer(site, Tt::from_days(days))?;
        let place = vantage.place(body)?;
        let sine = vantage.sine_of_altitude(place.apparent).unwrap_or(0.0);
        Ok(libm::asin(sine.clamp(-1.0, 1.0)) - threshold.altitude_of(&place).radians())
    };
    let count = (span.days() / STEP_DAYS).ceil().max(1.0) as usize;
    let step = span.days() / count as f64;
    // One sample more on either side, so that turning points at the edges are bracketed.
    let samples: Vec<(f64, f64)> = (0..count + 3)
        .map(|k| {
            let days = span.from.days() + (k as f64 - 1.0) * step;
            Ok((days, above(days)?))
        })
        .collect::<Result<_, SkyError>>()?;
    let mut brackets: Vec<((f64, f64), (f64, f64))> = Vec::new();
    for pair in samples.windows(2) {
        if let &[a, b] = pair
            && (a.1 < 0.0) != (b.1 < 0.0)
        {
            brackets.push((a, b));
        }
    }
    for triple in samples.windows(3) {
        let &[a, b, c] = triple else { continue };
        let same_side = (a.1 < 0.0) == (b.1 < 0.0) && (b.1 < 0.0) == (c.1 < 0.0);
        // A turning point towards the threshold may poke through it between the samples.
        let sign = if b.1 < 0.0 { -1.0 } else { 1.0 };
        if same_side && b.1 * sign <= a.1 * sign && b.1 * sign <= c.1 * sign {
            let towards = |days: f64| Ok::<_, SkyError>(above(days)? * sign);
            let (days, value) = minimum(a.0, (b.0, b.1 * sign), c.0, 1e-5, towards)?;
            if value < 0.0 {
                let turn = (days, value * sign);
                brackets.push((a, turn));
                brackets.push((turn, c));
            }
        }
    }
    let mut crossings = Vec::with_capacity(brackets.len());
    for (a, b) in brackets {
        let instant = Tt::from_days(root(a, b, TOLERANCE_DAYS, above)?);
        if span.contains(instant) {
            let vantage = sky.observer(site, instant)?;
            let place = vantage.place(body)?;
            let azimuth = vantage
                .horizontal(place.apparent)
                .map_or(Angle::ZERO, |seen| seen.azimuth);
            crossings.push(AltitudeCrossing {
                instant,
                upward: a.1 < 0.0,
                azimuth,
            });
        }
    }
    crossings.sort_by(|a, b| a.instant.days().total_cmp(&b.instant.days()));
    Ok(crossings)
}

/// Every upper transit within the span, in order of time.
///
/// # Errors
/// A span that the sky does not cover.
pub fn transits(sky: &Sky, site: &Site, body: Body, span: Span) -> Result<Vec<Transit>, SkyError> {
    let hour_angle = |days: f64| -> Result<f64, SkyError> {
        let vantage = sky.observer(site, Tt::from_days(days))?;
        let place = vantage.place(body)?;
        Ok(vantage.hour_angle(&place).unwrap_or(Angle::ZERO).radians())
    };
    // The hour angle grows by 15 degrees an hour: six-hour steps cannot skip a turn.
    let count = (span.days() * 4.0).ceil().max(1.0) as usize;
    let step = span.days() / count as f64;
    let mut transits = Vec::new();
    let mut before = (
        span.from.days() - step,
        hour_angle(span.from.days() - step)?,
    );
    for k in 0..count + 2 {
        let days = span.from.days() + k as f64 * step;
        let here = (days, hour_angle(days)?);
        if before.1 < 0.0 && here.1 >= 0.0 {
            let instant = Tt::from_days(root(before, here, TOLERANCE_DAYS, hour_angle)?);
            if span.contains(instant) {
                let vantage = sky.observer(site, instant)?;
                let seen = vantage.horizontal(vantage.place(body)?.apparent);
                transits.push(Transit {
                    instant,
                    altitude: seen.map_or(Angle::ZERO, |seen| seen.altitude),
                });
            }
        }
        before = here;
    }
    Ok(transits)
}

/// What happens to a body at a site in the course of a day.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum HorizonKind {
    Rise,
    UpperTransit,
    Set,
    CivilDusk,
    NauticalDusk,
    AstronomicalDusk,
    AstronomicalDawn,
    NauticalDawn,
    CivilDawn,
}

impl HorizonKind {
    pub const ALL: [HorizonKind; 9] = [
        HorizonKind::Rise,
        HorizonKind::UpperTransit,
        HorizonKind::Set,
        HorizonKind::CivilDusk,
        HorizonKind::NauticalDusk,
        HorizonKind::AstronomicalDusk,
        HorizonKind::AstronomicalDawn,
        HorizonKind::NauticalDawn,
        HorizonKind::CivilDawn,
    ];

    /// The word used in tables and on the command line.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            HorizonKind::Rise => "rise",
            HorizonKind::UpperTransit => "upper_transit",
            HorizonKind::Set => "set",
            HorizonKind::CivilDusk => "civil_dusk",
            HorizonKind::NauticalDusk => "nautical_dusk",
            HorizonKind::AstronomicalDusk => "astronomical_dusk",
            HorizonKind::AstronomicalDawn => "astronomical_dawn",
            HorizonKind::NauticalDawn => "nautical_dawn",
            HorizonKind::CivilDawn => "civil_dawn",
        }
    }

    /// Dusks and dawns are the Sun's alone.
    #[must_use]
    pub const fn is_twilight(self) -> bool {
        !matches!(
            self,
            HorizonKind::Rise | HorizonKind::UpperTransit | HorizonKind::Set
        )
    }

    /// Threshold and sense of a passage; a transit has none.
    fn passage(self) -> Option<(Threshold, bool)> {
        let twilight = |degrees: f64| Threshold::Altitude(Angle::from_degrees(degrees));
        match self {
            HorizonKind::Rise => Some((Threshold::RiseSet, true)),
            HorizonKind::Set => Some((Threshold::RiseSet, false)),
            HorizonKind::UpperTransit => None,
            HorizonKind::CivilDusk => Some((twilight(-6.0), false)),
            HorizonKind::NauticalDusk => Some((twilight(-12.0), false)),
            HorizonKind::AstronomicalDusk => Some((twilight(-18.0), false)),
            HorizonKind::AstronomicalDawn => Some((twilight(-18.0), true)),
            HorizonKind::NauticalDawn => Some((twilight(-12.0), true)),
            HorizonKind::CivilDawn => Some((twilight(-6.0), true)),
        }
    }
}

/// A rising, transit, setting, dusk or dawn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HorizonEvent {
    pub body: Body,
    pub kind: HorizonKind,
    pub instant: Tt,
    /// Azimuth of a passage; unrefracted altitude of a transit.
    pub value: Angle,
}

/// All events of the kinds asked for within the span, in order of time. Twilights of a body other than the Sun do not exist.
///
/// # Errors
/// A span that the sky does not cover.
pub fn horizon_events(
    sky: &Sky,
    site: &Site,
    body: Body,
    kinds: &[HorizonKind],
    span: Span,
) -> Result<Vec<HorizonEvent>, SkyError> {
    let mut found = Vec::new();
    let kinds = kinds
        .iter()
        .copied()
        .filter(|kind| body == Body::Sun || !kind.is_twilight());
    let mut thresholds: Vec<(Threshold, Vec<(HorizonKind, bool)>)> = Vec::new();
    for kind in kinds {
        match kind.passage() {
            None => found.extend(transits(sky, site, body, span)?.into_iter().map(|transit| {
                HorizonEvent {
                    body,
                    kind,
                    instant: transit.instant,
                    value: transit.altitude,
                }
            })),
            // Rise and set, dusk and dawn share the search for their threshold.
            Some((threshold, upward)) => {
                match thresholds.iter_mut().find(|(known, _)| *known == threshold) {
                    Some((_, kinds)) => kinds.push((kind, upward)),
                    None => thresholds.push((threshold, vec![(kind, upward)])),
                }
            }
        }
    }
    for (threshold, kinds) in thresholds {
        for crossing in altitude_crossings(sky, site, body, threshold, span)? {
            found.extend(
                kinds
                    .iter()
                    .filter(|(_, upward)| *upward == crossing.upward)
                    .map(|&(kind, _)| HorizonEvent {
                        body,
                        kind,
                        instant: crossing.instant,
                        value: crossing.azimuth,
                    }),
            );
        }
    }
    found.sort_by(|a, b| a.instant.days().total_cmp(&b.instant.days()));
    Ok(found)
}
