//! How far refraction near the horizon strays from any model of it.

use crate::constants::RADIANS_PER_DEGREE;
use crate::refraction::Refraction;

/// Standard deviation of refraction at the horizon, degrees: Sampson, Lozowski, Peterson & Hube 2003,
/// PASP 115, 1256.
const AT_HORIZON_DEG: f64 = 0.175;
/// Above this observed altitude, degrees, none is given.
const CEILING_DEG: f64 = 15.0;

/// Standard deviation of the refraction at an observed altitude, radians.
///
/// Measured at the horizon only; above it we let it fall with the square of the refraction itself,
/// because what varies is the lower air, whose share of the bending falls like that (common practice,
/// no source). Below the horizon it stays what it is at the horizon. Zero without refraction.
pub fn horizon_scatter(refraction: &Refraction, observed_altitude: f64) -> f64 {
    if observed_altitude > CEILING_DEG * RADIANS_PER_DEGREE {
        return 0.0;
    }
    let at_horizon = refraction.bending_at_observed(0.0);
    if at_horizon <= 0.0 {
        return 0.0;
    }
    let share = refraction.bending_at_observed(observed_altitude.max(0.0)) / at_horizon;
    AT_HORIZON_DEG * RADIANS_PER_DEGREE * share * share
}
