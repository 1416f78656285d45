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
    count: usize,
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
        let whole =
            terms > 0 && !coefficients.is_empty() && coefficients.len().is_multiple_of(terms);
        let length = (end - start) * terms as f64 / coefficients.len() as f64;
        (whole && length > 0.0 && length.is_finite()).then_some(Pieces {
            start,
            end,
            length,
            pieces_per_day: 1.0 / length,
            count: coefficients.len() / terms.max(1),
            terms,
            quantum,
            coefficients,
        })
    }

    /// The piece for a time in days and where in it the time lies, -1 to 1; None outside the span.
    fn piece_at(&self, days: f64) -> Option<(&[[C; N]], f64)> {
        if !(self.start <= days && days <= self.end) {
            return None;
        }
        let since = days - self.start;
        let piece = ((since * self.pieces_per_day) as usize).min(self.count - 1);
        let x = 2.0 * (since - piece as f64 * self.length) * self.pieces_per_day - 1.0;
        let from = piece * self.terms;
        Some((self.coefficients.get(from..from + self.terms)?, x))
    }

    /// Values and rates per day at a time in days, the ends of the span included; None outside.
    #[must_use]
    pub fn at(&self, days: f64) -> Option<([f64; N], [f64; N])> {
        let (coefficients, x) = self.piece_at(days)?;
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

#[cfg(test)]
mod tests {
    use super::*;

    /// T_0 to T_5 and their derivatives written out: NIST DLMF, table 18.6 and section 18.9.
    #[test]
    fn evaluates_single_polynomials_as_written_out() {
        let x: f64 = 0.3;
        let written = [
            (1.0, 0.0),
            (x, 1.0),
            (2.0 * x.powi(2) - 1.0, 4.0 * x),
            (4.0 * x.powi(3) - 3.0 * x, 12.0 * x.powi(2) - 3.0),
            (
                8.0 * x.powi(4) - 8.0 * x.powi(2) + 1.0,
                32.0 * x.powi(3) - 16.0 * x,
            ),
            (
                16.0 * x.powi(5) - 20.0 * x.powi(3) + 5.0 * x,
                80.0 * x.powi(4) - 60.0 * x.powi(2) + 5.0,
            ),
        ];
        for (degree, (value, derivative)) in written.into_iter().enumerate() {
            let mut coefficients = vec![[0.0]; degree + 1];
            coefficients[degree] = [1.0];
            let ([v], [d]) = evaluate(&coefficients, x);
            assert!((v - value).abs() < 1e-15, "T_{degree}: {v} for {value}");
            assert!(
                (d - derivative).abs() < 1e-14,
                "T_{degree}': {d} for {derivative}"
            );
        }
    }

    /// exp(x) has the coefficients I_0(1), 2 I_1(1), 2 I_2(1), ..: Abramowitz and Stegun 1964, formula 9.6.34 and
    /// table 9.8.
    #[test]
    fn fit_of_the_exponential_gives_bessel_coefficients() {
        let samples: Vec<[f64; 1]> = nodes(12).map(|x| [libm::exp(x)]).collect();
        let coefficients = fit(&samples);
        let bessel = [
            1.266_065_877_8,
            2.0 * 0.565_159_103_99,
            2.0 * 0.135_747_669_8,
        ];
        for (k, expected) in bessel.into_iter().enumerate() {
            assert!((coefficients[k][0] - expected).abs() < 1e-9, "{k}");
        }
        for x in [-1.0, -0.77, 0.0, 0.31, 1.0_f64] {
            let ([value], [derivative]) = evaluate(&coefficients, x);
            assert!((value - libm::exp(x)).abs() < 1e-12);
            assert!((derivative - libm::exp(x)).abs() < 1e-10);
        }
    }

    #[test]
    fn fits_of_degree_zero_and_of_nothing_stay_as_they_are() {
        assert_eq!(nodes(0).collect::<Vec<_>>(), [0.0]);
        assert_eq!(fit(&[[7.0, 8.0]]), [[7.0, 8.0]]);
        assert!(fit::<2>(&[]).is_empty());
        assert_eq!(evaluate::<f64, 1>(&[], 0.5), ([0.0], [0.0]));
    }

    #[test]
    fn pieces_scale_value_and_rate_and_end_where_they_say() {
        // t on 10..20 and on 20..30 in units of 0.5: c0 is the middle, c1 half the length, both doubled.
        let coefficients = vec![[30_i32], [10], [50], [10]];
        let pieces = Pieces::new(10.0, 30.0, 2, 0.5, coefficients).expect("two whole pieces");
        for t in [10.0, 13.0, 20.0, 27.5, 30.0] {
            let ([value], [rate]) = pieces.at(t).expect("inside");
            assert!(
                (value - t).abs() < 1e-12 && (rate - 1.0).abs() < 1e-12,
                "{t}: {value} {rate}"
            );
        }
        assert_eq!(pieces.length(), 10.0);
        assert!(
            pieces.at(9.999).is_none()
                && pieces.at(30.001).is_none()
                && pieces.at(f64::NAN).is_none()
        );
        assert!(Pieces::new(0.0, 1.0, 2, 1.0, vec![[1.0], [2.0], [3.0]]).is_none());
        assert!(Pieces::<f64, 1>::new(0.0, 1.0, 2, 1.0, vec![]).is_none());
        assert!(Pieces::new(1.0, 0.0, 1, 1.0, vec![[1.0]]).is_none());
    }
}
