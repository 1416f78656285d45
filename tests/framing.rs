//! Framing against independent projections, brute force, and what must hold for any sky.

use std::f64::consts::PI;

use loopwright::season::framing::{
    FrameError, PhotoFrame, Pixel, closest_dots, lean_from_zenith, longest_lens, longest_run,
    mosaic, smallest_rectangle,
};
use loopwright::season::lens::{Lens, Sensor};
use loopwright::season::tangent::TangentPlane;
use loopwright::sky::{Angle, Mat3, Vec3};
use proptest::prelude::*;

fn degrees(value: f64) -> Angle {
    Angle::from_degrees(value)
}

fn place(longitude: f64, latitude: f64) -> Vec3 {
    Vec3::from_spherical(degrees(longitude), degrees(latitude))
}

fn full_frame() -> Sensor {
    Sensor::new(36.0, 24.0, 6000, 4000).unwrap()
}

fn lens(focal_length_mm: f64) -> Lens {
    Lens::new("test", focal_length_mm, 4.0).unwrap()
}

#[track_caller]
fn close(got: f64, expected: f64, tolerance: f64) {
    assert!(
        (got - expected).abs() <= tolerance,
        "{got} against {expected}"
    );
}

/// The path of Mars from 2026 November 1 to 2027 June 1, a point a day: JPL DE440 through skyfield 1.55 (`strip_mars_2026.csv`).
fn mars_2026() -> Vec<Vec3> {
    let path = format!(
        "{}/tests/data/strip_mars_2026.csv",
        env!("CARGO_MANIFEST_DIR")
    );
    let text = std::fs::read_to_string(path).unwrap();
    let points: Vec<Vec3> = text
        .lines()
        .filter(|line| line.starts_with("track,mars,"))
        .map(|line| {
            let number: Vec<f64> = line
                .split(',')
                .skip(3)
                .take(3)
                .map(|cell| cell.parse().unwrap())
                .collect();
            Vec3::new(number[0], number[1], number[2])
        })
        .collect();
    assert_eq!(points.len(), 213);
    points
}

/// Standard coordinates by `tpxes` of pyerfa 2.0.1.5 (IAU SOFA's algorithm), also near a pole and across 0h.
#[test]
fn tangent_plane_agrees_with_erfa() {
    for (a, d, a0, d0, xi, eta) in [
        (
            100.0,
            20.0,
            95.0,
            22.0,
            0.082_222_298_783_564_68,
            -0.033_692_201_911_180_75,
        ),
        (
            10.0,
            89.2,
            200.0,
            89.9,
            0.002_424_805_416_680_334_7,
            0.015_497_106_845_065_493,
        ),
        (
            359.9,
            1.0,
            0.2,
            -1.0,
            -0.005_238_429_263_557_498,
            0.034_921_008_983_555_49,
        ),
        (220.0, -88.0, 40.0, -89.5, 0.0, -0.043_660_942_908_512_13),
    ] {
        let plane = TangentPlane::standard(place(a0, d0));
        let point = plane.project(place(a, d)).unwrap();
        close(point.x, xi, 1e-14);
        close(point.y, eta, 1e-14);
        assert!(plane.direction(point).separation(place(a, d)).arcsec() < 1e-8);
    }
    let plane = TangentPlane::standard(place(95.0, 22.0));
    assert_eq!(plane.project(place(275.0, -22.0)), None);
    assert_eq!(plane.project(place(95.0, -68.0)), None);
    assert_eq!(plane.project(Vec3::ZERO), None);
    assert_eq!(plane.project(Vec3::new(f64::NAN, 0.0, 0.0)), None);
}

