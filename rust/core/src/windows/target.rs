//! The windows of one target over a span.

use super::day::{DAY, LimitedDay, ends_of, note_lost};
use super::intervals::IntervalSet;
use super::limits::kinds::{
    fill_altitude, fill_azimuth_rate, fill_brightness, fill_declination, fill_hour_angle, fill_sectors,
    fill_skyline, split_by_cables,
};
use super::limits::{AzimuthWalk, Branch, Column, Limits, Lines, Turning};
use super::pieces::Piece;
use super::reason::Cause;
use crate::astrometry::{Star, Targets};
use crate::error::{Error, Result, Status};
use crate::events::{Crossing, DayPath, Days, Screen, StarArc};
use crate::time::Utc;
use std::f64::consts::{FRAC_PI_2, PI};

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
    /// How far the computed start may be from the true one for the stated atmosphere, seconds.
    pub start_error_s: f64,
    /// The same for the stop.
    pub stop_error_s: f64,
    /// Standard deviation by which refraction moves the start, seconds; 0 above 15° and where no altitude
    /// of the target sets the edge.
    pub start_scatter_s: f64,
    /// The same for the stop.
    pub stop_scatter_s: f64,
    /// Whether an edge is a grazing: its limit may not be passed at all, and the window may be longer,
    /// joined to its neighbour, or not be.
    pub may_not_happen: bool,
}

/// What came of one target; the windows themselves are appended to the caller's list.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct TargetWindows {
    /// What is to be said of the row.
    pub status: Status,
    /// The limit that left nothing, [`Cause::None`] when there is a window. Limits are applied in
    /// [`Cause::ORDER`], those that are the same for all targets first: named is the first after which
    /// nothing is left in the whole span.
    pub blocked_by: Cause,
}

/// A span under limits: what all targets share, worked out once.
#[derive(Debug)]
pub struct LimitedSpan<'a> {
    pub(super) days: &'a Days<'a>,
    pub(super) limits: &'a Limits,
    pub(super) limited: Vec<LimitedDay>,
    /// The limits that are asked target by target, in order.
    pub(super) each: Vec<Cause>,
    /// The same without those that another one makes needless.
    needed: Vec<Cause>,
    lower: Threshold,
    upper: Threshold,
    by_airmass: Threshold,
    pub(super) lines: Option<Lines>,
    /// For each day, where an altitude that is one for all targets comes first of those asked target by
    /// target: the limit, its sine, and what tells that a star stays below it.
    screens: Vec<Option<(Cause, f64, Screen)>>,
    pub(super) position_error: Option<Column>,
    has_columns: bool,
}

/// A limit in altitude as the sine of the topocentric altitude: computed once where it is one for all.
#[derive(Debug, Clone, Copy)]
struct Threshold(Option<f64>);

/// Space to work in, kept from target to target.
#[derive(Debug, Default)]
pub struct Workspace {
    left: IntervalSet,
    pub(super) set: IntervalSet,
    pub(super) scratch: IntervalSet,
    crossings: Vec<Crossing>,
    changes: Vec<(f64, bool)>,
    pub(super) highest: Vec<f64>,
    walk: AzimuthWalk,
    branch: Option<Branch>,
    pub(super) pieces: Vec<Piece>,
    pub(super) stages: Vec<(Cause, bool)>,
    /// Which limits took the beginning and the end of each day.
    pub(super) lost: Vec<[Cause; 2]>,
}

impl<'a> LimitedSpan<'a> {
    /// Works out what the targets share.
    ///
    /// # Errors
    /// Limits that do not fit the number of targets, their ranges or each other, a skyline asked of a site
    /// that has none, or a span outside the ephemeris.
    pub fn new(days: &'a Days<'a>, limits: &'a Limits, targets: usize) -> Result<Self> {
        limits.check(targets)?;
        let limited = (0..days.arcs.len())
            .map(|index| LimitedDay::new(days, index, limits))
            .collect::<Result<Vec<_>>>()?;
        let observer = days.observer();
        let refraction = observer.refraction;
        let sine = |observed: f64| refraction.topocentric_altitude(observed).sin();
        let shared = |column: &Option<Column>| Threshold(column.as_ref().and_then(Column::shared).map(sine));
        let by_airmass = match limits.airmass_max.as_ref().and_then(Column::shared) {
            Some(airmass) => {
                Threshold(Some(sine(limits.airmass_model.observed_altitude(airmass, refraction)?)))
            }
            None => Threshold(None),
        };
        let lines = match (limits.use_skyline, observer.site.skyline()) {
            (true, Some(skyline)) => Some(Lines::new(skyline, refraction)),
            (true, None) => {
                return Err(Error::invalid("use_skyline", "true", "a site that has a skyline"));
            }
            (false, _) => None,
        };
        let is_shared = |cause: Cause| limited[0].alone.iter().any(|alone| alone.0 == cause);
        let each: Vec<Cause> = Cause::ORDER
            .into_iter()
            .filter(|&cause| limits.has(cause) && cause != Cause::WindowMin && !is_shared(cause))
            .collect();
        let mut span = LimitedSpan {
            days,
            limits,
            limited,
            needed: Vec::new(),
            each,
            lower: shared(&limits.altitude_min),
            upper: shared(&limits.altitude_max),
            by_airmass,
            lines,
            screens: Vec::new(),
            position_error: None,
            has_columns: limits.has_columns(),
        };
        span.needed = span.each.iter().copied().filter(|&cause| !span.is_needless(cause)).collect();
        span.screens = (0..span.limited.len()).map(|index| span.screen(index)).collect();
        Ok(span)
    }

