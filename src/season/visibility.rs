//! Whether a body can be seen: how bright the sky is beside it, what the air takes, and the faintest that shows.
//!
//! Sky brightness and limiting magnitude after the printed listing of Schaefer 1998 (*Sky & Telescope*, May, p. 57; the
//! physics in 1993, *Vistas in Astronomy* 36, 311) in the V band: night glow with the solar cycle, twilight, daylight and
//! moonlight, seen through gas, aerosol, ozone and water; thresholds of the eye by Hecht's fit (1947) to Knoll, Tousey and
//! Hulburt 1946. Brightness is in nanolamberts (1 nL = 3.18e-6 cd/m^2), magnitudes are V, altitudes apparent unless named.
//! Twilight models differ by 0.4 magnitudes, eyes by a whole one, and air by more: first and last sightings are therefore
//! given for clear, usual and hazy air, never as one date.

use std::convert::Infallible;
use std::f64::consts::TAU;

use super::search::minimum;
use super::site_tracks::{LocalSky, NightSpan, SiteTracks, Which};
use super::types::Span;
use crate::sky::light::{Geometry, MarsTerms, magnitude};
use crate::sky::refraction::apparent_from_true;
use crate::sky::{Angle, Body, Site, Skyline, Tdb, Tt, Vec3};

/// What the air takes at the zenith, magnitudes in V, by constituent (each has its own airmass).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extinction {
    /// Scattering by the gas.
    pub gas: f64,
    /// Dust, smoke and haze.
    pub aerosol: f64,
    pub ozone: f64,
    /// Water vapour.
    pub water: f64,
}

/// What extinction depends on, beside the site.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Weather {
    /// Relative humidity, 0 to 1.
    pub humidity: f64,
    pub temperature_c: f64,
    /// 1 to 12.
    pub month: u8,
}

impl Extinction {
    /// By the listing, for a height above the sea in metres; northern latitudes positive.
    #[must_use]
    pub fn of_place(elevation_m: f64, latitude: Angle, weather: Weather) -> Self {
        let humidity = weather.humidity.clamp(0.01, 0.99);
        let season = Angle::from_degrees(30.0 * (f64::from(weather.month.clamp(1, 12)) - 3.0));
        let (sin_season, cos_season) = season.sin_cos();
        let sign = if latitude < Angle::ZERO { -1.0 } else { 1.0 };
        let scale = |height_m: f64| libm::exp(-elevation_m.max(-500.0) / height_m);
        let swelling = libm::pow(1.0 - 0.32 / libm::log(humidity), 1.33);
        let ozone_latitude = latitude.radians() * cos_season - (latitude * 3.0).cos();
        Extinction {
            gas: 0.1066 * scale(8200.0),
            aerosol: 0.1 * scale(1500.0) * swelling * (1.0 + 0.33 * sign * sin_season),
            ozone: 0.031 * (3.0 + 0.4 * ozone_latitude) / 3.0,
            water: 0.031
                * 0.94
                * humidity
                * libm::exp(weather.temperature_c / 15.0)
                * scale(8200.0),
        }
    }

    /// Of a site whose whole extinction has been measured: gas, ozone and water by the listing (humidity 40 %, the
    /// listing's own), and the aerosol what remains; nothing is left below zero.
    #[must_use]
    pub fn of_site(site: &Site, month: u8) -> Self {
        let weather = Weather {
            humidity: 0.4,
            temperature_c: site.air.temperature_c,
            month,
        };
        let listed = Extinction::of_place(site.elevation_m, site.latitude, weather);
        let clean = listed.total() - listed.aerosol;
        let measured = site.extinction_mag.max(0.0);
        if measured > clean {
            Extinction {
                aerosol: measured - clean,
                ..listed
            }
        } else {
            let share = measured / clean;
            Extinction {
                gas: listed.gas * share,
                aerosol: 0.0,
                ozone: listed.ozone * share,
                water: listed.water * share,
            }
        }
    }

    /// With more or less haze: half, once or twice the aerosol, and never less than 0.02 mag of it when hazy (our choice).
    #[must_use]
    pub fn through(self, haze: Haze) -> Self {
        let aerosol = match haze {
            Haze::Clear => 0.5 * self.aerosol,
            Haze::Usual => self.aerosol,
            Haze::Hazy => (2.0 * self.aerosol).max(0.02),
        };
        Extinction { aerosol, ..self }
    }

