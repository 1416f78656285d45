//! The star table against lists and programs outside the project.

use loopwright::sky::stars::{CATALOGUE_EPOCH, Star, StarCatalogue, StarTableError};
use loopwright::sky::{Angle, Tt, Vec3};

fn catalogue() -> &'static StarCatalogue {
    StarCatalogue::embedded().expect("the embedded table is sound")
}

fn by_hip(hip: u32) -> &'static Star {
    catalogue()
        .by_hip(hip)
        .unwrap_or_else(|| panic!("HIP {hip} is in the table"))
}

/// The rows of a CSV file with `#` comments and a header row.
fn rows(text: &'static str) -> impl Iterator<Item = Vec<&'static str>> {
    text.lines()
        .filter(|line| !line.starts_with('#'))
        .skip(1)
        .map(|line| line.split(',').collect())
}

fn number(text: &str) -> f64 {
    text.parse().expect("a number")
}

fn place(ra_degrees: f64, dec_degrees: f64) -> Vec3 {
    Vec3::from_spherical(
        Angle::from_degrees(ra_degrees),
        Angle::from_degrees(dec_degrees),
    )
}

#[test]
fn stars_stand_in_order_of_brightness_and_end_at_seven() {
    let stars = catalogue().stars();
    // The count follows from the source and its conversion; it guards against a table cut short.
    assert_eq!(stars.len(), 15_501);
    assert!(
        stars
            .windows(2)
            .all(|pair| pair[0].magnitude <= pair[1].magnitude)
    );
    assert!(stars.iter().all(|star| star.magnitude <= 7.0));
    let mut numbers: Vec<u32> = stars.iter().map(|star| star.hip).collect();
    numbers.sort_unstable();
    numbers.dedup();
    assert_eq!(numbers.len(), stars.len(), "each Hipparcos number once");
    // ReadMe of CDS I/311: numbers run to 120404.
    assert!(numbers.iter().all(|&hip| (1..=120_404).contains(&hip)));
    for star in stars {
        assert!((star.direction.norm() - 1.0).abs() < 1e-15);
        assert!(star.direction.dot(star.proper_motion).abs() < 1e-19);
    }
}

#[test]
fn brighter_slices_hold_what_they_say() {
    let all = catalogue();
    for limit in [-2.0, -1.0, 0.0, 2.5, 6.5, 7.0, 9.0] {
        let slice = all.to_magnitude(limit);
        assert_eq!(
            slice.len(),
            all.stars()
                .iter()
                .filter(|star| star.magnitude <= limit)
                .count()
        );
    }
    assert!(all.to_magnitude(f64::NAN).is_empty());
    assert_eq!(
        all.to_magnitude(-1.0).first().and_then(|star| star.name),
        Some("Sirius")
    );
}

/// tests/data/star_v_magnitudes.csv: V of the star list in ephem 4.2.1.
#[test]
fn magnitudes_converted_from_hp_agree_with_published_v() {
    let mut differences = Vec::new();
    for row in rows(include_str!("data/star_v_magnitudes.csv")) {
        let star = by_hip(row[1].parse().expect("a number"));
        let difference = star.magnitude - number(row[2]);
        // Red giants vary by a few tenths: Antares, Betelgeuse, Gacrux and Scheat have their mission median here.
        let allowed = if star.bv.is_some_and(|bv| bv >= 1.5) {
            0.15
        } else {
            0.055
        };
        assert!(difference.abs() < allowed, "{}: {difference:+.3}", row[0]);
        differences.push(difference);
    }
    assert!(differences.len() > 100);
    differences.sort_by(f64::total_cmp);
    let median = differences[differences.len() / 2];
    assert!(median.abs() < 0.01, "median {median:+.3}");
    differences.iter_mut().for_each(|d| *d = d.abs());
    differences.sort_by(f64::total_cmp);
    let typical = differences[differences.len() / 2];
    assert!(
        typical < 0.015,
        "median of absolute differences {typical:.3}"
    );
}

/// tests/data/star_motion.csv: `pmsafe` of pyerfa with the same catalogue, parallaxes included.
#[test]
fn places_agree_with_rigorous_space_motion_over_millennia() {
    let mut compared = 0;
    for row in rows(include_str!("data/star_motion.csv")) {
        let star = by_hip(row[0].parse().expect("a number"));
        let epoch = number(row[1]);
        let instant = Tt::from_julian_date(number(row[2]));
        let apart = star
            .direction_at(instant)
            .separation(place(number(row[3]), number(row[4])))
            .arcsec();
        // Rounding of the proper motion, up to 0.125 mas a year in each axis, and 1 mas of rounding of the place.
        // The witness also counts the light time across the path, which grows with the square of the years:
        // 0.1" in 3000 years for the fastest.
        let years = (epoch - 1991.25).abs();
        let allowed = 0.001 + 0.000_18 * years + 0.1 * (years / 3000.0) * (years / 3000.0);
        assert!(
            apart < allowed,
            "HIP {} at {epoch}: {apart:.4}\" against {allowed:.4}\"",
            row[0]
        );
        compared += 1;
    }
    assert!(compared > 100);
}

#[test]
fn motion_is_slow_at_the_epoch_and_never_leaves_the_sphere() {
    // Groombridge 1830, HIP 57939: 7.06" a year (the largest in the table; proper motions of CDS I/311:
    // 4003.98 and -5813.62 mas a year).
    let star = by_hip(57_939);
    assert_eq!(star.direction_at(CATALOGUE_EPOCH), star.direction.unit());
    let year = star
        .direction
        .separation(star.direction_at(CATALOGUE_EPOCH.plus_days(365.25)));
    assert!((year.arcsec() - f64::hypot(4003.98, 5813.62) / 1000.0).abs() < 0.001);
    for years in [-1e9, -1e5, 1e5, 1e9] {
        let there = star.direction_at(CATALOGUE_EPOCH.plus_days(years * 365.25));
        assert!((there.norm() - 1.0).abs() < 1e-15);
    }
}

/// Names with Hipparcos numbers as `skyfield.named_stars` 1.55 gives them (from Wikipedia's list of Hipparcos stars), where
/// its spelling is the IAU's.
#[test]
fn names_belong_to_the_right_stars() {
    for (name, hip) in [
        ("Achernar", 7588),
        ("Acrux", 60718),
        ("Aldebaran", 21421),
        ("Alphard", 46390),
        ("Alpheratz", 677),
        ("Altair", 97649),
        ("Antares", 80763),
        ("Arcturus", 69673),
        ("Bellatrix", 25336),
        ("Betelgeuse", 27989),
        ("Canopus", 30438),
        ("Capella", 24608),
        ("Castor", 36850),
        ("Deneb", 102098),
        ("Denebola", 57632),
        ("Dubhe", 54061),
        ("Fomalhaut", 113368),
        ("Hamal", 9884),
        ("Mirach", 5447),
        ("Nunki", 92855),
        ("Polaris", 11767),
        ("Pollux", 37826),
        ("Procyon", 37279),
        ("Regulus", 49669),
        ("Rigel", 24436),
        ("Rigil Kentaurus", 71683),
        ("Sirius", 32349),
        ("Spica", 65474),
        ("Vega", 91262),
        ("Zubenelgenubi", 72622),
    ] {
        let star = catalogue()
            .by_name(name)
            .unwrap_or_else(|| panic!("{name} has a name"));
        assert_eq!((star.hip, star.name), (hip, Some(name)));
        assert_eq!(
            catalogue().by_name(&format!(" {} ", name.to_uppercase())),
            Some(star)
        );
    }
    // IAU WGSN: the name of the bright double's other component.
    assert_eq!(
        catalogue().by_name("Toliman").map(|star| star.hip),
        Some(71681)
    );
    assert_eq!(
        catalogue()
            .stars()
            .iter()
            .filter(|star| star.name.is_some())
            .count(),
        343
    );
    assert_eq!(catalogue().by_name("No such star"), None);
    assert_eq!(catalogue().by_hip(0), None);
}

#[test]
fn colours_tell_red_stars_from_blue() {
    // B-V of well-known stars, from memory.
    for (name, expected) in [("Rigel", -0.03), ("Aldebaran", 1.54), ("Spica", -0.24)] {
        let bv = catalogue()
            .by_name(name)
            .and_then(|star| star.bv)
            .expect("a colour");
        assert!((bv - expected).abs() < 0.1, "{name}: {bv}");
    }
    assert_eq!(
        catalogue()
            .stars()
            .iter()
            .filter(|star| star.bv.is_none())
            .count(),
        8
    );
}

#[test]
fn damaged_tables_are_refused_with_a_reason() {
    let sound: &'static [u8] = include_bytes!("../assets/stars.bin");
    assert!(StarCatalogue::from_bytes(sound).is_ok());
    assert!(matches!(
        StarCatalogue::from_bytes(b""),
        Err(StarTableError::WrongFormat)
    ));
    assert!(matches!(
        StarCatalogue::from_bytes(b"LWSTARS9\0\0\0\0\0\0\0\0"),
        Err(StarTableError::WrongFormat)
    ));
    for length in [8, 15, 16, 40, sound.len() / 2, sound.len() - 1] {
        let cut = StarCatalogue::from_bytes(&sound[..length]);
        assert!(
            matches!(cut, Err(StarTableError::WrongLength { .. })),
            "cut to {length} bytes"
        );
    }
    let altered = |at: usize, value: u8| {
        let mut bytes = sound.to_vec();
        bytes[at] = value;
        StarCatalogue::from_bytes(Box::leak(bytes.into_boxed_slice()))
    };
    // The high byte of the first star's declination; the magnitude of the second; the star of the first name.
    assert!(matches!(
        altered(16 + 11, 0x7F),
        Err(StarTableError::BadEntry { offset: 16, .. })
    ));
    assert!(matches!(
        altered(16 + 20 + 17, 0x80),
        Err(StarTableError::BadEntry { offset: 36, .. })
    ));
    let first_name = 16 + 20 * 15_501;
    assert!(
        matches!(altered(first_name + 1, 0xFF), Err(StarTableError::BadEntry { offset, .. }) if offset == first_name)
    );
    assert!(
        matches!(altered(first_name + 3, 0xFF), Err(StarTableError::BadEntry { offset, .. }) if offset == first_name)
    );
    let message = altered(16 + 11, 0x7F).expect_err("refused").to_string();
    assert!(
        message.contains("byte 16") && message.contains("make_stars.py"),
        "{message}"
    );
}
