//! Precession and nutation together: the matrix to the true equinox, the pole, and the origins.

use super::intermediate::{Intermediate, celestial_to_intermediate, s_plus_half_xy};
use super::nutation::{Nutation, nutation};
use super::precession::{PrecessionAngles, precession_angles};
use crate::math::vector::{Matrix, dot};
use crate::time::{Instant, Tt};

/// IAU 2006/2000A precession and nutation at an instant: the expensive part computed once, for whatever
/// is asked of it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PrecessionNutation {
    /// The precession angles.
    pub precession: PrecessionAngles,
    /// The nutation.
    pub nutation: Nutation,
    centuries: f64,
}

impl PrecessionNutation {
    /// At an instant of TT. Cost: some 30 µs, nearly all of it nutation.
    pub fn at(tt: Instant<Tt>) -> Self {
        PrecessionNutation {
            precession: precession_angles(tt),
            nutation: nutation(tt),
            centuries: tt.julian_centuries(),
        }
    }

    /// The rotation from the GCRS to the true equator and equinox of date.
    ///
    /// Source: IERS Conventions (2010) section 5.6.4; Wallace & Capitaine 2006, Astronomy & Astrophysics
    /// 459, 981, section 5.3.
    pub fn matrix(&self) -> Matrix {
        self.precession.matrix(self.nutation.longitude, self.nutation.obliquity)
    }

    /// The rotation from the GCRS to the mean equator and equinox of date: frame bias and precession.
    pub fn mean_matrix(&self) -> Matrix {
        self.precession.matrix(0.0, 0.0)
    }

    /// Mean obliquity plus nutation in obliquity, radians.
    pub fn true_obliquity(&self) -> f64 {
        self.precession.obliquity + self.nutation.obliquity
    }

    /// X and Y of the pole, which is the third axis of the true equator, and s.
    pub fn intermediate(&self) -> Intermediate {
        self.intermediate_of(&self.matrix())
    }

    fn intermediate_of(&self, matrix: &Matrix) -> Intermediate {
        let [x, y, _] = matrix[2];
        Intermediate { x, y, s: s_plus_half_xy(self.centuries) - 0.5 * x * y }
    }

    /// The equation of the origins, radians: along the true equator from the intermediate origin to the
    /// equinox, measured eastward, which is ERA − GAST.
    pub fn equation_of_the_origins(&self) -> f64 {
        let matrix = self.matrix();
        let Intermediate { x, y, s } = self.intermediate_of(&matrix);
        // The first axis of the intermediate system with s left out lies in the true equator, an arc s
        // from the origin; its direction among the axes of the equinox is the rest of the angle.
        let sigma = celestial_to_intermediate(x, y, 0.0)[0];
        s - dot(matrix[1], sigma).atan2(dot(matrix[0], sigma))
    }
}

/// X, Y and s of the IAU 2006/2000A model, without observed offsets.
///
/// Units: components of a unit vector, and radians. Valid 1900–2100. Error against the published model:
/// below 0.01 µas (`earth_reference`); the model is off the sky by the observed dX, dY, some 0.3 mas.
/// Source: X and Y from the matrix (Wallace & Capitaine 2006), s from IERS Conventions (2010) table 5.2d.
pub fn intermediate(tt: Instant<Tt>) -> Intermediate {
    PrecessionNutation::at(tt).intermediate()
}

/// The rotation from the GCRS to the true equator and equinox of date, IAU 2006/2000A.
///
/// Orthogonal to 1e-15; error against the published model: below 0.01 µas (`earth_reference`).
pub fn bias_precession_nutation(tt: Instant<Tt>) -> Matrix {
    PrecessionNutation::at(tt).matrix()
}

