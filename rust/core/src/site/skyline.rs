//! The altitude of what stands around a telescope, against azimuth.

use crate::constants::{RADIANS_PER_DEGREE, TURN};
use crate::error::{Error, Result};
use std::f64::consts::FRAC_PI_2;

/// Altitude of the local horizon against azimuth: straight lines between the points, closed through north.
///
/// Azimuths run from north through east, 0 to 2π, and must not decrease. Two points at one azimuth are a
/// **step**, such as the edge of a dome's shutter: the first ends the line before it and the second begins
/// the line after it. At the very azimuth the second holds. North may be given as 0, as 2π, or as both: then
/// the point at 2π ends the line from the west and the point at 0 begins the line to the east. More than two
/// points at one azimuth have no meaning and are refused. One single point is a level skyline.
#[derive(Debug, Clone, PartialEq)]
pub struct Skyline {
    /// Pieces in order of their starts; the first starts at or before 0 and the last ends at or after 2π, so
    /// that every azimuth in [0, 2π) is in one.
    pieces: Vec<Piece>,
    breakpoints: Vec<f64>,
}

#[derive(Debug, Clone, Copy, PartialEq)]
struct Piece {
    start: f64,
    altitude: f64,
    slope: f64,
}

impl Skyline {
    /// From azimuths (0 to 2π, in order) and altitudes (−π/2 to π/2), radians, of equal number, at least one.
    pub fn new(azimuths: &[f64], altitudes: &[f64]) -> Result<Self> {
        check(azimuths, altitudes)?;
        let mut points: Vec<(f64, f64)> = azimuths.iter().copied().zip(altitudes.iter().copied()).collect();
        // North from the west belongs to the end of the circle. What is given at 2π alone, or as the
        // second of a step there, holds at 0 too.
        let at_north = points.iter().filter(|(azimuth, _)| *azimuth == 0.0 || *azimuth >= TURN).count();
        if at_north > 2 {
            return Err(crowded(0.0, at_north));
        }
        let first = points[0];
        let last = points[points.len() - 1];
        if at_north == 1 && first.0 == 0.0 {
            points.push((TURN, first.1));
        } else if at_north == 1 {
            points.insert(0, (0.0, last.1));
        } else if at_north == 2 && first.0 != 0.0 {
            points.pop();
            points.insert(0, (0.0, last.1));
        } else if at_north == 2 && last.0 < TURN {
            points.remove(0);
            points.push((TURN, first.1));
        } else if at_north == 0 {
            // No point in the north: the line over it is carried half a turn to both sides.
            points.insert(0, (last.0 - TURN, last.1));
            points.push((first.0 + TURN, first.1));
        }
        let pieces = points
            .windows(2)
            .filter(|pair| pair[1].0 > pair[0].0)
            .map(|pair| Piece {
                start: pair[0].0,
                altitude: pair[0].1,
                slope: (pair[1].1 - pair[0].1) / (pair[1].0 - pair[0].0),
            })
            .collect();
        let mut breakpoints: Vec<f64> =
            azimuths.iter().map(|&azimuth| if azimuth >= TURN { 0.0 } else { azimuth }).collect();
        breakpoints.sort_by(f64::total_cmp);
        breakpoints.dedup();
        Ok(Self { pieces, breakpoints })
    }

    /// Altitude of the skyline, radians, at any finite azimuth; NaN for NaN.
    pub fn altitude(&self, azimuth: f64) -> f64 {
        let (piece, beyond) = self.piece(azimuth);
        piece.altitude + piece.slope * beyond
    }

    /// Derivative of the altitude with respect to azimuth (radians per radian), of the line that holds at
    /// the azimuth and after it.
    pub fn slope(&self, azimuth: f64) -> f64 {
        self.piece(azimuth).0.slope
    }

    /// The azimuths, radians in [0, 2π), ascending, where the lines meet: between two of them the skyline is
    /// one straight line.
    pub fn breakpoints(&self) -> &[f64] {
        &self.breakpoints
    }

