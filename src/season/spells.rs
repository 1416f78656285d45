//! Spells: the stretches of a night in which the subject meets every condition, with what begins and ends each, its best
//! moment, and, for a night without one, which condition is missed, by how much and for how long.
//!
//! ```text
//! SiteTracks (site, subject, span)  ->  Openings (conditions, clock)  ->  spells (skyline)
//! ```
//! Each step is kept by its caller; only the last is done again when the skyline changes. Altitudes of the subject are
//! apparent, of the Sun true. Edges are good to 0.1 s of the model; what the air and a measured skyline add stands beside
//! each edge.

use super::openings::{
    Cause, Closed, Condition, NightRules, Openings, Shortfall, least_within, moon_separation,
};
use super::search::minimum;
use super::site_tracks::{LocalSky, SiteTracks, Which};
use super::skyline_scan::{Point, SkylineScan, point};
use super::spans::{Stretch, TOLERANCE_DAYS, between_changes, total_days};
use super::types::Span;
use crate::sky::physical::semidiameter;
use crate::sky::refraction::{apparent_from_true, horizon_dip, true_from_apparent};
use crate::sky::time::SECONDS_PER_DAY;
use crate::sky::{Angle, Body, Caution, Cautions, Skyline, Tt};

/// What begins or ends a spell.
#[derive(Clone, Debug, PartialEq)]
pub enum EdgeCause {
    /// Local mean noon: the night ends and the next begins.
    NightLimit,
    /// The Sun's centre passes its allowed altitude.
    SunAltitude { limit: Angle },
    /// The wait after the Sun has gone below the true horizon, or before it returns.
    SunDown { minutes: f64 },
    /// The subject passes its least altitude.
    LeastAltitude { limit: Angle },
    /// The subject passes the skyline.
    Skyline {
        part: Option<String>,
        azimuth: Angle,
    },
    /// The Moon rises or sets.
    MoonHorizon { separation: Angle },
    /// The Moon passes its least distance.
    MoonDistance { separation: Angle },
    /// The Moon passes the lit fraction that is allowed near the subject.
    MoonLit { lit_fraction: f64 },
    /// The Moon's limb passes the subject.
    Occultation,
    /// The allowed hours begin or end.
    Hours,
    /// The night is not on an allowed weekday.
    Weekday,
}

/// Which end of a spell.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    Start,
    Finish,
}

impl EdgeCause {
    /// In words for people, without the time.
    #[must_use]
    pub fn words(&self, end: End) -> String {
        let start = end == End::Start;
        let choose = |opens: &str, closes: &str| {
            if start {
                opens.to_owned()
            } else {
                closes.to_owned()
            }
        };
        match self {
            EdgeCause::NightLimit => choose("start of night", "end of night"),
            EdgeCause::SunAltitude { limit } => {
                let named = [
                    (-6.0, "civil twilight"),
                    (-12.0, "nautical twilight"),
                    (-18.0, "astronomical twilight"),
                ];
                let is_limit =
                    |(degrees, _): &(f64, &str)| (limit.degrees() - degrees).abs() < 0.01;
                let Some((_, twilight)) = named.into_iter().find(is_limit) else {
                    let side = if *limit < Angle::ZERO { "down" } else { "up" };
                    return format!("Sun {} deg {side}", degrees_text(limit.abs()));
                };
                if start {
                    format!("end of {twilight}")
                } else {
                    twilight.to_owned()
                }
            }
            EdgeCause::SunDown { minutes } => {
                let side = choose("after sunset", "before sunrise");
                format!("{minutes:.0} min {side}")
            }
            EdgeCause::LeastAltitude { limit } => {
                let side = choose("rises above", "sinks below");
                format!("{side} {} deg", degrees_text(*limit))
            }
            EdgeCause::Skyline { part, azimuth } => {
                // Never "az 360".
                let azimuth = azimuth.degrees().round() % 360.0;
                match part {
                    Some(part) if start => format!("comes out from behind {part}, az {azimuth:.0}"),
                    Some(part) => format!("goes behind {part}, az {azimuth:.0}"),
                    None if start => format!("clears the skyline, az {azimuth:.0}"),
                    None => format!("meets the skyline, az {azimuth:.0}"),
                }
            }
            EdgeCause::MoonHorizon { separation } => {
                let event = choose("Moon sets", "Moon rises");
                format!("{event}, {:.0} deg away", separation.degrees())
            }
            EdgeCause::MoonDistance { separation } => {
                format!("Moon {:.0} deg away", separation.degrees())
            }
            EdgeCause::MoonLit { lit_fraction } => {
                let side = choose("down to", "up to");
                format!("Moon {side} {:.0} % lit", lit_fraction * 100.0)
            }
            EdgeCause::Occultation => {
                choose("comes out from behind the Moon", "goes behind the Moon")
            }
            EdgeCause::Hours => choose("hours begin", "hours end"),
            EdgeCause::Weekday => choose("weekday begins", "weekday ends"),
        }
    }
}

