//! Framing: which lens holds a path with its stars, where to aim it, how to tilt it, and where in the picture a direction
//! falls.
//!
//! Directions are unit vectors on equatorial ICRS axes (astrometric, of the site); angles as everywhere. All is geometry on
//! the tangent plane at the middle of the picture, so it is exact for a rectilinear lens. Tilts count from the ICRS pole,
//! which is 0.14 degrees from the pole of date in 2026: that much differ the tilts near the equator at most.
//!
//! The best tilt is searched among finitely many. Between two tilts at which an edge of the convex hull lies along a side,
//! width and height of the surrounding rectangle are each a cosine of the tilt, so concave. The area (with a margin, too) is
//! therefore least with an edge along a side (Freeman and Shapira 1975, *Comm. ACM* 18, 409), and the larger of width over W
//! and height over H there or where both are equal.

use super::lens::{Lens, OutOfRange, Sensor, within};
use super::tangent::{PlanePoint, Rectangle, TangentPlane};
use crate::sky::{Angle, Vec3};

/// What cannot be framed.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum FrameError {
    #[error("nothing to frame: choose a part of the path or a star")]
    NoDirections,
    #[error("direction {index} (counted from 0) is no direction: a vector with finite components and a length is needed")]
    NotADirection { index: usize },
    #[error(
        "the chosen directions reach {reach:.0} deg from their middle; a picture holds {greatest:.0} deg at most: choose a \
         shorter part of the path or fewer stars"
    )]
    TooWide { reach: f64, greatest: f64 },
    #[error("the chosen directions all lie in one point: give a margin, or choose more of the path")]
    NoExtent,
    #[error("{pictures} pictures would be needed, {greatest} are the most: use a shorter lens or a shorter part of the path")]
    TooManyPictures { pictures: usize, greatest: usize },
    #[error(transparent)]
    OutOfRange(#[from] OutOfRange),
}

/// Farthest that a direction may lie from the middle of all, degrees: pictures of 140 degrees, beyond any rectilinear lens.
const GREATEST_REACH_DEG: f64 = 70.0;
/// Greatest margin, degrees.
const GREATEST_MARGIN_DEG: f64 = 45.0;

/// What is to be held, checked: the corners of the convex hull on the sphere, and the margin on the plane.
struct Subject {
    hull: Vec<Vec3>,
    margin: f64,
    start: TangentPlane,
}

impl Subject {
    fn new(directions: &[Vec3], margin: Angle) -> Result<Self, FrameError> {
        let margin_deg = within(
            "margin",
            margin.degrees(),
            (0.0, GREATEST_MARGIN_DEG),
            "degrees at the middle of the picture",
        )?;
        let mut units = Vec::with_capacity(directions.len());
        for (index, direction) in directions.iter().enumerate() {
            let norm = direction.norm();
            if !(norm.is_finite() && norm > 0.0) {
                return Err(FrameError::NotADirection { index });
            }
            units.push(direction.unit());
        }
        let middle = middle_of_cap(&units)?;
        let reach = units.iter().map(|unit| middle.separation(*unit).degrees()).fold(0.0, f64::max);
        if reach > GREATEST_REACH_DEG {
            return Err(too_wide(reach));
        }
        let start = TangentPlane::of_sky(middle, Angle::ZERO);
        let flat = flatten(&start, &units)?;
        // Great circles are straight on every tangent plane, so the hull is the same on all of them.
        let hull = hull_indices(&flat).into_iter().map(|index| units[index]).collect();
        Ok(Subject { hull, margin: Angle::from_degrees(margin_deg).tan(), start })
    }
}

fn too_wide(reach: f64) -> FrameError {
    FrameError::TooWide { reach, greatest: GREATEST_REACH_DEG }
}

/// About the middle of the smallest cap around unit vectors: the centre of the smallest ball around their ends, by the
/// method of Badoiu and Clarkson 2003 (*Proc. 14th SODA*, 801). A start for the fit, so a degree or two is enough.
fn middle_of_cap(units: &[Vec3]) -> Result<Vec3, FrameError> {
    const ROUNDS: usize = 60;
    let mut middle = *units.first().ok_or(FrameError::NoDirections)?;
    for round in 1..=ROUNDS {
        let mut farthest = (middle, -1.0);
        for unit in units {
            let away = *unit - middle;
            let distance = away.dot(away);
            if distance > farthest.1 {
                farthest = (*unit, distance);
            }
        }
        middle += (farthest.0 - middle) * (1.0 / (round as f64 + 1.0));
    }
    // The middle of a cap with a radius of 84 degrees lies a tenth inside the sphere.
    if middle.norm() < 0.1 { Err(too_wide(90.0)) } else { Ok(middle.unit()) }
}

