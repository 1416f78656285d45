//! The log: one entry a night, within the season, kept as text.

use loopwright::season::log::{Log, LogEntry, LogError, Outcome};
use loopwright::season::weather::SkyState;
use loopwright::sky::Angle;
use loopwright::sky::calendar::{CivilDate, parse_utc};

fn date(text: &str) -> CivilDate {
    text.parse().unwrap()
}

fn entry(night: &str, outcome: Outcome) -> LogEntry {
    LogEntry::new(date(night), outcome)
}

fn log() -> Log {
    Log::new(vec![
        entry("2027-02-14", Outcome::Planned),
        entry("2027-02-01", Outcome::Shot),
        entry("2027-02-05", Outcome::Clouded),
        entry("2027-02-08", Outcome::Skipped),
        entry("2027-02-09", Outcome::PartlyShot),
    ])
    .unwrap()
}

#[test]
fn two_entries_for_one_night_are_refused() {
    let twice = vec![
        entry("2027-02-01", Outcome::Shot),
        entry("2027-02-01", Outcome::Clouded),
    ];
    let message = Log::new(twice).unwrap_err().to_string();
    assert!(
        message.contains("two entries for the night of 2027-02-01"),
        "{message}"
    );
    let text = r#"[(night: "2027-02-01", outcome: shot), (night: "2027-02-01", outcome: held)]"#;
    assert!(
        ron::from_str::<Log>(text)
            .unwrap_err()
            .to_string()
            .contains("two entries")
    );
}

#[test]
fn entries_outside_the_season_are_named() {
    let error = log()
        .check_season(date("2027-02-02"), date("2027-05-01"))
        .unwrap_err();
    assert!(matches!(error, LogError::OutsideSeason { night, .. } if night == date("2027-02-01")));
    assert!(
        error
            .to_string()
            .contains("2027-02-01, which is outside the season, 2027-02-02 to 2027-05-01")
    );
    assert!(
        log()
            .check_season(date("2027-02-01"), date("2027-02-13"))
            .is_err()
    );
    assert_eq!(
        log().check_season(date("2027-02-01"), date("2027-02-14")),
        Ok(())
    );
}

#[test]
fn outcomes_take_the_place_of_plans_and_not_of_outcomes() {
    let mut log = log();
    log.record(entry("2027-02-14", Outcome::Clouded), false)
        .unwrap();
    log.record(entry("2027-02-03", Outcome::Held), false)
        .unwrap();
    assert_eq!(log.entries().len(), 6);
    assert_eq!(log.entries()[1].outcome, Outcome::Held);
    let error = log
        .record(entry("2027-02-14", Outcome::Shot), false)
        .unwrap_err();
    assert_eq!(
        error,
        LogError::AlreadyLogged {
            night: date("2027-02-14"),
            word: "clouded"
        }
    );
    log.record(entry("2027-02-14", Outcome::Shot), true)
        .unwrap();
    assert_eq!(log.entries()[5].outcome, Outcome::Shot);
}

#[test]
fn only_plans_lie_ahead_of_today() {
    assert_eq!(log().check_today(date("2027-02-09")), Ok(()));
    let error = log().check_today(date("2027-02-08")).unwrap_err();
    assert!(
        error
            .to_string()
            .contains("2027-02-09 is logged as partly_shot, but today is 2027-02-08")
    );
    assert_eq!(
        log().first_open_night(date("2027-02-09")),
        date("2027-02-10")
    );
    assert_eq!(
        log().first_open_night(date("2027-02-14")),
        date("2027-02-14")
    );
}

#[test]
fn known_weather_is_that_of_nights_with_an_outing() {
    let known: Vec<_> = log()
        .known_skies(date("2027-02-09"))
        .into_iter()
        .map(|known| (known.night, known.sky))
        .collect();
    assert_eq!(
        known,
        [
            (date("2027-02-01"), SkyState::Clear),
            (date("2027-02-05"), SkyState::Cloud)
        ]
    );
    assert_eq!(log().outings(), 3);
}

#[test]
fn times_lie_in_their_night_from_noon_to_noon() {
    let at = |night: &str, time: &str| {
        let mut entry = entry(night, Outcome::Shot);
        entry.at = Some(parse_utc(time).unwrap());
        Log::new(vec![entry]).unwrap()
    };
    // 15 degrees east: local mean noon is 11:00 UTC.
    let east = Angle::from_degrees(15.0);
    assert!(
        at("2027-02-01", "2027-02-01T11:00:00Z")
            .check_times(east)
            .is_ok()
    );
    assert!(
        at("2027-02-01", "2027-02-02T03:30:00Z")
            .check_times(east)
            .is_ok()
    );
    let error = at("2027-02-01", "2027-02-02T11:00:00Z")
        .check_times(east)
        .unwrap_err();
    assert!(
        error
            .to_string()
            .contains("2027-02-02T11:00:00Z is not in that night"),
        "{error}"
    );
    assert!(
        at("2027-02-02", "2027-02-02T03:30:00Z")
            .check_times(east)
            .is_err()
    );
}

#[test]
fn exposures_are_above_nothing() {
    for seconds in [0.0, -2.0, f64::NAN, f64::INFINITY] {
        let mut entry = entry("2027-02-01", Outcome::Shot);
        entry.exposure_s = Some(seconds);
        assert!(matches!(
            Log::new(vec![entry.clone()]),
            Err(LogError::Exposure { .. })
        ));
        assert!(Log::default().record(entry, false).is_err());
    }
}

#[test]
fn logs_come_back_from_text_as_they_were() {
    let mut full = entry("2027-02-01", Outcome::Shot);
    full.at = Some(parse_utc("2027-02-01T21:40:05Z").unwrap());
    full.exposure_s = Some(2.5);
    full.file = Some("mars 01.raw".to_owned());
    full.remark = Some("thin cloud".to_owned());
    let log = Log::new(vec![entry("2027-02-03", Outcome::Reserve), full]).unwrap();
    let text = ron::to_string(&log).unwrap();
    assert!(text.contains("2027-02-01T21:40:05Z"), "{text}");
    assert_eq!(ron::from_str::<Log>(&text).unwrap(), log);
    assert_eq!(
        serde_json::from_str::<Log>(&serde_json::to_string(&log).unwrap()).unwrap(),
        log
    );
}

#[test]
fn words_of_the_log_are_read_back() {
    for outcome in Outcome::ALL {
        assert_eq!(Outcome::from_word(outcome.word()), Ok(outcome));
    }
    assert!(
        Outcome::from_word("rained")
            .unwrap_err()
            .to_string()
            .contains("planned, reserve, shot, partly_shot, held, clouded, skipped")
    );
}
