//! Refraction, dip and airmass against published values and a general-purpose library.

use loopwright::sky::Angle;
use loopwright::sky::refraction::{
    Air, airmass, apparent_from_true, horizon_dip, true_from_apparent,
};
use proptest::prelude::*;

fn apparent_deg(true_deg: f64, air: &Air) -> f64 {
    apparent_from_true(Angle::from_degrees(true_deg), air).degrees()
}

fn true_deg(apparent_deg: f64, air: &Air) -> f64 {
    true_from_apparent(Angle::from_degrees(apparent_deg), air).degrees()
}

#[track_caller]
fn close(got: f64, published: f64, tolerance: f64) {
    assert!(
        (got - published).abs() <= tolerance,
        "{got:.9} against {published}, allowed {tolerance}"
    );
}

/// Bennett's formula evaluated apart, arcminutes at apparent altitudes; the first is Meeus, *Astronomical Algorithms*
/// 2nd ed., ex. 16.a (apparent 30', refraction 28.754', true 1.246').
#[test]
fn refraction_follows_bennetts_formula() {
    let air = Air::default();
    close(60.0 * true_deg(0.5, &air), 1.246, 0.0005);
    for (altitude, minutes) in [
        (0.0, 34.478),
        (1.0, 24.329),
        (5.0, 9.883),
        (10.0, 5.392),
        (45.0, 0.995),
    ] {
        close(
            60.0 * (altitude - true_deg(altitude, &air)),
            minutes,
            0.0005,
        );
    }
    // The same example the other way, there by another formula that agrees within 0.1': true 33.246', apparent 57.864'.
    close(60.0 * apparent_deg(33.246 / 60.0, &air), 57.864, 0.1);
}

/// tests/data/topo.csv: skyfield 1.55, Bennett's formula by iteration. That library takes 0.016667 degrees for an
/// arcminute and 0.28 P/(T + 273) for the scale at 1010 hPa and 10 C: the pressure here makes up for both.
#[test]
fn apparent_altitudes_follow_the_table() {
    let scale = 0.016_667 * 60.0 * 0.28 * 1010.0 / 283.0;
    let air = Air {
        pressure_hpa: 1010.0 * scale,
        temperature_c: 10.0,
    };
    let table = include_str!("data/topo.csv");
    let mut rows = table.lines().filter(|line| !line.starts_with('#'));
    let columns: Vec<&str> = rows.next().map(|line| line.split(',').collect()).unwrap();
    let column = |name: &str| columns.iter().position(|c| *c == name).unwrap();
    let (true_column, apparent_column) = (column("alt_deg"), column("alt_refr_deg"));
    let mut compared = 0;
    for row in rows {
        let fields: Vec<&str> = row.split(',').collect();
        // Blank below -1 degree, where that library applies none.
        if let Ok(expected) = fields[apparent_column].parse::<f64>() {
            let altitude = fields[true_column].parse::<f64>().unwrap();
            // Six digits in the table, on both sides.
            close(apparent_deg(altitude, &air), expected, 1.1e-6);
            compared += 1;
        }
    }
    assert!(compared >= 30, "{compared}");
}

/// Scale P/1010 * 283/(273 + T) (Meeus, *Astronomical Algorithms* 2nd ed., ch. 16), at one apparent altitude.
#[test]
fn refraction_scales_with_pressure_and_temperature() {
    let refraction = |pressure_hpa, temperature_c| {
        10.0 - true_deg(
            10.0,
            &Air {
                pressure_hpa,
                temperature_c,
            },
        )
    };
    let ordinary = refraction(1010.0, 10.0);
    close(refraction(505.0, 10.0) / ordinary, 0.5, 1e-9);
    close(
        refraction(1010.0, 293.0 - 273.0) / ordinary,
        283.0 / 293.0,
        1e-9,
    );
    close(refraction(0.0, 10.0), 0.0, 1e-12);
    close(apparent_deg(5.0, &Air::NONE), 5.0, 1e-12);
}

