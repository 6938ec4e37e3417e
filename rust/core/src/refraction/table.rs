//! A cubic spline whose cells grow with the distance from a point, and whose cell is read off the bits of
//! that distance.
//!
//! Bending against altitude is steep at the horizon and flat at the zenith, as 1/x a few degrees above x = 0.
//! A uniform table fine enough for the horizon takes thousands of cells and leaves the processor's nearest
//! cache. Here each octave of x, from 1/16 to 2 rad, has 64 equal cells: with x as a floating-point number
//! the octave is its exponent and the cell is the head of its mantissa, so that finding the cell takes a
//! shift and a subtraction, exactly and without a logarithm.

/// Bits of the mantissa that number the cells of an octave.
const CELL_BITS: u32 = 6;
const CELLS_PER_OCTAVE: usize = 1 << CELL_BITS;
const OCTAVES: usize = 5;
const CELLS: usize = OCTAVES * CELLS_PER_OCTAVE;
/// Knots of a table, both ends included.
pub(super) const KNOTS: usize = CELLS + 1;

/// The variable at the first knot: 2⁻⁴.
const FIRST: f64 = 0.0625;
/// The largest double below the last knot, 2.
const LAST: f64 = 2.0 - f64::EPSILON;

const MANTISSA_BITS: u32 = 52;
const REST_BITS: u32 = MANTISSA_BITS - CELL_BITS;
const REST_MASK: u64 = (1 << REST_BITS) - 1;
const ONE_BITS: u64 = 1.0_f64.to_bits();
const FIRST_CELL: u64 = FIRST.to_bits() >> REST_BITS;

/// A twice continuously differentiable function of an argument from 0 to 1.9375, constant below 0.
#[derive(Debug, Clone)]
pub(super) struct OctaveCubic {
    /// Coefficients of the powers of the fraction of the cell.
    cells: Box<[[f64; 4]; CELLS]>,
}

/// Derivatives at the two ends of a spline.
pub(super) struct Slopes {
    pub first: f64,
    pub last: f64,
}

/// The argument at a knot, 0 at the first.
pub(super) fn knot(i: usize) -> f64 {
    let within = (i % CELLS_PER_OCTAVE) as f64 / CELLS_PER_OCTAVE as f64;
    FIRST * ((1_u64 << (i / CELLS_PER_OCTAVE)) as f64 * (1.0 + within) - 1.0)
}

/// The number of the cell (beyond the last for a NaN), the fraction of the cell, and the variable's bits.
#[inline(always)]
fn locate(argument: f64) -> (usize, f64, u64) {
    let x = (argument + FIRST).clamp(FIRST, LAST);
    let bits = x.to_bits();
    let cell = (bits >> REST_BITS).wrapping_sub(FIRST_CELL) as usize;
    let fraction = f64::from_bits(ONE_BITS | (bits & REST_MASK) << CELL_BITS) - 1.0;
    (cell, fraction, bits)
}

#[inline(always)]
fn cubic(c: &[f64; 4], t: f64) -> f64 {
    ((c[3] * t + c[2]) * t + c[1]) * t + c[0]
}

impl OctaveCubic {
    /// Zero everywhere.
    pub fn zero() -> Self {
        Self { cells: Box::new([[0.0; 4]; CELLS]) }
    }

    /// The cubic spline through values at all knots with given end slopes.
    pub fn spline(values: &[f64; KNOTS], ends: Slopes) -> Self {
        let width = |i: usize| knot(i + 1) - knot(i);
        let chord = |i: usize| (values[i + 1] - values[i]) / width(i);
        // Slopes at the knots from the continuity of the second derivative: a tridiagonal system, swept
        // down and up (any text on splines).
        let mut slopes = [0.0; KNOTS];
        let mut factors = [0.0; KNOTS];
        slopes[0] = ends.first;
        slopes[KNOTS - 1] = ends.last;
        for i in 1..KNOTS - 1 {
            let (before, after) = (1.0 / width(i - 1), 1.0 / width(i));
            let right = 3.0 * (before * chord(i - 1) + after * chord(i));
            let pivot = 2.0 * (before + after) - before * factors[i - 1];
            factors[i] = after / pivot;
            slopes[i] = (right - before * slopes[i - 1]) / pivot;
        }
        for i in (1..KNOTS - 1).rev() {
            slopes[i] -= factors[i] * slopes[i + 1];
        }
        let mut cells = Box::new([[0.0; 4]; CELLS]);
        for (i, cell) in cells.iter_mut().enumerate() {
            let rise = values[i + 1] - values[i];
            let (first, last) = (slopes[i] * width(i), slopes[i + 1] * width(i));
            *cell = [values[i], first, 3.0 * rise - 2.0 * first - last, first + last - 2.0 * rise];
        }
        Self { cells }
    }

