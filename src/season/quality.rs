//! How good a night is: a product of named parts between 0 and 1, each raised to the user's weight, with the parts beside
//! the score; and for the disc the best run of nights and the longitudes of the globe seen in it.
//!
//! The shapes of the parts are our choice, but for seeing, which grows with the airmass to the power 0.6 (Kolmogorov
//! turbulence). A part at zero closes the night; a weight of zero leaves a part out.

use super::purposes::Purpose;
use super::spells::Spell;
use super::types::Span;
use crate::sky::physical::{
    LongitudeSystem, central_meridian, equatorial_diameter, planetocentric_latitudes,
    pole_position_angle,
};
use crate::sky::place::{Sky, SkyError};
use crate::sky::refraction::airmass;
use crate::sky::{Angle, Site, Tt};

/// What a score is made of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum PartName {
    /// What the air leaves: of the light (audience, path) or of sharpness (disc).
    Height,
    /// Length of the spell over what the purpose wants.
    Length,
    /// How far the subject stands out from the sky (audience), or how deep the Sun is (path).
    Darkness,
    /// How little the Moon disturbs.
    Moon,
    /// Diameter over the greatest of the season.
    Diameter,
    /// How little the air draws the colours apart.
    Dispersion,
}

impl PartName {
    /// The word used in tables.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            PartName::Height => "height",
            PartName::Length => "length",
            PartName::Darkness => "darkness",
            PartName::Moon => "moon",
            PartName::Diameter => "diameter",
            PartName::Dispersion => "dispersion",
        }
    }
}

/// One part of a score.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Part {
    pub name: PartName,
    /// 0 to 1, before the weight.
    pub value: f64,
    pub weight: f64,
}

/// Exponents of the parts; 1 unless set.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Weights {
    pub height: f64,
    pub length: f64,
    pub darkness: f64,
    pub moon: f64,
    pub diameter: f64,
    pub dispersion: f64,
}

impl Default for Weights {
    fn default() -> Self {
        Weights {
            height: 1.0,
            length: 1.0,
            darkness: 1.0,
            moon: 1.0,
            diameter: 1.0,
            dispersion: 1.0,
        }
    }
}

impl Weights {
    fn of(&self, name: PartName) -> f64 {
        let weight = match name {
            PartName::Height => self.height,
            PartName::Length => self.length,
            PartName::Darkness => self.darkness,
            PartName::Moon => self.moon,
            PartName::Diameter => self.diameter,
            PartName::Dispersion => self.dispersion,
        };
        // Neither a negative weight nor one that is no number may turn a bad part into a good one.
        if weight > 0.0 { weight } else { 0.0 }
    }
}

/// What a spell is judged by, beside itself.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Judged<'a> {
    pub spell: &'a Spell,
    /// Extinction of the site, magnitudes per airmass.
    pub extinction_mag: f64,
    /// By the visibility model, at the best moment.
    pub margin_mag: Option<f64>,
    /// Of the season.
    pub largest_diameter: Angle,
    /// Between the ends of the band used, at the best moment; `None` leaves the part out.
    pub dispersion: Option<Angle>,
    /// How long one wants; `None` for the purpose's usual time.
    pub wanted_minutes: Option<f64>,
}

/// A score with its parts.
#[derive(Clone, Debug, PartialEq)]
pub struct Score {
    /// 0 to 1: the product of the parts raised to their weights.
    pub value: f64,
    pub parts: Vec<Part>,
}

impl Score {
    /// The part that pulls the score down most.
    #[must_use]
    pub fn weakest(&self) -> Option<Part> {
        let loss = |part: &Part| libm::pow(part.value, part.weight);
        self.parts
            .iter()
            .copied()
            .reduce(|a, b| if loss(&b) < loss(&a) { b } else { a })
    }
}

/// Minutes that a purpose wants, unless the user says otherwise (our choice).
#[must_use]
pub const fn usual_minutes(purpose: Purpose) -> f64 {
    match purpose {
        Purpose::Audience => 45.0,
        Purpose::AudienceAtTelescope => 90.0,
        Purpose::Path => 15.0,
        Purpose::Disc => 60.0,
    }
}

