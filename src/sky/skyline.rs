//! The obstructions all round a site, as a function of azimuth.
//!
//! Azimuths are true, from north through east, 0 to 360 degrees; altitudes apparent, as a theodolite reads them, -90 to 90
//! degrees (a site above its surroundings looks down on its horizon). The skyline is a polygon of straight lines in
//! (azimuth, altitude), closed over north: everything that asks for it sees the same lines.

use std::collections::VecDeque;
use std::f64::consts::TAU;
use std::fmt;

use serde::{Deserialize, Serialize};

use super::Angle;

/// A point of the skyline as it is written in files.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SkylinePoint {
    /// True azimuth, 0 to 360 degrees.
    pub azimuth: f64,
    /// Apparent altitude, -90 to 90 degrees.
    pub altitude: f64,
    /// What begins here, as in "water tower".
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub name: Option<String>,
}

/// A corner of the skyline.
#[derive(Clone, Debug, PartialEq)]
pub struct Vertex {
    /// 0 up to but not including 360 degrees.
    pub azimuth: Angle,
    /// Apparent altitude.
    pub altitude: Angle,
    pub name: Option<String>,
}

/// The skyline all round: vertices in order of azimuth, at most two at one azimuth (a vertical wall, in the order in which
/// they are met going round with increasing azimuth). None: flat at altitude 0. One: the same altitude all round.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Skyline {
    vertices: Vec<Vertex>,
}

/// A straight piece of the skyline.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Segment<'a> {
    /// 0 up to but not including 360 degrees.
    pub from_azimuth: Angle,
    pub from_altitude: Angle,
    /// Not less than `from_azimuth`; beyond 360 degrees where the piece crosses north.
    pub to_azimuth: Angle,
    pub to_altitude: Angle,
    /// The name at its start, or else the one at its end.
    pub name: Option<&'a str>,
}

impl Segment<'_> {
    /// Whether it stands upright at one azimuth.
    #[must_use]
    pub fn is_wall(&self) -> bool {
        self.from_azimuth == self.to_azimuth
    }

    /// Altitude at an azimuth counted like the segment's own (so, past north, beyond 360 degrees); its end's beyond the ends.
    #[must_use]
    pub fn altitude_at(&self, azimuth: Angle) -> Angle {
        let width = (self.to_azimuth - self.from_azimuth).radians();
        let along = (azimuth - self.from_azimuth).radians();
        if along <= 0.0 || width <= 0.0 {
            return self.from_altitude;
        }
        if along >= width {
            return self.to_altitude;
        }
        self.from_altitude + (self.to_altitude - self.from_altitude) * (along / width)
    }
}

/// Which of the points handed in is meant.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PointPlace {
    /// Counted from 1 in the list.
    Point(usize),
    /// Counted from 1 in a text.
    Line(usize),
}

impl fmt::Display for PointPlace {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            PointPlace::Point(number) => write!(f, "skyline point {number}"),
            PointPlace::Line(number) => write!(f, "skyline, line {number}"),
        }
    }
}

/// Why points make no skyline.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum SkylineError {
    #[error("{place}: azimuth {value} is not within 0 to 360 degrees")]
    Azimuth { place: PointPlace, value: f64 },
    #[error("{place}: altitude {value} is not within -90 to 90 degrees")]
    Altitude { place: PointPlace, value: f64 },
    #[error(
        "{place}: a third point at azimuth {azimuth}; two make a vertical wall, more cannot be told apart"
    )]
    ThirdAtOneAzimuth { place: PointPlace, azimuth: f64 },
    #[error("{place}: {column} \"{text}\" is not a number of degrees")]
    NotANumber {
        place: PointPlace,
        column: &'static str,
        text: String,
    },
    #[error(
        "{place}: {found} fields between commas; a point is azimuth,altitude or azimuth,altitude,name, with decimal points"
    )]
    FieldCount { place: PointPlace, found: usize },
}

impl Skyline {
    /// A skyline through points in any order; two at one azimuth make a wall in the order given. A point at 360 degrees is
    /// one at north that is met before those at 0; where both have the same altitude they are one, so that a list may
    /// close itself.
    ///
    /// # Errors
    /// A value out of range or not a number; three points at one azimuth.
    pub fn new(points: Vec<SkylinePoint>) -> Result<Self, SkylineError> {
        let placed = points
            .into_iter()
            .enumerate()
            .map(|(index, point)| (PointPlace::Point(index + 1), point));
        Skyline::from_placed(placed.collect())
    }

