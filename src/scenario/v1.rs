//! Version 1 of the document as it stands on disk, and its conversion to and from [`Scenario`].
//!
//! These structs are the file format: a new optional field may be added with a default, nothing may be renamed, removed or
//! given another meaning (see [`super::version`]).

use std::path::Path;

use serde::{Deserialize, Serialize};

use super::checked::{
    Azimuth, Clearance, Elevation, Extinction, HeightAbove, Latitude, LeastAltitude, LitFraction,
    Longitude, MoonDistance, PartName, Pressure, SiteName, SkylineAltitude, SunBelow, SunDistance,
    Temperature, Title,
};
use super::outings::{Camera, PickSettings};
use super::skyline::{FileName, SkylineOrigin, SkylineSource};
use super::version::NEWEST_VERSION;
use super::{
    DEFAULT_SUN_DISTANCE, Remarks, Scenario, SeasonDates, SkylineError, Theme, View, Zone,
    usual_site,
};
use crate::season::log::Log;
use crate::season::picks::{Measure, ReserveRule};
use crate::season::purposes::Purpose;
use crate::season::weather::Weather;
use crate::season::{ClockTime, Conditions, Hours, MoonRule, Weekdays};
use crate::sky::calendar::{CivilDate, Weekday};
use crate::sky::refraction::Air;
use crate::sky::skyline::{SkylinePoint, Vertex};
use crate::sky::{Angle, Body, Site, Skyline};

/// Degrees in a file have at most ten decimals (0.4 microarcseconds): what was written as 51.3 is written as 51.3 again.
const DECIMALS: f64 = 1e10;

/// Years that the position engine reaches.
const FIRST_YEAR: i32 = -2000;
const LAST_YEAR: i32 = 2999;
/// Longest season: no chart of a longer one can be read, and the work stays bounded.
const LONGEST_SEASON_DAYS: i32 = 36_525;

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Scenario", deny_unknown_fields)]
pub(super) struct Document {
    version: u32,
    title: Title,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
    subject: Subject,
    #[serde(default, skip_serializing_if = "Companions::is_empty")]
    companions: Companions,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    season: Option<SeasonEntry>,
    site: SiteEntry,
    #[serde(default, skip_serializing_if = "SkylineEntry::says_nothing")]
    skyline: SkylineEntry,
    #[serde(default)]
    conditions: ConditionsEntry,
    #[serde(default)]
    sun_distance: Option<SunDistance>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    purpose: Option<Purpose>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    weather: Option<Weather>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    picks: Option<PicksEntry>,
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    lenses: Vec<Camera>,
    #[serde(default, skip_serializing_if = "log_is_empty")]
    log: Log,
    #[serde(default)]
    view: ViewEntry,
}

fn log_is_empty(log: &Log) -> bool {
    log.entries().is_empty()
}

impl Document {
    /// Whether the subject stands among the companions.
    pub(super) fn subject_is_companion(&self) -> Option<Body> {
        let subject = self.subject.0;
        self.companions.0.contains(&subject).then_some(subject)
    }

    /// First and last night of the season.
    fn nights(&self) -> Result<Option<(CivilDate, CivilDate)>, String> {
        self.season
            .as_ref()
            .map(|SeasonEntry(season)| {
                let last = season.to.plus_days(-1);
                last.map(|last| (season.from, last))
                    .map_err(|error| error.to_string())
            })
            .transpose()
    }

    /// Every entry lies in the season, every time in its night.
    pub(super) fn check_log(&self) -> Result<(), String> {
        if let Some((from, to)) = self.nights()? {
            let checked = self.log.check_season(from, to);
            checked.map_err(|error| error.to_string())?;
        }
        let longitude = Angle::from_degrees(self.site.longitude.into());
        let checked = self.log.check_times(longitude);
        checked.map_err(|error| error.to_string())
    }

    /// Dates of the picks lie in the season.
    pub(super) fn check_picks(&self) -> Result<(), String> {
        let (Some((first, last)), Some(entry)) = (self.nights()?, &self.picks) else {
            return Ok(());
        };
        let raw = &entry.0;
        let named = [raw.from, raw.to.and_then(|to| to.plus_days(-1).ok())];
        let mut all = named
            .into_iter()
            .flatten()
            .chain(raw.must_have.iter().copied());
        match all.find(|date| !(first..=last).contains(date)) {
            Some(date) => Err(format!(
                "picks: {date} is outside the season, whose nights run from {first} to {last}"
            )),
            None => Ok(()),
        }
    }
}

