//! Rising, setting, twilight and transit against a table made from JPL DE440 with skyfield 1.55 (`riseset.csv`).

mod common;

use common::table;
use loopwright::season::Span;
use loopwright::season::horizon::{HorizonKind, horizon_events};
use loopwright::sky::calendar::parse_utc;
use loopwright::sky::place::Sky;
use loopwright::sky::refraction::Air;
use loopwright::sky::{Angle, Body, Site};

/// The table prints whole seconds.
const SECONDS: f64 = 1.0;

#[test]
fn rise_set_twilight_and_transit_agree_with_de440() {
    let sky = Sky::de440().unwrap();
    let rows = table("riseset.csv");
    assert_eq!(rows.len(), 20);
    let mut worst = 0.0_f64;
    let mut checked = 0;
    for row in &rows {
        let site = Site {
            name: String::new(),
            latitude: Angle::from_degrees(row.number("lat_deg")),
            longitude: Angle::from_degrees(row.number("lon_deg")),
            elevation_m: row.number("elev_m"),
            height_above_surroundings_m: 0.0,
            air: Air {
                pressure_hpa: 1010.0,
                temperature_c: 10.0,
            },
            extinction_mag: 0.25,
        };
        let tables = sky.tables();
        let from = tables.tt_from_utc(parse_utc(row.text("window_start_utc")).unwrap());
        let span = Span {
            from,
            to: from.plus_days(1.0),
        };
        let planet: Body = row.text("planet").parse().unwrap();
        use HorizonKind as H;
        for (body, kind, column) in [
            (Body::Sun, H::Set, "sunset"),
            (Body::Sun, H::CivilDusk, "civil_dusk"),
            (Body::Sun, H::NauticalDusk, "nautical_dusk"),
            (Body::Sun, H::AstronomicalDusk, "astro_dusk"),
            (Body::Sun, H::AstronomicalDawn, "astro_dawn"),
            (Body::Sun, H::NauticalDawn, "nautical_dawn"),
            (Body::Sun, H::CivilDawn, "civil_dawn"),
            (Body::Sun, H::Rise, "sunrise"),
            (planet, H::Rise, "planet_rise"),
            (planet, H::UpperTransit, "planet_transit"),
            (planet, H::Set, "planet_set"),
            (Body::Moon, H::Rise, "moon_rise"),
            (Body::Moon, H::UpperTransit, "moon_transit"),
            (Body::Moon, H::Set, "moon_set"),
        ] {
            let found = horizon_events(&sky, &site, body, &[kind], span).unwrap();
            let name = format!("{body} {} at latitude {}", column, row.text("lat_deg"));
            match (row.text(column), found.first()) {
                ("", None) => {}
                ("", Some(event)) => panic!("{name}: found {event:?}, the table has none"),
                (text, None) => panic!("{name}: the table has {text}"),
                (text, Some(event)) => {
                    let expected = parse_utc(text).unwrap();
                    let off =
                        (tables.utc_from_tt(event.instant).days() - expected.days()) * 86_400.0;
                    assert!(off.abs() < SECONDS, "{name}: {off} s");
                    worst = worst.max(off.abs());
                    checked += 1;
                    if column == "planet_transit" {
                        let altitude = event.value.degrees() - row.number("planet_transit_alt_deg");
                        assert!(altitude.abs() < 1e-4, "{name}: altitude off by {altitude}");
                    }
                }
            }
        }
    }
    assert!(checked > 200, "{checked} instants checked");
    println!("worst: {worst:.2} s of {checked}");
}
