//! The loop that decides the speed of a season: hours of many stars in one night.
//!
//! A star is a unit vector that drifts by parallax and proper motion over a few weeks. In the frame of
//! the meridian at the night's middle its components give the hour angle there and, with the threshold,
//! the half-arc above it; what remains is the overlap of two intervals. First-order aberration is a
//! constant added to the vector. Left out are what aberration changes by in half a night (0.1″), the
//! Earth's pole and the site's own aberration (0.3″ along the horizon, a twentieth of that across it),
//! deflection (20 mas at 20° from the Sun) and the second order of aberration (1 mas): 0.5 µrad in all, a
//! hundredth of a second of time where the star crosses its threshold steeply. Where it does not,
//! [`GRAZING`] marks it for the exact path.

use crate::astrometry::{StarColumns, coordinate_direction};
use crate::math::dispatch::{Arithmetic, Kernel};
use crate::math::elementary::{acos_coarse, atan2_coarse};
use crate::math::vector::{Matrix, Vector};

/// Stars a block: a block's arrays stay in the first or second level of the cache.
pub(super) const STARS: usize = 512;

/// (cos φ cos δ sin H)² below which a crossing is too shallow for the loop: at the edge of it an error of
/// 0.5 µrad is 0.34 s.
const GRAZING: f64 = 4e-4;

/// What is to be done about a star on a night, beyond the loop.
pub(super) mod mark {
    /// Nothing.
    pub const DONE: f64 = 0.0;
    /// A body that it must keep away from may cut into its window.
    pub const NEAR_BODY: f64 = 1.0;
    /// It grazes its threshold.
    pub const GRAZES: f64 = 2.0;
}

/// A block of stars over some weeks, and the results of one night.
pub(super) struct Block {
    /// Number of stars in use.
    pub stars: usize,
    /// Whether the limits, the same for all targets, stand in the block already.
    pub limits_are_filled: bool,
    /// Directions at the first night of the weeks, ICRS, and their change until the last.
    pub direction: [[f64; STARS]; 3],
    pub drift: [[f64; STARS]; 3],
    /// Sine of the lowest topocentric altitude.
    pub sin_threshold: [f64; STARS],
    /// Shortest useful window, seconds.
    pub shortest_s: [f64; STARS],
    /// Sine and cosine of the distances to keep from the Moon and from the Sun.
    pub keep: [[[f64; STARS]; 2]; 2],
    /// Hour angle at the night's middle; half-arc above the threshold, negative when there is none,
    /// more than any hour angle when it is all of the circle.
    pub hour_angle: [f64; STARS],
    pub half_arc: [f64; STARS],
    /// Seconds above the threshold in the dark.
    pub seconds: [f64; STARS],
    /// See [`mark`].
    pub mark: [f64; STARS],
}

/// Half-arc of a star that never sets.
pub(super) const ALL_ROUND: f64 = 100.0;

impl Block {
    pub fn new() -> Box<Self> {
        let none = [f64::NAN; STARS];
        Box::new(Block {
            stars: 0,
            limits_are_filled: false,
            direction: [none; 3],
            drift: [none; 3],
            sin_threshold: none,
            shortest_s: [0.0; STARS],
            keep: [[none; 2]; 2],
            hour_angle: none,
            half_arc: none,
            seconds: none,
            mark: none,
        })
    }
}

/// Fills in directions and drifts.
pub(super) struct Directions<'a> {
    pub stars: StarColumns<'a>,
    /// Julian years after J2000.0 and barycentric position of the Earth at the first and the last night.
    pub at: [(f64, Vector); 2],
    pub block: &'a mut Block,
}

impl Kernel for Directions<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let count = self.stars.len().min(STARS);
        let stars = self.stars.exactly(count);
        self.block.stars = count;
        let [first, last] = self.at;
        let [x, y, z] = &mut self.block.direction;
        let [x, y, z] = [x, y, z].map(|c| &mut c[..count]);
        let [dx, dy, dz] = &mut self.block.drift;
        let [dx, dy, dz] = [dx, dy, dz].map(|c| &mut c[..count]);
        for i in 0..count {
            let star = stars.star(i);
            let from = coordinate_direction(&star, first.0, first.1);
            let to = coordinate_direction(&star, last.0, last.1);
            [x[i], y[i], z[i]] = from;
            [dx[i], dy[i], dz[i]] = [to[0] - from[0], to[1] - from[1], to[2] - from[2]];
        }
    }
}

/// What the loop knows of a night.
#[derive(Debug, Clone)]
pub(super) struct Meridian {
    /// From the axes of the GCRS to those of the meridian at the night's middle: components
    /// cos δ cos H, cos δ sin H, sin δ.
    pub matrix: Matrix,
    /// Velocity of the Earth over that of light on those axes: first-order aberration.
    pub aberration: Vector,
    pub sin_latitude: f64,
    pub cos_latitude: f64,
    /// Rate of the hour angle, radians per second.
    pub rate: f64,
}

/// Hour angles and half-arcs of a block on a night; seconds and marks are set to their beginnings.
pub(super) struct Arcs<'a> {
    pub meridian: &'a Meridian,
    /// Share of the weeks that has passed.
    pub share: f64,
    pub block: &'a mut Block,
}

