//! Windows by brute force: every second of whole days, random limits at random sites, poles included.
//!
//! Each limit is evaluated at each second by its definition, on the chain of an interpolated sky (which
//! `astrometry.rs` holds to the exact one), never by an interval. A sample decides unless some limit is
//! within its own numerical error of its bound there.

use super::*;

/// The sky at one second.
struct Second {
    sky: Sky,
    utc: Utc,
    sun: Vector,
    moon: Vector,
    phase_angle: f64,
    /// Days of the Moon's age from full Moon.
    from_full_d: f64,
}

fn elongation(observer: &Observer<'_>, tai: Instant<Tai>) -> f64 {
    let tt = tai.to_tt();
    let at = |body| observer.ephemeris.position(body, tt.to_tdb()).unwrap();
    let (earth, sun, moon) = (at(Body::Earth), at(Body::Sun), at(Body::Moon));
    let frame = bias_precession_nutation(tt);
    let tilt = rotation_1(mean_obliquity(tt) + nutation(tt).obliquity);
    let longitude = |v: Vector| {
        let v = rotate(&tilt, rotate(&frame, v));
        v[1].atan2(v[0])
    };
    longitude(sub(moon, earth)) - longitude(sub(sun, earth)) + 20.5 / 206_264.8
}

/// Whether all limits hold; `None` when one is too near to its bound to tell.
fn holds(
    limits: &Limits,
    row: usize,
    setting: &Setting,
    second: &Second,
    gcrs: Vector,
    catalogue: Option<Vector>,
    azimuth_rate: f64,
) -> Option<bool> {
    let latitude = Latitude::new(setting.site.latitude());
    let local = rotate(&second.sky.local, gcrs);
    let topocentric = altitude(local);
    let observed = setting.refraction.observed_altitude(topocentric);
    let across = topocentric.cos().max(1e-6);
    let mut all = true;
    let mut sure = true;
    // `margin` at least 0 where the limit holds; `near`: what it may be off by.
    let mut limit = |margin: f64, near: f64| {
        sure &= margin.abs() > near;
        all &= margin >= 0.0;
    };
    const NEAR: f64 = 1e-8;
    if let Some(least) = &limits.altitude_min {
        limit(observed - least.at(row), NEAR);
    }
    if let Some(most) = &limits.altitude_max {
        limit(most.at(row) - observed, NEAR);
    }
    if let Some(most) = &limits.airmass_max {
        let airmass = limits.airmass_model.airmass(observed, topocentric);
        limit(if airmass.is_nan() { -1.0 } else { most.at(row) - airmass }, 1e-5);
    }
    if let Some(most) = &limits.sun_altitude_max {
        limit(most.at(row) - altitude(rotate(&second.sky.local, second.sun)), NEAR);
    }
    let moon_altitude = altitude(rotate(&second.sky.local, second.moon));
    if let Some(most) = &limits.moon_altitude_max {
        limit(most.at(row) - moon_altitude, NEAR);
    }
    let illumination = 0.5 * (1.0 + second.phase_angle.cos());
    if let Some(most) = &limits.moon_illumination_max {
        limit(most.at(row) - illumination, 1e-7);
    }
    if let Some(least) = &limits.sun_separation_min {
        limit(angle(gcrs, second.sun) - least.at(row), NEAR);
    }
    let separation = angle(gcrs, second.moon);
    // What is lifted while the Moon is down holds as much as the Moon is down.
    let relaxed = |margin: f64| match limits.moon_down_relaxes {
        Some(down) => margin.max(down - moon_altitude),
        None => margin,
    };
    if let Some(least) = &limits.moon_separation_min {
        limit(relaxed(separation - least.at(row)), NEAR);
    }
    match &limits.moon_avoidance {
        Some(MoonAvoidance::Lorentzian { separation: full, width_d }) => {
            let least = full.at(row) / (1.0 + (second.from_full_d / width_d.at(row)).powi(2));
            limit(relaxed(separation - least), 2e-6);
        }
        Some(MoonAvoidance::Illumination { dark, bright }) => {
            let least = dark.at(row) + (bright.at(row) - dark.at(row)) * illumination;
            limit(relaxed(separation - least), 1e-7);
        }
        None => {}
    }
    if let Some(least) = &limits.sky_brightness_min_v {
        let light =
            MoonLight { sin_altitude: moon_altitude.sin(), separation, phase_angle: second.phase_angle };
        let v = sky_brightness(&limits.sky_model, local[2], Some(light));
        limit(if v.is_nan() { -1.0 } else { v - least.at(row) }, 1e-5);
        // The formula's own steps.
        limit(1.0, if moon_altitude.abs().min(topocentric.abs()) < NEAR { 2.0 } else { 0.0 });
        limit(1.0, if (separation - 10.0 * RADIANS_PER_DEGREE).abs() < NEAR { 2.0 } else { 0.0 });
    }
    if limits.hour_angle_min.is_some() || limits.hour_angle_max.is_some() {
        let angle = hour_angle(local, latitude);
        let cos_declination = (1.0 - sin_declination(local, latitude).powi(2)).sqrt().max(1e-6);
        let bound = |column: &Option<Column>, default: f64| column.as_ref().map_or(default, |c| c.at(row));
        let (least, most) = (bound(&limits.hour_angle_min, -PI), bound(&limits.hour_angle_max, PI));
        let wraps = if least > -PI || most < PI { PI - angle.abs() } else { 1.0 };
        let near = NEAR / cos_declination;
        limit((angle - least).min(most - angle), near);
        limit(1.0, if wraps < near { 2.0 } else { 0.0 });
    }
    if let Some(least) = &limits.declination_min {
        limit(sin_declination(local, latitude).asin() - least.at(row), 1e-7);
    }
    if let Some(most) = &limits.declination_max {
        limit(most.at(row) - sin_declination(local, latitude).asin(), 1e-7);
    }
    let bearing = azimuth(local);
    if let Some(sectors) = &limits.azimuth_sectors {
        let mut inside = false;
        let mut nearest = f64::INFINITY;
        for &(from, to) in sectors {
            let width = (to - from).rem_euclid(TURN);
            inside |= (bearing - from).rem_euclid(TURN) < width || (to - from).abs() >= TURN;
            for bound in [from, to] {
                nearest = nearest.min(((bearing - bound + PI).rem_euclid(TURN) - PI).abs());
            }
        }
        limit(if inside { nearest } else { -nearest }, NEAR / across);
    }
    if let Some(most) = &limits.azimuth_rate_max {
        limit(most.at(row) / azimuth_rate.abs() - 1.0, 1e-4);
    }
    if let (true, Some(skyline)) = (limits.use_skyline, setting.site.skyline()) {
        let near_point = skyline
            .breakpoints()
            .iter()
            .map(|point| ((bearing - point + PI).rem_euclid(TURN) - PI).abs())
            .fold(f64::INFINITY, f64::min);
        let slope = skyline.slope(bearing).abs();
        limit(observed - skyline.altitude(bearing), NEAR * (1.0 + slope / across));
        limit(1.0, if near_point < NEAR / across { 2.0 } else { 0.0 });
    }
    if let Some(intervals) = &limits.allowed_intervals {
        limit(if intervals.iter().any(|i| i.0 <= second.utc && second.utc < i.1) { 1.0 } else { -1.0 }, 0.0);
    }
    if let Some(phase) = &limits.phase {
        let direction = catalogue.unwrap();
        let (centre, (day, fraction)) = match phase.scale {
            PhaseScale::BarycentricTdb => (second.sky.observer_au, second.sky.tdb().mjd_parts()),
            PhaseScale::HeliocentricUtc => {
                (sub(second.sky.observer_au, second.sky.sun_au), second.utc.mjd_parts())
            }
        };
        let light_d = dot(centre, direction) * LIGHT_TIME_AU_S / SECONDS_PER_DAY;
        let since = (day - phase.epoch_mjd.at(row)) + fraction + light_d;
        let period = phase.period_d.at(row);
        let from_middle = (since + 0.5 * period).rem_euclid(period) - 0.5 * period;
        limit(phase.half_width_d.at(row) - from_middle.abs(), 1e-3 / SECONDS_PER_DAY);
    }
    sure.then_some(all)
}

