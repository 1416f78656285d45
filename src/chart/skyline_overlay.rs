//! What the turning sky lays over the strip at an instant: the silhouette of the skyline, the shade of dusk, the Sun's
//! glare, and the mark of where the subject stands. A picture of its own, light enough to be made anew in every frame.
//!
//! The skyline is drawn un-refracted, as the strip's places are: a direction is covered where its apparent altitude is
//! below the skyline's. The strip shows astrometric places, the horizon turns among apparent ones: the edge is true to
//! the 20" of aberration. Every coordinate goes through the mapping of the strip's rows, which may stand on their head.

use crate::season::Season;
use crate::season::moment::{Moment, Readings, Twilight};
use crate::sky::refraction::{Air, true_from_apparent};
use crate::sky::{Angle, Body, Mat3, Skyline, Vec3};

use super::geometry::{self, Point, Rect};
use super::palette::Role;
use super::scene::{
    Align, Label, Layer, Mark, MarkId, Paint, RibbonPoint, Run, Scene, Shape, Stop, Stroke,
};
use super::strip::{StripLayout, StripRow};
use super::text::Font;

/// Longest piece of the outline, degrees along azimuth or up a wall.
const PIECE_DEGREES: f64 = 0.5;
/// Longest step in ecliptic longitude between corners, where the skyline passes near a pole of the ecliptic.
const LONGEST_STEP_DEGREES: f64 = 12.0;
/// Days of the path behind the mark of the moment.
const SHADOW_DAYS: f64 = 12.0;

/// A skyline ready to be laid over strips: made once for a site.
#[derive(Clone, Debug)]
pub struct Outline {
    skyline: Skyline,
    air: Air,
    /// Unit vectors east, north, up, un-refracted, going round with azimuth.
    corners: Vec<Vec3>,
    parts: Vec<Part>,
    compass: Vec<CompassPoint>,
}

/// A place on the edge that is marked on a panorama board.
#[derive(Clone, Debug)]
struct CompassPoint {
    edge: Vec3,
    /// Half a degree below it.
    below: Vec3,
    kind: CompassKind,
}

