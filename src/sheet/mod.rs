//! What is handed out: charts and tables as files. A scene becomes SVG or PNG; both look alike.

mod png;
mod svg;
pub mod table;

pub use png::{PngError, png};
pub use svg::svg;
