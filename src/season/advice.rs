//! Go out tonight or stay at home: the best policy for someone who decides day by day, with a budget of outings.
//!
//! # The problem
//! The loop is *complete* when over the chosen path no two successive frames, nor an end and its nearest frame, lie farther
//! apart than the widest gap allowed (degrees along the track, or days). Every night the choice is to go or to stay, before
//! the weather of that night is seen; an outing on a clear night gives a frame. The policy that makes the chance of a
//! complete loop greatest follows by stochastic dynamic programming over
//!
//! ```text
//! night, last frame, last night whose weather is known, outings left
//! ```
//!
//! Belief about the sky runs through the chain of [`super::weather`] from that last known night. Staying at home reveals
//! nothing, so the known night is the last frame (clear) or a later clouded outing; if the user says that the weather is
//! always seen, it is last night. Odds of a forecast for tonight hold whatever was known, and 0 or 1 mean that tonight is known.
//!
//! # Exactly, and fast
//! Until the next outing a policy that sees nothing cannot change its mind, so it is a choice of the next night to go. A frame
//! must follow the last one within the gap: the last night on which it can is its *deadline*. With C(t, b) the value after
//! a frame on night t and W(s, j, b) after a clouded outing on j, last frame on s, b outings left:
//!
//! ```text
//! C(s, b)    = 1 if the end is within the gap, else max over s < t <= deadline(s) of p C(t, b-1) + (1-p) W(s, t, b-1)
//! W(s, j, b) =                                      max over j < t <= deadline(s) of p C(t, b-1) + (1-p) W(s, t, b-1)
//! ```
//!
//! with p the chance of a clear night t after what is known. For K candidate nights, at most w of them within one gap, and B
//! outings: K w^2 B / 2 steps and K w B numbers kept, at most K^3 B / 6 and K^2 B / 2, when the gap spans the path: for
//! 250 nights and 40 outings 10 MB. With weather always seen, and d nights of the calendar within one gap: 2 K d B steps
//! and numbers.
//!
//! # Where the chance is nil
//! The reason is given, with the smallest gap that can be held if every outing is clear. What is past cannot be mended, so the
//! advice goes on for the path from the last frame on: with the gap asked for, if it can be held from there; else with the
//! smallest gap that some policy holds with a chance of at least one half (the least median of the widest gap), or of a
//! quarter, an eighth and so on where one half is reached only by the whole rest as one gap. The policy is the one
//! most likely to hold that gap.
//!
//! Lengths in degrees or days, chances 0 to 1.

use std::ops::Range;
use std::sync::Arc;

use super::picks::{
    Candidate, Course, Mark, Measure, Path, PickError, Usable, all_lengths, within,
};
use super::weather::{Chain, KnownSky, SkyState, percent};
use crate::sky::Angle;
use crate::sky::calendar::CivilDate;

/// What the user asked for cannot be.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum AdviceError {
    #[error(transparent)]
    Course(#[from] PickError),
    #[error("no outings left: a budget of 0 gives no frame; give at least 1")]
    NoOutings,
    #[error("a widest gap of {value} cannot be; give a number above 0")]
    Gap { value: f64 },
    #[error(
        "{nights} candidate nights with {outings} outings and a gap of {gap} are too much at once; shorten the path, narrow the gap or lower the outings"
    )]
    TooLarge {
        nights: usize,
        outings: usize,
        gap: String,
    },
    #[error("no advice for {night}: it is not one of the candidate nights")]
    NotACandidate { night: CivilDate },
    #[error("no advice for {night}: the weather of {known} cannot be known before it")]
    KnownTooEarly { night: CivilDate, known: CivilDate },
    #[error("no advice for {night}: the path is finished, no further outing is needed")]
    Finished { night: CivilDate },
}

/// The widest gap allowed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Gap {
    Along(Angle),
    Days(f64),
}

impl Gap {
    #[must_use]
    pub const fn measure(self) -> Measure {
        match self {
            Gap::Along(_) => Measure::Angle,
            Gap::Days(_) => Measure::Days,
        }
    }

    /// Degrees or days.
    #[must_use]
    pub const fn length(self) -> f64 {
        match self {
            Gap::Along(angle) => angle.degrees(),
            Gap::Days(days) => days,
        }
    }
}

/// Everything that the advice depends on, but for the weather.
#[derive(Clone, Copy, Debug)]
pub struct AdviceRequest<'a> {
    /// In any order; of several for one night the best counts. Those before today or off the path are left out.
    pub candidates: &'a [Candidate],
    pub path: Path,
    /// Frames that the path already has.
    pub frames: &'a [Mark],
    /// Outings left from the chain's today on.
    pub outings: usize,
    pub gap: Gap,
    /// Whether the user sees what the weather was when staying at home.
    pub weather_always_seen: bool,
}

/// What the policy is after.
#[derive(Clone, Debug, PartialEq)]
pub enum Goal {
    /// Hold the gap that was asked for.
    Complete { gap: f64 },
    /// That cannot be; hold this gap instead from the last frame (or the start of the path) on.
    Instead { gap: f64, cannot: CannotHold },
}

/// Why a gap cannot be held.
#[derive(Clone, Debug, PartialEq)]
pub struct CannotHold {
    pub measure: Measure,
    /// What was asked for.
    pub asked: f64,
    /// The smallest gap that can be held if every outing is clear.
    pub smallest: f64,
    pub reason: Reason,
}

#[derive(Clone, Debug, PartialEq)]
pub enum Reason {
    /// Two frames of the log, or the start and the first of them, are that far apart.
    Past {
        after: CivilDate,
        before: CivilDate,
        length: f64,
    },
    /// No candidate night between these two.
    Hole {
        after: CivilDate,
        before: CivilDate,
        length: f64,
    },
    /// It takes more frames than outings are left.
    Budget { needed: usize, outings: usize },
    /// It takes nights whose odds are nil.
    Odds,
}

