//! How bodies of the solar system look, for the columns of a place that no direction tells.

use super::chain::Chain;
use super::columns::{PlaceColumn, PlaceColumns};
use crate::astrometry::{Appearance, Moving, Sky, Targets, appearance, appearance_of_orbit, observer_state};
use crate::constants::{RADIANS_PER_ARCSECOND, RADIANS_PER_DEGREE};
use crate::ephemeris::orbits::Orbits;
use crate::ephemeris::{Body, State};
use crate::events::moon_age_d;

const MINUTES_PER_DAY: f64 = 1440.0;

impl PlaceColumn {
    /// Whether it says how a body looks and not where it stands.
    pub(super) fn is_of_looks(self) -> bool {
        self.value(None).is_some()
    }

    /// The value of a column of looks; NaN where nothing is known. `None` for the other columns.
    fn value(self, looks: Option<&Appearance>) -> Option<f64> {
        let get = |of: fn(&Appearance) -> f64| Some(looks.map_or(f64::NAN, of));
        match self {
            PlaceColumn::DistanceAu => get(|looks| looks.distance_au),
            PlaceColumn::HeliocentricDistanceAu => get(|looks| looks.heliocentric_distance_au),
            PlaceColumn::PhaseAngleDeg => get(|looks| looks.phase_angle / RADIANS_PER_DEGREE),
            PlaceColumn::ElongationDeg => get(|looks| looks.elongation / RADIANS_PER_DEGREE),
            PlaceColumn::MagnitudeV => get(|looks| looks.magnitude),
            PlaceColumn::RateArcsecMin => get(|looks| looks.rate / RADIANS_PER_ARCSECOND / MINUTES_PER_DAY),
            PlaceColumn::MotionPositionAngleDeg => get(|looks| whole_turn(looks.motion_position_angle)),
            PlaceColumn::IlluminatedFraction => get(|looks| looks.illuminated_fraction),
            PlaceColumn::AngularDiameterArcsec => get(|looks| looks.angular_diameter / RADIANS_PER_ARCSECOND),
            PlaceColumn::BrightLimbPositionAngleDeg => {
                get(|looks| whole_turn(looks.bright_limb_position_angle))
            }
            // It is no matter of this instant's triangle and is added by `fill`.
            PlaceColumn::MoonAgeD => Some(f64::NAN),
            PlaceColumn::AltitudeDeg
            | PlaceColumn::AzimuthDeg
            | PlaceColumn::HourAngleDeg
            | PlaceColumn::DeclinationDeg
            | PlaceColumn::Airmass
            | PlaceColumn::ParallacticAngleDeg
            | PlaceColumn::AzimuthRateArcsecS
            | PlaceColumn::ParallacticAngleRateArcsecS
            | PlaceColumn::MoonSeparationDeg
            | PlaceColumn::SunSeparationDeg
            | PlaceColumn::SkyBrightnessMagArcsec2 => None,
        }
    }
}

/// Degrees in [0, 360): the last double below a turn must not become 360.
fn whole_turn(angle: f64) -> f64 {
    let degrees = angle / RADIANS_PER_DEGREE;
    if degrees >= 360.0 { 0.0 } else { degrees }
}

/// NaN in these rows of every column of looks.
pub(super) fn clear(out: &mut PlaceColumns<'_>, rows: std::ops::Range<usize>) {
    for (_, values) in out.columns.iter_mut().filter(|(column, _)| column.is_of_looks()) {
        values[rows.clone()].fill(f64::NAN);
    }
}

/// The columns of looks of the targets from `target` on under one sky.
pub(super) fn fill(
    chain: &Chain<'_>,
    sky: &Sky,
    target: usize,
    rows: std::ops::Range<usize>,
    out: &mut PlaceColumns<'_>,
) {
    if !out.columns.iter().any(|(column, _)| column.is_of_looks()) {
        return;
    }
    clear(out, rows.clone());
    if let Targets::Orbits(orbits) = chain.targets {
        fill_orbits(chain, orbits, sky, target, rows, out);
        return;
    }
    let wants_age = out.wants(PlaceColumn::MoonAgeD);
    for (row, target) in rows.zip(target..) {
        let Some(target) = chain.targets.moving(target) else { return };
        let Ok(looks) = appearance(target, chain.observer.ephemeris, sky, chain.isa) else { continue };
        write(&looks, row, out);
        if let (Moving::Body(Body::Moon), true) = (target, wants_age) {
            let age = moon_age_d(chain.observer, sky.tai).unwrap_or(f64::NAN);
            for (_, values) in out.columns.iter_mut().filter(|(column, _)| *column == PlaceColumn::MoonAgeD) {
                values[row] = age;
            }
        }
    }
}

fn fill_orbits(
    chain: &Chain<'_>,
    orbits: &Orbits,
    sky: &Sky,
    target: usize,
    rows: std::ops::Range<usize>,
    out: &mut PlaceColumns<'_>,
) {
    /// Rows whose vectors are worked out together.
    const TOGETHER: usize = 128;
    let tdb = sky.tdb();
    let Ok(sun) = chain.observer.ephemeris.state(Body::Sun, tdb) else { return };
    let observer = observer_state(sky);
    let mut numbers = [[0.0; TOGETHER]; 6];
    for first in rows.clone().step_by(TOGETHER) {
        let count = TOGETHER.min(rows.end - first);
        let target = target + (first - rows.start);
        let [x, y, z, vx, vy, vz] = numbers.each_mut().map(|axis| &mut axis[..count]);
        let of = target..target + count;
        orbits.astrometric_motion_batch(chain.isa, of, tdb, observer, sun, [x, y, z], [vx, vy, vz]);
        for i in 0..count {
            let [x, y, z, vx, vy, vz] = [0, 1, 2, 3, 4, 5].map(|axis| numbers[axis][i]);
            let seen = State { position: [x, y, z], velocity: [vx, vy, vz] };
            let looks = appearance_of_orbit(orbits.brightness(target + i), seen, sun, sky);
            write(&looks, first + i, out);
        }
    }
}

fn write(looks: &Appearance, row: usize, out: &mut PlaceColumns<'_>) {
    for (column, values) in &mut out.columns {
        if let Some(value) = column.value(Some(looks)) {
            values[row] = value;
        }
    }
}