#[derive(Clone, Debug)]
enum CompassKind {
    /// N, NE, E and so on.
    Main(&'static str),
    /// NNE, ENE and so on.
    Between(&'static str),
    /// Whole tens of degrees.
    Degrees(String),
    Tick,
}

/// A part of the skyline that has a name.
#[derive(Clone, Debug)]
struct Part {
    name: String,
    /// Azimuths, the later one perhaps beyond 360 degrees.
    from: Angle,
    to: Angle,
}

impl Outline {
    #[must_use]
    pub fn new(skyline: &Skyline, air: &Air) -> Self {
        let mut corners = Vec::new();
        let mut parts: Vec<Part> = Vec::new();
        for segment in skyline.segments() {
            let width = segment.to_azimuth - segment.from_azimuth;
            let rise = segment.to_altitude - segment.from_altitude;
            let longest = width.degrees().max(rise.degrees().abs());
            let pieces = (longest / PIECE_DEGREES).ceil().max(1.0);
            let mut piece = 0.0;
            while piece < pieces {
                let share = piece / pieces;
                corners.push(local(
                    segment.from_azimuth + width * share,
                    segment.from_altitude + rise * share,
                    air,
                ));
                piece += 1.0;
            }
            let Some(name) = segment.name else { continue };
            match parts.last_mut() {
                Some(part) if part.name == name && part.to == segment.from_azimuth => {
                    part.to = segment.to_azimuth;
                }
                _ => parts.push(Part {
                    name: name.to_owned(),
                    from: segment.from_azimuth,
                    to: segment.to_azimuth,
                }),
            }
        }
        let mut outline = Outline {
            skyline: skyline.clone(),
            air: *air,
            corners,
            parts,
            compass: Vec::new(),
        };
        outline.compass = outline.compass_points();
        outline
    }

    /// The horizon's points first, then degrees.
    fn compass_points(&self) -> Vec<CompassPoint> {
        const POINTS: [&str; 16] = [
            "N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW",
            "NW", "NNW",
        ];
        let point = |azimuth_degrees: f64, kind: CompassKind| {
            let azimuth = Angle::from_degrees(azimuth_degrees);
            CompassPoint {
                edge: self.edge(azimuth, Angle::ZERO),
                below: self.edge(azimuth, Angle::from_degrees(0.5)),
                kind,
            }
        };
        let named = (0_u32..).zip(POINTS).map(|(index, name)| {
            let kind = if index % 2 == 0 {
                CompassKind::Main(name)
            } else {
                CompassKind::Between(name)
            };
            point(22.5 * f64::from(index), kind)
        });
        let degrees = (0_u32..360).step_by(5).map(|degree| {
            let kind = if degree % 10 == 0 && degree % 45 != 0 {
                CompassKind::Degrees(format!("{degree}°"))
            } else {
                CompassKind::Tick
            };
            point(f64::from(degree), kind)
        });
        named.chain(degrees).collect()
    }

    /// Whether a local direction (east, north, up; un-refracted) lies below the skyline.
    #[must_use]
    pub fn covers(&self, local: Vec3) -> bool {
        self.height_over(local) < 0.0
    }

    /// Un-refracted altitude above the skyline's, radians.
    fn height_over(&self, local: Vec3) -> f64 {
        let azimuth = Angle::from_radians(libm::atan2(local.x, local.y));
        let edge = true_from_apparent(self.skyline.altitude_at(azimuth), &self.air);
        (local.latitude() - edge).radians()
    }

    /// The edge at an azimuth, `below` it by so much.
    fn edge(&self, azimuth: Angle, below: Angle) -> Vec3 {
        let (sin, cos) = azimuth.sin_cos();
        let altitude = true_from_apparent(self.skyline.altitude_at(azimuth), &self.air) - below;
        let (sin_alt, cos_alt) = altitude.sin_cos();
        Vec3::new(cos_alt * sin, cos_alt * cos, sin_alt)
    }
}

/// East, north, up at an azimuth and an apparent altitude, un-refracted.
fn local(azimuth: Angle, apparent_altitude: Angle, air: &Air) -> Vec3 {
    let (sin, cos) = azimuth.sin_cos();
    let (sin_alt, cos_alt) = true_from_apparent(apparent_altitude, air).sin_cos();
    Vec3::new(cos_alt * sin, cos_alt * cos, sin_alt)
}

/// How the overlay is drawn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OverlayStyle<'a> {
    /// Of the strip's whole sheet, points.
    pub width: f64,
    pub height: f64,
    /// Size of the text: 1 for print.
    pub text_scale: f64,
    /// Radius of the Sun's glare.
    pub sun_distance: Angle,
    /// Boxes that words in the silhouette keep clear of: see [`note_boxes`].
    pub keep_clear: &'a [Rect],
}

/// What lies over what when an overlay is laid over its strip.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Level {
    /// The strip's paper, its stars and constellations with their names: what drowns in twilight.
    Paper,
    /// The overlay's dusk and glare.
    Shade,
    /// The strip's scale, paths and their names.
    Paths,
    /// The overlay's silhouette.
    Skyline,
    /// The strip's events and dates, which stay legible over the silhouette, and its frame.
    Notes,
    /// The overlay's words and marks.
    Over,
}

impl Level {
    /// The level of a mark of the strip.
    #[must_use]
    pub const fn of_strip(mark: &Mark) -> Self {
        match (mark.layer, mark.id) {
            (Layer::Sheet | Layer::Plate | Layer::Boundaries | Layer::Stars, _)
            | (_, MarkId::Star(_) | MarkId::Constellation(_)) => Level::Paper,
            (Layer::Frame, _)
            | (
                Layer::Leaders | Layer::Labels | Layer::Marks,
                MarkId::Event(_) | MarkId::Tick(_) | MarkId::Sheet | MarkId::Scale,
            ) => Level::Notes,
            _ => Level::Paths,
        }
    }

    /// The level of a mark of the overlay.
    #[must_use]
    pub const fn of_overlay(mark: &Mark) -> Self {
        match mark.layer {
            Layer::Shade => Level::Shade,
            Layer::Skyline => Level::Skyline,
            _ => Level::Over,
        }
    }
}

