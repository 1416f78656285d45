//! Sky brightness, extinction and limiting magnitude against the printed listing's numbers and other published models.

use loopwright::season::purposes::{Occasion, Purpose, default_conditions};
use loopwright::season::visibility::{
    Aid, Extinction, Haze, Moonlight, Sight, SightingKind, Viewer, Weather, limiting_magnitude,
    magnitudes_per_square_arcsec, nl_of_magnitudes_per_square_arcsec, sightings, sky_brightness_nl,
};
use loopwright::season::{SiteTracks, Span};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::Air;
use loopwright::sky::{Angle, Body, Site, Skyline};

fn degrees(value: f64) -> Angle {
    Angle::from_degrees(value)
}

/// The defaults of the listing in Schaefer 1998: 1000 m, 40 %, 15 degrees Celsius, latitude 30, February, 1998.
fn listed() -> Extinction {
    Extinction::of_place(
        1000.0,
        degrees(30.0),
        Weather {
            humidity: 0.4,
            temperature_c: 15.0,
            month: 2,
        },
    )
}

fn sight(zenith_distance: f64, sun_altitude: f64, sun_separation: f64) -> Sight {
    Sight {
        altitude: degrees(90.0 - zenith_distance),
        sun_altitude: degrees(sun_altitude),
        sun_separation: degrees(sun_separation),
        moon: None,
        year: 1998.0,
        skyglow_nl: 0.0,
    }
}

#[track_caller]
fn assert_close(ours: f64, expected: f64, tolerance: f64) {
    assert!(
        (ours - expected).abs() <= tolerance,
        "{ours} for {expected}"
    );
}

/// Schaefer 1998, *Sky & Telescope*, May, p. 57: the listing with its defaults, worked out apart from this program in Python.
#[test]
fn extinction_of_the_listing() {
    let k = listed();
    assert_close(k.gas, 0.0944, 5e-5);
    assert_close(k.aerosol, 0.0639, 5e-5);
    assert_close(k.ozone, 0.0329, 5e-5);
    assert_close(k.water, 0.0280, 5e-5);
    assert_close(k.total(), 0.2191, 1e-4);
    assert_close(k.loss(degrees(30.0)), 0.438, 5e-4);
    assert_close(k.loss(degrees(10.0)), 1.227, 5e-4);
    assert_close(k.loss(degrees(5.0)), 2.242, 5e-4);
}

/// The same listing: brightness (nL) and limiting magnitude at zenith distance, altitude of the Sun, distance from it.
#[test]
fn brightness_and_limit_of_the_listing() {
    let k = listed();
    for (zenith_distance, sun_altitude, separation, nl, limit) in [
        (0.0, -40.0, 130.0, 52.43, 6.420),
        (60.0, -40.0, 130.0, 65.73, 6.088),
        (85.0, -40.0, 130.0, 25.16, 4.719),
        (80.0, -6.0, 16.0, 7.318e6, 0.049),
        (85.0, -8.0, 13.0, 1.951e6, 0.016),
        (70.0, -12.0, 32.0, 8561.0, 3.453),
        (45.0, 45.0, 45.0, 9.986e8, -3.814),
    ] {
        let sight = sight(zenith_distance, sun_altitude, separation);
        let ours = sky_brightness_nl(&sight, &k);
        assert_close(ours / nl, 1.0, 1e-3);
        let loss = k.loss(sight.altitude);
        assert_close(
            limiting_magnitude(ours, loss, 1.0, Aid::NakedEye),
            limit,
            2e-3,
        );
    }
    // A full Moon (magnitude -12.73) 60 degrees off at 45 degrees.
    let moonlit = Sight {
        moon: Some(Moonlight {
            altitude: degrees(45.0),
            separation: degrees(60.0),
            magnitude: -12.73,
        }),
        ..sight(45.0, -40.0, 130.0)
    };
    let nl = sky_brightness_nl(&moonlit, &k);
    assert_close(nl / 2032.0, 1.0, 1e-3);
    let limit = limiting_magnitude(nl, k.loss(moonlit.altitude), 1.0, Aid::NakedEye);
    assert_close(limit, 3.888, 2e-3);
}

