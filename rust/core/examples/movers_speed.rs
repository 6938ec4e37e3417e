//! Time an orbit of the main calls on random orbits, on one thread and on two.
//!
//! `cargo run --release -p hourarc-core --example movers_speed [rows]`

use hourarc_core::astrometry::{Observer, Targets};
use hourarc_core::constants::{RADIANS_PER_DEGREE, TURN};
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::ephemeris::orbits::{Orbits, table::from_mean_anomaly};
use hourarc_core::ephemeris::photometry::Brightness;
use hourarc_core::events::{Days, night_bounds, track_for};
use hourarc_core::grid::{
    KEEP_GOING, PlaceColumn, PlaceColumns, Shape, Workers, event_table, place, window_table,
};
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::Site;
use hourarc_core::time::{LeapSeconds, Utc};
use hourarc_core::windows::{Column, Limits, SkyModel};

#[path = "common/clock.rs"]
mod clock;

use clock::best;

fn orbits(rows: usize) -> Orbits {
    let mut state = 5u64;
    let mut unit = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64
    };
    let mut orbits = Orbits::new();
    for _ in 0..rows {
        let (e, inclination) = (0.3 * unit(), 0.4 * unit());
        let angles = [inclination, TURN * unit(), TURN * unit()];
        let elements = from_mean_anomaly(61_100.0, e, angles, 2.1 + unit(), TURN * unit());
        orbits.push(elements, Brightness::Hg { h: 18.0, g: 0.15 });
    }
    orbits
}

fn main() {
    let rows = std::env::args().nth(1).and_then(|word| word.parse().ok()).unwrap_or(1_000_000);
    let site = Site::from_degrees(24.5127, -20.8714, 1148.0).expect("a site");
    let air = Atmosphere {
        pressure_hpa: Atmosphere::standard_pressure_hpa(1148.0),
        temperature_c: 10.0,
        relative_humidity: 0.3,
        wavelength_um: 0.55,
    };
    let refraction = Refraction::new(&air, site.latitude(), 1148.0).expect("air");
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.05, 1e-6, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let observer =
        Observer { site: &site, refraction: &refraction, orientation: &orientation, ephemeris: &ephemeris };
    let orbits = orbits(rows);
    let targets = Targets::Orbits(&orbits);
    let (start, stop) = night_bounds(61_109, site.longitude());
    let pairs: Vec<Utc> = (0..rows)
        .map(|i| Utc::from_nanoseconds(start.nanoseconds() + 315 * i as i64 * 100_000_000_000 / rows as i64))
        .collect();
    let mut limits = Limits::none(AirmassModel::Pickering2002);
    limits.altitude_min = Some(Column::All(30.0 * RADIANS_PER_DEGREE));
    limits.sun_altitude_max = Some(Column::All(-18.0 * RADIANS_PER_DEGREE));
    limits.sun_separation_min = Some(Column::All(30.0 * RADIANS_PER_DEGREE));
    for threads in [1, 2] {
        let mut go = KEEP_GOING;
        let report = |name: &str, seconds: f64, rows: usize| {
            let each = seconds * 1e9 / rows as f64;
            println!("threads {threads}  {name:34} {:8.1} ms {each:9.1} ns an orbit", seconds * 1e3);
        };
        let looks = [PlaceColumn::MagnitudeV, PlaceColumn::RateArcsecMin];
        let directions = [PlaceColumn::AltitudeDeg, PlaceColumn::AzimuthDeg];
        let (mut a, mut b, mut status) = (vec![0.0; rows], vec![0.0; rows], vec![0u8; rows]);
        for (name, when, shape, wanted) in [
            ("place one instant, alt az", &pairs[..1], Shape::Grid, directions),
            ("place one instant, V and rate", &pairs[..1], Shape::Grid, looks),
            ("place pairwise, alt az", &pairs[..], Shape::Pairwise, directions),
        ] {
            let seconds = best(|| {
                let columns = vec![(wanted[0], &mut a[..]), (wanted[1], &mut b[..])];
                let out = PlaceColumns { columns, status: &mut status, sky_model: SkyModel::default() };
                let mut workers = Workers::new(threads, &mut go);
                place(&observer, &targets, when, shape, out, &mut workers).expect("places");
            });
            report(name, seconds, rows);
        }
        if rows > 100_000 {
            continue;
        }
        let track = track_for(&observer, start, stop).expect("a span");
        let mut days = Days::new(observer, &track, start, stop).expect("a span");
        let seconds = best(|| {
            let table = event_table(&mut days, &targets, 0.0, &mut Workers::new(threads, &mut go));
            assert!(table.expect("events").time.len() > rows / 2);
        });
        report("rise, transit, set of a night", seconds, rows);
        let seconds = best(|| {
            let table = window_table(&mut days, &targets, &limits, None, &mut Workers::new(threads, &mut go));
            assert!(table.expect("windows").start.len() > rows / 8);
        });
        report("windows of a night", seconds, rows);
    }
}
