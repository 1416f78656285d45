//! The path a body draws through a season, and the axes it is drawn on.

use super::types::{Span, StripFrame, Track, TrackPoint};
use crate::sky::Body;
use crate::sky::frames::ReferenceFrame;
use crate::sky::light::{MarsTerms, magnitude};
use crate::sky::place::{Sky, SkyError};

/// Most points a track may have; longer spans are sampled more coarsely.
const MOST_POINTS: f64 = 4_000.0;

/// Mean ecliptic and equator of the middle of the span.
#[must_use]
pub fn strip_frame(sky: &Sky, span: Span) -> StripFrame {
    let epoch = span.middle();
    let frame = ReferenceFrame::mean_of_date(epoch, sky.precession());
    StripFrame {
        epoch,
        ecliptic_from_icrs: frame.ecliptic_from_icrs,
        equatorial_from_icrs: frame.equatorial_from_icrs,
    }
}

/// Days between the points of a track over this span: a day, or what keeps the track within 4000 points.
#[must_use]
pub fn track_step_days(span: Span) -> f64 {
    let step = (span.days() / MOST_POINTS).max(1.0);
    // Even steps that end exactly on the end of the span.
    span.days() / (span.days() / step).ceil().max(1.0)
}

/// The geocentric path of a body, both ends of the span included.
///
/// # Errors
/// A span that the sky does not cover.
pub fn track(sky: &Sky, body: Body, span: Span) -> Result<Track, SkyError> {
    let step = track_step_days(span);
    let count = (span.days() / step).round() as usize;
    let point = |k: usize| {
        let instant = span.from.plus_days(k as f64 * step);
        let vantage = sky.geocentre(instant)?;
        let place = vantage.place(body)?;
        Ok(TrackPoint {
            instant,
            direction: place.direction,
            distance_au: place.distance_au,
            magnitude: (body != Body::Sun)
                .then(|| magnitude(&place.geometry(), MarsTerms::Omit).value),
            longitude_rate_per_day: place.ecliptic_rate().longitude,
            elongation: place.separation(&vantage.place(Body::Sun)?),
        })
    };
    Ok(Track {
        body,
        points: (0..=count).map(point).collect::<Result<_, SkyError>>()?,
    })
}
