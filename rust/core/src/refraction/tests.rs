use super::*;
use crate::constants::{RADIANS_PER_ARCSECOND, RADIANS_PER_DEGREE};
use crate::math::vector::{Vector, add_scaled, dot, norm, scale};
use crate::site::dip;

const TRACED: &str = include_str!("../../../../tests/reference/refraction_traced.csv");

const USUAL: Atmosphere =
    Atmosphere { pressure_hpa: 1013.25, temperature_c: 15.0, relative_humidity: 0.3, wavelength_um: 0.55 };

fn air(pressure_hpa: f64, temperature_c: f64, relative_humidity: f64, wavelength_um: f64) -> Atmosphere {
    Atmosphere { pressure_hpa, temperature_c, relative_humidity, wavelength_um }
}

/// Air, latitude in degrees, height: from the Dead Sea and Antarctica to the edge of space as telescopes know
/// it.
fn sites() -> Vec<(&'static str, Atmosphere, f64, f64)> {
    let standard = |height_m: f64| Atmosphere::standard_pressure_hpa(height_m);
    vec![
        ("sea level", USUAL, 45.0, 0.0),
        ("below the sea", air(standard(-430.0), 35.0, 0.5, 0.7), 31.0, -430.0),
        ("humid tropics", air(1005.0, 33.0, 1.0, 0.4), 0.0, 20.0),
        ("observatory", air(standard(2635.0), 10.0, 0.15, 0.55), -24.6, 2635.0),
        ("high plateau", air(standard(5050.0), -5.0, 0.3, 0.85), -23.0, 5050.0),
        ("ice cap", air(640.0, -75.0, 0.6, 2.2), -90.0, 3200.0),
        ("aircraft", air(standard(10_000.0), -50.0, 0.0, 10.0), 60.0, 10_000.0),
        ("aircraft, default temperature", air(standard(10_000.0), 10.0, 0.3, 0.55), 60.0, 10_000.0),
    ]
}

/// The corners of what is allowed, most of them weather that no one has seen.
fn corners() -> Vec<(Atmosphere, f64, f64)> {
    let mut all = Vec::new();
    for height_m in [-500.0, 0.0, 3000.0, 10_000.0] {
        for pressure_hpa in [1e-6, 1.0, 300.0, 1200.0] {
            for temperature_c in [-90.0, 0.0, 60.0] {
                for relative_humidity in [0.0, 1.0] {
                    for wavelength_um in [0.2, 100.0] {
                        let corner = air(pressure_hpa, temperature_c, relative_humidity, wavelength_um);
                        if corner.check().is_ok() {
                            all.push((corner, if height_m > 0.0 { 1.5 } else { 0.0 }, height_m));
                        }
                    }
                }
            }
        }
    }
    all
}

fn tabulated(atmosphere: &Atmosphere, latitude_deg: f64, height_m: f64) -> Refraction {
    Refraction::new(atmosphere, latitude_deg * RADIANS_PER_DEGREE, height_m).unwrap()
}

/// SplitMix64 (Steele, Lea & Flood 2014), to a number in [0, 1).
struct Random(u64);

impl Random {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.next()
    }
}

/// Gate: 0.1″ to 80° zenith distance.
#[test]
fn hohenkerk_sinclair_table() {
    let refraction = tabulated(&air(1005.0, 7.0, 0.8, 0.574), 50.0, 0.0);
    let mut rows = 0;
    let mut worst: f64 = 0.0;
    for line in TRACED.lines().filter(|line| !line.starts_with('#')).skip(1) {
        let (zenith_distance_deg, arcsec) = line.split_once(',').unwrap();
        let observed = (90.0 - zenith_distance_deg.parse::<f64>().unwrap()) * RADIANS_PER_DEGREE;
        let found = refraction.bending_at_observed(observed) / RADIANS_PER_ARCSECOND;
        let off = found - arcsec.parse::<f64>().unwrap();
        println!("{zenith_distance_deg}: {found:.3} off {off:+.3}");
        worst = worst.max(off.abs());
        rows += 1;
    }
    assert_eq!(rows, 10);
    assert!(worst < 0.1, "{worst}");
}

