//! Times of the ephemeris: a state at increasing and at random times, nutation, and the decoding of the asset.

use divan::{Bencher, black_box, counter::ItemsCount};
use loopwright::sky::{Ephemeris, Target, Tdb};

const COUNT: usize = 10_000;

fn main() {
    divan::main();
}

fn ephemeris() -> &'static Ephemeris {
    Ephemeris::embedded().expect("the embedded ephemeris is sound")
}

/// A century at steps of a few days.
fn increasing() -> Vec<Tdb> {
    (0..COUNT)
        .map(|i| Tdb::from_days(i as f64 * 3.65))
        .collect()
}

/// Anywhere in the span, by a multiplicative sequence.
fn random() -> Vec<Tdb> {
    let (start, end) = ephemeris().span();
    let golden = 0.618_033_988_749_894_9;
    (0..COUNT)
        .map(|i| start.plus_days((i as f64 * golden).fract() * (end.days() - start.days())))
        .collect()
}

fn states(bencher: Bencher, target: Target, times: &[Tdb]) {
    let ephemeris = ephemeris();
    bencher.counter(ItemsCount::new(COUNT)).bench(|| {
        for &time in times {
            black_box(ephemeris.state(black_box(target), time));
        }
    });
}

#[divan::bench(args = Target::ALL)]
fn state_at_increasing_times(bencher: Bencher, target: Target) {
    states(bencher, target, &increasing());
}

#[divan::bench(args = Target::ALL)]
fn state_at_random_times(bencher: Bencher, target: Target) {
    states(bencher, target, &random());
}

#[divan::bench]
fn nutation_at_increasing_times(bencher: Bencher) {
    let (ephemeris, times) = (ephemeris(), increasing());
    bencher.counter(ItemsCount::new(COUNT)).bench(|| {
        for &time in &times {
            black_box(ephemeris.nutation(time));
        }
    });
}

#[divan::bench]
fn nutation_at_random_times(bencher: Bencher) {
    let (ephemeris, times) = (ephemeris(), random());
    bencher.counter(ItemsCount::new(COUNT)).bench(|| {
        for &time in &times {
            black_box(ephemeris.nutation(time));
        }
    });
}

#[divan::bench]
fn decode() -> bool {
    Ephemeris::decode(black_box(Ephemeris::embedded_bytes())).is_ok()
}
