//! Earth orientation as a value: UT1, the pole and the celestial pole offsets at any instant, each with its
//! error and whether it was measured.

use super::daily_table::Table;
use super::iers_tables::{Row, parse_c04, parse_finals2000a};
use crate::error::{Error, Result, Status};
use crate::time::{Instant, LeapSeconds, Tai, Ut1, Utc};

/// Where the Earth's orientation at an instant is known from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[repr(u8)]
pub enum Quality {
    /// Observed (or given by the caller).
    Measured = 0,
    /// Predicted by the IERS.
    Predicted = 1,
    /// Outside the table: carried on by us.
    Extrapolated = 2,
}

impl Quality {
    /// The word for it, as it stands in files and messages.
    pub fn word(self) -> &'static str {
        match self {
            Quality::Measured => "measured",
            Quality::Predicted => "predicted",
            Quality::Extrapolated => "extrapolated",
        }
    }

    /// What a row that rests on it is to be marked with.
    pub fn status(self) -> Status {
        match self {
            Quality::Measured | Quality::Predicted => Status::Ok,
            Quality::Extrapolated => Status::OrientationExtrapolated,
        }
    }
}

/// Earth orientation at one instant.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Pole {
    /// UT1−TAI, s.
    pub ut1_minus_tai_s: f64,
    /// The pole's coordinate xp, radians.
    pub xp: f64,
    /// The pole's coordinate yp, radians.
    pub yp: f64,
    /// The celestial pole offset dX with respect to IAU 2006/2000A, radians.
    pub dx: f64,
    /// The celestial pole offset dY with respect to IAU 2006/2000A, radians.
    pub dy: f64,
    /// Standard error of UT1−TAI, s.
    pub ut1_error_s: f64,
    /// Standard error of the pole, both coordinates together, radians.
    pub pole_error: f64,
    /// Where this is known from.
    pub quality: Quality,
}

/// One table that went into an [`Orientation`], and the days taken from it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Source {
    /// The name that came with the text.
    pub name: String,
    /// What it is: `IERS C04` or `IERS finals2000A`.
    pub kind: &'static str,
    /// The first day taken from it, MJD at 0h UTC.
    pub first_mjd: i64,
    /// The last day taken from it, MJD at 0h UTC.
    pub last_mjd: i64,
}

/// What an [`Orientation`] was made of.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Provenance {
    /// The tables, in the order of their days.
    pub sources: Vec<Source>,
    /// The first day, MJD at 0h UTC.
    pub first_mjd: i64,
    /// The last day that was measured.
    pub last_measured_mjd: i64,
    /// The last day there is, measured or predicted.
    pub last_predicted_mjd: i64,
    /// The last day with celestial pole offsets; after it they fade to zero.
    pub last_offsets_mjd: i64,
}

/// Earth orientation at any instant, from the tables of the IERS or fixed by the caller.
///
/// Between the daily values at 0h UTC everything is interpolated by a twice continuously differentiable
/// cubic spline in TAI, and UT1 as UT1−TAI, which has no steps. Measured: with every second day of C04
/// 2000–2024 left out, the spline meets those days to 8 µs and 0.09 mas (root mean square); with none
/// left out it does better. Before and after the table it is carried
/// on without a break and marked [`Quality::Extrapolated`]. The variations within a day that ocean tides
/// make (up to some 0.05 ms and 0.5 mas; IERS Conventions (2010) chapter 8) are not in the tables and are
/// not added.
#[derive(Debug, Clone, PartialEq)]
pub struct Orientation {
    leap: LeapSeconds,
    kind: Kind,
}

#[derive(Debug, Clone, PartialEq)]
enum Kind {
    Constant { ut1_minus_utc_s: f64, pole: Pole },
    Table(Box<Table>),
}

