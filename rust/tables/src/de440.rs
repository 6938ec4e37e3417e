//! Makes the compact ephemeris (`rust/core/data/compact-ephemeris.bin`) from DE440.
//!
//! Only additions, multiplications, divisions and comparisons of f64 are used, in a fixed order, so the
//! bytes that come out are the same on every machine.

use std::path::{Path, PathBuf};

use hourarc_core::constants::{ASTRONOMICAL_UNIT_M, SECONDS_PER_DAY};
use hourarc_core::ephemeris::compact::layout;
use hourarc_core::ephemeris::{Body, Compact, Spk, State};
use hourarc_core::math::vector::{Vector, norm, scale, sub};
use sha2::{Digest, Sha256};

/// `de440.bsp` as NAIF publishes it.
const SOURCE_SHA256: &str = "a4ce9bf9b3282becc9f4b2ac3cebe03a2ae7599981aabd7265fd8482fff7c4b5";
const SOURCE_NAME: &[u8] = b"DE440";

/// 1899-07-13 and 2101-05-23: multiples of the longest piece around 1900 to 2100.
const FIRST_MJD: u32 = 14_848;
const LAST_MJD: u32 = 88_576;

/// How a body is cut into pieces. The quantum is some fifth of the error of the fit or less.
struct Plan {
    body: Body,
    target: i32,
    centre: i32,
    piece_days: u32,
    degree: usize,
    quantum_m: f64,
}

const fn plan(body: Body, codes: (i32, i32), piece_days: u32, degree: usize, quantum_m: f64) -> Plan {
    Plan { body, target: codes.0, centre: codes.1, piece_days, degree, quantum_m }
}

/// In the order of [`Body::ALL`].
const PLANS: [Plan; Body::ALL.len()] = [
    plan(Body::Sun, (10, 0), 32, 10, 0.01),
    plan(Body::Moon, (301, 399), 8, 14, 0.0025),
    plan(Body::Mercury, (199, 0), 16, 14, 0.25),
    plan(Body::Venus, (299, 0), 32, 10, 0.1),
    plan(Body::Earth, (399, 0), 16, 16, 0.0025),
    plan(Body::Mars, (4, 0), 32, 8, 0.1),
    plan(Body::Jupiter, (5, 0), 128, 7, 1.0),
    plan(Body::Saturn, (6, 0), 128, 6, 1.0),
    plan(Body::Uranus, (7, 0), 256, 6, 1.0),
    plan(Body::Neptune, (8, 0), 256, 6, 1.0),
    plan(Body::Pluto, (9, 0), 256, 6, 1.0),
];

/// Points a piece between those of the fit at which the result is compared with its source.
const CHECKS: usize = 151;

/// Writes the table, or with `check` compares it with the committed one.
pub fn run(check: bool, source: &Path) -> Result<(), String> {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../core/data/compact-ephemeris.bin");
    let name = source.display().to_string();
    let bytes = std::fs::read(source).map_err(|error| format!("{name}: {error}"))?;
    let sha256 = Sha256::digest(&bytes);
    let found: String = sha256.iter().map(|byte| format!("{byte:02x}")).collect();
    if found != SOURCE_SHA256 {
        return Err(format!("{name}: has sha256 {found}, the source has {SOURCE_SHA256}"));
    }
    let kernel = Spk::new(bytes, &name).map_err(|error| error.to_string())?;
    let table = make(&kernel, &sha256)?;
    if !check {
        return std::fs::write(&path, &table).map_err(|error| format!("{}: {error}", path.display()));
    }
    let committed = std::fs::read(&path).map_err(|error| format!("{}: {error}", path.display()))?;
    match committed.iter().zip(&table).position(|(a, b)| a != b) {
        Some(at) => Err(format!("{}: differs from byte {at} on", path.display())),
        None if committed.len() != table.len() => {
            Err(format!("{}: {} bytes, should be {}", path.display(), committed.len(), table.len()))
        }
        None => Ok(()),
    }
}

/// One body's pieces, rounded.
struct Fitted {
    /// Piece, order, axis.
    pieces: Vec<Vec<[i64; 3]>>,
    widths: Vec<u8>,
}

