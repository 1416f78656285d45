//! The bodies that can be looked at.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Serialize};

/// A body of the solar system, as seen from Earth.
///
/// Mars to Neptune are the barycentres of their systems, which is what DE440 holds; the planet itself is at most
/// 0.08" (Jupiter), 0.05" (Saturn), 0.004" (Uranus, Neptune) away.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Body {
    Sun,
    Moon,
    Mercury,
    Venus,
    Mars,
    Jupiter,
    Saturn,
    Uranus,
    Neptune,
}

impl Body {
    pub const ALL: [Body; 9] = [
        Body::Sun,
        Body::Moon,
        Body::Mercury,
        Body::Venus,
        Body::Mars,
        Body::Jupiter,
        Body::Saturn,
        Body::Uranus,
        Body::Neptune,
    ];

    pub const PLANETS: [Body; 7] = [
        Body::Mercury,
        Body::Venus,
        Body::Mars,
        Body::Jupiter,
        Body::Saturn,
        Body::Uranus,
        Body::Neptune,
    ];

    /// The English name with a capital, as in "Mars".
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Body::Sun => "Sun",
            Body::Moon => "Moon",
            Body::Mercury => "Mercury",
            Body::Venus => "Venus",
            Body::Mars => "Mars",
            Body::Jupiter => "Jupiter",
            Body::Saturn => "Saturn",
            Body::Uranus => "Uranus",
            Body::Neptune => "Neptune",
        }
    }

    /// The word used in files, tables and on the command line, as in "mars".
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Body::Sun => "sun",
            Body::Moon => "moon",
            Body::Mercury => "mercury",
            Body::Venus => "venus",
            Body::Mars => "mars",
            Body::Jupiter => "jupiter",
            Body::Saturn => "saturn",
            Body::Uranus => "uranus",
            Body::Neptune => "neptune",
        }
    }

    /// Equatorial radius in km. IAU WGCCRE 2015 (Archinal et al. 2018, Celest. Mech. 130:22) for planets and Moon;
    /// IAU 2015 resolution B3 for the Sun.
    #[must_use]
    pub const fn radius_km(self) -> f64 {
        match self {
            Body::Sun => 695_700.0,
            Body::Moon => 1737.4,
            Body::Mercury => 2440.53,
            Body::Venus => 6051.8,
            Body::Mars => 3396.19,
            Body::Jupiter => 71_492.0,
            Body::Saturn => 60_268.0,
            Body::Uranus => 25_559.0,
            Body::Neptune => 24_764.0,
        }
    }

    /// Mercury and Venus: bodies that never stand opposite the Sun.
    #[must_use]
    pub const fn is_inner_planet(self) -> bool {
        matches!(self, Body::Mercury | Body::Venus)
    }

    /// Mars to Neptune: bodies that come to opposition.
    #[must_use]
    pub const fn is_outer_planet(self) -> bool {
        matches!(
            self,
            Body::Mars | Body::Jupiter | Body::Saturn | Body::Uranus | Body::Neptune
        )
    }
}

impl fmt::Display for Body {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.name())
    }
}

/// A word that names no body.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error(
    "no body is called \"{0}\"; use sun, moon, mercury, venus, mars, jupiter, saturn, uranus or neptune"
)]
pub struct UnknownBody(pub String);

impl FromStr for Body {
    type Err = UnknownBody;
    fn from_str(word: &str) -> Result<Self, UnknownBody> {
        Body::ALL
            .into_iter()
            .find(|body| body.word().eq_ignore_ascii_case(word.trim()))
            .ok_or_else(|| UnknownBody(word.to_owned()))
    }
}
