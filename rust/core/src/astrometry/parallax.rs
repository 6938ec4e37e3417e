//! Parallax: the star seen from the observer and not from the barycentre.

use crate::constants::{DAYS_PER_JULIAN_YEAR, LIGHT_TIME_AU_S, SECONDS_PER_DAY};
use crate::math::vector::{Vector, add_scaled, dot};

/// Light time of one astronomical unit in Julian years.
const LIGHT_TIME_AU_YR: f64 = LIGHT_TIME_AU_S / (SECONDS_PER_DAY * DAYS_PER_JULIAN_YEAR);

/// The years by which light reaches the observer before it reaches the barycentre (the Rømer term,
/// ESA 1997, SP-1200 vol. 1, equation 1.2.12): the star is seen where it stood that much later.
#[inline(always)]
pub fn light_travel_lead_yr(direction: Vector, observer_au: Vector) -> f64 {
    dot(direction, observer_au) * LIGHT_TIME_AU_YR
}

/// Vector from the observer to the star, in units of the star's distance at epoch.
#[inline(always)]
pub fn from_observer(barycentric: Vector, parallax: f64, observer_au: Vector) -> Vector {
    add_scaled(barycentric, -parallax, observer_au)
}
