//! What a site knows of its air.

use crate::constants::RADIANS_PER_DEGREE;
use crate::error::{Error, Result};
use std::f64::consts::FRAC_PI_2;

/// 0 °C in kelvin. Exact.
pub(super) const ZERO_CELSIUS_K: f64 = 273.15;

/// The air at a site, and the colour of light that is observed through it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Atmosphere {
    /// Pressure at the site itself (not reduced to sea level), hPa, 0 to 1200; 0: no air, no refraction.
    pub pressure_hpa: f64,
    /// Temperature, °C, −90 to 60.
    pub temperature_c: f64,
    /// Relative humidity, 0 to 1.
    pub relative_humidity: f64,
    /// Wavelength in vacuum, µm, 0.2 to 100. The dispersion formula is one for the visible and near infrared:
    /// within 1e-4 of the refractivity of another from 0.4 to 1.7 µm, 2.5e-4 at 0.35, 8e-4 at 0.3, and 1.4 %
    /// at 0.2 (test `dispersion_against_another_formula`). It knows no absorption bands, so that beyond 1.7
    /// µm it is a smooth continuation. Radio waves, which water vapour bends twenty times more, are out of
    /// its scope.
    pub wavelength_um: f64,
}

impl Atmosphere {
    /// Pressure of the US Standard Atmosphere 1976 at a height above the sea, hPa, −500 to 10,000 m.
    ///
    /// Equation 33a of that document in its lowest layer: 1013.25 hPa and 288.15 K at the sea, −6.5 K per
    /// geopotential km. To the printed figures of its tables (test `standard_pressure`).
    pub fn standard_pressure_hpa(height_m: f64) -> f64 {
        const SEA_PRESSURE_HPA: f64 = 1013.25;
        const SEA_TEMPERATURE_K: f64 = 288.15;
        const LAPSE_K_PER_M: f64 = 0.0065;
        const EARTH_RADIUS_M: f64 = 6_356_766.0;
        // g₀ M₀ / (R* L): 9.80665 m/s², 28.9644 kg/kmol, 8314.32 J/(kmol K).
        const EXPONENT: f64 = 9.80665 * 28.9644 / (8314.32 * LAPSE_K_PER_M);
        let geopotential_m = EARTH_RADIUS_M * height_m / (EARTH_RADIUS_M + height_m);
        SEA_PRESSURE_HPA * (1.0 - LAPSE_K_PER_M * geopotential_m / SEA_TEMPERATURE_K).powf(EXPONENT)
    }

    /// Partial pressure of water vapour at the site, hPa, in the power law of the model atmosphere
    /// (Hohenkerk & Sinclair 1985), which is within 3.1 % of steam tables from 0 to 30 °C (test
    /// `saturation_pressure`): 0.02″ at 80° zenith distance.
    pub(super) fn vapour_pressure_hpa(&self) -> f64 {
        self.relative_humidity * saturation_pressure_hpa(self.temperature_c)
    }

    /// Whether every value is in its range and they can be true together.
    pub(super) fn check(&self) -> Result<()> {
        let ranges = [
            ("pressure", self.pressure_hpa, 0.0, 1200.0, " hPa"),
            ("temperature", self.temperature_c, -90.0, 60.0, " degrees Celsius"),
            ("relative humidity", self.relative_humidity, 0.0, 1.0, ""),
            ("wavelength", self.wavelength_um, 0.2, 100.0, " micrometres"),
        ];
        for (what, given, least, most, unit) in ranges {
            if !(least..=most).contains(&given) {
                return Err(Error::invalid(
                    what,
                    format!("{given}{unit}"),
                    format!("{least} to {most}{unit}"),
                ));
            }
        }
        let vapour_hpa = self.vapour_pressure_hpa();
        if self.pressure_hpa > 0.0 && vapour_hpa > self.pressure_hpa {
            let given = format!(
                "{} at {} degrees Celsius, that is {vapour_hpa:.3} hPa of water vapour in a pressure of {} hPa",
                self.relative_humidity, self.temperature_c, self.pressure_hpa
            );
            let most = self.pressure_hpa / saturation_pressure_hpa(self.temperature_c);
            return Err(Error::invalid("relative humidity", given, format!("0 to {most:.3} in that air")));
        }
        Ok(())
    }
}

