//! The program as it is used from a shell: output, exit status, messages, bad input.

use std::fs;
use std::io::Write;
use std::path::Path;
use std::process::{Command, Output, Stdio};

fn loopwright(folder: &Path, words: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_loopwright"))
        .args(words)
        .current_dir(folder)
        .env_remove("DISPLAY")
        .env_remove("WAYLAND_DISPLAY")
        .env_remove("WAYLAND_SOCKET")
        .stdin(Stdio::null())
        .output()
        .unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

/// Runs words that must fail and returns the message; nothing may have been written to standard output.
fn refused(words: &[&str], status: i32) -> String {
    let folder = tempfile::tempdir().unwrap();
    let output = loopwright(folder.path(), words);
    let message = text(&output.stderr);
    assert_eq!(output.status.code(), Some(status), "{words:?}: {message}");
    assert_eq!(text(&output.stdout), "", "{words:?}");
    assert!(!message.contains("panicked"), "{message}");
    message
}

#[test]
fn without_words_it_writes_the_season_sheet() {
    let folder = tempfile::tempdir().unwrap();
    let output = loopwright(folder.path(), &[]);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    let brief = text(&output.stdout);
    // The dates follow from the reference events: stations 2027-01-10 and 04-01, opposition 2027-02-19.
    for words in ["10 January 2027", "1 April 2027", "19 February 2027", "Leo"] {
        assert!(brief.contains(words), "{words} in\n{brief}");
    }
    let sheet = folder.path().join("season-sheet");
    for name in ["strip.svg", "strip.png", "events.csv", "places.csv"] {
        assert!(
            fs::metadata(sheet.join(name)).unwrap().len() > 500,
            "{name}"
        );
    }
    let svg = fs::read_to_string(sheet.join("strip.svg")).unwrap();
    assert!(roxmltree::Document::parse(&svg).is_ok());

    // The same again gives the same bytes, and replaces its own files.
    let first = fs::read(sheet.join("strip.png")).unwrap();
    assert_eq!(loopwright(folder.path(), &["sheet"]).status.code(), Some(0));
    assert_eq!(fs::read(sheet.join("strip.png")).unwrap(), first);

    // What the user changed stays, until he says otherwise.
    fs::write(sheet.join("events.csv"), "mine\n").unwrap();
    let output = loopwright(folder.path(), &["sheet"]);
    assert_eq!(output.status.code(), Some(1));
    assert!(text(&output.stderr).contains("events.csv"));
    assert_eq!(
        fs::read_to_string(sheet.join("events.csv")).unwrap(),
        "mine\n"
    );
    assert_eq!(
        loopwright(folder.path(), &["sheet", "--replace"])
            .status
            .code(),
        Some(0)
    );
    assert!(
        fs::read_to_string(sheet.join("events.csv"))
            .unwrap()
            .starts_with("body,kind,jd_tt,utc,value,")
    );
}

#[test]
fn every_shipped_scenario_makes_a_sheet() {
    let folder = tempfile::tempdir().unwrap();
    let scenarios = Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let mut count = 0;
    for entry in fs::read_dir(scenarios).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_some_and(|extension| extension == "ron") {
            let out = format!("out{count}");
            let output = loopwright(
                folder.path(),
                &["sheet", path.to_str().unwrap(), "--out", &out],
            );
            assert_eq!(
                output.status.code(),
                Some(0),
                "{}: {}",
                path.display(),
                text(&output.stderr)
            );
            assert!(text(&output.stdout).lines().count() > 20);
            count += 1;
        }
    }
    assert!(count >= 5);
}

