//! Altitude and airmass: circles about the zenith.

use super::super::intervals::{Interval, IntervalSet};
use crate::events::{Arc, Crossing, DayPath};

/// Makes `set` where the target stands at or above (`upper` false) or below (`upper` true) a topocentric
/// altitude, given by its sine.
pub fn fill_altitude<P: DayPath>(
    arc: &Arc<'_>,
    path: &P,
    sin_threshold: f64,
    upper: bool,
    (range, within): (Interval, (f64, f64)),
    reason: u8,
    crossings: &mut Vec<Crossing>,
    set: &mut IntervalSet,
) {
    crossings.clear();
    let above = path.plane_crossings(arc, arc.zenith(), sin_threshold, within, crossings);
    let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising != upper));
    set.fill_from_changes(range, above != upper, changes, reason);
}