    /// A skyline from comma-separated text: `azimuth,altitude` or `azimuth,altitude,name` in degrees, one point a line. A
    /// header line with those names may lead (`azimuth_deg` and `altitude_deg` do as well); lines that begin with `#` and empty
    /// lines are passed over.
    ///
    /// # Errors
    /// As [`Skyline::new`], with the number of the line; also a line that cannot be read.
    pub fn from_csv(text: &str) -> Result<Self, SkylineError> {
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        let lines = text
            .lines()
            .enumerate()
            .map(|(index, line)| (PointPlace::Line(index + 1), line.trim()))
            .filter(|(_, line)| !line.is_empty() && !line.starts_with('#'));
        let mut placed = Vec::new();
        for (index, (place, line)) in lines.enumerate() {
            if index == 0 && is_header(line) {
                continue;
            }
            placed.push((place, point_from_line(place, line)?));
        }
        Skyline::from_placed(placed)
    }

    fn from_placed(mut placed: Vec<(PointPlace, SkylinePoint)>) -> Result<Self, SkylineError> {
        for (place, point) in &placed {
            let place = *place;
            if !(0.0..=360.0).contains(&point.azimuth) {
                return Err(SkylineError::Azimuth {
                    place,
                    value: point.azimuth,
                });
            }
            if !(-90.0..=90.0).contains(&point.altitude) {
                return Err(SkylineError::Altitude {
                    place,
                    value: point.altitude,
                });
            }
        }
        // Points written at 360 come to 0, ahead of those written there; the sort keeps the order of equals.
        let azimuth = |point: &SkylinePoint| {
            if point.azimuth >= 360.0 {
                0.0
            } else {
                // Never -0.0, which would sort before 0.
                point.azimuth + 0.0
            }
        };
        let closes = |point: &SkylinePoint| point.azimuth >= 360.0;
        placed.sort_by(|(_, a), (_, b)| {
            azimuth(a)
                .total_cmp(&azimuth(b))
                .then_with(|| closes(b).cmp(&closes(a)))
        });
        let mut vertices: Vec<Vertex> = Vec::with_capacity(placed.len());
        let mut last_closes = false;
        for (place, point) in placed {
            let written_at_360 = closes(&point);
            let vertex = Vertex {
                azimuth: Angle::from_degrees(azimuth(&point)),
                altitude: Angle::from_degrees(point.altitude),
                name: point.name,
            };
            if last_closes
                && let Some(closing) = vertices.last_mut()
                && closing.azimuth == vertex.azimuth
                && closing.altitude == vertex.altitude
            {
                closing.name = vertex.name.or(closing.name.take());
                last_closes = false;
                continue;
            }
            if let [.., before, last] = &vertices[..]
                && before.azimuth == vertex.azimuth
                && last.azimuth == vertex.azimuth
            {
                return Err(SkylineError::ThirdAtOneAzimuth {
                    place,
                    azimuth: point.azimuth,
                });
            }
            last_closes = written_at_360;
            vertices.push(vertex);
        }
        Ok(Skyline { vertices })
    }

    /// The corners in order of azimuth; empty for the flat skyline.
    #[must_use]
    pub fn vertices(&self) -> &[Vertex] {
        &self.vertices
    }

