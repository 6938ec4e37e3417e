//! Orbits of minor bodies: from columns, from the Minor Planet Center's lines, at another epoch.

use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::ephemeris::orbits::{self, Anomaly, Columns, Elements, Slope, mpc};
use hourarc_core::ephemeris::photometry::Brightness;
use hourarc_core::error::Status;
use hourarc_core::grid;
use hourarc_core::time::{Instant, Tt};
use numpy::PyArray1;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::{Floats, codes, column, equal};
use crate::errors::raise;
use crate::workers::{self, Workers};

/// Orbits, a row a body.
#[pyclass(frozen, module = "hourarc._engine")]
pub struct Orbits {
    /// The rows, prepared.
    pub rows: orbits::Orbits,
}

/// Numbers a row in [`Orbits::rows`].
const ROW: usize = 13;

/// Rejected lines: their numbers, first and last columns at fault, reasons.
type Rejected = Vec<(usize, usize, usize, String)>;

#[pymethods]
impl Orbits {
    /// Sizes and places in the orbit are semi-major axes and mean anomalies (degrees), or perihelion distances and
    /// their instants.
    #[new]
    #[pyo3(signature = (epoch_mjd_tt, eccentricity, inclination_deg, node_deg, perihelion_argument_deg, size_au, place, by_mean_anomaly, h_mag, slope_g, slope_g2))]
    fn new(
        py: Python<'_>,
        epoch_mjd_tt: Floats<'_>,
        eccentricity: Floats<'_>,
        inclination_deg: Floats<'_>,
        node_deg: Floats<'_>,
        perihelion_argument_deg: Floats<'_>,
        size_au: Floats<'_>,
        place: Floats<'_>,
        by_mean_anomaly: bool,
        h_mag: Floats<'_>,
        slope_g: Floats<'_>,
        slope_g2: Option<Floats<'_>>,
    ) -> PyResult<Self> {
        let [epoch_mjd_tt, eccentricity, inclination, node, argument, size_au, place, h_mag, g] = equal([
            ("epoch_mjd_tt", &epoch_mjd_tt),
            ("eccentricity", &eccentricity),
            ("inclination_deg", &inclination_deg),
            ("node_deg", &node_deg),
            ("perihelion_argument_deg", &perihelion_argument_deg),
            ("size_au", &size_au),
            ("place", &place),
            ("h_mag", &h_mag),
            ("slope_g", &slope_g),
        ])?;
        let g2 = slope_g2.as_ref().map(|g2| g2.as_slice()).transpose()?;
        let rows = py.detach(|| {
            let radians = |degrees: &[f64]| -> Vec<f64> {
                degrees.iter().map(|degrees| degrees * RADIANS_PER_DEGREE).collect()
            };
            let mean_anomaly = if by_mean_anomaly { radians(place) } else { Vec::new() };
            orbits::Orbits::from_columns(&Columns {
                epoch_mjd_tt,
                eccentricity,
                inclination: &radians(inclination),
                node: &radians(node),
                perihelion_argument: &radians(argument),
                anomaly: if by_mean_anomaly {
                    Anomaly::Mean { semi_major_axis_au: size_au, mean_anomaly: &mean_anomaly }
                } else {
                    Anomaly::Perihelion { perihelion_au: size_au, perihelion_mjd_tt: place }
                },
                h_mag: Some(h_mag),
                slope: g2.map_or(Slope::G(g), |g2| Slope::G1G2(g, g2)),
            })
        });
        Ok(Orbits { rows: rows.map_err(raise)? })
    }

