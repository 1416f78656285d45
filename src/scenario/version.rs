//! From text to the newest document: reads the version, picks that version's struct, and migrates up.
//!
//! # How the format grows
//! - What is added (lenses, weather, picks, log, cues, circles) comes as a new optional field with a default that means what
//!   its absence meant before: old files keep opening, and the version stays. An older program refuses a file that uses
//!   the field, naming it, rather than lose it on saving.
//! - Where a field changes its meaning or its name, the version goes up: the new struct goes into a new module `v2`, with
//!   `impl From<v1::Document> for v2::Document`; here `1 => read::<v1::Document>(text).map(v2::Document::from)` joins the
//!   line for `2`, [`Newest`] and [`NEWEST_VERSION`] move on. The older struct stays as it is, and a file of each
//!   version stays among the tests.

use ron::error::{Error, SpannedError, SpannedResult};
use ron::extensions::Extensions;
use ron::ser::PrettyConfig;
use serde::de::{Deserializer, IgnoredAny};
use serde::{Deserialize, Serialize, de};

use super::ScenarioError;
use super::nearest::nearest;
use super::v1;

/// The newest version of the document; what is saved has it.
pub const NEWEST_VERSION: u32 = 1;
/// The struct of that version.
pub(super) type Newest = v1::Document;

/// A scenario needs six levels of brackets.
const DEEPEST_NESTING: usize = 32;
/// Structs below this level are written on one line each.
const INDENTED_LEVELS: usize = 3;

fn read<'de, T: Deserialize<'de>>(text: &'de str) -> SpannedResult<T> {
    options().from_str(text)
}

fn options() -> ron::Options {
    ron::Options::default()
        .with_default_extension(Extensions::IMPLICIT_SOME)
        .with_recursion_limit(DEEPEST_NESTING)
}

/// Reads any version and migrates it to the newest.
pub(super) fn parse(text: &str, origin: &str) -> Result<Newest, ScenarioError> {
    let version = match read::<VersionOnly>(text) {
        Ok(probe) => probe.version,
        // The struct knows better what was expected where the text went wrong.
        Err(error) => {
            let error = match error.code {
                Error::MissingStructField { .. } => error,
                _ => read::<Newest>(text).err().unwrap_or(error),
            };
            return Err(document_error(origin, error));
        }
    };
    match version {
        1 => read::<v1::Document>(text).map_err(|error| document_error(origin, error)),
        0 => Err(error_at::<VersionAt>(
            text,
            origin,
            format!("there is no version 0: use version: {NEWEST_VERSION}"),
        )),
        found => {
            let (line, column) = position::<VersionAt>(text);
            Err(ScenarioError::TooNew {
                origin: origin.to_owned(),
                line,
                column,
                found,
                newest: NEWEST_VERSION,
            })
        }
    }
}

/// A complaint about the companions, with their place in the text.
pub(super) fn companions_error(text: &str, origin: &str, message: String) -> ScenarioError {
    error_at::<CompanionsAt>(text, origin, message)
}

/// The document as text: `Scenario(` with every part on its own line, points of the skyline one a line.
pub(super) fn print<T: Serialize>(document: &T) -> Result<String, String> {
    let pretty = PrettyConfig::new()
        .depth_limit(INDENTED_LEVELS)
        .escape_strings(false)
        .new_line("\n");
    options()
        .to_string_pretty(document, pretty)
        .map(|text| format!("Scenario{text}\n"))
        .map_err(|error| error.to_string())
}

#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct VersionOnly {
    version: u32,
}

/// Fails where it stands: the reader's complaint then tells the place of a field.
struct Marker;

impl<'de> Deserialize<'de> for Marker {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        IgnoredAny::deserialize(deserializer)?;
        Err(de::Error::custom("here"))
    }
}

#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct VersionAt {
    #[serde(rename = "version")]
    _version: Marker,
}

#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct CompanionsAt {
    #[serde(rename = "companions")]
    _companions: Marker,
}

/// Line and column of the field that `T` marks.
fn position<'de, T: Deserialize<'de>>(text: &'de str) -> (usize, usize) {
    match read::<T>(text) {
        Err(error) => (error.span.start.line, error.span.start.col),
        Ok(_) => (1, 1),
    }
}

fn error_at<'de, T: Deserialize<'de>>(
    text: &'de str,
    origin: &str,
    message: String,
) -> ScenarioError {
    let (line, column) = position::<T>(text);
    ScenarioError::Document {
        origin: origin.to_owned(),
        line,
        column,
        message,
    }
}

/// The reader's complaint in words that help whoever wrote the text.
fn document_error(origin: &str, error: SpannedError) -> ScenarioError {
    let place = error.span.start;
    let message = match &error.code {
        Error::ExceededRecursionLimit => format!(
            "brackets are nested more than {DEEPEST_NESTING} deep: a scenario needs six levels"
        ),
        Error::MissingStructField {
            field: "version", ..
        } => format!("no version is given: begin with Scenario(version: {NEWEST_VERSION}, ..."),
        Error::NoSuchStructField {
            found, expected, ..
        } => unknown_word("field", found, expected),
        Error::NoSuchEnumVariant {
            found, expected, ..
        } => unknown_word("word", found, expected),
        Error::MissingStructField { field, outer } => format!(
            "{} has no field {field}: add it",
            outer.as_deref().unwrap_or("the struct")
        ),
        Error::DuplicateStructField { field, .. } => {
            format!("field {field} is given twice: keep one")
        }
        Error::Eof => "the text ends too early: a closing bracket or quote is missing".to_owned(),
        other => first_lower(&other.to_string()),
    };
    ScenarioError::Document {
        origin: origin.to_owned(),
        line: place.line,
        column: place.col,
        message,
    }
}

fn unknown_word(kind: &str, found: &str, expected: &[&str]) -> String {
    let shown: String = found.chars().take(64).collect();
    let meant = nearest(found, expected.iter().copied(), 1);
    match meant.first() {
        Some(word) => format!("there is no {kind} {shown} here; did you mean {word}?"),
        None => format!(
            "there is no {kind} {shown} here; use {}",
            expected.join(", ")
        ),
    }
}

fn first_lower(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_lowercase().chain(letters).collect()
    })
}
