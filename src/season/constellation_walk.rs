//! Following a planet across constellation boundaries.
//!
//! Boundaries have corners, and a planet may clip one within an hour. So the walk takes steps that cannot reach the
//! nearest boundary at the planet's greatest apparent speed; near a boundary the least step is three minutes, within
//! which a visit to a corner may go unnoticed.

use super::search::root;
use super::types::{Event, EventKind, EventValue};
use crate::sky::constellations::{Constellation, clearance};
use crate::sky::place::{Sky, SkyError};
use crate::sky::{Angle, Body, Tt, Vec3};

/// Three minutes.
const LEAST_STEP_DAYS: f64 = 1.0 / 480.0;
const TOLERANCE_DAYS: f64 = 5e-7;

/// More than a planet's greatest apparent motion a day, seen from the Earth's centre (largest daily motions over
/// 1900-2100 from DE440: Mercury 2.21, Venus 1.28, Mars 0.80, Jupiter 0.25, Saturn 0.14, Uranus 0.065, Neptune 0.04
/// degrees; a tenth and more added).
const fn greatest_motion_per_day(body: Body) -> Angle {
    Angle::from_degrees(match body {
        Body::Mercury => 2.5,
        Body::Venus => 1.4,
        Body::Mars => 0.9,
        Body::Jupiter => 0.3,
        Body::Saturn => 0.17,
        Body::Uranus => 0.08,
        Body::Neptune => 0.06,
        Body::Sun => 1.1,
        Body::Moon => 18.0,
    })
}

/// A place on the way; nothing before the first node.
#[derive(Default)]
pub(super) struct Walk {
    at: Option<(f64, Constellation)>,
}

impl Walk {
    /// Walks on to the next node of the body's grid and records every entry on the way. Nodes lie on a fixed grid, so
    /// the steps between them, and with them the instants found, are the same whatever the span.
    pub(super) fn advance(
        &mut self,
        sky: &Sky,
        body: Body,
        from_days: f64,
        to_days: f64,
        found: &mut Vec<Event>,
    ) -> Result<(), SkyError> {
        let direction = |days: f64| -> Result<Vec3, SkyError> {
            Ok(sky.geocentre(Tt::from_days(days))?.place(body)?.direction)
        };
        let speed = greatest_motion_per_day(body).radians();
        let mut days = from_days;
        let mut here = direction(days)?;
        let mut inside = match self.at {
            Some((at, constellation)) if at == from_days => constellation,
            _ => Constellation::at_icrs(here),
        };
        while days < to_days {
            let step = (clearance(here).radians() / speed).max(LEAST_STEP_DAYS);
            let next = (days + step).min(to_days);
            here = direction(next)?;
            let entered = Constellation::at_icrs(here);
            if entered != inside {
                let sign = |days: f64| -> Result<f64, SkyError> {
                    Ok(if Constellation::at_icrs(direction(days)?) == inside {
                        -1.0
                    } else {
                        1.0
                    })
                };
                // The bracket ends on the far side: the constellation found is the one entered.
                let instant = root((days, -1.0), (next, 1.0), TOLERANCE_DAYS, sign)?;
                found.push(Event {
                    body,
                    kind: EventKind::ConstellationEntry,
                    instant: Tt::from_days(instant),
                    value: EventValue::Constellation(entered.abbreviation()),
                    with: None,
                    cautions: sky.cautions(),
                });
                inside = entered;
            }
            days = next;
        }
        self.at = Some((to_days, inside));
        Ok(())
    }
}