fn flatten(plane: &TangentPlane, directions: &[Vec3]) -> Result<Vec<PlanePoint>, FrameError> {
    directions.iter().map(|direction| plane.project(*direction)).collect::<Option<_>>().ok_or(too_wide(90.0))
}

/// Corners of the convex hull, counter-clockwise, by Andrew's monotone chain (1979, *Inf. Process. Lett.* 9, 216). One or
/// two for points that coincide or lie on a line.
fn hull_indices(points: &[PlanePoint]) -> Vec<usize> {
    let mut order: Vec<usize> = (0..points.len()).collect();
    let key = |index: usize| (points[index].x, points[index].y);
    order.sort_by(|a, b| {
        let ((ax, ay), (bx, by)) = (key(*a), key(*b));
        ax.total_cmp(&bx).then(ay.total_cmp(&by))
    });
    order.dedup_by(|a, b| key(*a) == key(*b));
    if order.len() < 3 {
        return order;
    }
    let turns_left = |a: usize, b: usize, c: usize| {
        let ((ax, ay), (bx, by), (cx, cy)) = (key(a), key(b), key(c));
        (bx - ax) * (cy - ay) > (by - ay) * (cx - ax)
    };
    let mut hull: Vec<usize> = Vec::new();
    let mut chain = |indices: &mut dyn Iterator<Item = usize>| {
        let start = hull.len();
        for index in indices {
            while let [.., a, b] = hull[start..] {
                if turns_left(a, b, index) {
                    break;
                }
                hull.pop();
            }
            hull.push(index);
        }
        // The last corner begins the next chain.
        hull.pop();
    };
    chain(&mut order.iter().copied());
    chain(&mut order.iter().rev().copied());
    hull
}

/// What a good rectangle makes small.
#[derive(Clone, Copy)]
enum Goal {
    Area,
    /// The larger of width over the sensor's width and height over its height: one over the focal length in mm.
    Sensor { width_mm: f64, height_mm: f64 },
}

impl Goal {
    /// Sides in units of the focal length, margins included.
    fn cost(self, width: f64, height: f64) -> f64 {
        match self {
            Goal::Area => width * height,
            Goal::Sensor { width_mm, height_mm } => (width / width_mm).max(height / height_mm),
        }
    }
}

/// The box around points, along the axes.
#[derive(Clone, Copy)]
struct Bounds {
    left: f64,
    right: f64,
    bottom: f64,
    top: f64,
}

impl Bounds {
    fn of(points: impl Iterator<Item = PlanePoint>) -> Self {
        let nothing = Bounds { left: f64::MAX, right: f64::MIN, bottom: f64::MAX, top: f64::MIN };
        points.fold(nothing, |b, p| Bounds {
            left: b.left.min(p.x),
            right: b.right.max(p.x),
            bottom: b.bottom.min(p.y),
            top: b.top.max(p.y),
        })
    }

    /// Angles from the centre of the plane to the middle of the box, halving the angles to its sides.
    fn middle(self) -> (Angle, Angle) {
        let half = |a: f64, b: f64| Angle::from_radians(0.5 * (libm::atan(a) + libm::atan(b)));
        (half(self.left, self.right), half(self.bottom, self.top))
    }
}

/// The turn of the axes, counter-clockwise, above -90 up to 90 degrees, at which the box around the corners of a hull costs
/// least. Among equals the smallest turn.
fn best_turn(hull: &[PlanePoint], margin: f64, goal: Goal) -> Angle {
    let mut best = (cost_at(hull, margin, goal, Angle::ZERO), Angle::ZERO);
    let mut offer = |turn: Angle| {
        let turn = upright(turn);
        let cost = cost_at(hull, margin, goal, turn);
        let equal = 1e-9 * best.0;
        if cost < best.0 - equal || (cost < best.0 + equal && turn.abs() < best.1.abs()) {
            best = (cost, turn);
        }
    };
    let edges = edge_turns(hull);
    for edge in &edges {
        offer(*edge);
        offer(*edge + Angle::QUARTER_TURN);
    }
    if let Goal::Sensor { width_mm, height_mm } = goal {
        // Between neighbouring edge turns the same corners touch the box.
        let next = edges.iter().copied().skip(1).chain(edges.first().map(|first| *first + Angle::QUARTER_TURN));
        for (from, to) in edges.iter().copied().zip(next) {
            for quarter in [Angle::ZERO, Angle::QUARTER_TURN] {
                let between = (from + to) * 0.5 + quarter;
                for turn in equal_turns(hull, margin, (width_mm, height_mm), between).into_iter().flatten() {
                    if (turn - between).signed().abs() <= (to - from) * 0.5 {
                        offer(turn);
                    }
                }
            }
        }
    }
    best.1
}

