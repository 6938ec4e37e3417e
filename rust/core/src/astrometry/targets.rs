//! What can be observed: every verb takes any of these.

use super::catalog::Catalog;
use crate::ephemeris::Body;
use crate::ephemeris::orbits::Orbits;
use crate::error::Status;

/// Rows of targets of one kind.
#[derive(Debug, Clone, Copy)]
pub enum Targets<'a> {
    /// Catalogue places.
    Catalog(&'a Catalog),
    /// Bodies of the solar system, from the observer's ephemeris.
    Bodies(&'a [Body]),
    /// Minor bodies on their orbits about the Sun of the observer's ephemeris.
    Orbits(&'a Orbits),
}

/// One target of the solar system: it moves among the stars, and is near enough for parallax to be large.
#[derive(Debug, Clone, Copy)]
pub enum Moving<'a> {
    /// The Sun, the Moon or a planet.
    Body(Body),
    /// A row of a table of orbits.
    Orbit(&'a Orbits, usize),
}

impl From<Body> for Moving<'_> {
    fn from(body: Body) -> Self {
        Moving::Body(body)
    }
}

impl<'a> Targets<'a> {
    /// Number of rows, good and bad.
    pub fn len(&self) -> usize {
        match self {
            Targets::Catalog(catalog) => catalog.len(),
            Targets::Bodies(bodies) => bodies.len(),
            Targets::Orbits(orbits) => orbits.len(),
        }
    }

    /// Whether there are no rows.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// What is to be said of a row whatever is asked of it.
    pub fn status(&self, row: usize) -> Status {
        match self {
            Targets::Catalog(catalog) => catalog.status()[row],
            Targets::Bodies(_) => Status::Ok,
            Targets::Orbits(orbits) => orbits.status(row),
        }
    }

    /// The target of a row, if these are targets that move; `None` for a catalogue.
    pub fn moving(&self, row: usize) -> Option<Moving<'a>> {
        match self {
            Targets::Catalog(_) => None,
            Targets::Bodies(bodies) => Some(Moving::Body(bodies[row])),
            Targets::Orbits(orbits) => Some(Moving::Orbit(orbits, row)),
        }
    }
}
