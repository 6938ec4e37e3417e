//! A site with its air: the refraction is tabulated when it is made.

use hourarc_core::astrometry::Observer;
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::refraction::{Atmosphere, Refraction};
use hourarc_core::site::{self, Skyline};
use hourarc_core::windows::SkyModel;
use pyo3::prelude::*;

use crate::arrays::{Floats, equal};
use crate::errors::raise;
use crate::orientation::Orientation;

/// Where the telescope stands, the air above it, and the skyline around it.
#[pyclass(frozen, module = "hourarc._engine")]
pub struct Site {
    /// The place.
    pub place: site::Site,
    /// The refraction of its air.
    pub refraction: Refraction,
    /// What the brightness of its sky is computed from.
    pub sky_model: SkyModel,
    pressure_hpa: f64,
}

#[pymethods]
impl Site {
    #[new]
    #[pyo3(signature = (longitude_deg, latitude_deg, height_m, pressure_hpa, temperature_c, relative_humidity, wavelength_um, sky_extinction_mag, dark_sky_mag_arcsec2, skyline_azimuth_deg, skyline_altitude_deg))]
    fn new(
        py: Python<'_>,
        longitude_deg: f64,
        latitude_deg: f64,
        height_m: f64,
        pressure_hpa: Option<f64>,
        temperature_c: f64,
        relative_humidity: f64,
        wavelength_um: f64,
        sky_extinction_mag: f64,
        dark_sky_mag_arcsec2: f64,
        skyline_azimuth_deg: Option<Floats<'_>>,
        skyline_altitude_deg: Option<Floats<'_>>,
    ) -> PyResult<Self> {
        let mut place = site::Site::from_degrees(longitude_deg, latitude_deg, height_m).map_err(raise)?;
        if let (Some(azimuth), Some(altitude)) = (&skyline_azimuth_deg, &skyline_altitude_deg) {
            let [azimuth, altitude] =
                equal([("skyline_azimuth_deg", azimuth), ("skyline_altitude_deg", altitude)])?.map(
                    |degrees| degrees.iter().map(|angle| angle * RADIANS_PER_DEGREE).collect::<Vec<_>>(),
                );
            place = place.with_skyline(Skyline::new(&azimuth, &altitude).map_err(raise)?);
        }
        let sky_model = SkyModel { extinction_v: sky_extinction_mag, dark_zenith_v: dark_sky_mag_arcsec2 };
        sky_model.check().map_err(raise)?;
        let pressure_hpa = pressure_hpa.unwrap_or_else(|| Atmosphere::standard_pressure_hpa(height_m));
        let air = Atmosphere { pressure_hpa, temperature_c, relative_humidity, wavelength_um };
        let refraction =
            py.detach(|| Refraction::new(&air, place.latitude(), place.height_m())).map_err(raise)?;
        Ok(Site { place, refraction, sky_model, pressure_hpa })
    }

    /// The pressure in force, hPa.
    #[getter]
    fn pressure_hpa(&self) -> f64 {
        self.pressure_hpa
    }

    /// The lowest observed altitude for which the refraction is tabulated, degrees.
    #[getter]
    fn lowest_altitude_deg(&self) -> f64 {
        self.refraction.lowest_observed_altitude() / RADIANS_PER_DEGREE
    }

    /// Dip of the sea horizon, degrees.
    #[getter]
    fn horizon_dip_deg(&self) -> f64 {
        site::dip(self.place.height_m()) / RADIANS_PER_DEGREE
    }
}

impl Site {
    /// The observer here, on an Earth and in a solar system.
    pub fn observer<'a>(&'a self, orientation: &'a Orientation, ephemeris: &'a Ephemeris) -> Observer<'a> {
        Observer {
            site: &self.place,
            refraction: &self.refraction,
            orientation: &orientation.value,
            ephemeris,
        }
    }
}
