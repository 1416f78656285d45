//! Exposure: how fast things move over the sensor, and how fine the picture can be.
//!
//! Rates as angles per second of time; wavelengths in nanometres. Each formula names its source. What is a habit of the
//! trade and no physics is a [`ThumbRule`] and says so.

use super::lens::{Lens, OutOfRange, Sensor, within};
use crate::sky::light::AU_KM;
use crate::sky::time::SECONDS_PER_DAY;
use crate::sky::{Angle, Body, Vec3};

/// Degrees by which the sky turns in a day of UT1: the rate of the mean sidereal time of 1982 (Aoki et al. 1982, *Astron.
/// Astrophys.* 105, 359; later ones differ in the tenth digit).
pub(super) const SKY_DEGREES_PER_DAY: f64 = 360.985_647_366_29;

/// How fast something moves over the sky.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct AngularRate {
    /// Not negative.
    pub per_second: Angle,
}

impl AngularRate {
    /// The turning sky over a camera that stands still: 15.041" a second times the cosine of the declination. Within a
    /// picture it is fastest at [`super::tangent::Rectangle::declination_nearest_equator`].
    #[must_use]
    pub fn of_the_sky(declination: Angle) -> Self {
        AngularRate {
            per_second: Angle::from_degrees(SKY_DEGREES_PER_DAY / SECONDS_PER_DAY)
                * declination.cos().abs(),
        }
    }

    /// The surface in the middle of a planet's disc, carried along by the rotation: 2 pi R / (P D), for a planet seen over its
    /// equator; D is the light-time distance. `None` for bodies whose rotation shows nothing in a picture: Mars, Jupiter
    /// (System I) and Saturn (System III) do.
    ///
    /// # Errors
    /// A distance outside 0.001 to 100 au.
    pub fn of_rotation(body: Body, distance_au: f64) -> Result<Option<Self>, OutOfRange> {
        let distance_au = within("distance", distance_au, (0.001, 100.0), "au from the Earth")?;
        Ok(rotation_period_h(body).map(|hours| {
            let radius = body.radius_km() / (distance_au * AU_KM);
            AngularRate {
                per_second: Angle::from_radians(std::f64::consts::TAU * radius / (hours * 3600.0)),
            }
        }))
    }

    /// A body's own motion among the stars, from its directions at two instants; the mean rate along the great circle.
    ///
    /// # Errors
    /// Less than a second or more than ten days between them; vectors that are no directions.
    pub fn of_motion(first: Vec3, second: Vec3, days: f64) -> Result<Self, OutOfRange> {
        let days = within(
            "time between the directions",
            days,
            (1.0 / SECONDS_PER_DAY, 10.0),
            "days (an hour or a day will do)",
        )?;
        let degrees = within(
            "angle between the directions",
            first.separation(second).degrees(),
            (0.0, 180.0),
            "degrees",
        )?;
        Ok(AngularRate {
            per_second: Angle::from_degrees(degrees / (days * SECONDS_PER_DAY)),
        })
    }

    /// Seconds in which it moves over an angle; `None` when it stands still.
    #[must_use]
    pub fn seconds_for(&self, angle: Angle) -> Option<f64> {
        let seconds = angle.radians() / self.per_second.radians();
        seconds.is_finite().then_some(seconds)
    }

    /// The longest exposure that smears over no more than `allowed` pixels, in seconds; `None` when nothing moves. The scale is
    /// that of the middle of the picture; at the angle a from it trails are longer, by up to 1 / cos(a) squared.
    ///
    /// # Errors
    /// Pixels outside 0.01 to 1000.
    pub fn longest_exposure_s(
        &self,
        allowed: f64,
        lens: &Lens,
        sensor: &Sensor,
    ) -> Result<Option<f64>, OutOfRange> {
        let allowed = within(
            "allowed trail",
            allowed,
            (0.01, 1000.0),
            "pixels (1 to 3 look like points)",
        )?;
        Ok(self.seconds_for(lens.pixel_scale(sensor) * allowed))
    }

    /// Pixels of smear in an exposure, at the middle of the picture.
    #[must_use]
    pub fn pixels_in(&self, seconds: f64, lens: &Lens, sensor: &Sensor) -> f64 {
        self.per_second.radians() * seconds / lens.pixel_scale(sensor).radians()
    }
}

/// Hours of rotation of what is seen: Mars 24.6229 (350.892 degrees a day) and Saturn System III 10.656, IAU WGCCRE 2015
/// (Archinal et al. 2018, *Celest. Mech.* 130:22); Jupiter System I, the equatorial belts, 877.900 degrees a day.
const fn rotation_period_h(body: Body) -> Option<f64> {
    match body {
        Body::Mars => Some(360.0 / 350.891_982_443_297 * 24.0),
        Body::Jupiter => Some(360.0 / 877.900 * 24.0),
        Body::Saturn => Some(360.0 / 810.793_902_4 * 24.0),
        _ => None,
    }
}

