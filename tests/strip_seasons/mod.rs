//! Seasons read from `tests/data/strip_*.csv` (JPL DE440 through skyfield; see the head of each file).

use chrono::{Datelike, Days, NaiveDate};
use loopwright::chart::{DateRank, StripDate, StripText};
use loopwright::season::{
    Event, EventKind, EventValue, Season, Span, StripFrame, Track, TrackPoint,
};
use loopwright::sky::{Angle, Body, Cautions, Mat3, Tt, Vec3};

/// File, title and span in words of every season here.
pub const SEASONS: [(&str, &str, &str); 5] = [
    (
        "mars_2026",
        "Mars turns in the Lion",
        "November 2026 to May 2027",
    ),
    (
        "venus_2026",
        "Venus in the evening sky",
        "February to November 2026",
    ),
    (
        "saturn_2025",
        "Saturn between the Fishes",
        "May 2025 to February 2026",
    ),
    (
        "mercury_2027",
        "Two months of Mercury",
        "January to April 2027",
    ),
    (
        "jupiter_2026",
        "Jupiter in the Lion",
        "September 2026 to June 2027",
    ),
];

fn text_of(name: &str) -> &'static str {
    match name {
        "mars_2026" => include_str!("../data/strip_mars_2026.csv"),
        "venus_2026" => include_str!("../data/strip_venus_2026.csv"),
        "saturn_2025" => include_str!("../data/strip_saturn_2025.csv"),
        "mercury_2027" => include_str!("../data/strip_mercury_2027.csv"),
        "jupiter_2026" => include_str!("../data/strip_jupiter_2026.csv"),
        other => panic!("no season {other}"),
    }
}

fn kind(word: &str) -> EventKind {
    match word {
        "StationRetrograde" => EventKind::StationRetrograde,
        "StationDirect" => EventKind::StationDirect,
        "Opposition" => EventKind::Opposition,
        "Conjunction" => EventKind::Conjunction,
        "InferiorConjunction" => EventKind::InferiorConjunction,
        "SuperiorConjunction" => EventKind::SuperiorConjunction,
        "GreatestElongationEast" => EventKind::GreatestElongationEast,
        "GreatestElongationWest" => EventKind::GreatestElongationWest,
        "ClosestApproach" => EventKind::ClosestApproach,
        "GreatestBrightness" => EventKind::GreatestBrightness,
        other => panic!("no event {other}"),
    }
}

/// Reads a season.
pub fn season(name: &str) -> Season {
    read(name, text_of(name))
}

/// Reads a season from the text of such a file.
pub fn read(name: &str, file: &str) -> Season {
    let number = |word: &str| -> f64 { word.parse().unwrap_or_else(|_| panic!("{name}: {word}")) };
    let matrix = |words: &[&str]| {
        let n: Vec<f64> = words.iter().map(|word| number(word)).collect();
        Mat3::from_rows([[n[0], n[1], n[2]], [n[3], n[4], n[5]], [n[6], n[7], n[8]]])
    };
    let (mut subject, mut span) = (Body::Mars, None);
    let (mut ecliptic, mut equatorial) = (Mat3::IDENTITY, Mat3::IDENTITY);
    let mut tracks: Vec<Track> = Vec::new();
    let mut events = Vec::new();
    for line in file.lines().filter(|line| !line.starts_with('#')) {
        let words: Vec<&str> = line.split(',').collect();
        match words[0] {
            "subject" => subject = words[1].parse().unwrap(),
            "span" => {
                span = Some(Span {
                    from: Tt::from_days(number(words[1])),
                    to: Tt::from_days(number(words[2])),
                });
            }
            "ecliptic" => ecliptic = matrix(&words[1..]),
            "equatorial" => equatorial = matrix(&words[1..]),
            "track" => {
                let body: Body = words[1].parse().unwrap();
                if tracks.last().is_none_or(|track| track.body != body) {
                    tracks.push(Track {
                        body,
                        points: Vec::new(),
                    });
                }
                tracks.last_mut().unwrap().points.push(TrackPoint {
                    instant: Tt::from_days(number(words[2])),
                    direction: Vec3::new(number(words[3]), number(words[4]), number(words[5])),
                    distance_au: number(words[6]),
                    magnitude: (!words[7].is_empty()).then(|| number(words[7])),
                    longitude_rate_per_day: Angle::from_degrees(number(words[8])),
                    elongation: Angle::from_degrees(number(words[9])),
                });
            }
            "event" => events.push(Event {
                body: subject,
                kind: kind(words[1]),
                instant: Tt::from_days(number(words[2])),
                value: match words[4] {
                    "lon" => EventValue::Longitude(Angle::from_degrees(number(words[3]))),
                    "elong" => EventValue::Elongation(Angle::from_degrees(number(words[3]))),
                    "au" => EventValue::DistanceAu(number(words[3])),
                    "mag" => EventValue::Magnitude(number(words[3])),
                    other => panic!("no unit {other}"),
                },
                with: None,
                cautions: Cautions::NONE,
            }),
            other => panic!("{name}: no row {other}"),
        }
    }
    let span = span.unwrap();
    let sun = tracks.pop().unwrap();
    let track = tracks.remove(0);
    assert_eq!((sun.body, track.body), (Body::Sun, subject));
    Season {
        subject,
        span,
        frame: StripFrame {
            epoch: span.middle(),
            ecliptic_from_icrs: ecliptic,
            equatorial_from_icrs: equatorial,
        },
        track,
        companions: tracks,
        sun,
        events,
        loops: Vec::new(),
        cautions: Cautions::NONE,
    }
}

fn civil(instant: Tt) -> NaiveDate {
    // TT and UTC differ by little more than a minute: of no matter for a label.
    let noon = NaiveDate::from_ymd_opt(2000, 1, 1).unwrap();
    noon + Days::new((instant.days() + 0.5).floor() as u64)
}

/// The words of a strip, with dates in UTC.
pub fn text(season: &Season, title: &str, span: &str) -> StripText {
    let mut dates = Vec::new();
    let mut day = civil(season.span.from);
    let epoch = NaiveDate::from_ymd_opt(2000, 1, 1).unwrap();
    while day <= civil(season.span.to) {
        let rank = match day.day() {
            1 => Some(DateRank::Month),
            11 | 21 => Some(DateRank::Day),
            6 | 16 | 26 => Some(DateRank::Fine),
            _ => None,
        };
        let instant = Tt::from_days((day - epoch).num_days() as f64 - 0.5 + 69.184 / 86_400.0);
        let form = match rank {
            Some(DateRank::Month) if day.month() == 1 => "%-d %b %Y",
            Some(DateRank::Month) => "%-d %b",
            _ => "%-d",
        };
        dates.extend(rank.map(|rank| StripDate {
            instant,
            label: day.format(form).to_string(),
            rank,
        }));
        day = day + Days::new(1);
    }
    StripText {
        title: title.to_owned(),
        place: "Hollow Tor".to_owned(),
        span: span.to_owned(),
        date_note: "dates at 0h UTC, a tick every 5 days".to_owned(),
        event_dates: season
            .events
            .iter()
            .map(|event| civil(event.instant).format("%-d %b").to_string())
            .collect(),
        cautions: match season.subject.is_inner_planet() {
            true => vec![
                "Never point optics or eyes near the Sun: wait until the whole disc has set beyond the true horizon, and stop before it rises.".to_owned(),
            ],
            false => Vec::new(),
        },
        dates,
    }
}
