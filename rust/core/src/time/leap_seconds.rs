//! TAI−UTC as a value: the leap seconds since 1972 and the rates and steps of 1960–1971.

use std::borrow::Cow;

use super::calendar::Date;
use super::instant::{Instant, Tai};
use super::utc::Utc;
use crate::constants::SECONDS_PER_DAY;
use crate::error::{Error, Result, Status};

/// From `start_mjd` (0h UTC) on, TAI−UTC = `offset_s` + (MJD − `reference_mjd`) · `rate_s_per_day`.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Segment {
    start_mjd: f64,
    offset_s: f64,
    reference_mjd: f64,
    rate_s_per_day: f64,
}

const fn drifting(start_mjd: f64, offset_s: f64, reference_mjd: f64, rate_s_per_day: f64) -> Segment {
    Segment { start_mjd, offset_s, reference_mjd, rate_s_per_day }
}

const fn whole(start_mjd: f64, offset_s: f64) -> Segment {
    Segment { start_mjd, offset_s, reference_mjd: 0.0, rate_s_per_day: 0.0 }
}

/// How many segments precede 1972-01-01.
const DRIFTING: usize = 14;

/// The whole of UTC to date. 1960–1971: US Naval Observatory, `tai-utc.dat`. Since 1972: IERS Bulletin C.
const BUILTIN: [Segment; 42] = [
    drifting(36_934.0, 1.417_818_0, 37_300.0, 0.001_296),
    drifting(37_300.0, 1.422_818_0, 37_300.0, 0.001_296),
    drifting(37_512.0, 1.372_818_0, 37_300.0, 0.001_296),
    drifting(37_665.0, 1.845_858_0, 37_665.0, 0.001_123_2),
    drifting(38_334.0, 1.945_858_0, 37_665.0, 0.001_123_2),
    drifting(38_395.0, 3.240_130_0, 38_761.0, 0.001_296),
    drifting(38_486.0, 3.340_130_0, 38_761.0, 0.001_296),
    drifting(38_639.0, 3.440_130_0, 38_761.0, 0.001_296),
    drifting(38_761.0, 3.540_130_0, 38_761.0, 0.001_296),
    drifting(38_820.0, 3.640_130_0, 38_761.0, 0.001_296),
    drifting(38_942.0, 3.740_130_0, 38_761.0, 0.001_296),
    drifting(39_004.0, 3.840_130_0, 38_761.0, 0.001_296),
    drifting(39_126.0, 4.313_170_0, 39_126.0, 0.002_592),
    drifting(39_887.0, 4.213_170_0, 39_126.0, 0.002_592),
    whole(41_317.0, 10.0),
    whole(41_499.0, 11.0),
    whole(41_683.0, 12.0),
    whole(42_048.0, 13.0),
    whole(42_413.0, 14.0),
    whole(42_778.0, 15.0),
    whole(43_144.0, 16.0),
    whole(43_509.0, 17.0),
    whole(43_874.0, 18.0),
    whole(44_239.0, 19.0),
    whole(44_786.0, 20.0),
    whole(45_151.0, 21.0),
    whole(45_516.0, 22.0),
    whole(46_247.0, 23.0),
    whole(47_161.0, 24.0),
    whole(47_892.0, 25.0),
    whole(48_257.0, 26.0),
    whole(48_804.0, 27.0),
    whole(49_169.0, 28.0),
    whole(49_534.0, 29.0),
    whole(50_083.0, 30.0),
    whole(50_630.0, 31.0),
    whole(51_179.0, 32.0),
    whole(53_736.0, 33.0),
    whole(54_832.0, 34.0),
    whole(56_109.0, 35.0),
    whole(57_204.0, 36.0),
    whole(57_754.0, 37.0),
];

/// 2027-06-28: to this date IERS Bulletin C 72 (July 2026) rules out another leap second.
const BUILTIN_EXPIRES_MJD: i64 = 61_584;

