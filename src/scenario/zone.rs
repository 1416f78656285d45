//! The clock that people at a site live by. Zones are known here, at the edge, and not in the engine.
//!
//! Either a zone of the IANA database (the copy inside `chrono-tz`), or local mean time: the mean solar time of the
//! site's own longitude, for places and ages without zones. Before 1972 universal time is UT1. IANA zones use the mean
//! time of their reference city before zones were law, and know no summer time from 2100 on ([`Zone::doubt`]).

use std::fmt;
use std::str::FromStr;

use chrono::{MappedLocalTime, NaiveDateTime, Offset, TimeDelta, TimeZone};
use chrono_tz::{OffsetName, TZ_VARIANTS, Tz};
use serde::{Deserialize, Serialize};

use super::nearest::nearest;
use crate::sky::calendar::{CalendarError, CivilDate, DateTime};
use crate::sky::{Angle, Utc};

/// What a scenario writes for [`Zone::LocalMeanTime`].
const LOCAL_MEAN_TIME: &str = "local mean time";
/// Seconds from 1970-01-01 0h to 2000-01-01 12h.
const J2000_UNIX_SECONDS: f64 = 946_728_000.0;
/// Seconds by which a mean clock changes over one degree of longitude.
const SECONDS_PER_DEGREE: f64 = 240.0;
/// Last year whose summer time the zone table holds.
const LAST_SUMMER_TIME_YEAR: i32 = 2099;

/// Civil time of a site.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub enum Zone {
    /// A zone of the IANA database.
    Iana(Tz),
    /// Mean solar time of the site's longitude, to the nearest second.
    LocalMeanTime,
}

/// A word that names no zone.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("zone \"{name}\" is not in the IANA list; {advice}")]
pub struct UnknownZone {
    pub name: String,
    pub advice: String,
}

/// A reading of the local clock.
#[derive(Clone, Debug, PartialEq)]
pub struct LocalTime {
    pub date_time: DateTime,
    /// Local minus universal time in seconds.
    pub offset_seconds: i32,
    /// Such as "CET"; "LMT" for local mean time.
    pub abbreviation: String,
}

impl LocalTime {
    /// The offset as ISO 8601 writes it: `+01:00`, with seconds where it has them.
    #[must_use]
    pub fn offset_text(&self) -> String {
        let sign = if self.offset_seconds < 0 { '-' } else { '+' };
        let seconds = self.offset_seconds.unsigned_abs();
        let (hours, minutes, seconds) = (seconds / 3600, seconds / 60 % 60, seconds % 60);
        if seconds == 0 {
            format!("{sign}{hours:02}:{minutes:02}")
        } else {
            format!("{sign}{hours:02}:{minutes:02}:{seconds:02}")
        }
    }
}