/// The equation of the origins, ERA − GAST, radians in (−π, π].
///
/// Error against the published model: below 0.01 µas (`earth_reference`). Source: Wallace & Capitaine
/// 2006, Astronomy & Astrophysics 459, 981, section 5.
pub fn equation_of_the_origins(tt: Instant<Tt>) -> f64 {
    PrecessionNutation::at(tt).equation_of_the_origins()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::{RADIANS_PER_MICROARCSECOND, TURN};
    use crate::earth::arguments::locator;
    use crate::earth::intermediate::sum;
    use crate::earth::tables::complementary;
    use crate::earth::{
        earth_rotation_angle, greenwich_apparent_sidereal_time, greenwich_mean_sidereal_time,
    };
    use crate::math::vector::{IDENTITY, product, rotation_3, transpose};

    /// 401 instants from 1900 to 2100 at changing times of the day.
    fn instants() -> impl Iterator<Item = Instant<Tt>> {
        (0..=400).map(|k| Instant::from_mjd(15_020.0 + 182.625 * f64::from(k), 0.017 * f64::from(k)))
    }

    #[test]
    fn routine_values_of_the_erfa_test_suite() {
        // eraXys06a at MJD 53736.0 TT.
        let pole = intermediate(Instant::from_mjd(53_736.0, 0.0));
        assert!((pole.x - 0.579_130_848_283_529_261_7e-3).abs() < 1e-15, "{:e}", pole.x);
        assert!((pole.y - 0.402_058_009_945_402_031_0e-4).abs() < 1e-15, "{:e}", pole.y);
        assert!((pole.s - -0.122_003_229_416_457_989_6e-7).abs() < 1e-18, "{:e}", pole.s);
    }

    #[test]
    fn the_matrix_is_orthogonal() {
        let mut worst = 0.0_f64;
        for tt in instants() {
            let m = bias_precession_nutation(tt);
            let unit = product(&m, &transpose(&m));
            for (row, wanted) in unit.iter().flatten().zip(IDENTITY.iter().flatten()) {
                worst = worst.max((row - wanted).abs());
            }
        }
        assert!(worst < 1e-15, "{worst:e}");
    }

    #[test]
    fn the_route_by_the_origin_is_the_route_by_the_equinox() {
        let mut worst = 0.0_f64;
        for tt in instants() {
            let (day, fraction) = tt.mjd_parts();
            let ut1 = Instant::from_mjd(day, fraction - 0.000_8);
            let pole = intermediate(tt);
            let by_origin = product(
                &rotation_3(earth_rotation_angle(ut1)),
                &celestial_to_intermediate(pole.x, pole.y, pole.s),
            );
            let by_equinox = product(
                &rotation_3(greenwich_apparent_sidereal_time(ut1, tt)),
                &bias_precession_nutation(tt),
            );
            for (a, b) in by_origin.iter().flatten().zip(by_equinox.iter().flatten()) {
                worst = worst.max((a - b).abs());
            }
        }
        assert!(worst < 1e-12, "{worst:e}");
    }

    #[test]
    fn sidereal_time_agrees_with_the_classical_equation_of_the_equinoxes() {
        // GAST by the origin against GMST + Δψ cos ε_A + complementary terms (IERS Conventions (2010)
        // equations 5.30 and 5.31, table 5.2e), a road that shares neither s nor the matrix. The two are
        // consistent at the few µas to which the series were truncated.
        let mut worst = 0.0_f64;
        for tt in instants() {
            let (day, fraction) = tt.mjd_parts();
            let ut1 = Instant::from_mjd(day, fraction - 0.000_8);
            let parts = PrecessionNutation::at(tt);
            let t = tt.julian_centuries();
            let arguments = locator(t);
            let terms =
                sum(&complementary::ORDER_0, &arguments) + sum(&complementary::ORDER_1, &arguments) * t;
            let equinoxes = parts.nutation.longitude * parts.precession.obliquity.cos()
                + terms * RADIANS_PER_MICROARCSECOND;
            let classical = greenwich_mean_sidereal_time(ut1, tt) + equinoxes;
            let difference = greenwich_apparent_sidereal_time(ut1, tt) - classical;
            let difference = difference - TURN * (difference / TURN).round();
            worst = worst.max(difference.abs() / RADIANS_PER_MICROARCSECOND);
        }
        assert!(worst < 10.0, "{worst} µas");
        assert!(worst > 0.0);
    }
}
