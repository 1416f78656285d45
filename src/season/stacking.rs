//! Stacked pictures: one picture with a dot for each night.
//!
//! *Fixed on the stars*: each night's picture is laid on the same stars, and the dots draw the loop among them. Directions are
//! astrometric and topocentric on ICRS axes: the stars around the subject are moved by aberration and precession as it is, so
//! apparent places of date would let it slide.
//!
//! *Fixed on the ground*: the camera stands still, and a [`GroundRule`] says when it exposes each night; the dots draw an arc
//! over the skyline. Altitudes are apparent (refracted), azimuths from north through east.
//!
//! The instant of a rule is found within a second (0.25 s for a steady Sun) over functions that are handed in.

use std::fmt;
use std::ops::Range;

use super::conditions::ClockTime;
use super::exposure::SKY_DEGREES_PER_DAY;
use super::framing::{FrameError, PhotoFrame, Pixel};
use super::lens::{Lens, OutOfRange, Sensor, within};
use super::search::{minimum, root};
use super::tangent::{Rectangle, TangentPlane, ground_vector};
use super::types::Span;
use crate::sky::place::Horizontal;
use crate::sky::{Angle, Tt, Vec3};

/// One night's place in a stacked picture.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dot {
    pub instant: Tt,
    /// Also outside the picture; `None` behind the camera.
    pub pixel: Option<Pixel>,
    /// Whether it lies in the picture.
    pub held: bool,
}

/// A picture stacked on the stars.
#[derive(Clone, Debug, PartialEq)]
pub struct StarStack {
    pub frame: PhotoFrame,
    /// In the order of the picks.
    pub dots: Vec<Dot>,
}

impl StarStack {
    /// Places picks, each an instant with its astrometric topocentric direction on ICRS axes.
    #[must_use]
    pub fn new(frame: PhotoFrame, picks: &[(Tt, Vec3)]) -> Self {
        let dots = picks
            .iter()
            .map(|(instant, direction)| Dot {
                instant: *instant,
                pixel: frame.pixel(*direction),
                held: frame.holds(*direction),
            })
            .collect();
        StarStack { frame, dots }
    }
}

/// A picture stacked on the ground.
#[derive(Clone, Debug, PartialEq)]
pub struct GroundStack {
    pub frame: GroundFrame,
    pub rule: GroundRule,
    /// In the order of the picks.
    pub dots: Vec<Dot>,
}

impl GroundStack {
    /// Places picks, each an instant with azimuth and apparent altitude.
    #[must_use]
    pub fn new(frame: GroundFrame, rule: GroundRule, picks: &[(Tt, Horizontal)]) -> Self {
        let dots = picks
            .iter()
            .map(|(instant, place)| Dot {
                instant: *instant,
                pixel: frame.pixel(*place),
                held: frame.holds(*place),
            })
            .collect();
        GroundStack { frame, rule, dots }
    }
}

/// The rectangle over the ground that a camera on its tripod holds: the tangent plane over azimuth and apparent altitude.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GroundFrame {
    aim: Horizontal,
    roll: Angle,
    rectangle: Rectangle,
    columns: u32,
    rows: u32,
}

impl GroundFrame {
    /// A camera aimed at an azimuth and altitude. `roll` is how far its upward direction leans to the left of the zenith, as
    /// seen from behind the camera; 0 is level.
    ///
    /// # Errors
    /// An altitude outside -90 to 90 degrees, azimuth or roll that are no numbers.
    pub fn new(
        aim: Horizontal,
        roll: Angle,
        lens: &Lens,
        sensor: &Sensor,
    ) -> Result<Self, OutOfRange> {
        within(
            "azimuth",
            aim.azimuth.degrees(),
            (-360.0, 360.0),
            "degrees from north through east",
        )?;
        within("altitude", aim.altitude.degrees(), (-90.0, 90.0), "degrees")?;
        within(
            "roll",
            roll.degrees(),
            (-360.0, 360.0),
            "degrees, to the left positive",
        )?;
        let plane = TangentPlane::of_ground(aim, roll);
        Ok(GroundFrame {
            aim,
            roll,
            rectangle: Rectangle::of_camera(plane, lens, sensor),
            columns: sensor.columns(),
            rows: sensor.rows(),
        })
    }

