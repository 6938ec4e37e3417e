//! The two channels by which a call can report trouble, and no third: [`Error`] for a wrong call,
//! [`Status`] for a wrong row.

use std::fmt;

/// What is wrong with a call: its arguments, or a table handed in with it.
///
/// Opaque: ask it with the predicates, show it with `Display`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Error(Box<Kind>);

#[derive(Debug, Clone, PartialEq, Eq)]
enum Kind {
    Invalid { what: String, given: String, allowed: String },
    Table { source: String, line: usize, message: String },
    Interrupted,
}

/// The result of a call that can be wrong.
pub type Result<T> = std::result::Result<T, Error>;

impl Error {
    /// An argument with a value that is not allowed: what was given, and what would have been allowed.
    pub fn invalid(what: impl Into<String>, given: impl fmt::Display, allowed: impl Into<String>) -> Self {
        Error(Box::new(Kind::Invalid {
            what: what.into(),
            given: given.to_string(),
            allowed: allowed.into(),
        }))
    }

    /// A table that cannot be read; `line` counts from 1, 0 when the fault is the whole table's.
    pub fn table(source: impl Into<String>, line: usize, message: impl Into<String>) -> Self {
        Error(Box::new(Kind::Table { source: source.into(), line, message: message.into() }))
    }

    /// The caller asked for the work to stop.
    pub fn interrupted() -> Self {
        Error(Box::new(Kind::Interrupted))
    }

    /// Whether an argument had a value that is not allowed.
    pub fn is_invalid(&self) -> bool {
        matches!(*self.0, Kind::Invalid { .. })
    }

    /// Whether a table could not be read.
    pub fn is_table(&self) -> bool {
        matches!(*self.0, Kind::Table { .. })
    }

    /// Whether the caller asked for the work to stop.
    pub fn is_interrupted(&self) -> bool {
        matches!(*self.0, Kind::Interrupted)
    }
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &*self.0 {
            Kind::Invalid { what, given, allowed } => write!(f, "{what}: given {given}, allowed {allowed}"),
            Kind::Table { source, line: 0, message } => write!(f, "{source}: {message}"),
            Kind::Table { source, line, message } => write!(f, "{source}, line {line}: {message}"),
            Kind::Interrupted => write!(f, "interrupted"),
        }
    }
}

impl std::error::Error for Error {}

/// What is to be said of one row (or of one instant). Below [`Status::FIRST_BAD`] the row's outputs
/// are good and the status is a note; from there on they are NaN and the status says why.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[repr(u8)]
pub enum Status {
    /// Nothing to say.
    Ok = 0,
    /// The instant lies past the Earth orientation table: UT1 and the pole are extrapolated.
    OrientationExtrapolated = 1,
    /// A two-body orbit is used so far from its epoch that it may be off by more than 5″.
    FarFromEpoch = 2,
    /// A value of the row is NaN or infinite.
    NotFinite = 16,
    /// Right ascension outside −360° to +360°.
    RightAscension = 17,
    /// Declination outside −90° to +90°.
    Declination = 18,
    /// Proper motion above 100″/yr in a component: no star moves like that.
    ProperMotion = 19,
    /// Parallax beyond 2″ in size: nothing outside the solar system is that near.
    Parallax = 20,
    /// Radial velocity beyond 30,000 km/s in size.
    RadialVelocity = 21,
    /// Catalogue epoch outside 1700 to 2300.
    Epoch = 22,
    /// The instant is NaT.
    NotATime = 23,
    /// The instant lies before 1960-01-01, where UTC does not exist.
    BeforeUtc = 24,
    /// The instant lies outside the ephemeris.
    OutsideEphemeris = 25,
    /// Orbital elements that no orbit has.
    Elements = 26,
    /// A per-row limit that is NaN or contradicts another.
    Limit = 27,
    /// The observer is inside the body, or no direction exists.
    NoDirection = 28,
}

impl Status {
    /// Codes from here on mark rows whose outputs are NaN.
    pub const FIRST_BAD: u8 = 16;

    /// Every status, in the order of the codes.
    pub const ALL: [Status; 16] = [
        Status::Ok,
        Status::OrientationExtrapolated,
        Status::FarFromEpoch,
        Status::NotFinite,
        Status::RightAscension,
        Status::Declination,
        Status::ProperMotion,
        Status::Parallax,
        Status::RadialVelocity,
        Status::Epoch,
        Status::NotATime,
        Status::BeforeUtc,
        Status::OutsideEphemeris,
        Status::Elements,
        Status::Limit,
        Status::NoDirection,
    ];

    /// Whether the row has no outputs.
    pub fn is_bad(self) -> bool {
        self as u8 >= Status::FIRST_BAD
    }

    /// The word for this status, as it stands in files and messages.
    pub fn word(self) -> &'static str {
        match self {
            Status::Ok => "ok",
            Status::OrientationExtrapolated => "orientation_extrapolated",
            Status::FarFromEpoch => "far_from_epoch",
            Status::NotFinite => "not_finite",
            Status::RightAscension => "right_ascension_out_of_range",
            Status::Declination => "declination_out_of_range",
            Status::ProperMotion => "proper_motion_out_of_range",
            Status::Parallax => "parallax_out_of_range",
            Status::RadialVelocity => "radial_velocity_out_of_range",
            Status::Epoch => "epoch_out_of_range",
            Status::NotATime => "not_a_time",
            Status::BeforeUtc => "before_utc",
            Status::OutsideEphemeris => "outside_ephemeris",
            Status::Elements => "elements_out_of_range",
            Status::Limit => "limit_out_of_range",
            Status::NoDirection => "no_direction",
        }
    }

    /// The worse of two: a bad status wins over a note, a note over none.
    pub fn worst(self, other: Status) -> Status {
        if other as u8 > self as u8 { other } else { self }
    }
}
