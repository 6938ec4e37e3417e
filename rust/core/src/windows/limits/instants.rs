//! Limits on the instant itself: intervals that are given, and phases that recur.

use super::super::intervals::{Interval, IntervalSet};
use super::{Phase, PhaseScale};
use crate::astrometry::Star;
use crate::constants::{DAYS_PER_JULIAN_YEAR, J2000_MJD, LIGHT_TIME_AU_S, SECONDS_PER_DAY};
use crate::error::{Result, Status};
use crate::events::{Arc, SEPARATION_NODES};
use crate::math::chebyshev::ChebyshevVector;
use crate::math::vector::{Matrix, Vector, add_scaled, rotate_back, sub, unit};
use crate::time::{Instant, Tt, Utc};

/// Makes `set` the part of a day in which UTC is in one of the intervals.
///
/// # Errors
/// An instant outside UTC.
pub fn fill_intervals(
    arc: &Arc<'_>,
    intervals: &[(Utc, Utc)],
    range: Interval,
    reason: u8,
    set: &mut IntervalSet,
) -> Result<()> {
    let leap_seconds = arc.observer.orientation.leap_seconds();
    let fraction = |utc: Utc| {
        leap_seconds.to_tai(utc).map(|tai| arc.fraction(tai)).map_err(|status| {
            crate::error::Error::invalid("allowed_intervals", status.word(), "instants from 1960 on")
        })
    };
    let mut all = IntervalSet::new();
    for &(start, stop) in intervals {
        let (start, stop) = (fraction(start)?, fraction(stop)?);
        all = all.union(&IntervalSet::whole(start, stop, reason));
    }
    set.clear();
    set.push(range);
    set.intersect(&all, &mut IntervalSet::new());
    Ok(())
}

/// What a phase needs to know of a day: the observer's place, from which light travels on.
#[derive(Debug, Clone)]
pub struct PhaseDay {
    /// From the barycentre or from the Sun to the observer, light seconds over the day.
    from_centre_s: ChebyshevVector<SEPARATION_NODES, 3>,
    /// The clock's reading less the fraction of the day, MJD, at the beginning and at the end, light
    /// time left out: whole days apart and the rest in seconds.
    offset_s: [f64; 2],
    day: i64,
    epoch_yr: f64,
    /// From the GCRS to the horizon at the middle of the day.
    local_at_middle: Matrix,
}

impl PhaseDay {
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn new(arc: &Arc<'_>, scale: PhaseScale) -> std::result::Result<Self, Status> {
        let skies = arc.skies::<SEPARATION_NODES>()?;
        let local_at_middle = skies[SEPARATION_NODES / 2].local;
        let mut skies = skies.into_iter();
        let from_centre_s = ChebyshevVector::fit(0.0, 1.0, |_| {
            let Some(sky) = skies.next() else { return [f64::NAN; 3] };
            let au = match scale {
                PhaseScale::BarycentricTdb => sky.observer_au,
                PhaseScale::HeliocentricUtc => sub(sky.observer_au, sky.sun_au),
            };
            au.map(|component| component * LIGHT_TIME_AU_S)
        });
        let tt = |fraction: f64| Instant::<Tt>::from_mjd(arc.day as f64, fraction);
        let offset = |fraction: f64| match scale {
            PhaseScale::BarycentricTdb => {
                let (day, rest) = tt(fraction).to_tdb().mjd_parts();
                ((day - arc.day as f64) + (rest - fraction)) * SECONDS_PER_DAY
            }
            PhaseScale::HeliocentricUtc => {
                let (day, rest) = arc.utc(fraction).mjd_parts();
                ((day - arc.day as f64) + (rest - fraction)) * SECONDS_PER_DAY
            }
        };
        Ok(PhaseDay {
            from_centre_s,
            offset_s: [offset(0.0), offset(1.0)],
            day: arc.day,
            local_at_middle,
            epoch_yr: (arc.day as f64 - J2000_MJD) / DAYS_PER_JULIAN_YEAR,
        })
    }

    /// The direction in which light time is counted: the catalogue place carried to the day.
    pub fn direction(&self, star: &Star) -> Vector {
        unit(add_scaled(star.position, self.epoch_yr - star.epoch_yr, star.motion))
    }

    /// The same for a body: where it stands at the middle of the day, as if it were far away.
    pub fn body_direction(&self, local_at_middle: Vector) -> Vector {
        rotate_back(&self.local_at_middle, local_at_middle)
    }

    /// Makes `set` the part of the day within the half width of a recurrence.
    ///
    /// The clock runs 1e-4 faster or slower than the day's fraction: three steps give 1 µs and below.
    pub fn fill(
        &self,
        phase: &Phase,
        row: usize,
        direction: Vector,
        range: Interval,
        reason: u8,
        set: &mut IntervalSet,
    ) {
        let (epoch, period) = (phase.epoch_mjd.at(row), phase.period_d.at(row));
        let half = phase.half_width_d.at(row);
        let since_epoch = self.day as f64 - epoch;
        let light_s = self.from_centre_s.dot(direction);
        // What the clock reads beyond the day's fraction, days.
        let offset = |fraction: f64| {
            let [start, stop] = self.offset_s;
            (start + fraction * (stop - start) + light_s.value(fraction)) / SECONDS_PER_DAY
        };
        let clock = |fraction: f64| since_epoch + fraction + offset(fraction);
        let fraction_of = |wanted: f64| {
            let mut fraction = (wanted - since_epoch).clamp(-1.0, 2.0);
            for _ in 0..4 {
                fraction = wanted - since_epoch - offset(fraction.clamp(0.0, 1.0));
            }
            fraction
        };
        let all = {
            let mut all = IntervalSet::new();
            let first = ((clock(range.start) - half) / period).floor();
            let last = ((clock(range.stop) + half) / period).ceil();
            let mut n = first;
            while n <= last {
                let (start, stop) = (fraction_of(n * period - half), fraction_of(n * period + half));
                all.push(Interval { start, stop, start_reason: reason, stop_reason: reason });
                n += 1.0;
            }
            all
        };
        set.clear();
        set.push(range);
        set.intersect(&all, &mut IntervalSet::new());
    }
}
