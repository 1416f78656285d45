//! Stepping time under the three holds. The clock is checked against `chrono` with the IANA database, the stars against
//! the Earth rotation angle of the IAU's standard routines (crate `sofars`), the Sun against the engine's own places.

use chrono::{Offset, TimeZone};
use chrono_tz::Tz;
use loopwright::season::hold::{Anchor, Hold, Missed, Step, StepError, Stepper};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::Air;
use loopwright::sky::stars::StarCatalogue;
use loopwright::sky::time::J2000_JD;
use loopwright::sky::{Angle, Body, Site, Tt, Utc};

fn site(latitude: f64, longitude: f64) -> Site {
    Site {
        name: String::new(),
        latitude: Angle::from_degrees(latitude),
        longitude: Angle::from_degrees(longitude),
        elevation_m: 100.0,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.25,
    }
}

fn tt(sky: &Sky, utc: &str) -> Tt {
    sky.tables().tt_from_utc(parse_utc(utc).unwrap())
}

/// Seconds since 1970 of an instant, rounded.
fn unix(sky: &Sky, instant: Tt) -> i64 {
    let days = sky.tables().utc_from_tt(instant).days();
    (days * 86_400.0 + 946_728_000.0).round() as i64
}

fn local(sky: &Sky, zone: Tz, instant: Tt) -> String {
    let utc = chrono::DateTime::from_timestamp(unix(sky, instant), 0).unwrap();
    utc.with_timezone(&zone)
        .format("%Y-%m-%d %H:%M:%S")
        .to_string()
}

fn offset(zone: Tz) -> impl Fn(Utc) -> Option<f64> {
    move |utc: Utc| {
        let seconds = (utc.days() * 86_400.0 + 946_728_000.0).round() as i64;
        let utc = chrono::DateTime::from_timestamp(seconds, 0)?;
        let offset = zone.offset_from_utc_datetime(&utc.naive_utc());
        Some(f64::from(offset.fix().local_minus_utc()))
    }
}

#[test]
fn the_clock_on_the_wall_is_kept_across_its_changes() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3);
    let zone = chrono_tz::Europe::Berlin;
    let zone_offset = offset(zone);
    let stepper = Stepper {
        sky: &sky,
        site: &site,
        zone_offset: &zone_offset,
    };
    // 21:30 in winter; summer time from 28 March to 31 October 2027.
    let from = tt(&sky, "2027-03-01T20:30:00Z");
    assert_eq!(local(&sky, zone, from), "2027-03-01 21:30:00");
    let anchor = Anchor::new(&stepper, from, Hold::Clock).unwrap();
    assert_eq!(anchor.hold(), Hold::Clock);
    for days in [-120, -5, -1, 0, 1, 26, 27, 28, 100, 244, 245, 300] {
        let stepped = anchor.after(&stepper, days).unwrap();
        let date = chrono::NaiveDate::from_ymd_opt(2027, 3, 1).unwrap()
            + chrono::TimeDelta::days(i64::from(days));
        let expected = format!("{} 21:30:00", date.format("%Y-%m-%d"));
        assert_eq!(local(&sky, zone, stepped.instant), expected);
        assert_eq!(stepped.missed, None);
    }
}

/// EU summer time 2027: 02:00 becomes 03:00 on 28 March, 03:00 becomes 02:00 on 31 October (directive 2000/84/EC).
#[test]
fn readings_that_are_skipped_or_come_twice_follow_the_rule() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3);
    let zone = chrono_tz::Europe::Berlin;
    let zone_offset = offset(zone);
    let stepper = Stepper {
        sky: &sky,
        site: &site,
        zone_offset: &zone_offset,
    };
    let anchor = Anchor::new(&stepper, tt(&sky, "2027-03-27T01:30:00Z"), Hold::Clock).unwrap();
    let skipped = anchor.after(&stepper, 1).unwrap();
    assert_eq!(local(&sky, zone, skipped.instant), "2027-03-28 03:30:00");
    assert_eq!(skipped.missed, Some(Missed::ClockReading));
    // No trace of it on the next day.
    let next = anchor.after(&stepper, 2).unwrap();
    assert_eq!(local(&sky, zone, next.instant), "2027-03-29 02:30:00");
    assert_eq!(next.missed, None);
    let anchor = Anchor::new(&stepper, tt(&sky, "2027-10-30T00:30:00Z"), Hold::Clock).unwrap();
    let twice = anchor.after(&stepper, 1).unwrap();
    // The first 02:30 of the day is that of summer time.
    assert!((unix(&sky, twice.instant) - unix(&sky, tt(&sky, "2027-10-31T00:30:00Z"))).abs() < 1);
    assert_eq!(twice.missed, None);
}

