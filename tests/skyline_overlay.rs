//! The silhouette over the strip against the engine's own altitudes: it covers exactly the directions whose apparent
//! altitude is below the skyline, on every kind of row, in both hemispheres.

use std::path::Path;

use loopwright::chart::{
    Layer, Level, MarkId, Outline, OverlayStyle, Palette, Point, Rect, Role, Scene, Shape,
    StripText, StripView, StripWindow, note_boxes, overlaid, skyline_overlay, strip,
};
use loopwright::scenario::{Plan, Scenario};
use loopwright::season::moment::{Watch, moment};
use loopwright::sheet::{east_is_left, png, strip_text};
use loopwright::sky::refraction::apparent_from_true;
use loopwright::sky::skyline::SkylinePoint;
use loopwright::sky::stars::StarCatalogue;
use loopwright::sky::{Angle, Body, Skyline, Tt, Vec3};

fn plan(name: &str) -> Plan {
    let path = format!("{}/scenarios/{name}.ron", env!("CARGO_MANIFEST_DIR"));
    let scenario = Scenario::load(Path::new(&path)).unwrap();
    Plan::new(scenario, Tt::from_days(9_800.0)).unwrap()
}

fn watch<'a>(plan: &'a Plan, skyline: &'a Skyline) -> Watch<'a> {
    Watch {
        sky: &plan.sky,
        site: &plan.scenario.site,
        skyline,
        subject: plan.season.subject,
        companions: &plan.scenario.companions,
        sun_distance: plan.scenario.sun_distance,
    }
}

/// A point is inside when an odd number of edges lies to its right (the even-odd rule of SVG 1.1, section 11.3).
fn inside(point: Point, rings: &[Vec<Point>]) -> bool {
    let mut odd = false;
    for ring in rings {
        for (index, b) in ring.iter().enumerate() {
            let a = ring[(index + ring.len() - 1) % ring.len()];
            if (a.y > point.y) != (b.y > point.y) {
                let x = a.x + (point.y - a.y) / (b.y - a.y) * (b.x - a.x);
                odd ^= point.x < x;
            }
        }
    }
    odd
}

fn silhouettes(scene: &Scene) -> Vec<&Vec<Vec<Point>>> {
    scene
        .marks
        .iter()
        .filter_map(|mark| match (mark.layer, &mark.shape) {
            (Layer::Skyline, Shape::Area { rings, fill, .. }) if fill.role == Role::Skyline => {
                Some(rings)
            }
            _ => None,
        })
        .collect()
}

/// Scattered over 0 to 1 by multiplication with the golden ratio and its square.
fn scattered(index: u32) -> (f64, f64) {
    let index = f64::from(index) + 0.5;
    (
        (index * 0.618_033_988_749_895).fract(),
        (index * 0.381_966_011_250_105 * 2.1).fract(),
    )
}

