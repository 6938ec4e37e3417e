//! How sure the edges are: the stated errors cover what is off by them, and the exact chain.

use super::*;

fn degrees(value: f64) -> Option<Column> {
    Some(Column::All(value * RADIANS_PER_DEGREE))
}

/// What `with_position_error` says of a place that is off by at most so much must cover what such places do.
#[test]
fn the_stated_error_covers_places_that_are_off_by_it() {
    let mut random = Random(77);
    let error = 2.0 / 206_264.8;
    let (mut edges, mut grazing, mut gone, mut tightest) = (0, 0, 0, 0.0f64);
    for latitude_deg in [-89.0, -33.0, 0.0, 20.0, 67.0] {
        let setting = Setting::new(random.between(-180.0, 180.0), latitude_deg, 500.0);
        let least_deg = 25.0;
        let mut limits = Limits::none(AirmassModel::KastenYoung1989);
        limits.altitude_min = degrees(least_deg);
        limits.sun_separation_min = degrees(60.0);
        let plan = |places: &[(f64, f64)]| -> Vec<Vec<Window>> {
            let catalog = stars(places);
            let targets = Targets::Catalog(&catalog);
            let (start, stop) = (Utc::from_mjd(60_100.0, 0.13), Utc::from_mjd(60_101.0, 0.13));
            let track = track_for(&setting.observer(), start, stop).unwrap();
            let days = Days::new(setting.observer(), &track, start, stop).unwrap();
            let span = LimitedSpan::new(&days, &limits, targets.len())
                .unwrap()
                .with_position_error(Column::All(error), targets.len())
                .unwrap();
            let mut workspace = Workspace::default();
            (0..targets.len())
                .map(|row| {
                    let mut windows = Vec::new();
                    span.windows(&targets, row, &mut workspace, &mut windows);
                    windows
                })
                .collect()
        };
        let mut places: Vec<(f64, f64)> = (0..4000)
            .map(|_| (random.between(0.0, 360.0), random.between(-1.0f64, 1.0).asin() / RADIANS_PER_DEGREE))
            .collect();
        // A quarter of them culminate within some arcseconds of the limit: by halving, all at once.
        let grazes_deg = latitude_deg + if latitude_deg > 0.0 { -65.0 } else { 65.0 };
        if grazes_deg.abs() < 89.0 {
            let away_deg = if latitude_deg > 0.0 { -0.5 } else { 0.5 };
            let mut bounds = vec![(grazes_deg + away_deg, grazes_deg - away_deg); 1000];
            for _ in 0..30 {
                for (place, bound) in places.iter_mut().zip(&bounds) {
                    place.1 = 0.5 * (bound.0 + bound.1);
                }
                for (windows, bound) in plan(&places[..1000]).iter().zip(&mut bounds) {
                    let middle = 0.5 * (bound.0 + bound.1);
                    if windows.is_empty() { bound.0 = middle } else { bound.1 = middle }
                }
            }
            for place in &mut places[..1000] {
                place.1 += error / RADIANS_PER_DEGREE * random.between(-4.0, 4.0);
            }
        }
        let moved: Vec<(f64, f64)> = places
            .iter()
            .map(|&(ra_deg, dec_deg)| {
                let (angle, size) = (random.between(0.0, TURN), 0.999 * error * random.unit().sqrt());
                let towards = size / RADIANS_PER_DEGREE * angle.sin();
                let across = size / RADIANS_PER_DEGREE * angle.cos();
                (
                    (ra_deg + across / (dec_deg * RADIANS_PER_DEGREE).cos()).rem_euclid(360.0),
                    dec_deg + towards,
                )
            })
            .collect();
        for ((before, after), place) in plan(&places).iter().zip(&plan(&moved)).zip(&places) {
            let may_not = |windows: &[Window]| windows.iter().any(|w| w.may_not_happen);
            grazing += usize::from(may_not(before));
            if before.len() != after.len() {
                gone += 1;
                assert!(may_not(before) || may_not(after), "{place:?} {before:?} {after:?}");
                continue;
            }
            for (a, b) in before.iter().zip(after) {
                // Where the other limit or the span's end comes first, it is its own edge that counts.
                for (a_ns, b_ns, allowed_s) in [
                    (a.start, b.start, a.start_error_s.max(b.start_error_s)),
                    (a.stop, b.stop, a.stop_error_s.max(b.stop_error_s)),
                ] {
                    let off_s = (a_ns.nanoseconds() - b_ns.nanoseconds()).abs() as f64 * 1e-9;
                    edges += 1;
                    assert!(off_s <= allowed_s, "{place:?}: {off_s} {allowed_s} {a:?} {b:?}");
                    if allowed_s > 0.0 {
                        tightest = tightest.max(off_s / allowed_s);
                    }
                }
            }
        }
    }
    println!(
        "{edges} edges, {grazing} grazing, {gone} come or gone, at most {tightest:.3} of what is stated"
    );
    assert!(edges > 20_000 && grazing > 300 && gone > 30);
    // Covered, and not by far too much.
    assert!(tightest > 0.9, "{tightest}");
}

/// At every edge that an altitude sets, the exact sky (nothing interpolated) has that altitude to within what
/// the stated error allows.
#[test]
fn edges_hold_on_the_exact_chain() {
    let mut random = Random(5);
    let (mut edges, mut worst) = (0, 0.0f64);
    for latitude_deg in [-72.0, -30.0, 5.0, 48.0] {
        let setting = Setting::new(random.between(-180.0, 180.0), latitude_deg, 2000.0);
        let places: Vec<(f64, f64)> = (0..150)
            .map(|_| (random.between(0.0, 360.0), random.between(-1.0f64, 1.0).asin() / RADIANS_PER_DEGREE))
            .collect();
        let catalog = stars(&places);
        let least = 10.0 * RADIANS_PER_DEGREE;
        let mut limits = Limits::none(AirmassModel::KastenYoung1989);
        limits.altitude_min = Some(Column::All(least));
        let planned = setting.windows(&Targets::Catalog(&catalog), &limits, 60_432.7, 1.0);
        for (row, planned) in planned.iter().enumerate() {
            for window in &planned.windows {
                for (utc, reason, error_s) in [
                    (window.start, window.start_reason, window.start_error_s),
                    (window.stop, window.stop_reason, window.stop_error_s),
                ] {
                    if reason != Cause::AltitudeMin {
                        continue;
                    }
                    let tai = LeapSeconds::builtin().to_tai(utc).unwrap();
                    let over = |seconds: f64| {
                        let sky = setting.observer().sky(tai.plus_seconds(seconds)).unwrap();
                        let local = rotate(&sky.local, star_direction(&catalog.star(row), &sky));
                        setting.refraction.observed_altitude(altitude(local)) - least
                    };
                    let rate = 0.5 * (over(1.0) - over(-1.0));
                    let off_s = (over(0.0) / rate).abs();
                    edges += 1;
                    worst = worst.max(off_s);
                    assert!(off_s <= error_s + 1e-9, "{off_s} {error_s} {:?}", places[row]);
                }
            }
        }
    }
    println!("{edges} edges, {:.1} µs at most on the exact chain", worst * 1e6);
    assert!(edges > 500 && worst > 0.0);
}
