//! The skyline as a scenario gives it: points in the document, or a CSV file beside it.
//!
//! The CSV has the columns `azimuth_deg`, `altitude_deg` and, if wanted, `part` (the name of what stands there), one point a
//! row, in any order; the heading row may be left out, lines that begin with `#` are remarks. Degrees, azimuth from true
//! north through east, altitude as a theodolite reads it.

use std::path::{Component, Path, PathBuf};

use serde::{Deserialize, Serialize};

use super::checked::{Azimuth, PartName, SkylineAltitude};
use super::files::{FileError, read_limited};
use crate::sky::{Angle, Skyline};

/// A skyline file larger than this is none: a point every thousandth of a degree fits.
const CSV_LIMIT: u64 = 4 << 20;

/// One corner of the skyline.
#[derive(Clone, Debug, PartialEq)]
pub struct SkylinePoint {
    /// From true north through east, 0 to 360 degrees.
    pub azimuth: Angle,
    /// Apparent altitude, as a theodolite reads it.
    pub altitude: Angle,
    /// The name of what stands there, such as "the mill".
    pub part: Option<String>,
}

/// Where the points come from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum SkylineOrigin {
    /// They stand in the document.
    Document,
    /// They stand in a file beside the document.
    File {
        /// As the document writes it, relative to the document's folder.
        name: String,
        /// The folder of the document from which it was read.
        folder: PathBuf,
    },
}

/// The skyline of a scenario: checked points, where they come from, and the polygon that the engine uses.
#[derive(Clone, Debug, PartialEq)]
pub struct SkylineSource {
    points: Vec<SkylinePoint>,
    smooth: bool,
    origin: SkylineOrigin,
    polygon: Skyline,
}

/// Why there is no skyline.
#[derive(Debug, thiserror::Error)]
pub enum SkylineError {
    #[error("the skyline's file cannot be read: {source}; {advice}")]
    File {
        source: FileError,
        advice: &'static str,
    },
    #[error("skyline file {}, line {line}: {message}", path.display())]
    Row {
        path: PathBuf,
        line: u64,
        message: String,
    },
    #[error("skyline file {}: {message}", path.display())]
    Whole { path: PathBuf, message: String },
    #[error("skyline: {0}")]
    Points(String),
}

impl SkylineSource {
    /// A flat horizon.
    #[must_use]
    pub fn flat() -> Self {
        SkylineSource {
            points: Vec::new(),
            smooth: false,
            origin: SkylineOrigin::Document,
            polygon: Skyline::default(),
        }
    }

    /// From points that stand in the document, in any order.
    ///
    /// # Errors
    /// Three points at one azimuth, or an angle out of range.
    pub fn from_points(points: Vec<SkylinePoint>, smooth: bool) -> Result<Self, SkylineError> {
        SkylineSource::new(points, smooth, SkylineOrigin::Document)
    }

    fn new(
        points: Vec<SkylinePoint>,
        smooth: bool,
        origin: SkylineOrigin,
    ) -> Result<Self, SkylineError> {
        let polygon = polygon(&points, smooth).map_err(SkylineError::Points)?;
        Ok(SkylineSource {
            points,
            smooth,
            origin,
            polygon,
        })
    }

    /// Reads the file `name` in the document's folder.
    pub(super) fn from_file(
        folder: &Path,
        name: &FileName,
        smooth: bool,
    ) -> Result<Self, SkylineError> {
        let path = folder.join(&name.0);
        let bytes = read_limited(&path, CSV_LIMIT).map_err(|source| SkylineError::File {
            source,
            advice: "put it into the scenario's folder, or write points: [...] instead of file",
        })?;
        let points = read_csv(&path, &bytes)?;
        let origin = SkylineOrigin::File {
            name: name.0.clone(),
            folder: folder.to_owned(),
        };
        SkylineSource::new(points, smooth, origin).map_err(|error| match error {
            SkylineError::Points(message) => SkylineError::Whole { path, message },
            other => other,
        })
    }

    /// The points as given.
    #[must_use]
    pub fn points(&self) -> &[SkylinePoint] {
        &self.points
    }

    /// Whether points are put between the given ones, along a smooth curve.
    #[must_use]
    pub fn is_smooth(&self) -> bool {
        self.smooth
    }

    #[must_use]
    pub fn origin(&self) -> &SkylineOrigin {
        &self.origin
    }

    /// What the engine asks for altitudes.
    #[must_use]
    pub fn polygon(&self) -> &Skyline {
        &self.polygon
    }
}

