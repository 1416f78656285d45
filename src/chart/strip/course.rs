//! A body's path between its samples: places, brightness and sense of motion at any instant of the season.

use crate::season::{Season, Track};
use crate::sky::{Body, Tt};

use super::layout;

/// Longest piece of a drawn path, points: shorter ones cannot be told from a curve.
const PIECE: f64 = 2.4;
/// Pieces between two samples, at most.
const MOST_PIECES: f64 = 24.0;

/// A place on a path.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Spot {
    pub days: f64,
    /// Degrees, running on beyond 360.
    pub longitude: f64,
    pub latitude: f64,
    pub magnitude: Option<f64>,
    /// Degrees a day, negative while retrograde.
    pub rate: f64,
    /// The sample nearest in time.
    pub index: usize,
}

/// A path through a season, in its frame.
#[derive(Clone, Debug)]
pub(super) struct Course {
    pub body: Body,
    samples: Vec<Spot>,
}

impl Course {
    pub fn new(track: &Track, season: &Season) -> Self {
        let samples = track
            .points
            .iter()
            .zip(layout::unrolled(track, season))
            .enumerate()
            .filter(|(_, (point, place))| {
                point.instant.days().is_finite() && place.0.is_finite() && place.1.is_finite()
            })
            .map(|(index, (point, (longitude, latitude)))| Spot {
                days: point.instant.days(),
                longitude,
                latitude,
                magnitude: point.magnitude.filter(|magnitude| magnitude.is_finite()),
                rate: point.longitude_rate_per_day.degrees(),
                index,
            })
            .collect();
        Course {
            body: track.body,
            samples,
        }
    }

    pub fn samples(&self) -> &[Spot] {
        &self.samples
    }

    /// The place at an instant within the path; `None` before and after.
    pub fn at(&self, instant: Tt) -> Option<Spot> {
        let days = instant.days();
        let after = self.samples.partition_point(|spot| spot.days <= days);
        if after == self.samples.len() {
            return self
                .samples
                .last()
                .copied()
                .filter(|last| last.days == days);
        }
        let before = after.checked_sub(1)?;
        let (from, to) = (self.samples.get(before)?, self.samples.get(after)?);
        Some(self.inside(before, (days - from.days) / (to.days - from.days)))
    }

    /// The place at `part` (0 to 1) of the way from one sample to the next: a cubic through the samples with the
    /// slope of their neighbours (Catmull and Rom 1974), as samples stand at even steps of time.
    fn inside(&self, before: usize, part: f64) -> Spot {
        let last = self.samples.len() - 1;
        let spot = |index: usize| self.samples[index.min(last)];
        let (b, c) = (spot(before), spot(before + 1));
        let a = before.checked_sub(1).map(spot);
        let d = (before + 2 <= last).then(|| spot(before + 2));
        let cubic = |value: fn(&Spot) -> f64| {
            let (q, r) = (value(&b), value(&c));
            // Straight on beyond the ends.
            let p = a.as_ref().map_or(2.0 * q - r, value);
            let s = d.as_ref().map_or(2.0 * r - q, value);
            let (m, n) = ((r - p) / 2.0, (s - q) / 2.0);
            let (t, t2) = (part, part * part);
            let t3 = t2 * t;
            (2.0 * t3 - 3.0 * t2 + 1.0) * q
                + (t3 - 2.0 * t2 + t) * m
                + (3.0 * t2 - 2.0 * t3) * r
                + (t3 - t2) * n
        };
        let mix = |from: f64, to: f64| from + (to - from) * part;
        Spot {
            days: mix(b.days, c.days),
            longitude: cubic(|spot| spot.longitude),
            latitude: cubic(|spot| spot.latitude),
            magnitude: match (b.magnitude, c.magnitude) {
                (Some(from), Some(to)) => Some(mix(from, to)),
                _ => None,
            },
            rate: mix(b.rate, c.rate),
            index: if part < 0.5 { b.index } else { c.index },
        }
    }

    /// The whole path in pieces short enough to look curved at `scale` points a degree.
    pub fn dense(&self, scale: f64) -> Vec<Spot> {
        let mut spots = Vec::new();
        for (index, pair) in self.samples.windows(2).enumerate() {
            let &[from, to] = pair else { continue };
            let length = libm::hypot(to.longitude - from.longitude, to.latitude - from.latitude);
            let pieces = (length * scale / PIECE).ceil().clamp(1.0, MOST_PIECES);
            let mut piece = 0.0;
            while piece < pieces {
                spots.push(self.inside(index, piece / pieces));
                piece += 1.0;
            }
        }
        spots.extend(self.samples.last());
        spots
    }
}
