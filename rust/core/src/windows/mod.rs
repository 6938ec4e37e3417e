//! When a target may be observed: the intervals in which every limit holds.
//!
//! Each limit yields a set of intervals over a day, in closed form or from the crossings of a series;
//! no limit is a sampled mask. The sets are intersected, days are joined, and each edge keeps the
//! reason of the limit that set it.

mod day;
mod explain;
pub mod intervals;
mod limits;
mod pieces;
mod reason;
mod slots;
mod sure;
mod target;

pub use day::moon_phase_angle;
pub use explain::{Explanation, LimitExplained, UtcInterval};
pub use limits::{Column, Limits, MoonAvoidance, MoonLight, Phase, PhaseScale, SkyModel, sky_brightness};
pub use reason::Cause;
pub use slots::{Slots, slots, windows_after_gap};
pub use target::{LimitedSpan, TargetWindows, Window, Workspace};