impl Orientation {
    /// From the text of the IERS tables and their names: the series C04 as far as it reaches, the table
    /// finals2000A (with predictions) after it. Either may be left out, but not both.
    ///
    /// The leap seconds must be those of the tables' days. Errors carry the table's name and the line.
    pub fn from_tables(
        leap: LeapSeconds,
        c04: Option<(&str, &str)>,
        finals2000a: Option<(&str, &str)>,
    ) -> Result<Self> {
        let mut rows: Vec<Row> = Vec::new();
        let mut sources = Vec::new();
        // Of each row, the table it is from.
        let mut named: Vec<&str> = Vec::new();
        if let Some((text, name)) = c04 {
            rows = parse_c04(text, name)?;
            named = vec![name; rows.len()];
            sources.push(source(name, "IERS C04", &rows));
        }
        if let Some((text, name)) = finals2000a {
            let mut late = parse_finals2000a(text, name)?;
            if let Some(last) = rows.last() {
                if late[0].mjd > last.mjd + 1 {
                    return Err(Error::table(
                        name,
                        late[0].line,
                        format!(
                            "begins on MJD {}, but the table before it ends on MJD {}",
                            late[0].mjd, last.mjd
                        ),
                    ));
                }
                late.retain(|row| row.mjd > last.mjd);
            }
            if !late.is_empty() {
                sources.push(source(name, "IERS finals2000A", &late));
                named.resize(rows.len() + late.len(), name);
                rows.append(&mut late);
            }
        }
        if rows.len() < 2 {
            return Err(Error::invalid(
                "Earth orientation tables",
                "less than two days",
                "at least two days",
            ));
        }
        let table = Table::new(&leap, &rows, &named, sources)?;
        Ok(Orientation { leap, kind: Kind::Table(Box::new(table)) })
    }

    /// The same orientation at all times: UT1−UTC in seconds, the pole and the celestial pole offsets in
    /// radians. It counts as measured and without error.
    pub fn constant(leap: LeapSeconds, dut1_s: f64, xp: f64, yp: f64, dx: f64, dy: f64) -> Self {
        let pole = Pole {
            ut1_minus_tai_s: f64::NAN,
            xp,
            yp,
            dx,
            dy,
            ut1_error_s: 0.0,
            pole_error: 0.0,
            quality: Quality::Measured,
        };
        Orientation { leap, kind: Kind::Constant { ut1_minus_utc_s: dut1_s, pole } }
    }

    /// The leap seconds it goes by.
    pub fn leap_seconds(&self) -> &LeapSeconds {
        &self.leap
    }

    /// What it was made of; `None` for a constant one.
    pub fn provenance(&self) -> Option<&Provenance> {
        match &self.kind {
            Kind::Constant { .. } => None,
            Kind::Table(table) => Some(&table.provenance),
        }
    }

    /// Earth orientation at a UTC reading.
    pub fn at(&self, utc: Utc) -> std::result::Result<Pole, Status> {
        Ok(self.at_tai(self.leap.to_tai(utc)?))
    }

    /// Earth orientation at an instant of TAI. Cheap: no search, some 20 ns inside the table.
    ///
    /// Errors: those of the table, `ut1_error_s` and `pole_error`, to which past either end is added a
    /// growth: for UT1 0.0004 (d + √d) + 2.6e-7 d² s after d days, which covered 19 of 20 hindcasts on C04 (the
    /// 0.00025 d^0.75 s of IERS Bulletin A did not: `extrapolation.rs`), for the pole 0.00068 d^0.80
    /// arcseconds as in Bulletin A. NaN in, NaN out. A constant orientation before 1960, where UTC does not
    /// exist, takes TAI−UTC as it was in the beginning of 1960, and is extrapolated.
    pub fn at_tai(&self, tai: Instant<Tai>) -> Pole {
        match &self.kind {
            Kind::Table(table) => table.at(tai),
            Kind::Constant { ut1_minus_utc_s, pole } => {
                let known = self.leap.to_utc(tai).and_then(|(utc, _)| self.leap.tai_minus_utc(utc));
                let first = || {
                    let utc = Utc::from_mjd(LeapSeconds::FIRST_MJD as f64, 0.0);
                    self.leap.tai_minus_utc(utc).unwrap_or(f64::NAN)
                };
                let quality = if known.is_ok() { Quality::Measured } else { Quality::Extrapolated };
                let tai_minus_utc = match known {
                    Ok(value) => value,
                    Err(Status::BeforeUtc) => first(),
                    Err(_) => f64::NAN,
                };
                Pole { ut1_minus_tai_s: ut1_minus_utc_s - tai_minus_utc, quality, ..*pole }
            }
        }
    }