/// The same line, above -90 up to 90 degrees.
fn upright(turn: Angle) -> Angle {
    let signed = turn.signed();
    if signed > Angle::QUARTER_TURN {
        signed - Angle::HALF_TURN
    } else if signed <= -Angle::QUARTER_TURN {
        signed + Angle::HALF_TURN
    } else {
        signed
    }
}

fn cost_at(hull: &[PlanePoint], margin: f64, goal: Goal, turn: Angle) -> f64 {
    let sin_cos = turn.sin_cos();
    let bounds = Bounds::of(hull.iter().map(|point| point.on_turned_axes(sin_cos)));
    goal.cost(bounds.right - bounds.left + 2.0 * margin, bounds.top - bounds.bottom + 2.0 * margin)
}

/// Turns at which an edge of the hull lies along an axis, 0 to 90 degrees, in order.
fn edge_turns(hull: &[PlanePoint]) -> Vec<Angle> {
    let mut turns: Vec<Angle> = hull
        .iter()
        .zip(hull.iter().cycle().skip(1))
        .filter(|(a, b)| a != b)
        .map(|(a, b)| {
            let turn = libm::atan2(b.y - a.y, b.x - a.x).rem_euclid(std::f64::consts::FRAC_PI_2);
            Angle::from_radians(turn)
        })
        .collect();
    turns.sort_by(|a, b| a.radians().total_cmp(&b.radians()));
    turns
}

/// Turns at which the box, touched by the corners that touch it at the turn `between`, has the sensor's shape.
///
/// Width a cos t + b sin t and height c cos t - d sin t, from the differences (a, b), (d, c) of the touching corners:
/// (width + 2m) H = (height + 2m) W is A cos t + B sin t = C.
fn equal_turns(
    hull: &[PlanePoint],
    margin: f64,
    (width_mm, height_mm): (f64, f64),
    between: Angle,
) -> Option<[Angle; 2]> {
    let sin_cos = between.sin_cos();
    let extreme = |value: &dyn Fn(PlanePoint) -> f64| {
        hull.iter().copied().max_by(|a, b| {
            value(a.on_turned_axes(sin_cos)).total_cmp(&value(b.on_turned_axes(sin_cos)))
        })
    };
    let (right, left) = (extreme(&|p| p.x)?, extreme(&|p| -p.x)?);
    let (top, bottom) = (extreme(&|p| p.y)?, extreme(&|p| -p.y)?);
    let cosine = height_mm * (right.x - left.x) - width_mm * (top.y - bottom.y);
    let sine = height_mm * (right.y - left.y) + width_mm * (top.x - bottom.x);
    let constant = 2.0 * margin * (width_mm - height_mm);
    let size = libm::hypot(cosine, sine);
    if !(size > 0.0 && constant.abs() <= size) {
        return None;
    }
    let middle = Angle::from_radians(libm::atan2(sine, cosine));
    let aside = Angle::from_radians(libm::acos(constant / size));
    Some([middle - aside, middle + aside])
}

/// The best rectangle found, around the centre of its own plane.
struct Settled {
    plane: TangentPlane,
    half_width: f64,
    half_height: f64,
    cost: f64,
}

/// Turns and moves the plane until the box stands around its centre.
fn settle(subject: &Subject, goal: Goal) -> Result<Settled, FrameError> {
    const FREE_ROUNDS: usize = 30;
    const ALL_ROUNDS: usize = 60;
    /// 0.00002".
    const STILL: Angle = Angle::from_radians(1e-10);
    let mut plane = subject.start;
    let mut best: Option<Settled> = None;
    for round in 0..ALL_ROUNDS {
        if round == FREE_ROUNDS {
            // Two tilts may follow each other for ever; from here on only the centre of the better one settles.
            plane = best.as_ref().map_or(plane, |best| best.plane);
        }
        let mut flat = flatten(&plane, &subject.hull)?;
        if round < FREE_ROUNDS {
            let sin_cos = best_turn(&flat, subject.margin, goal).sin_cos();
            plane = plane.turned(sin_cos);
            flat.iter_mut().for_each(|point| *point = point.on_turned_axes(sin_cos));
        }
        let bounds = Bounds::of(flat.into_iter());
        let half_width = bounds.right.max(-bounds.left) + subject.margin;
        let half_height = bounds.top.max(-bounds.bottom) + subject.margin;
        let cost = goal.cost(2.0 * half_width, 2.0 * half_height);
        if best.as_ref().is_none_or(|best| cost < best.cost) {
            best = Some(Settled { plane, half_width, half_height, cost });
        }
        let (right, up) = bounds.middle();
        if right.abs() < STILL && up.abs() < STILL {
            break;
        }
        plane = plane.moved(right, up);
    }
    best.ok_or(FrameError::NoDirections)
}

