//! A scene as SVG 1.1 text, in points, its letters as outlines.
//!
//! Many readers of SVG ignore fonts that travel inside a file and put wider ones in their place, so that words run into
//! each other. Outlines look the same everywhere; each label's group carries its words for screen readers and searches.
//!
//! Source of the format: W3C Recommendation "Scalable Vector Graphics (SVG) 1.1".

use std::collections::BTreeSet;
use std::fmt::Write;

use ttf_parser::{GlyphId, OutlineBuilder};

use crate::chart::{
    self, Font, Label, Layer, Paint, Palette, Point, Rgb, Role, Run, Scene, Shape, Stroke,
};

/// Draws a scene. The same scene and palette give the same bytes.
///
/// The scene's title and description stand in it for screen readers.
#[must_use]
pub fn svg(scene: &Scene, palette: &Palette) -> String {
    let mut out = Writer {
        text: String::new(),
        palette,
        gradients: 0,
        letters: BTreeSet::new(),
    };
    out.scene(scene);
    out.text
}

struct Writer<'a> {
    text: String,
    palette: &'a Palette,
    gradients: usize,
    /// Glyphs with an outline, which are defined at the head; spaces have none.
    letters: BTreeSet<(Font, u16)>,
}

/// Writing into a `String` cannot fail, so that the result of `write!` says nothing.
macro_rules! put {
    ($out:expr, $($part:tt)*) => {{
        let _ = write!($out.text, $($part)*);
    }};
}

fn n(value: f64) -> String {
    chart::number(value)
}

fn hex(colour: Rgb) -> String {
    format!("#{:02x}{:02x}{:02x}", colour.red, colour.green, colour.blue)
}

/// Text as it may stand in XML: markup escaped, characters that XML 1.0 does not allow left out.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\t' | '\n' | '\r' => out.push(' '),
            '\u{0}'..='\u{1f}' | '\u{fffe}' | '\u{ffff}' => {}
            other => out.push(other),
        }
    }
    out
}

/// Units of a glyph's outline in the size of the text.
const UNITS: f64 = 1000.0;

/// The glyphs that the labels of a scene use.
fn glyphs_of(scene: &Scene) -> BTreeSet<(Font, u16)> {
    let labels = scene.labels().map(|(_, label)| label);
    labels
        .flat_map(|label| {
            label
                .text
                .chars()
                .map(|character| chart::glyph(label.font, character))
        })
        .map(|glyph| (glyph.font, glyph.id.0))
        .collect()
}

/// Writes a glyph's outline as path data, in [`UNITS`] to the size, y down.
struct Outline {
    data: String,
    scale: f64,
}

impl Outline {
    fn put(&mut self, command: char, points: &[(f32, f32)]) {
        self.data.push(command);
        for (index, &(x, y)) in points.iter().enumerate() {
            let to = |value: f32| (f64::from(value) * self.scale).round();
            let gap = if index == 0 { "" } else { " " };
            // Minus zero would be written with its sign.
            let _ = write!(self.data, "{gap}{} {}", to(x) + 0.0, to(-y) + 0.0);
        }
    }
}

impl OutlineBuilder for Outline {
    fn move_to(&mut self, x: f32, y: f32) {
        self.put('M', &[(x, y)]);
    }

    fn line_to(&mut self, x: f32, y: f32) {
        self.put('L', &[(x, y)]);
    }

    fn quad_to(&mut self, x1: f32, y1: f32, x: f32, y: f32) {
        self.put('Q', &[(x1, y1), (x, y)]);
    }

    fn curve_to(&mut self, x1: f32, y1: f32, x2: f32, y2: f32, x: f32, y: f32) {
        self.put('C', &[(x1, y1), (x2, y2), (x, y)]);
    }

    fn close(&mut self) {
        self.data.push('Z');
    }
}

/// Path data of a glyph; empty for a space.
fn outline(font: Font, id: u16) -> String {
    let Some(face) = font.face() else {
        return String::new();
    };
    let mut outline = Outline {
        data: String::new(),
        scale: UNITS / f64::from(face.units_per_em()),
    };
    face.outline_glyph(GlyphId(id), &mut outline);
    outline.data
}

