//! The chain against a published example, the interpolated sky against the exact one, and a star's day
//! against the chain.

mod common;

use common::Random;
use hourarc_core::astrometry::{Catalog, CatalogColumns, Observer, Sky, Star, Track, star_direction};
use hourarc_core::constants::{RADIANS_PER_DEGREE, RADIANS_PER_MICROARCSECOND, RADIANS_PER_MILLIARCSECOND};
use hourarc_core::earth::{Orientation, s_prime};
use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::events::{Arc, STAR_ARC_ERROR_RAD, StarArc};
use hourarc_core::horizon::azimuth;
use hourarc_core::math::vector::{angle, from_angles, rotate};
use hourarc_core::refraction::Refraction;
use hourarc_core::site::Site;
use hourarc_core::time::{Instant, LeapSeconds, Tai, Utc};

struct Setting {
    site: Site,
    refraction: Refraction,
    orientation: Orientation,
    ephemeris: Ephemeris,
}

impl Setting {
    fn new(longitude_deg: f64, latitude_deg: f64, height_m: f64, orientation: Orientation) -> Self {
        Setting {
            site: Site::from_degrees(longitude_deg, latitude_deg, height_m).unwrap(),
            refraction: Refraction::none(),
            orientation,
            ephemeris: Ephemeris::default(),
        }
    }

    fn observer(&self) -> Observer<'_> {
        Observer {
            site: &self.site,
            refraction: &self.refraction,
            orientation: &self.orientation,
            ephemeris: &self.ephemeris,
        }
    }
}

fn catalog(rows: &[[f64; 7]]) -> Catalog {
    let column = |i: usize| rows.iter().map(|row| row[i]).collect::<Vec<_>>();
    Catalog::new(&CatalogColumns {
        ra_deg: &column(0),
        dec_deg: &column(1),
        epoch_yr: &column(2),
        pm_ra_mas_yr: &column(3),
        pm_dec_mas_yr: &column(4),
        parallax_mas: &column(5),
        radial_velocity_km_s: &column(6),
    })
    .unwrap()
}

fn random_star(random: &mut Random) -> Star {
    let dec_deg = (random.between(-1.0, 1.0)).asin() / RADIANS_PER_DEGREE;
    let row = [
        random.between(0.0, 360.0),
        dec_deg,
        random.between(1991.0, 2016.0),
        random.between(-1000.0, 1000.0),
        random.between(-1000.0, 1000.0),
        random.between(0.0, 300.0),
        random.between(-100.0, 100.0),
    ];
    catalog(&[row]).star(0)
}

/// IAU SOFA, Astrometry Tools, worked example (section 6) [R]. The printed "CIRS topocentric" place is
/// about the terrestrial pole, so it is turned to the horizon by ERA, longitude, s′ and latitude alone;
/// it leaves out dX, dY and this star's diurnal parallax (7 µas).
#[test]
fn sofa_astrometry_example() {
    let mas = RADIANS_PER_MILLIARCSECOND;
    let orientation =
        Orientation::constant(LeapSeconds::builtin(), 0.1550675, 50.995 * mas, 376.723 * mas, 0.0, 0.0);
    let setting = Setting::new(
        -(5.0 + 41.0 / 60.0 + 54.2 / 3600.0),
        -(15.0 + 57.0 / 60.0 + 42.8 / 3600.0),
        625.0,
        orientation,
    );
    let star = catalog(&[[
        (14.0 + 34.0 / 60.0 + 16.81183 / 3600.0) * 15.0,
        -(12.0 + 31.0 / 60.0 + 10.3965 / 3600.0),
        2000.0,
        -354.45,
        595.35,
        164.99,
        0.0,
    ]])
    .star(0);
    // 2013-04-02 23:15:43.55
    let utc = Utc::from_mjd(56384.0, (23.0 * 3600.0 + 15.0 * 60.0 + 43.55) / 86400.0);
    let observer = setting.observer();
    let sky = observer.sky(setting.orientation.leap_seconds().to_tai(utc).unwrap()).unwrap();
    let right_ascension = (14.0 + 34.0 / 60.0 + 20.2570287 / 3600.0) * 15.0 * RADIANS_PER_DEGREE;
    let declination = -(12.0 + 34.0 / 60.0 + 36.141207 / 3600.0) * RADIANS_PER_DEGREE;
    let angle_west =
        sky.rotation_angle + setting.site.longitude() + s_prime(sky.tai.to_tt()) - right_ascension;
    let [x, y, z] = from_angles(-angle_west, declination);
    let (sin, cos) = setting.site.latitude().sin_cos();
    let published = [z * cos - x * sin, y, z * sin + x * cos];
    let local = rotate(&sky.local, star_direction(&star, &sky));
    let error = angle(local, published) / RADIANS_PER_MICROARCSECOND;
    assert!(error < 10.0, "{error} µas");
    assert!((azimuth(local) / RADIANS_PER_DEGREE - 91.39161345).abs() < 1e-8);
}

