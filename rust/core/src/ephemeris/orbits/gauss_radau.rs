//! Integration of second-order equations of motion to the 15th order, with steps of its own choice.
//!
//! # Method
//! Everhart 1985 (in *Dynamics of Comets: Their Origin and Evolution*, p. 185) in the form and with the step control of
//! Rein & Spiegel 2015 (*Mon. Not. R. Astron. Soc.* 446, 1424): over a step the acceleration is a polynomial of seventh
//! degree in time, fitted at the eight Gauss–Radau points; the points follow from the polynomial and it from them, until
//! they agree. The next step is as long as makes the polynomial's last coefficient a given share of the acceleration
//! (their equations 9 and 11, ε = [`TOLERANCE`]). The nodes and the matrix of Newton's divided differences are
//! computed, once, rather than written down.
//!
//! # Error
//! At ε = 1e-9 the truncation of a step is below the rounding (their figure 2). See [`advance`](super::advance) for what
//! is measured.

use std::sync::OnceLock;

use crate::error::Status;
use crate::math::vector::Vector;

/// Share of the acceleration that the last coefficient may have.
pub const TOLERANCE: f64 = 1e-9;
/// Steps after which an integration is given up: a body caught in a loop about a planet.
const STEPS_MAX: usize = 200_000;
/// Most passes over the nodes of a step; two to four are usual.
const PASSES_MAX: usize = 12;
/// The shortest step, days: below a tenth of a second nothing in the solar system turns.
const STEP_MIN_D: f64 = 1e-6;
/// Nodes after the first, which is the step's start.
const N: usize = 7;

struct Tables {
    /// The nodes as shares of the step; the first is 0.
    node: [f64; N + 1],
    /// 1/Π(hₙ − hⱼ) over the nodes before each.
    divisor: [[f64; N]; N],
    /// Coefficients of h Π(h − hⱼ) over the nodes before the n-th: row n−1, powers of h from the first.
    newton: [[f64; N]; N],
}

fn tables() -> &'static Tables {
    static TABLES: OnceLock<Tables> = OnceLock::new();
    TABLES.get_or_init(|| {
        let mut node = [0.0; N + 1];
        for (k, node) in node.iter_mut().enumerate().skip(1) {
            // Roots of P₇ + P₈ over 1 + x, from those of a Chebyshev polynomial.
            let mut x = -(std::f64::consts::PI * (2.0 * k as f64) / 15.0).cos();
            for _ in 0..50 {
                let (p, slope) = radau(x);
                x -= p / slope;
            }
            *node = 0.5 * (1.0 + x);
        }
        let mut divisor = [[0.0; N]; N];
        let mut newton = [[0.0; N]; N];
        let mut product = [0.0; N];
        product[0] = 1.0;
        for n in 0..N {
            newton[n] = product;
            for j in 0..=n {
                divisor[n][j] = 1.0 / (node[n + 1] - node[j]);
            }
            // Times (h − node of n+1).
            for power in (0..N).rev() {
                let lower = if power > 0 { product[power - 1] } else { 0.0 };
                product[power] = lower - node[n + 1] * product[power];
            }
        }
        Tables { node, divisor, newton }
    })
}

/// P₇ + P₈ and its slope at x.
fn radau(x: f64) -> (f64, f64) {
    let (mut before, mut now) = (1.0, x);
    let (mut slope_before, mut slope_now) = (0.0, 1.0);
    let mut sum = (0.0, 0.0);
    for n in 1..8 {
        let k = n as f64;
        let next = ((2.0 * k + 1.0) * x * now - k * before) / (k + 1.0);
        let slope_next = slope_before + (2.0 * k + 1.0) * now;
        (before, now) = (now, next);
        (slope_before, slope_now) = (slope_now, slope_next);
        if n >= 6 {
            sum = (sum.0 + now, sum.1 + slope_now);
        }
    }
    sum
}

/// The forces of a problem: what is needed of them at an instant, and the acceleration by it.
pub trait Forces {
    /// What depends on time only: worked out once a node, whatever the number of passes.
    type Sky: Copy;

    /// At `days` after the start.
    fn sky(&self, days: f64) -> Result<Self::Sky, Status>;

    /// Acceleration, au/d²; [`Status::NoDirection`] inside a body.
    fn acceleration(&self, sky: &Self::Sky, position: Vector, velocity: Vector) -> Result<Vector, Status>;
}

