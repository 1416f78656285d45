//! The values a season is made of.

use crate::sky::{Angle, Body, Cautions, Mat3, Tt, Vec3};

/// A half-open stretch of time: `from` belongs to it, `to` does not.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Span {
    pub from: Tt,
    pub to: Tt,
}

impl Span {
    #[must_use]
    pub fn days(self) -> f64 {
        self.to.days() - self.from.days()
    }

    #[must_use]
    pub fn middle(self) -> Tt {
        self.from.plus_days(self.days() / 2.0)
    }

    #[must_use]
    pub fn contains(self, instant: Tt) -> bool {
        self.from <= instant && instant < self.to
    }
}

/// What happens. Longitudes are apparent, of the true equinox of date.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum EventKind {
    /// Outer planet: longitude equal to the Sun's.
    Conjunction,
    /// Inner planet, nearer than the Sun: longitude equal to the Sun's.
    InferiorConjunction,
    /// Inner planet, farther than the Sun: longitude equal to the Sun's.
    SuperiorConjunction,
    /// Longitude 180 degrees from the Sun's.
    Opposition,
    /// Longitude 90 degrees east of the Sun's: evening sky.
    QuadratureEast,
    /// Longitude 90 degrees west of the Sun's: morning sky.
    QuadratureWest,
    /// The longitude stops growing.
    StationRetrograde,
    /// The longitude stops falling.
    StationDirect,
    /// The right ascension stops growing.
    RaStationRetrograde,
    /// The right ascension stops falling.
    RaStationDirect,
    /// Maximum of the angle between the apparent directions of planet and Sun, planet in the evening sky.
    GreatestElongationEast,
    /// The same in the morning sky.
    GreatestElongationWest,
    /// Minimum of the geometric distance from the Earth's centre.
    ClosestApproach,
    /// Minimum of the light-time distance from the Earth's centre.
    ClosestApproachLightTime,
    /// Minimum of the magnitude.
    GreatestBrightness,
    /// Minimum of the distance from the Sun's centre.
    Perihelion,
    /// The astrometric place passes into a constellation (the boundaries stand among the stars).
    ConstellationEntry,
    /// Minimum of the angle to another planet, a bright star or the Moon.
    CloseApproach,
}

impl EventKind {
    pub const ALL: [EventKind; 18] = [
        EventKind::Conjunction,
        EventKind::InferiorConjunction,
        EventKind::SuperiorConjunction,
        EventKind::Opposition,
        EventKind::QuadratureEast,
        EventKind::QuadratureWest,
        EventKind::StationRetrograde,
        EventKind::StationDirect,
        EventKind::RaStationRetrograde,
        EventKind::RaStationDirect,
        EventKind::GreatestElongationEast,
        EventKind::GreatestElongationWest,
        EventKind::ClosestApproach,
        EventKind::ClosestApproachLightTime,
        EventKind::GreatestBrightness,
        EventKind::Perihelion,
        EventKind::ConstellationEntry,
        EventKind::CloseApproach,
    ];

    /// The word used in tables and on the command line.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            EventKind::Conjunction => "conjunction",
            EventKind::InferiorConjunction => "inferior_conjunction",
            EventKind::SuperiorConjunction => "superior_conjunction",
            EventKind::Opposition => "opposition",
            EventKind::QuadratureEast => "quadrature_east",
            EventKind::QuadratureWest => "quadrature_west",
            EventKind::StationRetrograde => "station_retrograde",
            EventKind::StationDirect => "station_direct",
            EventKind::RaStationRetrograde => "ra_station_retrograde",
            EventKind::RaStationDirect => "ra_station_direct",
            EventKind::GreatestElongationEast => "greatest_elongation_east",
            EventKind::GreatestElongationWest => "greatest_elongation_west",
            EventKind::ClosestApproach => "closest_approach",
            EventKind::ClosestApproachLightTime => "closest_approach_lighttime",
            EventKind::GreatestBrightness => "greatest_brightness",
            EventKind::Perihelion => "perihelion",
            EventKind::ConstellationEntry => "constellation_entry",
            EventKind::CloseApproach => "close_approach",
        }
    }

    /// What happens, in words for people.
    #[must_use]
    pub const fn phrase(self) -> &'static str {
        match self {
            EventKind::Conjunction => "conjunction with the Sun",
            EventKind::InferiorConjunction => "inferior conjunction",
            EventKind::SuperiorConjunction => "superior conjunction",
            EventKind::Opposition => "opposition",
            EventKind::QuadratureEast => "quadrature, evening side",
            EventKind::QuadratureWest => "quadrature, morning side",
            EventKind::StationRetrograde => "station in longitude, turns back (westward)",
            EventKind::StationDirect => "station in longitude, turns forward (eastward)",
            EventKind::RaStationRetrograde => "station in right ascension, turns back (westward)",
            EventKind::RaStationDirect => "station in right ascension, turns forward (eastward)",
            EventKind::GreatestElongationEast => "greatest elongation, evening",
            EventKind::GreatestElongationWest => "greatest elongation, morning",
            EventKind::ClosestApproach => "nearest to the Earth",
            EventKind::ClosestApproachLightTime => "nearest by light time",
            EventKind::GreatestBrightness => "brightest",
            EventKind::Perihelion => "perihelion",
            EventKind::ConstellationEntry => "enters a constellation",
            EventKind::CloseApproach => "close approach",
        }
    }
}

