//! Odds, persistence, forecasts.
//!
//! The formulas for the chain are checked against the joint table of two correlated yes/no events, from which they follow
//! (elementary probability), and against seeded draws; the beta estimate against its textbook mean and variance.

#[path = "common/chance.rs"]
mod chance;

use chance::{Draws, after, date, draw_weather, weather};
use loopwright::season::weather::{
    Forecast, KnownSky, MonthlyOdds, Persistence, Probability, SkyState, Step, Weather,
    WeatherError, estimate_odds, percent,
};

const RISING: [f64; 12] = [
    0.20, 0.25, 0.35, 0.40, 0.45, 0.50, 0.55, 0.55, 0.50, 0.35, 0.25, 0.20,
];

fn chance_of(value: f64) -> Option<Probability> {
    Some(Probability::new(value, "forecast").unwrap())
}

fn forecast(tonight: Option<f64>, tomorrow: Option<f64>) -> Forecast {
    Forecast {
        tonight: tonight.and_then(chance_of),
        tomorrow: tomorrow.and_then(chance_of),
    }
}

#[test]
fn odds_are_those_of_the_table_in_the_middle_of_a_month() {
    let table = MonthlyOdds::new(RISING).unwrap();
    // April has 30 days: its middle is the midnight that ends the 15th.
    assert!((table.on(date("2027-04-15")).unwrap() - 0.40).abs() < 1e-12);
    // February 2027 has 28: the midnight that ends the 14th.
    assert!((table.on(date("2027-02-14")).unwrap() - 0.25).abs() < 1e-12);
}

#[test]
fn odds_run_straight_between_the_middles_and_across_the_new_year() {
    let table = MonthlyOdds::new(RISING).unwrap();
    // From the middle of April (15.0 days in) to the middle of May (15.5 days in) are 30.5 days; 10 of them passed.
    let expected = 0.40 + (0.45 - 0.40) * 10.0 / 30.5;
    assert!((table.on(date("2027-04-25")).unwrap() - expected).abs() < 1e-12);
    let mut steep = [0.5; 12];
    steep[11] = 0.2;
    steep[0] = 0.8;
    let table = MonthlyOdds::new(steep).unwrap();
    // Noon of 16 December to noon of 16 January, 31 days; the midnight that ends 31 December is half way.
    assert!((table.on(date("2026-12-31")).unwrap() - 0.5).abs() < 1e-12);
    // Two nights half a day on either side of noon of 1 January 00:00 plus 15.5 days agree with the slope.
    let slope = table.on(date("2027-01-01")).unwrap() - table.on(date("2026-12-31")).unwrap();
    assert!((slope - 0.6 / 31.0).abs() < 1e-12);
}

#[test]
fn steps_follow_from_the_joint_table_of_correlated_nights() {
    let mut draws = Draws(1);
    for _ in 0..2000 {
        let (p, tonight) = (draws.between(0.05, 0.95), draws.between(0.05, 0.95));
        let r = draws.between(0.0, 0.3);
        let step = Step::new(p, tonight, r);
        if step.clamped {
            continue;
        }
        // Correlation r: P(both clear) = p p' + r times the product of the standard deviations.
        let both = p * tonight + r * (p * (1.0 - p)).sqrt() * (tonight * (1.0 - tonight)).sqrt();
        assert!((step.after_clear - both / p).abs() < 1e-12);
        assert!((step.after_cloud - (tonight - both) / (1.0 - p)).abs() < 1e-12);
        assert!((step.clear(p) - tonight).abs() < 1e-12);
    }
    // By hand: p = p' = 1/2, r = 0.4.
    let step = Step::new(0.5, 0.5, 0.4);
    assert!((step.after_clear - 0.7).abs() < 1e-15 && (step.after_cloud - 0.3).abs() < 1e-15);
    // By hand: p = 0.2, p' = 0.5, r = 0.1: 0.5 + 0.1 sqrt(0.25 * 4) and 0.5 - 0.1 sqrt(0.25 / 4).
    let step = Step::new(0.2, 0.5, 0.1);
    assert!((step.after_clear - 0.6).abs() < 1e-12 && (step.after_cloud - 0.475).abs() < 1e-12);
}

#[test]
fn clamped_steps_stay_chances_and_are_reported() {
    let step = Step::new(0.9, 0.1, 0.9);
    assert!(step.clamped);
    assert!(step.after_cloud == 0.0 && step.after_clear <= 1.0);
    // Frozen weather with steady odds needs no clamping; with changing odds it does.
    assert!(!Step::new(0.3, 0.3, 1.0).clamped);
    let frozen = weather(RISING, 1.0)
        .chain(
            date("2027-01-01"),
            date("2027-12-31"),
            None,
            Forecast::default(),
        )
        .unwrap();
    assert!(!frozen.clamped().is_empty());
    assert!(
        frozen
            .clamped_words()
            .unwrap()
            .contains("the odds change too fast")
    );
    let calm = weather(RISING, 0.3)
        .chain(
            date("2027-01-01"),
            date("2027-12-31"),
            None,
            Forecast::default(),
        )
        .unwrap();
    assert!(calm.clamped().is_empty() && calm.clamped_words().is_none());
}

