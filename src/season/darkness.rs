//! How dark every night of a season is, and when the subject stands in the open: what a picture of the season needs.
//!
//! Altitudes come from [`SiteTracks`]. Times are TT, found to 3 s; altitudes of the Sun true, of its centre.
//!
//! "In view" is a plain test of altitude, skyline and the Sun's depth by [`Conditions`]; hours, weekdays and Moon do not
//! enter, and what lasts less than two minutes, an opening or a chimney
//! in it, may be missed. Stretches from an exact search can take its place
//! ([`Darkness::set_in_view`]).

use super::conditions::Conditions;
use super::site_tracks::{SiteTracks, Which};
use super::types::Span;
use crate::sky::place::{AU_KM, Sky, SkyError};
use crate::sky::refraction::apparent_from_true;
use crate::sky::skyline::Cursor;
use crate::sky::{Angle, Body, Site, Skyline, Tt};

/// Samples of a night, one every ten minutes, both ends included.
const SAMPLES: usize = 145;
/// Parts of the time between samples in which the skyline is looked at: 2 minutes, in which the sky turns by half a degree.
const FINER: usize = 5;
/// Where a stretch begins and ends is found to this, days.
const TOLERANCE_DAYS: f64 = 3.0 / 86_400.0;

/// The nights of a season.
#[derive(Clone, Debug, PartialEq)]
pub struct Darkness {
    pub subject: Body,
    /// One after the other, without gaps.
    pub nights: Vec<NightLight>,
}

/// The light of one night.
#[derive(Clone, Debug, PartialEq)]
pub struct NightLight {
    /// From local mean noon to the next.
    pub span: Span,
    /// True altitude of the Sun's centre at even instants, both ends of the span included.
    pub sun_altitudes: Vec<Angle>,
    /// When the Moon is up: upper limb, level horizon, standard refraction.
    pub moon_up: Vec<Span>,
    /// Of the Moon at the middle of the night, 0 to 1.
    pub moon_lit: f64,
    /// When the subject stands above the least altitude and the skyline while the Sun is low enough.
    pub in_view: Vec<Span>,
}

impl NightLight {
    /// The stretch around midnight in which the Sun's centre is below a true altitude; `None` where it never is. The ends
    /// are good to 20 s where the Sun does not merely graze the altitude.
    #[must_use]
    pub fn sun_below(&self, limit: Angle) -> Option<Span> {
        let samples = &self.sun_altitudes;
        let step = self.span.days() / samples.len().saturating_sub(1).max(1) as f64;
        let is_below = |index: usize| samples.get(index).is_some_and(|&altitude| altitude < limit);
        // The lowest is surely within, if any is.
        let lowest = (0..samples.len()).min_by(|&a, &b| {
            let altitude = |index: usize| samples.get(index).map_or(0.0, |angle| angle.radians());
            altitude(a).total_cmp(&altitude(b))
        })?;
        if !is_below(lowest) {
            return None;
        }
        let first = (0..lowest)
            .rev()
            .take_while(|&at| is_below(at))
            .last()
            .unwrap_or(lowest);
        let last = (lowest..samples.len())
            .take_while(|&at| is_below(at))
            .last()
            .unwrap_or(lowest);
        // Straight between the last sample on one side and the first on the other.
        let instant = |inside: usize, outside: Option<usize>| {
            let here = inside as f64;
            let beyond = outside.and_then(|outside| {
                let (a, b) = (
                    samples.get(inside)?.radians(),
                    samples.get(outside)?.radians(),
                );
                let share = (limit.radians() - a) / (b - a);
                Some(here + (outside as f64 - here) * share)
            });
            self.span.from.plus_days(beyond.unwrap_or(here) * step)
        };
        Some(Span {
            from: instant(first, first.checked_sub(1)),
            to: instant(last, Some(last + 1)),
        })
    }

    /// Days in which the subject is in view.
    #[must_use]
    pub fn days_in_view(&self) -> f64 {
        self.in_view.iter().map(|stretch| stretch.days()).sum()
    }
}

impl Darkness {
    /// The number of the night that holds an instant.
    #[must_use]
    pub fn night_of(&self, instant: Tt) -> Option<usize> {
        let after = self
            .nights
            .partition_point(|night| night.span.from <= instant);
        let index = after.checked_sub(1)?;
        self.nights
            .get(index)
            .filter(|night| night.span.contains(instant))
            .map(|_| index)
    }

    /// Puts stretches found elsewhere in the place of the plain ones. Each belongs to the night in which it begins;
    /// those that begin outside the season are left out.
    pub fn set_in_view(&mut self, stretches: impl IntoIterator<Item = Span>) {
        for night in &mut self.nights {
            night.in_view.clear();
        }
        for stretch in stretches {
            let night = self.night_of(stretch.from);
            if let Some(night) = night.and_then(|index| self.nights.get_mut(index)) {
                night.in_view.push(stretch);
            }
        }
    }
}

/// What stands in the way and what is asked for.
#[derive(Clone, Copy)]
pub struct Place<'a> {
    pub site: &'a Site,
    pub skyline: &'a Skyline,
    pub conditions: &'a Conditions,
}

/// The nights whose evenings lie in a span.
///
/// # Errors
/// A span that the sky does not cover.
pub fn darkness(
    sky: &Sky,
    place: Place<'_>,
    subject: Body,
    span: Span,
) -> Result<Darkness, SkyError> {
    // 18h of the first civil day, whatever the zone, lies in the night that its evening begins.
    let evenings = Span {
        from: span.from.plus_days(0.75),
        to: span.to,
    };
    let tracks = SiteTracks::new(sky, place.site, subject, evenings)?;
    Ok(darkness_along(&tracks, place))
}

