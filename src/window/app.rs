//! The window as eframe runs it: collects finished work, applies what was asked, draws the three views.

use std::path::PathBuf;
use std::sync::Arc;

use egui::{Frame, Margin, Panel as Side, Ui};

use super::fields::{Field, PathForm, SeasonForm};
use super::jobs::{Kind, Worker};
use super::keys::{self, BINDINGS, Command};
use super::reading_words::Column;
use super::readings_pane;
use super::state::{Action, Effect, Panel, State};
use super::strip_pane::{self, StripMade, StripPane};
use super::theme::{MARGIN, TITLE, colour, dress, font, palette, prepare, theme_word};
use super::time_words::{local_text, read_local, universal_text, zone_text};
use super::timeline_pane::{self, NightsMade, TimelineMade, TimelinePane, TimelineWanted};
use super::widgets::{Standing, caption, caution, word};
use crate::chart::{
    Font, Outline, OverlayStyle, Palette, Rect, Role, Scene, StripView, note_boxes, skyline_overlay,
};
use crate::scenario::{Plan, PlanError, Scenario, Theme};
use crate::season::hold::{Hold, Step};
use crate::season::moment::{Moment, Tonight, Watch, moment, night_at, tonight};
use crate::sheet::words::LocalClock;
use crate::sky::Tt;
use crate::sky::place::SkyError;

/// Width of the column of readings and of what opens beside the strip, screen points at text scale 1.
const READINGS_WIDTH: f32 = 268.0;
const ASIDE_WIDTH: f32 = 300.0;
/// The timeline's part of the window's height, and its limits in screen points at text scale 1.
const TIMELINE_PART: f32 = 0.165;
const TIMELINE_HEIGHT: (f32, f32) = (128.0, 190.0);

/// What the worker hands back.
pub enum Done {
    Plan(Arc<Scenario>, Result<Box<Plan>, PlanError>),
    Tonight(Arc<Plan>, Result<Tonight, SkyError>),
    Strip(Box<StripMade>),
    Nights(Result<Box<NightsMade>, SkyError>),
    Timeline(Box<TimelineMade>),
}

/// A moment with what it was worked out from.
struct MomentMade {
    plan: Arc<Plan>,
    instant: Tt,
    moment: Option<Moment>,
}

/// What is made once for a plan's skyline and for a strip on screen.
struct Laid {
    plan: Arc<Plan>,
    outline: Outline,
    strip: Arc<StripMade>,
    boxes: Vec<Rect>,
}

/// The program's window.
pub struct Window {
    state: State,
    /// The clock when the program started: where a scenario without dates looks for its season.
    now: Tt,
    worker: Worker<Done>,
    strip: StripPane,
    timeline: TimelinePane,
    moment: Option<MomentMade>,
    tonight: Option<(Arc<Plan>, Tonight)>,
    laid: Option<Laid>,
    asked_plan: Option<Arc<Scenario>>,
    asked_strip: Option<(Arc<Plan>, StripView)>,
    asked_nights: Option<Arc<Plan>>,
    asked_timeline: Option<(Arc<NightsMade>, TimelineWanted)>,
    asked_tonight: Option<(Arc<Plan>, Tt)>,
    date_field: Field,
    step_field: Field,
    form: Option<SeasonForm>,
    path_form: Option<(Panel, PathForm)>,
    dressed: Option<(Theme, f32)>,
    /// Parts of steps that playing has not taken yet.
    owed_steps: f64,
}

impl Window {
    /// A window on a scenario, read from `path` if that is given. `now` is the computer's clock.
    ///
    /// # Errors
    /// The system gives no thread to work in.
    pub fn new(
        ctx: &egui::Context,
        scenario: Scenario,
        path: Option<PathBuf>,
        now: Tt,
    ) -> std::io::Result<Self> {
        prepare(ctx);
        let of_worker = ctx.clone();
        let mut window = Window {
            state: State::new(scenario, path),
            now,
            worker: Worker::new(move || of_worker.request_repaint())?,
            strip: StripPane::default(),
            timeline: TimelinePane::default(),
            moment: None,
            tonight: None,
            laid: None,
            asked_plan: None,
            asked_strip: None,
            asked_nights: None,
            asked_timeline: None,
            asked_tonight: None,
            date_field: Field::default(),
            step_field: Field::default(),
            form: None,
            path_form: None,
            dressed: None,
            owed_steps: 0.0,
        };
        window.dress(ctx, 1.0);
        window.ask();
        Ok(window)
    }

