//! `loopwright advise`: go out tonight or stay at home.

use std::io::{BufWriter, Write, stdout};
use std::path::PathBuf;
use std::str::FromStr;

use crate::scenario::programme::Programme;
use crate::season::advice::{Advice, Gap};
use crate::season::weather::{Chain, Forecast, Probability, percent};
use crate::sheet::table::{Cell, TableFormat, TableWriter};
use crate::sheet::words::LocalClock;
use crate::sky::Angle;
use crate::sky::calendar::CivilDate;

use super::CliError;
use super::outings::{PageFormat, day_and_part, plan, print_cautions, times, utc_second};

/// Advise someone who decides day by day: go or stay tonight, and what every coming night is worth.
#[derive(Debug, clap::Args)]
#[command(after_help = "Example:
  loopwright advise scenarios/venus-evening-2029.ron --outings 30 --gap 8 --today 2029-09-20 --tonight 0.6

The policy is the one most likely to leave no gap over --gap between two frames, or between an end of the path and its nearest
frame. The log says what has been shot; odds and persistence stand in the scenario under weather.")]
pub struct Options {
    /// A scenario file.
    scenario: PathBuf,
    /// Outings that are left, tonight's included.
    #[arg(long, value_name = "N")]
    outings: usize,
    /// The widest gap allowed: degrees along the track, as in 8, or days, as in 12d.
    #[arg(long, value_name = "GAP", allow_hyphen_values = true)]
    gap: GapWord,
    /// The first night that is still open: 2026-11-01.
    #[arg(long, value_name = "DATE", allow_hyphen_values = true)]
    today: CivilDate,
    /// Chance of a clear sky tonight, 0 to 1, by the forecast; 0 or 1 when it is known.
    #[arg(long, value_name = "P", allow_hyphen_values = true, value_parser = probability)]
    tonight: Option<Probability>,
    /// The same for tomorrow night.
    #[arg(long, value_name = "P", allow_hyphen_values = true, value_parser = probability)]
    tomorrow: Option<Probability>,
    /// You see what the sky was like when you stay at home, too.
    #[arg(long)]
    weather_seen: bool,
    #[arg(long, value_enum, default_value_t)]
    format: PageFormat,
}

fn probability(text: &str) -> Result<Probability, String> {
    let value = text
        .trim()
        .parse()
        .map_err(|_| format!("\"{text}\" is no number; give a chance from 0 to 1, as in 0.6"))?;
    Probability::new(value, "the chance of a clear sky").map_err(|error| error.to_string())
}

/// `8`, `8deg` or `12d`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GapWord(Gap);

impl FromStr for GapWord {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let text = text.trim();
        let wrong = || {
            format!(
                "\"{text}\" is no gap; write degrees along the track as in 8, or days as in 12d"
            )
        };
        let number = |digits: &str| digits.trim().parse::<f64>().map_err(|_| wrong());
        let gap = if let Some(digits) = text.strip_suffix("deg") {
            Gap::Along(Angle::from_degrees(number(digits)?))
        } else if let Some(digits) = text.strip_suffix('d') {
            Gap::Days(number(digits)?)
        } else {
            Gap::Along(Angle::from_degrees(number(text)?))
        };
        Ok(GapWord(gap))
    }
}

const COLUMNS: &[&str] = &[
    "night",
    "local",
    "from_utc",
    "to_utc",
    "best_utc",
    "altitude_deg",
    "track_deg",
    "score",
    "clear_probability",
    "go_probability",
    "lost_by_staying",
];

/// Nights of the page: two weeks that can be used.
const NIGHTS_SHOWN: usize = 14;

pub(super) fn run(options: &Options) -> Result<(), CliError> {
    let plan = plan(&options.scenario)?;
    let programme = Programme::new(&plan)?;
    let forecast = Forecast {
        tonight: options.tonight,
        tomorrow: options.tomorrow,
    };
    let (advice, chain) = programme.advice(
        options.outings,
        options.gap.0,
        options.today,
        forecast,
        options.weather_seen,
    )?;
    let mut sentences = advice.words(&plan.scenario.weather.basis(forecast));
    sentences.extend(programme.odds_words(&chain)?);
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    match options.format {
        PageFormat::Words => {
            let mut out = BufWriter::new(stdout().lock());
            writeln!(out, "{}", plan.scenario.title)?;
            for sentence in &sentences {
                writeln!(out, "{sentence}")?;
            }
            for line in night_lines(&programme, &advice, &chain, &clock) {
                writeln!(out, "{line}")?;
            }
            out.flush()?;
        }
        PageFormat::Csv => table(&programme, &advice, &clock, TableFormat::Csv)?,
        PageFormat::Json => table(&programme, &advice, &clock, TableFormat::Json)?,
    }
    if options.format != PageFormat::Words {
        for sentence in &sentences {
            eprintln!("{sentence}");
        }
    }
    print_cautions(&plan);
    Ok(())
}

fn night_lines(
    programme: &Programme<'_>,
    advice: &Advice,
    chain: &Chain,
    clock: &LocalClock<'_>,
) -> Vec<String> {
    if advice.nights.is_empty() {
        return Vec::new();
    }
    let mut lines = vec![
        String::new(),
        format!(
            "the next nights, as seen from {} (clear; chance that you go; lost by staying):",
            chain.today()
        ),
    ];
    for night in advice.nights.iter().take(NIGHTS_SHOWN) {
        let Some((_, judged)) = programme.spell(night.candidate) else {
            continue;
        };
        lines.push(format!(
            "  {}: in view {}; {:.0} deg up; {}; {}; {}",
            day_and_part(clock, judged.spell.start.instant),
            times(clock, judged),
            judged.spell.best.altitude.degrees(),
            percent(night.clear),
            percent(night.go),
            percent(night.lost_by_staying),
        ));
    }
    lines
}

fn table(
    programme: &Programme<'_>,
    advice: &Advice,
    clock: &LocalClock<'_>,
    format: TableFormat,
) -> Result<(), CliError> {
    let sky = &programme.plan.sky;
    let mut table = TableWriter::new(BufWriter::new(stdout().lock()), COLUMNS, format)?;
    for night in &advice.nights {
        let Some((_, judged)) = programme.spell(night.candidate) else {
            continue;
        };
        let spell = &judged.spell;
        table.row(&[
            Cell::text(night.night.to_string()),
            Cell::text(day_and_part(clock, spell.start.instant)),
            Cell::text(utc_second(sky, spell.start.instant)),
            Cell::text(utc_second(sky, spell.finish.instant)),
            Cell::text(utc_second(sky, spell.best.instant)),
            Cell::Number(spell.best.altitude.degrees(), 2),
            Cell::Number(judged.track.degrees(), 3),
            Cell::Number(judged.score.value, 3),
            Cell::Number(night.clear, 3),
            Cell::Number(night.go, 3),
            Cell::Number(night.lost_by_staying, 4),
        ])?;
    }
    table.finish()?;
    Ok(())
}
