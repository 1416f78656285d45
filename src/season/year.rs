//! What a house can show on each evening it is open: every body at once, night after night.
//!
//! In view means the exact spells of [`super::spells`] under one set of conditions, which are the house's and not a
//! body's; the Moon itself is exempt from the Moon rule. A body that is not in view is given one reason ([`Absence`]). Two
//! bodies that stand close together while both are in view are worth an evening of their own ([`Meeting`]): separations are
//! topocentric, since the Moon stands up to a degree elsewhere from here.
//!
//! Instants are TT; altitudes apparent; magnitudes V, outside the air.

use super::close::Limits;
use super::nights::{LocalClock, SunOfNight, nights};
use super::outlook::night_of;
use super::site_tracks::{NightSpan, SAMPLE_STEP, SiteTracks, Which};
use super::spells::{Outcome, Spell, spells};
use super::types::{Other, Span};
use super::{Closed, Condition, Hours, NightRules, Openings, Weekdays};
use crate::sky::calendar::{CalendarError, CivilDate};
use crate::sky::place::{Sky, SkyError};
use crate::sky::refraction::true_from_apparent;
use crate::sky::stars::Star;
use crate::sky::time::SECONDS_PER_DAY;
use crate::sky::{Angle, Body, Site, Skyline, Tt};

/// Nearer to the Sun than this a body that stands too low is said to be lost in its light (common practice, no source).
const LOST_IN_SUNLIGHT: Angle = Angle::from_degrees(15.0);
/// Fainter bodies make no meeting with the Moon, whose light drowns them (common practice, no source).
const FAINTEST_BESIDE_MOON: f64 = 3.0;
/// Evenings of one meeting lie no farther apart than this; the Moon comes back after 27 days.
const SAME_MEETING_DAYS: i32 = 16;

/// On which nights the house is open.
#[derive(Clone, Debug, PartialEq)]
pub struct House {
    /// Days of the week on whose evenings it opens.
    pub weekdays: Weekdays,
    /// Dates on which it stays shut.
    pub closed: Vec<CivilDate>,
    /// Dates on which it opens whatever the weekday, and although they are among the closed ones.
    pub must: Vec<CivilDate>,
}

impl House {
    /// Open on these days of the week.
    #[must_use]
    pub const fn on(weekdays: Weekdays) -> Self {
        House {
            weekdays,
            closed: Vec::new(),
            must: Vec::new(),
        }
    }

    /// Whether it opens on the evening of a date.
    #[must_use]
    pub fn opens_on(&self, date: CivilDate) -> bool {
        self.must.contains(&date)
            || (self.weekdays.contains(date.weekday()) && !self.closed.contains(&date))
    }
}

/// Why a body is not in view on an evening, in one word.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Absence {
    /// In the hours of the house it never gets dark enough while the body is up.
    Daylight,
    /// Too low, and within 15 degrees of the Sun.
    Sun,
    /// Too low all through the hours, and never better in the dark of this night.
    Low,
    /// It would be in view before the house opens.
    Early,
    /// It would be in view after the house has shut.
    Late,
    /// Hidden by the skyline.
    Skyline,
    /// Too near the Moon.
    Moon,
    /// Behind the Moon.
    Occulted,
}

impl Absence {
    /// The word used in tables.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Absence::Daylight => "daylight",
            Absence::Sun => "sun",
            Absence::Low => "low",
            Absence::Early => "early",
            Absence::Late => "late",
            Absence::Skyline => "skyline",
            Absence::Moon => "moon",
            Absence::Occulted => "occulted",
        }
    }
}

/// A body in view on an evening.
#[derive(Clone, Debug, PartialEq)]
pub struct InView {
    /// The stretches, in order of time; never empty.
    pub spells: Vec<Span>,
    /// When it stands highest in them.
    pub best_at: Tt,
    /// Apparent, then.
    pub altitude: Angle,
    /// V, then.
    pub magnitude: f64,
}

