//! Brightness of the sky with the Moon in it, and the roots of what is smooth in pieces.
//!
//! K. Krisciunas & B. E. Schaefer 1991, PASP 103, 1033; equations by their numbers there [from memory].
//! They found it to hold to 8 to 23 % in brightness, 0.1 to 0.25 mag, for V and one site.

use super::super::intervals::{Interval, IntervalSet};
use crate::constants::RADIANS_PER_DEGREE;
use crate::error::{Error, Result};
use crate::events::{Arc, BodyArc, Crossing, DayPath, SEPARATION_NODES};
use crate::math::chebyshev::Chebyshev;
use crate::math::vector::dot;

/// Below this distance from the Moon, radians, the light scattered by aerosols goes by another formula.
const NEAR_MOON: f64 = 10.0 * RADIANS_PER_DEGREE;
/// The formula grows without bound at the Moon itself: inside its disc it is held.
const MOON_RADIUS: f64 = 0.26 * RADIANS_PER_DEGREE;

/// What the brightness of the sky is computed from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SkyModel {
    /// Extinction in V, magnitudes an airmass, 0.01 to 2.
    pub extinction_v: f64,
    /// The zenith of the dark sky, V magnitudes a square arcsecond, 15 to 25.
    pub dark_zenith_v: f64,
}

impl Default for SkyModel {
    /// Those of the paper, for Mauna Kea: 0.172 mag an airmass and 21.587 mag a square arcsecond.
    fn default() -> Self {
        SkyModel { extinction_v: 0.172, dark_zenith_v: 21.587 }
    }
}

impl SkyModel {
    /// Checks the parameters against their ranges.
    ///
    /// # Errors
    /// One that is outside its range or no number.
    pub fn check(&self) -> Result<()> {
        if !(0.01..=2.0).contains(&self.extinction_v) {
            return Err(Error::invalid("sky_extinction_v", self.extinction_v, "0.01 to 2 mag an airmass"));
        }
        if !(15.0..=25.0).contains(&self.dark_zenith_v) {
            return Err(Error::invalid("sky_dark_zenith_v", self.dark_zenith_v, "15 to 25 mag/arcsec²"));
        }
        Ok(())
    }
}

/// Airmass of light scattered in the air, equation 3, from the sine of the altitude.
fn airmass(sin_altitude: f64) -> f64 {
    (1.0 - 0.96 * (1.0 - sin_altitude * sin_altitude)).sqrt().recip()
}

/// The Moon as it lights the sky.
#[derive(Debug, Clone, Copy)]
pub struct MoonLight {
    /// Sine of its true altitude; below 0 it gives no light.
    pub sin_altitude: f64,
    /// Its distance from where one looks, radians.
    pub separation: f64,
    /// Angle at the Moon between Sun and Earth, radians: 0 at full Moon.
    pub phase_angle: f64,
}

/// Brightness of the sky in V, magnitudes a square arcsecond, at a true altitude given by its sine, 0 to 1.
///
/// NaN below the horizontal. The paper's own range: Moon and target above the horizon; it holds to
/// 0.1 to 0.25 mag there. Test: `the_dark_sky_and_the_full_moon`.
pub fn sky_brightness(model: &SkyModel, sin_altitude: f64, moon: Option<MoonLight>) -> f64 {
    if sin_altitude.is_nan() || sin_altitude < 0.0 {
        return f64::NAN;
    }
    let light = moon.filter(|moon| moon.sin_altitude >= 0.0);
    magnitude(brightness(model, sin_altitude, light.map(|moon| (moon, moon.separation < NEAR_MOON))))
}

/// Nanolamberts of a brightness in V magnitudes a square arcsecond, equation 1, and back.
fn nanolamberts(v: f64) -> f64 {
    34.08 * (20.7233 - 0.92104 * v).exp()
}

fn magnitude(nanolamberts: f64) -> f64 {
    (20.7233 - (nanolamberts / 34.08).ln()) / 0.92104
}

