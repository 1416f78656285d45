//! From conditions to candidates: every night of a season with its spells, each judged for the purpose and placed on the
//! track, ready for [`super::picks`] and [`super::advice`].
//!
//! A place on the track is the cumulative great-circle length of the geocentric astrometric track from the beginning of the
//! season, backward motion counted, read at the spell's best moment: chords of a day, so a loop comes out a few
//! arcseconds short. The site shifts planets by less than half an arcminute, which no step along the track notices.

use super::conditions::Weekdays;
use super::exposure::DispersingAir;
use super::nights::{LocalClock, Night, nights};
use super::openings::{Closed, Condition, NightRules, Openings, Shortfall};
use super::picks::{Candidate, Mark};
use super::purposes::Purpose;
use super::quality::{Judged, Score, Weights, score};
use super::site_tracks::{NightSpan, SiteTracks};
use super::spells::{End, Outcome, Spell, spells};
use super::types::{Span, Track};
use super::visibility::{Aid, Viewer};
use crate::sky::calendar::{CalendarError, CivilDate};
use crate::sky::place::{Sky, SkyError};
use crate::sky::{Angle, Body, Site, Skyline, Tt};

/// Ends of the band over which the air draws the colours of a disc apart, nanometres: blue and red of the eye.
const BLUE_NM: f64 = 450.0;
const RED_NM: f64 = 650.0;

/// Why the nights of a season could not be worked out.
#[derive(Debug, thiserror::Error)]
pub enum PlannerError {
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error("a night lies beyond the calendar: {0}")]
    Calendar(#[from] CalendarError),
}

/// On which nights the house is open, beside the weekdays of the conditions.
#[derive(Clone, Copy, Debug, Default)]
pub struct House<'a> {
    /// Open although the weekday is not.
    pub open: &'a [CivilDate],
    /// Closed although the weekday is open.
    pub closed: &'a [CivilDate],
}

/// What the nights are worked out from.
#[derive(Clone, Copy)]
pub struct SeasonInput<'a> {
    pub sky: &'a Sky,
    pub site: &'a Site,
    pub skyline: &'a Skyline,
    /// Of the subject, over the season.
    pub track: &'a Track,
    pub span: Span,
    pub rules: &'a NightRules,
    pub clock: &'a LocalClock,
    pub house: House<'a>,
    pub purpose: Purpose,
    /// How long a spell is wanted; `None` for the purpose's usual time.
    pub wanted_minutes: Option<f64>,
}

/// A spell, judged.
#[derive(Clone, Debug, PartialEq)]
pub struct JudgedSpell {
    pub spell: Spell,
    /// Magnitudes by which the subject exceeds the faintest that shows at the best moment; binoculars for Uranus and Neptune.
    pub margin_mag: Option<f64>,
    pub score: Score,
    /// Along the track at the best moment.
    pub track: Angle,
}

/// What a night offers.
#[derive(Clone, Debug, PartialEq)]
pub enum Offer {
    /// At least one spell, in order of time.
    Spells(Vec<JudgedSpell>),
    /// A condition closes it.
    Closed(Closed),
    /// The user has closed it by date.
    HouseClosed,
}

impl Offer {
    /// None where the night is closed.
    #[must_use]
    pub fn spells(&self) -> &[JudgedSpell] {
        match self {
            Offer::Spells(spells) => spells,
            Offer::Closed(_) | Offer::HouseClosed => &[],
        }
    }

    /// Why there is no spell, in words for people; `None` where there is one.
    #[must_use]
    pub fn closed_words(&self) -> Option<String> {
        match self {
            Offer::Spells(_) => None,
            Offer::Closed(closed) => Some(closed.words()),
            Offer::HouseClosed => Some("the house is closed".to_owned()),
        }
    }
}

impl JudgedSpell {
    /// What ends it, in words for people.
    #[must_use]
    pub fn ends_because(&self) -> String {
        self.spell.finish.cause.words(End::Finish)
    }

    /// What begins it, in words for people.
    #[must_use]
    pub fn begins_because(&self) -> String {
        self.spell.start.cause.words(End::Start)
    }
}

