//! Dates to announce: the choice against every possible choice, the chances against every possible weather.

#[path = "common/chance.rs"]
mod chance;

use chance::{
    Draws, after, agrees, all_weathers, candidate, date, draw_weather, mark, weather, widest,
};
use loopwright::season::picks::{
    Candidate, Mark, Measure, Path, PickError, PickRequest, Plan, ReserveRule, chances, pick_dates,
};
use loopwright::season::weather::{Chain, Forecast, KnownSky, SkyState};
use loopwright::sky::calendar::CivilDate;

const RULES: [ReserveRule; 3] = [
    ReserveRule::NextEvening,
    ReserveRule::SameWeekday,
    ReserveRule::WithinDays(4),
];

fn today() -> CivilDate {
    date("2027-02-01")
}

fn request(candidates: &[Candidate], path: Path, count: usize) -> PickRequest<'_> {
    PickRequest {
        candidates,
        path,
        frames: &[],
        count,
        measure: Measure::Angle,
        must_have: &[],
        reserve_rule: ReserveRule::NextEvening,
        reserves: 1,
        evenness: PickRequest::DEFAULT_EVENNESS,
        fill: PickRequest::DEFAULT_FILL,
    }
}

fn chain(nights: i32, odds: f64, persistence: f64) -> Chain {
    weather([odds; 12], persistence)
        .chain(
            today(),
            after(today(), nights - 1),
            None,
            Forecast::default(),
        )
        .unwrap()
}

/// Degrees after so many days of a planet that turns: a quarter of a degree a night, half a degree in mid-season.
fn turning_track(day: f64) -> f64 {
    0.25 * day + 20.0 * (1.0 - (day / 250.0 * std::f64::consts::PI).cos())
}

fn season(nights: i32, draws: &mut Draws) -> Vec<Candidate> {
    (0..nights)
        .filter_map(|day| {
            let open = draws.unit() < 0.8;
            open.then(|| {
                candidate(
                    after(today(), day),
                    turning_track(f64::from(day)),
                    draws.between(0.2, 1.0),
                )
            })
        })
        .collect()
}

fn path(nights: i32) -> Path {
    let end = turning_track(f64::from(nights) + 1.0);
    Path {
        start: mark(after(today(), -2), -0.5),
        end: mark(after(today(), nights), end),
    }
}

fn day(mark: Mark) -> usize {
    usize::try_from(mark.night.days_since(today())).unwrap()
}

/// Days after the pick on which a rule allows reserves, spelled out again.
fn is_allowed(rule: ReserveRule, most: usize, pick: usize, reserve: usize) -> bool {
    let wait = reserve - pick;
    match rule {
        ReserveRule::NextEvening => wait <= most,
        ReserveRule::SameWeekday => wait.is_multiple_of(7) && wait <= 7 * most,
        ReserveRule::WithinDays(days) => wait <= usize::from(days),
    }
}

/// The chance that one of these nights is clear, over every weather.
fn chance_of_any(weathers: &[(Vec<bool>, f64)], nights: &[usize]) -> f64 {
    weathers
        .iter()
        .filter(|(sky, _)| nights.iter().any(|&night| sky[night]))
        .map(|(_, chance)| chance)
        .sum()
}

/// The best fill of a pick with reserves before night `limit`, over every set of reserves.
fn best_fill(
    request: &PickRequest,
    weathers: &[(Vec<bool>, f64)],
    pick: usize,
    limit: usize,
) -> f64 {
    let mut nights: Vec<usize> = request
        .candidates
        .iter()
        .map(|candidate| day(candidate.mark))
        .collect();
    nights.dedup();
    nights.retain(|&night| {
        night > pick
            && night < limit
            && is_allowed(request.reserve_rule, request.reserves, pick, night)
    });
    let mut best = 0.0_f64;
    for set in 0..1_u32 << nights.len() {
        if set.count_ones() as usize <= request.reserves {
            let chosen = (0..nights.len())
                .filter(|bit| set & (1 << bit) != 0)
                .map(|bit| nights[bit]);
            best = best.max(chance_of_any(
                weathers,
                &chosen.chain([pick]).collect::<Vec<_>>(),
            ));
        }
    }
    best
}

