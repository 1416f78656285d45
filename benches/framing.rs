//! Framing a season, on one core. `cargo bench --bench framing`

use std::hint::black_box;

use loopwright::season::framing::{
    closest_dots, longest_lens, longest_run, mosaic, smallest_rectangle,
};
use loopwright::season::lens::{Lens, Sensor};
use loopwright::sky::{Angle, Vec3};

fn main() {
    divan::main();
}

/// A point a day for 250 days: a loop of about the size of one of Mars, across 0h.
fn path() -> Vec<Vec3> {
    (0..250)
        .map(|day| {
            let t = f64::from(day);
            let swing = Angle::from_degrees(t * 360.0 / 250.0);
            let longitude = Angle::from_degrees(345.0 + 0.12 * t + 10.0 * swing.sin());
            let latitude = Angle::from_degrees(-8.0 + 0.05 * t + 2.0 * swing.cos());
            Vec3::from_spherical(longitude, latitude)
        })
        .collect()
}

fn sensor() -> Sensor {
    Sensor::new(36.0, 24.0, 6000, 4000).expect("a sensor")
}

fn lens(focal_length_mm: f64) -> Lens {
    Lens::new("bench", focal_length_mm, 4.0).expect("a lens")
}

const MARGIN: Angle = Angle::from_degrees(1.0);

#[divan::bench]
fn smallest_rectangle_of_250_days(bencher: divan::Bencher) {
    let path = path();
    bencher.bench(|| smallest_rectangle(black_box(&path), MARGIN));
}

#[divan::bench]
fn longest_lens_for_250_days(bencher: divan::Bencher) {
    let (path, sensor) = (path(), sensor());
    bencher.bench(|| longest_lens(black_box(&path), MARGIN, &sensor));
}

#[divan::bench(sample_count = 20)]
fn longest_run_of_250_days(bencher: divan::Bencher) {
    let (path, lens, sensor) = (path(), lens(135.0), sensor());
    bencher.bench(|| longest_run(black_box(&path), &[], MARGIN, &lens, &sensor));
}

#[divan::bench]
fn mosaic_of_250_days(bencher: divan::Bencher) {
    let (path, lens, sensor) = (path(), lens(200.0), sensor());
    bencher.bench(|| mosaic(black_box(&path), MARGIN, 0.2, &lens, &sensor));
}

#[divan::bench]
fn part_held_of_250_days(bencher: divan::Bencher) {
    let (path, sensor) = (path(), sensor());
    let aim = longest_lens(&path, MARGIN, &sensor).expect("a path");
    let frame = aim.frame(&lens(135.0), &sensor);
    bencher.bench(|| frame.part_held(black_box(&path)));
}

#[divan::bench]
fn closest_of_250_dots(bencher: divan::Bencher) {
    let path = path();
    bencher.bench(|| closest_dots(black_box(&path)));
}
