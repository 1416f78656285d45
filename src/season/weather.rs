//! The odds that an outing succeeds, and how weather carries over from night to night.
//!
//! A night is *clear* when an outing on it succeeds (clear for as long as the purpose needs), else *cloud*. The user's
//! table gives the odds of a clear night by month; they are interpolated linearly, by date, between the middles of the
//! months, December joining January. Nights form a two-state Markov chain with these odds as its marginals and the
//! correlation r (the *persistence*) between one night and the next: with p for last night, p' for tonight, q = 1 - p,
//!
//! ```text
//! P(clear | clear) = p' + r sqrt(p' q' q / p)        P(clear | cloud) = p' - r sqrt(p' q' p / q)
//! ```
//!
//! Both are clamped to 0..1 where r is too large for a change of odds; the marginal then departs from the table, and
//! [`Chain::clamped`] says on which nights. Where p is 0 the first, where it is 1 the second is undefined and taken as p'.
//! Source: the only joint law of two yes/no events with chances p and p' and correlation r (elementary).
//!
//! A forecast replaces the odds of tonight or tomorrow as they are known today, whatever was known before. The step into
//! tomorrow's forecast starts from tonight's odds as known today, with persistence lowered (and said so) where the forecast
//! could not hold otherwise; the step out of the last forecast uses the table's odds on both sides, so that a good forecast
//! also lifts the nights after it, by persistence.
//!
//! Plain numbers without units throughout; nights are named by their civil date and their odds taken at the midnight
//! that ends it. Nothing here knows real climates: the default table is a placeholder and says so.

use serde::{Deserialize, Serialize};

use crate::sky::calendar::{CalendarError, CivilDate, days_in_month, month_name};

/// Odds or persistence that cannot be, or a chain that cannot be built.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum WeatherError {
    #[error("{what}: {value} is no chance; chances run from 0 to 1 (write 0.3 for 30 %)")]
    Probability { what: String, value: f64 },
    #[error(
        "persistence {value}: it runs from 0 (each night for itself) to 1 (the weather never changes)"
    )]
    Persistence { value: f64 },
    #[error("{count} monthly odds: twelve are needed, January first")]
    Months { count: usize },
    #[error(
        "no nights: the last, {last}, is before today, {today}; choose an earlier today or a later end"
    )]
    NoNights { today: CivilDate, last: CivilDate },
    #[error("{nights} nights are too many: at most {MOST_NIGHTS} can be planned at once")]
    TooManyNights { nights: i32 },
    #[error(
        "the weather of {night} cannot be known before {today}; only nights before today have been seen"
    )]
    KnownTooEarly { night: CivilDate, today: CivilDate },
    #[error(transparent)]
    Date(#[from] CalendarError),
}

/// The longest chain: ten years.
pub const MOST_NIGHTS: i32 = 3653;

/// A chance, 0 to 1. Made only by a constructor that checks.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Serialize, Deserialize)]
#[serde(try_from = "f64", into = "f64")]
pub struct Probability(f64);

impl Probability {
    /// # Errors
    /// Outside 0 to 1, or not a number; `what` names it in the message.
    pub fn new(value: f64, what: &str) -> Result<Self, WeatherError> {
        if (0.0..=1.0).contains(&value) {
            Ok(Probability(value))
        } else {
            Err(WeatherError::Probability {
                what: what.to_owned(),
                value,
            })
        }
    }

    #[must_use]
    pub const fn value(self) -> f64 {
        self.0
    }
}

impl TryFrom<f64> for Probability {
    type Error = WeatherError;
    fn try_from(value: f64) -> Result<Self, WeatherError> {
        Probability::new(value, "chance")
    }
}

impl From<Probability> for f64 {
    fn from(probability: Probability) -> f64 {
        probability.0
    }
}

/// Correlation of one night's weather with the next, 0 to 1.
///
/// 0 makes every night independent; daily cloud mostly has 0.2 to 0.4 (from memory); above about 0.6 no climate is
/// known to the author, and changing odds are clamped more and more; 1 freezes the weather. Negative values (weather
/// that alternates) are refused.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Serialize, Deserialize)]
#[serde(try_from = "f64", into = "f64")]
pub struct Persistence(f64);