impl std::fmt::Display for CannotHold {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let words = |length: f64| self.measure.words(length);
        write!(f, "a gap of {} cannot be held: ", words(self.asked))?;
        match self.reason {
            Reason::Past {
                after,
                before,
                length,
            } => {
                write!(
                    f,
                    "the section from {after} to {before} is past and {} wide",
                    words(length)
                )?;
            }
            Reason::Hole {
                after,
                before,
                length,
            } => {
                write!(
                    f,
                    "the section from {after} to {before} has no candidate night and is {} wide",
                    words(length)
                )?;
            }
            Reason::Budget { needed, outings } => {
                write!(
                    f,
                    "it takes {needed} frames, and {outings} outings are left"
                )?;
            }
            Reason::Odds => write!(
                f,
                "it takes nights on which the odds of a clear sky are nil"
            )?,
        }
        write!(f, "; the smallest gap that can is {}", words(self.smallest))
    }
}

/// Go or stay, with what either is worth.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Decision {
    pub go: bool,
    /// Chance of a clear night as far as is known.
    pub clear: f64,
    /// Chance of reaching the goal after going out, the best policy thereafter.
    pub chance_going: f64,
    /// The same after staying at home.
    pub chance_staying: f64,
}

impl Decision {
    /// What is lost by staying at home; 0 where nothing is.
    #[must_use]
    pub fn lost(&self) -> f64 {
        (self.chance_going - self.chance_staying).max(0.0)
    }
}

/// One coming night, seen from today.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NightAdvice {
    pub night: CivilDate,
    /// Place of the spell in the request's candidates.
    pub candidate: usize,
    /// Chance of a clear night as known today.
    pub clear: f64,
    /// Chance that the policy, followed from today, goes out on it.
    pub go: f64,
    /// What is lost of the chance of the goal if one stays at home on it against the policy, finding out only that day,
    /// and follows the best policy before and after.
    pub lost_by_staying: f64,
}

/// A line of the printed rule: how long to wait.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RuleLine {
    /// After this sky: at the last outing or, with weather always seen, last night.
    pub after: SkyState,
    /// Go from this many nights on: after that outing or, with weather always seen, after the last frame.
    pub from_nights: usize,
    /// Share of the evenings that may come on which the line agrees with the policy.
    pub agreement: f64,
}

/// Where one stands on a night: what the policy needs to decide.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Standing {
    pub night: CivilDate,
    /// The last frame since today; `None` when none has been added.
    pub last_frame: Option<CivilDate>,
    /// The latest night since today whose weather is known; `None` when nothing has been learned but by the frame.
    pub known: Option<KnownSky>,
    pub outings: usize,
}

/// The policy with what follows from it.
#[derive(Clone, Debug)]
pub struct Advice {
    pub goal: Goal,
    /// Chance of reaching the goal under the policy: of a complete loop, unless that is nil.
    pub chance: f64,
    /// `None` where tonight is no candidate night.
    pub tonight: Option<Decision>,
    /// Every candidate night from tonight on.
    pub nights: Vec<NightAdvice>,
    pub expected_outings: f64,
    /// The next night to go; `None` when none is of use or, with weather always seen, when it depends on the weather.
    pub next_outing: Option<CivilDate>,
    /// The night to go after that one, if it gives a frame,
    pub next_after_frame: Option<CivilDate>,
    /// and if it is clouded out.
    pub next_after_cloud: Option<CivilDate>,
    pub rule: Vec<RuleLine>,
    measure: Measure,
    last: Mark,
    begun: bool,
    weather_always_seen: bool,
    policy: Option<Policy>,
}

/// Works out the policy.
///
/// # Errors
/// Whatever in the request cannot be; see [`AdviceError`]. A gap that cannot be held is no error: see [`Goal`].
pub fn advise(request: &AdviceRequest, chain: &Chain) -> Result<Advice, AdviceError> {
    let gap = request.gap.length();
    if !(gap > 0.0 && gap.is_finite()) {
        return Err(AdviceError::Gap { value: gap });
    }
    let measure = request.gap.measure();
    let course = Course::new(request.path, request.frames, chain.today())?;
    let start = measure.of(course.last);
    let end = measure.of(request.path.end);
    let so_far = course.widest_so_far(measure);
    let mut advice = Advice {
        goal: Goal::Complete { gap },
        chance: 1.0,
        tonight: None,
        nights: Vec::new(),
        expected_outings: 0.0,
        next_outing: None,
        next_after_frame: None,
        next_after_cloud: None,
        rule: Vec::new(),
        measure,
        last: course.last,
        begun: course.begun,
        weather_always_seen: request.weather_always_seen,
        policy: None,
    };
    let past = course
        .widest_between(measure)
        .filter(|(length, _, _)| !within(gap, 0.0, *length));
    let past = past.map(|(length, after, before)| Reason::Past {
        after: after.night,
        before: before.night,
        length,
    });
    if within(gap, start, end) {
        if let Some(reason) = past {
            let cannot = CannotHold {
                measure,
                asked: gap,
                smallest: so_far,
                reason,
            };
            advice.goal = Goal::Instead { gap, cannot };
        }
        return Ok(advice);
    }
    if request.outings == 0 {
        return Err(AdviceError::NoOutings);
    }
    let season = Arc::new(Nights::new(
        &course.usable(request.candidates, chain)?,
        measure,
        &course,
        chain,
    ));
    let outings = request.outings.min(season.list.len());
    let solve = |gap: f64| Policy::solve(&season, gap, outings, request.weather_always_seen);

    let mut policy = solve(gap)?;
    let is_lost = policy.chance() <= 0.0;
    if is_lost || past.is_some() {
        let smallest = season.smallest_gap(outings);
        let aim = if is_lost {
            least_widest(&season, smallest, &solve)?
        } else {
            gap
        };
        if is_lost {
            policy = solve(aim)?;
        }
        let reason = past.unwrap_or_else(|| why_not(&course, &season, measure, gap, outings));
        let cannot = CannotHold {
            measure,
            asked: gap,
            smallest: smallest.max(so_far),
            reason,
        };
        advice.goal = Goal::Instead { gap: aim, cannot };
    }
    advice.chance = policy.chance();
    policy.fill_in(&mut advice);
    advice.policy = Some(policy);
    Ok(advice)
}