#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Picks", deny_unknown_fields, default)]
struct RawPicks {
    #[serde(skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    count: Option<u16>,
    #[serde(skip_serializing_if = "Option::is_none")]
    measure: Option<Measure>,
    /// The part of the season that the path covers: its first day, and the day after its last.
    #[serde(skip_serializing_if = "Option::is_none")]
    from: Option<CivilDate>,
    #[serde(skip_serializing_if = "Option::is_none")]
    to: Option<CivilDate>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    must_have: Vec<CivilDate>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reserve_rule: Option<ReserveRule>,
    #[serde(skip_serializing_if = "Option::is_none")]
    reserves: Option<u8>,
    #[serde(skip_serializing_if = "Option::is_none")]
    evenness: Option<f64>,
    /// Nights on which the house is open although the weekday is not.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    open: Vec<CivilDate>,
    /// Nights on which it is closed although the weekday is open.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    closed: Vec<CivilDate>,
}

/// Most dates and reserves that the choice takes.
const MOST_PICKS: u16 = 400;
const MOST_RESERVES: u8 = 20;
const MOST_RESERVE_DAYS: u16 = 90;

#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "RawPicks", into = "RawPicks")]
struct PicksEntry(RawPicks);

impl TryFrom<RawPicks> for PicksEntry {
    type Error = String;
    fn try_from(raw: RawPicks) -> Result<Self, String> {
        let within = |what: &str, value: Option<u16>, least: u16, most: u16| match value {
            Some(value) if !(least..=most).contains(&value) => Err(format!(
                "picks: {what} {value} is out of range: use {least} to {most}"
            )),
            _ => Ok(()),
        };
        within("count", raw.count, 1, MOST_PICKS)?;
        within(
            "reserves",
            raw.reserves.map(u16::from),
            0,
            MOST_RESERVES.into(),
        )?;
        if let Some(ReserveRule::WithinDays(days)) = raw.reserve_rule {
            within("within_days", Some(days), 1, MOST_RESERVE_DAYS)?;
        }
        if let Some(evenness) = raw.evenness
            && !(0.0..=1e6).contains(&evenness)
        {
            return Err(format!(
                "picks: evenness {evenness} is out of range: use 0 (any steps) to 1000000"
            ));
        }
        if let (Some(from), Some(to)) = (raw.from, raw.to)
            && from >= to
        {
            return Err(format!(
                "picks: from {from} is not before to {to}; the part begins with from and ends before to"
            ));
        }
        for date in &raw.closed {
            if raw.open.contains(date) || raw.must_have.contains(date) {
                return Err(format!(
                    "picks: {date} is closed, and open or must_have as well; keep one"
                ));
            }
        }
        Ok(PicksEntry(raw))
    }
}

impl From<PicksEntry> for RawPicks {
    fn from(entry: PicksEntry) -> RawPicks {
        entry.0
    }
}

impl PicksEntry {
    fn into_settings(self) -> PickSettings {
        let default = PickSettings::default();
        let raw = self.0;
        PickSettings {
            count: raw.count.map_or(default.count, usize::from),
            measure: raw.measure.unwrap_or(default.measure),
            from: raw.from,
            to: raw.to,
            must_have: raw.must_have,
            reserve_rule: raw.reserve_rule.unwrap_or(default.reserve_rule),
            reserves: raw.reserves.map_or(default.reserves, usize::from),
            evenness: raw.evenness.unwrap_or(default.evenness),
            open: raw.open,
            closed: raw.closed,
        }
    }

    /// `None` where nothing is said that the defaults do not say.
    fn from_settings(
        settings: &PickSettings,
        remark: Option<String>,
    ) -> Result<Option<Self>, String> {
        if *settings == PickSettings::default() && remark.is_none() {
            return Ok(None);
        }
        let raw = RawPicks {
            remark,
            count: Some(checked(settings.count)?),
            measure: Some(settings.measure),
            from: settings.from,
            to: settings.to,
            must_have: settings.must_have.clone(),
            reserve_rule: Some(settings.reserve_rule),
            reserves: Some(checked(settings.reserves)?),
            evenness: Some(settings.evenness),
            open: settings.open.clone(),
            closed: settings.closed.clone(),
        };
        checked(raw).map(Some)
    }
}

/// Days named in so many words; none at all is a mistake.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "Vec<Weekday>", into = "Vec<Weekday>")]
struct WeekdaysEntry(Vec<Weekday>);

