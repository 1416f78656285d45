//! Where to look first: an evening of the season that shows what it is about, at an hour when the subject can be seen.

use crate::scenario::Plan;
use crate::season::moment::night_at;
use crate::season::{EventKind, Span};
use crate::sky::refraction::apparent_from_true;
use crate::sky::{Angle, Body, Tt};

/// Between samples of the night: ten minutes.
const STEP_DAYS: f64 = 1.0 / 144.0;

/// So many days beside the event, so that the mark of the moment does not cover the event's own: after an opposition,
/// before a greatest elongation, which a station soon follows.
const BESIDE_DAYS: f64 = 7.0;

/// For an outer planet a night after the opposition, for an inner one before the first greatest elongation; there the
/// first time at which the subject stands over the skyline, as high as the scenario asks, in a sky as dark as it asks.
/// Where it never does, the time when it comes nearest to that.
#[must_use]
pub(super) fn first_look(plan: &Plan) -> Tt {
    let season = &plan.season;
    let inner = season.subject.is_inner_planet();
    let event = season.events.iter().find(|event| match event.kind {
        EventKind::GreatestElongationEast | EventKind::GreatestElongationWest => inner,
        EventKind::Opposition => !inner,
        _ => false,
    });
    let beside = if inner { -BESIDE_DAYS } else { BESIDE_DAYS };
    let day = event.map_or_else(
        || season.span.middle(),
        |event| event.instant.plus_days(beside),
    );
    let night = night_at(&plan.sky, &plan.scenario.site, day);
    let best = samples(night)
        .filter(|instant| season.span.contains(*instant))
        .filter_map(|instant| Some((instant, lack(plan, instant)?)))
        .reduce(|best, next| if next.1 < best.1 { next } else { best });
    best.map_or(day, |(instant, _)| instant)
}

fn samples(night: Span) -> impl Iterator<Item = Tt> {
    let count = (night.days() / STEP_DAYS) as u32;
    (0..count).map(move |sample| night.from.plus_days(f64::from(sample) * STEP_DAYS))
}

/// Degrees by which the conditions are missed, together; 0 where they hold.
fn lack(plan: &Plan, instant: Tt) -> Option<f64> {
    let scenario = &plan.scenario;
    let vantage = plan.sky.observer(&scenario.site, instant).ok()?;
    let sun = vantage.horizontal(vantage.place(Body::Sun).ok()?.apparent)?;
    let seen = vantage.horizontal(vantage.place(plan.season.subject).ok()?.apparent)?;
    let altitude = apparent_from_true(seen.altitude, &scenario.site.air);
    let over_skyline = altitude - scenario.skyline.polygon().altitude_at(seen.azimuth);
    let conditions = &scenario.conditions;
    let missing = |wanted: Angle, is: Angle| (wanted - is).degrees().max(0.0);
    Some(
        missing(conditions.least_altitude, altitude)
            + missing(conditions.clearance, over_skyline)
            + missing(sun.altitude, conditions.sun_below),
    )
}
