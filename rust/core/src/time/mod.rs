//! Instants, the scales they are counted in, leap seconds, and the civil calendar.
//!
//! An [`Instant`] carries its scale in its type, so that adding a conversion is the only way from one
//! to another. UTC is not such a scale (it has steps) and has a type of its own, [`Utc`], which is
//! exactly numpy's `datetime64[ns]`. What TAI−UTC was is a value, [`LeapSeconds`], that is handed in.
//!
//! The road between the scales: [`Utc`] ↔ TAI by [`LeapSeconds`], TAI ↔ TT by a constant, TT ↔ TDB by a
//! series, TAI ↔ UT1 by the Earth orientation table in [`crate::earth`].

mod calendar;
mod instant;
mod leap_seconds;
mod tdb;
mod utc;

pub use calendar::Date;
pub use instant::{Instant, Scale, Tai, Tdb, Tt, Ut1};
pub use leap_seconds::LeapSeconds;
pub use tdb::tdb_minus_tt;
pub use utc::Utc;
