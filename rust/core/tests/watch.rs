//! A watch against the windows and the places that it must agree with to the bit.

mod common;

use common::Random;
use hourarc_core::astrometry::{Catalog, CatalogColumns, Observer, Targets};
use hourarc_core::constants::RADIANS_PER_DEGREE;
use hourarc_core::earth::Orientation;
use hourarc_core::ephemeris::{Body, Ephemeris};
use hourarc_core::error::Status;
use hourarc_core::events::{Days, night_bounds, track_for};
use hourarc_core::grid::{
    KEEP_GOING, PlaceColumn, PlaceColumns, Shape, Watch, WatchColumns, WatchedWindows, WindowTable, Workers,
    place, window_table,
};
use hourarc_core::math::dispatch::Isa;
use hourarc_core::refraction::{AirmassModel, Atmosphere, Refraction};
use hourarc_core::site::Site;
use hourarc_core::time::{LeapSeconds, Utc};
use hourarc_core::windows::{Cause, Column, Limits, SkyModel};

const MJD: i64 = 61_109;
const ROWS: usize = 3_000;

/// Stars over the sky, every hundredth row a bad one.
fn catalog(random: &mut Random) -> Catalog {
    let mut column =
        |low: f64, high: f64| -> Vec<f64> { (0..ROWS).map(|_| random.between(low, high)).collect() };
    let mut dec_deg: Vec<f64> = column(-1.0, 1.0).iter().map(|s| s.asin() / RADIANS_PER_DEGREE).collect();
    for row in (7..ROWS).step_by(100) {
        dec_deg[row] = if row % 200 == 7 { f64::NAN } else { 95.0 };
    }
    Catalog::new(&CatalogColumns {
        ra_deg: &column(0.0, 360.0),
        dec_deg: &dec_deg,
        epoch_yr: &column(1990.0, 2020.0),
        pm_ra_mas_yr: &column(-500.0, 500.0),
        pm_dec_mas_yr: &column(-500.0, 500.0),
        parallax_mas: &column(0.0, 100.0),
        radial_velocity_km_s: &column(-100.0, 100.0),
    })
    .unwrap()
}

/// What a watch says at an instant.
#[derive(Default)]
struct Said {
    up: Vec<bool>,
    stop_reason: Vec<u8>,
    status: Vec<u8>,
    left: Vec<f64>,
    to_next: Vec<f64>,
    places: Vec<Vec<f64>>,
}

fn ask(
    watch: &Watch,
    observer: &Observer<'_>,
    targets: &Targets<'_>,
    when: Utc,
    isa: Isa,
    threads: usize,
) -> Said {
    let rows = targets.len();
    let mut said = Said {
        up: vec![true; rows],
        stop_reason: vec![99; rows],
        status: vec![99; rows],
        left: vec![9.0; rows],
        to_next: vec![9.0; rows],
        places: vec![vec![9.0; rows]; PlaceColumn::ALL.len()],
    };
    let columns = PlaceColumn::ALL.into_iter().zip(said.places.iter_mut().map(|values| &mut values[..]));
    let out = WatchColumns {
        up: &mut said.up,
        stop_reason: &mut said.stop_reason,
        seconds_left: Some(&mut said.left),
        seconds_to_next: Some(&mut said.to_next),
        places: PlaceColumns {
            columns: columns.collect(),
            sky_model: SkyModel::default(),
            status: &mut said.status,
        },
    };
    let mut go = KEEP_GOING;
    watch.at(observer, targets, when, out, &mut Workers::new(threads, &mut go).with_isa(isa)).unwrap();
    said
}

fn same(a: f64, b: f64) -> bool {
    a.to_bits() == b.to_bits() || (a.is_nan() && b.is_nan())
}

/// Compares what was said with the table, window by window, and with the places.
fn compare(
    said: &Said,
    table: &WindowTable,
    observer: &Observer<'_>,
    targets: &Targets<'_>,
    when: Utc,
    isa: Isa,
) {
    let rows = targets.len();
    let now = when.nanoseconds();
    for row in 0..rows {
        let windows = table.offsets[row] as usize..table.offsets[row + 1] as usize;
        let open = windows.clone().find(|&i| table.start[i] <= now && now < table.stop[i]);
        let next = windows.clone().find(|&i| table.start[i] > now);
        assert_eq!(said.up[row], open.is_some(), "row {row}");
        assert_eq!(said.stop_reason[row], open.map_or(Cause::None as u8, |i| table.stop_reason[i]));
        let seconds = |edge: i64| (edge - now) as f64 / 1e9;
        assert!(same(said.left[row], open.map_or(f64::NAN, |i| seconds(table.stop[i]))), "row {row}");
        assert!(same(said.to_next[row], next.map_or(f64::NAN, |i| seconds(table.start[i]))), "row {row}");
    }
    let mut values = vec![vec![0.0; rows]; PlaceColumn::ALL.len()];
    let mut status = vec![0; rows];
    let columns = PlaceColumn::ALL.into_iter().zip(values.iter_mut().map(|values| &mut values[..]));
    let out =
        PlaceColumns { columns: columns.collect(), sky_model: SkyModel::default(), status: &mut status };
    let mut go = KEEP_GOING;
    place(observer, targets, &[when], Shape::Grid, out, &mut Workers::new(1, &mut go).with_isa(isa)).unwrap();
    for ((column, said), placed) in PlaceColumn::ALL.iter().zip(&said.places).zip(&values) {
        assert!(said.iter().zip(placed).all(|(&a, &b)| same(a, b)), "{}", column.word());
    }
    for row in 0..rows {
        assert_eq!(said.status[row], status[row].max(table.status[row]), "row {row}");
    }
}

