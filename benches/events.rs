//! Searching events, on one core. `cargo bench --bench events`

use std::ops::ControlFlow;

use divan::counter::ItemsCount;
use loopwright::season::events::{Kinds, for_each_event};
use loopwright::season::{Span, loops, season};
use loopwright::sky::place::Sky;
use loopwright::sky::{Body, Tt};

fn main() {
    divan::main();
}

/// 1950 to 2050.
const CENTURY: Span = Span {
    from: Tt::from_days(-18_262.5),
    to: Tt::from_days(18_262.5),
};

fn count(kinds: Kinds) -> u64 {
    let sky = Sky::de440().expect("the embedded ephemeris is sound");
    let mut count = 0;
    for_each_event(&sky, &Body::PLANETS, kinds, CENTURY, |_| {
        count += 1;
        ControlFlow::Continue(())
    })
    .expect("within the span");
    count
}

/// Conjunctions, oppositions, quadratures, both kinds of stations, greatest elongations, closest approaches.
#[divan::bench(sample_count = 20)]
fn century_of_seven_planets(bencher: divan::Bencher) {
    let found = count(Kinds::CONFIGURATIONS);
    bencher
        .counter(ItemsCount::new(found))
        .bench(|| count(Kinds::CONFIGURATIONS));
}

/// With greatest brightness, perihelia and constellations.
#[divan::bench(sample_count = 5)]
fn century_with_everything(bencher: divan::Bencher) {
    let found = count(Kinds::ALL);
    bencher
        .counter(ItemsCount::new(found))
        .bench(|| count(Kinds::ALL));
}

/// A century of Mars loops with their crossings.
#[divan::bench(sample_count = 20)]
fn century_of_mars_loops() -> usize {
    let sky = Sky::de440().expect("the embedded ephemeris is sound");
    loops(&sky, Body::Mars, CENTURY)
        .expect("within the span")
        .len()
}

/// The built-in season: Mars 2026-27 with Jupiter.
#[divan::bench]
fn one_season() -> usize {
    let sky = Sky::de440().expect("the embedded ephemeris is sound");
    let span = Span {
        from: Tt::from_days(9_800.5),
        to: Tt::from_days(10_012.5),
    };
    season(&sky, Body::Mars, &[Body::Jupiter], span)
        .expect("within the span")
        .events
        .len()
}
