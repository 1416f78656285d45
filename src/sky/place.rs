//! Places of bodies: geometric, astrometric, apparent, topocentric, horizontal.
//!
//! The chain, for an observer at an instant of TT:
//! 1. barycentric states from the ephemeris (ICRS axes, au, au/day of TDB);
//! 2. light time, solved on the body's own motion extrapolated backwards with the Sun's attraction: the error after
//!    light time is below 1e-10 au for every planet (Mercury's third-order term, the greatest, is 3e-12 au);
//! 3. deflection by the Sun's mass for a source at finite distance (Klioner 2003, AJ 125, 1580, as in IAU SOFA
//!    `ld`); within the Sun's disc the deflection shrinks linearly to nothing at its centre, since light that would
//!    pass through the Sun reaches nobody and the bare formula diverges there. Other planets' masses bend light by
//!    at most 0.02" and are left out;
//! 4. annual and diurnal aberration (IAU SOFA `ab`, without its potential term of 0.0004");
//! 5. the axes of date from [`super::frames`].
//!
//! Accuracy within 1550-2650 against DE440 and IAU routines: 0.01" for planets, 0.1" for the Moon (the tests hold
//! tighter sums). Outside, places come from analytic series and carry [`Caution::SeriesPlace`].

use std::sync::Arc;

use super::delta_t::TimeTables;
use super::ephemeris::{Ephemeris, EphemerisError, State, Target};
use super::frames::{self, Nutation, Precession, ReferenceFrame};
use super::light::Geometry;
use super::remote::RemoteEphemeris;
use super::{Angle, Body, Caution, Cautions, Mat3, Site, Tdb, Tt, Ut1, Vec3};

/// Speed of light, au a day (IAU 2012 resolution B2 and the defined speed in m/s).
pub const LIGHT_AU_PER_DAY: f64 = 299_792_458.0 * 86_400.0 / AU_M;
/// The astronomical unit in metres (IAU 2012 resolution B2).
pub const AU_M: f64 = 149_597_870_700.0;
/// The astronomical unit in km.
pub const AU_KM: f64 = AU_M / 1000.0;
/// Solar gravitation, au^3/day^2 (the Gaussian constant squared; DE440 differs in the eleventh digit).
const GM_SUN: f64 = 0.017_202_098_95 * 0.017_202_098_95;
/// Ratio of the Sun's mass to the Earth's (IAU 2009 system of constants).
const SUN_EARTH_RATIO: f64 = 332_946.048_7;
/// Ratio of the Earth's mass to the Moon's, DE440 (Park et al. 2021, AJ 161, 105).
const EARTH_MOON_RATIO: f64 = 81.300_568_221_497_22;
/// Schwarzschild radius of the Sun, au: 2 GM / c^2.
const SCHWARZSCHILD_AU: f64 = 2.0 * GM_SUN / (LIGHT_AU_PER_DAY * LIGHT_AU_PER_DAY);
/// Turning rate of the Earth, radians a day of UT1 (IERS Conventions 2010, table 1.2).
const EARTH_SPIN_PER_DAY: f64 = std::f64::consts::TAU * 1.002_737_811_911_354_6;

