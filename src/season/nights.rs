//! The nights of a span at a site: Sun and twilights, Moon, and what the subject does, whatever stands on the skyline.
//!
//! A night is the 24 hours from local mean noon (12h - longitude/15 UTC) to the next, named by the civil date at 18h local
//! mean time. Rise and set are the almanac's (upper limb of Sun and Moon, centre of a planet, in 34' of refraction, without
//! dip); twilights are true altitudes of the Sun's centre. Instants are TT, good to a second. Where something does not
//! happen in a night, [`Daylight`] and the altitudes say why.

use super::search::minimum;
use super::site_tracks::{Limb, NightSpan, SAMPLE_STEP, SiteTracks, Which};
use super::spans::Samples;
use crate::sky::calendar::{CalendarError, CivilDate, DateTime};
use crate::sky::time::SECONDS_PER_DAY;
use crate::sky::{Angle, Body, Tt, Utc};

/// Refraction at the horizon by almanac convention.
const HORIZON_REFRACTION: Angle = Angle::from_degrees(34.0 / 60.0);
/// True altitude of the Sun's centre when almanacs have it rise and set.
const SUN_RISE_SET: Angle = Angle::from_degrees(-50.0 / 60.0);

/// The offsets of a civil clock over a span, handed in by a caller who knows the zone.
#[derive(Clone, Debug, PartialEq)]
pub struct LocalClock {
    /// From when on (UTC days), and local minus universal time in seconds; never empty, the first from the beginning of time.
    pieces: Vec<(f64, i32)>,
}

impl LocalClock {
    /// A clock that is never changed.
    #[must_use]
    pub fn fixed(offset_seconds: i32) -> Self {
        LocalClock {
            pieces: vec![(f64::NEG_INFINITY, offset_seconds)],
        }
    }

    /// Asks for the offset every six hours from one instant to the other and narrows each change to a second. A clock that
    /// is put one way and back within six hours is not noticed.
    ///
    /// # Errors
    /// What the caller's function returns.
    pub fn sampled<E>(
        from: Utc,
        to: Utc,
        mut offset_seconds: impl FnMut(Utc) -> Result<i32, E>,
    ) -> Result<Self, E> {
        let mut now = from.days();
        let mut offset = offset_seconds(from)?;
        let mut pieces = vec![(f64::NEG_INFINITY, offset)];
        while now < to.days() {
            let next = now + 0.25;
            let offset_next = offset_seconds(Utc::from_days(next))?;
            if offset_next != offset {
                let (mut low, mut high) = (now, next);
                while (high - low) * SECONDS_PER_DAY > 0.5 {
                    let middle = 0.5 * (low + high);
                    if offset_seconds(Utc::from_days(middle))? == offset {
                        low = middle;
                    } else {
                        high = middle;
                    }
                }
                // Clocks are changed on whole seconds.
                let second = (high * SECONDS_PER_DAY).round() / SECONDS_PER_DAY;
                pieces.push((second, offset_next));
                offset = offset_next;
            }
            now = next;
        }
        Ok(LocalClock { pieces })
    }

    /// Local minus universal time at an instant, seconds.
    #[must_use]
    pub fn offset_seconds(&self, utc: Utc) -> i32 {
        let after = self.pieces.partition_point(|piece| piece.0 <= utc.days());
        self.pieces
            .get(after.saturating_sub(1))
            .map_or(0, |piece| piece.1)
    }

    /// The reading of the clock.
    ///
    /// # Errors
    /// Outside the calendar's years.
    pub fn reading(&self, utc: Utc) -> Result<DateTime, CalendarError> {
        let offset = f64::from(self.offset_seconds(utc));
        DateTime::from_days(utc.plus_seconds(offset).days())
    }

    /// Stretches of constant offset: from, to (UTC days, the last without end), seconds.
    pub(super) fn pieces(&self) -> impl Iterator<Item = (f64, f64, i32)> {
        self.pieces.iter().enumerate().map(|(k, &(from, offset))| {
            let to = self
                .pieces
                .get(k + 1)
                .map_or(f64::INFINITY, |&(from, _)| from);
            (from, to, offset)
        })
    }
}

/// Whether there is a day and a night.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Daylight {
    Ordinary,
    /// Polar day.
    SunNeverSets,
    /// Polar night.
    SunNeverRises,
}

