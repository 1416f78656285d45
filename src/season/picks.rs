//! Dates to announce months ahead: N picks along the path, each with its reserves, and the chance that they hold.
//!
//! # Choice
//! Picks are chosen by dynamic programming over the candidates (one a spell), never greedily: of all ways to put `count`
//! picks on different nights, must-have nights among them, the one with the greatest
//!
//! ```text
//! sum of ln quality  +  w sum of ln fill  -  lambda sum of (step / mean step - 1)^2
//! ```
//!
//! A *step* leads from one pick to the next, in degrees along the track or in days; the first step counts too where the
//! path already has a frame to start from. The *mean step* is the length from the last frame, or else from the first
//! candidate, to the last candidate, by the number of steps: it does not depend on the choice. *Fill* is the chance that the pick's section is
//! filled: that the pick or one of its reserves is clear. It depends on the next pick, before which all reserves must lie
//! (sections do not interleave), and is part of the same optimisation, so that a pick with good reserves is preferred to one
//! without. `w` is 1 unless set; with 0 the dates follow from quality and evenness alone. A fill below 1e-6 counts as
//! 1e-6, so that hopeless odds still give dates.
//!
//! Reserves are those nights allowed by the rule, at most so many, that make the fill greatest (the later night is
//! less tied to the pick's weather, which counts for more the longer clouds stay); again by dynamic programming, exactly.
//!
//! # Chances
//! By forward recursion over (weather, sections filled), exactly for the Markov chain of [`super::weather`]. The weather is
//! that of the night, so two spells of one night share it. A frame comes from the first clear night of a section; reserves
//! after it stay unused. *Widest gap*: the greatest distance between successive frames, or between an end of the path and
//! its nearest frame; the whole path where there is none.
//!
//! Degrees along the track are cumulative great-circle length, backward motion counted. With K candidates and N picks
//! the choice takes about N K^2 / 2 steps.

use serde::{Deserialize, Serialize};

use super::weather::{Chain, SkyState, percent};
use crate::sky::Angle;
use crate::sky::calendar::CivilDate;

/// What the user asked for cannot be.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum PickError {
    #[error(
        "no candidate nights between {from} and {to}: no open night has a spell that meets every condition; widen the conditions, the weekdays or the path"
    )]
    NoCandidates { from: CivilDate, to: CivilDate },
    #[error("no dates asked for: the number of picks must be at least 1")]
    NoPicks,
    #[error(
        "{wanted} dates asked for, but there are only {nights} candidate nights between {from} and {to}; ask for at most {nights} or widen the conditions"
    )]
    TooFewNights {
        wanted: usize,
        nights: usize,
        from: CivilDate,
        to: CivilDate,
    },
    #[error("{night} must be in, but it is not among the candidate nights: {nearest}")]
    MustHaveNotCandidate { night: CivilDate, nearest: String },
    #[error(
        "{must_have} dates must be in, but only {wanted} are asked for; ask for at least {must_have}"
    )]
    TooManyMustHave { must_have: usize, wanted: usize },
    #[error("the path ends before it begins, or has no length: from {from} to {to}")]
    NoPath { from: CivilDate, to: CivilDate },
    #[error(
        "the length along the track is no number, or falls from {earlier} to {later}; it must grow from night to night"
    )]
    TrackFalls {
        earlier: CivilDate,
        later: CivilDate,
    },
    #[error("the quality {value} of the night of {night} is outside 0 to 1")]
    Quality { night: CivilDate, value: f64 },
    #[error("{what}: {value} cannot be; give a number from 0 up")]
    Weight { what: &'static str, value: f64 },
    #[error("{what}: {value} is too many; at most {most}")]
    TooMany {
        what: &'static str,
        value: usize,
        most: usize,
    },
    #[error("reserves within 0 days cannot be; give at least 1")]
    NoReserveDays,
    #[error("the weather chain covers {from} to {to}, but the path needs {needed}")]
    ChainTooShort {
        from: CivilDate,
        to: CivilDate,
        needed: CivilDate,
    },
    #[error(
        "a frame is logged for {night}, but {today} is taken as the first night still open; plan from the night after it"
    )]
    FrameAhead { night: CivilDate, today: CivilDate },
    #[error(
        "the sections interleave: {later} stands after {earlier}; each pick and its reserves must end before the next pick"
    )]
    Interleaved {
        earlier: CivilDate,
        later: CivilDate,
    },
}

/// By what steps along the path are measured.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Measure {
    /// Degrees along the track.
    Angle,
    Days,
}

impl Measure {
    pub const ALL: [Measure; 2] = [Measure::Angle, Measure::Days];

    /// Where a mark lies, in the measure's unit, from a zero point of its own.
    #[must_use]
    pub fn of(self, mark: Mark) -> f64 {
        match self {
            Measure::Angle => mark.track.degrees(),
            Measure::Days => f64::from(mark.night.julian_day_number()),
        }
    }

