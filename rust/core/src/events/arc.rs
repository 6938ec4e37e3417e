//! A day of TT in which the sky of a target is a handful of coefficients.
//!
//! Days are the same for every span that is asked for, so an event depends on its day alone: spans
//! joined at any instant lose no event, double none, and agree bit for bit.
//!
//! For a star ([`StarArc`]) the whole chain up to the CIRS is computed at the beginning, the middle
//! and the end of the day, and taken as a quadratic between: what is left out is the third difference
//! of annual aberration over half a day, 1 µas, and of the deflection of light, 20 µas at 5° from the
//! Sun. That of fortnightly nutation, 150 µas, is the same turn of the sky for every star and is put
//! back by the arc. The rotation of the Earth and the pole are quadratics through the same instants. Diurnal
//! aberration is applied on the horizon, where its velocity is constant. Left out: the product of the
//! two aberrations that is a rotation (15 µas), diurnal parallax of stars (33 µas for the nearest).
//! Together below [`STAR_ARC_ERROR_RAD`].
//!
//! For a body ([`BodyArc`](super::BodyArc)) the exact chain is sampled on Chebyshev nodes over the day.

use crate::astrometry::{Observer, Sky, Star, Track, star_direction};
use crate::constants::{
    EARTH_ROTATION_RAD_PER_S, RADIANS_PER_MICROARCSECOND, SECONDS_PER_DAY, SPEED_OF_LIGHT_M_S, TURN,
};
use crate::earth::{polar_motion, s_prime};
use crate::error::Status;
use crate::horizon::Latitude;
use crate::math::chebyshev::node;
use crate::math::vector::{
    Matrix, Vector, add, add_scaled, cross, dot, product, rotate, rotate_back, rotation_3, scale, sub,
};
use crate::time::{Instant, Tai, Tt, Utc};

/// What a star's arc leaves out, radians: the sum of the terms in the module's text, 20° from the Sun
/// or farther it is half of that.
pub const STAR_ARC_ERROR_RAD: f64 = 70.0 * RADIANS_PER_MICROARCSECOND;

const NANOSECONDS_PER_DAY: f64 = SECONDS_PER_DAY * 1e9;

/// Coefficients of the separation between two directions over a day, in which the rotation of the
/// Earth enters by the Moon's parallax alone.
pub const SEPARATION_NODES: usize = 17;

/// What is the same for all targets during one day.
#[derive(Debug, Clone)]
pub struct Arc<'a> {
    /// Who looks.
    pub observer: Observer<'a>,
    /// MJD of the day's beginning, TT.
    pub day: i64,
    /// UTC at the day's beginning when it runs as TAI does throughout the day: no leap second, and not
    /// before 1972. None otherwise.
    pub utc_at_start: Option<Utc>,
    /// The worst that is to be said of the Earth orientation during the day.
    pub note: Status,
    /// Error of UT1 and of the pole during the day.
    pub ut1_error_s: f64,
    /// Error of the pole, radians.
    pub pole_error: f64,
    /// Sine and cosine of the latitude.
    pub latitude: Latitude,
    /// The observer's sky at the beginning and the end.
    skies_at_ends: [Sky; 2],
    /// The sky of the Earth's centre at the three nodes.
    pub(super) centre: [Sky; 3],
    /// Angle of rotation at the three nodes, unwrapped, and coefficients of powers of the day's fraction.
    pub(super) rotation_angle: [f64; 3],
    pub(super) rotation: [f64; 3],
    /// From the rotated axes to the horizon: at the middle of the day, and coefficients.
    horizon_at_middle: Matrix,
    pub(super) horizon: [Matrix; 3],
    /// From the CIRS to the horizon at the beginning and the end, from the nodes themselves.
    ends: [Matrix; 2],
    /// The horizontal plane.
    zenith: Plane,
    /// Third differences of the celestial intermediate pole over the day: X and Y of the track less
    /// the quadratics are these times u (u − ½)(u − 1).
    pub(super) bend: [f64; 2],
    /// Velocity of the site by the rotation over the speed of light, towards the east.
    pub(super) diurnal_aberration: f64,
    track: &'a Track,
}