/// The greatest objective over every set of picks.
fn best_objective(request: &PickRequest, weathers: &[(Vec<bool>, f64)]) -> f64 {
    let count = request.candidates.len();
    let mut best = f64::NEG_INFINITY;
    let place = |mark: Mark| request.measure.of(mark);
    let begin = request
        .frames
        .last()
        .map_or(request.candidates[0].mark, |frame| *frame);
    let steps = request.count - usize::from(request.frames.is_empty());
    let mean = (place(request.candidates[count - 1].mark) - place(begin)) / steps.max(1) as f64;
    for set in 0..1_u32 << count {
        let picks: Vec<Candidate> = (0..count)
            .filter(|bit| set & (1 << bit) != 0)
            .map(|bit| request.candidates[bit])
            .collect();
        let nights: Vec<usize> = picks.iter().map(|pick| day(pick.mark)).collect();
        let has_all = request
            .must_have
            .iter()
            .all(|&night| picks.iter().any(|pick| pick.mark.night == night));
        if picks.len() != request.count
            || !has_all
            || nights.windows(2).any(|pair| pair[0] == pair[1])
        {
            continue;
        }
        let mut value = 0.0;
        for (order, pick) in picks.iter().enumerate() {
            let limit = nights.get(order + 1).copied().unwrap_or(usize::MAX);
            value += pick.quality.ln()
                + request.fill
                    * best_fill(request, weathers, nights[order], limit)
                        .max(1e-6)
                        .ln();
        }
        let marks = request
            .frames
            .last()
            .copied()
            .into_iter()
            .chain(picks.iter().map(|pick| pick.mark));
        let places: Vec<f64> = marks.map(place).collect();
        for pair in places.windows(2) {
            value -= request.evenness * ((pair[1] - pair[0]) / mean - 1.0).powi(2);
        }
        best = best.max(value);
    }
    best
}

fn nights_of(plan: &Plan, candidates: &[Candidate]) -> Vec<Vec<Mark>> {
    let marks = |section: &loopwright::season::picks::Section| {
        [section.pick]
            .iter()
            .chain(&section.reserves)
            .map(|&place| candidates[place].mark)
            .collect()
    };
    plan.sections.iter().map(marks).collect()
}

#[test]
fn dates_are_the_best_of_all_choices() {
    let mut draws = Draws(11);
    for round in 0..60_usize {
        let nights = 11;
        let mut candidates = season(nights, &mut draws);
        if round.is_multiple_of(3) {
            // A second spell in one night.
            let spell = candidates[2];
            candidates.insert(
                3,
                Candidate {
                    quality: draws.between(0.2, 1.0),
                    ..spell
                },
            );
        }
        let chain = chain(nights, draws.between(0.2, 0.7), draws.between(0.0, 0.6));
        let weathers = all_weathers(&chain);
        let frames = [mark(after(today(), -1), -0.2)];
        let must_have = [candidates[draws.below(candidates.len())].mark.night];
        let request = PickRequest {
            measure: Measure::ALL[round % 2],
            frames: if round % 4 == 1 { &frames } else { &[] },
            must_have: if round % 5 < 2 { &must_have } else { &[] },
            reserve_rule: RULES[round % 3],
            reserves: draws.below(3),
            evenness: draws.between(0.0, 4.0),
            fill: if round.is_multiple_of(7) {
                0.0
            } else {
                draws.between(0.3, 2.0)
            },
            ..request(&candidates, path(nights), 1 + draws.below(4))
        };
        let plan = pick_dates(&request, &chain).unwrap();
        let best = best_objective(&request, &weathers);
        assert!(
            (plan.objective(&request) - best).abs() < 1e-9,
            "round {round}: {} against {best}",
            plan.objective(&request)
        );
        // The reserves named are those whose chance was counted.
        for (section, nights) in plan.sections.iter().zip(nights_of(&plan, &candidates)) {
            let nights: Vec<usize> = nights.into_iter().map(day).collect();
            assert!((section.filled - chance_of_any(&weathers, &nights)).abs() < 1e-12);
            assert!(section.reserves.len() <= request.reserves);
            assert!(nights[1..].iter().all(|&night| is_allowed(
                request.reserve_rule,
                request.reserves,
                nights[0],
                night
            )));
        }
        let all: Vec<Mark> = nights_of(&plan, &candidates).concat();
        assert!(
            all.windows(2).all(|pair| pair[0].night < pair[1].night),
            "sections interleave"
        );
        assert!(request.must_have.iter().all(|&night| {
            plan.sections
                .iter()
                .any(|s| candidates[s.pick].mark.night == night)
        }));
    }
}

