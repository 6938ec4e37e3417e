//! The state of the sky for one observer at one instant: all that no target changes.

use crate::constants::{
    ASTRONOMICAL_UNIT_M, AU_PER_DAY_OVER_C, DAYS_PER_JULIAN_YEAR, EARTH_ROTATION_RAD_PER_S, J2000_MJD,
    SECONDS_PER_DAY,
};
use crate::earth::{
    Orientation, Pole, celestial_to_intermediate, earth_rotation_angle, intermediate, polar_motion, s_prime,
    ut1,
};
use crate::ephemeris::{Body, Ephemeris};
use crate::error::Status;
use crate::math::vector::{
    Matrix, Vector, add, cross, dot, norm, product, rotate_back, rotation_3, scale, sub,
};
use crate::refraction::Refraction;
use crate::site::Site;
use crate::time::{Instant, Tai, Tdb, Tt};

/// Who looks, through what air, on what Earth, at which solar system.
#[derive(Debug, Clone, Copy)]
pub struct Observer<'a> {
    /// Where the telescope stands.
    pub site: &'a Site,
    /// The air above it.
    pub refraction: &'a Refraction,
    /// Rotation of the Earth, pole and leap seconds.
    pub orientation: &'a Orientation,
    /// Where the Earth, the Sun, the Moon and the planets are.
    pub ephemeris: &'a Ephemeris,
}

/// What is known of an instant before anyone stands anywhere: expensive, smooth, and what a
/// [`Track`](super::Track) interpolates.
#[derive(Debug, Clone, Copy)]
pub struct Celestial {
    /// Celestial intermediate pole X of the model, radians.
    pub x: f64,
    /// Celestial intermediate pole Y of the model, radians.
    pub y: f64,
    /// CIO locator s of the model, radians.
    pub s: f64,
    /// Barycentric position of the Earth, au.
    pub earth_au: Vector,
    /// Barycentric velocity of the Earth, au/day.
    pub earth_au_day: Vector,
    /// Vector from the Sun to the Earth, au.
    pub sun_to_earth_au: Vector,
}

impl Celestial {
    /// Number of numbers in it.
    pub const CHANNELS: usize = 12;

    /// Computed at the instant itself; some 50 µs.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn exact(tt: Instant<Tt>, ephemeris: &Ephemeris) -> std::result::Result<Self, Status> {
        let tdb = tt.to_tdb();
        let pole = intermediate(tt);
        let earth = ephemeris.state(Body::Earth, tdb)?;
        let sun = ephemeris.position(Body::Sun, tdb)?;
        Ok(Celestial {
            x: pole.x,
            y: pole.y,
            s: pole.s,
            earth_au: earth.position,
            earth_au_day: earth.velocity,
            sun_to_earth_au: sub(earth.position, sun),
        })
    }

    /// As a row of numbers.
    pub fn to_channels(self) -> [f64; Self::CHANNELS] {
        let (e, v, s) = (self.earth_au, self.earth_au_day, self.sun_to_earth_au);
        [self.x, self.y, self.s, e[0], e[1], e[2], v[0], v[1], v[2], s[0], s[1], s[2]]
    }

    /// From a row of numbers.
    #[inline(always)]
    pub fn from_channels(c: [f64; Self::CHANNELS]) -> Self {
        Celestial {
            x: c[0],
            y: c[1],
            s: c[2],
            earth_au: [c[3], c[4], c[5]],
            earth_au_day: [c[6], c[7], c[8]],
            sun_to_earth_au: [c[9], c[10], c[11]],
        }
    }
}

/// The state of the sky for one observer at one instant.
#[derive(Debug, Clone, Copy)]
pub struct Sky {
    /// The instant, TAI.
    pub tai: Instant<Tai>,
    /// The instant, Julian years after J2000.0 (TT, which is TDB to 2 ms or 1e-10 yr).
    pub epoch_yr: f64,
    /// Barycentric position of the observer, au.
    pub observer_au: Vector,
    /// Barycentric velocity of the observer over the speed of light.
    pub velocity_c: Vector,
    /// √(1 − v²).
    pub inverse_gamma: f64,
    /// Barycentric position of the Sun, au.
    pub sun_au: Vector,
    /// Unit vector from the Sun to the observer.
    pub sun_to_observer: Vector,
    /// Distance from the Sun to the observer, au.
    pub sun_distance_au: f64,
    /// GCRS to CIRS: the celestial intermediate pole and origin.
    pub intermediate: Matrix,
    /// Earth rotation angle, radians.
    pub rotation_angle: f64,
    /// GCRS to the local horizon: rows north, east, zenith.
    pub local: Matrix,
    /// Earth orientation used.
    pub pole: Pole,
}

