//! Distance of a target from the Sun or the Moon over one day.
//!
//! Both directions are proper ones, as the observer on the turning Earth sees them without air. Their
//! scalar product is a smooth function of the day whose fastest part is the Moon's diurnal parallax,
//! so a Chebyshev series through a few samples holds it to 1e-11; a bound on how far the body strays
//! from where it stands at the middle of the day settles most targets without any series.

use super::intervals::{Interval, IntervalSet};
use crate::astrometry::Sky;
use crate::ephemeris::Body;
use crate::error::Status;
use crate::events::{Arc, DayPath, SEPARATION_NODES, directions_at, node_fraction};
use crate::math::chebyshev::Chebyshev;
use crate::math::vector::{Matrix, Vector, angle, dot, rotate_back};
use std::f64::consts::PI;

const NODES: usize = SEPARATION_NODES;
/// The node at the middle of the day.
const MIDDLE: usize = NODES / 2;

/// From the CIRS to the horizon at the nodes of a day; shared by all bodies and targets.
#[derive(Debug, Clone)]
pub(super) struct Nodes {
    skies: Vec<Sky>,
    cirs_to_horizon: Vec<Matrix>,
}

impl Nodes {
    pub(super) fn new(arc: &Arc<'_>) -> std::result::Result<Self, Status> {
        Ok(Nodes {
            skies: arc.skies::<NODES>()?,
            cirs_to_horizon: (0..NODES).map(|j| arc.cirs_to_horizon(node_fraction::<NODES>(j))).collect(),
        })
    }
}

/// A body from which targets keep a distance during one day.
#[derive(Debug, Clone)]
pub(super) struct Keepout {
    /// Direction on the horizon at the nodes.
    local: Vec<Vector>,
    /// The farthest it strays from where it stands at the middle of the day, radians.
    reach: f64,
}

impl Keepout {
    pub(super) fn new(arc: &Arc<'_>, nodes: &Nodes, body: Body) -> std::result::Result<Self, Status> {
        let local = directions_at(arc, &nodes.skies, body)?;
        let fixed = |j: usize| rotate_back(&nodes.cirs_to_horizon[j], local[j]);
        let farthest = (0..NODES).map(|j| angle(fixed(j), fixed(MIDDLE))).fold(0.0, f64::max);
        // The outermost nodes stand 0.2% of a day from its ends; precession, aberration and the
        // curve between nodes are far below a percent of the way.
        Ok(Keepout { local, reach: 1.02 * farthest + 1e-4 })
    }

    /// Makes `set` the part of `range` in which the target is at least `least` radians away.
    pub(super) fn fill<P: DayPath>(
        &self,
        arc: &Arc<'_>,
        nodes: &Nodes,
        path: &P,
        least: f64,
        range: Interval,
        reason: u8,
        set: &mut IntervalSet,
    ) {
        let middle = node_fraction::<NODES>(MIDDLE);
        let reach = self.reach + path.reach();
        let cos_middle = dot(path.local_by(arc, middle, &nodes.cirs_to_horizon[MIDDLE]), self.local[MIDDLE]);
        set.clear();
        if least + reach < PI && cos_middle < (least + reach).cos() {
            set.push(range);
            return;
        }
        if least > reach && cos_middle > (least - reach).cos() {
            return;
        }
        let cos_least = least.cos();
        let mut j = 0;
        let apart = Chebyshev::<NODES>::fit(0.0, 1.0, |fraction| {
            let target = path.local_by(arc, fraction, &nodes.cirs_to_horizon[j]);
            let cos = dot(target, self.local[j]);
            j += 1;
            cos_least - cos
        });
        let crossings = apart.crossings();
        let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising));
        set.fill_from_changes(range, apart.value(0.0) >= 0.0, changes, reason);
    }
}
