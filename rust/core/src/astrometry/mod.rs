//! From a catalogue place to the direction in which a telescope points.
//!
//! One effect stands in each file; [`chain`] is the only place that says in which order they act.
//! What depends on the instant and the observer but on no target is a [`Sky`]: computed exactly by
//! [`Observer::sky`], interpolated by a [`Track`]. The two stand behind one type, so every function
//! downstream takes either, and `tests` hold them together from both sides.

pub mod aberration;
pub mod appearance;
pub mod catalog;
pub mod chain;
pub mod deflection;
pub mod parallax;
pub mod sky;
pub mod space_motion;
pub mod targets;
pub mod track;

pub use appearance::{Appearance, appearance, appearance_of_orbit};
pub use catalog::{Catalog, CatalogColumns, Star, StarColumns};
pub use chain::{
    BodyDirection, body_direction, coordinate_direction, near_direction, observer_state, orbit_direction,
    star_direction,
};
pub use sky::{Celestial, Observer, Sky};
pub use targets::{Moving, Targets};
pub use track::{Node, Track, TrackPlan};