/// A night under limits that open and close many windows: `run(observer, targets, table, watch, start, stop)`.
fn with_night(
    latitude_deg: f64,
    targets: &Targets<'_>,
    limits: &Limits,
    run: impl FnOnce(&Observer<'_>, &WindowTable, &Watch, Utc, Utc),
) {
    let site = Site::from_degrees(24.5127, latitude_deg, 1148.0).unwrap();
    let air =
        Atmosphere { pressure_hpa: 880.0, temperature_c: 10.0, relative_humidity: 0.3, wavelength_um: 0.55 };
    let refraction = Refraction::new(&air, site.latitude(), 1148.0).unwrap();
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.05, 1e-6, 1e-6, 0.0, 0.0);
    let ephemeris = Ephemeris::default();
    let observer =
        Observer { site: &site, refraction: &refraction, orientation: &orientation, ephemeris: &ephemeris };
    let (start, stop) = night_bounds(MJD, site.longitude());
    let track = track_for(&observer, start, stop).unwrap();
    let mut days = Days::new(observer, &track, start, stop).unwrap();
    let mut go = KEEP_GOING;
    let mut workers = Workers::new(2, &mut go);
    let table = window_table(&mut days, targets, limits, None, &mut workers).unwrap();
    let windows = WatchedWindows {
        offsets: &table.offsets,
        start: &table.start,
        stop: &table.stop,
        stop_reason: &table.stop_reason,
        status: &table.status,
    };
    let watch = Watch::new(&observer, start, stop, &windows, &mut workers).unwrap();
    run(&observer, &table, &watch, start, stop);
}

fn limits() -> Limits {
    let degrees = |value: f64| Some(Column::All(value * RADIANS_PER_DEGREE));
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.altitude_min = degrees(25.0);
    // Parts the night of many stars, and puts the rows with more than one window to work.
    limits.altitude_max = degrees(50.0);
    limits.sun_altitude_max = degrees(-12.0);
    limits.sun_separation_min = degrees(30.0);
    limits
}

fn at(nanoseconds: i64) -> Utc {
    Utc::from_nanoseconds(nanoseconds)
}

#[test]
fn a_watch_gives_the_bits_of_windows_and_places() {
    let mut random = Random(11);
    let catalog = catalog(&mut random);
    let targets = Targets::Catalog(&catalog);
    let mut limits = limits();
    // Some rows without a limit that holds water.
    let of_row = |row: usize| if row % 150 == 3 { f64::NAN } else { 25.0 * RADIANS_PER_DEGREE };
    limits.altitude_min = Some(Column::Each((0..ROWS).map(of_row).collect()));
    with_night(-20.8714, &targets, &limits, |observer, table, watch, start, stop| {
        let counts: Vec<i64> = table.offsets.windows(2).map(|pair| pair[1] - pair[0]).collect();
        for count in 0..3 {
            assert!(counts.iter().filter(|&&c| c == count).count() > 100, "rows with {count} windows");
        }
        // The ends of the night, instants in it, and edges of windows, a nanosecond before and after them.
        let (first, last) = (start.nanoseconds(), stop.nanoseconds() - 1);
        let mut instants = vec![first, last];
        instants.extend((0..8).map(|_| random.between(first as f64, last as f64) as i64));
        for _ in 0..8 {
            let window = random.between(0.0, table.start.len() as f64) as usize;
            for edge in [table.start[window], table.stop[window]] {
                instants.extend([edge - 1, edge, edge + 1]);
            }
        }
        let mut up = 0;
        for (number, &instant) in instants.iter().enumerate() {
            let isas: Vec<Isa> = Isa::available().collect();
            let isa = isas[number % isas.len()];
            let said = ask(watch, observer, &targets, at(instant), isa, 1 + number % 3);
            compare(&said, table, observer, &targets, at(instant), isa);
            up += said.up.iter().filter(|&&up| up).count();
            let bad = |status: Status| said.status.iter().filter(|&&code| code == status as u8).count();
            assert_eq!(
                (bad(Status::NotFinite), bad(Status::Declination), bad(Status::Limit)),
                (15, 15, 20),
                "bad rows"
            );
        }
        assert!(up > 1000, "{up}");
    });
}

