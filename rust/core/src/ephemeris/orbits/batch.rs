//! Places of very many orbits at one instant, in loops that vectorise.

use std::ops::Range;

use super::{GM_SUN, Orbits, kepler};
use crate::constants::{LIGHT_TIME_AU_S, SECONDS_PER_DAY};
use crate::ephemeris::State;
use crate::math::dispatch::{Arithmetic, Isa, Kernel};
use crate::math::vector::{Vector, dot};
use crate::time::{Instant, Tdb};

impl Orbits {
    /// Heliocentric state of a row by two-body motion, au and au/day, ICRS axes; NaN for a bad row. The very numbers of
    /// [`Orbits::heliocentric_batch`] with [`Isa::best`].
    pub fn heliocentric(&self, row: usize, tdb: Instant<Tdb>) -> State {
        Isa::best().run(Single { orbits: self, row, tdb })
    }

    /// The vector of [`Orbits::astrometric_motion_batch`] for one row, with its rate: the very numbers of a batch under the
    /// same `isa`.
    pub fn astrometric(&self, isa: Isa, row: usize, tdb: Instant<Tdb>, observer: State, sun: State) -> State {
        isa.run(SingleAstrometric { single: Single { orbits: self, row, tdb }, observer, sun })
    }

    /// The vectors of [`Orbits::astrometric_batch`] for one row at many instants, each with its observer and Sun: the very
    /// numbers of a batch under the same `isa`.
    pub fn astrometric_at(&self, isa: Isa, row: usize, looks: &[Look], vectors: &mut [Vector]) {
        isa.run(AtInstants { orbits: self, row, looks, vectors });
    }

    /// Heliocentric positions (au) and velocities (au/day) of rows at one instant by two-body motion, ICRS axes, written
    /// a coordinate a slice; every slice as long as the range. Geometric: no light time.
    ///
    /// Error as a solution of the two-body problem: 1e-13 of the distance (`batch_is_the_elements_own_state`), and the
    /// rounding of time far from the epoch, 1e-16 of it times the speed.
    pub fn heliocentric_batch(
        &self,
        isa: Isa,
        rows: Range<usize>,
        tdb: Instant<Tdb>,
        position: [&mut [f64]; 3],
        velocity: Option<[&mut [f64]; 3]>,
    ) {
        isa.run(Heliocentric { orbits: self, rows, tdb, position, velocity });
    }

    /// Astrometric directions of rows at one instant: vectors from an observer to where each body was when the light
    /// left it, au, ICRS axes, written a coordinate a slice; every slice as long as the range.
    ///
    /// `observer` is the observer's barycentric position (the site's, not the Earth's centre, so that parallax is in it),
    /// `sun` the Sun's barycentric state at the instant. Deflection and aberration are not applied. The geometric
    /// distance at reception differs from the vectors' lengths by the light time.
    ///
    /// Kepler's equation is solved once a row; over the light time the motion is carried by its own derivatives up to the
    /// third. The error of that is below 1e-12 au beyond 0.1 au from the Sun (`light_time_by_iteration`). The Sun is taken to
    /// move straight over the light time, which its acceleration, 1e-8 au/d², makes wrong by 0.2 µas at 5 au and
    /// 0.7 µas at 20.
    pub fn astrometric_batch(
        &self,
        isa: Isa,
        rows: Range<usize>,
        tdb: Instant<Tdb>,
        observer: Vector,
        sun: State,
        direction: [&mut [f64]; 3],
    ) {
        let observer = State { position: observer, velocity: [0.0; 3] };
        isa.run(Astrometric { orbits: self, rows, tdb, observer, sun, direction, rate: None });
    }

    /// [`Orbits::astrometric_batch`] with the vectors' rates, au/day, for motion on the sky; the observer's velocity counts
    /// in them. Error of the rates: 1e-11 au/day beyond 0.2 au from the Sun (`rates_are_slopes`), and 2e-9 au/day at 20 au by
    /// the Sun's acceleration over the light time.
    pub fn astrometric_motion_batch(
        &self,
        isa: Isa,
        rows: Range<usize>,
        tdb: Instant<Tdb>,
        observer: State,
        sun: State,
        direction: [&mut [f64]; 3],
        rate: [&mut [f64]; 3],
    ) {
        isa.run(Astrometric { orbits: self, rows, tdb, observer, sun, direction, rate: Some(rate) });
    }
}