impl InView {
    /// The longest stretch.
    #[must_use]
    pub fn longest(&self) -> Option<Span> {
        self.spells
            .iter()
            .copied()
            .max_by(|a, b| a.days().total_cmp(&b.days()))
    }

    /// All stretches together.
    #[must_use]
    pub fn minutes(&self) -> f64 {
        self.spells.iter().map(|span| span.days()).sum::<f64>() * SECONDS_PER_DAY / 60.0
    }
}

/// What an evening has of one body.
#[derive(Clone, Debug, PartialEq)]
pub enum Showing {
    InView(InView),
    Absent(Absence),
}

impl Showing {
    /// The view, where there is one.
    #[must_use]
    pub const fn in_view(&self) -> Option<&InView> {
        match self {
            Showing::InView(view) => Some(view),
            Showing::Absent(_) => None,
        }
    }
}

/// Two bodies, or a body and a star, close together while they are in view.
#[derive(Clone, Debug, PartialEq)]
pub struct Meeting {
    pub body: Body,
    pub with: Other,
    /// When they stand closest while both are in view, of the ends and the middle of that time.
    pub instant: Tt,
    /// Topocentric.
    pub separation: Angle,
}

/// One evening on which the house is open.
#[derive(Clone, Debug, PartialEq)]
pub struct Evening {
    /// Civil date in the site's zone at 18h local mean time.
    pub date: CivilDate,
    /// From local mean noon to the next.
    pub span: Span,
    pub sun: SunOfNight,
    /// Lit fraction of the Moon at the middle of the night, 0 to 1.
    pub moon_lit_fraction: f64,
    /// In the order of [`Year::bodies`].
    pub showings: Vec<Showing>,
    /// On the evening on which each is closest of all open evenings.
    pub meetings: Vec<Meeting>,
}

/// The evenings of a year, or of any number of days.
#[derive(Clone, Debug, PartialEq)]
pub struct Year {
    pub bodies: Vec<Body>,
    pub evenings: Vec<Evening>,
}

/// From where, over what and by which rules.
#[derive(Clone, Copy, Debug)]
pub struct Watch<'a> {
    pub site: &'a Site,
    pub skyline: &'a Skyline,
    pub clock: &'a LocalClock,
    /// Their weekdays do not count; the house's do.
    pub rules: &'a NightRules,
    pub house: &'a House,
}

/// Why a year could not be worked out.
#[derive(Debug, thiserror::Error)]
pub enum YearError {
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error(transparent)]
    Calendar(#[from] CalendarError),
    #[error(
        "the house is open on no night from {from} within {days} days; allow a weekday or more days"
    )]
    NeverOpen { from: CivilDate, days: u32 },
}

/// Within how many degrees a meeting is worth an evening: planets in the field of a low power (3 degrees), the Moon with a
/// planet in a binocular's (5), a bright star beside a planet (2). Common practice, no source.
#[must_use]
pub const fn worth_an_evening() -> Limits {
    Limits {
        planets: Angle::from_degrees(3.0),
        moon: Angle::from_degrees(5.0),
        stars: Angle::from_degrees(2.0),
    }
}

