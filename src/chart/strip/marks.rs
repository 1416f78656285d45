//! Small marks for what happens on a track, alike in weight, and the words that go with them.

use crate::chart::geometry::Point;
use crate::chart::palette::Role;
use crate::chart::scene::{Layer, MarkId, Paint, Scene, Shape, Stroke};
use crate::season::{EventKind, EventValue};

/// Half the height of a mark, points.
pub(in crate::chart) const RADIUS: f64 = 3.7;

/// A mark; where several events stand at one place, the first in this order stands for all.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(in crate::chart) enum Glyph {
    Station,
    Opposition,
    Conjunction,
    Elongation,
    Nearest,
    Brightest,
}

impl Glyph {
    pub const ALL: [Glyph; 6] = [
        Glyph::Station,
        Glyph::Opposition,
        Glyph::Conjunction,
        Glyph::Elongation,
        Glyph::Nearest,
        Glyph::Brightest,
    ];

    /// What it means, for the key.
    pub const fn meaning(self) -> &'static str {
        match self {
            Glyph::Station => "station, the planet turns",
            Glyph::Opposition => "opposition",
            Glyph::Conjunction => "conjunction",
            Glyph::Elongation => "greatest elongation",
            Glyph::Nearest => "nearest",
            Glyph::Brightest => "brightest",
        }
    }
}

/// The mark and the words of an event on the strip; `None` for those that are told in tables only.
pub(in crate::chart) const fn told(kind: EventKind) -> Option<(Glyph, &'static str)> {
    Some(match kind {
        EventKind::StationRetrograde => (Glyph::Station, "turns back"),
        EventKind::StationDirect => (Glyph::Station, "turns forward"),
        EventKind::Opposition => (Glyph::Opposition, "opposition"),
        EventKind::Conjunction => (Glyph::Conjunction, "conjunction"),
        EventKind::InferiorConjunction => (Glyph::Conjunction, "inferior conjunction"),
        EventKind::SuperiorConjunction => (Glyph::Conjunction, "superior conjunction"),
        EventKind::GreatestElongationEast => (Glyph::Elongation, "greatest elongation east"),
        EventKind::GreatestElongationWest => (Glyph::Elongation, "greatest elongation west"),
        EventKind::ClosestApproach => (Glyph::Nearest, "nearest"),
        EventKind::GreatestBrightness => (Glyph::Brightest, "brightest"),
        EventKind::QuadratureEast
        | EventKind::QuadratureWest
        | EventKind::RaStationRetrograde
        | EventKind::RaStationDirect
        | EventKind::ClosestApproachLightTime
        | EventKind::Perihelion
        | EventKind::ConstellationEntry
        | EventKind::CloseApproach => return None,
    })
}

/// The number that goes with an event's words; longitudes are read off the edge.
pub(super) fn value(value: &EventValue) -> Option<String> {
    match value {
        EventValue::DistanceAu(distance) => Some(format!("{distance:.3} au")),
        EventValue::Magnitude(magnitude) => Some(signed(*magnitude, 1)),
        EventValue::Elongation(elongation) if elongation.degrees() < 60.0 => {
            Some(format!("{:.1}°", elongation.degrees()))
        }
        _ => None,
    }
}

/// A number with a true minus sign.
pub(in crate::chart) fn signed(value: f64, decimals: usize) -> String {
    let plain = format!("{:.decimals$}", value.abs());
    let is_zero = plain.chars().all(|figure| matches!(figure, '0' | '.'));
    match value < 0.0 && !is_zero {
        true => format!("\u{2212}{plain}"),
        false if is_zero => plain,
        false => format!("+{plain}"),
    }
}

/// Draws a mark around a point: an outline in ink over the plate.
pub(in crate::chart) fn draw(scene: &mut Scene, id: MarkId, layer: Layer, glyph: Glyph, at: Point) {
    let edge = Stroke::of(Role::Ink, 1.05);
    let polygon = |corners: &[(f64, f64)]| Shape::Area {
        rings: vec![
            corners
                .iter()
                .map(|&(x, y)| at.moved(x * RADIUS, y * RADIUS))
                .collect(),
        ],
        fill: Paint::of(Role::Plate),
        edge: Some(edge),
    };
    let disc = |radius: f64, role: Role| Shape::Disc {
        centre: at,
        radius: radius * RADIUS,
        fill: Paint::of(role),
    };
    let ring = Shape::Ring {
        centre: at,
        radius: 0.9 * RADIUS,
        stroke: edge,
    };
    match glyph {
        Glyph::Station => {
            scene.add(id, layer, disc(0.9, Role::Plate));
            scene.add(id, layer, ring);
        }
        Glyph::Opposition => {
            scene.add(
                id,
                layer,
                polygon(&[(0.0, -1.15), (1.15, 0.0), (0.0, 1.15), (-1.15, 0.0)]),
            );
        }
        Glyph::Conjunction => {
            scene.add(id, layer, disc(0.9, Role::Plate));
            scene.add(id, layer, ring);
            let bar = vec![at.moved(-0.9 * RADIUS, 0.0), at.moved(0.9 * RADIUS, 0.0)];
            scene.add(
                id,
                layer,
                Shape::Line {
                    points: bar,
                    stroke: edge,
                },
            );
        }
        Glyph::Elongation => {
            scene.add(
                id,
                layer,
                polygon(&[(-0.85, -0.85), (0.85, -0.85), (0.85, 0.85), (-0.85, 0.85)]),
            );
        }
        Glyph::Nearest => {
            scene.add(
                id,
                layer,
                polygon(&[(-1.05, -0.8), (1.05, -0.8), (0.0, 1.05)]),
            );
        }
        Glyph::Brightest => {
            scene.add(
                id,
                layer,
                polygon(&[
                    (0.0, -1.25),
                    (0.33, -0.33),
                    (1.25, 0.0),
                    (0.33, 0.33),
                    (0.0, 1.25),
                    (-0.33, 0.33),
                    (-1.25, 0.0),
                    (-0.33, -0.33),
                ]),
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn signs_are_true_and_zero_has_none() {
        assert_eq!(signed(-1.281, 1), "\u{2212}1.3");
        assert_eq!(signed(0.58, 1), "+0.6");
        assert_eq!(signed(-0.04, 1), "0.0");
    }
}