#[test]
fn a_window_is_half_open() {
    let catalog = catalog(&mut Random(12));
    let targets = Targets::Catalog(&catalog);
    with_night(-20.8714, &targets, &limits(), |observer, table, watch, _, _| {
        for row in (0..ROWS).filter(|&row| table.offsets[row] < table.offsets[row + 1]).take(20) {
            let window = table.offsets[row] as usize;
            let ask = |instant: i64| ask(watch, observer, &targets, at(instant), Isa::best(), 2);
            let (start, stop) = (table.start[window], table.stop[window]);
            let (before, first) = (ask(start - 1), ask(start));
            assert!(!before.up[row] && first.up[row]);
            assert_eq!(before.to_next[row], 1e-9);
            assert_eq!(first.left[row], (stop - start) as f64 / 1e9);
            let (last, after) = (ask(stop - 1), ask(stop));
            assert!(last.up[row] && !after.up[row]);
            assert_eq!(last.left[row], 1e-9);
            assert!(after.left[row].is_nan());
        }
    });
}

#[test]
fn bodies_are_watched_too() {
    let bodies = [Body::Sun, Body::Moon, Body::Jupiter, Body::Earth];
    let targets = Targets::Bodies(&bodies);
    let mut limits = limits();
    limits.sun_separation_min = None;
    with_night(51.0, &targets, &limits, |observer, table, watch, start, _| {
        for hour in 0..24 {
            let when = at(start.nanoseconds() + hour * 3_600_000_000_000);
            let said = ask(watch, observer, &targets, when, Isa::best(), 1);
            compare(&said, table, observer, &targets, when, Isa::best());
        }
    });
}

#[test]
fn threads_may_ask_at_once() {
    let catalog = catalog(&mut Random(13));
    let targets = Targets::Catalog(&catalog);
    with_night(-20.8714, &targets, &limits(), |observer, table, watch, start, _| {
        std::thread::scope(|scope| {
            for thread in 0..4 {
                let targets = &targets;
                scope.spawn(move || {
                    for step in 0..20 {
                        let when = at(start.nanoseconds() + (4 * step + thread) * 1_000_000_000_000);
                        let said = ask(watch, observer, targets, when, Isa::best(), 2);
                        compare(&said, table, observer, targets, when, Isa::best());
                    }
                });
            }
        });
    });
}

#[test]
fn wrong_calls_are_told() {
    let catalog = catalog(&mut Random(14));
    let targets = Targets::Catalog(&catalog);
    with_night(-20.8714, &targets, &limits(), |observer, table, watch, start, stop| {
        let mut go = KEEP_GOING;
        let mut refused = |targets: &Targets<'_>, when: Utc, short: usize| {
            let rows = targets.len();
            let (mut up, mut reason, mut status) = (vec![false; rows], vec![0; rows], vec![0; rows]);
            let mut left = vec![0.0; rows - short];
            let out = WatchColumns {
                up: &mut up,
                stop_reason: &mut reason,
                seconds_left: Some(&mut left),
                seconds_to_next: None,
                places: PlaceColumns {
                    columns: Vec::new(),
                    sky_model: SkyModel::default(),
                    status: &mut status,
                },
            };
            watch.at(observer, targets, when, out, &mut Workers::new(1, &mut go)).map_err(|e| e.to_string())
        };
        let before = at(start.nanoseconds() - 1);
        for outside in [before, stop, at(i64::MIN)] {
            assert!(refused(&targets, outside, 0).unwrap_err().starts_with("when: given "));
        }
        let span = "allowed 2026-03-10T10:21:56 to before 2026-03-11T10:21:56, the span watched";
        assert!(refused(&targets, stop, 0).unwrap_err().ends_with(span));
        assert_eq!(refused(&targets, start, 0), Ok(()));
        let message = refused(&targets, start, 1).unwrap_err();
        assert_eq!(message, "seconds_left: given 2999 values, allowed 3000");
        let message = refused(&Targets::Bodies(&[Body::Moon]), start, 0).unwrap_err();
        assert_eq!(message, "targets: given 1, allowed 3000, as many as were watched");

        let good = WatchedWindows {
            offsets: &table.offsets,
            start: &table.start,
            stop: &table.stop,
            stop_reason: &table.stop_reason,
            status: &table.status,
        };
        let mut falling = table.offsets.clone();
        falling[5] = falling[6] + 1;
        for (windows, name) in [
            (WatchedWindows { offsets: &table.offsets[1..], ..good }, "offsets"),
            (WatchedWindows { offsets: &falling, ..good }, "offsets"),
            (WatchedWindows { stop: &table.stop[1..], ..good }, "stop"),
            (WatchedWindows { stop_reason: &[], ..good }, "stop_reason"),
        ] {
            let mut go = KEEP_GOING;
            let error =
                Watch::new(observer, start, stop, &windows, &mut Workers::new(1, &mut go)).unwrap_err();
            assert!(error.to_string().starts_with(&format!("{name}: given")), "{error}");
        }
    });
}
