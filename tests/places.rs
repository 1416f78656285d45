//! Places against tables made from JPL DE440 with skyfield 1.55 (the head of each file in `tests/data` says how).

mod common;

use common::{degrees_apart, table};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::light::{MarsTerms, magnitude};
use loopwright::sky::physical::equatorial_diameter;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::{Air, apparent_from_true};
use loopwright::sky::{Angle, Body, Site, Ut1};

/// Apparent places of the Sun and planets: the table leaves out nothing but lets Jupiter and Saturn bend light too
/// (0.02" at most).
const PLANET_ARCSEC: f64 = 0.05;
const MOON_ARCSEC: f64 = 0.2;
const DISTANCE_RELATIVE: f64 = 1e-7;
const MAGNITUDE: f64 = 0.005;

#[test]
fn geocentric_places_agree_with_de440() {
    let sky = Sky::de440().unwrap();
    let rows = table("places.csv");
    assert!(rows.len() > 100);
    let mut worst = (0.0_f64, 0.0_f64);
    for row in &rows {
        let body: Body = row.text("body").parse().unwrap();
        let vantage = sky.geocentre(row.tt("jd_tt")).unwrap();
        let place = vantage.place(body).unwrap();
        let sun = vantage.place(Body::Sun).unwrap();
        let tolerance = if body == Body::Moon {
            MOON_ARCSEC
        } else {
            PLANET_ARCSEC
        };
        let equatorial = place.equatorial_of_date();
        let ecliptic = place.ecliptic_of_date();
        for (ours, column, cosine) in [
            (equatorial.longitude, "ra_deg", equatorial.latitude.cos()),
            (equatorial.latitude, "dec_deg", 1.0),
            (ecliptic.longitude, "lon_deg", ecliptic.latitude.cos()),
            (ecliptic.latitude, "lat_deg", 1.0),
        ] {
            let off = degrees_apart(ours.degrees(), row.number(column)) * 3600.0 * cosine;
            assert!(
                off.abs() < tolerance,
                "{body} {column} at {}: {off}\"",
                row.text("jd_tt")
            );
            let slot = if body == Body::Moon {
                &mut worst.1
            } else {
                &mut worst.0
            };
            *slot = slot.max(off.abs());
        }
        let relative = |ours: f64, column: &str| (ours / row.number(column) - 1.0).abs();
        assert!(
            relative(place.distance_au, "dist_au") < DISTANCE_RELATIVE,
            "{body}"
        );
        assert!(
            relative(place.geometric_distance_au(), "geo_dist_au") < DISTANCE_RELATIVE,
            "{body}"
        );
        let diameter = equatorial_diameter(&place.geometry()).arcsec();
        assert!(
            (diameter - row.number("angdiam_arcsec")).abs() < 1e-3,
            "{body} {diameter}"
        );
        if body != Body::Sun {
            let geometry = place.geometry();
            let elongation = place.separation(&sun).degrees() - row.number("elong_deg");
            assert!(elongation.abs() * 3600.0 < tolerance, "{body} elongation");
            let phase = geometry.phase_angle().degrees() - row.number("phase_deg");
            assert!(phase.abs() * 3600.0 < 0.5, "{body} phase angle {phase}");
            assert!(
                (geometry.lit_fraction() - row.number("illum")).abs() < 1e-6,
                "{body}"
            );
            assert!(
                relative(geometry.sun_distance_au(), "sunr_au") < DISTANCE_RELATIVE,
                "{body}"
            );
            if let Some(expected) = row.maybe("mag") {
                let ours = magnitude(&geometry, MarsTerms::Omit).value;
                assert!(
                    (ours - expected).abs() < MAGNITUDE,
                    "{body} {ours} against {expected}"
                );
            }
        }
    }
    println!(
        "worst: planets and Sun {:.4}\", Moon {:.4}\"",
        worst.0, worst.1
    );
}

fn site_of(row: &common::Row) -> Site {
    Site {
        name: String::from("reference"),
        latitude: Angle::from_degrees(row.number("lat_deg")),
        longitude: Angle::from_degrees(row.number("lon_deg")),
        elevation_m: row.number("elev_m"),
        height_above_surroundings_m: 0.0,
        // The table scales refraction by 0.28 P / (T + 273) = 0.999293 at 1010 hPa and 10 degrees.
        air: Air {
            pressure_hpa: 1010.0 * 0.999_293,
            temperature_c: 10.0,
        },
        extinction_mag: 0.25,
    }
}

