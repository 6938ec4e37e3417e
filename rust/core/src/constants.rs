//! Constants, each with its unit, its source, and whether it is exact by definition or measured.

use std::f64::consts::PI;

/// Degrees to radians. Exact.
pub const RADIANS_PER_DEGREE: f64 = PI / 180.0;
/// Hours of angle to radians. Exact.
pub const RADIANS_PER_HOUR: f64 = PI / 12.0;
/// Arcseconds to radians. Exact.
pub const RADIANS_PER_ARCSECOND: f64 = PI / 648_000.0;
/// Milliarcseconds to radians. Exact.
pub const RADIANS_PER_MILLIARCSECOND: f64 = RADIANS_PER_ARCSECOND * 1e-3;
/// Microarcseconds to radians. Exact.
pub const RADIANS_PER_MICROARCSECOND: f64 = RADIANS_PER_ARCSECOND * 1e-6;
/// A full turn, radians. Exact.
pub const TURN: f64 = 2.0 * PI;

/// Seconds in a day of a uniform scale. Exact.
pub const SECONDS_PER_DAY: f64 = 86_400.0;
/// Days in a Julian century. Exact (IAU 1976).
pub const DAYS_PER_JULIAN_CENTURY: f64 = 36_525.0;
/// Days in a Julian year. Exact (IAU 1976).
pub const DAYS_PER_JULIAN_YEAR: f64 = 365.25;
/// Julian Date at which the Modified Julian Date is 0. Exact.
pub const MJD_ZERO_JD: f64 = 2_400_000.5;
/// J2000.0 as a Modified Julian Date (JD 2451545.0). Exact.
pub const J2000_MJD: f64 = 51_544.5;
/// 1970-01-01, the zero of `datetime64`, as a Modified Julian Date. Exact.
pub const UNIX_EPOCH_MJD: f64 = 40_587.0;
/// TT − TAI, seconds. Exact (IAU 1991 resolution A4).
pub const TT_MINUS_TAI_S: f64 = 32.184;

/// Speed of light, m/s. Exact (SI).
pub const SPEED_OF_LIGHT_M_S: f64 = 299_792_458.0;
/// Astronomical unit, m. Exact (IAU 2012 resolution B2).
pub const ASTRONOMICAL_UNIT_M: f64 = 149_597_870_700.0;
/// Light time for one astronomical unit, s. Exact, from the two above.
pub const LIGHT_TIME_AU_S: f64 = ASTRONOMICAL_UNIT_M / SPEED_OF_LIGHT_M_S;
/// One au/day in units of the speed of light. Exact, from the above.
pub const AU_PER_DAY_OVER_C: f64 = LIGHT_TIME_AU_S / SECONDS_PER_DAY;
/// Schwarzschild radius of the Sun, au: 2 GM☉/(c² au), with GM☉ = 1.32712440041e20 m³/s²
/// (TDB-compatible, measured; IERS Conventions (2010) table 1.1).
pub const SUN_SCHWARZSCHILD_RADIUS_AU: f64 =
    2.0 * 1.327_124_400_41e20 / (SPEED_OF_LIGHT_M_S * SPEED_OF_LIGHT_M_S * ASTRONOMICAL_UNIT_M);

/// Earth rotation angle at J2000.0 UT1, turns (IERS Conventions (2010) equation 5.15). Exact.
pub const EARTH_ROTATION_AT_J2000_TURNS: f64 = 0.779_057_273_264_0;
/// Earth rotation rate beyond one turn a UT1 day, turns a day (same equation). Exact.
pub const EARTH_ROTATION_EXCESS_TURNS_PER_DAY: f64 = 0.002_737_811_911_354_48;
/// Earth rotation rate, radians per UT1 second, from the two above. Exact.
pub const EARTH_ROTATION_RAD_PER_S: f64 =
    TURN * (1.0 + EARTH_ROTATION_EXCESS_TURNS_PER_DAY) / SECONDS_PER_DAY;

/// Equatorial radius of the WGS 84 ellipsoid, m (NIMA TR8350.2). Exact.
pub const WGS84_EQUATORIAL_RADIUS_M: f64 = 6_378_137.0;
/// Flattening of the WGS 84 ellipsoid (NIMA TR8350.2). Exact.
pub const WGS84_FLATTENING: f64 = 1.0 / 298.257_223_563;
