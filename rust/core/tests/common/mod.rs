//! What the integration tests share.

/// A linear congruential generator (Knuth's MMIX constants): the same cases from the same seed on every machine.
pub struct Random(pub u64);

impl Random {
    /// Uniform from 0 to 1.
    pub fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Uniform from `low` to `high`.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }
}
