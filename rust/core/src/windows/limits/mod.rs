//! What the telescope and the programme allow.
//!
//! Every limit is a field of [`Limits`] and a function from a target's path over one day to the
//! [interval set](super::intervals::IntervalSet) in which it holds; a file holds one kind of them. In
//! closed form where there is one, otherwise from the crossings of a series whose error is bounded.
//!
//! | key | unit | per target | holds where | how |
//! |---|---|---|---|---|
//! | `altitude_min`, `altitude_max` | rad, observed | yes | altitude at or within | circle |
//! | `airmass_max` (`airmass_model`) | – | yes | airmass at most | circle |
//! | `use_skyline` | – | no | observed altitude at or above the site's skyline | vertical circles, then roots |
//! | `declination_min`, `declination_max` | rad, of date | yes | topocentric declination within | circle |
//! | `hour_angle_min`, `hour_angle_max` | rad, −π to π | yes | hour angle within | hour circles |
//! | `azimuth_sectors` | rad, pairs from–to, through east | no | azimuth in one of them | vertical circles |
//! | `azimuth_rate_max` | rad/s | yes | size of dA/dt at most | series |
//! | `cable_range` | rad, low–high, north 0 through east | no | one branch of the azimuth lasts | vertical circles |
//! | `sun_altitude_max` | rad, true | yes | Sun's centre at most | series |
//! | `sun_separation_min` | rad | yes | distance at least | series |
//! | `moon_altitude_max` | rad, true | yes | Moon's centre at most | series |
//! | `moon_illumination_max` | 0–1 | yes | illuminated fraction at most | series |
//! | `moon_separation_min` | rad | yes | distance at least | series |
//! | `moon_avoidance` | rad, days | yes | distance at least what the phase asks for | series |
//! | `moon_down_relaxes` | rad, true | no | lifts the two above while the Moon's centre is below this | series |
//! | `sky_brightness_min_v` (`sky_model`) | mag/arcsec² V | yes | sky at least so dark | roots |
//! | `allowed_intervals` | UTC | no | instant in one of them | as given |
//! | `phase` | MJD, days | yes | within the half width of T0 + nP | closed form |
//! | `window_min_s` | s | yes | window at least so long | – |
//!
//! "Circle" means: closed form for a star, polished by Newton's method on its exact arc; for a body the
//! crossings of its Chebyshev series.

mod altitude;
mod angles;
mod azimuth;
mod brightness;
mod instants;
mod separation;
mod skyline;

pub(super) use azimuth::{AzimuthWalk, Branch, Turning};
pub(super) use brightness::MoonLightDay;
pub use brightness::{MoonLight, SkyModel, sky_brightness};
pub(super) use instants::PhaseDay;
pub(super) use separation::{Keepout, Least, MoonPhaseDay, Nodes};
pub(super) use skyline::Lines;

pub(super) mod kinds {
    //! The limits as functions, for [`super::super::target`].
    pub use super::altitude::fill_altitude;
    pub use super::angles::{fill_declination, fill_hour_angle, fill_sectors};
    pub use super::azimuth::{fill_azimuth_rate, split_by_cables};
    pub use super::brightness::fill_brightness;
    pub use super::instants::fill_intervals;
    pub use super::skyline::fill_skyline;
}

use super::reason::Cause;
use crate::constants::TURN;
use crate::error::{Error, Result, Status};
use crate::refraction::{AirmassModel, Refraction};
use crate::time::Utc;
use std::f64::consts::{FRAC_PI_2, PI};

/// A limit: one value for all targets, or a value a target.
#[derive(Debug, Clone, PartialEq)]
pub enum Column {
    /// For all.
    All(f64),
    /// One a target, in the order of the targets.
    Each(Vec<f64>),
}

impl Column {
    /// The value for a target.
    #[inline(always)]
    pub fn at(&self, row: usize) -> f64 {
        match self {
            Column::All(value) => *value,
            Column::Each(values) => values[row],
        }
    }

    /// The column of a function of the values.
    pub fn map(&self, function: impl Fn(f64) -> f64) -> Column {
        match self {
            Column::All(value) => Column::All(function(*value)),
            Column::Each(values) => Column::Each(values.iter().copied().map(function).collect()),
        }
    }

