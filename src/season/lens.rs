//! What a camera is made of: a lens (or telescope) and a sensor, and the field and pixel scale they give together.
//!
//! Lengths in millimetres, pixel pitch in micrometres. Lenses are taken as rectilinear, so that the picture is the tangent
//! plane: a direction at the angle a from the axis falls f tan(a) from the middle. Real lenses differ from that by their
//! distortion, mostly under 3 % at the edge (common practice, no source); fisheyes are another kind and are not meant.
//! The field is 2 atan(s / 2f), the scale at the middle 206 265" times pitch over focal length: plain geometry.

use serde::{Deserialize, Serialize};

use crate::sky::Angle;

/// A number outside what a quantity accepts, or no number at all.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error("{quantity} {value} is out of range: use {least} to {greatest} {meaning}")]
pub struct OutOfRange {
    pub quantity: &'static str,
    pub value: f64,
    pub least: f64,
    pub greatest: f64,
    /// Unit and what would work.
    pub meaning: &'static str,
}

/// The value if it lies in the range, ends included; a NaN lies in no range.
pub(super) fn within(
    quantity: &'static str,
    value: f64,
    (least, greatest): (f64, f64),
    meaning: &'static str,
) -> Result<f64, OutOfRange> {
    if (least..=greatest).contains(&value) {
        Ok(value)
    } else {
        Err(OutOfRange {
            quantity,
            value,
            least,
            greatest,
            meaning,
        })
    }
}

/// A lens or telescope that cannot be, or a sensor that cannot.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum CameraError {
    #[error(transparent)]
    OutOfRange(#[from] OutOfRange),
    /// Width and height do not fit the numbers of pixels.
    #[error(
        "a sensor of {width_mm} x {height_mm} mm with {columns} x {rows} pixels has pixels of {across_um:.3} x {down_um:.3} \
         um: give width and height in the order of the pixels, both of the same sensor (pixels are square within 5 %)"
    )]
    PixelsNotSquare {
        width_mm: f64,
        height_mm: f64,
        columns: u32,
        rows: u32,
        across_um: f64,
        down_um: f64,
    },
}

/// A lens, or a telescope with whatever stands between it and the sensor.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "LensFields", into = "LensFields")]
pub struct Lens {
    name: String,
    focal_length_mm: f64,
    f_ratio: f64,
}

/// How a lens is written.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct LensFields {
    name: String,
    focal_length_mm: f64,
    f_ratio: f64,
}

impl TryFrom<LensFields> for Lens {
    type Error = CameraError;
    fn try_from(fields: LensFields) -> Result<Self, CameraError> {
        Lens::new(fields.name, fields.focal_length_mm, fields.f_ratio)
    }
}

impl From<Lens> for LensFields {
    fn from(lens: Lens) -> Self {
        LensFields {
            name: lens.name,
            focal_length_mm: lens.focal_length_mm,
            f_ratio: lens.f_ratio,
        }
    }
}

impl Lens {
    /// `name` is the user's and carries no meaning; the focal length is the effective one, at which the picture is taken.
    ///
    /// # Errors
    /// A focal length outside 1 to 100 000 mm or an f-ratio outside 0.5 to 1000.
    pub fn new(
        name: impl Into<String>,
        focal_length_mm: f64,
        f_ratio: f64,
    ) -> Result<Self, CameraError> {
        Ok(Lens {
            name: name.into(),
            focal_length_mm: within(
                "focal length",
                focal_length_mm,
                (1.0, 100_000.0),
                "mm (a standard lens has 50)",
            )?,
            f_ratio: within(
                "f-ratio",
                f_ratio,
                (0.5, 1000.0),
                "(focal length over aperture, as in 2.8)",
            )?,
        })
    }

    #[must_use]
    pub fn name(&self) -> &str {
        &self.name
    }

    #[must_use]
    pub const fn focal_length_mm(&self) -> f64 {
        self.focal_length_mm
    }

    #[must_use]
    pub const fn f_ratio(&self) -> f64 {
        self.f_ratio
    }

    /// Diameter of the entrance pupil.
    #[must_use]
    pub fn aperture_mm(&self) -> f64 {
        self.focal_length_mm / self.f_ratio
    }

