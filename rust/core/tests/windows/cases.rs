//! The cases that break planners, each with its outcome.

use super::*;

fn degrees(value: f64) -> Option<Column> {
    Some(Column::All(value * RADIANS_PER_DEGREE))
}

fn with_skyline(setting: Setting, points_deg: &[(f64, f64)]) -> Setting {
    let azimuths: Vec<f64> = points_deg.iter().map(|p| p.0 * RADIANS_PER_DEGREE).collect();
    let altitudes: Vec<f64> = points_deg.iter().map(|p| p.1 * RADIANS_PER_DEGREE).collect();
    let site = setting.site.clone().with_skyline(Skyline::new(&azimuths, &altitudes).unwrap());
    Setting { site, ..setting }
}

fn length_s(window: &Window) -> f64 {
    (window.stop.nanoseconds() - window.start.nanoseconds()) as f64 * 1e-9
}

#[test]
fn two_steps_of_the_skyline_a_second_apart_close_one_second() {
    // At the equator a star of declination 30° culminates in the north at 60°; there its azimuth moves by
    // 15.04″ cos δ / cos h = 26″ a second. A pillar of that width and 80° height hides it for a second.
    let width_deg = 15.04 * (30f64 * RADIANS_PER_DEGREE).cos() / 0.5 / 3600.0;
    for middle_deg in [0.0, 359.0, 20.0] {
        let [from, to] = [-0.5, 0.5].map(|side| (middle_deg + side * width_deg + 360.0f64) % 360.0);
        let mut points = if from < to {
            vec![(from, 0.0), (from, 80.0), (to, 80.0), (to, 0.0)]
        } else {
            vec![(to, 80.0), (to, 0.0), (from, 0.0), (from, 80.0)]
        };
        points.sort_by(|a, b| a.0.total_cmp(&b.0));
        let setting = with_skyline(Setting::new(0.0, 0.0, 0.0), &points);
        let mut limits = Limits::none(AirmassModel::KastenYoung1989);
        limits.use_skyline = true;
        let planned = setting.windows(&Targets::Catalog(&stars(&[(100.0, 30.0)])), &limits, 60_000.3, 1.0);
        let windows = &planned[0].windows;
        let gaps: Vec<f64> = windows
            .windows(2)
            .map(|w| (w[1].start.nanoseconds() - w[0].stop.nanoseconds()) as f64 * 1e-9)
            .filter(|gap| *gap < 100.0)
            .collect();
        assert_eq!(gaps.len(), 1, "{middle_deg}: {windows:?}");
        assert!((0.7..1.6).contains(&gaps[0]), "{middle_deg}: {gaps:?}");
    }
}

#[test]
fn a_pillar_behind_which_only_a_low_star_is_opens_for_a_second() {
    // The other way round: a slit of one second in a wall of 80°.
    let width_deg = 15.04 * (30f64 * RADIANS_PER_DEGREE).cos() / 0.5 / 3600.0;
    let (from, to) = (360.0 - 0.5 * width_deg, 0.5 * width_deg);
    let setting =
        with_skyline(Setting::new(0.0, 0.0, 0.0), &[(to, 0.0), (to, 80.0), (from, 80.0), (from, 0.0)]);
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.use_skyline = true;
    let planned = setting.windows(&Targets::Catalog(&stars(&[(100.0, 30.0)])), &limits, 60_000.3, 1.0);
    assert_eq!(planned[0].windows.len(), 1, "{:?}", planned[0].windows);
    assert!((length_s(&planned[0].windows[0]) - 1.0).abs() < 0.01);
    assert_eq!(planned[0].windows[0].start_reason, Cause::Skyline);
}

#[test]
fn a_window_over_midnight_of_tt_and_of_utc_is_one() {
    let setting = Setting::new(0.0, 50.0, 100.0);
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.sun_altitude_max = degrees(-18.0);
    limits.altitude_min = degrees(20.0);
    limits.sun_separation_min = degrees(30.0);
    // Circumpolar: dusk to dawn.
    let catalog = stars(&[(30.0, 85.0)]);
    let planned = setting.windows(&Targets::Catalog(&catalog), &limits, 60_700.5, 1.0);
    assert_eq!(planned[0].windows.len(), 1, "{:?}", planned[0].windows);
    let window = planned[0].windows[0];
    assert_eq!((window.start_reason, window.stop_reason), (Cause::SunAltitudeMax, Cause::SunAltitudeMax));
    assert!(window.start.mjd_parts().0 == 60_700.0 && window.stop.mjd_parts().0 == 60_701.0);
}

