//! Many targets at once: the only part of the crate that uses threads.
//!
//! Work is cut into blocks of targets, in the same way for every number of threads, and each block is
//! worked through by one thread in the order of its rows: the results are the same bits whoever did
//! which block. The caller owns the outputs and is asked, some twenty times a second, whether to go on.

mod advance;
mod event_table;
mod parallel;
mod place;
mod season;
mod window_table;
mod watch;

pub use advance::advance;
pub use event_table::{EventTable, event_table};
pub use parallel::{KEEP_GOING, Workers};
pub use place::{PLACE_AIRMASS, PlaceColumn, PlaceColumns, Shape, place};
pub use season::{GridColumns, GridQuantity, GridReport, GridValues, visibility_grid};
pub use watch::{Watch, WatchColumns, WatchedWindows};
pub use window_table::{WindowTable, window_table};
