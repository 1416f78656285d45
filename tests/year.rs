//! Evenings of a year, against places by the full chain and by skyfield 1.55 with DE440.

use std::process::Command;

use loopwright::season::nights::LocalClock;
use loopwright::season::year::{Absence, Evening, House, Showing, Watch, Year, YearError, year};
use loopwright::season::{ClockTime, Conditions, Hours, MoonRule, NightRules, Other, Weekdays};
use loopwright::sheet::season_tables::YEAR_BODIES;
use loopwright::sky::calendar::{CivilDate, Weekday};
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::{Air, apparent_from_true};
use loopwright::sky::{Angle, Body, Site, Skyline, Tt};

fn site(latitude: f64, longitude: f64) -> Site {
    Site {
        name: "Somewhere".into(),
        latitude: Angle::from_degrees(latitude),
        longitude: Angle::from_degrees(longitude),
        elevation_m: 300.0,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.25,
    }
}

fn date(text: &str) -> CivilDate {
    CivilDate::parse_start(text).unwrap()
}

fn hours(from: (u8, u8), to: (u8, u8)) -> Option<Hours> {
    Some(Hours {
        from: ClockTime::new(from.0, from.1)?,
        to: ClockTime::new(to.0, to.1)?,
    })
}

fn conditions(least_altitude: f64, open: Option<Hours>) -> Conditions {
    Conditions {
        least_altitude: Angle::from_degrees(least_altitude),
        hours: open,
        moon: None,
        ..Conditions::default()
    }
}

/// Evenings at a site whose clock stands an hour before UTC, with no stars.
fn evenings(
    site: &Site,
    conditions: Conditions,
    house: &House,
    from: &str,
    days: u32,
) -> Result<Year, YearError> {
    let sky = Sky::de440().unwrap();
    let watch = Watch {
        site,
        skyline: &Skyline::default(),
        clock: &LocalClock::fixed(3_600),
        rules: &NightRules::from(conditions),
        house,
    };
    year(&sky, watch, &YEAR_BODIES, &[], date(from), days)
}

fn showing(evening: &Evening, body: Body) -> &Showing {
    let index = YEAR_BODIES.iter().position(|&other| other == body).unwrap();
    &evening.showings[index]
}

fn absence(evening: &Evening, body: Body) -> Option<Absence> {
    match showing(evening, body) {
        Showing::Absent(absence) => Some(*absence),
        Showing::InView(_) => None,
    }
}

fn every_day() -> House {
    House::on(Weekdays::ALL)
}

#[test]
fn the_house_decides_which_nights_there_are() {
    let mut house = House::on(Weekdays::from_days(&[Weekday::Friday]).unwrap());
    house.closed = vec![date("2026-12-25"), date("2027-01-01")];
    house.must = vec![date("2026-12-23"), date("2027-01-01")];
    let open = evenings(
        &site(50.0, 10.0),
        conditions(10.0, None),
        &house,
        "2026-12-14",
        28,
    )
    .unwrap();
    let dates: Vec<String> = open
        .evenings
        .iter()
        .map(|evening| evening.date.to_string())
        .collect();
    // 2026 December 18 is a Friday (ISO 8601 calendar).
    assert_eq!(
        dates,
        ["2026-12-18", "2026-12-23", "2027-01-01", "2027-01-08"]
    );
    for evening in &open.evenings {
        assert_eq!(evening.showings.len(), YEAR_BODIES.len());
    }
    house.weekdays = Weekdays::from_days(&[Weekday::Monday]).unwrap();
    house.must.clear();
    let never = evenings(
        &site(50.0, 10.0),
        conditions(10.0, None),
        &house,
        "2026-12-15",
        3,
    );
    assert!(never.unwrap_err().to_string().contains("no night"));
    assert!(matches!(
        evenings(
            &site(50.0, 10.0),
            conditions(10.0, None),
            &every_day(),
            "2026-12-15",
            0
        ),
        Err(YearError::NeverOpen { .. })
    ));
}

