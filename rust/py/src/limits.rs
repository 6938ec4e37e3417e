//! Limits as Python hands them in: by key, a number for all targets or an array with one for each; lists of
//! pairs; words.

use hourarc_core::constants::{MJD_ZERO_JD, RADIANS_PER_DEGREE, RADIANS_PER_HOUR};
use hourarc_core::error::Error;
use hourarc_core::grid::PLACE_AIRMASS;
use hourarc_core::refraction::AirmassModel;
use hourarc_core::time::Utc;
use hourarc_core::windows::{Column, Limits, MoonAvoidance, Phase, PhaseScale, SkyModel};
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::Floats;
use crate::errors::raise;

/// Columns that stand together, until all of them are there.
#[derive(Default)]
struct Parts {
    avoidance_separation: Option<Column>,
    avoidance_width: Option<Column>,
    avoidance_dark: Option<Column>,
    avoidance_bright: Option<Column>,
    phase_epoch: Option<Column>,
    phase_period: Option<Column>,
    phase_half_width: Option<Column>,
}

/// Limits of a dictionary by key, yet without the sky of a site.
pub struct Given(Limits);

impl Given {
    /// The limits at a site whose sky is such.
    pub fn under(mut self, sky_model: SkyModel) -> Limits {
        self.0.sky_model = sky_model;
        self.0
    }
}

/// The limits of a dictionary by key.
pub fn limits(given: &Bound<'_, PyAny>) -> PyResult<Given> {
    let mut limits = Limits::none(PLACE_AIRMASS);
    let mut parts = Parts::default();
    let mut phase_scale = PhaseScale::BarycentricTdb;
    for (key, value) in given.cast::<PyDict>()? {
        let key: &str = key.extract()?;
        match key {
            "airmass_model" => {
                limits.airmass_model = AirmassModel::from_word(value.extract()?).map_err(raise)?;
            }
            "skyline" => limits.use_skyline = value.extract()?,
            "azimuth_sectors_deg" => limits.azimuth_sectors = Some(pairs(&value)?),
            "cable_range_deg" => limits.cable_range = pairs(&value)?.first().copied(),
            "allowed_intervals" => limits.allowed_intervals = Some(intervals(&value)?),
            "moon_relaxed_below_deg" => {
                limits.moon_down_relaxes = Some(value.extract::<f64>()? * RADIANS_PER_DEGREE);
            }
            "phase_scale" => phase_scale = PhaseScale::from_word(value.extract()?).map_err(raise)?,
            "phase_epoch_jd" => {
                parts.phase_epoch = Some(column(&value, 1.0)?.map(|epoch| epoch - MJD_ZERO_JD));
            }
            _ => {
                let (slot, unit) = slot(&mut limits, &mut parts, key)
                    .ok_or_else(|| raise(Error::invalid("limits", key, "the keys of hourarc.LIMITS")))?;
                *slot = Some(column(&value, unit)?);
            }
        }
    }
    if let (Some(separation), Some(width_d)) = (parts.avoidance_separation, parts.avoidance_width) {
        limits.moon_avoidance = Some(MoonAvoidance::Lorentzian { separation, width_d });
    }
    if let (Some(dark), Some(bright)) = (parts.avoidance_dark, parts.avoidance_bright) {
        limits.moon_avoidance = Some(MoonAvoidance::Illumination { dark, bright });
    }
    if let (Some(epoch_mjd), Some(period_d), Some(half_width_d)) =
        (parts.phase_epoch, parts.phase_period, parts.phase_half_width)
    {
        limits.phase = Some(Phase { epoch_mjd, period_d, half_width_d, scale: phase_scale });
    }
    Ok(Given(limits))
}

/// Where the column of a key belongs, and the core's unit of the key's.
fn slot<'a>(
    limits: &'a mut Limits,
    parts: &'a mut Parts,
    key: &str,
) -> Option<(&'a mut Option<Column>, f64)> {
    Some(match key {
        "altitude_min_deg" => (&mut limits.altitude_min, RADIANS_PER_DEGREE),
        "altitude_max_deg" => (&mut limits.altitude_max, RADIANS_PER_DEGREE),
        "airmass_max" => (&mut limits.airmass_max, 1.0),
        "declination_min_deg" => (&mut limits.declination_min, RADIANS_PER_DEGREE),
        "declination_max_deg" => (&mut limits.declination_max, RADIANS_PER_DEGREE),
        "hour_angle_min_h" => (&mut limits.hour_angle_min, RADIANS_PER_HOUR),
        "hour_angle_max_h" => (&mut limits.hour_angle_max, RADIANS_PER_HOUR),
        "azimuth_rate_max_deg_s" => (&mut limits.azimuth_rate_max, RADIANS_PER_DEGREE),
        "sun_altitude_max_deg" => (&mut limits.sun_altitude_max, RADIANS_PER_DEGREE),
        "sun_separation_min_deg" => (&mut limits.sun_separation_min, RADIANS_PER_DEGREE),
        "moon_separation_min_deg" => (&mut limits.moon_separation_min, RADIANS_PER_DEGREE),
        "moon_altitude_max_deg" => (&mut limits.moon_altitude_max, RADIANS_PER_DEGREE),
        "moon_illumination_max" => (&mut limits.moon_illumination_max, 1.0),
        "moon_avoidance_separation_deg" => (&mut parts.avoidance_separation, RADIANS_PER_DEGREE),
        "moon_avoidance_width_d" => (&mut parts.avoidance_width, 1.0),
        "moon_avoidance_dark_deg" => (&mut parts.avoidance_dark, RADIANS_PER_DEGREE),
        "moon_avoidance_bright_deg" => (&mut parts.avoidance_bright, RADIANS_PER_DEGREE),
        "sky_brightness_min_mag_arcsec2" => (&mut limits.sky_brightness_min_v, 1.0),
        "phase_period_d" => (&mut parts.phase_period, 1.0),
        "phase_half_width_d" => (&mut parts.phase_half_width, 1.0),
        "window_min_s" => (&mut limits.window_min_s, 1.0),
        _ => return None,
    })
}

/// A number for all targets, or an array with one for each, in the core's unit.
pub fn column(value: &Bound<'_, PyAny>, unit: f64) -> PyResult<Column> {
    if let Ok(each) = value.extract::<Floats<'_>>() {
        return Ok(Column::Each(each.as_slice()?.iter().map(|value| value * unit).collect()));
    }
    Ok(Column::All(value.extract::<f64>()? * unit))
}

/// Pairs of degrees, in radians.
fn pairs(value: &Bound<'_, PyAny>) -> PyResult<Vec<(f64, f64)>> {
    let degrees: Vec<(f64, f64)> = value.extract()?;
    Ok(degrees.iter().map(|pair| (pair.0 * RADIANS_PER_DEGREE, pair.1 * RADIANS_PER_DEGREE)).collect())
}

/// Pairs of nanoseconds.
fn intervals(value: &Bound<'_, PyAny>) -> PyResult<Vec<(Utc, Utc)>> {
    let nanoseconds: Vec<(i64, i64)> = value.extract()?;
    let utc = Utc::from_nanoseconds;
    Ok(nanoseconds.into_iter().map(|(start, stop)| (utc(start), utc(stop))).collect())
}