    fn piece(&self, azimuth: f64) -> (Piece, f64) {
        // `rem_euclid` of a tiny negative angle rounds up to the whole turn.
        let reduced = azimuth.rem_euclid(TURN);
        let reduced = if reduced >= TURN { 0.0 } else { reduced };
        let after = self.pieces.partition_point(|piece| piece.start <= reduced);
        let piece = self.pieces[after.saturating_sub(1)];
        (piece, reduced - piece.start)
    }
}

fn check(azimuths: &[f64], altitudes: &[f64]) -> Result<()> {
    if azimuths.is_empty() || azimuths.len() != altitudes.len() {
        let given = format!("{} azimuths and {} altitudes", azimuths.len(), altitudes.len());
        return Err(Error::invalid("skyline", given, "as many altitudes as azimuths, at least one"));
    }
    for (i, (&azimuth, &altitude)) in azimuths.iter().zip(altitudes).enumerate() {
        let what = |quantity: &str| format!("{quantity} of skyline point {}", i + 1);
        let degrees = |angle: f64| format!("{} degrees", displayed_deg(angle));
        if !(0.0..=TURN * (1.0 + f64::EPSILON)).contains(&azimuth) {
            return Err(Error::invalid(
                what("azimuth"),
                degrees(azimuth),
                "0 to 360 degrees, from north through east",
            ));
        }
        if !(-FRAC_PI_2..=FRAC_PI_2).contains(&altitude) {
            return Err(Error::invalid(what("altitude"), degrees(altitude), "-90 to 90 degrees"));
        }
        if i > 0 && azimuth < azimuths[i - 1] {
            let allowed = format!("azimuths in order, so {} or more here", degrees(azimuths[i - 1]));
            return Err(Error::invalid(what("azimuth"), degrees(azimuth), allowed));
        }
        if i > 1 && azimuth == azimuths[i - 2] {
            let together = azimuths.iter().filter(|&&other| other == azimuth).count();
            return Err(crowded(azimuth, together));
        }
    }
    Ok(())
}

/// Degrees for a message, without the rounding of the way through radians: 35, not 35.00000000000001.
fn displayed_deg(angle: f64) -> f64 {
    (angle / RADIANS_PER_DEGREE * 1e9).round() / 1e9
}

