//! Very many orbits, a column an element.

use super::elements::{Elements, mean_motion, reduced};
use super::{GM_SUN, drift};
use crate::constants::RADIANS_PER_DEGREE;
use crate::ephemeris::photometry::Brightness;
use crate::error::{Error, Result, Status};
use crate::math::vector::scale;
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
    pub(super) epoch_day: Vec<f64>,
    pub(super) epoch_fraction: Vec<f64>,
    pub(super) since_perihelion: Vec<f64>,
    pub(super) period: Vec<f64>,
    pub(super) frequency: Vec<f64>,
    pub(super) eccentricity: Vec<f64>,
    pub(super) rate: Vec<f64>,
    pub(super) along: [Vec<f64>; 3],
    pub(super) across: [Vec<f64>; 3],
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

    /// How far two-body motion may have drifted from the true one at an instant, au: see [`drift`].
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

#[cfg(test)]
mod tests {
    use super::*;

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
        let at = Instant::from_mjd(61_100.0, 0.123);
        let [first, bad, last] = [0, 1, 2].map(|row| orbits.heliocentric(row, at));
        assert!(bad.position.iter().chain(&bad.velocity).all(|value| value.is_nan()));
        assert!(first == last && first.position[0].is_finite());
        let short = Columns { node: &[0.2; 2], ..columns };
        let message = Orbits::from_columns(&short).unwrap_err().to_string();
        assert_eq!(message, "node: given 2 rows, allowed 3, as epochs");
    }

    #[test]
    fn far_from_its_epoch_a_row_says_so() {
        let mut orbits = Orbits::new();
        let brightness = Brightness::Hg { h: 15.0, g: 0.15 };
        orbits.push(from_mean_anomaly(60_600.0, 0.1, [0.1, 0.2, 0.3], 2.7, 1.0), brightness);
        orbits.push(from_mean_anomaly(60_600.0, -0.1, [0.1, 0.2, 0.3], 2.7, 1.0), brightness);
        let at = |days: f64| orbits.elements(0).epoch.plus_days(days);
        for sign in [1.0, -1.0] {
            assert_eq!(orbits.status_at(0, at(sign * 10.0), 2.0), Status::Ok);
            assert_eq!(orbits.status_at(0, at(sign * 2000.0), 2.0), Status::FarFromEpoch);
        }
        assert_eq!(orbits.drift_au(0, at(0.0)), 0.0);
        assert!(orbits.drift_au(0, at(500.0)) > orbits.drift_au(0, at(100.0)));
        for days in [0.0, 2000.0] {
            assert_eq!(orbits.status_at(1, at(days), 2.0), Status::Elements);
        }
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
}
