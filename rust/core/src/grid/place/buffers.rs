//! Directions of a block of rows, component by component, and the loops that turn them into columns.
//!
//! The loops are compiled for every instruction set and have no branch and no call in them, so LLVM
//! runs them on whole registers.

use super::columns::{PLACE_AIRMASS, PlaceColumn};
use crate::astrometry::{Sky, StarColumns, star_direction};
use crate::constants::RADIANS_PER_DEGREE;
use crate::horizon::Latitude;
use crate::math::dispatch::{Arithmetic, Kernel};
use crate::math::elementary::{atan2, wrap_positive};
use crate::math::vector::{Matrix, Vector, rotate};
use crate::refraction::Refraction;

/// Rows a block: what a block touches stays in the second level of the cache.
pub(super) const ROWS: usize = 1024;

/// Components of one direction a row.
pub(super) type Directions = [[f64; ROWS]; 3];

/// What is known of a block's rows before any angle is taken.
pub(super) struct Buffers {
    /// Proper direction on the axes of the GCRS.
    pub direction: Directions,
    /// The same towards north, east and zenith.
    pub local: Directions,
    /// The celestial intermediate pole, the Moon and the Sun on the axes of the GCRS.
    pub pole: Directions,
    pub moon: Directions,
    pub sun: Directions,
}

impl Buffers {
    pub fn new() -> Box<Self> {
        let none = [[f64::NAN; ROWS]; 3];
        Box::new(Buffers { direction: none, local: none, pole: none, moon: none, sun: none })
    }
}

/// Writes one direction in one row.
pub(super) fn set(directions: &mut Directions, row: usize, direction: Vector) {
    for axis in 0..3 {
        directions[axis][row] = direction[axis];
    }
}

/// Writes one direction in many rows.
pub(super) fn fill(directions: &mut Directions, rows: std::ops::Range<usize>, direction: Vector) {
    for axis in 0..3 {
        directions[axis][rows.clone()].fill(direction[axis]);
    }
}

/// The chain of many stars under one sky.
pub(super) struct StarsUnderOneSky<'a> {
    pub stars: StarColumns<'a>,
    pub sky: &'a Sky,
    pub first: usize,
    pub buffers: &'a mut Buffers,
}

impl Kernel for StarsUnderOneSky<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let count = self.stars.len();
        let stars = self.stars.exactly(count);
        let [x, y, z] = &mut self.buffers.direction;
        let [x, y, z] = [x, y, z].map(|c| &mut c[self.first..][..count]);
        let [north, east, zenith] = &mut self.buffers.local;
        let [north, east, zenith] = [north, east, zenith].map(|c| &mut c[self.first..][..count]);
        // Copies, which the compiler then keeps in registers instead of fearing that an output overwrites them.
        let (sky, matrix): (Sky, Matrix) = (*self.sky, self.sky.local);
        for row in 0..count {
            let direction = star_direction(&stars.star(row), &sky);
            [x[row], y[row], z[row]] = direction;
            [north[row], east[row], zenith[row]] = rotate(&matrix, direction);
        }
    }
}

/// One column of a block.
pub(super) struct WriteColumn<'a> {
    pub column: PlaceColumn,
    pub buffers: &'a Buffers,
    pub refraction: &'a Refraction,
    pub latitude: Latitude,
    pub out: &'a mut [f64],
}

const DEGREES_PER_RADIAN: f64 = 1.0 / RADIANS_PER_DEGREE;

impl Kernel for WriteColumn<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let rows = self.out.len().min(ROWS);
        let out = &mut self.out[..rows];
        let [north, east, zenith] = &self.buffers.local;
        let [north, east, zenith] = [north, east, zenith].map(|c| &c[..rows]);
        let Latitude { sin, cos } = self.latitude;
        match self.column {
            PlaceColumn::AltitudeDeg => {
                for row in 0..rows {
                    out[row] = topocentric::<A>(north[row], east[row], zenith[row]);
                }
                for value in out.iter_mut() {
                    *value = self.refraction.observed_altitude(*value) * DEGREES_PER_RADIAN;
                }
            }
            PlaceColumn::AzimuthDeg => {
                for row in 0..rows {
                    let degrees = wrap_positive::<A>(atan2::<A>(east[row], north[row])) * DEGREES_PER_RADIAN;
                    // The last double below 2π must not become 360.
                    out[row] = if degrees >= 360.0 { 0.0 } else { degrees };
                }
            }
            PlaceColumn::HourAngleDeg => {
                for row in 0..rows {
                    let towards_equator = zenith[row] * cos - north[row] * sin;
                    out[row] = atan2::<A>(0.0 - east[row], towards_equator) * DEGREES_PER_RADIAN;
                }
            }
            PlaceColumn::DeclinationDeg => {
                separation::<A>(&self.buffers.direction, &self.buffers.pole, out);
                for value in out.iter_mut() {
                    *value = 90.0 - *value;
                }
            }
            PlaceColumn::Airmass => {
                for row in 0..rows {
                    let altitude = topocentric::<A>(north[row], east[row], zenith[row]);
                    let observed = self.refraction.observed_altitude(altitude);
                    out[row] = PLACE_AIRMASS.airmass(observed, altitude);
                }
            }
            PlaceColumn::ParallacticAngleDeg => {
                for row in 0..rows {
                    let squared = north[row] * north[row] + east[row] * east[row];
                    let along = sin * squared - cos * zenith[row] * north[row];
                    out[row] = atan2::<A>(0.0 - cos * east[row], along) * DEGREES_PER_RADIAN;
                }
            }
            PlaceColumn::MoonSeparationDeg => {
                separation::<A>(&self.buffers.direction, &self.buffers.moon, out);
            }
            PlaceColumn::SunSeparationDeg => {
                separation::<A>(&self.buffers.direction, &self.buffers.sun, out);
            }
        }
    }
}

/// Altitude, radians, of a direction without air.
#[inline(always)]
fn topocentric<A: Arithmetic>(north: f64, east: f64, zenith: f64) -> f64 {
    atan2::<A>(zenith, A::multiply_add(north, north, east * east).sqrt())
}

/// Angle between two unit vectors a row, degrees, well conditioned from 0 to 180.
#[inline(always)]
fn separation<A: Arithmetic>(a: &Directions, b: &Directions, out: &mut [f64]) {
    let rows = out.len();
    let [ax, ay, az] = [&a[0][..rows], &a[1][..rows], &a[2][..rows]];
    let [bx, by, bz] = [&b[0][..rows], &b[1][..rows], &b[2][..rows]];
    for row in 0..rows {
        let x = ay[row] * bz[row] - az[row] * by[row];
        let y = az[row] * bx[row] - ax[row] * bz[row];
        let z = ax[row] * by[row] - ay[row] * bx[row];
        let along = ax[row] * bx[row] + ay[row] * by[row] + az[row] * bz[row];
        out[row] = atan2::<A>((x * x + y * y + z * z).sqrt(), along) * DEGREES_PER_RADIAN;
    }
}