impl Persistence {
    /// What stands where the user gave none: a placeholder like the odds.
    pub const PLACEHOLDER: Persistence = Persistence(0.3);

    /// # Errors
    /// Outside 0 to 1, or not a number.
    pub fn new(value: f64) -> Result<Self, WeatherError> {
        if (0.0..=1.0).contains(&value) {
            Ok(Persistence(value))
        } else {
            Err(WeatherError::Persistence { value })
        }
    }

    #[must_use]
    pub const fn value(self) -> f64 {
        self.0
    }
}

impl Default for Persistence {
    fn default() -> Self {
        Persistence::PLACEHOLDER
    }
}

impl TryFrom<f64> for Persistence {
    type Error = WeatherError;
    fn try_from(value: f64) -> Result<Self, WeatherError> {
        Persistence::new(value)
    }
}

impl From<Persistence> for f64 {
    fn from(persistence: Persistence) -> f64 {
        persistence.0
    }
}

/// Odds of a clear night for the middle of each month, January first; each 0 to 1.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "Vec<f64>", into = "Vec<f64>")]
pub struct MonthlyOdds([f64; 12]);

impl MonthlyOdds {
    /// The same odds all year, measured nowhere.
    pub const PLACEHOLDER: MonthlyOdds = MonthlyOdds([0.4; 12]);

    /// # Errors
    /// Names the month whose odds are outside 0 to 1.
    pub fn new(by_month: [f64; 12]) -> Result<Self, WeatherError> {
        for (month, &value) in (1..).zip(&by_month) {
            Probability::new(
                value,
                &format!("weather odds for {}", month_name(month).unwrap_or_default()),
            )?;
        }
        Ok(MonthlyOdds(by_month))
    }

    #[must_use]
    pub const fn by_month(&self) -> &[f64; 12] {
        &self.0
    }

    /// The odds of the night that begins on this date, taken at the midnight that ends the date.
    ///
    /// # Errors
    /// At the very ends of the calendar, where a neighbouring month is missing.
    pub fn on(&self, night: CivilDate) -> Result<f64, WeatherError> {
        let at = f64::from(night.julian_day_number()) + 0.5;
        let (year, month) = (night.year(), night.month());
        let middle = middle_of_month(year, month)?;
        let (before, after) = if at < middle {
            let (y, m) = if month == 1 {
                (year - 1, 12)
            } else {
                (year, month - 1)
            };
            (
                (middle_of_month(y, m)?, self.of(m)),
                (middle, self.of(month)),
            )
        } else {
            let (y, m) = if month == 12 {
                (year + 1, 1)
            } else {
                (year, month + 1)
            };
            (
                (middle, self.of(month)),
                (middle_of_month(y, m)?, self.of(m)),
            )
        };
        let share = (at - before.0) / (after.0 - before.0);
        Ok(before.1 + share * (after.1 - before.1))
    }

    fn of(&self, month: u8) -> f64 {
        self.0
            .get(usize::from(month) - 1)
            .copied()
            .unwrap_or_default()
    }
}

impl TryFrom<Vec<f64>> for MonthlyOdds {
    type Error = WeatherError;
    fn try_from(list: Vec<f64>) -> Result<Self, WeatherError> {
        let count = list.len();
        MonthlyOdds::new(
            list.try_into()
                .map_err(|_| WeatherError::Months { count })?,
        )
    }
}

impl From<MonthlyOdds> for Vec<f64> {
    fn from(odds: MonthlyOdds) -> Vec<f64> {
        odds.0.to_vec()
    }
}

/// Middle of a month as a day count with fractions whose whole numbers are noons. From day numbers, since October 1582
/// was ten days short.
fn middle_of_month(year: i32, month: u8) -> Result<f64, WeatherError> {
    let first = CivilDate::new(year, month, 1)?.julian_day_number();
    let last = CivilDate::new(year, month, days_in_month(year, month)?)?.julian_day_number();
    Ok((f64::from(first) + f64::from(last)) / 2.0)
}

/// What a sky was like, as far as an outing is concerned.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum SkyState {
    Clear,
    Cloud,
}

/// A night whose weather is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct KnownSky {
    pub night: CivilDate,
    pub sky: SkyState,
}

