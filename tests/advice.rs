//! Go or stay: the policy against every policy, its chances against every weather and against drawn weather.

#[path = "common/chance.rs"]
mod chance;

use chance::{
    Draws, after, agrees, all_weathers, candidate, date, draw_weather, mark, weather, widest,
};
use loopwright::season::advice::{
    Advice, AdviceError, AdviceRequest, Gap, Goal, Reason, Standing, advise, realistic_gap,
};
use loopwright::season::picks::{Candidate, Mark, Path, PickError};
use loopwright::season::weather::{Chain, Forecast, KnownSky, Probability, SkyState};
use loopwright::sky::Angle;
use loopwright::sky::calendar::CivilDate;

/// Weathers with their chances; bit n is set when night n is clear.
type Weathers = Vec<(u32, f64)>;

fn today() -> CivilDate {
    date("2027-02-01")
}

/// A small season, with all that brute force needs beside it.
struct Case {
    nights: usize,
    candidates: Vec<Candidate>,
    path: Path,
    frames: Vec<Mark>,
    outings: usize,
    gap: f64,
    seen: bool,
    chain: Chain,
}

impl Case {
    fn request(&self) -> AdviceRequest<'_> {
        AdviceRequest {
            candidates: &self.candidates,
            path: self.path,
            frames: &self.frames,
            outings: self.outings,
            gap: Gap::Along(Angle::from_degrees(self.gap)),
            weather_always_seen: self.seen,
        }
    }

    fn advice(&self) -> Advice {
        advise(&self.request(), &self.chain).unwrap()
    }

    /// Degrees along the track of a night, if it is a candidate.
    fn place(&self, night: usize) -> Option<f64> {
        let date = after(today(), night as i32);
        let found = self
            .candidates
            .iter()
            .find(|candidate| candidate.mark.night == date);
        found.map(|candidate| candidate.mark.track.degrees())
    }

    /// The widest gap with frames on these nights.
    fn widest(&self, shot: &[usize], from_last_frame: bool) -> f64 {
        let mut old: Vec<f64> = self
            .frames
            .iter()
            .map(|frame| frame.track.degrees())
            .collect();
        let mut start = self.path.start.track.degrees();
        if from_last_frame && let Some(last) = old.last() {
            start = *last;
            old.clear();
        }
        let new = shot.iter().filter_map(|&night| self.place(night));
        widest(
            start,
            &old.into_iter().chain(new).collect::<Vec<_>>(),
            self.path.end.track.degrees(),
        )
    }

    /// The greatest chance of a gap over every policy that may depend on everything observed so far: what is left are the
    /// weathers that agree with it.
    fn best(&self, gap: f64, from_last_frame: bool) -> f64 {
        let bits = |sky: Vec<bool>| {
            sky.iter()
                .rev()
                .fold(0, |bits, &clear| 2 * bits + u32::from(clear))
        };
        let weathers: Weathers = all_weathers(&self.chain)
            .into_iter()
            .map(|(sky, chance)| (bits(sky), chance))
            .collect();
        self.best_from(0, &weathers, &mut Vec::new(), self.outings, &|shot| {
            self.widest(shot, from_last_frame) <= gap + 1e-9
        })
    }

    fn best_from(
        &self,
        night: usize,
        left: &Weathers,
        shot: &mut Vec<usize>,
        outings: usize,
        is_reached: &dyn Fn(&[usize]) -> bool,
    ) -> f64 {
        if night == self.nights {
            let mass: f64 = left.iter().map(|(_, chance)| chance).sum();
            return if is_reached(shot) { mass } else { 0.0 };
        }
        let by_sky = |clear: bool| -> Weathers {
            left.iter()
                .filter(|(sky, _)| (sky >> night & 1 == 1) == clear)
                .copied()
                .collect()
        };
        let mut value = if self.seen {
            self.best_from(night + 1, &by_sky(true), shot, outings, is_reached)
                + self.best_from(night + 1, &by_sky(false), shot, outings, is_reached)
        } else {
            self.best_from(night + 1, left, shot, outings, is_reached)
        };
        if outings > 0 && self.place(night).is_some() {
            shot.push(night);
            let mut going = self.best_from(night + 1, &by_sky(true), shot, outings - 1, is_reached);
            shot.pop();
            going += self.best_from(night + 1, &by_sky(false), shot, outings - 1, is_reached);
            value = value.max(going);
        }
        value
    }

    /// Follows the advice through one weather, staying at home on night `missed`; the nights gone out and those shot.
    fn follow(
        &self,
        advice: &Advice,
        sky: &[bool],
        missed: Option<usize>,
    ) -> (Vec<usize>, Vec<usize>) {
        let (mut went, mut shot) = (Vec::new(), Vec::new());
        let mut known = None;
        for night in 0..self.nights {
            let date = after(today(), night as i32);
            let sky = if sky[night] {
                SkyState::Clear
            } else {
                SkyState::Cloud
            };
            if self.place(night).is_some() && missed != Some(night) {
                let standing = Standing {
                    night: date,
                    last_frame: shot
                        .last()
                        .map(|&night: &usize| after(today(), night as i32)),
                    known,
                    outings: self.outings - went.len(),
                };
                if advice.decide(&standing).unwrap().go {
                    went.push(night);
                    known = Some(KnownSky { night: date, sky });
                    if sky == SkyState::Clear {
                        shot.push(night);
                    }
                }
            }
            if self.seen {
                known = Some(KnownSky { night: date, sky });
            }
        }
        (went, shot)
    }
}

