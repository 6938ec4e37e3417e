//! Very many orbits, a column an element.

use std::ops::Range;

use super::drift;
use super::elements::{Elements, mean_motion, reduced};
use super::{GM_SUN, kepler};
use crate::constants::{LIGHT_TIME_AU_S, RADIANS_PER_DEGREE, SECONDS_PER_DAY};
use crate::ephemeris::State;
use crate::ephemeris::photometry::Brightness;
use crate::error::{Error, Result, Status};
use crate::math::dispatch::{Arithmetic, Isa, Kernel};
use crate::math::vector::{Vector, dot, scale};
use crate::time::{Instant, Tdb, Tt};

/// Where bodies are in their orbits, in one of the two ways in which it is published.
#[derive(Debug, Clone, Copy)]
pub enum Anomaly<'a> {
    /// Semi-major axis (negative for a hyperbola) and mean anomaly at the epoch. A parabola has neither.
    Mean {
        /// au.
        semi_major_axis_au: &'a [f64],
        /// Radians; for a hyperbola √(GM/|a|³) times the time since perihelion.
        mean_anomaly: &'a [f64],
    },
    /// Perihelion distance and the instant of perihelion.
    Perihelion {
        /// au.
        perihelion_au: &'a [f64],
        /// MJD, TT.
        perihelion_mjd_tt: &'a [f64],
    },
}

/// How brightness falls with the phase angle.
#[derive(Debug, Clone, Copy)]
pub enum Slope<'a> {
    /// The same G for all.
    Common(f64),
    /// A G a row.
    G(&'a [f64]),
    /// G₁ and G₂ a row.
    G1G2(&'a [f64], &'a [f64]),
}

/// Columns of elements, all of one length; angles in radians, ecliptic and equinox of J2000.0.
#[derive(Debug, Clone, Copy)]
pub struct Columns<'a> {
    /// Epoch of osculation, MJD TT.
    pub epoch_mjd_tt: &'a [f64],
    /// Eccentricity.
    pub eccentricity: &'a [f64],
    /// Inclination, 0 to π.
    pub inclination: &'a [f64],
    /// Longitude of the ascending node.
    pub node: &'a [f64],
    /// Argument of perihelion.
    pub perihelion_argument: &'a [f64],
    /// Where in the orbit.
    pub anomaly: Anomaly<'a>,
    /// Absolute magnitude H; NaN where unknown.
    pub h_mag: Option<&'a [f64]>,
    /// Slope of the phase function.
    pub slope: Slope<'a>,
}

/// Orbits in the order they came, with what is common to all instants worked out. A row that no orbit has keeps its
/// place: [`Orbits::status`] says why, and what is computed from it is NaN.
#[derive(Debug, Clone, Default)]
pub struct Orbits {
    status: Vec<Status>,
    elements: Vec<Elements>,
    brightness: Vec<Brightness>,
    // For the loops: whole day and fraction of the epoch, TDB; days since perihelion; period (0 if none) and its
    // inverse; √(GM/q³); the vectors to perihelion (length q) and across (length q√(1+e)), ICRS axes.
    epoch_day: Vec<f64>,
    epoch_fraction: Vec<f64>,
    since_perihelion: Vec<f64>,
    period: Vec<f64>,
    frequency: Vec<f64>,
    eccentricity: Vec<f64>,
    rate: Vec<f64>,
    along: [Vec<f64>; 3],
    across: [Vec<f64>; 3],
    perturbation: Vec<drift::Perturbation>,
    /// Where the planets were at the last row's epoch: most catalogues have one for all.
    planets: Option<drift::Planets>,
}

/// Largest eccentricity taken: hyperbolas so flat that the Sun hardly bends them have no use for an orbit.
pub const ECCENTRICITY_MAX: f64 = 1e6;
/// Bounds of epochs and perihelion times: years −25,000 to 29,000, where a day still resolves 1 µs in one double.
const MJD_MAX: f64 = 1e7;

