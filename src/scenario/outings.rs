//! What a scenario says about going out: how dates are chosen, when the house is open, what pictures are taken with.
//!
//! Plain values, checked where the document is read. Nights are named by the civil date of their evening at the site.

use serde::{Deserialize, Serialize};

use crate::season::lens::{Lens, Sensor};
use crate::season::picks::{Measure, PickRequest, ReserveRule};
use crate::sky::calendar::CivilDate;

/// A lens (or telescope) with the sensor behind it.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Camera {
    pub lens: Lens,
    pub sensor: Sensor,
}

/// How dates to announce are chosen.
#[derive(Clone, Debug, PartialEq)]
pub struct PickSettings {
    /// Number of dates, 1 to 400.
    pub count: usize,
    pub measure: Measure,
    /// The first night of the path; `None`: of the season.
    pub from: Option<CivilDate>,
    /// The day after its last night; `None`: that of the season.
    pub to: Option<CivilDate>,
    /// Nights that must be in.
    pub must_have: Vec<CivilDate>,
    pub reserve_rule: ReserveRule,
    /// Most reserves of each date, 0 to 20.
    pub reserves: usize,
    /// Lambda: how much even steps count.
    pub evenness: f64,
    /// Nights on which the house is open although the weekday is not.
    pub open: Vec<CivilDate>,
    /// Nights on which it is closed although the weekday is open.
    pub closed: Vec<CivilDate>,
}

impl Default for PickSettings {
    /// Six dates, even by angle, each with the next evening in reserve (our choice).
    fn default() -> Self {
        PickSettings {
            count: 6,
            measure: Measure::Angle,
            from: None,
            to: None,
            must_have: Vec::new(),
            reserve_rule: ReserveRule::NextEvening,
            reserves: 1,
            evenness: PickRequest::DEFAULT_EVENNESS,
            open: Vec::new(),
            closed: Vec::new(),
        }
    }
}