/// TAI−UTC from 1960-01-01 on.
///
/// Before 1960 there is no UTC, and asking is [`Status::BeforeUtc`]. Past the last entry TAI−UTC keeps
/// its last value; [`LeapSeconds::expires_mjd`] says how far that is more than a guess.
#[derive(Debug, Clone, PartialEq)]
pub struct LeapSeconds {
    segments: Cow<'static, [Segment]>,
    expires_mjd: Option<i64>,
    source: Cow<'static, str>,
}

impl LeapSeconds {
    /// 1960-01-01, the day on which UTC begins.
    pub const FIRST_MJD: i64 = 36_934;

    /// The table this program was built with: 1960 to the leap second at the end of 2016, complete up
    /// to [`LeapSeconds::expires_mjd`]. Costs nothing.
    pub fn builtin() -> Self {
        LeapSeconds {
            segments: Cow::Borrowed(&BUILTIN),
            expires_mjd: Some(BUILTIN_EXPIRES_MJD),
            source: Cow::Borrowed("built-in table (IERS Bulletin C 72)"),
        }
    }

    /// From the text of the IERS file `Leap_Second.dat`: lines of MJD, day, month, year, TAI−UTC in whole
    /// seconds, beginning with 1972-01-01; comments begin with `#`, and one of them gives the date on
    /// which the file expires. The years 1960–1971 come from the built-in table. `source` names the
    /// text in errors, which carry the number of the line.
    pub fn parse(text: &str, source: &str) -> Result<Self> {
        let mut segments = BUILTIN[..DRIFTING].to_vec();
        let mut expires_mjd = None;
        for (index, line) in text.lines().enumerate() {
            let fault = |message: String| Error::table(source, index + 1, message);
            if let Some(comment) = line.trim_start().strip_prefix('#') {
                if let Some(date) = comment.trim().strip_prefix("File expires on") {
                    expires_mjd = Some(parse_expiry(date).map_err(fault)?);
                }
                continue;
            }
            if line.trim().is_empty() {
                continue;
            }
            let segment = parse_entry(line).map_err(fault)?;
            if segments.len() == DRIFTING && segment != BUILTIN[DRIFTING] {
                return Err(fault("the first entry is not MJD 41317, 1972-01-01, 10 s".into()));
            }
            let last = segments[segments.len() - 1];
            if segment.start_mjd <= last.start_mjd {
                return Err(fault(format!(
                    "MJD {} does not follow MJD {}",
                    segment.start_mjd, last.start_mjd
                )));
            }
            if segments.len() > DRIFTING && (segment.offset_s - last.offset_s).abs() != 1.0 {
                return Err(fault(format!(
                    "TAI-UTC goes from {} s to {} s, not by one second",
                    last.offset_s, segment.offset_s
                )));
            }
            segments.push(segment);
        }
        if segments.len() == DRIFTING {
            return Err(Error::table(source, 0, "no leap second in it"));
        }
        Ok(LeapSeconds { segments: segments.into(), expires_mjd, source: source.to_string().into() })
    }

    /// The MJD on which the table expires: to that date it is known to be complete. `None` when the
    /// file did not say.
    pub fn expires_mjd(&self) -> Option<i64> {
        self.expires_mjd
    }

    /// The MJD (0h UTC) from which the last entry holds.
    pub fn last_change_mjd(&self) -> i64 {
        self.segments[self.segments.len() - 1].start_mjd as i64
    }

    /// Where the table is from.
    pub fn source(&self) -> &str {
        &self.source
    }

    /// TAI−UTC, seconds, at a UTC reading. Exact since 1972; before, to the rounding of the published
    /// formula. A reading that a negative step of the 1960s left out (the last 0.05 s of 1961-07-31 and
    /// 0.1 s of 1968-01-31) is taken on the formula of its day.
    pub fn tai_minus_utc(&self, utc: Utc) -> std::result::Result<f64, Status> {
        if utc.is_nat() {
            return Err(Status::NotATime);
        }
        let (day, fraction) = utc.mjd_parts();
        let segment = self.segment(day)?;
        Ok(segment.tai_minus_utc(day, fraction))
    }

