//! The brief: one page in plain words that the leader of a programme can read aloud.

use std::fmt::Write;

use super::words::{LocalClock, date_words, season_cautions, short_date, year_words};
use crate::scenario::Plan;
use crate::season::horizon::HorizonKind;
use crate::season::outlook::{OutlookNight, outlook_night};
use crate::season::{Event, EventKind, EventValue, Loop};
use crate::sky::Angle;
use crate::sky::calendar::CivilDate;
use crate::sky::constellations::Constellation;
use crate::sky::place::{AU_KM, SkyError};

/// Columns of the page.
const WIDTH: usize = 78;

/// The brief of a season, ready to print.
///
/// # Errors
/// An instant that the sky does not cover.
pub fn brief(plan: &Plan) -> Result<String, SkyError> {
    let mut page = String::new();
    let scenario = &plan.scenario;
    let site = &scenario.site;
    let clock = LocalClock {
        scenario,
        sky: &plan.sky,
    };
    line(&mut page, &scenario.title);
    line(&mut page, &format!("{}, {}", site.name, place_words(plan)));
    line(
        &mut page,
        &format!("{} to {}", clock.day(plan.season.span.from), last_day(plan)),
    );
    page.push('\n');
    for paragraph in paragraphs(plan) {
        wrap(&mut page, &paragraph, "");
        page.push('\n');
    }
    page.push_str(&evenings(plan)?);
    page.push('\n');
    dates(&mut page, plan);
    for sentence in season_cautions(plan) {
        page.push('\n');
        wrap(&mut page, &sentence, "");
    }
    page.push('\n');
    wrap(
        &mut page,
        "At night follow the rules of the place, and ask qualified people about lasers, roofs, ice and access.",
        "",
    );
    Ok(page)
}

fn line(page: &mut String, text: &str) {
    page.push_str(text);
    page.push('\n');
}

/// Adds a paragraph, broken at spaces, continued lines indented.
fn wrap(page: &mut String, text: &str, indent: &str) {
    let mut length = 0;
    for word in text.split_whitespace() {
        let width = word.chars().count();
        if length > 0 && length + 1 + width > WIDTH {
            page.push('\n');
            page.push_str(indent);
            length = indent.chars().count();
        } else if length > 0 {
            page.push(' ');
            length += 1;
        }
        page.push_str(word);
        length += width;
    }
    page.push('\n');
}

fn last_day(plan: &Plan) -> String {
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    // The end does not belong to the span.
    clock.day(plan.season.span.to.plus_days(-1.0 / 1_440.0))
}

/// `50.62° north, 10.31° east, 486 m; clock Europe/Berlin`
fn place_words(plan: &Plan) -> String {
    let site = &plan.scenario.site;
    let side = |angle: Angle, positive: &'static str, negative: &'static str| {
        let word = if angle < Angle::ZERO {
            negative
        } else {
            positive
        };
        format!("{:.2}° {word}", angle.degrees().abs())
    };
    format!(
        "{}, {}, {:.0} m; clock: {}",
        side(site.latitude, "north", "south"),
        side(site.longitude, "east", "west"),
        site.elevation_m,
        plan.scenario.zone.name()
    )
}

fn constellation_at(plan: &Plan, event: &Event) -> Option<&'static str> {
    let place = plan
        .sky
        .geocentre(event.instant)
        .ok()?
        .place(event.body)
        .ok()?;
    Some(Constellation::at_icrs(place.direction).name())
}

fn million_km(au: f64) -> String {
    format!("{:.0} million km", au * AU_KM / 1e6)
}

/// A magnitude with a true minus sign.
fn magnitude_words(magnitude: f64) -> String {
    format!("magnitude {magnitude:+.1}")
        .replace('-', "\u{2212}")
        .replace("+0.0", "0.0")
}

