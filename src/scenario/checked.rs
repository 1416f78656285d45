//! Numbers and lines of text that are checked while they are read, so that a mistake is reported where it stands.

use serde::{Deserialize, Serialize};

/// A number that is outside what its field accepts, or no number at all.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error("{field} {value} is out of range: use {least} to {greatest} {meaning}")]
pub struct OutOfRange {
    pub field: &'static str,
    pub value: f64,
    pub least: f64,
    pub greatest: f64,
    /// Unit, sign and what would work.
    pub meaning: &'static str,
}

macro_rules! checked_number {
    ($(#[$doc:meta])* $name:ident, $field:literal, $least:literal ..= $greatest:literal, $meaning:literal) => {
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
        #[serde(try_from = "f64", into = "f64")]
        pub(super) struct $name(f64);

        impl TryFrom<f64> for $name {
            type Error = OutOfRange;
            fn try_from(value: f64) -> Result<Self, OutOfRange> {
                // A NaN lies in no range.
                if ($least..=$greatest).contains(&value) {
                    Ok($name(value))
                } else {
                    Err(OutOfRange {
                        field: $field,
                        value,
                        least: $least,
                        greatest: $greatest,
                        meaning: $meaning,
                    })
                }
            }
        }

        impl From<$name> for f64 {
            fn from(checked: $name) -> f64 {
                checked.0
            }
        }
    };
}

checked_number!(
    Latitude,
    "latitude",
    -90.0..=90.0,
    "degrees, north positive, south negative"
);
checked_number!(
    Longitude,
    "longitude",
    -180.0..=180.0,
    "degrees, east positive, west negative (200 east is -160)"
);
checked_number!(
    Elevation,
    "elevation_m",
    -500.0..=9000.0,
    "metres above the sea"
);
checked_number!(
    HeightAbove,
    "height_above_surroundings_m",
    0.0..=9000.0,
    "metres above the land or sea around"
);
checked_number!(
    Pressure,
    "pressure_hpa",
    0.0..=1200.0,
    "hPa at the site itself, not reduced to sea level (0: no refraction)"
);
checked_number!(
    Temperature,
    "temperature_c",
    -100.0..=60.0,
    "degrees Celsius"
);
checked_number!(
    Extinction,
    "extinction_mag",
    0.0..=2.0,
    "magnitudes per airmass (0.2 is a clear night at sea level)"
);
checked_number!(
    Azimuth,
    "azimuth",
    0.0..=360.0,
    "degrees from true north through east (-10 is 350)"
);
checked_number!(
    SkylineAltitude,
    "altitude",
    -90.0..=90.0,
    "degrees above the level, below it negative"
);
checked_number!(
    LeastAltitude,
    "least_altitude",
    -5.0..=90.0,
    "degrees, refracted"
);
checked_number!(
    Clearance,
    "clearance",
    0.0..=90.0,
    "degrees above the skyline"
);
checked_number!(
    /// The upper limit keeps the whole disc under the true horizon (0.83 degrees with refraction), rounded.
    SunBelow,
    "sun_below",
    -90.0..=-1.0,
    "degrees, the altitude of the Sun's centre (-6 is the end of civil twilight)"
);
checked_number!(
    MoonDistance,
    "least_distance",
    0.0..=180.0,
    "degrees between Moon and subject"
);
checked_number!(
    LitFraction,
    "unless_lit_below",
    0.0..=1.0,
    "as a fraction (a half Moon is 0.5)"
);
checked_number!(
    SunDistance,
    "sun_distance",
    5.0..=180.0,
    "degrees from the Sun within which every reading by day carries the caution"
);

/// A text that does not fit on one line of a chart.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error(
    "{field} has {length} characters{reason}: use one line of 1 to {greatest} characters without control characters"
)]
pub struct NotOneLine {
    pub field: &'static str,
    pub length: usize,
    pub greatest: usize,
    /// "" or what else is wrong.
    pub reason: &'static str,
}

macro_rules! checked_line {
    ($name:ident, $field:literal, $greatest:literal) => {
        #[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
        #[serde(try_from = "String", into = "String")]
        pub(super) struct $name(String);

        impl TryFrom<String> for $name {
            type Error = NotOneLine;
            fn try_from(text: String) -> Result<Self, NotOneLine> {
                let length = text.chars().count();
                let reason = if text.chars().any(char::is_control) {
                    ", among them a line break or control character"
                } else if text.trim().is_empty() {
                    " and nothing to read"
                } else {
                    ""
                };
                if reason.is_empty() && length <= $greatest {
                    Ok($name(text))
                } else {
                    Err(NotOneLine {
                        field: $field,
                        length,
                        greatest: $greatest,
                        reason,
                    })
                }
            }
        }

        impl From<$name> for String {
            fn from(checked: $name) -> String {
                checked.0
            }
        }
    };
}

checked_line!(Title, "title", 160);
checked_line!(SiteName, "name", 120);
checked_line!(PartName, "name", 60);
