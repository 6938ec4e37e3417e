//! Chebyshev series: fits, values, derivatives, bounds, and every sign change in an interval.
//!
//! `Chebyshev<N>` has `N` coefficients (degree `N − 1`) in place, without allocation, because one is made
//! per target. A vector-valued series is fitted once; its scalar product with a constant vector is a
//! scalar series whose roots are all found. Where the degree is known only at run time, the functions on
//! slices ([`fit`], [`clenshaw`], [`clenshaw_and_rate`]) do the same work.
//!
//! Reference: Mason & Handscomb, *Chebyshev Polynomials* (2003): section 2.4.1 for Clenshaw's summation,
//! section 6.3 for the discrete orthogonality behind the fit [from memory].

use crate::math::bernstein::{self, Crossing, Crossings};
use std::sync::OnceLock;

/// Σ c_k T_k(u) by Clenshaw's summation. `u` in −1 to 1; the empty sum is 0.
///
/// Rounding error at most 2e-16 · Σ (k + 1) |c_k|, proved by `clenshaw_is_as_exact_as_stated`.
#[inline(always)]
pub fn clenshaw(coefficients: &[f64], u: f64) -> f64 {
    let (mut b1, mut b2) = (0.0, 0.0);
    let double = 2.0 * u;
    for &c in coefficients.iter().skip(1).rev() {
        (b1, b2) = (double * b1 - b2 + c, b1);
    }
    coefficients.first().map_or(0.0, |&c| u * b1 - b2 + c)
}

/// Σ c_k T_k(u) and its derivative by `u`, from one pass: the recurrence differentiated term by term.
#[inline(always)]
pub fn clenshaw_and_rate(coefficients: &[f64], u: f64) -> (f64, f64) {
    let (mut b1, mut b2) = (0.0, 0.0);
    let (mut d1, mut d2) = (0.0, 0.0);
    let double = 2.0 * u;
    for &c in coefficients.iter().skip(1).rev() {
        // The derivative first: it uses the sum before this step.
        (d1, d2) = (double * d1 - d2 + 2.0 * b1, d1);
        (b1, b2) = (double * b1 - b2 + c, b1);
    }
    match coefficients.first() {
        Some(&c) => (u * b1 - b2 + c, u * d1 - d2 + b1),
        None => (0.0, 0.0),
    }
}

/// Abscissa in −1 to 1 of node `j` of `n` (zeros of T_n), from the right end to the left.
pub fn node(j: usize, n: usize) -> f64 {
    // A sine about the middle keeps the nodes exactly symmetric, and the middle one exactly 0.
    let numerator = n as f64 - (2 * j + 1) as f64;
    (std::f64::consts::PI * numerator / (2 * n) as f64).sin()
}

/// Coefficients from `samples[j]` at [`node`]`(j, n)`, `n` the number of samples and of coefficients.
///
/// The interpolating polynomial: its error is at most about twice that of the series cut at the same degree.
pub fn fit(samples: &[f64], coefficients: &mut [f64]) {
    let n = samples.len();
    assert_eq!(n, coefficients.len(), "as many coefficients as samples");
    let made;
    let cosine: &[f64] = match MATRICES.get(n) {
        Some(matrix) => matrix.get_or_init(|| cosines(n)),
        None => {
            made = cosines(n);
            &made
        }
    };
    coefficients.fill(0.0);
    for (j, &y) in samples.iter().enumerate() {
        for (c, &cosine) in coefficients.iter_mut().zip(&cosine[j * n..][..n]) {
            *c += y * cosine;
        }
    }
    for (k, c) in coefficients.iter_mut().enumerate() {
        *c *= if k == 0 { 1.0 } else { 2.0 } / n as f64;
    }
}

/// What [`fit`] multiplies so many samples by, made once: a series is fitted for every moving target a day.
static MATRICES: [OnceLock<Vec<f64>>; 65] = [const { OnceLock::new() }; 65];

