//! The document: what is read, what is refused and where, what is written, and what is never overwritten.
//!
//! Positions in the messages are counted by hand in the texts below. Dates and zones name their sources.

use std::fs;
use std::path::{Path, PathBuf};

use loopwright::scenario::files::{
    FileError, MANIFEST_NAME, Output, Replace, write_outputs, write_whole,
};
use loopwright::scenario::{
    NEWEST_VERSION, PickSettings, Scenario, ScenarioError, SeasonDates, SkylineOrigin,
    SkylineSource, Theme, Zone, standard_pressure_hpa,
};
use loopwright::season::log::Log;
use loopwright::season::purposes::Purpose;
use loopwright::season::weather::Weather;
use loopwright::season::{ClockTime, Conditions, Hours, MoonRule, Weekdays};
use loopwright::sky::calendar::{CivilDate, DateTime, Precision, Weekday, parse_utc, utc_text};
use loopwright::sky::delta_t::TimeTables;
use loopwright::sky::refraction::Air;
use loopwright::sky::skyline::SkylinePoint;
use loopwright::sky::{Angle, Body, Site, Skyline};
use proptest::prelude::*;
use tempfile::TempDir;

const SHIPPED: [&str; 5] = [
    "mars-loop-2026.ron",
    "venus-evening-2029.ron",
    "saturn-thin-rings-2038.ron",
    "mercury-roofs-2029.ron",
    "mars-loop-139.ron",
];

fn shipped(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("scenarios")
        .join(name)
}

fn read(text: &str) -> Result<Scenario, ScenarioError> {
    Scenario::from_ron(text, Path::new("plan.ron"))
}

fn complaint(text: &str) -> String {
    read(text)
        .expect_err("this text should have been refused")
        .to_string()
}

/// A sound document in nine lines; a test replaces one of its parts.
const SMALL: &str = r#"Scenario(
    version: 1,
    title: "Test",
    subject: mars,
    companions: [jupiter],
    season: (from: "2026-11-01", to: "2027-06-01"),
    site: (name: "Here", latitude: 50, longitude: 10, zone: "Europe/Berlin"),
    skyline: (points: [(azimuth: 90, altitude: 5)]),
)
"#;

fn spoilt(part: &str, replacement: &str) -> String {
    assert!(SMALL.contains(part), "{part}");
    SMALL.replace(part, replacement)
}

/// The message begins with the place and holds every one of the words.
#[track_caller]
fn assert_complains(text: &str, place: &str, words: &[&str]) {
    let message = complaint(text);
    assert!(
        message.starts_with(&format!("plan.ron:{place}: ")),
        "{message}"
    );
    for word in words {
        assert!(message.contains(word), "no \"{word}\" in: {message}");
    }
}

fn civil(text: &str) -> CivilDate {
    text.parse().unwrap()
}

// What is shipped

#[test]
fn every_shipped_scenario_loads_and_survives_a_round_trip() {
    for name in SHIPPED {
        let scenario = Scenario::load(&shipped(name)).unwrap_or_else(|error| panic!("{error}"));
        let text = scenario.to_ron().unwrap();
        let again = read(&text).unwrap_or_else(|error| panic!("{error}\n{text}"));
        assert_eq!(again.to_ron().unwrap(), text, "{name}");
        // A skyline from a file comes back as points in the document; all else is equal.
        assert_eq!(again.skyline.surveyed(), scenario.skyline.surveyed());
        let mut with_origin = again.clone();
        with_origin.skyline = scenario.skyline.clone();
        assert_eq!(with_origin, scenario, "{name}");
        assert!(scenario.remarks.scenario.is_some(), "{name}");
        assert!(
            scenario
                .span(TimeTables::embedded())
                .unwrap()
                .unwrap()
                .days()
                > 60.0
        );
    }
}

#[test]
fn the_folder_of_scenarios_holds_nothing_untested() {
    let mut found: Vec<String> = fs::read_dir(shipped(""))
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .filter(|name| name.ends_with(".ron"))
        .collect();
    found.sort();
    let mut expected = SHIPPED.map(str::to_owned).to_vec();
    expected.sort();
    assert_eq!(found, expected);
}

#[test]
fn the_embedded_scenario_is_the_mars_loop() {
    let scenario = Scenario::embedded().unwrap();
    assert_eq!(
        scenario,
        Scenario::load(&shipped("mars-loop-2026.ron")).unwrap()
    );
    assert_eq!(scenario.subject, Body::Mars);
    assert_eq!(scenario.companions, [Body::Jupiter]);
    assert_eq!(
        scenario.season,
        Some(SeasonDates {
            from: civil("2026-11-01"),
            to: civil("2027-06-01"),
        })
    );
    let parts: Vec<&str> = scenario
        .skyline
        .surveyed()
        .vertices()
        .iter()
        .filter_map(|vertex| vertex.name.as_deref())
        .collect();
    assert!(parts.contains(&"the ridge") && parts.contains(&"the mill"));
}

#[test]
fn the_mercury_scenario_reads_the_skyline_beside_it() {
    let scenario = Scenario::load(&shipped("mercury-roofs-2029.ron")).unwrap();
    assert!(matches!(
        scenario.skyline.origin(),
        SkylineOrigin::File { name, .. } if name == "mercury-roofs-2029.csv"
    ));
    // The rows of the file.
    assert_eq!(scenario.skyline.surveyed().vertices().len(), 37);
    let behind_the_tower = Angle::from_degrees(263.0);
    let polygon = scenario.skyline.polygon();
    assert_eq!(polygon.part_at(behind_the_tower), Some("the church tower"));
    assert!(polygon.altitude_at(behind_the_tower).degrees() > 17.5);
}

