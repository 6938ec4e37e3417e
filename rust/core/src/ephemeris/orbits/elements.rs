//! One osculating orbit as a value.

use super::{GM_SUN, from_ecliptic, kepler, to_ecliptic};
use crate::constants::TURN;
use crate::ephemeris::State;
use crate::math::vector::{Vector, add, cross, dot, norm, scale};
use crate::time::{Instant, Tdb};

/// A conic about the Sun and where the body is in it at an instant. Angles in radians, ecliptic of J2000.0.
///
/// Perihelion rather than the semi-major axis, and time since perihelion rather than an anomaly, because those exist for
/// every conic; [`Elements::semi_major_axis_au`] and [`Elements::mean_anomaly`] give the others.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Elements {
    /// The instant at which the conic osculates.
    pub epoch: Instant<Tdb>,
    /// Perihelion distance, au.
    pub perihelion_au: f64,
    /// Eccentricity.
    pub eccentricity: f64,
    /// Inclination, 0 to π.
    pub inclination: f64,
    /// Longitude of the ascending node.
    pub node: f64,
    /// Argument of perihelion.
    pub perihelion_argument: f64,
    /// TDB days from perihelion to the epoch; of an ellipse, the nearest perihelion.
    pub since_perihelion_d: f64,
}

/// arctan(√x)/√x, or artanh(√−x)/√−x for a negative x: one smooth function.
fn arc(x: f64) -> f64 {
    if x.abs() < 1e-3 {
        // Alternating in x; the term left out is x⁶/13.
        1.0 - x * (1.0 / 3.0 - x * (1.0 / 5.0 - x * (1.0 / 7.0 - x * (1.0 / 9.0 - x / 11.0))))
    } else if x > 0.0 {
        let root = x.sqrt();
        root.atan() / root
    } else {
        let root = (-x).sqrt();
        root.atanh() / root
    }
}

impl Elements {
    /// Semi-major axis, au: negative for a hyperbola, infinite for a parabola.
    pub fn semi_major_axis_au(&self) -> f64 {
        self.perihelion_au / (1.0 - self.eccentricity)
    }

    /// Mean motion, radians a day: √(GM/|a|³); 0 for a parabola.
    pub fn mean_motion(&self) -> f64 {
        mean_motion(self.perihelion_au, self.eccentricity)
    }

    /// Mean anomaly at the epoch: −π to π for an ellipse, of any size for a hyperbola; 0 for a parabola, which has none.
    pub fn mean_anomaly(&self) -> f64 {
        self.mean_motion() * self.since_perihelion_d
    }

    /// Period, days; infinite for a parabola and a hyperbola.
    pub fn period_d(&self) -> f64 {
        if self.eccentricity < 1.0 { TURN / self.mean_motion() } else { f64::INFINITY }
    }

    /// The perihelion nearest to the epoch, MJD TT.
    pub fn perihelion_mjd_tt(&self) -> f64 {
        self.epoch.plus_days(-self.since_perihelion_d).to_tt().mjd()
    }

    /// The same conic with its epoch at another instant: two-body motion, nothing else.
    pub fn at(&self, epoch: Instant<Tdb>) -> Elements {
        let since = self.since_perihelion_d + epoch.days_since(self.epoch);
        Elements { epoch, since_perihelion_d: reduced(since, self.period_d()), ..*self }
    }

    /// Unit vectors towards perihelion and across it in the direction of motion, along ICRS axes.
    pub fn axes(&self) -> (Vector, Vector) {
        let (sin_node, cos_node) = self.node.sin_cos();
        let (sin_i, cos_i) = self.inclination.sin_cos();
        let (sin_w, cos_w) = self.perihelion_argument.sin_cos();
        let towards_node = [cos_node, sin_node, 0.0];
        let across_node = [-sin_node * cos_i, cos_node * cos_i, sin_i];
        (
            from_ecliptic(add(scale(cos_w, towards_node), scale(sin_w, across_node))),
            from_ecliptic(add(scale(-sin_w, towards_node), scale(cos_w, across_node))),
        )
    }

    /// Heliocentric state at the epoch, au and au/day, ICRS axes.
    ///
    /// With [`Elements::from_state`] it goes there and back to 1e-12 of the distance and of the speed
    /// (`states_go_there_and_back`: eccentricities 0 to 10, out to a thousand perihelion distances;
    /// beyond that the loss grows with the distance, 2e-12 at 14,000).
    pub fn state(&self) -> State {
        let (q, e) = (self.perihelion_au, self.eccentricity);
        let rate = (GM_SUN / q).sqrt() / q;
        let place = kepler::solve(e, self.since_perihelion_d * rate);
        let (p, q_axis) = self.axes();
        let across = q * (1.0 + e).sqrt();
        let speed = rate / place.r;
        State {
            position: add(scale(q * place.x, p), scale(across * place.y, q_axis)),
            velocity: add(scale(-speed * q * place.y, p), scale(speed * across * place.c0, q_axis)),
        }
    }

