//! Windows under every limit: by brute force each second, and the cases that break planners.

mod brute;
mod cases;
#[path = "../common/mod.rs"]
mod common;
mod sure;

use common::Random;
use hourarc_core::astrometry::{
    Catalog, CatalogColumns, Observer, Sky, Targets, Track, body_direction, star_direction,
};
use hourarc_core::constants::{
    DAYS_PER_JULIAN_YEAR, J2000_MJD, LIGHT_TIME_AU_S, RADIANS_PER_DEGREE, SECONDS_PER_DAY, TURN,
};
use hourarc_core::earth::{Orientation, bias_precession_nutation, mean_obliquity, nutation};
use hourarc_core::ephemeris::{Body, Ephemeris};
use hourarc_core::events::{Days, track_for};
use hourarc_core::horizon::{Latitude, altitude, azimuth, hour_angle, sin_declination};
use hourarc_core::math::vector::{Vector, add_scaled, angle, dot, rotate, rotation_1, sub, unit};
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::{Site, Skyline};
use hourarc_core::time::{Instant, LeapSeconds, Tai, Utc};
use hourarc_core::windows::{
    Cause, Column, Explanation, LimitedSpan, Limits, MoonAvoidance, MoonLight, Phase, PhaseScale, Window,
    Workspace, sky_brightness,
};
use std::f64::consts::PI;

impl Random {
    fn degrees(&mut self, low: f64, high: f64) -> f64 {
        self.between(low, high) * RADIANS_PER_DEGREE
    }

    fn chance(&mut self, probability: f64) -> bool {
        self.unit() < probability
    }
}

struct Setting {
    site: Site,
    refraction: Refraction,
    orientation: Orientation,
    ephemeris: Ephemeris,
}

impl Setting {
    fn new(longitude_deg: f64, latitude_deg: f64, height_m: f64) -> Self {
        let site = Site::from_degrees(longitude_deg, latitude_deg, height_m).unwrap();
        let atmosphere = Atmosphere {
            pressure_hpa: Atmosphere::standard_pressure_hpa(height_m),
            temperature_c: 10.0,
            relative_humidity: 0.3,
            wavelength_um: 0.55,
        };
        Setting {
            refraction: Refraction::new(&atmosphere, site.latitude(), height_m).unwrap(),
            site,
            orientation: Orientation::constant(LeapSeconds::builtin(), -0.1, 1e-6, 2e-6, 0.0, 0.0),
            ephemeris: Ephemeris::default(),
        }
    }

    fn observer(&self) -> Observer<'_> {
        Observer {
            site: &self.site,
            refraction: &self.refraction,
            orientation: &self.orientation,
            ephemeris: &self.ephemeris,
        }
    }

    /// What comes of each target from `mjd` for `days`.
    fn windows(&self, targets: &Targets<'_>, limits: &Limits, mjd: f64, days: f64) -> Vec<Planned> {
        let start = Utc::from_mjd(mjd.floor(), mjd - mjd.floor());
        let stop = start.plus_nanoseconds((days * 86_400e9) as i64);
        let track = track_for(&self.observer(), start, stop).unwrap();
        let mut span_days = Days::new(self.observer(), &track, start, stop).unwrap();
        span_days.prepare(targets).unwrap();
        let span = LimitedSpan::new(&span_days, limits, targets.len()).unwrap();
        let mut workspace = Workspace::default();
        (0..targets.len())
            .map(|row| {
                let mut windows = Vec::new();
                let outcome = span.windows(targets, row, &mut workspace, &mut windows);
                Planned { windows, blocked_by: outcome.blocked_by, explanation: span.explain(targets, row) }
            })
            .collect()
    }
}

struct Planned {
    windows: Vec<Window>,
    blocked_by: Cause,
    explanation: Explanation,
}

fn stars(ra_dec_deg: &[(f64, f64)]) -> Catalog {
    let zeros = vec![0.0; ra_dec_deg.len()];
    Catalog::new(&CatalogColumns {
        ra_deg: &ra_dec_deg.iter().map(|row| row.0).collect::<Vec<_>>(),
        dec_deg: &ra_dec_deg.iter().map(|row| row.1).collect::<Vec<_>>(),
        epoch_yr: &vec![2016.0; ra_dec_deg.len()],
        pm_ra_mas_yr: &zeros,
        pm_dec_mas_yr: &zeros,
        parallax_mas: &zeros,
        radial_velocity_km_s: &zeros,
    })
    .unwrap()
}