    /// A level camera aimed at the middle of places: halfway between the outermost in azimuth and in altitude.
    ///
    /// # Errors
    /// No places, or places more than 70 degrees from the middle.
    pub fn level_around(
        places: &[Horizontal],
        lens: &Lens,
        sensor: &Sensor,
    ) -> Result<Self, FrameError> {
        const GREATEST_REACH_DEG: f64 = 70.0;
        let sum = places
            .iter()
            .map(|place| Vec3::from_spherical(place.azimuth, Angle::ZERO))
            .fold(Vec3::ZERO, |sum, level| sum + level);
        if places.is_empty() {
            return Err(FrameError::NoDirections);
        }
        let about = sum.longitude();
        let range = |values: &dyn Fn(&Horizontal) -> f64| {
            let all = places.iter().map(values);
            let (least, greatest) = all.fold((f64::MAX, f64::MIN), |(least, greatest), value| {
                (least.min(value), greatest.max(value))
            });
            Angle::from_radians(0.5 * (least + greatest))
        };
        let aim = Horizontal {
            azimuth: (about + range(&|place| (place.azimuth - about).signed().radians())).wrapped(),
            altitude: range(&|place| place.altitude.radians()),
        };
        let middle = ground_vector(aim);
        let reach = places
            .iter()
            .map(|place| middle.separation(ground_vector(*place)).degrees())
            .fold(0.0, f64::max);
        if reach > GREATEST_REACH_DEG {
            return Err(FrameError::TooWide {
                reach,
                greatest: GREATEST_REACH_DEG,
            });
        }
        Ok(GroundFrame::new(aim, Angle::ZERO, lens, sensor)?)
    }

    #[must_use]
    pub const fn aim(&self) -> Horizontal {
        self.aim
    }

    /// To the left positive.
    #[must_use]
    pub const fn roll(&self) -> Angle {
        self.roll
    }

    /// Pixels along the width and along the height.
    #[must_use]
    pub const fn size(&self) -> (u32, u32) {
        (self.columns, self.rows)
    }

    /// Angles from edge to edge through the middle.
    #[must_use]
    pub fn field(&self) -> (Angle, Angle) {
        (self.rectangle.width(), self.rectangle.height())
    }

    /// Where a place over the ground falls, also outside the picture; `None` from a right angle off the axis onward.
    #[must_use]
    pub fn pixel(&self, place: Horizontal) -> Option<Pixel> {
        let point = self.rectangle.plane().project(ground_vector(place))?;
        Some(Pixel::from_plane(
            point,
            &self.rectangle,
            self.columns,
            self.rows,
        ))
    }

    /// Azimuth and altitude of a point of the picture.
    #[must_use]
    pub fn place(&self, pixel: Pixel) -> Horizontal {
        let point = pixel.to_plane(&self.rectangle, self.columns, self.rows);
        let vector = self.rectangle.plane().direction(point);
        Horizontal {
            azimuth: vector.longitude(),
            altitude: vector.latitude(),
        }
    }

    /// Whether a place lies in the picture, edges included.
    #[must_use]
    pub fn holds(&self, place: Horizontal) -> bool {
        self.rectangle.holds(ground_vector(place))
    }
}

/// Which half of the night a rule means.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum NightHalf {
    #[default]
    Evening,
    Morning,
}

/// When the camera on its tripod exposes, each night.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum GroundRule {
    /// The true altitude of the Sun's centre, on its way down in the evening or up in the morning: the sky is equally dark.
    SunAltitude { altitude: Angle, half: NightHalf },
    /// After sunset in the evening, before sunrise in the morning.
    FromSunset { minutes: f64, half: NightHalf },
    /// A reading of the local clock.
    Clock(ClockTime),
    /// Local apparent sidereal time: the stars stand still over the ground.
    SiderealTime(Angle),
}

/// Sun at -6 degrees, evening.
impl Default for GroundRule {
    fn default() -> Self {
        GroundRule::SunAltitude {
            altitude: Angle::from_degrees(-6.0),
            half: NightHalf::Evening,
        }
    }
}

/// Minutes that cameras keep from sunset and from sunrise (common practice, no source).
const AFTER_SUNSET_MIN: f64 = 5.0;
const BEFORE_SUNRISE_MIN: f64 = 10.0;
/// Altitude of the Sun's centre at which the highest rule keeps the whole disc under the true horizon.
const HIGHEST_SUN_DEG: f64 = -1.0;

