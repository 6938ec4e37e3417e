//! Windows of many targets as columns: rows of one target stand together, and `offsets` says where each
//! target's begin (compressed sparse rows).

use super::parallel::Workers;
use crate::astrometry::Targets;
use crate::error::{Error, Result};
use crate::events::Days;
use crate::windows::{Column, LimitedSpan, Limits, TargetWindows, Window, Workspace};

/// Targets a block: some milliseconds of work for one night.
const BLOCK: usize = 1024;
/// Target-days a block at the most, so that a long span is cut finer.
const BLOCK_DAYS: usize = 4096;

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
    /// Codes of [`Status`](crate::error::Status), one a target.
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
