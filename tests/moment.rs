//! Readings at an instant and passages of a night against tables made from JPL DE440 with skyfield 1.55 (`topo.csv`,
//! `riseset.csv`), and against the engine's own geocentric places.

mod common;

use common::{degrees_apart, table};
use loopwright::season::moment::{Course, Sense, Twilight, Watch, moment, night_at, tonight};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::place::{Side, Sky};
use loopwright::sky::refraction::{Air, apparent_from_true};
use loopwright::sky::skyline::SkylinePoint;
use loopwright::sky::{Angle, Body, Caution, Site, Skyline, Tt};

fn site(latitude: f64, longitude: f64, elevation_m: f64) -> Site {
    Site {
        name: String::new(),
        latitude: Angle::from_degrees(latitude),
        longitude: Angle::from_degrees(longitude),
        elevation_m,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.25,
    }
}

fn watch<'a>(sky: &'a Sky, site: &'a Site, skyline: &'a Skyline, subject: Body) -> Watch<'a> {
    Watch {
        sky,
        site,
        skyline,
        subject,
        companions: &[],
        sun_distance: Angle::from_degrees(20.0),
    }
}

/// The tolerances are those of `tests/places.rs` with the rounding of the table: 1" for places.
#[test]
fn places_from_a_site_agree_with_de440() {
    const DEGREES: f64 = 1.0 / 3600.0;
    let sky = Sky::de440().unwrap();
    let flat = Skyline::default();
    let rows = table("topo.csv");
    for row in &rows {
        let site = site(
            row.number("lat_deg"),
            row.number("lon_deg"),
            row.number("elev_m"),
        );
        let body: Body = row.text("body").parse().unwrap();
        let now = moment(&watch(&sky, &site, &flat, body), row.tt("jd_tt")).unwrap();
        let read = &now.readings[0];
        assert_eq!(read.body, body);
        let apart = |a: Angle, column: &str| degrees_apart(a.degrees(), row.number(column)).abs();
        assert!(apart(read.altitude, "alt_deg") < DEGREES, "{body}");
        let across = apart(read.azimuth, "az_deg") * read.altitude.cos();
        assert!(across < DEGREES, "{body}");
        let across = apart(read.equatorial.longitude, "topo_ra_deg");
        assert!(across * read.equatorial.latitude.cos() < DEGREES, "{body}");
        assert!(apart(read.equatorial.latitude, "topo_dec_deg") < DEGREES);
        let distance = row.number("topo_dist_au");
        assert!((read.distance_au - distance).abs() < 1e-7, "{body}");
        let lifted = apparent_from_true(read.altitude, &site.air);
        assert_eq!(read.apparent_altitude, lifted);
        assert_eq!(read.height_over_skyline(), lifted);
    }
    assert!(rows.len() >= 40, "{}", rows.len());
}

/// The table prints whole seconds; see `tests/horizon.rs`.
#[test]
fn passages_of_a_night_agree_with_de440() {
    const SECONDS: f64 = 1.0;
    let sky = Sky::de440().unwrap();
    let flat = Skyline::default();
    let mut checked = 0;
    for row in &table("riseset.csv") {
        let site = site(
            row.number("lat_deg"),
            row.number("lon_deg"),
            row.number("elev_m"),
        );
        let tables = sky.tables();
        let from = tables.tt_from_utc(parse_utc(row.text("window_start_utc")).unwrap());
        let planet: Body = row.text("planet").parse().unwrap();
        let watch = watch(&sky, &site, &flat, planet);
        // The window's start is rounded to the second; any instant of the night will do.
        for hours in [0.01, 11.0, 23.99] {
            let span = night_at(&sky, &site, from.plus_days(hours / 24.0));
            assert!((span.from.days() - from.days()).abs() * 86_400.0 <= 0.6);
        }
        let night = tonight(&watch, from.plus_days(0.4)).unwrap();
        for (body, [rise, transit, set]) in [
            (planet, ["planet_rise", "planet_transit", "planet_set"]),
            (Body::Moon, ["moon_rise", "moon_transit", "moon_set"]),
            (Body::Sun, ["sunrise", "", "sunset"]),
        ] {
            let passages = night.of(body).unwrap();
            let found = [
                (rise, passages.rise.map(|event| event.instant)),
                (transit, passages.culmination.map(|event| event.instant)),
                (set, passages.set.map(|event| event.instant)),
            ];
            let mut crosses = false;
            for (column, instant) in found {
                if column.is_empty() {
                    continue;
                }
                let text = row.text(column);
                crosses |= !text.is_empty() && column != transit;
                match instant {
                    None => assert!(text.is_empty(), "{column} {text}"),
                    Some(instant) => {
                        let expected = tables.tt_from_utc(parse_utc(text).unwrap());
                        let off = (instant.days() - expected.days()).abs() * 86_400.0;
                        assert!(off <= SECONDS, "{column} {text} off by {off:.2} s");
                        checked += 1;
                    }
                }
            }
            assert_eq!(passages.course == Course::RisesOrSets, crosses, "{body}");
        }
    }
    assert!(checked > 100, "{checked}");
}

