//! Why a window's edge is where it is, and why nothing is left.

/// What opens or closes a window, or leaves none.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[repr(u8)]
pub enum Cause {
    /// Nothing.
    None = 0,
    /// The span that was asked for begins or ends.
    Span = 1,
    /// The target's lowest altitude.
    AltitudeMin = 2,
    /// The target's highest altitude.
    AltitudeMax = 3,
    /// The target's largest airmass.
    AirmassMax = 4,
    /// The Sun's highest altitude.
    SunAltitudeMax = 5,
    /// The distance from the Sun.
    SunSeparationMin = 6,
    /// The distance from the Moon.
    MoonSeparationMin = 7,
    /// The Moon's highest altitude.
    MoonAltitudeMax = 8,
    /// The Moon's illuminated fraction.
    MoonIlluminationMax = 9,
    /// The hour angle's range.
    HourAngle = 10,
    /// What is left is shorter than the shortest useful window.
    WindowMin = 11,
    /// The row has no direction or no limits: its status says why.
    BadRow = 12,
    /// The skyline of the site.
    Skyline = 13,
    /// The distance from the Moon that its phase asks for.
    MoonAvoidance = 14,
    /// The brightness of the sky.
    SkyBrightness = 15,
    /// The sectors of azimuth.
    AzimuthSectors = 16,
    /// The rate of azimuth: the keyhole of an altazimuth mount.
    AzimuthRate = 17,
    /// The range of declination.
    Declination = 18,
    /// The range of the cables.
    CableRange = 19,
    /// The intervals that are allowed.
    AllowedIntervals = 20,
    /// The recurring phase.
    Phase = 21,
}

impl Cause {
    /// Every cause with its word, in the order of the codes.
    const WORDS: [(Cause, &'static str); 22] = [
        (Cause::None, "none"),
        (Cause::Span, "span"),
        (Cause::AltitudeMin, "altitude_min"),
        (Cause::AltitudeMax, "altitude_max"),
        (Cause::AirmassMax, "airmass_max"),
        (Cause::SunAltitudeMax, "sun_altitude_max"),
        (Cause::SunSeparationMin, "sun_separation_min"),
        (Cause::MoonSeparationMin, "moon_separation_min"),
        (Cause::MoonAltitudeMax, "moon_altitude_max"),
        (Cause::MoonIlluminationMax, "moon_illumination_max"),
        (Cause::HourAngle, "hour_angle"),
        (Cause::WindowMin, "window_min"),
        (Cause::BadRow, "bad_row"),
        (Cause::Skyline, "skyline"),
        (Cause::MoonAvoidance, "moon_avoidance"),
        (Cause::SkyBrightness, "sky_brightness"),
        (Cause::AzimuthSectors, "azimuth_sectors"),
        (Cause::AzimuthRate, "azimuth_rate"),
        (Cause::Declination, "declination"),
        (Cause::CableRange, "cable_range"),
        (Cause::AllowedIntervals, "allowed_intervals"),
        (Cause::Phase, "phase"),
    ];

    /// Every cause, in the order of the codes.
    pub const ALL: [Cause; 22] = {
        let mut all = [Cause::None; 22];
        let mut code = 0;
        while code < all.len() {
            all[code] = Self::WORDS[code].0;
            code += 1;
        }
        all
    };

    /// The limits in the order in which they are applied.
    pub const ORDER: [Cause; 19] = [
        Cause::SunAltitudeMax,
        Cause::MoonAltitudeMax,
        Cause::MoonIlluminationMax,
        Cause::AllowedIntervals,
        Cause::AltitudeMin,
        Cause::AirmassMax,
        Cause::AltitudeMax,
        Cause::Declination,
        Cause::HourAngle,
        Cause::AzimuthSectors,
        Cause::AzimuthRate,
        Cause::Skyline,
        Cause::SunSeparationMin,
        Cause::MoonSeparationMin,
        Cause::MoonAvoidance,
        Cause::Phase,
        Cause::SkyBrightness,
        Cause::CableRange,
        Cause::WindowMin,
    ];

    /// The word for this cause, as it stands in files and messages.
    pub fn word(self) -> &'static str {
        Self::WORDS[self as usize].1
    }

    /// The cause of a code.
    pub fn from_code(code: u8) -> Option<Cause> {
        Cause::ALL.get(usize::from(code)).copied()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_words_and_order_hold_every_cause_once() {
        for (code, (cause, word)) in Cause::WORDS.into_iter().enumerate() {
            assert_eq!(cause as usize, code);
            assert_eq!(Cause::from_code(code as u8), Some(cause));
            assert_eq!(Cause::WORDS.iter().filter(|other| other.1 == word).count(), 1);
            let no_limit = matches!(cause, Cause::None | Cause::Span | Cause::BadRow);
            assert_eq!(Cause::ORDER.contains(&cause), !no_limit);
        }
        assert_eq!(Cause::from_code(22), None);
    }
}
