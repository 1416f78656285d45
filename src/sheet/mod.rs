//! What is handed out: a scene as SVG or PNG. Every output draws the scene's own shapes; none measures or places.

mod font_subset;
mod png;
mod svg;

pub use png::{PngError, png};
pub use svg::svg;
