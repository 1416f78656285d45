//! How bright a body is: V magnitudes from distance, phase and orientation.
//!
//! Planets after Mallama and Hilton 2018, *Astronomy and Computing* 25, 10 (arXiv:1808.01973), with the true Sun and not
//! the barycentre; the paper's own test rows come out within 0.0005 mag. The Moon by the phase law that goes with
//! Krisciunas and Schaefer 1991, *PASP* 103, 1033 (within 0.02 mag of four values of JPL). No
//! extinction by air. Vectors are ICRS, au; instants TDB. The formulas for Neptune depend on the year.
//!
//! Outside the range a formula was made for the value stays finite and joins on where the paper allows it, and carries
//! [`Caution::MagnitudeOutsideRange`]; each function below says how it goes on.

use super::caution::{Caution, Cautions, Flagged};
use super::physical;
use super::{Angle, Body, Tdb, Vec3};

/// Kilometres in an astronomical unit, exact: IAU 2012 resolution B2.
pub const AU_KM: f64 = 149_597_870.7;

/// What a magnitude depends on. All vectors ICRS, au, with finite components.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Geometry {
    /// From the Sun's centre to the body, both at the time the light left; zero for the Sun itself.
    pub sun_to_body: Vec3,
    /// From the observer (when the light arrives) to the body (when the light left).
    pub observer_to_body: Vec3,
    /// When the light left.
    pub emission: Tdb,
    pub body: Body,
}

impl Geometry {
    /// Distance of the body from the Sun, au.
    #[must_use]
    pub fn sun_distance_au(&self) -> f64 {
        self.sun_to_body.norm()
    }

    /// Light-time distance of the body from the observer, au.
    #[must_use]
    pub fn distance_au(&self) -> f64 {
        self.observer_to_body.norm()
    }

    /// Angle Sun-body-observer, 0 to 180 degrees, accurate at both ends; zero for the Sun.
    #[must_use]
    pub fn phase_angle(&self) -> Angle {
        self.sun_to_body.separation(self.observer_to_body)
    }

    /// Lit fraction of the disc, 0 to 1.
    #[must_use]
    pub fn lit_fraction(&self) -> f64 {
        let cos_half = (self.phase_angle() / 2.0).cos();
        cos_half * cos_half
    }
}

/// Whether Mars's magnitude follows its markings and seasons, which makes it waver by up to 0.1 mag within a rotation.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum MarsTerms {
    /// For searches and curves over a season.
    Omit,
    /// For the reading at an instant.
    Include,
}

/// The V magnitude of the body as seen from outside the atmosphere.
#[must_use]
pub fn magnitude(geometry: &Geometry, mars_terms: MarsTerms) -> Flagged<f64> {
    let phase_deg = geometry.phase_angle().degrees();
    let reduced = match geometry.body {
        Body::Sun => Flagged::sound(SUN_AT_1_AU),
        Body::Moon => moon(phase_deg),
        Body::Mercury => mercury(phase_deg),
        Body::Venus => venus(phase_deg),
        Body::Mars => {
            let globe = mars(phase_deg);
            match mars_terms {
                MarsTerms::Omit => globe,
                MarsTerms::Include => Flagged {
                    value: globe.value + mars_terms_of(geometry),
                    cautions: globe.cautions,
                },
            }
        }
        Body::Jupiter => jupiter(phase_deg),
        Body::Saturn => saturn(
            phase_deg,
            saturn_ring_latitude(physical::planetocentric_latitudes(geometry)),
        ),
        Body::Uranus => uranus(phase_deg, physical::planetographic_latitudes(geometry)),
        Body::Neptune => neptune(phase_deg, 2000.0 + geometry.emission.days() / 365.25),
    };
    at_distances(reduced, geometry)
}

/// V magnitude of the Sun at 1 au: -26.74 in Schaefer 1998, *Sky & Telescope*, May, p. 57 (from memory; others give up to
/// -26.76).
const SUN_AT_1_AU: f64 = -26.74;

/// From 1 au to the distances of the geometry: adds 5 log10(r D), without a square root. A floor keeps a body at the
/// observer's own place, or a planet at the Sun's, finite; such a value is flagged.
fn at_distances(reduced: Flagged<f64>, geometry: &Geometry) -> Flagged<f64> {
    const LEAST_PRODUCT: f64 = 1e-30;
    let observer = geometry.observer_to_body;
    let sun_square = if geometry.body == Body::Sun {
        1.0
    } else {
        geometry.sun_to_body.dot(geometry.sun_to_body)
    };
    let product = sun_square * observer.dot(observer);
    Flagged {
        value: reduced.value + 2.5 * libm::log10(product.max(LEAST_PRODUCT)),
        cautions: reduced
            .cautions
            .with_if(product < LEAST_PRODUCT, Caution::MagnitudeOutsideRange),
    }
}