/// Every edge and every reason of a year against altitudes of the full chain, at four latitudes.
#[test]
fn a_year_holds_against_places_of_the_full_chain() {
    let sky = Sky::de440().unwrap();
    let least = 12.0;
    let open = hours((18, 30), (23, 15));
    for (latitude, longitude) in [(50.0, 15.0), (-35.0, 20.0), (68.0, 15.0), (-90.0, 0.0)] {
        let place = site(latitude, longitude);
        let found = evenings(
            &place,
            conditions(least, open),
            &every_day(),
            "2026-07-01",
            365,
        )
        .unwrap();
        assert_eq!(found.evenings.len(), 365);
        // Minutes of the clock and, by the full chain, the apparent altitude and the Sun's true one.
        let look = |body: Body, instant: Tt| {
            let vantage = sky.observer(&place, instant).unwrap();
            let altitude = |body: Body| {
                let seen = vantage.place(body).unwrap();
                vantage.horizontal(seen.apparent).unwrap().altitude
            };
            let utc = sky.tables().utc_from_tt(instant).days();
            let minutes = ((utc + 0.5) * 1_440.0 + 60.0).rem_euclid(1_440.0);
            (
                minutes,
                apparent_from_true(altitude(body), &place.air).degrees(),
                altitude(Body::Sun).degrees(),
            )
        };
        let fits = |(minutes, altitude, sun): (f64, f64, f64), slack: f64| {
            (1_110.0 - slack..1_395.0 + slack).contains(&minutes)
                && altitude >= least - slack / 10.0
                && sun <= -6.0 + slack / 10.0
        };
        for evening in found.evenings.iter().step_by(13) {
            for (&body, shown) in YEAR_BODIES.iter().zip(&evening.showings) {
                match shown {
                    Showing::InView(view) => {
                        for span in &view.spells {
                            assert!(evening.span.contains(span.from));
                            for instant in [span.from, span.middle(), span.to] {
                                assert!(fits(look(body, instant), 0.1), "{body} {}", evening.date);
                            }
                            for beyond in [span.from.plus_days(-0.002), span.to.plus_days(0.002)] {
                                assert!(
                                    !fits(look(body, beyond), -0.1),
                                    "{body} {}: it could be longer",
                                    evening.date
                                );
                            }
                        }
                        let (_, altitude, _) = look(body, view.best_at);
                        assert!((altitude - view.altitude.degrees()).abs() < 0.01);
                    }
                    Showing::Absent(absence) => {
                        let mut elsewhere = 0;
                        for k in 0..=288 {
                            let instant = evening
                                .span
                                .from
                                .plus_days(evening.span.days() * f64::from(k) / 288.0);
                            let (minutes, altitude, sun) = look(body, instant);
                            assert!(
                                !fits((minutes, altitude, sun), -0.1),
                                "{body} {}: {absence:?}, yet in view",
                                evening.date
                            );
                            elsewhere += i32::from(altitude > least + 0.5 && sun < -6.5);
                        }
                        match absence {
                            Absence::Low => {
                                // A stretch of less than 20 minutes may pass unnoticed.
                                assert!(elsewhere < 5, "{body} {}", evening.date);
                            }
                            Absence::Early | Absence::Late => {
                                let near = (0..=1_440).any(|minute| {
                                    let instant =
                                        evening.span.from.plus_days(f64::from(minute) / 1_440.0);
                                    let (_, altitude, sun) = look(body, instant);
                                    altitude > least - 0.1 && sun < -5.9
                                });
                                assert!(near, "{body} {}", evening.date);
                            }
                            _ => {}
                        }
                    }
                }
            }
        }
    }
}

/// Mars and Jupiter on 2027 February 19 at 21:30 UTC from 50.624 N, 10.307 E: 46.419 and 50.998 degrees with refraction
/// (skyfield 1.55, DE440); Mars is in opposition that day, so both still climb at the end of the hours.
#[test]
fn the_night_of_the_opposition_of_2027() {
    let mut place = site(50.624, 10.307);
    place.elevation_m = 486.0;
    let found = evenings(
        &place,
        conditions(20.0, hours((18, 0), (22, 30))),
        &every_day(),
        "2027-02-19",
        1,
    )
    .unwrap();
    let evening = &found.evenings[0];
    for (body, altitude) in [(Body::Mars, 46.419), (Body::Jupiter, 50.998)] {
        let view = showing(evening, body).in_view().expect("in view");
        assert!((view.altitude.degrees() - altitude).abs() < 0.02, "{body}");
        assert!(view.minutes() > 60.0);
    }
    // Brightest of that season (Mallama and Hilton 2018 by skyfield 1.55: -1.2 within a tenth).
    let mars = showing(evening, Body::Mars).in_view().unwrap();
    assert!((mars.magnitude + 1.2).abs() < 0.1, "{}", mars.magnitude);
}

/// Jupiter and Saturn on 2020 December 21 from 50 N, 10 E: 0.1025 degrees apart at the end of civil twilight, 0.1023 when
/// Jupiter stands 8.9 degrees high (skyfield 1.55, DE440).
#[test]
fn the_conjunction_of_2020_stands_in_the_margin_once() {
    let found = evenings(
        &site(50.0, 10.0),
        conditions(8.0, hours((16, 0), (22, 0))),
        &every_day(),
        "2020-12-05",
        40,
    )
    .unwrap();
    let mut dates = Vec::new();
    for evening in &found.evenings {
        for meeting in &evening.meetings {
            if meeting.body == Body::Jupiter && meeting.with == Other::Body(Body::Saturn) {
                dates.push(evening.date.to_string());
                assert!((meeting.separation.degrees() - 0.1024).abs() < 5e-4);
            }
        }
    }
    assert_eq!(dates, ["2020-12-21"]);
}

