//! The strip chart and its outputs over real seasons (DE440 through skyfield: see `tests/data/strip_*.csv`).

mod strip_seasons;

use std::collections::HashSet;

use loopwright::chart::{
    DateRank, Label, Layer, MarkId, Palette, Point, Rect, Role, Scene, Shape, StripDate, StripText,
    StripView, StripWindow, strip,
};
use loopwright::season::{EventKind, Season, TrackPoint};
use loopwright::sheet::{PngError, png, svg};
use loopwright::sky::stars::{Star, StarCatalogue};
use loopwright::sky::{Angle, Body, Tt, Vec3};
use proptest::prelude::*;
use strip_seasons::{SEASONS, season, text};

fn stars() -> &'static [Star] {
    StarCatalogue::embedded().unwrap().stars()
}

const WINDOW: StripWindow = StripWindow {
    longitude: Angle::from_degrees(150.0),
    latitude: Angle::from_degrees(2.0),
    degrees_across: 30.0,
};

/// Every sheet that is looked at: the printed one, the other way round, other sizes, a window without furniture.
fn views() -> Vec<StripView> {
    let a4 = StripView::A4;
    vec![
        a4.clone(),
        StripView {
            east_left: false,
            ..a4.clone()
        },
        StripView {
            width: 1684.0,
            height: 1191.0,
            ..a4.clone()
        },
        StripView {
            width: 595.0,
            height: 420.0,
            ..a4.clone()
        },
        StripView {
            width: 595.0,
            height: 842.0,
            ..a4.clone()
        },
        StripView {
            width: 1100.0,
            height: 460.0,
            furniture: false,
            window: Some(WINDOW),
            ..a4
        },
    ]
}

struct Drawing {
    name: String,
    season: Season,
    text: StripText,
    view: StripView,
    scene: Scene,
}

fn drawings() -> Vec<Drawing> {
    let mut all = Vec::new();
    for (name, title, span) in SEASONS {
        let season = season(name);
        let text = text(&season, title, span);
        for (index, view) in views().into_iter().enumerate() {
            all.push(Drawing {
                name: format!("{name} view {index}"),
                scene: strip(&season, stars(), &text, &view),
                season: season.clone(),
                text: text.clone(),
                view,
            });
        }
    }
    all
}

#[test]
fn no_two_labels_touch_and_none_is_cut() {
    for drawing in drawings() {
        let sheet = Rect::new(0.0, 0.0, drawing.scene.width, drawing.scene.height);
        let rows = drawing.view.layout(&drawing.season, &drawing.text).rows;
        let labels: Vec<&Label> = drawing.scene.labels().map(|(_, label)| label).collect();
        for (index, label) in labels.iter().enumerate() {
            let bounds = label.bounds();
            let name = &drawing.name;
            // What is whole in a palette's contrast test is whole here.
            assert!(Role::TEXT.contains(&label.paint.role) && label.paint.opacity == 1.0);
            assert!(
                sheet.holds(&bounds),
                "{name}: {:?} leaves the sheet",
                label.text
            );
            let whole = rows
                .iter()
                .all(|row| row.frame.holds(&bounds) || !row.frame.overlaps(&bounds));
            assert!(whole, "{name}: {:?} is cut by a frame", label.text);
            for other in &labels[index + 1..] {
                assert!(
                    !bounds.overlaps(&other.bounds()),
                    "{name}: {:?} touches {:?}",
                    label.text,
                    other.text
                );
            }
        }
    }
}

#[test]
fn no_label_lies_on_a_path_or_a_leader() {
    for drawing in drawings() {
        let scene = &drawing.scene;
        for (id, label) in scene.labels() {
            if matches!(id, MarkId::Sheet | MarkId::Scale) {
                continue;
            }
            let bounds = label.bounds();
            for mark in &scene.marks {
                let touched = match (&mark.shape, mark.layer) {
                    (Shape::Ribbon(points), Layer::Track | Layer::OtherPaths) => {
                        points.iter().any(|point| bounds.contains(point.at))
                    }
                    (Shape::Line { points, .. }, Layer::Leaders) => points
                        .windows(2)
                        .any(|pair| bounds.clip(pair[0], pair[1]).is_some()),
                    _ => false,
                };
                assert!(
                    !touched,
                    "{}: {:?}, {:?}",
                    drawing.name, label.text, mark.id
                );
            }
        }
    }
}

