//! Rise, transit and set of many stars, step by step in loops over all of them.
//!
//! The same road as for one star: the chain at the beginning, the middle and the end of each day, the
//! circle at the middle, crossings in closed form, Newton's method on the arc. Each step is a loop that
//! LLVM runs on whole registers. A star for which the closed form is no good beginning (it grazes, stands
//! near a pole, or passes within a millisecond of midnight TT) is left to [`rise_transit_set`], which
//! isolates its crossings.

use super::arc::{Arc, STAR_ARC_ERROR_RAD};
use super::days::Days;
use super::passages::{Event, EventKind, Passage, rise_transit_set};
use super::passing::ROUNDING_S;
use super::scatter::horizon_scatter;
use crate::astrometry::{Catalog, Sky, StarColumns, Targets, star_direction};
use crate::constants::{EARTH_ROTATION_RAD_PER_S, SECONDS_PER_DAY, TURN};
use crate::error::Status;
use crate::math::dispatch::{Arithmetic, Isa, Kernel};
use crate::math::elementary::{acos_coarse, atan2, atan2_coarse, sin_cos, wrap_positive};
use crate::math::vector::{Matrix, rotate};
use crate::refraction::Refraction;
use crate::time::Utc;

/// Stars a batch: what a batch touches stays in the second level of the cache.
pub const BATCH: usize = 256;
/// Candidates of one day at the most: a day is a little more than a turn.
const MOST: usize = 6 * BATCH;

/// Below this diurnal range of the sine of the altitude, or this cosine of the declination, a star's
/// circle says too little.
const FLAT: f64 = 1e-2;
/// A culmination nearer to the threshold than this, in the sine of the altitude, is a grazing.
const GRAZING: f64 = 1e-5;
/// Room about the span for what the closed form is off by, days.
const ROOM: f64 = 1e-3;
/// A second step of Newton's method below this, days, leaves less than a microsecond.
const CONVERGED: f64 = 1e-7;
/// About midnight the sign at the node decides which day an event belongs to.
const MIDNIGHT: f64 = 1e-8;
/// Half-arc of a star that never sets.
const ALL_ROUND: f64 = 10.0;

type Column = [f64; BATCH];

/// What a thread keeps from batch to batch.
pub struct BatchSpace {
    /// Directions in the CIRS of the Earth's centre at the three nodes of the day.
    nodes: [[Column; 3]; 3],
    /// Fraction of the day of the upper culmination nearest to noon TT, days from one to the next, days
    /// from it to the crossings (negative: none), and the star's margin at its culminations.
    upper: Column,
    period: Column,
    half_arc: Column,
    /// Whether the star is left to the other road.
    set_aside: Column,
    candidates: Candidates,
    found: Vec<(u16, Event)>,
    /// Places in `found`, star by star.
    order: Vec<u32>,
}

/// Events looked for in one day: a row each.
struct Candidates {
    count: usize,
    star: [u16; MOST],
    kind: [EventKind; MOST],
    /// Coefficients of the star's direction over the day.
    direction: [[f64; MOST]; 9],
    /// 1 for a transit, 0 for a crossing.
    transit: [f64; MOST],
    /// Fraction of the day: the guess, then the event.
    at: [f64; MOST],
    step: [f64; MOST],
    azimuth: [f64; MOST],
    altitude: [f64; MOST],
    error_s: [f64; MOST],
    scatter_s: [f64; MOST],
    /// 1 where the event may not happen.
    doubtful: [f64; MOST],
}

impl Default for BatchSpace {
    fn default() -> Self {
        let none = [0.0; BATCH];
        let row = [0.0; MOST];
        BatchSpace {
            nodes: [[none; 3]; 3],
            upper: none,
            period: none,
            half_arc: none,
            set_aside: none,
            candidates: Candidates {
                count: 0,
                star: [0; MOST],
                kind: [EventKind::Rise; MOST],
                direction: [row; 9],
                transit: row,
                at: row,
                step: row,
                azimuth: row,
                altitude: row,
                error_s: row,
                scatter_s: row,
                doubtful: row,
            },
            found: Vec::new(),
            order: Vec::new(),
        }
    }
}

