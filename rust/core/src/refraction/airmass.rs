//! Airmass: how much air a ray crosses, the zenith being 1, by published formulae.

use super::Refraction;
use crate::constants::RADIANS_PER_DEGREE;
use crate::error::{Error, Result};
use crate::math::dispatch::Arithmetic;
use crate::math::elementary::{power, sin_cos};
use crate::math::roots::newton_between;
use std::f64::consts::FRAC_PI_2;

/// A formula for airmass. Each stands here with the altitude it was made for, since they differ by
/// up to 6 airmasses at the horizon if one is fed with the other.
///
/// Hardie's polynomial of 1962 is left out: it turns back below 5° altitude and has no inverse there.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[repr(u8)]
pub enum AirmassModel {
    /// sec z of the observed zenith distance: a flat Earth's, without bound at the horizon.
    PlaneParallel,
    /// Observed altitude. F. Kasten & A. T. Young 1989, Applied Optics 28, 4735.
    KastenYoung1989,
    /// Topocentric (true) altitude. A. T. Young 1994, Applied Optics 33, 1108.
    Young1994,
    /// Observed altitude. K. A. Pickering 2002, DIO 12, 3, note 39.
    Pickering2002,
}

/// Kasten & Young's equation 3 and table II: a, b in degrees, c.
const KASTEN_YOUNG: [f64; 3] = [0.50572, 6.07995, 1.6364];
/// Young's polynomials in the cosine of the true zenith distance, lowest power first; the second has cos³ too.
const YOUNG_ABOVE: [f64; 3] = [0.0096467, 0.148386, 1.002432];
const YOUNG_BELOW: [f64; 3] = [0.000303978, 0.0102963, 0.149864];
/// Pickering's 1/sin(h + 244/(165 + 47 h^1.1)), h in degrees.
const PICKERING: [f64; 4] = [244.0, 165.0, 47.0, 1.1];

const DEGREES_PER_RADIAN: f64 = 1.0 / RADIANS_PER_DEGREE;

impl AirmassModel {
    /// Every model.
    pub const ALL: [AirmassModel; 4] = [
        AirmassModel::PlaneParallel,
        AirmassModel::KastenYoung1989,
        AirmassModel::Young1994,
        AirmassModel::Pickering2002,
    ];

