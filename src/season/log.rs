//! The log: what became of each night.
//!
//! One entry a night. Nights are named by the civil date of their evening at the site; the time taken is UTC. Plain
//! values that the scenario keeps on disk: `(night: "2027-02-11", outcome: shot, at: "2027-02-11T21:40:00Z")`.

use serde::{Deserialize, Deserializer, Serialize, Serializer};

use super::weather::{KnownSky, SkyState};
use crate::sky::calendar::{CivilDate, Precision, parse_utc, utc_text};
use crate::sky::{Angle, Utc};

/// A log that cannot be.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum LogError {
    #[error(
        "the log has two entries for the night of {night}; keep one (put the other's words into its remark)"
    )]
    TwoEntries { night: CivilDate },
    #[error("the night of {night} is already logged as {word}; say so if it is to be replaced")]
    AlreadyLogged {
        night: CivilDate,
        word: &'static str,
    },
    #[error("the log has {night}, which is outside the season, {from} to {to}")]
    OutsideSeason {
        night: CivilDate,
        from: CivilDate,
        to: CivilDate,
    },
    #[error(
        "the night of {night} is logged as {word}, but today is {today}: only planned and reserve lie ahead"
    )]
    NotYet {
        night: CivilDate,
        word: &'static str,
        today: CivilDate,
    },
    #[error(
        "the night of {night}: {at} is not in that night, which runs from noon to noon, local mean time"
    )]
    TimeOffNight { night: CivilDate, at: String },
    #[error("the night of {night}: an exposure of {seconds} s cannot be; give seconds above 0")]
    Exposure { night: CivilDate, seconds: f64 },
    #[error(
        "\"{text}\" is no word of the log; use one of planned, reserve, shot, partly_shot, held, clouded, skipped"
    )]
    Word { text: String },
}

/// What became of a night, or what it is meant for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Outcome {
    /// A pick that lies ahead.
    Planned,
    /// Stands in for a clouded pick.
    Reserve,
    /// The frame is taken.
    Shot,
    /// Fewer frames than wanted, but the subject's place is on record: counts as a frame on the path and as clear.
    PartlyShot,
    /// An evening with an audience that took place: fills its section and was clear, but left no frame.
    Held,
    /// Went out, or meant to, and lost it to cloud.
    Clouded,
    /// Stayed at home; nothing is known of the sky.
    Skipped,
}

impl Outcome {
    pub const ALL: [Outcome; 7] = [
        Outcome::Planned,
        Outcome::Reserve,
        Outcome::Shot,
        Outcome::PartlyShot,
        Outcome::Held,
        Outcome::Clouded,
        Outcome::Skipped,
    ];

    /// The word used in tables and on the command line.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Outcome::Planned => "planned",
            Outcome::Reserve => "reserve",
            Outcome::Shot => "shot",
            Outcome::PartlyShot => "partly_shot",
            Outcome::Held => "held",
            Outcome::Clouded => "clouded",
            Outcome::Skipped => "skipped",
        }
    }

    /// Reads a word of the command line.
    ///
    /// # Errors
    /// Lists the words there are.
    pub fn from_word(text: &str) -> Result<Outcome, LogError> {
        Outcome::ALL
            .into_iter()
            .find(|outcome| outcome.word() == text)
            .ok_or_else(|| LogError::Word {
                text: text.to_owned(),
            })
    }

    /// Whether the night is over; planned and reserve lie ahead.
    #[must_use]
    pub const fn is_over(self) -> bool {
        !matches!(self, Outcome::Planned | Outcome::Reserve)
    }

    /// What it tells of the sky.
    #[must_use]
    pub const fn sky(self) -> Option<SkyState> {
        match self {
            Outcome::Shot | Outcome::PartlyShot | Outcome::Held => Some(SkyState::Clear),
            Outcome::Clouded => Some(SkyState::Cloud),
            Outcome::Planned | Outcome::Reserve | Outcome::Skipped => None,
        }
    }

    /// Whether the path has a frame from this night.
    #[must_use]
    pub const fn gives_frame(self) -> bool {
        matches!(self, Outcome::Shot | Outcome::PartlyShot)
    }

    /// Whether the section of the path that the night belongs to is filled.
    #[must_use]
    pub const fn fills_section(self) -> bool {
        matches!(self, Outcome::Shot | Outcome::PartlyShot | Outcome::Held)
    }

    /// Whether it took an outing from the budget.
    #[must_use]
    pub const fn used_outing(self) -> bool {
        self.sky().is_some()
    }
}

/// One night.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LogEntry {
    pub night: CivilDate,
    pub outcome: Outcome,
    /// Middle of the exposure or start of the evening.
    #[serde(
        default,
        skip_serializing_if = "Option::is_none",
        serialize_with = "write_utc",
        deserialize_with = "read_utc"
    )]
    pub at: Option<Utc>,
    /// Seconds, above 0.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub exposure_s: Option<f64>,
    /// Name of the picture's file; never opened.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub file: Option<String>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub remark: Option<String>,
}

fn write_utc<S: Serializer>(at: &Option<Utc>, serializer: S) -> Result<S::Ok, S::Error> {
    match at {
        Some(utc) => serializer
            .serialize_some(&utc_text(*utc, Precision::Second).map_err(serde::ser::Error::custom)?),
        None => serializer.serialize_none(),
    }
}