/// The number that belongs to an event.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum EventValue {
    /// Apparent ecliptic longitude of date.
    Longitude(Angle),
    /// Apparent right ascension of date.
    RightAscension(Angle),
    Elongation(Angle),
    DistanceAu(f64),
    Magnitude(f64),
    Separation(Angle),
    /// IAU abbreviation of the constellation entered.
    Constellation(&'static str),
}

/// The second party of a close approach.
#[derive(Clone, Debug, PartialEq)]
pub enum Other {
    Body(Body),
    /// Proper name of a star.
    Star(String),
}

/// One thing that happens to a body at one instant.
#[derive(Clone, Debug, PartialEq)]
pub struct Event {
    pub body: Body,
    pub kind: EventKind,
    pub instant: Tt,
    pub value: EventValue,
    pub with: Option<Other>,
    pub cautions: Cautions,
}

/// Where the astrometric track meets itself.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TrackCrossing {
    /// The earlier passage.
    pub first: Tt,
    /// The later passage.
    pub second: Tt,
    /// Unit vector, ICRS.
    pub direction: Vec3,
}

/// A retrograde loop: the path between and around a pair of stations in longitude.
#[derive(Clone, Debug, PartialEq)]
pub struct Loop {
    pub body: Body,
    pub station_retrograde: Event,
    pub station_direct: Event,
    /// Opposition or inferior conjunction between the stations.
    pub middle: Option<Event>,
    /// Closest approach (geometric); it may lie outside the stations.
    pub closest: Option<Event>,
    /// Greatest brightness from station to station, ends included.
    pub brightest: Option<Event>,
    /// Largest equatorial diameter, at the least light-time distance.
    pub largest_diameter: Option<Angle>,
    /// Where the track meets itself; `None` where it never does (an open S or Z).
    pub crossing: Option<TrackCrossing>,
}

impl Loop {
    /// Days from station to station.
    #[must_use]
    pub fn duration_days(&self) -> f64 {
        self.station_direct.instant.days() - self.station_retrograde.instant.days()
    }

    /// Retrograde arc in longitude, positive.
    #[must_use]
    pub fn arc(&self) -> Angle {
        match (self.station_retrograde.value, self.station_direct.value) {
            (EventValue::Longitude(first), EventValue::Longitude(second)) => {
                (first - second).signed()
            }
            _ => Angle::ZERO,
        }
    }
}

/// One sample of a path.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TrackPoint {
    pub instant: Tt,
    /// Astrometric direction (light time only, no aberration): unit vector, ICRS, from the Earth's centre or,
    /// with a site, from there.
    pub direction: Vec3,
    /// Light-time distance.
    pub distance_au: f64,
    /// Without the rotation and season terms of Mars; `None` for the Sun.
    pub magnitude: Option<f64>,
    /// Rate of the apparent ecliptic longitude of date; negative while retrograde.
    pub longitude_rate_per_day: Angle,
    /// Angle between the apparent directions of body and Sun.
    pub elongation: Angle,
}

/// The path of a body through a season.
#[derive(Clone, Debug, PartialEq)]
pub struct Track {
    pub body: Body,
    /// In order of time, at even steps, both ends of the span included.
    pub points: Vec<TrackPoint>,
}

/// The axes of the strip: mean ecliptic and equinox of the middle of the season, so that stars stand still.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StripFrame {
    pub epoch: Tt,
    /// Turns ICRS components into ecliptic ones.
    pub ecliptic_from_icrs: Mat3,
    /// Turns ICRS components into mean equatorial ones of the same epoch.
    pub equatorial_from_icrs: Mat3,
}

/// A season: the span with all that happens to the subject in it.
#[derive(Clone, Debug, PartialEq)]
pub struct Season {
    pub subject: Body,
    pub span: Span,
    pub frame: StripFrame,
    /// The subject's path.
    pub track: Track,
    /// Paths of the companions, in the scenario's order.
    pub companions: Vec<Track>,
    /// The Sun's path.
    pub sun: Track,
    /// The subject's events within the span, in order of time.
    pub events: Vec<Event>,
    /// The subject's loops of which at least one station lies in the span.
    pub loops: Vec<Loop>,
    /// Cautions that hold for the whole season.
    pub cautions: Cautions,
}