/// Pixels by `astropy.wcs` 8.0.2 (TAN projection, CD matrix of tilt and pitch over focal length), counted from the corner of the
/// top left pixel: x + 0.5, rows - (y + 0.5) of its places from 0. Centre, tilt, focal length, sensor; then stars and pixels.
#[test]
fn pixels_agree_with_astropy() {
    let smaller = Sensor::new(23.5, 15.6667, 6000, 4000).unwrap();
    for (centre, tilt, focal, sensor, stars) in [
        (
            place(150.0, 12.0),
            35.0,
            50.0,
            full_frame(),
            [
                (149.0, 15.0, 3_365.931_315, 1_722.688_681),
                (160.5, 7.25, 1_354.265_740, 1_671.136_426),
                (141.0, 3.0, 3_339.146_280, 3_841.944_037),
            ],
        ),
        (
            place(0.5, -3.0),
            -80.0,
            85.0,
            smaller,
            [
                (358.9, -2.0, 2_732.450_331, 1_337.560_035),
                (2.2, -5.5, 3_822.601_327, 2_796.693_282),
                (359.99, -3.2, 3_108.144_512, 1_823.214_124),
            ],
        ),
        (
            place(30.0, 89.5),
            10.0,
            24.0,
            full_frame(),
            [
                (30.0, 85.0, 2_945.334_368, 2_310.024_204),
                (210.0, 80.0, 3_128.735_150, 1_269.906_686),
                (301.0, 88.7, 3_095.169_641, 1_982.943_758),
            ],
        ),
    ] {
        let frame = PhotoFrame::new(centre, degrees(tilt), &lens(focal), &sensor).unwrap();
        close(frame.rectangle().tilt().degrees(), tilt, 1e-9);
        for (longitude, latitude, x, y) in stars {
            let star = place(longitude, latitude);
            let pixel = frame.pixel(star).unwrap();
            close(pixel.x, x, 2e-6);
            close(pixel.y, y, 2e-6);
            assert!(frame.direction(pixel).separation(star).arcsec() < 1e-7);
            assert!(frame.holds(star));
        }
    }
}

#[test]
fn corners_and_edges_belong_to_the_picture() {
    let frame =
        PhotoFrame::new(place(10.0, 40.0), degrees(20.0), &lens(50.0), &full_frame()).unwrap();
    let expected = [(0.0, 0.0), (6000.0, 0.0), (6000.0, 4000.0), (0.0, 4000.0)];
    for (corner, (x, y)) in frame.rectangle().corners().into_iter().zip(expected) {
        let pixel = frame.pixel(corner).unwrap();
        close(pixel.x, x, 1e-8);
        close(pixel.y, y, 1e-8);
        assert!(frame.holds(corner));
    }
    assert!(!frame.holds(frame.direction(Pixel {
        x: 6000.01,
        y: 2000.0
    })));
    assert!(!frame.holds(-frame.rectangle().centre()));
    assert_eq!(frame.pixel(-frame.rectangle().centre()), None);
    close(
        frame.rectangle().width().degrees(),
        lens(50.0).field(&full_frame()).width.degrees(),
        1e-12,
    );
}

/// Longitudes and latitudes on the plane at (a0, d0) by the printed formula, turned so that the position angle `tilt` is up.
fn to_picture((a, d): (f64, f64), (a0, d0): (f64, f64), tilt: f64) -> (f64, f64) {
    let depth = d0.sin() * d.sin() + d0.cos() * d.cos() * (a - a0).cos();
    let xi = d.cos() * (a - a0).sin() / depth;
    let eta = (d0.cos() * d.sin() - d0.sin() * d.cos() * (a - a0).cos()) / depth;
    (
        eta * tilt.sin() - xi * tilt.cos(),
        eta * tilt.cos() + xi * tilt.sin(),
    )
}

/// Width and height of the box around places at a fixed tilt, on the plane at its own centre; written apart from the program.
fn box_at(places: &[(f64, f64)], tilt: f64, start: (f64, f64)) -> (f64, f64, (f64, f64)) {
    let mut centre = start;
    for _ in 0..60 {
        let points: Vec<(f64, f64)> = places
            .iter()
            .map(|p| to_picture(*p, centre, tilt))
            .collect();
        let low = |f: fn(&(f64, f64)) -> f64| points.iter().map(f).fold(f64::MAX, f64::min);
        let high = |f: fn(&(f64, f64)) -> f64| points.iter().map(f).fold(f64::MIN, f64::max);
        let (left, right, bottom, top) = (low(|p| p.0), high(|p| p.0), low(|p| p.1), high(|p| p.1));
        let (x, y) = (
            ((left.atan() + right.atan()) / 2.0).tan(),
            ((bottom.atan() + top.atan()) / 2.0).tan(),
        );
        if x.abs() < 1e-12 && y.abs() < 1e-12 {
            return (right - left, top - bottom, centre);
        }
        let (xi, eta) = (
            y * tilt.sin() - x * tilt.cos(),
            y * tilt.cos() + x * tilt.sin(),
        );
        let (a0, d0) = centre;
        let along = d0.cos() - eta * d0.sin();
        let a = a0 + xi.atan2(along);
        centre = (a, (eta * d0.cos() + d0.sin()).atan2(xi.hypot(along)));
    }
    panic!("the box at tilt {tilt} does not settle");
}