#[test]
fn every_event_and_every_month_is_told_on_the_printed_sheet() {
    for drawing in drawings() {
        if drawing.view != StripView::A4 {
            continue;
        }
        let told: HashSet<MarkId> = drawing.scene.labels().map(|(id, _)| id).collect();
        for index in 0..drawing.season.events.len() {
            assert!(
                told.contains(&MarkId::Event(index)),
                "{}: event {index}",
                drawing.name
            );
        }
        for (
            index,
            StripDate {
                instant,
                label,
                rank,
            },
        ) in drawing.text.dates.iter().enumerate()
        {
            // A month's first day that is an event's date is told with the event.
            let with_event = drawing.text.event_dates.contains(label);
            let on_path = *instant <= drawing.season.track.points.last().unwrap().instant;
            // Between two strands a finger apart there is no room for a date that would be read right.
            let hemmed = on_path && other_strand(&drawing, *instant) < 16.0;
            if *rank == DateRank::Month && on_path && !with_event && !hemmed {
                assert!(
                    told.contains(&MarkId::Tick(index)),
                    "{}: {label}",
                    drawing.name
                );
            }
        }
    }
}

/// Points from the path at an instant to the nearest part of it that is 20 days or more away in time.
fn other_strand(drawing: &Drawing, instant: Tt) -> f64 {
    let season = &drawing.season;
    let points = &season.track.points;
    let place = |point: &TrackPoint| season.frame.ecliptic_from_icrs * point.direction;
    let here = points
        .iter()
        .min_by(|a, b| {
            let off = |point: &TrackPoint| (point.instant.days() - instant.days()).abs();
            off(a).total_cmp(&off(b))
        })
        .unwrap();
    let layout = drawing.view.layout(season, &drawing.text);
    let row = layout
        .rows
        .iter()
        .find(|row| row.owns(place(here).longitude().degrees()))
        .unwrap();
    points
        .iter()
        .filter(|point| (point.instant.days() - instant.days()).abs() >= 20.0)
        .map(|point| {
            row.point_of(place(point))
                .distance(row.point_of(place(here)))
        })
        .fold(f64::INFINITY, f64::min)
}

#[test]
fn every_place_of_the_path_is_on_a_row_and_belongs_to_one() {
    for (name, title, span) in SEASONS {
        let season = season(name);
        let layout = StripView::A4.layout(&season, &text(&season, title, span));
        for point in &season.track.points {
            let place = season.frame.ecliptic_from_icrs * point.direction;
            let longitude = place.longitude().degrees();
            let owners: Vec<_> = layout
                .rows
                .iter()
                .filter(|row| row.owns(longitude))
                .collect();
            assert_eq!(owners.len(), 1, "{name} {longitude}");
            let at = owners[0].point_of(place);
            assert!(owners[0].frame.contains(at), "{name} {longitude}");
            let (longitude_back, latitude_back) = owners[0].place(at);
            let turned = Angle::from_degrees(longitude_back - longitude).signed();
            assert!(turned.degrees().abs() < 1e-9);
            assert!((latitude_back - place.latitude().degrees()).abs() < 1e-9);
        }
        // Nothing is gained by cutting a loop in two: a retrograde stretch lies on one row.
        let mut back: Vec<f64> = Vec::new();
        for point in &season.track.points {
            if point.longitude_rate_per_day < Angle::ZERO {
                let place = season.frame.ecliptic_from_icrs * point.direction;
                back.push(place.longitude().degrees());
            }
        }
        let rows = layout
            .rows
            .iter()
            .filter(|row| back.iter().any(|longitude| row.owns(*longitude)))
            .count();
        assert_eq!(rows, 1, "{name}");
    }
}

#[test]
fn a_long_path_takes_rows_and_a_loop_of_an_outer_planet_takes_one() {
    let rows = |name: &str| {
        let season = season(name);
        StripView::A4
            .layout(&season, &StripText::default())
            .rows
            .len()
    };
    assert_eq!(rows("mars_2026"), 1);
    assert_eq!(rows("saturn_2025"), 1);
    assert!(rows("venus_2026") > 1);
}