/// The smallest gap that has an even chance (or a quarter, an eighth and so on: see the head of this module) from the last
/// frame on with these outings, in the measure of the request's gap: what to offer where the chance of the gap asked for
/// is poor.
///
/// # Errors
/// Whatever in the request cannot be; see [`AdviceError`].
pub fn realistic_gap(request: &AdviceRequest, chain: &Chain) -> Result<f64, AdviceError> {
    let measure = request.gap.measure();
    let course = Course::new(request.path, request.frames, chain.today())?;
    if request.outings == 0 {
        return Err(AdviceError::NoOutings);
    }
    let season = Arc::new(Nights::new(
        &course.usable(request.candidates, chain)?,
        measure,
        &course,
        chain,
    ));
    let outings = request.outings.min(season.list.len());
    let solve = |gap: f64| Policy::solve(&season, gap, outings, request.weather_always_seen);
    least_widest(&season, season.smallest_gap(outings), &solve)
}

/// Why the gap cannot be held from the last frame on.
fn why_not(
    course: &Course,
    season: &Nights,
    measure: Measure,
    asked: f64,
    outings: usize,
) -> Reason {
    match season.frames_needed(asked) {
        Err((from, to)) => {
            let mark = |place: Option<usize>, other: Mark| {
                place
                    .and_then(|place| season.list.get(place))
                    .map_or(other, |night| night.mark)
            };
            let (from, to) = (mark(from, course.last), mark(to, course.end()));
            Reason::Hole {
                after: from.night,
                before: to.night,
                length: measure.of(to) - measure.of(from),
            }
        }
        Ok(needed) if needed > outings => Reason::Budget { needed, outings },
        Ok(_) => Reason::Odds,
    }
}

/// The smallest gap that some policy holds with a chance of one half or more, or of a quarter and so on: see the head of
/// this module. `smallest` is the smallest that can be held at all.
fn least_widest(
    season: &Nights,
    smallest: f64,
    solve: &impl Fn(f64) -> Result<Policy, AdviceError>,
) -> Result<f64, AdviceError> {
    let whole = season.end - season.start;
    let mut lengths = season.lengths();
    lengths.retain(|&length| length >= smallest && !season.is_done(0, length));
    let reaches = |place: usize, wanted: f64| -> Result<bool, AdviceError> {
        lengths.get(place).map_or(Ok(true), |&length| {
            Ok(solve(length)?.chance() >= wanted - ROUNDING)
        })
    };
    let Some(&longest) = lengths.last() else {
        return Ok(whole);
    };
    let mut wanted = 0.5;
    let mut most = None;
    loop {
        // In growing strides first: narrow gaps are solved much faster than wide ones.
        let (mut below, mut above) = (0, 1);
        while !reaches(above - 1, wanted)? {
            below = above;
            above *= 2;
        }
        while above - below > 1 {
            let middle = below + (above - below) / 2;
            if reaches(middle - 1, wanted)? {
                above = middle
            } else {
                below = middle
            }
        }
        if let Some(&length) = lengths.get(above - 1) {
            return Ok(length);
        }
        let most = match most {
            Some(most) => most,
            None => *most.insert(solve(longest)?.chance()),
        };
        if most <= 0.0 {
            return Ok(whole);
        }
        while wanted > most {
            wanted /= 2.0;
        }
    }
}

/// One candidate night.
#[derive(Clone, Copy, Debug)]
struct Night {
    mark: Mark,
    /// Place in the request's candidates.
    candidate: usize,
    /// Place in the chain.
    night: usize,
    /// Degrees or days.
    place: f64,
}

/// The candidate nights ahead, with what the weather on one says of the others.
#[derive(Clone, Debug)]
struct Nights {
    list: Vec<Night>,
    /// Where the last frame, or the start of the path, lies; and its end.
    start: f64,
    end: f64,
    chain: Chain,
    /// Element i: chances of clear nights i+1, i+2, ... of the list after night i was clear;
    after_clear: Vec<Vec<f64>>,
    /// and after it was cloudy.
    after_cloud: Vec<Vec<f64>>,
    /// Chances as known today.
    beliefs: Vec<f64>,
    /// By place in the chain: place in the list.
    by_night: Vec<Option<usize>>,
}

impl Nights {
    fn new(usable: &[Usable], measure: Measure, course: &Course, chain: &Chain) -> Self {
        let (start, end) = (measure.of(course.last), measure.of(course.end()));
        let best = |spells: &[Usable]| {
            // The first of the best, so that equal spells do not change places.
            spells.iter().copied().reduce(|best, next| {
                if next.candidate.quality > best.candidate.quality {
                    next
                } else {
                    best
                }
            })
        };
        let list: Vec<Night> = usable
            .chunk_by(|a, b| a.night == b.night)
            .filter_map(best)
            .map(|usable| Night {
                mark: usable.candidate.mark,
                candidate: usable.index,
                night: usable.night,
                place: measure.of(usable.candidate.mark),
            })
            .collect();
        let mut by_night = vec![None; chain.nights()];
        for (place, night) in list.iter().enumerate() {
            if let Some(slot) = by_night.get_mut(night.night) {
                *slot = Some(place);
            }
        }
        let after = |sky: SkyState| -> Vec<Vec<f64>> {
            list.iter()
                .map(|night| {
                    let later = by_night.iter().skip(night.night + 1);
                    later
                        .zip(chain.after(night.night, sky))
                        .filter(|(slot, _)| slot.is_some())
                        .map(|(_, p)| p)
                        .collect()
                })
                .collect()
        };
        let beliefs = list
            .iter()
            .filter_map(|night| chain.beliefs().get(night.night).copied())
            .collect();
        let (after_clear, after_cloud) = (after(SkyState::Clear), after(SkyState::Cloud));
        Nights {
            list,
            start,
            end,
            chain: chain.clone(),
            after_clear,
            after_cloud,
            beliefs,
            by_night,
        }
    }