    /// A length for people: "4.2 deg", "9 days".
    #[must_use]
    pub fn words(self, length: f64) -> String {
        match self {
            Measure::Angle => format!("{length:.1} deg"),
            Measure::Days if (length - 1.0).abs() < 1e-9 => "1 day".to_owned(),
            Measure::Days if (length - length.round()).abs() < 1e-9 => {
                format!("{} days", length.round())
            }
            Measure::Days => format!("{length:.1} days"),
        }
    }
}

/// A night, and how far along the track the subject stands then.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mark {
    pub night: CivilDate,
    /// Cumulative great-circle length, from any zero point; it never falls.
    pub track: Angle,
}

/// One spell that a pick, a reserve or an outing can take.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Candidate {
    pub mark: Mark,
    /// How good it is, 0 to 1; a spell of quality 0 is never taken.
    pub quality: f64,
}

/// The part of the path to be covered; the ends need not be candidates.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Path {
    pub start: Mark,
    pub end: Mark,
}

impl Path {
    /// Whether a night lies on it, both ends included.
    #[must_use]
    pub fn holds(self, night: CivilDate) -> bool {
        (self.start.night..=self.end.night).contains(&night)
    }
}

/// Which nights may stand in for a pick.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum ReserveRule {
    /// The evening after the pick, and those after that for more reserves.
    NextEvening,
    /// A week later, two weeks later and so on.
    SameWeekday,
    /// Any within so many days after the pick, 1 to 90.
    WithinDays(u16),
}

/// Most reserves of one pick.
const MOST_RESERVES: usize = 20;
/// Longest window for reserves.
const MOST_RESERVE_DAYS: u16 = 90;
/// Most picks and most candidates, so that no input takes minutes.
const MOST_PICKS: usize = 400;
const MOST_CANDIDATES: usize = 2000;
/// A fill below this counts as this.
const LEAST_FILL: f64 = 1e-6;

impl ReserveRule {
    /// Days after the pick that it allows for so many reserves, in order.
    fn offsets(self, count: usize) -> Vec<usize> {
        match self {
            ReserveRule::NextEvening => (1..=count).collect(),
            ReserveRule::SameWeekday => (1..=count).map(|week| 7 * week).collect(),
            ReserveRule::WithinDays(_) if count == 0 => Vec::new(),
            ReserveRule::WithinDays(days) => (1..=usize::from(days)).collect(),
        }
    }

    fn check(self, count: usize) -> Result<(), PickError> {
        if count > MOST_RESERVES {
            return Err(PickError::TooMany {
                what: "reserves of one pick",
                value: count,
                most: MOST_RESERVES,
            });
        }
        match self {
            ReserveRule::WithinDays(0) => Err(PickError::NoReserveDays),
            ReserveRule::WithinDays(days) if days > MOST_RESERVE_DAYS => Err(PickError::TooMany {
                what: "days for reserves",
                value: usize::from(days),
                most: usize::from(MOST_RESERVE_DAYS),
            }),
            _ => Ok(()),
        }
    }
}

/// Everything that the choice of dates depends on, but for the weather.
#[derive(Clone, Copy, Debug)]
pub struct PickRequest<'a> {
    /// In any order, several for one night allowed; those before today or off the path are left out.
    pub candidates: &'a [Candidate],
    pub path: Path,
    /// Frames that the path already has, in any order.
    pub frames: &'a [Mark],
    /// Number of picks from the chain's today on.
    pub count: usize,
    pub measure: Measure,
    /// Nights that must be picks; those before today are left out.
    pub must_have: &'a [CivilDate],
    pub reserve_rule: ReserveRule,
    /// Most reserves of each pick, 0 to 20.
    pub reserves: usize,
    /// Lambda: how much even steps count.
    pub evenness: f64,
    /// w: how much the chance that a section is filled counts.
    pub fill: f64,
}

impl PickRequest<'_> {
    /// Lambda where the user gave none (our choice): a step half again too long costs as much as a quality of 0.61
    /// instead of 1.
    pub const DEFAULT_EVENNESS: f64 = 2.0;
    pub const DEFAULT_FILL: f64 = 1.0;
}

/// A pick with its reserves.
#[derive(Clone, Debug, PartialEq)]
pub struct Section {
    /// Place in the request's candidates.
    pub pick: usize,
    /// Places of its reserves, in order of time.
    pub reserves: Vec<usize>,
    /// Chance that one of these nights is clear.
    pub filled: f64,
}

/// The dates.
#[derive(Clone, Debug, PartialEq)]
pub struct Plan {
    pub sections: Vec<Section>,
    /// In degrees or days, as measured.
    pub mean_step: f64,
    /// The parts of what was maximised: sum of ln quality,
    pub quality_sum: f64,
    /// sum of ln fill before its weight,
    pub fill_sum: f64,
    /// sum of squares before lambda.
    pub unevenness: f64,
    pub chances: Chances,
}

impl Plan {
    /// What was maximised.
    #[must_use]
    pub fn objective(&self, request: &PickRequest) -> f64 {
        self.quality_sum + request.fill * self.fill_sum - request.evenness * self.unevenness
    }
}

