//! Space motion: where a star stands at an instant, from its place and motion at the catalogue epoch.
//!
//! The standard model of astrometric catalogues (ESA 1997, *The Hipparcos and Tycho Catalogues*,
//! SP-1200 vol. 1, §1.2.8 and equation 1.2.16): uniform rectilinear motion through space. With the
//! distance at epoch as the unit of length the barycentric vector is u₀ + (t − T₀) m, where m holds
//! the proper motion across the line of sight and the radial velocity along it. Perspective
//! acceleration and the change of the parallax follow from that without further terms.

use crate::constants::{ASTRONOMICAL_UNIT_M, DAYS_PER_JULIAN_YEAR, SECONDS_PER_DAY};
use crate::math::vector::Vector;

/// One km/s in au per Julian year. Exact.
const AU_PER_YEAR_PER_KM_S: f64 = 1e3 * SECONDS_PER_DAY * DAYS_PER_JULIAN_YEAR / ASTRONOMICAL_UNIT_M;

/// The unit vector of a catalogue place and its rate, per Julian year, in units of the distance at epoch.
///
/// * `right_ascension`, `declination`: radians, ICRS
/// * `motion_right_ascension` (with the factor cos δ), `motion_declination`: radians per Julian year
/// * `parallax`: radians; `radial_velocity_km_s`: positive when receding
pub fn position_and_motion(
    right_ascension: f64,
    declination: f64,
    motion_right_ascension: f64,
    motion_declination: f64,
    parallax: f64,
    radial_velocity_km_s: f64,
) -> (Vector, Vector) {
    let (sin_a, cos_a) = right_ascension.sin_cos();
    let (sin_d, cos_d) = declination.sin_cos();
    let radial = AU_PER_YEAR_PER_KM_S * radial_velocity_km_s * parallax;
    let position = [cos_d * cos_a, cos_d * sin_a, sin_d];
    let motion = [
        -motion_right_ascension * sin_a - motion_declination * sin_d * cos_a + radial * position[0],
        motion_right_ascension * cos_a - motion_declination * sin_d * sin_a + radial * position[1],
        motion_declination * cos_d + radial * position[2],
    ];
    (position, motion)
}
