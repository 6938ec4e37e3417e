//! From what is left of each day to windows: pieces are joined over midnight, and measured.

use super::day::DAY;
use super::intervals::IntervalSet;
use super::reason::Cause;
use super::sure;
use super::target::{LimitedSpan, Window, Workspace, note};
use crate::events::{DayPath, Passing};
use crate::horizon::altitude;
use crate::math::vector::Vector;

/// Part of a window within one day.
#[derive(Debug, Clone, Copy)]
pub(super) struct Piece {
    first: (usize, f64),
    last: (usize, f64),
    start_reason: u8,
    stop_reason: u8,
    best: (usize, f64),
    best_sin_altitude: f64,
    start_sure: Passing,
    stop_sure: Passing,
}

impl LimitedSpan<'_> {
    /// Turns what is left of the day into pieces, each with the instant at which the target is highest.
    pub(super) fn pieces<P: DayPath>(
        &self,
        index: usize,
        path: &P,
        row: usize,
        left: &IntervalSet,
        workspace: &mut Workspace,
    ) {
        let arc = &self.days.arcs[index];
        let Workspace { highest, pieces, .. } = workspace;
        for interval in left.iter() {
            highest.clear();
            path.highest(arc, interval.start, interval.stop, highest);
            let mut best = (interval.start, f64::NEG_INFINITY);
            for at in [interval.start, interval.stop].into_iter().chain(highest.iter().copied()) {
                let sin_altitude = path.local(arc, at)[2];
                if sin_altitude > best.1 {
                    best = (at, sin_altitude);
                }
            }
            let piece = Piece {
                first: (index, interval.start),
                last: (index, interval.stop),
                start_reason: interval.start_reason,
                stop_reason: interval.stop_reason,
                best: (index, best.0),
                best_sin_altitude: best.1,
                start_sure: sure::edge(self, interval.start_reason, index, path, row, interval.start),
                stop_sure: sure::edge(self, interval.stop_reason, index, path, row, interval.stop),
            };
            match pieces.last_mut() {
                // Where one day ends the next begins: the edge between them is none.
                Some(last) if goes_on(last, &piece, index) => {
                    last.last = piece.last;
                    last.stop_reason = piece.stop_reason;
                    last.stop_sure = piece.stop_sure;
                    if piece.best_sin_altitude > last.best_sin_altitude {
                        last.best = piece.best;
                        last.best_sin_altitude = piece.best_sin_altitude;
                    }
                }
                _ => pieces.push(piece),
            }
        }
    }

    /// Appends the pieces that are long enough as windows; whether there are any.
    pub(super) fn join(&self, row: usize, workspace: &mut Workspace, windows: &mut Vec<Window>) -> bool {
        let shortest_s = self.limits.window_min_s.as_ref().map_or(0.0, |column| column.at(row));
        let utc = |at: (usize, f64)| self.days.utc(&self.days.arcs[at.0], at.1);
        let Workspace { pieces, lost, stages, .. } = workspace;
        let lost_at = |day: Option<usize>, end: usize| {
            day.and_then(|day| lost.get(day)).map_or(Cause::None, |lost| lost[end])
        };
        let before = windows.len();
        for piece in pieces.iter() {
            let instant = |at: (usize, f64)| self.days.arcs[at.0].instant(at.1);
            let (start, stop) = (utc(piece.first), utc(piece.last));
            if stop.nanoseconds() <= start.nanoseconds()
                || (shortest_s > 0.0 && instant(piece.last).seconds_since(instant(piece.first)) < shortest_s)
            {
                continue;
            }
            // A limit that opens or closes at midnight itself was passed on the other day.
            let start_reason = match piece.start_reason {
                DAY => lost_at(piece.first.0.checked_sub(1), 1),
                code => Cause::from_code(code).unwrap_or(Cause::None),
            };
            let stop_reason = match piece.stop_reason {
                DAY => lost_at(piece.last.0.checked_add(1), 0),
                code => Cause::from_code(code).unwrap_or(Cause::None),
            };
            windows.push(Window {
                start,
                stop,
                start_reason,
                stop_reason,
                best_airmass: self.airmass(piece.best_sin_altitude),
                best_time: utc(piece.best),
                start_error_s: piece.start_sure.computed_error_s,
                stop_error_s: piece.stop_sure.computed_error_s,
                start_scatter_s: piece.start_sure.horizon_scatter_s,
                stop_scatter_s: piece.stop_sure.horizon_scatter_s,
                may_not_happen: piece.start_sure.may_not_happen || piece.stop_sure.may_not_happen,
            });
        }
        let found = windows.len() > before;
        if !pieces.is_empty() && !found {
            note(stages, Cause::WindowMin, false);
        }
        found
    }

    fn airmass(&self, sin_altitude: f64) -> f64 {
        let across: Vector = [(1.0 - sin_altitude * sin_altitude).max(0.0).sqrt(), 0.0, sin_altitude];
        let topocentric = altitude(across);
        let observed = self.days.observer().refraction.observed_altitude(topocentric);
        self.limits.airmass_model.airmass(observed, topocentric)
    }
}

/// Whether a piece of day `index` goes on where the last one ended. Where rounding has put the crossing of
/// a limit on one side of midnight for one day and on the other for the next, what is between is none.
fn goes_on(last: &Piece, piece: &Piece, index: usize) -> bool {
    const ROUNDING: f64 = 1e-9;
    let ends = last.stop_reason == DAY || last.last.1 >= 1.0 - ROUNDING;
    let begins = piece.start_reason == DAY || piece.first.1 <= ROUNDING;
    let joint = last.stop_reason == DAY || piece.start_reason == DAY;
    last.last.0 + 1 == index && ends && begins && joint
}
