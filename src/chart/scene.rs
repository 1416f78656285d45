//! A picture as plain shapes and labels, in points (1/72 inch), y down. Every output draws this same picture.
//!
//! Colours are roles (see [`super::palette`]); text carries its box, measured by the shipped fonts. Numbers are `f64`;
//! the text dump rounds them to 0.01 point and is the same on every system.

use std::fmt;

use crate::sky::Body;
use crate::sky::constellations::Constellation;

use super::geometry::{self, Point, Rect};
use super::palette::{Palette, Rgb, Role};
use super::text::{self, Font};

/// What a mark stands for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum MarkId {
    /// Paper, frames, scales, title and key: nothing to point at.
    Sheet,
    /// Degrees along the edges, and the ecliptic.
    Scale,
    /// IAU boundary, by its place in the list handed in.
    Boundary(usize),
    /// The name of a constellation.
    Constellation(Constellation),
    /// A star by its number in the Hipparcos catalogue.
    Star(u32),
    /// The whole path of a body; a hit on it becomes a `TrackPoint`.
    Track(Body),
    /// A sample of a body's path.
    TrackPoint { body: Body, index: usize },
    /// The name of a body beside its path.
    BodyName(Body),
    /// An event of the season, by its place in the season's list.
    Event(usize),
    /// A date on the subject's path, by its place in the list handed in.
    Tick(usize),
    /// A date on the path of another body.
    OtherTick { body: Body, date: usize },
    /// A night of the timeline, by its place in the season.
    Night(usize),
    /// Where a body stands at the moment shown.
    Moment(Body),
    /// The moment shown, on the timeline.
    Cursor,
    /// The silhouette of the horizon with what is written in it.
    Skyline,
}

/// What lies over what; later ones cover earlier ones.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Layer {
    Sheet,
    Plate,
    /// Twilight and glare.
    Shade,
    Boundaries,
    Scale,
    Stars,
    /// Paths of companions and of the Sun.
    OtherPaths,
    /// Dates on them.
    Others,
    Track,
    Ticks,
    Marks,
    Leaders,
    /// The silhouette of the horizon.
    Skyline,
    Labels,
    Frame,
}

impl Layer {
    /// The word that stands for the layer in text dumps and in the groups of an SVG.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Layer::Sheet => "sheet",
            Layer::Plate => "plate",
            Layer::Shade => "shade",
            Layer::Boundaries => "boundaries",
            Layer::Scale => "scale",
            Layer::Stars => "stars",
            Layer::OtherPaths => "other-paths",
            Layer::Others => "others",
            Layer::Track => "track",
            Layer::Ticks => "ticks",
            Layer::Marks => "marks",
            Layer::Leaders => "leaders",
            Layer::Skyline => "skyline",
            Layer::Labels => "labels",
            Layer::Frame => "frame",
        }
    }
}

/// A colour before a palette resolves it: `amount` (0 to 1) of the way from one role to another.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Paint {
    pub role: Role,
    pub toward: Role,
    pub amount: f64,
    /// 1 covers what lies beneath, 0 shows nothing.
    pub opacity: f64,
}

impl Paint {
    #[must_use]
    pub const fn of(role: Role) -> Self {
        Paint {
            role,
            toward: role,
            amount: 0.0,
            opacity: 1.0,
        }
    }

    #[must_use]
    pub const fn mixed(role: Role, toward: Role, amount: f64) -> Self {
        Paint {
            role,
            toward,
            amount,
            opacity: 1.0,
        }
    }

    #[must_use]
    pub const fn faded(self, opacity: f64) -> Self {
        Paint { opacity, ..self }
    }

    /// The colour in a palette; the opacity stays apart.
    #[must_use]
    pub fn colour(&self, palette: &Palette) -> Rgb {
        palette
            .colour(self.role)
            .mixed(palette.colour(self.toward), self.amount)
    }
}

impl fmt::Display for Paint {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.role.word())?;
        if self.toward != self.role {
            write!(f, ">{}:{:.2}", self.toward.word(), self.amount)?;
        }
        if self.opacity < 1.0 {
            write!(f, "@{:.2}", self.opacity)?;
        }
        Ok(())
    }
}

/// A line's paint and width in points.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stroke {
    pub paint: Paint,
    pub width: f64,
    /// Lengths of stroke and gap in points; `None` for a whole line.
    pub dash: Option<(f64, f64)>,
}

