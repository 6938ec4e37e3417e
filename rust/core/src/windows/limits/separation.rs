//! Distance of a target from the Sun or the Moon over one day, and what the Moon's phase asks of it.
//!
//! Both directions are proper ones, as the observer on the turning Earth sees them without air. Their
//! scalar product is a smooth function of the day whose fastest part is the Moon's diurnal parallax,
//! so a Chebyshev series through a few samples holds it to 1e-11; a bound on how far the body strays
//! from where it stands at the middle of the day settles most targets without any series.

use super::super::intervals::{Interval, IntervalSet};
use super::MoonAvoidance;
use crate::astrometry::Sky;
use crate::constants::TURN;
use crate::ephemeris::Body;
use crate::error::Status;
use crate::events::{
    Arc, BodyArc, DayPath, SEPARATION_NODES, STAR_REACH_RAD, SYNODIC_MONTH_D, directions_at, moon_elongation,
    node_fraction,
};
use crate::math::chebyshev::Chebyshev;
use crate::math::vector::{Matrix, Vector, angle, dot, rotate_back};
use std::f64::consts::PI;

const NODES: usize = SEPARATION_NODES;
/// The node at the middle of the day.
const MIDDLE: usize = NODES / 2;

/// From the CIRS to the horizon at the nodes of a day; shared by all bodies and targets.
#[derive(Debug, Clone)]
pub struct Nodes {
    skies: Vec<Sky>,
    cirs_to_horizon: Vec<Matrix>,
}

impl Nodes {
    pub fn new(arc: &Arc<'_>) -> std::result::Result<Self, Status> {
        Ok(Nodes {
            skies: arc.skies::<NODES>()?,
            cirs_to_horizon: (0..NODES).map(|j| arc.cirs_to_horizon(node_fraction::<NODES>(j))).collect(),
        })
    }
}

/// The smallest distance: one value, or what it is at the nodes of the day.
#[derive(Debug, Clone, Copy)]
pub enum Least<'a> {
    /// Radians.
    Fixed(f64),
    /// Radians, from the end of the day to its beginning.
    AtNodes(&'a [f64; NODES]),
}

impl Least<'_> {
    fn at(&self, j: usize) -> f64 {
        match self {
            Least::Fixed(least) => *least,
            Least::AtNodes(least) => least[j],
        }
    }

    /// Smallest and largest during the day; beyond the outermost nodes it moves by far less than 0.01.
    fn bounds(&self) -> (f64, f64) {
        match self {
            Least::Fixed(least) => (*least, *least),
            Least::AtNodes(least) => (
                least.iter().copied().fold(f64::INFINITY, f64::min) - 0.01,
                least.iter().copied().fold(f64::NEG_INFINITY, f64::max) + 0.01,
            ),
        }
    }
}

/// A body from which targets keep a distance during one day.
#[derive(Debug, Clone)]
pub struct Keepout {
    /// Its path over the day.
    pub body: BodyArc,
    /// Direction on the horizon at the nodes.
    local: Vec<Vector>,
    /// The farthest it strays from where it stands at the middle of the day, radians.
    reach: f64,
    /// A distance that is the same for all targets, and the cosines beyond which it is settled for stars.
    settled: Option<Settled>,
}

/// Cosines of the distance at the middle of the day by which a smallest distance is settled.
#[derive(Debug, Clone, Copy)]
struct Settled {
    /// The smallest and largest distance asked for, and how far body and target may come closer.
    asked: (f64, f64, f64),
    /// Below this the target is far enough all day.
    far: f64,
    /// Above this it is too near all day.
    near: f64,
}

impl Settled {
    fn new(asked: (f64, f64, f64)) -> Self {
        let (smallest, largest, reach) = asked;
        Settled {
            asked,
            far: if largest + reach < PI { (largest + reach).cos() } else { f64::NEG_INFINITY },
            near: if smallest > reach { (smallest - reach).cos() } else { f64::INFINITY },
        }
    }
}

impl Keepout {
    pub fn new(arc: &Arc<'_>, nodes: &Nodes, body: Body, path: BodyArc) -> std::result::Result<Self, Status> {
        let local = directions_at(arc, &nodes.skies, body)?;
        let fixed = |j: usize| rotate_back(&nodes.cirs_to_horizon[j], local[j]);
        let farthest = (0..NODES).map(|j| angle(fixed(j), fixed(MIDDLE))).fold(0.0, f64::max);
        // The outermost nodes stand 0.2% of a day from its ends; precession, aberration and the
        // curve between nodes are far below a percent of the way.
        Ok(Keepout { body: path, local, reach: 1.02 * farthest + 1e-4, settled: None })
    }

    /// Prepares for stars and a distance that is the same for all.
    pub fn prepared(mut self, least: Option<f64>) -> Self {
        self.settled = least.map(|least| Settled::new((least, least, self.reach + STAR_REACH_RAD)));
        self
    }

