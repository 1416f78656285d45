//! The Earth's rotation against even time: leap seconds and delta-T = TT-UT1.
//!
//! | dates | source | standard error |
//! |---|---|---|
//! | 1962 to the end of measurement | IERS EOP 20 C04 and finals2000A, every 3 days, linear between (within 0.84 ms of the daily values, rms 0.11 ms) | 2 ms |
//! | about a year more | predictions in finals2000A | 0.3 ms d^(3/4), d in days after the last measurement |
//! | -720 to 1962 | splines of Stephenson, Morrison and Hohenkerk 2016, table S15 of 2020 | table of Morrison and Stephenson 2004 |
//! | all else | long-term parabola -320 + 32.5 ((year - 1825)/100)^2 s of the same paper, led into from the tables by a cubic 800 years long that meets both in value and slope | before -500 0.8 t^2 s, t in centuries from 1820 (Morrison and Stephenson 2004); later twice the random walk of the length of day of Huber 2006 |
//!
//! Value and slope are continuous but for the corners of linear interpolation. The spline is 0.38 s below the measured
//! value at 1962.0, so a cubic that starts at 1955.5 (the first atomic clocks) leads from one to the other. The slope at
//! the end of the predictions is that of their last year, which is free of the seasonal wave; of looking back 1, 2, 5, 10,
//! 20 or 30 years it forecast the years 1840 to 2027 best (3.3 s rms after 10 years, 9 s after 20).
//!
//! TAI-UTC stays at its last value in the future.

use super::calendar::first_utc;
use super::time::DAYS_PER_CENTURY;
use super::{Caution, Cautions, Tt, Ut1, Utc};

include!("../../assets/time_tables.rs");

/// TT-TAI in seconds, by definition.
const TT_MINUS_TAI_SECONDS: f64 = 32.184;
/// Modified Julian Date of J2000, 2000-01-01 12:00.
const J2000_MJD: f64 = 51_544.5;
/// Days in the Julian year, by which the years of the models here are counted from 2000.0.
const DAYS_PER_YEAR: f64 = DAYS_PER_CENTURY / 100.0;
/// Where the spline starts to be led over to the measurements.
const BLEND_FROM_YEAR: f64 = 1955.5;
/// Length of the cubics between the tables and the parabola.
const JOIN_YEARS: f64 = 800.0;
/// The C04 series prints 2 ms for 1962 and 0.03 ms for now; interpolation adds up to 0.84 ms.
const MEASURED_ERROR_SECONDS: f64 = 0.002;
/// A value with a larger standard error carries [`Caution::DeltaTModelled`].
const CAUTION_ABOVE_SECONDS: f64 = 1.0;

/// Where a value of delta-T comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum DeltaTOrigin {
    /// IERS measurements, 1962 on.
    Measured,
    /// IERS predictions, about a year beyond the measurements.
    Predicted,
    /// Stephenson, Morrison and Hohenkerk 2016, from eclipses and occultations, -720 to 1962.
    HistoricSpline,
    /// The long-term parabola of the same paper and the cubics that lead into it.
    LongTermParabola,
}

impl DeltaTOrigin {
    /// In a word or two, for labels.
    #[must_use]
    pub const fn label(self) -> &'static str {
        match self {
            DeltaTOrigin::Measured => "measured",
            DeltaTOrigin::Predicted => "predicted",
            DeltaTOrigin::HistoricSpline => "historic spline",
            DeltaTOrigin::LongTermParabola => "long-term parabola",
        }
    }
}

/// TT-UT1 at an instant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DeltaT {
    pub seconds: f64,
    /// Standard error in seconds; its sources are in the head of this module.
    pub error_seconds: f64,
    pub origin: DeltaTOrigin,
}

impl DeltaT {
    /// [`Caution::DeltaTModelled`] where the standard error is above 1 s: before 1800 and from about 2032.
    #[must_use]
    pub fn cautions(self) -> Cautions {
        Cautions::NONE.with_if(
            self.error_seconds > CAUTION_ABOVE_SECONDS,
            Caution::DeltaTModelled,
        )
    }
}

/// Leap seconds and delta-T, with the age of their measurements.
#[derive(Debug)]
pub struct TimeTables {
    /// Modified Julian Date and TAI-UTC in seconds from then on; ascending.
    leap_seconds: &'static [(i32, i32)],
    /// TT-UT1 in units of [`UNIT_SECONDS`], every [`STEP_DAYS`] from [`FIRST_MJD`].
    delta_t_units: &'static [i32],
    /// First and last year, then a0 to a3 of each cubic; contiguous and ascending.
    spline: &'static [[f64; 6]],
}

