//! What a night is for, and the conditions to start from.
//!
//! The numbers are common practice, from memory; every one is shown and may be changed. The Sun is down in all of them.
//! For inner planets altitude and darkness come from the visibility model of [`super::visibility`] instead.

use serde::{Deserialize, Serialize};

use super::conditions::{Conditions, MoonRule, Weekdays};
use super::visibility::{Haze, Viewer};
use crate::sky::{Angle, Body};

/// What the user goes out for.
#[derive(
    Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize,
)]
#[serde(rename_all = "snake_case")]
pub enum Purpose {
    /// People who look with their own eyes.
    #[default]
    Audience,
    /// People who queue at a telescope.
    #[serde(rename = "audience_telescope")]
    AudienceAtTelescope,
    /// Photographs of the path among the stars.
    Path,
    /// Photographs of the disc.
    Disc,
}

impl Purpose {
    pub const ALL: [Purpose; 4] = [
        Purpose::Audience,
        Purpose::AudienceAtTelescope,
        Purpose::Path,
        Purpose::Disc,
    ];

    /// The word used in tables and on the command line.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Purpose::Audience => "audience",
            Purpose::AudienceAtTelescope => "audience_telescope",
            Purpose::Path => "path",
            Purpose::Disc => "disc",
        }
    }
}

/// What the defaults for a subject are made from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Occasion {
    pub subject: Body,
    /// Greatest apparent altitude at culmination in the season.
    pub culmination: Angle,
    /// Typical V magnitude in the season.
    pub magnitude: f64,
    /// The usual eye in the site's usual air.
    pub viewer: Viewer,
}

/// Conditions to start from.
#[must_use]
pub fn default_conditions(purpose: Purpose, occasion: &Occasion) -> Conditions {
    let degrees = Angle::from_degrees;
    let moon = |least_deg: f64, unless_lit_below: f64| MoonRule {
        least_distance: degrees(least_deg),
        unless_lit_below,
    };
    let (least_altitude, sun_below, moon) = match purpose {
        Purpose::Audience => (degrees(10.0), degrees(-6.0), Some(moon(3.0, 0.0))),
        Purpose::AudienceAtTelescope => (degrees(20.0), degrees(-6.0), Some(moon(3.0, 0.0))),
        // Thin: a crescent of less than a quarter.
        Purpose::Path => (degrees(20.0), degrees(-12.0), Some(moon(30.0, 0.25))),
        Purpose::Disc => {
            let share = occasion.culmination * (2.0 / 3.0);
            let least = if share < degrees(30.0) {
                share
            } else {
                degrees(30.0)
            };
            (least, degrees(-6.0), None)
        }
    };
    let (least_altitude, sun_below) = if occasion.subject.is_inner_planet() {
        inner_planet_limits(occasion)
    } else {
        (least_altitude, sun_below)
    };
    Conditions {
        least_altitude,
        clearance: Angle::ZERO,
        sun_below,
        moon,
        hours: None,
        weekdays: Weekdays::ALL,
    }
}

/// Least altitude: the lowest at which the planet shows with the Sun 9 degrees down. Sun: the highest at which it shows 10
/// degrees up. Both in usual air, straight above the Sun, and never with the Sun above -1 degree.
fn inner_planet_limits(occasion: &Occasion) -> (Angle, Angle) {
    let viewer = occasion.viewer.through(Haze::Usual);
    let shows = |altitude_deg: f64, sun_deg: f64| {
        viewer.shows(
            occasion.magnitude,
            Angle::from_degrees(altitude_deg),
            Angle::from_degrees(sun_deg),
            Angle::from_degrees(altitude_deg - sun_deg),
        )
    };
    // In halves of a degree; where nothing shows, as for other subjects.
    let halves = |from: i32, to: i32| (from..=to).map(|k| 0.5 * f64::from(k));
    let least = halves(2, 40)
        .find(|&altitude_deg| shows(altitude_deg, -9.0))
        .unwrap_or(10.0);
    let depth = halves(2, 24)
        .find(|&depth_deg| shows(10.0, -depth_deg))
        .unwrap_or(12.0);
    (Angle::from_degrees(least), Angle::from_degrees(-depth))
}