/// The plane turned by half a turn where that brings its upward direction nearer to north.
fn north_up(plane: TangentPlane) -> TangentPlane {
    let tilt = plane.position_angle();
    if upright(tilt) == tilt { plane } else { plane.turned((0.0, -1.0)) }
}

/// The rectangle of least area that holds all directions with a margin, on the tangent plane at its own centre. Its width is
/// the longer side, its tilt above -90 up to 90 degrees.
///
/// The area is that in the picture (square of the focal length). The margin is as wide in the picture on all four sides:
/// `margin` at the centre, less on the sky towards the corners.
///
/// # Errors
/// Nothing to hold, something that is no direction, directions more than 70 degrees from their middle, a margin outside 0 to
/// 45 degrees.
pub fn smallest_rectangle(directions: &[Vec3], margin: Angle) -> Result<Rectangle, FrameError> {
    let subject = Subject::new(directions, margin)?;
    let settled = settle(&subject, Goal::Area)?;
    let (plane, width, height) = if settled.half_width < settled.half_height {
        (settled.plane.turned((1.0, 0.0)), settled.half_height, settled.half_width)
    } else {
        (settled.plane, settled.half_width, settled.half_height)
    };
    Ok(Rectangle::new(north_up(plane), width, height))
}

/// The longest lens that holds what was asked for, and how to point it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LongestLens {
    pub focal_length_mm: f64,
    plane: TangentPlane,
}

impl LongestLens {
    /// Unit vector to the middle of the picture.
    #[must_use]
    pub const fn centre(&self) -> Vec3 {
        self.plane.centre()
    }

    /// Position angle of the picture's upward direction, above -90 up to 90 degrees.
    #[must_use]
    pub fn tilt(&self) -> Angle {
        self.plane.position_angle()
    }

    /// Whether a lens, pointed like this, holds everything.
    #[must_use]
    pub fn is_held_by(&self, lens: &Lens) -> bool {
        lens.focal_length_mm() <= self.focal_length_mm
    }

    /// The picture that a lens takes, pointed like this; the sensor is the one that was asked about.
    #[must_use]
    pub fn frame(&self, lens: &Lens, sensor: &Sensor) -> PhotoFrame {
        PhotoFrame::on_plane(self.plane, lens, sensor)
    }
}

/// The longest focal length at which a picture holds all directions with a margin: least max(width/W, height/H) over tilt
/// and centre. See [`smallest_rectangle`] for the margin.
///
/// # Errors
/// As [`smallest_rectangle`], and directions that all coincide without a margin: any lens holds them.
pub fn longest_lens(
    directions: &[Vec3],
    margin: Angle,
    sensor: &Sensor,
) -> Result<LongestLens, FrameError> {
    let subject = Subject::new(directions, margin)?;
    let settled = settle(&subject, sensor_goal(sensor))?;
    let focal_length_mm = 1.0 / settled.cost;
    if !focal_length_mm.is_finite() {
        return Err(FrameError::NoExtent);
    }
    Ok(LongestLens { focal_length_mm, plane: north_up(settled.plane) })
}

fn sensor_goal(sensor: &Sensor) -> Goal {
    Goal::Sensor { width_mm: sensor.width_mm(), height_mm: sensor.height_mm() }
}

/// A point of a picture in pixels: x to the right, y down, from the top left corner of the top left pixel, whose middle is
/// at (0.5, 0.5).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pixel {
    pub x: f64,
    pub y: f64,
}

impl Pixel {
    /// Where the pixels of a picture lie on its rectangle.
    pub(super) fn from_plane(point: PlanePoint, rectangle: &Rectangle, columns: u32, rows: u32) -> Self {
        let (half_width, half_height) = rectangle.half_sides();
        Pixel {
            x: 0.5 * f64::from(columns) * (1.0 + point.x / half_width),
            y: 0.5 * f64::from(rows) * (1.0 - point.y / half_height),
        }
    }