    /// What the sensor sees behind this lens.
    #[must_use]
    pub fn field(&self, sensor: &Sensor) -> Field {
        let across = |millimetres: f64| {
            Angle::from_radians(2.0 * libm::atan(0.5 * millimetres / self.focal_length_mm))
        };
        Field {
            width: across(sensor.width_mm),
            height: across(sensor.height_mm),
            diagonal: across(libm::hypot(sensor.width_mm, sensor.height_mm)),
        }
    }

    /// Sky on one pixel in the middle of the picture, that is pitch over focal length. A pixel at the angle a from the
    /// middle sees cos(a) of it across and the square of that along the radius.
    #[must_use]
    pub fn pixel_scale(&self, sensor: &Sensor) -> Angle {
        Angle::from_radians(sensor.pitch_um() * 1e-3 / self.focal_length_mm)
    }
}

/// Angles from edge to edge and from corner to corner, through the middle of the picture.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Field {
    pub width: Angle,
    pub height: Angle,
    pub diagonal: Angle,
}

/// A sensor with square pixels.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "SensorFields", into = "SensorFields")]
pub struct Sensor {
    width_mm: f64,
    height_mm: f64,
    columns: u32,
    rows: u32,
}

/// How a sensor is written.
#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct SensorFields {
    width_mm: f64,
    height_mm: f64,
    columns: u32,
    rows: u32,
}

impl TryFrom<SensorFields> for Sensor {
    type Error = CameraError;
    fn try_from(fields: SensorFields) -> Result<Self, CameraError> {
        Sensor::new(
            fields.width_mm,
            fields.height_mm,
            fields.columns,
            fields.rows,
        )
    }
}

impl From<Sensor> for SensorFields {
    fn from(sensor: Sensor) -> Self {
        SensorFields {
            width_mm: sensor.width_mm,
            height_mm: sensor.height_mm,
            columns: sensor.columns,
            rows: sensor.rows,
        }
    }
}

impl Sensor {
    /// From the sides and the numbers of pixels along them.
    ///
    /// # Errors
    /// Sides outside 0.1 to 1000 mm, no pixels or more than 200 000 along a side, pixels that are not square within 5 %
    /// (data sheets round the sides by up to 1 %; a larger difference is a mix-up).
    pub fn new(
        width_mm: f64,
        height_mm: f64,
        columns: u32,
        rows: u32,
    ) -> Result<Self, CameraError> {
        let side = |name, value| {
            within(
                name,
                value,
                (0.1, 1000.0),
                "mm (a full-frame sensor has 36 x 24)",
            )
        };
        let pixels = |name, value: u32| {
            within(
                name,
                f64::from(value),
                (1.0, 200_000.0),
                "pixels along that side",
            )
        };
        let across_um = 1e3 * side("sensor width", width_mm)? / pixels("sensor columns", columns)?;
        let down_um = 1e3 * side("sensor height", height_mm)? / pixels("sensor rows", rows)?;
        if (across_um - down_um).abs() > 0.05 * across_um {
            return Err(CameraError::PixelsNotSquare {
                width_mm,
                height_mm,
                columns,
                rows,
                across_um,
                down_um,
            });
        }
        Ok(Sensor {
            width_mm,
            height_mm,
            columns,
            rows,
        })
    }

    /// From the numbers of pixels and their pitch, centre to centre.
    ///
    /// # Errors
    /// A pitch outside 0.1 to 1000 micrometres, or what [`Sensor::new`] refuses.
    pub fn from_pitch(columns: u32, rows: u32, pitch_um: f64) -> Result<Self, CameraError> {
        let pitch_mm = 1e-3
            * within(
                "pixel pitch",
                pitch_um,
                (0.1, 1000.0),
                "micrometres (most cameras have 2 to 9)",
            )?;
        Sensor::new(
            f64::from(columns) * pitch_mm,
            f64::from(rows) * pitch_mm,
            columns,
            rows,
        )
    }

    #[must_use]
    pub const fn width_mm(&self) -> f64 {
        self.width_mm
    }

    #[must_use]
    pub const fn height_mm(&self) -> f64 {
        self.height_mm
    }

    #[must_use]
    pub const fn columns(&self) -> u32 {
        self.columns
    }

    #[must_use]
    pub const fn rows(&self) -> u32 {
        self.rows
    }

    /// Side of a pixel: the root of its area, where the rounding of a data sheet leaves width and height a little apart.
    #[must_use]
    pub fn pitch_um(&self) -> f64 {
        let area =
            (self.width_mm / f64::from(self.columns)) * (self.height_mm / f64::from(self.rows));
        1e3 * area.sqrt()
    }
}
