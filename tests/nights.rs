//! Nights and spells against searches by brute force with the full chain of places, and against almanac numbers.

use loopwright::season::nights::{Daylight, LocalClock, nights};
use loopwright::season::spells::{EdgeCause, End, Outcome, spells};
use loopwright::season::{
    ClockTime, Condition, Conditions, Hours, MoonRule, NightRules, Openings, Shortfall, SiteTracks,
    Span, SunDownRule, Weekdays,
};
use loopwright::sky::calendar::{CivilDate, Weekday, parse_utc};
use loopwright::sky::physical::semidiameter;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::{Air, apparent_from_true, horizon_dip, true_from_apparent};
use loopwright::sky::skyline::SkylinePoint;
use loopwright::sky::{Angle, Body, Site, Skyline, Tt, Utc};

/// A small generator with a fixed seed (Steele, Lea and Flood 2014, OOPSLA, "SplitMix").
struct Random(u64);

impl Random {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
    }

    fn within(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.next()
    }

    fn below(&mut self, count: usize) -> usize {
        ((self.next() * count as f64) as usize).min(count - 1)
    }
}

fn site(latitude: f64, longitude: f64) -> Site {
    Site {
        name: "Somewhere".into(),
        latitude: Angle::from_degrees(latitude),
        longitude: Angle::from_degrees(longitude),
        elevation_m: 300.0,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.25,
    }
}

fn utc(text: &str) -> Utc {
    parse_utc(text).expect("a time")
}

fn tt(sky: &Sky, text: &str) -> Tt {
    sky.tables().tt_from_utc(utc(text))
}

fn point(azimuth: f64, altitude: f64, name: Option<&str>) -> SkylinePoint {
    SkylinePoint {
        azimuth,
        altitude,
        name: name.map(str::to_owned),
    }
}

/// Slopes, walls and narrow notches.
fn random_skyline(random: &mut Random) -> Skyline {
    let count = random.below(40);
    let mut points = Vec::new();
    for _ in 0..count {
        let azimuth = random.within(0.0, 359.0);
        let altitude = random.within(-2.0, 25.0) * random.next();
        points.push(point(azimuth, altitude, None));
        if random.next() < 0.4 {
            points.push(point(azimuth, random.within(-1.0, 30.0), None));
        }
        if random.next() < 0.2 {
            // A gap between two houses, a few hundredths of a degree wide.
            let width = random.within(0.01, 0.3);
            points.push(point(azimuth + width, random.within(10.0, 30.0), None));
            points.push(point(azimuth + width, random.within(0.0, 5.0), None));
            points.push(point(azimuth + 1.5 * width, 2.0, None));
            points.push(point(azimuth + 1.5 * width, 20.0, None));
        }
    }
    Skyline::new(points).unwrap_or_default()
}

fn random_conditions(random: &mut Random) -> Conditions {
    Conditions {
        least_altitude: Angle::from_degrees(random.within(-1.0, 35.0) * random.next()),
        clearance: Angle::from_degrees(if random.next() < 0.5 {
            0.0
        } else {
            random.within(0.0, 2.0)
        }),
        sun_below: Angle::from_degrees(random.within(-18.0, 0.5)),
        moon: (random.next() < 0.6).then(|| MoonRule {
            least_distance: Angle::from_degrees(random.within(1.0, 60.0)),
            unless_lit_below: if random.next() < 0.5 {
                0.0
            } else {
                random.within(0.0, 0.6)
            },
        }),
        hours: (random.next() < 0.4).then(|| Hours {
            from: ClockTime::new(random.below(24) as u8, random.below(60) as u8).expect("a time"),
            to: ClockTime::new(random.below(24) as u8, random.below(60) as u8).expect("a time"),
        }),
        weekdays: Weekdays::ALL,
    }
}