impl TryFrom<Vec<Weekday>> for WeekdaysEntry {
    type Error = String;
    fn try_from(days: Vec<Weekday>) -> Result<Self, String> {
        if days.is_empty() {
            Err(
                "weekdays: no day is allowed, so no night can be: name days, or leave weekdays out to allow every day"
                    .to_owned(),
            )
        } else {
            Ok(WeekdaysEntry(days))
        }
    }
}

impl From<WeekdaysEntry> for Vec<Weekday> {
    fn from(entry: WeekdaysEntry) -> Vec<Weekday> {
        entry.0
    }
}

#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "Body", into = "Body")]
struct Subject(Body);

impl TryFrom<Body> for Subject {
    type Error = String;
    fn try_from(body: Body) -> Result<Self, String> {
        if Body::PLANETS.contains(&body) {
            Ok(Subject(body))
        } else {
            Err(format!(
                "subject {} has no season of its own: use a planet, mercury to neptune",
                body.word()
            ))
        }
    }
}

impl From<Subject> for Body {
    fn from(subject: Subject) -> Body {
        subject.0
    }
}

#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "Vec<Body>", into = "Vec<Body>")]
struct Companions(Vec<Body>);

impl Companions {
    fn is_empty(&self) -> bool {
        self.0.is_empty()
    }
}

impl TryFrom<Vec<Body>> for Companions {
    type Error = String;
    fn try_from(bodies: Vec<Body>) -> Result<Self, String> {
        for (index, body) in bodies.iter().enumerate() {
            if *body == Body::Sun {
                return Err(
                    "companions: the Sun is always drawn; name planets or the Moon".to_owned(),
                );
            }
            if bodies.iter().take(index).any(|earlier| earlier == body) {
                return Err(format!(
                    "companions: {} is named twice; once is enough",
                    body.word()
                ));
            }
        }
        Ok(Companions(bodies))
    }
}

impl From<Companions> for Vec<Body> {
    fn from(companions: Companions) -> Vec<Body> {
        companions.0
    }
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Season", deny_unknown_fields)]
struct RawSeason {
    from: CivilDate,
    to: CivilDate,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "RawSeason", into = "RawSeason")]
struct SeasonEntry(RawSeason);

impl TryFrom<RawSeason> for SeasonEntry {
    type Error = String;
    fn try_from(raw: RawSeason) -> Result<Self, String> {
        let RawSeason { from, to, .. } = raw;
        for date in [from, to] {
            if !(FIRST_YEAR..=LAST_YEAR).contains(&date.year()) {
                return Err(format!(
                    "season: {date} is outside the years that can be computed: use {FIRST_YEAR} to {LAST_YEAR}"
                ));
            }
        }
        let days = to.days_since(from);
        if days <= 0 {
            Err(format!(
                "season: from {from} is not before to {to}; the season begins with from and ends before to"
            ))
        } else if days > LONGEST_SEASON_DAYS {
            Err(format!(
                "season: {from} to {to} lasts {days} days: use {LONGEST_SEASON_DAYS} (100 years) or fewer"
            ))
        } else {
            Ok(SeasonEntry(raw))
        }
    }
}

