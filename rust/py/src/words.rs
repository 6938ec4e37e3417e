//! The words behind the codes, and the words that arguments may be.

use hourarc_core::ephemeris::Body;
use hourarc_core::error::Status;
use hourarc_core::events::Passage;
use hourarc_core::math::dispatch::Isa;
use hourarc_core::refraction::AirmassModel;
use hourarc_core::windows::{Cause, PhaseScale};
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

/// The word for what a target does over a span, in the order of the codes.
#[pyfunction]
pub fn event_status_words() -> Vec<&'static str> {
    let word = |passage| match passage {
        Passage::Crosses => "crosses",
        Passage::AlwaysAbove => "always_above",
        Passage::AlwaysBelow => "always_below",
        Passage::BadRow => "bad_row",
    };
    [Passage::Crosses, Passage::AlwaysAbove, Passage::AlwaysBelow, Passage::BadRow].map(word).to_vec()
}

/// The word for what opens, closes or leaves no window, in the order of the codes.
#[pyfunction]
pub fn reason_words() -> Vec<&'static str> {
    Cause::ALL.iter().map(|cause| cause.word()).collect()
}

/// The names that `Bodies` takes.
#[pyfunction]
pub fn body_words() -> Vec<&'static str> {
    Body::ALL.iter().map(|body| body.word()).collect()
}

/// The names of the airmass formulae.
#[pyfunction]
pub fn airmass_model_words() -> Vec<&'static str> {
    AirmassModel::ALL.iter().map(|model| model.word()).collect()
}

/// The names of the clocks on which phases are counted.
#[pyfunction]
pub fn phase_scale_words() -> Vec<&'static str> {
    [PhaseScale::BarycentricTdb, PhaseScale::HeliocentricUtc].map(PhaseScale::word).to_vec()
}

/// The instruction sets that the inner loops can be run with on this processor, the widest last.
#[pyfunction]
pub fn instruction_sets() -> Vec<&'static str> {
    Isa::available().map(Isa::word).collect()
}