/// An instant at which an observer looks.
#[derive(Debug, Clone, Copy)]
pub struct Look {
    /// The instant.
    pub tdb: Instant<Tdb>,
    /// Barycentric position of the observer, au.
    pub observer_au: Vector,
    /// Barycentric state of the Sun.
    pub sun: State,
}

/// Rows worked on together: what a block needs between its loops stays in the first-level cache.
const BLOCK: usize = 64;

/// Positions and velocities of a block.
struct Block {
    position: [[f64; BLOCK]; 3],
    velocity: [[f64; BLOCK]; 3],
}

impl Block {
    fn new() -> Block {
        Block { position: [[0.0; BLOCK]; 3], velocity: [[0.0; BLOCK]; 3] }
    }

    /// Heliocentric states of `rows`, at most [`BLOCK`] of them.
    #[inline(always)]
    fn fill<A: Arithmetic>(&mut self, orbits: &Orbits, rows: Range<usize>, day: f64, fraction: f64) {
        let n = rows.len().min(BLOCK);
        let epoch_day = &orbits.epoch_day[rows.clone()][..n];
        let epoch_fraction = &orbits.epoch_fraction[rows.clone()][..n];
        let since = &orbits.since_perihelion[rows.clone()][..n];
        let period = &orbits.period[rows.clone()][..n];
        let frequency = &orbits.frequency[rows.clone()][..n];
        let eccentricity = &orbits.eccentricity[rows.clone()][..n];
        let rate = &orbits.rate[rows.clone()][..n];
        let mut means = [0.0; BLOCK];
        let mut x = [0.0; BLOCK];
        let mut y = [0.0; BLOCK];
        let mut c0 = [0.0; BLOCK];
        let mut speed = [0.0; BLOCK];
        let mut open = [0.0; BLOCK];
        for i in 0..n {
            let time = since[i] + ((day - epoch_day[i]) + (fraction - epoch_fraction[i]));
            let m = mean::<A>(time, period[i], frequency[i]) * rate[i];
            let (place, settled) = kepler::solve_quickly::<A>(eccentricity[i], m);
            means[i] = m;
            x[i] = place.x;
            y[i] = place.y;
            c0[i] = place.c0;
            speed[i] = rate[i] / place.r;
            open[i] = if settled { 0.0 } else { 1.0 };
        }
        for i in 0..n {
            if open[i] != 0.0 {
                let place = kepler::solve_safely(eccentricity[i], means[i]);
                (x[i], y[i], c0[i], speed[i]) = (place.x, place.y, place.c0, rate[i] / place.r);
            }
        }
        for axis in 0..3 {
            let along = &orbits.along[axis][rows.clone()][..n];
            let across = &orbits.across[axis][rows.clone()][..n];
            let position = &mut self.position[axis];
            let velocity = &mut self.velocity[axis];
            for i in 0..n {
                (position[i], velocity[i]) = component::<A>(x[i], y[i], c0[i], speed[i], along[i], across[i]);
            }
        }
    }
}

/// Time since the nearest perihelion; a period of 0, with a frequency of 0, is none.
#[inline(always)]
fn mean<A: Arithmetic>(time: f64, period: f64, frequency: f64) -> f64 {
    // Adding and taking away this rounds to a whole number.
    const ROUNDER: f64 = 6_755_399_441_055_744.0;
    let turns = (time * frequency + ROUNDER) - ROUNDER;
    A::multiply_add(-turns, period, time)
}

/// A coordinate and its rate from those in the plane of the orbit.
#[inline(always)]
fn component<A: Arithmetic>(x: f64, y: f64, c0: f64, speed: f64, along: f64, across: f64) -> (f64, f64) {
    (A::multiply_add(x, along, y * across), speed * A::multiply_add(c0, across, -(y * along)))
}

/// One row, with the arithmetic of a block and without its arrays.
struct Single<'a> {
    orbits: &'a Orbits,
    row: usize,
    tdb: Instant<Tdb>,
}