fn make(kernel: &Spk, sha256: &[u8]) -> Result<Vec<u8>, String> {
    let mut fitted = Vec::new();
    for (plan, body) in PLANS.iter().zip(Body::ALL) {
        assert!(plan.body == body, "the plans stand in the order of the bodies");
        fitted.push(fit(kernel, plan)?);
    }
    // The errors are measured on the table itself, then written into it.
    let unmeasured = assemble(&fitted, sha256, &[(1.0, 1.0); Body::ALL.len()]);
    let compact = Compact::parse(unmeasured.leak()).map_err(|error| error.to_string())?;
    let mut errors = [(0.0, 0.0); Body::ALL.len()];
    println!(
        "body       days degree  quantum/m     bytes  error/m  error/(m/s)  nearest/au  error/mas  join/m"
    );
    for (plan, error) in PLANS.iter().zip(&mut errors) {
        let measured = measure(kernel, &compact, plan)?;
        *error = (rounded_up(measured.position_m), rounded_up(measured.velocity_m_s));
        let fitted = &fitted[plan.body as usize];
        println!(
            "{:10} {:4} {:6} {:10} {:9} {:8.3} {:12.3e} {:11.5} {:10.5} {:7.3}",
            plan.body.word(),
            plan.piece_days,
            plan.degree,
            plan.quantum_m,
            fitted.pieces.len() * 3 * fitted.widths.iter().map(|&w| usize::from(w)).sum::<usize>(),
            measured.position_m,
            measured.velocity_m_s,
            measured.nearest_au,
            measured.direction_mas,
            measured.join_m,
        );
    }
    let table = assemble(&fitted, sha256, &errors);
    println!("{} bytes, hash {:016x}", table.len(), layout::hash(&table[..table.len() - layout::HASH_BYTES]));
    Ok(table)
}

fn assemble(fitted: &[Fitted], sha256: &[u8], errors: &[(f64, f64)]) -> Vec<u8> {
    let mut out = Vec::new();
    out.extend(layout::MAGIC);
    out.extend(f64::from(FIRST_MJD).to_le_bytes());
    out.extend(f64::from(LAST_MJD).to_le_bytes());
    out.extend(sha256);
    out.extend(SOURCE_NAME);
    out.resize(layout::HEADER_BYTES, 0);
    let mut first_byte = layout::HEADER_BYTES + PLANS.len() * layout::SERIES_BYTES;
    for ((plan, body), &(position_m, velocity_m_s)) in PLANS.iter().zip(fitted).zip(errors) {
        let end = out.len() + layout::SERIES_BYTES;
        out.extend(plan.piece_days.to_le_bytes());
        out.extend((plan.degree as u32 + 1).to_le_bytes());
        out.extend((first_byte as u64).to_le_bytes());
        for number in [plan.quantum_m, position_m, velocity_m_s] {
            out.extend(number.to_le_bytes());
        }
        out.extend(&body.widths);
        out.resize(end, 0);
        first_byte += body.pieces.len() * 3 * body.widths.iter().map(|&w| usize::from(w)).sum::<usize>();
    }
    for body in fitted {
        for piece in &body.pieces {
            for (order, &width) in piece.iter().zip(&body.widths) {
                for coefficient in order {
                    out.extend(&coefficient.to_le_bytes()[..usize::from(width)]);
                }
            }
        }
    }
    let hash = layout::hash(&out);
    out.extend(hash.to_le_bytes());
    out
}

/// Position in m and velocity in m/day.
fn metres(kernel: &Spk, plan: &Plan, day: u32, into_days: f64) -> Result<State, String> {
    let state = kernel
        .relative_state_at(plan.target, plan.centre, f64::from(day), into_days)
        .map_err(|status| format!("{}: {} at MJD {day}", plan.body.word(), status.word()))?;
    Ok(State {
        position: scale(ASTRONOMICAL_UNIT_M, state.position),
        velocity: scale(ASTRONOMICAL_UNIT_M, state.velocity),
    })
}

fn fit(kernel: &Spk, plan: &Plan) -> Result<Fitted, String> {
    let fitter = Fitter::new(plan.degree);
    let half_days = f64::from(plan.piece_days) / 2.0;
    let mut pieces = Vec::new();
    let mut largest = vec![0_i64; plan.degree + 1];
    for day in (FIRST_MJD..LAST_MJD).step_by(plan.piece_days as usize) {
        let mut samples = Vec::with_capacity(fitter.points.len());
        for x in &fitter.points {
            let mut state = metres(kernel, plan, day, (x + 1.0) * half_days)?;
            state.velocity = scale(half_days, state.velocity);
            samples.push(state);
        }
        let piece: Vec<[i64; 3]> = fitter
            .coefficients(&samples)
            .into_iter()
            .map(|coefficient| coefficient.map(|metres| (metres / plan.quantum_m).round() as i64))
            .collect();
        for (largest, order) in largest.iter_mut().zip(&piece) {
            *largest = order.iter().fold(*largest, |most, value| most.max(value.abs()));
        }
        pieces.push(piece);
    }
    let widths = largest.into_iter().map(|value| (1..8).find(|w| value < 1 << (8 * w - 1)).unwrap_or(8));
    Ok(Fitted { pieces, widths: widths.collect() })
}

