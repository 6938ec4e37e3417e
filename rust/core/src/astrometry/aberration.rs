//! Stellar aberration, relativistic.
//!
//! Urban & Seidelmann (2013), §7.2.5, equation 7.40 (Lorentz boost), with the potential of the Sun
//! in the term that Klioner (2003, AJ 125, 1580, equation 9) gives; that term is 0.4 µas at most.

use crate::constants::SUN_SCHWARZSCHILD_RADIUS_AU;
use crate::math::vector::{Vector, dot, unit};

/// Proper direction, a unit vector, from the natural one.
///
/// * `natural`: unit vector in the barycentric frame
/// * `velocity_c`: barycentric velocity of the observer in units of the speed of light
/// * `inverse_gamma`: √(1 − v²)
/// * `sun_distance_au`: distance of the observer from the Sun
#[inline(always)]
pub fn aberrated(natural: Vector, velocity_c: Vector, inverse_gamma: f64, sun_distance_au: f64) -> Vector {
    let along = dot(natural, velocity_c);
    let potential = SUN_SCHWARZSCHILD_RADIUS_AU / sun_distance_au;
    // The reciprocal is the same for all stars of a sky: a loop over them divides once.
    let of_velocity = 1.0 + along * (1.0 / (1.0 + inverse_gamma)) + potential;
    let of_natural = inverse_gamma - potential * along;
    unit([
        of_natural * natural[0] + of_velocity * velocity_c[0],
        of_natural * natural[1] + of_velocity * velocity_c[1],
        of_natural * natural[2] + of_velocity * velocity_c[2],
    ])
}
