//! The 88 constellations of the IAU: which one a direction lies in, where their edges run, where to write their names.
//!
//! Directions come in and go out as ICRS unit vectors. The edges are arcs of right ascension and declination of the mean
//! equator and equinox of B1875.0 (Delporte 1930), here from the table of Roman 1987 (PASP 99, 695; CDS VI/42), whose
//! hours are given to 0.0001 (2.7" at most from the whole seconds of the original). ICRS is carried to B1875.0 by the
//! IAU 2006 precession with frame bias; over the whole sky this differs by 0.23" or less from the older way by FK4 and
//! Newcomb's precession (astropy 8.0.2), of no matter beside the table's rounding.
//! `assets/make_constellations.py` makes the tables and derives the edges from them.

use std::fmt;
use std::sync::OnceLock;

use super::{Angle, Mat3, Vec3};

include!("../../assets/constellations.rs");

/// ICRS to the mean equator and equinox of B1875.0 (JD 2405889.258550475): the matrix of the IAU 2006 precession with
/// frame bias (Capitaine et al. 2003, Hilton et al. 2006) as `pmat06` of pyerfa 2.0.1.5 gives it.
const B1875_FROM_ICRS: Mat3 = Mat3::from_rows([
    [
        0.999_535_928_039_599_6,
        0.027_935_235_948_032_204,
        0.012_147_063_453_534_978,
    ],
    [
        -0.027_935_234_880_521_558,
        0.999_609_720_752_342_7,
        -0.000_169_792_795_177_259_31,
    ],
    [
        -0.012_147_065_908_544_64,
        -0.000_169_617_071_581_251_72,
        0.999_926_207_287_248_9,
    ],
]);

/// Points of a drawn edge stand no farther apart than this, in degrees of right ascension or declination: at this
/// spacing a chord leaves its parallel by 1" at most.
const EDGE_STEP_DEGREES: f64 = 0.5;

/// Origin of the boundaries, for `--version`.
pub const SOURCE: &str = "IAU boundaries of B1875.0, Roman 1987 (CDS VI/42)";

/// Right ascension in hours and declination in degrees, B1875.0.
type Place = (f64, f64);

/// What a constellation is called and where its name may stand.
struct Names {
    abbreviation: &'static str,
    name: &'static str,
    genitive: &'static str,
    anchors: &'static [Place],
}

const fn names(
    abbreviation: &'static str,
    name: &'static str,
    genitive: &'static str,
    anchors: &'static [Place],
) -> Names {
    Names {
        abbreviation,
        name,
        genitive,
        anchors,
    }
}

/// One of the 88 constellations; ordered as their abbreviations are.
///
/// The number inside is an index into the table of names, below 88.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Constellation(u8);

impl Constellation {
    /// All of them, in alphabetical order of abbreviations.
    pub fn all() -> impl Iterator<Item = Constellation> {
        (0u8..).zip(&NAMES).map(|(index, _)| Constellation(index))
    }

    /// The constellation in which a direction lies. Seen from anywhere in the solar system edges are at infinity, so a
    /// planet's astrometric or apparent direction (carried back to ICRS axes) serves alike; they differ by some 20".
    ///
    /// `icrs` need not be of length 1. A place on an edge belongs to the constellation east or north of it. The zero
    /// vector and vectors that are not finite have no direction and give some constellation, without meaning.
    #[must_use]
    pub fn at_icrs(icrs: Vec3) -> Constellation {
        let place = B1875_FROM_ICRS * icrs;
        let degrees = place.latitude().degrees();
        let hours = place.longitude().hours();
        // An angle just short of a full turn can round to 24 hours.
        let hours = if hours < 24.0 { hours } else { 0.0 };
        // The strips stand in order of falling declination; all from here on reach down to this place or below it.
        let first = STRIPS.partition_point(|&(_, _, lower, _)| lower > degrees);
        let found = STRIPS
            .iter()
            .skip(first)
            .find(|&&(from, to, _, _)| from <= hours && hours < to)
            // Below the last strip by a rounding error: it holds the south pole and goes all round.
            .unwrap_or(&STRIPS[STRIPS.len() - 1]);
        Constellation(found.3)
    }

    /// The constellation of an IAU abbreviation, capitals or not.
    #[must_use]
    pub fn by_abbreviation(abbreviation: &str) -> Option<Constellation> {
        Constellation::all().find(|c| c.abbreviation().eq_ignore_ascii_case(abbreviation.trim()))
    }

    /// The three letters of the IAU, as in "UMa".
    #[must_use]
    pub fn abbreviation(self) -> &'static str {
        self.names().abbreviation
    }

    /// The Latin name, as in "Ursa Major".
    #[must_use]
    pub fn name(self) -> &'static str {
        self.names().name
    }

    /// The Latin genitive used with designations of stars, as in "Ursae Majoris".
    #[must_use]
    pub fn genitive(self) -> &'static str {
        self.names().genitive
    }

    /// Where its name can stand: ICRS unit vectors, one in each connected part (two for Serpens, one for all others),
    /// the largest part first. Each is the point of its part farthest from all edges, to half a degree.
    #[must_use]
    pub fn anchors(self) -> Vec<Vec3> {
        let anchors = self.names().anchors;
        anchors
            .iter()
            .map(|&(hours, degrees)| icrs_from_b1875(hours, degrees))
            .collect()
    }

    fn names(self) -> &'static Names {
        // The number is below 88 by construction: it comes from `all` or from the table of strips.
        &NAMES[usize::from(self.0)]
    }
}

