//! Positions and velocities of the Sun, the Moon and the planets from JPL DE440, and nutation, for 1550 to 2650.
//!
//! Positions are in au, velocities in au per day of TDB, on ICRS axes, geometric (no light time); from the
//! solar-system barycentre except the Moon, which is from the Earth's centre. Mars to Neptune are the barycentres of
//! their systems. Source: R. S. Park, W. M. Folkner, J. G. Williams, D. H. Boggs 2021, AJ 161:105, as piecewise
//! Chebyshev polynomials rounded to integers (`assets/make_ephemeris.py` makes the asset and describes its layout).
//!
//! As seen from the Earth the rounded polynomials stay within 0.003" and 1.3e-8 of the distance of DE440 for Sun and
//! planets, 0.007" and 3e-8 for the Moon (400,000 epochs); velocities within 1e-7 au per day for Mercury, 1e-8 for the
//! other planets and the Sun, 1.5e-9 for the Moon. Nutation is IAU 2000A with the IAU 2006 adjustments
//! (SOFA `nut06a`) within 0.0006".

use std::ops::{Add, Sub};
use std::sync::OnceLock;

use super::chebyshev::Pieces;
use super::frames::Nutation;
use super::{Angle, Tdb, Vec3};

static ASSET: &[u8] = include_bytes!("../../assets/ephemeris.bin");

const MAGIC: &[u8; 8] = b"LOOPEPHM";
const VERSION: u32 = 1;
/// Where the checked part begins: after magic, version, checksum and length.
const PREFIX: usize = 20;
const NUTATION_CODE: u8 = 10;
/// Far above any degree in use; bounds what a damaged file can ask for.
const MAX_DEGREE: u8 = 31;
/// With up to 7 bits to skip, a field must still fit 64 bits.
const MAX_WIDTH: u8 = 56;

/// What the ephemeris gives a state for. From the solar-system barycentre unless the name says otherwise.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Target {
    Sun,
    Mercury,
    Venus,
    EarthMoonBarycentre,
    Mars,
    Jupiter,
    Saturn,
    Uranus,
    Neptune,
    MoonFromEarth,
}

impl Target {
    /// In the order of their codes in the asset.
    pub const ALL: [Target; 10] = [
        Target::Sun,
        Target::Mercury,
        Target::Venus,
        Target::EarthMoonBarycentre,
        Target::Mars,
        Target::Jupiter,
        Target::Saturn,
        Target::Uranus,
        Target::Neptune,
        Target::MoonFromEarth,
    ];
}

/// Position in au and velocity in au per day of TDB, on ICRS axes.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct State {
    pub position: Vec3,
    pub velocity: Vec3,
}

impl Add for State {
    type Output = State;
    fn add(self, other: State) -> State {
        State {
            position: self.position + other.position,
            velocity: self.velocity + other.velocity,
        }
    }
}

impl Sub for State {
    type Output = State;
    fn sub(self, other: State) -> State {
        State {
            position: self.position - other.position,
            velocity: self.velocity - other.velocity,
        }
    }
}

/// Why the bytes of an ephemeris cannot be used.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum EphemerisError {
    #[error(
        "the ephemeris does not begin with its mark; it is another kind of file or badly damaged"
    )]
    NotAnEphemeris,
    #[error("the ephemeris has format version {0}; this program reads version {VERSION}")]
    Version(u32),
    #[error(
        "the ephemeris should hold {expected} bytes after its prefix but holds {found}; it was cut or extended"
    )]
    Length { expected: usize, found: usize },
    #[error(
        "the ephemeris has checksum {found:08x} instead of {expected:08x}; it is damaged, reinstall the program"
    )]
    Checksum { expected: u32, found: u32 },
    #[error(
        "the ephemeris passes its checksum but {0}; make it again with assets/make_ephemeris.py"
    )]
    Malformed(&'static str),
}

