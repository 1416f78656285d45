//! The picture fixed on the ground for `loopwright frame --on ground`: the dates at the same depth of the Sun, over the skyline.

use crate::scenario::Camera;
use crate::scenario::programme::Programme;
use crate::season::Span;
use crate::season::stacking::{
    GroundFrame, GroundReadings, GroundRule, GroundStack, LocalClock as Reading, NightHalf,
    RuleNight, survey_rule,
};
use crate::sheet::words::LocalClock;
use crate::sky::place::{Horizontal, SkyError};
use crate::sky::refraction::{apparent_from_true, horizon_dip};
use crate::sky::{Angle, Body, Tt};

use super::CliError;
use super::outings::day_and_part;

/// What a rule reads at the scenario's site.
struct AtSite<'a>(&'a Programme<'a>);

impl GroundReadings for AtSite<'_> {
    type Error = SkyError;

    fn sun_altitude(&self, instant: Tt) -> Result<Angle, SkyError> {
        let plan = self.0.plan;
        let vantage = plan.sky.observer(&plan.scenario.site, instant)?;
        let sun = vantage.place(Body::Sun)?;
        Ok(vantage
            .horizontal(sun.apparent)
            .map_or(Angle::ZERO, |place| place.altitude))
    }

    fn sidereal_time(&self, instant: Tt) -> Result<Angle, SkyError> {
        let plan = self.0.plan;
        let vantage = plan.sky.observer(&plan.scenario.site, instant)?;
        Ok(vantage.sidereal_time().unwrap_or(Angle::ZERO))
    }

    fn local_clock(&self, instant: Tt) -> Result<Reading, SkyError> {
        let utc = self.0.plan.sky.tables().utc_from_tt(instant);
        let offset = f64::from(self.0.clock.offset_seconds(utc)) / 60.0;
        let minutes = (utc.days() + 0.5) * 1440.0 + offset;
        Ok(Reading {
            minutes: minutes.rem_euclid(1440.0),
            utc_offset_minutes: offset,
        })
    }

    /// The almanac's, lower by the dip of a high site.
    fn sunset_altitude(&self) -> Angle {
        let site = &self.0.plan.scenario.site;
        Angle::from_degrees(-50.0 / 60.0) - horizon_dip(site.height_above_surroundings_m)
    }
}

/// The page: the rule over the nights of these dates, and for each lens where the dots fall.
pub(super) fn lines(
    programme: &Programme<'_>,
    nights: &[Span],
    sun: Angle,
    half: NightHalf,
) -> Result<Vec<String>, CliError> {
    let plan = programme.plan;
    let scenario = &plan.scenario;
    let clock = LocalClock {
        scenario,
        sky: &plan.sky,
    };
    let rule = GroundRule::SunAltitude {
        altitude: sun,
        half,
    };
    let readings = AtSite(programme);
    let survey = survey_rule(rule, nights, &readings)
        .map_err(|error| CliError::Failed(error.to_string()))?;
    let mut lines = vec![format!(
        "fixed on the ground, the Sun at {:.1} deg in the {}",
        sun.degrees(),
        match half {
            NightHalf::Evening => "evening",
            NightHalf::Morning => "morning",
        }
    )];
    let mut picks = Vec::new();
    for (span, night) in nights.iter().zip(&survey.nights) {
        match night {
            RuleNight::Met(met) => {
                let vantage = plan.sky.observer(&scenario.site, met.instant)?;
                let place = vantage.place(scenario.subject)?;
                let Some(true_place) = vantage.horizontal(place.apparent) else {
                    continue;
                };
                picks.push((
                    met.instant,
                    Horizontal {
                        azimuth: true_place.azimuth,
                        altitude: apparent_from_true(true_place.altitude, &scenario.site.air),
                    },
                ));
            }
            RuleNight::NotMet { why, nearest } => {
                let nearest = nearest.map_or(String::new(), |nearest| {
                    format!(
                        "; nearest {}, {}, Sun at {:.1} deg",
                        day_and_part(&clock, nearest.instant),
                        clock.time(nearest.instant),
                        nearest.sun_altitude.degrees()
                    )
                });
                lines.push(format!(
                    "  {}: not met, {why}{nearest}",
                    day_and_part(&clock, span.middle())
                ));
            }
        }
    }
    if let Some(GroundRule::SunAltitude { altitude, .. }) = survey.instead {
        lines.push(format!(
            "  the Sun at {:.1} deg would be met on every night",
            altitude.degrees()
        ));
    }
    let skyline = scenario.skyline.polygon();
    let shows = |place: &Horizontal| {
        place.altitude > Angle::ZERO && place.altitude > skyline.altitude_at(place.azimuth)
    };
    for (instant, place) in &picks {
        let hidden = if shows(place) {
            ""
        } else {
            " (behind the skyline or down)"
        };
        lines.push(format!(
            "  {}, {}: azimuth {:.1}, altitude {:.1} deg{hidden}",
            day_and_part(&clock, *instant),
            clock.time(*instant),
            place.azimuth.degrees(),
            place.altitude.degrees()
        ));
    }
    picks.retain(|(_, place)| shows(place));
    if picks.is_empty() {
        lines.push("  none of these dates shows the subject over the skyline then".to_owned());
        return Ok(lines);
    }
    let places: Vec<Horizontal> = picks.iter().map(|pick| pick.1).collect();
    for Camera { lens, sensor } in &scenario.lenses {
        let frame = match GroundFrame::level_around(&places, lens, sensor) {
            Ok(frame) => frame,
            Err(error) => {
                lines.push(format!("{}: {error}", lens.name()));
                continue;
            }
        };
        let stack = GroundStack::new(frame, rule, &picks);
        let held = stack.dots.iter().filter(|dot| dot.held).count();
        let (width, height) = frame.field();
        lines.push(format!(
            "{}, {} mm, level, aimed at azimuth {:.1}, altitude {:.1} deg: {:.1} x {:.1} deg hold {held} of {} dots",
            lens.name(),
            lens.focal_length_mm(),
            frame.aim().azimuth.degrees(),
            frame.aim().altitude.degrees(),
            width.degrees(),
            height.degrees(),
            stack.dots.len()
        ));
        for dot in &stack.dots {
            if let Some(pixel) = dot.pixel.filter(|_| dot.held) {
                lines.push(format!(
                    "  {}: x {:.0}, y {:.0}",
                    day_and_part(&clock, dot.instant),
                    pixel.x,
                    pixel.y
                ));
            }
        }
    }
    Ok(lines)
}