impl fmt::Display for Constellation {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.name())
    }
}

/// A stretch of edge between the same two constellations.
#[derive(Clone, Debug, PartialEq)]
pub struct Boundary {
    /// The two it divides, in alphabetical order of abbreviations.
    pub between: [Constellation; 2],
    /// ICRS unit vectors along it, half a degree apart or closer; straight lines between them serve for drawing.
    pub points: Vec<Vec3>,
}

/// All edges, each once, worked out on first use.
#[must_use]
pub fn boundary_polylines() -> &'static [Boundary] {
    static BOUNDARIES: OnceLock<Vec<Boundary>> = OnceLock::new();
    BOUNDARIES.get_or_init(|| {
        CHAINS
            .iter()
            .map(|&(a, b, corners)| Boundary {
                between: [Constellation(a), Constellation(b)],
                points: points_along(corners),
            })
            .collect()
    })
}

/// A stretch of edge along one hour circle or one parallel of B1875.0, degrees. The right ascension may go beyond 360.
#[derive(Clone, Copy)]
struct Edge {
    from_ra: f64,
    to_ra: f64,
    from_dec: f64,
    to_dec: f64,
}

/// How far a direction (ICRS) may move without crossing a boundary: a lower bound on the distance to the nearest edge, at
/// least 0.7 times the distance itself, 0 on an edge, and never more than 10 degrees.
#[must_use]
pub fn clearance(icrs: Vec3) -> Angle {
    static EDGES: OnceLock<Vec<Edge>> = OnceLock::new();
    let edges = EDGES.get_or_init(|| {
        let mut edges = Vec::new();
        for pair in CHAINS.iter().flat_map(|(_, _, corners)| corners.windows(2)) {
            if let &[(hours, dec), (next_hours, next_dec)] = pair {
                let (a, b) = (hours * 15.0, next_hours * 15.0);
                edges.push(Edge {
                    from_ra: a.min(b),
                    to_ra: a.max(b),
                    from_dec: dec.min(next_dec),
                    to_dec: dec.max(next_dec),
                });
            }
        }
        edges
    });
    let here = B1875_FROM_ICRS * icrs;
    let (ra, dec) = (here.longitude().degrees(), here.latitude().degrees());
    let cos_dec = libm::hypot(here.x, here.y);
    let mut nearest = 10.0_f64;
    for edge in edges {
        let across = (edge.from_dec - dec).max(dec - edge.to_dec).max(0.0);
        if across >= nearest {
            continue;
        }
        let width = edge.to_ra - edge.from_ra;
        // From the edge's western end, 0 to 360: beyond the width the way round to either end.
        let past = (ra - edge.from_ra).rem_euclid(360.0);
        let off = if past <= width {
            0.0
        } else {
            (past - width).min(360.0 - past)
        };
        let off = off.min(90.0);
        // The sine of an angle up to 90 degrees is at least its share of 90: most edges are passed over without a sine.
        if off / 90.0 * cos_dec >= nearest.to_radians() {
            continue;
        }
        // The distance to an hour circle; behind the pole an edge is at least as far as the pole.
        let along = Angle::from_degrees(off).sin() * cos_dec;
        let along = Angle::from_radians(libm::asin(along.clamp(0.0, 1.0))).degrees();
        nearest = nearest.min(across.max(along));
    }
    Angle::from_degrees(nearest)
}

/// Points along a chain of corners (hours, degrees, B1875.0), corners included.
fn points_along(corners: &[Place]) -> Vec<Vec3> {
    let mut points = Vec::new();
    for pair in corners.windows(2) {
        let &[(hours, degrees), (next_hours, next_degrees)] = pair else {
            continue;
        };
        let length = ((next_hours - hours) * 15.0)
            .abs()
            .max((next_degrees - degrees).abs());
        let steps = (length / EDGE_STEP_DEGREES).ceil().max(1.0);
        let mut step = 0.0;
        while step < steps {
            let part = step / steps;
            points.push(icrs_from_b1875(
                hours + (next_hours - hours) * part,
                degrees + (next_degrees - degrees) * part,
            ));
            step += 1.0;
        }
    }
    points.extend(
        corners
            .last()
            .map(|&(hours, degrees)| icrs_from_b1875(hours, degrees)),
    );
    points
}

fn icrs_from_b1875(hours: f64, degrees: f64) -> Vec3 {
    B1875_FROM_ICRS.transposed()
        * Vec3::from_spherical(Angle::from_hours(hours), Angle::from_degrees(degrees))
}
