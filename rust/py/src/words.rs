//! The words behind the codes, and the words that arguments may be.

use hourarc_core::ephemeris::Body;
use hourarc_core::error::Status;
use pyo3::prelude::*;
use pyo3::types::PyDict;

/// The word for each status code.
#[pyfunction]
pub fn status_words(py: Python<'_>) -> PyResult<Bound<'_, PyDict>> {
    let words = PyDict::new(py);
    for status in Status::ALL {
        words.set_item(status as u8, status.word())?;
    }
    Ok(words)
}

/// The names that `Bodies` takes.
#[pyfunction]
pub fn body_words() -> Vec<&'static str> {
    Body::ALL.iter().map(|body| body.word()).collect()
}
