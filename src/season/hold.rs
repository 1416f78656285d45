//! Stepping time while something stays still: the clock on the wall, the Sun's altitude, or the stars.
//!
//! A step of days is one of the held kind: civil days, days from one Sun to the next, or turns of the Earth among the
//! stars. Steps shorter than a day are plain elapsed time under every hold, as nothing could be held.
//!
//! Steps are counted from an [`Anchor`], not from the last answer: what was held at the anchor is held on every day, so
//! that a night on which it is impossible (a clock reading skipped in spring, an altitude that the polar Sun does not reach)
//! leaves no trace on the days after it.
//!
//! - **Clock**: the civil clock of the zone handed in, so that 21:30 stays 21:30 when clocks change. A reading that comes
//!   twice means the first; one that is skipped means as long after the change as it stands after the skip's beginning.
//! - **Sun**: the true altitude of the Sun's centre and its side (towards noon or away from it), to 0.0005 degrees.
//! - **Stars**: the Earth rotation angle (IAU 2000): a day of 86 164.0989 s of UT1, against which star altitudes stay but
//!   for precession of the pole (20" a year at most) and aberration (20").

use std::fmt;
use std::str::FromStr;

use super::search::{minimum, root};
use crate::sky::place::{Sky, SkyError};
use crate::sky::time::SECONDS_PER_DAY;
use crate::sky::{Angle, Body, Site, Tt, Ut1, Utc};

/// What stays still while days pass.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Hold {
    #[default]
    Clock,
    Sun,
    Stars,
}

impl Hold {
    pub const ALL: [Hold; 3] = [Hold::Clock, Hold::Sun, Hold::Stars];

    /// As in "hold the clock".
    #[must_use]
    pub const fn phrase(self) -> &'static str {
        match self {
            Hold::Clock => "the clock",
            Hold::Sun => "the Sun's altitude",
            Hold::Stars => "the stars",
        }
    }
}

/// A step of time as the user types it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Step {
    /// Seconds of elapsed time, more than 0.
    Elapsed(f64),
    /// Days of the kind that is held, at least 1.
    Days(u32),
}

/// The longest step: three years.
const MOST_DAYS: f64 = 1100.0;

/// Units by their words, with their length in seconds or in days.
const SHORT_UNITS: [(&[&str], f64); 3] = [
    (&["s", "sec", "second", "seconds"], 1.0),
    (&["min", "mins", "minute", "minutes"], 60.0),
    (&["h", "hr", "hrs", "hour", "hours"], 3600.0),
];
const LONG_UNITS: [(&[&str], f64); 2] =
    [(&["d", "day", "days"], 1.0), (&["week", "weeks", "w"], 7.0)];

/// Why a text is no step.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum StepError {
    #[error("a step is a number and a unit, as in 10 min, 1 h or 5 days")]
    Empty,
    #[error("\"{0}\" does not begin with a number: write a step as 10 min, 1 h or 5 days")]
    NoNumber(String),
    #[error("\"{0}\" has a comma: write decimals with a point, as in 1.5 h")]
    Comma(String),
    #[error("{0} of what? add a unit: s, min, h, days or weeks")]
    NoUnit(String),
    #[error("\"{0}\" is not a unit of time here: use s, min, h, days or weeks")]
    UnknownUnit(String),
    #[error(
        "{0} days: a step of days holds something from day to day and needs a whole number; for part of a day use hours"
    )]
    PartOfDay(f64),
    #[error(
        "a step of {0} is out of range: from 1 s to {MOST_DAYS} days; its direction is chosen when stepping"
    )]
    OutOfRange(String),
}

impl FromStr for Step {
    type Err = StepError;

    fn from_str(text: &str) -> Result<Self, StepError> {
        let text = text.trim();
        if text.is_empty() {
            return Err(StepError::Empty);
        }
        let shown = || -> String { text.chars().take(40).collect() };
        let end = text
            .find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | '+' | '-' | '\u{2212}')))
            .unwrap_or(text.len());
        let (number, unit) = text.split_at(end);
        if unit.starts_with(',') {
            return Err(StepError::Comma(shown()));
        }
        let number: f64 = number
            .replace('\u{2212}', "-")
            .parse()
            .map_err(|_| StepError::NoNumber(shown()))?;
        let unit = unit.trim();
        if unit.is_empty() {
            return Err(StepError::NoUnit(shown()));
        }
        let named = |units: &[(&[&str], f64)]| {
            units
                .iter()
                .find(|(words, _)| words.iter().any(|word| word.eq_ignore_ascii_case(unit)))
                .map(|(_, length)| number * length)
        };
        if let Some(seconds) = named(&SHORT_UNITS) {
            return if (1.0..=MOST_DAYS * SECONDS_PER_DAY).contains(&seconds) {
                Ok(Step::Elapsed(seconds))
            } else {
                Err(StepError::OutOfRange(shown()))
            };
        }
        let Some(days) = named(&LONG_UNITS) else {
            return Err(StepError::UnknownUnit(unit.chars().take(40).collect()));
        };
        if days.fract() != 0.0 {
            return Err(StepError::PartOfDay(days));
        }
        if (1.0..=MOST_DAYS).contains(&days) {
            // Whole and in range.
            Ok(Step::Days(days as u32))
        } else {
            Err(StepError::OutOfRange(shown()))
        }
    }
}

