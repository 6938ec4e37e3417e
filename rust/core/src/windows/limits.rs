//! What the telescope and the programme allow.

use super::reason::Cause;
use crate::error::{Error, Result, Status};
use crate::refraction::{AirmassModel, Refraction};

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

/// The limits; `None` is none. Altitudes of a target are observed ones, those of Sun and Moon true
/// topocentric ones of the centre. Angles in radians.
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
    /// The Sun's highest altitude.
    pub sun_altitude_max: Option<Column>,
    /// The target's smallest distance from the Sun.
    pub sun_separation_min: Option<Column>,
    /// The target's smallest distance from the Moon.
    pub moon_separation_min: Option<Column>,
    /// The Moon's highest altitude.
    pub moon_altitude_max: Option<Column>,
    /// The largest illuminated fraction of the Moon.
    pub moon_illumination_max: Option<Column>,
    /// The target's smallest hour angle, −π to π.
    pub hour_angle_min: Option<Column>,
    /// The target's largest hour angle.
    pub hour_angle_max: Option<Column>,
    /// The shortest useful window, seconds.
    pub window_min_s: Option<Column>,
}

impl Limits {
    /// No limit at all.
    pub fn none(airmass_model: AirmassModel) -> Self {
        Limits {
            altitude_min: None,
            altitude_max: None,
            airmass_max: None,
            airmass_model,
            sun_altitude_max: None,
            sun_separation_min: None,
            moon_separation_min: None,
            moon_altitude_max: None,
            moon_illumination_max: None,
            hour_angle_min: None,
            hour_angle_max: None,
            window_min_s: None,
        }
    }

    /// Key, column, and what is allowed of it.
    fn columns(&self) -> [(&'static str, &Option<Column>, f64, f64); 11] {
        use std::f64::consts::{FRAC_PI_2, PI};
        [
            ("altitude_min", &self.altitude_min, -FRAC_PI_2, FRAC_PI_2),
            ("altitude_max", &self.altitude_max, -FRAC_PI_2, FRAC_PI_2),
            ("airmass_max", &self.airmass_max, 1.0, 100.0),
            ("sun_altitude_max", &self.sun_altitude_max, -FRAC_PI_2, FRAC_PI_2),
            ("sun_separation_min", &self.sun_separation_min, 0.0, PI),
            ("moon_separation_min", &self.moon_separation_min, 0.0, PI),
            ("moon_altitude_max", &self.moon_altitude_max, -FRAC_PI_2, FRAC_PI_2),
            ("moon_illumination_max", &self.moon_illumination_max, 0.0, 1.0),
            ("hour_angle_min", &self.hour_angle_min, -PI, PI),
            ("hour_angle_max", &self.hour_angle_max, -PI, PI),
            ("window_min_s", &self.window_min_s, 0.0, 86_400.0),
        ]
    }

    /// Checks the limits against the number of targets.
    ///
    /// # Errors
    /// A column of the wrong length, or a value for all targets outside its range.
    pub fn check(&self, targets: usize) -> Result<()> {
        for (key, column, low, high) in self.columns() {
            match column {
                Some(Column::Each(values)) if values.len() != targets => {
                    return Err(Error::invalid(
                        key,
                        format!("{} values", values.len()),
                        format!("one value, or {targets}, one a target"),
                    ));
                }
                Some(Column::All(value)) if !(low..=high).contains(value) => {
                    return Err(Error::invalid(key, value, format!("{low} to {high}")));
                }
                _ => {}
            }
        }
        Ok(())
    }

    /// [`Status::Limit`] when a value a target has for this row is NaN or outside its range.
    pub fn status(&self, row: usize) -> Status {
        let wrong = |(_, column, low, high): &(&str, &Option<Column>, f64, f64)| match column {
            Some(Column::Each(values)) => !(*low..=*high).contains(&values[row]),
            _ => false,
        };
        if self.columns().iter().any(wrong) { Status::Limit } else { Status::Ok }
    }

    /// Whether a limit differs from target to target.
    pub fn is_per_target(&self) -> bool {
        self.columns().iter().any(|(_, column, ..)| matches!(column, Some(Column::Each(_))))
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
            (Some(Column::All(a)), Column::All(b)) => Column::All(a.max(b)),
            (Some(Column::All(a)), Column::Each(b)) => Column::Each(b).map(|b| a.max(b)),
            (Some(Column::Each(a)), b) => {
                Column::Each(a.iter().enumerate().map(|(row, a)| a.max(b.at(row))).collect())
            }
        }))
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
}
