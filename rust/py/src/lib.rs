//! The Python face of `hourarc-core`: extract, detach, call, wrap. No arithmetic, no constant.
//!
//! One file a verb. Arrays arrive one-dimensional and contiguous, as `python/hourarc` makes them; the
//! stub `python/hourarc/_engine.pyi` says the same to a type checker, and a test holds the two together.

mod almanac;
mod arrays;
mod earth;
mod errors;
mod events;
mod explain;
mod geometry;
mod kernel;
mod limits;
mod orbits;
mod orientation;
mod place;
mod season;
mod site;
mod slots;
mod targets;
mod watch;
mod windows;
mod words;
mod workers;

use pyo3::prelude::*;

#[pymodule]
mod _engine {
    use pyo3::prelude::*;

    #[pymodule_export]
    use crate::almanac::almanac;
    #[pymodule_export]
    use crate::earth::{bias_precession_nutation, precession_nutation, rotation_angle, sidereal_time};
    #[pymodule_export]
    use crate::events::rise_transit_set;
    #[pymodule_export]
    use crate::explain::explain;
    #[pymodule_export]
    use crate::geometry::{position_angle, separation};
    #[pymodule_export]
    use crate::orbits::Orbits;
    #[pymodule_export]
    use crate::orientation::Orientation;
    #[pymodule_export]
    use crate::place::place;
    #[pymodule_export]
    use crate::season::{grid_quantities, visibility_grid};
    #[pymodule_export]
    use crate::site::Site;
    #[pymodule_export]
    use crate::slots::{slots, windows_after_gap};
    #[pymodule_export]
    use crate::targets::{Bodies, Catalog};
    #[pymodule_export]
    use crate::watch::Watch;
    #[pymodule_export]
    use crate::windows::windows;
    #[pymodule_export]
    use crate::words::{
        airmass_model_words, body_words, event_status_words, instruction_sets, phase_scale_words,
        reason_words, status_words,
    };

    #[pymodule_init]
    fn init(module: &Bound<'_, PyModule>) -> PyResult<()> {
        module.add("version", env!("CARGO_PKG_VERSION"))?;
        module.add("debug_build", cfg!(debug_assertions))?;
        module.add("first_bad_status", hourarc_core::error::Status::FIRST_BAD)
    }
}