#[test]
fn a_clock_beyond_its_calendar_is_an_error() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3);
    let zone_offset = |utc: Utc| (utc.days() < 10_000.0).then_some(0.0);
    let stepper = Stepper {
        sky: &sky,
        site: &site,
        zone_offset: &zone_offset,
    };
    let anchor = Anchor::new(&stepper, Tt::from_days(9_990.0), Hold::Clock).unwrap();
    assert!(anchor.after(&stepper, 5).is_ok());
    let error = anchor.after(&stepper, 50).unwrap_err().to_string();
    assert!(error.contains("calendar"), "{error}");
}

fn sun_altitude(sky: &Sky, site: &Site, instant: Tt) -> (f64, f64) {
    let vantage = sky.observer(site, instant).unwrap();
    let sun = vantage.place(Body::Sun).unwrap();
    (
        vantage.horizontal(sun.apparent).unwrap().altitude.degrees(),
        vantage.hour_angle(&sun).unwrap().degrees(),
    )
}

fn no_zone(_: Utc) -> Option<f64> {
    Some(0.0)
}

#[test]
fn the_sun_keeps_its_altitude_and_its_side() {
    let sky = Sky::de440().unwrap();
    for (latitude, longitude) in [(50.6, 10.3), (-35.0, 137.8), (0.0, -80.0), (47.2, 13.0)] {
        let site = site(latitude, longitude);
        let stepper = Stepper {
            sky: &sky,
            site: &site,
            zone_offset: &no_zone,
        };
        for hour in 0..24 {
            let from = Tt::from_days(9_900.0 + f64::from(hour) / 24.0);
            let anchor = Anchor::new(&stepper, from, Hold::Sun).unwrap();
            let (altitude, angle) = sun_altitude(&sky, &site, from);
            for days in [-30, -1, 1, 5, 40] {
                let stepped = anchor.after(&stepper, days).unwrap();
                let (there, there_angle) = sun_altitude(&sky, &site, stepped.instant);
                let gone = stepped.instant.days() - from.days();
                assert!((gone - f64::from(days)).abs() < 0.5, "{gone}");
                match stepped.missed {
                    None => {
                        assert!((there - altitude).abs() < 0.01, "{latitude} {hour} {days}");
                        // Within minutes of a culmination there is no side.
                        if angle.abs() > 3.0 && angle.abs() < 177.0 {
                            assert_eq!(angle < 0.0, there_angle < 0.0, "{angle} {there_angle}");
                        }
                    }
                    Some(Missed::SunAltitude { wanted, nearest }) => {
                        assert!((wanted.degrees() - altitude).abs() < 1e-9);
                        assert!((nearest.degrees() - there).abs() < 1e-6);
                        assert!((nearest - wanted).degrees().abs() >= 0.001);
                    }
                    Some(other) => panic!("{other:?}"),
                }
            }
        }
    }
}

#[test]
fn where_the_sun_does_not_come_the_nearest_is_taken_and_forgotten_again() {
    let sky = Sky::de440().unwrap();
    let site = site(68.14, 14.62);
    let stepper = Stepper {
        sky: &sky,
        site: &site,
        zone_offset: &no_zone,
    };
    // An evening of March with the Sun 8 degrees down.
    let noon = tt(&sky, "2038-03-20T11:00:00Z");
    let from = (0..1440)
        .map(|minute| noon.plus_days(f64::from(minute) / 1440.0))
        .find(|&instant| sun_altitude(&sky, &site, instant).0 < -8.0)
        .unwrap();
    let anchor = Anchor::new(&stepper, from, Hold::Sun).unwrap();
    let altitude = sun_altitude(&sky, &site, from).0;
    // In June it stays up: the nearest is the lowest, at the lower transit.
    let june = anchor.after(&stepper, 90).unwrap();
    let Some(Missed::SunAltitude { nearest, .. }) = june.missed else {
        panic!("{june:?}");
    };
    let (there, angle) = sun_altitude(&sky, &site, june.instant);
    assert!((there - nearest.degrees()).abs() < 1e-6 && there > 0.0);
    assert!(angle.abs() > 175.0, "{angle}");
    for minutes in [-20.0, 20.0] {
        let off = june.instant.plus_days(minutes / 1440.0);
        assert!(sun_altitude(&sky, &site, off).0 > there);
    }
    let said = june.missed.unwrap().to_string();
    assert!(
        said.contains("sinks only to") && said.contains("\u{2212}8"),
        "{said}"
    );
    // In September all is as before.
    let september = anchor.after(&stepper, 190).unwrap();
    assert_eq!(september.missed, None);
    assert!((sun_altitude(&sky, &site, september.instant).0 - altitude).abs() < 0.01);
}

