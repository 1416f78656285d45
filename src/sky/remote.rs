//! Places of Sun, Moon and planets where DE440 does not reach: years -2000 to 3000.
//!
//! Positions in au and velocities in au a day, on the axes of the ICRS, relative to the barycentre of the Sun and the four
//! giant planets (the Moon relative to the Earth); time TDB. The inner planets would move that barycentre by 6e-6 au, all
//! places alike, and change aberration by 0.0002".
//!
//! - Planets and Earth-Moon barycentre: VSOP87A (Bretagnon and Francou 1988, Astron. Astrophys. 202:309), untruncated,
//!   turned from the dynamical ecliptic of J2000 to the FK5 axes by the matrix published with it; FK5 is taken as ICRS
//!   (0.02" apart).
//! - Sun: from the heliocentric places and the masses of the giant planets.
//! - Moon: the series of Meeus 1998, chapter 47, after Chapront-Touze and Chapront 1988 (`moon98` of SOFA), with its mean
//!   longitude brought to that of DE406.
//! - Nutation: IAU 1980 (Seidelmann 1982), which stays within 0.025" of the IAU 2006/2000A nutation over all these years,
//!   because its arguments carry their secular terms; the short series 2000B, whose arguments do not, is 0.9" off at -2000.
//!
//! A planet's series costs 0.03 to 0.2 ms, so Chebyshev pieces are fitted to it where they are first asked for, and kept. A kept
//! place costs about 0.2 microseconds. The fit adds at most 0.01" to the error of the series, which
//! [`RemoteEphemeris::accuracy`] states.

use std::sync::OnceLock;

use super::chebyshev;
use super::ephemeris::{State, Target};
use super::frames::Nutation;
use super::time::J2000_JD;
use super::{Angle, Body, Mat3, Tdb, Vec3};

/// States are given from here, JD 990 499.5: two months before the year -2000, for light time.
const FROM_DAYS: f64 = 990_499.5 - J2000_JD;
/// States are given to here, JD 2 817 214.5: two months after the year 3000.
const TO_DAYS: f64 = 2_817_214.5 - J2000_JD;

/// VSOP87's dynamical ecliptic and equinox J2000 to FK5 (the notes that come with the series).
const FK5_FROM_VSOP: Mat3 = Mat3::from_rows([
    [1.0, 0.000_000_440_360, -0.000_000_190_919],
    [-0.000_000_479_966, 0.917_482_137_087, -0.397_776_982_902],
    [0.0, 0.397_776_982_902, 0.917_482_137_087],
]);

/// What is added to the Moon's mean longitude, in arcseconds by powers of centuries from J2000: the least-squares fit to
/// DE406 (Standish 1998) over the years -2000 to 3000 of the series' longitudes
/// (assets/fit_moon_correction.py). It reaches 94" at -2000.
const MOON_CORRECTION_ARCSEC: [f64; 5] =
    [0.093_195, -0.315_36, -0.059_947, -1.973_6e-4, -8.990_6e-6];
/// The Moon's mean motion in arcseconds a day.
const MOON_ARCSEC_A_DAY: f64 = 1_732_559_343.0 / 36_525.0;

/// The Moon's mass over that of Earth and Moon (DE440), so the way from the Earth's centre to the barycentre of the two.
const MOON_SHARE: f64 = 1.0 / (1.0 + 81.300_568_22);

/// What pieces are fitted to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Series {
    /// Heliocentric.
    Planet(Planet),
    /// From the barycentre.
    Sun,
    /// From the Earth.
    Moon,
    /// x: nutation in longitude, y: in obliquity, radians.
    Nutation,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Planet {
    Mercury,
    Venus,
    EarthMoonBarycentre,
    Mars,
    Jupiter,
    Saturn,
    Uranus,
    Neptune,
}

impl Planet {
    const ALL: [Planet; 8] = [
        Planet::Mercury,
        Planet::Venus,
        Planet::EarthMoonBarycentre,
        Planet::Mars,
        Planet::Jupiter,
        Planet::Saturn,
        Planet::Uranus,
        Planet::Neptune,
    ];