/// cos(π k (2j + 1) / 2n), the n values of k for one j together. They are periodic in the numerator with period 4n: a
/// table of so many is exact enough.
fn cosines(n: usize) -> Vec<f64> {
    let table: Vec<f64> = (0..4 * n).map(|i| cosine_of_turn(i, 4 * n)).collect();
    (0..n).flat_map(|j| (0..n).map(move |k| k * (2 * j + 1) % (4 * n))).map(|i| table[i]).collect()
}

/// cos(2π i / n).
fn cosine_of_turn(i: usize, n: usize) -> f64 {
    (2.0 * std::f64::consts::PI * i as f64 / n as f64).cos()
}

/// A scalar Chebyshev series of `N` coefficients on an interval.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Chebyshev<const N: usize> {
    interval: Interval,
    coefficients: [f64; N],
}

/// A Chebyshev series of `K` components on an interval, `N` coefficients each.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ChebyshevVector<const N: usize, const K: usize> {
    interval: Interval,
    coefficients: [[f64; N]; K],
}

#[derive(Debug, Clone, Copy, PartialEq)]
struct Interval {
    start: f64,
    stop: f64,
}

impl Interval {
    fn new(start: f64, stop: f64) -> Self {
        Interval { start, stop }
    }

    #[inline(always)]
    fn half(self) -> f64 {
        0.5 * (self.stop - self.start)
    }

    /// −1 and 1 exactly at the ends.
    #[inline(always)]
    fn unit(self, x: f64) -> f64 {
        ((x - self.start) - (self.stop - x)) / (self.stop - self.start)
    }

    /// The ends exactly at −1 and 1.
    #[inline(always)]
    fn abscissa(self, u: f64) -> f64 {
        0.5 * (self.start * (1.0 - u) + self.stop * (1.0 + u))
    }
}

impl<const N: usize> Chebyshev<N> {
    /// The series with these coefficients on `start` to `stop`, which the caller keeps in that order and apart.
    #[inline(always)]
    pub fn new(start: f64, stop: f64, coefficients: [f64; N]) -> Self {
        Chebyshev { interval: Interval::new(start, stop), coefficients }
    }

    /// The interpolating series of `f`, sampled at `N` Chebyshev nodes of `start` to `stop`.
    pub fn fit(start: f64, stop: f64, mut f: impl FnMut(f64) -> f64) -> Self {
        ChebyshevVector::<N, 1>::fit(start, stop, |x| [f(x)]).component(0)
    }

    /// First and last abscissa.
    pub fn interval(&self) -> (f64, f64) {
        (self.interval.start, self.interval.stop)
    }

    /// The coefficients, of T_0 upwards.
    pub fn coefficients(&self) -> &[f64; N] {
        &self.coefficients
    }

    /// Value at `x`, which the caller keeps within the interval.
    #[inline(always)]
    pub fn value(&self, x: f64) -> f64 {
        clenshaw(&self.coefficients, self.interval.unit(x))
    }

    /// Value and derivative by `x` at `x`, which the caller keeps within the interval.
    #[inline(always)]
    pub fn value_and_rate(&self, x: f64) -> (f64, f64) {
        let (value, rate) = clenshaw_and_rate(&self.coefficients, self.interval.unit(x));
        (value, rate / self.interval.half())
    }

    /// The derivative as a series (its last coefficient is 0): its crossings are the extrema.
    pub fn derivative(&self) -> Self {
        let mut derived = [0.0; N];
        // c′[k−1] = c′[k+1] + 2 k c[k], from the top, the first halved.
        for k in (1..N).rev() {
            derived[k - 1] =
                2.0 * k as f64 * self.coefficients[k] + if k + 1 < N { derived[k + 1] } else { 0.0 };
        }
        derived[0] *= 0.5;
        let scale = 1.0 / self.interval.half();
        Chebyshev { interval: self.interval, coefficients: derived.map(|c| c * scale) }
    }

