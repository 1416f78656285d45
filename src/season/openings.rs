//! When every condition but the skyline holds: found once, so that a skyline can be dragged while every night follows.

use std::ops::Range;

use super::conditions::{Conditions, Hours};
use super::nights::{FASTEST, LocalClock};
use super::search::minimum;
use super::site_tracks::{Limb, SAMPLE_STEP, SiteTracks, Which};
use super::skyline_scan::{Point, point};
use super::spans::{Samples, Stretch, clipped, intersection, total_days, union};
use super::types::Span;
use super::visibility::Viewer;
use crate::sky::calendar::CalendarError;
use crate::sky::physical::semidiameter;
use crate::sky::place::Sky;
use crate::sky::refraction::{horizon_dip, true_from_apparent};
use crate::sky::time::SECONDS_PER_DAY;
use crate::sky::{Angle, Body, Tt, Utc};

/// How long the Sun must be gone before optics are used, and how long before it returns they are put away. The Sun counts as
/// gone from the instant at which its upper limb sinks below the true horizon, with refraction and with the dip for the
/// site's height above its surroundings; hidden by a roof is not gone.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SunDownRule {
    minutes: Option<(f64, f64)>,
}

/// Common practice, no source.
const AFTER_SUNSET_MINUTES: f64 = 5.0;
/// Common practice, no source.
const BEFORE_SUNRISE_MINUTES: f64 = 10.0;
/// Longer waits than this have no use.
const MOST_MINUTES: f64 = 240.0;

impl Default for SunDownRule {
    /// From 5 minutes after to 10 minutes before.
    fn default() -> Self {
        SunDownRule {
            minutes: Some((AFTER_SUNSET_MINUTES, BEFORE_SUNRISE_MINUTES)),
        }
    }
}

impl SunDownRule {
    /// Longer waits; shorter ones than the default's are lifted to it.
    #[must_use]
    pub fn widened(after_minutes: f64, before_minutes: f64) -> Self {
        SunDownRule {
            minutes: Some((
                after_minutes.clamp(AFTER_SUNSET_MINUTES, MOST_MINUTES),
                before_minutes.clamp(BEFORE_SUNRISE_MINUTES, MOST_MINUTES),
            )),
        }
    }

    /// Shorter waits, at least nil, for a user who has asked for them in so many words.
    #[must_use]
    pub fn narrowed_as_the_user_asked(after_minutes: f64, before_minutes: f64) -> Self {
        SunDownRule {
            minutes: Some((
                after_minutes.clamp(0.0, MOST_MINUTES),
                before_minutes.clamp(0.0, MOST_MINUTES),
            )),
        }
    }

    /// Daylight too, for a user who has asked for it in so many words. Spells then carry
    /// [`SunNear`](crate::sky::Caution::SunNear) where the Sun is up and near.
    #[must_use]
    pub const fn daylight_as_the_user_asked() -> Self {
        SunDownRule { minutes: None }
    }

    /// Minutes after sunset and before sunrise; `None` where daylight is allowed.
    #[must_use]
    pub const fn minutes(self) -> Option<(f64, f64)> {
        self.minutes
    }
}

/// All that is asked of a night, apart from the skyline.
#[derive(Clone, Debug, PartialEq)]
pub struct NightRules {
    pub conditions: Conditions,
    pub sun_down: SunDownRule,
    /// Nearer to a Sun that is up, the subject carries a caution.
    pub sun_distance: Angle,
    /// How far the skyline may be wrong.
    pub skyline_error: Angle,
    /// With an eye, the best moment of a spell of Mercury or Venus is where the planet stands out most to it, which in the
    /// evening is well after it is highest; without, and for other subjects, where it is highest.
    pub best_for: Option<Viewer>,
}

impl From<Conditions> for NightRules {
    fn from(conditions: Conditions) -> Self {
        NightRules {
            conditions,
            sun_down: SunDownRule::default(),
            sun_distance: Angle::from_degrees(20.0),
            skyline_error: Angle::from_degrees(0.5),
            best_for: None,
        }
    }
}

/// A condition that can close a night.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Condition {
    Weekday,
    Moon,
    /// The subject is behind the Moon.
    Occultation,
    LeastAltitude,
    Hours,
    SunAltitude,
    SunDown,
    Skyline,
}

/// Why a stretch begins or ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Cause {
    Night,
    Is(Condition),
    MoonHorizon,
    MoonDistance,
    MoonLit,
}

/// By how much a condition is missed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Shortfall {
    /// Missing height, darkness or distance.
    Angle(Angle),
    /// Time to the nearest instant that is allowed.
    Minutes(f64),
    /// Nothing that could be measured: a weekday.
    Whole,
}