#[test]
fn chances_are_those_of_all_weathers() {
    let mut draws = Draws(5);
    for round in 0..40_usize {
        let nights = 13;
        let candidates = season(nights, &mut draws);
        let known = KnownSky {
            night: after(today(), -3),
            sky: if round.is_multiple_of(2) {
                SkyState::Clear
            } else {
                SkyState::Cloud
            },
        };
        let chain = weather([draws.between(0.2, 0.8); 12], draws.between(0.0, 0.7))
            .chain(
                today(),
                after(today(), nights - 1),
                Some(known),
                Forecast::default(),
            )
            .unwrap();
        let frames = [mark(after(today(), -1), -0.2)];
        let frames: &[Mark] = if round.is_multiple_of(3) {
            &frames
        } else {
            &[]
        };
        let request = PickRequest {
            frames,
            reserve_rule: RULES[round % 3],
            reserves: 2,
            ..request(&candidates, path(nights), 3)
        };
        let plan = pick_dates(&request, &chain).unwrap();
        let sections = nights_of(&plan, &candidates);
        let chances = &plan.chances;

        let mut filled = vec![0.0; sections.len() + 1];
        let mut gaps: Vec<[(f64, f64); 2]> = Vec::new();
        for (sky, chance) in all_weathers(&chain) {
            let shot: Vec<Mark> = sections
                .iter()
                .filter_map(|section| section.iter().copied().find(|&mark| sky[day(mark)]))
                .collect();
            filled[shot.len()] += chance;
            gaps.push(Measure::ALL.map(|measure| {
                let places: Vec<f64> = frames
                    .iter()
                    .chain(&shot)
                    .map(|&mark| measure.of(mark))
                    .collect();
                (
                    widest(
                        measure.of(request.path.start),
                        &places,
                        measure.of(request.path.end),
                    ),
                    chance,
                )
            }));
        }
        let expected: f64 = filled
            .iter()
            .enumerate()
            .map(|(count, chance)| count as f64 * chance)
            .sum();
        assert!((chances.all_filled - filled[sections.len()]).abs() < 1e-12);
        assert!((chances.expected_filled - expected).abs() < 1e-12);
        for (count, chance) in filled.iter().enumerate() {
            assert!((chances.filled[count] - chance).abs() < 1e-12);
        }
        for (which, table) in [&chances.gap_degrees, &chances.gap_days]
            .into_iter()
            .enumerate()
        {
            let at_most = |length: f64| -> f64 {
                gaps.iter()
                    .map(|gap| gap[which])
                    .filter(|(gap, _)| *gap <= length + 1e-9)
                    .map(|(_, chance)| chance)
                    .sum()
            };
            assert!(table.at_most.len() >= 2 && table.at_most.last().unwrap().1 >= 0.9995);
            for &(length, chance) in &table.at_most {
                assert!(
                    (chance - at_most(length)).abs() < 1e-12,
                    "{length} {:?}",
                    table.measure
                );
            }
            for (quantile, wanted) in [(table.median, 0.5), (table.nine_in_ten, 0.9)] {
                assert!(at_most(quantile) >= wanted - 1e-9 && at_most(quantile - 1e-6) < wanted);
            }
        }
    }
}

