//! The words on a season's strip: dates along the path, events, title block.

use super::words::{LocalClock, season_cautions, short_date, short_month, year_words};
use crate::chart::{DateRank, StripDate, StripText, StripView};
use crate::scenario::Plan;
use crate::sky::Angle;
use crate::sky::calendar::{CivilDate, month_name};

/// Everything on the strip that depends on place, calendar and zone.
#[must_use]
pub fn strip_text(plan: &Plan) -> StripText {
    let (scenario, season) = (&plan.scenario, &plan.season);
    let clock = LocalClock {
        scenario,
        sky: &plan.sky,
    };
    let (dates, spacing) = dates(plan);
    StripText {
        title: scenario.title.clone(),
        place: scenario.site.name.clone(),
        span: span_words(plan),
        date_note: format!("dates at 0h {}, {spacing}", zone_words(plan)),
        dates,
        event_dates: season
            .events
            .iter()
            .map(|event| {
                clock.date(event.instant).map_or_else(String::new, |date| {
                    // A season of several years has the same days again.
                    let day = short_date(date);
                    if season.span.days() < LONG_DAYS {
                        day
                    } else {
                        format!("{day} {}", year_words(date.year()))
                    }
                })
            })
            .collect(),
        cautions: season_cautions(plan),
    }
}

/// The strip as it is printed: A4 across, turned so that it matches the sky over the site unless the scenario turns it.
#[must_use]
pub fn printed_view(plan: &Plan) -> StripView {
    StripView {
        east_left: east_is_left(plan),
        ..StripView::A4
    }
}

/// East lies to the left where the subject culminates south of the zenith, to the right where north of it; the scenario's
/// switch turns it round.
#[must_use]
pub fn east_is_left(plan: &Plan) -> bool {
    let equatorial = plan.season.frame.equatorial_from_icrs;
    let points = &plan.season.track.points;
    let declinations: f64 = points
        .iter()
        .map(|point| (equatorial * point.direction).latitude().degrees())
        .sum();
    let mean = Angle::from_degrees(declinations / points.len().max(1) as f64);
    (mean < plan.scenario.site.latitude) != plan.scenario.view.turned
}

fn zone_words(plan: &Plan) -> &'static str {
    match plan.scenario.zone {
        crate::scenario::Zone::Iana(_) => "local time",
        crate::scenario::Zone::LocalMeanTime => "local mean time",
    }
}

/// `November 2026 to May 2027`
fn span_words(plan: &Plan) -> String {
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    let month = |date: CivilDate| month_name(date.month()).unwrap_or_default();
    // The end does not belong to the span: a minute before it does.
    let last = plan.season.span.to.plus_days(-1.0 / 1_440.0);
    match (clock.date(plan.season.span.from), clock.date(last)) {
        (Some(from), Some(to)) if from.year() == to.year() => {
            format!("{} to {} {}", month(from), month(to), year_words(to.year()))
        }
        (Some(from), Some(to)) => {
            let (first, second) = (year_words(from.year()), year_words(to.year()));
            format!("{} {first} to {} {second}", month(from), month(to))
        }
        _ => String::new(),
    }
}

/// From this length on a season spans several years and its dates say which, days.
const LONG_DAYS: f64 = 420.0;

/// Days of the month that carry a label, that carry a tick, and how that is said.
const SHORT_SEASON: (&[u8], &[u8], &str) =
    (&[5, 9, 13, 17, 21, 25, 29], &[], "a tick every 4 days");
const USUAL_SEASON: (&[u8], &[u8], &str) = (&[11, 21], &[6, 16, 26], "ticks 5 days apart");
const LONG_SEASON: (&[u8], &[u8], &str) = (&[], &[11, 21], "ticks 10 days apart");

/// The dates along the path and how far apart they stand.
fn dates(plan: &Plan) -> (Vec<StripDate>, &'static str) {
    let (scenario, season) = (&plan.scenario, &plan.season);
    let days = season.span.days();
    let (labelled, ticked, spacing) = match days {
        days if days < 120.0 => SHORT_SEASON,
        days if days < LONG_DAYS => USUAL_SEASON,
        _ => LONG_SEASON,
    };
    let clock = LocalClock {
        scenario,
        sky: &plan.sky,
    };
    let Some(mut date) = clock.date(season.span.from) else {
        return (Vec::new(), spacing);
    };
    let mut dates = Vec::new();
    let mut year_shown = None;
    // The calendar ends in the year 9999, far beyond every ephemeris.
    while let Ok(midnight) = scenario.zone.start_of_day(scenario.site.longitude, date) {
        let instant = plan.sky.tables().tt_from_utc(midnight);
        if instant >= season.span.to {
            break;
        }
        let rank = match date.day() {
            1 if days < LONG_DAYS || matches!(date.month(), 1 | 4 | 7 | 10) => {
                Some(DateRank::Month)
            }
            1 => Some(DateRank::Day),
            day if labelled.contains(&day) => Some(DateRank::Day),
            day if ticked.contains(&day) => Some(DateRank::Fine),
            _ => None,
        };
        if let Some(rank) = rank
            && instant >= season.span.from
        {
            let label = match (rank, date.day()) {
                (DateRank::Month, _) if year_shown != Some(date.year()) => {
                    // The year stands once, where it begins; the season's first date has it in the title block.
                    let new_year = year_shown.is_some();
                    year_shown = Some(date.year());
                    let words = if days < LONG_DAYS {
                        short_date(date)
                    } else {
                        short_month(date).to_owned()
                    };
                    if new_year {
                        format!("{words} {}", year_words(date.year()))
                    } else {
                        words
                    }
                }
                (DateRank::Month, _) if days < LONG_DAYS => short_date(date),
                (DateRank::Month, _) | (DateRank::Day, 1) => short_month(date).to_owned(),
                (DateRank::Day, day) => day.to_string(),
                (DateRank::Fine, _) => String::new(),
            };
            dates.push(StripDate {
                instant,
                label,
                rank,
            });
        }
        match date.plus_days(1) {
            Ok(next) => date = next,
            Err(_) => break,
        }
    }
    (dates, spacing)
}