static EMBEDDED: TimeTables = TimeTables {
    leap_seconds: &LEAP_SECONDS,
    delta_t_units: &DELTA_T_UNITS,
    spline: &SPLINE,
};

impl TimeTables {
    /// The tables that the program carries.
    #[must_use]
    pub fn embedded() -> &'static TimeTables {
        &EMBEDDED
    }

    /// TT-UT1 at an instant of TT.
    #[must_use]
    pub fn delta_t(&self, tt: Tt) -> DeltaT {
        let mjd = tt.days() + J2000_MJD;
        let year = year_from_mjd(mjd);
        let measured_to = f64::from(MEASURED_TO_MJD);
        let (seconds, origin) = if mjd > self.last_mjd() {
            let seconds = self.join_after().at(year).unwrap_or(parabola(year).value);
            (seconds, DeltaTOrigin::LongTermParabola)
        } else if mjd > measured_to {
            (self.tabulated(mjd), DeltaTOrigin::Predicted)
        } else if mjd >= f64::from(FIRST_MJD) {
            (self.tabulated(mjd), DeltaTOrigin::Measured)
        } else if year >= self.spline_from_year() {
            let seconds = self.historic(year).value + self.blend().at(year).unwrap_or(0.0);
            (seconds, DeltaTOrigin::HistoricSpline)
        } else {
            let seconds = self.join_before().at(year).unwrap_or(parabola(year).value);
            (seconds, DeltaTOrigin::LongTermParabola)
        };
        let error_seconds = match origin {
            DeltaTOrigin::Measured => MEASURED_ERROR_SECONDS,
            DeltaTOrigin::Predicted => prediction_error(mjd - measured_to),
            DeltaTOrigin::LongTermParabola if mjd > self.last_mjd() => libm::hypot(
                prediction_error(self.last_mjd() - measured_to),
                forecast_error(year - year_from_mjd(self.last_mjd())),
            ),
            DeltaTOrigin::HistoricSpline | DeltaTOrigin::LongTermParabola => historic_error(year),
        };
        DeltaT {
            seconds,
            error_seconds,
            origin,
        }
    }

    /// TT from UTC; before 1972 from UT1. Exact to the resolution of the numbers.
    #[must_use]
    pub fn tt_from_utc(&self, utc: Utc) -> Tt {
        if utc < first_utc() {
            // On the eve of 1972 UT1 was 46 ms behind UTC: the instants it names after 1972 began stand for that beginning.
            let start = self.tt_from_utc(first_utc());
            let tt = self.tt_from_ut1(Ut1::from_days(utc.days()));
            return if tt < start { tt } else { start };
        }
        let mjd = utc.days() + J2000_MJD;
        let offset = self.tt_minus_utc(|&(start, _)| f64::from(start) <= mjd);
        Tt::from_days(utc.days()).plus_seconds(offset)
    }

    /// UTC from TT; before 1972 UT1. A leap second shares its number with the second after it.
    #[must_use]
    pub fn utc_from_tt(&self, tt: Tt) -> Utc {
        if tt < self.tt_from_utc(first_utc()) {
            return Utc::from_days(self.ut1_from_tt(tt).days());
        }
        // An offset holds from 0h UTC of its first day, reckoned with itself and by the same steps as in `tt_from_utc`,
        // so that not even rounding puts that midnight a second off.
        let offset = self.tt_minus_utc(|&(start, tai_minus_utc)| {
            let midnight = Tt::from_days(f64::from(start) - J2000_MJD);
            midnight.plus_seconds(TT_MINUS_TAI_SECONDS + f64::from(tai_minus_utc)) <= tt
        });
        Utc::from_days(tt.days()).plus_seconds(-offset)
    }

    /// UT1 from TT.
    #[must_use]
    pub fn ut1_from_tt(&self, tt: Tt) -> Ut1 {
        Ut1::from_days(tt.days()).plus_seconds(-self.delta_t(tt).seconds)
    }

    /// TT from UT1, to the resolution of the numbers.
    #[must_use]
    pub fn tt_from_ut1(&self, ut1: Ut1) -> Tt {
        // Delta-T changes by less than 1e-6 of the time passed, so each round gains six digits.
        let mut tt = Tt::from_days(ut1.days());
        for _ in 0..3 {
            tt = Tt::from_days(ut1.days()).plus_seconds(self.delta_t(tt).seconds);
        }
        tt
    }

    /// Last day with a measured value, as `2026-10-24`.
    #[must_use]
    pub const fn measured_to(&self) -> &'static str {
        MEASURED_TO_DATE
    }

    /// Last day with an IERS prediction, as `2027-10-30`.
    #[must_use]
    pub const fn predicted_to(&self) -> &'static str {
        PREDICTED_TO_DATE
    }

    /// Days from the last measurement to `utc`; negative before it.
    #[must_use]
    pub fn age_days(&self, utc: Utc) -> f64 {
        utc.days() + J2000_MJD - f64::from(MEASURED_TO_MJD)
    }

    /// How far the tables reach, in a sentence.
    #[must_use]
    pub fn reach_text(&self) -> String {
        format!(
            "Earth rotation measured to {MEASURED_TO_DATE}, predicted to {PREDICTED_TO_DATE}; leap seconds known to {LEAP_SECONDS_TO_DATE}"
        )
    }

    /// TT-UTC by the last leap second that `holds`; by the first where none does.
    fn tt_minus_utc(&self, holds: impl Fn(&(i32, i32)) -> bool) -> f64 {
        let past = self.leap_seconds.partition_point(holds);
        let entry = self.leap_seconds.get(past.saturating_sub(1));
        TT_MINUS_TAI_SECONDS + entry.map_or(0.0, |&(_, tai_minus_utc)| f64::from(tai_minus_utc))
    }

    /// Modified Julian Date of the last table entry.
    fn last_mjd(&self) -> f64 {
        let steps = self.delta_t_units.len().saturating_sub(1);
        f64::from(FIRST_MJD) + steps as f64 * f64::from(STEP_DAYS)
    }

    /// Linear interpolation in the table; the nearest end outside it.
    fn tabulated(&self, mjd: f64) -> f64 {
        // The table is by UTC: a minute's difference to TT is worth 1 microsecond.
        let position = ((mjd - f64::from(FIRST_MJD)) / f64::from(STEP_DAYS)).max(0.0);
        let before = position.floor();
        let entry = |index: usize| {
            let last = self.delta_t_units.len().saturating_sub(1);
            let units = self.delta_t_units.get(index.min(last)).copied();
            f64::from(units.unwrap_or_default()) * UNIT_SECONDS
        };
        let index = before as usize;
        let (first, second) = (entry(index), entry(index.saturating_add(1)));
        first + (second - first) * (position - before)
    }

    fn spline_from_year(&self) -> f64 {
        self.spline.first().map_or(f64::INFINITY, |piece| piece[0])
    }

    /// The spline as published; its first or last piece beyond its ends.
    fn historic(&self, year: f64) -> Point {
        let begun = self.spline.partition_point(|piece| piece[0] <= year);
        let piece = self.spline.get(begun.saturating_sub(1));
        let [from, to, a0, a1, a2, a3] = piece.copied().unwrap_or([0.0, 1.0, 0.0, 0.0, 0.0, 0.0]);
        let t = (year - from) / (to - from);
        Point {
            year,
            value: a0 + t * (a1 + t * (a2 + t * a3)),
            slope: (a1 + t * (2.0 * a2 + t * 3.0 * a3)) / (to - from),
        }
    }

    /// The measured value with the mean slope over a year, which has no seasonal wave in it.
    fn measured_point(&self, mjd: f64, slope_from_mjd: f64) -> Point {
        Point {
            year: year_from_mjd(mjd),
            value: self.tabulated(mjd),
            slope: self.tabulated(slope_from_mjd + DAYS_PER_YEAR) - self.tabulated(slope_from_mjd),
        }
    }

    /// What is added to the spline to meet the measurements at 1962.
    fn blend(&self) -> Cubic {
        let first = f64::from(FIRST_MJD);
        let measured = self.measured_point(first, first);
        let spline = self.historic(measured.year);
        Cubic {
            from: Point {
                year: BLEND_FROM_YEAR,
                value: 0.0,
                slope: 0.0,
            },
            to: Point {
                year: measured.year,
                value: measured.value - spline.value,
                slope: measured.slope - spline.slope,
            },
        }
    }

    /// From the last prediction to the parabola.
    fn join_after(&self) -> Cubic {
        let last = self.last_mjd();
        let from = self.measured_point(last, last - DAYS_PER_YEAR);
        Cubic {
            from,
            to: parabola(from.year + JOIN_YEARS),
        }
    }

    /// From the parabola to the first year of the spline.
    fn join_before(&self) -> Cubic {
        let to = self.historic(self.spline_from_year());
        Cubic {
            from: parabola(to.year - JOIN_YEARS),
            to,
        }
    }
}

