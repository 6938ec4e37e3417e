//! Mathematics without an astronomical word in it.

pub mod spline;
pub mod vector;