/// How wide the widest gap becomes.
#[derive(Clone, Debug, PartialEq)]
pub struct WidestGap {
    pub measure: Measure,
    /// Rising: a length, and the chance that no gap is wider; from the last length without a chance (or 0) to the first
    /// with 99.95 %.
    pub at_most: Vec<(f64, f64)>,
    /// The least length not exceeded with a chance of 50 %,
    pub median: f64,
    /// and of 90 %.
    pub nine_in_ten: f64,
}

/// What becomes of the dates, by the odds of the chain.
#[derive(Clone, Debug, PartialEq)]
pub struct Chances {
    /// That every section is filled.
    pub all_filled: f64,
    pub expected_filled: f64,
    /// Element n is the chance that exactly n sections are filled.
    pub filled: Vec<f64>,
    pub gap_degrees: WidestGap,
    pub gap_days: WidestGap,
}

impl Chances {
    /// For people, whole percentages; `basis` is what [`super::weather::Weather::basis`] says.
    #[must_use]
    pub fn words(&self, basis: &str) -> Vec<String> {
        let sections = self.filled.len().saturating_sub(1);
        let gap = |gap: &WidestGap| {
            format!(
                "widest gap: as likely as not at most {}, nine times in ten at most {}",
                gap.measure.words(gap.median),
                gap.measure.words(gap.nine_in_ten)
            )
        };
        vec![
            format!(
                "{}: every one of the {sections} sections is filled",
                percent(self.all_filled)
            ),
            format!(
                "{:.1} of {sections} sections filled on average",
                self.expected_filled
            ),
            gap(&self.gap_degrees),
            gap(&self.gap_days),
            format!("all on {basis}"),
        ]
    }
}

/// A candidate that counts.
#[derive(Clone, Copy)]
pub(super) struct Usable {
    /// Place in the request.
    pub index: usize,
    /// Place of its night in the chain.
    pub night: usize,
    pub candidate: Candidate,
}

/// The path with what is already on it.
pub(super) struct Course {
    path: Path,
    /// The last frame, or the start of the path without any.
    pub last: Mark,
    /// Whether `last` is a frame.
    pub begun: bool,
    /// On the path, in order of time.
    frames: Vec<Mark>,
}

impl Course {
    /// Checks the path and keeps the frames on it; frames must lie before `today`.
    pub(super) fn new(path: Path, frames: &[Mark], today: CivilDate) -> Result<Self, PickError> {
        if !Measure::ALL
            .iter()
            .all(|measure| measure.of(path.end) - measure.of(path.start) > 0.0)
        {
            return Err(PickError::NoPath {
                from: path.start.night,
                to: path.end.night,
            });
        }
        let mut frames: Vec<Mark> = frames
            .iter()
            .copied()
            .filter(|frame| path.holds(frame.night))
            .collect();
        frames.sort_by_key(|frame| frame.night);
        if let Some(frame) = frames.last().filter(|frame| frame.night >= today) {
            return Err(PickError::FrameAhead {
                night: frame.night,
                today,
            });
        }
        check_track(
            [path.start]
                .into_iter()
                .chain(frames.iter().copied())
                .chain([path.end]),
        )?;
        let last = frames.last().copied();
        Ok(Course {
            path,
            last: last.unwrap_or(path.start),
            begun: last.is_some(),
            frames,
        })
    }

    pub(super) const fn end(&self) -> Mark {
        self.path.end
    }

    /// The widest gap from the start of the path up to the last frame, and the marks on either side; `None` without
    /// frames.
    pub(super) fn widest_between(&self, measure: Measure) -> Option<(f64, Mark, Mark)> {
        let starts = [self.path.start]
            .into_iter()
            .chain(self.frames.iter().copied());
        let gaps = starts
            .zip(&self.frames)
            .map(|(from, &to)| (measure.of(to) - measure.of(from), from, to));
        gaps.max_by(|a, b| a.0.total_cmp(&b.0))
    }

    /// The same length alone; 0 without frames.
    pub(super) fn widest_so_far(&self, measure: Measure) -> f64 {
        self.widest_between(measure)
            .map_or(0.0, |(length, _, _)| length)
    }

    /// The candidates from today on, after the last frame, with a quality above 0, in order of time; checks all.
    pub(super) fn usable(
        &self,
        candidates: &[Candidate],
        chain: &Chain,
    ) -> Result<Vec<Usable>, PickError> {
        let mut found = Vec::new();
        for (index, &candidate) in candidates.iter().enumerate() {
            let Candidate { mark, quality } = candidate;
            if !(0.0..=1.0).contains(&quality) {
                return Err(PickError::Quality {
                    night: mark.night,
                    value: quality,
                });
            }
            if quality > 0.0 && self.path.holds(mark.night) && mark.night >= chain.today() {
                let night = place_in(chain, mark.night)?;
                found.push(Usable {
                    index,
                    night,
                    candidate,
                });
            }
        }
        let track = |usable: &Usable| usable.candidate.mark.track.radians();
        found.sort_by(|a, b| {
            a.night
                .cmp(&b.night)
                .then(track(a).total_cmp(&track(b)))
                .then(a.index.cmp(&b.index))
        });
        let marks = found.iter().map(|usable| usable.candidate.mark);
        check_track([self.last].into_iter().chain(marks).chain([self.path.end]))?;
        if found.is_empty() {
            return Err(PickError::NoCandidates {
                from: self.path.start.night.max(chain.today()),
                to: self.path.end.night,
            });
        }
        if found.len() > MOST_CANDIDATES {
            return Err(PickError::TooMany {
                what: "candidate spells",
                value: found.len(),
                most: MOST_CANDIDATES,
            });
        }
        Ok(found)
    }
}

