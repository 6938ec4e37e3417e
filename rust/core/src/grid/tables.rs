//! Events and windows of many targets as columns: rows of one target stand together, and `offsets`
//! says where each target's begin (compressed sparse rows).

use super::parallel::Workers;
use crate::astrometry::{Catalog, Targets};
use crate::constants::RADIANS_PER_DEGREE;
use crate::error::{Error, Result, Status};
use crate::events::{BATCH, BatchSpace, Days, Event, Passage, rise_transit_set, star_events};
use crate::windows::{Column, LimitedSpan, Limits, TargetWindows, Window, Workspace};

/// Targets a block: some milliseconds of work for one night.
const BLOCK: usize = 1024;
/// Target-days a block at the most, so that a long span is cut finer.
const BLOCK_DAYS: usize = 4096;

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

/// Windows of many targets.
#[derive(Debug, Default)]
pub struct WindowTable {
    /// Target i's windows are rows `offsets[i]..offsets[i + 1]`.
    pub offsets: Vec<i64>,
    /// Nanoseconds UTC since 1970-01-01: first instant in the window.
    pub start: Vec<i64>,
    /// First instant after it.
    pub stop: Vec<i64>,
    /// Codes of [`crate::windows::Cause`].
    pub start_reason: Vec<u8>,
    /// Codes of [`crate::windows::Cause`].
    pub stop_reason: Vec<u8>,
    /// Airmass where the target stands highest.
    pub best_airmass: Vec<f64>,
    /// When that is, nanoseconds UTC.
    pub best_time: Vec<i64>,
    /// Error of the computed start, seconds.
    pub start_error_s: Vec<f64>,
    /// Error of the computed stop, seconds.
    pub stop_error_s: Vec<f64>,
    /// Scatter of the start by refraction, seconds.
    pub start_scatter_s: Vec<f64>,
    /// Scatter of the stop by refraction, seconds.
    pub stop_scatter_s: Vec<f64>,
    /// Whether an edge is a grazing that may not happen at all.
    pub may_not_happen: Vec<bool>,
    /// Codes of [`Status`], one a target.
    pub status: Vec<u8>,
    /// Codes of [`crate::windows::Cause`], one a target.
    pub blocked_by: Vec<u8>,
}

/// A block's rows: what was found, and for each target how much and what is to be said.
struct Block<Row, Summary> {
    rows: Vec<Row>,
    targets: Vec<(usize, Summary)>,
}

/// Runs `work` for every target and returns the blocks in order.
fn by_target<Row: Send, Summary: Send, Space: Default>(
    targets: usize,
    days: usize,
    workers: &mut Workers<'_>,
    work: impl Fn(usize, &mut Space, &mut Vec<Row>) -> Summary + Sync,
) -> Result<Vec<Block<Row, Summary>>> {
    let size = (BLOCK_DAYS / days.max(1)).clamp(1, BLOCK);
    let mut slots: Vec<Option<Block<Row, Summary>>> = Vec::new();
    slots.resize_with(targets.div_ceil(size), || None);
    workers.for_each(slots.iter_mut().enumerate().collect(), |(number, slot)| {
        let mut space = Space::default();
        let range = number * size..targets.min((number + 1) * size);
        let mut block = Block { rows: Vec::new(), targets: Vec::with_capacity(range.len()) };
        for target in range {
            let before = block.rows.len();
            let summary = work(target, &mut space, &mut block.rows);
            block.targets.push((block.rows.len() - before, summary));
        }
        *slot = Some(block);
    })?;
    slots.into_iter().collect::<Option<Vec<_>>>().ok_or_else(Error::interrupted)
}

fn offsets<Row, Summary>(blocks: &[Block<Row, Summary>]) -> Vec<i64> {
    let counts = blocks.iter().flat_map(|block| block.targets.iter().map(|target| target.0 as i64));
    std::iter::once(0)
        .chain(counts.scan(0, |total, count| {
            *total += count;
            Some(*total)
        }))
        .collect()
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
    let blocks = match targets {
        Targets::Catalog(catalog) => star_blocks(days, catalog, threshold, workers)?,
        Targets::Bodies(_) | Targets::Orbits(_) => by_target(
            targets.len(),
            days.arcs.len(),
            workers,
            |row, (): &mut (), events: &mut Vec<Event>| {
                rise_transit_set(days, targets, row, threshold, events)
            },
        )?,
    };
    let mut table = EventTable { offsets: offsets(&blocks), ..EventTable::default() };
    for (passage, status) in blocks.iter().flat_map(|block| block.targets.iter().map(|target| target.1)) {
        table.passage.push(passage as u8);
        table.status.push(status as u8);
    }
    table.fill(&blocks, workers)?;
    Ok(table)
}

