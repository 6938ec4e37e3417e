//! Where targets are, at one instant, at many, or each row at its own.

mod buffers;
mod columns;

use self::buffers::{Buffers, ROWS, StarsUnderOneSky, WriteColumn, fill, set};
use super::parallel::Workers;
use crate::astrometry::{Observer, Sky, Targets, Track, TrackPlan, body_direction, star_direction};
use crate::ephemeris::Body;
use crate::error::{Error, Result, Status};
use crate::horizon::Latitude;
use crate::math::dispatch::Isa;
use crate::math::vector::{Vector, rotate};
use crate::time::{Instant, Tai, Utc};

pub use self::columns::{PLACE_AIRMASS, PlaceColumn, PlaceColumns};

/// Instants a block when they are converted.
const INSTANTS: usize = 8192;

/// How instants and targets meet.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// Every target at every instant: the output's rows are instants, its columns targets.
    Grid,
    /// Target i at instant i.
    Pairwise,
}

/// Computes places: `when` × `targets` in rows of targets, or row by row.
///
/// Accuracy: directions as [`star_direction`] and [`body_direction`]; the track adds less than 0.5 µas,
/// the loops' own arctangents less than 0.1 µas. An instant or a row that is not good gives NaN and its
/// status, and touches no other.
///
/// # Errors
/// Outputs that do not fit, or the caller's wish to stop.
pub fn place(
    observer: &Observer<'_>,
    targets: &Targets<'_>,
    when: &[Utc],
    shape: Shape,
    out: PlaceColumns<'_>,
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
    out.check(rows)?;
    let leap_seconds = observer.orientation.leap_seconds();
    let parts = workers.map(when.chunks(INSTANTS).collect(), |when: &[Utc]| {
        let instants: Vec<_> = when.iter().map(|&utc| leap_seconds.to_tai(utc)).collect();
        let plan = TrackPlan::through(instants.iter().filter_map(|instant| instant.ok()));
        Ok((instants, plan))
    })?;
    let (instants, plans): (Vec<_>, Vec<_>) = parts.into_iter().unzip();
    let instants = instants.concat();
    let track = workers.track(TrackPlan::join(plans), observer.ephemeris)?;
    let job = Job { observer, targets, instants: &instants, shape, track: &track, isa: workers.isa() };
    workers.for_each(out.blocks(ROWS), |(first, block)| job.block(first, block))
}

struct Job<'a> {
    observer: &'a Observer<'a>,
    targets: &'a Targets<'a>,
    instants: &'a [std::result::Result<Instant<Tai>, Status>],
    shape: Shape,
    track: &'a Track,
    isa: Isa,
}

impl Job<'_> {
    fn block(&self, first: usize, mut out: PlaceColumns<'_>) {
        let rows = out.status.len();
        let mut buffers = Buffers::new();
        let mut row = 0;
        while row < rows {
            // As many rows as share an instant.
            let (time, target) = match self.shape {
                Shape::Grid => ((first + row) / self.targets.len(), (first + row) % self.targets.len()),
                Shape::Pairwise => (first + row, first + row),
            };
            let count = match self.shape {
                Shape::Grid => (rows - row).min(self.targets.len() - target),
                Shape::Pairwise => 1,
            };
            let range = row..row + count;
            match self.instants[time].and_then(|tai| self.track.sky(self.observer, tai)) {
                Ok(sky) => self.directions(&sky, target, range.clone(), &mut buffers, &mut out),
                Err(bad) => {
                    fill(&mut buffers.direction, range.clone(), [f64::NAN; 3]);
                    fill(&mut buffers.local, range.clone(), [f64::NAN; 3]);
                    for (status, target) in out.status[range].iter_mut().zip(target..) {
                        // A row that is bad in itself is so at every instant.
                        let own = self.targets.status(target);
                        *status = if own.is_bad() { own } else { bad } as u8;
                    }
                }
            }
            row += count;
        }
        let latitude = Latitude::new(self.observer.site.latitude());
        for (column, values) in &mut out.columns {
            self.isa.run(WriteColumn {
                column: *column,
                buffers: &buffers,
                refraction: self.observer.refraction,
                latitude,
                out: values,
            });
        }
    }

    /// Directions of the targets from `target` on, under one sky, into the rows of a block.
    fn directions(
        &self,
        sky: &Sky,
        target: usize,
        rows: std::ops::Range<usize>,
        buffers: &mut Buffers,
        out: &mut PlaceColumns<'_>,
    ) {
        let note = sky.note();
        for (status, target) in out.status[rows.clone()].iter_mut().zip(target..) {
            *status = self.targets.status(target).worst(note) as u8;
        }
        match self.targets {
            Targets::Catalog(catalog) if rows.len() > 1 => {
                let stars = catalog.columns(target..target + rows.len());
                self.isa.run(StarsUnderOneSky { stars, sky, first: rows.start, buffers });
            }
            Targets::Catalog(catalog) => {
                let direction = star_direction(&catalog.star(target), sky);
                set(&mut buffers.direction, rows.start, direction);
                set(&mut buffers.local, rows.start, rotate(&sky.local, direction));
            }
            Targets::Bodies(bodies) => {
                for (row, body) in rows.clone().zip(&bodies[target..]) {
                    let direction = self.body(*body, sky).unwrap_or_else(|status| {
                        out.status[row] = status as u8;
                        [f64::NAN; 3]
                    });
                    set(&mut buffers.direction, row, direction);
                    set(&mut buffers.local, row, rotate(&sky.local, direction));
                }
            }
        }
        if out.wants(PlaceColumn::DeclinationDeg) {
            fill(&mut buffers.pole, rows.clone(), sky.intermediate[2]);
        }
        for (column, body, directions) in [
            (PlaceColumn::MoonSeparationDeg, Body::Moon, &mut buffers.moon),
            (PlaceColumn::SunSeparationDeg, Body::Sun, &mut buffers.sun),
        ] {
            if out.wants(column) {
                fill(directions, rows.clone(), self.body(body, sky).unwrap_or([f64::NAN; 3]));
            }
        }
    }

    fn body(&self, body: Body, sky: &Sky) -> std::result::Result<Vector, Status> {
        Ok(body_direction(body, self.observer.ephemeris, sky)?.direction)
    }
}