fn check_track(marks: impl Iterator<Item = Mark>) -> Result<(), PickError> {
    let mut before: Option<Mark> = None;
    for mark in marks {
        let earlier = before.unwrap_or(mark);
        // Written so that a length that is no number fails as well.
        let rises = mark.track.radians() - earlier.track.radians() >= 0.0;
        if !rises || !mark.track.radians().is_finite() {
            return Err(PickError::TrackFalls {
                earlier: earlier.night,
                later: mark.night,
            });
        }
        before = Some(mark);
    }
    Ok(())
}

fn place_in(chain: &Chain, night: CivilDate) -> Result<usize, PickError> {
    let last = i32::try_from(chain.nights())
        .ok()
        .and_then(|nights| chain.today().plus_days(nights - 1).ok());
    chain.index(night).ok_or(PickError::ChainTooShort {
        from: chain.today(),
        to: last.unwrap_or(chain.today()),
        needed: night,
    })
}

/// Whether a gap is held: rounding in the last digits of a length must not break it.
pub(super) fn within(gap: f64, from: f64, to: f64) -> bool {
    to - from <= gap + 1e-9
}

/// Chooses the dates.
///
/// # Errors
/// Whatever in the request cannot be; see [`PickError`].
pub fn pick_dates(request: &PickRequest, chain: &Chain) -> Result<Plan, PickError> {
    check_numbers(request)?;
    let course = Course::new(request.path, request.frames, chain.today())?;
    let usable = course.usable(request.candidates, chain)?;
    let must_have = must_have_nights(request, chain, &usable)?;
    let places: Vec<f64> = usable
        .iter()
        .map(|usable| request.measure.of(usable.candidate.mark))
        .collect();
    let steps = request.count - usize::from(!course.begun);
    let begin = if course.begun {
        Some(request.measure.of(course.last))
    } else {
        places.first().copied()
    };
    let mean_step =
        begin.zip(places.last()).map_or(0.0, |(from, to)| to - from) / steps.max(1) as f64;
    if distinct_nights(&usable) < request.count {
        return Err(too_few_nights(request, chain, &usable));
    }
    if steps > 0 && mean_step <= 0.0 {
        return Err(PickError::NoPath {
            from: course.last.night,
            to: request.path.end.night,
        });
    }
    let fills = Fills::new(request, chain, &usable);
    let square = |from: f64, to: f64| {
        let deviation = (to - from) / mean_step - 1.0;
        deviation * deviation
    };
    let first_square = |to: f64| {
        if course.begun {
            square(request.measure.of(course.last), to)
        } else {
            0.0
        }
    };

    let chosen = {
        let first: Vec<f64> = usable
            .iter()
            .zip(&places)
            .map(|(usable, &place)| {
                let is_open = must_have.none_between(None, Some(usable.night));
                let score =
                    libm::log(usable.candidate.quality) - request.evenness * first_square(place);
                if is_open { score } else { f64::NEG_INFINITY }
            })
            .collect();
        let step = |from: usize, to: usize| -> f64 {
            let (Some(a), Some(b)) = (usable.get(from), usable.get(to)) else {
                return f64::NEG_INFINITY;
            };
            if a.night >= b.night || !must_have.none_between(Some(a.night), Some(b.night)) {
                return f64::NEG_INFINITY;
            }
            let (Some(&x), Some(&y)) = (places.get(from), places.get(to)) else {
                return f64::NEG_INFINITY;
            };
            libm::log(b.candidate.quality) + request.fill * fills.ln_fill(from, Some(b.night))
                - request.evenness * square(x, y)
        };
        let last: Vec<f64> = usable
            .iter()
            .enumerate()
            .map(|(place, usable)| {
                let is_open = must_have.none_between(Some(usable.night), None);
                if is_open {
                    request.fill * fills.ln_fill(place, None)
                } else {
                    f64::NEG_INFINITY
                }
            })
            .collect();
        best_chain(&first, step, &last, request.count)
    };
    // Cannot fail: enough nights for the count, and for those that must be in, always leave a choice.
    let chosen = chosen.ok_or_else(|| too_few_nights(request, chain, &usable))?;

    let mut sections = Vec::with_capacity(chosen.len());
    let (mut quality_sum, mut fill_sum, mut unevenness) = (0.0, 0.0, 0.0);
    let mut before: Option<f64> = None;
    for (order, &place) in chosen.iter().enumerate() {
        let (Some(pick), Some(&x)) = (usable.get(place), places.get(place)) else {
            continue;
        };
        let next = chosen
            .get(order + 1)
            .and_then(|&next| usable.get(next))
            .map(|next| next.night);
        let (reserves, filled) = fills.reserves(place, next);
        quality_sum += libm::log(pick.candidate.quality);
        fill_sum += fills.ln_fill(place, next);
        unevenness += before.map_or_else(|| first_square(x), |from| square(from, x));
        before = Some(x);
        sections.push(Section {
            pick: pick.index,
            reserves,
            filled,
        });
    }
    let nights: Vec<Vec<Mark>> = sections
        .iter()
        .map(|section| {
            let places = std::iter::once(&section.pick).chain(&section.reserves);
            places
                .filter_map(|&place| request.candidates.get(place))
                .map(|candidate| candidate.mark)
                .collect()
        })
        .collect();
    let chances = chances(&nights, request.path, request.frames, chain)?;
    Ok(Plan {
        sections,
        mean_step,
        quality_sum,
        fill_sum,
        unevenness,
        chances,
    })
}