/// The same along tracks that are known already.
#[must_use]
pub fn darkness_along(tracks: &SiteTracks, place: Place<'_>) -> Darkness {
    let mut looker = Looker {
        tracks,
        place,
        cursor: place.skyline.cursor(),
    };
    Darkness {
        subject: tracks.subject(),
        nights: tracks
            .night_spans()
            .iter()
            .map(|night| looker.light(night.span))
            .collect(),
    }
}

struct Looker<'a> {
    tracks: &'a SiteTracks,
    place: Place<'a>,
    cursor: Cursor<'a>,
}

impl Looker<'_> {
    fn light(&mut self, span: Span) -> NightLight {
        let days = |share: f64| span.from.days() + share * span.days();
        let mut sun_altitudes = Vec::with_capacity(SAMPLES);
        let mut moon = Stretches::default();
        let mut view = Stretches::default();
        for sample in 0..SAMPLES {
            let share = sample as f64 / (SAMPLES - 1) as f64;
            let sun = self.altitude(Which::Sun, days(share));
            sun_altitudes.push(Angle::from_radians(sun));
            let tracks = self.tracks;
            moon.sample(share, moon_over(tracks, days(share)), |share| {
                moon_over(tracks, days(share))
            });
            // Chimneys are narrow: a finer look wherever it could be dark with the subject up.
            let may_be = sun < 0.05 && self.altitude(Which::Subject, days(share)) > -0.15;
            let steps = if may_be { FINER } else { 1 };
            for step in 0..steps {
                let share = (sample as f64 + step as f64 / steps as f64) / (SAMPLES - 1) as f64;
                if share > 1.0 {
                    break;
                }
                let over = self.in_view_by(days(share));
                view.sample(share, over, |share| self.in_view_by(days(share)));
            }
        }
        let spans = |stretches: Stretches| {
            stretches
                .closed()
                .into_iter()
                .map(|(from, to)| Span {
                    from: Tt::from_days(days(from)),
                    to: if to >= 1.0 {
                        span.to
                    } else {
                        Tt::from_days(days(to))
                    },
                })
                .collect()
        };
        let lit = self
            .tracks
            .between(days(0.5))
            .map_or(0.0, |between| between.moon_lit_fraction());
        NightLight {
            span,
            sun_altitudes,
            moon_up: spans(moon),
            moon_lit: lit,
            in_view: spans(view),
        }
    }

    /// True altitude of the centre, radians.
    fn altitude(&self, which: Which, days: f64) -> f64 {
        self.tracks.standing(which, days).altitude().radians()
    }

    /// Not negative when the subject is in view; radians, but only the sign is meant.
    fn in_view_by(&mut self, days: f64) -> f64 {
        /// More than refraction ever lifts.
        const MOST_LIFT: f64 = 0.02;
        let conditions = self.place.conditions;
        let dark = conditions.sun_below.radians() - self.altitude(Which::Sun, days);
        if dark < 0.0 {
            return dark;
        }
        let subject = self.tracks.standing(Which::Subject, days);
        let true_altitude = subject.altitude();
        let over_least = (true_altitude - conditions.least_altitude).radians();
        if over_least < -MOST_LIFT {
            return over_least;
        }
        let skyline = self.cursor.altitude_at(subject.azimuth()) + conditions.clearance;
        let least = skyline.radians().max(conditions.least_altitude.radians());
        let over = true_altitude.radians() - least;
        if !(-MOST_LIFT..0.0).contains(&over) {
            return over;
        }
        apparent_from_true(true_altitude, &self.place.site.air).radians() - least
    }
}

/// The Moon's altitude above that at which it rises and sets, as in [`super::horizon::Threshold::RiseSet`], radians.
fn moon_over(tracks: &SiteTracks, days: f64) -> f64 {
    const LIMB: Angle = Angle::from_degrees(-34.0 / 60.0);
    let moon = tracks.standing(Which::Moon, days);
    let semidiameter = Body::Moon.radius_km() / AU_KM / moon.distance_au;
    moon.altitude().radians() + semidiameter - LIMB.radians()
}

/// Collects the stretches in which a sampled value is not negative.
#[derive(Default)]
struct Stretches {
    found: Vec<(f64, f64)>,
    open: Option<f64>,
    last: Option<(f64, bool)>,
}

impl Stretches {
    fn sample(&mut self, share: f64, value: f64, mut f: impl FnMut(f64) -> f64) {
        let holds = value >= 0.0;
        match self.last {
            None if holds => self.open = Some(share),
            Some((before, held)) if held != holds => {
                // By halves: a wall in the skyline makes the value jump.
                let (mut from, mut to) = (before, share);
                while to - from > TOLERANCE_DAYS {
                    let middle = 0.5 * (from + to);
                    if (f(middle) >= 0.0) == held {
                        from = middle;
                    } else {
                        to = middle;
                    }
                }
                let change = 0.5 * (from + to);
                match self.open.take() {
                    Some(open) => self.found.push((open, change)),
                    None => self.open = Some(change),
                }
            }
            _ => {}
        }
        self.last = Some((share, holds));
    }

    fn closed(mut self) -> Vec<(f64, f64)> {
        if let (Some(open), Some((last, _))) = (self.open, self.last) {
            self.found.push((open, last));
        }
        self.found
    }
}