#[test]
fn chances_of_a_long_season_agree_with_drawn_weather() {
    let nights = 250;
    let mut draws = Draws(3);
    let candidates = season(nights, &mut draws);
    let odds = [
        0.2, 0.25, 0.35, 0.4, 0.5, 0.5, 0.55, 0.55, 0.5, 0.4, 0.25, 0.2,
    ];
    let chain = weather(odds, 0.35)
        .chain(
            today(),
            after(today(), nights - 1),
            None,
            Forecast::default(),
        )
        .unwrap();
    let request = PickRequest {
        reserve_rule: ReserveRule::WithinDays(8),
        reserves: 3,
        ..request(&candidates, path(nights), 16)
    };
    let plan = pick_dates(&request, &chain).unwrap();
    let sections = nights_of(&plan, &candidates);
    let table = &plan.chances.gap_degrees;
    let runs = 20_000;
    let (mut all, mut counts, mut within) = (0, 0, vec![0; table.at_most.len()]);
    for _ in 0..runs {
        let sky = draw_weather(&chain, &mut draws);
        let shot = sections
            .iter()
            .filter_map(|section| section.iter().find(|&&mark| sky[day(mark)]));
        let places: Vec<f64> = shot.map(|&mark| Measure::Angle.of(mark)).collect();
        all += usize::from(places.len() == sections.len());
        counts += places.len();
        let widest = widest(
            Measure::Angle.of(request.path.start),
            &places,
            Measure::Angle.of(request.path.end),
        );
        for (count, (length, _)) in within.iter_mut().zip(&table.at_most) {
            *count += usize::from(widest <= length + 1e-9);
        }
    }
    let share = |count: usize| count as f64 / f64::from(runs);
    assert!(
        plan.chances.all_filled > 0.02 && plan.chances.all_filled < 0.98,
        "{}",
        plan.chances.all_filled
    );
    assert!(agrees(share(all), plan.chances.all_filled, runs as usize));
    assert!((share(counts) - plan.chances.expected_filled).abs() < 0.07);
    for (&count, &(length, chance)) in within.iter().zip(&table.at_most) {
        assert!(
            agrees(share(count), chance, runs as usize),
            "{length}: {} against {chance}",
            share(count)
        );
    }
}

#[test]
fn even_by_angle_and_by_days_mean_what_they_say() {
    let candidates: Vec<Candidate> = (0..241)
        .map(|day| candidate(after(today(), day), turning_track(f64::from(day)), 0.8))
        .collect();
    let chain = chain(250, 0.4, 0.2);
    for measure in Measure::ALL {
        let request = PickRequest {
            measure,
            evenness: 1000.0,
            reserves: 0,
            ..request(&candidates, path(250), 9)
        };
        let plan = pick_dates(&request, &chain).unwrap();
        let places: Vec<f64> = plan
            .sections
            .iter()
            .map(|section| measure.of(candidates[section.pick].mark))
            .collect();
        // Days divide evenly (240 by 8); by angle the nearest night is off by half a night's motion at either end.
        let tolerance = if measure == Measure::Days { 1e-9 } else { 0.51 };
        for pair in places.windows(2) {
            assert!(
                (pair[1] - pair[0] - plan.mean_step).abs() <= tolerance,
                "{measure:?} {places:?}"
            );
        }
    }
}

