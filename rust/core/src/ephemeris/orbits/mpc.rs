//! The Minor Planet Center's orbit lines: minor planets and comets, in fixed columns.
//!
//! Formats from the Center's pages *Export Format for Minor-Planet Orbits* and *Format for Comet Orbits* [from memory].
//! Columns count from 1.
//!
//! | minor planets | | comets | |
//! |---|---|---|---|
//! | 1–7 | packed designation | 1–12 | number, kind, packed designation |
//! | 9–13 | H | 15–29 | perihelion: year, month, day TT |
//! | 15–19 | G | 31–39 | q, au |
//! | 21–25 | packed epoch, 0h TT | 42–49 | e |
//! | 27–35 | mean anomaly, ° | 52–59 | argument of perihelion, ° |
//! | 38–46 | argument of perihelion, ° | 62–69 | node, ° |
//! | 49–57 | node, ° | 72–79 | inclination, ° |
//! | 60–68 | inclination, ° | 82–89 | epoch: yyyymmdd, 0h TT, or blank |
//! | 71–79 | e | 92–95 | absolute magnitude |
//! | 81–91 | mean daily motion, ° | 97–100 | slope |
//! | 93–103 | a, au | 103– | name |
//!
//! Dates are Gregorian. Every line that is not blank becomes a row or a rejection: none is lost, none stops the others.

use super::table::{Orbits, from_mean_anomaly, from_perihelion};
use super::{Elements, designation};
use crate::constants::RADIANS_PER_DEGREE;
use crate::ephemeris::photometry::Brightness;
use crate::error::Status;
use crate::time::Date;

/// A line that is an orbit.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Where it stands in the text, from 1.
    pub line: usize,
    /// Designation, unpacked.
    pub designation: String,
    /// The orbit.
    pub elements: Elements,
    /// H and G; for a comet its total magnitude.
    pub brightness: Brightness,
}

/// A line that is none.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Rejected {
    /// Where it stands in the text, from 1.
    pub line: usize,
    /// First and last column at fault, from 1, both included.
    pub columns: (usize, usize),
    /// What is wrong there.
    pub reason: String,
}

impl std::fmt::Display for Rejected {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let (first, last) = self.columns;
        write!(f, "line {}, columns {first}-{last}: {}", self.line, self.reason)
    }
}

/// What a text held, in its order.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Lines {
    /// The orbits.
    pub rows: Vec<Row>,
    /// The other lines.
    pub rejected: Vec<Rejected>,
}

impl Lines {
    /// The rows as orbits, in their order.
    pub fn orbits(&self) -> Orbits {
        let mut orbits = Orbits::new();
        for row in &self.rows {
            orbits.push(Ok(row.elements), row.brightness);
        }
        orbits
    }
}

/// Reads minor-planet lines. Everything up to a line of dashes is a heading, if there is such a line; blank lines are
/// passed over.
pub fn minor_planets(text: &str) -> Lines {
    read(text, heading(text), minor_planet)
}

/// Reads comet lines; blank lines are passed over. Without an epoch the perihelion is the epoch, as the Center has it for
/// unperturbed orbits.
pub fn comets(text: &str) -> Lines {
    read(text, 0, comet)
}

/// Reads lines of minor planets and of comets, each by what it looks like; a heading ends with a line of dashes.
///
/// A line is taken for a comet's when column 5 is one of the kinds `ACDIPX` and columns 15 to 18 are a year.
pub fn orbit_lines(text: &str) -> Lines {
    read(text, heading(text), |number, line| {
        let bytes = line.as_bytes();
        let kind = bytes.get(4).is_some_and(|kind| b"ACDIPX".contains(kind));
        let year = bytes.get(14..18).is_some_and(|year| year.iter().all(u8::is_ascii_digit));
        if kind && year { comet(number, line) } else { minor_planet(number, line) }
    })
}

/// Lines of a heading: those up to a line of dashes, if there is one.
fn heading(text: &str) -> usize {
    let is_rule = |line: &str| line.len() >= 20 && line.trim_end().bytes().all(|c| c == b'-');
    text.lines().position(is_rule).map_or(0, |rule| rule + 1)
}

/// Columns at fault and reason.
type Fault = ((usize, usize), String);

