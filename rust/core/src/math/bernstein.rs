//! Polynomials in the Bernstein basis, where the signs of the coefficients bound the number of roots.
//!
//! Over the interval, a polynomial has at most as many roots as its Bernstein coefficients have sign changes,
//! less an even number; none when there is none, exactly one when there is one (Descartes' rule in this
//! basis). Halving the interval by de Casteljau's scheme never adds sign changes, and in the end leaves each
//! crossing alone in its piece. Nothing is sampled, so nothing can hide between samples.
//!
//! References: Lane & Riesenfeld 1981, BIT 21, 112 (bounds on a polynomial and isolation of its roots);
//! Rababah 2003, Comput. Methods Appl. Math. 3, 608, theorem 2 (Chebyshev to Bernstein) [both from memory].

use crate::math::roots::newton_between;

/// A place where a function changes sign.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Crossing {
    /// The abscissa.
    pub at: f64,
    /// Whether the sign goes from negative to positive.
    pub rising: bool,
}

/// The crossings of a polynomial of `N` coefficients, fewer than `N`, in ascending order; used as a slice.
#[derive(Debug, Clone, Copy)]
pub struct Crossings<const N: usize> {
    items: [Crossing; N],
    count: usize,
}

impl<const N: usize> Crossings<N> {
    fn new() -> Self {
        Crossings { items: [Crossing { at: f64::NAN, rising: false }; N], count: 0 }
    }

    fn push(&mut self, at: f64, rising: bool) {
        // A polynomial of degree N − 1 has no more than that many; rounding of a vanishing one must not panic.
        if self.count < N {
            self.items[self.count] = Crossing { at, rising };
            self.count += 1;
        }
    }

    /// Brings the crossings into line with signs known from outside at −1 and at 1; `own` is the sign before the first.
    ///
    /// Rounding may carry a crossing over an end. One within 1e-6 of an end whose sign is other than known
    /// has been so carried inwards and is dropped; where there is none, one was carried outwards and is put at the end.
    pub(super) fn reconcile(&mut self, own: bool, start: bool, stop: bool) {
        const NEAR: f64 = 1e-6;
        if own != start {
            if self.first().is_some_and(|c| c.at < NEAR - 1.0) || self.count == N {
                self.items.copy_within(1..self.count, 0);
                self.count -= 1;
            } else {
                self.items.copy_within(0..self.count, 1);
                self.items[0] = Crossing { at: -1.0, rising: !start };
                self.count += 1;
            }
        }
        if self.last().map_or(start, |c| c.rising) != stop {
            if self.last().is_some_and(|c| c.at > 1.0 - NEAR) || self.count == N {
                self.count -= 1;
            } else {
                self.push(1.0, stop);
            }
        }
    }
}

impl<const N: usize> std::ops::Deref for Crossings<N> {
    type Target = [Crossing];
    fn deref(&self) -> &[Crossing] {
        &self.items[..self.count]
    }
}

impl<const N: usize> std::ops::DerefMut for Crossings<N> {
    fn deref_mut(&mut self) -> &mut [Crossing] {
        &mut self.items[..self.count]
    }
}

/// The change of basis from Chebyshev to Bernstein, computed at compile time in whole numbers.
struct Conversion<const N: usize>;

impl<const N: usize> Conversion<N> {
    /// `[k][j]`: Bernstein coefficient `j`, of degree `N − 1`, of T_k.
    const MATRIX: [[f64; N]; N] = conversion();
}

/// Largest number of coefficients whose conversion fits into 128-bit whole numbers.
pub const MOST_COEFFICIENTS: usize = 40;

