//! A scenario with its season computed: what every sheet and view is made from.

use super::{Scenario, ScenarioError};
use crate::season::{Season, Span, next_season, season};
use crate::sky::Tt;
use crate::sky::place::{Sky, SkyError};

/// Why a season could not be planned.
#[derive(Debug, thiserror::Error)]
pub enum PlanError {
    #[error(transparent)]
    Scenario(#[from] ScenarioError),
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error(
        "no season of {0} begins within the reach of the tables; give the scenario a season with from and to"
    )]
    NoSeason(crate::sky::Body),
}

/// A scenario, the sky it is seen in, and its season.
#[derive(Clone)]
pub struct Plan {
    pub scenario: Scenario,
    pub sky: Sky,
    pub season: Season,
}

impl Plan {
    /// Computes the season of a scenario. `now` decides which season is meant where the scenario names no dates.
    ///
    /// # Errors
    /// Dates that no ephemeris covers; a subject without a season to come.
    pub fn new(scenario: Scenario, now: Tt) -> Result<Self, PlanError> {
        let tables = crate::sky::delta_t::TimeTables::embedded();
        let span = match scenario.span(tables)? {
            Some(span) => span,
            None => next_span(&scenario, now)?,
        };
        let sky = Sky::for_span(span.from, span.to)?;
        let season = season(&sky, scenario.subject, &scenario.companions, span)?;
        Ok(Plan {
            scenario,
            sky,
            season,
        })
    }
}

fn next_span(scenario: &Scenario, now: Tt) -> Result<Span, PlanError> {
    // The longest wait for a season is Mars's, two years and two months.
    let sky = Sky::for_span(now.plus_days(-500.0), now.plus_days(3_000.0))?;
    next_season(&sky, scenario.subject, now)?.ok_or(PlanError::NoSeason(scenario.subject))
}