/// Degrees a minute by which the longitude in the middle of the disc changes. `None` as in [`AngularRate::of_rotation`].
#[must_use]
pub fn map_drift_per_minute(body: Body) -> Option<Angle> {
    rotation_period_h(body).map(|hours| Angle::from_degrees(360.0 / (hours * 60.0)))
}

/// A rule of the trade for untracked exposures. None follows from physics: each comes with the trail that its seconds leave,
/// and [`AngularRate::longest_exposure_s`] gives the exposure for a trail one has chosen.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum ThumbRule {
    /// 500 over the focal length; blind to pixels, aperture and declination.
    FiveHundred,
    /// (35 N + 30 p) / f for f-ratio N and pitch p in micrometres; blind to declination.
    NpfSimple,
    /// k (16.856 N + 0.0997 f + 13.713 p) / (f cos declination), k from 1 (strict) to 3. Credited to F. Michaud, Le Havre (from
    /// memory).
    NpfFull { leniency: f64 },
}

/// What a rule of the trade says, and what comes of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ThumbExposure {
    pub rule: ThumbRule,
    pub seconds: f64,
    /// Trail of a star at the declination in question.
    pub trail_pixels: f64,
}

impl ThumbRule {
    /// The name with what it is.
    #[must_use]
    pub const fn label(self) -> &'static str {
        match self {
            ThumbRule::FiveHundred => "500 rule (rule of thumb)",
            ThumbRule::NpfSimple => "NPF rule, simple (rule of thumb)",
            ThumbRule::NpfFull { .. } => "NPF rule, full (rule of thumb)",
        }
    }

    /// Its exposure for stars at a declination.
    ///
    /// # Errors
    /// A leniency outside 1 to 3; for the full rule, a declination beyond 89.9 degrees, where it has no bound.
    pub fn exposure(
        self,
        declination: Angle,
        lens: &Lens,
        sensor: &Sensor,
    ) -> Result<ThumbExposure, OutOfRange> {
        let (focal, f_ratio, pitch) = (lens.focal_length_mm(), lens.f_ratio(), sensor.pitch_um());
        let seconds = match self {
            ThumbRule::FiveHundred => 500.0 / focal,
            ThumbRule::NpfSimple => (35.0 * f_ratio + 30.0 * pitch) / focal,
            ThumbRule::NpfFull { leniency } => {
                let leniency = within(
                    "leniency of the NPF rule",
                    leniency,
                    (1.0, 3.0),
                    "(1 is strict)",
                )?;
                within(
                    "declination",
                    declination.degrees(),
                    (-89.9, 89.9),
                    "degrees (take the one in the picture that is nearest to the equator)",
                )?;
                leniency * (16.856 * f_ratio + 0.0997 * focal + 13.713 * pitch)
                    / (focal * declination.cos())
            }
        };
        let trail_pixels = AngularRate::of_the_sky(declination).pixels_in(seconds, lens, sensor);
        Ok(ThumbExposure {
            rule: self,
            seconds,
            trail_pixels,
        })
    }
}

/// Wavelengths accepted, nanometres: what silicon sensors see behind glass.
const WAVELENGTHS_NM: (f64, f64) = (300.0, 1100.0);

fn metres_of_light(wavelength_nm: f64) -> Result<f64, OutOfRange> {
    Ok(1e-9
        * within(
            "wavelength",
            wavelength_nm,
            WAVELENGTHS_NM,
            "nanometres (green light has 550)",
        )?)
}

/// What diffraction leaves of detail behind a round aperture.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Diffraction {
    /// Rayleigh's criterion, 1.22 wavelengths over the diameter: the middle of one point on the first dark ring of another.
    pub rayleigh: Angle,
    /// Period of the finest pattern that the aperture passes at all, wavelength over diameter.
    pub cutoff: Angle,
    /// Largest pixel that records everything it passes: half the cutoff period (Nyquist).
    pub critical_pixel: Angle,
}