    /// Magnitudes at the zenith.
    #[must_use]
    pub fn total(self) -> f64 {
        self.gas + self.aerosol + self.ozone + self.water
    }

    /// Magnitudes lost along a line of sight at an apparent altitude; below the horizon as at it.
    #[must_use]
    pub fn loss(self, altitude: Angle) -> f64 {
        let altitude = altitude.degrees().clamp(0.0, 90.0);
        let (sin_z, c) = Angle::from_degrees(90.0 - altitude).sin_cos();
        let gas = 1.0 / (c + 0.0286 * libm::exp(-10.5 * c));
        let aerosol = 1.0 / (c + 0.0123 * libm::exp(-24.5 * c));
        // A layer 20 km up.
        let over = sin_z / (1.0 + 20.0 / 6378.0);
        let ozone = 1.0 / (1.0 - over * over).sqrt();
        (self.gas + self.water) * gas + self.aerosol * aerosol + self.ozone * ozone
    }
}

/// How clear the air is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Haze {
    Clear,
    Usual,
    Hazy,
}

impl Haze {
    pub const ALL: [Haze; 3] = [Haze::Clear, Haze::Usual, Haze::Hazy];
}

/// The Moon as a lamp.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Moonlight {
    /// Apparent altitude.
    pub altitude: Angle,
    /// From the line of sight.
    pub separation: Angle,
    /// V, outside the air.
    pub magnitude: f64,
}

/// A line of sight and the lamps around it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sight {
    /// Apparent altitude of the line of sight.
    pub altitude: Angle,
    /// True altitude of the Sun's centre.
    pub sun_altitude: Angle,
    /// From the Sun.
    pub sun_separation: Angle,
    /// `None`: left out.
    pub moon: Option<Moonlight>,
    /// For the solar cycle of 11 years, in which the night sky is brightest about 1992, 2003, 2014.
    pub year: f64,
    /// Light of the place: brightness at the zenith that lamps add, nL; grows towards the horizon as the night glow does.
    pub skyglow_nl: f64,
}

/// The listing's constants for V.
const SUN_MAGNITUDE: f64 = -26.74;
const ZERO_POINT: f64 = -11.05;
/// From its erg units to nL.
const NL: f64 = 1.0 / 1.11e-15;

/// Airmass of Rozenberg 1966, 40 at the horizon and below.
fn airmass(altitude: Angle) -> f64 {
    if altitude <= Angle::ZERO {
        return 40.0;
    }
    let c = altitude.sin();
    1.0 / (c + 0.025 * libm::exp(-11.0 * c))
}

fn power_of_ten(exponent: f64) -> f64 {
    libm::pow(10.0, exponent)
}

/// Scattering of a lamp's light by angle.
fn scattering(separation: Angle) -> f64 {
    // Within half a degree one looks into the lamp itself.
    let degrees = separation.degrees().max(0.5);
    let cos = separation.cos();
    6.2e7 / (degrees * degrees)
        + power_of_ten(6.15 - degrees / 40.0)
        + power_of_ten(5.36) * (1.06 + cos * cos)
}

/// Light of a lamp high enough to shine, scattered into the line of sight; nL.
fn scattered_nl(
    magnitude: f64,
    lamp_altitude: Angle,
    separation: Angle,
    k: f64,
    through: f64,
) -> f64 {
    let left = power_of_ten(-0.4 * k * airmass(lamp_altitude));
    power_of_ten(-0.4 * (magnitude - ZERO_POINT + 43.27))
        * (1.0 - through)
        * (scattering(separation) * left + 440_000.0 * (1.0 - left))
        * NL
}

