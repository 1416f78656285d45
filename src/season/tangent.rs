//! The tangent plane, and a rectangle on it: what a rectilinear lens makes of the sky.
//!
//! A direction v falls at (v.x / v.c, v.y / v.c) for the centre c and two axes x, y of the plane: in the units of the
//! tangent, so that the focal length times it is the place on the sensor. With x east and y north these are the standard
//! coordinates xi = cos d sin(a-a0)/D, eta = (cos d0 sin d - sin d0 cos d cos(a-a0))/D, D = sin d0 sin d + cos d0 cos d
//! cos(a-a0) of astrometry (Green 1985, *Spherical Astronomy*, ch. 13; from memory). Vectors throughout: poles and the
//! passage from 24h to 0h need no care. Great circles are straight lines on the plane.

use super::lens::{Lens, Sensor};
use crate::sky::place::Horizontal;
use crate::sky::{Angle, Vec3};

/// Cosine of the angle from the centre at which the plane ends, 6 arcseconds short of a right angle.
const LEAST_COSINE: f64 = 3e-5;

/// A point on the plane: to the right and up, in units of the focal length.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct PlanePoint {
    pub x: f64,
    pub y: f64,
}

impl PlanePoint {
    /// The same point on axes turned counter-clockwise.
    #[must_use]
    pub(super) fn on_turned_axes(self, (sin, cos): (f64, f64)) -> Self {
        PlanePoint {
            x: cos * self.x + sin * self.y,
            y: cos * self.y - sin * self.x,
        }
    }
}

/// A plane that touches the sphere at its centre, with two axes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TangentPlane {
    centre: Vec3,
    x_axis: Vec3,
    y_axis: Vec3,
}

/// East and north at a direction. At a pole, as everywhere on the meridian of longitude 0.
fn east_and_north(centre: Vec3) -> (Vec3, Vec3) {
    let (sin, cos) = centre.longitude().sin_cos();
    let east = Vec3::new(-sin, cos, 0.0);
    (east, centre.cross(east))
}

impl TangentPlane {
    /// Standard coordinates: x east, y north, as maps of positions have them. `centre` on equatorial axes, of any length
    /// but zero.
    #[must_use]
    pub fn standard(centre: Vec3) -> Self {
        let centre = centre.unit();
        let (x_axis, y_axis) = east_and_north(centre);
        TangentPlane {
            centre,
            x_axis,
            y_axis,
        }
    }

    /// A picture of the sky: y up, x to the right, which is west when north is up. `tilt` is the position angle of the
    /// upward direction, from celestial north through east.
    #[must_use]
    pub fn of_sky(centre: Vec3, tilt: Angle) -> Self {
        let centre = centre.unit();
        let (east, north) = east_and_north(centre);
        let (sin, cos) = tilt.sin_cos();
        let y_axis = north * cos + east * sin;
        TangentPlane {
            centre,
            x_axis: centre.cross(y_axis),
            y_axis,
        }
    }

    /// A picture over the ground; directions come from [`ground_vector`]. `roll` is how far the upward direction of the
    /// picture leans to the left of the zenith.
    #[must_use]
    pub fn of_ground(aim: Horizontal, roll: Angle) -> Self {
        let centre = ground_vector(aim);
        let (rightward, upward) = east_and_north(centre);
        let (sin, cos) = roll.sin_cos();
        TangentPlane {
            centre,
            x_axis: rightward * cos + upward * sin,
            y_axis: upward * cos - rightward * sin,
        }
    }

    /// Unit vector to the point of contact.
    #[must_use]
    pub const fn centre(&self) -> Vec3 {
        self.centre
    }

    /// Position angle of the y axis, from the north of the vectors' own axes through east, above -180 up to 180 degrees.
    #[must_use]
    pub fn position_angle(&self) -> Angle {
        let (east, north) = east_and_north(self.centre);
        Angle::from_radians(libm::atan2(self.y_axis.dot(east), self.y_axis.dot(north))).signed()
    }

    /// Where a direction falls; `None` from a right angle off the centre (less 6") onward, and for what is no direction.
    #[must_use]
    pub fn project(&self, direction: Vec3) -> Option<PlanePoint> {
        let depth = direction.dot(self.centre);
        (depth > LEAST_COSINE * direction.norm()).then(|| PlanePoint {
            x: direction.dot(self.x_axis) / depth,
            y: direction.dot(self.y_axis) / depth,
        })
    }

    /// Unit vector to what falls on a point.
    #[must_use]
    pub fn direction(&self, point: PlanePoint) -> Vec3 {
        (self.centre + self.x_axis * point.x + self.y_axis * point.y).unit()
    }

    /// Components along x, y and the centre.
    fn components(&self, direction: Vec3) -> (f64, f64, f64) {
        (
            direction.dot(self.x_axis),
            direction.dot(self.y_axis),
            direction.dot(self.centre),
        )
    }

    /// Angles of a direction to the right, along the great circle of the x axis, and up from that circle.
    pub(super) fn right_and_up(&self, direction: Vec3) -> (Angle, Angle) {
        let (x, y, depth) = self.components(direction);
        (
            Angle::from_radians(libm::atan2(x, depth)),
            Angle::from_radians(libm::atan2(y, libm::hypot(x, depth))),
        )
    }

    /// The same plane with its axes turned counter-clockwise about the centre.
    pub(super) fn turned(&self, (sin, cos): (f64, f64)) -> Self {
        TangentPlane {
            centre: self.centre,
            x_axis: self.x_axis * cos + self.y_axis * sin,
            y_axis: self.y_axis * cos - self.x_axis * sin,
        }
    }

