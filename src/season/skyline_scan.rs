//! Where a body on its way across the sky passes behind the skyline and comes out again.
//!
//! Angles are radians here, times days of TT. Between two samples the body leaves the straight line in (azimuth, altitude)
//! by a bounded amount; the part of the skyline it can meet in between is looked up, and the stretch is halved until it is
//! clear, blocked, or crosses one straight piece of the skyline once. So no notch and no wall is stepped over, however
//! briefly the body shows in it.

use std::convert::Infallible;
use std::f64::consts::{FRAC_PI_2, PI, TAU};

use super::search::root;
use super::site_tracks::{SiteTracks, Which};
use super::spans::TOLERANCE_DAYS;
use crate::sky::refraction::apparent_from_true;
use crate::sky::{Angle, Skyline};

/// A body at an instant.
#[derive(Clone, Copy, Debug)]
pub(super) struct Point {
    pub days: f64,
    pub true_altitude: f64,
    pub apparent_altitude: f64,
    /// 0 to 2 pi.
    pub azimuth: f64,
}

/// The subject at an instant.
pub(super) fn point(tracks: &SiteTracks, days: f64) -> Point {
    let standing = tracks.standing(Which::Subject, days);
    let altitude = standing.altitude();
    Point {
        days,
        true_altitude: altitude.radians(),
        apparent_altitude: apparent_from_true(altitude, &tracks.site().air).radians(),
        azimuth: standing.azimuth().radians(),
    }
}

/// A skyline made ready for many questions.
pub(super) struct SkylineScan<'a> {
    tracks: &'a SiteTracks,
    skyline: &'a Skyline,
    clearance: f64,
    highest: f64,
    lowest: f64,
    /// Bound of the second derivative of apparent by true altitude near the horizon, per radian.
    refraction_bend: f64,
    speed: f64,
}

/// What of the skyline lies within a range of azimuth.
struct Part {
    lowest: f64,
    highest: f64,
    /// Altitude per azimuth where it is one straight piece.
    slope: Option<f64>,
}

/// Above this altitude refraction hardly bends; below, the bound of the horizon is used.
const LOW_RADIANS: f64 = 15.0 * PI / 180.0;
/// Refraction keeps its value below this true altitude: a kink there.
const KINK_RADIANS: f64 = -PI / 180.0;
/// Nearer to zenith and nadir azimuth is not bounded.
const STEEPEST_RADIANS: f64 = 85.0 * PI / 180.0;

impl<'a> SkylineScan<'a> {
    pub(super) fn new(tracks: &'a SiteTracks, skyline: &'a Skyline, clearance: Angle) -> Self {
        let altitudes = || {
            skyline
                .vertices()
                .iter()
                .map(|vertex| vertex.altitude.radians())
        };
        let flat = skyline.vertices().is_empty();
        // Six times what Bennett's formula does in ordinary air (3.3 at -1 degree), and more where the air is denser.
        let air = &tracks.site().air;
        let lift = apparent_from_true(Angle::ZERO, air).degrees() * 60.0 / 28.0;
        SkylineScan {
            tracks,
            skyline,
            clearance: clearance.radians(),
            highest: if flat {
                0.0
            } else {
                altitudes().fold(-PI, f64::max)
            },
            lowest: if flat {
                0.0
            } else {
                altitudes().fold(PI, f64::min)
            },
            refraction_bend: 20.0 * lift.max(1.0) * lift.max(1.0),
            speed: tracks.subject_speed(),
        }
    }

    /// Height over the skyline with its clearance; not negative where the body is clear.
    pub(super) fn margin(&self, point: &Point) -> f64 {
        let skyline = self.skyline.altitude_at(Angle::from_radians(point.azimuth));
        point.apparent_altitude - skyline.radians() - self.clearance
    }

    /// Where the body passes from clear to blocked or back between points that follow each other.
    pub(super) fn changes(&self, points: &[Point]) -> Vec<f64> {
        let mut found = Vec::new();
        let mut margins = points.iter().map(|point| self.margin(point));
        let Some(mut before) = margins.next() else {
            return found;
        };
        for (pair, after) in points.windows(2).zip(margins) {
            if let [a, b] = pair {
                self.between((a, before), (b, after), &mut found);
            }
            before = after;
        }
        found
    }