/// Rababah's theorem 2: `M[k][j] = Σ_i (−1)^(k−i) C(2k, 2i) C(n−k, j−i) / C(n, j)`.
const fn conversion<const N: usize>() -> [[f64; N]; N] {
    assert!(N >= 1 && N <= MOST_COEFFICIENTS, "1 to 40 coefficients");
    let mut choose = [[0i128; 2 * MOST_COEFFICIENTS]; 2 * MOST_COEFFICIENTS];
    let mut row = 0;
    while row < 2 * N {
        choose[row][0] = 1;
        let mut i = 1;
        while i <= row {
            choose[row][i] = choose[row - 1][i - 1] + choose[row - 1][i];
            i += 1;
        }
        row += 1;
    }
    let n = N - 1;
    let mut matrix = [[0.0; N]; N];
    let mut k = 0;
    while k <= n {
        let mut j = 0;
        while j <= n {
            let mut sum = 0i128;
            let mut i = (j + k).saturating_sub(n);
            while i <= j && i <= k {
                let term = choose[2 * k][2 * i] * choose[n - k][j - i];
                sum += if (k - i) % 2 == 0 { term } else { -term };
                i += 1;
            }
            matrix[k][j] = sum as f64 / choose[n][j] as f64;
            j += 1;
        }
        k += 1;
    }
    matrix
}

/// Bernstein coefficients on −1 to 1, of degree `N − 1`, of a Chebyshev series of up to [`MOST_COEFFICIENTS`].
///
/// Rounding error below N · 1e-16 times the sum over k of |c_k| and the largest element of column T_k of the change
/// of basis. That element grows as 2^k, so that a series whose coefficients fall by a factor of two or more a degree loses nothing.
#[inline]
pub fn from_chebyshev<const N: usize>(coefficients: &[f64; N]) -> [f64; N] {
    let mut bernstein = [0.0; N];
    // The smallest terms first.
    for k in (0..N).rev() {
        for j in 0..N {
            bernstein[j] += coefficients[k] * Conversion::<N>::MATRIX[k][j];
        }
    }
    bernstein
}

/// Every sign change in [−1, 1) of the polynomial with these Bernstein coefficients, in ascending order.
///
/// `value_and_rate` evaluates the same polynomial (in whatever basis is most exact) and polishes each
/// isolated crossing until a step no longer moves it: then it is good to the rounding of the value over the slope.
///
/// A zero at −1 counts when the sign changes there, at 1 never. Even zeros never count. Where a
/// piece has sunk below 8e-16 of the largest coefficient at the beginning it is rounding: the signs at its ends
/// decide between one crossing and none. A pair must thus reach 8e-16 · max|b| past zero to be found, and is
/// then found. Coefficients that are not finite give no crossing.
pub fn crossings<const N: usize>(
    coefficients: &[f64; N],
    value_and_rate: impl FnMut(f64) -> (f64, f64),
) -> Crossings<N> {
    let mut search = Search {
        noise: 8e-16 * coefficients.iter().fold(0.0_f64, |m, c| m.max(c.abs())),
        value_and_rate,
        positive: false,
        found: Crossings::new(),
    };
    if coefficients.iter().all(|c| c.is_finite()) {
        // The order of a zero at the very start is the number of leading zeros: odd, and the sign changes there.
        let order = coefficients.iter().take_while(|&&c| c == 0.0).count();
        if order < N {
            search.positive = (coefficients[order] > 0.0) ^ (order % 2 == 1);
            search.descend(coefficients, -1.0, 1.0);
        }
    }
    search.found
}

struct Search<const N: usize, F> {
    /// Below this size coefficients are rounding.
    noise: f64,
    value_and_rate: F,
    /// The sign of the polynomial just before what is still to be searched.
    positive: bool,
    found: Crossings<N>,
}

impl<const N: usize, F: FnMut(f64) -> (f64, f64)> Search<N, F> {
    /// Finds the crossings in [`left`, `right`), over which `b` are the polynomial's coefficients.
    fn descend(&mut self, b: &[f64; N], left: f64, right: f64) {
        let Some(&first) = b.iter().find(|&&c| c != 0.0) else { return };
        // Neighbouring pieces share the value at their joint, so that this happens only with a zero at the very start.
        if (first > 0.0) != self.positive {
            self.report(left);
        }
        let changes = sign_changes(b);
        if changes == 0 {
            return;
        }
        if changes == 1 && b[0] != 0.0 && b[N - 1] != 0.0 {
            // One crossing, alone: start where the line between the ends crosses.
            let guess = left + (right - left) * (b[0] / (b[0] - b[N - 1]));
            let at = newton_between(&mut self.value_and_rate, left, right, !self.positive, guess, 0.0);
            self.report(at);
            return;
        }
        if let Some((fraction, lower, upper)) = self.divide(b) {
            let joint = left + (right - left) * fraction;
            if left < joint && joint < right {
                self.descend(&lower, left, joint);
                self.descend(&upper, joint, right);
                return;
            }
        }
        // Nothing is left to divide by but rounding.
        if changes % 2 == 1 {
            let middle = left + 0.5 * (right - left);
            let at = newton_between(&mut self.value_and_rate, left, right, !self.positive, middle, 0.0);
            self.report(at);
        }
    }

