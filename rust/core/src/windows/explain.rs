//! Why a target's windows are what they are: each limit alone, and what is left after it.

use super::intervals::{Interval, IntervalSet};
use super::reason::Cause;
use super::target::{LimitedSpan, TargetWindows, Window, Workspace};
use crate::astrometry::{Star, Targets};
use crate::events::StarArc;
use crate::time::Utc;

/// A half-open interval of UTC.
pub type UtcInterval = (Utc, Utc);

/// One limit of an explanation.
#[derive(Debug, Clone)]
pub struct LimitExplained {
    /// The limit.
    pub cause: Cause,
    /// Where it alone holds, in order.
    pub alone: Vec<UtcInterval>,
    /// What it and all limits before it leave, in order.
    pub left: Vec<UtcInterval>,
}

/// When each limit holds for one target, and how they intersect.
#[derive(Debug, Clone)]
pub struct Explanation {
    /// The limits in the order in which they are applied. Of a shortest window, `left` is what is long enough;
    /// alone it holds always.
    pub limits: Vec<LimitExplained>,
    /// The windows.
    pub windows: Vec<Window>,
    /// What came of the target.
    pub outcome: TargetWindows,
}

impl LimitedSpan<'_> {
    /// Explains one target.
    ///
    /// Cables are explained on what the limits before them leave, since they bind only what is followed.
    pub fn explain(&self, targets: &Targets<'_>, row: usize) -> Explanation {
        let mut workspace = Workspace::default();
        let mut windows = Vec::new();
        let outcome = self.windows(targets, row, &mut workspace, &mut windows);
        if outcome.blocked_by == Cause::BadRow {
            return Explanation { limits: Vec::new(), windows, outcome };
        }
        let mut limits: Vec<LimitExplained> = Cause::ORDER
            .into_iter()
            .filter(|&cause| self.limits.has(cause))
            .map(|cause| LimitExplained { cause, alone: Vec::new(), left: Vec::new() })
            .collect();
        for index in 0..self.limited.len() {
            match targets {
                Targets::Catalog(catalog) => {
                    let star = catalog.star(row);
                    let path = StarArc::new(&self.days.arcs[index], &star);
                    self.explain_day(index, &path, Some(&star), row, &mut workspace, &mut limits);
                }
                Targets::Bodies(_) | Targets::Orbits(_) => {
                    // That the ephemeris reaches so far is known from the windows.
                    if let Ok(path) = self.days.moving(index, targets, row) {
                        self.explain_day(index, &path, None, row, &mut workspace, &mut limits);
                    }
                }
            }
        }
        if let Some(last) = limits.iter_mut().find(|limit| limit.cause == Cause::WindowMin) {
            last.alone = vec![(self.days.start, self.days.stop)];
            last.left = windows.iter().map(|window| (window.start, window.stop)).collect();
        }
        Explanation { limits, windows, outcome }
    }

    fn explain_day<P: super::limits::Turning>(
        &self,
        index: usize,
        path: &P,
        star: Option<&Star>,
        row: usize,
        workspace: &mut Workspace,
        limits: &mut [LimitExplained],
    ) {
        let day = &self.limited[index];
        let range: Interval = day.range;
        let within = (range.start, range.stop);
        let (mut left, mut set, mut scratch) = (IntervalSet::new(), IntervalSet::new(), IntervalSet::new());
        left.push(range);
        for limit in limits.iter_mut().filter(|limit| limit.cause != Cause::WindowMin) {
            match day.alone.iter().find(|alone| alone.0 == limit.cause) {
                Some((_, alone)) => set.clone_from(alone),
                None => self.fill(limit.cause, index, path, star, row, within, workspace, &mut set),
            }
            left.intersect(&set, &mut scratch);
            self.append(index, &set, &mut limit.alone);
            self.append(index, &left, &mut limit.left);
        }
    }

    /// Appends a day's intervals; one that begins where the last ended goes on with it.
    fn append(&self, index: usize, set: &IntervalSet, intervals: &mut Vec<UtcInterval>) {
        const ROUNDING_NS: i64 = 1_000;
        for interval in set.iter() {
            let utc = |at: f64| self.days.utc(&self.days.arcs[index], at);
            let (start, stop) = (utc(interval.start), utc(interval.stop));
            match intervals.last_mut() {
                Some(last)
                    if interval.start <= 0.0 && start.nanoseconds() - last.1.nanoseconds() <= ROUNDING_NS =>
                {
                    last.1 = stop;
                }
                _ if start < stop => intervals.push((start, stop)),
                _ => {}
            }
        }
    }
}
