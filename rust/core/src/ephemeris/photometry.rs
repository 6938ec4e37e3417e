//! How bright and how large bodies look, and how they are lit: pure functions of the geometry.
//!
//! Distances in au, angles in radians, magnitudes in V. Formulae whose constants were written down from memory of the
//! paper rather than with the paper at hand say "[from memory]"; the tests then check them against published worked values.

use std::f64::consts::PI;
use std::sync::OnceLock;

use super::Body;
use crate::constants::ASTRONOMICAL_UNIT_M;
use crate::math::vector::{Vector, angle, cross, dot, from_angles, norm, scale, sub};

/// The triangle of Sun, body and observer.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Geometry {
    /// Sun to body, au.
    pub heliocentric_au: f64,
    /// Observer to body, au.
    pub distance_au: f64,
    /// Angle at the body between Sun and observer, 0 to π.
    pub phase_angle: f64,
    /// Angle at the observer between Sun and body, 0 to π.
    pub elongation: f64,
}

impl Geometry {
    /// From the body as the Sun sees it and as the observer sees it: vectors from either to the body, au, any axes.
    ///
    /// For the Sun itself (`from_sun` zero) the phase angle is 0. Both angles are well conditioned from 0 to π.
    pub fn new(from_sun: Vector, from_observer: Vector) -> Geometry {
        let heliocentric_au = norm(from_sun);
        let to_sun = sub(from_observer, from_sun);
        Geometry {
            heliocentric_au,
            distance_au: norm(from_observer),
            phase_angle: if heliocentric_au > 0.0 { angle(from_sun, from_observer) } else { 0.0 },
            elongation: angle(to_sun, from_observer),
        }
    }

    /// Illuminated fraction of the disc, 0 to 1: (1 + cos phase)/2, of a sphere under parallel light (Meeus,
    /// *Astronomical Algorithms*, equation 48.1).
    pub fn illuminated_fraction(&self) -> f64 {
        0.5 * (1.0 + self.phase_angle.cos())
    }
}

/// Angular diameter, radians, of a sphere of a radius in km at a distance in au; π inside it.
pub fn angular_diameter(radius_km: f64, distance_au: f64) -> f64 {
    let sine = radius_km * 1e3 / (distance_au * ASTRONOMICAL_UNIT_M);
    2.0 * sine.min(1.0).asin()
}

/// Position angle, 0 to 2π from the `pole` through the left (east, on axes seen from inside the sphere), at which `to`
/// lies as seen at `from`: directions of any length.
///
/// With a Moon `from` and a Sun `to` it is the position angle of the Moon's bright limb (Meeus, equation 48.5); with a
/// rate of motion as `to` (see [`motion`]) its direction.
pub fn position_angle(from: Vector, to: Vector, pole: Vector) -> f64 {
    let east = cross(pole, from);
    let north = cross(from, east);
    (dot(to, east) * norm(from)).atan2(dot(to, north)).rem_euclid(2.0 * PI)
}

/// Rate of motion on the sky (radians per unit of time) and its position angle, from a vector to the body and the
/// vector's rate.
pub fn motion(direction: Vector, rate: Vector, pole: Vector) -> (f64, f64) {
    let square = dot(direction, direction);
    let across = sub(rate, scale(dot(rate, direction) / square, direction));
    (norm(across) / square.sqrt(), position_angle(direction, across, pole))
}

/// How bright a minor body is: the parameters of its magnitude.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Brightness {
    /// Absolute magnitude H and slope G.
    Hg {
        /// Absolute magnitude.
        h: f64,
        /// Slope, 0.15 where unknown.
        g: f64,
    },
    /// Absolute magnitude and two slopes.
    Hg1g2 {
        /// Absolute magnitude.
        h: f64,
        /// Share of the dark, porous surface's phase function.
        g1: f64,
        /// Share of the bright one's.
        g2: f64,
    },
    /// A comet's total magnitude: h + 5 log Δ + 2.5 k log r.
    Comet {
        /// At 1 au from both.
        h: f64,
        /// Power of the heliocentric distance; 4 where unknown.
        k: f64,
    },
}