    /// The planets that set the barycentre, with the mass of the Sun over theirs and their moons': DE440 (Park et al. 2021,
    /// AJ 161:105).
    const GIANTS: [(Planet, f64); 4] = [
        (Planet::Jupiter, 1_047.348_631),
        (Planet::Saturn, 3_497.901_801),
        (Planet::Uranus, 22_902.950_783),
        (Planet::Neptune, 19_412.259_776),
    ];

    /// Heliocentric position on FK5 axes, au, from the full series.
    fn sample(self, days: f64) -> Vec3 {
        use vsop87::vsop87a;
        let jd = days + J2000_JD;
        let place = match self {
            Planet::Mercury => vsop87a::mercury(jd),
            Planet::Venus => vsop87a::venus(jd),
            Planet::EarthMoonBarycentre => vsop87a::earth_moon(jd),
            Planet::Mars => vsop87a::mars(jd),
            Planet::Jupiter => vsop87a::jupiter(jd),
            Planet::Saturn => vsop87a::saturn(jd),
            Planet::Uranus => vsop87a::uranus(jd),
            Planet::Neptune => vsop87a::neptune(jd),
        };
        FK5_FROM_VSOP * Vec3::new(place.x, place.y, place.z)
    }
}

impl Series {
    const COUNT: usize = Planet::ALL.len() + 3;

    /// Its place among the caches.
    const fn index(self) -> usize {
        match self {
            Series::Planet(planet) => planet as usize,
            Series::Sun => Planet::ALL.len(),
            Series::Moon => Planet::ALL.len() + 1,
            Series::Nutation => Planet::ALL.len() + 2,
        }
    }

    /// Days in a piece and number of its coefficients.
    const fn piece(self) -> (f64, usize) {
        match self {
            Series::Planet(Planet::Mercury) => (44.0, 20),
            Series::Planet(Planet::Venus) => (112.0, 15),
            Series::Planet(Planet::EarthMoonBarycentre) => (128.0, 15),
            Series::Planet(Planet::Mars) => (256.0, 20),
            Series::Planet(Planet::Jupiter) => (256.0, 12),
            Series::Planet(Planet::Saturn) => (256.0, 12),
            Series::Planet(Planet::Uranus) => (256.0, 11),
            Series::Planet(Planet::Neptune) => (256.0, 11),
            Series::Sun => (256.0, 9),
            Series::Moon => (16.0, 18),
            Series::Nutation => (16.0, 11),
        }
    }
}

/// One piece: coefficients of Chebyshev polynomials, none before it is first asked for.
type Slot = OnceLock<Vec<[f64; 3]>>;

/// The analytic series with the pieces fitted so far; shared freely between threads.
#[derive(Debug, Default)]
pub struct RemoteEphemeris {
    /// By [`Series::index`]; a row of slots per series, none before the series is first asked for.
    pieces: [OnceLock<Box<[Slot]>>; Series::COUNT],
}

impl RemoteEphemeris {
    /// Without any piece yet.
    #[must_use]
    pub fn new() -> Self {
        RemoteEphemeris::default()
    }

    /// The first and last instant with states: two months beyond the years -2000 and 3000.
    #[must_use]
    pub const fn span(&self) -> (Tdb, Tdb) {
        (Tdb::from_days(FROM_DAYS), Tdb::from_days(TO_DAYS))
    }

    /// Position and velocity from the barycentre (the Moon's from the Earth's centre); `None` outside the span.
    #[must_use]
    pub fn state(&self, target: Target, tdb: Tdb) -> Option<State> {
        let planet = |planet| self.barycentric(planet, tdb);
        match target {
            Target::Sun => self.evaluate(Series::Sun, tdb),
            Target::Mercury => planet(Planet::Mercury),
            Target::Venus => planet(Planet::Venus),
            Target::EarthMoonBarycentre => planet(Planet::EarthMoonBarycentre),
            Target::Mars => planet(Planet::Mars),
            Target::Jupiter => planet(Planet::Jupiter),
            Target::Saturn => planet(Planet::Saturn),
            Target::Uranus => planet(Planet::Uranus),
            Target::Neptune => planet(Planet::Neptune),
            Target::MoonFromEarth => self.evaluate(Series::Moon, tdb),
        }
    }