impl Kernel for Single<'_> {
    type Output = State;

    #[inline(always)]
    fn run<A: Arithmetic>(self) -> State {
        let Single { orbits: o, row, tdb } = self;
        let (day, fraction) = tdb.mjd_parts();
        let time = o.since_perihelion[row] + ((day - o.epoch_day[row]) + (fraction - o.epoch_fraction[row]));
        let m = mean::<A>(time, o.period[row], o.frequency[row]) * o.rate[row];
        let e = o.eccentricity[row];
        let (mut place, settled) = kepler::solve_quickly::<A>(e, m);
        if !settled {
            place = kepler::solve_safely(e, m);
        }
        let speed = o.rate[row] / place.r;
        let mut state = State { position: [0.0; 3], velocity: [0.0; 3] };
        for axis in 0..3 {
            let (along, across) = (o.along[axis][row], o.across[axis][row]);
            (state.position[axis], state.velocity[axis]) =
                component::<A>(place.x, place.y, place.c0, speed, along, across);
        }
        state
    }
}

/// One row as an observer sees it.
struct SingleAstrometric<'a> {
    single: Single<'a>,
    observer: State,
    sun: State,
}

impl Kernel for SingleAstrometric<'_> {
    type Output = State;

    #[inline(always)]
    fn run<A: Arithmetic>(self) -> State {
        let State { position: p, velocity: v } = self.single.run::<A>();
        let s = [0, 1, 2].map(|axis| self.sun.position[axis] - self.observer.position[axis]);
        let (position, light_time) = when_light_left::<A>(p, v, s, self.sun.velocity);
        let velocity = rate_of(position, p, v, light_time, self.sun.velocity, self.observer.velocity);
        State { position, velocity }
    }
}

/// One row at many instants.
struct AtInstants<'a> {
    orbits: &'a Orbits,
    row: usize,
    looks: &'a [Look],
    vectors: &'a mut [Vector],
}

impl Kernel for AtInstants<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let AtInstants { orbits: o, row, looks, vectors } = self;
        let (e, rate, since) = (o.eccentricity[row], o.rate[row], o.since_perihelion[row]);
        let along = [0, 1, 2].map(|axis| o.along[axis][row]);
        let across = [0, 1, 2].map(|axis| o.across[axis][row]);
        for (looks, vectors) in looks.chunks(BLOCK).zip(vectors.chunks_mut(BLOCK)) {
            let n = looks.len().min(vectors.len()).min(BLOCK);
            let mut means = [0.0; BLOCK];
            for (mean_at, look) in means.iter_mut().zip(looks) {
                let (day, fraction) = look.tdb.mjd_parts();
                let time = since + ((day - o.epoch_day[row]) + (fraction - o.epoch_fraction[row]));
                *mean_at = mean::<A>(time, o.period[row], o.frequency[row]) * rate;
            }
            let (mut x, mut y, mut c0) = ([0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK]);
            let (mut speed, mut open) = ([0.0; BLOCK], [0.0; BLOCK]);
            for i in 0..n {
                let (place, settled) = kepler::solve_quickly::<A>(e, means[i]);
                (x[i], y[i], c0[i], speed[i]) = (place.x, place.y, place.c0, rate / place.r);
                open[i] = if settled { 0.0 } else { 1.0 };
            }
            for i in 0..n {
                if open[i] != 0.0 {
                    let place = kepler::solve_safely(e, means[i]);
                    (x[i], y[i], c0[i], speed[i]) = (place.x, place.y, place.c0, rate / place.r);
                }
                let (mut p, mut v) = ([0.0; 3], [0.0; 3]);
                for axis in 0..3 {
                    (p[axis], v[axis]) =
                        component::<A>(x[i], y[i], c0[i], speed[i], along[axis], across[axis]);
                }
                let look = &looks[i];
                let s = [0, 1, 2].map(|axis| look.sun.position[axis] - look.observer_au[axis]);
                vectors[i] = when_light_left::<A>(p, v, s, look.sun.velocity).0;
            }
        }
    }
}

struct Heliocentric<'a> {
    orbits: &'a Orbits,
    rows: Range<usize>,
    tdb: Instant<Tdb>,
    position: [&'a mut [f64]; 3],
    velocity: Option<[&'a mut [f64]; 3]>,
}

impl Kernel for Heliocentric<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(mut self) {
        let (day, fraction) = self.tdb.mjd_parts();
        let mut block = Block::new();
        let total = self.rows.len();
        let mut done = 0;
        while done < total {
            let n = (total - done).min(BLOCK);
            let first = self.rows.start + done;
            block.fill::<A>(self.orbits, first..first + n, day, fraction);
            for axis in 0..3 {
                self.position[axis][done..done + n].copy_from_slice(&block.position[axis][..n]);
                if let Some(velocity) = &mut self.velocity {
                    velocity[axis][done..done + n].copy_from_slice(&block.velocity[axis][..n]);
                }
            }
            done += n;
        }
    }
}

