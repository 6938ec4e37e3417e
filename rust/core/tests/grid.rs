//! The grid against the sum of the exact windows, night by night.

mod common;

use common::Random;
use hourarc_core::astrometry::{Catalog, CatalogColumns, Observer, Targets};
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::{Body, Ephemeris};
use hourarc_core::events::{Days, night_bounds, track_for};
use hourarc_core::grid::{GridQuantity, GridValues, KEEP_GOING, Workers, visibility_grid, window_table};
use hourarc_core::math::dispatch::Isa;
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::Site;
use hourarc_core::time::LeapSeconds;
use hourarc_core::windows::{Column, Limits};

const QUANTITIES: [GridQuantity; 7] = GridQuantity::ALL;

struct Case {
    site: Site,
    refraction: Refraction,
    limits: Limits,
    first_mjd: i64,
    nights: usize,
}

/// Every quantity of a grid, in doubles.
fn grid(
    observer: &Observer<'_>,
    targets: &Targets<'_>,
    case: &Case,
    quantities: &[GridQuantity],
    isa: Isa,
    threads: usize,
) -> Vec<Vec<f64>> {
    let size = case.nights * targets.len();
    let mut singles = vec![vec![0.0f32; size]; quantities.len()];
    let mut doubles = vec![vec![0.0f64; size]; quantities.len()];
    let columns = quantities
        .iter()
        .zip(singles.iter_mut().zip(doubles.iter_mut()))
        .map(|(&quantity, (single, double))| {
            let instant = quantity.is_instant();
            (quantity, if instant { GridValues::Double(double) } else { GridValues::Single(single) })
        })
        .collect();
    let mut go = KEEP_GOING;
    let mut workers = Workers::new(threads, &mut go).with_isa(isa);
    let mut heard = 0;
    let mut progress = |done| heard = done;
    visibility_grid(
        observer,
        targets,
        case.first_mjd,
        case.nights,
        &case.limits,
        columns,
        &mut workers,
        &mut progress,
    )
    .unwrap();
    assert_eq!(heard, case.nights);
    quantities
        .iter()
        .zip(singles.into_iter().zip(doubles))
        .map(
            |(quantity, (single, double))| {
                if quantity.is_instant() { double } else { single.into_iter().map(f64::from).collect() }
            },
        )
        .collect()
}

fn limits(random: &mut Random, kind: usize) -> Limits {
    let degrees = |value: f64| Some(Column::All(value * RADIANS_PER_DEGREE));
    let mut limits = Limits::none(AirmassModel::Pickering2002);
    limits.altitude_min = degrees(random.between(0.0, 60.0));
    limits.sun_altitude_max = degrees([-18.0, -12.0, -6.0, -0.833, 20.0][kind % 5]);
    limits.sun_separation_min = degrees(30.0);
    if kind % 2 == 1 {
        limits.moon_separation_min = degrees(random.between(5.0, 90.0));
    }
    if kind % 3 == 1 {
        limits.window_min_s = Some(Column::All(1800.0));
    }
    if kind % 7 == 2 {
        limits.altitude_max = degrees(80.0);
    }
    if kind % 4 == 3 {
        limits.airmass_max = Some(Column::All(1.8));
    }
    if kind % 5 == 4 {
        limits.moon_illumination_max = Some(Column::All(0.6));
    }
    limits
}

/// Stars over the sky, a third of them near their grazing declinations, and a few bad rows.
fn catalog(random: &mut Random, rows: usize, site: &Site, lowest: f64) -> Catalog {
    let latitude_deg = site.latitude() / RADIANS_PER_DEGREE;
    let mut columns: [Vec<f64>; 7] = Default::default();
    for row in 0..rows {
        let dec_deg = if row % 3 == 0 {
            // Upper or lower culmination within a degree to a thousandth of one from the threshold.
            let zenith_deg =
                90.0 - lowest + random.between(-1.0, 1.0) * 10f64.powf(random.between(-3.0, 0.0));
            let side = if row % 2 == 0 { 1.0 } else { -1.0 };
            let dec_deg = latitude_deg + side * zenith_deg;
            if dec_deg.abs() > 90.0 { dec_deg.signum() * 180.0 - dec_deg } else { dec_deg }
        } else {
            random.between(-1.0, 1.0).asin() / RADIANS_PER_DEGREE
        };
        let bad = row % 97 == 96;
        columns[0].push(random.between(0.0, 360.0));
        columns[1].push(if bad { f64::NAN } else { dec_deg.clamp(-90.0, 90.0) });
        columns[2].push(2016.0);
        columns[3].push(random.between(-1000.0, 1000.0));
        columns[4].push(random.between(-1000.0, 1000.0));
        columns[5].push(random.between(0.0, 700.0));
        columns[6].push(random.between(-100.0, 100.0));
    }
    let [ra, dec, epoch, pm_ra, pm_dec, parallax, velocity] = &columns;
    Catalog::new(&CatalogColumns {
        ra_deg: ra,
        dec_deg: dec,
        epoch_yr: epoch,
        pm_ra_mas_yr: pm_ra,
        pm_dec_mas_yr: pm_dec,
        parallax_mas: parallax,
        radial_velocity_km_s: velocity,
    })
    .unwrap()
}

