//! Events against tables made from JPL DE440 with skyfield 1.55 (the head of each file in `tests/data` says how).

mod common;

use common::{degrees_apart, table};
use loopwright::season::events::{Kinds, events};
use loopwright::season::{Event, EventKind, EventValue, Span, loops};
use loopwright::sky::place::Sky;
use loopwright::sky::{Body, Tt};
use proptest::prelude::*;

fn span(from_jd: f64, to_jd: f64) -> Span {
    Span {
        from: Tt::from_julian_date(from_jd),
        to: Tt::from_julian_date(to_jd),
    }
}

/// How far an instant may be off, in seconds.
fn tolerance_seconds(body: Body, kind: EventKind) -> f64 {
    match kind {
        EventKind::StationRetrograde
        | EventKind::StationDirect
        | EventKind::RaStationRetrograde
        | EventKind::RaStationDirect => match body {
            Body::Uranus | Body::Neptune => 900.0,
            _ => 120.0,
        },
        EventKind::GreatestElongationEast | EventKind::GreatestElongationWest => 60.0,
        EventKind::ClosestApproach | EventKind::ClosestApproachLightTime => 120.0,
        _ => 5.0,
    }
}

fn value_of(event: &Event) -> f64 {
    match event.value {
        EventValue::Longitude(angle)
        | EventValue::RightAscension(angle)
        | EventValue::Elongation(angle)
        | EventValue::Separation(angle) => angle.degrees(),
        EventValue::DistanceAu(value) | EventValue::Magnitude(value) => value,
        EventValue::Constellation(_) => f64::NAN,
    }
}

#[test]
fn nothing_missed_and_nothing_invented_2000_to_2035() {
    let sky = Sky::de440().unwrap();
    let rows = table("events_2000_2035.csv");
    assert_eq!(rows.len(), 737);
    // 2000-01-01 to 2036-01-01 TT.
    let span = span(2_451_544.5, 2_464_693.5);
    for body in [Body::Venus, Body::Mars, Body::Saturn] {
        let ours = events(&sky, &[body], Kinds::CONFIGURATIONS, span).unwrap();
        let theirs: Vec<_> = rows
            .iter()
            .filter(|row| row.text("body") == body.word())
            .collect();
        let mut worst: std::collections::BTreeMap<&str, f64> = std::collections::BTreeMap::new();
        for row in &theirs {
            let instant = row.tt("jd_tt");
            let event = ours
                .iter()
                .filter(|event| event.kind.word() == row.text("kind"))
                .min_by(|a, b| {
                    let off = |e: &Event| (e.instant.days() - instant.days()).abs();
                    off(a).total_cmp(&off(b))
                })
                .unwrap_or_else(|| panic!("{body}: no {}", row.text("kind")));
            let off = (event.instant.days() - instant.days()).abs() * 86_400.0;
            let limit = tolerance_seconds(body, event.kind);
            assert!(
                off < limit,
                "{body} {} {}: {off} s",
                row.text("kind"),
                row.text("utc")
            );
            let slot = worst.entry(event.kind.word()).or_default();
            *slot = slot.max(off);
            let value_off = match row.text("value_is") {
                "dist_au" => (value_of(event) - row.number("value")).abs(),
                _ => degrees_apart(value_of(event), row.number("value")).abs(),
            };
            assert!(
                value_off < 5e-5,
                "{body} {} {}: value off by {value_off}",
                row.text("kind"),
                row.text("utc")
            );
        }
        assert_eq!(
            ours.len(),
            theirs.len(),
            "{body}: as many events as in the table"
        );
        println!("{body}: worst offsets in seconds {worst:?}");
    }
}

