//! The palette, the shipped fonts and the few measures of the window, as egui wants them.

use std::sync::Arc;

use egui::{
    Color32, CornerRadius, FontData, FontDefinitions, FontFamily, FontId, Stroke, TextStyle,
};

use crate::chart::{Font, Palette, Rgb, Role};
use crate::scenario::Theme;

/// Height of the letters in panels, screen points at text scale 1.
pub const BODY: f32 = 14.0;
/// Labels beside readings, captions.
pub const SMALL: f32 = 12.5;
/// The three large numbers.
pub const LARGE: f32 = 34.0;
/// The title.
pub const TITLE: f32 = 24.0;
/// White space at the edges of the window.
pub const MARGIN: f32 = 18.0;

#[must_use]
pub const fn colour(rgb: Rgb) -> Color32 {
    Color32::from_rgb(rgb.red, rgb.green, rgb.blue)
}

/// The palette of a theme.
#[must_use]
pub const fn palette(theme: Theme) -> Palette {
    match theme {
        Theme::Light => Palette::LIGHT,
        Theme::Dark => Palette::DARK,
        Theme::Red => Palette::RED,
    }
}

/// The word for a theme.
#[must_use]
pub const fn theme_word(theme: Theme) -> &'static str {
    match theme {
        Theme::Light => "light",
        Theme::Dark => "dark",
        Theme::Red => "red",
    }
}

/// The egui family that stands for a chart's font.
#[must_use]
pub fn family(font: Font) -> FontFamily {
    match font {
        Font::Sans => FontFamily::Proportional,
        font => FontFamily::Name(font.word().into()),
    }
}

/// A size of a chart's font.
#[must_use]
pub fn font(font: Font, size: f32) -> FontId {
    FontId::new(size, family(font))
}

/// The shipped fonts, each falling back on the others as text in charts does, and on egui's own for what a user may type.
#[must_use]
fn fonts() -> FontDefinitions {
    let mut fonts = FontDefinitions::default();
    let others = fonts
        .families
        .get(&FontFamily::Proportional)
        .cloned()
        .unwrap_or_default();
    for font in Font::ALL {
        fonts.font_data.insert(
            font.word().to_owned(),
            Arc::new(FontData::from_static(font.data())),
        );
    }
    for font in Font::ALL {
        let mut chain: Vec<String> = vec![font.word().to_owned()];
        chain.extend(
            Font::ALL
                .iter()
                .filter(|other| **other != font)
                .map(|other| other.word().to_owned()),
        );
        chain.extend(others.iter().cloned());
        fonts.families.insert(family(font), chain);
    }
    fonts
}

/// Sets up a context once: fonts, and what egui would otherwise do that this window does itself.
pub fn prepare(ctx: &egui::Context) {
    ctx.set_fonts(fonts());
    ctx.options_mut(|options| {
        // Keys of the window's own change the size of text.
        options.zoom_with_keyboard = false;
        // Pictures are culled when they are made.
        options.tessellation_options.coarse_tessellation_culling = false;
    });
}

/// Gives egui's own widgets the colours of a palette and text of a size.
pub fn dress(ctx: &egui::Context, palette: &Palette, text_scale: f32) {
    let of = |role: Role| colour(palette.colour(role));
    let (ground, plate, ink, faint) = (
        of(Role::Ground),
        of(Role::Plate),
        of(Role::Ink),
        of(Role::FaintInk),
    );
    let (hairline, selection) = (of(Role::Hairline), of(Role::Selection));
    let dark = palette.name != Palette::LIGHT.name;
    ctx.set_theme(if dark {
        egui::Theme::Dark
    } else {
        egui::Theme::Light
    });
    ctx.all_styles_mut(|style| {
        let visuals = &mut style.visuals;
        visuals.dark_mode = dark;
        visuals.override_text_color = None;
        visuals.weak_text_color = Some(faint);
        visuals.panel_fill = ground;
        visuals.window_fill = ground;
        visuals.extreme_bg_color = plate;
        visuals.text_edit_bg_color = Some(plate);
        visuals.faint_bg_color = plate;
        visuals.code_bg_color = plate;
        visuals.window_stroke = Stroke::new(1.0, hairline);
        visuals.window_corner_radius = CornerRadius::same(2);
        visuals.menu_corner_radius = CornerRadius::same(2);
        visuals.window_shadow = egui::Shadow::NONE;
        visuals.popup_shadow = egui::Shadow::NONE;
        visuals.hyperlink_color = selection;
        visuals.warn_fg_color = of(Role::Caution);
        visuals.error_fg_color = of(Role::Caution);
        visuals.selection.bg_fill = selection.gamma_multiply(0.35);
        visuals.selection.stroke = Stroke::new(1.0, ink);
        visuals.text_cursor.stroke = Stroke::new(1.5, selection);
        let widgets = &mut visuals.widgets;
        for (state, text, line) in [
            (&mut widgets.noninteractive, ink, hairline),
            (&mut widgets.inactive, ink, hairline),
            (&mut widgets.hovered, ink, faint),
            (&mut widgets.active, ink, selection),
            (&mut widgets.open, ink, faint),
        ] {
            state.fg_stroke = Stroke::new(1.0, text);
            state.bg_stroke = Stroke::new(1.0, line);
            state.bg_fill = plate;
            state.weak_bg_fill = plate;
            state.corner_radius = CornerRadius::same(2);
            state.expansion = 0.0;
        }
        // A field is a lighter patch until it is pointed at.
        widgets.inactive.bg_stroke = Stroke::NONE;
        style.text_styles = [
            (TextStyle::Small, font(Font::Sans, SMALL * text_scale)),
            (TextStyle::Body, font(Font::Sans, BODY * text_scale)),
            (TextStyle::Button, font(Font::Sans, BODY * text_scale)),
            (TextStyle::Monospace, font(Font::Sans, BODY * text_scale)),
            (
                TextStyle::Heading,
                font(Font::SerifItalic, TITLE * text_scale),
            ),
        ]
        .into();
        style.spacing.item_spacing = egui::vec2(8.0, 5.0) * text_scale;
        style.spacing.interact_size.y = 22.0 * text_scale;
        style.animation_time = 0.12;
    });
}