/// Diffraction of a telescope's free aperture; a central obstruction changes contrast, not the cutoff. Textbook optics (Born
/// and Wolf, *Principles of Optics*, ch. 8; from memory).
///
/// # Errors
/// An aperture outside 1 to 50 000 mm, a wavelength outside 300 to 1100 nm.
pub fn diffraction(aperture_mm: f64, wavelength_nm: f64) -> Result<Diffraction, OutOfRange> {
    let aperture_m = 1e-3 * within("aperture", aperture_mm, (1.0, 50_000.0), "mm of diameter")?;
    let ratio = metres_of_light(wavelength_nm)? / aperture_m;
    Ok(Diffraction {
        rayleigh: Angle::from_radians(1.22 * ratio),
        cutoff: Angle::from_radians(ratio),
        critical_pixel: Angle::from_radians(0.5 * ratio),
    })
}

/// The f-ratio at which a pixel is half the cutoff period: 2 p / wavelength.
///
/// # Errors
/// A wavelength outside 300 to 1100 nm.
pub fn critical_f_ratio(sensor: &Sensor, wavelength_nm: f64) -> Result<f64, OutOfRange> {
    Ok(2e-6 * sensor.pitch_um() / metres_of_light(wavelength_nm)?)
}

/// The air that disperses light.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DispersingAir {
    pressure_mm_hg: f64,
    temperature_c: f64,
    vapour_mm_hg: f64,
}

impl DispersingAir {
    /// Pressure at the site and partial pressure of water vapour in hPa, degrees Celsius.
    ///
    /// # Errors
    /// A pressure outside 0 to 1200 hPa, a temperature outside -100 to 60 degrees, vapour outside 0 to 100 hPa.
    pub fn new(pressure_hpa: f64, temperature_c: f64, vapour_hpa: f64) -> Result<Self, OutOfRange> {
        /// One millimetre of mercury in hPa (conventional: 13.5951 times standard gravity).
        const HPA_PER_MM_HG: f64 = 1.333_223_874;
        Ok(DispersingAir {
            pressure_mm_hg: within(
                "pressure",
                pressure_hpa,
                (0.0, 1200.0),
                "hPa at the site itself",
            )? / HPA_PER_MM_HG,
            temperature_c: within(
                "temperature",
                temperature_c,
                (-100.0, 60.0),
                "degrees Celsius",
            )?,
            vapour_mm_hg: within(
                "vapour pressure",
                vapour_hpa,
                (0.0, 100.0),
                "hPa (10 is usual)",
            )? / HPA_PER_MM_HG,
        })
    }

    /// Refractive index less one: Edlen 1953 (*J. Opt. Soc. Am.* 43, 339) with pressure, temperature and vapour as in
    /// Filippenko 1982 (*Publ. Astron. Soc. Pacific* 94, 715), equations 1 to 3.
    fn refractivity(&self, wavelength_nm: f64) -> Result<f64, OutOfRange> {
        let micrometres = 1e6 * metres_of_light(wavelength_nm)?;
        let s = 1.0 / (micrometres * micrometres);
        let (p, t, f) = (self.pressure_mm_hg, self.temperature_c, self.vapour_mm_hg);
        let standard = 64.328 + 29_498.1 / (146.0 - s) + 255.4 / (41.0 - s);
        let expansion = 1.0 + 0.003_661 * t;
        let dry = standard * p * (1.0 + (1.049 - 0.0157 * t) * 1e-6 * p) / (720.883 * expansion);
        Ok(1e-6 * (dry - f * (0.0624 - 0.000_680 * s) / expansion))
    }

    /// How much higher light of the first wavelength arrives than light of the second: (n1 - n2) tan z. For flat
    /// layers of air, so not near the horizon.
    ///
    /// # Errors
    /// A wavelength outside 300 to 1100 nm, an altitude outside 5 to 90 degrees.
    pub fn dispersion(
        &self,
        first_nm: f64,
        second_nm: f64,
        apparent_altitude: Angle,
    ) -> Result<Angle, OutOfRange> {
        let altitude_deg = within(
            "altitude",
            apparent_altitude.degrees(),
            (5.0, 90.0),
            "degrees (nearer to the horizon the formula does not hold)",
        )?;
        let bend = self.refractivity(first_nm)? - self.refractivity(second_nm)?;
        Ok(Angle::from_radians(
            bend * Angle::from_degrees(90.0 - altitude_deg).tan(),
        ))
    }
}

/// Seeing at an airmass from that at the zenith: times airmass to the power 0.6, as Kolmogorov's turbulence has it (Fried 1966,
/// *J. Opt. Soc. Am.* 56, 1372; from memory).
///
/// # Errors
/// An airmass outside 1 to 40.
pub fn seeing_at(zenith_seeing: Angle, airmass: f64) -> Result<Angle, OutOfRange> {
    let airmass = within(
        "airmass",
        airmass,
        (1.0, 40.0),
        "(1 at the zenith, 38 at the horizon)",
    )?;
    Ok(zenith_seeing * libm::pow(airmass, 0.6))
}
