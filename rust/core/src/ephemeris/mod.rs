//! Where the Sun, the Moon and the planets are: a compact built-in ephemeris, or a kernel.
//!
//! Both give barycentric positions and velocities in the ICRS (the BCRS of IAU 2000 resolution B1.3),
//! au and au/day, at an instant of TDB, geometric: no light time, no aberration. [`Ephemeris`] is the
//! one seam behind which either stands.

pub mod body;
mod chebyshev;
pub mod compact;
mod daf;
pub mod spk;

pub use body::Body;
pub use compact::Compact;
pub use spk::Spk;

use crate::error::{Error, Result, Status};
use crate::math::vector::Vector;

/// A position and a velocity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct State {
    /// au.
    pub position: Vector,
    /// au a day of TDB.
    pub velocity: Vector,
}

/// Where positions come from. Cheap to clone.
#[derive(Debug, Clone)]
pub enum Ephemeris {
    /// The table built into this crate, 1900 to 2100.
    Compact(&'static Compact),
    /// A kernel handed in as bytes.
    Kernel(Spk),
}

impl Default for Ephemeris {
    fn default() -> Self {
        Ephemeris::Compact(Compact::builtin())
    }
}

impl Ephemeris {
    /// Barycentric state at the TDB instant `day + fraction` (Modified Julian Date, any split).
    /// [`Status::OutsideEphemeris`] where there is none.
    #[inline]
    pub fn state_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<State, Status> {
        match self {
            Ephemeris::Compact(compact) => compact.state_at(body, day, fraction),
            Ephemeris::Kernel(kernel) => kernel.state_at(body, day, fraction),
        }
    }

    /// Barycentric position, au, as [`Ephemeris::state_at`] at half the cost.
    #[inline]
    pub fn position_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<Vector, Status> {
        match self {
            Ephemeris::Compact(compact) => compact.position_at(body, day, fraction),
            Ephemeris::Kernel(kernel) => kernel.position_at(body, day, fraction),
        }
    }

    /// What the positions come from, in words, for the record that every file carries.
    pub fn provenance(&self) -> String {
        match self {
            Ephemeris::Compact(compact) => compact.provenance(),
            Ephemeris::Kernel(kernel) => kernel.provenance(),
        }
    }

    /// Whether the body is known at every instant from `first_mjd` to `last_mjd` (TDB, both included);
    /// an [`Error`] that says what is missing if not. For calls that would rather stop than return a
    /// status a row.
    pub fn require(&self, body: Body, first_mjd: f64, last_mjd: f64) -> Result<()> {
        match self {
            Ephemeris::Compact(compact) => {
                let (first, last) = compact.span_mjd();
                if first_mjd >= first && last_mjd <= last {
                    Ok(())
                } else {
                    Err(Error::invalid(
                        "time span for the built-in ephemeris",
                        format_args!("MJD {first_mjd} to {last_mjd} TDB"),
                        format!("MJD {first} to {last}; for others hand in a kernel"),
                    ))
                }
            }
            Ephemeris::Kernel(kernel) => kernel.require(body, first_mjd, last_mjd),
        }
    }
}
