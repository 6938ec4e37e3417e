//! Random stars for the examples.

use hourarc_core::astrometry::{Catalog, CatalogColumns};
use hourarc_core::constants::RADIANS_PER_DEGREE;

struct Random(u64);

impl Random {
    fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// Random stars over the whole sky, the same for every example.
pub fn catalog(rows: usize) -> Catalog {
    let mut random = Random(5);
    let mut column =
        |low: f64, high: f64| -> Vec<f64> { (0..rows).map(|_| low + (high - low) * random.unit()).collect() };
    let sin_dec = column(-1.0, 1.0);
    Catalog::new(&CatalogColumns {
        ra_deg: &column(0.0, 360.0),
        dec_deg: &sin_dec.iter().map(|s| s.asin() / RADIANS_PER_DEGREE).collect::<Vec<_>>(),
        epoch_yr: &vec![2016.0; rows],
        pm_ra_mas_yr: &column(-50.0, 50.0),
        pm_dec_mas_yr: &column(-50.0, 50.0),
        parallax_mas: &column(0.0, 10.0),
        radial_velocity_km_s: &vec![0.0; rows],
    })
    .expect("columns of one length")
}
