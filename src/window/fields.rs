//! Fields to type in: what is wrong stands beside the field, and what was typed stays until it is right.

use std::path::PathBuf;
use std::sync::Arc;

use egui::{Key, Ui};

use super::state::{Action, Panel};
use super::theme::colour;
use super::widgets::{Standing, caption, word};
use crate::chart::{Palette, Role};
use crate::scenario::{Scenario, SeasonDates, Zone, standard_pressure_hpa};
use crate::sky::calendar::CivilDate;
use crate::sky::{Angle, Body};

/// A field that shows a value until somebody types in it.
#[derive(Debug, Default)]
pub struct Field {
    text: String,
    error: Option<String>,
    wants_focus: bool,
}

impl Field {
    pub fn focus(&mut self) {
        self.wants_focus = true;
    }

    /// Draws the field; hands back what was typed when it is finished with Enter. `shown` is written into it while nobody
    /// types. What `read` says against the text stands beside the field.
    pub fn show<T>(
        &mut self,
        ui: &mut Ui,
        palette: &Palette,
        name: &str,
        width: f32,
        shown: &str,
        read: impl Fn(&str) -> Result<T, String>,
    ) -> Option<T> {
        let edit = egui::TextEdit::singleline(&mut self.text).desired_width(width);
        let response = ui.add(edit);
        response.widget_info(|| {
            let mut info = egui::WidgetInfo::labeled(egui::Role::TextInput, true, name);
            info.current_text_value = Some(self.text.clone());
            info
        });
        if std::mem::take(&mut self.wants_focus) {
            response.request_focus();
            select_all(ui, &response, &self.text);
        }
        let mut done = None;
        if response.changed() {
            self.error = None;
        }
        if response.lost_focus() {
            if ui.input(|input| input.key_pressed(Key::Escape)) {
                self.error = None;
            } else if self.text.trim() != shown {
                match read(&self.text) {
                    Ok(value) => {
                        self.error = None;
                        done = Some(value);
                    }
                    Err(error) => self.error = Some(error),
                }
            }
        }
        if !response.has_focus() && done.is_none() && self.error.is_none() && self.text != shown {
            shown.clone_into(&mut self.text);
        }
        if let Some(error) = &self.error {
            complaint(ui, palette, error);
        }
        done
    }
}

fn select_all(ui: &Ui, response: &egui::Response, text: &str) {
    let mut state = egui::text_edit::TextEditState::load(ui.ctx(), response.id).unwrap_or_default();
    let end = egui::text::CCursor::new(text.chars().count());
    state
        .cursor
        .set_char_range(Some(egui::text::CCursorRange::two(
            egui::text::CCursor::new(0),
            end,
        )));
    state.store(ui.ctx(), response.id);
}

fn complaint(ui: &mut Ui, palette: &Palette, error: &str) {
    let ink = colour(palette.colour(Role::Caution));
    ui.add(egui::Label::new(egui::RichText::new(error).small().color(ink)).wrap());
}

/// A file to open or to save to.
#[derive(Debug, Default)]
pub struct PathForm {
    text: String,
    wants_focus: bool,
}

impl PathForm {
    #[must_use]
    pub fn new(text: String) -> Self {
        PathForm {
            text,
            wants_focus: true,
        }
    }

    pub fn show(&mut self, ui: &mut Ui, palette: &Palette, saving: bool) -> Vec<Action> {
        let mut actions = Vec::new();
        let (heading, verb) = if saving {
            ("Save the season as", "save")
        } else {
            ("Open a season", "open")
        };
        ui.heading(heading);
        let label = caption(ui, "file");
        let edit = egui::TextEdit::singleline(&mut self.text).desired_width(f32::INFINITY);
        let response = ui.add(edit).labelled_by(label.id);
        if std::mem::take(&mut self.wants_focus) {
            response.request_focus();
        }
        let entered = response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter));
        ui.horizontal(|ui| {
            let pressed = word(ui, palette, verb, verb, Standing::Command).clicked();
            if (pressed || entered) && !self.text.trim().is_empty() {
                let path = PathBuf::from(self.text.trim());
                actions.push(if saving {
                    Action::Save(path)
                } else {
                    Action::Open(path)
                });
            }
            if word(ui, palette, "close", "close this", Standing::Open).clicked() {
                actions.push(Action::ShowPanel(Panel::None));
            }
        });
        if saving {
            caption(ui, "A file by another hand is kept beside it as .bak.");
        }
        actions
    }
}