/// Elements from published numbers, or what is wrong with them.
///
/// [`Status::NotFinite`] for NaN and infinity; [`Status::Elements`] for e < 0 or above [`ECCENTRICITY_MAX`], q ≤ 0, a
/// semi-major axis whose sign contradicts e (e = 1 with one, too), an inclination outside 0 to π, a mean anomaly of an
/// ellipse, a node or an argument beyond ±2π, an epoch or a perihelion beyond ±1e7 d.
fn checked(
    epoch_mjd_tt: f64,
    eccentricity: f64,
    [inclination, node, perihelion_argument]: [f64; 3],
    size_au: f64,
    place: f64,
    mean: bool,
) -> std::result::Result<Elements, Status> {
    let all = [epoch_mjd_tt, eccentricity, inclination, node, perihelion_argument, size_au, place];
    if !all.iter().all(|value| value.is_finite()) {
        return Err(Status::NotFinite);
    }
    // A hair beyond a full turn or a half for what degrees become in radians.
    let turn = 360.000_001 * RADIANS_PER_DEGREE;
    let perihelion_au = if mean { size_au * (1.0 - eccentricity) } else { size_au };
    let angles_good = node.abs() <= turn && perihelion_argument.abs() <= turn;
    if !((0.0..=ECCENTRICITY_MAX).contains(&eccentricity)
        && perihelion_au > 0.0
        && (0.0..=std::f64::consts::PI).contains(&inclination)
        && angles_good
        && epoch_mjd_tt.abs() <= MJD_MAX
        && (mean || place.abs() <= MJD_MAX)
        && !(mean && eccentricity < 1.0 && place.abs() > turn))
    {
        return Err(Status::Elements);
    }
    let tdb = |mjd: f64| Instant::<Tt>::from_mjd(mjd, 0.0).to_tdb();
    let epoch = tdb(epoch_mjd_tt);
    let motion = mean_motion(perihelion_au, eccentricity);
    let since = if mean { place / motion } else { epoch.days_since(tdb(place)) };
    let period = if eccentricity < 1.0 { crate::constants::TURN / motion } else { f64::INFINITY };
    let since_perihelion_d = reduced(since, period);
    if !since_perihelion_d.is_finite() {
        return Err(Status::Elements);
    }
    Ok(Elements {
        epoch,
        perihelion_au,
        eccentricity,
        inclination,
        node,
        perihelion_argument,
        since_perihelion_d,
    })
}

/// Elements by semi-major axis (au) and mean anomaly; angles in radians: inclination, node, argument of perihelion.
pub fn from_mean_anomaly(
    epoch_mjd_tt: f64,
    eccentricity: f64,
    angles: [f64; 3],
    semi_major_axis_au: f64,
    mean_anomaly: f64,
) -> std::result::Result<Elements, Status> {
    checked(epoch_mjd_tt, eccentricity, angles, semi_major_axis_au, mean_anomaly, true)
}

/// Elements by perihelion distance (au) and instant (MJD TT); angles as in [`from_mean_anomaly`].
pub fn from_perihelion(
    epoch_mjd_tt: f64,
    eccentricity: f64,
    angles: [f64; 3],
    perihelion_au: f64,
    perihelion_mjd_tt: f64,
) -> std::result::Result<Elements, Status> {
    checked(epoch_mjd_tt, eccentricity, angles, perihelion_au, perihelion_mjd_tt, false)
}

impl Orbits {
    /// No orbits yet.
    pub fn new() -> Orbits {
        Orbits::default()
    }

