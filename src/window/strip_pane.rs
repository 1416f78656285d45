//! The strip, alive: the chart of [`crate::chart::strip`] with pan, zoom, a reading under the pointer, and the skyline of
//! the moment laid over it.
//!
//! The chart itself is laid out by the worker; until it comes, the old picture is moved to where it belongs.

use std::sync::Arc;

use egui::{Sense, Ui, WidgetInfo};

use super::painter::{Easel, Picture, Placement, Shift};
use super::state::{Action, View};
use crate::chart::{
    Level, MarkId, Palette, Point, Scene, StripLayout, StripRow, StripText, StripView, StripWindow,
    strip,
};
use crate::scenario::Plan;
use crate::season::{Season, Track};
use crate::sheet::words::LocalClock;
use crate::sheet::{east_is_left, strip_text};
use crate::sky::constellations::Constellation;
use crate::sky::stars::StarCatalogue;
use crate::sky::{Angle, Tt, Vec3};

/// Screen points to a point of the sheet at text scale 1.
pub(super) const SHEET_SCALE: f64 = 1.22;
/// How near the pointer must come to a mark, screen points.
const REACH: f64 = 9.0;
/// Degrees along the strip, at least and at most.
const LEAST_ACROSS: f64 = 2.0;
const MOST_ACROSS: f64 = 360.0;
/// No strip is centred farther from the ecliptic, degrees.
const MOST_LATITUDE: f64 = 50.0;

/// A chart as it was laid out, with what it was laid out from.
pub struct StripMade {
    pub plan: Arc<Plan>,
    pub view: StripView,
    pub text: StripText,
    pub scene: Scene,
    pub layout: StripLayout,
}

impl StripMade {
    /// Lays a chart out: tens of milliseconds.
    #[must_use]
    pub fn new(plan: Arc<Plan>, view: StripView) -> Self {
        // Without its stars, which only a damaged build lacks, the path can still be read.
        let stars = StarCatalogue::embedded()
            .map(StarCatalogue::stars)
            .unwrap_or_default();
        let text = strip_text(&plan);
        let scene = strip(&plan.season, stars, &text, &view);
        let layout = view.layout(&plan.season, &text);
        StripMade {
            plan,
            view,
            text,
            scene,
            layout,
        }
    }
}

/// What the pane keeps between frames.
#[derive(Default)]
pub struct StripPane {
    made: Option<Arc<StripMade>>,
    picture: Option<(Arc<StripMade>, Picture)>,
    /// What the pane shows, as it should be laid out.
    pub wanted: Option<StripView>,
    /// What lies under the pointer, in words.
    pub hover: Option<String>,
    /// The sentence that screen readers are told.
    pub summary: String,
}

impl StripPane {
    pub fn take(&mut self, made: StripMade) {
        self.made = Some(Arc::new(made));
    }

    /// The chart on screen.
    #[must_use]
    pub fn made(&self) -> Option<&Arc<StripMade>> {
        self.made.as_ref()
    }

    /// Whether what is on screen is what should be.
    #[must_use]
    pub fn is_current(&self, plan: &Arc<Plan>) -> bool {
        self.made.as_ref().is_some_and(|made| {
            Arc::ptr_eq(&made.plan, plan) && Some(&made.view) == self.wanted.as_ref()
        })
    }
}

