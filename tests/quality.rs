//! Scores of nights, best runs, and what of a globe is seen.

use loopwright::season::Span;
use loopwright::season::purposes::Purpose;
use loopwright::season::quality::{
    GlobeSpell, Judged, PartName, Weights, best_run, globe, longitudes_seen, meridian_passages,
    score,
};
use loopwright::season::spells::{BestBecause, BestMoment, Edge, EdgeCause, Spell};
use loopwright::sky::physical::LongitudeSystem;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::Air;
use loopwright::sky::{Angle, Cautions, Site, Tt};

fn degrees(value: f64) -> Angle {
    Angle::from_degrees(value)
}

fn spell(altitude: f64, minutes: f64) -> Spell {
    let edge = |instant: Tt| Edge {
        instant,
        cause: EdgeCause::Hours,
        uncertainty_minutes: 0.0,
    };
    let start = Tt::from_days(9_800.0);
    Spell {
        start: edge(start),
        finish: edge(start.plus_seconds(60.0 * minutes)),
        best: BestMoment {
            instant: start,
            because: BestBecause::Culminates,
            altitude: degrees(altitude),
            azimuth: degrees(180.0),
            skyline: Angle::ZERO,
            sun_altitude: degrees(-15.0),
            moon_altitude: degrees(-10.0),
            moon_separation: degrees(40.0),
            moon_lit_fraction: 1.0,
            magnitude: -1.0,
            diameter: Angle::from_arcsec(12.0),
        },
        cautions: Cautions::NONE,
    }
}

fn judged(spell: &Spell) -> Judged<'_> {
    Judged {
        spell,
        extinction_mag: 0.25,
        margin_mag: Some(6.0),
        largest_diameter: Angle::from_arcsec(16.0),
        dispersion: None,
        wanted_minutes: None,
    }
}

/// Seeing grows with the airmass to the power 0.6 (Kolmogorov): at airmass 2 (altitude 30; Kasten and Young give 1.9943) it is
/// 1.516 times as wide.
#[test]
fn the_score_of_a_disc_is_the_product_of_its_parts() {
    let spell = spell(30.0, 30.0);
    let score = score(Purpose::Disc, &judged(&spell), &Weights::default());
    let part = |name: PartName| {
        let found = score.parts.iter().find(|part| part.name == name);
        found.expect("the part").value
    };
    assert!((1.0 / part(PartName::Height) - 1.9943_f64.powf(0.6)).abs() < 1e-4);
    // 30 of 60 minutes; 12 of 16 arcseconds.
    assert!((part(PartName::Length) - 0.5).abs() < 1e-9);
    assert!((part(PartName::Diameter) - 0.75).abs() < 1e-12);
    let product: f64 = score.parts.iter().map(|part| part.value).product();
    assert!((score.value - product).abs() < 1e-12);
    assert_eq!(score.weakest().expect("a part").name, PartName::Length);
}

#[test]
fn weights_are_exponents_and_zero_closes_the_night() {
    let spell = spell(30.0, 30.0);
    let plain = score(Purpose::Disc, &judged(&spell), &Weights::default()).value;
    let squared = Weights {
        length: 2.0,
        ..Weights::default()
    };
    let ours = score(Purpose::Disc, &judged(&spell), &squared).value;
    assert!((ours - plain * 0.5).abs() < 1e-9);
    let ignored = Weights {
        length: 0.0,
        ..Weights::default()
    };
    let ours = score(Purpose::Disc, &judged(&spell), &ignored).value;
    assert!((ours - plain / 0.5).abs() < 1e-9);
    // Nothing stands out from the sky where the margin is negative.
    let hidden = Judged {
        margin_mag: Some(-0.5),
        ..judged(&spell)
    };
    assert_eq!(
        score(Purpose::Audience, &hidden, &Weights::default()).value,
        0.0
    );
    let wrong = Judged {
        margin_mag: Some(f64::NAN),
        ..judged(&spell)
    };
    assert_eq!(
        score(Purpose::Audience, &wrong, &Weights::default()).value,
        0.0
    );
}

