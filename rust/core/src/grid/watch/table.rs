//! The windows of a night in the form in which an instant is looked up: no search for most rows.
//!
//! Nearly every row has one window or none. The first window of each row stands in flat columns that a loop
//! runs over on whole registers; the few rows that have more are then done one by one.

use crate::error::{Error, Result};
use crate::math::dispatch::{Arithmetic, Kernel};
use crate::windows::Cause;
use std::ops::Range;

/// Where a row without a window would have it: never.
const NEVER: i64 = i64::MAX;
const NANOSECONDS_PER_SECOND: f64 = 1e9;

/// Windows as [`WindowTable`](super::super::WindowTable) has them: what a watch is made of.
#[derive(Debug, Clone, Copy)]
pub struct WatchedWindows<'a> {
    /// Target i's windows are rows `offsets[i]..offsets[i + 1]`, in order of time.
    pub offsets: &'a [i64],
    /// Nanoseconds UTC since 1970-01-01: first instant in the window.
    pub start: &'a [i64],
    /// First instant after it.
    pub stop: &'a [i64],
    /// Codes of [`Cause`].
    pub stop_reason: &'a [u8],
    /// Codes of [`Status`](crate::error::Status), one a target.
    pub status: &'a [u8],
}

impl WatchedWindows<'_> {
    /// How many targets there are, if the columns fit one another.
    fn targets(&self) -> Result<usize> {
        let (targets, windows) = (self.status.len(), self.start.len());
        for (name, length, allowed) in [
            ("offsets", self.offsets.len(), targets + 1),
            ("stop", self.stop.len(), windows),
            ("stop_reason", self.stop_reason.len(), windows),
        ] {
            if length != allowed {
                return Err(Error::invalid(name, format!("{length} values"), allowed.to_string()));
            }
        }
        let from_end_to_end = self.offsets.first() == Some(&0)
            && self.offsets.last() == Some(&(windows as i64))
            && self.offsets.is_sorted();
        if !from_end_to_end {
            let allowed = format!("numbers that rise from 0 to {windows}, the number of windows");
            return Err(Error::invalid("offsets", "others", allowed));
        }
        Ok(targets)
    }
}

/// The layout.
#[derive(Debug, Clone)]
pub(super) struct Table {
    /// The first window of each row; [`NEVER`] where there is none.
    start: Vec<i64>,
    stop: Vec<i64>,
    stop_reason: Vec<u8>,
    status: Vec<u8>,
    /// The rows that have more, ascending, and all their windows: row `more[i]` has those from
    /// `more_offsets[i]` to `more_offsets[i + 1]`.
    more: Vec<usize>,
    more_offsets: Vec<usize>,
    windows: Vec<Window>,
}

#[derive(Debug, Clone, Copy)]
struct Window {
    start: i64,
    stop: i64,
    stop_reason: u8,
}

impl Table {
    pub fn new(windows: &WatchedWindows<'_>) -> Result<Self> {
        let targets = windows.targets()?;
        let mut table = Table {
            start: vec![NEVER; targets],
            stop: vec![NEVER; targets],
            stop_reason: vec![Cause::None as u8; targets],
            status: windows.status.to_vec(),
            more: Vec::new(),
            more_offsets: vec![0],
            windows: Vec::new(),
        };
        for row in 0..targets {
            let (first, last) = (windows.offsets[row] as usize, windows.offsets[row + 1] as usize);
            if first == last {
                continue;
            }
            table.start[row] = windows.start[first];
            table.stop[row] = windows.stop[first];
            table.stop_reason[row] = windows.stop_reason[first];
            if last - first > 1 {
                table.more.push(row);
                table.windows.extend((first..last).map(|at| Window {
                    start: windows.start[at],
                    stop: windows.stop[at],
                    stop_reason: windows.stop_reason[at],
                }));
                table.more_offsets.push(table.windows.len());
            }
        }
        Ok(table)
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.status.len()
    }
}