    /// What the window knows.
    #[must_use]
    pub fn state(&self) -> &State {
        &self.state
    }

    /// The chart on screen.
    #[must_use]
    pub fn strip(&self) -> Option<&Arc<StripMade>> {
        self.strip.made()
    }

    /// The moment shown, where the sky covers it.
    #[must_use]
    pub fn moment(&self) -> Option<&Moment> {
        self.moment.as_ref().and_then(|made| made.moment.as_ref())
    }

    /// The readings on screen.
    #[must_use]
    pub fn readings(&self) -> Option<Column> {
        let plan = self.state.plan.as_ref()?;
        Column::new(plan, self.moment()?, self.tonight_now())
    }

    /// Whether something on screen waits for the worker.
    #[must_use]
    pub fn is_working(&self) -> bool {
        Kind::ALL.into_iter().any(|kind| self.worker.is_busy(kind))
    }

    /// Waits until nothing is under way any more.
    pub fn finish_work(&mut self) {
        while let Some(done) = self.worker.wait() {
            self.take(done);
            self.ask();
        }
    }

    /// Carries out what was asked.
    pub fn apply(&mut self, ctx: &egui::Context, action: Action) {
        match self.state.apply(action) {
            Some(Effect::CopyReadings) => self.copy_readings(ctx),
            Some(Effect::Close) => ctx.send_viewport_cmd(egui::ViewportCommand::Close),
            None => {}
        }
    }

    /// The readings as they are copied.
    #[must_use]
    pub fn readings_text(&self) -> Option<String> {
        let plan = self.state.plan.as_ref()?;
        let clock = LocalClock {
            scenario: &plan.scenario,
            sky: &plan.sky,
        };
        let instant = self.state.view.instant;
        let heading = format!(
            "{}\n{} ({})",
            plan.scenario.site.name,
            clock.long(instant),
            universal_text(plan.sky.tables(), instant)
        );
        Some(self.readings()?.text(&heading))
    }

    fn copy_readings(&mut self, ctx: &egui::Context) {
        if let Some(text) = self.readings_text() {
            ctx.copy_text(text);
            self.state.say("The readings are copied as text.");
        }
    }

    fn tonight_now(&self) -> Option<&Tonight> {
        let (plan, tonight) = self.tonight.as_ref()?;
        let is_of_plan = self
            .state
            .plan
            .as_ref()
            .is_some_and(|now| Arc::ptr_eq(now, plan));
        (is_of_plan && tonight.span.contains(self.state.view.instant)).then_some(tonight)
    }

    /// Size of text and of what goes with it: larger windows have larger letters, though not in proportion, and in steps,
    /// so that resizing does not ask for letters of ever new sizes.
    fn scale(&self, window: egui::Vec2) -> f32 {
        let grown = (window.x * window.y / (1280.0 * 800.0))
            .max(0.01)
            .powf(0.25)
            .clamp(1.0, 1.4);
        (grown * self.state.view.text_scale() * 20.0).round() / 20.0
    }

    fn dress(&mut self, ctx: &egui::Context, scale: f32) {
        let wanted = (self.state.view.theme, scale);
        if self.dressed != Some(wanted) {
            dress(ctx, &palette(wanted.0), wanted.1);
            self.dressed = Some(wanted);
        }
    }

