//! The great circle between two directions.

use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::math::sphere;
use numpy::PyArray1;
use pyo3::prelude::*;

use crate::arrays::{Floats, column, equal};

/// Angle between two directions, degrees.
#[pyfunction]
pub fn separation<'py>(
    py: Python<'py>,
    lon1_deg: Floats<'py>,
    lat1_deg: Floats<'py>,
    lon2_deg: Floats<'py>,
    lat2_deg: Floats<'py>,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    pairs(py, [&lon1_deg, &lat1_deg, &lon2_deg, &lat2_deg], sphere::separation)
}

/// Position angle of the second direction from the first, degrees.
#[pyfunction]
pub fn position_angle<'py>(
    py: Python<'py>,
    lon1_deg: Floats<'py>,
    lat1_deg: Floats<'py>,
    lon2_deg: Floats<'py>,
    lat2_deg: Floats<'py>,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    pairs(py, [&lon1_deg, &lat1_deg, &lon2_deg, &lat2_deg], sphere::position_angle)
}

fn pairs<'py>(
    py: Python<'py>,
    [lon1, lat1, lon2, lat2]: [&Floats<'py>; 4],
    angle: impl Fn([f64; 2], [f64; 2]) -> f64 + Sync,
) -> PyResult<Bound<'py, PyArray1<f64>>> {
    let rows = equal([("lon1_deg", lon1), ("lat1_deg", lat1), ("lon2_deg", lon2), ("lat2_deg", lat2)])?;
    let angles = py.detach(|| {
        let radians = |column: usize, row: usize| rows[column][row] * RADIANS_PER_DEGREE;
        (0..rows[0].len())
            .map(|row| {
                let (from, to) = ([radians(0, row), radians(1, row)], [radians(2, row), radians(3, row)]);
                angle(from, to) / RADIANS_PER_DEGREE
            })
            .collect()
    });
    Ok(column(py, angles))
}