    /// The word for this model, as it stands in plans and files.
    pub fn word(self) -> &'static str {
        match self {
            AirmassModel::PlaneParallel => "plane_parallel",
            AirmassModel::KastenYoung1989 => "kasten_young_1989",
            AirmassModel::Young1994 => "young_1994",
            AirmassModel::Pickering2002 => "pickering_2002",
        }
    }

    /// The model of a word.
    pub fn from_word(word: &str) -> Result<Self> {
        Self::ALL.into_iter().find(|model| model.word() == word).ok_or_else(|| {
            let words: Vec<_> = Self::ALL.iter().map(|model| model.word()).collect();
            Error::invalid("airmass model", format!("\"{word}\""), words.join(", "))
        })
    }

    /// Airmass of one target from its two altitudes, radians; each model takes the one it was made for. NaN
    /// where the observed altitude is below the horizontal, where no formula here says anything
    /// (plane-parallel: infinite at the horizontal itself).
    pub fn airmass(self, observed_altitude: f64, topocentric_altitude: f64) -> f64 {
        if observed_altitude.is_nan() || observed_altitude < 0.0 {
            return f64::NAN;
        }
        let altitude = if self.takes_topocentric() { topocentric_altitude } else { observed_altitude };
        1.0 / self.transparency(altitude).0
    }

    /// The same without branch or call, for loops that are vectorised: within 2e-15 of it (test
    /// `in_loops_it_is_the_same`).
    #[inline(always)]
    pub fn airmass_in_loop<A: Arithmetic>(self, observed_altitude: f64, topocentric_altitude: f64) -> f64 {
        let altitude = if self.takes_topocentric() { topocentric_altitude } else { observed_altitude };
        const TINY: f64 = 1e-30;
        let (sine, _) = sin_cos::<A>(altitude);
        // Powers are taken of positive numbers only; what comes of altitudes below the horizontal is thrown away.
        let degrees = if altitude > TINY { altitude * DEGREES_PER_RADIAN } else { TINY };
        let transparency = match self {
            AirmassModel::PlaneParallel => sine,
            AirmassModel::KastenYoung1989 => {
                let [a, b, c] = KASTEN_YOUNG;
                A::multiply_add(a, power::<A>(degrees + b, -c), sine)
            }
            AirmassModel::Young1994 => {
                let ([a, b, c], [d, e, f]) = (YOUNG_ABOVE, YOUNG_BELOW);
                let above = A::multiply_add(A::multiply_add(c, sine, b), sine, a);
                let below = A::multiply_add(A::multiply_add(sine + f, sine, e), sine, d);
                below / above
            }
            AirmassModel::Pickering2002 => {
                let [a, b, c, d] = PICKERING;
                let lift = a / A::multiply_add(c, power::<A>(degrees, d), b);
                sin_cos::<A>((degrees + lift) * RADIANS_PER_DEGREE).0
            }
        };
        let airmass = 1.0 / transparency;
        if observed_altitude >= 0.0 { airmass } else { f64::NAN }
    }

    /// Observed altitude, radians, at which the airmass has a value and above which it is less: what an upper
    /// limit of airmass asks of altitude. Airmass from 1 upward; 0 if it is so large that no altitude above
    /// the horizontal has it, π/2 if the formula is a little above it at the zenith itself.
    ///
    /// Solved until airmass returns to 1e-10 of itself (test `inverse_returns_the_airmass`).
    pub fn observed_altitude(self, airmass: f64, refraction: &Refraction) -> Result<f64> {
        if airmass.is_nan() || airmass < 1.0 {
            return Err(Error::invalid("airmass", airmass, "1 or more"));
        }
        let lowest = if self.takes_topocentric() { refraction.topocentric_altitude(0.0) } else { 0.0 };
        let altitude = self.altitude(airmass, lowest);
        if altitude <= lowest {
            Ok(0.0)
        } else if self.takes_topocentric() {
            Ok(refraction.observed_altitude(altitude))
        } else {
            Ok(altitude)
        }
    }

    fn takes_topocentric(self) -> bool {
        self == AirmassModel::Young1994
    }

    /// Bracketed Newton on one over the airmass, which is nearly the sine of the altitude.
    fn altitude(self, airmass: f64, lowest: f64) -> f64 {
        let wanted = 1.0 / airmass;
        let (low, high) = (lowest, FRAC_PI_2);
        if self.transparency(low).0 >= wanted {
            return low;
        }
        if self.transparency(high).0 <= wanted {
            return high;
        }
        let short = |altitude: f64| {
            let (found, slope) = self.transparency(altitude);
            (found - wanted, slope)
        };
        newton_between(short, low, high, true, wanted.asin(), 1e-15)
    }

    /// One over the airmass at the model's own altitude, and its derivative per radian.
    fn transparency(self, altitude: f64) -> (f64, f64) {
        let (sine, cosine) = altitude.sin_cos();
        let degrees = altitude / RADIANS_PER_DEGREE;
        match self {
            AirmassModel::PlaneParallel => (sine, cosine),
            AirmassModel::KastenYoung1989 => {
                let [a, b, c] = KASTEN_YOUNG;
                let bend = a * (degrees + b).powf(-c);
                (sine + bend, cosine - c * bend / (degrees + b) / RADIANS_PER_DEGREE)
            }
            AirmassModel::Young1994 => {
                let ([a, b, c], [d, e, f]) = (YOUNG_ABOVE, YOUNG_BELOW);
                let above = (c * sine + b) * sine + a;
                let above_slope = 2.0 * c * sine + b;
                let below = ((sine + f) * sine + e) * sine + d;
                let below_slope = (3.0 * sine + 2.0 * f) * sine + e;
                let slope = (below_slope * above - below * above_slope) / (above * above);
                (below / above, slope * cosine)
            }
            AirmassModel::Pickering2002 => {
                let [a, b, c, d] = PICKERING;
                let denominator = b + c * degrees.powf(d);
                let denominator_slope = c * d * degrees.powf(d - 1.0);
                let (sine, cosine) = ((degrees + a / denominator) * RADIANS_PER_DEGREE).sin_cos();
                (sine, cosine * (1.0 - a * denominator_slope / (denominator * denominator)))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::dispatch::{Isa, Kernel};
    use crate::refraction::Atmosphere;

    const TABLE: &str = include_str!("../../../../tests/reference/airmass.csv");

    #[test]
    fn published_formulae() {
        let mut rows = 0;
        for line in TABLE.lines().filter(|line| !line.starts_with('#')).skip(1) {
            let mut fields = line.split(',');
            let zenith_distance_deg: f64 = fields.next().unwrap().parse().unwrap();
            let altitude = (90.0 - zenith_distance_deg) * RADIANS_PER_DEGREE;
            for model in [AirmassModel::KastenYoung1989, AirmassModel::Young1994, AirmassModel::Pickering2002]
            {
                let expected: f64 = fields.next().unwrap().parse().unwrap();
                let found = model.airmass(altitude, altitude);
                assert!((found - expected).abs() < 0.5001e-4, "{} {found} {expected}", model.word());
                rows += 1;
            }
        }
        assert_eq!(rows, 12);
        let flat = AirmassModel::PlaneParallel;
        assert!((flat.airmass(30.0 * RADIANS_PER_DEGREE, 0.0) - 2.0).abs() < 1e-15);
        assert_eq!(flat.airmass(0.0, 0.0), f64::INFINITY);
    }

    #[test]
    fn each_takes_its_own_altitude() {
        for model in AirmassModel::ALL {
            let from_observed = model.airmass(0.5, 0.4) == model.airmass(0.5, 0.3);
            assert_eq!(from_observed, model != AirmassModel::Young1994, "{}", model.word());
            assert!(model.airmass(-1e-9, -1e-9).is_nan());
            assert!(model.airmass(f64::NAN, 0.1).is_nan());
        }
    }

    struct InLoop<'a>(AirmassModel, &'a [(f64, f64)], &'a mut [f64]);

    impl Kernel for InLoop<'_> {
        type Output = ();
        #[inline(always)]
        fn run<A: Arithmetic>(self) {
            for (&(observed, topocentric), out) in self.1.iter().zip(self.2) {
                *out = self.0.airmass_in_loop::<A>(observed, topocentric);
            }
        }
    }

    #[test]
    fn in_loops_it_is_the_same() {
        let mut altitudes: Vec<(f64, f64)> =
            (-2000..=20_000).map(|i| f64::from(i) / 20_000.0 * FRAC_PI_2).map(|h| (h, h - 0.01)).collect();
        altitudes.extend([(f64::NAN, f64::NAN), (-0.0, -0.0), (1e-300, -1e-5), (-1e-300, -1e-5)]);
        let mut found = vec![0.0; altitudes.len()];
        for isa in Isa::available() {
            let mut worst = 0.0f64;
            for model in AirmassModel::ALL {
                isa.run(InLoop(model, &altitudes, &mut found));
                for (&(observed, topocentric), &found) in altitudes.iter().zip(&found) {
                    let expected = model.airmass(observed, topocentric);
                    let same = found == expected || (found.is_nan() && expected.is_nan());
                    worst = worst.max(if same { 0.0 } else { (found / expected - 1.0).abs() });
                    assert!(worst < 2e-15, "{} {} {observed}: {worst:.1e}", model.word(), isa.word());
                }
            }
            println!("airmass in loops, {}: {worst:.1e}", isa.word());
        }
    }

    #[test]
    fn inverse_returns_the_airmass() {
        let air = Atmosphere {
            pressure_hpa: 750.0,
            temperature_c: 8.0,
            relative_humidity: 0.2,
            wavelength_um: 0.55,
        };
        let mut worst: f64 = 0.0;
        for refraction in [Refraction::none(), Refraction::new(&air, 0.5, 2500.0).unwrap()] {
            for model in AirmassModel::ALL {
                for i in 0..3000 {
                    let airmass = 1.001 * 1.0012_f64.powi(i);
                    let observed = model.observed_altitude(airmass, &refraction).unwrap();
                    let largest = model.airmass(0.0, refraction.topocentric_altitude(0.0));
                    if airmass >= largest {
                        assert_eq!(observed, 0.0);
                        continue;
                    }
                    let back = model.airmass(observed, refraction.topocentric_altitude(observed));
                    worst = worst.max((back / airmass - 1.0).abs());
                }
            }
        }
        println!("airmass inverse: {worst:.2e}");
        assert!(worst < 1e-10, "{worst:.2e}");
    }

    #[test]
    fn limits_at_the_ends() {
        let none = Refraction::none();
        for model in AirmassModel::ALL {
            // All formulae are within 4e-4 of 1 at the zenith, so that a limit of 1 means almost there.
            let altitude = model.observed_altitude(1.0, &none).unwrap();
            assert!(
                (88.0 * RADIANS_PER_DEGREE..=FRAC_PI_2).contains(&altitude),
                "{} {altitude}",
                model.word()
            );
            assert!(model.observed_altitude(1e6, &none).unwrap() < 1.1e-6);
            assert_eq!(model.observed_altitude(f64::INFINITY, &none).unwrap(), 0.0);
            let message = model.observed_altitude(0.99, &none).unwrap_err().to_string();
            assert_eq!(message, "airmass: given 0.99, allowed 1 or more");
            assert!(model.observed_altitude(f64::NAN, &none).is_err());
        }
    }

    #[test]
    fn words() {
        for model in AirmassModel::ALL {
            assert_eq!(AirmassModel::from_word(model.word()).unwrap(), model);
        }
        let message = AirmassModel::from_word("pickering").unwrap_err().to_string();
        assert_eq!(
            message,
            "airmass model: given \"pickering\", allowed plane_parallel, kasten_young_1989, young_1994, pickering_2002"
        );
    }
}
