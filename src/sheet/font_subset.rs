//! A TrueType file with only the outlines of the glyphs used, so that an SVG that carries its fonts stays small.
//!
//! Glyph numbers, widths and character map stay as they are; outlines of other glyphs become empty. Works for fonts
//! whose glyphs are plain outlines, as the shipped ones are. Source of the format: OpenType 1.9 (ISO/IEC 14496-22),
//! "The OpenType Font File", "head", "loca".

use std::collections::BTreeSet;

/// The font with the outlines of `glyphs` and of glyph 0; `None` when the file is not such a font.
pub(super) fn subset(font: &[u8], glyphs: &BTreeSet<u16>) -> Option<Vec<u8>> {
    let count = usize::from(u16_at(font, 4)?);
    let mut tables: Vec<([u8; 4], Vec<u8>)> = Vec::with_capacity(count);
    for index in 0..count {
        let record = 12 + 16 * index;
        let tag: [u8; 4] = font.get(record..record + 4)?.try_into().ok()?;
        let offset = u32_at(font, record + 8)? as usize;
        let length = u32_at(font, record + 12)? as usize;
        let data = font.get(offset..offset.checked_add(length)?)?;
        tables.push((tag, data.to_vec()));
    }
    let table = |tag: &[u8; 4]| {
        tables
            .iter()
            .find(|table| &table.0 == tag)
            .map(|table| table.1.as_slice())
    };
    // head: indexToLocFormat at 50, checkSumAdjustment at 8.
    let is_long = u16_at(table(b"head")?, 50)? != 0;
    let (old_glyf, old_loca) = (table(b"glyf")?, table(b"loca")?);
    let entries = old_loca.len() / if is_long { 4 } else { 2 };
    let offset = |entry: usize| -> Option<usize> {
        if is_long {
            Some(u32_at(old_loca, 4 * entry)? as usize)
        } else {
            Some(2 * usize::from(u16_at(old_loca, 2 * entry)?))
        }
    };
    let (mut glyf, mut loca) = (Vec::new(), Vec::new());
    let mut write_offset = |length: usize| -> Option<()> {
        if is_long {
            loca.extend(u32::try_from(length).ok()?.to_be_bytes());
        } else {
            loca.extend(u16::try_from(length / 2).ok()?.to_be_bytes());
        }
        Some(())
    };
    for entry in 0..entries.checked_sub(1)? {
        write_offset(glyf.len())?;
        let number = u16::try_from(entry).ok()?;
        if number == 0 || glyphs.contains(&number) {
            glyf.extend(old_glyf.get(offset(entry)?..offset(entry + 1)?)?);
            glyf.resize(glyf.len().next_multiple_of(4), 0);
        }
    }
    write_offset(glyf.len())?;
    for (tag, data) in &mut tables {
        match &*tag {
            b"glyf" => *data = std::mem::take(&mut glyf),
            b"loca" => *data = std::mem::take(&mut loca),
            b"head" => data.get_mut(8..12)?.fill(0),
            _ => {}
        }
    }
    let mut file = font.get(..12)?.to_vec();
    let mut body = Vec::new();
    let mut head_at = None;
    for (tag, data) in &tables {
        let at = 12 + 16 * tables.len() + body.len();
        if tag == b"head" {
            head_at = Some(at);
        }
        file.extend(tag);
        file.extend(checksum(data).to_be_bytes());
        file.extend(u32::try_from(at).ok()?.to_be_bytes());
        file.extend(u32::try_from(data.len()).ok()?.to_be_bytes());
        body.extend(data);
        body.resize(body.len().next_multiple_of(4), 0);
    }
    file.extend(body);
    let adjustment = WHOLE_FILE.wrapping_sub(checksum(&file));
    let at = head_at? + 8;
    file.get_mut(at..at + 4)?
        .copy_from_slice(&adjustment.to_be_bytes());
    Some(file)
}

/// What the checksum of a whole font comes to.
const WHOLE_FILE: u32 = 0xB1B0_AFBA;

/// The sum of the big-endian words, the last one filled up with zeros.
fn checksum(data: &[u8]) -> u32 {
    data.chunks(4).fold(0, |sum: u32, word| {
        let mut whole = [0; 4];
        for (byte, value) in whole.iter_mut().zip(word) {
            *byte = *value;
        }
        sum.wrapping_add(u32::from_be_bytes(whole))
    })
}

fn u16_at(data: &[u8], at: usize) -> Option<u16> {
    Some(u16::from_be_bytes(data.get(at..at + 2)?.try_into().ok()?))
}

fn u32_at(data: &[u8], at: usize) -> Option<u32> {
    Some(u32::from_be_bytes(data.get(at..at + 4)?.try_into().ok()?))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::chart::Font;
    use ttf_parser::{Face, OutlineBuilder};

    #[derive(Default, PartialEq, Debug)]
    struct Trace(Vec<(u8, f32, f32)>);

    impl OutlineBuilder for Trace {
        fn move_to(&mut self, x: f32, y: f32) {
            self.0.push((b'M', x, y));
        }
        fn line_to(&mut self, x: f32, y: f32) {
            self.0.push((b'L', x, y));
        }
        fn quad_to(&mut self, x1: f32, y1: f32, x: f32, y: f32) {
            self.0.extend([(b'q', x1, y1), (b'Q', x, y)]);
        }
        fn curve_to(&mut self, x1: f32, y1: f32, x2: f32, y2: f32, x: f32, y: f32) {
            self.0
                .extend([(b'c', x1, y1), (b'c', x2, y2), (b'C', x, y)]);
        }
        fn close(&mut self) {
            self.0.push((b'Z', 0.0, 0.0));
        }
    }

    /// Read back by ttf-parser, a reader that is not ours.
    #[test]
    fn a_subset_keeps_what_is_used_and_is_a_sound_font() {
        for (font, letter, left_out) in [
            (Font::Sans, 'g', 'k'),
            (Font::SansStrong, '4', '5'),
            (Font::SerifItalic, 'R', 'e'),
            (Font::Signs, '\u{2642}', '\u{2640}'),
        ] {
            let whole = Face::parse(font.data(), 0).unwrap();
            let kept = whole.glyph_index(letter).unwrap();
            let file = subset(font.data(), &BTreeSet::from([kept.0])).unwrap();
            assert_eq!(checksum(&file), WHOLE_FILE, "{font:?}");
            assert!(file.len() < font.data().len() / 2, "{font:?}");
            let part = Face::parse(&file, 0).unwrap();
            assert_eq!(part.glyph_index(letter), Some(kept));
            assert_eq!(part.glyph_hor_advance(kept), whole.glyph_hor_advance(kept));
            let (mut before, mut after) = (Trace::default(), Trace::default());
            whole.outline_glyph(kept, &mut before);
            part.outline_glyph(kept, &mut after);
            assert!(before.0.len() > 4);
            assert_eq!(before, after);
            let gone = part.glyph_index(left_out).unwrap();
            assert_eq!(part.outline_glyph(gone, &mut Trace::default()), None);
        }
    }

    #[test]
    fn what_is_no_font_is_refused() {
        for bytes in [&b""[..], &[0; 11], &[0xff; 400]] {
            assert_eq!(subset(bytes, &BTreeSet::new()), None);
        }
        let cut = &Font::Sans.data()[..5000];
        assert_eq!(subset(cut, &BTreeSet::new()), None);
    }
}