/// The odds of a forecast; 0 or 1 when the sky is already certain.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Forecast {
    pub tonight: Option<Probability>,
    pub tomorrow: Option<Probability>,
}

/// The user's weather: part of the scenario.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Weather {
    /// What the user typed; without it the placeholder stands, and says so.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub odds: Option<MonthlyOdds>,
    #[serde(default)]
    pub persistence: Persistence,
    /// For how long the sky must stay clear to call it so, in minutes: the purpose's own length. For the words only.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub clear_minutes: Option<u32>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub remark: Option<String>,
}

impl Weather {
    /// The table in force.
    #[must_use]
    pub fn monthly_odds(&self) -> MonthlyOdds {
        self.odds.unwrap_or(MonthlyOdds::PLACEHOLDER)
    }

    /// On what every chance rests, to follow "on", as in "your odds (20 to 55 % by month, persistence 0.3)".
    #[must_use]
    pub fn basis(&self, forecast: Forecast) -> String {
        let table = self.monthly_odds();
        let least = table.by_month().iter().copied().fold(1.0, f64::min);
        let most = table.by_month().iter().copied().fold(0.0, f64::max);
        let range = if least == most {
            format!("{} in every month", percent(least))
        } else {
            format!("{} to {} by month", percent(least), percent(most))
        };
        let whose = if self.odds.is_some() {
            "your odds"
        } else {
            "placeholder odds, not yours yet"
        };
        let length = self
            .clear_minutes
            .map_or(String::new(), |minutes| format!("{minutes} min clear: "));
        let forecast = match (forecast.tonight, forecast.tomorrow) {
            (None, None) => String::new(),
            (Some(p), None) => format!(", forecast tonight {}", percent(p.value())),
            (None, Some(p)) => format!(", forecast tomorrow {}", percent(p.value())),
            (Some(p), Some(next)) => {
                format!(
                    ", forecast tonight {}, tomorrow {}",
                    percent(p.value()),
                    percent(next.value())
                )
            }
        };
        format!(
            "{whose} ({length}{range}, persistence {}{forecast})",
            self.persistence.value()
        )
    }

    /// The chain of all nights from `today` to `last`, given the latest night whose weather is known.
    ///
    /// # Errors
    /// No night, too many, or knowledge of a night that is not over.
    pub fn chain(
        &self,
        today: CivilDate,
        last: CivilDate,
        known: Option<KnownSky>,
        forecast: Forecast,
    ) -> Result<Chain, WeatherError> {
        let nights = last.days_since(today) + 1;
        if nights < 1 {
            return Err(WeatherError::NoNights { today, last });
        }
        if nights > MOST_NIGHTS {
            return Err(WeatherError::TooManyNights { nights });
        }
        let table = self.monthly_odds();
        let persistence = self.persistence.value();
        let odds = (0..nights)
            .map(|offset| table.on(today.plus_days(offset)?))
            .collect::<Result<Vec<f64>, WeatherError>>()?;
        let tonight = match (forecast.tonight, known) {
            (_, Some(known)) if known.night >= today => {
                return Err(WeatherError::KnownTooEarly {
                    night: known.night,
                    today,
                });
            }
            (Some(chance), _) => chance.value(),
            (None, Some(known)) => belief_after(table, persistence, known, today)?,
            (None, None) => odds.first().copied().unwrap_or_default(),
        };
        let mut beliefs = vec![tonight];
        let mut steps = vec![Step {
            after_clear: tonight,
            after_cloud: tonight,
            clamped: false,
        }];
        for (offset, pair) in odds.windows(2).enumerate() {
            let &[before, after] = pair else { continue };
            let last_belief = beliefs.last().copied().unwrap_or_default();
            let step = match forecast.tomorrow {
                Some(chance) if offset == 0 => {
                    Step::keeping(last_belief, chance.value(), persistence)
                }
                _ => Step::new(before, after, persistence),
            };
            beliefs.push(step.clear(last_belief));
            steps.push(step);
        }
        Ok(Chain {
            first: today,
            beliefs,
            steps,
        })
    }
}

