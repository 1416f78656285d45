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
/// Fairhead and Bretagnon 1990 (Astron. Astrophys. 229:240) in the seven-term form of USNO Circular 179, equation 2.6:
/// good to 10 microseconds from 1600 to 2200, and within a millisecond over the years -2000 to 3000.
fn tdb_minus_tt_seconds(centuries: f64) -> f64 {
    const TERMS: [(f64, f64, f64); 6] = [
        (0.001_657, 628.3076, 6.2401),
        (0.000_022, 575.3385, 4.2970),
        (0.000_014, 1256.6152, 6.1969),
        (0.000_005, 606.9777, 4.0212),
        (0.000_005, 52.9691, 0.4444),
        (0.000_002, 21.3299, 5.5431),
    ];
    let steady: f64 = TERMS
        .iter()
        .map(|(amplitude, rate, phase)| amplitude * libm::sin(rate * centuries + phase))
        .sum();
    steady + 0.000_010 * centuries * libm::sin(628.3076 * centuries + 4.2490)
}

impl Tdb {
    /// The same instant, from TT; by Fairhead and Bretagnon 1990 in the short form of USNO
    /// Circular 179: good to 10 microseconds from 1600 to 2200, to a millisecond from -2000 to 3000.
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