/// Least cost over all tilts, half a turn in steps of 0.1 degrees, the best refined to 0.0001.
fn brute_force(places: &[(f64, f64)], start: (f64, f64), cost: impl Fn(f64, f64) -> f64) -> f64 {
    let at = |tilt: f64| {
        let (width, height, _) = box_at(places, tilt, start);
        cost(width, height)
    };
    let mut best = (f64::MAX, 0.0);
    for (step, count) in [(0.1_f64, 900_i32), (0.01, 15), (0.001, 15), (0.0001, 15)] {
        let middle = best.1;
        for k in -count..count {
            let tilt = middle + f64::from(k) * step.to_radians();
            let value = at(tilt);
            if value < best.0 {
                best = (value, tilt);
            }
        }
    }
    best.0
}

/// Numbers that look random and are the same everywhere (Knuth's MMIX generator), 0 to 1.
struct Numbers(u64);

impl Numbers {
    fn next(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1_u64 << 53) as f64
    }

    fn within(&mut self, least: f64, greatest: f64) -> f64 {
        least + (greatest - least) * self.next()
    }
}

/// Places scattered over an ellipse at middle latitudes; radians.
fn scattered(numbers: &mut Numbers, long: f64, short: f64) -> (Vec<(f64, f64)>, (f64, f64)) {
    let (a0, d0) = (numbers.within(0.0, 2.0 * PI), numbers.within(-0.8, 0.8));
    let turn = numbers.within(0.0, PI);
    let count = 3 + (numbers.next() * 20.0) as usize;
    let places = (0..count)
        .map(|_| {
            let (r, around) = (numbers.next().sqrt(), numbers.within(0.0, 2.0 * PI));
            let (x, y) = (long * r * around.cos(), short * r * around.sin());
            let (xi, eta) = (
                x * turn.cos() - y * turn.sin(),
                x * turn.sin() + y * turn.cos(),
            );
            let along = d0.cos() - eta * d0.sin();
            (
                a0 + xi.atan2(along),
                (eta * d0.cos() + d0.sin()).atan2(xi.hypot(along)),
            )
        })
        .collect();
    (places, (a0, d0))
}

fn vectors(places: &[(f64, f64)]) -> Vec<Vec3> {
    places
        .iter()
        .map(|(a, d)| Vec3::from_spherical(Angle::from_radians(*a), Angle::from_radians(*d)))
        .collect()
}

/// Tilts at which the box has the sensor's shape must be tried beside those along the hull's edges.
#[test]
fn longest_lens_and_smallest_rectangle_agree_with_brute_force() {
    /// Brute force steps by 0.0001 degrees at last: it may miss a sharp minimum by this share of the size.
    const BRUTE: f64 = 1e-5;
    let mut numbers = Numbers(1);
    for (long, short) in [(0.05, 0.02), (0.2, 0.1), (0.45, 0.2)] {
        for _ in 0..12 {
            let (places, start) = scattered(&mut numbers, long, short);
            let margin = numbers.within(0.0, 0.2) * short;
            let angle = Angle::from_radians(margin.atan());
            let directions = vectors(&places);
            let longest = longest_lens(&directions, angle, &full_frame()).unwrap();
            let least = brute_force(&places, start, |w, h| {
                ((w + 2.0 * margin) / 36.0).max((h + 2.0 * margin) / 24.0)
            });
            close(longest.focal_length_mm * least, 1.0, BRUTE);
            let rectangle = smallest_rectangle(&directions, angle).unwrap();
            let area = 4.0
                * (0.5 * rectangle.width().radians()).tan()
                * (0.5 * rectangle.height().radians()).tan();
            let least = brute_force(&places, start, |w, h| {
                (w + 2.0 * margin) * (h + 2.0 * margin)
            });
            close(area / least, 1.0, BRUTE);
        }
    }
}

