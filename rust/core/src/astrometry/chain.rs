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
use super::targets::Moving;
use crate::constants::{AU_PER_DAY_OVER_C, LIGHT_TIME_AU_S};
use crate::ephemeris::orbits::Orbits;
use crate::ephemeris::{Body, Ephemeris, State};
use crate::error::Status;
use crate::math::dispatch::Isa;
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

/// Vector from the observer to where a body was when the light left it, au, ICRS axes, and the light time in
/// seconds, iterated until it no longer changes.
///
/// # Errors
/// [`Status::OutsideEphemeris`] when the light left outside the ephemeris.
pub(super) fn when_light_left(
    body: Body,
    ephemeris: &Ephemeris,
    sky: &Sky,
) -> std::result::Result<(Vector, f64), Status> {
    // The error shrinks by v/c ≈ 1e-4 an iteration: after three it is below 1e-12 of the path.
    const ITERATIONS: usize = 3;
    let tdb = sky.tdb();
    let mut light_time_s = 0.0;
    let mut from_observer_au = [0.0; 3];
    for _ in 0..=ITERATIONS {
        let body_au = ephemeris.position(body, tdb.plus_seconds(-light_time_s))?;
        from_observer_au = sub(body_au, sky.observer_au);
        light_time_s = norm(from_observer_au) * LIGHT_TIME_AU_S;
    }
    Ok((from_observer_au, light_time_s))
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
    let (from_observer_au, _) = when_light_left(body, ephemeris, sky)?;
    Ok(match body {
        // Light from the Sun itself is not bent sideways, and none passes the Sun on its way from the Moon.
        Body::Sun | Body::Moon => {
            let light_distance_au = norm(from_observer_au);
            let natural = scale(1.0 / light_distance_au, from_observer_au);
            let direction = aberrated(natural, sky.velocity_c, sky.inverse_gamma, sky.sun_distance_au);
            BodyDirection { direction, light_distance_au }
        }
        _ => near_direction(from_observer_au, sky),
    })
}

/// Proper direction of what stood at `from_observer_au` when the light left it: deflection, aberration.
#[inline(always)]
pub fn near_direction(from_observer_au: Vector, sky: &Sky) -> BodyDirection {
    let light_distance_au = norm(from_observer_au);
    let coordinate = scale(1.0 / light_distance_au, from_observer_au);
    let from_sun = unit(add_scaled(from_observer_au, sky.sun_distance_au, sky.sun_to_observer));
    let natural = unit(deflected(coordinate, from_sun, sky.sun_to_observer, sky.sun_distance_au));
    let direction = aberrated(natural, sky.velocity_c, sky.inverse_gamma, sky.sun_distance_au);
    BodyDirection { direction, light_distance_au }
}

/// The observer of a sky as the tables of orbits take one: barycentric, au and au/day.
pub fn observer_state(sky: &Sky) -> State {
    State { position: sky.observer_au, velocity: scale(1.0 / AU_PER_DAY_OVER_C, sky.velocity_c) }
}

/// Proper direction of a row of orbits by two-body motion; NaN for a bad row.
///
/// Error of the chain: 1 µas of light time ([`Orbits::astrometric_batch`]) and of deflection as for a planet;
/// how far two-body motion itself may be off says [`Orbits::drift_au`].
///
/// # Errors
/// [`Status::OutsideEphemeris`] when there is no Sun at the instant.
pub fn orbit_direction(
    orbits: &Orbits,
    row: usize,
    isa: Isa,
    ephemeris: &Ephemeris,
    sky: &Sky,
) -> std::result::Result<BodyDirection, Status> {
    let tdb = sky.tdb();
    let sun = ephemeris.state(Body::Sun, tdb)?;
    let seen = orbits.astrometric(isa, row, tdb, observer_state(sky), sun);
    Ok(near_direction(seen.position, sky))
}

impl Moving<'_> {
    /// Proper direction: [`body_direction`] or [`orbit_direction`].
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn direction(&self, ephemeris: &Ephemeris, sky: &Sky) -> std::result::Result<BodyDirection, Status> {
        match *self {
            Moving::Body(body) => body_direction(body, ephemeris, sky),
            Moving::Orbit(orbits, row) => orbit_direction(orbits, row, Isa::best(), ephemeris, sky),
        }
    }
}
