//! When a target rises, sets and passes the meridian; twilights; the almanac of a site.

mod almanac;
mod arc;
mod batch;
mod crossing;
mod days;
mod moving;
mod passages;
mod passing;
mod scatter;

pub use almanac::{AlmanacRow, almanac, night_bounds};
pub(crate) use almanac::{SYNODIC_MONTH_D, moon_age_d, moon_elongation};
pub use arc::{Arc, Plane, SEPARATION_NODES, STAR_ARC_ERROR_RAD, Screen, StarArc, node_fraction};
pub use batch::{BATCH, BatchSpace, star_events};
pub(crate) use crossing::STAR_REACH_RAD;
pub use crossing::{Crossing, Culmination, DayPath};
pub use days::{Days, span_ends, track_for, track_plan, utc_text};
pub use moving::{BODY_ARC_ERROR_RAD, BODY_NODES, BodyArc, MovingNodes, directions_at};
pub use passages::{Event, EventKind, Passage, rise_transit_set, rise_transit_set_with};
pub(crate) use passing::{Passing, ROUNDING_S, altitude_passing, passing};
pub use scatter::horizon_scatter;
