//! The readings of a moment as words and numbers with their units: what the column shows and what is copied as text.

use crate::scenario::Plan;
use crate::season::horizon::HorizonKind;
use crate::season::moment::{Course, Moment, Readings, Tonight};
use crate::sheet::words::LocalClock;
use crate::sky::{Angle, Body, Caution, Cautions};

/// One reading: a number to be aligned on its decimal mark, or words.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    pub name: &'static str,
    pub value: Value,
}

#[derive(Clone, Debug, PartialEq)]
pub enum Value {
    Number {
        /// With a true minus sign.
        number: String,
        unit: String,
    },
    Words(String),
    /// A sentence over the full width.
    Sentence(String),
}

/// A body told in a single row.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    pub name: &'static str,
    /// Elongation with its side, distance in au, magnitude; the Sun has no elongation.
    pub elongation: Option<(String, &'static str)>,
    pub distance: String,
    pub magnitude: String,
}

/// Everything in the column.
#[derive(Clone, Debug, PartialEq)]
pub struct Column {
    pub subject: &'static str,
    /// The caution above all others: the Sun is up and near.
    pub sun_caution: Option<&'static str>,
    /// Further sentences.
    pub cautions: Vec<String>,
    /// Elongation, distance, magnitude.
    pub large: Vec<Line>,
    pub small: Vec<Line>,
    pub others: Vec<Row>,
    /// Sun and Moon as the sky's light.
    pub sky: Vec<Line>,
}

/// What to do while the Sun is up and near.
const SUN_CAUTION: &str = "The Sun is up and near. Never point optics or eyes there: wait until the whole disc has set beyond the true horizon (hidden by a roof is not set), and stop before it rises.";

/// A number with a true minus sign, and a plus where signs tell.
#[must_use]
pub fn signed(value: f64, decimals: usize) -> String {
    let plain = format!("{:.decimals$}", value.abs());
    let is_zero = plain.chars().all(|figure| matches!(figure, '0' | '.'));
    if is_zero {
        plain
    } else if value < 0.0 {
        format!("\u{2212}{plain}")
    } else {
        format!("+{plain}")
    }
}

/// A number with a true minus sign and no plus.
#[must_use]
pub fn plain(value: f64, decimals: usize) -> String {
    let text = signed(value, decimals);
    text.strip_prefix('+').map_or(text.clone(), str::to_owned)
}

fn number(name: &'static str, number: String, unit: impl Into<String>) -> Line {
    Line {
        name,
        value: Value::Number {
            number,
            unit: unit.into(),
        },
    }
}

fn words(name: &'static str, text: impl Into<String>) -> Line {
    Line {
        name,
        value: Value::Words(text.into()),
    }
}

fn sentence(text: impl Into<String>) -> Line {
    Line {
        name: "",
        value: Value::Sentence(text.into()),
    }
}

/// Distance: the Moon's needs another figure.
fn distance(body: Body, au: f64) -> String {
    plain(au, if body == Body::Moon { 4 } else { 3 })
}

/// Right ascension to a tenth of a second.
fn right_ascension(angle: Angle) -> String {
    let tenths = (angle.wrapped().hours() * 36_000.0).round() as i64 % 864_000;
    format!(
        "{}h {:02}m {:02}.{}s",
        tenths / 36_000,
        tenths / 600 % 60,
        tenths / 10 % 60,
        tenths % 10
    )
}

/// Declination to a second.
fn declination(angle: Angle) -> String {
    let seconds = (angle.degrees().abs() * 3600.0).round() as i64;
    let sign = match angle.degrees() {
        degrees if seconds != 0 && degrees < 0.0 => "\u{2212}",
        _ if seconds != 0 => "+",
        _ => "",
    };
    format!(
        "{sign}{}\u{b0} {:02}\u{2032} {:02}\u{2033}",
        seconds / 3600,
        seconds / 60 % 60,
        seconds % 60
    )
}

/// `5.4° behind the ridge`
fn over_skyline(readings: &Readings) -> String {
    let height = readings.height_over_skyline().degrees();
    let part = readings.skyline_part.as_deref().unwrap_or("the skyline");
    if height < 0.0 {
        format!("{:.1}\u{b0} behind {part}", -height)
    } else {
        format!("{height:.1}\u{b0} above {part}")
    }
}

