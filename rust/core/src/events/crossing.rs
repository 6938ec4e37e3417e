//! When a target passes an altitude, and when it stands highest.
//!
//! The culminations of a day divide it into pieces in which the altitude rises or falls throughout, so
//! a change of sign between the ends of a piece is one crossing and none hides between. A star's
//! culminations follow from its hour angle, its crossings in closed form from the circle it
//! describes, and Newton's method ends on the arc itself. Where a star grazes, or hardly moves because
//! it or the site stands at a pole, and for bodies, which move as they please, the crossings are
//! those of a Chebyshev series over the day, isolated in the Bernstein basis: none can be missed.

use super::arc::{Arc, Motion, Plane, StarArc};
use super::moving::BodyArc;
pub use crate::math::bernstein::Crossing;
use crate::math::chebyshev::Chebyshev;
use crate::math::roots::newton_between;
use crate::math::vector::{Matrix, Vector, dot, rotate};
use std::f64::consts::PI;

/// A Newton step below this, in days, is the last: 8.6 µs, and the step after it would be its square.
const LAST_STEP_D: f64 = 1e-10;
/// A culmination within this of the threshold, in the sine of the altitude, is a grazing: 2 mas.
const GRAZING: f64 = 1e-8;
/// Farther from the threshold than this, the star's circle tells the sign of a culmination.
const CLEAR: f64 = 1e-4;
/// Below this diurnal range of the sine of the altitude (20″) a day has no shape of its own.
const FLAT: f64 = 1e-4;
/// Coefficients of a star's altitude over a day: J_k(π) is below 1e-16 from the 22nd.
const NODES: usize = 25;