/// A plain path below the scenario's folder.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub(super) struct FileName(String);

impl TryFrom<String> for FileName {
    type Error = String;
    fn try_from(name: String) -> Result<Self, String> {
        let below = Path::new(&name)
            .components()
            .all(|component| matches!(component, Component::Normal(_)));
        if below && !name.trim().is_empty() && !name.contains('\0') {
            Ok(FileName(name))
        } else {
            Err(format!(
                "file \"{name}\" is not beside the scenario: put it into the scenario's folder and write its name alone, as in \"skyline.csv\""
            ))
        }
    }
}

impl From<FileName> for String {
    fn from(name: FileName) -> String {
        name.0
    }
}

fn read_csv(path: &Path, bytes: &[u8]) -> Result<Vec<SkylinePoint>, SkylineError> {
    let row_error = |line: u64, message: String| SkylineError::Row {
        path: path.to_owned(),
        line,
        message,
    };
    let whole_error = |message: &str| SkylineError::Whole {
        path: path.to_owned(),
        message: message.to_owned(),
    };
    let text = std::str::from_utf8(bytes)
        .map_err(|_| whole_error("not UTF-8; save it as CSV in UTF-8"))?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .comment(Some(b'#'))
        .trim(csv::Trim::All)
        .from_reader(text.as_bytes());
    let mut points = Vec::new();
    for (index, record) in reader.records().enumerate() {
        let record = record.map_err(|error| whole_error(&error.to_string()))?;
        let line = record.position().map_or(0, csv::Position::line);
        let fields: Vec<&str> = record.iter().collect();
        match fields.as_slice() {
            ["azimuth" | "azimuth_deg", "altitude" | "altitude_deg"]
            | [
                "azimuth" | "azimuth_deg",
                "altitude" | "altitude_deg",
                "part",
            ] if index == 0 => {}
            [azimuth, altitude] | [azimuth, altitude, ""] => {
                let point = read_point(azimuth, altitude, None);
                points.push(point.map_err(|message| row_error(line, message))?);
            }
            [azimuth, altitude, part] => {
                let point = read_point(azimuth, altitude, Some(part));
                points.push(point.map_err(|message| row_error(line, message))?);
            }
            [only] if only.contains(';') => {
                return Err(row_error(
                    line,
                    "columns are parted by semicolons: use commas, and decimal points in numbers"
                        .to_owned(),
                ));
            }
            other => {
                return Err(row_error(
                    line,
                    format!(
                        "{} columns: write azimuth,altitude or azimuth,altitude,part, as in 143,5.2,the mill",
                        other.len()
                    ),
                ));
            }
        }
    }
    if points.is_empty() {
        return Err(whole_error(
            "no points in it; write azimuth,altitude a row, or leave the skyline out of the scenario for a flat horizon",
        ));
    }
    Ok(points)
}

fn read_point(azimuth: &str, altitude: &str, part: Option<&str>) -> Result<SkylinePoint, String> {
    let azimuth = Azimuth::try_from(read_number("azimuth", azimuth)?);
    let altitude = SkylineAltitude::try_from(read_number("altitude", altitude)?);
    let part = part
        .map(|part| PartName::try_from(part.to_owned()))
        .transpose()
        .map_err(|error| error.to_string())?;
    Ok(SkylinePoint {
        azimuth: Angle::from_degrees(azimuth.map_err(|error| error.to_string())?.into()),
        altitude: Angle::from_degrees(altitude.map_err(|error| error.to_string())?.into()),
        part: part.map(String::from),
    })
}

fn read_number(field: &str, text: &str) -> Result<f64, String> {
    text.parse().map_err(|_| {
        let shown: String = text.chars().take(40).collect();
        format!(
            "{field} \"{shown}\" is not a number: write degrees with a decimal point, as in 143.5"
        )
    })
}

/// The engine's skyline from the points; the message says which of them are at odds.
fn polygon(points: &[SkylinePoint], _smooth: bool) -> Result<Skyline, String> {
    let mut azimuths: Vec<f64> = points
        .iter()
        .map(|point| point.azimuth.wrapped().degrees())
        .collect();
    azimuths.sort_unstable_by(f64::total_cmp);
    for three in azimuths.windows(3) {
        if let [first, _, last] = three
            && first == last
        {
            return Err(format!(
                "three points stand at azimuth {first:.3}: two make a vertical wall, a third has no place; leave one out"
            ));
        }
    }
    Ok(Skyline::default())
}