#[test]
fn a_smooth_skyline_passes_through_its_points() {
    let scenario = Scenario::load(&shipped("saturn-thin-rings-2038.ron")).unwrap();
    let (surveyed, polygon) = (scenario.skyline.surveyed(), scenario.skyline.polygon());
    assert!(polygon.vertices().len() > 500);
    for vertex in surveyed.vertices() {
        let found = polygon.altitude_at(vertex.azimuth);
        assert!((found - vertex.altitude).abs().degrees() < 1e-9);
    }
}

// What a document means

#[test]
fn what_is_left_out_has_its_default() {
    let scenario = read(
        r#"(version: 1, title: "T", subject: venus, site: (name: "S", latitude: 1, longitude: 2, zone: "UTC"))"#,
    )
    .unwrap();
    assert_eq!(scenario.companions, []);
    assert_eq!(scenario.season, None);
    assert_eq!(scenario.span(TimeTables::embedded()).unwrap(), None);
    assert_eq!(scenario.site.elevation_m, 0.0);
    assert_eq!(scenario.site.air.pressure_hpa, 1013.25);
    assert_eq!(scenario.skyline, SkylineSource::flat());
    assert_eq!(scenario.conditions, Conditions::default());
    assert_eq!(scenario.sun_distance, Angle::from_degrees(20.0));
    assert_eq!(scenario.view.theme, Theme::Light);
    assert!(!scenario.view.turned);
}

#[test]
fn a_file_of_version_1_keeps_its_meaning() {
    // Every field of the version, as it was first written; this file and these values never change.
    let text = fs::read_to_string(
        Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/scenario_v1.ron"),
    )
    .unwrap();
    let scenario = read(&text).unwrap();
    let degrees = Angle::from_degrees;
    let note = |text: &str| Some(text.to_owned());
    let corner = |azimuth, altitude, name: Option<&str>| SkylinePoint {
        azimuth,
        altitude,
        name: name.map(str::to_owned),
    };
    let skyline = Skyline::new(vec![
        corner(90.0, 5.5, Some("shed")),
        corner(270.0, -0.5, None),
    ])
    .unwrap();
    let mut expected = Scenario::embedded().unwrap();
    expected.title = "Version 1".to_owned();
    expected.subject = Body::Saturn;
    expected.companions = vec![Body::Jupiter, Body::Moon];
    expected.season = Some(SeasonDates {
        from: civil("-0746-02-26"),
        to: civil("-0745-02-26"),
    });
    expected.site = Site {
        name: "Somewhere".to_owned(),
        latitude: degrees(-35.25),
        longitude: degrees(-70.5),
        elevation_m: 2400.0,
        height_above_surroundings_m: 300.0,
        air: Air {
            pressure_hpa: 760.0,
            temperature_c: 5.0,
        },
        extinction_mag: 0.125,
    };
    expected.zone = Zone::LocalMeanTime;
    expected.skyline = SkylineSource::in_document(skyline, true);
    expected.conditions = Conditions {
        least_altitude: degrees(15.0),
        clearance: degrees(1.0),
        sun_below: degrees(-9.0),
        moon: Some(MoonRule {
            least_distance: degrees(8.0),
            unless_lit_below: 0.5,
        }),
        hours: Some(Hours {
            from: ClockTime::new(20, 0).unwrap(),
            to: ClockTime::new(24, 0).unwrap(),
        }),
        weekdays: Weekdays::from_days(&[Weekday::Monday]).unwrap(),
    };
    expected.sun_distance = degrees(30.0);
    // What came later means, by its absence, what it meant before there was any.
    expected.purpose = Purpose::Audience;
    expected.weather = Weather::default();
    expected.picks = PickSettings::default();
    expected.lenses = Vec::new();
    expected.log = Log::default();
    expected.remarks.picks = None;
    expected.view.theme = Theme::Red;
    expected.view.turned = true;
    expected.remarks.scenario = note("a");
    expected.remarks.season = note("b");
    expected.remarks.site = note("c");
    expected.remarks.skyline = note("d");
    expected.remarks.conditions = note("e");
    expected.remarks.view = note("f");
    assert_eq!(scenario, expected);
}

#[test]
fn conditions_come_out_as_written() {
    let text = spoilt(
        "    skyline:",
        "    conditions: (least_altitude: 25, clearance: 2, sun_below: -12, moon: (least_distance: 30, unless_lit_below: 0.25), hours: (from: \"22:00\", to: \"01:30\"), weekdays: [saturday, friday]),\n    skyline:",
    );
    let conditions = read(&text).unwrap().conditions;
    let hours = Hours {
        from: ClockTime::new(22, 0).unwrap(),
        to: ClockTime::new(1, 30).unwrap(),
    };
    assert_eq!(
        conditions,
        Conditions {
            least_altitude: Angle::from_degrees(25.0),
            clearance: Angle::from_degrees(2.0),
            sun_below: Angle::from_degrees(-12.0),
            moon: Some(MoonRule {
                least_distance: Angle::from_degrees(30.0),
                unless_lit_below: 0.25,
            }),
            hours: Some(hours),
            weekdays: Weekdays::from_days(&[Weekday::Friday, Weekday::Saturday]).unwrap(),
        }
    );
    let clock = |hour, minute| ClockTime::new(hour, minute).unwrap();
    // Half-open, through midnight.
    assert!(hours.contains(clock(22, 0)) && hours.contains(clock(1, 29)));
    assert!(!hours.contains(clock(1, 30)) && !hours.contains(clock(21, 59)));
    let silent = spoilt(
        "    skyline:",
        "    conditions: (moon: None),\n    skyline:",
    );
    assert_eq!(read(&silent).unwrap().conditions.moon, None);
}

