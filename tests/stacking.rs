//! Stacked pictures: pixels of both kinds, and the instants of the rules against tables and closed forms.

#[allow(dead_code)] // It serves other tests, too.
mod common;

use std::convert::Infallible;
use std::ops::Range;

use common::table;
use loopwright::season::framing::{FrameError, PhotoFrame, Pixel, lean_from_zenith};
use loopwright::season::lens::{Lens, OutOfRange, Sensor};
use loopwright::season::stacking::{
    GroundFrame, GroundReadings, GroundRule, GroundStack, LocalClock, NightHalf, NotMet, RuleError,
    RuleNight, RuleSurvey, StarStack, rule_instant, survey_rule,
};
use loopwright::season::{ClockTime, Span};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::place::{Horizontal, Sky, SkyError};
use loopwright::sky::refraction::Air;
use loopwright::sky::{Angle, Body, Site, Tt, Vec3};
use proptest::prelude::*;

fn degrees(value: f64) -> Angle {
    Angle::from_degrees(value)
}

fn over_ground(azimuth: f64, altitude: f64) -> Horizontal {
    Horizontal {
        azimuth: degrees(azimuth),
        altitude: degrees(altitude),
    }
}

fn camera(focal_length_mm: f64) -> (Lens, Sensor) {
    (
        Lens::new("test", focal_length_mm, 4.0).unwrap(),
        Sensor::new(36.0, 24.0, 6000, 4000).unwrap(),
    )
}

#[track_caller]
fn close(got: f64, expected: f64, tolerance: f64) {
    assert!(
        (got - expected).abs() <= tolerance,
        "{got} against {expected}"
    );
}

/// Gnomonic places by `tpxes` of pyerfa 2.0.1.5 with azimuth and altitude as its coordinates; right is along the azimuth.
#[test]
fn ground_pixels_agree_with_erfa() {
    let (lens, sensor) = camera(35.0);
    // 35 mm over 6 um.
    let scale = 35.0 / 0.006;
    for ((az, alt), (az0, alt0), (x, y)) in [
        (
            (250.0, 8.0),
            (260.0, 12.0),
            (-0.174_959_071_921_314_4, -0.067_791_296_272_453_14),
        ),
        (
            (5.0, 30.0),
            (350.0, 20.0),
            (0.234_195_964_108_838_56, 0.191_981_042_887_357_2),
        ),
    ] {
        let frame = GroundFrame::new(over_ground(az0, alt0), Angle::ZERO, &lens, &sensor).unwrap();
        let pixel = frame.pixel(over_ground(az, alt)).unwrap();
        close(pixel.x, 3000.0 + scale * x, 1e-8);
        close(pixel.y, 2000.0 - scale * y, 1e-8);
        let back = frame.place(pixel);
        close(back.azimuth.degrees(), az, 1e-9);
        close(back.altitude.degrees(), alt, 1e-9);
        assert!(frame.holds(over_ground(az, alt)));
        assert_eq!(frame.pixel(over_ground(az0 + 180.0, 0.0)), None);
    }
}

/// One sky, two cameras: stars by hour angle and declination at latitude 50, their azimuths and altitudes and the parallactic
/// angle of the first by `hd2ae` and `hd2pa` of pyerfa 2.0.1.5.
#[test]
fn a_rolled_camera_over_the_ground_takes_the_same_picture_as_a_tilted_one_of_the_sky() {
    let (lens, sensor) = camera(50.0);
    let stars = [
        (30.0, 20.0, 229.340_165_115_963_12, 51.730_084_931_293_22),
        (27.0, 23.0, 227.935_346_494_193_06, 55.742_520_351_900_474),
        (36.0, 12.0, 230.582_426_430_397_42, 41.907_646_087_462_78),
    ];
    let parallactic = degrees(31.258_963_497_548_276);
    for tilt in [0.0, 25.0, -140.0] {
        let star_frame = PhotoFrame::new(
            Vec3::from_spherical(degrees(-30.0), degrees(20.0)),
            degrees(tilt),
            &lens,
            &sensor,
        )
        .unwrap();
        let lean = lean_from_zenith(degrees(tilt), parallactic);
        let ground =
            GroundFrame::new(over_ground(stars[0].2, stars[0].3), lean, &lens, &sensor).unwrap();
        for (hour_angle, declination, azimuth, altitude) in stars {
            let by_sky = star_frame
                .pixel(Vec3::from_spherical(
                    degrees(-hour_angle),
                    degrees(declination),
                ))
                .unwrap();
            let by_ground = ground.pixel(over_ground(azimuth, altitude)).unwrap();
            close(by_sky.x, by_ground.x, 1e-6);
            close(by_sky.y, by_ground.y, 1e-6);
        }
    }
}