/// The decoded ephemeris: about 16 MB of coefficients.
#[derive(Clone, Debug)]
pub struct Ephemeris {
    source: String,
    checksum: u32,
    start: Tdb,
    end: Tdb,
    /// Moon / (Earth + Moon): how far along the way from the Earth to the Moon their barycentre lies.
    moon_share: f64,
    bodies: [Pieces<i32, 3>; Target::ALL.len()],
    nutation: Pieces<i32, 2>,
}

impl Ephemeris {
    /// The ephemeris inside this program, decoded at the first call (some ten milliseconds).
    ///
    /// # Errors
    /// If the embedded bytes are damaged; every call then gives the same error.
    pub fn embedded() -> Result<&'static Ephemeris, EphemerisError> {
        static DECODED: OnceLock<Result<Ephemeris, EphemerisError>> = OnceLock::new();
        let decoded = DECODED.get_or_init(|| Ephemeris::decode(ASSET));
        decoded.as_ref().map_err(Clone::clone)
    }

    /// The bytes that [`Ephemeris::embedded`] decodes.
    #[must_use]
    pub fn embedded_bytes() -> &'static [u8] {
        ASSET
    }

    /// Decodes an ephemeris, whose layout `assets/make_ephemeris.py` describes.
    ///
    /// # Errors
    /// If the bytes are of another kind or version, cut, changed, or at odds with themselves.
    pub fn decode(bytes: &[u8]) -> Result<Ephemeris, EphemerisError> {
        let mut prefix = Reader { bytes };
        if bytes.len() < PREFIX || prefix.array().as_ref() != Some(MAGIC) {
            return Err(EphemerisError::NotAnEphemeris);
        }
        let (version, checksum, length) = (prefix.u32()?, prefix.u32()?, prefix.u32()?);
        if version != VERSION {
            return Err(EphemerisError::Version(version));
        }
        let body = bytes.get(PREFIX..).unwrap_or_default();
        if body.len() != length as usize {
            return Err(EphemerisError::Length {
                expected: length as usize,
                found: body.len(),
            });
        }
        let found = crc32fast::hash(body);
        if found != checksum {
            return Err(EphemerisError::Checksum {
                expected: checksum,
                found,
            });
        }
        Self::decode_body(body, checksum)
    }

    fn decode_body(body: &[u8], checksum: u32) -> Result<Ephemeris, EphemerisError> {
        let mut reader = Reader { bytes: body };
        let length = usize::from(reader.u16()?);
        let source = std::str::from_utf8(reader.take(length)?)
            .map_err(|_| EphemerisError::Malformed("its source is not UTF-8"))?
            .to_owned();
        let (start, end, mass_ratio) = (reader.f64()?, reader.f64()?, reader.f64()?);
        if !(start.is_finite() && end.is_finite() && start < end && mass_ratio > 0.0) {
            return Err(EphemerisError::Malformed(
                "its span or mass ratio makes no sense",
            ));
        }
        let count = reader.u8()?;
        let headers = (0..count)
            .map(|_| SeriesHeader::read(&mut reader))
            .collect::<Result<Vec<_>, _>>()?;

        let streams = headers
            .iter()
            .map(|header| Ok((header, reader.take(header.stream_bytes)?)))
            .collect::<Result<Vec<_>, EphemerisError>>()?;
        let largest = streams.iter().map(|(_, stream)| stream.len()).max();
        let (large, rest): (Vec<_>, Vec<_>) = streams
            .into_iter()
            .partition(|(_, stream)| Some(stream.len()) == largest);
        // The Moon is half of the file: a second thread halves the wait at the start.
        let decode_all = |streams: &[(&SeriesHeader, &[u8])]| {
            let decode =
                |&(header, stream): &(&SeriesHeader, &[u8])| header.decode_any(stream, start, end);
            streams.iter().map(decode).collect::<Result<Vec<_>, _>>()
        };
        let (large, rest) = std::thread::scope(|scope| {
            let helper = std::thread::Builder::new().spawn_scoped(scope, || decode_all(&large));
            let rest = decode_all(&rest);
            let large = match helper.map(std::thread::ScopedJoinHandle::join) {
                Ok(Ok(decoded)) => decoded,
                // No second thread to be had: one after the other then.
                _ => decode_all(&large),
            };
            (large, rest)
        });
        let mut bodies: [Option<Pieces<i32, 3>>; Target::ALL.len()] = [const { None }; _];
        let mut nutation = None;
        for decoded in large?.into_iter().chain(rest?) {
            match decoded {
                Decoded::Nutation(pieces) => nutation = Some(pieces),
                Decoded::Body(code, pieces) => {
                    if let Some(slot) = bodies.get_mut(usize::from(code)) {
                        *slot = Some(pieces);
                    }
                }
            }
        }
        let missing = EphemerisError::Malformed("a series is missing");
        let [
            Some(a),
            Some(b),
            Some(c),
            Some(d),
            Some(e),
            Some(f),
            Some(g),
            Some(h),
            Some(i),
            Some(j),
        ] = bodies
        else {
            return Err(missing);
        };
        Ok(Ephemeris {
            source,
            checksum,
            start: Tdb::from_days(start),
            end: Tdb::from_days(end),
            moon_share: 1.0 / (1.0 + mass_ratio),
            bodies: [a, b, c, d, e, f, g, h, i, j],
            nutation: nutation.ok_or(missing)?,
        })
    }

    /// First and last instant covered, both included.
    #[must_use]
    pub fn span(&self) -> (Tdb, Tdb) {
        (self.start, self.end)
    }

    /// Where the numbers come from, with the reference.
    #[must_use]
    pub fn source(&self) -> &str {
        &self.source
    }

    /// The format version of the asset.
    #[must_use]
    pub fn version(&self) -> u32 {
        VERSION
    }

    /// The CRC-32 of the asset, which it was checked against.
    #[must_use]
    pub fn checksum(&self) -> u32 {
        self.checksum
    }

    /// Position and velocity of a target; None outside the span.
    #[must_use]
    pub fn state(&self, target: Target, instant: Tdb) -> Option<State> {
        let (position, velocity) = self.bodies[target as usize].at(instant.days())?;
        let vector = |[x, y, z]: [f64; 3]| Vec3::new(x, y, z);
        Some(State {
            position: vector(position),
            velocity: vector(velocity),
        })
    }

    /// Position and velocity of the Earth's centre from the solar-system barycentre; None outside the span.
    #[must_use]
    pub fn earth(&self, instant: Tdb) -> Option<State> {
        let barycentre = self.state(Target::EarthMoonBarycentre, instant)?;
        let moon = self.state(Target::MoonFromEarth, instant)?;
        Some(State {
            position: barycentre.position - moon.position * self.moon_share,
            velocity: barycentre.velocity - moon.velocity * self.moon_share,
        })
    }

    /// Position and velocity of the Moon's centre from the solar-system barycentre; None outside the span.
    #[must_use]
    pub fn moon(&self, instant: Tdb) -> Option<State> {
        Some(self.earth(instant)? + self.state(Target::MoonFromEarth, instant)?)
    }

    /// Nutation, IAU 2000A with the IAU 2006 adjustments; None outside the span.
    ///
    /// The argument of the theory is TT; TDB in its place changes nothing above 1e-8".
    #[must_use]
    pub fn nutation(&self, instant: Tdb) -> Option<Nutation> {
        let ([longitude, obliquity], [longitude_rate, obliquity_rate]) =
            self.nutation.at(instant.days())?;
        Some(Nutation {
            longitude: Angle::from_radians(longitude),
            obliquity: Angle::from_radians(obliquity),
            longitude_per_day: Angle::from_radians(longitude_rate),
            obliquity_per_day: Angle::from_radians(obliquity_rate),
        })
    }

    /// Days between the joints of a target's polynomials, counted from the start of the span.
    ///
    /// At a joint position and velocity step by less than the stated errors, which a search for zeros of a rate
    /// may care about.
    #[must_use]
    pub fn piece_days(&self, target: Target) -> f64 {
        self.bodies[target as usize].length()
    }
}