    /// Orbits from columns. Columns of unequal lengths are an [`Error`]; a wrong row is a [`Status`]
    /// (`each_impossible_row_has_its_status`).
    pub fn from_columns(columns: &Columns<'_>) -> Result<Orbits> {
        let n = columns.epoch_mjd_tt.len();
        let same = |what: &str, column: &[f64]| {
            if column.len() == n {
                Ok(())
            } else {
                Err(Error::invalid(what, format_args!("{} rows", column.len()), format!("{n}, as epochs")))
            }
        };
        same("eccentricity", columns.eccentricity)?;
        same("inclination", columns.inclination)?;
        same("node", columns.node)?;
        same("argument of perihelion", columns.perihelion_argument)?;
        match columns.anomaly {
            Anomaly::Mean { semi_major_axis_au, mean_anomaly } => {
                same("semi-major axis", semi_major_axis_au)?;
                same("mean anomaly", mean_anomaly)?;
            }
            Anomaly::Perihelion { perihelion_au, perihelion_mjd_tt } => {
                same("perihelion distance", perihelion_au)?;
                same("perihelion time", perihelion_mjd_tt)?;
            }
        }
        if let Some(h) = columns.h_mag {
            same("absolute magnitude", h)?;
        }
        match columns.slope {
            Slope::Common(_) => {}
            Slope::G(g) => same("slope G", g)?,
            Slope::G1G2(g1, g2) => {
                same("slope G1", g1)?;
                same("slope G2", g2)?;
            }
        }
        let mut orbits = Orbits::new();
        orbits.reserve(n);
        for row in 0..n {
            let angles = [columns.inclination[row], columns.node[row], columns.perihelion_argument[row]];
            let (epoch, e) = (columns.epoch_mjd_tt[row], columns.eccentricity[row]);
            let elements = match columns.anomaly {
                Anomaly::Mean { semi_major_axis_au, mean_anomaly } => {
                    from_mean_anomaly(epoch, e, angles, semi_major_axis_au[row], mean_anomaly[row])
                }
                Anomaly::Perihelion { perihelion_au, perihelion_mjd_tt } => {
                    from_perihelion(epoch, e, angles, perihelion_au[row], perihelion_mjd_tt[row])
                }
            };
            let h = columns.h_mag.map_or(f64::NAN, |h| h[row]);
            let brightness = match columns.slope {
                Slope::Common(g) => Brightness::Hg { h, g },
                Slope::G(g) => Brightness::Hg { h, g: g[row] },
                Slope::G1G2(g1, g2) => Brightness::Hg1g2 { h, g1: g1[row], g2: g2[row] },
            };
            orbits.push(elements, brightness);
        }
        Ok(orbits)
    }

    fn reserve(&mut self, more: usize) {
        self.status.reserve(more);
        self.elements.reserve(more);
        self.brightness.reserve(more);
        for column in [
            &mut self.epoch_day,
            &mut self.epoch_fraction,
            &mut self.since_perihelion,
            &mut self.period,
            &mut self.frequency,
            &mut self.eccentricity,
            &mut self.rate,
        ] {
            column.reserve(more);
        }
        self.perturbation.reserve(more);
        self.along.iter_mut().chain(&mut self.across).for_each(|column| column.reserve(more));
    }

    /// Adds a row: elements, or what is wrong with it.
    pub fn push(&mut self, elements: std::result::Result<Elements, Status>, brightness: Brightness) {
        let (status, elements) = match elements {
            Ok(elements) => (Status::Ok, elements),
            Err(status) => (status, no_elements()),
        };
        let Elements { perihelion_au: q, eccentricity: e, .. } = elements;
        let (day, fraction) = elements.epoch.mjd_parts();
        let period = elements.period_d();
        let bound = status == Status::Ok && period.is_finite();
        let (along, across) = elements.axes();
        self.status.push(status);
        self.elements.push(elements);
        self.brightness.push(brightness);
        self.epoch_day.push(day);
        self.epoch_fraction.push(fraction);
        self.since_perihelion.push(elements.since_perihelion_d);
        self.period.push(if bound { period } else { 0.0 });
        self.frequency.push(if bound { 1.0 / period } else { 0.0 });
        self.eccentricity.push(e);
        self.rate.push((GM_SUN / q).sqrt() / q);
        let planets = match self.planets {
            Some(planets) if planets.epoch() == elements.epoch => planets,
            _ => drift::Planets::at(elements.epoch),
        };
        self.planets = Some(planets);
        self.perturbation.push(drift::perturbation(&elements, &planets));
        for (axis, (p, a)) in scale(q, along).into_iter().zip(scale(q * (1.0 + e).sqrt(), across)).enumerate()
        {
            self.along[axis].push(p);
            self.across[axis].push(a);
        }
    }

