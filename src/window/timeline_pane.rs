//! The timeline: the nights of the season under the strip, with the moment on it. Drag to scrub, wheel to zoom.
//!
//! Its tones are thousands of corners that stay where they are for as long as the season does: the worker draws them
//! once, as they are drawn for print, and the window shows that as one image with its words over it.

use std::sync::Arc;

use egui::accesskit;
use egui::emath::GuiRounding as _;
use egui::{Sense, Ui, Vec2, WidgetInfo};

use super::painter::{Easel, Picture, Placement, Shift};
use super::state::{Action, View};
use super::strip_pane::{SHEET_SCALE, focus_ring};
use crate::chart::{
    Level, Mark, MarkId, Palette, Scene, Shape, Timeline, TimelineLayout, TimelineText,
    TimelineView, timeline, timeline_cursor,
};
use crate::scenario::Plan;
use crate::season::darkness::{Darkness, Place, darkness};
use crate::sheet::words::LocalClock;
use crate::sheet::{Pixels, PngError, pixels, timeline_text};
use crate::sky::Tt;
use crate::sky::place::SkyError;

/// The nights of a season, worked out once for each plan.
pub struct NightsMade {
    pub plan: Arc<Plan>,
    pub darkness: Darkness,
    pub text: TimelineText,
}

impl NightsMade {
    /// A second for three years.
    ///
    /// # Errors
    /// A span that the sky does not cover.
    pub fn new(plan: Arc<Plan>) -> Result<Self, SkyError> {
        let scenario = &plan.scenario;
        let place = Place {
            site: &scenario.site,
            skyline: scenario.skyline.polygon(),
            conditions: &scenario.conditions,
        };
        let darkness = darkness(&plan.sky, place, plan.season.subject, plan.season.span)?;
        let text = timeline_text(&plan, &darkness);
        Ok(NightsMade {
            plan,
            darkness,
            text,
        })
    }
}

/// Which way the pointer goes while it is down: across the nights or along the hours of one.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Drag {
    Nights,
    Hours,
}

/// What a timeline is drawn for.
#[derive(Clone, Debug, PartialEq)]
pub struct TimelineWanted {
    pub view: TimelineView,
    pub palette: Palette,
    pub pixels_per_point: f32,
}

/// A timeline as it was drawn, with what it was drawn from.
pub struct TimelineMade {
    nights: Arc<NightsMade>,
    wanted: TimelineWanted,
    timeline: Timeline,
    image: Result<Pixels, PngError>,
}

impl TimelineMade {
    /// Draws a timeline: tens of milliseconds.
    #[must_use]
    pub fn new(nights: Arc<NightsMade>, wanted: TimelineWanted) -> Self {
        let timeline = timeline(
            &nights.plan.season,
            &nights.darkness,
            &nights.text,
            &wanted.view,
        );
        let mut tones = timeline.scene.clone();
        tones.marks.retain(|mark| !is_written(mark));
        let image = pixels(&tones, &wanted.palette, f64::from(wanted.pixels_per_point));
        TimelineMade {
            nights,
            wanted,
            timeline,
            image,
        }
    }
}

/// What is drawn over the image: words, in the letters of the window.
const fn is_written(mark: &Mark) -> bool {
    matches!(mark.shape, Shape::Label(_))
}

/// What the pane keeps between frames.
#[derive(Default)]
pub struct TimelinePane {
    nights: Option<Arc<NightsMade>>,
    made: Option<TimelineMade>,
    shown: Option<Shown>,
    drag: Option<Drag>,
    /// What the pane shows, as it should be drawn.
    pub wanted: Option<TimelineWanted>,
    /// What lies under the pointer, in words.
    pub hover: Option<String>,
}

/// The image on the graphics card and the words over it.
struct Shown {
    texture: egui::TextureHandle,
    size: Vec2,
    words: Scene,
    picture: Option<Picture>,
}

impl TimelinePane {
    pub fn take_nights(&mut self, nights: NightsMade) {
        self.nights = Some(Arc::new(nights));
    }

    pub fn take(&mut self, made: TimelineMade) {
        self.made = Some(made);
        self.shown = None;
    }

    /// The nights on screen.
    #[must_use]
    pub fn nights(&self) -> Option<&Arc<NightsMade>> {
        self.nights.as_ref()
    }

