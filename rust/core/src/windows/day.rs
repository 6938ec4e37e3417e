//! The limits on one day: what all targets share is worked out once.

use super::intervals::{Interval, IntervalSet};
use super::limits::Limits;
use super::reason::Cause;
use super::separation::{Keepout, Nodes};
use crate::ephemeris::Body;
use crate::error::Status;
use crate::events::{Arc, BODY_NODES, Days, directions_at, node_fraction};
use crate::math::chebyshev::Chebyshev;
use crate::math::vector::{angle, sub};

/// The edge of a day inside a span: not an edge of any window.
pub(super) const DAY: u8 = u8::MAX;

/// A limit on the sky itself, the same for every target but perhaps not its value.
#[derive(Debug, Clone)]
pub(super) struct SkyLimit {
    /// The quantity that must not exceed the limit, over the day.
    pub quantity: Chebyshev<BODY_NODES>,
    pub cause: Cause,
}

impl SkyLimit {
    /// Makes `set` the part of `range` in which the quantity is at most `most`.
    pub fn fill(&self, most: f64, range: Interval, set: &mut IntervalSet) {
        let below = self.quantity.combine(-1.0, &self.quantity, 0.0).plus(most);
        let crossings = below.crossings();
        let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising));
        set.fill_from_changes(range, below.value(0.0) >= 0.0, changes, self.cause as u8);
    }
}

/// One day of a span under limits.
#[derive(Debug)]
pub(super) struct LimitedDay {
    /// The part of the day that belongs to the span.
    pub range: Interval,
    /// Where the limits that are the same for all targets hold, one step a limit in the order of
    /// [`LimitedDay::sky`].
    pub shared: IntervalSet,
    /// Which of the shared limits left anything, in order.
    pub shared_left: Vec<(Cause, bool)>,
    /// Limits on the sky whose values differ from target to target.
    pub each: Vec<SkyLimit>,
    pub nodes: Option<Nodes>,
    pub sun: Option<Keepout>,
    pub moon: Option<Keepout>,
}

impl LimitedDay {
    pub fn new(days: &Days<'_>, index: usize, limits: &Limits) -> std::result::Result<Self, Status> {
        let arc = &days.arcs[index];
        let (start, stop) = days.part(arc);
        let edge = |is_span: bool| if is_span { Cause::Span as u8 } else { DAY };
        let range = Interval {
            start,
            stop,
            start_reason: edge(index == 0),
            stop_reason: edge(index + 1 == days.arcs.len()),
        };
        let mut shared = IntervalSet::new();
        shared.push(range);
        let mut day = LimitedDay {
            range,
            shared,
            shared_left: Vec::new(),
            each: Vec::new(),
            nodes: None,
            sun: None,
            moon: None,
        };
        day.add_sky_limits(arc, limits)?;
        if limits.sun_separation_min.is_some() || limits.moon_separation_min.is_some() {
            let nodes = Nodes::new(arc)?;
            day.sun = (limits.sun_separation_min.as_ref())
                .map(|_| Keepout::new(arc, &nodes, Body::Sun))
                .transpose()?;
            day.moon = (limits.moon_separation_min.as_ref())
                .map(|_| Keepout::new(arc, &nodes, Body::Moon))
                .transpose()?;
            day.nodes = Some(nodes);
        }
        Ok(day)
    }

    fn add_sky_limits(&mut self, arc: &Arc<'_>, limits: &Limits) -> std::result::Result<(), Status> {
        if limits.sky().iter().all(|(_, column)| column.is_none()) {
            return Ok(());
        }
        let skies = arc.skies::<BODY_NODES>()?;
        let (mut set, mut scratch) = (IntervalSet::new(), IntervalSet::new());
        for (cause, column) in limits.sky() {
            let Some(column) = column else { continue };
            let samples: Vec<f64> = match cause {
                Cause::SunAltitudeMax => {
                    directions_at(arc, &skies, Body::Sun)?.iter().map(|local| local[2]).collect()
                }
                Cause::MoonAltitudeMax => {
                    directions_at(arc, &skies, Body::Moon)?.iter().map(|local| local[2]).collect()
                }
                _ => (0..BODY_NODES)
                    .map(|j| moon_illumination(arc, node_fraction::<BODY_NODES>(j)))
                    .collect::<std::result::Result<_, Status>>()?,
            };
            let mut next = samples.iter();
            let quantity = Chebyshev::fit(0.0, 1.0, |_| next.next().copied().unwrap_or(f64::NAN));
            let limit = SkyLimit { quantity, cause };
            if let Some(most) = column.shared() {
                limit.fill(Limits::as_quantity(cause, most), self.range, &mut set);
                self.shared.intersect(&set, &mut scratch);
                self.shared_left.push((cause, !self.shared.is_empty()));
            } else {
                self.each.push(limit);
            }
        }
        Ok(())
    }
}

/// Illuminated fraction of the Moon's disc from the Earth's centre: (1 + cos i)/2 with the angle i at
/// the Moon between Sun and Earth (Meeus, *Astronomical Algorithms*, 2nd ed., equation 48.1).
fn moon_illumination(arc: &Arc<'_>, fraction: f64) -> std::result::Result<f64, Status> {
    let tdb = arc.instant(fraction).to_tt().to_tdb();
    let at = |body| arc.observer.ephemeris.position(body, tdb);
    let (earth, sun, moon) = (at(Body::Earth)?, at(Body::Sun)?, at(Body::Moon)?);
    Ok(0.5 * (1.0 + angle(sub(sun, moon), sub(earth, moon)).cos()))
}