/// Nanolamberts, for a caller who has decided whether the Moon is up and near: smooth in between.
fn brightness(model: &SkyModel, sin_altitude: f64, moon: Option<(MoonLight, bool)>) -> f64 {
    const LN_10: f64 = std::f64::consts::LN_10;
    let power_of_ten = |exponent: f64| (LN_10 * exponent).exp();
    let transmitted = |airmass: f64| power_of_ten(-0.4 * model.extinction_v * airmass);
    let x = airmass(sin_altitude);
    let through = transmitted(x);
    // Equation 2.
    let dark = nanolamberts(model.dark_zenith_v) * through / transmitted(1.0) * x;
    let Some((moon, near)) = moon else { return dark };
    let degrees = moon.phase_angle.abs() / RADIANS_PER_DEGREE;
    let separation = moon.separation.max(MOON_RADIUS);
    let separation_deg = separation / RADIANS_PER_DEGREE;
    let cosine = separation.cos();
    // Equations 16, 18 and 19, 21: scattered by molecules, and by aerosols.
    let molecules = 10f64.powf(5.36) * (1.06 + cosine * cosine);
    let aerosols = if near {
        6.2e7 / (separation_deg * separation_deg)
    } else {
        power_of_ten(6.15 - separation_deg / 40.0)
    };
    // Equation 20, illuminance of the Moon outside the air, and its extinction.
    let magnitudes = 3.84
        + 0.026 * degrees
        + 4e-9 * (degrees * degrees) * (degrees * degrees)
        + model.extinction_v * airmass(moon.sin_altitude);
    // Equation 15.
    dark + (molecules + aerosols) * power_of_ten(-0.4 * magnitudes) * (1.0 - through)
}

/// The Moon over one day, as it lights the sky.
#[derive(Debug, Clone)]
pub struct MoonLightDay {
    moon: BodyArc,
    cos_phase_angle: Chebyshev<SEPARATION_NODES>,
    horizon: Vec<f64>,
}

impl MoonLightDay {
    /// From the Moon's path and the illuminated fraction.
    pub fn new(arc: &Arc<'_>, moon: BodyArc, illumination: &Chebyshev<SEPARATION_NODES>) -> Self {
        let mut crossings: Vec<Crossing> = Vec::new();
        moon.plane_crossings(arc, arc.zenith(), 0.0, (0.0, 1.0), &mut crossings);
        let horizon = crossings.iter().map(|crossing| crossing.at).collect();
        // k = (1 + cos i) / 2.
        let cos_phase_angle = illumination.combine(2.0, illumination, 0.0).plus(-1.0);
        MoonLightDay { moon, cos_phase_angle, horizon }
    }

    /// The sky's brightness where the target stands, nanolamberts; whether the Moon is up and near is decided by the caller.
    fn at<P: DayPath>(&self, arc: &Arc<'_>, path: &P, model: &SkyModel, at: f64, moon: (bool, bool)) -> f64 {
        let local = path.local(arc, at);
        if !moon.0 {
            return brightness(model, local[2], None);
        }
        let light = self.light(local, at);
        brightness(model, local[2], Some((light, moon.1)))
    }

    fn light(&self, local: [f64; 3], at: f64) -> MoonLight {
        let moon = self.moon.local.value(at);
        MoonLight {
            sin_altitude: moon[2],
            separation: crate::math::vector::angle(local, moon),
            phase_angle: self.cos_phase_angle.value(at).clamp(-1.0, 1.0).acos(),
        }
    }

    /// How fast the brightness changes, magnitudes a day.
    pub fn rate<P: DayPath>(&self, arc: &Arc<'_>, path: &P, model: &SkyModel, at: f64) -> f64 {
        const STEP: f64 = 1e-4;
        let value = |at: f64| {
            let at = at.clamp(0.0, 1.0);
            let local = path.local(arc, at);
            sky_brightness(model, local[2].max(0.0), Some(self.light(local, at)))
        };
        (value(at + STEP) - value(at - STEP)) / (2.0 * STEP)
    }
}

