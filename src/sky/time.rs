//! Instants, one type per time scale.
//!
//! Each is days since 2000-01-01 12:00 (JD 2451545.0) of its own scale in one `f64`, which resolves 5 microseconds
//! within seven centuries of 2000 and 40 microseconds at the ends of the years -2000 to 3000: the Moon, the fastest
//! body, moves 0.00002" in that time and the sky turns 0.0006".

/// Seconds in a day of any scale.
pub const SECONDS_PER_DAY: f64 = 86_400.0;
/// Julian Date of the zero point of every scale here.
pub const J2000_JD: f64 = 2_451_545.0;
/// Days in a Julian century.
pub const DAYS_PER_CENTURY: f64 = 36_525.0;

macro_rules! scale {
    ($(#[$doc:meta])* $name:ident) => {
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd)]
        pub struct $name(f64);

        impl $name {
            /// From days since JD 2451545.0 of this scale.
            #[must_use]
            pub const fn from_days(days_since_j2000: f64) -> Self {
                $name(days_since_j2000)
            }

            /// From a Julian Date of this scale; one `f64` of it is good to 40 microseconds.
            #[must_use]
            pub const fn from_julian_date(jd: f64) -> Self {
                $name(jd - J2000_JD)
            }

            /// Days since JD 2451545.0 of this scale.
            #[must_use]
            pub const fn days(self) -> f64 {
                self.0
            }

            /// The Julian Date of this scale, good to 40 microseconds.
            #[must_use]
            pub const fn julian_date(self) -> f64 {
                self.0 + J2000_JD
            }

            /// Julian centuries of this scale since J2000.
            #[must_use]
            pub const fn centuries(self) -> f64 {
                self.0 / DAYS_PER_CENTURY
            }

            /// This instant moved by days of this scale.
            #[must_use]
            pub const fn plus_days(self, days: f64) -> Self {
                $name(self.0 + days)
            }

            /// This instant moved by seconds of this scale.
            #[must_use]
            pub const fn plus_seconds(self, seconds: f64) -> Self {
                $name(self.0 + seconds / SECONDS_PER_DAY)
            }
        }
    };
}

scale! {
    /// Terrestrial Time: the even time of the geocentre, in which events are searched.
    Tt
}
scale! {
    /// Barycentric Dynamical Time: the argument of the ephemeris. Differs from TT by less than 2 ms.
    Tdb
}
/// TDB-TT in seconds at `centuries` since J2000 of either scale.
///
/// Fairhead and Bretagnon 1990 (Astron. Astrophys. 229:240), the annual term and its harmonic of the seven-term form in
/// USNO Circular 179, equation 2.6. What is left out reaches 70 microseconds from 1600 to 2200 and a millisecond over
/// the years -2000 to 3000: the Moon moves 0.00004" in 70 microseconds. This runs once a place, so one sine has to do.
fn tdb_minus_tt_seconds(centuries: f64) -> f64 {
    let (sin, cos) = libm::sincos(628.3076 * centuries + 6.2401);
    (0.001_657 + 0.000_028 * cos) * sin
}

impl Tdb {
    /// The same instant, from TT; by Fairhead and Bretagnon 1990, the annual terms of USNO
    /// Circular 179: good to 0.1 ms from 1600 to 2200, to a millisecond from -2000 to 3000.
    #[must_use]
    pub fn from_tt(tt: Tt) -> Tdb {
        Tdb(tt.0).plus_seconds(tdb_minus_tt_seconds(tt.centuries()))
    }
}

impl Tt {
    /// The same instant, from TDB, to the accuracy of [`Tdb::from_tt`].
    #[must_use]
    pub fn from_tdb(tdb: Tdb) -> Tt {
        // TDB for TT in the argument changes the result by less than a picosecond.
        Tt(tdb.0).plus_seconds(-tdb_minus_tt_seconds(tdb.centuries()))
    }
}

scale! {
    /// Universal Time 1: the angle through which the Earth has turned.
    Ut1
}
scale! {
    /// Coordinated Universal Time from 1972 on, with days of 86 400 s (a leap second shares its number with the
    /// second after it); before 1972 it stands for UT1.
    Utc
}
