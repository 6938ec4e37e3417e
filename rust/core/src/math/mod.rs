//! Mathematics without an astronomical word in it.

pub mod vector;
