//! The columns of a place.

use crate::error::{Error, Result};
use crate::refraction::AirmassModel;
use crate::windows::SkyModel;

/// What can be computed of a place.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[repr(u8)]
pub enum PlaceColumn {
    /// Observed altitude, degrees.
    AltitudeDeg,
    /// Azimuth from north through east, degrees in [0, 360).
    AzimuthDeg,
    /// Local hour angle, degrees in (−180, 180].
    HourAngleDeg,
    /// Declination of date on the celestial intermediate pole, degrees.
    DeclinationDeg,
    /// Airmass by [`PLACE_AIRMASS`]; NaN below the horizon.
    Airmass,
    /// Parallactic angle, degrees in (−180, 180].
    ParallacticAngleDeg,
    /// Distance from the Moon's centre, degrees, both topocentric without refraction.
    MoonSeparationDeg,
    /// Distance from the Sun's centre, degrees, both topocentric without refraction.
    SunSeparationDeg,
    /// Rate of the azimuth of a direction that is fixed among the stars, arcseconds a second, in vacuum:
    /// ω (sin φ − cos φ cos A tan h), without bound towards the zenith. ω is that of the Earth's rotation; the
    /// target's own motion, at most 4 % of it for the Moon, is left out.
    AzimuthRateArcsecS,
    /// The same of the parallactic angle, at which an altazimuth telescope's field rotates:
    /// −ω cos φ cos A / cos h.
    ParallacticAngleRateArcsecS,
    /// Brightness of the sky with the Moon in it, V magnitudes a square arcsecond, by
    /// [`sky_brightness`](crate::windows::sky_brightness); NaN below the horizon. Twilight is not in it.
    SkyBrightnessMagArcsec2,
    /// Distance travelled by the light that arrives now, au; from here on NaN for a catalogue.
    DistanceAu,
    /// Distance from the Sun, au.
    HeliocentricDistanceAu,
    /// Angle at the body between the Sun and the observer, degrees.
    PhaseAngleDeg,
    /// Angle at the observer between the Sun and the body, degrees.
    ElongationDeg,
    /// Apparent V magnitude.
    MagnitudeV,
    /// Motion among the stars, arcseconds a minute.
    RateArcsecMin,
    /// Its direction from the north of the ICRS through the east, degrees in [0, 360).
    MotionPositionAngleDeg,
    /// Illuminated fraction of the disc.
    IlluminatedFraction,
    /// Angular diameter of the equator, arcseconds.
    AngularDiameterArcsec,
    /// Position angle of the middle of the bright limb from the north of date through the east, degrees.
    BrightLimbPositionAngleDeg,
    /// Days since the last new Moon; NaN for all but the Moon.
    MoonAgeD,
}

/// The formula behind [`PlaceColumn::Airmass`].
pub const PLACE_AIRMASS: AirmassModel = AirmassModel::KastenYoung1989;

impl PlaceColumn {
    /// Every column.
    pub const ALL: [PlaceColumn; 22] = [
        PlaceColumn::AltitudeDeg,
        PlaceColumn::AzimuthDeg,
        PlaceColumn::HourAngleDeg,
        PlaceColumn::DeclinationDeg,
        PlaceColumn::Airmass,
        PlaceColumn::ParallacticAngleDeg,
        PlaceColumn::MoonSeparationDeg,
        PlaceColumn::SunSeparationDeg,
        PlaceColumn::AzimuthRateArcsecS,
        PlaceColumn::ParallacticAngleRateArcsecS,
        PlaceColumn::SkyBrightnessMagArcsec2,
        PlaceColumn::DistanceAu,
        PlaceColumn::HeliocentricDistanceAu,
        PlaceColumn::PhaseAngleDeg,
        PlaceColumn::ElongationDeg,
        PlaceColumn::MagnitudeV,
        PlaceColumn::RateArcsecMin,
        PlaceColumn::MotionPositionAngleDeg,
        PlaceColumn::IlluminatedFraction,
        PlaceColumn::AngularDiameterArcsec,
        PlaceColumn::BrightLimbPositionAngleDeg,
        PlaceColumn::MoonAgeD,
    ];