/// Why a night has no spell.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Closed {
    pub condition: Condition,
    /// At the instant when it misses least.
    pub shortfall: Shortfall,
    pub nearest: Option<Tt>,
    /// How long it stands in the way: where it is alone in the way, all the time that every other condition allows; else
    /// the time that those before it leave (Sun, hours, altitude, Moon, in this order).
    pub lasting_days: f64,
    /// Every other condition (but the skyline, where that is not the one) would allow some of the night.
    pub alone: bool,
}

/// A stretch of one night that every condition but the skyline allows.
#[derive(Clone, Debug)]
pub(super) struct Window {
    pub stretch: Stretch<Cause>,
    /// Of [`Openings::points`]: its ends and the samples between.
    pub points: Range<usize>,
}

/// The stretches of each night that all conditions but the skyline allow.
#[derive(Clone, Debug)]
pub struct Openings {
    pub(super) rules: NightRules,
    pub(super) windows: Vec<Window>,
    pub(super) points: Vec<Point>,
    /// For each night its windows, or why there is none.
    pub(super) nights: Vec<Result<Range<usize>, Closed>>,
}

/// The sets of instants in which the conditions hold, one by one.
struct Sets<'a> {
    tracks: &'a SiteTracks,
    rules: &'a NightRules,
    sets: [Vec<Stretch<Cause>>; 7],
    /// True altitude at which the upper limbs of Sun and Moon touch the true horizon, without their semidiameter.
    horizon: Angle,
}

/// In the order in which the blame is laid where several conditions are each alone in the way.
const ORDER: [Condition; 7] = [
    Condition::Weekday,
    Condition::Moon,
    Condition::Occultation,
    Condition::LeastAltitude,
    Condition::Hours,
    Condition::SunAltitude,
    Condition::SunDown,
];

/// In the order in which they narrow a night where several are in the way together; indices of [`ORDER`].
const NARROWING: [usize; 7] = [5, 6, 0, 4, 3, 1, 2];

impl Openings {
    /// Finds them.
    ///
    /// # Errors
    /// Dates outside the calendar's years.
    pub fn new(
        sky: &Sky,
        tracks: &SiteTracks,
        rules: &NightRules,
        clock: &LocalClock,
    ) -> Result<Self, CalendarError> {
        let sets = Sets::new(sky, tracks, rules, clock)?;
        let mut all = sets.sets[0].clone();
        for set in &sets.sets[1..] {
            all = intersection(&all, set);
        }
        let mut openings = Openings {
            rules: rules.clone(),
            windows: Vec::new(),
            points: Vec::new(),
            nights: Vec::with_capacity(tracks.night_spans().len()),
        };
        for night in tracks.night_spans() {
            let (from, to) = (night.span.from.days(), night.span.to.days());
            let first = openings.windows.len();
            for stretch in clipped(&all, from, to, Cause::Night) {
                openings.push_window(tracks, stretch);
            }
            let windows = first..openings.windows.len();
            openings.nights.push(if windows.is_empty() {
                Err(sets.closed(night.span))
            } else {
                Ok(windows)
            });
        }
        Ok(openings)
    }

    fn push_window(&mut self, tracks: &SiteTracks, stretch: Stretch<Cause>) {
        let first = self.points.len();
        self.points.push(point(tracks, stretch.from));
        let start = tracks.start_days();
        let mut k = ((stretch.from - start) / SAMPLE_STEP).floor() + 1.0;
        while start + k * SAMPLE_STEP < stretch.to {
            self.points.push(point(tracks, start + k * SAMPLE_STEP));
            k += 1.0;
        }
        self.points.push(point(tracks, stretch.to));
        self.windows.push(Window {
            stretch,
            points: first..self.points.len(),
        });
    }

    #[must_use]
    pub fn rules(&self) -> &NightRules {
        &self.rules
    }
}

impl<'a> Sets<'a> {
    fn new(
        sky: &Sky,
        tracks: &'a SiteTracks,
        rules: &'a NightRules,
        clock: &LocalClock,
    ) -> Result<Self, CalendarError> {
        let site = tracks.site();
        let dip = horizon_dip(site.height_above_surroundings_m);
        let mut sets = Sets {
            tracks,
            rules,
            sets: Default::default(),
            horizon: true_from_apparent(-dip, &site.air),
        };
        sets.sets = [
            sets.weekdays(clock)?,
            sets.moon(),
            sets.not_occulted(),
            sets.high_enough(),
            sets.hours(sky, clock),
            sets.dark_enough(),
            sets.sun_down(),
        ];
        Ok(sets)
    }