/// The Sun in a night: times in the order of an ordinary night; `None` where it does not pass that altitude.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SunOfNight {
    pub daylight: Daylight,
    pub set: Option<Tt>,
    pub civil_dusk: Option<Tt>,
    pub nautical_dusk: Option<Tt>,
    pub astronomical_dusk: Option<Tt>,
    pub astronomical_dawn: Option<Tt>,
    pub nautical_dawn: Option<Tt>,
    pub civil_dawn: Option<Tt>,
    pub rise: Option<Tt>,
    /// Least true altitude of the centre.
    pub lowest: Angle,
    pub lowest_at: Tt,
}

/// The Moon in a night.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MoonOfNight {
    pub rise: Option<Tt>,
    pub set: Option<Tt>,
    /// Above the horizon at the beginning of the night: with neither rise nor set, all night.
    pub up_at_start: bool,
    /// At the middle of the night, 0 to 1.
    pub lit_fraction: f64,
    /// The lit fraction grows.
    pub waxing: bool,
    /// From the subject, at the middle of the night.
    pub separation: Angle,
}

/// The subject in a night, on a bare horizon.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SubjectOfNight {
    pub rise: Option<Tt>,
    pub set: Option<Tt>,
    /// With neither rise nor set: it never sets (`true`) or never rises.
    pub up_at_start: bool,
    /// Upper transit, and the true altitude then.
    pub transit: Option<(Tt, Angle)>,
}

/// One night, apart from conditions and skyline.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Night {
    /// Civil date in the site's zone at 18h local mean time.
    pub date: CivilDate,
    pub span: super::types::Span,
    pub sun: SunOfNight,
    pub moon: MoonOfNight,
    pub subject: SubjectOfNight,
}

/// Passages of a function through zero, in order.
struct Passages {
    at: Vec<f64>,
    above_at_first: bool,
}

impl Passages {
    /// The passages within a night with whether they go upward.
    fn within(&self, span: NightSpan) -> impl Iterator<Item = (Tt, bool)> {
        let (from, to) = (span.span.from.days(), span.span.to.days());
        let first = self.at.partition_point(|&at| at < from);
        let end = self.at.partition_point(|&at| at < to);
        (first..end).filter_map(move |k| {
            let upward = self.above_at_first == (k % 2 == 1);
            self.at.get(k).map(|&at| (Tt::from_days(at), upward))
        })
    }

    fn rise(&self, span: NightSpan) -> Option<Tt> {
        self.within(span).find(|passage| passage.1).map(|p| p.0)
    }

    fn last_rise(&self, span: NightSpan) -> Option<Tt> {
        self.within(span)
            .filter(|passage| passage.1)
            .last()
            .map(|p| p.0)
    }

    fn set(&self, span: NightSpan) -> Option<Tt> {
        self.within(span).find(|passage| !passage.1).map(|p| p.0)
    }

    /// Whether the function is positive at an instant.
    fn above(&self, days: f64) -> bool {
        let passed = self.at.partition_point(|&at| at <= days);
        self.above_at_first == (passed % 2 == 0)
    }
}

fn passages(
    tracks: &SiteTracks,
    values: &[f64],
    curvature: f64,
    f: impl Fn(f64) -> f64,
) -> Passages {
    let samples = Samples {
        from: tracks.start_days(),
        step: SAMPLE_STEP,
        values,
    };
    Passages {
        at: samples.sign_changes(curvature, &f),
        above_at_first: values.first().is_some_and(|&value| value >= 0.0),
    }
}

/// Passages of a body's centre through a fixed true altitude.
fn altitude_passages(tracks: &SiteTracks, which: Which, altitude: Angle) -> Passages {
    let sine = altitude.sin();
    let sines = match which {
        Which::Sun => &tracks.sampled.sun,
        Which::Moon => &tracks.sampled.moon,
        Which::Subject => &tracks.sampled.subject,
    };
    let values: Vec<f64> = sines.iter().map(|value| value - sine).collect();
    passages(tracks, &values, FASTEST * FASTEST, |t| {
        tracks.standing(which, t).direction.z - sine
    })
}

/// Upper bound of the speed of any of the bodies on the local sky, radians a day.
pub(super) const FASTEST: f64 = 6.75;

/// Passages of the Moon's upper limb through the horizon with its 34' of refraction.
fn moon_passages(tracks: &SiteTracks) -> Passages {
    let limb = Limb::new(Body::Moon, -HORIZON_REFRACTION);
    let sampled = &tracks.sampled;
    let values: Vec<f64> = sampled
        .moon
        .iter()
        .zip(&sampled.moon_distance_au)
        .map(|(sine, &distance)| sine - limb.sine(distance))
        .collect();
    passages(tracks, &values, FASTEST * FASTEST, |t| {
        let moon = tracks.standing(Which::Moon, t);
        moon.direction.z - limb.sine(moon.distance_au)
    })
}

