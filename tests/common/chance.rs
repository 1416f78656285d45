//! Weather by brute force: every sequence of clear and cloudy nights with its chance, or sequences drawn with a fixed seed.
#![allow(dead_code)] // every test file uses its own part

use loopwright::season::picks::{Candidate, Mark};
use loopwright::season::weather::{Chain, MonthlyOdds, Persistence, Weather};
use loopwright::sky::Angle;
use loopwright::sky::calendar::CivilDate;

/// SplitMix64 (Steele, Lea and Flood 2014, OOPSLA): the same draws on every system.
pub struct Draws(pub u64);

impl Draws {
    fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// From 0 up to but not including 1.
    pub fn unit(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1_u64 << 53) as f64
    }

    pub fn between(&mut self, least: f64, most: f64) -> f64 {
        least + (most - least) * self.unit()
    }

    /// From 0 up to but not including `count`.
    pub fn below(&mut self, count: usize) -> usize {
        (self.unit() * count as f64) as usize
    }
}

pub fn date(text: &str) -> CivilDate {
    text.parse().expect("a date")
}

pub fn after(night: CivilDate, days: i32) -> CivilDate {
    night.plus_days(days).expect("a date")
}

pub fn mark(night: CivilDate, degrees: f64) -> Mark {
    Mark {
        night,
        track: Angle::from_degrees(degrees),
    }
}

pub fn candidate(night: CivilDate, degrees: f64, quality: f64) -> Candidate {
    Candidate {
        mark: mark(night, degrees),
        quality,
    }
}

pub fn weather(odds: [f64; 12], persistence: f64) -> Weather {
    Weather {
        odds: Some(MonthlyOdds::new(odds).expect("odds")),
        persistence: Persistence::new(persistence).expect("persistence"),
        ..Weather::default()
    }
}

/// Every sequence of the chain's nights (true is clear) with its chance: the product of its steps.
pub fn all_weathers(chain: &Chain) -> Vec<(Vec<bool>, f64)> {
    let mut sequences = vec![(Vec::new(), 1.0)];
    for step in chain.steps() {
        sequences = sequences
            .into_iter()
            .flat_map(|(nights, chance): (Vec<bool>, f64)| {
                let clear = if nights.last() == Some(&true) {
                    step.after_clear
                } else {
                    step.after_cloud
                };
                [(true, clear), (false, 1.0 - clear)].map(|(sky, p)| {
                    let mut longer = nights.clone();
                    longer.push(sky);
                    (longer, chance * p)
                })
            })
            .collect();
    }
    sequences
}

/// One sequence of the chain's nights.
pub fn draw_weather(chain: &Chain, draws: &mut Draws) -> Vec<bool> {
    let mut last = false;
    let draw = |step: &loopwright::season::weather::Step| {
        last = draws.unit()
            < if last {
                step.after_clear
            } else {
                step.after_cloud
            };
        last
    };
    chain.steps().iter().map(draw).collect()
}

/// The widest gap between the start, places on the path in order, and the end.
pub fn widest(start: f64, places: &[f64], end: f64) -> f64 {
    let mut before = start;
    let mut widest = 0.0_f64;
    for &place in places.iter().chain([&end]) {
        widest = widest.max(place - before);
        before = place;
    }
    widest
}

/// Whether a share of so many draws agrees with a chance, to five standard deviations.
pub fn agrees(share: f64, chance: f64, draws: usize) -> bool {
    (share - chance).abs() <= 5.0 * (chance * (1.0 - chance) / draws as f64).sqrt() + 1e-12
}