/// Appends the events of up to [`BATCH`] stars from `first` on, star by star in order of time, and what
/// is to be said of each: how many events, and as [`rise_transit_set`] does.
pub fn star_events(
    days: &Days<'_>,
    catalog: &Catalog,
    rows: std::ops::Range<usize>,
    threshold: f64,
    isa: Isa,
    space: &mut BatchSpace,
    events: &mut Vec<Event>,
    summaries: &mut Vec<(usize, (Passage, Status))>,
) {
    let stars = catalog.columns(rows.clone());
    let count = stars.len();
    let refraction = days.observer().refraction;
    let topocentric = refraction.topocentric_altitude(threshold);
    let scatter = horizon_scatter(refraction, threshold);
    let mut passages = [Passage::Crosses; BATCH];
    space.found.clear();
    space.set_aside[..count].fill(0.0);
    for (index, arc) in days.arcs.iter().enumerate() {
        if index == 0 {
            isa.run(AtNode { stars, sky: &arc.centre[0], out: &mut space.nodes[0] });
        } else {
            space.nodes[0] = space.nodes[2];
        }
        isa.run(AtNode { stars, sky: &arc.centre[1], out: &mut space.nodes[1] });
        isa.run(AtNode { stars, sky: &arc.centre[2], out: &mut space.nodes[2] });
        isa.run(Circles { arc, sin_threshold: topocentric.sin(), count, space });
        if index == 0 {
            for (star, passage) in passages[..count].iter_mut().enumerate() {
                // Replaced by `Crosses` when an event is found; a star that crosses but not in this span
                // is set aside below.
                *passage = match space.half_arc[star] {
                    arc if arc < 0.0 => Passage::AlwaysBelow,
                    arc if arc >= ALL_ROUND => Passage::AlwaysAbove,
                    _ => Passage::Crosses,
                };
            }
        }
        let within = days.part(arc);
        space.gather(count, within);
        let angle_error = STAR_ARC_ERROR_RAD + arc.pole_error;
        isa.run(Solve { arc, sin_threshold: topocentric.sin(), candidates: &mut space.candidates });
        let sin_threshold = topocentric.sin();
        let candidates = &mut space.candidates;
        isa.run(Describe { arc, sin_threshold, refraction, angle_error, scatter, candidates });
        space.collect(arc, (days.start, days.stop));
    }
    space.deliver(days, catalog, rows, threshold, &passages, events, summaries);
}

/// The chain of the stars at one node, in the CIRS of the Earth's centre.
struct AtNode<'a> {
    stars: StarColumns<'a>,
    sky: &'a Sky,
    out: &'a mut [Column; 3],
}

impl Kernel for AtNode<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let count = self.stars.len().min(BATCH);
        let stars = self.stars.exactly(count);
        let (sky, intermediate): (Sky, Matrix) = (*self.sky, self.sky.intermediate);
        let [x, y, z] = self.out;
        let [x, y, z] = [x, y, z].map(|c| &mut c[..count]);
        for row in 0..count {
            [x[row], y[row], z[row]] = rotate(&intermediate, star_direction(&stars.star(row), &sky));
        }
    }
}

/// The circles of the stars at the middle of a day.
struct Circles<'a, 'b> {
    arc: &'a Arc<'b>,
    sin_threshold: f64,
    count: usize,
    space: &'a mut BatchSpace,
}

