//! The embedded ephemeris against JPL DE440 and ERFA's nutation (tests/data; sources in the files' heads).

use loopwright::sky::{Ephemeris, EphemerisError, State, Target, Tdb, Vec3};

/// Stated accuracy as seen from the Earth, arcseconds.
const PLANET_ARCSEC: f64 = 0.01;
const MOON_ARCSEC: f64 = 0.1;
const NUTATION_ARCSEC: f64 = 0.001;
/// Stated accuracy of the distance from the Earth, relative.
const DISTANCE: f64 = 3e-8;
/// Stated accuracy of velocities, au per day: rounding a coefficient of degree k by q changes the rate by up to k^2 q.
/// Mercury moves up to 0.034, the others up to 0.02, the Moon 0.0006 au per day.
fn rate_limit(name: &str) -> f64 {
    match name {
        "MoonFromEarth" => 1.5e-9,
        "Mercury" => 1e-7,
        _ => 1e-8,
    }
}

fn ephemeris() -> &'static Ephemeris {
    Ephemeris::embedded().expect("the embedded ephemeris is sound")
}

/// The rows of a file in tests/data: comment lines and the heading left out.
fn rows(text: &str) -> Vec<Vec<&str>> {
    text.lines()
        .filter(|line| !line.starts_with('#'))
        .skip(1)
        .map(|line| line.split(',').collect())
        .collect()
}

fn number(field: &str) -> f64 {
    field.parse().expect("a number")
}

/// A row's time, name and state.
fn kernel_states() -> Vec<(Tdb, &'static str, State)> {
    rows(include_str!("data/de440_states.csv"))
        .into_iter()
        .map(|row| {
            let v: Vec<f64> = row[2..].iter().map(|field| number(field)).collect();
            let state = State {
                position: Vec3::new(v[0], v[1], v[2]),
                velocity: Vec3::new(v[3], v[4], v[5]),
            };
            (Tdb::from_days(number(row[0])), row[1], state)
        })
        .collect()
}

fn target(name: &str) -> Option<Target> {
    Target::ALL
        .into_iter()
        .find(|target| format!("{target:?}") == name)
}

/// Calls the check with (name, ours, the kernel's) for every row, and returns how many rows there were.
fn compare(mut check: impl FnMut(&str, Tdb, State, State)) -> usize {
    let states = kernel_states();
    for (time, name, truth) in &states {
        let ours = match target(name) {
            Some(target) => ephemeris().state(target, *time),
            None => ephemeris().earth(*time),
        };
        check(name, *time, ours.expect("inside the span"), *truth);
    }
    states.len()
}

#[test]
fn places_seen_from_earth_agree_with_de440() {
    let states = kernel_states();
    let true_earth = |time: Tdb| {
        let row = states.iter().find(|row| row.0 == time && row.1 == "Earth");
        row.expect("each epoch has the Earth").2.position
    };
    let count = compare(|name, time, ours, truth| {
        let (ours, truth, limit) = match name {
            "Earth" => (ours.position, truth.position, PLANET_ARCSEC),
            "MoonFromEarth" => (ours.position, truth.position, MOON_ARCSEC),
            "EarthMoonBarycentre" => (ours.position, truth.position, PLANET_ARCSEC),
            _ => {
                let earth = ephemeris().earth(time).expect("inside the span").position;
                (
                    ours.position - earth,
                    truth.position - true_earth(time),
                    PLANET_ARCSEC,
                )
            }
        };
        let angle = ours.separation(truth).arcsec();
        assert!(angle <= limit, "{name} at {time:?}: {angle}\" off");
        let distance = (ours.norm() / truth.norm() - 1.0).abs();
        assert!(
            distance <= DISTANCE,
            "{name} at {time:?}: distance off by {distance:e}"
        );
    });
    assert_eq!(count, 42 * 11);
}

#[test]
fn velocities_agree_with_de440() {
    let count = compare(|name, time, ours, truth| {
        let limit = rate_limit(name);
        let error = (ours.velocity - truth.velocity).norm();
        assert!(error <= limit, "{name} at {time:?}: {error:e} au a day off");
    });
    assert_eq!(count, 42 * 11);
}

