//! What is up now.

use hourarc_core::grid::{self, PlaceColumn, PlaceColumns, WatchColumns, WatchedWindows};
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

/// The windows of a span, ready to be asked what is up.
#[pyclass(frozen, module = "hourarc._engine")]
pub struct Watch {
    table: grid::Watch,
}

#[pymethods]
impl Watch {
    #[new]
    fn new(
        py: Python<'_>,
        site: &Site,
        targets: Targets<'_>,
        orientation: &Orientation,
        start_ns: i64,
        stop_ns: i64,
        offsets: PyReadonlyArray1<'_, i64>,
        start: PyReadonlyArray1<'_, i64>,
        stop: PyReadonlyArray1<'_, i64>,
        stop_reason: PyReadonlyArray1<'_, u8>,
        status: PyReadonlyArray1<'_, u8>,
        workers: Workers,
    ) -> PyResult<Self> {
        let windows = WatchedWindows {
            offsets: offsets.as_slice()?,
            start: start.as_slice()?,
            stop: stop.as_slice()?,
            stop_reason: stop_reason.as_slice()?,
            status: status.as_slice()?,
        };
        let (start, stop) = (Utc::from_nanoseconds(start_ns), Utc::from_nanoseconds(stop_ns));
        let ephemeris = targets.ephemeris();
        let observer = site.observer(orientation, &ephemeris);
        let table = workers::run(py, &workers, |workers| {
            grid::Watch::new(&observer, start, stop, &windows, workers)
        })?;
        Ok(Watch { table })
    }

    /// Fills what is up, what closes it, the status, and the columns by their words.
    fn at(
        &self,
        py: Python<'_>,
        site: &Site,
        targets: Targets<'_>,
        orientation: &Orientation,
        utc_ns: i64,
        up: &Bound<'_, PyAny>,
        stop_reason: &Bound<'_, PyAny>,
        status: &Bound<'_, PyAny>,
        columns: &Bound<'_, PyDict>,
        workers: Workers,
    ) -> PyResult<()> {
        let mut arrays: Vec<(String, PyReadwriteArray1<'_, f64>)> = Vec::with_capacity(columns.len());
        for (word, array) in columns {
            let word: String = word.extract()?;
            let array = writable(&array, &word)?;
            arrays.push((word, array));
        }
        let (mut stop_reason, mut status) =
            (writable(stop_reason, "stop_reason")?, writable(status, "status")?);
        let mut up = writable(up, "up")?;
        let (mut seconds_left, mut seconds_to_next) = (None, None);
        let mut places = Vec::with_capacity(arrays.len());
        for (word, array) in &mut arrays {
            let values = array.as_slice_mut()?;
            match word.as_str() {
                "seconds_left" => seconds_left = Some(values),
                "seconds_to_next" => seconds_to_next = Some(values),
                word => places.push((PlaceColumn::from_word(word).map_err(raise)?, values)),
            }
        }
        let out = WatchColumns {
            up: up.as_slice_mut()?,
            stop_reason: stop_reason.as_slice_mut()?,
            seconds_left,
            seconds_to_next,
            places: PlaceColumns {
                columns: places,
                sky_model: site.sky_model,
                status: status.as_slice_mut()?,
            },
        };
        let ephemeris = targets.ephemeris();
        let (observer, rows) = (site.observer(orientation, &ephemeris), targets.rows());
        let when = Utc::from_nanoseconds(utc_ns);
        workers::run(py, &workers, |workers| self.table.at(&observer, &rows, when, out, workers))
    }
}