/// The season in plain fields.
#[derive(Debug)]
pub struct SeasonForm {
    /// What the texts were taken from.
    of: Arc<Scenario>,
    subject: Body,
    companions: Vec<Body>,
    title: String,
    from: String,
    to: String,
    site: String,
    latitude: String,
    longitude: String,
    elevation: String,
    zone: String,
}

/// A field of the form.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Entry {
    Title,
    From,
    To,
    Site,
    Latitude,
    Longitude,
    Elevation,
    Zone,
}

type Mistakes = Vec<(Entry, String)>;

/// A number of the file's own digits.
fn figure(value: f64) -> String {
    let text = format!("{value:.6}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    text.to_owned()
}

fn number(
    mistakes: &mut Mistakes,
    entry: Entry,
    text: &str,
    least: f64,
    most: f64,
    unit: &str,
) -> f64 {
    let plain = text.trim().replace('\u{2212}', "-");
    match plain.parse::<f64>() {
        Ok(value) if (least..=most).contains(&value) => value,
        _ => {
            mistakes.push((entry, format!("a number from {least} to {most}, {unit}")));
            0.0
        }
    }
}

impl SeasonForm {
    #[must_use]
    pub fn new(scenario: &Arc<Scenario>) -> Self {
        let date = |date: fn(&SeasonDates) -> CivilDate| {
            scenario
                .season
                .as_ref()
                .map_or_else(String::new, |season| date(season).to_string())
        };
        SeasonForm {
            subject: scenario.subject,
            companions: scenario.companions.clone(),
            title: scenario.title.clone(),
            from: date(|season| season.from),
            to: date(|season| season.to),
            site: scenario.site.name.clone(),
            latitude: figure(scenario.site.latitude.degrees()),
            longitude: figure(scenario.site.longitude.signed().degrees()),
            elevation: figure(scenario.site.elevation_m),
            zone: scenario.zone.name().to_owned(),
            of: Arc::clone(scenario),
        }
    }

    /// Whether it stands for this document.
    #[must_use]
    pub fn is_of(&self, scenario: &Arc<Scenario>) -> bool {
        Arc::ptr_eq(&self.of, scenario)
    }

    /// The document that the fields make.
    fn scenario(&self) -> Result<Scenario, Mistakes> {
        let mut mistakes = Mistakes::new();
        let mut scenario = Scenario::clone(&self.of);
        scenario.subject = self.subject;
        scenario.companions = self
            .companions
            .iter()
            .copied()
            .filter(|body| *body != self.subject)
            .collect();
        scenario.title = self.title.trim().to_owned();
        if scenario.title.is_empty() {
            mistakes.push((Entry::Title, String::from("a line of words")));
        }
        scenario.season = self.dates(&mut mistakes);
        scenario.site.name = self.site.trim().to_owned();
        if scenario.site.name.is_empty() {
            mistakes.push((Entry::Site, String::from("the name of the place")));
        }
        let latitude = number(
            &mut mistakes,
            Entry::Latitude,
            &self.latitude,
            -90.0,
            90.0,
            "degrees, north positive",
        );
        let longitude = number(
            &mut mistakes,
            Entry::Longitude,
            &self.longitude,
            -180.0,
            180.0,
            "degrees, east positive",
        );
        let elevation = number(
            &mut mistakes,
            Entry::Elevation,
            &self.elevation,
            -500.0,
            9000.0,
            "metres above the sea",
        );
        // A value that was not touched keeps all its digits.
        if self.latitude != figure(self.of.site.latitude.degrees()) {
            scenario.site.latitude = Angle::from_degrees(latitude);
        }
        if self.longitude != figure(self.of.site.longitude.signed().degrees()) {
            scenario.site.longitude = Angle::from_degrees(longitude);
        }
        if self.elevation != figure(self.of.site.elevation_m) {
            scenario.site.elevation_m = elevation;
            scenario.site.air.pressure_hpa = standard_pressure_hpa(elevation);
        }
        match self.zone.trim().parse::<Zone>() {
            Ok(zone) => scenario.zone = zone,
            Err(error) => mistakes.push((Entry::Zone, error.to_string())),
        }
        if mistakes.is_empty()
            && let Err(error) = scenario.to_ron()
        {
            mistakes.push((Entry::Title, error.to_string()));
        }
        if mistakes.is_empty() {
            Ok(scenario)
        } else {
            Err(mistakes)
        }
    }

    fn dates(&self, mistakes: &mut Mistakes) -> Option<SeasonDates> {
        let (from, to) = (self.from.trim(), self.to.trim());
        if from.is_empty() && to.is_empty() {
            return None;
        }
        let mut read = |entry: Entry, text: &str| match text.parse::<CivilDate>() {
            Ok(date) => Some(date),
            Err(error) => {
                mistakes.push((
                    entry,
                    format!("{error}; or leave both empty for the next season"),
                ));
                None
            }
        };
        let (from, to) = (read(Entry::From, from), read(Entry::To, to));
        let (from, to) = (from?, to?);
        if to.days_since(from) <= 0 {
            mistakes.push((Entry::To, format!("a date after {from}")));
            return None;
        }
        Some(SeasonDates { from, to })
    }

    pub fn show(&mut self, ui: &mut Ui, palette: &Palette) -> Vec<Action> {
        let mut actions = Vec::new();
        let mistakes = self.scenario().err().unwrap_or_default();
        ui.heading("The season");
        caption(ui, "subject");
        ui.horizontal_wrapped(|ui| {
            for body in Body::PLANETS {
                let standing = if self.subject == body {
                    Standing::Chosen
                } else {
                    Standing::Open
                };
                let name = format!("{body} as the subject");
                if word(ui, palette, body.name(), &name, standing).clicked() {
                    self.subject = body;
                }
            }
        });
        caption(ui, "drawn with it");
        ui.horizontal_wrapped(|ui| {
            for body in Body::PLANETS
                .into_iter()
                .chain([Body::Moon])
                .filter(|body| *body != self.subject)
            {
                let place = self
                    .companions
                    .iter()
                    .position(|companion| *companion == body);
                let standing = if place.is_some() {
                    Standing::Chosen
                } else {
                    Standing::Open
                };
                let name = format!("{body} drawn with it");
                if word(ui, palette, body.name(), &name, standing).clicked() {
                    match place {
                        Some(place) => drop(self.companions.remove(place)),
                        None => self.companions.push(body),
                    }
                }
            }
        });
        let mut entered = false;
        let wide = ui.available_width();
        let half = (wide - ui.spacing().item_spacing.x) / 2.0;
        let mut entry = |ui: &mut Ui, entry: Entry, name: &str, text: &mut String, width: f32| {
            ui.vertical(|ui| {
                ui.set_width(width);
                let label = caption(ui, name);
                let edit = egui::TextEdit::singleline(text).desired_width(f32::INFINITY);
                let response = ui.add(edit).labelled_by(label.id);
                entered |= response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter));
                for (_, mistake) in mistakes.iter().filter(|(wrong, _)| *wrong == entry) {
                    complaint(ui, palette, mistake);
                }
            });
        };
        entry(ui, Entry::Title, "title", &mut self.title, wide);
        ui.horizontal_top(|ui| {
            entry(ui, Entry::From, "first day", &mut self.from, half);
            entry(ui, Entry::To, "day after the last", &mut self.to, half);
        });
        entry(ui, Entry::Site, "place", &mut self.site, wide);
        ui.horizontal_top(|ui| {
            entry(
                ui,
                Entry::Latitude,
                "latitude, \u{b0} north",
                &mut self.latitude,
                half,
            );
            entry(
                ui,
                Entry::Longitude,
                "longitude, \u{b0} east",
                &mut self.longitude,
                half,
            );
        });
        ui.horizontal_top(|ui| {
            entry(
                ui,
                Entry::Elevation,
                "elevation, m",
                &mut self.elevation,
                half,
            );
            entry(ui, Entry::Zone, "clock", &mut self.zone, half);
        });
        ui.add_space(6.0);
        ui.horizontal(|ui| {
            let made = self.scenario().ok().filter(|made| *made != *self.of);
            let pressed = ui
                .add_enabled_ui(made.is_some(), |ui| {
                    word(
                        ui,
                        palette,
                        "plan this season",
                        "plan this season",
                        Standing::Command,
                    )
                    .clicked()
                })
                .inner;
            if let Some(made) = made.filter(|_| pressed || entered) {
                actions.push(Action::Edit(Arc::new(made)));
            }
            if word(ui, palette, "close", "close this", Standing::Open).clicked() {
                actions.push(Action::ShowPanel(Panel::None));
            }
        });
        actions
    }
}