/// Boxes of the strip's words that stay legible over the silhouette.
#[must_use]
pub fn note_boxes(strip: &Scene) -> Vec<Rect> {
    strip
        .marks
        .iter()
        .filter(|mark| Level::of_strip(mark) == Level::Notes && mark.layer == Layer::Labels)
        .filter_map(|mark| match &mark.shape {
            Shape::Label(label) => Some(label.bounds()),
            _ => None,
        })
        .collect()
}

/// Strip and overlay as one picture, every mark at its level.
#[must_use]
pub fn overlaid(strip: &Scene, overlay: &Scene) -> Scene {
    let mut marks: Vec<(Level, &Mark)> = strip
        .marks
        .iter()
        .map(|mark| (Level::of_strip(mark), mark))
        .chain(
            overlay
                .marks
                .iter()
                .map(|mark| (Level::of_overlay(mark), mark)),
        )
        .collect();
    marks.sort_by_key(|(level, _)| *level);
    Scene {
        width: strip.width,
        height: strip.height,
        title: strip.title.clone(),
        description: format!("{} {}", strip.description, overlay.description),
        marks: marks.into_iter().map(|(_, mark)| mark.clone()).collect(),
    }
}

/// Draws what an instant lays over a strip of that layout.
#[must_use]
pub fn skyline_overlay(
    season: &Season,
    layout: &StripLayout,
    outline: &Outline,
    moment: &Moment,
    style: &OverlayStyle<'_>,
) -> Scene {
    let mut scene = Scene {
        width: style.width,
        height: style.height,
        title: String::from("The sky at the moment shown"),
        description: description(moment),
        marks: Vec::new(),
    };
    let ecliptic_from_local =
        season.frame.ecliptic_from_icrs * moment.axes.local_from_icrs.transposed();
    let corners = corners_on_ecliptic(outline, ecliptic_from_local);
    for row in &layout.rows {
        let mut painter = RowPainter {
            scene: &mut scene,
            corners: &corners,
            map: RowMap::new(row, ecliptic_from_local),
            outline,
            moment,
            season,
            style,
            taken: style.keep_clear.to_vec(),
        };
        painter.dusk();
        painter.glare();
        painter.silhouette();
        painter.shadow();
        painter.marks();
        painter.compass();
        painter.part_names();
    }
    scene.sort();
    scene
}

fn description(moment: &Moment) -> String {
    let mut words = format!("Sky: {}.", moment.sky.twilight.phrase());
    if let Some(subject) = moment.readings.first() {
        let height = subject.height_over_skyline().degrees();
        let part = subject.skyline_part.as_deref().unwrap_or("the skyline");
        let place = if height < 0.0 { "behind" } else { "over" };
        words.push_str(&format!(
            " {} {place} {part} by {:.1} degrees.",
            subject.body,
            height.abs()
        ));
    }
    words
}

/// A row of the strip as a plane map, to the horizon and back.
struct RowMap<'a> {
    row: &'a StripRow,
    ecliptic_from_local: Mat3,
    local_from_ecliptic: Mat3,
    /// The middle of the row, and what a degree east and a degree north move on the sheet.
    origin: Point,
    east: Point,
    north: Point,
}

impl<'a> RowMap<'a> {
    fn new(row: &'a StripRow, ecliptic_from_local: Mat3) -> Self {
        let origin = row.point(row.longitude, row.latitude);
        RowMap {
            row,
            ecliptic_from_local,
            local_from_ecliptic: ecliptic_from_local.transposed(),
            origin,
            east: row.point(row.longitude + 1.0, row.latitude).minus(origin),
            north: row.point(row.longitude, row.latitude + 1.0).minus(origin),
        }
    }

    /// From degrees east of the row's middle, not wrapped, and latitude.
    fn unrolled(&self, east: f64, latitude: f64) -> Point {
        self.origin
            .towards(self.east, east)
            .towards(self.north, latitude - self.row.latitude)
    }

    fn point_of_local(&self, local: Vec3) -> Point {
        self.row.point_of(self.ecliptic_from_local * local)
    }

    fn local_at(&self, point: Point) -> Vec3 {
        let (longitude, latitude) = self.row.place(point);
        self.local_from_ecliptic
            * Vec3::from_spherical(
                Angle::from_degrees(longitude),
                Angle::from_degrees(latitude),
            )
    }
}

