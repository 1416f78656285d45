//! A season as finished values: what happens to a subject between two dates, and the path it draws.
//!
//! Everything here is a pure function of its arguments; the charts above ask the ephemeris nothing.

pub mod close;
mod compute;
mod conditions;
mod constellation_walk;
pub mod darkness;
pub mod events;
pub mod hold;
pub mod horizon;
mod loops;
pub mod moment;
pub mod outlook;
mod search;
mod track;
mod types;

pub use compute::{next_season, season};
pub use conditions::{ClockTime, Conditions, Hours, MoonRule, Weekdays};
pub use loops::{loops, synodic_days};
pub use track::{strip_frame, track, track_step_days};
pub use types::{
    Event, EventKind, EventValue, Loop, Other, Season, Span, StripFrame, Track, TrackCrossing,
    TrackPoint,
};