    /// The word for this column.
    pub fn word(self) -> &'static str {
        match self {
            PlaceColumn::AltitudeDeg => "altitude_deg",
            PlaceColumn::AzimuthDeg => "azimuth_deg",
            PlaceColumn::HourAngleDeg => "hour_angle_deg",
            PlaceColumn::DeclinationDeg => "declination_deg",
            PlaceColumn::Airmass => "airmass",
            PlaceColumn::ParallacticAngleDeg => "parallactic_angle_deg",
            PlaceColumn::MoonSeparationDeg => "moon_separation_deg",
            PlaceColumn::SunSeparationDeg => "sun_separation_deg",
            PlaceColumn::AzimuthRateArcsecS => "azimuth_rate_arcsec_s",
            PlaceColumn::ParallacticAngleRateArcsecS => "parallactic_angle_rate_arcsec_s",
            PlaceColumn::SkyBrightnessMagArcsec2 => "sky_brightness_mag_arcsec2",
            PlaceColumn::DistanceAu => "distance_au",
            PlaceColumn::HeliocentricDistanceAu => "heliocentric_distance_au",
            PlaceColumn::PhaseAngleDeg => "phase_angle_deg",
            PlaceColumn::ElongationDeg => "elongation_deg",
            PlaceColumn::MagnitudeV => "magnitude_v",
            PlaceColumn::RateArcsecMin => "rate_arcsec_min",
            PlaceColumn::MotionPositionAngleDeg => "motion_position_angle_deg",
            PlaceColumn::IlluminatedFraction => "illuminated_fraction",
            PlaceColumn::AngularDiameterArcsec => "angular_diameter_arcsec",
            PlaceColumn::BrightLimbPositionAngleDeg => "bright_limb_position_angle_deg",
            PlaceColumn::MoonAgeD => "moon_age_d",
        }
    }

    /// The column of a word.
    ///
    /// # Errors
    /// When there is none.
    pub fn from_word(word: &str) -> Result<Self> {
        Self::ALL
            .into_iter()
            .find(|column| column.word() == word)
            .ok_or_else(|| Error::invalid("column", word, Self::ALL.map(PlaceColumn::word).join(", ")))
    }
}

/// The columns asked for and the status, all of one length, owned by the caller.
#[derive(Debug)]
pub struct PlaceColumns<'a> {
    /// Each column once.
    pub columns: Vec<(PlaceColumn, &'a mut [f64])>,
    /// What the brightness of the sky is computed from.
    pub sky_model: SkyModel,
    /// [`Status`](crate::error::Status) codes.
    pub status: &'a mut [u8],
}

impl<'a> PlaceColumns<'a> {
    /// Whether every column has as many values as there are rows.
    pub(in crate::grid) fn check(&self, rows: usize) -> Result<()> {
        let lengths = self.columns.iter().map(|(column, values)| (column.word(), values.len()));
        self.sky_model.check()?;
        for (name, length) in lengths.chain([("status", self.status.len())]) {
            if length != rows {
                return Err(Error::invalid(name, format!("{length} values"), format!("{rows}")));
            }
        }
        Ok(())
    }

    /// Cut into blocks of `size` rows, each with the number of its first row.
    pub(in crate::grid) fn blocks(self, size: usize) -> Vec<(usize, PlaceColumns<'a>)> {
        let mut blocks = Vec::with_capacity(self.status.len().div_ceil(size));
        let (mut first, mut rest) = (0, self);
        while !rest.status.is_empty() {
            let rows = size.min(rest.status.len());
            let (block, after) = rest.split_at(rows);
            blocks.push((first, block));
            (first, rest) = (first + rows, after);
        }
        blocks
    }

    pub(in crate::grid) fn split_at(self, rows: usize) -> (Self, Self) {
        let (status, rest_status) = self.status.split_at_mut(rows);
        let (columns, rest) = self
            .columns
            .into_iter()
            .map(|(column, values)| {
                let (first, rest) = values.split_at_mut(rows);
                ((column, first), (column, rest))
            })
            .unzip();
        let sky_model = self.sky_model;
        (
            PlaceColumns { columns, sky_model, status },
            PlaceColumns { columns: rest, sky_model, status: rest_status },
        )
    }

    pub(in crate::grid) fn wants(&self, wanted: PlaceColumn) -> bool {
        self.columns.iter().any(|(column, _)| *column == wanted)
    }
}