    fn between(
        &self,
        (a, margin_a): (&Point, f64),
        (b, margin_b): (&Point, f64),
        found: &mut Vec<f64>,
    ) {
        let length = b.days - a.days;
        let differ = (margin_a < 0.0) != (margin_b < 0.0);
        let turned = self.speed * length;
        let top = a.true_altitude.abs().max(b.true_altitude.abs()) + 0.5 * turned;
        let bottom = a.true_altitude.min(b.true_altitude) - 0.5 * turned;
        let kinked = bottom <= KINK_RADIANS
            && a.true_altitude.max(b.true_altitude) + 0.5 * turned >= KINK_RADIANS;
        // Accelerations of a point that moves on a sphere: altitude by at most v^2 (1 + tan h), azimuth by v^2 (1 + tan h)/cos h.
        let level = top < STEEPEST_RADIANS;
        let acceleration = self.speed * self.speed;
        let (swing, secant) = if level {
            let (sin, cos) = libm::sincos(top);
            (acceleration * (1.0 + sin / cos), 1.0 / cos)
        } else {
            (0.0, 0.0)
        };
        let bend = if bottom < LOW_RADIANS {
            self.refraction_bend
        } else {
            0.2
        };
        let altitude_bound = swing + bend * acceleration;
        let eighth = length * length / 8.0;
        let (low, high) = {
            let (p, q) = (a.apparent_altitude, b.apparent_altitude);
            if level && !kinked && altitude_bound * eighth < 0.5 * turned {
                let off = altitude_bound * eighth;
                (p.min(q) - off, p.max(q) + off)
            } else {
                // Refraction only slows what moves near the horizon.
                let middle = 0.5 * (p + q);
                (middle - 0.5 * turned, middle + 0.5 * turned)
            }
        };
        if !differ && (low >= self.highest + self.clearance || high < self.lowest + self.clearance)
        {
            return;
        }
        let short = length <= TOLERANCE_DAYS;
        if !short && level {
            let off = swing * secant * eighth;
            let across = Angle::from_radians(b.azimuth - a.azimuth)
                .signed()
                .radians();
            let from = a.azimuth + across.min(0.0) - off;
            let to = a.azimuth + across.max(0.0) + off;
            if to - from < PI {
                let part = self.part(from, to);
                let clear = low >= part.highest + self.clearance;
                let blocked = high < part.lowest + self.clearance;
                if !differ && (clear || blocked) {
                    return;
                }
                if let Some(slope) = part.slope
                    && !kinked
                {
                    let bend = (altitude_bound + slope.abs() * swing * secant) * eighth;
                    if !differ && margin_a.abs().min(margin_b.abs()) > bend {
                        return;
                    }
                    if differ && (margin_b - margin_a).abs() > 4.0 * bend {
                        let margin =
                            |days: f64| Ok::<_, Infallible>(self.margin(&point(self.tracks, days)));
                        let ends = ((a.days, margin_a), (b.days, margin_b));
                        let Ok(at) = root(ends.0, ends.1, TOLERANCE_DAYS, margin);
                        found.push(at);
                        return;
                    }
                }
            }
        }
        if short {
            if differ {
                found.push(0.5 * (a.days + b.days));
            }
            return;
        }
        let middle = point(self.tracks, 0.5 * (a.days + b.days));
        let margin = self.margin(&middle);
        self.between((a, margin_a), (&middle, margin), found);
        self.between((&middle, margin), (b, margin_b), found);
    }

    /// The skyline from one azimuth to another not less, at most half a turn on; either may lie outside 0 to 2 pi.
    fn part(&self, from: f64, to: f64) -> Part {
        let vertices = self.skyline.vertices();
        let wrapped = Angle::from_radians(from).wrapped();
        let segment = self.skyline.segment_at(wrapped);
        let width = to - from;
        let start = self.skyline.altitude_at(wrapped).radians();
        let end = self.skyline.altitude_at(Angle::from_radians(to)).radians();
        let mut part = Part {
            lowest: start.min(end),
            highest: start.max(end),
            slope: None,
        };
        // The lower side of a wall at the very ends is looked at too.
        let first = vertices.partition_point(|vertex| vertex.azimuth < wrapped);
        let mut straight = true;
        for step in 0..vertices.len() {
            let Some(vertex) = vertices.get((first + step) % vertices.len()) else {
                break;
            };
            let turn = if first + step >= vertices.len() {
                TAU
            } else {
                0.0
            };
            if vertex.azimuth.radians() + turn - wrapped.radians() > width {
                break;
            }
            straight = false;
            let altitude = vertex.altitude.radians();
            part.lowest = part.lowest.min(altitude);
            part.highest = part.highest.max(altitude);
        }
        if straight {
            let run = (segment.to_azimuth - segment.from_azimuth).radians();
            let rise = (segment.to_altitude - segment.from_altitude).radians();
            part.slope = Some(if run > 0.0 { rise / run } else { 0.0 });
        }
        part
    }

    /// How fast the body moves away from the skyline (along the normal of the piece it stands over) just before or after an
    /// instant, radians a day, and in which azimuth.
    pub(super) fn departure(&self, days: f64, into: f64) -> f64 {
        let here = point(self.tracks, days);
        let there = point(self.tracks, days + into);
        let up = (there.apparent_altitude - here.apparent_altitude).abs() / into.abs();
        let cos = libm::cos(here.true_altitude.clamp(-FRAC_PI_2, FRAC_PI_2));
        let across = Angle::from_radians(there.azimuth - here.azimuth)
            .signed()
            .radians()
            * cos
            / into.abs();
        let azimuth = Angle::from_radians(here.azimuth);
        let width = Angle::from_degrees(0.02);
        let ahead = self.skyline.altitude_at(azimuth + width);
        let behind = self.skyline.altitude_at(azimuth - width);
        // Slope on the sky; a wall gives a steep one, along whose normal only the motion in azimuth counts.
        let slope = (ahead - behind).radians() / (2.0 * width.radians() * cos.max(1e-3));
        let signed_up = up.copysign(there.apparent_altitude - here.apparent_altitude);
        (signed_up - slope * across).abs() / (1.0 + slope * slope).sqrt()
    }

    /// The name of the part that blocks the body at an instant.
    pub(super) fn part_name(&self, days: f64) -> Option<&'a str> {
        let here = point(self.tracks, days);
        self.skyline.part_at(Angle::from_radians(here.azimuth))
    }
}
