//! Nights and spells against searches by brute force with the full chain of places, and against almanac numbers.

mod common;

use common::table;
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

/// Compares the nights of a span; returns how many spells there were, and how many of them were shorter than a minute.
#[allow(
    clippy::too_many_arguments,
    reason = "one argument for each thing that is varied"
)]
fn compare(
    sky: &Sky,
    place: &Site,
    body: Body,
    span: Span,
    rules: &NightRules,
    skyline: &Skyline,
    offset: i32,
    label: &str,
) -> (usize, usize) {
    let tracks = SiteTracks::new(sky, place, body, span).expect("covered");
    let clock = LocalClock::fixed(offset);
    let openings = Openings::new(sky, &tracks, rules, &clock).expect("dates");
    let outcomes = spells(&tracks, &openings, skyline);
    assert_eq!(outcomes.len(), tracks.night_spans().len());
    let (mut count, mut short) = (0, 0);
    for (outcome, night) in outcomes.iter().zip(tracks.night_spans()) {
        let found = outcome.spells();
        count += found.len();
        short += found.iter().filter(|spell| spell.minutes() < 1.0).count();
        let margins = margins_by_the_second(sky, place, body, rules, skyline, offset, night.span);
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
                "{label}, second {k} of the night: margin {margin} deg, yet {}",
                if ours { "in a spell" } else { "in none" }
            );
        }
    }
    (count, short)
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
        let label = format!("case {case} (seed {seed}), {body:?} at latitude {latitude}");
        let (all, brief) = compare(&sky, &place, body, span, &rules, &skyline, offset, &label);
        count += all;
        short += brief;
    }
    (count, short)
}

