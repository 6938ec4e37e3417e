//! What can be observed: every verb takes any of these.

use super::catalog::Catalog;
use crate::ephemeris::Body;
use crate::error::Status;

/// Rows of targets of one kind.
#[derive(Debug, Clone, Copy)]
pub enum Targets<'a> {
    /// Catalogue places.
    Catalog(&'a Catalog),
    /// Bodies of the solar system, from the observer's ephemeris.
    Bodies(&'a [Body]),
}

impl Targets<'_> {
    /// Number of rows, good and bad.
    pub fn len(&self) -> usize {
        match self {
            Targets::Catalog(catalog) => catalog.len(),
            Targets::Bodies(bodies) => bodies.len(),
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
        }
    }
}