    /// The straight pieces in order, walls included, from the first vertex once round; a single level piece where there are
    /// fewer than two vertices.
    pub fn segments(&self) -> impl Iterator<Item = Segment<'_>> {
        (0..self.vertices.len().max(1)).map(|index| self.segment(index))
    }

    /// The piece from the vertex of this number (taken round) to the next.
    fn segment(&self, index: usize) -> Segment<'_> {
        let count = self.vertices.len();
        let turn = Angle::from_radians(TAU);
        let (Some(from), Some(to)) = (
            self.vertices.get(index % count.max(1)),
            self.vertices.get((index + 1) % count.max(1)),
        ) else {
            return Segment {
                from_azimuth: Angle::ZERO,
                from_altitude: Angle::ZERO,
                to_azimuth: turn,
                to_altitude: Angle::ZERO,
                name: None,
            };
        };
        let closes = index + 1 >= count;
        Segment {
            from_azimuth: from.azimuth,
            from_altitude: from.altitude,
            to_azimuth: if closes {
                to.azimuth + turn
            } else {
                to.azimuth
            },
            to_altitude: to.altitude,
            name: from.name.as_deref().or(to.name.as_deref()),
        }
    }

    /// The number of the piece that holds an azimuth from 0 to 360: the one that starts at or before it and ends after it.
    fn index_at(&self, azimuth: Angle) -> usize {
        let after = self
            .vertices
            .partition_point(|vertex| vertex.azimuth <= azimuth);
        // Before the first vertex it is the piece that closes over north.
        match after {
            0 => self.vertices.len().saturating_sub(1),
            _ => after - 1,
        }
    }

    /// Whether the piece of this number holds the azimuth, as [`Skyline::index_at`] would find.
    fn holds(&self, index: usize, azimuth: Angle) -> bool {
        let (Some(first), Some(from)) = (self.vertices.first(), self.vertices.get(index)) else {
            return true;
        };
        match self.vertices.get(index + 1) {
            Some(to) => from.azimuth <= azimuth && azimuth < to.azimuth,
            None => from.azimuth <= azimuth || azimuth < first.azimuth,
        }
    }

    /// The straight piece at an azimuth: at a corner the one that starts there (at a wall, past the wall).
    #[must_use]
    pub fn segment_at(&self, azimuth: Angle) -> Segment<'_> {
        self.segment(self.index_at(azimuth.wrapped()))
    }

    /// What stands at an azimuth, given the piece that holds it: at a wall the higher side.
    fn part(&self, index: usize, azimuth: Angle) -> (Angle, Option<&str>) {
        let segment = self.segment(index);
        let count = self.vertices.len();
        // An azimuth before the first vertex is a turn further on for the piece that closes over north.
        let counted = if azimuth < segment.from_azimuth {
            azimuth + Angle::from_radians(TAU)
        } else {
            azimuth
        };
        if counted == segment.from_azimuth && count >= 2 {
            let before = self.segment((index + count - 1) % count);
            if before.is_wall() && before.from_altitude > segment.from_altitude {
                // The wall goes down: its upper edge belongs to the piece that ends at it.
                let upper = self.segment((index + count - 2) % count);
                return (before.from_altitude, upper.name);
            }
        }
        (segment.altitude_at(counted), segment.name)
    }

    /// Apparent altitude of the skyline at an azimuth; at a wall the higher side. O(log n).
    #[must_use]
    pub fn altitude_at(&self, azimuth: Angle) -> Angle {
        let azimuth = azimuth.wrapped();
        self.part(self.index_at(azimuth), azimuth).0
    }

    /// The name of what stands at an azimuth, at a wall on its higher side. A name holds for the piece that starts at its
    /// point; where only the end of a piece is named, for that.
    #[must_use]
    pub fn part_at(&self, azimuth: Angle) -> Option<&str> {
        let azimuth = azimuth.wrapped();
        self.part(self.index_at(azimuth), azimuth).1
    }

    /// For many azimuths that follow each other: as [`Skyline::altitude_at`], in constant time while they move little.
    #[must_use]
    pub fn cursor(&self) -> Cursor<'_> {
        Cursor {
            skyline: self,
            index: 0,
        }
    }

    /// The highest point, apparent altitude.
    #[must_use]
    pub fn max_altitude(&self) -> Angle {
        self.vertices
            .iter()
            .map(|vertex| vertex.altitude)
            .reduce(|a, b| if b > a { b } else { a })
            .unwrap_or(Angle::ZERO)
    }

    /// A rounder skyline: points put in between, at most `max_step` apart (0.05 degrees at least), along a cubic that passes
    /// through every vertex, bulges past none, and ends at walls.
    ///
    /// Steffen 1990, *A&A* 239, 443. Pieces that were straight between two vertices become several with the same name.
    #[must_use]
    pub fn smoothed(&self, max_step: Angle) -> Skyline {
        /// Finer than any survey of a skyline; keeps the number of points in bounds.
        const LEAST_STEP_DEG: f64 = 0.05;
        let step = max_step.degrees().max(LEAST_STEP_DEG);
        if self.vertices.len() < 2 {
            return self.clone();
        }
        let segments: Vec<Segment<'_>> = self.segments().collect();
        let count = segments.len();
        let mut vertices = Vec::new();
        // Those past north belong at the front.
        let mut past_north = VecDeque::new();
        for (index, (vertex, segment)) in self.vertices.iter().zip(&segments).enumerate() {
            vertices.push(vertex.clone());
            if segment.is_wall() {
                continue;
            }
            let width = segment.to_azimuth - segment.from_azimuth;
            // The neighbours, where no wall stands between.
            let neighbour = |at: usize| segments.get(at % count).filter(|s| !s.is_wall());
            let before = neighbour(index + count - 1);
            let after = neighbour(index + 1);
            let curve = Cubic::between(before, segment, after);
            let pieces = (width.degrees() / step).ceil().max(1.0) as usize;
            for piece in 1..pieces {
                let along = piece as f64 / pieces as f64;
                let azimuth = segment.from_azimuth + width * along;
                let inserted = Vertex {
                    azimuth: azimuth.wrapped(),
                    altitude: Angle::from_radians(curve.at(along)),
                    name: segment.name.map(str::to_owned),
                };
                if azimuth.radians() < TAU {
                    vertices.push(inserted);
                } else {
                    past_north.push_back(inserted);
                }
            }
        }
        past_north.extend(vertices);
        Skyline {
            vertices: past_north.into(),
        }
    }
}

