//! Dates and instants in words, for people and for tables.

use crate::scenario::Scenario;
use crate::sky::calendar::{CivilDate, Precision, month_name, utc_text};
use crate::sky::place::Sky;
use crate::sky::time::J2000_JD;
use crate::sky::{Caution, Tt};

/// The Julian Date of an instant with so many decimals, more than one `f64` of it would hold.
#[must_use]
pub fn julian_date_text(tt: Tt, decimals: u32) -> String {
    let scale = 10_i64.pow(decimals.min(12));
    let whole = tt.days().floor();
    let steps = ((tt.days() - whole) * scale as f64).round() as i64;
    let days = whole as i64 + J2000_JD as i64 + steps / scale;
    let width = decimals as usize;
    format!("{days}.{:0width$}", steps % scale)
}

/// An instant in UTC (before 1972 UT1), to the second where it falls on one, else to the millisecond.
#[must_use]
pub fn utc_shortest(sky: &Sky, instant: Tt) -> String {
    let utc = sky.tables().utc_from_tt(instant);
    let seconds = (utc.days() - utc.days().floor()) * 86_400.0;
    let whole = (seconds - seconds.round()).abs() < 5e-4;
    let precision = if whole {
        Precision::Second
    } else {
        Precision::Decimals(3)
    };
    utc_text(utc, precision).unwrap_or_else(|error| error.to_string())
}

/// An instant in UTC (before 1972 UT1) with tenths of a second.
#[must_use]
pub fn utc_tenths(sky: &Sky, instant: Tt) -> String {
    let utc = sky.tables().utc_from_tt(instant);
    utc_text(utc, Precision::Decimals(1)).unwrap_or_else(|error| error.to_string())
}

/// An instant in UTC (before 1972 UT1) to the minute.
#[must_use]
pub fn utc_minute(sky: &Sky, instant: Tt) -> String {
    let utc = sky.tables().utc_from_tt(instant);
    utc_text(utc, Precision::Minute).unwrap_or_else(|error| error.to_string())
}

/// A year as people write it: 2027, 139, 747 BC.
#[must_use]
pub fn year_words(year: i32) -> String {
    if year > 0 {
        year.to_string()
    } else {
        format!("{} BC", 1 - year)
    }
}

/// `19 February 2027`
#[must_use]
pub fn date_words(date: CivilDate) -> String {
    let month = month_name(date.month()).unwrap_or_default();
    format!("{} {month} {}", date.day(), year_words(date.year()))
}

/// `19 Feb`
#[must_use]
pub fn short_date(date: CivilDate) -> String {
    format!("{} {}", date.day(), short_month(date))
}

/// `Feb`
#[must_use]
pub fn short_month(date: CivilDate) -> &'static str {
    let name = month_name(date.month()).unwrap_or_default();
    name.get(..3).unwrap_or(name)
}

/// The clock at a scenario's site.
#[derive(Clone, Copy)]
pub struct LocalClock<'a> {
    pub scenario: &'a Scenario,
    pub sky: &'a Sky,
}

impl LocalClock<'_> {
    /// The civil date and the time of day with the zone, as in `17:43 CET`; `None` beyond the calendar.
    #[must_use]
    pub fn date_and_time(&self, instant: Tt) -> Option<(CivilDate, String)> {
        // To the nearest minute, so that date and clock agree when rounding passes midnight.
        let utc = self.sky.tables().utc_from_tt(instant);
        let minutes = (utc.days() * 1_440.0).round();
        let utc = crate::sky::Utc::from_days(minutes / 1_440.0 + 1e-9);
        let local = self
            .scenario
            .zone
            .local_from_utc(self.scenario.site.longitude, utc)
            .ok()?;
        let minute_of_day = (local.date_time.second_of_day() / 60.0 + 0.01).floor() as u32;
        let clock = format!("{:02}:{:02}", minute_of_day / 60, minute_of_day % 60);
        Some((
            local.date_time.date(),
            format!("{clock} {}", local.abbreviation),
        ))
    }

    /// `Friday 19 February 2027, 17:43 CET`
    #[must_use]
    pub fn long(&self, instant: Tt) -> String {
        self.date_and_time(instant).map_or_else(
            || String::from("beyond the calendar"),
            |(date, clock)| format!("{} {}, {clock}", date.weekday().name(), date_words(date)),
        )
    }

    /// `Friday 19 February 2027`
    #[must_use]
    pub fn day(&self, instant: Tt) -> String {
        self.date_and_time(instant).map_or_else(
            || String::from("beyond the calendar"),
            |(date, _)| format!("{} {}", date.weekday().name(), date_words(date)),
        )
    }

    /// `17:43`, without the zone.
    #[must_use]
    pub fn time(&self, instant: Tt) -> String {
        self.date_and_time(instant)
            .map_or_else(String::new, |(_, clock)| {
                clock.split(' ').next().unwrap_or_default().to_owned()
            })
    }

    /// The civil date.
    #[must_use]
    pub fn date(&self, instant: Tt) -> Option<CivilDate> {
        self.date_and_time(instant).map(|(date, _)| date)
    }
}

/// Sentences about a season that belong on everything handed out.
#[must_use]
pub fn season_cautions(plan: &crate::scenario::Plan) -> Vec<String> {
    let (scenario, season) = (&plan.scenario, &plan.season);
    let mut sentences = Vec::new();
    let nearest_sun = season
        .track
        .points
        .iter()
        .map(|point| point.elongation.degrees())
        .fold(180.0, f64::min);
    if nearest_sun < scenario.sun_distance.degrees() {
        sentences.push(String::from(
            "Never point optics or eyes near the Sun: wait until the whole disc has set beyond the true horizon (hidden by a roof is not set), and stop before it rises.",
        ));
    }
    for caution in season
        .cautions
        .and(plan.sky.tables().delta_t(season.span.middle()).cautions())
        .iter()
    {
        let mut sentence = caution.sentence().to_owned();
        if caution == Caution::DeltaTModelled {
            let delta_t = plan.sky.tables().delta_t(season.span.middle());
            sentence = format!(
                "{sentence}: clock times may be {:.0} s off",
                delta_t.error_seconds.ceil()
            );
        }
        sentences.push(capitalised(&sentence) + ".");
    }
    let last_year = LocalClock {
        scenario,
        sky: &plan.sky,
    }
    .date(season.span.to)
    .map_or(0, |date| date.year());
    if let Some(doubt) = scenario.zone.doubt(last_year) {
        sentences.push(capitalised(doubt.trim_end_matches('.')) + ".");
    }
    sentences
}

/// The sentence with a capital first letter.
#[must_use]
pub fn capitalised(sentence: &str) -> String {
    let mut letters = sentence.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(letters).collect()
    })
}