    /// Position and velocity of the Earth's centre from the barycentre; `None` outside the span.
    #[must_use]
    pub fn earth(&self, tdb: Tdb) -> Option<State> {
        let barycentre = self.state(Target::EarthMoonBarycentre, tdb)?;
        let moon = self.state(Target::MoonFromEarth, tdb)?;
        Some(State {
            position: barycentre.position - moon.position * MOON_SHARE,
            velocity: barycentre.velocity - moon.velocity * MOON_SHARE,
        })
    }

    /// Position and velocity of the Moon's centre from the barycentre; `None` outside the span.
    #[must_use]
    pub fn moon(&self, tdb: Tdb) -> Option<State> {
        Some(self.earth(tdb)? + self.state(Target::MoonFromEarth, tdb)?)
    }

    /// Nutation of date, IAU 1980; `None` outside the span.
    #[must_use]
    pub fn nutation(&self, tdb: Tdb) -> Option<Nutation> {
        let State {
            position: value,
            velocity: rate,
        } = self.evaluate(Series::Nutation, tdb)?;
        Some(Nutation {
            longitude: Angle::from_radians(value.x),
            obliquity: Angle::from_radians(value.y),
            longitude_per_day: Angle::from_radians(rate.x),
            obliquity_per_day: Angle::from_radians(rate.y),
        })
    }

    /// How far the geocentric place of a body may be off near a date: the largest difference found from DE440 (1550 to
    /// 2650) and DE406 (Standish 1998, all other years) at 30 000 epochs, rounded up. The error of delta-T, which matters
    /// more for the Moon, is not part of it.
    #[must_use]
    pub fn accuracy(body: Body, tdb: Tdb) -> Angle {
        // Arcseconds before -1000, -1000 to 0, 0 to 1000, from 1000.
        let by_age = match body {
            Body::Sun => [2.0, 1.0, 0.5, 0.5],
            Body::Moon => [40.0, 30.0, 20.0, 20.0],
            Body::Mercury => [3.0, 2.0, 1.0, 1.0],
            Body::Venus => [8.0, 4.0, 2.0, 1.0],
            Body::Mars => [15.0, 10.0, 9.0, 15.0],
            Body::Jupiter => [60.0, 20.0, 2.0, 2.0],
            Body::Saturn => [110.0, 32.0, 6.0, 4.0],
            Body::Uranus => [75.0, 70.0, 60.0, 25.0],
            Body::Neptune => [105.0, 80.0, 55.0, 25.0],
        };
        let [oldest, older, old, recent] = by_age;
        let arcsec = match tdb.centuries() {
            t if t < -30.0 => oldest,
            t if t < -20.0 => older,
            t if t < -10.0 => old,
            _ => recent,
        };
        Angle::from_arcsec(arcsec)
    }

    fn barycentric(&self, planet: Planet, tdb: Tdb) -> Option<State> {
        let from_sun = self.evaluate(Series::Planet(planet), tdb)?;
        let sun = self.evaluate(Series::Sun, tdb)?;
        Some(from_sun + sun)
    }

    /// Value and rate per day from the piece, which is fitted if this is its first use.
    fn evaluate(&self, series: Series, tdb: Tdb) -> Option<State> {
        let days = tdb.days();
        if !(FROM_DAYS..=TO_DAYS).contains(&days) {
            return None;
        }
        let (piece_days, _) = series.piece();
        let position = (days - FROM_DAYS) / piece_days;
        let number = position.floor();
        let slots = self.pieces.get(series.index())?.get_or_init(|| {
            let count = ((TO_DAYS - FROM_DAYS) / piece_days).floor() as usize + 1;
            (0..count).map(|_| Slot::new()).collect()
        });
        let slot = slots.get(number as usize)?;
        let coefficients = slot.get_or_init(|| self.fit(series, FROM_DAYS + number * piece_days));
        let (value, slope) = chebyshev::evaluate(coefficients, 2.0 * (position - number) - 1.0);
        Some(State {
            position: vector(value),
            velocity: vector(slope) * (2.0 / piece_days),
        })
    }