#[test]
fn more_reserves_and_better_odds_fill_more() {
    let mut draws = Draws(21);
    let candidates = season(120, &mut draws);
    let plan = |odds: f64, reserves: usize| {
        let request = PickRequest {
            reserve_rule: ReserveRule::WithinDays(9),
            reserves,
            fill: 0.0,
            ..request(&candidates, path(120), 8)
        };
        pick_dates(&request, &chain(120, odds, 0.3))
            .unwrap()
            .chances
    };
    for reserves in 0..4 {
        assert!(plan(0.4, reserves + 1).all_filled > plan(0.4, reserves).all_filled);
    }
    for odds in [0.2, 0.4, 0.6] {
        let (worse, better) = (plan(odds, 2), plan(odds + 0.2, 2));
        assert!(
            better.all_filled > worse.all_filled && better.gap_days.median <= worse.gap_days.median
        );
    }
    assert!(plan(0.0, 2).all_filled == 0.0 && (plan(1.0, 0).all_filled - 1.0).abs() < 1e-12);
}

#[test]
fn reserves_keep_away_from_the_cloud_of_their_pick() {
    let candidates: Vec<Candidate> = (0..20)
        .map(|day| candidate(after(today(), day), f64::from(day), 1.0))
        .collect();
    let end = mark(after(today(), 20), 20.0);
    let path = Path {
        start: mark(today(), 0.0),
        end,
    };
    let request = PickRequest {
        reserve_rule: ReserveRule::WithinDays(6),
        ..request(&candidates, path, 1)
    };
    // Steady odds and lasting weather: the farthest night allowed is the least tied to the pick's.
    let plan = pick_dates(&request, &chain(20, 0.4, 0.5)).unwrap();
    assert_eq!(plan.sections[0].reserves, [plan.sections[0].pick + 6]);
    // Independent nights are all alike: the earliest stands.
    let plan = pick_dates(&request, &chain(20, 0.4, 0.0)).unwrap();
    assert_eq!(plan.sections[0].reserves, [plan.sections[0].pick + 1]);
}

#[test]
fn a_gap_of_the_past_stays_in_the_account() {
    let candidates: Vec<Candidate> = (0..10)
        .map(|day| candidate(after(today(), day), f64::from(day), 1.0))
        .collect();
    let path = Path {
        start: mark(after(today(), -30), -30.0),
        end: mark(after(today(), 10), 10.0),
    };
    let frames = [
        mark(after(today(), -2), -2.0),
        mark(after(today(), -14), -14.0),
    ];
    let request = PickRequest {
        frames: &frames,
        ..request(&candidates, path, 3)
    };
    let plan = pick_dates(&request, &chain(10, 1.0, 0.0)).unwrap();
    assert!((plan.chances.gap_days.median - 16.0).abs() < 1e-9);
    // Three steps of 11/3 days from the last frame to the last candidate.
    assert!((plan.mean_step - 11.0 / 3.0).abs() < 1e-9);
}

#[test]
fn dates_planned_by_hand_get_their_chances() {
    let path = Path {
        start: mark(today(), 0.0),
        end: mark(after(today(), 20), 20.0),
    };
    let on = |day: i32| mark(after(today(), day), f64::from(day));
    let chain = chain(21, 0.5, 0.0);
    let result = chances(&[vec![on(3), on(4)], vec![on(12)]], path, &[], &chain).unwrap();
    // Independent halves: 3/4 and 1/2.
    assert!(
        (result.all_filled - 0.375).abs() < 1e-12 && (result.expected_filled - 1.25).abs() < 1e-12
    );
    let error = chances(&[vec![on(3), on(12)], vec![on(10)]], path, &[], &chain).unwrap_err();
    assert!(
        error
            .to_string()
            .contains("2027-02-11 stands after 2027-02-13"),
        "{error}"
    );
    let none = chances(&[], path, &[], &chain).unwrap();
    assert!((none.all_filled - 1.0).abs() < 1e-12 && (none.gap_days.median - 20.0).abs() < 1e-12);
    assert_eq!(
        result.words("your odds (50 % in every month, persistence 0)"),
        [
            "38 %: every one of the 2 sections is filled",
            "1.2 of 2 sections filled on average",
            "widest gap: as likely as not at most 12.0 deg, nine times in ten at most 20.0 deg",
            "widest gap: as likely as not at most 12 days, nine times in ten at most 20 days",
            "all on your odds (50 % in every month, persistence 0)",
        ]
    );
}

