//! The planner from a shell: nights, picks, advice, framing and log on the shipped scenarios, and what is refused.
//!
//! Dates that the reports are held against follow from events computed elsewhere (oppositions and elongations in the
//! reference tables of `tests/data`), from calendars, or from the rule in the scenario itself.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

use loopwright::scenario::programme::Programme;
use loopwright::scenario::{Plan, Scenario};
use loopwright::season::log::Outcome;
use loopwright::sky::Tt;
use loopwright::sky::calendar::{CivilDate, Weekday, parse_utc};

/// Scenario, a day before its path, and a day amid it.
const SHIPPED: [(&str, &str, &str); 5] = [
    ("mars-loop-2026", "2026-09-20", "2027-02-01"),
    ("venus-evening-2029", "2029-07-01", "2029-09-20"),
    ("saturn-thin-rings-2038", "2038-10-01", "2039-01-10"),
    ("mercury-roofs-2029", "2029-03-25", "2029-04-14"),
    ("mars-loop-139", "0139-03-01", "0139-05-01"),
];

fn shipped(name: &str) -> String {
    format!("{}/scenarios/{name}.ron", env!("CARGO_MANIFEST_DIR"))
}

fn loopwright(words: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_loopwright"))
        .args(words)
        .stdin(Stdio::null())
        .output()
        .unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

/// Standard output of words that must work.
fn done(words: &[&str]) -> String {
    let output = loopwright(words);
    let message = text(&output.stderr);
    assert_eq!(output.status.code(), Some(0), "{words:?}: {message}");
    text(&output.stdout)
}

/// The message of words that must fail with this status, and write nothing.
#[track_caller]
fn refused(words: &[&str], status: i32, parts: &[&str]) {
    let output = loopwright(words);
    let message = text(&output.stderr);
    assert_eq!(output.status.code(), Some(status), "{words:?}: {message}");
    assert_eq!(text(&output.stdout), "", "{words:?}");
    assert!(!message.contains("panicked"), "{message}");
    for part in parts {
        assert!(message.contains(part), "no \"{part}\" in: {message}");
    }
}

fn rows(csv: &str) -> Vec<Vec<String>> {
    let mut reader = csv::Reader::from_reader(csv.as_bytes());
    reader
        .records()
        .map(|row| row.unwrap().iter().map(str::to_owned).collect())
        .collect()
}

fn column(csv: &str, name: &str) -> usize {
    let header = csv.lines().next().unwrap();
    header.split(',').position(|word| word == name).unwrap()
}

#[test]
fn a_picture_fixed_on_the_ground_holds_the_dates_over_the_roofs() {
    let page = done(&[
        "frame",
        &shipped("venus-evening-2029"),
        "--on",
        "ground",
        "--today",
        "2029-07-01",
    ]);
    assert!(
        page.contains("the Sun at -6.0 deg in the evening"),
        "{page}"
    );
    assert!(page.contains("Sat 27 October 2029, evening, "), "{page}");
    // Greatest elongation: 40 degrees up at the end of civil twilight, says the scenario's own remark.
    let line = page
        .lines()
        .find(|line| line.contains("Sat 27 October 2029"))
        .unwrap();
    let altitude = line.split("altitude ").nth(1).unwrap();
    let altitude: f64 = altitude.split(' ').next().unwrap().parse().unwrap();
    assert!((37.0..42.0).contains(&altitude), "{line}");
    // The Sun must be down.
    refused(
        &[
            "frame",
            &shipped("venus-evening-2029"),
            "--on",
            "ground",
            "--sun",
            "3",
            "--today",
            "2029-07-01",
        ],
        1,
        &["Sun's altitude 3", "-1 degrees"],
    );
}

/// The embedded scenario as a file in a folder, with a part replaced.
fn changed(folder: &Path, part: &str, replacement: &str) -> PathBuf {
    let original = fs::read_to_string(shipped("mars-loop-2026")).unwrap();
    assert!(original.contains(part), "{part}");
    let path = folder.join("season.ron");
    fs::write(&path, original.replace(part, replacement)).unwrap();
    path
}

#[test]
fn nights_have_the_agreed_columns_and_a_row_each() {
    for (name, _, _) in SHIPPED {
        let csv = done(&["nights", &shipped(name)]);
        assert_eq!(
            csv.lines().next().unwrap(),
            "night,from_utc,to_utc,best_utc,altitude_deg,azimuth_deg,skyline_deg,sun_altitude_deg,moon_altitude_deg,\
             moon_separation_deg,moon_lit_fraction,magnitude,diameter_arcsec,margin_mag,score,ends_because"
        );
        let scenario = Scenario::load(Path::new(&shipped(name))).unwrap();
        let season = scenario.season.unwrap();
        let rows = rows(&csv);
        // Every civil date of the season, in order, none left out.
        let mut dates: Vec<&str> = rows.iter().map(|row| row[0].as_str()).collect();
        dates.dedup();
        let count = season.to.days_since(season.from);
        assert_eq!(dates.len(), usize::try_from(count).unwrap(), "{name}");
        assert_eq!(dates[0], season.from.to_string());
        // Conditions of the scenario itself, at the best moment.
        let conditions = &scenario.conditions;
        let number = |row: &[String], place: usize| -> f64 { row[place].parse().unwrap() };
        let mut with = 0;
        for row in &rows {
            assert!(!row[15].is_empty(), "{name}: {row:?}");
            if row[1].is_empty() {
                assert!(row[1..15].iter().all(String::is_empty), "{row:?}");
                continue;
            }
            with += 1;
            assert!(row[1] <= row[3] && row[3] <= row[2], "{row:?}");
            // Two decimals in the table, and refraction at the edges.
            let altitude = number(row, 4);
            assert!(
                altitude > conditions.least_altitude.degrees() - 0.02,
                "{row:?}"
            );
            // At an edge the skyline may be a wall, and the table gives its top.
            let at_edge = row[3] == row[1] || row[3] == row[2];
            assert!(
                at_edge || altitude > number(row, 6) + conditions.clearance.degrees() - 0.02,
                "{row:?}"
            );
            assert!(
                number(row, 7) < conditions.sun_below.degrees() + 0.02,
                "{row:?}"
            );
            assert!((0.0..=1.0).contains(&number(row, 14)), "{row:?}");
        }
        assert!(with >= 15, "{name}: only {with} spells");
    }
}

#[test]
fn nights_say_what_the_spells_say() {
    let path = shipped("mars-loop-2026");
    let plan = Plan::new(
        Scenario::load(Path::new(&path)).unwrap(),
        Tt::from_days(0.0),
    )
    .unwrap();
    let programme = Programme::new(&plan).unwrap();
    let csv = done(&["nights", &path]);
    let rows = rows(&csv);
    let mut found = rows.iter().filter(|row| !row[1].is_empty());
    let mut count = 0;
    for night in &programme.season.nights {
        for judged in night.offer.spells() {
            let row = found.next().unwrap();
            count += 1;
            let instant = plan.sky.tables().tt_from_utc(parse_utc(&row[1]).unwrap());
            let apart = (instant.days() - judged.spell.start.instant.days()) * 86_400.0;
            assert!(apart.abs() < 0.6, "{row:?}");
            assert_eq!(row[15], judged.ends_because());
            // Fridays and Saturdays only, says the scenario.
            let date: CivilDate = row[0].parse().unwrap();
            assert!(matches!(
                date.weekday(),
                Weekday::Friday | Weekday::Saturday
            ));
        }
    }
    assert!(found.next().is_none());
    assert!(count > 20, "{count}");
    // Track lengths grow from night to night.
    let (candidates, _) = programme.season.candidates();
    assert!(
        candidates
            .windows(2)
            .all(|pair| { pair[0].mark.track.radians() <= pair[1].mark.track.radians() })
    );
    // Closed by date.
    let closed = rows.iter().find(|row| row[0] == "2026-12-25").unwrap();
    assert_eq!(closed[15], "the house is closed");
}

#[test]
fn nights_come_as_json_too() {
    let json = done(&["nights", &shipped("mercury-roofs-2029"), "--format", "json"]);
    let rows: serde_json::Value = serde_json::from_str(&json).unwrap();
    assert!(rows.as_array().unwrap().len() >= 68);
    assert!(rows[0]["ends_because"].is_string());
}

#[test]
fn picks_keep_count_order_and_dates_that_must_be_in() {
    for (name, today, _) in SHIPPED {
        let scenario = Scenario::load(Path::new(&shipped(name))).unwrap();
        let csv = done(&["picks", &shipped(name), "--today", today, "--format", "csv"]);
        let (role, night, filled) = (
            column(&csv, "role"),
            column(&csv, "night"),
            column(&csv, "section_filled_probability"),
        );
        let rows = rows(&csv);
        let picks: Vec<&str> = rows
            .iter()
            .filter(|row| row[role] == "pick")
            .map(|row| row[night].as_str())
            .collect();
        assert_eq!(picks.len(), scenario.picks.count, "{name}");
        // Sections follow each other, and so do the nights within.
        let all: Vec<CivilDate> = rows.iter().map(|row| row[night].parse().unwrap()).collect();
        assert!(
            all.windows(2).all(|pair| pair[0] < pair[1]),
            "{name}: {all:?}"
        );
        for must in &scenario.picks.must_have {
            assert!(picks.contains(&must.to_string().as_str()), "{name}: {must}");
        }
        for closed in &scenario.picks.closed {
            assert!(!all.contains(closed), "{name}: {closed}");
        }
        for row in &rows {
            let filled: f64 = row[filled].parse().unwrap();
            assert!(filled > 0.0 && filled <= 1.0, "{row:?}");
        }
    }
}

#[test]
fn a_page_of_picks_names_weekday_and_civil_date() {
    let page = done(&[
        "picks",
        &shipped("mars-loop-2026"),
        "--count",
        "5",
        "--by",
        "days",
        "--today",
        "2026-09-20",
    ]);
    // The opposition of the reference events; 19 February 2027 is a Friday (ISO 8601 calendar).
    assert!(
        page.contains("Fri 19 February 2027, evening: in view "),
        "{page}"
    );
    assert!(
        page.contains("5 dates for an audience at the telescope, even in days"),
        "{page}"
    );
    assert!(
        page.contains("your odds (90 min clear: 18 % to 43 % by month, persistence 0.3)"),
        "{page}"
    );
}

#[test]
fn advice_is_given_for_every_scenario() {
    for (name, _, today) in SHIPPED {
        // Saturn's whole path of that winter is shorter than 10 degrees.
        let gap = if name.starts_with("saturn") {
            "3"
        } else {
            "15"
        };
        let words = [
            "advise",
            &shipped(name),
            "--outings",
            "30",
            "--gap",
            gap,
            "--today",
            today,
        ];
        let page = done(&words);
        assert!(
            page.contains(" % ") || page.contains(" %:"),
            "{name}: {page}"
        );
        let csv = done(&[&words[..], &["--format", "csv"]].concat());
        let (clear, lost) = (
            column(&csv, "clear_probability"),
            column(&csv, "lost_by_staying"),
        );
        for row in rows(&csv) {
            for place in [clear, lost] {
                let chance: f64 = row[place].parse().unwrap();
                assert!((0.0..=1.0).contains(&chance), "{row:?}");
            }
        }
    }
}

#[test]
fn a_forecast_counts_for_tonight() {
    let csv = done(&[
        "advise",
        &shipped("venus-evening-2029"),
        "--outings",
        "20",
        "--gap",
        "12",
        "--today",
        "2029-09-20",
        "--tonight",
        "0.6",
        "--format",
        "csv",
    ]);
    let clear = column(&csv, "clear_probability");
    let rows = rows(&csv);
    // A Thursday, which is allowed there.
    assert_eq!(rows[0][0], "2029-09-20");
    assert_eq!(rows[0][clear], "0.600");
}

#[test]
fn a_gap_that_cannot_be_held_names_the_section_and_what_can() {
    let page = done(&[
        "advise",
        &shipped("mars-loop-2026"),
        "--outings",
        "30",
        "--gap",
        "0.5",
        "--today",
        "2027-01-20",
    ]);
    assert!(page.contains("a gap of 0.5 deg cannot be held: "), "{page}");
    assert!(page.contains("the section from "), "{page}");
    assert!(page.contains("the smallest gap that can is "), "{page}");
}

#[test]
fn frames_place_every_date() {
    for (name, today, _) in SHIPPED {
        let scenario = Scenario::load(Path::new(&shipped(name))).unwrap();
        let words = ["frame", &shipped(name), "--today", today];
        let page = done(&words);
        for camera in &scenario.lenses {
            assert!(page.contains(camera.lens.name()), "{name}: {page}");
        }
        let csv = done(&[&words[..], &["--format", "csv"]].concat());
        let rows = rows(&csv);
        assert_eq!(
            rows.len(),
            scenario.lenses.len() * scenario.picks.count,
            "{name}"
        );
        let (x, y, held) = (
            column(&csv, "x_px"),
            column(&csv, "y_px"),
            column(&csv, "in_picture"),
        );
        for row in rows.iter().filter(|row| row[held] == "yes") {
            let camera = scenario
                .lenses
                .iter()
                .find(|camera| camera.lens.name() == row[0])
                .unwrap();
            let (x, y): (f64, f64) = (row[x].parse().unwrap(), row[y].parse().unwrap());
            assert!(
                (0.0..=f64::from(camera.sensor.columns())).contains(&x),
                "{row:?}"
            );
            assert!(
                (0.0..=f64::from(camera.sensor.rows())).contains(&y),
                "{row:?}"
            );
        }
    }
}

/// Celestial north lies below the pole for a southern observer facing the ecliptic: the picture is turned so that most
/// dates stand the right way up. Common practice, no source.
#[test]
fn pictures_stand_upright_north_and_south() {
    for (name, today, _) in SHIPPED {
        let csv = done(&["frame", &shipped(name), "--today", today, "--format", "csv"]);
        let lean = column(&csv, "tilt_to_horizon_deg");
        let held = column(&csv, "lens");
        let mut lenses: std::collections::BTreeMap<String, (usize, usize)> = Default::default();
        for row in rows(&csv) {
            let count = lenses.entry(row[held].clone()).or_default();
            count.1 += 1;
            count.0 += usize::from(row[lean].parse::<f64>().unwrap().abs() > 90.0);
        }
        assert!(!lenses.is_empty(), "{name}");
        for (lens, (on_its_head, all)) in lenses {
            assert!(
                on_its_head * 2 <= all,
                "{name} {lens}: {on_its_head} of {all} dates on their heads"
            );
        }
    }
}

#[test]
fn a_named_star_is_held_or_refused() {
    let path = shipped("mars-loop-2026");
    let page = done(&[
        "frame",
        &path,
        "--stars",
        "Regulus",
        "--today",
        "2026-09-20",
    ]);
    assert!(page.contains("holds all of it in one picture"), "{page}");
    refused(
        &["frame", &path, "--stars", "Vulcan", "--today", "2026-09-20"],
        2,
        &["Vulcan"],
    );
}

#[test]
fn the_log_is_written_and_planned_from() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("season.ron");
    fs::copy(shipped("mars-loop-2026"), &path).unwrap();
    let file = path.to_str().unwrap();
    let words = [
        "log",
        file,
        "--night",
        "2027-01-22",
        "--as",
        "shot",
        "--at",
        "2027-01-22T20:40:00Z",
        "--exposure",
        "8",
        "--file",
        "mars-0122.tif",
        "--remark",
        "thin cirrus",
    ];
    let output = loopwright(&words);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    assert!(
        text(&output.stderr).contains("season.ron.bak"),
        "{}",
        text(&output.stderr)
    );
    let original = fs::read_to_string(shipped("mars-loop-2026")).unwrap();
    assert_eq!(
        fs::read_to_string(folder.path().join("season.ron.bak")).unwrap(),
        original
    );
    let scenario = Scenario::load(&path).unwrap();
    let [entry] = scenario.log.entries() else {
        panic!("{:?}", scenario.log);
    };
    assert_eq!(entry.outcome, Outcome::Shot);
    assert_eq!(entry.exposure_s, Some(8.0));
    assert_eq!(entry.file.as_deref(), Some("mars-0122.tif"));
    assert_eq!(entry.remark.as_deref(), Some("thin cirrus"));
    assert_eq!(
        scenario.remarks.picks,
        Scenario::load(Path::new(&shipped("mars-loop-2026")))
            .unwrap()
            .remarks
            .picks
    );
    // Nothing else has changed.
    let mut without = scenario.clone();
    without.log = loopwright::season::log::Log::default();
    assert_eq!(
        without,
        Scenario::load(Path::new(&shipped("mars-loop-2026"))).unwrap()
    );

    // The same night again is refused, and replaced only when told to.
    refused(&words, 1, &["2027-01-22", "already logged as shot"]);
    assert_eq!(
        loopwright(&[&words[..], &["--replace"]].concat())
            .status
            .code(),
        Some(0)
    );

    // Planning goes on from there: no date before the day after, the frame counts as the last one.
    let planned = ["log", file, "--night", "2027-03-05", "--as", "planned"];
    assert_eq!(loopwright(&planned).status.code(), Some(0));
    let csv = done(&["picks", file, "--today", "2027-01-23", "--format", "csv"]);
    let night = column(&csv, "night");
    let nights: Vec<String> = rows(&csv)
        .into_iter()
        .map(|row| row[night].clone())
        .collect();
    assert!(
        nights.iter().all(|night| night.as_str() > "2027-01-22"),
        "{nights:?}"
    );
    // What was announced stays.
    assert!(nights.contains(&"2027-03-05".to_owned()), "{nights:?}");
    let page = done(&[
        "advise",
        file,
        "--outings",
        "20",
        "--gap",
        "15",
        "--today",
        "2027-01-29",
    ]);
    assert!(page.contains("last frame 7 nights ago"), "{page}");
}