    fn everything(&self, cause: Cause) -> Vec<Stretch<Cause>> {
        let from = self.tracks.start_days();
        let steps = self.tracks.sampled.sun.len().saturating_sub(1);
        vec![Stretch {
            from,
            to: from + steps as f64 * SAMPLE_STEP,
            opens: cause,
            closes: cause,
        }]
    }

    fn where_not_negative(
        &self,
        values: &[f64],
        curvature: f64,
        cause: Cause,
        f: impl Fn(f64) -> f64,
    ) -> Vec<Stretch<Cause>> {
        let samples = Samples {
            from: self.tracks.start_days(),
            step: SAMPLE_STEP,
            values,
        };
        samples.not_negative(curvature, cause, &f)
    }

    fn dark_enough(&self) -> Vec<Stretch<Cause>> {
        let sine = sine_within(self.rules.conditions.sun_below);
        let values: Vec<f64> = self.tracks.sampled.sun.iter().map(|z| sine - z).collect();
        let cause = Cause::Is(Condition::SunAltitude);
        self.where_not_negative(&values, FASTEST * FASTEST, cause, |t| {
            sine - self.tracks.standing(Which::Sun, t).direction.z
        })
    }

    fn high_enough(&self) -> Vec<Stretch<Cause>> {
        let least = self.rules.conditions.least_altitude;
        let sine = sine_within(true_from_apparent(least, &self.tracks.site().air));
        let sampled = &self.tracks.sampled;
        let values: Vec<f64> = sampled.subject.iter().map(|z| z - sine).collect();
        let cause = Cause::Is(Condition::LeastAltitude);
        self.where_not_negative(&values, FASTEST * FASTEST, cause, |t| {
            self.tracks.standing(Which::Subject, t).direction.z - sine
        })
    }

    /// Where the upper limb of Sun or Moon is below the true horizon.
    fn below_horizon(&self, body: Body, cause: Cause) -> Vec<Stretch<Cause>> {
        let limb = Limb::new(body, self.horizon);
        let sampled = &self.tracks.sampled;
        let (which, sines, distances) = match body {
            Body::Moon => (Which::Moon, &sampled.moon, &sampled.moon_distance_au),
            _ => (Which::Sun, &sampled.sun, &sampled.sun_distance_au),
        };
        let values: Vec<f64> = sines
            .iter()
            .zip(distances)
            .map(|(sine, &distance)| limb.sine(distance) - sine)
            .collect();
        self.where_not_negative(&values, FASTEST * FASTEST, cause, |t| {
            let standing = self.tracks.standing(which, t);
            limb.sine(standing.distance_au) - standing.direction.z
        })
    }

    fn sun_down(&self) -> Vec<Stretch<Cause>> {
        let cause = Cause::Is(Condition::SunDown);
        let Some((after, before)) = self.rules.sun_down.minutes() else {
            return self.everything(cause);
        };
        let days = |minutes: f64| minutes * 60.0 / SECONDS_PER_DAY;
        let [all] = &self.everything(cause)[..] else {
            return Vec::new();
        };
        let mut down = self.below_horizon(Body::Sun, cause);
        for stretch in &mut down {
            // At the ends of what is known, hours outside the nights, the Sun may have been down for long.
            if stretch.from > all.from {
                stretch.from += days(after);
            }
            if stretch.to < all.to {
                stretch.to -= days(before);
            }
        }
        down.retain(|stretch| stretch.from < stretch.to);
        down
    }

    fn moon(&self) -> Vec<Stretch<Cause>> {
        /// Bound of the second derivative of the cosine of the distance between Moon and subject, per day squared: 0.73 from
        /// the daily parallax, 0.15 from the speeds, and a third more.
        const CURVATURE: f64 = 1.2;
        /// The same of the lit fraction.
        const LIT_CURVATURE: f64 = 0.8;
        let everything = self.everything(Cause::Is(Condition::Moon));
        let Some(rule) = self.rules.conditions.moon else {
            return everything;
        };
        if self.tracks.subject() == Body::Moon {
            return everything;
        }
        let tracks = self.tracks;
        let mut allowed = self.below_horizon(Body::Moon, Cause::MoonHorizon);
        let cosine = rule.least_distance.cos();
        let sampled = &tracks.sampled;
        let values: Vec<f64> = sampled.moon_cosine.iter().map(|c| cosine - c).collect();
        let far = self.where_not_negative(&values, CURVATURE, Cause::MoonDistance, |t| {
            cosine - moon_cosine(tracks, t)
        });
        allowed = union(&allowed, &far);
        if rule.unless_lit_below > 0.0 {
            let spare = |t: f64| {
                let lit = tracks.between(t).map_or(1.0, |b| b.moon_lit_fraction());
                rule.unless_lit_below - lit
            };
            let values: Vec<f64> = (0..sampled.moon.len())
                .map(|k| spare(tracks.start_days() + k as f64 * SAMPLE_STEP))
                .collect();
            let thin = self.where_not_negative(&values, LIT_CURVATURE, Cause::MoonLit, spare);
            allowed = union(&allowed, &thin);
        }
        allowed
    }