/// Years by Julian years of 365.25 days from 2000.0 = J2000, as the models here count them.
fn year_from_mjd(mjd: f64) -> f64 {
    2000.0 + (mjd - J2000_MJD) / DAYS_PER_YEAR
}

/// Seconds at a year, and seconds per year there.
#[derive(Clone, Copy, Debug)]
struct Point {
    year: f64,
    value: f64,
    slope: f64,
}

/// The cubic that has the value and slope of both its ends.
#[derive(Clone, Copy, Debug)]
struct Cubic {
    from: Point,
    to: Point,
}

impl Cubic {
    /// The value at a year between the ends, `None` outside.
    fn at(&self, year: f64) -> Option<f64> {
        let years = self.to.year - self.from.year;
        let t = (year - self.from.year) / years;
        (0.0..=1.0).contains(&t).then(|| {
            let (rest, rise) = (1.0 - t, t * t * (3.0 - 2.0 * t));
            self.from.value * (1.0 - rise)
                + self.to.value * rise
                + years * t * rest * (self.from.slope * rest - self.to.slope * t)
        })
    }
}

/// The long-term parabola of Stephenson, Morrison and Hohenkerk 2016.
fn parabola(year: f64) -> Point {
    let centuries = (year - 1825.0) / 100.0;
    Point {
        year,
        value: -320.0 + 32.5 * centuries * centuries,
        slope: 0.65 * centuries,
    }
}