/// A monotone cubic over one segment.
struct Cubic {
    from: f64,
    to: f64,
    /// Slopes at the ends, for the whole width.
    slope_from: f64,
    slope_to: f64,
}

impl Cubic {
    fn between(
        before: Option<&Segment<'_>>,
        here: &Segment<'_>,
        after: Option<&Segment<'_>>,
    ) -> Self {
        let width = |s: &Segment<'_>| (s.to_azimuth - s.from_azimuth).radians();
        let slope = |s: &Segment<'_>| (s.to_altitude - s.from_altitude).radians() / width(s);
        // Steffen's slope at a point between two pieces: that of the parabola through the three points, but no steeper than
        // twice the flatter piece, and level at a summit or in a hollow. At an end, the piece's own.
        let joint = |left: &Segment<'_>, right: &Segment<'_>| {
            let (a, b) = (slope(left), slope(right));
            if a * b <= 0.0 {
                return 0.0;
            }
            let parabola = (a * width(right) + b * width(left)) / (width(left) + width(right));
            let limit = 2.0 * a.abs().min(b.abs());
            parabola.clamp(-limit, limit)
        };
        let own = slope(here);
        Cubic {
            from: here.from_altitude.radians(),
            to: here.to_altitude.radians(),
            slope_from: before.map_or(own, |left| joint(left, here)) * width(here),
            slope_to: after.map_or(own, |right| joint(here, right)) * width(here),
        }
    }

    /// The value a part of the way along.
    fn at(&self, along: f64) -> f64 {
        let rest = 1.0 - along;
        self.from * rest * rest * (1.0 + 2.0 * along)
            + self.to * along * along * (3.0 - 2.0 * along)
            + self.slope_from * along * rest * rest
            - self.slope_to * along * along * rest
    }
}

/// Remembers where the last answer was found.
#[derive(Clone, Debug)]
pub struct Cursor<'a> {
    skyline: &'a Skyline,
    index: usize,
}

impl Cursor<'_> {
    /// As [`Skyline::altitude_at`].
    pub fn altitude_at(&mut self, azimuth: Angle) -> Angle {
        let azimuth = azimuth.wrapped();
        self.move_to(azimuth);
        self.skyline.part(self.index, azimuth).0
    }

    fn move_to(&mut self, azimuth: Angle) {
        let count = self.skyline.vertices.len().max(1);
        let near = [
            self.index,
            (self.index + 1) % count,
            (self.index + count - 1) % count,
        ];
        self.index = near
            .into_iter()
            .find(|index| self.skyline.holds(*index, azimuth))
            .unwrap_or_else(|| self.skyline.index_at(azimuth));
    }
}

/// Whether a line holds the names of the columns instead of numbers.
fn is_header(line: &str) -> bool {
    let mut fields = line
        .split(',')
        .map(|field| field.trim().to_ascii_lowercase());
    let mut named = |name: &str| {
        fields
            .next()
            .is_some_and(|field| field.strip_suffix("_deg").unwrap_or(&field) == name)
    };
    named("azimuth") && named("altitude")
}

/// Reads `azimuth,altitude` or `azimuth,altitude,name`; a name with a comma in it stands in double quotes, which are
/// doubled inside (RFC 4180).
fn point_from_line(place: PointPlace, line: &str) -> Result<SkylinePoint, SkylineError> {
    let mut fields = line.splitn(3, ',').map(str::trim);
    let (Some(azimuth), Some(altitude), name) = (fields.next(), fields.next(), fields.next())
    else {
        return Err(SkylineError::FieldCount { place, found: 1 });
    };
    let name = name.unwrap_or("");
    let quoted = name
        .strip_prefix('"')
        .and_then(|rest| rest.strip_suffix('"'));
    let name = match quoted {
        Some(inner) => inner.replace("\"\"", "\""),
        // Where decimals are written with a comma this is where it shows.
        None if name.contains(',') => {
            return Err(SkylineError::FieldCount {
                place,
                found: line.split(',').count(),
            });
        }
        None => name.to_owned(),
    };
    let number = |column: &'static str, text: &str| {
        text.parse::<f64>().map_err(|_| SkylineError::NotANumber {
            place,
            column,
            text: text.to_owned(),
        })
    };
    Ok(SkylinePoint {
        azimuth: number("azimuth", azimuth)?,
        altitude: number("altitude", altitude)?,
        name: (!name.is_empty()).then_some(name),
    })
}
