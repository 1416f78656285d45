//! The strip: a band along the ecliptic with a season's path on it, as a plate that can hang on a wall.
//!
//! Longitudes and latitudes are of the mean ecliptic and equinox of the middle of the season, so that stars stand
//! still; tracks are astrometric. A path too long for one row of sky is laid out in several. Dates and names come in as
//! text: this module makes no choice of time zone. The width of the track follows brightness on a fixed scale,
//! stars follow one of their own.

mod course;
mod furniture;
mod layout;
pub(super) mod marks;

use crate::season::Season;
use crate::sky::constellations::{Constellation, boundary_polylines};
use crate::sky::stars::Star;
use crate::sky::{Angle, Tt, Vec3};

use super::geometry::{self, Point, Rect};
use super::palette::Role;
use super::place::{Ground, Offer, Taken, around};
use super::scene::{Align, Label, Layer, MarkId, Paint, RibbonPoint, Scene, Shape, Stroke};
use super::text::{self, Font};
use course::{Course, Spot};
pub use layout::{StripLayout, StripRow};
use marks::Glyph;

/// How a strip is laid out.
#[derive(Clone, Debug, PartialEq)]
pub struct StripView {
    /// Of the whole sheet, points.
    pub width: f64,
    pub height: f64,
    /// Longitude grows to the left and north is up, as the sky is seen by someone facing the subject at its culmination
    /// south of the zenith; `false` turns the sky by half a turn, for a culmination north of the zenith: longitude grows
    /// to the right and south is up.
    pub east_left: bool,
    /// The piece of sky to show; `None` for all of the season's path, as large as it fits.
    pub window: Option<StripWindow>,
    /// With title, place, span, key and cautions around the sky; without them the sky fills the sheet.
    pub furniture: bool,
}

impl StripView {
    /// A4 across (ISO 216: 297 x 210 mm).
    pub const A4: StripView = StripView {
        width: 297.0 / 25.4 * 72.0,
        height: 210.0 / 25.4 * 72.0,
        east_left: true,
        window: None,
        furniture: true,
    };

    /// Width and height, within what can be drawn: 120 to 20 000 points.
    #[must_use]
    pub fn size(&self) -> (f64, f64) {
        let sound = |length: f64| {
            if length.is_finite() {
                length.clamp(120.0, 20_000.0)
            } else {
                120.0
            }
        };
        (sound(self.width), sound(self.height))
    }

    /// The layout that [`strip`] uses for this view.
    #[must_use]
    pub fn layout(&self, season: &Season, text: &StripText) -> StripLayout {
        StripLayout::new(season, self, furniture::sky_area(self, text))
    }
}

/// A piece of sky.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StripWindow {
    /// Ecliptic longitude and latitude of its middle.
    pub longitude: Angle,
    pub latitude: Angle,
    /// Length of the row, degrees.
    pub degrees_across: f64,
}

/// How much a date on the track matters.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum DateRank {
    /// The first of a month: a long tick, always labelled where there is room at all.
    Month,
    /// A day that is labelled if there is room.
    Day,
    /// A tick without a label.
    Fine,
}

/// A date to mark on the track.
#[derive(Clone, Debug, PartialEq)]
pub struct StripDate {
    pub instant: Tt,
    /// As it is to be printed; not used for a `Fine` one.
    pub label: String,
    pub rank: DateRank,
}

/// The words on a strip that depend on place, calendar and zone.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct StripText {
    pub title: String,
    /// Name of the place.
    pub place: String,
    /// The span in words, as in "November 2026 to May 2027".
    pub span: String,
    /// What the dates along the track mean, as in "dates at 21:00 CET, a tick every 5 days"; may be empty.
    pub date_note: String,
    /// Dates along the tracks.
    pub dates: Vec<StripDate>,
    /// The date of each event of the season, as it is to be printed, in the season's order.
    pub event_dates: Vec<String>,
    /// Sentences.
    pub cautions: Vec<String>,
}