impl Kernel for Circles<'_, '_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let count = self.count.min(BATCH);
        let BatchSpace { nodes: [first, middle, last], upper, period, half_arc, set_aside, .. } = self.space;
        let [x, y, z] = &*middle;
        let [x, y, z] = [x, y, z].map(|c| &c[..count]);
        let ([x0, y0, _], [x1, y1, _]) = (&*first, &*last);
        let (x0, y0, x1, y1) = (&x0[..count], &y0[..count], &x1[..count], &y1[..count]);
        let (upper, period) = (&mut upper[..count], &mut period[..count]);
        let (half_arc, set_aside) = (&mut half_arc[..count], &mut set_aside[..count]);
        let zenith = self.arc.zenith();
        let (along, across) = (zenith.along_pole, zenith.across_pole);
        let meridian = self.arc.rotation_angle[1] + zenith.longitude;
        let spin = self.arc.rotation[1] + self.arc.rotation[2];
        let sin_threshold = self.sin_threshold;
        for i in 0..count {
            let squared = x[i] * x[i] + y[i] * y[i];
            let drift = (x[i] * (y1[i] - y0[i]) - y[i] * (x1[i] - x0[i])) / squared;
            let rate = spin - drift;
            let cos_declination = squared.sqrt();
            let swing = across * cos_declination;
            let cos = (sin_threshold - along * z[i]) / swing;
            // Hour angle at the middle, within half a turn.
            let angle = meridian - atan2_coarse::<A>(y[i], x[i]);
            let angle = angle - TURN * (angle * (1.0 / TURN)).round_ties_even();
            upper[i] = 0.5 - angle / rate;
            period[i] = TURN / rate;
            let arc = acos_coarse::<A>(cos.clamp(-1.0, 1.0)) / rate;
            let arc = if cos >= 1.0 { -1.0 } else { arc };
            half_arc[i] = if cos <= -1.0 { ALL_ROUND } else { arc };
            let poor = swing < FLAT || cos_declination < FLAT || swing * (1.0 - cos.abs()).abs() < GRAZING;
            set_aside[i] = if poor { 1.0 } else { set_aside[i] };
        }
    }
}

impl BatchSpace {
    /// Lists what each star may do within a part of the day.
    fn gather(&mut self, count: usize, (from, to): (f64, f64)) {
        let BatchSpace { nodes, upper, period, half_arc, set_aside, candidates, .. } = self;
        candidates.count = 0;
        let wanted = from - ROOM..to + ROOM;
        for star in 0..count {
            if set_aside[star] != 0.0 || upper[star].is_nan() {
                continue;
            }
            let crosses = (0.0..ALL_ROUND).contains(&half_arc[star]);
            for turn in -1..=1 {
                let centre = upper[star] + f64::from(turn) * period[star];
                if crosses && wanted.contains(&(centre - half_arc[star])) {
                    candidates.push(nodes, star, EventKind::Rise, centre - half_arc[star]);
                }
                if wanted.contains(&centre) {
                    candidates.push(nodes, star, EventKind::Transit, centre);
                }
                if crosses && wanted.contains(&(centre + half_arc[star])) {
                    candidates.push(nodes, star, EventKind::Set, centre + half_arc[star]);
                }
            }
        }
    }

    /// Takes the events that lie in the day and in the span; sets aside stars that did not settle.
    fn collect(&mut self, arc: &Arc<'_>, (start, stop): (Utc, Utc)) {
        let BatchSpace { set_aside, candidates: c, found, .. } = self;
        let span = start.nanoseconds()..stop.nanoseconds();
        for i in 0..c.count {
            let (star, at) = (c.star[i], c.at[i]);
            let near_midnight = at.abs() < MIDNIGHT || (at - 1.0).abs() < MIDNIGHT;
            let settled = c.step[i].abs() < CONVERGED;
            if !settled || near_midnight {
                set_aside[usize::from(star)] = 1.0;
                continue;
            }
            if !(0.0..1.0).contains(&at) {
                continue;
            }
            let time = arc.utc(at);
            if span.contains(&time.nanoseconds()) {
                let event = Event {
                    kind: c.kind[i],
                    time,
                    azimuth: c.azimuth[i],
                    altitude: c.altitude[i],
                    computed_error_s: c.error_s[i],
                    horizon_scatter_s: c.scatter_s[i],
                    may_not_happen: c.doubtful[i] != 0.0,
                };
                found.push((star, event));
            }
        }
    }