/// What can go wrong when a place is asked for.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum SkyError {
    #[error(
        "JD {jd:.1} TT lies outside the years -2000 to 3000 for which places can be computed; choose a date within them"
    )]
    OutsideAllSpans { jd: f64 },
    #[error(
        "JD {jd:.1} TT lies outside the span of the tables in use ({source_name}); ask for a sky that covers it"
    )]
    OutsideSource { jd: f64, source_name: &'static str },
    #[error(transparent)]
    Ephemeris(#[from] EphemerisError),
}

/// Where states come from.
#[derive(Clone)]
enum Source {
    De440(&'static Ephemeris),
    Series(Arc<RemoteEphemeris>),
}

/// The position engine over a span of time: one source of states for all of it, so that no seam falls inside.
#[derive(Clone)]
pub struct Sky {
    source: Source,
    tables: &'static TimeTables,
}

/// Margin around a span that searches and light time may touch, days.
const SPAN_MARGIN_DAYS: f64 = 500.0;

impl Sky {
    /// DE440 where it covers the whole span with a margin of 500 days, else the analytic series.
    ///
    /// # Errors
    /// A span outside the years -2000 to 3000; a damaged embedded table.
    pub fn for_span(from: Tt, to: Tt) -> Result<Sky, SkyError> {
        let tables = TimeTables::embedded();
        let inside = |span: (Tdb, Tdb), margin: f64| {
            span.0.days() + margin <= from.days() && to.days() <= span.1.days() - margin
        };
        let ephemeris = Ephemeris::embedded()?;
        if inside(ephemeris.span(), SPAN_MARGIN_DAYS) {
            return Ok(Sky {
                source: Source::De440(ephemeris),
                tables,
            });
        }
        let series = RemoteEphemeris::new();
        if inside(series.span(), 0.0) {
            return Ok(Sky {
                source: Source::Series(Arc::new(series)),
                tables,
            });
        }
        let jd = if inside((series.span().0, Tdb::from_days(f64::MAX)), 0.0) {
            to
        } else {
            from
        }
        .julian_date();
        Err(SkyError::OutsideAllSpans { jd })
    }

    /// DE440 over all of its span, for instants known to lie within it.
    ///
    /// # Errors
    /// A damaged embedded table.
    pub fn de440() -> Result<Sky, SkyError> {
        Ok(Sky {
            source: Source::De440(Ephemeris::embedded()?),
            tables: TimeTables::embedded(),
        })
    }

    /// The tables that join the time scales.
    #[must_use]
    pub fn tables(&self) -> &'static TimeTables {
        self.tables
    }

    /// What holds for every place of this sky.
    #[must_use]
    pub fn cautions(&self) -> Cautions {
        match self.source {
            Source::De440(_) => Cautions::NONE,
            Source::Series(_) => Cautions::of(Caution::SeriesPlace),
        }
    }

    /// The precession that goes with the source.
    #[must_use]
    pub fn precession(&self) -> Precession {
        match self.source {
            Source::De440(_) => Precession::Iau2006,
            Source::Series(_) => Precession::LongTerm,
        }
    }

    /// The span of the source, TDB.
    #[must_use]
    pub fn span(&self) -> (Tdb, Tdb) {
        match &self.source {
            Source::De440(ephemeris) => ephemeris.span(),
            Source::Series(series) => series.span(),
        }
    }

    /// Whether an instant lies within the source.
    #[must_use]
    pub fn covers(&self, instant: Tt) -> bool {
        let (from, to) = self.span();
        let tdb = Tdb::from_tt(instant);
        from <= tdb && tdb < to
    }

    fn outside(&self, instant: Tdb) -> SkyError {
        let source_name = match self.source {
            Source::De440(_) => "DE440, 1550 to 2650",
            Source::Series(_) => "analytic series, -2000 to 3000",
        };
        SkyError::OutsideSource {
            jd: instant.julian_date(),
            source_name,
        }
    }

    /// Barycentric state on ICRS axes (the Moon's from the Earth's centre).
    ///
    /// # Errors
    /// An instant outside the source.
    pub fn state(&self, target: Target, instant: Tdb) -> Result<State, SkyError> {
        match &self.source {
            Source::De440(ephemeris) => ephemeris.state(target, instant),
            Source::Series(series) => series.state(target, instant),
        }
        .ok_or_else(|| self.outside(instant))
    }

    fn nutation(&self, instant: Tdb) -> Result<Nutation, SkyError> {
        match &self.source {
            Source::De440(ephemeris) => ephemeris.nutation(instant),
            Source::Series(series) => series.nutation(instant),
        }
        .ok_or_else(|| self.outside(instant))
    }

    /// The axes of date.
    ///
    /// # Errors
    /// An instant outside the source.
    pub fn frame_of_date(&self, instant: Tt) -> Result<ReferenceFrame, SkyError> {
        let nutation = self.nutation(Tdb::from_tt(instant))?;
        Ok(ReferenceFrame::of_date(
            instant,
            nutation,
            self.precession(),
        ))
    }

    /// The view from the Earth's centre.
    ///
    /// # Errors
    /// An instant outside the source.
    pub fn geocentre(&self, instant: Tt) -> Result<Vantage<'_>, SkyError> {
        let tdb = Tdb::from_tt(instant);
        let frame = self.frame_of_date(instant)?;
        let sun = self.state(Target::Sun, tdb)?;
        let barycentre = self.state(Target::EarthMoonBarycentre, tdb)?;
        let moon = self.state(Target::MoonFromEarth, tdb)?;
        let moon_share = -1.0 / (1.0 + EARTH_MOON_RATIO);
        let earth = State {
            position: barycentre.position + moon.position * moon_share,
            velocity: barycentre.velocity + moon.velocity * moon_share,
        };
        Ok(Vantage {
            sky: self,
            instant,
            tdb,
            frame,
            sun,
            moon,
            earth,
            observer: earth,
            spin_acceleration: Vec3::ZERO,
            horizon: None,
        })
    }

    /// The view from a site, UT1 from the tables.
    ///
    /// # Errors
    /// An instant outside the source.
    pub fn observer(&self, site: &Site, instant: Tt) -> Result<Vantage<'_>, SkyError> {
        self.observer_at_ut1(site, instant, self.tables.ut1_from_tt(instant))
    }

    /// The view from a site with UT1 given.
    ///
    /// # Errors
    /// An instant outside the source.
    pub fn observer_at_ut1(
        &self,
        site: &Site,
        instant: Tt,
        ut1: Ut1,
    ) -> Result<Vantage<'_>, SkyError> {
        let mut vantage = self.geocentre(instant)?;
        let sidereal = (frames::apparent_sidereal_time(ut1, instant, &vantage.frame)
            + site.longitude)
            .wrapped();
        let (sin_theta, cos_theta) = sidereal.sin_cos();
        let (sin_phi, cos_phi) = site.latitude.sin_cos();
        let up = Vec3::new(cos_phi * cos_theta, cos_phi * sin_theta, sin_phi);
        let east = Vec3::new(-sin_theta, cos_theta, 0.0);
        let local_from_true = Mat3 {
            rows: [east, up.cross(east), up],
        };

        let (axial_au, polar_au) = site.geocentric_au();
        let position = Vec3::new(axial_au * cos_theta, axial_au * sin_theta, polar_au);
        let spin = Vec3::new(0.0, 0.0, EARTH_SPIN_PER_DAY);
        let velocity = spin.cross(position);
        let icrs_from_true = vantage.frame.equatorial_from_icrs.transposed();
        vantage.observer.position += icrs_from_true * position;
        vantage.observer.velocity += icrs_from_true * velocity;
        vantage.spin_acceleration = icrs_from_true * spin.cross(velocity);
        vantage.horizon = Some(Horizon {
            local_from_icrs: local_from_true * vantage.frame.equatorial_from_icrs,
            sidereal,
        });
        Ok(vantage)
    }
}