/// The events of a catalogue, batch by batch.
fn star_blocks(
    days: &Days<'_>,
    catalog: &Catalog,
    threshold: f64,
    workers: &mut Workers<'_>,
) -> Result<Vec<Block<Event, (Passage, Status)>>> {
    let isa = workers.isa();
    let mut slots: Vec<Option<Block<Event, (Passage, Status)>>> = Vec::new();
    slots.resize_with(catalog.len().div_ceil(BATCH), || None);
    let tasks = slots.iter_mut().enumerate().collect();
    workers.for_each_with(
        tasks,
        Box::<BatchSpace>::default,
        |space, (number, slot): (usize, &mut Option<_>)| {
            let rows = number * BATCH..catalog.len().min((number + 1) * BATCH);
            let mut block =
                Block { rows: Vec::with_capacity(4 * rows.len()), targets: Vec::with_capacity(rows.len()) };
            star_events(days, catalog, rows, threshold, isa, space, &mut block.rows, &mut block.targets);
            *slot = Some(block);
        },
    )?;
    slots.into_iter().collect::<Option<Vec<_>>>().ok_or_else(Error::interrupted)
}

impl EventTable {
    /// Writes the events into the columns, a block's by one thread.
    fn fill(&mut self, blocks: &[Block<Event, (Passage, Status)>], workers: &mut Workers<'_>) -> Result<()> {
        let rows: usize = blocks.iter().map(|block| block.rows.len()).sum();
        self.kind = vec![0; rows];
        self.time = vec![0; rows];
        self.azimuth_deg = vec![0.0; rows];
        self.altitude_deg = vec![0.0; rows];
        self.computed_error_s = vec![0.0; rows];
        self.horizon_scatter_s = vec![0.0; rows];
        self.may_not_happen = vec![false; rows];
        let mut kind = &mut self.kind[..];
        let mut time = &mut self.time[..];
        let mut azimuth = &mut self.azimuth_deg[..];
        let mut altitude = &mut self.altitude_deg[..];
        let mut error = &mut self.computed_error_s[..];
        let mut scatter = &mut self.horizon_scatter_s[..];
        let mut doubt = &mut self.may_not_happen[..];
        let mut tasks = Vec::with_capacity(blocks.len());
        for block in blocks {
            let n = block.rows.len();
            tasks.push((
                &block.rows,
                cut(&mut kind, n),
                cut(&mut time, n),
                cut(&mut doubt, n),
                [cut(&mut azimuth, n), cut(&mut altitude, n), cut(&mut error, n), cut(&mut scatter, n)],
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
fn cut<'a, T>(rest: &mut &'a mut [T], n: usize) -> &'a mut [T] {
    let (first, after) = std::mem::take(rest).split_at_mut(n);
    *rest = after;
    first
}

/// Windows of every target over the span; `position_error`, radians, is how far each catalogue place may be
/// off, and goes into the errors.
///
/// # Errors
/// The caller's wish to stop, limits that do not fit, or a span that the ephemeris does not cover.
pub fn window_table(
    days: &mut Days<'_>,
    targets: &Targets<'_>,
    limits: &Limits,
    position_error: Option<Column>,
    workers: &mut Workers<'_>,
) -> Result<WindowTable> {
    days.prepare(targets)?;
    let mut span = LimitedSpan::new(days, limits, targets.len())?;
    if let Some(error) = position_error {
        span = span.with_position_error(error, targets.len())?;
    }
    let blocks = by_target(
        targets.len(),
        days.arcs.len(),
        workers,
        |row, space: &mut Workspace, windows: &mut Vec<Window>| span.windows(targets, row, space, windows),
    )?;
    let mut table = WindowTable { offsets: offsets(&blocks), ..WindowTable::default() };
    for block in &blocks {
        for window in &block.rows {
            table.start.push(window.start.nanoseconds());
            table.stop.push(window.stop.nanoseconds());
            table.start_reason.push(window.start_reason as u8);
            table.stop_reason.push(window.stop_reason as u8);
            table.best_airmass.push(window.best_airmass);
            table.best_time.push(window.best_time.nanoseconds());
            table.start_error_s.push(window.start_error_s);
            table.stop_error_s.push(window.stop_error_s);
            table.start_scatter_s.push(window.start_scatter_s);
            table.stop_scatter_s.push(window.stop_scatter_s);
            table.may_not_happen.push(window.may_not_happen);
        }
        for (_, summary) in &block.targets {
            let summary: &TargetWindows = summary;
            table.status.push(summary.status as u8);
            table.blocked_by.push(summary.blocked_by as u8);
        }
    }
    Ok(table)
}