impl GroundRule {
    /// # Errors
    /// A Sun that is not down (higher than -1 degree), less than 5 minutes after sunset or 10 before sunrise or more than 720,
    /// a sidereal time outside 0 to 360 degrees.
    fn check(self) -> Result<(), OutOfRange> {
        match self {
            GroundRule::SunAltitude { altitude, .. } => within(
                "Sun's altitude",
                altitude.degrees(),
                (-90.0, HIGHEST_SUN_DEG),
                "degrees (-6 is the end of civil twilight)",
            ),
            GroundRule::FromSunset {
                minutes,
                half: NightHalf::Evening,
            } => within(
                "time from sunset",
                minutes,
                (AFTER_SUNSET_MIN, 720.0),
                "minutes after sunset (the whole Sun must be gone)",
            ),
            GroundRule::FromSunset {
                minutes,
                half: NightHalf::Morning,
            } => within(
                "time to sunrise",
                minutes,
                (BEFORE_SUNRISE_MIN, 720.0),
                "minutes before sunrise (done well before the Sun is back)",
            ),
            GroundRule::Clock(clock) => within(
                "clock time",
                f64::from(clock.minutes()),
                (0.0, 1440.0),
                "minutes since midnight",
            ),
            GroundRule::SiderealTime(time) => within(
                "sidereal time",
                time.degrees(),
                (0.0, 360.0),
                "degrees (15 to the hour)",
            ),
        }
        .map(|_| ())
    }
}

/// The local clock at an instant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LocalClock {
    /// Since local midnight, 0 up to 1440.
    pub minutes: f64,
    /// Local time less UTC.
    pub utc_offset_minutes: f64,
}

/// What a rule reads: the Sun, the stars and the clock at a place.
pub trait GroundReadings {
    type Error;

    /// True altitude of the Sun's centre.
    ///
    /// # Errors
    /// What the source of the reading reports.
    fn sun_altitude(&self, instant: Tt) -> Result<Angle, Self::Error>;

    /// Local apparent sidereal time.
    ///
    /// # Errors
    /// What the source of the reading reports.
    fn sidereal_time(&self, instant: Tt) -> Result<Angle, Self::Error>;

    /// # Errors
    /// What the source of the reading reports.
    fn local_clock(&self, instant: Tt) -> Result<LocalClock, Self::Error>;

    /// True altitude of the Sun's centre at sunset and sunrise: 34' of refraction and 16' of radius, the almanacs' convention. A
    /// high site adds its dip.
    fn sunset_altitude(&self) -> Angle {
        Angle::from_degrees(-50.0 / 60.0)
    }
}

/// A rule that says nothing, or a reading that failed.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum RuleError<E> {
    #[error(transparent)]
    Rule(#[from] OutOfRange),
    #[error(transparent)]
    Reading(E),
}

/// An instant with the Sun's altitude at it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RuleInstant {
    pub instant: Tt,
    /// True, of the centre. A clock or sidereal rule may fall into the day: look at it before anything is pointed.
    pub sun_altitude: Angle,
    pub sun_is_down: bool,
}

/// What a rule comes to in one night.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum RuleNight {
    Met(RuleInstant),
    NotMet {
        why: NotMet,
        /// The instant of the night that comes nearest with the Sun down, if there is one.
        nearest: Option<RuleInstant>,
    },
}

/// Why a night has no such instant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum NotMet {
    /// The Sun gets no lower than this.
    SunStaysAbove(Angle),
    /// The Sun gets no higher than this.
    SunStaysBelow(Angle),
    /// So many minutes from sunset the Sun is up again, or nearly: this many are left in the night, to 10 minutes before
    /// sunrise (or back to 5 after sunset).
    SunUpAgain { night_minutes: f64 },
    /// The clocks are put forward over this reading.
    SkippedByClocks,
}

impl fmt::Display for NotMet {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NotMet::SunStaysAbove(lowest) => {
                write!(f, "the Sun gets no lower than {:.1} deg", lowest.degrees())
            }
            NotMet::SunStaysBelow(highest) => write!(
                f,
                "the Sun gets no higher than {:.1} deg",
                highest.degrees()
            ),
            NotMet::SunUpAgain { night_minutes } => {
                write!(f, "the Sun leaves {night_minutes:.0} minutes only")
            }
            NotMet::SkippedByClocks => f.write_str("the clocks are put forward over this time"),
        }
    }
}

/// The clocks differ between two picks: a clock-time rule lets the dots jump there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ClockChange {
    /// The first night with the new time, counted from 0.
    pub night: usize,
    /// Put forward positive.
    pub minutes: f64,
}

