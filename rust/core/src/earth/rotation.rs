//! Earth rotation and polar motion.

use super::polynomial;
use super::precession_nutation::equation_of_the_origins;
use crate::constants::{
    EARTH_ROTATION_AT_J2000_TURNS, EARTH_ROTATION_EXCESS_TURNS_PER_DAY, J2000_MJD, RADIANS_PER_ARCSECOND,
    RADIANS_PER_MICROARCSECOND, TURN,
};
use crate::math::vector::{Matrix, product, rotation_1, rotation_2, rotation_3};
use crate::time::{Instant, Tt, Ut1};

/// Earth rotation angle, radians in [0, 2π).
///
/// Error: rounding, below 0.03 µas over 1900–2100 (`earth_reference`). Source: IERS Conventions (2010)
/// equation 5.15.
pub fn earth_rotation_angle(ut1: Instant<Ut1>) -> f64 {
    let (day, fraction) = ut1.mjd_parts();
    let since_j2000 = (day - J2000_MJD) + fraction;
    // The whole turn a day is the fraction of the Julian day, which begins at noon; only the excess is
    // multiplied by the days since J2000.0.
    let turns = (fraction + 0.5)
        + (EARTH_ROTATION_AT_J2000_TURNS + EARTH_ROTATION_EXCESS_TURNS_PER_DAY * since_j2000);
    normalised(TURN * (turns - turns.floor()))
}

/// Greenwich mean sidereal time, IAU 2006, radians in [0, 2π).
///
/// It needs both scales: one value for both costs 100 µas. Error against the published expression: below
/// 0.03 µas (`earth_reference`). Source: Capitaine, Wallace & Chapront 2005, Astronomy & Astrophysics
/// 432, 355, equation 34; IERS Conventions (2010) equation 5.32.
pub fn greenwich_mean_sidereal_time(ut1: Instant<Ut1>, tt: Instant<Tt>) -> f64 {
    const PRECESSION: [f64; 6] =
        [0.014_506, 4_612.156_534, 1.391_581_7, -0.000_000_44, -0.000_029_956, -0.000_000_036_8];
    let accumulated = polynomial(&PRECESSION, tt.julian_centuries()) * RADIANS_PER_ARCSECOND;
    normalised(earth_rotation_angle(ut1) + accumulated)
}

/// Greenwich apparent sidereal time, IAU 2006/2000A, radians in [0, 2π): the Earth rotation angle less the
/// equation of the origins, so that both routes through the equator give the same attitude.
///
/// Error against the published model: below 0.03 µas (`earth_reference`). Source: IERS Conventions (2010)
/// equation 5.30; Wallace & Capitaine 2006, Astronomy & Astrophysics 459, 981, section 5.
pub fn greenwich_apparent_sidereal_time(ut1: Instant<Ut1>, tt: Instant<Tt>) -> f64 {
    normalised(earth_rotation_angle(ut1) - equation_of_the_origins(tt))
}

/// An angle in [0, 2π).
fn normalised(angle: f64) -> f64 {
    let angle = angle % TURN;
    let angle = if angle < 0.0 { angle + TURN } else { angle };
    // A negative angle of less than the rounding of 2π becomes 2π itself.
    if angle >= TURN { 0.0 } else { angle }
}

/// s′, the locator of the terrestrial intermediate origin, radians: −47 µas a century (IERS Conventions
/// (2010) equation 5.13). Error: below 0.4 µas in this century, of the mean of the polar motion.
pub fn s_prime(tt: Instant<Tt>) -> f64 {
    -47.0 * tt.julian_centuries() * RADIANS_PER_MICROARCSECOND
}