impl Brightness {
    /// Apparent V magnitude. NaN where a parameter is unknown, and for H, G₁, G₂ beyond a phase of 150°.
    pub fn magnitude(&self, geometry: &Geometry) -> f64 {
        let (r, delta, phase) = (geometry.heliocentric_au, geometry.distance_au, geometry.phase_angle);
        match *self {
            Brightness::Hg { h, g } => {
                h + 5.0 * (r * delta).log10() - 2.5 * phase_function_hg(g, phase).log10()
            }
            Brightness::Hg1g2 { h, g1, g2 } => {
                h + 5.0 * (r * delta).log10() - 2.5 * phase_function_hg1g2(g1, g2, phase).log10()
            }
            Brightness::Comet { h, k } => h + 5.0 * delta.log10() + 2.5 * k * r.log10(),
        }
    }
}

/// The phase function of the H,G system, 1 at opposition.
///
/// Bowell et al. 1989, in *Asteroids II*, p. 524, in the form that the Minor Planet Center computes with [from memory]. Meant for
/// phases up to 120°; it falls to 0 at 180°.
pub fn phase_function_hg(g: f64, phase: f64) -> f64 {
    let tangent = (0.5 * phase).tan();
    let part = |factor: f64, power: f64| (-factor * tangent.powf(power)).exp();
    (1.0 - g) * part(3.33, 0.63) + g * part(1.87, 1.22)
}

/// The phase function of the H,G₁,G₂ system, 1 at opposition; NaN beyond 150°, where it is not defined.
///
/// Muinonen et al. 2010, *Icarus* 209, 542, tables 3 to 5: straight lines to 7.5° and cubic splines with given end slopes
/// beyond, and a spline of nine knots to 30° for the opposition effect [from memory].
pub fn phase_function_hg1g2(g1: f64, g2: f64, phase: f64) -> f64 {
    let [dark, bright, peak] = basis();
    let phase = phase.abs();
    if phase > 150f64.to_radians() * (1.0 + 1e-15) {
        return f64::NAN;
    }
    let (first, second) = if phase < 7.5f64.to_radians() {
        (1.0 - 6.0 * phase / PI, 1.0 - 9.0 * phase / (5.0 * PI))
    } else {
        (dark.value(phase), bright.value(phase))
    };
    let third = if phase < 30f64.to_radians() { peak.value(phase) } else { 0.0 };
    g1 * first + g2 * second + (1.0 - g1 - g2) * third
}

/// A cubic spline with given end slopes.
struct Spline {
    x: Vec<f64>,
    y: Vec<f64>,
    slope: Vec<f64>,
}

impl Spline {
    /// Through knots given in degrees, slopes at the ends per radian; the slopes between make the second derivative
    /// continuous.
    fn new(knots: &[(f64, f64)], first: f64, last: f64) -> Spline {
        let x: Vec<f64> = knots.iter().map(|knot| knot.0.to_radians()).collect();
        let y: Vec<f64> = knots.iter().map(|knot| knot.1).collect();
        let n = x.len();
        let mut slope = vec![0.0; n];
        (slope[0], slope[n - 1]) = (first, last);
        // Diagonally dominant, so that elimination without pivots is safe.
        let (mut factor, mut right) = (vec![0.0; n], vec![0.0; n]);
        right[0] = first;
        for i in 1..n - 1 {
            let (a, b) = (1.0 / (x[i] - x[i - 1]), 1.0 / (x[i + 1] - x[i]));
            let sum = 3.0 * ((y[i] - y[i - 1]) * a * a + (y[i + 1] - y[i]) * b * b);
            let pivot = 2.0 * (a + b) - a * factor[i - 1];
            factor[i] = b / pivot;
            right[i] = (sum - a * right[i - 1]) / pivot;
        }
        for i in (1..n - 1).rev() {
            slope[i] = right[i] - factor[i] * slope[i + 1];
        }
        Spline { x, y, slope }
    }