impl From<SeasonEntry> for RawSeason {
    fn from(entry: SeasonEntry) -> RawSeason {
        entry.0
    }
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Site", deny_unknown_fields)]
struct SiteEntry {
    name: SiteName,
    latitude: Latitude,
    longitude: Longitude,
    /// What may be left out, here and below, is optional; the conversion to a [`Scenario`] knows the defaults.
    #[serde(default)]
    elevation_m: Option<Elevation>,
    #[serde(default)]
    height_above_surroundings_m: Option<HeightAbove>,
    zone: Zone,
    #[serde(default)]
    pressure_hpa: Option<Pressure>,
    #[serde(default)]
    temperature_c: Option<Temperature>,
    #[serde(default)]
    extinction_mag: Option<Extinction>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Point", deny_unknown_fields)]
struct PointEntry {
    azimuth: Azimuth,
    altitude: SkylineAltitude,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    /// What begins here.
    name: Option<PartName>,
}

#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Skyline", deny_unknown_fields)]
struct RawSkyline {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    file: Option<FileName>,
    #[serde(default)]
    smooth: bool,
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    points: Vec<PointEntry>,
}

/// Points that make a skyline, or the name of a file that is yet to be read.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "RawSkyline", into = "RawSkyline")]
struct SkylineEntry {
    raw: RawSkyline,
    /// Through the points of the document.
    surveyed: Skyline,
}

impl SkylineEntry {
    fn says_nothing(&self) -> bool {
        self.raw == RawSkyline::default()
    }
}

impl TryFrom<RawSkyline> for SkylineEntry {
    type Error = String;
    fn try_from(raw: RawSkyline) -> Result<Self, String> {
        if raw.file.is_some() && !raw.points.is_empty() {
            return Err(
                "skyline: both file and points are given; keep the one that holds".to_owned(),
            );
        }
        // Made here, where the reader knows the line of what is wrong.
        let points = raw.points.iter().map(|point| SkylinePoint {
            azimuth: point.azimuth.into(),
            altitude: point.altitude.into(),
            name: point.name.clone().map(String::from),
        });
        let surveyed = Skyline::new(points.collect()).map_err(|error| error.to_string())?;
        Ok(SkylineEntry { raw, surveyed })
    }
}

impl From<SkylineEntry> for RawSkyline {
    fn from(entry: SkylineEntry) -> RawSkyline {
        entry.raw
    }
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Conditions", deny_unknown_fields, default)]
struct ConditionsEntry {
    #[serde(skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
    least_altitude: Option<LeastAltitude>,
    clearance: Option<Clearance>,
    sun_below: Option<SunBelow>,
    /// `None`, in so many words: the Moon never closes a night.
    moon: Option<MoonEntry>,
    #[serde(skip_serializing_if = "Option::is_none")]
    hours: Option<HoursEntry>,
    /// `None`: every day.
    #[serde(skip_serializing_if = "Option::is_none")]
    weekdays: Option<WeekdaysEntry>,
}

#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Moon", deny_unknown_fields, default)]
struct MoonEntry {
    least_distance: Option<MoonDistance>,
    unless_lit_below: Option<LitFraction>,
}

impl Default for ConditionsEntry {
    fn default() -> Self {
        ConditionsEntry {
            remark: None,
            least_altitude: None,
            clearance: None,
            sun_below: None,
            moon: Some(MoonEntry::default()),
            hours: None,
            weekdays: None,
        }
    }
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename = "Hours", deny_unknown_fields)]
struct RawHours {
    from: ClockEntry,
    to: ClockEntry,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "RawHours", into = "RawHours")]
struct HoursEntry(Hours);

impl TryFrom<RawHours> for HoursEntry {
    type Error = String;
    fn try_from(raw: RawHours) -> Result<Self, String> {
        let (from, to) = (raw.from.0, raw.to.0);
        if from == to {
            Err(format!(
                "hours: from and to are both {from}, which leaves no time; leave hours out to allow every hour"
            ))
        } else {
            Ok(HoursEntry(Hours { from, to }))
        }
    }
}

impl From<HoursEntry> for RawHours {
    fn from(entry: HoursEntry) -> RawHours {
        RawHours {
            from: ClockEntry(entry.0.from),
            to: ClockEntry(entry.0.to),
        }
    }
}

#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
struct ClockEntry(ClockTime);

impl TryFrom<String> for ClockEntry {
    type Error = String;
    fn try_from(text: String) -> Result<Self, String> {
        let read = |part: &str| -> Option<u8> {
            let digits = part.len() == 2 && part.bytes().all(|byte| byte.is_ascii_digit());
            if digits { part.parse().ok() } else { None }
        };
        text.split_once(':')
            .and_then(|(hour, minute)| ClockTime::new(read(hour)?, read(minute)?))
            .map(ClockEntry)
            .ok_or_else(|| {
                let shown: String = text.chars().take(40).collect();
                format!("\"{shown}\" is no time of the day: write 00:00 to 24:00, as in \"19:30\"")
            })
    }
}

impl From<ClockEntry> for String {
    fn from(entry: ClockEntry) -> String {
        entry.0.to_string()
    }
}

#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(rename = "View", deny_unknown_fields, default)]
struct ViewEntry {
    #[serde(skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
    theme: Theme,
    turned: bool,
}

impl Document {
    /// Settles defaults and reads the skyline's file, if the document names one, in `folder`.
    pub(super) fn into_scenario(self, folder: &Path) -> Result<Scenario, SkylineError> {
        // Taken apart field by field, so that a new one cannot be forgotten.
        let Document {
            version: _,
            title,
            remark,
            subject,
            companions,
            season,
            site,
            skyline,
            conditions,
            sun_distance,
            purpose,
            weather,
            picks,
            lenses,
            log,
            view,
        } = self;
        let season = season.map(|entry| entry.0);
        let zone = site.zone;
        let remarks = Remarks {
            scenario: remark,
            season: season.as_ref().and_then(|season| season.remark.clone()),
            site: site.remark.clone(),
            skyline: skyline.raw.remark.clone(),
            conditions: conditions.remark.clone(),
            picks: picks.as_ref().and_then(|picks| picks.0.remark.clone()),
            view: view.remark,
        };
        Ok(Scenario {
            title: title.into(),
            subject: subject.into(),
            companions: companions.into(),
            season: season.map(|season| SeasonDates {
                from: season.from,
                to: season.to,
            }),
            site: site.into_site(),
            zone,
            skyline: match &skyline.raw.file {
                Some(name) => SkylineSource::from_file(folder, name, skyline.raw.smooth)?,
                None => SkylineSource::in_document(skyline.surveyed, skyline.raw.smooth),
            },
            conditions: conditions.into_conditions(),
            sun_distance: sun_distance.map_or(DEFAULT_SUN_DISTANCE, |angle| {
                Angle::from_degrees(angle.into())
            }),
            purpose: purpose.unwrap_or_default(),
            weather: weather.unwrap_or_default(),
            picks: picks.map(PicksEntry::into_settings).unwrap_or_default(),
            lenses,
            log,
            view: View {
                theme: view.theme,
                turned: view.turned,
            },
            remarks,
        })
    }