    /// The same bodies with other elements, a row a row: what [`Orbits::advance`] gives, ranges joined in order.
    pub fn with_elements(&self, elements: &[std::result::Result<Elements, Status>]) -> Result<Orbits> {
        if elements.len() != self.len() {
            let given = format_args!("{} rows", elements.len());
            return Err(Error::invalid("elements", given, format!("{}, as orbits", self.len())));
        }
        let mut orbits = Orbits::new();
        orbits.reserve(elements.len());
        for (&elements, &brightness) in elements.iter().zip(&self.brightness) {
            orbits.push(elements, brightness);
        }
        Ok(orbits)
    }

    /// How many rows, bad ones included.
    pub fn len(&self) -> usize {
        self.status.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.status.is_empty()
    }

    /// What is to be said of a row, whatever the instant.
    pub fn status(&self, row: usize) -> Status {
        self.status[row]
    }

    /// The elements of a row; NaN throughout if it is bad.
    pub fn elements(&self, row: usize) -> &Elements {
        &self.elements[row]
    }

    /// How bright a row is.
    pub fn brightness(&self, row: usize) -> Brightness {
        self.brightness[row]
    }

    /// How far two-body motion may have drifted from the true one at an instant, au: see [`drift`](super::drift).
    pub fn drift_au(&self, row: usize, tdb: Instant<Tdb>) -> f64 {
        let elements = &self.elements[row];
        drift::drift_au(self.perturbation[row], elements.period_d(), tdb.days_since(elements.epoch))
    }

    /// [`Status::FarFromEpoch`] where the drift seen from `distance_au` may exceed [`drift::LIMIT`]; a bad row's status
    /// as it is.
    pub fn status_at(&self, row: usize, tdb: Instant<Tdb>, distance_au: f64) -> Status {
        let far = self.drift_au(row, tdb) > drift::LIMIT * distance_au;
        self.status[row].worst(if far { Status::FarFromEpoch } else { Status::Ok })
    }

