//! The face a body turns to us: poles, rotation, rings, limbs, diameters.
//!
//! Poles and rotation after IAU WGCCRE 2015 (Archinal et al. 2018, *Celest. Mech.* 130:22); vectors ICRS, au, light time
//! allowed for by the [`Geometry`] handed in; instants TDB. Periodic terms of Mars's pole and spin under 0.0003 degrees are
//! left out. Good to 0.003 degrees in this century; the poles of the outer planets drift by a few thousandths of a degree
//! a century and the formulas are linear, so remote epochs are as good as that.
//!
//! Position angles run from north through east, 0 to 360 degrees, in the frame the caller names by a rotation from ICRS:
//! `Mat3::IDENTITY` gives ICRS north, the rotation to the true equator and equinox of date gives north of date.
//! West longitudes of Mars and Jupiter grow as the planet turns. Central meridians are those of the geometric disc: no phase
//! term is added, as some almanacs do (57.3 degrees times the squared sine of half the phase angle).

use super::light::{AU_KM, Geometry};
use super::{Angle, Body, Mat3, Tdb, Vec3};

/// The body's north pole in the IAU sense (the one north of the solar system's invariable plane) as a unit vector, ICRS.
///
/// `None` for the Moon, whose pole needs a long series. Sources: the report named above; the coefficients were written
/// from memory and agree with those of general-purpose libraries (for Saturn and Uranus the pole vectors of skyfield 1.55,
/// for Jupiter, Neptune, Venus and the Sun poliastro 0.12, for Mars JPL's longitudes in the tests); Mercury's pole is
/// from memory alone.
#[must_use]
pub fn north_pole(body: Body, at: Tdb) -> Option<Vec3> {
    let t = at.centuries();
    let angle = |constant: f64, per_century: f64| Angle::from_degrees(constant + per_century * t);
    let (right_ascension_deg, declination_deg) = match body {
        Body::Moon => return None,
        Body::Sun => (286.13, 63.87),
        Body::Mercury => (281.0103 - 0.0328 * t, 61.4155 - 0.0049 * t),
        Body::Venus => (272.76, 67.16),
        Body::Mars => (
            317.269_202 - 0.109_275_47 * t + 0.419_057 * angle(79.398_797, 0.504_261_5).sin(),
            54.432_516 - 0.058_271_05 * t + 1.591_274 * angle(166.325_722, 0.504_261_5).cos(),
        ),
        Body::Jupiter => {
            let (sin_b, cos_b) = angle(175.895_369, 1191.9605).sin_cos();
            let (sin_c, cos_c) = angle(300.323_162, 262.5475).sin_cos();
            let (sin_e, cos_e) = angle(49.511_251, 64.3000).sin_cos();
            (
                268.056_595 - 0.006_499 * t
                    + 0.000_938 * sin_b
                    + 0.001_432 * sin_c
                    + 0.002_150 * sin_e,
                64.495_303
                    + 0.002_413 * t
                    + 0.000_404 * cos_b
                    + 0.000_617 * cos_c
                    + 0.000_926 * cos_e,
            )
        }
        // Worked out once, as magnitudes ask for these two again and again.
        Body::Saturn => return Some((SATURN_POLE + SATURN_POLE_DRIFT * t).unit()),
        Body::Uranus => return Some(URANUS_POLE),
        Body::Neptune => {
            let (sin_n, cos_n) = angle(357.85, 52.316).sin_cos();
            (299.36 + 0.70 * sin_n, 43.46 - 0.51 * cos_n)
        }
    };
    Some(Vec3::from_spherical(
        Angle::from_degrees(right_ascension_deg),
        Angle::from_degrees(declination_deg),
    ))
}

/// Right ascension 40.589 - 0.036 T, declination 83.537 - 0.004 T degrees at J2000, and its rate a century; as a straight
/// line 0.0025 degrees off after 30 centuries.
const SATURN_POLE: Vec3 = Vec3::new(
    0.085_478_831_861_071_7,
    0.073_235_757_877_528_9,
    0.993_644_751_946_977,
);
const SATURN_POLE_DRIFT: Vec3 = Vec3::new(9.869_431e-5, -8.574_17e-6, -7.858_280e-6);
/// Right ascension 257.311, declination -15.175 degrees.
const URANUS_POLE: Vec3 = Vec3::new(
    -0.211_999_581_537_798_55,
    -0.941_559_157_289_512_4,
    -0.261_768_085_816_551_4,
);

/// Polar radius in km, from the same report; the equatorial one is [`Body::radius_km`].
#[must_use]
pub const fn polar_radius_km(body: Body) -> f64 {
    match body {
        Body::Mercury => 2438.26,
        Body::Mars => 3376.20,
        Body::Jupiter => 66_854.0,
        Body::Saturn => 54_364.0,
        Body::Uranus => 24_973.0,
        Body::Neptune => 24_341.0,
        Body::Sun | Body::Moon | Body::Venus => body.radius_km(),
    }
}