fn flagged_outside(value: f64, outside: bool) -> Flagged<f64> {
    Flagged {
        value,
        cautions: Cautions::NONE.with_if(outside, Caution::MagnitudeOutsideRange),
    }
}

/// The value at `x` of the polynomial with these coefficients, the constant first.
fn polynomial<const N: usize>(coefficients: [f64; N], x: f64) -> f64 {
    coefficients.iter().rev().fold(0.0, |sum, c| sum * x + c)
}

/// Phase law of Krisciunas and Schaefer 1991, scaled from the mean distance of 384 400 km. Flagged beyond 150 degrees,
/// where the measurements behind it end (from memory). It leaves out the surge within a few degrees of full.
fn moon(phase_deg: f64) -> Flagged<f64> {
    /// 5 log10 of that distance in au: what brings the law to 1 au.
    const MEAN_DISTANCE_MAG: f64 = -12.950_710_165_245_855;
    let square = phase_deg * phase_deg;
    flagged_outside(
        -12.73 + 0.026 * phase_deg + 4e-9 * square * square - MEAN_DISTANCE_MAG,
        phase_deg > 150.0,
    )
}

/// Observed from 2 to 170 degrees; the polynomial goes on at both ends (10.4 at 180, distances apart).
fn mercury(phase_deg: f64) -> Flagged<f64> {
    let curve = [
        -0.613,
        6.3280e-2,
        -1.6336e-3,
        3.3644e-5,
        -3.4265e-7,
        1.6893e-9,
        -3.0334e-12,
    ];
    flagged_outside(
        polynomial(curve, phase_deg),
        !(2.0..=170.0).contains(&phase_deg),
    )
}

/// Two branches, 0.007 mag apart where they meet; the second goes on beyond 179 degrees.
fn venus(phase_deg: f64) -> Flagged<f64> {
    let value = if phase_deg < 163.7 {
        polynomial(
            [-4.384, -1.044e-3, 3.687e-4, -2.814e-6, 8.938e-9],
            phase_deg,
        )
    } else {
        polynomial([236.058_28, -2.819_14, 8.390_34e-3], phase_deg)
    };
    flagged_outside(value, phase_deg >= 179.0)
}

/// Two branches, 0.001 mag apart where they meet; the second goes on beyond 120 degrees.
fn mars(phase_deg: f64) -> Flagged<f64> {
    let curve = if phase_deg <= 50.0 {
        [-1.601, 2.267e-2, -1.302e-4]
    } else {
        [-0.367, -0.025_73, 3.445e-4]
    };
    flagged_outside(polynomial(curve, phase_deg), phase_deg > 120.0)
}

/// Two branches, 0.0004 mag apart where they meet; the second goes on beyond 130 degrees (its logarithm stays finite up
/// to 180).
fn jupiter(phase_deg: f64) -> Flagged<f64> {
    let value = if phase_deg <= 12.0 {
        polynomial([-9.395, -3.7e-4, 6.16e-4], phase_deg)
    } else {
        let flux = polynomial(
            [1.0, -1.507, -0.363, -0.062, 2.809, -1.876],
            phase_deg / 180.0,
        );
        -9.428 - 2.5 * libm::log10(flux)
    };
    flagged_outside(value, phase_deg > 130.0)
}

/// Largest phase angle of Saturn's formula with rings, degrees; the Earth never sees more.
const SATURN_RING_PHASE_DEG: f64 = 6.5;

/// The paper's latitude for the rings: the geometric mean of the planetocentric latitudes of Sun and observer, zero where
/// they stand on opposite sides of the ring plane and the unlit face is seen.
fn saturn_ring_latitude(latitudes: physical::SubLatitudes) -> Angle {
    let product = latitudes.sun.radians() * latitudes.observer.radians();
    Angle::from_radians(product.max(0.0).sqrt())
}

/// Saturn's globe alone beyond the phase angles that the Earth sees.
fn saturn_globe_beyond(phase_deg: f64) -> f64 {
    polynomial([-8.94, 2.446e-4, 2.672e-4, -1.506e-6, 4.767e-9], phase_deg)
}

/// Globe and rings. Beyond 27 degrees of ring latitude the formula goes on. Beyond 6.5 degrees of phase, where the paper
/// has none with rings, the rings keep the share they have there and the globe's own formula gives the slope, so that the
/// curve is continuous.
fn saturn(phase_deg: f64, ring_latitude: Angle) -> Flagged<f64> {
    let geocentric = phase_deg.min(SATURN_RING_PHASE_DEG);
    let sin_b = ring_latitude.sin();
    let with_rings =
        -8.914 - 1.825 * sin_b + 0.026 * geocentric - 0.378 * sin_b * libm::exp(-2.25 * geocentric);
    let beyond = phase_deg > SATURN_RING_PHASE_DEG;
    let value = if beyond {
        with_rings + saturn_globe_beyond(phase_deg) - saturn_globe_beyond(SATURN_RING_PHASE_DEG)
    } else {
        with_rings
    };
    flagged_outside(value, beyond || ring_latitude.degrees() > 27.0)
}