    fn value(&self, x: f64) -> f64 {
        let last = self.x.len() - 2;
        let i = self.x[1..=last].iter().take_while(|&&knot| knot <= x).count();
        let step = self.x[i + 1] - self.x[i];
        let t = (x - self.x[i]) / step;
        let u = 1.0 - t;
        self.y[i] * u * u * (1.0 + 2.0 * t)
            + self.y[i + 1] * t * t * (1.0 + 2.0 * u)
            + step * t * u * (self.slope[i] * u - self.slope[i + 1] * t)
    }
}

fn basis() -> &'static [Spline; 3] {
    static BASIS: OnceLock<[Spline; 3]> = OnceLock::new();
    BASIS.get_or_init(|| {
        [
            Spline::new(
                &[
                    (7.5, 0.75),
                    (30.0, 0.33486016),
                    (60.0, 0.13410560),
                    (90.0, 0.051104756),
                    (120.0, 0.021465687),
                    (150.0, 0.0036396989),
                ],
                -6.0 / PI,
                -0.091328612,
            ),
            Spline::new(
                &[
                    (7.5, 0.925),
                    (30.0, 0.62884169),
                    (60.0, 0.31755495),
                    (90.0, 0.12716367),
                    (120.0, 0.022373903),
                    (150.0, 0.00016505689),
                ],
                -9.0 / (5.0 * PI),
                -8.6573138e-8,
            ),
            Spline::new(
                &[
                    (0.0, 1.0),
                    (0.3, 0.83381185),
                    (1.0, 0.57735424),
                    (2.0, 0.42144772),
                    (4.0, 0.23174230),
                    (8.0, 0.10348178),
                    (12.0, 0.061733473),
                    (20.0, 0.016107006),
                    (30.0, 0.0),
                ],
                -0.10630097,
                0.0,
            ),
        ]
    })
}

/// Apparent V magnitude of the Sun, the Moon or a planet.
///
/// - Planets: Mallama & Hilton 2018, *Astronomy and Computing* 25, 10 [from memory], errors by their account 0.01 to 0.1 mag inside
///   the phases seen from the Earth. Left out are Mars's rotation and seasons (±0.06) and Uranus's latitude (at most
///   0.07).
/// - Saturn without its rings unless `ring_latitude` is given: the planetocentric latitude of the Earth above the ring
///   plane (radians, effective as they define it), the rings adding up to a magnitude.
/// - Neptune brightened from 1980 to 2000: `year` (any, 2000 or later for now).
/// - Sun: −26.76 at 1 au (Willmer 2018, *Astrophys. J. Suppl.* 236, 47).
/// - Moon: −12.73 + 0.026|α°| + 4e-9 α°⁴ at its mean distance and 1 au from the Sun (Krisciunas & Schaefer 1991, *Publ.
///   Astron. Soc. Pacific* 103, 1033, after Allen 1976) [from memory], which leaves out the surge within 7° of full and errs by
///   tenths in a thin crescent.
/// - Pluto: −1.01 + 0.041 α° (Seidelmann 1992, *Explanatory Supplement*, table 7.3) [from memory].
pub fn magnitude(body: Body, geometry: &Geometry, year: f64, ring_latitude: Option<f64>) -> f64 {
    let (r, delta) = (geometry.heliocentric_au, geometry.distance_au);
    let a = geometry.phase_angle.to_degrees();
    let far = || 5.0 * (r * delta).log10();
    /// Mean distance of the Moon, au: 384,400 km.
    const MOON_DISTANCE_AU: f64 = 384_400e3 / ASTRONOMICAL_UNIT_M;
    match body {
        Body::Sun => -26.76 + 5.0 * delta.log10(),
        Body::Moon => -12.73 + 0.026 * a + 4e-9 * a.powi(4) + far() - 5.0 * MOON_DISTANCE_AU.log10(),
        Body::Mercury => {
            far() + horner(a, &[-0.613, 6.3280e-2, -1.6336e-3, 3.3644e-5, -3.4265e-7, 1.6893e-9, -3.0334e-12])
        }
        Body::Venus if a < 163.7 => far() + horner(a, &[-4.384, -1.044e-3, 3.687e-4, -2.814e-6, 8.938e-9]),
        Body::Venus => far() + horner(a, &[236.05828, -2.81914, 8.39034e-3]),
        Body::Earth => far() + horner(a, &[-3.99, -1.060e-3, 2.054e-4]),
        Body::Mars if a <= 50.0 => far() + horner(a, &[-1.601, 2.267e-2, -1.302e-4]),
        Body::Mars => far() + horner(a, &[-0.367, -2.573e-2, 3.445e-4]),
        Body::Jupiter if a <= 12.0 => far() + horner(a, &[-9.395, -3.7e-4, 6.16e-4]),
        Body::Jupiter => {
            far() - 9.428 - 2.5 * horner(a / 180.0, &[1.0, -1.507, -0.363, -0.062, 2.809, -1.876]).log10()
        }
        Body::Saturn => match ring_latitude {
            Some(latitude) if a <= 6.5 => {
                let sine = latitude.abs().sin();
                far() - 8.914 - 1.825 * sine + 0.026 * a - 0.378 * sine * (-2.25 * a).exp()
            }
            _ if a <= 6.5 => far() + horner(a, &[-8.95, -3.7e-4, 6.16e-4]),
            _ => far() + horner(a, &[-8.94, 2.446e-4, 2.672e-4, -1.506e-6, 4.767e-9]),
        },
        Body::Uranus => far() + horner(a, &[-7.110, 6.587e-3, 1.045e-4]),
        Body::Neptune => {
            let brightened = -6.89 - 0.0054 * (year - 1980.0).clamp(0.0, 20.4);
            far() + brightened + if a > 1.9 { 7.944e-3 * a + 9.617e-5 * a * a } else { 0.0 }
        }
        Body::Pluto => far() - 1.01 + 0.041 * a,
    }
}