#[test]
fn places_keep_the_order_and_decimals_of_the_file() {
    let folder = tempfile::tempdir().unwrap();
    let instants = "# two instants\n2027-02-19T16:00:00.250Z\nJD 2423196.947002845 TT\n";
    fs::write(folder.path().join("instants.txt"), instants).unwrap();
    let words = [
        "places",
        "--bodies",
        "mars,moon",
        "--instants",
        "instants.txt",
    ];
    let output = loopwright(folder.path(), &words);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    let csv = text(&output.stdout);
    let lines: Vec<&str> = csv.lines().collect();
    assert_eq!(
        lines[0],
        "body,utc,jd_tt,ra_deg,dec_deg,lon_deg,lat_deg,distance_au,sun_distance_au,elongation_deg,phase_angle_deg,\
         lit_fraction,diameter_arcsec,magnitude,constellation,altitude_deg,apparent_altitude_deg,azimuth_deg,caution"
    );
    assert!(
        lines[1].starts_with("mars,2027-02-19T16:00:00.250Z,"),
        "{}",
        lines[1]
    );
    assert!(lines[2].starts_with("moon,2027-02-19T16:00:00.250Z,"));
    assert!(lines[3].contains(",2423196.947002845,"), "{}", lines[3]);
    assert_eq!(lines.len(), 5);
    // The same rows as JSON.
    let output = loopwright(folder.path(), &[&words[..], &["--format", "json"]].concat());
    let json: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(json.as_array().unwrap().len(), 4);
    assert_eq!(json[0]["body"], "mars");
    assert!(json[0]["altitude_deg"].is_null());
}

#[test]
fn negative_coordinates_are_plain_arguments() {
    let folder = tempfile::tempdir().unwrap();
    let words = [
        "places",
        "--bodies",
        "venus",
        "--from",
        "2029-10-01T10:00:00Z",
        "--to",
        "2029-10-01T12:00:00Z",
        "--step",
        "1h",
        "--site",
        "-35.0,-70.5,-12",
    ];
    let output = loopwright(folder.path(), &words);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    let csv = text(&output.stdout);
    assert_eq!(
        csv.lines().count(),
        3,
        "the end does not belong to the span"
    );
    let mut reader = csv::Reader::from_reader(csv.as_bytes());
    let column = reader
        .headers()
        .unwrap()
        .iter()
        .position(|name| name == "altitude_deg")
        .unwrap();
    for row in reader.records() {
        row.unwrap()[column].parse::<f64>().unwrap();
    }
}

#[test]
fn events_of_a_place_are_found_and_missing_ones_are_named() {
    let folder = tempfile::tempdir().unwrap();
    let sun = |site: &str, from: &str, to: &str| {
        let words = [
            "events", "--bodies", "sun", "--from", from, "--to", to, "--site", site, "--kinds",
            "rise,set",
        ];
        let output = loopwright(folder.path(), &words);
        assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
        (
            text(&output.stdout).lines().count() - 1,
            text(&output.stderr),
        )
    };
    let (count, _) = sun("50,10,0", "2026-12-01", "2026-12-03");
    assert_eq!(count, 4);
    // The pole in summer and in winter: no sunset, and said as such.
    for (from, to) in [("2026-06-01", "2026-06-11"), ("2026-12-01", "2026-12-11")] {
        let (count, message) = sun("90,0,0", from, to);
        assert_eq!(count, 0);
        assert!(
            message.contains("Sun") && message.contains("rise, set"),
            "{message}"
        );
    }
}

#[test]
fn remote_and_ancient_times_carry_their_cautions() {
    let folder = tempfile::tempdir().unwrap();
    let words = [
        "places",
        "--bodies",
        "mars",
        "--from",
        "-0746-02-26",
        "--to",
        "-0746-02-27",
    ];
    let output = loopwright(folder.path(), &words);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    let csv = text(&output.stdout);
    let row = csv.lines().nth(1).unwrap();
    assert!(row.starts_with("mars,-0746-02-26T00:00:00,"), "{row}");
    assert!(row.ends_with("series-place delta-t-modelled"), "{row}");
}