/// Two points: the diagonal of the sensor lies along them, and the focal length is half of it over the tangent of half the angle.
#[test]
fn two_points_lie_along_the_diagonal() {
    let pair = [place(359.0, 10.0), place(3.0, 12.0)];
    let longest = longest_lens(&pair, Angle::ZERO, &full_frame()).unwrap();
    let half = 0.5 * pair[0].separation(pair[1]).radians();
    close(
        longest.focal_length_mm,
        0.5 * 36.0_f64.hypot(24.0) / half.tan(),
        1e-6,
    );
    let long = longest.frame(&lens(longest.focal_length_mm), &full_frame());
    assert!(pair.iter().all(|point| long.holds(*point)));
}

#[test]
fn one_point_and_points_on_a_line_have_their_rectangles() {
    let margin = degrees(2.0);
    let one = smallest_rectangle(&[place(0.0, 90.0)], margin).unwrap();
    close(one.width().degrees(), 4.0, 1e-9);
    close(one.height().degrees(), 4.0, 1e-9);
    close(
        one.centre().separation(place(0.0, 90.0)).degrees(),
        0.0,
        1e-9,
    );
    let longest = longest_lens(&[place(33.0, -7.0)], margin, &full_frame()).unwrap();
    close(
        longest.focal_length_mm,
        12.0 / 2.0_f64.to_radians().tan(),
        1e-9,
    );
    close(longest.tilt().degrees(), 0.0, 1e-9);
    // Along the equator, across 0h: the width holds the arc, the height only the margin.
    let line: Vec<Vec3> = [355.0, 358.0, 1.0, 5.0]
        .iter()
        .map(|a| place(*a, 0.0))
        .collect();
    let flat = smallest_rectangle(&line, margin).unwrap();
    close(flat.height().degrees(), 4.0, 1e-6);
    close(
        (0.5 * flat.width().radians()).tan(),
        5.0_f64.to_radians().tan() + 2.0_f64.to_radians().tan(),
        1e-9,
    );
    close(flat.tilt().degrees(), 0.0, 1e-6);
    close(
        flat.centre().separation(place(0.0, 0.0)).degrees(),
        0.0,
        1e-6,
    );
    let without_margin = smallest_rectangle(&line, Angle::ZERO).unwrap();
    close(without_margin.height().degrees(), 0.0, 1e-9);
    assert!(line.iter().all(|point| without_margin.holds(*point)));
    assert_eq!(
        longest_lens(&[place(1.0, 2.0); 3], Angle::ZERO, &full_frame()),
        Err(FrameError::NoExtent)
    );
}

/// The loop of 2026-27 with two degrees of air: what a photographer would choose, a short telephoto lens.
#[test]
fn the_season_of_mars_is_held_by_the_longest_lens_and_no_longer_one() {
    let path = mars_2026();
    let longest = longest_lens(&path, degrees(2.0), &full_frame()).unwrap();
    let focal = longest.focal_length_mm;
    assert!((85.0..95.0).contains(&focal), "{focal} mm");
    let exact = lens(focal);
    let frame = longest.frame(&exact, &full_frame());
    // Every point keeps the margin in the picture: f tan 2 degrees over 6 um.
    let air = focal * 2.0_f64.to_radians().tan() / 0.006 - 1e-4;
    for point in &path {
        let pixel = frame.pixel(*point).unwrap();
        assert!(
            (air..=6000.0 - air).contains(&pixel.x) && (air..=4000.0 - air).contains(&pixel.y),
            "{pixel:?}"
        );
    }
    assert!(longest.is_held_by(&lens(85.0)) && !longest.is_held_by(&lens(100.0)));
    assert_eq!(frame.part_held(&path).fraction, 1.0);
    let held = PhotoFrame::new(
        longest.centre(),
        longest.tilt(),
        &lens(135.0),
        &full_frame(),
    )
    .unwrap()
    .part_held(&path);
    assert!((0.3..0.9).contains(&held.fraction), "{held:?}");
}

