//! Kernels as files, mapped into memory and never read as a whole.
//!
//! The one place of this crate with `unsafe`. A map is undefined behaviour if the file is changed while it stands, and
//! a file that is cut short then ends the process at the next access. The map is read only, a kernel is a file that
//! nobody writes once it is there, and a file of three gigabytes must not be copied: that is the whole argument.
#![allow(unsafe_code)]

use std::fs::File;
use std::path::Path;

use hourarc_core::ephemeris::{Body, Spk};
use memmap2::Mmap;
use pyo3::exceptions::PyOSError;
use pyo3::prelude::*;

use crate::errors::raise;

/// The kernel of a file, which must hold the bodies and with them the Earth and the Sun.
pub fn kernel_with(path: &Path, bodies: &[Body]) -> PyResult<Spk> {
    let failed = |error: std::io::Error| {
        PyOSError::new_err((error.raw_os_error(), error.to_string(), path.to_path_buf()))
    };
    let file = File::open(path).map_err(failed)?;
    // SAFETY: see the module's text.
    let map = unsafe { Mmap::map(&file) }.map_err(failed)?;
    let kernel = Spk::new(map, &path.display().to_string()).map_err(raise)?;
    for &body in [Body::Earth, Body::Sun].iter().chain(bodies) {
        // A body that the kernel has not at all is refused with the reason; one that it has not always is a status.
        if kernel.coverage_mjd(kernel.code(body)).is_empty() {
            kernel.require(body, f64::NEG_INFINITY, f64::INFINITY).map_err(raise)?;
        }
    }
    Ok(kernel)
}
