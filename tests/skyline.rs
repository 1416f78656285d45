//! The skyline by its definition: straight lines in azimuth and altitude, closed over north, walls, names, files.

use loopwright::sky::skyline::{PointPlace, SkylineError, SkylinePoint};
use loopwright::sky::{Angle, Skyline};
use proptest::prelude::*;

fn point(azimuth: f64, altitude: f64) -> SkylinePoint {
    SkylinePoint {
        azimuth,
        altitude,
        name: None,
    }
}

fn named(azimuth: f64, altitude: f64, name: &str) -> SkylinePoint {
    SkylinePoint {
        name: Some(name.to_owned()),
        ..point(azimuth, altitude)
    }
}

fn skyline(points: &[(f64, f64)]) -> Skyline {
    Skyline::new(points.iter().map(|(az, alt)| point(*az, *alt)).collect()).unwrap()
}

fn altitude(skyline: &Skyline, azimuth_deg: f64) -> f64 {
    skyline
        .altitude_at(Angle::from_degrees(azimuth_deg))
        .degrees()
}

#[track_caller]
fn close(got: f64, expected: f64) {
    assert!((got - expected).abs() < 1e-9, "{got} against {expected}");
}

/// A ridge, a tower with two walls, a drop below the horizon.
fn town() -> Skyline {
    Skyline::new(vec![
        named(20.0, 4.0, "ridge"),
        point(100.0, 8.0),
        point(143.0, 3.0),
        named(143.0, 12.0, "water tower"),
        point(146.0, 12.0),
        point(146.0, 2.0),
        point(300.0, -1.5),
    ])
    .unwrap()
}

#[test]
fn no_point_is_flat_and_one_is_level() {
    let flat = Skyline::default();
    assert_eq!(flat, Skyline::new(Vec::new()).unwrap());
    let level = skyline(&[(77.0, -2.5)]);
    for azimuth in [0.0, 76.9, 77.0, 180.0, 359.999, 400.0, -20.0] {
        close(altitude(&flat, azimuth), 0.0);
        close(altitude(&level, azimuth), -2.5);
    }
    assert_eq!(flat.max_altitude(), Angle::ZERO);
    close(level.max_altitude().degrees(), -2.5);
    assert_eq!(flat.segments().count(), 1);
    assert_eq!(level.segments().count(), 1);
    assert_eq!(flat.part_at(Angle::ZERO), None);
}

#[test]
fn lines_are_straight_and_close_over_north() {
    let skyline = skyline(&[(350.0, 10.0), (30.0, 2.0), (200.0, 6.0)]);
    close(altitude(&skyline, 115.0), 4.0);
    // 10 at 350 to 2 at 390: a fifth of a degree per degree.
    close(altitude(&skyline, 355.0), 9.0);
    close(altitude(&skyline, 0.0), 8.0);
    close(altitude(&skyline, 360.0), 8.0);
    close(altitude(&skyline, 10.0), 6.0);
    close(skyline.max_altitude().degrees(), 10.0);
}

#[test]
fn a_wall_shows_its_higher_side_and_each_side_its_own() {
    let town = town();
    let little = 1e-7;
    for (azimuth, before, at, after) in [(143.0, 3.0, 12.0, 12.0), (146.0, 12.0, 12.0, 2.0)] {
        assert!((altitude(&town, azimuth - little) - before).abs() < 1e-6);
        close(altitude(&town, azimuth), at);
        assert!((altitude(&town, azimuth + little) - after).abs() < 1e-6);
    }
    assert_eq!(town.segments().filter(|s| s.is_wall()).count(), 2);
    // Only a wall: from 9 all the way round down to 1.
    let alone = skyline(&[(90.0, 1.0), (90.0, 9.0)]);
    close(altitude(&alone, 90.0), 9.0);
    close(altitude(&alone, 270.0), 5.0);
}