/// A corner of the skyline on the ecliptic, degrees, its longitude running on from the corner before.
#[derive(Clone, Copy)]
struct Corner {
    longitude: f64,
    latitude: f64,
}

/// The skyline once round, its first corner repeated at the end.
fn corners_on_ecliptic(outline: &Outline, ecliptic_from_local: Mat3) -> Vec<Corner> {
    let around = outline.corners.iter().chain(outline.corners.first());
    let mut directions = around.map(|&local| ecliptic_from_local * local);
    let mut corners = Vec::with_capacity(outline.corners.len() + 1);
    let Some(first) = directions.next() else {
        return corners;
    };
    corners.push(Corner {
        longitude: first.longitude().degrees(),
        latitude: first.latitude().degrees(),
    });
    let mut last = first;
    for next in directions {
        walk(&mut corners, last, next, 10);
        last = next;
    }
    corners
}

struct RowPainter<'a> {
    scene: &'a mut Scene,
    map: RowMap<'a>,
    corners: &'a [Corner],
    outline: &'a Outline,
    moment: &'a Moment,
    season: &'a Season,
    style: &'a OverlayStyle<'a>,
    taken: Vec<Rect>,
}

/// 0 below `from`, 1 above `to`, smooth between.
fn smooth(value: f64, from: f64, to: f64) -> f64 {
    let part = ((value - from) / (to - from)).clamp(0.0, 1.0);
    part * part * (3.0 - 2.0 * part)
}