#[test]
fn part_held_agrees_with_fine_steps_along_the_path() {
    let path = mars_2026();
    let middle = longest_lens(&path, Angle::ZERO, &full_frame()).unwrap();
    for (focal, aside) in [(100.0, 0.0), (135.0, 4.0), (200.0, 8.0), (400.0, 3.0)] {
        let aim = Mat3::about_z(degrees(aside)) * middle.centre();
        let frame = PhotoFrame::new(aim, degrees(17.0), &lens(focal), &full_frame()).unwrap();
        let part = frame.part_held(&path);
        let (mut held, mut all) = (0.0, 0.0);
        for pair in path.windows(2) {
            for step in 0..200 {
                let share = (f64::from(step) + 0.5) / 200.0;
                let point = pair[0] * (1.0 - share) + pair[1] * share;
                let piece = pair[0].separation(pair[1]).degrees() / 200.0;
                all += piece;
                held += if frame.holds(point) { piece } else { 0.0 };
            }
        }
        close(part.fraction, held / all, 1e-4);
        for stretch in &part.stretches {
            assert!(0.0 <= stretch.from && stretch.from < stretch.to && stretch.to <= 212.0);
            for end in [stretch.from, stretch.to]
                .into_iter()
                .filter(|end| end.fract() != 0.0)
            {
                let at =
                    path[end as usize] * (1.0 - end.fract()) + path[end as usize + 1] * end.fract();
                let pixel = frame.pixel(at).unwrap();
                let to_edge = pixel
                    .x
                    .min(6000.0 - pixel.x)
                    .min(pixel.y)
                    .min(4000.0 - pixel.y);
                close(to_edge, 0.0, 0.01);
            }
        }
    }
    let away = PhotoFrame::new(-middle.centre(), Angle::ZERO, &lens(50.0), &full_frame()).unwrap();
    let none = away.part_held(&path);
    assert!(none.fraction == 0.0 && none.stretches.is_empty());
    assert_eq!(away.part_held(&[-middle.centre()]).fraction, 1.0);
    assert_eq!(away.part_held(&[]).fraction, 0.0);
}

/// Every pair of first and last point, on every eighth day.
#[test]
fn longest_run_agrees_with_trying_every_run() {
    let path: Vec<Vec3> = mars_2026().into_iter().step_by(8).collect();
    let also = [path[13]];
    let margin = degrees(1.0);
    for (focal, also) in [
        (60.0, &[][..]),
        (135.0, &[][..]),
        (135.0, &also[..]),
        (300.0, &[][..]),
        (2000.0, &[][..]),
    ] {
        let lens = lens(focal);
        let run = longest_run(&path, also, margin, &lens, &full_frame()).unwrap();
        let mut best: Option<(f64, usize, usize)> = None;
        for first in 0..path.len() {
            for last in first..path.len() {
                let wanted: Vec<Vec3> = path[first..=last].iter().chain(also).copied().collect();
                if longest_lens(&wanted, margin, &full_frame())
                    .unwrap()
                    .is_held_by(&lens)
                {
                    let length: f64 = path[first..=last]
                        .windows(2)
                        .map(|p| p[0].separation(p[1]).degrees())
                        .sum();
                    if best.is_none_or(|(longest, ..)| length > longest) {
                        best = Some((length, first, last));
                    }
                }
            }
        }
        match (run, best) {
            (None, None) => assert_eq!(focal, 2000.0),
            (Some(run), Some((_, first, last))) => {
                assert_eq!((run.first, run.last), (first, last), "{focal} mm");
                assert!(
                    path[first..=last]
                        .iter()
                        .chain(also)
                        .all(|point| run.frame.holds(*point))
                );
            }
            (run, best) => panic!("{focal} mm: {run:?} against {best:?}"),
        }
    }
}