impl Column {
    /// The readings at a moment; `tonight` is left out while it is being worked out.
    #[must_use]
    pub fn new(plan: &Plan, moment: &Moment, tonight: Option<&Tonight>) -> Option<Self> {
        let subject = moment.of(plan.season.subject)?;
        let others = moment
            .readings
            .iter()
            .filter(|readings| readings.body != subject.body)
            .map(|readings| Row {
                name: readings.body.name(),
                elongation: readings.elongation.map(|elongation| {
                    (plain(elongation.angle.degrees(), 1), side(elongation.side))
                }),
                distance: distance(readings.body, readings.distance_au),
                magnitude: signed(readings.magnitude.value, 1),
            })
            .collect();
        Some(Column {
            subject: subject.body.name(),
            sun_caution: subject
                .cautions
                .contains(Caution::SunNear)
                .then_some(SUN_CAUTION),
            cautions: cautions(plan, moment, subject),
            large: large(subject),
            small: small(plan, subject, moment, tonight),
            others,
            sky: sky(plan, moment, tonight),
        })
    }

    /// The column as text, a reading a line.
    #[must_use]
    pub fn text(&self, heading: &str) -> String {
        let mut text = format!("{heading}\n{}\n", self.subject);
        for caution in self
            .sun_caution
            .into_iter()
            .chain(self.cautions.iter().map(String::as_str))
        {
            text.push_str(&format!("CAUTION: {caution}\n"));
        }
        for line in self.large.iter().chain(&self.small).chain(&self.sky) {
            text.push_str(&line.text());
            text.push('\n');
        }
        for row in &self.others {
            let elongation = row
                .elongation
                .as_ref()
                .map_or_else(String::new, |(angle, side)| {
                    format!("elongation {angle}\u{b0} {side}, ")
                });
            text.push_str(&format!(
                "{}: {elongation}distance {} au, magnitude {}\n",
                row.name, row.distance, row.magnitude
            ));
        }
        text
    }
}

impl Line {
    /// `elongation 171.6° west`
    #[must_use]
    pub fn text(&self) -> String {
        match &self.value {
            Value::Number { number, unit } => {
                // Signs of arc stand close to their number.
                let close = unit.starts_with(['\u{b0}', '\u{2032}', '\u{2033}']);
                let gap = if close || unit.is_empty() { "" } else { " " };
                format!("{} {number}{gap}{unit}", self.name)
            }
            Value::Words(words) => format!("{} {words}", self.name),
            Value::Sentence(words) => words.clone(),
        }
    }
}

const fn side(side: crate::sky::place::Side) -> &'static str {
    side.word()
}

fn cautions(plan: &Plan, moment: &Moment, subject: &Readings) -> Vec<String> {
    let mut sentences = Vec::new();
    let rest: Cautions = subject.cautions.and(moment.cautions);
    for caution in rest.iter().filter(|caution| *caution != Caution::SunNear) {
        let mut sentence = super::capitalised(caution.sentence());
        if caution == Caution::DeltaTModelled {
            let delta_t = plan.sky.tables().delta_t(moment.instant);
            sentence.push_str(&format!(
                ": clock times may be {:.0} s off",
                delta_t.error_seconds.ceil()
            ));
        }
        sentences.push(sentence + ".");
    }
    sentences
}

fn large(subject: &Readings) -> Vec<Line> {
    let (angle, unit) = subject.elongation.map_or(
        (String::from("0.0"), String::from("\u{b0}")),
        |elongation| {
            (
                plain(elongation.angle.degrees(), 1),
                format!("\u{b0} {}", side(elongation.side)),
            )
        },
    );
    vec![
        number("elongation", angle, unit),
        number(
            "distance",
            distance(subject.body, subject.distance_au),
            "au",
        ),
        number("magnitude", signed(subject.magnitude.value, 2), ""),
    ]
}

fn small(plan: &Plan, subject: &Readings, moment: &Moment, tonight: Option<&Tonight>) -> Vec<Line> {
    let mut lines = vec![
        number(
            "altitude",
            plain(subject.apparent_altitude.degrees(), 1),
            "\u{b0}",
        ),
        number("azimuth", plain(subject.azimuth.degrees(), 1), "\u{b0}"),
        sentence(super::capitalised(&over_skyline(subject))),
    ];
    if let Some(passage) = tonight.and_then(|tonight| tonight.next_skyline_passage(moment.instant))
    {
        let clock = LocalClock {
            scenario: &plan.scenario,
            sky: &plan.sky,
        };
        let part = passage.part.as_deref().unwrap_or("the skyline");
        let verb = if passage.clears {
            "clears"
        } else {
            "goes behind"
        };
        lines.push(sentence(format!(
            "{} {part} at {}, az {:.0}\u{b0}",
            super::capitalised(verb),
            clock.time(passage.instant),
            passage.azimuth.degrees()
        )));
    }
    lines.extend(passages(plan, tonight));
    let per_day = subject.longitude_per_day.degrees();
    lines.extend([
        number("diameter", plain(subject.diameter.arcsec(), 1), "\u{2033}"),
        number(
            "lit",
            plain(100.0 * subject.lit_fraction.unwrap_or(1.0), 1),
            "%",
        ),
        number(
            "motion",
            signed(per_day, 3),
            format!("\u{b0} a day, {}", subject.sense().word()),
        ),
        words("in", subject.constellation.name()),
        words("RA", right_ascension(subject.equatorial.longitude)),
        words("Dec", declination(subject.equatorial.latitude)),
    ]);
    lines
}

