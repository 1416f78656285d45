//! A scene as SVG 1.1 text, in points, with what it uses of the fonts inside.
//!
//! Source of the format: W3C Recommendation "Scalable Vector Graphics (SVG) 1.1"; base64 of RFC 4648.

use std::borrow::Cow;
use std::collections::{BTreeMap, BTreeSet};
use std::fmt::Write;

use super::font_subset;
use crate::chart::{
    self, Font, Label, Layer, Paint, Palette, Point, Rgb, Role, Run, Scene, Shape, Stroke,
};

/// Draws a scene. The same scene and palette give the same bytes.
///
/// The fonts travel inside the file; a reader that ignores embedded fonts falls back to its own sans and serif.
/// The scene's title and description stand in it for screen readers.
#[must_use]
pub fn svg(scene: &Scene, palette: &Palette) -> String {
    let mut out = Writer {
        text: String::new(),
        palette,
        gradients: 0,
    };
    out.scene(scene);
    out.text
}

struct Writer<'a> {
    text: String,
    palette: &'a Palette,
    gradients: usize,
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

fn base64(data: &[u8]) -> String {
    const ALPHABET: &[u8; 64] = b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let mut out = String::with_capacity(data.len().div_ceil(3) * 4);
    for chunk in data.chunks(3) {
        let byte = |index: usize| u32::from(chunk.get(index).copied().unwrap_or(0));
        let bits = byte(0) << 16 | byte(1) << 8 | byte(2);
        for place in 0..4 {
            if place <= chunk.len() {
                // In bounds: six bits number 64 letters.
                out.push(char::from(
                    ALPHABET[(bits >> (18 - 6 * place) & 63) as usize],
                ));
            } else {
                out.push('=');
            }
        }
    }
    out
}

/// The glyphs that the labels of a scene use, by font.
fn glyphs_of(scene: &Scene) -> BTreeMap<Font, BTreeSet<u16>> {
    let mut used: BTreeMap<Font, BTreeSet<u16>> = BTreeMap::new();
    for (_, label) in scene.labels() {
        for character in label.text.chars() {
            let glyph = chart::glyph(label.font, character);
            used.entry(glyph.font).or_default().insert(glyph.id.0);
        }
    }
    used
}

impl Writer<'_> {
    fn scene(&mut self, scene: &Scene) {
        let (width, height) = (n(scene.width), n(scene.height));
        put!(
            self,
            "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<svg xmlns=\"http://www.w3.org/2000/svg\" \
             width=\"{width}pt\" height=\"{height}pt\" viewBox=\"0 0 {width} {height}\" role=\"img\" \
             aria-labelledby=\"title desc\">\n<title id=\"title\">{}</title>\n<desc id=\"desc\">{}</desc>\n",
            escaped(&scene.title),
            escaped(&scene.description),
        );
        put!(self, "<style>\n");
        for (font, glyphs) in glyphs_of(scene) {
            let file = font_subset::subset(font.data(), &glyphs)
                .map_or(Cow::Borrowed(font.data()), Cow::Owned);
            put!(
                self,
                "@font-face {{ font-family: \"{}\"; src: url(\"data:font/ttf;base64,{}\") format(\"truetype\"); }}\n",
                font.family(),
                base64(&file)
            );
        }
        // No kerning and no ligatures: the widths are those that the labels were placed by.
        put!(
            self,
            "text {{ font-kerning: none; font-variant-ligatures: none; white-space: pre; }}\n"
        );
        for font in Font::ALL {
            let general = match font {
                Font::SerifItalic => "serif",
                _ => "sans-serif",
            };
            let others: Vec<String> = std::iter::once(font)
                .chain(Font::ALL.into_iter().filter(|other| *other != font))
                .map(|family| format!("\"{}\"", family.family()))
                .collect();
            put!(
                self,
                ".{} {{ font-family: {}, {general}; }}\n",
                font.word(),
                others.join(", ")
            );
        }
        put!(self, "</style>\n");
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
        put!(
            self,
            "<text class=\"{}\" x=\"{}\" y=\"{}\" font-size=\"{}\"",
            label.font.word(),
            n(start.x),
            n(start.y),
            n(label.size)
        );
        if label.spacing != 0.0 {
            put!(self, " letter-spacing=\"{}\"", n(label.spacing));
        }
        if label.rotation_degrees != 0.0 {
            put!(
                self,
                " transform=\"rotate({} {} {})\"",
                n(label.rotation_degrees),
                n(label.anchor.x),
                n(label.anchor.y)
            );
        }
        if halo {
            let plate = Stroke::of(Role::Plate, 2.0 * label.halo);
            self.fill(&plate.paint);
            self.stroke(&plate);
            put!(self, " stroke-linejoin=\"round\" aria-hidden=\"true\"");
        } else {
            self.fill(&label.paint);
        }
        put!(self, ">{}</text>\n", escaped(&label.text));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Test vectors of RFC 4648, section 10.
    #[test]
    fn base64_agrees_with_its_standard() {
        for (plain, coded) in [
            ("", ""),
            ("f", "Zg=="),
            ("fo", "Zm8="),
            ("foo", "Zm9v"),
            ("foob", "Zm9vYg=="),
            ("fooba", "Zm9vYmE="),
            ("foobar", "Zm9vYmFy"),
        ] {
            assert_eq!(base64(plain.as_bytes()), coded);
        }
    }

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