/// The evenings of so many days from a date on, with every body on each. `stars` are the ones whose meetings with planets
/// count; those of the Moon with stars are left out.
///
/// # Errors
/// Dates that neither sky nor calendar covers; no open night.
pub fn year(
    sky: &Sky,
    watch: Watch<'_>,
    bodies: &[Body],
    stars: &[&Star],
    from: CivilDate,
    days: u32,
) -> Result<Year, YearError> {
    let mut rules = watch.rules.clone();
    rules.conditions.weekdays = Weekdays::ALL;
    let never_open = || YearError::NeverOpen { from, days };
    let last = i32::try_from(days)
        .ok()
        .and_then(|days| days.checked_sub(1));
    let to = from.plus_days(last.filter(|&last| last >= 0).ok_or_else(never_open)?)?;
    // Where the zone's date is not that of local mean time, the night lies a day off.
    let span = Span {
        from: night_of(sky, watch.site, from.julian_day_number() - 1).from,
        to: night_of(sky, watch.site, to.julian_day_number() + 1).to,
    };
    let moon_tracks = SiteTracks::new(sky, watch.site, Body::Moon, span)?;
    let almanac = nights(&moon_tracks, watch.clock)?;
    let open: Vec<usize> = (0..almanac.len())
        .filter(|&k| {
            almanac.get(k).is_some_and(|night| {
                from <= night.date && night.date <= to && watch.house.opens_on(night.date)
            })
        })
        .collect();
    if open.is_empty() {
        return Err(never_open());
    }
    let mut evenings: Vec<Evening> = open
        .iter()
        .filter_map(|&k| almanac.get(k))
        .map(|night| Evening {
            date: night.date,
            span: night.span,
            sun: night.sun,
            moon_lit_fraction: night.moon.lit_fraction,
            showings: Vec::with_capacity(bodies.len()),
            meetings: Vec::new(),
        })
        .collect();
    for &body in bodies {
        let of_body;
        let tracks = if body == Body::Moon {
            &moon_tracks
        } else {
            of_body = SiteTracks::new(sky, watch.site, body, span)?;
            &of_body
        };
        let mut rules = rules.clone();
        if body == Body::Moon {
            rules.conditions.moon = None;
        }
        let openings = Openings::new(sky, tracks, &rules, watch.clock)?;
        let outcomes = spells(tracks, &openings, watch.skyline);
        for (evening, &k) in evenings.iter_mut().zip(&open) {
            if let (Some(outcome), Some(&night)) = (outcomes.get(k), tracks.night_spans().get(k)) {
                evening
                    .showings
                    .push(showing(tracks, night, outcome, &rules, watch.clock));
            }
        }
    }
    let mut year = Year {
        bodies: bodies.to_vec(),
        evenings,
    };
    add_meetings(sky, watch.site, stars, worth_an_evening(), &mut year)?;
    Ok(year)
}

fn showing(
    tracks: &SiteTracks,
    night: NightSpan,
    outcome: &Outcome,
    rules: &NightRules,
    clock: &LocalClock,
) -> Showing {
    match outcome {
        Outcome::Closed(closed) => Showing::Absent(absence(tracks, night, closed, rules, clock)),
        Outcome::Spells(found) => {
            let highest = found
                .iter()
                .map(|spell| spell.best)
                .max_by(|a, b| a.altitude.radians().total_cmp(&b.altitude.radians()));
            match highest {
                Some(best) => Showing::InView(InView {
                    spells: found.iter().map(Spell::span).collect(),
                    best_at: best.instant,
                    altitude: best.altitude,
                    magnitude: best.magnitude,
                }),
                None => Showing::Absent(Absence::Low),
            }
        }
    }
}

fn absence(
    tracks: &SiteTracks,
    night: NightSpan,
    closed: &Closed,
    rules: &NightRules,
    clock: &LocalClock,
) -> Absence {
    match closed.condition {
        Condition::Moon => return Absence::Moon,
        Condition::Occultation => return Absence::Occulted,
        Condition::Skyline => return Absence::Skyline,
        Condition::Weekday
        | Condition::LeastAltitude
        | Condition::Hours
        | Condition::SunAltitude
        | Condition::SunDown => {}
    }
    let middle = night.span.middle().days();
    let from_sun = tracks
        .standing(Which::Subject, middle)
        .separation(&tracks.standing(Which::Sun, middle));
    let daylight = matches!(
        closed.condition,
        Condition::SunAltitude | Condition::SunDown
    );
    if daylight && !closed.alone {
        return Absence::Daylight;
    }
    if from_sun < LOST_IN_SUNLIGHT {
        return Absence::Sun;
    }
    let outside_hours = rules
        .conditions
        .hours
        .and_then(|hours| open_hours(clock, hours, night))
        .and_then(|hours| time_outside(tracks, night, hours, rules));
    match outside_hours {
        Some(absence) => absence,
        None if daylight => Absence::Daylight,
        None => Absence::Low,
    }
}