/// Draws a season. `stars` need be no more than those to magnitude 7; all that lie on the strip and are bright enough for
/// its scale are drawn, at their places of the frame's epoch.
#[must_use]
pub fn strip(season: &Season, stars: &[Star], text: &StripText, view: &StripView) -> Scene {
    let layout = view.layout(season, text);
    let (width, height) = view.size();
    let mut scene = Scene {
        width,
        height,
        title: text.title.clone(),
        description: furniture::description(season, text),
        marks: Vec::new(),
    };
    let subject = Course::new(&season.track, season);
    let companions: Vec<Course> = season
        .companions
        .iter()
        .map(|track| Course::new(track, season))
        .collect();
    let sun = Course::new(&season.sun, season);
    furniture::sheet(&mut scene);
    let mut drawn = Drawn::default();
    for row in &layout.rows {
        let mut painter = RowPainter {
            scene: &mut scene,
            drawn: &mut drawn,
            ground: Ground::new(row.frame.grown(-3.0)),
            row,
            season,
            text,
            marked: Vec::new(),
        };
        let named = painter.sky(stars);
        painter.track(&subject);
        painter.other(&sun, Role::Sun);
        for course in &companions {
            painter.other(course, Role::Companion);
        }
        painter.keep_off_ecliptic();
        let groups = painter.events(&subject);
        painter.dates(&subject, DateRank::Month);
        for group in &groups {
            painter.tell(group);
        }
        painter.other_dates(&sun, Role::Sun);
        for course in &companions {
            painter.body_name(course, Role::Companion);
        }
        painter.body_name(&sun, Role::Sun);
        painter.dates(&subject, DateRank::Day);
        for course in &companions {
            painter.other_dates(course, Role::Companion);
        }
        painter.star_names(named);
        painter.ecliptic_name();
        painter.constellations();
        furniture::edges(&mut scene, row);
    }
    if view.furniture {
        furniture::title_block(&mut scene, text);
        furniture::key(&mut scene, season, text, &subject, &layout, &drawn);
        furniture::cautions(&mut scene, text);
    }
    scene.sort();
    scene
}

/// What came to be on the strip, and so has to be explained in the key.
#[derive(Clone, Debug, Default)]
struct Drawn {
    glyphs: Vec<Glyph>,
    retrograde: bool,
}

/// Width of a track in points by magnitude: fixed, so that charts can be compared. A curve of our own that changes
/// most between +2 and -3 and keeps Venus from being a bar and Neptune from being a hair.
fn track_width(magnitude: f64) -> f64 {
    1.5 + 5.6 / (1.0 + libm::pow(10.0, 0.32 * (magnitude + 0.7)))
}

/// The line of the Sun and of companions, points.
const OTHER_WIDTH: f64 = 1.15;

/// Radius of a star's dot in points by magnitude, on a row of that scale in points a degree.
fn star_radius(magnitude: f64, scale: f64) -> f64 {
    let size = libm::pow(scale / 16.0, 0.3).clamp(0.8, 1.3);
    (0.52 * libm::pow(10.0, 0.122 * (6.5 - magnitude)) * size).min(5.0)
}

/// The faintest stars drawn at a scale in points a degree.
fn star_limit(scale: f64) -> f64 {
    (4.4 + 1.8 * libm::log10(scale.max(1.0))).min(7.0)
}

/// Dot of a star: colour as a hint of warmth, faint ones almost into the ground.
fn star_paint(magnitude: f64, bv: Option<f32>) -> Paint {
    let bv = bv.map_or(0.4, f64::from);
    let paint = if bv > 0.4 {
        Paint::mixed(
            Role::Star,
            Role::StarWarm,
            ((bv - 0.4) / 1.2).min(1.0) * 0.75,
        )
    } else {
        Paint::mixed(
            Role::Star,
            Role::StarCool,
            ((0.4 - bv) / 0.6).clamp(0.0, 1.0) * 0.6,
        )
    };
    paint.faded((0.98 - 0.11 * (magnitude - 1.5)).clamp(0.32, 0.98))
}

/// A star with a name that may be written.
struct Named {
    hip: u32,
    name: &'static str,
    at: Point,
    radius: f64,
    magnitude: f64,
}

struct RowPainter<'a> {
    scene: &'a mut Scene,
    drawn: &'a mut Drawn,
    ground: Ground,
    row: &'a StripRow,
    season: &'a Season,
    text: &'a StripText,
    /// Marks of events on this row and the dates told beside them.
    marked: Vec<(Point, Vec<String>)>,
}