    /// The two parts of a piece, cut near the middle where the value stands clear of rounding, so that the sign
    /// at the joint is certain: a joint on a root would hand the root, or a wrong sign, to the neighbour.
    fn divide(&self, b: &[f64; N]) -> Option<(f64, [f64; N], [f64; N])> {
        const FRACTIONS: [f64; 7] = [0.5, 0.4375, 0.5625, 0.375, 0.625, 0.25, 0.75];
        FRACTIONS.iter().find_map(|&fraction| {
            let (lower, upper) = parts(b, fraction);
            (upper[0].abs() > self.noise).then_some((fraction, lower, upper))
        })
    }

    fn report(&mut self, at: f64) {
        self.positive = !self.positive;
        self.found.push(at, self.positive);
        // Up and down again at one abscissa is no crossing but a tangent seen through rounding.
        if let [.., before, last] = *self.found
            && before.at >= last.at
        {
            self.found.count -= 2;
        }
    }
}

/// The number of sign changes along the coefficients, zeros passed over.
#[inline]
fn sign_changes<const N: usize>(b: &[f64; N]) -> usize {
    let mut changes = 0;
    let mut last = 0.0;
    for &c in b {
        if c != 0.0 {
            changes += usize::from(last != 0.0 && (c < 0.0) != (last < 0.0));
            last = c;
        }
    }
    changes
}

/// The two parts of a piece, before and after a fraction of it, by de Casteljau's scheme.
#[inline]
fn parts<const N: usize>(b: &[f64; N], fraction: f64) -> ([f64; N], [f64; N]) {
    let mut lower = [0.0; N];
    let mut upper = *b;
    for level in 0..N {
        lower[level] = upper[0];
        for i in 0..N - 1 - level {
            upper[i] = (1.0 - fraction) * upper[i] + fraction * upper[i + 1];
        }
    }
    // What stands in `upper` now is the second part: entry i was last averaged at level N − 1 − i.
    (lower, upper)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn conversion_of_the_first_polynomials_is_the_known_one() {
        // T_0 = 1, T_1 = u, T_2 = 2u² − 1 on −1 to 1 in degree 2: (1, 1, 1), (−1, 0, 1), (1, −3, 1).
        assert_eq!(from_chebyshev(&[1.0, 0.0, 0.0]), [1.0, 1.0, 1.0]);
        assert_eq!(from_chebyshev(&[0.0, 1.0, 0.0]), [-1.0, 0.0, 1.0]);
        assert_eq!(from_chebyshev(&[0.0, 0.0, 1.0]), [1.0, -3.0, 1.0]);
        // And the largest allowed compiles: every T_k is 1 at the right end.
        assert_eq!(
            from_chebyshev(&[1.0; MOST_COEFFICIENTS])[MOST_COEFFICIENTS - 1],
            MOST_COEFFICIENTS as f64
        );
    }

    #[test]
    fn parts_share_the_joint_and_keep_the_ends() {
        // u on −1 to 1, degree 3: coefficients are evenly spaced.
        let (lower, upper) = parts(&[-1.0, -1.0 / 3.0, 1.0 / 3.0, 1.0], 0.5);
        assert_eq!((lower[0], lower[3], upper[0], upper[3]), (-1.0, 0.0, 0.0, 1.0));
        assert!((lower[1] + 2.0 / 3.0).abs() < 1e-15 && (upper[2] - 2.0 / 3.0).abs() < 1e-15);
    }
}
