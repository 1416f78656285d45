//! Published worked examples and facts of the trade, from time to rising and setting.

use loopwright::season::Span;
use loopwright::season::horizon::{HorizonKind, horizon_events};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::delta_t::TimeTables;
use loopwright::sky::frames::mean_sidereal_time;
use loopwright::sky::place::{AU_KM, Sky};
use loopwright::sky::refraction::Air;
use loopwright::sky::{Angle, Body, Mat3, Site, Tt, Ut1, Vec3};
use proptest::prelude::*;

fn site(latitude: f64, longitude: f64) -> Site {
    Site {
        name: String::new(),
        latitude: Angle::from_degrees(latitude),
        longitude: Angle::from_degrees(longitude),
        elevation_m: 0.0,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.25,
    }
}

/// Meeus, Astronomical Algorithms, 2nd ed., example 47.a (1992 April 12.0 TD), recomputed from DE440: apparent
/// longitude 133.166724, latitude -3.229190, 368439 km.
#[test]
fn the_moon_of_1992_april_12() {
    let sky = Sky::de440().unwrap();
    let moon = sky
        .geocentre(Tt::from_julian_date(2_448_724.5))
        .unwrap()
        .place(Body::Moon)
        .unwrap();
    let seen = moon.ecliptic_of_date();
    assert!(
        (seen.longitude.degrees() - 133.166_724).abs() * 3600.0 < 0.02,
        "{}",
        seen.longitude.degrees()
    );
    assert!(
        (seen.latitude.degrees() + 3.229_190).abs() * 3600.0 < 0.02,
        "{}",
        seen.latitude.degrees()
    );
    assert!((moon.distance_au * AU_KM - 368_439.0).abs() < 1.0);
}

/// Apparent places of Jupiter at 0h UT1 as printed by the US Naval Observatory (file `usno/appgeo_jupiter.txt` in the
/// tests of the PyPI package ephem 4.2.1).
#[test]
fn jupiter_of_july_2008_as_published() {
    let sky = Sky::de440().unwrap();
    for (date, ra_seconds, dec_arcsec, distance_au) in [
        (
            "2008-07-25",
            19.0 * 3600.0 + 7.0 * 60.0 + 26.047,
            -(22.0 * 3600.0 + 45.0 * 60.0 + 58.37),
            4.191_907_851,
        ),
        (
            "2008-07-30",
            19.0 * 3600.0 + 4.0 * 60.0 + 58.666,
            -(22.0 * 3600.0 + 50.0 * 60.0 + 27.57),
            4.216_458_235,
        ),
    ] {
        let ut1 = Ut1::from_days(parse_utc(&format!("{date}T00:00:00Z")).unwrap().days());
        let jupiter = sky
            .geocentre(sky.tables().tt_from_ut1(ut1))
            .unwrap()
            .place(Body::Jupiter)
            .unwrap();
        let seen = jupiter.equatorial_of_date();
        // The table gives milliseconds and hundredths of an arcsecond, from an older ephemeris.
        assert!(
            (seen.longitude.hours() * 3600.0 - ra_seconds).abs() < 0.004,
            "{date}"
        );
        assert!((seen.latitude.arcsec() - dec_arcsec).abs() < 0.06, "{date}");
        // Printed is the distance without light time.
        assert!(
            (jupiter.geometric_distance_au() - distance_au).abs() < 2e-6,
            "{date}"
        );
    }
}

/// Meeus, example 15.a: Venus at Boston on 1988 March 20; recomputed from the example's own coordinates rise 12:25:26,
/// transit 19:40:30, set 02:54:39 UT (with the same standard altitude of -34').
#[test]
fn venus_over_boston_in_1988() {
    let sky = Sky::de440().unwrap();
    let boston = site(42.0 + 20.0 / 60.0, -(71.0 + 5.0 / 60.0));
    let tables = TimeTables::embedded();
    let tt = |text: &str| tables.tt_from_utc(parse_utc(text).unwrap());
    let span = Span {
        from: tt("1988-03-20T00:00:00Z"),
        to: tt("1988-03-21T00:00:00Z"),
    };
    let kinds = [
        HorizonKind::Rise,
        HorizonKind::UpperTransit,
        HorizonKind::Set,
    ];
    let found = horizon_events(&sky, &boston, Body::Venus, &kinds, span).unwrap();
    for (kind, expected) in [
        (HorizonKind::Rise, "1988-03-20T12:25:26Z"),
        (HorizonKind::UpperTransit, "1988-03-20T19:40:30Z"),
        (HorizonKind::Set, "1988-03-20T02:54:39Z"),
    ] {
        let event = found.iter().find(|event| event.kind == kind).unwrap();
        let off = (event.instant.days() - tt(expected).days()) * 86_400.0;
        // The example interpolates coordinates without parallax (18" at this distance) and to a second of time.
        assert!(off.abs() < 5.0, "{}: {off} s", kind.word());
    }
}