    /// Puts what was drawn on the graphics card.
    fn load(&mut self, ctx: &egui::Context) {
        let Some(made) = self.made.as_ref().filter(|_| self.shown.is_none()) else {
            return;
        };
        let Ok(image) = &made.image else { return };
        let colours = egui::ColorImage::from_rgb([image.width, image.height], &image.rgb);
        let mut words = made.timeline.scene.clone();
        words.marks.retain(is_written);
        self.shown = Some(Shown {
            texture: ctx.load_texture("timeline", colours, egui::TextureOptions::LINEAR),
            size: Vec2::new(image.width as f32, image.height as f32) / made.wanted.pixels_per_point,
            words,
            picture: None,
        });
    }
}

/// Degrees of freedom of the pointer before a drag has a direction, screen points.
const DECIDED: f32 = 4.0;

/// Draws the timeline over the full width.
pub fn show(
    ui: &mut Ui,
    pane: &mut TimelinePane,
    plan: &Arc<Plan>,
    view: &View,
    palette: &Palette,
    height: f32,
    text_scale: f32,
) -> Vec<Action> {
    let mut actions = Vec::new();
    let size = Vec2::new(ui.available_width(), height);
    let (rect, response) = ui.allocate_exact_size(size, Sense::click_and_drag());
    pane.hover = None;
    let Some(nights) = pane.nights.clone() else {
        response.widget_info(|| {
            WidgetInfo::labeled(egui::Role::Image, true, "timeline, being worked out")
        });
        return actions;
    };
    let wanted = TimelineWanted {
        view: TimelineView {
            width: f64::from(rect.width()),
            height: f64::from(rect.height()),
            text_scale: SHEET_SCALE * f64::from(text_scale),
            window: view.nights,
        },
        palette: *palette,
        pixels_per_point: ui.ctx().pixels_per_point(),
    };
    // Image and letters both stand on whole pixels.
    let corner = rect.min.round_to_pixels(wanted.pixels_per_point);
    let easel = Easel {
        placement: Placement {
            left: f64::from(corner.x),
            top: f64::from(corner.y),
            scale: 1.0,
        },
        palette: *palette,
        pixels_per_point: wanted.pixels_per_point,
        clip: rect,
    };
    pane.wanted = Some(wanted.clone());
    pane.load(ui.ctx());
    if let Some(shown) = &mut pane.shown
        && ui.is_rect_visible(rect)
    {
        let image = egui::Rect::from_min_size(corner, shown.size);
        let whole = egui::Rect::from_min_max(egui::Pos2::ZERO, egui::pos2(1.0, 1.0));
        ui.painter()
            .image(shown.texture.id(), image, whole, egui::Color32::WHITE);
        let words = match shown.picture.take() {
            Some(picture) if *picture.easel() == easel => picture,
            _ => Picture::new(&shown.words, easel.clone(), |_| Level::Paper),
        };
        words.show(ui.painter(), Shift::NONE, &[], None);
        shown.picture = Some(words);
    }
    let Some(made) = &pane.made else {
        return actions;
    };
    // While the image is behind, what is pointed at is already what will be seen.
    let next = (made.wanted.view != wanted.view || !Arc::ptr_eq(&made.nights, &nights))
        .then(|| TimelineLayout::new(&nights.darkness, &nights.text, &wanted.view));
    let layout = next.as_ref().unwrap_or(&made.timeline.layout);
    if ui.is_rect_visible(rect) {
        let cursor = timeline_cursor(layout, &wanted.view, view.instant);
        Picture::new(&cursor, easel.clone(), |_| Level::Over).show(
            ui.painter(),
            Shift::NONE,
            &[],
            None,
        );
    }
    actions.extend(told(
        ui,
        &response,
        layout,
        nights.darkness.nights.len(),
        plan,
        view,
        &nights.text,
    ));
    let placement = easel.placement;
    if let Some(pos) = response.interact_pointer_pos()
        && (response.dragged() || response.clicked())
    {
        let point = placement.point(pos);
        let clicked = response.clicked();
        let way = if clicked {
            None
        } else {
            direction(ui, pane.drag)
        };
        pane.drag = way;
        if clicked {
            response.request_focus();
            actions.extend(layout.instant_at(point).map(Action::GoTo));
        } else if let Some(way) = way {
            actions.extend(scrubbed(layout, way, point, view.instant));
        }
    } else {
        pane.drag = None;
    }
    if let Some(pos) = response.hover_pos() {
        let point = placement.point(pos);
        pane.hover = under(plan, &made.timeline.scene, layout, point);
        actions.extend(wheel(ui, layout, nights.darkness.nights.len(), point.x));
    }
    if response.has_focus() {
        focus_ring(ui, rect, palette);
    }
    actions
}