#[test]
fn a_season_begins_and_ends_at_civil_midnights_of_its_zone() {
    let tables = TimeTables::embedded();
    let span = read(SMALL).unwrap().span(tables).unwrap().unwrap();
    let text = |tt| utc_text(tables.utc_from_tt(tt), Precision::Second).unwrap();
    // Central European Time is one hour ahead in winter, two in summer (directive 2000/84/EC).
    assert_eq!(text(span.from), "2026-10-31T23:00:00Z");
    assert_eq!(text(span.to), "2027-05-31T22:00:00Z");
}

#[test]
fn local_mean_time_is_four_minutes_a_degree() {
    // 24 h / 360 degrees; 30.1 E is 2 h 0 min 24 s.
    let longitude = Angle::from_degrees(30.1);
    let zone = Zone::LocalMeanTime;
    let midnight = zone.start_of_day(longitude, civil("0139-05-27")).unwrap();
    assert_eq!(
        utc_text(midnight, Precision::Second).unwrap(),
        "0139-05-26T21:59:36"
    );
    let local = zone.local_from_utc(longitude, midnight).unwrap();
    assert_eq!(
        local.date_time.text(Precision::Second).unwrap(),
        "0139-05-27T00:00:00"
    );
    assert_eq!(local.offset_text(), "+02:00:24");
    let west = zone
        .local_from_utc(Angle::from_degrees(-75.0), midnight)
        .unwrap();
    assert_eq!(west.offset_text(), "-05:00");
}

#[test]
fn clocks_that_skip_or_repeat_a_reading_are_settled() {
    let zone: Zone = "Europe/Berlin".parse().unwrap();
    let instant = |date: &str, hour: f64| {
        let local = DateTime::new(civil(date), hour * 3600.0).unwrap();
        let utc = zone.utc_from_local(Angle::ZERO, local).unwrap();
        utc_text(utc, Precision::Second).unwrap()
    };
    // Directive 2000/84/EC: changes at 01:00 UTC on the last Sundays of March and October.
    assert_eq!(instant("2027-03-28", 1.5), "2027-03-28T00:30:00Z");
    assert_eq!(instant("2027-03-28", 2.5), "2027-03-28T01:30:00Z");
    assert_eq!(instant("2027-03-28", 3.5), "2027-03-28T01:30:00Z");
    assert_eq!(instant("2026-10-25", 2.5), "2026-10-25T00:30:00Z");
    // Samoa left out 2011-12-30 when it crossed the date line (IANA tz database, file australasia): that date begins
    // where the next one does.
    let apia: Zone = "Pacific/Apia".parse().unwrap();
    let start = |date: &str| apia.start_of_day(Angle::ZERO, civil(date)).unwrap();
    assert_eq!(
        utc_text(start("2011-12-30"), Precision::Second).unwrap(),
        "2011-12-30T10:00:00Z"
    );
    assert_eq!(start("2011-12-30"), start("2011-12-31"));
    let summer = zone
        .local_from_utc(Angle::ZERO, parse_utc("2026-07-01T12:00:00Z").unwrap())
        .unwrap();
    assert_eq!(
        (summer.offset_text().as_str(), summer.abbreviation.as_str()),
        ("+02:00", "CEST")
    );
    assert!(zone.doubt(2099).is_none() && zone.doubt(2100).is_some());
    assert!(Zone::LocalMeanTime.doubt(2100).is_none());
}

#[test]
fn standard_pressure_agrees_with_the_tables_of_the_atmosphere() {
    // U.S. Standard Atmosphere 1976 (the same as ISO 2533 below 32 km), table I, geopotential altitude; from memory.
    for (elevation_m, hpa) in [(0.0, 1013.25), (1000.0, 898.75), (5000.0, 540.20)] {
        let found = standard_pressure_hpa(elevation_m);
        assert!((found - hpa).abs() < 0.02, "{elevation_m} m: {found}");
    }
}

// What is refused, and where

#[test]
fn the_small_document_is_sound() {
    read(SMALL).unwrap();
}

#[test]
fn an_unknown_field_is_named_with_the_one_that_was_meant() {
    assert_complains(
        &spoilt("latitude: 50", "lattitude: 50"),
        "7:26",
        &["lattitude", "did you mean latitude?"],
    );
    assert_complains(
        &spoilt("    skyline:", "    humidity: (),\n    skyline:"),
        "8:5",
        &["humidity", "skyline", "conditions"],
    );
}

#[test]
fn a_number_out_of_range_is_told_with_its_range() {
    assert_complains(
        &spoilt("latitude: 50", "latitude: 95"),
        "7:36",
        &["latitude 95", "-90 to 90 degrees", "north positive"],
    );
    assert_complains(
        &spoilt("longitude: 10", "longitude: 200"),
        "7:51",
        &["longitude 200", "-180 to 180", "-160"],
    );
    assert_complains(
        &spoilt("azimuth: 90", "azimuth: 361"),
        "8:34",
        &["azimuth 361", "0 to 360"],
    );
    for (field, value, range) in [
        ("pressure_hpa", "1300", "0 to 1200 hPa"),
        ("temperature_c", "70", "-100 to 60"),
        ("extinction_mag", "2.5", "0 to 2 "),
        ("elevation_m", "9500", "-500 to 9000"),
        ("height_above_surroundings_m", "-1", "0 to 9000"),
        ("latitude", "NaN", "-90 to 90"),
        ("elevation_m", "inf", "-500 to 9000"),
    ] {
        let text = match field {
            "latitude" => spoilt("latitude: 50", "latitude: NaN"),
            _ => spoilt("zone:", &format!("{field}: {value}, zone:")),
        };
        let message = complaint(&text);
        assert!(
            message.starts_with("plan.ron:7:") && message.contains(&format!("{field} {value}")),
            "{message}"
        );
        assert!(message.contains(range), "{message}");
    }
    for (conditions, words) in [
        ("sun_below: 5", "sun_below 5 is out of range: use -90 to -1"),
        ("clearance: -2", "0 to 90"),
        ("moon: (unless_lit_below: 30)", "0 to 1 as a fraction"),
        ("moon: (least_distance: 181)", "0 to 180"),
        ("hours: (from: \"7 pm\", to: \"22:00\")", "\"19:30\""),
        ("hours: (from: \"19:00\", to: \"24:01\")", "00:00 to 24:00"),
        ("hours: (from: \"19:00\", to: \"19:00\")", "leaves no time"),
        ("weekdays: [fryday]", "did you mean friday?"),
    ] {
        let text = spoilt(
            "    skyline:",
            &format!("    conditions: ({conditions}),\n    skyline:"),
        );
        let message = complaint(&text);
        assert!(message.starts_with("plan.ron:8:"), "{message}");
        assert!(message.contains(words), "{message}");
    }
}