/// Mercury 1950-1960, Jupiter 2020-2050, Uranus 1950-2050, Neptune 1985-2050: the head of the table says how it was made.
#[test]
fn the_other_planets_agree_with_de440() {
    let sky = Sky::de440().unwrap();
    let rows = table("events_other_planets.csv");
    assert!(rows.len() > 1_500, "{}", rows.len());
    let kinds = Kinds::of(&[
        EventKind::Conjunction,
        EventKind::InferiorConjunction,
        EventKind::SuperiorConjunction,
        EventKind::Opposition,
        EventKind::QuadratureEast,
        EventKind::QuadratureWest,
        EventKind::StationRetrograde,
        EventKind::StationDirect,
        EventKind::RaStationRetrograde,
        EventKind::RaStationDirect,
        EventKind::GreatestElongationEast,
        EventKind::GreatestElongationWest,
    ]);
    for (body, from, to) in [
        (Body::Mercury, 2_433_282.5, 2_437_282.5),
        (Body::Jupiter, 2_458_849.5, 2_469_807.5),
        (Body::Uranus, 2_433_282.5, 2_469_807.5),
        (Body::Neptune, 2_446_000.5, 2_469_807.5),
    ] {
        // The table's search may miss or gain an event at the very ends of its span.
        let ours = events(&sky, &[body], kinds, span(from + 8.0, to - 8.0)).unwrap();
        let theirs: Vec<_> = rows
            .iter()
            .filter(|row| row.text("body") == body.word())
            .filter(|row| (from + 8.0..to - 8.0).contains(&row.number("jd_tt")))
            .collect();
        let mut worst = 0.0_f64;
        for row in &theirs {
            let instant = row.tt("jd_tt");
            let off = ours
                .iter()
                .filter(|event| event.kind.word() == row.text("kind"))
                .map(|event| (event.instant.days() - instant.days()).abs() * 86_400.0)
                .fold(f64::MAX, f64::min);
            let kind = ours
                .iter()
                .find(|event| event.kind.word() == row.text("kind"))
                .expect("the kind")
                .kind;
            let limit = tolerance_seconds(body, kind);
            assert!(
                off < limit,
                "{body} {} {}: {off} s",
                row.text("kind"),
                row.text("jd_tt")
            );
            worst = worst.max(off);
        }
        assert_eq!(
            ours.len(),
            theirs.len(),
            "{body}: as many events as in the table"
        );
        println!("{body}: {} events, worst {worst:.1} s", ours.len());
    }
}

#[test]
fn loops_2010_to_2030() {
    let sky = Sky::de440().unwrap();
    let rows = table("loops_2010_2030.csv");
    assert_eq!(rows.len(), 120);
    // 2010-01-01 to 2030-01-01 TT.
    let whole = span(2_455_197.5, 2_462_502.5);
    for body in [
        Body::Mercury,
        Body::Venus,
        Body::Mars,
        Body::Jupiter,
        Body::Saturn,
    ] {
        let ours: Vec<_> = loops(&sky, body, whole)
            .unwrap()
            .into_iter()
            .filter(|l| {
                whole.contains(l.station_retrograde.instant)
                    && whole.contains(l.station_direct.instant)
            })
            .collect();
        let theirs: Vec<_> = rows
            .iter()
            .filter(|row| row.text("body") == body.word())
            .collect();
        assert_eq!(ours.len(), theirs.len(), "{body}");
        for (ours, row) in ours.iter().zip(theirs) {
            let seconds = |a: Tt, column: &str| (a.days() - row.tt(column).days()).abs() * 86_400.0;
            let name = format!("{body} {}", row.text("utc_st1"));
            assert!(
                seconds(ours.station_retrograde.instant, "jd_st1") < 120.0,
                "{name}"
            );
            assert!(
                seconds(ours.station_direct.instant, "jd_st2") < 120.0,
                "{name}"
            );
            assert!(
                (ours.arc().degrees() - row.number("arc_deg")).abs() < 5e-5,
                "{name}"
            );
            assert!(
                (ours.duration_days() - row.number("duration_d")).abs() < 2e-3,
                "{name}"
            );
            let middle = ours.middle.as_ref().expect("a middle");
            assert_eq!(middle.kind.word(), row.text("mid_kind"), "{name}");
            assert!(seconds(middle.instant, "jd_mid") < 5.0, "{name}");
            let closest = ours.closest.as_ref().expect("a closest approach");
            assert!(seconds(closest.instant, "jd_closest") < 120.0, "{name}");
            assert!(
                (value_of(closest) - row.number("closest_au")).abs() < 1e-7,
                "{name}"
            );
            let diameter = ours.largest_diameter.expect("a diameter").arcsec();
            assert!(
                (diameter - row.number("max_diam_arcsec")).abs() < 1e-3,
                "{name} {diameter}"
            );
            let brightest = ours.brightest.as_ref().expect("a greatest brightness");
            assert!(
                (value_of(brightest) - row.number("brightest_mag")).abs() < 0.005,
                "{name}"
            );
            // Flat at the maximum: a day changes it by less than the formula is good for.
            let days = (brightest.instant.days() - row.tt("jd_brightest").days()).abs();
            assert!(days < 0.05, "{name}: brightest {days} days off");
        }
    }
}

