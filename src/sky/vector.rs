//! Vectors and rotations in three dimensions, as plain `f64`.

use std::ops::{Add, AddAssign, Mul, Neg, Sub};

use super::Angle;

/// A vector, in whatever unit its owner says (au for positions, au/day for velocities, 1 for directions).
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Vec3 {
    pub x: f64,
    pub y: f64,
    pub z: f64,
}

impl Vec3 {
    pub const ZERO: Vec3 = Vec3::new(0.0, 0.0, 0.0);

    #[must_use]
    pub const fn new(x: f64, y: f64, z: f64) -> Self {
        Vec3 { x, y, z }
    }

    /// The unit vector at a longitude-like and a latitude-like angle.
    #[must_use]
    pub fn from_spherical(longitude: Angle, latitude: Angle) -> Self {
        let (sin_lon, cos_lon) = longitude.sin_cos();
        let (sin_lat, cos_lat) = latitude.sin_cos();
        Vec3::new(cos_lat * cos_lon, cos_lat * sin_lon, sin_lat)
    }

    #[must_use]
    pub fn dot(self, other: Vec3) -> f64 {
        self.x * other.x + self.y * other.y + self.z * other.z
    }

    #[must_use]
    pub fn cross(self, other: Vec3) -> Vec3 {
        Vec3::new(
            self.y * other.z - self.z * other.y,
            self.z * other.x - self.x * other.z,
            self.x * other.y - self.y * other.x,
        )
    }

    #[must_use]
    pub fn norm(self) -> f64 {
        self.dot(self).sqrt()
    }

    /// The direction of this vector; the zero vector stays zero.
    #[must_use]
    pub fn unit(self) -> Vec3 {
        let norm = self.norm();
        if norm > 0.0 {
            self * (1.0 / norm)
        } else {
            self
        }
    }

    /// The longitude-like angle, 0 to 360 degrees.
    #[must_use]
    pub fn longitude(self) -> Angle {
        Angle::from_radians(libm::atan2(self.y, self.x)).wrapped()
    }

    /// The latitude-like angle, -90 to 90 degrees.
    #[must_use]
    pub fn latitude(self) -> Angle {
        Angle::from_radians(libm::atan2(self.z, libm::hypot(self.x, self.y)))
    }

    /// The angle between two vectors, 0 to 180 degrees, accurate also near 0 and 180.
    #[must_use]
    pub fn separation(self, other: Vec3) -> Angle {
        Angle::from_radians(libm::atan2(self.cross(other).norm(), self.dot(other)))
    }

    /// Position angle of `other` seen from this direction: from the frame's north through east, 0 to 360 degrees.
    #[must_use]
    pub fn position_angle(self, other: Vec3) -> Angle {
        let here = self.unit();
        let east = Vec3::new(-here.y, here.x, 0.0);
        let north = here.cross(east);
        Angle::from_radians(libm::atan2(other.dot(east), other.dot(north))).wrapped()
    }
}

impl Add for Vec3 {
    type Output = Vec3;
    fn add(self, o: Vec3) -> Vec3 {
        Vec3::new(self.x + o.x, self.y + o.y, self.z + o.z)
    }
}

impl AddAssign for Vec3 {
    fn add_assign(&mut self, o: Vec3) {
        *self = *self + o;
    }
}

impl Sub for Vec3 {
    type Output = Vec3;
    fn sub(self, o: Vec3) -> Vec3 {
        Vec3::new(self.x - o.x, self.y - o.y, self.z - o.z)
    }
}

impl Neg for Vec3 {
    type Output = Vec3;
    fn neg(self) -> Vec3 {
        Vec3::new(-self.x, -self.y, -self.z)
    }
}

impl Mul<f64> for Vec3 {
    type Output = Vec3;
    fn mul(self, k: f64) -> Vec3 {
        Vec3::new(self.x * k, self.y * k, self.z * k)
    }
}

/// A rotation as its three rows: `matrix * v` gives the components of `v` on the new axes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mat3 {
    pub rows: [Vec3; 3],
}

impl Mat3 {
    pub const IDENTITY: Mat3 = Mat3 {
        rows: [
            Vec3::new(1.0, 0.0, 0.0),
            Vec3::new(0.0, 1.0, 0.0),
            Vec3::new(0.0, 0.0, 1.0),
        ],
    };

    #[must_use]
    pub const fn from_rows(rows: [[f64; 3]; 3]) -> Self {
        let [a, b, c] = rows;
        Mat3 {
            rows: [
                Vec3::new(a[0], a[1], a[2]),
                Vec3::new(b[0], b[1], b[2]),
                Vec3::new(c[0], c[1], c[2]),
            ],
        }
    }

    /// Turns the axes by `angle` about x (a vector's components turn the other way).
    #[must_use]
    pub fn about_x(angle: Angle) -> Self {
        let (s, c) = angle.sin_cos();
        Mat3::from_rows([[1.0, 0.0, 0.0], [0.0, c, s], [0.0, -s, c]])
    }

    /// Turns the axes by `angle` about y.
    #[must_use]
    pub fn about_y(angle: Angle) -> Self {
        let (s, c) = angle.sin_cos();
        Mat3::from_rows([[c, 0.0, -s], [0.0, 1.0, 0.0], [s, 0.0, c]])
    }

    /// Turns the axes by `angle` about z.
    #[must_use]
    pub fn about_z(angle: Angle) -> Self {
        let (s, c) = angle.sin_cos();
        Mat3::from_rows([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])
    }

    /// The inverse of a rotation.
    #[must_use]
    pub fn transposed(self) -> Self {
        let [a, b, c] = self.rows;
        Mat3::from_rows([[a.x, b.x, c.x], [a.y, b.y, c.y], [a.z, b.z, c.z]])
    }
}

impl Mul<Vec3> for Mat3 {
    type Output = Vec3;
    fn mul(self, v: Vec3) -> Vec3 {
        Vec3::new(
            self.rows[0].dot(v),
            self.rows[1].dot(v),
            self.rows[2].dot(v),
        )
    }
}

impl Mul<Mat3> for Mat3 {
    type Output = Mat3;
    fn mul(self, o: Mat3) -> Mat3 {
        let columns = o.transposed().rows;
        let row = |r: Vec3| Vec3::new(r.dot(columns[0]), r.dot(columns[1]), r.dot(columns[2]));
        Mat3 {
            rows: self.rows.map(row),
        }
    }
}
