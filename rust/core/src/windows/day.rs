//! The limits on one day: what all targets share is worked out once.

use super::intervals::{Interval, IntervalSet};
use super::limits::kinds::fill_intervals;
use super::limits::{Column, Keepout, Limits, MoonLightDay, MoonPhaseDay, Nodes, PhaseDay};
use super::reason::Cause;
use crate::ephemeris::{Body, Ephemeris};
use crate::error::{Error, Result, Status};
use crate::events::{Arc, BODY_NODES, BodyArc, Crossing, DayPath, Days, node_fraction};
use crate::math::chebyshev::Chebyshev;
use crate::math::vector::{angle, sub};
use crate::time::{Instant, Tdb};

/// The edge of a day inside a span: not an edge of any window.
pub(super) const DAY: u8 = u8::MAX;

/// A limit on the sky itself, the same for every target but perhaps not its value.
#[derive(Debug, Clone)]
pub(super) struct SkyLimit {
    pub cause: Cause,
    /// The quantity that must not exceed the limit, over the day.
    pub quantity: Chebyshev<BODY_NODES>,
    /// The same at the beginning and the end, equal bits on the two days that meet there.
    ends: [f64; 2],
}

impl SkyLimit {
    /// Makes `set` the part of `range` in which the quantity is at most `most`.
    pub fn fill(&self, most: f64, range: Interval, set: &mut IntervalSet) {
        let below = self.quantity.combine(-1.0, &self.quantity, 0.0).plus(most);
        let [start, stop] = self.ends.map(|value| value <= most);
        let crossings = below.crossings_between(start, stop);
        let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising));
        set.fill_from_changes(range, start, changes, self.cause as u8);
    }
}

/// One day of a span under limits.
#[derive(Debug)]
pub(super) struct LimitedDay {
    /// The part of the day that belongs to the span.
    pub range: Interval,
    /// Where all limits hold that are the same for all targets.
    pub shared: IntervalSet,
    /// Each of those limits, where it alone holds, in order.
    pub alone: Vec<(Cause, IntervalSet)>,
    /// After which of them something was left, in order.
    pub shared_left: Vec<(Cause, bool)>,
    /// Which of them took the beginning and the end of the day.
    pub lost: [Cause; 2],
    /// Limits on the sky: one value for all targets or one each.
    pub sky: Vec<SkyLimit>,
    pub nodes: Option<Nodes>,
    pub sun: Option<Keepout>,
    pub moon: Option<Keepout>,
    /// Where the Moon is so low that distances from it are lifted, for either limit.
    pub moon_down: Option<[IntervalSet; 2]>,
    pub moon_phase: Option<MoonPhaseDay>,
    pub moon_light: Option<MoonLightDay>,
    pub phase: Option<PhaseDay>,
}

impl LimitedDay {
    pub fn new(days: &Days<'_>, index: usize, limits: &Limits) -> Result<Self> {
        let arc = &days.arcs[index];
        let (start, stop) = days.part(arc);
        let edge = |is_span: bool| if is_span { Cause::Span as u8 } else { DAY };
        // The last day of a span that ends with the day before is empty.
        let is_last = index + 1 == days.arcs.len()
            || (index + 2 == days.arcs.len() && days.part(&days.arcs[index + 1]).1 <= 0.0);
        let range = Interval { start, stop, start_reason: edge(index == 0), stop_reason: edge(is_last) };
        let mut shared = IntervalSet::new();
        shared.push(range);
        let mut day = LimitedDay {
            range,
            shared,
            alone: Vec::new(),
            shared_left: Vec::new(),
            lost: [Cause::None; 2],
            sky: Vec::new(),
            nodes: None,
            sun: None,
            moon: None,
            moon_down: None,
            moon_phase: None,
            moon_light: None,
            phase: None,
        };
        day.add_sky_limits(arc, limits).map_err(outside)?;
        if let Some(intervals) = &limits.allowed_intervals {
            let mut set = IntervalSet::new();
            fill_intervals(arc, intervals, range, Cause::AllowedIntervals as u8, &mut set)?;
            day.share(Cause::AllowedIntervals, set);
        }
        day.add_bodies(arc, limits).map_err(outside)?;
        Ok(day)
    }

    /// Takes in a limit that is the same for all targets.
    fn share(&mut self, cause: Cause, set: IntervalSet) {
        let before = ends_of(&self.shared, self.range);
        self.shared.intersect(&set, &mut IntervalSet::new());
        note_lost(&mut self.lost, before, ends_of(&self.shared, self.range), cause);
        self.shared_left.push((cause, !self.shared.is_empty()));
        self.alone.push((cause, set));
    }

