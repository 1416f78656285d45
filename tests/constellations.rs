//! The constellations against Roman's examples and other programs.

use std::collections::{BTreeMap, BTreeSet};

use loopwright::sky::constellations::{Constellation, boundary_polylines};
use loopwright::sky::{Angle, Mat3, Vec3};
use proptest::prelude::*;

fn place(ra_degrees: f64, dec_degrees: f64) -> Vec3 {
    Vec3::from_spherical(
        Angle::from_degrees(ra_degrees),
        Angle::from_degrees(dec_degrees),
    )
}

/// ICRS from the mean equator and equinox of a date, IAU 2006 with frame bias, by the crate sofars.
fn icrs_from_mean_of(julian_date: f64) -> Mat3 {
    Mat3::from_rows(sofars::pnp::pmat06(julian_date, 0.0)).transposed()
}

/// Julian Date of a Besselian epoch (Lieske 1979, A&A 73, 282).
fn besselian(epoch: f64) -> f64 {
    2_415_020.313_52 + (epoch - 1900.0) * 365.242_198_781
}

fn abbreviation_at(icrs: Vec3) -> &'static str {
    Constellation::at_icrs(icrs).abbreviation()
}

/// ReadMe of CDS VI/42 (Roman 1987), as quoted in astropy 8.0.2, coordinates/tests/test_funcs.py: right ascension in hours, declination in degrees, B1950.
#[test]
fn examples_of_the_published_table_are_met() {
    let icrs = icrs_from_mean_of(besselian(1950.0));
    for (hours, degrees, expected) in [
        (9.0, 65.0, "UMa"),
        (23.5, -20.0, "Aqr"),
        (5.12, 9.12, "Ori"),
        (9.4555, -19.9, "Hya"),
        (12.8888, 22.0, "Com"),
        (15.6687, -12.1234, "Lib"),
        (19.0, -40.0, "CrA"),
        (6.2222, -81.1234, "Men"),
    ] {
        assert_eq!(
            abbreviation_at(icrs * place(hours * 15.0, degrees)),
            expected,
            "{hours} h, {degrees}"
        );
    }
}

/// skyfield 1.55, tests/test_constellations.py.
#[test]
fn edge_cases_of_another_program_are_met() {
    for (hours, degrees, expected) in [
        (0.0, 0.0, "Psc"),
        (24.0, 90.0, "UMi"),
        (4.65, 0.0, "Eri"),
        (4.75, 0.3, "Ori"),
    ] {
        assert_eq!(
            abbreviation_at(place(hours * 15.0, degrees)),
            expected,
            "ICRS {hours} h, {degrees}"
        );
    }
    let icrs = icrs_from_mean_of(besselian(1875.0));
    for (hours, degrees, expected) in [
        (18.1747, 39.0, "Her"),
        (18.1753, 39.0, "Lyr"),
        // The table as first printed had this wrong.
        (16.323_165, -18.848_203, "Sco"),
    ] {
        assert_eq!(
            abbreviation_at(icrs * place(hours * 15.0, degrees)),
            expected,
            "B1875 {hours} h, {degrees}"
        );
    }
}

/// tests/data/constellations_random.csv: astropy.coordinates.get_constellation.
#[test]
fn random_directions_agree_with_astropy() {
    let mut seen = BTreeSet::new();
    let mut compared = 0;
    for line in include_str!("data/constellations_random.csv").lines() {
        let fields: Vec<&str> = line.split(',').collect();
        let [ra, dec, expected] = fields[..] else {
            continue;
        };
        let (Ok(ra), Ok(dec)) = (ra.parse(), dec.parse()) else {
            continue;
        };
        assert_eq!(abbreviation_at(place(ra, dec)), expected, "{ra}, {dec}");
        seen.insert(expected);
        compared += 1;
    }
    assert_eq!(compared, 600);
    assert_eq!(seen.len(), 84);
}