impl Stroke {
    #[must_use]
    pub const fn of(role: Role, width: f64) -> Self {
        Stroke {
            paint: Paint::of(role),
            width,
            dash: None,
        }
    }
}

/// A point of a line whose width and tone change along it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RibbonPoint {
    pub at: Point,
    pub width: f64,
    pub paint: Paint,
    /// The sample of the path it belongs to.
    pub index: usize,
}

/// A stop of a gradient: `part` (0 to 1) of the way.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stop {
    pub part: f64,
    pub paint: Paint,
}

/// Which way a gradient runs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Run {
    Along { from: Point, to: Point },
    Around { centre: Point, radius: f64 },
}

/// Where a label's anchor stands on its text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Align {
    Start,
    Middle,
    End,
}

/// A line of text.
#[derive(Clone, Debug, PartialEq)]
pub struct Label {
    /// On the baseline, at the start, middle or end of the text.
    pub anchor: Point,
    pub align: Align,
    pub text: String,
    pub font: Font,
    /// Size of the em in points.
    pub size: f64,
    /// Extra space between letters, points.
    pub spacing: f64,
    /// Clockwise about the anchor, degrees.
    pub rotation_degrees: f64,
    pub paint: Paint,
    /// Width of the band in the plate's colour around the letters, points; 0 for none.
    pub halo: f64,
}

impl Label {
    #[must_use]
    pub fn new(anchor: Point, text: impl Into<String>, font: Font, size: f64, role: Role) -> Self {
        Label {
            anchor,
            align: Align::Start,
            text: text.into(),
            font,
            size,
            spacing: 0.0,
            rotation_degrees: 0.0,
            paint: Paint::of(role),
            halo: 0.0,
        }
    }

    #[must_use]
    pub fn aligned(self, align: Align) -> Self {
        Label { align, ..self }
    }

    #[must_use]
    pub fn spaced(self, spacing: f64) -> Self {
        Label { spacing, ..self }
    }

    #[must_use]
    pub fn width(&self) -> f64 {
        text::width(&self.text, self.font, self.size, self.spacing)
    }

    /// Where the text begins, on the baseline, before it is turned.
    #[must_use]
    pub fn start(&self) -> Point {
        let back = match self.align {
            Align::Start => 0.0,
            Align::Middle => self.width() / 2.0,
            Align::End => self.width(),
        };
        self.anchor.moved(-back, 0.0)
    }

    /// The box of the text; of a turned one, the upright box around it.
    #[must_use]
    pub fn bounds(&self) -> Rect {
        let start = self.start();
        let flat = Rect::new(
            start.x,
            start.y - self.font.ascent() * self.size,
            start.x + self.width(),
            start.y + self.font.descent() * self.size,
        );
        if self.rotation_degrees == 0.0 {
            return flat;
        }
        let (sin, cos) = libm::sincos(self.rotation_degrees.to_radians());
        let turned = flat.corners().map(|corner| {
            let from = corner.minus(self.anchor);
            self.anchor
                .moved(from.x * cos - from.y * sin, from.x * sin + from.y * cos)
        });
        let [first, ..] = turned;
        turned.into_iter().fold(
            Rect::new(first.x, first.y, first.x, first.y),
            |around, corner| around.union(&Rect::new(corner.x, corner.y, corner.x, corner.y)),
        )
    }
}

/// The geometry of a mark.
#[derive(Clone, Debug, PartialEq)]
pub enum Shape {
    Line {
        points: Vec<Point>,
        stroke: Stroke,
    },
    /// A line whose width and tone change along it.
    Ribbon(Vec<RibbonPoint>),
    /// Filled rings, even-odd; with an edge where wanted.
    Area {
        rings: Vec<Vec<Point>>,
        fill: Paint,
        edge: Option<Stroke>,
    },
    Disc {
        centre: Point,
        radius: f64,
        fill: Paint,
    },
    Ring {
        centre: Point,
        radius: f64,
        stroke: Stroke,
    },
    /// A polygon filled with a gradient.
    Shade {
        polygon: Vec<Point>,
        run: Run,
        stops: Vec<Stop>,
    },
    Label(Label),
}

/// A shape with what it stands for and what it lies over.
#[derive(Clone, Debug, PartialEq)]
pub struct Mark {
    pub id: MarkId,
    pub layer: Layer,
    pub shape: Shape,
}

/// What was found at a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Hit {
    pub id: MarkId,
    /// From the point to the mark, in points; 0 inside it.
    pub distance: f64,
}

