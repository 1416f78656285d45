//! Words that can be pressed: this window has no buttons with frames and no icons.

use egui::{Color32, FontId, Response, Sense, Stroke, Ui, Vec2, WidgetInfo};

use super::theme::colour;
use crate::chart::{Palette, Role};

/// How a word stands: a command, or one choice of several.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Standing {
    Command,
    Chosen,
    Open,
}

/// A word that acts when pressed. `name` is what a screen reader says; it begins with the word that is seen.
pub(super) fn word(
    ui: &mut Ui,
    palette: &Palette,
    text: &str,
    name: &str,
    standing: Standing,
) -> Response {
    let font = egui::TextStyle::Body.resolve(ui.style());
    word_sized(ui, palette, text, name, standing, font)
}

pub(super) fn word_sized(
    ui: &mut Ui,
    palette: &Palette,
    text: &str,
    name: &str,
    standing: Standing,
    font: FontId,
) -> Response {
    let galley = ui
        .painter()
        .layout_no_wrap(text.to_owned(), font, Color32::PLACEHOLDER);
    let pad = Vec2::new(3.0, 2.0);
    let (rect, response) = ui.allocate_exact_size(galley.size() + 2.0 * pad, Sense::click());
    response.widget_info(|| match standing {
        Standing::Command => WidgetInfo::labeled(egui::Role::Button, ui.is_enabled(), name),
        Standing::Chosen | Standing::Open => WidgetInfo::selected(
            egui::Role::RadioButton,
            ui.is_enabled(),
            standing == Standing::Chosen,
            name,
        ),
    });
    if ui.is_rect_visible(rect) {
        let of = |role: Role| colour(palette.colour(role));
        let lit = response.hovered() || response.has_focus() || standing == Standing::Chosen;
        let ink = match standing {
            _ if !ui.is_enabled() => of(Role::Hairline),
            Standing::Open if !lit => of(Role::FaintInk),
            _ => of(Role::Ink),
        };
        ui.painter().galley(rect.min + pad, galley, ink);
        let line = |role: Role, width: f32| {
            let y = rect.bottom() - 1.0;
            ui.painter().hline(
                rect.left() + pad.x..=rect.right() - pad.x,
                y,
                Stroke::new(width, of(role)),
            );
        };
        if standing == Standing::Chosen {
            line(Role::Ink, 1.5);
        } else if response.hovered() {
            line(Role::FaintInk, 1.0);
        }
        if response.has_focus() {
            let ring = Stroke::new(1.5, of(Role::Selection));
            ui.painter()
                .rect_stroke(rect, 2.0, ring, egui::StrokeKind::Outside);
        }
    }
    if response.hovered() {
        ui.ctx().set_cursor_icon(egui::CursorIcon::PointingHand);
    }
    response
}

/// A small word in faint ink that names what stands beside or below it.
pub(super) fn caption(ui: &mut Ui, text: &str) -> Response {
    ui.add(egui::Label::new(egui::RichText::new(text).small().weak()).selectable(false))
}

/// A sentence of caution: a mark and the words, in the caution's ink.
pub(super) fn caution(ui: &mut Ui, palette: &Palette, text: &str) -> Response {
    let ink = colour(palette.colour(Role::Caution));
    ui.add(egui::Label::new(egui::RichText::new(text).color(ink)).wrap())
}
