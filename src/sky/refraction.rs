//! What the air does near the horizon: refraction, dip, airmass.
//!
//! Refraction by Bennett's formula (Bennett 1982, *J. Navigation* 35, 255, as in Meeus, *Astronomical Algorithms* 2nd ed.,
//! ch. 16), which is a function of the **apparent** altitude and here inverted to give the apparent from the true one:
//! within 0.07' of refraction tables for ordinary air. It scales with pressure and temperature. Real air near the horizon
//! differs from day to day by some arcminutes. Altitudes are angles from the astronomical horizon, -90 to 90 degrees.

use super::Angle;

/// The air at a site, as refraction sees it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Air {
    /// Pressure at the site (not reduced to sea level), hPa; 0 means no refraction.
    pub pressure_hpa: f64,
    /// Temperature, degrees Celsius.
    pub temperature_c: f64,
}

impl Default for Air {
    /// The air Bennett's formula was made for: 1010 hPa and 10 degrees Celsius.
    fn default() -> Self {
        Air {
            pressure_hpa: 1010.0,
            temperature_c: 10.0,
        }
    }
}

impl Air {
    /// No air: true and apparent altitude are the same.
    pub const NONE: Air = Air {
        pressure_hpa: 0.0,
        temperature_c: 10.0,
    };

    /// What refraction is multiplied by: P/1010 * 283/(273+T). Pressures outside 0 to 1200 hPa and temperatures outside
    /// -100 to 70 degrees, which no site has, count as the nearest of these; a number that is none counts as ordinary air.
    fn factor(&self) -> f64 {
        let or_ordinary = |value: f64, ordinary: f64| if value.is_nan() { ordinary } else { value };
        let pressure = or_ordinary(self.pressure_hpa, 1010.0).clamp(0.0, 1200.0);
        let temperature = or_ordinary(self.temperature_c, 10.0).clamp(-100.0, 70.0);
        pressure / 1010.0 * 283.0 / (273.0 + temperature)
    }
}

/// True altitude below which refraction keeps its value, degrees: no formula is meant for what lies deeper.
const LOWEST_TRUE_DEG: f64 = -1.0;

/// The altitude at which a body appears that stands at this true altitude.
///
/// Inverse of [`true_from_apparent`] to 1e-9 degrees and increasing throughout. Below -1 degree true the refraction keeps
/// the value it has there.
#[must_use]
pub fn apparent_from_true(true_altitude: Angle, air: &Air) -> Angle {
    let true_deg = true_altitude.degrees();
    let solved_deg = true_deg.max(LOWEST_TRUE_DEG);
    let lift_deg = apparent_deg_from_true_deg(solved_deg, air.factor()) - solved_deg;
    true_altitude + Angle::from_degrees(lift_deg)
}

/// The true altitude of a body that appears at this altitude.
///
/// Below about -0.4 degrees in ordinary air (-1 degree true) the refraction keeps the value it has there.
#[must_use]
pub fn true_from_apparent(apparent_altitude: Angle, air: &Air) -> Angle {
    let apparent_deg = apparent_altitude.degrees();
    let factor = air.factor();
    // The formula grows with the altitude from -1.7 degrees up, and no air lifts -1 degree true to less than -1 degree.
    if apparent_deg >= LOWEST_TRUE_DEG {
        let refraction_deg = bennett(apparent_deg, factor).refraction_deg;
        if apparent_deg - refraction_deg >= LOWEST_TRUE_DEG {
            return apparent_altitude - Angle::from_degrees(refraction_deg);
        }
    }
    let lift_deg = apparent_deg_from_true_deg(LOWEST_TRUE_DEG, factor) - LOWEST_TRUE_DEG;
    apparent_altitude - Angle::from_degrees(lift_deg)
}

/// Refraction and its change with altitude at one apparent altitude.
struct Bennett {
    refraction_deg: f64,
    slope: f64,
}

/// R = cot(h + 7.31/(h + 4.4)) arcminutes, h in degrees, times `factor`. From 89.92 degrees up, where the cotangent would
/// fall below zero (by 0.08" at the zenith), refraction is nil.
fn bennett(apparent_deg: f64, factor: f64) -> Bennett {
    let shifted = apparent_deg + 4.4;
    let argument = Angle::from_degrees(apparent_deg + 7.31 / shifted);
    if argument >= Angle::QUARTER_TURN {
        return Bennett {
            refraction_deg: 0.0,
            slope: 0.0,
        };
    }
    let cotangent = 1.0 / argument.tan();
    let argument_slope = 1.0 - 7.31 / (shifted * shifted);
    let per_degree = Angle::from_degrees(1.0).radians();
    Bennett {
        refraction_deg: factor / 60.0 * cotangent,
        slope: -factor / 60.0 * (1.0 + cotangent * cotangent) * argument_slope * per_degree,
    }
}

/// Solves h - R(h) = true altitude by Newton's rule, for true altitudes from -1 degree up.
fn apparent_deg_from_true_deg(true_deg: f64, factor: f64) -> f64 {
    // Start within 0.004 degrees in ordinary air: a cotangent of the kind that Saemundsson 1986, *Sky & Telescope* 72, 70,
    // gives for the true altitude, with numbers fitted to Bennett's, and by its series, which spares a tangent.
    let u = Angle::from_degrees(true_deg + 10.14 / (true_deg + 5.12)).radians();
    let square = u * u;
    let cotangent = 1.0 / u - u * (1.0 / 3.0 + square * (1.0 / 45.0 + square * (2.0 / 945.0)));
    let mut apparent_deg = true_deg + factor / 60.0 * cotangent;
    // A step leaves less than its own square times the slope. One to three steps do; the bound only makes the end plain.
    for _ in 0..8 {
        let Bennett {
            refraction_deg,
            slope,
        } = bennett(apparent_deg, factor);
        let step = (apparent_deg - refraction_deg - true_deg) / (1.0 - slope);
        apparent_deg -= step;
        if step * step * slope.abs() < 1e-11 {
            break;
        }
    }
    apparent_deg
}

/// How far the true horizon lies below the astronomical one, seen from a height above the ground or sea around it.
///
/// With ordinary refraction, which bends the line of sight by a sixth of the Earth's curvature: the navigator's 1.76' times
/// the square root of the height in metres (from memory), here without that rule's small-angle limit. Zero at or below the
/// ground. Apparent altitude of the horizon is minus this.
#[must_use]
pub fn horizon_dip(height_m: f64) -> Angle {
    /// Mean radius of the Earth (IUGG 6371 km) over 1 - 1/6.
    const BENT_RADIUS_M: f64 = 6_371_000.0 / (1.0 - 1.0 / 6.0);
    // tan(dip) = sqrt(2 R h + h^2) / R.
    let height = height_m.max(0.0);
    Angle::from_radians(libm::atan2(
        (height * (2.0 * BENT_RADIUS_M + height)).sqrt(),
        BENT_RADIUS_M,
    ))
}

/// Airmass at an **apparent** altitude: 1 at the zenith, 37.9 at the horizon, which it keeps below.
///
/// Kasten and Young 1989, *Applied Optics* 28, 4735: 1/(sin h + 0.50572 (h + 6.07995)^-1.6364), h in degrees.
#[must_use]
pub fn airmass(apparent_altitude: Angle) -> f64 {
    let altitude = if apparent_altitude > Angle::ZERO {
        apparent_altitude
    } else {
        Angle::ZERO
    };
    let bent = libm::pow(altitude.degrees() + 6.079_95, -1.6364);
    1.0 / (altitude.sin() + 0.505_72 * bent)
}
