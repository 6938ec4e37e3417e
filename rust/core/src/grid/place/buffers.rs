//! Directions of a block of rows, component by component, and the loops that turn them into columns.
//!
//! The loops are compiled for every instruction set and have no branch and no call in them, so LLVM
//! runs them on whole registers.

use super::columns::{PLACE_AIRMASS, PlaceColumn, PlaceColumns};
use crate::astrometry::{Observer, Sky, StarColumns, near_direction, star_direction};
use crate::constants::{EARTH_ROTATION_RAD_PER_S, RADIANS_PER_DEGREE};
use crate::horizon::Latitude;
use crate::math::dispatch::{Arithmetic, Isa, Kernel};
use crate::math::elementary::{atan2, wrap_positive};
use crate::math::vector::{Matrix, Vector, rotate};
use crate::refraction::Refraction;
use crate::windows::{MoonLight, SkyModel, sky_brightness};

/// Rows a block: what a block touches stays in the second level of the cache.
pub(in crate::grid) const ROWS: usize = 1024;

/// One number a row.
type Numbers = [f64; ROWS];
/// Components of one direction a row.
pub(super) type Directions = [Numbers; 3];

/// What is known of a block's rows before any angle is taken.
#[derive(Clone)]
pub(in crate::grid) struct Buffers {
    /// Proper direction on the axes of the GCRS.
    pub direction: Directions,
    /// Distance travelled by the light, au, of rows of orbits.
    pub distance_au: Numbers,
    /// The same towards north, east and zenith.
    pub local: Directions,
    /// The celestial intermediate pole, the Moon and the Sun on the axes of the GCRS.
    pub pole: Directions,
    pub moon: Directions,
    pub sun: Directions,
    /// Sine of the Moon's altitude, and its phase angle, radians.
    pub moon_light: [Numbers; 2],
    /// Altitudes without air and as observed, radians.
    topocentric: Numbers,
    observed: Numbers,
}

impl Buffers {
    pub fn new() -> Box<Self> {
        let none = [[f64::NAN; ROWS]; 3];
        let [distance_au, topocentric, observed] = [[f64::NAN; ROWS]; 3];
        Box::new(Buffers {
            direction: none,
            distance_au,
            local: none,
            pole: none,
            moon: none,
            sun: none,
            moon_light: [topocentric, observed],
            topocentric,
            observed,
        })
    }

    /// Turns the directions of a block's first rows into the columns asked for.
    pub fn write(&mut self, out: &mut PlaceColumns<'_>, observer: &Observer<'_>, isa: Isa) {
        let rows = out.status.len();
        if out.wants(PlaceColumn::AltitudeDeg) || out.wants(PlaceColumn::Airmass) {
            isa.run(Altitudes { buffers: self, refraction: observer.refraction, rows });
        }
        let latitude = Latitude::new(observer.site.latitude());
        let sky_model = out.sky_model;
        for (column, values) in out.columns.iter_mut().filter(|(column, _)| !column.is_of_looks()) {
            isa.run(WriteColumn { column: *column, buffers: self, latitude, sky_model, out: values });
        }
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

/// The rest of the chain of many near bodies under one sky, from the vectors (au) in `buffers.direction`.
pub(super) struct NearUnderOneSky<'a> {
    pub sky: &'a Sky,
    pub rows: std::ops::Range<usize>,
    pub buffers: &'a mut Buffers,
}

impl Kernel for NearUnderOneSky<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let (first, count) = (self.rows.start, self.rows.len());
        let [x, y, z] = &mut self.buffers.direction;
        let [x, y, z] = [x, y, z].map(|c| &mut c[first..][..count]);
        let [north, east, zenith] = &mut self.buffers.local;
        let [north, east, zenith] = [north, east, zenith].map(|c| &mut c[first..][..count]);
        let distance_au = &mut self.buffers.distance_au[first..][..count];
        let (sky, matrix): (Sky, Matrix) = (*self.sky, self.sky.local);
        for row in 0..count {
            let seen = near_direction([x[row], y[row], z[row]], &sky);
            distance_au[row] = seen.light_distance_au;
            [x[row], y[row], z[row]] = seen.direction;
            [north[row], east[row], zenith[row]] = rotate(&matrix, seen.direction);
        }
    }
}