    fn screen(&self, index: usize) -> Option<(Cause, f64, Screen)> {
        let (first, last) = (self.limited[index].shared.first()?, self.limited[index].shared.last()?);
        let cause = *self.needed.first()?;
        let sine = match cause {
            Cause::AltitudeMin => self.lower.0?,
            Cause::AirmassMax => self.by_airmass.0?,
            _ => return None,
        };
        Some((cause, sine, Screen::new(&self.days.arcs[index], first.start, last.stop)))
    }

    /// Whether another limit, the same for all targets too, says as much and more.
    fn is_needless(&self, cause: Cause) -> bool {
        let highest = match (self.lower.0, self.by_airmass.0) {
            (Some(a), Some(b)) => Some(a.max(b)),
            (a, b) => a.or(b),
        };
        match (cause, self.lower.0, self.by_airmass.0) {
            (Cause::AltitudeMin, Some(lower), Some(airmass)) => airmass > lower,
            (Cause::AirmassMax, Some(lower), Some(airmass)) => lower >= airmass,
            (Cause::Skyline, _, _) => {
                self.lines.as_ref().zip(highest).is_some_and(|(lines, lowest)| lowest >= lines.sin_highest())
            }
            _ => false,
        }
    }

    /// Takes into account that the catalogue place of each target may be off by so much, radians: it goes
    /// into the windows' errors.
    ///
    /// # Errors
    /// A column of the wrong length, or a value for all that is negative or not a number.
    pub fn with_position_error(mut self, error: Column, targets: usize) -> Result<Self> {
        match &error {
            Column::Each(values) if values.len() != targets => {
                let given = format!("{} values", values.len());
                return Err(Error::invalid("position_error", given, format!("one value, or {targets}")));
            }
            Column::All(value) if !(0.0..=PI).contains(value) => {
                return Err(Error::invalid("position_error", value, "0 to π"));
            }
            _ => {}
        }
        self.position_error = Some(error);
        Ok(self)
    }

    /// What is to be said of a row before anything is computed.
    pub(super) fn status(&self, targets: &Targets<'_>, row: usize) -> Status {
        let status = targets.status(row);
        if self.has_columns { status.worst(self.limits.status(row)) } else { status }
    }

    /// Appends the windows of target `row`, in order of time.
    ///
    /// Edges agree with the exact chain as the events do: 1 ms for stars, 20 ms where the Sun or the
    /// Moon sets them (`tests/test_accuracy_windows.py`; every limit by brute force in `rust/core/tests/windows`).
    pub fn windows(
        &self,
        targets: &Targets<'_>,
        row: usize,
        workspace: &mut Workspace,
        windows: &mut Vec<Window>,
    ) -> TargetWindows {
        let mut status = self.status(targets, row);
        if status.is_bad() {
            return TargetWindows { status, blocked_by: Cause::BadRow };
        }
        workspace.pieces.clear();
        workspace.stages.clear();
        workspace.lost.clear();
        workspace.branch = None;
        let star = match targets {
            Targets::Catalog(catalog) => Some(catalog.star(row)),
            Targets::Bodies(_) | Targets::Orbits(_) => None,
        };
        let mut yesterday: Option<(usize, StarArc)> = None;
        for (index, day) in self.limited.iter().enumerate() {
            for &(cause, left) in &day.shared_left {
                note(&mut workspace.stages, cause, left);
            }
            workspace.lost.push(day.lost);
            // A day that is all daylight costs no chain.
            if day.shared.is_empty() {
                continue;
            }
            match (&star, targets) {
                (Some(star), _) => {
                    // A star that is low all the time costs none either.
                    if let Some((cause, sine, screen)) = &self.screens[index]
                        && screen.stays_below(star, *sine)
                    {
                        note(&mut workspace.stages, *cause, false);
                        if let Some(lost) = workspace.lost.last_mut() {
                            note_lost(lost, ends_of(&day.shared, day.range), [false; 2], *cause);
                        }
                        continue;
                    }
                    let arc = &self.days.arcs[index];
                    let path = match &yesterday {
                        Some((before, path)) if before + 1 == index => path.on_the_next_day(arc, star),
                        _ => StarArc::new(arc, star),
                    };
                    self.day(index, &path, Some(star), row, workspace);
                    yesterday = Some((index, path));
                }
                (None, _) => match self.days.moving(index, targets, row) {
                    Ok(path) => {
                        status = status.worst(path.note);
                        self.day(index, &path, None, row, workspace);
                    }
                    Err(status) => return TargetWindows { status, blocked_by: Cause::BadRow },
                },
            }
        }
        let status = status.worst(self.days.note());
        let found = self.join(row, workspace, windows);
        let blocked_by = if found { Cause::None } else { first_empty(&workspace.stages) };
        TargetWindows { status, blocked_by }
    }