/// Reasons that follow from the configurations (DE440, skyfield 1.55): Mars in conjunction on 2026
/// January 9, Jupiter in opposition on 2026 January 10; Venus 47 degrees east of the Sun on 2025 January 10 and gone by 22:00.
#[test]
fn one_word_says_why_not() {
    let place = site(50.0, 10.0);
    let evening_of = |from: &str, open: Option<Hours>| {
        evenings(&place, conditions(10.0, open), &every_day(), from, 1)
            .unwrap()
            .evenings
            .remove(0)
    };
    let january = evening_of("2026-01-09", hours((19, 0), (23, 0)));
    assert_eq!(absence(&january, Body::Mars), Some(Absence::Sun));
    assert!(showing(&january, Body::Jupiter).in_view().is_some());
    let venus = evening_of("2025-01-10", hours((22, 0), (23, 30)));
    assert_eq!(absence(&venus, Body::Venus), Some(Absence::Early));
    // Jupiter a quarter of a year before opposition rises late in the evening.
    let october = evening_of("2025-10-01", hours((19, 0), (21, 0)));
    assert_eq!(absence(&october, Body::Jupiter), Some(Absence::Late));
    let strict = Conditions {
        moon: Some(MoonRule {
            least_distance: Angle::from_degrees(179.0),
            unless_lit_below: 0.0,
        }),
        ..conditions(10.0, hours((19, 0), (23, 0)))
    };
    // Full on 2026 January 3, so that it is up all evening.
    let moonlit = evenings(&place, strict, &every_day(), "2026-01-03", 1).unwrap();
    assert_eq!(
        absence(&moonlit.evenings[0], Body::Jupiter),
        Some(Absence::Moon)
    );
    assert!(
        showing(&moonlit.evenings[0], Body::Moon)
            .in_view()
            .is_some(),
        "the Moon does not close itself"
    );
}

#[test]
fn the_midnight_sun_leaves_nothing() {
    let found = evenings(
        &site(68.0, 20.0),
        conditions(5.0, None),
        &every_day(),
        "2026-06-10",
        20,
    )
    .unwrap();
    for evening in &found.evenings {
        for shown in &evening.showings {
            assert!(matches!(
                shown,
                Showing::Absent(Absence::Daylight | Absence::Sun)
            ));
        }
        assert!(evening.sun.set.is_none());
    }
}

fn run(words: &[&str]) -> (Option<i32>, String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_loopwright"))
        .args(words)
        .output()
        .unwrap();
    (
        output.status.code(),
        String::from_utf8(output.stdout).unwrap(),
        String::from_utf8(output.stderr).unwrap(),
    )
}

#[test]
fn the_command_prints_a_row_an_open_night() {
    let (status, text, errors) = run(&["year", "--from", "2026-09-01"]);
    assert_eq!(status, Some(0), "{errors}");
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let header = reader.headers().unwrap().clone();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    // Fridays and Saturdays of 365 days from a Tuesday.
    assert_eq!(rows.len(), 104);
    let column = |name: &str| header.iter().position(|other| other == name).unwrap();
    let mut in_view = 0;
    for row in &rows {
        assert!(["Friday", "Saturday"].contains(&&row[column("weekday")]));
        for body in YEAR_BODIES {
            let cell = |what: &str| &row[column(&format!("{}_{what}", body.word()))];
            // Either a view or a reason.
            assert_ne!(
                cell("from_local").is_empty(),
                cell("why_not").is_empty(),
                "{row:?}"
            );
            if !cell("from_local").is_empty() {
                in_view += 1;
                let clock = &cell("from_local")[11..16];
                assert!(("18:00"..="22:30").contains(&clock), "{clock}");
                assert!(cell("altitude_deg").parse::<f64>().unwrap() >= 20.0);
            }
        }
    }
    assert!(in_view > 100);

    let (status, text, _) = run(&[
        "year", "--from", "2026-11", "--days", "30", "--format", "json",
    ]);
    assert_eq!(status, Some(0));
    let rows: serde_json::Value = serde_json::from_str(&text).unwrap();
    assert!(rows[0]["mars_why_not"].is_string() || rows[0]["mars_from_local"].is_string());
    let (status, text, _) = run(&[
        "year", "--from", "2026-11", "--days", "30", "--format", "page",
    ]);
    assert_eq!(status, Some(0));
    assert!(text.starts_with("Evening"));
}

#[test]
fn wrong_words_are_explained() {
    for (words, status, expected) in [
        (vec!["--from", "soon"], 2, "2026-09-01"),
        (vec!["--from", "2026-02-30"], 2, "2026-09-01"),
        (vec!["--from", "2026", "--days", "0"], 2, "1..=3660"),
        (
            vec!["--from", "2026", "--least-altitude", "95"],
            2,
            "0 to 90",
        ),
        (
            vec!["--from", "2026", "--least-altitude", "nan"],
            2,
            "0 to 90",
        ),
        (vec!["nowhere.ron", "--from", "2026"], 1, "nowhere.ron"),
        // A Sunday alone; the built-in house opens on Fridays and Saturdays.
        (vec!["--from", "2026-11-01", "--days", "1"], 1, "no night"),
        (vec![], 2, "--from"),
    ] {
        let all: Vec<&str> = std::iter::once("year").chain(words).collect();
        let (code, text, errors) = run(&all);
        assert_eq!(code, Some(status), "{all:?}: {errors}");
        assert!(errors.contains(expected), "{all:?}: {errors}");
        assert!(text.is_empty() && !errors.contains("panicked"));
    }
}
