//! Time a target of the main calls on random stars, on one thread and on all.
//!
//! `cargo run --release -p hourarc-core --example throughput [rows]`

use hourarc_core::astrometry::{Observer, Targets};
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::events::{Days, night_bounds, track_for};
use hourarc_core::grid::{
    GridQuantity, GridValues, KEEP_GOING, PlaceColumn, PlaceColumns, Shape, Workers, event_table, place,
    visibility_grid, window_table,
};
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::Site;
use hourarc_core::time::{LeapSeconds, Utc};
use hourarc_core::windows::{Column, Limits, SkyModel};

#[path = "common/clock.rs"]
mod clock;
#[path = "common/stars.rs"]
mod stars;

use clock::best;
use stars::catalog;

fn main() {
    let rows = std::env::args().nth(1).and_then(|word| word.parse().ok()).unwrap_or(100_000);
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
    let catalog = catalog(rows);
    let targets = Targets::Catalog(&catalog);
    let (start, stop) = night_bounds(61_109, site.longitude());
    let pairs: Vec<Utc> = (0..rows)
        .map(|i| Utc::from_nanoseconds(start.nanoseconds() + 315 * i as i64 * 100_000_000_000 / rows as i64))
        .collect();
    let mut limits = Limits::none(AirmassModel::Pickering2002);
    let degrees = |value: f64| Some(Column::All(value * RADIANS_PER_DEGREE));
    limits.altitude_min = degrees(30.0);
    limits.sun_altitude_max = degrees(-18.0);
    limits.sun_separation_min = degrees(30.0);
    let mut with_moon = limits.clone();
    with_moon.moon_separation_min = degrees(30.0);
    for threads in [1, 0] {
        let mut go = KEEP_GOING;
        let report = |name: &str, seconds: f64| {
            let each = seconds * 1e9 / rows as f64;
            println!("threads {threads}  {name:34} {:8.1} ms {each:9.1} ns a row", seconds * 1e3);
        };
        let (mut a, mut b, mut status) = (vec![0.0; rows], vec![0.0; rows], vec![0u8; rows]);
        for (name, when, shape) in [
            ("place one instant, alt az", &pairs[..1], Shape::Grid),
            ("place pairwise, alt az", &pairs[..], Shape::Pairwise),
        ] {
            let seconds = best(|| {
                let columns =
                    vec![(PlaceColumn::AltitudeDeg, &mut a[..]), (PlaceColumn::AzimuthDeg, &mut b[..])];
                let out = PlaceColumns { columns, sky_model: SkyModel::default(), status: &mut status };
                place(&observer, &targets, when, shape, out, &mut Workers::new(threads, &mut go))
                    .expect("places");
            });
            report(name, seconds);
        }
        let track = track_for(&observer, start, stop).expect("a span");
        let mut days = Days::new(observer, &track, start, stop).expect("a span");
        let seconds = best(|| {
            let table = event_table(&mut days, &targets, 0.0, &mut Workers::new(threads, &mut go));
            assert!(table.expect("events").time.len() > rows / 2);
        });
        report("rise, transit, set", seconds);
        let nights = 365;
        let mut hours = vec![0.0f32; rows * nights];
        for (name, limits) in [("a year of hours", &limits), ("a year of hours with the Moon", &with_moon)] {
            let seconds = best(|| {
                let columns = vec![(GridQuantity::Hours, GridValues::Single(&mut hours))];
                let mut workers = Workers::new(threads, &mut go);
                visibility_grid(
                    &observer,
                    &targets,
                    61_109,
                    nights,
                    limits,
                    columns,
                    &mut workers,
                    &mut |_| (),
                )
                .expect("a grid");
            });
            report(name, seconds / nights as f64);
        }
        for (name, limits) in [("windows", &limits), ("windows with the Moon", &with_moon)] {
            let seconds = best(|| {
                let table =
                    window_table(&mut days, &targets, limits, None, &mut Workers::new(threads, &mut go));
                assert!(table.expect("windows").start.len() > rows / 4);
            });
            report(name, seconds);
        }
    }
}
