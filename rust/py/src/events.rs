//! When does it cross.

use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::events::{Days, track_for};
use hourarc_core::grid::event_table;
use hourarc_core::time::Utc;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::column;
use crate::orientation::Orientation;
use crate::site::Site;
use crate::targets::Targets;
use crate::workers::{self, Workers};

/// Rises, transits and sets of every target over [start, stop), as columns by name.
#[pyfunction]
pub fn rise_transit_set<'py>(
    py: Python<'py>,
    site: &Site,
    targets: Targets<'py>,
    orientation: &Orientation,
    start_ns: i64,
    stop_ns: i64,
    altitude_deg: f64,
    workers: Workers,
) -> PyResult<Bound<'py, PyDict>> {
    let (start, stop) = (Utc::from_nanoseconds(start_ns), Utc::from_nanoseconds(stop_ns));
    let ephemeris = targets.ephemeris();
    let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
    let table = workers::run(py, &workers, |workers| {
        let track = track_for(&observer, start, stop)?;
        let mut days = Days::new(observer, &track, start, stop)?;
        event_table(&mut days, &rows, altitude_deg * RADIANS_PER_DEGREE, workers)
    })?;
    let columns = PyDict::new(py);
    columns.set_item("offsets", column(py, table.offsets))?;
    columns.set_item("kind", column(py, table.kind))?;
    columns.set_item("time", column(py, table.time))?;
    columns.set_item("azimuth_deg", column(py, table.azimuth_deg))?;
    columns.set_item("altitude_deg", column(py, table.altitude_deg))?;
    columns.set_item("computed_error_s", column(py, table.computed_error_s))?;
    columns.set_item("horizon_scatter_s", column(py, table.horizon_scatter_s))?;
    columns.set_item("may_not_happen", column(py, table.may_not_happen))?;
    columns.set_item("status", column(py, table.passage))?;
    columns.set_item("row_status", column(py, table.status))?;
    Ok(columns)
}
