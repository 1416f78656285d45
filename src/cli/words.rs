//! Reading the words of the command line: instants, steps, sites, lists of bodies and kinds.

use std::str::FromStr;

use super::CliError;
use crate::scenario::{Scenario, ScenarioError};
use crate::season::nights::LocalClock;
use crate::sky::calendar::{CivilDate, parse_utc};
use crate::sky::delta_t::TimeTables;
use crate::sky::place::Sky;
use crate::sky::refraction::Air;
use crate::sky::stars::{Star, StarCatalogue};
use crate::sky::time::J2000_JD;
use crate::sky::{Angle, Body, Site, Tt};

/// An instant as it was typed: UTC in ISO 8601, a month or year for its beginning, or `JD 2461000.5 TT`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct InstantWord(pub Tt);

impl FromStr for InstantWord {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let text = text.trim();
        if let Some(jd) = text.strip_prefix("JD").or_else(|| text.strip_prefix("jd")) {
            return julian_date(jd.trim()).map(InstantWord);
        }
        let utc = match parse_utc(text) {
            Ok(utc) => utc,
            Err(error) => {
                // A month or a year alone stands for its first day.
                let date = CivilDate::parse_start(text).map_err(|_| {
                    format!("{error}; an instant is written 2026-11-01, 2026-11, 2026-11-01T18:30:00Z or \"JD 2461000.5 TT\"")
                })?;
                crate::sky::Utc::from_days(date.days_at_midnight())
            }
        };
        Ok(InstantWord(TimeTables::embedded().tt_from_utc(utc)))
    }
}

/// `2461000.5 TT` with all its decimals: the whole days are taken off before the text becomes a number.
fn julian_date(text: &str) -> Result<Tt, String> {
    let wrong = || {
        format!(
            "\"JD {text}\" cannot be read; a Julian Date is written \"JD 2461000.5 TT\", in Terrestrial Time and not below 0"
        )
    };
    let number = text
        .strip_suffix("TT")
        .or_else(|| text.strip_suffix("tt"))
        .ok_or_else(wrong)?
        .trim();
    let (whole, fraction) = number.split_once('.').unwrap_or((number, "0"));
    let digits = |part: &str| !part.is_empty() && part.bytes().all(|byte| byte.is_ascii_digit());
    if !digits(whole) || !digits(fraction) || whole.len() > 9 {
        return Err(wrong());
    }
    let whole: f64 = whole.parse().map_err(|_| wrong())?;
    let fraction: f64 = format!("0.{fraction}").parse().map_err(|_| wrong())?;
    Ok(Tt::from_days((whole - J2000_JD) + fraction))
}

/// A step of time: `1d`, `6h`, `10min`, `30s`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StepWord {
    pub days: f64,
}

impl FromStr for StepWord {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let text = text.trim();
        let split = text
            .find(|c: char| c.is_ascii_alphabetic())
            .unwrap_or(text.len());
        let (number, unit) = text.split_at(split);
        let wrong = || format!("\"{text}\" is no step; write 1d, 6h, 10min or 30s");
        let number: f64 = number.trim().parse().map_err(|_| wrong())?;
        let unit_days = match unit.trim() {
            "d" | "day" | "days" => 1.0,
            "h" => 1.0 / 24.0,
            "min" => 1.0 / 1_440.0,
            "s" => 1.0 / 86_400.0,
            _ => return Err(wrong()),
        };
        let days = number * unit_days;
        // Below a millisecond the steps drown in the resolution of an instant.
        if days.is_finite() && days >= 0.001 / 86_400.0 {
            Ok(StepWord { days })
        } else {
            Err(format!(
                "a step of \"{text}\" never gets anywhere; it must be longer than 0.001 s, for example 1d"
            ))
        }
    }
}

/// A site as `LAT,LON` or `LAT,LON,ELEV_M`.
#[derive(Clone, Debug, PartialEq)]
pub struct SiteWord(pub Site);

impl FromStr for SiteWord {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, String> {
        let parts: Vec<&str> = text.split(',').map(str::trim).collect();
        let (latitude, longitude, elevation) = match parts[..] {
            [latitude, longitude] => (latitude, longitude, "0"),
            [latitude, longitude, elevation] => (latitude, longitude, elevation),
            _ => {
                return Err(format!(
                    "\"{text}\" is no site; write LAT,LON,ELEV_M, for example 47.5,-8.3,450"
                ));
            }
        };
        let number = |name: &str, value: &str, low: f64, high: f64| {
            let read: f64 = value
                .parse()
                .map_err(|_| format!("{name} \"{value}\" is no number"))?;
            if (low..=high).contains(&read) {
                Ok(read)
            } else {
                Err(format!("{name} {value} is outside {low} to {high}"))
            }
        };
        Ok(SiteWord(Site {
            name: String::new(),
            latitude: Angle::from_degrees(number("latitude", latitude, -90.0, 90.0)?),
            longitude: Angle::from_degrees(number("longitude", longitude, -360.0, 360.0)?).signed(),
            elevation_m: number("elevation", elevation, -500.0, 9_000.0)?,
            height_above_surroundings_m: 0.0,
            air: Air::default(),
            extinction_mag: 0.25,
        }))
    }
}