/// Standard error before 1962: Morrison and Stephenson 2004 (J. Hist. Astron. 35:327), table 1, linear between; "<1 s"
/// and "<0.1 s" are taken as 0.5 and 0.1. Before -500 their 0.8 t^2. The values are from memory.
fn historic_error(year: f64) -> f64 {
    const FIRST: f64 = -500.0;
    const TABLE: [(f64, f64); 28] = [
        (FIRST, 430.0),
        (-400.0, 390.0),
        (-300.0, 360.0),
        (-200.0, 330.0),
        (-100.0, 290.0),
        (0.0, 260.0),
        (100.0, 240.0),
        (200.0, 210.0),
        (300.0, 180.0),
        (400.0, 160.0),
        (500.0, 140.0),
        (600.0, 120.0),
        (700.0, 100.0),
        (800.0, 80.0),
        (900.0, 70.0),
        (1000.0, 55.0),
        (1100.0, 40.0),
        (1200.0, 30.0),
        (1300.0, 20.0),
        (1400.0, 20.0),
        (1500.0, 20.0),
        (1600.0, 20.0),
        (1700.0, 5.0),
        (1750.0, 2.0),
        (1800.0, 1.0),
        (1850.0, 0.5),
        (1900.0, 0.5),
        (1950.0, 0.1),
    ];
    if year < FIRST {
        let centuries = (year - 1820.0) / 100.0;
        return 0.8 * centuries * centuries;
    }
    TABLE
        .windows(2)
        .find_map(|pair| match *pair {
            [(from, first), (to, second)] if year < to => {
                Some(first + (second - first) * (year - from) / (to - from))
            }
            _ => None,
        })
        .unwrap_or(0.1)
}

/// Standard error of an IERS prediction so many days ahead: 0.3 ms d^(3/4), which meets the errors that finals2000A
/// prints (3.5 ms after 30 days, 25 ms after a year) within a fifth.
fn prediction_error(days: f64) -> f64 {
    (3e-4 * libm::pow(days.max(0.0), 0.75)).max(MEASURED_ERROR_SECONDS)
}

/// Standard error of an extrapolation over so many years: the random walk of the length of day of Huber 2006
/// (J. Geodesy 80:283; from memory), with Q = 0.058 ms^2 a year and 2500 years of calibration, doubled because the
/// join used here missed the years 1840 to 2027 by twice that much.
fn forecast_error(years: f64) -> f64 {
    const Q: f64 = 0.058;
    const CALIBRATION_YEARS: f64 = 2500.0;
    let milliseconds_a_day = (years * Q / 3.0 * (1.0 + years / CALIBRATION_YEARS))
        .max(0.0)
        .sqrt();
    2.0 * DAYS_PER_YEAR * years * milliseconds_a_day / 1000.0
}

#[cfg(test)]
mod tests {
    use super::*;

    /// skyfield 1.55 with its own IERS file, which ends 2027-01-23 (MJD 61428) and reaches its parabola in 2800: the
    /// join must give the library's values from the library's end.
    #[test]
    fn join_after_agrees_with_skyfield_from_its_end() {
        let join = Cubic {
            from: Point {
                year: 2_027.059_550_447,
                value: 69.090_304_9,
                slope: -0.021_091_828,
            },
            to: parabola(2800.0),
        };
        for (year, seconds) in [
            (2050.0, 71.442_871),
            (2200.0, 221.601_928),
            (2500.0, 1_151.597_540),
        ] {
            let ours = join.at(year).unwrap();
            assert!(
                (ours - seconds).abs() < 0.001,
                "{year}: {ours} against {seconds}"
            );
        }
    }
}
