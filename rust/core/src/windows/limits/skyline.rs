//! The skyline of the site: observed altitude at or above a broken line over azimuth.
//!
//! Above its highest point the line cannot matter, below its lowest nothing is seen: two circles about
//! the zenith leave the stretches in which it decides. In each the azimuth moves one way, so the vertical
//! circles through the points of the line are passed one after the other, and between two of them there
//! is one straight line. Bounds on the sine of the altitude decide most of them; where they do not,
//! the zeros of the altitude's distance from the line are those of a Chebyshev series, cut until what it
//! leaves out is below 1e-10 rad. Steps, however near each other, are ends of such parts and cannot be missed.

use super::super::intervals::{Interval, IntervalSet};
use super::azimuth::{AzimuthWalk, Turning};
use super::brightness::changes_of;
use crate::constants::{EARTH_ROTATION_RAD_PER_S, SECONDS_PER_DAY, TURN};
use crate::events::{Arc, Crossing};
use crate::horizon::{altitude, azimuth};
use crate::refraction::Refraction;
use crate::site::Skyline;

/// A skyline as lines: each from its azimuth to that of the next.
#[derive(Debug, Clone)]
pub struct Lines {
    lines: Vec<Line>,
    sin_lowest: f64,
    sin_highest: f64,
}

#[derive(Debug, Clone, Copy)]
struct Line {
    azimuth: f64,
    width: f64,
    altitude: f64,
    slope: f64,
    /// Sines of the topocentric altitudes of its lower and its higher end.
    sin_low: f64,
    sin_high: f64,
}

impl Line {
    fn altitude(&self, azimuth: f64) -> f64 {
        let beyond = (azimuth - self.azimuth).rem_euclid(TURN);
        // Rounding at the line's beginning.
        let beyond = if beyond > 0.5 * (self.width + TURN) { beyond - TURN } else { beyond };
        self.altitude + self.slope * beyond
    }
}

impl Lines {
    pub fn new(skyline: &Skyline, refraction: &Refraction) -> Self {
        let starts = skyline.breakpoints();
        let sin = |observed: f64| refraction.topocentric_altitude(observed).sin();
        let lines: Vec<Line> = starts
            .iter()
            .enumerate()
            .map(|(i, &start)| {
                let next = starts[(i + 1) % starts.len()];
                let width = if next > start { next - start } else { next - start + TURN };
                let (altitude, slope) = (skyline.altitude(start), skyline.slope(start));
                let end = altitude + slope * width;
                Line {
                    azimuth: start,
                    width,
                    altitude,
                    slope,
                    sin_low: sin(altitude.min(end)),
                    sin_high: sin(altitude.max(end)),
                }
            })
            .collect();
        let ends = lines.iter().flat_map(|line| [line.altitude, line.altitude + line.slope * line.width]);
        let (lowest, highest) =
            ends.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), end| (low.min(end), high.max(end)));
        Lines { lines, sin_lowest: sin(lowest - 1e-9), sin_highest: sin(highest + 1e-9) }
    }

    /// The index of the line at an azimuth in [0, 2π).
    fn index(&self, azimuth: f64) -> usize {
        let after = self.lines.partition_point(|line| line.azimuth <= azimuth);
        if after == 0 { self.lines.len() - 1 } else { after - 1 }
    }

    /// The lowest sine of a topocentric altitude from which on the skyline decides nothing.
    pub fn sin_highest(&self) -> f64 {
        self.sin_highest
    }

    /// Slope of the skyline at an azimuth.
    pub fn slope(&self, azimuth: f64) -> f64 {
        self.lines[self.index(azimuth)].slope
    }
}

