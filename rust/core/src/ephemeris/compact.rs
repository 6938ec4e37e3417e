//! The built-in ephemeris: DE440 from 1900 to 2100 in a few megabytes.
//!
//! # Form
//! Each body is a row of Chebyshev pieces of equal length. A piece's coefficients are integers in units
//! of the body's quantum, and an order takes no more bytes than its largest coefficient over the two
//! centuries needs: the constant term of the Earth six, the last few orders one. All bodies are
//! barycentric but the Moon, which is stored about the Earth, so that its direction does not suffer
//! from the sum. The Earth is stored itself rather than through the barycentre of Earth and Moon: that
//! would halve its 0.75 MB, but make every Earth (the one body every instant needs) cost a Moon too.
//!
//! Pieces are fitted by `hourarc-tables ephemeris` to positions and velocities together, with both held
//! exactly at the ends of the piece (the idea of Newhall 1989, *Celest. Mech.* 45, 305): neighbours
//! join to within the rounding of the coefficients.
//!
//! # Reference
//! Park, Folkner, Williams & Boggs 2021, *Astron. J.* 161, 105 (DE440).
//!
//! # Error
//! See [`Compact::error`] and the table at [`super`].

use std::sync::OnceLock;

use super::{Body, State, chebyshev};
use crate::constants::ASTRONOMICAL_UNIT_M;
use crate::error::{Error, Result, Status};
use crate::math::vector::{Vector, add, scale};
use crate::time::{Instant, Tdb};

/// The layout of the file, for its reader here and its writer in `hourarc-tables`. Little-endian.
///
/// Header: magic, first and last MJD as f64, SHA-256 of the source, 16 bytes of the source's name padded
/// with zeros. Then a description for each of [`Body::ALL`]: length of a piece in days, number of
/// coefficients, u32 each; first byte in the file as u64; quantum in m, largest error of position in m
/// and of velocity in m/s, f64 each; and the width in bytes of each order, [`ORDERS_MAX`] bytes. Then the
/// pieces, in each order by order from the constant term up, x, y and z of an order together, signed.
/// Last the FNV-1a hash (64 bits) of all before it.
///
/// [`ORDERS_MAX`]: layout::ORDERS_MAX
pub mod layout {
    /// First bytes of the file.
    pub const MAGIC: [u8; 8] = *b"HOUREPH1";
    /// Bytes kept for the name of the source.
    pub const NAME_BYTES: usize = 16;
    /// Bytes before the descriptions.
    pub const HEADER_BYTES: usize = 8 + 2 * 8 + 32 + NAME_BYTES;
    /// Most coefficients a series may have.
    pub const ORDERS_MAX: usize = 32;
    /// Bytes of a description.
    pub const SERIES_BYTES: usize = 2 * 4 + 8 + 3 * 8 + ORDERS_MAX;
    /// Bytes of the hash at the end.
    pub const HASH_BYTES: usize = 8;

    /// FNV-1a, 64 bits (Fowler, Noll & Vo; RFC 9923): against damage, not against malice.
    pub fn hash(bytes: &[u8]) -> u64 {
        bytes.iter().fold(0xcbf2_9ce4_8422_2325, |hash, &byte| {
            (hash ^ u64::from(byte)).wrapping_mul(0x0000_0100_0000_01b3)
        })
    }
}

use layout::{HASH_BYTES, HEADER_BYTES, NAME_BYTES, ORDERS_MAX, SERIES_BYTES};

static BYTES: &[u8] = include_bytes!("../../data/compact-ephemeris.bin");

/// Where an order of a series stands in a piece, and how to widen it.
#[derive(Debug, Clone, Copy, Default)]
struct Order {
    offset: u16,
    width: u8,
    /// Bits by which eight bytes read at the coefficient exceed it.
    surplus: u8,
}

#[derive(Debug, Clone, Copy)]
struct Series {
    piece_days: f64,
    pieces: usize,
    piece_bytes: usize,
    first_byte: usize,
    count: usize,
    /// au in a unit of the stored integers.
    quantum_au: f64,
    orders: [Order; ORDERS_MAX],
    error: FitError,
}

/// The largest differences from the source over the whole table, measured by its generator between the
/// points of the fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FitError {
    /// Length of the difference in position, m.
    pub position_m: f64,
    /// Length of the difference in velocity, m/s.
    pub velocity_m_s: f64,
}

/// A compact ephemeris over its bytes.
#[derive(Debug)]
pub struct Compact {
    bytes: &'static [u8],
    first_mjd: f64,
    last_mjd: f64,
    source: String,
    source_sha256: [u8; 32],
    series: [Series; Body::ALL.len()],
}