fn random_limits(random: &mut Random, rows: usize, mjd: f64, of_stars: bool) -> Limits {
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    let r = random;
    // Few limits or many: with many hardly anything is left.
    let dense = r.between(0.2, 1.0);
    // One value or one a target.
    fn column(r: &mut Random, rows: usize, mut value: impl FnMut(&mut Random) -> f64) -> Option<Column> {
        if r.chance(0.5) {
            Some(Column::All(value(r)))
        } else {
            Some(Column::Each((0..rows).map(|_| value(r)).collect()))
        }
    }
    if r.chance(dense * 0.4) {
        limits.altitude_min = column(r, rows, |r| r.degrees(-1.0, 40.0));
    }
    if r.chance(dense * 0.2) {
        limits.altitude_max = column(r, rows, |r| r.degrees(45.0, 89.0));
    }
    if r.chance(dense * 0.2) {
        limits.airmass_max = column(r, rows, |r| r.between(1.2, 8.0));
    }
    if r.chance(dense * 0.5) {
        limits.sun_altitude_max = column(r, rows, |r| r.degrees(-18.0, 5.0));
    }
    if r.chance(dense * 0.3) {
        limits.moon_altitude_max = column(r, rows, |r| r.degrees(-5.0, 40.0));
    }
    if r.chance(dense * 0.1) {
        limits.moon_illumination_max = column(r, rows, |r| r.between(0.2, 1.0));
    }
    if r.chance(dense * 0.3) {
        limits.sun_separation_min = column(r, rows, |r| r.degrees(20.0, 90.0));
    }
    if r.chance(dense * 0.3) {
        limits.moon_separation_min = column(r, rows, |r| r.degrees(10.0, 90.0));
    }
    if r.chance(dense * 0.2) {
        limits.moon_avoidance = Some(MoonAvoidance::Lorentzian {
            separation: column(r, rows, |r| r.degrees(60.0, 140.0)).unwrap(),
            width_d: column(r, rows, |r| r.between(4.0, 14.0)).unwrap(),
        });
    } else if r.chance(dense * 0.2) {
        limits.moon_avoidance = Some(MoonAvoidance::Illumination {
            dark: column(r, rows, |r| r.degrees(0.0, 30.0)).unwrap(),
            bright: column(r, rows, |r| r.degrees(40.0, 120.0)).unwrap(),
        });
    }
    if r.chance(dense * 0.3) {
        limits.moon_down_relaxes = Some(r.degrees(-2.0, 5.0));
    }
    if r.chance(dense * 0.2) {
        limits.sky_brightness_min_v = column(r, rows, |r| r.between(17.5, 21.4));
    }
    if r.chance(dense * 0.2) {
        limits.hour_angle_min = column(r, rows, |r| r.degrees(-180.0, -5.0));
        limits.hour_angle_max = column(r, rows, |r| r.degrees(0.0, 180.0));
    }
    if r.chance(dense * 0.1) {
        limits.declination_min = column(r, rows, |r| r.degrees(-60.0, 0.0));
        limits.declination_max = column(r, rows, |r| r.degrees(0.0, 70.0));
    }
    if r.chance(0.25) {
        let count = 1 + (r.unit() * 3.0) as usize;
        limits.azimuth_sectors =
            Some((0..count).map(|_| (r.degrees(0.0, 360.0), r.degrees(0.0, 360.0))).collect());
    }
    if r.chance(dense * 0.2) {
        limits.azimuth_rate_max = column(r, rows, |r| r.between(1.0, 6.0) * 7.3e-5);
    }
    limits.use_skyline = r.chance(dense * 0.4);
    if r.chance(0.15) {
        let at = |day: f64| Utc::from_mjd(mjd, day);
        let (a, b) = (r.between(0.0, 0.5), r.between(0.6, 1.0));
        limits.allowed_intervals =
            Some(vec![(at(b), at(1.3)), (at(a), at(a + 0.2)), (at(a + 0.1), at(a + 0.3))]);
    }
    if of_stars && r.chance(dense * 0.2) {
        limits.phase = Some(Phase {
            epoch_mjd: column(r, rows, |r| r.between(50_000.0, 61_000.0)).unwrap(),
            period_d: column(r, rows, |r| r.between(0.05, 2.0)).unwrap(),
            half_width_d: column(r, rows, |r| r.between(0.002, 0.02)).unwrap(),
            scale: if r.chance(0.5) { PhaseScale::BarycentricTdb } else { PhaseScale::HeliocentricUtc },
        });
    }
    limits
}