#[test]
fn a_wrong_zone_brings_near_misses() {
    assert_complains(
        &spoilt("Europe/Berlin", "Europe/Berln"),
        "7:62",
        &["Europe/Berln", "did you mean Europe/Berlin?"],
    );
    assert!(complaint(&spoilt("Europe/Berlin", "berlin")).contains("Europe/Berlin"));
    assert!(complaint(&spoilt("Europe/Berlin", "Local Mean Time")).contains("local mean time"));
    assert!(complaint(&spoilt("Europe/Berlin", "CE summer time")).contains("IANA"));
    let long = "x".repeat(100_000);
    assert!(complaint(&spoilt("Europe/Berlin", &long)).len() < 400);
}

#[test]
fn impossible_dates_and_spans_are_refused() {
    assert_complains(
        &spoilt("2026-11-01", "2026-11-31"),
        "6:21",
        &["no day 31 in 2026-11", "1 to 30"],
    );
    assert!(complaint(&spoilt("2026-11-01", "1582-10-10")).contains("never was"));
    assert!(complaint(&spoilt("2026-11-01", "1 Nov 2026")).contains("2026-11-01"));
    // 1500 was a leap year of the Julian calendar, 1900 none of the Gregorian.
    let leap = spoilt("2026-11-01", "1500-02-29").replace("2027-06-01", "1500-09-01");
    read(&leap).unwrap();
    assert!(complaint(&spoilt("2026-11-01", "1900-02-29")).contains("1 to 28"));
    let place = |text: &str| complaint(text).starts_with("plan.ron:6:");
    let backwards = spoilt("2026-11-01", "2027-06-01");
    assert!(complaint(&backwards).contains("is not before") && place(&backwards));
    let endless = spoilt("2026-11-01", "1800-01-01");
    assert!(complaint(&endless).contains("100 years") && place(&endless));
    let remote = spoilt("2026-11-01", "-2001-11-01").replace("2027-06-01", "-2000-06-01");
    assert!(complaint(&remote).contains("-2000 to 2999") && place(&remote));
}

#[test]
fn three_points_at_one_azimuth_are_refused() {
    let points = "(azimuth: 90, altitude: 5)";
    let three = format!("{points}, {points}, {points}");
    let message = complaint(&spoilt(points, &three));
    assert!(message.starts_with("plan.ron:8:"), "{message}");
    assert!(
        message.contains("point 3") && message.contains("third") && message.contains("90"),
        "{message}"
    );
    // 360 is 0 again.
    let round = "(azimuth: 0, altitude: 5), (azimuth: 360, altitude: 6), (azimuth: 0, altitude: 7)";
    assert!(complaint(&spoilt(points, round)).contains("third"));
    read(&spoilt(points, &format!("{points}, {points}"))).unwrap();
}

#[test]
fn bodies_that_cannot_be_there_are_refused() {
    assert_complains(
        &spoilt("subject: mars", "subject: marz"),
        "4:14",
        &["marz", "did you mean mars?"],
    );
    let message = complaint(&spoilt("subject: mars", "subject: moon"));
    assert!(message.starts_with("plan.ron:4:") && message.contains("mercury to neptune"));
    for (companions, words) in [
        ("[mars]", "mars is the subject itself"),
        ("[jupiter, jupiter]", "named twice"),
        ("[sun]", "always drawn"),
    ] {
        let message = complaint(&spoilt("[jupiter]", companions));
        assert!(message.starts_with("plan.ron:5:"), "{message}");
        assert!(message.contains(words), "{message}");
    }
}

#[test]
fn versions_are_read_first() {
    let message = complaint(&spoilt("version: 1", "version: 7, novelty: %% (("));
    assert_eq!(
        message,
        format!(
            "plan.ron:2:14: the scenario has version 7, but the newest that this program reads is {NEWEST_VERSION}: use a newer program"
        )
    );
    assert_complains(
        &spoilt("version: 1", "version: 0"),
        "2:14",
        &["no version 0", "version: 1"],
    );
    let missing = complaint(&spoilt("    version: 1,\n", ""));
    assert!(missing.contains("no version is given"), "{missing}");
    assert!(complaint(&spoilt("version: 1", "version: -1")).starts_with("plan.ron:2:"));
}

#[test]
fn broken_syntax_is_told_with_its_place() {
    assert_complains(&spoilt("mars,", "mars"), "5:5", &["comma"]);
    assert!(complaint("Scenario(version: 1, title: \"T\"").contains("too early"));
    assert!(complaint("(version: 1, title: \"T\")").contains("no field subject"));
    assert!(complaint(&spoilt("subject: mars", "subject: mars, subject: venus")).contains("twice"));
    assert!(complaint(&spoilt("\"Test\"", "\"\"")).starts_with("plan.ron:3:"));
    assert!(complaint(&spoilt("\"Test\"", "\"two\\nlines\"")).contains("one line"));
    let trailing = complaint(&format!("{SMALL})"));
    assert!(
        trailing.starts_with("plan.ron:9:2: ") && trailing.contains("closing bracket"),
        "{trailing}"
    );
}