fn read(text: &str, heading: usize, parse: fn(usize, &str) -> Result<Row, Fault>) -> Lines {
    let mut lines = Lines::default();
    for (index, line) in text.lines().enumerate().skip(heading) {
        if line.trim().is_empty() {
            continue;
        }
        match parse(index + 1, line) {
            Ok(row) => lines.rows.push(row),
            Err((columns, reason)) => lines.rejected.push(Rejected { line: index + 1, columns, reason }),
        }
    }
    lines
}

/// The text in columns `first` to `last`; what is missing at the end of a line is blank.
fn columns(line: &str, first: usize, last: usize) -> Result<&str, Fault> {
    let end = last.min(line.len());
    if first > end {
        return Ok("");
    }
    line.get(first - 1..end).ok_or_else(|| ((first, last), "not plain ASCII".into()))
}

fn number(line: &str, (first, last): (usize, usize), what: &str) -> Result<f64, Fault> {
    let text = columns(line, first, last)?.trim();
    if line.len() < last && !text.is_empty() && line.len() >= first {
        return Err(((first, last), format!("{what}: the line ends at column {}", line.len())));
    }
    let value = text.parse::<f64>().ok().filter(|value| value.is_finite());
    value.ok_or_else(|| {
        let given = if text.is_empty() { "blank".into() } else { format!("{text:?} is no number") };
        ((first, last), format!("{what}: {given}"))
    })
}

/// A number that may be blank.
fn optional(line: &str, range: (usize, usize), what: &str) -> Result<Option<f64>, Fault> {
    if columns(line, range.0, range.1)?.trim().is_empty() {
        Ok(None)
    } else {
        number(line, range, what).map(Some)
    }
}

fn within(value: f64, low: f64, high: f64, range: (usize, usize), what: &str) -> Result<f64, Fault> {
    if (low..=high).contains(&value) {
        Ok(value)
    } else {
        Err((range, format!("{what}: {value} is outside {low} to {high}")))
    }
}

/// A degree column, as radians.
fn degrees(line: &str, range: (usize, usize), what: &str, high: f64) -> Result<f64, Fault> {
    let low = if high < 360.0 { 0.0 } else { -high };
    Ok(within(number(line, range, what)?, low, high, range, what)? * RADIANS_PER_DEGREE)
}

fn mjd(year: i32, month: u32, day: u32, range: (usize, usize), what: &str) -> Result<f64, Fault> {
    Date::new(year, month, day)
        .map(|date| date.mjd() as f64)
        .map_err(|_| (range, format!("{what}: {year}-{month:02}-{day:02} does not exist")))
}

/// What the checks column by column let pass and the orbit as a whole does not.
fn impossible(status: Status, range: (usize, usize)) -> Fault {
    (range, format!("no such orbit ({})", status.word()))
}

const MINOR_PLANET_COLUMNS: usize = 103;

fn minor_planet(line_number: usize, line: &str) -> Result<Row, Fault> {
    if line.trim_end().len() < MINOR_PLANET_COLUMNS {
        let from = line.trim_end().len() + 1;
        return Err(((from, MINOR_PLANET_COLUMNS), format!("the line ends at column {}", from - 1)));
    }
    let packed = columns(line, 1, 7)?;
    let designation = designation::minor_planet(packed)
        .ok_or_else(|| ((1, 7), format!("designation: {:?} is no packed designation", packed.trim())))?;
    let h = optional(line, (9, 13), "H")?.unwrap_or(f64::NAN);
    let g = optional(line, (15, 19), "G")?.unwrap_or(0.15);
    let packed = columns(line, 21, 25)?;
    let (year, month, day) = designation::date(packed)
        .ok_or_else(|| ((21, 25), format!("epoch: {packed:?} is no packed date")))?;
    let epoch = mjd(year, month, day, (21, 25), "epoch")?;
    let mean_anomaly = degrees(line, (27, 35), "mean anomaly", 360.0)?;
    let argument = degrees(line, (38, 46), "argument of perihelion", 360.0)?;
    let node = degrees(line, (49, 57), "node", 360.0)?;
    let inclination = degrees(line, (60, 68), "inclination", 180.0)?;
    let e = number(line, (71, 79), "eccentricity")?;
    if !(0.0..1.0).contains(&e) {
        return Err(((71, 79), format!("eccentricity: {e} is no ellipse's (0 to below 1)")));
    }
    let a = number(line, (93, 103), "semi-major axis")?;
    if a <= 0.0 {
        return Err(((93, 103), format!("semi-major axis: {a} is not above 0")));
    }
    // Says nothing new, but what contradicts it has been damaged.
    if let Some(motion) = optional(line, (81, 91), "daily motion")? {
        let expected = super::elements::mean_motion(a * (1.0 - e), e) / RADIANS_PER_DEGREE;
        if (motion - expected).abs() > 1e-3 * expected + 1e-8 {
            let reason = format!("daily motion {motion} contradicts the semi-major axis {a} ({expected:.8})");
            return Err(((81, 103), reason));
        }
    }
    let elements = from_mean_anomaly(epoch, e, [inclination, node, argument], a, mean_anomaly)
        .map_err(|status| impossible(status, (27, 103)))?;
    Ok(Row { line: line_number, designation, elements, brightness: Brightness::Hg { h, g } })
}