/// What a rule comes to over a season.
#[derive(Clone, Debug, PartialEq)]
pub struct RuleSurvey {
    pub nights: Vec<RuleNight>,
    /// Runs of nights in which the rule is never met.
    pub missed: Vec<Range<usize>>,
    /// For a clock-time rule only.
    pub clock_changes: Vec<ClockChange>,
    /// Where nights are missed: the rule of the same kind nearest to it that every night meets with the Sun down, if any.
    pub instead: Option<GroundRule>,
}

/// How narrowly instants are searched: a quarter of a second.
const TOLERANCE_DAYS: f64 = 0.25 / 86_400.0;
/// Between samples of the Sun's altitude; it has one high and one low a day, which are searched apart.
const SAMPLE_DAYS: f64 = 1.0 / 24.0;

/// The instant of a rule in a night: the 24 hours from local mean noon.
///
/// # Errors
/// A rule out of range, a reading that fails.
pub fn rule_instant<R: GroundReadings>(
    rule: GroundRule,
    night: Span,
    readings: &R,
) -> Result<RuleNight, RuleError<R::Error>> {
    rule.check()?;
    let finder = Finder { night, readings };
    match rule {
        GroundRule::SunAltitude { altitude, half } => finder.sun_altitude(altitude, half),
        GroundRule::FromSunset { minutes, half } => finder.minutes_off_sunset(minutes, half),
        GroundRule::Clock(clock) => finder.clock(f64::from(clock.minutes())),
        GroundRule::SiderealTime(time) => finder.sidereal_time(time),
    }
    .map_err(RuleError::Reading)
}

struct Finder<'a, R> {
    night: Span,
    readings: &'a R,
}

/// Passages of the Sun through an altitude in a night, with its extremes.
struct SunPassages {
    downward: Vec<f64>,
    upward: Vec<f64>,
    /// Instant and altitude, radians.
    lowest: (f64, f64),
    highest: (f64, f64),
}