#[test]
fn refraction_keeps_its_value_below_one_degree_under_the_horizon() {
    let air = Air::default();
    let lift = apparent_deg(-1.0, &air) + 1.0;
    // Bennett at the apparent altitude itself, -0.36 degrees: cot(-0.36 + 7.31/4.04) = 39.5'.
    assert!((0.6..0.7).contains(&lift), "{lift}");
    for altitude in [-1.000_001, -5.0, -45.0, -90.0] {
        close(apparent_deg(altitude, &air) - altitude, lift, 1e-12);
    }
    assert!(apparent_deg(-0.9, &air) + 0.9 < lift);
}

#[test]
fn zenith_stays_at_the_zenith() {
    close(apparent_deg(90.0, &Air::default()), 90.0, 1e-12);
    close(true_deg(90.0, &Air::default()), 90.0, 1e-12);
}

#[test]
fn impossible_air_gives_finite_altitudes() {
    for pressure_hpa in [f64::NAN, -5.0, f64::INFINITY] {
        for temperature_c in [f64::NAN, -273.0, -1e9, 1e9] {
            let air = Air {
                pressure_hpa,
                temperature_c,
            };
            for altitude in [-90.0, -1.0, 0.0, 45.0] {
                assert!(apparent_deg(altitude, &air).is_finite());
                assert!(true_deg(altitude, &air).is_finite());
            }
        }
    }
}

/// Navigator's rule 1.76' sqrt(metres), and 0.97' sqrt(feet) (both from memory).
#[test]
fn dip_follows_the_navigators_rule() {
    for metres in [1.0, 2.0, 10.0, 50.0, 100.0_f64] {
        let minutes = 60.0 * horizon_dip(metres).degrees();
        close(minutes, 1.76 * metres.sqrt(), 0.002 * minutes);
        close(minutes, 0.97 * (metres / 0.3048).sqrt(), 0.003 * minutes);
    }
    assert_eq!(horizon_dip(0.0), Angle::ZERO);
    assert_eq!(horizon_dip(-3.0), Angle::ZERO);
}

/// Kasten and Young 1989, formula evaluated apart; 38 at the horizon is the paper's well-known value (from memory).
#[test]
fn airmass_follows_kasten_and_young() {
    for (altitude, published) in [
        (30.0, 1.9943),
        (10.0, 5.5860),
        (5.0, 10.3058),
        (0.0, 37.920),
    ] {
        close(airmass(Angle::from_degrees(altitude)), published, 0.0006);
    }
    close(airmass(Angle::QUARTER_TURN), 1.0, 0.0004);
    assert_eq!(airmass(Angle::from_degrees(-20.0)), airmass(Angle::ZERO));
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn both_directions_undo_each_other(
        altitude in prop_oneof![-90.0..=90.0_f64, -2.0..3.0_f64, 89.0..=90.0_f64],
        pressure_hpa in 0.0..=1200.0_f64,
        temperature_c in -60.0..=60.0_f64,
    ) {
        let air = Air { pressure_hpa, temperature_c };
        prop_assert!((true_deg(apparent_deg(altitude, &air), &air) - altitude).abs() < 1e-9);
        prop_assert!((apparent_deg(true_deg(altitude, &air), &air) - altitude).abs() < 1e-9);
    }

    #[test]
    fn higher_stays_higher(
        altitude in prop_oneof![-90.0..=90.0_f64, -2.0..3.0_f64, 89.0..=90.0_f64],
        higher_by in 1e-6..1.0_f64,
        pressure_hpa in 0.0..=1200.0_f64,
        temperature_c in -60.0..=60.0_f64,
    ) {
        let air = Air { pressure_hpa, temperature_c };
        prop_assert!(apparent_deg(altitude + higher_by, &air) > apparent_deg(altitude, &air));
        prop_assert!(true_deg(altitude + higher_by, &air) > true_deg(altitude, &air));
        // The air only lifts, and never past the zenith.
        prop_assert!(apparent_deg(altitude, &air) >= altitude);
        prop_assert!(apparent_deg(altitude, &air) <= 90.0 + 1e-12);
    }
}