#[test]
fn a_span_that_ends_with_a_day_of_tt_says_so() {
    let setting = Setting::new(0.0, 50.0, 100.0);
    let limits = Limits::none(AirmassModel::KastenYoung1989);
    let catalog = stars(&[(30.0, 85.0)]);
    // Midnight TT is 69.184 s before midnight UTC in 2025.
    let midnight_tt = 60_701.0 - 69.184 / 86_400.0;
    let start = Utc::from_mjd(60_700.0, 0.5);
    let stop = Utc::from_mjd(60_700.0, midnight_tt - 60_700.0);
    let days = (stop.nanoseconds() - start.nanoseconds()) as f64 / 86_400e9;
    let planned = setting.windows(&Targets::Catalog(&catalog), &limits, 60_700.5, days);
    assert_eq!(planned[0].windows.len(), 1);
    assert_eq!(planned[0].windows[0].stop_reason, Cause::Span);
}

#[test]
fn polar_day_blocks_by_the_sun_and_polar_night_never_ends() {
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.sun_altitude_max = degrees(-0.8);
    let setting = Setting::new(20.0, 78.0, 0.0);
    let catalog = stars(&[(30.0, 85.0)]);
    // 2025 June 21 and December 21.
    let summer = setting.windows(&Targets::Catalog(&catalog), &limits, 60_847.5, 1.0);
    assert_eq!((summer[0].windows.len(), summer[0].blocked_by), (0, Cause::SunAltitudeMax));
    let winter = setting.windows(&Targets::Catalog(&catalog), &limits, 61_030.5, 3.0);
    assert_eq!(winter[0].windows.len(), 1);
    assert!((length_s(&winter[0].windows[0]) - 3.0 * 86_400.0).abs() < 1e-3);
    assert_eq!(winter[0].windows[0].start_reason, Cause::Span);
}

#[test]
fn the_keyhole_has_the_radius_of_the_textbook() {
    // Radius 15.04″ cos φ / v around the zenith: a star through the zenith is lost for 2 r / (15.04″ cos φ) =
    // 2 / v, v in radians a radian of time.
    let setting = Setting::new(0.0, 30.0, 0.0);
    let catalog = stars(&[(10.0, 30.0), (10.0, 20.0)]);
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.altitude_min = degrees(30.0);
    let most_deg_s = 1.0;
    limits.azimuth_rate_max = degrees(most_deg_s);
    let planned = setting.windows(&Targets::Catalog(&catalog), &limits, 60_000.5, 1.0);
    let zenithal = &planned[0].windows;
    let gap = zenithal
        .windows(2)
        .map(|w| (w[1].start.nanoseconds() - w[0].stop.nanoseconds()) as f64 * 1e-9)
        .fold(f64::INFINITY, f64::min);
    // Precession has carried the star 0.13° off the zenith by 2023: a chord of the keyhole, 0.207° in radius.
    let radius_deg = 15.04 * (30f64 * RADIANS_PER_DEGREE).cos() / 3600.0 / most_deg_s;
    assert!(gap > 0.0 && gap < 2.0 * radius_deg / (15.04 * 0.866 / 3600.0) + 60.0, "{gap} {zenithal:?}");
    assert!(planned[1].windows.iter().all(|w| w.start_reason != Cause::AzimuthRate));
}