impl Kernel for Arcs<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let Block {
            stars, direction, drift, sin_threshold, hour_angle, half_arc, seconds, mark: marks, ..
        } = self.block;
        let count = *stars;
        let [x, y, z] = &*direction;
        let [x, y, z] = [x, y, z].map(|c| &c[..count]);
        let [dx, dy, dz] = &*drift;
        let [dx, dy, dz] = [dx, dy, dz].map(|c| &c[..count]);
        let sin_threshold = &sin_threshold[..count];
        let hour_angle = &mut hour_angle[..count];
        let half_arc = &mut half_arc[..count];
        let seconds = &mut seconds[..count];
        let marks = &mut marks[..count];
        let Meridian { matrix: m, aberration, sin_latitude, cos_latitude, .. } = *self.meridian;
        let share = self.share;
        for i in 0..count {
            let u = A::multiply_add(share, dx[i], x[i]);
            let v = A::multiply_add(share, dy[i], y[i]);
            let w = A::multiply_add(share, dz[i], z[i]);
            let along = |row: Vector, constant: f64| {
                A::multiply_add(row[0], u, A::multiply_add(row[1], v, A::multiply_add(row[2], w, constant)))
            };
            let [p, q, r] = [0, 1, 2].map(|axis| along(m[axis], aberration[axis]));
            let across_squared = A::multiply_add(p, p, q * q);
            // The length, which aberration changes, to second order.
            let length = A::multiply_add(0.5, A::multiply_add(r, r, across_squared), 0.5);
            let above = A::multiply_add(sin_threshold[i], length, -sin_latitude * r);
            let radius_squared = cos_latitude * cos_latitude * across_squared;
            let cos_half_arc = above / radius_squared.sqrt();
            let shallow = (radius_squared - above * above).abs() < GRAZING;
            let arc = acos_coarse::<A>(cos_half_arc.clamp(-1.0, 1.0));
            let arc = if cos_half_arc >= 1.0 { -1.0 } else { arc };
            half_arc[i] = if cos_half_arc <= -1.0 { ALL_ROUND } else { arc };
            hour_angle[i] = atan2_coarse::<A>(q, p);
            // A row that is not a number stays none.
            seconds[i] = 0.0 * p;
            marks[i] = if shallow { mark::GRAZES } else { mark::DONE };
        }
    }
}

/// Adds the seconds above the threshold in one stretch of darkness.
pub(super) struct Overlap<'a> {
    /// The stretch, seconds from the night's middle.
    pub dark: (f64, f64),
    pub rate: f64,
    pub block: &'a mut Block,
}

impl Kernel for Overlap<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        const TURN: f64 = crate::constants::TURN;
        let Block { stars, shortest_s, hour_angle, half_arc, seconds, .. } = self.block;
        let count = *stars;
        let shortest_s = &shortest_s[..count];
        let hour_angle = &hour_angle[..count];
        let half_arc = &half_arc[..count];
        let seconds = &mut seconds[..count];
        let (from, to) = (self.dark.0 * self.rate, self.dark.1 * self.rate);
        let per_radian = 1.0 / self.rate;
        for i in 0..count {
            let (start, stop) = (hour_angle[i] + from, hour_angle[i] + to);
            let arc = half_arc[i];
            // The passage nearest to the night's middle, and those a turn before and after it, which
            // a star that never sets does not have.
            let other = if arc >= ALL_ROUND { -1.0 } else { arc };
            let overlap = |arc: f64, centre: f64| {
                let length = (stop.min(centre + arc) - start.max(centre - arc)) * per_radian;
                if length >= shortest_s[i] { length.max(0.0) } else { 0.0 }
            };
            seconds[i] += overlap(arc, 0.0) + (overlap(other, TURN) + overlap(other, -TURN));
        }
    }
}

/// Takes out stars that stand too near a body all night, and marks those that may for a part of it.
pub(super) struct Keepout<'a> {
    /// Proper direction of the body in the middle of the dark, GCRS axes.
    pub direction: Vector,
    /// Velocity of the Earth over that of light, GCRS: the aberration of the star.
    pub velocity: Vector,
    /// Cosine and sine of how far the body strays from there during the dark.
    pub reach: (f64, f64),
    /// Which of [`Block::keep`].
    pub which: usize,
    /// The mark of those that the body may cut into.
    pub mark: f64,
    pub share: f64,
    pub block: &'a mut Block,
}

impl Kernel for Keepout<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let Block { stars, direction, drift, keep, seconds, mark: marks, .. } = self.block;
        let count = *stars;
        let [x, y, z] = &*direction;
        let [x, y, z] = [x, y, z].map(|c| &c[..count]);
        let [dx, dy, dz] = &*drift;
        let [dx, dy, dz] = [dx, dy, dz].map(|c| &c[..count]);
        let [sin_keep, cos_keep] = &keep[self.which];
        let (sin_keep, cos_keep) = (&sin_keep[..count], &cos_keep[..count]);
        let seconds = &mut seconds[..count];
        let marks = &mut marks[..count];
        let (body, velocity, share) = (self.direction, self.velocity, self.share);
        let (cos_reach, sin_reach) = self.reach;
        let shift = velocity[0] * body[0] + velocity[1] * body[1] + velocity[2] * body[2];
        for i in 0..count {
            let u = A::multiply_add(share, dx[i], x[i]);
            let v = A::multiply_add(share, dy[i], y[i]);
            let w = A::multiply_add(share, dz[i], z[i]);
            // The star's length is off by its aberration, 1e-4: the reach has room for that.
            let near = A::multiply_add(body[0], u, A::multiply_add(body[1], v, body[2] * w)) + shift;
            let (cos, sin) = (cos_keep[i], sin_keep[i]);
            // Cosines of the distance less and plus the reach, where these lie within 0 to π.
            let inner = if cos < cos_reach { A::multiply_add(cos, cos_reach, sin * sin_reach) } else { 2.0 };
            let outer =
                if cos > -cos_reach { A::multiply_add(cos, cos_reach, -sin * sin_reach) } else { -2.0 };
            seconds[i] = if near > inner { 0.0 * seconds[i] } else { seconds[i] };
            let cut = near > outer && near <= inner && seconds[i] > 0.0;
            marks[i] = if cut { marks[i].max(self.mark) } else { marks[i] };
        }
    }
}