    /// The conic that osculates a heliocentric state (au, au/day, ICRS axes) at an instant. `None` where there is
    /// none: a value that is not finite, a body in the Sun's centre, or one that moves straight to or from it.
    ///
    /// The node of an orbit in the ecliptic is put at 0, as is the perihelion of a circle at the body.
    pub fn from_state(state: State, epoch: Instant<Tdb>) -> Option<Elements> {
        let position = to_ecliptic(state.position);
        let velocity = to_ecliptic(state.velocity);
        let distance = norm(position);
        let momentum = cross(position, velocity);
        let h = norm(momentum);
        if !(h.is_finite() && h > 0.0 && distance > 0.0) {
            return None;
        }
        let parameter = h * h / GM_SUN;
        let e_sin = dot(position, velocity) / distance * h / GM_SUN;
        let e_cos = parameter / distance - 1.0;
        let mut eccentricity = e_sin.hypot(e_cos);
        let perihelion_au = parameter / (1.0 + eccentricity);
        let mut lambda = 1.0 - eccentricity;
        if eccentricity > 0.5 {
            // By the energy: 1 − e from e would have lost the digits by which an orbit misses a parabola.
            lambda = perihelion_au * (2.0 / distance - dot(velocity, velocity) / GM_SUN);
            eccentricity = 1.0 - lambda;
        }
        let true_anomaly = if eccentricity > 0.0 { e_sin.atan2(e_cos) } else { 0.0 };
        let scaled = (1.0 + eccentricity).sqrt();
        // e + e cos ν, without the cancellation far out.
        let e_plus_cos = parameter / distance - lambda;
        let w = if eccentricity <= 0.5 {
            // From the true anomaly itself: of a circle only the rounding knows it, and both must go by the same.
            let (sin, cos) = (0.5 * true_anomaly).sin_cos();
            let root = lambda.sqrt();
            2.0 * (root * sin).atan2(scaled * cos) / root
        } else if lambda * distance > perihelion_au {
            // The outer half of an ellipse: e cos E = 1 − r/a and e sin E, there without cancellation.
            let root = lambda.sqrt();
            let sine = dot(position, velocity) * root / (GM_SUN * perihelion_au).sqrt();
            sine.atan2(1.0 - lambda * distance / perihelion_au) / root
        } else {
            let tangent = e_sin / (scaled * e_plus_cos);
            2.0 * tangent * arc(lambda * tangent * tangent)
        };
        let c = kepler::stumpff(lambda * w * w);
        let m = w + eccentricity * w * w * w * c[3];
        let rate = (GM_SUN / perihelion_au).sqrt() / perihelion_au;

        let flat = momentum[0].hypot(momentum[1]);
        let node = if flat > 0.0 { momentum[0].atan2(-momentum[1]) } else { 0.0 };
        let towards_node = [node.cos(), node.sin(), 0.0];
        let across_node = scale(1.0 / h, cross(momentum, towards_node));
        let latitude_argument = dot(position, across_node).atan2(dot(position, towards_node));
        let elements = Elements {
            epoch,
            perihelion_au,
            eccentricity,
            inclination: flat.atan2(momentum[2]),
            node: node.rem_euclid(TURN),
            perihelion_argument: (latitude_argument - true_anomaly).rem_euclid(TURN),
            since_perihelion_d: m / rate,
        };
        elements.since_perihelion_d.is_finite().then_some(elements)
    }
}

/// √(GM/|a|³), radians a day.
pub(super) fn mean_motion(perihelion_au: f64, eccentricity: f64) -> f64 {
    let inverse = (1.0 - eccentricity).abs() / perihelion_au;
    inverse * (GM_SUN * inverse).sqrt()
}

/// Time since the nearest perihelion.
pub(super) fn reduced(since_d: f64, period_d: f64) -> f64 {
    if period_d.is_finite() { since_d - period_d * (since_d / period_d).round() } else { since_d }
}

#[cfg(test)]
mod tests {
    use std::f64::consts::PI;

    use super::*;
    use crate::ephemeris::orbits::random::Random;
    use crate::math::vector::sub;

    fn epoch() -> Instant<Tdb> {
        Instant::from_mjd(61_000.0, 0.25)
    }

