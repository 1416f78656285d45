//! Where a season lies on the sheet: one row of sky, or several below each other when the path is long.
//!
//! Ecliptic longitude runs along a row, latitude up, both at the same number of points a degree; axes of the season's
//! frame. A row is at most 360 degrees long and may run across longitude 0.

use crate::chart::geometry::{Point, Rect};
use crate::season::{Season, Track};
use crate::sky::{Angle, Vec3};

use super::StripView;

/// Sky kept on either side of the path, degrees.
const SIDE_MARGIN_DEGREES: f64 = 3.5;
/// The least length of a strip, degrees: an outer planet's loop with its neighbourhood.
const LEAST_SPAN_DEGREES: f64 = 16.0;
/// Room kept above and below the path for labels, points.
const LABEL_ROOM: f64 = 44.0;
/// What two rows share at a break, degrees.
const OVERLAP_DEGREES: f64 = 4.0;
/// Space between rows for the numbers along the edge, points.
const ROW_GAP: f64 = 27.0;
/// Rows at most.
const MOST_ROWS: usize = 5;
/// A row lower than this is not worth having, points.
const LEAST_ROW_HEIGHT: f64 = 70.0;
/// What another row must gain in scale to be worth it.
const ROW_GAIN: f64 = 1.15;
/// A strip up to this length stays in one row, degrees.
const ONE_ROW_DEGREES: f64 = 60.0;

/// A piece of sky shown on the strip.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StripRow {
    /// On the sheet, points.
    pub frame: Rect,
    /// Ecliptic longitude of its middle, degrees.
    pub longitude: f64,
    /// Ecliptic latitude of its middle, degrees.
    pub latitude: f64,
    /// Points a degree.
    pub scale: f64,
    /// Whether longitude grows to the left.
    pub east_left: bool,
    /// Degrees of longitude from the middle within which this row, not its neighbour, carries the labels.
    own: (f64, f64),
}

impl StripRow {
    /// Degrees east of the row's middle, -180 to 180.
    fn east(&self, longitude_degrees: f64) -> f64 {
        Angle::from_degrees(longitude_degrees - self.longitude)
            .signed()
            .degrees()
    }

    /// Where a place lies on the sheet; it may be outside the frame.
    #[must_use]
    pub fn point(&self, longitude_degrees: f64, latitude_degrees: f64) -> Point {
        let east = self.east(longitude_degrees) * self.scale;
        let north = (latitude_degrees - self.latitude) * self.scale;
        let middle = self.frame.centre();
        // Turned round is half a turn, not a mirror image: with east to the right south is up.
        let turn = if self.east_left { -1.0 } else { 1.0 };
        middle.moved(turn * east, turn * north)
    }

    /// Where an ecliptic direction lies on the sheet; it may be outside the frame.
    #[must_use]
    pub fn point_of(&self, ecliptic: Vec3) -> Point {
        self.point(
            ecliptic.longitude().degrees(),
            ecliptic.latitude().degrees(),
        )
    }

    /// The place at a point of the sheet: longitude 0 to 360 and latitude, degrees.
    #[must_use]
    pub fn place(&self, point: Point) -> (f64, f64) {
        let from = point.minus(self.frame.centre());
        let turn = if self.east_left { -1.0 } else { 1.0 };
        let east = turn * from.x / self.scale;
        (
            Angle::from_degrees(self.longitude + east)
                .wrapped()
                .degrees(),
            self.latitude + turn * from.y / self.scale,
        )
    }

    /// Whether labels of this longitude belong to this row.
    #[must_use]
    pub fn owns(&self, longitude_degrees: f64) -> bool {
        let east = self.east(longitude_degrees);
        self.own.0 <= east && east < self.own.1
    }

    /// Degrees of longitude from the middle to either end.
    #[must_use]
    pub fn half_length(&self) -> f64 {
        self.frame.width() / self.scale / 2.0
    }

    /// Degrees of latitude from the middle to either edge.
    #[must_use]
    pub fn half_height(&self) -> f64 {
        self.frame.height() / self.scale / 2.0
    }
}

/// The rows of a strip, in the order of longitude, from the top.
#[derive(Clone, Debug, PartialEq)]
pub struct StripLayout {
    pub rows: Vec<StripRow>,
}

