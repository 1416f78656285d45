//! A place on Earth.

use super::Angle;

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
    /// Pressure in hPa, for refraction.
    pub pressure_hpa: f64,
    /// Temperature in degrees Celsius, for refraction.
    pub temperature_c: f64,
    /// Extinction in the V band, magnitudes per airmass.
    pub extinction_mag: f64,
}