/// Pulkovo refraction tables, 5th ed. (1985): 1977.97″ at the horizon, 15 °C, 1013.25 hPa, 0.590 µm, dry
/// [R second-hand]. Gate: 0.1′.
#[test]
fn pulkovo_horizontal_refraction() {
    let refraction = tabulated(&air(1013.25, 15.0, 0.0, 0.590), 45.0, 0.0);
    let found = refraction.bending_at_observed(0.0) / RADIANS_PER_ARCSECOND;
    println!("horizon: {found:.2} off {:+.2}", found - 1977.97);
    assert!((found - 1977.97).abs() < 6.0, "{found}");
}

/// The simple formulae for mean air (10 °C, 1010 hPa), in arcminutes: Bennett 1982 against apparent altitude
/// and Saemundsson 1986 against true altitude [R, V]. They stand for tables of another model atmosphere, so
/// that 0.7′ at the horizon is no one's error: a check against blunders, no more.
#[test]
fn simple_formulae() {
    let refraction = tabulated(&air(1010.0, 10.0, 0.0, 0.57), 45.0, 0.0);
    let arcmin = |angle: f64| angle / RADIANS_PER_ARCSECOND / 60.0;
    for (altitude_deg, bennett, within) in
        [(0.0, 34.478, 0.7), (1.0, 24.329, 0.3), (5.0, 9.883, 0.1), (10.0, 5.392, 0.1)]
    {
        let found = arcmin(refraction.bending_at_observed(altitude_deg * RADIANS_PER_DEGREE));
        println!("Bennett, {altitude_deg} deg: {:+.3}'", found - bennett);
        assert!((found - bennett).abs() < within, "{altitude_deg}: {found}");
    }
    for (altitude_deg, saemundsson, within) in [(0.0, 28.98, 0.5), (10.0, 5.408, 0.2)] {
        let topocentric = altitude_deg * RADIANS_PER_DEGREE;
        let found = arcmin(refraction.observed_altitude(topocentric) - topocentric);
        println!("Saemundsson, {altitude_deg} deg: {:+.3}'", found - saemundsson);
        assert!((found - saemundsson).abs() < within, "{altitude_deg}: {found}");
    }
}

/// Forward and inverse undo each other, 100,000 random altitudes a site. Gate: 1e-9 rad.
#[test]
fn round_trip() {
    let mut random = Random(1);
    let mut worst: f64 = 0.0;
    for (_, atmosphere, latitude_deg, height_m) in sites() {
        let refraction = tabulated(&atmosphere, latitude_deg, height_m);
        for _ in 0..100_000 {
            // Half of them near the horizon and below the lowest altitude too.
            let top = if random.next() < 0.5 { 0.1 } else { FRAC_PI_2 };
            let altitude = random.between(-0.15, top);
            let there = refraction.topocentric_altitude(refraction.observed_altitude(altitude));
            let back = refraction.observed_altitude(refraction.topocentric_altitude(altitude));
            worst = worst.max((there - altitude).abs()).max((back - altitude).abs());
        }
    }
    for (atmosphere, latitude, height_m) in corners() {
        let refraction = Refraction::new(&atmosphere, latitude, height_m).unwrap();
        for _ in 0..1000 {
            let altitude = random.between(-0.15, 0.3);
            let back = refraction.observed_altitude(refraction.topocentric_altitude(altitude));
            worst = worst.max((back - altitude).abs());
        }
    }
    println!("round trip: {worst:.2e} rad");
    assert!(worst < 1e-9, "{worst:.2e}");
    assert!(worst < 4.5e-16, "the documented figure: {worst:.2e}");
}