/// A picture.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Scene {
    /// Points.
    pub width: f64,
    /// Points.
    pub height: f64,
    /// What it is, in a line.
    pub title: String,
    /// What it shows, in a sentence or two, for those who cannot see it.
    pub description: String,
    /// In the order of drawing after [`Scene::sort`].
    pub marks: Vec<Mark>,
}

impl Scene {
    pub fn add(&mut self, id: MarkId, layer: Layer, shape: Shape) {
        self.marks.push(Mark { id, layer, shape });
    }

    /// Puts the marks in the order of their layers; within a layer they keep theirs.
    pub fn sort(&mut self) {
        self.marks.sort_by_key(|mark| mark.layer);
    }

    pub fn labels(&self) -> impl Iterator<Item = (MarkId, &Label)> {
        self.marks.iter().filter_map(|mark| match &mark.shape {
            Shape::Label(label) => Some((mark.id, label)),
            _ => None,
        })
    }

    /// What lies within `tolerance` points of a place: nearest first, and of equally near ones the one drawn last.
    /// Each id once, and of a body's path the one sample whose place is nearest. Sheet, scale and boundaries are never
    /// found.
    #[must_use]
    pub fn hit(&self, point: Point, tolerance: f64) -> Vec<Hit> {
        let mut found: Vec<Hit> = Vec::new();
        // Per body: place in `found`, distance from the middle of the path.
        let mut paths: Vec<(Body, usize, f64)> = Vec::new();
        for mark in self.marks.iter().rev() {
            if matches!(mark.id, MarkId::Sheet | MarkId::Scale | MarkId::Boundary(_)) {
                continue;
            }
            let (distance, sample) = mark.shape.distance(point);
            if distance > tolerance || !distance.is_finite() {
                continue;
            }
            let id = match (mark.id, sample) {
                (MarkId::Track(body), Some((index, off))) => {
                    let id = MarkId::TrackPoint { body, index };
                    match paths.iter_mut().find(|path| path.0 == body) {
                        Some(path) => {
                            if let Some(hit) = found.get_mut(path.1) {
                                hit.distance = hit.distance.min(distance);
                                if off < path.2 {
                                    (hit.id, path.2) = (id, off);
                                }
                            }
                        }
                        None => {
                            paths.push((body, found.len(), off));
                            found.push(Hit { id, distance });
                        }
                    }
                    continue;
                }
                (id, _) => id,
            };
            match found.iter_mut().find(|hit| hit.id == id) {
                Some(hit) => hit.distance = hit.distance.min(distance),
                None => found.push(Hit { id, distance }),
            }
        }
        found.sort_by(|a, b| a.distance.total_cmp(&b.distance));
        found
    }
}

impl Shape {
    /// Distance from a point (0 inside); of a ribbon also the sample nearest to it and how far its middle is.
    fn distance(&self, point: Point) -> (f64, Option<(usize, f64)>) {
        let along = |points: &[Point]| {
            points.windows(2).fold(f64::INFINITY, |least, pair| {
                least.min(geometry::distance_to_segment(point, pair[0], pair[1]).0)
            })
        };
        match self {
            Shape::Line { points, stroke } => ((along(points) - stroke.width / 2.0).max(0.0), None),
            Shape::Ribbon(points) => {
                let mut best: (f64, Option<(usize, f64)>) = (f64::INFINITY, None);
                for pair in points.windows(2) {
                    let &[from, to] = pair else { continue };
                    let (apart, part) = geometry::distance_to_segment(point, from.at, to.at);
                    let width = from.width + (to.width - from.width) * part;
                    let index = if part < 0.5 { from.index } else { to.index };
                    best.0 = best.0.min((apart - width / 2.0).max(0.0));
                    if best.1.is_none_or(|(_, off)| apart < off) {
                        best.1 = Some((index, apart));
                    }
                }
                best
            }
            Shape::Area { rings, .. } => {
                let inside = rings
                    .iter()
                    .filter(|ring| geometry::inside(point, ring))
                    .count()
                    % 2
                    == 1;
                if inside {
                    (0.0, None)
                } else {
                    let edge = rings
                        .iter()
                        .fold(f64::INFINITY, |least, ring| least.min(along(ring)));
                    (edge, None)
                }
            }
            Shape::Shade { polygon, .. } => {
                if geometry::inside(point, polygon) {
                    (0.0, None)
                } else {
                    (along(polygon), None)
                }
            }
            Shape::Disc { centre, radius, .. } => {
                ((point.distance(*centre) - radius).max(0.0), None)
            }
            Shape::Ring {
                centre,
                radius,
                stroke,
            } => (
                (point.distance(*centre) - radius - stroke.width / 2.0).max(0.0),
                None,
            ),
            Shape::Label(label) => (label.bounds().nearest(point).distance(point), None),
        }
    }
}