/// Acceleration towards a mass at `towards`.
fn attraction(towards: Vec3, gm: f64) -> Vec3 {
    let distance = towards.norm();
    towards * (gm / (distance * distance * distance))
}

/// The local axes of a site at an instant.
#[derive(Clone, Copy, Debug)]
struct Horizon {
    /// Rows: east, north, up.
    local_from_icrs: Mat3,
    /// Local apparent sidereal time.
    sidereal: Angle,
}

/// An observer at an instant, from whom any number of bodies can be looked at.
pub struct Vantage<'s> {
    sky: &'s Sky,
    instant: Tt,
    tdb: Tdb,
    frame: ReferenceFrame,
    sun: State,
    moon: State,
    /// The Earth's centre.
    earth: State,
    /// The observer: the same, or a site on the turning Earth.
    observer: State,
    /// Of a site towards the Earth's axis.
    spin_acceleration: Vec3,
    horizon: Option<Horizon>,
}

impl Vantage<'_> {
    #[must_use]
    pub fn instant(&self) -> Tt {
        self.instant
    }

    /// The axes of date.
    #[must_use]
    pub fn frame(&self) -> &ReferenceFrame {
        &self.frame
    }

    /// Looks at a body.
    ///
    /// # Errors
    /// An instant outside the source.
    pub fn place(&self, body: Body) -> Result<Place, SkyError> {
        let (state, acceleration) = match body {
            Body::Sun => (self.sun, Vec3::ZERO),
            Body::Moon => {
                let state = self.earth + self.moon;
                (
                    state,
                    attraction(self.sun.position - state.position, GM_SUN),
                )
            }
            planet => {
                let state = self.sky.state(target_of(planet), self.tdb)?;
                (
                    state,
                    attraction(self.sun.position - state.position, GM_SUN),
                )
            }
        };
        let geometric = state.position - self.observer.position;
        let geometric_rate = state.velocity - self.observer.velocity;

        let seen_after =
            |days: f64| geometric - state.velocity * days + acceleration * (0.5 * days * days);
        // The body's own motion along the line of sight brings the first guess to 1e-8 of the light time; a round of
        // iteration leaves 1e-4 (speed over the speed of light) of that.
        let length = geometric.norm();
        let guess = length / (LIGHT_AU_PER_DAY + geometric.dot(state.velocity) / length);
        let light_time = seen_after(guess).norm() / LIGHT_AU_PER_DAY;
        let astrometric = seen_after(light_time);
        let distance = light_time * LIGHT_AU_PER_DAY;
        let direction = astrometric * (1.0 / distance);
        let velocity_then = state.velocity - acceleration * light_time;
        let light_time_rate = direction.dot(velocity_then - self.observer.velocity)
            / (LIGHT_AU_PER_DAY + direction.dot(velocity_then));
        let astrometric_rate = velocity_then * (1.0 - light_time_rate) - self.observer.velocity;
        let sun_then = self.sun.position - self.sun.velocity * light_time;
        let heliocentric = astrometric + self.observer.position - sun_then;
        let deflected = match body {
            Body::Sun => direction,
            _ => deflect(
                direction,
                heliocentric,
                self.observer.position - self.sun.position,
            ),
        };
        let apparent = self.aberrate(deflected);
        Ok(Place {
            body,
            instant: self.instant,
            emission: self.tdb.plus_days(-light_time),
            geometric,
            geometric_rate,
            astrometric,
            direction,
            astrometric_rate,
            distance_au: distance,
            heliocentric,
            heliocentric_now: state.position - self.sun.position,
            heliocentric_velocity_now: state.velocity - self.sun.velocity,
            apparent,
            observer: ObserverMotion {
                velocity: self.observer.velocity,
                to_sun: self.sun.position - self.earth.position,
                to_moon: self.moon.position,
                spin_acceleration: self.spin_acceleration,
            },
            frame: self.frame,
            cautions: self.sky.cautions(),
        })
    }

    /// The apparent direction, on ICRS axes, of something infinitely far in the (astrometric) direction given.
    #[must_use]
    pub fn apparent_of_star(&self, direction: Vec3) -> Vec3 {
        let deflected = deflect(
            direction,
            direction * 1e9,
            self.observer.position - self.sun.position,
        );
        self.aberrate(deflected)
    }

    fn aberrate(&self, direction: Vec3) -> Vec3 {
        let beta = self.observer.velocity * (1.0 / LIGHT_AU_PER_DAY);
        let gamma_inverse = (1.0 - beta.dot(beta)).sqrt();
        let along = direction.dot(beta);
        (direction * gamma_inverse + beta * (1.0 + along / (1.0 + gamma_inverse))).unit()
    }

    /// Altitude (no refraction) and azimuth of an apparent direction on ICRS axes; `None` at the geocentre.
    #[must_use]
    pub fn horizontal(&self, apparent: Vec3) -> Option<Horizontal> {
        let horizon = self.horizon?;
        let local = horizon.local_from_icrs * apparent;
        Some(Horizontal {
            azimuth: Angle::from_radians(libm::atan2(local.x, local.y)).wrapped(),
            altitude: local.latitude(),
        })
    }

    /// Sine of the altitude: what night searches need, without the cost of the angles. `None` at the geocentre.
    #[must_use]
    pub fn sine_of_altitude(&self, apparent: Vec3) -> Option<f64> {
        Some(self.horizon?.local_from_icrs.rows[2].dot(apparent))
    }

    /// Direction on ICRS axes that stands at this azimuth and (unrefracted) altitude; `None` at the geocentre.
    #[must_use]
    pub fn direction_at(&self, horizontal: Horizontal) -> Option<Vec3> {
        let (sin, cos) = horizontal.azimuth.sin_cos();
        let (sin_alt, cos_alt) = horizontal.altitude.sin_cos();
        let local = Vec3::new(cos_alt * sin, cos_alt * cos, sin_alt);
        Some(self.horizon?.local_from_icrs.transposed() * local)
    }

    /// Local apparent sidereal time; `None` at the geocentre.
    #[must_use]
    pub fn sidereal_time(&self) -> Option<Angle> {
        Some(self.horizon?.sidereal)
    }

    /// Local hour angle, west positive, -180 to 180 degrees; `None` at the geocentre.
    #[must_use]
    pub fn hour_angle(&self, place: &Place) -> Option<Angle> {
        Some((self.horizon?.sidereal - place.equatorial_of_date().longitude).signed())
    }
}

