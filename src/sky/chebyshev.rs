//! Piecewise Chebyshev polynomials: evaluating and fitting them.
//!
//! A piece is a stretch of time mapped to x from -1 to 1 and, for each of N components, a sum of c_k T_k(x). Units and
//! frame are those of the samples it was fitted to; time is days. The evaluation is Clenshaw's recurrence for the value
//! and its derivative in one pass (C. W. Clenshaw 1955, MTAC 9:118); it adds rounding errors of a few 1e-16 of the
//! largest coefficient.

use std::f64::consts::PI;

/// Values and derivatives in x of N Chebyshev series at x (-1 to 1), their coefficients from degree 0 up.
#[must_use]
pub fn evaluate<C, const N: usize>(coefficients: &[[C; N]], x: f64) -> ([f64; N], [f64; N])
where
    C: Copy + Into<f64>,
{
    let Some((constant, upper)) = coefficients.split_first() else {
        return ([0.0; N], [0.0; N]);
    };
    let twice_x = 2.0 * x;
    let (mut b1, mut b2) = ([0.0; N], [0.0; N]);
    let (mut d1, mut d2) = ([0.0; N], [0.0; N]);
    for row in upper.iter().rev() {
        // The differences first: only one product and one sum then wait for the step before.
        for i in 0..N {
            let d = (2.0 * b1[i] - d2[i]) + twice_x * d1[i];
            let b = (row[i].into() - b2[i]) + twice_x * b1[i];
            (d2[i], d1[i]) = (d1[i], d);
            (b2[i], b1[i]) = (b1[i], b);
        }
    }
    let (mut value, mut derivative) = ([0.0; N], [0.0; N]);
    for i in 0..N {
        value[i] = (constant[i].into() - b2[i]) + x * b1[i];
        derivative[i] = (b1[i] - d2[i]) + x * d1[i];
    }
    (value, derivative)
}

/// The x at which [`fit`] wants its samples: the extrema of T_degree from 1 down to -1, both ends included.
///
/// For degree 0 the middle alone.
pub fn nodes(degree: usize) -> impl Iterator<Item = f64> {
    (0..=degree).map(move |j| {
        if degree == 0 {
            0.0
        } else {
            libm::cos(PI * j as f64 / degree as f64)
        }
    })
}

/// Coefficients, degree 0 up, of the polynomial through samples taken at [`nodes`] in their order.
///
/// The degree is one less than the number of samples. Pieces fitted so meet at their common ends, and the largest
/// error is at most about twice that of the best polynomial of that degree for smooth motion.
#[must_use]
pub fn fit<const N: usize>(samples: &[[f64; N]]) -> Vec<[f64; N]> {
    let Some(degree @ 1..) = samples.len().checked_sub(1) else {
        return samples.to_vec();
    };
    let half_at_end = |i: usize| if i == 0 || i == degree { 0.5 } else { 1.0 };
    (0..=degree)
        .map(|k| {
            let mut sum = [0.0; N];
            for (j, sample) in samples.iter().enumerate() {
                let turn = (j * k) % (2 * degree);
                let weight = half_at_end(j) * libm::cos(PI * turn as f64 / degree as f64);
                for (total, value) in sum.iter_mut().zip(sample) {
                    *total += weight * value;
                }
            }
            sum.map(|total| total * half_at_end(k) * 2.0 / degree as f64)
        })
        .collect()
}

/// Pieces of equal length and degree, one after another.
#[derive(Clone, Debug)]
pub struct Pieces<C, const N: usize> {
    start: f64,
    end: f64,
    length: f64,
    pieces_per_day: f64,
    terms: usize,
    quantum: f64,
    coefficients: Vec<[C; N]>,
}

impl<C, const N: usize> Pieces<C, N>
where
    C: Copy + Into<f64>,
{
    /// Pieces that together cover start to end (days), each of `terms` coefficients, all in units of `quantum`.
    ///
    /// None unless the coefficients fill one or more pieces and start lies before end.
    #[must_use]
    pub fn new(
        start: f64,
        end: f64,
        terms: usize,
        quantum: f64,
        coefficients: Vec<[C; N]>,
    ) -> Option<Self> {
        let whole = terms > 0 && !coefficients.is_empty() && coefficients.len() % terms == 0;
        let length = (end - start) * terms as f64 / coefficients.len() as f64;
        (whole && length > 0.0 && length.is_finite()).then_some(Pieces {
            start,
            end,
            length,
            pieces_per_day: 1.0 / length,
            terms,
            quantum,
            coefficients,
        })
    }

    /// Values and rates per day at a time in days, the ends of the span included; None outside.
    #[must_use]
    pub fn at(&self, days: f64) -> Option<([f64; N], [f64; N])> {
        if !(self.start <= days && days <= self.end) {
            return None;
        }
        let since = days - self.start;
        let count = self.coefficients.len() / self.terms;
        let piece = ((since * self.pieces_per_day) as usize).min(count - 1);
        let x = 2.0 * (since - piece as f64 * self.length) * self.pieces_per_day - 1.0;
        let from = piece * self.terms;
        let coefficients = self.coefficients.get(from..from + self.terms)?;
        let (values, derivatives) = evaluate(coefficients, x);
        let per_day = 2.0 * self.pieces_per_day * self.quantum;
        Some((
            values.map(|v| v * self.quantum),
            derivatives.map(|d| d * per_day),
        ))
    }

    /// Days in a piece.
    #[must_use]
    pub fn length(&self) -> f64 {
        self.length
    }
}
