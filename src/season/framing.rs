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
    #[error(
        "direction {index} (counted from 0) is no direction: a vector with finite components and a length is needed"
    )]
    NotADirection { index: usize },
    #[error(
        "the chosen directions, with their margin, reach {reach:.0} deg from their middle; {greatest:.0} deg is the most: choose a \
         shorter part of the path or fewer stars"
    )]
    TooWide { reach: f64, greatest: f64 },
    #[error(
        "the chosen directions all lie in one point: give a margin, or choose more of the path"
    )]
    NoExtent,
    #[error(
        "{pictures} pictures would be needed, {greatest} are the most: use a shorter lens or a shorter part of the path"
    )]
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
        let units = checked_units(directions)?;
        let middle = middle_of_cap(&units)?;
        let reach = units
            .iter()
            .map(|unit| middle.separation(*unit).degrees())
            .fold(0.0, f64::max);
        if reach > GREATEST_REACH_DEG {
            return Err(too_wide(reach));
        }
        let start = TangentPlane::of_sky(middle, Angle::ZERO);
        let flat = flatten(&start, &units)?;
        // Great circles are straight on every tangent plane, so the hull is the same on all of them.
        let hull = hull_indices(&flat)
            .into_iter()
            .map(|index| units[index])
            .collect();
        Ok(Subject {
            hull,
            margin: Angle::from_degrees(margin_deg).tan(),
            start,
        })
    }
}

/// # Errors
/// The first that has no length or a length that is no number.
fn checked_units(directions: &[Vec3]) -> Result<Vec<Vec3>, FrameError> {
    let checked = |(index, direction): (usize, &Vec3)| {
        let norm = direction.norm();
        if norm.is_finite() && norm > 0.0 {
            Ok(direction.unit())
        } else {
            Err(FrameError::NotADirection { index })
        }
    };
    directions.iter().enumerate().map(checked).collect()
}

fn too_wide(reach: f64) -> FrameError {
    FrameError::TooWide {
        reach,
        greatest: GREATEST_REACH_DEG,
    }
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
    if middle.norm() < 0.1 {
        Err(too_wide(90.0))
    } else {
        Ok(middle.unit())
    }
}

fn flatten(plane: &TangentPlane, directions: &[Vec3]) -> Result<Vec<PlanePoint>, FrameError> {
    directions
        .iter()
        .map(|direction| plane.project(*direction))
        .collect::<Option<_>>()
        .ok_or(too_wide(90.0))
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
    Sensor {
        width_mm: f64,
        height_mm: f64,
    },
}

