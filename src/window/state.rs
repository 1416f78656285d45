//! What the window knows, in three kinds: the document (saved, with undo), the view (what is looked at, and how), and
//! what a view keeps for itself while a pointer is down or a field is being typed in. One [`Action`] for everything that
//! a user may ask, one [`State::apply`] that carries it out.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::first_look::first_look;
use crate::chart::StripWindow;
use crate::scenario::{Plan, Scenario, Theme};
use crate::season::hold::{Anchor, Hold, HoldError, Missed, Step, Stepped, Stepper};
use crate::season::{Event, EventKind, Span};
use crate::sky::{Tt, Utc};

/// Text scales on offer.
pub const TEXT_SCALES: [f32; 4] = [0.85, 1.0, 1.2, 1.5];
/// Steps a second on offer for playing.
pub const SPEEDS: [f64; 6] = [1.0, 2.0, 5.0, 10.0, 20.0, 40.0];
/// Snapshots kept for undo.
const MOST_UNDO: usize = 200;

/// What a user may ask for.
#[derive(Clone, Debug, PartialEq)]
pub enum Action {
    /// Look at exactly this instant.
    GoTo(Tt),
    /// Look at the day of this instant, what is held staying as it is.
    GoToDay(Tt),
    /// So many steps on, back where negative.
    Step(i32),
    NextEvent,
    PreviousEvent,
    SeasonStart,
    SeasonEnd,
    SetHold(Hold),
    SetStep(Step),
    Play(bool),
    /// Faster or slower by so many places of [`SPEEDS`].
    Speed(i32),
    /// The piece of sky on the strip; `None` for the whole season.
    ShowSky(Option<StripWindow>),
    TurnRound,
    ShowSkyline(bool),
    /// The nights on the timeline, counted from the first; `None` for the whole season.
    ShowNights(Option<(f64, f64)>),
    SetTheme(Theme),
    /// Larger or smaller text by so many places of [`TEXT_SCALES`].
    TextScale(i32),
    ShowPanel(Panel),
    /// A changed document.
    Edit(Arc<Scenario>),
    Undo,
    Redo,
    Open(PathBuf),
    Save(PathBuf),
    /// Give up changes that are not saved, and then do what was asked before.
    Discard,
    /// Go on with the document, whatever was asked before.
    Stay,
    CopyReadings,
    Close,
}

/// What stands open beside the three views.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Panel {
    #[default]
    None,
    Season,
    Open,
    Save,
    Keys,
}

/// What the window has to do that is not a change of state.
#[derive(Clone, Debug, PartialEq)]
pub enum Effect {
    CopyReadings,
    Close,
}

/// A sentence for the user, until the next one.
#[derive(Clone, Debug, PartialEq)]
pub struct Notice {
    pub text: String,
    /// Something went wrong.
    pub is_error: bool,
}

/// The scenario with its past.
#[derive(Debug)]
pub struct Document {
    pub scenario: Arc<Scenario>,
    /// Where it was read from or saved to.
    pub path: Option<PathBuf>,
    saved: Arc<Scenario>,
    undo: Vec<Arc<Scenario>>,
    redo: Vec<Arc<Scenario>>,
}

impl Document {
    #[must_use]
    pub fn new(scenario: Arc<Scenario>, path: Option<PathBuf>) -> Self {
        Document {
            saved: Arc::clone(&scenario),
            scenario,
            path,
            undo: Vec::new(),
            redo: Vec::new(),
        }
    }

    /// Whether it differs from what stands in the file.
    #[must_use]
    pub fn is_changed(&self) -> bool {
        self.scenario != self.saved
    }

    #[must_use]
    pub fn can_undo(&self) -> bool {
        !self.undo.is_empty()
    }

    #[must_use]
    pub fn can_redo(&self) -> bool {
        !self.redo.is_empty()
    }

    fn edit(&mut self, next: Arc<Scenario>) {
        if next == self.scenario {
            return;
        }
        self.undo.push(std::mem::replace(&mut self.scenario, next));
        if self.undo.len() > MOST_UNDO {
            self.undo.remove(0);
        }
        self.redo.clear();
    }

