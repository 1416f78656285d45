//! Reference frames of date: precession, nutation, obliquity, sidereal time.
//!
//! - Precession with frame bias: IAU 2006 in the Fukushima-Williams angles (Hilton et al. 2006, Celest. Mech. Dyn.
//!   Astron. 94, 351; the polynomials as published by IAU SOFA, `pfw06`), good to milliarcseconds within six
//!   centuries of 2000.
//! - For remote epochs: the long-term precession of Vondrák, Capitaine and Wallace 2011 (A&A 534, A22) through the
//!   crate `sofars` (`ltpecl`, `ltpequ`), good to arcseconds over ten thousand years.
//! - Nutation is handed in (IAU 2000A with the adjustments to IAU 2006).
//! - Sidereal time: Earth rotation angle and the IAU 2006 polynomial (`gmst06`), with the equation of the equinoxes
//!   and the two greatest of its complementary terms (the rest stays under 0.00001").
//!
//! "Of date" means the true equator, equinox and ecliptic of date, nutation included.

use super::time::DAYS_PER_CENTURY;
use super::{Angle, Mat3, Tt, Ut1, Vec3};

/// The nodding of the Earth's axis at an instant, and how fast it changes.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Nutation {
    /// In longitude, the true equinox minus the mean one.
    pub longitude: Angle,
    /// In obliquity, true minus mean.
    pub obliquity: Angle,
    pub longitude_per_day: Angle,
    pub obliquity_per_day: Angle,
}

/// Which precession a frame is built from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Precession {
    /// IAU 2006.
    Iau2006,
    /// Vondrák, Capitaine and Wallace 2011.
    LongTerm,
}

/// The axes of one instant, with the rates at which they turn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ReferenceFrame {
    pub ecliptic_from_icrs: Mat3,
    pub equatorial_from_icrs: Mat3,
    /// The obliquity between the two, with nutation if the frame has it.
    pub obliquity: Angle,
    pub nutation: Nutation,
    /// Angular velocity of the ecliptic axes against ICRS, in their own components, radians a day.
    ecliptic_spin: Vec3,
    /// The same of the equatorial axes.
    equatorial_spin: Vec3,
}

fn polynomial(t: f64, coefficients: &[f64]) -> f64 {
    coefficients.iter().rev().fold(0.0, |sum, c| sum * t + c)
}

/// Coefficients in arcseconds and Julian centuries of TT: bias and precession, IAU 2006 (SOFA `pfw06`, `obl06`).
const GAMMA_BAR: [f64; 6] = [
    -0.052_928,
    10.556_378,
    0.493_204_4,
    -0.000_312_38,
    -0.000_002_788,
    0.000_000_026_0,
];
const PHI_BAR: [f64; 6] = [
    84_381.412_819,
    -46.811_016,
    0.051_126_8,
    0.000_532_89,
    -0.000_000_440,
    -0.000_000_017_6,
];
const PSI_BAR: [f64; 6] = [
    -0.041_775,
    5_038.481_484,
    1.558_417_5,
    -0.000_185_22,
    -0.000_026_452,
    -0.000_000_014_8,
];
const OBLIQUITY: [f64; 6] = [
    84_381.406,
    -46.836_769,
    -0.000_183_1,
    0.002_003_40,
    -0.000_000_576,
    -0.000_000_043_4,
];

/// Obliquity of J2000, radians, near which the obliquities of a few centuries stay, with its sine and cosine.
const J2000_OBLIQUITY: f64 = Angle::from_arcsec(84_381.406).radians();
const J2000_OBLIQUITY_SIN_COS: (f64, f64) = (0.397_776_969_112_605_96, 0.917_482_143_065_241_9);

/// Sine and cosine of an angle `off` radians from one whose sine and cosine are known. Exact to the last digits for
/// |off| below 0.01, at a tenth of the cost of a sine; the angles of ten centuries stay below 0.003.
fn sin_cos_near((sin, cos): (f64, f64), off: f64) -> (f64, f64) {
    let square = off * off;
    let sin_off = off * (1.0 - square / 6.0 * (1.0 - square / 20.0));
    let cos_off = 1.0 - square / 2.0 * (1.0 - square / 12.0 * (1.0 - square / 30.0));
    (sin * cos_off + cos * sin_off, cos * cos_off - sin * sin_off)
}

/// Mean obliquity of the ecliptic, IAU 2006; good to 0.01" within six centuries of 2000.
#[must_use]
pub fn mean_obliquity(tt: Tt) -> Angle {
    Angle::from_arcsec(polynomial(tt.centuries(), &OBLIQUITY))
}