#[test]
fn a_wall_at_north_may_be_written_at_0_or_360() {
    let at_zero = skyline(&[(0.0, 3.0), (0.0, 9.0), (180.0, 5.0)]);
    let at_360 = skyline(&[(180.0, 5.0), (360.0, 3.0), (360.0, 9.0)]);
    let both = skyline(&[(0.0, 9.0), (180.0, 5.0), (360.0, 3.0)]);
    let closed = skyline(&[(0.0, 3.0), (0.0, 9.0), (180.0, 5.0), (360.0, 3.0)]);
    assert_eq!(at_zero, at_360);
    assert_eq!(at_zero, both);
    assert_eq!(at_zero, closed);
    close(altitude(&at_zero, 0.0), 9.0);
    close(altitude(&at_zero, 270.0), 4.0);
    // A list that closes itself has no wall there.
    assert_eq!(
        skyline(&[(0.0, 5.0), (90.0, 1.0), (360.0, 5.0)])
            .vertices()
            .len(),
        2
    );
}

#[test]
fn parts_are_known_by_name() {
    let town = town();
    let part = |azimuth: f64| town.part_at(Angle::from_degrees(azimuth));
    assert_eq!(part(144.0), Some("water tower"));
    assert_eq!(part(143.0), Some("water tower"));
    assert_eq!(part(146.0), Some("water tower"));
    assert_eq!(part(146.1), None);
    assert_eq!(part(50.0), Some("ridge"));
    assert_eq!(part(120.0), None);
    // The slope up to a named point that has no name of its own.
    assert_eq!(part(10.0), Some("ridge"));
}

#[test]
fn wrong_points_are_refused_with_number_value_and_range() {
    let refused = |points: &[(f64, f64)]| {
        Skyline::new(points.iter().map(|(az, alt)| point(*az, *alt)).collect()).unwrap_err()
    };
    let error = refused(&[(0.0, 1.0), (361.5, 2.0)]);
    assert_eq!(
        error.to_string(),
        "skyline point 2: azimuth 361.5 is not within 0 to 360 degrees"
    );
    let error = refused(&[(0.0, 1.0), (20.0, 2.0), (30.0, -90.5)]);
    assert_eq!(
        error.to_string(),
        "skyline point 3: altitude -90.5 is not within -90 to 90 degrees"
    );
    assert!(matches!(
        refused(&[(f64::NAN, 0.0)]),
        SkylineError::Azimuth { .. }
    ));
    assert!(matches!(
        refused(&[(1.0, f64::NAN)]),
        SkylineError::Altitude { .. }
    ));
    assert_eq!(
        refused(&[(5.0, 1.0), (90.0, 1.0), (5.0, 2.0), (5.0, 3.0)]),
        SkylineError::ThirdAtOneAzimuth {
            place: PointPlace::Point(4),
            azimuth: 5.0
        }
    );
}

#[test]
fn text_is_read_with_or_without_header() {
    let text = "\u{feff}# surveyed with a theodolite\nazimuth,altitude,name\n20, 4, ridge\n100,8\n143,3\r\n\n143,12,water tower\n146,12\n146,2\n300,-1.5,\n";
    let mut expected = town();
    assert_eq!(Skyline::from_csv(text).unwrap(), expected);
    let bare = text.replace("azimuth,altitude,name\n", "");
    assert_eq!(Skyline::from_csv(&bare).unwrap(), expected);
    expected = Skyline::new(vec![named(1.0, 2.0, "chapel, \"old\"")]).unwrap();
    assert_eq!(
        Skyline::from_csv("Azimuth_deg,Altitude_deg\n1,2,\"chapel, \"\"old\"\"\"").unwrap(),
        expected
    );
    assert_eq!(Skyline::from_csv("").unwrap(), Skyline::default());
}

