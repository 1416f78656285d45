//! The nights' darkness against a table made from JPL DE440 with skyfield 1.55 (`riseset.csv`) and against the engine's
//! full chain; the timeline's geometry against the values it draws.

mod common;

use common::table;
use loopwright::chart::{
    HourLine, Layer, MarkId, Palette, Point, Rect, Scene, Shape, TimelineLayout, TimelineText,
    TimelineView, timeline, timeline_cursor,
};
use loopwright::scenario::{Plan, Scenario};
use loopwright::season::darkness::{Darkness, Place, darkness};
use loopwright::season::moment::night_at;
use loopwright::season::{Conditions, Span};
use loopwright::sheet::{png, svg, timeline_text};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::{Air, apparent_from_true};
use loopwright::sky::{Angle, Body, Site, Skyline, Tt};
use std::path::Path;

const SCENARIOS: [&str; 5] = [
    "mars-loop-2026",
    "mercury-roofs-2029",
    "saturn-thin-rings-2038",
    "venus-evening-2029",
    "mars-loop-139",
];

fn plan(name: &str) -> Plan {
    let path = format!("{}/scenarios/{name}.ron", env!("CARGO_MANIFEST_DIR"));
    let scenario = Scenario::load(Path::new(&path)).unwrap();
    Plan::new(scenario, Tt::from_days(9_800.0)).unwrap()
}

fn nights(plan: &Plan) -> Darkness {
    let place = Place {
        site: &plan.scenario.site,
        skyline: plan.scenario.skyline.polygon(),
        conditions: &plan.scenario.conditions,
    };
    darkness(&plan.sky, place, plan.season.subject, plan.season.span).unwrap()
}

/// Sunset, sunrise and twilights to the 20 s promised, Moonrise and Moonset to the 5 s that its 5" and the rounding of the
/// table allow where it crosses the horizon at a fair angle (below 60 degrees of latitude).
#[test]
fn darkness_agrees_with_de440() {
    const SUN_SECONDS: f64 = 20.0;
    const MOON_SECONDS: f64 = 5.0;
    let sky = Sky::de440().unwrap();
    let (mut suns, mut moons) = (0, 0);
    for row in &table("riseset.csv") {
        let latitude = row.number("lat_deg");
        let site = Site {
            name: String::new(),
            latitude: Angle::from_degrees(latitude),
            longitude: Angle::from_degrees(row.number("lon_deg")),
            elevation_m: row.number("elev_m"),
            height_above_surroundings_m: 0.0,
            air: Air::default(),
            extinction_mag: 0.25,
        };
        let tables = sky.tables();
        let instant = |column: &str| {
            let text = row.text(column);
            (!text.is_empty()).then(|| tables.tt_from_utc(parse_utc(text).unwrap()))
        };
        let from = instant("window_start_utc").unwrap();
        let place = Place {
            site: &site,
            skyline: &Skyline::default(),
            conditions: &Conditions::default(),
        };
        let span = Span {
            from: from.plus_days(-0.5),
            to: from.plus_days(0.4),
        };
        let found = darkness(&sky, place, Body::Mars, span).unwrap();
        assert_eq!(found.nights.len(), 1);
        let night = &found.nights[0];
        assert_eq!(night.span, night_at(&sky, &site, from.plus_days(0.5)));
        for (limit, dusk, dawn) in [
            (-50.0 / 60.0, "sunset", "sunrise"),
            (-6.0, "civil_dusk", "civil_dawn"),
            (-12.0, "nautical_dusk", "nautical_dawn"),
            (-18.0, "astro_dusk", "astro_dawn"),
        ] {
            let below = night.sun_below(Angle::from_degrees(limit));
            let (Some(dusk), Some(dawn)) = (instant(dusk), instant(dawn)) else {
                continue;
            };
            let below = below.unwrap();
            for (a, b) in [(below.from, dusk), (below.to, dawn)] {
                let off = (a.days() - b.days()).abs() * 86_400.0;
                assert!(off <= SUN_SECONDS, "{latitude} {limit} off by {off:.1} s");
                suns += 1;
            }
        }
        if latitude.abs() > 60.0 {
            continue;
        }
        for (column, rises) in [("moon_rise", true), ("moon_set", false)] {
            let Some(expected) = instant(column) else {
                continue;
            };
            let ends = night
                .moon_up
                .iter()
                .map(|up| if rises { up.from } else { up.to });
            let off = ends
                .map(|end| (end.days() - expected.days()).abs() * 86_400.0)
                .fold(f64::INFINITY, f64::min);
            assert!(off <= MOON_SECONDS, "{latitude} {column} off by {off:.1} s");
            moons += 1;
        }
    }
    assert!(suns > 100 && moons > 20, "{suns} {moons}");
}

