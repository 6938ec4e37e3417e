//! The model atmosphere: refractive index against distance from the Earth's centre.
//!
//! After C. Y. Hohenkerk & A. T. Sinclair, *The computation of angular atmospheric refraction at large zenith
//! angles*, NAO Technical Note 63 (1985), also in the Explanatory Supplement to the Astronomical Almanac
//! (1992), section 3.281: a troposphere to 11 km whose temperature falls by 6.5 K/km from that of the site,
//! with relative humidity constant and water vapour as a power of the temperature, and an isothermal dry
//! stratosphere to 80 km, both in hydrostatic balance. Two things differ: the dispersion of light is the
//! newer formula of the International Association of Geodesy (1999), and the Earth's radius is the mean
//! radius of curvature at the latitude in place of one number for all.

use super::atmosphere::{Atmosphere, ZERO_CELSIUS_K};
use crate::constants::{RADIANS_PER_DEGREE, WGS84_EQUATORIAL_RADIUS_M, WGS84_FLATTENING};
use std::f64::consts::FRAC_PI_2;

/// Universal gas constant, J/(kmol K) (US Standard Atmosphere 1976).
const GAS_CONSTANT: f64 = 8314.32;
/// Molar masses of dry air and of water, kg/kmol (same, and Hohenkerk & Sinclair).
const DRY_AIR_MOLAR_MASS: f64 = 28.9644;
const WATER_MOLAR_MASS: f64 = 18.0152;
/// Fall of temperature with height in the troposphere, K/m.
const LAPSE_K_PER_M: f64 = 0.0065;
/// Water vapour pressure goes with this power of temperature (δ of Hohenkerk & Sinclair).
pub(super) const VAPOUR_EXPONENT: f64 = 18.36;
/// Heights above the ellipsoid of the two upper boundaries, m.
const TROPOPAUSE_M: f64 = 11_000.0;
const TOP_M: f64 = 80_000.0;
/// How much less water vapour refracts than dry air of its pressure, K/hPa (IAG 1999: 11.27 in units of
/// 1e-6).
const VAPOUR_REFRACTION_K_PER_HPA: f64 = 11.27e-6;

/// Refractivity n − 1 and its derivative with distance from the Earth's centre, per metre.
#[derive(Debug, Clone, Copy)]
pub(super) struct Index {
    pub refractivity: f64,
    pub gradient: f64,
}

impl Index {
    /// n r, which times the sine of the zenith distance is constant along a ray.
    pub fn optical_radius(self, radius_m: f64) -> f64 {
        radius_m + self.refractivity * radius_m
    }

    /// d(n r)/dr; where it is not positive the air traps rays.
    pub fn optical_slope(self, radius_m: f64) -> f64 {
        1.0 + self.refractivity + radius_m * self.gradient
    }
}

/// The refractive index above (and, continued, below) one site.
#[derive(Debug, Clone)]
pub(super) struct Profile {
    /// Distances of the site and of the two boundaries from the centre of curvature, m.
    pub site_m: f64,
    pub tropopause_m: f64,
    pub top_m: f64,
    height_m: f64,
    temperature_k: f64,
    /// Refractivity at the site is `dry − wet`; each goes with its own power of the temperature ratio.
    dry: f64,
    wet: f64,
    dry_exponent: f64,
    tropopause_refractivity: f64,
    /// Inverse scale height of the stratosphere, 1/m.
    stratosphere_per_m: f64,
}

impl Profile {
    /// For checked air at a checked place with pressure above 0.
    pub fn new(air: &Atmosphere, latitude: f64, height_m: f64) -> Self {
        let radius_m = curvature_radius_m(latitude);
        let temperature_k = air.temperature_c + ZERO_CELSIUS_K;
        // Gravity at the centre of mass of the column (Saastamoinen 1972), m/s².
        let gravity = 9.784 * (1.0 - 0.0026 * (2.0 * latitude).cos() - 0.000_000_28 * height_m);
        let per_kelvin_m = gravity * DRY_AIR_MOLAR_MASS / GAS_CONSTANT;
        let gamma = per_kelvin_m / LAPSE_K_PER_M;

        // Hydrostatic balance of dP/dT = (γ/T)(P − (1 − Mw/Md) Pw) with Pw ~ T^δ gives, with τ = T/T₀,
        // P = (P₀ + K) τ^γ − K τ^δ, K = γ (1 − Mw/Md) Pw₀ / (δ − γ).
        let vapour_hpa = air.vapour_pressure_hpa();
        let buoyancy_hpa =
            gamma * (1.0 - WATER_MOLAR_MASS / DRY_AIR_MOLAR_MASS) * vapour_hpa / (VAPOUR_EXPONENT - gamma);
        let per_density = dry_refractivity_k_per_hpa(air.wavelength_um);
        let dry = per_density * (air.pressure_hpa + buoyancy_hpa) / temperature_k;
        let wet = (per_density * buoyancy_hpa + VAPOUR_REFRACTION_K_PER_HPA * vapour_hpa) / temperature_k;

        let tropopause_k = temperature_k - LAPSE_K_PER_M * (TROPOPAUSE_M - height_m);
        let mut profile = Self {
            site_m: radius_m + height_m,
            tropopause_m: radius_m + TROPOPAUSE_M,
            top_m: radius_m + TOP_M,
            height_m,
            temperature_k,
            dry,
            wet,
            dry_exponent: gamma,
            tropopause_refractivity: 0.0,
            stratosphere_per_m: per_kelvin_m / tropopause_k,
        };
        profile.tropopause_refractivity = profile.troposphere(profile.tropopause_m).refractivity;
        profile
    }

