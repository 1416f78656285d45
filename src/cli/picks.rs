//! `loopwright picks`: dates to announce, each with its reserves, and the chance that they hold.

use std::io::{BufWriter, Write, stdout};
use std::path::PathBuf;

use clap::ValueEnum;

use crate::scenario::programme::{Dates, Programme};
use crate::season::picks::{Measure, ReserveRule};
use crate::season::weather::{Forecast, percent};
use crate::sheet::table::{Cell, TableFormat, TableWriter};
use crate::sheet::words::LocalClock;
use crate::sky::calendar::CivilDate;

use super::CliError;
use super::outings::{PageFormat, day_and_part, plan, print_cautions, times, today, utc_second};

/// Choose dates to announce: N nights along the path, each with its reserves, and the chance that they hold.
#[derive(Debug, clap::Args)]
#[command(after_help = "Example:
  loopwright picks scenarios/mars-loop-2026.ron --count 6 --by angle --today 2026-09-20

Dates that must be in, the rule for reserves, closed dates and the part of the path stand in the scenario under picks; nights
logged as planned have been announced and are kept. Even steps by angle are even along the track, backward motion counted.")]
pub struct Options {
    /// A scenario file.
    scenario: PathBuf,
    /// Number of dates; without it the scenario's.
    #[arg(long, value_name = "N")]
    count: Option<usize>,
    /// By what the steps along the path are even; without it the scenario's.
    #[arg(long, value_enum)]
    by: Option<By>,
    /// The first night that is still open: 2026-11-01.
    #[arg(long, value_name = "DATE", allow_hyphen_values = true)]
    today: Option<CivilDate>,
    #[arg(long, value_enum, default_value_t)]
    format: PageFormat,
}

#[derive(Clone, Copy, Debug, ValueEnum)]
pub(super) enum By {
    /// Degrees along the track.
    Angle,
    Days,
}

impl From<By> for Measure {
    fn from(by: By) -> Self {
        match by {
            By::Angle => Measure::Angle,
            By::Days => Measure::Days,
        }
    }
}

const COLUMNS: &[&str] = &[
    "section",
    "role",
    "night",
    "local",
    "from_utc",
    "to_utc",
    "best_utc",
    "altitude_deg",
    "track_deg",
    "score",
    "clear_probability",
    "section_filled_probability",
    "ends_because",
];

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let plan = plan(&options.scenario)?;
    let programme = Programme::new(&plan)?;
    let today = today(&programme, options.today)?;
    let settings = &plan.scenario.picks;
    let measure = options.by.map_or(settings.measure, Measure::from);
    let dates = programme.dates(options.count.unwrap_or(settings.count), measure, today)?;
    let page = Page {
        programme: &programme,
        dates: &dates,
        measure,
        clock: LocalClock {
            scenario: &plan.scenario,
            sky: &plan.sky,
        },
    };
    match options.format {
        PageFormat::Words => {
            let mut out = BufWriter::new(stdout().lock());
            for line in page.lines()? {
                writeln!(out, "{line}")?;
            }
            out.flush()?;
        }
        PageFormat::Csv | PageFormat::Json => {
            let format = if options.format == PageFormat::Csv {
                TableFormat::Csv
            } else {
                TableFormat::Json
            };
            page.table(format)?;
            for line in page.chances()? {
                eprintln!("{line}");
            }
        }
    }
    print_cautions(&plan);
    Ok(())
}

struct Page<'a> {
    programme: &'a Programme<'a>,
    dates: &'a Dates,
    measure: Measure,
    clock: LocalClock<'a>,
}

