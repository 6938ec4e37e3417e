//! Where targets are, at one instant, at many, or each row at its own.

use super::parallel::Workers;
use crate::astrometry::{Observer, Sky, Targets, Track, body_direction, star_direction};
use crate::constants::RADIANS_PER_DEGREE;
use crate::ephemeris::Body;
use crate::error::{Error, Result, Status};
use crate::horizon::{Latitude, altitude, azimuth, hour_angle, parallactic_angle};
use crate::math::vector::{Vector, angle, dot, rotate};
use crate::refraction::AirmassModel;
use crate::time::{Instant, Tai, Utc};

/// Rows a block: large enough that starting one costs nothing, small enough that all threads are busy
/// and the caller is heard in time.
const BLOCK: usize = 4096;

/// How instants and targets meet.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// Every target at every instant: the output's rows are instants, its columns targets.
    Grid,
    /// Target i at instant i.
    Pairwise,
}

/// What can be computed of a place.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[repr(u8)]
pub enum PlaceColumn {
    /// Observed altitude, degrees.
    AltitudeDeg,
    /// Azimuth from north through east, degrees in [0, 360).
    AzimuthDeg,
    /// Local hour angle, degrees in (−180, 180].
    HourAngleDeg,
    /// Declination of date on the celestial intermediate pole, degrees.
    DeclinationDeg,
    /// Airmass by [`PLACE_AIRMASS`]; NaN below the horizon.
    Airmass,
    /// Parallactic angle, degrees in (−180, 180].
    ParallacticAngleDeg,
    /// Distance from the Moon's centre, degrees, both topocentric without refraction.
    MoonSeparationDeg,
    /// Distance from the Sun's centre, degrees, both topocentric without refraction.
    SunSeparationDeg,
}

/// The formula behind [`PlaceColumn::Airmass`].
pub const PLACE_AIRMASS: AirmassModel = AirmassModel::KastenYoung1989;

impl PlaceColumn {
    /// Every column.
    pub const ALL: [PlaceColumn; 8] = [
        PlaceColumn::AltitudeDeg,
        PlaceColumn::AzimuthDeg,
        PlaceColumn::HourAngleDeg,
        PlaceColumn::DeclinationDeg,
        PlaceColumn::Airmass,
        PlaceColumn::ParallacticAngleDeg,
        PlaceColumn::MoonSeparationDeg,
        PlaceColumn::SunSeparationDeg,
    ];

    /// The word for this column.
    pub fn word(self) -> &'static str {
        match self {
            PlaceColumn::AltitudeDeg => "altitude_deg",
            PlaceColumn::AzimuthDeg => "azimuth_deg",
            PlaceColumn::HourAngleDeg => "hour_angle_deg",
            PlaceColumn::DeclinationDeg => "declination_deg",
            PlaceColumn::Airmass => "airmass",
            PlaceColumn::ParallacticAngleDeg => "parallactic_angle_deg",
            PlaceColumn::MoonSeparationDeg => "moon_separation_deg",
            PlaceColumn::SunSeparationDeg => "sun_separation_deg",
        }
    }

    /// The column of a word.
    ///
    /// # Errors
    /// When there is none.
    pub fn from_word(word: &str) -> Result<Self> {
        Self::ALL
            .into_iter()
            .find(|column| column.word() == word)
            .ok_or_else(|| Error::invalid("column", word, Self::ALL.map(PlaceColumn::word).join(", ")))
    }
}

/// The columns asked for and the status, all of one length, owned by the caller.
#[derive(Debug)]
pub struct PlaceColumns<'a> {
    /// Each column once.
    pub columns: Vec<(PlaceColumn, &'a mut [f64])>,
    /// [`Status`] codes.
    pub status: &'a mut [u8],
}

impl<'a> PlaceColumns<'a> {
    fn split_at(self, rows: usize) -> (Self, Self) {
        let (status, rest_status) = self.status.split_at_mut(rows);
        let (columns, rest) = self
            .columns
            .into_iter()
            .map(|(column, values)| {
                let (first, rest) = values.split_at_mut(rows);
                ((column, first), (column, rest))
            })
            .unzip();
        (PlaceColumns { columns, status }, PlaceColumns { columns: rest, status: rest_status })
    }

    fn wants(&self, wanted: PlaceColumn) -> bool {
        self.columns.iter().any(|(column, _)| *column == wanted)
    }
}

/// Computes places: `when` × `targets` in rows of targets, or row by row.
///
/// Accuracy: directions as [`star_direction`] and [`body_direction`]; the track adds less than 0.5 µas.
/// An instant or a row that is not good gives NaN and its status, and touches no other.
///
/// # Errors
/// Outputs that do not fit, or the caller's wish to stop.
pub fn place(
    observer: &Observer<'_>,
    targets: &Targets<'_>,
    when: &[Utc],
    shape: Shape,
    mut out: PlaceColumns<'_>,
    workers: &mut Workers<'_>,
) -> Result<()> {
    let rows = match shape {
        Shape::Grid => when.len() * targets.len(),
        Shape::Pairwise if when.len() == targets.len() => when.len(),
        Shape::Pairwise => {
            let allowed = format!("{}, one a target", targets.len());
            return Err(Error::invalid("when", format!("{} instants", when.len()), allowed));
        }
    };
    for (name, length) in out
        .columns
        .iter()
        .map(|(column, values)| (column.word(), values.len()))
        .chain([("status", out.status.len())])
    {
        if length != rows {
            return Err(Error::invalid(name, format!("{length} values"), format!("{rows}")));
        }
    }
    let leap_seconds = observer.orientation.leap_seconds();
    let instants: Vec<std::result::Result<Instant<Tai>, Status>> =
        when.iter().map(|&utc| leap_seconds.to_tai(utc)).collect();
    let track = Track::through(instants.iter().filter_map(|instant| instant.ok()), observer.ephemeris);
    let mut blocks = Vec::with_capacity(rows.div_ceil(BLOCK));
    let mut first = 0;
    while first < rows {
        let (block, rest) = out.split_at(BLOCK.min(rows - first));
        out = rest;
        let length = block.status.len();
        blocks.push((first, block));
        first += length;
    }
    let job = Job { observer, targets, instants: &instants, shape, track: &track };
    workers.for_each(blocks, |(first, block)| job.block(first, block))
}

