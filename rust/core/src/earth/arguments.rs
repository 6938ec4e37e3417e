//! The fundamental arguments of nutation theory, radians; t in Julian centuries of TDB from J2000.0, for
//! which TT serves: in the 1.7 ms between them the Moon moves 0.9 mas, which changes no term of nutation
//! by more than 0.01 µas.

use super::polynomial;
use crate::constants::{RADIANS_PER_ARCSECOND, TURN};

const ARCSECONDS_PER_TURN: f64 = 1_296_000.0;

/// A polynomial in arcseconds, reduced by whole turns while it is still in arcseconds.
fn arcseconds(coefficients: &[f64; 5], t: f64) -> f64 {
    (polynomial(coefficients, t) % ARCSECONDS_PER_TURN) * RADIANS_PER_ARCSECOND
}

fn linear(at_j2000: f64, per_century: f64, t: f64) -> f64 {
    (at_j2000 + per_century * t) % TURN
}

/// l, l′, F, D, Ω: IERS Conventions (2010) equation 5.43 (Simon et al. 1994, Astronomy & Astrophysics
/// 282, 663, section 3.4).
pub(super) fn delaunay(t: f64) -> [f64; 5] {
    [
        arcseconds(&[485_868.249_036, 1_717_915_923.217_8, 31.879_2, 0.051_635, -0.000_244_70], t),
        arcseconds(&[1_287_104.793_048, 129_596_581.048_1, -0.553_2, 0.000_136, -0.000_011_49], t),
        arcseconds(&[335_779.526_232, 1_739_527_262.847_8, -12.751_2, -0.001_037, 0.000_004_17], t),
        arcseconds(&[1_072_260.703_692, 1_602_961_601.209_0, -6.370_6, 0.006_593, -0.000_031_69], t),
        arcseconds(&[450_160.398_036, -6_962_890.543_1, 7.472_2, 0.007_702, -0.000_059_39], t),
    ]
}

/// Mean longitudes of Mercury to Neptune: IERS Conventions (2010) equation 5.44.
pub(super) fn planets(t: f64) -> [f64; 8] {
    [
        linear(4.402_608_842, 2_608.790_314_157_4, t),
        linear(3.176_146_697, 1_021.328_554_621_1, t),
        linear(1.753_470_314, 628.307_584_999_1, t),
        linear(6.203_480_913, 334.061_242_670_0, t),
        linear(0.599_546_497, 52.969_096_264_1, t),
        linear(0.874_016_757, 21.329_910_496_0, t),
        linear(5.481_293_872, 7.478_159_856_7, t),
        linear(5.311_886_287, 3.813_303_563_8, t),
    ]
}

/// General precession in longitude: IERS Conventions (2010) equation 5.44.
pub(super) fn general_precession(t: f64) -> f64 {
    (0.024_381_75 + 0.000_005_386_91 * t) * t
}

/// The arguments of the planetary nutation as the model was fitted with them, which are simpler than the
/// others and must not be improved: l, F, D, Ω, the longitudes of Mercury to Neptune, the precession
/// (Mathews, Herring & Buffett 2002, Journal of Geophysical Research 107, B4; the authors' program
/// MHB_2000 of 2002).
pub(super) fn planetary_nutation(t: f64) -> [f64; 13] {
    let [mercury, venus, earth, mars, jupiter, saturn, uranus, _] = planets(t);
    [
        linear(2.355_555_98, 8_328.691_426_955_4, t),
        linear(1.627_905_234, 8_433.466_158_131, t),
        linear(5.198_466_741, 7_771.377_146_812_1, t),
        linear(2.182_439_20, -33.757_045, t),
        mercury,
        venus,
        earth,
        mars,
        jupiter,
        saturn,
        uranus,
        linear(5.321_159_000, 3.812_777_400_0, t),
        general_precession(t),
    ]
}

/// The arguments of s and of the equation of the equinoxes: l, l′, F, D, Ω, the longitudes of Venus and
/// the Earth, the precession.
pub(super) fn locator(t: f64) -> [f64; 8] {
    let [l, l_prime, f, d, omega] = delaunay(t);
    let [_, venus, earth, ..] = planets(t);
    [l, l_prime, f, d, omega, venus, earth, general_precession(t)]
}