/// Mean synodic arcs and durations of a century, recomputed from DE440 over 1900-2100 (ranges widened by 1 %):
/// counts follow from the synodic periods.
#[test]
fn a_century_has_the_events_that_periods_ask_for() {
    let sky = Sky::de440().unwrap();
    // 1950-01-01 to 2050-01-01.
    let century = span(2_433_282.5, 2_469_807.5);
    let all = events(&sky, &Body::PLANETS, Kinds::CONFIGURATIONS, century).unwrap();
    let count = |body: Body, kind: EventKind| {
        all.iter()
            .filter(|e| e.body == body && e.kind == kind)
            .count() as f64
    };
    for body in Body::PLANETS {
        let periods = century.days() / loopwright::season::synodic_days(body);
        let kinds: &[EventKind] = if body.is_inner_planet() {
            &[
                EventKind::InferiorConjunction,
                EventKind::SuperiorConjunction,
                EventKind::GreatestElongationEast,
                EventKind::GreatestElongationWest,
            ]
        } else {
            &[
                EventKind::Conjunction,
                EventKind::Opposition,
                EventKind::QuadratureEast,
                EventKind::QuadratureWest,
            ]
        };
        let everyone = [
            EventKind::StationRetrograde,
            EventKind::StationDirect,
            EventKind::RaStationRetrograde,
            EventKind::RaStationDirect,
            EventKind::ClosestApproach,
            EventKind::ClosestApproachLightTime,
        ];
        for &kind in kinds.iter().chain(&everyone) {
            let found = count(body, kind);
            assert!(
                (found - periods).abs() <= 1.5,
                "{body} {}: {found} in {periods} periods",
                kind.word()
            );
        }
    }
    assert!(
        all.windows(2)
            .all(|pair| pair[0].instant <= pair[1].instant),
        "in order of time"
    );
}

/// Recomputed from DE440 for the years 2024 to 2026 with skyfield 1.55; TT.
#[test]
fn recent_events() {
    let sky = Sky::de440().unwrap();
    let around = |year_jd: f64| span(year_jd - 20.0, year_jd + 20.0);
    let check = |body: Body, kind: EventKind, jd: f64, minutes: f64| {
        let found = events(&sky, &[body], Kinds::of(&[kind]), around(jd)).unwrap();
        assert_eq!(found.len(), 1, "{body} {}", kind.word());
        let off = (found[0].instant.julian_date() - jd).abs() * 1440.0;
        assert!(off < minutes, "{body} {}: {off} min", kind.word());
        value_of(&found[0])
    };
    // The table prints whole minutes.
    let jd = |y: i32, m: u8, d: u8, h: f64, min: f64| {
        let date = loopwright::sky::calendar::CivilDate::new(y, m, d).unwrap();
        f64::from(date.julian_day_number()) - 0.5 + (h + min / 60.0) / 24.0
    };
    let longitude = check(
        Body::Mars,
        EventKind::StationRetrograde,
        jd(2024, 12, 6, 23.0, 34.0),
        2.0,
    );
    assert!((longitude - 126.1711).abs() < 1e-4);
    check(
        Body::Mars,
        EventKind::RaStationRetrograde,
        jd(2024, 12, 7, 21.0, 1.0),
        2.0,
    );
    check(
        Body::Mars,
        EventKind::Opposition,
        jd(2025, 1, 16, 2.0, 40.0),
        1.0,
    );
    check(
        Body::Mars,
        EventKind::Conjunction,
        jd(2026, 1, 9, 11.0, 42.0),
        1.0,
    );
    check(
        Body::Jupiter,
        EventKind::Opposition,
        jd(2026, 1, 10, 8.0, 43.0),
        1.0,
    );
    check(
        Body::Jupiter,
        EventKind::StationDirect,
        jd(2026, 3, 11, 3.0, 31.0),
        2.0,
    );
    check(
        Body::Saturn,
        EventKind::StationDirect,
        jd(2025, 11, 28, 3.0, 53.0),
        2.0,
    );
    let elongation = check(
        Body::Mercury,
        EventKind::GreatestElongationEast,
        jd(2026, 2, 19, 17.0, 42.3),
        1.0,
    );
    assert!((elongation - 18.1227).abs() < 1e-4);
    check(
        Body::Mercury,
        EventKind::InferiorConjunction,
        jd(2026, 3, 7, 11.0, 3.0),
        1.0,
    );
    check(
        Body::Venus,
        EventKind::RaStationRetrograde,
        jd(2025, 2, 28, 3.0, 28.0),
        2.0,
    );
}

/// A naive search that differences longitudes finds four false stations of Neptune on 2003-01-30 and 31, made by the
/// bending of light while Neptune stands behind the Sun's disc.
#[test]
fn no_false_stations_of_neptune_behind_the_sun() {
    let sky = Sky::de440().unwrap();
    let kinds = Kinds::of(&[
        EventKind::StationRetrograde,
        EventKind::StationDirect,
        EventKind::RaStationRetrograde,
        EventKind::RaStationDirect,
    ]);
    assert_eq!(
        events(
            &sky,
            &[Body::Neptune],
            kinds,
            span(2_452_640.5, 2_452_690.5)
        )
        .unwrap(),
        []
    );
}