const COMET_COLUMNS: usize = 79;

fn comet(line_number: usize, line: &str) -> Result<Row, Fault> {
    if line.trim_end().len() < COMET_COLUMNS {
        let from = line.trim_end().len() + 1;
        return Err(((from, COMET_COLUMNS), format!("the line ends at column {}", from - 1)));
    }
    let packed = columns(line, 1, 12)?;
    let designation = designation::comet(packed)
        .ok_or_else(|| ((1, 12), format!("designation: {:?} is no packed designation", packed.trim())))?;
    let whole = |range, what| -> Result<f64, Fault> {
        let value = number(line, range, what)?;
        if value.fract() == 0.0 && value.abs() < 1e5 {
            Ok(value)
        } else {
            Err((range, format!("{what}: {value} is not a whole number")))
        }
    };
    let year = whole((15, 18), "perihelion year")? as i32;
    let month = within(whole((20, 21), "perihelion month")?, 1.0, 12.0, (20, 21), "perihelion month")? as u32;
    let day = within(number(line, (23, 29), "perihelion day")?, 1.0, 32.0, (23, 29), "perihelion day")?;
    let perihelion = mjd(year, month, day.floor() as u32, (15, 29), "perihelion")? + day.fract();
    let q = number(line, (31, 39), "perihelion distance")?;
    if q <= 0.0 {
        return Err(((31, 39), format!("perihelion distance: {q} is not above 0")));
    }
    let e = number(line, (42, 49), "eccentricity")?;
    if e < 0.0 {
        return Err(((42, 49), format!("eccentricity: {e} is below 0")));
    }
    let argument = degrees(line, (52, 59), "argument of perihelion", 360.0)?;
    let node = degrees(line, (62, 69), "node", 360.0)?;
    let inclination = degrees(line, (72, 79), "inclination", 180.0)?;
    let epoch = if columns(line, 82, 89)?.trim().is_empty() {
        perihelion
    } else {
        let year = whole((82, 85), "epoch year")? as i32;
        let month = within(whole((86, 87), "epoch month")?, 1.0, 12.0, (86, 87), "epoch month")? as u32;
        let day = within(whole((88, 89), "epoch day")?, 1.0, 31.0, (88, 89), "epoch day")? as u32;
        mjd(year, month, day, (82, 89), "epoch")?
    };
    let h = optional(line, (92, 95), "absolute magnitude")?.unwrap_or(f64::NAN);
    let k = optional(line, (97, 100), "slope")?.unwrap_or(4.0);
    let elements = from_perihelion(epoch, e, [inclination, node, argument], q, perihelion)
        .map_err(|status| impossible(status, (15, 89)))?;
    Ok(Row { line: line_number, designation, elements, brightness: Brightness::Comet { h, k } })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::SECONDS_PER_DAY;

    // Written after the Center's formats [M]: no copies of its lines, and their digits are of no orbit's authority.
    const CERES: &str = "00001    3.34  0.15 K239D  60.07881   73.42179   80.25496   10.58688  0.0789126  0.21411523   2.7672544  0 E2023-F87  7283 123 1801-2023 0.65 M-v 30k MPCLINUX   4000      (1) Ceres              20230321";
    const PROVISIONAL: &str = "K23A01B 21.1   0.15 K239D 123.45678  200.00000  100.00000    5.12345  0.4512345  0.30000000   2.2100000  7 E2023-A00    20   1   10 days 0.40";
    const COMET: &str = "    CJ95O010  1997 03 29.6333  0.906507  0.994945  130.6044  282.1468   89.2186  20230225  -1.8  4.0  C/1995 O1 (Hale-Bopp)                                    MPC106342";
    const PERIODIC: &str = "0001P         1986 02  8.6613  0.574733  0.967143  111.3325   58.4201  162.2627             4.0  8.0  1P/Halley                                                98, 1083";

    /// The daily motion that goes with a semi-major axis, for lines made here.
    fn with_motion(line: &str, a: f64) -> String {
        let motion = super::super::elements::mean_motion(a, 0.0) / RADIANS_PER_DEGREE;
        format!("{}{motion:11.8}{}", &line[..80], &line[91..])
    }

    #[test]
    fn lines_become_orbits() {
        let text =
            format!("MPCORB heading\n{}\n{CERES}\n\n{}\n", "-".repeat(160), with_motion(PROVISIONAL, 2.21));
        let lines = minor_planets(&text);
        assert_eq!(lines.rejected, []);
        assert_eq!(lines.rows.len(), 2);
        let ceres = &lines.rows[0];
        assert_eq!((ceres.line, ceres.designation.as_str()), (3, "1"));
        assert_eq!(ceres.brightness, Brightness::Hg { h: 3.34, g: 0.15 });
        // K239D is 2023 September 13.
        let epoch = ceres.elements.epoch.to_tt();
        assert!(epoch.seconds_since(crate::time::Instant::from_mjd(60_200.0, 0.0)).abs() < 1e-6);
        assert!((ceres.elements.semi_major_axis_au() - 2.7672544).abs() < 1e-13);
        assert!((ceres.elements.mean_anomaly() / RADIANS_PER_DEGREE - 60.07881).abs() < 1e-11);
        assert!((ceres.elements.inclination / RADIANS_PER_DEGREE - 10.58688).abs() < 1e-13);
        assert_eq!((lines.rows[1].line, lines.rows[1].designation.as_str()), (5, "2023 AB1"));
        assert_eq!(lines.orbits().len(), 2);
    }

    #[test]
    fn comet_lines_become_orbits() {
        let lines = comets(&format!("{COMET}\n{PERIODIC}\n"));
        assert_eq!(lines.rejected, []);
        let [hale_bopp, halley] = &lines.rows[..] else { panic!("two rows") };
        assert_eq!(hale_bopp.designation, "C/1995 O1");
        assert_eq!(hale_bopp.brightness, Brightness::Comet { h: -1.8, k: 4.0 });
        assert_eq!(hale_bopp.elements.perihelion_au, 0.906507);
        // From 1997-03-29.6333 to 2023-02-25.
        assert!((hale_bopp.elements.since_perihelion_d - 9463.3667).abs() < 1e-6);
        assert_eq!(halley.designation, "1P");
        assert_eq!(halley.elements.since_perihelion_d, 0.0);
        let perihelion = crate::time::Instant::from_mjd(46_469.0, 0.6613);
        assert!(halley.elements.epoch.to_tt().seconds_since(perihelion).abs() < 1e-11 * SECONDS_PER_DAY);
    }

    /// A line with the text in columns from `first` on replaced.
    fn replaced(line: &str, first: usize, text: &str) -> String {
        format!("{}{text}{}", &line[..first - 1], &line[first - 1 + text.len()..])
    }

    #[test]
    fn malformed_minor_planet_lines_are_rejected_with_their_place() {
        let cases = [
            (CERES[..62].to_string(), (63, 103), "ends at column 62"),
            (replaced(CERES, 71, "1.0789126"), (71, 79), "eccentricity: 1.0789126"),
            (replaced(CERES, 70, " -0.078912"), (71, 79), "eccentricity"),
            (replaced(CERES, 21, "K23DD"), (21, 25), "\"K23DD\" is no packed date"),
            (replaced(CERES, 21, "K232V"), (21, 25), "2023-02-31 does not exist"),
            (replaced(CERES, 27, "  6O.0788"), (27, 35), "\"6O.0788\" is no number"),
            (replaced(CERES, 60, "190.58688"), (60, 68), "190.58688 is outside 0 to 180"),
            (replaced(CERES, 93, "  0.0000000"), (93, 103), "is not above 0"),
            (replaced(CERES, 93, "  2.9672544"), (81, 103), "contradicts"),
            (replaced(CERES, 38, "         "), (38, 46), "argument of perihelion: blank"),
            (replaced(CERES, 1, "0000? "), (1, 7), "\"0000?\" is no packed designation"),
            (replaced(CERES, 27, "nan      "), (27, 35), "no number"),
            (replaced(CERES, 9, "é3"), (9, 13), "H"),
        ];
        for (line, columns, reason) in cases {
            let lines = minor_planets(&format!("{CERES}\n{line}\n{CERES}"));
            assert_eq!(lines.rows.len(), 2, "{line}");
            let rejected = &lines.rejected[0];
            assert_eq!((rejected.line, rejected.columns), (2, columns), "{rejected}");
            assert!(rejected.reason.contains(reason), "{rejected}");
        }
        let shown = minor_planets(&CERES[..62]).rejected[0].to_string();
        assert_eq!(shown, "line 1, columns 63-103: the line ends at column 62");
    }

    #[test]
    fn malformed_comet_lines_are_rejected_with_their_place() {
        let cases = [
            (COMET[..55].to_string(), (56, 79), "ends at column 55"),
            (replaced(COMET, 31, " 0.000000"), (31, 39), "perihelion distance: 0 is not above 0"),
            (replaced(COMET, 31, "-0.906507"), (31, 39), "is not above 0"),
            (replaced(COMET, 42, "-0.99494"), (42, 49), "is below 0"),
            (replaced(COMET, 20, "13"), (20, 21), "13 is outside 1 to 12"),
            (replaced(COMET, 20, "02"), (15, 29), "1997-02-29 does not exist"),
            (replaced(COMET, 82, "20230231"), (82, 89), "2023-02-31 does not exist"),
            (replaced(COMET, 72, "199.2186"), (72, 79), "outside 0 to 180"),
            (replaced(COMET, 5, "Q"), (1, 12), "no packed designation"),
        ];
        for (line, columns, reason) in cases {
            let lines = comets(&format!("{line}\n{COMET}"));
            assert_eq!(lines.rows.len(), 1, "{line}");
            let rejected = &lines.rejected[0];
            assert_eq!((rejected.line, rejected.columns), (1, columns), "{rejected}");
            assert!(rejected.reason.contains(reason), "{rejected}");
        }
    }

    /// A file of both kinds, with a heading: each line by what it looks like, none lost.
    #[test]
    fn mixed_lines_are_told_apart() {
        let short = &CERES[..80];
        let text = format!("heading\n{}\n{CERES}\n{COMET}\n{short}\n{PERIODIC}\n", "-".repeat(160));
        let lines = orbit_lines(&text);
        assert_eq!(lines.rows.iter().map(|row| row.line).collect::<Vec<_>>(), [3, 4, 6]);
        assert_eq!(
            lines.rows[..2],
            [&minor_planets(CERES).rows[0], &comets(COMET).rows[0]]
                .map(|row| Row { line: if row.designation.contains("1995") { 4 } else { 3 }, ..row.clone() })
        );
        assert_eq!((lines.rejected.len(), lines.rejected[0].line), (1, 5));
    }

    /// Any line cut anywhere, and any column overwritten by any of some bad characters, is a row or a rejection.
    #[test]
    fn nothing_panics_and_nothing_is_lost() {
        for (line, parse) in
            [(CERES, minor_planets as fn(&str) -> Lines), (COMET, comets), (PERIODIC, comets)]
        {
            for end in 1..line.len() {
                let cut = &line[..end];
                let lines = parse(cut);
                let expected = usize::from(!cut.trim().is_empty());
                assert_eq!(lines.rows.len() + lines.rejected.len(), expected);
                for bad in ["\u{e9}", "-", "e", "9", " ", "\0"] {
                    let lines = parse(&format!("{cut}{bad}{}", &line[end + 1..]));
                    assert_eq!(lines.rows.len() + lines.rejected.len(), 1);
                }
            }
        }
    }
}