    /// Heliocentric state of a row by two-body motion, au and au/day, ICRS axes; NaN for a bad row. The very numbers of
    /// [`Orbits::heliocentric_batch`] with [`Isa::best`].
    pub fn heliocentric(&self, row: usize, tdb: Instant<Tdb>) -> State {
        let [mut x, mut y, mut z, mut u, mut v, mut w] = [[0.0]; 6];
        self.heliocentric_batch(
            Isa::best(),
            row..row + 1,
            tdb,
            [&mut x, &mut y, &mut z],
            Some([&mut u, &mut v, &mut w]),
        );
        State { position: [x[0], y[0], z[0]], velocity: [u[0], v[0], w[0]] }
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

/// What a bad row holds.
fn no_elements() -> Elements {
    Elements {
        epoch: Instant::from_mjd(0.0, 0.0),
        perihelion_au: f64::NAN,
        eccentricity: f64::NAN,
        inclination: f64::NAN,
        node: f64::NAN,
        perihelion_argument: f64::NAN,
        since_perihelion_d: f64::NAN,
    }
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
        // Adding and taking away this rounds to a whole number.
        const ROUNDER: f64 = 6_755_399_441_055_744.0;
        let mut mean = [0.0; BLOCK];
        let mut x = [0.0; BLOCK];
        let mut y = [0.0; BLOCK];
        let mut c0 = [0.0; BLOCK];
        let mut speed = [0.0; BLOCK];
        let mut open = [0.0; BLOCK];
        for i in 0..n {
            let time = since[i] + ((day - epoch_day[i]) + (fraction - epoch_fraction[i]));
            let turns = (time * frequency[i] + ROUNDER) - ROUNDER;
            let m = A::multiply_add(-turns, period[i], time) * rate[i];
            let (place, settled) = kepler::solve_quickly::<A>(eccentricity[i], m);
            mean[i] = m;
            x[i] = place.x;
            y[i] = place.y;
            c0[i] = place.c0;
            speed[i] = rate[i] / place.r;
            open[i] = if settled { 0.0 } else { 1.0 };
        }
        for i in 0..n {
            if open[i] != 0.0 {
                let place = kepler::solve_safely(eccentricity[i], mean[i]);
                (x[i], y[i], c0[i], speed[i]) = (place.x, place.y, place.c0, rate[i] / place.r);
            }
        }
        for axis in 0..3 {
            let along = &orbits.along[axis][rows.clone()][..n];
            let across = &orbits.across[axis][rows.clone()][..n];
            let position = &mut self.position[axis];
            let velocity = &mut self.velocity[axis];
            for i in 0..n {
                position[i] = A::multiply_add(x[i], along[i], y[i] * across[i]);
                velocity[i] = speed[i] * A::multiply_add(c0[i], across[i], -(y[i] * along[i]));
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
        const LIGHT_TIME_AU_D: f64 = LIGHT_TIME_AU_S / SECONDS_PER_DAY;
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
                let (pull, turn) = derivatives(p, v);
                let mut at = [p[0] + s[0], p[1] + s[1], p[2] + s[2]];
                let mut light_time = 0.0;
                for _ in 0..3 {
                    light_time = LIGHT_TIME_AU_D * (at[0] * at[0] + at[1] * at[1] + at[2] * at[2]).sqrt();
                    let second = 0.5 * light_time * pull;
                    at = [0, 1, 2].map(|axis| {
                        // The second and third derivatives are −pull·p and −pull·(v − turn·p); the Sun moves straight.
                        let third = A::multiply_add(
                            light_time * (1.0 / 3.0),
                            A::multiply_add(-turn, p[axis], v[axis]),
                            -p[axis],
                        );
                        let slope = A::multiply_add(second, third, -(v[axis] + sun_velocity[axis]));
                        A::multiply_add(light_time, slope, p[axis] + s[axis])
                    });
                }
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
                    let (pull, turn) = derivatives(p, v);
                    let t = light_times[i];
                    // The body's barycentric velocity when the light left, and the share by which light time shortens.
                    let left = [0, 1, 2].map(|axis| {
                        let bend = p[axis] - 0.5 * t * (v[axis] - turn * p[axis]);
                        v[axis] + sun_velocity[axis] + pull * t * bend
                    });
                    let observer = self.observer.velocity;
                    let distance = dot(d, d).sqrt();
                    let receding = dot(d, left) / distance;
                    let shortening = (receding - dot(d, observer) / distance) * LIGHT_TIME_AU_D
                        / (1.0 + LIGHT_TIME_AU_D * receding);
                    for axis in 0..3 {
                        rate[axis][done + i] = left[axis] * (1.0 - shortening) - observer[axis];
                    }
                }
            }
            done += n;
        }
    }
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
    use crate::ephemeris::{Body, Compact};
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

