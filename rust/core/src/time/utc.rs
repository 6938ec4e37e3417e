//! UTC as a count of nanoseconds: exactly numpy's `datetime64[ns]`.

use std::fmt;

use super::calendar::Date;
use crate::constants::UNIX_EPOCH_MJD;

const NANOSECONDS_PER_DAY: i64 = 86_400_000_000_000;

/// A UTC reading: nanoseconds since 1970-01-01T00:00:00, counting 86,400 s to every day.
///
/// Range 1677-09-21 to 2262-04-11. A reading inside a leap second (23:59:60) cannot be expressed.
/// [`Utc::NOT_A_TIME`] is numpy's NaT.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Utc(i64);

impl Utc {
    /// The reading that is none: NaT.
    pub const NOT_A_TIME: Utc = Utc(i64::MIN);

    /// From the integer inside a `datetime64[ns]`.
    #[inline(always)]
    pub const fn from_nanoseconds(nanoseconds: i64) -> Self {
        Utc(nanoseconds)
    }

    /// The integer inside a `datetime64[ns]`.
    #[inline(always)]
    pub const fn nanoseconds(self) -> i64 {
        self.0
    }

    /// Whether this is NaT.
    #[inline(always)]
    pub const fn is_nat(self) -> bool {
        self.0 == i64::MIN
    }

    /// The reading at MJD `day + fraction`, both in days and split in any way, rounded to the nearest
    /// nanosecond. NaT for NaN, an infinity, or a date out of range.
    pub fn from_mjd(day: f64, fraction: f64) -> Self {
        let (day_floor, fraction_floor) = (day.floor(), fraction.floor());
        let rest = (day - day_floor) + (fraction - fraction_floor);
        let days = day_floor + fraction_floor - UNIX_EPOCH_MJD;
        // Written so that NaN fails it.
        if !(days.abs() < 200_000.0 && rest.is_finite()) {
            return Utc::NOT_A_TIME;
        }
        let nanoseconds = (rest * NANOSECONDS_PER_DAY as f64).round() as i64;
        match (days as i64).checked_mul(NANOSECONDS_PER_DAY).and_then(|d| d.checked_add(nanoseconds)) {
            Some(n) => Utc(n),
            None => Utc::NOT_A_TIME,
        }
    }

    /// Midnight at the start of a date; NaT when out of range.
    pub fn from_date(date: Date) -> Self {
        Utc::from_mjd(date.mjd() as f64, 0.0)
    }

    /// The whole MJD and the fraction of that day in [0, 1), the latter within half a unit in its last
    /// place. (NaN, NaN) for NaT.
    #[inline]
    pub fn mjd_parts(self) -> (f64, f64) {
        if self.is_nat() {
            return (f64::NAN, f64::NAN);
        }
        let days = self.0.div_euclid(NANOSECONDS_PER_DAY);
        let rest = self.0.rem_euclid(NANOSECONDS_PER_DAY);
        (UNIX_EPOCH_MJD + days as f64, rest as f64 / NANOSECONDS_PER_DAY as f64)
    }

    /// The civil date; `None` for NaT.
    pub fn date(self) -> Option<Date> {
        if self.is_nat() {
            return None;
        }
        Some(Date::from_mjd(UNIX_EPOCH_MJD as i64 + self.0.div_euclid(NANOSECONDS_PER_DAY)))
    }

    /// The reading `nanoseconds` later; NaT stays NaT, and so becomes what leaves the range.
    pub fn plus_nanoseconds(self, nanoseconds: i64) -> Self {
        if self.is_nat() { self } else { self.0.checked_add(nanoseconds).map_or(Utc::NOT_A_TIME, Utc) }
    }
}

/// ISO 8601 with as many decimals as are needed: none, 3, 6 or 9.
impl fmt::Display for Utc {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Some(date) = self.date() else { return f.write_str("NaT") };
        let rest = self.0.rem_euclid(NANOSECONDS_PER_DAY);
        let (seconds, nanoseconds) = (rest / 1_000_000_000, rest % 1_000_000_000);
        let (hour, minute, second) = (seconds / 3600, seconds / 60 % 60, seconds % 60);
        write!(f, "{date}T{hour:02}:{minute:02}:{second:02}")?;
        match nanoseconds {
            0 => Ok(()),
            n if n % 1_000_000 == 0 => write!(f, ".{:03}", n / 1_000_000),
            n if n % 1_000 == 0 => write!(f, ".{:06}", n / 1_000),
            n => write!(f, ".{n:09}"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_go_there_and_back_to_the_nanosecond() {
        let mut state = 1_u64;
        for _ in 0..20_000 {
            // A fixed linear congruence (Knuth's MMIX constants) spreads the readings.
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            let utc = Utc::from_nanoseconds((state as i64) / 2);
            let (day, fraction) = utc.mjd_parts();
            assert!((0.0..1.0).contains(&fraction));
            assert_eq!(Utc::from_mjd(day, fraction), utc);
        }
    }

    #[test]
    fn what_is_no_time_is_nat() {
        assert!(Utc::from_mjd(f64::NAN, 0.0).is_nat());
        assert!(Utc::from_mjd(50_000.0, f64::INFINITY).is_nat());
        assert!(Utc::from_mjd(1e9, 0.0).is_nat());
        assert!(Utc::from_mjd(UNIX_EPOCH_MJD + 106_752.0, 0.0).is_nat());
        assert!(Utc::NOT_A_TIME.mjd_parts().0.is_nan());
        assert!(Utc::from_nanoseconds(i64::MAX).plus_nanoseconds(1).is_nat());
        assert!(Utc::NOT_A_TIME.plus_nanoseconds(5).is_nat());
        assert_eq!(Utc::NOT_A_TIME.to_string(), "NaT");
    }

    #[test]
    fn readings_are_shown_in_iso_8601() {
        assert_eq!(Utc::from_nanoseconds(0).to_string(), "1970-01-01T00:00:00");
        assert_eq!(Utc::from_nanoseconds(-1).to_string(), "1969-12-31T23:59:59.999999999");
        assert_eq!(Utc::from_mjd(54_195.0, 0.5).to_string(), "2007-04-05T12:00:00");
        assert_eq!(Utc::from_nanoseconds(1_500_000_000).to_string(), "1970-01-01T00:00:01.500");
        assert_eq!(Utc::from_nanoseconds(1_000).to_string(), "1970-01-01T00:00:00.000001");
    }
}