/// Makes `set` where the target is up and its sky is at least as dark as `darkest_min` within `within`.
pub fn fill_brightness<P: DayPath>(
    arc: &Arc<'_>,
    path: &P,
    day: &MoonLightDay,
    model: &SkyModel,
    least_v: f64,
    (range, within): (Interval, (f64, f64)),
    reason: u8,
    crossings: &mut Vec<Crossing>,
    set: &mut IntervalSet,
) {
    // Where the formula has a corner or a step: rise and set of target and Moon, and 10° from the Moon.
    crossings.clear();
    path.plane_crossings(arc, arc.zenith(), 0.0, within, crossings);
    let mut cuts: Vec<f64> = crossings.iter().map(|c| c.at).chain(day.horizon.iter().copied()).collect();
    let per_brightest = 1.0 / nanolamberts(least_v);
    let cos_near = NEAR_MOON.cos();
    let nearer = |at: f64| dot(path.local(arc, at), day.moon.local.value(at)) - cos_near;
    let (first, last) = (nearer(within.0), nearer(within.1));
    // In a day the Moon moves by 16° among the stars, parallax included: from 30° away it does not come near.
    if first.max(last) > (30.0 * RADIANS_PER_DEGREE).cos() - cos_near || path.reach() > 0.1 {
        let (first, last) = (first >= 0.0, last >= 0.0);
        changes_of(&nearer, within.0, within.1, first, last, 1e-12, 0, &mut |at, _| cuts.push(at));
    }
    cuts.retain(|&at| at > within.0 && at < within.1);
    cuts.sort_by(f64::total_cmp);
    cuts.push(within.1);

    set.clear();
    let mut open: Option<f64> = None;
    let mut state = |at: f64, dark: bool, set: &mut IntervalSet| match (open, dark) {
        (None, true) => open = Some(at),
        (Some(start), false) => {
            open = None;
            let start_reason = if start <= range.start { range.start_reason } else { reason };
            let stop_reason = if at >= range.stop { range.stop_reason } else { reason };
            set.push(Interval { start, stop: at, start_reason, stop_reason });
        }
        _ => {}
    };
    let mut from = within.0;
    for &to in &cuts {
        if to <= from {
            continue;
        }
        let middle = 0.5 * (from + to);
        if path.local(arc, middle)[2] < 0.0 {
            state(from, false, set);
        } else {
            let moon = (day.moon.local.value(middle)[2] >= 0.0, nearer(middle) >= 0.0);
            let darker = |at: f64| 1.0 - day.at(arc, path, model, at, moon) * per_brightest;
            let (first, last) = (darker(from) >= 0.0, darker(to) >= 0.0);
            state(from, first, set);
            changes_of(&darker, from, to, first, last, 1e-7, 0, &mut |at, rising| state(at, rising, set));
        }
        from = to;
    }
    state(within.1, false, set);
}

/// Reports every change of sign of a smooth function between `from` and `to`, in order, given its signs
/// there; what is left out of the series that decides is below `tolerance` in the function's unit.
///
/// A piece whose series does not fall below that is halved, at most 16 times: 1.3 s of a day.
pub fn changes_of(
    f: &impl Fn(f64) -> f64,
    from: f64,
    to: f64,
    positive_at_from: bool,
    positive_at_to: bool,
    tolerance: f64,
    depth: usize,
    report: &mut impl FnMut(f64, bool),
) {
    const COEFFICIENTS: usize = 13;
    const DEEPEST: usize = 16;
    if to - from < 1e-14 {
        if positive_at_from != positive_at_to {
            report(to, positive_at_to);
        }
        return;
    }
    let series = Chebyshev::<COEFFICIENTS>::fit(from, to, f);
    let tail = series.tail();
    let (low, high) = series.loose_bounds();
    let clear = low > 2.0 * tail || high < -2.0 * tail;
    if clear && positive_at_from == positive_at_to && tail < 1e-2 {
        return;
    }
    if tail < tolerance || depth >= DEEPEST {
        for crossing in series.crossings_between(positive_at_from, positive_at_to).iter() {
            report(crossing.at, crossing.rising);
        }
        return;
    }
    let middle = 0.5 * (from + to);
    let positive = f(middle) >= 0.0;
    changes_of(f, from, middle, positive_at_from, positive, tolerance, depth + 1, report);
    changes_of(f, middle, to, positive, positive_at_to, tolerance, depth + 1, report);
}