#[test]
fn a_level_camera_is_aimed_at_the_middle_of_an_arc_across_north() {
    let (lens, sensor) = camera(24.0);
    let arc = [
        over_ground(350.0, 4.0),
        over_ground(2.0, 16.0),
        over_ground(16.0, 6.0),
    ];
    let frame = GroundFrame::level_around(&arc, &lens, &sensor).unwrap();
    close(frame.aim().azimuth.degrees(), 3.0, 1e-9);
    close(frame.aim().altitude.degrees(), 10.0, 1e-9);
    close(frame.roll().degrees(), 0.0, 0.0);
    close(frame.field().0.degrees(), 73.740, 0.001); // 2 atan(36/48)
    let picks = arc.map(|place| (Tt::from_days(0.0), place));
    let stack = GroundStack::new(frame, GroundRule::default(), &picks);
    assert!(stack.dots.iter().all(|dot| dot.held));
    assert_eq!(
        GroundFrame::level_around(&[], &lens, &sensor),
        Err(FrameError::NoDirections)
    );
    let wide = [
        over_ground(0.0, 5.0),
        over_ground(100.0, 5.0),
        over_ground(200.0, 5.0),
    ];
    assert!(matches!(
        GroundFrame::level_around(&wide, &lens, &sensor),
        Err(FrameError::TooWide { .. })
    ));
    for bad in [over_ground(f64::NAN, 0.0), over_ground(0.0, 91.0)] {
        assert!(GroundFrame::new(bad, Angle::ZERO, &lens, &sensor).is_err());
    }
}

#[test]
fn dots_on_the_stars_keep_their_order_and_say_whether_they_are_held() {
    let (lens, sensor) = camera(100.0);
    let at = |a: f64, d: f64| Vec3::from_spherical(degrees(a), degrees(d));
    let frame = PhotoFrame::new(at(10.0, 5.0), Angle::ZERO, &lens, &sensor).unwrap();
    let picks = [
        (Tt::from_days(1.0), at(10.0, 5.0)),
        (Tt::from_days(2.0), at(30.0, 5.0)),
        (Tt::from_days(3.0), at(190.0, -5.0)),
    ];
    let stack = StarStack::new(frame, &picks);
    assert_eq!(
        stack.dots.iter().map(|dot| dot.held).collect::<Vec<_>>(),
        [true, false, false]
    );
    let middle = stack.dots[0].pixel.unwrap();
    close(middle.x, 3000.0, 1e-9);
    close(middle.y, 2000.0, 1e-9);
    // East is to the left when north is up.
    assert!(stack.dots[1].pixel.unwrap().x < 0.0);
    assert_eq!(stack.dots[2].pixel, None);
    assert_eq!(stack.dots[2].instant, Tt::from_days(3.0));
}

/// The engine's own Sun and sidereal time.
struct AtSite<'a> {
    sky: &'a Sky,
    site: Site,
}

impl GroundReadings for AtSite<'_> {
    type Error = SkyError;

    fn sun_altitude(&self, instant: Tt) -> Result<Angle, SkyError> {
        let vantage = self.sky.observer(&self.site, instant)?;
        let sun = vantage.place(Body::Sun)?;
        Ok(vantage.horizontal(sun.apparent).unwrap().altitude)
    }

    fn sidereal_time(&self, instant: Tt) -> Result<Angle, SkyError> {
        Ok(self
            .sky
            .observer(&self.site, instant)?
            .sidereal_time()
            .unwrap())
    }

    fn local_clock(&self, _instant: Tt) -> Result<LocalClock, SkyError> {
        Ok(LocalClock {
            minutes: 0.0,
            utc_offset_minutes: 0.0,
        })
    }
}