impl ReferenceFrame {
    /// True equator, equinox and ecliptic of date.
    #[must_use]
    pub fn of_date(tt: Tt, nutation: Nutation, precession: Precession) -> Self {
        match precession {
            Precession::Iau2006 => Self::iau_2006(tt, nutation),
            Precession::LongTerm => Self::long_term(tt, nutation),
        }
    }

    /// Mean equator, equinox and ecliptic of date: what stands still when star charts are drawn.
    #[must_use]
    pub fn mean_of_date(tt: Tt, precession: Precession) -> Self {
        Self::of_date(tt, Nutation::default(), precession)
    }

    /// Mean equator, equinox and ecliptic of J2000.
    #[must_use]
    pub fn j2000() -> Self {
        Self::mean_of_date(Tt::from_days(0.0), Precession::Iau2006)
    }

    fn iau_2006(tt: Tt, nutation: Nutation) -> Self {
        let t = tt.centuries();
        let arcsec = |coefficients: &[f64]| Angle::from_arcsec(polynomial(t, coefficients));
        let gamma = arcsec(&GAMMA_BAR);
        let phi = arcsec(&PHI_BAR);
        let psi = arcsec(&PSI_BAR) + nutation.longitude;
        let obliquity = arcsec(&OBLIQUITY) + nutation.obliquity;

        // The three turns written out: about z by gamma, about x by phi, about z by -psi. Only psi is large.
        let (sin_gamma, cos_gamma) = sin_cos_near((0.0, 1.0), gamma.radians());
        let (sin_phi, cos_phi) =
            sin_cos_near(J2000_OBLIQUITY_SIN_COS, phi.radians() - J2000_OBLIQUITY);
        let (sin_psi, cos_psi) = psi.sin_cos();
        let first = Vec3::new(cos_gamma, sin_gamma, 0.0);
        let second = Vec3::new(-cos_phi * sin_gamma, cos_phi * cos_gamma, sin_phi);
        let pole = Vec3::new(sin_phi * sin_gamma, -sin_phi * cos_gamma, cos_phi);
        let ecliptic_from_icrs = Mat3 {
            rows: [
                first * cos_psi - second * sin_psi,
                first * sin_psi + second * cos_psi,
                pole,
            ],
        };

        // Rates of the slow angles: the linear terms are enough for 0.0001" a day.
        let per_day = |arcsec_per_century: f64| {
            Angle::from_arcsec(arcsec_per_century).radians() / DAYS_PER_CENTURY
        };
        let psi_rate =
            per_day(PSI_BAR[1] + 2.0 * PSI_BAR[2] * t) + nutation.longitude_per_day.radians();
        let phi_rate = per_day(PHI_BAR[1]);
        let gamma_rate = per_day(GAMMA_BAR[1]);
        // The x axis of the second turn and the z axis of the first, seen on the final axes.
        let node = Vec3::new(cos_psi, sin_psi, 0.0);
        let icrs_pole = Vec3::new(-sin_psi * sin_phi, cos_psi * sin_phi, cos_phi);
        let ecliptic_spin =
            Vec3::new(0.0, 0.0, -psi_rate) + node * phi_rate + icrs_pole * gamma_rate;
        let tilt = sin_cos_near(
            J2000_OBLIQUITY_SIN_COS,
            obliquity.radians() - J2000_OBLIQUITY,
        );
        Self::with_equator(
            ecliptic_from_icrs,
            (obliquity, tilt),
            nutation,
            ecliptic_spin,
        )
    }

    fn long_term(tt: Tt, nutation: Nutation) -> Self {
        let epoch = 2000.0 + tt.days() / 365.25;
        let vector = |[x, y, z]: [f64; 3]| Vec3::new(x, y, z);
        // Both poles on the mean axes of J2000; the bias of those axes against ICRS is below 0.03", far inside
        // the accuracy of the series places this is used with, but costs nothing to keep.
        let bias = Mat3::about_x(Angle::from_arcsec(0.006_819_2))
            * Mat3::about_y(Angle::from_arcsec(-0.016_617))
            * Mat3::about_z(Angle::from_arcsec(-0.014_6));
        let icrs_from_j2000 = bias.transposed();
        let ecliptic_pole = icrs_from_j2000 * vector(sofars::pnp::ltpecl(epoch));
        let equator_pole = icrs_from_j2000 * vector(sofars::pnp::ltpequ(epoch));
        let equinox = equator_pole.cross(ecliptic_pole).unit();
        let mean = Mat3 {
            rows: [equinox, ecliptic_pole.cross(equinox), ecliptic_pole],
        };
        let obliquity = equator_pole.separation(ecliptic_pole) + nutation.obliquity;
        let ecliptic_from_icrs = Mat3::about_z(-nutation.longitude) * mean;
        // General precession (Capitaine et al. 2003, A&A 412, 567): good to 0.002" a day.
        let precession = Angle::from_arcsec(5_028.796_195 + 2.210_869_6 * tt.centuries()).radians();
        let spin = precession / DAYS_PER_CENTURY + nutation.longitude_per_day.radians();
        Self::with_equator(
            ecliptic_from_icrs,
            (obliquity, obliquity.sin_cos()),
            nutation,
            Vec3::new(0.0, 0.0, -spin),
        )
    }

