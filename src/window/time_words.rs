//! The instant as the user reads and types it: on the clock of the site.

use crate::scenario::Scenario;
use crate::sky::calendar::{DateTime, Precision, utc_text};
use crate::sky::delta_t::TimeTables;
use crate::sky::{Tt, Utc};

/// The instant on the site's clock as the date field shows it: `2027-02-12 18:50`.
#[must_use]
pub(super) fn local_text(scenario: &Scenario, tables: &TimeTables, instant: Tt) -> String {
    local(scenario, tables, instant).map_or_else(String::new, |(text, _)| text)
}

/// The same with the zone: abbreviation and offset.
fn local(scenario: &Scenario, tables: &TimeTables, instant: Tt) -> Option<(String, String)> {
    // To the nearest minute, and just past it, so that nothing is rounded down again.
    let minutes = (tables.utc_from_tt(instant).days() * 1_440.0).round();
    let utc = Utc::from_days(minutes / 1_440.0 + 1e-8);
    let local = scenario
        .zone
        .local_from_utc(scenario.site.longitude, utc)
        .ok()?;
    let minute = (local.date_time.second_of_day() / 60.0).floor() as u32;
    let text = format!(
        "{} {:02}:{:02}",
        local.date_time.date(),
        minute / 60,
        minute % 60
    );
    Some((
        text,
        format!("{} {}", local.abbreviation, local.offset_text()),
    ))
}

/// `CET +01:00`
#[must_use]
pub(super) fn zone_text(scenario: &Scenario, tables: &TimeTables, instant: Tt) -> String {
    local(scenario, tables, instant).map_or_else(String::new, |(_, zone)| zone)
}

/// Universal time to the minute.
#[must_use]
pub(super) fn universal_text(tables: &TimeTables, instant: Tt) -> String {
    let utc = tables.utc_from_tt(instant);
    utc_text(utc, Precision::Minute).unwrap_or_else(|error| error.to_string())
}

/// Reads a date, or a date and a time, of the site's clock. A date alone keeps the time of day shown before.
pub(super) fn read_local(
    scenario: &Scenario,
    tables: &TimeTables,
    before: Tt,
    text: &str,
) -> Result<Tt, String> {
    const FORM: &str =
        "write a date, or a date and a time of the site's clock, as in 2027-02-12 18:50";
    let text = text.trim();
    let (date, time) = match text.split_once([' ', 'T']) {
        Some((date, time)) => (date, Some(time.trim())),
        None => (text, None),
    };
    let date = date
        .parse()
        .map_err(|_| format!("\"{date}\" is no date; {FORM}"))?;
    let longitude = scenario.site.longitude;
    let seconds = match time {
        Some(time) => {
            clock_seconds(time).ok_or_else(|| format!("\"{time}\" is no time of day; {FORM}"))?
        }
        None => {
            let utc = tables.utc_from_tt(before);
            let local = scenario
                .zone
                .local_from_utc(longitude, utc)
                .map_err(|error| error.to_string())?;
            local.date_time.second_of_day()
        }
    };
    let local = DateTime::new(date, seconds).map_err(|error| error.to_string())?;
    let utc = scenario
        .zone
        .utc_from_local(longitude, local)
        .map_err(|error| error.to_string())?;
    Ok(tables.tt_from_utc(utc))
}

/// `18:50` or `18:50:30` as seconds of the day.
fn clock_seconds(text: &str) -> Option<f64> {
    let mut parts = text.split(':');
    let mut part = |below: u32| -> Option<u32> {
        let text = parts.next()?;
        let is_plain =
            (1..=2).contains(&text.len()) && text.bytes().all(|byte| byte.is_ascii_digit());
        is_plain
            .then(|| text.parse().ok())
            .flatten()
            .filter(|value| *value < below)
    };
    let (hour, minute) = (part(24)?, part(60)?);
    let second = if text.matches(':').count() > 1 {
        part(60)?
    } else {
        0
    };
    parts
        .next()
        .is_none()
        .then(|| f64::from(hour * 3600 + minute * 60 + second))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_shown_can_be_typed() {
        let scenario = Scenario::embedded().unwrap();
        let tables = TimeTables::embedded();
        let before = Tt::from_days(9_000.0);
        // Central European time is an hour, summer time two hours ahead of UTC (Directive 2000/84/EC).
        for (typed, universal) in [
            ("2027-02-12 18:50", "2027-02-12T17:50Z"),
            ("2027-05-12 18:50", "2027-05-12T16:50Z"),
            ("2027-03-28 03:00", "2027-03-28T01:00Z"),
        ] {
            let instant = read_local(&scenario, tables, before, typed).unwrap();
            assert_eq!(local_text(&scenario, tables, instant), typed);
            assert_eq!(universal_text(tables, instant), universal);
        }
        let instant = read_local(&scenario, tables, before, "2027-02-12 18:50").unwrap();
        let next = read_local(&scenario, tables, instant, "2027-02-13").unwrap();
        assert_eq!(local_text(&scenario, tables, next), "2027-02-13 18:50");
    }

    #[test]
    fn what_cannot_be_read_is_told() {
        let scenario = Scenario::embedded().unwrap();
        let tables = TimeTables::embedded();
        for typed in [
            "",
            "soon",
            "2027-02-30 18:50",
            "2027-02-12 24:00",
            "2027-02-12 18",
            "2027-02-12 18:50:00:00",
        ] {
            let error = read_local(&scenario, tables, Tt::from_days(0.0), typed).unwrap_err();
            assert!(!error.is_empty(), "{typed}");
        }
    }
}
