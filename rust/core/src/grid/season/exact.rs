//! The exact windows of a target over some weeks, night by night.

use super::columns::{NightSummary, Wanted};
use super::night::Night;
use crate::astrometry::{Moving, Observer, Targets};
use crate::error::Status;
use crate::windows::intervals::{Interval, IntervalSet};
use crate::windows::{LimitedSpan, TargetWindows, Window, Workspace};

/// The windows of one target over the weeks, and those of one night.
#[derive(Debug)]
pub(super) struct ExactNights {
    workspace: Workspace,
    pub windows: Vec<Window>,
    status: Status,
    night: IntervalSet,
}

impl Default for ExactNights {
    fn default() -> Self {
        ExactNights {
            workspace: Workspace::default(),
            windows: Vec::new(),
            status: Status::Ok,
            night: IntervalSet::new(),
        }
    }
}

impl ExactNights {
    /// Works out the windows of a target.
    pub fn compute(&mut self, targets: &Targets<'_>, row: usize, span: &LimitedSpan<'_>) {
        self.windows.clear();
        let TargetWindows { status, .. } = span.windows(targets, row, &mut self.workspace, &mut self.windows);
        self.status = status;
    }

    /// Those of a night, seconds from its middle; `None` for a bad row.
    pub fn of_night(
        &mut self,
        observer: &Observer<'_>,
        night: &Night,
        shortest_s: f64,
    ) -> Option<&IntervalSet> {
        if self.status.is_bad() {
            return None;
        }
        let leap_seconds = observer.orientation.leap_seconds();
        let seconds = |utc| leap_seconds.to_tai(utc).map_or(f64::NAN, |tai| tai.seconds_since(night.middle));
        let (from, to) = (seconds(night.start), seconds(night.stop));
        self.night.clear();
        for window in &self.windows {
            if window.stop.nanoseconds() <= night.start.nanoseconds()
                || window.start.nanoseconds() >= night.stop.nanoseconds()
            {
                continue;
            }
            let (start, stop) = (seconds(window.start).max(from), seconds(window.stop).min(to));
            if stop - start >= shortest_s {
                self.night.push(Interval { start, stop, start_reason: 0, stop_reason: 0 });
            }
        }
        Some(&self.night)
    }

    /// What is wanted of a moving target's windows on a night.
    pub fn moving(
        &mut self,
        target: Moving<'_>,
        days: &crate::events::Days<'_>,
        night: &Night,
        shortest_s: f64,
        wanted: &Wanted,
    ) -> Option<NightSummary> {
        let observer = *days.observer();
        self.of_night(&observer, night, shortest_s)?;
        super::movers::summary(target, days, night, &self.night, &self.windows, wanted)
    }
}