/// The latitudes on a body under the observer and under the Sun.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct SubLatitudes {
    pub observer: Angle,
    pub sun: Angle,
}

/// Planetographic latitudes under observer and Sun, north positive. Zero for the Moon, whose pole is not modelled here.
#[must_use]
pub fn planetographic_latitudes(geometry: &Geometry) -> SubLatitudes {
    let axis_ratio = polar_radius_km(geometry.body) / geometry.body.radius_km();
    sub_latitudes(geometry, axis_ratio * axis_ratio)
}

/// Planetocentric latitudes under observer and Sun, north positive: DE and DS of Mars and Jupiter. Zero for the Moon.
#[must_use]
pub fn planetocentric_latitudes(geometry: &Geometry) -> SubLatitudes {
    sub_latitudes(geometry, 1.0)
}

/// Latitudes whose tangent is the planetocentric one's divided by `squeeze`.
fn sub_latitudes(geometry: &Geometry, squeeze: f64) -> SubLatitudes {
    let Some(pole) = north_pole(geometry.body, geometry.emission) else {
        return SubLatitudes::default();
    };
    // The direction from the body is the reverse of the vector to it.
    let latitude = |to_body: Vec3| {
        Angle::from_radians(libm::atan2(
            -pole.dot(to_body),
            squeeze * pole.cross(to_body).norm(),
        ))
    };
    SubLatitudes {
        observer: latitude(geometry.observer_to_body),
        sun: latitude(geometry.sun_to_body),
    }
}

/// A system of longitudes that turns with a planet.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum LongitudeSystem {
    /// Mars, through the crater Airy-0.
    Mars,
    /// Jupiter's equatorial belts.
    JupiterI,
    /// Jupiter's belts away from the equator; the Great Red Spot is given in it.
    JupiterII,
    /// Jupiter's magnetic field.
    JupiterIII,
}

impl LongitudeSystem {
    #[must_use]
    pub const fn body(self) -> Body {
        match self {
            LongitudeSystem::Mars => Body::Mars,
            LongitudeSystem::JupiterI
            | LongitudeSystem::JupiterII
            | LongitudeSystem::JupiterIII => Body::Jupiter,
        }
    }

    /// The angle W from the node of the planet's equator on the ICRS equator to the prime meridian.
    fn prime_meridian(self, at: Tdb) -> Angle {
        let d = at.days();
        let t = at.centuries();
        let sine =
            |constant: f64, per_century: f64| Angle::from_degrees(constant + per_century * t).sin();
        // Whole turns go first, so that no digits are lost to them.
        let turned = |constant: f64, per_day: f64| constant + (per_day * d) % 360.0;
        Angle::from_degrees(match self {
            LongitudeSystem::Mars => {
                turned(176.049_863, 350.891_982_443_297)
                    + 0.000_145 * sine(129.071_773, 19_140.032_824_4)
                    + 0.000_157 * sine(36.352_167, 38_281.047_359_1)
                    + 0.000_040 * sine(56.668_646, 57_420.929_536_0)
                    + 0.584_542 * sine(95.391_654, 0.504_261_5)
            }
            LongitudeSystem::JupiterI => turned(67.1, 877.900),
            LongitudeSystem::JupiterII => turned(43.3, 870.270),
            LongitudeSystem::JupiterIII => turned(284.95, 870.5360),
        })
    }
}

/// The west longitudes on a body under the observer and under the Sun, 0 to 360 degrees.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SubLongitudes {
    /// The central meridian.
    pub observer: Angle,
    pub sun: Angle,
}

/// West longitudes under observer and Sun; `None` where the system is another body's.
///
/// The Sun's is where it stands overhead at the moment the light leaves (JPL's lets the Sun's light travel too, which
/// makes Mars's 0.005 degrees larger).
#[must_use]
pub fn sub_longitudes(geometry: &Geometry, system: LongitudeSystem) -> Option<SubLongitudes> {
    if geometry.body != system.body() {
        return None;
    }
    Some(longitudes_on(geometry, system))
}

/// West longitudes on Mars, for a geometry already known to be Mars's.
pub(super) fn mars_longitudes(geometry: &Geometry) -> SubLongitudes {
    longitudes_on(geometry, LongitudeSystem::Mars)
}

fn longitudes_on(geometry: &Geometry, system: LongitudeSystem) -> SubLongitudes {
    let pole = north_pole(system.body(), geometry.emission).unwrap_or(Vec3::new(0.0, 0.0, 1.0));
    // Where the planet's equator rises through the ICRS equator, and a quarter turn further along.
    let node = Vec3::new(-pole.y, pole.x, 0.0).unit();
    let quarter = pole.cross(node);
    let meridian = system.prime_meridian(geometry.emission);
    let west = |to_body: Vec3| {
        let east_of_node = libm::atan2(-to_body.dot(quarter), -to_body.dot(node));
        (meridian - Angle::from_radians(east_of_node)).wrapped()
    };
    SubLongitudes {
        observer: west(geometry.observer_to_body),
        sun: west(geometry.sun_to_body),
    }
}