    /// From the lines of a text, with their designations and numbers, and the lines that are no orbits.
    #[staticmethod]
    fn from_mpc<'py>(
        py: Python<'py>,
        text: &str,
    ) -> (Self, Vec<String>, Bound<'py, PyArray1<i64>>, Rejected) {
        let (rows, names, numbers, rejected) = py.detach(|| {
            let lines = mpc::orbit_lines(text);
            let rejected = lines
                .rejected
                .iter()
                .map(|line| (line.line, line.columns.0, line.columns.1, line.reason.clone()))
                .collect();
            let rows = lines.orbits();
            let numbers: Vec<i64> = lines.rows.iter().map(|row| row.line as i64).collect();
            let names = lines.rows.into_iter().map(|row| row.designation).collect();
            (rows, names, numbers, rejected)
        });
        (Orbits { rows }, names, column(py, numbers), rejected)
    }

    /// From what [`Orbits::rows`] gave.
    #[staticmethod]
    fn from_rows(numbers: Floats<'_>) -> PyResult<Self> {
        let mut rows = orbits::Orbits::new();
        for row in numbers.as_slice()?.chunks_exact(ROW) {
            let (elements, brightness) = unpacked(row);
            rows.push(elements, brightness);
        }
        Ok(Orbits { rows })
    }

    fn __len__(&self) -> usize {
        self.rows.len()
    }

    /// The status of each row.
    #[getter]
    fn status<'py>(&self, py: Python<'py>) -> Bound<'py, PyArray1<u8>> {
        let status: Vec<Status> = (0..self.rows.len()).map(|row| self.rows.status(row)).collect();
        column(py, codes(&status))
    }

    /// Everything, thirteen numbers a row.
    fn rows<'py>(&self, py: Python<'py>) -> Bound<'py, PyArray1<f64>> {
        column(py, (0..self.rows.len()).flat_map(|row| packed(&self.rows, row)).collect())
    }

    /// The elements as columns by name, in degrees, MJD TT and au.
    fn elements<'py>(&self, py: Python<'py>) -> PyResult<Bound<'py, PyDict>> {
        let columns = PyDict::new(py);
        let of = |value: &dyn Fn(&Elements) -> f64| {
            column(py, (0..self.rows.len()).map(|row| value(self.rows.elements(row))).collect::<Vec<f64>>())
        };
        let bright = |value: &dyn Fn(Brightness) -> f64| {
            column(py, (0..self.rows.len()).map(|row| value(self.rows.brightness(row))).collect::<Vec<f64>>())
        };
        columns.set_item(
            "epoch_mjd_tt",
            of(&|e| if e.eccentricity.is_nan() { f64::NAN } else { e.epoch.to_tt().mjd() }),
        )?;
        columns.set_item("eccentricity", of(&|e| e.eccentricity))?;
        columns.set_item("inclination_deg", of(&|e| e.inclination / RADIANS_PER_DEGREE))?;
        columns.set_item("node_deg", of(&|e| e.node / RADIANS_PER_DEGREE))?;
        columns.set_item("perihelion_argument_deg", of(&|e| e.perihelion_argument / RADIANS_PER_DEGREE))?;
        columns.set_item("semi_major_axis_au", of(&Elements::semi_major_axis_au))?;
        columns.set_item("mean_anomaly_deg", of(&|e| e.mean_anomaly() / RADIANS_PER_DEGREE))?;
        columns.set_item("perihelion_au", of(&|e| e.perihelion_au))?;
        columns.set_item("perihelion_mjd_tt", of(&Elements::perihelion_mjd_tt))?;
        columns.set_item(
            "h_mag",
            bright(&|brightness| match brightness {
                Brightness::Hg { h, .. } | Brightness::Hg1g2 { h, .. } | Brightness::Comet { h, .. } => h,
            }),
        )?;
        Ok(columns)
    }

    /// The same bodies at another epoch, MJD TT, with the perturbations in between.
    fn advance(&self, py: Python<'_>, to_mjd_tt: f64, workers: Workers) -> PyResult<Self> {
        let to = Instant::<Tt>::from_mjd(to_mjd_tt, 0.0).to_tdb();
        let ephemeris = Ephemeris::default();
        let rows = workers::run(py, &workers, |workers| grid::advance(&self.rows, to, &ephemeris, workers))?;
        Ok(Orbits { rows })
    }

    /// How far two-body motion may have drifted at an instant, MJD TT: au, one a row.
    fn drift_au<'py>(&self, py: Python<'py>, mjd_tt: f64) -> Bound<'py, PyArray1<f64>> {
        let at = Instant::<Tt>::from_mjd(mjd_tt, 0.0).to_tdb();
        column(py, (0..self.rows.len()).map(|row| self.rows.drift_au(row, at)).collect())
    }
}

fn packed(rows: &orbits::Orbits, row: usize) -> [f64; ROW] {
    let elements = rows.elements(row);
    let (day, fraction) = elements.epoch.mjd_parts();
    let (kind, h, a, b) = match rows.brightness(row) {
        Brightness::Hg { h, g } => (0.0, h, g, 0.0),
        Brightness::Hg1g2 { h, g1, g2 } => (1.0, h, g1, g2),
        Brightness::Comet { h, k } => (2.0, h, k, 0.0),
    };
    [
        day,
        fraction,
        elements.perihelion_au,
        elements.eccentricity,
        elements.inclination,
        elements.node,
        elements.perihelion_argument,
        elements.since_perihelion_d,
        kind,
        h,
        a,
        b,
        f64::from(rows.status(row) as u8),
    ]
}

fn unpacked(row: &[f64]) -> (Result<Elements, Status>, Brightness) {
    let brightness = match row[8] {
        0.0 => Brightness::Hg { h: row[9], g: row[10] },
        1.0 => Brightness::Hg1g2 { h: row[9], g1: row[10], g2: row[11] },
        _ => Brightness::Comet { h: row[9], k: row[10] },
    };
    let status = Status::ALL.into_iter().find(|&status| f64::from(status as u8) == row[12]);
    let elements = match status {
        Some(Status::Ok) => Ok(Elements {
            epoch: Instant::from_mjd(row[0], row[1]),
            perihelion_au: row[2],
            eccentricity: row[3],
            inclination: row[4],
            node: row[5],
            perihelion_argument: row[6],
            since_perihelion_d: row[7],
        }),
        bad => Err(bad.unwrap_or(Status::Elements)),
    };
    (elements, brightness)
}