const ALTITUDE_ARCSEC: f64 = 0.3;
const MOON_ALTITUDE_ARCSEC: f64 = 0.6;
/// Both tables of UT1 are interpolated; the program's own is within 1 ms of IERS values.
const UT1_SECONDS: f64 = 0.002;
/// The table gives refracted altitudes to a millionth of a degree.
const REFRACTED_ARCSEC: f64 = 0.5;

#[test]
fn topocentric_places_agree_with_de440() {
    let sky = Sky::de440().unwrap();
    let rows = table("topo.csv");
    assert!(rows.len() > 50);
    let mut worst = 0.0_f64;
    for row in &rows {
        let body: Body = row.text("body").parse().unwrap();
        let utc = parse_utc(row.text("utc")).unwrap();
        let ut1 = Ut1::from_days(utc.days()).plus_seconds(row.number("dut1_s"));
        let site = site_of(row);
        let vantage = sky.observer_at_ut1(&site, row.tt("jd_tt"), ut1).unwrap();
        let place = vantage.place(body).unwrap();
        let seen = vantage.horizontal(place.apparent).unwrap();
        let tolerance = if body == Body::Moon {
            MOON_ALTITUDE_ARCSEC
        } else {
            ALTITUDE_ARCSEC
        };
        let altitude = (seen.altitude.degrees() - row.number("alt_deg")) * 3600.0;
        let azimuth = degrees_apart(seen.azimuth.degrees(), row.number("az_deg"))
            * 3600.0
            * seen.altitude.cos();
        assert!(altitude.abs() < tolerance, "{body} altitude {altitude}\"");
        assert!(azimuth.abs() < tolerance, "{body} azimuth {azimuth}\"");
        worst = worst.max(altitude.abs()).max(azimuth.abs());
        if let Some(expected) = row.maybe("alt_refr_deg") {
            let apparent = apparent_from_true(seen.altitude, &site.air).degrees();
            assert!(
                (apparent - expected).abs() * 3600.0 < REFRACTED_ARCSEC + tolerance,
                "{body} {apparent}"
            );
        }
        let equatorial = place.equatorial_of_date();
        let right_ascension =
            degrees_apart(equatorial.longitude.degrees(), row.number("topo_ra_deg"));
        assert!(
            right_ascension.abs() * 3600.0 * equatorial.latitude.cos() < tolerance,
            "{body}"
        );
        let declination = equatorial.latitude.degrees() - row.number("topo_dec_deg");
        assert!(declination.abs() * 3600.0 < tolerance, "{body}");
        assert!(
            (place.distance_au / row.number("topo_dist_au") - 1.0).abs() < 4e-7,
            "{body}"
        );
        // UT1 from the program's own tables.
        let own = sky.tables().ut1_from_tt(row.tt("jd_tt"));
        let off = (own.days() - ut1.days()) * 86_400.0;
        // What was a forecast when the table was made has been measured since.
        let limit = if row.text("utc") < "2025" {
            UT1_SECONDS
        } else {
            0.02
        };
        assert!(
            off.abs() < limit,
            "{body} {}: UT1 off by {off} s",
            row.text("utc")
        );
    }
    println!("worst: {worst:.4}\"");
}

/// Meeus, Astronomical Algorithms, 2nd ed., example 33.a (Venus, 1992 December 20.0 TD), and the same date's other
/// planets as recomputed from DE440; right ascension in hours, declination in degrees.
#[test]
fn worked_example_of_venus_1992() {
    let sky = Sky::de440().unwrap();
    let vantage = sky
        .geocentre(loopwright::sky::Tt::from_julian_date(2_448_976.5))
        .unwrap();
    let hms = |h: f64, m: f64, s: f64| h + m / 60.0 + s / 3600.0;
    for (body, ra_hours, dec_degrees) in [
        (Body::Venus, hms(21.0, 4.0, 41.457), -hms(18.0, 53.0, 16.84)),
        (
            Body::Mercury,
            hms(16.0, 33.0, 59.289),
            -hms(20.0, 53.0, 31.57),
        ),
        (Body::Mars, hms(7.0, 48.0, 35.361), hms(24.0, 35.0, 33.90)),
        (
            Body::Jupiter,
            hms(12.0, 47.0, 9.633),
            -hms(3.0, 41.0, 55.23),
        ),
    ] {
        let seen = vantage.place(body).unwrap().equatorial_of_date();
        assert!(
            (seen.longitude.hours() - ra_hours).abs() * 3600.0 < 0.003,
            "{body} {}",
            seen.longitude.hours()
        );
        assert!(
            (seen.latitude.degrees() - dec_degrees).abs() * 3600.0 < 0.05,
            "{body}"
        );
    }
}