/// What the samples said: how many were covered and how many open.
fn check(plan: &Plan, skyline: &Skyline, view: &StripView, instant: Tt, what: &str) -> (u32, u32) {
    let watch = watch(plan, skyline);
    let now = moment(&watch, instant).unwrap();
    let outline = Outline::new(skyline, &plan.scenario.site.air);
    let layout = view.layout(&plan.season, &StripText::default());
    let style = OverlayStyle {
        width: view.width,
        height: view.height,
        text_scale: 1.0,
        sun_distance: plan.scenario.sun_distance,
        keep_clear: &[],
    };
    let scene = skyline_overlay(&plan.season, &layout, &outline, &now, &style);
    let vantage = plan.sky.observer(&plan.scenario.site, instant).unwrap();
    let icrs_from_ecliptic = plan.season.frame.ecliptic_from_icrs.transposed();
    let areas = silhouettes(&scene);
    let (mut covered, mut open) = (0, 0);
    for row in &layout.rows {
        for ring in areas.iter().flat_map(|rings| rings.iter()) {
            let on_a_row = layout.rows.iter().any(|row| {
                ring.iter()
                    .all(|point| row.frame.grown(1e-6).contains(*point))
            });
            assert!(on_a_row, "{what}: a ring leaves its row");
        }
        for index in 0..600 {
            let (across, down) = scattered(index);
            let point = Point::new(
                row.frame.left + across * row.frame.width(),
                row.frame.top + down * row.frame.height(),
            );
            let (longitude, latitude) = row.place(point);
            let ecliptic = Vec3::from_spherical(
                Angle::from_degrees(longitude),
                Angle::from_degrees(latitude),
            );
            let apparent = vantage.apparent_of_star(icrs_from_ecliptic * ecliptic);
            let seen = vantage.horizontal(apparent).unwrap();
            let lifted = apparent_from_true(seen.altitude, &plan.scenario.site.air);
            let edge = |azimuth: f64| {
                skyline
                    .altitude_at(seen.azimuth + Angle::from_degrees(azimuth))
                    .degrees()
            };
            let height = lifted.degrees() - edge(0.0);
            // Aberration (20"), pieces of half a degree, and refraction that bends between their ends: 0.05 degrees;
            // beside a wall as much in azimuth.
            let near_wall = (edge(0.05) - edge(-0.05)).abs() > 0.5;
            if height.abs() < 0.05 || near_wall {
                continue;
            }
            let drawn = areas.iter().any(|rings| {
                let here = rings[0].iter().all(|p| row.frame.grown(1e-6).contains(*p));
                here && inside(point, rings)
            });
            assert_eq!(
                drawn,
                height < 0.0,
                "{what}: longitude {longitude:.3} latitude {latitude:.3} altitude {:.3} azimuth {:.3} height {height:.3}",
                lifted.degrees(),
                seen.azimuth.degrees(),
            );
            if drawn { covered += 1 } else { open += 1 }
        }
    }
    (covered, open)
}

fn sheet(east_left: bool, window: Option<(f64, f64, f64)>) -> StripView {
    StripView {
        width: 1000.0,
        height: 460.0,
        east_left,
        window: window.map(|(longitude, latitude, degrees_across)| StripWindow {
            longitude: Angle::from_degrees(longitude),
            latitude: Angle::from_degrees(latitude),
            degrees_across,
        }),
        furniture: false,
    }
}

#[test]
fn the_silhouette_covers_what_is_below_the_skyline() {
    for name in [
        "mars-loop-2026",
        "mercury-roofs-2029",
        "saturn-thin-rings-2038",
        "venus-evening-2029",
        "mars-loop-139",
    ] {
        let plan = plan(name);
        let skyline = plan.scenario.skyline.polygon();
        let (mut covered, mut open) = (0, 0);
        for east_left in [true, false] {
            for hour in 0..8 {
                let instant = plan.season.span.middle().plus_days(f64::from(hour) / 8.0);
                let view = sheet(east_left, None);
                let what = format!("{name} {east_left} {hour}");
                let (a, b) = check(&plan, skyline, &view, instant, &what);
                covered += a;
                open += b;
            }
        }
        assert!(covered > 1000 && open > 1000, "{name}: {covered} {open}");
    }
}

#[test]
fn every_window_is_covered_alike() {
    let plan = plan("mars-loop-2026");
    let skyline = plan.scenario.skyline.polygon();
    for window in [
        (0.0, 0.0, 40.0),
        (359.9, 3.0, 5.0),
        (150.0, 0.0, 360.0),
        (10.0, -20.0, 360.0),
        (150.0, 2.0, 1.5),
        (200.0, 40.0, 90.0),
        (90.0, -60.0, 120.0),
    ] {
        for east_left in [true, false] {
            for hour in 0..6 {
                let instant = plan.season.span.middle().plus_days(f64::from(hour) / 6.0);
                let view = sheet(east_left, Some(window));
                let what = format!("{window:?} {east_left} {hour}");
                check(&plan, skyline, &view, instant, &what);
            }
        }
    }
}