#[test]
fn empty_texts_say_how_to_get_a_scenario() {
    for text in ["", " \n\t", "\u{feff}\n"] {
        assert!(complaint(text).contains("loopwright new"), "{text:?}");
    }
}

#[test]
fn deep_nesting_is_refused_without_harm() {
    let deep = spoilt(
        "[jupiter]",
        &format!("{}{}", "[".repeat(100_000), "]".repeat(100_000)),
    );
    let message = complaint(&deep);
    assert!(message.starts_with("plan.ron:5:"), "{message}");
    assert!(complaint(&"(".repeat(1_000_000)).starts_with("plan.ron:1:"));
    let unknown = format!("(x: {}{}, version: 1)", "[".repeat(5000), "]".repeat(5000));
    let message = complaint(&unknown);
    assert!(message.contains("nested more than 32 deep"), "{message}");
}

#[test]
fn files_that_cannot_be_scenarios_are_refused() {
    let folder = TempDir::new().unwrap();
    let load = |name: &str, bytes: &[u8]| {
        let path = folder.path().join(name);
        fs::write(&path, bytes).unwrap();
        Scenario::load(&path).unwrap_err().to_string()
    };
    let message = load("latin.ron", b"(version: 1,\n title: \"M\xe4rz\")");
    assert!(
        message.contains("latin.ron:2:11: the text is not UTF-8"),
        "{message}"
    );
    let utf16: Vec<u8> = "\u{feff}(version: 1)"
        .encode_utf16()
        .flat_map(u16::to_le_bytes)
        .collect();
    assert!(load("wide.ron", &utf16).contains("UTF-16"));
    let message = load("huge.ron", &vec![b' '; (4 << 20) + 1]);
    assert!(
        message.contains("huge.ron") && message.contains("4194304"),
        "{message}"
    );
    assert!(load("empty.ron", b"").contains("is empty"));
    let missing = Scenario::load(&folder.path().join("none.ron")).unwrap_err();
    assert!(missing.to_string().contains("none.ron"), "{missing}");
    let directory = Scenario::load(folder.path()).unwrap_err();
    assert!(
        directory.to_string().contains("not an ordinary file"),
        "{directory}"
    );
    assert!(matches!(
        read(&" ".repeat((4 << 20) + 1)),
        Err(ScenarioError::TooLarge { .. })
    ));
}

#[test]
fn a_bad_skyline_file_is_told_with_its_line() {
    let folder = TempDir::new().unwrap();
    let plan = folder.path().join("plan.ron");
    let text = spoilt(
        "points: [(azimuth: 90, altitude: 5)]",
        "file: \"skyline.csv\"",
    );
    fs::write(&plan, &text).unwrap();
    let missing = Scenario::load(&plan).unwrap_err().to_string();
    assert!(
        missing.contains("plan.ron") && missing.contains("skyline.csv"),
        "{missing}"
    );
    assert!(missing.contains("scenario's folder"), "{missing}");
    for (csv, words) in [
        ("azimuth_deg,altitude_deg\n10,x\n", "line 2"),
        ("# note\n10,5\n400,5\n", "line 3: azimuth 400"),
        ("10,5\n20\n", "line 2: 1 fields"),
        ("10;5\n", "between commas"),
        ("10,1\n10,2\n10,3\n", "third point"),
        ("azimuth,altitude\n", "no points"),
        ("", "no points"),
    ] {
        fs::write(folder.path().join("skyline.csv"), csv).unwrap();
        let message = Scenario::load(&plan).unwrap_err().to_string();
        assert!(
            message.contains("plan.ron: skyline file ") && message.contains("skyline.csv: "),
            "{message}"
        );
        assert!(message.contains(words), "{csv:?}: {message}");
    }
    fs::write(folder.path().join("skyline.csv"), b"10,\xff\n").unwrap();
    let message = Scenario::load(&plan).unwrap_err().to_string();
    assert!(message.contains("UTF-8"), "{message}");
    let huge = vec![b'#'; (4 << 20) + 1];
    fs::write(folder.path().join("skyline.csv"), huge).unwrap();
    let message = Scenario::load(&plan).unwrap_err().to_string();
    assert!(message.contains("4194304"), "{message}");
    fs::write(folder.path().join("skyline.csv"), "10,5,the mill\r\n").unwrap();
    let level = Scenario::load(&plan).unwrap();
    assert_eq!(level.skyline.surveyed().vertices().len(), 1);
    for name in ["../skyline.csv", "/etc/hosts", "", "."] {
        let message = complaint(&text.replace("skyline.csv", name));
        assert!(message.starts_with("plan.ron:8:"), "{message}");
        assert!(message.contains("beside"), "{message}");
    }
    let both = spoilt("points:", "file: \"skyline.csv\", points:");
    assert!(complaint(&both).contains("both"));
}

// What is written

#[test]
fn a_new_scenario_reads_back_and_says_what_to_do() {
    let site = read(SMALL).unwrap().site;
    let dates = SeasonDates {
        from: civil("2026-11-01"),
        to: civil("2027-05-01"),
    };
    let scenario = Scenario::new_for(Body::Mars, dates, site, Zone::LocalMeanTime);
    let text = scenario.to_ron().unwrap();
    assert_eq!(read(&text).unwrap(), scenario);
    assert!(text.starts_with("Scenario(\n    version: 1,\n    title: \"Mars 2026 to 2027\",\n"));
    assert!(text.contains("azimuth,altitude a row"));
    // The example that a remark gives is itself a sound skyline.
    let example = r#"points: [(azimuth: 143, altitude: 5.2, name: "the mill")]"#;
    assert!(text.contains(example), "{text}");
    read(&spoilt("points: [(azimuth: 90, altitude: 5)]", example)).unwrap();
}