#[test]
fn logs_that_cannot_be_are_refused() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("season.ron");
    fs::copy(shipped("mars-loop-2026"), &path).unwrap();
    let file = path.to_str().unwrap();
    let log = |night: &str, more: &[&str], status: i32, parts: &[&str]| {
        let words = [&["log", file, "--night", night, "--as", "shot"], more].concat();
        refused(&words, status, parts);
    };
    log(
        "2028-01-01",
        &[],
        1,
        &["2028-01-01", "outside the season", "2026-11-01"],
    );
    log(
        "2027-02-11",
        &["--exposure", "0"],
        1,
        &["exposure", "above 0"],
    );
    log(
        "2027-02-11",
        &["--at", "2027-02-14T20:00:00Z"],
        1,
        &["not in that night"],
    );
    log("2027-02-11", &["--at", "yesterday"], 2, &["yesterday"]);
    refused(
        &["log", file, "--night", "2027-02-11", "--as", "lost"],
        2,
        &["partly_shot", "clouded"],
    );
    // The file has not been touched.
    assert_eq!(
        fs::read_to_string(&path).unwrap(),
        fs::read_to_string(shipped("mars-loop-2026")).unwrap()
    );
}

#[test]
fn scenarios_that_cannot_be_planned_say_where() {
    let folder = tempfile::tempdir().unwrap();
    let refuse = |part: &str, replacement: &str, parts: &[&str]| {
        let path = changed(folder.path(), part, replacement);
        let file = path.to_str().unwrap().to_owned();
        // Line and column follow the file's name.
        let mut all = vec!["season.ron:"];
        all.extend(parts);
        refused(&["nights", &file], 1, &all);
    };
    refuse("odds: [0.22,", "odds: [1.22,", &["1.22", "0 to 1"]);
    refuse("odds: [0.22,", "odds: [NaN,", &["NaN"]);
    refuse("persistence: 0.3", "persistence: 1.5", &["1.5"]);
    refuse(
        "focal_length_mm: 50",
        "focal_length_mm: 0",
        &["focal length 0", "50"],
    );
    refuse(
        "weekdays: [friday, saturday]",
        "weekdays: []",
        &["no day is allowed"],
    );
    refuse("count: 6", "count: 0", &["count 0", "1 to 400"]);
    refuse(
        "reserve_rule: within_days(8)",
        "reserve_rule: within_days(0)",
        &["within_days"],
    );
    refuse(
        "to: \"2027-05-08\"",
        "to: \"2027-01-08\"",
        &["2027-01-08", "not before"],
    );
    refuse(
        "must_have: [\"2027-02-19\"]",
        "must_have: [\"2028-02-19\"]",
        &["2028-02-19", "outside the season"],
    );
    refuse(
        "    view: (",
        "    log: [(night: \"2027-02-12\", outcome: shot), (night: \"2027-02-12\", outcome: clouded)],\n    view: (",
        &["two entries for the night of 2027-02-12"],
    );
    refuse(
        "    view: (",
        "    log: [(night: \"2028-02-12\", outcome: shot)],\n    view: (",
        &["2028-02-12", "outside the season"],
    );
    refuse(
        "purpose: audience_telescope",
        "purpose: audience_at_telescope",
        &["audience_telescope"],
    );
}