    #[test]
    fn states_go_there_and_back() {
        let mut random = Random::new(42);
        let (mut worst_position, mut worst_velocity) = (0.0f64, 0.0f64);
        for case in 0..100_000 {
            let e = match case % 6 {
                0 => random.unit(),
                1 => 0.0,
                2 => 1.0,
                3 => 1.0 + (2.0 * random.unit() - 1.0) * 1e-9,
                4 => 1.0 + 9.0 * random.unit(),
                _ => 1.0 - 10f64.powf(-6.0 * random.unit()),
            };
            let q: f64 = 10f64.powf(-2.0 + 3.5 * random.unit());
            // Out to a thousand perihelion distances, which a hyperbola reaches soonest.
            let longest = if e > 1.0 { (1e3 / (e - 1.0).sqrt()).min(1e4) } else { 1e4 };
            let time = longest * 10f64.powf(-7.0 * random.unit()) * (q * q * q / GM_SUN).sqrt();
            let flat = [0.0, PI][case % 2];
            let first = Elements {
                epoch: epoch(),
                perihelion_au: q,
                eccentricity: e,
                inclination: if case % 10 == 7 { flat } else { PI * random.unit() },
                node: TURN * random.unit(),
                perihelion_argument: TURN * random.unit(),
                since_perihelion_d: if case % 3 == 0 { time } else { -time },
            };
            let state = first.state();
            let again = Elements::from_state(state, epoch()).unwrap().state();
            let position = norm(sub(again.position, state.position)) / norm(state.position);
            let velocity = norm(sub(again.velocity, state.velocity)) / norm(state.velocity);
            assert!(position < 1e-12 && velocity < 1e-12, "{first:?}: {position:e}, {velocity:e}");
            worst_position = worst_position.max(position);
            worst_velocity = worst_velocity.max(velocity);
        }
        println!("worst: position {worst_position:e}, velocity {worst_velocity:e}");
    }

    /// Every row of two_body.csv: fifty digits and the classical anomalies, by tests/reference/make_two_body.py.
    #[test]
    fn two_bodies_as_fifty_digits_have_them() {
        let text = include_str!("../../../../../tests/reference/two_body.csv");
        let (mut rows, mut worst) = (0, 0.0f64);
        for line in text.lines().skip(2) {
            let n: Vec<f64> = line.split(',').map(|field| field.parse().unwrap()).collect();
            let first = Elements {
                epoch: epoch(),
                perihelion_au: n[0],
                eccentricity: n[1],
                inclination: n[2],
                node: n[3],
                perihelion_argument: n[4],
                since_perihelion_d: n[5],
            };
            let state = first.at(epoch().plus_days(n[6])).state();
            let position = norm(sub(state.position, [n[7], n[8], n[9]])) / norm(state.position);
            let velocity = norm(sub(state.velocity, [n[10], n[11], n[12]])) / norm(state.velocity);
            // Rounding of the time (an instant keeps 1e-16 d, its sum with the days 1e-16 of them) moves along the orbit.
            let moved = 1e-15 * n[6].abs() * norm(state.velocity) / norm(state.position);
            let turned = 1e-15 * n[6].abs() * GM_SUN / norm(state.position).powi(2) / norm(state.velocity);
            assert!(position < 1e-14 + 2.0 * moved, "{line}: {position:e}");
            assert!(velocity < 1e-14 + 2.0 * turned, "{line}: {velocity:e}");
            worst = worst.max(position).max(velocity);
            rows += 1;
        }
        println!("{rows} rows, worst {worst:e}");
        assert_eq!(rows, 200);
    }

    #[test]
    fn energy_and_momentum_stay() {
        let first = Elements {
            epoch: epoch(),
            perihelion_au: 0.3,
            eccentricity: 0.9,
            inclination: 1.0,
            node: 2.0,
            perihelion_argument: 3.0,
            since_perihelion_d: -20.0,
        };
        let energy = |s: State| 0.5 * dot(s.velocity, s.velocity) - GM_SUN / norm(s.position);
        let momentum = |s: State| cross(s.position, s.velocity);
        let a = first.state();
        for day in 0..2000 {
            let b = first.at(epoch().plus_days(0.77 * f64::from(day))).state();
            assert!((energy(a) - energy(b)).abs() < 2e-15);
            assert!(norm(sub(momentum(a), momentum(b))) < 1e-16);
        }
    }

    #[test]
    fn velocity_is_the_slope_of_position() {
        for e in [0.2, 1.0, 1.7] {
            let orbit = Elements {
                epoch: epoch(),
                perihelion_au: 1.2,
                eccentricity: e,
                inclination: 0.4,
                node: 0.3,
                perihelion_argument: 0.2,
                since_perihelion_d: 80.0,
            };
            let at = |days: f64| orbit.at(epoch().plus_days(days)).state();
            let slope = scale(1.0 / 0.002, sub(at(0.001).position, at(-0.001).position));
            assert!(norm(sub(slope, at(0.0).velocity)) < 1e-11);
        }
    }

    #[test]
    fn no_orbit_from_no_motion() {
        let state = |position, velocity| Elements::from_state(State { position, velocity }, epoch());
        assert_eq!(state([1.0, 0.0, 0.0], [0.01, 0.0, 0.0]), None);
        assert_eq!(state([0.0; 3], [0.0, 0.01, 0.0]), None);
        assert_eq!(state([1.0, f64::NAN, 0.0], [0.0, 0.01, 0.0]), None);
    }
}