/// Meeus, example 25.b (Sun, 1992 October 13.0 TD), recomputed from DE440: longitude 199°54'21.591", latitude 0.746",
/// distance 0.99760852 au.
#[test]
fn worked_example_of_the_sun_1992() {
    let sky = Sky::de440().unwrap();
    let vantage = sky
        .geocentre(loopwright::sky::Tt::from_julian_date(2_448_908.5))
        .unwrap();
    let sun = vantage.place(Body::Sun).unwrap();
    let seen = sun.ecliptic_of_date();
    assert!(
        (seen.longitude.degrees() - (199.0 + 54.0 / 60.0 + 21.591 / 3600.0)).abs() * 3600.0 < 0.02
    );
    assert!((seen.latitude.arcsec() - 0.746).abs() < 0.02);
    assert!((sun.distance_au - 0.997_608_52).abs() < 2e-8);
}

/// The analytic rates are the derivatives of the places themselves.
#[test]
fn rates_agree_with_differences() {
    let sky = Sky::de440().unwrap();
    let site: Site = Site {
        name: String::new(),
        latitude: Angle::from_degrees(51.0),
        longitude: Angle::from_degrees(9.0),
        elevation_m: 300.0,
        height_above_surroundings_m: 0.0,
        air: Air {
            pressure_hpa: 1010.0,
            temperature_c: 10.0,
        },
        extinction_mag: 0.25,
    };
    for (k, &body) in Body::ALL.iter().enumerate() {
        for site in [None, Some(&site)] {
            let days = 9_000.3 + 71.7 * k as f64;
            let at = |days: f64| {
                let tt = loopwright::sky::Tt::from_days(days);
                let vantage = match site {
                    Some(site) => sky.observer(site, tt).unwrap(),
                    None => sky.geocentre(tt).unwrap(),
                };
                (
                    vantage.place(body).unwrap(),
                    vantage.place(Body::Sun).unwrap(),
                )
            };
            let h = 0.005;
            let (here, sun) = at(days);
            let difference = |f: &dyn Fn(
                &(loopwright::sky::place::Place, loopwright::sky::place::Place),
            ) -> Angle| {
                // Four points, so that the hourly sway of topocentric places is followed.
                let d1 = (f(&at(days + h)) - f(&at(days - h))).signed().arcsec() / (2.0 * h);
                let d2 = (f(&at(days + 2.0 * h)) - f(&at(days - 2.0 * h)))
                    .signed()
                    .arcsec()
                    / (4.0 * h);
                (4.0 * d1 - d2) / 3.0
            };
            let rates = [
                (
                    here.ecliptic_rate().longitude,
                    difference(&|p| p.0.ecliptic_of_date().longitude),
                ),
                (
                    here.ecliptic_rate().latitude,
                    difference(&|p| p.0.ecliptic_of_date().latitude),
                ),
                (
                    here.equatorial_rate().longitude,
                    difference(&|p| p.0.equatorial_of_date().longitude),
                ),
                (
                    here.equatorial_rate().latitude,
                    difference(&|p| p.0.equatorial_of_date().latitude),
                ),
            ];
            // The Moon's fitted velocity is less smooth, and terms of v^2/c^2 grow with the daily turn.
            let tolerance = if body == Body::Moon { 0.5 } else { 0.05 };
            for (ours, theirs) in rates {
                assert!(
                    (ours.arcsec() - theirs).abs() < tolerance,
                    "{body} {} {theirs}",
                    ours.arcsec()
                );
            }
            if body != Body::Sun {
                let theirs = difference(&|p| p.0.separation(&p.1));
                assert!(
                    (here.separation_rate(&sun).arcsec() - theirs).abs() < tolerance,
                    "{body}"
                );
            }
        }
    }
}