    /// What the scenario looks like on disk. A skyline's file keeps its name where `folder` is the one it was read in;
    /// elsewhere its points go into the document, which thus stays complete.
    pub(super) fn from_scenario(
        scenario: &Scenario,
        folder: Option<&Path>,
    ) -> Result<Self, String> {
        let Scenario {
            title,
            subject,
            companions,
            season,
            site,
            zone,
            skyline,
            conditions,
            sun_distance,
            purpose,
            weather,
            picks,
            lenses,
            log,
            view,
            remarks,
        } = scenario;
        let season = season.map(|SeasonDates { from, to }| RawSeason {
            from,
            to,
            remark: remarks.season.clone(),
        });
        let document = Document {
            version: NEWEST_VERSION,
            title: checked(title.clone())?,
            remark: remarks.scenario.clone(),
            subject: checked(*subject)?,
            companions: checked(companions.clone())?,
            season: season.map(checked).transpose()?,
            site: SiteEntry::from_site(site, *zone, remarks.site.clone())?,
            skyline: SkylineEntry::from_source(skyline, folder, remarks.skyline.clone())?,
            conditions: ConditionsEntry::from_conditions(conditions, remarks.conditions.clone())?,
            sun_distance: Some(degrees(*sun_distance)?),
            purpose: (*purpose != Purpose::default()).then_some(*purpose),
            weather: (*weather != Weather::default()).then(|| weather.clone()),
            picks: PicksEntry::from_settings(picks, remarks.picks.clone())?,
            lenses: lenses.clone(),
            log: log.clone(),
            view: ViewEntry {
                remark: remarks.view.clone(),
                theme: view.theme,
                turned: view.turned,
            },
        };
        document.check_log()?;
        document.check_picks()?;
        match document.subject_is_companion() {
            Some(body) => Err(subject_among_companions(body)),
            None => Ok(document),
        }
    }
}

/// The complaint about a subject that is its own companion.
pub(super) fn subject_among_companions(body: Body) -> String {
    format!(
        "companions: {} is the subject itself; leave it out here",
        body.word()
    )
}

impl SiteEntry {
    fn into_site(self) -> Site {
        let usual = usual_site(
            self.name.into(),
            Angle::from_degrees(self.latitude.into()),
            Angle::from_degrees(self.longitude.into()),
            self.elevation_m.map_or(0.0, f64::from),
        );
        Site {
            height_above_surroundings_m: self
                .height_above_surroundings_m
                .map_or(usual.height_above_surroundings_m, f64::from),
            air: Air {
                pressure_hpa: self.pressure_hpa.map_or(usual.air.pressure_hpa, f64::from),
                temperature_c: self
                    .temperature_c
                    .map_or(usual.air.temperature_c, f64::from),
            },
            extinction_mag: self.extinction_mag.map_or(usual.extinction_mag, f64::from),
            ..usual
        }
    }