/// How far a star may move in half a day: see [`DayPath::reach`].
pub(crate) const STAR_REACH_RAD: f64 = 1e-4;

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
    /// Direction on the horizon at the beginning (`end` false) or the end of the day: the end of one day
    /// and the beginning of the next are the same bits.
    fn local_at_end(&self, arc: &Arc<'_>, end: bool) -> [f64; 3];
    /// Appends the instants in [0, 1), ascending, at which the target passes a circle: where the sine of
    /// its distance from `plane` changes from below `sin_threshold` to at or above it, or back. Returns
    /// whether it is at or above it at the beginning of the day. Crossings before or after `within` may
    /// be off by minutes, but stay outside it.
    fn plane_crossings(
        &self,
        arc: &Arc<'_>,
        plane: &Plane,
        sin_threshold: f64,
        within: (f64, f64),
        crossings: &mut Vec<Crossing>,
    ) -> bool;
    /// The same for an altitude, given by its sine, over the whole day.
    fn altitude_crossings(&self, arc: &Arc<'_>, sin_threshold: f64, crossings: &mut Vec<Crossing>) -> bool {
        self.plane_crossings(arc, arc.zenith(), sin_threshold, (0.0, 1.0), crossings)
    }
    /// Appends the passages of the meridian in [0, 1), ascending.
    fn culminations(&self, arc: &Arc<'_>, culminations: &mut Vec<Culmination>);
    /// The same as [`DayPath::local`] for a caller who holds the rotation from the CIRS to the horizon.
    fn local_by(&self, arc: &Arc<'_>, fraction: f64, cirs_to_horizon: &Matrix) -> [f64; 3];
    /// Appends the instants in (from, to) at which the altitude is greatest, ascending.
    fn highest(&self, arc: &Arc<'_>, from: f64, to: f64, at: &mut Vec<f64>);
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

    #[inline]
    fn local_at_end(&self, arc: &Arc<'_>, end: bool) -> [f64; 3] {
        StarArc::local_at_end(self, arc, end)
    }

    fn plane_crossings(
        &self,
        arc: &Arc<'_>,
        plane: &Plane,
        sin_threshold: f64,
        within: (f64, f64),
        crossings: &mut Vec<Crossing>,
    ) -> bool {
        let above = |local: Vector| dot(plane.normal, local) >= sin_threshold;
        let above_at_start = above(StarArc::local_at_end(self, arc, false));
        let above_at_stop = above(StarArc::local_at_end(self, arc, true));
        let motion = self.motion(arc, plane);
        // Never or always above: nothing to solve, unless an end says otherwise, which it cannot.
        if motion.is_some_and(|motion| motion.stays_off(sin_threshold)) && above_at_start == above_at_stop {
            return above_at_start;
        }
        let grazed = match motion.filter(|motion| motion.swing > FLAT) {
            Some(motion) => {
                let pieces = Pieces { path: self, arc, plane, motion, sin_threshold, within };
                pieces.crossings(above_at_start, above_at_stop, crossings)
            }
            None => true,
        };
        if grazed {
            let series = Chebyshev::<NODES>::fit(0.0, 1.0, |fraction| {
                dot(plane.normal, self.local(arc, fraction)) - sin_threshold
            });
            crossings.extend_from_slice(&series.crossings_between(above_at_start, above_at_stop));
        }
        above_at_start
    }

    fn culminations(&self, arc: &Arc<'_>, culminations: &mut Vec<Culmination>) {
        let Some(Motion { half_turn, highest: upper, .. }) = self.motion(arc, arc.zenith()) else {
            return;
        };
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
    fn highest(&self, arc: &Arc<'_>, from: f64, to: f64, at: &mut Vec<f64>) {
        let Some(motion) = self.motion(arc, arc.zenith()) else {
            return;
        };
        let turn = 2.0 * motion.half_turn;
        // The rate of a star near the pole changes during the day: leave room for Newton to move.
        let room = if motion.swing > FLAT { 1e-2 } else { 0.1 };
        for k in -1..=1 {
            let guess = motion.highest + f64::from(k) * turn;
            if guess > from - room && guess < to + room {
                let found = self.meridian(arc, guess);
                if found > from && found < to {
                    at.push(found);
                }
            }
        }
    }

    /// Aberration, precession and deflection move no star by as much as this.
    fn reach(&self) -> f64 {
        STAR_REACH_RAD
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

impl Motion {
    /// Whether the star never passes a threshold, by a margin that covers what its circle leaves out.
    fn stays_off(&self, sin_threshold: f64) -> bool {
        (self.middle - sin_threshold).abs() > self.swing + CLEAR
    }
}

/// A day divided by the culminations of a star above and below a plane.
struct Pieces<'a> {
    path: &'a StarArc,
    arc: &'a Arc<'a>,
    plane: &'a Plane,
    motion: Motion,
    sin_threshold: f64,
    within: (f64, f64),
}

impl Pieces<'_> {
    /// Appends the crossings; `true`, and nothing appended, when the star grazes the threshold.
    fn crossings(&self, above_at_start: bool, above_at_stop: bool, crossings: &mut Vec<Crossing>) -> bool {
        let before = crossings.len();
        let Motion { highest, half_turn, rate, middle, swing } = self.motion;
        let over = [middle + swing - self.sin_threshold, middle - swing - self.sin_threshold];
        let cos_hour_angle = ((self.sin_threshold - middle) / swing).clamp(-1.0, 1.0);
        let to_crossing = cos_hour_angle.acos() / rate;
        // Where the circle is crossed steeply the guess is good to minutes.
        let steep = swing * swing * (1.0 - cos_hour_angle * cos_hour_angle) > 1e-3;
        // The last culmination at or before the beginning of the day.
        let (mut left, mut left_is_upper) = (highest, true);
        while left > 0.0 {
            (left, left_is_upper) = (left - half_turn, !left_is_upper);
        }
        while left + half_turn <= 0.0 {
            (left, left_is_upper) = (left + half_turn, !left_is_upper);
        }
        let (mut from, mut above_from) = (0.0, above_at_start);
        loop {
            let right = left + half_turn;
            let to = right.min(1.0);
            let above_to = if right < 1.0 {
                let expected = over[usize::from(left_is_upper)];
                let found = if expected.abs() > CLEAR { expected } else { self.value(right) };
                if found.abs() < GRAZING {
                    crossings.truncate(before);
                    return true;
                }
                found >= 0.0
            } else {
                above_at_stop
            };
            if above_from != above_to {
                let guess = if left_is_upper { left + to_crossing } else { right - to_crossing };
                let at = self.crossing(guess.clamp(from, to), steep, from, to, above_to);
                crossings.push(Crossing { at: at.min(1.0 - f64::EPSILON), rising: above_to });
            }
            if right >= 1.0 {
                return false;
            }
            (left, left_is_upper, from, above_from) = (right, !left_is_upper, to, above_to);
        }
    }

    fn crossing(&self, guess: f64, steep: bool, from: f64, to: f64, rising: bool) -> f64 {
        const FAR: f64 = 0.01;
        if steep && (guess < self.within.0 - FAR || guess > self.within.1 + FAR) {
            return guess;
        }
        newton_between(
            |fraction| {
                let (local, rate) = self.path.local_and_rate(self.arc, fraction);
                (dot(self.plane.normal, local) - self.sin_threshold, dot(self.plane.normal, rate))
            },
            from,
            to,
            rising,
            guess,
            LAST_STEP_D,
        )
    }

    fn value(&self, fraction: f64) -> f64 {
        dot(self.plane.normal, self.path.local(self.arc, fraction)) - self.sin_threshold
    }
}

impl DayPath for BodyArc {
    fn local(&self, _: &Arc<'_>, fraction: f64) -> [f64; 3] {
        self.local.value(fraction)
    }

    fn local_and_rate(&self, _: &Arc<'_>, fraction: f64) -> ([f64; 3], [f64; 3]) {
        self.local.value_and_rate(fraction)
    }

    fn local_at_end(&self, _: &Arc<'_>, end: bool) -> [f64; 3] {
        self.ends[usize::from(end)]
    }

    fn plane_crossings(
        &self,
        _: &Arc<'_>,
        plane: &Plane,
        sin_threshold: f64,
        _: (f64, f64),
        crossings: &mut Vec<Crossing>,
    ) -> bool {
        let series = self.local.dot(plane.normal).plus(-sin_threshold);
        let above = |local: Vector| dot(plane.normal, local) >= sin_threshold;
        let above_at_start = above(self.ends[0]);
        crossings.extend_from_slice(&series.crossings_between(above_at_start, above(self.ends[1])));
        above_at_start
    }

    fn culminations(&self, arc: &Arc<'_>, culminations: &mut Vec<Culmination>) {
        let [start, stop] = self.ends.map(|local| local[1] >= 0.0);
        for crossing in self.component(1).crossings_between(start, stop).iter() {
            let local = self.local.value(crossing.at);
            let towards_equator = local[2] * arc.latitude.cos - local[0] * arc.latitude.sin;
            culminations.push(Culmination { at: crossing.at, upper: towards_equator > 0.0 });
        }
    }

    fn local_by(&self, _: &Arc<'_>, fraction: f64, _: &Matrix) -> [f64; 3] {
        self.local.value(fraction)
    }

    fn highest(&self, _: &Arc<'_>, from: f64, to: f64, at: &mut Vec<f64>) {
        let rate = self.component(2).derivative();
        let inside = |crossing: &&Crossing| !crossing.rising && crossing.at > from && crossing.at < to;
        at.extend(rate.crossings().iter().filter(inside).map(|crossing| crossing.at));
    }

    /// No bound is known for a body, so none is used.
    fn reach(&self) -> f64 {
        PI
    }

    fn error_rad(&self) -> f64 {
        self.error_rad
    }
}
