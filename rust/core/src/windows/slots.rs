//! What schedulers take: start times that fit into windows, and the windows after a visit.

use crate::error::{Error, Result};
use crate::time::Utc;

/// Start times in compressed sparse rows.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Slots {
    /// Window i's start times are `start[offsets[i]..offsets[i + 1]]`.
    pub offsets: Vec<i64>,
    /// Nanoseconds UTC since 1970-01-01, in order within each window.
    pub start: Vec<i64>,
}

/// Start times, every `step_ns` from the epoch `origin`, at which an exposure of `duration_ns` fits into each
/// window [start, stop): start ≤ t and t + duration ≤ stop. All in nanoseconds of UTC, as the windows are.
///
/// Times lie on one raster for all windows, so that those of different targets can be compared.
/// Through a leap second the duration is that of the UTC count, a second short.
///
/// # Errors
/// A step or a duration that is not positive, columns of different length, or more than 2³¹ slots.
pub fn slots(start: &[i64], stop: &[i64], origin: Utc, step_ns: i64, duration_ns: i64) -> Result<Slots> {
    const MOST: i64 = 1 << 31;
    if start.len() != stop.len() {
        let given = format!("{} values", stop.len());
        return Err(Error::invalid("stop", given, format!("{}, as many as start", start.len())));
    }
    if step_ns <= 0 {
        return Err(Error::invalid("step", format!("{} s", step_ns as f64 * 1e-9), "a positive step"));
    }
    if duration_ns <= 0 {
        return Err(Error::invalid(
            "duration",
            format!("{} s", duration_ns as f64 * 1e-9),
            "a positive duration",
        ));
    }
    if origin.is_nat() {
        return Err(Error::invalid("origin", "NaT", "an instant"));
    }
    let origin = origin.nanoseconds();
    // First on the raster and number that fit; in 128 bits, since NaT and far origins must not overflow.
    let fit = |start: i64, stop: i64| -> Option<(i64, i64)> {
        if start == i64::MIN || stop == i64::MIN {
            return None;
        }
        let (step, origin) = (i128::from(step_ns), i128::from(origin));
        let last = i128::from(stop) - i128::from(duration_ns);
        let first = origin + (i128::from(start) - origin + step - 1).div_euclid(step) * step;
        if first > last {
            return None;
        }
        Some((i64::try_from(first).ok()?, i64::try_from((last - first) / step + 1).ok()?))
    };
    let mut total = 0i64;
    for (&start, &stop) in start.iter().zip(stop) {
        total = total.saturating_add(fit(start, stop).map_or(0, |fit| fit.1));
    }
    if total > MOST {
        return Err(Error::invalid("step", format!("{total} slots"), format!("at most {MOST} slots")));
    }
    let mut slots =
        Slots { offsets: Vec::with_capacity(start.len() + 1), start: Vec::with_capacity(total as usize) };
    slots.offsets.push(0);
    for (&start, &stop) in start.iter().zip(stop) {
        if let Some((first, count)) = fit(start, stop) {
            slots.start.extend((0..count).map(|i| first + i * step_ns));
        }
        slots.offsets.push(slots.start.len() as i64);
    }
    Ok(slots)
}

/// What is left of the windows of one target for a next visit at least `gap_ns` after the last one: windows
/// that end before that are dropped, one in which it falls begins there.
///
/// The third of each is whether the gap, and not the window's own limit, sets its beginning.
pub fn windows_after_gap(windows: &[(i64, i64)], last_visit: Utc, gap_ns: i64) -> Vec<(i64, i64, bool)> {
    let earliest = if last_visit.is_nat() {
        // Never visited: at any time.
        i64::MIN
    } else {
        last_visit.nanoseconds().saturating_add(gap_ns.max(0))
    };
    windows
        .iter()
        .filter(|window| window.1 > earliest && window.1 > window.0)
        .map(|&(start, stop)| (start.max(earliest), stop, earliest > start))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    const ZERO: Utc = Utc::from_nanoseconds(0);

    #[test]
    fn every_start_on_the_raster_that_fits_and_no_other() {
        let mut state = 7u64;
        let mut next = |below: i64| {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            ((state >> 33) as i64) % below
        };
        for _ in 0..300 {
            let (start, length) = (next(400) - 200, next(60));
            let (step, duration, origin) = (1 + next(9), 1 + next(20), next(100) - 50);
            let found =
                slots(&[start], &[start + length], Utc::from_nanoseconds(origin), step, duration).unwrap();
            let expected: Vec<i64> = (start..start + length)
                .filter(|t| (t - origin).rem_euclid(step) == 0 && t + duration <= start + length)
                .collect();
            assert_eq!(found.start, expected);
            assert_eq!(found.offsets, [0, expected.len() as i64]);
        }
    }

    #[test]
    fn rows_stay_apart_and_nat_has_none() {
        let found = slots(&[0, i64::MIN, 10], &[10, 5, 15], ZERO, 5, 5).unwrap();
        assert_eq!(found, Slots { offsets: vec![0, 2, 2, 3], start: vec![0, 5, 10] });
    }

    #[test]
    fn wrong_calls_are_named() {
        let message = |step, duration| slots(&[0], &[10], ZERO, step, duration).unwrap_err().to_string();
        assert_eq!(message(0, 1), "step: given 0 s, allowed a positive step");
        assert!(message(1, -1).starts_with("duration: given -0.000000001 s"));
        assert!(slots(&[0], &[], ZERO, 1, 1).unwrap_err().to_string().contains("as many as start"));
        assert!(slots(&[0], &[1 << 40], ZERO, 1, 1).unwrap_err().to_string().contains("slots"));
        assert!(slots(&[0], &[1], Utc::NOT_A_TIME, 1, 1).unwrap_err().to_string().contains("NaT"));
    }

    #[test]
    fn the_next_windows_after_a_gap() {
        let windows = [(0, 10), (20, 30), (40, 50)];
        let after = |visit, gap| windows_after_gap(&windows, Utc::from_nanoseconds(visit), gap);
        assert_eq!(after(5, 0), [(5, 10, true), (20, 30, false), (40, 50, false)]);
        assert_eq!(after(5, 20), [(25, 30, true), (40, 50, false)]);
        assert_eq!(after(5, 5), [(20, 30, false), (40, 50, false)]);
        assert_eq!(after(100, 0), []);
        assert_eq!(windows_after_gap(&windows, Utc::NOT_A_TIME, 99).len(), 3);
    }
}