impl<R: GroundReadings> Finder<'_, R> {
    fn sun(&self, days: f64) -> Result<f64, R::Error> {
        Ok(self.readings.sun_altitude(Tt::from_days(days))?.radians())
    }

    fn seen(&self, days: f64) -> Result<RuleInstant, R::Error> {
        let instant = Tt::from_days(days);
        let sun_altitude = self.readings.sun_altitude(instant)?;
        // A passage found to a quarter second may stand 0.001 degrees to either side.
        let slack = Angle::from_degrees(0.002);
        let sun_is_down = sun_altitude <= self.readings.sunset_altitude() + slack;
        Ok(RuleInstant {
            instant,
            sun_altitude,
            sun_is_down,
        })
    }

    /// The instant where the Sun is down there.
    fn nearest(&self, days: f64) -> Result<Option<RuleInstant>, R::Error> {
        let seen = self.seen(days)?;
        Ok(seen.sun_is_down.then_some(seen))
    }

    fn passages(&self, altitude: Angle) -> Result<SunPassages, R::Error> {
        let level = altitude.radians();
        let (from, to) = (self.night.from.days(), self.night.to.days());
        let count = ((to - from) / SAMPLE_DAYS).ceil().clamp(1.0, 100.0) as usize;
        let step = (to - from) / count as f64;
        // One sample beyond either end, so that an extreme at an end is seen.
        let mut samples = Vec::with_capacity(count + 3);
        for index in 0..count + 3 {
            let days = from + (index as f64 - 1.0) * step;
            samples.push((days, self.sun(days)?));
        }
        let mut points = samples.clone();
        for window in samples.windows(3) {
            let &[a, b, c] = window else { continue };
            for sign in [1.0, -1.0] {
                if sign * a.1 > sign * b.1 && sign * b.1 <= sign * c.1 {
                    let f = |days: f64| Ok(sign * self.sun(days)?);
                    let (days, value) = minimum(a.0, (b.0, sign * b.1), c.0, TOLERANCE_DAYS, f)?;
                    points.push((days, sign * value));
                }
            }
        }
        points.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut found = SunPassages {
            downward: Vec::new(),
            upward: Vec::new(),
            lowest: (from, f64::MAX),
            highest: (from, f64::MIN),
        };
        for point in points.iter().filter(|point| (from..=to).contains(&point.0)) {
            if point.1 < found.lowest.1 {
                found.lowest = *point;
            }
            if point.1 > found.highest.1 {
                found.highest = *point;
            }
        }
        for pair in points.windows(2) {
            let &[a, b] = pair else { continue };
            let (a, b) = ((a.0, a.1 - level), (b.0, b.1 - level));
            if (a.1 < 0.0) != (b.1 < 0.0) {
                let days = root(a, b, TOLERANCE_DAYS, |days| Ok(self.sun(days)? - level))?;
                if (from..to).contains(&days) {
                    if a.1 < 0.0 {
                        found.upward.push(days)
                    } else {
                        found.downward.push(days)
                    }
                }
            }
        }
        Ok(found)
    }

    fn sun_altitude(&self, altitude: Angle, half: NightHalf) -> Result<RuleNight, R::Error> {
        let passages = self.passages(altitude)?;
        let passage = match half {
            NightHalf::Evening => passages.downward.first(),
            NightHalf::Morning => passages.upward.last(),
        };
        if let Some(days) = passage {
            return Ok(RuleNight::Met(self.seen(*days)?));
        }
        let (nearest, why) = if passages.lowest.1 >= altitude.radians() {
            (
                passages.lowest,
                NotMet::SunStaysAbove(Angle::from_radians(passages.lowest.1)),
            )
        } else {
            (
                passages.highest,
                NotMet::SunStaysBelow(Angle::from_radians(passages.highest.1)),
            )
        };
        Ok(RuleNight::NotMet {
            why,
            nearest: self.nearest(nearest.0)?,
        })
    }

    fn minutes_off_sunset(&self, minutes: f64, half: NightHalf) -> Result<RuleNight, R::Error> {
        let horizon = self.readings.sunset_altitude();
        let passages = self.passages(horizon)?;
        let passage = match half {
            NightHalf::Evening => passages.downward.first().map(|sunset| (*sunset, 1.0)),
            NightHalf::Morning => passages.upward.last().map(|sunrise| (*sunrise, -1.0)),
        };
        let Some((edge, sign)) = passage else {
            let why = if passages.lowest.1 >= horizon.radians() {
                NotMet::SunStaysAbove(Angle::from_radians(passages.lowest.1))
            } else {
                NotMet::SunStaysBelow(Angle::from_radians(passages.highest.1))
            };
            return Ok(RuleNight::NotMet { why, nearest: None });
        };
        let wanted = edge + sign * minutes / 1440.0;
        let other = match half {
            NightHalf::Evening => passages
                .upward
                .iter()
                .copied()
                .find(|sunrise| *sunrise > edge),
            NightHalf::Morning => passages
                .downward
                .iter()
                .copied()
                .rev()
                .find(|sunset| *sunset < edge),
        };
        let guard = match half {
            NightHalf::Evening => BEFORE_SUNRISE_MIN,
            NightHalf::Morning => AFTER_SUNSET_MIN,
        };
        if let Some(other) = other {
            let night_minutes = (other - edge).abs() * 1440.0 - guard;
            if minutes > night_minutes {
                return Ok(RuleNight::NotMet {
                    why: NotMet::SunUpAgain {
                        night_minutes: night_minutes.max(0.0),
                    },
                    nearest: if night_minutes > 0.0 {
                        self.nearest(other - sign * guard / 1440.0)?
                    } else {
                        None
                    },
                });
            }
        }
        Ok(RuleNight::Met(self.seen(wanted)?))
    }

    fn clock(&self, target: f64) -> Result<RuleNight, R::Error> {
        let (from, to) = (self.night.from, self.night.to);
        let (start, end) = (
            self.readings.local_clock(from)?,
            self.readings.local_clock(to)?,
        );
        // Reading `target` for the first time from an instant whose clock is known, were there no change.
        let next = |known: Tt, reading: LocalClock| {
            known.days() + (target - reading.minutes).rem_euclid(1440.0) / 1440.0
        };
        let plain = next(from, start);
        if start.utc_offset_minutes == end.utc_offset_minutes {
            return Ok(RuleNight::Met(self.seen(plain)?));
        }
        let (mut before, mut after) = (from.days(), to.days());
        while after - before > TOLERANCE_DAYS {
            let middle = 0.5 * (before + after);
            let offset = self
                .readings
                .local_clock(Tt::from_days(middle))?
                .utc_offset_minutes;
            if offset == start.utc_offset_minutes {
                before = middle
            } else {
                after = middle
            }
        }
        if plain < after {
            return Ok(RuleNight::Met(self.seen(plain)?));
        }
        let late = next(
            Tt::from_days(after),
            self.readings.local_clock(Tt::from_days(after))?,
        );
        if late < to.days() {
            return Ok(RuleNight::Met(self.seen(late)?));
        }
        Ok(RuleNight::NotMet {
            why: NotMet::SkippedByClocks,
            nearest: self.nearest(after)?,
        })
    }

    fn sidereal_time(&self, target: Angle) -> Result<RuleNight, R::Error> {
        let start = self.night.from.days();
        let days_for = |angle: Angle| angle.degrees() / SKY_DEGREES_PER_DAY;
        let at = |days: f64| self.readings.sidereal_time(Tt::from_days(days));
        let mut days = start + days_for((target - at(start)?).wrapped());
        // Nutation and the Earth's rate of the day leave milliseconds.
        days += days_for((target - at(days)?).signed());
        Ok(RuleNight::Met(self.seen(days)?))
    }
}