/// Splits `mars,venus` into bodies; `all` and `planets` stand for themselves.
///
/// # Errors
/// A word that names no body.
pub fn bodies(text: &str) -> Result<Vec<Body>, String> {
    let mut bodies: Vec<Body> = Vec::new();
    for word in text
        .split(',')
        .map(str::trim)
        .filter(|word| !word.is_empty())
    {
        let more = match word {
            "all" => Body::ALL.to_vec(),
            "planets" => Body::PLANETS.to_vec(),
            word => vec![word.parse::<Body>().map_err(|error| error.to_string())?],
        };
        for body in more {
            if !bodies.contains(&body) {
                bodies.push(body);
            }
        }
    }
    if bodies.is_empty() {
        return Err(String::from(
            "no body is named; write for example --bodies mars,venus",
        ));
    }
    Ok(bodies)
}

/// Named stars bright and near enough to the ecliptic to be met by planets.
pub(super) fn bright_zodiac_stars(epoch: Tt) -> Result<Vec<&'static Star>, CliError> {
    const FAINTEST: f64 = 3.0;
    let frame = crate::sky::frames::ReferenceFrame::j2000();
    let catalogue =
        StarCatalogue::embedded().map_err(|error| CliError::Failed(error.to_string()))?;
    Ok(catalogue
        .to_magnitude(FAINTEST)
        .iter()
        .filter(|star| star.name.is_some())
        .filter(|star| {
            (frame.ecliptic_from_icrs * star.direction_at(epoch))
                .latitude()
                .degrees()
                .abs()
                < 12.0
        })
        .collect())
}

/// The clock of a scenario's site from one instant to another.
///
/// # Errors
/// Outside the calendar's years.
pub(super) fn site_clock(
    scenario: &Scenario,
    sky: &Sky,
    from: Tt,
    to: Tt,
) -> Result<LocalClock, CliError> {
    let utc = |instant: Tt| sky.tables().utc_from_tt(instant);
    LocalClock::sampled(utc(from), utc(to), |utc| {
        scenario
            .zone
            .local_from_utc(scenario.site.longitude, utc)
            .map(|local| local.offset_seconds)
    })
    .map_err(|error| CliError::Scenario(ScenarioError::from(error)))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::sheet::words::julian_date_text;

    #[test]
    fn julian_dates_keep_their_decimals() {
        for text in [
            "2423196.947002845",
            "2460000.500000000",
            "1721057.000000001",
            "0.250000000",
        ] {
            let instant: InstantWord = format!("JD {text} TT").parse().unwrap();
            assert_eq!(julian_date_text(instant.0, 9), text);
        }
        for bad in [
            "JD 2460000.5",
            "JD -1 TT",
            "JD TT",
            "JD 1e5 TT",
            "JD 24.5.1 TT",
            "JD NaN TT",
            "yesterday",
        ] {
            assert!(bad.parse::<InstantWord>().is_err(), "{bad}");
        }
    }

    #[test]
    fn rounding_carries_into_the_day() {
        assert_eq!(
            julian_date_text(Tt::from_days(0.999_999_999_9), 9),
            "2451546.000000000"
        );
        assert_eq!(
            julian_date_text(Tt::from_days(-0.000_000_000_1), 9),
            "2451545.000000000"
        );
    }

    #[test]
    fn steps_and_sites() {
        assert_eq!("6h".parse::<StepWord>().unwrap().days, 0.25);
        for bad in ["0", "0d", "-1d", "1", "1y", "d", "nan d", "infd"] {
            assert!(bad.parse::<StepWord>().is_err(), "{bad}");
        }
        let site = "-35.1,138.6,50".parse::<SiteWord>().unwrap().0;
        assert!((site.latitude.degrees() + 35.1).abs() < 1e-12);
        for bad in [
            "91,0",
            "0,361",
            "1",
            "1,2,3,4",
            "a,b,c",
            "NaN,0,0",
            "0,0,99999",
        ] {
            assert!(bad.parse::<SiteWord>().is_err(), "{bad}");
        }
    }

    #[test]
    fn lists_of_bodies() {
        assert_eq!(
            bodies("mars, venus,mars").unwrap(),
            [Body::Mars, Body::Venus]
        );
        assert_eq!(bodies("planets").unwrap().len(), 7);
        assert!(bodies("vulcan").unwrap_err().contains("vulcan"));
        assert!(bodies(" , ").is_err());
    }
}