#[test]
fn wrong_words_end_with_status_2() {
    for (words, expected) in [
        (
            &[
                "places", "--bodies", "vulcan", "--from", "2026", "--to", "2027",
            ][..],
            "vulcan",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "2026", "--to", "2025",
            ][..],
            "later",
        ),
        (
            &[
                "places",
                "--bodies",
                "mars",
                "--from",
                "2026-13-01",
                "--to",
                "2027",
            ][..],
            "2026-13-01",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "2026", "--to", "2027", "--step", "0",
            ][..],
            "step",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "2026", "--to", "2027", "--step", "NaNd",
            ][..],
            "step",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "2026", "--to", "2027", "--site", "91,0,0",
            ][..],
            "latitude",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "2026", "--to", "2027", "--site", "NaN,0,0",
            ][..],
            "latitude",
        ),
        (&["places", "--bodies", "mars"][..], "--from"),
        (
            &[
                "events", "--bodies", "mars", "--from", "2026", "--to", "2027", "--kinds",
                "eclipse",
            ][..],
            "eclipse",
        ),
        (
            &[
                "events", "--bodies", "mars", "--from", "2026", "--to", "2027", "--kinds", "rise",
            ][..],
            "--site",
        ),
        (&["new", "--subject", "moon", "--site", "1,2,3"][..], "moon"),
        (
            &[
                "new",
                "--subject",
                "mars",
                "--site",
                "1,2,3",
                "--zone",
                "Europe/Berln",
            ][..],
            "Europe/Berlin",
        ),
        (
            &[
                "new",
                "--subject",
                "mars",
                "--from",
                "2027",
                "--to",
                "2026",
                "--site",
                "1,2,3",
                "--zone",
                "UTC",
            ][..],
            "later",
        ),
        (&["nonsense.ron", "more"][..], "more"),
    ] {
        let message = refused(words, 2);
        assert!(
            message.to_lowercase().contains(&expected.to_lowercase()),
            "{words:?}: {message}"
        );
    }
}

#[test]
fn what_cannot_be_done_ends_with_status_1() {
    for (words, expected) in [
        (&["sheet", "missing.ron"][..], "missing.ron"),
        (&["missing.ron"][..], "missing.ron"),
        (
            &["places", "--bodies", "mars", "--instants", "missing.txt"][..],
            "missing.txt",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "-2500", "--to", "-2499",
            ][..],
            "-2000",
        ),
        (
            &[
                "places", "--bodies", "mars", "--from", "3500", "--to", "3501",
            ][..],
            "3000",
        ),
        (
            &[
                "events", "--bodies", "mars", "--from", "2990", "--to", "3500",
            ][..],
            "3000",
        ),
    ] {
        let message = refused(words, 1);
        assert!(message.contains(expected), "{words:?}: {message}");
    }
}

#[test]
fn a_bad_line_among_instants_is_named() {
    let folder = tempfile::tempdir().unwrap();
    fs::write(
        folder.path().join("instants.txt"),
        "2026-01-01T00:00:00Z\nsoon\n",
    )
    .unwrap();
    let output = loopwright(
        folder.path(),
        &["places", "--bodies", "mars", "--instants", "instants.txt"],
    );
    assert_eq!(output.status.code(), Some(1));
    assert!(
        text(&output.stderr).contains("line 2"),
        "{}",
        text(&output.stderr)
    );
    assert_eq!(output.stdout, b"");
    fs::write(folder.path().join("instants.txt"), [0xff, 0xfe, 0x00]).unwrap();
    let output = loopwright(
        folder.path(),
        &["places", "--bodies", "mars", "--instants", "instants.txt"],
    );
    assert_eq!(output.status.code(), Some(1));
    assert!(text(&output.stderr).contains("UTF-8"));
}

#[test]
fn huge_and_binary_scenarios_are_refused() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("huge.ron");
    // 100 MB, most of it never written.
    fs::File::create(&path).unwrap().set_len(100 << 20).unwrap();
    let output = loopwright(folder.path(), &["sheet", "huge.ron"]);
    assert_eq!(output.status.code(), Some(1));
    assert!(
        text(&output.stderr).contains("huge.ron"),
        "{}",
        text(&output.stderr)
    );
    fs::write(&path, [0x80, 0x81, 0x82]).unwrap();
    let output = loopwright(folder.path(), &["sheet", "huge.ron"]);
    assert_eq!(output.status.code(), Some(1));
    assert!(text(&output.stderr).contains("UTF-8"));
}