    fn go_back(&mut self) {
        if let Some(before) = self.undo.pop() {
            self.redo
                .push(std::mem::replace(&mut self.scenario, before));
        }
    }

    fn go_forward(&mut self) {
        if let Some(after) = self.redo.pop() {
            self.undo.push(std::mem::replace(&mut self.scenario, after));
        }
    }
}

/// What is looked at, and how. Theme and turning begin as the document has them and go into it when it is saved; changing
/// them leaves nothing unsaved.
#[derive(Clone, Debug)]
pub struct View {
    pub instant: Tt,
    pub hold: Hold,
    pub step: Step,
    pub playing: bool,
    /// A place in [`SPEEDS`].
    speed: usize,
    pub sky: Option<StripWindow>,
    pub turned: bool,
    pub skyline: bool,
    /// The nights on the timeline, counted from the first.
    pub nights: Option<(f64, f64)>,
    pub theme: Theme,
    /// A place in [`TEXT_SCALES`].
    text_scale: usize,
    pub panel: Panel,
    /// Days are counted from here while only days are stepped.
    anchor: Option<Anchor>,
    days: i32,
    /// What the last step could not keep.
    pub missed: Option<Missed>,
    /// The plan to come decides where to look first.
    is_new: bool,
}

impl View {
    fn of(scenario: &Scenario) -> Self {
        View {
            instant: Tt::from_days(0.0),
            hold: Hold::Clock,
            step: Step::Days(1),
            playing: false,
            speed: 3,
            sky: None,
            turned: scenario.view.turned,
            skyline: true,
            nights: None,
            theme: scenario.view.theme,
            text_scale: 1,
            panel: Panel::None,
            anchor: None,
            days: 0,
            missed: None,
            is_new: true,
        }
    }

    #[must_use]
    pub fn text_scale(&self) -> f32 {
        TEXT_SCALES.get(self.text_scale).copied().unwrap_or(1.0)
    }

    #[must_use]
    pub fn steps_a_second(&self) -> f64 {
        SPEEDS.get(self.speed).copied().unwrap_or(1.0)
    }
}

/// Everything but pictures and threads.
pub struct State {
    pub document: Document,
    pub view: View,
    /// The season on screen; it may be older than the document while the next one is being planned.
    pub plan: Option<Arc<Plan>>,
    pub notice: Option<Notice>,
    /// Waits until changes are saved or given up.
    pub waiting: Option<Box<Action>>,
}