#[test]
fn nutation_agrees_with_erfa() {
    let rows = rows(include_str!("data/nutation_iau2000a.csv"));
    assert_eq!(rows.len(), 42);
    for row in rows {
        let time = Tdb::from_days(number(row[0]));
        let nutation = ephemeris().nutation(time).expect("inside the span");
        for (ours, truth) in [(nutation.longitude, row[1]), (nutation.obliquity, row[2])] {
            let error = (ours.radians() - number(truth)).abs().to_degrees() * 3600.0;
            assert!(error <= NUTATION_ARCSEC, "{time:?}: {error}\" off");
        }
    }
}

/// Own bound: what two pieces differ by where they meet stays inside the stated accuracy.
#[test]
fn states_are_continuous_where_pieces_meet() {
    let (start, end) = ephemeris().span();
    for target in Target::ALL {
        let arcsec = match target {
            Target::MoonFromEarth => MOON_ARCSEC,
            _ => PLANET_ARCSEC,
        };
        // The least distance from the Earth, au, rounded down; for the barycentre the Sun's counts.
        let nearest_au = match target {
            Target::MoonFromEarth => 0.0023,
            Target::Sun | Target::EarthMoonBarycentre => 0.98,
            Target::Mercury => 0.54,
            Target::Venus => 0.26,
            Target::Mars => 0.37,
            Target::Jupiter => 3.9,
            Target::Saturn => 8.0,
            Target::Uranus => 17.2,
            Target::Neptune => 28.7,
        };
        let length = ephemeris().piece_days(target);
        let joints = ((end.days() - start.days()) / length).round() as usize;
        // 1e-5 of a day on either side is far above the resolution of the time, and linear motion is exact enough.
        let half = 1e-5;
        for joint in (1..joints).step_by(joints.div_ceil(500)) {
            let time = start.plus_days(joint as f64 * length);
            let before = ephemeris()
                .state(target, time.plus_days(-half))
                .expect("inside");
            let after = ephemeris()
                .state(target, time.plus_days(half))
                .expect("inside");
            let mean = (before.velocity + after.velocity) * 0.5;
            let step = (after.position - before.position - mean * (2.0 * half)).norm();
            assert!(
                step <= nearest_au * (arcsec / 3600.0).to_radians(),
                "{target:?} {time:?}: {step:e} au"
            );
            // The largest accelerations: Sun on Mercury at 0.307 au 0.0032 au/day^2, on Venus 0.0006, and Sun or Earth
            // on the others and the Moon less; times the gap they are at most 6.4e-8 and 1.2e-8.
            let pull = if target == Target::Mercury {
                0.0032
            } else {
                0.0006
            };
            let kick = (after.velocity - before.velocity).norm();
            let limit = 2.0 * rate_limit(&format!("{target:?}")) + pull * 2.0 * half;
            assert!(kick <= limit, "{target:?} {time:?}: {kick:e} au a day");
        }
    }
}

#[test]
fn velocity_is_the_slope_of_position() {
    // Central differences over 0.02 days, own check; the error of the formula is (0.01 d)^2 / 6 of the third derivative.
    let h = 0.01;
    for target in Target::ALL {
        for time in (-160..230).map(|k| Tdb::from_days(f64::from(k) * 1000.0 + 0.37)) {
            let at = |days| {
                ephemeris()
                    .state(target, time.plus_days(days))
                    .expect("inside")
            };
            let slope = (at(h).position - at(-h).position) * (0.5 / h);
            let error = (slope - at(0.0).velocity).norm();
            let limit = if target == Target::MoonFromEarth {
                1e-8
            } else {
                1e-7
            };
            assert!(error < limit, "{target:?} {time:?}: {error:e}");
        }
    }
}