impl StripLayout {
    /// Finds the rows that show the season's path as large as the area allows, or the window asked for.
    /// The area is in points and includes the room for the numbers along the edges.
    #[must_use]
    pub fn new(season: &Season, view: &StripView, area: Rect) -> Self {
        let edge = Rect::new(
            area.left + EDGE_LEFT,
            area.top + EDGE_TOP,
            area.right - EDGE_RIGHT,
            area.bottom - EDGE_BOTTOM,
        );
        if let Some(window) = view.window {
            let across = if window.degrees_across.is_finite() {
                window.degrees_across.clamp(1.0, 360.0)
            } else {
                LEAST_SPAN_DEGREES
            };
            let row = StripRow {
                frame: edge,
                longitude: sound(window.longitude.wrapped().degrees()),
                latitude: sound(window.latitude.degrees()).clamp(-90.0, 90.0),
                scale: edge.width() / across,
                east_left: view.east_left,
                own: (-181.0, 181.0),
            };
            return StripLayout { rows: vec![row] };
        }
        let extent = Extent::of(season);
        let plan = (1..=extent.most_rows())
            .filter(|&rows| rows == 1 || row_height(rows, &edge) >= LEAST_ROW_HEIGHT)
            .map(|rows| Plan::new(rows, &extent, &edge))
            .reduce(|best, next| {
                if next.scale > best.scale * ROW_GAIN {
                    next
                } else {
                    best
                }
            });
        let Some(plan) = plan else {
            return StripLayout { rows: Vec::new() };
        };
        let count = plan.starts.len();
        let height = row_height(count, &edge);
        let length = edge.width() / plan.scale;
        // A break's middle divides the labels of two rows.
        let middles: Vec<f64> = plan
            .starts
            .iter()
            .map(|start| start + length / 2.0)
            .collect();
        let borders: Vec<f64> = plan
            .starts
            .windows(2)
            .map(|pair| match *pair {
                [before, after] => {
                    let (from, to) = (after, before + length);
                    // A loop that straddles the break belongs whole to the row that holds it whole.
                    extent
                        .loops
                        .iter()
                        .find(|&&(low, high)| low < to && high > to && low >= from)
                        .map_or((from + to) / 2.0, |&(low, _)| (from + low) / 2.0)
                }
                _ => 0.0,
            })
            .collect();
        // A hair more than the frame, so that its very edge belongs to the row.
        let end = length / 2.0 + 1e-6;
        let rows = middles
            .iter()
            .enumerate()
            .map(|(index, &middle)| {
                let top = edge.top + (height + ROW_GAP) * index as f64;
                let before = index.checked_sub(1).and_then(|before| borders.get(before));
                StripRow {
                    frame: Rect::new(edge.left, top, edge.right, top + height),
                    longitude: Angle::from_degrees(middle).wrapped().degrees(),
                    latitude: extent.middle_latitude(height / plan.scale / 2.0),
                    scale: plan.scale,
                    east_left: view.east_left,
                    own: (
                        before.map_or(-end, |border| border - middle),
                        borders.get(index).map_or(end, |border| border - middle),
                    ),
                }
            })
            .collect();
        StripLayout { rows }
    }

    /// The row whose frame holds a point.
    #[must_use]
    pub fn row_at(&self, point: Point) -> Option<&StripRow> {
        self.rows.iter().find(|row| row.frame.contains(point))
    }
}

fn sound(degrees: f64) -> f64 {
    if degrees.is_finite() { degrees } else { 0.0 }
}

const EDGE_LEFT: f64 = 26.0;
const EDGE_RIGHT: f64 = 26.0;
const EDGE_TOP: f64 = 6.0;
const EDGE_BOTTOM: f64 = 17.0;

fn row_height(rows: usize, edge: &Rect) -> f64 {
    let rows = rows.max(1) as f64;
    (edge.height() - ROW_GAP * (rows - 1.0)) / rows
}

/// What has to be on the strip, in degrees; longitudes run on beyond 360.
struct Extent {
    from: f64,
    to: f64,
    south: f64,
    north: f64,
    /// Longitudes of the retrograde stretches, lowest and highest.
    loops: Vec<(f64, f64)>,
}