#[cfg(test)]
mod tests {
    use super::*;

    fn moon(altitude_deg: f64, separation_deg: f64, phase_angle_deg: f64) -> Option<MoonLight> {
        Some(MoonLight {
            sin_altitude: (altitude_deg * RADIANS_PER_DEGREE).sin(),
            separation: separation_deg * RADIANS_PER_DEGREE,
            phase_angle: phase_angle_deg * RADIANS_PER_DEGREE,
        })
    }

    #[test]
    fn the_dark_sky_and_the_full_moon() {
        let model = SkyModel::default();
        // The zenith of the moonless sky is what the model says; 79.0 nL is 21.587 mag [M, the paper].
        assert!((sky_brightness(&model, 1.0, None) - 21.587).abs() < 1e-5);
        assert!((34.08 * (20.7233f64 - 0.92104 * 21.587).exp() - 79.0).abs() < 0.1);
        // At 60° zenith distance airmass 1.89 by equation 3: 2.5 log X − k (X − 1) brighter.
        let x = airmass(0.5);
        assert!((x - 1.890).abs() < 1e-3);
        let brighter = 2.5 * x.log10() - 0.172 * (x - 1.0);
        assert!((sky_brightness(&model, 0.5, None) - (21.587 - brighter)).abs() < 1e-4);
        // A full Moon at 60° altitude, 60° away, makes the zenith distance of 30° some 3 mag brighter (common
        // practice: V 18 to 19 at full Moon); a half Moon about 1.6 mag less than the full one.
        let full = sky_brightness(&model, 0.866, moon(60.0, 60.0, 0.0));
        assert!((17.5..19.0).contains(&full), "{full}");
        let half = sky_brightness(&model, 0.866, moon(60.0, 60.0, 90.0));
        assert!((1.0..2.6).contains(&(half - full)), "{half}");
        // Below the horizon it gives no light, and nothing looks there.
        assert_eq!(sky_brightness(&model, 0.866, moon(-1.0, 60.0, 0.0)), sky_brightness(&model, 0.866, None));
        assert!(sky_brightness(&model, -0.1, None).is_nan());
        // The nearer the brighter, but for the formula's step at 10°, and finite at the Moon itself.
        let near = |degrees: f64| sky_brightness(&model, 0.866, moon(60.0, degrees, 0.0));
        assert!(near(0.0).is_finite() && near(0.0) == near(0.2) && near(0.2) < near(5.0));
        assert!(near(5.0) < near(15.0) && near(15.0) < near(60.0));
    }

    #[test]
    fn every_change_of_sign_is_reported() {
        // Two zeros 2e-5 apart, in a function that needs halving.
        let f = |x: f64| ((x - 0.3) * (x - 0.30002)) * (40.0 * x).cos().exp();
        let mut found = Vec::new();
        changes_of(&f, 0.0, 1.0, true, true, 1e-12, 0, &mut |at, rising| found.push((at, rising)));
        assert_eq!(found.len(), 2, "{found:?}");
        assert!((found[0].0 - 0.3).abs() < 1e-7 && !found[0].1);
        assert!((found[1].0 - 0.30002).abs() < 1e-7 && found[1].1);
    }
}
