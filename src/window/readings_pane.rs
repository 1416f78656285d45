//! The narrow column of readings: three large numbers, the rest small beneath, aligned on the decimal mark.

use egui::{Align2, Color32, FontId, Rect, Sense, Ui, Vec2, WidgetInfo, pos2};

use super::reading_words::{Column, Line, Row, Value};
use super::state::Action;
use super::theme::{LARGE, SMALL, TITLE, colour, font};
use super::widgets::{Standing, caution, word};
use crate::chart::{Font, Palette, Role};

/// Where the decimal mark of a number stands, from the left edge of the column.
const DECIMAL_MARK: f32 = 112.0;
/// The same of the three large ones.
const LARGE_DECIMAL_MARK: f32 = 136.0;
/// Where words begin.
const WORDS: f32 = 78.0;

/// Draws the column.
pub fn show(ui: &mut Ui, column: &Column, palette: &Palette, text_scale: f32) -> Vec<Action> {
    let mut actions = Vec::new();
    let ink = Inks::new(palette);
    ui.spacing_mut().item_spacing.y = 0.0;
    let name =
        egui::RichText::new(column.subject).font(font(Font::SerifItalic, TITLE * text_scale));
    ui.horizontal(|ui| {
        ui.add(egui::Label::new(name).selectable(false));
        ui.with_layout(egui::Layout::right_to_left(egui::Align::Center), |ui| {
            if word(
                ui,
                palette,
                "copy",
                "copy the readings as text",
                Standing::Open,
            )
            .clicked()
            {
                actions.push(Action::CopyReadings);
            }
        });
    });
    if let Some(sentence) = column.sun_caution {
        ui.add_space(4.0 * text_scale);
        caution(ui, palette, sentence);
    }
    for sentence in &column.cautions {
        ui.add_space(2.0 * text_scale);
        let words = egui::RichText::new(sentence).small().color(ink.caution);
        ui.add(egui::Label::new(words).wrap());
    }
    ui.add_space(2.0 * text_scale);
    for line in &column.large {
        large(ui, line, &ink, text_scale);
    }
    ui.add_space(7.0 * text_scale);
    let mut before: Option<&Line> = None;
    for line in &column.small {
        // Sentences stand a little apart from rows.
        let is_sentence = |line: &Line| matches!(line.value, Value::Sentence(_));
        if before.is_some_and(|before| is_sentence(before) != is_sentence(line)) {
            ui.add_space(4.0 * text_scale);
        }
        small(ui, line, &ink, text_scale);
        before = Some(line);
    }
    ui.add_space(7.0 * text_scale);
    for line in &column.sky {
        small(ui, line, &ink, text_scale);
    }
    ui.add_space(7.0 * text_scale);
    others(ui, &column.others, &ink, text_scale);
    actions
}

struct Inks {
    ink: Color32,
    faint: Color32,
    caution: Color32,
}

impl Inks {
    fn new(palette: &Palette) -> Self {
        Inks {
            ink: colour(palette.colour(Role::Ink)),
            faint: colour(palette.colour(Role::FaintInk)),
            caution: colour(palette.colour(Role::Caution)),
        }
    }
}

/// A row of the column's width that a screen reader is told as one text.
fn row(ui: &mut Ui, height: f32, text: &str) -> Rect {
    let (rect, response) =
        ui.allocate_exact_size(Vec2::new(ui.available_width(), height), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(egui::Role::Label, true, text));
    rect
}

/// Writes a number with its decimal mark at `x`, and the unit after it in faint ink.
fn number(
    ui: &Ui,
    x: f32,
    baseline: f32,
    text: &str,
    unit: &str,
    fonts: (FontId, FontId),
    ink: &Inks,
) {
    let (whole, rest) = text
        .split_once('.')
        .map_or((text, String::new()), |(whole, part)| {
            (whole, format!(".{part}"))
        });
    let (of_number, of_unit) = fonts;
    let painter = ui.painter();
    painter.text(
        pos2(x, baseline),
        Align2::RIGHT_BOTTOM,
        whole,
        of_number.clone(),
        ink.ink,
    );
    let right = painter
        .text(
            pos2(x, baseline),
            Align2::LEFT_BOTTOM,
            rest,
            of_number.clone(),
            ink.ink,
        )
        .right();
    // Letters of another size share the baseline, not the foot of their boxes.
    let drop = 0.2 * (of_number.size - of_unit.size);
    let gap = if unit.starts_with('\u{b0}') || unit.starts_with('\u{2033}') {
        1.5
    } else {
        5.0
    };
    painter.text(
        pos2(right + gap, baseline - drop),
        Align2::LEFT_BOTTOM,
        unit,
        of_unit,
        ink.faint,
    );
}

