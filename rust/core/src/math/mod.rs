//! Mathematics without an astronomical word in it.

pub mod bernstein;
pub mod chebyshev;
pub mod dispatch;
pub mod elementary;
mod elementary_coefficients;
pub mod roots;
pub mod sphere;
pub mod vector;
