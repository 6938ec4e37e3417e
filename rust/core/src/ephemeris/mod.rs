//! Where the Sun, the Moon and the planets are: a compact built-in ephemeris, or a kernel.
//!
//! Both give barycentric positions and velocities in the ICRS (the BCRS of IAU 2000 resolution B1.3),
//! au and au/day, at an instant of TDB, geometric: no light time, no aberration. [`Ephemeris`] is the
//! one seam behind which either stands.
//!
//! # Errors of the compact ephemeris
//!
//! Largest differences from DE440 over its whole span (1899-07-13 to 2101-05-23), measured at 151
//! points of every piece by `hourarc-tables ephemeris`, carried by the table ([`Compact::error`]) and
//! held by the tests in `compact` to jplephem's reading of DE440. All barycentric, the Moon geocentric.
//! The last column is what is left in the direction from the Earth's centre at the nearest approach,
//! the Earth's own error included.
//!
//! | body | position, m | velocity, mm/s | direction, mas |
//! |---|---|---|---|
//! | Sun | 0.15 | 0.0015 | 0.0006 |
//! | Moon | 0.031 | 0.0033 | 0.018 |
//! | Mercury | 2.0 | 0.17 | 0.006 |
//! | Venus | 0.49 | 0.014 | 0.004 |
//! | Earth | 0.26 | 0.0076 | – |
//! | Mars | 0.39 | 0.0074 | 0.003 |
//! | Jupiter | 3.2 | 0.013 | 0.0012 |
//! | Saturn | 3.2 | 0.0082 | 0.0006 |
//! | Uranus | 2.8 | 0.0041 | 0.0003 |
//! | Neptune | 2.7 | 0.0029 | 0.0002 |
//! | Pluto | 2.6 | 0.0029 | 0.0002 |
//!
//! The Earth's velocity makes 0.005 µas of aberration. DE440 itself is tied to the ICRF to some 0.2 mas
//! for the inner planets (Park et al. 2021, *Astron. J.* 161, 105, from memory) and less well beyond.

pub mod body;
mod chebyshev;
pub mod compact;
mod daf;
pub mod orbits;
pub mod photometry;
pub mod spk;

pub use body::Body;
pub use compact::Compact;
pub use spk::Spk;

use crate::error::{Error, Result, Status};
use crate::math::vector::Vector;
use crate::time::{Instant, Tdb};

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
    /// Barycentric state, au and au/day. [`Status::OutsideEphemeris`] where there is none.
    #[inline]
    pub fn state(&self, body: Body, tdb: Instant<Tdb>) -> std::result::Result<State, Status> {
        let (day, fraction) = tdb.mjd_parts();
        self.state_at(body, day, fraction)
    }

    /// Barycentric position, au, as [`Ephemeris::state`] at some two thirds of the cost.
    #[inline]
    pub fn position(&self, body: Body, tdb: Instant<Tdb>) -> std::result::Result<Vector, Status> {
        let (day, fraction) = tdb.mjd_parts();
        self.position_at(body, day, fraction)
    }

    /// Barycentric state at the TDB instant `day + fraction` (Modified Julian Date, any split).
    /// [`Status::OutsideEphemeris`] where there is none.
    #[inline]
    pub fn state_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<State, Status> {
        match self {
            Ephemeris::Compact(compact) => compact.state_at(body, day, fraction),
            Ephemeris::Kernel(kernel) => kernel.state_at(body, day, fraction),
        }
    }

    /// Barycentric position, au, as [`Ephemeris::state_at`].
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::vector::{norm, sub};

    static EXCERPT: &[u8] = include_bytes!("../../../../tests/data/de440-excerpt.bsp");

    /// The same through either arm of the seam, by instant and by parts: DE440 and its compact form
    /// agree to the stated errors, and are not the same thing.
    #[test]
    fn both_arms_give_the_same_sky() {
        let compact = Ephemeris::default();
        let kernel = Ephemeris::Kernel(Spk::new(EXCERPT, "excerpt").unwrap());
        // Before the 33rd day: from there on the excerpt's Sun is moved on purpose.
        for day in 60_976..61_008 {
            let tdb = Instant::from_mjd(f64::from(day), 0.4);
            for body in [Body::Sun, Body::Moon, Body::Earth, Body::Mars, Body::Jupiter, Body::Uranus] {
                let (a, b) = (compact.state(body, tdb).unwrap(), kernel.state(body, tdb).unwrap());
                let apart = norm(sub(a.position, b.position));
                assert!(apart > 0.0 && apart < 2.2e-11, "{body:?}: {apart} au");
                assert!(norm(sub(a.velocity, b.velocity)) < 1e-11);
                for (ephemeris, state) in [(&compact, a), (&kernel, b)] {
                    assert_eq!(ephemeris.position(body, tdb), Ok(state.position));
                    assert_eq!(ephemeris.state_at(body, f64::from(day), 0.4), Ok(state));
                }
            }
        }
    }

    #[test]
    fn velocities_are_the_slopes_of_positions() {
        let ephemeris = Ephemeris::default();
        for body in Body::ALL {
            let at = |fraction: f64| ephemeris.position_at(body, 60_003.0, fraction).unwrap();
            let slope = sub(at(0.51), at(0.49)).map(|difference| difference / 0.02);
            let velocity = ephemeris.state_at(body, 60_003.0, 0.5).unwrap().velocity;
            assert!(norm(sub(slope, velocity)) < 1e-7, "{body:?}");
        }
    }

    #[test]
    fn a_span_is_required_or_refused_with_the_reason() {
        let compact = Ephemeris::default();
        assert_eq!(compact.require(Body::Moon, 15_020.0, 88_434.0), Ok(()));
        for (first, last) in [(14_000.0, 60_000.0), (60_000.0, 90_000.0), (f64::NAN, 60_000.0)] {
            let message = compact.require(Body::Moon, first, last).unwrap_err().to_string();
            assert!(message.contains(&format!("given MJD {first} to {last}")), "{message}");
            assert!(message.contains("MJD 14848 to 88576"), "{message}");
        }
        let kernel = Ephemeris::Kernel(Spk::new(EXCERPT, "excerpt").unwrap());
        assert_eq!(kernel.require(Body::Moon, 60_976.0, 61_072.0), Ok(()));
        assert!(kernel.require(Body::Moon, 60_976.0, 61_073.0).unwrap_err().is_table());
        assert_eq!(kernel.provenance(), "SPK kernel excerpt");
        assert!(compact.provenance().starts_with("DE440 (compact"));
    }
}