    /// Where the last frame of a state lies: state 0 is today's, state i + 1 a frame on night i of the list.
    fn place(&self, state: usize) -> f64 {
        state.checked_sub(1).map_or(self.start, |night| {
            self.list.get(night).map_or(self.end, |night| night.place)
        })
    }

    /// Whether the path ends within the gap after a state's last frame.
    fn is_done(&self, state: usize, gap: f64) -> bool {
        within(gap, self.place(state), self.end)
    }

    /// End (exclusive) of the nights on which a frame may follow that of a state; they begin with night `state`.
    fn deadline(&self, state: usize, gap: f64) -> usize {
        let from = self.place(state);
        let later = self.list.get(state..).unwrap_or_default();
        state + later.partition_point(|night| within(gap, from, night.place))
    }

    /// The smallest gap that so many outings hold if every one of them is clear.
    fn smallest_gap(&self, outings: usize) -> f64 {
        let lengths = self.lengths();
        let fits = |length: f64| {
            self.frames_needed(length)
                .is_ok_and(|needed| needed <= outings)
        };
        let place = lengths.partition_point(|&length| !fits(length));
        lengths.get(place).copied().unwrap_or(self.end - self.start)
    }

    /// Every length that the widest gap from the last frame on can have, rising.
    fn lengths(&self) -> Vec<f64> {
        let places: Vec<f64> = self.list.iter().map(|night| night.place).collect();
        let mut lengths = all_lengths(self.start, &places, self.end);
        lengths.sort_by(f64::total_cmp);
        lengths.dedup();
        lengths
    }

    /// The fewest frames that hold a gap if every night is clear; or the two nights of the list (`None` for the last frame
    /// and for the end of the path) between which it cannot be held.
    fn frames_needed(&self, gap: f64) -> Result<usize, (Option<usize>, Option<usize>)> {
        let mut state = 0;
        let mut frames = 0;
        while !self.is_done(state, gap) {
            let deadline = self.deadline(state, gap);
            if deadline == state {
                return Err((
                    state.checked_sub(1),
                    Some(state).filter(|&next| next < self.list.len()),
                ));
            }
            // The farthest frame within the gap: it is night `deadline - 1` of the list.
            state = deadline;
            frames += 1;
        }
        Ok(frames)
    }
}

/// Numbers in rows of one length: a value for each count of outings left.
#[derive(Clone, Debug)]
struct Rows {
    width: usize,
    values: Vec<f64>,
}

impl Rows {
    fn new(count: usize, width: usize) -> Self {
        Rows {
            width,
            values: vec![0.0; count * width],
        }
    }

    fn row(&self, place: usize) -> &[f64] {
        self.values
            .get(place * self.width..(place + 1) * self.width)
            .unwrap_or_default()
    }

    fn row_mut(&mut self, place: usize) -> &mut [f64] {
        self.values
            .get_mut(place * self.width..(place + 1) * self.width)
            .unwrap_or_default()
    }

    /// 0 where there is no such number.
    fn at(&self, place: usize, outings: usize) -> f64 {
        self.row(place).get(outings).copied().unwrap_or_default()
    }
}

/// At most so many numbers are kept (160 MB).
const MOST_NUMBERS: usize = 20_000_000;
/// And at most so many steps taken (a few seconds).
const MOST_STEPS: usize = 4_000_000_000;
/// An outing must gain more than this to be worth it: what differs by less is rounding.
const ROUNDING: f64 = 1e-12;

/// Values of every state, from which each decision follows.
#[derive(Clone, Debug)]
struct Policy {
    season: Arc<Nights>,
    gap: f64,
    outings: usize,
    weather_always_seen: bool,
    /// Row of a state: chance of the goal right after its last frame (state 0: as things are today).
    after_frame: Rows,
    /// For each state, when nothing is seen from home: row j is the chance after a clouded outing on night `state + j` of
    /// the list. When the weather is always seen: rows 2 d and 2 d + 1 are the chances d + 1 nights after the last frame (for
    /// state 0: d nights after today), before that night is seen, when the night before was clear and cloudy.
    later: Vec<Rows>,
}

impl Policy {
    fn solve(
        season: &Arc<Nights>,
        gap: f64,
        outings: usize,
        weather_always_seen: bool,
    ) -> Result<Policy, AdviceError> {
        let states = season.list.len() + 1;
        let width = outings + 1;
        let mut policy = Policy {
            season: Arc::clone(season),
            gap,
            outings,
            weather_always_seen,
            after_frame: Rows::new(states, width),
            later: vec![Rows::new(0, width); states],
        };
        let rows: Vec<usize> = (0..states)
            .map(|state| {
                if season.is_done(state, gap) {
                    0
                } else {
                    policy.rows_needed(state)
                }
            })
            .collect();
        let numbers = width.saturating_mul(rows.iter().sum());
        // Each row after a clouded outing is the best over half a window of further rows.
        let work: usize = rows.iter().map(|rows| rows * rows / 2).sum();
        if numbers > MOST_NUMBERS
            || (!weather_always_seen && width.saturating_mul(work) > MOST_STEPS)
        {
            let gap = format!("{gap:.1}");
            return Err(AdviceError::TooLarge {
                nights: season.list.len(),
                outings,
                gap,
            });
        }
        for (state, rows) in rows.into_iter().enumerate().rev() {
            if season.is_done(state, gap) {
                policy.after_frame.row_mut(state).fill(1.0);
                continue;
            }
            let mut later = Rows::new(rows, width);
            let first = if weather_always_seen {
                policy.solve_seen(state, &mut later)
            } else {
                policy.solve_unseen(state, &mut later)
            };
            policy.after_frame.row_mut(state).copy_from_slice(&first);
            policy.later[state] = later;
        }
        Ok(policy)
    }

