//! The observer's place: geodetic to terrestrial, the local horizon's axes, dip, and the skyline.

mod skyline;

use crate::constants::{
    RADIANS_PER_ARCSECOND, RADIANS_PER_DEGREE, TURN, WGS84_EQUATORIAL_RADIUS_M, WGS84_FLATTENING,
};
use crate::error::{Error, Result};
use crate::math::vector::{Matrix, Vector};
use std::f64::consts::{FRAC_PI_2, PI};

pub use skyline::Skyline;

/// Lowest height of a site above the ellipsoid, m. The shore of the Dead Sea lies at −430 m.
pub const LOWEST_HEIGHT_M: f64 = -500.0;
/// Greatest height of a site above the ellipsoid, m: Everest and an aircraft, but inside the troposphere
/// that the refraction is traced through.
pub const GREATEST_HEIGHT_M: f64 = 10_000.0;

/// A telescope's place on the Earth, on the WGS 84 ellipsoid.
///
/// # Axes
/// The local frame is x to the geodetic north, y to the east, z to the geodetic zenith, so that
/// azimuth = atan2(y, x) runs from north through east and altitude = asin(z) of a unit vector.
/// North, east, up is a **left-handed** triad: [`Site::local`] is orthogonal with determinant −1.
/// Lengths and angles survive it; a vector product changes its sign. At a pole "north" is the meridian
/// of the longitude that was given.
///
/// The zenith is that of the ellipsoid: deflections of the vertical (some 10″ in mountains) are not in it.
#[derive(Debug, Clone, PartialEq)]
pub struct Site {
    longitude: f64,
    latitude: f64,
    height_m: f64,
    terrestrial: Vector,
    local: Matrix,
    skyline: Option<Skyline>,
}

impl Site {
    /// A site from its geodetic longitude (east positive, −2π to 2π) and latitude (−π/2 to π/2) in radians,
    /// and its height above the ellipsoid (−500 to 10,000 m).
    pub fn new(longitude: f64, latitude: f64, height_m: f64) -> Result<Self> {
        check_height(height_m)?;
        // A few last places of slack: 90° and 360° come out of a multiplication.
        const SLACK: f64 = 1.0 + 4.0 * f64::EPSILON;
        if !(-TURN * SLACK..=TURN * SLACK).contains(&longitude) {
            return Err(longitude_error(longitude / RADIANS_PER_DEGREE));
        }
        if !(-FRAC_PI_2 * SLACK..=FRAC_PI_2 * SLACK).contains(&latitude) {
            return Err(latitude_error(latitude / RADIANS_PER_DEGREE));
        }
        Ok(Self::unchecked(longitude, latitude, height_m))
    }

    /// The same from degrees, as they stand in a plan: −360 to 360, −90 to 90. Longitudes a turn apart
    /// (−180 and 180, 270 and −90) give the same bits.
    pub fn from_degrees(longitude_deg: f64, latitude_deg: f64, height_m: f64) -> Result<Self> {
        check_height(height_m)?;
        if !(-360.0..=360.0).contains(&longitude_deg) {
            return Err(longitude_error(longitude_deg));
        }
        if !(-90.0..=90.0).contains(&latitude_deg) {
            return Err(latitude_error(latitude_deg));
        }
        let reduced_deg = reduce(longitude_deg, 360.0);
        Ok(Self::unchecked(reduced_deg * RADIANS_PER_DEGREE, latitude_deg * RADIANS_PER_DEGREE, height_m))
    }

    fn unchecked(longitude: f64, latitude: f64, height_m: f64) -> Self {
        let longitude = reduce(longitude, TURN).clamp(-PI, PI);
        let latitude = latitude.clamp(-FRAC_PI_2, FRAC_PI_2);
        let (sin_lon, cos_lon) = longitude.sin_cos();
        let (sin_lat, cos_lat) = latitude.sin_cos();
        let prime_vertical_m = prime_vertical_radius_m(sin_lat);
        let axis_ratio = 1.0 - WGS84_FLATTENING;
        let from_axis_m = (prime_vertical_m + height_m) * cos_lat;
        Self {
            longitude,
            latitude,
            height_m,
            terrestrial: [
                from_axis_m * cos_lon,
                from_axis_m * sin_lon,
                (prime_vertical_m * axis_ratio * axis_ratio + height_m) * sin_lat,
            ],
            local: [
                [-sin_lat * cos_lon, -sin_lat * sin_lon, cos_lat],
                [-sin_lon, cos_lon, 0.0],
                [cos_lat * cos_lon, cos_lat * sin_lon, sin_lat],
            ],
            skyline: None,
        }
    }