/// Twilights and sunsets of DE440 through skyfield 1.55, to the second (`riseset.csv`); blank where there is none.
#[test]
fn sun_rules_agree_with_de440() {
    let sky = Sky::de440().unwrap();
    let tables = sky.tables();
    let mut checked = 0;
    for row in table("riseset.csv") {
        let from = tables.tt_from_utc(parse_utc(row.text("window_start_utc")).unwrap());
        let night = Span {
            from,
            to: from.plus_days(1.0),
        };
        let site = Site {
            name: String::new(),
            latitude: degrees(row.number("lat_deg")),
            longitude: degrees(row.number("lon_deg")),
            elevation_m: row.number("elev_m"),
            height_above_surroundings_m: 0.0,
            air: Air {
                pressure_hpa: 1010.0,
                temperature_c: 10.0,
            },
            extinction_mag: 0.25,
        };
        let readings = AtSite { sky: &sky, site };
        let sun = |altitude: f64, half| GroundRule::SunAltitude {
            altitude: degrees(altitude),
            half,
        };
        let by_edge = |minutes, half| GroundRule::FromSunset { minutes, half };
        use NightHalf::{Evening, Morning};
        for (rule, column, later_s) in [
            (GroundRule::default(), "civil_dusk", 0.0),
            (sun(-12.0, Evening), "nautical_dusk", 0.0),
            (sun(-6.0, Morning), "civil_dawn", 0.0),
            (sun(-18.0, Morning), "astro_dawn", 0.0),
            (by_edge(5.0, Evening), "sunset", 300.0),
            (by_edge(10.0, Morning), "sunrise", -600.0),
        ] {
            let found = rule_instant(rule, night, &readings).unwrap();
            match (row.text(column), found) {
                ("", RuleNight::NotMet { .. }) => {}
                (text, RuleNight::Met(seen)) if !text.is_empty() => {
                    let expected = parse_utc(text).unwrap().days() * 86_400.0 + later_s;
                    close(
                        tables.utc_from_tt(seen.instant).days() * 86_400.0,
                        expected,
                        1.0,
                    );
                    assert!(seen.sun_is_down);
                    checked += 1;
                }
                (text, found) => panic!(
                    "{column} at latitude {}: \"{text}\", found {found:?}",
                    row.text("lat_deg")
                ),
            }
        }
        let wanted = degrees(row.number("lat_deg").rem_euclid(360.0));
        let RuleNight::Met(seen) =
            rule_instant(GroundRule::SiderealTime(wanted), night, &readings).unwrap()
        else {
            panic!("a sidereal time comes every night")
        };
        assert!(night.contains(seen.instant));
        // A second of time is 15".
        let off = readings.sidereal_time(seen.instant).unwrap() - wanted;
        close(off.signed().arcsec(), 0.0, 0.5);
    }
    assert!(checked > 90, "{checked} checked");
}

/// A Sun that goes round at a fixed declination, due south at days + 0.5 whole; local time is UTC+1 until `change`, then UTC+2
/// (or as said).
struct Simple {
    latitude: f64,
    /// Degrees, and degrees a day.
    declination: (f64, f64),
    change: f64,
    offsets_min: (f64, f64),
}

impl Simple {
    fn declination(&self, days: f64) -> f64 {
        (self.declination.0 + self.declination.1 * days).to_radians()
    }
}

impl GroundReadings for Simple {
    type Error = Infallible;

    fn sun_altitude(&self, instant: Tt) -> Result<Angle, Infallible> {
        let hour_angle = degrees(360.0 * (instant.days() - 0.5)).radians();
        let (phi, dec) = (self.latitude.to_radians(), self.declination(instant.days()));
        Ok(Angle::from_radians(
            (phi.sin() * dec.sin() + phi.cos() * dec.cos() * hour_angle.cos()).asin(),
        ))
    }

    fn sidereal_time(&self, instant: Tt) -> Result<Angle, Infallible> {
        Ok(degrees(361.0 * instant.days()).wrapped())
    }