impl Extent {
    fn of(season: &Season) -> Self {
        let places = unrolled(&season.track, season);
        let mut extent = Extent {
            from: f64::INFINITY,
            to: f64::NEG_INFINITY,
            south: f64::INFINITY,
            north: f64::NEG_INFINITY,
            loops: Vec::new(),
        };
        let mut turning = false;
        for (point, &(longitude, latitude)) in season.track.points.iter().zip(&places) {
            extent.from = extent.from.min(longitude);
            extent.to = extent.to.max(longitude);
            extent.south = extent.south.min(latitude);
            extent.north = extent.north.max(latitude);
            let back = point.longitude_rate_per_day < Angle::ZERO;
            match extent.loops.last_mut() {
                Some(last) if back && turning => {
                    *last = (last.0.min(longitude), last.1.max(longitude));
                }
                _ if back => extent.loops.push((longitude, longitude)),
                _ => {}
            }
            turning = back;
        }
        if extent.from > extent.to {
            (extent.from, extent.to) = (-LEAST_SPAN_DEGREES / 2.0, LEAST_SPAN_DEGREES / 2.0);
            (extent.south, extent.north) = (0.0, 0.0);
        }
        let length =
            (extent.to - extent.from + 2.0 * SIDE_MARGIN_DEGREES).clamp(LEAST_SPAN_DEGREES, 360.0);
        let middle = (extent.from + extent.to) / 2.0;
        (extent.from, extent.to) = (middle - length / 2.0, middle + length / 2.0);
        extent
    }

    const fn most_rows(&self) -> usize {
        if self.to - self.from <= ONE_ROW_DEGREES {
            1
        } else {
            MOST_ROWS
        }
    }

    /// The middle of the path, moved so far that the ecliptic stays on the row.
    fn middle_latitude(&self, half_height: f64) -> f64 {
        let middle = (self.south + self.north) / 2.0;
        let most = half_height * 0.8;
        middle.clamp(-most, most)
    }
}

/// Ecliptic longitude and latitude of a track's samples in the season's frame, degrees, longitude without jumps.
pub(super) fn unrolled(track: &Track, season: &Season) -> Vec<(f64, f64)> {
    let mut last: Option<f64> = None;
    track
        .points
        .iter()
        .map(|point| {
            let place = season.frame.ecliptic_from_icrs * point.direction;
            let longitude = place.longitude();
            let degrees = last.map_or(longitude.degrees(), |last| {
                last + (longitude - Angle::from_degrees(last)).signed().degrees()
            });
            if degrees.is_finite() {
                last = Some(degrees);
            }
            (degrees, place.latitude().degrees())
        })
        .collect()
}

/// A number of rows with the scale it allows and where the rows begin, degrees.
struct Plan {
    scale: f64,
    starts: Vec<f64>,
}

impl Plan {
    fn new(rows: usize, extent: &Extent, edge: &Rect) -> Self {
        let room = (row_height(rows, edge) - 2.0 * LABEL_ROOM).max(10.0);
        // The ecliptic has to fit too, the path's labels need no room on its side.
        let high = (extent.north - extent.south).max(0.5);
        let off = extent.north.abs().max(extent.south.abs());
        let by_height = (room / high).min((room + LABEL_ROOM) / off.max(high));
        let whole = extent.to - extent.from;
        // The shortest row length with which that many rows cover the path.
        let (mut short, mut long) = (whole / rows as f64, whole);
        for _ in 0..50 {
            let middle = (short + long) / 2.0;
            if starts(extent, middle).len() <= rows {
                long = middle;
            } else {
                short = middle;
            }
        }
        // No row shows more than the whole circle.
        let scale = (edge.width() / long)
            .min(by_height)
            .max(edge.width() / 360.0);
        let length = edge.width() / scale;
        let mut starts = starts(extent, length);
        let end = starts.last().map_or(extent.to, |last| last + length);
        let spare = (end - extent.to).max(0.0) / 2.0;
        for start in &mut starts {
            *start -= spare;
        }
        Plan { scale, starts }
    }
}

/// Where rows of that length begin so as to cover the extent, no loop cut where it can be helped.
fn starts(extent: &Extent, length: f64) -> Vec<f64> {
    let mut starts = vec![extent.from];
    let mut last = extent.from;
    while last + length < extent.to - 1e-9 && starts.len() <= MOST_ROWS {
        let end = last + length;
        let plain = end - OVERLAP_DEGREES.min(length / 4.0);
        let next = extent
            .loops
            .iter()
            .filter(|&&(low, high)| low < end && high + 1.0 > end)
            .map(|&(low, _)| low - OVERLAP_DEGREES)
            .fold(plain, f64::min);
        last = if next > last + length / 4.0 {
            next
        } else {
            plain
        };
        starts.push(last);
    }
    starts
}
