//! A scene as a PNG picture, drawn from its shapes and the outlines of the shipped fonts.

use tiny_skia::{
    Color, FillRule, GradientStop, LineCap, LineJoin, LinearGradient, Paint as Ink, Path,
    PathBuilder, Pixmap, RadialGradient, Shader, SpreadMode, StrokeDash, Transform,
};

use crate::chart::{self, Label, Paint, Palette, Point, Role, Run, Scene, Shape, Stroke};

/// Why a picture could not be made.
#[derive(Debug, thiserror::Error)]
pub enum PngError {
    /// The picture would be empty, or larger than 16 384 pixels on a side.
    #[error(
        "a picture of {width:.0} x {height:.0} pixels cannot be made: each side must have 1 to {LARGEST_SIDE} pixels; choose another scale"
    )]
    Size { width: f64, height: f64 },
    #[error("the picture could not be written as PNG: {0}")]
    Encode(String),
}

/// Pixels along the longer side, at most: a picture of that square takes 1 GB.
pub const LARGEST_SIDE: u32 = 16_384;

/// Draws a scene at `scale` pixels a point (2 is 144 pixels an inch). The same input gives the same bytes.
///
/// # Errors
/// When the picture would be empty or too large, or cannot be encoded.
pub fn png(scene: &Scene, palette: &Palette, scale: f64) -> Result<Vec<u8>, PngError> {
    pixmap(scene, palette, scale)?
        .encode_png()
        .map_err(|error| PngError::Encode(error.to_string()))
}

/// A picture as rows of red, green, blue, each a byte, from the upper left corner; nothing shines through it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Pixels {
    pub width: usize,
    pub height: usize,
    pub rgb: Vec<u8>,
}

/// The same picture as plain bytes.
///
/// # Errors
/// When the picture would be empty or too large.
pub fn pixels(scene: &Scene, palette: &Palette, scale: f64) -> Result<Pixels, PngError> {
    let drawn = pixmap(scene, palette, scale)?;
    // The ground covers all of it, so that no pixel is premultiplied by anything but 1.
    let rgb = drawn
        .pixels()
        .iter()
        .flat_map(|pixel| [pixel.red(), pixel.green(), pixel.blue()])
        .collect();
    Ok(Pixels {
        width: drawn.width() as usize,
        height: drawn.height() as usize,
        rgb,
    })
}

fn pixmap(scene: &Scene, palette: &Palette, scale: f64) -> Result<Pixmap, PngError> {
    let (width, height) = (
        (scene.width * scale).round(),
        (scene.height * scale).round(),
    );
    let allowed = 1.0..=f64::from(LARGEST_SIDE);
    if !allowed.contains(&width) || !allowed.contains(&height) {
        return Err(PngError::Size { width, height });
    }
    let mut pixels =
        Pixmap::new(width as u32, height as u32).ok_or(PngError::Size { width, height })?;
    let ground = palette.colour(Role::Ground);
    pixels.fill(Color::from_rgba8(
        ground.red,
        ground.green,
        ground.blue,
        255,
    ));
    let mut canvas = Canvas {
        pixels,
        palette,
        view: Transform::from_scale(scale as f32, scale as f32),
    };
    for mark in &scene.marks {
        canvas.shape(&mark.shape);
    }
    Ok(canvas.pixels)
}

struct Canvas<'a> {
    pixels: Pixmap,
    palette: &'a Palette,
    view: Transform,
}

fn trace<'a>(rings: impl IntoIterator<Item = &'a [Point]>, closed: bool) -> Option<Path> {
    let mut path = PathBuilder::new();
    for ring in rings {
        for (index, point) in ring.iter().enumerate() {
            let (x, y) = (point.x as f32, point.y as f32);
            if index == 0 {
                path.move_to(x, y);
            } else {
                path.line_to(x, y);
            }
        }
        if closed {
            path.close();
        }
    }
    path.finish()
}

fn circle(centre: Point, radius: f64) -> Option<Path> {
    PathBuilder::from_circle(centre.x as f32, centre.y as f32, radius as f32)
}

