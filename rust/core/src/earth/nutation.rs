//! IAU 2000A nutation and its IAU 2006 adjustments.

use super::arguments::{delaunay, planetary_nutation};
use super::tables::{argument, luni_solar::LUNI_SOLAR, planetary::PLANETARY};
use crate::constants::RADIANS_PER_MICROARCSECOND;
use crate::time::{Instant, Tt};

/// Nutation of the Earth's pole, radians.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Nutation {
    /// Δψ, in longitude.
    pub longitude: f64,
    /// Δε, in obliquity.
    pub obliquity: f64,
}

/// The coefficients' unit.
const RADIANS_PER_TENTH_MICROARCSECOND: f64 = 0.1 * RADIANS_PER_MICROARCSECOND;

/// IAU 2000A nutation, all 678 luni-solar and 687 planetary terms, with the adjustments that make it
/// consistent with IAU 2006 precession.
///
/// Units: radians. Valid 1900–2100 at the accuracy of the model (0.2 mas by the free core nutation, which
/// is not in it and comes with the observed dX, dY). Error against the published series: below
/// 0.01 µas (`earth_reference`). Cost: some 30 µs.
///
/// Adjustments: Wallace & Capitaine 2006, Astronomy & Astrophysics 459, 981, equation 5: the J2 rate that
/// IAU 2006 has and IAU 2000 had not, and the factor for the new obliquity and precession rate.
pub fn nutation(tt: Instant<Tt>) -> Nutation {
    let model = nutation_iau_2000a(tt);
    let j2_rate = -2.777_4e-6 * tt.julian_centuries();
    Nutation {
        longitude: model.longitude * (1.0 + (0.469_7e-6 + j2_rate)),
        obliquity: model.obliquity * (1.0 + j2_rate),
    }
}

/// IAU 2000A nutation as it was adopted, without the adjustments of [`nutation`]; to be used with IAU 2000
/// precession only.
///
/// Source: Mathews, Herring & Buffett 2002, Journal of Geophysical Research 107, B4; IERS Conventions
/// (2003), equations 5.10 and tables 5.3a, 5.3b.
pub fn nutation_iau_2000a(tt: Instant<Tt>) -> Nutation {
    let t = tt.julian_centuries();
    // Within each part the terms stand smallest first, and the planetary part is the smaller.
    let arguments = planetary_nutation(t);
    let (mut longitude, mut obliquity) = (0.0, 0.0);
    for (multipliers, c) in &PLANETARY {
        let (sin, cos) = argument(multipliers, &arguments).sin_cos();
        longitude += f64::from(c[0]) * sin + f64::from(c[1]) * cos;
        obliquity += f64::from(c[2]) * sin + f64::from(c[3]) * cos;
    }
    let arguments = delaunay(t);
    for (multipliers, c) in &LUNI_SOLAR {
        let (sin, cos) = argument(multipliers, &arguments).sin_cos();
        longitude += (f64::from(c[0]) + f64::from(c[1]) * t) * sin + f64::from(c[2]) * cos;
        obliquity += (f64::from(c[3]) + f64::from(c[4]) * t) * cos + f64::from(c[5]) * sin;
    }
    Nutation {
        longitude: longitude * RADIANS_PER_TENTH_MICROARCSECOND,
        obliquity: obliquity * RADIANS_PER_TENTH_MICROARCSECOND,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn routine_values_of_the_erfa_test_suite() {
        // eraNut00a [M] and eraNut06a at MJD 53736.0 TT. What is left, 1.3e-16, is that the model's own
        // program cuts the constants of l′ and D after five decimals and the Conventions after six.
        let tt = Instant::from_mjd(53_736.0, 0.0);
        let model = nutation_iau_2000a(tt);
        assert!((model.longitude - -0.963_090_910_711_551_8e-5).abs() < 1e-15, "{:e}", model.longitude);
        assert!((model.obliquity - 0.406_323_917_400_167_88e-4).abs() < 1e-15, "{:e}", model.obliquity);
        let adjusted = nutation(tt);
        assert!((adjusted.longitude - -0.963_091_202_582_030_9e-5).abs() < 1e-15, "{:e}", adjusted.longitude);
        assert!((adjusted.obliquity - 0.406_323_849_688_724_98e-4).abs() < 1e-15, "{:e}", adjusted.obliquity);
    }

    #[test]
    fn the_example_of_meeus_within_the_difference_of_the_models() {
        // Meeus, Astronomical Algorithms, 2nd ed., example 22.a, 1987-04-10 0h TD: −3.788″ and +9.443″ on
        // IAU 1980; IAU 2000A gives −3.7810″ and +9.4454″.
        let nutation = nutation(Instant::from_mjd(46_895.0, 0.0));
        let milliarcsecond = 1e3 * RADIANS_PER_MICROARCSECOND;
        assert!((nutation.longitude / milliarcsecond - -3_781.0).abs() < 0.05);
        assert!((nutation.obliquity / milliarcsecond - 9_445.4).abs() < 0.05);
    }

    #[test]
    fn every_term_is_there_and_the_smallest_comes_first() {
        assert_eq!(LUNI_SOLAR.len() + PLANETARY.len(), 1365);
        let largest = LUNI_SOLAR.last().unwrap();
        // −17.2064161″ and 9.2052331″ at the node (IERS Conventions (2003) table 5.3a).
        assert_eq!(largest.0, [0, 0, 0, 0, 1]);
        assert_eq!((largest.1[0], largest.1[3]), (-172_064_161, 92_052_331));
        let size = |c: &[i32]| c.iter().map(|&c| f64::from(c).powi(2)).sum::<f64>();
        assert!(LUNI_SOLAR.windows(2).all(|w| size(&w[0].1) <= size(&w[1].1)));
        assert!(PLANETARY.windows(2).all(|w| size(&w[0].1) <= size(&w[1].1)));
    }
}