    fn from_site(site: &Site, zone: Zone, remark: Option<String>) -> Result<Self, String> {
        Ok(SiteEntry {
            name: checked(site.name.clone())?,
            latitude: degrees(site.latitude)?,
            longitude: degrees(site.longitude)?,
            elevation_m: Some(checked(site.elevation_m)?),
            height_above_surroundings_m: Some(checked(site.height_above_surroundings_m)?),
            zone,
            pressure_hpa: Some(checked(site.air.pressure_hpa)?),
            temperature_c: Some(checked(site.air.temperature_c)?),
            extinction_mag: Some(checked(site.extinction_mag)?),
            remark,
        })
    }
}

impl SkylineEntry {
    fn from_source(
        source: &SkylineSource,
        folder: Option<&Path>,
        remark: Option<String>,
    ) -> Result<Self, String> {
        let file = match source.origin() {
            SkylineOrigin::File { name, folder: read } if folder == Some(read.as_path()) => {
                Some(checked(name.clone())?)
            }
            SkylineOrigin::File { .. } | SkylineOrigin::Document => None,
        };
        let points = if file.is_some() {
            Vec::new()
        } else {
            let vertices = source.surveyed().vertices().iter();
            vertices
                .map(PointEntry::from_vertex)
                .collect::<Result<_, _>>()?
        };
        checked(RawSkyline {
            remark,
            file,
            smooth: source.is_smooth(),
            points,
        })
    }
}

impl PointEntry {
    fn from_vertex(vertex: &Vertex) -> Result<Self, String> {
        Ok(PointEntry {
            azimuth: degrees(vertex.azimuth)?,
            altitude: degrees(vertex.altitude)?,
            name: vertex.name.clone().map(checked).transpose()?,
        })
    }
}

impl ConditionsEntry {
    fn into_conditions(self) -> Conditions {
        let default = Conditions::default();
        let angle = |degrees: f64| Angle::from_degrees(degrees);
        Conditions {
            least_altitude: self
                .least_altitude
                .map_or(default.least_altitude, |given| angle(given.into())),
            clearance: self
                .clearance
                .map_or(default.clearance, |given| angle(given.into())),
            sun_below: self
                .sun_below
                .map_or(default.sun_below, |given| angle(given.into())),
            moon: self.moon.map(MoonEntry::into_rule),
            hours: self.hours.map(|entry| entry.0),
            weekdays: self
                .weekdays
                .and_then(|days| Weekdays::from_days(&days.0))
                .unwrap_or(Weekdays::ALL),
        }
    }

    fn from_conditions(conditions: &Conditions, remark: Option<String>) -> Result<Self, String> {
        Ok(ConditionsEntry {
            remark,
            least_altitude: Some(degrees(conditions.least_altitude)?),
            clearance: Some(degrees(conditions.clearance)?),
            sun_below: Some(degrees(conditions.sun_below)?),
            moon: conditions.moon.map(MoonEntry::from_rule).transpose()?,
            hours: conditions
                .hours
                .map(|Hours { from, to }| {
                    checked(RawHours {
                        from: ClockEntry(from),
                        to: ClockEntry(to),
                    })
                })
                .transpose()?,
            weekdays: if conditions.weekdays == Weekdays::ALL {
                None
            } else {
                Some(checked(conditions.weekdays.iter().collect::<Vec<_>>())?)
            },
        })
    }
}

impl MoonEntry {
    fn into_rule(self) -> MoonRule {
        let default = MoonRule::default();
        MoonRule {
            least_distance: self.least_distance.map_or(default.least_distance, |given| {
                Angle::from_degrees(given.into())
            }),
            unless_lit_below: self
                .unless_lit_below
                .map_or(default.unless_lit_below, f64::from),
        }
    }

    fn from_rule(rule: MoonRule) -> Result<Self, String> {
        Ok(MoonEntry {
            least_distance: Some(degrees(rule.least_distance)?),
            unless_lit_below: Some(checked(rule.unless_lit_below)?),
        })
    }
}

/// An angle as its checked number of degrees, rid of the last digits that radians leave.
fn degrees<T: TryFrom<f64>>(angle: Angle) -> Result<T, String>
where
    T::Error: ToString,
{
    checked((angle.degrees() * DECIMALS).round() / DECIMALS)
}

fn checked<T, U: TryFrom<T>>(value: T) -> Result<U, String>
where
    U::Error: ToString,
{
    U::try_from(value).map_err(|error| error.to_string())
}