fn random_skyline(random: &mut Random) -> Skyline {
    let mut azimuths: Vec<f64> = (0..12).map(|_| random.degrees(0.0, 360.0)).collect();
    azimuths.sort_by(f64::total_cmp);
    let mut points: Vec<(f64, f64)> = Vec::new();
    for azimuth in azimuths {
        points.push((azimuth, random.degrees(-0.5, 25.0)));
        if random.chance(0.5) {
            points.push((azimuth, random.degrees(-0.5, 25.0)));
        }
    }
    let (azimuths, altitudes): (Vec<f64>, Vec<f64>) = points.into_iter().unzip();
    Skyline::new(&azimuths, &altitudes).unwrap()
}

/// Site-days of the test; the environment may ask for more.
fn site_days() -> usize {
    std::env::var("HOURARC_SITE_DAYS").ok().and_then(|text| text.parse().ok()).unwrap_or(8)
}

#[test]
fn every_second_of_random_days_agrees() {
    let mut random = Random(2026);
    let (mut decided, mut target_days, mut found, mut unsure) = (0u64, 0, 0, 0u64);
    for number in 0..site_days() {
        let latitude_deg = match number % 8 {
            0 => 90.0,
            1 => -90.0,
            2 => 0.0,
            3 => 89.99,
            _ => random.between(-1.0f64, 1.0).asin() / RADIANS_PER_DEGREE,
        };
        let mut setting =
            Setting::new(random.between(-180.0, 180.0), latitude_deg, random.between(0.0, 4000.0));
        setting.site = setting.site.clone().with_skyline(random_skyline(&mut random));
        // One day has a new Moon, at which the Moon's age begins anew: 2023-03-21 17:23 UTC.
        let new_moon = number % 8 == 5;
        let mjd = if new_moon { 60_024.0 } else { random.between(58_000.0, 62_000.0).floor() };
        let begin = random.unit();
        let of_stars = number % 4 != 3;
        let bodies = [Body::Sun, Body::Moon, Body::Venus, Body::Mars, Body::Jupiter];
        let places: Vec<(f64, f64)> = (0..20)
            .map(|_| {
                let dec_deg = random.between(-1.0f64, 1.0).asin() / RADIANS_PER_DEGREE;
                // Some pass near the zenith.
                let dec_deg = if random.chance(0.2) {
                    (latitude_deg + random.between(-2.0, 2.0)).clamp(-90.0, 90.0)
                } else {
                    dec_deg
                };
                (random.between(0.0, 360.0), dec_deg)
            })
            .collect();
        let catalog = stars(&places);
        let targets = if of_stars { Targets::Catalog(&catalog) } else { Targets::Bodies(&bodies) };
        let mut limits = random_limits(&mut random, targets.len(), mjd + begin.floor(), of_stars);
        if new_moon {
            limits.moon_avoidance = Some(MoonAvoidance::Lorentzian {
                separation: Column::All(random.between(1.5, 3.0)),
                width_d: Column::All(random.between(6.0, 14.0)),
            });
        }
        let days = 1.0;
        let planned = setting.windows(&targets, &limits, mjd + begin, days);
        target_days += planned.len();
        found += planned.iter().map(|p| p.windows.len()).sum::<usize>();
        for row in 0..targets.len() {
            check_explanation(&planned[row], targets.len(), number);
        }

        let observer = setting.observer();
        let leap_seconds = LeapSeconds::builtin();
        let start = Utc::from_mjd(mjd, begin);
        let tai_of = |utc: Utc| leap_seconds.to_tai(utc).unwrap();
        let stop = start.plus_nanoseconds(86_400_000_000_000);
        let track = Track::over(
            tai_of(start).plus_seconds(-600.0),
            tai_of(stop).plus_seconds(600.0),
            &setting.ephemeris,
        );
        let elongations: Vec<f64> = (0..=1440)
            .map(|minute| {
                if matches!(limits.moon_avoidance, Some(MoonAvoidance::Lorentzian { .. })) {
                    elongation(&observer, tai_of(start).plus_seconds(60.0 * f64::from(minute)))
                } else {
                    0.0
                }
            })
            .collect();
        for step in 0..86_400i64 {
            let utc = start.plus_nanoseconds(step * 1_000_000_000 + 500_000_000);
            let sky = track.sky(&observer, tai_of(utc)).unwrap();
            let at = |body| body_direction(body, &setting.ephemeris, &sky).unwrap().direction;
            let position = |body| setting.ephemeris.position(body, sky.tdb()).unwrap();
            let (earth, sun, moon) = (position(Body::Earth), position(Body::Sun), position(Body::Moon));
            let from_full = {
                let minute = (step / 60) as usize;
                let share = ((step % 60) as f64 + 0.5) / 60.0;
                let next = elongations[minute + 1] - elongations[minute];
                let next = next - TURN * (next / TURN).round();
                let value = elongations[minute] + share * next - PI;
                value - TURN * (value / TURN).round()
            };
            let second = Second {
                utc,
                sun: at(Body::Sun),
                moon: at(Body::Moon),
                phase_angle: angle(sub(sun, moon), sub(earth, moon)),
                from_full_d: from_full / TURN * 29.530_588_86,
                sky,
            };
            let nearby = |row: usize, seconds: f64| -> f64 {
                if limits.azimuth_rate_max.is_none() {
                    return 0.0;
                }
                let sky = track.sky(&observer, tai_of(utc).plus_seconds(seconds)).unwrap();
                azimuth(rotate(&sky.local, direction_of(&targets, row, &setting, &sky).0))
            };
            for row in 0..targets.len() {
                let (gcrs, catalogue) = direction_of(&targets, row, &setting, &second.sky);
                let turned = nearby(row, 0.5) - nearby(row, -0.5);
                let turned = turned - TURN * (turned / TURN).round();
                let expected = holds(&limits, row, &setting, &second, gcrs, catalogue, turned);
                let Some(expected) = expected else {
                    unsure += 1;
                    continue;
                };
                decided += 1;
                let inside = planned[row].windows.iter().any(|w| w.start <= utc && utc < w.stop);
                assert_eq!(
                    inside,
                    expected,
                    "site-day {number} at latitude {latitude_deg}, target {row}, {utc:?}, MJD {}: {:?}\n{limits:?}\n{:?}",
                    mjd + begin + step as f64 / 86_400.0,
                    planned[row].windows,
                    places.get(row),
                );
            }
        }
    }
    println!("{target_days} target-days, {decided} samples agree, {unsure} not decided, {found} windows");
    assert!(unsure * 1000 < decided, "{unsure} of {decided}");
    assert!(found > target_days / 4);
}