fn crowded(azimuth: f64, together: usize) -> Error {
    let given = format!("{together} points at azimuth {} degrees", displayed_deg(azimuth));
    Error::invalid("skyline", given, "one point, or two for a step, at one azimuth (0 and 360 are one)")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn skyline_deg(points: &[(f64, f64)]) -> Result<Skyline> {
        let azimuths: Vec<f64> = points.iter().map(|p| p.0 * RADIANS_PER_DEGREE).collect();
        let altitudes: Vec<f64> = points.iter().map(|p| p.1 * RADIANS_PER_DEGREE).collect();
        Skyline::new(&azimuths, &altitudes)
    }

    fn altitude_deg(skyline: &Skyline, azimuth_deg: f64) -> f64 {
        skyline.altitude(azimuth_deg * RADIANS_PER_DEGREE) / RADIANS_PER_DEGREE
    }

    #[test]
    fn lines_between_points_and_over_north() {
        let skyline = skyline_deg(&[(10.0, 4.0), (100.0, 13.0), (350.0, 8.0)]).unwrap();
        for (azimuth_deg, expected) in [
            (10.0, 4.0),
            (55.0, 8.5),
            (100.0, 13.0),
            (225.0, 10.5),
            (350.0, 8.0),
            (0.0, 6.0),
            (355.0, 7.0),
            (365.0, 5.0),
            (-5.0, 7.0),
        ] {
            let found = altitude_deg(&skyline, azimuth_deg);
            assert!((found - expected).abs() < 1e-12, "{azimuth_deg}: {found}");
        }
        assert!((skyline.slope(0.0) + 0.2).abs() < 1e-13);
        assert!((skyline.slope(1.0) - 0.1).abs() < 1e-13);
        assert_eq!(skyline.breakpoints().len(), 3);
        assert!(skyline.altitude(f64::NAN).is_nan());
        // A hair west of north must not fall off the end of the circle.
        assert!((altitude_deg(&skyline, -1e-18) - 6.0).abs() < 1e-12);
    }

    #[test]
    fn a_step_holds_its_second_point() {
        let skyline =
            skyline_deg(&[(0.0, 5.0), (90.0, 5.0), (90.0, 20.0), (180.0, 20.0), (180.0, 5.0)]).unwrap();
        for (azimuth_deg, expected) in
            [(89.999999, 5.0), (90.0, 20.0), (179.999999, 20.0), (180.0, 5.0), (359.9, 5.0)]
        {
            assert!((altitude_deg(&skyline, azimuth_deg) - expected).abs() < 1e-12, "{azimuth_deg}");
        }
        assert_eq!(skyline.breakpoints().len(), 3);
    }

    #[test]
    fn north_may_be_given_as_0_as_360_and_as_a_step() {
        let middle = (180.0, 10.0);
        let level = |points: &[(f64, f64)]| skyline_deg(points).unwrap();
        let zero = level(&[(0.0, 2.0), middle]);
        let turn = level(&[middle, (360.0, 2.0)]);
        let both = level(&[(0.0, 2.0), middle, (360.0, 2.0)]);
        for azimuth_deg in [0.0, 1.0, 90.0, 270.0, 359.0] {
            let expected = altitude_deg(&zero, azimuth_deg);
            assert!((altitude_deg(&turn, azimuth_deg) - expected).abs() < 1e-12);
            assert!((altitude_deg(&both, azimuth_deg) - expected).abs() < 1e-12);
        }
        // From 10 in the south up to 8 from the west, and on from 2 to the east.
        let first_of_the_step = (360.0, 8.0);
        for step in [
            level(&[(0.0, 2.0), middle, first_of_the_step]),
            level(&[(0.0, 8.0), (0.0, 2.0), middle]),
            level(&[middle, first_of_the_step, (360.0, 2.0)]),
        ] {
            for (azimuth_deg, expected) in [(0.0, 2.0), (90.0, 6.0), (270.0, 9.0)] {
                assert!((altitude_deg(&step, azimuth_deg) - expected).abs() < 1e-12, "{azimuth_deg}");
            }
            assert_eq!(step.breakpoints(), [0.0, 180.0 * RADIANS_PER_DEGREE]);
        }
    }

    #[test]
    fn one_point_is_level() {
        for azimuth_deg in [0.0, 75.0, 360.0] {
            let skyline = skyline_deg(&[(azimuth_deg, 15.0)]).unwrap();
            for at_deg in [0.0, 74.0, 76.0, 359.0] {
                assert!((altitude_deg(&skyline, at_deg) - 15.0).abs() < 1e-12);
            }
            assert_eq!(skyline.slope(1.0), 0.0);
        }
    }

    #[test]
    fn wrong_skylines_are_refused_by_name() {
        let message = |points: &[(f64, f64)]| skyline_deg(points).unwrap_err().to_string();
        assert_eq!(
            message(&[]),
            "skyline: given 0 azimuths and 0 altitudes, allowed as many altitudes as azimuths, at least one"
        );
        assert!(Skyline::new(&[0.0], &[]).unwrap_err().to_string().contains("1 azimuths and 0 altitudes"));
        assert!(
            message(&[(0.0, 1.0), (90.0, 1.0), (45.0, 1.0)])
                .starts_with("azimuth of skyline point 3: given 45 degrees")
        );
        assert!(message(&[(-1.0, 1.0)]).contains("-1 degrees, allowed 0 to 360"));
        assert!(message(&[(361.0, 1.0)]).contains("361"));
        assert!(message(&[(10.0, 91.0)]).contains("altitude of skyline point 1: given 91 degrees"));
        assert!(message(&[(10.0, f64::NAN)]).contains("NaN"));
        assert!(message(&[(f64::NAN, 0.0)]).contains("NaN"));
        assert!(message(&[(9.0, 1.0), (9.0, 2.0), (9.0, 3.0)]).contains("3 points at azimuth 9"));
        assert!(message(&[(0.0, 1.0), (0.0, 2.0), (360.0, 3.0)]).contains("3 points at azimuth 0 degrees"));
    }
}