    /// The inverse of [`Pixel::from_plane`].
    pub(super) fn to_plane(self, rectangle: &Rectangle, columns: u32, rows: u32) -> PlanePoint {
        let (half_width, half_height) = rectangle.half_sides();
        PlanePoint {
            x: (2.0 * self.x / f64::from(columns) - 1.0) * half_width,
            y: (1.0 - 2.0 * self.y / f64::from(rows)) * half_height,
        }
    }
}

/// The rectangle of sky that a lens and a sensor hold.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PhotoFrame {
    rectangle: Rectangle,
    columns: u32,
    rows: u32,
}

impl PhotoFrame {
    /// A picture aimed at `centre` with its upward direction at the position angle `tilt`, from north through east.
    ///
    /// # Errors
    /// A centre that is no direction, a tilt that is no number.
    pub fn new(centre: Vec3, tilt: Angle, lens: &Lens, sensor: &Sensor) -> Result<Self, FrameError> {
        let norm = centre.norm();
        if !(norm.is_finite() && norm > 0.0) {
            return Err(FrameError::NotADirection { index: 0 });
        }
        within("tilt", tilt.degrees(), (-360.0, 360.0), "degrees, from north through east")?;
        Ok(PhotoFrame::on_plane(TangentPlane::of_sky(centre, tilt), lens, sensor))
    }

    fn on_plane(plane: TangentPlane, lens: &Lens, sensor: &Sensor) -> Self {
        PhotoFrame {
            rectangle: Rectangle::of_camera(plane, lens, sensor),
            columns: sensor.columns(),
            rows: sensor.rows(),
        }
    }

    /// Centre, tilt, sides and corners.
    #[must_use]
    pub const fn rectangle(&self) -> &Rectangle {
        &self.rectangle
    }

    /// Pixels along the width and along the height.
    #[must_use]
    pub const fn size(&self) -> (u32, u32) {
        (self.columns, self.rows)
    }

    /// Where a direction falls, also outside the picture; `None` from a right angle off the axis onward.
    #[must_use]
    pub fn pixel(&self, direction: Vec3) -> Option<Pixel> {
        let point = self.rectangle.plane().project(direction)?;
        Some(Pixel::from_plane(point, &self.rectangle, self.columns, self.rows))
    }

    /// Unit vector to what falls on a point of the picture.
    #[must_use]
    pub fn direction(&self, pixel: Pixel) -> Vec3 {
        self.rectangle.plane().direction(pixel.to_plane(&self.rectangle, self.columns, self.rows))
    }

    /// Whether a direction lies in the picture, edges included.
    #[must_use]
    pub fn holds(&self, direction: Vec3) -> bool {
        self.rectangle.holds(direction)
    }

    /// The part of a path that lies in the picture; neighbouring points are joined by great circles.
    #[must_use]
    pub fn part_held(&self, path: &[Vec3]) -> PartHeld {
        let mut stretches: Vec<Stretch> = Vec::new();
        let (mut held, mut all) = (0.0, 0.0);
        for (index, (a, b)) in path.iter().zip(path.iter().skip(1)).enumerate() {
            let (a, b) = (a.unit(), b.unit());
            all += a.separation(b).radians();
            let Some((from, to)) = self.rectangle.clip(a, b) else { continue };
            let at = |share: f64| a * (1.0 - share) + b * share;
            held += at(from).separation(at(to)).radians();
            let (from, to) = (index as f64 + from, index as f64 + to);
            match stretches.last_mut() {
                Some(last) if last.to == from => last.to = to,
                _ => stretches.push(Stretch { from, to }),
            }
        }
        // A path that touches an edge in one point is not held there.
        stretches.retain(|stretch| stretch.to > stretch.from);
        let fraction = if all > 0.0 {
            held / all
        } else {
            // A path of one point is held or not.
            f64::from(u8::from(path.first().is_some_and(|point| self.holds(*point))))
        };
        PartHeld { fraction: fraction.min(1.0), stretches }
    }
}

/// How much of a path a picture holds.
#[derive(Clone, Debug, PartialEq)]
pub struct PartHeld {
    /// Of the length along the path, backward motion counted, 0 to 1.
    pub fraction: f64,
    /// In order along the path.
    pub stretches: Vec<Stretch>,
}

