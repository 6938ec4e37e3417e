//! The great circle between two points of a sphere. Points are longitude and latitude, radians.

use super::vector::{angle, from_angles};
use std::f64::consts::TAU;

/// Angle between two points, radians, 0 to π. Well conditioned from 0 to π.
///
/// Error: at most the last place of π, 4.5e-16 rad or 0.1 nas (`known_angles_of_every_size`). Through vectors
/// and an arctangent of two arguments, since the cosine alone loses half the digits of a small angle.
pub fn separation(from: [f64; 2], to: [f64; 2]) -> f64 {
    angle(from_angles(from[0], from[1]), from_angles(to[0], to[1]))
}

/// Direction of the second point seen from the first: from that of increasing latitude through that of increasing
/// longitude, radians, 0 to 2π. 0 where the points are one.
///
/// Source: the sine and the five-part formulae of the triangle pole–first–second (Smart, Textbook on Spherical
/// Astronomy, 6th ed., sections 5 to 8).
pub fn position_angle(from: [f64; 2], to: [f64; 2]) -> f64 {
    let (sin_from, cos_from) = from[1].sin_cos();
    let (sin_to, cos_to) = to[1].sin_cos();
    let (sin_difference, cos_difference) = (to[0] - from[0]).sin_cos();
    let angle = (cos_to * sin_difference).atan2(sin_to * cos_from - cos_to * sin_from * cos_difference);
    if angle < 0.0 { (angle + TAU) % TAU } else { angle }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::{FRAC_PI_2, PI};

    #[test]
    fn known_angles_of_every_size() {
        // Along a meridian the angle is the difference of the latitudes, over the pole as well.
        let mut worst: f64 = 0.0;
        for k in 0..=1_000_000 {
            let size = PI * 10f64.powf(-12.0 * f64::from(k) / 1_000_000.0);
            let start = -FRAC_PI_2 + f64::from(k % 997) * 1e-3 * (PI - size);
            let end = start + size;
            let to = if end > FRAC_PI_2 { [1.0 + PI, PI - end] } else { [1.0, end] };
            // What was added, rounded, is what the angle is.
            worst = worst.max((separation([1.0, start], to) - (end - start)).abs());
        }
        assert!(worst < 4.5e-16, "{worst:e}");
    }

    #[test]
    fn the_example_of_meeus() {
        // Meeus, Astronomical Algorithms, 2nd ed., example 17.a [M]: Arcturus to Spica 32.7930 degrees.
        let point = |lon: f64, lat: f64| [lon.to_radians(), lat.to_radians()];
        let found = separation(point(213.9154, 19.1825), point(201.2983, -11.1614));
        assert!((found.to_degrees() - 32.7930).abs() < 5e-5, "{found}");
    }

    #[test]
    fn position_angle_turns_from_latitude_through_longitude() {
        for (to, expected) in [
            ([0.2, 0.1], 0.0),
            ([0.2 + 1e-9, 0.0], FRAC_PI_2),
            ([0.2, -0.1], PI),
            ([0.2 - 1e-9, 0.0], 1.5 * PI),
            ([0.2, 0.0], 0.0),
        ] {
            assert!((position_angle([0.2, 0.0], to) - expected).abs() < 1e-8, "{to:?}");
        }
        // From a pole, directions are longitudes; a hair west of north stays below a turn.
        let from_pole = position_angle([0.0, FRAC_PI_2], [1.0, 0.3]);
        assert!((from_pole - (PI - 1.0)).abs() < 1e-15, "{from_pole}");
        assert!(position_angle([1e-18, 0.0], [0.0, 0.5]) < TAU);
        assert!(position_angle([0.0, 0.0], [f64::NAN, 0.0]).is_nan());
    }

    #[test]
    fn sine_rule_holds_in_every_triangle() {
        // The two position angles at the ends of an arc (Smart, section 6), over a grid of points.
        for k in 0..2_000 {
            let (a, b) = (f64::from(k % 41), f64::from(k % 59));
            let (from, to) = ([a * 0.15, a * 0.07 - 1.4], [b * 0.1 + 0.03, 1.4 - b * 0.047]);
            let there = position_angle(from, to).sin() * from[1].cos();
            let back = position_angle(to, from).sin() * to[1].cos();
            assert!((there + back).abs() < 1e-14, "{k}: {there} {back}");
        }
    }
}
