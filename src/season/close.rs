//! Close approaches: a planet near another planet, a bright star or the Moon.
//!
//! Geocentric and astrometric: what the eye compares are directions, and aberration moves both alike. From a site the
//! Moon stands up to a degree elsewhere, which the tables of places show.

use super::search::root;
use super::types::{Event, EventKind, EventValue, Other, Span};
use crate::sky::place::{Sky, SkyError};
use crate::sky::stars::Star;
use crate::sky::{Angle, Body, Tt, Vec3};

/// The Moon passes a planet once in 27 days and two planets stay within a few degrees for days: a day is short enough.
const STEP_DAYS: f64 = 1.0;
const TOLERANCE_DAYS: f64 = 1e-6;

/// Within how many degrees an approach counts.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limits {
    pub planets: Angle,
    pub moon: Angle,
    pub stars: Angle,
}

impl Default for Limits {
    /// A binocular field of 6 degrees holds both with room to spare (common practice, no source).
    fn default() -> Self {
        let five = Angle::from_degrees(5.0);
        Limits {
            planets: five,
            moon: five,
            stars: Angle::from_degrees(3.0),
        }
    }
}

/// Direction and its rate per day.
type Motion = (Vec3, Vec3);

/// Every least separation below the limits within the span, in order of time.
///
/// `stars` are the ones to look at; those that never come near cost little.
///
/// # Errors
/// A span that the sky does not cover.
pub fn close_approaches(
    sky: &Sky,
    body: Body,
    others: &[Body],
    stars: &[&Star],
    limits: Limits,
    span: Span,
) -> Result<Vec<Event>, SkyError> {
    let mut partners: Vec<(Other, Angle, Option<&Star>)> = Vec::new();
    for &other in others.iter().filter(|&&other| other != body) {
        let limit = if other == Body::Moon {
            limits.moon
        } else {
            limits.planets
        };
        partners.push((Other::Body(other), limit, None));
    }
    for star in stars {
        if let Some(name) = star.name {
            partners.push((Other::Star(name.to_owned()), limits.stars, Some(star)));
        }
    }
    let motion = |body: Body, instant: Tt| -> Result<Motion, SkyError> {
        let place = sky.geocentre(instant)?.place(body)?;
        Ok((place.direction, place.direction_rate()))
    };
    let partner_motion = |other: &Other, star: Option<&Star>, instant: Tt| match (other, star) {
        (Other::Body(other), _) => motion(*other, instant),
        (Other::Star(_), Some(star)) => Ok((star.direction_at(instant), Vec3::ZERO)),
        (Other::Star(_), None) => Ok((Vec3::ZERO, Vec3::ZERO)),
    };
    let mut found = Vec::new();
    let first = (span.from.days() / STEP_DAYS).floor() as i64;
    let last = (span.to.days() / STEP_DAYS).ceil() as i64;
    let mut before: Option<Vec<f64>> = None;
    for node in first..=last {
        let instant = Tt::from_days(node as f64 * STEP_DAYS);
        let vantage = sky.geocentre(instant)?;
        let place = vantage.place(body)?;
        let here = (place.direction, place.direction_rate());
        let mut rates = Vec::with_capacity(partners.len());
        for (other, _, star) in &partners {
            let there = match (other, star) {
                (Other::Body(other), _) => {
                    let place = vantage.place(*other)?;
                    (place.direction, place.direction_rate())
                }
                _ => partner_motion(other, *star, instant)?,
            };
            rates.push(opening(here, there));
        }
        if let Some(before) = &before {
            for (((other, limit, star), &a), &b) in partners.iter().zip(before).zip(&rates) {
                if !(a < 0.0 && b >= 0.0) {
                    continue;
                }
                let start = instant.days() - STEP_DAYS;
                let at = |days: f64| -> Result<f64, SkyError> {
                    let instant = Tt::from_days(days);
                    Ok(opening(
                        motion(body, instant)?,
                        partner_motion(other, *star, instant)?,
                    ))
                };
                let nearest =
                    Tt::from_days(root((start, a), (instant.days(), b), TOLERANCE_DAYS, at)?);
                let separation = motion(body, nearest)?
                    .0
                    .separation(partner_motion(other, *star, nearest)?.0);
                if separation < *limit && span.contains(nearest) {
                    found.push(Event {
                        body,
                        kind: EventKind::CloseApproach,
                        instant: nearest,
                        value: EventValue::Separation(separation),
                        with: Some(other.clone()),
                        cautions: sky.cautions(),
                    });
                }
            }
        }
        before = Some(rates);
    }
    found.sort_by(|a, b| a.instant.days().total_cmp(&b.instant.days()));
    Ok(found)
}

/// Has the sign of the rate of the separation: minus the rate of its cosine.
fn opening((a, a_rate): Motion, (b, b_rate): Motion) -> f64 {
    -(a_rate.dot(b) + a.dot(b_rate))
}
