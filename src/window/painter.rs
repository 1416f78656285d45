//! Draws a [`Scene`] with egui: shapes become meshes once, text goes through egui's fonts each time it is shown.
//!
//! A [`Picture`] is tied to where it stands on screen, to a palette and to the density of pixels; whoever keeps one
//! compares these by equality. Places stay `f64` until a vertex is written. Edges are feathered over one pixel. What
//! lies outside the clip is left out, and points of lines that cannot be told apart are dropped.

use std::sync::Arc;

use egui::epaint::{TessellationOptions, Tessellator};
use egui::{Color32, FontId, Mesh, Pos2, Shape as EguiShape, TextFormat};

use super::polygon::{convex, quadrangles, trapezoids, triangles_within};
use super::theme::{colour, family};
use crate::chart::{
    Align, Label, Layer, Level, Mark, Paint, Palette, Point, Rect, RibbonPoint, Role, Run, Scene,
    Shape, Stop, Stroke,
};

/// Where a sheet stands on screen: its upper left corner and the size of its points.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Placement {
    pub left: f64,
    pub top: f64,
    /// Screen points to a point of the sheet.
    pub scale: f64,
}

impl Placement {
    #[must_use]
    pub fn at(&self, point: Point) -> Pos2 {
        let (x, y) = self.at_f64(point);
        Pos2::new(x as f32, y as f32)
    }

    /// The same without rounding.
    #[must_use]
    pub fn at_f64(&self, point: Point) -> (f64, f64) {
        (
            self.left + point.x * self.scale,
            self.top + point.y * self.scale,
        )
    }

    /// The point of the sheet under a place on screen.
    #[must_use]
    pub fn point(&self, pos: Pos2) -> Point {
        Point::new(
            (f64::from(pos.x) - self.left) / self.scale,
            (f64::from(pos.y) - self.top) / self.scale,
        )
    }

    /// A rectangle of the sheet on screen.
    #[must_use]
    pub fn rect(&self, rect: &Rect) -> egui::Rect {
        egui::Rect::from_min_max(
            self.at(Point::new(rect.left, rect.top)),
            self.at(Point::new(rect.right, rect.bottom)),
        )
    }
}

/// What a picture is made for.
#[derive(Clone, Debug, PartialEq)]
pub struct Easel {
    pub placement: Placement,
    pub palette: Palette,
    pub pixels_per_point: f32,
    /// The part of the screen that can be seen.
    pub clip: egui::Rect,
}

/// A scene as egui draws it.
#[derive(Clone, Debug)]
pub struct Picture {
    easel: Easel,
    pieces: Vec<Piece>,
}

#[derive(Clone, Debug)]
struct Piece {
    level: Level,
    /// Sheet and edges stay where they are when the sky is moved.
    is_still: bool,
    what: What,
}

#[derive(Clone, Debug)]
enum What {
    Mesh(Arc<Mesh>),
    Text(Label),
}

/// A small move of a picture while the next one is being made.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shift {
    pub scale: f64,
    pub dx: f64,
    pub dy: f64,
}

impl Shift {
    pub const NONE: Shift = Shift {
        scale: 1.0,
        dx: 0.0,
        dy: 0.0,
    };

    fn pos(self, pos: Pos2) -> Pos2 {
        Pos2::new(
            (f64::from(pos.x) * self.scale + self.dx) as f32,
            (f64::from(pos.y) * self.scale + self.dy) as f32,
        )
    }
}

impl Picture {
    /// Turns a scene into meshes. `level_of` says what may slip between its marks; the scene is expected in the order of
    /// its layers, which holds within a level.
    #[must_use]
    pub fn new(scene: &Scene, easel: Easel, level_of: impl Fn(&Mark) -> Level) -> Self {
        let mut marks: Vec<(Level, &Mark)> = scene
            .marks
            .iter()
            .map(|mark| (level_of(mark), mark))
            .collect();
        marks.sort_by_key(|(level, _)| *level);
        let mut pieces: Vec<Piece> = Vec::new();
        let mut brush = Brush::new(&easel);
        let mut place = (Level::Paper, true);
        for (level, mark) in marks {
            let next = (
                level,
                matches!(mark.layer, Layer::Sheet | Layer::Plate | Layer::Frame),
            );
            // One mesh for all that belongs together.
            if next != place || matches!(mark.shape, Shape::Label(_)) {
                brush.give(place, &mut pieces);
            }
            place = next;
            match &mark.shape {
                // The window is the sheet.
                Shape::Area { fill, .. }
                    if mark.layer == Layer::Sheet && fill.role == Role::Ground => {}
                Shape::Label(label) => {
                    pieces.push(Piece {
                        level,
                        is_still: next.1,
                        what: What::Text(label.clone()),
                    });
                }
                shape => brush.draw(shape),
            }
        }
        brush.give(place, &mut pieces);
        Picture { easel, pieces }
    }