/// The plain test of altitude, skyline and Sun, put into words anew with the full chain of places.
fn is_in_view(plan: &Plan, instant: Tt) -> (bool, f64) {
    let (site, conditions) = (&plan.scenario.site, &plan.scenario.conditions);
    let vantage = plan.sky.observer(site, instant).unwrap();
    let seen = |body| {
        vantage
            .horizontal(vantage.place(body).unwrap().apparent)
            .unwrap()
    };
    let subject = seen(plan.season.subject);
    let apparent = apparent_from_true(subject.altitude, &site.air).degrees();
    let skyline = plan
        .scenario
        .skyline
        .polygon()
        .altitude_at(subject.azimuth)
        .degrees();
    let margin = [
        apparent - skyline - conditions.clearance.degrees(),
        apparent - conditions.least_altitude.degrees(),
        conditions.sun_below.degrees() - seen(Body::Sun).altitude.degrees(),
    ]
    .into_iter()
    .fold(f64::INFINITY, f64::min);
    (margin >= 0.0, margin)
}

#[test]
fn the_subject_is_in_view_when_the_full_chain_says_so() {
    for name in SCENARIOS {
        let plan = plan(name);
        let found = nights(&plan);
        let (mut yes, mut no) = (0, 0);
        for (index, night) in found.nights.iter().enumerate().step_by(4) {
            for sample in 0..97 {
                // Uneven steps, so that samples of the search are not met again.
                let share = (f64::from(sample) + 0.37) / 97.3;
                let instant = night.span.from.plus_days(share);
                let (expected, margin) = is_in_view(&plan, instant);
                // 3 s of the sky's turning and the interpolation; what lasts less than two minutes may be missed.
                let lasts = [-121.0, 121.0]
                    .into_iter()
                    .all(|seconds| is_in_view(&plan, instant.plus_seconds(seconds)).0 == expected);
                if margin.abs() < 0.03 || !lasts {
                    continue;
                }
                let said = night.in_view.iter().any(|view| view.contains(instant));
                assert_eq!(
                    said, expected,
                    "{name} night {index} {share:.3} {margin:.3}"
                );
                yes += usize::from(expected);
                no += usize::from(!expected);
            }
        }
        assert!(yes > 10 && no > 100, "{name}: {yes} {no}");
    }
}

#[test]
fn nights_follow_each_other_and_cover_the_evenings() {
    for name in SCENARIOS {
        let plan = plan(name);
        let found = nights(&plan);
        let days = plan.season.span.days();
        assert!((found.nights.len() as f64 - days).abs() < 1.1, "{name}");
        for pair in found.nights.windows(2) {
            assert_eq!(pair[0].span.to, pair[1].span.from);
        }
        for (index, night) in found.nights.iter().enumerate() {
            assert_eq!(found.night_of(night.span.middle()), Some(index));
            for view in &night.in_view {
                assert!(night.span.from <= view.from && view.to <= night.span.to);
                assert!(view.from < view.to);
            }
        }
        assert_eq!(found.night_of(plan.season.span.from.plus_days(-2.0)), None);
    }
}

#[test]
fn stretches_from_elsewhere_take_the_place_of_the_plain_ones() {
    let plan = plan("mars-loop-2026");
    let mut found = nights(&plan);
    let night = found.nights[10].span;
    let stretch = |from: f64, to: f64| Span {
        from: night.from.plus_days(from),
        to: night.from.plus_days(to),
    };
    let (here, next, before) = (stretch(0.3, 0.4), stretch(1.3, 1.35), stretch(-40.0, -39.9));
    found.set_in_view([here, next, before]);
    assert_eq!(found.nights[10].in_view, [here]);
    assert_eq!(found.nights[11].in_view, [next]);
    let total: usize = found.nights.iter().map(|night| night.in_view.len()).sum();
    assert_eq!(total, 2);
}

fn threads(scene: &Scene) -> Vec<(usize, Point, Point)> {
    scene
        .marks
        .iter()
        .filter_map(|mark| match (mark.id, &mark.shape) {
            (MarkId::Night(night), Shape::Line { points, .. }) => {
                Some((night, points[0], points[1]))
            }
            _ => None,
        })
        .collect()
}