impl RowPainter<'_> {
    /// How strong the shade of dusk is towards a local direction, 0 to 1: a picture, not photometry. It grows with the Sun
    /// from -18 degrees, towards the Sun and towards the horizon, and is all over the sky by day.
    fn dusk_at(&self, local: Vec3, sun: Vec3) -> f64 {
        let depth = self.moment.sky.sun_altitude.degrees();
        let dusk = smooth(depth, -19.0, 1.0);
        let day = smooth(depth, -5.0, 3.0);
        let away = local.separation(sun).degrees() / 55.0;
        let low = libm::exp(-local.latitude().degrees().max(0.0) / 28.0);
        let glow = libm::exp(-away * away);
        let by_twilight = dusk * (0.22 + 0.5 * glow + 0.28 * low);
        (by_twilight + (0.9 - by_twilight) * day).clamp(0.0, 0.92)
    }

    fn sun_local(&self) -> Option<Vec3> {
        let sun = self.moment.of(Body::Sun)?;
        let (sin, cos) = sun.azimuth.sin_cos();
        let (sin_alt, cos_alt) = sun.altitude.sin_cos();
        Some(Vec3::new(cos_alt * sin, cos_alt * cos, sin_alt))
    }

    /// The shade of dusk as one gradient: along the way it changes fastest, or along a row too long for that.
    fn dusk(&mut self) {
        let frame = self.map.row.frame;
        let Some(sun) = self.sun_local() else { return };
        if self.moment.sky.sun_altitude.degrees() < -19.0 {
            return;
        }
        let strength = |point: Point| self.dusk_at(self.map.local_at(point), sun);
        let centre = frame.centre();
        let half = Point::new(frame.width() / 2.0, frame.height() / 2.0);
        let is_long = self.map.row.half_length() > 50.0;
        let along = if is_long {
            Point::new(1.0, 0.0)
        } else {
            let part = 0.8;
            let across = strength(centre.moved(half.x * part, 0.0))
                - strength(centre.moved(-half.x * part, 0.0));
            let up = strength(centre.moved(0.0, half.y * part))
                - strength(centre.moved(0.0, -half.y * part));
            let slope = Point::new(across / half.x, up / half.y).unit();
            if slope.length() > 0.0 {
                slope
            } else {
                Point::new(1.0, 0.0)
            }
        };
        let reach = half.x * along.x.abs() + half.y * along.y.abs();
        let (from, to) = (centre.towards(along, -reach), centre.towards(along, reach));
        let count = if is_long { 48_u32 } else { 12 };
        let stops = (0..=count)
            .map(|stop| {
                let part = f64::from(stop) / f64::from(count);
                // A little short of the ends, where a whole circle would come round to its other side.
                let at = from.between(to, 0.002 + 0.996 * part);
                Stop {
                    part,
                    paint: Paint::of(Role::Dusk).faded(strength(at)),
                }
            })
            .collect();
        self.scene.add(
            MarkId::Sheet,
            Layer::Shade,
            Shape::Shade {
                polygon: frame.corners().to_vec(),
                run: Run::Along { from, to },
                stops,
            },
        );
    }

    /// The Sun's glare: a soft disc as wide as the scenario's distance from the Sun, while the Sun is up.
    fn glare(&mut self) {
        let row = self.map.row;
        let Some(sun) = self.moment.of(Body::Sun) else {
            return;
        };
        let strength = smooth(self.moment.sky.sun_altitude.degrees(), -2.5, 0.0);
        let radius = self.style.sun_distance.degrees() * row.scale;
        if strength <= 0.0 || radius <= 0.0 {
            return;
        }
        let middle = row.point_of(self.season.frame.ecliptic_from_icrs * sun.direction);
        let turn = 360.0 * row.scale;
        for shift in [-turn, 0.0, turn] {
            let centre = middle.moved(shift, 0.0);
            if row.frame.nearest(centre).distance(centre) >= radius {
                continue;
            }
            let stop = |part: f64, amount: f64, opacity: f64| Stop {
                part,
                paint: Paint::mixed(Role::Moonlight, Role::Caution, amount)
                    .faded(opacity * strength),
            };
            self.scene.add(
                MarkId::Sheet,
                Layer::Shade,
                Shape::Shade {
                    polygon: row.frame.corners().to_vec(),
                    run: Run::Around { centre, radius },
                    stops: vec![
                        stop(0.0, 0.1, 0.95),
                        stop(0.1, 0.3, 0.8),
                        stop(0.3, 0.55, 0.42),
                        stop(0.65, 0.8, 0.13),
                        stop(1.0, 1.0, 0.0),
                    ],
                },
            );
        }
    }

    /// What lies below the skyline, and its edge.
    fn silhouette(&mut self) {
        const FAR_DEGREES: f64 = 100.0;
        let frame = self.map.row.frame;
        let corners = self.corners;
        let [first, .., last] = *corners else { return };
        let middle = Angle::from_degrees(self.map.row.longitude);
        // Degrees by which the walk is counted from elsewhere than this row's middle.
        let away = (Angle::from_degrees(first.longitude) - middle)
            .signed()
            .degrees()
            - first.longitude;
        // Once round the pole of the ecliptic that is under ground, or round neither or both.
        let turns = ((last.longitude - first.longitude) / 360.0).round();
        let copies: Vec<Vec<Point>> = [-1.0, 0.0, 1.0]
            .map(|copy| {
                let shift = away + copy * if turns < 0.0 { -360.0 } else { 360.0 };
                corners
                    .iter()
                    .map(|corner| self.map.unrolled(corner.longitude + shift, corner.latitude))
                    .collect()
            })
            .to_vec();
        let mut rings: Vec<Vec<Point>> = if turns == 0.0 {
            copies.clone()
        } else {
            let mut ring: Vec<Point> = copies.concat();
            if let [begin, .., end] = ring[..] {
                let down = |point: Point| point.towards(self.map.north, -2.0 * FAR_DEGREES);
                ring.extend([down(end), down(begin)]);
            }
            vec![ring]
        };
        rings = rings
            .iter()
            .map(|ring| clipped(ring, &frame))
            .filter(|ring| ring.len() > 2)
            .collect();
        // The rings hold either the ground or the sky: a place well off the edge tells which.
        let probe = self.probe();
        let inside = rings
            .iter()
            .filter(|ring| geometry::inside(probe, ring))
            .count()
            % 2
            == 1;
        if inside != self.outline.covers(self.map.local_at(probe)) {
            rings.push(frame.corners().to_vec());
        }
        if rings.is_empty() {
            return;
        }
        self.scene.add(
            MarkId::Skyline,
            Layer::Skyline,
            Shape::Area {
                rings,
                fill: Paint::of(Role::Skyline).faded(0.9),
                edge: None,
            },
        );
        let whole: Vec<Vec<Point>> = if turns == 0.0 {
            copies
        } else {
            vec![copies.concat()]
        };
        for points in whole.iter().flat_map(|line| frame.clip_line(line)) {
            self.scene.add(
                MarkId::Skyline,
                Layer::Skyline,
                Shape::Line {
                    points,
                    stroke: Stroke::of(Role::FaintInk, 1.1),
                },
            );
        }
    }

    /// Of some places on the row the one farthest from the skyline.
    fn probe(&self) -> Point {
        let frame = self.map.row.frame;
        let mut best = (frame.centre(), -1.0);
        for across in [0.03, 0.25, 0.52, 0.77, 0.96] {
            for up in [0.06, 0.47, 0.93] {
                let point = Point::new(
                    frame.left + across * frame.width(),
                    frame.top + up * frame.height(),
                );
                let height = self.outline.height_over(self.map.local_at(point)).abs();
                if height > best.1 {
                    best = (point, height);
                }
            }
        }
        best.0
    }

    /// A short shadow of the last days behind the mark of the subject, fading backwards.
    fn shadow(&mut self) {
        let Some(subject) = self.moment.readings.first() else {
            return;
        };
        let now = self.moment.instant;
        let from = now.plus_days(-SHADOW_DAYS);
        let points = &self.season.track.points;
        let after = points.partition_point(|point| point.instant <= now);
        let first = points.partition_point(|point| point.instant < from);
        let frame = self.map.row.frame;
        let mut path: Vec<(Point, f64)> = points
            .get(first..after)
            .unwrap_or_default()
            .iter()
            .map(|point| {
                let at = self.row_point(point.direction);
                (at, (now.days() - point.instant.days()) / SHADOW_DAYS)
            })
            .collect();
        path.push((self.row_point(subject.direction), 0.0));
        for pair in path.windows(2) {
            let &[(from, older), (to, newer)] = pair else {
                continue;
            };
            let Some((enter, leave)) = frame.clip(from, to) else {
                continue;
            };
            // A path that jumps from end to end of the row has run round its back.
            if from.distance(to) > frame.width() / 2.0 {
                continue;
            }
            let age = |part: f64| older + (newer - older) * part;
            let point = |part: f64| RibbonPoint {
                at: from.between(to, part),
                width: 11.0 - 8.0 * age(part),
                paint: Paint::of(Role::Selection).faded(0.4 * (1.0 - age(0.5))),
                index: 0,
            };
            self.scene.add(
                MarkId::Moment(subject.body),
                Layer::Skyline,
                Shape::Ribbon(vec![point(enter), point(leave)]),
            );
        }
    }

    fn row_point(&self, icrs: Vec3) -> Point {
        self.map
            .row
            .point_of(self.season.frame.ecliptic_from_icrs * icrs)
    }

    /// Where the bodies stand now: the subject by a strong ring, broken while it is behind the skyline.
    fn marks(&mut self) {
        let frame = self.map.row.frame;
        for (index, readings) in self.moment.readings.iter().enumerate().rev() {
            let at = self.row_point(readings.direction);
            if !frame.grown(-1.0).contains(at) {
                continue;
            }
            if index == 0 {
                self.subject_mark(readings, at);
            } else {
                self.other_mark(readings, at);
            }
        }
    }

    fn subject_mark(&mut self, readings: &Readings, at: Point) {
        let id = MarkId::Moment(readings.body);
        let behind = readings.height_over_skyline() < Angle::ZERO;
        let ring = |radius: f64, stroke: Stroke| Shape::Ring {
            centre: at,
            radius,
            stroke,
        };
        let dot = |radius: f64, role: Role| Shape::Disc {
            centre: at,
            radius,
            fill: Paint::of(role),
        };
        let ink = Stroke {
            dash: behind.then_some((2.6, 2.0)),
            ..Stroke::of(Role::Ink, 1.7)
        };
        self.add(id, ring(7.0, Stroke::of(Role::Plate, 3.6)));
        self.add(id, ring(7.0, ink));
        self.add(id, dot(3.2, Role::Plate));
        self.add(id, dot(2.2, Role::Ink));
        self.taken.push(Rect::around(at, 22.0, 22.0));
    }

    fn other_mark(&mut self, readings: &Readings, at: Point) {
        let id = MarkId::Moment(readings.body);
        let (radius, fill, edge) = match readings.body {
            Body::Sun if self.moment.sky.twilight == Twilight::Day => {
                (6.0, Role::Caution, Role::Ink)
            }
            Body::Sun => (5.0, Role::Sun, Role::Plate),
            Body::Moon => (5.0, Role::Moonlight, Role::FaintInk),
            _ => (3.6, Role::Companion, Role::Plate),
        };
        self.add(
            id,
            Shape::Disc {
                centre: at,
                radius,
                fill: Paint::of(fill),
            },
        );
        self.add(
            id,
            Shape::Ring {
                centre: at,
                radius,
                stroke: Stroke::of(edge, 1.1),
            },
        );
        self.taken
            .push(Rect::around(at, 2.0 * radius, 2.0 * radius));
        // Companions have their names on the strip.
        if !matches!(readings.body, Body::Sun | Body::Moon) {
            return;
        }
        let size = 8.4 * self.style.text_scale;
        let mut label = Label::new(
            at.moved(radius + 3.5, 0.35 * size),
            readings.body.name(),
            Font::Sans,
            size,
            Role::Ink,
        );
        let frame = self.map.row.frame.grown(-2.0);
        if !frame.holds(&label.bounds()) {
            label = label.aligned(Align::End);
            label.anchor.x = at.x - radius - 3.5;
        }
        if frame.holds(&label.bounds()) && self.is_free(&label.bounds()) {
            self.taken.push(label.bounds());
            self.add(id, Shape::Label(label));
        }
    }

    fn add(&mut self, id: MarkId, shape: Shape) {
        self.scene.add(id, Layer::Labels, shape);
    }

    fn is_free(&self, bounds: &Rect) -> bool {
        let roomy = bounds.grown(2.0);
        self.taken.iter().all(|other| !other.overlaps(&roomy))
    }

    /// Whether a box lies within the silhouette: looked at all along its upper, middle and lower line, since roofs are small.
    fn is_under(&self, bounds: &Rect) -> bool {
        const APART: f64 = 7.0;
        if !self.map.row.frame.grown(-1.5).holds(bounds) {
            return false;
        }
        let bounds = bounds.grown(1.5);
        let steps = (bounds.width() / APART).ceil().max(1.0);
        let mut step = 0.0;
        while step <= steps {
            let x = bounds.left + bounds.width() * step / steps;
            let middle = bounds.centre().y;
            for y in [bounds.top, middle, bounds.bottom] {
                if !self.outline.covers(self.map.local_at(Point::new(x, y))) {
                    return false;
                }
            }
            step += 1.0;
        }
        true
    }

    /// A place on the edge on the row and the way down into the silhouette; `None` outside the row.
    fn edge_at(&self, edge: Vec3, below: Vec3) -> Option<(Point, Point)> {
        let at = self.map.point_of_local(edge);
        if !self.map.row.frame.contains(at) {
            return None;
        }
        let down = self.map.point_of_local(below).minus(at).unit();
        (down.length() > 0.0).then_some((at, down))
    }

    /// Ticks and names of the horizon's points, set into the silhouette as on a panorama board.
    fn compass(&mut self) {
        let scale = self.map.row.scale;
        let size = self.style.text_scale;
        let outline = self.outline;
        for point in &outline.compass {
            let (words, font, size, role, tick) = match &point.kind {
                CompassKind::Main(name) => (*name, Font::SansStrong, 8.6 * size, Role::Ink, 6.0),
                CompassKind::Between(name) if scale >= 4.0 => {
                    (*name, Font::Sans, 8.6 * size, Role::Ink, 6.0)
                }
                CompassKind::Degrees(degrees) if scale >= 9.0 => (
                    degrees.as_str(),
                    Font::Sans,
                    7.0 * size,
                    Role::FaintInk,
                    4.5,
                ),
                CompassKind::Tick if scale >= 9.0 => ("", Font::Sans, 0.0, Role::FaintInk, 2.8),
                _ => continue,
            };
            let Some((at, down)) = self.edge_at(point.edge, point.below) else {
                continue;
            };
            if !words.is_empty() {
                let label = Label::new(at, words, font, size, role).aligned(Align::Middle);
                let Some(label) = self.set_into(label, down, &[tick + 2.5, tick + 6.0]) else {
                    continue;
                };
                self.taken.push(label.bounds());
                self.add(MarkId::Skyline, Shape::Label(label));
            }
            self.scene.add(
                MarkId::Skyline,
                Layer::Skyline,
                Shape::Line {
                    points: vec![at, at.towards(down, tick)],
                    stroke: Stroke::of(Role::FaintInk, 0.8),
                },
            );
        }
    }

    /// The label moved from its anchor on the edge down into the silhouette, to the first depth at which it is free.
    fn set_into(&self, label: Label, down: Point, depths: &[f64]) -> Option<Label> {
        let half = label.width() / 2.0;
        let (up, below) = (
            label.font.ascent() * label.size,
            label.font.descent() * label.size,
        );
        let reach = half * down.x.abs() + (up + below) / 2.0 * down.y.abs();
        depths.iter().find_map(|depth| {
            let centre = label.anchor.towards(down, depth + reach);
            let moved = Label {
                anchor: centre.moved(0.0, (up - below) / 2.0),
                ..label.clone()
            };
            let bounds = moved.bounds();
            (self.is_free(&bounds) && self.is_under(&bounds)).then_some(moved)
        })
    }

    fn part_names(&mut self) {
        let outline = self.outline;
        let size = 9.4 * self.style.text_scale;
        for part in &outline.parts {
            // Where most of it can be seen: its middle, else nearer its ends.
            let shares = [0.5, 0.35, 0.65, 0.2, 0.8, 0.05, 0.95];
            let found = shares.into_iter().find_map(|share| {
                let azimuth = part.from + (part.to - part.from) * share;
                let edge = outline.edge(azimuth, Angle::ZERO);
                let (at, down) =
                    self.edge_at(edge, outline.edge(azimuth, Angle::from_degrees(0.5)))?;
                let label = Label::new(at, part.name.clone(), Font::SerifItalic, size, Role::Ink)
                    .aligned(Align::Middle);
                self.set_into(label, down, &[14.0, 20.0, 28.0, 38.0])
            });
            if let Some(label) = found {
                self.taken.push(label.bounds());
                self.add(MarkId::Skyline, Shape::Label(label));
            }
        }
    }
}

