//! The position engine. Knows nothing of seasons, charts or files.

mod angle;
mod body;
pub mod calendar;
mod caution;
pub mod chebyshev;
pub mod constellations;
pub mod delta_t;
pub mod ephemeris;
pub mod frames;
pub mod light;
pub mod physical;
pub mod place;
pub mod refraction;
pub mod remote;
pub mod site;
pub mod skyline;
pub mod stars;
pub mod time;
mod vector;

pub use angle::Angle;
pub use body::{Body, UnknownBody};
pub use caution::{Caution, Cautions, Flagged};
pub use ephemeris::{Ephemeris, EphemerisError, State, Target};
pub use site::Site;
pub use skyline::Skyline;
pub use time::{Tdb, Tt, Ut1, Utc};
pub use vector::{Mat3, Vec3};