fn check_numbers(request: &PickRequest) -> Result<(), PickError> {
    let weights = [
        ("weight of evenness (lambda)", request.evenness),
        ("weight of the fill", request.fill),
    ];
    for (what, value) in weights {
        if !(value >= 0.0 && value.is_finite()) {
            return Err(PickError::Weight { what, value });
        }
    }
    if request.count == 0 {
        return Err(PickError::NoPicks);
    }
    if request.count > MOST_PICKS {
        return Err(PickError::TooMany {
            what: "dates",
            value: request.count,
            most: MOST_PICKS,
        });
    }
    request.reserve_rule.check(request.reserves)
}

/// `usable` is in order of time.
fn distinct_nights(usable: &[Usable]) -> usize {
    usable.chunk_by(|a, b| a.night == b.night).count()
}

fn too_few_nights(request: &PickRequest, chain: &Chain, usable: &[Usable]) -> PickError {
    PickError::TooFewNights {
        wanted: request.count,
        nights: distinct_nights(usable),
        from: request.path.start.night.max(chain.today()),
        to: request.path.end.night,
    }
}

/// Nights that must be picks: how many there are before each night of the chain.
struct MustHave {
    /// Element n counts those before night n; one element more than nights.
    before: Vec<usize>,
}

impl MustHave {
    /// None strictly between two nights of the chain; `None` is before the first or after the last.
    fn none_between(&self, from: Option<usize>, to: Option<usize>) -> bool {
        let count = |night: usize| {
            self.before
                .get(night)
                .or(self.before.last())
                .copied()
                .unwrap_or_default()
        };
        count(to.unwrap_or(usize::MAX)) == from.map_or(0, |night| count(night + 1))
    }
}

fn must_have_nights(
    request: &PickRequest,
    chain: &Chain,
    usable: &[Usable],
) -> Result<MustHave, PickError> {
    let mut is_must = vec![false; chain.nights()];
    for &night in request
        .must_have
        .iter()
        .filter(|night| **night >= chain.today())
    {
        let found = usable
            .iter()
            .find(|usable| usable.candidate.mark.night == night);
        let Some(found) = found else {
            let nearest = usable
                .iter()
                .min_by_key(|usable| usable.candidate.mark.night.days_since(night).abs());
            let nearest = nearest.map_or_else(
                || "there is none at all".to_owned(),
                |usable| {
                    format!(
                        "the nearest that is stands on {}",
                        usable.candidate.mark.night
                    )
                },
            );
            return Err(PickError::MustHaveNotCandidate { night, nearest });
        };
        if let Some(flag) = is_must.get_mut(found.night) {
            *flag = true;
        }
    }
    let mut before = Vec::with_capacity(is_must.len() + 1);
    let mut count = 0;
    before.push(0);
    for flag in is_must {
        count += usize::from(flag);
        before.push(count);
    }
    if count > request.count {
        return Err(PickError::TooManyMustHave {
            must_have: count,
            wanted: request.count,
        });
    }
    Ok(MustHave { before })
}

/// The best chain of `count` places: `first` for where it begins, `step` for each link, `last` for where it ends. The
/// earliest among equals; `None` where every chain is ruled out.
fn best_chain(
    first: &[f64],
    step: impl Fn(usize, usize) -> f64,
    last: &[f64],
    count: usize,
) -> Option<Vec<usize>> {
    let size = first.len();
    let links: Vec<f64> = (0..size * size)
        .map(|pair| step(pair % size, pair / size))
        .collect();
    let mut score = first.to_vec();
    let mut came_from: Vec<Vec<usize>> = Vec::with_capacity(count);
    for _ in 1..count {
        let mut next = Vec::with_capacity(size);
        let mut from = Vec::with_capacity(size);
        for into in links.chunks_exact(size) {
            let mut best = (f64::NEG_INFINITY, 0);
            for (place, (before, link)) in score.iter().zip(into).enumerate() {
                if before + link > best.0 {
                    best = (before + link, place);
                }
            }
            next.push(best.0);
            from.push(best.1);
        }
        score = next;
        came_from.push(from);
    }
    let mut best = (f64::NEG_INFINITY, None);
    for (place, (score, last)) in score.iter().zip(last).enumerate() {
        if score + last > best.0 {
            best = (score + last, Some(place));
        }
    }
    let mut place = best.1?;
    let mut chain = vec![place];
    for from in came_from.iter().rev() {
        place = *from.get(place)?;
        chain.push(place);
    }
    chain.reverse();
    Some(chain)
}