/// Brightness of the sky on a line of sight, nL.
#[must_use]
pub fn sky_brightness_nl(sight: &Sight, extinction: &Extinction) -> f64 {
    let k = extinction.total();
    let through = power_of_ten(-0.4 * k * airmass(sight.altitude));
    let zenith_distance = 90.0 - sight.altitude.degrees().clamp(0.0, 90.0);
    let sin_z = Angle::from_degrees(zenith_distance).sin();
    let glow = 0.4 + 0.6 / (1.0 - 0.96 * sin_z * sin_z).sqrt();
    let cycle = 1.0 + 0.3 * libm::cos(TAU * (sight.year - 1992.0) / 11.0);
    let night = (1e-13 * NL * cycle + sight.skyglow_nl.max(0.0)) * glow * through;

    let sun_altitude_deg = sight.sun_altitude.degrees();
    let separation_deg = sight.sun_separation.degrees().max(0.5);
    let twilight_exponent = SUN_MAGNITUDE - ZERO_POINT + 32.5
        - sun_altitude_deg
        - zenith_distance / (360.0 * k.max(0.01));
    let twilight =
        power_of_ten(-0.4 * twilight_exponent) * (100.0 / separation_deg) * (1.0 - through) * NL;
    let day = scattered_nl(
        SUN_MAGNITUDE,
        sight.sun_altitude,
        sight.sun_separation,
        k,
        through,
    );
    let moon = match sight.moon {
        Some(moon) if moon.altitude > Angle::ZERO => {
            scattered_nl(moon.magnitude, moon.altitude, moon.separation, k, through)
        }
        _ => 0.0,
    };
    night + twilight.min(day) + moon
}

/// Surface brightness in V magnitudes per square arcsecond (Krisciunas and Schaefer 1991, *PASP* 103, 1033).
#[must_use]
pub fn magnitudes_per_square_arcsec(nl: f64) -> f64 {
    (20.7233 - libm::log(nl.max(1e-6) / 34.08)) / 0.92104
}

/// The reverse: nL of a surface brightness.
#[must_use]
pub fn nl_of_magnitudes_per_square_arcsec(magnitudes: f64) -> f64 {
    34.08 * libm::exp(20.7233 - 0.92104 * magnitudes)
}

/// What one looks through.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Aid {
    NakedEye,
    /// Both barrels count as one.
    Binoculars {
        aperture_mm: f64,
        magnification: f64,
    },
}

impl Aid {
    /// The usual pair, 10 times 50.
    pub const BINOCULARS: Aid = Aid::Binoculars {
        aperture_mm: 50.0,
        magnification: 10.0,
    };
}

/// Share of the light that coated lenses and prisms pass (common practice, no source).
const TRANSMISSION: f64 = 0.8;

/// Diameter of the pupil, mm, in a field of this brightness: Moon and Spencer 1944, *J. Opt. Soc. Am.* 34, 319 (from memory).
fn pupil_mm(nl: f64) -> f64 {
    let candelas = nl.max(1e-6) * 3.183e-6;
    4.9 - 3.0 * libm::tanh(0.4 * libm::log10(candelas))
}

/// Threshold of the eye for a point on a ground of this brightness, footcandles.
fn threshold(nl: f64) -> f64 {
    let (scale, slope) = if nl <= 1500.0 {
        (power_of_ten(-9.8), power_of_ten(-1.9))
    } else {
        (power_of_ten(-8.35), power_of_ten(-5.9))
    };
    let root = 1.0 + (slope * nl.max(0.0)).sqrt();
    scale * root * root
}

/// The faintest star, by its magnitude outside the air, that shows on a line of sight with this brightness and loss (mag).
///
/// `acuity` is Snellen's: 1 for the usual eye, 2 for a keen one. Binoculars gather light by the area of the aperture over
/// that of the pupil and darken the ground where their exit pupil is narrower than the eye's (after Schaefer 1990, *PASP*
/// 102, 212, in its main terms).
#[must_use]
pub fn limiting_magnitude(nl: f64, loss: f64, acuity: f64, aid: Aid) -> f64 {
    let (ground, gain) = match aid {
        Aid::NakedEye => (nl, 1.0),
        Aid::Binoculars {
            aperture_mm,
            magnification,
        } => {
            let pupil = pupil_mm(nl);
            let exit = aperture_mm.max(1.0) / magnification.max(1.0);
            // Light outside the pupil is lost.
            let used = (exit / pupil).min(1.0);
            let ground = nl * TRANSMISSION * used * used;
            let magnified = used * magnification.max(1.0);
            (ground, TRANSMISSION * magnified * magnified)
        }
    };
    -16.57 - 2.5 * libm::log10(threshold(ground)) - loss
        + 5.0 * libm::log10(acuity.max(0.1))
        + 2.5 * libm::log10(gain)
}

