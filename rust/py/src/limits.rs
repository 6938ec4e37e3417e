//! Limits as Python hands them in: by key, a number for all targets or an array with one for each.

use hourarc_core::constants::{RADIANS_PER_DEGREE, RADIANS_PER_HOUR};
use hourarc_core::error::Error;
use hourarc_core::grid::PLACE_AIRMASS;
use hourarc_core::refraction::AirmassModel;
use hourarc_core::windows::{Column, Limits};
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::Floats;
use crate::errors::raise;

/// The limits of a dictionary by key.
pub fn limits(given: &Bound<'_, PyAny>) -> PyResult<Limits> {
    let mut limits = Limits::none(PLACE_AIRMASS);
    for (key, value) in given.cast::<PyDict>()? {
        let key: &str = key.extract()?;
        if key == "airmass_model" {
            limits.airmass_model = AirmassModel::from_word(value.extract()?).map_err(raise)?;
            continue;
        }
        let (slot, unit) = match key {
            "altitude_min_deg" => (&mut limits.altitude_min, RADIANS_PER_DEGREE),
            "altitude_max_deg" => (&mut limits.altitude_max, RADIANS_PER_DEGREE),
            "airmass_max" => (&mut limits.airmass_max, 1.0),
            "sun_altitude_max_deg" => (&mut limits.sun_altitude_max, RADIANS_PER_DEGREE),
            "sun_separation_min_deg" => (&mut limits.sun_separation_min, RADIANS_PER_DEGREE),
            "moon_separation_min_deg" => (&mut limits.moon_separation_min, RADIANS_PER_DEGREE),
            "moon_altitude_max_deg" => (&mut limits.moon_altitude_max, RADIANS_PER_DEGREE),
            "moon_illumination_max" => (&mut limits.moon_illumination_max, 1.0),
            "hour_angle_min_h" => (&mut limits.hour_angle_min, RADIANS_PER_HOUR),
            "hour_angle_max_h" => (&mut limits.hour_angle_max, RADIANS_PER_HOUR),
            "window_min_s" => (&mut limits.window_min_s, 1.0),
            _ => return Err(raise(Error::invalid("limits", key, "the keys of hourarc.LIMITS"))),
        };
        *slot = Some(column(&value, unit)?);
    }
    Ok(limits)
}

/// A number for all targets, or an array with one for each, in the core's unit.
fn column(value: &Bound<'_, PyAny>, unit: f64) -> PyResult<Column> {
    if let Ok(each) = value.extract::<Floats<'_>>() {
        return Ok(Column::Each(each.as_slice()?.iter().map(|value| value * unit).collect()));
    }
    Ok(Column::All(value.extract::<f64>()? * unit))
}