impl Compact {
    /// The ephemeris committed with this crate.
    pub fn builtin() -> &'static Compact {
        static BUILTIN: OnceLock<Compact> = OnceLock::new();
        BUILTIN.get_or_init(|| Compact::parse(BYTES).expect("the committed table, checked by the tests"))
    }

    /// Reads the structure of a table; its pieces stay where they are. A table that is damaged in its
    /// structure is an [`Error`]; damage among the coefficients is found by [`Compact::verify`].
    pub fn parse(bytes: &'static [u8]) -> Result<Compact> {
        let fault = |message: String| Error::table("compact ephemeris", 0, message);
        let pieces_at = HEADER_BYTES + Body::ALL.len() * SERIES_BYTES;
        if bytes.len() < pieces_at + HASH_BYTES {
            return Err(fault(format!("truncated: {} bytes, less than its header", bytes.len())));
        }
        if bytes[..8] != layout::MAGIC {
            return Err(fault("is not a compact ephemeris of this version".into()));
        }
        let number = |at: usize| f64::from_le_bytes(take(bytes, at));
        let (first_mjd, last_mjd) = (number(8), number(16));
        let span = last_mjd - first_mjd;
        if !(span > 0.0 && span < 1e7 && first_mjd.fract() == 0.0 && last_mjd.fract() == 0.0) {
            return Err(fault(format!("damaged: covers MJD {first_mjd} to {last_mjd}")));
        }
        let name = &bytes[HEADER_BYTES - NAME_BYTES..HEADER_BYTES];
        let source = String::from_utf8_lossy(name).trim_end_matches('\0').to_string();

        let mut next_byte = pieces_at;
        let mut series = Vec::with_capacity(Body::ALL.len());
        for (index, body) in Body::ALL.into_iter().enumerate() {
            let one = Series::parse(bytes, HEADER_BYTES + index * SERIES_BYTES, span, next_byte)
                .map_err(|message| fault(format!("{}: {message}", body.word())))?;
            next_byte += one.pieces * one.piece_bytes;
            series.push(one);
        }
        if next_byte + HASH_BYTES != bytes.len() {
            return Err(fault(format!(
                "truncated or damaged: {} bytes, {} described",
                bytes.len(),
                next_byte + HASH_BYTES
            )));
        }
        let series = series.try_into().expect("as many as there are bodies");
        Ok(Compact { bytes, first_mjd, last_mjd, source, source_sha256: take(bytes, 24), series })
    }

    /// Whether the bytes are those that were written, by the hash at their end. Reads all of them.
    pub fn verify(&self) -> Result<()> {
        let end = self.bytes.len() - HASH_BYTES;
        if layout::hash(&self.bytes[..end]) == u64::from_le_bytes(take(self.bytes, end)) {
            Ok(())
        } else {
            Err(Error::table("compact ephemeris", 0, "damaged: its bytes do not have the hash at their end"))
        }
    }

    /// First and last instant, MJD TDB, both included: 1899-07-13 and 2101-05-23, so that 1900 to 2100
    /// has some months of margin for light time and for arcs that start a day early.
    pub fn span_mjd(&self) -> (f64, f64) {
        (self.first_mjd, self.last_mjd)
    }

    /// First instant covered.
    pub fn first(&self) -> Instant<Tdb> {
        Instant::from_mjd(self.first_mjd, 0.0)
    }

    /// Last instant covered.
    pub fn last(&self) -> Instant<Tdb> {
        Instant::from_mjd(self.last_mjd, 0.0)
    }

    /// What this is, in words, with the hash of what it was made from.
    pub fn provenance(&self) -> String {
        let hash: String = self.source_sha256[..8].iter().map(|byte| format!("{byte:02x}")).collect();
        format!("{} (compact, from sha256 {hash}…)", self.source)
    }

    /// The largest difference from the source for a body: barycentric, and for the Moon geocentric (its
    /// barycentric one is that plus the Earth's).
    pub fn error(&self, body: Body) -> FitError {
        self.series[body as usize].error
    }

    /// [`Compact::state_at`] at a typed instant.
    #[inline]
    pub fn state(&self, body: Body, tdb: Instant<Tdb>) -> std::result::Result<State, Status> {
        let (day, fraction) = tdb.mjd_parts();
        self.state_at(body, day, fraction)
    }

    /// [`Compact::position_at`] at a typed instant.
    #[inline]
    pub fn position(&self, body: Body, tdb: Instant<Tdb>) -> std::result::Result<Vector, Status> {
        let (day, fraction) = tdb.mjd_parts();
        self.position_at(body, day, fraction)
    }

    /// Barycentric state, au and au/day, ICRS, at the TDB instant `day + fraction` (Modified Julian
    /// Date, any split). [`Status::OutsideEphemeris`] outside [`Compact::span_mjd`] and for NaN.
    #[inline]
    pub fn state_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<State, Status> {
        let state = self.stored_state(body, day, fraction)?;
        if body != Body::Moon {
            return Ok(state);
        }
        let earth = self.stored_state(Body::Earth, day, fraction)?;
        Ok(State {
            position: add(state.position, earth.position),
            velocity: add(state.velocity, earth.velocity),
        })
    }

    /// Barycentric position, au, as [`Compact::state_at`].
    #[inline]
    pub fn position_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<Vector, Status> {
        let position = self.stored_position(body, day, fraction)?;
        if body != Body::Moon {
            return Ok(position);
        }
        Ok(add(position, self.stored_position(Body::Earth, day, fraction)?))
    }

    /// State of the Moon about the Earth, au and au/day, ICRS, without the detour by the barycentre.
    #[inline]
    pub fn geocentric_moon_at(&self, day: f64, fraction: f64) -> std::result::Result<State, Status> {
        self.stored_state(Body::Moon, day, fraction)
    }

    #[inline]
    fn stored_state(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<State, Status> {
        let series = &self.series[body as usize];
        let (piece, x) = self.locate(series, day, fraction)?;
        let (value, slope) =
            chebyshev::value_and_slope(x, series.higher(piece), series.coefficient(piece, 0));
        Ok(State {
            position: scale(series.quantum_au, value),
            velocity: scale(series.quantum_au * 2.0 / series.piece_days, slope),
        })
    }

    #[inline]
    fn stored_position(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<Vector, Status> {
        let series = &self.series[body as usize];
        let (piece, x) = self.locate(series, day, fraction)?;
        Ok(scale(series.quantum_au, chebyshev::value(x, series.higher(piece), series.coefficient(piece, 0))))
    }

    /// The piece an instant falls in (its bytes and all after them) and where in it, −1 to 1.
    #[inline(always)]
    fn locate(&self, series: &Series, day: f64, fraction: f64) -> std::result::Result<(&[u8], f64), Status> {
        let days = (day - self.first_mjd) + fraction;
        // Written so that NaN fails it.
        if !(days >= 0.0 && (day - self.last_mjd) + fraction <= 0.0) {
            return Err(Status::OutsideEphemeris);
        }
        let index = ((days / series.piece_days) as usize).min(series.pieces - 1);
        let into = (day - self.first_mjd - index as f64 * series.piece_days) + fraction;
        let piece = &self.bytes[series.first_byte + index * series.piece_bytes..];
        Ok((piece, 2.0 * into / series.piece_days - 1.0))
    }
}

impl Series {
    fn parse(bytes: &[u8], at: usize, span: f64, next_byte: usize) -> std::result::Result<Series, String> {
        let integer = |at: usize| u32::from_le_bytes(take(bytes, at));
        let number = |at: usize| f64::from_le_bytes(take(bytes, at));
        let (piece_days, count) = (f64::from(integer(at)), integer(at + 4) as usize);
        let first_byte = u64::from_le_bytes(take(bytes, at + 8));
        let quantum_m = number(at + 16);
        let error = FitError { position_m: number(at + 24), velocity_m_s: number(at + 32) };
        if !(1..=ORDERS_MAX).contains(&count) || piece_days == 0.0 || span % piece_days != 0.0 {
            return Err(format!("damaged: pieces of {piece_days} days with {count} coefficients"));
        }
        if !(quantum_m > 0.0 && quantum_m.is_finite() && error.position_m > 0.0 && error.velocity_m_s > 0.0) {
            return Err(format!("damaged: a quantum of {quantum_m} m, errors {error:?}"));
        }
        let mut orders = [Order::default(); ORDERS_MAX];
        let mut offset = 0;
        for (order, &width) in orders[..count].iter_mut().zip(&bytes[at + 40..]) {
            if !(1..=8).contains(&width) {
                return Err(format!("damaged: a coefficient {width} bytes wide"));
            }
            *order = Order { offset, width, surplus: 64 - 8 * width };
            offset += 3 * u16::from(width);
        }
        if first_byte != next_byte as u64 {
            return Err(format!("damaged: starts at byte {first_byte} rather than {next_byte}"));
        }
        Ok(Series {
            piece_days,
            pieces: (span / piece_days) as usize,
            piece_bytes: usize::from(offset),
            first_byte: next_byte,
            count,
            quantum_au: quantum_m / ASTRONOMICAL_UNIT_M,
            orders,
            error,
        })
    }

    /// The coefficients above the constant term, the highest first.
    #[inline(always)]
    fn higher(&self, piece: &[u8]) -> impl Iterator<Item = Vector> {
        (1..self.count).rev().map(|order| self.coefficient(piece, order))
    }

    /// Reads eight bytes from where a coefficient starts and shifts out those of its neighbours; the
    /// hash at the end of the table keeps the last read inside it.
    #[inline(always)]
    fn coefficient(&self, piece: &[u8], order: usize) -> Vector {
        let Order { offset, width, surplus } = self.orders[order];
        let (start, width) = (usize::from(offset), usize::from(width));
        std::array::from_fn(|axis| {
            let eight = u64::from_le_bytes(take(piece, start + axis * width));
            ((eight << surplus) as i64 >> surplus) as f64
        })
    }
}

/// `N` bytes from `at` on, of a slice known to hold them.
#[inline(always)]
fn take<const N: usize>(bytes: &[u8], at: usize) -> [u8; N] {
    bytes[at..at + N].try_into().expect("a slice of the very length")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::constants::{RADIANS_PER_MILLIARCSECOND, SECONDS_PER_DAY};
    use crate::math::vector::{angle, norm, sub};

    static REFERENCE: &str = include_str!("../../../../tests/reference/ephemeris_de440.csv");

    /// The last column of the table in the documentation of `ephemeris`, in the order of the bodies; none
    /// for the Earth.
    const DIRECTION_MAS: [f64; Body::ALL.len()] =
        [0.0006, 0.018, 0.006, 0.004, 0.0, 0.003, 0.0012, 0.0006, 0.0003, 0.0002, 0.0002];

    /// All rows of the reference: body, day, fraction, state.
    fn reference() -> Vec<(Body, f64, f64, State)> {
        let rows = REFERENCE.lines().skip(2).map(|line| {
            let (body, rest) = line.split_once(',').unwrap();
            let n: Vec<f64> = rest.split(',').map(|cell| cell.parse().unwrap()).collect();
            let state = State { position: [n[2], n[3], n[4]], velocity: [n[5], n[6], n[7]] };
            (Body::from_word(body).unwrap(), n[0], n[1], state)
        });
        let rows: Vec<_> = rows.collect();
        assert!(rows.len() > 3000);
        rows
    }

    /// The committed bytes are those the generator wrote, and of the size agreed.
    #[test]
    fn the_table_is_whole() {
        let compact = Compact::builtin();
        compact.verify().unwrap();
        assert_eq!(layout::hash(&BYTES[..BYTES.len() - HASH_BYTES]), 0xfef2c238bb12859f);
        assert!(BYTES.len() < 8_000_000);
        assert_eq!(compact.span_mjd(), (14_848.0, 88_576.0));
        assert_eq!(compact.provenance(), "DE440 (compact, from sha256 a4ce9bf9b3282bec…)");
    }

    /// Against DE440 as jplephem reads it (tests/reference/make_ephemeris.py): within the stated errors.
    #[test]
    fn states_agree_with_de440() {
        let compact = Compact::builtin();
        for (body, day, fraction, wanted) in reference() {
            let found = compact.state_at(body, day, fraction).unwrap();
            let mut allowed = compact.error(body);
            if body == Body::Moon {
                allowed.position_m += compact.error(Body::Earth).position_m;
                allowed.velocity_m_s += compact.error(Body::Earth).velocity_m_s;
            }
            let position_m = norm(sub(found.position, wanted.position)) * ASTRONOMICAL_UNIT_M;
            let velocity_m_s =
                norm(sub(found.velocity, wanted.velocity)) * ASTRONOMICAL_UNIT_M / SECONDS_PER_DAY;
            assert!(position_m <= allowed.position_m, "{body:?} {day} {fraction}: {position_m} m");
            assert!(velocity_m_s <= allowed.velocity_m_s, "{body:?} {day} {fraction}: {velocity_m_s} m/s");
            assert_eq!(compact.position_at(body, day, fraction), Ok(found.position));
        }
    }

    /// The directions from the Earth's centre agree with DE440's within the figures of the module's table.
    #[test]
    fn geocentric_directions_agree_with_de440() {
        let compact = Compact::builtin();
        let rows = reference();
        let count = rows.len() / Body::ALL.len();
        let earths = &rows[count * Body::Earth as usize..][..count];
        let mut worst = [0.0_f64; Body::ALL.len()];
        for (index, (body, day, fraction, wanted)) in rows.iter().enumerate() {
            if *body == Body::Earth {
                continue;
            }
            let (_, earth_day, earth_fraction, earth) = earths[index % count];
            assert_eq!((earth_day, earth_fraction), (*day, *fraction));
            let seen = sub(
                compact.position_at(*body, *day, *fraction).unwrap(),
                compact.position_at(Body::Earth, *day, *fraction).unwrap(),
            );
            let mas = angle(seen, sub(wanted.position, earth.position)) / RADIANS_PER_MILLIARCSECOND;
            worst[*body as usize] = worst[*body as usize].max(mas);
        }
        for (body, worst) in Body::ALL.into_iter().zip(worst) {
            let allowed = DIRECTION_MAS[body as usize];
            assert!(worst <= allowed, "{body:?}: {worst} mas, stated {allowed}");
        }
    }

    #[test]
    fn the_moon_about_the_earth_is_the_difference() {
        let compact = Compact::builtin();
        let (day, fraction) = (60_000.0, 0.3);
        let moon = compact.state_at(Body::Moon, day, fraction).unwrap();
        let earth = compact.state_at(Body::Earth, day, fraction).unwrap();
        let about = compact.geocentric_moon_at(day, fraction).unwrap();
        assert!(norm(sub(sub(moon.position, earth.position), about.position)) < 3e-16);
        assert!(norm(sub(sub(moon.velocity, earth.velocity), about.velocity)) < 1e-17);
    }

    /// Neighbouring pieces join: the step in position is below what is stated as the error, at every join.
    #[test]
    fn pieces_join() {
        let compact = Compact::builtin();
        let short = 1e-7;
        for body in Body::ALL {
            let series = &compact.series[body as usize];
            let mut worst = 0.0_f64;
            for piece in 1..series.pieces {
                let day = compact.first_mjd + piece as f64 * series.piece_days;
                let before = compact.stored_state(body, day - 1.0, 1.0 - short).unwrap();
                let after = compact.stored_state(body, day, 0.0).unwrap();
                let reached = add(before.position, scale(short, before.velocity));
                worst = worst.max(norm(sub(reached, after.position)) * ASTRONOMICAL_UNIT_M);
            }
            let allowed = 2.0 * compact.error(body).position_m;
            assert!(worst <= allowed, "{body:?}: a step of {worst} m, stated {allowed}");
        }
    }

    #[test]
    fn outside_is_a_status() {
        let compact = Compact::builtin();
        assert!(compact.state_at(Body::Sun, 14_848.0, 0.0).is_ok());
        assert!(compact.state_at(Body::Sun, 88_575.0, 1.0).is_ok());
        for (day, fraction) in [
            (14_847.0, 1.0 - 1e-9),
            (88_576.0, 1e-9),
            (f64::NAN, 0.0),
            (60_000.0, f64::NAN),
            (f64::INFINITY, 0.0),
        ] {
            assert_eq!(compact.state_at(Body::Moon, day, fraction), Err(Status::OutsideEphemeris));
            assert_eq!(compact.position_at(Body::Moon, day, fraction), Err(Status::OutsideEphemeris));
        }
    }

    #[test]
    fn damage_is_told() {
        let message = |change: &dyn Fn(&mut Vec<u8>)| {
            let mut bytes = BYTES.to_vec();
            change(&mut bytes);
            let error = Compact::parse(bytes.leak()).and_then(|compact| compact.verify()).unwrap_err();
            assert!(error.is_table());
            error.to_string()
        };
        let sun = HEADER_BYTES;
        for (at, new, wanted) in [
            (0, &b"x"[..], "of this version"),
            (8, &f64::NAN.to_le_bytes(), "covers MJD NaN"),
            (sun, &0_u32.to_le_bytes(), "sun: damaged: pieces of 0 days"),
            (sun + 4, &33_u32.to_le_bytes(), "with 33 coefficients"),
            (sun + 8, &1_u64.to_le_bytes(), "starts at byte 1 rather"),
            (sun + 16, &(-1.0_f64).to_le_bytes(), "a quantum of -1 m"),
            (sun + 40, &[9], "9 bytes wide"),
            (sun + 40, &[1], "moon: damaged: starts at"),
            (1_000_000, &[BYTES[1_000_000] ^ 1], "the hash at their end"),
        ] {
            let message = message(&|bytes| bytes[at..at + new.len()].copy_from_slice(new));
            assert!(message.contains(wanted), "{wanted}: {message}");
        }
        assert!(message(&|bytes| bytes.truncate(100)).contains("truncated: 100 bytes"));
        assert!(message(&|bytes| bytes.truncate(1_000_000)).contains("truncated or damaged: 1000000 bytes"));
    }
}
