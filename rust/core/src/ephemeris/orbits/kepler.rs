//! The time equation of the two-body problem, for every conic with one formula.
//!
//! # Form
//! Universal variables counted from perihelion. With q the perihelion distance, λ = 1 − e, and time
//! in units of √(q³/GM),
//!
//! - m = w + e w³ c₃(λw²), to be solved for w;
//! - r/q = 1 + e w² c₂(λw²);
//! - along the perihelion, x/q = 1 − w² c₂; across it, y/(q√(1+e)) = w c₁;
//!
//! where c₀ … c₃ are Stumpff's functions (Stumpff 1959, *Himmelsmechanik* I; Danby 1988, *Fundamentals of
//! Celestial Mechanics*, §6.9). For an ellipse w = E/√λ, for a parabola w = √2 tan(ν/2), for a hyperbola w = H/√−λ;
//! nothing is singular or cancels where they meet, and dm/dw = r/q never falls below 1.
//!
//! # Method
//! The start is the cubic of Markley 1995 (*Celest. Mech. Dyn. Astron.* 63, 101, equations 5, 10, 14, 15, 20), in which
//! the same scaling by λ has been carried out so that it passes into Barker's equation at λ = 0. It is followed by one
//! correction of fifth order (his equations 21 to 26, with Stumpff's functions for the sines) and one of first.
//! That is a fixed number of plain operations: a loop over it vectorises. What is not settled by it, hyperbolas
//! with |λ|w² above 10 or far from the start, is done again by [`solve_safely`].
//!
//! # Error
//! |w + e w³c₃ − m| ≤ 1e-13 max(1, |m|) over 10⁷ random cases (`residual_over_ten_million_cases`, ignored for its
//! length; `residual_over_many_cases` takes 2·10⁵), 6e-15 measured.

use std::f64::consts::PI;

use crate::math::dispatch::{Arithmetic, Native};

/// Where in its conic a body is: see the module for x, y and r; `c0` is the derivative of y by w.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    /// Along the perihelion, in units of q.
    pub x: f64,
    /// Across it, in units of q√(1+e).
    pub y: f64,
    /// Distance from the Sun, in units of q.
    pub r: f64,
    /// dy/dw; dx/dw is −y.
    pub c0: f64,
    /// The universal anomaly.
    pub w: f64,
}

/// 1/(2k+2)! and 1/(2k+3)!: as far as |z| ≤ 10 needs.
const TERMS: usize = 14;
const C2: [f64; TERMS] = reciprocal_factorials(2);
const C3: [f64; TERMS] = reciprocal_factorials(3);
/// The series serve |z| up to here; the largest of an ellipse is π².
const SERIES_MAX: f64 = 10.0;

const fn reciprocal_factorials(first: usize) -> [f64; TERMS] {
    let mut table = [0.0; TERMS];
    let mut k = 0;
    while k < TERMS {
        // Products up to 29! are rounded a few times: each table entry is good to some 1e-15 at the worst, where
        // its term is below 1e-9 of the sum.
        let mut factorial = 1.0;
        let mut n = 2;
        while n <= 2 * k + first {
            factorial *= n as f64;
            n += 1;
        }
        table[k] = 1.0 / factorial;
        k += 1;
    }
    table
}

/// Stumpff's c₂ and c₃ by their series, |z| ≤ 10.
#[inline(always)]
fn series<A: Arithmetic>(z: f64) -> (f64, f64) {
    let (mut c2, mut c3) = (C2[TERMS - 1], C3[TERMS - 1]);
    for k in (0..TERMS - 1).rev() {
        c2 = A::multiply_add(-z, c2, C2[k]);
        c3 = A::multiply_add(-z, c3, C3[k]);
    }
    (c2, c3)
}

