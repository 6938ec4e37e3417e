//! Targets: a catalogue, bodies of the solar system, or orbits.

use hourarc_core::astrometry::{self, CatalogColumns};
use hourarc_core::ephemeris::{Body, Ephemeris, State};
use numpy::PyArray1;
use pyo3::prelude::*;
use std::path::PathBuf;

use crate::arrays::{Floats, codes, column, equal};
use crate::errors::raise;
use crate::kernel::kernel_with;
use crate::orbits::Orbits;

/// Rows of catalogue places.
#[pyclass(frozen, module = "hourarc._engine")]
pub struct Catalog {
    /// The rows, prepared.
    pub rows: astrometry::Catalog,
}

#[pymethods]
impl Catalog {
    #[new]
    fn new(
        py: Python<'_>,
        ra_deg: Floats<'_>,
        dec_deg: Floats<'_>,
        epoch_yr: Floats<'_>,
        pm_ra_mas_yr: Floats<'_>,
        pm_dec_mas_yr: Floats<'_>,
        parallax_mas: Floats<'_>,
        radial_velocity_km_s: Floats<'_>,
    ) -> PyResult<Self> {
        let [ra_deg, dec_deg, epoch_yr, pm_ra_mas_yr, pm_dec_mas_yr, parallax_mas, radial_velocity_km_s] =
            equal([
                ("ra_deg", &ra_deg),
                ("dec_deg", &dec_deg),
                ("epoch_yr", &epoch_yr),
                ("pm_ra_mas_yr", &pm_ra_mas_yr),
                ("pm_dec_mas_yr", &pm_dec_mas_yr),
                ("parallax_mas", &parallax_mas),
                ("radial_velocity_km_s", &radial_velocity_km_s),
            ])?;
        let columns = CatalogColumns {
            ra_deg,
            dec_deg,
            epoch_yr,
            pm_ra_mas_yr,
            pm_dec_mas_yr,
            parallax_mas,
            radial_velocity_km_s,
        };
        Ok(Catalog { rows: py.detach(|| astrometry::Catalog::new(&columns)).map_err(raise)? })
    }

    fn __len__(&self) -> usize {
        self.rows.len()
    }

    /// The status of each row.
    #[getter]
    fn status<'py>(&self, py: Python<'py>) -> Bound<'py, PyArray1<u8>> {
        column(py, codes(self.rows.status()))
    }
}

/// Bodies of the solar system, and where they are from.
#[pyclass(frozen, module = "hourarc._engine")]
pub struct Bodies {
    /// Which.
    pub bodies: Vec<Body>,
    /// Their positions.
    pub ephemeris: Ephemeris,
}

#[pymethods]
impl Bodies {
    #[new]
    #[pyo3(signature = (words, kernel))]
    fn new(words: Vec<String>, kernel: Option<PathBuf>) -> PyResult<Self> {
        let bodies: Vec<Body> =
            words.iter().map(|word| Body::from_word(word)).collect::<Result<_, _>>().map_err(raise)?;
        let ephemeris = match kernel {
            Some(path) => Ephemeris::Kernel(kernel_with(&path, &bodies)?),
            None => Ephemeris::default(),
        };
        Ok(Bodies { bodies, ephemeris })
    }

    /// Barycentric states at instants of TDB, six numbers a body, the bodies of an instant together, au and au a day;
    /// NaN outside the ephemeris.
    fn states<'py>(
        &self,
        py: Python<'py>,
        mjd_tdb: Floats<'py>,
        fraction: Floats<'py>,
    ) -> PyResult<Bound<'py, PyArray1<f64>>> {
        let [days, fractions] = equal([("mjd_tdb", &mjd_tdb), ("fraction", &fraction)])?;
        let numbers = py.detach(|| {
            let mut numbers = Vec::with_capacity(6 * self.bodies.len() * days.len());
            for (&day, &fraction) in days.iter().zip(fractions) {
                for &body in &self.bodies {
                    match self.ephemeris.state_at(body, day, fraction) {
                        Ok(State { position: [x, y, z], velocity: [vx, vy, vz] }) => {
                            numbers.extend_from_slice(&[x, y, z, vx, vy, vz]);
                        }
                        Err(_) => numbers.extend_from_slice(&[f64::NAN; 6]),
                    }
                }
            }
            numbers
        });
        Ok(column(py, numbers))
    }

    /// What the positions come from, in words.
    #[getter]
    fn ephemeris(&self) -> String {
        self.ephemeris.provenance()
    }

    fn __len__(&self) -> usize {
        self.bodies.len()
    }
}

/// What every verb takes as its targets.
#[derive(FromPyObject)]
pub enum Targets<'py> {
    /// Catalogue places.
    Catalog(Bound<'py, Catalog>),
    /// Bodies of the solar system.
    Bodies(Bound<'py, Bodies>),
    /// Minor bodies on their orbits.
    Orbits(Bound<'py, Orbits>),
}

impl Targets<'_> {
    /// As the core takes them.
    pub fn rows(&self) -> astrometry::Targets<'_> {
        match self {
            Targets::Catalog(catalog) => astrometry::Targets::Catalog(&catalog.get().rows),
            Targets::Bodies(bodies) => astrometry::Targets::Bodies(&bodies.get().bodies),
            Targets::Orbits(orbits) => astrometry::Targets::Orbits(&orbits.get().rows),
        }
    }

    /// The ephemeris they ask for.
    pub fn ephemeris(&self) -> Ephemeris {
        match self {
            Targets::Catalog(_) | Targets::Orbits(_) => Ephemeris::default(),
            Targets::Bodies(bodies) => bodies.get().ephemeris.clone(),
        }
    }
}
