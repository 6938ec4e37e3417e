//! A target of the solar system during one day of TT: the exact chain on Chebyshev nodes.
//!
//! Twenty-five nodes hold the rotation of the Earth to 1e-16. What else bends the path is how near the target
//! passes: at the distance b and the speed v the direction has a singularity b/v from the instant of closest
//! approach, and 25 coefficients hold 0.01 au at 20 km/s to 1e-15, 0.003 au to 1″. What the last coefficients are
//! still worth is counted into [`DayPath::error_rad`](super::DayPath::error_rad), and so is the drift of two-body motion.

use super::arc::Arc;
use crate::astrometry::{Sky, body_direction, near_direction};
use crate::constants::RADIANS_PER_MILLIARCSECOND;
use crate::ephemeris::Body;
use crate::ephemeris::orbits::{Look, Orbits};
use crate::error::Status;
use crate::math::chebyshev::{Chebyshev, ChebyshevVector};
use crate::math::dispatch::Isa;
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

/// What the paths of all orbits on a day share: the observer's skies at the nodes, then at both ends of the day.
#[derive(Debug, Clone)]
pub struct MovingNodes {
    /// The skies at the nodes, from the end to the beginning.
    pub skies: Vec<Sky>,
    looks: Vec<Look>,
}

impl MovingNodes {
    /// On a day.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn new(arc: &Arc<'_>) -> std::result::Result<Self, Status> {
        let skies = arc.skies::<BODY_NODES>()?;
        let looks = skies
            .iter()
            .chain(arc.skies_at_ends())
            .map(|sky| {
                let tdb = sky.tdb();
                let sun = arc.observer.ephemeris.state(Body::Sun, tdb)?;
                Ok(Look { tdb, observer_au: sky.observer_au, sun })
            })
            .collect::<std::result::Result<_, Status>>()?;
        Ok(MovingNodes { skies, looks })
    }
}

impl BodyArc {
    /// From the skies of [`Arc::skies`]`::<BODY_NODES>`.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn new(arc: &Arc<'_>, skies: &[Sky], body: Body) -> std::result::Result<Self, Status> {
        let directions = directions_at(arc, skies, body)?;
        let ends = directions_at(arc, arc.skies_at_ends(), body)?;
        let ends = [ends[0], ends[1]];
        let local = series_of(&directions);
        let error_rad = BODY_ARC_ERROR_RAD + left_out(&local, &ends);
        Ok(BodyArc { local, ends, note: Status::Ok, error_rad })
    }

    /// Of a row of orbits.
    pub fn of_orbit(arc: &Arc<'_>, nodes: &MovingNodes, orbits: &Orbits, row: usize) -> Self {
        let mut vectors = [[0.0; 3]; BODY_NODES + 2];
        orbits.astrometric_at(Isa::best(), row, &nodes.looks, &mut vectors);
        let mut nearest_au = f64::INFINITY;
        let mut see = |sky: &Sky, vector: Vector| {
            let seen = near_direction(vector, sky);
            nearest_au = nearest_au.min(seen.light_distance_au);
            rotate(&sky.local, seen.direction)
        };
        let samples = std::array::from_fn(|j| see(&nodes.skies[j], vectors[j]));
        let local = ChebyshevVector::through(0.0, 1.0, &samples);
        let [start, stop] = arc.skies_at_ends();
        let ends = [see(start, vectors[BODY_NODES]), see(stop, vectors[BODY_NODES + 1])];
        // The drift grows away from the epoch: within the day it is largest at an end.
        let at_ends = [nodes.looks[BODY_NODES].tdb, nodes.looks[BODY_NODES + 1].tdb];
        let drift_au = at_ends.map(|tdb| orbits.drift_au(row, tdb)).into_iter().fold(0.0, f64::max);
        let note = at_ends.map(|tdb| orbits.status_at(row, tdb, nearest_au));
        BodyArc {
            error_rad: drift_au / nearest_au + left_out(&local, &ends),
            local,
            ends,
            note: note[0].worst(note[1]),
        }
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
pub fn directions_at(arc: &Arc<'_>, skies: &[Sky], body: Body) -> std::result::Result<Vec<Vector>, Status> {
    skies
        .iter()
        .map(|sky| Ok(rotate(&sky.local, body_direction(body, arc.observer.ephemeris, sky)?.direction)))
        .collect()
}

/// The series over the day through samples at its Chebyshev nodes.
fn series_of<const N: usize>(samples: &[Vector]) -> ChebyshevVector<N, 3> {
    ChebyshevVector::through(0.0, 1.0, samples.try_into().expect("as many samples as nodes"))
}