/// Carries a position and a velocity over `days` (of either sign). `first_step` is a guess.
///
/// Besides what the forces report: [`Status::NotATime`] where `days` is not finite, and [`Status::NoDirection`] where 200,000
/// steps do not suffice or the acceleration is not finite.
pub fn integrate<F: Forces>(
    forces: &F,
    mut position: Vector,
    mut velocity: Vector,
    days: f64,
    first_step: f64,
) -> Result<(Vector, Vector), Status> {
    if !days.is_finite() {
        return Err(Status::NotATime);
    }
    let t = tables();
    let sign = if days < 0.0 { -1.0 } else { 1.0 };
    let mut now = 0.0;
    let mut step = sign * first_step.abs().max(STEP_MIN_D);
    // The polynomial's coefficients, and what was foreseen of them.
    let mut b = [[0.0; 3]; N];
    let mut foreseen = [[0.0; 3]; N];
    let mut start_sky = forces.sky(0.0)?;
    for _ in 0..STEPS_MAX {
        let left = days - now;
        if left == 0.0 {
            return Ok((position, velocity));
        }
        let last = step.abs() >= left.abs();
        if last {
            let ratio = left / step;
            if ratio < 1.0 {
                foreseen = extrapolated(&foreseen, ratio, 0.0);
                b = extrapolated(&b, ratio, 0.0);
            }
            step = left;
        }
        let start = forces.acceleration(&start_sky, position, velocity)?;
        let mut skies = [start_sky; N + 1];
        for n in 1..=N {
            skies[n] = forces.sky(now + t.node[n] * step)?;
        }
        // Divided differences that go with b.
        let mut g = differences(&b, t);
        let mut change_before = f64::INFINITY;
        for pass in 0..PASSES_MAX {
            let mut change = 0.0f64;
            let mut size = 0.0f64;
            for n in 1..=N {
                let (x, v) = at(position, velocity, start, &b, t.node[n], step);
                let a = forces.acceleration(&skies[n], x, v)?;
                for axis in 0..3 {
                    let mut difference = (a[axis] - start[axis]) * t.divisor[n - 1][0];
                    for j in 1..n {
                        difference = (difference - g[j - 1][axis]) * t.divisor[n - 1][j];
                    }
                    let moved = difference - g[n - 1][axis];
                    g[n - 1][axis] = difference;
                    for power in 0..n {
                        b[power][axis] += moved * t.newton[n - 1][power];
                    }
                    size = size.max(a[axis].abs());
                    if n == N {
                        change = change.max(moved.abs());
                    }
                }
            }
            let change = change / size;
            if !change.is_finite() {
                return Err(Status::NoDirection);
            }
            if change < 1e-16 || pass > 1 && change >= change_before {
                break;
            }
            change_before = change;
        }
        let largest = |v: Vector| v[0].abs().max(v[1].abs()).max(v[2].abs());
        let share = largest(b[N - 1]) / largest(start);
        let factor = if share > 0.0 { (TOLERANCE / share).powf(1.0 / 7.0) } else { 4.0 };
        if factor < 0.25 && step.abs() > STEP_MIN_D {
            // Too long by far: again, with nothing foreseen.
            step *= factor.max(0.01);
            b = [[0.0; 3]; N];
            foreseen = b;
            continue;
        }
        (position, velocity) = at(position, velocity, start, &b, 1.0, step);
        if last {
            return Ok((position, velocity));
        }
        now += step;
        start_sky = forces.sky(now)?;
        let factor = factor.min(4.0);
        let next = sign * (step * factor).abs().max(STEP_MIN_D);
        // What the last forecast missed by, the next is taken to miss by as well.
        let mut corrected = extrapolated(&b, next / step, 1.0);
        let forecast = corrected;
        for (k, row) in corrected.iter_mut().enumerate() {
            for axis in 0..3 {
                row[axis] += b[k][axis] - foreseen[k][axis];
            }
        }
        // A forecast far outside the fit is worth nothing.
        (b, foreseen) = if factor > 2.0 { ([[0.0; 3]; N], [[0.0; 3]; N]) } else { (corrected, forecast) };
        step = next;
    }
    Err(Status::NoDirection)
}