/// Rise, culmination, set of the night, in words where one is missing.
fn passages(plan: &Plan, tonight: Option<&Tonight>) -> Vec<Line> {
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    let waiting = || String::from("\u{2026}");
    let Some(passages) = tonight.and_then(|tonight| tonight.of(plan.season.subject)) else {
        return vec![
            words("rises", waiting()),
            words("culminates", waiting()),
            words("sets", waiting()),
        ];
    };
    let mut lines = Vec::new();
    let never = match passages.course {
        Course::RisesOrSets => "not this night",
        Course::StaysUp => "up all day",
        Course::StaysDown => "down all day",
    };
    let passage = |event: Option<crate::season::horizon::HorizonEvent>| {
        event.map_or_else(
            || String::from(never),
            |event| {
                format!(
                    "{}, az {:.0}\u{b0}",
                    clock.time(event.instant),
                    event.value.degrees()
                )
            },
        )
    };
    lines.push(words("rises", passage(passages.rise)));
    lines.push(words(
        "culminates",
        passages.culmination.map_or_else(
            || String::from("not this night"),
            |transit| {
                format!(
                    "{}, {}\u{b0} up",
                    clock.time(transit.instant),
                    plain(transit.altitude.degrees(), 0)
                )
            },
        ),
    ));
    lines.push(words("sets", passage(passages.set)));
    lines
}

fn sky(plan: &Plan, moment: &Moment, tonight: Option<&Tonight>) -> Vec<Line> {
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    let state = &moment.sky;
    let up = if state.moon_is_up { "up" } else { "down" };
    let mut lines = vec![
        words("sky", state.twilight.phrase()),
        number(
            "Sun",
            plain(state.sun_altitude.degrees(), 1),
            "\u{b0} altitude",
        ),
        words(
            "Moon",
            format!(
                "{}, {:.0} %, {up}",
                state.moon_phase(),
                100.0 * state.moon_lit
            ),
        ),
    ];
    if let Some(tonight) = tonight {
        let at = |kind: HorizonKind| {
            tonight
                .sun
                .iter()
                .find(|event| event.kind == kind)
                .map(|event| clock.time(event.instant))
        };
        let set = at(HorizonKind::Set).unwrap_or_else(|| String::from("none"));
        let rise = at(HorizonKind::Rise).unwrap_or_else(|| String::from("none"));
        lines.push(words("sunset", format!("{set}, sunrise {rise}")));
        let dark = match (
            at(HorizonKind::AstronomicalDusk),
            at(HorizonKind::AstronomicalDawn),
        ) {
            (Some(from), Some(to)) => format!("{from} to {to}"),
            (Some(from), None) => format!("from {from}"),
            (None, Some(to)) => format!("until {to}"),
            (None, None) => String::from(
                if state.twilight == crate::season::moment::Twilight::Night {
                    "all night"
                } else {
                    "no full darkness"
                },
            ),
        };
        lines.push(words("dark", dark));
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn angles_carry_into_the_next_unit() {
        assert_eq!(
            right_ascension(Angle::from_hours(23.999_999_9)),
            "0h 00m 00.0s"
        );
        assert_eq!(right_ascension(Angle::from_hours(10.07)), "10h 04m 12.0s");
        assert_eq!(
            declination(Angle::from_degrees(-0.000_05)),
            "0\u{b0} 00\u{2032} 00\u{2033}"
        );
        assert_eq!(
            declination(Angle::from_degrees(-9.999_95)),
            "\u{2212}10\u{b0} 00\u{2032} 00\u{2033}"
        );
    }

    #[test]
    fn signs_are_true() {
        assert_eq!(signed(-1.16, 2), "\u{2212}1.16");
        assert_eq!(signed(0.001, 2), "0.00");
        assert_eq!(plain(3.12, 1), "3.1");
    }
}
