//! The celestial intermediate pole and origin.

use super::arguments::locator;
use super::polynomial;
use super::tables::{Term, argument, locator as table};
use crate::constants::RADIANS_PER_MICROARCSECOND;
use crate::math::vector::{Matrix, product, rotation_3};

/// Where the celestial intermediate pole and the celestial intermediate origin are.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Intermediate {
    /// X: first component of the pole's unit vector in the GCRS.
    pub x: f64,
    /// Y: second component of the pole's unit vector in the GCRS.
    pub y: f64,
    /// s: the CIO locator, radians.
    pub s: f64,
}

/// The rotation from the GCRS to the celestial intermediate reference system, for a pole at X, Y and the
/// CIO locator s (radians). Observed offsets dX and dY belong into X and Y here; s is that of the model.
///
/// Orthogonal to 1e-15 (`orthogonal`). Source: IERS Conventions (2010) equation 5.10, with the a of
/// equation 5.8 in full and not as a series.
pub fn celestial_to_intermediate(x: f64, y: f64, s: f64) -> Matrix {
    let z = (1.0 - (x * x + y * y)).sqrt();
    let a = 1.0 / (1.0 + z);
    let pole = [[1.0 - a * x * x, -a * x * y, -x], [-a * x * y, 1.0 - a * y * y, -y], [x, y, z]];
    product(&rotation_3(-s), &pole)
}

/// s + XY/2, radians, at `t` Julian centuries of TT from J2000.0 (IERS Conventions (2010) table 5.2d, for
/// IAU 2006/2000A).
pub(super) fn s_plus_half_xy(t: f64) -> f64 {
    let arguments = locator(t);
    let mut powers = [
        sum(&table::ORDER_0, &arguments),
        sum(&table::ORDER_1, &arguments),
        sum(&table::ORDER_2, &arguments),
        sum(&table::ORDER_3, &arguments),
        sum(&table::ORDER_4, &arguments),
        0.0,
    ];
    for (power, coefficient) in powers.iter_mut().zip(table::POLYNOMIAL) {
        *power += coefficient;
    }
    polynomial(&powers, t) * RADIANS_PER_MICROARCSECOND
}

/// A series of sines and cosines, in the unit of its coefficients.
pub(super) fn sum(terms: &[Term<8, [f64; 2]>], arguments: &[f64; 8]) -> f64 {
    let mut sum = 0.0;
    for (multipliers, c) in terms {
        let (sin, cos) = argument(multipliers, arguments).sin_cos();
        sum += c[0] * sin + c[1] * cos;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::vector::{IDENTITY, transpose};

    #[test]
    fn orthogonal() {
        let mut worst = 0.0_f64;
        for i in -20..=20 {
            for j in -20..=20 {
                // X reaches 0.01 in a century.
                let m = celestial_to_intermediate(f64::from(i) * 5.1e-4, f64::from(j) * 4.9e-4, 1e-6);
                let unit = product(&m, &transpose(&m));
                for (row, wanted) in unit.iter().flatten().zip(IDENTITY.iter().flatten()) {
                    worst = worst.max((row - wanted).abs());
                }
            }
        }
        assert!(worst < 1e-15, "{worst:e}");
    }
}