    /// The value for all targets, when there is one.
    pub(super) fn shared(&self) -> Option<f64> {
        match self {
            Column::All(value) => Some(*value),
            Column::Each(_) => None,
        }
    }
}

/// The distance from the Moon that its phase asks for.
#[derive(Debug, Clone, PartialEq)]
pub enum MoonAvoidance {
    /// D / (1 + ((a − P/2) / W)²): D at full Moon, half of it W days before and after; a is the Moon's
    /// age, P the synodic month of 29.53 days, age counted in the Moon's elongation in longitude, so that
    /// a = P/2 at full Moon itself. Common practice, no source.
    Lorentzian {
        /// D, radians, 0 to π.
        separation: Column,
        /// W, days, 0.1 to 15.
        width_d: Column,
    },
    /// Linear in the illuminated fraction k: dark + (bright − dark) k.
    Illumination {
        /// At new Moon, radians, 0 to π.
        dark: Column,
        /// At full Moon, radians, 0 to π.
        bright: Column,
    },
}

/// On which clock a recurring phase is counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PhaseScale {
    /// Arrival of the light at the barycentre of the solar system, TDB: BJD(TDB) − 2400000.5.
    BarycentricTdb,
    /// Arrival at the centre of the Sun, UTC: HJD(UTC) − 2400000.5.
    HeliocentricUtc,
}

impl PhaseScale {
    /// The word for this clock.
    pub fn word(self) -> &'static str {
        match self {
            PhaseScale::BarycentricTdb => "bjd_tdb",
            PhaseScale::HeliocentricUtc => "hjd_utc",
        }
    }

    /// The clock of a word.
    ///
    /// # Errors
    /// When there is none.
    pub fn from_word(word: &str) -> Result<Self> {
        [PhaseScale::BarycentricTdb, PhaseScale::HeliocentricUtc]
            .into_iter()
            .find(|scale| scale.word() == word)
            .ok_or_else(|| Error::invalid("phase_scale", word, "bjd_tdb or hjd_utc"))
    }
}

/// Windows that recur: within `half_width_d` of `epoch_mjd` + n `period_d`, in days of the clock.
///
/// One double holds an epoch to 1 µs; what limits it is the source.
#[derive(Debug, Clone, PartialEq)]
pub struct Phase {
    /// T0, MJD of the clock: the JD less 2400000.5.
    pub epoch_mjd: Column,
    /// P, days.
    pub period_d: Column,
    /// w, days, below half the period.
    pub half_width_d: Column,
    /// The clock.
    pub scale: PhaseScale,
}

/// The limits; `None` is none. Altitudes of a target are observed ones, those of Sun and Moon true
/// topocentric ones of the centre. Angles in radians. The module's table says more of each.
#[derive(Debug, Clone)]
pub struct Limits {
    /// The target's lowest altitude.
    pub altitude_min: Option<Column>,
    /// The target's highest altitude.
    pub altitude_max: Option<Column>,
    /// The target's largest airmass, by `airmass_model`.
    pub airmass_max: Option<Column>,
    /// How altitude becomes airmass, here and in the windows' best airmass.
    pub airmass_model: AirmassModel,
    /// Whether the site's skyline holds.
    pub use_skyline: bool,
    /// The Sun's highest altitude.
    pub sun_altitude_max: Option<Column>,
    /// The target's smallest distance from the Sun.
    pub sun_separation_min: Option<Column>,
    /// The target's smallest distance from the Moon.
    pub moon_separation_min: Option<Column>,
    /// The same, as the Moon's phase asks for.
    pub moon_avoidance: Option<MoonAvoidance>,
    /// Both distances from the Moon are lifted while its centre stands below this true altitude.
    pub moon_down_relaxes: Option<f64>,
    /// The Moon's highest altitude.
    pub moon_altitude_max: Option<Column>,
    /// The largest illuminated fraction of the Moon.
    pub moon_illumination_max: Option<Column>,
    /// The brightest sky, V magnitudes a square arcsecond: the sky's must be at least this.
    pub sky_brightness_min_v: Option<Column>,
    /// What that brightness is computed from.
    pub sky_model: SkyModel,
    /// The target's smallest hour angle, −π to π.
    pub hour_angle_min: Option<Column>,
    /// The target's largest hour angle.
    pub hour_angle_max: Option<Column>,
    /// The target's smallest declination, of date and topocentric.
    pub declination_min: Option<Column>,
    /// The target's largest declination.
    pub declination_max: Option<Column>,
    /// Sectors of azimuth that are allowed, each from the first to the second through east, 0 to 2π.
    pub azimuth_sectors: Option<Vec<(f64, f64)>>,
    /// The largest rate of azimuth, radians a second.
    pub azimuth_rate_max: Option<Column>,
    /// Lowest and highest azimuth of the cables, counted on beyond a turn. A window ends where the branch
    /// of the azimuth that lasts longest from its beginning runs out.
    pub cable_range: Option<(f64, f64)>,
    /// Intervals of UTC that are allowed, [start, stop).
    pub allowed_intervals: Option<Vec<(Utc, Utc)>>,
    /// Recurring windows.
    pub phase: Option<Phase>,
    /// The shortest useful window, seconds.
    pub window_min_s: Option<Column>,
}

