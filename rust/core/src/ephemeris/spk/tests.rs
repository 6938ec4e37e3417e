//! Against jplephem on a small excerpt of DE440, and on what damage does to it.

use super::*;
use crate::math::vector::norm;

static EXCERPT: &[u8] = include_bytes!("../../../../../tests/data/de440-excerpt.bsp");
static REFERENCE: &str = include_str!("../../../../../tests/reference/spk_excerpt.csv");

/// Where the excerpt's first and second summary records start, and a summary's fields in them.
const SUMMARIES: [usize; 2] = [1024, 3 * 1024];
const FIRST_SUMMARY: usize = 1024 + 24;
const SUMMARY_BYTES: usize = 40;

fn excerpt() -> Spk {
    Spk::new(EXCERPT, "excerpt").unwrap()
}

/// The excerpt as a machine of the other byte order would have written it.
fn big_endian() -> Vec<u8> {
    let mut bytes = EXCERPT.to_vec();
    let mut flip = |start: usize, width: usize| bytes[start..start + width].reverse();
    [8, 12, 76, 80, 84].into_iter().for_each(|at| flip(at, 4));
    for (record, summaries) in SUMMARIES.into_iter().zip([5, 5]) {
        (0..3).for_each(|word| flip(record + 8 * word, 8));
        for summary in 0..summaries {
            let at = record + 24 + SUMMARY_BYTES * summary;
            (0..2).for_each(|word| flip(at + 8 * word, 8));
            (0..6).for_each(|integer| flip(at + 16 + 4 * integer, 4));
        }
    }
    (5 * 1024..EXCERPT.len()).step_by(8).for_each(|at| flip(at, 8));
    bytes[88..96].copy_from_slice(b"BIG-IEEE");
    bytes
}

/// What `Spk::new` says of the excerpt with some bytes changed.
fn message(change: impl FnOnce(&mut Vec<u8>)) -> String {
    let mut bytes = EXCERPT.to_vec();
    change(&mut bytes);
    let error = Spk::new(bytes, "changed.bsp").unwrap_err();
    assert!(error.is_table());
    error.to_string()
}

fn put(bytes: &mut [u8], at: usize, new: &[u8]) {
    bytes[at..at + new.len()].copy_from_slice(new);
}

#[test]
fn agrees_with_jplephem() {
    let swapped = Spk::new(big_endian(), "swapped").unwrap();
    let mut rows = 0;
    for line in REFERENCE.lines().skip(2) {
        let cells: Vec<&str> = line.split(',').collect();
        let (target, centre) = (cells[0].parse().unwrap(), cells[1].parse().unwrap());
        let numbers: Vec<f64> = cells[2..].iter().map(|cell| cell.parse().unwrap()).collect();
        let (day, fraction) = (numbers[0], numbers[1]);
        let position: Vector = std::array::from_fn(|axis| numbers[2 + axis] * AU_PER_KM);
        let velocity: Vector = std::array::from_fn(|axis| numbers[5 + axis] * AU_PER_KM);
        let state = excerpt().relative_state_at(target, centre, day, fraction).unwrap();
        assert!(norm(sub(state.position, position)) < 1e-13 * norm(position), "{line}");
        assert!(norm(sub(state.velocity, velocity)) < 1e-13 * norm(velocity), "{line}");
        // The position alone, the way back, and the other byte order, to the bit.
        assert_eq!(excerpt().relative_position_at(target, centre, day, fraction), Ok(state.position));
        let back = excerpt().relative_position_at(centre, target, day, fraction).unwrap();
        assert!(norm(add(back, position)) < 1e-13 * norm(position), "{line}");
        assert_eq!(swapped.relative_state_at(target, centre, day, fraction), Ok(state));
        rows += 1;
    }
    assert!(rows > 300);
}

#[test]
fn any_split_of_the_instant_gives_the_same() {
    let one = excerpt().state_at(Body::Moon, 60_990.0, 0.375).unwrap();
    for (day, fraction) in [(60_990.375, 0.0), (60_989.0, 1.375), (0.0, 60_990.375), (61_000.0, -9.625)] {
        let other = excerpt().state_at(Body::Moon, day, fraction).unwrap();
        assert!(norm(sub(one.position, other.position)) < 1e-15);
    }
}

