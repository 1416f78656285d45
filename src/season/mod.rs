//! A season as finished values: what happens to a subject between two dates, and the path it draws.
//!
//! Everything here is a pure function of its arguments; the charts above ask the ephemeris nothing.

mod conditions;
mod types;

pub use conditions::{ClockTime, Conditions, Hours, MoonRule, Weekdays};
pub use types::{
    Event, EventKind, EventValue, Loop, Other, Season, Span, StripFrame, Track, TrackCrossing,
    TrackPoint,
};