    fn take(&mut self, done: Done) {
        match done {
            Done::Plan(scenario, Ok(plan)) => {
                if Arc::ptr_eq(&scenario, &self.state.document.scenario) {
                    self.state.take_plan(Arc::from(plan));
                }
            }
            Done::Plan(scenario, Err(error)) => {
                if Arc::ptr_eq(&scenario, &self.state.document.scenario) {
                    self.state.complain(error.to_string());
                }
            }
            Done::Tonight(plan, Ok(tonight)) => self.tonight = Some((plan, tonight)),
            Done::Nights(Ok(nights)) => self.timeline.take_nights(*nights),
            Done::Timeline(made) => self.timeline.take(*made),
            Done::Strip(made) => self.strip.take(*made),
            Done::Tonight(_, Err(error)) | Done::Nights(Err(error)) => {
                self.state.complain(error.to_string())
            }
        }
    }

    /// Asks the worker for whatever is shown and not yet there.
    fn ask(&mut self) {
        let scenario = &self.state.document.scenario;
        if !self
            .asked_plan
            .as_ref()
            .is_some_and(|asked| Arc::ptr_eq(asked, scenario))
        {
            self.asked_plan = Some(Arc::clone(scenario));
            let (scenario, now) = (Arc::clone(scenario), self.now);
            self.worker.ask(Kind::Plan, move || {
                let plan = Plan::new(Scenario::clone(&scenario), now).map(Box::new);
                Done::Plan(scenario, plan)
            });
        }
        let Some(plan) = self.state.plan.clone() else {
            return;
        };
        if let Some(view) = self.strip.wanted.clone() {
            let wanted = (Arc::clone(&plan), view);
            let is_asked = self
                .asked_strip
                .as_ref()
                .is_some_and(|(of, view)| Arc::ptr_eq(of, &wanted.0) && *view == wanted.1);
            if !is_asked {
                self.asked_strip = Some(wanted.clone());
                self.worker.ask(Kind::Strip, move || {
                    Done::Strip(Box::new(StripMade::new(wanted.0, wanted.1)))
                });
            }
        }
        if !self
            .asked_nights
            .as_ref()
            .is_some_and(|asked| Arc::ptr_eq(asked, &plan))
        {
            self.asked_nights = Some(Arc::clone(&plan));
            let plan = Arc::clone(&plan);
            self.worker.ask(Kind::Nights, move || {
                Done::Nights(NightsMade::new(plan).map(Box::new))
            });
        }
        if let Some((nights, wanted)) = self
            .timeline
            .nights()
            .cloned()
            .zip(self.timeline.wanted.clone())
        {
            let is_asked = self
                .asked_timeline
                .as_ref()
                .is_some_and(|(of, asked)| Arc::ptr_eq(of, &nights) && *asked == wanted);
            if !is_asked {
                self.asked_timeline = Some((Arc::clone(&nights), wanted.clone()));
                self.worker.ask(Kind::Timeline, move || {
                    Done::Timeline(Box::new(TimelineMade::new(nights, wanted)))
                });
            }
        }
        self.moment_of(&plan);
        let instant = self.state.view.instant;
        let night = night_at(&plan.sky, &plan.scenario.site, instant).from;
        let is_asked = self
            .asked_tonight
            .as_ref()
            .is_some_and(|(of, from)| Arc::ptr_eq(of, &plan) && *from == night);
        if !is_asked {
            self.asked_tonight = Some((Arc::clone(&plan), night));
            self.worker.ask(Kind::Tonight, move || {
                let found = tonight(&watch(&plan), instant);
                Done::Tonight(plan, found)
            });
        }
    }

    /// Works out the moment shown: far less than a frame.
    fn moment_of(&mut self, plan: &Arc<Plan>) {
        let instant = self.state.view.instant;
        let fits = self
            .moment
            .as_ref()
            .is_some_and(|made| Arc::ptr_eq(&made.plan, plan) && made.instant == instant);
        if fits {
            return;
        }
        let moment = match moment(&watch(plan), instant) {
            Ok(moment) => Some(moment),
            Err(error) => {
                self.state.complain(error.to_string());
                None
            }
        };
        self.moment = Some(MomentMade {
            plan: Arc::clone(plan),
            instant,
            moment,
        });
    }