    /// Below the tropopause, and continued below the site.
    pub fn troposphere(&self, radius_m: f64) -> Index {
        let above_m = radius_m - self.site_m;
        let log_ratio = (-LAPSE_K_PER_M * above_m / self.temperature_k).ln_1p();
        // Density: pressure over temperature, hence the powers less by one.
        let dry = self.dry * ((self.dry_exponent - 1.0) * log_ratio).exp();
        let wet = self.wet * ((VAPOUR_EXPONENT - 1.0) * log_ratio).exp();
        let per_m = -LAPSE_K_PER_M / (self.temperature_k - LAPSE_K_PER_M * above_m);
        Index {
            refractivity: dry - wet,
            gradient: per_m * ((self.dry_exponent - 1.0) * dry - (VAPOUR_EXPONENT - 1.0) * wet),
        }
    }

    /// Above the tropopause.
    pub fn stratosphere(&self, radius_m: f64) -> Index {
        let above_m = radius_m - self.tropopause_m;
        let refractivity = self.tropopause_refractivity * (-self.stratosphere_per_m * above_m).exp();
        Index { refractivity, gradient: -self.stratosphere_per_m * refractivity }
    }

    /// The lowest observed altitude for which rays can be traced, radians: below the dip of the sea horizon
    /// by half a degree or more, unless the air would come near to trapping the ray at its perigee.
    pub fn lowest_altitude(&self) -> f64 {
        let wanted = -(1.0 + 2.5 * (self.height_m.max(0.0) * 1e-4).sqrt()) * RADIANS_PER_DEGREE;
        let at_site = self.troposphere(self.site_m).optical_radius(self.site_m);
        let mut possible = 0.0;
        for step in 1..=400 {
            let radius_m = self.site_m - 50.0 * step as f64;
            let index = self.troposphere(radius_m);
            if index.optical_slope(radius_m) < LEAST_OPTICAL_SLOPE {
                break;
            }
            possible = -(index.optical_radius(radius_m) / at_site).acos();
            if possible < wanted {
                return wanted;
            }
        }
        possible
    }
}

/// Rays are not followed to where d(n r)/dr falls below this (it is 0.84 at sea level on a usual day): the
/// bending grows without limit as it goes to 0.
const LEAST_OPTICAL_SLOPE: f64 = 0.4;

/// Mean (Gaussian) radius of curvature of the ellipsoid, m: the geometric mean of those along the meridian
/// and across it.
pub(super) fn curvature_radius_m(latitude: f64) -> f64 {
    let eccentricity_squared = WGS84_FLATTENING * (2.0 - WGS84_FLATTENING);
    let sin_latitude = latitude.clamp(-FRAC_PI_2, FRAC_PI_2).sin();
    WGS84_EQUATORIAL_RADIUS_M * (1.0 - eccentricity_squared).sqrt()
        / (1.0 - eccentricity_squared * sin_latitude * sin_latitude)
}

/// Refractivity of dry air times temperature over pressure, K/hPa, at a vacuum wavelength.
///
/// International Association of Geodesy, resolution 3 of Birmingham (1999), which takes up Barrell & Sears
/// (1939) and Ciddor (1996): (n − 1) 10⁶ = 287.6155 + 1.62887/λ² + 0.01360/λ⁴ at 273.15 K and 1013.25 hPa.
pub(super) fn dry_refractivity_k_per_hpa(wavelength_um: f64) -> f64 {
    let wavenumber_squared = 1.0 / (wavelength_um * wavelength_um);
    let standard = 287.6155 + (1.62887 + 0.01360 * wavenumber_squared) * wavenumber_squared;
    standard * 1e-6 * ZERO_CELSIUS_K / 1013.25
}
