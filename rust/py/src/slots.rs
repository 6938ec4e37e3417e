//! Start times that fit into windows, and windows after a visit.

use hourarc_core::time::Utc;
use hourarc_core::windows;
use numpy::{PyArray1, PyReadonlyArray1};
use pyo3::prelude::*;

use crate::arrays::column;
use crate::errors::raise;

/// An array of nanoseconds or of offsets as it leaves.
type Integers<'py> = Bound<'py, PyArray1<i64>>;

/// For each window [start, stop) the start times on the raster at which a duration fits: offsets and times.
#[pyfunction]
pub fn slots<'py>(
    py: Python<'py>,
    start: PyReadonlyArray1<'py, i64>,
    stop: PyReadonlyArray1<'py, i64>,
    origin_ns: i64,
    step_ns: i64,
    duration_ns: i64,
) -> PyResult<(Integers<'py>, Integers<'py>)> {
    let (start, stop) = (start.as_slice()?, stop.as_slice()?);
    let origin = Utc::from_nanoseconds(origin_ns);
    let made = py.detach(|| windows::slots(start, stop, origin, step_ns, duration_ns)).map_err(raise)?;
    Ok((column(py, made.offsets), column(py, made.start)))
}

/// For each target, of whose windows `offsets` says where they stand, what is left of them at least a gap after its
/// last visit: offsets, starts, stops, and whether the gap set the start.
#[pyfunction]
pub fn windows_after_gap<'py>(
    py: Python<'py>,
    offsets: PyReadonlyArray1<'py, i64>,
    start: PyReadonlyArray1<'py, i64>,
    stop: PyReadonlyArray1<'py, i64>,
    last_visit_ns: PyReadonlyArray1<'py, i64>,
    gap_ns: i64,
) -> PyResult<(Integers<'py>, Integers<'py>, Integers<'py>, Bound<'py, PyArray1<bool>>)> {
    let (offsets, visits) = (offsets.as_slice()?, last_visit_ns.as_slice()?);
    let all: Vec<(i64, i64)> =
        start.as_slice()?.iter().copied().zip(stop.as_slice()?.iter().copied()).collect();
    let (mut counts, mut starts, mut stops, mut by_gap) = (vec![0], Vec::new(), Vec::new(), Vec::new());
    for (ends, &visit) in offsets.windows(2).zip(visits) {
        let mine = all.get(ends[0] as usize..ends[1] as usize).unwrap_or(&[]);
        for (start, stop, gap) in windows::windows_after_gap(mine, Utc::from_nanoseconds(visit), gap_ns) {
            starts.push(start);
            stops.push(stop);
            by_gap.push(gap);
        }
        counts.push(starts.len() as i64);
    }
    Ok((column(py, counts), column(py, starts), column(py, stops), column(py, by_gap)))
}