    /// Sorts what was found by star and appends it, with the stars set aside worked out one by one.
    fn deliver(
        &mut self,
        days: &Days<'_>,
        catalog: &Catalog,
        rows: std::ops::Range<usize>,
        threshold: f64,
        passages: &[Passage; BATCH],
        events: &mut Vec<Event>,
        summaries: &mut Vec<(usize, (Passage, Status))>,
    ) {
        // A counting sort: the days came in order, and within a day the candidates of a star nearly so.
        let mut next = [0usize; BATCH + 1];
        for (star, _) in &self.found {
            next[usize::from(*star) + 1] += 1;
        }
        for star in 0..BATCH {
            next[star + 1] += next[star];
        }
        let bounds = next;
        self.order.clear();
        self.order.resize(self.found.len(), 0);
        for (place, (star, _)) in (0..).zip(&self.found) {
            let slot = &mut next[usize::from(*star)];
            self.order[*slot] = place;
            *slot += 1;
        }
        let targets = Targets::Catalog(catalog);
        let note = days.note();
        for (star, row) in rows.enumerate() {
            let own = &self.order[bounds[star]..bounds[star + 1]];
            let own = own.iter().map(|&place| &self.found[place as usize].1);
            let before = events.len();
            let crosses = own.clone().any(|event| event.kind != EventKind::Transit);
            let status = catalog.status()[row];
            // A star that crosses the threshold, but not in this span, may be above or below.
            let unknown = passages[star] == Passage::Crosses && !crosses;
            let summary = if status.is_bad() {
                (Passage::BadRow, status)
            } else if self.set_aside[star] != 0.0 || unknown {
                rise_transit_set(days, &targets, row, threshold, events)
            } else {
                events.extend(own);
                events[before..].sort_by_key(|event| event.time.nanoseconds());
                (if crosses { Passage::Crosses } else { passages[star] }, status.worst(note))
            };
            summaries.push((events.len() - before, summary));
        }
    }
}

impl Candidates {
    #[inline(always)]
    fn push(&mut self, nodes: &[[Column; 3]; 3], star: usize, kind: EventKind, at: f64) {
        let i = self.count;
        if i >= MOST {
            return;
        }
        for axis in 0..3 {
            let [a, b, c] = [nodes[0][axis][star], nodes[1][axis][star], nodes[2][axis][star]];
            self.direction[axis][i] = a;
            self.direction[3 + axis][i] = (-3.0 * a + 4.0 * b) - c;
            self.direction[6 + axis][i] = 2.0 * ((a + c) - 2.0 * b);
        }
        self.star[i] = star as u16;
        self.kind[i] = kind;
        self.transit[i] = if kind == EventKind::Transit { 1.0 } else { 0.0 };
        self.at[i] = at;
        self.count += 1;
    }
}

/// Constants of a day for the loops over candidates.
#[derive(Clone, Copy)]
struct Turning {
    rotation: [f64; 3],
    horizon: [Matrix; 3],
    bend: [f64; 2],
    aberration: f64,
}

impl Turning {
    fn of(arc: &Arc<'_>) -> Self {
        Turning {
            rotation: arc.rotation,
            horizon: arc.horizon,
            bend: arc.bend,
            aberration: arc.diurnal_aberration,
        }
    }