/// Stumpff's c₀ … c₃ of any z that does not overflow. Relative error 1e-15, but c₀ and c₁ near their zeros.
pub fn stumpff(z: f64) -> [f64; 4] {
    if z.abs() <= SERIES_MAX {
        let (c2, c3) = series::<Native>(z);
        [1.0 - z * c2, 1.0 - z * c3, c2, c3]
    } else if z > 0.0 {
        let root = z.sqrt();
        let (sin, cos) = root.sin_cos();
        [cos, sin / root, (1.0 - cos) / z, (root - sin) / (z * root)]
    } else {
        let root = (-z).sqrt();
        let (sinh, cosh) = (root.sinh(), root.cosh());
        [cosh, sinh / root, (1.0 - cosh) / z, (root - sinh) / (z * root)]
    }
}

/// A cube root to 1e-9, of a positive normal number: a start by thirds of the exponent and two steps of Halley's method.
#[inline(always)]
fn cube_root(x: f64) -> f64 {
    // A third of the upper word (the product is a division by 3), plus two thirds of the exponent's bias, less what
    // makes the start too large as often as too small.
    const OFFSET: u64 = ((1023.0 * 2.0 / 3.0 - 0.0331) * 1_048_576.0) as u64;
    let third = ((x.to_bits() >> 32) * 0xAAAA_AAAB) >> 33;
    let mut t = f64::from_bits((third + OFFSET) << 32);
    for _ in 0..2 {
        let cube = t * t * t;
        t *= (cube + 2.0 * x) / (2.0 * cube + x);
    }
    t
}

/// The solution by a fixed number of operations, and whether it is one. `m` of an ellipse must have been reduced to
/// half a period either side of perihelion.
#[inline(always)]
pub fn solve_quickly<A: Arithmetic>(e: f64, m: f64) -> (Place, bool) {
    let lambda = 1.0 - e;
    let ellipse = lambda.max(0.0);
    let size = m.abs();
    let mean = ellipse * ellipse.sqrt() * size;
    let alpha = (3.0 * PI * PI + 1.6 * PI * (PI - mean) / (1.0 + e)) * (1.0 / (PI * PI - 6.0));
    let d = 3.0 * lambda + alpha * e;
    let lm = lambda * size;
    let r = (3.0 * alpha * d * (d - lambda) + lambda * lm * lm) * size;
    let q = 2.0 * alpha * d - lm * lm;
    let root = cube_root(r + (q * q * q + r * r).max(0.0).sqrt());
    let s = root * root;
    let w = (2.0 * r * s / (s * s + s * q + q * q) + lm) / d;

    let (c2, c3) = series::<A>(lambda * w * w);
    let w2 = w * w;
    let f0 = A::multiply_add(e * w2 * w, c3, w - size);
    let f1 = A::multiply_add(e * w2, c2, 1.0);
    let f2 = e * w * A::multiply_add(-lambda * w2, c3, 1.0);
    let f3 = e * A::multiply_add(-lambda * w2, c2, 1.0);
    let d3 = -f0 / (f1 - 0.5 * f0 * f2 / f1);
    let d4 = -f0 / (f1 + d3 * (0.5 * f2 + d3 * (f3 * (1.0 / 6.0))));
    let d5 = -f0 / (f1 + d4 * (0.5 * f2 + d4 * (f3 * (1.0 / 6.0) - d4 * (lambda * f2 * (1.0 / 24.0)))));
    let w = w + d5;

    let w2 = w * w;
    let z = lambda * w2;
    let (c2, c3) = series::<A>(z);
    let f0 = A::multiply_add(e * w2 * w, c3, w - size);
    let f1 = A::multiply_add(e * w2, c2, 1.0);
    let step = -f0 / f1;
    // What the last step moves is below 1e-9 of w, so its square is nothing.
    let settled = step.abs() <= 1e-9 * w && z.abs() <= SERIES_MAX;
    let c0 = A::multiply_add(-z, c2, 1.0);
    let y = w * A::multiply_add(-z, c3, 1.0);
    let place = Place {
        x: A::multiply_add(-w2, c2, 1.0) - step * y,
        y: (y + step * c0).copysign_of(m),
        r: f1 + e * step * y,
        c0: c0 - step * lambda * y,
        w: (w + step).copysign_of(m),
    };
    (place, settled)
}