    /// Appends the pieces of one day.
    fn day<P: Turning>(
        &self,
        index: usize,
        path: &P,
        star: Option<&Star>,
        row: usize,
        workspace: &mut Workspace,
    ) {
        let day = &self.limited[index];
        let mut left = std::mem::take(&mut workspace.left);
        let mut set = std::mem::take(&mut workspace.set);
        left.clone_from(&day.shared);
        let mut lost = day.lost;
        for &cause in &self.needed {
            let (Some(first), Some(last)) = (left.first(), left.last()) else { break };
            let within = (first.start, last.stop);
            let before = ends_of(&left, day.range);
            if cause == Cause::CableRange {
                self.cables(index, path, &left, &mut set, workspace);
                std::mem::swap(&mut left, &mut set);
            } else {
                self.fill(cause, index, path, star, row, within, workspace, &mut set);
                left.intersect(&set, &mut workspace.scratch);
            }
            note_lost(&mut lost, before, ends_of(&left, day.range), cause);
            note(&mut workspace.stages, cause, !left.is_empty());
        }
        if let Some(of_day) = workspace.lost.last_mut() {
            *of_day = lost;
        }
        self.pieces(index, path, row, &left, workspace);
        (workspace.left, workspace.set) = (left, set);
    }

    /// Makes `set` where one limit holds on a day; outside `within` it may be off by minutes.
    pub(super) fn fill<P: Turning>(
        &self,
        cause: Cause,
        index: usize,
        path: &P,
        star: Option<&Star>,
        row: usize,
        within: (f64, f64),
        workspace: &mut Workspace,
        set: &mut IntervalSet,
    ) {
        let (arc, day, limits) = (&self.days.arcs[index], &self.limited[index], self.limits);
        let (part, reason) = ((day.range, within), cause as u8);
        let value = |column: &Option<Column>, default: f64| column.as_ref().map_or(default, |c| c.at(row));
        let Workspace { crossings, changes, walk, scratch, .. } = workspace;
        match cause {
            Cause::SunAltitudeMax | Cause::MoonAltitudeMax | Cause::MoonIlluminationMax => {
                let column =
                    limits.sky().into_iter().find(|sky| sky.0 == cause).and_then(|sky| sky.1.as_ref());
                let limit = day.sky.iter().find(|limit| limit.cause == cause);
                if let (Some(limit), Some(column)) = (limit, column) {
                    limit.fill(Limits::as_quantity(cause, column.at(row)), day.range, set);
                }
            }
            Cause::AltitudeMin | Cause::AirmassMax | Cause::AltitudeMax => {
                let upper = cause == Cause::AltitudeMax;
                match self.sin_threshold(cause, row) {
                    Some(sine) => fill_altitude(arc, path, sine, upper, part, reason, crossings, set),
                    None => {
                        set.clear();
                        set.push(day.range);
                    }
                }
            }
            Cause::Declination => {
                let bounds = (value(&limits.declination_min, -PI), value(&limits.declination_max, PI));
                fill_declination(arc, path, bounds, part, reason, (crossings, set, scratch));
            }
            Cause::HourAngle => {
                let bounds = (value(&limits.hour_angle_min, -PI), value(&limits.hour_angle_max, PI));
                fill_hour_angle(arc, path, bounds, part, reason, (crossings, changes), set);
            }
            Cause::AzimuthSectors => {
                let sectors = limits.azimuth_sectors.as_deref().unwrap_or(&[]);
                fill_sectors(arc, path, sectors, part, reason, (crossings, changes), set);
            }
            Cause::AzimuthRate => {
                let most = value(&limits.azimuth_rate_max, f64::INFINITY);
                fill_azimuth_rate(arc, path, most, day.range, reason, set);
            }
            Cause::Skyline => {
                if let Some(lines) = &self.lines {
                    fill_skyline(arc, path, lines, part, reason, walk, crossings, set);
                }
            }
            Cause::SunSeparationMin | Cause::MoonSeparationMin | Cause::MoonAvoidance => {
                self.keepout(cause, index, path, row, set);
            }
            Cause::Phase => {
                if let (Some(of_day), Some(phase)) = (&day.phase, &limits.phase) {
                    let direction = match star {
                        Some(star) => of_day.direction(star),
                        None => of_day.body_direction(path.local(arc, 0.5)),
                    };
                    of_day.fill(phase, row, direction, day.range, reason, set);
                }
            }
            Cause::SkyBrightness => {
                if let Some(light) = &day.moon_light {
                    let least_v = value(&limits.sky_brightness_min_v, 0.0);
                    fill_brightness(
                        arc,
                        path,
                        light,
                        &limits.sky_model,
                        least_v,
                        part,
                        reason,
                        crossings,
                        set,
                    );
                }
            }
            Cause::CableRange => {
                let mut whole = IntervalSet::new();
                whole.push(day.range);
                self.cables(index, path, &whole, set, workspace);
            }
            Cause::None | Cause::Span | Cause::BadRow | Cause::WindowMin | Cause::AllowedIntervals => {
                set.clear();
                set.push(day.range);
            }
        }
    }