    /// Direction on the horizon and its rate a day, as `StarArc::local_and_rate`. Written out: a closure
    /// over an array is a call to LLVM until after it has given up on whole registers.
    #[inline(always)]
    fn local_and_rate<A: Arithmetic>(&self, path: &Path, at: f64) -> ([f64; 3], [f64; 3]) {
        let [x0, y0, z0, x1, y1, z1, x2, y2, z2] = *path;
        let along = |c0: f64, c1: f64, c2: f64| A::multiply_add(at, A::multiply_add(at, c2, c1), c0);
        let (x, y, z) = (along(x0, x1, x2), along(y0, y1, y2), along(z0, z1, z2));
        let twice = 2.0 * at;
        let dx = A::multiply_add(twice, x2, x1);
        let dy = A::multiply_add(twice, y2, y1);
        let dz = A::multiply_add(twice, z2, z1);
        let shape = at * (at - 0.5) * (at - 1.0);
        let (bx, by) = (shape * self.bend[0], shape * self.bend[1]);
        let (x, y, z) = (
            A::multiply_add(-bx, z, x),
            A::multiply_add(-by, z, y),
            A::multiply_add(bx, x, A::multiply_add(by, y, z)),
        );
        let angle = along(self.rotation[0], self.rotation[1], self.rotation[2]);
        let spin = A::multiply_add(twice, self.rotation[2], self.rotation[1]);
        let (sin, cos) = sin_cos::<A>(angle);
        let (u, v) = (A::multiply_add(cos, x, sin * y), A::multiply_add(cos, y, -sin * x));
        let (du, dv) = (A::multiply_add(cos, dx, sin * dy), A::multiply_add(cos, dy, -sin * dx));
        let (du, dv) = (A::multiply_add(spin, v, du), A::multiply_add(-spin, u, dv));
        let h = &self.horizon;
        let row = |i: usize| {
            let a = along(h[0][i][0], h[1][i][0], h[2][i][0]);
            let b = along(h[0][i][1], h[1][i][1], h[2][i][1]);
            let c = along(h[0][i][2], h[1][i][2], h[2][i][2]);
            let value = A::multiply_add(a, u, A::multiply_add(b, v, c * z));
            let rate = A::multiply_add(a, du, A::multiply_add(b, dv, c * dz));
            (value, rate)
        };
        let ((north, dnorth), (east, deast), (zenith, dzenith)) = (row(0), row(1), row(2));
        let shrink = 1.0 - self.aberration * east;
        let dshrink = -self.aberration * deast;
        (
            [north * shrink, A::multiply_add(east, shrink, self.aberration), zenith * shrink],
            [
                A::multiply_add(dnorth, shrink, north * dshrink),
                A::multiply_add(deast, shrink, east * dshrink),
                A::multiply_add(dzenith, shrink, zenith * dshrink),
            ],
        )
    }
}

/// Coefficients of a star's direction over a day: three constant ones, three linear, three quadratic.
type Path = [f64; 9];

/// A first step of Newton's method.
struct Solve<'a, 'b> {
    arc: &'a Arc<'b>,
    sin_threshold: f64,
    candidates: &'a mut Candidates,
}

impl Kernel for Solve<'_, '_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let turning = Turning::of(self.arc);
        let Candidates { count, direction, transit, at, .. } = self.candidates;
        let count = (*count).min(MOST);
        let (transit, at) = (&transit[..count], &mut at[..count]);
        for i in 0..count {
            let (local, rate) = turning.local_and_rate::<A>(&path_of(direction, i), at[i]);
            at[i] -= newton_step::<A>(local, rate, transit[i], self.sin_threshold);
        }
    }
}

/// Days back to where the component towards the east vanishes, for a transit, or the altitude is that of
/// the threshold.
#[inline(always)]
fn newton_step<A: Arithmetic>(local: [f64; 3], rate: [f64; 3], transit: f64, sin_threshold: f64) -> f64 {
    let crossing = 1.0 - transit;
    let value = A::multiply_add(transit, local[1], crossing * (local[2] - sin_threshold));
    let slope = A::multiply_add(transit, rate[1], crossing * rate[2]);
    value / slope
}

