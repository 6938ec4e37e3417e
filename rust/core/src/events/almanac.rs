//! The almanac of a site: Sun and Moon, night by night.
//!
//! Definitions are those of the printed almanacs (Urban & Seidelmann (2013) §7.3; check-values in
//! `tests/reference`): sunrise and sunset when the Sun's centre stands at zenith distance 90°50′, that
//! is 34′ of refraction and 16′ of semidiameter whatever the weather; twilights at −6°, −12°, −18°; all
//! of these true topocentric altitudes. Moonrise and moonset when the centre, seen from the Earth's
//! centre, stands at zenith distance 90°34′ + semidiameter − horizontal parallax, both of the instant.
//! No dip of the horizon, no height of the site. Twilight lasts as long as the Sun is where it says:
//! near the poles a night may have none, or a dusk without its dawn.

use super::arc::{Arc, node_fraction};
use super::crossing::Crossing;
use super::days::{Days, track_for};
use super::moving::{BODY_NODES, directions_at};
use crate::astrometry::{Observer, body_direction};
use crate::constants::{ASTRONOMICAL_UNIT_M, RADIANS_PER_DEGREE, TURN, WGS84_EQUATORIAL_RADIUS_M};
use crate::earth::bias_precession_nutation;
use crate::ephemeris::Body;
use crate::error::{Error, Result, Status};
use crate::math::chebyshev::Chebyshev;
use crate::math::vector::{Vector, angle, norm, rotate, rotation_1, sub};
use crate::time::{Instant, Tai, Utc};

/// Altitudes of the Sun's centre: horizon, then the three twilights, degrees.
const SUN_ALTITUDES_DEG: [f64; 4] = [-50.0 / 60.0, -6.0, -12.0, -18.0];
/// Refraction at the horizon in the almanacs, degrees.
const HORIZON_REFRACTION_DEG: f64 = 34.0 / 60.0;
/// Radius of the Moon in equatorial radii of the Earth (IAU 1982; Urban & Seidelmann (2013) table 11.1).
const MOON_RADIUS: f64 = 0.272_507_6;
/// Mean synodic month, days (Urban & Seidelmann (2013) §11.2.1).
pub(crate) const SYNODIC_MONTH_D: f64 = 29.530_588_86;
/// Nights in one call: two centuries, all that the ephemeris holds.
const MOST_NIGHTS: usize = 75_000;

/// One night. An instant that does not occur is [`Utc::NOT_A_TIME`]; of several, the first is given.
#[derive(Debug, Clone, Copy)]
pub struct AlmanacRow {
    /// Beginning: local mean solar noon of the evening's date.
    pub start: Utc,
    /// End: the noon after.
    pub stop: Utc,
    /// The Sun passes 90°50′, −6°, −12°, −18° downwards: sunset and the three dusks.
    pub sun_down: [Utc; 4],
    /// The Sun passes them upwards: sunrise and the three dawns.
    pub sun_up: [Utc; 4],
    /// The Moon rises.
    pub moonrise: Utc,
    /// The Moon sets.
    pub moonset: Utc,
    /// Days since the last new Moon at the night's middle.
    pub moon_age_d: f64,
    /// Illuminated fraction of the Moon's disc at the night's middle, seen from the Earth's centre.
    pub moon_illuminated_fraction: f64,
    /// Hours in which the Sun is below −18°.
    pub dark_hours: f64,
    /// Those of them in which the Moon has not risen or has set.
    pub dark_hours_moonless: f64,
    /// What is to be said of the night.
    pub status: Status,
}

/// Local mean solar noon of a date and the noon after: the bounds of the night that begins on the
/// evening of `mjd`, at an east longitude in radians.
pub fn night_bounds(mjd: i64, longitude: f64) -> (Utc, Utc) {
    let noon = |mjd: i64| Utc::from_mjd(mjd as f64, 0.5 - longitude / TURN);
    (noon(mjd), noon(mjd + 1))
}

/// The nights from that of the evening of `first_mjd` on.
///
/// Rise, set and twilight agree with the exact chain to 20 ms (`tests/test_accuracy_almanac.py`).
///
/// # Errors
/// No nights or too many, or nights outside the ephemeris or before UTC.
pub fn almanac(observer: Observer<'_>, first_mjd: i64, nights: usize) -> Result<Vec<AlmanacRow>> {
    if nights == 0 || nights > MOST_NIGHTS {
        return Err(Error::invalid("nights", nights, format!("1 to {MOST_NIGHTS}")));
    }
    let longitude = observer.site.longitude();
    let (start, _) = night_bounds(first_mjd, longitude);
    let (_, stop) = night_bounds(first_mjd + nights as i64 - 1, longitude);
    let track = track_for(&observer, start, stop)?;
    let days = Days::new(observer, &track, start, stop)?;
    let outside = |status: Status| Error::invalid("nights", status.word(), "nights within the ephemeris");
    let passages = Passages::over(&days).map_err(outside)?;
    (0..nights).map(|i| passages.night(&days, first_mjd + i as i64).map_err(outside)).collect()
}