/// A limit as the user set it: whole where it is, else to a tenth.
fn degrees_text(limit: Angle) -> String {
    let tenths = (limit.degrees() * 10.0).round();
    if tenths % 10.0 == 0.0 {
        format!("{:.0}", tenths / 10.0)
    } else {
        format!("{:.1}", tenths / 10.0)
    }
}

/// One end of a spell.
#[derive(Clone, Debug, PartialEq)]
pub struct Edge {
    pub instant: Tt,
    pub cause: EdgeCause,
    /// What a wrong skyline and the air near the horizon make of the time, minutes either way (12 h at most); 0 for causes
    /// that depend on neither.
    pub uncertainty_minutes: f64,
}

/// Why the best moment is best.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum BestBecause {
    /// Highest, and on both sides it sinks.
    Culminates,
    /// It sinks all the while: as early as can be.
    SinksFromStart,
    /// It climbs all the while: as late as can be.
    ClimbsToEnd,
    /// It stands out most from the sky, though it may not be highest.
    StandsOutMost,
}

impl BestBecause {
    /// In words for people.
    #[must_use]
    pub const fn words(self) -> &'static str {
        match self {
            BestBecause::Culminates => "highest",
            BestBecause::SinksFromStart => "at once: it sinks all the while",
            BestBecause::ClimbsToEnd => "at the end: it climbs all the while",
            BestBecause::StandsOutMost => "stands out most from the sky",
        }
    }
}

/// The sky at the best moment of a spell.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct BestMoment {
    pub instant: Tt,
    pub because: BestBecause,
    /// Apparent.
    pub altitude: Angle,
    pub azimuth: Angle,
    /// Apparent altitude of the skyline below (or above) it.
    pub skyline: Angle,
    /// True, of the centre.
    pub sun_altitude: Angle,
    /// True, of the centre.
    pub moon_altitude: Angle,
    pub moon_separation: Angle,
    /// 0 to 1.
    pub moon_lit_fraction: f64,
    /// V outside the air, without the rotation and season terms of Mars.
    pub magnitude: f64,
    /// Equatorial.
    pub diameter: Angle,
}

/// A stretch of one night in which the subject meets every condition.
#[derive(Clone, Debug, PartialEq)]
pub struct Spell {
    pub start: Edge,
    pub finish: Edge,
    pub best: BestMoment,
    pub cautions: Cautions,
}

impl Spell {
    #[must_use]
    pub fn span(&self) -> Span {
        Span {
            from: self.start.instant,
            to: self.finish.instant,
        }
    }

    #[must_use]
    pub fn minutes(&self) -> f64 {
        self.span().days() * SECONDS_PER_DAY / 60.0
    }
}

/// What a night offers.
#[derive(Clone, Debug, PartialEq)]
pub enum Outcome {
    /// At least one spell, in order of time.
    Spells(Vec<Spell>),
    Closed(Closed),
}

impl Outcome {
    /// The spells; none where the night is closed.
    #[must_use]
    pub fn spells(&self) -> &[Spell] {
        match self {
            Outcome::Spells(spells) => spells,
            Outcome::Closed(_) => &[],
        }
    }
}