#[test]
fn mosaics_hold_everything_between_the_directions() {
    let mut numbers = Numbers(7);
    let path = mars_2026();
    let mut sets = vec![(path, degrees(1.0))];
    for (long, short) in [(0.05, 0.02), (0.3, 0.1), (0.6, 0.4)] {
        for _ in 0..10 {
            let (places, _) = scattered(&mut numbers, long, short);
            sets.push((vectors(&places), Angle::from_radians(0.1 * short)));
        }
    }
    for (directions, margin) in &sets {
        let longest = longest_lens(directions, *margin, &full_frame())
            .unwrap()
            .focal_length_mm;
        for (times, overlap) in [(0.9, 0.2), (1.3, 0.2), (2.5, 0.0), (4.0, 0.4)] {
            let found = mosaic(
                directions,
                *margin,
                overlap,
                &lens(longest * times),
                &full_frame(),
            )
            .unwrap();
            assert_eq!(found.tiles.len(), found.columns * found.rows);
            assert_eq!(
                found.tiles.len() == 1,
                times < 1.0,
                "{times} times the longest lens"
            );
            // No fewer than the sky that must be held needs.
            let most = (times * times * 12.0 / (1.0 - overlap).powi(2)).ceil() as usize + 6;
            assert!(
                found.tiles.len() <= most,
                "{} pictures for {times} times",
                found.tiles.len()
            );
            let held = |point: Vec3| found.tiles.iter().any(|tile| tile.frame.holds(point));
            for _ in 0..300 {
                let pick = |share: f64| directions[(share * directions.len() as f64) as usize];
                let (a, b, share) = (pick(numbers.next()), pick(numbers.next()), numbers.next());
                let between = (a * share + b * (1.0 - share)).unit();
                let around = TangentPlane::of_sky(
                    between,
                    Angle::from_radians(numbers.within(0.0, 2.0 * PI)),
                );
                let edge = around.direction(loopwright::season::tangent::PlanePoint {
                    x: 0.999 * margin.tan(),
                    y: 0.0,
                });
                assert!(
                    held(between) && held(edge),
                    "{times} times, overlap {overlap}"
                );
            }
            assert!(found.tiles.iter().any(|tile| tile.holds_any));
        }
    }
}

/// In the middle row of a strip the pictures step by their field less the overlap.
#[test]
fn pictures_of_a_strip_overlap_as_asked() {
    let line: Vec<Vec3> = (-20..=20).map(|a| place(f64::from(a), 0.0)).collect();
    let lens = lens(200.0);
    let strip = mosaic(&line, degrees(0.5), 0.25, &lens, &full_frame()).unwrap();
    assert_eq!(strip.rows, 1);
    // (41 - 10.286) / (0.75 * 10.286) + 1 pictures with the long side along the line.
    assert_eq!(strip.columns, 5);
    for pair in strip.tiles.windows(2) {
        let step = pair[0]
            .frame
            .rectangle()
            .centre()
            .separation(pair[1].frame.rectangle().centre());
        assert!(step.degrees() <= 0.75 * lens.field(&full_frame()).width.degrees() + 1e-9);
        assert!(step.degrees() > 0.73 * lens.field(&full_frame()).width.degrees());
    }
    assert!(strip.tiles.iter().all(|tile| tile.holds_any));
}

/// Parallactic angle by `hd2pa` of pyerfa 2.0.1.5: hour angle 30, declination 20, latitude 50 degrees.
#[test]
fn lean_is_tilt_less_parallactic_angle() {
    let parallactic = degrees(31.258_963);
    // West of the meridian a camera with north up leans to the right.
    close(
        lean_from_zenith(Angle::ZERO, parallactic).degrees(),
        -31.258_963,
        1e-9,
    );
    close(
        lean_from_zenith(parallactic, parallactic).degrees(),
        0.0,
        1e-9,
    );
    close(
        lean_from_zenith(degrees(170.0), degrees(-170.0)).degrees(),
        -20.0,
        1e-9,
    );
    // With the zenith at right ascension 0, the star stands at -30 degrees.
    let zenith_seen = place(-30.0, 20.0).position_angle(place(0.0, 50.0));
    close(zenith_seen.degrees(), parallactic.degrees(), 1e-6);
}