    fn add_sky_limits(&mut self, arc: &Arc<'_>, limits: &Limits) -> std::result::Result<(), Status> {
        if limits.sky().iter().all(|(_, column)| column.is_none()) {
            return Ok(());
        }
        let skies = arc.skies::<BODY_NODES>()?;
        for (cause, column) in limits.sky() {
            let Some(column) = column else { continue };
            let of_body = |body: Body| {
                let path = BodyArc::new(arc, &skies, body)?;
                Ok((path.component(2), path.ends.map(|local| local[2])))
            };
            let (quantity, ends) = match cause {
                Cause::SunAltitudeMax => of_body(Body::Sun)?,
                Cause::MoonAltitudeMax => of_body(Body::Moon)?,
                _ => (
                    illumination::<BODY_NODES>(arc)?,
                    [moon_illumination(arc, 0.0)?, moon_illumination(arc, 1.0)?],
                ),
            };
            let limit = SkyLimit { cause, quantity, ends };
            if let Some(most) = column.shared() {
                let mut set = IntervalSet::new();
                limit.fill(Limits::as_quantity(cause, most), self.range, &mut set);
                self.share(cause, set);
            }
            self.sky.push(limit);
        }
        Ok(())
    }

    fn add_bodies(&mut self, arc: &Arc<'_>, limits: &Limits) -> std::result::Result<(), Status> {
        let from_sun = limits.sun_separation_min.is_some();
        let from_moon = limits.moon_separation_min.is_some() || limits.moon_avoidance.is_some();
        let by_moonlight = limits.sky_brightness_min_v.is_some();
        if from_sun || from_moon {
            self.nodes = Some(Nodes::new(arc)?);
        }
        let skies =
            if from_sun || from_moon || by_moonlight { arc.skies::<BODY_NODES>()? } else { Vec::new() };
        if let (Some(nodes), true) = (&self.nodes, from_sun) {
            let path = BodyArc::new(arc, &skies, Body::Sun)?;
            let least = limits.sun_separation_min.as_ref().and_then(Column::shared);
            self.sun = Some(Keepout::new(arc, nodes, Body::Sun, path)?.prepared(least));
        }
        if let (Some(nodes), true) = (&self.nodes, from_moon) {
            let path = BodyArc::new(arc, &skies, Body::Moon)?;
            self.moon_down = limits.moon_down_relaxes.map(|altitude| {
                [Cause::MoonSeparationMin, Cause::MoonAvoidance].map(|cause| {
                    let mut crossings: Vec<Crossing> = Vec::new();
                    let up = path.altitude_crossings(arc, altitude.sin(), &mut crossings);
                    let changes = crossings.iter().map(|crossing| (crossing.at, !crossing.rising));
                    let mut down = IntervalSet::new();
                    down.fill_from_changes(self.range, !up, changes, cause as u8);
                    down
                })
            });
            let least = limits.moon_separation_min.as_ref().and_then(Column::shared);
            self.moon = Some(Keepout::new(arc, nodes, Body::Moon, path)?.prepared(least));
        }
        if limits.moon_avoidance.is_some() {
            self.moon_phase = Some(MoonPhaseDay::new(arc, illumination(arc)?)?);
        }
        if by_moonlight {
            let path = BodyArc::new(arc, &skies, Body::Moon)?;
            self.moon_light = Some(MoonLightDay::new(arc, path, &illumination(arc)?));
        }
        if let Some(phase) = &limits.phase {
            self.phase = Some(PhaseDay::new(arc, phase.scale)?);
        }
        Ok(())
    }
}

fn outside(status: Status) -> Error {
    Error::invalid("the span", status.word(), "a span within the ephemeris")
}

/// Whether a set holds the beginning and the end of a range.
pub(super) fn ends_of(set: &IntervalSet, range: Interval) -> [bool; 2] {
    [
        set.first().is_some_and(|first| first.start <= range.start),
        set.last().is_some_and(|last| last.stop >= range.stop),
    ]
}

/// Notes which limit took an end of a day.
pub(super) fn note_lost(lost: &mut [Cause; 2], before: [bool; 2], after: [bool; 2], cause: Cause) {
    for end in 0..2 {
        if before[end] && !after[end] {
            lost[end] = cause;
        }
    }
}

fn illumination<const N: usize>(arc: &Arc<'_>) -> std::result::Result<Chebyshev<N>, Status> {
    let samples: Vec<f64> = (0..N)
        .map(|j| moon_illumination(arc, node_fraction::<N>(j)))
        .collect::<std::result::Result<_, Status>>()?;
    let mut next = samples.into_iter();
    Ok(Chebyshev::fit(0.0, 1.0, |_| next.next().unwrap_or(f64::NAN)))
}

/// Illuminated fraction of the Moon's disc from the Earth's centre: (1 + cos i)/2 with the phase angle i
/// (Meeus, *Astronomical Algorithms*, 2nd ed., equation 48.1).
fn moon_illumination(arc: &Arc<'_>, fraction: f64) -> std::result::Result<f64, Status> {
    let tdb = arc.instant(fraction).to_tt().to_tdb();
    Ok(0.5 * (1.0 + moon_phase_angle(arc.observer.ephemeris, tdb)?.cos()))
}

/// Angle at the Moon between Sun and Earth, radians, of the centres where they are at one instant: 0 at full Moon.
///
/// # Errors
/// [`Status::OutsideEphemeris`].
pub fn moon_phase_angle(ephemeris: &Ephemeris, tdb: Instant<Tdb>) -> std::result::Result<f64, Status> {
    let at = |body| ephemeris.position(body, tdb);
    let (earth, sun, moon) = (at(Body::Earth)?, at(Body::Sun)?, at(Body::Moon)?);
    Ok(angle(sub(sun, moon), sub(earth, moon)))
}
