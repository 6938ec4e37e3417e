//! What all targets share on one night of a season.

use super::kernel::Meridian;
use crate::astrometry::{Catalog, CatalogColumns, Observer, Sky, Targets, Track, body_direction};
use crate::constants::{EARTH_ROTATION_RAD_PER_S, SECONDS_PER_DAY, TURN};
use crate::earth::{polar_motion, s_prime};
use crate::ephemeris::Body;
use crate::error::{Error, Result, Status};
use crate::events::{Days, night_bounds};
use crate::math::chebyshev::{ChebyshevVector, node};
use crate::math::vector::{Vector, angle, dot, product, rotate, rotation_3, scale, sub};
use crate::time::{Instant, Tai, Utc};
use crate::windows::{Column, LimitedSpan, Limits, Workspace};

/// Coefficients of a body's series over the dark: the Moon's parallax over a whole day of polar night
/// is held to 2 mas, over an ordinary night to a thousandth of that.
pub(super) const NODES: usize = 13;
/// Room for the star's aberration and for what lies between the nodes, radians.
const ROOM: f64 = 4e-4;

/// One night.
#[derive(Debug)]
pub(super) struct Night {
    pub start: Utc,
    pub stop: Utc,
    pub middle: Instant<Tai>,
    /// UTC of the middle as day and fraction, where UTC keeps step with TAI through the night.
    even: Option<(f64, f64)>,
    /// Julian years after J2000.0 and barycentric position of the Earth at the middle.
    pub epoch_yr: f64,
    pub earth_au: Vector,
    /// Velocity of the Earth over that of light.
    pub velocity: Vector,
    pub meridian: Meridian,
    /// Where the limits on the sky hold, seconds from the middle, in order.
    pub dark: Vec<(f64, f64)>,
    /// The Moon and the Sun over the dark, where targets must keep away from them.
    pub bodies: [Option<Mover>; 2],
    pub note: Status,
}

/// A body over the dark of a night.
#[derive(Debug)]
pub(super) struct Mover {
    /// Proper direction m, the observer's velocity v over that of light less the Earth's at the night's
    /// middle, and m·v; GCRS axes, over seconds from the night's middle.
    pub series: ChebyshevVector<NODES, 7>,
    /// Direction in the middle of the dark.
    pub direction: Vector,
    /// The farthest that it strays from there, radians.
    pub reach: f64,
}

/// The limits that are on the sky alone; of one that differs from target to target, the loosest.
fn sky_limits(limits: &Limits) -> Limits {
    let loosest = |column: &Option<Column>| match column {
        Some(Column::Each(values)) => {
            Some(Column::All(values.iter().copied().fold(f64::NEG_INFINITY, f64::max)))
        }
        shared => shared.clone(),
    };
    Limits {
        sun_altitude_max: loosest(&limits.sun_altitude_max),
        moon_altitude_max: loosest(&limits.moon_altitude_max),
        moon_illumination_max: loosest(&limits.moon_illumination_max),
        allowed_intervals: limits.allowed_intervals.clone(),
        ..Limits::none(limits.airmass_model)
    }
}

/// Instants, seconds after `zero`, between which the limits on the sky hold during the days.
pub(super) fn dark_stretches(days: &Days<'_>, limits: &Limits) -> Result<Vec<(Utc, Utc)>> {
    let sky = sky_limits(limits);
    let span = LimitedSpan::new(days, &sky, 1)?;
    // Any target will do: no limit looks at it.
    let one = Catalog::new(&CatalogColumns {
        ra_deg: &[0.0],
        dec_deg: &[0.0],
        epoch_yr: &[2000.0],
        pm_ra_mas_yr: &[0.0],
        pm_dec_mas_yr: &[0.0],
        parallax_mas: &[0.0],
        radial_velocity_km_s: &[0.0],
    })?;
    let mut windows = Vec::new();
    span.windows(&Targets::Catalog(&one), 0, &mut Workspace::default(), &mut windows);
    Ok(windows.iter().map(|window| (window.start, window.stop)).collect())
}

impl Night {
    /// The night of the evening of `mjd`; `stretches` are those of [`dark_stretches`] around it.
    ///
    /// # Errors
    /// A night outside the ephemeris or before UTC.
    pub fn new(
        observer: &Observer<'_>,
        track: &Track,
        mjd: i64,
        stretches: &[(Utc, Utc)],
        bodies: [bool; 2],
    ) -> Result<Self> {
        let outside = |status: Status| {
            Error::invalid("nights", status.word(), "nights from 1960 on within the ephemeris")
        };
        let (start, stop) = night_bounds(mjd, observer.site.longitude());
        let leap_seconds = observer.orientation.leap_seconds();
        let tai = |utc: Utc| leap_seconds.to_tai(utc).map_err(outside);
        let (first, last) = (tai(start)?, tai(stop)?);
        let middle = first.plus_seconds(0.5 * last.seconds_since(first));
        let celestial = track.celestial(middle.to_tt()).map_err(outside)?;
        let sky = observer.sky_from(middle, &celestial);
        let velocity = sky.geocentric(&celestial).velocity_c;
        let mut dark = Vec::with_capacity(1);
        for &(from, to) in stretches {
            let from = tai(from)?.seconds_since(middle).max(first.seconds_since(middle));
            let to = tai(to)?.seconds_since(middle).min(last.seconds_since(middle));
            if from < to {
                dark.push((from, to));
            }
        }
        let step = |utc: Utc| leap_seconds.tai_minus_utc(utc).map_err(outside);
        let even = (step(start)? == step(stop)?).then(|| {
            let (day, fraction) = start.mjd_parts();
            (day, fraction + 0.5)
        });
        let mut night = Night {
            start,
            stop,
            middle,
            even,
            epoch_yr: sky.epoch_yr,
            earth_au: celestial.earth_au,
            velocity,
            meridian: meridian(observer, &sky, velocity),
            dark,
            bodies: [None, None],
            note: sky.note(),
        };
        if !night.dark.is_empty() {
            for ((slot, wanted), body) in night.bodies.iter_mut().zip(bodies).zip([Body::Moon, Body::Sun]) {
                if wanted {
                    let hull = (night.dark[0].0, night.dark[night.dark.len() - 1].1);
                    *slot =
                        Some(Mover::new(observer, track, (middle, velocity), hull, body).map_err(outside)?);
                }
            }
        }
        Ok(night)
    }

