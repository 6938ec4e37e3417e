//! When a target passes an altitude, and when it stands highest.
//!
//! The culminations of a day divide it into pieces in which the altitude rises or falls throughout, so
//! a change of sign between the ends of a piece is one crossing and none hides between. A star's
//! culminations follow from its hour angle, its crossings in closed form from the circle it
//! describes, and Newton's method ends on the arc itself. Where a star grazes, or hardly moves because
//! it or the site stands at a pole, and for bodies, which move as they please, the crossings are
//! those of a Chebyshev series over the day, isolated in the Bernstein basis: none can be missed.

use super::arc::{Arc, BodyArc, MiddleOfDay, StarArc};
pub use crate::math::bernstein::Crossing;
use crate::math::chebyshev::Chebyshev;
use crate::math::roots::newton_between;
use crate::math::vector::{Matrix, rotate};
use std::f64::consts::PI;

/// A Newton step below this, in days, is the last: 8.6 µs, and the step after it would be its square.
const LAST_STEP_D: f64 = 1e-10;
/// A culmination within this of the threshold, in the sine of the altitude, is a grazing: 2 mas.
const GRAZING: f64 = 1e-8;
/// Below this diurnal range of the sine of the altitude (20″) a day has no shape of its own.
const FLAT: f64 = 1e-4;
/// Coefficients of a star's altitude over a day: J_k(π) is below 1e-16 from the 22nd.
const NODES: usize = 25;

/// A passage of the meridian.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Culmination {
    /// Fraction of the day.
    pub at: f64,
    /// Whether it is the upper one, above the pole.
    pub upper: bool,
}

