//! The windows of one target over a span.

use super::day::{DAY, LimitedDay};
use super::intervals::{Interval, IntervalSet};
use super::limits::{Column, Limits};
use super::reason::Cause;
use crate::astrometry::Targets;
use crate::error::{Error, Result, Status};
use crate::events::{Arc, Crossing, DayPath, Days};
use crate::horizon::{altitude, hour_angle};
use crate::math::chebyshev::Chebyshev;
use crate::time::Utc;
use std::f64::consts::FRAC_PI_2;

/// A half-open interval of UTC in which every limit holds.
#[derive(Debug, Clone, Copy)]
pub struct Window {
    /// First instant in it.
    pub start: Utc,
    /// First instant after it.
    pub stop: Utc,
    /// What opens it.
    pub start_reason: Cause,
    /// What closes it.
    pub stop_reason: Cause,
    /// Airmass where the target stands highest in it, by the limits' model.
    pub best_airmass: f64,
    /// When that is.
    pub best_time: Utc,
}

/// What came of one target; the windows themselves are appended to the caller's list.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct TargetWindows {
    /// What is to be said of the row.
    pub status: Status,
    /// The limit that left nothing, [`Cause::None`] when there is a window. Limits are applied in the
    /// order Sun altitude, Moon altitude, Moon illumination, altitude and airmass, hour angle, Sun
    /// separation, Moon separation, shortest window: named is the first after which nothing is left in
    /// the whole span.
    pub blocked_by: Cause,
}

/// A span under limits: what all targets share, worked out once.
#[derive(Debug)]
pub struct LimitedSpan<'a> {
    days: &'a Days<'a>,
    limits: &'a Limits,
    limited: Vec<LimitedDay>,
    airmass_altitude: Option<Column>,
}

/// Space to work in, kept from target to target.
#[derive(Debug, Default)]
pub struct Workspace {
    left: IntervalSet,
    set: IntervalSet,
    scratch: IntervalSet,
    crossings: Vec<Crossing>,
    changes: Vec<(f64, bool)>,
    highest: Vec<f64>,
    pieces: Vec<Piece>,
    stages: Vec<(Cause, bool)>,
}

/// Part of a window within one day.
#[derive(Debug, Clone, Copy)]
struct Piece {
    first: (usize, f64),
    last: (usize, f64),
    start_reason: u8,
    stop_reason: u8,
    best: (usize, f64),
    best_sin_altitude: f64,
}

impl<'a> LimitedSpan<'a> {
    /// Works out what the targets share.
    ///
    /// # Errors
    /// Limits that do not fit the number of targets or their ranges, or a span outside the ephemeris.
    pub fn new(days: &'a Days<'a>, limits: &'a Limits, targets: usize) -> Result<Self> {
        limits.check(targets)?;
        let limited = (0..days.arcs.len())
            .map(|index| LimitedDay::new(days, index, limits))
            .collect::<std::result::Result<Vec<_>, Status>>()
            .map_err(|status| Error::invalid("the span", status.word(), "a span within the ephemeris"))?;
        let refraction = days.observer().refraction;
        let altitude_of = |airmass: f64| limits.airmass_model.observed_altitude(airmass, refraction);
        let airmass_altitude = match &limits.airmass_max {
            None => None,
            Some(Column::All(airmass)) => Some(Column::All(altitude_of(*airmass)?)),
            // A bad value is the row's own affair: Limits::status marks it.
            Some(Column::Each(values)) => Some(Column::Each(
                values.iter().map(|&airmass| altitude_of(airmass).unwrap_or(f64::NAN)).collect(),
            )),
        };
        Ok(LimitedSpan { days, limits, limited, airmass_altitude })
    }

    /// Appends the windows of target `row`, in order of time.
    ///
    /// Edges agree with the exact chain as the events do: 1 ms for stars, 20 ms where the Sun or the
    /// Moon sets them (`tests/test_accuracy_windows.py`).
    pub fn windows(
        &self,
        targets: &Targets<'_>,
        row: usize,
        workspace: &mut Workspace,
        windows: &mut Vec<Window>,
    ) -> TargetWindows {
        let status = targets.status(row).worst(self.limits.status(row));
        if status.is_bad() {
            return TargetWindows { status, blocked_by: Cause::BadRow };
        }
        workspace.pieces.clear();
        workspace.stages.clear();
        for index in 0..self.limited.len() {
            match targets {
                Targets::Catalog(catalog) => {
                    // A day that is all daylight costs no chain.
                    if self.shared_is_empty(index, workspace) {
                        continue;
                    }
                    let path = self.days.star(index, &catalog.star(row));
                    self.day(index, &path, row, workspace);
                }
                Targets::Bodies(bodies) => {
                    if self.shared_is_empty(index, workspace) {
                        continue;
                    }
                    match self.days.body(index, bodies[row]) {
                        Ok(path) => self.day(index, &path, row, workspace),
                        Err(status) => return TargetWindows { status, blocked_by: Cause::BadRow },
                    }
                }
            }
        }
        let status = status.worst(self.days.note());
        let found = self.join(row, workspace, windows);
        let blocked_by = if found { Cause::None } else { first_empty(&workspace.stages) };
        TargetWindows { status, blocked_by }
    }