    fn with_equator(
        ecliptic_from_icrs: Mat3,
        (obliquity, (sin, cos)): (Angle, (f64, f64)),
        nutation: Nutation,
        ecliptic_spin: Vec3,
    ) -> Self {
        let [x, y, z] = ecliptic_from_icrs.rows;
        let tip = |v: Vec3| Vec3::new(v.x, cos * v.y - sin * v.z, sin * v.y + cos * v.z);
        let equatorial_from_icrs = Mat3 {
            rows: [x, y * cos - z * sin, y * sin + z * cos],
        };
        let mean_rate = Angle::from_arcsec(OBLIQUITY[1]).radians() / DAYS_PER_CENTURY;
        let obliquity_rate = mean_rate + nutation.obliquity_per_day.radians();
        let equatorial_spin = tip(ecliptic_spin) - Vec3::new(obliquity_rate, 0.0, 0.0);
        ReferenceFrame {
            ecliptic_from_icrs,
            equatorial_from_icrs,
            obliquity,
            nutation,
            ecliptic_spin,
            equatorial_spin,
        }
    }

    /// Ecliptic components of the rate of a vector fixed by `vector` and `rate` on ICRS axes, per day.
    #[must_use]
    pub fn ecliptic_rate(&self, vector: Vec3, rate: Vec3) -> Vec3 {
        self.ecliptic_from_icrs * rate - self.ecliptic_spin.cross(self.ecliptic_from_icrs * vector)
    }

    /// Equatorial components of the same.
    #[must_use]
    pub fn equatorial_rate(&self, vector: Vec3, rate: Vec3) -> Vec3 {
        self.equatorial_from_icrs * rate
            - self
                .equatorial_spin
                .cross(self.equatorial_from_icrs * vector)
    }
}

/// Earth rotation angle (IAU 2000), 0 to 360 degrees.
#[must_use]
pub fn earth_rotation_angle(ut1: Ut1) -> Angle {
    let days = ut1.days();
    // Whole turns are dropped before the small excess is added, so that no digit is lost.
    let turns = days.rem_euclid(1.0) + 0.779_057_273_264_0 + 0.002_737_811_911_354_48 * days;
    Angle::from_degrees(turns.rem_euclid(1.0) * 360.0)
}

/// Greenwich mean sidereal time, IAU 2006, 0 to 360 degrees.
#[must_use]
pub fn mean_sidereal_time(ut1: Ut1, tt: Tt) -> Angle {
    const GMST: [f64; 6] = [
        0.014_506,
        4_612.156_534,
        1.391_581_7,
        -0.000_000_44,
        -0.000_029_956,
        -0.000_000_036_8,
    ];
    (earth_rotation_angle(ut1) + Angle::from_arcsec(polynomial(tt.centuries(), &GMST))).wrapped()
}

