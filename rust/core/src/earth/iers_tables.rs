//! The Earth orientation tables of the IERS as text: C04 and finals2000A.

use crate::constants::{RADIANS_PER_ARCSECOND, RADIANS_PER_MILLIARCSECOND};
use crate::error::{Error, Result};
use crate::time::Date;

/// Earth orientation at 0h UTC of a day.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Row {
    pub mjd: i64,
    /// The line it stands on, from 1.
    pub line: usize,
    pub measured: bool,
    pub ut1_minus_utc_s: f64,
    /// xp and yp, radians.
    pub pole: [f64; 2],
    /// dX and dY with respect to IAU 2000A, radians, where the table has them.
    pub offsets: Option<[f64; 2]>,
    /// Formal error of UT1−UTC, s.
    pub ut1_error_s: f64,
    /// Formal error of the pole, radians: that of its two coordinates together.
    pub pole_error: f64,
}

/// What a value must stay within to be believed.
const UT1_MINUS_UTC_LIMIT_S: f64 = 2.0;
const POLE_LIMIT_ARCSEC: f64 = 2.0;
const OFFSETS_LIMIT_MAS: f64 = 1_000.0;

/// A line of fixed columns, with the place of its faults.
struct Line<'a> {
    text: &'a str,
    number: usize,
    source: &'a str,
}

impl<'a> Line<'a> {
    fn fault(&self, message: impl Into<String>) -> Error {
        Error::table(self.source, self.number, message)
    }

    /// Columns `first` to `last`, counted from 1, without surrounding blanks; blank past the line's end.
    fn columns(&self, first: usize, last: usize) -> &'a str {
        // The lines are plain ASCII (checked), so any byte is a place to cut.
        let end = last.min(self.text.len());
        if first > end { "" } else { self.text[first - 1..end].trim() }
    }

    fn is_blank(&self, first: usize, last: usize) -> bool {
        self.columns(first, last).is_empty()
    }

    fn number(&self, name: &str, first: usize, last: usize) -> Result<f64> {
        let text = self.columns(first, last);
        match text.parse::<f64>() {
            Ok(value) if value.is_finite() => Ok(value),
            _ if text.is_empty() => Err(self.fault(format!("{name} (columns {first} to {last}) is blank"))),
            _ => Err(self.fault(format!("{name} (columns {first} to {last}) is not a number: {text:?}"))),
        }
    }

    fn number_within(&self, name: &str, first: usize, last: usize, limit: f64) -> Result<f64> {
        let value = self.number(name, first, last)?;
        if value.abs() > limit {
            return Err(
                self.fault(format!("{name} (columns {first} to {last}) is {value}, which is beyond {limit}"))
            );
        }
        Ok(value)
    }

    /// The MJD at columns `first` to `last`: a whole one.
    fn mjd(&self, first: usize, last: usize) -> Result<i64> {
        let mjd = self.number("MJD", first, last)?;
        if mjd.fract() != 0.0 || mjd.abs() > 1e6 {
            return Err(self.fault(format!("MJD {mjd} is not at 0h of a day")));
        }
        Ok(mjd as i64)
    }
}

/// The lines that carry data, each checked to be plain ASCII.
fn lines<'a>(text: &'a str, source: &'a str) -> impl Iterator<Item = Result<Line<'a>>> {
    text.lines().enumerate().filter(|(_, text)| !text.trim().is_empty() && !text.starts_with('#')).map(
        move |(index, text)| {
            let line = Line { text, number: index + 1, source };
            if text.is_ascii() { Ok(line) } else { Err(line.fault("not plain ASCII")) }
        },
    )
}

/// Rows must follow each other day by day.
fn follows(line: &Line<'_>, last: Option<i64>, mjd: i64) -> Result<()> {
    match last {
        Some(last) if mjd != last + 1 => {
            Err(line.fault(format!("MJD {mjd} after MJD {last}: the days do not follow each other")))
        }
        _ => Ok(()),
    }
}