    /// What it was made for.
    #[must_use]
    pub fn easel(&self) -> &Easel {
        &self.easel
    }

    /// Vertices of all its meshes.
    #[must_use]
    pub fn vertices(&self) -> usize {
        self.pieces
            .iter()
            .map(|piece| match &piece.what {
                What::Mesh(mesh) => mesh.vertices.len(),
                What::Text(_) => 0,
            })
            .sum()
    }

    /// Shows the picture with another laid over it, level by level. A shift moves what lies within the `frames`; sheet
    /// and edges stay.
    pub fn show(
        &self,
        painter: &egui::Painter,
        shift: Shift,
        frames: &[egui::Rect],
        over: Option<&Picture>,
    ) {
        let painter = painter.with_clip_rect(self.easel.clip.intersect(painter.clip_rect()));
        let mut waiting = over.map(|over| over.pieces.iter().peekable());
        for piece in &self.pieces {
            while let (Some(waiting), Some(over)) = (&mut waiting, over)
                && let Some(next) = waiting.next_if(|next| next.level < piece.level)
            {
                next.show(&painter, &over.easel, Shift::NONE);
            }
            if shift == Shift::NONE || piece.is_still {
                piece.show(&painter, &self.easel, Shift::NONE);
            } else {
                for frame in frames {
                    let within = painter.with_clip_rect(frame.intersect(painter.clip_rect()));
                    piece.show(&within, &self.easel, shift);
                }
            }
        }
        if let (Some(waiting), Some(over)) = (waiting, over) {
            for next in waiting {
                next.show(&painter, &over.easel, Shift::NONE);
            }
        }
    }
}

impl Piece {
    fn show(&self, painter: &egui::Painter, easel: &Easel, shift: Shift) {
        match &self.what {
            What::Mesh(mesh) if shift == Shift::NONE => {
                painter.add(EguiShape::Mesh(Arc::clone(mesh)));
            }
            What::Mesh(mesh) => {
                let mut moved = Mesh::clone(mesh);
                for vertex in &mut moved.vertices {
                    vertex.pos = shift.pos(vertex.pos);
                }
                painter.add(EguiShape::mesh(moved));
            }
            What::Text(label) => write(painter, label, easel, shift),
        }
    }
}

/// Directions in which a halo is laid around letters.
const HALO: [(f32, f32); 8] = [
    (1.0, 0.0),
    (0.7, 0.7),
    (0.0, 1.0),
    (-0.7, 0.7),
    (-1.0, 0.0),
    (-0.7, -0.7),
    (0.0, -1.0),
    (0.7, -0.7),
];

fn write(painter: &egui::Painter, label: &Label, easel: &Easel, shift: Shift) {
    let scale = easel.placement.scale;
    let ink = paint_colour(&label.paint, &easel.palette);
    let format = TextFormat {
        font_id: FontId::new((label.size * scale) as f32, family(label.font)),
        extra_letter_spacing: (label.spacing * scale) as f32,
        color: Color32::PLACEHOLDER,
        ..TextFormat::default()
    };
    let job = egui::text::LayoutJob::single_section(label.text.clone(), format);
    let galley = painter.layout_job(job);
    let baseline = galley
        .rows
        .first()
        .and_then(|row| Some(row.pos.y + row.row.glyphs.first()?.pos.y))
        .unwrap_or(0.0);
    let back = match label.align {
        Align::Start => 0.0,
        Align::Middle => galley.size().x / 2.0,
        Align::End => galley.size().x,
    };
    let anchor = shift.pos(easel.placement.at(label.anchor));
    let turn = egui::emath::Rot2::from_angle(label.rotation_degrees.to_radians() as f32);
    let corner = anchor + turn * egui::vec2(-back, -baseline);
    let angle = label.rotation_degrees.to_radians() as f32;
    if !painter
        .clip_rect()
        .expand(4.0)
        .intersects(egui::Rect::from_min_size(corner, galley.size()))
        && label.rotation_degrees == 0.0
    {
        return;
    }
    if label.halo > 0.0 {
        let ground = colour(easel.palette.colour(Role::Plate));
        let reach = (label.halo * scale) as f32;
        for (x, y) in HALO {
            let at = corner + egui::vec2(x, y) * reach;
            painter.add(
                egui::epaint::TextShape::new(at, Arc::clone(&galley), ground).with_angle(angle),
            );
        }
    }
    painter.add(egui::epaint::TextShape::new(corner, galley, ink).with_angle(angle));
}

