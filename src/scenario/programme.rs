//! A planned season as nights to go out on: the scenario's place, conditions, weather, picks and log put together.

use super::{Plan, ScenarioError};
use crate::season::NightRules;
use crate::season::advice::{Advice, AdviceError, AdviceRequest, Gap, advise};
use crate::season::log::LogError;
use crate::season::nights::LocalClock;
use crate::season::picks::{
    self, Candidate, Mark, Measure, Path, PickError, PickRequest, pick_dates,
};
use crate::season::planner::{
    House, JudgedSpell, PlannerError, SeasonInput, SeasonNight, SeasonNights, SpellId,
};
use crate::season::purposes::Purpose;
use crate::season::visibility::Viewer;
use crate::season::weather::{Chain, Forecast, WeatherError, estimate_odds};
use crate::sky::calendar::{CalendarError, CivilDate, DateTime};
use crate::sky::place::SkyError;
use crate::sky::{Tt, Utc, Vec3};

/// Why dates or advice could not be worked out.
#[derive(Debug, thiserror::Error)]
pub enum ProgrammeError {
    #[error(transparent)]
    Planner(#[from] PlannerError),
    #[error(transparent)]
    Sky(#[from] SkyError),
    #[error(transparent)]
    Scenario(#[from] ScenarioError),
    #[error(transparent)]
    Calendar(#[from] CalendarError),
    #[error(transparent)]
    Weather(#[from] WeatherError),
    #[error(transparent)]
    Log(#[from] LogError),
    #[error(transparent)]
    Pick(#[from] PickError),
    #[error(transparent)]
    Advice(#[from] AdviceError),
    #[error(
        "the path ended with the night of {last}, before {today}; give an earlier --today or a later end of the path"
    )]
    Over { last: CivilDate, today: CivilDate },
    #[error(
        "the path, {from} to {to}, has no night of the season in it; change from and to of the picks"
    )]
    NoNights { from: CivilDate, to: CivilDate },
}

/// The nights of a plan, judged.
pub struct Programme<'a> {
    pub plan: &'a Plan,
    pub season: SeasonNights,
    pub clock: LocalClock,
    candidates: Vec<Candidate>,
    ids: Vec<SpellId>,
}

/// Dates with what they rest on.
pub struct Dates {
    /// Places are those of [`Programme::spell`].
    pub plan: picks::Plan,
    pub chain: Chain,
    /// Nights that had to be in: the user's, and those logged as planned.
    pub kept: Vec<CivilDate>,
}

impl<'a> Programme<'a> {
    /// Works out every night.
    ///
    /// # Errors
    /// Nights that the sky or the calendar does not cover.
    pub fn new(plan: &'a Plan) -> Result<Self, ProgrammeError> {
        let scenario = &plan.scenario;
        let span = plan.season.span;
        let tables = plan.sky.tables();
        let longitude = scenario.site.longitude;
        let utc = |tt: Tt| tables.utc_from_tt(tt);
        let clock = LocalClock::sampled(
            utc(span.from.plus_days(-2.0)),
            utc(span.to.plus_days(2.0)),
            |instant| {
                let local = scenario.zone.local_from_utc(longitude, instant)?;
                Ok::<_, CalendarError>(local.offset_seconds)
            },
        )?;
        let mut rules = NightRules::from(scenario.conditions.clone());
        rules.sun_distance = scenario.sun_distance;
        if scenario.purpose == Purpose::Audience && scenario.subject.is_inner_planet() {
            let middle = DateTime::from_days(utc(span.middle()).days())?.date();
            rules.best_for = Some(Viewer::at(&scenario.site, middle.month()));
        }
        let season = SeasonNights::new(&SeasonInput {
            sky: &plan.sky,
            site: &scenario.site,
            skyline: scenario.skyline.polygon(),
            track: &plan.season.track,
            span,
            rules: &rules,
            clock: &clock,
            house: House {
                open: &scenario.picks.open,
                closed: &scenario.picks.closed,
            },
            purpose: scenario.purpose,
            wanted_minutes: scenario.weather.clear_minutes.map(f64::from),
        })?;
        let (candidates, ids) = season.candidates();
        Ok(Programme {
            plan,
            season,
            clock,
            candidates,
            ids,
        })
    }

    /// The spell behind a candidate of the dates or of the advice.
    #[must_use]
    pub fn spell(&self, candidate: usize) -> Option<(&SeasonNight, &JudgedSpell)> {
        self.season.spell(*self.ids.get(candidate)?)
    }

    /// A candidate by its place.
    #[must_use]
    pub fn candidate(&self, candidate: usize) -> Option<Candidate> {
        self.candidates.get(candidate).copied()
    }

    /// The part of the season that the path covers, from noon of its first night to noon after its last.
    ///
    /// # Errors
    /// No night of the season lies in it.
    pub fn path(&self) -> Result<Path, ProgrammeError> {
        let settings = &self.plan.scenario.picks;
        let to_last = settings.to.map(|to| to.plus_days(-1)).transpose()?;
        let mut on_path = self.season.nights.iter().filter(|night| {
            settings.from.is_none_or(|from| night.date() >= from)
                && to_last.is_none_or(|last| night.date() <= last)
        });
        let first = on_path.next();
        let last = on_path.next_back().or(first);
        let (Some(first), Some(last)) = (first, last) else {
            let named = |date: Option<CivilDate>, night: Option<&SeasonNight>| {
                date.or(night.map(SeasonNight::date))
            };
            let nights = &self.season.nights;
            let from = named(settings.from, nights.first());
            let to = named(settings.to, nights.last());
            let any = CivilDate::new(2000, 1, 1)?;
            return Err(ProgrammeError::NoNights {
                from: from.or(to).unwrap_or(any),
                to: to.or(from).unwrap_or(any),
            });
        };
        Ok(Path {
            start: Mark {
                night: first.date(),
                track: self.season.track_at(first.night.span.from),
            },
            end: Mark {
                night: last.date(),
                track: self.season.track_at(last.night.span.to),
            },
        })
    }

    /// Marks of the log's nights before `today` that count as done by `counts`.
    fn done(
        &self,
        today: CivilDate,
        counts: impl Fn(crate::season::log::Outcome) -> bool,
    ) -> Vec<Mark> {
        let tables = self.plan.sky.tables();
        let entries = self.plan.scenario.log.entries().iter();
        entries
            .filter(|entry| entry.night < today && counts(entry.outcome))
            .filter_map(|entry| {
                let at = entry.at.map(|at| tables.tt_from_utc(at));
                self.season.mark(entry.night, at)
            })
            .collect()
    }

    /// The night to plan from: `today`, the night after it where today's outcome is logged, and never before the path.
    fn first_night(&self, today: CivilDate, path: Path) -> Result<CivilDate, ProgrammeError> {
        let log = &self.plan.scenario.log;
        log.check_today(today)?;
        let first = log.first_open_night(today).max(path.start.night);
        if first > path.end.night {
            return Err(ProgrammeError::Over {
                last: path.end.night,
                today,
            });
        }
        Ok(first)
    }

    fn chain(
        &self,
        first: CivilDate,
        path: Path,
        forecast: Forecast,
    ) -> Result<Chain, ProgrammeError> {
        let scenario = &self.plan.scenario;
        let known = scenario.log.known_skies(first).last().copied();
        Ok(scenario
            .weather
            .chain(first, path.end.night, known, forecast)?)
    }

    /// Chooses dates from `today` on. Nights logged as planned have been announced and are kept.
    ///
    /// # Errors
    /// What cannot be; see [`PickError`].
    pub fn dates(
        &self,
        count: usize,
        measure: Measure,
        today: CivilDate,
    ) -> Result<Dates, ProgrammeError> {
        let scenario = &self.plan.scenario;
        let settings = &scenario.picks;
        let path = self.path()?;
        let first = self.first_night(today, path)?;
        let chain = self.chain(first, path, Forecast::default())?;
        let mut kept = settings.must_have.clone();
        let planned = scenario.log.entries().iter();
        kept.extend(
            planned
                .filter(|entry| entry.outcome == crate::season::log::Outcome::Planned)
                .map(|entry| entry.night),
        );
        kept.retain(|night| *night >= first);
        kept.sort();
        kept.dedup();
        let frames = self.done(first, crate::season::log::Outcome::fills_section);
        let request = PickRequest {
            candidates: &self.candidates,
            path,
            frames: &frames,
            count,
            measure,
            must_have: &kept,
            reserve_rule: settings.reserve_rule,
            reserves: settings.reserves,
            evenness: settings.evenness,
            fill: PickRequest::DEFAULT_FILL,
        };
        let plan = pick_dates(&request, &chain)?;
        Ok(Dates { plan, chain, kept })
    }

    /// Whether to go out tonight, and the rule to follow.
    ///
    /// # Errors
    /// What cannot be; see [`AdviceError`].
    pub fn advice(
        &self,
        outings: usize,
        gap: Gap,
        today: CivilDate,
        forecast: Forecast,
        weather_always_seen: bool,
    ) -> Result<(Advice, Chain), ProgrammeError> {
        let path = self.path()?;
        let first = self.first_night(today, path)?;
        let chain = self.chain(first, path, forecast)?;
        let frames = self.done(first, crate::season::log::Outcome::gives_frame);
        let request = AdviceRequest {
            candidates: &self.candidates,
            path,
            frames: &frames,
            outings,
            gap,
            weather_always_seen,
        };
        Ok((advise(&request, &chain)?, chain))
    }

    /// On what every chance rests, and what the log says about the odds, as sentences.
    ///
    /// # Errors
    /// A night at the very ends of the calendar.
    pub fn odds_words(&self, chain: &Chain) -> Result<Vec<String>, ProgrammeError> {
        let scenario = &self.plan.scenario;
        let seen = scenario.log.known_skies(chain.today());
        let estimate = estimate_odds(&scenario.weather.monthly_odds(), &seen)?;
        Ok(estimate
            .map(|estimate| estimate.words())
            .into_iter()
            .chain(chain.clamped_words())
            .collect())
    }

    /// Astrometric direction of the subject from the site, on ICRS axes.
    ///
    /// # Errors
    /// An instant that the sky does not cover.
    pub fn direction(&self, instant: Tt) -> Result<Vec3, ProgrammeError> {
        let scenario = &self.plan.scenario;
        let vantage = self.plan.sky.observer(&scenario.site, instant)?;
        Ok(vantage.place(scenario.subject)?.direction)
    }

    /// The civil date on which the night of an instant began: the night lasts from local mean noon to the next.
    ///
    /// # Errors
    /// Beyond the calendar.
    pub fn night_of(&self, instant: Utc) -> Result<CivilDate, ProgrammeError> {
        let shift = self.plan.scenario.site.longitude.signed().degrees() / 360.0;
        Ok(DateTime::from_days(instant.days() + shift - 0.5)?.date())
    }
}
