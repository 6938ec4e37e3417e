//! Cubic splines through several channels sampled on the same uniform knots.
//!
//! One piece holds the coefficients of all channels side by side, so that a value of all of them costs
//! one run of consecutive loads and three multiply-adds a channel, in vectors across the channels.

use crate::error::{Error, Result};

/// The coefficients of one piece, `[power][channel]`, in powers of the fraction of a step from its first knot.
pub type Piece<const N: usize> = [[f64; N]; 4];

/// A twice continuously differentiable cubic spline of `N` channels on uniform knots.
///
/// Far from the ends it errs, to leading order in the step h, by h⁴ f⁗ / 384 at the middle of a piece and
/// less elsewhere; its rate by h³ f⁗ / (72 √3) at most. Reference: Ahlberg, Nilson & Walsh, *The Theory of Splines
/// and Their Applications* (1967), section 2.1 for the equations of the second derivatives [from memory].
/// Proved by `errs_as_theory_says_and_no_more`.
#[derive(Debug, Clone, PartialEq)]
pub struct Spline<const N: usize> {
    first: f64,
    step: f64,
    pieces: Vec<Piece<N>>,
}

impl<const N: usize> Spline<N> {
    /// The spline through `values[i]` at `first + i · step`, with the "not-a-knot" end condition: the
    /// first two pieces are one cubic, and so are the last two. A cubic is reproduced exactly.
    ///
    /// Near an end it errs more than inside (by some 10 times in the first piece); where that matters, sample beyond
    /// the span and use [`Spline::with_margin`]. At least four values; `step` positive; everything finite.
    pub fn not_a_knot(first: f64, step: f64, values: &[[f64; N]]) -> Result<Self> {
        Self::with_margin(first, step, values, 0)
    }

    /// The same, with `margin` knots at each end that serve only to keep the end condition away: the
    /// spline's domain is `first + margin · step ..= first + (m − 1 − margin) · step`, `m` the number of values.
    ///
    /// An end effect fades by a factor of 2 − √3 = 0.268 a knot, so that 8 knots of margin leave 3e-5 of it.
    pub fn with_margin(first: f64, step: f64, values: &[[f64; N]], margin: usize) -> Result<Self> {
        let m = values.len();
        if m < 4 || m < 2 * margin + 2 {
            return Err(Error::invalid(
                "number of spline knots",
                m,
                format!("at least {}", 4.max(2 * margin + 2)),
            ));
        }
        if !(step > 0.0 && step.is_finite() && first.is_finite()) {
            return Err(Error::invalid(
                "spline knots",
                format!("first {first}, step {step}"),
                "finite, with a positive step",
            ));
        }
        if let Some(i) = values.iter().position(|v| v.iter().any(|c| !c.is_finite())) {
            return Err(Error::invalid(
                format!("spline value at knot {i}"),
                format!("{:?}", values[i]),
                "finite numbers",
            ));
        }
        let second = second_derivatives(values);
        let pieces = (margin..m - 1 - margin)
            .map(|i| {
                let mut piece = [[0.0; N]; 4];
                for c in 0..N {
                    let (here, next) = (second[i][c], second[i + 1][c]);
                    piece[0][c] = values[i][c];
                    piece[1][c] = (values[i + 1][c] - values[i][c]) - (2.0 * here + next) / 6.0;
                    piece[2][c] = here / 2.0;
                    piece[3][c] = (next - here) / 6.0;
                }
                piece
            })
            .collect();
        Ok(Spline { first: first + margin as f64 * step, step, pieces })
    }

    /// First abscissa of the domain.
    pub fn first(&self) -> f64 {
        self.first
    }

    /// Last abscissa of the domain, which belongs to it.
    pub fn last(&self) -> f64 {
        self.first + self.pieces.len() as f64 * self.step
    }

    /// Distance between knots.
    pub fn step(&self) -> f64 {
        self.step
    }

    /// All pieces, in order: piece `i` runs from knot `i` to knot `i + 1`.
    pub fn pieces(&self) -> &[Piece<N>] {
        &self.pieces
    }

    /// The piece in which `x` lies, and how far into it, as a fraction of a step.
    ///
    /// The caller keeps `x` within the domain; outside it the nearest end piece is continued (a cubic,
    /// soon worthless), and a NaN lands in the first piece with a NaN fraction.
    #[inline(always)]
    pub fn locate(&self, x: f64) -> (usize, f64) {
        let knots = (x - self.first) / self.step;
        // The conversion saturates: below the domain to 0, NaN to 0.
        let index = (knots as usize).min(self.pieces.len() - 1);
        (index, knots - index as f64)
    }

