//! How much of it will I get.

use hourarc_core::grid::{self, GridColumns, GridQuantity, GridValues};
use numpy::PyReadwriteArray1;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::{codes, column, writable};
use crate::errors::raise;
use crate::limits::{Given, limits};
use crate::orientation::Orientation;
use crate::site::Site;
use crate::targets::Targets;
use crate::workers::{self, Workers};

/// A column to fill: instants are doubles, all else is single.
enum Values<'py> {
    Single(PyReadwriteArray1<'py, f32>),
    Double(PyReadwriteArray1<'py, f64>),
}

/// Fills the quantities, by their words: nights by targets, row after row. `progress` hears how many nights
/// are done. What is to be said of targets and nights comes back as columns by name.
#[pyfunction]
pub fn visibility_grid<'py>(
    py: Python<'py>,
    site: &Site,
    targets: Targets<'py>,
    orientation: &Orientation,
    first_mjd: i64,
    nights: usize,
    #[pyo3(from_py_with = limits)] limits: Given,
    quantities: &Bound<'py, PyDict>,
    progress: Option<Bound<'py, PyAny>>,
    workers: Workers,
) -> PyResult<Bound<'py, PyDict>> {
    let mut arrays: Vec<(GridQuantity, Values<'py>)> = Vec::with_capacity(quantities.len());
    for (word, array) in quantities {
        let word: &str = word.extract()?;
        let quantity = GridQuantity::from_word(word).map_err(raise)?;
        let array = match quantity.is_instant() {
            true => Values::Double(writable(&array, word)?),
            false => Values::Single(writable(&array, word)?),
        };
        arrays.push((quantity, array));
    }
    let mut columns: GridColumns<'_> = Vec::with_capacity(arrays.len());
    for (quantity, array) in &mut arrays {
        let values = match array {
            Values::Single(array) => GridValues::Single(array.as_slice_mut()?),
            Values::Double(array) => GridValues::Double(array.as_slice_mut()?),
        };
        columns.push((*quantity, values));
    }
    let limits = limits.under(site.sky_model);
    let ephemeris = targets.ephemeris();
    let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
    let report = workers::run_telling(py, &workers, progress.as_ref(), |workers, progress| {
        grid::visibility_grid(&observer, &rows, first_mjd, nights, &limits, columns, workers, progress)
    })?;
    let columns = PyDict::new(py);
    columns.set_item("status", column(py, codes(&report.target_status)))?;
    columns.set_item("night_status", column(py, codes(&report.night_status)))?;
    columns.set_item("night_start", column(py, report.night_start))?;
    columns.set_item("dark_hours", column(py, report.dark_hours))?;
    Ok(columns)
}

/// The words for what can be asked of a target's night, and whether each is an instant.
#[pyfunction]
pub fn grid_quantities() -> Vec<(&'static str, bool)> {
    GridQuantity::ALL.iter().map(|quantity| (quantity.word(), quantity.is_instant())).collect()
}