    fn play(&mut self, ctx: &egui::Context) {
        if !self.state.view.playing {
            self.owed_steps = 0.0;
            return;
        }
        let seconds = ctx.input(|input| f64::from(input.stable_dt.min(0.2)));
        self.owed_steps += seconds * self.state.view.steps_a_second();
        let steps = self.owed_steps.floor();
        self.owed_steps -= steps;
        if steps >= 1.0 {
            self.state.apply(Action::Step(steps as i32));
        }
        ctx.request_repaint();
    }

    fn keys(&mut self, ctx: &egui::Context) -> Vec<Action> {
        let mut actions = Vec::new();
        for command in keys::pressed(ctx) {
            match command {
                Command::TypeDate => self.date_field.focus(),
                Command::Save => actions.push(self.save()),
                command => actions.extend(keys::action(
                    command,
                    &self.state.view,
                    self.state.plan.as_deref(),
                    &self.strip,
                )),
            }
        }
        actions
    }

    /// Saves where the document has a file, else asks for one.
    fn save(&self) -> Action {
        match &self.state.document.path {
            Some(path) => Action::Save(path.clone()),
            None => Action::ShowPanel(Panel::Save),
        }
    }

    fn heading(&self, ui: &mut Ui, colours: &Palette, scale: f32) -> Vec<Action> {
        let mut actions = Vec::new();
        ui.horizontal(|ui| {
            let shown = self
                .state
                .plan
                .as_ref()
                .map_or(&*self.state.document.scenario, |plan| &plan.scenario);
            ui.with_layout(egui::Layout::right_to_left(egui::Align::Center), |ui| {
                let view = &self.state.view;
                let panel = |panel: Panel| {
                    if view.panel == panel {
                        Standing::Chosen
                    } else {
                        Standing::Open
                    }
                };
                let toggled = |panel: Panel| {
                    Action::ShowPanel(if view.panel == panel {
                        Panel::None
                    } else {
                        panel
                    })
                };
                if word(ui, colours, "keys", "keys, a list", panel(Panel::Keys)).clicked() {
                    actions.push(toggled(Panel::Keys));
                }
                for theme in [Theme::Red, Theme::Dark, Theme::Light] {
                    let standing = if view.theme == theme {
                        Standing::Chosen
                    } else {
                        Standing::Open
                    };
                    let name = format!("{} theme", theme_word(theme));
                    if word(ui, colours, theme_word(theme), &name, standing).clicked() {
                        actions.push(Action::SetTheme(theme));
                    }
                }
                ui.add_space(14.0 * scale);
                if word(ui, colours, "save", "save the season", Standing::Open).clicked() {
                    actions.push(self.save());
                }
                if word(ui, colours, "open", "open a season", panel(Panel::Open)).clicked() {
                    actions.push(toggled(Panel::Open));
                }
                if word(
                    ui,
                    colours,
                    "season",
                    "season, edit it",
                    panel(Panel::Season),
                )
                .clicked()
                {
                    actions.push(toggled(Panel::Season));
                }
                ui.add_space(14.0 * scale);
                ui.with_layout(egui::Layout::left_to_right(egui::Align::Center), |ui| {
                    let title = egui::RichText::new(&shown.title)
                        .font(font(Font::SerifItalic, TITLE * scale));
                    ui.add(egui::Label::new(title).truncate().selectable(false));
                    ui.add_space(6.0 * scale);
                    if self.state.document.is_changed() {
                        caption(ui, "not saved");
                    }
                    let faint = egui::RichText::new(&shown.site.name).weak();
                    ui.add(egui::Label::new(faint).truncate().selectable(false));
                });
            });
        });
        actions
    }

    /// Asks what to do with changes before they would be lost.
    fn question(&self, ui: &mut Ui, colours: &Palette) -> Vec<Action> {
        let mut actions = Vec::new();
        if self.state.waiting.is_none() {
            return actions;
        }
        ui.horizontal_wrapped(|ui| {
            caution(ui, colours, "The season has changes that are not saved.");
            if word(ui, colours, "save them", "save them", Standing::Command).clicked() {
                actions.push(self.save());
            }
            if word(
                ui,
                colours,
                "give them up",
                "give them up",
                Standing::Command,
            )
            .clicked()
            {
                actions.push(Action::Discard);
            }
            if word(
                ui,
                colours,
                "go on editing",
                "go on editing",
                Standing::Command,
            )
            .clicked()
            {
                actions.push(Action::Stay);
            }
        });
        actions
    }