fn target_of(planet: Body) -> Target {
    match planet {
        Body::Sun => Target::Sun,
        Body::Moon => Target::MoonFromEarth,
        Body::Mercury => Target::Mercury,
        Body::Venus => Target::Venus,
        Body::Mars => Target::Mars,
        Body::Jupiter => Target::Jupiter,
        Body::Saturn => Target::Saturn,
        Body::Uranus => Target::Uranus,
        Body::Neptune => Target::Neptune,
    }
}

/// Bends a direction by the Sun's mass.
///
/// `body_from_sun` and `observer_from_sun` in au. The bending falls off as 1 + cos(angle at the Sun between the two);
/// where the ray would pass through the Sun's disc that term is held at its value on the limb.
fn deflect(direction: Vec3, body_from_sun: Vec3, observer_from_sun: Vec3) -> Vec3 {
    let observer_distance = observer_from_sun.norm();
    let body_distance = body_from_sun.norm();
    let q = body_from_sun * (1.0 / body_distance);
    let e = observer_from_sun * (1.0 / observer_distance);
    let sun_radius_au = Body::Sun.radius_km() / AU_KM;
    let limb = sun_radius_au / observer_distance + sun_radius_au / body_distance;
    let opening = (1.0 + q.dot(e)).max(0.5 * limb * limb);
    let strength = SCHWARZSCHILD_AU / observer_distance / opening;
    (direction + (e * direction.dot(q) - q * direction.dot(e)) * strength).unit()
}

