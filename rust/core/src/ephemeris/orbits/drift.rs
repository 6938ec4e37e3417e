//! How far two-body motion may be off: a figure from the size of the perturbing accelerations, cheap enough for every row
//! of every call.
//!
//! # Form
//! A is the largest tidal acceleration by each of the eight planets, added up: for every planet the line-up at which it
//! comes nearest, |1/Δ² ∓ 1/r_p²| GM, with Δ the gap between the planet's range of distances from the Sun and
//! the body's. A constant acceleration along the motion displaces by A t²/2 at first and by 3/2 A t² after a revolution
//! (Hill's equations); beyond a coherence time, half a period of the body, line-ups come and go and the growth is taken as
//! linear. So
//!
//! drift = A t · min(t, P/2) · (1/2 + min(1, 2t/P)).
//!
//! # What it is worth
//! Measured against [`advance`](super::advance) in `drift_covers_what_integration_finds`: see there for the shares. It is
//! no strict bound: a body whose orbit meets a planet's takes Δ no smaller than [`PASSAGE_AU`], and a closer passage is
//! not foreseen.

use super::{Elements, GM_SUN};
use crate::constants::RADIANS_PER_ARCSECOND;
use crate::math::vector::norm;

/// Beyond this, seen from the observer, a two-body place is called far from its epoch: 5″, radians.
pub const LIMIT: f64 = 5.0 * RADIANS_PER_ARCSECOND;

/// The least distance at which a planet is taken to pass, in units of the planet's mean distance from the Sun.
pub const PASSAGE_AU: f64 = 0.1;

/// Sun's mass over the planet's with its satellites (IAU 2009 system, Luzum et al. 2011, *Celest. Mech. Dyn. Astron.* 110,
/// 293, table 1, rounded), perihelion and aphelion in au (mean elements of J2000.0, rounded).
const PLANETS: [(f64, f64, f64); 8] = [
    (6.0236e6, 0.307, 0.467),
    (4.08523719e5, 0.718, 0.728),
    (3.28900559e5, 0.983, 1.017),
    (3.09870359e6, 1.381, 1.666),
    (1.047348644e3, 4.95, 5.46),
    (3.4979018e3, 9.02, 10.05),
    (2.290298e4, 18.3, 20.1),
    (1.941226e4, 29.8, 30.3),
];

/// The size of the perturbing acceleration for an orbit, au/d².
pub fn perturbation(elements: &Elements) -> f64 {
    let q = elements.perihelion_au;
    if q.is_nan() {
        return f64::NAN;
    }
    let now = norm(elements.state().position);
    let aphelion = if elements.eccentricity < 1.0 {
        q * (1.0 + elements.eccentricity) / (1.0 - elements.eccentricity)
    } else {
        f64::INFINITY
    };
    // A comet does not reach its aphelion while its elements are in use.
    let (low, high) = (q, aphelion.min(1.5 * now + 0.5));
    PLANETS
        .iter()
        .map(|&(inverse_mass, perihelion, aphelion)| {
            let gap = (low - aphelion).max(perihelion - high).max(0.0);
            let nearest = gap.max(PASSAGE_AU * 0.5 * (perihelion + aphelion));
            let direct = 1.0 / (nearest * nearest);
            let indirect = 1.0 / (perihelion * perihelion);
            // Outside the body's orbit both pull the same way and the difference counts; inside, against each other.
            let sum = if perihelion > high { direct - indirect.min(0.9 * direct) } else { direct + indirect };
            GM_SUN / inverse_mass * sum
        })
        .sum()
}

/// The drift after `days`, au, for an orbit and its [`perturbation`].
pub fn drift_au(elements: &Elements, perturbation: f64, days: f64) -> f64 {
    let t = days.abs();
    let half_period = 0.5 * elements.period_d();
    perturbation * t * t.min(half_period) * (0.5 + (t / half_period).min(1.0))
}