fn random_case(round: usize, draws: &mut Draws) -> Case {
    let nights = 4 + draws.below(3);
    let mut track = draws.unit();
    let mut candidates = Vec::new();
    for night in 0..nights {
        track += draws.between(0.3, 1.5);
        if draws.unit() < 0.85 {
            candidates.push(candidate(after(today(), night as i32), track, 0.5));
        }
    }
    candidates.push(candidate(after(today(), nights as i32 - 1), track, 0.6));
    candidates.dedup_by_key(|candidate| candidate.mark.night);
    let mut odds = [0.0; 12];
    odds.fill_with(|| draws.between(0.15, 0.85));
    let sky = if round % 4 == 1 {
        SkyState::Clear
    } else {
        SkyState::Cloud
    };
    let known = (round % 4 < 2).then_some(KnownSky {
        night: after(today(), -1),
        sky,
    });
    let chance = |value: f64| Some(Probability::new(value, "forecast").unwrap());
    let forecast = Forecast {
        tonight: if round.is_multiple_of(5) {
            chance([0.0, 1.0, 0.6][draws.below(3)])
        } else {
            None
        },
        tomorrow: if round % 5 < 2 {
            chance(draws.unit())
        } else {
            None
        },
    };
    let weather = weather(odds, draws.between(0.0, 0.6));
    let frames = if round.is_multiple_of(3) {
        vec![mark(after(today(), -2), -1.0)]
    } else {
        Vec::new()
    };
    Case {
        nights,
        path: Path {
            start: mark(after(today(), -4), -2.0),
            end: mark(after(today(), nights as i32), track + 0.7),
        },
        candidates,
        frames,
        outings: 1 + draws.below(5),
        gap: draws.between(1.2, 4.5),
        seen: round % 2 == 1,
        chain: weather
            .chain(today(), after(today(), nights as i32), known, forecast)
            .unwrap(),
    }
}

#[test]
fn no_policy_has_a_greater_chance() {
    let mut draws = Draws(2);
    let mut complete = 0;
    for round in 0..240 {
        let case = random_case(round, &mut draws);
        let best = case.best(case.gap, false);
        let advice = case.advice();
        if let Goal::Complete { .. } = advice.goal {
            complete += 1;
            assert!(
                (advice.chance - best).abs() < 1e-12,
                "round {round}: {} against {best}",
                advice.chance
            );
        } else {
            assert!(best == 0.0, "round {round}: {best} was called nil");
        }
    }
    assert!(complete > 70, "only {complete} cases had a chance");
}

