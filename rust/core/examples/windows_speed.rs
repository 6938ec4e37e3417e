//! Nanoseconds a target of the windows of one night, on one core: `cargo run --release --example windows_speed`.
//!
//! Limits are added one after the other, so that the cost of each is the difference of two lines.

use hourarc_core::astrometry::{Catalog, CatalogColumns, Observer, Targets};
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::events::{Days, track_for};
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::{Site, Skyline};
use hourarc_core::time::{LeapSeconds, Utc};
use hourarc_core::windows::{Column, LimitedSpan, Limits, MoonAvoidance, Phase, PhaseScale, Workspace};
use std::time::Instant;

const STARS: usize = 100_000;

/// A name and what it adds to the limits.
type OneMore = (&'static str, fn(&mut Limits));

fn main() {
    let points: Vec<f64> = (0..72).map(|i| f64::from(i) * 5.0 * RADIANS_PER_DEGREE).collect();
    let altitudes: Vec<f64> =
        points.iter().map(|a| (10.0 + 8.0 * (7.0 * a).sin()) * RADIANS_PER_DEGREE).collect();
    let site = Site::from_degrees(-70.4, -24.6, 2600.0)
        .unwrap()
        .with_skyline(Skyline::new(&points, &altitudes).unwrap());
    let atmosphere = Atmosphere {
        pressure_hpa: Atmosphere::standard_pressure_hpa(2600.0),
        temperature_c: 10.0,
        relative_humidity: 0.3,
        wavelength_um: 0.55,
    };
    let refraction = Refraction::new(&atmosphere, site.latitude(), 2600.0).unwrap();
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.05, 1e-6, 2e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let observer =
        Observer { site: &site, refraction: &refraction, orientation: &orientation, ephemeris: &ephemeris };
    let catalog = random_stars();
    let targets = Targets::Catalog(&catalog);
    let start = Utc::from_mjd(61_109.0, 0.5 + 70.4 / 360.0);
    let stop = start.plus_nanoseconds(86_400_000_000_000);
    let track = track_for(&observer, start, stop).unwrap();
    let days = Days::new(observer, &track, start, stop).unwrap();

    let deg = |angle_deg: f64| Some(Column::All(angle_deg * RADIANS_PER_DEGREE));
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    measure("no limit", &days, &targets, &limits);
    limits.altitude_min = deg(30.0);
    measure("altitude", &days, &targets, &limits);
    limits.sun_altitude_max = deg(-18.0);
    measure("+ Sun altitude", &days, &targets, &limits);
    limits.sun_separation_min = deg(30.0);
    measure("+ Sun separation (the default limits)", &days, &targets, &limits);
    limits.moon_separation_min = deg(30.0);
    measure("+ Moon separation", &days, &targets, &limits);

    println!("the default limits and one more:");
    limits.moon_separation_min = None;
    let one_more: [OneMore; 10] = [
        ("hour angle", |l| {
            l.hour_angle_min = Some(Column::All(-1.0));
            l.hour_angle_max = Some(Column::All(1.0));
        }),
        ("declination", |l| l.declination_max = Some(Column::All(0.5))),
        ("azimuth sector", |l| l.azimuth_sectors = Some(vec![(1.0, 5.0)])),
        ("azimuth rate", |l| l.azimuth_rate_max = Some(Column::All(0.005))),
        ("cables", |l| l.cable_range = Some((-4.7, 4.7))),
        ("Lorentzian Moon avoidance", |l| {
            let (separation, width_d) = (Column::All(2.0), Column::All(7.0));
            l.moon_avoidance = Some(MoonAvoidance::Lorentzian { separation, width_d });
        }),
        ("sky brightness", |l| l.sky_brightness_min_v = Some(Column::All(20.5))),
        ("phase", |l| {
            l.phase = Some(Phase {
                epoch_mjd: Column::All(60_000.0),
                period_d: Column::All(0.7),
                half_width_d: Column::All(0.02),
                scale: PhaseScale::BarycentricTdb,
            });
        }),
        ("skyline of 72 points below 30°", |l| l.use_skyline = true),
        ("skyline of 72 points alone, no altitude", |l| {
            l.use_skyline = true;
            l.altitude_min = None;
        }),
    ];
    for (name, add) in one_more {
        let mut limits = limits.clone();
        add(&mut limits);
        measure(name, &days, &targets, &limits);
    }
}

fn measure(name: &str, days: &Days<'_>, targets: &Targets<'_>, limits: &Limits) {
    let begun = Instant::now();
    let span = LimitedSpan::new(days, limits, targets.len()).unwrap();
    let prepared = begun.elapsed().as_secs_f64();
    let mut best = f64::INFINITY;
    let mut count = 0;
    for _ in 0..7 {
        let (mut workspace, mut windows) = (Workspace::default(), Vec::with_capacity(4 * STARS));
        let begun = Instant::now();
        for row in 0..targets.len() {
            span.windows(targets, row, &mut workspace, &mut windows);
        }
        best = f64::min(best, begun.elapsed().as_secs_f64());
        count = windows.len();
    }
    println!(
        "{name:40} {:7.0} ns a target, {count} windows, {:.1} ms once",
        best / targets.len() as f64 * 1e9,
        prepared * 1e3
    );
}

/// Uniform on the sphere, with proper motion and parallax; Knuth's MMIX generator.
fn random_stars() -> Catalog {
    let mut state = 1u64;
    let mut next = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64
    };
    let mut columns: [Vec<f64>; 7] = Default::default();
    for _ in 0..STARS {
        let row = [
            360.0 * next(),
            (2.0 * next() - 1.0).asin() / RADIANS_PER_DEGREE,
            2016.0,
            200.0 * next() - 100.0,
            200.0 * next() - 100.0,
            10.0 * next(),
            100.0 * next() - 50.0,
        ];
        for (column, value) in columns.iter_mut().zip(row) {
            column.push(value);
        }
    }
    Catalog::new(&CatalogColumns {
        ra_deg: &columns[0],
        dec_deg: &columns[1],
        epoch_yr: &columns[2],
        pm_ra_mas_yr: &columns[3],
        pm_dec_mas_yr: &columns[4],
        parallax_mas: &columns[5],
        radial_velocity_km_s: &columns[6],
    })
    .unwrap()
}
