//! Minor bodies: osculating orbits, their motion about the Sun, and where they come from.
//!
//! An orbit is a conic about the Sun at an epoch: heliocentric, osculating, referred to the ecliptic and
//! equinox of J2000.0, whose obliquity is [`OBLIQUITY`] exactly. The equator of J2000.0 is taken as
//! the plane of the ICRS, as the Minor Planet Center and JPL do; positions come out along ICRS axes.
//!
//! - [`Elements`] is one orbit as a value: from a state, to a state, at another epoch.
//! - [`Orbits`] is very many, a column an element, with what is common to all instants computed once.
//! - [`kepler`] solves the time equation for every eccentricity from 0 up.
//! - [`mpc`] reads the Minor Planet Center's lines; [`designation`] its packed names.
//! - [`advance`] carries orbits to another epoch under the pull of the Sun, the Moon and the planets.
//! - [`drift`] says how far two-body motion may be off.
pub mod advance;
mod batch;
pub mod designation;
pub mod drift;
pub mod elements;

pub mod gauss_radau;
pub mod kepler;
pub mod mpc;

pub mod table;
#[cfg(test)]
pub(crate) mod random;

pub use batch::Look;
pub use elements::Elements;
pub use table::{Anomaly, Columns, Orbits, Slope};

use crate::constants::RADIANS_PER_ARCSECOND;
use crate::math::vector::Vector;

/// Obliquity of the ecliptic of J2000.0, radians: 84381.448″ (IAU 1976; the value to which elements of
/// minor bodies are referred).
pub const OBLIQUITY: f64 = 84_381.448 * RADIANS_PER_ARCSECOND;

/// GM of the Sun, au³/d² of TDB: 132712440041.279419 km³/s² of DE440 (Park et al. 2021, *Astron. J.* 161,
/// 105, table 2) in the au of IAU 2012. The square of Gauss's constant, 0.01720209895², is larger by 5e-12 of
/// itself: 0.00001″ a year for a main-belt orbit.
pub const GM_SUN: f64 = 132_712_440_041.279_419 * KM3_S2_IN_AU3_D2;

/// One km³/s² in au³/d².
pub(crate) const KM3_S2_IN_AU3_D2: f64 = 86_400.0 * 86_400.0 / (AU_KM * AU_KM * AU_KM);
const AU_KM: f64 = 149_597_870.7;

/// From axes of the ecliptic of J2000.0 to ICRS axes.
pub fn from_ecliptic(v: Vector) -> Vector {
    let (sin, cos) = OBLIQUITY.sin_cos();
    [v[0], cos * v[1] - sin * v[2], sin * v[1] + cos * v[2]]
}

/// From ICRS axes to axes of the ecliptic of J2000.0.
pub fn to_ecliptic(v: Vector) -> Vector {
    let (sin, cos) = OBLIQUITY.sin_cos();
    [v[0], cos * v[1] + sin * v[2], cos * v[2] - sin * v[1]]
}