/// A quadratic in the day's fraction from values at 0, ½ and 1.
fn quadratic(at: [f64; 3]) -> [f64; 3] {
    [at[0], 4.0 * at[1] - 3.0 * at[0] - at[2], 2.0 * (at[0] + at[2]) - 4.0 * at[1]]
}

impl<'a> Arc<'a> {
    /// The day `day` (MJD, TT). The track must reach from its beginning to its end.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn new(observer: Observer<'a>, track: &'a Track, day: i64) -> std::result::Result<Self, Status> {
        let instant = |i: usize| Instant::<Tt>::from_mjd(day as f64, 0.5 * i as f64).to_tai();
        let mut centre = Vec::with_capacity(3);
        let mut skies = Vec::with_capacity(3);
        let mut horizon_at = [[[0.0; 3]; 3]; 3];
        let mut rotation_angle = [0.0; 3];
        let (mut note, mut ut1_error_s, mut pole_error) = (Status::Ok, 0.0f64, 0.0f64);
        for i in 0..3 {
            let tai = instant(i);
            let celestial = track.celestial(tai.to_tt())?;
            let sky = observer.sky_from(tai, &celestial);
            let wobble = polar_motion(sky.pole.xp, sky.pole.yp, s_prime(tai.to_tt()));
            horizon_at[i] = product(observer.site.local(), &wobble);
            rotation_angle[i] = sky.rotation_angle;
            note = note.worst(sky.note());
            ut1_error_s = ut1_error_s.max(sky.pole.ut1_error_s);
            pole_error = pole_error.max(sky.pole.pole_error);
            centre.push(sky.geocentric(&celestial));
            skies.push(sky);
        }
        // Half a day is a little more than half a turn.
        for i in 1..3 {
            let expected = rotation_angle[i - 1] + 0.5 * SECONDS_PER_DAY * EARTH_ROTATION_RAD_PER_S;
            rotation_angle[i] += TURN * ((expected - rotation_angle[i]) / TURN).round();
        }
        let mut horizon = [[[0.0; 3]; 3]; 3];
        for row in 0..3 {
            for column in 0..3 {
                let powers = quadratic([0, 1, 2].map(|i| horizon_at[i][row][column]));
                for power in 0..3 {
                    horizon[power][row][column] = powers[power];
                }
            }
        }
        let pole_at = |fraction: f64| {
            let tt = Instant::<Tt>::from_mjd(day as f64, fraction);
            track.celestial(tt).map(|celestial| [celestial.x, celestial.y])
        };
        let nodes = [pole_at(0.0)?, pole_at(0.5)?, pole_at(1.0)?];
        let (quarter, three_quarters) = (pole_at(0.25)?, pole_at(0.75)?);
        let bend = [0, 1].map(|axis| {
            let powers = quadratic([nodes[0][axis], nodes[1][axis], nodes[2][axis]]);
            let smooth = |u: f64| powers[0] + u * (powers[1] + u * powers[2]);
            // u (u − ½)(u − 1) is ±3/64 at the quarters.
            ((quarter[axis] - smooth(0.25)) - (three_quarters[axis] - smooth(0.75))) * 64.0 / 6.0
        });
        let position = observer.site.terrestrial();
        let end = |i: usize| product(&horizon_at[i], &rotation_3(centre[i].rotation_angle));
        Ok(Arc {
            bend,
            skies_at_ends: [skies[0], skies[2]],
            ends: [end(0), end(2)],
            zenith: Plane::of(&horizon_at[1], [0.0, 0.0, 1.0]),
            observer,
            day,
            utc_at_start: steady_utc(&observer, instant(0), instant(2)),
            note,
            ut1_error_s,
            pole_error,
            latitude: Latitude::new(observer.site.latitude()),
            centre: [centre[0], centre[1], centre[2]],
            rotation_angle,
            rotation: quadratic(rotation_angle),
            horizon_at_middle: horizon_at[1],
            horizon,
            diurnal_aberration: EARTH_ROTATION_RAD_PER_S * position[0].hypot(position[1])
                / SPEED_OF_LIGHT_M_S,
            track,
        })
    }

    /// The instant at a fraction of the day.
    pub fn instant(&self, fraction: f64) -> Instant<Tai> {
        Instant::<Tt>::from_mjd(self.day as f64, 0.0).to_tai().plus_seconds(fraction * SECONDS_PER_DAY)
    }

    /// The instant, UTC, at a fraction of the day, 0 to 1.
    #[inline]
    pub fn utc(&self, fraction: f64) -> Utc {
        match self.utc_at_start {
            // Half a nanosecond and the cut of the conversion: rounded to the nearest.
            Some(start) => start.plus_nanoseconds((fraction * NANOSECONDS_PER_DAY + 0.5) as i64),
            // A day within the ephemeris and after the span's start has a UTC.
            None => {
                let leap_seconds = self.observer.orientation.leap_seconds();
                leap_seconds.to_utc(self.instant(fraction)).map_or(Utc::NOT_A_TIME, |utc| utc.0)
            }
        }
    }

    /// The fraction of the day at an instant; outside 0 to 1 for one outside the day.
    pub fn fraction(&self, tai: Instant<Tai>) -> f64 {
        tai.seconds_since(self.instant(0.0)) / SECONDS_PER_DAY
    }

    /// The sky of the observer, not of the Earth's centre, at a fraction of the day.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn sky(&self, fraction: f64) -> std::result::Result<Sky, Status> {
        self.track.sky(&self.observer, self.instant(fraction))
    }

    /// The observer's sky at the beginning and the end of the day.
    pub fn skies_at_ends(&self) -> &[Sky; 2] {
        &self.skies_at_ends
    }

    /// The sky of the Earth's centre at a fraction of the day.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn geocentric_sky(&self, fraction: f64) -> std::result::Result<Sky, Status> {
        let tai = self.instant(fraction);
        let celestial = self.track.celestial(tai.to_tt())?;
        Ok(self.observer.sky_from(tai, &celestial).geocentric(&celestial))
    }

    /// The observer's sky at the Chebyshev nodes of the day, from the end to the beginning.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn skies<const N: usize>(&self) -> std::result::Result<Vec<Sky>, Status> {
        (0..N).map(|j| self.sky(node_fraction::<N>(j))).collect()
    }

    /// From the CIRS to the horizon at a fraction of the day: rows north, east, zenith.
    pub fn cirs_to_horizon(&self, fraction: f64) -> Matrix {
        let mut horizon = self.horizon[0];
        for row in 0..3 {
            for column in 0..3 {
                horizon[row][column] +=
                    fraction * (self.horizon[1][row][column] + fraction * self.horizon[2][row][column]);
            }
        }
        let turned = product(&horizon, &rotation_3(self.angle(fraction)));
        let [x, y] = self.bend_at(fraction);
        product(&turned, &[[1.0, 0.0, -x], [0.0, 1.0, -y], [x, y, 1.0]])
    }

    /// Direction of a star in the CIRS of the Earth's centre at one of the three nodes: one chain.
    #[inline(always)]
    fn cirs_at(&self, node: usize, star: &Star) -> Vector {
        let sky = &self.centre[node];
        rotate(&sky.intermediate, star_direction(star, sky))
    }

    /// Where the intermediate pole stands beyond its quadratic, radians.
    #[inline(always)]
    fn bend_at(&self, fraction: f64) -> [f64; 2] {
        let shape = fraction * (fraction - 0.5) * (fraction - 1.0);
        [shape * self.bend[0], shape * self.bend[1]]
    }

    /// A direction of the quadratic CIRS in the true one.
    #[inline(always)]
    fn bent(&self, cirs: Vector, fraction: f64) -> Vector {
        let [x, y] = self.bend_at(fraction);
        [cirs[0] - x * cirs[2], cirs[1] - y * cirs[2], cirs[2] + x * cirs[0] + y * cirs[1]]
    }

    /// A plane through the observer, given by its normal on the horizon, for
    /// [`DayPath::plane_crossings`](super::DayPath::plane_crossings).
    pub fn plane(&self, normal: Vector) -> Plane {
        Plane::of(&self.horizon_at_middle, normal)
    }

    /// The horizontal plane.
    pub fn zenith(&self) -> &Plane {
        &self.zenith
    }

    fn angle(&self, fraction: f64) -> f64 {
        self.rotation[0] + fraction * (self.rotation[1] + fraction * self.rotation[2])
    }

    /// Diurnal aberration of a direction on the horizon, to first order (the second is 0.2 µas).
    #[inline(always)]
    pub(super) fn with_diurnal_aberration(&self, local: Vector) -> Vector {
        let shrink = 1.0 - self.diurnal_aberration * local[1];
        [local[0] * shrink, local[1] * shrink + self.diurnal_aberration, local[2] * shrink]
    }
}