#[test]
fn odd_skylines_and_places_are_covered_alike() {
    let point = |azimuth, altitude| SkylinePoint {
        azimuth,
        altitude,
        name: None,
    };
    let walls = vec![
        point(10.0, 2.0),
        point(10.0, 40.0),
        point(95.0, 40.0),
        point(95.0, -1.0),
        point(300.0, 60.0),
        point(301.0, 5.0),
    ];
    let skylines = [
        Skyline::default(),
        Skyline::new(vec![point(0.0, -4.0)]).unwrap(),
        Skyline::new(vec![point(120.0, 35.0)]).unwrap(),
        // Both poles of the ecliptic under it.
        Skyline::new(vec![point(0.0, 75.0)]).unwrap(),
        Skyline::new(walls).unwrap(),
    ];
    let mut plan = plan("mars-loop-2026");
    for latitude in [0.0, 23.4, -35.0, 66.56, 90.0, -90.0] {
        plan.scenario.site.latitude = Angle::from_degrees(latitude);
        for (index, skyline) in skylines.iter().enumerate() {
            for hour in 0..5 {
                let instant = plan.season.span.middle().plus_days(f64::from(hour) / 5.0);
                for view in [sheet(true, None), sheet(false, Some((80.0, 0.0, 360.0)))] {
                    let what = format!("{latitude} skyline {index} {hour}");
                    check(&plan, skyline, &view, instant, &what);
                }
            }
        }
    }
}

fn overlay(plan: &Plan, instant: Tt) -> (Scene, Scene) {
    let skyline = plan.scenario.skyline.polygon();
    let now = moment(&watch(plan, skyline), instant).unwrap();
    let outline = Outline::new(skyline, &plan.scenario.site.air);
    let text = strip_text(plan);
    let view = sheet(east_is_left(plan), None);
    let layout = view.layout(&plan.season, &text);
    let stars = StarCatalogue::embedded().unwrap().stars();
    let base = strip(&plan.season, stars, &text, &view);
    let boxes = note_boxes(&base);
    let style = OverlayStyle {
        width: view.width,
        height: view.height,
        text_scale: 1.2,
        sun_distance: plan.scenario.sun_distance,
        keep_clear: &boxes,
    };
    let over = skyline_overlay(&plan.season, &layout, &outline, &now, &style);
    (base, over)
}

/// Rising over the ridge in the evening of 12 February 2027 (18:30 CET).
fn over_the_ridge() -> Tt {
    Tt::from_julian_date(2_461_449.229_2 + 0.000_8)
}

#[test]
fn words_in_the_silhouette_lie_in_it_and_clear_of_the_dates() {
    let plan = plan("mars-loop-2026");
    let (base, over) = overlay(&plan, over_the_ridge());
    let areas = silhouettes(&over);
    assert!(!areas.is_empty());
    let notes = note_boxes(&base);
    let mut said = Vec::new();
    let words: Vec<(Rect, &str)> = over
        .labels()
        .filter(|(id, _)| *id == MarkId::Skyline)
        .map(|(_, label)| (label.bounds(), label.text.as_str()))
        .collect();
    for (index, (bounds, text)) in words.iter().enumerate() {
        said.push(*text);
        for corner in bounds.corners() {
            assert!(areas.iter().any(|rings| inside(corner, rings)), "{text}");
        }
        assert!(notes.iter().all(|note| !note.overlaps(bounds)), "{text}");
        for (other, others) in &words[index + 1..] {
            assert!(!bounds.overlaps(other), "{text} {others}");
        }
    }
    assert!(said.contains(&"80°"), "{said:?}");
    assert!(
        said.contains(&"the ridge") || said.contains(&"the Hohe Lehne"),
        "{said:?}"
    );
}

