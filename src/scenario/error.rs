//! What can be wrong with a scenario.

use super::files::FileError;
use super::skyline::SkylineError;
use crate::sky::calendar::CalendarError;

/// Why a scenario could not be read or saved. Each message says where and what would work.
#[derive(Debug, thiserror::Error)]
pub enum ScenarioError {
    /// The text is not a scenario: a word, a number or a bracket is wrong.
    #[error("{origin}:{line}:{column}: {message}")]
    Document {
        /// The file, or what else the text came from.
        origin: String,
        line: usize,
        column: usize,
        message: String,
    },
    #[error(
        "{origin}:{line}:{column}: the scenario has version {found}, but the newest that this program reads is {newest}: use a newer program"
    )]
    TooNew {
        origin: String,
        line: usize,
        column: usize,
        found: u32,
        newest: u32,
    },
    #[error("{origin}: the scenario is empty; `loopwright new` writes one to start from")]
    Empty { origin: String },
    #[error("{origin}: more than {limit} bytes, too large for a scenario")]
    TooLarge { origin: String, limit: u64 },
    #[error(
        "{origin}:{line}:{column}: the text is not UTF-8{hint}; save it as UTF-8 in the editor"
    )]
    NotUtf8 {
        origin: String,
        line: usize,
        column: usize,
        hint: &'static str,
    },
    /// The skyline's own file is wrong or missing.
    #[error("{origin}: {source}")]
    Skyline {
        origin: String,
        source: SkylineError,
    },
    #[error(transparent)]
    File(#[from] FileError),
    /// A value that was changed after reading and is not allowed in a file.
    #[error("the scenario cannot be saved: {0}")]
    NotWritable(String),
    #[error("a date of the season cannot be turned into an instant: {0}")]
    Date(#[from] CalendarError),
}
