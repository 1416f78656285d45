//! The timeline: a whole season at a glance, a column a night, evening above and morning below.
//!
//! Darkness and Moonlight are tones, the hours in which the subject stands in the open a thread through every night, its
//! events notches above, months below. Hours are those of the clock at the site: where clocks change the lines step.
//! Words, dates and the clock's offsets come in ready made; lengths are points, y down.

use crate::season::darkness::{Darkness, NightLight};
use crate::season::{EventKind, Season, Span};
use crate::sky::{Angle, Tt};

use super::geometry::{Point, Rect};
use super::palette::Role;
use super::scene::{Align, Label, Layer, MarkId, Paint, Run, Scene, Shape, Stop, Stroke};
use super::strip::marks;
use super::text::Font;

/// How a timeline is laid out.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TimelineView {
    /// Points.
    pub width: f64,
    pub height: f64,
    /// Size of the text: 1 for print.
    pub text_scale: f64,
    /// The nights shown, counted from the first as 0, parts of a night allowed; `None` for all.
    pub window: Option<(f64, f64)>,
}

impl TimelineView {
    /// All nights, text as in print.
    #[must_use]
    pub const fn new(width: f64, height: f64) -> Self {
        TimelineView {
            width,
            height,
            text_scale: 1.0,
            window: None,
        }
    }
}

/// A month that begins.
#[derive(Clone, Debug, PartialEq)]
pub struct TimelineMonth {
    pub instant: Tt,
    pub label: String,
    /// What is written where there is little room; may be empty.
    pub short: String,
}

/// An hour of the clock to draw across the nights.
#[derive(Clone, Debug, PartialEq)]
pub struct HourLine {
    /// 0 to 24.
    pub hour: f64,
    pub label: String,
    /// Drawn a little stronger.
    pub is_midnight: bool,
}

/// The words of a timeline that depend on calendar and zone.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct TimelineText {
    pub title: String,
    /// What it shows, in a sentence or two.
    pub description: String,
    /// What the tones and threads mean, in a line; may be empty.
    pub caption: String,
    pub months: Vec<TimelineMonth>,
    /// In order of the hour from noon on.
    pub hours: Vec<HourLine>,
    /// Local minus universal time at the middle of each night, hours.
    pub zone_offsets: Vec<f64>,
    /// Universal time of local mean noon, hours of the day.
    pub mean_noon_utc: f64,
    /// The date of each event of the season, in its order.
    pub event_dates: Vec<String>,
}

/// Where nights and hours lie on a timeline.
#[derive(Clone, Debug, PartialEq)]
pub struct TimelineLayout {
    /// The nights themselves, without the words around them.
    pub plot: Rect,
    /// First night's beginning; nights are a day long.
    first: Tt,
    nights: usize,
    /// Nights from and to.
    window: (f64, f64),
    /// Hours after local mean noon at the top and at the bottom.
    hours: (f64, f64),
}

/// The narrowest window that can be zoomed to, nights.
const LEAST_WINDOW: f64 = 3.0;

impl TimelineLayout {
    /// The layout that [`timeline`] uses.
    #[must_use]
    pub fn new(darkness: &Darkness, text: &TimelineText, view: &TimelineView) -> Self {
        let nights = darkness.nights.len();
        let count = (nights as f64).max(1.0);
        let window = match view.window {
            Some((from, to)) if from.is_finite() && to.is_finite() => {
                let least = LEAST_WINDOW.min(count);
                let from = from.clamp(0.0, count - least);
                (from, to.clamp(from + least, count))
            }
            _ => (0.0, count),
        };
        let scale = view.scale();
        let top = if view.is_tall() { 39.0 } else { 26.0 } * scale;
        let bottom = if view.has_caption(text) { 27.0 } else { 16.0 } * scale;
        let (left, right) = (38.0 * scale, 8.0);
        let plot = Rect::new(
            left,
            top,
            (view.width - right).max(left + 20.0),
            (view.height - bottom).max(top + 12.0),
        );
        TimelineLayout {
            plot,
            first: darkness
                .nights
                .first()
                .map_or(Tt::default(), |night| night.span.from),
            nights,
            window,
            hours: hours_shown(&darkness.nights),
        }
    }

    /// Points a night.
    #[must_use]
    pub fn night_width(&self) -> f64 {
        self.plot.width() / (self.window.1 - self.window.0)
    }

