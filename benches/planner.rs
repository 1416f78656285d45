//! Committing to nights, on one core. `cargo bench --bench planner`

use loopwright::season::advice::{AdviceRequest, Gap, advise};
use loopwright::season::picks::{
    Candidate, Mark, Measure, Path, PickRequest, ReserveRule, pick_dates,
};
use loopwright::season::weather::{Chain, Forecast, MonthlyOdds, Persistence, Weather};
use loopwright::sky::Angle;
use loopwright::sky::calendar::CivilDate;

fn main() {
    divan::main();
}

fn night(offset: i32) -> CivilDate {
    CivilDate::new(2027, 1, 1)
        .and_then(|first| first.plus_days(offset))
        .expect("a date")
}

fn mark(offset: i32) -> Mark {
    // Half a degree a night in mid-season, a quarter at the ends.
    let turn = f64::from(offset) / 250.0 * std::f64::consts::PI;
    let degrees = 0.25 * f64::from(offset) + 20.0 * (1.0 - libm::cos(turn));
    Mark {
        night: night(offset),
        track: Angle::from_degrees(degrees),
    }
}

/// 250 nights, all of them candidates.
fn candidates() -> Vec<Candidate> {
    (0..250)
        .map(|offset| Candidate {
            mark: mark(offset),
            quality: 0.5 + 0.4 * libm::sin(f64::from(offset)),
        })
        .collect()
}

fn path() -> Path {
    Path {
        start: mark(0),
        end: mark(250),
    }
}

fn chain() -> Chain {
    let odds = [
        0.25, 0.30, 0.35, 0.40, 0.45, 0.50, 0.55, 0.55, 0.50, 0.40, 0.25, 0.25,
    ];
    let weather = Weather {
        odds: Some(MonthlyOdds::new(odds).expect("odds")),
        persistence: Persistence::new(0.3).expect("persistence"),
        ..Weather::default()
    };
    weather
        .chain(night(0), night(250), None, Forecast::default())
        .expect("a chain")
}

/// 250 nights, 40 outings; gaps in degrees on a path of 102.
#[divan::bench(args = [5, 7, 10, 20, 50, 100])]
fn policy(bencher: divan::Bencher, gap: u32) {
    advice(bencher, f64::from(gap), 40, false);
}

/// The same when the weather is always seen.
#[divan::bench(args = [7, 20, 100])]
fn policy_weather_seen(bencher: divan::Bencher, gap: u32) {
    advice(bencher, f64::from(gap), 40, true);
}

/// A gap that cannot be held: the least widest gap is sought.
#[divan::bench(args = [40, 10])]
fn policy_for_a_gap_that_cannot_be_held(bencher: divan::Bencher, outings: usize) {
    advice(bencher, 0.3, outings, false);
}

fn advice(bencher: divan::Bencher, gap: f64, outings: usize, weather_always_seen: bool) {
    let (candidates, chain) = (candidates(), chain());
    let gap = Gap::Along(Angle::from_degrees(gap));
    let request = AdviceRequest {
        candidates: &candidates,
        path: path(),
        frames: &[],
        outings,
        gap,
        weather_always_seen,
    };
    bencher.bench_local(|| advise(&request, &chain).expect("advice").chance);
}

/// 250 nights, so many dates, three reserves of each within ten days; with all chances.
#[divan::bench(args = [12, 25, 60])]
fn dates(bencher: divan::Bencher, count: usize) {
    let (candidates, chain) = (candidates(), chain());
    let request = PickRequest {
        candidates: &candidates,
        path: path(),
        frames: &[],
        count,
        measure: Measure::Angle,
        must_have: &[],
        reserve_rule: ReserveRule::WithinDays(10),
        reserves: 3,
        evenness: PickRequest::DEFAULT_EVENNESS,
        fill: PickRequest::DEFAULT_FILL,
    };
    bencher.bench_local(|| {
        pick_dates(&request, &chain)
            .expect("dates")
            .chances
            .all_filled
    });
}