impl Canvas<'_> {
    fn colour(&self, paint: &Paint) -> Color {
        let rgb = paint.colour(self.palette);
        let opacity = (paint.opacity.clamp(0.0, 1.0) * 255.0).round() as u8;
        Color::from_rgba8(rgb.red, rgb.green, rgb.blue, opacity)
    }

    fn ink(&self, paint: &Paint) -> Ink<'static> {
        Ink {
            shader: Shader::SolidColor(self.colour(paint)),
            anti_alias: true,
            ..Ink::default()
        }
    }

    fn fill(&mut self, path: Option<Path>, paint: &Paint, rule: FillRule) {
        if let Some(path) = path {
            let ink = self.ink(paint);
            self.pixels.fill_path(&path, &ink, rule, self.view, None);
        }
    }

    fn stroke(&mut self, path: Option<Path>, stroke: &Stroke) {
        let Some(path) = path else { return };
        let ink = self.ink(&stroke.paint);
        let pen = tiny_skia::Stroke {
            width: stroke.width as f32,
            line_cap: LineCap::Butt,
            line_join: LineJoin::Round,
            dash: stroke
                .dash
                .and_then(|(on, off)| StrokeDash::new(vec![on as f32, off as f32], 0.0)),
            ..tiny_skia::Stroke::default()
        };
        self.pixels.stroke_path(&path, &ink, &pen, self.view, None);
    }

    fn shape(&mut self, shape: &Shape) {
        match shape {
            Shape::Line { points, stroke } => {
                self.stroke(trace([points.as_slice()], false), stroke);
            }
            Shape::Ribbon(points) => {
                for (outline, paint) in chart::ribbon_outlines(points) {
                    self.fill(trace([outline.as_slice()], true), &paint, FillRule::Winding);
                }
            }
            Shape::Area { rings, fill, edge } => {
                let path = trace(rings.iter().map(Vec::as_slice), true);
                self.fill(path.clone(), fill, FillRule::EvenOdd);
                if let Some(stroke) = edge {
                    self.stroke(path, stroke);
                }
            }
            Shape::Disc {
                centre,
                radius,
                fill,
            } => self.fill(circle(*centre, *radius), fill, FillRule::Winding),
            Shape::Ring {
                centre,
                radius,
                stroke,
            } => self.stroke(circle(*centre, *radius), stroke),
            Shape::Shade {
                polygon,
                run,
                stops,
            } => {
                let stops = stops
                    .iter()
                    .map(|stop| GradientStop::new(stop.part as f32, self.colour(&stop.paint)))
                    .collect();
                let to_skia =
                    |point: Point| tiny_skia::Point::from_xy(point.x as f32, point.y as f32);
                let shader = match *run {
                    Run::Along { from, to } => LinearGradient::new(
                        to_skia(from),
                        to_skia(to),
                        stops,
                        SpreadMode::Pad,
                        Transform::identity(),
                    ),
                    Run::Around { centre, radius } => RadialGradient::new(
                        to_skia(centre),
                        to_skia(centre),
                        radius as f32,
                        stops,
                        SpreadMode::Pad,
                        Transform::identity(),
                    ),
                };
                if let (Some(shader), Some(path)) = (shader, trace([polygon.as_slice()], true)) {
                    let ink = Ink {
                        shader,
                        anti_alias: true,
                        ..Ink::default()
                    };
                    self.pixels
                        .fill_path(&path, &ink, FillRule::EvenOdd, self.view, None);
                }
            }
            Shape::Label(label) => {
                let path = letters(label);
                if label.halo > 0.0 {
                    self.stroke(path.clone(), &Stroke::of(Role::Plate, 2.0 * label.halo));
                }
                self.fill(path, &label.paint, FillRule::Winding);
            }
        }
    }
}

/// The outlines of a label's letters, in points on the sheet.
fn letters(label: &Label) -> Option<Path> {
    let mut outline = Outline {
        path: PathBuilder::new(),
        origin: label.start(),
        pivot: label.anchor,
        turn: libm::sincos(label.rotation_degrees.to_radians()),
        scale: 1.0,
    };
    for character in label.text.chars() {
        let glyph = chart::glyph(label.font, character);
        if let Some(face) = glyph.font.face() {
            outline.scale = label.size / f64::from(face.units_per_em());
            face.outline_glyph(glyph.id, &mut outline);
        }
        outline.origin = outline
            .origin
            .moved(glyph.advance * label.size + label.spacing, 0.0);
    }
    outline.path.finish()
}

/// Takes a glyph's outline (font units, y up) to the sheet.
struct Outline {
    path: PathBuilder,
    origin: Point,
    pivot: Point,
    /// Sine and cosine.
    turn: (f64, f64),
    scale: f64,
}

impl Outline {
    fn on_sheet(&self, x: f32, y: f32) -> (f32, f32) {
        let flat = self
            .origin
            .moved(f64::from(x) * self.scale, -f64::from(y) * self.scale)
            .minus(self.pivot);
        let (sin, cos) = self.turn;
        let turned = self
            .pivot
            .moved(flat.x * cos - flat.y * sin, flat.x * sin + flat.y * cos);
        (turned.x as f32, turned.y as f32)
    }
}

impl ttf_parser::OutlineBuilder for Outline {
    fn move_to(&mut self, x: f32, y: f32) {
        let (x, y) = self.on_sheet(x, y);
        self.path.move_to(x, y);
    }

    fn line_to(&mut self, x: f32, y: f32) {
        let (x, y) = self.on_sheet(x, y);
        self.path.line_to(x, y);
    }

    fn quad_to(&mut self, x1: f32, y1: f32, x: f32, y: f32) {
        let (x1, y1) = self.on_sheet(x1, y1);
        let (x, y) = self.on_sheet(x, y);
        self.path.quad_to(x1, y1, x, y);
    }

    fn curve_to(&mut self, x1: f32, y1: f32, x2: f32, y2: f32, x: f32, y: f32) {
        let (x1, y1) = self.on_sheet(x1, y1);
        let (x2, y2) = self.on_sheet(x2, y2);
        let (x, y) = self.on_sheet(x, y);
        self.path.cubic_to(x1, y1, x2, y2, x, y);
    }

    fn close(&mut self) {
        self.path.close();
    }
}