/// Belief about `night` after a night whose weather is known, by the table.
fn belief_after(
    table: MonthlyOdds,
    persistence: f64,
    known: KnownSky,
    night: CivilDate,
) -> Result<f64, WeatherError> {
    // Older knowledge than this has faded below the last digit unless the weather never changes.
    let first = if night.days_since(known.night) > MOST_NIGHTS {
        night.plus_days(-MOST_NIGHTS)?
    } else {
        known.night
    };
    let mut belief = if known.sky == SkyState::Clear {
        1.0
    } else {
        0.0
    };
    let mut odds = table.on(first)?;
    for offset in 1..=night.days_since(first) {
        let next = table.on(first.plus_days(offset)?)?;
        belief = Step::new(odds, next, persistence).clear(belief);
        odds = next;
    }
    Ok(belief)
}

/// From one night into the next.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Step {
    /// Chance of a clear night after a clear one.
    pub after_clear: f64,
    /// Chance of a clear night after a cloudy one.
    pub after_cloud: f64,
    /// Whether either had to be brought back into 0..1.
    pub clamped: bool,
}

impl Step {
    /// From odds `last` into odds `tonight`, both 0 to 1, with persistence `r`.
    #[must_use]
    pub fn new(last: f64, tonight: f64, r: f64) -> Step {
        let spread = tonight * (1.0 - tonight);
        let (p, q) = (last, 1.0 - last);
        // A night that cannot be clear (cloudy) says nothing about what follows a clear (cloudy) one.
        let after_clear = if p > 0.0 {
            tonight + r * (spread * q / p).sqrt()
        } else {
            tonight
        };
        let after_cloud = if q > 0.0 {
            tonight - r * (spread * p / q).sqrt()
        } else {
            tonight
        };
        Step {
            after_clear: after_clear.min(1.0),
            after_cloud: after_cloud.max(0.0),
            // Rounding alone may pass an end by a few units in the last place, as with r = 1 and steady odds.
            clamped: after_clear > 1.0 + 1e-12 || after_cloud < -1e-12,
        }
    }

    /// The same with persistence lowered as far as it takes to keep `tonight` the odds of the night, clamped or not.
    #[must_use]
    pub fn keeping(last: f64, tonight: f64, r: f64) -> Step {
        let step = Step::new(last, tonight, r);
        if !step.clamped {
            return step;
        }
        // Clamped only where no factor is 0. Both chances stay within 0..1 up to the lesser of these.
        let ratio = (tonight * (1.0 - last) / ((1.0 - tonight) * last)).sqrt();
        Step {
            clamped: true,
            ..Step::new(last, tonight, ratio.min(1.0 / ratio).min(r))
        }
    }

    /// Chance of a clear night when last night was clear with this chance.
    #[must_use]
    pub fn clear(self, last: f64) -> f64 {
        last * self.after_clear + (1.0 - last) * self.after_cloud
    }

    /// Chance of a clear night after this sky.
    #[must_use]
    pub const fn after(self, sky: SkyState) -> f64 {
        match sky {
            SkyState::Clear => self.after_clear,
            SkyState::Cloud => self.after_cloud,
        }
    }
}

/// Consecutive nights from today with the odds known today and the steps between them.
///
/// Never empty; night 0 is today. Every number is a chance.
#[derive(Clone, Debug, PartialEq)]
pub struct Chain {
    first: CivilDate,
    beliefs: Vec<f64>,
    /// Element i leads into night i; element 0 holds today's odds whatever came before.
    steps: Vec<Step>,
}

impl Chain {
    #[must_use]
    pub const fn today(&self) -> CivilDate {
        self.first
    }

    /// The number of nights.
    #[must_use]
    pub fn nights(&self) -> usize {
        self.beliefs.len()
    }

    /// Place of a night in the chain; `None` outside it.
    #[must_use]
    pub fn index(&self, night: CivilDate) -> Option<usize> {
        usize::try_from(night.days_since(self.first))
            .ok()
            .filter(|&index| index < self.nights())
    }

    /// Chance of a clear night as known today; element 0 is tonight.
    #[must_use]
    pub fn beliefs(&self) -> &[f64] {
        &self.beliefs
    }

    /// Element i leads from night i - 1 into night i; element 0 holds today's odds twice.
    #[must_use]
    pub fn steps(&self) -> &[Step] {
        &self.steps
    }