/// Regulus at the epoch of the season's frame: Hipparcos place and proper motion (I/311), axes of `ecm06` in pyerfa
/// 2.0.1.5.
#[test]
fn regulus_stands_where_the_catalogue_puts_it() {
    const LONGITUDE: f64 = 150.206_29;
    const LATITUDE: f64 = 0.465_72;
    let season = season("mars_2026");
    let text = StripText::default();
    let row = StripView::A4.layout(&season, &text).rows[0];
    let scene = strip(&season, stars(), &text, &StripView::A4);
    let centre = scene
        .marks
        .iter()
        .find_map(|mark| match mark.shape {
            Shape::Disc { centre, .. } if mark.id == MarkId::Star(49669) => Some(centre),
            _ => None,
        })
        .unwrap();
    let (longitude, latitude) = row.place(centre);
    assert!((longitude - LONGITUDE).abs() < 0.000_05, "{longitude}");
    assert!((latitude - LATITUDE).abs() < 0.000_05, "{latitude}");
}

/// The opposition in the fixture is that of DE440's apparent places of date; on the strip (astrometric, another
/// equinox) it lies opposite the Sun within the aberration of both.
#[test]
fn the_mark_of_the_opposition_lies_opposite_the_sun() {
    let season = season("mars_2026");
    let text = text(&season, "Mars", "");
    let scene = strip(&season, stars(), &text, &StripView::A4);
    let row = StripView::A4.layout(&season, &text).rows[0];
    let index = season
        .events
        .iter()
        .position(|event| event.kind == EventKind::Opposition)
        .unwrap();
    let area = scene
        .marks
        .iter()
        .find(|mark| mark.layer == Layer::Marks && group_of(&season, index).contains(&mark.id))
        .unwrap();
    let Shape::Area { rings, .. } = &area.shape else {
        panic!("opposition is an outline")
    };
    let count = rings[0].len() as f64;
    let middle = rings[0].iter().fold(Point::default(), |sum, corner| {
        sum.moved(corner.x / count, corner.y / count)
    });
    let day = season.events[index].instant.days() - season.sun.points[0].instant.days();
    let sun = |index: usize| {
        (season.frame.ecliptic_from_icrs * season.sun.points[index].direction).longitude()
    };
    let before = day.floor() as usize;
    let sun_longitude =
        sun(before) + (sun(before + 1) - sun(before)).signed() * (day - day.floor());
    let apart = Angle::from_degrees(row.place(middle).0) - sun_longitude - Angle::HALF_TURN;
    assert!(apart.signed().degrees().abs() < 0.02, "{apart:?}");
}

fn group_of(season: &Season, index: usize) -> Vec<MarkId> {
    let at = season.events[index].instant.days();
    (0..season.events.len())
        .filter(|other| (season.events[*other].instant.days() - at).abs() < 1.0)
        .map(MarkId::Event)
        .collect()
}

#[test]
fn a_point_on_the_track_tells_its_date_and_a_label_its_event() {
    let season = season("mars_2026");
    let text = text(&season, "Mars", "");
    let scene = strip(&season, stars(), &text, &StripView::A4);
    let row = StripView::A4.layout(&season, &text).rows[0];
    for index in (5..200).step_by(15) {
        let place = season.frame.ecliptic_from_icrs * season.track.points[index].direction;
        let found = scene.hit(row.point_of(place), 0.5);
        let expected = MarkId::TrackPoint {
            body: Body::Mars,
            index,
        };
        assert!(
            found.iter().any(|hit| hit.id == expected),
            "{index}: {found:?}"
        );
    }
    let (id, label) = scene
        .labels()
        .find(|(_, label)| label.text.contains("turns back"))
        .unwrap();
    assert_eq!(scene.hit(label.bounds().centre(), 0.0)[0].id, id);
    assert!(matches!(id, MarkId::Event(index)
        if season.events[index].kind == EventKind::StationRetrograde));
}