impl RowPainter<'_> {
    fn point(&self, spot: &Spot) -> Point {
        self.row.point(spot.longitude, spot.latitude)
    }

    /// The parts of a line on the row that lie in its frame. A line that runs round the back of the sky jumps from end
    /// to end of the sheet: it is cut there.
    fn clipped(&self, points: &[Point]) -> Vec<Vec<Point>> {
        let half_turn = 180.0 * self.row.scale;
        points
            .chunk_by(|a, b| (a.x - b.x).abs() < half_turn)
            .flat_map(|part| self.row.frame.clip_line(part))
            .collect()
    }

    fn line(&mut self, id: MarkId, layer: Layer, points: Vec<Point>, stroke: Stroke) {
        self.scene.add(id, layer, Shape::Line { points, stroke });
    }

    /// The plate, boundaries, ecliptic and stars. Hands back the stars that have names.
    fn sky(&mut self, stars: &[Star]) -> Vec<Named> {
        let frame = self.row.frame;
        self.scene.add(
            MarkId::Sheet,
            Layer::Plate,
            Shape::Area {
                rings: vec![frame.corners().to_vec()],
                fill: Paint::of(Role::Plate),
                edge: None,
            },
        );
        let to_ecliptic = self.season.frame.ecliptic_from_icrs;
        for (index, boundary) in boundary_polylines().iter().enumerate() {
            let points: Vec<Point> = boundary
                .points
                .iter()
                .map(|&direction| self.row.point_of(to_ecliptic * direction))
                .collect();
            for line in self.clipped(&points) {
                let stroke = Stroke {
                    dash: Some((2.6, 1.7)),
                    ..Stroke::of(Role::Boundary, 0.6)
                };
                self.line(MarkId::Boundary(index), Layer::Boundaries, line, stroke);
            }
        }
        furniture::ecliptic(self.scene, self.row);
        let limit = star_limit(self.row.scale);
        let mut named = Vec::new();
        for star in stars {
            if star.magnitude > limit {
                continue;
            }
            let place = to_ecliptic * star.direction_at(self.season.frame.epoch);
            let at = self.row.point_of(place);
            let radius = star_radius(star.magnitude, self.row.scale);
            if !at.is_finite() || !frame.grown(-radius - 0.5).contains(at) {
                continue;
            }
            self.ground.dot(at, radius, 2.0 + 4.0 * radius * radius);
            self.scene.add(
                MarkId::Star(star.hip),
                Layer::Stars,
                Shape::Disc {
                    centre: at,
                    radius,
                    fill: star_paint(star.magnitude, star.bv),
                },
            );
            named.extend(star.name.map(|name| Named {
                hip: star.hip,
                name,
                at,
                radius,
                magnitude: star.magnitude,
            }));
        }
        named
    }

    /// The path of the Sun or of a companion: a fine line, a dot at the first of each month.
    fn other(&mut self, course: &Course, role: Role) {
        let ribbon: Vec<RibbonPoint> = course
            .dense(self.row.scale)
            .iter()
            .map(|spot| RibbonPoint {
                at: self.point(spot),
                width: OTHER_WIDTH,
                paint: Paint::of(role),
                index: spot.index,
            })
            .collect();
        for (index, spot) in self.month_spots(course) {
            let centre = self.point(&spot);
            // Under the subject's track it could not be read.
            if self.ground.room(&Rect::around(centre, 3.0, 3.0), 1.0) < 0.9 {
                continue;
            }
            let id = MarkId::OtherTick {
                body: course.body,
                date: index,
            };
            let radius: f64 = if role == Role::Sun {
                let stroke = Stroke::of(role, 0.6);
                let ring = Shape::Ring {
                    centre,
                    radius: 3.2,
                    stroke,
                };
                self.scene.add(
                    id,
                    Layer::Others,
                    Shape::Disc {
                        centre,
                        radius: 3.2,
                        fill: Paint::of(Role::Plate),
                    },
                );
                self.scene.add(id, Layer::Others, ring);
                3.6
            } else {
                1.7
            };
            let fill = Paint::of(role);
            self.scene.add(
                id,
                Layer::Others,
                Shape::Disc {
                    centre,
                    radius: radius.min(1.7),
                    fill,
                },
            );
            self.ground.line(centre, centre, radius);
        }
        for part in self.clip_ribbon(&ribbon) {
            self.keep_off(&part);
            // Under the dots.
            self.scene.add(
                MarkId::Track(course.body),
                Layer::OtherPaths,
                Shape::Ribbon(part),
            );
        }
    }

    /// Keeps labels off the ecliptic.
    fn keep_off_ecliptic(&mut self) {
        let frame = self.row.frame;
        let y = self.row.point(self.row.longitude, 0.0).y;
        let (from, to) = (Point::new(frame.left, y), Point::new(frame.right, y));
        self.ground.line(from, to, 0.3);
    }

    /// Where a body stands at the first of each month, with the date's place in the list.
    fn month_spots(&self, course: &Course) -> Vec<(usize, Spot)> {
        let frame = self.row.frame.grown(-3.0);
        self.text
            .dates
            .iter()
            .enumerate()
            .filter(|(_, date)| date.rank == DateRank::Month)
            .filter_map(|(index, date)| Some((index, course.at(date.instant)?)))
            .filter(|(_, spot)| frame.contains(self.point(spot)))
            .collect()
    }

    /// Keeps labels off a path.
    fn keep_off(&mut self, path: &[RibbonPoint]) {
        const STEP: f64 = 4.0;
        let Some(mut from) = path.first().copied() else {
            return;
        };
        for (index, &to) in path.iter().enumerate() {
            if from.at.distance(to.at) >= STEP || index + 1 == path.len() {
                self.ground
                    .line(from.at, to.at, from.width.max(to.width) / 2.0);
                from = to;
            }
        }
    }

    /// The parts of a ribbon in the frame.
    fn clip_ribbon(&self, ribbon: &[RibbonPoint]) -> Vec<Vec<RibbonPoint>> {
        let half_turn = 180.0 * self.row.scale;
        let mut parts: Vec<Vec<RibbonPoint>> = Vec::new();
        let mut open = false;
        for pair in ribbon.windows(2) {
            let &[from, to] = pair else { continue };
            let cut = self.row.frame.clip(from.at, to.at);
            let Some((enter, leave)) = cut.filter(|_| (from.at.x - to.at.x).abs() < half_turn)
            else {
                open = false;
                continue;
            };
            let cut_at = |part: f64| RibbonPoint {
                at: from.at.between(to.at, part),
                width: from.width + (to.width - from.width) * part,
                ..if part < 0.5 { from } else { to }
            };
            match parts.last_mut() {
                Some(part) if open && enter == 0.0 => part.push(cut_at(leave)),
                _ => parts.push(vec![cut_at(enter), cut_at(leave)]),
            }
            open = leave == 1.0;
        }
        parts
    }

    /// Part (0 to 1) of the season gone at an instant.
    fn gone(&self, days: f64) -> f64 {
        let span = self.season.span;
        if span.days() > 0.0 {
            ((days - span.from.days()) / span.days()).clamp(0.0, 1.0)
        } else {
            0.0
        }
    }

    /// The subject's track: width by brightness, tone by date, the retrograde part with a light line within, the later
    /// strand passing over the earlier one.
    fn track(&mut self, course: &Course) {
        let id = MarkId::Track(course.body);
        let ribbon: Vec<RibbonPoint> = course
            .dense(self.row.scale)
            .iter()
            .map(|spot| RibbonPoint {
                at: self.point(spot),
                width: track_width(spot.magnitude.unwrap_or(9.0)),
                paint: if spot.rate < 0.0 {
                    Paint::of(Role::Retrograde)
                } else {
                    Paint::mixed(Role::Subject, Role::SubjectLate, self.gone(spot.days))
                },
                index: spot.index,
            })
            .collect();
        for part in self.clip_ribbon(&ribbon) {
            self.keep_off(&part);
            // Companions, boundaries and the ecliptic keep a little off.
            self.scene.add(
                id,
                Layer::Track,
                Shape::Ribbon(repainted(&part, |point| point.width + 2.4)),
            );
            let mut begun = 0;
            for (over_from, over_to) in passages_over(&part) {
                self.strand(id, part.get(begun..=over_from).unwrap_or_default());
                let over = part.get(over_from..=over_to).unwrap_or_default();
                self.scene.add(
                    id,
                    Layer::Track,
                    Shape::Ribbon(repainted(over, |point| point.width + 2.6)),
                );
                begun = over_from.saturating_sub(1);
            }
            self.strand(id, part.get(begun..).unwrap_or_default());
        }
        self.arrow(id, &ribbon);
    }

    /// A head at the end of the path: which way it is travelled.
    fn arrow(&mut self, id: MarkId, ribbon: &[RibbonPoint]) {
        let [.., before, last] = ribbon else { return };
        let along = last.at.minus(before.at).unit();
        let (long, half) = (last.width * 1.2 + 4.0, last.width / 2.0 + 2.0);
        let tip = last.at.towards(along, long);
        if !self.row.frame.grown(-2.0).contains(tip) || along.length() == 0.0 {
            return;
        }
        let foot = last.at.towards(along, -0.3);
        let across = along.turned();
        self.ground.line(last.at, tip, half);
        self.scene.add(
            id,
            Layer::Track,
            Shape::Area {
                rings: vec![vec![
                    tip,
                    foot.towards(across, half),
                    foot.towards(across, -half),
                ]],
                fill: last.paint,
                edge: None,
            },
        );
    }

    fn strand(&mut self, id: MarkId, points: &[RibbonPoint]) {
        if points.len() < 2 {
            return;
        }
        self.scene
            .add(id, Layer::Track, Shape::Ribbon(points.to_vec()));
        let retrograde = |point: &RibbonPoint| point.paint.role == Role::Retrograde;
        for back in points.chunk_by(|a, b| retrograde(a) == retrograde(b)) {
            if back.len() > 2 && back.first().is_some_and(retrograde) {
                self.drawn.retrograde = true;
                self.scene
                    .add(id, Layer::Track, Shape::Ribbon(light_line(back)));
            }
        }
    }

    /// Unit vector along a path on the sheet.
    fn along(&self, course: &Course, spot: &Spot) -> Point {
        let near = |days: f64| {
            course
                .at(Tt::from_days(spot.days + days))
                .map_or(self.point(spot), |spot| self.point(&spot))
        };
        let along = near(0.4).minus(near(-0.4)).unit();
        if along.length() > 0.0 {
            along
        } else {
            Point::new(1.0, 0.0)
        }
    }

    /// Ticks of one rank square to the track, with labels clear of it; with the days come the fine ones.
    fn dates(&mut self, course: &Course, rank: DateRank) {
        let mut last: Option<Point> = None;
        for (index, date) in self.text.dates.iter().enumerate() {
            let Some(spot) = course.at(date.instant) else {
                continue;
            };
            let at = self.point(&spot);
            // Close to a station ticks would run into each other.
            let crowded = last.is_some_and(|last: Point| last.distance(at) < 2.6);
            if !crowded || date.rank == DateRank::Month {
                last = Some(at);
            }
            let wanted = match rank {
                DateRank::Month => date.rank == DateRank::Month,
                _ => date.rank != DateRank::Month && !crowded,
            };
            let at_mark = self
                .marked
                .iter()
                .find(|(mark, _)| mark.distance(at) < marks::RADIUS + 1.6);
            if !wanted || !self.row.frame.grown(-2.0).contains(at) {
                continue;
            }
            // The mark of an event stands for a tick beneath it, its words for the same date.
            if at_mark
                .is_some_and(|(_, dates)| rank == DateRank::Day || dates.contains(&date.label))
            {
                continue;
            }
            let normal = self.along(course, &spot).turned();
            let width = track_width(spot.magnitude.unwrap_or(9.0));
            let (reach, stroke) = match date.rank {
                DateRank::Month => (width / 2.0 + 3.4, Stroke::of(Role::Ink, 0.95)),
                DateRank::Day => (width / 2.0 + 1.9, Stroke::of(Role::Ink, 0.6)),
                DateRank::Fine => (width / 2.0 + 1.0, Stroke::of(Role::Ink, 0.4)),
            };
            let (end, start) = (at.towards(normal, reach), at.towards(normal, -reach));
            self.ground.line(start, end, stroke.width / 2.0);
            self.line(MarkId::Tick(index), Layer::Ticks, vec![start, end], stroke);
            let label = match date.rank {
                DateRank::Month => {
                    Label::new(at, date.label.as_str(), Font::SansStrong, 9.6, Role::Ink)
                }
                DateRank::Day => {
                    Label::new(at, date.label.as_str(), Font::Sans, 7.6, Role::FaintInk)
                }
                DateRank::Fine => continue,
            };
            if !self.row.owns(spot.longitude) {
                continue;
            }
            let may_lead = date.rank == DateRank::Month;
            let offers = beside(at, normal, reach, &label, may_lead);
            // Across another strand a leader would give the date to that one: then rather no label.
            if let Some(taken) = self.ground.take(offers) {
                self.label(MarkId::Tick(index), label, taken, Role::FaintInk);
            }
        }
    }

    /// Puts a label into the place found, with its leader.
    fn label(&mut self, id: MarkId, mut label: Label, taken: Taken, leader: Role) {
        label.anchor = Point::new(
            taken.bounds.left,
            taken.bounds.bottom - label.font.descent() * label.size,
        );
        label.align = Align::Start;
        self.scene.add(id, Layer::Labels, Shape::Label(label));
        self.leader(id, taken, leader);
    }

    fn leader(&mut self, id: MarkId, taken: Taken, role: Role) {
        if let Some((from, to)) = taken.leader {
            self.line(id, Layer::Leaders, vec![from, to], Stroke::of(role, 0.45));
        }
    }

    /// Dates of another body at the first of each month.
    fn other_dates(&mut self, course: &Course, role: Role) {
        for (index, spot) in self.month_spots(course) {
            let Some(date) = self.text.dates.get(index) else {
                continue;
            };
            let id = MarkId::OtherTick {
                body: course.body,
                date: index,
            };
            let is_drawn = self.scene.marks.iter().any(|mark| mark.id == id);
            if !is_drawn || !self.row.owns(spot.longitude) {
                continue;
            }
            let near = if role == Role::Sun { 5.4 } else { 3.6 };
            let label = Label::new(Point::default(), date.label.as_str(), Font::Sans, 6.8, role);
            let at = self.point(&spot);
            let offers = around(at, size(&label), 0.0, &[near, near + 1.6], 8, 99.0, None);
            if let Some(taken) = self.ground.take(offers) {
                self.label(id, label, taken, role);
            }
        }
    }

    /// The ecliptic's own name, where there is room along it.
    fn ecliptic_name(&mut self) {
        let frame = self.row.frame;
        let y = self.row.point(self.row.longitude, 0.0).y;
        if !frame.grown(-12.0).contains(Point::new(frame.centre().x, y)) {
            return;
        }
        let label = Label::new(
            Point::default(),
            "ecliptic",
            Font::SerifItalic,
            8.6,
            Role::FaintInk,
        )
        .spaced(0.8);
        let (width, height) = size(&label);
        let mut offers = Vec::new();
        let mut x = frame.left + 8.0 + width / 2.0;
        while x < frame.right - width / 2.0 {
            for (side, cost) in [(-1.0, 0.0), (1.0, 4.0)] {
                let centre = Point::new(x, y + side * (height / 2.0 + 2.5));
                offers.push(Offer {
                    bounds: Rect::around(centre, width, height),
                    cost: cost + 0.02 * (x - frame.left),
                    leader_from: None,
                });
            }
            x += 12.0;
        }
        if let Some(taken) = self.ground.take(offers) {
            self.label(MarkId::Scale, label, taken, Role::FaintInk);
        }
    }

    /// The name of a body beside its path, once a row.
    fn body_name(&mut self, course: &Course, role: Role) {
        let label = Label {
            halo: 1.2,
            ..Label::new(
                Point::default(),
                course.body.name(),
                Font::SerifItalic,
                12.0,
                role,
            )
        };
        // A little apart from the names of stars, which look alike.
        const APART: f64 = 5.0;
        let (width, height) = size(&label);
        let mut offers = Vec::new();
        for spot in course.samples() {
            let at = self.point(spot);
            if self.row.frame.grown(-8.0).contains(at) {
                offers.extend(around(
                    at,
                    (width + 2.0 * APART, height),
                    0.0,
                    &[4.0, 7.0],
                    8,
                    99.0,
                    None,
                ));
            }
        }
        if let Some(mut taken) = self.ground.take(offers) {
            taken.bounds.left += APART;
            taken.bounds.right -= APART;
            self.label(MarkId::BodyName(course.body), label, taken, role);
        }
    }

    /// The subject's events: marks on the track. Hands back what is to be told beside them.
    fn events(&mut self, course: &Course) -> Vec<Vec<Told>> {
        let mut groups: Vec<Vec<Told>> = Vec::new();
        for (index, event) in self.season.events.iter().enumerate() {
            let Some((glyph, words)) = marks::told(event.kind) else {
                continue;
            };
            let Some(spot) = course
                .at(event.instant)
                .filter(|_| event.body == course.body)
            else {
                continue;
            };
            let at = self.point(&spot);
            if !self.row.frame.grown(-3.0).contains(at) {
                continue;
            }
            let told = Told {
                index,
                glyph,
                at,
                longitude: spot.longitude,
                square: self.along(course, &spot).turned(),
                date: self
                    .text
                    .event_dates
                    .get(index)
                    .cloned()
                    .unwrap_or_default(),
                words: match marks::value(&event.value) {
                    Some(value) => format!("{words}, {value}"),
                    None => words.to_owned(),
                },
            };
            match groups.iter_mut().find(|group| {
                group
                    .first()
                    .is_some_and(|first| first.at.distance(at) < 9.0)
            }) {
                Some(group) => group.push(told),
                None => groups.push(vec![told]),
            }
        }
        for group in &groups {
            // The first by rank of glyph stands on the track for all of them.
            let Some(chief) = group.iter().min_by_key(|told| told.glyph) else {
                continue;
            };
            for told in group {
                if !self.drawn.glyphs.contains(&told.glyph) {
                    self.drawn.glyphs.push(told.glyph);
                }
            }
            self.ground.line(chief.at, chief.at, marks::RADIUS + 0.5);
            marks::draw(
                self.scene,
                MarkId::Event(chief.index),
                Layer::Marks,
                chief.glyph,
                chief.at,
            );
        }
        for group in &groups {
            self.marked.extend(group.first().map(|first| {
                let dates = group.iter().map(|told| told.date.clone()).collect();
                (first.at, dates)
            }));
        }
        groups
    }

    /// The words of events that stand at one place.
    fn tell(&mut self, group: &[Told]) {
        const SIZE: f64 = 9.6;
        const LEADING: f64 = 12.4;
        let Some(chief) = group.iter().min_by_key(|told| told.glyph) else {
            return;
        };
        if !self.row.owns(chief.longitude) {
            return;
        }
        let dates = group
            .iter()
            .map(|told| text::width(&told.date, Font::SansStrong, SIZE, 0.0))
            .fold(0.0, f64::max);
        let words = group
            .iter()
            .map(|told| text::width(&told.words, Font::Sans, SIZE, 0.0))
            .fold(0.0, f64::max);
        let gap = if dates > 0.0 { 5.0 } else { 0.0 };
        let glyph_width = 2.0 * marks::RADIUS + 4.0;
        let bare = dates + gap + words;
        let height = LEADING * (group.len() - 1) as f64
            + (Font::Sans.ascent() + Font::Sans.descent()) * SIZE;
        let distances = [
            7.0, 10.0, 14.0, 18.0, 24.0, 30.0, 38.0, 48.0, 60.0, 75.0, 95.0, 120.0, 150.0, 190.0,
        ];
        let mut with_glyphs = group.len() > 1;
        let width = if with_glyphs {
            bare + glyph_width
        } else {
            bare
        };
        let offers = around(
            chief.at,
            (width, height),
            marks::RADIUS + 1.0,
            &distances,
            24,
            8.0,
            Some(chief.square),
        );
        let mut taken = self.ground.take_across(&offers);
        if taken.is_none() {
            // No leader gets through: the mark itself, repeated before the words, ties them to the path.
            with_glyphs = true;
            let offers = self.anywhere(chief.at, bare + glyph_width, height);
            taken = self.ground.take(offers);
        }
        let Some(taken) = taken else {
            return;
        };
        self.leader(MarkId::Event(chief.index), taken, Role::FaintInk);
        for (line, told) in group.iter().enumerate() {
            let id = MarkId::Event(told.index);
            let base = taken.bounds.top + Font::Sans.ascent() * SIZE + LEADING * line as f64;
            let mut x = taken.bounds.left;
            if with_glyphs {
                let middle = Point::new(x + marks::RADIUS, base - 0.34 * SIZE);
                marks::draw(self.scene, id, Layer::Labels, told.glyph, middle);
                x += glyph_width;
            }
            for (words, font) in [(&told.date, Font::SansStrong), (&told.words, Font::Sans)] {
                if !words.is_empty() {
                    let label =
                        Label::new(Point::new(x, base), words.as_str(), font, SIZE, Role::Ink);
                    self.scene.add(id, Layer::Labels, Shape::Label(label));
                }
                if font == Font::SansStrong {
                    x += dates + gap;
                }
            }
        }
    }

    /// Places all over the row, the nearest to a point cheapest, without leaders.
    fn anywhere(&self, near: Point, width: f64, height: f64) -> Vec<Offer> {
        const STEP: f64 = 7.0;
        let frame = self.row.frame;
        let mut offers = Vec::new();
        let mut y = frame.top + height / 2.0;
        while y < frame.bottom {
            let mut x = frame.left + width / 2.0;
            while x < frame.right {
                let bounds = Rect::around(Point::new(x, y), width, height);
                offers.push(Offer {
                    bounds,
                    cost: bounds.nearest(near).distance(near),
                    leader_from: None,
                });
                x += STEP;
            }
            y += STEP;
        }
        offers
    }

    /// Names of the bright stars, small, out of the way.
    fn star_names(&mut self, mut named: Vec<Named>) {
        let faintest = if self.row.scale > 12.0 { 3.6 } else { 2.6 };
        named.retain(|star| star.magnitude <= faintest);
        named.sort_by(|a, b| a.magnitude.total_cmp(&b.magnitude));
        for star in named.into_iter().take(16) {
            let label = Label {
                halo: 0.9,
                ..Label::new(star.at, star.name, Font::SerifItalic, 9.2, Role::FaintInk).spaced(0.5)
            };
            let near = star.radius + 2.2;
            let offers = around(
                star.at,
                size(&label),
                0.0,
                &[near, near + 2.5],
                16,
                99.0,
                None,
            );
            if let Some(taken) = self.ground.take(offers) {
                self.label(MarkId::Star(star.hip), label, taken, Role::FaintInk);
            }
        }
    }

    /// Wide pale names, each where its constellation has most room on the row.
    fn constellations(&mut self) {
        const STEP: f64 = 12.0;
        let frame = self.row.frame;
        let icrs_from_ecliptic = self.season.frame.ecliptic_from_icrs.transposed();
        let row = self.row;
        let at = |point: Point| {
            let (longitude, latitude) = row.place(point);
            Constellation::at_icrs(
                icrs_from_ecliptic
                    * Vec3::from_spherical(
                        Angle::from_degrees(longitude),
                        Angle::from_degrees(latitude),
                    ),
            )
        };
        let mut cells: Vec<(Constellation, Point)> = Vec::new();
        let mut y = frame.top + STEP;
        while y < frame.bottom {
            let mut x = frame.left + STEP;
            while x < frame.right {
                let point = Point::new(x, y);
                cells.push((at(point), point));
                x += STEP;
            }
            y += STEP;
        }
        cells.sort_by_key(|cell| cell.0);
        let large = if row.frame.height() > 220.0 {
            15.0
        } else {
            11.0
        };
        for region in cells.chunk_by(|a, b| a.0 == b.0) {
            let Some(&(constellation, _)) = region.first() else {
                continue;
            };
            let count = region.len() as f64;
            let middle = region.iter().fold(Point::default(), |sum, cell| {
                sum.moved(cell.1.x / count, cell.1.y / count)
            });
            let label = Label::new(
                middle,
                constellation.name().to_uppercase(),
                Font::SerifItalic,
                large,
                Role::RegionName,
            )
            .spaced(large * 0.42);
            let offers: Vec<Offer> = region
                .iter()
                .filter_map(|&(_, centre)| {
                    let (width, height) = size(&label);
                    let bounds = Rect::around(centre, width, height);
                    let around = bounds.grown(4.0);
                    if !frame.grown(-6.0).holds(&around) {
                        return None;
                    }
                    around
                        .corners()
                        .into_iter()
                        .chain([bounds.centre()])
                        .all(|corner| at(corner) == constellation)
                        .then(|| Offer {
                            bounds,
                            cost: 0.04 * centre.distance(middle) - self.ground.room(&bounds, 30.0),
                            leader_from: None,
                        })
                })
                .collect();
            if let Some(taken) = self.ground.take(offers) {
                self.label(
                    MarkId::Constellation(constellation),
                    label,
                    taken,
                    Role::RegionName,
                );
            }
        }
    }
}