/// An eye at a site, and the air and lamps it looks through.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Viewer {
    pub extinction: Extinction,
    /// Snellen's: 1 for the usual eye.
    pub acuity: f64,
    /// Light of the place at the zenith, nL.
    pub skyglow_nl: f64,
    /// Whether moonlight counts; first and last sightings leave it out.
    pub with_moon: bool,
}

impl Viewer {
    /// The usual eye in the site's usual air in this month (1 to 12), no lamps.
    #[must_use]
    pub fn at(site: &Site, month: u8) -> Self {
        Viewer {
            extinction: Extinction::of_site(site, month),
            acuity: 1.0,
            skyglow_nl: 0.0,
            with_moon: true,
        }
    }

    /// With the zenith as bright as measured on a moonless night, in V magnitudes per square arcsecond: what exceeds the
    /// natural 22.0 (from memory) is lamps.
    #[must_use]
    pub fn under_zenith_of(self, magnitudes_per_square_arcsec: f64) -> Self {
        let natural = nl_of_magnitudes_per_square_arcsec(22.0);
        let measured = nl_of_magnitudes_per_square_arcsec(magnitudes_per_square_arcsec);
        Viewer {
            skyglow_nl: (measured - natural).max(0.0),
            ..self
        }
    }

    #[must_use]
    pub fn through(self, haze: Haze) -> Self {
        Viewer {
            extinction: self.extinction.through(haze),
            ..self
        }
    }

    /// How many magnitudes the subject is brighter than the faintest thing that shows where it stands; negative where it
    /// does not show. `None` below the horizon.
    #[must_use]
    pub fn margin(&self, site: &Site, local: &LocalSky, aid: Aid) -> Option<f64> {
        let altitude = apparent_from_true(local.subject.altitude(), &site.air);
        if altitude < Angle::ZERO {
            return None;
        }
        let moon = (self.with_moon).then(|| Moonlight {
            altitude: apparent_from_true(local.moon.altitude(), &site.air),
            separation: local.subject.separation(&local.moon),
            magnitude: moon_magnitude(local),
        });
        let sight = Sight {
            altitude,
            sun_altitude: local.sun.altitude(),
            sun_separation: local.subject.separation(&local.sun),
            moon,
            year: 2000.0 + local.instant.days() / 365.25,
            skyglow_nl: self.skyglow_nl,
        };
        let nl = sky_brightness_nl(&sight, &self.extinction);
        let loss = self.extinction.loss(altitude);
        Some(limiting_magnitude(nl, loss, self.acuity, aid) - local.magnitude)
    }

    /// When within a span the subject stands out most to the bare eye, and its margin then: looked for every five minutes, then
    /// narrowed to some seconds. `None` where it is below the horizon throughout or the span lies outside the tracks.
    #[must_use]
    pub fn best_within(&self, tracks: &SiteTracks, span: Span) -> Option<(Tt, f64)> {
        const STEPS_PER_DAY: f64 = 288.0;
        const NARROW_DAYS: f64 = 1e-4;
        let missing = |days: f64| {
            tracks
                .at(Tt::from_days(days))
                .and_then(|local| self.margin(tracks.site(), &local, Aid::NakedEye))
                .map_or(f64::MAX, |margin| -margin)
        };
        let steps = (span.days() * STEPS_PER_DAY).ceil().max(1.0);
        let step = span.days() / steps;
        let (from, to) = (span.from.days(), span.to.days());
        let (at, least) = (0..=steps as usize)
            .map(|k| from + k as f64 * step)
            .map(|days| (days, missing(days)))
            .reduce(|a, b| if b.1 < a.1 { b } else { a })?;
        if least == f64::MAX {
            return None;
        }
        let (low, high) = ((at - step).max(from), (at + step).min(to));
        let Ok((at, least)) = minimum(low, (at, least), high, NARROW_DAYS, |days| {
            Ok::<_, Infallible>(missing(days))
        });
        Some((Tt::from_days(at), -least))
    }

