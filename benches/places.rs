//! Apparent geocentric places a second, on one core. `cargo bench --bench places`

use divan::counter::ItemsCount;
use loopwright::sky::place::Sky;
use loopwright::sky::{Body, Tt};

fn main() {
    divan::main();
}

const COUNT: u64 = 20_000;

fn sum_of_places(instants: impl Iterator<Item = (f64, Body)>) -> f64 {
    let sky = Sky::de440().expect("the embedded ephemeris is sound");
    instants
        .map(|(days, body)| {
            let vantage = sky.geocentre(Tt::from_days(days)).expect("within the span");
            let place = vantage.place(body).expect("within the span");
            // Apparent direction on the axes of date: the numbers that a search looks at.
            let direction = place.frame.ecliptic_from_icrs * place.apparent;
            direction.x + place.distance_au
        })
        .sum()
}

/// Every 1.7 hours from 2020 on, a fresh instant for every place.
#[divan::bench(args = Body::PLANETS)]
fn increasing_times(bencher: divan::Bencher, body: Body) {
    bencher
        .counter(ItemsCount::new(COUNT))
        .bench(|| sum_of_places((0..COUNT).map(|k| (7_305.0 + 0.07 * k as f64, body))));
}

/// Scattered over 1600 to 2600 by multiplication with the golden ratio.
#[divan::bench(args = Body::PLANETS)]
fn random_times(bencher: divan::Bencher, body: Body) {
    bencher.counter(ItemsCount::new(COUNT)).bench(|| {
        sum_of_places((0..COUNT).map(|k| {
            let share = (k as f64 * 0.618_033_988_749_895).fract();
            (-146_000.0 + 365_000.0 * share, body)
        }))
    });
}

/// All coordinates of a place: right ascension, declination, longitude, latitude, rates, elongation.
#[divan::bench]
fn every_coordinate(bencher: divan::Bencher) {
    let sky = Sky::de440().expect("the embedded ephemeris is sound");
    bencher.counter(ItemsCount::new(COUNT)).bench(|| {
        (0..COUNT)
            .map(|k| {
                let vantage = sky
                    .geocentre(Tt::from_days(7_305.0 + 0.07 * k as f64))
                    .expect("within the span");
                let place = vantage.place(Body::Mars).expect("within the span");
                let sun = vantage.place(Body::Sun).expect("within the span");
                place.equatorial_of_date().longitude.radians()
                    + place.ecliptic_of_date().longitude.radians()
                    + place.ecliptic_rate().longitude.radians()
                    + place.separation(&sun).radians()
            })
            .sum::<f64>()
    });
}
