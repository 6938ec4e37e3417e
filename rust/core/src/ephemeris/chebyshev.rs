//! Sums of Chebyshev series with vector coefficients, fetched one by one.
//!
//! Clenshaw's recurrence (Clenshaw 1955, *Math. Tables Aids Comput.* 9, 118) run from the highest
//! order down, for the value and, alongside, for the slope. The coefficients come from an iterator so
//! that both the compact table (packed integers) and the kernel (numbers of either byte order) are
//! summed straight from their bytes, with nothing allocated and nothing copied.
//!
//! The sums are so bracketed that one product and one sum stand between an order and the next; that
//! chain, not the arithmetic beside it, is what an evaluation waits for.

use crate::math::vector::Vector;

/// Σ cₖ Tₖ(x), |x| ≤ 1, from the coefficients of the higher orders, the highest first, and of order 0.
#[inline(always)]
pub(super) fn value(x: f64, higher: impl Iterator<Item = Vector>, constant: Vector) -> Vector {
    let two_x = 2.0 * x;
    let mut next = [0.0; 3];
    let mut after = [0.0; 3];
    for c in higher {
        for axis in 0..3 {
            let here = (c[axis] - after[axis]) + two_x * next[axis];
            after[axis] = next[axis];
            next[axis] = here;
        }
    }
    std::array::from_fn(|axis| (constant[axis] - after[axis]) + x * next[axis])
}

/// Σ cₖ Tₖ(x) and its derivative with respect to x, as [`value`].
///
/// The slope's recurrence is the derivative of the value's: with bₖ = cₖ + 2x bₖ₊₁ − bₖ₊₂,
/// b′ₖ = 2 bₖ₊₁ + 2x b′ₖ₊₁ − b′ₖ₊₂.
#[inline(always)]
pub(super) fn value_and_slope(
    x: f64,
    higher: impl Iterator<Item = Vector>,
    constant: Vector,
) -> (Vector, Vector) {
    let two_x = 2.0 * x;
    let mut next = [0.0; 3];
    let mut after = [0.0; 3];
    let mut slope_next = [0.0; 3];
    let mut slope_after = [0.0; 3];
    for c in higher {
        for axis in 0..3 {
            let slope_here = (2.0 * next[axis] - slope_after[axis]) + two_x * slope_next[axis];
            slope_after[axis] = slope_next[axis];
            slope_next[axis] = slope_here;
            let here = (c[axis] - after[axis]) + two_x * next[axis];
            after[axis] = next[axis];
            next[axis] = here;
        }
    }
    (
        std::array::from_fn(|axis| (constant[axis] - after[axis]) + x * next[axis]),
        std::array::from_fn(|axis| (next[axis] - slope_after[axis]) + x * slope_next[axis]),
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against Tₙ(cos θ) = cos nθ and T′ₙ(cos θ) = n sin nθ / sin θ.
    #[test]
    fn single_polynomials_are_cosines() {
        for order in 0..20 {
            for step in 1..60 {
                let theta = f64::from(step) * 0.052;
                let pick = |k: usize| if k == order { [1.0, -2.0, 0.5] } else { [0.0; 3] };
                let higher = (1..20).rev().map(pick);
                let (v, s) = value_and_slope(theta.cos(), higher.clone(), pick(0));
                let n = order as f64;
                let (value_wanted, slope_wanted) = ((n * theta).cos(), n * (n * theta).sin() / theta.sin());
                for (axis, factor) in [1.0, -2.0, 0.5].into_iter().enumerate() {
                    assert!((v[axis] - factor * value_wanted).abs() < 1e-13);
                    assert!((s[axis] - factor * slope_wanted).abs() < 2e-11);
                }
                assert_eq!(v, value(theta.cos(), higher, pick(0)));
            }
        }
    }
}