    /// The line between strip and timeline: what lies under the pointer or what there is to say, and how the strip is
    /// shown.
    fn caption_line(&self, ui: &mut Ui, colours: &Palette) -> Vec<Action> {
        let mut actions = Vec::new();
        let view = &self.state.view;
        ui.horizontal(|ui| {
            ui.with_layout(egui::Layout::right_to_left(egui::Align::Center), |ui| {
                let standing = if view.skyline {
                    Standing::Chosen
                } else {
                    Standing::Open
                };
                if word(ui, colours, "skyline", "skyline over the strip", standing).clicked() {
                    actions.push(Action::ShowSkyline(!view.skyline));
                }
                if word(
                    ui,
                    colours,
                    "turn round",
                    "turn the strip round",
                    Standing::Open,
                )
                .clicked()
                {
                    actions.push(Action::TurnRound);
                }
                let whole = if view.sky.is_none() {
                    Standing::Chosen
                } else {
                    Standing::Open
                };
                if word(
                    ui,
                    colours,
                    "whole season",
                    "whole season on the strip",
                    whole,
                )
                .clicked()
                {
                    actions.push(Action::ShowSky(None));
                }
                if let Some(plan) = self
                    .state
                    .plan
                    .as_ref()
                    .filter(|plan| !plan.season.loops.is_empty())
                    && word(
                        ui,
                        colours,
                        "the loop",
                        "the loop on the strip",
                        Standing::Open,
                    )
                    .clicked()
                {
                    actions.extend(keys::fit_loop(view, plan, &self.strip));
                }
                ui.with_layout(egui::Layout::left_to_right(egui::Align::Center), |ui| {
                    self.status(ui, colours)
                });
            });
        });
        actions
    }

    fn status(&self, ui: &mut Ui, colours: &Palette) {
        let is_old = self.worker.is_busy(Kind::Plan)
            || self
                .state
                .plan
                .as_ref()
                .is_some_and(|plan| !self.strip.is_current(plan));
        let hover = self.strip.hover.as_ref().or(self.timeline.hover.as_ref());
        let notice = self.state.notice.as_ref();
        let missed = self
            .state
            .view
            .missed
            .map(|missed| super::capitalised(&missed.to_string()) + ".");
        let words = match (notice, hover) {
            (Some(notice), _) if notice.is_error => {
                let ink = colour(colours.colour(Role::Caution));
                egui::RichText::new(&notice.text).color(ink)
            }
            (_, Some(hover)) => egui::RichText::new(hover),
            _ if self.worker.is_busy(Kind::Plan) => {
                egui::RichText::new("Planning the season \u{2026}").weak()
            }
            _ if is_old => egui::RichText::new("Drawing \u{2026}").weak(),
            (_, None) if missed.is_some() => egui::RichText::new(missed.unwrap_or_default()),
            (Some(notice), None) => egui::RichText::new(&notice.text).weak(),
            (None, None) => egui::RichText::new(
                "Drag the strip, turn the wheel, press on the path to go to that day",
            )
            .weak(),
        };
        ui.add(egui::Label::new(words).truncate().selectable(false));
    }

