//! The azimuth as it is followed through a day: monotone pieces, its rate, and the cables' range.
//!
//! A star's azimuth turns back where its parallactic angle is ±90°, which is where
//! sin h = sin φ / sin δ (from dA/dt cos²h = ω (sin φ − sin h sin δ), the derivative of the azimuth of the
//! spherical triangle, e.g. Urban & Seidelmann (2013) §7.1.3): one more circle about the zenith. For a
//! body, the crossings of a series. Between two turnings the azimuth takes each value once.

use super::super::intervals::{Interval, IntervalSet};
use crate::constants::{EARTH_ROTATION_RAD_PER_S, SECONDS_PER_DAY, TURN};
use crate::events::{Arc, Crossing, DayPath};
use crate::horizon::azimuth;
use crate::math::chebyshev::Chebyshev;
use crate::math::roots::newton_between;

/// Coefficients over half a day of what goes through two turns a day: J_k(π) is below 1e-16 from the 22nd.
const NODES: usize = 25;
/// The longest piece, days: short enough that the azimuth moves by less than a turn.
const LONGEST: f64 = 0.25;
/// A Newton step below this, in days, is the last: 0.9 µs.
const LAST_STEP_D: f64 = 1e-11;

/// A branch that lasts no longer than this, in days, is none: 86 µs.
const SHORTEST: f64 = 1e-9;
/// What is left of a turn when rounding has carried the azimuth back over its beginning.
const ROUNDING: f64 = 1e-7;

/// cos²h · dA/dt, radians a day, and cos²h.
#[inline(always)]
fn turning_rate(local: [f64; 3], rate: [f64; 3]) -> (f64, f64) {
    (local[0] * rate[1] - local[1] * rate[0], local[0] * local[0] + local[1] * local[1])
}

