//! Civil dates and clock readings as text.
//!
//! Gregorian calendar from 1582-10-15, Julian before it; 1582-10-05 to 1582-10-14 never were. Years are signed and
//! astronomical: 0 is 1 BC, -746 is 747 BC. Years -9999 to 9999. Days are counted by the Julian Day Number, the integer
//! Julian Date of the day's noon. Exact integer arithmetic (Meeus 1998, chapter 7, recast in whole numbers so that it holds
//! for negative day numbers too). Text follows ISO 8601: `2026-11-01`, `-0746-02-26`, `2026-11-01T18:30:00Z`.
//!
//! Before 1972 clock readings are UT1 and carry no `Z`; from 1972 on they are UTC and carry it. Zones are not known here.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Serialize};

use super::Utc;
use super::time::SECONDS_PER_DAY;

/// Julian Day Number of 2000-01-01, whose noon is the zero point of the time scales.
const J2000_DAY_NUMBER: i32 = 2_451_545;
/// Julian Day Number of 1 March of the year 0 in either calendar, from which days are counted.
const JULIAN_MARCH_0: i32 = 1_721_118;
const GREGORIAN_MARCH_0: i32 = 1_721_120;
/// Julian Day Number of 1582-10-15, the first day of the Gregorian calendar.
const FIRST_GREGORIAN_DAY: i32 = 2_299_161;
/// First and last year that a [`CivilDate`] can have.
const FIRST_YEAR: i32 = -9999;
const LAST_YEAR: i32 = 9999;
/// From 1972-01-01 on clock readings are UTC, before it UT1.
const FIRST_UTC_YEAR: i32 = 1972;
/// More decimals than the resolution of an instant in one `f64` make no sense.
const MOST_DECIMALS: u8 = 6;

/// A date or time that cannot be.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum CalendarError {
    #[error(
        "there is no year {year} here: years run from {FIRST_YEAR} to {LAST_YEAR}, 0 being 1 BC"
    )]
    Year { year: i64 },
    #[error("there is no month {month}: months run from 1 to 12")]
    Month { month: u8 },
    #[error("there is no day {day} in {year:04}-{month:02}: that month runs from 1 to {last}")]
    Day {
        year: i32,
        month: u8,
        day: u8,
        last: u8,
    },
    #[error(
        "1582-10-{day:02} never was: 1582-10-04 (Julian) was followed by 1582-10-15 (Gregorian); use a date outside this gap"
    )]
    Gap { day: u8 },
    #[error("the instant lies outside the years {FIRST_YEAR} to {LAST_YEAR} or is not a number")]
    OutOfRange,
    #[error(
        "cannot read \"{text}\" as a date; write year-month-day as in 2026-11-01 or -0746-02-26"
    )]
    DateText { text: String },
    #[error(
        "cannot read \"{text}\" as a date; write 2026-11-01, 2026-11 (first of the month) or 2026 (first of the year)"
    )]
    PartialDateText { text: String },
    #[error(
        "cannot read \"{text}\" as a time; write 2026-11-01T18:30:00Z (UTC), or -0746-02-26T12:00:00 (UT1, before 1972)"
    )]
    TimeText { text: String },
    #[error(
        "there is no clock time {hour:02}:{minute:02}:{second:02}: hours run to 23, minutes and seconds to 59; for a leap second write the second after it"
    )]
    Clock { hour: u8, minute: u8, second: u8 },
    #[error(
        "\"{text}\" names no zone; from 1972 on times are UTC: add Z, as in 2026-11-01T18:30:00Z"
    )]
    MissingZ { text: String },
    #[error(
        "\"{text}\" is before 1972, when UTC in its present form began: leave out the Z, the time is UT1"
    )]
    UtcBefore1972 { text: String },
}

/// The days of the week.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Weekday {
    Monday,
    Tuesday,
    Wednesday,
    Thursday,
    Friday,
    Saturday,
    Sunday,
}

impl Weekday {
    pub const ALL: [Weekday; 7] = [
        Weekday::Monday,
        Weekday::Tuesday,
        Weekday::Wednesday,
        Weekday::Thursday,
        Weekday::Friday,
        Weekday::Saturday,
        Weekday::Sunday,
    ];

    /// The English name, as in "Monday".
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Weekday::Monday => "Monday",
            Weekday::Tuesday => "Tuesday",
            Weekday::Wednesday => "Wednesday",
            Weekday::Thursday => "Thursday",
            Weekday::Friday => "Friday",
            Weekday::Saturday => "Saturday",
            Weekday::Sunday => "Sunday",
        }
    }
}