/// Writes what [`FromStr`] reads: `10 min`, `1.5 h`, `1 day`, `5 days`.
impl fmt::Display for Step {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match *self {
            Step::Days(1) => f.write_str("1 day"),
            Step::Days(days) => write!(f, "{days} days"),
            Step::Elapsed(seconds) => {
                let quarter_hours = seconds / 900.0;
                if seconds >= 3600.0 && quarter_hours.fract() == 0.0 {
                    write!(f, "{} h", seconds / 3600.0)
                } else if (seconds / 60.0).fract() == 0.0 {
                    write!(f, "{} min", seconds / 60.0)
                } else {
                    write!(f, "{seconds} s")
                }
            }
        }
    }
}

/// Local minus universal time in seconds at an instant; `None` beyond the calendar.
pub type ZoneOffset<'a> = &'a dyn Fn(Utc) -> Option<f64>;

/// Where time is stepped.
#[derive(Clone, Copy)]
pub struct Stepper<'a> {
    pub sky: &'a Sky,
    pub site: &'a Site,
    pub zone_offset: ZoneOffset<'a>,
}

/// Why a step leads nowhere.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum HoldError {
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error(
        "the local clock is not known there: step within the years of the calendar, or hold the Sun or the stars"
    )]
    BeyondCalendar,
}

/// What could not be kept.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Missed {
    /// Clocks skip this reading on this day.
    ClockReading,
    /// The Sun does not come to the altitude on this day; the nearest is taken.
    SunAltitude { wanted: Angle, nearest: Angle },
}

impl fmt::Display for Missed {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Missed::ClockReading => f.write_str(
                "clocks go forward over this time tonight: shown as long after the change",
            ),
            Missed::SunAltitude { wanted, nearest } => {
                let degrees =
                    |angle: Angle| format!("{:.1}\u{b0}", angle.degrees()).replace('-', "\u{2212}");
                let verb = if nearest < wanted {
                    "rises only to"
                } else {
                    "sinks only to"
                };
                write!(
                    f,
                    "the Sun {verb} {} on this day, {} is held",
                    degrees(*nearest),
                    degrees(*wanted)
                )
            }
        }
    }
}

/// Where a step led.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stepped {
    pub instant: Tt,
    /// `None` where everything was kept.
    pub missed: Option<Missed>,
}

/// The instant from which days are counted, with what is held.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Anchor {
    pub instant: Tt,
    kept: Kept,
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Kept {
    /// Days of the local clock since 2000-01-01 12:00 on it, and its offset.
    Clock {
        local_days: f64,
        offset_seconds: f64,
    },
    /// The Sun's transit nearest to the anchor.
    Sun {
        altitude: Angle,
        is_rising: bool,
        noon: Tt,
    },
    Stars(Ut1),
}

/// One turn of the Earth among the stars in days of UT1: 1/1.00273781191135448 (IAU 2000 resolution B1.8).
const STELLAR_DAY: f64 = 1.0 / 1.002_737_811_911_354_5;

impl Anchor {
    /// Holds something from an instant on.
    ///
    /// # Errors
    /// An instant that the sky or the calendar does not cover.
    pub fn new(stepper: &Stepper<'_>, instant: Tt, hold: Hold) -> Result<Self, HoldError> {
        let tables = stepper.sky.tables();
        let kept = match hold {
            Hold::Clock => {
                let utc = tables.utc_from_tt(instant);
                let offset_seconds = (stepper.zone_offset)(utc).ok_or(HoldError::BeyondCalendar)?;
                Kept::Clock {
                    local_days: utc.plus_seconds(offset_seconds).days(),
                    offset_seconds,
                }
            }
            Hold::Sun => {
                let (altitude, hour_angle) = stepper.sun(instant.days())?;
                Kept::Sun {
                    altitude: Angle::from_radians(altitude),
                    is_rising: hour_angle < 0.0,
                    noon: Tt::from_days(stepper.noon(instant.days())?),
                }
            }
            Hold::Stars => Kept::Stars(tables.ut1_from_tt(instant)),
        };
        Ok(Anchor { instant, kept })
    }

    #[must_use]
    pub const fn hold(&self) -> Hold {
        match self.kept {
            Kept::Clock { .. } => Hold::Clock,
            Kept::Sun { .. } => Hold::Sun,
            Kept::Stars(_) => Hold::Stars,
        }
    }