/// A target during one day: what events and windows ask of it.
pub trait DayPath {
    /// Direction on the horizon at a fraction of the day: north, east, zenith.
    fn local(&self, arc: &Arc<'_>, fraction: f64) -> [f64; 3];
    /// The same with its rate per day.
    fn local_and_rate(&self, arc: &Arc<'_>, fraction: f64) -> ([f64; 3], [f64; 3]);
    /// Appends the crossings of an altitude, given by its sine, in [0, 1), ascending. Returns whether
    /// the target is at or above it at the beginning of the day.
    fn altitude_crossings(&self, arc: &Arc<'_>, sin_threshold: f64, crossings: &mut Vec<Crossing>) -> bool;
    /// Appends the passages of the meridian in [0, 1), ascending.
    fn culminations(&self, arc: &Arc<'_>, culminations: &mut Vec<Culmination>);
    /// The same as [`DayPath::local`] for a caller who holds the rotation from the CIRS to the horizon.
    fn local_by(&self, arc: &Arc<'_>, fraction: f64, cirs_to_horizon: &Matrix) -> [f64; 3];
    /// Appends the instants in [0, 1) at which the altitude is greatest, ascending.
    fn highest(&self, arc: &Arc<'_>, at: &mut Vec<f64>);
    /// How far the target may move among the stars in half a day, radians.
    fn reach(&self) -> f64;
    /// What the path leaves out of the exact chain, radians.
    fn error_rad(&self) -> f64;
}

impl DayPath for StarArc {
    #[inline]
    fn local(&self, arc: &Arc<'_>, fraction: f64) -> [f64; 3] {
        StarArc::local(self, arc, fraction)
    }

    #[inline]
    fn local_and_rate(&self, arc: &Arc<'_>, fraction: f64) -> ([f64; 3], [f64; 3]) {
        StarArc::local_and_rate(self, arc, fraction)
    }

    fn altitude_crossings(&self, arc: &Arc<'_>, sin_threshold: f64, crossings: &mut Vec<Crossing>) -> bool {
        let at_start = self.local_at_end(arc, false)[2] - sin_threshold;
        let at_stop = self.local_at_end(arc, true)[2] - sin_threshold;
        let middle = self.hour_angle_at_middle(arc);
        let shaped = middle.filter(|m| m.cos_latitude * m.cos_declination > FLAT);
        let grazed = match shaped {
            Some(middle) => {
                let pieces = Pieces { path: self, arc, middle, sin_threshold, at_start, at_stop };
                pieces.crossings(crossings)
            }
            None => true,
        };
        if grazed {
            let series =
                Chebyshev::<NODES>::fit(0.0, 1.0, |fraction| self.local(arc, fraction)[2] - sin_threshold);
            crossings.extend_from_slice(&series.crossings());
        }
        at_start >= 0.0
    }

    fn culminations(&self, arc: &Arc<'_>, culminations: &mut Vec<Culmination>) {
        let Some(middle) = self.hour_angle_at_middle(arc) else {
            return;
        };
        let half_turn = PI / middle.rate;
        let upper = 0.5 - middle.hour_angle / middle.rate;
        let east_at = [self.local_at_end(arc, false)[1], self.local_at_end(arc, true)[1]];
        for k in -2..=2 {
            let is_upper = k % 2 == 0;
            let guess = upper + f64::from(k) * half_turn;
            // The rate of a star near the pole changes during the day: leave room for Newton to move.
            if !(-0.1..1.1).contains(&guess) {
                continue;
            }
            let at = self.meridian(arc, guess);
            if self.belongs(at, is_upper, east_at) {
                culminations.push(Culmination { at: at.clamp(0.0, 1.0 - f64::EPSILON), upper: is_upper });
            }
        }
    }

    #[inline]
    fn local_by(&self, arc: &Arc<'_>, fraction: f64, cirs_to_horizon: &Matrix) -> [f64; 3] {
        arc.with_diurnal_aberration(rotate(cirs_to_horizon, self.cirs(fraction)))
    }

    /// A star is highest on the meridian: its own motion shifts the instant by microseconds.
    fn highest(&self, arc: &Arc<'_>, at: &mut Vec<f64>) {
        let mut culminations = Vec::with_capacity(4);
        DayPath::culminations(self, arc, &mut culminations);
        at.extend(
            culminations.iter().filter(|culmination| culmination.upper).map(|culmination| culmination.at),
        );
    }

    /// Aberration, precession and deflection move no star by as much as this.
    fn reach(&self) -> f64 {
        1e-4
    }

    fn error_rad(&self) -> f64 {
        super::arc::STAR_ARC_ERROR_RAD
    }
}

impl StarArc {
    /// The passage of the meridian near `guess`, where the component towards the east vanishes.
    fn meridian(&self, arc: &Arc<'_>, guess: f64) -> f64 {
        let mut at = guess;
        for _ in 0..4 {
            let (local, rate) = self.local_and_rate(arc, at);
            let step = local[1] / rate[1];
            at -= step.clamp(-0.05, 0.05);
            if step.abs() < LAST_STEP_D {
                break;
            }
        }
        at
    }

    /// Whether a passage found at `at` lies in this day. Within a millisecond of midnight the sign at
    /// the node decides, which both days share.
    fn belongs(&self, at: f64, upper: bool, east_at: [f64; 2]) -> bool {
        const NEAR: f64 = 1e-8;
        // Before an upper passage the star is east of the meridian, before a lower one west.
        let still_before = |east: f64| if upper { east >= 0.0 } else { east <= 0.0 };
        if at.abs() < NEAR {
            still_before(east_at[0])
        } else if (at - 1.0).abs() < NEAR {
            !still_before(east_at[1])
        } else {
            (0.0..1.0).contains(&at)
        }
    }
}

/// A day divided by the culminations of a star.
struct Pieces<'a> {
    path: &'a StarArc,
    arc: &'a Arc<'a>,
    middle: MiddleOfDay,
    sin_threshold: f64,
    at_start: f64,
    at_stop: f64,
}

impl Pieces<'_> {
    /// Appends the crossings; `true`, and nothing appended, when the star grazes the threshold.
    fn crossings(&self, crossings: &mut Vec<Crossing>) -> bool {
        let before = crossings.len();
        let m = &self.middle;
        let half_turn = PI / m.rate;
        let cos_hour_angle =
            (self.sin_threshold - m.sin_latitude * m.sin_declination) / (m.cos_latitude * m.cos_declination);
        let to_crossing = cos_hour_angle.clamp(-1.0, 1.0).acos() / m.rate;
        // The last culmination at or before the beginning of the day.
        let upper = 0.5 - m.hour_angle / m.rate;
        let mut k = -(upper / half_turn).ceil();
        let mut left = upper + k * half_turn;
        let (mut from, mut at_from) = (0.0, self.at_start);
        loop {
            let left_is_upper = k.rem_euclid(2.0) == 0.0;
            let right = left + half_turn;
            let to = right.min(1.0);
            let at_to = if right < 1.0 { self.value(right) } else { self.at_stop };
            if right < 1.0 && at_to.abs() < GRAZING {
                crossings.truncate(before);
                return true;
            }
            if (at_from < 0.0) != (at_to < 0.0) {
                let rising = at_from < 0.0;
                let guess = if left_is_upper { left + to_crossing } else { right - to_crossing };
                let at = newton_between(
                    |fraction| {
                        let (local, rate) = self.path.local_and_rate(self.arc, fraction);
                        (local[2] - self.sin_threshold, rate[2])
                    },
                    from,
                    to,
                    rising,
                    guess.clamp(from, to),
                    LAST_STEP_D,
                );
                crossings.push(Crossing { at: at.min(1.0 - f64::EPSILON), rising });
            }
            if right >= 1.0 {
                return false;
            }
            (left, from, at_from) = (right, to, at_to);
            k += 1.0;
        }
    }

    fn value(&self, fraction: f64) -> f64 {
        self.path.local(self.arc, fraction)[2] - self.sin_threshold
    }
}

impl DayPath for BodyArc {
    fn local(&self, _: &Arc<'_>, fraction: f64) -> [f64; 3] {
        self.local.value(fraction)
    }

    fn local_and_rate(&self, _: &Arc<'_>, fraction: f64) -> ([f64; 3], [f64; 3]) {
        self.local.value_and_rate(fraction)
    }

    fn altitude_crossings(&self, _: &Arc<'_>, sin_threshold: f64, crossings: &mut Vec<Crossing>) -> bool {
        let series = self.component(2).plus(-sin_threshold);
        crossings.extend_from_slice(&series.crossings());
        series.value(0.0) >= 0.0
    }

    fn culminations(&self, arc: &Arc<'_>, culminations: &mut Vec<Culmination>) {
        let east = self.component(1);
        for crossing in east.crossings().iter() {
            let local = self.local.value(crossing.at);
            let towards_equator = local[2] * arc.latitude.cos - local[0] * arc.latitude.sin;
            culminations.push(Culmination { at: crossing.at, upper: towards_equator > 0.0 });
        }
    }

    fn local_by(&self, _: &Arc<'_>, fraction: f64, _: &Matrix) -> [f64; 3] {
        self.local.value(fraction)
    }

    fn highest(&self, _: &Arc<'_>, at: &mut Vec<f64>) {
        let rate = self.component(2).derivative();
        at.extend(rate.crossings().iter().filter(|crossing| !crossing.rising).map(|crossing| crossing.at));
    }

    /// No bound is known for a body, so none is used.
    fn reach(&self) -> f64 {
        PI
    }

    fn error_rad(&self) -> f64 {
        super::arc::BODY_ARC_ERROR_RAD
    }
}
