//! Hour angle, declination and sectors of azimuth: hour circles, parallels, vertical circles.
//!
//! An angle about an axis passes a bound where the direction crosses the half plane of that bound; the
//! plane's other half, half a turn away, is told apart by the side on which the direction stands.

use super::super::intervals::{Interval, IntervalSet};
use crate::constants::TURN;
use crate::events::{Arc, Crossing, DayPath};
use crate::horizon::{azimuth, hour_angle};
use crate::math::vector::{Vector, dot};

/// Where an angle passes a bound: the instant and whether the angle grows.
type Passages = Vec<(f64, bool)>;

/// Appends the passages of a half plane, given by the normal on the side of greater angles and a vector
/// within it.
fn half_plane<P: DayPath>(
    arc: &Arc<'_>,
    path: &P,
    normal: Vector,
    ahead: Vector,
    within: (f64, f64),
    crossings: &mut Vec<Crossing>,
    mut push: impl FnMut(f64, bool),
) {
    crossings.clear();
    path.plane_crossings(arc, &arc.plane(normal), 0.0, within, crossings);
    for crossing in crossings.iter() {
        if dot(ahead, path.local(arc, crossing.at)) > 0.0 {
            push(crossing.at, crossing.rising);
        }
    }
}

/// Makes `set` where the hour angle is in [least, most), −π to π.
pub fn fill_hour_angle<P: DayPath>(
    arc: &Arc<'_>,
    path: &P,
    (least, most): (f64, f64),
    (range, within): (Interval, (f64, f64)),
    reason: u8,
    (crossings, changes): (&mut Vec<Crossing>, &mut Passages),
    set: &mut IntervalSet,
) {
    let pi = std::f64::consts::PI;
    changes.clear();
    if least <= -pi && most >= pi {
        set.clear();
        set.push(range);
        return;
    }
    let (sin_latitude, cos_latitude) = (arc.latitude.sin, arc.latitude.cos);
    for (bound, opens) in [(least, true), (most, false)] {
        let (sin, cos) = bound.sin_cos();
        let normal = [sin_latitude * sin, -cos, -cos_latitude * sin];
        let ahead = [-sin_latitude * cos, -sin, cos_latitude * cos];
        half_plane(arc, path, normal, ahead, within, crossings, |at, rising| {
            changes.push((at, rising == opens));
        });
    }
    // Where the range ends at the lower culmination as another begins, it closes before it opens.
    changes.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let inside = (least..most).contains(&hour_angle(path.local_at_end(arc, false), arc.latitude));
    set.fill_from_changes(range, inside, changes.iter().copied(), reason);
}

/// Makes `set` where the declination, topocentric and on the terrestrial pole, is within two bounds.
pub fn fill_declination<P: DayPath>(
    arc: &Arc<'_>,
    path: &P,
    (least, most): (f64, f64),
    (range, within): (Interval, (f64, f64)),
    reason: u8,
    (crossings, set, scratch): (&mut Vec<Crossing>, &mut IntervalSet, &mut IntervalSet),
) {
    set.clear();
    set.push(range);
    let plane = arc.plane([arc.latitude.cos, 0.0, arc.latitude.sin]);
    let mut part = IntervalSet::new();
    for (bound, upper) in [(least, false), (most, true)] {
        let half_turn = std::f64::consts::FRAC_PI_2;
        if (upper && bound >= half_turn) || (!upper && bound <= -half_turn) {
            continue;
        }
        crossings.clear();
        let above = path.plane_crossings(arc, &plane, bound.sin(), within, crossings);
        let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising != upper));
        part.fill_from_changes(range, above != upper, changes, reason);
        set.intersect(&part, scratch);
    }
}

/// Makes `set` where the azimuth is in one of the sectors, each [from, to) through east.
pub fn fill_sectors<P: DayPath>(
    arc: &Arc<'_>,
    path: &P,
    sectors: &[(f64, f64)],
    (range, within): (Interval, (f64, f64)),
    reason: u8,
    (crossings, changes): (&mut Vec<Crossing>, &mut Passages),
    set: &mut IntervalSet,
) {
    set.clear();
    let at_start = azimuth(path.local_at_end(arc, false));
    let mut sector_set = IntervalSet::new();
    for &(from, to) in sectors {
        // The whole circle, or the rounding of it.
        let width = if to > from { to - from } else { to - from + TURN };
        if width >= TURN {
            set.clear();
            set.push(range);
            return;
        }
        changes.clear();
        for (bound, opens) in [(from, true), (to, false)] {
            let (sin, cos) = bound.sin_cos();
            half_plane(arc, path, [-sin, cos, 0.0], [cos, sin, 0.0], within, crossings, |at, rising| {
                changes.push((at, rising == opens));
            });
        }
        changes.sort_by(|a, b| a.0.total_cmp(&b.0));
        let inside = (at_start - from).rem_euclid(TURN) < width;
        sector_set.fill_from_changes(range, inside, changes.iter().copied(), reason);
        *set = set.union(&sector_set);
    }
}
