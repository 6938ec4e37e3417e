//! Where targets are, at one instant, at many, or each row at its own.

mod buffers;
mod chain;
mod columns;
mod looks;

use self::buffers::fill;
pub(super) use self::buffers::{Buffers, ROWS};
pub(super) use self::chain::Chain;
use super::parallel::Workers;
use crate::astrometry::{Observer, Sky, Targets, Track, TrackPlan};
use crate::error::{Error, Result, Status};
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
/// Accuracy: directions as in [`astrometry::chain`](crate::astrometry::chain); the track adds less than 0.5 µas,
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
    let chain = Chain { observer, targets, isa: workers.isa() };
    let job = Job { chain, instants: &instants, shape, track: &track };
    let space = || Space { buffers: Buffers::new(), last: None };
    workers.for_each_with(out.blocks(ROWS), space, |space, (first, block)| job.block(first, block, space))
}

struct Job<'a> {
    chain: Chain<'a>,
    instants: &'a [std::result::Result<Instant<Tai>, Status>],
    shape: Shape,
    track: &'a Track,
}

/// What a thread keeps from block to block.
struct Space {
    buffers: Box<Buffers>,
    /// The last instant's number and sky: neighbouring blocks share it.
    last: LastSky,
}

type LastSky = Option<(usize, std::result::Result<Sky, Status>)>;

impl Job<'_> {
    fn block(&self, first: usize, mut out: PlaceColumns<'_>, space: &mut Space) {
        let rows = out.status.len();
        let targets = self.chain.targets.len();
        let mut row = 0;
        while row < rows {
            // As many rows as share an instant.
            let (time, target) = match self.shape {
                Shape::Grid => ((first + row) / targets, (first + row) % targets),
                Shape::Pairwise => (first + row, first + row),
            };
            let count = match self.shape {
                Shape::Grid => (rows - row).min(targets - target),
                Shape::Pairwise => 1,
            };
            let range = row..row + count;
            match self.sky(time, &mut space.last) {
                Ok(sky) => {
                    self.chain.partners(sky, range.clone(), &mut space.buffers, &out);
                    self.chain.directions(sky, target, range, &mut space.buffers, &mut out);
                }
                &Err(bad) => {
                    looks::clear(&mut out, range.clone());
                    fill(&mut space.buffers.direction, range.clone(), [f64::NAN; 3]);
                    fill(&mut space.buffers.local, range.clone(), [f64::NAN; 3]);
                    for (status, target) in out.status[range].iter_mut().zip(target..) {
                        // A row that is bad in itself is so at every instant.
                        let own = self.chain.targets.status(target);
                        *status = if own.is_bad() { own } else { bad } as u8;
                    }
                }
            }
            row += count;
        }
        space.buffers.write(&mut out, self.chain.observer, self.chain.isa);
    }

    /// The sky of an instant; that of the last one is kept where others will ask for it.
    fn sky<'s>(&self, time: usize, last: &'s mut LastSky) -> &'s std::result::Result<Sky, Status> {
        if self.shape == Shape::Pairwise || last.as_ref().is_none_or(|(number, _)| *number != time) {
            *last = None;
        }
        let (_, sky) = last.get_or_insert_with(|| {
            (time, self.instants[time].and_then(|tai| self.track.sky(self.chain.observer, tai)))
        });
        sky
    }
}
