//! How sure the instant is at which something passes a bound.

use super::arc::Arc;
use super::scatter::horizon_scatter;
use crate::constants::{EARTH_ROTATION_RAD_PER_S, SECONDS_PER_DAY};
use crate::horizon::sin_declination;

/// Rounding of the instant, of Newton's last step and of TDB, seconds.
pub(crate) const ROUNDING_S: f64 = 1e-5;

/// How sure an instant is.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(crate) struct Passing {
    /// How far the computed instant may be from the true one for the stated atmosphere, seconds.
    pub computed_error_s: f64,
    /// Standard deviation by which refraction strays from the stated atmosphere, seconds.
    pub horizon_scatter_s: f64,
    /// Whether the turning point lies nearer to the bound than the errors: it may not be passed at all.
    pub may_not_happen: bool,
}

/// Seconds by which an error moves the instant at which a bound is passed at a rate, at most a day; and
/// whether it may carry the turning point over the bound.
///
/// The quantity is taken as a parabola whose second derivative has at most the size `curvature`, all
/// in one unit and days. Towards the turning point, the error is made up after t with
/// rate t − curvature t²/2 = error; where that has no solution the bound may not be reached, and from the
/// turning point it takes √(2 error / curvature) to move by the error.
pub(crate) fn passing(error: f64, rate_per_day: f64, curvature_per_day2: f64) -> (f64, bool) {
    if error <= 0.0 {
        return (0.0, false);
    }
    let rate = rate_per_day.abs();
    let left = rate * rate - 2.0 * curvature_per_day2 * error;
    let grazes = left <= 0.0;
    let days = if grazes {
        // Both the way to the turning point and the way out from it; NaN (no curvature, no rate) is a day.
        (2.0 * error / curvature_per_day2).sqrt()
    } else {
        2.0 * error / (rate + left.sqrt())
    };
    (if days < 1.0 { days * SECONDS_PER_DAY } else { SECONDS_PER_DAY }, grazes)
}

/// The same for a bound in altitude: `angle_error` is that of the direction, radians.
///
/// The second derivative of the sine of an altitude is at most cos φ cos δ ω².
pub(crate) fn altitude_passing(
    arc: &Arc<'_>,
    local: [f64; 3],
    rate: [f64; 3],
    observed: f64,
    angle_error: f64,
) -> Passing {
    let sin_declination = sin_declination(local, arc.latitude);
    let cos_declination = (1.0 - sin_declination * sin_declination).max(0.0).sqrt();
    let turn = EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY;
    let curvature = arc.latitude.cos.abs() * cos_declination * turn * turn;
    let cos_altitude = local[0].hypot(local[1]);
    let scatter = horizon_scatter(arc.observer.refraction, observed);
    let (error_s, _) = passing(angle_error * cos_altitude, rate[2], curvature);
    let (scatter_s, _) = passing(scatter * cos_altitude, rate[2], curvature);
    let (_, grazes) = passing((angle_error + scatter) * cos_altitude, rate[2], curvature);
    Passing {
        computed_error_s: error_s + arc.ut1_error_s + ROUNDING_S,
        horizon_scatter_s: scatter_s,
        may_not_happen: grazes,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_error_of_a_parabola_is_covered() {
        // h = margin − c t²/2, passed at t = √(2 margin / c); then all of it moved by the error.
        let c = 30.0;
        for margin in [1e-9, 1e-6, 1e-3, 0.1] {
            for error in [1e-10, 1e-8, 1e-6, 1e-4] {
                let at = |margin: f64| (2.0 * margin / c).sqrt();
                let (bound_s, grazes) = passing(error, c * at(margin), c);
                assert_eq!(grazes, margin <= error * (1.0 + 1e-12), "{margin} {error}");
                let moved: Vec<f64> = [margin - error, margin + error]
                    .into_iter()
                    .filter(|&margin| margin >= 0.0)
                    // The difference of the two roots, without loss.
                    .map(|moved| 2.0 * error / c / (at(moved) + at(margin)) * SECONDS_PER_DAY)
                    .collect();
                for moved in moved {
                    // The difference of the two instants is rounded to 1e-18 d.
                    assert!(moved <= bound_s * (1.0 + 1e-9) + 1e-12, "{margin} {error}: {moved} {bound_s}");
                }
            }
        }
        // Far from the turning point it is the error over the rate.
        assert!((passing(1e-6, 2.0, 0.0).0 - 5e-7 * SECONDS_PER_DAY).abs() < 1e-12);
        // Nothing moves: at any time of the day.
        assert_eq!(passing(1e-6, 0.0, 0.0), (SECONDS_PER_DAY, true));
        assert_eq!(passing(0.0, 0.0, 0.0), (0.0, false));
    }
}