/// Whether the body stands high enough in the dark before or after the hours; whichever lasts longer.
fn time_outside(
    tracks: &SiteTracks,
    night: NightSpan,
    hours: Span,
    rules: &NightRules,
) -> Option<Absence> {
    let conditions = &rules.conditions;
    let least = true_from_apparent(conditions.least_altitude, &tracks.site().air).sin();
    let dark = conditions.sun_below.sin();
    let (from, to) = (night.span.from.days(), night.span.to.days());
    let first = ((from - tracks.start_days()) / SAMPLE_STEP).ceil().max(0.0) as usize;
    let samples = tracks.sampled.subject.iter().zip(&tracks.sampled.sun);
    let (mut before, mut after) = (0_u32, 0_u32);
    for (k, (&subject, &sun)) in samples.enumerate().skip(first) {
        let t = tracks.start_days() + k as f64 * SAMPLE_STEP;
        if t >= to {
            break;
        }
        if subject >= least && sun <= dark {
            if t < hours.from.days() {
                before += 1;
            } else if t >= hours.to.days() {
                after += 1;
            }
        }
    }
    match (before, after) {
        (0, 0) => None,
        (before, after) if before > after => Some(Absence::Early),
        _ => Some(Absence::Late),
    }
}

/// The stretch of a night in which hours of the clock lie; the longest where there are two, `None` where there is none. A
/// clock that is changed in the night is taken as it stands at 18h local mean time.
#[must_use]
pub fn open_hours(clock: &LocalClock, hours: Hours, night: NightSpan) -> Option<Span> {
    let offset = f64::from(clock.offset_seconds(night.evening)) / SECONDS_PER_DAY;
    let noon = night.noon.days() + offset;
    // The count of days begins at noon.
    let midnight = (noon + 0.5).floor() - 0.5;
    let minute = |minutes: u16| f64::from(minutes) / 1_440.0;
    let (from, mut to) = (minute(hours.from.minutes()), minute(hours.to.minutes()));
    if to < from {
        to += 1.0;
    }
    [-1.0, 0.0, 1.0]
        .into_iter()
        .filter_map(|day| {
            let start = (midnight + day + from).max(noon);
            let end = (midnight + day + to).min(noon + 1.0);
            (start < end).then_some((start - noon, end - noon))
        })
        .max_by(|a, b| (a.1 - a.0).total_cmp(&(b.1 - b.0)))
        .map(|(start, end)| Span {
            from: night.span.from.plus_days(start),
            to: night.span.from.plus_days(end),
        })
}

/// A meeting before it is known whether another evening has it closer.
struct Candidate {
    evening: usize,
    meeting: Meeting,
}