/// Observed altitude strictly increases with topocentric altitude, from far below the horizon to the zenith,
/// and its slope is the derivative.
#[test]
fn increases_and_has_its_slope() {
    let mut all: Vec<_> =
        sites().into_iter().map(|(_, a, lat, h)| (a, lat * RADIANS_PER_DEGREE, h)).collect();
    all.extend(corners());
    let mut least: f64 = 1.0;
    let mut slope_off: f64 = 0.0;
    for (atmosphere, latitude, height_m) in all {
        let refraction = Refraction::new(&atmosphere, latitude, height_m).unwrap();
        let lowest = refraction.lowest_topocentric_altitude();
        let mut before = f64::NEG_INFINITY;
        for i in 0..20_000 {
            let altitude = -0.2 + (FRAC_PI_2 + 0.2) * i as f64 / 19_999.0;
            let (observed, slope) = refraction.observed_altitude_and_slope(altitude);
            assert_eq!(observed, refraction.observed_altitude(altitude));
            assert!(observed > before, "{atmosphere:?} at {altitude}");
            assert!(slope > 0.0, "{atmosphere:?} at {altitude}: {slope}");
            before = observed;
            least = least.min(slope);
            let step = 1e-6;
            if altitude - step > lowest && altitude + step < FRAC_PI_2 {
                let difference = refraction.observed_altitude(altitude + step)
                    - refraction.observed_altitude(altitude - step);
                slope_off = slope_off.max((difference / (2.0 * step) - slope).abs());
            } else if altitude < lowest {
                assert_eq!(slope, 1.0);
            }
        }
        // No step where the bending begins to be held.
        let jump =
            refraction.observed_altitude(lowest + 1e-12) - refraction.observed_altitude(lowest - 1e-12);
        assert!(jump > 0.0 && jump < 3e-12, "{atmosphere:?}: {jump:.2e}");
    }
    println!("least slope {least:.3}, slope against differences {slope_off:.1e}");
    assert!(slope_off < 1e-7, "{slope_off:.1e}");
}

/// What the table adds to the ray it is made from, at random altitudes: above the dip of the sea horizon, and
/// over the whole range, whose last degree is the hardest.
#[test]
fn table_follows_the_traced_ray() {
    let mut random = Random(2);
    let (mut worst_above, mut worst_usual, mut worst_all): (f64, f64, f64) = (0.0, 0.0, 0.0);
    for (name, atmosphere, latitude_deg, height_m) in sites() {
        let latitude = latitude_deg * RADIANS_PER_DEGREE;
        let profile = Profile::new(&atmosphere, latitude, height_m);
        let tracer = ray::Tracer::new(&profile);
        let refraction = Refraction::new(&atmosphere, latitude, height_m).unwrap();
        let (mut above, mut all): (f64, f64) = (0.0, 0.0);
        for i in 0..3000 {
            let top = if i % 3 == 0 { FRAC_PI_2 } else { 0.1 };
            let observed = random.between(refraction.lowest_observed_altitude(), top);
            let bending = tracer.bending(observed);
            let off = (refraction.observed_altitude(observed - bending) - observed).abs();
            all = all.max(off);
            if observed > -dip(height_m) {
                above = above.max(off);
            }
        }
        println!("table, {name}: {above:.1e} rad above the dip, {all:.1e} everywhere");
        worst_above = worst_above.max(above);
        worst_all = worst_all.max(all);
        if atmosphere.temperature_c > -20.0 && height_m < 6000.0 {
            worst_usual = worst_usual.max(all);
        }
    }
    assert!(worst_usual < 4e-10, "{worst_usual:.2e}");
    assert!(worst_above < 1.5e-9, "{worst_above:.2e}");
    assert!(worst_all < 3e-8, "{worst_all:.2e}");
}