/// Judges one spell.
#[must_use]
pub fn score(purpose: Purpose, judged: &Judged<'_>, weights: &Weights) -> Score {
    let best = &judged.spell.best;
    let air = airmass(best.altitude);
    let height = match purpose {
        Purpose::Disc => libm::pow(air, -0.6),
        _ => libm::pow(10.0, -0.4 * judged.extinction_mag.max(0.0) * (air - 1.0)),
    };
    let wanted = judged
        .wanted_minutes
        .unwrap_or_else(|| usual_minutes(purpose))
        .max(1.0);
    let mut parts = vec![
        (PartName::Height, height),
        (PartName::Length, judged.spell.minutes() / wanted),
    ];
    match purpose {
        Purpose::Audience | Purpose::AudienceAtTelescope => {
            if let Some(margin) = judged.margin_mag {
                // Three magnitudes over the threshold nobody has to search.
                parts.push((PartName::Darkness, margin / 3.0));
            }
            parts.push((PartName::Moon, 1.0 - 0.5 * moon_harm(judged.spell)));
        }
        Purpose::Path => {
            // From civil dusk, with hardly a star, to full night.
            let depth = -best.sun_altitude.degrees();
            parts.push((PartName::Darkness, (depth - 6.0) / 12.0));
            parts.push((PartName::Moon, 1.0 - 0.95 * moon_harm(judged.spell)));
        }
        Purpose::Disc => {
            let largest = judged.largest_diameter.radians();
            let share = if largest > 0.0 {
                best.diameter.radians() / largest
            } else {
                1.0
            };
            parts.push((PartName::Diameter, share));
            if let Some(dispersion) = judged.dispersion {
                // Half is lost where colours lie two arcseconds apart.
                let spread = dispersion.arcsec() / 2.0;
                parts.push((PartName::Dispersion, 1.0 / (1.0 + spread * spread)));
            }
        }
    }
    let parts: Vec<Part> = parts
        .into_iter()
        .map(|(name, value)| Part {
            name,
            // What is no number is no good.
            value: if value > 0.0 { value.min(1.0) } else { 0.0 },
            weight: weights.of(name),
        })
        .collect();
    let value = parts
        .iter()
        .map(|part| libm::pow(part.value, part.weight))
        .product();
    Score { value, parts }
}

/// 0 for no Moon to 1 for a full one beside the subject; it fades with its phase and over 90 degrees of distance.
fn moon_harm(spell: &Spell) -> f64 {
    let best = &spell.best;
    if best.moon_altitude < Angle::ZERO {
        return 0.0;
    }
    let near = (1.0 - best.moon_separation.degrees() / 90.0).max(0.0);
    best.moon_lit_fraction * near
}

/// Nights that follow each other.
#[derive(Clone, Debug, PartialEq)]
pub struct Run {
    /// Of the scores handed in.
    pub nights: std::ops::Range<usize>,
    /// Mean score.
    pub mean: f64,
}

/// The `length` nights in a row with the greatest sum of scores (a closed night counts as 0); the earliest of equals.
/// `None` for no nights, for a length of 0 or beyond what there is, and where every night is closed.
#[must_use]
pub fn best_run(scores: &[f64], length: usize) -> Option<Run> {
    if length == 0 {
        return None;
    }
    let mut best: Option<Run> = None;
    for (start, nights) in scores.windows(length).enumerate() {
        let mean = nights.iter().sum::<f64>() / length as f64;
        if mean > best.as_ref().map_or(0.0, |run| run.mean) {
            best = Some(Run {
                nights: start..start + length,
                mean,
            });
        }
    }
    best
}

/// The disc through one spell.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GlobeSpell {
    pub span: Span,
    /// Central meridian at the start, 0 to 360 degrees west.
    pub central_meridian: Angle,
    /// By how much it grows until the end; more than a turn where the spell outlasts one.
    pub turned: Angle,
    /// At the middle: position angle of the north pole, from celestial north of date through east.
    pub axis_position_angle: Angle,
    /// Planetocentric latitude under the observer.
    pub latitude: Angle,
    pub phase_angle: Angle,
    pub lit_fraction: f64,
    /// Equatorial.
    pub diameter: Angle,
}

/// Degrees of longitude a day by which the central meridian grows, for a globe at rest (IAU WGCCRE 2015).
const fn degrees_a_day(system: LongitudeSystem) -> f64 {
    match system {
        LongitudeSystem::Mars => 350.891_982,
        LongitudeSystem::JupiterI => 877.900,
        LongitudeSystem::JupiterII => 870.270,
        LongitudeSystem::JupiterIII => 870.536,
    }
}