impl Closed {
    /// Which condition is missed, by how much and for how long, in words for people.
    #[must_use]
    pub fn words(&self) -> String {
        let what = match (self.condition, self.shortfall) {
            (Condition::Weekday, _) => return "not an open weekday".to_owned(),
            (Condition::Moon, Shortfall::Angle(by)) => {
                format!("Moon {:.1} deg too near", by.degrees())
            }
            (Condition::LeastAltitude, Shortfall::Angle(by)) => {
                format!("{:.1} deg too low", by.degrees())
            }
            (Condition::SunAltitude, Shortfall::Angle(by)) => {
                format!("Sun {:.1} deg too high", by.degrees())
            }
            (Condition::Skyline, Shortfall::Angle(by)) => {
                format!("{:.1} deg behind the skyline", by.degrees())
            }
            (Condition::Hours, Shortfall::Minutes(by)) => {
                format!("{by:.0} min outside the hours")
            }
            (Condition::SunDown, Shortfall::Minutes(by)) => {
                format!("{by:.0} min too near the Sun's rising or setting")
            }
            (Condition::Moon, _) => "Moon too near".to_owned(),
            (Condition::Occultation, _) => "behind the Moon".to_owned(),
            (Condition::LeastAltitude, _) => "too low".to_owned(),
            (Condition::Hours, _) => "outside the hours".to_owned(),
            (Condition::SunAltitude, _) => "not dark enough".to_owned(),
            (Condition::SunDown, _) => "the Sun is up".to_owned(),
            (Condition::Skyline, _) => "behind the skyline".to_owned(),
        };
        let minutes = (self.lasting_days * SECONDS_PER_DAY / 60.0).round();
        if minutes < 90.0 {
            format!("{what} at best, for {minutes:.0} min")
        } else {
            format!("{what} at best, for {:.1} h", minutes / 60.0)
        }
    }
}

/// What every night of the tracks offers over a skyline, in the order of [`SiteTracks::night_spans`].
#[must_use]
pub fn spells(tracks: &SiteTracks, openings: &Openings, skyline: &Skyline) -> Vec<Outcome> {
    let rules = &openings.rules;
    let scan = SkylineScan::new(tracks, skyline, rules.conditions.clearance);
    let maker = SpellMaker {
        tracks,
        skyline,
        rules,
        scan: &scan,
    };
    openings
        .nights
        .iter()
        .map(|night| {
            let windows = match night {
                Err(closed) => return Outcome::Closed(*closed),
                Ok(range) => openings.windows.get(range.clone()).unwrap_or_default(),
            };
            let mut spells = Vec::new();
            for window in windows {
                let points = openings
                    .points
                    .get(window.points.clone())
                    .unwrap_or_default();
                for stretch in maker.clear(&window.stretch, points) {
                    spells.push(maker.spell(&stretch, points));
                }
            }
            if spells.is_empty() {
                Outcome::Closed(maker.behind_skyline(windows.iter().map(|w| w.stretch)))
            } else {
                Outcome::Spells(spells)
            }
        })
        .collect()
}

struct SpellMaker<'a> {
    tracks: &'a SiteTracks,
    skyline: &'a Skyline,
    rules: &'a NightRules,
    scan: &'a SkylineScan<'a>,
}

