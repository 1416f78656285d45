//! Sets of instants as sorted, disjoint, half-open stretches, and where a smooth function is not negative.
//!
//! Times are days of TT. Each end of a stretch carries what made it (`C`), so that after any number of intersections
//! one still knows why a stretch begins and why it ends.
//!
//! ```text
//!   f0 o---___          between samples L apart a function with |f''| <= M leaves its chord by at most M L^2 / 8:
//!             ---o f1   chord farther from zero: no crossing; ends on either side and |f1 - f0| > M L^2 / 2: one
//!                       crossing; else the stretch is halved, down to [`TOLERANCE_DAYS`]
//! ```

use std::convert::Infallible;

use super::search::root;

/// Stretches shorter than this are not told apart: 0.04 s.
pub(super) const TOLERANCE_DAYS: f64 = 5e-7;

/// A half-open stretch with the causes of its ends.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Stretch<C> {
    pub from: f64,
    pub to: f64,
    pub opens: C,
    pub closes: C,
}

impl<C> Stretch<C> {
    pub(super) fn days(&self) -> f64 {
        self.to - self.from
    }
}

/// The instants in both sets. Where ends coincide, the cause of `a` stands.
pub(super) fn intersection<C: Copy>(a: &[Stretch<C>], b: &[Stretch<C>]) -> Vec<Stretch<C>> {
    let mut common = Vec::new();
    let (mut a, mut b) = (a.iter().peekable(), b.iter().peekable());
    while let (Some(x), Some(y)) = (a.peek(), b.peek()) {
        let (from, opens) = if y.from > x.from {
            (y.from, y.opens)
        } else {
            (x.from, x.opens)
        };
        let (to, closes) = if y.to < x.to {
            (y.to, y.closes)
        } else {
            (x.to, x.closes)
        };
        if from < to {
            common.push(Stretch {
                from,
                to,
                opens,
                closes,
            });
        }
        if x.to <= y.to {
            a.next();
        } else {
            b.next();
        }
    }
    common
}

/// The instants in either set.
pub(super) fn union<C: Copy>(a: &[Stretch<C>], b: &[Stretch<C>]) -> Vec<Stretch<C>> {
    let mut all: Vec<Stretch<C>> = a.iter().chain(b).copied().collect();
    all.sort_by(|x, y| x.from.total_cmp(&y.from));
    let mut joined: Vec<Stretch<C>> = Vec::with_capacity(all.len());
    for next in all {
        match joined.last_mut() {
            Some(last) if next.from <= last.to => {
                if next.to > last.to {
                    last.to = next.to;
                    last.closes = next.closes;
                }
            }
            _ => joined.push(next),
        }
    }
    joined
}

/// The part of a set within `from` to `to`, cut ends carrying `cut`.
pub(super) fn clipped<C: Copy>(set: &[Stretch<C>], from: f64, to: f64, cut: C) -> Vec<Stretch<C>> {
    let start = set.partition_point(|stretch| stretch.to <= from);
    let bounds = [Stretch {
        from,
        to,
        opens: cut,
        closes: cut,
    }];
    let end = set.partition_point(|stretch| stretch.from < to);
    intersection(&bounds, set.get(start..end).unwrap_or_default())
}

/// Total length in days.
pub(super) fn total_days<C>(set: &[Stretch<C>]) -> f64 {
    set.iter().map(Stretch::days).sum()
}

/// Where the sign of a function with |f''| <= `curvature` changes between two samples, in order; a value of zero counts as
/// positive.
pub(super) fn sign_changes(
    a: (f64, f64),
    b: (f64, f64),
    curvature: f64,
    f: &impl Fn(f64) -> f64,
    found: &mut Vec<f64>,
) {
    // A value that is no number would be halved for ever: the sign is not known, so none is claimed.
    if !(a.1.is_finite() && b.1.is_finite()) {
        return;
    }
    let length = b.0 - a.0;
    let bend = curvature * length * length / 8.0;
    let differ = (a.1 < 0.0) != (b.1 < 0.0);
    let short = length <= TOLERANCE_DAYS;
    if !differ {
        if short || a.1.abs().min(b.1.abs()) > bend {
            return;
        }
    } else if short || (b.1 - a.1).abs() > 4.0 * bend {
        let Ok(at) = root(a, b, TOLERANCE_DAYS, |t| Ok::<_, Infallible>(f(t)));
        found.push(at);
        return;
    }
    let middle_at = 0.5 * (a.0 + b.0);
    let middle = (middle_at, f(middle_at));
    sign_changes(a, middle, curvature, f, found);
    sign_changes(middle, b, curvature, f, found);
}

