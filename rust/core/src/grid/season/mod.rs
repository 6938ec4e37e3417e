//! Targets × nights: what a season offers.
//!
//! Nights are taken a few weeks at a time, targets a block at a time. In such a tile the stars' directions
//! are computed for the first and the last night and interpolated, and the loop of `kernel` does the
//! rest; it marks the few stars that it cannot be sure of, which get the exact windows. Targets that
//! move, and limits that the loop does not know, go the exact way altogether.

mod columns;
mod detail;
mod exact;
mod kernel;
mod movers;
mod night;
mod tile;

use self::columns::{Wanted, check};
use self::night::{Night, dark_stretches};
use self::tile::{Season, Tile, TileSpace};
use super::parallel::Workers;
use crate::astrometry::{Observer, Targets};
use crate::error::{Error, Result, Status};
use crate::events::{Days, night_bounds, track_plan};
use crate::windows::{LimitedSpan, Limits};

pub use self::columns::{GridColumns, GridQuantity, GridValues};

/// Nights over which a star's direction is interpolated: its parallax curves by 2 mas in them at most,
/// and a tile's results are still in the cache when its last night is done.
const WEEKS: usize = 16;
/// Stretches of [`WEEKS`] that are prepared together, for all threads to have work.
const TOGETHER: usize = 8;
/// Nights in one call: two centuries, all that the ephemeris holds.
const MOST_NIGHTS: usize = 75_000;

/// What is to be said of a grid beside its values.
#[derive(Debug, Clone, Default)]
pub struct GridReport {
    /// One a target. A target with a bad status has NaN on every night.
    pub target_status: Vec<Status>,
    /// One a night.
    pub night_status: Vec<Status>,
    /// Beginning of each night, nanoseconds UTC.
    pub night_start: Vec<i64>,
    /// Hours in which the limits on the sky alone hold, one a night.
    pub dark_hours: Vec<f64>,
}

/// Fills in the quantities of every target on every night from that of the evening of `first_mjd` on.
///
/// A night reaches from local mean solar noon to noon. Hours agree with the sum of the exact windows to
/// 1 s (`tests/grid.rs` and `tests/test_accuracy_grid.py`). `progress` hears how many nights are done.
///
/// # Errors
/// Arrays or limits that do not fit, nights outside the ephemeris or before UTC, or the caller's wish
/// to stop.
pub fn visibility_grid(
    observer: &Observer<'_>,
    targets: &Targets<'_>,
    first_mjd: i64,
    nights: usize,
    limits: &Limits,
    mut columns: GridColumns<'_>,
    workers: &mut Workers<'_>,
    progress: &mut dyn FnMut(usize),
) -> Result<GridReport> {
    if nights == 0 || nights > MOST_NIGHTS {
        return Err(Error::invalid("nights", nights, format!("1 to {MOST_NIGHTS}")));
    }
    check(&columns, nights, targets.len())?;
    limits.check(targets.len())?;
    let season = Season::new(observer, targets, limits, Wanted::of(&columns), workers.isa())?;
    let mut report = GridReport { target_status: season.target_status(), ..GridReport::default() };
    let mut done = 0;
    while done < nights {
        let together = (nights - done).min(WEEKS * TOGETHER);
        let longitude = observer.site.longitude();
        let bounds = |from: usize, count: usize| {
            let first = first_mjd + from as i64;
            (night_bounds(first, longitude).0, night_bounds(first + count as i64 - 1, longitude).1)
        };
        let (start, stop) = bounds(done, together);
        let track = workers.track(track_plan(observer, start, stop)?, observer.ephemeris)?;
        let stretches: Vec<(usize, usize)> =
            (0..together).step_by(WEEKS).map(|from| (done + from, WEEKS.min(together - from))).collect();
        let days: Vec<Days<'_>> = workers.map(stretches.clone(), |(from, count)| {
            let (start, stop) = bounds(from, count);
            let mut days = Days::new(*observer, &track, start, stop)?;
            days.prepare(targets)?;
            Ok(days)
        })?;
        let spans: Vec<LimitedSpan<'_>> = workers.map(days.iter().collect(), |days| {
            LimitedSpan::new(days, season.exact_limits(), targets.len())
        })?;
        let tasks = stretches.iter().zip(&days).collect();
        let prepared: Vec<Vec<Night>> = workers.map(tasks, |(&(from, count), days)| {
            let dark = dark_stretches(days, limits)?;
            (from..from + count)
                .map(|i| Night::new(observer, &track, first_mjd + i as i64, &dark, season.bodies()))
                .collect()
        })?;
        for ((weeks, span), days) in prepared.iter().zip(&spans).zip(&days) {
            let (tiles, rest) = Tile::cut(columns, weeks.len(), targets.len());
            columns = rest;
            workers.for_each_with(tiles, TileSpace::default, |space, tile| {
                season.tile(weeks, span, days, tile, space);
            })?;
            for night in weeks {
                report.night_status.push(night.note);
                report.night_start.push(night.start.nanoseconds());
                report.dark_hours.push(night.dark.iter().map(|dark| dark.1 - dark.0).sum::<f64>() / 3600.0);
            }
            done += weeks.len();
            progress(done);
        }
    }
    Ok(report)
}