#[test]
fn wrong_text_is_refused_with_its_line() {
    let message = |text: &str| Skyline::from_csv(text).unwrap_err().to_string();
    assert_eq!(
        message("# remark\n\nazimuth,altitude\n10,3\nten,4\n"),
        "skyline, line 5: azimuth \"ten\" is not a number of degrees"
    );
    assert_eq!(
        message("10,3\n\n20,95\n"),
        "skyline, line 3: altitude 95 is not within -90 to 90 degrees"
    );
    assert!(message("10\n").starts_with("skyline, line 1: 1 fields"));
    assert!(message("10,5,3,0\n").starts_with("skyline, line 1: 4 fields"));
    assert!(message("bearing,height\n10,5\n").starts_with("skyline, line 1: azimuth \"bearing\""));
    assert!(message("9,1\n9,2\n#\n9,3\n").starts_with("skyline, line 4: a third point"));
}

#[test]
fn points_are_written_and_read_by_name() {
    let point = named(143.0, 12.0, "water tower");
    let text = ron::to_string(&point).unwrap();
    assert_eq!(ron::from_str::<SkylinePoint>(&text).unwrap(), point);
    assert!(ron::from_str::<SkylinePoint>("(azimuth:1.0,altitude:2.0,hight:3.0)").is_err());
}

#[test]
fn smoothing_rounds_the_ridge_and_keeps_walls_and_names() {
    let smooth = town().smoothed(Angle::from_degrees(1.0));
    for vertex in town().vertices() {
        assert!(
            smooth
                .vertices()
                .iter()
                .any(|v| v.azimuth == vertex.azimuth && v.altitude == vertex.altitude)
        );
    }
    assert_eq!(smooth.segments().filter(|s| s.is_wall()).count(), 2);
    for segment in smooth.segments() {
        assert!((segment.to_azimuth - segment.from_azimuth).degrees() <= 1.0 + 1e-9);
    }
    assert_eq!(
        smooth.part_at(Angle::from_degrees(144.5)),
        Some("water tower")
    );
    assert_eq!(smooth.part_at(Angle::from_degrees(10.0)), Some("ridge"));
    assert_eq!(smooth.part_at(Angle::from_degrees(120.0)), None);
    // The roof between its walls stays level, the ridge no longer straight.
    close(altitude(&smooth, 144.5), 12.0);
    assert!((altitude(&smooth, 80.0) - altitude(&town(), 80.0)).abs() > 0.05);
    // The summit at 100 degrees becomes level: half a degree beside it the line falls by less than a straight one.
    assert!(8.0 - altitude(&smooth, 98.0) < 0.5 * (8.0 - altitude(&town(), 98.0)));
    assert_eq!(
        Skyline::default().smoothed(Angle::from_degrees(1.0)),
        Skyline::default()
    );
    // Nonsense steps are kept in bounds.
    assert!(town().smoothed(Angle::ZERO).vertices().len() < 8000);
    assert!(
        town()
            .smoothed(Angle::from_degrees(f64::NAN))
            .vertices()
            .len()
            < 8000
    );
}