/// Goes from one direction to the next along the map, in steps short enough to tell which way round the pole it went.
fn walk(corners: &mut Vec<Corner>, from: Vec3, to: Vec3, depth: u32) {
    let Some(last) = corners.last().copied() else {
        return;
    };
    let step = (to.longitude() - Angle::from_degrees(last.longitude))
        .signed()
        .degrees();
    if step.abs() > LONGEST_STEP_DEGREES && depth > 0 {
        let middle = (from + to).unit();
        walk(corners, from, middle, depth - 1);
        walk(corners, middle, to, depth - 1);
        return;
    }
    corners.push(Corner {
        longitude: last.longitude + step,
        latitude: to.latitude().degrees(),
    });
}

/// The part of a ring inside a rectangle (Sutherland and Hodgman 1974, Commun. ACM 17:32). A ring that leaves and comes
/// back runs along the rectangle's edge between, which an even-odd filling does not show.
fn clipped(ring: &[Point], frame: &Rect) -> Vec<Point> {
    /// Distance inside of one side.
    type Room = fn(&Rect, Point) -> f64;
    let sides: [Room; 4] = [
        |frame, point| point.x - frame.left,
        |frame, point| frame.right - point.x,
        |frame, point| point.y - frame.top,
        |frame, point| frame.bottom - point.y,
    ];
    let mut ring = ring.to_vec();
    for room in sides {
        let mut kept = Vec::with_capacity(ring.len() + 8);
        let Some(mut before) = ring.last().copied() else {
            break;
        };
        let mut room_before = room(frame, before);
        for point in ring {
            let room_here = room(frame, point);
            if (room_before < 0.0) != (room_here < 0.0) {
                let part = room_before / (room_before - room_here);
                kept.push(before.between(point, part));
            }
            if room_here >= 0.0 {
                kept.push(point);
            }
            (before, room_before) = (point, room_here);
        }
        ring = kept;
    }
    ring
}