/// Puts the sign of `m` on a number computed for its size. Not `f64::copysign`: y has its own sign beyond aphelion.
trait CopySign {
    fn copysign_of(self, m: f64) -> f64;
}

impl CopySign for f64 {
    #[inline(always)]
    fn copysign_of(self, m: f64) -> f64 {
        if m < 0.0 { -self } else { self }
    }
}

/// The most steps [`solve_safely`] takes: bisection alone would be done by then.
const STEPS_MAX: usize = 80;

/// The solution by Newton's method between bounds. `m` as for [`solve_quickly`]; NaN for NaN.
pub fn solve_safely(e: f64, m: f64) -> Place {
    let lambda = 1.0 - e;
    let size = m.abs();
    if !(size.is_finite() && e.is_finite()) {
        return Place { x: f64::NAN, y: f64::NAN, r: f64::NAN, c0: f64::NAN, w: f64::NAN };
    }
    // m ≥ w, so w ≤ m. Without the growth of c₃ a hyperbola's w is larger than with it: its cubic bounds w from above.
    let mut high = size;
    let mut guess;
    if lambda > 0.0 {
        high = high.min(PI / lambda.sqrt() * (1.0 + 1e-15));
        guess = 0.5 * high;
    } else {
        high = high.min((6.0 * size / e).cbrt());
        guess = high;
        let root = (-lambda).sqrt();
        if root > 1e-4 {
            // With H = w√−λ: e sinh H = N + H ≤ N + H_high.
            let n = -lambda * root * size;
            guess = guess.min(((n + high * root) / e).asinh() / root);
        }
    }
    high *= 1.0 + 1e-14;
    let mut low = 0.0;
    let mut w = guess;
    let mut c = stumpff(lambda * w * w);
    for _ in 0..STEPS_MAX {
        let f0 = w - size + e * w * w * w * c[3];
        if f0 > 0.0 {
            high = w;
        } else {
            low = w;
        }
        let f1 = 1.0 + e * w * w * c[2];
        let f2 = e * w * c[1];
        let slope = f1 - 0.5 * f0 * f2 / f1;
        let mut next = w - f0 / if slope > 0.0 { slope } else { f1 };
        if !(next >= low && next <= high) {
            next = 0.5 * (low + high);
        }
        let step = next - w;
        w = next;
        c = stumpff(lambda * w * w);
        if step.abs() <= 2.0 * f64::EPSILON * w {
            break;
        }
    }
    Place {
        x: 1.0 - w * w * c[2],
        y: (w * c[1]).copysign_of(m),
        r: 1.0 + e * w * w * c[2],
        c0: c[0],
        w: w.copysign_of(m),
    }
}

