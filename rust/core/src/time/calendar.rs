//! The civil calendar: proleptic Gregorian dates and Modified Julian Dates.

use std::fmt;

use crate::error::{Error, Result};

/// Days from 0000-03-01 to 1858-11-17, the zero of the Modified Julian Date.
const MJD_ZERO_SINCE_MARCH_0000: i64 = 678_881;
/// Days in the 400-year cycle of the Gregorian calendar.
const DAYS_PER_CYCLE: i64 = 146_097;

/// A date of the proleptic Gregorian calendar, with astronomical year numbers (the year before 1 is 0).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Date {
    year: i32,
    month: u8,
    day: u8,
}

impl Date {
    /// A date that exists, in a year from −9999 to 9999; any other is an error.
    pub fn new(year: i32, month: u32, day: u32) -> Result<Date> {
        let given = || format!("{year:04}-{month:02}-{day:02}");
        if !(-9999..=9999).contains(&year) {
            return Err(Error::invalid("date", given(), "years -9999 to 9999"));
        }
        if !(1..=12).contains(&month) {
            return Err(Error::invalid("date", given(), "months 1 to 12"));
        }
        let last = days_in_month(year, month);
        if !(1..=last).contains(&day) {
            return Err(Error::invalid("date", given(), format!("days 1 to {last} in {year:04}-{month:02}")));
        }
        Ok(Date { year, month: month as u8, day: day as u8 })
    }

    /// The year.
    pub fn year(self) -> i32 {
        self.year
    }

    /// The month, 1 to 12.
    pub fn month(self) -> u32 {
        u32::from(self.month)
    }

    /// The day of the month, from 1.
    pub fn day(self) -> u32 {
        u32::from(self.day)
    }

    /// The Modified Julian Date at 0h of this date.
    pub fn mjd(self) -> i64 {
        // Years are taken to begin in March, so that the leap day is the last of its year and the
        // months before it have lengths that repeat every five: 31 30 31 30 31.
        let from_march = (i64::from(self.month) + 9) % 12;
        let year = i64::from(self.year) - i64::from(self.month <= 2);
        let (cycle, of_cycle) = (year.div_euclid(400), year.rem_euclid(400));
        let of_year = (153 * from_march + 2) / 5 + i64::from(self.day) - 1;
        cycle * DAYS_PER_CYCLE + of_cycle * 365 + of_cycle / 4 - of_cycle / 100 + of_year
            - MJD_ZERO_SINCE_MARCH_0000
    }

    /// The date at a Modified Julian Date. Valid for years −9999 to 9999 (MJD −4,331,000 to 2,973,483);
    /// beyond, the nearest of those.
    pub fn from_mjd(mjd: i64) -> Date {
        let mjd = mjd.clamp(-4_331_000, 2_973_483);
        let days = mjd + MJD_ZERO_SINCE_MARCH_0000;
        let (cycle, of_cycle) = (days.div_euclid(DAYS_PER_CYCLE), days.rem_euclid(DAYS_PER_CYCLE));
        // Taking out the leap days of 4, 100 and 400 years leaves years of 365.
        let year = (of_cycle - of_cycle / 1_460 + of_cycle / 36_524 - of_cycle / 146_096) / 365;
        let of_year = of_cycle - (365 * year + year / 4 - year / 100);
        let from_march = (5 * of_year + 2) / 153;
        let day = of_year - (153 * from_march + 2) / 5 + 1;
        let month = if from_march < 10 { from_march + 3 } else { from_march - 9 };
        let year = 400 * cycle + year + i64::from(month <= 2);
        Date { year: year as i32, month: month as u8, day: day as u8 }
    }
}

impl fmt::Display for Date {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{:04}-{:02}-{:02}", self.year, self.month, self.day)
    }
}

/// Whether a year has a 29 February.
fn is_leap_year(year: i32) -> bool {
    year % 4 == 0 && (year % 100 != 0 || year % 400 == 0)
}

fn days_in_month(year: i32, month: u32) -> u32 {
    match month {
        2 if is_leap_year(year) => 29,
        2 => 28,
        4 | 6 | 9 | 11 => 30,
        _ => 31,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dates_of_known_modified_julian_date() {
        // 1858-11-17 is zero by definition; J2000.0 falls on MJD 51544; the others are Meeus,
        // Astronomical Algorithms, 2nd ed., p. 62 [M]: 1957-10-04 (JD 2436115.5 at 0h),
        // 1600-01-01 (2305447.5), 1987-06-19 (2446965.5), 1999-01-01 (2451179.5).
        for (year, month, day, mjd) in [
            (1858, 11, 17, 0),
            (2000, 1, 1, 51_544),
            (1957, 10, 4, 36_115),
            (1600, 1, 1, -94_553),
            (1987, 6, 19, 46_965),
            (1999, 1, 1, 51_179),
            (1970, 1, 1, 40_587),
        ] {
            let date = Date::new(year, month, day).unwrap();
            assert_eq!(date.mjd(), mjd, "{date}");
            assert_eq!(Date::from_mjd(mjd), date);
        }
    }

    #[test]
    fn every_day_follows_the_one_before() {
        let mut date = Date::new(-9999, 1, 1).unwrap();
        let mut mjd = date.mjd();
        while date.year < 9999 || date.month < 12 || date.day < 31 {
            let (year, month, day) = (date.year, date.month(), date.day());
            let next = Date::new(year, month, day + 1)
                .or_else(|_| Date::new(year, month + 1, 1))
                .or_else(|_| Date::new(year + 1, 1, 1))
                .unwrap();
            mjd += 1;
            assert_eq!(next.mjd(), mjd, "{next}");
            assert_eq!(Date::from_mjd(mjd), next);
            date = next;
        }
        assert_eq!(Date::from_mjd(mjd + 1), date);
    }

    #[test]
    fn a_date_that_does_not_exist_is_an_error_that_says_so() {
        for (year, month, day, wanted) in [
            (2026, 2, 29, "date: given 2026-02-29, allowed days 1 to 28 in 2026-02"),
            (1900, 2, 29, "date: given 1900-02-29, allowed days 1 to 28 in 1900-02"),
            (2026, 13, 1, "date: given 2026-13-01, allowed months 1 to 12"),
            (2026, 4, 31, "date: given 2026-04-31, allowed days 1 to 30 in 2026-04"),
            (2026, 4, 0, "date: given 2026-04-00, allowed days 1 to 30 in 2026-04"),
            (12026, 4, 1, "date: given 12026-04-01, allowed years -9999 to 9999"),
        ] {
            let error = Date::new(year, month, day).unwrap_err();
            assert!(error.is_invalid());
            assert_eq!(error.to_string(), wanted);
        }
        assert!(Date::new(2000, 2, 29).is_ok());
    }
}
