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

impl Site {
    /// Distance from the Earth's axis and from the equator's plane, au (WGS84: 6378.137 km, 1/298.257223563).
    #[must_use]
    pub fn geocentric_au(&self) -> (f64, f64) {
        const EQUATORIAL_M: f64 = 6_378_137.0;
        const FLATTENING: f64 = 1.0 / 298.257_223_563;
        let (sin, cos) = self.latitude.sin_cos();
        let squash = (1.0 - FLATTENING) * (1.0 - FLATTENING);
        let c = 1.0 / (cos * cos + squash * sin * sin).sqrt();
        let axial = (EQUATORIAL_M * c + self.elevation_m) * cos;
        let polar = (EQUATORIAL_M * c * squash + self.elevation_m) * sin;
        (axial / super::place::AU_M, polar / super::place::AU_M)
    }
}