    /// TAI at a UTC reading. Error: 1e-11 s, the resolution of an instant.
    pub fn to_tai(&self, utc: Utc) -> std::result::Result<Instant<Tai>, Status> {
        let (day, fraction) = utc.mjd_parts();
        Ok(Instant::from_mjd(day, fraction).plus_seconds(self.tai_minus_utc(utc)?))
    }

    /// The UTC reading at an instant of TAI, rounded to the nanosecond, and whether the instant lies
    /// inside a leap second (or one of the smaller insertions of the 1960s). There the reading is the
    /// following midnight, since [`Utc`] has no 23:59:60.
    pub fn to_utc(&self, tai: Instant<Tai>) -> std::result::Result<(Utc, bool), Status> {
        if !tai.is_finite() {
            return Err(Status::NotATime);
        }
        let after = self.segments.partition_point(|s| s.start().seconds_since(tai) <= 0.0);
        let segment = self.segments[after.checked_sub(1).ok_or(Status::BeforeUtc)?];
        let (start, since) = (segment.start_mjd, tai.seconds_since(segment.start()));
        // A first reading that may be off by some tens of nanoseconds when `since` is decades, and the
        // correction of what is left, which is exact.
        let first = Utc::from_mjd(start, since / segment.tai_seconds_per_utc_day());
        let (day, fraction) = first.mjd_parts();
        let back = Instant::from_mjd(day, fraction).plus_seconds(segment.tai_minus_utc(day, fraction));
        let left = tai.seconds_since(back) * SECONDS_PER_DAY / segment.tai_seconds_per_utc_day();
        let utc = first.plus_nanoseconds((left * 1e9).round() as i64);
        if utc.is_nat() {
            return Err(Status::NotATime);
        }
        if let Some(next) = self.segments.get(after) {
            let midnight = Utc::from_mjd(next.start_mjd, 0.0);
            if utc >= midnight {
                return Ok((midnight, true));
            }
        }
        Ok((utc, false))
    }

    /// The segment in force on a day.
    fn segment(&self, day: f64) -> std::result::Result<Segment, Status> {
        // Nearly every question is about the present.
        let last = self.segments[self.segments.len() - 1];
        if day >= last.start_mjd {
            return Ok(last);
        }
        let after = self.segments.partition_point(|s| s.start_mjd <= day);
        Ok(self.segments[after.checked_sub(1).ok_or(Status::BeforeUtc)?])
    }
}

impl Segment {
    fn tai_minus_utc(&self, day: f64, fraction: f64) -> f64 {
        self.offset_s + ((day - self.reference_mjd) + fraction) * self.rate_s_per_day
    }

    /// The instant at which the segment begins.
    fn start(&self) -> Instant<Tai> {
        Instant::from_mjd(self.start_mjd, 0.0).plus_seconds(self.tai_minus_utc(self.start_mjd, 0.0))
    }

    fn tai_seconds_per_utc_day(&self) -> f64 {
        SECONDS_PER_DAY + self.rate_s_per_day
    }
}

/// One line of the table: MJD, day, month, year, TAI−UTC.
fn parse_entry(line: &str) -> std::result::Result<Segment, String> {
    let fields: Vec<&str> = line.split_whitespace().collect();
    let &[mjd, day, month, year, offset] = &fields[..] else {
        return Err(format!("{} fields, not the five MJD, day, month, year, TAI-UTC", fields.len()));
    };
    let number = |name: &str, text: &str| -> std::result::Result<f64, String> {
        match text.parse::<f64>() {
            Ok(value) if value.fract() == 0.0 => Ok(value),
            _ => Err(format!("{name} {text:?} is not a whole number")),
        }
    };
    let start_mjd = number("MJD", mjd)?;
    let offset_s = number("TAI-UTC", offset)?;
    let (year, month, day) = (number("year", year)?, number("month", month)?, number("day", day)?);
    let date = Date::new(year as i32, month as u32, day as u32).map_err(|e| e.to_string())?;
    if date.mjd() as f64 != start_mjd {
        return Err(format!("{date} is MJD {}, not {start_mjd}", date.mjd()));
    }
    Ok(whole(start_mjd, offset_s))
}