/// Saturn's globe alone, its rings left out: what the rings add is the difference from [`magnitude`]. `None` for another
/// body. Two branches, 0.001 mag apart where they meet at 6.5 degrees; flagged beyond 150 degrees (from memory).
#[must_use]
pub fn saturn_globe_magnitude(geometry: &Geometry) -> Option<Flagged<f64>> {
    if geometry.body != Body::Saturn {
        return None;
    }
    let phase_deg = geometry.phase_angle().degrees();
    let reduced = if phase_deg <= SATURN_RING_PHASE_DEG {
        polynomial([-8.95, -3.7e-4, 6.16e-4], phase_deg)
    } else {
        saturn_globe_beyond(phase_deg)
    };
    Some(at_distances(
        flagged_outside(reduced, phase_deg > 150.0),
        geometry,
    ))
}

/// Sub-latitude term always; the phase term only beyond 3.1 degrees, as the paper has it, which is a step of 0.02 mag that
/// the Earth crosses near quadrature in the years about Uranus's perihelion. Flagged beyond 154 degrees, where the
/// spacecraft photometry behind it ends (from memory).
fn uranus(phase_deg: f64, latitudes: physical::SubLatitudes) -> Flagged<f64> {
    let mean_deg = (latitudes.sun.degrees().abs() + latitudes.observer.degrees().abs()) / 2.0;
    let phase_term = if phase_deg > 3.1 {
        polynomial([0.0, 6.587e-3, 1.045e-4], phase_deg)
    } else {
        0.0
    };
    flagged_outside(-7.110 - 8.4e-4 * mean_deg + phase_term, phase_deg > 154.0)
}

/// Neptune grew brighter from 1980 to 2000. The phase term holds beyond 1.9 degrees from 2000 on, a step of 0.015 mag as
/// the paper has it; before 2000 the paper has none, and here it starts from zero at 1.9 degrees. Flagged then, and beyond
/// 133 degrees, where the spacecraft photometry behind it ends (from memory).
fn neptune(phase_deg: f64, year: f64) -> Flagged<f64> {
    const GEOCENTRIC_PHASE_DEG: f64 = 1.9;
    let phase_term = |a: f64| polynomial([0.0, 7.944e-3, 9.617e-5], a);
    let level = (-6.89 - 0.0054 * (year - 1980.0)).clamp(-7.00, -6.89);
    let beyond = phase_deg > GEOCENTRIC_PHASE_DEG;
    let value = match (beyond, year >= 2000.0) {
        (false, _) => level,
        (true, true) => level + phase_term(phase_deg),
        (true, false) => level + phase_term(phase_deg) - phase_term(GEOCENTRIC_PHASE_DEG),
    };
    flagged_outside(value, (beyond && year < 2000.0) || phase_deg > 133.0)
}

/// Mars's two terms at a geometry.
fn mars_terms_of(geometry: &Geometry) -> f64 {
    let longitudes = physical::mars_longitudes(geometry);
    // Halfway along the shorter way round, which is what the paper's rule of adding 180 degrees amounts to.
    let central = longitudes.sun + (longitudes.observer - longitudes.sun).signed() / 2.0;
    // Obliquity of the ecliptic at J2000, IAU 2006 (84 381.406").
    let sun_to_body = geometry.sun_to_body;
    let (sin, cos) = Angle::from_arcsec(84_381.406).sin_cos();
    let heliocentric = Vec3::new(
        sun_to_body.x,
        sun_to_body.y * cos + sun_to_body.z * sin,
        0.0,
    )
    .longitude();
    mars_rotation_term(central) + mars_season_term(heliocentric - Angle::from_degrees(85.0))
}

/// L1: what Mars's markings add, magnitudes, by the effective central meridian (mean of the west longitudes under the
/// observer and under the Sun).
#[must_use]
pub fn mars_rotation_term(central_meridian: Angle) -> f64 {
    const L1: [f64; 36] = [
        0.036, 0.045, 0.038, 0.023, 0.015, 0.011, 0.000, -0.012, -0.018, -0.036, -0.044, -0.059,
        -0.060, -0.055, -0.043, -0.041, -0.041, -0.036, -0.036, -0.018, -0.038, -0.011, 0.002,
        0.004, 0.018, 0.019, 0.035, 0.050, 0.035, 0.027, 0.037, 0.048, 0.025, 0.022, 0.024, 0.034,
    ];
    interpolate_every_ten_degrees(&L1, central_meridian)
}