/// What is looked up of a block's rows.
pub(super) struct Lookup<'a> {
    pub table: &'a Table,
    pub rows: Range<usize>,
    /// Nanoseconds UTC since 1970-01-01.
    pub when: i64,
    pub up: &'a mut [bool],
    pub stop_reason: &'a mut [u8],
    pub seconds_left: Option<&'a mut [f64]>,
    pub seconds_to_next: Option<&'a mut [f64]>,
    /// Holds what the places say; the worse of the two is left.
    pub status: &'a mut [u8],
}

/// Seconds from an instant to a later one; as numpy divides a timedelta64.
#[inline(always)]
fn seconds(nanoseconds: i64) -> f64 {
    nanoseconds as f64 / NANOSECONDS_PER_SECOND
}

/// The reasons of the rows that are up; the code of [`Cause::None`], 0, in the others.
///
/// Functions of their own, because bytes may be anything to the compiler: only of arguments does it know that
/// they do not overlap.
#[inline(always)]
fn keep_where(up: &[bool], reasons: &[u8], out: &mut [u8]) {
    for ((out, &reason), &up) in out.iter_mut().zip(reasons).zip(up) {
        *out = reason & u8::from(up).wrapping_neg();
    }
}

/// The worse of two statuses, as [`Status::worst`](crate::error::Status::worst).
#[inline(always)]
fn worst(status: &mut [u8], others: &[u8]) {
    for (status, &other) in status.iter_mut().zip(others) {
        *status = (*status).max(other);
    }
}

impl Kernel for Lookup<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(mut self) {
        let (rows, when) = (self.rows.len(), self.when);
        // Every column visibly of so many rows: no bounds check, no branch.
        let first = self.rows.start;
        let start = &self.table.start[first..][..rows];
        let stop = &self.table.stop[first..][..rows];
        let reason = &self.table.stop_reason[first..][..rows];
        let of_windows = &self.table.status[first..][..rows];
        let up = &mut self.up[..rows];
        for row in 0..rows {
            up[row] = (start[row] <= when) & (when < stop[row]);
        }
        keep_where(up, reason, &mut self.stop_reason[..rows]);
        worst(&mut self.status[..rows], of_windows);
        if let Some(left) = &mut self.seconds_left {
            let left = &mut left[..rows];
            for row in 0..rows {
                let is_up = (start[row] <= when) & (when < stop[row]);
                let seconds = seconds(stop[row].wrapping_sub(when));
                left[row] = if is_up { seconds } else { f64::NAN };
            }
        }
        if let Some(to_next) = &mut self.seconds_to_next {
            let to_next = &mut to_next[..rows];
            for row in 0..rows {
                let is_ahead = (when < start[row]) & (start[row] != NEVER);
                let seconds = seconds(start[row].wrapping_sub(when));
                to_next[row] = if is_ahead { seconds } else { f64::NAN };
            }
        }
        self.rows_with_more();
    }
}

impl Lookup<'_> {
    /// The rows of which the first window does not say all.
    #[inline(always)]
    fn rows_with_more(&mut self) {
        let Table { more, more_offsets, windows, .. } = self.table;
        let first = more.partition_point(|&row| row < self.rows.start);
        let last = more.partition_point(|&row| row < self.rows.end);
        for index in first..last {
            let row = more[index] - self.rows.start;
            let windows = &windows[more_offsets[index]..more_offsets[index + 1]];
            let begun = windows.partition_point(|window| window.start <= self.when);
            let now = windows[..begun].last().filter(|window| self.when < window.stop);
            self.up[row] = now.is_some();
            self.stop_reason[row] = now.map_or(Cause::None as u8, |window| window.stop_reason);
            if let Some(left) = &mut self.seconds_left {
                left[row] = now.map_or(f64::NAN, |window| seconds(window.stop - self.when));
            }
            if let Some(to_next) = &mut self.seconds_to_next {
                let next = windows.get(begun);
                to_next[row] = next.map_or(f64::NAN, |window| seconds(window.start - self.when));
            }
        }
    }
}