#[test]
fn at_the_pole_there_is_an_answer_for_every_hold() {
    let sky = Sky::de440().unwrap();
    for latitude in [90.0, -90.0] {
        let site = site(latitude, 0.0);
        let stepper = Stepper {
            sky: &sky,
            site: &site,
            zone_offset: &no_zone,
        };
        for hold in Hold::ALL {
            let anchor = Anchor::new(&stepper, Tt::from_days(9_900.3), hold).unwrap();
            for days in [-100, -1, 1, 100] {
                let stepped = anchor.after(&stepper, days).unwrap();
                let gone = stepped.instant.days() - 9_900.3;
                assert!((gone - f64::from(days)).abs() < 1.0, "{hold:?} {gone}");
            }
        }
    }
}

#[test]
fn the_stars_stay_when_they_are_held() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3);
    let stepper = Stepper {
        sky: &sky,
        site: &site,
        zone_offset: &no_zone,
    };
    let from = Tt::from_days(9_850.8);
    let anchor = Anchor::new(&stepper, from, Hold::Stars).unwrap();
    let stars = StarCatalogue::embedded().unwrap().to_magnitude(2.5);
    let altitudes = |instant: Tt| -> Vec<f64> {
        let vantage = sky.observer(&site, instant).unwrap();
        let seen = |direction| {
            vantage
                .horizontal(vantage.apparent_of_star(direction))
                .unwrap()
        };
        stars
            .iter()
            .map(|star| seen(star.direction_at(instant)).altitude.degrees())
            .collect()
    };
    let before = altitudes(from);
    let era = |instant: Tt| {
        let ut1 = sky.tables().ut1_from_tt(instant);
        sofars::erst::era00(J2000_JD, ut1.days())
    };
    for days in [-200, -7, 1, 30, 212] {
        let instant = anchor.after(&stepper, days).unwrap().instant;
        let turned = (era(instant) - era(from) + 3.0).rem_euclid(std::f64::consts::TAU) - 3.0;
        // 1e-9 radians are 0.014 ms of the Earth's turning.
        assert!(turned.abs() < 2e-8, "{turned}");
        for (a, b) in before.iter().zip(altitudes(instant)) {
            // Aberration swings by 41" at most, the pole wanders 12" in 212 days with nutation's 9".
            assert!((a - b).abs() < 70.0 / 3600.0, "{a} {b}");
        }
    }
}

#[test]
fn steps_are_read_as_they_are_typed_and_written_back() {
    for (text, step, written) in [
        ("10 min", Step::Elapsed(600.0), "10 min"),
        ("10min", Step::Elapsed(600.0), "10 min"),
        (" 1 h ", Step::Elapsed(3600.0), "1 h"),
        ("1.5 h", Step::Elapsed(5400.0), "1.5 h"),
        ("90 minutes", Step::Elapsed(5400.0), "1.5 h"),
        ("30 s", Step::Elapsed(30.0), "30 s"),
        ("1 day", Step::Days(1), "1 day"),
        ("5 days", Step::Days(5), "5 days"),
        ("2 Weeks", Step::Days(14), "14 days"),
    ] {
        assert_eq!(text.parse(), Ok(step), "{text}");
        assert_eq!(step.to_string(), written);
        assert_eq!(written.parse(), Ok(step));
    }
}

#[test]
fn what_is_no_step_is_told_with_what_would_work() {
    let error = |text: &str| text.parse::<Step>().unwrap_err();
    assert_eq!(error("  "), StepError::Empty);
    assert_eq!(error("day"), StepError::NoNumber("day".into()));
    assert_eq!(error("1.2.3 h"), StepError::NoNumber("1.2.3 h".into()));
    assert_eq!(error("1,5 h"), StepError::Comma("1,5 h".into()));
    assert_eq!(error("5"), StepError::NoUnit("5".into()));
    assert_eq!(
        error("5 fortnights"),
        StepError::UnknownUnit("fortnights".into())
    );
    assert_eq!(error("1.5 days"), StepError::PartOfDay(1.5));
    for text in ["0 min", "-1 day", "0 days", "5000 days", "0.5 s", "1e9 h"] {
        let error = error(text);
        assert!(
            matches!(error, StepError::OutOfRange(_) | StepError::UnknownUnit(_)),
            "{text}: {error:?}"
        );
    }
    for text in ["", "x", "3", "3 q", "1.5 days", "1,5 h"] {
        let words = error(text).to_string();
        assert!(words.contains(" h") || words.contains("hours"), "{words}");
    }
}