/// All 2^13 policies of three nights: after each of the histories of stay, clear and cloud, go or stay.
#[test]
fn all_policies_of_three_nights_written_out() {
    let mut draws = Draws(9);
    for round in 0..12 {
        let candidates: Vec<Candidate> = (0..3)
            .map(|night| candidate(after(today(), night), f64::from(night), 1.0))
            .collect();
        let chain = weather([draws.between(0.2, 0.8); 12], draws.between(0.0, 0.6))
            .chain(today(), after(today(), 2), None, Forecast::default())
            .unwrap();
        let case = Case {
            nights: 3,
            candidates,
            path: Path {
                start: mark(after(today(), -1), -1.0),
                end: mark(after(today(), 3), 3.0),
            },
            frames: Vec::new(),
            outings: 1 + round % 3,
            gap: [2.0, 2.5, 3.0][round / 4],
            seen: false,
            chain,
        };
        let weathers = all_weathers(&case.chain);
        let mut best = 0.0_f64;
        for policy in 0..1_u32 << 13 {
            let mut chance_of_policy = 0.0;
            for (sky, chance) in &weathers {
                // Histories are numbered 0; 1-3; 4-12: three children each.
                let (mut history, mut outings, mut shot) = (0, case.outings, Vec::new());
                for (night, &clear) in sky.iter().enumerate() {
                    let goes = policy & (1 << history) != 0 && outings > 0;
                    outings -= usize::from(goes);
                    if goes && clear {
                        shot.push(night);
                    }
                    history = 3 * history
                        + 1
                        + if !goes {
                            0
                        } else if clear {
                            1
                        } else {
                            2
                        };
                }
                chance_of_policy += if case.widest(&shot, false) <= case.gap + 1e-9 {
                    *chance
                } else {
                    0.0
                };
            }
            best = best.max(chance_of_policy);
        }
        let advice = case.advice();
        let chance = if let Goal::Complete { .. } = advice.goal {
            advice.chance
        } else {
            0.0
        };
        assert!(
            (chance - best).abs() < 1e-12,
            "round {round}: {chance} against {best}"
        );
    }
}

#[test]
fn following_the_advice_through_every_weather_gives_its_numbers() {
    let mut draws = Draws(4);
    let mut nights_that_matter = 0;
    for round in 0..120 {
        let case = random_case(round, &mut draws);
        let advice = case.advice();
        let (gap, from_last) = match advice.goal {
            Goal::Complete { gap } => (gap, false),
            Goal::Instead { gap, .. } => (gap, true),
        };
        if advice.nights.is_empty() {
            continue;
        }
        let weathers = all_weathers(&case.chain);
        let reached = |missed: Option<usize>| -> f64 {
            let follow = |sky: &[bool]| {
                case.widest(&case.follow(&advice, sky, missed).1, from_last) <= gap + 1e-9
            };
            weathers
                .iter()
                .filter(|(sky, _)| follow(sky))
                .map(|(_, chance)| chance)
                .sum()
        };
        assert!(
            (reached(None) - advice.chance).abs() < 1e-12,
            "round {round}"
        );
        let mut outings = 0.0;
        let mut going = vec![0.0; case.nights];
        for (sky, chance) in &weathers {
            for night in case.follow(&advice, sky, None).0 {
                outings += chance;
                going[night] += chance;
            }
        }
        // Outings after the goal is out of reach are of no use, and the policy makes none.
        assert!(
            (outings - advice.expected_outings).abs() < 1e-9,
            "round {round}"
        );
        for night in &advice.nights {
            let index = case.chain.index(night.night).unwrap();
            assert!((going[index] - night.go).abs() < 1e-9, "round {round}");
            let lost = advice.chance - reached(Some(index));
            assert!(
                (lost - night.lost_by_staying).abs() < 1e-9,
                "round {round}: {lost} {night:?}"
            );
            nights_that_matter += usize::from(lost > 0.01);
        }
        if let Some(tonight) = advice.tonight {
            let expected = tonight.chance_going.max(tonight.chance_staying);
            assert!((expected - advice.chance).abs() < 1e-12);
            assert!((tonight.clear - case.chain.beliefs()[0]).abs() < 1e-15);
        }
    }
    assert!(nights_that_matter > 100);
}