/// For each candidate as a pick: which reserves are best before the next pick, and how likely they fill the section.
struct Fills<'a> {
    usable: &'a [Usable],
    beliefs: &'a [f64],
    offsets: Vec<usize>,
    most: usize,
    /// By night of the chain: the best candidate there, as a place in `usable`.
    best_of_night: Vec<Option<usize>>,
    /// By night of the chain: chances of cloud on the nights after a cloudy one.
    cloud_after_cloud: Vec<Vec<f64>>,
    /// By candidate: (night, ln of the fill with the best reserves up to that night), the pick's own first.
    ln_fill: Vec<Vec<(usize, f64)>>,
}

impl<'a> Fills<'a> {
    fn new(request: &PickRequest, chain: &'a Chain, usable: &'a [Usable]) -> Self {
        let offsets = request.reserve_rule.offsets(request.reserves);
        let window = offsets.last().copied().unwrap_or_default();
        let mut best_of_night: Vec<Option<usize>> = vec![None; chain.nights()];
        let quality = |place: usize| {
            usable
                .get(place)
                .map_or(0.0, |usable| usable.candidate.quality)
        };
        for (place, usable) in usable.iter().enumerate() {
            if let Some(best) = best_of_night.get_mut(usable.night)
                && best.is_none_or(|best| quality(best) < usable.candidate.quality)
            {
                *best = Some(place);
            }
        }
        let cloud_after_cloud = (0..chain.nights())
            .map(|night| match best_of_night.get(night) {
                Some(Some(_)) => chain
                    .after(night, SkyState::Cloud)
                    .take(window)
                    .map(|clear| 1.0 - clear)
                    .collect(),
                _ => Vec::new(),
            })
            .collect();
        let mut fills = Fills {
            usable,
            beliefs: chain.beliefs(),
            offsets,
            most: request.reserves,
            best_of_night,
            cloud_after_cloud,
            ln_fill: Vec::new(),
        };
        fills.ln_fill = usable
            .iter()
            .map(|usable| fills.ln_fill_by_limit(usable.night))
            .collect();
        fills
    }

    /// ln of the fill of the candidate at `place` when the next pick is on night `next`.
    fn ln_fill(&self, place: usize, next: Option<usize>) -> f64 {
        let Some(steps) = self.ln_fill.get(place) else {
            return libm::log(LEAST_FILL);
        };
        let fitting = steps.partition_point(|&(night, _)| next.is_none_or(|next| night < next));
        steps
            .get(fitting.max(1) - 1)
            .map_or(libm::log(LEAST_FILL), |&(_, value)| value)
    }

    /// Nights that may hold reserves of a pick on `night`, before night `next`.
    fn allowed(&self, night: usize, next: Option<usize>) -> Vec<usize> {
        let nights = self.offsets.iter().map(|offset| night + offset);
        nights
            .take_while(|&reserve| next.is_none_or(|next| reserve < next))
            .filter(|&reserve| matches!(self.best_of_night.get(reserve), Some(Some(_))))
            .collect()
    }

    fn cloudy(&self, from: usize, to: usize) -> f64 {
        self.cloud_after_cloud
            .get(from)
            .and_then(|row| row.get(to - from - 1))
            .copied()
            .unwrap_or(1.0)
    }

    /// Layer h, element a: the least chance that pick and h + 1 reserves, the last of them `allowed[a]`, are all cloudy,
    /// and the reserve before it.
    fn layers(&self, night: usize, allowed: &[usize]) -> Vec<Vec<(f64, usize)>> {
        let alone = self.alone(night);
        let mut layers: Vec<Vec<(f64, usize)>> = Vec::new();
        for _ in 0..self.most.min(allowed.len()) {
            let layer = allowed
                .iter()
                .enumerate()
                .map(|(place, &to)| match layers.last() {
                    None => (alone * self.cloudy(night, to), 0),
                    Some(before) => {
                        let mut best = (f64::INFINITY, 0);
                        for (from, (&(chance, _), &reserve)) in
                            before.iter().zip(allowed).take(place).enumerate()
                        {
                            let chance = chance * self.cloudy(reserve, to);
                            if is_less(chance, best.0) {
                                best = (chance, from);
                            }
                        }
                        best
                    }
                })
                .collect();
            layers.push(layer);
        }
        layers
    }

    /// Chance that the pick itself is clouded out.
    fn alone(&self, night: usize) -> f64 {
        1.0 - self.beliefs.get(night).copied().unwrap_or_default()
    }

    fn ln_fill_by_limit(&self, night: usize) -> Vec<(usize, f64)> {
        let allowed = self.allowed(night, None);
        let layers = self.layers(night, &allowed);
        let mut least = self.alone(night);
        let ln = |cloudy: f64| libm::log((1.0 - cloudy).max(LEAST_FILL));
        let mut steps = vec![(night, ln(least))];
        for (place, &reserve) in allowed.iter().enumerate() {
            let here = layers
                .iter()
                .filter_map(|layer| layer.get(place))
                .map(|&(chance, _)| chance);
            least = here.fold(least, f64::min);
            steps.push((reserve, ln(least)));
        }
        steps
    }