/// A rule over many nights: where it is met, in which runs of nights it is not, and what would be met instead.
///
/// # Errors
/// As [`rule_instant`].
pub fn survey_rule<R: GroundReadings>(
    rule: GroundRule,
    nights: &[Span],
    readings: &R,
) -> Result<RuleSurvey, RuleError<R::Error>> {
    let found = nights
        .iter()
        .map(|night| rule_instant(rule, *night, readings))
        .collect::<Result<Vec<_>, _>>()?;
    let mut missed: Vec<Range<usize>> = Vec::new();
    for (index, _) in found
        .iter()
        .enumerate()
        .filter(|(_, night)| matches!(night, RuleNight::NotMet { .. }))
    {
        match missed.last_mut() {
            Some(run) if run.end == index => run.end = index + 1,
            _ => missed.push(index..index + 1),
        }
    }
    let mut clock_changes = Vec::new();
    if let GroundRule::Clock(_) = rule {
        let mut before: Option<f64> = None;
        for (night, outcome) in found.iter().enumerate() {
            let RuleNight::Met(seen) = outcome else {
                continue;
            };
            let offset = readings
                .local_clock(seen.instant)
                .map_err(RuleError::Reading)?
                .utc_offset_minutes;
            if let Some(before) = before
                && before != offset
            {
                clock_changes.push(ClockChange {
                    night,
                    minutes: offset - before,
                });
            }
            before = Some(offset);
        }
    }
    let instead = match other_rule(rule, &found) {
        None => None,
        Some(other) => {
            let mut everywhere = true;
            for night in nights {
                everywhere &= matches!(rule_instant(other, *night, readings)?, RuleNight::Met(_));
            }
            everywhere.then_some(other)
        }
    };
    Ok(RuleSurvey {
        nights: found,
        missed,
        clock_changes,
        instead,
    })
}

/// The nearest rule of the same kind that the missed nights would meet, rounded to what people set: a tenth of a degree,
/// whole minutes.
fn other_rule(rule: GroundRule, found: &[RuleNight]) -> Option<GroundRule> {
    let reasons = || {
        found.iter().filter_map(|night| match night {
            RuleNight::NotMet { why, .. } => Some(*why),
            RuleNight::Met(_) => None,
        })
    };
    reasons().next()?;
    match rule {
        GroundRule::SunAltitude { half, .. } => {
            let mut least = f64::MIN;
            let mut greatest = f64::MAX;
            for why in reasons() {
                match why {
                    // A tenth of a margin, for the lowest point itself is met in an instant only.
                    NotMet::SunStaysAbove(lowest) => {
                        least = least.max((10.0 * lowest.degrees() + 0.1).ceil() / 10.0)
                    }
                    NotMet::SunStaysBelow(highest) => {
                        greatest = greatest.min((10.0 * highest.degrees() - 0.1).floor() / 10.0);
                    }
                    NotMet::SunUpAgain { .. } | NotMet::SkippedByClocks => return None,
                }
            }
            let altitude = if greatest == f64::MAX {
                least
            } else {
                greatest
            };
            (altitude >= least && altitude <= HIGHEST_SUN_DEG).then_some(GroundRule::SunAltitude {
                altitude: Angle::from_degrees(altitude),
                half,
            })
        }
        GroundRule::FromSunset { half, .. } => {
            let mut minutes = f64::MAX;
            for why in reasons() {
                let NotMet::SunUpAgain { night_minutes } = why else {
                    return None;
                };
                minutes = minutes.min(night_minutes.floor());
            }
            // Whether that is enough of a distance from the Sun, the check of the rule says.
            let other = GroundRule::FromSunset { minutes, half };
            other.check().is_ok().then_some(other)
        }
        GroundRule::Clock(_) | GroundRule::SiderealTime(_) => None,
    }
}