fn steady_utc(observer: &Observer<'_>, start: Instant<Tai>, stop: Instant<Tai>) -> Option<Utc> {
    let leap_seconds = observer.orientation.leap_seconds();
    let (start, _) = leap_seconds.to_utc(start).ok()?;
    let (stop, inside_leap_second) = leap_seconds.to_utc(stop).ok()?;
    let steady = stop.nanoseconds() - start.nanoseconds() == NANOSECONDS_PER_DAY as i64;
    (steady && !inside_leap_second).then_some(start)
}

/// A plane through the observer that turns with the Earth: the horizon, a vertical circle, an hour circle.
#[derive(Debug, Clone, Copy)]
pub struct Plane {
    /// Unit normal on the horizon: north, east, zenith.
    pub normal: Vector,
    /// Longitude of the normal on the rotating axes, and its components along the pole and across it.
    pub(super) longitude: f64,
    pub(super) along_pole: f64,
    pub(super) across_pole: f64,
}

impl Plane {
    fn of(horizon_at_middle: &Matrix, normal: Vector) -> Self {
        let [x, y, z] = rotate_back(horizon_at_middle, normal);
        Plane { normal, longitude: y.atan2(x), along_pole: z, across_pole: x.hypot(y) }
    }
}

/// The fraction of the day of Chebyshev node `j` of `N`.
pub fn node_fraction<const N: usize>(j: usize) -> f64 {
    0.5 * (1.0 + node(j, N))
}