fn case(random: &mut Random, kind: usize) -> Case {
    let latitude_deg = match kind % 6 {
        0 => 90.0,
        1 => -89.99,
        2 => random.between(60.0, 80.0),
        _ => random.between(-60.0, 60.0),
    };
    let site = Site::from_degrees(random.between(-180.0, 180.0), latitude_deg, 2000.0).unwrap();
    let air =
        Atmosphere { pressure_hpa: 790.0, temperature_c: 5.0, relative_humidity: 0.3, wavelength_um: 0.55 };
    let refraction = if kind.is_multiple_of(4) {
        Refraction::none()
    } else {
        Refraction::new(&air, site.latitude(), 2000.0).unwrap()
    };
    let limits = limits(random, kind);
    Case { site, refraction, limits, first_mjd: random.between(57_000.0, 61_300.0) as i64, nights: 20 }
}

/// Sums and extremes of exact windows, computed night by night by another road than the grid's.
#[test]
fn hours_are_the_sum_of_the_exact_windows() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let mut random = Random(23);
    let (mut worst_s, mut cases, mut with_hours, mut worst_edge_s) = (0.0f64, 0, 0, 0.0f64);
    for kind in 0..84 {
        let case = case(&mut random, kind);
        let observer = Observer {
            site: &case.site,
            refraction: &case.refraction,
            orientation: &orientation,
            ephemeris: &ephemeris,
        };
        let lowest = match case.limits.lowest_altitude(&case.refraction).unwrap() {
            Some(Column::All(lowest)) => lowest / RADIANS_PER_DEGREE,
            _ => unreachable!(),
        };
        let catalog = catalog(&mut random, 80, &case.site, lowest);
        let targets = Targets::Catalog(&catalog);
        let hours = grid(&observer, &targets, &case, &[GridQuantity::Hours], Isa::best(), 2).remove(0);
        let all = grid(&observer, &targets, &case, &QUANTITIES, Isa::best(), 2);
        for night in 0..case.nights {
            let (start, stop) = night_bounds(case.first_mjd + night as i64, case.site.longitude());
            let track = track_for(&observer, start, stop).unwrap();
            let mut days = Days::new(observer, &track, start, stop).unwrap();
            let mut go = KEEP_GOING;
            let table =
                window_table(&mut days, &targets, &case.limits, None, &mut Workers::new(1, &mut go)).unwrap();
            for row in 0..targets.len() {
                let at = night * targets.len() + row;
                if targets.status(row).is_bad() {
                    assert!(all.iter().all(|values| values[at].is_nan()) && hours[at].is_nan());
                    continue;
                }
                let windows = table.offsets[row] as usize..table.offsets[row + 1] as usize;
                let length_s = |i: usize| (table.stop[i] - table.start[i]) as f64 * 1e-9;
                let sum_s: f64 = windows.clone().map(length_s).sum();
                // A window whose length is within a second of the shortest useful one may fall either way.
                let shortest = case.limits.window_min_s.as_ref().map(|column| column.at(row));
                if let Some(shortest) = shortest {
                    let close = |seconds: f64| (seconds - shortest).abs() < 2.0;
                    if windows.clone().any(|i| close(length_s(i))) || close(sum_s - hours[at] * 3600.0) {
                        continue;
                    }
                }
                cases += 1;
                with_hours += usize::from(sum_s > 0.0);
                for found in [hours[at], all[0][at]] {
                    let error = (found * 3600.0 - sum_s).abs();
                    assert!(error < 1.0, "kind {kind} night {night} row {row}: {found} h, windows {sum_s} s");
                    worst_s = worst_s.max(error);
                }
                // A sliver of a window may be there or not; the longest one's edges must agree.
                let longest = windows.clone().max_by(|&a, &b| length_s(a).total_cmp(&length_s(b)));
                if let Some(longest) = longest.filter(|&i| length_s(i) > 60.0) {
                    let mjd = |ns: i64| ns as f64 / 86_400e9 + 40_587.0;
                    let rivals = windows.clone().filter(|&i| (length_s(i) - length_s(longest)).abs() < 2.0);
                    if rivals.count() == 1 {
                        let (start, stop) =
                            (all[2][at] - mjd(table.start[longest]), all[3][at] - mjd(table.stop[longest]));
                        worst_edge_s = worst_edge_s.max(86_400.0 * start.abs().max(stop.abs()));
                    }
                    let airmass =
                        windows.clone().map(|i| table.best_airmass[i]).fold(f64::INFINITY, f64::min);
                    assert!((all[4][at] - airmass).abs() < 2e-4 * airmass, "{} {airmass}", all[4][at]);
                }
            }
        }
    }
    println!(
        "{cases} target-nights, {with_hours} with hours: worst {worst_s:.3} s, edges {worst_edge_s:.3} s"
    );
    assert!(cases > 100_000 && with_hours > 20_000);
    assert!(worst_edge_s < 1.0, "{worst_edge_s}");
}

