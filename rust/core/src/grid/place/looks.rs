//! How bodies of the solar system look, for the columns of a place that no direction tells.

use super::chain::Chain;
use super::columns::{PlaceColumn, PlaceColumns};
use crate::astrometry::{Appearance, Moving, Sky, appearance};
use crate::constants::{RADIANS_PER_ARCSECOND, RADIANS_PER_DEGREE};
use crate::ephemeris::Body;
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
    let wants_age = out.wants(PlaceColumn::MoonAgeD);
    for (row, target) in rows.zip(target..) {
        let Some(target) = chain.targets.moving(target) else { return };
        let Ok(looks) = appearance(target, chain.observer.ephemeris, sky, chain.isa) else { continue };
        let age = match target {
            Moving::Body(Body::Moon) if wants_age => moon_age_d(chain.observer, sky.tai).unwrap_or(f64::NAN),
            _ => f64::NAN,
        };
        for (column, values) in &mut out.columns {
            match column {
                PlaceColumn::MoonAgeD => values[row] = age,
                _ => {
                    if let Some(value) = column.value(Some(&looks)) {
                        values[row] = value;
                    }
                }
            }
        }
    }
}