#[test]
fn turning_the_strip_turns_it_by_half_a_turn() {
    let season = season("saturn_2025");
    let text = StripText::default();
    let left = StripView::A4.layout(&season, &text).rows[0];
    let right_view = StripView {
        east_left: false,
        ..StripView::A4
    };
    let right = right_view.layout(&season, &text).rows[0];
    // Longitude grows to the left across 0 degrees.
    assert!(left.point(1.0, 0.0).x < left.point(359.0, 0.0).x);
    assert!(right.point(1.0, 0.0).x > right.point(359.0, 0.0).x);
    // No mirror image: with east to the right south is up, and the way back leads to the same place.
    assert!(left.point(0.0, 1.0).y < left.point(0.0, -1.0).y);
    assert!(right.point(0.0, 1.0).y > right.point(0.0, -1.0).y);
    let (longitude, latitude) = right.place(right.point(3.0, 1.5));
    assert!((longitude - 3.0).abs() < 1e-9 && (latitude - 1.5).abs() < 1e-9);
    // One degree is as long along as across.
    let along = left.point(0.0, 0.0).distance(left.point(1.0, 0.0));
    let across = left.point(0.0, 0.0).distance(left.point(0.0, 1.0));
    assert!((along - across).abs() < 1e-9);
}

/// The scene of Mars's first station, kept to the byte: written with `LOOPWRIGHT_WRITE_SNAPSHOTS=1 cargo test`, looked
/// at, and kept. It holds what was drawn, not what is true; the tests above do that.
#[test]
fn the_dump_of_a_scene_stays_the_same() {
    let season = season("mars_2026");
    let text = text(
        &season,
        "Mars turns in the Lion",
        "November 2026 to May 2027",
    );
    let view = StripView {
        width: 500.0,
        height: 300.0,
        furniture: false,
        window: Some(StripWindow {
            longitude: Angle::from_degrees(157.0),
            latitude: Angle::from_degrees(3.5),
            degrees_across: 10.0,
        }),
        ..StripView::A4
    };
    let dump = strip(&season, stars(), &text, &view).to_string();
    let path = concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/tests/data/strip_mars_station.txt"
    );
    if std::env::var_os("LOOPWRIGHT_WRITE_SNAPSHOTS").is_some() {
        std::fs::write(path, &dump).unwrap();
    }
    let kept = std::fs::read_to_string(path).unwrap();
    for (number, (now, then)) in dump.lines().zip(kept.lines()).enumerate() {
        assert_eq!(now, then, "line {}", number + 1);
    }
    assert_eq!(dump.len(), kept.len());
}

#[test]
fn svg_is_well_formed_and_carries_outlines_and_words() {
    for (name, title, span) in SEASONS {
        let season = season(name);
        let text = text(&season, title, span);
        let scene = strip(&season, stars(), &text, &StripView::A4);
        let file = svg(&scene, &Palette::LIGHT);
        assert_eq!(
            file,
            svg(
                &strip(&season, stars(), &text, &StripView::A4),
                &Palette::LIGHT
            )
        );
        let document = roxmltree::Document::parse(&file).unwrap();
        let texts = |tag: &str| -> Vec<String> {
            document
                .descendants()
                .filter(|node| {
                    node.has_tag_name(("http://www.w3.org/2000/svg", tag))
                        && node.attribute("aria-hidden").is_none()
                })
                .map(|node| node.text().unwrap_or_default().to_owned())
                .collect()
        };
        assert_eq!(texts("title"), [title]);
        assert!(texts("desc")[0].contains(season.subject.name()));
        let written: Vec<String> = scene
            .labels()
            .map(|(_, label)| label.text.clone())
            .collect();
        let spoken: Vec<&str> = document
            .descendants()
            .filter(|node| node.has_tag_name(("http://www.w3.org/2000/svg", "g")))
            .filter_map(|node| node.attribute("aria-label"))
            .collect();
        assert_eq!(spoken, written, "{name}");
        // Every letter that is used is drawn, and no reader's own font is asked for.
        let known: std::collections::BTreeSet<String> = document
            .descendants()
            .filter(|node| node.has_tag_name(("http://www.w3.org/2000/svg", "path")))
            .filter_map(|node| node.attribute("id").map(|id| format!("#{id}")))
            .collect();
        let used: Vec<&str> = document
            .descendants()
            .filter_map(|node| node.attribute(("http://www.w3.org/1999/xlink", "href")))
            .collect();
        assert!(used.len() > 200, "{name}: {} letters", used.len());
        assert!(used.iter().all(|letter| known.contains(*letter)), "{name}");
        assert!(texts("text").is_empty() && !file.contains("font-family"));
        let drawn = file.split("</defs>").nth(1).unwrap();
        assert!(!drawn.contains("NaN") && !drawn.contains("\"inf\"") && !drawn.contains("inf "));
    }
}