#[test]
fn where_the_chance_is_nil_the_widest_gap_is_the_least_held_with_even_chance() {
    let mut draws = Draws(6);
    let (mut even, mut less, mut past) = (0, 0, 0);
    for round in 0..250 {
        let mut case = random_case(round, &mut draws);
        case.gap = draws.between(0.2, 1.2);
        let Goal::Instead { gap, cannot } = case.advice().goal else {
            continue;
        };
        if let Reason::Past { .. } = cannot.reason {
            past += 1;
            if gap == case.gap {
                continue;
            }
        }
        let chance = case.advice().chance;
        assert_eq!(realistic_gap(&case.request(), &case.chain), Ok(gap));
        assert!((chance - case.best(gap, true)).abs() < 1e-12);
        let smaller = case.best(gap - 1e-6, true);
        if chance >= 0.5 && smaller < 0.5 {
            even += 1;
        } else {
            // Every gap shorter than the whole rest has less than one half; then a quarter and so on.
            less += 1;
            let start = case
                .frames
                .last()
                .map_or(case.path.start, |frame| *frame)
                .track
                .degrees();
            let whole = case.path.end.track.degrees() - start;
            assert!(case.best(whole - 1e-6, true) < 0.5, "round {round}");
            let wanted = (1..20)
                .map(|power| 0.5_f64.powi(power))
                .find(|wanted| chance >= *wanted)
                .unwrap();
            assert!(smaller < wanted && case.best(whole - 1e-6, true) < 2.0 * wanted);
        }
    }
    assert!(even > 40 && less > 5 && past > 5, "{even} {less} {past}");
}

fn long_season(odds: f64, persistence: f64, outings: usize, gap: f64, seen: bool) -> Case {
    let nights = 250;
    let mut draws = Draws(8);
    let track = |day: f64| 0.25 * day + 20.0 * (1.0 - (day / 250.0 * std::f64::consts::PI).cos());
    let candidates = (0..nights)
        .filter(|_| draws.unit() < 0.85)
        .map(|day| candidate(after(today(), day), track(f64::from(day)), 0.7))
        .collect();
    let mut table = [odds; 12];
    table[4..8].fill((odds + 0.1).min(1.0));
    let chain = weather(table, persistence)
        .chain(today(), after(today(), nights), None, Forecast::default())
        .unwrap();
    Case {
        nights: nights as usize,
        candidates,
        path: Path {
            start: mark(today(), 0.0),
            end: mark(after(today(), nights), track(250.0)),
        },
        frames: Vec::new(),
        outings,
        gap,
        seen,
        chain,
    }
}

#[test]
fn drawn_weather_completes_a_long_season_as_often_as_told() {
    for (seen, outings, gap) in [(false, 40, 8.0), (true, 40, 7.0), (false, 25, 11.0)] {
        let case = long_season(0.4, 0.35, outings, gap, seen);
        let advice = case.advice();
        assert!(
            advice.chance > 0.1 && advice.chance < 0.9,
            "{}",
            advice.chance
        );
        let mut draws = Draws(31);
        let runs = 800;
        let (mut complete, mut went) = (0, 0);
        for _ in 0..runs {
            let sky = draw_weather(&case.chain, &mut draws);
            let (out, shot) = case.follow(&advice, &sky, None);
            complete += usize::from(case.widest(&shot, false) <= gap + 1e-9);
            went += out.len();
        }
        let share = complete as f64 / runs as f64;
        assert!(
            agrees(share, advice.chance, runs),
            "{share} against {}",
            advice.chance
        );
        // The number of outings scatters by less than the budget.
        let outings_mean = went as f64 / runs as f64;
        assert!(
            (outings_mean - advice.expected_outings).abs()
                < 5.0 * outings as f64 / (runs as f64).sqrt()
        );
    }
}

