//! The clock of the examples.

use std::time::Instant;

/// Seconds of the best of five runs.
pub fn best(mut run: impl FnMut()) -> f64 {
    (0..5)
        .map(|_| {
            let begun = Instant::now();
            run();
            begun.elapsed().as_secs_f64()
        })
        .fold(f64::INFINITY, f64::min)
}