    fn local_clock(&self, instant: Tt) -> Result<LocalClock, Infallible> {
        let offset = if instant.days() < self.change {
            self.offsets_min.0
        } else {
            self.offsets_min.1
        };
        Ok(LocalClock {
            minutes: (instant.days() * 1440.0 + offset).rem_euclid(1440.0),
            utc_offset_minutes: offset,
        })
    }
}

fn simple(latitude: f64, declination: f64) -> Simple {
    Simple {
        latitude,
        declination: (declination, 0.0),
        change: f64::MAX,
        offsets_min: (60.0, 120.0),
    }
}

/// From noon of a day to the next.
fn night(day: f64) -> Span {
    Span {
        from: Tt::from_days(day + 0.5),
        to: Tt::from_days(day + 1.5),
    }
}

#[track_caller]
fn met(found: Result<RuleNight, RuleError<Infallible>>) -> f64 {
    match found.unwrap() {
        RuleNight::Met(seen) => seen.instant.days(),
        not => panic!("{not:?}"),
    }
}

proptest! {
    /// cos H = (sin h - sin phi sin dec) / (cos phi cos dec): met where that has a solution, at that instant.
    #[test]
    fn sun_rules_agree_with_the_closed_form(
        latitude in -89.0..89.0_f64, declination in -23.4..23.4_f64, altitude in -20.0..-1.0_f64, evening: bool,
    ) {
        let half = if evening { NightHalf::Evening } else { NightHalf::Morning };
        let rule = GroundRule::SunAltitude { altitude: degrees(altitude), half };
        let (phi, dec, h) = (latitude.to_radians(), declination.to_radians(), altitude.to_radians());
        let cosine = (h.sin() - phi.sin() * dec.sin()) / (phi.cos() * dec.cos());
        let found = rule_instant(rule, night(3.0), &simple(latitude, declination)).unwrap();
        // Where the Sun just touches the altitude, a quarter second decides.
        prop_assume!((cosine.abs() - 1.0).abs() > 1e-6);
        match found {
            RuleNight::Met(seen) => {
                prop_assert!(cosine.abs() < 1.0);
                let hours = cosine.acos() / (2.0 * std::f64::consts::PI);
                let expected = if evening { 3.5 + hours } else { 4.5 - hours };
                prop_assert!((seen.instant.days() - expected).abs() * 86_400.0 < 1.0);
            }
            RuleNight::NotMet { why, nearest } => {
                prop_assert!(cosine.abs() > 1.0);
                let lowest = (-(phi + dec).cos()).asin().to_degrees();
                let highest = (phi - dec).cos().asin().to_degrees();
                match why {
                    NotMet::SunStaysAbove(found) => {
                        prop_assert!(lowest > altitude && (found.degrees() - lowest).abs() < 1e-4);
                        prop_assert_eq!(nearest.is_some(), found.degrees() <= -50.0 / 60.0 + 0.002);
                    }
                    NotMet::SunStaysBelow(found) => {
                        prop_assert!(highest < altitude && (found.degrees() - highest).abs() < 1e-4);
                        prop_assert!(nearest.is_some());
                    }
                    other => prop_assert!(false, "{other:?}"),
                }
            }
        }
    }
}

/// The only run of nights that a rule misses.
#[track_caller]
fn only_run(survey: &RuleSurvey) -> Range<usize> {
    assert_eq!(survey.missed.len(), 1, "{:?}", survey.missed);
    survey.missed[0].clone()
}