#[test]
fn more_outings_better_odds_and_wider_gaps_help() {
    let chance = |odds: f64, outings: usize, gap: f64, seen: bool| {
        let advice = long_season(odds, 0.3, outings, gap, seen).advice();
        if let Goal::Complete { .. } = advice.goal {
            advice.chance
        } else {
            0.0
        }
    };
    for seen in [false, true] {
        let base = chance(0.4, 30, 8.0, seen);
        assert!(base > 0.05);
        assert!(
            chance(0.4, 36, 8.0, seen) > base
                && chance(0.5, 30, 8.0, seen) > base
                && chance(0.4, 30, 9.0, seen) > base
        );
    }
    // What is seen can be ignored.
    assert!(chance(0.4, 30, 7.0, true) > chance(0.4, 30, 7.0, false));
    // A budget beyond the number of nights is the number of nights.
    assert!((chance(0.4, 250, 7.0, false) - chance(0.4, 100_000, 7.0, false)).abs() < 1e-12);
}

/// One candidate a degree and a night, from today on.
fn nightly(nights: i32, odds: f64) -> (Vec<Candidate>, Path, Chain) {
    let candidates = (0..nights)
        .map(|day| candidate(after(today(), day), f64::from(day), 0.8))
        .collect();
    let path = Path {
        start: mark(after(today(), -6), -6.0),
        end: mark(after(today(), nights), f64::from(nights)),
    };
    let chain = weather([odds; 12], 0.3)
        .chain(today(), after(today(), nights), None, Forecast::default())
        .unwrap();
    (candidates, path, chain)
}

fn days(candidates: &[Candidate], path: Path, outings: usize, gap: f64) -> AdviceRequest<'_> {
    AdviceRequest {
        candidates,
        path,
        frames: &[],
        outings,
        gap: Gap::Days(gap),
        weather_always_seen: false,
    }
}

#[test]
fn gaps_that_cannot_be_held_name_the_section_and_the_smallest_that_can() {
    let (mut candidates, path, chain) = nightly(30, 0.5);
    candidates.retain(|candidate| !(12.0..19.5).contains(&candidate.mark.track.degrees()));
    let cannot = |request: AdviceRequest| match advise(&request, &chain).unwrap().goal {
        Goal::Instead { cannot, .. } => cannot,
        Goal::Complete { .. } => panic!("it can be held"),
    };
    let hole = cannot(days(&candidates, path, 25, 7.0));
    assert_eq!(
        hole.to_string(),
        "a gap of 7 days cannot be held: the section from 2027-02-12 to 2027-02-21 has no candidate night and is 9 days wide; the smallest gap that can is 9 days"
    );
    assert_eq!(hole.smallest, 9.0);
    // 36 days in steps of 9: three frames between the ends.
    let budget = cannot(days(&candidates, path, 2, 10.0));
    assert_eq!(
        budget.reason,
        Reason::Budget {
            needed: 3,
            outings: 2
        }
    );
    assert!(
        budget
            .to_string()
            .contains("it takes 3 frames, and 2 outings are left; the smallest gap that can is")
    );
    let frames = [
        mark(after(today(), -1), -1.0),
        mark(after(today(), -5), -5.0),
    ];
    let broken = AdviceRequest {
        frames: &frames,
        ..days(&candidates, path, 25, 3.5)
    };
    let message = cannot(broken).to_string();
    assert!(
        message.contains("the section from 2027-01-27 to 2027-01-31 is past and 4 days wide"),
        "{message}"
    );
    // The rest can still be held: that is what is advised.
    let (whole, ..) = nightly(30, 0.5);
    let rest = advise(
        &AdviceRequest {
            frames: &frames,
            ..days(&whole, path, 25, 3.5)
        },
        &chain,
    )
    .unwrap();
    assert!(matches!(rest.goal, Goal::Instead { gap: 3.5, .. }) && rest.chance > 0.0);
    // No clear sky at all.
    let (candidates, path, dull) = nightly(30, 0.0);
    let advice = advise(&days(&candidates, path, 25, 8.0), &dull).unwrap();
    let Goal::Instead { cannot, gap } = &advice.goal else {
        panic!("{:?}", advice.goal)
    };
    assert!(cannot.reason == Reason::Odds && (gap - 36.0).abs() < 1e-9);
    assert!(advice.next_outing.is_none() && !advice.tonight.unwrap().go);
}