/// Which side of the Sun a body stands on, seen from Earth.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// East of the Sun: evening sky.
    East,
    /// West of the Sun: morning sky.
    West,
}

impl Side {
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Side::East => "east",
            Side::West => "west",
        }
    }
}

/// A direction as longitude-like and latitude-like angles.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Spherical {
    /// Longitude or right ascension, 0 to 360 degrees.
    pub longitude: Angle,
    /// Latitude or declination, -90 to 90 degrees.
    pub latitude: Angle,
}

impl Spherical {
    #[must_use]
    pub fn of(direction: Vec3) -> Self {
        Spherical {
            longitude: direction.longitude(),
            latitude: direction.latitude(),
        }
    }
}

/// Rates of a direction per day.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SphericalRate {
    /// Of the longitude or right ascension (not times the cosine), eastward positive.
    pub longitude: Angle,
    /// Of the latitude or declination, northward positive.
    pub latitude: Angle,
}

impl SphericalRate {
    fn of(v: Vec3, rate: Vec3) -> Self {
        let across = v.x * v.x + v.y * v.y;
        let longitude = if across > 0.0 {
            (v.x * rate.y - v.y * rate.x) / across
        } else {
            0.0
        };
        let norm = v.norm();
        let latitude = if across > 0.0 {
            (rate.z - v.z * v.dot(rate) / (norm * norm)) / across.sqrt()
        } else {
            0.0
        };
        SphericalRate {
            longitude: Angle::from_radians(longitude),
            latitude: Angle::from_radians(latitude),
        }
    }
}

