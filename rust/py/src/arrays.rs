//! Columns of numbers from and to numpy.

use hourarc_core::error::Status;
use numpy::{Element, IntoPyArray, PyArray1, PyReadonlyArray1};
use pyo3::prelude::*;

use crate::errors::unequal;

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

/// A column as it leaves: the vector's own memory.
pub fn column<T: Element>(py: Python<'_>, values: Vec<T>) -> Bound<'_, PyArray1<T>> {
    values.into_pyarray(py)
}

/// A column of status codes.
pub fn codes(status: &[Status]) -> Vec<u8> {
    status.iter().map(|&status| status as u8).collect()
}
