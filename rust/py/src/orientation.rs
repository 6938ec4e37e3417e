//! Earth orientation: tables or constants, and their values at instants.

use hourarc_core::constants::{RADIANS_PER_ARCSECOND, RADIANS_PER_MILLIARCSECOND};
use hourarc_core::earth::{self, Pole};
use hourarc_core::error::Status;
use hourarc_core::time::{LeapSeconds, Utc};
use numpy::PyReadonlyArray1;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::column;
use crate::errors::raise;

/// UT1, the pole and the celestial pole offsets against time.
#[pyclass(frozen, module = "hourarc._engine")]
pub struct Orientation {
    /// The tables, or the constants.
    pub value: earth::Orientation,
}

#[pymethods]
impl Orientation {
    /// From IERS tables, each a text with its name.
    #[staticmethod]
    #[pyo3(signature = (leap_seconds, c04, finals))]
    fn tables(
        py: Python<'_>,
        leap_seconds: (&str, &str),
        c04: Option<(&str, &str)>,
        finals: Option<(&str, &str)>,
    ) -> PyResult<Self> {
        let value = py.detach(|| {
            let leap = LeapSeconds::parse(leap_seconds.0, leap_seconds.1)?;
            earth::Orientation::from_tables(leap, c04, finals)
        });
        Ok(Orientation { value: value.map_err(raise)? })
    }

    /// The same values for all time; leap seconds are a text with its name.
    #[staticmethod]
    fn constant(
        leap_seconds: (&str, &str),
        dut1_s: f64,
        xp_arcsec: f64,
        yp_arcsec: f64,
        dx_mas: f64,
        dy_mas: f64,
    ) -> PyResult<Self> {
        let leap = LeapSeconds::parse(leap_seconds.0, leap_seconds.1).map_err(raise)?;
        let [xp, yp] = [xp_arcsec, yp_arcsec].map(|angle| angle * RADIANS_PER_ARCSECOND);
        let [dx, dy] = [dx_mas, dy_mas].map(|angle| angle * RADIANS_PER_MILLIARCSECOND);
        Ok(Orientation { value: earth::Orientation::constant(leap, dut1_s, xp, yp, dx, dy) })
    }

    /// The values at instants, as columns by name.
    fn at<'py>(&self, py: Python<'py>, utc_ns: PyReadonlyArray1<'py, i64>) -> PyResult<Bound<'py, PyDict>> {
        let instants = utc_ns.as_slice()?;
        let rows: Vec<_> =
            py.detach(|| instants.iter().map(|&ns| self.row(Utc::from_nanoseconds(ns))).collect());
        let numbers = |of: &dyn Fn(f64, &Pole) -> f64| {
            let value = |row: &Row| {
                row.as_ref().map_or(f64::NAN, |(tai_minus_utc_s, pole)| of(*tai_minus_utc_s, pole))
            };
            column(py, rows.iter().map(value).collect())
        };
        let columns = PyDict::new(py);
        columns.set_item(
            "ut1_minus_utc_s",
            numbers(&|tai_minus_utc_s, pole| pole.ut1_minus_tai_s + tai_minus_utc_s),
        )?;
        columns.set_item("xp_arcsec", numbers(&|_, pole| pole.xp / RADIANS_PER_ARCSECOND))?;
        columns.set_item("yp_arcsec", numbers(&|_, pole| pole.yp / RADIANS_PER_ARCSECOND))?;
        columns.set_item("dx_mas", numbers(&|_, pole| pole.dx / RADIANS_PER_MILLIARCSECOND))?;
        columns.set_item("dy_mas", numbers(&|_, pole| pole.dy / RADIANS_PER_MILLIARCSECOND))?;
        columns.set_item("ut1_error_s", numbers(&|_, pole| pole.ut1_error_s))?;
        let codes = |of: &dyn Fn(&Row) -> u8| column(py, rows.iter().map(of).collect::<Vec<u8>>());
        columns.set_item("quality", codes(&|row| row.as_ref().map_or(0, |(_, pole)| pole.quality as u8)))?;
        let status =
            |row: &Row| row.as_ref().map_or_else(|&status| status, |(_, pole)| pole.quality.status());
        columns.set_item("status", codes(&|row| status(row) as u8))?;
        Ok(columns)
    }

    /// How far the tables reach, in Modified Julian Dates of 0h UTC; None for what there is not.
    fn provenance<'py>(&self, py: Python<'py>) -> PyResult<Bound<'py, PyDict>> {
        let reach = PyDict::new(py);
        let tables = self.value.provenance();
        reach.set_item("first_mjd", tables.map(|tables| tables.first_mjd))?;
        reach.set_item("last_measured_mjd", tables.map(|tables| tables.last_measured_mjd))?;
        reach.set_item("last_mjd", tables.map(|tables| tables.last_predicted_mjd))?;
        reach.set_item("leap_second_expiry_mjd", self.value.leap_seconds().expires_mjd())?;
        Ok(reach)
    }
}

/// TAI−UTC in seconds and the orientation, or why there is none.
type Row = std::result::Result<(f64, Pole), Status>;

impl Orientation {
    fn row(&self, utc: Utc) -> Row {
        Ok((self.value.leap_seconds().tai_minus_utc(utc)?, self.value.at(utc)?))
    }
}
