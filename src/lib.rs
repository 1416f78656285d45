//! Loopwright plans a planet's season from one place.
//!
//! # Conventions, stated once
//! - **Angles** inside the engine are radians in [`sky::Angle`]; files, tables and screens show degrees.
//! - **Azimuth** runs from north through east, 0 to 360 degrees. **Longitude** on Earth is east positive.
//! - **Distances** are astronomical units of 149 597 870.7 km (IAU 2012 resolution B2), the Moon's too.
//! - **Directions** are right-handed unit vectors. Equatorial axes: x to the equinox, z to the north pole.
//!   Ecliptic axes: x to the equinox, z to the north pole of the ecliptic.
//! - **Signs**: elongation is 0 to 180 degrees with its side apart; a rate is positive eastward; an observer's
//!   hour angle is positive west of the meridian.
//! - **Time** is days since 2000-01-01 12:00 of its own scale, in a type per scale: [`sky::Tt`], [`sky::Tdb`],
//!   [`sky::Ut1`], [`sky::Utc`]. One `f64` of such days resolves 5 microseconds within seven centuries of 2000.
//! - **Intervals** are half-open: the start belongs to them, the end does not.
//! - A transform names both ends: `true_from_icrs`, `ecliptic_from_equatorial`.
//!
//! # Layers, each using only those below it
//! ```text
//! main.rs     command line (or window); nothing more
//! cli         one file a command; opens the window where none is named
//! window      the egui program: strip, timeline, readings
//! sheet       Scene -> SVG, PNG; tables as CSV and JSON; files written whole or not at all
//! chart       season -> Scene: plain shapes and labels, no ephemeris calls
//! scenario    reads, checks and saves the document
//! season      search, events, loops, tracks, nights
//! sky         the position engine: time, ephemeris, reference frames, places, light, stars
//! ```
//! `sky` and `season` are pure: the clock, paths and tables are handed in. The test `layers` holds the direction.

pub mod chart;
pub mod cli;
pub mod scenario;
pub mod season;
pub mod sheet;
pub mod sky;
pub mod window;