#[test]
fn span_has_both_ends_and_nothing_beyond() {
    // The kernel's own span: JD 2287184.5 to 2688976.5 (1549-12-31 to 2650-01-25).
    let (start, end) = ephemeris().span();
    assert_eq!(
        (start.julian_date(), end.julian_date()),
        (2_287_184.5, 2_688_976.5)
    );
    for target in Target::ALL {
        assert!(ephemeris().state(target, start).is_some());
        assert!(ephemeris().state(target, end).is_some());
        assert_eq!(ephemeris().state(target, start.plus_days(-1e-6)), None);
        assert_eq!(ephemeris().state(target, end.plus_days(1e-6)), None);
        assert_eq!(ephemeris().state(target, Tdb::from_days(f64::NAN)), None);
        assert_eq!(
            ephemeris().state(target, Tdb::from_days(f64::INFINITY)),
            None
        );
    }
    assert!(ephemeris().nutation(start).is_some() && ephemeris().nutation(end).is_some());
    assert_eq!(ephemeris().nutation(end.plus_days(1.0)), None);
    assert_eq!(ephemeris().earth(start.plus_days(-1.0)), None);
}

#[test]
fn moon_is_the_earth_plus_the_way_to_it() {
    // DE440's Earth / Moon mass ratio 81.3005682 (Park et al. 2021, table 2) places the barycentre.
    let time = Tdb::from_days(7777.25);
    let earth = ephemeris().earth(time).expect("inside").position;
    let moon = ephemeris().moon(time).expect("inside").position;
    let barycentre = ephemeris()
        .state(Target::EarthMoonBarycentre, time)
        .expect("inside")
        .position;
    let ratio = (moon - barycentre).norm() / (earth - barycentre).norm();
    assert!((ratio - 81.300_568_2).abs() < 1e-6, "{ratio}");
}

#[test]
fn embedded_ephemeris_names_its_source() {
    assert!(ephemeris().source().contains("DE440"));
    assert_eq!(ephemeris().version(), 1);
    let stored = &Ephemeris::embedded_bytes()[12..16];
    assert_eq!(stored, ephemeris().checksum().to_le_bytes());
    assert!(Ephemeris::embedded_bytes().len() < 6_000_000);
}

#[test]
fn damage_is_an_error() {
    let sound = Ephemeris::embedded_bytes();
    let changed = |at: usize| {
        let mut bytes = sound.to_vec();
        bytes[at] ^= 0x10;
        Ephemeris::decode(&bytes).map(|_| ())
    };
    assert_eq!(changed(0), Err(EphemerisError::NotAnEphemeris));
    assert!(matches!(changed(8), Err(EphemerisError::Version(17))));
    for at in [12, 24, 300, sound.len() / 2, sound.len() - 1] {
        assert!(
            matches!(changed(at), Err(EphemerisError::Checksum { .. })),
            "byte {at}"
        );
    }
    let cut = |length: usize| Ephemeris::decode(&sound[..length]).map(|_| ());
    for length in [0, 7, 19] {
        assert_eq!(cut(length), Err(EphemerisError::NotAnEphemeris));
    }
    assert!(matches!(
        cut(sound.len() - 1),
        Err(EphemerisError::Length { .. })
    ));
}

/// A forged head with a right checksum must end in an error or in an ephemeris, never in a panic.
#[test]
fn forged_heads_do_not_panic() {
    let sound = Ephemeris::embedded_bytes();
    let source = usize::from(u16::from_le_bytes([sound[20], sound[21]]));
    let records = 22 + source;
    let mut refused = 0;
    // The source's length, the span, the first record; a body of two thousand bytes keeps the test quick.
    for at in [20, 21].into_iter().chain(records..records + 60) {
        for value in [0x00, 0x01, 0x7f, 0xff] {
            let mut bytes = sound[..2000].to_vec();
            bytes[at] = value;
            let length = (bytes.len() - 20) as u32;
            let checksum = crc32fast::hash(&bytes[20..]);
            bytes[12..16].copy_from_slice(&checksum.to_le_bytes());
            bytes[16..20].copy_from_slice(&length.to_le_bytes());
            refused += usize::from(matches!(
                Ephemeris::decode(&bytes),
                Err(EphemerisError::Malformed(_))
            ));
        }
    }
    assert_eq!(
        refused,
        62 * 4,
        "two thousand bytes hold no whole ephemeris"
    );
}