/// Follows the globe through spells.
///
/// # Errors
/// An instant that the sky does not cover.
pub fn globe(
    sky: &Sky,
    site: &Site,
    system: LongitudeSystem,
    spells: &[Span],
) -> Result<Vec<GlobeSpell>, SkyError> {
    spells
        .iter()
        .map(|&span| {
            let meridian = |instant: Tt| -> Result<Angle, SkyError> {
                let place = sky.observer(site, instant)?.place(system.body())?;
                Ok(central_meridian(&place.geometry(), system).unwrap_or(Angle::ZERO))
            };
            let (start, end) = (meridian(span.from)?, meridian(span.to)?);
            // Motion of the Earth and the planet changes the count of turns by far less than half a turn.
            let expected = Angle::from_degrees(degrees_a_day(system) * span.days());
            let turned = expected + (end - start - expected).signed();
            let place = sky.observer(site, span.middle())?.place(system.body())?;
            let geometry = place.geometry();
            Ok(GlobeSpell {
                span,
                central_meridian: start,
                turned,
                axis_position_angle: pole_position_angle(
                    &geometry,
                    &place.frame.equatorial_from_icrs,
                )
                .unwrap_or(Angle::ZERO),
                latitude: planetocentric_latitudes(&geometry).observer,
                phase_angle: geometry.phase_angle(),
                lit_fraction: geometry.lit_fraction(),
                diameter: equatorial_diameter(&geometry),
            })
        })
        .collect()
}

/// An arc of west longitudes, from one to the other in the sense in which they grow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LongitudeArc {
    /// 0 to 360 degrees.
    pub from: Angle,
    /// Up to a whole turn.
    pub width: Angle,
}

/// The longitudes that come within `reach` of the central meridian in any of the spells: arcs in order, and their share of
/// the globe.
#[must_use]
pub fn longitudes_seen(spells: &[GlobeSpell], reach: Angle) -> (Vec<LongitudeArc>, f64) {
    let reach = reach.degrees().clamp(0.0, 90.0);
    // On a line from 0 to 360, cut at 0.
    let mut cut: Vec<(f64, f64)> = Vec::new();
    for spell in spells {
        let width = (spell.turned.degrees() + 2.0 * reach).max(0.0);
        if width >= 360.0 {
            cut = vec![(0.0, 360.0)];
            break;
        }
        let from = (spell.central_meridian - Angle::from_degrees(reach))
            .wrapped()
            .degrees();
        cut.push((from, (from + width).min(360.0)));
        if from + width > 360.0 {
            cut.push((0.0, from + width - 360.0));
        }
    }
    cut.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut joined: Vec<(f64, f64)> = Vec::new();
    for (from, to) in cut {
        match joined.last_mut() {
            Some(last) if from <= last.1 => last.1 = last.1.max(to),
            _ => joined.push((from, to)),
        }
    }
    let share = joined.iter().map(|(from, to)| to - from).sum::<f64>() / 360.0;
    // The cut at 0 is no end.
    if joined.len() > 1
        && let (Some(&first), Some(&last)) = (joined.first(), joined.last())
        && first.0 <= 0.0
        && last.1 >= 360.0
    {
        joined.remove(0);
        if let Some(last) = joined.last_mut() {
            last.1 += first.1;
        }
    }
    let arcs = joined
        .into_iter()
        .map(|(from, to)| LongitudeArc {
            from: Angle::from_degrees(from),
            width: Angle::from_degrees(to - from),
        })
        .collect();
    (arcs, share)
}

/// When a longitude of the user's crosses the central meridian within the spells, to a few seconds: the meridian is taken to
/// turn evenly through a spell.
#[must_use]
pub fn meridian_passages(spells: &[GlobeSpell], longitude: Angle) -> Vec<Tt> {
    let mut passages = Vec::new();
    for spell in spells {
        let turned = spell.turned.degrees();
        if turned <= 0.0 {
            continue;
        }
        let mut ahead = (longitude - spell.central_meridian).wrapped().degrees();
        while ahead < turned {
            passages.push(
                spell
                    .span
                    .from
                    .plus_days(spell.span.days() * ahead / turned),
            );
            ahead += 360.0;
        }
    }
    passages
}
