//! An angle that knows its unit.

use std::f64::consts::{PI, TAU};
use std::ops::{Add, Div, Mul, Neg, Sub};

use serde::{Deserialize, Serialize};

/// An angle; radians inside, degrees in files (serde writes and reads degrees).
#[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd, Serialize, Deserialize)]
#[serde(from = "f64", into = "f64")]
pub struct Angle(f64);

impl From<f64> for Angle {
    fn from(degrees: f64) -> Self {
        Angle::from_degrees(degrees)
    }
}

impl From<Angle> for f64 {
    fn from(angle: Angle) -> Self {
        angle.degrees()
    }
}

impl Angle {
    pub const ZERO: Angle = Angle(0.0);
    pub const HALF_TURN: Angle = Angle(PI);
    pub const QUARTER_TURN: Angle = Angle(PI / 2.0);

    #[must_use]
    pub const fn from_radians(radians: f64) -> Self {
        Angle(radians)
    }

    #[must_use]
    pub const fn from_degrees(degrees: f64) -> Self {
        Angle(degrees * (PI / 180.0))
    }

    /// From hours of right ascension or hour angle, 15 degrees each.
    #[must_use]
    pub const fn from_hours(hours: f64) -> Self {
        Angle(hours * (PI / 12.0))
    }

    #[must_use]
    pub const fn from_arcsec(arcsec: f64) -> Self {
        Angle(arcsec * (PI / 648_000.0))
    }

    #[must_use]
    pub const fn radians(self) -> f64 {
        self.0
    }

    #[must_use]
    pub const fn degrees(self) -> f64 {
        self.0 * (180.0 / PI)
    }

    #[must_use]
    pub const fn hours(self) -> f64 {
        self.0 * (12.0 / PI)
    }

    #[must_use]
    pub const fn arcsec(self) -> f64 {
        self.0 * (648_000.0 / PI)
    }

    #[must_use]
    pub fn sin(self) -> f64 {
        libm::sin(self.0)
    }

    #[must_use]
    pub fn cos(self) -> f64 {
        libm::cos(self.0)
    }

    #[must_use]
    pub fn tan(self) -> f64 {
        libm::tan(self.0)
    }

    #[must_use]
    pub fn sin_cos(self) -> (f64, f64) {
        libm::sincos(self.0)
    }

    #[must_use]
    pub fn abs(self) -> Angle {
        Angle(self.0.abs())
    }

    /// The same direction, from 0 up to but not including 360 degrees.
    #[must_use]
    pub fn wrapped(self) -> Angle {
        let turns = self.0.rem_euclid(TAU);
        // rem_euclid of a tiny negative number rounds up to a whole turn.
        Angle(if turns >= TAU { 0.0 } else { turns })
    }

    /// The same direction, above -180 up to and including 180 degrees: the one signed shortest difference
    /// that events, loops and charts use.
    #[must_use]
    pub fn signed(self) -> Angle {
        let turns = self.wrapped().0;
        Angle(if turns > PI { turns - TAU } else { turns })
    }
}

impl Add for Angle {
    type Output = Angle;
    fn add(self, o: Angle) -> Angle {
        Angle(self.0 + o.0)
    }
}

impl Sub for Angle {
    type Output = Angle;
    fn sub(self, o: Angle) -> Angle {
        Angle(self.0 - o.0)
    }
}

impl Neg for Angle {
    type Output = Angle;
    fn neg(self) -> Angle {
        Angle(-self.0)
    }
}

impl Mul<f64> for Angle {
    type Output = Angle;
    fn mul(self, k: f64) -> Angle {
        Angle(self.0 * k)
    }
}

impl Div<f64> for Angle {
    type Output = Angle;
    fn div(self, k: f64) -> Angle {
        Angle(self.0 / k)
    }
}