    /// The plane that touches at the angles `right` and `up` from this centre, its axes carried along: the x axis stays on
    /// its parallel.
    pub(super) fn moved(&self, right: Angle, up: Angle) -> Self {
        let (sin_right, cos_right) = right.sin_cos();
        let (sin_up, cos_up) = up.sin_cos();
        let level = self.centre * cos_right + self.x_axis * sin_right;
        // Made orthogonal afresh, so that rounding does not add up over many moves.
        let centre = (level * cos_up + self.y_axis * sin_up).unit();
        let x_axis = self.x_axis * cos_right - self.centre * sin_right;
        let x_axis = (x_axis - centre * x_axis.dot(centre)).unit();
        let y_axis = self.y_axis * cos_up - level * sin_up;
        let y_axis = (y_axis - centre * y_axis.dot(centre)).unit();
        TangentPlane {
            centre,
            x_axis,
            y_axis,
        }
    }
}

/// The direction to an azimuth and altitude as a vector whose x axis points north, y east, z to the zenith. Only
/// [`TangentPlane::of_ground`] knows that these axes are left-handed.
#[must_use]
pub fn ground_vector(place: Horizontal) -> Vec3 {
    Vec3::from_spherical(place.azimuth, place.altitude)
}

/// How far outside an edge a direction still counts as inside, in units of the focal length (0.0002"): what the fit puts
/// on an edge shall lie within it.
const EDGE_SLACK: f64 = 1e-9;

/// A rectangle around the centre of a tangent plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rectangle {
    plane: TangentPlane,
    half_width: f64,
    half_height: f64,
}

impl Rectangle {
    /// Half sides in units of the focal length, finite and not negative.
    pub(super) const fn new(plane: TangentPlane, half_width: f64, half_height: f64) -> Self {
        Rectangle {
            plane,
            half_width,
            half_height,
        }
    }

    /// What a sensor sees behind a lens.
    pub(super) fn of_camera(plane: TangentPlane, lens: &Lens, sensor: &Sensor) -> Self {
        let half = |millimetres: f64| 0.5 * millimetres / lens.focal_length_mm();
        Rectangle::new(plane, half(sensor.width_mm()), half(sensor.height_mm()))
    }

    #[must_use]
    pub const fn plane(&self) -> &TangentPlane {
        &self.plane
    }

    /// Unit vector to the middle.
    #[must_use]
    pub const fn centre(&self) -> Vec3 {
        self.plane.centre
    }

    /// Position angle of the upward direction at the centre: from celestial north through east on equatorial axes, above
    /// -180 up to 180 degrees.
    #[must_use]
    pub fn tilt(&self) -> Angle {
        self.plane.position_angle()
    }

    /// Angle from left to right edge through the middle.
    #[must_use]
    pub fn width(&self) -> Angle {
        Angle::from_radians(2.0 * libm::atan(self.half_width))
    }

    /// Angle from bottom to top edge through the middle.
    #[must_use]
    pub fn height(&self) -> Angle {
        Angle::from_radians(2.0 * libm::atan(self.half_height))
    }

    pub(super) const fn half_sides(&self) -> (f64, f64) {
        (self.half_width, self.half_height)
    }

    /// Directions to the corners: top left, top right, bottom right, bottom left.
    #[must_use]
    pub fn corners(&self) -> [Vec3; 4] {
        let (w, h) = self.half_sides();
        [(-w, h), (w, h), (w, -h), (-w, -h)].map(|(x, y)| self.plane.direction(PlanePoint { x, y }))
    }

    /// The declination in the picture that is nearest to the equator, where the sky turns fastest.
    #[must_use]
    pub fn declination_nearest_equator(&self) -> Angle {
        // A side is an arc of a great circle: away from the equator its ends are nearest to it.
        let latitudes = self.corners().map(|corner| corner.latitude());
        let least = latitudes
            .into_iter()
            .fold(Angle::QUARTER_TURN, |a, b| if b < a { b } else { a });
        let greatest = latitudes
            .into_iter()
            .fold(-Angle::QUARTER_TURN, |a, b| if b > a { b } else { a });
        if least > Angle::ZERO {
            least
        } else if greatest < Angle::ZERO {
            greatest
        } else {
            Angle::ZERO
        }
    }

    /// Distances inside the four edges times the depth: all at least zero within the rectangle, and linear in the vector.
    fn inside_edges(&self, direction: Vec3) -> [f64; 4] {
        let (x, y, depth) = self.plane.components(direction);
        let (w, h) = (self.half_width + EDGE_SLACK, self.half_height + EDGE_SLACK);
        [w * depth - x, w * depth + x, h * depth - y, h * depth + y]
    }

    /// Whether a direction lies in the rectangle, edges included.
    #[must_use]
    pub fn holds(&self, direction: Vec3) -> bool {
        direction.norm() > 0.0
            && self
                .inside_edges(direction)
                .iter()
                .all(|distance| *distance >= 0.0)
    }

    /// The part of the great-circle arc from `a` to `b` (less than 180 degrees) that lies within, as shares of the chord.
    pub(super) fn clip(&self, a: Vec3, b: Vec3) -> Option<(f64, f64)> {
        let (mut from, mut to) = (0.0_f64, 1.0_f64);
        for (start, end) in self.inside_edges(a).into_iter().zip(self.inside_edges(b)) {
            if start < 0.0 && end < 0.0 {
                return None;
            }
            if start < 0.0 {
                from = from.max(start / (start - end));
            } else if end < 0.0 {
                to = to.min(start / (start - end));
            }
        }
        (from <= to).then_some((from, to))
    }
}