/// A stretch of a path: numbers of points, counted from 0, with the share of the step beyond them: 3.5 is halfway from
/// point 3 to point 4.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stretch {
    pub from: f64,
    pub to: f64,
}

/// The longest unbroken part of a path that one picture holds.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LongestRun {
    /// First and last point of the path, both held.
    pub first: usize,
    pub last: usize,
    /// Of the length of the whole path, 0 to 1.
    pub fraction: f64,
    pub frame: PhotoFrame,
}

/// The longest run of a path, by length along it, that a lens holds together with the directions of `also` and a margin;
/// `None` if it does not even hold one point with them.
///
/// # Errors
/// As [`smallest_rectangle`], but for a path that is too wide: its parts may do.
pub fn longest_run(
    path: &[Vec3],
    also: &[Vec3],
    margin: Angle,
    lens: &Lens,
    sensor: &Sensor,
) -> Result<Option<LongestRun>, FrameError> {
    if path.is_empty() {
        return Err(FrameError::NoDirections);
    }
    let mut wanted: Vec<Vec3> = Vec::with_capacity(path.len() + also.len());
    let mut framed = |run: &[Vec3]| -> Result<Option<PhotoFrame>, FrameError> {
        wanted.clear();
        wanted.extend_from_slice(run);
        wanted.extend_from_slice(also);
        let settled = match Subject::new(&wanted, margin).and_then(|subject| settle(&subject, sensor_goal(sensor))) {
            Ok(settled) => settled,
            Err(FrameError::TooWide { .. }) => return Ok(None),
            Err(error) => return Err(error),
        };
        Ok((settled.cost * lens.focal_length_mm() <= 1.0)
            .then(|| PhotoFrame::on_plane(north_up(settled.plane), lens, sensor)))
    };
    let mut travelled = vec![0.0];
    let mut length = 0.0;
    for (a, b) in path.iter().zip(path.iter().skip(1)) {
        length += a.separation(*b).radians();
        travelled.push(length);
    }
    let mut best: Option<(f64, LongestRun)> = None;
    let mut first = 0;
    // What holds a run holds every part of it, so neither end ever has to go back.
    for last in 0..path.len() {
        while first <= last {
            let run = travelled[last] - travelled[first];
            if best.as_ref().is_some_and(|(longest, _)| run <= *longest) {
                break;
            }
            if let Some(frame) = framed(&path[first..=last])? {
                let fraction = if length > 0.0 { run / length } else { 1.0 };
                best = Some((run, LongestRun { first, last, fraction, frame }));
                break;
            }
            first += 1;
        }
    }
    Ok(best.map(|(_, run)| run))
}

/// Pictures side by side that together hold what one does not.
#[derive(Clone, Debug, PartialEq)]
pub struct Mosaic {
    pub columns: usize,
    pub rows: usize,
    /// Row by row from the top, each from the left, all with their sides along the grid.
    pub tiles: Vec<Tile>,
}

/// One picture of a mosaic.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tile {
    pub frame: PhotoFrame,
    /// Whether it holds any of the directions; without a margin the others may be left out.
    pub holds_any: bool,
}

/// Most pictures of a mosaic.
const MOST_TILES: usize = 400;

/// The mosaic of fewest pictures in rows and columns that holds all directions with a margin, neighbours sharing `overlap`
/// of their side (0 to 0.9). One picture where one does.
///
/// Tilts along the hull's edges and at the longest lens are tried. The rows lie on parallels of the middle row, and within a
/// row the pictures are spread so that even their narrow ends overlap as asked.
///
/// # Errors
/// As [`smallest_rectangle`], an overlap out of range, more than 400 pictures.
pub fn mosaic(
    directions: &[Vec3],
    margin: Angle,
    overlap: f64,
    lens: &Lens,
    sensor: &Sensor,
) -> Result<Mosaic, FrameError> {
    let overlap = within("overlap", overlap, (0.0, 0.9), "as a share of the picture's side (0.2 is usual)")?;
    let subject = Subject::new(directions, margin)?;
    let settled = settle(&subject, sensor_goal(sensor))?;
    if settled.cost * lens.focal_length_mm() <= 1.0 {
        let frame = PhotoFrame::on_plane(north_up(settled.plane), lens, sensor);
        return Ok(Mosaic { columns: 1, rows: 1, tiles: vec![Tile { frame, holds_any: true }] });
    }
    let flat = flatten(&settled.plane, &subject.hull)?;
    let mut best: Option<(Grid, TangentPlane)> = None;
    let mut fewest_seen = usize::MAX;
    let edges = edge_turns(&flat);
    let quarters = edges.iter().map(|edge| *edge + Angle::QUARTER_TURN);
    for turn in [Angle::ZERO].into_iter().chain(edges.iter().copied()).chain(quarters) {
        let sin_cos = turn.sin_cos();
        let bounds = Bounds::of(flat.iter().map(|point| point.on_turned_axes(sin_cos)));
        let (right, up) = bounds.middle();
        let plane = north_up(settled.plane.turned(sin_cos).moved(right, up));
        let reach = Reach::of(&plane, &subject.hull, margin);
        match Grid::fewest(reach, overlap, lens, sensor) {
            Ok(grid) => {
                if best.as_ref().is_none_or(|(least, _)| grid.count() < least.count()) {
                    best = Some((grid, plane));
                }
            }
            Err(count) => fewest_seen = fewest_seen.min(count),
        }
    }
    let (grid, plane) =
        best.ok_or(FrameError::TooManyPictures { pictures: fewest_seen, greatest: MOST_TILES })?;
    Ok(grid.lay(&plane, directions, lens, sensor))
}

