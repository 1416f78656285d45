//! The document: one RON file that holds a season's place, skyline, subject, span and conditions.
//!
//! [`Scenario`] is the finished value: every default settled, every part in the type of the layer that uses it. What stands
//! on disk is a struct per version ([`version`] says how the format grows without breaking old files), read with the
//! line and column of every mistake. Angles in the file are degrees, other units stand in the field's name; dates are civil
//! dates of the site's zone, Julian before 1582-10-15, years signed and astronomical (`0139-03-01`, `-0746-02-26`; 0 is
//! 1 BC). Comments are lost when a scenario is saved; notes go into fields named `remark`, and the first save over a file
//! written by hand keeps it as `.bak`.

mod checked;
mod error;
pub mod files;
mod nearest;
pub mod outings;
mod plan;
pub mod programme;
mod skyline;
mod v1;
pub mod version;
mod zone;

use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

pub use checked::{NotOneLine, OutOfRange};
pub use error::ScenarioError;
use files::FileError;
pub use outings::{Camera, PickSettings};
pub use plan::{Plan, PlanError};
pub use skyline::{SkylineError, SkylineOrigin, SkylineSource};
pub use version::NEWEST_VERSION;
pub use zone::{LocalTime, UnknownZone, Zone};

use crate::season::log::Log;
use crate::season::purposes::Purpose;
use crate::season::weather::Weather;
use crate::season::{Conditions, Span};
use crate::sky::calendar::CivilDate;
use crate::sky::delta_t::TimeTables;
use crate::sky::refraction::Air;
use crate::sky::{Angle, Body, Site};

/// The scenario that the program carries.
const EMBEDDED: &str = include_str!("../../scenarios/mars-loop-2026.ron");
const EMBEDDED_NAME: &str = "the embedded scenario";
/// A larger file is refused before it is read.
const SIZE_LIMIT: u64 = 4 << 20;
/// Our choice: within this angle of the Sun, readings by day carry the caution.
pub const DEFAULT_SUN_DISTANCE: Angle = Angle::from_degrees(20.0);

/// A season's document, ready to be planned.
#[derive(Clone, Debug, PartialEq)]
pub struct Scenario {
    /// One line.
    pub title: String,
    /// A planet, Mercury to Neptune.
    pub subject: Body,
    /// Other bodies drawn with it: not the Sun, not the subject, none twice.
    pub companions: Vec<Body>,
    /// `None`: the next season of the subject.
    pub season: Option<SeasonDates>,
    pub site: Site,
    /// The clock at the site.
    pub zone: Zone,
    pub skyline: SkylineSource,
    pub conditions: Conditions,
    /// While the Sun is up and nearer to the subject than this, everything said carries the caution.
    pub sun_distance: Angle,
    /// What nights are judged by.
    pub purpose: Purpose,
    /// Odds of clear nights; the placeholder where the user gave none.
    pub weather: Weather,
    /// How dates are chosen, and when the house is open.
    pub picks: PickSettings,
    /// What pictures are taken with.
    pub lenses: Vec<Camera>,
    /// What became of the nights.
    pub log: Log,
    pub view: View,
    pub remarks: Remarks,
}

/// The span as the document gives it, in civil dates of the site's zone.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct SeasonDates {
    /// The first day.
    pub from: CivilDate,
    /// The day after the last.
    pub to: CivilDate,
}

/// How the season is shown.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct View {
    pub theme: Theme,
    /// Turns the strip round: east lies to the left where the subject culminates south of the zenith and to the right
    /// where north of it, unless turned.
    pub turned: bool,
}

/// The colours of charts and window.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Theme {
    /// Dark ink on light paper.
    #[default]
    Light,
    Dark,
    /// One dim hue, for use at the telescope.
    Red,
}

/// Notes for people; the program keeps them and does nothing with them.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Remarks {
    pub scenario: Option<String>,
    /// Kept only while the scenario has dates.
    pub season: Option<String>,
    pub site: Option<String>,
    pub skyline: Option<String>,
    pub conditions: Option<String>,
    pub picks: Option<String>,
    pub view: Option<String>,
}

