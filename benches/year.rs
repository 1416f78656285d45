//! Evenings of a year and seasons compared, on one core. `cargo bench --bench year`

use loopwright::season::compare::{Viewpoint, inner_seasons, outer_seasons};
use loopwright::season::nights::LocalClock;
use loopwright::season::year::{House, Watch, year};
use loopwright::season::{Conditions, NightRules, Span, Weekdays};
use loopwright::sheet::season_tables::YEAR_BODIES;
use loopwright::sky::calendar::CivilDate;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::Air;
use loopwright::sky::{Angle, Body, Site, Skyline, Tt};

fn main() {
    divan::main();
}

/// 2026 to 2061.
const YEARS_35: Span = Span {
    from: Tt::from_days(9_496.5),
    to: Tt::from_days(22_280.5),
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

fn sky() -> Sky {
    Sky::de440().expect("the embedded ephemeris is sound")
}

/// Moon and seven planets on 365 nights.
#[divan::bench(sample_count = 10)]
fn year_of_all_bodies() -> usize {
    let watch = Watch {
        site: &site(),
        skyline: &Skyline::default(),
        clock: &LocalClock::fixed(3_600),
        rules: &NightRules::from(Conditions::default()),
        house: &House::on(Weekdays::ALL),
    };
    let from = CivilDate::new(2026, 9, 1).expect("a date");
    year(&sky(), watch, &YEAR_BODIES, &[], from, 365)
        .expect("within the span")
        .evenings
        .len()
}

fn with_viewpoint<T>(f: impl Fn(&[Viewpoint<'_>]) -> T) -> T {
    f(&[Viewpoint {
        site: &site(),
        skyline: &Skyline::default(),
        conditions: &Conditions::default(),
        clock: &LocalClock::fixed(3_600),
    }])
}

/// Nights within 120 days of each opposition of 35 years.
#[divan::bench(sample_count = 10, args = [Body::Mars, Body::Saturn])]
fn thirty_five_years_outer(body: Body) -> usize {
    with_viewpoint(|views| {
        outer_seasons(&sky(), body, YEARS_35, views)
            .expect("within the span")
            .len()
    })
}

/// Every evening and morning apparition of 35 years, with sightings.
#[divan::bench(sample_count = 10, args = [Body::Mercury, Body::Venus])]
fn thirty_five_years_inner(body: Body) -> usize {
    with_viewpoint(|views| {
        inner_seasons(&sky(), body, YEARS_35, views)
            .expect("within the span")
            .len()
    })
}
