//! Retrograde loops: the path between and around a pair of stations in ecliptic longitude.
//!
//! Geocentric. Stations and the middle are apparent, of date, as in [`super::events`]; where the track meets itself is
//! astrometric, since that is what stands among the stars.

use super::events::{Kinds, events};
use super::search::minimum;
use super::types::{Event, EventKind, EventValue, Loop, Span, TrackCrossing};
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::physical::semidiameter;
use crate::sky::place::{Place, Sky, SkyError};
use crate::sky::{Body, Tt, Vec3};

/// Longer than any planet is retrograde (Neptune: 160 days), so that both stations of a loop are found when only
/// one lies in the span.
const LONGEST_RETROGRADE_DAYS: f64 = 200.0;

/// Mean synodic period in days, from the sidereal periods (1 / (1/P - 1/365.25636)); the Moon's with the Sun.
#[must_use]
pub const fn synodic_days(body: Body) -> f64 {
    match body {
        Body::Sun => 365.25636,
        Body::Moon => 29.530_59,
        Body::Mercury => 115.88,
        Body::Venus => 583.92,
        Body::Mars => 779.94,
        Body::Jupiter => 398.88,
        Body::Saturn => 378.09,
        Body::Uranus => 369.66,
        Body::Neptune => 367.49,
    }
}

/// The loops of a planet of which at least one station lies within the span, in order of time.
///
/// # Errors
/// A span that the sky does not cover.
pub fn loops(sky: &Sky, body: Body, span: Span) -> Result<Vec<Loop>, SkyError> {
    let wide = Span {
        from: span.from.plus_days(-LONGEST_RETROGRADE_DAYS),
        to: span.to.plus_days(LONGEST_RETROGRADE_DAYS),
    };
    let kinds = Kinds::of(&[
        EventKind::StationRetrograde,
        EventKind::StationDirect,
        EventKind::Opposition,
        EventKind::InferiorConjunction,
        EventKind::ClosestApproach,
        EventKind::ClosestApproachLightTime,
    ]);
    let events = events(sky, &[body], kinds, wide)?;
    let mut loops = Vec::new();
    for (index, start) in events.iter().enumerate() {
        if start.kind != EventKind::StationRetrograde {
            continue;
        }
        let Some(end) = events[index..]
            .iter()
            .find(|event| event.kind == EventKind::StationDirect)
        else {
            continue;
        };
        if span.contains(start.instant) || span.contains(end.instant) {
            loops.push(one_loop(sky, start, end, &events)?);
        }
    }
    Ok(loops)
}

fn one_loop(sky: &Sky, start: &Event, end: &Event, events: &[Event]) -> Result<Loop, SkyError> {
    let middle = events
        .iter()
        .find(|event| {
            matches!(
                event.kind,
                EventKind::Opposition | EventKind::InferiorConjunction
            ) && start.instant < event.instant
                && event.instant < end.instant
        })
        .cloned();
    let centre = middle
        .as_ref()
        .map_or(0.5 * (start.instant.days() + end.instant.days()), |event| {
            event.instant.days()
        });
    let nearest = |kind: EventKind| {
        events
            .iter()
            .filter(|event| event.kind == kind)
            .min_by(|a, b| {
                let off = |event: &Event| (event.instant.days() - centre).abs();
                off(a).total_cmp(&off(b))
            })
            // Farther than this it belongs to another loop.
            .filter(|event| (event.instant.days() - centre).abs() < LONGEST_RETROGRADE_DAYS / 2.0)
    };
    let largest_diameter = match nearest(EventKind::ClosestApproachLightTime)
        .map(|event| event.value)
    {
        Some(EventValue::DistanceAu(distance)) => Some(semidiameter(start.body, distance) * 2.0),
        _ => None,
    };
    Ok(Loop {
        body: start.body,
        station_retrograde: start.clone(),
        station_direct: end.clone(),
        closest: nearest(EventKind::ClosestApproach).cloned(),
        brightest: Some(brightest_between(sky, start, end)?),
        largest_diameter,
        crossing: crossing(sky, start, end)?,
        middle,
    })
}

/// Greatest brightness from station to station, ends included.
fn brightest_between(sky: &Sky, start: &Event, end: &Event) -> Result<Event, SkyError> {
    const SAMPLES: i32 = 64;
    let (from, to) = (start.instant.days(), end.instant.days());
    let at = |days: f64| {
        let place = sky.geocentre(Tt::from_days(days))?.place(start.body)?;
        Ok::<_, SkyError>(magnitude(&place.geometry(), MarsTerms::Omit))
    };
    let days_of = |k: i32| from + (to - from) * f64::from(k) / f64::from(SAMPLES);
    let mut best = (0, at(from)?.value);
    for k in 1..=SAMPLES {
        let value = at(days_of(k))?.value;
        if value < best.1 {
            best = (k, value);
        }
    }
    let days = if best.0 == 0 || best.0 == SAMPLES {
        days_of(best.0)
    } else {
        let value_at = |days: f64| Ok::<_, SkyError>(at(days)?.value);
        minimum(
            days_of(best.0 - 1),
            (days_of(best.0), best.1),
            days_of(best.0 + 1),
            2e-4,
            value_at,
        )?
        .0
    };
    let flagged = at(days)?;
    Ok(Event {
        body: start.body,
        kind: EventKind::GreatestBrightness,
        instant: Tt::from_days(days),
        value: EventValue::Magnitude(flagged.value),
        with: None,
        cautions: flagged.cautions.and(sky.cautions()),
    })
}

