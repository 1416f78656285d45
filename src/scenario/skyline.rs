//! The skyline as a scenario gives it: points in the document, or a CSV file beside it that [`Skyline::from_csv`] reads
//! (azimuth, altitude and, if wanted, a name, in degrees, one point a row).

use std::path::{Component, Path, PathBuf};

use serde::{Deserialize, Serialize};

use super::files::{FileError, read_limited};
use crate::sky::{Angle, Skyline, skyline};

/// A skyline file larger than this is none: a point every thousandth of a degree fits.
const CSV_LIMIT: u64 = 4 << 20;
/// Greatest distance between points of a smooth skyline: finer than it is usually surveyed, coarse enough to be quick.
const SMOOTH_STEP: Angle = Angle::from_degrees(0.5);

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

/// The skyline of a scenario: the surveyed points, where they come from, and the polygon that everything is measured by.
#[derive(Clone, Debug, PartialEq)]
pub struct SkylineSource {
    surveyed: Skyline,
    smooth: bool,
    origin: SkylineOrigin,
    polygon: Skyline,
}

/// Why there is no skyline in the file that the document names.
#[derive(Debug, thiserror::Error)]
pub enum SkylineError {
    #[error(
        "the skyline's file: {0}; put it into the scenario's folder, or write points: [...] instead of file"
    )]
    File(FileError),
    #[error("skyline file {}: {source}", path.display())]
    Points {
        path: PathBuf,
        source: skyline::SkylineError,
    },
    #[error("skyline file {}: {message}", path.display())]
    Whole {
        path: PathBuf,
        message: &'static str,
    },
}

impl SkylineSource {
    /// A flat horizon.
    #[must_use]
    pub fn flat() -> Self {
        SkylineSource::in_document(Skyline::default(), false)
    }

    /// A skyline whose points stand in the document; a smooth one gets points along a curve between them.
    #[must_use]
    pub fn in_document(surveyed: Skyline, smooth: bool) -> Self {
        SkylineSource::new(surveyed, smooth, SkylineOrigin::Document)
    }

    fn new(surveyed: Skyline, smooth: bool, origin: SkylineOrigin) -> Self {
        let polygon = if smooth {
            surveyed.smoothed(SMOOTH_STEP)
        } else {
            surveyed.clone()
        };
        SkylineSource {
            surveyed,
            smooth,
            origin,
            polygon,
        }
    }

    /// Reads the file `name` in the document's folder.
    pub(super) fn from_file(
        folder: &Path,
        name: &FileName,
        smooth: bool,
    ) -> Result<Self, SkylineError> {
        let path = folder.join(&name.0);
        let bytes = read_limited(&path, CSV_LIMIT).map_err(SkylineError::File)?;
        let surveyed = match std::str::from_utf8(&bytes) {
            Ok(text) => Skyline::from_csv(text),
            Err(_) => {
                return Err(SkylineError::Whole {
                    path,
                    message: "the text is not UTF-8; save it as CSV in UTF-8",
                });
            }
        };
        match surveyed {
            Ok(surveyed) if surveyed.vertices().is_empty() => Err(SkylineError::Whole {
                path,
                message: "no points in it; write azimuth,altitude a row, or leave the skyline out of the scenario for a flat horizon",
            }),
            Ok(surveyed) => Ok(SkylineSource::new(
                surveyed,
                smooth,
                SkylineOrigin::File {
                    name: name.0.clone(),
                    folder: folder.to_owned(),
                },
            )),
            Err(source) => Err(SkylineError::Points { path, source }),
        }
    }

    /// The points as surveyed, in order of azimuth.
    #[must_use]
    pub fn surveyed(&self) -> &Skyline {
        &self.surveyed
    }

    /// Whether points are put between the surveyed ones, along a smooth curve.
    #[must_use]
    pub fn is_smooth(&self) -> bool {
        self.smooth
    }

    #[must_use]
    pub fn origin(&self) -> &SkylineOrigin {
        &self.origin
    }

    /// What every altitude of the skyline is asked of.
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
            let shown: String = name.chars().take(64).collect();
            Err(format!(
                "file \"{shown}\" is not beside the scenario: put it into the scenario's folder and write its name alone, as in \"skyline.csv\""
            ))
        }
    }
}

impl From<FileName> for String {
    fn from(name: FileName) -> String {
        name.0
    }
}