#[test]
fn the_moment_stands_on_the_track() {
    for name in ["mars-loop-2026", "venus-evening-2029"] {
        let plan = plan(name);
        let instant = plan.season.span.middle().plus_days(0.37);
        let (base, over) = overlay(&plan, instant);
        let subject = plan.season.subject;
        let ring = over
            .marks
            .iter()
            .find_map(|mark| match (mark.id, &mark.shape) {
                (MarkId::Moment(body), Shape::Ring { centre, .. }) if body == subject => {
                    Some(*centre)
                }
                _ => None,
            })
            .unwrap();
        let on_track = base
            .hit(ring, 1.5)
            .into_iter()
            .any(|hit| matches!(hit.id, MarkId::TrackPoint { body, .. } if body == subject));
        assert!(on_track, "{name} {ring:?}");
        assert!(over.marks.iter().any(|mark| {
            mark.id == MarkId::Moment(Body::Sun)
                || !base
                    .marks
                    .iter()
                    .any(|mark| mark.id == MarkId::BodyName(Body::Sun))
        }));
    }
}

#[test]
fn dusk_deepens_with_the_sun_and_the_night_has_none() {
    let plan = plan("venus-evening-2029");
    let skyline = plan.scenario.skyline.polygon();
    let strength = |instant: Tt| {
        let sun = moment(&watch(&plan, skyline), instant)
            .unwrap()
            .sky
            .sun_altitude
            .degrees();
        let (_, over) = overlay(&plan, instant);
        let strongest = over
            .marks
            .iter()
            .filter_map(|mark| match &mark.shape {
                Shape::Shade { stops, .. } => Some(stops.iter()),
                _ => None,
            })
            .flatten()
            .filter(|stop| stop.paint.role == Role::Dusk)
            .map(|stop| stop.paint.opacity)
            .fold(0.0, f64::max);
        (sun, strongest)
    };
    // From afternoon into the night.
    let noon = plan.season.span.middle();
    let mut found: Vec<(f64, f64)> = (0..48)
        .map(|step| strength(noon.plus_days(f64::from(step) / 48.0)))
        .collect();
    found.sort_by(|a, b| a.0.total_cmp(&b.0));
    for (sun, strength) in &found {
        assert!((0.0..=0.92).contains(strength));
        if *sun < -19.0 {
            assert_eq!(*strength, 0.0);
        }
        if *sun > 3.0 {
            assert!(*strength > 0.8, "{sun} {strength}");
        }
    }
    assert!(found[0].0 < -19.0 && found[47].0 > 3.0);
}

#[test]
fn strip_and_overlay_join_at_their_levels() {
    let plan = plan("mars-loop-2026");
    let (base, over) = overlay(&plan, over_the_ridge());
    let both = overlaid(&base, &over);
    assert_eq!(both.marks.len(), base.marks.len() + over.marks.len());
    let place = |wanted: &dyn Fn(&loopwright::chart::Mark) -> bool| {
        both.marks.iter().position(wanted).unwrap()
    };
    let silhouette = place(&|mark| mark.id == MarkId::Skyline && mark.layer == Layer::Skyline);
    let star = place(&|mark| matches!(mark.id, MarkId::Star(_)));
    let date = place(&|mark| matches!(mark.id, MarkId::Tick(_)) && mark.layer == Layer::Labels);
    let dusk = place(&|mark| mark.layer == Layer::Shade);
    let track = place(&|mark| matches!(mark.id, MarkId::Track(_)));
    // Stars drown in twilight, the path does not; both go behind the roofs, dates stay legible.
    assert!(star < dusk && dusk < track && track < silhouette && silhouette < date);
    for mark in &base.marks {
        match mark.id {
            MarkId::Star(_) | MarkId::Constellation(_) => {
                assert_eq!(Level::of_strip(mark), Level::Paper);
            }
            MarkId::Track(_) => assert_eq!(Level::of_strip(mark), Level::Paths),
            _ => {}
        }
    }
    for palette in Palette::ALL {
        assert!(png(&both, &palette, 0.5).is_ok());
    }
    assert!(both.description.contains("Mars"));
}