#[test]
fn the_end_of_the_path_counts_as_well_as_its_start() {
    let (candidates, path, chain) = nightly(10, 0.5);
    // The whole path is 16 days: nothing to do for a gap of 16.
    let idle = advise(&days(&candidates, path, 5, 16.0), &chain).unwrap();
    assert!(idle.chance == 1.0 && idle.words("x")[0].contains("finished"));
    let standing = Standing {
        night: today(),
        last_frame: None,
        known: None,
        outings: 5,
    };
    assert!(matches!(
        idle.decide(&standing),
        Err(AdviceError::Finished { .. })
    ));
    // One outing and 15 days: any night is within 15 of both ends; the odds are the same on all, so it can wait to the last.
    let one = advise(&days(&candidates, path, 1, 15.0), &chain).unwrap();
    assert!((one.chance - 0.5).abs() < 1e-12 && one.next_outing == Some(after(today(), 9)));
    // 9 days: only nights 1, 2 and 3 are within 9 days of both ends.
    let tight = advise(&days(&candidates, path, 1, 9.0), &chain).unwrap();
    assert!(tight.next_outing == Some(after(today(), 3)) && tight.nights.len() == 10);
}

#[test]
fn a_night_known_to_be_clear_or_cloudy_is_taken_or_left() {
    let (candidates, path, _) = nightly(20, 0.3);
    let advice = |tonight: f64| {
        let forecast = Forecast {
            tonight: Some(Probability::new(tonight, "forecast").unwrap()),
            tomorrow: None,
        };
        let chain = weather([0.3; 12], 0.4)
            .chain(today(), after(today(), 20), None, forecast)
            .unwrap();
        advise(&days(&candidates, path, 8, 8.0), &chain).unwrap()
    };
    let (clear, cloudy) = (advice(1.0), advice(0.0));
    let (sure, none) = (clear.tonight.unwrap(), cloudy.tonight.unwrap());
    assert!(sure.go && sure.lost() > 0.05 && !none.go && none.lost() == 0.0);
    assert!(clear.chance > advice(0.3).chance && advice(0.3).chance > cloudy.chance);
    assert!(
        clear.words("x")[1]
            .starts_with("no frame yet, sky clear (100 %): go (staying at home leaves ")
    );
    assert!(cloudy.words("x")[1] == "no frame yet, sky cloudy (0 %): stay at home");
}

#[test]
fn words_are_a_rule_one_can_follow() {
    let (candidates, path, _) = nightly(30, 0.4);
    let frames = [mark(after(today(), -6), -6.0)];
    let forecast = Forecast {
        tonight: Some(Probability::new(0.7, "forecast").unwrap()),
        tomorrow: None,
    };
    let chain = weather([0.4; 12], 0.3)
        .chain(today(), after(today(), 30), None, forecast)
        .unwrap();
    let request = AdviceRequest {
        frames: &frames,
        ..days(&candidates, path, 14, 9.0)
    };
    let lines = advise(&request, &chain)
        .unwrap()
        .words("your odds (40 % in every month, persistence 0.3)");
    assert!(
        lines[0]
            .contains(": a complete loop, no gap over 9 days, on your odds (40 % in every month"),
        "{lines:?}"
    );
    assert!(
        lines[1].starts_with(
            "last frame 6 nights ago, sky likely clear (70 %): go (staying at home leaves "
        ),
        "{lines:?}"
    );
    assert!(
        lines[2].starts_with("next outing 2027-02-01; after a frame then 2027-02-"),
        "{lines:?}"
    );
    assert!(
        lines[3].starts_with("after a frame go again from ")
            && lines[4].starts_with("after a clouded outing go again from ")
    );
    let seen = advise(
        &AdviceRequest {
            weather_always_seen: true,
            ..request
        },
        &chain,
    )
    .unwrap()
    .words("x");
    assert!(
        seen[2].starts_with("after a clear night go when the last frame is "),
        "{seen:?}"
    );
}

