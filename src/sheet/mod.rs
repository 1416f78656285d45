//! What is handed out: charts and tables as files, and the brief. A scene becomes SVG or PNG; both look alike.

mod brief;
mod png;
mod season_sheet;
pub mod season_tables;
mod strip_words;
mod svg;
pub mod table;
pub mod tables;
mod timeline_words;
pub mod words;

pub use brief::brief;
pub use png::{Pixels, PngError, pixels, png};
pub use season_sheet::{SeasonSheet, SheetError, printed_strip, season_sheet};
pub use strip_words::{east_is_left, printed_view, strip_text};
pub use svg::svg;
pub use timeline_words::timeline_text;