/// The least-squares fit of a Chebyshev series to position and velocity at points of −1 to 1, both held
/// exactly at the ends, as a matrix from samples to coefficients.
struct Fitter {
    points: Vec<f64>,
    /// A row a coefficient: weights of the positions, then of the velocities.
    rows: Vec<Vec<f64>>,
}

impl Fitter {
    fn new(degree: usize) -> Fitter {
        let (terms, count) = (degree + 1, 3 * degree);
        let points: Vec<f64> = (0..count).map(|index| crowded(index as f64 / (count - 1) as f64)).collect();
        // A velocity weighs as the position it would make over 1/degree of half the piece.
        let weight = 1.0 / (degree * degree) as f64;
        let basis: Vec<(Vec<f64>, Vec<f64>)> = points.iter().map(|&x| polynomials(x, terms)).collect();
        let ends = [0, count - 1];
        // Normal equations bordered with the four conditions: the unknowns are the coefficients and the
        // multipliers of the conditions, the right-hand sides one for each sample.
        let size = terms + 4;
        let mut left = vec![vec![0.0; size]; size];
        let mut right = vec![vec![0.0; 2 * count]; size];
        for row in 0..terms {
            for column in 0..terms {
                left[row][column] =
                    basis.iter().map(|(t, d)| t[row] * t[column] + weight * d[row] * d[column]).sum();
            }
            for (index, (t, d)) in basis.iter().enumerate() {
                right[row][index] = t[row];
                right[row][count + index] = weight * d[row];
            }
            for (which, &end) in ends.iter().enumerate() {
                for (condition, value) in [(which, basis[end].0[row]), (2 + which, basis[end].1[row])] {
                    left[row][terms + condition] = value;
                    left[terms + condition][row] = value;
                }
            }
        }
        for (which, &end) in ends.iter().enumerate() {
            right[terms + which][end] = 1.0;
            right[terms + 2 + which][count + end] = 1.0;
        }
        solve(&mut left, &mut right);
        right.truncate(terms);
        Fitter { points, rows: right }
    }

    /// Fits, then fits what is left over: the first pass errs by the condition of the matrix, the second
    /// by the rounding of the samples.
    fn coefficients(&self, samples: &[State]) -> Vec<Vector> {
        let mut found = vec![[0.0; 3]; self.rows.len()];
        for _ in 0..2 {
            let left: Vec<State> = samples
                .iter()
                .zip(&self.points)
                .map(|(sample, &x)| {
                    let (values, slopes) = polynomials(x, found.len());
                    let sum = |basis: &[f64]| -> Vector {
                        std::array::from_fn(|axis| {
                            basis.iter().zip(&found).rev().map(|(t, c)| t * c[axis]).sum()
                        })
                    };
                    State {
                        position: sub(sample.position, sum(&values)),
                        velocity: sub(sample.velocity, sum(&slopes)),
                    }
                })
                .collect();
            for (coefficient, row) in found.iter_mut().zip(&self.rows) {
                for axis in 0..3 {
                    let positions = left.iter().map(|state| state.position[axis]);
                    let velocities = left.iter().map(|state| state.velocity[axis]);
                    coefficient[axis] +=
                        row.iter().zip(positions.chain(velocities)).map(|(w, v)| w * v).sum::<f64>();
                }
            }
        }
        found
    }
}

/// From 0 to 1 to −1 to 1, crowding towards both ends as the zeros of Chebyshev polynomials do, which
/// keeps the fit near the smallest largest error. A cubic rather than a cosine, whose last bit may
/// differ from one machine to the next.
fn crowded(fraction: f64) -> f64 {
    let u = 2.0 * fraction - 1.0;
    (3.0 * u - u * u * u) / 2.0
}