/// What decides, from its catalogue place alone, that a star stays below an altitude during part of a day.
///
/// The sine of the altitude is c + a cos ωτ + b sin ωτ about the middle of the part; its greatest value in
/// −T to T needs no trigonometry. What the place leaves out (aberration, parallax, the change of
/// precession in a day) is below `SCREEN_MARGIN`.
#[derive(Debug, Clone, Copy)]
pub struct Screen {
    /// Zenith at the middle, the point it moves towards, and the pole, each times what the site's latitude
    /// makes of it, on the axes of the GCRS.
    zenith: Vector,
    onwards: Vector,
    pole: Vector,
    cos_half: f64,
    sin_half: f64,
    /// Julian years after J2000.0.
    years: f64,
}

/// What a catalogue place carried to the day may be off by, with room to spare, radians.
const SCREEN_MARGIN: f64 = 1e-3;

impl Screen {
    /// For the part of a day between two fractions.
    pub fn new(arc: &Arc<'_>, from: f64, to: f64) -> Self {
        let matrix = product(&arc.cirs_to_horizon(0.5 * (from + to)), &arc.centre[1].intermediate);
        let intermediate = &arc.centre[1].intermediate;
        let zenith = matrix[2];
        let along = dot(zenith, intermediate[2]);
        let pole = scale(along, intermediate[2]);
        let half = 0.5 * (to - from) * EARTH_ROTATION_RAD_PER_S * SECONDS_PER_DAY;
        let half = half.min(std::f64::consts::PI);
        Screen {
            zenith: sub(zenith, pole),
            // The zenith moves eastwards about the pole.
            onwards: cross(intermediate[2], zenith),
            pole,
            cos_half: half.cos(),
            sin_half: half.sin(),
            years: arc.centre[1].epoch_yr,
        }
    }