impl Page<'_> {
    fn clear(&self, night: CivilDate) -> Option<f64> {
        let chain = &self.dates.chain;
        chain.beliefs().get(chain.index(night)?).copied()
    }

    fn chances(&self) -> Result<Vec<String>, CliError> {
        let basis = self
            .programme
            .plan
            .scenario
            .weather
            .basis(Forecast::default());
        let mut lines = self.dates.plan.chances.words(&basis);
        lines.extend(self.programme.odds_words(&self.dates.chain)?);
        Ok(lines)
    }

    fn lines(&self) -> Result<Vec<String>, CliError> {
        let scenario = &self.programme.plan.scenario;
        let plan = &self.dates.plan;
        let by = match self.measure {
            Measure::Angle => "along the track",
            Measure::Days => "in days",
        };
        let mut lines = vec![
            scenario.title.clone(),
            format!(
                "{} for {}, even {by}: mean step {} (lambda {}); reserves: {}",
                match plan.sections.len() {
                    1 => "1 date".to_owned(),
                    count => format!("{count} dates"),
                },
                purpose_words(scenario.purpose),
                self.measure.words(plan.mean_step),
                scenario.picks.evenness,
                reserve_words(scenario.picks.reserve_rule, scenario.picks.reserves),
            ),
            String::new(),
        ];
        let mut before: Option<f64> = None;
        for (number, section) in plan.sections.iter().enumerate() {
            let places = std::iter::once((section.pick, true))
                .chain(section.reserves.iter().map(|&reserve| (reserve, false)));
            for (place, is_pick) in places {
                let Some((night, judged)) = self.programme.spell(place) else {
                    continue;
                };
                let best = &judged.spell.best;
                let clear = self
                    .clear(night.date())
                    .map_or(String::new(), |clear| format!("; clear {}", percent(clear)));
                let head = if is_pick {
                    format!("{:2}  ", number + 1)
                } else {
                    "      reserve ".to_owned()
                };
                lines.push(format!(
                    "{head}{}: in view {}; {:.0} deg up at {}{clear}",
                    day_and_part(&self.clock, judged.spell.start.instant),
                    times(&self.clock, judged),
                    best.altitude.degrees(),
                    self.clock.time(best.instant),
                ));
                if !is_pick {
                    continue;
                }
                let mark = self.programme.candidate(place).map(|found| found.mark);
                let here = mark.map(|mark| self.measure.of(mark));
                let step = match (before, here) {
                    (Some(before), Some(here)) => {
                        format!("{} after the last; ", self.measure.words(here - before))
                    }
                    _ => String::new(),
                };
                before = here;
                let must = if self.dates.kept.contains(&night.date()) {
                    "must be in; "
                } else {
                    ""
                };
                lines.push(format!(
                    "      {must}{step}score {:.2}{}; filled with its reserves {}; ends: {}",
                    judged.score.value,
                    judged.score.weakest().map_or(String::new(), |part| format!(
                        " (weakest: {} {:.2})",
                        part.name.word(),
                        part.value
                    )),
                    percent(section.filled),
                    judged.ends_because(),
                ));
            }
        }
        lines.push(String::new());
        lines.extend(self.chances()?);
        Ok(lines)
    }

    fn table(&self, format: TableFormat) -> Result<(), CliError> {
        let sky = &self.programme.plan.sky;
        let sink = BufWriter::new(stdout().lock());
        let mut table = TableWriter::new(sink, COLUMNS, format)?;
        for (number, section) in self.dates.plan.sections.iter().enumerate() {
            let places = std::iter::once((section.pick, "pick"))
                .chain(section.reserves.iter().map(|&reserve| (reserve, "reserve")));
            for (place, role) in places {
                let Some((night, judged)) = self.programme.spell(place) else {
                    continue;
                };
                let spell = &judged.spell;
                table.row(&[
                    Cell::Digits((number + 1).to_string()),
                    Cell::text(role),
                    Cell::text(night.date().to_string()),
                    Cell::text(day_and_part(&self.clock, spell.start.instant)),
                    Cell::text(utc_second(sky, spell.start.instant)),
                    Cell::text(utc_second(sky, spell.finish.instant)),
                    Cell::text(utc_second(sky, spell.best.instant)),
                    Cell::Number(spell.best.altitude.degrees(), 2),
                    Cell::Number(judged.track.degrees(), 3),
                    Cell::Number(judged.score.value, 3),
                    Cell::number(self.clear(night.date()), 3),
                    Cell::Number(section.filled, 3),
                    Cell::text(judged.ends_because()),
                ])?;
            }
        }
        table.finish()?;
        Ok(())
    }
}

/// To follow "dates for".
fn purpose_words(purpose: crate::season::purposes::Purpose) -> &'static str {
    use crate::season::purposes::Purpose;
    match purpose {
        Purpose::Audience => "an audience",
        Purpose::AudienceAtTelescope => "an audience at the telescope",
        Purpose::Path => "pictures of the path",
        Purpose::Disc => "pictures of the disc",
    }
}

fn reserve_words(rule: ReserveRule, reserves: usize) -> String {
    let many = |one: &str, more: String| {
        if reserves == 1 { one.to_owned() } else { more }
    };
    match rule {
        _ if reserves == 0 => "none".to_owned(),
        ReserveRule::NextEvening => {
            many("the next evening", format!("the next {reserves} evenings"))
        }
        ReserveRule::SameWeekday => many(
            "the same weekday next week",
            format!("the same weekday of the next {reserves} weeks"),
        ),
        ReserveRule::WithinDays(days) => many(
            &format!("one within {days} days"),
            format!("up to {reserves} within {days} days"),
        ),
    }
}