/// The clock is put forward from 02:00 to 03:00 in the second night: 01:00 UTC of day 2.
#[test]
fn clock_rule_warns_across_a_clock_change_and_skips_no_other_night() {
    let change = 2.0 + 1.0 / 24.0;
    let readings = Simple {
        change,
        ..simple(45.0, 0.0)
    };
    let nights: Vec<Span> = (0..4).map(|day| night(f64::from(day))).collect();
    let at = |hour, minute| GroundRule::Clock(ClockTime::new(hour, minute).unwrap());
    let evening = survey_rule(at(20, 0), &nights, &readings).unwrap();
    assert!(evening.missed.is_empty() && evening.instead.is_none());
    // 20:00 is 19:00 UTC before and 18:00 UTC after.
    let instants: Vec<f64> = evening
        .nights
        .iter()
        .map(|night| match night {
            RuleNight::Met(seen) => seen.instant.days(),
            RuleNight::NotMet { .. } => panic!("20:00 comes every night"),
        })
        .collect();
    for (found, expected) in instants
        .iter()
        .zip([19.0 / 24.0, 1.0 + 19.0 / 24.0, 2.75, 3.75])
    {
        close(*found, expected, 1e-9);
    }
    assert_eq!(evening.clock_changes.len(), 1);
    assert_eq!(evening.clock_changes[0].night, 2);
    close(evening.clock_changes[0].minutes, 60.0, 0.0);
    // After the change in the same night.
    close(
        met(rule_instant(at(5, 0), nights[1], &readings)),
        2.0 + 3.0 / 24.0,
        1e-5,
    );
    // 02:30 does not exist in that night, and is back in the next.
    let skipped = survey_rule(at(2, 30), &nights, &readings).unwrap();
    assert_eq!(only_run(&skipped), 1..2);
    let RuleNight::NotMet {
        why: NotMet::SkippedByClocks,
        nearest: Some(nearest),
    } = skipped.nights[1]
    else {
        panic!("{:?}", skipped.nights[1])
    };
    close(nearest.instant.days(), change, 1e-5);
    // Put back from 03:00 to 02:00: 02:30 comes twice, the first counts.
    let back = Simple {
        change,
        offsets_min: (120.0, 60.0),
        ..simple(45.0, 0.0)
    };
    close(
        met(rule_instant(at(2, 30), nights[1], &back)),
        2.0 + 0.5 / 24.0,
        1e-9,
    );
    // At noon the Sun is up, and that is said.
    let RuleNight::Met(noon) = rule_instant(at(13, 30), nights[0], &readings).unwrap() else {
        panic!()
    };
    assert!(!noon.sun_is_down);
    // Other rules do not look at the clock.
    assert!(
        survey_rule(GroundRule::default(), &nights, &readings)
            .unwrap()
            .clock_changes
            .is_empty()
    );
}

/// Latitude 60, declination climbing from 20 to 23 degrees: the Sun's lowest point rises from -10 to -7 degrees.
#[test]
fn a_rule_that_summer_nights_miss_says_so_and_offers_the_nearest_that_all_meet() {
    let readings = Simple {
        declination: (20.0, 0.1),
        ..simple(60.0, 20.0)
    };
    let nights: Vec<Span> = (0..30).map(|day| night(f64::from(day))).collect();
    let wanted = GroundRule::SunAltitude {
        altitude: degrees(-8.45),
        half: NightHalf::Evening,
    };
    let survey = survey_rule(wanted, &nights, &readings).unwrap();
    // Lowest: declination - 30 at the midnight that ends the night's day; it passes -8.45 in the middle of day 15.
    assert_eq!(only_run(&survey), 15..30);
    let Some(GroundRule::SunAltitude {
        altitude,
        half: NightHalf::Evening,
    }) = survey.instead
    else {
        panic!("{:?}", survey.instead)
    };
    // In the last night the Sun goes down to -7.0 degrees.
    close(altitude.degrees(), -6.9, 0.11);
    let offered = survey_rule(survey.instead.unwrap(), &nights, &readings).unwrap();
    assert!(offered.missed.is_empty());
    let RuleNight::NotMet {
        why,
        nearest: Some(nearest),
    } = survey.nights[20]
    else {
        panic!()
    };
    assert!(nearest.sun_is_down);
    assert!(
        why.to_string()
            .contains("the Sun gets no lower than -7.9 deg"),
        "{why}"
    );
}

