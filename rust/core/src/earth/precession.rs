//! IAU 2006 precession in the four angles of Fukushima and Williams.

use super::polynomial;
use crate::constants::RADIANS_PER_ARCSECOND;
use crate::math::vector::{Matrix, product, rotation_1, rotation_3};
use crate::time::{Instant, Tt};

/// The Fukushima–Williams angles, radians, frame bias included.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PrecessionAngles {
    /// γ̄: from the GCRS origin of right ascension along the GCRS equator to the ecliptic of date.
    pub gamma_bar: f64,
    /// φ̄: obliquity of the ecliptic of date on the GCRS equator.
    pub phi_bar: f64,
    /// ψ̄: along the ecliptic of date from the GCRS equator to the mean equinox of date.
    pub psi_bar: f64,
    /// ε_A: mean obliquity of the ecliptic of date.
    pub obliquity: f64,
}

const GAMMA_BAR: [f64; 6] =
    [-0.052_928, 10.556_378, 0.493_204_4, -0.000_312_38, -0.000_002_788, 0.000_000_026_0];
const PHI_BAR: [f64; 6] =
    [84_381.412_819, -46.811_016, 0.051_126_8, 0.000_532_89, -0.000_000_440, -0.000_000_017_6];
const PSI_BAR: [f64; 6] =
    [-0.041_775, 5_038.481_484, 1.558_417_5, -0.000_185_22, -0.000_026_452, -0.000_000_014_8];
const OBLIQUITY: [f64; 6] =
    [84_381.406, -46.836_769, -0.000_183_1, 0.002_003_40, -0.000_000_576, -0.000_000_043_4];

/// IAU 2006 precession and frame bias.
///
/// Units: radians. Source: Hilton et al. 2006, Celestial Mechanics and Dynamical Astronomy 94, 351
/// (equations 39 to 42 and table 1); IERS Conventions (2010), section 5.6.4. Error: the rounding of the
/// polynomials, below 1e-15 rad.
pub fn precession_angles(tt: Instant<Tt>) -> PrecessionAngles {
    let t = tt.julian_centuries();
    PrecessionAngles {
        gamma_bar: polynomial(&GAMMA_BAR, t) * RADIANS_PER_ARCSECOND,
        phi_bar: polynomial(&PHI_BAR, t) * RADIANS_PER_ARCSECOND,
        psi_bar: polynomial(&PSI_BAR, t) * RADIANS_PER_ARCSECOND,
        obliquity: polynomial(&OBLIQUITY, t) * RADIANS_PER_ARCSECOND,
    }
}

/// Mean obliquity of the ecliptic, IAU 2006, radians (IERS Conventions (2010) equation 5.40).
pub fn mean_obliquity(tt: Instant<Tt>) -> f64 {
    polynomial(&OBLIQUITY, tt.julian_centuries()) * RADIANS_PER_ARCSECOND
}

impl PrecessionAngles {
    /// The rotation from the GCRS to the equator and equinox that these angles describe, further turned
    /// by a nutation in longitude and in obliquity (radians; zero for the mean equator and equinox):
    /// R₁(−(ε_A + Δε)) R₃(−(ψ̄ + Δψ)) R₁(φ̄) R₃(γ̄).
    pub(super) fn matrix(&self, longitude: f64, obliquity: f64) -> Matrix {
        let ecliptic = product(&rotation_1(self.phi_bar), &rotation_3(self.gamma_bar));
        let equinox = product(&rotation_3(-(self.psi_bar + longitude)), &ecliptic);
        product(&rotation_1(-(self.obliquity + obliquity)), &equinox)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn routine_values_of_the_erfa_test_suite() {
        // eraPfw06 at MJD 50123.9999 TT, eraObl06 at MJD 54388.0 TT (recomputed with pyerfa 2.0.1.5).
        let angles = precession_angles(Instant::from_mjd(50_123.999_9, 0.0));
        assert!((angles.gamma_bar - -0.224_338_767_099_799_5e-5).abs() < 1e-16, "{:e}", angles.gamma_bar);
        assert!((angles.phi_bar - 0.409_101_460_239_131_28).abs() < 1e-15, "{}", angles.phi_bar);
        assert!((angles.psi_bar - -0.950_195_417_801_303_1e-3).abs() < 1e-15, "{:e}", angles.psi_bar);
        assert!((angles.obliquity - 0.409_101_431_658_736_7).abs() < 1e-15, "{}", angles.obliquity);
        let obliquity = mean_obliquity(Instant::from_mjd(54_388.0, 0.0));
        assert!((obliquity - 0.409_074_922_938_725_8).abs() < 1e-15, "{obliquity}");
    }
}