/// Saturn's effective ring latitude for [`magnitude`], radians: the geometric mean of the latitudes of observer and Sun
/// above the plane of the rings, 0 where they are on opposite sides (Mallama & Hilton 2018, after Mallama 2012 [from memory]).
///
/// Vectors from the Sun and from the observer to Saturn, any length, ICRS axes. Saturn's pole: Archinal et al. 2018,
/// *Celest. Mech. Dyn. Astron.* 130:22, table 1 [from memory], at J2000.0; its precession is 0.004° in thirty years.
pub fn saturn_ring_latitude(from_sun: Vector, from_observer: Vector) -> f64 {
    let pole = from_angles(40.589f64.to_radians(), 83.537f64.to_radians());
    let latitude = |v: Vector| (-dot(v, pole) / norm(v)).clamp(-1.0, 1.0).asin();
    (latitude(from_sun) * latitude(from_observer)).max(0.0).sqrt()
}

fn horner(x: f64, coefficients: &[f64]) -> f64 {
    coefficients.iter().rev().fold(0.0, |sum, coefficient| sum * x + coefficient)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ephemeris::Compact;
    use crate::time::Instant;

    fn geometry(r: f64, delta: f64, phase_deg: f64) -> Geometry {
        Geometry {
            heliocentric_au: r,
            distance_au: delta,
            phase_angle: f64::to_radians(phase_deg),
            elongation: 0.0,
        }
    }

    /// Worked values of Mallama & Hilton 2018 (appendix: date, r, Δ, phase, V) [M]. Jupiter, Mercury and Venus as
    /// printed, to the rounding of the last digit.
    #[test]
    fn published_magnitudes_of_planets() {
        let cases = [
            (Body::Mercury, 0.310295423552, 1.32182643625754, 1.1677, -2.477),
            (Body::Venus, 0.722722540169, 1.71607489554051, 1.3432, -3.917),
            (Body::Jupiter, 5.446231815414, 6.44985867459088, 0.2446, -1.667),
        ];
        for (body, r, delta, phase, published) in cases {
            let v = magnitude(body, &geometry(r, delta, phase), 2018.0, None);
            assert!((v - published).abs() < 1e-3, "{body:?}: {v}, published {published}");
        }
        // Mars near opposition in August 2003: −2.862 printed, with ±0.06 of rotation and season, left out here.
        let mars = magnitude(Body::Mars, &geometry(1.381191244505, 0.37274381097911, 4.8948), 2003.6, None);
        assert!((mars + 2.862).abs() < 0.15, "{mars}");
    }

    /// Facts of the trade: Venus at its brightest −4.8 to −4.9, the full Moon −12.7, the quarter Moon some −10, the Sun −26.76,
    /// Saturn with open rings about half a magnitude brighter than without, Neptune 7.7 to 7.8, Uranus 5.6 to 5.7.
    #[test]
    fn magnitudes_are_those_one_sees() {
        let v = |body, r, delta, phase| magnitude(body, &geometry(r, delta, phase), 2026.0, None);
        assert!((v(Body::Venus, 0.722, 0.43, 118.0) + 4.8).abs() < 0.1);
        assert!((v(Body::Moon, 1.0, 384_400e3 / ASTRONOMICAL_UNIT_M, 0.0) + 12.73).abs() < 1e-9);
        assert!((v(Body::Moon, 1.0, 384_400e3 / ASTRONOMICAL_UNIT_M, 90.0) + 10.13).abs() < 0.1);
        assert_eq!(v(Body::Sun, 0.0, 1.0, 0.0), -26.76);
        assert!((v(Body::Neptune, 29.9, 28.9, 0.0) - 7.7).abs() < 0.1);
        assert!((v(Body::Uranus, 19.5, 18.5, 0.0) - 5.68).abs() < 0.1);
        let saturn = geometry(9.03, 8.05, 0.3);
        let gain = magnitude(Body::Saturn, &saturn, 2003.9, None)
            - magnitude(Body::Saturn, &saturn, 2003.9, Some(26f64.to_radians()));
        assert!((0.7..1.0).contains(&gain), "{gain}");
        // The branches meet.
        for (body, edge, step) in
            [(Body::Venus, 163.7, 0.06), (Body::Mars, 50.0, 0.05), (Body::Jupiter, 12.0, 0.05)]
        {
            let gap = v(body, 1.0, 1.0, edge - 1e-9) - v(body, 1.0, 1.0, edge + 1e-9);
            assert!(gap.abs() < step, "{body:?} {gap}");
        }
    }

    /// The rings stood open by 26.7° to 27° in October 2017 and went edge-on to the Earth on 2025 March 23, to the Sun on 2025
    /// May 6; in between the two were on opposite sides. [M]
    #[test]
    fn rings_open_and_close() {
        let latitude = |mjd: f64| {
            let at = |body| Compact::builtin().position(body, Instant::from_mjd(mjd, 0.0)).unwrap();
            let saturn = at(Body::Saturn);
            saturn_ring_latitude(sub(saturn, at(Body::Sun)), sub(saturn, at(Body::Earth))).to_degrees()
        };
        let (october_2017, march_23) = (58_040.0, 60_757.0);
        assert!((26.6..27.0).contains(&latitude(october_2017)), "{}", latitude(october_2017));
        assert!(
            latitude(march_23 - 2.0) > 0.0
                && latitude(march_23 + 2.0) == 0.0
                && latitude(march_23 + 40.0) == 0.0
        );
        assert!(latitude(march_23 + 60.0) > 0.0);
    }

    /// By hand from the formula: with G = 0.15 a phase of 20° dims by 1.00 mag, one of 0° by nothing.
    #[test]
    fn hg_dims_as_tabulated() {
        let dimming = |g, phase_deg: f64| -2.5 * phase_function_hg(g, phase_deg.to_radians()).log10();
        assert_eq!(dimming(0.15, 0.0), 0.0);
        // Φ₁(20°) = exp(−3.33·0.17633^0.63), Φ₂(20°) = exp(−1.87·0.17633^1.22).
        let by_hand =
            -2.5 * (0.85 * (-3.33f64 * 0.335106).exp() + 0.15 * (-1.87f64 * 0.120376).exp()).log10();
        assert!((dimming(0.15, 20.0) - by_hand).abs() < 1e-4, "{} {by_hand}", dimming(0.15, 20.0));
        // Brighter surfaces (large G) dim less.
        assert!(dimming(0.4, 20.0) < dimming(0.15, 20.0) && dimming(0.15, 20.0) < dimming(0.0, 20.0));
    }

    #[test]
    fn hg1g2_is_smooth_and_falls() {
        for (g1, g2) in [(0.26, 0.38), (0.84, 0.05), (0.15, 0.6)] {
            assert!((phase_function_hg1g2(g1, g2, 0.0) - 1.0).abs() < 1e-15);
            let mut last = 1.0 + 1e-12;
            for step in 0..15_000 {
                let value = phase_function_hg1g2(g1, g2, (f64::from(step) * 0.01).to_radians());
                assert!(value < last && last - value < 0.01, "at {} degrees", f64::from(step) * 0.01);
                last = value;
            }
            assert!(phase_function_hg1g2(g1, g2, 2.7).is_nan());
        }
        // Against H,G with the same opposition brightness: an S-type surface (0.26, 0.38) is like G = 0.24 within
        // 0.05 mag from 10° to 60° (Muinonen et al. 2010, figure 3, read off) [M].
        for phase in [10.0, 20.0, 40.0, 60.0f64] {
            let a = -2.5 * phase_function_hg1g2(0.26, 0.38, phase.to_radians()).log10();
            let b = -2.5 * phase_function_hg(0.24, phase.to_radians()).log10();
            assert!((a - b).abs() < 0.1, "{phase}: {a} {b}");
        }
    }

    /// Meeus, examples 47.a, 48.a: the Moon on 1992-04-12 0h TD at α 134.6885°, δ 13.7684°, 368410 km; the Sun at
    /// α 20.6579°, δ 8.6964°, 149971520 km; phase 69.0756°, illuminated 0.6786, bright limb 285.0°. [M, as in the
    /// project's table of values]
    #[test]
    fn published_moon_phase_and_bright_limb() {
        let au = ASTRONOMICAL_UNIT_M / 1e3;
        let moon = scale(368_410.0 / au, from_angles(134.6885f64.to_radians(), 13.7684f64.to_radians()));
        let sun = scale(149_971_520.0 / au, from_angles(20.6579f64.to_radians(), 8.6964f64.to_radians()));
        let geometry = Geometry::new(sub(moon, sun), moon);
        assert!((geometry.phase_angle.to_degrees() - 69.0756).abs() < 2e-4);
        assert!((geometry.illuminated_fraction() - 0.6786).abs() < 5e-5);
        let limb = position_angle(moon, sun, [0.0, 0.0, 1.0]).to_degrees();
        assert!((limb - 285.0).abs() < 0.05, "{limb}");
        // The angles of the triangle with the third at the Sun make π.
        let third = angle(scale(-1.0, sun), sub(moon, sun));
        assert!((geometry.phase_angle + geometry.elongation + third - PI).abs() < 1e-12);
    }

    #[test]
    fn diameters_and_motion() {
        // The Sun at 1 au: 1919.26″ by the nominal radius (959.63″ is the half of the almanacs).
        let sun = angular_diameter(Body::Sun.equatorial_radius_km(), 1.0).to_degrees() * 3600.0;
        assert!((sun - 2.0 * 959.22).abs() < 0.5, "{sun}");
        assert_eq!(angular_diameter(1737.4, 1e-6), PI);
        let pole = [0.0, 0.0, 1.0];
        let (rate, direction) = motion([2.0, 0.0, 0.0], [5.0, 0.0, 0.02], pole);
        assert!((rate - 0.01).abs() < 1e-15 && direction == 0.0);
        let (_, east) = motion([2.0, 0.0, 0.0], [0.0, 0.02, 0.0], pole);
        assert!((east - PI / 2.0).abs() < 1e-15);
    }
}
