//! The natural cubic spline through several channels on knots that need not be equally spaced.

/// The second derivatives at the knots of the twice continuously differentiable piecewise cubic through
/// `values` at spacings `steps` (one fewer), zero at both ends.
///
/// Between knots it errs by h⁴ f⁗/384 (Hall & Meyer 1976, Journal of Approximation Theory 16, 105: 5/384 as a
/// bound with the right end derivatives); the natural end costs a few hundredths of h² f″ in the last
/// steps, dying out by 0.27 a step.
pub(super) fn second_derivatives<const N: usize>(steps: &[f64], values: &[[f64; N]]) -> Vec<[f64; N]> {
    let count = values.len();
    debug_assert_eq!(steps.len() + 1, count);
    let mut second = vec![[0.0; N]; count];
    if count < 3 {
        return second;
    }
    // Elimination down the tridiagonal system: row i is h₋ m₋ + 2 (h₋ + h₊) m + h₊ m₊ = 6 (slope₊ − slope₋).
    let mut above = vec![0.0; count];
    for i in 1..count - 1 {
        let (before, after) = (steps[i - 1], steps[i]);
        let pivot = 2.0 * (before + after) - before * above[i - 1];
        above[i] = after / pivot;
        for c in 0..N {
            let bend = (values[i + 1][c] - values[i][c]) / after - (values[i][c] - values[i - 1][c]) / before;
            second[i][c] = (6.0 * bend - before * second[i - 1][c]) / pivot;
        }
    }
    for i in (1..count - 1).rev() {
        for c in 0..N {
            second[i][c] -= above[i] * second[i + 1][c];
        }
    }
    second
}

/// The value at `u` (0 to `step`) in the piece between two knots, each with its value and second derivative.
#[inline(always)]
pub(super) fn piece(u: f64, step: f64, [y0, y1]: [f64; 2], [m0, m1]: [f64; 2]) -> f64 {
    let (b, a) = (u / step, 1.0 - u / step);
    a * y0 + b * y1 + ((a * a - 1.0) * a * m0 + (b * b - 1.0) * b * m1) * (step * step / 6.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_wave_on_uneven_knots_is_followed_as_the_theory_says() {
        let wave = |x: f64| (0.9 * x).sin();
        let knots: Vec<f64> = (0..60).map(|k| f64::from(k) + 0.1 * f64::from(k % 3)).collect();
        let steps: Vec<f64> = knots.windows(2).map(|w| w[1] - w[0]).collect();
        let values: Vec<[f64; 1]> = knots.iter().map(|&x| [wave(x)]).collect();
        let second = second_derivatives(&steps, &values);
        let mut worst = 0.0_f64;
        for i in 10..50 {
            for k in 0..=10 {
                let u = steps[i] * f64::from(k) / 10.0;
                let found =
                    piece(u, steps[i], [values[i][0], values[i + 1][0]], [second[i][0], second[i + 1][0]]);
                worst = worst.max((found - wave(knots[i] + u)).abs());
            }
        }
        // 5/384 h⁴ f⁗ with h = 1.1.
        let bound = 5.0 / 384.0 * (1.1 * 0.9_f64).powi(4);
        assert!(worst < bound, "{worst} {bound}");
        assert!(worst > bound / 20.0, "{worst} {bound}");
    }

    #[test]
    fn a_line_is_reproduced_and_so_are_two_knots() {
        let second = second_derivatives(&[1.0, 1.5, 0.5], &[[1.0], [3.0], [6.0], [7.0]]);
        assert!(second.iter().flatten().all(|m| m.abs() < 1e-15));
        assert_eq!(second_derivatives(&[1.0], &[[1.0], [3.0]]), [[0.0], [0.0]]);
        assert_eq!(piece(0.25, 1.0, [1.0, 3.0], [0.0, 0.0]), 1.5);
    }
}
