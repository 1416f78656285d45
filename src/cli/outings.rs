//! What the commands of the planner share: reading a scenario, the day to plan from, words for spells.

use std::path::Path;

use clap::ValueEnum;

use crate::scenario::programme::Programme;
use crate::scenario::{Plan, Scenario};
use crate::season::planner::JudgedSpell;
use crate::sheet::words::{LocalClock, date_words, season_cautions};
use crate::sky::calendar::{CivilDate, Precision, utc_text};
use crate::sky::place::Sky;
use crate::sky::{Cautions, Tt};

use super::CliError;

/// How a plan is written.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum PageFormat {
    /// A page for people.
    #[default]
    Words,
    /// Comma-separated values with a header row.
    Csv,
    /// An array of objects, one a row.
    Json,
}

/// Reads a scenario and computes its season.
pub(super) fn plan(path: &Path) -> Result<Plan, CliError> {
    Ok(Plan::new(Scenario::load(path)?, super::now())?)
}

/// The day to plan from: what was asked for, or else today where it lies in the season, or else the first night of the
/// path, as for dates that are announced long before; says so on standard error.
pub(super) fn today(
    programme: &Programme<'_>,
    asked: Option<CivilDate>,
) -> Result<CivilDate, CliError> {
    if let Some(asked) = asked {
        return Ok(asked);
    }
    let path = programme.path()?;
    let tables = programme.plan.sky.tables();
    let tonight = programme.night_of(tables.utc_from_tt(super::now()))?;
    if path.holds(tonight) {
        return Ok(tonight);
    }
    let first = path.start.night;
    eprintln!("Planned from the first night of the path, {first}; --today DATE sets another day.");
    Ok(first)
}

/// Sentences about the Sun, the clock and the tables, to standard error.
pub(super) fn print_cautions(plan: &Plan) {
    for sentence in season_cautions(plan) {
        eprintln!("{sentence}");
    }
}

/// The cautions that the spells carry beyond those of the season, each once, to standard error.
pub(super) fn print_spell_cautions<'a>(plan: &Plan, spells: impl Iterator<Item = &'a JudgedSpell>) {
    let all = spells.fold(Cautions::default(), |all, judged| {
        all.and(judged.spell.cautions)
    });
    let season = plan.season.cautions;
    for caution in all.iter().filter(|caution| !season.contains(*caution)) {
        eprintln!("{}", crate::sheet::words::capitalised(caution.sentence()));
    }
}

/// An instant in UTC to the second.
pub(super) fn utc_second(sky: &Sky, instant: Tt) -> String {
    utc_text(sky.tables().utc_from_tt(instant), Precision::Second)
        .unwrap_or_else(|error| error.to_string())
}

/// `Thu 4 March 2027`
pub(super) fn short_day(date: CivilDate) -> String {
    let weekday = date.weekday().name();
    format!(
        "{} {}",
        weekday.get(..3).unwrap_or(weekday),
        date_words(date)
    )
}

/// The part of the day that people call an hour of it.
const fn part_of_day(hour: u32) -> &'static str {
    match hour {
        0..=5 => "early morning",
        6..=11 => "morning",
        12..=15 => "afternoon",
        16..=21 => "evening",
        _ => "late evening",
    }
}

/// `Thu 4 March 2027, early morning`: weekday and civil date of the actual time.
pub(super) fn day_and_part(clock: &LocalClock<'_>, instant: Tt) -> String {
    clock.date_and_time(instant).map_or_else(
        || "beyond the calendar".to_owned(),
        |(date, time)| {
            let hour = time.get(..2).and_then(|hour| hour.parse().ok());
            format!("{}, {}", short_day(date), part_of_day(hour.unwrap_or(0)))
        },
    )
}

/// `19:40-22:10 CET`, and where midnight lies between `23:40 CET - Fri 5 March 2027, 01:10 CET`. Times that a wrong skyline
/// or the air makes doubtful by a minute or more say by how much.
pub(super) fn times(clock: &LocalClock<'_>, judged: &JudgedSpell) -> String {
    let (start, finish) = (&judged.spell.start, &judged.spell.finish);
    let (Some((date, from)), Some((end_date, to))) = (
        clock.date_and_time(start.instant),
        clock.date_and_time(finish.instant),
    ) else {
        return "beyond the calendar".to_owned();
    };
    let doubt = |minutes: f64| {
        if minutes < 0.5 {
            String::new()
        } else {
            format!(" (give or take {minutes:.0} min)")
        }
    };
    let (from_doubt, to_doubt) = (
        doubt(start.uncertainty_minutes),
        doubt(finish.uncertainty_minutes),
    );
    if date == end_date && from_doubt.is_empty() {
        let (from, zone) = from.split_once(' ').unwrap_or((from.as_str(), ""));
        let same_zone = to.ends_with(zone);
        let zone = if same_zone {
            String::new()
        } else {
            format!(" {zone}")
        };
        format!("{from}{zone}-{to}{to_doubt}")
    } else if date == end_date {
        format!("{from}{from_doubt} - {to}{to_doubt}")
    } else {
        format!(
            "{from}{from_doubt} - {}, {to}{to_doubt}",
            short_day(end_date)
        )
    }
}