/// Common practice, no source: the sidereal day is about four minutes shorter than the solar day.
#[test]
fn the_sidereal_day_is_four_minutes_shorter() {
    let turn_after = |days: f64| {
        let at = |days: f64| mean_sidereal_time(Ut1::from_days(days), Tt::from_days(days));
        (at(9_000.0 + days) - at(9_000.0)).signed().degrees()
    };
    let minutes = turn_after(1.0) * 4.0;
    assert!((3.9..4.0).contains(&minutes), "{minutes}");
    assert!(turn_after(1.0 - minutes / 1_440.0).abs() < 0.02);
}

/// Common practice, no source: Mercury is seen only soon after sunset or before sunrise. It rises and sets within three
/// hours of the Sun at middle latitudes.
#[test]
fn mercury_keeps_close_to_the_sun() {
    let sky = Sky::de440().unwrap();
    let place = site(47.0, 13.0);
    for k in 0..120 {
        let from = Tt::from_days(9_000.0 + 3.0 * f64::from(k));
        let span = Span {
            from,
            to: from.plus_days(1.0),
        };
        let of = |body: Body| {
            let found = horizon_events(&sky, &place, body, &[HorizonKind::Set], span).unwrap();
            found[0].instant.days()
        };
        let hours = ((of(Body::Mercury) - of(Body::Sun)) * 24.0 + 12.0).rem_euclid(24.0) - 12.0;
        assert!(hours.abs() < 3.0, "{hours} h");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn wraps_are_idempotent_and_keep_the_direction(degrees in -1e6_f64..1e6) {
        let angle = Angle::from_degrees(degrees);
        let wrapped = angle.wrapped();
        prop_assert!((0.0..360.0).contains(&wrapped.degrees()));
        prop_assert_eq!(wrapped.wrapped(), wrapped);
        let signed = angle.signed();
        prop_assert!(signed.degrees() > -180.0 - 1e-12 && signed.degrees() <= 180.0 + 1e-12);
        prop_assert!((wrapped.sin() - angle.sin()).abs() < 1e-8);
        prop_assert!((signed.cos() - angle.cos()).abs() < 1e-8);
    }

    #[test]
    fn rotations_keep_lengths_and_undo(a in -400.0_f64..400.0, b in -400.0_f64..400.0, x in -2.0_f64..2.0, y in -2.0_f64..2.0, z in -2.0_f64..2.0) {
        let turn = Mat3::about_z(Angle::from_degrees(a)) * Mat3::about_x(Angle::from_degrees(b)) * Mat3::about_y(Angle::from_degrees(a - b));
        let v = Vec3::new(x, y, z);
        prop_assert!(((turn * v).norm() - v.norm()).abs() < 1e-13);
        prop_assert!((turn.transposed() * (turn * v) - v).norm() < 1e-13);
    }

    #[test]
    fn spherical_coordinates_round_trip(longitude in 0.0_f64..360.0, latitude in -89.9_f64..89.9) {
        let v = Vec3::from_spherical(Angle::from_degrees(longitude), Angle::from_degrees(latitude));
        prop_assert!((v.longitude().degrees() - longitude).abs() < 1e-9 || (v.longitude().degrees() - longitude).abs() > 360.0 - 1e-9);
        prop_assert!((v.latitude().degrees() - latitude).abs() < 1e-10);
    }

    /// Altitude and azimuth lead back to the direction they came from.
    #[test]
    fn horizontal_coordinates_round_trip(days in -20_000.0_f64..20_000.0, latitude in -90.0_f64..90.0, azimuth in 0.0_f64..360.0, altitude in -89.0_f64..89.0) {
        let sky = Sky::de440().unwrap();
        let vantage = sky.observer(&site(latitude, 11.0), Tt::from_days(days)).unwrap();
        let horizontal = loopwright::sky::place::Horizontal {
            azimuth: Angle::from_degrees(azimuth),
            altitude: Angle::from_degrees(altitude),
        };
        let back = vantage.horizontal(vantage.direction_at(horizontal).unwrap()).unwrap();
        prop_assert!((back.altitude.degrees() - altitude).abs() < 1e-9);
        prop_assert!((back.azimuth - horizontal.azimuth).signed().degrees().abs() < 1e-8);
    }
}