#[test]
fn values_that_no_document_may_have_are_not_saved() {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("plan.ron");
    let mut scenario = read(SMALL).unwrap();
    scenario.site.latitude = Angle::from_degrees(91.0);
    let message = scenario.save(&path).unwrap_err().to_string();
    assert!(
        message.contains("latitude 91") && !path.exists(),
        "{message}"
    );
    scenario.site.latitude = Angle::from_degrees(f64::NAN);
    assert!(scenario.to_ron().is_err());
    let mut scenario = read(SMALL).unwrap();
    scenario.companions.push(Body::Mars);
    assert!(scenario.to_ron().is_err());
}

#[test]
fn the_first_save_over_a_hand_written_file_keeps_it() {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("plan.ron");
    let by_hand = format!("// my notes\n{SMALL}");
    fs::write(&path, &by_hand).unwrap();
    let mut scenario = Scenario::load(&path).unwrap();
    let backup = scenario.save(&path).unwrap().unwrap();
    assert_eq!(backup, folder.path().join("plan.ron.bak"));
    assert_eq!(fs::read_to_string(&backup).unwrap(), by_hand);
    assert_eq!(Scenario::load(&path).unwrap(), scenario);
    // What the program wrote itself needs no backup.
    scenario.title = "Another".to_owned();
    assert_eq!(scenario.save(&path).unwrap(), None);
    assert_eq!(fs::read_to_string(&backup).unwrap(), by_hand);
    // Changed by hand again: kept again, under the next name.
    let edited = fs::read_to_string(&path)
        .unwrap()
        .replace("Another", "Mine");
    fs::write(&path, &edited).unwrap();
    let second = scenario.save(&path).unwrap().unwrap();
    assert_eq!(second, folder.path().join("plan.ron.bak2"));
    assert_eq!(fs::read_to_string(second).unwrap(), edited);
    assert_eq!(scenario.save(&folder.path().join("new.ron")).unwrap(), None);
    assert_no_leftovers(folder.path());
}

#[test]
fn a_skyline_file_stays_beside_its_scenario_and_goes_inside_elsewhere() {
    let folder = TempDir::new().unwrap();
    let elsewhere = TempDir::new().unwrap();
    for name in ["mercury-roofs-2029.ron", "mercury-roofs-2029.csv"] {
        fs::copy(shipped(name), folder.path().join(name)).unwrap();
    }
    let path = folder.path().join("mercury-roofs-2029.ron");
    let scenario = Scenario::load(&path).unwrap();
    scenario.save(&path).unwrap();
    assert_eq!(Scenario::load(&path).unwrap(), scenario);
    assert!(fs::read_to_string(&path).unwrap().contains("file: \""));
    let copy = elsewhere.path().join("copy.ron");
    scenario.save(&copy).unwrap();
    let copied = Scenario::load(&copy).unwrap();
    assert_eq!(copied.skyline.surveyed(), scenario.skyline.surveyed());
    assert_eq!(copied.skyline.origin(), &SkylineOrigin::Document);
}

#[track_caller]
fn assert_no_leftovers(folder: &Path) {
    for entry in fs::read_dir(folder).unwrap() {
        let name = entry.unwrap().file_name().into_string().unwrap();
        assert!(!name.ends_with(".part"), "{name}");
    }
}

#[test]
fn outputs_of_an_earlier_run_are_replaced_and_the_users_are_not() {
    let parent = TempDir::new().unwrap();
    let folder = parent.path().join("sheet");
    let write = |strip: &str, table: &str, replace| {
        write_outputs(
            &folder,
            &[
                Output {
                    name: "strip.svg",
                    bytes: strip.as_bytes(),
                },
                Output {
                    name: "events.csv",
                    bytes: table.as_bytes(),
                },
            ],
            replace,
        )
    };
    let read = |name: &str| fs::read_to_string(folder.join(name)).unwrap();
    write("a1", "b1", Replace::OnlyOurs).unwrap();
    write("a2", "b2", Replace::OnlyOurs).unwrap();
    assert_eq!(
        (read("strip.svg"), read("events.csv")),
        ("a2".into(), "b2".into())
    );
    // The user draws on the strip: nothing of the next run is written.
    fs::write(folder.join("strip.svg"), "mine").unwrap();
    let error = write("a3", "b3", Replace::OnlyOurs).unwrap_err();
    assert!(matches!(&error, FileError::NotOurs { paths } if paths == &[folder.join("strip.svg")]));
    assert!(error.to_string().contains("--replace"), "{error}");
    assert_eq!(
        (read("strip.svg"), read("events.csv")),
        ("mine".into(), "b2".into())
    );
    // Even the bytes of an older run are the user's once the program has written newer ones.
    fs::write(folder.join("strip.svg"), "a1").unwrap();
    write("a3", "b3", Replace::OnlyOurs).unwrap_err();
    write("a3", "b3", Replace::Everything).unwrap();
    assert_eq!(read("strip.svg"), "a3");
    write("a4", "b4", Replace::OnlyOurs).unwrap();
    // A file that holds the very bytes to be written does no harm, and a deleted one comes back.
    fs::write(folder.join("strip.svg"), "a5").unwrap();
    fs::remove_file(folder.join("events.csv")).unwrap();
    write("a5", "b5", Replace::OnlyOurs).unwrap();
    assert_eq!(read("events.csv"), "b5");
    // Without the list everything counts as the user's; a list full of nonsense is no list.
    fs::write(
        folder.join(MANIFEST_NAME),
        b"\xff\x00 nonsense\nabc  strip.svg\n",
    )
    .unwrap();
    write("a6", "b6", Replace::OnlyOurs).unwrap_err();
    assert_no_leftovers(&folder);
}