    /// The nights shown, first and last, parts of a night included.
    #[must_use]
    pub const fn window(&self) -> (f64, f64) {
        self.window
    }

    /// Nights from the first one's beginning to an instant; may lie outside the season.
    #[must_use]
    pub fn nights_to(&self, instant: Tt) -> f64 {
        instant.days() - self.first.days()
    }

    /// Where a number of nights from the beginning lies across.
    #[must_use]
    pub fn x(&self, nights: f64) -> f64 {
        self.plot.left + (nights - self.window.0) * self.night_width()
    }

    /// Nights from the beginning at a place across: the whole part is the night's number.
    #[must_use]
    pub fn nights_at(&self, x: f64) -> f64 {
        self.window.0 + (x - self.plot.left) / self.night_width()
    }

    /// The night at a place across; beyond the ends the first or the last. `None` without nights.
    #[must_use]
    pub fn night_at(&self, x: f64) -> Option<usize> {
        let last = self.nights.checked_sub(1)?;
        let nights = self.nights_at(x);
        // NaN goes to the first.
        Some((nights.max(0.0) as usize).min(last))
    }

    /// Where an hour after local mean noon lies, from above.
    #[must_use]
    pub fn y(&self, hours: f64) -> f64 {
        let (from, to) = self.hours;
        self.plot.top + (hours - from) / (to - from) * self.plot.height()
    }

    /// Hours after local mean noon at a height, 0 to 24.
    #[must_use]
    pub fn hours_at(&self, y: f64) -> f64 {
        let (from, to) = self.hours;
        let hours = from + (y - self.plot.top) / self.plot.height() * (to - from);
        hours.clamp(0.0, 24.0)
    }

    /// The instant at a point: its night by the place across, its hour by the height. `None` without nights.
    #[must_use]
    pub fn instant_at(&self, point: Point) -> Option<Tt> {
        let night = self.night_at(point.x)? as f64;
        // Just short of noon, so that the night is kept.
        let share = (self.hours_at(point.y) / 24.0).min(1.0 - 1e-6);
        Some(self.first.plus_days(night + share))
    }

    /// The same time of another night: what dragging sideways means. `None` without nights.
    #[must_use]
    pub fn same_hour_at(&self, x: f64, instant: Tt) -> Option<Tt> {
        let nights = self.nights_to(instant);
        let night = self.night_at(x)? as f64;
        Some(self.first.plus_days(night + nights - nights.floor()))
    }

    /// Where an instant lies: the middle of its night's column, at its hour. It may be outside the plot.
    #[must_use]
    pub fn point_of(&self, instant: Tt) -> Point {
        let nights = self.nights_to(instant);
        let night = nights.floor();
        Point::new(self.x(night + 0.5), self.y(24.0 * (nights - night)))
    }
}

impl TimelineView {
    fn scale(&self) -> f64 {
        if self.text_scale.is_finite() {
            self.text_scale.clamp(0.5, 4.0)
        } else {
            1.0
        }
    }

    fn is_tall(&self) -> bool {
        self.height >= 130.0 * self.scale()
    }

    fn has_caption(&self, text: &TimelineText) -> bool {
        self.is_tall() && !text.caption.is_empty()
    }
}

/// Sunset and sunrise, for what is shown and what the Moon lights.
const SUN_GONE: Angle = Angle::from_degrees(-0.83);

/// From the earliest sunset to the latest sunrise with a little of the day, hours after noon; at least six hours.
fn hours_shown(nights: &[NightLight]) -> (f64, f64) {
    let (mut from, mut to) = (f64::INFINITY, f64::NEG_INFINITY);
    for night in nights {
        if let Some(dark) = night.sun_below(SUN_GONE) {
            let hours = hours_of(night, dark);
            from = from.min(hours.0);
            to = to.max(hours.1);
        }
    }
    if from > to {
        return (6.0, 18.0);
    }
    let short = (6.0 - (to - from)).max(0.0) / 2.0;
    (
        (from - 0.35 - short).max(0.0),
        (to + 0.35 + short).min(24.0),
    )
}

/// Hours after the night's beginning.
fn hours_of(night: &NightLight, span: Span) -> (f64, f64) {
    let hours = |instant: Tt| 24.0 * (instant.days() - night.span.from.days());
    (hours(span.from), hours(span.to))
}

/// A timeline with the layout that turns places on it into instants.
#[derive(Clone, Debug, PartialEq)]
pub struct Timeline {
    pub scene: Scene,
    pub layout: TimelineLayout,
}