/// A full disk, by way of the device that is always full.
#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_is_said_and_is_no_panic() {
    let full = fs::OpenOptions::new()
        .write(true)
        .open("/dev/full")
        .unwrap();
    let output = Command::new(env!("CARGO_BIN_EXE_loopwright"))
        .args([
            "places", "--bodies", "mars", "--from", "2026", "--to", "2027",
        ])
        .stdout(full)
        .stderr(Stdio::piped())
        .output()
        .unwrap();
    let message = text(&output.stderr);
    assert_eq!(output.status.code(), Some(1), "{message}");
    assert!(message.contains("standard output"), "{message}");
}

#[test]
fn a_closed_pipe_is_nothing_to_speak_of() {
    let mut child = Command::new(env!("CARGO_BIN_EXE_loopwright"))
        .args([
            "places", "--bodies", "all", "--from", "1990", "--to", "2020",
        ])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    // The reader goes away at once, as `head` does.
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    assert_eq!(text(&output.stderr), "");
}

#[test]
fn a_folder_that_cannot_be_made_is_named() {
    let folder = tempfile::tempdir().unwrap();
    // A file where the folder should be: works for root, whom permissions do not stop.
    fs::File::create(folder.path().join("taken"))
        .unwrap()
        .write_all(b"mine")
        .unwrap();
    let output = loopwright(folder.path(), &["sheet", "--out", "taken"]);
    assert_eq!(output.status.code(), Some(1));
    assert!(
        text(&output.stderr).contains("taken"),
        "{}",
        text(&output.stderr)
    );
    assert_eq!(fs::read(folder.path().join("taken")).unwrap(), b"mine");
}

#[test]
fn new_writes_a_scenario_that_opens() {
    let folder = tempfile::tempdir().unwrap();
    let words = [
        "new",
        "--subject",
        "venus",
        "--from",
        "2029-07",
        "--to",
        "2030-02",
        "--site",
        "-35.1,138.6,50",
        "--zone",
        "Australia/Adelaide",
        "--out",
        "venus.ron",
    ];
    let output = loopwright(folder.path(), &words);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    assert_eq!(
        loopwright(folder.path(), &["sheet", "venus.ron"])
            .status
            .code(),
        Some(0)
    );
    // A second time it is left alone.
    let output = loopwright(folder.path(), &words);
    assert_eq!(output.status.code(), Some(1));
    assert!(text(&output.stderr).contains("--replace"));
    // Without dates the next season is taken, for every planet.
    for subject in [
        "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune",
    ] {
        let words = [
            "new",
            "--subject",
            subject,
            "--site",
            "50,10,100",
            "--zone",
            "Europe/Berlin",
        ];
        let output = loopwright(folder.path(), &words);
        assert_eq!(
            output.status.code(),
            Some(0),
            "{subject}: {}",
            text(&output.stderr)
        );
        assert!(text(&output.stdout).contains("from:"), "{subject}");
    }
}

#[test]
fn help_version_and_completions() {
    let folder = tempfile::tempdir().unwrap();
    for command in ["sheet", "new", "places", "events"] {
        let help = text(&loopwright(folder.path(), &[command, "--help"]).stdout);
        assert!(help.contains("Example"), "{command}");
    }
    let version = text(&loopwright(folder.path(), &["--version"]).stdout);
    for word in ["DE440", "Hipparcos", "measured to", "boundaries"] {
        assert!(version.contains(word), "{word} in {version}");
    }
    let script = text(&loopwright(folder.path(), &["completions", "bash"]).stdout);
    assert!(script.contains("loopwright"));
}
