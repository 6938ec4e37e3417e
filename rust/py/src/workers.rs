//! Long work: detached, on threads, and stopped by Ctrl-C.

use hourarc_core::error::Result;
use hourarc_core::grid::Workers;
use pyo3::prelude::*;

use crate::errors::raise;

/// Does the work, detached, on so many threads (0: all), asking in between whether a signal has come.
///
/// The core asks on the thread that called; handlers of signals run on Python's main thread only, so a call
/// from another thread is not interrupted. What a handler raises (KeyboardInterrupt as a rule) is raised.
pub fn run<T: Send>(
    py: Python<'_>,
    threads: usize,
    work: impl FnOnce(&mut Workers<'_>) -> Result<T> + Send,
) -> PyResult<T> {
    let mut raised = None;
    let result = py.detach(|| {
        let mut keep_going = || match Python::attach(|py| py.check_signals()) {
            Ok(()) => true,
            Err(signal) => {
                raised = Some(signal);
                false
            }
        };
        work(&mut Workers::new(threads, &mut keep_going))
    });
    match raised {
        Some(signal) => Err(signal),
        None => result.map_err(raise),
    }
}