fn ridge() -> Skyline {
    let point = |azimuth: f64, altitude: f64, name: Option<&str>| SkylinePoint {
        azimuth,
        altitude,
        name: name.map(str::to_owned),
    };
    Skyline::new(vec![
        point(0.0, 2.0, None),
        point(90.0, 12.0, Some("the ridge")),
        point(180.0, 2.0, None),
        point(240.0, 2.0, None),
        point(240.0, 15.0, Some("the mill")),
        point(250.0, 15.0, None),
        point(250.0, 2.0, None),
    ])
    .unwrap()
}

#[test]
fn heights_over_the_skyline_change_sign_at_its_passages() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3, 480.0);
    let skyline = ridge();
    let watch = watch(&sky, &site, &skyline, Body::Mars);
    // February 2027: Mars is up all night.
    let instant = Tt::from_julian_date(2_461_449.3);
    let night = tonight(&watch, instant).unwrap();
    assert!(night.skyline.len() >= 2, "{:?}", night.skyline);
    let second = 1.0 / 86_400.0;
    for passage in &night.skyline {
        let height = |days: f64| {
            let now = moment(&watch, passage.instant.plus_days(days)).unwrap();
            now.readings[0].height_over_skyline()
        };
        let sign = if passage.clears { 1.0 } else { -1.0 };
        assert!(sign * height(2.0 * second).degrees() > 0.0, "{passage:?}");
        assert!(sign * height(-2.0 * second).degrees() < 0.0, "{passage:?}");
    }
    let first = &night.skyline[0];
    assert!(first.clears);
    assert_eq!(first.part.as_deref(), Some("the ridge"));
    let next = night.next_skyline_passage(night.span.from).unwrap();
    assert_eq!(next.instant, first.instant);
    assert!(night.next_skyline_passage(night.span.to).is_none());
}

/// Circumstances of Mars in 2027 from `tests/data/loops_2010_2030.csv` and by the definitions of the words.
#[test]
fn words_follow_the_numbers() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3, 480.0);
    let flat = Skyline::default();
    let watch = Watch {
        companions: &[Body::Jupiter, Body::Moon],
        ..watch(&sky, &site, &flat, Body::Mars)
    };
    // Opposition 19 February 2027: between the stations, opposite the Sun.
    let now = moment(&watch, Tt::from_julian_date(2_461_456.5)).unwrap();
    let bodies: Vec<Body> = now.readings.iter().map(|read| read.body).collect();
    assert_eq!(bodies, [Body::Mars, Body::Jupiter, Body::Moon, Body::Sun]);
    let mars = now.of(Body::Mars).unwrap();
    assert_eq!(mars.sense(), Sense::Westward);
    assert!(mars.elongation.unwrap().angle.degrees() > 170.0);
    assert!(mars.lit_fraction.unwrap() > 0.99);
    let sun = now.of(Body::Sun).unwrap();
    assert!(sun.elongation.is_none() && sun.lit_fraction.is_none());
    assert_eq!(sun.sense(), Sense::Eastward);
    assert_eq!(now.sky.sun_altitude, sun.altitude);
    // The motion is the Earth centre's.
    let geocentre = sky.geocentre(now.instant).unwrap();
    let rate = geocentre.place(Body::Mars).unwrap().ecliptic_rate();
    assert_eq!(mars.longitude_per_day, rate.longitude);
    assert!(now.of(Body::Venus).is_none());
    for (degrees, twilight) in [
        (3.0, Twilight::Day),
        (-0.5, Twilight::Day),
        (-0.9, Twilight::Civil),
        (-6.1, Twilight::Nautical),
        (-12.1, Twilight::Astronomical),
        (-18.1, Twilight::Night),
    ] {
        assert_eq!(Twilight::of(Angle::from_degrees(degrees)), twilight);
    }
}

