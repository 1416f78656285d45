//! Finished values to pictures: plain shapes and labels in `f64`, no ephemeris calls, no colours but roles.
//!
//! Lengths are points (1/72 inch), y down.

mod geometry;
mod palette;
mod place;
mod scene;
mod skyline_overlay;
mod strip;
mod text;
mod timeline;

pub use geometry::{Point, Rect};
pub use palette::{Palette, Rgb, Role};
pub(crate) use scene::number;
pub use scene::{
    Align, Hit, Label, Layer, Mark, MarkId, Paint, RibbonPoint, Run, Scene, Shape, Stop, Stroke,
    ribbon_outlines,
};
pub use skyline_overlay::{Level, Outline, OverlayStyle, note_boxes, overlaid, skyline_overlay};
pub use strip::{
    DateRank, StripDate, StripLayout, StripRow, StripText, StripView, StripWindow, strip,
};
pub use text::{Font, Glyph, glyph, width as text_width};
pub use timeline::{
    HourLine, Timeline, TimelineLayout, TimelineMonth, TimelineText, TimelineView, timeline,
    timeline_cursor,
};