/// Everything is drawn where the layout says, at every size asked for.
#[test]
fn threads_stand_at_their_hours_and_places_lead_back_to_instants() {
    for name in SCENARIOS {
        let plan = plan(name);
        let found = nights(&plan);
        let text = timeline_text(&plan, &found);
        for (width, height) in [(600.0, 90.0), (1100.0, 170.0), (2500.0, 260.0)] {
            let view = TimelineView::new(width, height);
            let line = timeline(&plan.season, &found, &text, &view);
            let plot = line.layout.plot;
            assert!(plot.left >= 0.0 && plot.right <= width && plot.bottom <= height);
            assert!(plot.height() > 40.0, "{plot:?}");
            let drawn = threads(&line.scene);
            let whole: usize = found.nights.iter().map(|night| night.in_view.len()).sum();
            if line.layout.night_width() < 2.0 {
                assert!(drawn.is_empty(), "too fine for threads");
            } else {
                assert!(
                    drawn.len() <= whole && drawn.len() * 10 >= whole * 9,
                    "{name}"
                );
            }
            for (night, top, bottom) in drawn {
                assert_eq!(line.layout.night_at(top.x), Some(night));
                let at = |point| line.layout.instant_at(point).unwrap();
                let hit = found.nights[night].in_view.iter().any(|view| {
                    // A point is some minutes.
                    (at(top).days() - view.from.days()).abs() < 1e-3
                        && (at(bottom).days() - view.to.days()).abs() < 1e-3
                });
                assert!(hit, "{name} {night}");
            }
            for (index, night) in found.nights.iter().enumerate().step_by(5) {
                let instant = night.span.from.plus_days(0.5);
                let point = line.layout.point_of(instant);
                assert!(plot.grown(1e-6).contains(point), "midnight is always shown");
                assert_eq!(line.layout.night_at(point.x), Some(index));
                let back = line.layout.instant_at(point).unwrap();
                assert!((back.days() - instant.days()).abs() < 1e-6);
                let later = line
                    .layout
                    .same_hour_at(line.layout.x(3.5), instant)
                    .unwrap();
                let whole = later.days() - instant.days();
                assert!((whole - whole.round()).abs() < 1e-6);
                assert_eq!(line.layout.night_at(line.layout.x(3.5)), Some(3));
            }
            assert_eq!(line.layout.night_at(-50.0), Some(0));
            assert_eq!(line.layout.night_at(1e9), Some(found.nights.len() - 1));
        }
    }
}

#[test]
fn words_lie_on_the_sheet_and_clear_of_each_other() {
    for name in SCENARIOS {
        let plan = plan(name);
        let found = nights(&plan);
        let text = timeline_text(&plan, &found);
        for (width, height, text_scale) in [
            (600.0, 90.0, 1.0),
            (1100.0, 170.0, 1.3),
            (2500.0, 260.0, 1.6),
            (800.0, 130.0, 1.5),
        ] {
            let view = TimelineView {
                text_scale,
                ..TimelineView::new(width, height)
            };
            let line = timeline(&plan.season, &found, &text, &view);
            let sheet = Rect::new(0.0, 0.0, width, height);
            let boxes: Vec<(Rect, &str)> = line
                .scene
                .labels()
                .map(|(_, label)| (label.bounds(), label.text.as_str()))
                .collect();
            assert!(boxes.len() >= 5, "{name}");
            for (index, (bounds, words)) in boxes.iter().enumerate() {
                assert!(sheet.grown(0.5).holds(bounds), "{name} {words} {bounds:?}");
                for (other, others) in &boxes[index + 1..] {
                    assert!(
                        !bounds.overlaps(&other.grown(-0.8)),
                        "{name}: {words} / {others}"
                    );
                }
            }
            for mark in &line.scene.marks {
                let outside = match &mark.shape {
                    Shape::Area { rings, .. } => rings.concat(),
                    Shape::Line { points, .. } => points.clone(),
                    Shape::Shade { polygon, .. } => polygon.clone(),
                    _ => Vec::new(),
                };
                for point in outside {
                    assert!(
                        point.is_finite() && sheet.grown(8.0).contains(point),
                        "{mark:?}"
                    );
                }
            }
        }
    }
}

#[test]
fn a_window_shows_its_nights_only() {
    let plan = plan("saturn-thin-rings-2038");
    let found = nights(&plan);
    let text = timeline_text(&plan, &found);
    let mut view = TimelineView::new(900.0, 160.0);
    view.window = Some((100.0, 160.0));
    let line = timeline(&plan.season, &found, &text, &view);
    assert_eq!(line.layout.window(), (100.0, 160.0));
    for (night, top, _) in threads(&line.scene) {
        assert!((100..160).contains(&night), "{night}");
        assert_eq!(line.layout.night_at(top.x), Some(night));
    }
    assert!((line.layout.night_width() - line.layout.plot.width() / 60.0).abs() < 1e-9);
    // Windows that are none, too small or beyond the ends are put right.
    for window in [(-50.0, 5e9), (300.0, 299.0), (f64::NAN, 3.0), (5e9, 6e9)] {
        view.window = Some(window);
        let layout = TimelineLayout::new(&found, &text, &view);
        let (from, to) = layout.window();
        assert!(0.0 <= from && from + 2.9 <= to && to <= found.nights.len() as f64);
    }
}