#[test]
fn the_list_of_hashes_is_that_of_the_standard_tool() {
    let folder = TempDir::new().unwrap();
    let output = Output {
        name: "abc.txt",
        bytes: b"abc",
    };
    write_outputs(folder.path(), &[output], Replace::OnlyOurs).unwrap();
    let list = fs::read_to_string(folder.path().join(MANIFEST_NAME)).unwrap();
    // FIPS 180-2, appendix B.1: SHA-256 of "abc".
    let line = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad  abc.txt";
    assert_eq!(list.lines().nth(1), Some(line));
    assert!(list.starts_with("# "));
}

#[test]
fn output_names_stay_in_their_folder() {
    let folder = TempDir::new().unwrap();
    for name in [
        "",
        ".",
        "..",
        "../x",
        "a/b",
        "a\\b",
        "/x",
        "x/",
        "a\nb",
        MANIFEST_NAME,
    ] {
        let output = Output { name, bytes: b"x" };
        let error = write_outputs(folder.path(), &[output], Replace::Everything).unwrap_err();
        assert!(
            matches!(error, FileError::BadName { .. }),
            "{name:?}: {error}"
        );
    }
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 0);
}

#[test]
fn a_failed_write_leaves_the_old_file_and_nothing_else() {
    let folder = TempDir::new().unwrap();
    let inside = folder.path().join("none").join("x.txt");
    let error = write_whole(&inside, b"x").unwrap_err();
    assert!(error.to_string().contains("x.txt"), "{error}");
    assert!(matches!(
        write_whole(folder.path(), b"x"),
        Err(FileError::NotAFile { .. })
    ));
    let fixed = folder.path().join("fixed.txt");
    fs::write(&fixed, "old").unwrap();
    let mut permissions = fs::metadata(&fixed).unwrap().permissions();
    permissions.set_readonly(true);
    fs::set_permissions(&fixed, permissions).unwrap();
    assert!(matches!(
        write_whole(&fixed, b"new"),
        Err(FileError::WriteProtected { .. })
    ));
    assert_eq!(fs::read_to_string(&fixed).unwrap(), "old");
    assert_no_leftovers(folder.path());
}

#[cfg(unix)]
#[test]
fn links_permissions_and_devices_are_respected() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    let folder = TempDir::new().unwrap();
    let real = folder.path().join("real.ron");
    let link = folder.path().join("link.ron");
    fs::write(&real, "old").unwrap();
    fs::set_permissions(&real, fs::Permissions::from_mode(0o640)).unwrap();
    symlink("real.ron", &link).unwrap();
    write_whole(&link, b"new").unwrap();
    assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
    assert_eq!(fs::read_to_string(&real).unwrap(), "new");
    assert_eq!(
        fs::metadata(&real).unwrap().permissions().mode() & 0o777,
        0o640
    );
    let dangling = folder.path().join("dangling.ron");
    symlink("nowhere", &dangling).unwrap();
    assert!(matches!(
        write_whole(&dangling, b"x"),
        Err(FileError::DanglingLink { .. })
    ));
    let device = folder.path().join("device");
    symlink("/dev/null", &device).unwrap();
    assert!(matches!(
        write_whole(&device, b"x"),
        Err(FileError::NotAFile { .. })
    ));
    // The backup of a linked scenario stands beside its target.
    let target_folder = TempDir::new().unwrap();
    let target = target_folder.path().join("plan.ron");
    fs::write(&target, SMALL).unwrap();
    let linked = folder.path().join("linked.ron");
    symlink(&target, &linked).unwrap();
    let backup = read(SMALL).unwrap().save(&linked).unwrap().unwrap();
    assert_eq!(
        backup.canonicalize().unwrap(),
        target_folder
            .path()
            .canonicalize()
            .unwrap()
            .join("plan.ron.bak")
    );
    assert_no_leftovers(folder.path());
    assert_no_leftovers(target_folder.path());
}

// Properties

/// Degrees with up to eight decimals.
fn degrees(least: i64, greatest: i64) -> impl Strategy<Value = Angle> {
    (least * 100_000_000..=greatest * 100_000_000)
        .prop_map(|steps| Angle::from_degrees(steps as f64 / 1e8))
}

fn any_site() -> impl Strategy<Value = Site> {
    (
        "[^\\p{Cc}]{0,50}x",
        degrees(-90, 90),
        degrees(-180, 180),
        (
            -500.0..9000.0,
            0.0..9000.0,
            0.0..1200.0,
            -100.0..60.0,
            0.0..2.0,
        ),
    )
        .prop_map(|(name, latitude, longitude, air)| Site {
            name,
            latitude,
            longitude,
            elevation_m: air.0,
            height_above_surroundings_m: air.1,
            air: Air {
                pressure_hpa: air.2,
                temperature_c: air.3,
            },
            extinction_mag: air.4,
        })
}