impl fmt::Display for Weekday {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.name())
    }
}

/// English name of a month, 1 to 12.
#[must_use]
pub const fn month_name(month: u8) -> Option<&'static str> {
    Some(match month {
        1 => "January",
        2 => "February",
        3 => "March",
        4 => "April",
        5 => "May",
        6 => "June",
        7 => "July",
        8 => "August",
        9 => "September",
        10 => "October",
        11 => "November",
        12 => "December",
        _ => return None,
    })
}

/// A day that exists in the civil calendar (Gregorian from 1582-10-15, Julian before).
///
/// Made only by constructors that check; ordered by time; in files it is text, as in `2026-11-01`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub struct CivilDate {
    year: i32,
    month: u8,
    day: u8,
}

impl CivilDate {
    /// Checks that the day exists: astronomical year -9999 to 9999, month 1 to 12, day of that month.
    ///
    /// # Errors
    /// Says which part does not exist and what would.
    pub fn new(year: i32, month: u8, day: u8) -> Result<Self, CalendarError> {
        let last = days_in_month(year, month)?;
        if (year, month) == (1582, 10) && (5..15).contains(&day) {
            return Err(CalendarError::Gap { day });
        }
        if !(1..=last).contains(&day) {
            return Err(CalendarError::Day {
                year,
                month,
                day,
                last,
            });
        }
        Ok(CivilDate { year, month, day })
    }

    /// Astronomical year: 0 is 1 BC.
    #[must_use]
    pub const fn year(self) -> i32 {
        self.year
    }

    /// 1 to 12.
    #[must_use]
    pub const fn month(self) -> u8 {
        self.month
    }

    /// 1 to 31.
    #[must_use]
    pub const fn day(self) -> u8 {
        self.day
    }

    /// Whether the date is of the Gregorian calendar; dates before 1582-10-15 are of the Julian.
    #[must_use]
    pub fn is_gregorian(self) -> bool {
        (self.year, self.month, self.day) >= (1582, 10, 15)
    }

    /// The Julian Day Number: the Julian Date at noon of this day.
    #[must_use]
    pub fn julian_day_number(self) -> i32 {
        // Years that begin in March put the leap day last; (153 m + 2)/5 days precede the m-th month after March.
        let after_march = (i32::from(self.month) + 9) % 12;
        let year = self.year - i32::from(self.month < 3);
        let days = 365 * year
            + year.div_euclid(4)
            + (153 * after_march + 2) / 5
            + (i32::from(self.day) - 1);
        if self.is_gregorian() {
            GREGORIAN_MARCH_0 + days - year.div_euclid(100) + year.div_euclid(400)
        } else {
            JULIAN_MARCH_0 + days
        }
    }

    /// The date with this Julian Day Number.
    ///
    /// # Errors
    /// Outside the years -9999 to 9999.
    pub fn from_julian_day_number(number: i32) -> Result<Self, CalendarError> {
        let number = i64::from(number);
        let (century_years, days) = if number >= i64::from(FIRST_GREGORIAN_DAY) {
            let days = number - i64::from(GREGORIAN_MARCH_0);
            let century = (4 * days + 3).div_euclid(146_097);
            (100 * century, days - (146_097 * century).div_euclid(4))
        } else {
            (0, number - i64::from(JULIAN_MARCH_0))
        };
        let year = (4 * days + 3).div_euclid(1461);
        let day_of_year = days - (1461 * year).div_euclid(4);
        let after_march = (5 * day_of_year + 2) / 153;
        let day = day_of_year - (153 * after_march + 2) / 5 + 1;
        let month = (after_march + 2) % 12 + 1;
        let year = century_years + year + i64::from(month < 3);
        match (i32::try_from(year), u8::try_from(month), u8::try_from(day)) {
            (Ok(year), Ok(month), Ok(day)) => CivilDate::new(year, month, day),
            _ => Err(CalendarError::OutOfRange),
        }
    }

    /// Days from J2000 (2000-01-01 12:00) to 0h of this day, in the scale in which the date is reckoned.
    #[must_use]
    pub fn days_at_midnight(self) -> f64 {
        f64::from(self.julian_day_number() - J2000_DAY_NUMBER) - 0.5
    }

    #[must_use]
    pub fn weekday(self) -> Weekday {
        // Day number 0, noon of -4712-01-01, was a Monday.
        match self.julian_day_number().rem_euclid(7) {
            0 => Weekday::Monday,
            1 => Weekday::Tuesday,
            2 => Weekday::Wednesday,
            3 => Weekday::Thursday,
            4 => Weekday::Friday,
            5 => Weekday::Saturday,
            _ => Weekday::Sunday,
        }
    }