    /// The least arc of vision (the Sun straight below) at which a point of this magnitude shows, and the altitude of the
    /// body at which it first does; `None` if 30 degrees are not enough.
    #[must_use]
    pub fn arc_of_vision(&self, magnitude: f64) -> Option<ArcOfVision> {
        let shows = |arc_deg: f64| {
            (1..=60).find_map(|half_degrees| {
                let altitude_deg = 0.5 * f64::from(half_degrees);
                let sun_altitude = Angle::from_degrees(altitude_deg - arc_deg);
                let visible = sun_altitude < SUN_GONE
                    && self.shows(
                        magnitude,
                        Angle::from_degrees(altitude_deg),
                        sun_altitude,
                        Angle::from_degrees(arc_deg),
                    );
                visible.then_some((altitude_deg, sun_altitude))
            })
        };
        (10..=300).find_map(|tenths| {
            let arc_deg = 0.1 * f64::from(tenths);
            shows(arc_deg).map(|(altitude_deg, sun_altitude)| ArcOfVision {
                arc: Angle::from_degrees(arc_deg),
                altitude: Angle::from_degrees(altitude_deg),
                sun_altitude,
            })
        })
    }

    /// Whether a point shows to the bare eye, without Moon, in the year's mean of the solar cycle.
    pub(super) fn shows(
        &self,
        magnitude: f64,
        altitude: Angle,
        sun_altitude: Angle,
        sun_separation: Angle,
    ) -> bool {
        let sight = Sight {
            altitude,
            sun_altitude,
            sun_separation,
            moon: None,
            // A quarter of the cycle from its crest.
            year: 1992.0 + 2.75,
            skyglow_nl: self.skyglow_nl,
        };
        let nl = sky_brightness_nl(&sight, &self.extinction);
        let loss = self.extinction.loss(altitude);
        limiting_magnitude(nl, loss, self.acuity, Aid::NakedEye) >= magnitude
    }
}

/// The Sun counts as gone below this true altitude of its centre.
const SUN_GONE: Angle = Angle::from_degrees(-50.0 / 60.0);

/// The vertical arc between a body and the Sun at which it first shows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ArcOfVision {
    pub arc: Angle,
    /// Of the body, then.
    pub altitude: Angle,
    pub sun_altitude: Angle,
}

/// The Moon's V magnitude from what is kept of it.
fn moon_magnitude(local: &LocalSky) -> f64 {
    let phase = Angle::from_radians(libm::acos(
        (2.0 * local.moon_lit_fraction - 1.0).clamp(-1.0, 1.0),
    ));
    let (sin, cos) = phase.sin_cos();
    let geometry = Geometry {
        sun_to_body: Vec3::new(cos, sin, 0.0),
        observer_to_body: Vec3::new(local.moon.distance_au, 0.0, 0.0),
        emission: Tdb::from_tt(local.instant),
        body: Body::Moon,
    };
    magnitude(&geometry, MarsTerms::Omit).value
}

/// What happens to a body near the Sun.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum SightingKind {
    EveningFirst,
    EveningLast,
    MorningFirst,
    MorningLast,
}

impl SightingKind {
    /// In words for people.
    #[must_use]
    pub const fn words(self) -> &'static str {
        match self {
            SightingKind::EveningFirst => "first seen in the evening",
            SightingKind::EveningLast => "last seen in the evening",
            SightingKind::MorningFirst => "first seen in the morning",
            SightingKind::MorningLast => "last seen in the morning",
        }
    }
}

/// A first or last sighting: the moment at which the body shows best on that night, for each state of the air.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sighting {
    pub kind: SightingKind,
    pub clear: Tt,
    /// `None`: in such air it is not seen at all in this apparition.
    pub usual: Option<Tt>,
    pub hazy: Option<Tt>,
}