#[test]
fn closest_dots_are_found_across_the_loop() {
    // Two branches that cross: the third and the last dot nearly meet, 5" apart.
    let dots = [
        place(359.0, 0.0),
        place(359.5, 0.5),
        place(0.0, 1.0),
        place(0.5, 0.5),
        place(0.0, 1.0 + 5.0 / 3600.0),
    ];
    let closest = closest_dots(&dots).unwrap();
    assert_eq!((closest.first, closest.second), (2, 4));
    close(closest.separation.arcsec(), 5.0, 1e-6);
    // 200 mm and 6 um: 6.188" to the pixel.
    let frame =
        PhotoFrame::new(place(0.0, 1.0), degrees(30.0), &lens(200.0), &full_frame()).unwrap();
    close(closest.pixels(&dots, &frame).unwrap(), 5.0 / 6.188, 0.001);
    assert_eq!(closest_dots(&dots[..1]), None);
    assert_eq!(closest_dots(&[]), None);
    let with_a_gap = [Vec3::new(f64::NAN, 0.0, 0.0), dots[0], dots[1]];
    assert_eq!(
        closest_dots(&with_a_gap).map(|pair| (pair.first, pair.second)),
        Some((1, 2))
    );
    assert_eq!(frame.part_held(&with_a_gap).fraction, 1.0);
    // Daily dots of the season crowd at a station: 2027 January 10 is day 70, April 1 day 151.
    let mars = closest_dots(&mars_2026()).unwrap();
    assert!(
        mars.second == mars.first + 1 && (66..74).contains(&mars.first)
            || (147..155).contains(&mars.first),
        "{mars:?}"
    );
}

/// The declination nearest to the equator, against a fine grid of the picture.
#[test]
fn fastest_sky_in_the_picture() {
    for (longitude, latitude, tilt) in [
        (10.0, 30.0, 20.0),
        (200.0, -4.0, 45.0),
        (80.0, -55.0, 70.0),
        (0.0, 90.0, 0.0),
    ] {
        let frame = PhotoFrame::new(
            place(longitude, latitude),
            degrees(tilt),
            &lens(50.0),
            &full_frame(),
        )
        .unwrap();
        let mut least = f64::MAX;
        for column in 0..=60 {
            for row in 0..=40 {
                let pixel = Pixel {
                    x: 100.0 * f64::from(column),
                    y: 100.0 * f64::from(row),
                };
                least = least.min(frame.direction(pixel).latitude().abs().degrees());
            }
        }
        let found = frame
            .rectangle()
            .declination_nearest_equator()
            .degrees()
            .abs();
        assert!(
            found <= least + 1e-9 && least - found < 0.4,
            "{found} against {least}"
        );
    }
}

#[test]
fn what_cannot_be_framed_is_refused_with_what_would_work() {
    let sensor = full_frame();
    let lens = lens(50.0);
    let some = [place(0.0, 0.0), place(10.0, 0.0)];
    let margin = degrees(1.0);
    assert_eq!(
        longest_lens(&[], margin, &sensor),
        Err(FrameError::NoDirections)
    );
    assert_eq!(
        smallest_rectangle(&[], margin),
        Err(FrameError::NoDirections)
    );
    assert_eq!(
        longest_run(&[], &some, margin, &lens, &sensor),
        Err(FrameError::NoDirections)
    );
    for bad in [
        Vec3::ZERO,
        Vec3::new(f64::NAN, 0.0, 1.0),
        Vec3::new(f64::INFINITY, 0.0, 0.0),
    ] {
        let directions = [some[0], bad];
        assert_eq!(
            longest_lens(&directions, margin, &sensor),
            Err(FrameError::NotADirection { index: 1 })
        );
        assert!(PhotoFrame::new(bad, Angle::ZERO, &lens, &sensor).is_err());
        let run = longest_run(&directions, &some, margin, &lens, &sensor);
        assert_eq!(run, Err(FrameError::NotADirection { index: 1 }));
    }
    for wide in [
        vec![place(0.0, 0.0), place(180.0, 0.0)],
        (0..36).map(|k| place(10.0 * f64::from(k), 0.0)).collect(),
    ] {
        let error = smallest_rectangle(&wide, margin).unwrap_err();
        assert!(matches!(error, FrameError::TooWide { .. }), "{error}");
        assert!(error.to_string().contains("shorter part of the path"));
    }
    for margin in [-1.0, 60.0, f64::NAN] {
        let error = longest_lens(&some, degrees(margin), &sensor).unwrap_err();
        assert!(error.to_string().contains("margin"), "{error}");
    }
    for overlap in [-0.1, 1.0, f64::NAN] {
        let error = mosaic(&some, margin, overlap, &lens, &sensor).unwrap_err();
        assert!(error.to_string().contains("overlap"), "{error}");
    }
    let long = Lens::new("long", 10_000.0, 10.0).unwrap();
    let error = mosaic(&some, margin, 0.2, &long, &sensor).unwrap_err();
    assert!(
        matches!(
            error,
            FrameError::TooManyPictures {
                pictures: 401..,
                ..
            }
        ),
        "{error}"
    );
    assert!(
        PhotoFrame::new(some[0], degrees(f64::NAN), &lens, &sensor)
            .unwrap_err()
            .to_string()
            .contains("tilt")
    );
}