fn large(ui: &mut Ui, line: &Line, ink: &Inks, scale: f32) {
    let rect = row(ui, 41.0 * scale, &line.text());
    let small = font(Font::Sans, SMALL * scale);
    let foot = rect.bottom();
    // On the baseline of the number.
    let at = pos2(rect.left(), foot - 0.2 * (LARGE - SMALL) * scale);
    ui.painter()
        .text(at, Align2::LEFT_BOTTOM, line.name, small.clone(), ink.faint);
    if let Value::Number { number: text, unit } = &line.value {
        let x = rect.left() + LARGE_DECIMAL_MARK * scale;
        number(
            ui,
            x,
            foot,
            text,
            unit,
            (font(Font::Sans, LARGE * scale), small),
            ink,
        );
    }
}

fn small(ui: &mut Ui, line: &Line, ink: &Inks, scale: f32) {
    let size = font(Font::Sans, SMALL * scale);
    if let Value::Sentence(text) = &line.value {
        ui.add(
            egui::Label::new(egui::RichText::new(text).font(size).color(ink.ink))
                .selectable(false)
                .wrap(),
        );
        return;
    }
    let rect = row(ui, 17.0 * scale, &line.text());
    let foot = rect.bottom() - 1.5 * scale;
    ui.painter().text(
        pos2(rect.left(), foot),
        Align2::LEFT_BOTTOM,
        line.name,
        size.clone(),
        ink.faint,
    );
    match &line.value {
        Value::Number { number: text, unit } => {
            number(
                ui,
                rect.left() + DECIMAL_MARK * scale,
                foot,
                text,
                unit,
                (size.clone(), size),
                ink,
            );
        }
        Value::Words(text) => {
            ui.painter().text(
                pos2(rect.left() + WORDS * scale, foot),
                Align2::LEFT_BOTTOM,
                text,
                size,
                ink.ink,
            );
        }
        Value::Sentence(_) => {}
    }
}

fn others(ui: &mut Ui, rows: &[Row], ink: &Inks, scale: f32) {
    let size = font(Font::Sans, SMALL * scale);
    let marks = [96.0, 160.0, 229.0].map(|x| x * scale);
    let rect = row(ui, 17.0 * scale, "body, elongation, distance, magnitude");
    for ((heading, x), back) in ["elong.", "au", "mag"]
        .into_iter()
        .zip(marks)
        .zip([20.0, 8.0, 14.0])
    {
        let at = pos2(rect.left() + x - back * scale, rect.bottom() - 2.0 * scale);
        ui.painter()
            .text(at, Align2::LEFT_BOTTOM, heading, size.clone(), ink.faint);
    }
    for other in rows {
        let elongation = other.elongation.as_ref();
        let spoken = elongation.map_or_else(String::new, |(angle, side)| {
            format!(" elongation {angle}\u{b0} {side},")
        });
        let told = format!(
            "{}{spoken} distance {} au, magnitude {}",
            other.name, other.distance, other.magnitude
        );
        let rect = row(ui, 17.0 * scale, &told);
        let foot = rect.bottom() - 1.5 * scale;
        ui.painter().text(
            pos2(rect.left(), foot),
            Align2::LEFT_BOTTOM,
            other.name,
            size.clone(),
            ink.ink,
        );
        let [at_elongation, at_distance, at_magnitude] = marks.map(|x| rect.left() + x);
        let fonts = || (size.clone(), size.clone());
        if let Some((angle, side)) = elongation {
            let unit = format!(
                "\u{b0}{}",
                side.chars().next().unwrap_or(' ').to_uppercase()
            );
            number(ui, at_elongation, foot, angle, &unit, fonts(), ink);
        }
        number(ui, at_distance, foot, &other.distance, "", fonts(), ink);
        number(ui, at_magnitude, foot, &other.magnitude, "", fonts(), ink);
    }
}