/// Brute force at steps of a second with the full chain, all latitudes: edges within 2 s wherever the margin is 0.001 degrees
/// or more.
#[test]
fn edges_agree_with_brute_force() {
    let (count, _) = compare_with_brute_force(20_261_101, 12);
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

fn season(sky: &Sky, from: &str, to: &str) -> Span {
    Span {
        from: tt(sky, from),
        to: tt(sky, to),
    }
}

fn outcomes_of(
    sky: &Sky,
    site: &Site,
    body: Body,
    span: Span,
    rules: &NightRules,
    clock: &LocalClock,
    skyline: &Skyline,
) -> Vec<Outcome> {
    let tracks = SiteTracks::new(sky, site, body, span).expect("covered");
    let openings = Openings::new(sky, &tracks, rules, clock).expect("dates");
    spells(&tracks, &openings, skyline)
}

/// No Moon rule, every hour.
fn plain(least_altitude: f64, sun_below: f64) -> NightRules {
    NightRules::from(Conditions {
        least_altitude: Angle::from_degrees(least_altitude),
        sun_below: Angle::from_degrees(sun_below),
        moon: None,
        ..Conditions::default()
    })
}

#[track_caller]
fn assert_at(sky: &Sky, instant: Tt, expected: &str, seconds: f64) {
    let off = (instant.days() - tt(sky, expected).days()) * 86_400.0;
    assert!(off.abs() <= seconds, "{off} s after {expected}");
}

/// Source: `riseset.csv`, made from JPL DE440 with skyfield 1.55, printed to whole seconds.
#[test]
fn sun_moon_and_planet_agree_with_de440() {
    let sky = Sky::de440().expect("embedded");
    let mut checked = 0;
    for row in table("riseset.csv") {
        let mut place = site(row.number("lat_deg"), row.number("lon_deg"));
        place.elevation_m = row.number("elev_m");
        let from = tt(&sky, row.text("window_start_utc"));
        let span = Span {
            from: from.plus_days(0.1),
            to: from.plus_days(0.2),
        };
        let body: Body = row.text("planet").parse().expect("a planet");
        let tracks = SiteTracks::new(&sky, &place, body, span).expect("covered");
        let night = nights(&tracks, &LocalClock::fixed(0)).expect("dates")[0];
        for (column, ours) in [
            ("sunset", night.sun.set),
            ("civil_dusk", night.sun.civil_dusk),
            ("nautical_dusk", night.sun.nautical_dusk),
            ("astro_dusk", night.sun.astronomical_dusk),
            ("astro_dawn", night.sun.astronomical_dawn),
            ("nautical_dawn", night.sun.nautical_dawn),
            ("civil_dawn", night.sun.civil_dawn),
            ("sunrise", night.sun.rise),
            ("planet_rise", night.subject.rise),
            (
                "planet_transit",
                night.subject.transit.map(|transit| transit.0),
            ),
            ("planet_set", night.subject.set),
            ("moon_rise", night.moon.rise),
            ("moon_set", night.moon.set),
        ] {
            let text = row.text(column);
            match ours {
                Some(instant) => assert_at(&sky, instant, text, 1.0),
                None => assert_eq!(text, "", "{column}"),
            }
            checked += 1;
        }
        let altitude = night.subject.transit.expect("a transit").1.degrees();
        assert!((altitude - row.number("planet_transit_alt_deg")).abs() < 1e-4);
    }
    assert_eq!(checked, 260);
}

/// Source: skyfield 1.55 with JPL DE440: from Greenwich (51.4779 N, 0 E) the centre of Mars is within the Moon's mean radius
/// (1737.4 km) from 2022-12-08 05:00:34 to 05:59:34 UTC.
#[test]
fn mars_goes_behind_the_moon_and_comes_out() {
    let sky = Sky::de440().expect("embedded");
    let mut greenwich = site(51.4779, 0.0);
    greenwich.elevation_m = 0.0;
    let span = season(&sky, "2022-12-07T20:00:00Z", "2022-12-08T06:00:00Z");
    let found = outcomes_of(
        &sky,
        &greenwich,
        Body::Mars,
        span,
        &plain(10.0, -6.0),
        &LocalClock::fixed(0),
        &Skyline::default(),
    );
    let [before, after] = found[0].spells() else {
        panic!("{found:?}")
    };
    assert_at(&sky, before.finish.instant, "2022-12-08T05:00:34Z", 2.0);
    assert_at(&sky, after.start.instant, "2022-12-08T05:59:34Z", 2.0);
    assert_eq!(before.finish.cause, EdgeCause::Occultation);
    assert_eq!(after.start.cause, EdgeCause::Occultation);
    assert_eq!(after.finish.cause.words(End::Finish), "sinks below 10 deg");
    assert_eq!(before.best.because.words(), "highest");
}

/// Altitude of the Sun at midnight in polar summer: declination 23.436 degrees at the solstice of 2026-06-21 (Meeus,
/// *Astronomical Algorithms* 2nd ed., ch. 22: obliquity 23.436) less the colatitude.
#[test]
fn polar_day_and_polar_night() {
    let sky = Sky::de440().expect("embedded");
    let place = site(78.22, 15.65);
    let clock = LocalClock::fixed(3600);
    let flat = Skyline::default();
    let summer = season(&sky, "2026-06-21T12:00:00Z", "2026-06-22T06:00:00Z");
    let tracks = SiteTracks::new(&sky, &place, Body::Saturn, summer).expect("covered");
    let night = nights(&tracks, &clock).expect("dates")[0];
    assert_eq!(night.sun.daylight, Daylight::SunNeverSets);
    assert!(night.sun.set.is_none() && night.sun.rise.is_none() && night.sun.civil_dusk.is_none());
    let lowest = night.sun.lowest.degrees();
    assert!((lowest - (23.436 - 11.78)).abs() < 0.01, "{lowest}");
    let found = outcomes_of(
        &sky,
        &place,
        Body::Saturn,
        summer,
        &plain(10.0, -6.0),
        &clock,
        &flat,
    );
    let Outcome::Closed(closed) = &found[0] else {
        panic!("{found:?}")
    };
    assert_eq!(closed.condition, Condition::SunAltitude);
    let Shortfall::Angle(by) = closed.shortfall else {
        panic!("{closed:?}")
    };
    // Both the darkness asked for and the rule that the Sun is down fail all night.
    assert!((by.degrees() - (lowest + 6.0)).abs() < 0.01, "{by:?}");
    assert!((closed.lasting_days - 1.0).abs() < 1e-6 && !closed.alone);

    // In December Jupiter (declination +21.6 in 2012) never sets there, and the Sun never rises.
    let winter = season(&sky, "2012-12-20T12:00:00Z", "2012-12-23T06:00:00Z");
    let tracks = SiteTracks::new(&sky, &place, Body::Jupiter, winter).expect("covered");
    let dark = nights(&tracks, &clock).expect("dates");
    assert!(
        dark.iter()
            .all(|night| night.sun.daylight == Daylight::SunNeverRises)
    );
    assert!(
        dark.iter()
            .all(|night| night.subject.set.is_none() && night.subject.up_at_start)
    );
    let found = outcomes_of(
        &sky,
        &place,
        Body::Jupiter,
        winter,
        &plain(5.0, -6.0),
        &clock,
        &flat,
    );
    assert_eq!(found.len(), dark.len());
    for (outcome, night) in found.iter().zip(&dark) {
        let [spell] = outcome.spells() else {
            panic!("{outcome:?}")
        };
        assert_eq!(spell.span(), night.span);
        assert_eq!(spell.finish.cause.words(End::Finish), "end of night");
    }
}

/// Clocks in the European Union change at 01:00 UTC on the last Sundays of March and October (Directive 2000/84/EC).
#[test]
fn hours_across_a_change_of_the_clock() {
    let sky = Sky::de440().expect("embedded");
    let place = site(50.0, 10.0);
    let rules = NightRules::from(Conditions {
        hours: Some(Hours {
            from: ClockTime::new(20, 0).expect("a time"),
            to: ClockTime::new(2, 30).expect("a time"),
        }),
        ..plain(10.0, -6.0).conditions
    });
    let run = |body: Body, day: &str, next: &str, change: &str, before: i32, after: i32| {
        let change = utc(change);
        let span = season(&sky, day, next);
        let offset = |at: Utc| Ok::<_, ()>(if at < change { before } else { after });
        let clock = LocalClock::sampled(utc(day).plus_days(-1.0), utc(next).plus_days(1.0), offset)
            .expect("offsets");
        assert_eq!(clock.offset_seconds(change), after);
        assert_eq!(clock.offset_seconds(change.plus_seconds(-1.0)), before);
        outcomes_of(
            &sky,
            &place,
            body,
            span,
            &rules,
            &clock,
            &Skyline::default(),
        )
    };
    // Saturn is up all that night until 03:30 UTC.
    let autumn = run(
        Body::Saturn,
        "2026-10-24T18:00:00Z",
        "2026-10-25T05:00:00Z",
        "2026-10-25T01:00:00Z",
        7200,
        3600,
    );
    let [first, second] = autumn[0].spells() else {
        panic!("{autumn:?}")
    };
    assert_at(&sky, first.start.instant, "2026-10-24T18:00:00Z", 0.5);
    assert_at(&sky, first.finish.instant, "2026-10-25T00:30:00Z", 0.5);
    assert_at(&sky, second.start.instant, "2026-10-25T01:00:00Z", 0.5);
    assert_at(&sky, second.finish.instant, "2026-10-25T01:30:00Z", 0.5);
    assert_eq!(second.finish.cause.words(End::Finish), "hours end");
    // Half past two is skipped: the hours end with the change. Jupiter stands high until after 02:00 UTC.
    let spring = run(
        Body::Jupiter,
        "2027-03-27T18:00:00Z",
        "2027-03-28T05:00:00Z",
        "2027-03-28T01:00:00Z",
        3600,
        7200,
    );
    let [only] = spring[0].spells() else {
        panic!("{spring:?}")
    };
    assert_at(&sky, only.finish.instant, "2027-03-28T01:00:00Z", 0.5);
}

/// A subject that passes the zenith with a wall on the eastern side, and one that shows for seconds between two chimneys:
/// against brute force.
#[test]
fn through_the_zenith_and_through_a_slit() {
    let sky = Sky::de440().expect("embedded");
    // Jupiter's declination on that night is +21.0 degrees (the engine's own; only to make the case).
    let place = site(21.0, 30.0);
    let span = season(&sky, "2014-01-05T20:00:00Z", "2014-01-06T01:00:00Z");
    let vantage = sky.observer(&place, span.from).expect("covered");
    let jupiter = vantage.place(Body::Jupiter).expect("covered");
    let mut place = place;
    place.latitude = jupiter.equatorial_of_date().latitude;
    let wall = Skyline::new(vec![
        point(0.0, 88.0, Some("the east tower")),
        point(180.0, 88.0, None),
        point(180.0, 5.0, None),
        point(360.0, 5.0, None),
    ])
    .expect("a skyline");
    let rules = plain(10.0, -6.0);
    let (count, _) = compare(
        &sky,
        &place,
        Body::Jupiter,
        span,
        &rules,
        &wall,
        0,
        "zenith",
    );
    assert_eq!(count, 1);
    let found = outcomes_of(
        &sky,
        &place,
        Body::Jupiter,
        span,
        &rules,
        &LocalClock::fixed(0),
        &wall,
    );
    let spell = &found[0].spells()[0];
    assert!(spell.best.altitude.degrees() > 89.9, "{spell:?}");

    // On a meridian 0.02 degrees wide Jupiter, at 15 degrees an hour and 45 up, stays about four seconds.
    let place = site(-24.0, 30.0);
    let slit = Skyline::new(vec![
        point(0.01, 5.0, None),
        point(0.01, 80.0, None),
        point(359.99, 80.0, None),
        point(359.99, 5.0, None),
    ])
    .expect("a skyline");
    let (count, short) = compare(&sky, &place, Body::Jupiter, span, &rules, &slit, 0, "slit");
    assert_eq!((count, short), (1, 1));
}

#[test]
fn a_spell_says_what_hides_the_subject_and_how_sure_the_minute_is() {
    let sky = Sky::de440().expect("embedded");
    // On the equator with Neptune near it: straight up at 15.04 degrees an hour.
    let place = site(0.0, 0.0);
    let span = season(&sky, "2025-09-22T20:00:00Z", "2025-09-23T03:00:00Z");
    let skyline = Skyline::new(vec![
        point(0.0, 2.0, None),
        point(80.0, 2.0, None),
        point(80.0, 20.0, Some("the water tower")),
        point(100.0, 20.0, None),
        point(100.0, 2.0, Some("the plain")),
    ])
    .expect("a skyline");
    let found = outcomes_of(
        &sky,
        &place,
        Body::Neptune,
        span,
        &plain(1.0, -6.0),
        &LocalClock::fixed(0),
        &skyline,
    );
    let spell = &found[0].spells()[0];
    let words = spell.start.cause.words(End::Start);
    assert!(
        words.starts_with("comes out from behind the water tower, az 9"),
        "{words}"
    );
    // 0.5 degrees of skyline over 15.04 degrees an hour; refraction at 20 degrees adds hardly anything.
    let minutes = spell.start.uncertainty_minutes;
    assert!((minutes - 0.5 / 15.04 * 60.0).abs() < 0.05, "{minutes}");
    let end = spell.finish.cause.words(End::Finish);
    assert!(
        end.starts_with("goes behind") || end.starts_with("civil twilight"),
        "{end}"
    );
}

/// Common practice, no source: 5 minutes after the upper limb has gone below the true horizon, to 10 before it returns.
#[test]
fn the_sun_is_down_by_the_true_horizon() {
    assert_eq!(SunDownRule::widened(1.0, 1.0).minutes(), Some((5.0, 10.0)));
    assert_eq!(
        SunDownRule::widened(30.0, 20.0).minutes(),
        Some((30.0, 20.0))
    );
    let sky = Sky::de440().expect("embedded");
    let mut place = site(45.0, 0.0);
    place.height_above_surroundings_m = 400.0;
    let span = season(&sky, "2027-02-10T20:00:00Z", "2027-02-11T03:00:00Z");
    let rules = plain(10.0, 5.0);
    let hill = Skyline::new(vec![point(0.0, 9.0, None)]).expect("a skyline");
    let found = outcomes_of(
        &sky,
        &place,
        Body::Mars,
        span,
        &rules,
        &LocalClock::fixed(0),
        &hill,
    );
    let spells = found[0].spells();
    let last = spells.last().expect("Mars is up until morning");
    assert_eq!(
        last.finish.cause.words(End::Finish),
        "10 min before sunrise"
    );
    let sunrise = last.finish.instant.plus_seconds(600.0);
    let vantage = sky.observer(&place, sunrise).expect("covered");
    let sun = vantage.place(Body::Sun).expect("covered");
    let centre = vantage.horizontal(sun.apparent).expect("a site").altitude;
    let limb = centre + semidiameter(Body::Sun, sun.distance_au);
    let limb = apparent_from_true(limb, &place.air).degrees();
    // 1.76' times the square root of the height in metres, the navigator's rule (from memory).
    let dip = 1.76 * 400.0_f64.sqrt() / 60.0;
    assert!((limb + dip).abs() < 0.01, "{limb} and {dip}");
}

#[test]
fn daylight_only_when_asked_for_and_with_its_caution() {
    use loopwright::sky::Caution;
    let sky = Sky::de440().expect("embedded");
    let place = site(45.0, 0.0);
    // Venus passes its inferior conjunction on 2026 October 24.
    let span = season(&sky, "2026-10-24T08:00:00Z", "2026-10-24T10:00:00Z");
    let mut rules = plain(10.0, 90.0);
    let flat = Skyline::default();
    let clock = LocalClock::fixed(0);
    let found = outcomes_of(&sky, &place, Body::Venus, span, &rules, &clock, &flat);
    assert!(
        matches!(found[0], Outcome::Closed(closed) if closed.condition == Condition::SunDown
        || closed.condition == Condition::LeastAltitude),
        "{found:?}"
    );
    rules.sun_down = SunDownRule::daylight_as_the_user_asked();
    let found = outcomes_of(&sky, &place, Body::Venus, span, &rules, &clock, &flat);
    let spells = found[0].spells();
    assert!(!spells.is_empty());
    assert!(
        spells
            .iter()
            .all(|spell| spell.cautions.contains(Caution::SunNear))
    );
}

#[test]
fn a_closed_night_says_what_is_missing() {
    let sky = Sky::de440().expect("embedded");
    let place = site(50.0, 10.0);
    let clock = LocalClock::fixed(3600);
    let flat = Skyline::default();
    // Mars at its opposition of 2027 February 19, near the full Moon of February 20.
    let span = season(&sky, "2027-02-19T20:00:00Z", "2027-02-20T03:00:00Z");
    let night = |rules: &NightRules, skyline: &Skyline| {
        let found = outcomes_of(&sky, &place, Body::Mars, span, rules, &clock, skyline);
        let Outcome::Closed(closed) = found[0] else {
            panic!("{found:?}")
        };
        closed
    };
    let mut rules = plain(10.0, -6.0);
    let wall = Skyline::new(vec![point(0.0, 80.0, None)]).expect("a skyline");
    let closed = night(&rules, &wall);
    assert_eq!(closed.condition, Condition::Skyline);
    let Shortfall::Angle(by) = closed.shortfall else {
        panic!("{closed:?}")
    };
    let seen = sky
        .observer(&place, closed.nearest.expect("an instant"))
        .and_then(|vantage| {
            let mars = vantage.place(Body::Mars)?;
            Ok((mars.equatorial_of_date().latitude.degrees(), mars))
        })
        .expect("covered");
    // Height at culmination: 90 - latitude + declination, and a hundredth of a degree of refraction.
    let expected = 80.0 - (90.0 - 50.0 + seen.0) - 0.01;
    assert!((by.degrees() - expected).abs() < 0.02, "{by:?} {expected}");
    let words = closed.words();
    let start = format!("{:.1} deg behind the skyline at best, for ", by.degrees());
    assert!(words.starts_with(&start), "{words}");
    // The subject would be up and the sky dark for most of a winter night.
    assert!((0.4..0.6).contains(&closed.lasting_days), "{words}");

    rules.conditions.moon = Some(MoonRule {
        least_distance: Angle::from_degrees(120.0),
        unless_lit_below: 0.0,
    });
    let closed = night(&rules, &flat);
    assert_eq!(closed.condition, Condition::Moon);
    assert!(closed.alone);

    rules.conditions.moon = None;
    rules.conditions.weekdays = Weekdays::from_days(&[Weekday::Saturday]).expect("a day");
    // That evening is a Friday.
    assert_eq!(
        CivilDate::new(2027, 2, 19).expect("a date").weekday(),
        Weekday::Friday
    );
    let closed = night(&rules, &flat);
    assert_eq!(closed.words(), "not an open weekday");

    rules.conditions.weekdays = Weekdays::ALL;
    rules.conditions.hours = Some(Hours {
        from: ClockTime::new(12, 0).expect("a time"),
        to: ClockTime::new(13, 0).expect("a time"),
    });
    let closed = night(&rules, &flat);
    assert!(
        !closed.alone || closed.condition == Condition::Hours,
        "{closed:?}"
    );

    // Numbers that are none close the night; they do not hang or open it.
    let nonsense = plain(f64::NAN, f64::NAN);
    night(&nonsense, &flat);
}

/// Nights are named by the evening; a site just west of the date line in its own zone.
#[test]
fn a_night_has_the_date_of_its_evening() {
    let sky = Sky::de440().expect("embedded");
    let place = site(-40.0, 179.0);
    let span = season(&sky, "2027-02-19T08:00:00Z", "2027-02-19T09:00:00Z");
    let tracks = SiteTracks::new(&sky, &place, Body::Mars, span).expect("covered");
    let night = nights(&tracks, &LocalClock::fixed(12 * 3600)).expect("dates")[0];
    assert_eq!(night.date, CivilDate::new(2027, 2, 19).expect("a date"));
    // 12h - 179/15 h = 00:04 UTC.
    assert_at(&sky, night.span.from, "2027-02-19T00:04:00Z", 1.0);
}

#[test]
fn limits_are_written_as_they_were_set() {
    let sun = |limit: f64, end: End| {
        let limit = Angle::from_degrees(limit);
        EdgeCause::SunAltitude { limit }.words(end)
    };
    assert_eq!(sun(-6.0, End::Start), "end of civil twilight");
    assert_eq!(sun(-12.0, End::Finish), "nautical twilight");
    assert_eq!(sun(-6.5, End::Start), "Sun 6.5 deg down");
    assert_eq!(sun(3.0, End::Start), "Sun 3 deg up");
    let limit = Angle::from_degrees(7.5);
    let words = EdgeCause::LeastAltitude { limit }.words(End::Start);
    assert_eq!(words, "rises above 7.5 deg");
}