    /// Whether the star surely stays below an altitude, given by its sine, in the part.
    #[inline(always)]
    pub fn stays_below(&self, star: &Star, sin_threshold: f64) -> bool {
        let place = add_scaled(star.position, self.years - star.epoch_yr, star.motion);
        let (a, b, c) = (dot(self.zenith, place), dot(self.onwards, place), dot(self.pole, place));
        let swing = (a * a + b * b).sqrt();
        // The culmination lies in the part when its distance from the middle, whose cosine is a / swing, does.
        let peaks = a >= swing * self.cos_half;
        let highest = c + if peaks { swing } else { a * self.cos_half + b.abs() * self.sin_half };
        // NaN is not below.
        highest < (sin_threshold - SCREEN_MARGIN) * dot(place, place).sqrt()
    }
}

/// A star during one day.
#[derive(Debug, Clone, Copy)]
pub struct StarArc {
    /// Coefficients of powers of the day's fraction: direction in the CIRS of the Earth's centre.
    direction: [Vector; 3],
    /// The direction at the end of the day.
    last: Vector,
    circle: Circle,
}

/// The circle that a star describes, at the middle of a day, on the intermediate pole.
#[derive(Debug, Clone, Copy)]
struct Circle {
    right_ascension: f64,
    /// Rate of the hour angle a day.
    rate: f64,
    sin_declination: f64,
    /// Zero for a star so near the pole that it has no hour angle.
    cos_declination: f64,
}

impl StarArc {
    /// Three chains.
    #[inline(always)]
    pub fn new(arc: &Arc<'_>, star: &Star) -> Self {
        Self::through(arc, [arc.cirs_at(0, star), arc.cirs_at(1, star), arc.cirs_at(2, star)])
    }

    /// The same star on the day after: two chains, and the same bits as [`StarArc::new`], because the
    /// end of one day is the beginning of the next.
    #[inline(always)]
    pub fn on_the_next_day(&self, arc: &Arc<'_>, star: &Star) -> Self {
        Self::through(arc, [self.last, arc.cirs_at(1, star), arc.cirs_at(2, star)])
    }

    #[inline(always)]
    fn through(arc: &Arc<'_>, at: [Vector; 3]) -> Self {
        let first = scale(-3.0, at[0]);
        let direction = [
            at[0],
            sub(add_scaled(first, 4.0, at[1]), at[2]),
            scale(2.0, sub(add(at[0], at[2]), scale(2.0, at[1]))),
        ];
        let (middle, drift) = (at[1], sub(at[2], at[0]));
        let across_squared = middle[0] * middle[0] + middle[1] * middle[1];
        let circle = if across_squared >= 1e-16 {
            let right_ascension_rate = (middle[0] * drift[1] - middle[1] * drift[0]) / across_squared;
            Circle {
                right_ascension: middle[1].atan2(middle[0]),
                rate: arc.rotation[1] + arc.rotation[2] - right_ascension_rate,
                sin_declination: middle[2],
                cos_declination: across_squared.sqrt(),
            }
        } else {
            Circle {
                right_ascension: 0.0,
                rate: arc.rotation[1],
                sin_declination: middle[2],
                cos_declination: 0.0,
            }
        };
        StarArc { direction, last: at[2], circle }
    }

    /// Direction in the CIRS of the Earth's centre, the arc's bend not applied.
    #[inline(always)]
    pub fn cirs(&self, fraction: f64) -> Vector {
        add_scaled(self.direction[0], fraction, add_scaled(self.direction[1], fraction, self.direction[2]))
    }

    /// Direction on the horizon: north, east, zenith.
    #[inline(always)]
    pub fn local(&self, arc: &Arc<'_>, fraction: f64) -> Vector {
        self.local_and_rate(arc, fraction).0
    }