#[test]
fn threads_and_instruction_sets() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let mut random = Random(5);
    let case = Case { nights: 40, ..case(&mut random, 11) };
    let observer = Observer {
        site: &case.site,
        refraction: &case.refraction,
        orientation: &orientation,
        ephemeris: &ephemeris,
    };
    let catalog = catalog(&mut random, 3000, &case.site, 30.0);
    let targets = Targets::Catalog(&catalog);
    let of = |isa: Isa, threads: usize| {
        grid(&observer, &targets, &case, &[GridQuantity::Hours], isa, threads).remove(0)
    };
    let reference = of(Isa::best(), 1);
    assert!(reference.iter().filter(|hours| **hours > 0.0).count() > 10_000);
    let bits = |values: &[f64]| values.iter().map(|value| value.to_bits()).collect::<Vec<_>>();
    for threads in [2, 5] {
        assert_eq!(bits(&of(Isa::best(), threads)), bits(&reference), "{threads} threads");
    }
    for isa in Isa::available() {
        let values = of(isa, 2);
        let difference = values.iter().zip(&reference).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
        println!("{}: {:.2e} s from {}", isa.word(), difference * 3600.0, Isa::best().word());
        // One rounding of a single-precision hour is 3 ms.
        assert!(difference * 3600.0 < 0.01, "{}", isa.word());
    }
}

/// Bodies go the exact way throughout.
#[test]
fn bodies_have_their_quantities() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.altitude_min = Some(Column::All(20.0 * RADIANS_PER_DEGREE));
    limits.sun_altitude_max = Some(Column::All(-12.0 * RADIANS_PER_DEGREE));
    let case = Case { first_mjd: 61_100, limits, ..case(&mut Random(3), 3) };
    let observer = Observer {
        site: &case.site,
        refraction: &case.refraction,
        orientation: &orientation,
        ephemeris: &ephemeris,
    };
    let bodies = [Body::Mars, Body::Jupiter, Body::Moon];
    let targets = Targets::Bodies(&bodies);
    let all = grid(&observer, &targets, &case, &QUANTITIES, Isa::best(), 2);
    let mut seen = 0;
    for at in 0..case.nights * bodies.len() {
        assert!(all[5][at].is_finite() || at % 3 == 2, "a transit each night, the Moon's perhaps not");
        if all[0][at] > 0.0 {
            seen += 1;
            assert!((all[3][at] - all[2][at]) * 24.0 <= all[0][at] + 1e-3);
            assert!(all[4][at] >= 0.99 && all[1][at] >= 1.0);
            let own = at % 3 == 2;
            assert!(if own { all[6][at] < 1e-6 } else { all[6][at] > 0.0 });
        }
    }
    assert!(seen > 10, "{seen}");
}
