//! The quantities of a season and the caller's arrays for them.

use crate::constants::RADIANS_PER_DEGREE;
use crate::error::{Error, Result};
use crate::windows::intervals::IntervalSet;

/// What can be asked of a target's night.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum GridQuantity {
    /// Hours in which every limit holds.
    Hours,
    /// Number of windows.
    WindowCount,
    /// Beginning of the longest window, MJD UTC; NaN without a window.
    Start,
    /// End of the longest window, MJD UTC; NaN without a window.
    Stop,
    /// The least airmass within the windows; NaN without a window.
    BestAirmass,
    /// Upper culmination nearest to the middle of the night, MJD UTC, whether observable or not.
    Transit,
    /// The least distance from the Moon within the windows, degrees; NaN without a window.
    MoonSeparationMin,
}

impl GridQuantity {
    /// Every quantity.
    pub const ALL: [GridQuantity; 7] = [
        GridQuantity::Hours,
        GridQuantity::WindowCount,
        GridQuantity::Start,
        GridQuantity::Stop,
        GridQuantity::BestAirmass,
        GridQuantity::Transit,
        GridQuantity::MoonSeparationMin,
    ];

    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            GridQuantity::Hours => "hours",
            GridQuantity::WindowCount => "window_count",
            GridQuantity::Start => "start",
            GridQuantity::Stop => "stop",
            GridQuantity::BestAirmass => "best_airmass",
            GridQuantity::Transit => "transit",
            GridQuantity::MoonSeparationMin => "moon_separation_min",
        }
    }

    /// The quantity of a word.
    ///
    /// # Errors
    /// When there is none.
    pub fn from_word(word: &str) -> Result<Self> {
        Self::ALL
            .into_iter()
            .find(|quantity| quantity.word() == word)
            .ok_or_else(|| Error::invalid("quantity", word, Self::ALL.map(GridQuantity::word).join(", ")))
    }

    /// Whether it is an instant and needs doubles.
    pub fn is_instant(self) -> bool {
        matches!(self, GridQuantity::Start | GridQuantity::Stop | GridQuantity::Transit)
    }
}

/// Values of one quantity.
#[derive(Debug)]
pub enum GridValues<'a> {
    /// For quantities that are no instants.
    Single(&'a mut [f32]),
    /// For instants.
    Double(&'a mut [f64]),
}

impl<'a> GridValues<'a> {
    pub(super) fn len(&self) -> usize {
        match self {
            GridValues::Single(values) => values.len(),
            GridValues::Double(values) => values.len(),
        }
    }

    pub(super) fn split_at(self, at: usize) -> (GridValues<'a>, GridValues<'a>) {
        match self {
            GridValues::Single(values) => {
                let (first, rest) = values.split_at_mut(at);
                (GridValues::Single(first), GridValues::Single(rest))
            }
            GridValues::Double(values) => {
                let (first, rest) = values.split_at_mut(at);
                (GridValues::Double(first), GridValues::Double(rest))
            }
        }
    }

    pub(super) fn set(&mut self, index: usize, value: f64) {
        match self {
            GridValues::Single(values) => values[index] = value as f32,
            GridValues::Double(values) => values[index] = value,
        }
    }
}

/// The quantities wanted, each with nights × targets values, a night's targets together.
pub type GridColumns<'a> = Vec<(GridQuantity, GridValues<'a>)>;

/// Checks that the arrays fit.
pub(super) fn check(columns: &GridColumns<'_>, nights: usize, targets: usize) -> Result<()> {
    for (quantity, values) in columns {
        if values.len() != nights * targets {
            let allowed = format!("{nights} nights × {targets} targets = {}", nights * targets);
            return Err(Error::invalid(quantity.word(), format!("{} values", values.len()), allowed));
        }
        if quantity.is_instant() != matches!(values, GridValues::Double(_)) {
            let allowed = if quantity.is_instant() { "64-bit values" } else { "32-bit values" };
            return Err(Error::invalid(quantity.word(), "values of another width", allowed));
        }
    }
    Ok(())
}

/// Which quantities need work beyond the windows themselves.
#[derive(Debug, Clone, Copy)]
pub(super) struct Wanted {
    pub hours_only: bool,
    pub transit: bool,
    pub best_airmass: bool,
    pub moon_separation_min: bool,
}

impl Wanted {
    pub fn of(columns: &GridColumns<'_>) -> Self {
        let has = |wanted: GridQuantity| columns.iter().any(|(quantity, _)| *quantity == wanted);
        Wanted {
            hours_only: columns.iter().all(|(quantity, _)| *quantity == GridQuantity::Hours),
            transit: has(GridQuantity::Transit),
            best_airmass: has(GridQuantity::BestAirmass),
            moon_separation_min: has(GridQuantity::MoonSeparationMin),
        }
    }
}

/// What came of one target on one night.
#[derive(Debug, Clone, Copy)]
pub(super) struct NightSummary {
    pub hours: f64,
    pub window_count: usize,
    pub start: f64,
    pub stop: f64,
    pub best_airmass: f64,
    pub transit: f64,
    /// Radians; infinite until something is nearer.
    pub moon_separation_min: f64,
}

impl NightSummary {
    /// Of windows in seconds from the night's middle; `mjd` turns seconds into a date.
    pub fn of_windows(windows: &IntervalSet, mjd: impl Fn(f64) -> f64) -> Self {
        let mut summary = NightSummary {
            hours: windows.duration() / 3600.0,
            window_count: windows.len(),
            start: f64::NAN,
            stop: f64::NAN,
            best_airmass: f64::NAN,
            transit: f64::NAN,
            moon_separation_min: f64::INFINITY,
        };
        // Of equally long windows, the first.
        let mut longest = f64::NEG_INFINITY;
        for window in windows.iter() {
            if window.stop - window.start > longest {
                longest = window.stop - window.start;
                (summary.start, summary.stop) = (mjd(window.start), mjd(window.stop));
            }
        }
        summary
    }

    fn value(&self, quantity: GridQuantity) -> f64 {
        match quantity {
            GridQuantity::Hours => self.hours,
            GridQuantity::WindowCount => self.window_count as f64,
            GridQuantity::Start => self.start,
            GridQuantity::Stop => self.stop,
            GridQuantity::BestAirmass => self.best_airmass,
            GridQuantity::Transit => self.transit,
            GridQuantity::MoonSeparationMin if self.moon_separation_min.is_finite() => {
                self.moon_separation_min / RADIANS_PER_DEGREE
            }
            GridQuantity::MoonSeparationMin => f64::NAN,
        }
    }

    /// Into a night's row of each column.
    pub fn write(summary: Option<&Self>, columns: &mut GridColumns<'_>, index: usize) {
        for (quantity, values) in columns {
            values.set(index, summary.map_or(f64::NAN, |summary| summary.value(*quantity)));
        }
    }
}