/// The series C04 as the IERS publishes it since 2023 (`eopc04.1962-now`; 20 C04): fixed columns, one line
/// a day at 0h UTC, errors in the second half of the line. Every row is measured.
pub(super) fn parse_c04(text: &str, source: &str) -> Result<Vec<Row>> {
    let mut rows: Vec<Row> = Vec::new();
    for line in lines(text, source) {
        let line = line?;
        let mjd = line.mjd(17, 26)?;
        let date = [line.number("year", 1, 4)?, line.number("month", 5, 8)?, line.number("day", 9, 12)?];
        let wanted = Date::from_mjd(mjd);
        if date != [f64::from(wanted.year()), f64::from(wanted.month()), f64::from(wanted.day())] {
            return Err(line.fault(format!("MJD {mjd} is {wanted}, not the date of the line")));
        }
        if line.number("hour", 13, 16)? != 0.0 {
            return Err(line.fault("not at 0h"));
        }
        follows(&line, rows.last().map(|r| r.mjd), mjd)?;
        let pole = [
            line.number_within("x", 27, 38, POLE_LIMIT_ARCSEC)? * RADIANS_PER_ARCSECOND,
            line.number_within("y", 39, 50, POLE_LIMIT_ARCSEC)? * RADIANS_PER_ARCSECOND,
        ];
        let offsets_limit = OFFSETS_LIMIT_MAS * 1e-3;
        let offsets = [
            line.number_within("dX", 63, 74, offsets_limit)? * RADIANS_PER_ARCSECOND,
            line.number_within("dY", 75, 86, offsets_limit)? * RADIANS_PER_ARCSECOND,
        ];
        let pole_error = line
            .number_within("error of x", 123, 134, POLE_LIMIT_ARCSEC)?
            .hypot(line.number_within("error of y", 135, 146, POLE_LIMIT_ARCSEC)?);
        rows.push(Row {
            mjd,
            line: line.number,
            measured: true,
            ut1_minus_utc_s: line.number_within("UT1-UTC", 51, 62, UT1_MINUS_UTC_LIMIT_S)?,
            pole,
            offsets: Some(offsets),
            ut1_error_s: line.number_within("error of UT1-UTC", 147, 158, UT1_MINUS_UTC_LIMIT_S)?.abs(),
            pole_error: pole_error * RADIANS_PER_ARCSECOND,
        });
    }
    if rows.is_empty() {
        return Err(Error::table(source, 0, "no line of data in it"));
    }
    Ok(rows)
}

/// The table finals2000A of the IERS (Bulletins A and B): fixed columns, one line a day at 0h UTC,
/// measured (flag I) or predicted (flag P). Bulletin B is taken where it is given, Bulletin A elsewhere;
/// the errors are those of Bulletin A. The dates past the last prediction have no values and are left out.
pub(super) fn parse_finals2000a(text: &str, source: &str) -> Result<Vec<Row>> {
    let mut rows: Vec<Row> = Vec::new();
    let mut last: Option<i64> = None;
    let mut ended = false;
    for line in lines(text, source) {
        let line = line?;
        let mjd = line.mjd(8, 15)?;
        let date = [line.number("year", 1, 2)?, line.number("month", 3, 4)?, line.number("day", 5, 6)?];
        let wanted = Date::from_mjd(mjd);
        let year = f64::from(wanted.year().rem_euclid(100));
        if date != [year, f64::from(wanted.month()), f64::from(wanted.day())] {
            return Err(line.fault(format!("MJD {mjd} is {wanted}, not the date of the line")));
        }
        follows(&line, last, mjd)?;
        last = Some(mjd);
        if line.is_blank(17, 57) || line.is_blank(58, 78) {
            ended = true;
            continue;
        }
        if ended {
            return Err(line.fault(format!("values at MJD {mjd} after days without")));
        }
        let flag = |name: &str, column: usize| match line.columns(column, column) {
            "I" => Ok(true),
            "P" => Ok(false),
            other => Err(line.fault(format!("flag of {name} (column {column}) is {other:?}, not I or P"))),
        };
        let measured = flag("the pole", 17)? & flag("UT1-UTC", 58)?;
        let has_bulletin_b = !line.is_blank(135, 144) && !line.is_blank(155, 165);
        let (x, y, ut1) = if has_bulletin_b {
            ((135, 144), (145, 154), (155, 165))
        } else {
            ((19, 27), (38, 46), (59, 68))
        };
        let pole = [
            line.number_within("x", x.0, x.1, POLE_LIMIT_ARCSEC)? * RADIANS_PER_ARCSECOND,
            line.number_within("y", y.0, y.1, POLE_LIMIT_ARCSEC)? * RADIANS_PER_ARCSECOND,
        ];
        let offsets = |dx: (usize, usize), dy: (usize, usize)| -> Result<Option<[f64; 2]>> {
            Ok(Some([
                line.number_within("dX", dx.0, dx.1, OFFSETS_LIMIT_MAS)? * RADIANS_PER_MILLIARCSECOND,
                line.number_within("dY", dy.0, dy.1, OFFSETS_LIMIT_MAS)? * RADIANS_PER_MILLIARCSECOND,
            ]))
        };
        let offsets = if !line.is_blank(166, 185) {
            offsets((166, 175), (176, 185))?
        } else if !line.is_blank(98, 125) {
            offsets((98, 106), (117, 125))?
        } else {
            None
        };
        let pole_error = line
            .number_within("error of x", 28, 36, POLE_LIMIT_ARCSEC)?
            .hypot(line.number_within("error of y", 47, 55, POLE_LIMIT_ARCSEC)?);
        rows.push(Row {
            mjd,
            line: line.number,
            measured,
            ut1_minus_utc_s: line.number_within("UT1-UTC", ut1.0, ut1.1, UT1_MINUS_UTC_LIMIT_S)?,
            pole,
            offsets,
            ut1_error_s: line.number_within("error of UT1-UTC", 69, 78, UT1_MINUS_UTC_LIMIT_S)?.abs(),
            pole_error: pole_error * RADIANS_PER_ARCSECOND,
        });
    }
    if rows.is_empty() {
        return Err(Error::table(source, 0, "no line with values in it"));
    }
    Ok(rows)
}