/// One night of a season.
#[derive(Clone, Debug, PartialEq)]
pub struct SeasonNight {
    /// Sun, Moon and subject, whatever the conditions.
    pub night: Night,
    pub offer: Offer,
}

impl SeasonNight {
    /// Civil date of its evening.
    #[must_use]
    pub const fn date(&self) -> CivilDate {
        self.night.date
    }
}

/// Every night whose evening lies in a season.
#[derive(Clone, Debug)]
pub struct SeasonNights {
    pub tracks: SiteTracks,
    /// In order.
    pub nights: Vec<SeasonNight>,
    lengths: TrackLengths,
}

/// Names a spell: its night among [`SeasonNights::nights`], and its place in that night.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct SpellId {
    pub night: usize,
    pub spell: usize,
}

impl SeasonNights {
    /// Works them out.
    ///
    /// # Errors
    /// A span that the sky, with half a day more on either side, does not cover.
    pub fn new(input: &SeasonInput) -> Result<Self, PlannerError> {
        let SeasonInput {
            sky, site, clock, ..
        } = *input;
        let tracks = SiteTracks::new(sky, site, input.track.body, input.span)?;
        let mut rules = input.rules.clone();
        let weekdays = rules.conditions.weekdays;
        if !input.house.open.is_empty() {
            // Dates that are open against their weekday need their spells, too.
            rules.conditions.weekdays = Weekdays::ALL;
        }
        let openings = Openings::new(sky, &tracks, &rules, clock)?;
        let outcomes = spells(&tracks, &openings, input.skyline);
        let lengths = TrackLengths::new(input.track);
        let judge = Judge::new(input, &tracks, &lengths, &outcomes);
        let mut found = Vec::with_capacity(outcomes.len());
        let all = nights(&tracks, clock)?
            .into_iter()
            .zip(tracks.night_spans());
        for ((night, span), outcome) in all.zip(outcomes) {
            if !input.span.contains(evening(sky, span)) {
                continue;
            }
            let date = night.date;
            let weekday_is_open =
                weekdays.contains(date.weekday()) || input.house.open.contains(&date);
            let offer = match outcome {
                _ if input.house.closed.contains(&date) => Offer::HouseClosed,
                _ if !weekday_is_open => Offer::Closed(wrong_weekday(&night)),
                Outcome::Closed(closed) => Offer::Closed(closed),
                Outcome::Spells(spells) => Offer::Spells(
                    spells
                        .into_iter()
                        .map(|spell| judge.spell(spell, date))
                        .collect(),
                ),
            };
            found.push(SeasonNight { night, offer });
        }
        Ok(SeasonNights {
            tracks,
            nights: found,
            lengths,
        })
    }

    /// Length along the track up to an instant; 0 before its beginning and the whole length after its end.
    #[must_use]
    pub fn track_at(&self, instant: Tt) -> Angle {
        self.lengths.at(instant)
    }

    /// The night of a date; `None` outside the season.
    #[must_use]
    pub fn night(&self, date: CivilDate) -> Option<&SeasonNight> {
        self.nights.iter().find(|night| night.date() == date)
    }

    /// A spell by its name.
    #[must_use]
    pub fn spell(&self, id: SpellId) -> Option<(&SeasonNight, &JudgedSpell)> {
        let night = self.nights.get(id.night)?;
        Some((night, night.offer.spells().get(id.spell)?))
    }

    /// A mark for a frame: where the subject stood at an instant, or else at the best moment of that night's first spell, or
    /// at the middle of the night.
    #[must_use]
    pub fn mark(&self, date: CivilDate, at: Option<Tt>) -> Option<Mark> {
        let night = self.night(date)?;
        let best = night.offer.spells().first().map(|s| s.spell.best.instant);
        let instant = at.or(best).unwrap_or_else(|| night.night.span.middle());
        Some(Mark {
            night: date,
            track: self.track_at(instant),
        })
    }

    /// Every spell as a candidate, with its name, in order of time.
    #[must_use]
    pub fn candidates(&self) -> (Vec<Candidate>, Vec<SpellId>) {
        let mut candidates = Vec::new();
        let mut ids = Vec::new();
        for (night, season_night) in self.nights.iter().enumerate() {
            for (spell, judged) in season_night.offer.spells().iter().enumerate() {
                candidates.push(Candidate {
                    mark: Mark {
                        night: season_night.date(),
                        track: judged.track,
                    },
                    quality: judged.score.value,
                });
                ids.push(SpellId { night, spell });
            }
        }
        (candidates, ids)
    }
}

