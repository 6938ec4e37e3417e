//! Why a target may be observed when it may.

use hourarc_core::events::{Days, track_for};
use hourarc_core::time::Utc;
use hourarc_core::windows::{LimitedSpan, UtcInterval};
use numpy::PyArray1;
use pyo3::prelude::*;

use crate::arrays::column;
use crate::errors::raise;
use crate::limits::{Given, limits};
use crate::orientation::Orientation;
use crate::site::Site;
use crate::targets::Targets;

/// A limit's code, where it alone holds, and what it and those before it leave.
type Explained<'py> = (u8, Bound<'py, PyArray1<i64>>, Bound<'py, PyArray1<i64>>);

/// Each limit in the order in which they are applied, for target `row` over [start, stop): intervals as start, stop,
/// start, stop, …
#[pyfunction]
#[pyo3(signature = (site, targets, row, orientation, start_ns, stop_ns, limits))]
pub fn explain<'py>(
    py: Python<'py>,
    site: &Site,
    targets: Targets<'py>,
    row: usize,
    orientation: &Orientation,
    start_ns: i64,
    stop_ns: i64,
    #[pyo3(from_py_with = limits)] limits: Given,
) -> PyResult<Vec<Explained<'py>>> {
    let (start, stop) = (Utc::from_nanoseconds(start_ns), Utc::from_nanoseconds(stop_ns));
    let limits = limits.under(site.sky_model);
    let ephemeris = targets.ephemeris();
    let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
    let explanation = py.detach(|| {
        let track = track_for(&observer, start, stop)?;
        let mut days = Days::new(observer, &track, start, stop)?;
        days.prepare(&rows)?;
        Ok(LimitedSpan::new(&days, &limits, rows.len())?.explain(&rows, row))
    });
    let explanation = explanation.map_err(raise)?;
    let flat = |intervals: Vec<UtcInterval>| {
        let ends = intervals.iter().flat_map(|&(start, stop)| [start.nanoseconds(), stop.nanoseconds()]);
        column(py, ends.collect())
    };
    let explained = |limit: hourarc_core::windows::LimitExplained| {
        (limit.cause as u8, flat(limit.alone), flat(limit.left))
    };
    Ok(explanation.limits.into_iter().map(explained).collect())
}