    fn rows_needed(&self, state: usize) -> usize {
        let deadline = self.season.deadline(state, self.gap);
        if !self.weather_always_seen {
            return deadline - state;
        }
        let last = deadline
            .checked_sub(1)
            .filter(|&last| last >= state)
            .and_then(|last| self.season.list.get(last));
        last.map_or(0, |last| 2 * (last.night + 1 - self.first_night(state)))
    }

    /// The night of the chain that follows a state's last frame; tonight for state 0.
    fn first_night(&self, state: usize) -> usize {
        state
            .checked_sub(1)
            .and_then(|night| self.season.list.get(night))
            .map_or(0, |night| night.night + 1)
    }

    /// Fills the rows after clouded outings and returns the row right after the frame.
    fn solve_unseen(&self, state: usize, later: &mut Rows) -> Vec<f64> {
        let deadline = self.season.deadline(state, self.gap);
        for cloudy in (state..deadline).rev() {
            let chances = self
                .season
                .after_cloud
                .get(cloudy)
                .map(Vec::as_slice)
                .unwrap_or_default();
            let best = self.best_next(state, cloudy + 1..deadline, chances, later);
            later.row_mut(cloudy - state).copy_from_slice(&best);
        }
        self.best_next(
            state,
            state..deadline,
            self.chances_after_frame(state),
            later,
        )
    }

    /// Chances of the nights `state`, `state + 1`, ... of the list right after the state's frame.
    fn chances_after_frame(&self, state: usize) -> &[f64] {
        match state.checked_sub(1) {
            Some(night) => self
                .season
                .after_clear
                .get(night)
                .map(Vec::as_slice)
                .unwrap_or_default(),
            None => &self.season.beliefs,
        }
    }

    /// For each count of outings, the value of the best next night to go; `chances` begins with that of the first night.
    fn best_next(
        &self,
        state: usize,
        nights: Range<usize>,
        chances: &[f64],
        later: &Rows,
    ) -> Vec<f64> {
        let mut best = vec![0.0; self.outings + 1];
        for (night, &clear) in nights.zip(chances) {
            let frame = self.after_frame.row(night + 1);
            let cloud = later.row(night - state);
            for ((best, &frame), &cloud) in best.iter_mut().skip(1).zip(frame).zip(cloud) {
                let value = clear * frame + (1.0 - clear) * cloud;
                *best = if value > *best { value } else { *best };
            }
        }
        best
    }

    fn solve_seen(&self, state: usize, later: &mut Rows) -> Vec<f64> {
        let first = self.first_night(state);
        let nothing = vec![0.0; self.outings + 1];
        for offset in (0..later.values.len() / later.width / 2).rev() {
            let Some(step) = self.season.chain.steps().get(first + offset) else {
                continue;
            };
            let place = self.season.by_night.get(first + offset).copied().flatten();
            let frame = place.map(|night| self.after_frame.row(night + 1));
            for (column, clear) in [step.after_clear, step.after_cloud].into_iter().enumerate() {
                let (rows, next) = later.values.split_at_mut(2 * (offset + 1) * later.width);
                let (next_clear, next_cloud) = if next.is_empty() {
                    (nothing.as_slice(), nothing.as_slice())
                } else {
                    (&next[..later.width], &next[later.width..2 * later.width])
                };
                let row = &mut rows[(2 * offset + column) * later.width..][..later.width];
                for ((value, &after_clear), &after_cloud) in
                    row.iter_mut().zip(next_clear).zip(next_cloud)
                {
                    *value = clear * after_clear + (1.0 - clear) * after_cloud;
                }
                for ((value, &frame), &cloud) in row
                    .iter_mut()
                    .skip(1)
                    .zip(frame.unwrap_or_default())
                    .zip(next_cloud)
                {
                    let going = clear * frame + (1.0 - clear) * cloud;
                    *value = if going > *value { going } else { *value };
                }
            }
        }
        if later.values.is_empty() {
            nothing
        } else {
            later.row(0).to_vec()
        }
    }

    /// Chance of the goal as things are today.
    fn chance(&self) -> f64 {
        self.after_frame.at(0, self.outings)
    }

    /// Value of going out on a night of the list, clear with this chance; 0 after the deadline.
    fn going_if_in_time(&self, state: usize, night: usize, clear: f64, outings: usize) -> f64 {
        let is_in_time = (state..self.season.deadline(state, self.gap)).contains(&night);
        if is_in_time {
            self.going(state, night, clear, outings)
        } else {
            0.0
        }
    }

    /// The same for a night up to the deadline.
    fn going(&self, state: usize, night: usize, clear: f64, outings: usize) -> f64 {
        let Some(left) = outings.checked_sub(1) else {
            return 0.0;
        };
        let cloud = if self.weather_always_seen {
            let next = self
                .season
                .list
                .get(night)
                .map_or(0, |night| night.night + 1);
            self.before_night(state, next, SkyState::Cloud, left)
        } else {
            self.later
                .get(state)
                .map_or(0.0, |rows| rows.at(night - state, left))
        };
        clear * self.after_frame.at(night + 1, left) + (1.0 - clear) * cloud
    }

    /// With weather always seen: value before a night of the chain when the night before it had this sky.
    fn before_night(&self, state: usize, night: usize, last: SkyState, outings: usize) -> f64 {
        let column = usize::from(last == SkyState::Cloud);
        let Some(offset) = night.checked_sub(self.first_night(state)) else {
            return 0.0;
        };
        self.later
            .get(state)
            .map_or(0.0, |rows| rows.at(2 * offset + column, outings))
    }