#[test]
fn cables_cut_a_window_where_they_run_out_and_every_branch_is_tried() {
    let setting = Setting::new(0.0, 40.0, 0.0);
    // North of the zenith: the azimuth of a circumpolar star swings to and fro about north. South of it: from
    // east over south to west.
    let catalog = stars(&[(10.0, 70.0), (10.0, 0.0), (10.0, 39.0)]);
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.altitude_min = degrees(10.0);
    let free = setting.windows(&Targets::Catalog(&catalog), &limits, 60_000.5, 1.0);
    let mut with = |low_deg: f64, high_deg: f64| {
        limits.cable_range = Some((low_deg * RADIANS_PER_DEGREE, high_deg * RADIANS_PER_DEGREE));
        setting.windows(&Targets::Catalog(&catalog), &limits, 60_000.5, 1.0)
    };
    // All of any azimuth's swing fits.
    let wide = with(-360.0, 360.0);
    for (a, b) in free.iter().zip(&wide) {
        assert_eq!(a.windows.len(), b.windows.len(), "{:?} {:?}", a.windows, b.windows);
    }
    // From 0 to 360: the star about north is cut as it passes north, the one over the south is not.
    let narrow = with(0.0, 360.0);
    assert!(narrow[0].windows.len() > free[0].windows.len());
    assert!(narrow[0].windows.iter().any(|w| w.stop_reason == Cause::CableRange));
    assert_eq!(narrow[1].windows.len(), free[1].windows.len());
    let total = |planned: &Planned| planned.windows.iter().map(length_s).sum::<f64>();
    // Nothing is lost but the turning back.
    assert!((total(&narrow[0]) - total(&free[0])).abs() < 1e-3);
    // Half a circle: what is in the west is not reached at all.
    let half = with(0.0, 180.0);
    assert!(total(&half[1]) < 0.6 * total(&free[1]));
    assert!(
        half[1].windows.iter().all(|w| w.stop_reason == Cause::CableRange || w.stop_reason == Cause::Span)
    );
}

#[test]
fn the_moon_that_is_down_lifts_its_limits() {
    let setting = Setting::new(0.0, 40.0, 0.0);
    let catalog = stars(&[(10.0, 10.0), (100.0, 20.0), (200.0, -10.0), (280.0, 40.0)]);
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.moon_separation_min = degrees(180.0);
    let never = setting.windows(&Targets::Catalog(&catalog), &limits, 60_000.5, 1.0);
    assert!(never.iter().all(|p| p.windows.is_empty() && p.blocked_by == Cause::MoonSeparationMin));
    limits.moon_down_relaxes = Some(0.0);
    let down = setting.windows(&Targets::Catalog(&catalog), &limits, 60_000.5, 1.0);
    for planned in &down {
        let total: f64 = planned.windows.iter().map(length_s).sum();
        assert!((30_000.0..60_000.0).contains(&total), "{total}");
    }
}

#[test]
fn a_grazing_star_says_that_it_may_not_happen() {
    let setting = Setting::new(0.0, 40.0, 0.0);
    // Find the declination whose culmination is at 30° to within a milliarcsecond, by halving.
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.altitude_min = degrees(30.0);
    let windows = |dec_deg: f64| {
        setting
            .windows(&Targets::Catalog(&stars(&[(100.0, dec_deg)])), &limits, 60_000.5, 1.0)
            .remove(0)
            .windows
    };
    let (mut never, mut rises) = (-25.0, -15.0);
    for _ in 0..60 {
        let middle = 0.5 * (never + rises);
        if windows(middle).is_empty() { never = middle } else { rises = middle }
    }
    let grazing = windows(rises);
    assert!(grazing.len() == 1 && grazing[0].may_not_happen, "{grazing:?}");
    assert!(grazing[0].start_error_s >= 0.5 * length_s(&grazing[0]));
    let clear = windows(rises + 0.01);
    assert!(clear.len() == 1 && !clear[0].may_not_happen && clear[0].start_error_s < 1.0, "{clear:?}");
}