    /// The cell's coefficients, the fraction of the cell, and the variable's bits.
    #[inline(always)]
    fn locate(&self, argument: f64) -> (&[f64; 4], f64, u64) {
        let (cell, fraction, bits) = locate(argument);
        // A NaN lands in the last cell: the callers add the argument itself.
        (&self.cells[cell.min(CELLS - 1)], fraction, bits)
    }

    /// The function.
    #[inline(always)]
    pub fn value(&self, argument: f64) -> f64 {
        let (c, t, _) = self.locate(argument);
        cubic(c, t)
    }

    /// Adds to each variable the function of what it exceeds `zero` by: the same bits as [`OctaveCubic::value`].
    ///
    /// In two loops: the cells are found on whole registers, their coefficients fetched one by one.
    #[inline(always)]
    pub fn add_values(&self, zero: f64, variables: &mut [f64]) {
        const AT_ONCE: usize = 64;
        let (mut cells, mut fractions) = ([0_u32; AT_ONCE], [0.0; AT_ONCE]);
        for part in variables.chunks_mut(AT_ONCE) {
            for ((&variable, cell), fraction) in part.iter().zip(&mut cells).zip(&mut fractions) {
                let (number, within, _) = locate(variable - zero);
                (*cell, *fraction) = (number as u32, within);
            }
            for ((variable, &cell), &fraction) in part.iter_mut().zip(&cells).zip(&fractions) {
                *variable += cubic(&self.cells[(cell as usize).min(CELLS - 1)], fraction);
            }
        }
    }

    /// The function and its derivative, which is 0 below an argument of 0.
    #[inline(always)]
    pub fn value_and_slope(&self, argument: f64) -> (f64, f64) {
        let (c, t, bits) = self.locate(argument);
        let value = ((c[3] * t + c[2]) * t + c[1]) * t + c[0];
        let per_cell = (3.0 * c[3] * t + 2.0 * c[2]) * t + c[1];
        // One over the width of the cell: the octave's exponent with its sign turned.
        let exponent = bits >> MANTISSA_BITS;
        let octave_inverse = f64::from_bits(2046_u64.wrapping_sub(exponent) << MANTISSA_BITS);
        let slope = per_cell * (CELLS_PER_OCTAVE as f64 * octave_inverse);
        (value, if argument < 0.0 { 0.0 } else { slope })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cubic_is_its_own_spline() {
        let f = |x: f64| ((0.5 * x - 1.5) * x + 0.25) * x + 2.0;
        let slope = |x: f64| (1.5 * x - 3.0) * x + 0.25;
        let values = std::array::from_fn(|i| f(knot(i)));
        let spline = OctaveCubic::spline(&values, Slopes { first: slope(0.0), last: slope(knot(KNOTS - 1)) });
        for i in 0..10_000 {
            let x = i as f64 * 1.9375e-4;
            let (value, found_slope) = spline.value_and_slope(x);
            assert!((value - f(x)).abs() < 2e-15 && value == spline.value(x), "{x}");
            assert!((found_slope - slope(x)).abs() < 5e-13, "{x} {}", found_slope - slope(x));
        }
        assert_eq!(spline.value_and_slope(-0.3), (2.0, 0.0));
    }

    /// An independent way to the cell: the logarithm.
    #[test]
    fn knots_stand_where_the_bits_say() {
        let mut values = [0.0; KNOTS];
        for spike in [0, 1, 63, 64, 65, 200, 319, 320] {
            values.fill(0.0);
            values[spike] = 1.0;
            let spline = OctaveCubic::spline(&values, Slopes { first: 0.0, last: 0.0 });
            let octave = (spike / 64).min(4);
            let x = 2.0_f64.powi(octave as i32 - 4) * (1.0 + (spike - 64 * octave) as f64 / 64.0);
            assert!((spline.value(x - 0.0625) - 1.0).abs() < 1e-13, "{spike}");
        }
    }

    #[test]
    fn nan_and_far_arguments_do_not_fault() {
        let spline = OctaveCubic::zero();
        for x in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 1e300, -1e300] {
            assert_eq!(spline.value(x), 0.0);
        }
    }

    #[test]
    fn many_at_once_are_the_same_bits() {
        let values = std::array::from_fn(|i| (3.0 * knot(i)).sin());
        let spline = OctaveCubic::spline(&values, Slopes { first: 3.0, last: -1.0 });
        let edges = [f64::NAN, -f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 0.25, -0.0, 1.9375, 1e300];
        let mut many: Vec<f64> = (0..1000).map(|i| 0.0025 * f64::from(i) - 0.2).chain(edges).collect();
        let expected: Vec<f64> = many.iter().map(|x| x + spline.value(x - 0.25)).collect();
        spline.add_values(0.25, &mut many);
        for (found, expected) in many.iter().zip(&expected) {
            assert!(found.to_bits() == expected.to_bits() || (found.is_nan() && expected.is_nan()));
        }
    }
}