#[test]
fn bodies_fall_back_to_their_barycentres_and_missing_ones_are_named() {
    let kernel = excerpt();
    assert_eq!((kernel.code(Body::Venus), kernel.code(Body::Moon), kernel.code(Body::Mars)), (2, 301, 4));
    assert_eq!(kernel.require(Body::Moon, 60_976.0, 61_072.0), Ok(()));
    let missing = kernel.require(Body::Neptune, 60_976.0, 61_072.0).unwrap_err().to_string();
    assert!(
        missing.contains("holds no neptune (body 899); it has bodies 2, 3, 4, 5, 7, 10, 301, 399"),
        "{missing}"
    );
    assert_eq!(kernel.state_at(Body::Neptune, 60_990.0, 0.0), Err(Status::OutsideEphemeris));
    kernel.verify().unwrap();
}

#[test]
fn outside_and_in_a_gap_is_a_status() {
    let kernel = excerpt();
    assert!(kernel.state_at(Body::Moon, 60_976.0, 0.0).is_ok());
    assert!(kernel.state_at(Body::Moon, 61_072.0, 0.0).is_ok());
    for (day, fraction) in
        [(60_975.0, 1.0 - 1e-6), (61_072.0, 1e-6), (f64::NAN, 0.0), (60_990.0, f64::INFINITY)]
    {
        assert_eq!(kernel.state_at(Body::Moon, day, fraction), Err(Status::OutsideEphemeris));
        assert_eq!(kernel.position_at(Body::Moon, day, fraction), Err(Status::OutsideEphemeris));
    }
    assert!(kernel.position_at(Body::Uranus, 61_000.0, 0.0).is_ok());
    assert_eq!(kernel.position_at(Body::Uranus, 61_020.0, 0.0), Err(Status::OutsideEphemeris));
    assert_eq!(kernel.coverage_mjd(7), [(60_976.0, 61_008.0), (61_040.0, 61_072.0)]);
    let gap = kernel.require(Body::Uranus, 60_990.0, 61_050.0).unwrap_err().to_string();
    assert!(
        gap.contains("covered from 60976.0000 to 61008.0000, 61040.0000 to 61072.0000, with a gap"),
        "{gap}"
    );
}

#[test]
fn unknown_codes_and_unconnected_centres_are_a_status() {
    assert_eq!(excerpt().relative_state_at(2_000_001, 0, 60_990.0, 0.0), Err(Status::OutsideEphemeris));
    assert_eq!(excerpt().relative_state_at(301, 2_000_001, 60_990.0, 0.0), Err(Status::OutsideEphemeris));
    assert_eq!(excerpt().relative_position_at(301, 301, 60_990.0, 0.0), Ok([0.0; 3]));
}

#[test]
fn a_file_cut_short_is_told_so() {
    for (length, wanted) in [
        (0, "is not an SPK file"),
        (700, "truncated: 700 bytes"),
        (1024, "chain of summaries leads to record 2, the file has 1"),
        (2048, "chain of summaries leads to record 4, the file has 2"),
        (5 * 1024, "segment 1 (body 3 about 0): truncated: ends at byte"),
        (EXCERPT.len() - 8, "segment 10 (body 10 about 0): truncated"),
    ] {
        let message = message(|bytes| bytes.truncate(length));
        assert!(message.starts_with("changed.bsp: ") && message.contains(wanted), "{length}: {message}");
    }
}

#[test]
fn foreign_files_are_told_so() {
    for (at, new, wanted) in [
        (0, &b"GIF89a.."[..], "is not an SPK file"),
        (0, b"DAF/CK  ", "kind \"DAF/CK  \""),
        (0, b"DAFETF NAIF DAF", "transfer format"),
        (88, b"VAX-GFLT", "VAX-GFLT"),
        (88, b"BIG-IEEE", "wrong byte order: says it is big-endian, but its numbers are little-endian"),
        (8, &[3], "damaged file record"),
        (706, b"\n", "transfer in text mode"),
    ] {
        let message = message(|bytes| put(bytes, at, new));
        assert!(message.contains(wanted), "{message}");
    }
}

