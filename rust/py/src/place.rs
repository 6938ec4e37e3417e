//! Where is it.

use hourarc_core::grid::{self, PlaceColumn, PlaceColumns, Shape};
use hourarc_core::time::Utc;
use numpy::{PyReadonlyArray1, PyReadwriteArray1};
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::writable;
use crate::errors::raise;
use crate::orientation::Orientation;
use crate::site::Site;
use crate::targets::Targets;
use crate::workers::{self, Workers};

/// Fills the columns, by their words, and the status: times by targets, row after row, or pairwise.
#[pyfunction]
pub fn place(
    py: Python<'_>,
    site: &Site,
    targets: Targets<'_>,
    orientation: &Orientation,
    utc_ns: PyReadonlyArray1<'_, i64>,
    columns: &Bound<'_, PyDict>,
    status: &Bound<'_, PyAny>,
    pairwise: bool,
    workers: Workers,
) -> PyResult<()> {
    let when: Vec<Utc> = utc_ns.as_slice()?.iter().map(|&ns| Utc::from_nanoseconds(ns)).collect();
    let mut arrays: Vec<(PlaceColumn, PyReadwriteArray1<'_, f64>)> = Vec::with_capacity(columns.len());
    for (word, array) in columns {
        let word: &str = word.extract()?;
        arrays.push((PlaceColumn::from_word(word).map_err(raise)?, writable(&array, word)?));
    }
    let mut status = writable(status, "status")?;
    let columns = arrays
        .iter_mut()
        .map(|(column, array)| Ok((*column, array.as_slice_mut()?)))
        .collect::<PyResult<Vec<_>>>()?;
    let out = PlaceColumns { columns, sky_model: site.sky_model, status: status.as_slice_mut()? };
    let shape = if pairwise { Shape::Pairwise } else { Shape::Grid };
    let ephemeris = targets.ephemeris();
    let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
    workers::run(py, &workers, |workers| grid::place(&observer, &rows, &when, shape, out, workers))
}
