//! How a body of the solar system looks: how far, how bright, how large, how lit, and which way it moves.
//!
//! All of it is of the triangle of Sun, body and the observer on the turning Earth, with the body where it was
//! when the light left it and the Sun where it was then. No aberration: these angles differ from those between
//! the directions of [`body_direction`](super::body_direction) by 20″ each at most.

use super::chain::{observer_state, when_light_left};
use super::sky::Sky;
use super::targets::Moving;
use crate::constants::LIGHT_TIME_AU_S;
use crate::constants::SECONDS_PER_DAY;
use crate::ephemeris::orbits::Orbits;
use crate::ephemeris::photometry::{self, Brightness, Geometry};
use crate::ephemeris::{Body, Ephemeris, State};
use crate::error::Status;
use crate::math::dispatch::Isa;
use crate::math::vector::{Vector, dot, norm, scale, sub};

/// How a body looks.
#[derive(Debug, Clone, Copy)]
pub struct Appearance {
    /// Distance travelled by the light that arrives now, au.
    pub distance_au: f64,
    /// Distance from the Sun, au; 0 for the Sun.
    pub heliocentric_distance_au: f64,
    /// Angle at the body between the Sun and the observer, radians, 0 to π; NaN for the Sun.
    pub phase_angle: f64,
    /// Angle at the observer between the Sun and the body, radians, 0 to π; 0 for the Sun.
    pub elongation: f64,
    /// Apparent V magnitude: [`photometry::magnitude`] or
    /// [`Brightness::magnitude`](photometry::Brightness::magnitude); NaN where a parameter is unknown.
    pub magnitude: f64,
    /// Motion among the stars as this observer sees it, diurnal parallax included, radians a day.
    pub rate: f64,
    /// Its direction, from the north of the ICRS through the east, radians, 0 to 2π.
    pub motion_position_angle: f64,
    /// Illuminated fraction of the disc, 0 to 1; NaN for the Sun.
    pub illuminated_fraction: f64,
    /// Angular diameter of the equator, radians; NaN for minor bodies.
    pub angular_diameter: f64,
    /// Position angle of the middle of the bright limb, from the north of date through the east, radians,
    /// 0 to 2π (Meeus, *Astronomical Algorithms*, 2nd ed., equation 48.5); NaN for the Sun.
    pub bright_limb_position_angle: f64,
}

/// How a target looks to the observer of a sky.
///
/// Errors: distances and angles as the ephemeris and the light time, 1e-9 of them; the rate 1e-8 of itself, against
/// differences of astrometric places (`rates_are_differences_of_places`); magnitudes as the formulae say.
///
/// # Errors
/// [`Status::OutsideEphemeris`].
pub fn appearance(
    target: Moving<'_>,
    ephemeris: &Ephemeris,
    sky: &Sky,
    isa: Isa,
) -> std::result::Result<Appearance, Status> {
    match target {
        Moving::Body(body) => body_appearance(body, ephemeris, sky),
        Moving::Orbit(orbits, row) => orbit_appearance(orbits, row, ephemeris, sky, isa),
    }
}

fn orbit_appearance(
    orbits: &Orbits,
    row: usize,
    ephemeris: &Ephemeris,
    sky: &Sky,
    isa: Isa,
) -> std::result::Result<Appearance, Status> {
    let tdb = sky.tdb();
    let sun = ephemeris.state(Body::Sun, tdb)?;
    let seen = orbits.astrometric(isa, row, tdb, observer_state(sky), sun);
    Ok(appearance_of_orbit(orbits.brightness(row), seen, sun, sky))
}

/// How a minor body looks that is seen along a vector of
/// [`Orbits::astrometric_motion_batch`], with its rate; `sun` as there.
pub fn appearance_of_orbit(brightness: Brightness, seen: State, sun: State, sky: &Sky) -> Appearance {
    let light_time_d = norm(seen.position) * LIGHT_TIME_AU_S / SECONDS_PER_DAY;
    // Where the Sun was, as the observer counts: it moves straight.
    let to_sun: Vector =
        [0, 1, 2].map(|i| sun.position[i] - light_time_d * sun.velocity[i] - sky.observer_au[i]);
    let geometry = Geometry::new(sub(seen.position, to_sun), seen.position);
    let of_triangle =
        Appearance::of(&geometry, seen.position, seen.velocity, sub(to_sun, seen.position), sky);
    Appearance { magnitude: brightness.magnitude(&geometry), ..of_triangle }
}

fn body_appearance(body: Body, ephemeris: &Ephemeris, sky: &Sky) -> std::result::Result<Appearance, Status> {
    let (from_observer, light_time_s) = when_light_left(body, ephemeris, sky)?;
    let left = sky.tdb().plus_seconds(-light_time_s);
    let sun = ephemeris.position(Body::Sun, left)?;
    let of_body = ephemeris.state(body, left)?;
    let from_sun = sub(of_body.position, sun);
    let geometry = Geometry::new(from_sun, from_observer);
    // By how much the light time changes a day: the instant at which the light left runs slower by it.
    let observer = observer_state(sky).velocity;
    let distance = norm(from_observer);
    let light_time_au_d = LIGHT_TIME_AU_S / SECONDS_PER_DAY;
    let receding = dot(from_observer, of_body.velocity) / distance;
    let growth = light_time_au_d * (receding - dot(from_observer, observer) / distance)
        / (1.0 + light_time_au_d * receding);
    let rate = sub(scale(1.0 - growth, of_body.velocity), observer);
    let of_triangle = Appearance::of(&geometry, from_observer, rate, scale(-1.0, from_sun), sky);
    let year = 2000.0 + sky.epoch_yr;
    let rings = (body == Body::Saturn).then(|| photometry::saturn_ring_latitude(from_sun, from_observer));
    let shines = body == Body::Sun;
    let unless_it_shines = |value: f64| if shines { f64::NAN } else { value };
    Ok(Appearance {
        phase_angle: unless_it_shines(of_triangle.phase_angle),
        illuminated_fraction: unless_it_shines(of_triangle.illuminated_fraction),
        bright_limb_position_angle: unless_it_shines(of_triangle.bright_limb_position_angle),
        magnitude: photometry::magnitude(body, &geometry, year, rings),
        angular_diameter: photometry::angular_diameter(body.equatorial_radius_km(), distance),
        ..of_triangle
    })
}

impl Appearance {
    fn of(geometry: &Geometry, from_observer: Vector, rate: Vector, to_sun: Vector, sky: &Sky) -> Self {
        const NORTH: Vector = [0.0, 0.0, 1.0];
        let (rate, motion_position_angle) = photometry::motion(from_observer, rate, NORTH);
        Appearance {
            distance_au: geometry.distance_au,
            heliocentric_distance_au: geometry.heliocentric_au,
            phase_angle: geometry.phase_angle,
            elongation: geometry.elongation,
            magnitude: f64::NAN,
            rate,
            motion_position_angle,
            illuminated_fraction: geometry.illuminated_fraction(),
            angular_diameter: f64::NAN,
            bright_limb_position_angle: photometry::position_angle(
                from_observer,
                to_sun,
                sky.intermediate[2],
            ),
        }
    }
}
