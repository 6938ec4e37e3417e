//! Orbits carried to another epoch, shared out among threads.

use super::parallel::Workers;
use crate::ephemeris::Ephemeris;
use crate::ephemeris::orbits::Orbits;
use crate::error::Result;
use crate::time::{Instant, Tdb};

/// Orbits a block: some tens of milliseconds of integration.
const BLOCK: usize = 32;

/// The orbits at another epoch, row by row, under the pull of the Sun, the Moon and the planets
/// ([`Orbits::advance`] says how exactly). A row that has no orbit there keeps its place with the status.
///
/// # Errors
/// The caller's wish to stop.
pub fn advance(
    orbits: &Orbits,
    to: Instant<Tdb>,
    ephemeris: &Ephemeris,
    workers: &mut Workers<'_>,
) -> Result<Orbits> {
    let rows = orbits.len();
    let blocks = (0..rows).step_by(BLOCK).map(|first| first..rows.min(first + BLOCK)).collect();
    let elements = workers.map(blocks, |rows| Ok(orbits.advance(rows, to, ephemeris)))?;
    orbits.with_elements(&elements.concat())
}