/// All passages of Sun and Moon over a span, as days of TT and fractions of them since the first.
struct Passages {
    sun: [Timeline; 4],
    moon: Timeline,
}

/// Where something is up or down: the state at the beginning and the changes, in days since the
/// beginning of the first arc.
#[derive(Default)]
struct Timeline {
    up_at_start: bool,
    changes: Vec<Crossing>,
}

impl Timeline {
    /// Appends a day; `up` says whether the thing is up at its beginning and at its end, by the same
    /// computation for the end of one day and the beginning of the next.
    fn extend(&mut self, day: usize, series: &Chebyshev<BODY_NODES>, up: [bool; 2]) {
        if day == 0 {
            self.up_at_start = up[0];
        }
        for crossing in series.crossings_between(up[0], up[1]).iter() {
            self.changes.push(Crossing { at: day as f64 + crossing.at, rising: crossing.rising });
        }
    }

    fn first(&self, rising: bool, from: f64, to: f64) -> Option<f64> {
        self.changes.iter().find(|c| c.rising == rising && c.at >= from && c.at < to).map(|c| c.at)
    }

    /// Intervals within [from, to) in which the thing is down.
    fn down(&self, from: f64, to: f64) -> Vec<(f64, f64)> {
        let mut intervals = Vec::new();
        let mut down_since = if self.up_at_start { None } else { Some(f64::NEG_INFINITY) };
        for change in &self.changes {
            match (change.rising, down_since) {
                (true, Some(since)) => {
                    intervals.push((since, change.at));
                    down_since = None;
                }
                (false, None) => down_since = Some(change.at),
                _ => {}
            }
        }
        if let Some(since) = down_since {
            intervals.push((since, f64::INFINITY));
        }
        intervals.iter().map(|i| (i.0.max(from), i.1.min(to))).filter(|i| i.0 < i.1).collect()
    }
}

impl Passages {
    fn over(days: &Days<'_>) -> std::result::Result<Self, Status> {
        let mut passages = Passages { sun: Default::default(), moon: Timeline::default() };
        for (index, arc) in days.arcs.iter().enumerate() {
            let skies = arc.skies::<BODY_NODES>()?;
            let sun: Vec<f64> = directions_at(arc, &skies, Body::Sun)?.iter().map(|local| local[2]).collect();
            let sun_at_ends = directions_at(arc, &[arc.sky(0.0)?, arc.sky(1.0)?], Body::Sun)?;
            for (timeline, altitude_deg) in passages.sun.iter_mut().zip(SUN_ALTITUDES_DEG) {
                let threshold = (altitude_deg * RADIANS_PER_DEGREE).sin();
                let up = [0, 1].map(|end: usize| sun_at_ends[end][2] >= threshold);
                timeline.extend(index, &series(|j| sun[j] - threshold), up);
            }
            let moon = (0..BODY_NODES)
                .map(|j| moon_above_its_horizon(arc, node_fraction::<BODY_NODES>(j)))
                .collect::<std::result::Result<Vec<f64>, Status>>()?;
            let up = [moon_above_its_horizon(arc, 0.0)? >= 0.0, moon_above_its_horizon(arc, 1.0)? >= 0.0];
            passages.moon.extend(index, &series(|j| moon[j]), up);
        }
        Ok(passages)
    }

    fn night(&self, days: &Days<'_>, mjd: i64) -> std::result::Result<AlmanacRow, Status> {
        let observer = days.observer();
        let (start, stop) = night_bounds(mjd, observer.site.longitude());
        let leap_seconds = observer.orientation.leap_seconds();
        let (start_tai, stop_tai) = (leap_seconds.to_tai(start)?, leap_seconds.to_tai(stop)?);
        let first = &days.arcs[0];
        let (from, to) = (first.fraction(start_tai), first.fraction(stop_tai));
        let utc = |at: Option<f64>| {
            at.map_or(Utc::NOT_A_TIME, |at| {
                let index = at.floor();
                days.utc(&days.arcs[index as usize], at - index)
            })
        };
        let dark = self.sun[3].down(from, to);
        let moonless = self.moon.down(from, to);
        // Not `sum`, which is −0.0 of nothing.
        let hours = |intervals: &[(f64, f64)]| intervals.iter().fold(0.0, |sum, i| sum + (i.1 - i.0) * 24.0);
        let both: Vec<_> = dark
            .iter()
            .flat_map(|a| moonless.iter().map(|b| (a.0.max(b.0), a.1.min(b.1))))
            .filter(|i| i.0 < i.1)
            .collect();
        let middle = start_tai.plus_seconds(0.5 * stop_tai.seconds_since(start_tai));
        let phase = MoonPhase::at(observer, middle)?;
        let note = |arc: &Arc<'_>| {
            if (from..to).contains(&((arc.day - first.day) as f64)) { arc.note } else { Status::Ok }
        };
        Ok(AlmanacRow {
            start,
            stop,
            sun_down: [0, 1, 2, 3].map(|i| utc(self.sun[i].first(false, from, to))),
            sun_up: [0, 1, 2, 3].map(|i| utc(self.sun[i].first(true, from, to))),
            moonrise: utc(self.moon.first(true, from, to)),
            moonset: utc(self.moon.first(false, from, to)),
            moon_age_d: phase.age_d,
            moon_illuminated_fraction: phase.illuminated_fraction,
            dark_hours: hours(&dark),
            dark_hours_moonless: hours(&both),
            status: days.arcs.iter().map(note).fold(Status::Ok, Status::worst),
        })
    }
}