/// An event as it is told on the strip.
struct Told {
    index: usize,
    glyph: Glyph,
    at: Point,
    longitude: f64,
    /// Unit vector square to the path.
    square: Point,
    date: String,
    words: String,
}

fn size(label: &Label) -> (f64, f64) {
    let bounds = label.bounds();
    (bounds.width(), bounds.height())
}

/// Places for a date beside its tick, on both sides; those farther off with a leader.
fn beside(at: Point, normal: Point, reach: f64, label: &Label, may_lead: bool) -> Vec<Offer> {
    const STEPS: [f64; 10] = [2.2, 4.0, 7.0, 11.0, 16.0, 22.0, 29.0, 38.0, 49.0, 62.0];
    const SHIFTS: [f64; 9] = [0.0, 4.0, -4.0, 9.0, -9.0, 16.0, -16.0, 26.0, -26.0];
    let (width, height) = size(label);
    let along = normal.turned();
    let mut offers = Vec::new();
    for step in STEPS {
        for shift in SHIFTS {
            for out in [normal, normal.towards(normal, -2.0)] {
                let end = at.towards(out, reach);
                let support = out.x.abs() * width / 2.0 + out.y.abs() * height / 2.0;
                let centre = end.towards(out, step + support).towards(along, shift);
                let led = step > 5.0 || shift.abs() > 10.0;
                if led && !may_lead {
                    continue;
                }
                offers.push(Offer {
                    bounds: Rect::around(centre, width, height),
                    cost: step + 0.5 * shift.abs(),
                    leader_from: led.then(|| end.towards(out, 0.8)),
                });
            }
        }
    }
    offers
}