/// The way of a drag, decided once it has gone far enough.
fn direction(ui: &Ui, before: Option<Drag>) -> Option<Drag> {
    if before.is_some() {
        return before;
    }
    let (origin, now) =
        ui.input(|input| (input.pointer.press_origin(), input.pointer.interact_pos()));
    let gone = now? - origin?;
    if gone.length() < DECIDED {
        None
    } else if gone.x.abs() >= gone.y.abs() {
        Some(Drag::Nights)
    } else {
        Some(Drag::Hours)
    }
}

/// Sideways whole days pass and what is held stays; upright the hours of the one night.
fn scrubbed(
    layout: &TimelineLayout,
    way: Drag,
    point: crate::chart::Point,
    instant: Tt,
) -> Option<Action> {
    match way {
        Drag::Nights => {
            let there = layout.same_hour_at(point.x, instant)?;
            let days = (there.days() - instant.days()).round();
            (days != 0.0).then_some(Action::GoToDay(there))
        }
        Drag::Hours => {
            let night = layout.nights_to(instant).floor();
            let x = layout.x(night + 0.5);
            layout
                .instant_at(crate::chart::Point::new(x, point.y))
                .map(Action::GoTo)
        }
    }
}

/// The words for what lies under the pointer: an event near its mark, else the night and the hour.
fn under(
    plan: &Plan,
    scene: &Scene,
    layout: &TimelineLayout,
    point: crate::chart::Point,
) -> Option<String> {
    const REACH: f64 = 5.0;
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    for hit in scene.hit(point, REACH) {
        if let MarkId::Event(index) = hit.id {
            let event = plan.season.events.get(index)?;
            return Some(format!(
                "{}, {}",
                super::capitalised(event.kind.phrase()),
                clock.long(event.instant)
            ));
        }
    }
    if !layout.plot.contains(point) {
        return None;
    }
    layout.instant_at(point).map(|instant| clock.long(instant))
}

fn wheel(ui: &Ui, layout: &TimelineLayout, nights: usize, x: f64) -> Option<Action> {
    let (scroll, pinch) = ui.input(|input| (input.smooth_scroll_delta(), input.zoom_delta()));
    let factor = libm::exp(f64::from(scroll.y) * 0.004) * f64::from(pinch);
    let (from, to) = layout.window();
    if (factor == 1.0 && scroll.x == 0.0) || !factor.is_finite() {
        return None;
    }
    let at = layout.nights_at(x);
    let across = f64::from(scroll.x) / layout.night_width();
    let (count, length) = (nights as f64, (to - from) / factor);
    if length >= count {
        return Some(Action::ShowNights(None));
    }
    let from = (at - (at - from) / factor - across).clamp(0.0, count - length);
    Some(Action::ShowNights(Some((from, from + length))))
}

/// Tells screen readers what stands here and lets them step and set the night.
fn told(
    ui: &Ui,
    response: &egui::Response,
    layout: &TimelineLayout,
    nights: usize,
    plan: &Plan,
    view: &View,
    text: &TimelineText,
) -> Vec<Action> {
    let night = layout.nights_to(view.instant).floor();
    response.widget_info(|| WidgetInfo::slider(true, night, "timeline, night of the season"));
    let clock = LocalClock {
        scenario: &plan.scenario,
        sky: &plan.sky,
    };
    ui.ctx().accesskit_node_builder(response.id, |node| {
        node.set_min_numeric_value(0.0);
        node.set_max_numeric_value(nights.saturating_sub(1) as f64);
        node.set_numeric_value_step(1.0);
        node.set_value(clock.long(view.instant));
        node.set_description(text.description.clone());
        node.add_action(accesskit::Action::SetValue);
        node.add_action(accesskit::Action::Increment);
        node.add_action(accesskit::Action::Decrement);
    });
    ui.input(|input| {
        let count = |action| input.accesskit_action_requests(response.id, action).count() as i32;
        let steps = count(accesskit::Action::Increment) - count(accesskit::Action::Decrement);
        let mut actions = Vec::new();
        if steps != 0 {
            actions.push(Action::Step(steps));
        }
        for request in input.accesskit_action_requests(response.id, accesskit::Action::SetValue) {
            if let Some(accesskit::ActionData::NumericValue(value)) = request.data
                && value.is_finite()
            {
                actions.push(Action::GoToDay(
                    view.instant.plus_days(value.round() - night),
                ));
            }
        }
        actions
    })
}