    /// 1 for the first of January; days that never were are not counted, so 1582 ends with 355.
    #[must_use]
    pub fn day_of_year(self) -> u16 {
        let january_first = CivilDate {
            year: self.year,
            month: 1,
            day: 1,
        };
        let elapsed = self.julian_day_number() - january_first.julian_day_number();
        u16::try_from(elapsed + 1).unwrap_or_default()
    }

    /// The number of the last day of this date's month, 28 to 31.
    #[must_use]
    pub fn last_day_of_month(self) -> u8 {
        month_length(self.year, self.month)
    }

    /// The date so many days later, or earlier when negative.
    ///
    /// # Errors
    /// Outside the years -9999 to 9999.
    pub fn plus_days(self, days: i32) -> Result<Self, CalendarError> {
        self.julian_day_number()
            .checked_add(days)
            .ok_or(CalendarError::OutOfRange)
            .and_then(CivilDate::from_julian_day_number)
    }

    /// Days from `earlier` to this date; negative when this date is the earlier one.
    #[must_use]
    pub fn days_since(self, earlier: CivilDate) -> i32 {
        self.julian_day_number() - earlier.julian_day_number()
    }

    /// Reads `2026-11-01`, or `2026-11` as the first of that month, or `2026` as the first of that year.
    ///
    /// # Errors
    /// Says what was read and what would work.
    pub fn parse_start(text: &str) -> Result<Self, CalendarError> {
        let unreadable = || CalendarError::PartialDateText {
            text: text.to_owned(),
        };
        let fields = DateFields::read(text.trim()).ok_or_else(unreadable)?;
        CivilDate::new(
            fields.year,
            fields.month.unwrap_or(1),
            fields.day.unwrap_or(1),
        )
    }
}

/// Writes `2026-11-01` or `-0746-02-26`.
impl fmt::Display for CivilDate {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let sign = if self.year < 0 { "-" } else { "" };
        let year = self.year.unsigned_abs();
        f.pad(&format!(
            "{sign}{year:04}-{:02}-{:02}",
            self.month, self.day
        ))
    }
}

/// Reads `2026-11-01` or `-0746-02-26`, all three parts required.
impl FromStr for CivilDate {
    type Err = CalendarError;
    fn from_str(text: &str) -> Result<Self, CalendarError> {
        match DateFields::read(text.trim()) {
            Some(DateFields {
                year,
                month: Some(month),
                day: Some(day),
            }) => CivilDate::new(year, month, day),
            _ => Err(CalendarError::DateText {
                text: text.to_owned(),
            }),
        }
    }
}

impl TryFrom<String> for CivilDate {
    type Error = CalendarError;
    fn try_from(text: String) -> Result<Self, CalendarError> {
        text.parse()
    }
}

impl From<CivilDate> for String {
    fn from(date: CivilDate) -> String {
        date.to_string()
    }
}

/// The number of the last day of a month, 28 to 31.
///
/// # Errors
/// No such year or month.
pub fn days_in_month(year: i32, month: u8) -> Result<u8, CalendarError> {
    if !(FIRST_YEAR..=LAST_YEAR).contains(&year) {
        return Err(CalendarError::Year {
            year: i64::from(year),
        });
    }
    if !(1..=12).contains(&month) {
        return Err(CalendarError::Month { month });
    }
    Ok(month_length(year, month))
}

/// [`days_in_month`] of a month that is known to exist.
fn month_length(year: i32, month: u8) -> u8 {
    let julian_leap = year.rem_euclid(4) == 0;
    let leap =
        julian_leap && (year <= 1582 || year.rem_euclid(100) != 0 || year.rem_euclid(400) == 0);
    match month {
        2 if leap => 29,
        2 => 28,
        4 | 6 | 9 | 11 => 30,
        _ => 31,
    }
}

/// The numbers of a date as written, not yet checked against the calendar.
struct DateFields {
    year: i32,
    month: Option<u8>,
    day: Option<u8>,
}

impl DateFields {
    /// `[+-]YYYY[-MM[-DD]]` and nothing else.
    fn read(text: &str) -> Option<Self> {
        let (sign, unsigned) = match text.strip_prefix(['-', '\u{2212}']) {
            Some(rest) => (-1, rest),
            None => (1, text.strip_prefix('+').unwrap_or(text)),
        };
        let mut parts = unsigned.split('-');
        let year: i32 = digits(parts.next()?, 4)?;
        let month = parts.next().map(|part| digits(part, 2));
        let day = parts.next().map(|part| digits(part, 2));
        if parts.next().is_some() || month == Some(None) || day == Some(None) {
            return None;
        }
        Some(DateFields {
            year: sign * year,
            month: month.flatten(),
            day: day.flatten(),
        })
    }
}