/// Where the astrometric track meets itself: the widest pair of passages around the stations.
///
/// ```text
///              <---- retrograde
///            .-----------------.
///   st2 ---> '--.         .--- ' <--- st1      the strand that comes in and the one that goes out
///                 `--. .-'                     cover the same longitudes as the way back; the search
///   comes in ------>  X  ------> goes out      goes out to where they leave them
/// ```
fn crossing(sky: &Sky, start: &Event, end: &Event) -> Result<Option<TrackCrossing>, SkyError> {
    const SAMPLES: usize = 240;
    let retrograde = end.instant.days() - start.instant.days();
    // Before and after, twice the retrograde time leads clear of the arc for the planets to Jupiter; beyond, the
    // next loop would begin before that, and the strands are followed to there.
    let reach = (2.2 * retrograde).min(0.95 * (synodic_days(start.body) - retrograde));
    let from = start.instant.days() - reach;
    let to = end.instant.days() + reach;
    let step = (to - from) / SAMPLES as f64;
    let direction = |days: f64| -> Result<Place, SkyError> {
        sky.geocentre(Tt::from_days(days))?.place(start.body)
    };
    let mut path = Vec::with_capacity(SAMPLES + 1);
    for k in 0..=SAMPLES {
        path.push(direction(from + k as f64 * step)?.direction);
    }
    // Flat axes about the loop's middle: at most some 25 degrees off, where the projection still keeps crossings.
    let centre = path[SAMPLES / 2];
    let east = Vec3::new(-centre.y, centre.x, 0.0).unit();
    let north = centre.cross(east);
    let flat = |v: Vec3| {
        let scale = 1.0 / v.dot(centre).max(0.05);
        (v.dot(east) * scale, v.dot(north) * scale)
    };
    let points: Vec<(f64, f64)> = path.iter().map(|&v| flat(v)).collect();
    let mut widest: Option<(f64, f64)> = None;
    for i in 0..SAMPLES {
        for j in i + 2..SAMPLES {
            if let Some((s, t)) = meeting([points[i], points[i + 1]], [points[j], points[j + 1]]) {
                let pair = (from + (i as f64 + s) * step, from + (j as f64 + t) * step);
                if widest.is_none_or(|(a, b)| pair.1 - pair.0 > b - a) {
                    widest = Some(pair);
                }
            }
        }
    }
    let Some((mut first, mut second)) = widest else {
        return Ok(None);
    };
    // Newton's method on the two instants: the tracks are smooth and the start is within a step.
    for _ in 0..8 {
        let (a, b) = (direction(first)?, direction(second)?);
        let (pa, pb) = (flat(a.direction), flat(b.direction));
        const H: f64 = 0.01;
        let rate = |days: f64| -> Result<(f64, f64), SkyError> {
            let (x0, y0) = flat(direction(days - H)?.direction);
            let (x1, y1) = flat(direction(days + H)?.direction);
            Ok(((x1 - x0) / (2.0 * H), (y1 - y0) / (2.0 * H)))
        };
        let (va, vb) = (rate(first)?, rate(second)?);
        let gap = (pb.0 - pa.0, pb.1 - pa.1);
        let determinant = va.0 * vb.1 - va.1 * vb.0;
        if determinant == 0.0 {
            break;
        }
        let d_first = (gap.0 * vb.1 - gap.1 * vb.0) / determinant;
        let d_second = (gap.0 * va.1 - gap.1 * va.0) / determinant;
        first += d_first.clamp(-step, step);
        second += d_second.clamp(-step, step);
        if d_first.abs().max(d_second.abs()) < 1e-5 {
            break;
        }
    }
    Ok(Some(TrackCrossing {
        first: Tt::from_days(first),
        second: Tt::from_days(second),
        direction: direction(first)?.direction,
    }))
}

/// Where two segments of the plane meet, as shares of their lengths.
fn meeting(a: [(f64, f64); 2], b: [(f64, f64); 2]) -> Option<(f64, f64)> {
    let d = |[p, q]: [(f64, f64); 2]| (q.0 - p.0, q.1 - p.1);
    let (da, db) = (d(a), d(b));
    let determinant = da.0 * db.1 - da.1 * db.0;
    if determinant == 0.0 {
        return None;
    }
    let gap = (b[0].0 - a[0].0, b[0].1 - a[0].1);
    let s = (gap.0 * db.1 - gap.1 * db.0) / determinant;
    let t = (gap.0 * da.1 - gap.1 * da.0) / determinant;
    ((0.0..1.0).contains(&s) && (0.0..1.0).contains(&t)).then_some((s, t))
}