fn evening(sky: &Sky, span: &NightSpan) -> Tt {
    sky.tables().tt_from_utc(span.evening)
}

/// All of the night, for want of a measure.
fn wrong_weekday(night: &Night) -> Closed {
    Closed {
        condition: Condition::Weekday,
        shortfall: Shortfall::Whole,
        nearest: None,
        lasting_days: night.span.days(),
        alone: false,
    }
}

/// Cumulative length along a track.
#[derive(Clone, Debug)]
struct TrackLengths {
    /// Instant in days and length in radians, rising.
    knots: Vec<(f64, f64)>,
}

impl TrackLengths {
    fn new(track: &Track) -> Self {
        let mut length = 0.0;
        let mut before = None;
        let knots = track.points.iter().map(|point| {
            if let Some(before) = before.replace(point.direction) {
                length += point.direction.separation(before).radians();
            }
            (point.instant.days(), length)
        });
        TrackLengths {
            knots: knots.collect(),
        }
    }

    fn at(&self, instant: Tt) -> Angle {
        let days = instant.days();
        let after = self.knots.partition_point(|knot| knot.0 <= days);
        let low = after.checked_sub(1).and_then(|k| self.knots.get(k));
        let length = match (low, self.knots.get(after)) {
            (Some(low), Some(high)) => low.1 + (high.1 - low.1) * (days - low.0) / (high.0 - low.0),
            (Some(only), None) | (None, Some(only)) => only.1,
            (None, None) => 0.0,
        };
        Angle::from_radians(length)
    }
}

/// Judges spells by one purpose.
struct Judge<'a> {
    input: &'a SeasonInput<'a>,
    tracks: &'a SiteTracks,
    lengths: &'a TrackLengths,
    largest_diameter: Angle,
    /// For the disc only.
    air: Option<DispersingAir>,
    /// By month, January first.
    viewers: Vec<Viewer>,
    aid: Aid,
}

impl<'a> Judge<'a> {
    fn new(
        input: &'a SeasonInput<'a>,
        tracks: &'a SiteTracks,
        lengths: &'a TrackLengths,
        outcomes: &[Outcome],
    ) -> Self {
        let largest = outcomes
            .iter()
            .flat_map(Outcome::spells)
            .map(|spell| spell.best.diameter.radians())
            .fold(0.0, f64::max);
        let air = &input.site.air;
        Judge {
            input,
            tracks,
            lengths,
            largest_diameter: Angle::from_radians(largest),
            // Water vapour hardly tells blue from red: dry air. A site without air draws nothing apart.
            air: (input.purpose == Purpose::Disc)
                .then(|| DispersingAir::new(air.pressure_hpa, air.temperature_c, 0.0).ok())
                .flatten(),
            viewers: (1..=12)
                .map(|month| Viewer::at(input.site, month))
                .collect(),
            aid: match input.track.body {
                Body::Uranus | Body::Neptune => Aid::BINOCULARS,
                _ => Aid::NakedEye,
            },
        }
    }

    fn spell(&self, spell: Spell, date: CivilDate) -> JudgedSpell {
        let input = self.input;
        let month = usize::from(date.month().saturating_sub(1));
        let margin_mag = self.tracks.at(spell.best.instant).and_then(|local| {
            let viewer = self.viewers.get(month)?;
            viewer.margin(input.site, &local, self.aid)
        });
        let dispersion = self
            .air
            .as_ref()
            .and_then(|air| air.dispersion(BLUE_NM, RED_NM, spell.best.altitude).ok());
        let judged = Judged {
            spell: &spell,
            extinction_mag: input.site.extinction_mag,
            margin_mag,
            largest_diameter: self.largest_diameter,
            dispersion,
            wanted_minutes: input.wanted_minutes,
        };
        let score = score(input.purpose, &judged, &Weights::default());
        JudgedSpell {
            margin_mag,
            score,
            track: self.lengths.at(spell.best.instant),
            spell,
        }
    }
}