struct Job<'a> {
    observer: &'a Observer<'a>,
    targets: &'a Targets<'a>,
    instants: &'a [std::result::Result<Instant<Tai>, Status>],
    shape: Shape,
    track: &'a Track,
}

/// What is the same for all targets at one instant.
struct Moment {
    sky: Sky,
    moon: Vector,
    sun: Vector,
}

impl Job<'_> {
    fn block(&self, first: usize, mut out: PlaceColumns<'_>) {
        let wants_moon = out.wants(PlaceColumn::MoonSeparationDeg);
        let wants_sun = out.wants(PlaceColumn::SunSeparationDeg);
        let latitude = Latitude::new(self.observer.site.latitude());
        let mut current = usize::MAX;
        let mut moment = Err(Status::NotATime);
        for index in 0..out.status.len() {
            let row = first + index;
            let (time, target) = match self.shape {
                Shape::Grid => (row / self.targets.len(), row % self.targets.len()),
                Shape::Pairwise => (row, row),
            };
            if time != current {
                moment = self.moment(time, wants_moon, wants_sun);
                current = time;
            }
            let status = self.targets.status(target);
            let outcome = match &moment {
                _ if status.is_bad() => Err(status),
                Err(bad) => Err(*bad),
                Ok(moment) => self.direction(target, &moment.sky).map(|direction| (moment, direction)),
            };
            match outcome {
                Ok((moment, direction)) => {
                    out.status[index] = status.worst(moment.sky.note()) as u8;
                    self.write(moment, direction, latitude, index, &mut out);
                }
                Err(bad) => {
                    out.status[index] = bad as u8;
                    for (_, values) in &mut out.columns {
                        values[index] = f64::NAN;
                    }
                }
            }
        }
    }

    fn moment(&self, time: usize, moon: bool, sun: bool) -> std::result::Result<Moment, Status> {
        let sky = self.track.sky(self.observer, self.instants[time]?)?;
        let direction = |wanted: bool, body: Body| -> std::result::Result<Vector, Status> {
            if !wanted {
                return Ok([f64::NAN; 3]);
            }
            Ok(body_direction(body, self.observer.ephemeris, &sky)?.direction)
        };
        Ok(Moment { moon: direction(moon, Body::Moon)?, sun: direction(sun, Body::Sun)?, sky })
    }

    #[inline(always)]
    fn direction(&self, target: usize, sky: &Sky) -> std::result::Result<Vector, Status> {
        match self.targets {
            Targets::Catalog(catalog) => Ok(star_direction(&catalog.star(target), sky)),
            Targets::Bodies(bodies) => {
                Ok(body_direction(bodies[target], self.observer.ephemeris, sky)?.direction)
            }
        }
    }

    fn write(
        &self,
        moment: &Moment,
        direction: Vector,
        latitude: Latitude,
        index: usize,
        out: &mut PlaceColumns<'_>,
    ) {
        let local = rotate(&moment.sky.local, direction);
        for (column, values) in &mut out.columns {
            values[index] = match column {
                PlaceColumn::AltitudeDeg => {
                    self.observer.refraction.observed_altitude(altitude(local)) / RADIANS_PER_DEGREE
                }
                PlaceColumn::AzimuthDeg => degrees_of_turn(azimuth(local)),
                PlaceColumn::HourAngleDeg => hour_angle(local, latitude) / RADIANS_PER_DEGREE,
                PlaceColumn::DeclinationDeg => {
                    let pole = moment.sky.intermediate[2];
                    let along = dot(pole, direction);
                    let across = crate::math::vector::norm(crate::math::vector::cross(pole, direction));
                    along.atan2(across) / RADIANS_PER_DEGREE
                }
                PlaceColumn::Airmass => {
                    let topocentric = altitude(local);
                    let observed = self.observer.refraction.observed_altitude(topocentric);
                    PLACE_AIRMASS.airmass(observed, topocentric)
                }
                PlaceColumn::ParallacticAngleDeg => parallactic_angle(local, latitude) / RADIANS_PER_DEGREE,
                PlaceColumn::MoonSeparationDeg => angle(direction, moment.moon) / RADIANS_PER_DEGREE,
                PlaceColumn::SunSeparationDeg => angle(direction, moment.sun) / RADIANS_PER_DEGREE,
            };
        }
    }
}

/// Degrees in [0, 360) of radians in [0, 2π): the last double below 2π must not become 360.
fn degrees_of_turn(radians: f64) -> f64 {
    let degrees = radians / RADIANS_PER_DEGREE;
    if degrees < 360.0 { degrees } else { 0.0 }
}