#[test]
fn requests_that_cannot_be_say_why() {
    let candidates: Vec<Candidate> = (0..10)
        .map(|day| candidate(after(today(), day), f64::from(day), 1.0))
        .collect();
    let path = Path {
        start: mark(today(), 0.0),
        end: mark(after(today(), 12), 12.0),
    };
    let chain = chain(13, 0.4, 0.3);
    let base = request(&candidates, path, 4);
    let says = |request: PickRequest, words: &str| {
        let message = pick_dates(&request, &chain).unwrap_err().to_string();
        assert!(message.contains(words), "{message}");
    };
    says(
        PickRequest {
            candidates: &[],
            ..base
        },
        "no candidate nights between 2027-02-01 and 2027-02-13",
    );
    let closed = [candidate(today(), 0.0, 0.0)];
    says(
        PickRequest {
            candidates: &closed,
            ..base
        },
        "no candidate nights",
    );
    says(PickRequest { count: 0, ..base }, "at least 1");
    says(
        PickRequest { count: 11, ..base },
        "only 10 candidate nights",
    );
    says(
        PickRequest {
            count: 1_000_000,
            ..base
        },
        "at most 400",
    );
    let twelfth = [date("2027-02-12")];
    says(
        PickRequest {
            must_have: &twelfth,
            ..base
        },
        "2027-02-12 must be in, but it is not among the candidate nights: the nearest that is stands on 2027-02-10",
    );
    let five: Vec<CivilDate> = (1..6).map(|day| after(today(), day)).collect();
    says(
        PickRequest {
            must_have: &five,
            ..base
        },
        "5 dates must be in, but only 4",
    );
    says(
        PickRequest {
            evenness: -1.0,
            ..base
        },
        "lambda",
    );
    says(
        PickRequest {
            fill: f64::NAN,
            ..base
        },
        "weight of the fill",
    );
    says(
        PickRequest {
            reserves: 21,
            ..base
        },
        "at most 20",
    );
    says(
        PickRequest {
            reserve_rule: ReserveRule::WithinDays(0),
            ..base
        },
        "at least 1",
    );
    says(
        PickRequest {
            reserve_rule: ReserveRule::WithinDays(91),
            ..base
        },
        "at most 90",
    );
    let backwards = Path {
        start: path.end,
        end: path.start,
    };
    says(
        PickRequest {
            path: backwards,
            ..base
        },
        "ends before it begins",
    );
    let ahead = [mark(after(today(), 1), 1.0)];
    says(
        PickRequest {
            frames: &ahead,
            ..base
        },
        "a frame is logged for 2027-02-02",
    );
    for (track, quality) in [(f64::NAN, 1.0), (-3.0, 1.0), (f64::INFINITY, 1.0)] {
        let falling = [candidates[0], candidate(after(today(), 3), track, quality)];
        says(
            PickRequest {
                candidates: &falling,
                ..base
            },
            "length along the track",
        );
    }
    for quality in [-0.1, 1.1, f64::NAN] {
        let odd = [candidate(after(today(), 3), 3.0, quality)];
        says(
            PickRequest {
                candidates: &odd,
                ..base
            },
            "2027-02-04 is outside 0 to 1",
        );
    }
    let short = weather([0.4; 12], 0.3)
        .chain(today(), after(today(), 4), None, Forecast::default())
        .unwrap();
    assert!(matches!(
        pick_dates(&base, &short),
        Err(PickError::ChainTooShort { .. })
    ));
}
