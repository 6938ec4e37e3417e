//! A target that moves on one night: what its windows do not say.

use super::columns::{NightSummary, Wanted};
use super::night::Night;
use crate::astrometry::Moving;
use crate::constants::SECONDS_PER_DAY;
use crate::ephemeris::Body;
use crate::events::{Arc, BodyArc, DayPath, Days};
use crate::math::roots::minimum;
use crate::math::vector::angle;
use crate::windows::Window;
use crate::windows::intervals::IntervalSet;

/// Pieces into which a window is cut to bracket the nearest approach to the Moon: an hour or two each.
const PIECES: usize = 12;

/// What is wanted of a target's windows on a night, which are seconds from its middle; `exact` are those of
/// the weeks around it. `None` when the ephemeris does not reach.
pub(super) fn summary(
    target: Moving<'_>,
    days: &Days<'_>,
    night: &Night,
    windows: &IntervalSet,
    exact: &[Window],
    wanted: &Wanted,
) -> Option<NightSummary> {
    let observer = days.observer();
    let mut summary = NightSummary::of_windows(windows, |seconds| night.mjd(observer, seconds));
    let arcs: Vec<(usize, &Arc<'_>)> = days
        .arcs
        .iter()
        .enumerate()
        .filter(|(_, arc)| (-1.0..2.0).contains(&arc.fraction(night.middle)))
        .collect();
    if wanted.transit {
        let mut nearest = f64::INFINITY;
        for &(index, arc) in &arcs {
            let mut culminations = Vec::new();
            days.body(index, target).ok()?.culminations(arc, &mut culminations);
            for culmination in culminations.iter().filter(|culmination| culmination.upper) {
                let seconds = arc.instant(culmination.at).seconds_since(night.middle);
                if seconds.abs() < nearest.abs() {
                    nearest = seconds;
                }
            }
        }
        summary.transit = if nearest.is_finite() { night.mjd(observer, nearest) } else { f64::NAN };
    }
    if wanted.best_airmass && !windows.is_empty() {
        let night_span = night.start.nanoseconds()..night.stop.nanoseconds();
        let inside = exact.iter().filter(|window| night_span.contains(&window.best_time.nanoseconds()));
        summary.best_airmass = inside.map(|window| window.best_airmass).fold(f64::NAN, f64::min);
    }
    if wanted.moon_separation_min && !windows.is_empty() {
        for &(index, arc) in &arcs {
            let paths = (days.body(index, target).ok()?, days.body(index, Body::Moon).ok()?);
            for window in windows.iter() {
                let fraction =
                    |seconds: f64| arc.fraction(night.middle.plus_seconds(seconds)).clamp(0.0, 1.0);
                let (from, to) = (fraction(window.start), fraction(window.stop));
                if from < to {
                    let nearest = nearest_approach(&paths, from, to);
                    summary.moon_separation_min = summary.moon_separation_min.min(nearest);
                }
            }
        }
    }
    Some(summary)
}

/// The least angle between two paths between two fractions of a day, radians.
fn nearest_approach(paths: &(BodyArc, BodyArc), from: f64, to: f64) -> f64 {
    let separation = |at: f64| angle(paths.0.local.value(at), paths.1.local.value(at));
    let step = (to - from) / PIECES as f64;
    let samples: Vec<f64> = (0..=PIECES).map(|i| separation(from + step * i as f64)).collect();
    let least = (0..=PIECES).min_by(|&a, &b| samples[a].total_cmp(&samples[b])).unwrap_or(0);
    let low = from + step * least.saturating_sub(1) as f64;
    let high = (from + step * (least + 1) as f64).min(to);
    minimum(separation, low, high, 1.0 / SECONDS_PER_DAY).1.min(samples[least])
}
