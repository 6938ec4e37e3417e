//! Two-part instants, typed by their scale.

use std::marker::PhantomData;

use crate::constants::{DAYS_PER_JULIAN_CENTURY, J2000_MJD, SECONDS_PER_DAY, TT_MINUS_TAI_S};

mod sealed {
    pub trait Sealed: Copy {}
}

/// A continuous time scale that an [`Instant`] can be counted in.
pub trait Scale: sealed::Sealed + std::fmt::Debug + PartialEq + PartialOrd + Send + Sync + 'static {
    /// The name of the scale.
    const NAME: &'static str;
}

macro_rules! scale {
    ($(#[$doc:meta])* $name:ident, $word:literal) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
        pub struct $name;
        impl sealed::Sealed for $name {}
        impl Scale for $name {
            const NAME: &'static str = $word;
        }
    };
}

scale!(
    /// International Atomic Time.
    Tai, "TAI");
scale!(
    /// Terrestrial Time, TAI + 32.184 s.
    Tt, "TT");
scale!(
    /// Barycentric Dynamical Time, the argument of the ephemerides (IAU 2006 resolution B3).
    Tdb, "TDB");
scale!(
    /// Universal Time UT1: the rotation of the Earth.
    Ut1, "UT1");

/// An instant in scale `S`: a whole Modified Julian Date and the fraction of that day, in [0, 1).
///
/// Resolution: 1.1e-16 day, 10 picoseconds, over all dates. Instants of one scale compare in time
/// order.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Instant<S: Scale> {
    day: f64,
    fraction: f64,
    scale: PhantomData<S>,
}

/// The largest whole number not above `x`: [`f64::floor`], which is a call on processors that are not
/// asked for more than the least, where this is three additions.
#[inline(always)]
fn floor(x: f64) -> f64 {
    /// 1.5 · 2⁵²: beside it there is no room for a fraction.
    const SHIFT: f64 = 6_755_399_441_055_744.0;
    if x.abs() < 1e15 {
        let nearest = (x + SHIFT) - SHIFT;
        if nearest > x { nearest - 1.0 } else { nearest }
    } else {
        x.floor()
    }
}

impl<S: Scale> Instant<S> {
    /// The instant at MJD `day + fraction`, both in days, of any size and sign and split in any way.
    ///
    /// The parts are added without loss: the result is within 1.1e-16 day of their exact sum
    /// (`any_split_gives_the_same_instant`). NaN or an infinity in either gives an instant of NaN.
    #[inline]
    pub fn from_mjd(day: f64, fraction: f64) -> Self {
        let (day_floor, fraction_floor) = (floor(day), floor(fraction));
        // Both remainders are exact; only their sum rounds, and it is below 2.
        let rest = (day - day_floor) + (fraction - fraction_floor);
        let mut whole = day_floor + fraction_floor;
        let mut part = rest;
        if part >= 1.0 {
            part -= 1.0;
            whole += 1.0;
        }
        if !part.is_finite() || !whole.is_finite() {
            (whole, part) = (f64::NAN, f64::NAN);
        }
        Instant { day: whole, fraction: part, scale: PhantomData }
    }

    /// The whole MJD and the fraction of that day in [0, 1).
    pub fn mjd_parts(self) -> (f64, f64) {
        (self.day, self.fraction)
    }

    /// The MJD in one number, days. Near the present it resolves 0.6 µs: enough for display and for
    /// slow quantities, not for Earth rotation.
    pub fn mjd(self) -> f64 {
        self.day + self.fraction
    }

    /// The instant `seconds` later; negative for earlier. Error: 2.2e-16 day
    /// (`seconds_added_come_back`).
    pub fn plus_seconds(self, seconds: f64) -> Self {
        if seconds.abs() < SECONDS_PER_DAY {
            // What comes out below, without the remainder's division.
            return Instant::from_mjd(self.day, self.fraction + seconds / SECONDS_PER_DAY);
        }
        // The remainder is exact, so whole days lose nothing however many they are.
        let rest = seconds % SECONDS_PER_DAY;
        let days = ((seconds - rest) / SECONDS_PER_DAY).round();
        Instant::from_mjd(self.day + days, self.fraction + rest / SECONDS_PER_DAY)
    }

    /// The instant `days` of 86,400 s later; negative for earlier.
    pub fn plus_days(self, days: f64) -> Self {
        let whole = days.floor();
        Instant::from_mjd(self.day + whole, self.fraction + (days - whole))
    }

    /// Seconds from `other` to this instant, exact to the rounding of the difference.
    pub fn seconds_since(self, other: Self) -> f64 {
        SECONDS_PER_DAY * self.days_since(other)
    }

    /// Days from `other` to this instant, exact to the rounding of the difference.
    pub fn days_since(self, other: Self) -> f64 {
        (self.day - other.day) + (self.fraction - other.fraction)
    }