/// Draws the nights of a season.
#[must_use]
pub fn timeline(
    season: &Season,
    darkness: &Darkness,
    text: &TimelineText,
    view: &TimelineView,
) -> Timeline {
    let layout = TimelineLayout::new(darkness, text, view);
    let mut painter = Painter {
        scene: Scene {
            width: view.width,
            height: view.height,
            title: text.title.clone(),
            description: text.description.clone(),
            marks: Vec::new(),
        },
        layout: &layout,
        season,
        darkness,
        text,
        scale: view.scale(),
    };
    painter.sheet();
    painter.dusk();
    painter.moonlight();
    painter.hours();
    painter.threads();
    painter.months();
    painter.events(view.is_tall());
    if view.has_caption(text) {
        painter.caption();
    }
    let mut scene = painter.scene;
    scene.sort();
    Timeline { scene, layout }
}

/// The mark of the moment shown: a picture of its own to lay over the timeline, as large as that.
#[must_use]
pub fn timeline_cursor(layout: &TimelineLayout, view: &TimelineView, instant: Tt) -> Scene {
    let mut scene = Scene {
        width: view.width,
        height: view.height,
        title: String::from("The moment shown"),
        ..Scene::default()
    };
    let plot = layout.plot;
    let at = layout.point_of(instant);
    if !at.is_finite() || at.x < plot.left - 0.5 || plot.right + 0.5 < at.x {
        return scene;
    }
    let mut add = |layer, shape| scene.add(MarkId::Cursor, layer, shape);
    let line = |width: f64, role: Role| Shape::Line {
        points: vec![
            Point::new(at.x, plot.top - 5.0),
            Point::new(at.x, plot.bottom + 3.0),
        ],
        stroke: Stroke::of(role, width),
    };
    // A little air on either side, so that it is not one of the threads.
    add(Layer::Marks, line(3.4, Role::Ground));
    add(Layer::Marks, line(1.2, Role::Ink));
    add(
        Layer::Marks,
        Shape::Area {
            rings: vec![vec![
                Point::new(at.x - 4.0, plot.top - 8.5),
                Point::new(at.x + 4.0, plot.top - 8.5),
                Point::new(at.x, plot.top - 2.5),
            ]],
            fill: Paint::of(Role::Ink),
            edge: None,
        },
    );
    if plot.top <= at.y && at.y <= plot.bottom {
        for (radius, role) in [(5.2, Role::Ground), (3.9, Role::Ink), (1.7, Role::Ground)] {
            add(
                Layer::Marks,
                Shape::Disc {
                    centre: at,
                    radius,
                    fill: Paint::of(role),
                },
            );
        }
    } else {
        // By day, above or below what is shown: a chevron points there.
        let (edge, way) = if at.y < plot.top {
            (plot.top + 3.0, 1.0)
        } else {
            (plot.bottom - 3.0, -1.0)
        };
        add(
            Layer::Marks,
            Shape::Line {
                points: vec![
                    Point::new(at.x - 4.0, edge + 4.0 * way),
                    Point::new(at.x, edge),
                    Point::new(at.x + 4.0, edge + 4.0 * way),
                ],
                stroke: Stroke::of(Role::Ink, 1.2),
            },
        );
    }
    scene
}

/// A stretch of hours in each of several nights that follow each other.
struct Chain {
    first: usize,
    /// Hours after noon.
    hours: Vec<(f64, f64)>,
}

/// Joins the stretches of following nights that overlap.
fn chains(nights: impl Iterator<Item = (usize, Vec<(f64, f64)>)>) -> Vec<Chain> {
    let mut chains: Vec<Chain> = Vec::new();
    for (night, stretches) in nights {
        for stretch in stretches {
            if stretch.1 <= stretch.0 {
                continue;
            }
            let overlap = |chain: &Chain| {
                let open = chain.first + chain.hours.len() == night;
                let last = chain.hours.last().filter(|_| open)?;
                let shared = last.1.min(stretch.1) - last.0.max(stretch.0);
                (shared > 0.0).then_some(shared)
            };
            let best = chains
                .iter_mut()
                .filter_map(|chain| Some((overlap(chain)?, chain)))
                .max_by(|a, b| a.0.total_cmp(&b.0));
            match best {
                Some((_, chain)) => chain.hours.push(stretch),
                None => chains.push(Chain {
                    first: night,
                    hours: vec![stretch],
                }),
            }
        }
    }
    chains
}

