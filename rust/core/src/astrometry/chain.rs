//! The order of the chain, in one place.
//!
//! For a star: space motion → parallax → deflection by the Sun → aberration → (rotation to the local
//! horizon, [`Sky::local`]). For a body of the solar system: light time → deflection → aberration.
//! Both end in the proper direction, a unit vector on the axes of the GCRS, as seen by the observer
//! on the turning Earth. Refraction acts on the altitude only and is applied by the caller who wants
//! an observed one.

use super::aberration::aberrated;
use super::catalog::Star;
use super::deflection::deflected;
use super::parallax::{from_observer, light_travel_lead_yr};
use super::sky::Sky;
use crate::constants::LIGHT_TIME_AU_S;
use crate::ephemeris::{Body, Ephemeris};
use crate::error::Status;
use crate::math::vector::{Vector, add_scaled, norm, scale, sub, unit};

/// Direction of a star before light is bent: space motion and parallax, a unit vector on the axes of the
/// ICRS from a barycentric position (au) at an instant (Julian years after J2000.0).
///
/// For callers who follow many stars over weeks: it changes so slowly that it may be interpolated.
#[inline(always)]
pub fn coordinate_direction(star: &Star, epoch_yr: f64, observer_au: Vector) -> Vector {
    let years = epoch_yr - star.epoch_yr + light_travel_lead_yr(star.position, observer_au);
    let barycentric = add_scaled(star.position, years, star.motion);
    unit(from_observer(barycentric, star.parallax, observer_au))
}

/// Proper direction of a star: unit vector, GCRS axes, as the observer of `sky` sees it.
///
/// Error: below 5 µas against the IAU chain with its own Earth series and below 2 µas with the same
/// Earth, farther than 5° from the Sun (`tests/test_accuracy_place.py`). NaN in, NaN out.
#[inline(always)]
pub fn star_direction(star: &Star, sky: &Sky) -> Vector {
    let coordinate = coordinate_direction(star, sky.epoch_yr, sky.observer_au);
    let natural = deflected(coordinate, coordinate, sky.sun_to_observer, sky.sun_distance_au);
    aberrated(natural, sky.velocity_c, sky.inverse_gamma, sky.sun_distance_au)
}

/// Where a body of the solar system is seen.
#[derive(Debug, Clone, Copy)]
pub struct BodyDirection {
    /// Proper direction: unit vector, GCRS axes.
    pub direction: Vector,
    /// Distance travelled by the light that arrives now, au.
    pub light_distance_au: f64,
}

/// Proper direction of a body, light time iterated until it no longer changes.
///
/// # Errors
/// [`Status::OutsideEphemeris`] when the light left outside the ephemeris.
pub fn body_direction(
    body: Body,
    ephemeris: &Ephemeris,
    sky: &Sky,
) -> std::result::Result<BodyDirection, Status> {
    // The error shrinks by v/c ≈ 1e-4 an iteration: after three it is below 1e-12 of the path.
    const ITERATIONS: usize = 3;
    let tdb = sky.tdb();
    let mut light_time_s = 0.0;
    let mut from_observer_au = [0.0; 3];
    let mut body_au = [0.0; 3];
    for _ in 0..=ITERATIONS {
        body_au = ephemeris.position(body, tdb.plus_seconds(-light_time_s))?;
        from_observer_au = sub(body_au, sky.observer_au);
        light_time_s = norm(from_observer_au) * LIGHT_TIME_AU_S;
    }
    let light_distance_au = norm(from_observer_au);
    let coordinate = scale(1.0 / light_distance_au, from_observer_au);
    let natural = match body {
        // Light from the Sun itself is not bent sideways, and none passes the Sun on its way from the Moon.
        Body::Sun | Body::Moon => coordinate,
        _ => {
            let from_sun = unit(sub(body_au, sky.sun_au));
            unit(deflected(coordinate, from_sun, sky.sun_to_observer, sky.sun_distance_au))
        }
    };
    let direction = aberrated(natural, sky.velocity_c, sky.inverse_gamma, sky.sun_distance_au);
    Ok(BodyDirection { direction, light_distance_au })
}