    /// Julian centuries of 36,525 days since J2000.0 (MJD 51544.5) in this scale.
    pub fn julian_centuries(self) -> f64 {
        ((self.day - J2000_MJD) + self.fraction) / DAYS_PER_JULIAN_CENTURY
    }

    /// Whether this is an instant at all (not made from NaN or an infinity).
    pub fn is_finite(self) -> bool {
        self.day.is_finite()
    }

    /// The same reading under the name of another scale; for use by the conversions only.
    pub(super) fn relabelled<T: Scale>(self) -> Instant<T> {
        Instant { day: self.day, fraction: self.fraction, scale: PhantomData }
    }
}

impl Instant<Tai> {
    /// TT = TAI + 32.184 s, by definition (IAU 1991 resolution A4).
    pub fn to_tt(self) -> Instant<Tt> {
        self.plus_seconds(TT_MINUS_TAI_S).relabelled()
    }

    /// UT1, given UT1−TAI in seconds.
    pub fn to_ut1(self, ut1_minus_tai_s: f64) -> Instant<Ut1> {
        self.plus_seconds(ut1_minus_tai_s).relabelled()
    }
}

impl Instant<Tt> {
    /// TAI = TT − 32.184 s, by definition (IAU 1991 resolution A4).
    pub fn to_tai(self) -> Instant<Tai> {
        self.plus_seconds(-TT_MINUS_TAI_S).relabelled()
    }
}

impl Instant<Ut1> {
    /// TAI, given UT1−TAI in seconds.
    pub fn to_tai(self, ut1_minus_tai_s: f64) -> Instant<Tai> {
        self.plus_seconds(-ut1_minus_tai_s).relabelled()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn any_split_gives_the_same_instant() {
        // A tenth of a day cannot be written exactly in binary next to a large whole part; the parts
        // are exact here, so every split must give the same bits.
        let wanted = Instant::<Tt>::from_mjd(60_000.0, 0.375);
        for (day, fraction) in [
            (60_000.375, 0.0),
            (0.375, 60_000.0),
            (59_999.5, 0.875),
            (60_001.0, -0.625),
            (-1.0, 60_001.375),
            (120_000.0, -59_999.625),
        ] {
            assert_eq!(Instant::<Tt>::from_mjd(day, fraction), wanted, "{day} {fraction}");
        }
        assert_eq!(wanted.mjd_parts(), (60_000.0, 0.375));
    }

    #[test]
    fn a_hair_before_midnight_keeps_the_fraction_below_one() {
        let instant = Instant::<Tai>::from_mjd(50_000.0, -1e-20);
        let (day, fraction) = instant.mjd_parts();
        assert!((0.0..1.0).contains(&fraction), "{fraction}");
        assert_eq!(day + fraction, 50_000.0);
    }

    #[test]
    fn no_number_gives_no_instant() {
        for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            assert!(!Instant::<Tai>::from_mjd(bad, 0.0).is_finite());
            assert!(!Instant::<Tai>::from_mjd(50_000.0, bad).is_finite());
            assert!(!Instant::<Tai>::from_mjd(50_000.0, 0.0).plus_seconds(bad).is_finite());
        }
    }

    #[test]
    fn seconds_added_come_back() {
        let start = Instant::<Tai>::from_mjd(51_544.0, 0.123_456_789);
        let mut worst = 0.0_f64;
        for k in -400..400 {
            let seconds = f64::from(k) * 7_777_777.777_777;
            // A difference of centuries has a unit in the last place of up to 1e-6 s, so the test
            // goes there and back, where only the resolution of the instant is left.
            let there = start.plus_seconds(seconds);
            let back = there.plus_seconds(-seconds).seconds_since(start);
            worst = worst.max(back.abs());
        }
        assert!(worst < 4.0 * 1.2e-16 * SECONDS_PER_DAY, "{worst:e} s");
    }

    #[test]
    fn terrestrial_time_is_tai_plus_a_constant() {
        // 1977-01-01 00:00:00 TAI is 1977 January 1.0003725 TT, the definition of the scales' origin
        // (IAU 1991 resolution A4).
        let tt = Instant::<Tai>::from_mjd(43_144.0, 0.0).to_tt();
        assert_eq!(tt.mjd_parts().0, 43_144.0);
        assert!((tt.mjd_parts().1 - 0.000_372_5).abs() < 1e-18);
        assert!(tt.to_tai().seconds_since(Instant::from_mjd(43_144.0, 0.0)).abs() < 1e-11);
    }

    #[test]
    fn instants_compare_in_time_order() {
        let a = Instant::<Tt>::from_mjd(50_000.0, 0.9);
        let b = Instant::<Tt>::from_mjd(50_001.0, 0.1);
        assert!(a < b);
        assert!((b.days_since(a) - 0.2).abs() < 1e-15);
        assert_eq!(Instant::<Tt>::from_mjd(51_544.5 + 36_525.0, 0.0).julian_centuries(), 1.0);
    }
}