/// The central meridian: west longitude under the observer, 0 to 360 degrees, without phase term; `None` where the system
/// is another body's.
#[must_use]
pub fn central_meridian(geometry: &Geometry, system: LongitudeSystem) -> Option<Angle> {
    sub_longitudes(geometry, system).map(|longitudes| longitudes.observer)
}

/// Ls, the areocentric longitude of the Sun, 0 to 360 degrees: 0 at the northern spring equinox of Mars. `None` for another
/// body.
///
/// Counted along the mean plane of Mars's orbit from its node on the planet's equator. Mean plane after Simon et al. 1994,
/// *A&A* 282, 663 (J2000 ecliptic; within 0.002 degrees of DE440 from 1600 to 2400).
#[must_use]
pub fn mars_season(geometry: &Geometry) -> Option<Angle> {
    if geometry.body != Body::Mars {
        return None;
    }
    let pole = north_pole(Body::Mars, geometry.emission)?;
    // The series counts in thousands of years. Beyond about six thousand years it is no longer meant.
    let t = geometry.emission.centuries() / 10.0;
    let inclination = Angle::from_arcsec(1.849_726_48 * 3600.0 + (-293.317_22 - 8.118_30 * t) * t);
    let node = Angle::from_arcsec(49.558_093_21 * 3600.0 + (-10_620.900_88 - 230.574_16 * t) * t);
    // From the orbit's axes back to the ecliptic and the equator of J2000 (84 381.448", the obliquity that series uses).
    let icrs_from_ecliptic = Mat3::about_x(Angle::from_arcsec(-84_381.448));
    let ecliptic_normal =
        Mat3::about_z(-node) * (Mat3::about_x(-inclination) * Vec3::new(0.0, 0.0, 1.0));
    let normal = icrs_from_ecliptic * ecliptic_normal;
    let equinox = pole.cross(normal).unit();
    let to_sun = -geometry.sun_to_body;
    Some(
        Angle::from_radians(libm::atan2(
            to_sun.dot(normal.cross(equinox)),
            to_sun.dot(equinox),
        ))
        .wrapped(),
    )
}

/// How Saturn's rings lie.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RingTilt {
    /// B: height of the observer over the ring plane as seen from Saturn, north positive.
    pub observer: Angle,
    /// B': height of the Sun over it. With signs opposite to B, the unlit face is seen.
    pub sun: Angle,
    /// P: position angle of the minor axis of the rings on its northern side, which is that of Saturn's pole.
    pub position_angle: Angle,
}

/// The tilt of Saturn's rings; `None` for another body.
#[must_use]
pub fn saturn_rings(geometry: &Geometry, frame_from_icrs: &Mat3) -> Option<RingTilt> {
    if geometry.body != Body::Saturn {
        return None;
    }
    let latitudes = planetocentric_latitudes(geometry);
    Some(RingTilt {
        observer: latitudes.observer,
        sun: latitudes.sun,
        position_angle: pole_position_angle(geometry, frame_from_icrs)?,
    })
}

/// Position angle of the body's north pole (of its axis, whether or not the pole itself is on the near side); `None` for
/// the Moon.
#[must_use]
pub fn pole_position_angle(geometry: &Geometry, frame_from_icrs: &Mat3) -> Option<Angle> {
    let pole = north_pole(geometry.body, geometry.emission)?;
    let direction = *frame_from_icrs * geometry.observer_to_body;
    Some(direction.position_angle(*frame_from_icrs * pole))
}

/// Position angle of the middle of the bright limb: from the centre of the disc toward the Sun. Undefined at full and new
/// phase, where it turns quickly; 0 for the Sun itself.
#[must_use]
pub fn bright_limb_position_angle(geometry: &Geometry, frame_from_icrs: &Mat3) -> Angle {
    let direction = *frame_from_icrs * geometry.observer_to_body;
    direction.position_angle(*frame_from_icrs * -geometry.sun_to_body)
}

/// Position angle of the greatest defect of illumination: opposite to the bright limb.
#[must_use]
pub fn greatest_defect_position_angle(geometry: &Geometry, frame_from_icrs: &Mat3) -> Angle {
    (bright_limb_position_angle(geometry, frame_from_icrs) + Angle::HALF_TURN).wrapped()
}

/// Angle under which the equatorial radius is seen: half the angle between lines of sight that touch the limb. 90 degrees
/// from inside the body.
#[must_use]
pub fn semidiameter(body: Body, distance_au: f64) -> Angle {
    let ratio = body.radius_km() / (distance_au * AU_KM);
    // Also where the distance is zero and the ratio infinite.
    Angle::from_radians(libm::asin(ratio.clamp(0.0, 1.0)))
}

/// Apparent equatorial diameter at the light-time distance.
#[must_use]
pub fn equatorial_diameter(geometry: &Geometry) -> Angle {
    semidiameter(geometry.body, geometry.distance_au()) * 2.0
}
