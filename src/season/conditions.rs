//! What a user asks of a night: the conditions that a stretch of it must meet to be worth anything.
//!
//! Plain values in the units of [`Angle`]; nothing is evaluated here. Altitudes of the subject are apparent (refracted),
//! the Sun's is the true altitude of its centre. The defaults are for an audience with bare eyes: common practice, no
//! source.

use crate::sky::Angle;
use crate::sky::calendar::Weekday;

/// Every condition holds at once; each names itself when it ends a spell.
#[derive(Clone, Debug, PartialEq)]
pub struct Conditions {
    /// Least apparent altitude of the subject.
    pub least_altitude: Angle,
    /// Least height of the subject above the skyline, apparent.
    pub clearance: Angle,
    /// The true altitude of the Sun's centre is this or lower.
    pub sun_below: Angle,
    /// `None`: the Moon never closes a night.
    pub moon: Option<MoonRule>,
    /// `None`: every hour.
    pub hours: Option<Hours>,
    /// Days on which nights may begin.
    pub weekdays: Weekdays,
}

impl Default for Conditions {
    fn default() -> Self {
        Conditions {
            least_altitude: Angle::from_degrees(10.0),
            clearance: Angle::ZERO,
            sun_below: Angle::from_degrees(-6.0),
            moon: Some(MoonRule::default()),
            hours: None,
            weekdays: Weekdays::ALL,
        }
    }
}

/// Passes when the Moon is down, or at least so far from the subject, or less lit than a fraction.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MoonRule {
    /// Least angle between Moon and subject.
    pub least_distance: Angle,
    /// A Moon with a smaller lit fraction (0 to 1) does no harm at any distance; 0 makes no exception.
    pub unless_lit_below: f64,
}

impl Default for MoonRule {
    fn default() -> Self {
        MoonRule {
            least_distance: Angle::from_degrees(3.0),
            unless_lit_below: 0.0,
        }
    }
}

/// A half-open stretch of the local clock; where `to` is earlier than `from` it passes midnight.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Hours {
    pub from: ClockTime,
    pub to: ClockTime,
}

impl Hours {
    /// Whether the clock reading lies in the stretch.
    #[must_use]
    pub fn contains(self, clock: ClockTime) -> bool {
        if self.from <= self.to {
            self.from <= clock && clock < self.to
        } else {
            self.from <= clock || clock < self.to
        }
    }
}

/// A reading of the local clock in whole minutes, 00:00 to 24:00.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct ClockTime(u16);

impl ClockTime {
    /// `None` beyond 24:00 or for more than 59 minutes.
    #[must_use]
    pub fn new(hour: u8, minute: u8) -> Option<Self> {
        let minutes = 60 * u16::from(hour) + u16::from(minute);
        (minute < 60 && minutes <= 1440).then_some(ClockTime(minutes))
    }

    /// Minutes since 00:00, at most 1440.
    #[must_use]
    pub const fn minutes(self) -> u16 {
        self.0
    }
}

/// Writes `18:30`.
impl std::fmt::Display for ClockTime {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.pad(&format!("{:02}:{:02}", self.0 / 60, self.0 % 60))
    }
}

/// A set of days of the week, never empty: the civil days on whose evenings nights begin.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Weekdays(u8);

impl Weekdays {
    pub const ALL: Weekdays = Weekdays(0b111_1111);

    /// `None` when no day is given.
    #[must_use]
    pub fn from_days(days: &[Weekday]) -> Option<Self> {
        let set = days.iter().fold(0, |set, day| set | (1 << *day as u8));
        (set != 0).then_some(Weekdays(set))
    }

    #[must_use]
    pub fn contains(self, day: Weekday) -> bool {
        self.0 & (1 << day as u8) != 0
    }

    /// The days of the set, from Monday on.
    pub fn iter(self) -> impl Iterator<Item = Weekday> {
        Weekday::ALL
            .into_iter()
            .filter(move |day| self.contains(*day))
    }
}
