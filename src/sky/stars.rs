//! The stars to V 7.0, with their names.
//!
//! Frame ICRS; angles in radians; epoch J1991.25 (TT). Source: Hipparcos, the New Reduction (van Leeuwen 2007, CDS I/311);
//! names approved by the IAU (Working Group on Star Names, as of January 2021). `assets/make_stars.py` makes the table.
//!
//! Accuracy: places 0.3 milliarcsec of rounding beside the catalogue's own errors (about 1 mas for most, more for close
//! pairs); proper motion rounded to 0.13 mas/yr, hence 0.4" in 3000 years. Radial velocities are left out: that costs
//! 2" or less within a century, but by the year -1000 as much as 14' for 61 Cygni, 9' for Alpha Centauri and 25" for Sirius.
//! Magnitudes are V converted from Hp, within about 0.02 mag for steady single stars; variable stars have the median of
//! 1989 to 1993. No parallax: it stays under 0.8".

use std::sync::OnceLock;

use thiserror::Error;

use super::{Angle, Tt, Vec3};

/// Origin of the stars, for `--version`.
pub const SOURCE: &str =
    "Hipparcos, the new reduction (van Leeuwen 2007, CDS I/311); names approved by the IAU";

/// The epoch of the catalogue, J1991.25.
pub const CATALOGUE_EPOCH: Tt = Tt::from_julian_date(2_448_349.062_5);

const DAYS_PER_JULIAN_YEAR: f64 = 365.25;
const MAGIC: &[u8] = b"LWSTARS1";
const STAR_BYTES: usize = 20;
/// Proper motions are stored in quarters of a milliarcsecond a year.
const MOTION_UNIT: Angle = Angle::from_arcsec(0.000_25);
const NO_COLOUR: i16 = i16::MIN;

static EMBEDDED: &[u8] = include_bytes!("../../assets/stars.bin");

/// What is wrong with a star table.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Error)]
pub enum StarTableError {
    /// The file does not begin as a star table does.
    #[error(
        "star table: the first bytes are not those of a star table of this version; make it again with assets/make_stars.py"
    )]
    WrongFormat,
    /// The file ends too early or goes on too long.
    #[error(
        "star table: wrong length, found out at byte {offset}; make it again with assets/make_stars.py"
    )]
    WrongLength { offset: usize },
    /// An entry holds something impossible.
    #[error("star table: {what} at byte {offset}; make it again with assets/make_stars.py")]
    BadEntry { what: &'static str, offset: usize },
}

/// One star.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Star {
    /// Its number in the Hipparcos catalogue.
    pub hip: u32,
    /// Unit vector to it, ICRS, at [`CATALOGUE_EPOCH`].
    pub direction: Vec3,
    /// Proper motion, ICRS, radians per Julian year, at right angles to `direction`.
    pub proper_motion: Vec3,
    /// V magnitude.
    pub magnitude: f64,
    /// Colour index B-V in magnitudes; `None` where the catalogue has none.
    pub bv: Option<f32>,
    /// The name approved by the IAU.
    pub name: Option<&'static str>,
}

impl Star {
    /// Unit vector to the star from the barycentre at an instant, ICRS: straight, even motion through space at right
    /// angles to the line of sight. Valid for any number of years within the limits in the module's head.
    #[must_use]
    pub fn direction_at(&self, instant: Tt) -> Vec3 {
        let years = (instant.days() - CATALOGUE_EPOCH.days()) / DAYS_PER_JULIAN_YEAR;
        (self.direction + self.proper_motion * years).unit()
    }
}

/// The stars, brightest first.
#[derive(Clone, Debug)]
pub struct StarCatalogue {
    stars: Vec<Star>,
}