fn add_meetings(
    sky: &Sky,
    site: &Site,
    stars: &[&Star],
    limits: Limits,
    year: &mut Year,
) -> Result<(), SkyError> {
    let mut found: Vec<Candidate> = Vec::new();
    for (index, evening) in year.evenings.iter().enumerate() {
        let shown: Vec<(Body, &InView)> = year
            .bodies
            .iter()
            .zip(&evening.showings)
            .filter_map(|(&body, showing)| Some((body, showing.in_view()?)))
            .collect();
        if shown.is_empty() {
            continue;
        }
        let vantage = sky.geocentre(evening.span.middle())?;
        let mut places = Vec::with_capacity(shown.len());
        for &(body, _) in &shown {
            places.push(vantage.place(body)?);
        }
        for (k, (&(body, view), place)) in shown.iter().zip(&places).enumerate() {
            for (&(other, other_view), other_place) in shown.iter().zip(&places).skip(k + 1) {
                let with_moon = body == Body::Moon || other == Body::Moon;
                let fainter = view.magnitude.max(other_view.magnitude);
                if with_moon && fainter > FAINTEST_BESIDE_MOON {
                    continue;
                }
                // The Moon walks up to 8 degrees in half a day and is shifted by up to one; planets walk 1.
                let (limit, reserve) = if with_moon {
                    (limits.moon, Angle::from_degrees(9.0))
                } else {
                    (limits.planets, Angle::from_degrees(2.5))
                };
                if place.separation(other_place) > limit + reserve {
                    continue;
                }
                let Some(together) = longest_overlap(&view.spells, &other_view.spells) else {
                    continue;
                };
                let mut closest: Option<(Tt, Angle)> = None;
                for instant in [together.from, together.middle(), together.to] {
                    let from_here = sky.observer(site, instant)?;
                    let separation = from_here.place(body)?.separation(&from_here.place(other)?);
                    if closest.is_none_or(|(_, least)| separation < least) {
                        closest = Some((instant, separation));
                    }
                }
                if let Some((instant, separation)) = closest.filter(|found| found.1 < limit) {
                    found.push(Candidate {
                        evening: index,
                        meeting: Meeting {
                            body,
                            with: Other::Body(other),
                            instant,
                            separation,
                        },
                    });
                }
            }
            if body == Body::Moon {
                continue;
            }
            for star in stars {
                let (Some(name), Some(span)) = (star.name, view.longest()) else {
                    continue;
                };
                let direction = star.direction_at(evening.span.middle());
                if place.direction.separation(direction) > limits.stars + Angle::from_degrees(1.5) {
                    continue;
                }
                let instant = span.middle();
                let there = sky.observer(site, instant)?.place(body)?;
                let separation = there.direction.separation(direction);
                if separation < limits.stars {
                    found.push(Candidate {
                        evening: index,
                        meeting: Meeting {
                            body,
                            with: Other::Star(name.to_owned()),
                            instant,
                            separation,
                        },
                    });
                }
            }
        }
    }
    for candidate in closest_of_each(found, &year.evenings) {
        if let Some(evening) = year.evenings.get_mut(candidate.evening) {
            evening.meetings.push(candidate.meeting);
        }
    }
    Ok(())
}

/// Of every run of evenings with the same two, the one on which they are closest.
fn closest_of_each(found: Vec<Candidate>, evenings: &[Evening]) -> Vec<Candidate> {
    // With the evening on which the run was last met.
    let mut kept: Vec<(Candidate, usize)> = Vec::new();
    let date = |evening: usize| evenings.get(evening).map(|evening| evening.date);
    for candidate in found {
        let run = kept.iter_mut().rev().find(|(other, last)| {
            let near = match (date(candidate.evening), date(*last)) {
                (Some(now), Some(then)) => now.days_since(then) <= SAME_MEETING_DAYS,
                _ => false,
            };
            near && other.meeting.body == candidate.meeting.body
                && other.meeting.with == candidate.meeting.with
        });
        match run {
            Some((best, last)) => {
                *last = candidate.evening;
                if candidate.meeting.separation < best.meeting.separation {
                    *best = candidate;
                }
            }
            None => {
                let evening = candidate.evening;
                kept.push((candidate, evening));
            }
        }
    }
    kept.into_iter().map(|(candidate, _)| candidate).collect()
}

fn longest_overlap(a: &[Span], b: &[Span]) -> Option<Span> {
    let mut longest: Option<Span> = None;
    for one in a {
        for other in b {
            let both = Span {
                from: if one.from > other.from {
                    one.from
                } else {
                    other.from
                },
                to: if one.to < other.to { one.to } else { other.to },
            };
            if both.from < both.to && longest.is_none_or(|span| span.days() < both.days()) {
                longest = Some(both);
            }
        }
    }
    longest
}