/// IAU 2006 precession with frame bias, by the crate sofars, which is apart from the matrix in the program.
#[test]
fn edges_are_carried_by_the_stated_precession() {
    let b1875 = icrs_from_mean_of(besselian(1875.0)).transposed();
    // Both sides of the hour circle of 18.1750 h between Hercules and Lyra, 0.05" from it.
    let offset = 0.05 / 3600.0 / Angle::from_degrees(39.0).cos();
    for (sign, expected) in [(-1.0, "Her"), (1.0, "Lyr")] {
        let there = b1875.transposed() * place(18.175 * 15.0 + sign * offset, 39.0);
        assert_eq!(abbreviation_at(there), expected);
    }
    // And of the parallel of 88 degrees that ends Cepheus at 3 h.
    for (degrees, expected) in [(88.0 - 0.05 / 3600.0, "Cep"), (88.0 + 0.05 / 3600.0, "UMi")] {
        assert_eq!(
            abbreviation_at(b1875.transposed() * place(45.0, degrees)),
            expected
        );
    }
}

#[test]
fn eighty_eight_names_are_there_and_all_are_reached() {
    let all: Vec<Constellation> = Constellation::all().collect();
    assert_eq!(all.len(), 88, "IAU 1922, 1930");
    let distinct = |text: fn(Constellation) -> &'static str| {
        all.iter().map(|&c| text(c)).collect::<BTreeSet<_>>().len()
    };
    assert_eq!(distinct(Constellation::abbreviation), 88);
    assert_eq!(distinct(Constellation::name), 88);
    assert_eq!(distinct(Constellation::genitive), 88);
    for &constellation in &all {
        assert_eq!(constellation.abbreviation().len(), 3);
        assert_eq!(
            Constellation::by_abbreviation(&constellation.abbreviation().to_lowercase()),
            Some(constellation)
        );
    }
    assert_eq!(Constellation::by_abbreviation("Xyz"), None);

    // Areas from a grid of one degree, against square degrees of the IAU's constellations (from memory; the first two are
    // the largest, the last the smallest).
    let mut area: BTreeMap<&str, f64> = BTreeMap::new();
    for dec in 0..180 {
        let dec = f64::from(dec) - 89.5;
        for ra in 0..360 {
            *area
                .entry(abbreviation_at(place(f64::from(ra) + 0.5, dec)))
                .or_default() += Angle::from_degrees(dec).cos();
        }
    }
    assert_eq!(area.len(), 88, "all are reached");
    for (name, expected) in [
        ("Hya", 1303.0),
        ("Vir", 1294.0),
        ("Ori", 594.0),
        ("Leo", 947.0),
        ("Cru", 68.0),
    ] {
        assert!(
            (area[name] - expected).abs() < 0.01 * expected + 6.0,
            "{name}: {}",
            area[name]
        );
    }
}

/// Latin names as in `skyfield.api.load_constellation_names` 1.55; genitives from memory of the IAU's list.
#[test]
fn names_and_genitives_are_spelt_right() {
    for (abbreviation, name, genitive) in [
        ("Ari", "Aries", "Arietis"),
        ("Cha", "Chamaeleon", "Chamaeleontis"),
        ("CVn", "Canes Venatici", "Canum Venaticorum"),
        ("Leo", "Leo", "Leonis"),
        ("Oph", "Ophiuchus", "Ophiuchi"),
        ("PsA", "Piscis Austrinus", "Piscis Austrini"),
        ("Psc", "Pisces", "Piscium"),
        ("Sgr", "Sagittarius", "Sagittarii"),
        ("UMa", "Ursa Major", "Ursae Majoris"),
        ("Vir", "Virgo", "Virginis"),
    ] {
        let constellation = Constellation::by_abbreviation(abbreviation).expect("one of the 88");
        assert_eq!(
            (constellation.name(), constellation.genitive()),
            (name, genitive)
        );
        assert_eq!(constellation.to_string(), name);
    }
}

