//! Events of many targets as columns: rows of one target stand together, and `offsets` says where each
//! target's begin (compressed sparse rows).
//!
//! Targets are taken in rounds of batches: a round's events stand in space that is used again for the
//! next, and are copied into the columns by all threads. What memory costs at its first touch, which for
//! a million stars is more than their astronomy, is paid for the columns alone.

use super::parallel::Workers;
use crate::astrometry::Targets;
use crate::constants::RADIANS_PER_DEGREE;
use crate::error::{Result, Status};
use crate::events::{BATCH, BatchSpace, Days, Event, Passage, rise_transit_set, star_events};

/// Batches a round for a span of one day.
const ROUND: usize = 256;

/// Events of many targets.
#[derive(Debug, Default)]
pub struct EventTable {
    /// Target i's events are rows `offsets[i]..offsets[i + 1]`.
    pub offsets: Vec<i64>,
    /// Codes of [`crate::events::EventKind`].
    pub kind: Vec<u8>,
    /// Nanoseconds UTC since 1970-01-01.
    pub time: Vec<i64>,
    /// Azimuth, degrees.
    pub azimuth_deg: Vec<f64>,
    /// Observed altitude, degrees.
    pub altitude_deg: Vec<f64>,
    /// Seconds.
    pub computed_error_s: Vec<f64>,
    /// Seconds.
    pub horizon_scatter_s: Vec<f64>,
    /// Whether the event is a grazing that may not happen at all.
    pub may_not_happen: Vec<bool>,
    /// Codes of [`Passage`], one a target.
    pub passage: Vec<u8>,
    /// Codes of [`Status`], one a target.
    pub status: Vec<u8>,
}

/// The events of one batch, and for each of its targets how many and what is to be said.
#[derive(Default)]
struct Batch {
    events: Vec<Event>,
    targets: Vec<(usize, (Passage, Status))>,
}

/// Rise, transit and set of every target over the span; `threshold` is an observed altitude, radians.
///
/// # Errors
/// The caller's wish to stop, or a span that the targets' ephemeris does not cover.
pub fn event_table(
    days: &mut Days<'_>,
    targets: &Targets<'_>,
    threshold: f64,
    workers: &mut Workers<'_>,
) -> Result<EventTable> {
    days.prepare(targets)?;
    let days = &*days;
    let isa = workers.isa();
    let rows = targets.len();
    let mut batches: Vec<Batch> = Vec::new();
    batches.resize_with((ROUND / days.arcs.len()).clamp(4, ROUND), Batch::default);
    let mut table = EventTable { offsets: Vec::with_capacity(rows + 1), ..EventTable::default() };
    table.offsets.push(0);
    let (mut first, mut found) = (0, 0);
    while first < rows {
        let round = batches.len().min((rows - first).div_ceil(BATCH));
        let tasks = batches[..round].iter_mut().enumerate().collect();
        workers.for_each_with(
            tasks,
            Box::<BatchSpace>::default,
            |space, (number, batch): (usize, &mut Batch)| {
                let from = first + number * BATCH;
                let range = from..rows.min(from + BATCH);
                batch.events.clear();
                batch.targets.clear();
                match targets {
                    Targets::Catalog(catalog) => {
                        let Batch { events, targets } = batch;
                        star_events(days, catalog, range, threshold, isa, space, events, targets);
                    }
                    Targets::Bodies(_) | Targets::Orbits(_) => {
                        for row in range {
                            let before = batch.events.len();
                            let said = rise_transit_set(days, targets, row, threshold, &mut batch.events);
                            batch.targets.push((batch.events.len() - before, said));
                        }
                    }
                }
            },
        )?;
        let done = first + batches[..round].iter().map(|batch| batch.targets.len()).sum::<usize>();
        let more: usize = batches[..round].iter().map(|batch| batch.events.len()).sum();
        table.make_room(found + more, rows as f64 / done as f64);
        table.append(&batches[..round], found, workers)?;
        (first, found) = (done, found + more);
    }
    table.cut(found);
    Ok(table)
}

impl EventTable {
    /// Makes the columns long enough for `rows` events; where they must grow, by the factor by which the
    /// events are expected to grow yet. What is allocated as zeros is not touched before it is used.
    fn make_room(&mut self, rows: usize, expected: f64) {
        if rows <= self.time.len() {
            return;
        }
        let wanted = (rows as f64 * expected * 1.05) as usize + 64;
        if self.time.is_empty() {
            *self = EventTable {
                kind: vec![0; wanted],
                time: vec![0; wanted],
                azimuth_deg: vec![0.0; wanted],
                altitude_deg: vec![0.0; wanted],
                computed_error_s: vec![0.0; wanted],
                horizon_scatter_s: vec![0.0; wanted],
                may_not_happen: vec![false; wanted],
                ..std::mem::take(self)
            };
        }
        self.cut(wanted);
    }

    /// Makes the columns `rows` long.
    fn cut(&mut self, rows: usize) {
        self.kind.resize(rows, 0);
        self.time.resize(rows, 0);
        self.may_not_happen.resize(rows, false);
        for column in [
            &mut self.azimuth_deg,
            &mut self.altitude_deg,
            &mut self.computed_error_s,
            &mut self.horizon_scatter_s,
        ] {
            column.resize(rows, 0.0);
        }
    }

    /// Writes a round's events from row `found` on, a batch's by one thread.
    fn append(&mut self, batches: &[Batch], found: usize, workers: &mut Workers<'_>) -> Result<()> {
        for (count, (passage, status)) in batches.iter().flat_map(|batch| &batch.targets) {
            let total = self.offsets.last().map_or(0, |last| last + *count as i64);
            self.offsets.push(total);
            self.passage.push(*passage as u8);
            self.status.push(*status as u8);
        }
        let mut kind = &mut self.kind[found..];
        let mut time = &mut self.time[found..];
        let mut azimuth = &mut self.azimuth_deg[found..];
        let mut altitude = &mut self.altitude_deg[found..];
        let mut error = &mut self.computed_error_s[found..];
        let mut scatter = &mut self.horizon_scatter_s[found..];
        let mut doubt = &mut self.may_not_happen[found..];
        let mut tasks = Vec::with_capacity(batches.len());
        for batch in batches {
            let n = batch.events.len();
            tasks.push((
                &batch.events,
                take(&mut kind, n),
                take(&mut time, n),
                take(&mut doubt, n),
                [take(&mut azimuth, n), take(&mut altitude, n), take(&mut error, n), take(&mut scatter, n)],
            ));
        }
        workers.for_each(tasks, |(events, kind, time, doubt, [azimuth, altitude, error, scatter])| {
            for (i, event) in events.iter().enumerate() {
                kind[i] = event.kind as u8;
                time[i] = event.time.nanoseconds();
                azimuth[i] = event.azimuth / RADIANS_PER_DEGREE;
                altitude[i] = event.altitude / RADIANS_PER_DEGREE;
                error[i] = event.computed_error_s;
                scatter[i] = event.horizon_scatter_s;
                doubt[i] = event.may_not_happen;
            }
        })
    }
}

/// Takes the first `n` values off a slice.
fn take<'a, T>(rest: &mut &'a mut [T], n: usize) -> &'a mut [T] {
    let (first, after) = std::mem::take(rest).split_at_mut(n);
    *rest = after;
    first
}