/// The colour of a paint, its opacity in the alpha.
fn paint_colour(paint: &Paint, palette: &Palette) -> Color32 {
    let solid = paint.colour(palette);
    let alpha = (paint.opacity.clamp(0.0, 1.0) * 255.0).round() as u8;
    Color32::from_rgba_unmultiplied(solid.red, solid.green, solid.blue, alpha)
}

/// Points of a line nearer to each other than this cannot be told apart, screen points.
const LEAST_STEP: f64 = 0.35;

struct Brush<'e> {
    easel: &'e Easel,
    tessellator: Tessellator,
    mesh: Mesh,
    /// Screen points over which an edge fades: a pixel.
    feather: f64,
}

impl<'e> Brush<'e> {
    fn new(easel: &'e Easel) -> Self {
        let options = TessellationOptions {
            coarse_tessellation_culling: false,
            ..TessellationOptions::default()
        };
        Brush {
            easel,
            // No text passes through it, so that the size of the font's texture does not matter.
            tessellator: Tessellator::new(easel.pixels_per_point, options, [1, 1], Vec::new()),
            mesh: Mesh::default(),
            feather: 1.0 / f64::from(easel.pixels_per_point.max(0.1)),
        }
    }

    fn give(&mut self, (level, is_still): (Level, bool), pieces: &mut Vec<Piece>) {
        if !self.mesh.is_empty() {
            let mesh = std::mem::take(&mut self.mesh);
            pieces.push(Piece {
                level,
                is_still,
                what: What::Mesh(Arc::new(mesh)),
            });
        }
    }

    fn colour(&self, paint: &Paint) -> Color32 {
        paint_colour(paint, &self.easel.palette)
    }