fn any_skyline() -> impl Strategy<Value = SkylineSource> {
    // Altitudes to eight decimals; one or two points at an azimuth.
    let height = (-9_000_000_000..=9_000_000_000_i64).prop_map(|steps| steps as f64 / 1e8);
    let point = (
        height.clone(),
        proptest::option::of(height),
        proptest::option::of("[^\\p{Cc}]{0,20}x"),
    );
    let points = proptest::collection::btree_map(0..3600_u16, point, 0..20);
    (points, any::<bool>()).prop_map(|(points, smooth)| {
        let mut list = Vec::new();
        for (tenths, (altitude, wall, name)) in points {
            for altitude in [Some(altitude), wall].into_iter().flatten() {
                list.push(SkylinePoint {
                    azimuth: f64::from(tenths) / 10.0,
                    altitude,
                    name: name.clone(),
                });
            }
        }
        SkylineSource::in_document(Skyline::new(list).unwrap(), smooth)
    })
}

fn any_conditions() -> impl Strategy<Value = Conditions> {
    let moon =
        (degrees(0, 180), 0.0..=1.0).prop_map(|(least_distance, unless_lit_below)| MoonRule {
            least_distance,
            unless_lit_below,
        });
    let clock =
        (0..24_u8, 0..60_u8).prop_map(|(hour, minute)| ClockTime::new(hour, minute).unwrap());
    let hours = (clock.clone(), clock)
        .prop_filter("some time", |(from, to)| from != to)
        .prop_map(|(from, to)| Hours { from, to });
    let weekdays = proptest::sample::subsequence(Weekday::ALL.to_vec(), 1..=7)
        .prop_map(|days| Weekdays::from_days(&days).unwrap());
    (
        degrees(-5, 90),
        degrees(0, 90),
        degrees(-90, -1),
        proptest::option::of(moon),
        proptest::option::of(hours),
        weekdays,
    )
        .prop_map(
            |(least_altitude, clearance, sun_below, moon, hours, weekdays)| Conditions {
                least_altitude,
                clearance,
                sun_below,
                moon,
                hours,
                weekdays,
            },
        )
}

fn any_scenario() -> impl Strategy<Value = Scenario> {
    let dates = (-2000..2890_i32, 1..13_u8, 1..29_u8, 1..36_525_i32).prop_map(
        |(year, month, day, length)| {
            // The days that never were make room for the day after them.
            let from = CivilDate::new(year, month, day)
                .unwrap_or_else(|_| CivilDate::new(1582, 10, 15).unwrap());
            SeasonDates {
                from,
                to: from.plus_days(length).unwrap(),
            }
        },
    );
    let zone = prop_oneof![
        Just(Zone::LocalMeanTime),
        proptest::sample::select(vec!["UTC", "Europe/Oslo", "America/Argentina/Buenos_Aires"])
            .prop_map(|name| name.parse().unwrap()),
    ];
    // Any text at all, quotes, backslashes and line breaks included.
    let remark = || proptest::option::of(".*|\"#\\\\\"#.*|[\\r\\n\\t\\x00 -~]*");
    (
        (
            "[^\\p{Cc}]{0,80}x",
            proptest::sample::select(Body::PLANETS.to_vec()),
        ),
        proptest::sample::subsequence(Body::ALL[1..].to_vec(), 0..5),
        proptest::option::of(dates),
        (any_site(), zone),
        any_skyline(),
        any_conditions(),
        (degrees(5, 180), any::<bool>()),
        [remark(), remark(), remark(), remark(), remark()],
    )
        .prop_map(
            |(
                (title, subject),
                mut companions,
                season,
                (site, zone),
                skyline,
                conditions,
                (sun, turned),
                remarks,
            )| {
                companions.retain(|body| *body != subject);
                let mut scenario = read(SMALL).unwrap();
                let [whole, of_site, of_skyline, of_conditions, of_view] = remarks;
                scenario.title = title;
                scenario.subject = subject;
                scenario.companions = companions;
                scenario.season = season;
                scenario.site = site;
                scenario.zone = zone;
                scenario.skyline = skyline;
                scenario.conditions = conditions;
                scenario.sun_distance = sun;
                scenario.view.turned = turned;
                scenario.view.theme = if turned { Theme::Red } else { Theme::Dark };
                scenario.remarks.scenario = whole;
                scenario.remarks.site = of_site;
                scenario.remarks.skyline = of_skyline;
                scenario.remarks.conditions = of_conditions;
                scenario.remarks.view = of_view;
                scenario
            },
        )
}

/// A sound document with some of its bytes changed, cut or doubled.
fn mangled() -> impl Strategy<Value = String> {
    let text: Vec<char> = fs::read_to_string(shipped("mars-loop-2026.ron"))
        .unwrap()
        .chars()
        .collect();
    let length = text.len();
    (
        proptest::collection::vec((0..length, any::<char>()), 0..4),
        0..length,
        0..length,
    )
        .prop_map(move |(changes, from, to)| {
            let mut text = text.clone();
            for (place, letter) in changes {
                text[place] = letter;
            }
            let tail = text.split_off(from.max(to));
            text.truncate(text.len() - (from.max(to) - from.min(to)) % 7);
            text.into_iter().chain(tail).collect()
        })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 256, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn what_is_saved_reads_back_equal(scenario in any_scenario()) {
        let text = scenario.to_ron().unwrap();
        let again = read(&text).map_err(|error| TestCaseError::fail(format!("{error}\n{text}")))?;
        prop_assert_eq!(&again, &scenario);
        prop_assert_eq!(again.to_ron().unwrap(), text);
    }

    #[test]
    fn arbitrary_text_is_read_or_refused(text in ".*|[(){}\\[\\]:,\"r#a-z0-9 .-]*") {
        if let Err(error) = read(&text) {
            prop_assert!(error.to_string().starts_with("plan.ron"));
        }
    }

    #[test]
    fn a_mangled_document_is_read_or_refused_with_its_place(text in mangled()) {
        match read(&text) {
            Ok(scenario) => { scenario.to_ron().unwrap(); }
            Err(error) => prop_assert!(error.to_string().starts_with("plan.ron:"), "{}", error),
        }
    }
}