    /// Time and how it is stepped.
    fn time_line(&mut self, ui: &mut Ui, colours: &Palette, scale: f32) -> Vec<Action> {
        let mut actions = Vec::new();
        let Some(plan) = self.state.plan.clone() else {
            return actions;
        };
        let view = self.state.view.clone();
        let (scenario, tables) = (&plan.scenario, plan.sky.tables());
        ui.horizontal_wrapped(|ui| {
            let clock = LocalClock {
                scenario,
                sky: &plan.sky,
            };
            let weekday = clock
                .date(view.instant)
                .map_or("", |date| date.weekday().name());
            // Three letters in the room of the widest, so that nothing moves while days pass.
            let room = 30.0 * scale;
            let used = caption(ui, weekday.get(..3).unwrap_or(weekday))
                .rect
                .width();
            ui.add_space((room - used).max(0.0));
            let shown = local_text(scenario, tables, view.instant);
            let width = 138.0 * scale;
            let typed = self.date_field.show(
                ui,
                colours,
                "date and time at the site",
                width,
                &shown,
                |text| read_local(scenario, tables, view.instant, text),
            );
            actions.extend(typed.map(Action::GoTo));
            caption(ui, &zone_text(scenario, tables, view.instant));
            caption(
                ui,
                &universal_words(&shown, &universal_text(tables, view.instant)),
            );
            ui.add_space(10.0 * scale);
            caption(ui, "step");
            let width = 62.0 * scale;
            let typed = self.step_field.show(
                ui,
                colours,
                "length of a step",
                width,
                &view.step.to_string(),
                |text| text.parse::<Step>().map_err(|error| error.to_string()),
            );
            actions.extend(typed.map(Action::SetStep));
            if word(ui, colours, "back", "back by a step", Standing::Command).clicked() {
                actions.push(Action::Step(-1));
            }
            if word(ui, colours, "on", "on by a step", Standing::Command).clicked() {
                actions.push(Action::Step(1));
            }
            let (play, name) = if view.playing {
                ("pause", "pause")
            } else {
                ("play", "play")
            };
            if word(ui, colours, play, name, Standing::Command).clicked() {
                actions.push(Action::Play(!view.playing));
            }
            if word(ui, colours, "slower", "slower", Standing::Open).clicked() {
                actions.push(Action::Speed(-1));
            }
            caption(ui, &format!("{} a second", view.steps_a_second()));
            if word(ui, colours, "faster", "faster", Standing::Open).clicked() {
                actions.push(Action::Speed(1));
            }
            ui.add_space(10.0 * scale);
            caption(ui, "hold");
            for hold in Hold::ALL {
                let standing = if view.hold == hold {
                    Standing::Chosen
                } else {
                    Standing::Open
                };
                let name = format!("hold {}", hold.phrase());
                if word(ui, colours, hold.phrase(), &name, standing).clicked() {
                    actions.push(Action::SetHold(hold));
                }
            }
            ui.add_space(10.0 * scale);
            caption(ui, "event");
            if word(ui, colours, "before", "event before", Standing::Command).clicked() {
                actions.push(Action::PreviousEvent);
            }
            if word(ui, colours, "next", "next event", Standing::Command).clicked() {
                actions.push(Action::NextEvent);
            }
        });
        actions
    }

    fn aside(&mut self, ui: &mut Ui, colours: &Palette) -> Vec<Action> {
        match self.state.view.panel {
            Panel::None => Vec::new(),
            Panel::Keys => {
                ui.heading("Keys");
                ui.spacing_mut().interact_size.y = 0.0;
                ui.spacing_mut().item_spacing.y = 1.0;
                egui::Grid::new("keys").num_columns(2).show(ui, |ui| {
                    for binding in &BINDINGS {
                        ui.label(egui::RichText::new(binding.shown).small());
                        caption(ui, binding.words);
                        ui.end_row();
                    }
                });
                Vec::new()
            }
            panel @ (Panel::Open | Panel::Save) => {
                let text = || {
                    self.state
                        .document
                        .path
                        .as_ref()
                        .map_or_else(String::new, |path| path.display().to_string())
                };
                if self.path_form.as_ref().is_none_or(|(of, _)| *of != panel) {
                    self.path_form = Some((panel, PathForm::new(text())));
                }
                self.path_form.as_mut().map_or_else(Vec::new, |(_, form)| {
                    form.show(ui, colours, panel == Panel::Save)
                })
            }
            Panel::Season => {
                let scenario = &self.state.document.scenario;
                if !self.form.as_ref().is_some_and(|form| form.is_of(scenario)) {
                    self.form = Some(SeasonForm::new(scenario));
                }
                let mut actions = self
                    .form
                    .as_mut()
                    .map_or_else(Vec::new, |form| form.show(ui, colours));
                ui.horizontal(|ui| {
                    let document = &self.state.document;
                    for (text, can, action) in [
                        ("undo", document.can_undo(), Action::Undo),
                        ("redo", document.can_redo(), Action::Redo),
                    ] {
                        let pressed = ui.add_enabled_ui(can, |ui| {
                            word(ui, colours, text, text, Standing::Command).clicked()
                        });
                        if pressed.inner {
                            actions.push(action);
                        }
                    }
                });
                actions
            }
        }
    }

