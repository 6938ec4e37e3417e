//! How sure each edge of a window is.

use super::day::DAY;
use super::reason::Cause;
use super::target::LimitedSpan;
use crate::constants::{EARTH_ROTATION_RAD_PER_S, RADIANS_PER_DEGREE, SECONDS_PER_DAY};
use crate::events::{BODY_ARC_ERROR_RAD, DayPath, Passing, ROUNDING_S, altitude_passing, passing};
use crate::horizon::{altitude, azimuth};

/// Rate of rotation, radians a day.
const TURN_PER_DAY: f64 = EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY;
/// The distance from Sun or Moon bends by the square of their motion among the stars and of parallax:
/// radians a day².
const SEPARATION_BEND: f64 = 0.3;
/// Error of the sky's brightness as the formula gives it, magnitudes: that of the arguments, not of the formula.
const BRIGHTNESS_ERROR: f64 = 1e-6;
/// Error of light time and of the clock's rate over the day, seconds.
const PHASE_ERROR_S: f64 = 1e-3;

/// How sure the edge is that a limit sets at an instant of a day.
pub(super) fn edge<P: DayPath>(
    span: &LimitedSpan<'_>,
    reason: u8,
    index: usize,
    path: &P,
    row: usize,
    at: f64,
) -> Passing {
    let (arc, day) = (&span.days.arcs[index], &span.limited[index]);
    let cause = if reason == DAY { Cause::None } else { Cause::from_code(reason).unwrap_or(Cause::None) };
    if matches!(cause, Cause::None | Cause::Span | Cause::AllowedIntervals) {
        return Passing::default();
    }
    let position_error = span.position_error.as_ref().map_or(0.0, |column| column.at(row));
    let target_error = path.error_rad() + arc.pole_error + position_error;
    let body_error = BODY_ARC_ERROR_RAD + arc.pole_error;
    let by_rate = |error: f64, rate: f64, bend: f64| {
        let (error_s, may_not_happen) = passing(error, rate, bend);
        Passing {
            computed_error_s: error_s + arc.ut1_error_s + ROUNDING_S,
            horizon_scatter_s: 0.0,
            may_not_happen,
        }
    };
    let separation = |keepout: &Option<super::limits::Keepout>| {
        let rate = keepout.as_ref().map_or(0.0, |keepout| keepout.rate(arc, path, at).0);
        by_rate(target_error + BODY_ARC_ERROR_RAD, rate, SEPARATION_BEND)
    };
    match cause {
        Cause::SunAltitudeMax | Cause::MoonAltitudeMax | Cause::MoonIlluminationMax => {
            let Some(limit) = day.sky.iter().find(|limit| limit.cause == cause) else {
                return Passing::default();
            };
            let (value, rate) = limit.quantity.value_and_rate(at);
            if cause == Cause::MoonIlluminationMax {
                // Half the sine of an angle of 12° a day.
                return by_rate(0.5 * BODY_ARC_ERROR_RAD, rate, 0.05);
            }
            let cosine = (1.0 - value * value).max(0.0).sqrt();
            by_rate(body_error * cosine, rate, arc.latitude.cos.abs() * TURN_PER_DAY * TURN_PER_DAY)
        }
        Cause::AltitudeMin | Cause::AirmassMax | Cause::AltitudeMax | Cause::Skyline => {
            let (local, mut rate) = path.local_and_rate(arc, at);
            let observed = arc.observer.refraction.observed_altitude(altitude(local));
            if let (Cause::Skyline, Some(lines)) = (cause, &span.lines) {
                // Relative to the line: cos h (dh/dt − slope dA/dt). At a step it is the azimuth that passes.
                let across = local[0].hypot(local[1]).max(1e-9);
                let azimuth_rate = (local[0] * rate[1] - local[1] * rate[0]) / (across * across);
                let over = observed - line_altitude(span, azimuth(local));
                if over.abs() > 1e-6 {
                    return by_rate(target_error, azimuth_rate * across, 0.0);
                }
                rate[2] -= across * lines.slope(azimuth(local)) * azimuth_rate;
            }
            altitude_passing(arc, local, rate, observed, target_error)
        }
        Cause::SunSeparationMin => separation(&day.sun),
        Cause::MoonSeparationMin | Cause::MoonAvoidance => {
            // Where the Moon's rise or set decides, its altitude does; the slower of the two covers both.
            separation(&day.moon)
        }
        Cause::HourAngle | Cause::AzimuthSectors | Cause::CableRange => {
            let (local, rate) = path.local_and_rate(arc, at);
            let across = if cause == Cause::HourAngle {
                let sin_declination = crate::horizon::sin_declination(local, arc.latitude);
                TURN_PER_DAY * (1.0 - sin_declination * sin_declination).max(0.0).sqrt()
            } else {
                (local[0] * rate[1] - local[1] * rate[0]) / local[0].hypot(local[1]).max(1e-9)
            };
            by_rate(
                target_error,
                across,
                if cause == Cause::HourAngle { 0.0 } else { TURN_PER_DAY * TURN_PER_DAY },
            )
        }
        Cause::AzimuthRate => {
            let (_, rate) = path.local_and_rate(arc, at);
            by_rate(target_error, rate[2], TURN_PER_DAY * TURN_PER_DAY)
        }
        Cause::Declination => {
            let (_, rate) = path.local_and_rate(arc, at);
            by_rate(target_error, rate[2] * arc.latitude.sin + rate[0] * arc.latitude.cos, 0.0)
        }
        Cause::SkyBrightness => {
            let rate = day
                .moon_light
                .as_ref()
                .map_or(0.0, |light| light.rate(arc, path, &span.limits.sky_model, at));
            // A magnitude changes by some tens a radian of direction.
            by_rate(BRIGHTNESS_ERROR + 10.0 * target_error, rate, 0.0)
        }
        Cause::Phase => {
            // Error of the direction times the light time of one astronomical unit.
            let light_s = target_error * 500.0;
            Passing { computed_error_s: PHASE_ERROR_S + light_s, ..Passing::default() }
        }
        Cause::None | Cause::Span | Cause::AllowedIntervals | Cause::WindowMin | Cause::BadRow => {
            Passing::default()
        }
    }
}

fn line_altitude(span: &LimitedSpan<'_>, azimuth: f64) -> f64 {
    let skyline = span.days.observer().site.skyline();
    skyline.map_or(-90.0 * RADIANS_PER_DEGREE, |skyline| skyline.altitude(azimuth))
}
