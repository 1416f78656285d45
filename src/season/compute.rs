//! From a subject and a span to a finished season.

use super::events::{Kinds, events};
use super::loops::{loops, synodic_days};
use super::track::{strip_frame, track};
use super::types::{Event, EventKind, Season, Span};
use crate::sky::place::{Sky, SkyError};
use crate::sky::{Body, Tt};

/// Computes a season.
///
/// # Errors
/// A span that the sky does not cover.
pub fn season(
    sky: &Sky,
    subject: Body,
    companions: &[Body],
    span: Span,
) -> Result<Season, SkyError> {
    let others: Vec<Body> = companions
        .iter()
        .copied()
        .filter(|&body| body != subject && body != Body::Sun)
        .collect();
    Ok(Season {
        subject,
        span,
        frame: strip_frame(sky, span),
        track: track(sky, subject, span)?,
        companions: others
            .iter()
            .map(|&body| track(sky, body, span))
            .collect::<Result<_, _>>()?,
        sun: track(sky, Body::Sun, span)?,
        events: events(sky, &[subject], Kinds::ALL, span)?,
        loops: loops(sky, subject, span)?,
        cautions: sky.cautions(),
    })
}

/// The span of the next season of a subject after an instant: for an outer planet, from 110 days before the next
/// opposition to 100 days after it; for an inner one, the apparition around the next greatest elongation, from one
/// conjunction with the Sun to the next.
///
/// # Errors
/// A sky that does not reach far enough; a subject that has no seasons (the Sun, the Moon) gives `None`.
pub fn next_season(sky: &Sky, subject: Body, after: Tt) -> Result<Option<Span>, SkyError> {
    let reach = Span {
        from: after.plus_days(-400.0),
        to: after.plus_days(2.2 * synodic_days(subject) + 400.0),
    };
    if subject.is_outer_planet() {
        let found = events(sky, &[subject], Kinds::of(&[EventKind::Opposition]), reach)?;
        // A season under way is still the next one until its opposition is a month past.
        let opposition = found
            .iter()
            .find(|event| event.instant.plus_days(30.0) > after);
        return Ok(opposition.map(|event| Span {
            from: event.instant.plus_days(-110.0),
            to: event.instant.plus_days(100.0),
        }));
    }
    if !subject.is_inner_planet() {
        return Ok(None);
    }
    let kinds = Kinds::of(&[
        EventKind::InferiorConjunction,
        EventKind::SuperiorConjunction,
        EventKind::GreatestElongationEast,
        EventKind::GreatestElongationWest,
    ]);
    let found = events(sky, &[subject], kinds, reach)?;
    let is_elongation = |event: &Event| {
        matches!(
            event.kind,
            EventKind::GreatestElongationEast | EventKind::GreatestElongationWest
        )
    };
    let Some(index) = found
        .iter()
        .position(|event| is_elongation(event) && event.instant > after)
    else {
        return Ok(None);
    };
    let from = found[..index]
        .iter()
        .rev()
        .find(|event| !is_elongation(event));
    let to = found[index..].iter().find(|event| !is_elongation(event));
    Ok(match (from, to) {
        (Some(from), Some(to)) => Some(Span {
            from: from.instant,
            to: to.instant,
        }),
        _ => None,
    })
}
