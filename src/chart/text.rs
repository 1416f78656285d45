//! Text measured by the shipped fonts' own advances, the same on every system and in every output.
//!
//! The fonts carry no kerning, so that the width of a text is the sum of its advances. A character that the font
//! lacks is taken from the next one that has it.

use std::sync::OnceLock;

use ttf_parser::{Face, GlyphId};

/// A font by what it is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Font {
    /// What counts: numbers, dates, readings.
    Sans,
    /// The same, stronger.
    SansStrong,
    /// Titles, names of stars, captions.
    SerifItalic,
    /// Planet and aspect signs.
    Signs,
}

impl Font {
    pub const ALL: [Font; 4] = [Font::Sans, Font::SansStrong, Font::SerifItalic, Font::Signs];

    /// The family name in the font file.
    #[must_use]
    pub const fn family(self) -> &'static str {
        match self {
            Font::Sans => "Loopwright Sans",
            Font::SansStrong => "Loopwright Sans SemiBold",
            Font::SerifItalic => "Loopwright Serif",
            Font::Signs => "Loopwright Signs",
        }
    }

    /// The word that stands for the font in text dumps.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Font::Sans => "sans",
            Font::SansStrong => "sans-strong",
            Font::SerifItalic => "serif-italic",
            Font::Signs => "signs",
        }
    }

    /// The TrueType file.
    #[must_use]
    pub const fn data(self) -> &'static [u8] {
        match self {
            Font::Sans => include_bytes!("../../assets/fonts/sans-regular.ttf"),
            Font::SansStrong => include_bytes!("../../assets/fonts/sans-semibold.ttf"),
            Font::SerifItalic => include_bytes!("../../assets/fonts/serif-italic.ttf"),
            Font::Signs => include_bytes!("../../assets/fonts/signs.ttf"),
        }
    }

    /// How far letters rise above the baseline, in parts of the size (accents on capitals rise higher).
    #[must_use]
    pub const fn ascent(self) -> f64 {
        match self {
            Font::Sans | Font::SansStrong => 0.76,
            Font::SerifItalic => 0.72,
            Font::Signs => 0.80,
        }
    }

    /// How far letters hang below the baseline, in parts of the size.
    #[must_use]
    pub const fn descent(self) -> f64 {
        match self {
            Font::Sans | Font::SansStrong => 0.21,
            Font::SerifItalic => 0.26,
            Font::Signs => 0.16,
        }
    }

    /// The parsed file.
    #[must_use]
    pub fn face(self) -> Option<&'static Face<'static>> {
        static FACES: OnceLock<[Option<Face<'static>>; 4]> = OnceLock::new();
        let faces = FACES.get_or_init(|| Font::ALL.map(|font| Face::parse(font.data(), 0).ok()));
        let [sans, strong, serif, signs] = faces;
        match self {
            Font::Sans => sans.as_ref(),
            Font::SansStrong => strong.as_ref(),
            Font::SerifItalic => serif.as_ref(),
            Font::Signs => signs.as_ref(),
        }
    }
}

/// A character's form: the font that has it, its number there, and its advance in parts of the size.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Glyph {
    pub font: Font,
    pub id: GlyphId,
    pub advance: f64,
}

/// The form of a character, from `font` or else from the first font that has it; the box for a missing character
/// where none does.
#[must_use]
pub fn glyph(font: Font, character: char) -> Glyph {
    let (font, id) = std::iter::once(font)
        .chain(Font::ALL)
        .find_map(|candidate| Some((candidate, candidate.face()?.glyph_index(character)?)))
        .unwrap_or((font, GlyphId(0)));
    let advance = font.face().map_or(0.0, |face| {
        f64::from(face.glyph_hor_advance(id).unwrap_or(0)) / f64::from(face.units_per_em())
    });
    Glyph { font, id, advance }
}

/// Width of a text in points, at a size and with extra space between its letters, both in points.
#[must_use]
pub fn width(text: &str, font: Font, size: f64, spacing: f64) -> f64 {
    let (mut total, mut count) = (0.0, 0_u32);
    for character in text.chars() {
        total += glyph(font, character).advance;
        count += 1;
    }
    total * size + spacing * f64::from(count.saturating_sub(1))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_font_can_be_read() {
        for font in Font::ALL {
            assert!(font.face().is_some(), "{font:?}");
        }
    }

    /// Advances read from the files with fontTools 4.68.0 (`hmtx` over `unitsPerEm`).
    #[test]
    fn widths_are_the_sum_of_the_advances_in_the_font() {
        for (text, font, em) in [
            ("10 Jan", Font::Sans, SANS_10_JAN),
            ("Regulus", Font::SerifItalic, SERIF_REGULUS),
            ("\u{2212}1.3", Font::SansStrong, STRONG_MINUS_1_3),
        ] {
            assert!((width(text, font, 1.0, 0.0) - em).abs() < 1e-9, "{text}");
            let spaced = width(text, font, 10.0, 2.0);
            let gaps = text.chars().count() as f64 - 1.0;
            assert!((spaced - em * 10.0 - 2.0 * gaps).abs() < 1e-9, "{text}");
        }
    }

    #[test]
    fn figures_are_of_one_width() {
        let one = width("1", Font::Sans, 1.0, 0.0);
        for figure in "023456789\u{2212}".chars().take(9) {
            assert_eq!(width(&figure.to_string(), Font::Sans, 1.0, 0.0), one);
        }
    }

    #[test]
    fn a_missing_character_comes_from_another_font() {
        assert_eq!(glyph(Font::Sans, '\u{2642}').font, Font::Signs);
        assert_eq!(glyph(Font::Sans, '\u{4e2d}').id, GlyphId(0));
    }

    const SANS_10_JAN: f64 = 5787.0 / 2000.0;
    const SERIF_REGULUS: f64 = 2893.0 / 1000.0;
    const STRONG_MINUS_1_3: f64 = 3953.0 / 2000.0;
}