    /// Chances of clear nights after night `index` had this sky: element 0 is the night after it.
    pub fn after(&self, index: usize, sky: SkyState) -> impl Iterator<Item = f64> + '_ {
        let start = if sky == SkyState::Clear { 1.0 } else { 0.0 };
        self.steps
            .iter()
            .skip(index.saturating_add(1))
            .scan(start, |belief, step| {
                *belief = step.clear(*belief);
                Some(*belief)
            })
    }

    /// Nights (by place in the chain) whose odds departed from the table because a chance was clamped.
    #[must_use]
    pub fn clamped(&self) -> Vec<usize> {
        self.steps
            .iter()
            .enumerate()
            .filter(|(_, step)| step.clamped)
            .map(|(index, _)| index)
            .collect()
    }

    /// A sentence where odds were clamped, for the line under any chance.
    #[must_use]
    pub fn clamped_words(&self) -> Option<String> {
        let nights = self.clamped();
        let night = self
            .first
            .plus_days(i32::try_from(*nights.first()?).ok()?)
            .ok()?;
        Some(match nights.len() {
            1 => format!(
                "on {night} the odds change too fast for this persistence; chances were cut off at 0 or 100 %"
            ),
            count => format!(
                "on {count} nights, the first {night}, the odds change too fast for this persistence; chances were cut off at 0 or 100 %"
            ),
        })
    }
}

/// How many nights of experience the typed odds are worth when the log is set against them: our choice.
pub const NIGHTS_BEHIND_TYPED_ODDS: f64 = 10.0;

/// What the log says about the odds: shown beside what the user typed, never put in its place.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OddsEstimate {
    /// Mean of the odds in force over the nights in the log.
    pub typed: f64,
    /// Mean of a beta distribution that starts as [`NIGHTS_BEHIND_TYPED_ODDS`] nights at `typed` and counts the log.
    pub shown: f64,
    /// Standard deviation of the same. Nights are counted as independent; with persistence it is somewhat too small.
    pub uncertainty: f64,
    pub clear: usize,
    pub nights: usize,
}

impl OddsEstimate {
    /// As in "your 30 %: the log has 3 clear of 15 nights, which makes it 24 % (give or take 8)".
    #[must_use]
    pub fn words(&self) -> String {
        let points = (100.0 * self.uncertainty).round();
        format!(
            "your {}: the log has {} clear of {} night{}, which makes it {} (give or take {points})",
            percent(self.typed),
            self.clear,
            self.nights,
            if self.nights == 1 { "" } else { "s" },
            percent(self.shown),
        )
    }
}

/// Sets the nights of known weather against the table; `None` without any.
///
/// # Errors
/// A night at the very ends of the calendar.
pub fn estimate_odds(
    table: &MonthlyOdds,
    seen: &[KnownSky],
) -> Result<Option<OddsEstimate>, WeatherError> {
    if seen.is_empty() {
        return Ok(None);
    }
    let mut sum = 0.0;
    for known in seen {
        sum += table.on(known.night)?;
    }
    let nights = seen.len();
    let clear = seen
        .iter()
        .filter(|known| known.sky == SkyState::Clear)
        .count();
    let typed = sum / nights as f64;
    let weight = NIGHTS_BEHIND_TYPED_ODDS + nights as f64;
    let shown = (NIGHTS_BEHIND_TYPED_ODDS * typed + clear as f64) / weight;
    let uncertainty = (shown * (1.0 - shown) / (weight + 1.0)).sqrt();
    Ok(Some(OddsEstimate {
        typed,
        shown,
        uncertainty,
        clear,
        nights,
    }))
}

/// A chance as a whole percentage: "37 %"; "under 1 %" and "over 99 %" where rounding would promise too much.
#[must_use]
pub fn percent(chance: f64) -> String {
    let rounded = (100.0 * chance).round();
    if chance > 0.0 && rounded < 1.0 {
        "under 1 %".to_owned()
    } else if chance < 1.0 && rounded > 99.0 {
        "over 99 %".to_owned()
    } else {
        format!("{} %", rounded.clamp(0.0, 100.0))
    }
}