impl Writer<'_> {
    fn scene(&mut self, scene: &Scene) {
        let (width, height) = (n(scene.width), n(scene.height));
        put!(
            self,
            "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<svg xmlns=\"http://www.w3.org/2000/svg\" \
             xmlns:xlink=\"http://www.w3.org/1999/xlink\" \
             width=\"{width}pt\" height=\"{height}pt\" viewBox=\"0 0 {width} {height}\" role=\"img\" \
             aria-labelledby=\"title desc\">\n<title id=\"title\">{}</title>\n<desc id=\"desc\">{}</desc>\n",
            escaped(&scene.title),
            escaped(&scene.description),
        );
        put!(self, "<defs>\n");
        for (font, id) in glyphs_of(scene) {
            let data = outline(font, id);
            if !data.is_empty() {
                put!(self, "<path id=\"{}-{id}\" d=\"{data}\"/>\n", font.word());
                self.letters.insert((font, id));
            }
        }
        put!(self, "</defs>\n");
        let mut open: Option<Layer> = None;
        for mark in &scene.marks {
            if open != Some(mark.layer) {
                if open.is_some() {
                    put!(self, "</g>\n");
                }
                put!(self, "<g class=\"{}\">\n", mark.layer.word());
                open = Some(mark.layer);
            }
            self.shape(&mark.shape);
        }
        if open.is_some() {
            put!(self, "</g>\n");
        }
        put!(self, "</svg>\n");
    }

    fn fill(&mut self, paint: &Paint) {
        put!(self, " fill=\"{}\"", hex(paint.colour(self.palette)));
        if paint.opacity < 1.0 {
            put!(self, " fill-opacity=\"{}\"", n(paint.opacity));
        }
    }

    fn stroke(&mut self, stroke: &Stroke) {
        put!(
            self,
            " stroke=\"{}\" stroke-width=\"{}\"",
            hex(stroke.paint.colour(self.palette)),
            n(stroke.width)
        );
        if stroke.paint.opacity < 1.0 {
            put!(self, " stroke-opacity=\"{}\"", n(stroke.paint.opacity));
        }
        if let Some((on, off)) = stroke.dash {
            put!(self, " stroke-dasharray=\"{} {}\"", n(on), n(off));
        }
    }

    fn path(&mut self, rings: &[&[Point]], closed: bool) {
        put!(self, " d=\"");
        for ring in rings {
            let mut lead = 'M';
            for point in *ring {
                put!(self, "{lead}{} {}", n(point.x), n(point.y));
                lead = 'L';
            }
            if closed {
                put!(self, "Z");
            }
        }
        put!(self, "\"");
    }

    fn shape(&mut self, shape: &Shape) {
        match shape {
            Shape::Line { points, stroke } => {
                put!(self, "<path fill=\"none\" stroke-linejoin=\"round\"");
                self.stroke(stroke);
                self.path(&[points], false);
                put!(self, "/>\n");
            }
            Shape::Ribbon(points) => {
                for (outline, paint) in chart::ribbon_outlines(points) {
                    put!(self, "<path");
                    self.fill(&paint);
                    self.path(&[&outline], true);
                    put!(self, "/>\n");
                }
            }
            Shape::Area { rings, fill, edge } => {
                put!(
                    self,
                    "<path fill-rule=\"evenodd\" stroke-linejoin=\"round\""
                );
                self.fill(fill);
                if let Some(stroke) = edge {
                    self.stroke(stroke);
                }
                let rings: Vec<&[Point]> = rings.iter().map(Vec::as_slice).collect();
                self.path(&rings, true);
                put!(self, "/>\n");
            }
            Shape::Disc {
                centre,
                radius,
                fill,
            } => {
                put!(
                    self,
                    "<circle cx=\"{}\" cy=\"{}\" r=\"{}\"",
                    n(centre.x),
                    n(centre.y),
                    n(*radius)
                );
                self.fill(fill);
                put!(self, "/>\n");
            }
            Shape::Ring {
                centre,
                radius,
                stroke,
            } => {
                put!(
                    self,
                    "<circle fill=\"none\" cx=\"{}\" cy=\"{}\" r=\"{}\"",
                    n(centre.x),
                    n(centre.y),
                    n(*radius)
                );
                self.stroke(stroke);
                put!(self, "/>\n");
            }
            Shape::Shade {
                polygon,
                run,
                stops,
            } => {
                self.gradients += 1;
                let id = self.gradients;
                let name = match run {
                    Run::Along { from, to } => {
                        put!(
                            self,
                            "<linearGradient id=\"shade{id}\" gradientUnits=\"userSpaceOnUse\" x1=\"{}\" y1=\"{}\" x2=\"{}\" y2=\"{}\">",
                            n(from.x),
                            n(from.y),
                            n(to.x),
                            n(to.y)
                        );
                        "linearGradient"
                    }
                    Run::Around { centre, radius } => {
                        put!(
                            self,
                            "<radialGradient id=\"shade{id}\" gradientUnits=\"userSpaceOnUse\" cx=\"{}\" cy=\"{}\" r=\"{}\">",
                            n(centre.x),
                            n(centre.y),
                            n(*radius)
                        );
                        "radialGradient"
                    }
                };
                for stop in stops {
                    put!(
                        self,
                        "<stop offset=\"{}\" stop-color=\"{}\" stop-opacity=\"{}\"/>",
                        n(stop.part),
                        hex(stop.paint.colour(self.palette)),
                        n(stop.paint.opacity)
                    );
                }
                put!(self, "</{name}><path fill=\"url(#shade{id})\"");
                self.path(&[polygon], true);
                put!(self, "/>\n");
            }
            Shape::Label(label) => {
                if label.halo > 0.0 {
                    self.label(label, true);
                }
                self.label(label, false);
            }
        }
    }

    fn label(&mut self, label: &Label, halo: bool) {
        let start = label.start();
        let scale = label.size / UNITS;
        put!(self, "<g transform=\"");
        if label.rotation_degrees != 0.0 {
            put!(
                self,
                "rotate({} {} {}) ",
                n(label.rotation_degrees),
                n(label.anchor.x),
                n(label.anchor.y)
            );
        }
        put!(
            self,
            "translate({} {}) scale({scale:.6})\"",
            n(start.x),
            n(start.y)
        );
        if halo {
            let mut plate = Stroke::of(Role::Plate, 2.0 * label.halo);
            plate.width /= scale;
            self.fill(&plate.paint);
            self.stroke(&plate);
            put!(self, " stroke-linejoin=\"round\" aria-hidden=\"true\"");
        } else {
            self.fill(&label.paint);
            put!(
                self,
                " role=\"img\" aria-label=\"{}\"",
                escaped(&label.text)
            );
        }
        put!(self, ">");
        let mut x = 0.0;
        for character in label.text.chars() {
            let glyph = chart::glyph(label.font, character);
            if self.letters.contains(&(glyph.font, glyph.id.0)) {
                put!(
                    self,
                    "<use xlink:href=\"#{}-{}\" x=\"{}\"/>",
                    glyph.font.word(),
                    glyph.id.0,
                    n(x)
                );
            }
            x += glyph.advance * UNITS + label.spacing / scale;
        }
        put!(self, "</g>\n");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn markup_in_a_title_stays_text() {
        let scene = Scene {
            width: 10.0,
            height: 10.0,
            title: "a < b & \"c\" \u{0}\u{1b}".to_owned(),
            ..Scene::default()
        };
        let text = svg(&scene, &Palette::LIGHT);
        assert!(text.contains("<title id=\"title\">a &lt; b &amp; &quot;c&quot; </title>"));
        let read = roxmltree::Document::parse(&text).map(|document| {
            document
                .descendants()
                .find(|node| node.has_tag_name("title"))
                .and_then(|node| node.text())
                .map(str::to_owned)
        });
        assert_eq!(read.ok().flatten().as_deref(), Some("a < b & \"c\" "));
    }
}