    /// The skyline of the moment over the strip on screen.
    fn overlay(&mut self, made: &Arc<StripMade>) -> Option<Scene> {
        if !self.state.view.skyline {
            return None;
        }
        let fits = self.laid.as_ref().is_some_and(|laid| {
            Arc::ptr_eq(&laid.plan, &made.plan) && Arc::ptr_eq(&laid.strip, made)
        });
        if !fits {
            let scenario = &made.plan.scenario;
            let outline = match self.laid.take() {
                Some(laid) if Arc::ptr_eq(&laid.plan, &made.plan) => laid.outline,
                _ => Outline::new(scenario.skyline.polygon(), &scenario.site.air),
            };
            self.laid = Some(Laid {
                plan: Arc::clone(&made.plan),
                outline,
                strip: Arc::clone(made),
                boxes: note_boxes(&made.scene),
            });
        }
        let laid = self.laid.as_ref()?;
        let moment = self
            .moment
            .as_ref()
            .filter(|moment| Arc::ptr_eq(&moment.plan, &made.plan))?
            .moment
            .as_ref()?;
        let style = OverlayStyle {
            width: made.view.width,
            height: made.view.height,
            text_scale: 1.0,
            sun_distance: made.plan.scenario.sun_distance,
            keep_clear: &laid.boxes,
        };
        Some(skyline_overlay(
            &made.plan.season,
            &made.layout,
            &laid.outline,
            moment,
            &style,
        ))
    }

    /// What the strip shows, in a sentence, for those who cannot see it.
    fn strip_summary(&self) -> String {
        let Some(plan) = &self.state.plan else {
            return String::from("strip, being worked out");
        };
        let clock = LocalClock {
            scenario: &plan.scenario,
            sky: &plan.sky,
        };
        let place = self
            .moment()
            .and_then(|moment| moment.of(plan.season.subject))
            .map_or_else(String::new, |subject| {
                let height = subject.height_over_skyline().degrees();
                let part = subject.skyline_part.as_deref().unwrap_or("the skyline");
                let where_it_is = if height < 0.0 { "behind" } else { "above" };
                format!(
                    " stands in {}, {:.1} degrees {where_it_is} {part}",
                    subject.constellation.name(),
                    height.abs()
                )
            });
        format!(
            "strip at {}: {}{place}",
            clock.long(self.state.view.instant),
            plan.season.subject
        )
    }
}

/// Universal time as it is shown beside local time: month and day only where they are others.
fn universal_words(local: &str, universal: &str) -> String {
    let (date, time) = universal.split_once('T').unwrap_or(("", universal));
    let time = time.replace('Z', " UTC");
    if local.starts_with(date) {
        return time;
    }
    let (_, month_and_day) = date.split_at(date.len().saturating_sub("07-01".len()));
    format!("{month_and_day} {time}")
}

/// Who looks at what in a plan.
fn watch(plan: &Plan) -> Watch<'_> {
    let scenario = &plan.scenario;
    Watch {
        sky: &plan.sky,
        site: &scenario.site,
        skyline: scenario.skyline.polygon(),
        subject: plan.season.subject,
        companions: &scenario.companions,
        sun_distance: scenario.sun_distance,
    }
}

impl eframe::App for Window {
    fn logic(&mut self, ctx: &egui::Context, _frame: &mut eframe::Frame) {
        for done in self.worker.collect() {
            self.take(done);
        }
        if ctx.input(|input| input.viewport().close_requested()) && self.state.document.is_changed()
        {
            ctx.send_viewport_cmd(egui::ViewportCommand::CancelClose);
            self.state.apply(Action::Close);
        }
    }