fn paragraphs(plan: &Plan) -> Vec<String> {
    let mut paragraphs = Vec::new();
    let subject = plan.season.subject;
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    for season_loop in &plan.season.loops {
        paragraphs.push(loop_words(plan, season_loop));
    }
    if plan.season.loops.is_empty() {
        paragraphs.push(format!(
            "{subject} keeps moving eastward among the stars all season."
        ));
    }
    for event in &plan.season.events {
        let side = match event.kind {
            EventKind::GreatestElongationEast => "in the evening sky, east of the Sun",
            EventKind::GreatestElongationWest => "in the morning sky, west of the Sun",
            _ => continue,
        };
        if let EventValue::Elongation(angle) = event.value {
            paragraphs.push(format!(
                "On {} {subject} stands farthest from the Sun, {:.1}° {side}.",
                clock.day(event.instant),
                angle.degrees()
            ));
        }
    }
    paragraphs
}

fn loop_words(plan: &Plan, season_loop: &Loop) -> String {
    let subject = season_loop.body;
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    let mut words = String::new();
    let back = &season_loop.station_retrograde;
    let forward = &season_loop.station_direct;
    let among = match (
        constellation_at(plan, back),
        constellation_at(plan, forward),
    ) {
        (Some(first), Some(second)) if first == second => format!(" in {first}"),
        (Some(first), Some(second)) => format!(" from {first} into {second}"),
        _ => String::new(),
    };
    let _ = write!(
        words,
        "{subject} turns back on {}, runs westward among the stars{among} for {:.0} days and {:.1}°, and turns forward again on {}.",
        clock.day(back.instant),
        season_loop.duration_days(),
        season_loop.arc().degrees(),
        clock.day(forward.instant)
    );
    if let Some(crossing) = &season_loop.crossing {
        let _ = write!(
            words,
            " Its path crosses itself where it stood on {} and comes again on {}: a closed loop.",
            clock
                .date(crossing.first)
                .map(date_words)
                .unwrap_or_default(),
            clock
                .date(crossing.second)
                .map(date_words)
                .unwrap_or_default()
        );
    } else {
        words.push_str(" Its path does not cross itself: an open bend.");
    }
    if let Some(middle) = &season_loop.middle {
        let what = match middle.kind {
            EventKind::Opposition => "It stands opposite the Sun on",
            _ => "It passes between us and the Sun on",
        };
        let _ = write!(words, " {what} {}.", clock.long(middle.instant));
    }
    if let Some((EventValue::DistanceAu(distance), instant)) = season_loop
        .closest
        .as_ref()
        .map(|event| (event.value, event.instant))
    {
        let _ = write!(
            words,
            " It is nearest to us on {}, {distance:.3} au or {} away",
            clock.day(instant),
            million_km(distance)
        );
        if let Some(diameter) = season_loop.largest_diameter {
            let _ = write!(
                words,
                ", and its disc is then {:.1}\u{2033} across",
                diameter.arcsec()
            );
        }
        words.push('.');
    }
    // The brightest moment between the stations of an inner planet lies at one of them: nothing to announce.
    if subject.is_outer_planet()
        && let Some((EventValue::Magnitude(magnitude), instant)) = season_loop
            .brightest
            .as_ref()
            .map(|event| (event.value, event.instant))
    {
        let _ = write!(
            words,
            " It is brightest on {}, at {}.",
            clock.day(instant),
            magnitude_words(magnitude)
        );
    }
    words
}

/// Most rows in the table of evenings.
const MOST_ROWS: usize = 14;