    /// The best next night to go, of nights up to the deadline: (place in the list, value, value of the best one after it); the latest among equals.
    fn next_outing(
        &self,
        state: usize,
        nights: Range<usize>,
        chances: &[f64],
        outings: usize,
    ) -> Option<(usize, f64, f64)> {
        let mut best: Option<(usize, f64, f64)> = None;
        for (night, &clear) in nights.zip(chances).rev() {
            let value = self.going(state, night, clear, outings);
            let later = best.map_or(0.0, |(_, value, _)| value);
            if value > later + ROUNDING {
                best = Some((night, value, later));
            }
        }
        best
    }

    /// Decides for any standing.
    fn decide(&self, standing: &Standing) -> Result<Decision, AdviceError> {
        let season = &self.season;
        let unknown = |night: CivilDate| AdviceError::NotACandidate { night };
        let find = |night: CivilDate| -> Result<usize, AdviceError> {
            let place = season
                .chain
                .index(night)
                .and_then(|index| season.by_night.get(index).copied().flatten());
            place.ok_or_else(|| unknown(night))
        };
        let tonight = find(standing.night)?;
        let state = standing
            .last_frame
            .map_or(Ok(0), |frame| find(frame).map(|night| night + 1))?;
        let night = season
            .list
            .get(tonight)
            .ok_or_else(|| unknown(standing.night))?
            .night;
        let too_early = |known| AdviceError::KnownTooEarly {
            night: standing.night,
            known,
        };
        if let Some(frame) = standing.last_frame.filter(|_| state > tonight) {
            return Err(too_early(frame));
        }
        // Chances of clear nights from tonight to the last that can matter.
        let last = season
            .deadline(state, self.gap)
            .checked_sub(1)
            .and_then(|last| season.list.get(last));
        let count = last.map_or(0, |last| last.night.saturating_sub(night)) + 1;
        let known = standing.known.or(standing.last_frame.map(|night| KnownSky {
            night,
            sky: SkyState::Clear,
        }));
        let chances: Vec<f64> = match known {
            None => season
                .chain
                .beliefs()
                .get(night..)
                .unwrap_or_default()
                .to_vec(),
            Some(known) => {
                let index = season
                    .chain
                    .index(known.night)
                    .ok_or_else(|| unknown(known.night))?;
                let wait = night
                    .checked_sub(index + 1)
                    .ok_or_else(|| too_early(known.night))?;
                season
                    .chain
                    .after(index, known.sky)
                    .skip(wait)
                    .take(count)
                    .collect()
            }
        };
        let clear = chances.first().copied().unwrap_or_default();
        let outings = standing.outings.min(self.outings);
        if season.is_done(state, self.gap) {
            return Ok(Decision {
                go: false,
                clear,
                chance_going: 1.0,
                chance_staying: 1.0,
            });
        }
        let chance_going = self.going_if_in_time(state, tonight, clear, outings);
        let chance_staying = if self.weather_always_seen {
            clear * self.before_night(state, night + 1, SkyState::Clear, outings)
                + (1.0 - clear) * self.before_night(state, night + 1, SkyState::Cloud, outings)
        } else {
            let later = season
                .list
                .get(tonight + 1..season.deadline(state, self.gap))
                .unwrap_or_default();
            let later_chances: Vec<f64> = later
                .iter()
                .filter_map(|later| chances.get(later.night - night).copied())
                .collect();
            let later = tonight + 1..tonight + 1 + later.len();
            self.next_outing(state, later, &later_chances, outings)
                .map_or(0.0, |(_, value, _)| value)
        };
        Ok(Decision {
            go: chance_going > chance_staying + ROUNDING,
            clear,
            chance_going,
            chance_staying,
        })
    }

    /// Works out the rest of the advice.
    fn fill_in(&self, advice: &mut Advice) {
        let tally = if self.weather_always_seen {
            self.follow_seen(advice.last)
        } else {
            self.follow_unseen()
        };
        let today = self.season.chain.today();
        let tonight = Standing {
            night: today,
            last_frame: None,
            known: None,
            outings: self.outings,
        };
        advice.tonight = self.decide(&tonight).ok();
        advice.expected_outings = tally.go.iter().sum();
        advice.nights = (self.season.list.iter().zip(&self.season.beliefs))
            .zip(tally.go.iter().zip(&tally.lost))
            .map(|((night, &clear), (&go, &lost_by_staying))| NightAdvice {
                night: night.mark.night,
                candidate: night.candidate,
                clear,
                go,
                lost_by_staying,
            })
            .collect();
        advice.rule = tally.rule();
        if self.weather_always_seen {
            return;
        }
        let season = &self.season;
        let date = |night: usize| season.list.get(night).map(|night| night.mark.night);
        let next = self.next_outing(
            0,
            0..season.deadline(0, self.gap),
            &season.beliefs,
            self.outings,
        );
        let Some((night, _, _)) = next else { return };
        let left = self.outings - 1;
        let after = |state: usize, from: usize, chances: &[f64]| {
            let deadline = season.deadline(state, self.gap);
            self.next_outing(state, from..deadline, chances, left)
                .and_then(|(night, _, _)| date(night))
        };
        advice.next_outing = date(night);
        if !season.is_done(night + 1, self.gap) {
            advice.next_after_frame =
                after(night + 1, night + 1, self.chances_after_frame(night + 1));
        }
        let after_cloud = season
            .after_cloud
            .get(night)
            .map(Vec::as_slice)
            .unwrap_or_default();
        advice.next_after_cloud = after(0, night + 1, after_cloud);
    }