/// Points on a grid of whole degrees, so that walls and north come up; at most two at one azimuth.
fn any_skyline() -> impl Strategy<Value = (Skyline, Vec<(f64, f64)>)> {
    prop::collection::vec((0_u32..=360, -20_i32..60), 0..25).prop_map(|raw| {
        let mut points: Vec<(f64, f64)> = Vec::new();
        for (azimuth, altitude) in raw {
            let same = |p: &&(f64, f64)| p.0 as u32 % 360 == azimuth % 360;
            if points.iter().filter(same).count() < 2 {
                points.push((f64::from(azimuth), f64::from(altitude)));
            }
        }
        (skyline(&points), points)
    })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 600, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn closed_all_round((skyline, _) in any_skyline(), azimuth in -720.0..720.0_f64) {
        let once = altitude(&skyline, azimuth);
        prop_assert!((altitude(&skyline, azimuth + 360.0) - once).abs() < 1e-6);
        let mut end = skyline.segments().next().unwrap().from_azimuth;
        let begin = end;
        for segment in skyline.segments() {
            // Each piece begins where the last one ended.
            prop_assert!((segment.from_azimuth - end).signed().degrees().abs() < 1e-9);
            prop_assert!(segment.to_azimuth >= segment.from_azimuth);
            end = segment.to_azimuth;
        }
        prop_assert!((end - begin - Angle::from_degrees(360.0)).degrees().abs() < 1e-9);
    }

    #[test]
    fn between_its_neighbours((skyline, points) in any_skyline(), azimuth in 0.0..360.0_f64) {
        prop_assume!(points.len() >= 2 && azimuth.fract() > 1e-6);
        // The nearest points on either side, by looking at all of them.
        let behind = |p: &(f64, f64)| (azimuth - p.0).rem_euclid(360.0);
        let ahead = |p: &(f64, f64)| (p.0 - azimuth).rem_euclid(360.0);
        let low = points.iter().map(behind).fold(f64::INFINITY, f64::min);
        let high = points.iter().map(ahead).fold(f64::INFINITY, f64::min);
        let left: Vec<f64> = points.iter().filter(|p| (behind(p) - low).abs() < 1e-9).map(|p| p.1).collect();
        let right: Vec<f64> = points.iter().filter(|p| (ahead(p) - high).abs() < 1e-9).map(|p| p.1).collect();
        let got = altitude(&skyline, azimuth);
        let fits = left.iter().any(|l| right.iter().any(|r| {
            (got - (l + (r - l) * low / (low + high))).abs() < 1e-9
        }));
        prop_assert!(fits, "{got} from {left:?} and {right:?}");
    }

    #[test]
    fn every_point_is_reached_and_walls_show_the_higher((skyline, points) in any_skyline()) {
        for (azimuth, _) in &points {
            let highest = points
                .iter()
                .filter(|p| p.0 % 360.0 == azimuth % 360.0)
                .map(|p| p.1)
                .fold(f64::NEG_INFINITY, f64::max);
            prop_assert!((altitude(&skyline, *azimuth) - highest).abs() < 1e-9);
        }
        let highest = points.iter().map(|p| p.1).fold(f64::NEG_INFINITY, f64::max);
        if !points.is_empty() {
            prop_assert!((skyline.max_altitude().degrees() - highest).abs() < 1e-9);
        }
    }

    #[test]
    fn the_cursor_answers_as_the_skyline_does(
        (skyline, _) in any_skyline(),
        steps in prop::collection::vec(prop_oneof![-3.0..5.0_f64, -360.0..360.0_f64, (0_i32..360).prop_map(f64::from)], 1..60),
    ) {
        let mut cursor = skyline.cursor();
        let mut azimuth = 0.0;
        for step in steps {
            azimuth = if step.fract() == 0.0 { step } else { azimuth + step };
            let angle = Angle::from_degrees(azimuth);
            prop_assert_eq!(cursor.altitude_at(angle), skyline.altitude_at(angle));
        }
    }

    #[test]
    fn smoothing_passes_every_vertex_and_bulges_past_none((skyline, _) in any_skyline(), step in 0.5..20.0_f64) {
        let smooth = skyline.smoothed(Angle::from_degrees(step));
        for segment in skyline.segments().filter(|s| !s.is_wall()) {
            let (a, b) = (segment.from_altitude.degrees(), segment.to_altitude.degrees());
            let mut last = a;
            for part in 1..20 {
                let along = segment.from_azimuth + (segment.to_azimuth - segment.from_azimuth) * (f64::from(part) / 20.0);
                let here = smooth.altitude_at(along).degrees();
                // Never back: it goes from one end to the other in one direction.
                prop_assert!((here - last) * (b - a) >= -1e-9, "{last} {here} between {a} and {b}");
                last = here;
            }
            prop_assert!((last - a) * (b - last) >= -1e-9);
        }
        for pair in smooth.vertices().windows(2) {
            prop_assert!(pair[0].azimuth <= pair[1].azimuth);
        }
    }
}