/// When the Sun is gone and the subject up, on some evenings of the season.
fn evenings(plan: &Plan) -> Result<String, SkyError> {
    let (scenario, season) = (&plan.scenario, &plan.season);
    let subject = season.subject;
    let clock = LocalClock {
        scenario,
        sky: &plan.sky,
    };
    let mut text = format!("{subject} over the true horizon, local time:\n");
    let _ = writeln!(
        text,
        "{:<12}{:>9}{:>10}{:>9}{:>14}{:>9}{:>9}",
        "night of", "sunset", "dark from", "rises", "culminates", "at", "sets"
    );
    let (Some(first), Some(last)) = (clock.date(season.span.from), clock.date(season.span.to))
    else {
        return Ok(text);
    };
    let days = last.days_since(first).max(1);
    // Steps of half months where they fit, else the fewest whole months that keep to the page.
    let mut date = first;
    let months = f64::from(days) / 30.44;
    let step = (months / MOST_ROWS as f64).ceil() as i32;
    let with_year = first.year() + 1 < last.year();
    let mut rows = 0;
    while date < last && rows < MOST_ROWS + 2 {
        let wanted = if months * 2.0 <= MOST_ROWS as f64 {
            matches!(date.day(), 1 | 15)
        } else {
            date.day() == 1 && i32::from(date.month()).rem_euclid(step) == 1 % step
        };
        if wanted || rows == 0 {
            let night =
                outlook_night(&plan.sky, &scenario.site, subject, date.julian_day_number())?;
            text.push_str(&evening_row(&clock, (date, with_year), &night));
            rows += 1;
        }
        match date.plus_days(1) {
            Ok(next) => date = next,
            Err(_) => break,
        }
    }
    Ok(text)
}

fn evening_row(
    clock: &LocalClock<'_>,
    (date, with_year): (CivilDate, bool),
    night: &OutlookNight,
) -> String {
    let mut name = format!("{:>6}", short_date(date));
    if with_year {
        let _ = write!(name, " {}", year_words(date.year()));
    }
    let sun = |kind: HorizonKind| night.of_sun(kind).map(|event| clock.time(event.instant));
    let subject = |kind: HorizonKind| {
        let event = night.of_subject(kind);
        event.map_or_else(
            || String::from("\u{2013}"),
            |event| clock.time(event.instant),
        )
    };
    let sunset = sun(HorizonKind::Set).unwrap_or_else(|| String::from("none"));
    let dark = sun(HorizonKind::NauticalDusk).unwrap_or_else(|| String::from("never"));
    let (transit, altitude) = night.of_subject(HorizonKind::UpperTransit).map_or_else(
        || (String::from("\u{2013}"), String::from("\u{2013}")),
        |transit| {
            (
                clock.time(transit.instant),
                format!("{:.0}°", transit.value.degrees()),
            )
        },
    );
    format!(
        "{name:<12}{sunset:>9}{dark:>10}{:>9}{transit:>14}{altitude:>9}{:>9}\n",
        subject(HorizonKind::Rise),
        subject(HorizonKind::Set)
    )
}

/// All events of the season, a line each.
fn dates(page: &mut String, plan: &Plan) {
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    line(page, "Dates:");
    for event in &plan.season.events {
        // Stations in right ascension and light-time distance are for tables.
        if matches!(
            event.kind,
            EventKind::RaStationRetrograde
                | EventKind::RaStationDirect
                | EventKind::ClosestApproachLightTime
        ) {
            continue;
        }
        let mut what = event.kind.phrase().to_owned();
        match event.value {
            EventValue::Constellation(name) => {
                let full = Constellation::by_abbreviation(name).map_or(name, Constellation::name);
                what = format!("enters {full}");
            }
            EventValue::Elongation(angle) => {
                let _ = write!(what, ", {:.1}°", angle.degrees());
            }
            EventValue::DistanceAu(distance) => {
                let _ = write!(what, ", {distance:.3} au");
            }
            EventValue::Magnitude(magnitude) => {
                let _ = write!(what, ", {}", magnitude_words(magnitude));
            }
            EventValue::Separation(angle) => {
                let _ = write!(what, ", {:.1}°", angle.degrees());
            }
            EventValue::Longitude(_) | EventValue::RightAscension(_) => {}
        }
        line(page, &format!("  {:<38}{what}", clock.long(event.instant)));
    }
}