    /// All channels at `x`, which the caller keeps within the domain (see [`Spline::locate`]).
    #[inline(always)]
    pub fn value(&self, x: f64) -> [f64; N] {
        let (index, u) = self.locate(x);
        let [a, b, c, d] = &self.pieces[index];
        std::array::from_fn(|k| a[k] + u * (b[k] + u * (c[k] + u * d[k])))
    }

    /// All channels and their derivatives by `x`, which the caller keeps within the domain.
    #[inline(always)]
    pub fn value_and_rate(&self, x: f64) -> ([f64; N], [f64; N]) {
        let (index, u) = self.locate(x);
        let [a, b, c, d] = &self.pieces[index];
        let value = std::array::from_fn(|k| a[k] + u * (b[k] + u * (c[k] + u * d[k])));
        let rate = std::array::from_fn(|k| (b[k] + u * (2.0 * c[k] + u * (3.0 * d[k]))) / self.step);
        (value, rate)
    }

    /// The largest deviation of each channel from `exact`, measured at the middle (where a spline errs
    /// most) of every `every`-th piece, and of the last. `every = 0` counts as 1. NaN where `exact` gives NaN.
    pub fn error_between_knots(&self, mut exact: impl FnMut(f64) -> [f64; N], every: usize) -> [f64; N] {
        let mut worst = [0.0; N];
        let last = self.pieces.len() - 1;
        for i in (0..last).step_by(every.max(1)).chain([last]) {
            let x = self.first + (i as f64 + 0.5) * self.step;
            let (here, there) = (self.value(x), exact(x));
            for c in 0..N {
                let error = (here[c] - there[c]).abs();
                // Written so that a NaN stays: f64::max would drop it.
                if error > worst[c] || error.is_nan() {
                    worst[c] = error;
                }
            }
        }
        worst
    }
}

