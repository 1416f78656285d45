//! Rising, setting, twilight and transit at a site.
//!
//! Altitudes are topocentric, of the body's centre, unrefracted, without dip: the almanac definition, in which the
//! usual 34' of refraction stand in the threshold. What hides behind roofs is the business of skylines, not of this.

use super::search::{minimum, root};
use super::types::Span;
use crate::sky::place::{Place, Sky, SkyError, AU_KM};
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
    fn altitude_of(self, place: &Place) -> Angle {
        match (self, place.body) {
            (Threshold::Altitude(altitude), _) => altitude,
            (Threshold::RiseSet, Body::Sun) => Angle::from_degrees(-50.0 / 60.0),
            (Threshold::RiseSet, Body::Moon) => {
                let radius_au = Body::Moon.radius_km() / AU_KM;
                let semidiameter = Angle::from_radians(libm::asin((radius_au / place.distance_au).min(1.0)));
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

/// The 24 hours from local mean noon to the next that are named by the civil date on which they begin: the noon is
/// 12h - longitude/15 of UTC on that date. `noon_days` is that instant in days of UTC since J2000.
#[must_use]
pub fn local_mean_noon_utc_days(julian_day_number: f64, longitude: Angle) -> f64 {
    // A Julian day begins at noon of its date.
    julian_day_number - crate::sky::time::J2000_JD - longitude.signed().degrees() / 360.0
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
            let azimuth = vantage.horizontal(place.apparent).map_or(Angle::ZERO, |seen| seen.azimuth);
            crossings.push(AltitudeCrossing { instant, upward: a.1 < 0.0, azimuth });
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
    let mut before = (span.from.days() - step, hour_angle(span.from.days() - step)?);
    for k in 0..count + 2 {
        let days = span.from.days() + k as f64 * step;
        let here = (days, hour_angle(days)?);
        if before.1 < 0.0 && here.1 >= 0.0 {
            let instant = Tt::from_days(root(before, here, TOLERANCE_DAYS, hour_angle)?);
            if span.contains(instant) {
                let vantage = sky.observer(site, instant)?;
                let seen = vantage.horizontal(vantage.place(body)?.apparent);
                transits.push(Transit { instant, altitude: seen.map_or(Angle::ZERO, |seen| seen.altitude) });
            }
        }
        before = here;
    }
    Ok(transits)
}