/// Zenith in twilight: the listing (13.55 to 19.51 mag per square arcsecond) and, as an independent witness, the fit of Patat
/// et al. 2006 (A&A 455, 385) for Paranal (coefficients from memory); such models agree to 0.4 magnitudes.
#[test]
fn twilight_at_the_zenith() {
    let k = listed();
    for (sun, listing, patat) in [
        (-6.0, 13.55, 13.30),
        (-8.0, 15.57, 15.88),
        (-10.0, 17.58, 18.00),
        (-12.0, 19.51, 19.67),
    ] {
        let nl = sky_brightness_nl(&sight(0.0, sun, 90.0 - sun), &k);
        let ours = magnitudes_per_square_arcsec(nl);
        assert_close(ours, listing, 0.01);
        assert_close(ours, patat, 0.43);
    }
}

/// Krisciunas and Schaefer 1991, *PASP* 103, 1033: their law worked out for k 0.172 (phase angle, distance from the Moon, zenith
/// distances of Moon and sky, nL); its stated accuracy is 8 to 23 percent. 79.0 nL are 21.587 mag per square arcsecond.
#[test]
fn moonlight_agrees_with_the_law_of_1991() {
    let listed = listed();
    let share = 0.172 / listed.total();
    let k = Extinction {
        gas: listed.gas * share,
        aerosol: listed.aerosol * share,
        ozone: listed.ozone * share,
        water: listed.water * share,
    };
    for (phase, separation, moon_z, z, nl) in [
        (0.0_f64, 60.0, 45.0, 45.0, 1588.9),
        (30.0, 60.0, 45.0, 45.0, 772.3),
        (90.0, 60.0, 45.0, 30.0, 121.8),
        (90.0, 30.0, 60.0, 60.0, 338.2),
    ] {
        let magnitude = -12.73 + 0.026 * phase + 4e-9 * phase.powi(4);
        let dark = sight(z, -40.0, 130.0);
        let lit = Sight {
            moon: Some(Moonlight {
                altitude: degrees(90.0 - moon_z),
                separation: degrees(separation),
                magnitude,
            }),
            ..dark
        };
        let ours = sky_brightness_nl(&lit, &k) - sky_brightness_nl(&dark, &k);
        assert!((ours / nl - 1.0).abs() < 0.35, "{ours} for {nl}");
    }
    assert_close(magnitudes_per_square_arcsec(79.0), 21.587, 2e-3);
    assert_close(nl_of_magnitudes_per_square_arcsec(21.587), 79.0, 0.1);
}

/// Contrast threshold of Crumey 2014 (MNRAS 442, 2600), full form, field factor 2, worked out apart: an independent witness.
/// Eyes differ by more than half a magnitude, and 18 lies where the listing has gone over from rods to cones.
#[test]
fn limits_agree_with_crumey() {
    for (surface, crumey) in [(22.0, 6.258), (21.0, 5.867), (18.0, 4.977)] {
        let nl = nl_of_magnitudes_per_square_arcsec(surface);
        let ours = limiting_magnitude(nl, 0.0, 1.0, Aid::NakedEye);
        assert!(
            (ours - crumey).abs() < 0.8,
            "{ours} for {crumey} at {surface}"
        );
    }
}

/// Smallest arc at which the listing lets a point show, Sun straight below, at 1000 m: worked out apart, rounded to 0.1.
#[test]
fn arcs_of_vision_of_the_listing() {
    let viewer = |acuity: f64| Viewer {
        extinction: listed(),
        acuity,
        skyglow_nl: 0.0,
        with_moon: false,
    };
    for (acuity, magnitude, arc) in [
        (1.0, -3.9, 7.9),
        (1.0, -2.0, 10.0),
        (1.0, 0.0, 12.8),
        (1.0, 1.0, 14.8),
        (2.0, -3.9, 6.5),
        (2.0, -2.0, 8.3),
        (2.0, 0.0, 10.6),
        (2.0, 1.0, 12.0),
    ] {
        let ours = viewer(acuity).arc_of_vision(magnitude).expect("it shows");
        assert_close(ours.arc.degrees(), arc, 0.25);
    }
}

