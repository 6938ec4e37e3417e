//! One star on one night, window by window, from the same circle as the loop's.

use super::columns::{NightSummary, Wanted};
use super::kernel::{ALL_ROUND, Block, Meridian};
use super::night::{Night, nearest_turn};
use crate::astrometry::Observer;
use crate::constants::TURN;
use crate::horizon::altitude;
use crate::math::vector::{Vector, add, add_scaled, rotate, unit};
use crate::refraction::AirmassModel;
use crate::windows::intervals::{Interval, IntervalSet};

/// The circle that a star describes on a night.
#[derive(Debug, Clone, Copy)]
pub(super) struct Circle {
    /// Direction with the Earth's aberration, GCRS axes, a unit vector.
    pub direction: Vector,
    /// Hour angle at the night's middle.
    pub hour_angle: f64,
    /// sin φ sin δ and cos φ cos δ.
    offset: f64,
    radius: f64,
    rate: f64,
}

impl Circle {
    /// Star `i` of a block when `share` of the weeks has passed.
    pub fn new(block: &Block, i: usize, share: f64, night: &Night) -> Self {
        let at = |axis: usize| block.direction[axis][i] + share * block.drift[axis][i];
        let direction = unit(add([at(0), at(1), at(2)], night.velocity));
        let Meridian { matrix, sin_latitude, cos_latitude, rate, .. } = &night.meridian;
        let [p, q, r] = rotate(matrix, direction);
        Circle {
            direction,
            hour_angle: q.atan2(p),
            offset: sin_latitude * r,
            radius: cos_latitude * p.hypot(q),
            rate: *rate,
        }
    }

    /// Sine of the altitude at seconds from the night's middle.
    pub fn sin_altitude(&self, seconds: f64) -> f64 {
        self.offset + self.radius * (self.hour_angle + self.rate * seconds).cos()
    }

    /// Seconds from the night's middle to the upper culmination nearest to it.
    pub fn transit(&self) -> f64 {
        -self.hour_angle / self.rate
    }

    /// Makes `set` where the star stands above a threshold, within a day and a half of the night's middle.
    pub fn above(&self, sin_threshold: f64, set: &mut IntervalSet) {
        let cos_half_arc = (sin_threshold - self.offset) / self.radius;
        let half_arc = if cos_half_arc <= -1.0 { ALL_ROUND } else { cos_half_arc.min(1.0).acos() };
        set.clear();
        if cos_half_arc >= 1.0 || cos_half_arc.is_nan() {
            return;
        }
        if half_arc >= ALL_ROUND {
            set.fill(-1.5 * TURN / self.rate, 1.5 * TURN / self.rate, 0);
            return;
        }
        for turn in [-TURN, 0.0, TURN] {
            let at = |side: f64| (turn + side * half_arc - self.hour_angle) / self.rate;
            set.push(Interval { start: at(-1.0), stop: at(1.0), start_reason: 0, stop_reason: 0 });
        }
    }

    /// The greatest sine of the altitude within an interval.
    fn highest(&self, interval: &Interval) -> f64 {
        let day = TURN / self.rate;
        let middle = 0.5 * (interval.start + interval.stop);
        let transit = self.transit() + nearest_turn((middle - self.transit()) / day * TURN) / TURN * day;
        if interval.start <= transit && transit < interval.stop {
            return self.offset + self.radius;
        }
        self.sin_altitude(interval.start).max(self.sin_altitude(interval.stop))
    }
}

/// What limits a star on a night, as the loop takes it.
#[derive(Debug, Clone, Copy)]
pub(super) struct StarLimits {
    /// Sines of the lowest and the highest topocentric altitude.
    pub sin_lowest: f64,
    pub sin_highest: f64,
    /// Cosines of the least distances from the Moon and from the Sun.
    pub cos_keep: [f64; 2],
    pub shortest_s: f64,
}

/// Space to work in.
#[derive(Debug, Default)]
pub(super) struct Sets {
    pub left: IntervalSet,
    other: IntervalSet,
    scratch: IntervalSet,
}

/// Leaves in `sets.left` the windows of a star on a night, seconds from its middle.
pub(super) fn windows(circle: &Circle, night: &Night, limits: &StarLimits, sets: &mut Sets) {
    let Sets { left, other, scratch } = sets;
    circle.above(limits.sin_lowest, left);
    other.clear();
    for &(start, stop) in &night.dark {
        other.push(Interval { start, stop, start_reason: 0, stop_reason: 0 });
    }
    left.intersect(other, scratch);
    if limits.sin_highest < 1.0 && !left.is_empty() {
        circle.above(limits.sin_highest, other);
        let all = Interval { start: f64::NEG_INFINITY, stop: f64::INFINITY, start_reason: 0, stop_reason: 0 };
        let below = other.complement(all);
        left.intersect(&below, scratch);
    }
    for (body, cos_keep) in night.bodies.iter().zip(limits.cos_keep) {
        let (Some(body), false) = (body, left.is_empty()) else { continue };
        let clearance = body.clearance(circle.direction, cos_keep);
        let (start, stop) = clearance.interval();
        let crossings = clearance.crossings();
        let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising));
        let range = Interval { start, stop, start_reason: 0, stop_reason: 0 };
        other.fill_from_changes(range, clearance.value(start) >= 0.0, changes, 0);
        left.intersect(other, scratch);
    }
    left.retain(|window| window.stop - window.start >= limits.shortest_s);
}

/// What is wanted of a star's windows on a night.
pub(super) fn summary(
    circle: &Circle,
    night: &Night,
    windows: &IntervalSet,
    observer: &Observer<'_>,
    model: AirmassModel,
    wanted: &Wanted,
) -> NightSummary {
    let mut summary = NightSummary::of_windows(windows, |seconds| night.mjd(observer, seconds));
    if wanted.transit {
        summary.transit = night.mjd(observer, circle.transit());
    }
    if wanted.best_airmass && !windows.is_empty() {
        let highest = windows.iter().map(|window| circle.highest(window)).fold(-1.0, f64::max);
        summary.best_airmass = airmass(observer, model, highest);
    }
    if let (true, Some(moon)) = (wanted.moon_separation_min, &night.bodies[0]) {
        // The clearance from distance 90° is least where the Moon is nearest.
        let clearance = moon.clearance(circle.direction, 0.0);
        let turning = clearance.derivative().crossings();
        for window in windows.iter() {
            let inside = turning.iter().map(|crossing| crossing.at);
            let inside = inside.filter(|at| (window.start..window.stop).contains(at));
            for at in [window.start, window.stop].into_iter().chain(inside) {
                let [.., vx, vy, vz, _] = moon.series.value(at);
                let star = add_scaled(circle.direction, 1.0, [vx, vy, vz]);
                summary.moon_separation_min = summary.moon_separation_min.min(moon.separation(star, at));
            }
        }
    }
    summary
}

fn airmass(observer: &Observer<'_>, model: AirmassModel, sin_altitude: f64) -> f64 {
    let sin_altitude = sin_altitude.min(1.0);
    let topocentric = altitude([(1.0 - sin_altitude * sin_altitude).sqrt(), 0.0, sin_altitude]);
    model.airmass(observer.refraction.observed_altitude(topocentric), topocentric)
}