struct Painter<'a> {
    scene: Scene,
    layout: &'a TimelineLayout,
    season: &'a Season,
    darkness: &'a Darkness,
    text: &'a TimelineText,
    scale: f64,
}

/// The least distance between corners of an outline, points.
const FINEST: f64 = 1.2;

impl Painter<'_> {
    fn shown(&self) -> impl Iterator<Item = (usize, &NightLight)> {
        let (from, to) = self.layout.window;
        let nights = self.darkness.nights.iter().enumerate();
        nights.filter(move |(index, _)| {
            let index = *index as f64;
            from - 1.0 < index && index < to
        })
    }

    /// The outline of a chain: corners at the middle of its nights, level through the halves at its ends.
    fn outline(&self, chain: &Chain) -> Vec<Point> {
        let plot = self.layout.plot;
        let point = |nights: f64, hours: f64| {
            Point::new(
                self.layout.x(nights).clamp(plot.left, plot.right),
                self.layout.y(hours).clamp(plot.top, plot.bottom),
            )
        };
        let every = ((FINEST / self.layout.night_width()).ceil() as usize).max(1);
        let last = chain.hours.len().saturating_sub(1);
        let mut upper = Vec::new();
        let mut lower = Vec::new();
        for (index, &(from, to)) in chain.hours.iter().enumerate() {
            let night = (chain.first + index) as f64;
            if index == 0 {
                upper.push(point(night, from));
                lower.push(point(night, to));
            }
            if index % every == 0 || index == last {
                upper.push(point(night + 0.5, from));
                lower.push(point(night + 0.5, to));
            }
            if index == last {
                upper.push(point(night + 1.0, from));
                lower.push(point(night + 1.0, to));
            }
        }
        upper.extend(lower.into_iter().rev());
        upper
    }

    fn sheet(&mut self) {
        let sheet = Rect::new(0.0, 0.0, self.scene.width, self.scene.height);
        self.scene.add(
            MarkId::Sheet,
            Layer::Sheet,
            Shape::Area {
                rings: vec![sheet.corners().to_vec()],
                fill: Paint::of(Role::Ground),
                edge: None,
            },
        );
    }

    /// From day through dusk to night, in steps of tone too fine to be seen.
    fn dusk(&mut self) {
        const STEPS: u32 = 40;
        for step in 0..=STEPS {
            let depth = f64::from(step) / f64::from(STEPS);
            // Ground at sunset, dusk at its brightest with the end of civil twilight, then night.
            let paint = if depth < 1.0 / 3.0 {
                Paint::mixed(Role::Ground, Role::Dusk, (depth + 0.04) * 3.0)
            } else {
                Paint::mixed(Role::Dusk, Role::Night, (depth - 1.0 / 3.0) * 1.5)
            };
            let limit = Angle::from_degrees(-18.0 * depth - 0.4);
            let levels = chains(self.shown().map(|(index, night)| {
                let dark = night.sun_below(limit);
                (
                    index,
                    dark.map(|dark| hours_of(night, dark)).into_iter().collect(),
                )
            }));
            for chain in &levels {
                let ring = self.outline(chain);
                self.scene.add(
                    MarkId::Sheet,
                    Layer::Plate,
                    Shape::Area {
                        rings: vec![ring],
                        fill: paint,
                        edge: None,
                    },
                );
            }
        }
    }

    /// Where the Moon is up while the Sun is down, as strong as it is lit.
    fn moonlight(&mut self) {
        let moonlit = chains(self.shown().map(|(index, night)| {
            let Some(dark) = night.sun_below(SUN_GONE) else {
                return (index, Vec::new());
            };
            let dark = hours_of(night, dark);
            let up = night.moon_up.iter().map(|&up| {
                let up = hours_of(night, up);
                (up.0.max(dark.0), up.1.min(dark.1))
            });
            (index, up.collect())
        }));
        for chain in &moonlit {
            let polygon = self.outline(chain);
            let lit = |offset: usize| {
                let night = self.darkness.nights.get(chain.first + offset);
                night.map_or(0.0, |night| night.moon_lit)
            };
            // A half Moon gives a tenth of a full one's light; the eye makes a third of that.
            let strength = |lit: f64| 0.52 * libm::pow(lit.clamp(0.0, 1.0), 1.6);
            let paint = |lit| Paint::of(Role::Moonlight).faded(strength(lit));
            self.shaded(chain, polygon, Layer::Shade, |offset| paint(lit(offset)));
        }
    }

    /// A chain filled with a paint for each of its nights, even between them.
    fn shaded(
        &mut self,
        chain: &Chain,
        polygon: Vec<Point>,
        layer: Layer,
        paint: impl Fn(usize) -> Paint,
    ) {
        let (mut left, mut right) = (f64::INFINITY, f64::NEG_INFINITY);
        for point in &polygon {
            left = left.min(point.x);
            right = right.max(point.x);
        }
        if right - left < 0.01 {
            return;
        }
        let mut stops: Vec<Stop> = Vec::new();
        for offset in 0..chain.hours.len() {
            let x = self.layout.x((chain.first + offset) as f64 + 0.5);
            let part = (x - left) / (right - left);
            if !(0.0..=1.0).contains(&part) {
                continue;
            }
            let stop = Stop {
                part,
                paint: paint(offset),
            };
            // Where a paint lasts, its first and last night are enough.
            match stops.as_mut_slice() {
                [.., before, last] if before.paint == last.paint && last.paint == stop.paint => {
                    last.part = part;
                }
                _ => stops.push(stop),
            }
        }
        let (Some(&first), Some(&last)) = (stops.first(), stops.last()) else {
            return;
        };
        stops.insert(0, Stop { part: 0.0, ..first });
        stops.push(Stop { part: 1.0, ..last });
        self.scene.add(
            MarkId::Sheet,
            layer,
            Shape::Shade {
                polygon,
                run: Run::Along {
                    from: Point::new(left, 0.0),
                    to: Point::new(right, 0.0),
                },
                stops,
            },
        );
    }

    /// Hours of the clock across the nights, stepping where clocks change, with their names at the left.
    fn hours(&mut self) {
        let layout = self.layout;
        let plot = layout.plot;
        let size = 7.6 * self.scale;
        let mut last_label = f64::NEG_INFINITY;
        for line in &self.text.hours {
            // Hours after local mean noon of each night.
            let after_noon =
                |offset: f64| (line.hour - offset - self.text.mean_noon_utc).rem_euclid(24.0);
            let mut points: Vec<Point> = Vec::new();
            let mut label_y = None;
            for (index, _) in self.shown() {
                let Some(&offset) = self.text.zone_offsets.get(index) else {
                    continue;
                };
                let y = layout.y(after_noon(offset));
                if y < plot.top + 1.0 || plot.bottom - 1.0 < y {
                    continue;
                }
                label_y.get_or_insert(y);
                let (from, to) = (layout.x(index as f64), layout.x(index as f64 + 1.0));
                let from = Point::new(from.clamp(plot.left, plot.right), y);
                let to = Point::new(to.clamp(plot.left, plot.right), y);
                match points.as_mut_slice() {
                    [.., last] if (last.y - y).abs() < 1e-9 => last.x = to.x,
                    _ => points.extend([from, to]),
                }
            }
            let width = if line.is_midnight { 0.6 } else { 0.4 };
            let opacity = if line.is_midnight { 0.8 } else { 0.45 };
            if points.len() >= 2 {
                let paint = Paint::of(Role::Hairline).faded(opacity);
                self.scene.add(
                    MarkId::Scale,
                    Layer::Scale,
                    Shape::Line {
                        points,
                        stroke: Stroke {
                            paint,
                            width,
                            dash: None,
                        },
                    },
                );
            }
            if let Some(y) = label_y
                && y - last_label > size * 1.15
            {
                last_label = y;
                let role = if line.is_midnight {
                    Role::Ink
                } else {
                    Role::FaintInk
                };
                let anchor = Point::new(plot.left - 5.0, y + size * 0.35);
                let label = Label::new(anchor, line.label.clone(), Font::Sans, size, role)
                    .aligned(Align::End);
                self.scene
                    .add(MarkId::Scale, Layer::Labels, Shape::Label(label));
            }
        }
    }

    /// The subject's paint on a night, as on the strip: its tone moves along the season, going back has its own.
    fn subject_paint(&self, instant: Tt) -> Paint {
        let span = self.season.span;
        let gone = (instant.days() - span.from.days()) / span.days().max(1e-9);
        let points = &self.season.track.points;
        let after = points.partition_point(|point| point.instant <= instant);
        let near = points.get(after.saturating_sub(1));
        if near.is_some_and(|point| point.longitude_rate_per_day < Angle::ZERO) {
            Paint::of(Role::Retrograde)
        } else {
            Paint::mixed(Role::Subject, Role::SubjectLate, gone.clamp(0.0, 1.0))
        }
    }

    /// The hours in view: a pale field for the whole, a thread for every night.
    fn threads(&mut self) {
        let layout = self.layout;
        let in_view = |night: &NightLight| -> Vec<(f64, f64)> {
            night
                .in_view
                .iter()
                .map(|&span| hours_of(night, span))
                .collect()
        };
        let fields = chains(self.shown().map(|(index, night)| (index, in_view(night))));
        let width = (layout.night_width() * 0.3).clamp(0.3, 1.25);
        // Where threads would run into each other the field alone speaks.
        let is_fine = layout.night_width() < 2.0;
        let field = if is_fine { 0.55 } else { 0.2 };
        for chain in &fields {
            let paints: Vec<Paint> = (0..chain.hours.len())
                .map(|offset| {
                    let night = self.darkness.nights.get(chain.first + offset);
                    let instant = night.map_or(self.season.span.from, |night| night.span.middle());
                    self.subject_paint(instant).faded(field)
                })
                .collect();
            let Some(&last) = paints.last() else { continue };
            let polygon = self.outline(chain);
            self.shaded(chain, polygon, Layer::OtherPaths, |offset| {
                paints.get(offset).copied().unwrap_or(last)
            });
        }
        if is_fine {
            return;
        }
        let plot = layout.plot;
        let mut threads = Vec::new();
        for (index, night) in self.shown() {
            let x = layout.x(index as f64 + 0.5);
            if x < plot.left || plot.right < x {
                continue;
            }
            let paint = self.subject_paint(night.span.middle());
            for (from, to) in in_view(night) {
                let top = layout.y(from).clamp(plot.top, plot.bottom);
                let bottom = layout.y(to).clamp(plot.top, plot.bottom);
                if bottom - top > 0.05 {
                    let points = vec![Point::new(x, top), Point::new(x, bottom)];
                    let stroke = Stroke {
                        paint,
                        width,
                        dash: None,
                    };
                    threads.push((MarkId::Night(index), Shape::Line { points, stroke }));
                }
            }
        }
        for (id, shape) in threads {
            self.scene.add(id, Layer::Track, shape);
        }
    }

    fn months(&mut self) {
        let layout = self.layout;
        let plot = layout.plot;
        let size = 8.2 * self.scale;
        let frame = Shape::Line {
            points: vec![
                Point::new(plot.left, plot.bottom),
                Point::new(plot.right, plot.bottom),
            ],
            stroke: Stroke::of(Role::Hairline, 0.6),
        };
        self.scene.add(MarkId::Scale, Layer::Frame, frame);
        let places: Vec<f64> = self
            .text
            .months
            .iter()
            .map(|month| layout.x(layout.nights_to(month.instant)))
            .collect();
        for (index, month) in self.text.months.iter().enumerate() {
            let Some(&x) = places.get(index) else {
                continue;
            };
            let next = places
                .get(index + 1)
                .copied()
                .unwrap_or(plot.right)
                .min(plot.right);
            if plot.left - 0.5 <= x && x <= plot.right {
                let points = vec![
                    Point::new(x, plot.bottom),
                    Point::new(x, plot.bottom + 4.5 * self.scale),
                ];
                let stroke = Stroke::of(Role::FaintInk, 0.6);
                self.scene
                    .add(MarkId::Scale, Layer::Frame, Shape::Line { points, stroke });
            }
            // The name stands in its month, also when the month began before what is shown.
            let start = x.max(plot.left) + 3.0;
            for words in [&month.label, &month.short] {
                let anchor = Point::new(start, plot.bottom + 9.8 * self.scale);
                let label = Label::new(anchor, words.clone(), Font::Sans, size, Role::FaintInk);
                if !words.is_empty() && start + label.width() + 2.0 <= next.max(start) {
                    self.scene
                        .add(MarkId::Scale, Layer::Labels, Shape::Label(label));
                    break;
                }
            }
        }
    }

    /// The retrograde stretch as a bar above the nights, events as marks on it, their names over them.
    fn events(&mut self, is_tall: bool) {
        let layout = self.layout;
        let plot = layout.plot;
        let rail = plot.top - 8.5 * self.scale.min(1.3) - 4.0;
        let middle_of = |instant: Tt| layout.x(layout.nights_to(instant));
        for one in &self.season.loops {
            let from = middle_of(one.station_retrograde.instant).max(plot.left);
            let to = middle_of(one.station_direct.instant).min(plot.right);
            if from < to {
                self.scene.add(
                    MarkId::Sheet,
                    Layer::Track,
                    Shape::Line {
                        points: vec![Point::new(from, rail), Point::new(to, rail)],
                        stroke: Stroke::of(Role::Retrograde, 2.0),
                    },
                );
            }
        }
        let mut events: Vec<(usize, u32)> = self
            .season
            .events
            .iter()
            .enumerate()
            .filter_map(|(index, event)| Some((index, weight(event.kind)?)))
            .collect();
        events.sort_by_key(|&(index, weight)| (weight, index));
        let size = 8.2 * self.scale;
        let rows: &[f64] = if is_tall { &[1.0, 2.3] } else { &[1.0] };
        let mut taken: Vec<Rect> = Vec::new();
        let mut marked: Vec<f64> = Vec::new();
        for (index, _) in events {
            let Some(event) = self.season.events.get(index) else {
                continue;
            };
            let Some((glyph, words)) = marks::told(event.kind) else {
                continue;
            };
            let x = middle_of(event.instant);
            if x < plot.left || plot.right < x {
                continue;
            }
            let id = MarkId::Event(index);
            let notch = Shape::Line {
                points: vec![Point::new(x, rail), Point::new(x, plot.top + 3.0)],
                stroke: Stroke::of(Role::FaintInk, 0.8),
            };
            self.scene.add(id, Layer::Ticks, notch);
            // Marks that would cover each other: the weightier one stands.
            if marked
                .iter()
                .all(|other| (other - x).abs() > 2.2 * marks::RADIUS)
            {
                marked.push(x);
                marks::draw(
                    &mut self.scene,
                    id,
                    Layer::Marks,
                    glyph,
                    Point::new(x, rail),
                );
            }
            let date = self.text.event_dates.get(index).map_or("", String::as_str);
            let full = format!("{words}, {date}");
            let offers = if date.is_empty() {
                vec![words.to_owned()]
            } else {
                vec![full, words.to_owned()]
            };
            let place = rows
                .iter()
                .flat_map(|&row| offers.iter().map(move |words| (row, words)));
            for (row, words) in place {
                let base = rail - 6.0 - size * (row - 1.0);
                let mut label = Label::new(
                    Point::new(x, base),
                    words.clone(),
                    Font::Sans,
                    size,
                    Role::Ink,
                )
                .aligned(Align::Middle);
                let half = label.width() / 2.0;
                label.anchor.x =
                    x.clamp(half + 2.0, (self.scene.width - half - 2.0).max(half + 2.0));
                let bounds = label.bounds();
                let free = taken.iter().all(|other| {
                    !other.overlaps(&Rect::new(
                        bounds.left - 6.0,
                        bounds.top + 1.0,
                        bounds.right + 6.0,
                        bounds.bottom - 1.0,
                    ))
                });
                if free && bounds.top >= 0.0 {
                    taken.push(bounds);
                    self.scene.add(id, Layer::Labels, Shape::Label(label));
                    break;
                }
            }
        }
    }

    fn caption(&mut self) {
        let size = 7.6 * self.scale;
        let plot = self.layout.plot;
        let base = self.scene.height - 4.0 * self.scale;
        let anchor = Point::new(plot.left, base);
        let label = Label::new(
            anchor,
            self.text.caption.clone(),
            Font::Sans,
            size,
            Role::FaintInk,
        );
        if label.bounds().right <= self.scene.width {
            self.scene
                .add(MarkId::Sheet, Layer::Labels, Shape::Label(label));
        }
    }
}

/// In which order events are named where there is not room for all; `None` for those without a mark.
const fn weight(kind: EventKind) -> Option<u32> {
    Some(match kind {
        EventKind::Opposition | EventKind::InferiorConjunction => 0,
        EventKind::GreatestElongationEast | EventKind::GreatestElongationWest => 1,
        EventKind::StationRetrograde | EventKind::StationDirect => 2,
        EventKind::Conjunction | EventKind::SuperiorConjunction => 3,
        EventKind::GreatestBrightness => 4,
        EventKind::ClosestApproach => 5,
        _ => return None,
    })
}