/// Ptolemy, *Almagest* XIII.7 (from memory): arcs of vision of Saturn 11, Jupiter 10, Mars 11.5, Venus 5, Mercury 10. At first
/// sight those planets shine with about +1.0, -1.9, +1.5, -3.9 and -0.7 (common values, no source). Between a keen eye in
/// clear air and a usual eye in haze lies what he gives, but for Venus, which is seen at daylight by who knows where it is.
#[test]
fn historic_arcs_fall_in_the_range() {
    let eye = |acuity: f64, haze: Haze| {
        Viewer {
            extinction: listed(),
            acuity,
            skyglow_nl: 0.0,
            with_moon: false,
        }
        .through(haze)
    };
    for (magnitude, ptolemy) in [(1.0, 11.0), (-1.9, 10.0), (1.5, 11.5), (-0.7, 10.0)] {
        let keen = eye(2.0, Haze::Clear)
            .arc_of_vision(magnitude)
            .expect("it shows");
        let usual = eye(1.0, Haze::Hazy)
            .arc_of_vision(magnitude)
            .expect("it shows");
        assert!(
            keen.arc.degrees() - 1.5 <= ptolemy && ptolemy <= usual.arc.degrees(),
            "{magnitude}: {ptolemy} in {:?} to {:?}",
            keen.arc,
            usual.arc
        );
        assert!(keen.arc < usual.arc);
    }
}

fn site() -> Site {
    Site {
        name: "A roof".into(),
        latitude: degrees(37.0),
        longitude: degrees(-6.0),
        elevation_m: 100.0,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.26,
    }
}

fn span(sky: &Sky, from: &str, to: &str) -> Span {
    let tt = |text: &str| sky.tables().tt_from_utc(parse_utc(text).expect("a time"));
    Span {
        from: tt(from),
        to: tt(to),
    }
}

/// A measured extinction is kept whole, and haze only adds to it.
#[test]
fn the_air_of_a_site() {
    let usual = Extinction::of_site(&site(), 5);
    assert_close(usual.total(), 0.26, 1e-12);
    assert!(usual.aerosol > 0.0);
    let totals = Haze::ALL.map(|haze| usual.through(haze).total());
    assert!(totals[0] < totals[1] && totals[1] < totals[2]);
    let mut clean = site();
    clean.extinction_mag = 0.08;
    let clean = Extinction::of_site(&clean, 5);
    assert_close(clean.total(), 0.08, 1e-12);
    assert!(clean.aerosol >= 0.0);
}

/// Binoculars of 50 mm show stars of about magnitude 9 to 10.5 under a dark sky (common practice, no source), and help less
/// than that in bright twilight's company of the Moon; they always help.
#[test]
fn binoculars_help() {
    let k = listed();
    let dark = limiting_magnitude(52.4, k.loss(degrees(90.0)), 1.0, Aid::BINOCULARS);
    assert!((9.0..11.5).contains(&dark), "{dark}");
    for nl in [1.0, 100.0, 1e4, 1e6, 1e8] {
        let with = limiting_magnitude(nl, 0.3, 1.0, Aid::BINOCULARS);
        assert!(
            with > limiting_magnitude(nl, 0.3, 1.0, Aid::NakedEye) + 1.0,
            "{nl}"
        );
    }
}

/// Venus about its inferior conjunction of 2022 January 9 (skyfield 1.55 with JPL DE440: equal longitudes at 00:48 UTC): it
/// leaves the evening before it and enters the morning after it, in hazy air sooner and later than in clear.
#[test]
fn venus_between_evening_and_morning() {
    let sky = Sky::de440().expect("embedded");
    let site = site();
    let span = span(&sky, "2021-11-15T12:00:00Z", "2022-03-10T12:00:00Z");
    let tracks = SiteTracks::new(&sky, &site, Body::Venus, span).expect("covered");
    let viewer = Viewer::at(&site, 1);
    let found = sightings(&tracks, &viewer, &Skyline::default());
    let kinds: Vec<SightingKind> = found.iter().map(|sighting| sighting.kind).collect();
    assert!(
        kinds.contains(&SightingKind::EveningLast) && kinds.contains(&SightingKind::MorningFirst)
    );
    assert_eq!(kinds.len(), 2, "{found:?}");
    let conjunction = sky
        .tables()
        .tt_from_utc(parse_utc("2022-01-09T00:48:00Z").expect("a time"));
    for sighting in &found {
        let days = |at: loopwright::sky::Tt| at.days() - conjunction.days();
        let clear = days(sighting.clear);
        let usual = days(sighting.usual.expect("seen"));
        let hazy = days(sighting.hazy.expect("seen"));
        match sighting.kind {
            SightingKind::EveningLast => {
                assert!(hazy <= usual && usual <= clear && hazy < clear);
                assert!((-12.0..3.0).contains(&clear), "{clear}");
            }
            SightingKind::MorningFirst => {
                assert!(clear <= usual && usual <= hazy && clear < hazy);
                assert!((-3.0..12.0).contains(&clear), "{clear}");
            }
            _ => panic!("{found:?}"),
        }
    }
}

