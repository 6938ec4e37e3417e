//! Events of many stars at once against those of each by itself.

mod common;

use common::Random;
use hourarc_core::astrometry::{Catalog, CatalogColumns, Observer, Targets};
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::events::{Days, rise_transit_set, track_for};
use hourarc_core::grid::{KEEP_GOING, Workers, event_table};
use hourarc_core::math::dispatch::Isa;
use hourarc_core::refraction::{Atmosphere, Refraction};
use hourarc_core::site::Site;
use hourarc_core::time::{LeapSeconds, Utc};

/// Stars over the sky, many near grazing declinations and the poles, a few bad rows.
fn catalog(random: &mut Random, rows: usize, latitude_deg: f64, threshold_deg: f64) -> Catalog {
    let mut columns: [Vec<f64>; 7] = Default::default();
    for row in 0..rows {
        let dec_deg = match row % 5 {
            0 => {
                let off = random.between(-1.0, 1.0) * 10f64.powf(random.between(-6.0, 0.0));
                let side = if row % 2 == 0 { 1.0 } else { -1.0 };
                let dec_deg: f64 = latitude_deg + side * (90.0 - threshold_deg + off);
                if dec_deg.abs() > 90.0 { dec_deg.signum() * 180.0 - dec_deg } else { dec_deg }
            }
            1 => 90.0 - 10f64.powf(random.between(-4.0, 0.5)),
            _ => random.between(-1.0, 1.0).asin() / RADIANS_PER_DEGREE,
        };
        columns[0].push(random.between(0.0, 360.0));
        columns[1].push(if row % 71 == 70 { f64::NAN } else { dec_deg.clamp(-90.0, 90.0) });
        columns[2].push(2016.0);
        columns[3].push(random.between(-1000.0, 1000.0));
        columns[4].push(random.between(-1000.0, 1000.0));
        columns[5].push(random.between(0.0, 700.0));
        columns[6].push(random.between(-100.0, 100.0));
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

#[test]
fn the_batch_is_every_star_by_itself() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let air =
        Atmosphere { pressure_hpa: 790.0, temperature_c: 5.0, relative_humidity: 0.3, wavelength_um: 0.55 };
    let mut random = Random(41);
    let (mut events, mut stars, mut worst_s, mut worst_rad, mut worst_error) = (0, 0, 0.0f64, 0.0f64, 0.0f64);
    for case in 0..60 {
        let latitude_deg = [90.0, -89.9, random.between(-70.0, 70.0), random.between(-70.0, 70.0)][case % 4];
        let site = Site::from_degrees(random.between(-180.0, 180.0), latitude_deg, 2000.0).unwrap();
        let refraction = Refraction::new(&air, site.latitude(), 2000.0).unwrap();
        let observer = Observer {
            site: &site,
            refraction: &refraction,
            orientation: &orientation,
            ephemeris: &ephemeris,
        };
        let threshold_deg = random.between(0.0, 70.0);
        let catalog = catalog(&mut random, 300, latitude_deg, threshold_deg);
        let targets = Targets::Catalog(&catalog);
        let start = Utc::from_mjd(random.between(45_000.0, 61_000.0).floor(), random.unit());
        let hours = [0.5, 12.0, 24.0, 100.0][case / 4 % 4];
        let stop = Utc::from_nanoseconds(start.nanoseconds() + (hours * 3.6e12) as i64);
        let track = track_for(&observer, start, stop).unwrap();
        let mut days = Days::new(observer, &track, start, stop).unwrap();
        let threshold = threshold_deg * RADIANS_PER_DEGREE;
        let mut go = KEEP_GOING;
        let table = event_table(&mut days, &targets, threshold, &mut Workers::new(2, &mut go)).unwrap();
        for row in 0..catalog.len() {
            let mut alone = Vec::new();
            let (passage, status) = rise_transit_set(&days, &targets, row, threshold, &mut alone);
            let own = table.offsets[row] as usize..table.offsets[row + 1] as usize;
            assert_eq!(
                own.len(),
                alone.len(),
                "case {case} row {row}: {alone:?} {:?}",
                &table.time[own.clone()]
            );
            assert_eq!(
                (table.passage[row], table.status[row]),
                (passage as u8, status as u8),
                "case {case} row {row}"
            );
            stars += 1;
            for (i, event) in own.zip(&alone) {
                events += 1;
                assert_eq!(table.kind[i], event.kind as u8);
                worst_s = worst_s.max((table.time[i] - event.time.nanoseconds()).abs() as f64 * 1e-9);
                let angle = |degrees: f64, radians: f64| {
                    let turn = std::f64::consts::TAU;
                    let off = degrees * RADIANS_PER_DEGREE - radians;
                    (off - turn * (off / turn).round()).abs() * event.altitude.cos()
                };
                worst_rad = worst_rad.max(angle(table.azimuth_deg[i], event.azimuth));
                worst_rad =
                    worst_rad.max((table.altitude_deg[i] * RADIANS_PER_DEGREE - event.altitude).abs());
                worst_error =
                    worst_error.max((table.computed_error_s[i] / event.computed_error_s - 1.0).abs());
                let scatter = (table.horizon_scatter_s[i] - event.horizon_scatter_s).abs();
                assert!(scatter <= 1e-3 * event.horizon_scatter_s, "{scatter}");
            }
        }
    }
    println!(
        "{stars} stars, {events} events: {worst_s:.1e} s, {worst_rad:.1e} rad, errors to {worst_error:.1e}"
    );
    assert!(events > 20_000);
    assert!(worst_s < 2e-6 && worst_rad < 1e-9 && worst_error < 1e-2);
}

#[test]
fn every_instruction_set_finds_the_same_events() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let refraction = Refraction::none();
    let site = Site::from_degrees(12.0, -33.0, 0.0).unwrap();
    let observer =
        Observer { site: &site, refraction: &refraction, orientation: &orientation, ephemeris: &ephemeris };
    let catalog = catalog(&mut Random(3), 2000, -33.0, 20.0);
    let targets = Targets::Catalog(&catalog);
    let (start, stop) = (Utc::from_mjd(60_000.0, 0.4), Utc::from_mjd(60_001.0, 0.4));
    let track = track_for(&observer, start, stop).unwrap();
    let mut days = Days::new(observer, &track, start, stop).unwrap();
    let mut of = |isa: Isa| {
        let mut go = KEEP_GOING;
        let mut workers = Workers::new(2, &mut go).with_isa(isa);
        event_table(&mut days, &targets, 0.35, &mut workers).unwrap()
    };
    let reference = of(Isa::best());
    for isa in Isa::available() {
        let table = of(isa);
        assert_eq!(table.offsets, reference.offsets);
        assert_eq!(table.kind, reference.kind);
        let worst = table.time.iter().zip(&reference.time).map(|(a, b)| (a - b).abs()).max().unwrap();
        println!("{}: {worst} ns from {}", isa.word(), Isa::best().word());
        assert!(worst <= 1000, "{worst} ns");
    }
}