/// Evenly spaced samples of a function.
pub(super) struct Samples<'a> {
    /// Instant of the first.
    pub from: f64,
    pub step: f64,
    pub values: &'a [f64],
}

impl Samples<'_> {
    /// The sign changes of the function over the whole sampled stretch.
    pub(super) fn sign_changes(&self, curvature: f64, f: &impl Fn(f64) -> f64) -> Vec<f64> {
        let mut found = Vec::new();
        let at = |k: usize| self.from + k as f64 * self.step;
        for (k, pair) in self.values.windows(2).enumerate() {
            if let &[a, b] = pair {
                sign_changes((at(k), a), (at(k + 1), b), curvature, f, &mut found);
            }
        }
        found
    }

    /// The stretches in which the function is not negative, their ends carrying `cause` (also at the ends of the samples).
    pub(super) fn not_negative<C: Copy>(
        &self,
        curvature: f64,
        cause: C,
        f: &impl Fn(f64) -> f64,
    ) -> Vec<Stretch<C>> {
        let changes = self.sign_changes(curvature, f);
        let Some(&first) = self.values.first() else {
            return Vec::new();
        };
        let end = self.from + (self.values.len() - 1) as f64 * self.step;
        between_changes(self.from, end, first >= 0.0, &changes, cause)
    }
}

/// The stretches that hold, given whether the first does and where it changes.
pub(super) fn between_changes<C: Copy>(
    from: f64,
    to: f64,
    mut holds: bool,
    changes: &[f64],
    cause: C,
) -> Vec<Stretch<C>> {
    let mut set = Vec::new();
    let mut since = from;
    for &at in changes.iter().chain(std::iter::once(&to)) {
        if holds && since < at {
            set.push(Stretch {
                from: since,
                to: at,
                opens: cause,
                closes: cause,
            });
        }
        holds = !holds;
        since = at;
    }
    set
}

#[cfg(test)]
mod tests {
    use super::*;

    fn stretch(from: f64, to: f64, cause: char) -> Stretch<char> {
        Stretch {
            from,
            to,
            opens: cause,
            closes: cause,
        }
    }

    #[test]
    fn ends_keep_their_causes() {
        let a = [stretch(0.0, 5.0, 'a'), stretch(7.0, 9.0, 'a')];
        let b = [stretch(4.0, 8.0, 'b')];
        let both = intersection(&a, &b);
        assert_eq!(both.len(), 2);
        assert_eq!((both[0].from, both[0].opens), (4.0, 'b'));
        assert_eq!((both[0].to, both[0].closes), (5.0, 'a'));
        assert_eq!((both[1].from, both[1].opens), (7.0, 'a'));
        assert_eq!((both[1].to, both[1].closes), (8.0, 'b'));
        let either = union(&a, &b);
        assert_eq!(
            either,
            [Stretch {
                from: 0.0,
                to: 9.0,
                opens: 'a',
                closes: 'a'
            }]
        );
        assert_eq!(
            clipped(&a, 8.0, 20.0, 'c'),
            [Stretch {
                from: 8.0,
                to: 9.0,
                opens: 'c',
                closes: 'a'
            }]
        );
        assert_eq!(total_days(&a), 7.0);
    }

    #[test]
    fn a_dip_of_a_second_between_samples_is_found() {
        // 1e-10 below zero for 2 * sqrt(1e-10) days = 1.7 s in the middle of a step of 20 minutes.
        let f = |t: f64| (t - 0.507) * (t - 0.507) - 1e-10;
        let step = 1.0 / 72.0;
        let values: Vec<f64> = (0..73).map(|k| f(k as f64 * step)).collect();
        let samples = Samples {
            from: 0.0,
            step,
            values: &values,
        };
        let set = samples.not_negative(2.0, (), &f);
        assert_eq!(set.len(), 2);
        assert!((set[0].to - (0.507 - 1e-5)).abs() < 2.0 * TOLERANCE_DAYS);
        assert!((set[1].from - (0.507 + 1e-5)).abs() < 2.0 * TOLERANCE_DAYS);
    }
}
