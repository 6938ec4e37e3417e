//! Catalogue places: rows of ICRS position, motion, parallax and radial velocity, ready for the chain.

use super::space_motion::position_and_motion;
use crate::constants::{RADIANS_PER_DEGREE, RADIANS_PER_MILLIARCSECOND};
use crate::error::{Error, Result, Status};
use crate::math::vector::Vector;

/// The columns of a catalogue as people keep them, all of one length. ICRS; epochs in Julian years.
#[derive(Debug, Clone, Copy)]
pub struct CatalogColumns<'a> {
    /// Right ascension, degrees.
    pub ra_deg: &'a [f64],
    /// Declination, degrees.
    pub dec_deg: &'a [f64],
    /// Epoch of the place, Julian year TCB (TDB differs by less than 30 s and 1 µas of anything).
    pub epoch_yr: &'a [f64],
    /// Proper motion in right ascension, with the factor cos δ, mas/yr.
    pub pm_ra_mas_yr: &'a [f64],
    /// Proper motion in declination, mas/yr.
    pub pm_dec_mas_yr: &'a [f64],
    /// Parallax, mas. Zero and negative values, which real catalogues hold, are taken as they are.
    pub parallax_mas: &'a [f64],
    /// Radial velocity, km/s, positive when receding.
    pub radial_velocity_km_s: &'a [f64],
}

/// One row, in the form that the chain takes.
#[derive(Debug, Clone, Copy)]
pub struct Star {
    /// Unit vector at the epoch, ICRS.
    pub position: Vector,
    /// Rate of that vector per Julian year, the radial part included.
    pub motion: Vector,
    /// Parallax, radians.
    pub parallax: f64,
    /// Epoch, Julian years after J2000.0.
    pub epoch_yr: f64,
}

/// Rows of a catalogue as columns, all of one length.
#[derive(Debug, Clone, Copy)]
pub struct StarColumns<'a> {
    /// Components of the unit vectors.
    pub position: [&'a [f64]; 3],
    /// Components of their rates per Julian year.
    pub motion: [&'a [f64]; 3],
    /// Parallax, radians.
    pub parallax: &'a [f64],
    /// Epoch, Julian years after J2000.0.
    pub epoch_yr: &'a [f64],
}

impl StarColumns<'_> {
    /// Number of rows.
    pub fn len(&self) -> usize {
        self.parallax.len()
    }

    /// Whether there are no rows.
    pub fn is_empty(&self) -> bool {
        self.parallax.is_empty()
    }

    /// The same columns, each visibly of `rows` rows, so that loops over them need no bounds checks.
    #[inline(always)]
    pub fn exactly(self, rows: usize) -> Self {
        StarColumns {
            position: self.position.map(|column| &column[..rows]),
            motion: self.motion.map(|column| &column[..rows]),
            parallax: &self.parallax[..rows],
            epoch_yr: &self.epoch_yr[..rows],
        }
    }

    /// One row.
    #[inline(always)]
    pub fn star(&self, row: usize) -> Star {
        Star {
            position: [self.position[0][row], self.position[1][row], self.position[2][row]],
            motion: [self.motion[0][row], self.motion[1][row], self.motion[2][row]],
            parallax: self.parallax[row],
            epoch_yr: self.epoch_yr[row],
        }
    }
}

/// A catalogue of stars. A row that is not good has NaN in its vectors, so it can touch no other.
#[derive(Debug, Clone)]
pub struct Catalog {
    position: [Vec<f64>; 3],
    motion: [Vec<f64>; 3],
    parallax: Vec<f64>,
    epoch_yr: Vec<f64>,
    status: Vec<Status>,
}

impl Catalog {
    /// Prepares the rows; cost some 50 ns a row.
    ///
    /// # Errors
    /// When the columns are not of one length. A row with a value outside its range is no error: its
    /// [`Catalog::status`] says what is wrong with it.
    pub fn new(columns: &CatalogColumns<'_>) -> Result<Self> {
        let rows = columns.ra_deg.len();
        for (name, column) in [
            ("dec_deg", columns.dec_deg),
            ("epoch_yr", columns.epoch_yr),
            ("pm_ra_mas_yr", columns.pm_ra_mas_yr),
            ("pm_dec_mas_yr", columns.pm_dec_mas_yr),
            ("parallax_mas", columns.parallax_mas),
            ("radial_velocity_km_s", columns.radial_velocity_km_s),
        ] {
            if column.len() != rows {
                let given = format!("{} values", column.len());
                return Err(Error::invalid(name, given, format!("{rows}, as many as ra_deg")));
            }
        }
        let column = || Vec::with_capacity(rows);
        let mut catalog = Catalog {
            position: [column(), column(), column()],
            motion: [column(), column(), column()],
            parallax: column(),
            epoch_yr: column(),
            status: Vec::with_capacity(rows),
        };
        for row in 0..rows {
            catalog.push(columns, row);
        }
        Ok(catalog)
    }