/// Where the azimuth turns back.
pub trait Turning: DayPath {
    /// Appends instants that divide the day into parts in which the azimuth moves one way.
    fn azimuth_turns(&self, arc: &Arc<'_>, within: (f64, f64), at: &mut Vec<f64>);
    /// Whether the azimuth may somewhere be faster than so much a day; false only when it surely is not.
    fn may_turn_faster(&self, arc: &Arc<'_>, most_per_day: f64) -> bool;
}

impl Turning for crate::events::StarArc {
    fn azimuth_turns(&self, arc: &Arc<'_>, within: (f64, f64), at: &mut Vec<f64>) {
        let sin_altitude = arc.latitude.sin / self.sin_declination();
        if sin_altitude.abs() < 1.0 {
            let mut crossings: Vec<Crossing> = Vec::new();
            self.plane_crossings(arc, arc.zenith(), sin_altitude, within, &mut crossings);
            at.extend(crossings.iter().map(|crossing| crossing.at));
        }
    }

    fn may_turn_faster(&self, arc: &Arc<'_>, most_per_day: f64) -> bool {
        // Concave in the sine of the altitude: the least is at one of the culminations.
        const TURN_PER_DAY: f64 = EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY;
        let (sin_latitude, sin_declination) = (arc.latitude.sin, self.sin_declination());
        let swing = arc.latitude.cos.abs() * (1.0 - sin_declination * sin_declination).max(0.0).sqrt();
        let spare = |sine: f64| {
            most_per_day * (1.0 - sine * sine) - TURN_PER_DAY * (sin_latitude - sine * sin_declination).abs()
        };
        let middle = sin_latitude * sin_declination;
        // The circle leaves out 2e-6 of each sine.
        spare(middle + swing).min(spare(middle - swing)) < 1e-4 * (most_per_day + TURN_PER_DAY)
    }
}

impl Turning for crate::events::BodyArc {
    fn azimuth_turns(&self, arc: &Arc<'_>, _: (f64, f64), at: &mut Vec<f64>) {
        for (start, stop) in [(0.0, 0.5), (0.5, 1.0)] {
            let series = Chebyshev::<NODES>::fit(start, stop, |fraction| {
                let (local, rate) = self.local_and_rate(arc, fraction);
                turning_rate(local, rate).0
            });
            at.extend(series.crossings().iter().map(|crossing| crossing.at));
        }
    }

    /// No bound is known for a body, so none is used.
    fn may_turn_faster(&self, _: &Arc<'_>, _: f64) -> bool {
        true
    }
}

/// A part of a day in which the azimuth moves one way.
#[derive(Debug, Clone, Copy)]
pub struct AzimuthPiece {
    /// First and last instant.
    pub from: f64,
    pub to: f64,
    /// Azimuth at the first, counted on from the beginning of the walk.
    pub azimuth: f64,
    /// How far it moves, at least 0, and which way: +1 through east, −1 through west.
    pub swing: f64,
    pub way: f64,
}

/// The azimuth over a part of a day, counted on through any number of turns.
#[derive(Debug, Default)]
pub struct AzimuthWalk {
    pub pieces: Vec<AzimuthPiece>,
    cuts: Vec<f64>,
}

impl AzimuthWalk {
    /// Divides `from` to `to`.
    pub fn walk<P: Turning>(&mut self, arc: &Arc<'_>, path: &P, from: f64, to: f64) {
        let AzimuthWalk { pieces, cuts } = self;
        pieces.clear();
        cuts.clear();
        path.azimuth_turns(arc, (from, to), cuts);
        cuts.retain(|&at| at > from && at < to);
        cuts.sort_by(f64::total_cmp);
        cuts.push(to);
        let mut start = from;
        let mut at_start = azimuth(path.local(arc, from));
        for &cut in cuts.iter() {
            let parts = ((cut - start) / LONGEST).ceil().max(1.0);
            let width = (cut - start) / parts;
            for part in 0..parts as usize {
                let first = start + width * part as f64;
                let last = if part + 1 == parts as usize { cut } else { first + width };
                let (local, rate) = path.local_and_rate(arc, 0.5 * (first + last));
                let way = if turning_rate(local, rate).0 < 0.0 { -1.0 } else { 1.0 };
                let moved = (way * (azimuth(path.local(arc, last)) - at_start)).rem_euclid(TURN);
                let swing = if moved > TURN - ROUNDING { 0.0 } else { moved };
                pieces.push(AzimuthPiece { from: first, to: last, azimuth: at_start, swing, way });
                at_start += way * swing;
            }
            start = cut;
        }
    }
}

impl AzimuthPiece {
    /// How far the azimuth has moved at an instant of the piece, and the rate a day of that.
    fn moved<P: DayPath>(&self, arc: &Arc<'_>, path: &P, fraction: f64) -> (f64, f64) {
        let (local, rate) = path.local_and_rate(arc, fraction);
        let (numerator, denominator) = turning_rate(local, rate);
        let moved = (self.way * (azimuth(local) - self.azimuth)).rem_euclid(TURN);
        let moved = if moved > TURN - ROUNDING { moved - TURN } else { moved };
        (moved, self.way * numerator / denominator)
    }

    /// The instant at which the azimuth has moved by `swing`, which the caller keeps within the piece's, at
    /// or after `after`.
    pub fn at_swing<P: DayPath>(&self, arc: &Arc<'_>, path: &P, swing: f64, after: f64) -> f64 {
        let guess = self.from + (self.to - self.from) * (swing / self.swing);
        newton_between(
            |fraction| {
                let (moved, rate) = self.moved(arc, path, fraction);
                (moved - swing, rate)
            },
            after,
            self.to,
            true,
            guess.clamp(after, self.to),
            LAST_STEP_D,
        )
    }
}

/// Makes `set` where the azimuth's rate is at most `most`, radians a second, in size.
///
/// Around the zenith that leaves out the keyhole, whose radius is 15.04″ cos φ / v at v ″/s. For a star
/// the bound is an interval of sin h, since v (1 − s²) − ω |sin φ − s sin δ| is concave in s: whether the day
/// comes near it at all is seen at once. Where it does, the crossings of series over half days.
pub fn fill_azimuth_rate<P: Turning>(
    arc: &Arc<'_>,
    path: &P,
    most: f64,
    range: Interval,
    reason: u8,
    set: &mut IntervalSet,
) {
    let most_per_day = most * SECONDS_PER_DAY;
    let spare = |fraction: f64, way: f64| {
        let (local, rate) = path.local_and_rate(arc, fraction);
        let (numerator, denominator) = turning_rate(local, rate);
        most_per_day * denominator - way * numerator
    };
    set.clear();
    set.push(range);
    if !path.may_turn_faster(arc, most_per_day) {
        return;
    }
    let mut scratch = IntervalSet::new();
    for way in [1.0, -1.0] {
        let ends = [0.0, 0.5, 1.0].map(|fraction| spare(fraction, way) >= 0.0);
        let mut changes: Vec<(f64, bool)> = Vec::new();
        for half in 0..2 {
            let start = 0.5 * half as f64;
            let series = Chebyshev::<NODES>::fit(start, start + 0.5, |fraction| spare(fraction, way));
            let (low, _) = series.loose_bounds();
            if low > 0.0 && ends[half] && ends[half + 1] {
                continue;
            }
            let crossings = series.crossings_between(ends[half], ends[half + 1]);
            changes.extend(crossings.iter().map(|crossing| (crossing.at, crossing.rising)));
        }
        let mut part = IntervalSet::new();
        part.fill_from_changes(range, ends[0], changes.into_iter(), reason);
        set.intersect(&part, &mut scratch);
    }
}

/// The branch of the azimuth on which the cables are: what is added to the azimuth that is counted on,
/// and that azimuth where the day ended.
#[derive(Debug, Clone, Copy)]
pub struct Branch {
    pub cable_at_end: f64,
}

/// Cuts each interval of `left` where the cables run out.
///
/// At the beginning of an interval that branch is taken which lasts longest; where it runs out the next
/// begins. An interval goes on from the day before on its `branch`. Where no branch is within the range
/// the interval is left out.
pub fn split_by_cables<P: Turning>(
    arc: &Arc<'_>,
    path: &P,
    (low, high): (f64, f64),
    goes_on: Option<Branch>,
    reason: u8,
    walk: &mut AzimuthWalk,
    left: &IntervalSet,
    set: &mut IntervalSet,
) -> Option<Branch> {
    set.clear();
    let mut branch = goes_on;
    for (number, interval) in left.iter().enumerate() {
        if number > 0 {
            branch = None;
        }
        walk.walk(arc, path, interval.start, interval.stop);
        let mut start = interval.start;
        let mut start_reason = interval.start_reason;
        while start < interval.stop {
            let at = walk.azimuth_at(arc, path, start);
            let offset = match branch.take() {
                Some(branch) => TURN * ((branch.cable_at_end - at) / TURN).round(),
                None => {
                    let first = ((low - at) / TURN).ceil() as i64;
                    let last = ((high - at) / TURN).floor() as i64;
                    let lasting = (first..=last)
                        .map(|turns| turns as f64 * TURN)
                        .map(|offset| (offset, walk.leaves(arc, path, start, low - offset, high - offset)))
                        // On a bound and on its way out: no branch to begin with.
                        .filter(|branch| branch.1 > start + SHORTEST)
                        .max_by(|a, b| a.1.total_cmp(&b.1));
                    match lasting {
                        Some((offset, _)) => offset,
                        None => match walk.enters(arc, path, start, low, high) {
                            Some(later) => {
                                (start, start_reason) = (later, reason);
                                continue;
                            }
                            None => break,
                        },
                    }
                }
            };
            let leaves = walk.leaves(arc, path, start, low - offset, high - offset);
            let ends = leaves >= interval.stop;
            let stop = if ends { interval.stop } else { leaves.max(start + SHORTEST) };
            set.push_apart(Interval {
                start,
                stop,
                start_reason,
                stop_reason: if ends { interval.stop_reason } else { reason },
            });
            if ends {
                branch = Some(Branch { cable_at_end: walk.azimuth_at(arc, path, stop) + offset });
                break;
            }
            (start, start_reason) = (stop, reason);
        }
    }
    branch
}

impl AzimuthWalk {
    /// The azimuth, counted on, at an instant of the walk.
    fn azimuth_at<P: DayPath>(&self, arc: &Arc<'_>, path: &P, at: f64) -> f64 {
        let index =
            self.pieces.partition_point(|piece| piece.to < at).min(self.pieces.len().saturating_sub(1));
        match self.pieces.get(index) {
            Some(piece) => piece.azimuth + piece.way * piece.moved(arc, path, at).0.clamp(0.0, piece.swing),
            None => azimuth(path.local(arc, at)),
        }
    }

    /// The first instant after `start` at which the azimuth leaves [low, high]; infinity when it does not.
    fn leaves<P: DayPath>(&self, arc: &Arc<'_>, path: &P, start: f64, low: f64, high: f64) -> f64 {
        for piece in self.pieces.iter().filter(|piece| piece.to > start) {
            let bound = if piece.way > 0.0 { high } else { low };
            let swing = piece.way * (bound - piece.azimuth);
            if swing < piece.swing {
                let at = if swing <= 0.0 { piece.from } else { piece.at_swing(arc, path, swing, piece.from) };
                return at.max(start);
            }
        }
        f64::INFINITY
    }

    /// The first instant after `start` at which some branch comes into the range.
    fn enters<P: DayPath>(&self, arc: &Arc<'_>, path: &P, start: f64, low: f64, high: f64) -> Option<f64> {
        for piece in self.pieces.iter().filter(|piece| piece.to > start) {
            let bound = if piece.way > 0.0 { low } else { high };
            let swing = (piece.way * (bound - piece.azimuth)).rem_euclid(TURN);
            if swing < piece.swing {
                let at = piece.at_swing(arc, path, swing, piece.from);
                if at > start + SHORTEST {
                    return Some(at);
                }
            }
        }
        None
    }
}