/// Altitude and azimuth.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Horizontal {
    /// From north through east, 0 to 360 degrees.
    pub azimuth: Angle,
    /// Unrefracted unless the owner says otherwise.
    pub altitude: Angle,
}

/// What the rate of aberration depends on; worked out only when a rate is asked for.
#[derive(Clone, Copy, Debug)]
struct ObserverMotion {
    velocity: Vec3,
    /// From the Earth's centre.
    to_sun: Vec3,
    to_moon: Vec3,
    spin_acceleration: Vec3,
}

impl ObserverMotion {
    /// au/day^2. The Moon draws the Earth with a 170th of the Sun's pull, which counts at a greatest elongation.
    fn acceleration(&self) -> Vec3 {
        let gm_moon = GM_SUN / SUN_EARTH_RATIO / EARTH_MOON_RATIO;
        attraction(self.to_sun, GM_SUN) + attraction(self.to_moon, gm_moon) + self.spin_acceleration
    }
}

/// A body as an observer sees it at an instant.
#[derive(Clone, Copy, Debug)]
pub struct Place {
    pub body: Body,
    pub instant: Tt,
    /// When the light left the body.
    pub emission: Tdb,
    /// From the observer to the body, both at the instant; au, ICRS axes.
    pub geometric: Vec3,
    /// au a day.
    pub geometric_rate: Vec3,
    /// From the observer now to the body when the light left it; au, ICRS axes.
    pub astrometric: Vec3,
    /// Unit vector of `astrometric`: the astrometric place.
    pub direction: Vec3,
    /// Rate of `astrometric`, au a day of TT.
    pub astrometric_rate: Vec3,
    /// Length of `astrometric`: the light-time distance.
    pub distance_au: f64,
    /// From the Sun to the body, both when the light left it; au, ICRS axes.
    pub heliocentric: Vec3,
    /// From the Sun to the body, both at the instant; au.
    pub heliocentric_now: Vec3,
    /// Rate of `heliocentric_now`, au a day.
    pub heliocentric_velocity_now: Vec3,
    /// Apparent direction: light time, deflection, aberration; unit vector on ICRS axes.
    pub apparent: Vec3,
    observer: ObserverMotion,
    /// The axes of date.
    pub frame: ReferenceFrame,
    pub cautions: Cautions,
}

impl Place {
    /// Apparent right ascension and declination, true equator and equinox of date.
    #[must_use]
    pub fn equatorial_of_date(&self) -> Spherical {
        Spherical::of(self.frame.equatorial_from_icrs * self.apparent)
    }

    /// Apparent ecliptic longitude and latitude, true ecliptic and equinox of date.
    #[must_use]
    pub fn ecliptic_of_date(&self) -> Spherical {
        Spherical::of(self.frame.ecliptic_from_icrs * self.apparent)
    }

    /// Astrometric right ascension and declination on ICRS axes.
    #[must_use]
    pub fn astrometric_icrs(&self) -> Spherical {
        Spherical::of(self.direction)
    }