#[test]
fn damage_to_the_structure_is_told() {
    let first = FIRST_SUMMARY;
    let end_of_first = 8 * i32::from_le_bytes(EXCERPT[first + 36..first + 40].try_into().unwrap()) as usize;
    for (at, new, wanted) in [
        (1024, &1e9_f64.to_le_bytes()[..], "leads to record 1000000000"),
        (1024, &f64::NAN.to_le_bytes(), "leads to record NaN"),
        (1024, &2.0_f64.to_le_bytes(), "runs in a circle"),
        (1024 + 16, &26.0_f64.to_le_bytes(), "claims 26 summaries"),
        (first, &f64::NAN.to_le_bytes(), "covers NaN"),
        (first, &0.0_f64.to_le_bytes(), "gap: claims 0 to"),
        (first + 20, &3_i32.to_le_bytes(), "its own centre"),
        (first + 32, &0_i32.to_le_bytes(), "lies in words 0"),
        (end_of_first - 8, &7.0_f64.to_le_bytes(), "describes itself as 7 records"),
        (end_of_first - 24, &(-1.0_f64).to_le_bytes(), "-1 s from"),
        (5 * 1024, &0.0_f64.to_le_bytes(), "its record 1 says it spans 0 ±"),
    ] {
        let message = message(|bytes| put(bytes, at, new));
        assert!(message.contains(wanted), "{wanted}: {message}");
    }
}

#[test]
fn types_and_frames_not_read_are_passed_over_and_named() {
    for (field, new, wanted) in [(28, 21_i32, "type 21; 2 and 3 are read"), (24, 17, "frame 17; J2000 (1)")] {
        let mut bytes = EXCERPT.to_vec();
        put(&mut bytes, FIRST_SUMMARY + 4 * SUMMARY_BYTES + field, &new.to_le_bytes());
        let kernel = Spk::new(bytes, "changed.bsp").unwrap();
        let message = kernel.require(Body::Jupiter, 60_990.0, 60_991.0).unwrap_err().to_string();
        assert!(message.contains("jupiter (body 5) cannot be read") && message.contains(wanted), "{message}");
        assert_eq!(kernel.position_at(Body::Jupiter, 60_990.0, 0.0), Err(Status::OutsideEphemeris));
        assert!(kernel.position_at(Body::Moon, 60_990.0, 0.0).is_ok());
    }
}

/// Records in the middle of a segment are not read when the kernel is opened: damage there costs the
/// instants it touches, and `verify` finds it.
#[test]
fn a_damaged_record_costs_its_instants_only() {
    // The Moon's ninth record, days 32 to 36: its middle, or one of its coefficients.
    let moon = FIRST_SUMMARY + SUMMARY_BYTES;
    let start = 8 * (i32::from_le_bytes(EXCERPT[moon + 32..moon + 36].try_into().unwrap()) as usize - 1);
    let record = start + 8 * 41 * 8;
    for (at, new) in [(record, 0.0_f64), (record + 16, f64::NAN)] {
        let mut bytes = EXCERPT.to_vec();
        put(&mut bytes, at, &new.to_le_bytes());
        let kernel = Spk::new(bytes, "changed.bsp").unwrap();
        assert!(kernel.position_at(Body::Moon, 61_007.0, 0.5).is_ok());
        assert_eq!(kernel.position_at(Body::Moon, 61_009.0, 0.5), Err(Status::OutsideEphemeris));
        assert_eq!(kernel.state_at(Body::Moon, 61_009.0, 0.5), Err(Status::OutsideEphemeris));
        assert!(kernel.position_at(Body::Moon, 61_013.0, 0.5).is_ok());
        let message = kernel.verify().unwrap_err().to_string();
        assert!(message.contains("record 9 of 24 for body 301 about 3 is damaged"), "{message}");
    }
}

/// No single changed byte of the structure makes a panic or an endless loop.
#[test]
fn any_damaged_byte_is_survived() {
    for at in (0..EXCERPT.len()).filter(|at| *at < 4 * 1024 || at % 7 == 0) {
        for new in [0, 1, 0x7f, 0xff] {
            let mut bytes = EXCERPT.to_vec();
            bytes[at] = new;
            if let Ok(kernel) = Spk::new(bytes, "changed.bsp") {
                for body in Body::ALL {
                    if let Ok(state) = kernel.state_at(body, 61_000.0, 0.25) {
                        assert!(state.position.into_iter().chain(state.velocity).all(f64::is_finite));
                    }
                }
            }
        }
    }
}