    /// Direction on the horizon, and its rate per day (the wobble of the pole, 1e-8 of it, left out).
    #[inline(always)]
    pub fn local_and_rate(&self, arc: &Arc<'_>, fraction: f64) -> (Vector, Vector) {
        let cirs = arc.bent(self.cirs(fraction), fraction);
        let drift = add_scaled(self.direction[1], 2.0 * fraction, self.direction[2]);
        let (sin, cos) = arc.angle(fraction).sin_cos();
        let turn = |v: Vector| [cos * v[0] + sin * v[1], cos * v[1] - sin * v[0], v[2]];
        let spin = arc.rotation[1] + 2.0 * fraction * arc.rotation[2];
        let turned = turn(cirs);
        let turned_rate = add(turn(drift), [spin * turned[1], -spin * turned[0], 0.0]);
        let mut local = [0.0; 3];
        let mut rate = [0.0; 3];
        for row in 0..3 {
            for column in 0..3 {
                let element = arc.horizon[0][row][column]
                    + fraction * (arc.horizon[1][row][column] + fraction * arc.horizon[2][row][column]);
                local[row] += element * turned[column];
                rate[row] += element * turned_rate[column];
            }
        }
        let shrink = 1.0 - arc.diurnal_aberration * local[1];
        let shrink_rate = -arc.diurnal_aberration * rate[1];
        let rate = [0, 1, 2].map(|i| rate[i] * shrink + local[i] * shrink_rate);
        (arc.with_diurnal_aberration(local), rate)
    }

    /// Direction on the horizon at the beginning (`end` false) or the end of the day, from the node
    /// itself: the end of one day and the beginning of the next are the same bits, so no change of
    /// sign falls between two days or into both.
    #[inline(always)]
    pub fn local_at_end(&self, arc: &Arc<'_>, end: bool) -> Vector {
        let (matrix, cirs) = if end { (&arc.ends[1], self.last) } else { (&arc.ends[0], self.direction[0]) };
        arc.with_diurnal_aberration(rotate(matrix, cirs))
    }

    /// The sine of the declination of date on the intermediate pole, at the middle of the day.
    pub fn sin_declination(&self) -> f64 {
        self.circle.sin_declination
    }

    /// How the star moves with respect to a plane, from its circle. None when it is so near the pole
    /// that it has no hour angle.
    #[inline(always)]
    pub(super) fn motion(&self, arc: &Arc<'_>, plane: &Plane) -> Option<Motion> {
        let circle = &self.circle;
        // NaN must not pass for a star with an hour angle.
        if circle.cos_declination > 0.0 {
            let angle = arc.rotation_angle[1] + plane.longitude - circle.right_ascension;
            let angle = angle - TURN * whole(angle / TURN);
            Some(Motion {
                highest: 0.5 - angle / circle.rate,
                half_turn: std::f64::consts::PI / circle.rate,
                rate: circle.rate,
                middle: plane.along_pole * circle.sin_declination,
                swing: plane.across_pole * circle.cos_declination,
            })
        } else {
            None
        }
    }
}

/// The nearest whole number to one that is small, without a call on any processor: adding 1.5 · 2⁵² leaves no
/// room for a fraction.
#[inline(always)]
fn whole(x: f64) -> f64 {
    const SHIFT: f64 = 6_755_399_441_055_744.0;
    (x + SHIFT) - SHIFT
}

/// Distance of a star from a plane during a day, in the sine: `middle + swing · cos(rate · (t − highest))`.
///
/// Left out, 2e-6: diurnal aberration, the change of the star's circle and of the pole during half a day.
#[derive(Debug, Clone, Copy)]
pub(super) struct Motion {
    /// Fraction of the day of a culmination above the plane, in −0.01 to 1.01.
    pub highest: f64,
    /// Days from there to the culmination below.
    pub half_turn: f64,
    /// Radians a day.
    pub rate: f64,
    pub middle: f64,
    pub swing: f64,
}
