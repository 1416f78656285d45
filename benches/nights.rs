//! Spells of a season of 250 nights, on one core. `cargo bench --bench nights`

use loopwright::season::nights::{LocalClock, nights};
use loopwright::season::spells::{Outcome, spells};
use loopwright::season::visibility::{Viewer, sightings};
use loopwright::season::{Conditions, NightRules, Openings, SiteTracks, Span};
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::Air;
use loopwright::sky::skyline::SkylinePoint;
use loopwright::sky::{Angle, Body, Site, Skyline, Tt};

fn main() {
    divan::main();
}

/// 2026 September 1 and 250 nights.
const SEASON: Span = Span {
    from: Tt::from_days(9_740.0),
    to: Tt::from_days(9_989.5),
};

fn site() -> Site {
    Site {
        name: "A hill".into(),
        latitude: Angle::from_degrees(50.6),
        longitude: Angle::from_degrees(10.3),
        elevation_m: 486.0,
        height_above_surroundings_m: 115.0,
        air: Air::default(),
        extinction_mag: 0.24,
    }
}

/// Fifty points, slopes and walls, shifted by `lift` degrees.
fn skyline(lift: f64) -> Skyline {
    let points = (0..50)
        .map(|k| SkylinePoint {
            azimuth: 7.2 * f64::from(k / 2 * 2) + f64::from(k % 2) * f64::from(k % 3) * 2.0,
            altitude: f64::from(k * 37 % 23) * 0.5 + lift,
            name: (k % 4 == 0).then(|| format!("house {k}")),
        })
        .collect();
    Skyline::new(points).expect("a skyline")
}

fn sky() -> Sky {
    Sky::de440().expect("the embedded ephemeris is sound")
}

fn count(outcomes: &[Outcome]) -> usize {
    outcomes.iter().map(|outcome| outcome.spells().len()).sum()
}

const BODIES: [Body; 3] = [Body::Venus, Body::Mars, Body::Saturn];

/// Tracks, nights, conditions and spells.
#[divan::bench(args = BODIES)]
fn season_from_nothing(body: Body) -> usize {
    let sky = sky();
    let tracks = SiteTracks::new(&sky, &site(), body, SEASON).expect("within the span");
    let clock = LocalClock::fixed(3600);
    let rules = NightRules::from(Conditions::default());
    let almanac = nights(&tracks, &clock).expect("dates");
    let openings = Openings::new(&sky, &tracks, &rules, &clock).expect("dates");
    almanac.len() + count(&spells(&tracks, &openings, &skyline(0.0)))
}

/// What follows a dragged point of the skyline.
#[divan::bench(args = BODIES)]
fn season_after_a_change_of_the_skyline(bencher: divan::Bencher, body: Body) {
    let sky = sky();
    let tracks = SiteTracks::new(&sky, &site(), body, SEASON).expect("within the span");
    let clock = LocalClock::fixed(3600);
    let rules = NightRules::from(Conditions::default());
    let openings = Openings::new(&sky, &tracks, &rules, &clock).expect("dates");
    bencher
        .with_inputs(|| skyline(1.3))
        .bench_values(|skyline| count(&spells(&tracks, &openings, &skyline)));
}

/// The same where the skyline hides the subject on every night.
#[divan::bench]
fn season_behind_a_wall(bencher: divan::Bencher) {
    let sky = sky();
    let tracks = SiteTracks::new(&sky, &site(), Body::Mars, SEASON).expect("within the span");
    let clock = LocalClock::fixed(3600);
    let rules = NightRules::from(Conditions::default());
    let openings = Openings::new(&sky, &tracks, &rules, &clock).expect("dates");
    bencher
        .with_inputs(|| skyline(80.0 - 12.0))
        .bench_values(|skyline| count(&spells(&tracks, &openings, &skyline)));
}

/// First and last sightings of Venus in three states of the air.
#[divan::bench]
fn sightings_of_venus(bencher: divan::Bencher) {
    let sky = sky();
    let site = site();
    let tracks = SiteTracks::new(&sky, &site, Body::Venus, SEASON).expect("within the span");
    let viewer = Viewer::at(&site, 3);
    let flat = Skyline::default();
    bencher.bench(|| sightings(&tracks, &viewer, &flat).len());
}
