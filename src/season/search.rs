//! Finding where a function of time vanishes or is least.
//!
//! ```text
//!   root:     f(a) < 0 <= f(b) or the reverse; the bracket shrinks until it is shorter than the tolerance
//!   minimum:  f(a) > f(b) <= f(c) with a < b < c; the same
//! ```
//! Functions may fail (an instant outside the ephemeris); the first failure ends the search.

/// Narrows a sign change between `a` and `b` to `tolerance` by Chandrupatla's method (1997, Adv. Eng. Software 28,
/// 145): inverse quadratic steps where they are safe, bisection where they are not. Takes the values at the ends so
/// that they are not computed again.
///
/// A value of zero counts as positive, so that adjoining brackets never both claim or both miss a root on their edge.
pub(crate) fn root<E>(
    (mut a, mut fa): (f64, f64),
    (mut b, mut fb): (f64, f64),
    tolerance: f64,
    mut f: impl FnMut(f64) -> Result<f64, E>,
) -> Result<f64, E> {
    debug_assert!((fa < 0.0) != (fb < 0.0));
    let (mut c, mut fc);
    let mut share = 0.5;
    // Bisection alone would need 60 rounds to exhaust the digits of any bracket.
    for _ in 0..100 {
        let x = a + share * (b - a);
        let fx = f(x)?;
        if (fx < 0.0) == (fa < 0.0) {
            (c, fc) = (a, fa);
        } else {
            (c, fc, b, fb) = (b, fb, a, fa);
        }
        (a, fa) = (x, fx);
        let (best, f_best) = if fa.abs() < fb.abs() {
            (a, fa)
        } else {
            (b, fb)
        };
        let width = (b - a).abs();
        if f_best == 0.0 || width <= tolerance {
            return Ok(best);
        }
        let xi = (a - b) / (c - b);
        let phi = (fa - fb) / (fc - fb);
        share = if phi * phi < xi && (1.0 - phi) * (1.0 - phi) < 1.0 - xi {
            fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        } else {
            0.5
        };
        // At least half a tolerance off the end, so that the last step closes the bracket.
        let least = 0.5 * tolerance / width;
        share = if share.is_finite() {
            share.clamp(least, 1.0 - least)
        } else {
            0.5
        };
    }
    Ok(if fa.abs() < fb.abs() { a } else { b })
}

/// Narrows a minimum bracketed by `a < b < c` to `tolerance` by Brent's method (1973, *Algorithms for Minimization
/// without Derivatives*, ch. 5). Returns the instant and the value.
pub(crate) fn minimum<E>(
    a: f64,
    (b, fb): (f64, f64),
    c: f64,
    tolerance: f64,
    mut f: impl FnMut(f64) -> Result<f64, E>,
) -> Result<(f64, f64), E> {
    const GOLDEN: f64 = 0.381_966_011_250_105;
    let (mut low, mut high) = (a, c);
    let (mut x, mut w, mut v) = (b, b, b);
    let (mut fx, mut fw, mut fv) = (fb, fb, fb);
    let (mut step, mut before_last) = (0.0_f64, 0.0_f64);
    for _ in 0..100 {
        let middle = 0.5 * (low + high);
        if (x - middle).abs() <= 2.0 * tolerance - 0.5 * (high - low) {
            break;
        }
        let mut golden = true;
        if before_last.abs() > tolerance {
            let r = (x - w) * (fx - fv);
            let q = (x - v) * (fx - fw);
            let (p, q) = ((x - v) * q - (x - w) * r, 2.0 * (q - r));
            let (p, q) = if q > 0.0 { (-p, q) } else { (p, -q) };
            if p.abs() < (0.5 * q * before_last).abs() && p > q * (low - x) && p < q * (high - x) {
                before_last = step;
                step = p / q;
                let u = x + step;
                if u - low < 2.0 * tolerance || high - u < 2.0 * tolerance {
                    step = tolerance.copysign(middle - x);
                }
                golden = false;
            }
        }
        if golden {
            before_last = if x < middle { high - x } else { low - x };
            step = GOLDEN * before_last;
        }
        let u = if step.abs() >= tolerance {
            x + step
        } else {
            x + tolerance.copysign(step)
        };
        let fu = f(u)?;
        if fu <= fx {
            if u < x {
                high = x
            } else {
                low = x
            }
            (v, fv, w, fw, x, fx) = (w, fw, x, fx, u, fu);
        } else {
            if u < x {
                low = u
            } else {
                high = u
            }
            if fu <= fw || w == x {
                (v, fv, w, fw) = (w, fw, u, fu);
            } else if fu <= fv || v == x || v == w {
                (v, fv) = (u, fu);
            }
        }
    }
    Ok((x, fx))
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::convert::Infallible;

    #[test]
    fn root_of_a_cubic_and_of_a_step() {
        let f = |x: f64| Ok::<_, Infallible>(x * x * x - 2.0);
        let Ok(x) = root((0.0, -2.0), (4.0, 62.0), 1e-12, f);
        assert!((x - libm::cbrt(2.0)).abs() < 1e-12);
        let step = |x: f64| Ok::<_, Infallible>(if x < 0.3 { -1.0 } else { 1.0 });
        let Ok(x) = root((-1.0, -1.0), (1.0, 1.0), 1e-9, step);
        assert!((x - 0.3).abs() < 2e-9);
    }

    #[test]
    fn root_needs_few_evaluations() {
        let mut calls = 0;
        let f = |x: f64| {
            calls += 1;
            Ok::<_, Infallible>(libm::sin(x) - 0.1 * x)
        };
        let Ok(x) = root(
            (2.0, libm::sin(2.0) - 0.2),
            (4.0, libm::sin(4.0) - 0.4),
            1e-7,
            f,
        );
        assert!((libm::sin(x) - 0.1 * x).abs() < 1e-6);
        assert!(calls <= 8, "{calls} evaluations");
    }

    #[test]
    fn minimum_of_a_parabola_and_of_a_kink() {
        let f = |x: f64| Ok::<_, Infallible>((x - 0.7) * (x - 0.7));
        let Ok((x, fx)) = minimum(0.0, (0.5, 0.04), 2.0, 1e-7, f);
        assert!((x - 0.7).abs() < 1e-6 && fx < 1e-12);
        let kink = |x: f64| Ok::<_, Infallible>((x - 1.2).abs());
        let Ok((x, _)) = minimum(0.0, (1.0, 0.2), 2.0, 1e-7, kink);
        assert!((x - 1.2).abs() < 1e-6);
    }

    #[test]
    fn a_failing_function_ends_the_search() {
        let result = root((0.0, -1.0), (1.0, 1.0), 1e-9, |_| Err("outside"));
        assert_eq!(result, Err("outside"));
    }
}