/// A column, its key and what is allowed of it.
type Rule<'a> = (&'static str, Option<&'a Column>, f64, f64);

impl Limits {
    /// No limit at all.
    pub fn none(airmass_model: AirmassModel) -> Self {
        Limits {
            altitude_min: None,
            altitude_max: None,
            airmass_max: None,
            airmass_model,
            use_skyline: false,
            sun_altitude_max: None,
            sun_separation_min: None,
            moon_separation_min: None,
            moon_avoidance: None,
            moon_down_relaxes: None,
            moon_altitude_max: None,
            moon_illumination_max: None,
            sky_brightness_min_v: None,
            sky_model: SkyModel::default(),
            hour_angle_min: None,
            hour_angle_max: None,
            declination_min: None,
            declination_max: None,
            azimuth_sectors: None,
            azimuth_rate_max: None,
            cable_range: None,
            allowed_intervals: None,
            phase: None,
            window_min_s: None,
        }
    }

    /// Key, column, and what is allowed of it: the ranges are declared here and nowhere else.
    fn columns(&self) -> [Rule<'_>; 22] {
        let (lorentzian, illumination) = match &self.moon_avoidance {
            Some(MoonAvoidance::Lorentzian { separation, width_d }) => (Some((separation, width_d)), None),
            Some(MoonAvoidance::Illumination { dark, bright }) => (None, Some((dark, bright))),
            None => (None, None),
        };
        let phase = self.phase.as_ref();
        [
            ("altitude_min", self.altitude_min.as_ref(), -FRAC_PI_2, FRAC_PI_2),
            ("altitude_max", self.altitude_max.as_ref(), -FRAC_PI_2, FRAC_PI_2),
            ("airmass_max", self.airmass_max.as_ref(), 1.0, 100.0),
            ("sun_altitude_max", self.sun_altitude_max.as_ref(), -FRAC_PI_2, FRAC_PI_2),
            ("sun_separation_min", self.sun_separation_min.as_ref(), 0.0, PI),
            ("moon_separation_min", self.moon_separation_min.as_ref(), 0.0, PI),
            ("moon_avoidance_separation", lorentzian.map(|l| l.0), 0.0, PI),
            ("moon_avoidance_width_d", lorentzian.map(|l| l.1), 0.1, 15.0),
            ("moon_avoidance_dark", illumination.map(|i| i.0), 0.0, PI),
            ("moon_avoidance_bright", illumination.map(|i| i.1), 0.0, PI),
            ("moon_altitude_max", self.moon_altitude_max.as_ref(), -FRAC_PI_2, FRAC_PI_2),
            ("moon_illumination_max", self.moon_illumination_max.as_ref(), 0.0, 1.0),
            ("sky_brightness_min_v", self.sky_brightness_min_v.as_ref(), 0.0, 30.0),
            ("hour_angle_min", self.hour_angle_min.as_ref(), -PI, PI),
            ("hour_angle_max", self.hour_angle_max.as_ref(), -PI, PI),
            ("declination_min", self.declination_min.as_ref(), -FRAC_PI_2, FRAC_PI_2),
            ("declination_max", self.declination_max.as_ref(), -FRAC_PI_2, FRAC_PI_2),
            ("azimuth_rate_max", self.azimuth_rate_max.as_ref(), 1e-9, 1.0),
            ("phase_epoch_mjd", phase.map(|p| &p.epoch_mjd), -100_000.0, 200_000.0),
            ("phase_period_d", phase.map(|p| &p.period_d), 1e-4, 1e6),
            ("phase_half_width_d", phase.map(|p| &p.half_width_d), 0.0, 5e5),
            ("window_min_s", self.window_min_s.as_ref(), 0.0, 86_400.0),
        ]
    }