/// The zenith is not refracted, and what lies past the lowest altitude keeps its bending.
#[test]
fn ends_of_the_range() {
    for (_, atmosphere, latitude_deg, height_m) in sites() {
        let refraction = tabulated(&atmosphere, latitude_deg, height_m);
        assert!((refraction.observed_altitude(FRAC_PI_2) - FRAC_PI_2).abs() < 3e-12);
        let lowest = refraction.lowest_observed_altitude();
        let bending = refraction.bending_at_observed(lowest);
        assert!((lowest - refraction.lowest_topocentric_altitude() - bending).abs() < 1e-16);
        for below in [0.001, 0.1, 1.0] {
            assert!((refraction.bending_at_observed(lowest - below) - bending).abs() < 5e-16);
            let topocentric = refraction.lowest_topocentric_altitude() - below;
            assert!((refraction.observed_altitude(topocentric) - topocentric - bending).abs() < 5e-16);
        }
        // The sea horizon is inside the range with more than half a degree to spare (in air that can be).
        assert!(lowest < -dip(height_m) - 0.5 * RADIANS_PER_DEGREE);
        for strange in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            assert!(!refraction.observed_altitude(strange).is_finite());
            assert!(!refraction.topocentric_altitude(strange).is_finite());
        }
        assert!(refraction.observed_altitude_and_slope(f64::NAN).0.is_nan());
    }
}

/// Without air the bits pass through.
#[test]
fn no_pressure_no_refraction() {
    let empty = Refraction::new(&Atmosphere { pressure_hpa: 0.0, ..USUAL }, 0.7, 100.0).unwrap();
    let mut random = Random(3);
    for refraction in [empty, Refraction::none()] {
        for _ in 0..10_000 {
            let altitude = random.between(-FRAC_PI_2, FRAC_PI_2);
            assert_eq!(refraction.observed_altitude(altitude), altitude);
            assert_eq!(refraction.topocentric_altitude(altitude), altitude);
            assert_eq!(refraction.observed_altitude_and_slope(altitude), (altitude, 1.0));
            assert_eq!(refraction.bending_at_observed(altitude), 0.0);
        }
        assert_eq!(refraction.lowest_observed_altitude(), -FRAC_PI_2);
    }
    // And a trace of it is a trace of refraction: in proportion to the pressure.
    let thin = tabulated(&air(1e-3, 15.0, 0.0, 0.55), 45.0, 0.0).bending_at_observed(0.5);
    let thick = tabulated(&air(1.0, 15.0, 0.0, 0.55), 45.0, 0.0).bending_at_observed(0.5);
    assert!((thick / thin / 1000.0 - 1.0).abs() < 1e-4);
}

#[test]
fn wrong_sites_are_refused() {
    let message = |atmosphere: &Atmosphere, latitude, height_m| {
        Refraction::new(atmosphere, latitude, height_m).unwrap_err().to_string()
    };
    assert!(
        message(&Atmosphere { temperature_c: 99.0, ..USUAL }, 0.0, 0.0).starts_with("temperature: given 99")
    );
    assert!(message(&USUAL, 2.0, 0.0).starts_with("latitude: given 114.5"));
    assert!(message(&USUAL, 0.0, -600.0).starts_with("height: given -600 m"));
    // Also where the pressure says that nothing will be computed.
    assert!(
        message(&Atmosphere { pressure_hpa: 0.0, wavelength_um: 0.1, ..USUAL }, 0.0, 0.0)
            .starts_with("wavelength")
    );
}

/// The quadrature against a much longer one.
#[test]
fn enough_points() {
    let mut worst: f64 = 0.0;
    for (_, atmosphere, latitude_deg, height_m) in sites() {
        let profile = Profile::new(&atmosphere, latitude_deg * RADIANS_PER_DEGREE, height_m);
        let (tracer, longer) = (ray::Tracer::new(&profile), ray::Tracer::with_points(&profile, 90, 120));
        for i in 0..300 {
            let altitude = profile.lowest_altitude() + 1.6 * (i as f64 / 299.0).powi(3);
            worst = worst.max((tracer.bending(altitude) - longer.bending(altitude)).abs());
        }
    }
    println!("quadrature: {worst:.1e} rad");
    assert!(worst < 1e-13, "{worst:.1e}");
}