/// Steps of tone in which a ribbon is drawn: finer ones cannot be told apart.
const TONE_STEPS: f64 = 48.0;

/// A ribbon as filled outlines, one for each step of its tone, in the order of drawing. Neighbours overlap by one
/// sample, so that no seam shows.
#[must_use]
pub fn ribbon_outlines(points: &[RibbonPoint]) -> Vec<(Vec<Point>, Paint)> {
    let tone = |paint: &Paint| {
        let step = (paint.amount * TONE_STEPS).round();
        (paint.role, paint.toward, step as i64)
    };
    let edge = |index: usize| -> Option<(Point, Point)> {
        let here = points.get(index)?;
        let before = points.get(index.saturating_sub(1))?;
        let after = points.get((index + 1).min(points.len() - 1))?;
        let normal = after.at.minus(before.at).unit().turned();
        Some((
            here.at.towards(normal, here.width / 2.0),
            here.at.towards(normal, -here.width / 2.0),
        ))
    };
    let mut outlines = Vec::new();
    let mut first = 0;
    while first + 1 < points.len() {
        let mut last = first + 1;
        while last + 1 < points.len() && tone(&points[last].paint) == tone(&points[first].paint) {
            last += 1;
        }
        let reach = (last + 1).min(points.len() - 1);
        let sides: Vec<(Point, Point)> = (first..=reach).filter_map(edge).collect();
        let outline = sides
            .iter()
            .map(|side| side.0)
            .chain(sides.iter().rev().map(|side| side.1))
            .collect();
        outlines.push((outline, points[first].paint));
        first = last;
    }
    outlines
}

/// A number to 0.01 without a negative zero, as dumps and the SVG write it.
pub(crate) fn number(value: f64) -> String {
    let text = format!("{value:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" {
        "0".to_owned()
    } else {
        text.to_owned()
    }
}

fn dump_points<'a>(
    f: &mut fmt::Formatter<'_>,
    points: impl IntoIterator<Item = &'a Point>,
) -> fmt::Result {
    for point in points {
        write!(f, " {},{}", number(point.x), number(point.y))?;
    }
    Ok(())
}

fn dump_stroke(f: &mut fmt::Formatter<'_>, stroke: &Stroke) -> fmt::Result {
    write!(f, " {} {}", stroke.paint, number(stroke.width))?;
    if let Some((on, off)) = stroke.dash {
        write!(f, " dash {}/{}", number(on), number(off))?;
    }
    Ok(())
}