    /// The same site behind a skyline.
    pub fn with_skyline(self, skyline: Skyline) -> Self {
        Self { skyline: Some(skyline), ..self }
    }

    /// Geodetic longitude, radians, east positive, in (−π, π].
    pub fn longitude(&self) -> f64 {
        self.longitude
    }

    /// Geodetic latitude, radians.
    pub fn latitude(&self) -> f64 {
        self.latitude
    }

    /// Height above the ellipsoid, m.
    pub fn height_m(&self) -> f64 {
        self.height_m
    }

    /// Place in the ITRS, m, to the rounding of the numbers (2e-9 m, test `terrestrial_place`).
    ///
    /// WGS 84 defining constants (NIMA TR8350.2); the closed form of any text on geodesy, with the radius of
    /// curvature in the prime vertical (Explanatory Supplement to the Astronomical Almanac, 3rd ed., chapter 5).
    pub fn terrestrial(&self) -> Vector {
        self.terrestrial
    }

    /// Takes ITRS components to local ones: the rows are north, east and zenith in the ITRS. See the note on
    /// handedness above.
    pub fn local(&self) -> &Matrix {
        &self.local
    }

    /// What stands before the sky here, if it was told.
    pub fn skyline(&self) -> Option<&Skyline> {
        self.skyline.as_ref()
    }
}

/// Dip of the sea horizon below the horizontal, radians, with mean refraction: 1.76′ √h, h in metres above
/// the sea; 0 at and below it. Good to a few per cent (test `dip_against_a_traced_ray`); refraction over
/// water scatters by more. An option for who wants it: the almanac's definitions of rise and set carry no
/// dip.
///
/// Source: the dip table of The Nautical Almanac, as its explanation gives it.
pub fn dip(height_m: f64) -> f64 {
    1.76 * 60.0 * RADIANS_PER_ARCSECOND * height_m.max(0.0).sqrt()
}

/// Radius of curvature in the prime vertical, m.
fn prime_vertical_radius_m(sin_lat: f64) -> f64 {
    let eccentricity_squared = WGS84_FLATTENING * (2.0 - WGS84_FLATTENING);
    WGS84_EQUATORIAL_RADIUS_M / (1.0 - eccentricity_squared * sin_lat * sin_lat).sqrt()
}

/// Into (−turn/2, turn/2], from at most one turn to either side.
fn reduce(angle: f64, turn: f64) -> f64 {
    if angle > 0.5 * turn {
        angle - turn
    } else if angle <= -0.5 * turn {
        angle + turn
    } else {
        angle
    }
}

fn check_height(height_m: f64) -> Result<()> {
    if (LOWEST_HEIGHT_M..=GREATEST_HEIGHT_M).contains(&height_m) {
        return Ok(());
    }
    let allowed = format!("{LOWEST_HEIGHT_M} to {GREATEST_HEIGHT_M} m above the WGS 84 ellipsoid");
    Err(Error::invalid("height of the site", format!("{height_m} m"), allowed))
}

fn longitude_error(longitude_deg: f64) -> Error {
    Error::invalid(
        "longitude of the site",
        format!("{longitude_deg} degrees"),
        "-360 to 360 degrees, east positive",
    )
}

