//! When a target may be observed: the intervals in which every limit holds.
//!
//! Each limit yields a set of intervals over a day, in closed form or from the crossings of a series;
//! no limit is a sampled mask. The sets are intersected, days are joined, and each edge keeps the
//! reason of the limit that set it.

mod day;
pub mod intervals;
mod limits;
mod reason;
mod separation;
mod target;

pub use limits::{Column, Limits};
pub use reason::Cause;
pub use target::{LimitedSpan, TargetWindows, Window, Workspace};