    /// Fitted at the ends of the piece too, so that neighbours meet without a step, whatever short waves of the series they
    /// leave out between.
    fn fit(&self, series: Series, first_day: f64) -> Vec<[f64; 3]> {
        let (piece_days, count) = series.piece();
        let middle = first_day + piece_days / 2.0;
        let samples: Vec<[f64; 3]> = chebyshev::nodes(count - 1)
            .map(|x| {
                let Vec3 { x, y, z } = self.sample(series, middle + x * piece_days / 2.0);
                [x, y, z]
            })
            .collect();
        chebyshev::fit(&samples)
    }

    /// The value from the series itself.
    fn sample(&self, series: Series, days: f64) -> Vec3 {
        match series {
            Series::Planet(planet) => planet.sample(days),
            Series::Sun => self.sun(days),
            Series::Moon => moon(days),
            Series::Nutation => {
                let (longitude, obliquity) = sofars::pnp::nut80(J2000_JD, days);
                Vec3::new(longitude, obliquity, 0.0)
            }
        }
    }

    /// The Sun from the barycentre of Sun and giant planets.
    fn sun(&self, days: f64) -> Vec3 {
        let (mut moment, mut mass) = (Vec3::ZERO, 1.0);
        for (planet, sun_over_mass) in Planet::GIANTS {
            let share = 1.0 / sun_over_mass;
            // A piece of the Sun may end some days after the span does: there the series itself is asked.
            let place = self
                .evaluate(Series::Planet(planet), Tdb::from_days(days))
                .map_or_else(|| planet.sample(days), |state| state.position);
            moment += place * share;
            mass += share;
        }
        moment * (-1.0 / mass)
    }
}

fn vector([x, y, z]: [f64; 3]) -> Vec3 {
    Vec3::new(x, y, z)
}

/// The Moon from the Earth's centre, au.
fn moon(days: f64) -> Vec3 {
    let centuries = Tdb::from_days(days).centuries();
    let correction = MOON_CORRECTION_ARCSEC
        .iter()
        .rev()
        .fold(0.0, |sum, term| sum * centuries + term);
    // A shift in time moves all the arguments together, as an error in the Moon's mean longitude does in fact.
    let [position, _] = sofars::eph::moon98(J2000_JD, days + correction / MOON_ARCSEC_A_DAY);
    vector(position)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Least distance from the Earth, au: turns an error in au into an angle.
    fn least_distance(series: Series) -> f64 {
        match series {
            Series::Planet(Planet::Mercury) => 0.54,
            Series::Planet(Planet::Venus) => 0.26,
            Series::Planet(Planet::Mars) => 0.37,
            Series::Planet(Planet::Jupiter) => 3.9,
            Series::Planet(Planet::Saturn) => 7.9,
            Series::Planet(Planet::Uranus) => 17.2,
            Series::Planet(Planet::Neptune) => 28.7,
            Series::Planet(Planet::EarthMoonBarycentre) | Series::Sun => 0.26,
            Series::Moon => 0.002_3,
            // Already an angle.
            Series::Nutation => 1.0,
        }
    }

    /// Pieces against the series they are made from, at odd places in pieces spread over all years.
    #[test]
    fn pieces_meet_their_series_within_a_hundredth_of_an_arcsecond() {
        let ephemeris = RemoteEphemeris::new();
        let mut all = Planet::ALL.map(Series::Planet).to_vec();
        all.extend([Series::Sun, Series::Moon, Series::Nutation]);
        for series in all {
            let mut worst: f64 = 0.0;
            for step in 0..8 {
                let (piece_days, _) = series.piece();
                let near = FROM_DAYS + 221_000.0 * f64::from(step);
                let first = near - (near - FROM_DAYS).rem_euclid(piece_days);
                for place in [0.0, 0.001, 0.03, 0.21, 0.47, 0.74, 0.93, 0.98, 0.999] {
                    let days = first + piece_days * place;
                    let state = ephemeris.evaluate(series, Tdb::from_days(days)).unwrap();
                    let error = (state.position - ephemeris.sample(series, days)).norm();
                    worst = worst.max(error);
                }
            }
            let arcsec = Angle::from_radians(worst / least_distance(series)).arcsec();
            assert!(arcsec < 0.01, "{series:?}: {arcsec}\"");
        }
    }
}