impl Scenario {
    /// Reads a document. `origin` is the file it comes from, or a name for it: messages begin with it, and a skyline's
    /// file is looked for in its folder.
    ///
    /// # Errors
    /// What is wrong, in which line and column, and what would work.
    pub fn from_ron(text: &str, origin: &Path) -> Result<Self, ScenarioError> {
        let name = origin.display().to_string();
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        if u64::try_from(text.len()).map_or(true, |length| length > SIZE_LIMIT) {
            return Err(ScenarioError::TooLarge {
                origin: name,
                limit: SIZE_LIMIT,
            });
        }
        if text.trim().is_empty() {
            return Err(ScenarioError::Empty { origin: name });
        }
        let document = version::parse(text, &name)?;
        if let Some(body) = document.subject_is_companion() {
            let message = v1::subject_among_companions(body);
            return Err(version::companions_error(text, &name, message));
        }
        if let Err(message) = document.check_log() {
            return Err(version::log_error(text, &name, message));
        }
        if let Err(message) = document.check_picks() {
            return Err(version::picks_error(text, &name, message));
        }
        document
            .into_scenario(&folder_of(origin))
            .map_err(|source| ScenarioError::Skyline {
                origin: name,
                source,
            })
    }

    /// Reads a file of at most 4 MB.
    ///
    /// # Errors
    /// As [`Scenario::from_ron`], and when the file cannot be read or is not UTF-8.
    pub fn load(path: &Path) -> Result<Self, ScenarioError> {
        let bytes = files::read_limited(path, SIZE_LIMIT).map_err(|error| match error {
            FileError::TooLarge { limit, .. } => ScenarioError::TooLarge {
                origin: path.display().to_string(),
                limit,
            },
            other => ScenarioError::File(other),
        })?;
        match std::str::from_utf8(&bytes) {
            Ok(text) => Scenario::from_ron(text, path),
            Err(error) => {
                let sound = bytes.get(..error.valid_up_to()).unwrap_or_default();
                let last_line = sound.rsplit(|byte| *byte == b'\n').next().unwrap_or(sound);
                Err(ScenarioError::NotUtf8 {
                    origin: path.display().to_string(),
                    line: 1 + sound.iter().filter(|byte| **byte == b'\n').count(),
                    column: 1 + String::from_utf8_lossy(last_line).chars().count(),
                    hint: match bytes.as_slice() {
                        [0xff, 0xfe, ..] | [0xfe, 0xff, ..] => " but UTF-16",
                        _ => "",
                    },
                })
            }
        }
    }

    /// The scenario that the program carries: the loop of Mars in 2026-27 over an invented observatory.
    ///
    /// # Errors
    /// None in a tested build.
    pub fn embedded() -> Result<Self, ScenarioError> {
        Scenario::from_ron(EMBEDDED, Path::new(EMBEDDED_NAME))
    }

    /// A scenario to start from: a flat horizon, conditions for an audience, and remarks that say what to do next.
    #[must_use]
    pub fn new_for(subject: Body, season: SeasonDates, site: Site, zone: Zone) -> Self {
        let years = match (season.from.year(), season.to.year()) {
            (first, last) if first == last => first.to_string(),
            (first, last) => format!("{first} to {last}"),
        };
        let remark = |text: &str| Some(text.to_owned());
        Scenario {
            title: format!("{subject} {years}"),
            subject,
            companions: Vec::new(),
            season: Some(season),
            site,
            zone,
            skyline: SkylineSource::flat(),
            conditions: Conditions::default(),
            sun_distance: DEFAULT_SUN_DISTANCE,
            purpose: Purpose::default(),
            weather: Weather::default(),
            picks: PickSettings::default(),
            lenses: Vec::new(),
            log: Log::default(),
            view: View::default(),
            remarks: Remarks {
                scenario: remark(
                    "Comments are lost when the program saves this file; notes in a remark stay. Companions are further planets to draw, as in companions: [jupiter].",
                ),
                season: remark(
                    "Civil dates of the site's zone, the last day not included. Without a season the next one of the subject is taken.",
                ),
                site: remark(
                    "Degrees, north and east positive. Pressure is that of the site itself. height_above_surroundings_m is how far the site looks down on the land around.",
                ),
                skyline: remark(
                    "A flat horizon until points are given, as in points: [(azimuth: 143, altitude: 5.2, name: \"the mill\")], or file: \"skyline.csv\" with azimuth,altitude a row. Azimuth from true north through east.",
                ),
                conditions: remark(
                    "For an audience with bare eyes. 20 degrees of altitude suits a telescope, sun_below -12 a photograph. hours: (from: \"19:00\", to: \"23:00\") and weekdays: [friday] narrow it to when people come.",
                ),
                picks: None,
                view: remark("theme is light, dark or red; turned turns the strip round."),
            },
        }
    }