/// How far directions with their margin reach from the centre of a plane, to either side and up or down.
#[derive(Clone, Copy)]
struct Reach {
    sideways: f64,
    upward: f64,
}

impl Reach {
    fn of(plane: &TangentPlane, directions: &[Vec3], margin: Angle) -> Self {
        let nothing = Reach { sideways: 0.0, upward: 0.0 };
        directions.iter().fold(nothing, |reach, direction| {
            let (right, up) = plane.right_and_up(*direction);
            // A small circle around a direction spans asin(sin m / cos up) of the parallels.
            let aside = libm::asin((margin.sin() / up.cos()).clamp(-1.0, 1.0));
            Reach {
                sideways: reach.sideways.max(right.abs().radians() + aside),
                upward: reach.upward.max((up.abs() + margin).radians()),
            }
        })
    }
}

/// Rows and columns of pictures; radians.
///
/// A picture raised by b with half sides of tangents w and h = tan(half height) reaches sideways over the angle
/// atan(w / (cos b + h |sin b|)) at its narrower end, and its top edge, at the angle s aside of its middle, up to
/// atan(cos s tan(b + half height)); the bottom edge alike.
struct Grid {
    columns: usize,
    /// From the bottom.
    rows: Vec<GridRow>,
}

#[derive(Clone, Copy)]
struct GridRow {
    raised: f64,
    /// From one column to the next.
    step: f64,
}

impl Grid {
    fn count(&self) -> usize {
        self.columns * self.rows.len()
    }

    /// The grid of fewest pictures, or a count above the limit.
    fn fewest(reach: Reach, overlap: f64, lens: &Lens, sensor: &Sensor) -> Result<Grid, usize> {
        let field = lens.field(sensor);
        let row_step = field.height.radians() * (1.0 - overlap);
        let least_rows = needed(reach.upward, 0.5 * field.height.radians(), row_step);
        let mut best: Option<Grid> = None;
        // Curved edges may cost a row or a column more than flat ones would.
        for row_count in least_rows..least_rows.saturating_add(3).min(MOST_TILES + 1) {
            if let Some(grid) = Grid::with_rows(row_count, reach, overlap, lens, sensor)
                && best.as_ref().is_none_or(|best| grid.count() < best.count())
            {
                best = Some(grid);
            }
        }
        match best {
            Some(grid) if grid.count() <= MOST_TILES => Ok(grid),
            Some(grid) => Err(grid.count()),
            None => {
                let step = field.width.radians() * (1.0 - overlap);
                Err(least_rows.saturating_mul(needed(reach.sideways, 0.5 * field.width.radians(), step)))
            }
        }
    }

    fn with_rows(row_count: usize, reach: Reach, overlap: f64, lens: &Lens, sensor: &Sensor) -> Option<Grid> {
        let field = lens.field(sensor);
        let half_height = 0.5 * field.height.radians();
        let width = 0.5 * sensor.width_mm() / lens.focal_length_mm();
        let height = 0.5 * sensor.height_mm() / lens.focal_length_mm();
        let mut rows = Vec::with_capacity(row_count);
        let mut columns = 1;
        for row in 0..row_count {
            let from_middle = row as f64 - 0.5 * (row_count as f64 - 1.0);
            let raised = from_middle * 2.0 * half_height * (1.0 - overlap);
            if raised.abs() + half_height >= std::f64::consts::FRAC_PI_2 {
                return None;
            }
            let half_width = libm::atan(width / (libm::cos(raised) + height * libm::sin(raised).abs()));
            let step = 2.0 * half_width * (1.0 - overlap);
            columns = columns.max(needed(reach.sideways, half_width, step));
            rows.push(GridRow { raised, step });
        }
        let most_columns = columns + 2;
        (columns..=most_columns)
            .map(|columns| Grid { columns, rows: rows.clone() })
            .find(|grid| grid.covers(reach, half_height))
    }