    /// TAI at an instant of UT1. Error: 1e-11 s, the resolution of an instant (`ut1_goes_there_and_back`).
    pub fn tai_at_ut1(&self, ut1: Instant<Ut1>) -> Instant<Tai> {
        // UT1−TAI changes by some 1e-8 s a second, so that each step gains eight digits.
        let mut tai = ut1.to_tai(0.0);
        for _ in 0..3 {
            tai = ut1.to_tai(self.at_tai(tai).ut1_minus_tai_s);
        }
        tai
    }
}

/// UT1 at an instant of TAI, with the orientation at that instant.
pub fn ut1(tai: Instant<Tai>, pole: &Pole) -> Instant<Ut1> {
    tai.to_ut1(pole.ut1_minus_tai_s)
}

fn source(name: &str, kind: &'static str, rows: &[Row]) -> Source {
    Source { name: name.to_string(), kind, first_mjd: rows[0].mjd, last_mjd: rows[rows.len() - 1].mjd }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::{RADIANS_PER_ARCSECOND, RADIANS_PER_MILLIARCSECOND};
    use crate::earth::extrapolation::CHANNELS;
    use crate::time::Date;

    // Excerpts, unchanged, of the tables carried by PyPI astropy-iers-data: C04 for MJD 61250 to 61312,
    // finals2000A for MJD 61300 to 61712.
    const C04: &str = include_str!("../../../../tests/reference/earth_c04.txt");
    const FINALS: &str = include_str!("../../../../tests/reference/earth_finals2000a.txt");

    fn joined() -> Orientation {
        let leap = LeapSeconds::builtin();
        Orientation::from_tables(leap, Some((C04, "c04")), Some((FINALS, "finals"))).unwrap()
    }

    fn at(orientation: &Orientation, day: f64, fraction: f64) -> Pole {
        orientation.at(Utc::from_mjd(day, fraction)).unwrap()
    }

    /// A C04 table of days from `first` on, of UT1−UTC alone.
    fn c04_of(first: i64, ut1_minus_utc_s: &[f64]) -> String {
        let line = |(i, ut1): (usize, &f64)| {
            let mjd = first + i as i64;
            let date = Date::from_mjd(mjd);
            format!(
                "{:4}{:4}{:4}{:4}{mjd:10.2}{:12.6}{:12.6}{ut1:12.7}{:12.6}{:12.6}{:36}{:12.6}{:12.6}{:12.7}\n",
                date.year(),
                date.month(),
                date.day(),
                0,
                0.1,
                0.2,
                0.0,
                0.0,
                "",
                0.00003,
                0.00004,
                0.00001,
            )
        };
        ut1_minus_utc_s.iter().enumerate().map(line).collect()
    }

    #[test]
    fn c04_as_far_as_it_reaches_and_finals_after_it() {
        let orientation = joined();
        let source =
            |name: &str, kind, first_mjd, last_mjd| Source { name: name.into(), kind, first_mjd, last_mjd };
        let wanted = Provenance {
            sources: vec![
                source("c04", "IERS C04", 61_250, 61_312),
                source("finals", "IERS finals2000A", 61_313, 61_707),
            ],
            first_mjd: 61_250,
            last_measured_mjd: 61_335,
            last_predicted_mjd: 61_707,
            last_offsets_mjd: 61_416,
        };
        assert_eq!(orientation.provenance(), Some(&wanted));
        // At 0h the values of the tables themselves, to their last digits.
        for (day, ut1_minus_utc, xp, yp, dx) in [
            (61_312.0, -0.020_614_3, 0.177_494, 0.326_038, 0.315),
            (61_313.0, -0.021_712_3, 0.176_124, 0.325_814, 0.361),
            (61_707.0, -0.208_143_1, 0.179_319, 0.276_208, f64::NAN),
        ] {
            let pole = at(&orientation, day, 0.0);
            assert!((pole.ut1_minus_tai_s + 37.0 - ut1_minus_utc).abs() < 1e-13);
            assert!((pole.xp / RADIANS_PER_ARCSECOND - xp).abs() < 1e-14);
            assert!((pole.yp / RADIANS_PER_ARCSECOND - yp).abs() < 1e-14);
            let difference = (pole.dx / RADIANS_PER_MILLIARCSECOND - dx).abs();
            assert!(dx.is_nan() || difference < 1e-12);
        }
        // Past their end, the offsets fade: 0.478 and 0.012 mas on MJD 61416.
        let late = at(&orientation, 61_466.0, 0.0);
        assert!((late.dx / RADIANS_PER_MILLIARCSECOND - 0.478 / std::f64::consts::E).abs() < 1e-6);
    }

    #[test]
    fn what_is_measured_what_predicted_and_what_neither() {
        let orientation = joined();
        for (day, fraction, quality) in [
            (61_249.0, 0.999, Quality::Extrapolated),
            (61_250.0, 0.0, Quality::Measured),
            (61_335.0, 0.0, Quality::Measured),
            (61_335.0, 1e-9, Quality::Predicted),
            (61_707.0, 0.0, Quality::Predicted),
            (61_707.0, 1e-9, Quality::Extrapolated),
            (70_000.0, 0.5, Quality::Extrapolated),
        ] {
            let pole = at(&orientation, day, fraction);
            assert_eq!(pole.quality, quality, "{day} {fraction}");
            let note = quality == Quality::Extrapolated;
            assert_eq!(pole.quality.status() == Status::OrientationExtrapolated, note);
            assert!(pole.ut1_minus_tai_s.is_finite() && pole.xp.is_finite());
        }
    }

    #[test]
    fn errors_grow_past_the_table() {
        let orientation = joined();
        // The last line's own errors, and the growth in a year: 0.19 s and 0.076″.
        let end = at(&orientation, 61_707.0, 0.0);
        let year = at(&orientation, 61_707.0 + 365.25, 0.0);
        assert_eq!(end.ut1_error_s, 0.025_409_6);
        assert!((year.ut1_error_s - end.ut1_error_s - 0.188_4).abs() < 0.0001);
        let growth = (year.pole_error - end.pole_error) / RADIANS_PER_ARCSECOND;
        assert!((growth - 0.000_68 * 365.25_f64.powf(0.80)).abs() < 1e-12);
        let before = at(&orientation, 61_250.0 - 365.25, 0.0);
        assert!(before.ut1_error_s > 0.020 && before.quality == Quality::Extrapolated);
        // Inside, the table's.
        assert_eq!(at(&orientation, 61_312.0, 0.0).ut1_error_s, 0.000_050_6);
    }

    #[test]
    fn nothing_breaks_at_a_knot_at_a_join_or_at_either_end() {
        let orientation = joined();
        let leap = LeapSeconds::builtin();
        let h = 1e-3;
        for day in [61_250.0, 61_251.0, 61_300.0, 61_312.0, 61_313.0, 61_335.0, 61_416.0, 61_500.0, 61_707.0]
        {
            let knot = leap.to_tai(Utc::from_mjd(day, 0.0)).unwrap();
            let value = |d: f64| {
                let p = orientation.at_tai(knot.plus_days(d));
                // In units in which each is of the order of one.
                [p.ut1_minus_tai_s + 37.0, 1e6 * p.xp, 1e6 * p.yp, 1e9 * p.dx, 1e9 * p.dy]
            };
            let samples: Vec<[f64; CHANNELS]> = (-3..=3).map(|k| value(h * f64::from(k))).collect();
            for c in 0..CHANNELS {
                let y: Vec<f64> = samples.iter().map(|s| s[c]).collect();
                let second = |i: usize| (y[i - 1] - 2.0 * y[i] + y[i + 1]) / (h * h);
                // Continuous value, slope and bend: a step in any would stand out of these.
                assert!((y[4] - y[2]).abs() < 2.0 * h, "value, {day} {c}");
                assert!(((y[4] - 2.0 * y[3] + y[2]) / h).abs() < 2.0 * h, "slope, {day} {c}");
                assert!((second(5) - second(1)).abs() < 0.03, "bend, {day} {c}: {} {}", second(5), second(1));
            }
        }
    }

    #[test]
    fn a_leap_second_leaves_no_trace_in_ut1() {
        // Twenty days around 2017-01-01 (MJD 57754), UT1−TAI falling by 1.3 ms a day.
        let ut1: Vec<f64> =
            (0..20).map(|i| -0.4 - 0.0013 * f64::from(i) + if i >= 10 { 1.0 } else { 0.0 }).collect();
        let text = c04_of(57_744, &ut1);
        let leap = LeapSeconds::builtin();
        let orientation = Orientation::from_tables(leap.clone(), Some((&text, "c04")), None).unwrap();
        let start = leap.to_tai(Utc::from_mjd(57_750.0, 0.0)).unwrap();
        let first = orientation.at_tai(start).ut1_minus_tai_s;
        for k in 0..800 {
            let tai = start.plus_days(0.01 * f64::from(k));
            let wanted = first - 0.0013 * 0.01 * f64::from(k);
            // The day with the leap second is longer by it, which bends the line by 1.3 ms / 86400.
            assert!((orientation.at_tai(tai).ut1_minus_tai_s - wanted).abs() < 2e-8);
        }
    }

    #[test]
    fn tables_that_do_not_fit_are_errors() {
        let leap = LeapSeconds::builtin;
        let of = |first: i64, ut1: &[f64]| c04_of(first, ut1);
        let error = Orientation::from_tables(leap(), None, None).unwrap_err();
        assert!(error.is_invalid());
        let one = of(57_000, &[0.1]);
        assert!(Orientation::from_tables(leap(), Some((&one, "one")), None).unwrap_err().is_invalid());
        // A leap second that the table has and the leap seconds have not.
        let step = of(57_000, &[-0.1, -0.101, 0.898]);
        let error = Orientation::from_tables(leap(), Some((&step, "step")), None).unwrap_err();
        assert_eq!(
            error.to_string(),
            "step, line 3: UT1-TAI changes by 0.9990 s in a day: are the leap seconds of another date?"
        );
        let early = of(61_000, &[0.1, 0.1]);
        let error =
            Orientation::from_tables(leap(), Some((&early, "c04")), Some((FINALS, "finals"))).unwrap_err();
        assert_eq!(
            error.to_string(),
            "finals, line 1: begins on MJD 61300, but the table before it ends on MJD 61001"
        );
        let ancient = of(36_900, &[0.1, 0.1]);
        let error = Orientation::from_tables(leap(), Some((&ancient, "c04")), None).unwrap_err();
        assert_eq!(error.to_string(), "c04, line 1: MJD 36900: no TAI-UTC: before_utc");
    }

    #[test]
    fn ut1_goes_there_and_back() {
        let orientation = joined();
        for k in 0..500 {
            let tai = Instant::from_mjd(61_200.0 + 1.37 * f64::from(k), 0.123);
            let there = ut1(tai, &orientation.at_tai(tai));
            assert!(orientation.tai_at_ut1(there).seconds_since(tai).abs() < 4e-11);
        }
    }

    #[test]
    fn a_constant_orientation_keeps_ut1_minus_utc() {
        let leap = LeapSeconds::builtin();
        let orientation = Orientation::constant(leap, -0.2, 1e-6, 2e-6, 3e-9, 4e-9);
        assert_eq!(orientation.provenance(), None);
        for (day, tai_minus_utc) in [(54_195.0, 33.0), (60_000.0, 37.0), (41_317.0, 10.0)] {
            let pole = at(&orientation, day, 0.5);
            assert_eq!(pole.ut1_minus_tai_s, -0.2 - tai_minus_utc);
            assert_eq!((pole.xp, pole.yp, pole.dx, pole.dy), (1e-6, 2e-6, 3e-9, 4e-9));
            assert_eq!((pole.quality, pole.ut1_error_s, pole.pole_error), (Quality::Measured, 0.0, 0.0));
        }
        assert_eq!(orientation.at(Utc::NOT_A_TIME), Err(Status::NotATime));
        assert_eq!(orientation.at(Utc::from_mjd(30_000.0, 0.0)), Err(Status::BeforeUtc));
        let before = orientation.at_tai(Instant::from_mjd(30_000.0, 0.0));
        assert_eq!(before.quality, Quality::Extrapolated);
        assert!((before.ut1_minus_tai_s - (-0.2 - 0.943_482)).abs() < 1e-9, "{}", before.ut1_minus_tai_s);
        assert!(orientation.at_tai(Instant::from_mjd(f64::NAN, 0.0)).ut1_minus_tai_s.is_nan());
        assert!(joined().at_tai(Instant::from_mjd(f64::NAN, 0.0)).ut1_minus_tai_s.is_nan());
    }
}
