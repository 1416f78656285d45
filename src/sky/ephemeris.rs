//! Places of Sun, Moon and planets: what can be asked for and what comes back.

use super::Vec3;

/// What an ephemeris gives the place of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
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
    /// The Moon from the Earth's centre; all others are from the barycentre of the solar system.
    MoonFromEarth,
}

/// Place and motion on the axes of the ICRS.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct State {
    /// au
    pub position: Vec3,
    /// au/day
    pub velocity: Vec3,
}