/// First and last sightings near the Sun with the bare eye over a skyline, by date of the clear-air one.
///
/// A night counts when the margin is positive at some time with the Sun gone; moonlight is left out, and gaps of up to three
/// nights in a run are taken for the skyline's. Runs that begin or end far from the Sun (beyond 60 degrees, as when an outer
/// planet rises too late for the evening) or at the ends of the tracks are no sightings. Sampled every 4 minutes.
#[must_use]
pub fn sightings(tracks: &SiteTracks, viewer: &Viewer, skyline: &Skyline) -> Vec<Sighting> {
    let shown: Vec<[Shown; 3]> = tracks
        .night_spans()
        .iter()
        .map(|&night| best_of_night(tracks, viewer, skyline, night))
        .collect();
    let mut found = Vec::new();
    for evening in [true, false] {
        let runs = |haze: usize| {
            runs_of(shown.iter().map(|night| {
                night.get(haze).and_then(|shown| {
                    if evening {
                        shown.evening
                    } else {
                        shown.morning
                    }
                })
            }))
        };
        let [clear, usual, hazy] = [runs(0), runs(1), runs(2)];
        for run in &clear {
            let within = |other: &[Run]| -> Vec<Run> {
                let inside = |r: &&Run| r.first <= run.last && run.first <= r.last;
                other.iter().filter(inside).copied().collect()
            };
            let (usual, hazy) = (within(&usual), within(&hazy));
            let (first, last) = if evening {
                (SightingKind::EveningFirst, SightingKind::EveningLast)
            } else {
                (SightingKind::MorningFirst, SightingKind::MorningLast)
            };
            if run.first > 0 && run.at_first.near_sun {
                found.push(Sighting {
                    kind: first,
                    clear: run.at_first.at,
                    usual: usual.first().map(|r| r.at_first.at),
                    hazy: hazy.first().map(|r| r.at_first.at),
                });
            }
            if run.last + 1 < shown.len() && run.at_last.near_sun {
                found.push(Sighting {
                    kind: last,
                    clear: run.at_last.at,
                    usual: usual.last().map(|r| r.at_last.at),
                    hazy: hazy.last().map(|r| r.at_last.at),
                });
            }
        }
    }
    found.sort_by(|a, b| a.clear.days().total_cmp(&b.clear.days()));
    found
}

/// When a body shows best in a half of a night in which it shows.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Seen {
    at: Tt,
    margin: f64,
    near_sun: bool,
}

#[derive(Clone, Copy, Debug, Default)]
struct Shown {
    evening: Option<Seen>,
    morning: Option<Seen>,
}

/// Nights in a row on which a body shows.
#[derive(Clone, Copy, Debug)]
struct Run {
    first: usize,
    last: usize,
    at_first: Seen,
    at_last: Seen,
}

fn runs_of(nights: impl Iterator<Item = Option<Seen>>) -> Vec<Run> {
    const LONGEST_GAP: usize = 3;
    let mut runs: Vec<Run> = Vec::new();
    for (k, seen) in nights.enumerate() {
        let Some(seen) = seen else { continue };
        match runs.last_mut() {
            Some(run) if k - run.last <= LONGEST_GAP + 1 => {
                run.last = k;
                run.at_last = seen;
            }
            _ => runs.push(Run {
                first: k,
                last: k,
                at_first: seen,
                at_last: seen,
            }),
        }
    }
    runs
}

/// The best moments of the evening and morning halves in each air, where the body shows.
fn best_of_night(
    tracks: &SiteTracks,
    viewer: &Viewer,
    skyline: &Skyline,
    night: NightSpan,
) -> [Shown; 3] {
    /// Deeper in the night it is no sighting near the Sun.
    const DARK: Angle = Angle::from_degrees(-20.0);
    const STEPS: usize = 360;
    let near = Angle::from_degrees(60.0);
    let site = tracks.site();
    let mut shown = [Shown::default(); 3];
    let airs = Haze::ALL.map(|haze| Viewer {
        with_moon: false,
        ..viewer.through(haze)
    });
    for k in 0..STEPS {
        let share = (k as f64 + 0.5) / STEPS as f64;
        let instant = night.span.from.plus_days(share * night.span.days());
        let sun = tracks.standing(Which::Sun, instant.days()).altitude();
        if sun >= SUN_GONE || sun < DARK {
            continue;
        }
        let Some(local) = tracks.at(instant) else {
            continue;
        };
        let altitude = apparent_from_true(local.subject.altitude(), &site.air);
        if altitude < skyline.altitude_at(local.subject.azimuth()) {
            continue;
        }
        // The Sun is west of the meridian in the evening.
        let evening = local.sun.direction.x < 0.0;
        for (shown, air) in shown.iter_mut().zip(&airs) {
            let margin = air.margin(site, &local, Aid::NakedEye);
            let Some(margin) = margin.filter(|&margin| margin >= 0.0) else {
                continue;
            };
            let half = if evening {
                &mut shown.evening
            } else {
                &mut shown.morning
            };
            if half.is_none_or(|seen| margin > seen.margin) {
                *half = Some(Seen {
                    at: instant,
                    margin,
                    near_sun: local.subject.separation(&local.sun) < near,
                });
            }
        }
    }
    shown
}