    /// Pairs of columns of which the first must not be above the second.
    fn pairs(&self) -> [(&'static str, Option<&Column>, &'static str, Option<&Column>); 3] {
        [
            ("altitude_min", self.altitude_min.as_ref(), "altitude_max", self.altitude_max.as_ref()),
            ("hour_angle_min", self.hour_angle_min.as_ref(), "hour_angle_max", self.hour_angle_max.as_ref()),
            (
                "declination_min",
                self.declination_min.as_ref(),
                "declination_max",
                self.declination_max.as_ref(),
            ),
        ]
    }

    /// Checks the limits against the number of targets, and against each other.
    ///
    /// # Errors
    /// A column of the wrong length; a value for all targets outside its range; a smallest value above
    /// the largest; a phase as wide as its period; sectors, intervals or a range of cables that are none.
    pub fn check(&self, targets: usize) -> Result<()> {
        for (key, column, low, high) in self.columns() {
            match column {
                Some(Column::Each(values)) if values.len() != targets => {
                    let given = format!("{} values", values.len());
                    return Err(Error::invalid(key, given, format!("one value, or {targets}, one a target")));
                }
                Some(Column::All(value)) if !(low..=high).contains(value) => {
                    return Err(Error::invalid(key, value, format!("{low} to {high}")));
                }
                _ => {}
            }
        }
        for (low_key, low, high_key, high) in self.pairs() {
            if let (Some(Column::All(low)), Some(Column::All(high))) = (low, high)
                && low > high
            {
                return Err(Error::invalid(low_key, low, format!("at most {high_key}, {high}")));
            }
        }
        if let Some(Phase { period_d: Column::All(period), half_width_d: Column::All(half), .. }) =
            &self.phase
            && 2.0 * half >= *period
        {
            let allowed = format!("below half of phase_period_d, {}", 0.5 * period);
            return Err(Error::invalid("phase_half_width_d", half, allowed));
        }
        self.check_lists()?;
        self.sky_model.check()
    }

    fn check_lists(&self) -> Result<()> {
        for &(from, to) in self.azimuth_sectors.iter().flatten() {
            if !((0.0..=TURN).contains(&from) && (0.0..=TURN).contains(&to) && from != to) {
                let given = format!("{from} to {to}");
                return Err(Error::invalid("azimuth_sectors", given, "two different azimuths from 0 to 2π"));
            }
        }
        if let Some((low, high)) = self.cable_range
            && !(low < high && low >= -4.0 * TURN && high <= 4.0 * TURN)
        {
            let allowed = "a lower and a higher azimuth within four turns";
            return Err(Error::invalid("cable_range", format!("{low} to {high}"), allowed));
        }
        for &(start, stop) in self.allowed_intervals.iter().flatten() {
            if start.is_nat() || stop.is_nat() || start >= stop {
                let given = format!("{start} to {stop}");
                return Err(Error::invalid("allowed_intervals", given, "a start before its stop"));
            }
        }
        match self.moon_down_relaxes {
            Some(altitude) if !(-FRAC_PI_2..=FRAC_PI_2).contains(&altitude) => {
                Err(Error::invalid("moon_down_relaxes", altitude, format!("{} to {FRAC_PI_2}", -FRAC_PI_2)))
            }
            _ => Ok(()),
        }
    }

