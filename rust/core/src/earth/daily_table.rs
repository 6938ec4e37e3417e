//! The daily values of Earth orientation, joined by a spline and carried on past both ends.
//!
//! Tested through [`super::Orientation`], in its file.

use super::extrapolation::{CHANNELS, Extrapolation, ut1_growth_s};
use super::iers_tables::Row;
use super::orientation::{Pole, Provenance, Quality, Source};
use super::spline::{piece, second_derivatives};
use crate::constants::{RADIANS_PER_ARCSECOND, SECONDS_PER_DAY};
use crate::error::{Error, Result};
use crate::time::{Instant, LeapSeconds, Tai, Utc};

#[derive(Debug, Clone, PartialEq)]
pub(super) struct Table {
    pub(super) provenance: Provenance,
    knots: Vec<Knot>,
    before: Extrapolation,
    after: Extrapolation,
}

/// A day of the table. The channels are UT1−TAI (s), xp, yp, dX, dY (radians).
#[derive(Debug, Clone, Copy, PartialEq)]
struct Knot {
    /// TAI−UTC, days: 0h UTC of the day is this much after 0h TAI.
    offset_days: f64,
    /// Days (of TAI) to the next knot; 1 after the last.
    step: f64,
    values: [f64; CHANNELS],
    second: [f64; CHANNELS],
    ut1_error_s: f64,
    pole_error: f64,
}

/// UT1 never gains or loses more on TAI in a day, s; a jump above it is a leap second left out.
const LARGEST_DAILY_CHANGE_S: f64 = 0.02;

impl Table {
    pub(super) fn new(
        leap: &LeapSeconds,
        rows: &[Row],
        named: &[&str],
        sources: Vec<Source>,
    ) -> Result<Self> {
        let mut knots: Vec<Knot> = Vec::with_capacity(rows.len());
        let mut offsets = [0.0; 2];
        let mut last_offsets_mjd = rows[0].mjd - 1;
        for (row, name) in rows.iter().zip(named) {
            let tai_minus_utc = leap.tai_minus_utc(Utc::from_mjd(row.mjd as f64, 0.0)).map_err(|status| {
                Error::table(*name, row.line, format!("MJD {}: no TAI-UTC: {}", row.mjd, status.word()))
            })?;
            match row.offsets {
                Some(given) => (offsets, last_offsets_mjd) = (given, row.mjd),
                // Past their end they fade; a step would ring through the spline.
                None => offsets = offsets.map(|v| v * (-1.0_f64 / 50.0).exp()),
            }
            let knot = Knot {
                offset_days: tai_minus_utc / SECONDS_PER_DAY,
                step: 1.0,
                values: [
                    row.ut1_minus_utc_s - tai_minus_utc,
                    row.pole[0],
                    row.pole[1],
                    offsets[0],
                    offsets[1],
                ],
                second: [0.0; CHANNELS],
                ut1_error_s: row.ut1_error_s,
                pole_error: row.pole_error,
            };
            if let Some(last) = knots.last() {
                let change = knot.values[0] - last.values[0];
                if change.abs() > LARGEST_DAILY_CHANGE_S {
                    return Err(Error::table(
                        *name,
                        row.line,
                        format!(
                            "UT1-TAI changes by {change:.4} s in a day: are the leap seconds of another date?"
                        ),
                    ));
                }
            }
            knots.push(knot);
        }
        for i in 1..knots.len() {
            knots[i - 1].step = 1.0 + (knots[i].offset_days - knots[i - 1].offset_days);
        }
        let steps: Vec<f64> = knots[..knots.len() - 1].iter().map(|k| k.step).collect();
        let values: Vec<[f64; CHANNELS]> = knots.iter().map(|k| k.values).collect();
        for (knot, second) in knots.iter_mut().zip(second_derivatives(&steps, &values)) {
            knot.second = second;
        }

        let (first, last) = (rows[0], rows[rows.len() - 1]);
        let backward = slope(&knots[0], &knots[1]).map(|s| -s);
        let n = knots.len();
        // From the last knot's side the last piece looks the same, mirrored.
        let forward = slope(&Knot { step: knots[n - 2].step, ..knots[n - 1] }, &knots[n - 2]).map(|s| -s);
        let before = Extrapolation::new(values.iter().copied(), backward, first.mjd as f64, -1.0);
        let after = Extrapolation::new(values.iter().rev().copied(), forward, last.mjd as f64, 1.0);
        let provenance = Provenance {
            sources,
            first_mjd: first.mjd,
            last_measured_mjd: rows.iter().rev().find(|r| r.measured).map_or(first.mjd - 1, |r| r.mjd),
            last_predicted_mjd: last.mjd,
            last_offsets_mjd,
        };
        Ok(Table { provenance, knots, before, after })
    }

    pub(super) fn at(&self, tai: Instant<Tai>) -> Pole {
        let (day, fraction) = tai.mjd_parts();
        let first = self.provenance.first_mjd as f64;
        let last = self.knots.len() - 1;
        // Days since knot k. Its TAI is at most some tens of seconds after 0h TAI of its day, so that the
        // piece is that of the day or of the one before.
        let since = |k: usize| (day - (first + k as f64)) + (fraction - self.knots[k].offset_days);
        let index = day - first;
        // NaN goes outside too, and comes back as NaN.
        if index < 0.0 || index.is_nan() {
            return self.outside(&self.before, &self.knots[0], -since(0));
        }
        let mut k = (index as usize).min(last);
        let mut u = since(k);
        if u < 0.0 {
            if k == 0 {
                return self.outside(&self.before, &self.knots[0], -u);
            }
            k -= 1;
            u = since(k);
        }
        if k == last && u > 0.0 {
            return self.outside(&self.after, &self.knots[last], u);
        }
        let left = &self.knots[k];
        let right = &self.knots[(k + 1).min(last)];
        let value = |c: usize| {
            piece(u, left.step, [left.values[c], right.values[c]], [left.second[c], right.second[c]])
        };
        let ahead = if u > 0.0 { k + 1 } else { k };
        let measured = self.provenance.last_measured_mjd - self.provenance.first_mjd;
        Pole {
            ut1_minus_tai_s: value(0),
            xp: value(1),
            yp: value(2),
            dx: value(3),
            dy: value(4),
            ut1_error_s: left.ut1_error_s.max(right.ut1_error_s),
            pole_error: left.pole_error.max(right.pole_error),
            quality: if ahead as i64 <= measured { Quality::Measured } else { Quality::Predicted },
        }
    }

    /// `d` days past the end of the table at which `knot` stands.
    #[cold]
    fn outside(&self, extrapolation: &Extrapolation, knot: &Knot, d: f64) -> Pole {
        let [ut1_minus_tai_s, xp, yp, dx, dy] = extrapolation.at(d);
        Pole {
            ut1_minus_tai_s,
            xp,
            yp,
            dx,
            dy,
            ut1_error_s: knot.ut1_error_s + ut1_growth_s(d),
            pole_error: knot.pole_error + 0.000_68 * d.powf(0.80) * RADIANS_PER_ARCSECOND,
            quality: Quality::Extrapolated,
        }
    }
}

/// The slope at `at`, towards the neighbouring knot.
fn slope(at: &Knot, towards: &Knot) -> [f64; CHANNELS] {
    std::array::from_fn(|c| {
        (towards.values[c] - at.values[c]) / at.step
            - at.step * (2.0 * at.second[c] + towards.second[c]) / 6.0
    })
}