struct Astrometric<'a> {
    orbits: &'a Orbits,
    rows: Range<usize>,
    tdb: Instant<Tdb>,
    observer: State,
    sun: State,
    direction: [&'a mut [f64]; 3],
    rate: Option<[&'a mut [f64]; 3]>,
}

impl Kernel for Astrometric<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(mut self) {
        let (day, fraction) = self.tdb.mjd_parts();
        let mut block = Block::new();
        let total = self.rows.len();
        let mut done = 0;
        // From the observer to the Sun.
        let s = [0, 1, 2].map(|axis| self.sun.position[axis] - self.observer.position[axis]);
        let sun_velocity = self.sun.velocity;
        while done < total {
            let n = (total - done).min(BLOCK);
            let first = self.rows.start + done;
            block.fill::<A>(self.orbits, first..first + n, day, fraction);
            let mut out = [[0.0; BLOCK]; 3];
            let mut light_times = [0.0; BLOCK];
            for i in 0..n {
                let p = [0, 1, 2].map(|axis| block.position[axis][i]);
                let v = [0, 1, 2].map(|axis| block.velocity[axis][i]);
                let (at, light_time) = when_light_left::<A>(p, v, s, sun_velocity);
                light_times[i] = light_time;
                for axis in 0..3 {
                    out[axis][i] = at[axis];
                }
            }
            for axis in 0..3 {
                self.direction[axis][done..done + n].copy_from_slice(&out[axis][..n]);
            }
            if let Some(rate) = &mut self.rate {
                for i in 0..n {
                    let p = [0, 1, 2].map(|axis| block.position[axis][i]);
                    let v = [0, 1, 2].map(|axis| block.velocity[axis][i]);
                    let d = [0, 1, 2].map(|axis| out[axis][i]);
                    let rate_at = rate_of(d, p, v, light_times[i], sun_velocity, self.observer.velocity);
                    for axis in 0..3 {
                        rate[axis][done + i] = rate_at[axis];
                    }
                }
            }
            done += n;
        }
    }
}

const LIGHT_TIME_AU_D: f64 = LIGHT_TIME_AU_S / SECONDS_PER_DAY;

/// Where a body of the heliocentric state `p`, `v` was, from the observer, when the light left it, and the light time in
/// days; `s` from the observer to the Sun, which moves straight.
#[inline(always)]
fn when_light_left<A: Arithmetic>(p: Vector, v: Vector, s: Vector, sun_velocity: Vector) -> (Vector, f64) {
    let (pull, turn) = derivatives(p, v);
    let mut at = [p[0] + s[0], p[1] + s[1], p[2] + s[2]];
    let mut light_time = 0.0;
    for _ in 0..3 {
        light_time = LIGHT_TIME_AU_D * (at[0] * at[0] + at[1] * at[1] + at[2] * at[2]).sqrt();
        let second = 0.5 * light_time * pull;
        at = [0, 1, 2].map(|axis| {
            // The second and third derivatives are −pull·p and −pull·(v − turn·p).
            let third =
                A::multiply_add(light_time * (1.0 / 3.0), A::multiply_add(-turn, p[axis], v[axis]), -p[axis]);
            let slope = A::multiply_add(second, third, -(v[axis] + sun_velocity[axis]));
            A::multiply_add(light_time, slope, p[axis] + s[axis])
        });
    }
    (at, light_time)
}

/// Rate of the vector `d` of [`when_light_left`]; `t` its light time.
#[inline(always)]
fn rate_of(d: Vector, p: Vector, v: Vector, t: f64, sun_velocity: Vector, observer: Vector) -> Vector {
    let (pull, turn) = derivatives(p, v);
    // The body's barycentric velocity when the light left, and the share by which light time shortens.
    let left = [0, 1, 2].map(|axis| {
        let bend = p[axis] - 0.5 * t * (v[axis] - turn * p[axis]);
        v[axis] + sun_velocity[axis] + pull * t * bend
    });
    let distance = dot(d, d).sqrt();
    let receding = dot(d, left) / distance;
    let shortening =
        (receding - dot(d, observer) / distance) * LIGHT_TIME_AU_D / (1.0 + LIGHT_TIME_AU_D * receding);
    [0, 1, 2].map(|axis| left[axis] * (1.0 - shortening) - observer[axis])
}