fn series(mut sample: impl FnMut(usize) -> f64) -> Chebyshev<BODY_NODES> {
    let mut j = 0;
    Chebyshev::fit(0.0, 1.0, |_| {
        j += 1;
        sample(j - 1)
    })
}

/// Sine of the altitude of the Moon's centre seen from the Earth's centre, less that at which its limb
/// appears on the almanac's horizon.
fn moon_above_its_horizon(arc: &Arc<'_>, fraction: f64) -> std::result::Result<f64, Status> {
    let sky = arc.geocentric_sky(fraction)?;
    let ephemeris = arc.observer.ephemeris;
    let direction = rotate(&sky.local, body_direction(Body::Moon, ephemeris, &sky)?.direction);
    let distance_au = norm(sub(ephemeris.position(Body::Moon, sky.tdb())?, sky.observer_au));
    let sin_parallax = WGS84_EQUATORIAL_RADIUS_M / ASTRONOMICAL_UNIT_M / distance_au;
    let semidiameter = (MOON_RADIUS * sin_parallax).asin();
    let threshold = sin_parallax.asin() - semidiameter - HORIZON_REFRACTION_DEG * RADIANS_PER_DEGREE;
    Ok(direction[2] - threshold.sin())
}

/// The Moon's phase, seen from the Earth's centre.
struct MoonPhase {
    age_d: f64,
    illuminated_fraction: f64,
}

impl MoonPhase {
    fn at(observer: &Observer<'_>, tai: Instant<Tai>) -> std::result::Result<Self, Status> {
        let (earth, sun, moon) = positions(observer, tai)?;
        // Angle at the Moon between the Sun and the Earth.
        let phase_angle = angle(sub(sun, moon), sub(earth, moon));
        let age_d = moon_age_d(observer, tai)?;
        Ok(MoonPhase { age_d, illuminated_fraction: 0.5 * (1.0 + phase_angle.cos()) })
    }
}

/// Days since the last new Moon, which is where [`moon_elongation`] passes zero.
pub(crate) fn moon_age_d(observer: &Observer<'_>, tai: Instant<Tai>) -> std::result::Result<f64, Status> {
    let mut age_d = moon_elongation(observer, tai)?.rem_euclid(TURN) / TURN * SYNODIC_MONTH_D;
    // The elongation grows by 10° to 15° a day: each step leaves a fifth of the error or less.
    for _ in 0..12 {
        let elongation = moon_elongation(observer, tai.plus_seconds(-age_d * 86_400.0))?;
        let step = (elongation - TURN * (elongation / TURN).round()) / TURN * SYNODIC_MONTH_D;
        age_d += step;
        if step.abs() < 1e-7 {
            break;
        }
    }
    // A step past the new Moon of this very night makes the age that of the one before.
    if age_d < 0.0 {
        age_d += SYNODIC_MONTH_D;
    }
    Ok(age_d)
}

fn positions(
    observer: &Observer<'_>,
    tai: Instant<Tai>,
) -> std::result::Result<(Vector, Vector, Vector), Status> {
    let tdb = tai.to_tt().to_tdb();
    let at = |body| observer.ephemeris.position(body, tdb);
    Ok((at(Body::Earth)?, at(Body::Sun)?, at(Body::Moon)?))
}

/// Longitude of the Moon less that of the Sun on the ecliptic of date, seen from the Earth's centre.
///
/// Geometric for the Moon; for the Sun the aberration of 20″ is applied as such (the Moon's own is its
/// light time, 0.7″, which is a second and a half of time and left out).
pub(crate) fn moon_elongation(
    observer: &Observer<'_>,
    tai: Instant<Tai>,
) -> std::result::Result<f64, Status> {
    let tt = tai.to_tt();
    let (earth, sun, moon) = positions(observer, tai)?;
    let to_equator = bias_precession_nutation(tt);
    let obliquity = crate::earth::mean_obliquity(tt) + crate::earth::nutation(tt).obliquity;
    let to_ecliptic = rotation_1(obliquity);
    let longitude = |vector: Vector| {
        let ecliptic = rotate(&to_ecliptic, rotate(&to_equator, vector));
        ecliptic[1].atan2(ecliptic[0])
    };
    const SUN_ABERRATION: f64 = 20.5 * crate::constants::RADIANS_PER_ARCSECOND;
    Ok(longitude(sub(moon, earth)) - longitude(sub(sun, earth)) + SUN_ABERRATION)
}