    /// Estimate of what the fit leaves out: the sum of the sizes of the last two coefficients (two, because
    /// every other one of an even or odd function is 0).
    ///
    /// An upper bound of the error for a function whose coefficients fall by a factor of two or more a degree;
    /// where they do not fall, no estimate helps: take a higher degree. Proved by `the_tail_covers_the_error`.
    pub fn tail(&self) -> f64 {
        self.coefficients.iter().rev().take(2).map(|c| c.abs()).sum()
    }

    /// The series plus a constant.
    #[inline(always)]
    pub fn plus(mut self, constant: f64) -> Self {
        self.coefficients[0] += constant;
        self
    }

    /// `a · self + b · other`, both on the same interval.
    #[inline(always)]
    pub fn combine(&self, a: f64, other: &Self, b: f64) -> Self {
        debug_assert_eq!(self.interval, other.interval, "series on one interval");
        let coefficients = std::array::from_fn(|k| a * self.coefficients[k] + b * other.coefficients[k]);
        Chebyshev { interval: self.interval, coefficients }
    }

    /// Lower and upper bound on the interval, c_0 ∓ Σ|c_k|: the cheapest that is safe.
    #[inline(always)]
    pub fn loose_bounds(&self) -> (f64, f64) {
        let spread: f64 = self.coefficients.iter().skip(1).map(|c| c.abs()).sum();
        (self.coefficients[0] - spread, self.coefficients[0] + spread)
    }

    /// Lower and upper bound on the interval, from the hull of the Bernstein coefficients where that is tighter.
    ///
    /// Safe up to rounding, 1e-16 of the largest Bernstein coefficient.
    pub fn bounds(&self) -> (f64, f64) {
        let (low, high) = self.loose_bounds();
        let hull = self.bernstein();
        (
            low.max(hull.iter().copied().fold(f64::INFINITY, f64::min)),
            high.min(hull.iter().copied().fold(f64::NEG_INFINITY, f64::max)),
        )
    }

    /// Coefficients in the Bernstein basis of degree `N − 1` on the interval, from its start to its stop.
    pub fn bernstein(&self) -> [f64; N] {
        bernstein::from_chebyshev(&self.coefficients)
    }

    /// Every sign change in [start, stop), in ascending order, each with its direction.
    ///
    /// * Half-open: a change exactly at `start` is reported, one exactly at `stop` is not.
    /// * A zero where the sign stays (a tangent, any even order) is not reported. Two crossings nearer than
    ///   about 1e-8 of the interval merge with rounding into such a tangent, and may be reported or not, but
    ///   always both or neither: directions alternate.
    /// * Abscissae are good to the rounding of the value divided by the slope; see [`bernstein::crossings`].
    pub fn crossings(&self) -> Crossings<N> {
        self.placed(self.crossings_of_unit(&self.bernstein()))
    }

    /// The same, made to agree with signs at the ends that the caller knows from elsewhere (`true`: positive).
    ///
    /// For spans that are joined: two fits differ by rounding at the joint, and a crossing there could be lost by both or
    /// found by both. If both spans are given the same sign of the exact function at their joint (zero counting
    /// as negative, say), each crossing is reported once, and directions alternate across the joint. A crossing
    /// that lies before the start or after the stop by these signs is dropped, a missing one is put at that end.
    pub fn crossings_between(&self, positive_at_start: bool, positive_at_stop: bool) -> Crossings<N> {
        let hull = self.bernstein();
        let mut found = self.crossings_of_unit(&hull);
        // The sign before the first crossing; without one, that of the end which stands farther from zero: the
        // coefficients between the ends may well have the other sign.
        let end = if hull[0].abs() >= hull[N - 1].abs() { hull[0] } else { hull[N - 1] };
        let own = found.first().map_or(end > 0.0, |c| !c.rising);
        found.reconcile(own, positive_at_start, positive_at_stop);
        self.placed(found)
    }