/// Common practice, from memory: the numbers a programme starts from.
#[test]
fn defaults_by_purpose() {
    let occasion = |subject: Body, magnitude: f64, culmination: f64| Occasion {
        subject,
        culmination: degrees(culmination),
        magnitude,
        viewer: Viewer::at(&site(), 5),
    };
    let mars = occasion(Body::Mars, -1.0, 36.0);
    let audience = default_conditions(Purpose::Audience, &mars);
    assert_eq!(audience.least_altitude, degrees(10.0));
    assert_eq!(audience.sun_below, degrees(-6.0));
    assert_eq!(audience.moon.expect("a rule").least_distance, degrees(3.0));
    let telescope = default_conditions(Purpose::AudienceAtTelescope, &mars);
    assert_eq!(telescope.least_altitude, degrees(20.0));
    let path = default_conditions(Purpose::Path, &mars);
    assert_eq!(path.sun_below, degrees(-12.0));
    assert_eq!(path.least_altitude, degrees(20.0));
    assert_eq!(path.moon.expect("a rule").least_distance, degrees(30.0));
    // Two thirds of 36 is less than 30.
    let disc = default_conditions(Purpose::Disc, &mars);
    assert_close(disc.least_altitude.degrees(), 24.0, 1e-9);
    assert!(disc.moon.is_none());
    assert_eq!(
        default_conditions(Purpose::Disc, &occasion(Body::Mars, -1.0, 60.0)).least_altitude,
        degrees(30.0)
    );
    // Venus shows in brighter twilight and lower than Mercury at its faintest.
    let venus = default_conditions(Purpose::Audience, &occasion(Body::Venus, -4.2, 30.0));
    let mercury = default_conditions(Purpose::Audience, &occasion(Body::Mercury, 1.0, 20.0));
    assert!(venus.sun_below > mercury.sun_below);
    assert!(venus.least_altitude < mercury.least_altitude);
    assert!(venus.sun_below <= degrees(-1.0));
}

/// Venus in the evening of 2023 May 20 (greatest elongation June 4, JPL DE440): it stands out more as the sky darkens, until the
/// air near the horizon takes it; the best moment lies between.
#[test]
fn venus_stands_out_most_between_dusk_and_setting() {
    let sky = Sky::de440().expect("embedded");
    let site = site();
    let night = span(&sky, "2023-05-20T18:00:00Z", "2023-05-21T03:00:00Z");
    let tracks = SiteTracks::new(&sky, &site, Body::Venus, night).expect("covered");
    let viewer = Viewer::at(&site, 5);
    // Sunset is at about 19:33 UTC, Venus sets about 22:40.
    let evening = span(&sky, "2023-05-20T19:40:00Z", "2023-05-20T22:30:00Z");
    let (best, margin) = viewer.best_within(&tracks, evening).expect("up");
    let at = |instant| {
        let local = tracks.at(instant).expect("inside");
        let margin = viewer.margin(&site, &local, Aid::NakedEye).expect("up");
        (margin, local.sun.altitude().degrees())
    };
    assert!((at(best).0 - margin).abs() < 1e-9);
    assert!(margin > at(evening.from).0 + 3.0 && margin > at(evening.to).0 + 0.5);
    // At that elongation twilight still counts until the Sun is some 18 degrees down.
    assert!((-20.0..-8.0).contains(&at(best).1), "{}", at(best).1);
    let altitude = tracks.at(best).expect("inside").subject.altitude();
    assert!(altitude.degrees() > 5.0, "{altitude:?}");
}