    /// [`Status::Limit`] when a value a target has for this row is NaN, outside its range or contradicts
    /// another.
    pub fn status(&self, row: usize) -> Status {
        let wrong = |(_, column, low, high): &Rule<'_>| match column {
            Some(Column::Each(values)) => !(*low..=*high).contains(&values[row]),
            _ => false,
        };
        let crossed = |low: Option<&Column>, high: Option<&Column>| match (low, high) {
            (Some(low), Some(high)) => low.at(row) > high.at(row),
            _ => false,
        };
        let wide = |phase: &Phase| 2.0 * phase.half_width_d.at(row) >= phase.period_d.at(row);
        let bad = self.columns().iter().any(wrong)
            || self.pairs().iter().any(|pair| crossed(pair.1, pair.3))
            || self.phase.as_ref().is_some_and(wide);
        if bad { Status::Limit } else { Status::Ok }
    }

    /// The lowest observed altitude that altitude and airmass allow, radians; `None` without either.
    ///
    /// # Errors
    /// An airmass for all targets that no altitude has.
    pub fn lowest_altitude(&self, refraction: &Refraction) -> Result<Option<Column>> {
        let altitude_of = |airmass: f64| self.airmass_model.observed_altitude(airmass, refraction);
        let by_airmass = match &self.airmass_max {
            None => return Ok(self.altitude_min.clone()),
            Some(Column::All(airmass)) => Column::All(altitude_of(*airmass)?),
            // A bad value is the row's own affair: Limits::status marks it.
            Some(each) => each.map(|airmass| altitude_of(airmass).unwrap_or(f64::NAN)),
        };
        Ok(Some(match (&self.altitude_min, by_airmass) {
            (None, by_airmass) => by_airmass,
            (Some(Column::All(a)), by_airmass) => by_airmass.map(|b| a.max(b)),
            (Some(Column::Each(a)), b) => {
                Column::Each(a.iter().enumerate().map(|(row, a)| a.max(b.at(row))).collect())
            }
        }))
    }

    /// Whether some limit has a value a target.
    pub(crate) fn has_columns(&self) -> bool {
        self.columns().iter().any(|rule| matches!(rule.1, Some(Column::Each(_))))
    }

    /// The limits on the sky itself, in the order in which they are applied.
    pub(super) fn sky(&self) -> [(Cause, &Option<Column>); 3] {
        [
            (Cause::SunAltitudeMax, &self.sun_altitude_max),
            (Cause::MoonAltitudeMax, &self.moon_altitude_max),
            (Cause::MoonIlluminationMax, &self.moon_illumination_max),
        ]
    }

    /// A limit on the sky in the terms of the quantity that is followed: the sine of an altitude, or
    /// the illuminated fraction.
    pub(super) fn as_quantity(cause: Cause, most: f64) -> f64 {
        if cause == Cause::MoonIlluminationMax { most } else { most.sin() }
    }

    /// Whether a limit is set.
    pub(super) fn has(&self, cause: Cause) -> bool {
        match cause {
            Cause::None | Cause::Span | Cause::BadRow => false,
            Cause::AltitudeMin => self.altitude_min.is_some(),
            Cause::AltitudeMax => self.altitude_max.is_some(),
            Cause::AirmassMax => self.airmass_max.is_some(),
            Cause::SunAltitudeMax => self.sun_altitude_max.is_some(),
            Cause::SunSeparationMin => self.sun_separation_min.is_some(),
            Cause::MoonSeparationMin => self.moon_separation_min.is_some(),
            Cause::MoonAltitudeMax => self.moon_altitude_max.is_some(),
            Cause::MoonIlluminationMax => self.moon_illumination_max.is_some(),
            Cause::HourAngle => self.hour_angle_min.is_some() || self.hour_angle_max.is_some(),
            Cause::WindowMin => self.window_min_s.is_some(),
            Cause::Skyline => self.use_skyline,
            Cause::MoonAvoidance => self.moon_avoidance.is_some(),
            Cause::SkyBrightness => self.sky_brightness_min_v.is_some(),
            Cause::AzimuthSectors => self.azimuth_sectors.is_some(),
            Cause::AzimuthRate => self.azimuth_rate_max.is_some(),
            Cause::Declination => self.declination_min.is_some() || self.declination_max.is_some(),
            Cause::CableRange => self.cable_range.is_some(),
            Cause::AllowedIntervals => self.allowed_intervals.is_some(),
            Cause::Phase => self.phase.is_some(),
        }
    }
}