    /// The sine of the topocentric altitude that bounds a target; None where nothing does.
    pub(super) fn sin_threshold(&self, cause: Cause, row: usize) -> Option<f64> {
        let refraction = self.days.observer().refraction;
        let observed = match cause {
            Cause::AltitudeMin if self.lower.0.is_some() => return self.lower.0,
            Cause::AirmassMax if self.by_airmass.0.is_some() => return self.by_airmass.0,
            Cause::AltitudeMin => self.limits.altitude_min.as_ref()?.at(row),
            Cause::AltitudeMax => {
                let observed = self.limits.altitude_max.as_ref()?.at(row);
                if observed >= FRAC_PI_2 {
                    return None;
                }
                match self.upper.0 {
                    Some(sine) => return Some(sine),
                    None => observed,
                }
            }
            _ => {
                let airmass = self.limits.airmass_max.as_ref()?.at(row);
                // A bad value is the row's own affair: Limits::status marked it.
                self.limits.airmass_model.observed_altitude(airmass, refraction).unwrap_or(f64::NAN)
            }
        };
        Some(refraction.topocentric_altitude(observed).sin())
    }

    fn keepout<P: DayPath>(&self, cause: Cause, index: usize, path: &P, row: usize, set: &mut IntervalSet) {
        use super::limits::Least;
        let (arc, day, limits) = (&self.days.arcs[index], &self.limited[index], self.limits);
        let Some(nodes) = &day.nodes else { return };
        let reason = cause as u8;
        match cause {
            Cause::SunSeparationMin => {
                if let (Some(sun), Some(column)) = (&day.sun, &limits.sun_separation_min) {
                    sun.fill(arc, nodes, path, Least::Fixed(column.at(row)), day.range, reason, set);
                }
                return;
            }
            Cause::MoonSeparationMin => {
                if let (Some(moon), Some(column)) = (&day.moon, &limits.moon_separation_min) {
                    moon.fill(arc, nodes, path, Least::Fixed(column.at(row)), day.range, reason, set);
                }
            }
            _ => {
                if let (Some(moon), Some(phase), Some(avoidance)) =
                    (&day.moon, &day.moon_phase, &limits.moon_avoidance)
                {
                    phase.fill(moon, avoidance, row, arc, nodes, path, day.range, reason, set);
                }
            }
        }
        if let Some(down) = &day.moon_down {
            *set = set.union(&down[usize::from(cause == Cause::MoonAvoidance)]);
        }
    }

    fn cables<P: Turning>(
        &self,
        index: usize,
        path: &P,
        left: &IntervalSet,
        set: &mut IntervalSet,
        workspace: &mut Workspace,
    ) {
        let Some(range) = self.limits.cable_range else { return };
        let arc = &self.days.arcs[index];
        let goes_on = workspace.branch.take().filter(|_| left.first().is_some_and(|i| i.start_reason == DAY));
        let reason = Cause::CableRange as u8;
        workspace.branch = split_by_cables(arc, path, range, goes_on, reason, &mut workspace.walk, left, set);
    }
}

/// Notes that after a limit something was left, on this day or an earlier one.
pub(super) fn note(stages: &mut Vec<(Cause, bool)>, cause: Cause, left: bool) {
    match stages.iter_mut().find(|stage| stage.0 == cause) {
        Some(stage) => stage.1 |= left,
        None => stages.push((cause, left)),
    }
}

/// The first limit after which nothing was left on any day.
fn first_empty(stages: &[(Cause, bool)]) -> Cause {
    let empty = |cause: &Cause| stages.iter().any(|stage| stage.0 == *cause && !stage.1);
    Cause::ORDER.into_iter().find(empty).unwrap_or(Cause::Span)
}