    fn crossings_of_unit(&self, hull: &[f64; N]) -> Crossings<N> {
        bernstein::crossings(hull, |u| clenshaw_and_rate(&self.coefficients, u))
    }

    fn placed(&self, mut found: Crossings<N>) -> Crossings<N> {
        for crossing in found.iter_mut() {
            let x = self.interval.abscissa(crossing.at);
            // The last step of rounding must not carry a crossing before the stop onto it.
            crossing.at = x.clamp(self.interval.start, self.interval.stop.next_down());
        }
        found
    }

    /// The first sign change in [start, stop), as [`Chebyshev::crossings`] defines it.
    pub fn first_crossing(&self) -> Option<Crossing> {
        self.crossings().first().copied()
    }
}

impl<const N: usize, const K: usize> ChebyshevVector<N, K> {
    /// The series with these coefficients, `[component][degree]`, on `start` to `stop`.
    pub fn new(start: f64, stop: f64, coefficients: [[f64; N]; K]) -> Self {
        ChebyshevVector { interval: Interval::new(start, stop), coefficients }
    }

    /// The interpolating series of `f`, sampled at `N` Chebyshev nodes of `start` to `stop`, from the last to the first.
    pub fn fit(start: f64, stop: f64, mut f: impl FnMut(f64) -> [f64; K]) -> Self {
        let interval = Interval::new(start, stop);
        let samples = std::array::from_fn(|j| f(interval.abscissa(node(j, N))));
        Self::through(start, stop, &samples)
    }

    /// The interpolating series through samples at the `N` Chebyshev nodes of `start` to `stop`, from the last to the
    /// first.
    pub fn through(start: f64, stop: f64, samples: &[[f64; K]; N]) -> Self {
        let mut coefficients = [[0.0; N]; K];
        for (k, coefficients) in coefficients.iter_mut().enumerate() {
            fit(&samples.map(|sample| sample[k]), coefficients);
        }
        ChebyshevVector { interval: Interval::new(start, stop), coefficients }
    }

    /// First and last abscissa.
    pub fn interval(&self) -> (f64, f64) {
        (self.interval.start, self.interval.stop)
    }

    /// One component as a scalar series.
    pub fn component(&self, k: usize) -> Chebyshev<N> {
        Chebyshev { interval: self.interval, coefficients: self.coefficients[k] }
    }

    /// Value at `x`, which the caller keeps within the interval.
    #[inline(always)]
    pub fn value(&self, x: f64) -> [f64; K] {
        let u = self.interval.unit(x);
        std::array::from_fn(|k| clenshaw(&self.coefficients[k], u))
    }

    /// Value and derivative by `x` at `x`, which the caller keeps within the interval.
    #[inline(always)]
    pub fn value_and_rate(&self, x: f64) -> ([f64; K], [f64; K]) {
        let u = self.interval.unit(x);
        let (mut value, mut rate) = ([0.0; K], [0.0; K]);
        for k in 0..K {
            let (v, r) = clenshaw_and_rate(&self.coefficients[k], u);
            (value[k], rate[k]) = (v, r / self.interval.half());
        }
        (value, rate)
    }

    /// Estimate of what the fit leaves out, a component: see [`Chebyshev::tail`].
    pub fn tail(&self) -> [f64; K] {
        std::array::from_fn(|k| self.component(k).tail())
    }

    /// The scalar product with a constant vector, as a scalar series.
    #[inline(always)]
    pub fn dot(&self, vector: [f64; K]) -> Chebyshev<N> {
        let mut coefficients = [0.0; N];
        for k in 0..K {
            for i in 0..N {
                coefficients[i] += self.coefficients[k][i] * vector[k];
            }
        }
        Chebyshev { interval: self.interval, coefficients }
    }
}

#[cfg(test)]
mod tests;