fn direction_of(targets: &Targets<'_>, row: usize, setting: &Setting, sky: &Sky) -> (Vector, Option<Vector>) {
    match targets {
        Targets::Catalog(catalog) => {
            let star = catalog.star(row);
            let years = (sky.tdb().mjd() - J2000_MJD) / DAYS_PER_JULIAN_YEAR - star.epoch_yr;
            (star_direction(&star, sky), Some(unit(add_scaled(star.position, years, star.motion))))
        }
        Targets::Bodies(_) | Targets::Orbits(_) => {
            let target = targets.moving(row).unwrap();
            (target.direction(&setting.ephemeris, sky).unwrap().direction, None)
        }
    }
}

/// What an explanation must say whatever the limits: each limit leaves what it and the ones before it allow,
/// the last leaves the windows, and the limit that blocks is the first that leaves nothing.
fn check_explanation(planned: &Planned, rows: usize, number: usize) {
    let Explanation { limits, windows, outcome } = &planned.explanation;
    assert_eq!(windows.len(), planned.windows.len());
    assert_eq!(outcome.blocked_by, planned.blocked_by);
    let Some(last) = limits.last() else { return };
    let bounds: Vec<(i64, i64)> =
        planned.windows.iter().map(|w| (w.start.nanoseconds(), w.stop.nanoseconds())).collect();
    let left: Vec<(i64, i64)> = last.left.iter().map(|i| (i.0.nanoseconds(), i.1.nanoseconds())).collect();
    assert_eq!(left.len(), bounds.len(), "site-day {number} of {rows}: {left:?} {bounds:?}");
    // The same edges found from another division of the day: each to within its own error.
    for ((a, b), window) in left.iter().zip(&bounds).zip(&planned.windows) {
        let allowed_ns = |error_s: f64| 20_000 + (error_s * 1e9) as i64;
        let off = ((a.0 - b.0).abs(), (a.1 - b.1).abs());
        let (start, stop) = (allowed_ns(window.start_error_s), allowed_ns(window.stop_error_s));
        assert!(off.0 <= start && off.1 <= stop, "{a:?} {window:?}");
    }
    for pair in limits.windows(2) {
        for interval in &pair[1].left {
            let middle = interval.0.nanoseconds() / 2 + interval.1.nanoseconds() / 2;
            let within = |set: &[(Utc, Utc)]| {
                set.iter().any(|i| i.0.nanoseconds() <= middle && middle < i.1.nanoseconds())
            };
            assert!(within(&pair[0].left) && within(&pair[1].alone));
        }
    }
    let empty = limits.iter().find(|limit| limit.left.is_empty()).map(|limit| limit.cause);
    if windows.is_empty() {
        // Limits that are one value for all targets come first.
        assert!(limits.iter().any(|l| l.cause == outcome.blocked_by), "{:?} {empty:?}", outcome.blocked_by);
    } else {
        assert_eq!((outcome.blocked_by, empty), (Cause::None, None));
    }
    for window in windows {
        for reason in [window.start_reason, window.stop_reason] {
            assert!(reason == Cause::Span || limits.iter().any(|limit| limit.cause == reason), "{reason:?}");
        }
        assert!(window.best_time >= window.start && window.best_time <= window.stop);
    }
}