/// One line a mark: layer, id, shape, paint, numbers to 0.01 point. The same bytes on every system.
impl fmt::Display for Scene {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(f, "scene {} x {}", number(self.width), number(self.height))?;
        writeln!(f, "title {}", self.title)?;
        writeln!(f, "description {}", self.description)?;
        for mark in &self.marks {
            write!(f, "{} {:?} ", mark.layer.word(), mark.id)?;
            match &mark.shape {
                Shape::Line { points, stroke } => {
                    f.write_str("line")?;
                    dump_stroke(f, stroke)?;
                    dump_points(f, points)?;
                }
                Shape::Ribbon(points) => {
                    f.write_str("ribbon")?;
                    for point in points {
                        write!(
                            f,
                            " {},{}/{}/{}",
                            number(point.at.x),
                            number(point.at.y),
                            number(point.width),
                            point.paint
                        )?;
                    }
                }
                Shape::Area { rings, fill, edge } => {
                    write!(f, "area {fill}")?;
                    if let Some(stroke) = edge {
                        f.write_str(" edge")?;
                        dump_stroke(f, stroke)?;
                    }
                    for ring in rings {
                        f.write_str(" ring")?;
                        dump_points(f, ring)?;
                    }
                }
                Shape::Disc {
                    centre,
                    radius,
                    fill,
                } => {
                    write!(f, "disc {fill} {}", number(*radius))?;
                    dump_points(f, [centre])?;
                }
                Shape::Ring {
                    centre,
                    radius,
                    stroke,
                } => {
                    f.write_str("ring")?;
                    dump_stroke(f, stroke)?;
                    write!(f, " {}", number(*radius))?;
                    dump_points(f, [centre])?;
                }
                Shape::Shade {
                    polygon,
                    run,
                    stops,
                } => {
                    f.write_str("shade")?;
                    match run {
                        Run::Along { from, to } => dump_points(f, [from, to])?,
                        Run::Around { centre, radius } => {
                            dump_points(f, [centre])?;
                            write!(f, " {}", number(*radius))?;
                        }
                    }
                    for stop in stops {
                        write!(f, " {:.2}:{}", stop.part, stop.paint)?;
                    }
                    f.write_str(" polygon")?;
                    dump_points(f, polygon)?;
                }
                Shape::Label(label) => {
                    let bounds = label.bounds();
                    write!(
                        f,
                        "label {} {} {} {:?} box {} {} {} {}",
                        label.font.word(),
                        number(label.size),
                        label.paint,
                        label.text,
                        number(bounds.left),
                        number(bounds.top),
                        number(bounds.right),
                        number(bounds.bottom),
                    )?;
                }
            }
            writeln!(f)?;
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn scene() -> Scene {
        let mut scene = Scene {
            width: 100.0,
            height: 50.0,
            ..Scene::default()
        };
        let ribbon = (0..5)
            .map(|index| RibbonPoint {
                at: Point::new(10.0 + 10.0 * index as f64, 20.0),
                width: 4.0,
                paint: Paint::mixed(Role::Subject, Role::SubjectLate, index as f64 / 4.0),
                index,
            })
            .collect();
        scene.add(
            MarkId::Star(49669),
            Layer::Stars,
            Shape::Disc {
                centre: Point::new(30.0, 26.0),
                radius: 1.0,
                fill: Paint::of(Role::Star),
            },
        );
        scene.add(
            MarkId::Track(Body::Mars),
            Layer::Track,
            Shape::Ribbon(ribbon),
        );
        scene.add(
            MarkId::Sheet,
            Layer::Sheet,
            Shape::Area {
                rings: vec![Rect::new(0.0, 0.0, 100.0, 50.0).corners().to_vec()],
                fill: Paint::of(Role::Ground),
                edge: None,
            },
        );
        scene.sort();
        scene
    }

    #[test]
    fn hits_are_ranked_by_distance_and_name_the_sample() {
        let mars = |index| MarkId::TrackPoint {
            body: Body::Mars,
            index,
        };
        let found = scene().hit(Point::new(29.0, 23.5), 3.0);
        let ids: Vec<MarkId> = found.iter().map(|hit| hit.id).collect();
        assert_eq!(ids, [mars(2), MarkId::Star(49669)]);
        // From (29, 23.5): 1.5 to the ribbon's edge at y = 22; sqrt(1 + 6.25) - 1 to the star's.
        assert!((found[0].distance - 1.5).abs() < 1e-12);
        assert!((found[1].distance - (7.25_f64.sqrt() - 1.0)).abs() < 1e-12);
        assert_eq!(scene().hit(Point::new(10.0, 21.0), 0.0)[0].id, mars(0));
        assert!(scene().hit(Point::new(80.0, 40.0), 5.0).is_empty());
    }

    #[test]
    fn the_sheet_lies_under_everything() {
        let scene = scene();
        assert_eq!(scene.marks[0].layer, Layer::Sheet);
        assert_eq!(scene.marks[2].id, MarkId::Track(Body::Mars));
    }

    #[test]
    fn a_turned_label_keeps_its_area() {
        let mut label = Label::new(
            Point::new(50.0, 20.0),
            "ecliptic",
            Font::SerifItalic,
            10.0,
            Role::Ink,
        );
        let flat = label.bounds();
        label.rotation_degrees = 90.0;
        let upright = label.bounds();
        assert!((flat.width() - upright.height()).abs() < 1e-9);
        assert!((flat.height() - upright.width()).abs() < 1e-9);
    }

    #[test]
    fn a_ribbon_is_as_wide_as_asked() {
        let Shape::Ribbon(points) = &scene().marks[2].shape else {
            panic!("the track is a ribbon");
        };
        for (outline, _) in ribbon_outlines(points) {
            for point in outline {
                assert!((point.y - 20.0).abs() - 2.0 < 1e-12);
            }
        }
    }

    #[test]
    fn numbers_have_no_negative_zero() {
        assert_eq!(number(-0.001), "0");
        assert_eq!(number(12.5), "12.5");
        assert_eq!(number(-3.456), "-3.46");
        assert_eq!(number(100.0), "100");
    }
}