    /// Makes `set` the part of `range` in which the target is at least so far away.
    pub fn fill<P: DayPath>(
        &self,
        arc: &Arc<'_>,
        nodes: &Nodes,
        path: &P,
        least: Least<'_>,
        range: Interval,
        reason: u8,
        set: &mut IntervalSet,
    ) {
        let middle = node_fraction::<NODES>(MIDDLE);
        let (smallest, largest) = least.bounds();
        set.clear();
        // At no distance there is no limit, not even for the body itself.
        if largest <= 0.0 {
            set.push(range);
            return;
        }
        let cos_middle = dot(path.local_by(arc, middle, &nodes.cirs_to_horizon[MIDDLE]), self.local[MIDDLE]);
        let asked = (smallest, largest, self.reach + path.reach());
        let settled = self.settled.filter(|settled| settled.asked == asked);
        let settled = settled.unwrap_or_else(|| Settled::new(asked));
        if cos_middle < settled.far {
            set.push(range);
            return;
        }
        if cos_middle > settled.near {
            return;
        }
        let mut j = 0;
        let apart = Chebyshev::<NODES>::fit(0.0, 1.0, |fraction| {
            let target = path.local_by(arc, fraction, &nodes.cirs_to_horizon[j]);
            let spare = least.at(j).cos() - dot(target, self.local[j]);
            j += 1;
            spare
        });
        let [start, stop] = [false, true].map(|end| match least {
            // The same bits for the end of one day and the beginning of the next.
            Least::Fixed(least) => {
                least.cos() >= dot(path.local_at_end(arc, end), self.body.ends[usize::from(end)])
            }
            Least::AtNodes(_) => apart.value(f64::from(u8::from(end))) >= 0.0,
        });
        let crossings = apart.crossings_between(start, stop);
        let changes = crossings.iter().map(|crossing| (crossing.at, crossing.rising));
        set.fill_from_changes(range, start, changes, reason);
    }

    /// Rate a day of the distance from the target, and the distance.
    pub fn rate<P: DayPath>(&self, arc: &Arc<'_>, path: &P, at: f64) -> (f64, f64) {
        let (target, target_rate) = path.local_and_rate(arc, at);
        let (body, body_rate) = self.body.local_and_rate(arc, at);
        let separation = angle(target, body);
        ((dot(target_rate, body) + dot(target, body_rate)) / separation.sin().max(1e-9), separation)
    }
}

/// The Moon's phase over one day.
#[derive(Debug, Clone)]
pub struct MoonPhaseDay {
    /// Elongation of the Moon in longitude less half a turn, radians, at the nodes, continuous over the
    /// day; within −π to π at its middle.
    from_full: [f64; NODES],
    /// Where that leaves −π to π: the instant of new Moon.
    new_moon: Option<f64>,
    /// Illuminated fraction.
    pub illumination: Chebyshev<NODES>,
}

impl MoonPhaseDay {
    pub fn new(arc: &Arc<'_>, illumination: Chebyshev<NODES>) -> std::result::Result<Self, Status> {
        // The Moon's elongation over a day is a parabola to 1e-6.
        const COARSE: usize = 7;
        let mut at = [0.0; COARSE];
        for (j, value) in at.iter_mut().enumerate() {
            *value = moon_elongation(&arc.observer, arc.instant(node_fraction::<COARSE>(j)))? - PI;
        }
        let middle = at[COARSE / 2];
        let shift = TURN * (middle / TURN).round();
        let mut samples = at.iter().map(|value| {
            let value = value - shift;
            let middle = middle - shift;
            value - TURN * ((value - middle) / TURN).round()
        });
        let series = Chebyshev::<COARSE>::fit(0.0, 1.0, |_| samples.next().unwrap_or(f64::NAN));
        let from_full = std::array::from_fn(|j| series.value(node_fraction::<NODES>(j)));
        let bound = if middle - shift >= 0.0 { PI } else { -PI };
        let new_moon = series.plus(-bound).first_crossing().map(|crossing| crossing.at);
        Ok(MoonPhaseDay { from_full, new_moon, illumination })
    }

    /// Makes `set` the part of `range` in which the target keeps the distance that the phase asks for.
    pub fn fill<P: DayPath>(
        &self,
        keepout: &Keepout,
        avoidance: &MoonAvoidance,
        row: usize,
        arc: &Arc<'_>,
        nodes: &Nodes,
        path: &P,
        range: Interval,
        reason: u8,
        set: &mut IntervalSet,
    ) {
        match avoidance {
            MoonAvoidance::Illumination { dark, bright } => {
                let (dark, bright) = (dark.at(row), bright.at(row));
                let least = std::array::from_fn(|j| {
                    let lit = self.illumination.value(node_fraction::<NODES>(j));
                    dark + (bright - dark) * lit
                });
                keepout.fill(arc, nodes, path, Least::AtNodes(&least), range, reason, set);
            }
            MoonAvoidance::Lorentzian { separation, width_d } => {
                let (separation, width_d) = (separation.at(row), width_d.at(row));
                let least = |shift: f64| -> [f64; NODES] {
                    std::array::from_fn(|j| {
                        let days = (self.from_full[j] + shift) / TURN * SYNODIC_MONTH_D;
                        separation / (1.0 + (days / width_d).powi(2))
                    })
                };
                let Some(new_moon) = self.new_moon else {
                    keepout.fill(arc, nodes, path, Least::AtNodes(&least(0.0)), range, reason, set);
                    return;
                };
                // At new Moon the age begins anew and the Lorentzian has a corner: either side is smooth
                // by itself, and is followed over the whole day but kept on its own side.
                let before_full = self.from_full[MIDDLE] < 0.0;
                let shifts = if before_full { [TURN, 0.0] } else { [0.0, -TURN] };
                let mut sides = [IntervalSet::new(), IntervalSet::new()];
                for (side, shift) in sides.iter_mut().zip(shifts) {
                    keepout.fill(arc, nodes, path, Least::AtNodes(&least(shift)), range, reason, side);
                }
                let mut scratch = IntervalSet::new();
                sides[0].intersect(&IntervalSet::whole(f64::NEG_INFINITY, new_moon, reason), &mut scratch);
                sides[1].intersect(&IntervalSet::whole(new_moon, f64::INFINITY, reason), &mut scratch);
                *set = sides[0].union(&sides[1]);
            }
        }
    }
}