impl SpellMaker<'_> {
    /// The stretches of a window in which the subject is clear of the skyline.
    fn clear(&self, window: &Stretch<Cause>, points: &[Point]) -> Vec<Stretch<Cause>> {
        let changes = self.scan.changes(points);
        let first = points
            .first()
            .is_some_and(|point| self.scan.margin(point) >= 0.0);
        let cause = Cause::Is(Condition::Skyline);
        let mut clear = between_changes(window.from, window.to, first, &changes, cause);
        if first && let Some(stretch) = clear.first_mut() {
            stretch.opens = window.opens;
        }
        if let Some(stretch) = clear.last_mut()
            && stretch.to >= window.to
        {
            stretch.closes = window.closes;
        }
        clear
    }

    fn spell(&self, stretch: &Stretch<Cause>, points: &[Point]) -> Spell {
        let best = self.best(stretch, points);
        Spell {
            start: self.edge(stretch.from, stretch.opens, stretch.days(), End::Start),
            finish: self.edge(stretch.to, stretch.closes, stretch.days(), End::Finish),
            best,
            cautions: self.cautions(stretch),
        }
    }

    /// Where an inner planet stands out most in a stretch, for an eye; else the subject's highest point.
    fn best(&self, stretch: &Stretch<Cause>, points: &[Point]) -> BestMoment {
        if let Some(viewer) = &self.rules.best_for
            && self.tracks.subject().is_inner_planet()
        {
            let span = Span {
                from: Tt::from_days(stretch.from),
                to: Tt::from_days(stretch.to),
            };
            if let Some((at, _)) = viewer.best_within(self.tracks, span) {
                return self.moment(at.days(), BestBecause::StandsOutMost);
            }
        }
        let height = |days: f64| self.tracks.standing(Which::Subject, days).direction.z;
        let mut best = (stretch.from, height(stretch.from));
        let mut because = BestBecause::SinksFromStart;
        let end = (stretch.to, height(stretch.to));
        if end.1 > best.1 {
            best = end;
            because = BestBecause::ClimbsToEnd;
        }
        let inside = points
            .iter()
            .filter(|point| stretch.from < point.days && point.days < stretch.to);
        let highest = inside
            .map(|point| (point.days, libm::sin(point.true_altitude)))
            .reduce(|a, b| if b.1 > a.1 { b } else { a });
        // A culmination between two samples, or between a sample and an end.
        let middle = highest.unwrap_or_else(|| {
            let days = 0.5 * (stretch.from + stretch.to);
            (days, height(days))
        });
        let step = super::site_tracks::SAMPLE_STEP;
        let low = (middle.0 - step).max(stretch.from);
        let high = (middle.0 + step).min(stretch.to);
        let Ok((at, depth)) = minimum(low, (middle.0, -middle.1), high, 1e-5, |days| {
            Ok::<_, std::convert::Infallible>(-height(days))
        });
        // Within three seconds of an end it is the end.
        let off_ends = at - stretch.from > 4e-5 && stretch.to - at > 4e-5;
        if -depth > best.1 && off_ends {
            best = (at, -depth);
            because = BestBecause::Culminates;
        }
        self.moment(best.0, because)
    }

    fn moment(&self, days: f64, because: BestBecause) -> BestMoment {
        let instant = Tt::from_days(days);
        let air = &self.tracks.site().air;
        let Some(LocalSky {
            subject,
            moon,
            sun,
            moon_lit_fraction,
            magnitude,
            diameter,
            ..
        }) = self.tracks.at(instant)
        else {
            // Spells lie within the tracks.
            return BestMoment {
                instant,
                because,
                altitude: Angle::ZERO,
                azimuth: Angle::ZERO,
                skyline: Angle::ZERO,
                sun_altitude: Angle::ZERO,
                moon_altitude: Angle::ZERO,
                moon_separation: Angle::ZERO,
                moon_lit_fraction: 0.0,
                magnitude: 0.0,
                diameter: Angle::ZERO,
            };
        };
        BestMoment {
            instant,
            because,
            altitude: apparent_from_true(subject.altitude(), air),
            azimuth: subject.azimuth(),
            skyline: self.skyline.altitude_at(subject.azimuth()),
            sun_altitude: sun.altitude(),
            moon_altitude: moon.altitude(),
            moon_separation: subject.separation(&moon),
            moon_lit_fraction,
            magnitude,
            diameter,
        }
    }

    fn edge(&self, days: f64, cause: Cause, spell_days: f64, end: End) -> Edge {
        let conditions = &self.rules.conditions;
        let tracks = self.tracks;
        let cause_of = |condition: Condition| match condition {
            Condition::Weekday => EdgeCause::Weekday,
            Condition::Moon => EdgeCause::MoonDistance {
                separation: moon_separation(tracks, days),
            },
            Condition::Occultation => EdgeCause::Occultation,
            Condition::LeastAltitude => EdgeCause::LeastAltitude {
                limit: conditions.least_altitude,
            },
            Condition::Hours => EdgeCause::Hours,
            Condition::SunAltitude => EdgeCause::SunAltitude {
                limit: conditions.sun_below,
            },
            Condition::SunDown => {
                let (after, before) = self.rules.sun_down.minutes().unwrap_or((0.0, 0.0));
                EdgeCause::SunDown {
                    minutes: if end == End::Start { after } else { before },
                }
            }
            Condition::Skyline => {
                // On the blocked side, so that it is the wall that is named and not what stands before it.
                let off = 4.0 * TOLERANCE_DAYS;
                let outside = days + if end == End::Start { -off } else { off };
                EdgeCause::Skyline {
                    part: self.scan.part_name(outside).map(str::to_owned),
                    azimuth: tracks.standing(Which::Subject, days).azimuth(),
                }
            }
        };
        let cause = match cause {
            Cause::Night => EdgeCause::NightLimit,
            Cause::Is(condition) => cause_of(condition),
            Cause::MoonHorizon => EdgeCause::MoonHorizon {
                separation: moon_separation(tracks, days),
            },
            Cause::MoonDistance => cause_of(Condition::Moon),
            Cause::MoonLit => EdgeCause::MoonLit {
                lit_fraction: conditions.moon.map_or(0.0, |moon| moon.unless_lit_below),
            },
        };
        Edge {
            instant: Tt::from_days(days),
            uncertainty_minutes: self.uncertainty_minutes(days, &cause, spell_days, end),
            cause,
        }
    }

    /// How long the subject takes over the error in height.
    fn uncertainty_minutes(&self, days: f64, cause: &EdgeCause, spell_days: f64, end: End) -> f64 {
        const MOST_MINUTES: f64 = 720.0;
        let here = point(self.tracks, days);
        let refraction = (here.apparent_altitude - here.true_altitude).abs();
        let air = refraction * REFRACTION_SCATTER;
        let error = match cause {
            EdgeCause::Skyline { .. } => {
                let skyline = self.rules.skyline_error.radians();
                (skyline * skyline + air * air).sqrt()
            }
            EdgeCause::LeastAltitude { .. } => air,
            _ => return 0.0,
        };
        // Inwards, over no more than half a minute and no more than the spell.
        let reach = (30.0 / SECONDS_PER_DAY).min(spell_days).max(TOLERANCE_DAYS);
        let into = if end == End::Start { reach } else { -reach };
        let rate = match cause {
            EdgeCause::Skyline { .. } => self.scan.departure(days, into),
            _ => {
                let there = point(self.tracks, days + into);
                (there.apparent_altitude - here.apparent_altitude).abs() / reach
            }
        };
        // A subject that grazes its limit gathers speed by the turning of the sky: error = rate t + 1/2 bend t^2.
        let latitude = self.tracks.site().latitude.cos();
        let bend = (40.0 * latitude.abs() * libm::cos(here.true_altitude)).max(1e-3);
        let time = (-rate + (rate * rate + 2.0 * bend * error).sqrt()) / bend;
        (time * SECONDS_PER_DAY / 60.0).min(MOST_MINUTES)
    }

    /// Whether the Sun is up and near at any time of the stretch, looked at every two minutes and at its ends.
    fn cautions(&self, stretch: &Stretch<Cause>) -> Cautions {
        const STEPS_PER_DAY: f64 = 720.0;
        let sound = self.tracks.cautions();
        if self.rules.sun_down.minutes().is_some() {
            return sound;
        }
        let site = self.tracks.site();
        let horizon = true_from_apparent(-horizon_dip(site.height_above_surroundings_m), &site.air);
        let near = |days: f64| {
            let sun = self.tracks.standing(Which::Sun, days);
            let limb = sun.altitude() + semidiameter(Body::Sun, sun.distance_au);
            let subject = self.tracks.standing(Which::Subject, days);
            limb >= horizon && subject.separation(&sun) < self.rules.sun_distance
        };
        let steps = (stretch.days() * STEPS_PER_DAY).ceil().max(1.0) as usize;
        let any = (0..=steps)
            .map(|k| stretch.from + stretch.days() * k as f64 / steps as f64)
            .any(near);
        sound.with_if(any, Caution::SunNear)
    }

    fn behind_skyline(&self, windows: impl Iterator<Item = Stretch<Cause>>) -> Closed {
        let windows: Vec<Stretch<Cause>> = windows.collect();
        let missing = |days: f64| Some(-self.scan.margin(&point(self.tracks, days)));
        let (nearest, least) = least_within(&windows, missing);
        Closed {
            condition: Condition::Skyline,
            shortfall: least.map_or(Shortfall::Whole, |by| {
                Shortfall::Angle(Angle::from_radians(by))
            }),
            nearest: nearest.map(Tt::from_days),
            lasting_days: total_days(&windows),
            alone: true,
        }
    }
}

/// Refraction at the horizon scatters by about a sixth of an arc degree in half a degree (Schaefer and Liller 1990, *PASP*
/// 102, 796: 0.16 degrees, from memory); taken as the same share of it higher up.
const REFRACTION_SCATTER: f64 = 0.3;
