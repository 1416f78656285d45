//! Following a planet across constellation boundaries.
//!
//! Boundaries have corners, and a planet may clip one within an hour. So the walk takes steps that cannot reach the
//! nearest boundary at the planet's speed of the day and what it can gain; near a boundary the least step is three
//! minutes, within which a visit to a corner may go unnoticed.

use super::search::root;
use super::types::{Event, EventKind, EventValue};
use crate::sky::constellations::{Constellation, clearance};
use crate::sky::place::{Sky, SkyError};
use crate::sky::{Angle, Body, Tt, Vec3};

/// Three minutes.
const LEAST_STEP_DAYS: f64 = 1.0 / 480.0;
const TOLERANCE_DAYS: f64 = 5e-7;

/// More than a planet's speed among the stars can change between two nodes of its grid, degrees a day (largest changes of
/// the daily motion within 8 days, 4 for Mercury, from DE440 over 1900-2100: Mercury 0.761, Venus 0.336, Mars 0.116,
/// Jupiter 0.027, Saturn 0.015, Uranus 0.0076, Neptune 0.0046; a quarter and more added).
const fn greatest_change_of_motion(body: Body) -> Angle {
    Angle::from_degrees(match body {
        Body::Mercury => 1.0,
        Body::Venus => 0.42,
        Body::Mars => 0.15,
        Body::Jupiter => 0.035,
        Body::Saturn => 0.02,
        Body::Uranus => 0.011,
        Body::Neptune => 0.007,
        Body::Sun | Body::Moon => 6.0,
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
        let place = |days: f64| sky.geocentre(Tt::from_days(days))?.place(body);
        let direction = |days: f64| -> Result<Vec3, SkyError> { Ok(place(days)?.direction) };
        let reserve = greatest_change_of_motion(body).radians();
        let mut days = from_days;
        let mut here = place(days)?;
        let mut inside = match self.at {
            Some((at, constellation)) if at == from_days => constellation,
            _ => Constellation::at_icrs(here.direction),
        };
        while days < to_days {
            let speed = here.direction_rate().norm() + reserve;
            let step = (clearance(here.direction).radians() / speed).max(LEAST_STEP_DAYS);
            let next = (days + step).min(to_days);
            here = place(next)?;
            let entered = Constellation::at_icrs(here.direction);
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