    /// The season as instants: from the beginning of its first civil day to that of the day after its last. `None`
    /// where the document gives no dates.
    ///
    /// # Errors
    /// The dates lie at the very end of the calendar.
    pub fn span(&self, tables: &TimeTables) -> Result<Option<Span>, ScenarioError> {
        let instant = |date| {
            let utc = self.zone.start_of_day(self.site.longitude, date)?;
            Ok::<_, ScenarioError>(tables.tt_from_utc(utc))
        };
        self.season
            .map(|SeasonDates { from, to }| {
                Ok(Span {
                    from: instant(from)?,
                    to: instant(to)?,
                })
            })
            .transpose()
    }

    /// The document as text, complete in itself: points of a skyline's file stand in it. The same scenario gives the same
    /// text, and reading it gives the same scenario (angles to ten decimals of a degree).
    ///
    /// # Errors
    /// A value was changed to one that a document cannot have.
    pub fn to_ron(&self) -> Result<String, ScenarioError> {
        self.text_for(None)
    }

    /// Writes the document, whole or not at all, through a symbolic link to its target. A skyline's file keeps its name
    /// in the folder it was read from. Returns where a file that the program had not written is kept.
    ///
    /// # Errors
    /// As [`Scenario::to_ron`], and what keeps the file from being written; the old one then stands untouched.
    pub fn save(&self, path: &Path) -> Result<Option<PathBuf>, ScenarioError> {
        let text = self.text_for(Some(&folder_of(path)))?;
        Ok(files::save_keeping_backup(path, text.as_bytes())?)
    }

    fn text_for(&self, folder: Option<&Path>) -> Result<String, ScenarioError> {
        v1::Document::from_scenario(self, folder)
            .and_then(|document| version::print(&document))
            .map_err(ScenarioError::NotWritable)
    }
}

/// The folder a file stands in.
fn folder_of(path: &Path) -> PathBuf {
    match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
        _ => PathBuf::from("."),
    }
}

/// A site with what a document may leave out: level with the land around, 10 degrees Celsius, the standard atmosphere's
/// pressure at that elevation, and the extinction of a clear night (common practice, no source).
#[must_use]
pub fn usual_site(name: String, latitude: Angle, longitude: Angle, elevation_m: f64) -> Site {
    Site {
        name,
        latitude,
        longitude,
        elevation_m,
        height_above_surroundings_m: 0.0,
        air: Air {
            pressure_hpa: standard_pressure_hpa(elevation_m),
            temperature_c: 10.0,
        },
        extinction_mag: 0.25,
    }
}

/// Pressure of the standard atmosphere (ISO 2533:1975) at an elevation in metres, below the tropopause at 11 km, in hPa to
/// two decimals.
#[must_use]
pub fn standard_pressure_hpa(elevation_m: f64) -> f64 {
    /// hPa at the sea.
    const SEA_LEVEL_HPA: f64 = 1013.25;
    /// The lapse of 6.5 K a kilometre over 288.15 K.
    const LAPSE_PER_M: f64 = 0.0065 / 288.15;
    /// g M / (R L).
    const EXPONENT: f64 = 5.255_88;
    let ratio = (1.0 - LAPSE_PER_M * elevation_m).max(0.0);
    (SEA_LEVEL_HPA * libm::pow(ratio, EXPONENT) * 100.0).round() / 100.0
}
