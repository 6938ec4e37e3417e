//! Columns of numbers from and to numpy.

use hourarc_core::error::{Error, Status};
use numpy::{Element, IntoPyArray, PyArray1, PyArrayMethods, PyReadonlyArray1, PyReadwriteArray1};
use pyo3::prelude::*;

use crate::errors::{raise, unequal};

/// A column as it arrives.
pub type Floats<'py> = PyReadonlyArray1<'py, f64>;

/// The numbers of columns that must have one length.
pub fn equal<'a, const N: usize>(columns: [(&str, &'a Floats<'_>); N]) -> PyResult<[&'a [f64]; N]> {
    let mut slices = [&[][..]; N];
    for (slice, (name, column)) in slices.iter_mut().zip(columns) {
        *slice = column.as_slice()?;
        let expected = columns[0].1.as_slice()?.len();
        if slice.len() != expected {
            return Err(unequal(name, slice.len(), expected));
        }
    }
    Ok(slices)
}

/// An array of the caller's to be filled. It may be in use: another call may fill it at this moment.
pub fn writable<'py, T: Element>(
    array: &Bound<'py, PyAny>,
    name: &str,
) -> PyResult<PyReadwriteArray1<'py, T>> {
    let array = array.cast::<PyArray1<T>>()?;
    array.try_readwrite().map_err(|error| {
        raise(Error::invalid(
            name,
            format!("an array that cannot be filled ({error})"),
            "an array of its own",
        ))
    })
}

/// A column as it leaves: the vector's own memory.
pub fn column<T: Element>(py: Python<'_>, values: Vec<T>) -> Bound<'_, PyArray1<T>> {
    values.into_pyarray(py)
}

/// A column of status codes.
pub fn codes(status: &[Status]) -> Vec<u8> {
    status.iter().map(|&status| status as u8).collect()
}