/// The date of expiry, as in `28 June 2027`.
fn parse_expiry(text: &str) -> std::result::Result<i64, String> {
    const MONTHS: [&str; 12] =
        ["jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec"];
    let unreadable = || format!("date of expiry {:?} is not of the form 28 June 2027", text.trim());
    let fields: Vec<&str> = text.split_whitespace().collect();
    let &[day, month, year] = &fields[..] else { return Err(unreadable()) };
    let beginning = month.get(..3).ok_or_else(unreadable)?.to_ascii_lowercase();
    let month = 1 + MONTHS.iter().position(|m| **m == beginning).ok_or_else(unreadable)?;
    let day = day.parse().map_err(|_| unreadable())?;
    let year = year.parse().map_err(|_| unreadable())?;
    Ok(Date::new(year, month as u32, day).map_err(|e| e.to_string())?.mjd())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn midnight(year: i32, month: u32, day: u32) -> Utc {
        Utc::from_date(Date::new(year, month, day).unwrap())
    }

    #[test]
    fn published_values() {
        let leap = LeapSeconds::builtin();
        // ERFA test suite, eraDat: 2003-06-01 32 s, 2008-01-17 33 s, 2017-09-01 37 s.
        assert_eq!(leap.tai_minus_utc(midnight(2003, 6, 1)), Ok(32.0));
        assert_eq!(leap.tai_minus_utc(midnight(2008, 1, 17)), Ok(33.0));
        assert_eq!(leap.tai_minus_utc(midnight(2017, 9, 1)), Ok(37.0));
        // 1965-01-01 3.540130 s; 1971-01-01 8.946162 s (US Naval Observatory tai-utc.dat).
        assert!((leap.tai_minus_utc(midnight(1965, 1, 1)).unwrap() - 3.540_130).abs() < 1e-12);
        assert!((leap.tai_minus_utc(midnight(1971, 1, 1)).unwrap() - 8.946_162).abs() < 1e-12);
        // The step into 1972 was 0.107758 s (Bureau International de l'Heure) [M].
        let eve = leap.to_tai(midnight(1971, 12, 31)).unwrap();
        let new_year = leap.to_tai(midnight(1972, 1, 1)).unwrap();
        assert!((new_year.seconds_since(eve) - (86_400.0 + 0.107_758 + 0.002_592)).abs() < 1e-10);
    }

    #[test]
    fn outside_utc_is_a_status() {
        let leap = LeapSeconds::builtin();
        let before = midnight(1960, 1, 1).plus_nanoseconds(-1);
        assert_eq!(leap.tai_minus_utc(before), Err(Status::BeforeUtc));
        assert_eq!(leap.to_tai(before), Err(Status::BeforeUtc));
        assert!(leap.to_tai(midnight(1960, 1, 1)).is_ok());
        assert_eq!(leap.to_tai(Utc::NOT_A_TIME), Err(Status::NotATime));
        assert_eq!(leap.to_utc(Instant::from_mjd(36_934.0, 0.0)), Err(Status::BeforeUtc));
        assert_eq!(leap.to_utc(Instant::from_mjd(f64::NAN, 0.0)), Err(Status::NotATime));
        assert_eq!(leap.to_utc(Instant::from_mjd(200_000.0, 0.0)), Err(Status::NotATime));
    }

    #[test]
    fn there_and_back_to_the_nanosecond() {
        let leap = LeapSeconds::builtin();
        let (first, last) = (midnight(1960, 1, 1).nanoseconds(), midnight(2200, 1, 1).nanoseconds());
        let mut state = 7_u64;
        for _ in 0..50_000 {
            // A fixed linear congruence (Knuth's MMIX constants) spreads the readings.
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            let utc = Utc::from_nanoseconds(first + ((state >> 2) as i64) % (last - first));
            let tai = leap.to_tai(utc).unwrap();
            assert_eq!(leap.to_utc(tai), Ok((utc, false)), "{utc}");
        }
    }

    #[test]
    fn inside_a_leap_second_the_reading_is_the_following_midnight() {
        let leap = LeapSeconds::builtin();
        let midnight = midnight(2017, 1, 1);
        let tai = leap.to_tai(midnight).unwrap();
        assert_eq!(leap.to_utc(tai), Ok((midnight, false)));
        assert_eq!(leap.to_utc(tai.plus_seconds(-0.25)), Ok((midnight, true)));
        assert_eq!(leap.to_utc(tai.plus_seconds(-1.0)), Ok((midnight, true)));
        let before = midnight.plus_nanoseconds(-250_000_000);
        assert_eq!(leap.to_utc(tai.plus_seconds(-1.25)), Ok((before, false)));
        // 2016-12-31 has 86,401 s.
        let eve = midnight.plus_nanoseconds(-86_400_000_000_000);
        assert_eq!(tai.seconds_since(leap.to_tai(eve).unwrap()), 86_401.0);
    }

    #[test]
    fn time_never_runs_backwards_through_the_steps() {
        let leap = LeapSeconds::builtin();
        for segment in &BUILTIN[1..] {
            let start = segment.start();
            let mut last = Utc::NOT_A_TIME;
            for k in -300..300 {
                let (utc, _) = leap.to_utc(start.plus_seconds(f64::from(k) * 0.01)).unwrap();
                assert!(utc >= last, "{utc} after {last}");
                last = utc;
            }
        }
    }

    const GOOD: &str = "#  File expires on 28 June 2027\n#\n    41317.0    1  1 1972       10\n    41499.0    1  7 1972       11\n";

    #[test]
    fn a_table_is_read_and_joined_to_the_sixties() {
        let leap = LeapSeconds::parse(GOOD, "Leap_Second.dat").unwrap();
        assert_eq!(leap.expires_mjd(), Some(61_584));
        assert_eq!(leap.expires_mjd(), LeapSeconds::builtin().expires_mjd());
        assert_eq!(leap.source(), "Leap_Second.dat");
        assert_eq!(leap.last_change_mjd(), 41_499);
        assert_eq!(leap.tai_minus_utc(midnight(2020, 1, 1)), Ok(11.0));
        let wanted = LeapSeconds::builtin().tai_minus_utc(midnight(1966, 5, 5));
        assert_eq!(leap.tai_minus_utc(midnight(1966, 5, 5)), wanted);
    }

    #[test]
    fn a_malformed_table_is_an_error_with_its_line() {
        for (text, wanted) in [
            ("", "t: no leap second in it"),
            ("# nothing\n", "t: no leap second in it"),
            ("41317.0 1 1 1972\n", "t, line 1: 4 fields, not the five MJD, day, month, year, TAI-UTC"),
            ("\n41499.0 1 7 1972 11\n", "t, line 2: the first entry is not MJD 41317, 1972-01-01, 10 s"),
            (&GOOD.replace("41499.0", "41498.0"), "t, line 4: 1972-07-01 is MJD 41499, not 41498"),
            (
                &GOOD.replace("  11\n", "  12\n"),
                "t, line 4: TAI-UTC goes from 10 s to 12 s, not by one second",
            ),
            (&GOOD.replace("  11\n", "  1x\n"), "t, line 4: TAI-UTC \"1x\" is not a whole number"),
            (&format!("{GOOD}41317.0 1 1 1972 10\n"), "t, line 5: MJD 41317 does not follow MJD 41499"),
            (
                &GOOD.replace("1  7 1972", "31  6 1972"),
                "t, line 4: date: given 1972-06-31, allowed days 1 to 30 in 1972-06",
            ),
            (
                &GOOD.replace("28 June", "soon"),
                "t, line 1: date of expiry \"soon 2027\" is not of the form 28 June 2027",
            ),
        ] {
            let error = LeapSeconds::parse(text, "t").unwrap_err();
            assert!(error.is_table());
            assert_eq!(error.to_string(), wanted);
        }
    }
}