fn read_utc<'de, D: Deserializer<'de>>(deserializer: D) -> Result<Option<Utc>, D::Error> {
    let text = Option::<String>::deserialize(deserializer)?;
    text.map(|text| parse_utc(&text))
        .transpose()
        .map_err(serde::de::Error::custom)
}

impl LogEntry {
    #[must_use]
    pub const fn new(night: CivilDate, outcome: Outcome) -> Self {
        LogEntry {
            night,
            outcome,
            at: None,
            exposure_s: None,
            file: None,
            remark: None,
        }
    }
}

/// The entries in order of their nights, no night twice.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "Vec<LogEntry>", into = "Vec<LogEntry>")]
pub struct Log(Vec<LogEntry>);

impl TryFrom<Vec<LogEntry>> for Log {
    type Error = LogError;
    fn try_from(entries: Vec<LogEntry>) -> Result<Self, LogError> {
        Log::new(entries)
    }
}

impl From<Log> for Vec<LogEntry> {
    fn from(log: Log) -> Vec<LogEntry> {
        log.0
    }
}

impl Log {
    /// Sorts and checks.
    ///
    /// # Errors
    /// Two entries for one night; an exposure that cannot be.
    pub fn new(mut entries: Vec<LogEntry>) -> Result<Self, LogError> {
        entries.sort_by_key(|entry| entry.night);
        for pair in entries.windows(2) {
            if let [first, second] = pair
                && first.night == second.night
            {
                return Err(LogError::TwoEntries { night: first.night });
            }
        }
        for entry in &entries {
            check_exposure(entry)?;
        }
        Ok(Log(entries))
    }

    #[must_use]
    pub fn entries(&self) -> &[LogEntry] {
        &self.0
    }

    /// Adds what became of a night, in place of an entry that only planned it; of any entry when `replace` is set.
    ///
    /// # Errors
    /// The night already has an outcome; an exposure that cannot be.
    pub fn record(&mut self, entry: LogEntry, replace: bool) -> Result<(), LogError> {
        check_exposure(&entry)?;
        match self
            .0
            .binary_search_by_key(&entry.night, |entry| entry.night)
        {
            Err(place) => self.0.insert(place, entry),
            Ok(place) => {
                if let Some(old) = self.0.get_mut(place) {
                    if old.outcome.is_over() && !replace {
                        return Err(LogError::AlreadyLogged {
                            night: old.night,
                            word: old.outcome.word(),
                        });
                    }
                    *old = entry;
                }
            }
        }
        Ok(())
    }

    /// Every night must lie in the season, both ends included.
    ///
    /// # Errors
    /// Names the first night outside.
    pub fn check_season(&self, from: CivilDate, to: CivilDate) -> Result<(), LogError> {
        match self
            .0
            .iter()
            .find(|entry| entry.night < from || entry.night > to)
        {
            Some(entry) => Err(LogError::OutsideSeason {
                night: entry.night,
                from,
                to,
            }),
            None => Ok(()),
        }
    }

    /// Nights after `today` can only be planned or reserve.
    ///
    /// # Errors
    /// Names the first that claims more.
    pub fn check_today(&self, today: CivilDate) -> Result<(), LogError> {
        match self
            .0
            .iter()
            .find(|entry| entry.night > today && entry.outcome.is_over())
        {
            Some(entry) => Err(LogError::NotYet {
                night: entry.night,
                word: entry.outcome.word(),
                today,
            }),
            None => Ok(()),
        }
    }

    /// Every time must lie in its night, the 24 hours from local mean noon; longitude east positive.
    ///
    /// # Errors
    /// Names the first that does not.
    pub fn check_times(&self, longitude: Angle) -> Result<(), LogError> {
        for entry in &self.0 {
            let Some(at) = entry.at else { continue };
            let noon = entry.night.days_at_midnight() + 0.5 - longitude.signed().degrees() / 360.0;
            if !(noon..noon + 1.0).contains(&at.days()) {
                let at = utc_text(at, Precision::Second).unwrap_or_else(|_| "that time".to_owned());
                return Err(LogError::TimeOffNight {
                    night: entry.night,
                    at,
                });
            }
        }
        Ok(())
    }

    /// Nights before `today` whose weather is known, in order.
    #[must_use]
    pub fn known_skies(&self, today: CivilDate) -> Vec<KnownSky> {
        self.0
            .iter()
            .filter(|entry| entry.night < today)
            .filter_map(|entry| {
                Some(KnownSky {
                    night: entry.night,
                    sky: entry.outcome.sky()?,
                })
            })
            .collect()
    }

    /// The first night still open at `today`: the next one when today itself has its outcome.
    #[must_use]
    pub fn first_open_night(&self, today: CivilDate) -> CivilDate {
        let is_over = self
            .0
            .iter()
            .any(|entry| entry.night == today && entry.outcome.is_over());
        if is_over {
            today.plus_days(1).unwrap_or(today)
        } else {
            today
        }
    }

    /// Outings taken.
    #[must_use]
    pub fn outings(&self) -> usize {
        self.0
            .iter()
            .filter(|entry| entry.outcome.used_outing())
            .count()
    }
}

fn check_exposure(entry: &LogEntry) -> Result<(), LogError> {
    match entry.exposure_s {
        Some(seconds) if !(seconds > 0.0 && seconds.is_finite()) => Err(LogError::Exposure {
            night: entry.night,
            seconds,
        }),
        _ => Ok(()),
    }
}