#[cfg(test)]
mod tests {
    use super::*;

    const C04: &str = include_str!("../../../../tests/reference/earth_c04.txt");
    const FINALS: &str = include_str!("../../../../tests/reference/earth_finals2000a.txt");

    // Excerpts, unchanged, of the tables carried by PyPI astropy-iers-data: C04 for MJD 61250 to 61312,
    // finals2000A for MJD 61300 to 61712.

    #[test]
    fn c04_is_read_to_the_last_digit() {
        let rows = parse_c04(C04, "c04").unwrap();
        assert_eq!((rows.len(), rows[0].mjd, rows[62].mjd), (63, 61_250, 61_312));
        let arcsec = |v: f64| v * RADIANS_PER_ARCSECOND;
        let wanted = Row {
            mjd: 61_312,
            line: 69,
            measured: true,
            ut1_minus_utc_s: -0.020_614_3,
            pole: [arcsec(0.177_494), arcsec(0.326_038)],
            offsets: Some([arcsec(0.000_315), arcsec(-0.000_226)]),
            ut1_error_s: 0.000_050_6,
            pole_error: arcsec(0.000_046_f64.hypot(0.000_046)),
        };
        assert_eq!(rows[62], wanted);
    }

    #[test]
    fn finals_are_read_to_the_last_digit() {
        let rows = parse_finals2000a(FINALS, "finals").unwrap();
        assert_eq!((rows[0].mjd, rows.last().unwrap().mjd), (61_300, 61_707));
        let row = |mjd: i64| rows[(mjd - 61_300) as usize];
        let arcsec = |v: f64| v * RADIANS_PER_ARCSECOND;
        let wanted = Row {
            mjd: 61_313,
            line: 14,
            measured: true,
            ut1_minus_utc_s: -0.021_712_3,
            pole: [arcsec(0.176_124), arcsec(0.325_814)],
            offsets: Some([0.361 * RADIANS_PER_MILLIARCSECOND, -0.107 * RADIANS_PER_MILLIARCSECOND]),
            ut1_error_s: 0.000_010_9,
            pole_error: arcsec(0.000_026_f64.hypot(0.000_026)),
        };
        assert_eq!(row(61_313), wanted);
        assert!(row(61_335).measured && !row(61_336).measured);
        assert!(row(61_416).offsets.is_some() && row(61_417).offsets.is_none());
        assert_eq!(row(61_707).ut1_error_s, 0.025_409_6);
    }

    /// The table's first line of 1973 as it stands in finals2000A, where Bulletin B is given too.
    const OF_1973: &str = "73 1 2 41684.00 I  0.120733 0.009786  0.136966 0.015902  I 0.8084178 0.0002710  0.0000 0.1916  P    -0.766    0.199    -0.720    0.300   .143000   .137000   .8075000   -18.637    -3.667  ";