impl Sky {
    /// [`Status::OrientationExtrapolated`] or [`Status::Ok`].
    pub fn note(&self) -> Status {
        self.pole.quality.status()
    }

    /// The instant, TDB: what an ephemeris is asked with.
    pub fn tdb(&self) -> Instant<Tdb> {
        self.tai.to_tt().to_tdb()
    }

    /// The sky of the Earth's centre at the same instant: no diurnal parallax, no diurnal aberration,
    /// the same horizon. For definitions that are geocentric, such as those of the printed almanacs.
    pub fn geocentric(&self, celestial: &Celestial) -> Sky {
        let mut sky = *self;
        sky.place_observer(celestial, [0.0; 3], [0.0; 3]);
        sky
    }

    fn place_observer(&mut self, celestial: &Celestial, offset_au: Vector, velocity_c: Vector) {
        let sun_to_observer_au = add(celestial.sun_to_earth_au, offset_au);
        self.observer_au = add(celestial.earth_au, offset_au);
        self.velocity_c = add(scale(AU_PER_DAY_OVER_C, celestial.earth_au_day), velocity_c);
        self.inverse_gamma = (1.0 - dot(self.velocity_c, self.velocity_c)).sqrt();
        self.sun_au = sub(celestial.earth_au, celestial.sun_to_earth_au);
        self.sun_distance_au = norm(sun_to_observer_au);
        self.sun_to_observer = scale(1.0 / self.sun_distance_au, sun_to_observer_au);
    }
}

impl Observer<'_> {
    /// The sky at an instant, nothing interpolated but the Earth orientation table.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn sky(&self, tai: Instant<Tai>) -> std::result::Result<Sky, Status> {
        Ok(self.sky_from(tai, &Celestial::exact(tai.to_tt(), self.ephemeris)?))
    }

    /// The sky at an instant from what was computed or interpolated for it: the diurnal rotation,
    /// which is fast, is always analytic.
    pub fn sky_from(&self, tai: Instant<Tai>, celestial: &Celestial) -> Sky {
        let tt = tai.to_tt();
        let pole = self.orientation.at_tai(tai);
        let rotation_angle = earth_rotation_angle(ut1(tai, &pole));
        // s belongs to the model pole; the observed corrections are added to X and Y afterwards
        // (IERS Conventions (2010) §5.5.4).
        let intermediate =
            celestial_to_intermediate(celestial.x + pole.dx, celestial.y + pole.dy, celestial.s);
        let wobble = polar_motion(pole.xp, pole.yp, s_prime(tt));
        let rotation = rotation_3(rotation_angle);
        let terrestrial = product(&wobble, &product(&rotation, &intermediate));

        // Position and velocity of the site: turning about the intermediate pole.
        let in_tirs_m = rotate_back(&wobble, self.site.terrestrial());
        let spin = [0.0, 0.0, EARTH_ROTATION_RAD_PER_S];
        let to_gcrs = |v: Vector| rotate_back(&intermediate, rotate_back(&rotation, v));
        let offset_au = scale(1.0 / ASTRONOMICAL_UNIT_M, to_gcrs(in_tirs_m));
        let velocity_c =
            scale(AU_PER_DAY_OVER_C * SECONDS_PER_DAY / ASTRONOMICAL_UNIT_M, to_gcrs(cross(spin, in_tirs_m)));

        let (day, fraction) = tt.mjd_parts();
        let mut sky = Sky {
            tai,
            epoch_yr: ((day - J2000_MJD) + fraction) / DAYS_PER_JULIAN_YEAR,
            observer_au: [0.0; 3],
            velocity_c: [0.0; 3],
            inverse_gamma: 1.0,
            sun_au: [0.0; 3],
            sun_to_observer: [0.0; 3],
            sun_distance_au: 1.0,
            intermediate,
            rotation_angle,
            local: product(self.site.local(), &terrestrial),
            pole,
        };
        sky.place_observer(celestial, offset_au, velocity_c);
        sky
    }
}
