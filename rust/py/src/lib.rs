//! The Python face of `hourarc-core`: extract, detach, call, wrap.
use pyo3::prelude::*;

#[pymodule]
mod _engine {}