    #[test]
    fn bulletin_b_is_preferred_where_it_is_given() {
        let row = parse_finals2000a(OF_1973, "finals").unwrap()[0];
        assert_eq!(row.ut1_minus_utc_s, 0.807_5);
        assert_eq!(row.pole[0], 0.143 * RADIANS_PER_ARCSECOND);
        assert_eq!(row.offsets.unwrap()[1], -3.667 * RADIANS_PER_MILLIARCSECOND);
        assert_eq!(row.ut1_error_s, 0.000_271_0);
        let bulletin_a = parse_finals2000a(&OF_1973[..134], "finals").unwrap()[0];
        assert_eq!(bulletin_a.ut1_minus_utc_s, 0.808_417_8);
        assert_eq!(bulletin_a.offsets.unwrap()[0], -0.766 * RADIANS_PER_MILLIARCSECOND);
    }

    /// Line `number` (from 1) of a text with `from` replaced by `to`, which must change it.
    fn spoilt(text: &str, number: usize, from: &str, to: &str) -> String {
        let mut lines: Vec<String> = text.lines().map(str::to_string).collect();
        let line = lines[number - 1].replacen(from, to, 1);
        assert_ne!(line, lines[number - 1]);
        lines[number - 1] = line;
        lines.join("\n")
    }

    #[test]
    fn a_malformed_c04_is_an_error_with_its_line() {
        let cut: String = C04.lines().map(|l| format!("{}\n", &l[..l.len().min(100)])).collect();
        let gap: Vec<&str> = C04.lines().enumerate().filter(|(i, _)| *i != 19).map(|(_, l)| l).collect();
        for (text, wanted) in [
            (String::new(), "c04: no line of data in it"),
            ("# only a comment\n".into(), "c04: no line of data in it"),
            (cut, "c04, line 7: error of x (columns 123 to 134) is blank"),
            (gap.join("\n"), "c04, line 20: MJD 61264 after MJD 61262: the days do not follow each other"),
            (
                spoilt(C04, 7, "61250.00", "61251.00"),
                "c04, line 7: MJD 61251 is 2026-07-30, not the date of the line",
            ),
            (spoilt(C04, 8, "61251.00", "61251.50"), "c04, line 8: MJD 61251.5 is not at 0h of a day"),
            (
                spoilt(C04, 9, "61252.00", "     NaN"),
                "c04, line 9: MJD (columns 17 to 26) is not a number: \"NaN\"",
            ),
            (
                spoilt(C04, 69, "-0.0206143", " 9.0206143"),
                "c04, line 69: UT1-UTC (columns 51 to 62) is 9.0206143, which is beyond 2",
            ),
            (
                spoilt(C04, 69, "-0.0206143", "-0.02O6143"),
                "c04, line 69: UT1-UTC (columns 51 to 62) is not a number: \"-0.02O6143\"",
            ),
            (spoilt(C04, 69, "   0  61312", "  12  61312"), "c04, line 69: not at 0h"),
            (spoilt(C04, 69, "0.177494", "0.17749½"), "c04, line 69: not plain ASCII"),
        ] {
            let error = parse_c04(&text, "c04").unwrap_err();
            assert!(error.is_table());
            assert_eq!(error.to_string(), wanted);
        }
    }

    #[test]
    fn malformed_finals_are_an_error_with_its_line() {
        let no_values: String =
            FINALS.lines().filter(|l| l[16..].trim().is_empty()).map(|l| format!("{l}\n")).collect();
        for (text, wanted) in [
            (String::new(), "finals: no line with values in it"),
            (no_values, "finals: no line with values in it"),
            (
                spoilt(FINALS, 3, " I ", " Q "),
                "finals, line 3: flag of the pole (column 17) is \"Q\", not I or P",
            ),
            (
                spoilt(FINALS, 14, "-0.0217123", "          "),
                "finals, line 14: UT1-UTC (columns 59 to 68) is blank",
            ),
            (
                spoilt(FINALS, 14, "0.176124", "5.176124"),
                "finals, line 14: x (columns 19 to 27) is 5.176124, which is beyond 2",
            ),
            (
                spoilt(FINALS, 14, "61313.00", "61314.00"),
                "finals, line 14: MJD 61314 is 2026-10-01, not the date of the line",
            ),
            (
                spoilt(FINALS, 14, &FINALS.lines().nth(13).unwrap()[16..], ""),
                "finals, line 15: values at MJD 61314 after days without",
            ),
            (
                FINALS.lines().take(5).chain(FINALS.lines().skip(4)).collect::<Vec<_>>().join("\n"),
                "finals, line 6: MJD 61304 after MJD 61304: the days do not follow each other",
            ),
        ] {
            let error = parse_finals2000a(&text, "finals").unwrap_err();
            assert!(error.is_table());
            assert_eq!(error.to_string(), wanted);
        }
    }
}
