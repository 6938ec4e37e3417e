//! Bending of a ray by a spherical atmosphere, as an integral over its local zenith distance.
//!
//! L. H. Auer & E. M. Standish, *Astronomical refraction: computational method for all zenith angles*, AJ
//! 119, 2472 (2000). Along a ray n r sin ψ is constant, and with ψ, the zenith distance of
//! the ray where it is, as the variable the bending is the integral of −r n′/(n + r n′), whose integrand is
//! bounded and smooth at all zenith distances: at the horizontal, and through the perigee of a ray that
//! arrives from below it, where ψ simply passes 90°.

use super::profile::{Index, Profile};
use std::f64::consts::{FRAC_PI_2, PI};

/// Gauss–Legendre points in a layer. More change no bending by 1e-13 rad (test `enough_points`).
const TROPOSPHERE_POINTS: usize = 26;
const STRATOSPHERE_POINTS: usize = 28;

/// Traces rays through one profile.
pub(super) struct Tracer<'a> {
    profile: &'a Profile,
    troposphere: Vec<(f64, f64)>,
    stratosphere: Vec<(f64, f64)>,
    /// n r at the site, the tropopause and the top.
    site: f64,
    tropopause: f64,
    top: f64,
}

impl<'a> Tracer<'a> {
    pub fn new(profile: &'a Profile) -> Self {
        Self::with_points(profile, TROPOSPHERE_POINTS, STRATOSPHERE_POINTS)
    }

    pub fn with_points(profile: &'a Profile, troposphere: usize, stratosphere: usize) -> Self {
        let Profile { site_m, tropopause_m, top_m, .. } = *profile;
        Self {
            profile,
            troposphere: gauss_legendre(troposphere),
            stratosphere: gauss_legendre(stratosphere),
            site: profile.troposphere(site_m).optical_radius(site_m),
            tropopause: profile.troposphere(tropopause_m).optical_radius(tropopause_m),
            top: profile.stratosphere(top_m).optical_radius(top_m),
        }
    }

    /// The lowest observed altitude worth tabulating, radians: that of the profile, unless the bending stops
    /// growing before. It does where air laden with vapour is continued far below the site, as the model's
    /// vapour rises faster than its pressure; a little further down rays would cross and no mapping exist.
    pub fn lowest_altitude(&self) -> f64 {
        const STEPS: usize = 50;
        let lowest = self.profile.lowest_altitude();
        let altitude = |i: usize| lowest * i as f64 / STEPS as f64;
        let mut before = self.bending(0.0);
        for i in 1..=STEPS {
            let bending = self.bending(altitude(i));
            if bending <= before {
                return altitude(i - 1);
            }
            before = bending;
        }
        lowest
    }

    /// Bending, radians, of the ray that arrives at an observed altitude from the profile's lowest to π/2.
    pub fn bending(&self, observed_altitude: f64) -> f64 {
        let invariant = self.site * observed_altitude.cos();
        let zenith_distance = FRAC_PI_2 - observed_altitude;
        if zenith_distance <= 0.0 {
            return 0.0;
        }
        let at_tropopause = (invariant / self.tropopause).asin();
        let at_top = (invariant / self.top).asin();
        let profile = self.profile;
        let lower = self.layer(
            &self.troposphere,
            |radius_m| profile.troposphere(radius_m),
            invariant,
            [at_tropopause, zenith_distance],
            [(profile.tropopause_m, self.tropopause), (profile.site_m, self.site)],
        );
        let upper = self.layer(
            &self.stratosphere,
            |radius_m| profile.stratosphere(radius_m),
            invariant,
            [at_top, at_tropopause],
            [(profile.top_m, self.top), (profile.tropopause_m, self.tropopause)],
        );
        // The air left above the top, as one thin layer: Snell's law for a refractivity of some 1e-9.
        let above = profile.stratosphere(profile.top_m).refractivity * at_top.tan();
        lower + upper + above
    }

    /// The integral over one layer. `ends`: radius and n r at its two boundaries, which give the first guess
    /// of the radius where n r has a value, n r being nearly linear in r.
    fn layer(
        &self,
        points: &[(f64, f64)],
        index: impl Fn(f64) -> Index,
        invariant: f64,
        [from, to]: [f64; 2],
        [(r1, q1), (r2, q2)]: [(f64, f64); 2],
    ) -> f64 {
        let half = 0.5 * (to - from);
        let metres_per_optical = (r2 - r1) / (q2 - q1);
        let mut sum = 0.0;
        for &(node, weight) in points {
            let optical_radius = invariant / (from + half * (1.0 + node)).sin();
            let mut radius_m = r1 + (optical_radius - q1) * metres_per_optical;
            // A step leaves an error of its square over the scale height: after one of 1e-2 m that is 1e-8 m.
            let mut here = index(radius_m);
            for _ in 0..12 {
                let step = (here.optical_radius(radius_m) - optical_radius) / here.optical_slope(radius_m);
                radius_m -= step;
                here = index(radius_m);
                if step.abs() < 1e-2 {
                    break;
                }
            }
            sum -= weight * radius_m * here.gradient / here.optical_slope(radius_m);
        }
        half * sum
    }
}

/// Nodes on (−1, 1) and weights, by Newton on the Legendre polynomial's recurrence (Abramowitz & Stegun
/// 25.4.29).
fn gauss_legendre(points: usize) -> Vec<(f64, f64)> {
    (0..points)
        .map(|i| {
            let mut x = (PI * (i as f64 + 0.75) / (points as f64 + 0.5)).cos();
            let mut derivative = 1.0;
            for _ in 0..8 {
                let (mut before, mut here) = (1.0, x);
                for k in 2..=points {
                    let k = k as f64;
                    (before, here) = (here, ((2.0 * k - 1.0) * x * here - (k - 1.0) * before) / k);
                }
                derivative = points as f64 * (x * here - before) / (x * x - 1.0);
                x -= here / derivative;
            }
            (x, 2.0 / ((1.0 - x * x) * derivative * derivative))
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quadrature_is_exact_for_polynomials() {
        let points = gauss_legendre(12);
        for power in 0..24 {
            let found: f64 = points.iter().map(|(x, w)| w * x.powi(power)).sum();
            let exact = if power % 2 == 0 { 2.0 / (power as f64 + 1.0) } else { 0.0 };
            assert!((found - exact).abs() < 1e-14, "{power}");
        }
    }
}