/// Design: the interpolated sky stays within 1 µas of the exact one, and is not the exact one.
#[test]
fn track_agrees_with_the_exact_sky_from_both_sides() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 1e-9, -1e-9);
    let setting = Setting::new(20.8, -32.4, 1800.0, orientation);
    let observer = setting.observer();
    let mut random = Random(7);
    let (mut worst, mut cases) = (0.0f64, 0);
    for _ in 0..300 {
        let tai = Instant::<Tai>::from_mjd(random.between(15_100.0, 88_000.0).floor(), random.unit());
        let track = Track::through([tai].into_iter(), &setting.ephemeris);
        let exact = observer.sky(tai).unwrap();
        let fast = track.sky(&observer, tai).unwrap();
        for _ in 0..5 {
            let star = random_star(&mut random);
            let local = |sky: &Sky| rotate(&sky.local, star_direction(&star, sky));
            worst = worst.max(angle(local(&exact), local(&fast)));
            cases += 1;
        }
    }
    let worst_uas = worst / RADIANS_PER_MICROARCSECOND;
    println!("track against exact sky, {cases} cases: {worst_uas:.4} µas");
    assert_eq!(cases, 1500);
    assert!(worst_uas < 1.0, "{worst_uas} µas");
    assert!(worst_uas > 1e-5, "{worst_uas} µas: the interpolated path did not run");
}

/// A span of any length, or one instant alone, gives the same bits.
#[test]
fn track_does_not_depend_on_the_span() {
    let setting =
        Setting::new(0.0, 51.0, 0.0, Orientation::constant(LeapSeconds::builtin(), 0.0, 0.0, 0.0, 0.0, 0.0));
    let tai = Instant::<Tai>::from_mjd(61_000.0, 0.3);
    let one = Track::through([tai].into_iter(), &setting.ephemeris);
    let many = Track::over(tai.plus_seconds(-9e5), tai.plus_seconds(3e6), &setting.ephemeris);
    let celestial = |track: &Track| track.celestial(tai.to_tt()).unwrap().to_channels();
    assert_eq!(celestial(&one).map(f64::to_bits), celestial(&many).map(f64::to_bits));
    assert!(many.interpolation_error(&setting.ephemeris, 3) < RADIANS_PER_MICROARCSECOND);
}

/// What the quadratic day of a star leaves out is within the stated bound, and is something.
#[test]
fn star_arcs_hold_their_error() {
    let orientation = Orientation::constant(LeapSeconds::builtin(), 0.1, 3e-7, 1e-6, 0.0, 0.0);
    let mut random = Random(11);
    let (mut worst, mut worst_far, mut cases) = (0.0f64, 0.0f64, 0);
    for _ in 0..60 {
        let latitude_deg = random.between(-90.0, 90.0);
        let setting = Setting::new(random.between(-180.0, 180.0), latitude_deg, 2000.0, orientation.clone());
        let observer = setting.observer();
        let day = random.between(50_000.0, 62_000.0).floor();
        let start = Instant::<hourarc_core::time::Tt>::from_mjd(day, 0.0).to_tai();
        let track = Track::over(start, start.plus_seconds(86_400.0), &setting.ephemeris);
        let arc = Arc::new(observer, &track, day as i64).unwrap();
        for _ in 0..40 {
            let star = random_star(&mut random);
            let path = StarArc::new(&arc, &star);
            for _ in 0..10 {
                let fraction = random.unit();
                let sky = observer.sky(arc.instant(fraction)).unwrap();
                let direction = star_direction(&star, &sky);
                let from_sun = angle(direction, sky.sun_to_observer.map(|x| -x));
                if from_sun < 5.0 * RADIANS_PER_DEGREE {
                    continue;
                }
                let error = angle(rotate(&sky.local, direction), path.local(&arc, fraction));
                worst = worst.max(error);
                if from_sun > 20.0 * RADIANS_PER_DEGREE {
                    worst_far = worst_far.max(error);
                }
                cases += 1;
            }
        }
    }
    let (all, far) = (worst / RADIANS_PER_MICROARCSECOND, worst_far / RADIANS_PER_MICROARCSECOND);
    println!("star arc against the chain, {cases} cases: {all:.1} µas, 20° from the Sun {far:.1} µas");
    assert!(cases > 20_000);
    assert!(worst < STAR_ARC_ERROR_RAD, "{all} µas");
    assert!(all > 0.01, "{all} µas: the arc did not run");
    assert!(worst_far < 0.5 * STAR_ARC_ERROR_RAD, "{far} µas");
}
