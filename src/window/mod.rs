//! The window: strip, timeline and readings of a season, drawn with egui.
//!
//! What is drawn is the [`crate::chart::Scene`] of the charts. Each view is a function of the plan and the view state and
//! returns actions; [`state::State::apply`] carries them out. Work over a few milliseconds goes to one thread
//! ([`jobs`]). Nothing is painted while nothing changes.

mod app;
mod fields;
mod first_look;
pub mod jobs;
pub mod keys;
pub mod painter;
mod polygon;
pub mod reading_words;
mod readings_pane;
mod start;
pub mod state;
pub mod strip_pane;
pub mod theme;
mod time_words;
pub mod timeline_pane;
mod widgets;

pub use crate::sheet::words::capitalised;
pub use app::Window;
pub use start::{NoWindow, open};