fn saturation_pressure_hpa(temperature_c: f64) -> f64 {
    ((ZERO_CELSIUS_K + temperature_c) / 247.1).powf(super::profile::VAPOUR_EXPONENT)
}

pub(super) fn check_place(latitude: f64, height_m: f64) -> Result<()> {
    let quarter = FRAC_PI_2 * (1.0 + 4.0 * f64::EPSILON);
    if !(-quarter..=quarter).contains(&latitude) {
        let given = format!("{} degrees", latitude / RADIANS_PER_DEGREE);
        return Err(Error::invalid("latitude", given, "-90 to 90 degrees"));
    }
    if !(-500.0..=10_000.0).contains(&height_m) {
        return Err(Error::invalid("height", format!("{height_m} m"), "-500 to 10000 m"));
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    const USUAL: Atmosphere =
        Atmosphere { pressure_hpa: 1000.0, temperature_c: 10.0, relative_humidity: 0.3, wavelength_um: 0.55 };

    /// US Standard Atmosphere 1976, table I, pressure against geometric altitude [M].
    #[test]
    fn standard_pressure() {
        for (height_m, pressure_hpa, printed) in [
            (0.0, 1013.25, 1e-9),
            (1000.0, 898.76, 0.006),
            (5000.0, 540.48, 0.006),
            (10_000.0, 265.00, 0.006),
            (-500.0, 1074.8, 0.06),
        ] {
            let found = Atmosphere::standard_pressure_hpa(height_m);
            assert!((found - pressure_hpa).abs() < printed, "{height_m}: {found}");
        }
    }

    /// Saturation over water: 12.27 hPa at 10 °C, 6.11 at 0 °C, 42.4 at 30 °C (steam tables [M]).
    #[test]
    fn saturation_pressure() {
        for (temperature_c, hpa) in [(0.0, 6.11), (10.0, 12.27), (30.0, 42.4)] {
            let off = saturation_pressure_hpa(temperature_c) / hpa - 1.0;
            assert!(off.abs() < 0.031, "{temperature_c}: {off}");
        }
    }

    #[test]
    fn impossible_air_is_refused_by_name() {
        let message = |air: Atmosphere| air.check().unwrap_err().to_string();
        assert!(USUAL.check().is_ok());
        assert_eq!(
            message(Atmosphere { pressure_hpa: 1300.0, ..USUAL }),
            "pressure: given 1300 hPa, allowed 0 to 1200 hPa"
        );
        assert!(message(Atmosphere { pressure_hpa: -1.0, ..USUAL }).contains("-1 hPa"));
        assert!(message(Atmosphere { temperature_c: 283.0, ..USUAL }).contains("-90 to 60 degrees Celsius"));
        assert!(
            message(Atmosphere { relative_humidity: 30.0, ..USUAL }).contains("given 30, allowed 0 to 1")
        );
        assert!(message(Atmosphere { wavelength_um: 550.0, ..USUAL }).contains("0.2 to 100 micrometres"));
        assert!(message(Atmosphere { wavelength_um: f64::NAN, ..USUAL }).contains("NaN"));
        let steam = message(Atmosphere { pressure_hpa: 2.0, relative_humidity: 0.5, ..USUAL });
        assert!(steam.contains("hPa of water vapour in a pressure of 2 hPa, allowed 0 to 0.1"), "{steam}");
        assert!(Atmosphere { pressure_hpa: 0.0, ..USUAL }.check().is_ok());
        assert!(check_place(1.6, 0.0).unwrap_err().to_string().contains("-90 to 90"));
        assert!(
            check_place(0.0, 11_000.0)
                .unwrap_err()
                .to_string()
                .contains("given 11000 m, allowed -500 to 10000 m")
        );
        assert!(check_place(0.0, f64::NAN).is_err() && check_place(f64::NAN, 0.0).is_err());
    }
}
