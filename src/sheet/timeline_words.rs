//! The words on a season's timeline: months, hours of the local clock, dates of events, and what it says in a sentence.

use super::words::{LocalClock, date_words, short_date, short_month, year_words};
use crate::chart::{HourLine, TimelineMonth, TimelineText};
use crate::scenario::Plan;
use crate::season::darkness::{Darkness, NightLight};
use crate::sky::Angle;
use crate::sky::calendar::CivilDate;

/// Everything on the timeline that depends on place, calendar and zone.
#[must_use]
pub fn timeline_text(plan: &Plan, darkness: &Darkness) -> TimelineText {
    let (scenario, season) = (&plan.scenario, &plan.season);
    let clock = LocalClock {
        scenario,
        sky: &plan.sky,
    };
    let longitude = scenario.site.longitude;
    let offset = |night: &NightLight| {
        let utc = plan.sky.tables().utc_from_tt(night.span.middle());
        let local = scenario.zone.local_from_utc(longitude, utc);
        local.map_or(longitude.signed().hours(), |local| {
            f64::from(local.offset_seconds) / 3600.0
        })
    };
    TimelineText {
        title: format!("The nights of {}", season.subject),
        description: description(plan, darkness, &clock),
        caption: caption(plan),
        months: months(plan, &clock),
        hours: [15.0, 18.0, 21.0, 0.0, 3.0, 6.0, 9.0]
            .map(hour_line)
            .to_vec(),
        zone_offsets: darkness.nights.iter().map(offset).collect(),
        mean_noon_utc: 12.0 - longitude.signed().hours(),
        event_dates: season
            .events
            .iter()
            .map(|event| {
                clock
                    .date(event.instant)
                    .map_or_else(String::new, short_date)
            })
            .collect(),
    }
}

fn hour_line(hour: f64) -> HourLine {
    let is_midnight = hour == 0.0;
    let label = if is_midnight {
        String::from("midnight")
    } else {
        format!("{hour:.0} h")
    };
    HourLine {
        hour,
        label,
        is_midnight,
    }
}

fn degrees(angle: Angle) -> String {
    format!("{}°", angle.degrees()).replace('-', "\u{2212}")
}

fn caption(plan: &Plan) -> String {
    let conditions = &plan.scenario.conditions;
    let over = if conditions.clearance > Angle::ZERO {
        format!("{} over the skyline", degrees(conditions.clearance))
    } else {
        String::from("over the skyline")
    };
    format!(
        "threads: {} {over} and at least {} up, Sun below {}; pale: the Moon is up",
        plan.season.subject,
        degrees(conditions.least_altitude),
        degrees(conditions.sun_below),
    )
}

fn description(plan: &Plan, darkness: &Darkness, clock: &LocalClock<'_>) -> String {
    let nights = &darkness.nights;
    let subject = plan.season.subject;
    let date = |night: &NightLight| {
        clock
            .date(night.span.middle().plus_days(-0.25))
            .map_or_else(String::new, date_words)
    };
    let (Some(first), Some(last)) = (nights.first(), nights.last()) else {
        return String::from("No nights.");
    };
    let mut words = format!(
        "The {} nights from {} to {}.",
        nights.len(),
        date(first),
        date(last)
    );
    let good = nights
        .iter()
        .filter(|night| !night.in_view.is_empty())
        .count();
    let best = nights
        .iter()
        .max_by(|a, b| a.days_in_view().total_cmp(&b.days_in_view()));
    match best.filter(|_| good > 0) {
        Some(best) => words.push_str(&format!(
            " {subject} is in view on {good} of them, longest in the night of {} with {:.1} hours.",
            date(best),
            24.0 * best.days_in_view()
        )),
        None => words.push_str(&format!(" {subject} is in view on none of them.")),
    }
    words
}

/// The months of the season, that in which it begins included.
fn months(plan: &Plan, clock: &LocalClock<'_>) -> Vec<TimelineMonth> {
    let scenario = &plan.scenario;
    let mut months = Vec::new();
    let Some(first) = clock.date(plan.season.span.from) else {
        return months;
    };
    let (mut year, mut month) = (first.year(), first.month());
    while let Ok(date) = CivilDate::new(year, month, 1) {
        let Ok(utc) = scenario.zone.start_of_day(scenario.site.longitude, date) else {
            break;
        };
        let instant = plan.sky.tables().tt_from_utc(utc);
        if instant >= plan.season.span.to {
            break;
        }
        let name = short_month(date);
        let has_year = months.is_empty() || month == 1;
        months.push(TimelineMonth {
            instant,
            label: if has_year {
                format!("{name} {}", year_words(year))
            } else {
                name.to_owned()
            },
            short: match (has_year, month) {
                (true, 1) => year_words(year),
                (true, _) => name.to_owned(),
                _ => String::new(),
            },
        });
        (year, month) = if month == 12 {
            (year + 1, 1)
        } else {
            (year, month + 1)
        };
    }
    months
}