/// Under the midnight Sun nothing is offered.
#[test]
fn polar_day_offers_no_instant_and_no_rule() {
    let nights: Vec<Span> = (0..3).map(|day| night(f64::from(day))).collect();
    for rule in [
        GroundRule::default(),
        GroundRule::FromSunset {
            minutes: 30.0,
            half: NightHalf::Evening,
        },
    ] {
        let survey = survey_rule(rule, &nights, &simple(75.0, 22.0)).unwrap();
        assert_eq!(only_run(&survey), 0..3);
        assert_eq!(survey.instead, None);
        for night in survey.nights {
            assert!(
                matches!(
                    night,
                    RuleNight::NotMet {
                        why: NotMet::SunStaysAbove(_),
                        nearest: None
                    }
                ),
                "{night:?}"
            );
        }
    }
}

#[test]
fn minutes_beyond_a_short_night_are_refused_and_shorter_ones_offered() {
    // Latitude 60, declination 22: cos H = (sin -50' - sin 60 sin 22) / (cos 60 cos 22), so 5.4 hours without the Sun.
    let readings = simple(60.0, 22.0);
    let (phi, dec) = (60.0_f64.to_radians(), 22.0_f64.to_radians());
    let horizon = (-50.0_f64 / 60.0).to_radians();
    let cosine = (horizon.sin() - phi.sin() * dec.sin()) / (phi.cos() * dec.cos());
    let dark_minutes = 1440.0 * (1.0 - cosine.acos() / std::f64::consts::PI);
    let nights = [night(0.0), night(1.0)];
    let rule = |minutes| GroundRule::FromSunset {
        minutes,
        half: NightHalf::Evening,
    };
    assert!(
        survey_rule(rule(240.0), &nights, &readings)
            .unwrap()
            .missed
            .is_empty()
    );
    let long = survey_rule(rule(500.0), &nights, &readings).unwrap();
    assert_eq!(only_run(&long), 0..2);
    let RuleNight::NotMet {
        why: NotMet::SunUpAgain { night_minutes },
        nearest: Some(nearest),
    } = long.nights[0]
    else {
        panic!("{:?}", long.nights[0])
    };
    // Ten minutes are kept from sunrise.
    close(night_minutes, dark_minutes - 10.0, 0.05);
    assert!(nearest.sun_is_down);
    assert_eq!(long.instead, Some(rule(night_minutes.floor())));
}

#[test]
fn rules_with_the_sun_up_or_without_meaning_are_refused() {
    let refused = |rule| match rule_instant(rule, night(0.0), &simple(45.0, 0.0)) {
        Err(RuleError::Rule(error)) => error.to_string(),
        other => panic!("{other:?}"),
    };
    let sun = |altitude| GroundRule::SunAltitude {
        altitude: degrees(altitude),
        half: NightHalf::Evening,
    };
    assert!(refused(sun(0.0)).contains("-90 to -1"));
    assert!(refused(sun(f64::NAN)).contains("Sun's altitude"));
    assert!(
        refused(GroundRule::FromSunset {
            minutes: 0.0,
            half: NightHalf::Evening
        })
        .contains("5 to 720")
    );
    assert!(
        refused(GroundRule::FromSunset {
            minutes: 5.0,
            half: NightHalf::Morning
        })
        .contains("10 to 720")
    );
    assert!(refused(GroundRule::SiderealTime(degrees(400.0))).contains("sidereal time"));
    let (lens, sensor) = camera(50.0);
    let roll: Result<_, OutOfRange> =
        GroundFrame::new(over_ground(0.0, 0.0), degrees(f64::NAN), &lens, &sensor);
    assert!(roll.unwrap_err().to_string().contains("roll"));
}

#[test]
fn the_whole_picture_lies_where_its_pixels_say() {
    let (lens, sensor) = camera(35.0);
    let frame = GroundFrame::new(over_ground(280.0, 15.0), degrees(12.0), &lens, &sensor).unwrap();
    for (x, y) in [(0.0, 0.0), (6000.0, 0.0), (3000.0, 4000.0), (1234.5, 678.9)] {
        let pixel = frame.pixel(frame.place(Pixel { x, y })).unwrap();
        close(pixel.x, x, 1e-8);
        close(pixel.y, y, 1e-8);
        assert!(frame.holds(frame.place(pixel)));
    }
    assert!(!frame.holds(frame.place(Pixel { x: -1.0, y: 2000.0 })));
}