/// A number written with exactly `count` decimal digits.
fn digits<T: FromStr>(text: &str, count: usize) -> Option<T> {
    let well_formed = text.len() == count && text.bytes().all(|byte| byte.is_ascii_digit());
    if well_formed { text.parse().ok() } else { None }
}

/// How finely a clock reading is written; it is rounded, not cut off.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Precision {
    /// `18:30`
    Minute,
    /// `18:30:00`
    Second,
    /// `18:30:00.25` with so many decimals, 6 at most.
    Decimals(u8),
}

impl Precision {
    /// Whole steps in a day.
    fn steps_per_day(self) -> i64 {
        match self {
            Precision::Minute => 1440,
            Precision::Second => 86_400,
            Precision::Decimals(count) => 86_400 * 10_i64.pow(u32::from(count.min(MOST_DECIMALS))),
        }
    }
}

/// A date and the time of day on it, of a scale that its user knows.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct DateTime {
    date: CivilDate,
    second_of_day: f64,
}

impl DateTime {
    /// Checks that `second_of_day` is at least 0 and less than 86400.
    ///
    /// # Errors
    /// [`CalendarError::OutOfRange`].
    pub fn new(date: CivilDate, second_of_day: f64) -> Result<Self, CalendarError> {
        if (0.0..SECONDS_PER_DAY).contains(&second_of_day) {
            Ok(DateTime {
                date,
                second_of_day,
            })
        } else {
            Err(CalendarError::OutOfRange)
        }
    }

    /// From days since J2000 of any scale, such as [`Utc::days`]; exact to the resolution of the argument.
    ///
    /// # Errors
    /// Not a number, or outside the years -9999 to 9999.
    pub fn from_days(days_since_j2000: f64) -> Result<Self, CalendarError> {
        let midnight = (days_since_j2000 + 0.5).floor();
        let date = date_of_midnight(midnight)?;
        // Two steps: the first is exact, and the half day is added without losing digits of a large day count.
        let second_of_day = ((days_since_j2000 - midnight) + 0.5) * SECONDS_PER_DAY;
        if second_of_day < SECONDS_PER_DAY {
            DateTime::new(date, second_of_day.max(0.0))
        } else {
            DateTime::new(date.plus_days(1)?, 0.0)
        }
    }

    #[must_use]
    pub const fn date(self) -> CivilDate {
        self.date
    }

    /// From 0 up to but not including 86400.
    #[must_use]
    pub const fn second_of_day(self) -> f64 {
        self.second_of_day
    }

    /// Days since J2000 of the same scale.
    #[must_use]
    pub fn days(self) -> f64 {
        self.date.days_at_midnight() + self.second_of_day / SECONDS_PER_DAY
    }

    /// ISO 8601 text without zone, rounded: 23:59:59.9 to the second is 00:00:00 of the next day.
    ///
    /// # Errors
    /// When rounding leads beyond the last day of the year 9999.
    pub fn text(self, precision: Precision) -> Result<String, CalendarError> {
        let steps_per_day = precision.steps_per_day();
        // At most 8.64e10 steps: far below the 2^53 up to which every integer is an f64, so the cast is exact.
        let steps = (self.second_of_day / SECONDS_PER_DAY * steps_per_day as f64).round() as i64;
        let date = if steps < steps_per_day {
            self.date
        } else {
            self.date.plus_days(1)?
        };
        let steps = steps % steps_per_day;
        let steps_per_minute = steps_per_day / 1440;
        let (minutes, rest) = (steps / steps_per_minute, steps % steps_per_minute);
        let clock = format!("{date}T{:02}:{:02}", minutes / 60, minutes % 60);
        Ok(match precision {
            Precision::Minute => clock,
            Precision::Second | Precision::Decimals(0) => format!("{clock}:{rest:02}"),
            Precision::Decimals(count) => {
                let width = usize::from(count.min(MOST_DECIMALS));
                let scale = steps_per_minute / 60;
                format!("{clock}:{:02}.{:0width$}", rest / scale, rest % scale)
            }
        })
    }
}

