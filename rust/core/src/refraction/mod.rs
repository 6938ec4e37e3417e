//! Refraction by the air above a site, both ways, and airmass.
//!
//! The bending is traced numerically (`ray`) through a model atmosphere (`profile`) fixed by what the
//! site measures ([`Atmosphere`]), tabulated once (`table`), and then costs a few nanoseconds a direction.

mod airmass;
mod atmosphere;
mod profile;
mod ray;
mod table;

use crate::error::Result;
use crate::math::roots::newton_between;
use profile::Profile;
use std::f64::consts::FRAC_PI_2;
use table::{KNOTS, OctaveCubic, Slopes};

pub use airmass::AirmassModel;
pub use atmosphere::Atmosphere;

/// Refraction at one site, tabulated.
///
/// *Topocentric* altitude is that of the direction in vacuum, *observed* altitude that of the ray where it
/// arrives, of one and the same target. Azimuth does not change: the air lies in spherical shells.
///
/// # Range
/// From the zenith down to [`lowest_observed_altitude`](Refraction::lowest_observed_altitude), below the dip
/// of the sea horizon: −1° at sea level, −1.79° at 1000 m, −3.5° at 10 km. Rays that arrive from below the
/// horizontal are followed through their perigee, in the same troposphere continued below the site. Lower
/// than that the bending is **held constant**: the mapping stays continuous and strictly increasing, but its
/// slope jumps there and it says nothing about nature.
///
/// # Error
/// - The mapping is strictly increasing, and twice continuously differentiable above the lowest altitude; the
///   inverse undoes it to 4.5e-16 rad (tests `increases_and_has_its_slope`, `round_trip`).
/// - The table stays within 4e-10 rad (0.0001″) of the traced ray for sites from the sea to 6 km in all but
///   polar cold, within 1.5e-9 rad anywhere above the sea horizon, and within 3e-8 rad (0.006″) in the last
///   degree of the range (test `table_follows_the_traced_ray`).
/// - The traced ray is within 0.1″ of a published trace to 80° zenith distance, and within 0.1′ of the
///   Pulkovo tables at the horizon (tests `hohenkerk_sinclair_table`, `pulkovo_horizontal_refraction`).
/// - Real air at the horizon scatters by 0.17° from day to day (Sampson et al. 2003, PASP 115, 1256).
#[derive(Debug, Clone)]
pub struct Refraction {
    /// Bending against topocentric altitude; all zero where there is no air, so that the hot path has no
    /// branch.
    bending: OctaveCubic,
    lowest_observed: f64,
    lowest_topocentric: f64,
}

impl Refraction {
    /// Traces and tabulates the refraction of a site: latitude in radians, height in metres above the
    /// ellipsoid (−500 to 10,000). With a pressure of 0 there is none, exactly. Takes some 2 ms.
    pub fn new(atmosphere: &Atmosphere, latitude: f64, height_m: f64) -> Result<Self> {
        atmosphere.check()?;
        atmosphere::check_place(latitude, height_m)?;
        if atmosphere.pressure_hpa == 0.0 {
            return Ok(Self::none());
        }
        Ok(Self::tabulate(&Profile::new(atmosphere, latitude, height_m)))
    }

    /// No refraction: observed and topocentric altitudes are the same bits, to the nadir.
    pub fn none() -> Self {
        Self { bending: OctaveCubic::zero(), lowest_observed: -FRAC_PI_2, lowest_topocentric: -FRAC_PI_2 }
    }

    fn tabulate(profile: &Profile) -> Self {
        let tracer = ray::Tracer::new(profile);
        let lowest_observed = tracer.lowest_altitude();
        let traced = tabulate_against_observed(&tracer, lowest_observed);
        let lowest_topocentric = lowest_observed - tracer.bending(lowest_observed);

        // The table that is kept has the topocentric altitude as its variable: solve each knot for the
        // observed one.
        let solve = |topocentric: f64| {
            let mapping = |observed: f64| {
                let (bending, slope) = traced.value_and_slope(observed - lowest_observed);
                (observed - bending - topocentric, 1.0 - slope)
            };
            let highest = (topocentric + GREATEST_BENDING).max(lowest_observed);
            let start = topocentric.max(lowest_observed);
            let observed = newton_between(mapping, lowest_observed, highest, true, start, 1e-15);
            let slope = traced.value_and_slope(observed - lowest_observed).1;
            (observed - topocentric, slope / (1.0 - slope))
        };
        let knots: Vec<(f64, f64)> = (0..KNOTS).map(|i| solve(lowest_topocentric + table::knot(i))).collect();
        let values = std::array::from_fn(|i| knots[i].0);
        let bending = OctaveCubic::spline(&values, Slopes { first: knots[0].1, last: knots[KNOTS - 1].1 });
        Self { bending, lowest_observed, lowest_topocentric }
    }