/// The altitudes of a block, which more than one column is made of.
struct Altitudes<'a> {
    buffers: &'a mut Buffers,
    refraction: &'a Refraction,
    rows: usize,
}

impl Kernel for Altitudes<'_> {
    type Output = ();

    #[inline(always)]
    fn run<A: Arithmetic>(self) {
        let rows = self.rows.min(ROWS);
        let [north, east, zenith] = &self.buffers.local;
        let [north, east, zenith] = [north, east, zenith].map(|c| &c[..rows]);
        let topocentric = &mut self.buffers.topocentric[..rows];
        let observed = &mut self.buffers.observed[..rows];
        for row in 0..rows {
            let across = A::multiply_add(north[row], north[row], east[row] * east[row]).sqrt();
            topocentric[row] = atan2::<A>(zenith[row], across);
        }
        observed.copy_from_slice(topocentric);
        self.refraction.observe(observed);
    }
}

/// One column of a block.
struct WriteColumn<'a> {
    column: PlaceColumn,
    buffers: &'a Buffers,
    latitude: Latitude,
    sky_model: SkyModel,
    out: &'a mut [f64],
}

const DEGREES_PER_RADIAN: f64 = 1.0 / RADIANS_PER_DEGREE;
/// The rotation of the Earth, arcseconds a second: 15.041067.
const ROTATION_ARCSEC_S: f64 = EARTH_ROTATION_RAD_PER_S * DEGREES_PER_RADIAN * 3600.0;

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
                for (value, observed) in out.iter_mut().zip(&self.buffers.observed) {
                    *value = observed * DEGREES_PER_RADIAN;
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
                let topocentric = &self.buffers.topocentric[..rows];
                let observed = &self.buffers.observed[..rows];
                for row in 0..rows {
                    out[row] = PLACE_AIRMASS.airmass_in_loop::<A>(observed[row], topocentric[row]);
                }
            }
            PlaceColumn::ParallacticAngleDeg => {
                for row in 0..rows {
                    let squared = north[row] * north[row] + east[row] * east[row];
                    let along = sin * squared - cos * zenith[row] * north[row];
                    out[row] = atan2::<A>(0.0 - cos * east[row], along) * DEGREES_PER_RADIAN;
                }
            }
            PlaceColumn::AzimuthRateArcsecS => {
                for row in 0..rows {
                    let squared = north[row] * north[row] + east[row] * east[row];
                    out[row] = ROTATION_ARCSEC_S * (sin - cos * north[row] * zenith[row] / squared);
                }
            }
            PlaceColumn::ParallacticAngleRateArcsecS => {
                for row in 0..rows {
                    let squared = north[row] * north[row] + east[row] * east[row];
                    out[row] = ROTATION_ARCSEC_S * (0.0 - cos * north[row] / squared);
                }
            }
            PlaceColumn::MoonSeparationDeg => {
                separation::<A>(&self.buffers.direction, &self.buffers.moon, out);
            }
            PlaceColumn::SunSeparationDeg => {
                separation::<A>(&self.buffers.direction, &self.buffers.sun, out);
            }
            PlaceColumn::SkyBrightnessMagArcsec2 => {
                separation::<A>(&self.buffers.direction, &self.buffers.moon, out);
                let [sin_altitude, phase_angle] = &self.buffers.moon_light;
                for row in 0..rows {
                    let moon = MoonLight {
                        sin_altitude: sin_altitude[row],
                        separation: out[row] * RADIANS_PER_DEGREE,
                        phase_angle: phase_angle[row],
                    };
                    out[row] = sky_brightness(&self.sky_model, zenith[row], Some(moon));
                }
            }
            // Written by `looks`.
            _ => {}
        }
    }
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
