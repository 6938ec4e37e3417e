//! Earth rotation, sidereal time, precession and nutation.

use hourarc_core::earth;
use hourarc_core::math::vector::Matrix;
use hourarc_core::time::{Instant, Scale, Tt};
use numpy::PyArray1;
use pyo3::prelude::*;

use crate::arrays::{Floats, column, equal};

/// Instants of one scale from days and fractions, one after another.
fn instants<S: Scale>(day: &[f64], fraction: &[f64]) -> impl Iterator<Item = Instant<S>> {
    day.iter().zip(fraction).map(|(&day, &fraction)| Instant::from_mjd(day, fraction))
}

/// Earth rotation angle, radians.
#[pyfunction]
pub fn rotation_angle<'py>(
    py: Python<'py>,
    ut1_mjd: Floats<'py>,
    ut1_fraction: Floats<'py>,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    let [day, fraction] = equal([("ut1_mjd", &ut1_mjd), ("ut1_fraction", &ut1_fraction)])?;
    let angles = py.detach(|| instants(day, fraction).map(earth::earth_rotation_angle).collect());
    Ok(column(py, angles))
}

/// Greenwich sidereal time, radians.
#[pyfunction]
pub fn sidereal_time<'py>(
    py: Python<'py>,
    ut1_mjd: Floats<'py>,
    ut1_fraction: Floats<'py>,
    tt_mjd: Floats<'py>,
    tt_fraction: Floats<'py>,
    apparent: bool,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    let [ut1, ut1_rest, tt, tt_rest] = equal([
        ("ut1_mjd", &ut1_mjd),
        ("ut1_fraction", &ut1_fraction),
        ("tt_mjd", &tt_mjd),
        ("tt_fraction", &tt_fraction),
    ])?;
    let time =
        if apparent { earth::greenwich_apparent_sidereal_time } else { earth::greenwich_mean_sidereal_time };
    let angles = py.detach(|| {
        instants(ut1, ut1_rest).zip(instants(tt, tt_rest)).map(|(ut1, tt)| time(ut1, tt)).collect()
    });
    Ok(column(py, angles))
}

/// GCRS to CIRS, nine elements an instant, row after row.
#[pyfunction]
pub fn precession_nutation<'py>(
    py: Python<'py>,
    tt_mjd: Floats<'py>,
    tt_fraction: Floats<'py>,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    matrices(py, &tt_mjd, &tt_fraction, |tt| {
        let earth::Intermediate { x, y, s } = earth::intermediate(tt);
        earth::celestial_to_intermediate(x, y, s)
    })
}

/// GCRS to the true equator and equinox of date, nine elements an instant, row after row.
#[pyfunction]
pub fn bias_precession_nutation<'py>(
    py: Python<'py>,
    tt_mjd: Floats<'py>,
    tt_fraction: Floats<'py>,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    matrices(py, &tt_mjd, &tt_fraction, earth::bias_precession_nutation)
}

fn matrices<'py>(
    py: Python<'py>,
    tt_mjd: &Floats<'py>,
    tt_fraction: &Floats<'py>,
    matrix: impl Fn(Instant<Tt>) -> Matrix + Sync,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    let [day, fraction] = equal([("tt_mjd", tt_mjd), ("tt_fraction", tt_fraction)])?;
    let elements =
        py.detach(|| instants(day, fraction).flat_map(|tt| matrix(tt).into_iter().flatten()).collect());
    Ok(column(py, elements))
}