#[inline(always)]
fn path_of(direction: &[[f64; MOST]; 9], i: usize) -> Path {
    let [a, b, c, d, e, f, g, h, k] = direction;
    [a[i], b[i], c[i], d[i], e[i], f[i], g[i], h[i], k[i]]
}

/// The second step, and azimuth, observed altitude and errors of the events. The direction goes along with the
/// step in a straight line, which is short by its square: below 1e-12 where the step passes for settled.
struct Describe<'a, 'b> {
    arc: &'a Arc<'b>,
    sin_threshold: f64,
    refraction: &'a Refraction,
    angle_error: f64,
    /// Standard deviation of refraction at the threshold, radians.
    scatter: f64,
    candidates: &'a mut Candidates,
}

impl Kernel for Describe<'_, '_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let turning = Turning::of(self.arc);
        let Candidates {
            count,
            direction,
            transit,
            at,
            step,
            azimuth,
            altitude,
            error_s,
            scatter_s,
            doubtful,
            ..
        } = self.candidates;
        let count = (*count).min(MOST);
        let (transit, at, step) = (&transit[..count], &mut at[..count], &mut step[..count]);
        let (azimuth, altitude) = (&mut azimuth[..count], &mut altitude[..count]);
        let (error_s, scatter_s, doubtful) =
            (&mut error_s[..count], &mut scatter_s[..count], &mut doubtful[..count]);
        let (latitude, angle_error, scatter) = (self.arc.latitude, self.angle_error, self.scatter);
        let turn = EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY;
        let always = self.arc.ut1_error_s + ROUNDING_S;
        for i in 0..count {
            let (before, rate) = turning.local_and_rate::<A>(&path_of(direction, i), at[i]);
            let back = newton_step::<A>(before, rate, transit[i], self.sin_threshold);
            step[i] = back;
            at[i] -= back;
            let local = [
                A::multiply_add(-back, rate[0], before[0]),
                A::multiply_add(-back, rate[1], before[1]),
                A::multiply_add(-back, rate[2], before[2]),
            ];
            let cos_altitude = A::multiply_add(local[0], local[0], local[1] * local[1]).sqrt();
            azimuth[i] = wrap_positive::<A>(atan2::<A>(local[1], local[0]));
            altitude[i] = atan2::<A>(local[2], cos_altitude);
            // As `passing::altitude_passing`, with no curvature and no scatter for a transit.
            let sin_declination = A::multiply_add(local[2], latitude.sin, local[0] * latitude.cos);
            let cos_declination = (1.0 - sin_declination * sin_declination).max(0.0).sqrt();
            let is_transit = transit[i] != 0.0;
            let curvature = if is_transit { 0.0 } else { latitude.cos.abs() * cos_declination * turn * turn };
            let rate = if is_transit { rate[1].abs() } else { rate[2].abs() };
            let error = if is_transit { angle_error } else { angle_error * cos_altitude };
            let scatter = if is_transit { 0.0 } else { scatter * cos_altitude };
            error_s[i] = seconds_to_pass(error, rate, curvature) + always;
            scatter_s[i] = seconds_to_pass(scatter, rate, curvature);
            let grazes = rate * rate <= 2.0 * curvature * (error + scatter);
            doubtful[i] = if grazes { 1.0 } else { 0.0 };
        }
        for value in altitude {
            *value = self.refraction.observed_altitude(*value);
        }
    }
}

/// [`super::passing::passing`] without a branch.
#[inline(always)]
fn seconds_to_pass(error: f64, rate: f64, curvature: f64) -> f64 {
    let left = rate * rate - 2.0 * curvature * error;
    let grazing = (2.0 * error / curvature).sqrt();
    let steep = 2.0 * error / (rate + left.max(0.0).sqrt());
    let days = if left <= 0.0 { grazing } else { steep };
    let days = if error <= 0.0 { 0.0 } else { days };
    if days < 1.0 { days * SECONDS_PER_DAY } else { SECONDS_PER_DAY }
}