#[test]
fn moon_and_dispersion_take_their_share() {
    let dark = spell(40.0, 60.0);
    let mut moonlit = dark.clone();
    moonlit.best.moon_altitude = degrees(30.0);
    let of = |spell: &Spell, purpose| score(purpose, &judged(spell), &Weights::default()).value;
    assert!(of(&moonlit, Purpose::Path) < of(&dark, Purpose::Path));
    assert!(of(&moonlit, Purpose::Audience) < of(&dark, Purpose::Audience));
    assert_eq!(of(&moonlit, Purpose::Disc), of(&dark, Purpose::Disc));
    let spread = Judged {
        dispersion: Some(Angle::from_arcsec(2.0)),
        ..judged(&dark)
    };
    let ours = score(Purpose::Disc, &spread, &Weights::default()).value;
    assert!((ours - 0.5 * of(&dark, Purpose::Disc)).abs() < 1e-12);
}

#[test]
fn the_best_run_is_the_greatest_sum() {
    let scores = [0.1, 0.9, 0.0, 0.8, 0.7, 0.6, 0.2, 0.9];
    let run = best_run(&scores, 3).expect("a run");
    assert_eq!(run.nights, 3..6);
    assert!((run.mean - 0.7).abs() < 1e-12);
    assert_eq!(best_run(&scores, 0), None);
    assert_eq!(best_run(&scores, 9), None);
    assert_eq!(best_run(&[0.0; 5], 2), None);
    assert_eq!(best_run(&[0.5; 5], 2).expect("a run").nights, 0..2);
}

/// JPL's row for Mars on 2020 January 1, 0h UT: sub-observer west longitude 44.6699 (light time allowed for); the map drifts by
/// 0.2437 degrees a minute (IAU WGCCRE 2015: a turn in 24.6229 h).
#[test]
fn the_globe_of_mars_turns() {
    let sky = Sky::de440().expect("embedded");
    let site = Site {
        name: String::new(),
        latitude: degrees(0.0),
        longitude: degrees(0.0),
        elevation_m: 0.0,
        height_above_surroundings_m: 0.0,
        air: Air::default(),
        extinction_mag: 0.25,
    };
    let from = sky
        .tables()
        .tt_from_utc(loopwright::sky::calendar::parse_utc("2020-01-01T00:00:00Z").expect("a time"));
    let span = |days: f64| Span {
        from,
        to: from.plus_days(days),
    };
    let spells = globe(
        &sky,
        &site,
        LongitudeSystem::Mars,
        &[span(0.125), span(1.5)],
    )
    .expect("covered");
    assert!((spells[0].central_meridian.degrees() - 44.6699).abs() < 0.02);
    let drift = spells[0].turned.degrees() / 180.0;
    assert!((drift - 0.2437).abs() < 0.0005, "{drift}");
    // A day and a half is more than one turn.
    assert!((spells[1].turned.degrees() - 1.5 * 350.89).abs() < 1.5);
    let passages = meridian_passages(&spells[1..], degrees(50.0));
    assert_eq!(passages.len(), 2);
    let turn_hours = (passages[1].days() - passages[0].days()) * 24.0;
    assert!((turn_hours - 24.6229).abs() < 0.05, "{turn_hours}");
}

#[test]
fn longitudes_seen_join_across_zero() {
    let at = |meridian: f64, turned: f64| GlobeSpell {
        span: Span {
            from: Tt::from_days(0.0),
            to: Tt::from_days(0.1),
        },
        central_meridian: degrees(meridian),
        turned: degrees(turned),
        axis_position_angle: Angle::ZERO,
        latitude: Angle::ZERO,
        phase_angle: Angle::ZERO,
        lit_fraction: 1.0,
        diameter: Angle::ZERO,
    };
    let (arcs, share) = longitudes_seen(&[at(350.0, 20.0), at(100.0, 10.0)], degrees(30.0));
    // 320 over 0 to 40, and 70 to 140.
    assert_eq!(arcs.len(), 2);
    assert!((share - 150.0 / 360.0).abs() < 1e-9);
    assert!(
        (arcs[0].from.degrees() - 70.0).abs() < 1e-9
            && (arcs[0].width.degrees() - 70.0).abs() < 1e-9
    );
    assert!(
        (arcs[1].from.degrees() - 320.0).abs() < 1e-9
            && (arcs[1].width.degrees() - 80.0).abs() < 1e-9
    );
    let (arcs, share) = longitudes_seen(&[at(10.0, 340.0)], degrees(30.0));
    assert_eq!((arcs.len(), share), (1, 1.0));
    assert!(longitudes_seen(&[], degrees(30.0)).0.is_empty());
}