/// The same ribbon in the plate's colour, at another width.
fn repainted(points: &[RibbonPoint], width: impl Fn(&RibbonPoint) -> f64) -> Vec<RibbonPoint> {
    points
        .iter()
        .map(|point| RibbonPoint {
            width: width(point),
            paint: Paint::of(Role::Plate),
            ..*point
        })
        .collect()
}

/// The light line within a retrograde stretch.
fn light_line(points: &[RibbonPoint]) -> Vec<RibbonPoint> {
    repainted(points, |point| (0.24 * point.width).clamp(0.6, 1.6))
}

/// Where a path passes over an earlier part of itself: first and last point of the stretches on top, in order.
fn passages_over(points: &[RibbonPoint]) -> Vec<(usize, usize)> {
    /// Parts of a path nearer than this along it do not cross, they turn: points.
    const APART: f64 = 26.0;
    let mut lengths = Vec::with_capacity(points.len());
    let mut length = 0.0;
    let mut last: Option<Point> = None;
    for point in points {
        length += last.map_or(0.0, |last: Point| last.distance(point.at));
        lengths.push(length);
        last = Some(point.at);
    }
    let mut passages: Vec<(usize, usize)> = Vec::new();
    for (later, pair) in points.windows(2).enumerate() {
        let &[from, to] = pair else { continue };
        for (earlier, first) in points.windows(2).enumerate() {
            let &[a, b] = first else { continue };
            if lengths[earlier + 1] + APART > lengths[later] {
                break;
            }
            if geometry::crossing((from.at, to.at), (a.at, b.at)).is_none() {
                continue;
            }
            // The gap reaches as far as the two strands lie upon each other.
            let sine = b.at.minus(a.at).unit().cross(to.at.minus(from.at).unit());
            let half = ((a.width / 2.0 + 3.0) / sine.abs().max(0.05)).min(60.0) + to.width;
            let near = |index: &usize| (lengths[*index] - lengths[later]).abs() <= half;
            let first_over = (0..=later).rev().take_while(near).last().unwrap_or(later);
            let last_over = (later + 1..points.len())
                .take_while(near)
                .last()
                .unwrap_or(later + 1);
            match passages.last_mut() {
                Some(before) if first_over <= before.1 => before.1 = before.1.max(last_over),
                _ => passages.push((first_over, last_over)),
            }
        }
    }
    passages
}