/// L2: what Mars's seasons add, magnitudes, by the paper's season angle (heliocentric ecliptic longitude of J2000 less 85
/// degrees).
#[must_use]
pub fn mars_season_term(season: Angle) -> f64 {
    const L2: [f64; 36] = [
        -0.029, -0.017, -0.014, -0.006, -0.018, -0.020, -0.014, -0.030, -0.008, -0.040, -0.024,
        -0.037, -0.036, -0.032, 0.010, 0.010, -0.001, 0.044, 0.025, -0.004, -0.016, -0.008, 0.029,
        -0.054, -0.033, 0.055, 0.017, 0.052, 0.006, 0.087, 0.006, 0.064, 0.030, 0.019, -0.030,
        -0.017,
    ];
    interpolate_every_ten_degrees(&L2, season)
}

/// Stirling's interpolation to fourth differences about the entry before the angle, as the paper's own program does it:
/// that leaves the last of its four first differences at zero, so that the entry two further on counts as equal to the
/// next one. JPL's published magnitudes follow the program to 0.0005 mag (seven rows); the textbook rule about the same
/// entry is up to 0.003 mag off, about the nearest entry up to 0.013. Continuous: it meets every entry.
fn interpolate_every_ten_degrees(table: &[f64; 36], angle: Angle) -> f64 {
    let place = angle.wrapped().degrees() / 10.0;
    let before = place.floor();
    let p = place - before;
    let entry = |step: usize| table[(before as usize + 36 + step - 2) % 36];
    let first = [
        entry(1) - entry(0),
        entry(2) - entry(1),
        entry(3) - entry(2),
        0.0,
    ];
    let second = [
        first[1] - first[0],
        first[2] - first[1],
        first[3] - first[2],
    ];
    let third = [second[1] - second[0], second[2] - second[1]];
    let fourth = third[1] - third[0];
    let square = p * p;
    entry(2)
        + p * (first[1] + first[2]) / 2.0
        + square * second[1] / 2.0
        + p * (square - 1.0) * (third[0] + third[1]) / 12.0
        + square * (square - 1.0) * fourth / 24.0
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Rounding of the published rows.
    const PUBLISHED_MAG: f64 = 0.0005 + 1e-9;

    fn latitudes(sun_deg: f64, observer_deg: f64) -> physical::SubLatitudes {
        physical::SubLatitudes {
            sun: Angle::from_degrees(sun_deg),
            observer: Angle::from_degrees(observer_deg),
        }
    }

    fn check(reduced: f64, r: f64, delta: f64, published: f64) {
        let value = reduced + 5.0 * libm::log10(r * delta);
        assert!(
            (value - published).abs() <= PUBLISHED_MAG,
            "{value} against {published}"
        );
    }

    // The authors' own rows (their file Ap_Mag_Input_V3.txt, as kept in skyfield 1.55, tests/test_magnitudes_raw.py).
    // They give latitudes and phase angle apart, rounded so that no position fits them all: hence here, at the formulas.

    #[test]
    fn saturn_formulas_give_the_authors_rows() {
        let ring_latitude =
            saturn_ring_latitude(latitudes(-26.224_864_126_755_417, -26.332_275_658_328_648));
        let with_rings = saturn(0.1055, ring_latitude);
        check(with_rings.value, 9.014989659493, 8.03160470546889, -0.552);
        assert!(with_rings.cautions.is_empty());
        let globe = saturn_globe_beyond(169.8958);
        check(globe, 9.026035315474, 10.1321497654765, 5.206);
    }

    #[test]
    fn mean_distance_of_the_moon_is_what_its_constant_says() {
        let full_moon_at_mean_distance = moon(0.0).value + 5.0 * libm::log10(384_400.0 / AU_KM);
        assert!((full_moon_at_mean_distance + 12.73).abs() < 1e-12);
    }

    #[test]
    fn uranus_formula_gives_the_authors_rows() {
        let rows = [
            (
                18.321003215845,
                17.3229728525108,
                0.0410,
                -20.29,
                -20.28,
                5.381,
            ),
            (20.096361095266, 21.0888470145276, 0.0568, 1.02, 0.97, 6.025),
            (
                19.38003071775,
                11.1884243801383,
                161.7728,
                -71.16,
                55.11,
                8.318,
            ),
        ];
        for (r, delta, phase_deg, sun_deg, observer_deg, published) in rows {
            let reduced = uranus(phase_deg, latitudes(sun_deg, observer_deg));
            check(reduced.value, r, delta, published);
        }
    }
}