/// Draws the strip into all the room there is.
pub fn show(
    ui: &mut Ui,
    pane: &mut StripPane,
    plan: &Arc<Plan>,
    view: &View,
    palette: &Palette,
    text_scale: f32,
    overlay: impl FnOnce(&Arc<StripMade>) -> Option<Scene>,
) -> Vec<Action> {
    let mut actions = Vec::new();
    let size = ui.available_size();
    let (rect, response) = ui.allocate_exact_size(size, Sense::click_and_drag());
    let scale = SHEET_SCALE * f64::from(text_scale);
    let placement = Placement {
        left: f64::from(rect.left()),
        top: f64::from(rect.top()),
        scale,
    };
    let wanted = StripView {
        width: (f64::from(rect.width()) / scale).round(),
        height: (f64::from(rect.height()) / scale).round(),
        east_left: east_is_left(plan) != (view.turned != plan.scenario.view.turned),
        window: view.sky,
        furniture: false,
    };
    response.widget_info(|| WidgetInfo::labeled(egui::Role::Image, true, &pane.summary));
    pane.wanted = Some(wanted.clone());
    if let Some(made) = pane.made.clone() {
        let easel = Easel {
            placement,
            palette: *palette,
            pixels_per_point: ui.ctx().pixels_per_point(),
            clip: rect,
        };
        let fits = pane
            .picture
            .as_ref()
            .is_some_and(|(of, picture)| Arc::ptr_eq(of, &made) && *picture.easel() == easel);
        if !fits {
            pane.picture = Some((
                Arc::clone(&made),
                Picture::new(&made.scene, easel.clone(), Level::of_strip),
            ));
        }
        let shift = shift(&made, &wanted, &placement);
        // Over a picture that is still where it was, nothing of the moment would stand right.
        let over = overlay(&made)
            .filter(|_| shift == Shift::NONE)
            .map(|scene| Picture::new(&scene, easel, Level::of_overlay));
        if let Some((_, picture)) = &pane.picture
            && ui.is_rect_visible(rect)
        {
            let frames: Vec<egui::Rect> = made
                .layout
                .rows
                .iter()
                .map(|row| placement.rect(&row.frame))
                .collect();
            picture.show(ui.painter(), shift, &frames, over.as_ref());
        }
        pane.hover = None;
        if let Some(pos) = response.hover_pos() {
            let point = placement.point(pos);
            if shift == Shift::NONE && !response.dragged() {
                let under = Under::at(&made, point, REACH / scale);
                pane.hover = under.as_ref().map(|under| under.words.clone());
                if let Some(instant) = under.and_then(|under| under.instant) {
                    ui.ctx().set_cursor_icon(egui::CursorIcon::PointingHand);
                    if response.clicked() {
                        actions.push(Action::GoToDay(instant));
                    }
                }
            }
            actions.extend(wheel(ui, &wanted, plan, point));
        }
        if response.dragged()
            && let Some(pos) = response.interact_pointer_pos()
            && response.drag_delta() != egui::Vec2::ZERO
        {
            let (to, from) = (
                placement.point(pos),
                placement.point(pos - response.drag_delta()),
            );
            actions.extend(panned(&wanted, plan, from, to));
        }
    }
    if response.clicked() {
        response.request_focus();
    }
    if response.has_focus() {
        focus_ring(ui, rect, palette);
    }
    actions
}

/// Arrow keys belong to the painted area that has the focus, and its outline says so.
pub(super) fn focus_ring(ui: &Ui, rect: egui::Rect, palette: &Palette) {
    let ring = egui::Stroke::new(
        1.0,
        super::theme::colour(palette.colour(crate::chart::Role::Selection)),
    );
    ui.painter()
        .rect_stroke(rect.shrink(1.0), 2.0, ring, egui::StrokeKind::Inside);
}

/// The rows of a view, without laying the chart out.
fn layout(view: &StripView, plan: &Plan) -> StripLayout {
    // Words only take room on a sheet with furniture, and this one has none.
    view.layout(&plan.season, &Default::default())
}

/// How the picture on screen has to be moved to stand for the view wanted.
fn shift(made: &StripMade, wanted: &StripView, placement: &Placement) -> Shift {
    if made.view == *wanted || made.view.east_left != wanted.east_left {
        return Shift::NONE;
    }
    let next = layout(wanted, &made.plan);
    let ([old], [new]) = (made.layout.rows.as_slice(), next.rows.as_slice()) else {
        return Shift::NONE;
    };
    let scale = new.scale / old.scale;
    let from = placement.at_f64(old.point(old.longitude, old.latitude));
    let to = placement.at_f64(new.point(old.longitude, old.latitude));
    if !(scale.is_finite() && (0.1..10.0).contains(&scale)) {
        return Shift::NONE;
    }
    Shift {
        scale,
        dx: to.0 - from.0 * scale,
        dy: to.1 - from.1 * scale,
    }
}

/// The row that a change of view starts from: that under the pointer.
fn row_at(view: &StripView, plan: &Plan, point: Point) -> Option<StripRow> {
    let layout = layout(view, plan);
    layout.row_at(point).or(layout.rows.first()).copied()
}