/// Tₖ(x) and T′ₖ(x) for k below `terms`, by their recurrences.
fn polynomials(x: f64, terms: usize) -> (Vec<f64>, Vec<f64>) {
    let (mut values, mut slopes) = (vec![1.0, x], vec![0.0, 1.0]);
    for order in 2..terms {
        slopes.push(2.0 * values[order - 1] + 2.0 * x * slopes[order - 1] - slopes[order - 2]);
        values.push(2.0 * x * values[order - 1] - values[order - 2]);
    }
    values.truncate(terms);
    slopes.truncate(terms);
    (values, slopes)
}

/// Solves `left · X = right` in place of `right`, by elimination with partial pivoting.
fn solve(left: &mut [Vec<f64>], right: &mut [Vec<f64>]) {
    let size = left.len();
    for step in 0..size {
        let pivot = (step..size)
            .fold(step, |best, row| if left[row][step].abs() > left[best][step].abs() { row } else { best });
        left.swap(step, pivot);
        right.swap(step, pivot);
        for row in 0..size {
            if row != step {
                let factor = left[row][step] / left[step][step];
                for column in step..size {
                    left[row][column] -= factor * left[step][column];
                }
                for column in 0..right[row].len() {
                    right[row][column] -= factor * right[step][column];
                }
            }
        }
    }
    for (row, diagonal) in right.iter_mut().zip(left.iter().enumerate().map(|(i, row)| row[i])) {
        row.iter_mut().for_each(|value| *value /= diagonal);
    }
}

/// The largest differences between the table and its source.
#[derive(Default)]
struct Measured {
    position_m: f64,
    velocity_m_s: f64,
    /// Least distance from the Earth's centre, and largest error of position over distance.
    nearest_au: f64,
    direction_mas: f64,
    /// Largest step in position from the end of a piece to the start of the next.
    join_m: f64,
}

/// The next number with two significant digits: what is stated is not exceeded between the points of
/// [`measure`] either.
fn rounded_up(value: f64) -> f64 {
    let mut digits = 0;
    let mut power = 1.0;
    while value * power < 10.0 {
        power *= 10.0;
        digits += 1;
    }
    assert!(digits > 0, "errors are below 10 m and 10 m/s");
    (value * power).ceil() / power
}

fn measure(kernel: &Spk, compact: &Compact, plan: &Plan) -> Result<Measured, String> {
    const MAS_PER_RADIAN: f64 = 648_000e3 / std::f64::consts::PI;
    let mut most = Measured { nearest_au: f64::INFINITY, ..Measured::default() };
    let ours = |day: u32, into: f64| {
        let state = match plan.body {
            Body::Moon => compact.geocentric_moon_at(f64::from(day), into),
            body => compact.state_at(body, f64::from(day), into),
        };
        state.map_err(|status| format!("{}: {} at MJD {day}", plan.body.word(), status.word()))
    };
    // Seen from the Earth, or for the Earth itself from the Sun.
    let observer = if plan.body == Body::Earth { 10 } else { 399 };
    for day in (FIRST_MJD..LAST_MJD).step_by(plan.piece_days as usize) {
        for check in 0..CHECKS {
            let into =
                f64::from(plan.piece_days) / 2.0 * (1.0 + crowded((check as f64 + 0.5) / CHECKS as f64));
            let (found, wanted) = (ours(day, into)?, metres(kernel, plan, day, into)?);
            let position_m = norm(sub(scale(ASTRONOMICAL_UNIT_M, found.position), wanted.position));
            let velocity = norm(sub(scale(ASTRONOMICAL_UNIT_M, found.velocity), wanted.velocity));
            let away = kernel.relative_position_at(plan.target, observer, f64::from(day), into);
            let away_au = norm(away.map_err(|status| status.word().to_string())?);
            most.position_m = most.position_m.max(position_m);
            most.velocity_m_s = most.velocity_m_s.max(velocity / SECONDS_PER_DAY);
            most.nearest_au = most.nearest_au.min(away_au);
            most.direction_mas =
                most.direction_mas.max(position_m / (away_au * ASTRONOMICAL_UNIT_M) * MAS_PER_RADIAN);
        }
        let length = f64::from(plan.piece_days);
        if day + plan.piece_days < LAST_MJD {
            // Short of the join by 1e-9 of the piece, and moved up to it along the velocity.
            let short = length * 1e-9;
            let (before, after) = (ours(day, length - short)?, ours(day, length)?);
            let reached = |axis: usize| before.position[axis] + short * before.velocity[axis];
            let step = sub(std::array::from_fn(reached), after.position);
            most.join_m = most.join_m.max(norm(step) * ASTRONOMICAL_UNIT_M);
        }
    }
    Ok(most)
}