/// Position and velocity at a share `h` of a step.
#[inline]
fn at(
    position: Vector,
    velocity: Vector,
    start: Vector,
    b: &[[f64; 3]; N],
    h: f64,
    step: f64,
) -> (Vector, Vector) {
    let time = h * step;
    let mut x = [0.0; 3];
    let mut v = [0.0; 3];
    for axis in 0..3 {
        let (mut once, mut twice) = (0.0, 0.0);
        for power in (0..N).rev() {
            let k = power as f64;
            once = (once + b[power][axis] / (k + 2.0)) * h;
            twice = (twice + b[power][axis] / ((k + 2.0) * (k + 3.0))) * h;
        }
        x[axis] = position[axis] + time * (velocity[axis] + time * (0.5 * start[axis] + twice));
        v[axis] = velocity[axis] + time * (start[axis] + once);
    }
    (x, v)
}

/// The same polynomial about the point `from` of its step (0 or 1), for a step `ratio` times as long: its coefficients but
/// the constant one.
fn extrapolated(b: &[[f64; 3]; N], ratio: f64, from: f64) -> [[f64; 3]; N] {
    let mut out = [[0.0; 3]; N];
    let mut scale = ratio;
    for k in 0..N {
        // Binomials of (from + h)^(j+1).
        let mut binomial = 1.0;
        for j in k..N {
            if j > k {
                binomial *= (j + 1) as f64 / (j - k) as f64 * from;
            }
            for axis in 0..3 {
                out[k][axis] += binomial * b[j][axis];
            }
        }
        for axis in 0..3 {
            out[k][axis] *= scale;
        }
        scale *= ratio;
    }
    out
}

/// Divided differences of a polynomial: the inverse of its expansion in [`Tables::newton`], which is triangular with ones
/// on its diagonal.
fn differences(b: &[[f64; 3]; N], t: &Tables) -> [[f64; 3]; N] {
    let mut g = *b;
    for n in (0..N).rev() {
        for power in 0..n {
            for axis in 0..3 {
                g[power][axis] -= g[n][axis] * t.newton[n][power];
            }
        }
    }
    g
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ephemeris::orbits::{Elements, GM_SUN};
    use crate::math::vector::{dot, norm, scale, sub};
    use crate::time::Instant;

    /// The nodes as printed by Everhart 1985 and by Rein & Spiegel 2015, their first digits [M].
    #[test]
    fn published_nodes() {
        let printed = [
            0.0,
            0.0562625605,
            0.1802406917,
            0.3526247171,
            0.5471536263,
            0.7342101772,
            0.8853209468,
            0.9775206136,
        ];
        for (node, printed) in tables().node.into_iter().zip(printed) {
            assert!((node - printed).abs() < 1e-10, "{node} {printed}");
        }
    }

    struct TwoBodies;

    impl Forces for TwoBodies {
        type Sky = ();

        fn sky(&self, _: f64) -> Result<(), Status> {
            Ok(())
        }

        fn acceleration(&self, (): &(), x: Vector, _: Vector) -> Result<Vector, Status> {
            let square = dot(x, x);
            Ok(scale(-GM_SUN / (square * square.sqrt()), x))
        }
    }

    /// Against the closed solution, for ten years, from circles to a sungrazer.
    #[test]
    fn two_bodies_move_as_kepler_has_them() {
        for (e, q, bound) in [
            (0.0, 2.5, 1e-13),
            (0.3, 1.8, 2e-13),
            (0.9, 0.2, 2e-11),
            (0.999, 0.01, 2e-10),
            (1.0, 0.5, 1e-12),
            (1.5, 1.0, 1e-12),
        ] {
            let first = Elements {
                epoch: Instant::from_mjd(60_000.0, 0.0),
                perihelion_au: q,
                eccentricity: e,
                inclination: 0.5,
                node: 1.0,
                perihelion_argument: 2.0,
                since_perihelion_d: -100.0,
            };
            for days in [3652.5, -3652.5] {
                let state = first.state();
                let (x, v) = integrate(&TwoBodies, state.position, state.velocity, days, 1.0).unwrap();
                let exact = first.at(first.epoch.plus_days(days)).state();
                let apart = norm(sub(x, exact.position)) / norm(exact.position);
                let speed = norm(sub(v, exact.velocity)) / norm(exact.velocity);
                println!("e {e}, q {q}, {days} d: {apart:e}, {speed:e}");
                assert!(apart < bound && speed < bound, "e {e}: {apart:e} {speed:e}");
            }
        }
    }
}