fn window(longitude: f64, latitude: f64, across: f64) -> Action {
    Action::ShowSky(Some(StripWindow {
        longitude: Angle::from_degrees(longitude).wrapped(),
        latitude: Angle::from_degrees(latitude.clamp(-MOST_LATITUDE, MOST_LATITUDE)),
        degrees_across: across.clamp(LEAST_ACROSS, MOST_ACROSS),
    }))
}

/// The view after the sky was dragged from one point of the sheet to another.
fn panned(view: &StripView, plan: &Plan, from: Point, to: Point) -> Option<Action> {
    let row = row_at(view, plan, from)?;
    let centre = row.frame.centre();
    let (longitude, latitude) = row.place(centre.moved(from.x - to.x, from.y - to.y));
    Some(window(longitude, latitude, row.frame.width() / row.scale))
}

/// The view with the sky under a point of the sheet left where it is, so many times as large.
fn zoomed(view: &StripView, plan: &Plan, at: Point, factor: f64) -> Option<Action> {
    let row = row_at(view, plan, at)?;
    let across = row.frame.width() / row.scale;
    let next = (across / factor).clamp(LEAST_ACROSS, MOST_ACROSS);
    let kept = 1.0 - next / across;
    // A strip of several rows becomes one over the whole sheet: zooming brings the point to its middle.
    let centre = row.frame.centre();
    let (longitude, latitude) = if view.window.is_none() && layout(view, plan).rows.len() > 1 {
        row.place(at)
    } else {
        row.place(centre.between(at, kept))
    };
    Some(window(longitude, latitude, next))
}

fn wheel(ui: &Ui, view: &StripView, plan: &Plan, at: Point) -> Option<Action> {
    let (scroll, pinch) = ui.input(|input| (input.smooth_scroll_delta().y, input.zoom_delta()));
    let factor = libm::exp(f64::from(scroll) * 0.004) * f64::from(pinch);
    if factor == 1.0 || !factor.is_finite() {
        return None;
    }
    zoomed(view, plan, at, factor)
}

/// The view zoomed about its middle, for the keyboard.
#[must_use]
pub fn zoomed_about_middle(view: &StripView, plan: &Plan, factor: f64) -> Option<Action> {
    let row = layout(view, plan).rows.first().copied()?;
    zoomed(view, plan, row.frame.centre(), factor)
}

/// The view that holds the loop nearest to an instant: the path from before the first station to after the second.
#[must_use]
pub fn on_loop(season: &Season, frame_aspect: f64, instant: Tt) -> Option<StripWindow> {
    /// Part of the retrograde stretch kept on either side of it, so that the loop closes.
    const AROUND: f64 = 0.35;
    let middle = |of: &crate::season::Loop| {
        (of.station_retrograde.instant.days() + of.station_direct.instant.days()) / 2.0
    };
    let apart = |of: &crate::season::Loop| (middle(of) - instant.days()).abs();
    let nearest = season
        .loops
        .iter()
        .min_by(|a, b| apart(a).total_cmp(&apart(b)))?;
    let more = AROUND * nearest.duration_days();
    let from = nearest.station_retrograde.instant.days() - more;
    let to = nearest.station_direct.instant.days() + more;
    let places: Vec<(f64, f64)> = season
        .track
        .points
        .iter()
        .filter(|point| (from..=to).contains(&point.instant.days()))
        .map(|point| {
            let place = season.frame.ecliptic_from_icrs * point.direction;
            (place.longitude().degrees(), place.latitude().degrees())
        })
        .collect();
    let &(start, _) = places.first()?;
    let east = |longitude: f64| Angle::from_degrees(longitude - start).signed().degrees();
    let low = places
        .iter()
        .map(|place| east(place.0))
        .fold(f64::INFINITY, f64::min);
    let high = places
        .iter()
        .map(|place| east(place.0))
        .fold(f64::NEG_INFINITY, f64::max);
    let south = places
        .iter()
        .map(|place| place.1)
        .fold(f64::INFINITY, f64::min);
    let north = places
        .iter()
        .map(|place| place.1)
        .fold(f64::NEG_INFINITY, f64::max);
    // Room for words around the path.
    let across = ((high - low) * 1.35).max((north - south) * 1.9 * frame_aspect);
    Some(StripWindow {
        longitude: Angle::from_degrees(start + (low + high) / 2.0).wrapped(),
        latitude: Angle::from_degrees((south + north) / 2.0),
        degrees_across: across.clamp(LEAST_ACROSS, MOST_ACROSS),
    })
}