    /// The reserves of the candidate at `place` (places in the request), and the chance that the section is filled.
    fn reserves(&self, place: usize, next: Option<usize>) -> (Vec<usize>, f64) {
        let Some(pick) = self.usable.get(place) else {
            return (Vec::new(), 0.0);
        };
        let allowed = self.allowed(pick.night, next);
        let layers = self.layers(pick.night, &allowed);
        let mut best = (self.alone(pick.night), None);
        for (depth, layer) in layers.iter().enumerate() {
            for (place, &(chance, _)) in layer.iter().enumerate() {
                if is_less(chance, best.0) {
                    best = (chance, Some((depth, place)));
                }
            }
        }
        let mut reserves = Vec::new();
        let mut at = best.1;
        while let Some((depth, place)) = at {
            let candidate = allowed
                .get(place)
                .and_then(|&night| self.best_of_night.get(night).copied().flatten());
            reserves.extend(
                candidate
                    .and_then(|candidate| self.usable.get(candidate))
                    .map(|usable| usable.index),
            );
            let before = layers
                .get(depth)
                .and_then(|layer| layer.get(place))
                .map(|&(_, from)| from);
            at = depth.checked_sub(1).zip(before);
        }
        reserves.reverse();
        (reserves, 1.0 - best.0)
    }
}

/// Less by more than rounding, so that the earliest among equals stays.
fn is_less(a: f64, b: f64) -> bool {
    a < b * (1.0 - 1e-12)
}

/// One night of the schedule.
struct Slot {
    night: usize,
    /// First slot of its section.
    section_start: usize,
    mark: Mark,
}

/// The chances of any dates, chosen here or by hand: a pick with its reserves is one element, nights in order of time.
///
/// # Errors
/// A path that cannot be; sections that interleave; nights that the chain does not cover.
pub fn chances(
    sections: &[Vec<Mark>],
    path: Path,
    frames: &[Mark],
    chain: &Chain,
) -> Result<Chances, PickError> {
    let course = Course::new(path, frames, chain.today())?;
    let mut slots: Vec<Slot> = Vec::new();
    for section in sections {
        let section_start = slots.len();
        for &mark in section {
            if let Some(before) = slots
                .last()
                .filter(|before| before.mark.night >= mark.night)
            {
                return Err(PickError::Interleaved {
                    earlier: before.mark.night,
                    later: mark.night,
                });
            }
            slots.push(Slot {
                night: place_in(chain, mark.night)?,
                section_start,
                mark,
            });
        }
    }
    check_track(
        [course.last]
            .into_iter()
            .chain(slots.iter().map(|slot| slot.mark))
            .chain([path.end]),
    )?;
    let clear = clear_chances(&slots, chain);
    let filled = filled_distribution(sections.len(), &slots, &clear);
    let expected_filled = filled
        .iter()
        .enumerate()
        .map(|(count, chance)| count as f64 * chance)
        .sum();
    Ok(Chances {
        all_filled: filled.last().copied().unwrap_or_default(),
        expected_filled,
        filled,
        gap_degrees: widest_gap(Measure::Angle, &course, &slots, &clear),
        gap_days: widest_gap(Measure::Days, &course, &slots, &clear),
    })
}

/// For each slot, the chances of a clear night after the slot before it was clear, and was cloudy.
fn clear_chances(slots: &[Slot], chain: &Chain) -> Vec<[f64; 2]> {
    let belief = |night: usize| chain.beliefs().get(night).copied().unwrap_or_default();
    let first = slots.first().map(|slot| [belief(slot.night); 2]);
    let rest = slots.windows(2).filter_map(|pair| {
        let [before, slot] = pair else { return None };
        let after = |sky| {
            chain
                .after(before.night, sky)
                .nth(slot.night - before.night - 1)
        };
        Some([after(SkyState::Clear)?, after(SkyState::Cloud)?])
    });
    first.into_iter().chain(rest).collect()
}

/// Element n: the chance that exactly n sections are filled.
fn filled_distribution(sections: usize, slots: &[Slot], clear: &[[f64; 2]]) -> Vec<f64> {
    // By sections filled before this one: [this one filled; not filled], each by last sky [clear, cloud].
    let mut states = vec![[[0.0; 2]; 2]; sections + 1];
    if let Some(state) = states.first_mut() {
        // The first slot's chances are the same after either sky.
        *state = [[0.0; 2], [1.0, 0.0]];
    }
    for (place, (slot, chances)) in slots.iter().zip(clear).enumerate() {
        if slot.section_start == place {
            close_section(&mut states);
        }
        for [filled, open] in &mut states {
            let [open_clear, open_cloud] = next_sky(*open, *chances);
            let [filled_clear, filled_cloud] = next_sky(*filled, *chances);
            *filled = [filled_clear + open_clear, filled_cloud];
            *open = [0.0, open_cloud];
        }
    }
    close_section(&mut states);
    states
        .iter()
        .map(|[_, [clear, cloud]]| clear + cloud)
        .collect()
}