/// GM/r³ and 3 (p·v)/r² of a heliocentric state.
#[inline(always)]
fn derivatives(p: Vector, v: Vector) -> (f64, f64) {
    let square = p[0] * p[0] + p[1] * p[1] + p[2] * p[2];
    (GM_SUN / (square * square.sqrt()), 3.0 * (p[0] * v[0] + p[1] * v[1] + p[2] * v[2]) / square)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::TURN;
    use crate::ephemeris::orbits::random::Random;
    use crate::ephemeris::orbits::table::{Anomaly, Columns, Slope, from_perihelion};
    use crate::ephemeris::photometry::Brightness;
    use crate::ephemeris::{Body, Compact};
    use crate::error::Status;
    use crate::math::vector::{add_scaled, norm, sub};

    /// Random orbits of every kind.
    fn random_orbits(n: usize, seed: u64) -> Orbits {
        let mut random = Random::new(seed);
        let mut orbits = Orbits::new();
        for _ in 0..n {
            let e = match random.below(10) {
                0 => 1.0,
                1 => 1.0 + random.unit(),
                2 => 1.0 - 1e-9 * random.unit(),
                _ => random.unit() * 0.9,
            };
            let angles = [random.between(0.0, 3.0), random.between(0.0, TURN), random.between(0.0, TURN)];
            let elements = from_perihelion(
                random.between(59_000.0, 61_000.0),
                e,
                angles,
                random.between(0.2, 4.0),
                random.between(59_000.0, 62_000.0),
            );
            orbits.push(elements, Brightness::Hg { h: 15.0, g: 0.15 });
        }
        orbits
    }

    fn at() -> Instant<Tdb> {
        Instant::from_mjd(61_100.0, 0.123)
    }

    /// Positions of all rows with an instruction set.
    fn batch(orbits: &Orbits, isa: Isa) -> ([Vec<f64>; 3], [Vec<f64>; 3]) {
        let mut position = [(); 3].map(|()| vec![0.0; orbits.len()]);
        let mut velocity = position.clone();
        let [x, y, z] = &mut position;
        let [u, v, w] = &mut velocity;
        orbits.heliocentric_batch(isa, 0..orbits.len(), at(), [x, y, z], Some([u, v, w]));
        (position, velocity)
    }

    #[test]
    fn batch_is_the_elements_own_state() {
        let orbits = random_orbits(5_000, 1);
        for isa in Isa::available() {
            let (position, velocity) = batch(&orbits, isa);
            for row in 0..orbits.len() {
                assert_eq!(orbits.status(row), Status::Ok);
                let state = orbits.elements(row).at(at()).state();
                let p = [0, 1, 2].map(|axis| position[axis][row]);
                let v = [0, 1, 2].map(|axis| velocity[axis][row]);
                let apart = norm(sub(p, state.position)) / norm(state.position);
                assert!(apart < 1e-13, "{isa:?} {:?}: {apart:e}", orbits.elements(row));
                assert!(norm(sub(v, state.velocity)) < 1e-12 * norm(state.velocity), "{row}");
                if isa == Isa::best() {
                    assert_eq!(orbits.heliocentric(row, at()), State { position: p, velocity: v });
                }
            }
        }
    }

    #[test]
    fn light_time_by_iteration() {
        let orbits = random_orbits(3_000, 2);
        let compact = Compact::builtin();
        let earth = compact.position(Body::Earth, at()).unwrap();
        let sun = compact.state(Body::Sun, at()).unwrap();
        let mut direction = [(); 3].map(|()| vec![0.0; orbits.len()]);
        let [x, y, z] = &mut direction;
        orbits.astrometric_batch(Isa::best(), 0..orbits.len(), at(), earth, sun, [x, y, z]);
        for row in 0..orbits.len() {
            let mut light_time = 0.0;
            let mut exact = [0.0; 3];
            for _ in 0..8 {
                let then = at().plus_seconds(-light_time);
                let body = orbits.elements(row).at(then).state().position;
                let moved = add_scaled(sun.position, -light_time / SECONDS_PER_DAY, sun.velocity);
                exact = sub(add_scaled(body, 1.0, moved), earth);
                light_time = LIGHT_TIME_AU_S * norm(exact);
            }
            let apart = norm(sub([0, 1, 2].map(|axis| direction[axis][row]), exact));
            let limit = 1e-12 + 2e-14 * norm(exact);
            assert!(apart < limit, "{:?}: {apart:e}", orbits.elements(row));
        }
    }

    #[test]
    fn rates_are_slopes() {
        let orbits = random_orbits(2_000, 4);
        let compact = Compact::builtin();
        let directions = |days: f64| {
            let tdb = at().plus_days(days);
            let earth = compact.state(Body::Earth, tdb).unwrap();
            // A Sun that moves straight, as it is taken to over the light time.
            let sun = compact.state(Body::Sun, at()).unwrap();
            let sun = State { position: add_scaled(sun.position, days, sun.velocity), ..sun };
            let mut direction = [(); 3].map(|()| vec![0.0; orbits.len()]);
            let mut rate = direction.clone();
            let ([x, y, z], [u, v, w]) = (&mut direction, &mut rate);
            orbits.astrometric_motion_batch(
                Isa::best(),
                0..orbits.len(),
                tdb,
                earth,
                sun,
                [x, y, z],
                [u, v, w],
            );
            let mut alone = [(); 3].map(|()| vec![0.0; orbits.len()]);
            let [x, y, z] = &mut alone;
            orbits.astrometric_batch(Isa::best(), 0..orbits.len(), tdb, earth.position, sun, [x, y, z]);
            assert_eq!(alone, direction);
            (direction, rate)
        };
        let (_, rate) = directions(0.0);
        let [a, b, c, d] = [-2e-3, -1e-3, 1e-3, 2e-3].map(|days| directions(days).0);
        let mut worst = 0.0f64;
        for axis in 0..3 {
            for row in 0..orbits.len() {
                // Central differences of fourth order.
                let far = d[axis][row] - a[axis][row];
                let near = c[axis][row] - b[axis][row];
                worst = worst.max(((8.0 * near - far) / 12e-3 - rate[axis][row]).abs());
            }
        }
        println!("rates: {worst:e} au/day");
        assert!(worst < 1e-11, "{worst:e}");
    }

    /// A million orbits taken in, and placed with light time: the time a core takes, printed.
    #[test]
    #[ignore = "a measurement"]
    fn pace() {
        let mut random = Random::new(3);
        let mut column = |low, high| (0..1_000_000).map(|_| random.between(low, high)).collect::<Vec<f64>>();
        let columns = Columns {
            epoch_mjd_tt: &[61_000.0; 1_000_000],
            eccentricity: &column(0.0, 0.4),
            inclination: &column(0.0, 0.5),
            node: &column(0.0, TURN),
            perihelion_argument: &column(0.0, TURN),
            anomaly: Anomaly::Mean {
                semi_major_axis_au: &column(1.0, 4.0),
                mean_anomaly: &column(0.0, TURN),
            },
            h_mag: None,
            slope: Slope::Common(0.15),
        };
        let start = std::time::Instant::now();
        let orbits = Orbits::from_columns(&columns).unwrap();
        println!("from columns: {:.0} ns an orbit", start.elapsed().as_secs_f64() * 1e3);
        let start = std::time::Instant::now();
        let sum: f64 = (0..orbits.len()).map(|row| orbits.heliocentric(row, at()).position[0]).sum();
        println!("row by row: {:.0} ns an orbit (sum {sum:.3})", start.elapsed().as_secs_f64() * 1e3);
        let sun = State { position: [0.001, 0.0, 0.0], velocity: [1e-6; 3] };
        let mut out = [(); 3].map(|()| vec![0.0; orbits.len()]);
        for isa in Isa::available() {
            for _ in 0..2 {
                let [x, y, z] = &mut out;
                let start = std::time::Instant::now();
                orbits.astrometric_batch(isa, 0..orbits.len(), at(), [1.0, 0.0, 0.0], sun, [x, y, z]);
                println!("{}: {:.0} ns an orbit", isa.word(), start.elapsed().as_secs_f64() * 1e3);
            }
        }
    }
}