    fn is_seen<'p>(&self, points: impl IntoIterator<Item = &'p Point>, margin: f64) -> bool {
        let mut bounds = egui::Rect::NOTHING;
        for point in points {
            if point.is_finite() {
                bounds.extend_with(self.easel.placement.at(*point));
            }
        }
        bounds.is_positive_or_line() && self.easel.clip.expand(margin as f32).intersects(bounds)
    }

    fn draw(&mut self, shape: &Shape) {
        let scale = self.easel.placement.scale;
        match shape {
            Shape::Line { points, stroke } => {
                if self.is_seen(points, stroke.width * scale) {
                    self.line(points, stroke, false);
                }
            }
            Shape::Ribbon(points) => {
                if self.is_seen(points.iter().map(|point| &point.at), 8.0 * scale) {
                    self.ribbon(points);
                }
            }
            Shape::Area { rings, fill, edge } => {
                if self.is_seen(rings.iter().flatten(), 2.0 * scale) {
                    self.area(rings, fill, edge.as_ref());
                }
            }
            Shape::Disc {
                centre,
                radius,
                fill,
            } => {
                if self.is_seen([centre], radius * scale + 1.0) {
                    self.disc(*centre, *radius, self.colour(fill));
                }
            }
            Shape::Ring {
                centre,
                radius,
                stroke,
            } => {
                if self.is_seen([centre], (radius + stroke.width) * scale + 1.0) {
                    let circle = egui::epaint::CircleShape::stroke(
                        self.easel.placement.at(*centre),
                        (radius * scale) as f32,
                        self.egui_stroke(stroke),
                    );
                    self.tessellator.tessellate_circle(circle, &mut self.mesh);
                }
            }
            Shape::Shade {
                polygon,
                run,
                stops,
            } => {
                if self.is_seen(polygon, 1.0) {
                    self.shade(polygon, *run, stops);
                }
            }
            // Text is written when it is shown.
            Shape::Label(_) => {}
        }
    }

    fn egui_stroke(&self, stroke: &Stroke) -> egui::Stroke {
        let width = (stroke.width * self.easel.placement.scale) as f32;
        egui::Stroke::new(width, self.colour(&stroke.paint))
    }

    fn line(&mut self, points: &[Point], stroke: &Stroke, closed: bool) {
        let mut kept: Vec<Pos2> = Vec::with_capacity(points.len());
        let mut last: Option<(f64, f64)> = None;
        for (index, point) in points.iter().enumerate() {
            if !point.is_finite() {
                continue;
            }
            let (x, y) = self.easel.placement.at_f64(*point);
            let near = last.is_some_and(|(lx, ly)| libm::hypot(x - lx, y - ly) < LEAST_STEP);
            if !near || index + 1 == points.len() {
                kept.push(Pos2::new(x as f32, y as f32));
                last = Some((x, y));
            }
        }
        let pen = self.egui_stroke(stroke);
        let scale = self.easel.placement.scale;
        let shapes = match stroke.dash {
            Some((on, off)) => {
                EguiShape::dashed_line(&kept, pen, (on * scale) as f32, (off * scale) as f32)
            }
            None if closed => vec![EguiShape::closed_line(kept, pen)],
            None => vec![EguiShape::line(kept, pen)],
        };
        for shape in shapes {
            self.tessellator.tessellate_shape(shape, &mut self.mesh);
        }
    }

    fn vertex(&mut self, x: f64, y: f64, colour: Color32) -> u32 {
        let index = self.mesh.vertices.len() as u32;
        self.mesh
            .colored_vertex(Pos2::new(x as f32, y as f32), colour);
        index
    }

    /// A band of four vertices across at each point: two on the edges, two a feather outside them.
    fn ribbon(&mut self, points: &[RibbonPoint]) {
        let placement = self.easel.placement;
        let mut across: Option<[u32; 4]> = None;
        let kept = self.kept(points);
        let last = kept.len().saturating_sub(1);
        for (index, point) in kept.iter().enumerate() {
            let (Some(before), Some(after)) = (
                kept.get(index.saturating_sub(1)),
                kept.get((index + 1).min(last)),
            ) else {
                continue;
            };
            let normal = after.at.minus(before.at).unit().turned();
            let (x, y) = placement.at_f64(point.at);
            // Thinner than a pixel it is drawn a pixel wide and fainter.
            let width = point.width * placement.scale;
            let half = (width.max(self.feather) / 2.0 - self.feather / 2.0).max(0.0);
            let mut ink = self.colour(&point.paint);
            if width < self.feather {
                ink = ink.gamma_multiply((width / self.feather) as f32);
            }
            let out = half + self.feather;
            let row = [
                self.vertex(x + normal.x * out, y + normal.y * out, Color32::TRANSPARENT),
                self.vertex(x + normal.x * half, y + normal.y * half, ink),
                self.vertex(x - normal.x * half, y - normal.y * half, ink),
                self.vertex(x - normal.x * out, y - normal.y * out, Color32::TRANSPARENT),
            ];
            if let Some(from) = across {
                for side in 0..3 {
                    self.mesh
                        .add_triangle(from[side], from[side + 1], row[side]);
                    self.mesh
                        .add_triangle(from[side + 1], row[side], row[side + 1]);
                }
            }
            across = Some(row);
        }
    }

    /// The points of a ribbon that are needed to see its course: those a few pixels apart, and those where it bends or
    /// changes its paint. Without points that are no numbers.
    fn kept<'p>(&self, points: &'p [RibbonPoint]) -> Vec<&'p RibbonPoint> {
        /// Nearer ones may be left out, screen points.
        const APART: f64 = 2.5;
        /// Cosine of a bend of 5 degrees, which must be kept.
        const STRAIGHT: f64 = 0.996;
        let mut kept: Vec<&RibbonPoint> = Vec::with_capacity(points.len());
        let mut along: Option<Point> = None;
        for (index, point) in points.iter().enumerate() {
            if !point.at.is_finite() {
                continue;
            }
            let Some(last) = kept.last() else {
                kept.push(point);
                continue;
            };
            let step = point.at.minus(last.at);
            let way = step.unit();
            let is_near = step.length() * self.easel.placement.scale < APART;
            let is_straight = along.is_none_or(|along| along.dot(way) > STRAIGHT);
            let is_same = point.paint.role == last.paint.role;
            if is_near && is_straight && is_same && index + 1 != points.len() {
                continue;
            }
            along = Some(way);
            kept.push(point);
        }
        kept
    }

    /// A dot: its middle, a ring on its edge and one a feather outside. The least ones are cones of light as strong as the
    /// dot they stand for.
    fn disc(&mut self, centre: Point, radius: f64, ink: Color32) {
        let (x, y) = self.easel.placement.at_f64(centre);
        let radius = radius * self.easel.placement.scale;
        let small = radius < 1.1 * self.feather;
        // The volume of a cone is a third of its cylinder's.
        let outer = if small {
            radius * 1.732
        } else {
            radius + self.feather / 2.0
        };
        let outer = outer.max(self.feather);
        let inner = (radius - self.feather / 2.0).max(0.0);
        let ink = if small {
            let light = (radius * 1.732 / outer).powi(2).min(1.0);
            ink.gamma_multiply(light as f32)
        } else {
            ink
        };
        // As few corners as still look round: stars are many.
        let corners = if small {
            5
        } else {
            (5.0 + 2.0 * radius).clamp(7.0, 48.0) as u32
        };
        let middle = self.vertex(x, y, ink);
        let first = self.mesh.vertices.len() as u32;
        let rings: u32 = if small { 1 } else { 2 };
        for corner in 0..corners {
            let angle = std::f64::consts::TAU * f64::from(corner) / f64::from(corners);
            let (sin, cos) = libm::sincos(angle);
            if !small {
                self.vertex(x + inner * cos, y + inner * sin, ink);
            }
            self.vertex(x + outer * cos, y + outer * sin, Color32::TRANSPARENT);
        }
        for corner in 0..corners {
            let (here, next) = (
                first + corner * rings,
                first + (corner + 1) % corners * rings,
            );
            self.mesh.add_triangle(middle, here, next);
            if !small {
                self.mesh.add_triangle(here, here + 1, next);
                self.mesh.add_triangle(here + 1, next, next + 1);
            }
        }
    }

    fn area(&mut self, rings: &[Vec<Point>], fill: &Paint, edge: Option<&Stroke>) {
        let ink = self.colour(fill);
        let placement = self.easel.placement;
        match rings {
            [ring] if convex(ring) => {
                let points = ring.iter().map(|point| placement.at(*point)).collect();
                let shape = EguiShape::convex_polygon(points, ink, egui::Stroke::NONE);
                self.tessellator.tessellate_shape(shape, &mut self.mesh);
            }
            rings => {
                for [a, b, c, d] in quadrangles(rings) {
                    let corners = [a, b, c, d].map(|point| {
                        let (x, y) = placement.at_f64(point);
                        self.vertex(x, y, ink)
                    });
                    self.quad(corners);
                }
                // A fine line along the rim takes the steps out of it.
                if edge.is_none() && ink.a() == 255 {
                    let rim = Stroke {
                        paint: *fill,
                        width: self.feather / placement.scale,
                        dash: None,
                    };
                    for ring in rings {
                        self.line(ring, &rim, true);
                    }
                }
            }
        }
        if let Some(stroke) = edge {
            for ring in rings {
                self.line(ring, stroke, true);
            }
        }
    }

    fn quad(&mut self, [a, b, c, d]: [u32; 4]) {
        self.mesh.add_triangle(a, b, c);
        self.mesh.add_triangle(a, c, d);
    }

    fn shade(&mut self, polygon: &[Point], run: Run, stops: &[Stop]) {
        match run {
            Run::Along { from, to } => self.shade_along(polygon, from, to, stops),
            Run::Around { centre, radius } => self.shade_around(polygon, centre, radius, stops),
        }
    }

    /// Cuts the polygon across the gradient at its stops: between them colours run evenly over a piece.
    fn shade_along(&mut self, polygon: &[Point], from: Point, to: Point, stops: &[Stop]) {
        let length = from.distance(to);
        if length == 0.0 || !length.is_finite() {
            return;
        }
        let along = to.minus(from).unit();
        let across = along.turned();
        // Axes in which the gradient runs down.
        let turned = |point: &Point| {
            let from = point.minus(from);
            Point::new(
                from.x * across.x + from.y * across.y,
                from.x * along.x + from.y * along.y,
            )
        };
        let back = |point: Point| from.towards(across, point.x).towards(along, point.y);
        let ring: Vec<Point> = polygon.iter().map(turned).collect();
        let cuts: Vec<f64> = stops.iter().map(|stop| length * stop.part).collect();
        let placement = self.easel.placement;
        for corners in trapezoids(&[ring], &cuts) {
            let vertices = corners.map(|corner| {
                let (x, y) = placement.at_f64(back(corner));
                let ink = self.shade_colour(stops, corner.y / length);
                self.vertex(x, y, ink)
            });
            self.quad(vertices);
        }
    }

    /// Rings around the centre, cut to the polygon.
    fn shade_around(&mut self, polygon: &[Point], centre: Point, radius: f64, stops: &[Stop]) {
        const SECTORS: u32 = 48;
        const RINGS: u32 = 14;
        if !(radius > 0.0 && radius.is_finite() && centre.is_finite()) {
            return;
        }
        // Beyond the last stop its paint goes on to the polygon's farthest corner.
        let farthest = polygon
            .iter()
            .fold(radius, |most, corner| most.max(corner.distance(centre)));
        let goes_on = stops.last().is_some_and(|stop| stop.paint.opacity > 0.0);
        let mut parts: Vec<f64> = (0..=RINGS)
            .map(|ring| f64::from(ring) / f64::from(RINGS))
            .collect();
        if goes_on {
            parts.push(1.05 * farthest / radius);
        }
        let cells = trapezoids(&[polygon.to_vec()], &[]);
        let placement = self.easel.placement;
        let at = |part: f64, sector: u32| {
            let (sin, cos) =
                libm::sincos(std::f64::consts::TAU * f64::from(sector) / f64::from(SECTORS));
            centre.moved(part * radius * cos, part * radius * sin)
        };
        for pair in parts.windows(2) {
            let &[inner, outer] = pair else { continue };
            for sector in 0..SECTORS {
                let (a, b) = (at(inner, sector), at(outer, sector));
                let (c, d) = (at(outer, sector + 1), at(inner, sector + 1));
                for triangle in [[a, b, c], [a, c, d]] {
                    for piece in cells
                        .iter()
                        .flat_map(|cell| triangles_within(triangle, cell))
                    {
                        let corners = piece.map(|corner| {
                            let (x, y) = placement.at_f64(corner);
                            let ink = self.shade_colour(stops, corner.distance(centre) / radius);
                            self.vertex(x, y, ink)
                        });
                        self.mesh.add_triangle(corners[0], corners[1], corners[2]);
                    }
                }
            }
        }
    }

    fn shade_colour(&self, stops: &[Stop], part: f64) -> Color32 {
        let after = stops.iter().position(|stop| stop.part >= part);
        let paint = |stop: Option<&Stop>| {
            stop.map_or(Color32::TRANSPARENT, |stop| self.colour(&stop.paint))
        };
        match after {
            None => paint(stops.last()),
            Some(0) => paint(stops.first()),
            Some(index) => match (stops.get(index - 1), stops.get(index)) {
                (Some(a), Some(b)) => {
                    let width = (b.part - a.part).max(1e-9);
                    let t = ((part - a.part) / width) as f32;
                    self.colour(&a.paint)
                        .lerp_to_gamma(self.colour(&b.paint), t)
                }
                (one, _) => paint(one),
            },
        }
    }
}

trait Seen {
    /// Not empty: a line or a point is seen, too.
    fn is_positive_or_line(&self) -> bool;
}

impl Seen for egui::Rect {
    fn is_positive_or_line(&self) -> bool {
        self.min.x <= self.max.x && self.min.y <= self.max.y
    }
}