/// Full Moon 2027-02-20 23:24 UTC, new Moon 2027-03-08 09:30 UTC (from memory, to the hour; the words have a day's room).
#[test]
fn the_moon_has_its_phase() {
    let sky = Sky::de440().unwrap();
    let site = site(50.6, 10.3, 480.0);
    let flat = Skyline::default();
    let watch = watch(&sky, &site, &flat, Body::Mars);
    for (jd, phase) in [
        (2_461_457.475, "full Moon"),
        (2_461_472.9, "new Moon"),
        (2_461_462.0, "waning gibbous"),
        (2_461_476.0, "waxing crescent"),
    ] {
        let now = moment(&watch, Tt::from_julian_date(jd)).unwrap();
        assert_eq!(now.sky.moon_phase(), phase, "{jd}");
        let moon = now.of(Body::Moon).unwrap();
        assert_eq!(moon.lit_fraction.unwrap(), now.sky.moon_lit);
    }
}

#[test]
fn the_sun_caution_stands_by_day_near_the_sun_and_only_then() {
    let sky = Sky::de440().unwrap();
    let site = site(47.2, 13.0, 600.0);
    let flat = Skyline::default();
    let watch = watch(&sky, &site, &flat, Body::Mercury);
    let (mut with, mut without) = (0, 0);
    for hour in 0..(40 * 24) {
        // From the inferior conjunction of 13 May 2029 back through the greatest elongation.
        let instant = Tt::from_julian_date(2_462_235.0).plus_days(f64::from(hour) / 24.0);
        let now = moment(&watch, instant).unwrap();
        let mercury = &now.readings[0];
        let elongation = mercury.elongation.unwrap();
        let expected = elongation.angle.degrees() < 20.0 && now.sky.twilight == Twilight::Day;
        assert_eq!(mercury.cautions.contains(Caution::SunNear), expected);
        with += usize::from(expected);
        without += usize::from(!expected);
        if elongation.angle.degrees() > 15.0 {
            let east = now.of(Body::Sun).unwrap().ecliptic.longitude;
            let east = (mercury.ecliptic.longitude - east).signed() > Angle::ZERO;
            assert_eq!(elongation.side == Side::East, east);
        }
        let sun = now.of(Body::Sun).unwrap();
        assert_eq!(
            sun.cautions.contains(Caution::SunNear),
            now.sky.twilight == Twilight::Day
        );
    }
    assert!(with > 50 && without > 50, "{with} {without}");
}

#[test]
fn bodies_that_never_cross_the_horizon_say_which_way() {
    let sky = Sky::de440().unwrap();
    // June at 70 N: the Sun stays up; December: it stays down.
    let site = site(70.0, 20.0, 0.0);
    let flat = Skyline::default();
    let watch = watch(&sky, &site, &flat, Body::Mars);
    for (jd, course) in [
        (2_461_578.0, Course::StaysUp),
        (2_461_761.0, Course::StaysDown),
    ] {
        let night = tonight(&watch, Tt::from_julian_date(jd)).unwrap();
        let sun = night.of(Body::Sun).unwrap();
        assert_eq!(sun.course, course);
        assert!(sun.rise.is_none() && sun.set.is_none());
        assert!(sun.culmination.is_some());
    }
}

#[test]
fn an_instant_outside_the_tables_is_refused() {
    let sky = Sky::de440().unwrap();
    let site = site(50.0, 10.0, 0.0);
    let flat = Skyline::default();
    let watch = watch(&sky, &site, &flat, Body::Mars);
    assert!(moment(&watch, Tt::from_days(1e7)).is_err());
    assert!(tonight(&watch, Tt::from_days(1e7)).is_err());
}