    /// Astrometric ecliptic longitude and latitude, mean ecliptic and equinox of J2000.
    #[must_use]
    pub fn ecliptic_j2000(&self) -> Spherical {
        Spherical::of(ReferenceFrame::j2000().ecliptic_from_icrs * self.direction)
    }

    /// Rate of [`Place::direction`], radians a day.
    #[must_use]
    pub fn direction_rate(&self) -> Vec3 {
        let across =
            self.astrometric_rate - self.direction * self.direction.dot(self.astrometric_rate);
        across * (1.0 / self.distance_au)
    }

    /// Rate of `apparent`, radians a day: without that of the deflection (below 0.002" a day beyond 10 degrees from the
    /// Sun) and of second order in v/c (0.00004" a day).
    #[must_use]
    pub fn apparent_rate(&self) -> Vec3 {
        let beta = self.observer.velocity * (1.0 / LIGHT_AU_PER_DAY);
        let beta_rate = self.observer.acceleration() * (1.0 / LIGHT_AU_PER_DAY);
        let (u, u_rate) = (self.direction, self.direction_rate());
        let along = u.dot(beta);
        let along_rate = u_rate.dot(beta) + u.dot(beta_rate);
        u_rate + beta_rate - u_rate * along - u * along_rate
    }

    /// Rate of [`Place::distance_au`], au a day.
    #[must_use]
    pub fn distance_rate(&self) -> f64 {
        self.direction.dot(self.astrometric_rate)
    }

    /// Rates of [`Place::equatorial_of_date`], the turning of the axes included.
    #[must_use]
    pub fn equatorial_rate(&self) -> SphericalRate {
        let rate = self
            .frame
            .equatorial_rate(self.apparent, self.apparent_rate());
        SphericalRate::of(self.frame.equatorial_from_icrs * self.apparent, rate)
    }

    /// Rates of [`Place::ecliptic_of_date`], the turning of the axes included.
    #[must_use]
    pub fn ecliptic_rate(&self) -> SphericalRate {
        let rate = self
            .frame
            .ecliptic_rate(self.apparent, self.apparent_rate());
        SphericalRate::of(self.frame.ecliptic_from_icrs * self.apparent, rate)
    }

    /// Distance from the observer at the instant, without light time.
    #[must_use]
    pub fn geometric_distance_au(&self) -> f64 {
        self.geometric.norm()
    }

    /// Rate of [`Place::geometric_distance_au`], au a day.
    #[must_use]
    pub fn geometric_distance_rate(&self) -> f64 {
        self.geometric.dot(self.geometric_rate) / self.geometric.norm()
    }

    /// What magnitudes and discs are computed from.
    #[must_use]
    pub fn geometry(&self) -> Geometry {
        Geometry {
            body: self.body,
            sun_to_body: self.heliocentric,
            observer_to_body: self.astrometric,
            emission: self.emission,
        }
    }

    /// Angle between the apparent directions of this body and another seen from the same place, 0 to 180 degrees.
    #[must_use]
    pub fn separation(&self, other: &Place) -> Angle {
        self.apparent.separation(other.apparent)
    }

    /// Rate of [`Place::separation`] per day.
    #[must_use]
    pub fn separation_rate(&self, other: &Place) -> Angle {
        let sine = self.apparent.cross(other.apparent).norm();
        if sine == 0.0 {
            return Angle::ZERO;
        }
        let cosine_rate =
            self.apparent_rate().dot(other.apparent) + self.apparent.dot(other.apparent_rate());
        Angle::from_radians(-cosine_rate / sine)
    }

    /// The side of the Sun, by apparent longitude of date.
    #[must_use]
    pub fn side_of(&self, sun: &Place) -> Side {
        let difference = self.ecliptic_of_date().longitude - sun.ecliptic_of_date().longitude;
        if difference.signed() >= Angle::ZERO {
            Side::East
        } else {
            Side::West
        }
    }
}