fn any_rotation() -> impl Strategy<Value = Mat3> {
    (0.0..360.0_f64, 0.0..360.0_f64, 0.0..360.0_f64).prop_map(|(a, b, c)| {
        Mat3::about_z(degrees(a)) * Mat3::about_x(degrees(b)) * Mat3::about_z(degrees(c))
    })
}

/// Directions within 30 degrees of the x axis.
fn some_directions() -> impl Strategy<Value = Vec<Vec3>> {
    proptest::collection::vec((-20.0..20.0_f64, -20.0..20.0_f64), 2..30)
        .prop_map(|places| places.into_iter().map(|(a, d)| place(a, d)).collect())
}

proptest! {
    /// Size and focal length do not know where on the sky the path lies: poles and the passage through 0h are as good as any.
    #[test]
    fn sizes_do_not_depend_on_the_place(directions in some_directions(), rotation in any_rotation(), margin in 0.01..3.0_f64) {
        let margin = degrees(margin);
        let turned: Vec<Vec3> = directions.iter().map(|direction| rotation * *direction).collect();
        let here = longest_lens(&directions, margin, &full_frame()).unwrap();
        let there = longest_lens(&turned, margin, &full_frame()).unwrap();
        prop_assert!((here.focal_length_mm / there.focal_length_mm - 1.0).abs() < 1e-6);
        let here = smallest_rectangle(&directions, margin).unwrap();
        let there = smallest_rectangle(&turned, margin).unwrap();
        let area = |r: &loopwright::season::tangent::Rectangle| (0.5 * r.width().radians()).tan() * (0.5 * r.height().radians()).tan();
        prop_assert!((area(&here) / area(&there) - 1.0).abs() < 1e-6);
        prop_assert!(turned.iter().all(|direction| there.holds(*direction)));
        prop_assert!(there.width() >= there.height());
        prop_assert!(there.tilt().abs() <= Angle::QUARTER_TURN + Angle::from_radians(1e-12));
    }

    /// The order of the directions, and directions said twice, change nothing.
    #[test]
    fn order_and_repetition_do_not_matter(directions in some_directions(), margin in 0.01..3.0_f64) {
        let margin = degrees(margin);
        let mut mixed: Vec<Vec3> = directions.iter().rev().copied().collect();
        mixed.extend_from_slice(&directions[..directions.len() / 2]);
        let a = longest_lens(&directions, margin, &full_frame()).unwrap();
        let b = longest_lens(&mixed, margin, &full_frame()).unwrap();
        prop_assert!((a.focal_length_mm / b.focal_length_mm - 1.0).abs() < 1e-6);
    }

    /// Picture and sky are inverse, anywhere and at any tilt.
    #[test]
    fn pixels_and_directions_are_inverse(
        longitude in 0.0..360.0_f64, latitude in -90.0..=90.0_f64, tilt in -180.0..180.0_f64,
        x in -500.0..6500.0_f64, y in -500.0..4500.0_f64, focal in 12.0..800.0_f64,
    ) {
        let frame = PhotoFrame::new(place(longitude, latitude), degrees(tilt), &lens(focal), &full_frame()).unwrap();
        let back = frame.pixel(frame.direction(Pixel { x, y })).unwrap();
        prop_assert!((back.x - x).abs() < 1e-7 && (back.y - y).abs() < 1e-7, "{back:?}");
        let inside = (0.0..=6000.0).contains(&x) && (0.0..=4000.0).contains(&y);
        let near_edge = [x, 6000.0 - x, y, 4000.0 - y].iter().any(|distance| distance.abs() < 0.01);
        let held = frame.holds(frame.direction(Pixel { x, y }));
        prop_assert!(near_edge || held == inside);
    }
}