    /// Observed altitude of a target at a topocentric altitude in the range −π/2 to π/2, radians. NaN for
    /// NaN.
    #[inline]
    pub fn observed_altitude(&self, topocentric_altitude: f64) -> f64 {
        topocentric_altitude + self.bending.value(topocentric_altitude - self.lowest_topocentric)
    }

    /// Topocentric altitudes made observed ones, in place: the same bits, in loops to be compiled by
    /// [`dispatch`](crate::math::dispatch).
    #[inline(always)]
    pub fn observe(&self, altitudes: &mut [f64]) {
        self.bending.add_values(self.lowest_topocentric, altitudes);
    }

    /// The same as [`observed_altitude`](Refraction::observed_altitude), with its derivative with respect to the
    /// topocentric altitude. That is positive, below 1 but for air laden with vapour, and exactly 1 under the
    /// lowest altitude.
    #[inline]
    pub fn observed_altitude_and_slope(&self, topocentric_altitude: f64) -> (f64, f64) {
        let (bending, slope) = self.bending.value_and_slope(topocentric_altitude - self.lowest_topocentric);
        (topocentric_altitude + bending, 1.0 + slope)
    }

    /// Topocentric altitude of what is observed at an altitude, radians: the inverse of
    /// [`observed_altitude`](Refraction::observed_altitude) to its last places, by Newton on the same table.
    pub fn topocentric_altitude(&self, observed_altitude: f64) -> f64 {
        if !observed_altitude.is_finite() {
            return observed_altitude;
        }
        if observed_altitude <= self.lowest_observed {
            // The bending is that of the table's first knot, whatever the altitude.
            return observed_altitude - self.bending.value(0.0);
        }
        let mapping = |topocentric: f64| {
            let (found, slope) = self.observed_altitude_and_slope(topocentric);
            (found - observed_altitude, slope)
        };
        let start = observed_altitude - self.bending.value(observed_altitude - self.lowest_topocentric);
        let highest = observed_altitude + GREATEST_BENDING;
        newton_between(mapping, self.lowest_topocentric, highest, true, start, 4e-16)
    }

    /// Bending of the ray that arrives at an observed altitude, radians: observed minus topocentric.
    pub fn bending_at_observed(&self, observed_altitude: f64) -> f64 {
        observed_altitude - self.topocentric_altitude(observed_altitude)
    }

    /// Observed altitude, radians, below which the bending is held constant; −π/2 without refraction.
    ///
    /// It is −(1° + 2.5° √(h/10 km)), or −1° for a site below sea level. It lies higher only in air that
    /// hardly exists: so dense and cold that rays are nearly trapped a little below the site, or so hot and
    /// moist at a height that the model's vapour, continued downward, would drive out the air.
    pub fn lowest_observed_altitude(&self) -> f64 {
        self.lowest_observed
    }

    /// Topocentric altitude that belongs to the lowest observed one, radians.
    pub fn lowest_topocentric_altitude(&self) -> f64 {
        self.lowest_topocentric
    }
}

/// More than any bending that is tabulated, and than the negative ones just past the zenith, radians.
const GREATEST_BENDING: f64 = 0.2;

/// The bending of traced rays against observed altitude above the lowest, with knots past the zenith too:
/// there the ray is that of the other side with the other sign.
fn tabulate_against_observed(tracer: &ray::Tracer, lowest_observed: f64) -> OctaveCubic {
    let bending = |altitude: f64| {
        if altitude <= FRAC_PI_2 {
            tracer.bending(altitude)
        } else {
            -tracer.bending(2.0 * FRAC_PI_2 - altitude)
        }
    };
    // Fourth-order central difference; the rays are smooth to 1e-16, and can be followed a little below the
    // lowest.
    let slope = |altitude: f64| {
        let step = 1e-4;
        let difference = |width: f64| (bending(altitude + width) - bending(altitude - width)) / (2.0 * width);
        (4.0 * difference(step) - difference(2.0 * step)) / 3.0
    };
    let altitude = |i: usize| lowest_observed + table::knot(i);
    let values = std::array::from_fn(|i| bending(altitude(i)));
    OctaveCubic::spline(&values, Slopes { first: slope(altitude(0)), last: slope(altitude(KNOTS - 1)) })
}

#[cfg(test)]
mod tests;