/// The same rays by another way: the ray equation of Fermat's principle in Cartesian coordinates,
/// dp/dσ = q, dq/dσ = ∇n²/2, from the site outward by Runge–Kutta, with no invariant and no zenith distance.
#[test]
fn rays_by_the_ray_equation() {
    for (name, atmosphere, latitude_deg, height_m) in sites() {
        let profile = Profile::new(&atmosphere, latitude_deg * RADIANS_PER_DEGREE, height_m);
        let tracer = ray::Tracer::new(&profile);
        for altitude in [1.2, 0.3, 0.02, 0.0, profile.lowest_altitude()] {
            let off = (tracer.bending(altitude) - bending_by_the_ray_equation(&profile, altitude)).abs();
            assert!(off < 2e-12, "{name} at {altitude}: {off:.2e}");
        }
    }
}

fn bending_by_the_ray_equation(profile: &Profile, altitude: f64) -> f64 {
    let mut position: Vector = [0.0, profile.site_m, 0.0];
    let index = profile.troposphere(profile.site_m);
    let mut direction = scale(1.0 + index.refractivity, [altitude.cos(), altitude.sin(), 0.0]);
    for (boundary_m, upper) in [(profile.tropopause_m, false), (profile.top_m, true)] {
        let pull = |p: Vector| {
            let radius_m = norm(p);
            let index = if upper { profile.stratosphere(radius_m) } else { profile.troposphere(radius_m) };
            scale((1.0 + index.refractivity) * index.gradient / radius_m, p)
        };
        loop {
            let left_m = boundary_m - norm(position);
            let climb = dot(position, direction) / norm(position);
            // Steps of 200 m; the last ones land on the boundary, where the gradient jumps.
            let last = climb > 0.0 && left_m / climb < 200.0;
            let h = if last { left_m / climb } else { 200.0 };
            if last && left_m.abs() < 1e-5 {
                break;
            }
            let (p1, q1) = (direction, pull(position));
            let (p2, q2) = (add_scaled(direction, 0.5 * h, q1), pull(add_scaled(position, 0.5 * h, p1)));
            let (p3, q3) = (add_scaled(direction, 0.5 * h, q2), pull(add_scaled(position, 0.5 * h, p2)));
            let (p4, q4) = (add_scaled(direction, h, q3), pull(add_scaled(position, h, p3)));
            for (total, [k1, k2, k3, k4]) in
                [(&mut position, [p1, p2, p3, p4]), (&mut direction, [q1, q2, q3, q4])]
            {
                for axis in 0..3 {
                    total[axis] += h / 6.0 * (k1[axis] + 2.0 * (k2[axis] + k3[axis]) + k4[axis]);
                }
            }
        }
    }
    let sine = dot(position, direction) / (norm(position) * norm(direction));
    let above = profile.stratosphere(profile.top_m).refractivity * sine.acos().tan();
    altitude - direction[1].atan2(direction[0]) + above
}