/// Every night of the tracks.
///
/// # Errors
/// Dates outside the calendar's years.
pub fn nights(tracks: &SiteTracks, clock: &LocalClock) -> Result<Vec<Night>, CalendarError> {
    let sun_at = |degrees: f64| altitude_passages(tracks, Which::Sun, Angle::from_degrees(degrees));
    let rise_set = altitude_passages(tracks, Which::Sun, SUN_RISE_SET);
    let (civil, nautical, astronomical) = (sun_at(-6.0), sun_at(-12.0), sun_at(-18.0));
    let moon = moon_passages(tracks);
    let subject = match tracks.subject() {
        Body::Sun => altitude_passages(tracks, Which::Sun, SUN_RISE_SET),
        Body::Moon => moon_passages(tracks),
        _ => altitude_passages(tracks, Which::Subject, -HORIZON_REFRACTION),
    };
    let east = passages(
        tracks,
        &tracks.sampled.subject_east,
        FASTEST * FASTEST,
        |t| tracks.standing(Which::Subject, t).direction.x,
    );
    tracks
        .night_spans()
        .iter()
        .map(|&span| {
            let (lowest_at, lowest) = lowest_sun(tracks, span);
            let set = rise_set.set(span);
            let rise = rise_set.last_rise(span);
            let daylight = match (set, rise) {
                (None, None) if rise_set.above(lowest_at.days()) => Daylight::SunNeverSets,
                (None, None) => Daylight::SunNeverRises,
                _ => Daylight::Ordinary,
            };
            let start = span.span.from.days();
            let middle = span.span.middle().days();
            let lit = |days: f64| {
                tracks
                    .between(days)
                    .map_or(0.0, |between| between.moon_lit_fraction())
            };
            let separation = tracks
                .standing(Which::Subject, middle)
                .separation(&tracks.standing(Which::Moon, middle));
            let transit = east
                .within(span)
                .find(|passage| !passage.1)
                .map(|(instant, _)| {
                    let standing = tracks.standing(Which::Subject, instant.days());
                    (instant, standing.altitude())
                });
            Ok(Night {
                date: clock.reading(span.evening)?.date(),
                span: span.span,
                sun: SunOfNight {
                    daylight,
                    set,
                    civil_dusk: civil.set(span),
                    nautical_dusk: nautical.set(span),
                    astronomical_dusk: astronomical.set(span),
                    astronomical_dawn: astronomical.last_rise(span),
                    nautical_dawn: nautical.last_rise(span),
                    civil_dawn: civil.last_rise(span),
                    rise,
                    lowest,
                    lowest_at,
                },
                moon: MoonOfNight {
                    rise: moon.rise(span),
                    set: moon.set(span),
                    up_at_start: moon.above(start),
                    lit_fraction: lit(middle),
                    // A day apart: the daily parallax, which shifts the phase too, is the same at both.
                    waxing: lit(span.span.to.days()) > lit(start),
                    separation,
                },
                subject: SubjectOfNight {
                    rise: subject.rise(span),
                    set: subject.set(span),
                    up_at_start: subject.above(start),
                    transit,
                },
            })
        })
        .collect()
}

/// When the Sun stands lowest in a night.
fn lowest_sun(tracks: &SiteTracks, span: NightSpan) -> (Tt, Angle) {
    let sine = |days: f64| tracks.standing(Which::Sun, days).direction.z;
    let (from, to) = (span.span.from.days(), span.span.to.days());
    let count = ((to - from) / SAMPLE_STEP) as usize;
    let mut best = (from, sine(from));
    let first = ((from - tracks.start_days()) / SAMPLE_STEP).ceil() as usize;
    for k in first..first + count {
        if let Some(&value) = tracks.sampled.sun.get(k)
            && value < best.1
        {
            best = (tracks.start_days() + k as f64 * SAMPLE_STEP, value);
        }
    }
    let low = (best.0 - SAMPLE_STEP).max(from);
    let high = (best.0 + SAMPLE_STEP).min(to);
    let Ok((at, value)) = minimum(low, best, high, 1e-5, |days| {
        Ok::<_, std::convert::Infallible>(sine(days))
    });
    (
        Tt::from_days(at),
        Angle::from_radians(libm::asin(value.clamp(-1.0, 1.0))),
    )
}
