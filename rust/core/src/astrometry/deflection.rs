//! Deflection of light by the Sun.
//!
//! Urban & Seidelmann (eds.), *Explanatory Supplement to the Astronomical Almanac*, 3rd ed. (2013),
//! §7.2.4, equation 7.63, for a body at finite distance; a star is the case in which the direction
//! from the Sun equals the direction from the observer. 4 mas at 90° from the Sun, 1.75″ at its limb.
//! Planets and the Moon deflect too (Jupiter 17 mas at its limb, below 0.01 mas beyond 0.5°): left out.

use crate::constants::SUN_SCHWARZSCHILD_RADIUS_AU;
use crate::math::vector::{Vector, dot};

/// The smallest 1 + q·e for which the formula is used: 4.9′ from the centre, inside the Sun's disc.
/// Behind it the formula has a pole; nothing is seen there, but the direction must stay finite.
const SMALLEST_DENOMINATOR: f64 = 1e-6;

/// The deflected direction, not normalised (its length differs from one by less than 1e-11).
///
/// * `direction`: unit vector from the observer to the body
/// * `from_sun`: unit vector from the Sun to the body; `direction` itself for a star
/// * `sun_to_observer`: unit vector; `sun_distance_au`: its length
#[inline(always)]
pub fn deflected(
    direction: Vector,
    from_sun: Vector,
    sun_to_observer: Vector,
    sun_distance_au: f64,
) -> Vector {
    let q_e = dot(from_sun, sun_to_observer);
    let p_q = dot(direction, from_sun);
    let p_e = dot(direction, sun_to_observer);
    let strength = SUN_SCHWARZSCHILD_RADIUS_AU / sun_distance_au / (1.0 + q_e).max(SMALLEST_DENOMINATOR);
    [
        direction[0] + strength * (p_q * sun_to_observer[0] - p_e * from_sun[0]),
        direction[1] + strength * (p_q * sun_to_observer[1] - p_e * from_sun[1]),
        direction[2] + strength * (p_q * sun_to_observer[2] - p_e * from_sun[2]),
    ]
}