/// The closed form of the pressure, by numerical integration of the hydrostatic equation for moist air.
#[test]
fn atmosphere_is_in_balance() {
    let (latitude, height_m) = (0.6_f64, 500.0);
    let moist = air(960.0, 25.0, 0.7, 0.6);
    let profile = Profile::new(&moist, latitude, height_m);
    let gravity = 9.784 * (1.0 - 0.0026 * (2.0 * latitude).cos() - 0.000_000_28 * height_m);
    let vapour = |t: f64| moist.vapour_pressure_hpa() * (t / 298.15).powf(18.36);
    let fall = |p: f64, above_m: f64| {
        let t = 298.15 - 0.0065 * above_m;
        // Density of a mixture of gases times gravity.
        -gravity * ((p - vapour(t)) * 28.9644 + vapour(t) * 18.0152) / (8314.32 * t)
    };
    let (mut pressure, steps) = (960.0, 1000);
    let h = (11_000.0 - height_m) / steps as f64;
    for i in 0..steps {
        let z = i as f64 * h;
        let k1 = fall(pressure, z);
        let k2 = fall(pressure + 0.5 * h * k1, z + 0.5 * h);
        let k3 = fall(pressure + 0.5 * h * k2, z + 0.5 * h);
        let k4 = fall(pressure + h * k3, z + h);
        pressure += h / 6.0 * (k1 + 2.0 * (k2 + k3) + k4);
    }
    let t = 298.15 - 0.0065 * (11_000.0 - height_m);
    let expected = (profile::dry_refractivity_k_per_hpa(0.6) * pressure - 11.27e-6 * vapour(t)) / t;
    let found = profile.troposphere(profile.tropopause_m).refractivity;
    assert!((found / expected - 1.0).abs() < 1e-10, "{found} {expected}");
    assert!((profile.stratosphere(profile.tropopause_m).refractivity - found).abs() < 1e-20);
    // The gradients are the derivatives, in both layers and for the continuation below the site.
    for above_m in [-1000.0, 0.0, 5000.0, 10_000.0, 20_000.0, 70_000.0] {
        let radius_m = profile.site_m + above_m;
        let index =
            |r: f64| if above_m > 10_500.0 { profile.stratosphere(r) } else { profile.troposphere(r) };
        let difference = (index(radius_m + 10.0).refractivity - index(radius_m - 10.0).refractivity) / 20.0;
        assert!((difference / index(radius_m).gradient - 1.0).abs() < 1e-6, "{above_m}");
    }
}

/// The dispersion of Ciddor 1996 (Applied Optics 35, 1566, equation 1, for 15 °C and 450 ppm of CO₂), an
/// independent formula, as a ratio to the value at 0.574 µm.
#[test]
fn dispersion_against_another_formula() {
    let other = |wavelength_um: f64| {
        let s = 1.0 / (wavelength_um * wavelength_um);
        5_792_105.0 / (238.0185 - s) + 167_917.0 / (57.362 - s)
    };
    let ours = profile::dry_refractivity_k_per_hpa;
    let off =
        |wavelength_um: f64| ours(wavelength_um) / ours(0.574) / (other(wavelength_um) / other(0.574)) - 1.0;
    for (wavelengths_um, within) in
        [(0.4..=1.7, 1e-4), (1.7..=5.0, 1e-4), (0.35..=0.4, 2.5e-4), (0.3..=0.35, 8e-4), (0.2..=0.3, 0.015)]
    {
        let worst = (0..=100)
            .map(|i| {
                off(wavelengths_um.start()
                    + (wavelengths_um.end() - wavelengths_um.start()) * 0.01 * i as f64)
            })
            .fold(0.0, |worst: f64, off| worst.max(off.abs()));
        println!("dispersion {wavelengths_um:?} um: {worst:.1e}");
        assert!(worst < within, "{wavelengths_um:?}: {worst:.2e}");
    }
}

/// The ray that grazes the sea leaves the site at the dip: from the perigee's n r, with no table.
#[test]
fn dip_against_a_traced_ray() {
    for height_m in [10.0, 100.0, 1000.0, 4200.0] {
        let atmosphere = Atmosphere { pressure_hpa: Atmosphere::standard_pressure_hpa(height_m), ..USUAL };
        let profile = Profile::new(&atmosphere, 0.5, height_m);
        let sea_m = profile.site_m - height_m;
        let at = |radius_m: f64| profile.troposphere(radius_m).optical_radius(radius_m);
        let traced = (at(sea_m) / at(profile.site_m)).acos();
        println!("dip from {height_m} m: {:+.1} %", 100.0 * (dip(height_m) / traced - 1.0));
        assert!((dip(height_m) / traced - 1.0).abs() < 0.05);
    }
}

/// The mean radius of curvature: a²/b at the poles, b on the equator (geometry of the ellipsoid; WGS 84
/// axes).
#[test]
fn radius_of_curvature() {
    assert!((profile::curvature_radius_m(FRAC_PI_2) - 6399593.6258).abs() < 1e-3);
    assert!((profile::curvature_radius_m(0.0) - 6356752.3142).abs() < 1e-3);
}