/// What was filled in the section that ends counts as one section more.
fn close_section(states: &mut [[[f64; 2]; 2]]) {
    for count in (0..states.len()).rev() {
        let from_below = count
            .checked_sub(1)
            .and_then(|below| states.get(below))
            .map_or([0.0; 2], |[filled, _]| *filled);
        if let Some([filled, open]) = states.get_mut(count) {
            *open = [open[0] + from_below[0], open[1] + from_below[1]];
            *filled = [0.0; 2];
        }
    }
}

/// Mass by sky [clear, cloud] moved on by the chances of a clear night after each.
fn next_sky(mass: [f64; 2], clear: [f64; 2]) -> [f64; 2] {
    [
        mass[0] * clear[0] + mass[1] * clear[1],
        mass[0] * (1.0 - clear[0]) + mass[1] * (1.0 - clear[1]),
    ]
}

/// Where the table of a [`WidestGap`] ends.
const NEARLY_CERTAIN: f64 = 0.9995;
/// At most so many points in it.
const MOST_GAP_POINTS: f64 = 60.0;

fn widest_gap(measure: Measure, course: &Course, slots: &[Slot], clear: &[[f64; 2]]) -> WidestGap {
    let start = measure.of(course.last);
    let end = measure.of(course.path.end);
    let places: Vec<f64> = slots.iter().map(|slot| measure.of(slot.mark)).collect();
    let so_far = course.widest_so_far(measure);
    let chance = |gap: f64| {
        if within(gap, 0.0, so_far) {
            chance_no_gap_wider(gap, start, end, slots, &places, clear)
        } else {
            0.0
        }
    };
    let mut lengths = all_lengths(start, &places, end);
    lengths.push(so_far);
    lengths.retain(|&length| length >= so_far);
    lengths.sort_by(f64::total_cmp);
    let least_with = |wanted: f64| {
        let place = lengths.partition_point(|&length| chance(length) < wanted - 1e-12);
        lengths
            .get(place)
            .or(lengths.last())
            .copied()
            .unwrap_or_default()
    };
    let whole = f64::max(end - start, so_far);
    let steps: &[f64] = match measure {
        Measure::Angle => &[0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0],
        Measure::Days => &[1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0],
    };
    let step = steps
        .iter()
        .copied()
        .find(|step| whole / step <= MOST_GAP_POINTS)
        .unwrap_or(whole / MOST_GAP_POINTS);
    let mut at_most = Vec::new();
    let mut count = 0.0;
    while count <= MOST_GAP_POINTS + 1.0 {
        let length = count * step;
        let chance = chance(length);
        if chance <= 0.0 {
            at_most.clear();
        }
        at_most.push((length, chance));
        if chance >= NEARLY_CERTAIN {
            break;
        }
        count += 1.0;
    }
    WidestGap {
        measure,
        at_most,
        median: least_with(0.5),
        nine_in_ten: least_with(0.9),
    }
}

/// Every length that a gap between frames or ends can have.
pub(super) fn all_lengths(start: f64, places: &[f64], end: f64) -> Vec<f64> {
    let mut lengths = vec![end - start];
    for (order, &place) in places.iter().enumerate() {
        lengths.push(place - start);
        lengths.push(end - place);
        lengths.extend(places.iter().skip(order + 1).map(|later| later - place));
    }
    lengths
}

/// Chance that no gap from the last frame on is wider: forward over (last frame, sky at the last slot).
fn chance_no_gap_wider(
    gap: f64,
    start: f64,
    end: f64,
    slots: &[Slot],
    places: &[f64],
    clear: &[[f64; 2]],
) -> f64 {
    // Element 0: no frame since the start; element n + 1: the last frame is from slot n.
    let mut mass = vec![[0.0; 2]; slots.len() + 1];
    if let Some(first) = mass.first_mut() {
        *first = [1.0, 0.0];
    }
    let place_of = |state: usize| {
        state
            .checked_sub(1)
            .map_or(start, |slot| places.get(slot).copied().unwrap_or(end))
    };
    let mut alive = 0;
    for (slot_place, ((slot, &place), &chances)) in slots.iter().zip(places).zip(clear).enumerate()
    {
        // A last frame farther back than the gap can never be joined any more.
        while alive <= slot_place && !within(gap, place_of(alive), place) {
            alive += 1;
        }
        let mut frame = 0.0;
        for (state, mass) in mass.iter_mut().enumerate().take(slot_place + 1).skip(alive) {
            let [now_clear, now_cloud] = next_sky(*mass, chances);
            // The section is filled when its frame comes from one of its own slots; then nobody goes out.
            if state > slot.section_start {
                *mass = [now_clear, now_cloud];
            } else {
                frame += now_clear;
                *mass = [0.0, now_cloud];
            }
        }
        if let Some(mass) = mass.get_mut(slot_place + 1) {
            *mass = [frame, 0.0];
        }
    }
    let reaches_end = |state: usize| within(gap, place_of(state), end);
    mass.iter()
        .enumerate()
        .skip(alive)
        .filter(|(state, _)| reaches_end(*state))
        .map(|(_, [a, b])| a + b)
        .sum()
}