impl Zone {
    /// As written in a scenario: `Europe/Berlin` or `local mean time`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Zone::Iana(zone) => zone.name(),
            Zone::LocalMeanTime => LOCAL_MEAN_TIME,
        }
    }

    /// The local clock at an instant, at a site of this longitude.
    ///
    /// # Errors
    /// The instant lies outside the calendar's years.
    pub fn local_from_utc(self, longitude: Angle, utc: Utc) -> Result<LocalTime, CalendarError> {
        let (offset_seconds, abbreviation) = match self {
            Zone::Iana(zone) => {
                let offset = zone.offset_from_utc_datetime(&naive(utc.days())?);
                let abbreviation = offset.abbreviation().unwrap_or_default().to_owned();
                (offset.fix().local_minus_utc(), abbreviation)
            }
            Zone::LocalMeanTime => (mean_offset_seconds(longitude), "LMT".to_owned()),
        };
        let local = utc.plus_seconds(f64::from(offset_seconds));
        Ok(LocalTime {
            date_time: DateTime::from_days(local.days())?,
            offset_seconds,
            abbreviation,
        })
    }

    /// The instant of a local clock reading. A reading that comes twice when clocks go back means the first; one that
    /// is skipped when they go forward means as long after the change as it stands after the skip's beginning.
    ///
    /// # Errors
    /// The reading lies outside the calendar's years.
    pub fn utc_from_local(self, longitude: Angle, local: DateTime) -> Result<Utc, CalendarError> {
        let offset_seconds = match self {
            Zone::Iana(zone) => {
                let clock = naive(local.days())?;
                match zone.offset_from_local_datetime(&clock) {
                    MappedLocalTime::Single(offset) | MappedLocalTime::Ambiguous(offset, _) => {
                        offset.fix().local_minus_utc()
                    }
                    // The offset before the skip; no skip is longer than a day.
                    MappedLocalTime::None => clock
                        .checked_sub_signed(TimeDelta::days(1))
                        .and_then(|before| zone.offset_from_local_datetime(&before).earliest())
                        .ok_or(CalendarError::OutOfRange)?
                        .fix()
                        .local_minus_utc(),
                }
            }
            Zone::LocalMeanTime => mean_offset_seconds(longitude),
        };
        Ok(Utc::from_days(local.days()).plus_seconds(-f64::from(offset_seconds)))
    }

    /// The instant at which a civil date begins.
    ///
    /// # Errors
    /// Outside the calendar's years.
    pub fn start_of_day(self, longitude: Angle, date: CivilDate) -> Result<Utc, CalendarError> {
        self.utc_from_local(longitude, DateTime::new(date, 0.0)?)
    }

    /// Why local times of that year may be wrong, in a sentence; `None` where nothing is known against them.
    #[must_use]
    pub fn doubt(self, year: i32) -> Option<&'static str> {
        match self {
            Zone::Iana(_) if year > LAST_SUMMER_TIME_YEAR => Some(
                "no summer time is known beyond 2099: local times may be an hour early from spring to autumn",
            ),
            _ => None,
        }
    }
}

/// The same count of days as chrono's date and time, to the second.
fn naive(days_since_j2000: f64) -> Result<NaiveDateTime, CalendarError> {
    let seconds =
        (days_since_j2000 * crate::sky::time::SECONDS_PER_DAY + J2000_UNIX_SECONDS).round();
    // Within 100 000 years of 1970 the cast is exact; NaN is not among them.
    if !(-3.2e12..3.2e12).contains(&seconds) {
        return Err(CalendarError::OutOfRange);
    }
    chrono::DateTime::from_timestamp(seconds as i64, 0)
        .map(|instant| instant.naive_utc())
        .ok_or(CalendarError::OutOfRange)
}

/// Local mean time minus universal time, to the nearest second; within half a day either way.
fn mean_offset_seconds(longitude: Angle) -> i32 {
    (longitude.signed().degrees() * SECONDS_PER_DEGREE).round() as i32
}

impl fmt::Display for Zone {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.name())
    }
}

impl FromStr for Zone {
    type Err = UnknownZone;
    fn from_str(name: &str) -> Result<Self, UnknownZone> {
        if name == LOCAL_MEAN_TIME {
            return Ok(Zone::LocalMeanTime);
        }
        name.parse().map(Zone::Iana).map_err(|_| {
            let names = TZ_VARIANTS.iter().map(|zone| zone.name());
            let near = nearest(name, names.chain([LOCAL_MEAN_TIME]), 3);
            let advice = if near.is_empty() {
                format!(
                    "use a name such as Europe/Berlin, UTC, or \"{LOCAL_MEAN_TIME}\" for the mean solar time of the site"
                )
            } else {
                format!("did you mean {}?", near.join(", "))
            };
            UnknownZone {
                name: name.chars().take(64).collect(),
                advice,
            }
        })
    }
}

impl TryFrom<String> for Zone {
    type Error = UnknownZone;
    fn try_from(name: String) -> Result<Self, UnknownZone> {
        name.parse()
    }
}

impl From<Zone> for String {
    fn from(zone: Zone) -> String {
        zone.name().to_owned()
    }
}