    /// Notes what the shared limits left of a day; whether that is nothing.
    fn shared_is_empty(&self, index: usize, workspace: &mut Workspace) -> bool {
        let day = &self.limited[index];
        for &(cause, left) in &day.shared_left {
            note(&mut workspace.stages, cause, left);
        }
        day.shared.is_empty()
    }

    /// Appends the pieces of one day.
    fn day<P: DayPath>(&self, index: usize, path: &P, row: usize, workspace: &mut Workspace) {
        let (arc, day) = (&self.days.arcs[index], &self.limited[index]);
        let Workspace { left, set, scratch, stages, .. } = workspace;
        left.clone_from(&day.shared);
        for limit in &day.each {
            let column =
                self.limits.sky().into_iter().find(|sky| sky.0 == limit.cause).and_then(|sky| sky.1.as_ref());
            let Some(column) = column else { continue };
            limit.fill(Limits::as_quantity(limit.cause, column.at(row)), day.range, set);
            left.intersect(set, scratch);
            note(stages, limit.cause, !left.is_empty());
        }
        self.altitude(arc, day.range, path, row, workspace);
        self.hour_angle(arc, day.range, path, row, workspace);
        self.keepout(index, path, row, workspace);
        self.pieces(index, path, workspace);
    }

    fn altitude<P: DayPath>(
        &self,
        arc: &Arc<'_>,
        range: Interval,
        path: &P,
        row: usize,
        workspace: &mut Workspace,
    ) {
        let refraction = arc.observer.refraction;
        let Workspace { left, set, scratch, crossings, stages, .. } = workspace;
        let lowest = self.limits.altitude_min.as_ref().map(|column| (column.at(row), Cause::AltitudeMin));
        let by_airmass = self.airmass_altitude.as_ref().map(|column| (column.at(row), Cause::AirmassMax));
        // Both bound the altitude from below: the higher one is the limit.
        let lower = match (lowest, by_airmass) {
            (Some(a), Some(b)) => Some(if b.0 > a.0 { b } else { a }),
            (a, b) => a.or(b),
        };
        let highest = self.limits.altitude_max.as_ref().map(|column| (column.at(row), Cause::AltitudeMax));
        for (bound, upper) in [(lower, false), (highest, true)] {
            let Some((observed, cause)) = bound else { continue };
            if left.is_empty() || (upper && observed >= FRAC_PI_2) {
                continue;
            }
            crossings.clear();
            let threshold = refraction.topocentric_altitude(observed).sin();
            let above = path.altitude_crossings(arc, threshold, crossings);
            let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising != upper));
            set.fill_from_changes(range, above != upper, changes, cause as u8);
            left.intersect(set, scratch);
            note(stages, cause, !left.is_empty());
        }
    }

    fn hour_angle<P: DayPath>(
        &self,
        arc: &Arc<'_>,
        range: Interval,
        path: &P,
        row: usize,
        workspace: &mut Workspace,
    ) {
        const NODES: usize = 25;
        let at = |column: &Option<Column>, default: f64| column.as_ref().map_or(default, |c| c.at(row));
        let pi = std::f64::consts::PI;
        let (least, most) = (at(&self.limits.hour_angle_min, -pi), at(&self.limits.hour_angle_max, pi));
        let Workspace { left, set, scratch, changes, stages, .. } = workspace;
        if left.is_empty() || (least <= -pi && most >= pi) {
            return;
        }
        changes.clear();
        for (bound, opens) in [(least, true), (most, false)] {
            let (sin, cos) = bound.sin_cos();
            // cos δ · sin(H − bound), which also vanishes half a turn away.
            let offset = Chebyshev::<NODES>::fit(0.0, 1.0, |fraction| {
                let local = path.local(arc, fraction);
                -local[1] * cos - (local[2] * arc.latitude.cos - local[0] * arc.latitude.sin) * sin
            });
            for crossing in offset.crossings().iter() {
                let there = hour_angle(path.local(arc, crossing.at), arc.latitude) - bound;
                if there.cos() > 0.0 {
                    changes.push((crossing.at, crossing.rising == opens));
                }
            }
        }
        changes.sort_by(|a, b| a.0.total_cmp(&b.0));
        let at_start = hour_angle(path.local(arc, 0.0), arc.latitude);
        let inside = (least..most).contains(&at_start);
        set.fill_from_changes(range, inside, changes.iter().copied(), Cause::HourAngle as u8);
        left.intersect(set, scratch);
        note(stages, Cause::HourAngle, !left.is_empty());
    }

    fn keepout<P: DayPath>(&self, index: usize, path: &P, row: usize, workspace: &mut Workspace) {
        let (arc, day) = (&self.days.arcs[index], &self.limited[index]);
        let Workspace { left, set, scratch, stages, .. } = workspace;
        let keepouts = [
            (&day.sun, &self.limits.sun_separation_min, Cause::SunSeparationMin),
            (&day.moon, &self.limits.moon_separation_min, Cause::MoonSeparationMin),
        ];
        for (keepout, column, cause) in keepouts {
            let (Some(keepout), Some(column), Some(nodes)) = (keepout, column, &day.nodes) else { continue };
            if left.is_empty() {
                return;
            }
            keepout.fill(arc, nodes, path, column.at(row), day.range, cause as u8, set);
            left.intersect(set, scratch);
            note(stages, cause, !left.is_empty());
        }
    }

    /// Turns what is left of the day into pieces, each with the instant at which the target is highest.
    fn pieces<P: DayPath>(&self, index: usize, path: &P, workspace: &mut Workspace) {
        let arc = &self.days.arcs[index];
        let Workspace { left, highest, pieces, .. } = workspace;
        if left.is_empty() {
            return;
        }
        for interval in left.iter() {
            highest.clear();
            path.highest(arc, interval.start, interval.stop, highest);
            let inside = highest.iter().copied();
            let mut best = (interval.start, f64::NEG_INFINITY);
            for at in [interval.start, interval.stop].into_iter().chain(inside) {
                let sin_altitude = path.local(arc, at)[2];
                if sin_altitude > best.1 {
                    best = (at, sin_altitude);
                }
            }
            let piece = Piece {
                first: (index, interval.start),
                last: (index, interval.stop),
                start_reason: interval.start_reason,
                stop_reason: interval.stop_reason,
                best: (index, best.0),
                best_sin_altitude: best.1,
            };
            match pieces.last_mut() {
                // Where one day ends the next begins: the edge between them is none.
                Some(last)
                    if last.stop_reason == DAY && piece.start_reason == DAY && last.last.0 + 1 == index =>
                {
                    last.last = piece.last;
                    last.stop_reason = piece.stop_reason;
                    if piece.best_sin_altitude > last.best_sin_altitude {
                        last.best = piece.best;
                        last.best_sin_altitude = piece.best_sin_altitude;
                    }
                }
                _ => pieces.push(piece),
            }
        }
    }

    /// Appends the pieces that are long enough as windows; whether there are any.
    fn join(&self, row: usize, workspace: &mut Workspace, windows: &mut Vec<Window>) -> bool {
        let shortest_s = self.limits.window_min_s.as_ref().map_or(0.0, |column| column.at(row));
        let utc = |at: (usize, f64)| self.days.utc(&self.days.arcs[at.0], at.1);
        let cause = |reason: u8| Cause::from_code(reason).unwrap_or(Cause::None);
        let before = windows.len();
        for piece in &workspace.pieces {
            let instant = |at: (usize, f64)| self.days.arcs[at.0].instant(at.1);
            let length_s = instant(piece.last).seconds_since(instant(piece.first));
            let (start, stop) = (utc(piece.first), utc(piece.last));
            if length_s < shortest_s || stop.nanoseconds() <= start.nanoseconds() {
                continue;
            }
            windows.push(Window {
                start,
                stop,
                start_reason: cause(piece.start_reason),
                stop_reason: cause(piece.stop_reason),
                best_airmass: self.airmass(piece.best_sin_altitude),
                best_time: utc(piece.best),
            });
        }
        let found = windows.len() > before;
        if self.limits.window_min_s.is_some() && !workspace.pieces.is_empty() {
            note(&mut workspace.stages, Cause::WindowMin, found);
        }
        found
    }

    fn airmass(&self, sin_altitude: f64) -> f64 {
        let topocentric = altitude([(1.0 - sin_altitude * sin_altitude).max(0.0).sqrt(), 0.0, sin_altitude]);
        let observed = self.days.observer().refraction.observed_altitude(topocentric);
        self.limits.airmass_model.airmass(observed, topocentric)
    }
}

/// Notes that after a limit something was left, on this day or an earlier one.
fn note(stages: &mut Vec<(Cause, bool)>, cause: Cause, left: bool) {
    match stages.iter_mut().find(|stage| stage.0 == cause) {
        Some(stage) => stage.1 |= left,
        None => stages.push((cause, left)),
    }
}

/// The first limit after which nothing was left on any day.
fn first_empty(stages: &[(Cause, bool)]) -> Cause {
    let order = [
        Cause::SunAltitudeMax,
        Cause::MoonAltitudeMax,
        Cause::MoonIlluminationMax,
        Cause::AltitudeMin,
        Cause::AirmassMax,
        Cause::AltitudeMax,
        Cause::HourAngle,
        Cause::SunSeparationMin,
        Cause::MoonSeparationMin,
        Cause::WindowMin,
    ];
    let empty = |cause: &Cause| stages.iter().any(|stage| stage.0 == *cause && !stage.1);
    order.into_iter().find(empty).unwrap_or(Cause::Span)
}