impl StarCatalogue {
    /// The table within the program, read on first use.
    ///
    /// # Errors
    /// When the program was built with a damaged table.
    pub fn embedded() -> Result<&'static StarCatalogue, StarTableError> {
        static CATALOGUE: OnceLock<Result<StarCatalogue, StarTableError>> = OnceLock::new();
        CATALOGUE
            .get_or_init(|| StarCatalogue::from_bytes(EMBEDDED))
            .as_ref()
            .map_err(|error| *error)
    }

    /// Reads a table as `assets/make_stars.py` describes it.
    ///
    /// # Errors
    /// When the bytes are not such a table.
    pub fn from_bytes(bytes: &'static [u8]) -> Result<StarCatalogue, StarTableError> {
        let mut reader = Reader { bytes, offset: 0 };
        if reader.take(MAGIC.len()) != Ok(MAGIC) {
            return Err(StarTableError::WrongFormat);
        }
        let star_count = reader.u32()? as usize;
        let name_count = reader.u32()? as usize;
        // Each star takes 20 bytes, so a wrong count cannot ask for more memory than the file is long.
        let mut stars = Vec::with_capacity(star_count.min(bytes.len() / STAR_BYTES));
        for _ in 0..star_count {
            stars.push(reader.star()?);
        }
        if let Some(i) = stars
            .windows(2)
            .position(|pair| matches!(pair, [a, b] if a.magnitude > b.magnitude))
        {
            return Err(StarTableError::BadEntry {
                what: "a star brighter than the one before it",
                offset: MAGIC.len() + 8 + STAR_BYTES * (i + 1),
            });
        }
        for _ in 0..name_count {
            let offset = reader.offset;
            let bad = |what| StarTableError::BadEntry { what, offset };
            let index = usize::from(reader.u16()?);
            let length = usize::from(reader.u8()?);
            let name = std::str::from_utf8(reader.take(length)?)
                .map_err(|_| bad("a name that is not UTF-8"))?;
            let star = stars
                .get_mut(index)
                .ok_or(bad("a name of a star that is not there"))?;
            star.name = Some(name);
        }
        if reader.offset != bytes.len() {
            return Err(StarTableError::WrongLength {
                offset: reader.offset,
            });
        }
        Ok(StarCatalogue { stars })
    }

    /// All stars, brightest first.
    #[must_use]
    pub fn stars(&self) -> &[Star] {
        &self.stars
    }

    /// The stars of this V magnitude and brighter, brightest first.
    #[must_use]
    pub fn to_magnitude(&self, faintest: f64) -> &[Star] {
        let end = self
            .stars
            .partition_point(|star| star.magnitude <= faintest);
        self.stars.get(..end).unwrap_or_default()
    }

    /// The star of this Hipparcos number.
    #[must_use]
    pub fn by_hip(&self, hip: u32) -> Option<&Star> {
        self.stars.iter().find(|star| star.hip == hip)
    }

    /// The star of this IAU name, capitals or not; accents count.
    #[must_use]
    pub fn by_name(&self, name: &str) -> Option<&Star> {
        let wanted = name.trim().to_lowercase();
        self.stars
            .iter()
            .find(|star| star.name.is_some_and(|own| own.to_lowercase() == wanted))
    }
}

/// Takes little-endian values from the front of a table.
struct Reader {
    bytes: &'static [u8],
    offset: usize,
}

impl Reader {
    fn take(&mut self, count: usize) -> Result<&'static [u8], StarTableError> {
        let end = self.offset.saturating_add(count);
        let taken = self
            .bytes
            .get(self.offset..end)
            .ok_or(StarTableError::WrongLength {
                offset: self.offset,
            })?;
        self.offset = end;
        Ok(taken)
    }

    fn array<const N: usize>(&mut self) -> Result<[u8; N], StarTableError> {
        let offset = self.offset;
        self.take(N)?
            .try_into()
            .map_err(|_| StarTableError::WrongLength { offset })
    }

    fn u8(&mut self) -> Result<u8, StarTableError> {
        self.array().map(u8::from_le_bytes)
    }

    fn u16(&mut self) -> Result<u16, StarTableError> {
        self.array().map(u16::from_le_bytes)
    }

    fn i16(&mut self) -> Result<i16, StarTableError> {
        self.array().map(i16::from_le_bytes)
    }

    fn u32(&mut self) -> Result<u32, StarTableError> {
        self.array().map(u32::from_le_bytes)
    }

    fn i32(&mut self) -> Result<i32, StarTableError> {
        self.array().map(i32::from_le_bytes)
    }

    fn star(&mut self) -> Result<Star, StarTableError> {
        const RADIANS_PER_UNIT: f64 = std::f64::consts::TAU / 4_294_967_296.0;
        let offset = self.offset;
        let hip = self.u32()?;
        let right_ascension = Angle::from_radians(f64::from(self.u32()?) * RADIANS_PER_UNIT);
        let declination = Angle::from_radians(f64::from(self.i32()?) * RADIANS_PER_UNIT);
        if declination.abs() > Angle::QUARTER_TURN {
            return Err(StarTableError::BadEntry {
                what: "a declination beyond a pole",
                offset,
            });
        }
        let motion_east = MOTION_UNIT.radians() * f64::from(self.i16()?);
        let motion_north = MOTION_UNIT.radians() * f64::from(self.i16()?);
        let magnitude = f64::from(self.i16()?) / 1000.0;
        let colour = self.i16()?;

        let (sin_ra, cos_ra) = right_ascension.sin_cos();
        let (sin_dec, cos_dec) = declination.sin_cos();
        let east = Vec3::new(-sin_ra, cos_ra, 0.0);
        let north = Vec3::new(-sin_dec * cos_ra, -sin_dec * sin_ra, cos_dec);
        Ok(Star {
            hip,
            direction: Vec3::new(cos_dec * cos_ra, cos_dec * sin_ra, sin_dec),
            proper_motion: east * motion_east + north * motion_north,
            magnitude,
            bv: (colour != NO_COLOUR).then(|| f32::from(colour) / 1000.0),
            name: None,
        })
    }
}
