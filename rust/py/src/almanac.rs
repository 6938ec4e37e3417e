//! The nights of a site.

use hourarc_core::ephemeris::Ephemeris;
use hourarc_core::events::{self, AlmanacRow};
use hourarc_core::time::Utc;
use pyo3::prelude::*;
use pyo3::types::PyDict;

use crate::arrays::column;
use crate::errors::raise;
use crate::orientation::Orientation;
use crate::site::Site;

/// One row a night from that of the evening of `first_mjd` on, as columns by name.
#[pyfunction]
pub fn almanac<'py>(
    py: Python<'py>,
    site: &Site,
    orientation: &Orientation,
    first_mjd: i64,
    nights: usize,
) -> PyResult<Bound<'py, PyDict>> {
    let ephemeris = Ephemeris::default();
    let observer = site.observer(orientation, &ephemeris);
    let rows = py.detach(|| events::almanac(observer, first_mjd, nights)).map_err(raise)?;
    let times =
        |of: &dyn Fn(&AlmanacRow) -> Utc| column(py, rows.iter().map(|row| of(row).nanoseconds()).collect());
    let numbers = |of: &dyn Fn(&AlmanacRow) -> f64| column(py, rows.iter().map(of).collect());
    let columns = PyDict::new(py);
    columns.set_item("start", times(&|row| row.start))?;
    columns.set_item("stop", times(&|row| row.stop))?;
    let of_the_sun = [
        ("sunset", "sunrise"),
        ("dusk_civil", "dawn_civil"),
        ("dusk_nautical", "dawn_nautical"),
        ("dusk_astronomical", "dawn_astronomical"),
    ];
    for (index, (evening, morning)) in of_the_sun.into_iter().enumerate() {
        columns.set_item(evening, times(&|row| row.sun_down[index]))?;
        columns.set_item(morning, times(&|row| row.sun_up[index]))?;
    }
    columns.set_item("moonrise", times(&|row| row.moonrise))?;
    columns.set_item("moonset", times(&|row| row.moonset))?;
    columns.set_item("moon_age_d", numbers(&|row| row.moon_age_d))?;
    columns.set_item("moon_illuminated_fraction", numbers(&|row| row.moon_illuminated_fraction))?;
    columns.set_item("dark_hours", numbers(&|row| row.dark_hours))?;
    columns.set_item("dark_hours_moonless", numbers(&|row| row.dark_hours_moonless))?;
    columns.set_item("status", column(py, rows.iter().map(|row| row.status as u8).collect::<Vec<u8>>()))?;
    Ok(columns)
}
