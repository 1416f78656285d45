//! A place on Earth.

use super::Angle;
use super::refraction::Air;

/// A place on the WGS84 ellipsoid with the air above it.
#[derive(Clone, Debug, PartialEq)]
pub struct Site {
    pub name: String,
    /// Geodetic latitude, north positive.
    pub latitude: Angle,
    /// Longitude, east positive.
    pub longitude: Angle,
    /// Metres above the ellipsoid.
    pub elevation_m: f64,
    /// Metres above the surrounding ground or sea: sets the dip of the true horizon.
    pub height_above_surroundings_m: f64,
    /// Pressure and temperature, for refraction.
    pub air: Air,
    /// Extinction in the V band, magnitudes per airmass.
    pub extinction_mag: f64,
}