    fn not_occulted(&self) -> Vec<Stretch<Cause>> {
        const CURVATURE: f64 = 1.2;
        let cause = Cause::Is(Condition::Occultation);
        let tracks = self.tracks;
        if tracks.subject() == Body::Moon {
            return self.everything(cause);
        }
        let limb = Limb::new(Body::Moon, Angle::ZERO);
        let sampled = &tracks.sampled;
        let values: Vec<f64> = sampled
            .moon_cosine
            .iter()
            .zip(&sampled.moon_distance_au)
            .map(|(cosine, &distance)| limb.cosine(distance) - cosine)
            .collect();
        self.where_not_negative(&values, CURVATURE, cause, |t| {
            let moon = tracks.standing(Which::Moon, t);
            limb.cosine(moon.distance_au) - moon_cosine(tracks, t)
        })
    }

    fn weekdays(&self, clock: &LocalClock) -> Result<Vec<Stretch<Cause>>, CalendarError> {
        let cause = Cause::Is(Condition::Weekday);
        let allowed = self.rules.conditions.weekdays;
        let mut open = Vec::new();
        for night in self.tracks.night_spans() {
            if allowed.contains(clock.reading(night.evening)?.date().weekday()) {
                open.push(Stretch {
                    from: night.span.from.days(),
                    to: night.span.to.days(),
                    opens: cause,
                    closes: cause,
                });
            }
        }
        Ok(open)
    }

    fn hours(&self, sky: &Sky, clock: &LocalClock) -> Vec<Stretch<Cause>> {
        let cause = Cause::Is(Condition::Hours);
        let all = self.everything(cause);
        let (Some(hours), Some(all)) = (self.rules.conditions.hours, all.first()) else {
            return all;
        };
        let tables = sky.tables();
        let utc = |days: f64| tables.utc_from_tt(Tt::from_days(days)).days();
        let tt = |days: f64| tables.tt_from_utc(Utc::from_days(days)).days();
        let (from, to) = (utc(all.from), utc(all.to));
        let mut open = Vec::new();
        for (piece_from, piece_to, offset) in clock.pieces() {
            let (piece_from, piece_to) = (piece_from.max(from), piece_to.min(to));
            if piece_from >= piece_to {
                continue;
            }
            // Local days begin half a day off the count from noon.
            let shift = f64::from(offset) / SECONDS_PER_DAY + 0.5;
            let mut day = (piece_from + shift).floor() - 1.0;
            while day - shift < piece_to {
                let (begin, end) = bounds_of(hours);
                let begin = (day + begin - shift).max(piece_from);
                let end = (day + end - shift).min(piece_to);
                if begin < end {
                    open.push(Stretch {
                        from: tt(begin),
                        to: tt(end),
                        opens: cause,
                        closes: cause,
                    });
                }
                day += 1.0;
            }
        }
        union(&open, &[])
    }

    /// Which condition keeps a night closed.
    fn closed(&self, span: Span) -> Closed {
        let (from, to) = (span.from.days(), span.to.days());
        let whole = [Stretch {
            from,
            to,
            opens: Cause::Night,
            closes: Cause::Night,
        }];
        let sets: Vec<Vec<Stretch<Cause>>> = self
            .sets
            .iter()
            .map(|set| clipped(set, from, to, Cause::Night))
            .collect();
        for (index, &condition) in ORDER.iter().enumerate() {
            let mut others = whole.to_vec();
            for (other, set) in sets.iter().enumerate() {
                if other != index && !others.is_empty() {
                    others = intersection(&others, set);
                }
            }
            if !others.is_empty() {
                return self.blame(condition, &others, &sets, true);
            }
        }
        let mut left = whole.to_vec();
        for index in NARROWING {
            let (Some(set), Some(&condition)) = (sets.get(index), ORDER.get(index)) else {
                continue;
            };
            let narrower = intersection(&left, set);
            if narrower.is_empty() {
                return self.blame(condition, &left, &sets, false);
            }
            left = narrower;
        }
        // Not reached while the night is closed: the intersection of all is empty.
        self.blame(Condition::LeastAltitude, &left, &sets, false)
    }

