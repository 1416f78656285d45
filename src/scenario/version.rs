//! From text to the newest document: reads the version, picks that version's struct, and migrates up.
//!
//! # How the format grows
//! - What is added (as lenses, weather, picks and log were; later cues, circles) comes as a new optional field with a default that means what
//!   its absence meant before: old files keep opening, and the version stays. An older program refuses a file that uses
//!   the field, naming it, rather than lose it on saving.
//! - Where a field changes its meaning or its name, the version goes up: the new struct goes into a new module `v2`, with
//!   `impl From<v1::Document> for v2::Document`; here `1 => read::<v1::Document>(text).map(v2::Document::from)` joins the
//!   line for `2`, `Newest` and [`NEWEST_VERSION`] move on. The older struct stays as it is, and a file of each
//!   version stays among the tests.

use ron::error::{Error, Position, SpannedError, SpannedResult};
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

const ENDS_TOO_EARLY: &str = "the text ends too early: a closing bracket or quote is missing";

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
    let probe = match read::<VersionAt>(text) {
        Err(error) => error,
        // Not reached: the probe fails at the version, or for want of one.
        Ok(_) => return read(text).map_err(|error| document_error(text, origin, error)),
    };
    let (line, column) = (probe.span.start.line, probe.span.start.col);
    let Error::Message(found) = &probe.code else {
        let about_version = matches!(
            probe.code,
            Error::MissingStructField { .. } | Error::ExceededRecursionLimit
        );
        // The struct knows better what was expected where the text went wrong.
        let error = if about_version {
            probe
        } else {
            read::<Newest>(text).err().unwrap_or(probe)
        };
        return Err(document_error(text, origin, error));
    };
    match found.parse::<u32>() {
        Ok(1) => read::<v1::Document>(text).map_err(|error| document_error(text, origin, error)),
        Ok(found) if found > NEWEST_VERSION => Err(ScenarioError::TooNew {
            origin: origin.to_owned(),
            line,
            column,
            found,
            newest: NEWEST_VERSION,
        }),
        _ => Err(ScenarioError::Document {
            origin: origin.to_owned(),
            line,
            column,
            message: format!("there is no version {found}: use version: {NEWEST_VERSION}"),
        }),
    }
}

/// A complaint about the companions, with their place in the text.
pub(super) fn companions_error(text: &str, origin: &str, message: String) -> ScenarioError {
    error_at::<CompanionsAt>(text, origin, message)
}

/// The same about the log.
pub(super) fn log_error(text: &str, origin: &str, message: String) -> ScenarioError {
    error_at::<LogAt>(text, origin, message)
}

/// The same about the picks.
pub(super) fn picks_error(text: &str, origin: &str, message: String) -> ScenarioError {
    error_at::<PicksAt>(text, origin, message)
}

/// A complaint at the place where reading a struct stops.
fn error_at<'de, T: Deserialize<'de>>(
    text: &'de str,
    origin: &str,
    message: String,
) -> ScenarioError {
    let (line, column) = match read::<T>(text) {
        Err(error) => (error.span.start.line, error.span.start.col),
        Ok(_) => (1, 1),
    };
    ScenarioError::Document {
        origin: origin.to_owned(),
        line,
        column,
        message,
    }
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

/// Fails at the version with its number as the message, so that what follows need not be of a kind known here.
#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct VersionAt {
    #[serde(rename = "version", deserialize_with = "stop_at_number")]
    _version: (),
}

fn stop_at_number<'de, D: Deserializer<'de>>(deserializer: D) -> Result<(), D::Error> {
    Err(de::Error::custom(i64::deserialize(deserializer)?))
}

/// Fails at the companions, to tell their place.
#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct CompanionsAt {
    #[serde(rename = "companions", deserialize_with = "stop_here")]
    _companions: (),
}

/// Fails at the log, to tell its place.
#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct LogAt {
    #[serde(rename = "log", deserialize_with = "stop_here")]
    _log: (),
}

/// Fails at the picks, to tell their place.
#[derive(Deserialize)]
#[serde(rename = "Scenario")]
struct PicksAt {
    #[serde(rename = "picks", deserialize_with = "stop_here")]
    _picks: (),
}

fn stop_here<'de, D: Deserializer<'de>>(deserializer: D) -> Result<(), D::Error> {
    IgnoredAny::deserialize(deserializer)?;
    Err(de::Error::custom("here"))
}

/// The reader's complaint in words that help whoever wrote the text.
fn document_error(text: &str, origin: &str, error: SpannedError) -> ScenarioError {
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
        Error::Eof | Error::ExpectedStringEnd => ENDS_TOO_EARLY.to_owned(),
        Error::TrailingCharacters => {
            "something stands after the closing bracket of the scenario: take it away".to_owned()
        }
        // What is expected where nothing more stands is what is missing.
        _ if error.span.end == end_of(text) => ENDS_TOO_EARLY.to_owned(),
        other => first_lower(&other.to_string()),
    };
    ScenarioError::Document {
        origin: origin.to_owned(),
        line: place.line,
        column: place.col,
        message,
    }
}

/// The place after the last letter.
fn end_of(text: &str) -> Position {
    let last_line = text.rsplit('\n').next().unwrap_or(text);
    Position {
        line: 1 + text.matches('\n').count(),
        col: 1 + last_line.chars().count(),
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