    /// Follows the policy through all that may happen, when nothing is seen from home.
    fn follow_unseen(&self) -> Tally {
        let season = &self.season;
        let mut tally = Tally::new(season);
        let mut frame_mass = Rows::new(season.list.len() + 1, self.outings + 1);
        let mut cloud_mass: Vec<Rows> = self
            .later
            .iter()
            .map(|rows| Rows {
                width: rows.width,
                values: vec![0.0; rows.values.len()],
            })
            .collect();
        if let Some(mass) = frame_mass.row_mut(0).last_mut() {
            *mass = 1.0;
        }
        // In order of time: what is known dates from before night `known` of the list.
        for known in 0..=season.list.len() {
            for state in 0..=known {
                let is_frame = state == known;
                if season.is_done(state, self.gap) {
                    continue;
                }
                let deadline = season.deadline(state, self.gap);
                if known > deadline {
                    continue;
                }
                let chances = match known.checked_sub(1).filter(|_| !is_frame) {
                    Some(cloudy) => season
                        .after_cloud
                        .get(cloudy)
                        .map(Vec::as_slice)
                        .unwrap_or_default(),
                    None => self.chances_after_frame(state),
                };
                for outings in 1..=self.outings {
                    let mass = if is_frame {
                        frame_mass.at(state, outings)
                    } else {
                        cloud_mass
                            .get(state)
                            .map_or(0.0, |rows| rows.at(known - 1 - state, outings))
                    };
                    if mass <= 0.0 {
                        continue;
                    }
                    let Some((next, value, later)) =
                        self.next_outing(state, known..deadline, chances, outings)
                    else {
                        continue;
                    };
                    let clear = chances.get(next - known).copied().unwrap_or_default();
                    tally.went(next, mass, value - later);
                    if let Some(base) = known.checked_sub(1) {
                        let sky = if is_frame {
                            SkyState::Clear
                        } else {
                            SkyState::Cloud
                        };
                        tally.waited(season, base, sky, known..next, mass);
                    }
                    if let Some(to) = frame_mass.row_mut(next + 1).get_mut(outings - 1) {
                        *to += mass * clear;
                    }
                    let rows = cloud_mass.get_mut(state);
                    if let Some(to) =
                        rows.and_then(|rows| rows.row_mut(next - state).get_mut(outings - 1))
                    {
                        *to += mass * (1.0 - clear);
                    }
                }
            }
        }
        tally
    }

    /// The same when the weather is always seen.
    fn follow_seen(&self, last: Mark) -> Tally {
        let season = &self.season;
        let mut tally = Tally::new(season);
        let width = self.outings + 1;
        // Rows 2 s and 2 s + 1: state s after a clear and after a cloudy night.
        let mut mass = Rows::new(2 * (season.list.len() + 1), width);
        if let Some(mass) = mass.row_mut(0).last_mut() {
            *mass = 1.0;
        }
        for (night, step) in season.chain.steps().iter().enumerate() {
            let place = season.by_night.get(night).copied().flatten();
            let mut next = Rows::new(2 * (season.list.len() + 1), width);
            for state in 0..=place.map_or(season.list.len(), |place| place) {
                if season.is_done(state, self.gap) {
                    continue;
                }
                let in_time = place.filter(|&place| place < season.deadline(state, self.gap));
                for (column, (sky, clear)) in [
                    (SkyState::Clear, step.after_clear),
                    (SkyState::Cloud, step.after_cloud),
                ]
                .into_iter()
                .enumerate()
                {
                    for outings in 1..=self.outings {
                        let here = mass.at(2 * state + column, outings);
                        if here <= 0.0 {
                            continue;
                        }
                        let staying = clear
                            * self.before_night(state, night + 1, SkyState::Clear, outings)
                            + (1.0 - clear)
                                * self.before_night(state, night + 1, SkyState::Cloud, outings);
                        let going =
                            in_time.map_or(0.0, |place| self.going(state, place, clear, outings));
                        if staying <= 0.0 && going <= 0.0 {
                            continue;
                        }
                        let goes = going > staying + ROUNDING;
                        let left = outings - usize::from(goes);
                        if let Some(place) = place {
                            let since = match state
                                .checked_sub(1)
                                .and_then(|frame| season.list.get(frame))
                            {
                                Some(frame) => night - frame.night,
                                None => nights_since(&season.chain, last.night, night),
                            };
                            tally.counted(sky, since, here, goes);
                            if goes {
                                tally.went(place, here, going - staying);
                            }
                        }
                        let clear_state = place.filter(|_| goes).map_or(state, |place| place + 1);
                        if let Some(to) = next.row_mut(2 * clear_state).get_mut(left) {
                            *to += here * clear;
                        }
                        if let Some(to) = next.row_mut(2 * state + 1).get_mut(left) {
                            *to += here * (1.0 - clear);
                        }
                    }
                }
            }
            mass = next;
        }
        tally
    }
}

/// Nights from a date to a night of the chain.
fn nights_since(chain: &Chain, from: CivilDate, night: usize) -> usize {
    usize::try_from(chain.today().days_since(from)).unwrap_or_default() + night
}

/// What happens under the policy, by chance.
struct Tally {
    /// By night of the list: chance of going out,
    go: Vec<f64>,
    /// and what staying at home against the policy loses.
    lost: Vec<f64>,
    /// After a clear and after a cloudy sky, by nights waited: chance of staying and of going.
    waits: [Vec<[f64; 2]>; 2],
}

impl Tally {
    fn new(season: &Nights) -> Self {
        let count = season.list.len();
        Tally {
            go: vec![0.0; count],
            lost: vec![0.0; count],
            waits: [Vec::new(), Vec::new()],
        }
    }

    fn went(&mut self, night: usize, mass: f64, lost: f64) {
        if let (Some(go), Some(sum)) = (self.go.get_mut(night), self.lost.get_mut(night)) {
            *go += mass;
            *sum += mass * lost;
        }
    }