#[test]
fn anchors_lie_well_inside_their_constellations() {
    let edges: Vec<Vec3> = boundary_polylines()
        .iter()
        .flat_map(|b| b.points.iter().copied())
        .collect();
    for constellation in Constellation::all() {
        let anchors = constellation.anchors();
        // Serpens is the only one in two parts.
        assert_eq!(
            anchors.len(),
            if constellation.abbreviation() == "Ser" {
                2
            } else {
                1
            }
        );
        for anchor in anchors {
            assert_eq!(Constellation::at_icrs(anchor), constellation);
            let nearest = edges
                .iter()
                .map(|edge| edge.separation(anchor).degrees())
                .fold(f64::INFINITY, f64::min);
            assert!(nearest > 1.0, "{constellation}: {nearest}");
        }
    }
}

#[test]
fn boundaries_divide_the_two_they_name() {
    let boundaries = boundary_polylines();
    let mut touched = BTreeSet::new();
    for boundary in boundaries {
        let [first, second] = boundary.between;
        assert!(first < second);
        touched.extend(boundary.between);
        for pair in boundary.points.windows(2) {
            let length = pair[0].separation(pair[1]);
            assert!(length.degrees() <= 0.5 + 1e-9 && length.arcsec() > 1.0);
            // 10" to the left and to the right of the middle of each piece stand the two constellations.
            let middle = (pair[0] + pair[1]).unit();
            let side =
                (pair[1] - pair[0]).cross(middle).unit() * Angle::from_arcsec(10.0).radians();
            let sides = BTreeSet::from([
                Constellation::at_icrs(middle + side),
                Constellation::at_icrs(middle - side),
            ]);
            assert_eq!(sides, BTreeSet::from(boundary.between));
        }
    }
    assert_eq!(touched.len(), 88);
}

/// The other way round: wherever the constellation changes along a path, a drawn edge is near.
#[test]
fn every_change_of_constellation_has_an_edge() {
    let edges: Vec<Vec3> = boundary_polylines()
        .iter()
        .flat_map(|b| b.points.iter().copied())
        .collect();
    let mut changes = 0;
    for (node, inclination) in [(0.0, 23.4), (40.0, 70.0), (130.0, 88.0), (250.0, -50.0)] {
        let tilt = Mat3::about_z(Angle::from_degrees(-node))
            * Mat3::about_x(Angle::from_degrees(-inclination));
        let mut before = tilt * place(0.0, 0.0);
        for step in 1..=3600 {
            let here = tilt * place(f64::from(step) * 0.1, 0.0);
            if Constellation::at_icrs(here) != Constellation::at_icrs(before) {
                changes += 1;
                let nearest = edges
                    .iter()
                    .map(|edge| edge.separation(here).degrees())
                    .fold(f64::INFINITY, f64::min);
                // Half the spacing of the points and the step along the path.
                assert!(nearest < 0.36, "{nearest}");
            }
            before = here;
        }
    }
    assert!(changes > 60);
}

proptest! {
    #[test]
    fn no_direction_makes_it_fail(x in any::<f64>(), y in any::<f64>(), z in any::<f64>()) {
        let _ = Constellation::at_icrs(Vec3::new(x, y, z));
    }
}

#[test]
fn poles_and_right_ascension_zero_have_constellations() {
    let icrs = icrs_from_mean_of(besselian(1875.0));
    assert_eq!(abbreviation_at(icrs * Vec3::new(0.0, 0.0, 1.0)), "UMi");
    assert_eq!(abbreviation_at(icrs * Vec3::new(0.0, 0.0, -1.0)), "Oct");
    for tiny in [0.0, -0.0, 1e-300, -1e-300, 1e-17, -1e-17, 1e-12, -1e-12] {
        assert_eq!(abbreviation_at(icrs * Vec3::new(1.0, tiny, 0.0)), "Psc");
        assert_eq!(abbreviation_at(icrs * Vec3::new(tiny, tiny, -1.0)), "Oct");
        assert_eq!(abbreviation_at(icrs * Vec3::new(tiny, -tiny, 1.0)), "UMi");
    }
}