/// Common practice, no source.
#[test]
fn facts_of_the_trade() {
    let sky = Sky::de440().unwrap();
    // Mars ran backward for between two and three months around the turn of 2009 to early 2010.
    let mars = loops(&sky, Body::Mars, span(2_455_100.5, 2_455_300.5)).unwrap();
    assert_eq!(mars.len(), 1);
    assert!((60.0..92.0).contains(&mars[0].duration_days()));
    // An outer planet is brightest near the middle of its backward run; backward means east to west.
    for body in [Body::Mars, Body::Jupiter, Body::Saturn] {
        for l in loops(&sky, body, span(2_455_100.5, 2_458_500.5)).unwrap() {
            let middle =
                0.5 * (l.station_retrograde.instant.days() + l.station_direct.instant.days());
            let brightest = l.brightest.as_ref().unwrap().instant.days();
            assert!(
                (brightest - middle).abs() < 0.2 * l.duration_days(),
                "{body}"
            );
            assert!(l.arc().degrees() > 0.0);
        }
    }
    // Mercury and Venus never stand opposite the Sun.
    let never = Kinds::of(&[
        EventKind::Opposition,
        EventKind::QuadratureEast,
        EventKind::QuadratureWest,
    ]);
    let inner = [Body::Mercury, Body::Venus];
    assert_eq!(
        events(&sky, &inner, never, span(2_433_282.5, 2_469_807.5)).unwrap(),
        []
    );
}

/// Where a loop's track meets itself, both passages look in the same direction.
#[test]
fn crossings_close_the_loop() {
    let sky = Sky::de440().unwrap();
    let mut closed = 0;
    for body in Body::PLANETS {
        for l in loops(&sky, body, span(2_455_197.5, 2_458_000.5)).unwrap() {
            let Some(crossing) = l.crossing else { continue };
            closed += 1;
            let direction = |tt: Tt| sky.geocentre(tt).unwrap().place(body).unwrap().direction;
            let gap = direction(crossing.first)
                .separation(direction(crossing.second))
                .arcsec();
            assert!(gap < 0.01, "{body}: {gap}\" between the passages");
            assert!(crossing.first < crossing.second);
        }
    }
    assert!(closed > 10);
}

/// Against sampling the boundaries every six minutes (the lookup itself is checked in `constellations.rs`).
#[test]
fn constellation_entries_agree_with_dense_sampling() {
    use loopwright::sky::constellations::Constellation;
    let sky = Sky::de440().unwrap();
    for (body, days) in [
        (Body::Mercury, 400.0),
        (Body::Venus, 500.0),
        (Body::Mars, 700.0),
        (Body::Saturn, 1_500.0),
    ] {
        let span = span(2_461_000.5, 2_461_000.5 + days);
        let kinds = Kinds::of(&[EventKind::ConstellationEntry]);
        let found: Vec<(f64, &str)> = events(&sky, &[body], kinds, span)
            .unwrap()
            .iter()
            .map(|event| match event.value {
                EventValue::Constellation(name) => (event.instant.days(), name),
                _ => panic!("{event:?}"),
            })
            .collect();
        let step = 1.0 / 240.0;
        let at = |k: usize| {
            let instant = span.from.plus_days(k as f64 * step);
            let place = sky.geocentre(instant).unwrap().place(body).unwrap();
            (
                instant.days(),
                Constellation::at_icrs(place.direction).abbreviation(),
            )
        };
        let mut sampled = Vec::new();
        let mut before = at(0);
        for k in 1..(days / step) as usize {
            let here = at(k);
            if here.1 != before.1 {
                sampled.push(here);
            }
            before = here;
        }
        assert_eq!(found.len(), sampled.len(), "{body}: {found:?} {sampled:?}");
        for (ours, theirs) in found.iter().zip(&sampled) {
            assert_eq!(ours.1, theirs.1, "{body}");
            assert!(
                theirs.0 - ours.0 >= -1e-6 && theirs.0 - ours.0 <= step,
                "{body} {ours:?} {theirs:?}"
            );
        }
        assert!(!found.is_empty(), "{body}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    /// The same event, to the last bit, comes out of any overlapping window.
    #[test]
    fn overlapping_windows_agree(
        start in -20_000.0_f64..20_000.0,
        shift in 0.0_f64..300.0,
        length in 50.0_f64..700.0,
        which in 0_usize..7,
    ) {
        let sky = Sky::de440().unwrap();
        let body = Body::PLANETS[which];
        let window = |from: f64, to: f64| Span { from: Tt::from_days(from), to: Tt::from_days(to) };
        let wide = events(&sky, &[body], Kinds::ALL, window(start, start + shift + length + 100.0)).unwrap();
        let inner = window(start + shift, start + shift + length);
        let narrow = events(&sky, &[body], Kinds::ALL, inner).unwrap();
        let expected: Vec<Event> = wide.into_iter().filter(|e| inner.contains(e.instant)).collect();
        prop_assert_eq!(narrow, expected);
    }
}