    /// Whether the edges of the rows leave no gap within reach.
    fn covers(&self, reach: Reach, half_height: f64) -> bool {
        // The farthest that a direction lies aside of the middle of its nearest picture.
        let aside = |row: GridRow| {
            let last = 0.5 * (self.columns as f64 - 1.0) * row.step;
            let between = if self.columns > 1 { 0.5 * row.step } else { 0.0 };
            between.max(reach.sideways - last)
        };
        let edge = |row: GridRow, from_middle: f64, aside: f64| {
            libm::atan(libm::cos(aside) * libm::tan(row.raised + from_middle))
        };
        let lowest_top = |row: GridRow| edge(row, half_height, 0.0).min(edge(row, half_height, aside(row)));
        let highest_bottom = |row: GridRow| edge(row, -half_height, 0.0).max(edge(row, -half_height, aside(row)));
        let joined = self
            .rows
            .iter()
            .zip(self.rows.iter().skip(1))
            .all(|(lower, upper)| lowest_top(*lower) >= highest_bottom(*upper));
        joined && self.rows.last().is_some_and(|top| lowest_top(*top) >= reach.upward)
    }

    fn lay(&self, plane: &TangentPlane, directions: &[Vec3], lens: &Lens, sensor: &Sensor) -> Mosaic {
        let mut tiles = Vec::with_capacity(self.count());
        for row in self.rows.iter().rev() {
            for column in 0..self.columns {
                let right = (column as f64 - 0.5 * (self.columns as f64 - 1.0)) * row.step;
                let plane = plane.moved(Angle::from_radians(right), Angle::from_radians(row.raised));
                let frame = PhotoFrame::on_plane(plane, lens, sensor);
                let holds_any = directions.iter().any(|direction| frame.holds(*direction));
                tiles.push(Tile { frame, holds_any });
            }
        }
        Mosaic { columns: self.columns, rows: self.rows.len(), tiles }
    }
}

/// Pictures with half a side `half`, `step` apart, that span `reach` to either side.
fn needed(reach: f64, half: f64, step: f64) -> usize {
    if reach <= half { 1 } else { ((2.0 * (reach - half) / step).ceil() as usize).saturating_add(1) }
}

/// How far the upward direction of a picture leans from the zenith, counter-clockwise as seen from behind the camera (to the
/// left) positive, above -180 up to 180 degrees: tilt less parallactic angle.
///
/// The parallactic angle at the picture's centre is the position angle of the zenith there: positive west of the meridian
/// for northern sites.
#[must_use]
pub fn lean_from_zenith(tilt: Angle, parallactic: Angle) -> Angle {
    (tilt - parallactic).signed()
}

/// The two dots of a picture that lie nearest to each other.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ClosestDots {
    /// Places in the list, in order.
    pub first: usize,
    pub second: usize,
    pub separation: Angle,
}

impl ClosestDots {
    /// Pixels from dot to dot where a picture shows both.
    #[must_use]
    pub fn pixels(&self, dots: &[Vec3], frame: &PhotoFrame) -> Option<f64> {
        let a = frame.pixel(*dots.get(self.first)?)?;
        let b = frame.pixel(*dots.get(self.second)?)?;
        Some(libm::hypot(a.x - b.x, a.y - b.y))
    }
}

/// The closest pair among the dots, neighbours in time or not: they crowd at stations and where a loop crosses itself.
/// `None` for fewer than two.
#[must_use]
pub fn closest_dots(dots: &[Vec3]) -> Option<ClosestDots> {
    let mut least: Option<(f64, usize, usize)> = None;
    for (first, a) in dots.iter().enumerate() {
        for (second, b) in dots.iter().enumerate().skip(first + 1) {
            let away = a.unit() - b.unit();
            let distance = away.dot(away);
            if least.is_none_or(|(least, ..)| distance < least) {
                least = Some((distance, first, second));
            }
        }
    }
    let (_, first, second) = least?;
    let separation = dots.get(first)?.separation(*dots.get(second)?);
    Some(ClosestDots { first, second, separation })
}