/// A series with its coefficients.
enum Decoded {
    Nutation(Pieces<i32, 2>),
    Body(u8, Pieces<i32, 3>),
}

/// What the head of the asset says of one series.
struct SeriesHeader {
    code: u8,
    degree: u8,
    pieces: usize,
    quantum: f64,
    /// Bits of each field, component after component.
    widths: Vec<u8>,
    /// Value and slope at the start of the first piece, for each component.
    seeds: Vec<[i64; 2]>,
    stream_bytes: usize,
}

impl SeriesHeader {
    fn read(reader: &mut Reader) -> Result<SeriesHeader, EphemerisError> {
        let (code, components, degree) = (reader.u8()?, reader.u8()?, reader.u8()?);
        let pieces = reader.u32()? as usize;
        let quantum = reader.f64()?;
        if !((2..=MAX_DEGREE).contains(&degree) && quantum > 0.0 && quantum.is_finite()) {
            return Err(EphemerisError::Malformed(
                "a degree or quantum is out of range",
            ));
        }
        let fields = usize::from(components) * (usize::from(degree) + 1);
        let widths = reader.take(fields)?.to_vec();
        let seeds = (0..components)
            .map(|_| Ok([reader.i64()?, reader.i64()?]))
            .collect::<Result<Vec<_>, _>>()?;
        let stream_bytes = reader.u32()? as usize;

        let bits_per_piece: usize = widths.iter().map(|&width| usize::from(width)).sum();
        let bits = bits_per_piece.checked_mul(pieces);
        let fits = bits.is_some_and(|bits| bits > 0 && bits.div_ceil(8) == stream_bytes);
        if !fits || widths.iter().any(|&width| width > MAX_WIDTH) {
            return Err(EphemerisError::Malformed("a series does not fit its bytes"));
        }
        Ok(SeriesHeader {
            code,
            degree,
            pieces,
            quantum,
            widths,
            seeds,
            stream_bytes,
        })
    }