/// Makes `set` where the target stands at or above the skyline, within `within`.
pub fn fill_skyline<P: Turning>(
    arc: &Arc<'_>,
    path: &P,
    lines: &Lines,
    (range, within): (Interval, (f64, f64)),
    reason: u8,
    walk: &mut AzimuthWalk,
    crossings: &mut Vec<Crossing>,
    set: &mut IntervalSet,
) {
    set.clear();
    crossings.clear();
    path.plane_crossings(arc, arc.zenith(), lines.sin_highest, within, crossings);
    path.plane_crossings(arc, arc.zenith(), lines.sin_lowest, within, crossings);
    crossings.retain(|crossing| crossing.at > within.0 && crossing.at < within.1);
    crossings.sort_by(|a, b| a.at.total_cmp(&b.at));
    let mut from = within.0;
    let mut open: Option<f64> = None;
    let mut state = |at: f64, above: bool, set: &mut IntervalSet| match (open, above) {
        (None, true) => open = Some(at),
        (Some(start), false) => {
            open = None;
            let start_reason = if start <= range.start { range.start_reason } else { reason };
            let stop_reason = if at >= range.stop { range.stop_reason } else { reason };
            set.push(Interval { start, stop: at, start_reason, stop_reason });
        }
        _ => {}
    };
    let ends = crossings.iter().map(|crossing| crossing.at).chain([within.1]);
    for to in ends {
        if to <= from {
            continue;
        }
        let sin_middle = path.local(arc, 0.5 * (from + to))[2];
        if sin_middle >= lines.sin_highest {
            state(from, true, set);
        } else if sin_middle < lines.sin_lowest {
            state(from, false, set);
        } else {
            walk.walk(arc, path, from, to);
            along(arc, path, lines, walk, |at, above| state(at, above, set));
        }
        from = to;
    }
    state(within.1, false, set);
}

/// Follows the skyline along a walk, and reports from when on the target stands above or below it.
fn along<P: Turning>(
    arc: &Arc<'_>,
    path: &P,
    lines: &Lines,
    walk: &AzimuthWalk,
    mut state: impl FnMut(f64, bool),
) {
    let count = lines.lines.len();
    for piece in &walk.pieces {
        let start_azimuth = piece.azimuth.rem_euclid(TURN);
        let start_azimuth = if start_azimuth >= TURN { 0.0 } else { start_azimuth };
        let mut index = lines.index(start_azimuth);
        // Going west from a point of the line, the line is that to the west of it.
        if piece.way < 0.0 && (start_azimuth - lines.lines[index].azimuth).rem_euclid(TURN) < 1e-12 {
            index = (index + count - 1) % count;
        }
        let mut at = piece.from;
        let mut swing = 0.0;
        loop {
            let line = &lines.lines[index];
            // Where this line ends, as a swing from the piece's beginning.
            let bound = if piece.way > 0.0 { line.azimuth + line.width } else { line.azimuth };
            let mut end = (piece.way * (bound - start_azimuth)).rem_euclid(TURN);
            if end <= swing {
                end += TURN;
            }
            let last = end >= piece.swing;
            let to = if last { piece.to } else { piece.at_swing(arc, path, end, at) };
            if to > at {
                on_line(arc, path, line, at, to, &mut state);
            }
            if last {
                break;
            }
            (at, swing) = (to, end);
            index = if piece.way > 0.0 { (index + 1) % count } else { (index + count - 1) % count };
        }
    }
}

fn on_line<P: Turning>(
    arc: &Arc<'_>,
    path: &P,
    line: &Line,
    from: f64,
    to: f64,
    state: &mut impl FnMut(f64, bool),
) {
    // The sine of the altitude bends by at most ω² cos φ: between two instants it strays from the straight line
    // by an eighth of that times the square of the time (Moon and planets: a tenth more).
    const BEND: f64 =
        0.14 * (EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY) * (EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY);
    let (first, last) = (path.local(arc, from), path.local(arc, to));
    let stray = BEND * arc.latitude.cos.abs() * (to - from) * (to - from) + 1e-9;
    if first[2].min(last[2]) - stray > line.sin_high {
        state(from, true);
        return;
    }
    if first[2].max(last[2]) + stray < line.sin_low {
        state(from, false);
        return;
    }
    let refraction = arc.observer.refraction;
    let over_line =
        |local: [f64; 3]| refraction.observed_altitude(altitude(local)) - line.altitude(azimuth(local));
    let over = |fraction: f64| over_line(path.local(arc, fraction));
    let (first, last) = (over_line(first) >= 0.0, over_line(last) >= 0.0);
    state(from, first);
    changes_of(&over, from, to, first, last, 1e-10, 0, &mut |at, rising| state(at, rising));
}