    fn ui(&mut self, ui: &mut Ui, _frame: &mut eframe::Frame) {
        let ctx = ui.ctx().clone();
        let mut actions = self.keys(&ctx);
        for action in actions.drain(..) {
            self.apply(&ctx, action);
        }
        self.play(&ctx);
        self.ask();
        let colours = palette(self.state.view.theme);
        let whole = ui.available_size();
        let scale = self.scale(whole);
        self.dress(&ctx, scale);
        // The window is cleared to the ground: no panel fills it a second time.
        let edge = |left: f32, right: f32, top: f32, bottom: f32| {
            Frame::NONE.inner_margin(Margin {
                left: left as i8,
                right: right as i8,
                top: top as i8,
                bottom: bottom as i8,
            })
        };

        Side::top("heading")
            .frame(edge(MARGIN, MARGIN, 8.0, 2.0))
            .show_separator_line(false)
            .show(ui, |ui| {
                actions.extend(self.heading(ui, &colours, scale));
                actions.extend(self.question(ui, &colours));
            });
        Side::bottom("time")
            .frame(edge(MARGIN, MARGIN, 2.0, 8.0))
            .show_separator_line(false)
            .show(ui, |ui| {
                actions.extend(self.caption_line(ui, &colours));
                if let Some(plan) = self.state.plan.clone() {
                    let (least, most) = TIMELINE_HEIGHT;
                    let height = (TIMELINE_PART * whole.y).clamp(least * scale, most * scale);
                    let view = self.state.view.clone();
                    actions.extend(timeline_pane::show(
                        ui,
                        &mut self.timeline,
                        &plan,
                        &view,
                        &colours,
                        height,
                        scale,
                    ));
                }
                actions.extend(self.time_line(ui, &colours, scale));
            });
        Side::right("readings")
            .exact_size(READINGS_WIDTH * scale)
            .resizable(false)
            .frame(edge(10.0, MARGIN, 4.0, 4.0))
            .show_separator_line(false)
            .show(ui, |ui| {
                egui::ScrollArea::vertical()
                    .auto_shrink(false)
                    .show(ui, |ui| {
                        if let Some(column) = self.readings() {
                            actions.extend(readings_pane::show(ui, &column, &colours, scale));
                        }
                    });
            });
        if self.state.view.panel == Panel::None {
            (self.form, self.path_form) = (None, None);
        } else {
            Side::left("aside")
                .exact_size(ASIDE_WIDTH * scale)
                .resizable(false)
                .frame(edge(MARGIN, 10.0, 4.0, 4.0))
                .show_separator_line(false)
                .show(ui, |ui| {
                    egui::ScrollArea::vertical()
                        .auto_shrink(false)
                        .show(ui, |ui| {
                            actions.extend(self.aside(ui, &colours));
                        });
                });
        }
        egui::CentralPanel::default()
            .frame(edge(4.0, 0.0, 0.0, 0.0))
            .show(ui, |ui| match self.state.plan.clone() {
                Some(plan) => {
                    let mut strip = std::mem::take(&mut self.strip);
                    strip.summary = self.strip_summary();
                    let view = self.state.view.clone();
                    let overlay = |made: &Arc<StripMade>| self.overlay(made);
                    actions.extend(strip_pane::show(
                        ui, &mut strip, &plan, &view, &colours, scale, overlay,
                    ));
                    self.strip = strip;
                }
                None => {
                    let words = match &self.state.notice {
                        Some(notice) => notice.text.as_str(),
                        None => "Planning the season \u{2026}",
                    };
                    ui.centered_and_justified(|ui| ui.label(words));
                }
            });
        let is_idle = actions.is_empty();
        for action in actions {
            self.apply(&ctx, action);
        }
        if !is_idle {
            ctx.request_repaint();
        }
        self.ask();
    }

    fn clear_color(&self, _visuals: &egui::Visuals) -> [f32; 4] {
        colour(palette(self.state.view.theme).colour(Role::Ground)).to_normalized_gamma_f32()
    }
}