    fn decode_any(&self, stream: &[u8], start: f64, end: f64) -> Result<Decoded, EphemerisError> {
        Ok(match self.code {
            NUTATION_CODE => Decoded::Nutation(self.decode(stream, start, end)?),
            code => Decoded::Body(code, self.decode(stream, start, end)?),
        })
    }

    fn decode<const N: usize>(
        &self,
        stream: &[u8],
        start: f64,
        end: f64,
    ) -> Result<Pieces<i32, N>, EphemerisError> {
        let terms = usize::from(self.degree) + 1;
        let Ok(mut before) = <[[i64; 2]; N]>::try_from(self.seeds.as_slice()) else {
            return Err(EphemerisError::Malformed(
                "a series has too many or too few components",
            ));
        };
        let mut coefficients = vec![[0_i32; N]; self.pieces * terms];
        let mut bits = BitReader {
            bytes: stream,
            at: 0,
        };
        let mut in_range = true;
        let mut series = [0_i64; MAX_DEGREE as usize + 1];
        for piece in coefficients.chunks_exact_mut(terms) {
            let by_component = self.widths.chunks_exact(terms).zip(&mut before);
            for (component, (widths, [value, slope])) in by_component.enumerate() {
                for (field, &width) in series.iter_mut().zip(widths) {
                    *field = bits.signed(width);
                }
                continue_from(value, slope, &mut series[..terms]);
                for (row, &c) in piece.iter_mut().zip(&series) {
                    row[component] = c as i32;
                    in_range &= i64::from(row[component]) == c;
                }
            }
        }
        if !in_range {
            return Err(EphemerisError::Malformed("a coefficient is out of range"));
        }
        Pieces::new(start, end, terms, self.quantum, coefficients)
            .ok_or(EphemerisError::Malformed("a series has no pieces"))
    }
}