    #[test]
    fn each_impossible_row_has_its_status() {
        let good = (60_000.0, 0.1, [0.2, 0.3, 0.4], 2.5, 1.0);
        let mean = |(t, e, angles, a, m): (f64, f64, [f64; 3], f64, f64)| {
            from_mean_anomaly(t, e, angles, a, m).err()
        };
        assert_eq!(mean(good), None);
        assert_eq!(mean((f64::NAN, 0.1, [0.2, 0.3, 0.4], 2.5, 1.0)), Some(Status::NotFinite));
        for wrong in [
            (60_000.0, -0.1, [0.2, 0.3, 0.4], 2.5, 1.0),
            (60_000.0, 2e6, [0.2, 0.3, 0.4], -2.5, 1.0),
            (60_000.0, 0.1, [0.2, 0.3, 0.4], -2.5, 1.0),
            (60_000.0, 1.1, [0.2, 0.3, 0.4], 2.5, 1.0),
            (60_000.0, 1.0, [0.2, 0.3, 0.4], 2.5, 1.0),
            (60_000.0, 0.1, [0.2, 0.3, 0.4], 0.0, 1.0),
            (60_000.0, 0.1, [-0.2, 0.3, 0.4], 2.5, 1.0),
            (60_000.0, 0.1, [3.2, 0.3, 0.4], 2.5, 1.0),
            (60_000.0, 0.1, [0.2, 7.0, 0.4], 2.5, 1.0),
            (60_000.0, 0.1, [0.2, 0.3, -7.0], 2.5, 1.0),
            (60_000.0, 0.1, [0.2, 0.3, 0.4], 2.5, 7.0),
            (2e7, 0.1, [0.2, 0.3, 0.4], 2.5, 1.0),
        ] {
            assert_eq!(mean(wrong), Some(Status::Elements), "{wrong:?}");
        }
        let perihelion = |q, t| from_perihelion(60_000.0, 1.0, [0.2, 0.3, 0.4], q, t).err();
        assert_eq!(perihelion(1.0, 60_100.0), None);
        assert_eq!(perihelion(0.0, 60_100.0), Some(Status::Elements));
        assert_eq!(perihelion(-1.0, 60_100.0), Some(Status::Elements));
        assert_eq!(perihelion(1.0, f64::INFINITY), Some(Status::NotFinite));
        assert_eq!(perihelion(1.0, 2e7), Some(Status::Elements));
    }

    #[test]
    fn a_bad_row_keeps_its_place_and_touches_no_other() {
        let columns = Columns {
            epoch_mjd_tt: &[60_000.0; 3],
            eccentricity: &[0.1, -0.1, 0.1],
            inclination: &[0.1; 3],
            node: &[0.2; 3],
            perihelion_argument: &[0.3; 3],
            anomaly: Anomaly::Mean { semi_major_axis_au: &[2.5; 3], mean_anomaly: &[1.0; 3] },
            h_mag: None,
            slope: Slope::Common(0.15),
        };
        let orbits = Orbits::from_columns(&columns).unwrap();
        assert_eq!([0, 1, 2].map(|row| orbits.status(row)), [Status::Ok, Status::Elements, Status::Ok]);
        let (position, _) = batch(&orbits, Isa::best());
        assert!(position[0][1].is_nan() && orbits.heliocentric(1, at()).velocity[2].is_nan());
        assert_eq!(position[0][0], position[0][2]);
        assert!(position[0][0].is_finite());
        let short = Columns { node: &[0.2; 2], ..columns };
        let message = Orbits::from_columns(&short).unwrap_err().to_string();
        assert_eq!(message, "node: given 2 rows, allowed 3, as epochs");
    }

    /// Mean anomaly and perihelion time are two ways to say one thing.
    #[test]
    fn both_anomalies_give_one_orbit() {
        for (e, a) in [(0.3, 2.5), (1.4, -3.0)] {
            let angles = [0.2, 0.3, 0.4];
            let by_mean = from_mean_anomaly(60_000.0, e, angles, a, 0.7).unwrap();
            let perihelion = 60_000.0 - by_mean.since_perihelion_d;
            let by_time = from_perihelion(60_000.0, e, angles, a * (1.0 - e), perihelion).unwrap();
            assert!((by_mean.mean_anomaly() - 0.7).abs() < 1e-14);
            assert!((by_time.perihelion_mjd_tt() - perihelion).abs() < 1e-9);
            // The two instants are converted to TDB, which moves by up to 3 ms between them.
            assert!((by_mean.since_perihelion_d - by_time.since_perihelion_d).abs() < 5e-8);
        }
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
