//! Long work: detached, on threads, and stopped by Ctrl-C.

use std::cell::RefCell;

use hourarc_core::error::Result;
use hourarc_core::grid;
use hourarc_core::math::dispatch::Isa;
use pyo3::prelude::*;

use crate::errors::raise;

/// How to work: on so many threads (0: all), with an instruction set by its word.
#[derive(FromPyObject)]
pub struct Workers(usize, String);

/// Does the work, detached, asking in between whether a signal has come.
///
/// The core asks on the thread that called; handlers of signals run on Python's main thread only, so a call
/// from another thread is not interrupted. What a handler raises (KeyboardInterrupt as a rule) is raised.
pub fn run<T: Send>(
    py: Python<'_>,
    workers: &Workers,
    work: impl FnOnce(&mut grid::Workers<'_>) -> Result<T> + Send,
) -> PyResult<T> {
    run_telling(py, workers, None, |workers, _| work(workers))
}

/// The same, with a function of Python's that hears how much is done. What it raises, ends the work.
pub fn run_telling<T: Send>(
    py: Python<'_>,
    Workers(threads, isa): &Workers,
    listener: Option<&Bound<'_, PyAny>>,
    work: impl FnOnce(&mut grid::Workers<'_>, &mut dyn FnMut(usize)) -> Result<T> + Send,
) -> PyResult<T> {
    let isa = Isa::from_word(isa).map_err(raise)?;
    let listener = listener.map(|listener| listener.as_unbound());
    py.detach(|| {
        // What Python raises is kept, and nothing more is asked of it.
        let raised: RefCell<Option<PyErr>> = RefCell::new(None);
        let ask = |question: &dyn Fn(Python<'_>) -> PyResult<()>| {
            if raised.borrow().is_none() {
                raised.replace(Python::attach(question).err());
            }
            raised.borrow().is_none()
        };
        let mut keep_going = || ask(&|py| py.check_signals());
        let mut tell = |done| {
            if let Some(listener) = listener {
                ask(&|py| listener.call1(py, (done,)).map(drop));
            }
        };
        let result = work(&mut grid::Workers::new(*threads, &mut keep_going).with_isa(isa), &mut tell);
        raised.take().map_or_else(|| result.map_err(raise), Err)
    })
}