#[test]
fn dates_and_advice_that_cannot_be_say_why() {
    let folder = tempfile::tempdir().unwrap();
    let mars = shipped("mars-loop-2026");
    let picks = |file: &str, more: &[&str], status: i32, parts: &[&str]| {
        let words = [&["picks", file, "--today", "2026-09-20"], more].concat();
        refused(&words, status, parts);
    };
    picks(&mars, &["--count", "0"], 1, &["at least 1"]);
    picks(
        &mars,
        &["--count", "300"],
        1,
        &["300 dates asked for", "at most"],
    );
    picks(&mars, &["--by", "luck"], 2, &["angle", "days"]);
    refused(
        &["picks", &mars, "--today", "2027-05-20"],
        1,
        &["2027-05-20", "ended"],
    );
    // A Wednesday cannot be in where Fridays and Saturdays are open.
    let path = changed(
        folder.path(),
        "must_have: [\"2027-02-19\"]",
        "must_have: [\"2027-02-17\"]",
    );
    picks(
        path.to_str().unwrap(),
        &[],
        1,
        &[
            "2027-02-17 must be in",
            "the nearest that is stands on 2027-02-1",
        ],
    );
    // Mars at 75 degrees over a place at 50.6 north never is.
    let path = changed(folder.path(), "least_altitude: 20", "least_altitude: 75");
    picks(
        path.to_str().unwrap(),
        &[],
        1,
        &["no candidate nights between"],
    );
    let advise = |more: &[&str], status: i32, parts: &[&str]| {
        let words = [&["advise", &mars, "--today", "2027-01-20"], more].concat();
        refused(&words, status, parts);
    };
    advise(&["--outings", "0", "--gap", "10"], 1, &["budget of 0"]);
    advise(&["--outings", "9", "--gap", "0"], 1, &["gap of 0"]);
    advise(&["--outings", "9", "--gap", "wide"], 2, &["wide", "12d"]);
    advise(
        &["--outings", "9", "--gap", "9", "--tonight", "1.4"],
        2,
        &["1.4", "0 to 1"],
    );
    advise(
        &["--outings", "9", "--gap", "9", "--tonight", "NaN"],
        2,
        &["NaN"],
    );
    // No lenses.
    let path = folder.path().join("bare.ron");
    fs::write(
        &path,
        r#"Scenario(version: 1, title: "T", subject: mars, season: (from: "2026-11-01", to: "2027-06-01"),
            site: (name: "S", latitude: 50, longitude: 10, zone: "Europe/Berlin"))"#,
    )
    .unwrap();
    refused(
        &["frame", path.to_str().unwrap(), "--today", "2026-11-01"],
        1,
        &["no lenses", "focal_length_mm"],
    );
}

#[test]
fn every_command_shows_an_example() {
    for command in ["nights", "picks", "advise", "frame", "log"] {
        let help = done(&[command, "--help"]);
        let example = help.lines().find(|line| {
            line.trim_start()
                .starts_with(&format!("loopwright {command} "))
        });
        assert!(example.is_some(), "{help}");
    }
}
