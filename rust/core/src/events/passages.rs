//! Rise, transit and set of targets over a span.

use super::arc::Arc;
use super::crossing::{Crossing, Culmination, DayPath};
use super::days::Days;
use super::passing::{Passing, ROUNDING_S, altitude_passing, passing};
use crate::astrometry::Targets;
use crate::error::Status;
use crate::horizon::{altitude, azimuth};
use crate::time::Utc;

/// What happens.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[repr(u8)]
pub enum EventKind {
    /// The target passes the threshold upwards.
    Rise = 0,
    /// The target passes the meridian on the side of the equator: upper culmination.
    Transit = 1,
    /// The target passes the threshold downwards.
    Set = 2,
}

/// One event of one target.
#[derive(Debug, Clone, Copy)]
pub struct Event {
    /// What happens.
    pub kind: EventKind,
    /// When, to the nanosecond.
    pub time: Utc,
    /// Azimuth, radians.
    pub azimuth: f64,
    /// Observed altitude, radians.
    pub altitude: f64,
    /// How far the computed instant may be from the true one for the stated atmosphere, seconds.
    pub computed_error_s: f64,
    /// Standard deviation by which refraction strays from the stated atmosphere, seconds.
    pub horizon_scatter_s: f64,
    /// Whether the culmination lies nearer to the threshold than the errors of direction and refraction
    /// (one standard deviation) together: then the target may not pass it at all. Never for a transit.
    pub may_not_happen: bool,
}

/// What a target does over a span.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[repr(u8)]
pub enum Passage {
    /// It rises or sets.
    Crosses = 0,
    /// It stays above the threshold.
    AlwaysAbove = 1,
    /// It stays below the threshold.
    AlwaysBelow = 2,
    /// The row has no direction: its [`Status`] says why.
    BadRow = 3,
}

/// Scratch space of a caller who asks for many targets.
#[derive(Debug, Default)]
struct Scratch {
    crossings: Vec<Crossing>,
    culminations: Vec<Culmination>,
}

/// Appends the events of target `row` in the span, in order of time, and says what the target does.
///
/// * `threshold`: the observed altitude of the centre, radians
///
/// A star's events are good to 1 ms against the exact chain wherever its altitude changes faster than
/// 3″/s, a body's to 20 ms (`tests/test_accuracy_events.py`); `computed_error_s` covers the rest.
pub fn rise_transit_set(
    days: &Days<'_>,
    targets: &Targets<'_>,
    row: usize,
    threshold: f64,
    events: &mut Vec<Event>,
) -> (Passage, Status) {
    rise_transit_set_with(days, targets, row, threshold, 0.0, events)
}

/// The same for a row whose catalogue place may be off by `position_error` radians in direction, which
/// goes into `computed_error_s` and `may_not_happen`.
pub fn rise_transit_set_with(
    days: &Days<'_>,
    targets: &Targets<'_>,
    row: usize,
    threshold: f64,
    position_error: f64,
    events: &mut Vec<Event>,
) -> (Passage, Status) {
    let status = targets.status(row);
    if status.is_bad() {
        return (Passage::BadRow, status);
    }
    let before = events.len();
    let topocentric = days.observer().refraction.topocentric_altitude(threshold);
    let mut scratch = Scratch::default();
    let mut above_at_start = false;
    let mut status = status;
    for (index, arc) in days.arcs.iter().enumerate() {
        let above = match targets {
            Targets::Catalog(catalog) => {
                let path = days.star(index, &catalog.star(row));
                day_events(days, arc, &path, (topocentric, position_error), &mut scratch, events)
            }
            Targets::Bodies(_) | Targets::Orbits(_) => match days.moving(index, targets, row) {
                Ok(path) => {
                    status = status.worst(path.note);
                    day_events(days, arc, &path, (topocentric, position_error), &mut scratch, events)
                }
                Err(status) => {
                    events.truncate(before);
                    return (Passage::BadRow, status);
                }
            },
        };
        if index == 0 {
            above_at_start = above;
        }
    }
    let crosses = events[before..].iter().any(|event| event.kind != EventKind::Transit);
    let passage = match (crosses, above_at_start) {
        (true, _) => Passage::Crosses,
        (false, true) => Passage::AlwaysAbove,
        (false, false) => Passage::AlwaysBelow,
    };
    (passage, status.worst(days.note()))
}

/// Appends one day's events within the span; returns whether the target is above the threshold where
/// the span begins in this day.
fn day_events<P: DayPath>(
    days: &Days<'_>,
    arc: &Arc<'_>,
    path: &P,
    (threshold, position_error): (f64, f64),
    scratch: &mut Scratch,
    events: &mut Vec<Event>,
) -> bool {
    scratch.crossings.clear();
    scratch.culminations.clear();
    let above_at_midnight = path.altitude_crossings(arc, threshold.sin(), &mut scratch.crossings);
    path.culminations(arc, &mut scratch.culminations);
    let before = events.len();
    let mut above = above_at_midnight;
    for crossing in &scratch.crossings {
        let kind = if crossing.rising { EventKind::Rise } else { EventKind::Set };
        let event = event(days, arc, path, position_error, kind, crossing.at);
        if event.time.nanoseconds() < days.start.nanoseconds() {
            above = crossing.rising;
        }
        events.push(event);
    }
    for culmination in scratch.culminations.iter().filter(|culmination| culmination.upper) {
        events.push(event(days, arc, path, position_error, EventKind::Transit, culmination.at));
    }
    let span = days.start.nanoseconds()..days.stop.nanoseconds();
    let mut kept = before;
    for index in before..events.len() {
        if span.contains(&events[index].time.nanoseconds()) {
            events[kept] = events[index];
            kept += 1;
        }
    }
    events.truncate(kept);
    events[before..].sort_by_key(|event| event.time.nanoseconds());
    above
}

fn event<P: DayPath>(
    days: &Days<'_>,
    arc: &Arc<'_>,
    path: &P,
    position_error: f64,
    kind: EventKind,
    at: f64,
) -> Event {
    let (local, rate) = path.local_and_rate(arc, at);
    let observed = arc.observer.refraction.observed_altitude(altitude(local));
    let angle_error = path.error_rad() + arc.pole_error + position_error;
    let sure = match kind {
        EventKind::Transit => {
            // Across the meridian the direction moves in azimuth: cos h · dA/dt is the rate eastwards.
            let (error_s, _) = passing(angle_error, rate[1], 0.0);
            Passing { computed_error_s: error_s + arc.ut1_error_s + ROUNDING_S, ..Passing::default() }
        }
        EventKind::Rise | EventKind::Set => altitude_passing(arc, local, rate, observed, angle_error),
    };
    Event {
        kind,
        time: days.utc(arc, at),
        azimuth: azimuth(local),
        altitude: observed,
        computed_error_s: sure.computed_error_s,
        horizon_scatter_s: sure.horizon_scatter_s,
        may_not_happen: sure.may_not_happen,
    }
}