/// The solution by whichever of the two is good; `m` of an ellipse is reduced first.
pub fn solve(e: f64, m: f64) -> Place {
    let lambda = 1.0 - e;
    let m = if lambda > 0.0 {
        let period = 2.0 * PI / (lambda * lambda.sqrt());
        m - period * (m / period).round()
    } else {
        m
    };
    let (place, settled) = solve_quickly::<Native>(e, m);
    if settled { place } else { solve_safely(e, m) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ephemeris::orbits::random::Random;
    use crate::math::dispatch::{Fused, Separate};

    /// Eccentricities of every kind, and m from minutes after perihelion to far out.
    fn random_case(random: &mut Random) -> (f64, f64) {
        let u = random.unit();
        let e = match random.below(6) {
            0 => u,
            1 => 1.0 - 10f64.powf(-12.0 * u),
            2 => 1.0 + (2.0 * u - 1.0) * 1e-9,
            3 => 1.0 + 10f64.powf(-12.0 + 12.0 * u),
            4 => 1.0 + 10.0 * u,
            _ => [0.0, 1.0, 1.0 - f64::EPSILON, 1.0 + f64::EPSILON, 100.0, 1e-18][random.below(6)],
        };
        let sign = if random.below(2) == 0 { 1.0 } else { -1.0 };
        let lambda = 1.0 - e;
        let m = if lambda > 0.0 {
            let half = PI / (lambda * lambda.sqrt());
            match random.below(3) {
                0 => half * random.unit(),
                1 => (half * 10f64.powf(-14.0 * random.unit())).min(1e9),
                _ => half.min(10f64.powf(-8.0 + 14.0 * random.unit())),
            }
        } else {
            10f64.powf(-8.0 + 15.0 * random.unit())
        };
        (e, sign * m)
    }

    /// The largest residual over cases, and how many of the ellipses went to the safe solver.
    fn worst_residual(cases: usize) -> (f64, usize) {
        let mut random = Random::new(20260301);
        let (mut worst, mut unsettled) = (0.0f64, 0);
        for _ in 0..cases {
            let (e, m) = random_case(&mut random);
            let (fused, settled) = solve_quickly::<Fused>(e, m);
            let (separate, settled_too) = solve_quickly::<Separate>(e, m);
            let safe = solve_safely(e, m);
            unsettled += usize::from(!settled && e <= 1.0);
            for (place, good) in [(fused, settled), (separate, settled_too), (safe, true)] {
                if !good {
                    continue;
                }
                let c = stumpff((1.0 - e) * place.w * place.w);
                let residual = place.w + e * place.w.powi(3) * c[3] - m;
                let relative = residual.abs() / m.abs().max(1.0);
                assert!(relative < 1e-13, "e {e:e}, m {m:e}: residual {relative:e}");
                worst = worst.max(relative);
                // On the conic: r = q(1+e) − e x in units of q.
                let gap = (place.r - (1.0 + e - e * place.x)).abs();
                assert!(
                    gap <= 4e-15 * (1.0 + e) * place.r.max(1.0),
                    "e {e:e}, m {m:e}: off the conic by {gap:e}"
                );
            }
        }
        (worst, unsettled)
    }

    #[test]
    fn residual_over_many_cases() {
        let (worst, unsettled) = worst_residual(200_000);
        println!("largest residual {worst:e}, ellipses not settled at once {unsettled}");
        assert_eq!(unsettled, 0);
    }

    #[test]
    #[ignore = "a minute"]
    fn residual_over_ten_million_cases() {
        let (worst, unsettled) = worst_residual(10_000_000);
        println!("largest residual {worst:e}, ellipses not settled at once {unsettled}");
        assert_eq!(unsettled, 0);
    }

    #[test]
    fn the_two_solvers_agree() {
        let mut random = Random::new(7);
        for _ in 0..20_000 {
            let (e, m) = random_case(&mut random);
            let (quick, settled) = solve_quickly::<Native>(e, m);
            if settled {
                let safe = solve_safely(e, m);
                let scale = safe.r * 1e-14 * (1.0 + e);
                assert!((quick.x - safe.x).abs() < 10.0 * scale.max(1e-14), "{e:e} {m:e} {quick:?} {safe:?}");
                assert!((quick.r - safe.r).abs() < 10.0 * scale, "{e:e} {m:e} {quick:?} {safe:?}");
            }
        }
    }

    /// Meeus, *Astronomical Algorithms*, 2nd edition, chapter 30, table 30.a: e = 0.1, M = 5° gives
    /// E = 5.554589°; and the last of the difficult cases, e = 0.99, M = 2°: E = 32.361007°. [M]
    #[test]
    fn published_eccentric_anomalies() {
        for (e, mean_deg, eccentric_deg) in [(0.1, 5.0, 5.554589), (0.99, 2.0, 32.361007)] {
            let lambda: f64 = 1.0 - e;
            let m = f64::to_radians(mean_deg) / (lambda * lambda.sqrt());
            let eccentric = (solve(e, m).w * lambda.sqrt()).to_degrees();
            assert!((eccentric - eccentric_deg).abs() < 1e-6, "{eccentric}");
        }
    }

    #[test]
    fn a_nan_stays_one() {
        for (e, m) in [(f64::NAN, 1.0), (0.5, f64::NAN), (1.5, f64::INFINITY)] {
            assert!(solve(e, m).x.is_nan());
        }
    }
}