    fn push(&mut self, columns: &CatalogColumns<'_>, row: usize) {
        let status = row_status(columns, row);
        let (mut position, mut motion) = position_and_motion(
            columns.ra_deg[row] * RADIANS_PER_DEGREE,
            columns.dec_deg[row] * RADIANS_PER_DEGREE,
            columns.pm_ra_mas_yr[row] * RADIANS_PER_MILLIARCSECOND,
            columns.pm_dec_mas_yr[row] * RADIANS_PER_MILLIARCSECOND,
            columns.parallax_mas[row] * RADIANS_PER_MILLIARCSECOND,
            columns.radial_velocity_km_s[row],
        );
        if status.is_bad() {
            position = [f64::NAN; 3];
            motion = [f64::NAN; 3];
        }
        for axis in 0..3 {
            self.position[axis].push(position[axis]);
            self.motion[axis].push(motion[axis]);
        }
        self.parallax.push(columns.parallax_mas[row] * RADIANS_PER_MILLIARCSECOND);
        self.epoch_yr.push(columns.epoch_yr[row] - 2000.0);
        self.status.push(status);
    }

    /// Number of rows, good and bad.
    pub fn len(&self) -> usize {
        self.status.len()
    }

    /// Whether there are no rows.
    pub fn is_empty(&self) -> bool {
        self.status.is_empty()
    }

    /// What is to be said of each row.
    pub fn status(&self) -> &[Status] {
        &self.status
    }

    /// The prepared columns of some rows, for loops over them. Panics past the end, like a slice.
    pub fn columns(&self, rows: std::ops::Range<usize>) -> StarColumns<'_> {
        StarColumns {
            position: [0, 1, 2].map(|axis| &self.position[axis][rows.clone()]),
            motion: [0, 1, 2].map(|axis| &self.motion[axis][rows.clone()]),
            parallax: &self.parallax[rows.clone()],
            epoch_yr: &self.epoch_yr[rows],
        }
    }

    /// One row. Panics past the end, like a slice.
    #[inline(always)]
    pub fn star(&self, row: usize) -> Star {
        Star {
            position: [self.position[0][row], self.position[1][row], self.position[2][row]],
            motion: [self.motion[0][row], self.motion[1][row], self.motion[2][row]],
            parallax: self.parallax[row],
            epoch_yr: self.epoch_yr[row],
        }
    }
}

/// The ranges are declared here and nowhere else: value, allowed size, status.
fn row_status(columns: &CatalogColumns<'_>, row: usize) -> Status {
    const MAX_MOTION_MAS_YR: f64 = 100.0 * 1e3;
    const MAX_PARALLAX_MAS: f64 = 2.0 * 1e3;
    const MAX_RADIAL_VELOCITY_KM_S: f64 = 30_000.0;
    let checks = [
        (columns.ra_deg[row], -360.0, 360.0, Status::RightAscension),
        (columns.dec_deg[row], -90.0, 90.0, Status::Declination),
        (columns.epoch_yr[row], 1700.0, 2300.0, Status::Epoch),
        (columns.pm_ra_mas_yr[row], -MAX_MOTION_MAS_YR, MAX_MOTION_MAS_YR, Status::ProperMotion),
        (columns.pm_dec_mas_yr[row], -MAX_MOTION_MAS_YR, MAX_MOTION_MAS_YR, Status::ProperMotion),
        (columns.parallax_mas[row], -MAX_PARALLAX_MAS, MAX_PARALLAX_MAS, Status::Parallax),
        (
            columns.radial_velocity_km_s[row],
            -MAX_RADIAL_VELOCITY_KM_S,
            MAX_RADIAL_VELOCITY_KM_S,
            Status::RadialVelocity,
        ),
    ];
    if checks.iter().any(|check| !check.0.is_finite()) {
        return Status::NotFinite;
    }
    checks.iter().find(|check| check.0 < check.1 || check.0 > check.2).map_or(Status::Ok, |check| check.3)
}