#[test]
fn wrong_limits_name_key_value_and_what_is_allowed() {
    let message = |change: &dyn Fn(&mut Limits)| {
        let mut limits = Limits::none(AirmassModel::KastenYoung1989);
        change(&mut limits);
        limits.check(2).unwrap_err().to_string()
    };
    assert_eq!(
        message(&|l| (l.altitude_min, l.altitude_max) = (Some(Column::All(1.0)), Some(Column::All(0.5)))),
        "altitude_min: given 1, allowed at most altitude_max, 0.5"
    );
    assert_eq!(
        message(
            &|l| (l.declination_min, l.declination_max) = (Some(Column::All(0.5)), Some(Column::All(0.1)))
        ),
        "declination_min: given 0.5, allowed at most declination_max, 0.1"
    );
    assert!(
        message(&|l| l.azimuth_sectors = Some(vec![(1.0, 7.0)])).starts_with("azimuth_sectors: given 1 to 7")
    );
    assert!(message(&|l| l.cable_range = Some((1.0, -1.0))).starts_with("cable_range: given 1 to -1"));
    assert!(message(&|l| l.moon_down_relaxes = Some(f64::NAN)).starts_with("moon_down_relaxes: given NaN"));
    assert!(message(&|l| l.sun_altitude_max = Some(Column::Each(vec![0.0]))).contains("given 1 values"));
    let phase = |half: f64| Phase {
        epoch_mjd: Column::All(60_000.0),
        period_d: Column::All(1.0),
        half_width_d: Column::All(half),
        scale: PhaseScale::BarycentricTdb,
    };
    assert_eq!(
        message(&|l| l.phase = Some(phase(0.5))),
        "phase_half_width_d: given 0.5, allowed below half of phase_period_d, 0.5"
    );
    let backwards = (Utc::from_mjd(60_001.0, 0.0), Utc::from_mjd(60_000.0, 0.0));
    assert!(message(&|l| l.allowed_intervals = Some(vec![backwards])).contains("a start before its stop"));
    assert!(message(&|l| l.sky_model.extinction_v = 9.0).starts_with("sky_extinction_v: given 9"));
    // A skyline asked of a site without one.
    let setting = Setting::new(0.0, 0.0, 0.0);
    let (start, stop) = (Utc::from_mjd(60_000.0, 0.0), Utc::from_mjd(60_001.0, 0.0));
    let track = track_for(&setting.observer(), start, stop).unwrap();
    let days = Days::new(setting.observer(), &track, start, stop).unwrap();
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.use_skyline = true;
    assert!(LimitedSpan::new(&days, &limits, 1).unwrap_err().to_string().starts_with("use_skyline"));
}

#[test]
fn a_row_whose_own_limits_contradict_is_marked_and_touches_no_other() {
    let setting = Setting::new(0.0, 40.0, 0.0);
    let catalog = stars(&[(10.0, 10.0), (100.0, 20.0), (200.0, 10.0)]);
    let mut limits = Limits::none(AirmassModel::KastenYoung1989);
    limits.altitude_min = Some(Column::Each(vec![0.5, 0.9, f64::NAN]));
    limits.altitude_max = Some(Column::All(0.8));
    let planned = setting.windows(&Targets::Catalog(&catalog), &limits, 60_000.5, 1.0);
    assert!(!planned[0].windows.is_empty());
    assert_eq!((planned[1].blocked_by, planned[2].blocked_by), (Cause::BadRow, Cause::BadRow));
}

#[test]
fn the_end_of_a_day_is_the_beginning_of_the_next_to_the_last_bit() {
    let setting = Setting::new(12.0, -33.0, 1000.0);
    let (start, stop) = (Utc::from_mjd(60_000.0, 0.2), Utc::from_mjd(60_006.0, 0.3));
    let track = track_for(&setting.observer(), start, stop).unwrap();
    let bodies = [Body::Sun, Body::Moon, Body::Mars];
    let mut days = Days::new(setting.observer(), &track, start, stop).unwrap();
    days.prepare(&Targets::Bodies(&bodies)).unwrap();
    let star = stars(&[(77.0, 12.0)]).star(0);
    for index in 1..days.arcs.len() {
        for body in bodies {
            let (one, next) = (days.body(index - 1, body).unwrap(), days.body(index, body).unwrap());
            assert_eq!(one.ends[1], next.ends[0]);
        }
        let (one, next) = (days.star(index - 1, &star), days.star(index, &star));
        assert_eq!(
            one.local_at_end(&days.arcs[index - 1], true),
            next.local_at_end(&days.arcs[index], false)
        );
        let onwards = one.on_the_next_day(&days.arcs[index], &star);
        assert_eq!(onwards.local(&days.arcs[index], 0.3), next.local(&days.arcs[index], 0.3));
    }
}