impl Goal {
    /// Sides in units of the focal length, margins included.
    fn cost(self, width: f64, height: f64) -> f64 {
        match self {
            Goal::Area => width * height,
            Goal::Sensor {
                width_mm,
                height_mm,
            } => (width / width_mm).max(height / height_mm),
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
        let nothing = Bounds {
            left: f64::MAX,
            right: f64::MIN,
            bottom: f64::MAX,
            top: f64::MIN,
        };
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

/// A turn of the axes, counter-clockwise, above -90 up to 90 degrees, with what the box costs at it.
#[derive(Clone, Copy)]
struct Turn {
    angle: Angle,
    cost: f64,
}

/// The turns among which the best one is: an edge of the hull along an axis or, for a sensor, a box of the sensor's shape.
///
/// From edge turn to edge turn the same corners touch the box, and they only ever go round forward (Toussaint 1983, *Proc.
/// MELECON*, A10.02).
fn candidate_turns(hull: &[PlanePoint], margin: f64, goal: Goal) -> Vec<Turn> {
    let edges = edge_turns(hull);
    let Some(first) = edges.first() else {
        return Vec::new();
    };
    // Numbers of the corners that touch the box to the right, top, left and bottom.
    let mut touching = [0; 4];
    let mut turns = Vec::with_capacity(4 * edges.len());
    let ends = edges
        .iter()
        .skip(1)
        .copied()
        .chain([*first + Angle::QUARTER_TURN]);
    for (from, to) in edges.iter().copied().zip(ends) {
        let middle = (from + to) * 0.5;
        let sin_cos = middle.sin_cos();
        let outward = |index: usize| {
            let PlanePoint { x, y } = hull[index % hull.len()].on_turned_axes(sin_cos);
            [x, y, -x, -y]
        };
        for (side, index) in touching.iter_mut().enumerate() {
            // All round at the first turn, a corner or two later.
            let mut farthest = *index;
            for next in *index + 1..*index + hull.len() {
                if outward(next)[side] > outward(farthest)[side] {
                    farthest = next;
                } else if !turns.is_empty() {
                    break;
                }
            }
            *index = farthest;
        }
        let [right, top, left, bottom] = touching.map(|index| hull[index % hull.len()]);
        let across = PlanePoint {
            x: right.x - left.x,
            y: right.y - left.y,
        };
        let along = PlanePoint {
            x: top.x - bottom.x,
            y: top.y - bottom.y,
        };
        // A quarter turn more exchanges width and height.
        let mut push = |turn: Angle, quarter: bool| {
            let sin_cos = turn.sin_cos();
            let width = across.on_turned_axes(sin_cos).x + 2.0 * margin;
            let height = along.on_turned_axes(sin_cos).y + 2.0 * margin;
            turns.push(if quarter {
                Turn {
                    angle: upright(turn + Angle::QUARTER_TURN),
                    cost: goal.cost(height, width),
                }
            } else {
                Turn {
                    angle: upright(turn),
                    cost: goal.cost(width, height),
                }
            });
        };
        for quarter in [false, true] {
            push(from, quarter);
            let Goal::Sensor {
                width_mm,
                height_mm,
            } = goal
            else {
                continue;
            };
            // The width is a cos t + b sin t, the height d cos t - c sin t for the differences (a, b) and (c, d), and
            // width times the sensor's height equals height times its width, margins included, where A cos t + B sin t = C.
            let (by, over) = if quarter {
                (width_mm, height_mm)
            } else {
                (height_mm, width_mm)
            };
            let cosine = by * across.x - over * along.y;
            let sine = by * across.y + over * along.x;
            let constant = 2.0 * margin * (over - by);
            let size = libm::hypot(cosine, sine);
            if !(size > 0.0 && constant.abs() <= size) {
                continue;
            }
            let peak = Angle::from_radians(libm::atan2(sine, cosine));
            let aside = Angle::from_radians(libm::acos(constant / size));
            for turn in [peak - aside, peak + aside] {
                if (turn - middle).signed().abs() <= (to - from) * 0.5 {
                    push(turn, quarter);
                }
            }
        }
    }
    turns
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

/// A rectangle around the centre of its own plane.
#[derive(Clone, Copy)]
struct Settled {
    plane: TangentPlane,
    half_width: f64,
    half_height: f64,
    cost: f64,
}

/// How the next turn is chosen while the plane settles.
#[derive(Clone, Copy, PartialEq)]
enum Choice {
    /// The least cost; among equals the smallest turn.
    Best,
    /// The smallest turn: stays with the edge or the shape it has.
    Nearest,
}

/// Turns and moves the plane until the box stands around its centre.
fn follow(
    subject: &Subject,
    goal: Goal,
    start: TangentPlane,
    choice: Choice,
) -> Result<Settled, FrameError> {
    /// Two tilts may follow each other for ever; after these rounds only the centre settles.
    const TURNING_ROUNDS: usize = 20;
    const ALL_ROUNDS: usize = 40;
    /// 0.00002".
    const STILL: Angle = Angle::from_radians(1e-10);
    let mut plane = start;
    let mut round = 0;
    loop {
        let mut flat = flatten(&plane, &subject.hull)?;
        // The first turn of a start that was chosen is the start's own.
        if round < TURNING_ROUNDS && (choice == Choice::Best || round > 0) {
            let turn = next_turn(&flat, subject.margin, goal, choice);
            plane = plane.turned(turn.sin_cos());
            flat.iter_mut()
                .for_each(|point| *point = point.on_turned_axes(turn.sin_cos()));
        }
        let bounds = Bounds::of(flat.into_iter());
        let (right, up) = bounds.middle();
        round += 1;
        if round == ALL_ROUNDS || (right.abs() < STILL && up.abs() < STILL) {
            let half_width = bounds.right.max(-bounds.left) + subject.margin;
            let half_height = bounds.top.max(-bounds.bottom) + subject.margin;
            let cost = goal.cost(2.0 * half_width, 2.0 * half_height);
            return Ok(Settled {
                plane,
                half_width,
                half_height,
                cost,
            });
        }
        plane = plane.moved(right, up);
    }
}

fn next_turn(hull: &[PlanePoint], margin: f64, goal: Goal, choice: Choice) -> Angle {
    let turns = candidate_turns(hull, margin, goal);
    let size = |turn: &Turn| turn.angle.abs().radians();
    let next = match choice {
        Choice::Nearest => turns.iter().min_by(|a, b| size(a).total_cmp(&size(b))),
        Choice::Best => {
            let least = turns.iter().map(|turn| turn.cost).fold(f64::MAX, f64::min);
            let equal = turns
                .iter()
                .filter(|turn| turn.cost <= least * (1.0 + 1e-9));
            equal.min_by(|a, b| size(a).total_cmp(&size(b)))
        }
    };
    // A hull without edges is one point, which any turn suits.
    next.map_or(Angle::ZERO, |turn| turn.angle)
}

/// The best rectangle: the best tilt on the plane where it settles, or a rival of it.
fn settle(subject: &Subject, goal: Goal) -> Result<Settled, FrameError> {
    let first = follow(subject, goal, subject.start, Choice::Best)?;
    best_rival(subject, goal, first)
}

impl Settled {
    /// Least cost that a rival on this plane may have on its own: both change by about the square of the half diagonal (the
    /// factor found by trial: no better rival escaped in 20 000 trials to 60 degrees).
    fn least_rival(&self) -> f64 {
        self.cost
            / (1.0
                + 0.3 * (self.half_width * self.half_width + self.half_height * self.half_height))
    }
}

/// Settles the tilts that cost little more than the best on its plane, each on its own plane; the best of all.
fn best_rival(subject: &Subject, goal: Goal, first: Settled) -> Result<Settled, FrameError> {
    const MOST_RIVALS: usize = 8;
    let mut rivals = candidate_turns(&flatten(&first.plane, &subject.hull)?, subject.margin, goal);
    let near_tie = first.cost * first.cost / first.least_rival();
    rivals.retain(|turn| turn.cost <= near_tie && turn.angle.abs().radians() > 1e-6);
    rivals.sort_by(|a, b| a.cost.total_cmp(&b.cost));
    let mut best = first;
    for turn in rivals.into_iter().take(MOST_RIVALS) {
        let rival = follow(
            subject,
            goal,
            first.plane.turned(turn.angle.sin_cos()),
            Choice::Nearest,
        )?;
        if rival.cost < best.cost {
            best = rival;
        }
    }
    Ok(best)
}

/// The plane turned by half a turn where that brings its upward direction nearer to north.
fn north_up(plane: TangentPlane) -> TangentPlane {
    let tilt = plane.position_angle();
    if upright(tilt) == tilt {
        plane
    } else {
        plane.turned((0.0, -1.0))
    }
}

/// The rectangle of least area that holds all directions with a margin, on the tangent plane at its own centre. Its width is
/// the longer side, its tilt above -90 up to 90 degrees.
///
/// The area is that in the picture (square of the focal length). The margin is as wide in the picture on all four sides:
/// `margin` at the centre, less on the sky towards the corners. Found to 1e-7 for pictures to 60 degrees; beyond 80 degrees, one
/// in a thousand is up to 2 % larger than need be.
///
/// # Errors
/// Nothing to hold, something that is no direction, directions more than 70 degrees from their middle, a margin outside 0 to
/// 45 degrees.
pub fn smallest_rectangle(directions: &[Vec3], margin: Angle) -> Result<Rectangle, FrameError> {
    let subject = Subject::new(directions, margin)?;
    let settled = settle(&subject, Goal::Area)?;
    let (plane, width, height) = if settled.half_width < settled.half_height {
        (
            settled.plane.turned((1.0, 0.0)),
            settled.half_height,
            settled.half_width,
        )
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

/// The longest focal length at which a picture holds all directions with a margin: least max(width/W, height/H) over the
/// tilt, with the directions in the middle of the picture both ways. See [`smallest_rectangle`] for the margin.
///
/// Where one side has room to spare, a centre moved along it can win some 0.1 % for pictures of 50 degrees, which leaves
/// uneven air; it is not sought.
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
    // 0.00002": what is left of one point by rounding is far less.
    if settled.half_width.max(settled.half_height) < 1e-10 {
        return Err(FrameError::NoExtent);
    }
    Ok(LongestLens {
        focal_length_mm: 1.0 / settled.cost,
        plane: north_up(settled.plane),
    })
}

fn sensor_goal(sensor: &Sensor) -> Goal {
    Goal::Sensor {
        width_mm: sensor.width_mm(),
        height_mm: sensor.height_mm(),
    }
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
    pub(super) fn from_plane(
        point: PlanePoint,
        rectangle: &Rectangle,
        columns: u32,
        rows: u32,
    ) -> Self {
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
    pub fn new(
        centre: Vec3,
        tilt: Angle,
        lens: &Lens,
        sensor: &Sensor,
    ) -> Result<Self, FrameError> {
        checked_units(&[centre])?;
        within(
            "tilt",
            tilt.degrees(),
            (-360.0, 360.0),
            "degrees, from north through east",
        )?;
        Ok(PhotoFrame::on_plane(
            TangentPlane::of_sky(centre, tilt),
            lens,
            sensor,
        ))
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
        Some(Pixel::from_plane(
            point,
            &self.rectangle,
            self.columns,
            self.rows,
        ))
    }

    /// Unit vector to what falls on a point of the picture.
    #[must_use]
    pub fn direction(&self, pixel: Pixel) -> Vec3 {
        self.rectangle
            .plane()
            .direction(pixel.to_plane(&self.rectangle, self.columns, self.rows))
    }

    /// Whether a direction lies in the picture, edges included.
    #[must_use]
    pub fn holds(&self, direction: Vec3) -> bool {
        self.rectangle.holds(direction)
    }

    /// The part of a path that lies in the picture; neighbouring points are joined by great circles. A step from or to what
    /// is no direction counts for nothing.
    #[must_use]
    pub fn part_held(&self, path: &[Vec3]) -> PartHeld {
        let mut stretches: Vec<Stretch> = Vec::new();
        let (mut held, mut all) = (0.0, 0.0);
        for (index, (a, b)) in path.iter().zip(path.iter().skip(1)).enumerate() {
            let (a, b) = (a.unit(), b.unit());
            let step = a.separation(b).radians();
            if !step.is_finite() {
                continue;
            }
            all += step;
            let Some((from, to)) = self.rectangle.clip(a, b) else {
                continue;
            };
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
            f64::from(u8::from(
                path.first().is_some_and(|point| self.holds(*point)),
            ))
        };
        PartHeld {
            fraction: fraction.min(1.0),
            stretches,
        }
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
    let path = &checked_units(path)?;
    let also = &checked_units(also)?;
    let mut wanted: Vec<Vec3> = Vec::with_capacity(path.len() + also.len());
    let mut framed = |run: &[Vec3]| -> Result<Option<PhotoFrame>, FrameError> {
        wanted.clear();
        wanted.extend_from_slice(run);
        wanted.extend_from_slice(also);
        let subject = match Subject::new(&wanted, margin) {
            Err(FrameError::TooWide { .. }) => return Ok(None),
            subject => subject?,
        };
        let goal = sensor_goal(sensor);
        let allowed = 1.0 / lens.focal_length_mm();
        let mut settled = follow(&subject, goal, subject.start, Choice::Best)?;
        if settled.cost > allowed && settled.least_rival() <= allowed {
            settled = best_rival(&subject, goal, settled)?;
        }
        Ok((settled.cost <= allowed)
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
                best = Some((
                    run,
                    LongestRun {
                        first,
                        last,
                        fraction,
                        frame,
                    },
                ));
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
    let overlap = within(
        "overlap",
        overlap,
        (0.0, 0.9),
        "as a share of the picture's side (0.2 is usual)",
    )?;
    let subject = Subject::new(directions, margin)?;
    let settled = settle(&subject, sensor_goal(sensor))?;
    if settled.cost * lens.focal_length_mm() <= 1.0 {
        let frame = PhotoFrame::on_plane(north_up(settled.plane), lens, sensor);
        return Ok(Mosaic {
            columns: 1,
            rows: 1,
            tiles: vec![Tile {
                frame,
                holds_any: true,
            }],
        });
    }
    let flat = flatten(&settled.plane, &subject.hull)?;
    let (width, height) = Rectangle::of_camera(settled.plane, lens, sensor).half_sides();
    let mut best: Option<(Grid, TangentPlane)> = None;
    let mut fewest_seen = usize::MAX;
    let edges = edge_turns(&flat);
    let quarters = edges.iter().map(|edge| *edge + Angle::QUARTER_TURN);
    for turn in [Angle::ZERO]
        .into_iter()
        .chain(edges.iter().copied())
        .chain(quarters)
    {
        let sin_cos = turn.sin_cos();
        let bounds = Bounds::of(flat.iter().map(|point| point.on_turned_axes(sin_cos)));
        let (right, up) = bounds.middle();
        let plane = north_up(settled.plane.turned(sin_cos).moved(right, up));
        let reach = Reach::of(&plane, &subject.hull, margin)?;
        match (GridTask {
            reach,
            overlap,
            width,
            height,
        })
        .fewest()
        {
            Ok(grid) => {
                if best
                    .as_ref()
                    .is_none_or(|(least, _)| grid.count() < least.count())
                {
                    best = Some((grid, plane));
                }
            }
            Err(count) => fewest_seen = fewest_seen.min(count),
        }
    }
    let (grid, plane) = best.ok_or(FrameError::TooManyPictures {
        pictures: fewest_seen,
        greatest: MOST_TILES,
    })?;
    Ok(grid.lay(&plane, directions, lens, sensor))
}

/// How far directions with their margin reach from the centre of a plane, to either side and up or down.
#[derive(Clone, Copy)]
struct Reach {
    sideways: f64,
    upward: f64,
}

impl Reach {
    fn of(plane: &TangentPlane, directions: &[Vec3], margin: Angle) -> Result<Self, FrameError> {
        const GREATEST_REACH_DEG: f64 = 80.0;
        let mut reach = Reach {
            sideways: 0.0,
            upward: 0.0,
        };
        for direction in directions {
            let (right, up) = plane.right_and_up(*direction);
            // A small circle around a direction spans asin(sin m / cos up) of the parallels.
            let aside = libm::asin((margin.sin() / up.cos()).clamp(0.0, 1.0));
            reach.sideways = reach.sideways.max(right.abs().radians() + aside);
            reach.upward = reach.upward.max((up.abs() + margin).radians());
        }
        let greatest = Angle::from_radians(reach.sideways.max(reach.upward)).degrees();
        if greatest > GREATEST_REACH_DEG {
            return Err(FrameError::TooWide {
                reach: greatest,
                greatest: GREATEST_REACH_DEG,
            });
        }
        Ok(reach)
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

/// What a grid is made for.
struct GridTask {
    reach: Reach,
    overlap: f64,
    /// Tangents of half the field.
    width: f64,
    height: f64,
}

impl GridTask {
    /// Angle sideways that a picture holds all the way up.
    fn half_width(&self, raised: f64) -> f64 {
        libm::atan(self.width / (libm::cos(raised) + self.height * libm::sin(raised).abs()))
    }

    fn columns_for(&self, half_width: f64) -> usize {
        needed(
            self.reach.sideways,
            half_width,
            2.0 * half_width * (1.0 - self.overlap),
        )
    }

    /// The grid of fewest pictures, or about how many too many there would be.
    fn fewest(&self) -> Result<Grid, usize> {
        let least_columns = self.columns_for(self.half_width(0.0));
        // The narrowest that any row can be.
        let most_columns = self.columns_for(libm::atan(self.width / libm::hypot(1.0, self.height)));
        let half_height = libm::atan(self.height);
        let flat_rows = needed(
            self.reach.upward,
            half_height,
            2.0 * half_height * (1.0 - self.overlap),
        );
        let flat_count = least_columns.saturating_mul(flat_rows);
        let mut best: Option<Grid> = None;
        if flat_count <= MOST_TILES {
            for columns in least_columns..=most_columns {
                for odd in [true, false] {
                    let Some(rows) = self.rows(columns, odd) else {
                        continue;
                    };
                    let grid = Grid { columns, rows };
                    if best.as_ref().is_none_or(|best| grid.count() < best.count()) {
                        best = Some(grid);
                    }
                }
            }
        }
        best.ok_or(flat_count.max(MOST_TILES + 1))
    }

    /// Rows from the middle up until they reach far enough, and as many down; each as far from the last as the overlap
    /// and the curved edges allow. `None` for more pictures than wanted.
    fn rows(&self, columns: usize, odd: bool) -> Option<Vec<GridRow>> {
        /// Next to a pole of the grid rows become circles.
        const HIGHEST_TOP: f64 = 89.9 / 180.0 * std::f64::consts::PI;
        let half_height = libm::atan(self.height);
        let row_step = 2.0 * half_height * (1.0 - self.overlap);
        let mut upper: Vec<GridRow> = Vec::new();
        let mut raised = if odd { 0.0 } else { 0.5 * row_step };
        loop {
            raised = raised.min(HIGHEST_TOP - half_height);
            let half_width = self.half_width(raised);
            let count = columns * (2 * upper.len() + if odd { 1 } else { 2 });
            if count > MOST_TILES
                || self.columns_for(half_width) > columns
                || upper.last().is_some_and(|last| last.raised >= raised)
            {
                return None;
            }
            let step = 2.0 * half_width * (1.0 - self.overlap);
            upper.push(GridRow { raised, step });
            // The farthest that a direction lies aside of the middle of its nearest picture.
            let last = 0.5 * (columns as f64 - 1.0) * step;
            let between = if columns > 1 { 0.5 * step } else { 0.0 };
            let aside = between.max(self.reach.sideways - last);
            let top = libm::atan(libm::cos(aside) * libm::tan(raised + half_height));
            if top >= self.reach.upward {
                break;
            }
            raised = (raised + row_step).min(top + half_height);
        }
        let lower = upper.iter().skip(usize::from(odd)).rev();
        let lower = lower.map(|row| GridRow {
            raised: -row.raised,
            step: row.step,
        });
        Some(lower.chain(upper.iter().copied()).collect())
    }
}

impl Grid {
    fn count(&self) -> usize {
        self.columns * self.rows.len()
    }

    fn lay(
        &self,
        plane: &TangentPlane,
        directions: &[Vec3],
        lens: &Lens,
        sensor: &Sensor,
    ) -> Mosaic {
        let mut tiles = Vec::with_capacity(self.count());
        for row in self.rows.iter().rev() {
            for column in 0..self.columns {
                let right = (column as f64 - 0.5 * (self.columns as f64 - 1.0)) * row.step;
                let plane =
                    plane.moved(Angle::from_radians(right), Angle::from_radians(row.raised));
                let frame = PhotoFrame::on_plane(plane, lens, sensor);
                let holds_any = directions.iter().any(|direction| frame.holds(*direction));
                tiles.push(Tile { frame, holds_any });
            }
        }
        Mosaic {
            columns: self.columns,
            rows: self.rows.len(),
            tiles,
        }
    }
}

/// Pictures with half a side `half`, `step` apart, that span `reach` to either side.
fn needed(reach: f64, half: f64, step: f64) -> usize {
    if reach <= half {
        1
    } else {
        ((2.0 * (reach - half) / step).ceil() as usize).saturating_add(1)
    }
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
/// What is no direction is passed over; `None` for fewer than two.
#[must_use]
pub fn closest_dots(dots: &[Vec3]) -> Option<ClosestDots> {
    let mut least: Option<(f64, usize, usize)> = None;
    for (first, a) in dots.iter().enumerate() {
        for (second, b) in dots.iter().enumerate().skip(first + 1) {
            let away = a.unit() - b.unit();
            let distance = away.dot(away);
            if distance.is_finite() && least.is_none_or(|(least, ..)| distance < least) {
                least = Some((distance, first, second));
            }
        }
    }
    let (_, first, second) = least?;
    let separation = dots.get(first)?.separation(*dots.get(second)?);
    Some(ClosestDots {
        first,
        second,
        separation,
    })
}