#[test]
fn png_has_the_size_asked_for_and_a_picture_in_it() {
    let season = season("mars_2026");
    let text = text(&season, "Mars", "");
    let scene = strip(&season, stars(), &text, &StripView::A4);
    for palette in Palette::ALL {
        let file = png(&scene, &palette, 1.5).unwrap();
        assert_eq!(
            file,
            png(&scene, &palette, 1.5).unwrap(),
            "same bytes again"
        );
        // PNG specification (ISO/IEC 15948), 5.2 and 11.2.2: signature, then width and height in IHDR.
        assert_eq!(
            file[..8],
            [0x89, b'P', b'N', b'G', b'\r', b'\n', 0x1a, b'\n']
        );
        let number = |at: usize| u32::from_be_bytes(file[at..at + 4].try_into().unwrap());
        assert_eq!((number(16), number(20)), (1263, 893));
        let picture = tiny_skia::Pixmap::decode_png(&file).unwrap();
        let colours: HashSet<[u8; 4]> = picture
            .pixels()
            .iter()
            .map(|pixel| [pixel.red(), pixel.green(), pixel.blue(), pixel.alpha()])
            .collect();
        assert!(colours.len() > 200, "{} {}", palette.name, colours.len());
    }
}

#[test]
fn a_picture_too_large_or_empty_is_refused_with_what_would_work() {
    let scene = Scene {
        width: 100.0,
        height: 100.0,
        ..Scene::default()
    };
    for scale in [0.0, -1.0, 1e9, f64::NAN, f64::INFINITY] {
        let error = png(&scene, &Palette::LIGHT, scale).unwrap_err();
        assert!(matches!(error, PngError::Size { .. }), "{scale}");
        assert!(error.to_string().contains("choose another scale"));
    }
}

#[test]
fn a_season_without_a_path_still_gives_a_chart() {
    let mut season = season("mars_2026");
    let text = text(&season, "Nothing", "");
    season.track.points.truncate(1);
    let one = strip(&season, stars(), &text, &StripView::A4);
    assert!(one.to_string().contains("label"));
    season.track.points.clear();
    season.companions.clear();
    season.sun.points.clear();
    season.events.clear();
    let none = strip(&season, &[], &text, &StripView::A4);
    assert!(none.to_string().contains("label"));
}

#[test]
fn samples_that_are_not_numbers_are_left_out() {
    let mut season = season("mars_2026");
    let text = text(&season, "Mars", "");
    for index in [0, 40, 41, 211] {
        season.track.points[index].direction = Vec3::new(f64::NAN, 0.0, 0.0);
        season.track.points[index + 1].magnitude = Some(f64::NAN);
        if index == 211 {
            break;
        }
    }
    let dump = strip(&season, stars(), &text, &StripView::A4).to_string();
    assert!(!dump.contains("NaN"));
    assert!(dump.contains("turns back"));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(40))]

    #[test]
    fn any_view_gives_finite_numbers(
        width in prop_oneof![Just(f64::NAN), Just(-5.0), 100.0..2000.0_f64],
        height in prop_oneof![Just(f64::INFINITY), Just(0.0), 100.0..1500.0_f64],
        longitude in prop_oneof![Just(f64::NAN), -400.0..800.0_f64],
        latitude in -120.0..120.0_f64,
        across in prop_oneof![Just(f64::NAN), Just(0.0), Just(1e9), 0.5..400.0_f64],
        with_window: bool,
        furniture: bool,
        east_left: bool,
        which in 0..SEASONS.len(),
    ) {
        let (name, title, span) = SEASONS[which];
        let season = season(name);
        let text = text(&season, title, span);
        // As many stars as a test has time for.
        let some = StarCatalogue::embedded().unwrap().to_magnitude(4.0);
        let view = StripView {
            width,
            height,
            east_left,
            furniture,
            window: with_window.then_some(StripWindow {
                longitude: Angle::from_degrees(longitude),
                latitude: Angle::from_degrees(latitude),
                degrees_across: across,
            }),
        };
        let dump = strip(&season, some, &text, &view).to_string();
        prop_assert!(!dump.contains("NaN") && !dump.contains("inf,") && !dump.contains(",inf"));
    }
}