#[test]
fn the_moment_is_a_picture_of_its_own_at_its_night_and_hour() {
    let plan = plan("mars-loop-2026");
    let found = nights(&plan);
    let text = timeline_text(&plan, &found);
    let view = TimelineView::new(1000.0, 160.0);
    let line = timeline(&plan.season, &found, &text, &view);
    let instant = found.nights[50].span.from.plus_days(0.4);
    let cursor = timeline_cursor(&line.layout, &view, instant);
    assert!(cursor.marks.iter().all(|mark| mark.id == MarkId::Cursor));
    let at = line.layout.point_of(instant);
    let disc = cursor
        .marks
        .iter()
        .any(|mark| matches!(mark.shape, Shape::Disc { centre, .. } if centre.distance(at) < 1e-9));
    assert!(disc);
    // By day its hour is not shown: a chevron instead of the disc; outside the season there is nothing.
    let by_day = timeline_cursor(&line.layout, &view, found.nights[50].span.from);
    assert!(!by_day.marks.is_empty());
    assert!(
        !by_day
            .marks
            .iter()
            .any(|mark| matches!(mark.shape, Shape::Disc { .. }))
    );
    let outside = timeline_cursor(&line.layout, &view, plan.season.span.from.plus_days(-30.0));
    assert!(outside.marks.is_empty());
}

/// Berlin's clocks go forward on 28 March 2027 (EU directive 2000/84/EC): 21 h comes an hour earlier to the Sun.
#[test]
fn hours_of_the_clock_step_where_clocks_change() {
    let plan = plan("mars-loop-2026");
    let found = nights(&plan);
    let mut text = timeline_text(&plan, &found);
    text.hours = vec![HourLine {
        hour: 21.0,
        label: "21 h".into(),
        is_midnight: false,
    }];
    let view = TimelineView::new(1000.0, 160.0);
    let line = timeline(&plan.season, &found, &text, &view);
    let hour: Vec<&Vec<Point>> = line
        .scene
        .marks
        .iter()
        .filter(|mark| mark.layer == Layer::Scale)
        .filter_map(|mark| match &mark.shape {
            Shape::Line { points, .. } => Some(points),
            _ => None,
        })
        .collect();
    assert_eq!(hour.len(), 1);
    let [a, b, c, d] = hour[0][..] else {
        panic!("{:?}", hour[0])
    };
    let an_hour = line.layout.y(9.0) - line.layout.y(8.0);
    assert!(a.y == b.y && c.y == d.y && ((b.y - c.y) - an_hour).abs() < 1e-6);
    let change = plan
        .sky
        .tables()
        .tt_from_utc(parse_utc("2027-03-28T01:00:00Z").unwrap());
    let night = found.night_of(change).unwrap() as f64;
    // The hours of a night are those at its middle, before the change.
    assert!((line.layout.nights_at(b.x) - night - 1.0).abs() < 1e-6);
    // 20:00 UTC is 21 h by winter time.
    let winter = plan
        .sky
        .tables()
        .tt_from_utc(parse_utc("2027-01-10T20:00:00Z").unwrap());
    assert!((line.layout.point_of(winter).y - a.y).abs() < 0.01);
}

#[test]
fn odd_seasons_make_a_picture_too() {
    let plan = plan("mars-loop-2026");
    let empty = Darkness {
        subject: Body::Mars,
        nights: Vec::new(),
    };
    let view = TimelineView::new(600.0, 90.0);
    let line = timeline(&plan.season, &empty, &TimelineText::default(), &view);
    assert_eq!(line.layout.night_at(100.0), None);
    assert_eq!(line.layout.instant_at(Point::new(1.0, 1.0)), None);
    // Very small, and with text of any size.
    let found = nights(&plan);
    for (width, height, text_scale) in
        [(1.0, 1.0, 1.0), (40.0, 400.0, f64::NAN), (600.0, 90.0, 1e9)]
    {
        let view = TimelineView {
            text_scale,
            ..TimelineView::new(width, height)
        };
        let line = timeline(&plan.season, &found, &timeline_text(&plan, &found), &view);
        assert!(line.layout.plot.width() > 0.0 && line.layout.plot.height() > 0.0);
        let _ = svg(&line.scene, &Palette::DARK);
    }
    // Both outputs take every shape of it.
    let view = TimelineView::new(600.0, 90.0);
    let line = timeline(&plan.season, &found, &timeline_text(&plan, &found), &view);
    assert!(png(&line.scene, &Palette::RED, 1.0).is_ok());
    assert!(svg(&line.scene, &Palette::LIGHT).contains("opposition"));
}