    fn blame(
        &self,
        condition: Condition,
        within: &[Stretch<Cause>],
        sets: &[Vec<Stretch<Cause>>],
        alone: bool,
    ) -> Closed {
        let tracks = self.tracks;
        let conditions = &self.rules.conditions;
        let allowed = ORDER
            .iter()
            .position(|&other| other == condition)
            .and_then(|index| sets.get(index));
        let minutes_off = |t: f64| -> Option<f64> {
            let near = allowed?.iter().map(|s| (s.from - t).max(t - s.to));
            near.reduce(f64::min)
                .map(|days| days * SECONDS_PER_DAY / 60.0)
        };
        let altitude = |which: Which, t: f64| tracks.standing(which, t).altitude();
        let missing = |t: f64| -> Option<f64> {
            let angle = match condition {
                Condition::Weekday | Condition::Skyline => return None,
                Condition::Hours | Condition::SunDown => return minutes_off(t),
                Condition::SunAltitude => altitude(Which::Sun, t) - conditions.sun_below,
                Condition::LeastAltitude => {
                    conditions.least_altitude
                        - Angle::from_radians(point(tracks, t).apparent_altitude)
                }
                Condition::Moon => {
                    let least = conditions.moon.map_or(Angle::ZERO, |m| m.least_distance);
                    least - moon_separation(tracks, t)
                }
                Condition::Occultation => {
                    let moon = tracks.standing(Which::Moon, t);
                    semidiameter(Body::Moon, moon.distance_au) - moon_separation(tracks, t)
                }
            };
            Some(angle.radians())
        };
        let (nearest, least) = least_within(within, missing);
        let shortfall = match (condition, least) {
            (_, None) => Shortfall::Whole,
            (Condition::Hours | Condition::SunDown, Some(minutes)) => Shortfall::Minutes(minutes),
            (_, Some(radians)) => Shortfall::Angle(Angle::from_radians(radians)),
        };
        Closed {
            condition,
            shortfall,
            nearest: nearest.map(Tt::from_days),
            lasting_days: total_days(within),
            alone,
        }
    }
}

/// Where a function is least over a set, and its value: looked for at the ends and every twenty minutes, then narrowed. `None`
/// for an empty set and where the function has no value.
pub(super) fn least_within<C>(
    set: &[Stretch<C>],
    f: impl Fn(f64) -> Option<f64>,
) -> (Option<f64>, Option<f64>) {
    let mut best: Option<(f64, f64, f64, f64)> = None;
    for stretch in set {
        let steps = (stretch.days() / SAMPLE_STEP).ceil().max(1.0);
        let step = stretch.days() / steps;
        let mut k = 0.0;
        while k <= steps {
            let t = stretch.from + step * k;
            let Some(value) = f(t) else {
                return (None, None);
            };
            if best.is_none_or(|(_, least, ..)| value < least) {
                let low = (t - step).max(stretch.from);
                best = Some((t, value, low, (t + step).min(stretch.to)));
            }
            k += 1.0;
        }
    }
    let Some((t, value, low, high)) = best else {
        return (None, None);
    };
    /// Eight seconds.
    const NARROW_DAYS: f64 = 1e-4;
    let Ok((t, value)) = minimum(low, (t, value), high, NARROW_DAYS, |t| {
        Ok::<_, std::convert::Infallible>(f(t).unwrap_or(f64::MAX))
    });
    (Some(t), Some(value))
}

fn moon_cosine(tracks: &SiteTracks, t: f64) -> f64 {
    tracks.between(t).map_or(-1.0, |between| {
        let subject = between.standing(Which::Subject).direction;
        subject.dot(between.standing(Which::Moon).direction)
    })
}

pub(super) fn moon_separation(tracks: &SiteTracks, t: f64) -> Angle {
    tracks
        .standing(Which::Subject, t)
        .separation(&tracks.standing(Which::Moon, t))
}

/// Sine of an altitude; beyond the zenith nothing is as high, below the nadir everything.
fn sine_within(altitude: Angle) -> f64 {
    if altitude > Angle::QUARTER_TURN {
        2.0
    } else if altitude < -Angle::QUARTER_TURN {
        -2.0
    } else {
        altitude.sin()
    }
}

/// Beginning and end as shares of a day, the end beyond 1 where the stretch passes midnight.
fn bounds_of(hours: Hours) -> (f64, f64) {
    let share = |clock: super::conditions::ClockTime| f64::from(clock.minutes()) / 1440.0;
    let (from, to) = (share(hours.from), share(hours.to));
    if from <= to {
        (from, to)
    } else {
        (from, to + 1.0)
    }
}
