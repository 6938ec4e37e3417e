//! Time of a watch at an instant, by the columns asked for, on one thread and on all.
//!
//! `cargo run --release -p hourarc-core --example watch_speed [rows]`

use hourarc_core::astrometry::{Observer, Targets};
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::events::{Days, night_bounds, track_for};
use hourarc_core::grid::{
    KEEP_GOING, PlaceColumn, PlaceColumns, Shape, Watch, WatchColumns, WatchedWindows, Workers, place,
    window_table,
};
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::Site;
use hourarc_core::time::{LeapSeconds, Utc};
use hourarc_core::windows::{Column, Limits, SkyModel};
use std::time::Instant;

#[path = "common/stars.rs"]
mod stars;

use stars::catalog;

/// Milliseconds of the best and of the middle of many runs.
fn times(mut run: impl FnMut()) -> [f64; 2] {
    let mut all: Vec<f64> = (0..21)
        .map(|_| {
            let begun = Instant::now();
            run();
            begun.elapsed().as_secs_f64() * 1e3
        })
        .collect();
    all.sort_by(f64::total_cmp);
    [all[0], all[all.len() / 2]]
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
    let catalog = catalog(rows);
    let targets = Targets::Catalog(&catalog);
    let (start, stop) = night_bounds(61_109, site.longitude());
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    let degrees = |value: f64| Some(Column::All(value * RADIANS_PER_DEGREE));
    limits.altitude_min = degrees(30.0);
    limits.sun_altitude_max = degrees(-18.0);
    limits.sun_separation_min = degrees(30.0);
    limits.moon_separation_min = degrees(30.0);
    let mut go = KEEP_GOING;
    let track = track_for(&observer, start, stop).expect("a span");
    let mut days = Days::new(observer, &track, start, stop).expect("a span");
    let begun = Instant::now();
    let table =
        window_table(&mut days, &targets, &limits, None, &mut Workers::new(0, &mut go)).expect("windows");
    println!("windows {:8.1} ms, {} of them", begun.elapsed().as_secs_f64() * 1e3, table.start.len());
    let windows = WatchedWindows {
        offsets: &table.offsets,
        start: &table.start,
        stop: &table.stop,
        stop_reason: &table.stop_reason,
        status: &table.status,
    };
    let begun = Instant::now();
    let watch = Watch::new(&observer, start, stop, &windows, &mut Workers::new(0, &mut go)).expect("a watch");
    println!("layout  {:8.1} ms", begun.elapsed().as_secs_f64() * 1e3);
    let when = Utc::from_nanoseconds(start.nanoseconds() + 11 * 3_600_000_000_000);
    let (mut up, mut reason, mut status) = (vec![false; rows], vec![0u8; rows], vec![0u8; rows]);
    let (mut left, mut next) = (vec![0.0; rows], vec![0.0; rows]);
    let mut numbers = vec![vec![0.0; rows]; PlaceColumn::ALL.len()];
    let usual = [PlaceColumn::AltitudeDeg, PlaceColumn::Airmass, PlaceColumn::HourAngleDeg];
    let mut cases: Vec<(String, Vec<PlaceColumn>)> = vec![
        ("no place".into(), Vec::new()),
        ("the usual".into(), usual.to_vec()),
        ("all".into(), PlaceColumn::ALL.to_vec()),
    ];
    cases.extend(PlaceColumn::ALL.map(|column| (column.word().to_string(), vec![column])));
    for threads in [1, 2] {
        for (name, columns) in &cases {
            let [best, middle] = times(|| {
                let columns = columns.iter().copied().zip(numbers.iter_mut().map(|n| &mut n[..])).collect();
                let out = WatchColumns {
                    up: &mut up,
                    stop_reason: &mut reason,
                    seconds_left: Some(&mut left),
                    seconds_to_next: Some(&mut next),
                    places: PlaceColumns { columns, sky_model: SkyModel::default(), status: &mut status },
                };
                watch
                    .at(&observer, &targets, when, out, &mut Workers::new(threads, &mut go))
                    .expect("a state");
            });
            println!("threads {threads}  watch, {name:32} {best:7.2} ms best {middle:7.2} ms middle");
        }
        let [best, middle] = times(|| {
            let columns = usual.iter().copied().zip(numbers.iter_mut().map(|n| &mut n[..])).take(1);
            let out = PlaceColumns {
                columns: columns.collect(),
                sky_model: SkyModel::default(),
                status: &mut status,
            };
            place(&observer, &targets, &[when], Shape::Grid, out, &mut Workers::new(threads, &mut go))
                .expect("places");
        });
        println!(
            "threads {threads}  place, altitude                         {best:7.2} ms best {middle:7.2} ms middle"
        );
    }
}