    /// UTC as a Modified Julian Date, at seconds from the middle; rounded as one double is, 0.6 µs.
    pub fn mjd(&self, observer: &Observer<'_>, seconds: f64) -> f64 {
        if let (Some((day, fraction)), true) = (self.even, seconds.abs() <= 0.5 * SECONDS_PER_DAY) {
            return day + (fraction + seconds / SECONDS_PER_DAY);
        }
        let utc = observer.orientation.leap_seconds().to_utc(self.middle.plus_seconds(seconds));
        utc.map_or(f64::NAN, |(utc, _)| {
            let (day, fraction) = utc.mjd_parts();
            day + fraction
        })
    }
}

fn meridian(observer: &Observer<'_>, sky: &Sky, velocity: Vector) -> Meridian {
    let wobble = polar_motion(sky.pole.xp, sky.pole.yp, s_prime(sky.tai.to_tt()));
    let zenith = product(observer.site.local(), &wobble)[2];
    let (longitude, cos_latitude) = (zenith[1].atan2(zenith[0]), zenith[0].hypot(zenith[1]));
    let mut matrix = product(&rotation_3(sky.rotation_angle + longitude), &sky.intermediate);
    // Hour angle runs westwards.
    matrix[1] = scale(-1.0, matrix[1]);
    Meridian {
        aberration: rotate(&matrix, velocity),
        matrix,
        sin_latitude: zenith[2],
        cos_latitude,
        rate: EARTH_ROTATION_RAD_PER_S,
    }
}

impl Mover {
    fn new(
        observer: &Observer<'_>,
        track: &Track,
        (middle, velocity): (Instant<Tai>, Vector),
        hull: (f64, f64),
        body: Body,
    ) -> std::result::Result<Self, Status> {
        let at = |seconds: f64| -> std::result::Result<[f64; 7], Status> {
            let tai = middle.plus_seconds(seconds);
            let celestial = track.celestial(tai.to_tt())?;
            let sky = observer.sky_from(tai, &celestial);
            let m = body_direction(body, observer.ephemeris, &sky)?.direction;
            let v = sub(sky.velocity_c, velocity);
            Ok([m[0], m[1], m[2], v[0], v[1], v[2], dot(m, v)])
        };
        let half = 0.5 * (hull.1 - hull.0);
        let samples = (0..NODES)
            .map(|j| at(hull.0 + half * (1.0 + node(j, NODES))))
            .collect::<std::result::Result<Vec<_>, Status>>()?;
        let direction_of = |sample: &[f64; 7]| [sample[0], sample[1], sample[2]];
        let direction = direction_of(&samples[NODES / 2]);
        let farthest =
            samples.iter().map(|sample| angle(direction_of(sample), direction)).fold(0.0, f64::max);
        let mut next = samples.iter();
        let series = ChebyshevVector::fit(hull.0, hull.1, |_| next.next().copied().unwrap_or([f64::NAN; 7]));
        Ok(Mover { series, direction, reach: 1.02 * farthest + ROOM })
    }

    /// cos(least) − cos(distance) for a star over the dark, times one plus a small part of the star's
    /// aberration: positive where it is far enough away. `star` is its direction with the Earth's aberration
    /// at the night's middle, a unit vector; what the observer's differs from that is in the series.
    pub fn clearance(&self, star: Vector, cos_least: f64) -> crate::math::chebyshev::Chebyshev<NODES> {
        // Seen with the velocity v more, the star stands at (p + v) / (1 + p·v).
        let v = scale(cos_least, star);
        self.series.dot([-star[0], -star[1], -star[2], v[0], v[1], v[2], -1.0]).plus(cos_least)
    }

    /// Angle between the body and a star at an instant, radians.
    pub fn separation(&self, star: Vector, seconds: f64) -> f64 {
        let [x, y, z, ..] = self.series.value(seconds);
        angle([x, y, z], star)
    }
}

/// Whole turns off an hour angle.
pub(super) fn nearest_turn(angle: f64) -> f64 {
    TURN * (angle / TURN).round()
}
