//! How far two-body motion may be off: a figure from the size of the perturbing accelerations, cheap enough for every row
//! of every call.
//!
//! # Form
//! Two accelerations are kept for an orbit: A₀, that of the eight planets at its epoch, from the compact ephemeris, and A₁,
//! the largest it may meet: for every planet the line-up at which it comes nearest, |1/Δ² ∓ 1/r_p²| GM, with Δ the gap
//! between the planet's range of distances from the Sun and the body's, all added up. What acts over a time t is
//! taken to pass from A₀ to A₁ in half the period P of the body,
//!
//! A = A₀ + (A₁ − A₀) min(1, 2t/P).
//!
//! A constant acceleration along the motion displaces by A t²/2 at first and by 3/2 A t² after a revolution (Hill's
//! equations); beyond half a period line-ups come and go and the growth is taken as linear. So
//!
//! drift = A t · min(t, P/2) · (1/2 + min(1, 2t/P)).
//!
//! # What it is worth
//! Measured against [`advance`](super::advance) by `drift_covers_what_integration_finds`, on 200 orbits of either kind (the
//! test takes 60): of the main belt every drift was covered, the stated one being 1.1 times the true one in the median
//! after 10 days, 1.9 after 60, 2.5 after 100, 11 after 400 and 17 after 2000 or more; near the Earth 99 in 100 were
//! covered or more, at 2 times after 10 days and 10 to 80 times later. It is no strict bound: a body whose orbit meets a
//! planet's takes Δ no smaller than [`PASSAGE`], and a closer passage is not foreseen.

use super::{Elements, GM_SUN};
use crate::constants::RADIANS_PER_ARCSECOND;
use crate::ephemeris::{Body, Compact};
use crate::math::vector::{Vector, add_scaled, dot, norm, sub};
use crate::time::{Instant, Tdb};

/// Beyond this, seen from the observer, a two-body place is called far from its epoch: 5″, radians.
pub const LIMIT: f64 = 5.0 * RADIANS_PER_ARCSECOND;

/// The least distance at which a planet is taken to pass, in units of the planet's mean distance from the Sun.
pub const PASSAGE: f64 = 0.1;

/// Sun's mass over the planet's with its satellites (IAU 2009 system, Luzum et al. 2011, *Celest. Mech. Dyn. Astron.* 110,
/// 293, table 1, rounded), perihelion and aphelion in au (mean elements of J2000.0, rounded).
const PLANETS: [(Body, f64, f64, f64); 8] = [
    (Body::Mercury, 6.0236e6, 0.307, 0.467),
    (Body::Venus, 4.08523719e5, 0.718, 0.728),
    (Body::Earth, 3.28900559e5, 0.983, 1.017),
    (Body::Mars, 3.09870359e6, 1.381, 1.666),
    (Body::Jupiter, 1.047348644e3, 4.95, 5.46),
    (Body::Saturn, 3.4979018e3, 9.02, 10.05),
    (Body::Uranus, 2.290298e4, 18.3, 20.1),
    (Body::Neptune, 1.941226e4, 29.8, 30.3),
];

/// The planets about the Sun at an instant, au; `None` outside the compact ephemeris.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Planets {
    epoch: Instant<Tdb>,
    positions: Option<[Vector; PLANETS.len()]>,
}

impl Planets {
    /// At an instant.
    pub fn at(epoch: Instant<Tdb>) -> Planets {
        let compact = Compact::builtin();
        let positions = compact.position(Body::Sun, epoch).ok().map(|sun| {
            PLANETS.map(|(body, ..)| compact.position(body, epoch).map_or([f64::NAN; 3], |p| sub(p, sun)))
        });
        Planets { epoch, positions }
    }

    /// The instant.
    pub fn epoch(&self) -> Instant<Tdb> {
        self.epoch
    }
}

/// What perturbs an orbit, au/d².
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Perturbation {
    /// A₀.
    pub now: f64,
    /// A₁.
    pub largest: f64,
}

/// The perturbing accelerations of an orbit; `planets` at its epoch.
pub fn perturbation(elements: &Elements, planets: &Planets) -> Perturbation {
    let q = elements.perihelion_au;
    if q.is_nan() {
        return Perturbation { now: f64::NAN, largest: f64::NAN };
    }
    let position = elements.state().position;
    let aphelion = if elements.eccentricity < 1.0 {
        q * (1.0 + elements.eccentricity) / (1.0 - elements.eccentricity)
    } else {
        f64::INFINITY
    };
    // A comet does not reach its aphelion while its elements are in use.
    let (low, high) = (q, aphelion.min(1.5 * norm(position) + 0.5));
    let mut largest = 0.0;
    for &(_, inverse_mass, perihelion, aphelion) in &PLANETS {
        let gap = (low - aphelion).max(perihelion - high).max(0.0);
        let nearest = gap.max(PASSAGE * 0.5 * (perihelion + aphelion));
        let direct = 1.0 / (nearest * nearest);
        let indirect = 1.0 / (perihelion * perihelion);
        // A planet beyond the body pulls it and the Sun the same way, and the difference counts; one inside may pull them
        // apart.
        let sum = if perihelion > high { direct - indirect.min(0.9 * direct) } else { direct + indirect };
        largest += GM_SUN / inverse_mass * sum;
    }
    let now = planets.positions.map_or(largest, |planets| {
        let mut sum = [0.0; 3];
        for (planet, &(_, inverse_mass, ..)) in planets.into_iter().zip(&PLANETS) {
            let gm = GM_SUN / inverse_mass;
            let away = sub(planet, position);
            sum = add_scaled(sum, gm / cubed(away), away);
            sum = add_scaled(sum, -gm / cubed(planet), planet);
        }
        norm(sum)
    });
    Perturbation { now, largest: largest.max(now) }
}

fn cubed(v: Vector) -> f64 {
    let square = dot(v, v);
    square * square.sqrt()
}

/// The drift after `days`, au, for an orbit of a period (days; infinite for none) and its [`perturbation`].
pub fn drift_au(perturbation: Perturbation, period_d: f64, days: f64) -> f64 {
    let t = days.abs();
    let half_period = 0.5 * period_d.min(PERIOD_MAX_D);
    let Perturbation { now, largest } = perturbation;
    let acting = now + (largest - now) * (t / half_period).min(1.0);
    acting * t * t.min(half_period) * (0.5 + (t / half_period).min(1.0))
}

/// Longer periods, and none, are taken for this: twelve years, in which Jupiter meets everything.
const PERIOD_MAX_D: f64 = 4383.0;
