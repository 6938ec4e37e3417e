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
}

impl Cause {
    /// Every cause, in the order of the codes.
    pub const ALL: [Cause; 13] = [
        Cause::None,
        Cause::Span,
        Cause::AltitudeMin,
        Cause::AltitudeMax,
        Cause::AirmassMax,
        Cause::SunAltitudeMax,
        Cause::SunSeparationMin,
        Cause::MoonSeparationMin,
        Cause::MoonAltitudeMax,
        Cause::MoonIlluminationMax,
        Cause::HourAngle,
        Cause::WindowMin,
        Cause::BadRow,
    ];

    /// The word for this cause, as it stands in files and messages.
    pub fn word(self) -> &'static str {
        match self {
            Cause::None => "none",
            Cause::Span => "span",
            Cause::AltitudeMin => "altitude_min",
            Cause::AltitudeMax => "altitude_max",
            Cause::AirmassMax => "airmass_max",
            Cause::SunAltitudeMax => "sun_altitude_max",
            Cause::SunSeparationMin => "sun_separation_min",
            Cause::MoonSeparationMin => "moon_separation_min",
            Cause::MoonAltitudeMax => "moon_altitude_max",
            Cause::MoonIlluminationMax => "moon_illumination_max",
            Cause::HourAngle => "hour_angle",
            Cause::WindowMin => "window_min",
            Cause::BadRow => "bad_row",
        }
    }

    /// The cause of a code.
    pub fn from_code(code: u8) -> Option<Cause> {
        Cause::ALL.get(usize::from(code)).copied()
    }
}