    /// The instant so many held days after the anchor (before it where negative); 0 is the anchor itself.
    ///
    /// # Errors
    /// An instant that the sky or the calendar does not cover.
    pub fn after(&self, stepper: &Stepper<'_>, days: i32) -> Result<Stepped, HoldError> {
        if days == 0 {
            return Ok(Stepped {
                instant: self.instant,
                missed: None,
            });
        }
        let tables = stepper.sky.tables();
        let count = f64::from(days);
        match self.kept {
            Kept::Clock {
                local_days,
                offset_seconds,
            } => {
                let wall = local_days + count;
                let (utc, is_skipped) = stepper
                    .utc_of_wall(wall, offset_seconds)
                    .ok_or(HoldError::BeyondCalendar)?;
                Ok(Stepped {
                    instant: tables.tt_from_utc(utc),
                    missed: is_skipped.then_some(Missed::ClockReading),
                })
            }
            Kept::Sun {
                altitude,
                is_rising,
                noon,
            } => stepper.sun_at(altitude, is_rising, noon.days() + count),
            Kept::Stars(ut1) => Ok(Stepped {
                instant: tables.tt_from_ut1(ut1.plus_days(count * STELLAR_DAY)),
                missed: None,
            }),
        }
    }
}

impl Stepper<'_> {
    /// The instant of a reading of the wall clock, and whether clocks skip it.
    fn utc_of_wall(&self, wall_days: f64, usual_offset: f64) -> Option<(Utc, bool)> {
        let wall = Utc::from_days(wall_days);
        // The offsets on either side: no clock is changed twice within two days.
        let before = (self.zone_offset)(wall.plus_seconds(-usual_offset).plus_days(-1.0))?;
        let after = (self.zone_offset)(wall.plus_seconds(-usual_offset).plus_days(1.0))?;
        // The first of two readings is the one by the earlier offset.
        for offset in [before, after] {
            let utc = wall.plus_seconds(-offset);
            if (self.zone_offset)(utc)? == offset {
                return Some((utc, false));
            }
        }
        Some((wall.plus_seconds(-before), true))
    }

    /// True altitude and hour angle (west positive) of the Sun's centre, radians.
    fn sun(&self, days: f64) -> Result<(f64, f64), SkyError> {
        let vantage = self.sky.observer(self.site, Tt::from_days(days))?;
        let sun = vantage.place(Body::Sun)?;
        // A site has a horizon.
        let sine = vantage.sine_of_altitude(sun.apparent).unwrap_or(0.0);
        let hour_angle = vantage.hour_angle(&sun).unwrap_or(Angle::ZERO);
        Ok((libm::asin(sine.clamp(-1.0, 1.0)), hour_angle.radians()))
    }

    /// The Sun's upper transit nearest to an instant.
    fn noon(&self, mut days: f64) -> Result<f64, SkyError> {
        // The hour angle grows by a turn a day but for 30 s, so that each round gains three digits.
        for _ in 0..4 {
            days -= self.sun(days)?.1 / std::f64::consts::TAU;
        }
        Ok(days)
    }

    /// The Sun at an altitude before or after the noon nearest to `near_noon`.
    fn sun_at(&self, wanted: Angle, is_rising: bool, near_noon: f64) -> Result<Stepped, HoldError> {
        /// 0.04 s, in which the Sun climbs by at most 0.0002 degrees.
        const TOLERANCE_DAYS: f64 = 5e-7;
        let noon = self.noon(near_noon)?;
        let midnight = noon + if is_rising { -0.5 } else { 0.5 };
        let over = |days: f64| Ok::<_, SkyError>(self.sun(days)?.0 - wanted.radians());
        let mut high = (noon, over(noon)?);
        let mut low = (midnight, over(midnight)?);
        // Highest and lowest are not quite at the transits, as the declination changes; near a pole not even nearly.
        const REACH_DAYS: f64 = 0.25;
        if high.1 < 0.0 {
            let fall = |days: f64| Ok::<_, SkyError>(-over(days)?);
            let (days, value) = minimum(
                noon - REACH_DAYS,
                (noon, -high.1),
                noon + REACH_DAYS,
                1e-5,
                fall,
            )?;
            high = (days, -value);
        }
        if low.1 >= 0.0 {
            low = minimum(
                midnight - REACH_DAYS,
                low,
                midnight + REACH_DAYS,
                1e-5,
                over,
            )?;
        }
        let nearest = if high.1 < 0.0 {
            high
        } else if low.1 >= 0.0 {
            low
        } else {
            let days = root(low, high, TOLERANCE_DAYS, over)?;
            return Ok(Stepped {
                instant: Tt::from_days(days),
                missed: None,
            });
        };
        let instant = Tt::from_days(nearest.0);
        let nearest = wanted + Angle::from_radians(nearest.1);
        // An altitude held at the turning point itself is kept, though the search falls short of it by its tolerance.
        let kept = (nearest - wanted).abs() < Angle::from_degrees(0.001);
        Ok(Stepped {
            instant,
            missed: (!kept).then_some(Missed::SunAltitude { wanted, nearest }),
        })
    }
}
