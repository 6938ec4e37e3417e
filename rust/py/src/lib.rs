//! The Python face of `hourarc-core`: extract, detach, call, wrap. No arithmetic, no constant.
//!
//! One file a verb. Arrays arrive one-dimensional and contiguous, as `python/hourarc` makes them; the
//! stub `python/hourarc/_engine.pyi` says the same to a type checker, and a test holds the two together.

mod arrays;
mod earth;
mod errors;
mod geometry;
mod words;

use pyo3::prelude::*;

#[pymodule]
mod _engine {
    use pyo3::prelude::*;

    #[pymodule_export]
    use crate::earth::{bias_precession_nutation, precession_nutation, rotation_angle, sidereal_time};
    #[pymodule_export]
    use crate::geometry::{position_angle, separation};
    #[pymodule_export]
    use crate::words::{body_words, status_words};

    #[pymodule_init]
    fn init(module: &Bound<'_, PyModule>) -> PyResult<()> {
        module.add("version", env!("CARGO_PKG_VERSION"))?;
        module.add("debug_build", cfg!(debug_assertions))
    }
}