/// What lies under the pointer.
struct Under {
    words: String,
    /// When the subject stands there, where it does.
    instant: Option<Tt>,
}

impl Under {
    fn at(made: &StripMade, point: Point, reach: f64) -> Option<Self> {
        let row = made.layout.row_at(point)?;
        let clock = LocalClock {
            scenario: &made.plan.scenario,
            sky: &made.plan.sky,
        };
        let season = &made.plan.season;
        for hit in made.scene.hit(point, reach) {
            let found = match hit.id {
                MarkId::TrackPoint { body, index } => {
                    let track = track_of(season, body)?;
                    let instant = instant_on(track, season, row, index, point)?;
                    let sample = track.points.get(index)?;
                    let magnitude = sample.magnitude.map_or_else(String::new, |magnitude| {
                        format!(", magnitude {}", signed(magnitude, 1))
                    });
                    let angle = if body == crate::sky::Body::Sun {
                        String::new()
                    } else {
                        format!(", {:.0}\u{b0} from the Sun", sample.elongation.degrees())
                    };
                    Under {
                        words: format!(
                            "{body}, {}{angle}, {:.3} au{magnitude}",
                            clock.day(instant),
                            sample.distance_au
                        ),
                        instant: Some(instant),
                    }
                }
                MarkId::Event(index) => {
                    let event = season.events.get(index)?;
                    Under {
                        words: format!(
                            "{}, {}",
                            super::capitalised(event.kind.phrase()),
                            clock.long(event.instant)
                        ),
                        instant: Some(event.instant),
                    }
                }
                MarkId::Tick(index) | MarkId::OtherTick { date: index, .. } => {
                    let instant = made.text.dates.get(index)?.instant;
                    Under {
                        words: clock.long(instant),
                        instant: Some(instant),
                    }
                }
                MarkId::Star(hip) => {
                    let star = StarCatalogue::embedded().ok()?.by_hip(hip)?;
                    let name = star
                        .name
                        .map_or_else(|| format!("HIP {hip}"), str::to_owned);
                    Under {
                        words: format!("{name}, magnitude {}", signed(star.magnitude, 1)),
                        instant: None,
                    }
                }
                _ => continue,
            };
            return Some(found);
        }
        let (longitude, latitude) = row.place(point);
        let ecliptic = Vec3::from_spherical(
            Angle::from_degrees(longitude),
            Angle::from_degrees(latitude),
        );
        let direction = season.frame.ecliptic_from_icrs.transposed() * ecliptic;
        Some(Under {
            words: format!(
                "{}, ecliptic longitude {longitude:.1}\u{b0}, latitude {}\u{b0}",
                Constellation::at_icrs(direction).name(),
                signed(latitude, 1)
            ),
            instant: None,
        })
    }
}

fn track_of(season: &Season, body: crate::sky::Body) -> Option<&Track> {
    std::iter::once(&season.track)
        .chain(&season.companions)
        .chain(std::iter::once(&season.sun))
        .find(|track| track.body == body)
}

/// When a body passes nearest to a point of the sheet, between the neighbours of a sample.
fn instant_on(
    track: &Track,
    season: &Season,
    row: &StripRow,
    index: usize,
    point: Point,
) -> Option<Tt> {
    let first = index.saturating_sub(1);
    let near = track
        .points
        .get(first..(index + 2).min(track.points.len()))?;
    let at = |sample: &crate::season::TrackPoint| {
        row.point_of(season.frame.ecliptic_from_icrs * sample.direction)
    };
    near.windows(2)
        .filter_map(|pair| {
            let [from, to] = pair else { return None };
            let (a, b) = (at(from), at(to));
            let along = b.minus(a);
            let part = (point.minus(a).dot(along) / along.dot(along).max(1e-12)).clamp(0.0, 1.0);
            let days = from.instant.days() + (to.instant.days() - from.instant.days()) * part;
            Some((a.between(b, part).distance(point), Tt::from_days(days)))
        })
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, instant)| instant)
}

/// A number with a true sign.
fn signed(value: f64, decimals: usize) -> String {
    super::reading_words::signed(value, decimals)
}