/// Turns the stored fields of one component of a piece into coefficients, and takes value and slope (sum of k^2 c_k)
/// from the start of the piece to its end.
///
/// Fields 0 and 1 are what the piece differs by from a continuation of the one before; see the maker script.
/// Wrapping: nonsense from a forged file ends as an error in the caller or as nonsense, never as a panic.
fn continue_from(value: &mut i64, slope: &mut i64, series: &mut [i64]) {
    let [c0, c1, upper @ ..] = series else {
        return;
    };
    let (mut even, mut odd, mut even_rise, mut odd_rise) = (0_i64, 0_i64, 0_i64, 0_i64);
    for (k, pair) in (2_i64..).step_by(2).zip(upper.chunks(2)) {
        if let Some(&c) = pair.first() {
            even = even.wrapping_add(c);
            even_rise = even_rise.wrapping_add(c.wrapping_mul(k * k));
        }
        if let Some(&c) = pair.get(1) {
            odd = odd.wrapping_add(c);
            odd_rise = odd_rise.wrapping_add(c.wrapping_mul((k + 1) * (k + 1)));
        }
    }
    // At x = -1 the odd degrees change the sign of the value, the even ones that of the slope.
    *c1 = c1
        .wrapping_add(*slope)
        .wrapping_add(even_rise)
        .wrapping_sub(odd_rise);
    odd = odd.wrapping_add(*c1);
    *c0 = c0.wrapping_add(*value).wrapping_add(odd).wrapping_sub(even);
    *value = c0.wrapping_add(even).wrapping_add(odd);
    *slope = c1.wrapping_add(even_rise).wrapping_add(odd_rise);
}

/// Takes little-endian numbers off the front of bytes.
struct Reader<'a> {
    bytes: &'a [u8],
}

impl<'a> Reader<'a> {
    fn take(&mut self, count: usize) -> Result<&'a [u8], EphemerisError> {
        let (front, rest) = self
            .bytes
            .split_at_checked(count)
            .ok_or(EphemerisError::Malformed("it ends too early"))?;
        self.bytes = rest;
        Ok(front)
    }

    fn array<const N: usize>(&mut self) -> Option<[u8; N]> {
        let (front, rest) = self.bytes.split_first_chunk()?;
        self.bytes = rest;
        Some(*front)
    }

    fn number<const N: usize, T>(&mut self, read: fn([u8; N]) -> T) -> Result<T, EphemerisError> {
        self.array()
            .map(read)
            .ok_or(EphemerisError::Malformed("it ends too early"))
    }

    fn u8(&mut self) -> Result<u8, EphemerisError> {
        self.number(u8::from_le_bytes)
    }

    fn u16(&mut self) -> Result<u16, EphemerisError> {
        self.number(u16::from_le_bytes)
    }

    fn u32(&mut self) -> Result<u32, EphemerisError> {
        self.number(u32::from_le_bytes)
    }

    fn i64(&mut self) -> Result<i64, EphemerisError> {
        self.number(i64::from_le_bytes)
    }

    fn f64(&mut self) -> Result<f64, EphemerisError> {
        self.number(f64::from_le_bytes)
    }
}

/// Takes signed integers of any width up to [`MAX_WIDTH`] bits off a bit stream, least significant bit first.
struct BitReader<'a> {
    bytes: &'a [u8],
    at: usize,
}

impl BitReader<'_> {
    /// The next field; bits beyond the end are 0.
    fn signed(&mut self, width: u8) -> i64 {
        if width == 0 {
            return 0;
        }
        let rest = self.bytes.get(self.at / 8..).unwrap_or_default();
        let word = rest.first_chunk().copied().unwrap_or_else(|| {
            let mut last = [0; 8];
            for (to, from) in last.iter_mut().zip(rest) {
                *to = *from;
            }
            last
        });
        let field = u64::from_le_bytes(word) >> (self.at % 8);
        self.at += usize::from(width);
        let unused = 64 - u32::from(width);
        ((field << unused) as i64) >> unused
    }
}