/// Second derivatives at the knots, by the step squared.
///
/// Continuity of the first derivative asks M[i−1] + 4 M[i] + M[i+1] = 6 (y[i−1] − 2 y[i] + y[i+1]) inside.
/// "Not a knot" asks M[0] = 2 M[1] − M[2], which put into the equation of i = 1 leaves 6 M[1] = 6 δ²y[1]:
/// the second and the last but one are known at once, and the rest is a tridiagonal system between them.
fn second_derivatives<const N: usize>(values: &[[f64; N]]) -> Vec<[f64; N]> {
    let m = values.len();
    let difference =
        |i: usize, c: usize| (values[i + 1][c] - values[i][c]) - (values[i][c] - values[i - 1][c]);
    let mut second = vec![[0.0; N]; m];
    for c in 0..N {
        second[1][c] = difference(1, c);
        second[m - 2][c] = difference(m - 2, c);
    }
    // Elimination downwards: M[i] = second[i] − factor[i] M[i+1], the pivots shared by all channels.
    let mut factor = vec![0.0; m];
    for i in 2..m - 2 {
        let pivot = 1.0 / (4.0 - factor[i - 1]);
        factor[i] = pivot;
        for c in 0..N {
            second[i][c] = (6.0 * difference(i, c) - second[i - 1][c]) * pivot;
        }
    }
    for i in (2..m - 2).rev() {
        for c in 0..N {
            second[i][c] -= factor[i] * second[i + 1][c];
        }
    }
    for c in 0..N {
        second[0][c] = 2.0 * second[1][c] - second[2][c];
        second[m - 1][c] = 2.0 * second[m - 2][c] - second[m - 3][c];
    }
    second
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sampled<const N: usize>(
        f: impl Fn(f64) -> [f64; N],
        first: f64,
        step: f64,
        m: usize,
        margin: usize,
    ) -> Spline<N> {
        let values: Vec<_> = (0..m).map(|i| f(first + i as f64 * step)).collect();
        Spline::with_margin(first, step, &values, margin).unwrap()
    }

    #[test]
    fn a_cubic_is_reproduced_for_any_number_of_knots() {
        let cubic = |x: f64| [1.0 - 2.0 * x + 0.5 * x * x + 0.25 * x * x * x, x];
        let rate = |x: f64| -2.0 + x + 0.75 * x * x;
        for m in 4..12 {
            let spline = sampled(cubic, -1.0, 0.5, m, 0);
            assert_eq!(spline.pieces().len(), m - 1);
            for i in 0..=20 {
                let x = spline.first() + (spline.last() - spline.first()) * f64::from(i) / 20.0;
                let (value, slope) = spline.value_and_rate(x);
                assert!((value[0] - cubic(x)[0]).abs() < 2e-13, "{m} knots at {x}");
                assert!((value[1] - x).abs() < 2e-14);
                assert!((slope[0] - rate(x)).abs() < 2e-13 && (slope[1] - 1.0).abs() < 2e-14);
                assert_eq!(value, spline.value(x));
            }
        }
    }

    #[test]
    fn joins_are_continuous_to_the_second_derivative() {
        let spline = sampled(|x| [x.sin(), (0.3 * x).exp()], 0.0, 0.7, 20, 0);
        for pair in spline.pieces().windows(2) {
            for c in 0..2 {
                let [a, b, q, d] = [pair[0][0][c], pair[0][1][c], pair[0][2][c], pair[0][3][c]];
                let scale = pair[1][0][c].abs().max(1.0);
                assert!((a + b + q + d - pair[1][0][c]).abs() < 1e-14 * scale);
                assert!((b + 2.0 * q + 3.0 * d - pair[1][1][c]).abs() < 1e-14 * scale);
                assert!((q + 3.0 * d - pair[1][2][c]).abs() < 1e-14 * scale);
            }
        }
    }

    #[test]
    fn errs_as_theory_says_and_no_more() {
        // The fourth derivatives reach 1; the next order of the expansion adds a part of about h²/4.
        for step in [0.2_f64, 0.1, 0.05] {
            let spline = sampled(|x| [x.sin(), x.cos()], 0.0, step, 200, 10);
            let bound = step.powi(4) / 384.0;
            for error in spline.error_between_knots(|x| [x.sin(), x.cos()], 1) {
                assert!(
                    error < (1.0 + step * step / 3.0) * bound && error > 0.98 * bound,
                    "step {step}: {error:e} against {bound:e}"
                );
            }
            let slope_bound = step.powi(3) / (72.0 * 3.0_f64.sqrt());
            let mut worst = 0.0_f64;
            for i in 0..5000 {
                let x = spline.first() + (spline.last() - spline.first()) * f64::from(i) / 4999.0;
                worst = worst.max((spline.value_and_rate(x).1[0] - x.cos()).abs());
            }
            assert!(
                worst < (1.0 + step) * slope_bound && worst > (1.0 - step) * slope_bound,
                "step {step}: {worst:e} against {slope_bound:e}"
            );
        }
    }

    #[test]
    fn margin_fades_the_end_effect_by_two_minus_root_three_a_knot() {
        // The end effect in the last piece: the difference from the spline of a margin so wide that it has none.
        let spline = |margin| sampled(|x: f64| [x.exp()], 0.0, 0.05, 60, margin);
        let clean = spline(20);
        let effect = |margin: usize| {
            let here = spline(margin);
            // The clean spline is shorter, so the function is shifted: exp(x) = exp(shift) exp(x − shift).
            let shift = 0.05 * (20 - margin) as f64;
            let x = here.last() - 0.025;
            here.value(x)[0] - shift.exp() * clean.value(x - shift)[0]
        };
        let ratio = 3.0_f64.sqrt() - 2.0;
        for margin in 1..6 {
            assert!((effect(margin + 1) / effect(margin) - ratio).abs() < 0.02, "margin {margin}");
        }
        assert!((effect(8) / effect(0)).abs() < 3e-5, "{:e}", effect(8) / effect(0));
    }

    #[test]
    fn the_measured_error_sees_a_wrong_value_and_keeps_nan() {
        let spline = sampled(|x| [x, x], 0.0, 1.0, 10, 0);
        let error = spline.error_between_knots(|x| [x, if x == 4.5 { x + 0.25 } else { x }], 2);
        assert!(error[0] < 1e-15 && (error[1] - 0.25).abs() < 1e-15);
        assert!(spline.error_between_knots(|x| [x, f64::NAN], 0)[1].is_nan());
    }

    #[test]
    fn ends_and_nan_are_safe() {
        let spline = sampled(|x| [x * x], 1.0, 0.5, 9, 0);
        assert_eq!((spline.first(), spline.last(), spline.step()), (1.0, 5.0, 0.5));
        assert!((spline.value(5.0)[0] - 25.0).abs() < 1e-13);
        assert_eq!(spline.locate(5.0).0, 7);
        assert_eq!(spline.locate(-1e300).0, 0);
        assert!(spline.value(f64::NAN)[0].is_nan());
    }

    #[test]
    fn wrong_calls_are_named() {
        for (what, result) in [
            ("at least 4", Spline::not_a_knot(0.0, 1.0, &[[0.0]; 3])),
            ("at least 18", Spline::with_margin(0.0, 1.0, &[[0.0]; 17], 8)),
            ("positive step", Spline::not_a_knot(0.0, 0.0, &[[0.0]; 5])),
            ("knot 2", Spline::not_a_knot(0.0, 1.0, &[[0.0], [0.0], [f64::NAN], [0.0]])),
        ] {
            let error = result.unwrap_err();
            assert!(error.is_invalid() && error.to_string().contains(what), "{error}");
        }
    }
}