#[test]
fn rules_state_how_often_they_agree() {
    // Independent nights and an ample budget: after cloud the best is always the very next night.
    let (candidates, path, _) = nightly(25, 0.5);
    let chain = weather([0.5; 12], 0.0)
        .chain(today(), after(today(), 25), None, Forecast::default())
        .unwrap();
    let advice = advise(&days(&candidates, path, 25, 7.5), &chain).unwrap();
    let cloud = advice
        .rule
        .iter()
        .find(|line| line.after == SkyState::Cloud)
        .unwrap();
    assert_eq!(cloud.from_nights, 1);
    assert!(
        advice
            .rule
            .iter()
            .all(|line| line.agreement >= 0.5 && line.agreement <= 1.0 + 1e-12)
    );
}

#[test]
fn requests_that_cannot_be_say_why() {
    let (candidates, path, chain) = nightly(20, 0.4);
    let error = |request: AdviceRequest| advise(&request, &chain).unwrap_err();
    let base = days(&candidates, path, 8, 8.0);
    assert_eq!(
        error(AdviceRequest { outings: 0, ..base }),
        AdviceError::NoOutings
    );
    assert_eq!(
        realistic_gap(&AdviceRequest { outings: 0, ..base }, &chain),
        Err(AdviceError::NoOutings)
    );
    for gap in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(matches!(
            error(AdviceRequest {
                gap: Gap::Days(gap),
                ..base
            }),
            AdviceError::Gap { .. }
        ));
    }
    let none = error(AdviceRequest {
        candidates: &[],
        ..base
    });
    assert!(
        matches!(none, AdviceError::Course(PickError::NoCandidates { .. })),
        "{none}"
    );
    let odd = [candidate(today(), 0.0, 1.5)];
    assert!(matches!(
        error(AdviceRequest {
            candidates: &odd,
            ..base
        }),
        AdviceError::Course(PickError::Quality { .. })
    ));
    let ahead = [mark(today(), 0.0)];
    assert!(matches!(
        error(AdviceRequest {
            frames: &ahead,
            ..base
        }),
        AdviceError::Course(PickError::FrameAhead { .. })
    ));
    let advice = advise(&base, &chain).unwrap();
    let standing = |night, known| Standing {
        night,
        last_frame: None,
        known,
        outings: 8,
    };
    let outside = after(today(), 40);
    assert_eq!(
        advice.decide(&standing(outside, None)),
        Err(AdviceError::NotACandidate { night: outside })
    );
    let known = Some(KnownSky {
        night: after(today(), 3),
        sky: SkyState::Clear,
    });
    let early = advice
        .decide(&standing(after(today(), 3), known))
        .unwrap_err();
    assert!(
        matches!(early, AdviceError::KnownTooEarly { .. }),
        "{early}"
    );
}

#[test]
fn a_problem_too_large_is_refused_at_once() {
    let nights = 1900;
    let candidates: Vec<Candidate> = (0..nights)
        .map(|day| candidate(after(today(), day), f64::from(day), 0.8))
        .collect();
    let path = Path {
        start: mark(today(), 0.0),
        end: mark(after(today(), nights), 3000.0),
    };
    let chain = weather([0.4; 12], 0.3)
        .chain(today(), after(today(), nights), None, Forecast::default())
        .unwrap();
    let error = advise(&days(&candidates, path, 1900, 1500.0), &chain).unwrap_err();
    assert!(
        error
            .to_string()
            .contains("are too much at once; shorten the path"),
        "{error}"
    );
}
