//! How the Earth is turned: precession and nutation, Earth rotation, polar motion.
//!
//! Models: IAU 2006 precession, IAU 2000A nutation with the IAU 2006 adjustments, the CIO locator s and
//! the Earth rotation angle of the IERS Conventions (2010), chapter 5. Observed: UT1, the pole and the
//! celestial pole offsets from the tables of the IERS, in [`Orientation`].
//!
//! The chain from the GCRS to the ITRS is
//! `polar_motion(xp, yp, s′) · R₃(earth_rotation_angle) · celestial_to_intermediate(X + dX, Y + dY, s)`,
//! where s is computed from X and Y of the model before dX and dY are added.

mod arguments;
mod daily_table;
mod extrapolation;
mod iers_tables;
mod intermediate;
mod nutation;
mod orientation;
mod precession;
mod precession_nutation;
mod rotation;
mod spline;
mod tables;

pub use intermediate::{Intermediate, celestial_to_intermediate};
pub use nutation::{Nutation, nutation, nutation_iau_2000a};
pub use orientation::{Orientation, Pole, Provenance, Quality, Source, ut1};
pub use precession::{PrecessionAngles, mean_obliquity, precession_angles};
pub use precession_nutation::{
    PrecessionNutation, bias_precession_nutation, equation_of_the_origins, intermediate,
};
pub use rotation::{
    earth_rotation_angle, greenwich_apparent_sidereal_time, greenwich_mean_sidereal_time, polar_motion,
    s_prime,
};

/// A polynomial by rising powers, at `t`.
#[inline(always)]
fn polynomial<const N: usize>(coefficients: &[f64; N], t: f64) -> f64 {
    coefficients.iter().rev().fold(0.0, |sum, c| sum * t + c)
}
