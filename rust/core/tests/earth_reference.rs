//! Time scales and the Earth's attitude against pyerfa 2.0.1.5: every row of the tables that
//! `tests/reference/make_earth.py` wrote. The worst cases are printed (`--nocapture`).

use std::collections::HashMap;
use std::path::Path;

use hourarc_core::constants::{RADIANS_PER_MICROARCSECOND, TURN};
use hourarc_core::earth::{
    PrecessionNutation, bias_precession_nutation, celestial_to_intermediate, earth_rotation_angle,
    equation_of_the_origins, greenwich_apparent_sidereal_time, greenwich_mean_sidereal_time, intermediate,
    mean_obliquity, nutation, precession_angles, s_prime,
};
use hourarc_core::time::{Instant, LeapSeconds, Tt, Ut1, Utc, tdb_minus_tt};

/// The columns of a reference table by name.
fn columns(name: &str, at_least: usize) -> HashMap<String, Vec<f64>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../tests/reference").join(name);
    let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let mut lines = text.lines();
    let names: Vec<&str> = lines.next().expect("a header").split(',').collect();
    let mut columns: Vec<Vec<f64>> = vec![Vec::new(); names.len()];
    for line in lines {
        let cells: Vec<&str> = line.split(',').collect();
        assert_eq!(cells.len(), names.len(), "{name}: {line}");
        for (column, cell) in columns.iter_mut().zip(cells) {
            column.push(cell.parse().unwrap_or_else(|e| panic!("{name}: {cell}: {e}")));
        }
    }
    assert!(columns[0].len() >= at_least, "{name} has {} rows only", columns[0].len());
    names.into_iter().map(str::to_string).zip(columns).collect()
}

#[test]
fn attitude_within_a_tenth_of_a_microarcsecond() {
    let table = columns("earth_attitude.csv", 400);
    let mut worst: HashMap<&str, f64> = HashMap::new();
    let mut compare = |name: &'static str, difference: f64| {
        let difference = (difference - TURN * (difference / TURN).round()).abs() / RADIANS_PER_MICROARCSECOND;
        let entry = worst.entry(name).or_insert(0.0);
        *entry = entry.max(difference);
        assert!(difference < 0.1, "{name}: {difference} µas");
    };
    for row in 0..table["tt_day"].len() {
        let wanted = |name: &str| table[name][row];
        let tt = Instant::<Tt>::from_mjd(wanted("tt_day"), wanted("tt_fraction"));
        let ut1 = Instant::<Ut1>::from_mjd(wanted("tt_day"), wanted("ut1_fraction"));

        compare("rotation_angle", earth_rotation_angle(ut1) - wanted("rotation_angle"));
        let mean = greenwich_mean_sidereal_time(ut1, tt);
        compare("mean_sidereal_time", mean - wanted("mean_sidereal_time"));
        let apparent = greenwich_apparent_sidereal_time(ut1, tt);
        compare("apparent_sidereal_time", apparent - wanted("apparent_sidereal_time"));
        compare("equation_of_the_origins", equation_of_the_origins(tt) - wanted("equation_of_the_origins"));
        let nutation = nutation(tt);
        compare("nutation_longitude", nutation.longitude - wanted("nutation_longitude"));
        compare("nutation_obliquity", nutation.obliquity - wanted("nutation_obliquity"));
        let angles = precession_angles(tt);
        compare("gamma_bar", angles.gamma_bar - wanted("gamma_bar"));
        compare("phi_bar", angles.phi_bar - wanted("phi_bar"));
        compare("psi_bar", angles.psi_bar - wanted("psi_bar"));
        compare("mean_obliquity", angles.obliquity - wanted("mean_obliquity"));
        assert_eq!(mean_obliquity(tt), angles.obliquity);
        let pole = intermediate(tt);
        compare("x", pole.x - wanted("x"));
        compare("y", pole.y - wanted("y"));
        compare("s", pole.s - wanted("s"));
        compare("s_prime", s_prime(tt) - wanted("s_prime"));

        let equinox = bias_precession_nutation(tt);
        let origin = celestial_to_intermediate(pole.x, pole.y, pole.s);
        for i in 0..3 {
            for j in 0..3 {
                compare("equinox", equinox[i][j] - wanted(&format!("equinox_{}{}", i + 1, j + 1)));
                compare("origin", origin[i][j] - wanted(&format!("origin_{}{}", i + 1, j + 1)));
            }
        }
        let parts = PrecessionNutation::at(tt);
        assert_eq!(parts.matrix(), equinox);
        assert_eq!(parts.intermediate(), pole);
    }
    let mut lines: Vec<_> = worst.iter().map(|(name, value)| format!("{name}: {value:.5} µas")).collect();
    lines.sort();
    println!("{} epochs, worst cases:\n{}", table["tt_day"].len(), lines.join("\n"));
    assert!(worst["rotation_angle"] > 0.0);
}

#[test]
fn barycentric_time_agrees_with_the_full_series() {
    // eraDtdb has all 787 terms of Fairhead & Bretagnon 1990; ours, the seven largest.
    let table = columns("earth_tdb.csv", 400);
    let mut worst = 0.0_f64;
    for row in 0..table["tt_day"].len() {
        let tt = Instant::<Tt>::from_mjd(table["tt_day"][row], table["tt_fraction"][row]);
        let difference = (tdb_minus_tt(tt) - table["tdb_minus_tt_s"][row]).abs();
        worst = worst.max(difference);
        assert!(difference < 10e-6, "{difference:e} s");
        let there = tt.to_tdb();
        let (day, fraction) = tt.mjd_parts();
        assert!((there.seconds_since(Instant::from_mjd(day, fraction)) - tdb_minus_tt(tt)).abs() < 1e-10);
    }
    println!("TDB-TT: worst of {} epochs {:.2} µs", table["tt_day"].len(), worst * 1e6);
}

#[test]
fn atomic_time_agrees_since_1960() {
    let table = columns("earth_tai_utc.csv", 300);
    let leap = LeapSeconds::builtin();
    for row in 0..table["utc_day"].len() {
        let utc = Utc::from_mjd(table["utc_day"][row], table["utc_fraction"][row]);
        let difference = leap.tai_minus_utc(utc).unwrap() - table["tai_minus_utc_s"][row];
        assert!(difference.abs() < 1e-12, "{utc}: {difference:e} s");
    }
}