#[test]
fn nights_that_cannot_be_clear_or_cloudy_leave_the_next_to_the_table() {
    for r in [0.0, 0.3, 1.0] {
        for (last, tonight) in [
            (0.0, 0.4),
            (1.0, 0.4),
            (0.0, 0.0),
            (1.0, 1.0),
            (0.0, 1.0),
            (1.0, 0.0),
            (0.4, 0.0),
            (0.4, 1.0),
        ] {
            let step = Step::new(last, tonight, r);
            assert!(
                (0.0..=1.0).contains(&step.after_clear) && (0.0..=1.0).contains(&step.after_cloud)
            );
            assert!(
                (step.clear(last) - tonight).abs() < 1e-15,
                "{last} {tonight} {r}"
            );
            assert!(!step.clamped);
        }
    }
}

#[test]
fn chain_keeps_the_table_as_its_marginals_and_persistence_as_its_correlation() {
    let weather = weather(RISING, 0.4);
    let (first, last) = (date("2027-01-01"), date("2027-12-31"));
    let chain = weather
        .chain(first, last, None, Forecast::default())
        .unwrap();
    assert_eq!(chain.nights(), 365);
    for (offset, belief) in (0..).zip(chain.beliefs()) {
        assert!((belief - weather.monthly_odds().on(after(first, offset)).unwrap()).abs() < 1e-12);
    }
    // Nights 99 and 100 (10 and 11 April, odds about 0.39) over many drawn years.
    let mut draws = Draws(7);
    let (mut clear, mut both) = ([0.0; 2], 0.0);
    let years = 40_000;
    for _ in 0..years {
        let nights = draw_weather(&chain, &mut draws);
        clear[0] += f64::from(u8::from(nights[99]));
        clear[1] += f64::from(u8::from(nights[100]));
        both += f64::from(u8::from(nights[99] && nights[100]));
    }
    let [p, q] = clear.map(|count| count / f64::from(years));
    let correlation = (both / f64::from(years) - p * q) / (p * (1.0 - p) * q * (1.0 - q)).sqrt();
    // Standard error of a correlation of 0.4 in 40 000 pairs: about 0.005.
    assert!((correlation - 0.4).abs() < 0.025, "{correlation}");
    assert!((p - chain.beliefs()[99]).abs() < 0.0125);
}

#[test]
fn what_is_known_fades_by_the_powers_of_persistence_when_odds_are_steady() {
    let weather = weather([0.3; 12], 0.5);
    let today = date("2027-03-10");
    for (days, sky, start) in [
        (1, SkyState::Clear, 1.0),
        (3, SkyState::Clear, 1.0),
        (2, SkyState::Cloud, 0.0),
    ] {
        let known = Some(KnownSky {
            night: after(today, -days),
            sky,
        });
        let chain = weather
            .chain(today, after(today, 5), known, Forecast::default())
            .unwrap();
        // Steady two-state chain: the departure from its mean shrinks by r every night (textbook).
        for (offset, belief) in (0..).zip(chain.beliefs()) {
            let expected = 0.3 + (start - 0.3) * 0.5_f64.powi(days + offset);
            assert!((belief - expected).abs() < 1e-12);
        }
        let after_cloud: Vec<f64> = chain.after(2, SkyState::Cloud).collect();
        assert_eq!(after_cloud.len(), 3);
        assert!((after_cloud[1] - (0.3 - 0.3 * 0.25)).abs() < 1e-12);
    }
}

#[test]
fn forecasts_replace_the_odds_of_their_nights_and_fade_into_the_table() {
    let weather = weather([0.3; 12], 0.5);
    let today = date("2027-03-10");
    let known = Some(KnownSky {
        night: after(today, -1),
        sky: SkyState::Cloud,
    });
    let chain = |forecast| {
        weather
            .chain(today, after(today, 4), known, forecast)
            .unwrap()
    };
    let both = chain(forecast(Some(0.9), Some(0.6)));
    assert!((both.beliefs()[0] - 0.9).abs() < 1e-15 && (both.beliefs()[1] - 0.6).abs() < 1e-12);
    assert!((both.beliefs()[2] - (0.3 + 0.3 * 0.5)).abs() < 1e-12);
    // 90 % and then 60 % with persistence 0.5 cannot be: it is lowered to the most that can, where cloud stays cloud.
    assert!(both.clamped() == [1] && both.steps()[1].after_cloud.abs() < 1e-12);
    assert!((both.steps()[1].after_clear - 0.6 / 0.9).abs() < 1e-12);
    let tonight = chain(forecast(Some(1.0), None));
    assert!((tonight.beliefs()[1] - (0.3 + 0.7 * 0.5)).abs() < 1e-12);
    let tomorrow = chain(forecast(None, Some(0.8)));
    assert!(
        (tomorrow.beliefs()[0] - 0.15).abs() < 1e-12 && (tomorrow.beliefs()[1] - 0.8).abs() < 1e-12
    );
}

