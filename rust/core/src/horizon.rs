//! The local horizon: altitude, azimuth, hour angle and parallactic angle of a direction.
//!
//! A direction on the horizon's axes is north, east, zenith: a left-handed set, so azimuth runs from
//! north through east. The zenith is the normal of the ellipsoid. Formulae of the spherical triangle
//! zenith–pole–star, e.g. Urban & Seidelmann (2013) §7.1.3, written in components, which have no
//! special case at the zenith, at the pole, or for a site at a pole.

use crate::math::vector::Vector;

/// Sine and cosine of a geodetic latitude.
#[derive(Debug, Clone, Copy)]
pub struct Latitude {
    /// Sine.
    pub sin: f64,
    /// Cosine.
    pub cos: f64,
}

impl Latitude {
    /// From radians.
    pub fn new(latitude: f64) -> Self {
        let (sin, cos) = latitude.sin_cos();
        Latitude { sin, cos }
    }
}

/// Altitude, radians, of a unit vector.
#[inline(always)]
pub fn altitude(local: Vector) -> f64 {
    local[2].atan2(local[0].hypot(local[1]))
}

/// Azimuth from north through east, radians in [0, 2π). Zero at the zenith exactly, where there is none.
#[inline(always)]
pub fn azimuth(local: Vector) -> f64 {
    let azimuth = local[1].atan2(local[0]);
    if azimuth < 0.0 {
        // −1e-17 + 2π rounds to 2π, which is outside the range.
        let wrapped = azimuth + crate::constants::TURN;
        if wrapped < crate::constants::TURN { wrapped } else { 0.0 }
    } else {
        // Minus zero becomes plain zero.
        azimuth + 0.0
    }
}

/// Hour angle, radians in (−π, π], positive west of the meridian.
#[inline(always)]
pub fn hour_angle(local: Vector, latitude: Latitude) -> f64 {
    (0.0 - local[1]).atan2(local[2] * latitude.cos - local[0] * latitude.sin)
}

/// Sine of the declination on the terrestrial pole.
#[inline(always)]
pub fn sin_declination(local: Vector, latitude: Latitude) -> f64 {
    local[2] * latitude.sin + local[0] * latitude.cos
}

/// Parallactic angle, radians in (−π, π]: position angle of the zenith at the target, from the pole
/// through east; negative before the meridian, positive after it.
#[inline(always)]
pub fn parallactic_angle(local: Vector, latitude: Latitude) -> f64 {
    let from_zenith_squared = local[0] * local[0] + local[1] * local[1];
    let along = latitude.sin * from_zenith_squared - latitude.cos * local[2] * local[0];
    (0.0 - latitude.cos * local[1]).atan2(along)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::RADIANS_PER_DEGREE;
    use crate::math::vector::from_angles;

    /// North, east, zenith of an hour angle and declination.
    fn local_of(hour_angle: f64, declination: f64, latitude: Latitude) -> Vector {
        let [x, y, z] = from_angles(-hour_angle, declination);
        [z * latitude.cos - x * latitude.sin, y, z * latitude.sin + x * latitude.cos]
    }

    #[test]
    fn worked_example_of_the_erfa_test_suite() {
        // hd2ae(1.1, 1.2, 0.3) [R]
        let local = local_of(1.1, 1.2, Latitude::new(0.3));
        assert!((azimuth(local) - 5.916889243730066194).abs() < 1e-13);
        assert!((altitude(local) - 0.4472186304990486228).abs() < 1e-14);
        assert!((hour_angle(local, Latitude::new(0.3)) - 1.1).abs() < 1e-14);
        assert!((sin_declination(local, Latitude::new(0.3)) - 1.2f64.sin()).abs() < 1e-15);
    }

    #[test]
    fn meeus_example_13b() {
        // Meeus, Astronomical Algorithms, 2nd ed., example 13.b [M]; azimuth from north.
        let latitude = Latitude::new((38.0 + 55.0 / 60.0 + 17.0 / 3600.0) * RADIANS_PER_DEGREE);
        let declination = -(6.0 + 43.0 / 60.0 + 11.61 / 3600.0) * RADIANS_PER_DEGREE;
        let local = local_of(64.352133 * RADIANS_PER_DEGREE, declination, latitude);
        assert!((altitude(local) / RADIANS_PER_DEGREE - 15.1249).abs() < 5e-5);
        assert!((azimuth(local) / RADIANS_PER_DEGREE - 248.0337).abs() < 5e-5);
    }

    #[test]
    fn facts_of_the_trade() {
        // Common practice, no source.
        for degrees in [-90.0, -33.0, 0.0, 51.5, 90.0] {
            let latitude = Latitude::new(degrees * RADIANS_PER_DEGREE);
            let pole = local_of(0.7, 90.0 * RADIANS_PER_DEGREE, latitude);
            assert!((altitude(pole) - degrees * RADIANS_PER_DEGREE).abs() < 1e-8);
            // Sine rule: sin A cos h = −sin H cos δ.
            let (hour, declination) = (0.4f64, 0.3f64);
            let local = local_of(hour, declination, latitude);
            let left = azimuth(local).sin() * altitude(local).cos();
            assert!((left + hour.sin() * declination.cos()).abs() < 1e-15);
            // Altitude at upper transit.
            let transit = altitude(local_of(0.0, declination, latitude));
            let expected = std::f64::consts::FRAC_PI_2 - (latitude.sin.asin() - declination).abs();
            assert!((transit - expected).abs() < 1e-7);
        }
    }

    #[test]
    fn parallactic_angle_follows_the_textbook_form() {
        // tan q = sin H / (tan φ cos δ − sin δ cos H), Meeus equation 14.1 [M].
        let latitude = Latitude::new(0.6);
        for hour in [-3.0, -1.2, -0.01, 0.01, 0.9, 2.5f64] {
            for declination in [-0.9, 0.0, 0.5, 1.4f64] {
                let expected = hour
                    .sin()
                    .atan2(latitude.sin / latitude.cos * declination.cos() - declination.sin() * hour.cos());
                let got = parallactic_angle(local_of(hour, declination, latitude), latitude);
                assert!((got - expected).abs() < 1e-13, "{hour} {declination}");
            }
        }
    }

    #[test]
    fn azimuth_stays_below_a_turn() {
        assert_eq!(azimuth([1.0, -1e-300, 0.0]), 0.0);
        assert_eq!(azimuth([1.0, -0.0, 0.0]), 0.0);
    }
}
