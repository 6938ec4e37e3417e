//! When may I observe it.

use hourarc_core::events::{Days, track_for};
use hourarc_core::grid::window_table;
use hourarc_core::time::Utc;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::column;
use crate::limits::limits;
use crate::orientation::Orientation;
use crate::site::Site;
use crate::targets::Targets;
use crate::workers::{self, Workers};

/// The windows of every target over [start, stop), as columns by name.
#[pyfunction]
#[pyo3(signature = (site, targets, orientation, start_ns, stop_ns, limits, workers))]
pub fn windows<'py>(
    py: Python<'py>,
    site: &Site,
    targets: Targets<'py>,
    orientation: &Orientation,
    start_ns: i64,
    stop_ns: i64,
    #[pyo3(from_py_with = limits)] limits: hourarc_core::windows::Limits,
    workers: Workers,
) -> PyResult<Bound<'py, PyDict>> {
    let (start, stop) = (Utc::from_nanoseconds(start_ns), Utc::from_nanoseconds(stop_ns));
    let ephemeris = targets.ephemeris();
    let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
    let table = workers::run(py, &workers, |workers| {
        let track = track_for(&observer, start, stop)?;
        let mut days = Days::new(observer, &track, start, stop)?;
        window_table(&mut days, &rows, &limits, workers)
    })?;
    let columns = PyDict::new(py);
    columns.set_item("offsets", column(py, table.offsets))?;
    columns.set_item("start", column(py, table.start))?;
    columns.set_item("stop", column(py, table.stop))?;
    columns.set_item("start_reason", column(py, table.start_reason))?;
    columns.set_item("stop_reason", column(py, table.stop_reason))?;
    columns.set_item("best_airmass", column(py, table.best_airmass))?;
    columns.set_item("best_time", column(py, table.best_time))?;
    columns.set_item("status", column(py, table.status))?;
    columns.set_item("blocked_by", column(py, table.blocked_by))?;
    Ok(columns)
}