/// The clock at the site, for stepping.
fn with_stepper<T>(plan: &Plan, work: impl FnOnce(&Stepper<'_>) -> T) -> T {
    let scenario = &plan.scenario;
    let zone_offset = |utc: Utc| {
        let local = scenario
            .zone
            .local_from_utc(scenario.site.longitude, utc)
            .ok()?;
        Some(f64::from(local.offset_seconds))
    };
    work(&Stepper {
        sky: &plan.sky,
        site: &scenario.site,
        zone_offset: &zone_offset,
    })
}

/// Events that the timeline marks and that can be jumped to.
#[must_use]
pub fn is_marked(event: &Event) -> bool {
    !matches!(
        event.kind,
        EventKind::RaStationRetrograde
            | EventKind::RaStationDirect
            | EventKind::ClosestApproachLightTime
            | EventKind::Perihelion
    )
}

impl State {
    #[must_use]
    pub fn new(scenario: Scenario, path: Option<PathBuf>) -> Self {
        let scenario = Arc::new(scenario);
        State {
            view: View::of(&scenario),
            document: Document::new(scenario, path),
            plan: None,
            notice: None,
            waiting: None,
        }
    }

    /// Carries out what was asked.
    pub fn apply(&mut self, action: Action) -> Option<Effect> {
        // What would lose changes waits for a word about them.
        if matches!(action, Action::Open(_) | Action::Close) && self.document.is_changed() {
            self.waiting = Some(Box::new(action));
            return None;
        }
        self.notice = None;
        match action {
            Action::GoTo(instant) => self.go_to(instant),
            Action::GoToDay(instant) => self.go_to_day(instant),
            Action::Step(count) => self.step(count),
            Action::NextEvent => self.go_to_event(|now, event| event > now, false),
            Action::PreviousEvent => self.go_to_event(|now, event| event < now, true),
            Action::SeasonStart => self.go_to_season(|span| span.from),
            Action::SeasonEnd => self.go_to_season(|span| span.to),
            Action::SetHold(hold) => {
                self.view.hold = hold;
                self.view.anchor = None;
                self.view.missed = None;
            }
            Action::SetStep(step) => self.view.step = step,
            Action::Play(playing) => self.view.playing = playing && self.plan.is_some(),
            Action::Speed(places) => self.view.speed = moved(self.view.speed, places, SPEEDS.len()),
            Action::ShowSky(window) => self.view.sky = window,
            Action::TurnRound => self.view.turned = !self.view.turned,
            Action::ShowSkyline(shown) => self.view.skyline = shown,
            Action::ShowNights(nights) => self.view.nights = nights,
            Action::SetTheme(theme) => self.view.theme = theme,
            Action::TextScale(places) => {
                self.view.text_scale = moved(self.view.text_scale, places, TEXT_SCALES.len());
            }
            Action::ShowPanel(panel) => self.view.panel = panel,
            Action::Edit(scenario) => self.document.edit(scenario),
            Action::Undo => self.document.go_back(),
            Action::Redo => self.document.go_forward(),
            Action::Open(path) => self.open(&path),
            Action::Save(path) => {
                if self.save(path)
                    && let Some(action) = self.waiting.take()
                {
                    return self.apply(*action);
                }
            }
            Action::Discard => {
                self.document.saved = Arc::clone(&self.document.scenario);
                if let Some(action) = self.waiting.take() {
                    return self.apply(*action);
                }
            }
            Action::Stay => self.waiting = None,
            Action::CopyReadings => return Some(Effect::CopyReadings),
            Action::Close => return Some(Effect::Close),
        }
        None
    }

    /// Puts a season on screen.
    pub fn take_plan(&mut self, plan: Arc<Plan>) {
        let is_other_subject = self
            .plan
            .as_ref()
            .is_some_and(|old| old.season.subject != plan.season.subject);
        if self.view.is_new || is_other_subject || !plan.season.span.contains(self.view.instant) {
            self.view.instant = first_look(&plan);
            self.view.sky = None;
        }
        self.view.is_new = false;
        self.view.nights = None;
        self.view.anchor = None;
        self.view.missed = None;
        self.plan = Some(plan);
    }

    pub fn say(&mut self, text: impl Into<String>) {
        self.notice = Some(Notice {
            text: text.into(),
            is_error: false,
        });
    }

    pub fn complain(&mut self, text: impl Into<String>) {
        self.notice = Some(Notice {
            text: text.into(),
            is_error: true,
        });
    }

    /// The season's span, its last instant included, which is where tracks end.
    fn clamped(&self, instant: Tt) -> Tt {
        match &self.plan {
            Some(plan) => {
                let span = plan.season.span;
                Tt::from_days(instant.days().clamp(span.from.days(), span.to.days()))
            }
            None => instant,
        }
    }

    fn go_to(&mut self, instant: Tt) {
        if instant.days().is_finite() {
            self.view.instant = self.clamped(instant);
            self.view.anchor = None;
            self.view.missed = None;
        }
    }

    /// Counts days from what is held.
    fn go_to_day(&mut self, instant: Tt) {
        let days = (instant.days() - self.view.instant.days()).round();
        if days.abs() < 1e6 {
            self.days_on(days as i32);
        }
    }

    fn step(&mut self, count: i32) {
        match self.view.step {
            Step::Elapsed(seconds) => {
                let there = self.view.instant.plus_seconds(seconds * f64::from(count));
                let stays = self.clamped(there) == self.view.instant;
                self.go_to(there);
                self.view.playing &= !stays;
            }
            Step::Days(days) => {
                let days = i32::try_from(days).unwrap_or(i32::MAX);
                self.days_on(count.saturating_mul(days));
            }
        }
    }

    fn days_on(&mut self, days: i32) {
        let Some(plan) = self.plan.clone() else {
            return;
        };
        let (hold, instant) = (self.view.hold, self.view.instant);
        let total = self.view.days.saturating_add(days);
        let anchored = self.view.anchor.filter(|anchor| anchor.hold() == hold);
        let result = with_stepper(
            &plan,
            |stepper| -> Result<(Anchor, i32, Stepped), HoldError> {
                let (anchor, total) = match anchored {
                    Some(anchor) => (anchor, total),
                    None => (Anchor::new(stepper, instant, hold)?, days),
                };
                Ok((anchor, total, anchor.after(stepper, total)?))
            },
        );
        match result {
            Ok((anchor, total, stepped)) if within(plan.season.span, stepped.instant) => {
                self.view.anchor = Some(anchor);
                self.view.days = total;
                self.view.instant = stepped.instant;
                self.view.missed = stepped.missed;
            }
            Ok(_) => {
                self.view.playing = false;
                self.say("The season ends here.");
            }
            Err(error) => {
                self.view.playing = false;
                self.complain(error.to_string());
            }
        }
    }

    fn go_to_event(&mut self, wanted: impl Fn(f64, f64) -> bool, last: bool) {
        let Some(plan) = &self.plan else { return };
        // A second of difference is no other event.
        let now = self.view.instant.days();
        let slack = if last { -1e-5 } else { 1e-5 };
        let mut found = plan
            .season
            .events
            .iter()
            .filter(|event| is_marked(event) && wanted(now + slack, event.instant.days()));
        let event = if last {
            found.next_back()
        } else {
            found.next()
        };
        match event.map(|event| (event.instant, event.kind.phrase())) {
            Some((instant, phrase)) => {
                self.go_to(instant);
                self.say(super::capitalised(phrase));
            }
            None => self.say(if last {
                "No event before this in the season."
            } else {
                "No event after this in the season."
            }),
        }
    }

    fn go_to_season(&mut self, end: impl Fn(Span) -> Tt) {
        if let Some(plan) = &self.plan {
            let instant = end(plan.season.span);
            self.go_to(instant);
        }
    }

    fn open(&mut self, path: &Path) {
        match Scenario::load(path) {
            Ok(scenario) => {
                let (text_scale, skyline) = (self.view.text_scale, self.view.skyline);
                let scenario = Arc::new(scenario);
                self.view = View {
                    text_scale,
                    skyline,
                    ..View::of(&scenario)
                };
                self.document = Document::new(scenario, Some(path.to_owned()));
                self.say(format!("{} opened.", path.display()));
            }
            Err(error) => self.complain(error.to_string()),
        }
    }

    /// Whether it was saved.
    fn save(&mut self, path: PathBuf) -> bool {
        let mut scenario = Scenario::clone(&self.document.scenario);
        scenario.view.theme = self.view.theme;
        scenario.view.turned = self.view.turned;
        match scenario.save(&path) {
            Ok(backup) => {
                let kept = backup.map_or_else(String::new, |kept| {
                    format!(" The file as it was before is kept as {}.", kept.display())
                });
                self.say(format!("Saved to {}.{kept}", path.display()));
                self.document.saved = Arc::clone(&self.document.scenario);
                self.document.path = Some(path);
                self.view.panel = Panel::None;
                true
            }
            Err(error) => {
                self.complain(error.to_string());
                false
            }
        }
    }
}

fn within(span: Span, instant: Tt) -> bool {
    span.from <= instant && instant <= span.to
}

/// A place in a list, moved and kept within it.
fn moved(place: usize, places: i32, count: usize) -> usize {
    let steps = usize::try_from(places.unsigned_abs()).unwrap_or(usize::MAX);
    let there = if places < 0 {
        place.saturating_sub(steps)
    } else {
        place.saturating_add(steps)
    };
    there.min(count.saturating_sub(1))
}
