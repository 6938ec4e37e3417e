//! The core's errors as the exceptions of `hourarc.errors`.

use hourarc_core::error::Error;
use pyo3::exceptions::PyKeyboardInterrupt;
use pyo3::prelude::*;

pyo3::import_exception!(hourarc.errors, HourarcError);
pyo3::import_exception!(hourarc.errors, InvalidArgument);
pyo3::import_exception!(hourarc.errors, TableError);

/// The exception for an error of the core.
pub fn raise(error: Error) -> PyErr {
    let message = error.to_string();
    if error.is_invalid() {
        InvalidArgument::new_err(message)
    } else if error.is_table() {
        TableError::new_err(message)
    } else if error.is_interrupted() {
        PyKeyboardInterrupt::new_err(())
    } else {
        HourarcError::new_err(message)
    }
}

/// A call whose arguments do not fit one another, in the core's own words.
pub fn unequal(what: &str, given: usize, expected: usize) -> PyErr {
    raise(Error::invalid(what, format!("{given} values"), format!("{expected} values")))
}