/// The date that begins at this whole number of days after 2000-01-01 0h.
fn date_of_midnight(midnight: f64) -> Result<CivilDate, CalendarError> {
    // Bounds well outside the calendar's years, so that the cast cannot saturate; NaN is not among them.
    if !(-1e8..1e8).contains(&midnight) {
        return Err(CalendarError::OutOfRange);
    }
    CivilDate::from_julian_day_number(midnight as i32 + J2000_DAY_NUMBER)
        .map_err(|_| CalendarError::OutOfRange)
}

/// Writes an instant as `2026-11-01T18:30:00Z`; before 1972, where it is UT1, as `-0746-02-26T12:00:00`.
///
/// # Errors
/// Outside the years -9999 to 9999.
pub fn utc_text(utc: Utc, precision: Precision) -> Result<String, CalendarError> {
    let text = DateTime::from_days(utc.days())?.text(precision)?;
    // A reading that rounds up to 1972 is marked as what it is printed as.
    let zone = if utc < first_utc() && !text.starts_with("1972-") {
        ""
    } else {
        "Z"
    };
    Ok(text + zone)
}

/// Reads `2026-11-01T18:30:00Z`, seconds and their fraction optional; before 1972, as UT1, the same without `Z`.
/// Instead of `Z` an offset such as `+01:00` may stand. A date alone is 0h of that day.
///
/// # Errors
/// Says what was read and what would work.
pub fn parse_utc(text: &str) -> Result<Utc, CalendarError> {
    let trimmed = text.trim();
    let Some((date, clock)) = trimmed.split_once(['T', 't', ' ']) else {
        return Ok(Utc::from_days(
            trimmed.parse::<CivilDate>()?.days_at_midnight(),
        ));
    };
    let unreadable = || CalendarError::TimeText {
        text: text.to_owned(),
    };
    let date: CivilDate = date.parse()?;
    let (clock, offset_minutes) = split_zone(clock).ok_or_else(unreadable)?;
    let second_of_day = read_clock(clock).ok_or_else(unreadable)??;
    match offset_minutes {
        None if date.year() >= FIRST_UTC_YEAR => Err(CalendarError::MissingZ {
            text: text.to_owned(),
        }),
        Some(_) if date.year() < FIRST_UTC_YEAR => Err(CalendarError::UtcBefore1972 {
            text: text.to_owned(),
        }),
        _ => {
            let seconds = second_of_day - 60.0 * f64::from(offset_minutes.unwrap_or(0));
            Ok(Utc::from_days(
                date.days_at_midnight() + seconds / SECONDS_PER_DAY,
            ))
        }
    }
}

/// 1972-01-01 0h.
pub(super) fn first_utc() -> Utc {
    // 10 227 days and a half before 2000-01-01 12h.
    Utc::from_days(-10_227.5)
}

/// Clock and offset east of Greenwich in minutes; no offset where nothing follows the clock.
fn split_zone(text: &str) -> Option<(&str, Option<i32>)> {
    if let Some(clock) = text.strip_suffix(['Z', 'z']) {
        return Some((clock, Some(0)));
    }
    let Some(at) = text.find(['+', '-']) else {
        return Some((text, None));
    };
    let (clock, offset) = text.split_at(at);
    let sign = if offset.starts_with('-') { -1 } else { 1 };
    let (hours, minutes) = offset.get(1..)?.split_once(':')?;
    let (hours, minutes): (i32, i32) = (digits(hours, 2)?, digits(minutes, 2)?);
    let possible = hours <= 14 && minutes <= 59;
    possible.then_some((clock, Some(sign * (60 * hours + minutes))))
}

/// Seconds from `18:30`, `18:30:00` or `18:30:00.25`; `None` when unreadable.
fn read_clock(text: &str) -> Option<Result<f64, CalendarError>> {
    let mut parts = text.splitn(3, ':');
    let hour: u8 = digits(parts.next()?, 2)?;
    let minute: u8 = digits(parts.next()?, 2)?;
    let (second, fraction) = match parts.next() {
        None => (0, 0.0),
        Some(seconds) => {
            let (whole, decimals) = seconds.split_once('.').unwrap_or((seconds, "0"));
            let count = decimals.len();
            let fraction: u32 = digits(decimals, count.clamp(1, 9))?;
            let scale = libm::pow(10.0, f64::from(u8::try_from(count).ok()?));
            (digits(whole, 2)?, f64::from(fraction) / scale)
        }
    };
    Some(if hour > 23 || minute > 59 || second > 59 {
        Err(CalendarError::Clock {
            hour,
            minute,
            second,
        })
    } else {
        Ok(f64::from(hour) * 3600.0 + f64::from(minute) * 60.0 + f64::from(second) + fraction)
    })
}