fn latitude_error(latitude_deg: f64) -> Error {
    Error::invalid("latitude of the site", format!("{latitude_deg} degrees"), "-90 to 90 degrees, geodetic")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::vector::{cross, dot, norm, rotate, sub};

    /// ERFA test suite, gd2gc with WGS 84 [R check-values].
    #[test]
    fn terrestrial_place() {
        let site = Site::new(3.1, -0.5, 2500.0).unwrap();
        let expected = [-5599000.5577049947, 233011.67223479203, -3040909.4706983363];
        let off_m = norm(sub(site.terrestrial(), expected));
        assert!(off_m < 2e-9, "{off_m} m");
    }

    /// The ellipsoid's own axes, with no series in between: semi-minor axis 6,356,752.3142 m (NIMA TR8350.2).
    #[test]
    fn poles_and_equator() {
        let pole = Site::from_degrees(0.0, 90.0, 0.0).unwrap();
        assert!((pole.terrestrial()[2] - 6356752.3142).abs() < 5e-5);
        assert!(pole.terrestrial()[0].abs() < 1e-9);
        let equator = Site::from_degrees(90.0, 0.0, 100.0).unwrap();
        assert!((equator.terrestrial()[1] - 6378237.0).abs() < 2e-9);
    }

    #[test]
    fn local_axes_are_north_east_up_and_left_handed() {
        for (longitude_deg, latitude_deg) in [(0.0, 0.0), (-70.4, -24.6), (123.0, 89.99), (10.0, -90.0)] {
            let site = Site::from_degrees(longitude_deg, latitude_deg, 0.0).unwrap();
            let [north, east, zenith] = *site.local();
            for (a, b, product) in [(north, north, 1.0), (east, east, 1.0), (zenith, zenith, 1.0)] {
                assert!((dot(a, b) - product).abs() < 1e-15);
            }
            assert!(norm(sub(cross(east, north), zenith)) < 1e-15, "east × north is up");
            // The zenith is the ellipsoid's normal: going up is going along it.
            let higher = Site::from_degrees(longitude_deg, latitude_deg, 1000.0).unwrap();
            let up = sub(higher.terrestrial(), site.terrestrial());
            assert!(norm(sub(rotate(site.local(), up), [0.0, 0.0, 1000.0])) < 1e-8);
        }
        // The celestial pole stands in the north at the latitude (spherical astronomy, no source needed).
        let site = Site::from_degrees(17.0, 35.0, 0.0).unwrap();
        let pole = rotate(site.local(), [0.0, 0.0, 1.0]);
        assert!((pole[2].asin() - site.latitude()).abs() < 1e-15);
        assert!(pole[1].abs() < 1e-16 && pole[0] > 0.0);
    }

    #[test]
    fn longitudes_a_turn_apart_are_one_site() {
        for (one_deg, other_deg) in [(-180.0, 180.0), (270.0, -90.0), (360.0, 0.0), (-289.7, 70.3)] {
            let one = Site::from_degrees(one_deg, 30.0, 0.0).unwrap();
            let other = Site::from_degrees(other_deg, 30.0, 0.0).unwrap();
            assert!((one.longitude() - other.longitude()).abs() < 1e-15, "{one_deg} {other_deg}");
        }
        assert_eq!(Site::from_degrees(-180.0, 30.0, 0.0), Site::from_degrees(180.0, 30.0, 0.0));
        assert_eq!(Site::new(-PI, 0.5, 0.0), Site::new(PI, 0.5, 0.0));
    }

    #[test]
    fn what_is_not_on_the_earth_is_refused_by_name() {
        let message = |site: Result<Site>| site.unwrap_err().to_string();
        assert_eq!(
            message(Site::from_degrees(0.0, 90.5, 0.0)),
            "latitude of the site: given 90.5 degrees, allowed -90 to 90 degrees, geodetic"
        );
        assert_eq!(
            message(Site::from_degrees(361.0, 0.0, 0.0)),
            "longitude of the site: given 361 degrees, allowed -360 to 360 degrees, east positive"
        );
        assert_eq!(
            message(Site::new(0.0, 0.0, 10_001.0)),
            "height of the site: given 10001 m, allowed -500 to 10000 m above the WGS 84 ellipsoid"
        );
        assert!(message(Site::new(0.0, 0.0, -501.0)).contains("-501"));
        assert!(message(Site::new(0.0, 1.6, 0.0)).contains("latitude"));
        assert!(message(Site::new(f64::NAN, 0.0, 0.0)).contains("NaN"));
        assert!(message(Site::new(0.0, f64::NAN, 0.0)).contains("NaN"));
        assert!(message(Site::new(0.0, 0.0, f64::NAN)).contains("NaN"));
        for (longitude_deg, latitude_deg, height_m) in
            [(360.0, 90.0, 10_000.0), (-360.0, -90.0, -500.0), (180.0, 0.0, 0.0)]
        {
            assert!(Site::from_degrees(longitude_deg, latitude_deg, height_m).is_ok());
            let (longitude, latitude) = (longitude_deg.to_radians(), latitude_deg.to_radians());
            assert!(Site::new(longitude, latitude, height_m).is_ok());
        }
    }

    #[test]
    fn dip_of_the_sea_horizon() {
        // The Nautical Almanac's dip table: 1.0 m −1.8′, 10 m −5.6′, 48 m −12.2′ [M].
        for (height_m, arcmin) in [(1.0, 1.8), (10.0, 5.6), (48.0, 12.2)] {
            assert!((dip(height_m) / RADIANS_PER_ARCSECOND / 60.0 - arcmin).abs() < 0.05);
        }
        assert_eq!(dip(0.0), 0.0);
        assert_eq!(dip(-400.0), 0.0);
    }
}