/// Greenwich apparent sidereal time, 0 to 360 degrees.
#[must_use]
pub fn apparent_sidereal_time(ut1: Ut1, tt: Tt, frame: &ReferenceFrame) -> Angle {
    // Mean longitude of the Moon's ascending node, linear term (IERS Conventions 2003, eq. 5.43).
    let node = Angle::from_arcsec(450_160.398_036 - 6_962_890.543_1 * tt.centuries());
    let (sin, cos) = node.sin_cos();
    let complementary = Angle::from_arcsec(0.002_640_96 * sin + 0.000_063_52 * 2.0 * sin * cos);
    let mean_obliquity = frame.obliquity - frame.nutation.obliquity;
    let equation = frame.nutation.longitude * mean_obliquity.cos() + complementary;
    (mean_sidereal_time(ut1, tt) + equation).wrapped()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn assert_matrices_close(ours: Mat3, theirs: [[f64; 3]; 3], tolerance_arcsec: f64) {
        let theirs = Mat3::from_rows(theirs);
        for (a, b) in ours.rows.into_iter().zip(theirs.rows) {
            let off = a.separation(b).arcsec();
            assert!(
                off < tolerance_arcsec,
                "rows {a:?} and {b:?} are {off}\" apart"
            );
        }
    }

    /// Source: IAU SOFA algorithms as carried by the crate sofars 0.6 (`nut06a`, `pnm06a`).
    #[test]
    fn true_equator_agrees_with_sofa() {
        for jd in [
            2_287_200.25,
            2_378_496.5,
            2_446_896.0,
            2_451_545.0,
            2_461_345.5,
            2_542_000.75,
            2_688_900.1,
        ] {
            let tt = Tt::from_julian_date(jd);
            let (dpsi, deps) = sofars::pnp::nut06a(jd, 0.0);
            let nutation = Nutation {
                longitude: Angle::from_radians(dpsi),
                obliquity: Angle::from_radians(deps),
                ..Nutation::default()
            };
            let frame = ReferenceFrame::of_date(tt, nutation, Precession::Iau2006);
            assert_matrices_close(
                frame.equatorial_from_icrs,
                sofars::pnp::pnm06a(jd, 0.0),
                1e-6,
            );
        }
    }

    /// Source: IAU SOFA `ltpb`, `ltecm` as carried by sofars 0.6.
    #[test]
    fn long_term_frames_agree_with_sofa() {
        for epoch in [-1999.0, -746.0, 139.4, 1000.0, 2999.0] {
            let tt = Tt::from_days((epoch - 2000.0) * 365.25);
            let frame = ReferenceFrame::mean_of_date(tt, Precession::LongTerm);
            assert_matrices_close(frame.equatorial_from_icrs, sofars::pnp::ltpb(epoch), 1e-6);
            assert_matrices_close(frame.ecliptic_from_icrs, sofars::coords::ltecm(epoch), 1e-6);
        }
    }

    /// Source: IAU SOFA `gst06a` as carried by sofars 0.6.
    #[test]
    fn sidereal_time_agrees_with_sofa() {
        for jd in [
            2_415_020.3,
            2_446_895.5,
            2_451_545.0,
            2_461_345.7,
            2_488_000.1,
        ] {
            let tt = Tt::from_julian_date(jd).plus_seconds(69.184);
            let (dpsi, deps) = sofars::pnp::nut06a(jd, 69.184 / 86_400.0);
            let nutation = Nutation {
                longitude: Angle::from_radians(dpsi),
                obliquity: Angle::from_radians(deps),
                ..Nutation::default()
            };
            let frame = ReferenceFrame::of_date(tt, nutation, Precession::Iau2006);
            let ours = apparent_sidereal_time(Ut1::from_julian_date(jd), tt, &frame);
            let theirs = Angle::from_radians(sofars::erst::gst06a(jd, 0.0, jd, 69.184 / 86_400.0));
            let off = (ours - theirs).signed().arcsec();
            assert!(off.abs() < 1e-3, "{jd}: {off}\"");
        }
    }

    /// Meeus, Astronomical Algorithms, 2nd ed., example 12.a gives 13h10m46.3668s for the 1982 model; the IAU 2006
    /// model gives 13h10m46.3701s (pyerfa 2.0.1.5 `gmst06`).
    #[test]
    fn mean_sidereal_time_of_1987_april_10() {
        let ut1 = Ut1::from_julian_date(2_446_895.5);
        let hours = mean_sidereal_time(ut1, Tt::from_julian_date(2_446_895.5)).hours();
        let expected = 13.0 + 10.0 / 60.0 + 46.3701 / 3600.0;
        assert!((hours - expected).abs() * 3600.0 < 2e-4, "{hours}");
    }

    /// The rates are the derivative of the frames themselves.
    #[test]
    fn rates_agree_with_differences() {
        let v = Vec3::new(0.3, -0.5, 0.81).unit();
        for precession in [Precession::Iau2006, Precession::LongTerm] {
            let at = |days: f64| {
                let nutation = Nutation {
                    longitude: Angle::from_arcsec(3.0 + 0.1 * days),
                    obliquity: Angle::from_arcsec(-5.0 + 0.07 * days),
                    longitude_per_day: Angle::from_arcsec(0.1),
                    obliquity_per_day: Angle::from_arcsec(0.07),
                };
                ReferenceFrame::of_date(Tt::from_days(9_000.0 + days), nutation, precession)
            };
            let (before, here, after) = (at(-1.0), at(0.0), at(1.0));
            let ecliptic = (after.ecliptic_from_icrs * v - before.ecliptic_from_icrs * v) * 0.5;
            let equatorial =
                (after.equatorial_from_icrs * v - before.equatorial_from_icrs * v) * 0.5;
            let arcsec = |v: Vec3| Angle::from_radians(v.norm()).arcsec();
            assert!(arcsec(ecliptic - here.ecliptic_rate(v, Vec3::ZERO)) < 0.002);
            assert!(arcsec(equatorial - here.equatorial_rate(v, Vec3::ZERO)) < 0.002);
        }
    }
}
