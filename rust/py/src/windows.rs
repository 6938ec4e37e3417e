//! When may I observe it.

use hourarc_core::constants::RADIANS_PER_MILLIARCSECOND;
use hourarc_core::events::{Days, track_for};
use hourarc_core::grid::window_table;
use hourarc_core::time::Utc;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::column;
use crate::limits::{Given, column as limit_column, limits};
use crate::orientation::Orientation;
use crate::site::Site;
use crate::targets::Targets;
use crate::workers::{self, Workers};

/// The windows of every target over [start, stop), as columns by name.
#[pyfunction]
#[pyo3(signature = (site, targets, orientation, start_ns, stop_ns, limits, position_error_mas, workers))]
pub fn windows<'py>(
    py: Python<'py>,
    site: &Site,
    targets: Targets<'py>,
    orientation: &Orientation,
    start_ns: i64,
    stop_ns: i64,
    #[pyo3(from_py_with = limits)] limits: Given,
    position_error_mas: Option<Bound<'py, PyAny>>,
    workers: Workers,
) -> PyResult<Bound<'py, PyDict>> {
    let (start, stop) = (Utc::from_nanoseconds(start_ns), Utc::from_nanoseconds(stop_ns));
    let ephemeris = targets.ephemeris();
    let limits = limits.under(site.sky_model);
    let position_error =
        position_error_mas.map(|error| limit_column(&error, RADIANS_PER_MILLIARCSECOND)).transpose()?;
    let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
    let table = workers::run(py, &workers, |workers| {
        let track = track_for(&observer, start, stop)?;
        let mut days = Days::new(observer, &track, start, stop)?;
        window_table(&mut days, &rows, &limits, position_error, workers)
    })?;
    let columns = PyDict::new(py);
    columns.set_item("offsets", column(py, table.offsets))?;
    columns.set_item("start", column(py, table.start))?;
    columns.set_item("stop", column(py, table.stop))?;
    columns.set_item("start_reason", column(py, table.start_reason))?;
    columns.set_item("stop_reason", column(py, table.stop_reason))?;
    columns.set_item("best_airmass", column(py, table.best_airmass))?;
    columns.set_item("best_time", column(py, table.best_time))?;
    columns.set_item("start_error_s", column(py, table.start_error_s))?;
    columns.set_item("stop_error_s", column(py, table.stop_error_s))?;
    columns.set_item("start_scatter_s", column(py, table.start_scatter_s))?;
    columns.set_item("stop_scatter_s", column(py, table.stop_scatter_s))?;
    columns.set_item("may_not_happen", column(py, table.may_not_happen))?;
    columns.set_item("status", column(py, table.status))?;
    columns.set_item("blocked_by", column(py, table.blocked_by))?;
    Ok(columns)
}