/// The rotation from the terrestrial intermediate to the terrestrial system (TIRS to ITRS), for a pole at
/// xp, yp and s′, all in radians: R₁(−yp) R₂(−xp) R₃(s′).
///
/// Source: the inverse of IERS Conventions (2010) equation 5.3.
pub fn polar_motion(xp: f64, yp: f64, s_prime: f64) -> Matrix {
    product(&rotation_1(-yp), &product(&rotation_2(-xp), &rotation_3(s_prime)))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::earth::{celestial_to_intermediate, intermediate};
    use crate::time::{LeapSeconds, Utc};

    #[test]
    fn routine_values_of_the_erfa_test_suite() {
        // eraEra00 at MJD 54388.0 UT1; eraGmst06 and eraGst06a at MJD 53736.0, UT1 = TT.
        let angle = earth_rotation_angle(Instant::from_mjd(54_388.0, 0.0));
        assert!((angle - 0.402_283_724_002_815_810_2).abs() < 1e-12, "{angle}");
        let (ut1, tt) = (Instant::from_mjd(53_736.0, 0.0), Instant::from_mjd(53_736.0, 0.0));
        let mean = greenwich_mean_sidereal_time(ut1, tt);
        assert!((mean - 1.754_174_971_870_091_203).abs() < 1e-13, "{mean}");
        let apparent = greenwich_apparent_sidereal_time(ut1, tt);
        assert!((apparent - 1.754_166_137_675_019_159).abs() < 1e-13, "{apparent}");
    }

    #[test]
    fn angles_stay_below_a_turn() {
        for k in 0..100_000 {
            let ut1 = Instant::from_mjd(51_544.0 + f64::from(k % 777), f64::from(k) * 1e-5);
            let angle = earth_rotation_angle(ut1);
            assert!((0.0..TURN).contains(&angle));
        }
        assert_eq!(normalised(-1e-20), 0.0);
        assert_eq!(normalised(TURN), 0.0);
        assert!((normalised(-1.0) - (TURN - 1.0)).abs() < 1e-15);
    }

    #[test]
    fn the_examples_of_meeus_within_the_difference_of_the_models() {
        // Meeus, Astronomical Algorithms, 2nd ed., examples 12.a and 12.b [M], 1987-04-10 0h and 19:21 UT.
        // IAU 2006 differs from the expressions used there by +3.3 ms (mean) and +3.8 ms (apparent).
        let tt = |fraction: f64| Instant::from_mjd(46_895.0, fraction).plus_seconds(55.3);
        let seconds = |hours: f64, minutes: f64, seconds: f64| 3600.0 * hours + 60.0 * minutes + seconds;
        let of_day = 86_400.0 / TURN;
        let mean = greenwich_mean_sidereal_time(Instant::from_mjd(46_895.0, 0.0), tt(0.0)) * of_day;
        assert!((mean - seconds(13.0, 10.0, 46.3668) - 0.0033).abs() < 0.0002, "{mean}");
        let apparent = greenwich_apparent_sidereal_time(Instant::from_mjd(46_895.0, 0.0), tt(0.0)) * of_day;
        assert!((apparent - seconds(13.0, 10.0, 46.1351) - 0.0038).abs() < 0.0002, "{apparent}");
        let evening = (19.0 + 21.0 / 60.0) / 24.0;
        let mean = greenwich_mean_sidereal_time(Instant::from_mjd(46_895.0, evening), tt(evening)) * of_day;
        assert!((mean - seconds(8.0, 34.0, 57.0896) - 0.0033).abs() < 0.0002, "{mean}");
    }

    #[test]
    fn the_worked_example_of_the_earths_attitude() {
        // IAU SOFA, Tools for Earth Attitude, section 5: 2007-04-05 12:00:00.0 UTC, IAU 2006/2000A, CIO
        // based, using angles.
        let tai = LeapSeconds::builtin().to_tai(Utc::from_mjd(54_195.0, 0.5)).unwrap();
        let tt = tai.to_tt();
        let ut1 = tai.to_ut1(-0.072_073_685 - 33.0);
        let (xp, yp) = (0.034_928_2 * RADIANS_PER_ARCSECOND, 0.483_316_3 * RADIANS_PER_ARCSECOND);
        let (dx, dy) = (175.0 * RADIANS_PER_MICROARCSECOND, -225.9 * RADIANS_PER_MICROARCSECOND);

        assert_eq!(tt.mjd_parts().0, 54_195.0);
        assert!((tt.mjd_parts().1 - 0.500_754_444_444_444).abs() < 1e-15);
        assert!((ut1.mjd_parts().1 - 0.499_999_165_813_831).abs() < 1e-15);
        let angle = earth_rotation_angle(ut1);
        assert!((angle.to_degrees() - 13.318_492_966_097).abs() < 1e-12);
        let pole = intermediate(tt);
        let (x, y) = (pole.x + dx, pole.y + dy);
        assert!((x - 0.000_712_264_729_599).abs() < 1e-15, "{x}");
        assert!((y - 0.000_044_385_250_426).abs() < 1e-15, "{y}");
        assert!((pole.s / RADIANS_PER_ARCSECOND - -0.002_200_475).abs() < 1e-9);
        let apparent = greenwich_apparent_sidereal_time(ut1, tt).to_degrees();
        assert!((apparent - 13.412_416_949_356).abs() < 1e-12, "{apparent}");
        let origins = equation_of_the_origins(tt).to_degrees();
        assert!((origins - -0.093_923_983_260).abs() < 1e-12, "{origins}");

        let intermediate_terrestrial = product(&rotation_3(angle), &celestial_to_intermediate(x, y, pole.s));
        let terrestrial = product(&polar_motion(xp, yp, s_prime(tt)), &intermediate_terrestrial);
        let without_polar_motion = [
            [0.973_104_317_573_127, 0.230_363_826_247_709, -0.000_703_332_818_845],
            [-0.230_363_798_804_182, 0.973_104_570_735_574, 0.000_120_888_549_586],
            [0.000_712_264_729_599, 0.000_044_385_250_426, 0.999_999_745_354_420],
        ];
        let with_polar_motion = [
            [0.973_104_317_697_535, 0.230_363_826_239_128, -0.000_703_163_482_198],
            [-0.230_363_800_456_037, 0.973_104_570_632_801, 0.000_118_545_366_625],
            [0.000_711_560_162_668, 0.000_046_626_403_995, 0.999_999_745_754_024],
        ];
        for (ours, published) in
            [(intermediate_terrestrial, without_polar_motion), (terrestrial, with_polar_motion)]
        {
            for (a, b) in ours.iter().flatten().zip(published.iter().flatten()) {
                // The gate is 1e-14, the print 5e-16.
                assert!((a - b).abs() < 1e-15, "{a} {b}");
            }
        }
    }
}