#[test]
fn chances_outside_0_to_1_are_refused_with_their_name() {
    for value in [-0.1, 1.2, f64::NAN, f64::INFINITY, 30.0] {
        let mut odds = RISING;
        odds[2] = value;
        let message = MonthlyOdds::new(odds).unwrap_err().to_string();
        assert!(
            message.contains("March") && message.contains("from 0 to 1"),
            "{message}"
        );
        assert!(matches!(
            Persistence::new(value),
            Err(WeatherError::Persistence { .. })
        ));
        assert!(
            Probability::new(value, "forecast for tonight")
                .unwrap_err()
                .to_string()
                .contains("forecast for tonight")
        );
    }
    let message = ron::from_str::<Weather>("(odds: Some([0.3, 0.3]))")
        .unwrap_err()
        .to_string();
    assert!(message.contains("2 monthly odds: twelve"), "{message}");
    let message = ron::from_str::<Weather>("(persistence: 1.5)")
        .unwrap_err()
        .to_string();
    assert!(message.contains("persistence 1.5"), "{message}");
}

#[test]
fn chains_that_cannot_be_are_refused() {
    let weather = Weather::default();
    let today = date("2027-03-10");
    let chain = |last, known| {
        weather
            .chain(today, last, known, Forecast::default())
            .map(|chain| chain.nights())
    };
    assert!(matches!(
        chain(after(today, -1), None),
        Err(WeatherError::NoNights { .. })
    ));
    assert!(matches!(
        chain(after(today, 5000), None),
        Err(WeatherError::TooManyNights { nights: 5001 })
    ));
    let tonight = Some(KnownSky {
        night: today,
        sky: SkyState::Clear,
    });
    assert!(matches!(
        chain(after(today, 5), tonight),
        Err(WeatherError::KnownTooEarly { .. })
    ));
    assert_eq!(chain(today, None), Ok(1));
    // Known weather of a remote past takes no time and says nothing.
    let remote = Some(KnownSky {
        night: date("-9000-01-01"),
        sky: SkyState::Cloud,
    });
    assert!(
        (weather
            .chain(today, today, remote, Forecast::default())
            .unwrap()
            .beliefs()[0]
            - 0.4)
            .abs()
            < 1e-9
    );
}

#[test]
fn the_log_moves_what_is_shown_and_not_what_was_typed() {
    let weather = weather([0.3; 12], 0.2);
    let before = weather.clone();
    let seen: Vec<KnownSky> = (0..15)
        .map(|night| KnownSky {
            night: after(date("2027-02-01"), night),
            sky: if night < 3 {
                SkyState::Clear
            } else {
                SkyState::Cloud
            },
        })
        .collect();
    let estimate = estimate_odds(&weather.monthly_odds(), &seen)
        .unwrap()
        .unwrap();
    // Beta(3 + 3, 7 + 12): mean 6/25, variance 6 * 19 / (25^2 * 26).
    assert!((estimate.typed - 0.3).abs() < 1e-12 && (estimate.shown - 0.24).abs() < 1e-12);
    assert!((estimate.uncertainty - (6.0 * 19.0 / (625.0 * 26.0_f64)).sqrt()).abs() < 1e-12);
    assert_eq!(
        estimate.words(),
        "your 30 %: the log has 3 clear of 15 nights, which makes it 24 % (give or take 8)"
    );
    assert_eq!(weather, before);
    assert_eq!(estimate_odds(&weather.monthly_odds(), &[]), Ok(None));
}

#[test]
fn words_say_on_which_odds_a_chance_rests() {
    assert!(
        Weather::default()
            .basis(Forecast::default())
            .starts_with("placeholder odds, not yours yet (40 % in every month")
    );
    let mut weather = weather(RISING, 0.3);
    weather.clear_minutes = Some(90);
    assert_eq!(
        weather.basis(forecast(Some(0.6), None)),
        "your odds (90 min clear: 20 % to 55 % by month, persistence 0.3, forecast tonight 60 %)"
    );
    let text = ron::to_string(&weather).unwrap();
    assert_eq!(ron::from_str::<Weather>(&text).unwrap(), weather);
    assert_eq!(ron::from_str::<Weather>("()").unwrap(), Weather::default());
}

#[test]
fn percentages_are_whole_and_promise_nothing_certain() {
    let cases = [
        (0.0, "0 %"),
        (0.002, "under 1 %"),
        (0.0051, "1 %"),
        (0.374, "37 %"),
        (0.994, "99 %"),
    ];
    for (chance, words) in cases
        .into_iter()
        .chain([(0.996, "over 99 %"), (1.0, "100 %")])
    {
        assert_eq!(percent(chance), words);
    }
}
