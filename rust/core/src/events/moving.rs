//! A target of the solar system during one day of TT: the exact chain on Chebyshev nodes.
//!
//! Twenty-five nodes hold the rotation of the Earth to 1e-16. What else bends the path is how near the target
//! passes: at the distance b and the speed v the direction has a singularity b/v from the instant of closest
//! approach, and 25 coefficients hold 0.01 au at 20 km/s to 1e-15, 0.003 au to 1″. What the last coefficients are
//! still worth is counted into [`DayPath::error_rad`](super::DayPath::error_rad), and so is the drift of two-body motion.

use super::arc::Arc;
use crate::astrometry::{Moving, Sky};
use crate::constants::RADIANS_PER_MILLIARCSECOND;
use crate::error::Status;
use crate::math::chebyshev::{Chebyshev, ChebyshevVector};
use crate::math::vector::{Vector, norm, rotate, sub};

/// Error of the compact ephemeris in direction, radians, as its tests hold it.
pub const BODY_ARC_ERROR_RAD: f64 = RADIANS_PER_MILLIARCSECOND;

/// Coefficients of a body's Chebyshev series over a day. The fastest term is the rotation of the
/// Earth, whose coefficients fall as the Bessel functions J_k(π): below 1e-16 from the 22nd.
pub const BODY_NODES: usize = 25;

/// A body of the solar system during one day: its topocentric direction on the horizon.
#[derive(Debug, Clone)]
pub struct BodyArc {
    /// North, east, zenith over the fraction of the day.
    pub local: ChebyshevVector<BODY_NODES, 3>,
    /// At the beginning and at the end of the day, from the chain itself: the end of one day and the
    /// beginning of the next are the same bits.
    pub ends: [Vector; 2],
    /// What is to be said of the target during the day.
    pub note: Status,
    /// What the path may be off, radians.
    pub error_rad: f64,
}

impl BodyArc {
    /// From the skies of [`Arc::skies`]`::<BODY_NODES>`.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`], or the status of a row without an orbit.
    pub fn new<'t>(
        arc: &Arc<'_>,
        skies: &[Sky],
        target: impl Into<Moving<'t>>,
    ) -> std::result::Result<Self, Status> {
        let target = target.into();
        let mut seen = Seen { nearest_au: f64::INFINITY };
        let local = series_of(&seen.directions(arc, skies, target)?);
        let ends = seen.directions(arc, arc.skies_at_ends(), target)?;
        let ends = [ends[0], ends[1]];
        let (own_error_rad, note) = match target {
            Moving::Body(_) => (BODY_ARC_ERROR_RAD, Status::Ok),
            Moving::Orbit(orbits, row) => {
                // It grows away from the epoch: within the day it is largest at an end.
                let drift = |sky: &Sky| {
                    let tdb = sky.tdb();
                    let error = orbits.drift_au(row, tdb) / seen.nearest_au;
                    (error, orbits.status_at(row, tdb, seen.nearest_au))
                };
                let [(start, note), (stop, later)] = arc.skies_at_ends().each_ref().map(drift);
                (start.max(stop), note.worst(later))
            }
        };
        Ok(BodyArc { error_rad: own_error_rad + left_out(&local, &ends), local, ends, note })
    }

    /// The series of one component: 0 north, 1 east, 2 zenith.
    pub fn component(&self, axis: usize) -> Chebyshev<BODY_NODES> {
        self.local.component(axis)
    }
}

/// What the series leaves out, radians: what its last coefficients and its values at the ends of the day say.
fn left_out(local: &ChebyshevVector<BODY_NODES, 3>, ends: &[Vector; 2]) -> f64 {
    const LAST: usize = 3;
    let tail: f64 = (0..3)
        .map(|axis| {
            let component = local.component(axis);
            component.coefficients()[BODY_NODES - LAST..].iter().map(|c| c.abs()).sum::<f64>()
        })
        .sum();
    let at_ends = norm(sub(local.value(0.0), ends[0])).max(norm(sub(local.value(1.0), ends[1])));
    4.0 * tail + 2.0 * at_ends
}

/// Direction of a body on the horizon at each sky.
///
/// # Errors
/// [`Status::OutsideEphemeris`].
pub fn directions_at<'t>(
    arc: &Arc<'_>,
    skies: &[Sky],
    target: impl Into<Moving<'t>>,
) -> std::result::Result<Vec<Vector>, Status> {
    Seen { nearest_au: f64::INFINITY }.directions(arc, skies, target.into())
}

/// How near a target was while it was looked at.
struct Seen {
    nearest_au: f64,
}

impl Seen {
    fn directions(
        &mut self,
        arc: &Arc<'_>,
        skies: &[Sky],
        target: Moving<'_>,
    ) -> std::result::Result<Vec<Vector>, Status> {
        skies
            .iter()
            .map(|sky| {
                let seen = target.direction(arc.observer.ephemeris, sky)?;
                self.nearest_au = self.nearest_au.min(seen.light_distance_au);
                Ok(rotate(&sky.local, seen.direction))
            })
            .collect()
    }
}

/// The series over the day through samples at its Chebyshev nodes.
fn series_of<const N: usize>(samples: &[Vector]) -> ChebyshevVector<N, 3> {
    let mut next = samples.iter();
    ChebyshevVector::fit(0.0, 1.0, |_| *next.next().expect("as many samples as nodes"))
}
