//! A few nights of a season at its site: when the Sun is gone, when the subject rises, culminates and sets.

use super::horizon::{HorizonEvent, HorizonKind, horizon_events};
use super::types::Span;
use crate::sky::place::{Sky, SkyError};
use crate::sky::time::J2000_JD;
use crate::sky::{Body, Site, Tt, Utc};

/// One night: the 24 hours from local mean noon (12h - longitude/15 UTC) to the next.
#[derive(Clone, Debug, PartialEq)]
pub struct OutlookNight {
    pub span: Span,
    /// Sunset, dusks, dawns, sunrise.
    pub sun: Vec<HorizonEvent>,
    /// Rise, upper transit and set of the subject.
    pub subject: Vec<HorizonEvent>,
}

impl OutlookNight {
    /// The first of a kind among the Sun's events.
    #[must_use]
    pub fn of_sun(&self, kind: HorizonKind) -> Option<HorizonEvent> {
        self.sun.iter().copied().find(|event| event.kind == kind)
    }

    /// The first of a kind among the subject's events.
    #[must_use]
    pub fn of_subject(&self, kind: HorizonKind) -> Option<HorizonEvent> {
        self.subject
            .iter()
            .copied()
            .find(|event| event.kind == kind)
    }
}

/// The night that begins at local mean noon of the date with this Julian Day Number.
#[must_use]
pub fn night_of(sky: &Sky, site: &Site, julian_day_number: i32) -> Span {
    // A Julian day begins at noon of its date.
    let noon = f64::from(julian_day_number) - J2000_JD - site.longitude.signed().degrees() / 360.0;
    let tt = |days: f64| -> Tt { sky.tables().tt_from_utc(Utc::from_days(days)) };
    Span {
        from: tt(noon),
        to: tt(noon + 1.0),
    }
}

/// Sun and subject in the night that begins on the date with this Julian Day Number.
///
/// # Errors
/// A date that the sky does not cover.
pub fn outlook_night(
    sky: &Sky,
    site: &Site,
    subject: Body,
    julian_day_number: i32,
) -> Result<OutlookNight, SkyError> {
    let span = night_of(sky, site, julian_day_number);
    let daily = [
        HorizonKind::Rise,
        HorizonKind::UpperTransit,
        HorizonKind::Set,
    ];
    Ok(OutlookNight {
        span,
        sun: horizon_events(sky, site, Body::Sun, &HorizonKind::ALL, span)?,
        subject: horizon_events(sky, site, subject, &daily, span)?,
    })
}