    /// Stayed on the nights `stayed` of the list and went on the one after, last known night `base`.
    fn waited(
        &mut self,
        season: &Nights,
        base: usize,
        sky: SkyState,
        stayed: Range<usize>,
        mass: f64,
    ) {
        let night = |place: usize| season.list.get(place).map_or(0, |night| night.night);
        let went = stayed.end;
        for place in stayed {
            self.counted(sky, night(place) - night(base), mass, false);
        }
        self.counted(sky, night(went) - night(base), mass, true);
    }

    fn counted(&mut self, sky: SkyState, nights: usize, mass: f64, goes: bool) {
        let waits = &mut self.waits[usize::from(sky == SkyState::Cloud)];
        if waits.len() <= nights {
            waits.resize(nights + 1, [0.0; 2]);
        }
        if let Some(wait) = waits.get_mut(nights) {
            wait[usize::from(goes)] += mass;
        }
    }

    /// After either sky the wait that agrees best with the policy.
    fn rule(&self) -> Vec<RuleLine> {
        let lines = [SkyState::Clear, SkyState::Cloud]
            .into_iter()
            .zip(&self.waits)
            .filter_map(|(after, waits)| {
                let [stay, go] = waits
                    .iter()
                    .fold([0.0, 0.0], |[a, b], [c, d]| [a + c, b + d]);
                if go <= 0.0 {
                    return None;
                }
                // Always going agrees on all evenings of going; each night more of waiting trades one kind for the other.
                let mut agreed = go;
                let mut best = (agreed, 0);
                for (nights, [stays, goes]) in waits.iter().enumerate() {
                    agreed += stays - goes;
                    if agreed > best.0 + ROUNDING {
                        best = (agreed, nights + 1);
                    }
                }
                Some(RuleLine {
                    after,
                    from_nights: best.1.max(1),
                    agreement: best.0 / (stay + go),
                })
            });
        lines.collect()
    }
}

impl Advice {
    /// The policy's decision for any standing from today on, so that it can be followed without planning again. Where both
    /// chances are nil the goal is lost: plan again from the log.
    ///
    /// # Errors
    /// The night or the last frame is not a candidate night, or the path is finished already.
    pub fn decide(&self, standing: &Standing) -> Result<Decision, AdviceError> {
        let policy = self.policy.as_ref().ok_or(AdviceError::Finished {
            night: standing.night,
        })?;
        policy.decide(standing)
    }

    /// For people: the goal and its chance, tonight's rule, what comes next, the rule to keep; `basis` is what
    /// [`super::weather::Weather::basis`] says.
    #[must_use]
    pub fn words(&self, basis: &str) -> Vec<String> {
        let mut lines = Vec::new();
        if let Goal::Instead { cannot, .. } = &self.goal {
            lines.push(cannot.to_string());
        }
        let Some(policy) = &self.policy else {
            lines.push(
                "the path is finished: its end is within the gap, no further outing is needed"
                    .to_owned(),
            );
            return lines;
        };
        let chance = percent(self.chance);
        lines.push(match &self.goal {
            Goal::Complete { gap } => {
                format!(
                    "{chance}: a complete loop, no gap over {}, on {basis}",
                    self.measure.words(*gap)
                )
            }
            Goal::Instead { gap, .. } => {
                format!(
                    "{chance}: from here on no gap over {}, on {basis}",
                    self.measure.words(*gap)
                )
            }
        });
        lines.push(self.tonight_words(policy));
        if let Some(next) = self.next_outing {
            let then = |night: Option<CivilDate>| {
                night.map_or("no further outing".to_owned(), |night| night.to_string())
            };
            lines.push(format!(
                "next outing {next}; after a frame then {}, after cloud {}",
                then(self.next_after_frame),
                then(self.next_after_cloud)
            ));
        }
        for line in &self.rule {
            let nights = if line.from_nights == 1 {
                "night"
            } else {
                "nights"
            };
            let sky = match (self.weather_always_seen, line.after) {
                (false, SkyState::Clear) => "after a frame go again from {} on",
                (false, SkyState::Cloud) => "after a clouded outing go again from {} on",
                (true, SkyState::Clear) => {
                    "after a clear night go when the last frame is {} old or more"
                }
                (true, SkyState::Cloud) => {
                    "after a cloudy night go when the last frame is {} old or more"
                }
            };
            let rule = sky.replace("{}", &format!("{} {nights}", line.from_nights));
            lines.push(format!(
                "{rule} (right on {} of the evenings that may come)",
                percent(line.agreement)
            ));
        }
        lines
    }

    fn tonight_words(&self, policy: &Policy) -> String {
        let today = policy.season.chain.today();
        let Some(tonight) = self.tonight else {
            return format!("{today} is no candidate night: stay at home");
        };
        let since = match (self.begun, today.days_since(self.last.night)) {
            (false, _) => "no frame yet".to_owned(),
            (true, 1) => "last frame last night".to_owned(),
            (true, nights) => format!("last frame {nights} nights ago"),
        };
        let sky = sky_words(tonight.clear);
        let verdict = if tonight.go {
            let (going, staying) = (
                percent(tonight.chance_going),
                percent(tonight.chance_staying),
            );
            if going == staying {
                format!("go (staying at home costs little: {staying} either way)")
            } else {
                format!("go (staying at home leaves {staying} of {going})")
            }
        } else {
            "stay at home".to_owned()
        };
        format!("{since}, sky {sky} ({}): {verdict}", percent(tonight.clear))
    }
}

/// A chance of a clear sky in words.
fn sky_words(clear: f64) -> &'static str {
    match clear {
        clear if clear >= 1.0 => "clear",
        clear if clear >= 0.6 => "likely clear",
        clear if clear > 0.4 => "as likely clear as not",
        clear if clear > 0.0 => "likely cloudy",
        _ => "cloudy",
    }
}
