//! A season as finished values: what happens to a subject between two dates, and the path it draws.
//!
//! Everything here is a pure function of its arguments; the charts above ask the ephemeris nothing.

pub mod advice;
pub mod close;
pub mod compare;
mod compute;
mod conditions;
mod constellation_walk;
pub mod darkness;
pub mod events;
pub mod exposure;
pub mod framing;
pub mod hold;
pub mod horizon;
pub mod lens;
pub mod log;
mod loops;
pub mod moment;
pub mod nights;
mod openings;
pub mod outlook;
pub mod picks;
pub mod planner;
pub mod purposes;
pub mod quality;
mod search;
mod site_tracks;
mod skyline_scan;
mod spans;
pub mod spells;
pub mod stacking;
pub mod tangent;
mod track;
mod types;
pub mod visibility;
pub mod weather;
pub mod year;

pub use compute::{next_season, season};
pub use conditions::{ClockTime, Conditions, Hours, MoonRule, Weekdays};
pub use loops::{loops, synodic_days};
pub use openings::{Closed, Condition, NightRules, Openings, Shortfall, SunDownRule};
pub use site_tracks::{LocalSky, NightSpan, SiteTracks, Standing};
pub use track::{strip_frame, track, track_step_days};
pub use types::{
    Event, EventKind, EventValue, Loop, Other, Season, Span, StripFrame, Track, TrackCrossing,
    TrackPoint,
};