/// Signed distance to the nearest broken or next broken condition, degrees, second by second through a night, from the full
/// chain of places. What has no measure counts as 90 degrees.
fn margins_by_the_second(
    sky: &Sky,
    site: &Site,
    body: Body,
    rules: &NightRules,
    skyline: &Skyline,
    offset_seconds: i32,
    night: Span,
) -> Vec<f64> {
    let c = &rules.conditions;
    let horizon = true_from_apparent(-horizon_dip(site.height_above_surroundings_m), &site.air);
    let seconds = (night.days() * 86_400.0).round() as i64;
    let (after, before) = rules.sun_down.minutes().expect("the Sun is down");
    let (after, before) = ((after * 60.0) as i64, (before * 60.0) as i64);
    let at = |k: i64| night.from.plus_seconds(k as f64);
    let suns: Vec<(f64, bool)> = (-after..seconds + before + 2)
        .map(|k| {
            let vantage = sky.observer(site, at(k)).expect("covered");
            let sun = vantage.place(Body::Sun).expect("covered");
            let altitude = vantage.horizontal(sun.apparent).expect("a site").altitude;
            let limb = altitude + semidiameter(Body::Sun, sun.distance_au);
            (altitude.degrees(), limb < horizon)
        })
        .collect();
    // Number of seconds with the Sun up before each instant.
    let mut up_before = vec![0_i64];
    for sun in &suns {
        up_before.push(up_before.last().expect("one") + i64::from(!sun.1));
    }
    (0..seconds)
        .map(|k| {
            let from = (k + after - after) as usize;
            let to = (k + after + before + 1) as usize;
            let down = up_before[to] == up_before[from];
            let mut margin = c.sun_below.degrees() - suns[(k + after) as usize].0;
            if !down {
                margin = margin.min(-90.0);
            }
            if let Some(hours) = c.hours {
                let utc = sky.tables().utc_from_tt(at(k)).days();
                let minute =
                    (utc + 0.5).rem_euclid(1.0) * 1440.0 + f64::from(offset_seconds) / 60.0;
                let minute = minute.rem_euclid(1440.0);
                let (a, b) = (
                    f64::from(hours.from.minutes()),
                    f64::from(hours.to.minutes()),
                );
                let open = if a <= b {
                    a <= minute && minute < b
                } else {
                    a <= minute || minute < b
                };
                if !open {
                    margin = -90.0;
                }
            }
            if margin < -0.01 {
                // The others can only make it less.
                return margin;
            }
            let vantage = sky.observer(site, at(k)).expect("covered");
            let place = vantage.place(body).expect("covered");
            let seen = vantage.horizontal(place.apparent).expect("a site");
            let apparent = apparent_from_true(seen.altitude, &site.air);
            margin = margin.min((apparent - c.least_altitude).degrees());
            let wall = skyline.altitude_at(seen.azimuth) + c.clearance;
            margin = margin.min((apparent - wall).degrees());
            if body != Body::Moon {
                let moon = vantage.place(Body::Moon).expect("covered");
                let altitude = vantage.horizontal(moon.apparent).expect("a site").altitude;
                let radius = semidiameter(Body::Moon, moon.distance_au);
                let separation = place.separation(&moon);
                margin = margin.min((separation - radius).degrees());
                if let Some(rule) = c.moon {
                    let mut spare = (horizon - radius - altitude).degrees();
                    spare = spare.max((separation - rule.least_distance).degrees());
                    let lit = moon.geometry().lit_fraction();
                    spare = spare.max((rule.unless_lit_below - lit) * 90.0);
                    margin = margin.min(spare);
                }
            }
            margin
        })
        .collect()
}

/// Compares nights at random sites, dates, skylines and rules; returns how many spells there were, and how many of them were
/// shorter than a minute.
fn compare_with_brute_force(seed: u64, cases: usize) -> (usize, usize) {
    let sky = Sky::de440().expect("embedded");
    let mut random = Random(seed);
    let (mut count, mut short) = (0, 0);
    for case in 0..cases {
        let latitude = [random.within(-90.0, 90.0), 90.0, -90.0, 0.0, 78.0][if random.next() < 0.8 {
            0
        } else {
            random.below(5)
        }];
        let mut place = site(latitude, random.within(-180.0, 180.0));
        place.height_above_surroundings_m = random.within(0.0, 300.0);
        place.air.pressure_hpa = random.within(700.0, 1030.0);
        place.air.temperature_c = random.within(-20.0, 25.0);
        let mut bodies = Body::PLANETS.to_vec();
        bodies.push(Body::Moon);
        let body = bodies[random.below(bodies.len())];
        let start = Tt::from_days(random.within(-18_000.0, 18_000.0));
        let span = Span {
            from: start,
            to: start.plus_days(0.01),
        };
        let rules = NightRules::from(random_conditions(&mut random));
        let skyline = random_skyline(&mut random);
        let offset = (random.below(25) as i32 - 12) * 3600;
        let tracks = SiteTracks::new(&sky, &place, body, span).expect("covered");
        let clock = LocalClock::fixed(offset);
        let openings = Openings::new(&sky, &tracks, &rules, &clock).expect("dates");
        let outcomes = spells(&tracks, &openings, &skyline);
        assert_eq!(outcomes.len(), tracks.night_spans().len());
        for (outcome, night) in outcomes.iter().zip(tracks.night_spans()) {
            let found = outcome.spells();
            count += found.len();
            short += found.iter().filter(|spell| spell.minutes() < 1.0).count();
            let margins =
                margins_by_the_second(&sky, &place, body, &rules, &skyline, offset, night.span);
            let mut wrong = 0;
            for (k, &margin) in margins.iter().enumerate() {
                let instant = night.span.from.plus_seconds(k as f64);
                let ours = found.iter().any(|spell| spell.span().contains(instant));
                if ours == (margin >= 0.0) || margin.abs() < 0.001 {
                    wrong = 0;
                    continue;
                }
                wrong += 1;
                assert!(
                    wrong <= 2,
                    "case {case} (seed {seed}): {body:?} at latitude {latitude}, second {k} of the night: \
                     margin {margin} deg, yet {}",
                    if ours { "in a spell" } else { "in none" }
                );
            }
        }
    }
    (count, short)
}

/// Brute force at steps of a second with the full chain, all latitudes: edges within 2 s wherever the margin is 0.001 degrees
/// or more.
#[test]
fn edges_agree_with_brute_force() {
    let (count, _) = compare_with_brute_force(20_261_101, 14);
    assert!(count >= 5, "only {count} spells were compared");
}

/// The same at length; run with `cargo test --release --test nights -- --ignored`.
#[test]
#[ignore = "takes minutes"]
fn edges_agree_with_brute_force_at_length() {
    let (count, short) = compare_with_brute_force(7, 700);
    println!("{count} spells, {short} of them shorter than a minute");
    assert!(short > 0);
}
